//! The example campaign against the truth it was made from, and its first day against an independent reduction.
//!
//! Sources: `tests/synthetic/truth.json` (what the generator put in) and `tests/synthetic/reference_day_1.json`
//! (another implementation's reduction of the same rows).

#![allow(clippy::disallowed_methods)]

use libripens::block::Engine;
use libripens::graph::{NodeId, budget, correlation, degrees_of_freedom, sensitivities, standard_uncertainty};
use libripens::intake::MemoryIntake;
use serde_json::Value;
use std::collections::BTreeMap;
use std::fs;
use std::path::Path;

fn read_into(root: &Path, folder: &Path, files: &mut BTreeMap<String, Vec<u8>>) {
    for entry in fs::read_dir(folder).expect("folder") {
        let path = entry.expect("entry").path();
        let name = path.strip_prefix(root).expect("inside").to_string_lossy().replace('\\', "/");
        if path.is_dir() {
            read_into(root, &path, files);
        } else if !name.ends_with(".pdf") {
            files.insert(name, fs::read(&path).expect("file"));
        }
    }
}

fn example() -> BTreeMap<String, Vec<u8>> {
    let root = Path::new(env!("CARGO_MANIFEST_DIR")).join("example-records");
    let mut files = BTreeMap::new();
    read_into(&root, &root, &mut files);
    files
}

fn json(path: &str) -> Value {
    let path = Path::new(env!("CARGO_MANIFEST_DIR")).join("tests/synthetic").join(path);
    serde_json::from_slice(&fs::read(path).expect("file")).expect("JSON")
}

fn node(engine: &Engine, path: &str) -> NodeId {
    engine.graph().find(path).unwrap_or_else(|| panic!("no result {path}"))
}

fn value_and_u(engine: &Engine, path: &str) -> (f64, f64) {
    let id = node(engine, path);
    let graph = engine.graph();
    (graph.number(id), standard_uncertainty(&graph, &sensitivities(&graph, id)))
}

#[test]
fn the_example_draws_no_complaint() {
    let intake = MemoryIntake { files: example(), ..MemoryIntake::default() };
    let engine = libripens::reduce(&intake, None).expect("readable");
    libripens::report::examine_reports(&engine);
    assert!(engine.complaints().list.is_empty(), "{:#?}", engine.complaints());
}

#[test]
fn results_lie_within_three_u_of_truth() {
    let intake = MemoryIntake { files: example(), ..MemoryIntake::default() };
    let engine = libripens::reduce(&intake, None).expect("readable");
    let truth = json("truth.json");
    let mass = |name: &str| truth["standards"][name]["mass"].as_f64().unwrap_or_else(|| panic!("truth of {name}"));
    for (item, comparisons, combined) in [("S1", ["W1", "W2", "W3"], "R1"), ("S2", ["W4", "W5", "W6"], "R2")] {
        for comparison in comparisons {
            let (difference, u) = value_and_u(&engine, &format!("{comparison}.difference"));
            let bias = (difference - (mass(item) - mass("K17"))) / u;
            assert!(bias.abs() < 3.0, "{comparison}: {bias} u from truth");
        }
        let (found, u) = value_and_u(&engine, &format!("{combined}.mass"));
        assert!(((found - mass(item)) / u).abs() < 3.0, "{combined}");
    }
}

/// The example's first comparison without what the independent reduction leaves out: resolution, drift, eccentricity.
fn as_the_reference_reduces() -> BTreeMap<String, Vec<u8>> {
    let mut files = example();
    for (path, bytes) in &mut files {
        if path.starts_with("instruments/") && path.ends_with(".md") || path.starts_with("standards/") {
            let text = String::from_utf8(bytes.clone()).expect("UTF-8");
            let kept = text.lines().filter(|line| {
                !["resolution:", "drift_since_calibration:", "eccentricity:"]
                    .iter()
                    .any(|field| line.starts_with(field))
            });
            *bytes = kept.map(|line| format!("{line}\n")).collect::<String>().into_bytes();
        }
    }
    files
}

