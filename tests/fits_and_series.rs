//! Fits, analyses of variance and series in time from the record to the number, and what they refuse.

#![allow(clippy::disallowed_methods)]

use libripens::block::Engine;
use libripens::diagnostic::Code;
use libripens::graph::{degrees_of_freedom, propagate_distributions, sensitivities, standard_uncertainty};
use libripens::intake::MemoryIntake;

const LABORATORY: &str = "---\nformat: 1\nname: Test laboratory\naddress: Nowhere\ncoverage_probability: 95.45 %\ndecimal_marker: point\ndegrees_of_freedom: truncated\n---\n";

fn reduce<T>(blocks: &str, check: impl FnOnce(&Engine) -> T) -> T {
    let record = format!("---\nrecord: T-1\ndate: 2041-03-12\n---\n\n{blocks}");
    let intake = MemoryIntake::with([("laboratory.md", LABORATORY.to_string()), ("record.md", record)]);
    let engine = libripens::reduce(&intake, None).expect("readable");
    check(&engine)
}

fn value_and_u(engine: &Engine, path: &str) -> (f64, f64) {
    assert!(!engine.complaints().has_faults(), "{:#?}", engine.complaints());
    let graph = engine.graph();
    let id = graph.find(path).unwrap_or_else(|| panic!("no result {path}"));
    (graph.number(id), standard_uncertainty(&graph, &sensitivities(&graph, id)))
}

fn near(found: f64, expected: f64, relative: f64) {
    assert!((found / expected - 1.0).abs() < relative, "{found} against {expected}");
}

/// Every complaint, with the text it points at.
fn complaints(blocks: &str) -> Vec<(Code, String, String)> {
    reduce(blocks, |engine| {
        let list = engine.complaints().list;
        let text = |place| engine.sources().text(place).into_owned();
        list.into_iter().map(|one| (one.code, one.place.map(text).unwrap_or_default(), one.message)).collect()
    })
}

fn refused(blocks: &str, code: Code, words: &str) {
    let found = complaints(blocks);
    assert_eq!(found.len(), 1, "{found:#?}");
    assert_eq!(found[0].0, code, "{found:#?}");
    assert!(found[0].2.contains(words), "{found:#?}");
}

const DRIFT: &str = "```yaml fit D
x: {values: [2008.3, 2010.6, 2013.1, 2015.4, 2018.0, 2020.5, 2023.2], unit: 1, label: year}
y: {values: [1264.5, 1266.4, 1275.2, 1270.1, 1281.3, 1274.8, 1279.9], unit: µg, label: departure from nominal}
u: {values: [6, 6, 6, 5, 5, 4, 4], unit: µg}
u_is: absolute
degree: 1
about: 2026.2
predictions:
  - {at: 2026.2}
  - {at: 2020.0(5)}
