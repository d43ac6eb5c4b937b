//! Combination of results: weights, consistency, what varies between them, results left out, and what they share.

#![allow(clippy::disallowed_methods)]

use libripens::block::Engine;
use libripens::block::combining::Combined;
use libripens::diagnostic::Code;
use libripens::graph::{correlation, coverage, degrees_of_freedom, joint, sensitivities, standard_uncertainty};
use libripens::intake::MemoryIntake;

const LABORATORY: &str = "---\nformat: 1\nname: Test laboratory\naddress: Nowhere\ncoverage_probability: 95.45 %\ndecimal_marker: point\ndegrees_of_freedom: truncated\n---\n";

/// Results of invented runs: values and uncertainties of their own in ng/g, and what they have in common.
struct Runs<'a> {
    values: &'a [f64],
    own: &'a [f64],
    common: f64,
}

const THREE: Runs<'_> = Runs { values: &[12.0, 25.0, 18.0], own: &[14.0, 16.0, 12.0], common: 11.0 };
/// Invented; mean and uncertainty with each between component computed in high precision.
const SIX: Runs<'_> =
    Runs { values: &[12.3, -4.1, 7.7, 25.0, 3.2, 9.8], own: &[6.0, 5.0, 8.0, 7.0, 4.0, 10.0], common: 0.0 };

impl Runs<'_> {
    fn record(&self, combination: &str) -> String {
        let model = |name: &str, inputs: String, equation: &str| {
            format!(
                "```yaml measurement-model {name}\nmeasurand: mass of the weight\nunit: µg\ninputs:\n{inputs}equation: {equation}\n```\n\n"
            )
        };
        // An uncertainty of zero is not stated.
        let input = |name: &str, value: f64, u: f64| match u {
            0.0 => format!("  {name}: {value} µg\n"),
            u => format!("  {name}: {{value: {value} µg, u: {u} µg}}\n"),
        };
        let mut record = String::from(
            "---\nrecord: T-1\ndate: 2041-03-12\n---\n\n```yaml rule EARLY\ntext: A run with an open door is left out.\ndate: 2041-01-10\n```\n\n```yaml rule LATE\ntext: A run far off is left out.\ndate: 2041-04-10\n```\n\n",
        );
        record += &model("B", input("b", 0.0, self.common), "b");
        for (index, (value, u)) in self.values.iter().zip(self.own).enumerate() {
            let inputs = input("x", *value, *u) + "  b: from B.value\n";
            record += &model(&format!("X{}", index + 1), inputs, "x + b");
        }
        let listed: Vec<String> = (1..=self.values.len()).map(|index| format!("X{index}.value")).collect();
        record + &format!("```yaml combined-result C\nresults: [{}]\n{combination}\n```\n", listed.join(", "))
    }

    fn reduce<T>(&self, combination: &str, check: impl FnOnce(&Engine) -> T) -> T {
        let files = [("laboratory.md", LABORATORY.to_string()), ("record.md", self.record(combination))];
        let intake = MemoryIntake::with(files);
        check(&libripens::reduce(&intake, None).expect("readable"))
    }
}

/// In micrograms, where it is a mass; the plain number of a statistic.
fn number(engine: &Engine, path: &str) -> f64 {
    assert!(!engine.complaints().has_faults(), "{:#?}", engine.complaints());
    let graph = engine.graph();
    let id = graph.find(path).unwrap_or_else(|| panic!("no {path} among {:?}", graph.names.keys()));
    let is_mass = graph.node(id).dimension == libripens::quantity::Dimension::MASS;
    graph.number(id) * if is_mass { 1e9 } else { 1.0 }
}

fn uncertainty(engine: &Engine, path: &str) -> f64 {
    let graph = engine.graph();
    let of = sensitivities(&graph, graph.find(path).expect("a result"));
    standard_uncertainty(&graph, &of) * 1e9
}

#[track_caller]
fn near(found: f64, expected: f64, tolerance: f64) {
    assert!((found - expected).abs() <= tolerance, "{found}, expected {expected}");
}

/// The codes of all complaints.
fn codes(engine: &Engine) -> Vec<Code> {
    engine.complaints().list.iter().map(|complaint| complaint.code).collect()
}