#[test]
fn day_one_agrees_with_an_independent_reduction() {
    let intake = MemoryIntake { files: as_the_reference_reduces(), ..MemoryIntake::default() };
    let engine = libripens::reduce(&intake, None).expect("readable");
    let reference = json("reference_day_1.json");
    let expected = &reference["W1.difference"];
    let (value, u) = (expected["value"].as_f64().expect("value"), expected["u"].as_f64().expect("u"));
    let (found, found_u) = value_and_u(&engine, "W1.difference");
    assert!(((found - value) / u).abs() < 0.02, "difference {found} against {value}");
    assert!((found_u / u - 1.0).abs() < 0.02, "u {found_u} against {u}");
    for (index, series) in expected["series"].as_array().expect("series").iter().enumerate() {
        let (mean, _) = value_and_u(&engine, &format!("W1.series.{}", index + 1));
        // The series are of the corrected weighings, before the heights of the mass centres: 3e-13 kg here.
        assert!((mean - series.as_f64().expect("number")).abs() < 0.1 * u, "series {}: {mean}", index + 1);
    }
    let graph = engine.graph();
    let id = node(&engine, "W1.difference");
    let freedom = degrees_of_freedom(&graph, &sensitivities(&graph, id));
    assert!((freedom / expected["degrees_of_freedom"].as_f64().expect("ν") - 1.0).abs() < 0.05, "ν_eff {freedom}");
    let (mass, mass_u) = value_and_u(&engine, "W1.mass");
    let expected = &reference["W1.mass"];
    assert!(((mass - expected["value"].as_f64().expect("value")) / mass_u).abs() < 0.02);
    assert!((mass_u / expected["u"].as_f64().expect("u") - 1.0).abs() < 0.02);
    let (density, _) = value_and_u(&engine, "W1.air.density");
    let expected = reference["W1.air.density"]["value"].as_f64().expect("density");
    assert!((density / expected - 1.0).abs() < 1e-6, "air density {density} against {expected}");
}

#[test]
fn contributions_agree_with_an_independent_reduction() {
    let intake = MemoryIntake { files: as_the_reference_reduces(), ..MemoryIntake::default() };
    let engine = libripens::reduce(&intake, None).expect("readable");
    let lines = budget(&engine.graph(), node(&engine, "W1.difference")).lines;
    let reference = json("reference_day_1.json");
    let named = [
        ("K17.volume", "K17.volume"),
        ("type_a", "W1.repeatability"),
        ("S1.volume", "S1.volume"),
        ("M1.sensitivity_weight", "M1.sensitivity_weight"),
        ("S1.expansion", "S1.expansion"),
        ("K17.expansion", "K17.expansion"),
        ("K17.mass_centre_height", "K17.mass_centre_height"),
    ];
    for (theirs, ours) in named {
        let expected = reference["W1.difference"]["contributions"][theirs].as_f64().expect("contribution");
        let line = lines.iter().find(|line| line.path == ours).unwrap_or_else(|| panic!("no line {ours}"));
        assert!((line.contribution / expected - 1.0).abs() < 0.02, "{ours}: {} against {expected}", line.contribution);
    }
}

#[test]
fn what_the_days_share_is_not_averaged_away() {
    let intake = MemoryIntake { files: example(), ..MemoryIntake::default() };
    let engine = libripens::reduce(&intake, None).expect("readable");
    let (_, single) = value_and_u(&engine, "W1.mass");
    let (_, combined) = value_and_u(&engine, "R1.mass");
    // The reference standard contributes 10 µg to each day; averaging three days must leave it whole.
    assert!(combined > 0.97 * single, "{combined} against {single}");
    let graph = engine.graph();
    let of = |path: &str| sensitivities(&graph, node(&engine, path));
    let r = correlation(&graph, &of("R1.mass"), &of("R2.mass"));
    assert!((0.93..1.0).contains(&r), "correlation of the two items: {r}");
    let lines = budget(&graph, node(&engine, "R1.mass")).lines;
    let total: f64 = lines.iter().map(|line| line.share).sum();
    assert!((total - 1.0).abs() < 1e-9, "shares add to {total}");
    assert!(lines.windows(2).all(|pair| pair[0].contribution >= pair[1].contribution));
}

/// One mistake in the reference standard stops every result; it is said once, not at every place that cites a result.
#[test]
fn a_mistake_is_not_repeated_by_its_consequences() {
    let mut files = example();
    let standard = files.get_mut("standards/k17.md").expect("the standard");
    let text = String::from_utf8(standard.clone()).expect("UTF-8");
    *standard = text.replace("nominal: 1 kg", "nominal: 1").into_bytes();
    let intake = MemoryIntake { files, ..MemoryIntake::default() };
    let engine = libripens::reduce(&intake, None).expect("readable");
    libripens::report::examine_reports(&engine);
    let list = engine.complaints().list;
    let words: Vec<&str> = list.iter().map(|complaint| complaint.code.word()).collect();
    assert_eq!(words, ["figure_missing", "bare_number"], "{list:#?}");
    assert!(list[0].message.contains("stay marked gaps"));
}
