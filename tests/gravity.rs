//! Every vector of `tests/published/gravity.json`, and the tide of a day, against the methods of the transfer of gravity.
//!
//! Units of the vectors stand in their keys: µGal is 1e-8 m/s².

#![allow(clippy::disallowed_methods)]

use libripens::graph::{
    Builder, Distribution, Estimator, InputDraft, Origin, Quantity, Value, sensitivities, standard_uncertainty,
};
use libripens::method::gravity_epoch::{Determination, between};
use libripens::method::gravity_profile::{Profile, ReadingsFit, Scatter, TiesFit, chi_square};
use libripens::method::gravity_range::{self, Verdict};
use libripens::method::gravity_site::Site;
use libripens::method::ocean_loading::{Constituent, Load, OceanLoading, Positive};
use libripens::method::permanent_tide::{PermanentSystem, permanent};
use libripens::method::solid_earth_tide::{SolidEarthTide, check_times, tide};
use libripens::method::tidal_groups::WaveGroup;
use libripens::method::{air_pressure_effect, exact, normal_gravity, polar_motion, unit};
use libripens::numeric::astronomy::time_scale::{Instant, tai_minus_utc};
use libripens::numeric::astronomy::{arc_seconds, moon, sun};
use libripens::quantity::Kind;
use serde_json::Value as Json;
use std::path::Path;

const MICROGAL: f64 = 1e-8;

fn published(file: &str) -> String {
    let path = Path::new(env!("CARGO_MANIFEST_DIR")).join("tests/published").join(file);
    std::fs::read_to_string(path).expect("vectors")
}

/// The vectors of one term; how many there are is part of each test, so that none is passed over.
fn vectors(term: &str, count: usize) -> Vec<Json> {
    let all: Json = serde_json::from_str(&published("gravity.json")).expect("JSON");
    let list = all["vectors"].as_array().expect("a list");
    let found: Vec<Json> = list.iter().filter(|vector| vector["term"] == term).cloned().collect();
    assert_eq!(found.len(), count, "vectors of {term}");
    found
}

fn number(value: &Json, key: &str) -> f64 {
    value[key].as_f64().unwrap_or_else(|| panic!("{key} in {value}"))
}

fn given(vector: &Json, key: &str) -> f64 {
    number(&vector["inputs"], key)
}

/// The seconds since 1970 of `2006-06-11T19:10:00Z` or of a date at midnight.
fn seconds(text: &str) -> f64 {
    let text = if text.len() == 10 { format!("{text}T00:00:00Z") } else { text.to_string() };
    chrono::DateTime::parse_from_rfc3339(&text).expect("an instant").timestamp() as f64
}

fn time(vector: &Json, key: &str) -> f64 {
    seconds(vector["inputs"][key].as_str().expect("a time"))
}

fn site(vector: &Json) -> Site {
    let optional = |key: &str| vector["inputs"][key].as_f64().unwrap_or(0.0);
    let (latitude, longitude) = (optional("lat_deg").to_radians(), optional("lon_deg_east").to_radians());
    Site::new(latitude, longitude, optional("height_m")).expect("a site")
}

/// The tide of a vector; its leap seconds must be those of the table.
fn tide_of(vector: &Json, at: f64) -> SolidEarthTide {
    if let Some(leap) = vector["inputs"]["tai_minus_utc_s"].as_f64() {
        assert_eq!(tai_minus_utc(at), Some(leap), "{}", vector["name"]);
    }
    SolidEarthTide::new(site(vector)).with_dut1(vector["inputs"]["dut1_s"].as_f64().unwrap_or(0.0))
}

/// Each expected number must have been found, to its own tolerance.
fn compare(vector: &Json, found: &[(&str, f64)]) {
    let name = &vector["name"];
    let expected = vector["expected"].as_object().expect("expected");
    for (key, value) in expected.iter().filter(|(_, value)| value.is_number()) {
        let found = found.iter().find(|(other, _)| other == key).unwrap_or_else(|| panic!("{name}: {key} unchecked"));
        let (tolerance, value) = (number(&vector["tolerance"], key), value.as_f64().expect("a number"));
        let departure = (found.1 - value).abs();
        assert!(departure <= tolerance, "{name} {key}: found {}, expected {value}, apart {departure}", found.1);
    }
}

