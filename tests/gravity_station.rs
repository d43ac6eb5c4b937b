//! Gravity stations: g at a mass against values computed in decimals, and what a station refuses.

#![allow(clippy::disallowed_methods)]

use libripens::block::Engine;
use libripens::block::gravity_at_mass::GravityUse;
use libripens::block::gravity_station::GravityStation;
use libripens::graph::{Distribution, InputDraft, NodeId, Origin, Value, sensitivities, standard_uncertainty};
use libripens::intake::{FileId, MemoryIntake, Place};
use libripens::quantity::{Kind, Unit};
use libripens::record::Text;
use serde_json::Value as Json;

const LABORATORY: &str = "---\nformat: 1\nname: Test laboratory\naddress: Nowhere\ncoverage_probability: 95.45 %\ndecimal_marker: point\ndegrees_of_freedom: truncated\n---\n";

const SERIES: &str = "```yaml raw-data TIDE\nfile: tide.csv\nzero_time: 2041-05-04T00:00:00Z\ncolumns:\n  time: {head: t_s, unit: s}\n  tide: {head: tide_nm_s2, unit: nm/s2}\n  pressure: {head: p_atm_hPa, unit: hPa}\n```\n\n";

/// The station of the vectors; `more` follows its fields.
fn station(determinations: &str, more: &str) -> String {
    format!(
        "```yaml gravity-station G1\nlatitude: 47.312° N\nlongitude: 8.415° E\nheight_above_sea_level: 423.0 m\nmark: brass mark in the floor\ndeterminations:\n{determinations}\n{more}```\n"
    )
}

const ONE: &str = "  - {value: 9.8072945691(250) m/s2, date: 2041-04-20, height: 0 mm, permanent_tide: zero-tide, normal_pressure: 963.46 hPa}";

const EFFECTS: &str = "change_since_determination: 0 nm/s2
profile: {gradient: -2.9765(200)e-6 s-2}
tie: {value: -4.186(100)e-7 m/s2}
self_attraction: -5.481(700)e-8 m/s2
tide: {source: series, data: TIDE, permanent_tide: zero-tide, scale: 1.00223(300)}
air_pressure: {admittance: -2.625(300) nm s-2 hPa-1, normal_pressure: 963.46 hPa, data: TIDE}
polar_motion: {effect: 21.34(300) nm/s2}
";

fn folder(text: &str) -> MemoryIntake {
    let tide = std::fs::read_to_string(concat!(env!("CARGO_MANIFEST_DIR"), "/tests/synthetic/gravity/tide.csv"));
    let record = format!("---\nrecord: G\ndate: 2041-05-04\n---\n\n{SERIES}{text}");
    MemoryIntake::with([
        ("laboratory.md", LABORATORY.to_string()),
        ("gravity.md", record),
        ("tide.csv", tide.expect("vectors")),
    ])
}

fn vectors() -> Json {
    let path = concat!(env!("CARGO_MANIFEST_DIR"), "/tests/synthetic/gravity/at_mass.json");
    serde_json::from_str(&std::fs::read_to_string(path).expect("vectors")).expect("JSON")
}

fn number(json: &Json) -> f64 {
    json.as_str().expect("text").parse().expect("a number")
}

/// 2041-05-04T00:00:00Z in seconds since 1970.
const ZERO: f64 = 2_251_238_400.0;

fn name(text: &str) -> Text {
    Text { text: text.into(), place: Place::new(FileId(0), 0, 0) }
}

/// Builds the station and asks it for g at `times`, with the mass centre 1.38459(150) m above the mark.
fn ask<'e>(engine: &'e Engine<'e>, times: &[f64], pressure: Option<f64>) -> Option<NodeId> {
    let station = GravityStation::find(engine, &name("G1"))?;
    let origin = Origin::Stated(Place::new(FileId(0), 0, 0));
    let metre = Unit::parse("m").expect("metre");
    let mut height =
        InputDraft::new("W.height", "z", "height", Kind::Height, metre, Value::Scalar(1.38459), origin.clone());
    height.distribution = Distribution::Normal { standard_uncertainty: 1.5e-3 };
    let height = engine.builder.input(height);
    let pressure = pressure.map(|pressure| {
        let pascal = Unit::parse("Pa").expect("pascal");
        let rows = Value::column(vec![pressure; times.len()]);
        engine.builder.input(InputDraft::new("W.p", "p", "pressure", Kind::Pressure, pascal, rows, origin))
    });
    station.at(height, times, pressure, "W").map(|found| found.id)
}

