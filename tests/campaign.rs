//! The result of a campaign: determinations combined, left out, compared; what it refuses.

#![allow(clippy::disallowed_methods)]

use libripens::block::Engine;
use libripens::block::realization::Campaign;
use libripens::diagnostic::Code;
use libripens::graph::{sensitivities, standard_uncertainty};
use libripens::intake::MemoryIntake;
use libripens::report::make_report;
use libripens::report::parts::contents::{Met, rows};

const LABORATORY: &str = "---\nformat: 1\nname: Test laboratory\naddress: Nowhere\ncoverage_probability: 95.45 %\ndecimal_marker: point\ndegrees_of_freedom: truncated\n---\n";

/// Six results that share one gravity value; each adds scatter of its own.
const RUNS: &str = "```yaml mass-standard P1\nnominal: 1 kg\n```\n\n```yaml rule R1\ntext: A run is left out when a door was open.\ndate: 2041-01-01\n```\n";

/// A run as a model: 1 kg + departure, with a relative common part from COMMON.value.
fn run(name: &str, micrograms: &str) -> String {
    format!(
        "```yaml measurement-model {name}\nmeasurand: mass\nunit: kg\ninputs:\n  scatter: {micrograms} µg\n  nominal: {{value: 1 kg}}\n  common: from COMMON.value\nequation: nominal*(1 + common) + scatter\n```\n\n"
    )
}

fn campaign(runs: &[(&str, &str)], more: &str) -> MemoryIntake {
    let mut files = vec![("laboratory.md".to_string(), LABORATORY.to_string())];
    let common = "```yaml measurement-model COMMON\nmeasurand: common part\nunit: \"1\"\ninputs:\n  g: 0.0(8)e-8\nequation: g\n```\n\n";
    let listed: Vec<String> = runs.iter().map(|(name, _)| format!("{name}.value")).collect();
    let mut text = format!("---\nrecord: C\ndate: 2041-05-06\n---\n\n{RUNS}\n{common}");
    text.push_str(&format!(
        "```yaml realization C1\nartefact: P1\ndeterminations: [{}]\ncombination: Paule-Mandel\nmethod: {{primary: Kibble balance}}\nmeasurand: {{state: vacuum}}\n{more}```\n",
        listed.join(", ")
    ));
    files.push(("campaign.md".into(), text));
    for (index, (name, value)) in runs.iter().enumerate() {
        let day = 4 + index / 2;
        files.push((
            format!("run-{name}.md"),
            format!(
                "---\nrecord: {name}\ndate: 2041-05-0{day}\nperformed_by: duty metrologist\n---\n\n{}",
                run(name, value)
            ),
        ));
    }
    MemoryIntake::with(files)
}

fn reduced<T>(intake: &MemoryIntake, check: impl FnOnce(&Engine) -> T) -> T {
    let engine = libripens::reduce(intake, None).expect("readable");
    check(&engine)
}

fn value_and_u(engine: &Engine, path: &str) -> (f64, f64) {
    let graph = engine.graph();
    let id = graph.find(path).unwrap_or_else(|| panic!("no {path}: {:#?}", engine.complaints()));
    (graph.number(id), standard_uncertainty(&graph, &sensitivities(&graph, id)))
}

const SIX: [(&str, &str); 6] = [
    ("D1", "12.3(60)"),
    ("D2", "-4.1(50)"),
    ("D3", "7.7(80)"),
    ("D4", "25.0(70)"),
    ("D5", "3.2(40)"),
    ("D6", "9.8(100)"),
];

/// The same six values as the method's example: mean 8.047225 µg, Type A 4.077634 µg (bisection in another language);
/// days 4.1, 16.35, 6.5 µg with two each give MS_b = 84.2683… hence MS_b/6 below the weighted variance.
#[test]
fn determinations_are_combined_and_the_common_part_is_not_divided() {
    let intake = campaign(&SIX, "");
    reduced(&intake, |engine| {
        assert!(!engine.complaints().has_faults(), "{:#?}", engine.complaints());
        let (mass, u) = value_and_u(engine, "C1.mass");
        assert!((mass - 1.0 - 8.047225e-9).abs() < 1e-15, "{mass}");
        let expected = (4.077_633_733_7e-9f64.powi(2) + 8e-9f64.powi(2)).sqrt();
        assert!((u / expected - 1.0).abs() < 1e-6, "{u} against {expected}");
        let campaign = engine.found::<Campaign>("C1").expect("a campaign");
        assert_eq!(campaign.determinations.len(), 6);
        assert!((campaign.determinations[3].own_uncertainty - 7e-9).abs() < 1e-17);
        assert_eq!(campaign.determinations[3].performed_by, "duty metrologist");
        // τ² = 57.888 µg² (the same bisection).
        assert!((value_and_u(engine, "C1.between").0 - 57.888_175_589_1f64.sqrt() * 1e-9).abs() < 1e-16);
    });
}

#[test]
fn a_run_left_out_stays_listed_with_both_results() {
    let more = "excluded:\n  - {result: D4.value, rule: R1, reason: door open}\n";
    reduced(&campaign(&SIX, more), |engine| {
        assert!(!engine.complaints().has_faults(), "{:#?}", engine.complaints());
        let without = value_and_u(engine, "C1.mass").0;
        let with = value_and_u(engine, "C1.with_excluded.mass").0;
        assert!((with - 1.0 - 8.047225e-9).abs() < 1e-15);
        assert!(without < with - 1e-9);
        let campaign = engine.found::<Campaign>("C1").expect("a campaign");
        assert!(campaign.determinations[3].excluded.is_some() && campaign.determinations[3].weight == 0.0);
        assert!((campaign.determinations.iter().map(|run| run.weight).sum::<f64>() - 1.0).abs() < 1e-14);
    });
}

