//! Published and high-precision vectors against the methods, and sensitivities against finite differences for every
//! method the example campaign uses. Sources stand in the vector files and in `tests/published/README.md`.

#![allow(clippy::disallowed_methods)]

use libripens::diagnostic::Code;
use libripens::graph::{
    Builder, Distribution, Estimator, InputDraft, Origin, Quantity, Value, budget, degrees_of_freedom,
    evaluate_displaced, sensitivities, standard_uncertainty,
};
use libripens::intake::MemoryIntake;
use libripens::method::air_density::{Air, Humidity, check_validity, density};
use libripens::method::averaging_cycle::{AveragedDifferences, AveragingCycle};
use libripens::method::design_control::precision;
use libripens::method::weighing_cycle::{Dispersion, MeanDifference, Scheme, regular_cycles};
use libripens::method::weighing_design::{Scatter, Solution, WeighingDesign};
use libripens::method::{METHODS, conventional_mass, exact, unit};
use libripens::numeric::distribution::coverage_factor;
use libripens::quantity::Kind;
use serde_json::Value as Json;
use std::collections::BTreeMap;
use std::path::Path;

fn vectors(file: &str) -> Vec<Json> {
    let path = Path::new(env!("CARGO_MANIFEST_DIR")).join("tests/published").join(file);
    let text = std::fs::read_to_string(path).expect("vectors");
    serde_json::from_str::<Json>(&text).expect("JSON").as_array().expect("a list").clone()
}

fn number(vector: &Json, part: &str, key: &str) -> f64 {
    vector[part][key].as_f64().unwrap_or_else(|| panic!("{} {part} {key}", vector["name"]))
}

fn close(found: f64, expected: f64, relative: f64, what: &str) {
    assert!(
        (found - expected).abs() <= relative * expected.abs() + f64::MIN_POSITIVE,
        "{what}: {found} against {expected}"
    );
}

fn input<'g>(b: &'g Builder, path: &str, unit_text: &str, value: f64, u: f64) -> Quantity<'g> {
    let mut draft =
        InputDraft::new(path, path, path, Kind::Plain, unit(unit_text), Value::Scalar(value), Origin::Assumed("test"));
    if u > 0.0 {
        draft.distribution = Distribution::Normal { standard_uncertainty: u };
    }
    b.input(draft)
}

/// The air of a vector; the uncertainties of temperature, pressure, humidity and carbon dioxide are optional.
fn air<'g>(b: &'g Builder, vector: &Json, dew: Option<f64>, u: [f64; 4]) -> Air<'g> {
    let humidity = match dew {
        Some(dew) => Humidity::DewPoint(input(b, "t_d", "K", dew + 273.15, u[2])),
        None => Humidity::Relative(input(b, "h", "1", number(vector, "inputs", "h_fraction"), u[2])),
    };
    Air {
        temperature: input(b, "t", "K", number(vector, "inputs", "t_degC") + 273.15, u[0]),
        pressure: input(b, "p", "Pa", number(vector, "inputs", "p_Pa"), u[1]),
        humidity,
        carbon_dioxide: input(b, "x", "1", number(vector, "inputs", "x_CO2_mol_mol"), u[3]),
    }
}

/// CIPM-2007 against 47 high-precision vectors: relative humidity and dew point, inside and outside the range.
#[test]
fn air_density_agrees_with_every_vector() {
    let mut checked = 0;
    for vector in vectors("air-density.json") {
        let name = vector["name"].as_str().expect("name").to_string();
        if name.starts_with("simplified") || name.starts_with("sensitivities") || name.starts_with("uncertainty") {
            continue;
        }
        let b = Builder::default();
        let dew = vector["inputs"]["t_dew_degC"].as_f64();
        let rho = density(&b, air(&b, &vector, dew, [0.0; 4])).number();
        close(rho, number(&vector, "expected", "rho_kg_m3"), 1e-12, &name);
        let valid = vector["expected"]["in_validity_range"].as_bool().expect("flag");
        let t = number(&vector, "inputs", "t_degC") + 273.15;
        let verdict = check_validity(&[t], &[number(&vector, "inputs", "p_Pa")]);
        assert_eq!(verdict.is_ok(), valid, "{name}");
        assert!(valid || verdict.is_err_and(|(row, problem)| row == 0 && problem.code == Code::OutOfValidity));
        checked += 1;
    }
    assert_eq!(checked, 37);
}