fn value_and_u(engine: &Engine, path: &str) -> (f64, f64) {
    let graph = engine.graph();
    let id = graph.find(path).unwrap_or_else(|| panic!("no {path}: {:#?}", engine.complaints()));
    (graph.number(id), standard_uncertainty(&graph, &sensitivities(&graph, id)))
}

fn words(engine: &Engine) -> Vec<&'static str> {
    engine.complaints().list.iter().map(|complaint| complaint.code.word()).collect()
}

#[test]
fn g_at_the_mass_agrees_with_decimal_arithmetic() {
    let vectors = vectors();
    let seconds: Vec<f64> = vectors["times_s"].as_array().expect("list").iter().filter_map(Json::as_f64).collect();
    let times: Vec<f64> = seconds.iter().map(|t| ZERO + t).collect();
    let intake = folder(&station(ONE, EFFECTS));
    let engine = libripens::reduce(&intake, None).expect("readable");
    let column = ask(&engine, &times, None).unwrap_or_else(|| panic!("{:#?}", engine.complaints()));
    assert!(!engine.complaints().has_faults(), "{:#?}", engine.complaints());
    let rows = engine.graph().value(column).rows().to_vec();
    let expected: Vec<f64> = vectors["gravity"].as_array().expect("list").iter().map(number).collect();
    assert_eq!(rows.len(), expected.len());
    assert_eq!(rows.len(), 34);
    for (found, expected) in rows.iter().zip(&expected) {
        // Rounding of sums near 9.8 m/s²; a tenth of the 1e-12 that is asked for.
        assert!((found / expected - 1.0).abs() < 1e-13, "{found} against {expected}");
    }
    for (effect, expected) in vectors["effects"].as_object().expect("mapping") {
        let (value, u) = value_and_u(&engine, &format!("W.gravity.{effect}"));
        let (wanted, wanted_u) = (number(&expected["value"]), number(&expected["u"]));
        // Times near 2e9 s have a grain of 2e-7 s, which the slope of a series turns into 1e-12 of its mean.
        assert!((value / wanted - 1.0).abs() < 1e-11, "{effect}: {value} against {wanted}");
        assert!((u / wanted_u - 1.0).abs() < 1e-10, "{effect}: u {u} against {wanted_u}");
    }
    let used = engine.found::<GravityUse>("W").expect("stored for the report");
    assert_eq!(
        used.effects.iter().map(|effect| effect.name).collect::<Vec<_>>(),
        ["height", "tie", "self_attraction", "tide", "air_pressure", "polar_motion"]
    );
}

#[test]
fn the_pressure_of_a_weighing_serves_where_the_station_has_no_log() {
    let effects = EFFECTS.replace(", data: TIDE}\npolar", "}\npolar");
    let intake = folder(&station(ONE, &effects));
    let engine = libripens::reduce(&intake, None).expect("readable");
    ask(&engine, &[ZERO + 36_000.0, ZERO + 36_600.0], Some(97_346.0)).expect("g");
    let (air, _) = value_and_u(&engine, "W.gravity.air_pressure");
    assert!((air / -26.25e-9 - 1.0).abs() < 1e-9, "{air}");
    assert!(ask(&engine, &[ZERO + 36_000.0], None).is_none());
    assert_eq!(words(&engine), ["field_missing"]);
}

#[test]
fn what_is_not_stated_is_zero_and_said() {
    let intake = folder(&station(
        ONE,
        "change_since_determination: 0.0(15) µGal\nprofile: {gradient: -2976.5(200) nm s-2 m-1}\n",
    ));
    let engine = libripens::reduce(&intake, None).expect("readable");
    ask(&engine, &[ZERO, ZERO + 60.0], None).expect("g");
    let (mean, u) = value_and_u(&engine, "W.gravity.mean");
    assert!((mean - (9.8072945691 - 2.9765e-6 * 1.38459)).abs() < 4e-15, "{mean}");
    let expected = [25e-9, 15e-9, 2e-8 * 1.38459, 2.9765e-6 * 1.5e-3].iter().map(|u| u * u).sum::<f64>().sqrt();
    assert!((u / expected - 1.0).abs() < 1e-12, "{u} against {expected}");
    let assumptions: Vec<String> = engine.builder.assumptions().into_iter().map(|one| one.text).collect();
    for effect in ["tide of the solid Earth", "air pressure", "polar motion", "ground water", "attraction", "tie"] {
        assert!(assumptions.iter().any(|text| text.contains(effect)), "{effect}: {assumptions:?}");
    }
}