#[test]
fn what_the_runs_share_is_not_divided_by_the_root_of_their_number() {
    THREE.reduce("weights: covariance", |engine| {
        near(number(engine, "C.value"), 17.80, 0.005);
        near(uncertainty(engine, "C.value"), 13.55, 0.005);
        near(number(engine, "C.chi_square"), 0.374, 0.0005);
        near(number(engine, "C.reduced_chi_square"), 0.187, 0.0005);
        near(number(engine, "C.chi_square_probability"), 0.83, 0.005);
        near(number(engine, "C.birge_ratio"), 0.43, 0.005);
        let combined = engine.found::<Combined>("C").expect("stored");
        for (member, weight) in combined.members.iter().zip([0.320, 0.245, 0.435]) {
            near(member.weight, weight, 0.0005);
        }
        let graph = engine.graph();
        let of = |path: &str| sensitivities(&graph, graph.find(path).expect("a result"));
        near(correlation(&graph, &of("X1.value"), &of("X2.value")), 0.350, 0.0005);
        // Without the common part 7.917; with it divided by √3 it would be 10.14.
        near(standard_uncertainty(&graph, &of("C.value")) * 1e9, (62.684_f64 + 121.0).sqrt(), 1e-3);
        assert!(codes(engine).is_empty(), "{:?}", engine.complaints());
    });
    let alone = Runs { common: 0.0, ..THREE };
    alone.reduce("weights: covariance", |engine| near(uncertainty(engine, "C.value"), 7.917, 0.001));
}

#[test]
fn nineteen_more_runs_leave_the_common_part() {
    let (values, own) = ([5.0; 20], [1.0; 20]);
    let runs = Runs { values: &values, own: &own, common: 11.0 };
    runs.reduce("weights: equal", |engine| {
        near(uncertainty(engine, "C.value"), (121.0_f64 + 1.0 / 20.0).sqrt(), 1e-9);
    });
}

#[test]
fn between_components_enter_as_type_a_with_n_minus_one() {
    for (rule, tau_squared, mean, u) in [
        ("paule_mandel", 57.888175589, 8.047225022400466, 4.077633733698948),
        ("dersimonian_laird", 60.243114955, 8.071737413211414, 4.12812417238061),
    ] {
        SIX.reduce(&format!("weights: inverse_variance\nbetween: {rule}"), |engine| {
            near(number(engine, "C.value"), mean, 1e-8);
            near(uncertainty(engine, "C.value"), u, 1e-8);
            near(number(engine, "C.between").powi(2), tau_squared, 1e-6);
            near(number(engine, "C.chi_square"), 13.2165618627, 1e-8);
            let graph = engine.graph();
            let of = sensitivities(&graph, graph.find("C.value").expect("a result"));
            let budget = libripens::graph::budget(&graph, of.measurand);
            let line = budget.lines.iter().find(|line| line.path == "C.between_component").expect("a line");
            assert_eq!((line.evaluation.letter(), line.degrees_of_freedom, line.symbol.as_str()), ("A", 5.0, "δ"));
            assert_eq!(line.unit.text(), "µg");
            near(degrees_of_freedom(&graph, &of), 5.0 / line.share.powi(2), 1e-9);
            assert!(coverage(&graph, &of, engine.laboratory.settings).factor > 2.0);
            // Asked for, so not complained of.
            assert!(codes(engine).is_empty());
        });
    }
}

#[test]
fn agreeing_results_get_no_component_and_no_smaller_uncertainty() {
    let plain = THREE.reduce("weights: inverse_variance", |engine| uncertainty(engine, "C.value"));
    for added in
        ["between: paule_mandel", "between: dersimonian_laird", "expansion: birge_ratio", "expansion: residuals"]
    {
        THREE.reduce(&format!("weights: inverse_variance\n{added}"), |engine| {
            assert_eq!(uncertainty(engine, "C.value"), plain, "{added}");
            assert!(number(engine, "C.birge_ratio") < 1.0);
            assert!(codes(engine).is_empty());
        });
    }
}

#[test]
fn disagreement_without_a_component_is_warned_of() {
    SIX.reduce("weights: inverse_variance", |engine| {
        let complaints = engine.complaints();
        assert_eq!(codes(engine), [Code::ResultsInconsistent]);
        assert!(!complaints.has_faults());
        assert!(complaints.list[0].message.contains("13.2 for 5 degrees of freedom, p = 0.021"), "{complaints:#?}");
        near(number(engine, "C.value"), 6.274047666894417, 1e-9);
    });
    SIX.reduce("weights: inverse_variance\nexpansion: birge_ratio", |engine| {
        near(uncertainty(engine, "C.value"), 3.8719934383264656, 1e-9);
        near(number(engine, "C.expansion_factor"), 1.6258266735827833, 1e-9);
        assert!(codes(engine).is_empty());
    });
}