fn input<'g>(b: &'g Builder, path: &str, unit_text: &str, value: f64, u: f64) -> Quantity<'g> {
    let origin = Origin::Assumed("test");
    let mut draft = InputDraft::new(path, path, path, Kind::Plain, unit(unit_text), Value::Scalar(value), origin);
    if u > 0.0 {
        draft.distribution = Distribution::Normal { standard_uncertainty: u };
    }
    b.input(draft)
}

fn correlate(b: &Builder, pair: [Quantity; 2], r: f64) {
    if r != 0.0 {
        b.correlate("r", &pair.map(|quantity| quantity.id), vec![vec![1.0, r], vec![r, 1.0]]).expect("a correlation");
    }
}

fn uncertainty(b: &Builder, of: Quantity) -> f64 {
    let graph = b.graph();
    standard_uncertainty(&graph, &sensitivities(&graph, of.id))
}

/// Degrees between two angles in rad and degrees.
fn apart(found: f64, expected: f64) -> f64 {
    (found.to_degrees() - expected + 180.0).rem_euclid(360.0) - 180.0
}

#[test]
fn places_of_moon_and_sun_agree() {
    for vector in vectors("ephemeris", 7) {
        let t = (given(&vector, "tt_mjd") - 51_544.5) / 36_525.0;
        let (moon, sun) = (moon::place(t), sun::place(t));
        let longitude = |found: f64, key: &str| {
            vector["expected"][key].as_f64().map_or(f64::NAN, |expected| expected + apart(found, expected))
        };
        let found = [
            ("moon_longitude_deg", longitude(moon.longitude, "moon_longitude_deg")),
            ("moon_latitude_deg", moon.latitude.to_degrees()),
            ("moon_distance_km", moon.distance / 1e3),
            ("sun_longitude_deg", longitude(sun.longitude, "sun_longitude_deg")),
            ("sun_latitude_deg", sun.latitude.to_degrees()),
            ("sun_distance_km", sun.distance / 1e3),
        ];
        compare(&vector, &found);
        if let Some(utc) = vector["inputs"]["utc"].as_str() {
            assert!((Instant::new(seconds(utc), 0.0).terrestrial_centuries() - t).abs() < 1e-13);
        }
    }
}

#[test]
fn tides_agree_by_body_degree_and_order() {
    let mut largest = 0.0_f64;
    for vector in vectors("tide", 46) {
        let at = time(&vector, "utc");
        let tide = tide_of(&vector, at);
        let (rigid, permanent) = (tide.rigid(at), permanent(&site(&vector)));
        let (sum, total) = (rigid.sum(), rigid.sum().total());
        let effect = tide.effect(at);
        let found = [
            ("rigid_total_ugal", total),
            ("rigid_moon2_ugal", rigid.moon.second.iter().sum()),
            ("rigid_moon3_ugal", rigid.moon.third.iter().sum()),
            ("rigid_moon4_ugal", rigid.moon.fourth),
            ("rigid_sun2_ugal", rigid.sun.second.iter().sum()),
            ("rigid_n2m0_ugal", sum.second[0]),
            ("rigid_n2m1_ugal", sum.second[1]),
            ("rigid_n2m2_ugal", sum.second[2]),
            ("rigid_n3m0_ugal", sum.third[0]),
            ("rigid_n3m1_ugal", sum.third[1]),
            ("rigid_n3m2_ugal", sum.third[2]),
            ("rigid_n3m3_ugal", sum.third[3]),
            ("permanent_rigid_ugal", permanent),
            ("body_wdz_zero_tide_ugal", effect),
            ("body_uniform_1p16_zero_tide_ugal", 1.16 * (total - permanent) + permanent),
            ("correction_added_to_observed_wdz_zero_tide_ugal", -effect),
            ("pygtide_wdz_zero_tide_ugal", effect),
        ];
        compare(&vector, &found.map(|(key, value)| (key, value / MICROGAL)));
        largest = largest.max((effect / MICROGAL - number(&vector["expected"], "body_wdz_zero_tide_ugal")).abs());
    }
    assert!(largest < 0.023, "the method's own error is stated as 0.023 µGal, found {largest}");
}

