//! The graph of quantities proven on three things through all its evaluators, numbers, first-order sensitivities and
//! Monte Carlo trials: a weighing series at unequal times, the line fit of JCGM 100 H.3, the profile fit of a moving
//! coil. Then the published examples of combined uncertainty, and what cannot be built.

#![allow(clippy::disallowed_methods)]

use libripens::diagnostic::{Code, Problem};
use libripens::graph::{
    Builder, DegreesOfFreedomRule, Distribution, Graph, InputDraft, NodeId, Op, Origin, Quantity, Settings, State,
    Value, budget, correlation, covariance, coverage, degrees_of_freedom, evaluate_displaced, linearity_departure,
    propagate_distributions, sensitivities, standard_uncertainty,
};
use libripens::method::weighing_cycle::{Cycle, Dispersion, MeanDifference};
use libripens::method::{exact, profile_fit::ProfileFit, straight_line::StraightLine, unit};
use libripens::quantity::{Dimension, Kind, Unit};
use proptest::prelude::*;
use serde_json::Value as Json;
use std::collections::BTreeMap;
use std::sync::Arc;

fn published(name: &str) -> Json {
    let path = format!("{}/tests/published/{name}", env!("CARGO_MANIFEST_DIR"));
    serde_json::from_str(&std::fs::read_to_string(path).expect("vectors")).expect("JSON")
}

fn example(file: &str, name: &str) -> Json {
    let list = published(file);
    let found =
        list.as_array().expect("a list").iter().find(|one| one["name"].as_str().is_some_and(|n| n.starts_with(name)));
    found.unwrap_or_else(|| panic!("no example {name}")).clone()
}

fn input<'g>(
    b: &'g Builder,
    path: &str,
    unit_text: &str,
    value: f64,
    distribution: Distribution,
    freedom: f64,
) -> Quantity<'g> {
    let shown = unit(unit_text);
    let mut draft =
        InputDraft::new(path, path, path, Kind::Plain, shown, Value::Scalar(value), Origin::Assumed("test"));
    draft.distribution = distribution;
    draft.degrees_of_freedom = freedom;
    b.input(draft)
}

fn normal(u: f64) -> Distribution {
    Distribution::Normal { standard_uncertainty: u }
}

/// Sensitivities of `measurand` against central differences of the graph evaluated anew, for every scalar input.
fn compare_with_differences(graph: &Graph, measurand: NodeId, tolerance: f64) {
    let derivatives = sensitivities(graph, measurand);
    let combined = standard_uncertainty(graph, &derivatives);
    for (number, weights) in &derivatives.inputs {
        let node = graph.inputs[*number as usize].node;
        if graph.value(node).length().is_some() {
            continue;
        }
        let centre = graph.number(node);
        let step = graph.inputs[*number as usize].distribution.standard_uncertainty().max(1e-9 * centre.abs());
        let at = |value: f64| {
            let moved = BTreeMap::from([(node, Value::Scalar(value))]);
            evaluate_displaced(graph, &moved, measurand).expect("evaluates")[measurand.index()].number()
        };
        let difference = (at(centre + step) - at(centre - step)) / (2.0 * step);
        let scale = difference.abs().max(weights[0].abs()).max(f64::MIN_POSITIVE);
        let path = &graph.node(node).name.as_ref().expect("named").path;
        // Where the effects on numerator and denominator cancel, what is left must not matter to u.
        let off = (weights[0] - difference).abs();
        let negligible = off * step < 1e-6 * combined;
        assert!(off / scale < tolerance || negligible, "{path}: {} against {difference}", weights[0]);
    }
}

fn compare_with_trials(graph: &Graph, measurand: NodeId, trials: usize, tolerance: f64) {
    let first_order = standard_uncertainty(graph, &sensitivities(graph, measurand));
    let found = propagate_distributions(graph, &[measurand], trials).expect("runs").summary(0, 0.95);
    assert!((found.standard_uncertainty / first_order - 1.0).abs() < tolerance, "{found:?} against {first_order}");
    let mean_off = (found.estimate - graph.number(measurand)).abs() / (first_order / (trials as f64).sqrt());
    assert!(mean_off < 5.0, "the mean of the trials is {mean_off} standard deviations off");
}

