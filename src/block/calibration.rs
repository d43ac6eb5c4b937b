//! The calibration that was valid on the day of use.

use super::engine::Engine;
use super::fields::Fields;
use crate::diagnostic::{Code, Problem};
use crate::intake::Place;
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
