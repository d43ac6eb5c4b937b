//! Gravity stations: g at a mass against values computed in decimals, and what a station refuses.

#![allow(clippy::disallowed_methods)]

use libripens::block::Engine;
use libripens::block::gravity_at_mass::GravityUse;
use libripens::block::gravity_station::GravityStation;
use libripens::graph::{
    Distribution, Estimator, InputDraft, NodeId, Origin, Value, sensitivities, standard_uncertainty,
};
use libripens::intake::{FileId, MemoryIntake, Place};
use libripens::method::gravity_profile::{Scatter, TiesFit};
use libripens::method::gravity_site::Site;
use libripens::method::solid_earth_tide::SolidEarthTide;
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

/// Gravity at the mass by the computed tide, for a value in one of the three systems.
fn in_system(value: &str, system: &str) -> (f64, f64) {
    let one = format!("  - {{value: {value}, date: 2041-05-04, height: 0 mm, permanent_tide: {system}}}");
    let more = "profile: {gradient: -2976.5(200) nm s-2 m-1}\ntide: {source: computed}\n";
    let intake = folder(&station(&one, more));
    let engine = libripens::reduce(&intake, None).expect("readable");
    ask(&engine, &[ZERO + 36_000.0, ZERO + 36_600.0], None).unwrap_or_else(|| panic!("{:#?}", engine.complaints()));
    assert!(engine.complaints().list.is_empty(), "{:#?}", engine.complaints());
    (value_and_u(&engine, "W.gravity.mean").0, value_and_u(&engine, "W.gravity.tide").0)
}

/// One gravity, reported in three systems: the permanent attraction at 47.312° is +18.7 µGal by its series in sin²φ.
#[test]
fn a_value_of_any_system_gives_the_same_gravity_at_the_mass() {
    let s = 47.312f64.to_radians().sin().powi(2);
    let permanent = (-30.485 + 90.944 * s + 0.307 * s * s) * 1e-8;
    let zero = in_system("9.8072945691(250) m/s2", "zero-tide");
    let mean = in_system(&format!("{:.13}(250000) m/s2", 9.8072945691 + permanent), "mean-tide");
    let free = 9.8072945691 - 0.16 * permanent;
    let free = in_system(&format!("{free:.13}(250000) m/s2"), "tide-free, permanent_tide_factor: 1.16");
    for (g, _) in [mean, free] {
        assert!((g - zero.0).abs() < 2e-11, "{g} against {}", zero.0);
    }
    assert!((zero.1 - mean.1 - permanent).abs() < 2e-11);
}

#[test]
fn a_computed_tide_is_that_of_the_method_and_follows_its_scale() {
    let scaled = EFFECTS.replace(
        "{source: series, data: TIDE, permanent_tide: zero-tide, scale: 1.00223(300)}",
        "{source: computed, scale: 1.002(3), dut1: -0.2 s}",
    );
    let intake = folder(&station(ONE, &scaled));
    let engine = libripens::reduce(&intake, None).expect("readable");
    let times = [ZERO + 36_000.0, ZERO + 36_300.0];
    ask(&engine, &times, None).unwrap_or_else(|| panic!("{:#?}", engine.complaints()));
    let (tide, u) = value_and_u(&engine, "W.gravity.tide");
    let site = Site::new(47.312f64.to_radians(), 8.415f64.to_radians(), 423.0).expect("a site");
    let body = SolidEarthTide::new(site).with_dut1(-0.2);
    let variable = (body.variable(times[0]) + body.variable(times[1])) / 2.0;
    assert!((tide - (1.002 * variable + body.permanent())).abs() < 1e-13, "{tide}");
    assert!((u - 0.003 * variable.abs()).abs() < 1e-15, "{u}");
    assert!(variable.abs() > 1e-7, "a time at which there is a tide");
}

