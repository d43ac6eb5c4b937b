//! Columns of readings given in a block: a list written there, or a column of raw data.

use super::engine::Engine;
use super::field::{Field, Shape, optional};
use super::fields::Fields;
use super::raw_data::RawData;
use crate::diagnostic::{Code, Problem};
use crate::graph::{Distribution, InputDraft, Origin, Quantity, Value};
use crate::quantity::{Kind, Unit, parse_number};
use crate::record::{Node, Text};

/// The fields of a column.
pub const COLUMN_FIELDS: &[Field] = &[
    optional("values", Shape::Numbers, "the readings, written here"),
    optional("unit", Shape::Text, "their unit"),
    optional("data", Shape::Name, "raw data, instead of values"),
    optional("column", Shape::Text, "the name of the column in the raw data"),
    optional("label", Shape::Text, "what the readings are, in words"),
];

/// A column read: its node and what is known of it.
#[derive(Clone)]
pub struct Column<'e> {
    pub quantity: Quantity<'e>,
    /// The unit it was given in.
    pub unit: Unit,
    pub label: String,
    /// Its values in coherent SI units.
    pub rows: Vec<f64>,
}

impl Column<'_> {
    /// The unit of differences of its values: kelvin for temperatures in °C.
    pub fn difference_unit(&self) -> Unit {
        difference_unit(&self.unit)
    }
}

/// The unit of differences of values given in `unit`: kelvin for °C.
pub fn difference_unit(unit: &Unit) -> Unit {
    if unit.is_celsius() { Unit::parse("K").unwrap_or_else(|_| Unit::one()) } else { unit.clone() }
}

/// The column as an input of the graph; a scale temperature in °C becomes kelvin.
pub fn read_column<'e>(
    engine: &'e Engine<'e>,
    fields: Fields<'_>,
    path: &str,
    symbol: &str,
    label: &str,
) -> Option<Column<'e>> {
    let label = fields.text("label").map_or_else(|| label.to_string(), |text| text.text);
    match fields.text("data") {
        Some(data) => from_raw_data(engine, &data, fields, path, symbol, label),
        None => from_list(engine, fields, path, symbol, label),
    }
}

fn from_raw_data<'e>(
    engine: &'e Engine<'e>,
    data: &Text,
    fields: Fields<'_>,
    path: &str,
    symbol: &str,
    label: String,
) -> Option<Column<'e>> {
    let raw = RawData::find(engine, data)?;
    let column = fields.text("column").map_or_else(|| symbol.to_string(), |text| text.text);
    let (_, unit) = raw.numbers(engine, &column, Kind::Plain)?;
    let kind = if unit.is_celsius() { Kind::Temperature } else { Kind::Plain };
    let input = raw.input(engine, &column, path, symbol, &label, kind, Distribution::Exact)?;
    Some(Column { quantity: input.as_kind(Kind::Plain), unit, label, rows: input.rows() })
}

fn from_list<'e>(
    engine: &'e Engine<'e>,
    fields: Fields<'_>,
    path: &str,
    symbol: &str,
    label: String,
) -> Option<Column<'e>> {
    let Some(items) = fields.get("values").and_then(Node::as_list) else {
        let problem = Problem::new(Code::FieldMissing, "A column needs either values or data.");
        engine.complain(
            problem.hint("Write `values: [1.2, 1.3]` with `unit:`, or `data:` with `column:`."),
            fields.place(),
        );
        return None;
    };
    let Some(unit_text) = fields.text("unit") else {
        let problem = Problem::new(Code::BareNumber, "The values of this column have no unit.");
        engine.complain(problem.hint("Write `unit: K`, or `unit: 1` for plain numbers."), fields.place());
        return None;
    };
    let unit = engine.keep(Unit::parse(&unit_text.text), unit_text.place)?;
    let mut rows = Vec::new();
    for item in items {
        rows.push(engine.keep(parse_number(item.as_text().unwrap_or_default(), &unit), item.place)?);
    }
    let places = items.iter().map(|item| item.place).collect();
    let origin = Origin::ReadingList(places);
    let draft = InputDraft::new(path, symbol, &label, Kind::Plain, unit.clone(), Value::column(rows.clone()), origin);
    Some(Column { quantity: engine.builder.input(draft), unit, label, rows })
}
