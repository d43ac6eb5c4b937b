//! A user's own measurement models: what goes in comes out with its uncertainty, and what does not fit points into the
//! equation.

#![allow(clippy::disallowed_methods)]

use libripens::block::Engine;
use libripens::diagnostic::Code;
use libripens::graph::{sensitivities, standard_uncertainty};
use libripens::intake::MemoryIntake;

const LABORATORY: &str = "---\nformat: 1\nname: Test laboratory\naddress: Nowhere\ncoverage_probability: 95.45 %\ndecimal_marker: point\ndegrees_of_freedom: truncated\n---\n";

fn reduce<T>(block: &str, check: impl FnOnce(&Engine) -> T) -> T {
    let record = format!("---\nrecord: T-1\ndate: 2041-03-12\n---\n\n```yaml measurement-model M\n{block}\n```\n");
    let intake = MemoryIntake::with([("laboratory.md", LABORATORY.to_string()), ("record.md", record)]);
    let engine = libripens::reduce(&intake, None).expect("readable");
    check(&engine)
}

fn value_and_u(engine: &Engine) -> (f64, f64) {
    assert!(!engine.complaints().has_faults(), "{:#?}", engine.complaints());
    let graph = engine.graph();
    let id = graph.find("M.value").expect("a value");
    (graph.number(id), standard_uncertainty(&graph, &sensitivities(&graph, id)))
}

/// The one complaint, with the text it points at.
fn complaint(block: &str) -> (Code, String, String) {
    reduce(block, |engine| {
        let list = engine.complaints().list;
        assert_eq!(list.len(), 1, "{list:#?}");
        let text = engine.sources().text(list[0].place.expect("a place")).into_owned();
        (list[0].code, text, list[0].message.clone())
    })
}

#[test]
fn a_model_enters_the_graph_with_units_and_constants() {
    let block = "measurand: kinetic energy\nunit: mJ\ninputs:\n  m: 2.000(10) g\n  v: 3.00(3) m/s\nequation: m*v^2/2";
    let (value, u) = reduce(block, value_and_u);
    assert!((value - 9e-3).abs() < 1e-15);
    let expected = ((4.5f64 * 1e-5).powi(2) + (6e-3f64 * 0.03).powi(2)).sqrt();
    assert!((u / expected - 1.0).abs() < 1e-12, "{u} against {expected}");
    let block = "measurand: frequency of one microvolt\nunit: MHz\ninputs:\n  U: 1 µV\nequation: U*K_J";
    // K_J = 2e/h, SI Brochure, 9th edition: 483 597.848 4… GHz/V.
    assert!((reduce(block, value_and_u).0 - 483.597_848_416_984e6).abs() < 1e-6);
    let block = "measurand: angle\nunit: rad\ninputs:\n  a: 1 m\n  b: 1 m\nequation: atan(a/b)*4/π";
    assert!((reduce(block, value_and_u).0 - 1.0).abs() < 1e-15);
}

#[test]
fn intermediate_equations_and_readings_serve_the_equation() {
    let block = "measurand: resistance\nunit: Ω\ninputs:\n  U: {readings: [1.001, 0.999, 1.000, 1.000], unit: V}\n  I: 10.00(2) mA\nwhere:\n  G: I/U\nequation: 1/G";
    let (value, u) = reduce(block, value_and_u);
    assert!((value - 100.0).abs() < 1e-12);
    let scatter = (2e-6f64 / 3.0).sqrt() / 2.0;
    let expected = ((scatter / 0.01).powi(2) + (100.0 * 0.002f64).powi(2)).sqrt();
    assert!((u / expected - 1.0).abs() < 1e-9, "{u} against {expected}");
}

#[test]
fn what_does_not_fit_points_into_the_equation() {
    let inputs = "measurand: x\nunit: m\ninputs:\n  a: 1.0(1) m\n  t: 2.0(1) s\n";
    let (code, text, _) = complaint(&format!("{inputs}equation: 3*a + a*t"));
    assert_eq!((code, text.as_str()), (Code::DimensionMismatch, "3*a + a*t"));
    let (code, text, _) = complaint(&format!("{inputs}equation: a*exp(t)"));
    assert_eq!((code, text.as_str()), (Code::DimensionMismatch, "exp(t)"));
    let (code, text, _) = complaint(&format!("{inputs}equation: a*b"));
    assert_eq!((code, text.as_str()), (Code::UndefinedReference, "b"));
    let (code, text, _) = complaint(&format!("{inputs}equation: a*(t"));
    assert_eq!((code, text.as_str()), (Code::NotationUnreadable, "("));
    let (code, _, message) = complaint(&format!("{inputs}equation: a*t"));
    assert_eq!(code, Code::DimensionMismatch);
    assert!(message.contains("the unit of M is m"), "{message}");
    let (code, ..) = complaint(&format!("{inputs}equation: a*ln(1 - t/t)"));
    assert_eq!(code, Code::OutOfValidity);
}

#[test]
fn impossible_inputs_are_refused() {
    let block = |input: &str| format!("measurand: x\nunit: m\ninputs:\n  a: {input}\nequation: a");
    assert_eq!(complaint(&block("{readings: [1.0], unit: m}")).0, Code::DesignIncomplete);
    assert_eq!(complaint(&block("{readings: [1.0, 1.1]}")).0, Code::FieldMissing);
    assert_eq!(
        complaint(&block("{distribution: trapezoidal, lower: 2, upper: 1, beta: 0.5, unit: m}")).0,
        Code::NotationUnreadable
    );
    assert_eq!(complaint(&block("{distribution: trapezoidal, lower: 1, upper: 2, unit: m}")).0, Code::FieldMissing);
    assert_eq!(complaint(&block("1.0 m ± 0.1 m")).0, Code::UncertaintyIncomplete);
}

/// At a vanishing slope first order knows no uncertainty, and a product of wide factors loses a part of it.
#[test]
fn an_equation_that_bends_within_its_uncertainty_is_warned_of() {
    let warned = |equation: &str| {
        let block = format!("measurand: loss\nunit: \"1\"\ninputs:\n  x: 0.000(5)\n  y: 2.0(1)\nequation: {equation}");
        reduce(&block, |engine| engine.complaints().list.iter().map(|one| one.code).collect::<Vec<_>>())
    };
    assert_eq!(warned("cos(x)"), [Code::FirstOrderShort]);
    assert_eq!(warned("x^2"), [Code::FirstOrderShort]);
    assert_eq!(warned("x + y"), []);
    assert_eq!(warned("y^2"), []);
}