#[test]
fn a_weighing_series_at_unequal_times() {
    let b = Builder::default();
    let times = [0.0, 70.0, 190.0, 260.0, 900.0, 1010.0, 1080.0, 1200.0, 2000.0, 2050.0, 2160.0, 2290.0];
    let sides = [false, true, true, false];
    let cycles: Vec<Cycle> = (0..3)
        .map(|index| Cycle {
            series: 1,
            number: index + 1,
            rows: (0..4).map(|row| index as usize * 4 + row).collect(),
            times: times[index as usize * 4..index as usize * 4 + 4].to_vec(),
            b_on_pan: sides.to_vec(),
            excluded: false,
        })
        .collect();
    // Indications of a difference of 1.5 mg in units of mass, with drift and a known scatter.
    let scatter = [0.3, -0.1, 0.2, -0.4, 0.1, 0.4, -0.3, 0.0, -0.2, 0.1, 0.3, -0.2];
    let rows: Vec<f64> = (0..12)
        .map(|row| 1e-6 * (2.0 + 1e-4 * times[row] + if sides[row % 4] { 1.5 } else { 0.0 }) + 1e-9 * scatter[row])
        .collect();
    let mass = Unit::parse("kg").expect("kg");
    let origin = Origin::Assumed("test");
    let indications =
        b.input(InputDraft::new("I", "I", "indications", Kind::MassDifference, mass, Value::column(rows), origin));
    let k = input(&b, "k", "1", 1.000_02, normal(3e-5), f64::INFINITY);
    let density = input(&b, "rho", "kg/m3", 1.18, normal(4e-4), f64::INFINITY);
    let volume = input(&b, "V", "m3", 0.4e-6, normal(0.8e-9), f64::INFINITY);
    let mask = b.column((0..12).map(|row| f64::from(u8::from(sides[row % 4]))).collect::<Vec<_>>());
    let drift = b.column((0..12).map(|row| 1.0 + 1e-4 * f64::from(row)).collect::<Vec<_>>());
    let y = k * indications.as_kind(Kind::Plain) + density * drift * volume * mask;
    let rule =
        MeanDifference::new(&cycles, Dispersion::PooledCycle { standard_deviation: 0.5e-9, degrees_of_freedom: 40.0 });
    let outputs = vec![(Dimension::MASS, Kind::MassDifference); 2];
    let made = b
        .estimator(Arc::new(rule.expect("rule")), &[y], &outputs, "repeatability", "repeatability")
        .expect("estimates");
    let id = made[0].id;
    let (graph, _) = b.finish();
    // Closed form: k · 1.5 mg + ρ V, the air drifting by the rows weighed with b, plus the scatter by the cycle's weights.
    let found = graph.number(id);
    let expected = 1.000_02 * 1.5e-6 + 1.18 * 0.4e-6;
    assert!((found - expected).abs() < 1.2e-9, "{found} against {expected}");
    compare_with_differences(&graph, id, 1e-6);
    let u = standard_uncertainty(&graph, &sensitivities(&graph, id));
    let closed = ((3e-5f64 * 1.5e-6).powi(2)
        + (4e-4f64 * 0.4e-6).powi(2)
        + (0.8e-9f64 * 1.18).powi(2)
        + 0.5e-9f64.powi(2) / 3.0)
        .sqrt();
    assert!((u / closed - 1.0).abs() < 1e-3, "u {u} against {closed}");
    assert!(linearity_departure(&graph, id).expect("evaluates") < 1e-6);
    // The t distribution with 40 degrees of freedom widens the scatter by √(40/38).
    compare_with_trials(&graph, id, 200_000, 0.01);
}

