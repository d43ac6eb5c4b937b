//! Checks of a gravity station that need no other block: dimensions, uncertainties, and conventions that must agree.

use super::fields::Fields;
use super::given::{Given, read_given};
use super::gravity_station::stated_number;
use crate::diagnostic::{Code, Complaints, Problem};
use crate::method::unit;
use crate::quantity::{Axis, Dimension, Kind, parse_coordinate};

/// Normal pressures that agree to this, in Pa, are the same to what reports print.
const SAME_PRESSURE: f64 = 6.0;

/// Everything about a station that its fields alone tell.
pub fn check(fields: Fields<'_>, complaints: &mut Complaints) {
    for (name, axis) in [("latitude", Axis::Latitude), ("longitude", Axis::Longitude)] {
        if let Some(text) = fields.text(name) {
            complaints.keep(parse_coordinate(&text.text, axis).map_err(sentence), text.place);
        }
    }
    check_values(fields, complaints);
    check_profile(fields, complaints);
    check_heights(fields, complaints);
    check_conventions(fields, complaints);
}

/// A problem of a notation as a whole sentence, with its advice.
fn sentence(problem: Problem) -> Problem {
    let mut letters = problem.message.chars();
    let first = letters.next().map(|first| first.to_uppercase().to_string()).unwrap_or_default();
    let message = format!("{first}{}.", letters.as_str().trim_end_matches('.'));
    let hints = problem.hints.iter().map(|hint| {
        let mut letters = hint.chars();
        let first = letters.next().map(|first| first.to_uppercase().to_string()).unwrap_or_default();
        format!("{first}{}.", letters.as_str().trim_end_matches('.'))
    });
    let mut hints: Vec<String> = hints.collect();
    if hints.is_empty() {
        hints.push("Write `latitude: 47.312° N` and `longitude: 8.415° E`.".into());
    }
    Problem { message, hints, ..problem }
}

/// Dimensions of all values, and uncertainties where a value cannot go without.
fn check_values(fields: Fields<'_>, complaints: &mut Complaints) {
    let acceleration = "nm/s2";
    for determination in fields.mappings("determinations") {
        expect(determination, "value", "m/s2", true, complaints);
        expect(determination, "gradient", "nm s-2 m-1", false, complaints);
    }
    for name in ["change_since_determination", "change_between_determinations", "self_attraction", "hydrology"] {
        expect(fields, name, acceleration, false, complaints);
    }
    let inner = [
        ("profile", "gradient", "nm s-2 m-1", true),
        ("profile", "second_coefficient", "nm s-2 m-2", true),
        ("tie", "value", acceleration, true),
        ("tide", "scale", "1", false),
        ("air_pressure", "admittance", "nm s-2 hPa-1", true),
        ("polar_motion", "effect", acceleration, false),
    ];
    for (holder, name, unit_text, needs_uncertainty) in inner {
        if let Some(holder) = fields.mapping(holder) {
            expect(holder, name, unit_text, needs_uncertainty, complaints);
        }
    }
}

/// A value must have the dimension of this unit; a missing uncertainty is said where it is needed.
pub(super) fn expect(
    fields: Fields<'_>,
    name: &str,
    unit_text: &str,
    needs_uncertainty: bool,
    complaints: &mut Complaints,
) {
    let Some(node) = fields.get(name) else { return };
    let Ok(Given::Stated { value, place }) = read_given(node, Kind::Plain, name) else { return };
    let wanted = unit(unit_text).dimension();
    if value.unit.dimension() != wanted {
        let message =
            format!("The {} {} has the wrong dimension: a value in {unit_text} is expected.", words(name), value.text);
        complaints.add_at(
            Problem::new(Code::DimensionMismatch, message).hint(format!("Write it in a unit such as {unit_text}.")),
            place,
        );
    } else if needs_uncertainty && value.standard_uncertainty().is_none() {
        let message = format!("The {} {} has no uncertainty.", words(name), value.text);
        let problem = Problem::new(Code::UncertaintyMissing, message);
        complaints.add_at(problem.hint("Write its standard uncertainty in brackets, or `± … (k = 2)`."), place);
    }
}

fn words(name: &str) -> String {
    name.replace('_', " ")
}

