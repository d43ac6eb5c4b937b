//! Vectors of voltages, resistances, velocities and refractive indices against the methods.

#![allow(clippy::disallowed_methods)]

use libripens::graph::{Builder, Distribution, InputDraft, Origin, Quantity, Value, evaluate_displaced, sensitivities};
use libripens::method::{
    constants, exact, interferometer_velocity, josephson_voltage, quantum_hall_resistance, refractive_index_ciddor,
    refractive_index_edlen, residual_gas_buoyancy, unit,
};
use libripens::quantity::Kind;
use serde_json::Value as Json;
use std::collections::BTreeMap;
use std::path::Path;

fn vectors(prefix: &str) -> Vec<Json> {
    let path = Path::new(env!("CARGO_MANIFEST_DIR")).join("tests/published/electric-and-optical.json");
    let text = std::fs::read_to_string(path).expect("vectors");
    let all = serde_json::from_str::<Json>(&text).expect("JSON").as_array().expect("a list").clone();
    let found: Vec<Json> =
        all.into_iter().filter(|vector| vector["name"].as_str().is_some_and(|name| name.starts_with(prefix))).collect();
    assert!(!found.is_empty(), "no vector {prefix}");
    found
}

fn given(vector: &Json, key: &str) -> f64 {
    vector["inputs"][key].as_f64().unwrap_or_else(|| panic!("{} {key}", vector["name"]))
}

/// Within the vector's own tolerance, but never closer than the last bits of a double.
fn agrees(vector: &Json, key: &str, found: f64) {
    let expected = vector["expected"][key].as_f64().unwrap_or_else(|| panic!("{} {key}", vector["name"]));
    let relative = vector["tolerance"]["rel"].as_f64().map(|relative| relative * expected.abs());
    let tolerance = relative.or_else(|| vector["tolerance"]["abs"].as_f64()).expect("a tolerance");
    assert!((found - expected).abs() <= tolerance, "{} {key}: {found} against {expected}", vector["name"]);
}

#[test]
fn constants_follow_from_the_defining_ones() {
    let b = Builder::default();
    let vector = &vectors("constants.KJ_RK")[0];
    agrees(vector, "K_J_Hz_per_V", constants::known(&b, "K_J").number());
    agrees(vector, "R_K_ohm", constants::known(&b, "R_K").number());
    agrees(&vectors("constants.R_gas")[0], "R", constants::known(&b, "R").number());
}

#[test]
fn voltage_resistance_and_velocity_agree() {
    let b = Builder::default();
    let k = |value, text| exact(&b, value, text);
    let vector = &vectors("kibble.josephson")[0];
    let step = josephson_voltage::step_voltage(k(given(vector, "f_Hz"), "Hz"), b.number(0.0));
    agrees(vector, "U_V", (given(vector, "n") * step).number());
    let vector = &vectors("kibble.qhr")[0];
    let resistance =
        |ratio: f64| quantum_hall_resistance::resistance(b.number(ratio), given(vector, "i"), b.number(0.0));
    agrees(vector, "R_ohm", resistance(given(vector, "ratio")).number());
    agrees(vector, "R_H_ohm", resistance(1.0).number());
    let vector = &vectors("kibble.fringe_velocity")[0];
    let laser = k(given(vector, "f_laser_Hz"), "Hz");
    agrees(vector, "lambda_m", interferometer_velocity::vacuum_wavelength(laser).number());
    let (y, n, gate) = (b.number(given(vector, "y")), b.number(given(vector, "n_gas")), k(given(vector, "tau_s"), "s"));
    let v = interferometer_velocity::velocity(b.number(given(vector, "N")), laser, y, n, gate);
    agrees(vector, "v_m_per_s", v.number());
}

/// Voltage, resistance and velocity put together: e leaves, the mass rests on h alone.
#[test]
fn the_ideal_mass_follows_from_both_effects() {
    let b = Builder::default();
    let vector = &vectors("kibble.mass_quantum")[0];
    let step = |key| josephson_voltage::step_voltage(exact(&b, given(vector, key), "Hz"), b.number(0.0));
    let r = quantum_hall_resistance::resistance(b.number(given(vector, "ratio")), given(vector, "i"), b.number(0.0));
    let (g, v) = (exact(&b, given(vector, "g"), "m/s2"), exact(&b, given(vector, "v"), "m/s"));
    let m = (given(vector, "n1") * step("f1")) * (given(vector, "n2") * step("f2")) / (r * g * v);
    assert_eq!(m.dimension(), unit("kg").dimension());
    agrees(vector, "m_kg", m.number());
}