#[test]
fn a_component_between_three_results_warns_of_its_degrees_of_freedom() {
    let runs = Runs { values: &[12.0, 95.0, 18.0], ..THREE };
    runs.reduce("weights: covariance\nbetween: paule_mandel", |engine| assert_eq!(codes(engine), [Code::FewReadings]));
}

#[test]
fn a_result_left_out_stays_in_print() {
    let excluded = "weights: covariance\nexcluded:\n  - {result: X2.value, rule: EARLY, reason: door open}";
    let all = THREE.reduce("weights: covariance", |engine| (number(engine, "C.value"), uncertainty(engine, "C.value")));
    THREE.reduce(excluded, |engine| {
        // Weights 144/340 and 196/340.
        near(number(engine, "C.value"), (12.0 * 144.0 + 18.0 * 196.0) / 340.0, 1e-9);
        assert_eq!((number(engine, "C.with_excluded.value"), uncertainty(engine, "C.with_excluded.value")), all);
        near(number(engine, "C.with_excluded.chi_square"), 0.374, 0.0005);
        let combined = engine.found::<Combined>("C").expect("stored");
        assert_eq!(combined.excluded[0].1.reason, "door open");
        assert_eq!(combined.members.len(), 2);
        assert!(codes(engine).is_empty());
    });
}

#[test]
fn exclusions_are_refused_without_reason_rule_or_data() {
    for (excluded, code) in [
        ("{result: X2.value, rule: EARLY}", Code::ExclusionWithoutReason),
        ("{result: X2.value, reason: far off}", Code::ExclusionWithoutReason),
        ("{result: X2.value, rule: LATE, reason: far off}", Code::RuleDated),
        ("{result: X9.value, rule: EARLY, reason: far off}", Code::UndefinedReference),
        ("{result: X2.value, rule: X1, reason: far off}", Code::KindMismatch),
    ] {
        THREE.reduce(&format!("weights: equal\nexcluded:\n  - {excluded}"), |engine| {
            assert_eq!(codes(engine), [code], "{excluded}");
        });
    }
    let every = "excluded:\n  - {result: X1.value, rule: EARLY, reason: a}\n  - {result: X2.value, rule: EARLY, reason: b}\n  - {result: X3.value, rule: EARLY, reason: c}";
    THREE.reduce(&format!("weights: equal\n{every}"), |engine| assert_eq!(codes(engine), [Code::DesignIncomplete]));
}

#[test]
fn what_cannot_be_combined_is_said_at_its_place() {
    let check = |runs: &Runs<'_>, combination: &str, code: Code, at: &str| {
        runs.reduce(combination, |engine| {
            let list = engine.complaints().list;
            assert_eq!(list.len(), 1, "{combination}: {list:#?}");
            assert_eq!(list[0].code, code, "{list:#?}");
            assert_eq!(engine.sources().text(list[0].place.expect("a place")), at);
            assert!(!list[0].hints.is_empty(), "{list:#?}");
        });
    };
    let exact = Runs { own: &[14.0, 0.0, 12.0], common: 0.0, ..THREE };
    check(&exact, "weights: inverse_variance", Code::UncertaintyMissing, "X2.value");
    let twins = Runs { own: &[0.0, 0.0, 12.0], ..THREE };
    for combination in ["weights: covariance", "weights: equal\nbetween: paule_mandel"] {
        check(&twins, combination, Code::CorrelationImpossible, "X2.value");
    }
    check(
        &THREE,
        "weights: equal\nbetween: paule_mandel\nexpansion: birge_ratio",
        Code::DesignIncomplete,
        "birge_ratio",
    );
    // Equal weights alone need no inverse; the test is then left out.
    twins.reduce("weights: equal", |engine| {
        assert!(codes(engine).is_empty() && engine.graph().find("C.chi_square").is_none());
    });
}