/// JCGM 100:2008, H.3: published digits of the line through eleven corrections, and the prediction at 30 °C.
#[test]
fn the_line_of_the_guide_and_its_prediction() {
    let vector = example("guides.json", "JCGM 100 H.3");
    let list = |key: &str| -> Vec<f64> {
        vector["inputs"][key].as_array().expect("list").iter().map(|x| x.as_f64().expect("number")).collect()
    };
    let b = Builder::default();
    let kelvin = unit("K");
    let column = |path: &str, rows: Vec<f64>| {
        b.input(InputDraft::new(
            path,
            path,
            path,
            Kind::Plain,
            kelvin.clone(),
            Value::column(rows),
            Origin::Assumed("test"),
        ))
    };
    let (t, correction) = (column("t", list("t_degC")), column("b", list("b_degC")));
    let outputs = [(Dimension::TEMPERATURE, Kind::Plain), (Dimension::ONE, Kind::Plain)];
    let line = b
        .estimator(Arc::new(StraightLine { reference: 20.0 }), &[t, correction], &outputs, "line", "line")
        .expect("fits");
    let prediction = line[0] + line[1] * exact(&b, 10.0, "K");
    let (y1, y2, at_30) = (line[0].id, line[1].id, prediction.id);
    let (graph, _) = b.finish();
    let of = |id: NodeId| sensitivities(&graph, id);
    let printed = [
        (graph.number(y1), -0.1712, 5e-5),
        (graph.number(y2), 0.00218, 5e-6),
        (standard_uncertainty(&graph, &of(y1)), 0.0029, 5e-5),
        (standard_uncertainty(&graph, &of(y2)), 0.00067, 5e-6),
        (correlation(&graph, &of(y1), &of(y2)), -0.930, 5e-4),
        (graph.number(at_30), -0.1494, 5e-5),
        (standard_uncertainty(&graph, &of(at_30)), 0.0041, 5e-5),
        (degrees_of_freedom(&graph, &of(at_30)), 9.0, 1e-9),
    ];
    for (found, value, tolerance) in printed {
        assert!((found - value).abs() <= tolerance, "printed {value}, found {found}");
    }
    // The trials draw the joint t of the parameters: s²·9/7 for nine degrees of freedom.
    let trials = propagate_distributions(&graph, &[at_30], 200_000).expect("runs").summary(0, 0.95);
    let expected = standard_uncertainty(&graph, &of(at_30)) * (9.0f64 / 7.0).sqrt();
    assert!((trials.standard_uncertainty / expected - 1.0).abs() < 0.02, "{trials:?} against {expected}");
}

/// The moving phase in `det1_moving.csv`: 2400 gates, from fringes, steps and null readings to the geometric factor.
struct MovingPhase {
    graph: Graph,
    outputs: Vec<NodeId>,
    expected: Json,
}

