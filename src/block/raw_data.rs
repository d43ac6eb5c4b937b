//! Raw data: columns of a CSV file, with their units, as the author names them.

use super::engine::{Block, Engine};
use super::field::{Field, Shape, needed, optional};
use super::fields::Fields;
use super::{BlockKind, no_check};
use crate::diagnostic::{Code, Problem};
use crate::graph::{Distribution, InputDraft, Origin, Quantity, ReadingColumn, Value};
use crate::intake::{FileId, Place};
use crate::quantity::{Kind, Unit};
use crate::record::{
    ColumnData, Content, RowFilter, Text, WantedColumn, parse_instant, parse_timestamps, read_columns,
};
use chrono::{DateTime, FixedOffset};
use std::sync::Arc;

const COLUMN_FIELDS: &[Field] = &[
    needed("head", Shape::Text, "the head of the column in the file"),
    needed("unit", Shape::Text, "the unit of its numbers, 1 for plain numbers, or text"),
];

const FILTER_FIELDS: &[Field] = &[
    needed("head", Shape::Text, "the head of the column that chooses rows"),
    needed("equals", Shape::Text, "what a chosen row holds there"),
];

/// A raw data file.
pub static KIND: BlockKind = BlockKind {
    name: "raw-data",
    meaning: "a raw data file: which columns, in which units",
    fields: &[
        needed("file", Shape::Text, "the file, seen from the record's folder"),
        optional("zero_time", Shape::Instant, "the time that columns of seconds count from"),
        optional("header_line", Shape::Number, "the line of the heads, 1 unless written"),
        optional("rows", Shape::Mapping(FILTER_FIELDS), "take only the rows whose cell equals a text"),
        needed("columns", Shape::Named(COLUMN_FIELDS), "the columns by name"),
    ],
    outputs: &[],
    check: no_check,
    build: |engine, block| {
        RawData::read(engine, block);
    },
};

/// A raw data file read; its columns are shared by its copies.
#[derive(Clone)]
pub struct RawData {
    pub name: String,
    pub file: FileId,
    pub lines: Arc<[u32]>,
    columns: Arc<[Column]>,
    zero_time: Option<DateTime<FixedOffset>>,
    place: Place,
}

struct Column {
    name: Text,
    head: Text,
    unit: Option<Unit>,
    data: ColumnData,
}

impl RawData {
    /// The raw data with this name, read; complaints go to the engine.
    pub fn find(engine: &Engine, name: &Text) -> Option<RawData> {
        let block = engine.block(name, &["raw-data"])?;
        match engine.found::<RawData>(block.name()) {
            Some(known) => Some((*known).clone()),
            None => Self::read(engine, block),
        }
    }

    fn read(engine: &Engine, block: &Block) -> Option<RawData> {
        let fields = block.fields();
        let file_name = fields.text("file")?;
        let file = engine.keep(engine.read_file(&file_name.text, &block.path), file_name.place)?;
        let filter = fields
            .mapping("rows")
            .and_then(|rows| Some(RowFilter { head: rows.text("head")?, equals: rows.words("equals") }));
        let mut wanted = Vec::new();
        let mut named = Vec::new();
        for entry in fields.get("columns")?.as_map()? {
            let particulars = Fields { node: &entry.value };
            let unit_text = particulars.text("unit")?;
            let unit = match unit_text.text.as_str() {
                "text" => None,
                text => Some(engine.keep(Unit::parse(text), unit_text.place)?),
            };
            let content = if unit.is_some() { Content::Number } else { Content::Text };
            let head = particulars.text("head")?;
            wanted.push(WantedColumn { head: head.clone(), content });
            named.push((entry.key.clone(), head, unit));
        }
        let header_line = fields.number("header_line").map_or(1, |line| line.max(1.0) as usize);
        let bytes = engine.sources().file(file).bytes.clone();
        let (read, complaints) = read_columns(&bytes, file, header_line, &wanted, filter.as_ref());
        let faulty = complaints.has_faults();
        engine.complain_all(complaints);
        if faulty {
            return None;
        }
        let columns =
            named.into_iter().zip(read.columns).map(|((name, head, unit), data)| Column { name, head, unit, data });
        let made = RawData {
            name: block.name().into(),
            file,
            lines: read.rows.into(),
            columns: columns.collect(),
            zero_time: fields.instant("zero_time"),
            place: block.raw.name.place,
        };
        engine.store(block.name(), made.clone());
        Some(made)
    }

    /// Whether a column of this name is declared.
    pub fn has(&self, name: &str) -> bool {
        self.columns.iter().any(|column| column.name.text == name)
    }

    fn column(&self, engine: &Engine, name: &str) -> Option<&Column> {
        let found = self.columns.iter().find(|column| column.name.text == name);
        if found.is_none() {
            let message = format!("{} has no column named {name}, which is needed here.", self.name);
            let problem = Problem::new(Code::ColumnUnknown, message)
                .hint(format!("Write `{name}: {{head: …, unit: …}}` under its columns."));
            engine.complain(problem, self.place);
        }
        found
    }

