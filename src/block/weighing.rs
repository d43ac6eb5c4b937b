//! The weighings of a comparison: which row is which, at which time, in which cycle.

use super::engine::{Block, Engine};
use super::fields::Fields;
use super::raw_data::{RawData, epoch};
use crate::diagnostic::{Code, Problem};
use crate::graph::{InputDraft, NodeId, Origin, Quantity, Value};
use crate::intake::Place;
use crate::method::weighing_cycle::Cycle;
use crate::quantity::{Kind, Unit, parse_number};
use crate::record::{Node, Text, seconds_since};

/// One weighing.
#[derive(Debug, Clone, PartialEq)]
pub struct Weighing {
    pub series: u32,
    pub cycle: u32,
    /// 0 for a, 1 for b (or B1), 2 for B2, …
    pub on_pan: u32,
    /// Seconds since 1970.
    pub time: f64,
}

/// A cycle left out, with rule and reason.
#[derive(Debug, Clone, PartialEq)]
pub struct Excluded {
    pub series: u32,
    pub cycle: u32,
    pub rule: String,
    pub rule_text: String,
    pub reason: String,
}

/// All weighings of a comparison in order, with their column of indications.
pub struct Weighings<'e> {
    pub list: Vec<Weighing>,
    pub indications: Quantity<'e>,
    pub unit: Unit,
    places: Rows,
}

enum Rows {
    Written(Vec<Place>),
    File(Box<RawData>),
}

/// What a report shows of a comparison.
#[derive(Debug, Clone, PartialEq)]
pub struct Comparison {
    pub a: String,
    pub b: Vec<String>,
    pub comparator: String,
    pub ambient: Option<String>,
    pub scheme: String,
    pub unit: Unit,
    pub weighings: Vec<Weighing>,
    /// Indications in kg.
    pub indications: Vec<f64>,
    /// Series, cycle, start time, differences of the cycle for each b in kg, whether left out.
    pub cycles: Vec<CycleResult>,
    pub excluded: Vec<Excluded>,
    /// Difference b − a with all cycles kept and with the excluded ones left out, in kg, where any was left out.
    pub with_and_without: Option<(f64, f64)>,
    /// The differences m_b − m_a.
    pub differences: Vec<NodeId>,
    pub decisions: Vec<(String, String)>,
    /// File and lines of the readings.
    pub source: String,
}

/// The difference found in one cycle.
#[derive(Debug, Clone, PartialEq)]
pub struct CycleResult {
    pub series: u32,
    pub cycle: u32,
    pub start: f64,
    pub differences: Vec<f64>,
    pub excluded: bool,
}

impl<'e> Weighings<'e> {
    /// Reads the weighings of a comparison block: written in the record, or from raw data.
    pub fn read(engine: &'e Engine<'e>, block: &Block, pans: &[u32]) -> Option<Self> {
        match block.fields().text("data") {
            Some(data) => Self::from_file(engine, block, &data, pans),
            None => Self::from_lists(engine, block, pans),
        }
    }

    /// The place of a row.
    pub fn place(&self, engine: &Engine, row: usize) -> Place {
        match &self.places {
            Rows::Written(places) => places.get(row).copied().unwrap_or(Place::new(crate::intake::FileId(0), 0, 0)),
            Rows::File(raw) => raw.line(engine, row),
        }
    }

    /// Where the rows stand, in words: file and lines.
    pub fn source(&self, engine: &Engine) -> String {
        let sources = engine.sources();
        match &self.places {
            Rows::File(raw) => {
                let (first, last) = (raw.lines.first().copied().unwrap_or(0), raw.lines.last().copied().unwrap_or(0));
                format!("{}, lines {first} to {last}", sources.file(raw.file).path)
            }
            Rows::Written(places) => match (places.first(), places.last()) {
                (Some(first), Some(last)) => {
                    let (path, from, _) = sources.locate(*first);
                    format!("{path}, lines {from} to {}", sources.locate(*last).1)
                }
                _ => String::new(),
            },
        }
    }