fn moving_phase() -> MovingPhase {
    let vector = published("moving_phase.json");
    let text = std::fs::read_to_string(format!("{}/tests/published/det1_moving.csv", env!("CARGO_MANIFEST_DIR")))
        .expect("raw");
    let mut columns: Vec<Vec<f64>> = vec![Vec::new(); 7];
    for line in text.lines().skip(1) {
        line.split(',')
            .zip(&mut columns)
            .for_each(|(cell, column)| column.push(cell.trim_start_matches('+').parse().expect("number")));
    }
    let b = Builder::default();
    let given = |key: &str| {
        (vector["inputs"][key]["value"].as_f64().expect("value"), vector["inputs"][key]["u"].as_f64().expect("u"))
    };
    let scalar = |key: &str, unit_text: &str| {
        let (value, u) = given(key);
        let distribution = if u > 0.0 { normal(u) } else { Distribution::Exact };
        input(&b, key, unit_text, value, distribution, f64::INFINITY)
    };
    let read = |path: &str, unit_text: &str, rows: &[f64], factor: f64| {
        let rows: Vec<f64> = rows.iter().map(|row| row * factor).collect();
        b.input(InputDraft::new(
            path,
            path,
            path,
            Kind::Plain,
            unit(unit_text),
            Value::column(rows),
            Origin::Assumed("test"),
        ))
    };
    let (fringes, steps) = (read("fringes", "1", &columns[4], 1.0), read("steps", "1", &columns[5], 1.0));
    let null = read("null", "V", &columns[6], 1e-6);
    let y = scalar("time.y", "1");
    // v = N c (1 + y) / (2 n f τ), along the vertical: (4) of the alignment of the velocity.
    let c = exact(&b, 299_792_458.0, "m/s");
    let gate = exact(&b, given("gate").0, "s");
    let pressure = exact(&b, 0.058_215_605_882_352_944, "Pa");
    let index = 1.0
        + scalar("vac.refractivity", "K/Pa") * scalar("vac.gauge", "1") * pressure / exact(&b, 293.353_141_176_47, "K");
    let measured = fringes * (c * (1.0 + y) / (2.0 * index * scalar("laser.f", "Hz") * gate));
    let (tx, ty) = (scalar("align.theta_x", "1"), scalar("align.theta_y", "1"));
    let (wx, wy) = (scalar("par.wx", "/m"), scalar("par.wy", "/m"));
    let abbe = wx * scalar("abbe.d_y", "m") - wy * scalar("abbe.d_x", "m");
    let v = measured * ((1.0 + (tx.squared() + ty.squared()) * 0.5) * (1.0 - abbe));
    // U = n f (1 + y) / K_J + g null, over 1 + ε.
    let k_j = 2.0 * exact(&b, 1.602_176_634e-19, "C") / exact(&b, 6.626_070_15e-34, "J s");
    let voltage = steps * (scalar("jj.f1", "Hz") * (1.0 + y) / k_j) + scalar("null.gain_moving", "1") * null;
    let eps = scalar("par.Fx", "1") * scalar("par.vx", "1")
        + scalar("par.Fy", "1") * scalar("par.vy", "1")
        + scalar("par.Gx", "m") * wx
        + scalar("par.Gy", "m") * wy
        + scalar("par.Gz", "m") * scalar("par.wz", "/m");
    let u = voltage / (1.0 + eps);
    let z_w = given("z_w").0;
    let rule = ProfileFit {
        sweeps: columns[0].iter().map(|sweep| *sweep as i64).collect(),
        positions: columns[3].iter().map(|z| (z - z_w) * 1e-3).collect(),
        times: columns[2].iter().map(|t| t - 35_779.81).collect(),
        gate: given("gate").0,
        order: 4,
        drift: true,
        decisions: Vec::new(),
    };
    let outputs = vec![(Dimension::ONE, Kind::Plain); 8];
    let made = b.estimator(Arc::new(rule), &[v, u], &outputs, "profile", "scatter of the gates").expect("fits");
    let outputs = made.iter().map(|quantity| quantity.id).collect();
    assert!(b.take_problems().is_empty());
    MovingPhase { graph: b.finish().0, outputs, expected: vector["expected"].clone() }
}

