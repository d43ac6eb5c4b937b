//! What a report shows of a two-mode balance: corrections, profile of the geometric factor, sequence of currents.

use crate::block::Engine;
use crate::block::determination::Determination;
use crate::block::moving_phase::MovingPhase;
use crate::block::weighing_phase::WeighingPhase;
use crate::graph::{NodeId, Op, sensitivities, standard_uncertainty};
use crate::quantity::Marker;
use crate::report::Markup;
use crate::report::chart::{Axis, Chart, Mean, Series, Style, figure};
use crate::report::figures::significant;
use crate::report::table::{Table, head};

const WIDTH_MM: f64 = 150.0;
/// Bins of position that gates are averaged in.
const BINS: usize = 40;

fn marker(engine: &Engine) -> char {
    if engine.laboratory.style.marker == Marker::Comma { ',' } else { '.' }
}

fn value_and_u(engine: &Engine, path: &str) -> Option<(f64, f64)> {
    let graph = engine.graph();
    let id = graph.find(path)?;
    Some((graph.number(id), standard_uncertainty(&graph, &sensitivities(&graph, id))))
}

/// Every correction of a determination with its sign, relative and in micrograms, and what they come to together.
pub fn corrections_table(engine: &Engine, name: &str) -> Option<Markup> {
    let found = engine.found::<Determination>(name)?;
    let style = engine.laboratory.style;
    let relative = |symbol_text: &str| head(symbol_text, "10⁻⁹");
    let header =
        vec!["Correction for".into(), relative("δ"), relative("u(δ)"), head("δ m", "µg"), head("u(δ m)", "µg")];
    let mut table = Table::new(format!("Corrections in {name}, to be added to the mass without them"), header);
    table.columns = vec!["1fr", "auto", "auto", "auto", "auto"];
    table.align = vec!["left", "right", "right", "right", "right"];
    let digits = |value: f64| significant(style, value, 3);
    let mut total = 0.0;
    for correction in &found.corrections {
        let path = format!("{name}.correction.{correction}");
        let (delta, u) = value_and_u(engine, &path)?;
        let (mass, u_mass) = value_and_u(engine, &format!("{name}.correction_mass.{correction}"))?;
        let label =
            engine.graph().find(&path).and_then(|id| engine.graph().node(id).name.clone()).map(|name| name.label);
        let label = label.unwrap_or_default();
        let words = label.strip_prefix("correction for ").unwrap_or(&label).to_string();
        total += delta;
        table.rows.push(vec![
            words.into(),
            digits(delta * 1e9).into(),
            digits(u * 1e9).into(),
            digits(mass * 1e9).into(),
            digits(u_mass * 1e9).into(),
        ]);
    }
    let mass = value_and_u(engine, &format!("{name}.mass"))?.0;
    table.closing.push(vec![
        "all together, to first order".into(),
        digits(total * 1e9).into(),
        "".into(),
        digits(total * mass * 1e9).into(),
        "".into(),
    ]);
    Some(table.markup())
}

/// The estimator behind a coefficient.
fn estimator_of(engine: &Engine, coefficient: NodeId) -> Option<usize> {
    match engine.graph().node(coefficient).op {
        Op::Output(estimator, _) => Some(estimator.index()),
        _ => None,
    }
}

/// Values averaged in bins of position: middle, mean, standard deviation of the mean.
fn binned(positions: &[f64], values: &[f64]) -> Vec<(f64, f64, Option<f64>)> {
    let low = positions.iter().copied().fold(f64::INFINITY, f64::min);
    let high = positions.iter().copied().fold(f64::NEG_INFINITY, f64::max);
    let width = (high - low) / BINS as f64;
    if width.is_nan() || width <= 0.0 {
        return Vec::new();
    }
    let bin = |z: f64| (((z - low) / width) as usize).min(BINS - 1);
    let of = |index: usize| {
        let rows: Vec<f64> =
            positions.iter().zip(values).filter(|(z, _)| bin(**z) == index).map(|(_, value)| *value).collect();
        let mean = crate::numeric::sum::mean(&rows)?;
        let deviation = crate::numeric::sum::experimental_standard_deviation(&rows);
        let spread = deviation.map(|deviation| deviation / (rows.len() as f64).sqrt());
        Some((low + (index as f64 + 0.5) * width, mean, spread))
    };
    (0..BINS).filter_map(of).collect()
}

