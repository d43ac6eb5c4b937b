//! Every named quantity with its uncertainty: the results a run gives, for terminal, JSON and CSV.
//!
//! The JSON is a versioned shape. Additions keep the number; a changed meaning raises it.

use crate::block::Engine;
use crate::graph::{Graph, NodeId, Op, Origin, Sensitivities, degrees_of_freedom, sensitivities, standard_uncertainty};
use crate::intake::Sources;
use crate::quantity::{Dimension, Style, Unit, choose_unit};
use serde::Serialize;

/// The version of the JSON shape of results.
pub const RESULTS_FORMAT: u32 = 1;

/// Where a quantity's number comes from.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct ListedOrigin {
    /// reading, stated input, constant, assumption, computed.
    pub what: String,
    /// Path of the record or raw data file, where there is one.
    pub file: Option<String>,
    /// Line, from 1; the first line of a column.
    pub line: Option<u32>,
    /// Name of the method, or source of the constant.
    pub by: Option<String>,
}

/// One named quantity.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct Listed {
    pub name: String,
    pub symbol: String,
    pub label: String,
    pub kind: String,
    pub state: Option<String>,
    pub basis: Option<String>,
    /// The unit of `printed`.
    pub unit: String,
    /// The coherent SI unit of `value` and `standard_uncertainty`.
    pub si_unit: String,
    /// In coherent SI units; none for a column.
    pub value: Option<f64>,
    /// In coherent SI units; none for a column.
    pub standard_uncertainty: Option<f64>,
    /// None when infinite.
    pub degrees_of_freedom: Option<f64>,
    /// Number of rows, for a column.
    pub rows: Option<usize>,
    pub printed: String,
    pub origin: ListedOrigin,
    /// The text as the author typed it, for a stated input.
    pub typed: Option<String>,
}

/// The results of a run.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct Results {
    pub format: u32,
    pub engine: String,
    pub laboratory: String,
    pub coverage_probability: f64,
    pub quantities: Vec<Listed>,
    pub assumptions: Vec<String>,
}

/// Every named quantity of the graph, in order of name.
pub fn list_results(engine: &Engine) -> Results {
    let graph = engine.graph();
    let sources = engine.sources();
    let style = engine.laboratory.style;
    Results {
        format: RESULTS_FORMAT,
        engine: crate::VERSION.into(),
        laboratory: engine.laboratory.name.clone(),
        coverage_probability: engine.laboratory.settings.coverage_probability,
        quantities: graph.names.values().map(|id| listed(&graph, &sources, *id, style)).collect(),
        assumptions: assumptions(engine),
    }
}

/// Values used that nobody wrote, in words.
pub fn assumptions(engine: &Engine) -> Vec<String> {
    let of_graph = engine.builder.assumptions().into_iter().map(|assumption| assumption.text);
    let mut list: Vec<String> = engine.laboratory.assumed.iter().cloned().chain(of_graph).collect();
    list.dedup();
    list
}

fn listed(graph: &Graph, sources: &Sources, id: NodeId, style: Style) -> Listed {
    let node = graph.node(id);
    let value = graph.value(id);
    let scalar = value.length().is_none();
    let derivatives = scalar.then(|| sensitivities(graph, id));
    let uncertainty = derivatives.as_ref().map(|of| standard_uncertainty(graph, of));
    let freedom = derivatives.as_ref().map(|of| degrees_of_freedom(graph, of)).filter(|freedom| freedom.is_finite());
    let name = node.name.clone();
    let unit_text = name.as_ref().map_or_else(String::new, |name| name.unit.text_or_one());
    Listed {
        name: name.as_ref().map_or_else(String::new, |name| name.path.clone()),
        symbol: name.as_ref().map_or_else(String::new, |name| name.symbol.clone()),
        label: name.as_ref().map_or_else(String::new, |name| name.label.clone()),
        kind: node.kind.word().into(),
        state: node.state.map(|state| state.word().into()),
        basis: node.basis.as_ref().map(|basis| basis.to_string()),
        unit: unit_text,
        si_unit: node.dimension.to_string(),
        value: scalar.then(|| value.number()),
        standard_uncertainty: uncertainty,
        degrees_of_freedom: freedom,
        rows: value.length(),
        printed: derivatives
            .map_or_else(|| format!("{} values", value.rows().len()), |of| print_quantity(graph, id, &of, style)),
        origin: listed_origin(sources, &node.origin),
        typed: graph.input(id).and_then(|input| input.text.clone()),
    }
}

/// Decimals of an exact value that are still printed out; beyond them, and beyond six zeros before the marker, a power of ten is.
const MOST_DECIMALS: i32 = 15;
const MOST_ZEROS: i32 = -6;