#[test]
fn the_profile_fit_of_a_moving_phase() {
    let phase = moving_phase();
    let (graph, b0) = (&phase.graph, phase.outputs[0]);
    let expected = |key: &str| phase.expected[key].as_f64().expect("expected");
    let estimate = &graph.estimators[0].estimate;
    let own = estimate.own_covariance[0][0].sqrt();
    assert!((graph.number(b0) - expected("Bl0")).abs() < 0.05 * expected("u_Bl0"), "b_0 {} ", graph.number(b0));
    assert!((own / expected("u_Bl0") - 1.0).abs() < 0.03, "u(b_0) {own}");
    assert_eq!(estimate.degrees_of_freedom, expected("dof"));
    let drift = estimate.values[5] / estimate.values[0] * 3600.0;
    assert!((drift / expected("drift_rel_per_h") - 1.0).abs() < 1e-3, "drift {drift}");
    assert!((estimate.values[6] * 1e6 - expected("emf0_uV")).abs() < 1e-4, "thermal voltage {}", estimate.values[6]);
    let rss: f64 = estimate.residuals.iter().map(|r| r * r).sum();
    let s = (rss / estimate.degrees_of_freedom).sqrt() * 1e6;
    assert!((s / expected("s_uV") - 1.0).abs() < 1e-3, "s {s}");
    // Every scalar that shapes the rows, through the linear response against a fit at displaced inputs.
    compare_with_differences(graph, b0, 2e-4);
    assert!(linearity_departure(graph, b0).expect("fits") < 1e-3);
    // Both microwaves, gate and fringe rate hang on one oscillator: b_0 ∝ f/v is left with (1 + y)/(1 + y).
    let derivatives = sensitivities(graph, b0);
    let of = |path: &str| {
        let node = graph.find(path).expect("named");
        let Op::Input(number) = graph.node(node).op else { panic!("an input") };
        derivatives.inputs[&number][0]
    };
    assert!((of("time.y") / graph.number(b0)).abs() < 1e-3);
    let laser = of("laser.f") * 473_612_353_772_100.0 / graph.number(b0);
    assert!((laser - 1.0).abs() < 1e-6, "b_0 rises with the laser frequency: {laser}");
    // The cosine of the beam is quadratic in its angles: trials see <θ²> = θ₀² + u², which first order cannot.
    let u = standard_uncertainty(graph, &derivatives);
    let found = propagate_distributions(graph, &[b0], 50_000).expect("runs").summary(0, 0.95);
    let shift = -graph.number(b0) * 2.5e-5 * 2.5e-5;
    assert!((found.standard_uncertainty / u - 1.0).abs() < 0.02, "{found:?} against {u}");
    assert!((found.estimate - graph.number(b0) - shift).abs() < 5.0 * u / 50_000f64.sqrt(), "{found:?}, shift {shift}");
}

/// JCGM 100:2008, 5.2.2: ten resistors from one reference, fully correlated: 1 Ω, not 0.32 Ω.
#[test]
fn ten_resistors_share_one_reference() {
    let b = Builder::default();
    let reference = input(&b, "R_s", "Ω", 1000.0, normal(0.1), f64::INFINITY);
    let sum = (0..10).map(|_| reference.alias()).reduce(|sum, next| sum + next).expect("ten");
    let id = sum.id;
    let (graph, _) = b.finish();
    assert!((standard_uncertainty(&graph, &sensitivities(&graph, id)) - 1.0).abs() < 1e-12);
}

/// JCGM 100:2008, G.4.1: u_c 1.03 %, ν_eff 19.0, U_95 2.2 %.
#[test]
fn effective_degrees_of_freedom_of_the_guide() {
    let b = Builder::default();
    let parts =
        [(0.25, 9.0), (0.57, 4.0), (0.82, 14.0)].map(|(u, nu)| input(&b, &format!("x{nu}"), "1", 1.0, normal(u), nu));
    let id = (parts[0] * parts[1] * parts[2]).id;
    let (graph, _) = b.finish();
    let found = coverage(&graph, &sensitivities(&graph, id), Settings::new(0.95, DegreesOfFreedomRule::Truncated));
    assert!((found.standard_uncertainty - 1.03).abs() < 0.005, "{found:?}");
    assert!((found.effective_degrees_of_freedom - 19.0).abs() < 0.05, "{found:?}");
    assert!((found.expanded_uncertainty - 2.2).abs() < 0.05, "{found:?}");
    // Truncated, as the guide allows: 18.999 counts as 18.
    assert_eq!(found.degrees_of_freedom, 18.0);
}

