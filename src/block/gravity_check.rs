//! Checks of a gravity station that need no other block: dimensions, uncertainties, and conventions that must agree.

use super::fields::Fields;
use super::given::{Given, read_given};
use super::gravity_conventions::check_conventions;
use crate::diagnostic::{Code, Complaints, Problem};
use crate::method::gravity_range::{self, Range, Verdict};
use crate::method::ocean_loading::Constituent;
use crate::method::unit;
use crate::quantity::{Axis, Dimension, Kind, parse_coordinate};

/// Everything about a station that its fields alone tell.
pub fn check(fields: Fields<'_>, complaints: &mut Complaints) {
    for (name, axis) in [("latitude", Axis::Latitude), ("longitude", Axis::Longitude)] {
        if let Some(text) = fields.text(name) {
            complaints.keep(parse_coordinate(&text.text, axis).map_err(sentence), text.place);
        }
    }
    check_values(fields, complaints);
    check_ranges(fields, complaints);
    for profile in profiles(fields) {
        check_profile(profile, complaints);
    }
    check_tie(fields, complaints);
    check_loading(fields, complaints);
    check_pole(fields, complaints);
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
    for profile in profiles(fields) {
        expect(profile, "gradient", "nm s-2 m-1", true, complaints);
        expect(profile, "second_coefficient", "nm s-2 m-2", true, complaints);
    }
    for point in fields.mapping("room_map").map(|map| map.mappings("points")).unwrap_or_default() {
        expect(point, "difference", acceleration, false, complaints);
    }
    for determination in fields.mappings("determinations") {
        expect(determination, "value", "m/s2", true, complaints);
        expect(determination, "gradient", "nm s-2 m-1", false, complaints);
    }
    for name in ["change_since_determination", "change_between_determinations", "self_attraction", "hydrology"] {
        expect(fields, name, acceleration, false, complaints);
    }
    let inner = [
        ("tie", "value", acceleration, true),
        ("tide", "scale", "1", false),
        ("air_pressure", "admittance", "nm s-2 hPa-1", true),
        ("polar_motion", "effect", acceleration, false),
        ("ocean_loading", "scale", "1", false),
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

/// The profile of the station, and that of its tie.
fn profiles(fields: Fields<'_>) -> Vec<Fields<'_>> {
    [fields.mapping("profile"), fields.mapping("tie").and_then(|tie| tie.mapping("profile"))]
        .into_iter()
        .flatten()
        .collect()
}

fn check_profile(profile: Fields<'_>, complaints: &mut Complaints) {
    let (gradient, ties) = (profile.get("gradient"), profile.mappings("ties"));
    if gradient.is_some() == profile.get("ties").is_some() {
        let problem =
            Problem::new(Code::FieldMissing, "The profile needs either its gradient or the ties it is fitted to.");
        complaints.add_at(problem.hint("Write `gradient: -2976.5(200) nm s-2 m-1`, or list `ties:`."), profile.place());
    }
    for tie in &ties {
        expect(*tie, "difference", "nm/s2", true, complaints);
    }
    if let Some(degree) = profile.number("degree").filter(|degree| ![1.0, 2.0].contains(degree)) {
        let problem = Problem::new(Code::OutOfRange, format!("The degree {degree} of the profile is neither 1 nor 2."));
        complaints.add_at(problem.hint("Write `degree: 1` for a straight profile."), profile.place_of("degree"));
    }
    let typed = |name: &str| {
        profile.get(name).is_some_and(|node| !node.as_text().is_some_and(|text| text.starts_with("from ")))
    };
    if typed("gradient") && typed("second_coefficient") && profile.number("correlation").is_none() {
        let message = "The two coefficients of the profile stand without their correlation, which changes the uncertainty several times.";
        let problem = Problem::new(Code::FieldMissing, message);
        complaints.add_at(problem.hint("Write the `correlation:` of the fit, usually near -0.95."), profile.place());
    }
    check_correlation(profile, complaints);
}

fn check_correlation(holder: Fields<'_>, complaints: &mut Complaints) {
    if let Some(r) = holder.number("correlation").filter(|r| !(-1.0..=1.0).contains(r)) {
        let message = format!("The correlation coefficient {r} is not between -1 and 1.");
        let problem = Problem::new(Code::CorrelationImpossible, message);
        complaints.add_at(problem.hint("Take it from the report again."), holder.place_of("correlation"));
    }
}

fn check_tie(fields: Fields<'_>, complaints: &mut Complaints) {
    let Some(tie) = fields.mapping("tie") else { return };
    if tie.get("profile").is_some() != tie.get("height").is_some() {
        let message = "A profile at the balance needs the height of the tie, and the height a profile.";
        let problem = Problem::new(Code::FieldMissing, message);
        complaints.add_at(problem.hint("Write both, or neither when one profile serves at both places."), tie.place());
    }
}

fn check_loading(fields: Fields<'_>, complaints: &mut Complaints) {
    let Some(loading) = fields.mapping("ocean_loading") else { return };
    let entries = loading.get("constituents").and_then(|node| node.as_map()).unwrap_or_default();
    for entry in entries {
        expect(Fields { node: &entry.value }, "amplitude", "nm/s2", false, complaints);
        if Constituent::of_name(&entry.key.text).is_none() {
            let known: Vec<&str> = Constituent::ALL.iter().map(|known| known.name()).collect();
            let message = format!("{} is no constituent of the ocean tide that is computed here.", entry.key.text);
            let hint = format!("The constituents are {}.", known.join(", "));
            complaints.add_at(Problem::new(Code::UndefinedReference, message).hint(hint), entry.key.place);
        }
    }
    if fields.mapping("tide").is_some_and(|tide| tide.get("wave_groups").is_some()) {
        let message = "The observed groups of waves hold the load of the ocean tide already.";
        let problem = Problem::new(Code::ConventionMismatch, message);
        complaints
            .add_at(problem.hint("Leave out `ocean_loading:`, or the `wave_groups:` of the tide."), loading.place());
    }
}

fn check_pole(fields: Fields<'_>, complaints: &mut Complaints) {
    let Some(pole) = fields.mapping("polar_motion") else { return };
    let (effect, x, y) = (pole.get("effect").is_some(), pole.get("x").is_some(), pole.get("y").is_some());
    if x != y || effect == x {
        let message = "Polar motion needs either its effect, or both coordinates of the pole.";
        let problem = Problem::new(Code::FieldMissing, message);
        complaints.add_at(problem.hint("Write `effect: 21(3) nm/s2`, or `x: 0.1234″` and `y: 0.3456″`."), pole.place());
    }
}

/// What lies outside the range of the possible is refused, outside that of the usual warned of.
fn check_ranges(fields: Fields<'_>, complaints: &mut Complaints) {
    let mut judge = |holder: Option<Fields<'_>>, name: &str, kind: Kind, range: &Range| {
        let Some(holder) = holder else { return };
        let Some(value) = stated_number(holder, name, kind) else { return };
        let place = holder.place_of(name);
        match (range.verdict(value), range.remark(value)) {
            (Verdict::Warn, Some(remark)) => {
                complaints.add_at(Problem::new(Code::ValueUnusual, remark).hint(range.hint), place);
            }
            _ => {
                complaints.keep(range.check(value), place);
            }
        }
    };
    for name in ["height_above_sea_level", "height_above_ellipsoid"] {
        judge(Some(fields), name, Kind::Height, &gravity_range::HEIGHT);
    }
    for profile in profiles(fields) {
        judge(Some(profile), "gradient", Kind::Plain, &gravity_range::GRADIENT);
    }
    let air = fields.mapping("air_pressure");
    judge(air, "admittance", Kind::Plain, &gravity_range::ADMITTANCE);
    judge(air, "normal_pressure", Kind::Pressure, &gravity_range::PRESSURE);
    let pole = fields.mapping("polar_motion");
    judge(pole, "x", Kind::Angle, &gravity_range::POLE_X);
    judge(pole, "y", Kind::Angle, &gravity_range::POLE_Y);
    judge(fields.mapping("tide"), "dut1", Kind::Duration, &gravity_range::DUT1);
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
        check_correlation(*determination, complaints);
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

/// Whether a result has the dimension of a unit; for values that refer to results.
pub(super) fn fits(dimension: Dimension, unit_text: &str) -> bool {
    unit(unit_text).dimension() == dimension
}

/// A stated number in coherent SI units; nothing for a reference.
pub(super) fn stated_number(fields: Fields<'_>, field: &str, kind: Kind) -> Option<f64> {
    match fields.given(field, kind)? {
        Given::Stated { value, .. } => Some(value.value),
        Given::Reference(_) => None,
    }
}

/// The standard uncertainty of a stated value, in coherent SI units.
pub(super) fn stated_uncertainty(fields: Fields<'_>, field: &str) -> Option<f64> {
    match fields.given(field, Kind::Plain)? {
        Given::Stated { value, .. } => value.standard_uncertainty(),
        Given::Reference(_) => None,
    }
}