    fn from_file(engine: &'e Engine<'e>, block: &Block, data: &Text, pans: &[u32]) -> Option<Self> {
        let raw = RawData::find(engine, data)?;
        let times = raw.times(engine)?;
        let (series, _) = raw.numbers(engine, "series", Kind::Plain)?;
        let (cycles, _) = raw.numbers(engine, "cycle", Kind::Plain)?;
        let which = raw.texts(engine, "which")?;
        let mut list = Vec::new();
        for (row, text) in which.iter().enumerate() {
            let Some(on_pan) = pan_of(text, pans.len()) else {
                let message = format!(
                    "The row says that “{text}” was on the pan; expected is A or B{}.",
                    if pans.len() > 4 { "1, B2, …" } else { "" }
                );
                engine.complain(Problem::new(Code::CellUnreadable, message), raw.line(engine, row));
                return None;
            };
            list.push(Weighing { series: series[row] as u32, cycle: cycles[row] as u32, on_pan, time: times[row] });
        }
        let path = format!("{}.indications", block.name());
        let label = format!("indications of {}", block.name());
        let exact = crate::graph::Distribution::Exact;
        let indications = raw.input(engine, "indication", &path, "I", &label, Kind::MassDifference, exact)?;
        let (_, unit) = raw.numbers(engine, "indication", Kind::MassDifference)?;
        Some(Self { list, indications, unit, places: Rows::File(Box::new(raw)) })
    }

    fn from_lists(engine: &'e Engine<'e>, block: &Block, pans: &[u32]) -> Option<Self> {
        let fields = block.fields();
        let Some(unit_text) = fields.text("unit") else {
            engine.complain(
                Problem::new(Code::FieldMissing, format!("The indications of {} have no unit.", block.name()))
                    .hint("Write `unit: mg`."),
                block.raw.name.place,
            );
            return None;
        };
        let unit = engine.keep(Unit::parse(&unit_text.text), unit_text.place)?;
        if unit.dimension() != crate::quantity::Dimension::MASS {
            let message = format!("Indications are in units of mass, but unit is {}.", unit_text.text);
            engine.complain(Problem::new(Code::DimensionMismatch, message).hint("Write mg, µg or g."), unit_text.place);
            return None;
        }
        let (mut list, mut rows, mut places) = (Vec::new(), Vec::new(), Vec::new());
        for (index, series) in fields.mappings("series").into_iter().enumerate() {
            let number = index as u32 + 1;
            let cycles = series.get("indications")?.as_list()?;
            let times = series_times(engine, series, cycles.len() * pans.len())?;
            for (cycle, node) in cycles.iter().enumerate() {
                let cells = node.as_list()?;
                if cells.len() != pans.len() {
                    let message = format!(
                        "A cycle of {} has {} weighings, but {} indications stand here.",
                        fields.words("cycle"),
                        pans.len(),
                        cells.len()
                    );
                    engine.complain(
                        Problem::new(Code::DesignIncomplete, message)
                            .hint("Complete the cycle, or leave it out with its rule and reason in the prose."),
                        node.place,
                    );
                    return None;
                }
                for (position, cell) in cells.iter().enumerate() {
                    rows.push(engine.keep(parse_number(cell.as_text().unwrap_or_default(), &unit), cell.place)?);
                    places.push(cell.place);
                    let time = times[cycle * pans.len() + position];
                    list.push(Weighing { series: number, cycle: cycle as u32 + 1, on_pan: pans[position], time });
                }
            }
        }
        let origin = Origin::ReadingList(places.clone().into());
        let label = format!("indications of {}", block.name());
        let draft = InputDraft::new(
            &format!("{}.indications", block.name()),
            "I",
            &label,
            Kind::MassDifference,
            unit.clone(),
            Value::column(rows),
            origin,
        );
        Some(Self { list, indications: engine.builder.input(draft), unit, places: Rows::Written(places) })
    }