#[test]
fn the_tide_of_a_day_agrees_at_every_step() {
    let site = Site { latitude: 48.83_f64.to_radians(), longitude: 2.22_f64.to_radians(), height: 70.0 };
    let tide = SolidEarthTide::new(site).with_dut1(-0.5548);
    let text = published("tide-series.csv");
    let rows: Vec<Vec<&str>> = text
        .lines()
        .filter(|line| !line.starts_with('#') && !line.starts_with("utc"))
        .map(|line| line.split(',').collect())
        .collect();
    assert_eq!(rows.len(), 145);
    let times: Vec<f64> = rows.iter().map(|row| seconds(row[0])).collect();
    for ((row, time), effect) in rows.iter().zip(&times).zip(tide.effects(&times)) {
        let column = |index: usize| row[index].parse::<f64>().expect("a number");
        let (rigid, permanent) = (tide.rigid(*time).sum().total(), tide.permanent());
        let found = [rigid, permanent, effect, 1.16 * (rigid - permanent) + permanent, effect];
        for (index, found) in found.iter().enumerate() {
            assert!((found / MICROGAL - column(index + 1)).abs() <= 0.05, "{} column {}", row[0], index + 1);
        }
    }
}

#[test]
fn means_agree() {
    for vector in vectors("tide-mean", 4) {
        let (start, span) = (time(&vector, "utc_start"), given(&vector, "minutes") * 60.0);
        let tide = tide_of(&vector, start);
        let found = [
            ("mean_wdz_zero_tide_ugal", tide.mean(start, span) / MICROGAL),
            ("midpoint_wdz_zero_tide_ugal", tide.effect(start + span / 2.0) / MICROGAL),
        ];
        compare(&vector, &found);
    }
}

#[test]
fn observed_wave_groups_agree() {
    for vector in vectors("tide-groups", 4) {
        let at = time(&vector, "utc");
        let rows = vector["inputs"]["groups_cpd_delta_phase_lead_deg"].as_array().expect("groups");
        // The first row is the permanent part, which the system of the value settles.
        let groups: Vec<WaveGroup> = rows[1..]
            .iter()
            .map(|row| {
                let cell = |index: usize| row[index].as_f64().expect("a number");
                WaveGroup { from: cell(0), to: cell(1), factor: cell(2), phase_lead: cell(3).to_radians() }
            })
            .collect();
        let plain = tide_of(&vector, at);
        let tide = plain.clone().with_groups(&groups).expect("groups");
        compare(&vector, &[("effect_on_g_ugal", tide.effect(at) / MICROGAL)]);
        assert!((tide.effect(at) - plain.effect(at)).abs() > 0.1 * MICROGAL, "the groups must matter");
    }
}

/// The same g at the instant from a value in each of the three systems.
#[test]
fn the_three_permanent_systems_agree() {
    for vector in vectors("permanent-tide", 3) {
        let (at, zero, factor) =
            (time(&vector, "utc"), given(&vector, "g_zero_tide_ugal_offset"), given(&vector, "tide_free_factor"));
        let site = site(&vector);
        let free = PermanentSystem::TideFree { factor };
        let stated = |system: PermanentSystem| zero - system.to_zero_tide(&site) / MICROGAL;
        let mut found = vec![
            ("permanent_rigid_ugal", permanent(&site) / MICROGAL),
            ("g_mean_tide_ugal_offset", stated(PermanentSystem::MeanTide)),
            ("g_tide_free_ugal_offset", stated(free)),
        ];
        let instants = [PermanentSystem::ZeroTide, PermanentSystem::MeanTide, free]
            .map(|system| stated(system) + tide_of(&vector, at).in_system(system).effect(at) / MICROGAL);
        assert!((instants[0] - instants[1]).abs() < 1e-9 && (instants[0] - instants[2]).abs() < 1e-9);
        found.push(("g_instant_ugal_offset", instants[0]));
        compare(&vector, &found);
    }
}

