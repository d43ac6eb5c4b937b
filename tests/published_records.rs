//! Published worked examples written as ordinary records, compiled end to end.
//!
//! Each folder under `tests/published/` with a `laboratory.md` is a laboratory folder; its `expected.json` lists what
//! the source prints, with source and tolerance.

#![allow(clippy::disallowed_methods)]

use libripens::block::Engine;
use libripens::graph::{
    Distributed, Graph, NodeId, Validation, correlation, coverage, propagate_distributions, second_order_uncertainty,
    sensitivities, standard_uncertainty,
};
use libripens::intake::MemoryIntake;
use serde_json::Value;
use std::collections::BTreeMap;
use std::fs;
use std::path::{Path, PathBuf};

fn folders() -> Vec<PathBuf> {
    let root = Path::new(env!("CARGO_MANIFEST_DIR")).join("tests/published");
    let mut found: Vec<PathBuf> = fs::read_dir(root)
        .expect("published")
        .map(|entry| entry.expect("entry").path())
        .filter(|path| path.join("laboratory.md").is_file() && path.join("expected.json").is_file())
        .collect();
    found.sort();
    found
}

fn files_of(folder: &Path) -> BTreeMap<String, Vec<u8>> {
    let entries = fs::read_dir(folder).expect("folder").map(|entry| entry.expect("entry").path());
    entries
        .filter(|path| path.is_file())
        .map(|path| (path.file_name().expect("name").to_string_lossy().into_owned(), fs::read(&path).expect("file")))
        .collect()
}

/// Trials for comparisons with exact distributions: the tolerances of the vectors are made for this number.
const TRIALS: usize = 1_000_000;

fn by_trials(engine: &Engine, name: &str, seen: &mut BTreeMap<String, Distributed>) -> Distributed {
    if let Some(found) = seen.get(name) {
        return *found;
    }
    let graph = engine.graph();
    let id = graph.find(name).unwrap_or_else(|| panic!("no result {name}"));
    let probability = engine.laboratory.settings.coverage_probability;
    let found = propagate_distributions(&graph, &[id], TRIALS).expect("runs").summary(0, probability);
    seen.insert(name.to_string(), found);
    found
}

fn uncertainty_of(graph: &Graph, id: NodeId, second_order: bool) -> f64 {
    match second_order {
        true => second_order_uncertainty(graph, id).unwrap_or(f64::NAN),
        false => standard_uncertainty(graph, &sensitivities(graph, id)),
    }
}

fn found(engine: &Engine, one: &Value, seen: &mut BTreeMap<String, Distributed>) -> f64 {
    let (name, quantity) = (one["name"].as_str().expect("name"), one["quantity"].as_str().expect("quantity"));
    match quantity {
        "trials_estimate" => return by_trials(engine, name, seen).estimate,
        "trials_standard_uncertainty" => return by_trials(engine, name, seen).standard_uncertainty,
        "trials_low" => return by_trials(engine, name, seen).symmetric.0,
        "trials_high" => return by_trials(engine, name, seen).symmetric.1,
        "shortest_low" => return by_trials(engine, name, seen).shortest.0,
        "shortest_high" => return by_trials(engine, name, seen).shortest.1,
        _ => {}
    }
    let graph = engine.graph();
    let Some(id) = graph.find(name) else { return f64::NAN };
    if quantity == "correlation" {
        let other = graph.find(one["with"].as_str().expect("with")).expect("the other result");
        return correlation(&graph, &sensitivities(&graph, id), &sensitivities(&graph, other));
    }
    let derivatives = sensitivities(&graph, id);
    match quantity {
        "value" => graph.number(id),
        "standard_uncertainty" => standard_uncertainty(&graph, &derivatives),
        "expanded_uncertainty" => coverage(&graph, &derivatives, engine.laboratory.settings).expanded_uncertainty,
        "coverage_factor" => coverage(&graph, &derivatives, engine.laboratory.settings).factor,
        "second_order_standard_uncertainty" => second_order_uncertainty(&graph, id).unwrap_or(f64::NAN),
        "low" | "high" | "second_order_low" | "second_order_high" => {
            let k = coverage(&graph, &derivatives, engine.laboratory.settings).factor;
            let half = k * uncertainty_of(&graph, id, quantity.starts_with("second_order"));
            graph.number(id) + if quantity.ends_with("low") { -half } else { half }
        }
        "first_order_is_validated" | "second_order_is_validated" => {
            let k = coverage(&graph, &derivatives, engine.laboratory.settings).factor;
            let half = k * uncertainty_of(&graph, id, quantity.starts_with("second_order"));
            let value = graph.number(id);
            drop(graph);
            let found = by_trials(engine, name, seen);
            let shown = Validation::new(value, half, found.shortest, found.standard_uncertainty, 1);
            f64::from(u8::from(shown.is_valid()))
        }
        "degrees_of_freedom" => coverage(&graph, &derivatives, engine.laboratory.settings).effective_degrees_of_freedom,
        other => panic!("unknown quantity {other}"),
    }
}

#[test]
fn published_examples_compile_to_their_printed_digits() {
    let mut faults = Vec::new();
    let mut checks = 0;
    for folder in folders() {
        let intake = MemoryIntake { files: files_of(&folder), ..MemoryIntake::default() };
        let engine = libripens::reduce(&intake, None).expect("readable");
        let complaints = engine.complaints();
        let name = folder.file_name().expect("name").to_string_lossy().into_owned();
        if complaints.has_faults() {
            let printed = libripens::diagnostic::print_complaints(
                &complaints,
                &engine.sources(),
                libripens::diagnostic::Look::Plain,
            );
            faults.push(format!("{name}:\n{printed}"));
            continue;
        }
        let expected: Value =
            serde_json::from_slice(&fs::read(folder.join("expected.json")).expect("file")).expect("JSON");
        let mut seen = BTreeMap::new();
        for one in expected.as_array().expect("a list") {
            let text = |key: &str| one[key].as_str().unwrap_or_default();
            let ours = found(&engine, one, &mut seen);
            let (value, tolerance) =
                (one["value"].as_f64().expect("value"), one["tolerance"].as_f64().expect("tolerance"));
            checks += 1;
            // A hair for the binary form of the decimal tolerance.
            if ours.is_nan() || (ours - value).abs() > tolerance * (1.0 + 1e-9) {
                let source = text("source");
                faults.push(format!(
                    "{name}, {} {}: printed {}, found {ours} ({source})",
                    text("name"),
                    text("quantity"),
                    text("printed")
                ));
            }
        }
    }
    assert!(faults.is_empty(), "{}", faults.join("\n"));
    assert!(checks >= 10, "only {checks} checks were made");
}