/// The load of one constituent counted upwards is the negative of that counted downwards; 5 % unless written.
#[test]
fn the_sign_of_an_ocean_load_is_that_of_its_table() {
    let load = |sign: &str| {
        let more = format!(
            "change_since_determination: 0 µGal\nprofile: {{gradient: -2976.5(200) nm s-2 m-1}}\nocean_loading: {{sign: {sign}, constituents: {{M2: {{amplitude: 12.0 nm/s2, phase: 63.5 °}}, O1: {{amplitude: 3.0 nm/s2, phase: -20.0 °}}}}}}\n"
        );
        let intake = folder(&station(ONE, &more));
        let engine = libripens::reduce(&intake, None).expect("readable");
        ask(&engine, &[ZERO + 36_000.0], None).unwrap_or_else(|| panic!("{:#?}", engine.complaints()));
        value_and_u(&engine, "W.gravity.ocean_loading")
    };
    let ((up, u), (down, _)) = (load("up"), load("down"));
    assert_eq!(up, -down);
    assert!(up.abs() > 1e-9 && up.abs() < 16e-9, "{up}");
    assert!((u - 0.05 * up.abs()).abs() < 1e-18, "{u}");
}

/// 2 ω² a sin φ cos φ (x cos λ − y sin λ) × 1.164 by hand.
#[test]
fn a_pole_given_by_its_coordinates() {
    let more = "change_since_determination: 0 µGal\nprofile: {gradient: -2976.5(200) nm s-2 m-1}\npolar_motion: {x: 0.1234(1)″, y: 0.3456(1)″}\n";
    let intake = folder(&station(ONE, more));
    let engine = libripens::reduce(&intake, None).expect("readable");
    ask(&engine, &[ZERO], None).unwrap_or_else(|| panic!("{:#?}", engine.complaints()));
    let (pole, u) = value_and_u(&engine, "W.gravity.polar_motion");
    let (phi, lambda, arcsec) = (47.312f64.to_radians(), 8.415f64.to_radians(), std::f64::consts::PI / 648_000.0);
    let scale = 1.164 * 2.0 * 7.292115e-5f64.powi(2) * 6_378_136.0 * phi.sin() * phi.cos() * arcsec;
    let expected = scale * (0.1234 * lambda.cos() - 0.3456 * lambda.sin());
    assert!((pole - expected).abs() < 1e-16, "{pole} against {expected}");
    assert!((u - scale * 1e-4).abs() < 1e-16, "{u}");
}

/// Two straight profiles: down the first to the tie, up the second from there.
#[test]
fn the_balance_may_stand_on_a_profile_of_its_own() {
    let more = "change_since_determination: 0 µGal\nprofile: {gradient: -3.0(1)e-6 s-2}\ntie: {value: -4.0(1)e-7 m/s2, height: 0.5 m, profile: {gradient: -2.8(1)e-6 s-2}}\n";
    let intake = folder(&station(ONE, more));
    let engine = libripens::reduce(&intake, None).expect("readable");
    ask(&engine, &[ZERO], None).unwrap_or_else(|| panic!("{:#?}", engine.complaints()));
    let (height, u) = value_and_u(&engine, "W.gravity.height");
    assert!((height - (-3.0e-6 * 0.5 - 2.8e-6 * 0.88459)).abs() < 1e-18, "{height}");
    let expected = [0.5e-7, 0.88459e-7, 2.8e-6 * 1.5e-3].iter().map(|u: &f64| u * u).sum::<f64>().sqrt();
    assert!((u / expected - 1.0).abs() < 1e-9, "{u} against {expected}");
}