#[test]
fn air_density_is_valid_up_to_its_edges() {
    for (t, p, valid) in [
        (288.15, 60_000.0, true),
        (300.15, 110_000.0, true),
        (288.149, 60_000.0, false),
        (300.151, 110_000.0, false),
        (293.15, 59_999.0, false),
        (293.15, 110_001.0, false),
        (f64::NAN, 100_000.0, false),
    ] {
        assert_eq!(check_validity(&[t], &[p]).is_ok(), valid, "{t} K, {p} Pa");
    }
}

#[test]
fn air_density_has_the_published_sensitivities_and_uncertainty() {
    let list = vectors("air-density.json");
    let find = |start: &str| {
        list.iter().find(|one| one["name"].as_str().is_some_and(|name| name.starts_with(start))).expect("vector")
    };
    let (derivatives, example) = (find("sensitivities"), find("uncertainty example"));
    let u = ["u_t_K", "u_p_Pa", "u_h_fraction", "u_xCO2"].map(|key| number(example, "inputs", key));
    let b = Builder::default();
    let id = density(&b, air(&b, example, None, u)).id;
    let (graph, _) = b.finish();
    let lines = budget(&graph, id).lines;
    let line = |path: &str| lines.iter().find(|line| line.path == path).unwrap_or_else(|| panic!("{path}"));
    for (path, slope, contribution) in [
        ("p", "drho_dp_kg_m3_Pa", "contrib_p_kg_m3"),
        ("t", "drho_dt_kg_m3_K", "contrib_t_kg_m3"),
        ("h", "drho_dh_kg_m3_per_unit_fraction", "contrib_h_kg_m3"),
        ("x", "drho_dxCO2_kg_m3_per_mol_mol", "contrib_xCO2_kg_m3"),
    ] {
        close(line(path).sensitivity_coefficient.expect("scalar"), number(derivatives, "expected", slope), 1e-7, slope);
        close(line(path).contribution, number(example, "expected", contribution), 1e-6, contribution);
    }
    close(
        line("cipm_2007.equation").contribution,
        number(example, "expected", "contrib_equation_kg_m3"),
        1e-6,
        "equation",
    );
    let total = standard_uncertainty(&graph, &sensitivities(&graph, id));
    close(total, number(example, "expected", "u_rho_kg_m3"), 1e-6, "u(rho)");
}

#[test]
fn dew_point_has_the_published_sensitivity() {
    let list = vectors("air-density.json");
    let vector = list
        .iter()
        .find(|one| one["name"].as_str().is_some_and(|name| name.starts_with("sensitivities")))
        .expect("vector");
    let b = Builder::default();
    let dew = number(vector, "expected", "equivalent_dew_point_degC");
    let id = density(&b, air(&b, vector, Some(dew), [0.0, 0.0, 0.1, 0.0])).id;
    let (graph, _) = b.finish();
    let node = graph.find("t_d").expect("dew point");
    let libripens::graph::Op::Input(input) = graph.node(node).op else { panic!("an input") };
    let slope = sensitivities(&graph, id).inputs[&input][0];
    close(slope, number(vector, "expected", "drho_dtd_kg_m3_K"), 1e-7, "d rho / d t_d");
}