#[test]
fn a_weight_below_zero_is_explained() {
    // The second result is the first with more noise of the same source: r is larger than the ratio of the uncertainties.
    let record = "---\nrecord: T-1\ndate: 2041-03-12\n---\n\n```yaml measurement-model A\nmeasurand: a\nunit: µg\ninputs:\n  a: 0.0(1.0) µg\n  c: 5.0(1) µg\nequation: a + c\n```\n\n```yaml measurement-model B\nmeasurand: b\nunit: µg\ninputs:\n  a: from A.a\n  d: 6.0(2) µg\nequation: 2*a + d\n```\n\n```yaml combined-result C\nresults: [A.value, B.value]\nweights: covariance\n```\n";
    let intake = MemoryIntake::with([("laboratory.md", LABORATORY.to_string()), ("record.md", record.to_string())]);
    let engine = libripens::reduce(&intake, None).expect("readable");
    let combined = engine.found::<Combined>("C").expect("stored");
    assert!(combined.members[1].weight < 0.0);
    let explained = combined.decisions.iter().find(|(what, _)| what == "weight below zero").expect("explained");
    assert!(explained.1.starts_with("of B.value:"), "{explained:?}");
    // V = [[1.01, 2], [2, 4.04]] gives weights 2.04/1.05 and −0.99/1.05.
    near(combined.members[1].weight, -0.99 / 1.05, 1e-9);
}

#[test]
fn covariance_of_any_set_of_results() {
    THREE.reduce("weights: covariance", |engine| {
        let graph = engine.graph();
        let ids = ["X1.value", "X2.value", "C.value"].map(|path| graph.find(path).expect("a result"));
        let found = joint(&graph, &ids).expect("possible");
        near(found.covariance[0][1] * 1e18, 121.0, 1e-9);
        near(found.covariance[0][0] * 1e18, 14.0 * 14.0 + 121.0, 1e-9);
        // A mean of least variance covaries with each of its results as with itself.
        near(found.covariance[0][2] / found.covariance[2][2], 1.0, 1e-12);
        near(found.covariance[1][2] / found.covariance[2][2], 1.0, 1e-12);
    });
}

const REPORT: &str = "---\nrecord: REP\ndate: 2041-03-20\nperformed_by: duty metrologist\nreport:\n  title: Combined runs\n  place: room 4\n  method: {id: P-1, revision: 2}\n  deviations: none\n  results: [C.value]\n  performed_by: duty metrologist\n---\n\n# Agreement\n\n";

/// The typesetter's source of a report with this prose.
fn page(runs: &Runs<'_>, combination: &str, prose: &str) -> (String, Vec<(Code, String)>) {
    let files = [
        ("laboratory.md", LABORATORY.to_string()),
        ("record.md", runs.record(combination)),
        ("report.md", format!("{REPORT}{prose}\n")),
    ];
    let intake = MemoryIntake::with(files);
    let engine = Engine::read(&intake, None).expect("readable");
    let written = libripens::report::write_report(&engine, "report.md");
    let said = engine.complaints().list.iter().map(|one| (one.code, one.message.clone())).collect();
    (written.map_or_else(String::new, |written| written.document.source.clone()), said)
}

#[test]
fn the_report_shows_agreement_correlation_and_what_was_left_out() {
    let combination = "weights: covariance\nexcluded:\n  - {result: X2.value, rule: EARLY, reason: door open}";
    let prose = "{{ consistency(C) }}\n\n{{ correlation(X1.value, X2.value, C.value) }}\n\n{{ excluded() }}\n\n{{ chart(C) }}\n\nBirge ratio {{ C.birge_ratio }}.";
    let (page, said) = page(&THREE, combination, prose);
    assert!(said.is_empty(), "{said:?}");
    // Of the two kept: χ² = 36/340, w = 144/340 and 196/340.
    for shown in [
        "0.106",
        "0.424",
        "0.576",
        "χ²",
        "Birge ratio",
        "0.350",
        "EARLY: A run with an open door is left out. Reason: door open.",
        "left out",
        "0.325396",
    ] {
        assert!(page.replace(['\u{202f}', '\u{2009}'], "").contains(shown), "{shown} in {page}");
    }
}

#[test]
fn a_correlation_needs_two_results() {
    for prose in ["{{ correlation(X1.value) }}", "{{ correlation(X1.value, \"X2.value\") }}", "{{ consistency(X1) }}"] {
        let (_, said) = page(&THREE, "weights: covariance", prose);
        assert_eq!(said.iter().map(|(code, _)| *code).collect::<Vec<_>>(), [Code::TemplateFaulty], "{prose}: {said:?}");
    }
}