/// JCGM 100:2008, H.1: end gauge. DIFFERENCE: the guide prints U_99 = 93 nm from the rounded u_c = 32 nm; unrounded it is 92.5 nm.
#[test]
fn the_end_gauge_of_the_guide() {
    let b = Builder::default();
    let nm = 1e-9;
    let l_s = input(&b, "l_S", "m", 50.000_623e-3, normal(25.0 * nm), 18.0);
    let d = input(&b, "d", "m", 215.0 * nm, normal(13.0 * nm / 5f64.sqrt()), 24.0);
    let d1 = input(&b, "d_1", "m", 0.0, normal(3.890_3 * nm), 5.0);
    let d2 = input(&b, "d_2", "m", 0.0, normal(20.0 / 3.0 * nm), 8.0);
    let alpha = input(&b, "alpha_S", "/K", 11.5e-6, Distribution::Rectangular { half_width: 2e-6 }, f64::INFINITY);
    let theta = input(&b, "theta", "K", -0.1, normal(0.406_201_920_231_8), f64::INFINITY);
    let d_alpha = input(&b, "d_alpha", "/K", 0.0, Distribution::Rectangular { half_width: 1e-6 }, 50.0);
    let d_theta = input(&b, "d_theta", "K", 0.0, Distribution::Rectangular { half_width: 0.05 }, 2.0);
    let nominal = exact(&b, 50.0, "mm");
    let l = l_s + d + d1 + d2 - nominal * (d_alpha * theta + alpha * d_theta);
    let id = l.id;
    let (graph, _) = b.finish();
    let found = coverage(&graph, &sensitivities(&graph, id), Settings::new(0.99, DegreesOfFreedomRule::Truncated));
    assert!((graph.number(id) * 1e3 - 50.000_838).abs() < 5e-7);
    assert!(((found.standard_uncertainty / nm).powi(2) - 1002.0).abs() < 0.5, "{found:?}");
    assert!((found.effective_degrees_of_freedom - 16.7).abs() < 0.05, "{found:?}");
    assert_eq!(found.degrees_of_freedom, 16.0);
    assert!((found.factor - 2.92).abs() < 0.005, "{found:?}");
    assert!((found.expanded_uncertainty / nm - 92.466).abs() < 0.01, "{found:?}");
    let lines = budget(&graph, id).lines;
    // Table H.1: 25, 16.6, 2.9 nm and the three parts of d.
    assert_eq!((lines[0].path.as_str(), lines[1].path.as_str()), ("l_S", "d_theta"));
    assert!((lines[1].contribution / nm - 16.6).abs() < 0.05);
    assert!((lines.iter().map(|line| line.share).sum::<f64>() - 1.0).abs() < 1e-12);
    // θ and α_S have no first-order effect where δα and δθ are zero.
    assert!(lines.iter().all(|line| line.path != "theta" && line.path != "alpha_S"));
}

#[test]
fn two_results_that_share_an_input_are_correlated() {
    let b = Builder::default();
    let (shared, own_a, own_b) = (
        input(&b, "shared", "1", 1.0, normal(3.0), f64::INFINITY),
        input(&b, "a", "1", 1.0, normal(4.0), f64::INFINITY),
        input(&b, "b", "1", 1.0, normal(4.0), f64::INFINITY),
    );
    let (y, z) = ((shared + own_a).id, (shared * 2.0 - own_b).id);
    let (graph, _) = b.finish();
    let (of_y, of_z) = (sensitivities(&graph, y), sensitivities(&graph, z));
    assert!((covariance(&graph, &of_y, &of_z) - 18.0).abs() < 1e-12);
    assert!((correlation(&graph, &of_y, &of_z) - 18.0 / (5.0 * 52f64.sqrt())).abs() < 1e-12);
    let trials = propagate_distributions(&graph, &[y, z], 100_000).expect("runs").values;
    let mean = |list: &[f64]| list.iter().sum::<f64>() / list.len() as f64;
    let (my, mz) = (mean(&trials[0]), mean(&trials[1]));
    let joint: f64 = trials[0].iter().zip(&trials[1]).map(|(a, b)| (a - my) * (b - mz)).sum::<f64>() / 1e5;
    assert!((joint - 18.0).abs() < 0.5, "covariance of the trials {joint}");
}

