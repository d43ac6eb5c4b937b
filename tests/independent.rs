//! Every quantity of the example report computed again by a script in another language, from the derivation alone.
//!
//! Where Python is not installed the test says so and checks nothing; with `LIBRIPENS_TOOLS_REQUIRED` set, as in
//! `.ci/run`, a missing Python is a failure.

#![allow(clippy::disallowed_methods)]

mod example;

use example::{example_report, fresh, repository};
use libripens::report::dossier::{DERIVATION, RESULTS};
use std::io::ErrorKind;
use std::process::{Command, Output};

/// What the script says of a derivation and its results; nothing where Python is not installed.
fn recomputed(test: &str, derivation: &str, results: &str) -> Option<Output> {
    let folder = fresh(&format!("independent-{test}"));
    let (first, second) = (folder.join("derivation.json"), folder.join("results.json"));
    std::fs::write(&first, derivation).expect("a file to write");
    std::fs::write(&second, results).expect("a file to write");
    let script = repository().join("tests/independent/recompute.py");
    match Command::new("python3").arg(script).arg(first).arg(second).output() {
        Ok(output) => Some(output),
        Err(error) if error.kind() == ErrorKind::NotFound && std::env::var_os("LIBRIPENS_TOOLS_REQUIRED").is_none() => {
            eprintln!("NOT CHECKED: python3 is not installed");
            None
        }
        Err(error) => panic!("python3 cannot be started: {error}"),
    }
}

fn attached(name: &str) -> String {
    String::from_utf8(example_report().dossier.files[name].clone()).expect("text in UTF-8")
}

#[test]
fn every_quantity_of_the_example_is_found_again() {
    let Some(output) = recomputed("whole", &attached(DERIVATION), &attached(RESULTS)) else { return };
    let said = String::from_utf8_lossy(&output.stdout).into_owned() + &String::from_utf8_lossy(&output.stderr);
    assert!(output.status.success(), "{said}");
    let counts: Vec<usize> = said.split(|c: char| !c.is_ascii_digit()).filter_map(|word| word.parse().ok()).collect();
    assert!(counts[1] > 1000, "few nodes were computed again: {said}");
}

/// A script that finds everything right would be no check.
#[test]
fn an_altered_value_and_an_altered_uncertainty_are_found() {
    let (derivation, results) = (attached(DERIVATION), attached(RESULTS));
    let mut altered: serde_json::Value = serde_json::from_str(&derivation).expect("JSON");
    let nodes = altered["nodes"].as_array_mut().expect("nodes");
    let product =
        nodes.iter_mut().find(|node| node["operation"] == "multiply" && node["value"].is_f64()).expect("a product");
    let value = product["value"].as_f64().expect("a number");
    product["value"] = serde_json::json!(value * (1.0 + 1e-9));
    let Some(output) = recomputed("value", &altered.to_string(), &results) else { return };
    assert_eq!(output.status.code(), Some(1));
    let mut altered: serde_json::Value = serde_json::from_str(&results).expect("JSON");
    let quantities = altered["quantities"].as_array_mut().expect("quantities");
    let mass = quantities.iter_mut().find(|quantity| quantity["name"] == "R1.mass").expect("the result");
    let u = mass["standard_uncertainty"].as_f64().expect("a number");
    mass["standard_uncertainty"] = serde_json::json!(u * 1.001);
    let output = recomputed("uncertainty", &derivation, &altered.to_string()).expect("Python was there");
    assert_eq!(output.status.code(), Some(1));
}