    /// The cycles in order, each with its rows; a cycle whose weighings are not those of the scheme is complained of.
    pub fn cycles(&self, engine: &Engine, pans: &[u32], excluded: &[Excluded]) -> Option<Vec<Cycle>> {
        let mut cycles: Vec<Cycle> = Vec::new();
        for (row, weighing) in self.list.iter().enumerate() {
            let same = |cycle: &&mut Cycle| cycle.series == weighing.series && cycle.number == weighing.cycle;
            let cycle = match cycles.iter_mut().find(same) {
                Some(cycle) => cycle,
                None => {
                    let left_out =
                        excluded.iter().any(|other| other.series == weighing.series && other.cycle == weighing.cycle);
                    cycles.push(Cycle {
                        series: weighing.series,
                        number: weighing.cycle,
                        rows: vec![],
                        times: vec![],
                        b_on_pan: vec![],
                        excluded: left_out,
                    });
                    cycles.last_mut()?
                }
            };
            cycle.rows.push(row);
            cycle.times.push(weighing.time);
            cycle.b_on_pan.push(weighing.on_pan > 0);
        }
        for cycle in &cycles {
            let found: Vec<u32> = cycle.rows.iter().map(|row| self.list[*row].on_pan).collect();
            let rising = cycle.times.windows(2).all(|pair| pair[0] < pair[1]);
            if found != pans || !rising {
                let letters =
                    |list: &[u32]| list.iter().map(|pan| pan_letter(*pan, pans.len())).collect::<Vec<_>>().join(" ");
                let message = match rising {
                    true => format!(
                        "Cycle {} of series {} reads {}, but the scheme is {}.",
                        cycle.number,
                        cycle.series,
                        letters(&found),
                        letters(pans)
                    ),
                    false => format!("The times of cycle {} of series {} do not rise.", cycle.number, cycle.series),
                };
                engine.complain(Problem::new(Code::DesignIncomplete, message), self.place(engine, cycle.rows[0]));
                return None;
            }
        }
        Some(cycles)
    }
}

/// The number of the pan's load for the text of a row.
fn pan_of(text: &str, weighings: usize) -> Option<u32> {
    match text.trim().to_ascii_uppercase().as_str() {
        "A" => Some(0),
        "B" => Some(1),
        other => other.strip_prefix('B')?.parse().ok().filter(|number| (1..weighings as u32).contains(number)),
    }
}

/// The letter of a load.
pub fn pan_letter(pan: u32, weighings: usize) -> String {
    match pan {
        0 => "A".into(),
        1 if weighings <= 4 => "B".into(),
        number => format!("B{number}"),
    }
}

/// The times of a series: start and interval, or a list of times.
fn series_times(engine: &Engine, series: Fields<'_>, count: usize) -> Option<Vec<f64>> {
    if let Some(listed) = series.get("times").and_then(Node::as_list) {
        let texts: Vec<&Node> = listed
            .iter()
            .flat_map(|node| node.as_list().map_or_else(|| vec![node], |inner| inner.iter().collect()))
            .collect();
        let times: Option<Vec<f64>> = texts
            .iter()
            .map(|node| {
                Some(seconds_since(
                    epoch(),
                    engine.keep(crate::record::parse_instant(node.as_text().unwrap_or_default()), node.place)?,
                ))
            })
            .collect();
        let times = times?;
        if times.len() != count {
            let message = format!("{} times stand beside {count} indications.", times.len());
            engine.complain(Problem::new(Code::DesignIncomplete, message), series.place_of("times"));
            return None;
        }
        return Some(times);
    }
    let (Some(start), Some(super::given::Given::Stated { value: interval, .. })) =
        (series.instant("start"), series.given("interval", Kind::Duration))
    else {
        let problem = Problem::new(Code::FieldMissing, "A series needs start and interval, or times.");
        engine.complain(problem.hint("Write `start: 2041-03-12T09:12:00Z` and `interval: 90 s`."), series.place());
        return None;
    };
    let start = seconds_since(epoch(), start);
    Some((0..count).map(|index| start + interval.value * index as f64).collect())
}