#[test]
fn trials_have_the_same_bits_on_any_number_of_threads_and_ignore_new_inputs() {
    let make = |extra: bool| {
        let b = Builder::default();
        if extra {
            input(&b, "unrelated", "1", 5.0, normal(1.0), f64::INFINITY);
        }
        let x = input(&b, "x", "1", 1.0, normal(0.1), f64::INFINITY);
        let w = input(&b, "w", "1", 2.0, Distribution::Triangular { half_width: 0.3 }, f64::INFINITY);
        let t = input(&b, "t", "1", 3.0, Distribution::StudentT { scale: 0.2 }, 7.0);
        let y = (x * w).exponential() / (1.0 + t.squared());
        let id = y.id;
        (b.finish().0, id)
    };
    let bits = |extra: bool, threads: usize| -> Vec<u64> {
        let (graph, id) = make(extra);
        let pool = rayon::ThreadPoolBuilder::new().num_threads(threads).build().expect("pool");
        let trials = pool.install(|| propagate_distributions(&graph, &[id], 5000).expect("runs"));
        trials.values[0].iter().map(|value| value.to_bits()).collect()
    };
    let one = bits(false, 1);
    assert!(one == bits(false, 2) && one == bits(false, 7));
    assert!(one == bits(true, 2), "a new input moved other draws");
}

#[test]
fn a_t_input_has_the_variance_of_its_distribution_in_trials() {
    let b = Builder::default();
    let id = input(&b, "t", "1", 0.0, Distribution::StudentT { scale: 1.0 }, 8.0).id;
    let (graph, _) = b.finish();
    let found = propagate_distributions(&graph, &[id], 200_000).expect("runs").summary(0, 0.95);
    assert!((found.standard_uncertainty - (8.0f64 / 6.0).sqrt()).abs() < 0.01, "{found:?}");
    assert!(
        (found.symmetric.1 - 2.306_004_135).abs() < 0.03,
        "t quantile at 97.5 % for 8 degrees of freedom: {found:?}"
    );
}

fn problems(make: impl for<'g> Fn(&'g Builder) -> Quantity<'g>) -> Vec<Problem> {
    let b = Builder::default();
    let made = make(&b);
    assert!(made.number().is_nan(), "what cannot be built is not a number");
    b.take_problems()
}

#[test]
fn sums_of_unlike_quantities_cannot_be_built() {
    fn mass<'g>(b: &'g Builder, kind: Kind) -> Quantity<'g> {
        exact(b, 1.0, "kg").as_kind(kind)
    }
    let code = |problems: Vec<Problem>| problems.first().map(|problem| problem.code);
    assert_eq!(code(problems(|b| exact(b, 1.0, "kg") + exact(b, 1.0, "K"))), Some(Code::DimensionMismatch));
    assert_eq!(code(problems(|b| mass(b, Kind::Mass) + mass(b, Kind::ConventionalMass))), Some(Code::KindMismatch));
    fn kelvin(b: &Builder) -> Quantity<'_> {
        exact(b, 293.0, "K").as_kind(Kind::Temperature)
    }
    assert_eq!(code(problems(|b| kelvin(b) + kelvin(b))), Some(Code::KindMismatch));
    fn held(b: &Builder, state: State) -> Quantity<'_> {
        mass(b, Kind::Mass).in_state(Some(state))
    }
    assert_eq!(code(problems(|b| held(b, State::Air) - held(b, State::Vacuum))), Some(Code::StateMismatch));
    fn on<'g>(b: &'g Builder, basis: &str) -> Quantity<'g> {
        mass(b, Kind::Mass).on_basis(Some(basis.into()))
    }
    assert_eq!(code(problems(|b| on(b, "consensus_1") - on(b, "consensus_2"))), Some(Code::BasisMismatch));
    assert_eq!(code(problems(|b| b.column(vec![1.0, 2.0]) + b.column(vec![1.0]))), Some(Code::DesignIncomplete));
    assert_eq!(code(problems(|b| exact(b, 1.0, "kg").exponential())), Some(Code::DimensionMismatch));
    assert_eq!(code(problems(|b| exact(b, 1.0, "kg").square_root())), Some(Code::DimensionMismatch));
}

