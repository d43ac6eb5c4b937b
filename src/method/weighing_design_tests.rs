//! Tests of weighing designs.

use super::*;
use crate::graph::{
    Builder, Distribution, InputDraft, Origin, Quantity, Value, propagate_distributions, sensitivities,
    standard_uncertainty,
};
use crate::method::unit;
use crate::quantity::Kind;
use std::sync::Arc;

const REFERENCE: &[f64] = &[1.0, 0.0, 0.0, 0.0, 0.0, 0.0];
const Y: [f64; 10] = [9.8e-7, 1.08e-6, 1.38e-7, 2.29e-7, -9.0e-8, -2.7e-7, -1.8e-7, -4.3e-8, 1.4e-7, 9.1e-8];

fn named(mut rule: WeighingDesign) -> WeighingDesign {
    rule.weights = ["1000", "500", "200", "200*", "100", "100*"].map(str::to_string).to_vec();
    rule
}

/// The restraint holds, and the residuals of the fit are orthogonal to what the restraint leaves free.
#[test]
fn restraints_hold_whatever_their_number() {
    let both: [&[f64]; 2] = [&[1.0, 0.0, 0.0, 0.0, 0.0, 0.0], &[0.0, 0.0, 1.0, 1.0, 0.0, 1.0]];
    let rule = design(&DECADE, &both);
    let found = rule.solve(&Y, &[1.0, 0.500_000_3]).expect("a solution");
    assert_eq!(found.degrees_of_freedom, 6.0);
    for (row, value) in both.iter().zip([1.0, 0.500_000_3]) {
        assert!((less(value, row, &found.masses)).abs() < 4e-16, "{:?}", found.masses);
    }
    let free = [0.0, 3.0, 1.0, 0.0, 2.0, -1.0];
    let seen = times_vector(&rule.comparisons, &free);
    assert!(less(0.0, &seen, &found.residuals).abs() < 1e-15);
    // As many restraints as weights: nothing is left to fit, all is scatter.
    let all = design(&ONES_3, &[&[1.0, 0.0, 0.0], &[0.0, 1.0, 0.0], &[1.0, 1.0, 1.0]]);
    let found = all.solve(&[0.1, 0.2, 0.3], &[1.0, 2.0, 6.0]).expect("a solution");
    assert!(found.masses.iter().zip([1.0, 2.0, 3.0]).all(|(m, exact)| (m - exact).abs() < 1e-14));
    assert_eq!((found.degrees_of_freedom, found.unscaled_covariance[2][2]), (3.0, 0.0));
}

/// What it does not determine is named: the pair that no comparison tells apart, or all masses without a restraint.
#[test]
fn the_free_direction_is_named() {
    let pair: [&[f64]; 5] = [
        &[1.0, -1.0, -1.0, -1.0, -1.0, 0.0],
        &[0.0, 1.0, -1.0, -1.0, -1.0, 0.0],
        &[0.0, 0.0, 1.0, -1.0, 0.0, 0.0],
        &[0.0, 0.0, 0.0, 1.0, -1.0, -1.0],
        &[0.0, 0.0, 1.0, 0.0, -1.0, -1.0],
    ];
    let refused = named(design(&pair, &[REFERENCE])).solve(&[0.0; 5], &[1.0]).expect_err("free");
    assert_eq!(refused.code, Code::DesignIncomplete);
    let by_hand = [0.0, 0.0, 1.0, 1.0, -2.0, 3.0];
    assert!(pair.iter().all(|row| less(0.0, row, &by_hand) == 0.0), "the direction of this test");
    assert!(refused.message.contains("200 by +1, 200* by +1, 100 by −2, 100* by +3."), "{}", refused.message);
    let no_restraint = WeighingDesign { restraints: Vec::new(), ..named(design(&DECADE, &[REFERENCE])) };
    let refused = no_restraint.solve(&Y, &[]).expect_err("free").message;
    assert!(refused.contains("1000 by +10, 500 by +5, 200 by +2, 200* by +2, 100 by +1, 100* by +1."), "{refused}");
}

#[test]
fn unusable_designs_are_refused() {
    let rule = named(design(&DECADE, &[REFERENCE]));
    assert!(rule.solve(&Y[..9], &[1.0]).expect_err("short").message.contains("10 comparisons, but 9"));
    assert!(rule.solve(&[f64::NAN; 10], &[1.0]).expect_err("no number").message.contains("no number"));
    let twice = WeighingDesign {
        restraints: vec![REFERENCE.to_vec(), scaled(&[REFERENCE.to_vec()], 2.0).remove(0)],
        ..rule.clone()
    };
    assert!(twice.solve(&Y, &[1.0, 2.0]).expect_err("twice").message.starts_with("Restraint 2 "));
    let ragged = WeighingDesign { restraints: vec![vec![1.0]], ..rule.clone() };
    assert!(ragged.solve(&Y, &[1.0]).expect_err("ragged").message.contains("1 entries for 6 weights"));
    for relative in [vec![1.0; 9], vec![0.0; 10], vec![f64::NAN; 10]] {
        let bad = WeighingDesign { relative: Some(relative), ..rule.clone() };
        assert!(bad.solve(&Y, &[1.0]).expect_err("bad").message.contains("positive standard deviations"));
    }
    let exact = design(&ONES_3[..2], &[&[1.0, 0.0, 0.0]]);
    assert!(exact.estimate(&[&[0.1, 0.2], &[1.0]]).expect_err("no spare").message.contains("no comparison to spare"));
    let accepted = WeighingDesign { scatter: Scatter::Accepted { deviation: 0.5, degrees_of_freedom: 9.0 }, ..exact };
    let found = accepted.estimate(&[&[0.1, 0.2], &[1.0]]).expect("accepted");
    assert!((found.own_covariance[2][2] - 0.25).abs() < 1e-15 && found.degrees_of_freedom == 9.0);
    assert!(found.decisions.is_empty(), "no scatter, no test");
}

