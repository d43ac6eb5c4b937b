//! Conventions that a gravimeter's report and the effects added back to its value must share.

use super::fields::Fields;
use super::gravity_check::stated_number;
use super::gravity_station::GRAVIMETER_CORRECTIONS;
use crate::diagnostic::{Code, Complaints, Problem};
use crate::method::air_pressure_effect;
use crate::quantity::Kind;

/// Normal pressures that agree to this, in Pa, are the same to what reports print.
const SAME_PRESSURE: f64 = 6.0;

/// How a value treats the permanent tide: the word, and the factor of a tide-free value.
#[derive(Debug, Clone, PartialEq)]
struct Treatment {
    word: String,
    factor: Option<f64>,
}

impl Treatment {
    fn of(fields: Fields<'_>) -> Option<Treatment> {
        let word = fields.text("permanent_tide")?.text;
        let factor = if word == "tide-free" { fields.number("permanent_tide_factor") } else { None };
        Some(Treatment { word, factor })
    }

    fn words(&self) -> String {
        match self.factor {
            Some(factor) => format!("{} with the factor {factor}", self.word),
            None => self.word.clone(),
        }
    }
}

/// Permanent tide and normal pressure must be the same in all determinations and in the effects added back.
pub(super) fn check_conventions(fields: Fields<'_>, complaints: &mut Complaints) {
    let determinations = fields.mappings("determinations");
    let tide = fields.mapping("tide");
    for holder in determinations.iter().copied().chain(tide) {
        let factor = holder.number("permanent_tide_factor");
        if holder.words("permanent_tide") == "tide-free" && factor.is_none() {
            let problem = Problem::new(Code::FieldMissing, "A tide-free value needs the factor its report used.");
            complaints.add_at(
                problem.hint("Write `permanent_tide_factor: 1.16` as the report says."),
                holder.place_of("permanent_tide"),
            );
        }
    }
    if let Some(tide) = tide.filter(|tide| tide.words("source") == "series") {
        for (name, meaning) in
            [("data", "the raw data of the series"), ("permanent_tide", "how the series treats the permanent tide")]
        {
            if tide.get(name).is_none() {
                let problem =
                    Problem::new(Code::FieldMissing, format!("The series of the tide lacks {name}: {meaning}."));
                complaints.add_at(problem.hint(format!("Write `{name}:` beside `source: series`.")), tide.place());
            }
        }
    }
    let Some(first) = determinations.first() else { return };
    let Some(expected) = Treatment::of(*first) else { return };
    for other in determinations.iter().skip(1).copied().chain(tide) {
        if let Some(found) = Treatment::of(other).filter(|found| *found != expected) {
            let message = format!(
                "The permanent tide is {} here, but {} in the first determination.",
                found.words(),
                expected.words()
            );
            let problem = Problem::new(Code::ConventionMismatch, message);
            complaints.add_at(
                problem.hint("Convert one of them, and state the convention it then follows."),
                other.place_of("permanent_tide"),
            );
        }
    }
    check_normal_pressures(fields, complaints);
    check_attraction(fields, complaints);
    for determination in determinations {
        check_corrections(determination, complaints);
    }
}

/// A profile measured with the balance in place holds the attraction of the balance already.
fn check_attraction(fields: Fields<'_>, complaints: &mut Complaints) {
    let present = fields.mapping("profile").is_some_and(|profile| profile.words("balance") == "present");
    if present && fields.get("self_attraction").is_some() {
        let message = "The profile was measured with the balance in its place and holds its attraction already.";
        let problem = Problem::new(Code::ConventionMismatch, message);
        complaints.add_at(problem.hint("Leave out `self_attraction:`."), fields.place_of("self_attraction"));
    }
}

fn check_corrections(determination: Fields<'_>, complaints: &mut Complaints) {
    for text in determination.texts("corrected_for") {
        if GRAVIMETER_CORRECTIONS.contains(&text.text.as_str()) {
            continue;
        }
        let message = format!("“{}” is no correction that the report of a gravimeter is asked about.", text.text);
        let hint = format!("Known are {}.", GRAVIMETER_CORRECTIONS.join(", "));
        complaints.add_at(Problem::new(Code::UndefinedReference, message).hint(hint), text.place);
    }
}

/// The normal pressure of the effect that is added back, in Pa: as stated, else that of the height above sea level.
fn normal_pressure(fields: Fields<'_>) -> Option<f64> {
    let air = fields.mapping("air_pressure")?;
    stated_number(air, "normal_pressure", Kind::Pressure).or_else(|| {
        let height = stated_number(fields, "height_above_sea_level", Kind::Height)?;
        air.get("normal_pressure").is_none().then(|| air_pressure_effect::normal_pressure(height))
    })
}

fn check_normal_pressures(fields: Fields<'_>, complaints: &mut Complaints) {
    let Some(air) = fields.mapping("air_pressure") else { return };
    if air.get("normal_pressure").is_none() && fields.get("height_above_sea_level").is_none() {
        let message = "The normal pressure follows from the height above sea level, which is not stated.";
        let problem = Problem::new(Code::FieldMissing, message);
        complaints.add_at(
            problem.hint("Write `height_above_sea_level:`, or the `normal_pressure:` of the report."),
            air.place(),
        );
        return;
    }
    let Some(expected) = normal_pressure(fields) else { return };
    for holder in fields.mappings("determinations") {
        let found = stated_number(holder, "normal_pressure", Kind::Pressure);
        let Some(found) = found.filter(|found| (found - expected).abs() > SAME_PRESSURE) else { continue };
        let message = format!(
            "The report's normal pressure is {:.2} hPa, but the effect of air pressure is added back against {:.2} hPa.",
            found / 100.0,
            expected / 100.0
        );
        let problem = Problem::new(Code::ConventionMismatch, message);
        let hint = "Write the report's value as `normal_pressure:` under `air_pressure:` too.";
        complaints.add_at(problem.hint(hint), holder.place_of("normal_pressure"));
    }
}
