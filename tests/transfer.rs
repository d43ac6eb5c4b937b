//! Density of water against vectors, volume by weighing in water, sorption; sensitivities against differences. Sources stand in the vector file and in
//! `tests/published/README.md`.

#![allow(clippy::disallowed_methods)]

use libripens::graph::{
    Builder, Distribution, Graph, InputDraft, NodeId, Origin, Quantity, State, Value, evaluate_displaced,
    sensitivities, standard_uncertainty,
};
use libripens::method::hydrostatic_volume::{Weighing, at_reference, volume};
use libripens::method::sorption_correction::{coefficient, mass_in_air};
use libripens::method::water_density::{EQUATION_UNCERTAINTY, Isotopes, Water, density};
use libripens::method::{exact, unit};
use libripens::quantity::Kind;
use serde_json::Value as Json;
use std::collections::BTreeMap;
use std::path::Path;

fn vectors(file: &str) -> Vec<Json> {
    let path = Path::new(env!("CARGO_MANIFEST_DIR")).join("tests/published").join(file);
    let text = std::fs::read_to_string(path).expect("vectors");
    serde_json::from_str::<Json>(&text).expect("JSON").as_array().expect("a list").clone()
}

fn input<'g>(b: &'g Builder, path: &str, unit_text: &str, value: f64) -> Quantity<'g> {
    let mut draft =
        InputDraft::new(path, path, path, Kind::Plain, unit(unit_text), Value::Scalar(value), Origin::Assumed("test"));
    draft.distribution = Distribution::Normal { standard_uncertainty: 1e-6 * value.abs().max(1e-6) };
    b.input(draft)
}

fn water(b: &Builder, celsius: f64, pascals: f64, saturated: bool) -> Water<'_> {
    Water {
        temperature: input(b, "t", "K", celsius + 273.15),
        pressure: input(b, "p", "Pa", pascals),
        dissolved_air: saturated.then(|| input(b, "x_a", "1", 1.0)),
        isotopes: None,
    }
}

fn found(celsius: f64, pascals: f64, saturated: bool) -> f64 {
    let b = Builder::default();
    let rho = density(&b, water(&b, celsius, pascals, saturated)).number();
    assert!(b.take_problems().is_empty(), "{celsius} °C, {pascals} Pa");
    rho
}

/// −(1/ρ) dρ/dT of air-free water at 101 325 Pa, from the graph.
fn expansion(celsius: f64) -> f64 {
    let b = Builder::default();
    let rho = density(&b, water(&b, celsius, 101_325.0, false));
    let (id, value) = (rho.id, rho.number());
    let (graph, _) = b.finish();
    -slope(&graph, id, "t") / value
}

fn slope(graph: &Graph, id: NodeId, path: &str) -> f64 {
    let input = graph.find(path).expect("an input");
    let number = graph.inputs.iter().position(|own| own.node == input).expect("an input");
    sensitivities(graph, id).inputs.get(&(number as u32)).map_or(0.0, |weights| weights[0])
}

/// Our value of an expected key at a temperature and a pressure.
fn own(key: &str, t: f64, p: f64) -> Option<f64> {
    match key {
        "rho_air_free_kg_m3" => Some(found(t, p, false)),
        "rho_air_saturated_kg_m3" => Some(found(t, p, true)),
        "compression_factor" => Some(found(t, p, false) / found(t, 101_325.0, false)),
        "expansion_coefficient_per_K" => Some(expansion(t)),
        _ => None,
    }
}