/// Both directions of the method: the ratio of the h found to the exact h is m_ind/m.
#[test]
fn the_ratio_of_h_and_its_e_n() {
    let more = "independent_mass: {mass: 1 kg + 0.030(20) mg, source: sphere}\nearlier_result: {mass: 1 kg + 0.020(12) mg, date: 2040-03-01, correlation: 0.5}\n";
    reduced(&campaign(&SIX, more), |engine| {
        assert!(!engine.complaints().has_faults(), "{:#?}", engine.complaints());
        let (mass, u) = value_and_u(engine, "C1.mass");
        let (departure, u_ratio) = value_and_u(engine, "C1.planck_ratio_departure");
        assert!((departure - (1.000_000_03 / mass - 1.0)).abs() < 1e-15);
        assert!((u_ratio / (u * u + 4e-16f64).sqrt() - 1.0).abs() < 1e-6);
        let e_n = value_and_u(engine, "C1.planck_ratio_e_n").0;
        assert!((e_n - departure.abs() / (2.0 * u_ratio)).abs() < 1e-9);
        let change = value_and_u(engine, "C1.change").0;
        assert!((change - (mass - 1.000_000_02)).abs() < 1e-15);
        // u² of the difference with r = 0.5, by hand.
        let u_change = (u * u + 144e-18 - 2.0 * 0.5 * u * 12e-9).sqrt();
        assert!((value_and_u(engine, "C1.change_e_n").0 - change.abs() / (2.0 * u_change)).abs() < 1e-9);
    });
}

#[test]
fn the_value_handed_on_carries_its_own_basis() {
    let more = "drift: {to: 2041-06-01, change: 0.0(2) µg}\ndissemination: {basis: consensus_3, shift: 0.002(20) mg}\n";
    reduced(&campaign(&SIX, more), |engine| {
        let (mass, u) = value_and_u(engine, "C1.mass");
        let (handed_on, u_handed_on) = value_and_u(engine, "C1.disseminated_mass");
        assert!((handed_on - mass - 2e-9).abs() < 1e-16);
        assert!((u_handed_on / (u * u + 0.04e-18 + 400e-18).sqrt() - 1.0).abs() < 1e-6);
        let graph = engine.graph();
        let basis = |path: &str| graph.node(graph.find(path).expect("named")).basis.clone();
        assert_eq!(basis("C1.mass").as_deref(), Some("own realization"));
        assert_eq!(basis("C1.disseminated_mass").as_deref(), Some("consensus_3"));
    });
}

#[test]
fn a_value_handed_in_is_frozen() {
    let codes = |more: &str| {
        reduced(&campaign(&SIX, more), |engine| engine.complaints().list.iter().map(|one| one.code).collect::<Vec<_>>())
    };
    assert_eq!(codes("submitted: {date: 2041-05-20, mass: 1 kg + 8.0(9.0) µg}\n"), []);
    assert_eq!(codes("submitted: {date: 2041-05-20, mass: 1 kg + 8.3(9.0) µg}\n"), [Code::SubmittedValueChanged]);
    assert_eq!(codes("submitted: {date: 2041-05-20, mass: 1 kg + 8.0(8.0) µg}\n"), [Code::SubmittedValueChanged]);
}

const REPORT: &str = "---
record: REP
date: 2041-05-20
report:
  title: Realization of the kilogram
  place: room 2
  method: {id: NP-20, revision: \"1\"}
  deviations: none
  results: [C1.mass]
  performed_by: duty metrologist
---

# Determinations

{{ determinations(C1) }}

{{ chart(C1) }}

# Budget

{{ relative_budget(C1.mass) }}

The mass is {{ deviation(C1.mass, \"µg\") }}.

# Contents

{{ contents(C1) }}

# Protocol

{{ protocol(C1) }}
";

/// The parts of a realization report are typeset; a row of contents is stated, left out with its reason, or missing.
#[test]
fn the_parts_of_the_report_are_typeset_and_rows_checked() {
    let more = "excluded:\n  - {result: D4.value, rule: R1, reason: door open}\nrejection_rule: R1\nhandling: Lift with a lined fork.\nleft_out:\n  - {row: R19, reason: no offset was used}\n";
    let intake = campaign(&SIX, more);
    let mut files = intake.files.clone();
    files.insert("report.md".into(), REPORT.as_bytes().to_vec());
    let intake = MemoryIntake::with(files);
    let engine = Engine::read(&intake, None).expect("readable");
    let report = make_report(&engine, "report.md");
    assert!(!engine.complaints().has_faults(), "{:#?}", engine.complaints());
    let report = report.expect("a report");
    if let Some(path) = std::env::var_os("LIBRIPENS_SHOW") {
        std::fs::write(path, &report.pdf).expect("a file to write");
    }
    let rows = rows(&engine, "C1").expect("rows");
    assert_eq!(rows.len(), 20);
    let met = |number: &str| &rows.iter().find(|row| row.number == number).expect("the row").met;
    assert!(matches!(met("R6"), Met::Stated(words) if words.contains("5 used, 1 not used")));
    assert!(matches!(met("R7"), Met::Stated(words) if words.contains("2041-01-01")));
    assert!(matches!(met("R19"), Met::LeftOut(reason) if reason == "no offset was used"));
    assert!(matches!(met("R14"), Met::Missing(_)) && matches!(met("R2"), Met::Missing(_)));
    assert!(matches!(met("R16"), Met::Stated(words) if words.contains("consistent")));
}