fn loading(table: &Json, positive: &Json) -> OceanLoading {
    let loads = table.as_object().expect("a table").iter().map(|(name, row)| Load {
        constituent: Constituent::of_name(name).expect("a constituent"),
        amplitude: number(row, "amplitude_nm_s2") * 1e-9,
        phase_lag: number(row, "greenwich_phase_lag_deg").to_radians(),
    });
    let positive = match positive.as_str() {
        Some("up") => Positive::Up,
        Some("down") => Positive::Down,
        other => panic!("positive {other:?}"),
    };
    OceanLoading { loads: loads.collect(), positive, dut1: 0.0 }
}

#[test]
fn ocean_loading_agrees() {
    for vector in vectors("ocean-loading", 5) {
        let at = time(&vector, "utc");
        let loading = loading(&vector["inputs"]["table"], &vector["inputs"]["table_positive"]);
        assert_eq!(loading.loads.len(), 11);
        let found = [
            ("effect_on_g_no_nodal_ugal", loading.effect_without_nodal_factors(at) / MICROGAL),
            ("effect_on_g_nodal_ugal", loading.effect(at) / MICROGAL),
        ];
        compare(&vector, &found);
        let arguments = vector["expected"]["arguments_deg"].as_object().expect("arguments");
        for (name, expected) in arguments {
            let found = Constituent::of_name(name).expect("a constituent").argument(Instant::new(at, 0.0));
            let apart = apart(found, expected.as_f64().expect("a number")).abs();
            assert!(apart <= number(&vector["tolerance"], "arguments_deg"), "{} {name}: {apart}°", vector["name"]);
        }
    }
}

#[test]
fn air_pressure_agrees() {
    for vector in vectors("pressure", 6) {
        let b = Builder::default();
        let normal = air_pressure_effect::normal_pressure(given(&vector, "height_m"));
        let alpha = exact(&b, given(&vector, "admittance_ugal_per_hpa") * 1e-10, "m s-2 Pa-1");
        let (p, p_n) = (exact(&b, given(&vector, "pressure_hpa") * 100.0, "Pa"), exact(&b, normal, "Pa"));
        let effect = air_pressure_effect::effect(alpha, p, p_n).number() / MICROGAL;
        let found =
            [("normal_pressure_hpa", normal / 100.0), ("effect_on_g_ugal", effect), ("correction_added_ugal", -effect)];
        compare(&vector, &found);
    }
}

#[test]
fn polar_motion_agrees() {
    for vector in vectors("polar-motion", 5) {
        let b = Builder::default();
        let coordinate = |key: &str| exact(&b, arc_seconds(given(&vector, key)), "rad");
        let (x, y) = (coordinate("x_arcsec"), coordinate("y_arcsec"));
        let effect = polar_motion::effect(&b, &site(&vector), x, y).number() / MICROGAL;
        compare(&vector, &[("effect_on_g_ugal", effect), ("correction_added_ugal", -effect)]);
    }
}

/// The step between two heights with its correlated coefficients, through the graph.
#[test]
fn steps_of_the_profile_agree() {
    for vector in vectors("gradient", 4) {
        let b = Builder::default();
        let gamma = |path: &str, unit: &str, key: &str, u: &str| {
            input(&b, path, unit, given(&vector, key) * MICROGAL, given(&vector, u) * MICROGAL)
        };
        let gamma_1 = gamma("gamma_1", "s-2", "g1_ugal_per_m", "u_g1");
        let gamma_2 = gamma("gamma_2", "m-1 s-2", "g2_ugal_per_m2", "u_g2");
        correlate(&b, [gamma_1, gamma_2], given(&vector, "corr_g1_g2"));
        let height = |key: &str| exact(&b, given(&vector, key), "m").as_kind(Kind::Height);
        let profile = Profile { gamma_1, gamma_2: Some(gamma_2) };
        let step = profile.step(height("z_from_m"), height("z_to_m"));
        let found = [("delta_g_ugal", step.number() / MICROGAL), ("u_ugal", uncertainty(&b, step) / MICROGAL)];
        compare(&vector, &found);
    }
}

fn list(rows: &Json, key: &str, scale: f64) -> Vec<f64> {
    rows.as_array().expect("rows").iter().map(|row| number(row, key) * scale).collect()
}