/// The ties of the method's example, in a record: γ_1 and γ_2 with their correlation.
#[test]
fn a_profile_is_fitted_to_its_ties() {
    let ties = "profile:\n  ties:\n    - {from: 250 mm, to: 850 mm, difference: -187.4(9) µGal}\n    - {from: 250 mm, to: 1450 mm, difference: -371.9(1.1) µGal}\n    - {from: 850 mm, to: 1450 mm, difference: -184.1(9) µGal}\n    - {from: 1450 mm, to: 1950 mm, difference: -152.2(1.3) µGal}\n";
    let intake = folder(&station(ONE, &format!("change_since_determination: 0 µGal\n{ties}")));
    let engine = libripens::reduce(&intake, None).expect("readable");
    assert!(!engine.complaints().has_faults(), "{:#?}", engine.complaints());
    let rule = TiesFit { degree: 2, uncertainties: [0.9e-8, 1.1e-8, 0.9e-8, 1.3e-8].into(), scatter: Scatter::Stated };
    let found = rule
        .estimate(&[
            &[0.25, 0.25, 0.85, 1.45],
            &[0.85, 1.45, 1.45, 1.95],
            &[-187.4e-8, -371.9e-8, -184.1e-8, -152.2e-8],
        ])
        .expect("fitted");
    for (index, name) in ["gradient", "second_coefficient"].into_iter().enumerate() {
        let (value, u) = value_and_u(&engine, &format!("G1.profile.{name}"));
        assert!((value / found.values[index] - 1.0).abs() < 1e-12, "{value}");
        assert!((u / found.own_covariance[index][index].sqrt() - 1.0).abs() < 1e-12, "{u}");
    }
    let graph = engine.graph();
    let sweep = |name: &str| sensitivities(&graph, graph.find(name).expect("fitted"));
    let r =
        libripens::graph::correlation(&graph, &sweep("G1.profile.gradient"), &sweep("G1.profile.second_coefficient"));
    assert!(r < -0.9, "{r}");
}

#[test]
fn an_implausible_gravity_is_warned_of_or_refused() {
    let more = "profile: {gradient: -2976.5(200) nm s-2 m-1}\n";
    for (value, expected) in [("9.8122945691(250)", "value_unusual"), ("9.8272945691(250)", "out_of_validity")] {
        let intake = folder(&station(&ONE.replace("9.8072945691(250)", value), more));
        let engine = libripens::reduce(&intake, None).expect("readable");
        assert_eq!(words(&engine), [expected], "{value}");
    }
}