/// One step of a random graph: which operation, on which earlier nodes.
fn grow<'g>(nodes: &mut Vec<Quantity<'g>>, (op, a, b): (u8, usize, usize)) {
    let (x, y) = (nodes[a % nodes.len()], nodes[b % nodes.len()]);
    let bounded = |q: Quantity<'g>| q / (1.0 + q.squared());
    let made = match op % 16 {
        0 => x + y,
        1 => x - y,
        2 => bounded(x) * y,
        3 => x / (2.0 + y.squared()),
        4 => -x,
        5 => (1.0 + x.squared()).square_root(),
        6 => bounded(x).exponential(),
        7 => (1.5 + bounded(x)).logarithm(),
        8 => x.sine(),
        9 => x.cosine(),
        10 => bounded(x).tangent(),
        11 => (bounded(x) * 0.9).arc_sine(),
        12 => (bounded(x) * 0.9).arc_cosine(),
        13 => x.arc_tangent(),
        14 => bounded(x).power(3),
        _ => {
            // Through columns and back: stack, mixing, a row, a sum.
            let stack = Quantity::stack(&[x, y, x]).expect("three");
            let mixed = (stack * stack).mix(vec![vec![(0, 0.25), (1, 0.75)], vec![(2, 1.0)]]);
            bounded(mixed.row(0)) + bounded(mixed.sum())
        }
    };
    nodes.push(made);
}

proptest! {
    #![proptest_config(ProptestConfig { cases: 64, ..ProptestConfig::default() })]
    #[test]
    fn reverse_sweeps_agree_with_differences(
        steps in prop::collection::vec((any::<u8>(), 0usize..40, 0usize..40), 1..25),
        values in prop::collection::vec(-1.5f64..1.5, 3),
    ) {
        let b = Builder::default();
        let mut nodes: Vec<Quantity<'_>> =
            values.iter().enumerate().map(|(i, v)| input(&b, &format!("x{i}"), "1", *v, normal(1e-5), f64::INFINITY)).collect();
        steps.into_iter().for_each(|step| grow(&mut nodes, step));
        let id = nodes.last().expect("grown").id;
        let (graph, _) = b.finish();
        let derivatives = sensitivities(&graph, id);
        for index in 0..3 {
            let node = graph.find(&format!("x{index}")).expect("input");
            let centre = graph.number(node);
            let at = |value: f64| {
                let moved = BTreeMap::from([(node, Value::Scalar(value))]);
                evaluate_displaced(&graph, &moved, id).expect("evaluates")[id.index()].number()
            };
            let difference = (at(centre + 1e-5) - at(centre - 1e-5)) / 2e-5;
            let found = derivatives.inputs.get(&(index as u32)).map_or(0.0, |weights| weights[0]);
            prop_assert!((found - difference).abs() < 1e-4 * (1.0 + difference.abs()), "x{index}: {found} against {difference}");
        }
    }

    #[test]
    fn first_order_is_exact_for_linear_models(weights in prop::collection::vec(-3.0f64..3.0, 4), seed in 0u32..1000) {
        let b = Builder::default();
        let inputs: Vec<Quantity<'_>> =
            (0..4).map(|i| input(&b, &format!("s{seed}x{i}"), "1", 1.0, normal(0.5 + f64::from(i)), f64::INFINITY)).collect();
        let y = inputs.iter().zip(&weights).map(|(x, w)| *x * *w).reduce(|sum, next| sum + next).expect("four");
        let id = y.id;
        let (graph, _) = b.finish();
        let u = standard_uncertainty(&graph, &sensitivities(&graph, id));
        let found = propagate_distributions(&graph, &[id], 20_000).expect("runs").summary(0, 0.95);
        prop_assert!((found.standard_uncertainty - u).abs() < 0.03 * u + 1e-12, "{found:?} against {u}");
    }
}