#[test]
fn conventional_mass_both_ways() {
    let mut checked = 0;
    for vector in vectors("r111.json") {
        let name = vector["name"].as_str().expect("name").to_string();
        let b = Builder::default();
        if name.starts_with("conventional mass of") {
            let rho = exact(&b, number(&vector, "inputs", "rho_kg_m3"), "kg/m3");
            let m = exact(&b, number(&vector, "inputs", "m_true_g"), "g").as_kind(Kind::Mass);
            let found = conventional_mass::from_mass(&b, m, rho);
            close(found.number() * 1e3, number(&vector, "expected", "m_conventional_g"), 1e-13, &name);
            assert_eq!(found.kind(), Kind::ConventionalMass);
            let back = conventional_mass::to_mass(&b, found, rho);
            close(back.number(), m.number(), 4e-16, &name);
            checked += 1;
        } else if name.starts_with("true mass from") {
            let rho = exact(&b, number(&vector, "inputs", "rho_kg_m3"), "kg/m3");
            let m_c = exact(&b, number(&vector, "inputs", "m_conventional_g"), "g").as_kind(Kind::ConventionalMass);
            let found = conventional_mass::to_mass(&b, m_c, rho);
            close(found.number() * 1e3, number(&vector, "expected", "m_true_g"), 1e-13, &name);
            checked += 1;
        }
    }
    assert_eq!(checked, 14);
}

fn numbers(value: &Json) -> Vec<f64> {
    value.as_array().expect("list").iter().map(|x| x.as_f64().expect("number")).collect()
}

/// The weighing cycles of OIML R 111-1:2004, C.4 and C.6.1.
#[test]
fn weighing_cycles_of_r111() {
    for vector in vectors("r111.json") {
        let name = vector["name"].as_str().expect("name").to_string();
        let scheme = match name.as_str() {
            name if name.starts_with("cycle ABBA") => Scheme::Abba,
            name if name.starts_with("cycle ABA") => Scheme::Aba,
            _ => continue,
        };
        let cycles: Vec<Vec<f64>> =
            vector["inputs"]["cycles"].as_array().expect("cycles").iter().map(numbers).collect();
        let readings: Vec<f64> = cycles.concat();
        let rule = MeanDifference::new(&regular_cycles(scheme, cycles.len(), true), Dispersion::Own).expect("rule");
        let found = rule.estimate(&[&readings]).expect("estimates");
        close(found.values[0], number(&vector, "expected", "mean"), 1e-9, &name);
        close(found.own_covariance[0][0].sqrt(), number(&vector, "expected", "u_w"), 1e-9, &name);
        assert_eq!(found.degrees_of_freedom, cycles.len() as f64 - 1.0);
    }
}

#[test]
fn averaging_cycles_of_r111() {
    let list = vectors("r111.json");
    let vector =
        list.iter().find(|one| one["name"].as_str().is_some_and(|name| name.starts_with("cycle AB1"))).expect("vector");
    let mut readings = Vec::new();
    for cycle in vector["inputs"]["cycles"].as_array().expect("cycles") {
        readings.push(cycle["r1"].as_f64().expect("r1"));
        readings.extend(numbers(&cycle["t"]));
        readings.push(cycle["r2"].as_f64().expect("r2"));
    }
    let cycle =
        |start: usize| AveragingCycle { first: start, tests: vec![start + 1, start + 2, start + 3], last: start + 4 };
    let rule = AveragedDifferences { weights: 3, cycles: vec![cycle(0), cycle(5)], dispersion: Dispersion::Own };
    let found = rule.estimate(&[&readings]).expect("estimates");
    for (index, expected) in numbers(&vector["expected"]["mean_differences"]).into_iter().enumerate() {
        close(found.values[index], expected, 1e-9, "mean difference");
        let s = numbers(&vector["expected"]["s"])[index];
        close(found.own_covariance[index][index].sqrt() * 2f64.sqrt(), s, 1e-9, "s");
    }
}