#[test]
fn water_density_agrees_with_every_vector() {
    let (mut checked, mut cross_checked) = (0, 0);
    for vector in vectors("water-density.json") {
        let given = |key: &str| vector["inputs"][key].as_f64().unwrap_or_else(|| panic!("{key} {vector}"));
        let (t, p) = (given("t_degC"), given("p_Pa"));
        for (key, expected) in vector["expected"].as_object().expect("expected") {
            if key == "in_range_0_40_degC" {
                assert_eq!(expected, true, "{}", vector["name"]);
                continue;
            }
            let limits = [&vector["tolerance"][key], &vector["tolerance"]["*"], &vector["tolerance"]];
            let limits = limits.into_iter().find(|limits| limits.is_object()).expect("a tolerance");
            let (relative, absolute) = (limits["rel"].as_f64().unwrap_or(0.0), limits["abs"].as_f64().unwrap_or(0.0));
            assert!(relative > 0.0 || absolute > 0.0, "{}", vector["name"]);
            let expected = expected.as_f64().expect("a number");
            let own = own(key, t, p).unwrap_or_else(|| panic!("{key}"));
            let off = (own - expected).abs();
            assert!(off <= relative * expected.abs() + absolute, "{} {key}: {own}, {expected}", vector["name"]);
            checked += 1;
        }
        if let Some(other) = vector["cross_check"]["iapws95_rho_kg_m3"].as_f64() {
            let own = found(t, p, false);
            assert!((own / other - 1.0).abs() < 1.5e-6, "{}: {own}, IAPWS-95 {other}", vector["name"]);
            cross_checked += 1;
        }
    }
    assert_eq!((checked, cross_checked), (70, 20));
}

/// Every sensitivity of a result against central differences of the graph evaluated anew.
fn compare_with_differences(graph: &Graph, id: NodeId, steps: &[(&str, f64)]) {
    for (path, step) in steps {
        let input = graph.find(path).unwrap_or_else(|| panic!("{path}"));
        let at = |by: f64| {
            let moved = BTreeMap::from([(input, Value::Scalar(graph.number(input) + by))]);
            evaluate_displaced(graph, &moved, id).expect("evaluates")[id.index()].number()
        };
        let difference = (at(*step) - at(-step)) / (2.0 * step);
        let own = slope(graph, id, path);
        // A result resolves 1e-16 of itself, which a difference divides by its step.
        let rounding = 4.0 * f64::EPSILON * graph.number(id).abs() / step;
        assert!((own - difference).abs() <= 1e-6 * own.abs() + rounding, "{path}: {own} against {difference}");
        assert!(own != 0.0, "{path}");
    }
}

#[test]
fn sensitivities_of_water_agree_with_differences() {
    for (celsius, pascals) in [(0.5, 60_000.0), (12.0, 101_000.0), (20.0, 99_000.0), (24.5, 900_000.0)] {
        let b = Builder::default();
        let isotopes = Isotopes { oxygen: input(&b, "O", "1", -7e-3), hydrogen: input(&b, "D", "1", -50e-3) };
        let rho = density(&b, Water { isotopes: Some(isotopes), ..water(&b, celsius, pascals, true) });
        let id = rho.id;
        let (graph, _) = b.finish();
        let steps = [("t", 1e-2), ("p", 1e3), ("x_a", 0.1), ("O", 0.1), ("D", 0.1), ("tanaka_2001.equation", 1e-3)];
        compare_with_differences(&graph, id, &steps);
    }
}

/// Two densities of one record share the departure of the equation; alone it is the whole uncertainty of exact water.
#[test]
fn the_equation_is_one_shared_input() {
    let b = Builder::default();
    let water = |celsius: f64| Water {
        temperature: exact(&b, celsius, "°C"),
        pressure: exact(&b, 101_325.0, "Pa"),
        dissolved_air: None,
        isotopes: None,
    };
    let (first, second) = (density(&b, water(20.0)), density(&b, water(22.0)));
    let (alone, ratio, value) = (first.id, (first / second).id, first.number());
    let (graph, _) = b.finish();
    let u = standard_uncertainty(&graph, &sensitivities(&graph, alone));
    assert!((u / value / EQUATION_UNCERTAINTY - 1.0).abs() < 1e-12, "{u}");
    assert!(standard_uncertainty(&graph, &sensitivities(&graph, ratio)) < 1e-20);
}