#[test]
fn fits_of_the_profile_agree() {
    for vector in vectors("gradient-fit", 6) {
        let (inputs, degree) = (&vector["inputs"], given(&vector, "degree") as usize);
        let (first, estimate, chi) = if inputs["ties"].is_array() {
            let rows = &inputs["ties"];
            let rule =
                TiesFit { degree, uncertainties: list(rows, "u_ugal", MICROGAL).into(), scatter: Scatter::Stated };
            let (low, high) = (list(rows, "z_low_m", 1.0), list(rows, "z_high_m", 1.0));
            let difference = list(rows, "dg_ugal", MICROGAL);
            let chi = chi_square(&rule.fit(&low, &high, &difference).expect("a fit")).expect("chi-square");
            (0, rule.estimate(&[&low, &high, &difference]).expect("a fit"), chi)
        } else {
            let rows = &inputs["readings"];
            let rule = ReadingsFit {
                degree,
                drift_degree: given(&vector, "drift_degree") as usize,
                times: list(rows, "t_h", 3600.0).into(),
                uncertainties: list(rows, "u_ugal", MICROGAL).into(),
                scatter: Scatter::Stated,
            };
            let (z, value) = (list(rows, "z_m", 1.0), list(rows, "value_ugal", MICROGAL));
            let chi = chi_square(&rule.fit(&z, &value).expect("a fit")).expect("chi-square");
            (1, rule.estimate(&[&z, &value]).expect("a fit"), chi)
        };
        let covariance = &estimate.own_covariance;
        let u = |index: usize| covariance[index][index].sqrt() / MICROGAL;
        let mut found = vec![
            ("g1_ugal_per_m", estimate.values[first] / MICROGAL),
            ("u_g1", u(first)),
            ("chi2", chi.statistic),
            ("dof", chi.degrees.0),
        ];
        if degree == 2 {
            let second = first + 1;
            let r = covariance[first][second] / (covariance[first][first] * covariance[second][second]).sqrt();
            found.extend([("g2_ugal_per_m2", estimate.values[second] / MICROGAL), ("u_g2", u(second))]);
            found.extend([("corr", r), ("corr_g1_g2", r)]);
        }
        if first == 1 {
            found.push(("c0_ugal", estimate.values[0] / MICROGAL));
            found.push(("drift_ugal_per_h", estimate.values[1 + degree] / MICROGAL * 3600.0));
        }
        compare(&vector, &found);
    }
}

#[test]
fn gravity_between_determinations_agrees() {
    for vector in vectors("drift", 3) {
        let b = Builder::default();
        let value = |path: &str, key: &str, u: &str| {
            input(&b, path, "m/s2", given(&vector, key) * MICROGAL, given(&vector, u) * MICROGAL)
        };
        let pair = [value("g_1", "g1_ugal", "u1_ugal"), value("g_2", "g2_ugal", "u2_ugal")];
        correlate(&b, pair, given(&vector, "corr_1_2"));
        let departure = input(&b, "d", "m/s2", 0.0, given(&vector, "u_model_ugal") * MICROGAL);
        let list = [
            Determination { time: time(&vector, "date1"), gravity: pair[0] },
            Determination { time: time(&vector, "date2"), gravity: pair[1] },
        ];
        let g = between(&list, time(&vector, "date"), departure).expect("inside the span");
        compare(&vector, &[("g_ugal", g.number() / MICROGAL), ("u_ugal", uncertainty(&b, g) / MICROGAL)]);
    }
}

#[test]
fn normal_gravity_agrees_to_the_digits_published() {
    for vector in vectors("normal-gravity", 8) {
        compare(&vector, &[("gamma_m_s2", normal_gravity::normal_gravity(&site(&vector)))]);
    }
}

fn word(verdict: Verdict) -> &'static str {
    match verdict {
        Verdict::Accept => "accept",
        Verdict::Warn => "warn",
        Verdict::Reject => "reject",
    }
}