/// The profile of the geometric factor about the weighing position, and the residuals of its fit.
pub fn profile_charts(engine: &Engine, name: &str) -> Option<Markup> {
    let found = engine.found::<MovingPhase>(name)?;
    let (residuals, voltages, coefficients) = {
        let graph = engine.graph();
        let estimator = &graph.estimators[estimator_of(engine, *found.coefficients.get(1)?)?];
        let voltage = graph.value(*estimator.columns.get(1)?).rows().to_vec();
        let b: Vec<f64> = found.coefficients.iter().map(|id| graph.number(*id)).collect();
        (estimator.estimate.residuals.clone(), voltage, b)
    };
    let relative: Vec<f64> = residuals.iter().zip(&voltages).map(|(r, u)| r / u * 1e9).collect();
    let millimetres: Vec<f64> = found.offsets().iter().map(|z| z * 1e3).collect();
    let shape = |z: f64| {
        let power = |k: usize| crate::numeric::elementary::powi(z, k as i32);
        let departure: f64 = coefficients.iter().enumerate().skip(1).map(|(k, b)| b * power(k)).sum();
        departure / coefficients[0] * 1e6
    };
    let low = found.offsets().iter().copied().fold(f64::INFINITY, f64::min);
    let high = found.offsets().iter().copied().fold(f64::NEG_INFINITY, f64::max);
    let along = (0..=100).map(|step| low + (high - low) * f64::from(step) / 100.0);
    let curve = along.map(|z| (z * 1e3, shape(z), None)).collect();
    let (factor, _) = value_and_u(engine, &format!("{name}.geometric_factor"))?;
    let profile = Chart {
        title: format!(
            "{name}: profile of the geometric factor, relative to its value {} T m at the weighing position",
            significant(engine.laboratory.style, factor, 8)
        ),
        x_label: "ζ/mm".into(),
        y_label: "(_Bl_/_b_₀ − 1) × 10⁶".into(),
        series: vec![Series {
            name: format!("fit of order {}", coefficients.len() - 1),
            points: curve,
            style: Style::Line,
        }],
        decimal_marker: marker(engine),
        ..Chart::default()
    };
    let remaining = Chart {
        title: format!(
            "{name}: residuals of the profile fit, averaged in {BINS} bins of position, with standard deviations of the means"
        ),
        x_label: "ζ/mm".into(),
        y_label: "residual × 10⁹".into(),
        series: vec![Series {
            name: "residuals".into(),
            points: binned(&millimetres, &relative),
            style: Style::Points,
        }],
        lines: vec![Mean { y: 0.0, half_width: None, label: "fit".into() }],
        decimal_marker: marker(engine),
        ..Chart::default()
    };
    let mut made = figure(&profile, WIDTH_MM, 56.0);
    made.push_code("\n\n").push(&figure(&remaining, WIDTH_MM, 56.0)).push_code("\n\n");
    Some(made)
}

/// The current of the coil state by state, and the force over gravitational acceleration with the artefact off and on.
pub fn current_charts(engine: &Engine, name: &str) -> Option<Markup> {
    let found = engine.found::<WeighingPhase>(name)?;
    let current = engine.graph().value(found.current).rows().to_vec();
    let mean = |values: &[f64], rows: &[usize]| {
        let picked: Vec<f64> = rows.iter().filter_map(|row| values.get(*row)).copied().collect();
        crate::numeric::sum::mean(&picked)
    };
    let of_state = |rows: &Vec<usize>| Some((mean(&found.times, rows)?, mean(&current, rows)? * 1e3));
    let points: Vec<(f64, f64)> = found.rows.iter().filter_map(of_state).collect();
    let chart = |title: String, y_label: &str, series: Vec<Series>| Chart {
        title,
        x_label: "time (UTC)".into(),
        y_label: y_label.into(),
        x_axis: Axis::Time,
        series,
        decimal_marker: marker(engine),
        ..Chart::default()
    };
    let sequence = Series {
        name: String::new(),
        points: points.iter().map(|(time, value)| (*time, *value, None)).collect(),
        style: Style::Points,
    };
    let first = chart(format!("{name}: current of the coil, state by state"), "_I_/mA", vec![sequence]);
    let mut made = figure(&first, WIDTH_MM, 48.0);
    made.push_code("\n\n");
    // Departures from the mean of each kind of state show drift that the sequence hides.
    let side = |on: bool, words: &str| -> Option<Series> {
        let chosen: Vec<(f64, f64)> = points.iter().copied().filter(|(_, value)| (*value < 0.0) == on).collect();
        let mean = crate::numeric::sum::mean(&chosen.iter().map(|(_, value)| *value).collect::<Vec<_>>())?;
        let points = chosen.iter().map(|(time, value)| (*time, (value - mean) * 1e6, None)).collect();
        Some(Series { name: words.into(), points, style: Style::Points })
    };
    let sides: Vec<Series> = [side(false, "artefact off"), side(true, "artefact on")].into_iter().flatten().collect();
    let second = chart(format!("{name}: current of each kind of state, less its mean"), "Δ_I_/nA", sides);
    made.push(&figure(&second, WIDTH_MM, 48.0)).push_code("\n\n");
    Some(made)
}
