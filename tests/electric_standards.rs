//! The standards of a Kibble balance as blocks: one mass from voltage, resistance and wavelength, and what the report says of them.

#![allow(clippy::disallowed_methods)]

use libripens::block::Engine;
use libripens::diagnostic::Code;
use libripens::graph::{budget, sensitivities, standard_uncertainty};
use libripens::intake::MemoryIntake;
use libripens::report::make_report;
use libripens::report::parts::{constants::constants_table, traceability::traceability_table};

const LABORATORY: &str = "---\nformat: 1\nname: Example Metrology Laboratory\naddress: Northgate\n---\n";

const STANDARDS: &str = "---
record: STD
date: 2041-05-04
---

```yaml time-base TB1
label: hydrogen maser
offset: 2.353(400)e-10
source: comparison with UTC(k), May 2041
```

```yaml laser L1
calibrations:
  - {certificate: L-41-003, issued_by: Eastvale Calibration Laboratory, date: 2041-02-11, due: 2042-02-11, frequency: 473612353772100(19000) Hz}
```

```yaml voltage-standard VS1
frequency: 74.96 GHz
time_base: TB1
residual: 0.0(5)e-9
source: comparison of two arrays
```

```yaml resistor R1
label: 100 Ω resistor
quantum_hall: {plateau: 2}
bridge_error: 0.0(15)e-9
at: 2041-05-04T00:00:00Z
calibrations:
  - {certificate: R-41-07, date: 2041-04-03, ratio: 0.0077481169689, relative_uncertainty: 1.2e-9}
  - {certificate: R-41-15, date: 2041-06-01, ratio: 0.0077481170919, relative_uncertainty: 1.2e-9}
```

```yaml apparatus KB1
beam_tilt_x: 78.1(250) µrad
null_gain_moving: 1.0000482(150)
parasitic: {force_x: 0.85(2.00)e-6, velocity_x: -188.5(30.0)e-6}
corrections:
  - {label: alignment of the magnet, relative: 0.0(3)e-9, source: exchange of coils}
```

```yaml measurement-model M1
measurand: ideal mass
symbol: m
unit: kg
inputs:
  U: from VS1.step_voltage
  R: from R1.resistance
  w: from L1.vacuum_wavelength
  d: from KB1.correction_1
  g: 9.80729 m/s2
  t: 1 s
equation: 6984*11687*U^2/(R*g*6320*w/2/t)*(1 + d)
```
";

const REPORT: &str = "---
record: REP
date: 2041-05-20
report:
  title: Ideal mass
  place: room 2
  method: {id: NP-20, revision: \"1\"}
  deviations: none
  results: [M1.value]
  performed_by: duty metrologist
---

# Traceability

{{ constants() }}

{{ traceability() }}

{{ assumptions() }}

{{ trail(M1.value) }}
";

fn folder(standards: &str) -> MemoryIntake {
    MemoryIntake::with([("laboratory.md", LABORATORY), ("standards/standards.md", standards), ("report.md", REPORT)])
}

#[test]
fn one_mass_from_voltage_resistance_and_wavelength() {
    let intake = folder(STANDARDS);
    let engine = libripens::reduce(&intake, None).expect("a folder");
    assert!(!engine.complaints().has_faults(), "{:#?}", engine.complaints());
    let graph = engine.graph();
    let id = graph.find("M1.value").expect("a mass");
    let (h, step) = (6.626_070_15e-34, 74.96e9 * (1.0 + 2.353e-10));
    let wavelength = 299_792_458.0 / 473_612_353_772_100.0;
    // The line between the two calibrations, 31 of 59 days along.
    let ratio = 0.007_748_116_968_9 + (0.007_748_117_091_9 - 0.007_748_116_968_9) * 31.0 / 59.0;
    let expected = h * 2.0 * 6984.0 * 11_687.0 * step * step / (4.0 * ratio * 9.80729 * 3160.0 * wavelength);
    assert!((graph.number(id) / expected - 1.0).abs() < 1e-12, "{} {expected}", graph.number(id));
    // Bounds whose estimate is zero are lines of the budget, each shared input once.
    let lines: Vec<String> = budget(&graph, id).lines.iter().map(|line| line.label.clone()).collect();
    for part in ["relative error of VS1", "bridge error of 100 Ω resistor", "alignment of the magnet", "hydrogen maser"]
    {
        assert_eq!(lines.iter().filter(|label| label.contains(part)).count(), 1, "{part}: {lines:?}");
    }
    let u = standard_uncertainty(&graph, &sensitivities(&graph, id)) / graph.number(id);
    let off_middle: f64 = 31.0 / 59.0 - 0.5;
    let line = (0.5 + 2.0 * off_middle * off_middle) * 1.44e-18;
    let laser: f64 = 19_000.0 / 473_612_353_772_100.0;
    let by_hand = (line + 2.25e-18 + 4.0 * 0.25e-18 + 0.09e-18 + 4.0 * 16e-22 + laser * laser).sqrt();
    assert!((u / by_hand - 1.0).abs() < 1e-4, "{u} {by_hand}");
}

#[test]
fn the_report_names_constants_and_standards() {
    let intake = folder(STANDARDS);
    let engine = Engine::read(&intake, None).expect("readable");
    let report = make_report(&engine, "report.md");
    assert!(!engine.complaints().has_faults(), "{:#?}", engine.complaints());
    let report = report.expect("a report");
    if let Some(path) = std::env::var_os("LIBRIPENS_SHOW") {
        std::fs::write(path, &report.pdf).expect("a file to write");
    }
    let id = engine.graph().find("M1.value").expect("a mass");
    let constants = format!("{:?}", constants_table(&engine, &[id])).replace("\\u{202f}", " ").replace("\\u{a0}", " ");
    for part in
        ["6.626 070 15 × 10⁻³⁴ J s", "1.602 176 634 × 10⁻¹⁹ C", "299 792 458 m s⁻¹", "483 597.848 416 98", "R_K = h/e²"]
    {
        assert!(constants.contains(part), "{part}: {constants}");
    }
    assert!(!constants.contains("Boltzmann"), "not used: {constants}");
    let table = format!("{:?}", traceability_table(&engine));
    for part in
        ["L-41-003", "R-41-07", "R-41-15", "UTC(k)", "comparison of two arrays", "relative standard uncertainty"]
    {
        assert!(table.contains(part), "{part}: {table}");
    }
    let assumed: Vec<String> = engine.builder.assumptions().into_iter().map(|one| one.text).collect();
    assert!(assumed.iter().any(|text| text.starts_with("KB1 states nothing of") && !text.contains("beam tilt x")));
}

#[test]
fn values_without_dimension_or_uncertainty_are_refused() {
    for (right, wrong, code) in [
        ("beam_tilt_x: 78.1(250) µrad", "beam_tilt_x: 78.1(250) µm", Code::DimensionMismatch),
        ("frequency: 74.96 GHz", "frequency: -74.96 GHz", Code::OutOfRange),
        ("offset: 2.353(400)e-10", "offset: 2.353e-10", Code::UncertaintyMissing),
        ("plateau: 2", "plateau: 2.5", Code::OutOfRange),
        ("date: 2041-06-01", "date: 2041-04-03", Code::TimeUnreadable),
        ("time_base: TB1", "time_base: TB2", Code::UndefinedReference),
    ] {
        assert!(STANDARDS.contains(right), "{right}");
        let intake = folder(&STANDARDS.replace(right, wrong));
        let engine = libripens::reduce(&intake, None).expect("a folder");
        let found = engine.complaints();
        assert!(found.list.iter().any(|complaint| complaint.code == code), "{wrong}: {found:#?}");
    }
}