/// Derivatives against differences, with unlike comparisons, and the same whatever the columns.
#[test]
fn sensitivities_agree_with_differences() {
    let relative = Some((0..10).map(|i| 1.0 + f64::from(i % 3)).collect());
    let rule = WeighingDesign { relative, ..design(&DECADE, &[REFERENCE, &[0.0, 1.0, 0.0, 0.0, 0.0, 0.0]]) };
    let all = [&Y[..], &[1.0, 0.500_000_2]].concat();
    let whole = rule.estimate(&[&all]).expect("found");
    let parts = rule.estimate(&[&all[..4], &all[4..10], &all[10..11], &all[11..]]).expect("found");
    for weight in 0..6 {
        let joined: Vec<f64> = parts.jacobian.iter().flat_map(|column| column[weight].clone()).collect();
        assert_eq!(joined, whole.jacobian[0][weight]);
        for row in 0..12 {
            let moved = |step: f64| {
                let mut all = all.clone();
                all[row] += step;
                rule.estimate(&[&all]).expect("found").values[weight]
            };
            let difference = (moved(0.5) - moved(-0.5)) / 1.0;
            assert!((difference - whole.jacobian[0][weight][row]).abs() < 1e-14, "{weight} {row}: {difference}");
        }
    }
}

/// Linear, so that trials give the first-order uncertainty, with the shared restraint and the scatter in it.
#[test]
fn trials_agree_with_first_order() {
    let builder = Builder::default();
    let input = |name: &str, value: f64, u: f64| -> Quantity<'_> {
        let (kg, value) = (unit("kg"), Value::Scalar(value));
        let mut draft = InputDraft::new(name, name, name, Kind::Plain, kg, value, Origin::Assumed("test"));
        draft.distribution = Distribution::Normal { standard_uncertainty: u };
        builder.input(draft)
    };
    let mut columns: Vec<Quantity<'_>> =
        Y.iter().enumerate().map(|(i, y)| input(&format!("y{i}"), *y, 2e-10)).collect();
    columns.push(input("reference", 1.000_001_2, 1e-9));
    let scatter = Scatter::Accepted { deviation: 3.1e-10, degrees_of_freedom: f64::INFINITY };
    let rule = WeighingDesign { scatter, ..design(&DECADE, &[REFERENCE]) };
    let outputs = [(unit("kg").dimension(), Kind::Plain); 6];
    let made = builder.estimator(Arc::new(rule), &columns, &outputs, "D.scatter", "scatter").expect("made");
    let ids: Vec<_> = made.iter().map(|quantity| quantity.id).collect();
    let (graph, _) = builder.finish();
    let trials = propagate_distributions(&graph, &ids, 100_000).expect("trials");
    for (index, (nominal, c)) in
        [(1.0, 0.0), (0.5, 0.25), (0.2, 23.0 / 175.0), (0.2, 23.0 / 175.0), (0.1, 61.0 / 400.0)].iter().enumerate()
    {
        let first = standard_uncertainty(&graph, &sensitivities(&graph, ids[index]));
        let by_hand = sqrt(c * (square(3.1e-10) + square(2e-10)) + square(nominal * 1e-9));
        assert!((first / by_hand - 1.0).abs() < 1e-12, "{index}: {first} {by_hand}");
        let seen = trials.summary(index, 0.95).standard_uncertainty;
        assert!((seen / first - 1.0).abs() < 0.01, "{index}: {seen} {first}");
    }
}

/// The tests stand among the decisions, in words.
#[test]
fn decisions_say_what_the_tests_found() {
    let check = CheckStandard { weight: 1, accepted: 0.0105, deviation: 0.0005, count: 16 };
    let scatter = Scatter::Accepted { deviation: 0.0005, degrees_of_freedom: 40.0 };
    let rule = WeighingDesign { scatter, check: Some(check), ..design(&ONES_4, &[&[1.0, 1.0, 0.0, 0.0]]) };
    let differences = [0.021, -0.1335, 0.248, -0.1522, 0.2291, 0.3838];
    let words = rule.estimate(&[&differences, &[0.043]]).expect("found").decisions;
    assert!(words[0].decided.starts_with("F(3, 40) = 7.08, p = 0.0006"), "{words:?}");
    assert!(words[0].decided.ends_with("limit 2.84 at the level 0.95, failed"), "{words:?}");
    assert_eq!(words[1].what, "check standard W2 against its accepted mass");
    assert!(words[1].decided.starts_with("t(15) = 2.04, p = 0.06"), "{words:?}");
    assert!(words[1].decided.ends_with("limit 2.13 at the level 0.95, passed"), "{words:?}");
    let elsewhere = WeighingDesign { check: Some(CheckStandard { weight: 4, ..check }), ..rule };
    let refused = elsewhere.estimate(&[&differences, &[0.043]]).expect_err("no such weight");
    assert_eq!(refused.code, Code::DesignIncomplete);
}