/// Two results of one gravimeter: on the line between them with r, and its variance by hand.
#[test]
fn between_two_determinations_g_lies_on_the_line() {
    let two = "  - {value: 9.8072945600(200) m/s2, date: 2041-04-30, height: 1.2 m, permanent_tide: zero-tide}
  - {value: 9.8072945800(300) m/s2, date: 2041-05-10, height: 1.2 m, permanent_tide: zero-tide, correlation: 0.7}";
    let more = "profile: {gradient: -2976.5(200) nm s-2 m-1, second_coefficient: 10.0(80) nm s-2 m-2, correlation: -0.95}\nchange_between_determinations: 0.0(10) µGal\nreference_date: 2041-05-04\n";
    let intake = folder(&station(two, more));
    let engine = libripens::reduce(&intake, None).expect("readable");
    assert!(engine.complaints().list.is_empty(), "{:#?}", engine.complaints());
    let (mark, u) = value_and_u(&engine, "G1.gravity");
    let rise = 2.9765e-6 * 1.2 - 1e-8 * 1.44;
    assert!((mark - (0.6 * 9.80729456 + 0.4 * 9.80729458 + rise)).abs() < 4e-15, "{mark}");
    let (a, b) = (0.6 * 20e-9, 0.4 * 30e-9);
    let (d1, d2, u1, u2): (f64, f64, f64, f64) = (-1.2, -1.44, 20e-9, 8e-9);
    let profile = d1 * d1 * u1 * u1 + 2.0 * d1 * d2 * -0.95 * u1 * u2 + d2 * d2 * u2 * u2;
    let expected = (a * a + b * b + 2.0 * 0.7 * a * b + 1e-16 + profile).sqrt();
    assert!((u / expected - 1.0).abs() < 1e-9, "{u} against {expected}");
}

/// A mass at the height of the absolute value needs no profile: its uncertainty cancels.
#[test]
fn the_profile_cancels_at_the_height_of_the_determination() {
    let at_mass = ONE.replace("height: 0 mm", "height: 1384.59 mm");
    let intake = folder(&station(&at_mass, "change_since_determination: 0 µGal\n"));
    let engine = libripens::reduce(&intake, None).expect("readable");
    ask(&engine, &[ZERO], None).expect("g");
    let (mean, u) = value_and_u(&engine, "W.gravity.mean");
    assert!((mean - 9.8072945691).abs() < 4e-15, "{mean}");
    let expected = (25e-9f64.powi(2) + (3.086e-6 * 1.5e-3f64).powi(2)).sqrt();
    assert!((u / expected - 1.0).abs() < 1e-9, "{u} against {expected}");
    assert_eq!(words(&engine), ["gradient_assumed"]);
}

/// A report's value at the top of the drop, with the gradient it used, moved to the effective height.
#[test]
fn a_reported_value_is_taken_at_its_effective_height() {
    let top = "  - {value: 9.8072940000(200) m/s2, date: 2041-05-04, height: 1.3 m, effective_height: 1.2 m, gradient: -3.0e-6 s-2, permanent_tide: zero-tide}";
    let intake = folder(&station(top, "profile: {gradient: -2.9(1)e-6 s-2}\n"));
    let engine = libripens::reduce(&intake, None).expect("readable");
    let (mark, _) = value_and_u(&engine, "G1.gravity");
    assert!((mark - (9.807294 + 3.0e-6 * 0.1 + 2.9e-6 * 1.2)).abs() < 4e-15, "{mark}");
}

#[test]
fn a_day_outside_the_determinations_is_refused() {
    let intake = folder(&station(ONE, "profile: {gradient: -2976.5(200) nm s-2 m-1}\n"));
    let engine = libripens::reduce(&intake, None).expect("readable");
    assert!(ask(&engine, &[ZERO], None).is_none());
    assert_eq!(words(&engine), ["conditions_out_of_span"]);
}

#[test]
fn a_time_outside_the_series_is_refused() {
    let intake = folder(&station(ONE, EFFECTS));
    let engine = libripens::reduce(&intake, None).expect("readable");
    assert!(ask(&engine, &[ZERO + 36_000.0, ZERO + 40_000.0], None).is_none());
    assert_eq!(words(&engine), ["conditions_out_of_span"]);
}

#[test]
fn conventions_must_agree() {
    let other_tide = EFFECTS.replace("permanent_tide: zero-tide", "permanent_tide: mean-tide");
    let other_pressure = EFFECTS.replace("normal_pressure: 963.46 hPa", "normal_pressure: 1013.25 hPa");
    for (effects, code) in [(other_tide, "convention_mismatch"), (other_pressure, "convention_mismatch")] {
        let intake = folder(&station(ONE, &effects));
        let engine = libripens::reduce(&intake, None).expect("readable");
        assert_eq!(words(&engine), [code]);
    }
}
