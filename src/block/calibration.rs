//! The calibration that was valid on the day of use.

use super::engine::{Block, Engine};
use super::fields::Fields;
use super::given::Given;
use crate::diagnostic::{Code, Complaints, Problem};
use crate::graph::Quantity;
use crate::intake::Place;
use crate::quantity::Kind;
use chrono::NaiveDate;

/// Chooses the calibration for `day`: the newest dated on or before it.
///
/// A certificate past its due date on that day, or no calibration by then, is complained of.
pub fn valid_calibration<'n>(
    engine: &Engine,
    owner: &str,
    fields: Fields<'n>,
    day: NaiveDate,
    used_at: Place,
) -> Option<Fields<'n>> {
    let calibrations = fields.mappings("calibrations");
    let dated = |fields: &Fields<'n>| fields.date("date");
    let newest = calibrations
        .iter()
        .copied()
        .filter(|calibration| dated(calibration).is_some_and(|date| date <= day))
        .max_by_key(dated);
    let Some(chosen) = newest else {
        let message = match calibrations.iter().filter_map(dated).min() {
            Some(first) => format!("{owner} was used on {day}, before its first calibration of {first}."),
            None => format!("{owner} was used on {day}, but it has no calibration."),
        };
        let place = fields.get("calibrations").map_or(fields.place(), |node| node.place);
        let problem =
            Problem::new(Code::CertificateMissing, message).hint("Enter the certificate that was valid on that day.");
        let mut complaint = problem.at(place);
        complaint.hints.push(crate::diagnostic::Hint { text: "It is used here.".into(), place: Some(used_at) });
        engine.complain_all(crate::diagnostic::Complaints { list: vec![complaint] });
        return None;
    };
    if let Some(due) = chosen.date("due").filter(|due| *due < day) {
        let message = format!(
            "The certificate {} of {owner} was due on {due}, but {owner} was used on {day}.",
            chosen.words("certificate")
        );
        let problem = Problem::new(Code::CertificateExpired, message).hint(
            "Enter the newer certificate, or weigh again with a standard or instrument in its calibration period.",
        );
        let complaint = problem.at(chosen.place_of("due")).hint_at("It is used here.", used_at);
        engine.complain_all(crate::diagnostic::Complaints { list: vec![complaint] });
        return None;
    }
    Some(chosen)
}

/// The path of a value of a calibration: plain where there is one calibration, else with the certificate.
pub fn calibration_path(block: &str, fields: Fields<'_>, calibration: Fields<'_>, name: &str) -> String {
    if fields.mappings("calibrations").len() < 2 {
        return format!("{block}.{name}");
    }
    let certificate: String =
        calibration.words("certificate").chars().map(|c| if c.is_ascii_alphanumeric() { c } else { '_' }).collect();
    format!("{block}.{name}.{certificate}")
}

/// A value that a block states by itself, or in the calibration that was valid on `day`.
pub struct Certified<'n> {
    pub given: Given,
    pub path: String,
    pub label: String,
    /// The mapping the value stands in: the block's own, or the calibration's.
    pub holder: Fields<'n>,
}

impl Certified<'_> {
    /// The input of the graph, or the result referred to.
    pub fn input<'e>(&self, engine: &'e Engine<'e>, symbol: &str, kind: Kind) -> Option<Quantity<'e>> {
        engine.given(&self.given, &self.path, symbol, &self.label, kind)
    }
}

/// The value of `field` in the block itself, else in its calibration valid on `day`.
///
/// `name` is the value's own path behind the block's name, `words` says in words what it is.
pub fn certified_on<'e>(
    engine: &Engine,
    block: &'e Block,
    (field, kind): (&str, Kind),
    (name, words): (&str, &str),
    day: NaiveDate,
    used_at: Place,
) -> Option<Certified<'e>> {
    let fields = block.fields();
    if let Some(given) = fields.given(field, kind) {
        let path = format!("{}.{name}", block.name());
        return Some(Certified { given, path, label: format!("{words} of {}", block.label()), holder: fields });
    }
    let calibration = valid_calibration(engine, block.name(), fields, day, used_at)?;
    let path = calibration_path(block.name(), fields, calibration, name);
    let label = format!("{words} of {}, certificate {}", block.label(), calibration.words("certificate"));
    Some(Certified { given: calibration.given(field, kind)?, path, label, holder: calibration })
}

/// Checks that a value stands in the block or in dated calibrations, and not in both.
pub fn check_one_source(fields: Fields<'_>, field: &str, complaints: &mut Complaints) {
    let found = (fields.get(field).is_some(), fields.get("calibrations").is_some());
    if found.0 == found.1 {
        let message = match found.0 {
            true => format!("The value of {field} stands in the block, and calibrations are listed too."),
            false => format!("Neither {field} nor calibrations that state it are given."),
        };
        let problem = Problem::new(Code::FieldMissing, message)
            .hint(format!("Write `{field}:` once: in the block itself, or in each of its dated calibrations."));
        complaints.add_at(problem, fields.place());
    }
}

/// Checks that a value has the dimension of `unit`, and an uncertainty where one is needed.
pub fn check_dimension(holder: Fields<'_>, field: &str, unit: &str, uncertain: bool, complaints: &mut Complaints) {
    let Some(Given::Stated { value, place }) = holder.given(field, Kind::Plain) else { return };
    let expected = crate::method::unit(unit);
    if value.unit.dimension() != expected.dimension() {
        let message = format!("{field} is {}, but a value in {} is expected.", value.text, expected.text());
        let problem = Problem::new(Code::DimensionMismatch, message);
        complaints.add_at(problem.hint(format!("Write it in {} or a unit of its kind.", expected.text())), place);
    } else if uncertain && value.standard_uncertainty().is_none() {
        let problem = Problem::new(Code::UncertaintyMissing, format!("The {field} {} has no uncertainty.", value.text));
        complaints.add_at(
            problem
                .hint("Write it with its standard uncertainty in brackets, or `± U (k = 2)`; a bound is `0.0(5)e-9`."),
            place,
        );
    }
}
