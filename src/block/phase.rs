//! What the two phases of a balance have in common: columns with their units, and values a column can plausibly hold.

use super::engine::Engine;
use super::raw_data::{RawData, epoch};
use crate::diagnostic::{Code, Problem};
use crate::graph::{InputDraft, Origin, Quantity, ReadingColumn, Value};
use crate::intake::Place;
use crate::method::unit;
use crate::quantity::{Dimension, Kind};
use crate::record::Text;
use chrono::NaiveDate;

/// A column that a phase needs: its name, symbol, meaning, kind and unit.
pub struct WantedColumn {
    pub name: &'static str,
    pub symbol: &'static str,
    pub label: &'static str,
    pub kind: Kind,
    /// A unit of the dimension expected, for plain quantities.
    pub unit: &'static str,
    /// The least and the largest value that make sense, in coherent SI units.
    pub plausible: (f64, f64),
}

/// The raw data of a phase.
pub struct PhaseData<'e> {
    pub engine: &'e Engine<'e>,
    pub raw: RawData,
    /// Name of the block.
    pub name: &'e str,
    /// Where the block names its data.
    pub place: Place,
}

impl<'e> PhaseData<'e> {
    /// The raw data that a block names.
    pub fn find(engine: &'e Engine<'e>, name: &'e str, data: &Text) -> Option<PhaseData<'e>> {
        Some(PhaseData { engine, raw: RawData::find(engine, data)?, name, place: data.place })
    }

    /// The rows of a column in coherent SI units; a column of another dimension, or with values that cannot be, is
    /// complained of.
    pub fn rows(&self, wanted: &WantedColumn) -> Option<Vec<f64>> {
        let (rows, found) = self.raw.numbers(self.engine, wanted.name, wanted.kind)?;
        let expected = unit(wanted.unit);
        if found.dimension() != expected.dimension() {
            let message = format!(
                "The column {} is in {}, but {} in a unit such as {} is expected.",
                wanted.name,
                found.text(),
                wanted.label,
                wanted.unit
            );
            let problem = Problem::new(Code::DimensionMismatch, message);
            self.engine
                .complain(problem.hint("Correct its unit, or the head it is read from."), self.column(wanted.name));
            return None;
        }
        let (least, largest) = wanted.plausible;
        if let Some(row) = rows.iter().position(|value| !(least..=largest).contains(value)) {
            let scale = expected.difference_to_si(1.0);
            let shown = |si: f64| if expected.is_celsius() { si - 273.15 } else { si / scale };
            let message = format!(
                "The column {} ({}) holds {:.6} {} here; between {} {} and {} {} would make sense.",
                wanted.name,
                wanted.label,
                shown(rows[row]),
                wanted.unit,
                shown(least),
                wanted.unit,
                shown(largest),
                wanted.unit
            );
            let hint = "Look whether two columns are exchanged, or the unit is another than the record says.";
            self.engine.complain(Problem::new(Code::ColumnImplausible, message).hint(hint), self.line(row));
            return None;
        }
        Some(rows)
    }

    /// A column as an input of the graph, after the checks of [`PhaseData::rows`].
    pub fn input(&self, wanted: &WantedColumn) -> Option<Quantity<'e>> {
        let rows = self.rows(wanted)?;
        self.declare(wanted, &rows)
    }

    /// The rows of a column that was checked already, as an input of the graph.
    pub fn declare(&self, wanted: &WantedColumn, rows: &[f64]) -> Option<Quantity<'e>> {
        let path = format!("{}.{}", self.name, wanted.name);
        let label = format!("{} of {}", wanted.label, self.name);
        let (head, unit) = self.raw.head(wanted.name)?;
        let origin =
            Origin::Readings(ReadingColumn { file: self.raw.file, column: head, lines: self.raw.lines.clone() });
        let value = Value::column(rows);
        let draft = InputDraft::new(&path, wanted.symbol, &label, wanted.kind, unit, value, origin);
        Some(self.engine.builder.input(draft))
    }

    /// The line of a row.
    pub fn line(&self, row: usize) -> Place {
        self.raw.line(self.engine, row)
    }

    /// Where the record declares a column.
    pub fn column(&self, name: &str) -> Place {
        self.raw.column_place(name)
    }

    /// Complains that a time does not follow the one before.
    pub fn times(&self) -> Option<Vec<f64>> {
        let times = self.raw.times(self.engine)?;
        if let Some(row) = (1..times.len()).find(|row| times[*row] <= times[row - 1]) {
            let message =
                format!("The time of this row is {:.3} s before that of the row above.", times[row - 1] - times[row]);
            let problem = Problem::new(Code::TimeUnreadable, message);
            self.engine.complain(problem.hint("Rows stand in the order in which they were taken."), self.line(row));
            return None;
        }
        Some(times)
    }
}

impl PhaseData<'_> {
    /// The day of the first row.
    pub fn day(&self, times: &[f64]) -> Option<NaiveDate> {
        let first = epoch() + chrono::Duration::seconds(*times.first()? as i64);
        Some(first.date_naive())
    }
}

/// An exact column of a dimension, such as positions from a reference.
pub fn exact_column<'e>(engine: &'e Engine<'e>, rows: Vec<f64>, dimension: Dimension) -> Quantity<'e> {
    engine.builder.exact(Value::column(rows), dimension, Kind::Plain)
}

/// The mean over some rows of a column.
pub fn mean_of<'e>(column: Quantity<'e>, rows: &[usize]) -> Quantity<'e> {
    let weight = 1.0 / rows.len().max(1) as f64;
    column.mix(vec![rows.iter().map(|row| (*row as u32, weight)).collect()]).row(0)
}

/// Means over groups of rows, as a column.
pub fn means_of<'e>(column: Quantity<'e>, groups: &[Vec<usize>]) -> Quantity<'e> {
    let weights = |rows: &Vec<usize>| {
        let weight = 1.0 / rows.len().max(1) as f64;
        rows.iter().map(|row| (*row as u32, weight)).collect()
    };
    column.mix(groups.iter().map(weights).collect())
}
