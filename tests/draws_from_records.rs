//! Draws of Monte Carlo trials from inputs as records state them: each distribution against its quantiles, linear
//! models against closed forms, and nothing moved by what is unrelated.

#![allow(clippy::disallowed_methods)]

use libripens::graph::{propagate_distributions, sensitivities, standard_uncertainty};
use libripens::intake::MemoryIntake;
use proptest::prelude::*;
use serde_json::Value;

const LABORATORY: &str = "---\nformat: 1\nname: Test laboratory\naddress: Nowhere\ncoverage_probability: 95.45 %\ndecimal_marker: point\ndegrees_of_freedom: truncated\n---\n";

/// First-order u and the trials of `M.value`.
fn run(inputs: &str, equation: &str, more: &str, trials: usize) -> (f64, Vec<f64>) {
    let block =
        format!("```yaml measurement-model M\nmeasurand: sum\nunit: m\ninputs:\n{inputs}equation: {equation}\n```\n");
    let record = format!("---\nrecord: T-1\ndate: 2041-03-12\n---\n\n{more}\n{block}");
    let intake = MemoryIntake::with([("laboratory.md", LABORATORY.to_string()), ("record.md", record)]);
    let engine = libripens::reduce(&intake, None).expect("readable");
    assert!(!engine.complaints().has_faults(), "{:#?}", engine.complaints());
    let graph = engine.graph();
    let id = graph.find("M.value").expect("a value");
    let u = standard_uncertainty(&graph, &sensitivities(&graph, id));
    (u, propagate_distributions(&graph, &[id], trials).expect("runs").values.swap_remove(0))
}

/// How a record states an input with this distribution.
fn stated(distribution: &str, parameters: &Value) -> String {
    let number = |name: &str| parameters[name].as_f64().expect("a parameter");
    let limits = || format!("lower: {}, upper: {}", number("lower"), number("upper"));
    match distribution {
        "rectangular" | "triangular" | "arcsine" => {
            format!("{} m to {} m {distribution}", number("lower"), number("upper"))
        }
        "normal" => format!("{{value: {} m, u: {} m}}", number("mean"), number("standard_deviation")),
        "t" => format!("{{value: 0 m, u: 1 m, degrees_of_freedom: {}}}", number("degrees_of_freedom")),
        "trapezoidal" => format!("{{distribution: trapezoidal, {}, beta: {}, unit: m}}", limits(), number("beta")),
        "rectangular_inexact_limits" => {
            format!("{{distribution: {distribution}, {}, inexactness: {}, unit: m}}", limits(), number("d"))
        }
        "exponential" => format!("{{distribution: exponential, mean: {}, unit: m}}", number("mean")),
        "gamma" => format!("{{distribution: gamma, shape: {}, rate: {}, unit: m}}", number("shape"), number("rate")),
        other => panic!("no words for {other}"),
    }
}

/// The share of trials below each quantile is its probability, within five standard deviations of that share.
#[test]
fn every_distribution_follows_its_quantiles() {
    const TRIALS: usize = 100_000;
    let file: Value = serde_json::from_str(include_str!("published/quantiles.json")).expect("JSON");
    let (mut known, mut checked): (Vec<(String, Vec<f64>)>, usize) = (Vec::new(), 0);
    for vector in file["quantiles"].as_array().expect("a list") {
        let text = |name: &str| vector[name].as_str().expect("a text");
        let parameters = match text("distribution") {
            "t" if ["3", "7.3", "50"].contains(&text("degrees_of_freedom")) => {
                serde_json::json!({"degrees_of_freedom": text("degrees_of_freedom").parse::<f64>().expect("a number")})
            }
            "t" => continue,
            _ => vector["parameters"].clone(),
        };
        let input = stated(text("distribution"), &parameters);
        if known.last().is_none_or(|(last, _)| *last != input) {
            let values = run(&format!("  a: {input}\n"), "a", "", TRIALS).1;
            known.push((input.clone(), values));
        }
        let values = &known.last().expect("just drawn").1;
        let (p, quantile): (f64, f64) = (text("p").parse().expect("p"), text("quantile").parse().expect("a quantile"));
        let share = values.iter().filter(|value| **value <= quantile).count() as f64 / TRIALS as f64;
        let spread = (p * (1.0 - p) / TRIALS as f64).sqrt();
        assert!((share - p).abs() < 5.0 * spread, "{input}: {share} of the trials below the quantile of {p}");
        checked += 1;
    }
    assert_eq!((known.len(), checked), (11, 80));
}

/// A further block, and a further input of the model itself that is not used, leave every draw as it was.
#[test]
fn what_is_unrelated_moves_no_draw() {
    let inputs = "  a: 1.0(1) m\n  b: 2.0 m ± 0.3 m rectangular\n  c: {value: 3 m, u: 0.2 m, degrees_of_freedom: 7}\n";
    let bits = |inputs: &str, more: &str| -> Vec<u64> {
        run(inputs, "a + b*c/a", more, 5000).1.into_iter().map(f64::to_bits).collect()
    };
    let alone = bits(inputs, "");
    let other = "```yaml measurement-model A\nmeasurand: another\nunit: m\ninputs:\n  a: 5.0(7) m\n  z: 1.0(2) m\nequation: a + z\n```\n";
    assert!(alone == bits(inputs, other), "another block moved the draws");
    assert!(alone == bits(&format!("  A_0: 9.0(9) m\n{inputs}"), ""), "an unused input moved the draws");
    assert!(alone != bits(&inputs.replace("1.0(1)", "1.0(2)"), ""), "a larger u moves them");
}

proptest! {
    #![proptest_config(ProptestConfig { cases: 12, ..ProptestConfig::default() })]
    /// Linear models: first order is the closed form, and the trials agree.
    #[test]
    fn linear_models_from_records(weights in prop::collection::vec(-3i32..=3, 3), u in 1u32..99) {
        prop_assume!(weights.iter().any(|weight| *weight != 0));
        let inputs = format!("  a: 1.00({u}) m\n  b: 2.0 m ± 0.3 m rectangular\n  c: 3.0 m ± 0.4 m triangular\n");
        let equation = format!("{}*a + {}*b + {}*c", weights[0], weights[1], weights[2]);
        let (first, values) = run(&inputs, &equation.replace("+ -", "- "), "", 40_000);
        let own = [f64::from(u) / 100.0, 0.3 / 3f64.sqrt(), 0.4 / 6f64.sqrt()];
        let closed = weights.iter().zip(own).map(|(weight, u)| (f64::from(*weight) * u).powi(2)).sum::<f64>().sqrt();
        prop_assert!((first / closed - 1.0).abs() < 1e-12, "{first} against {closed}");
        let mean = values.iter().sum::<f64>() / values.len() as f64;
        let variance = values.iter().map(|value| (value - mean) * (value - mean)).sum::<f64>() / (values.len() - 1) as f64;
        prop_assert!((variance.sqrt() / closed - 1.0).abs() < 0.02, "{} against {closed}", variance.sqrt());
    }
}