/// A quantity as text: value and standard uncertainty in its own unit, or the value alone when it is exact.
pub fn print_quantity(graph: &Graph, id: NodeId, of: &Sensitivities, style: Style) -> String {
    let Some(name) = &graph.node(id).name else { return String::new() };
    let (value, u) = (graph.number(id), standard_uncertainty(graph, of));
    if u > 0.0 {
        let in_own = style.standard(value, u, &name.unit);
        return in_own
            .or_else(|_| style.standard(value, u, &choose_unit(u, &name.unit)))
            .unwrap_or_else(|problem| problem.message);
    }
    let decimals = exact_decimals(graph, id, value, &name.unit);
    if name.unit.dimension() != Dimension::TEMPERATURE && !(MOST_ZEROS..=MOST_DECIMALS).contains(&decimals) {
        return print_constant(value, &name.unit, style);
    }
    style.value(value, &name.unit, decimals.clamp(0, MOST_DECIMALS)).unwrap_or_else(|problem| problem.message)
}

/// An exact value with the digits it has, at most fifteen, and a power of ten where it reads better.
pub fn print_constant(value: f64, unit: &Unit, style: Style) -> String {
    let shortest = format!("{:e}", unit.difference_decimal_from_si(value).map_or(value, |decimal| decimal.to_f64()));
    let mantissa = shortest.split('e').next().unwrap_or_default();
    let digits = mantissa.chars().filter(char::is_ascii_digit).count();
    style.difference(value, unit, digits.min(15)).unwrap_or_else(|problem| problem.message)
}

/// Digits shown of a statistic.
const STATISTIC_DIGITS: usize = 6;

/// The decimals of a value without uncertainty: those it has, for a statistic those of six significant digits.
pub fn exact_decimals(graph: &Graph, id: NodeId, value: f64, unit: &Unit) -> i32 {
    let Some(decimal) = unit.decimal_from_si(value) else { return 0 };
    match graph.node(id).op {
        Op::Output(..) => decimal.decimals().min(decimal.rounded_to_digits(STATISTIC_DIGITS).decimals()),
        _ => decimal.decimals(),
    }
}

fn listed_origin(sources: &Sources, origin: &Origin) -> ListedOrigin {
    let mut listed = ListedOrigin { what: origin.word().into(), file: None, line: None, by: None };
    if let Some(place) = origin.place() {
        let (path, line, _) = sources.locate(place);
        listed.file = Some(path.into());
        listed.line = Some(line as u32);
    }
    match origin {
        Origin::Readings(column) => {
            listed.file = Some(sources.file(column.file).path.clone());
            listed.line = column.lines.first().copied();
            listed.by = Some(format!("column {}", column.column));
        }
        Origin::Computed(method) => listed.by = Some(method.name.into()),
        Origin::Constant(source) => listed.by = Some((*source).into()),
        Origin::Assumed(reason) => listed.by = Some((*reason).into()),
        _ => {}
    }
    listed
}

impl Results {
    /// The results as JSON, one quantity after the other, ending with a line break.
    pub fn json(&self) -> String {
        let mut text = serde_json::to_string_pretty(self).unwrap_or_default();
        text.push('\n');
        text
    }

    /// The results as CSV with a line of heads.
    pub fn csv(&self) -> String {
        let mut writer = csv::Writer::from_writer(Vec::new());
        let heads = [
            "name",
            "label",
            "kind",
            "state",
            "basis",
            "unit",
            "si_unit",
            "value",
            "standard_uncertainty",
            "degrees_of_freedom",
            "printed",
            "file",
            "line",
        ];
        let mut written = writer.write_record(heads);
        for one in &self.quantities {
            let number = |value: Option<f64>| value.map(|value| format!("{value:e}")).unwrap_or_default();
            written = written.and_then(|()| {
                writer.write_record([
                    one.name.as_str(),
                    &one.label,
                    &one.kind,
                    one.state.as_deref().unwrap_or(""),
                    one.basis.as_deref().unwrap_or(""),
                    &one.unit,
                    &one.si_unit,
                    &number(one.value),
                    &number(one.standard_uncertainty),
                    &number(one.degrees_of_freedom),
                    &one.printed,
                    one.origin.file.as_deref().unwrap_or(""),
                    &one.origin.line.map(|line| line.to_string()).unwrap_or_default(),
                ])
            });
        }
        // Writing into memory does not fail.
        let _ = written;
        String::from_utf8(writer.into_inner().unwrap_or_default()).unwrap_or_default()
    }
}