#[test]
fn effective_degrees_of_freedom_and_coverage_factors() {
    for vector in vectors("stats.json") {
        let name = vector["name"].as_str().expect("name").to_string();
        if !name.starts_with("Welch-Satterthwaite") {
            continue;
        }
        let b = Builder::default();
        let freedoms = vector["inputs"]["nu"].as_array().expect("ν");
        let parts: Vec<Quantity<'_>> = numbers(&vector["inputs"]["u"])
            .iter()
            .zip(freedoms)
            .enumerate()
            .map(|(index, (u, nu))| {
                let mut draft = InputDraft::new(
                    &format!("x{index}"),
                    "x",
                    "x",
                    Kind::Plain,
                    unit("1"),
                    Value::Scalar(0.0),
                    Origin::Assumed("test"),
                );
                draft.distribution = Distribution::Normal { standard_uncertainty: *u };
                draft.degrees_of_freedom = nu.as_f64().unwrap_or(f64::INFINITY);
                b.input(draft)
            })
            .collect();
        let id = parts.iter().copied().reduce(|sum, next| sum + next).expect("parts").id;
        let (graph, _) = b.finish();
        let of = sensitivities(&graph, id);
        close(standard_uncertainty(&graph, &of), number(&vector, "expected", "u_c"), 1e-9, &name);
        let nu = degrees_of_freedom(&graph, &of);
        let p = number(&vector, "inputs", "p");
        match vector["expected"]["nu_eff"].as_f64() {
            Some(expected) => {
                close(nu, expected, 1e-9, &name);
                close(coverage_factor(p, nu.floor()), number(&vector, "expected", "k_truncated"), 1e-9, &name);
                close(coverage_factor(p, nu), number(&vector, "expected", "k_real_nu"), 1e-9, &name);
            }
            None => {
                assert!(nu.is_infinite());
                close(coverage_factor(p, nu), number(&vector, "expected", "k_truncated"), 1e-9, &name);
            }
        }
    }
}

/// The design of a vector; the restraint is the sum of the items listed, the first where none are.
fn weighing_design(vector: &Json) -> WeighingDesign {
    let comparisons: Vec<Vec<f64>> = vector["inputs"]["A_rows"].as_array().expect("A").iter().map(numbers).collect();
    let size = comparisons[0].len();
    let items = match vector["inputs"]["restraint_items"].as_array() {
        Some(_) => numbers(&vector["inputs"]["restraint_items"]),
        None => vec![0.0],
    };
    WeighingDesign {
        weights: (0..size).map(|j| format!("weight {j}")).collect(),
        comparisons,
        restraints: vec![(0..size).map(|j| if items.contains(&(j as f64)) { 1.0 } else { 0.0 }).collect()],
        relative: None,
        scatter: Scatter::Observed,
        check: None,
        confidence: 0.95,
    }
}

/// Each within an absolute tolerance.
fn all_close(found: &[f64], expected: &[f64], tolerance: f64, what: &str) {
    assert_eq!(found.len(), expected.len(), "{what}");
    for (found, expected) in found.iter().zip(expected) {
        assert!((found - expected).abs() <= tolerance, "{what}: {found} against {expected}");
    }
}

fn fractions(list: &Json) -> Vec<f64> {
    let fraction = |text: &Json| {
        let (above, below) =
            text.as_str().expect("text").split_once('/').unwrap_or((text.as_str().expect("text"), "1"));
        above.parse::<f64>().expect("number") / below.parse::<f64>().expect("number")
    };
    list.as_array().expect("a list").iter().map(fraction).collect()
}

fn deviations(found: &Solution, s: f64) -> Vec<f64> {
    (0..found.masses.len()).map(|j| s * found.unscaled_covariance[j][j].sqrt()).collect()
}

#[test]
fn weighing_designs_have_the_published_solutions() {
    let mut seen = 0;
    for vector in vectors("stats.json").iter().filter(|vector| vector["expected"]["solution_rational"].is_array()) {
        let name = vector["name"].as_str().expect("name");
        let rule = weighing_design(vector);
        let found = rule.solve(&vec![0.0; rule.comparisons.len()], &[0.0]).expect("a solution");
        let expected = &vector["expected"];
        for (row, exact) in found.by_difference.iter().zip(expected["solution_rational"].as_array().expect("rows")) {
            all_close(row, &fractions(exact), 1e-15, name);
        }
        let by_restraint: Vec<f64> = found.by_restraint.iter().map(|row| row[0]).collect();
        all_close(&by_restraint, &fractions(&expected["restraint_factors"]), 1e-15, name);
        all_close(&deviations(&found, 1.0), &numbers(&expected["repeatability_factors"]), 1e-9, name);
        if expected["published_repeatability_factors"].is_array() {
            let printed = numbers(&expected["published_repeatability_factors"]);
            all_close(&deviations(&found, 1.0)[..printed.len()], &printed, 5.1e-5, name);
        }
        close(found.degrees_of_freedom, number(vector, "expected", "dof"), 0.0, name);
        seen += 1;
    }
    assert_eq!(seen, 7);
}