fn check_profile(fields: Fields<'_>, complaints: &mut Complaints) {
    let Some(profile) = fields.mapping("profile") else { return };
    let (gradient, second) = (profile.get("gradient"), profile.get("second_coefficient"));
    if gradient.is_none() {
        let problem = Problem::new(Code::FieldMissing, "The profile has no gradient.");
        complaints.add_at(problem.hint("Write `gradient: -2976.5(200) nm s-2 m-1`."), profile.place());
    }
    let both_stated = [gradient, second]
        .iter()
        .flatten()
        .filter(|node| !matches!(node.as_text(), Some(text) if text.starts_with("from ")))
        .count()
        == 2;
    let r = profile.number("correlation");
    if both_stated && r.is_none() {
        let problem = Problem::new(
            Code::FieldMissing,
            "The two coefficients of the profile stand without their correlation, which changes the uncertainty several times.",
        );
        complaints.add_at(problem.hint("Write the `correlation:` of the fit, usually near -0.95."), profile.place());
    }
    let holders = fields.mappings("determinations").into_iter().chain([profile]);
    for holder in holders {
        if let Some(r) = holder.number("correlation").filter(|r| !(-1.0..=1.0).contains(r)) {
            let problem = Problem::new(
                Code::CorrelationImpossible,
                format!("The correlation coefficient {r} is not between -1 and 1."),
            );
            complaints.add_at(problem.hint("Take it from the report again."), holder.place_of("correlation"));
        }
    }
}

fn check_heights(fields: Fields<'_>, complaints: &mut Complaints) {
    if fields.get("height_above_sea_level").is_none() && fields.get("height_above_ellipsoid").is_none() {
        let problem =
            Problem::new(Code::FieldMissing, "The station has no height above sea level or above the ellipsoid.");
        complaints.add_at(problem.hint("Write `height_above_sea_level: 423 m`."), fields.place_of("latitude"));
    }
    let determinations = fields.mappings("determinations");
    if determinations.is_empty() {
        let problem = Problem::new(Code::DesignIncomplete, "The station has no determination of gravity.");
        complaints.add_at(problem.hint("List at least one absolute value."), fields.place_of("determinations"));
    }
    for determination in &determinations {
        if determination.get("effective_height").is_some() != determination.get("gradient").is_some() {
            let problem = Problem::new(
                Code::FieldMissing,
                "An effective height needs the gradient of the report, and the gradient an effective height.",
            );
            complaints.add_at(problem.hint("Write both as the report states them, or neither when the value already holds at the effective height."), determination.place());
        }
    }
    let mut days: Vec<_> =
        determinations.iter().filter_map(|one| Some((one.date("date")?, one.place_of("date")))).collect();
    days.sort();
    if let Some(pair) = days.windows(2).find(|pair| pair[0].0 == pair[1].0) {
        let problem = Problem::new(Code::DesignIncomplete, format!("Two determinations are dated {}.", pair[1].0));
        complaints.add_at(problem.hint("Combine them first, or correct a date."), pair[1].1);
    }
}

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
fn check_conventions(fields: Fields<'_>, complaints: &mut Complaints) {
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
}

fn check_normal_pressures(fields: Fields<'_>, complaints: &mut Complaints) {
    let determinations = fields.mappings("determinations");
    let air = fields.mapping("air_pressure");
    let holders: Vec<Fields<'_>> = air.into_iter().chain(determinations).collect();
    let stated: Vec<(f64, Fields<'_>)> = holders
        .into_iter()
        .filter_map(|holder| Some((stated_number(holder, "normal_pressure", Kind::Pressure)?, holder)))
        .collect();
    let Some((expected, _)) = stated.first().copied() else { return };
    for (found, holder) in stated.into_iter().skip(1).filter(|(found, _)| (found - expected).abs() > SAME_PRESSURE) {
        let message = format!(
            "The normal pressure is {} hPa here, but {} hPa where it is written first.",
            found / 100.0,
            expected / 100.0
        );
        let problem = Problem::new(Code::ConventionMismatch, message);
        complaints.add_at(
            problem.hint("The effect of air pressure is added back against the normal pressure that the report subtracted it with; use the report's."),
            holder.place_of("normal_pressure"),
        );
    }
}

/// Whether a result has the dimension of a unit; for values that refer to results.
pub(super) fn fits(dimension: Dimension, unit_text: &str) -> bool {
    unit(unit_text).dimension() == dimension
}