    /// The head in the file and the unit of a column of numbers.
    pub fn head(&self, name: &str) -> Option<(String, Unit)> {
        let column = self.columns.iter().find(|column| column.name.text == name)?;
        Some((column.head.text.clone(), column.unit.clone()?))
    }

    /// Where the record declares a column; the block's name when it does not.
    pub fn column_place(&self, name: &str) -> Place {
        self.columns.iter().find(|column| column.name.text == name).map_or(self.place, |column| column.name.place)
    }

    /// A column of numbers in coherent SI units (temperatures in K); units of other dimensions than `kind` are refused.
    pub fn numbers(&self, engine: &Engine, name: &str, kind: Kind) -> Option<(Vec<f64>, Unit)> {
        let column = self.column(engine, name)?;
        let (Some(unit), ColumnData::Numbers(numbers)) = (&column.unit, &column.data) else {
            let problem = Problem::new(
                Code::KindMismatch,
                format!("The column {name} of {} holds text, but numbers are needed.", self.name),
            );
            engine.complain(problem, column.head.place);
            return None;
        };
        if kind.dimension().is_some_and(|dimension| dimension != unit.dimension()) {
            let message = format!(
                "The column {name} is in {}, but {} such as 1 {} is expected.",
                unit.text(),
                kind.phrase(),
                kind.default_unit()
            );
            engine.complain(Problem::new(Code::DimensionMismatch, message), column.name.place);
            return None;
        }
        let scale = matches!(kind, Kind::Temperature | Kind::DewPoint);
        let rows =
            if scale { numbers.iter().map(|x| unit.to_si_f64(*x)).collect() } else { unit.differences_to_si(numbers) };
        Some((rows, unit.clone()))
    }

    /// A column of texts.
    pub fn texts(&self, engine: &Engine, name: &str) -> Option<&[String]> {
        let column = self.column(engine, name)?;
        match &column.data {
            ColumnData::Texts(texts) => Some(texts),
            ColumnData::Numbers(_) => {
                let problem = Problem::new(
                    Code::KindMismatch,
                    format!("The column {name} of {} holds numbers, but text is needed.", self.name),
                );
                engine.complain(problem.hint("Write `unit: text`."), column.head.place);
                None
            }
        }
    }

    /// The column of times, in seconds since 1970-01-01T00:00:00Z.
    pub fn times(&self, engine: &Engine) -> Option<Vec<f64>> {
        let column = self.column(engine, "time")?;
        if let ColumnData::Texts(texts) = &column.data {
            return match parse_timestamps(epoch(), texts) {
                Ok(times) => Some(times),
                Err(problems) => {
                    for (row, problem) in problems.into_iter().take(20) {
                        engine.complain(problem, self.line(engine, row));
                    }
                    None
                }
            };
        }
        let Some(zero) = self.zero_time else {
            let problem = Problem::new(
                Code::TimeUnreadable,
                format!("The times of {} count seconds, but zero_time is missing.", self.name),
            );
            engine.complain(problem.hint("Write `zero_time: 2041-05-04T00:00:00Z`."), column.head.place);
            return None;
        };
        let start = crate::record::seconds_since(epoch(), zero);
        let (numbers, _) = self.numbers(engine, "time", Kind::Duration)?;
        Some(numbers.iter().map(|seconds| start + seconds).collect())
    }

    /// The line of a row, as a place.
    pub fn line(&self, engine: &Engine, row: usize) -> Place {
        let number = self.lines.get(row).copied().unwrap_or(1) as usize;
        let sources = engine.sources();
        let (start, end) = sources.file(self.file).line_range(number);
        Place::new(self.file, start, end)
    }

    /// A column as an input of the graph, each row with the same rounding.
    #[allow(clippy::too_many_arguments)]
    pub fn input<'e>(
        &self,
        engine: &'e Engine<'e>,
        column: &str,
        path: &str,
        symbol: &str,
        label: &str,
        kind: Kind,
        rounding: Distribution,
    ) -> Option<Quantity<'e>> {
        let (rows, unit) = self.numbers(engine, column, kind)?;
        let head = self.column(engine, column)?.head.text.clone();
        let origin = Origin::Readings(ReadingColumn { file: self.file, column: head, lines: self.lines.clone() });
        let mut draft = InputDraft::new(path, symbol, label, kind, unit, Value::column(rows), origin);
        draft.distribution = rounding;
        Some(engine.builder.input(draft))
    }
}

/// The beginning of 1970, from which times are counted inside.
pub fn epoch() -> DateTime<FixedOffset> {
    parse_instant("1970-01-01T00:00:00Z").unwrap_or_default()
}