#[test]
fn weighing_designs_with_numbers() {
    let mut seen = 0;
    for vector in vectors("stats.json").iter().filter(|vector| vector["inputs"]["restraint_deviation_mg"].is_number()) {
        let (name, expected) = (vector["name"].as_str().expect("name"), &vector["expected"]);
        let rule = weighing_design(vector);
        let (y, value) = (numbers(&vector["inputs"]["y_mg"]), number(vector, "inputs", "restraint_deviation_mg"));
        let (found, estimate) =
            (rule.solve(&y, &[value]).expect("found"), rule.estimate(&[&y, &[value]]).expect("found"));
        all_close(&found.masses, &numbers(&expected["b_mg"]), 1e-11, name);
        all_close(&found.residuals, &numbers(&expected["residuals_mg"]), 1e-11, name);
        close(found.variance().expect("s").sqrt(), number(vector, "expected", "s_mg"), 1e-8, name);
        let u_squared = number(vector, "inputs", "u_restraint_mg").powi(2);
        let row = |i: usize| -> Vec<f64> {
            let shared = |j: usize| found.by_restraint[i][0] * found.by_restraint[j][0] * u_squared;
            (0..found.masses.len()).map(|j| estimate.own_covariance[i][j] + shared(j)).collect()
        };
        all_close(&row(0), &numbers(&expected["covariance_first_row_mg2"]), 1e-11, name);
        all_close(&row(found.masses.len() - 1), &numbers(&expected["covariance_last_row_mg2"]), 1e-11, name);
        seen += 1;
    }
    assert_eq!(seen, 3);
}

#[test]
fn weighing_design_of_unlike_comparisons() {
    let list = vectors("stats.json");
    let vector = list.iter().find(|vector| vector["inputs"]["s_known_mg"].is_array()).expect("the vector");
    let mut rule = weighing_design(vector);
    rule.relative = Some(numbers(&vector["inputs"]["s_known_mg"]));
    rule.scatter = Scatter::Accepted { deviation: 1.0, degrees_of_freedom: f64::INFINITY };
    let (y, value) = (numbers(&vector["inputs"]["y_mg"]), number(vector, "inputs", "reference_deviation_mg"));
    let found = rule.solve(&y, &[value]).expect("found");
    all_close(&found.masses[1..], &numbers(&vector["expected"]["b_mg"]), 1e-11, "masses");
    close(found.residual_sum_of_squares, number(vector, "expected", "chi2"), 1e-7, "chi-square");
    let u_reference = number(vector, "inputs", "u_reference_mg");
    let u = |j: usize| (found.unscaled_covariance[j][j] + (found.by_restraint[j][0] * u_reference).powi(2)).sqrt();
    all_close(&(1..6).map(u).collect::<Vec<_>>(), &numbers(&vector["expected"]["u_mg"]), 1e-9, "u");
    let precision = precision((found.variance().expect("s"), 3.0), (1.0, f64::INFINITY), 0.95).expect("a test");
    close(precision.probability, number(vector, "expected", "p_value"), 1e-7, "p");
}