```
";

/// Invented recalibrations; the line in high precision, centred at its weighted mean.
#[test]
fn a_line_weighted_point_by_point() {
    reduce(DRIFT, |engine| {
        near(value_and_u(engine, "D.c1").0, 0.9332786997e-9, 1e-9);
        let (value, u) = value_and_u(engine, "D.at_1");
        near(value, 1282.802044622e-9, 1e-12);
        near(u, 3.889699601e-9, 1e-9);
        near(value_and_u(engine, "D.chi_square").0, 2.997816111, 1e-9);
        let graph = engine.graph();
        let id = graph.find("D.at_1").expect("a prediction");
        assert_eq!(degrees_of_freedom(&graph, &sensitivities(&graph, id)), f64::INFINITY);
    });
}

/// At an uncertain abscissa the slope carries its uncertainty over: u² = u²(line) + (c_1 u(x))².
#[test]
fn an_uncertain_abscissa_adds_its_own_share() {
    let sharp = DRIFT.replace("2020.0(5)", "2020.0");
    let of_line = reduce(&sharp, |engine| value_and_u(engine, "D.at_2").1);
    let found = reduce(DRIFT, |engine| value_and_u(engine, "D.at_2").1);
    let slope = reduce(DRIFT, |engine| value_and_u(engine, "D.c1").0);
    near(found, of_line.hypot(slope * 0.5), 1e-12);
}

/// The same weights up to a factor: u follows the residuals, with n − 2 degrees of freedom.
#[test]
fn relative_weights_take_their_scale_from_the_residuals() {
    let relative = DRIFT.replace("u_is: absolute", "u_is: relative");
    reduce(&relative, |engine| {
        near(value_and_u(engine, "D.at_1").1, 3.889699601e-9 * (2.997816111f64 / 5.0).sqrt(), 1e-9);
        let graph = engine.graph();
        let id = graph.find("D.at_1").expect("a prediction");
        assert_eq!(degrees_of_freedom(&graph, &sensitivities(&graph, id)), 5.0);
        assert!(graph.find("D.chi_square").is_none(), "weights known up to a factor test nothing");
    });
}

/// A prediction is linear in jointly estimated parameters: the trials give the same u.
#[test]
fn trials_of_a_prediction_agree_with_first_order() {
    reduce(DRIFT, |engine| {
        let (value, u) = value_and_u(engine, "D.at_2");
        let graph = engine.graph();
        let id = graph.find("D.at_2").expect("a prediction");
        let trials = propagate_distributions(&graph, &[id], 200_000).expect("runs").summary(0, 0.95);
        near(trials.estimate, value, 1e-4);
        near(trials.standard_uncertainty, u, 0.01);
    });
}

#[test]
fn what_a_fit_refuses() {
    let line = |x: &str, y: &str, rest: &str| {
        format!("```yaml fit F\nx: {{values: {x}, unit: °C}}\ny: {{values: {y}, unit: mg}}\n{rest}\n```\n")
    };
    let four = ("[20.1, 21.2, 22.3, 23.4]", "[1.1, 1.2, 1.4, 1.5]");
    refused(&line(four.0, "[1.1, 1.2, 1.4]", "degree: 1"), Code::DesignIncomplete, "4 abscissae, but 3 ordinates");
    refused(
        &line("[20.1, 21.2]", "[1.1, 1.2]", "degree: 1"),
        Code::DesignIncomplete,
        "needs 3 points or more, found 2",
    );
    refused(&line(four.0, four.1, "degree: 1.5"), Code::OutOfRange, "1.5");
    refused(&line(four.0, four.1, "degree: 1\nabout: 20 hPa"), Code::DimensionMismatch, "about is given in hPa");
    refused(&line(four.0, four.1, "degree: 1\nu: 0.1 K\nu_is: absolute"), Code::DimensionMismatch, "u is given in K");
    refused(&line(four.0, four.1, "degree: 1\nu: 0 mg\nu_is: absolute"), Code::OutOfRange, "above zero");
    refused(&line(four.0, four.1, "degree: 1\nu: 0.1 mg"), Code::FieldMissing, "u together with u_is");
    refused(
        &line(four.0, four.1, "degree: 1\nu: {values: [0.1, 0.1], unit: mg}\nu_is: relative"),
        Code::DesignIncomplete,
        "4 ordinates, but 2 standard uncertainties",
    );
    refused(
        &line(four.0, four.1, "degree: 1\npredictions:\n  - {at: 1 m}"),
        Code::DimensionMismatch,
        "at is given in m, but the abscissae of F are in °C",
    );
    refused(&line(four.0, four.1, "search: {largest: 3, confidence: 99}"), Code::OutOfRange, "between 0.5 and 1");
    refused(&line("[20, 20, 20, 20]", four.1, "degree: 1"), Code::DesignIncomplete, "cannot separate");
    let found = complaints(&line(four.0, four.1, "degree: 1\npredictions:\n  - {at: 25 °C}"));
    assert_eq!(found.len(), 1);
    assert_eq!((found[0].0, found[0].1.as_str()), (Code::Extrapolated, "25 °C"), "{found:#?}");
    assert!(found[0].2.contains("from 20.1 to 23.4 °C"), "{found:#?}");
}

/// Temperatures of the scale as ordinates: an uncertainty in °C would be counted from the wrong zero.
#[test]
fn an_uncertainty_in_degrees_celsius_is_refused() {
    let block = "```yaml fit F\nx: {values: [1, 2, 3], unit: 1}\ny: {values: [20.1, 20.3, 20.4], unit: °C}\nu: 0.1 °C\nu_is: absolute\ndegree: 1\n```\n";
    refused(block, Code::KindMismatch, "difference of temperatures");
    reduce(&block.replace("0.1 °C", "0.1 K"), |engine| {
        near(value_and_u(engine, "F.c0").1, 0.1 * (7.0f64 / 3.0).sqrt(), 1e-9)
    });
}

/// The degree by F tests: a parabola with a small scatter.
#[test]
fn the_degree_is_chosen_by_the_stated_rule() {
    let y: Vec<String> =
        (0..12).map(|i| format!("{:.4}", 1.0 + 0.5 * f64::from(i * i) + 0.01 * f64::from((i * 7) % 5 - 2))).collect();
    let x: Vec<String> = (0..12).map(|i| i.to_string()).collect();
    let block = format!(
        "```yaml fit F\nx: {{values: [{}], unit: s}}\ny: {{values: [{}], unit: m}}\nsearch: {{largest: 4, confidence: 0.99}}\n```\n",
        x.join(", "),
        y.join(", ")
    );
    reduce(&block, |engine| {
        near(value_and_u(engine, "F.c2").0, 0.5, 0.01);
        let graph = engine.graph();
        assert!(graph.find("F.c3").is_none());
        assert_eq!(graph.node(graph.find("F.c2").expect("c2")).name.as_ref().expect("named").unit.text(), "m s⁻²");
        let said: Vec<String> =
            graph.estimators[0].estimate.decisions.iter().map(|one| format!("{}: {}", one.what, one.decided)).collect();
        assert!(
            said[0].starts_with("degree 2 against 1: F(1, 9) = ") && said[0].ends_with("significant, taken"),
            "{said:?}"
        );
        assert!(said[2].contains("by F tests at the level 0.99, degree 4 at most"), "{said:?}");
    });
}

#[test]
fn what_an_analysis_of_variance_refuses() {
    let block = |rest: &str| format!("```yaml analysis-of-variance A\nunit: mg\n{rest}\n```\n");
    let groups = "groups:\n  - [1.1, 1.2]\n  - [1.3, 1.5]\n";
    refused(&block("groups:\n  - [1.1, 1.2]\n  - []\nsignificance: 0.05"), Code::DesignIncomplete, "no readings");
    refused(&block("groups:\n  - [1.1, 1.2]\nsignificance: 0.05"), Code::DesignIncomplete, "two groups or more");
    refused(&block("days:\n  - series: []\nsignificance: 0.05"), Code::DesignIncomplete, "no readings");
    refused(&block(&format!("{groups}significance: 5")), Code::OutOfRange, "between 0 and 1");
    refused(&block("significance: 0.05"), Code::FieldMissing, "one of groups, days and summaries");
    refused(
        &block(
            "summaries:\n  - {mean: 1.2, count: 2.5, standard_deviation: 0.1}\n  - {mean: 1.2, count: 2, standard_deviation: 0.1}\nsignificance: 0.05",
        ),
        Code::OutOfRange,
        "2.5 readings",
    );
}

/// Groups that differ less than their readings scatter: u is that of all readings, never less.
#[test]
fn groups_that_agree_too_well_do_not_shrink_the_uncertainty() {
    let block = "```yaml analysis-of-variance A\nunit: mg\nsignificance: 0.05\nbetween: always\ngroups:\n  - [1.0, 3.0]\n  - [1.1, 2.9]\n  - [0.9, 3.1]\n```\n";
    reduce(block, |engine| {
        let rows = [1.0, 3.0, 1.1, 2.9, 0.9, 3.1f64];
        let squares: f64 = rows.iter().map(|row| (row - 2.0) * (row - 2.0)).sum();
        let (_, u) = value_and_u(engine, "A.mean");
        assert!(u >= 1e-6 * (squares / 30.0).sqrt() * (1.0 - 1e-12), "{u}");
        assert_eq!(value_and_u(engine, "A.between").0, 0.0);
    });
}

/// Confidence limits of the nine points, from quantiles of chi-square found by bisection of another incomplete gamma.
#[test]
fn allan_deviations_carry_their_limits() {
    let block = "```yaml series-in-time S\nreadings: {values: [892, 809, 823, 798, 671, 644, 883, 903, 677], unit: 1}\ninterval: 1 s\nuncertainty: independent readings\n```\n";
    reduce(block, |engine| {
        for (path, expected) in [
            ("S.allan_1.low", 57.516_61),
            ("S.allan_1.high", 216.041_3),
            ("S.allan_2.low", 51.310_29),
            ("S.allan_2.high", 250.786_1),
        ] {
            near(value_and_u(engine, path).0, expected, 1e-6);
        }
        assert!(engine.graph().find("S.allan_4").is_some() && engine.graph().find("S.allan_8").is_none());
    });
}

/// Temperatures in °C: deviations are differences, in kelvin.
#[test]
fn deviations_of_temperatures_are_differences() {
    let blocks = "```yaml series-in-time S\nreadings: {values: [20.1, 20.2, 20.1, 20.3, 20.2], unit: °C}\ninterval: 1 s\nuncertainty: independent readings\n```\n\n```yaml analysis-of-variance A\nunit: °C\nsignificance: 0.05\ngroups:\n  - [20.1, 20.2]\n  - [20.3, 20.5]\n```\n";
    reduce(blocks, |engine| {
        for path in ["S.allan_1", "A.within"] {
            let (value, _) = value_and_u(engine, path);
            let graph = engine.graph();
            let name = graph.node(graph.find(path).expect("a result")).name.clone().expect("named");
            assert!(value < 1.0 && name.unit.text() == "K", "{path} {value} {}", name.unit.text());
        }
        near(value_and_u(engine, "S.mean").0, 293.33, 1e-9);
    });
}

#[test]
fn what_a_series_refuses() {
    let block = |readings: &str, rest: &str| {
        format!("```yaml series-in-time S\nreadings: {{values: {readings}, unit: mV}}\n{rest}\n```\n")
    };
    let few = block("[1.0, 1.1]", "interval: 1 s\nuncertainty: independent readings");
    refused(&few, Code::DesignIncomplete, "three or more are needed");
    let three = block("[1.0, 1.1, 1.05]", "interval: 1 s\nuncertainty: least Allan deviation");
    refused(&three, Code::DesignIncomplete, "too few for an Allan deviation");
    let still = block("[1.0, 1.1, 1.05]", "interval: 0 s\nuncertainty: independent readings");
    refused(&still, Code::OutOfRange, "0 s");
    let length = block("[1.0, 1.1, 1.05]", "interval: 1 m\nuncertainty: independent readings");
    refused(&length, Code::DimensionMismatch, "interval");
}