/// An input of every field of a weighing in water, in SI units.
fn weighing<'g>(b: &'g Builder, water_density: Quantity<'g>, difference: f64) -> Weighing<'g> {
    Weighing {
        mass: input(b, "m_x", "kg", 1.0),
        difference: input(b, "d", "kg", difference),
        exchange_mass: input(b, "m_s", "kg", 0.875),
        exchange_density: input(b, "rho_s", "kg/m3", 7990.0),
        air_density: input(b, "rho_a", "kg/m3", 1.17),
        water_density,
        gradient: input(b, "gamma", "/m", 3.1e-7),
        height: input(b, "dh", "m", 0.45),
    }
}

/// Water, weighing and expansion in one graph: the balance of forces gives the difference, the method the volume again.
#[test]
fn a_volume_is_found_again_through_water_and_expansion() {
    let (v_20, beta, t_w, p) = (125.1e-6, 47e-6, 21.3, 99_000.0);
    let rho_w = found(t_w, p, true);
    let v = v_20 * (1.0 + beta * (t_w - 20.0));
    let d = 1.0 - rho_w * v - 0.875 * (1.0 - 1.17 / 7990.0) * (1.0 - 3.1e-7 * 0.45);
    let b = Builder::default();
    let water = water(&b, t_w, p, true);
    let given = weighing(&b, density(&b, water), d);
    let t_ref = exact(&b, 20.0, "°C").as_kind(Kind::Temperature);
    let beta = input(&b, "beta", "/K", beta);
    let volume = at_reference(volume(given), beta, t_ref, water.temperature);
    assert!(b.take_problems().is_empty());
    assert_eq!(volume.kind(), Kind::Volume);
    assert!((volume.number() / v_20 - 1.0).abs() < 1e-13, "{}", volume.number());
    let id = volume.id;
    let (graph, _) = b.finish();
    let steps = [
        ("m_x", 1e-4),
        ("d", 1e-4),
        ("m_s", 1e-4),
        ("rho_s", 1.0),
        ("rho_a", 0.1),
        ("gamma", 1e-2),
        ("dh", 1e4),
        ("t", 1e-2),
        ("p", 1e3),
        ("x_a", 0.1),
        ("beta", 1e-4),
        ("tanaka_2001.equation", 1e-4),
    ];
    compare_with_differences(&graph, id, &steps);
    // 0.15 mg of the mass known beforehand are 0.15 mm³.
    let of_mass = 0.15e-6 * slope(&graph, id, "m_x");
    assert!((of_mass - 1.503e-10).abs() < 5e-14, "{of_mass}");
}

#[test]
fn sensitivities_of_sorption_agree_with_differences() {
    let b = Builder::default();
    let (in_air, in_vacuum) = (input(&b, "air", "kg", 31e-9), input(&b, "vacuum", "kg", -4e-9));
    let (a_1, a_2) = (input(&b, "a_1", "m2", 0.0153), input(&b, "a_2", "m2", 0.0461));
    let (area, cycle) = (input(&b, "area", "m2", 0.0147), input(&b, "cycle", "kg", 0.0));
    let m = input(&b, "m", "kg", 1.0);
    let eta = coefficient(in_air, in_vacuum, a_1, a_2);
    let taken_up = mass_in_air(m, eta, area, Some(cycle)) - m.in_state(Some(State::Air));
    assert!(b.take_problems().is_empty());
    let expected = 35e-9 / 0.0308 * 0.0147;
    // The difference of two masses of 1 kg resolves 2e-16 kg.
    assert!((taken_up.number() - expected).abs() < 3e-16, "{}", taken_up.number());
    let (eta, air) = (eta.id, mass_in_air(m, eta, area, Some(cycle)).id);
    let (graph, _) = b.finish();
    compare_with_differences(&graph, eta, &[("air", 1e-9), ("vacuum", 1e-9), ("a_1", 1e-6), ("a_2", 1e-6)]);
    compare_with_differences(
        &graph,
        air,
        &[("m", 1e-3), ("air", 1e-6), ("vacuum", 1e-6), ("area", 1e-3), ("cycle", 1e-6)],
    );
    // The same gain on a larger second area is less for each area.
    assert!(slope(&graph, eta, "a_2") < 0.0 && slope(&graph, eta, "a_1") > 0.0);
}