/// Masses of the subdivision of a whole campaign, reduced independently.
#[test]
fn subdivision_of_a_kilogram() {
    let vector = &vectors("subdivision.json")[0];
    let expected = &vector["expected"];
    let rule = weighing_design(vector);
    let found =
        rule.solve(&numbers(&vector["inputs"]["y_kg"]), &[number(vector, "inputs", "reference_kg")]).expect("found");
    all_close(&found.masses, &numbers(&expected["masses_kg"]), 2e-11, "masses");
    close(found.variance().expect("s").sqrt(), number(vector, "expected", "s_kg"), 1e-3, "s");
    for (row, exact) in found.unscaled_covariance.iter().zip(expected["C"].as_array().expect("C")) {
        all_close(row, &numbers(exact), 1e-15, "C");
    }
    let by_restraint: Vec<f64> = found.by_restraint.iter().map(|row| row[0]).collect();
    all_close(&by_restraint, &numbers(&expected["restraint_factors"]), 1e-15, "D");
    let (accepted, freedom) = (number(vector, "inputs", "accepted_kg"), number(vector, "inputs", "accepted_dof"));
    let precision =
        precision((found.variance().expect("s"), found.degrees_of_freedom), (accepted, freedom), 0.95).expect("a test");
    close(precision.statistic, number(vector, "expected", "F"), 1e-3, "F");
    close(precision.limit, number(vector, "expected", "F_limit_95"), 1e-12, "limit of F");
    assert!(precision.passed);
}

fn read_into(root: &Path, folder: &Path, files: &mut BTreeMap<String, Vec<u8>>) {
    for entry in std::fs::read_dir(folder).expect("folder") {
        let path = entry.expect("entry").path();
        let name = path.strip_prefix(root).expect("inside").to_string_lossy().replace('\\', "/");
        match path.is_dir() {
            true => read_into(root, &path, files),
            false => drop(files.insert(name, std::fs::read(&path).expect("file"))),
        }
    }
}

/// Every scalar input of every mass in the example, so every method on the way, against central differences.
#[test]
fn sensitivities_agree_with_differences_through_every_method_of_the_example() {
    let root = Path::new(env!("CARGO_MANIFEST_DIR")).join("example-records");
    let mut files = BTreeMap::new();
    read_into(&root, &root, &mut files);
    let intake = MemoryIntake { files, ..MemoryIntake::default() };
    let engine = libripens::reduce(&intake, None).expect("readable");
    let graph = engine.graph();
    let mut methods = std::collections::BTreeSet::new();
    for result in ["W1.conventional_mass", "W5.mass", "W6.difference", "R2.conventional_mass"] {
        let id = graph.find(result).unwrap_or_else(|| panic!("{result}"));
        for step in libripens::graph::trail(&graph, id).steps {
            if let Origin::Computed(method) = &graph.node(step.node).origin {
                methods.insert(method.name);
            }
        }
        let derivatives = sensitivities(&graph, id);
        let combined = standard_uncertainty(&graph, &derivatives);
        for (input, weights) in &derivatives.inputs {
            let node = graph.inputs[*input as usize].node;
            let u = graph.inputs[*input as usize].distribution.standard_uncertainty();
            if graph.value(node).length().is_some() || u == 0.0 {
                continue;
            }
            let centre = graph.number(node);
            let at = |value: f64| {
                let moved = BTreeMap::from([(node, Value::Scalar(value))]);
                evaluate_displaced(&graph, &moved, id).expect("evaluates")[id.index()].number()
            };
            let contribution = (at(centre + u) - at(centre - u)) / 2.0;
            let off = (weights[0] * u - contribution).abs();
            let path = &graph.node(node).name.as_ref().expect("named").path;
            // A kilogram in binary resolves 1e-16: what lies below 1e-6 of u is rounding.
            assert!(off < 1e-4 * contribution.abs() + 1e-6 * combined, "{result} by {path}: {off}");
        }
    }
    for name in [
        "air-density",
        "combination",
        "comparator-sensitivity",
        "conventional-mass",
        "instrument-correction",
        "mass-on-day",
        "substitution",
        "type-a-mean",
        "weighing-cycle",
    ] {
        assert!(methods.contains(name), "{name} is not on the way of any result checked: {methods:?}");
    }
}

#[test]
fn every_method_has_a_source_and_agrees_with_its_published_checks() {
    for method in METHODS {
        for check in method.examples {
            assert!(
                check.agrees(),
                "{}: {} printed {}, found {}",
                method.info.name,
                check.quantity,
                check.printed,
                (check.found)()
            );
        }
    }
}
