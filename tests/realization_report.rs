//! The report of the example's realization: its result against the independent reduction, its contents row by row, and
//! what it says when a run is hidden.

#![allow(clippy::disallowed_methods)]

mod example;

use example::example_files;
use libripens::block::Engine;
use libripens::diagnostic::Code;
use libripens::graph::{sensitivities, standard_uncertainty};
use libripens::intake::MemoryIntake;
use libripens::report::make_report;
use libripens::report::parts::contents::{Met, rows};

const CAMPAIGN: &str = "realization";
const REPORT: &str = "campaigns/realization/report.md";

fn value_and_u(engine: &Engine, path: &str) -> (f64, f64) {
    let graph = engine.graph();
    let id = graph.find(path).unwrap_or_else(|| panic!("no {path}"));
    (graph.number(id), standard_uncertainty(&graph, &sensitivities(&graph, id)))
}

fn reference(name: &str) -> (f64, f64, f64) {
    let path = example::repository().join("tests/synthetic/reference_realization.json");
    let json: serde_json::Value = serde_json::from_slice(&std::fs::read(path).expect("file")).expect("JSON");
    let of = |key: &str| json[name][key].as_f64().unwrap_or_else(|| panic!("{name} {key}"));
    (of("value"), of("u"), of("truth"))
}

/// Against another implementation's reduction: 0.1 u and 3 % of u; against the truth behind the readings: 3 u.
#[test]
fn the_result_of_the_campaign_is_that_of_the_independent_reduction() {
    let intake = MemoryIntake::with(example_files());
    let engine = libripens::reduce(&intake, Some(CAMPAIGN)).expect("readable");
    assert!(!engine.complaints().has_faults(), "{:#?}", engine.complaints().list);
    for (path, name) in [("C41.mass", "mass"), ("C41.planck_ratio_departure", "planck_ratio_departure")] {
        let ((value, u), (expected, expected_u, truth)) = (value_and_u(&engine, path), reference(name));
        assert!((value - expected).abs() <= 0.1 * expected_u, "{path}: {value} against {expected}");
        assert!((u / expected_u - 1.0).abs() <= 0.03, "{path}: u {u} against {expected_u}");
        assert!((value - truth).abs() <= 3.0 * u, "{path}: {value} against the truth {truth}");
    }
}

#[test]
fn the_report_states_every_row_of_its_contents() {
    let intake = MemoryIntake::with(example_files());
    let engine = Engine::read(&intake, Some(CAMPAIGN)).expect("readable");
    let report = make_report(&engine, REPORT);
    assert!(engine.complaints().list.is_empty(), "{:#?}", engine.complaints().list);
    let report = report.expect("a report");
    assert!(report.pdf.starts_with(b"%PDF"));
    let attached = report.dossier.files.keys();
    assert_eq!(attached.filter(|name| name.contains("moving-") || name.contains("weighing-")).count(), 14);
    for row in rows(&engine, "C41").expect("rows") {
        assert!(matches!(row.met, Met::Stated(_)), "{} is not stated", row.number);
    }
}

#[test]
fn a_hidden_run_is_named() {
    let mut files = example_files();
    let path = "campaigns/realization/campaign.md";
    let text = String::from_utf8(files[path].clone()).expect("UTF-8").replace(", KD6.mass, KD7.mass]", ", KD7.mass]");
    files.insert(path.into(), text.into_bytes());
    let intake = MemoryIntake::with(files);
    let engine = libripens::reduce(&intake, Some(CAMPAIGN)).expect("readable");
    let list = engine.complaints().list;
    assert_eq!(list.len(), 1, "{list:#?}");
    assert_eq!(list[0].code, Code::RunUnlisted);
    assert!(list[0].message.contains("KD6"));
}
