//! A value as given in a field: stated in place, or referring to a result.

use crate::diagnostic::{Code, Complaint, Problem};
use crate::graph::Distribution;
use crate::intake::Place;
use crate::quantity::{Kind, Shape, StatedUncertainty, StatedValue, parse_plain_value, parse_value};
use crate::record::{Node, Text};

/// What stands in a field for a value.
#[derive(Debug, Clone, PartialEq)]
pub enum Given {
    Stated {
        value: Box<StatedValue>,
        place: Place,
    },
    /// `from W3.mass`: the same node, not a copy.
    Reference(Text),
}

/// Keys allowed beside `value` in the long form.
const LONG_FORM: &[&str] = &["value", "u", "degrees_of_freedom", "note", "at", "origin"];

/// Reads a value in short or long form.
///
/// # Errors
/// Those of the notation, at the place of the text.
pub fn read_given(node: &Node, kind: Kind, owner: &str) -> Result<Given, Box<Complaint>> {
    let fail = |problem: Problem, place: Place| Box::new(problem.at(place));
    if let Some(text) = node.as_text() {
        if let Some(path) = text.strip_prefix("from ") {
            return Ok(Given::Reference(Text { text: path.trim().into(), place: node.place }));
        }
        let parsed = match kind {
            Kind::Plain => parse_plain_value(text),
            kind => parse_value(text, kind),
        };
        return parsed
            .map(|value| Given::Stated { value: Box::new(value), place: node.place })
            .map_err(|problem| fail(naming(problem, owner), node.place));
    }
    let Some(entries) = node.as_map() else {
        return Err(fail(
            Problem::new(Code::ShapeMismatch, format!("A value is expected as {owner}, found {}.", node.describe())),
            node.place,
        ));
    };
    if let Some(entry) = entries.iter().find(|entry| !LONG_FORM.contains(&entry.key.text.as_str())) {
        let message = format!("The field {} is not known in {owner}.", entry.key.text);
        return Err(fail(
            Problem::new(Code::FieldUnknown, message).hint(format!("Known fields: {}.", LONG_FORM.join(", "))),
            entry.key.place,
        ));
    }
    let Some(inner) = node.get("value") else {
        return Err(fail(
            Problem::new(Code::FieldMissing, format!("The field value is missing from {owner}.")),
            node.place,
        ));
    };
    let given = read_given(inner, kind, owner)?;
    with_stated_uncertainty(given, node, kind, owner)
}

/// Applies `u` and `degrees_of_freedom` of the long form.
fn with_stated_uncertainty(given: Given, node: &Node, kind: Kind, owner: &str) -> Result<Given, Box<Complaint>> {
    let Given::Stated { mut value, place } = given else { return Ok(given) };
    if let Some(u) = node.get("u") {
        let text = u.as_text().unwrap_or_default();
        let parsed = parse_value(text, kind.of_difference());
        let stated = parsed.map_err(|problem| Box::new(naming(problem, &format!("u of {owner}")).at(u.place)))?;
        if value.uncertainty != StatedUncertainty::None {
            let message = format!("{owner} states an uncertainty twice: with its value and as u.");
            return Err(Box::new(Problem::new(Code::DoubleUncertainty, message).at(u.place)));
        }
        value.uncertainty = StatedUncertainty::Standard { u: stated.value };
        value.text = format!("{}, u = {text}", value.text);
    }
    if let Some(freedom) = node.get("degrees_of_freedom") {
        let number = super::field::number(freedom.as_text().unwrap_or_default());
        value.degrees_of_freedom = number.map_err(|problem| Box::new(problem.at(freedom.place)))?;
    }
    Ok(Given::Stated { value, place })
}

/// Says in the message which field is meant.
fn naming(mut problem: Problem, owner: &str) -> Problem {
    if !problem.message.contains(owner) {
        problem.message = format!("{} ({owner}).", problem.message.trim_end_matches('.'));
    }
    if problem.hints.is_empty() {
        problem.hints.push("Correct the value and its unit, or move it to the field it belongs to.".into());
    }
    problem
}

/// The distribution that a stated uncertainty assigns to its quantity (JCGM 100, 4.3; JCGM 101, 6.4).
pub fn distribution_of(value: &StatedValue) -> Distribution {
    let half = |half_width: f64, shape: Shape| match shape {
        Shape::Rectangular => Distribution::Rectangular { half_width },
        Shape::Triangular => Distribution::Triangular { half_width },
        Shape::Arcsine => Distribution::Arcsine { half_width },
    };
    let spread = |u: f64| match value.degrees_of_freedom {
        freedom if freedom.is_finite() => Distribution::StudentT { scale: u },
        _ => Distribution::Normal { standard_uncertainty: u },
    };
    match value.uncertainty {
        StatedUncertainty::None => Distribution::Exact,
        StatedUncertainty::Standard { u } => spread(u),
        StatedUncertainty::Expanded { expanded, coverage_factor } => spread(expanded / coverage_factor),
        StatedUncertainty::HalfWidth { half_width, shape } => half(half_width, shape),
        StatedUncertainty::Limits { lower, upper, shape } => half((upper - lower) / 2.0, shape),
    }
}