#[test]
fn verdicts_on_typed_values_agree() {
    for vector in vectors("plausibility", 4) {
        let (site, g) = (site(&vector), given(&vector, "g_m_s2"));
        compare(&vector, &[("difference_mgal", (g - normal_gravity::normal_gravity(&site)) * 1e5)]);
        assert_eq!(vector["expected"]["verdict"], word(normal_gravity::verdict(&site, g)), "{}", vector["name"]);
    }
    for vector in vectors("input-range", 8) {
        let range = match vector["inputs"]["quantity"].as_str().expect("a quantity") {
            "pressure_hpa" => gravity_range::PRESSURE,
            "pole_x_arcsec" => gravity_range::POLE_X,
            "g1_ugal_per_m" => gravity_range::GRADIENT,
            "dut1_s" => gravity_range::DUT1,
            "admittance_ugal_per_hpa" => gravity_range::ADMITTANCE,
            other => panic!("{other}"),
        };
        let verdict = range.verdict(given(&vector, "value") * range.in_si);
        assert_eq!(vector["expected"]["verdict"], word(verdict), "{}", vector["name"]);
    }
}

/// Whole transfers: determinations, height, tie, self-attraction and the four effects.
#[test]
fn whole_transfers_agree() {
    for vector in vectors("chain", 2) {
        let (b, at, site) = (Builder::default(), time(&vector, "utc"), site(&vector));
        let inputs = &vector["inputs"];
        let number_of = |value: f64, unit: &str| exact(&b, value, unit);
        let list: Vec<Determination> = inputs["absolute"]
            .as_array()
            .expect("a list")
            .iter()
            .map(|row| Determination {
                time: seconds(row["date"].as_str().expect("a date")),
                gravity: number_of(number(row, "g_ugal") * MICROGAL, "m/s2"),
            })
            .collect();
        let reference = between(&list, at, number_of(0.0, "m/s2")).expect("inside the span");
        let profile = Profile {
            gamma_1: number_of(given(&vector, "g1_ugal_per_m") * MICROGAL, "s-2"),
            gamma_2: Some(number_of(given(&vector, "g2_ugal_per_m2") * MICROGAL, "m-1 s-2")),
        };
        let height =
            profile.step(number_of(given(&vector, "z_ref_m"), "m"), number_of(given(&vector, "z_mass_m"), "m"));
        let tide = tide_of(&vector, at).effect(at);
        let load = loading(&inputs["otl"], &inputs["otl_positive"]).effect(at);
        let normal = number_of(air_pressure_effect::normal_pressure(site.height), "Pa");
        let pressure = air_pressure_effect::effect(
            number_of(air_pressure_effect::ADMITTANCE, "m s-2 Pa-1"),
            number_of(given(&vector, "pressure_hpa") * 100.0, "Pa"),
            normal,
        );
        let pole = polar_motion::effect_number(
            &site,
            arc_seconds(given(&vector, "x_arcsec")),
            arc_seconds(given(&vector, "y_arcsec")),
        );
        let stated = (given(&vector, "horizontal_tie_ugal") + given(&vector, "self_attraction_ugal")) * MICROGAL;
        let g = reference + height + pressure + number_of(tide + load + pole + stated, "m/s2");
        let found = [
            ("g_mass_ugal", g.number()),
            ("tide_ugal", tide),
            ("otl_ugal", load),
            ("pressure_ugal", pressure.number()),
            ("pole_ugal", pole),
            ("height_ugal", height.number()),
            ("reference_interpolated_ugal", reference.number()),
        ];
        compare(&vector, &found.map(|(key, value)| (key, value / MICROGAL)));
    }
}

#[test]
fn the_plain_function_is_the_zero_tide_system() {
    let site = Site { latitude: 0.823, longitude: 0.147, height: 450.0 };
    assert_eq!(tide(&site, 2.25e9), SolidEarthTide::new(site).effect(2.25e9));
    assert!(check_times(&[2.25e9]).is_ok());
}

/// UT1 is unknown for times to come: how much that may matter is stated as 0.020 µGal.
#[test]
fn an_unknown_ut1_matters_little() {
    let site = Site { latitude: 0.823, longitude: 0.147, height: 450.0 };
    let (without, with) = (SolidEarthTide::new(site), SolidEarthTide::new(site).with_dut1(0.9));
    let largest = (0..720)
        .map(|hour| 2.25e9 + 3600.0 * f64::from(hour))
        .map(|at| (with.effect(at) - without.effect(at)).abs() / MICROGAL)
        .fold(0.0, f64::max);
    assert!(largest > 0.005 && largest < 0.020, "{largest} µGal");
}