#[test]
fn slips_of_sign_and_unit_are_seen() {
    let slips = [
        ("profile: {gradient: 2976.5(200) nm s-2 m-1}", "out_of_validity"),
        ("profile: {gradient: -4500(200) nm s-2 m-1}", "value_unusual"),
        ("profile: {gradient: -2976.5(200) nm s-2}", "dimension_mismatch"),
        ("profile: {gradient: -2976.5 nm s-2 m-1}", "uncertainty_missing"),
        ("profile: {gradient: -2976.5(200) nm s-2 m-1, second_coefficient: 10(8) nm s-2 m-2}", "field_missing"),
        ("profile: {}", "field_missing"),
        ("polar_motion: {x: 123.4″, y: 345.6″}", "out_of_validity"),
        ("polar_motion: {x: 0.1234″}", "field_missing"),
        ("ocean_loading: {sign: up, constituents: {M7: {amplitude: 1 nm/s2, phase: 10 °}}}", "undefined_reference"),
        ("air_pressure: {admittance: 3.0(3) nm s-2 hPa-1}", "out_of_validity"),
        ("tide: {source: series}", "field_missing"),
        (
            "profile: {gradient: -2976.5(200) nm s-2 m-1, balance: present}\nself_attraction: 5(1) nm/s2",
            "convention_mismatch",
        ),
        (
            "tide: {source: computed, wave_groups: [{from: 1.9, to: 2.0, factor: 1.18, phase_lead: 1 °}]}\nocean_loading: {sign: up, constituents: {M2: {amplitude: 1 nm/s2, phase: 10 °}}}",
            "convention_mismatch",
        ),
        ("tie: {value: 1(1) nm/s2, height: 1 m}", "field_missing"),
    ];
    for (slip, expected) in slips {
        let profile = if slip.starts_with("profile") { "" } else { "profile: {gradient: -2976.5(200) nm s-2 m-1}\n" };
        let intake = folder(&station(ONE, &format!("{profile}{slip}\n")));
        let engine = libripens::reduce(&intake, None).expect("readable");
        let found = words(&engine);
        assert!(!found.is_empty() && found.iter().all(|code| *code == expected), "{slip}: {:#?}", engine.complaints());
    }
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

/// A weighing that took gravity from the station, reported with its table, charts and the map of the room.
#[test]
fn a_report_shows_each_effect_with_sign_and_uncertainty() {
    let map = "room_map:\n  height: 1.0 m\n  points:\n    - {x: 0 m, y: 0 m, difference: 0 nm/s2}\n    - {x: 1 m, y: 0 m, difference: 41 nm/s2}\n    - {x: 0 m, y: 1 m, difference: -63 nm/s2}\n    - {x: 1 m, y: 1 m, difference: -20 nm/s2}\n";
    let mut intake = folder(
        &(station(ONE, &format!("{EFFECTS}{map}"))
            + "\n```yaml mass-standard W\nnominal: 1 kg\n```\n\n```yaml customer X1\nname: Harrow\naddress: Dale\n```\n"),
    );
    let report = "---\nrecord: R\ndate: 2041-05-05\nreport:\n  title: Gravity\n  customer: X1\n  items: [W]\n  place: Northgate\n  method: {id: NP-20, revision: \"1\"}\n  deviations: none\n  results: [G1.gravity]\n  performed_by: duty metrologist\n  reviewed_by: second metrologist\n  authorised_by: technical manager\n---\n\n# Gravity\n\n{{ gravity(W) }}\n\n{{ gravity_charts(W) }}\n\n{{ gravity(G1) }}\n\n{{ gravity_charts(G1) }}\n";
    intake.files.insert("report.md".into(), report.into());
    let engine = libripens::reduce(&intake, None).expect("readable");
    ask(&engine, &[ZERO + 36_000.0, ZERO + 36_600.0, ZERO + 37_000.0], None).expect("g");
    let manuscript = libripens::report::write_report(&engine, "report.md").expect("a report");
    let typst = manuscript.document.source.replace(['\u{2009}', '\u{202f}', '\u{a0}'], " ");
    for expected in [
        "Height above the mark",
        "−4121.23",
        "Tie to the balance",
        "−418.60",
        "+21.34",
        "Not stated and taken as zero: ocean loading, hydrology",
    ] {
        assert!(typst.contains(expected), "{expected} is not in\n{typst}");
    }
    let report = libripens::report::make_report(&engine, "report.md");
    assert!(report.is_some() && !engine.complaints().has_faults(), "{:#?}", engine.complaints());
    if let Some(path) = std::env::var_os("LIBRIPENS_SHOW") {
        std::fs::write(path, report.expect("a report").pdf).expect("written");
    }
}

/// First-order propagation and trials agree where everything but the height of the centre of mass is linear.
#[test]
fn trials_agree_with_first_order() {
    let ties = "profile:\n  ties:\n    - {from: 250 mm, to: 850 mm, difference: -187.4(9) µGal}\n    - {from: 250 mm, to: 1450 mm, difference: -371.9(1.1) µGal}\n    - {from: 850 mm, to: 1450 mm, difference: -184.1(9) µGal}\n";
    let two = "  - {value: 9.8072945600(200) m/s2, date: 2041-04-30, height: 1.2 m, permanent_tide: zero-tide}\n  - {value: 9.8072945800(300) m/s2, date: 2041-05-10, height: 1.2 m, permanent_tide: zero-tide, correlation: 0.7}";
    let more = EFFECTS
        .replace("profile: {gradient: -2.9765(200)e-6 s-2}\n", ties)
        .replace(", normal_pressure: 963.46 hPa, data", ", data");
    let intake = folder(&station(two, &more));
    let engine = libripens::reduce(&intake, None).expect("readable");
    ask(&engine, &[ZERO + 36_000.0, ZERO + 36_600.0], None).unwrap_or_else(|| panic!("{:#?}", engine.complaints()));
    let (mean, u) = value_and_u(&engine, "W.gravity.mean");
    let graph = engine.graph();
    let id = graph.find("W.gravity.mean").expect("a mean");
    let found = libripens::graph::propagate_distributions(&graph, &[id], 100_000).expect("runs").summary(0, 0.9545);
    assert!((found.estimate - mean).abs() < 0.02 * u, "{} against {mean}", found.estimate);
    assert!((found.standard_uncertainty / u - 1.0).abs() < 0.01, "{} against {u}", found.standard_uncertainty);
}