#[test]
fn refractive_indices_agree() {
    let b = Builder::default();
    let k = |value, text| exact(&b, value, text);
    for vector in vectors("air.edlen") {
        let n = refractive_index_edlen::index(
            k(given(&vector, "lambda_um"), "µm"),
            k(given(&vector, "t_degC"), "°C"),
            k(given(&vector, "p_Pa"), "Pa"),
            k(given(&vector, "p_v_Pa"), "Pa"),
        );
        agrees(&vector, "n_minus_1_1e8", (n.number() - 1.0) * 1e8);
    }
    for vector in vectors("air.ciddor") {
        let n = refractive_index_ciddor::index(
            k(given(&vector, "lambda_um"), "µm"),
            k(given(&vector, "t_degC"), "°C"),
            k(given(&vector, "p_Pa"), "Pa"),
            k(given(&vector, "xv"), "1"),
            k(given(&vector, "xCO2_ppm"), "µmol/mol"),
        );
        agrees(&vector, "n_minus_1_1e8", (n.number() - 1.0) * 1e8);
    }
    let vector = &vectors("vacuum.residual_gas")[0];
    let (p, t) = (k(given(vector, "p_Pa"), "Pa"), k(given(vector, "T_K"), "K"));
    let rho = residual_gas_buoyancy::density(p, t, k(given(vector, "M"), "kg/mol"));
    agrees(vector, "rho", rho.number());
    agrees(vector, "buoyancy_kg", (rho * k(given(vector, "V_m3"), "m3")).number());
    let r = k(given(vector, "refractivity_K_per_Pa"), "K/Pa");
    // The index itself keeps n − 1 to 2⁻⁵³ only.
    let found = residual_gas_buoyancy::refractive_index(p, t, r).number() - 1.0;
    let expected = vector["expected"]["n_minus_1"].as_f64().expect("n − 1");
    assert!((found - expected).abs() < 2e-16, "{found} against {expected}");
    assert!(b.take_problems().is_empty());
}

fn input<'g>(b: &'g Builder, path: &str, text: &str, value: f64) -> Quantity<'g> {
    let origin = Origin::Assumed("test");
    let mut draft = InputDraft::new(path, path, path, Kind::Plain, unit(text), Value::Scalar(value), origin);
    draft.distribution = Distribution::Normal { standard_uncertainty: 1e-6 * value };
    b.input(draft)
}

/// Sensitivities of every formula here against central differences.
#[test]
fn sensitivities_agree_with_differences() {
    let b = Builder::default();
    let (wavelength, t) = (input(&b, "lambda", "nm", 633e-9), input(&b, "t", "K", 293.65));
    let (p, p_v) = (input(&b, "p", "Pa", 98_700.0), input(&b, "p_v", "Pa", 1100.0));
    let (x_v, x_c) = (input(&b, "x_v", "1", 0.0111), input(&b, "x_c", "1", 430e-6));
    let (f, y, gate) = (input(&b, "f", "Hz", 4.7e14), input(&b, "y", "1", 2e-3), input(&b, "gate", "s", 0.1));
    let (ratio, bridge) = (input(&b, "r", "1", 0.0077), input(&b, "b", "1", 1e-3));
    let n = refractive_index_edlen::index(wavelength, t, p, p_v);
    for measurand in [
        n - 1.0,
        refractive_index_ciddor::index(wavelength, t, p, x_v, x_c) - 1.0,
        interferometer_velocity::velocity(b.number(632.0), f, y, n, gate),
        josephson_voltage::step_voltage(josephson_voltage::frequency(f, y), bridge),
        quantum_hall_resistance::resistance(ratio, 2.0, bridge),
    ] {
        let graph = b.graph();
        let found = sensitivities(&graph, measurand.id);
        for (number, input) in graph.inputs.iter().enumerate() {
            let step = 1e-4 * graph.number(input.node);
            let at = |by: f64| {
                let moved = BTreeMap::from([(input.node, Value::Scalar(graph.number(input.node) + by))]);
                evaluate_displaced(&graph, &moved, measurand.id).expect("evaluates")[measurand.id.index()].number()
            };
            let difference = (at(step) - at(-step)) / (2.0 * step);
            let own = found.inputs.get(&(number as u32)).map_or(0.0, |rows| rows[0]);
            // A value near 1 resolves 1e-16, which a difference divides by its step.
            let rounding = 4e-16 * graph.number(measurand.id).abs().max(1.0) / step;
            assert!((own - difference).abs() <= 1e-6 * own.abs() + rounding, "{number}: {own} against {difference}");
        }
    }
}
