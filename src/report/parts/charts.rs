//! Charts: differences of a comparison, results of a combination, conditions over time.

use crate::block::Engine;
use crate::block::combining::Combined;
use crate::block::weighing::Comparison;
use crate::graph::NodeId;
use crate::quantity::{Marker, choose_unit};
use crate::report::Markup;
use crate::report::chart::{Axis, Chart, Mean, Series, Style, figure};
use crate::report::figures::Figure;

pub(super) const WIDTH_MM: f64 = 150.0;
/// Two charts beside each other.
const HALF_WIDTH_MM: f64 = 76.0;

/// The chart that suits a block: of a comparison, of logged conditions, or of a combined result.
pub fn chart_of(engine: &Engine, name: &str) -> Option<Markup> {
    if let Some(comparison) = engine.weighing(name) {
        return Some(figure(&differences(engine, name, &comparison), WIDTH_MM, 62.0));
    }
    if engine.conditions(name).is_some() {
        return conditions(engine, name);
    }
    if let Some(chart) = super::campaign::determinations_chart(engine, name) {
        return Some(chart);
    }
    combined(engine, name).map(|chart| figure(&chart, WIDTH_MM, 58.0))
}

pub(super) fn marker(engine: &Engine) -> char {
    if engine.laboratory.style.marker == Marker::Comma { ',' } else { '.' }
}

/// Differences of the cycles over time, series means with their spread, and the mean with its standard uncertainty.
fn differences(engine: &Engine, name: &str, comparison: &Comparison) -> Chart {
    let micrograms = |value: f64| value * 1e9;
    let points = |excluded: bool| -> Vec<(f64, f64, Option<f64>)> {
        let kept = comparison.cycles.iter().filter(|cycle| cycle.excluded == excluded);
        kept.filter_map(|cycle| Some((cycle.start, micrograms(*cycle.differences.first()?), None))).collect()
    };
    let mut series = vec![Series { name: "cycles".into(), points: points(false), style: Style::Points }];
    let means = series_means(engine, name, comparison);
    if means.len() > 1 {
        series.push(Series {
            name: "series means with standard deviation".into(),
            points: means,
            style: Style::Points,
        });
    }
    let left_out = points(true);
    if !left_out.is_empty() {
        series.push(Series { name: "left out".into(), points: left_out, style: Style::Points });
    }
    let lines = mean_and_scatter(engine, name).map(|(mean, scatter)| Mean {
        y: micrograms(mean),
        half_width: Some(micrograms(scatter)),
        label: "mean and its Type A standard uncertainty".into(),
    });
    Chart {
        title: format!("{name}: differences {} − {}, corrected for buoyancy", comparison.b.join(", "), comparison.a),
        x_label: "time (UTC)".into(),
        y_label: "_d_/µg".into(),
        x_axis: Axis::Time,
        series,
        lines: lines.into_iter().collect(),
        decimal_marker: marker(engine),
        ..Chart::default()
    }
}

/// Mean difference and its own scatter.
fn mean_and_scatter(engine: &Engine, name: &str) -> Option<(f64, f64)> {
    let graph = engine.graph();
    let id = graph.find(&format!("{name}.corrected_difference"))?;
    let crate::graph::Op::Output(estimator, _) = graph.node(id).op else { return None };
    let own = graph.estimators[estimator.index()].estimate.own_covariance.first()?.first().copied()?;
    Some((graph.number(id), own.max(0.0).sqrt()))
}

fn series_means(engine: &Engine, name: &str, comparison: &Comparison) -> Vec<(f64, f64, Option<f64>)> {
    let graph = engine.graph();
    let mut series: Vec<u32> = comparison.cycles.iter().map(|cycle| cycle.series).collect();
    series.dedup();
    let mean = |number: &u32| {
        let id = graph.find(&format!("{name}.series.{number}"))?;
        let times: Vec<f64> = comparison
            .cycles
            .iter()
            .filter(|cycle| cycle.series == *number && !cycle.excluded)
            .map(|cycle| cycle.start)
            .collect();
        let middle = times.iter().sum::<f64>() / times.len().max(1) as f64;
        let crate::graph::Op::Output(estimator, output) = graph.node(id).op else { return None };
        let own = graph.estimators[estimator.index()].estimate.own_covariance[output as usize][output as usize];
        Some((middle, graph.number(id) * 1e9, Some(own.max(0.0).sqrt() * 1e9)))
    };
    series.iter().filter_map(mean).collect()
}

fn conditions(engine: &Engine, name: &str) -> Option<Markup> {
    let logged = engine.conditions(name)?;
    let density = ("air density", "ρ_a", crate::method::unit("kg/m3"), logged.density);
    let mut made = Markup::code("#grid(columns: (1fr, 1fr), column-gutter: 6mm, ");
    for (words, symbol, unit, id) in logged.columns.iter().cloned().chain([density]) {
        let rows = engine.graph().value(id).rows().to_vec();
        let points = logged.times.iter().zip(&rows).map(|(time, value)| (*time, unit.from_si(*value), None)).collect();
        let (letter, below) = symbol.split_once('_').unwrap_or((symbol, ""));
        let chart = Chart {
            title: format!("{name}: {words} over the log"),
            x_label: "time (UTC)".into(),
            y_label: format!("_{letter}_{}/{}", subscript(below), solidus(&engine.laboratory.style.unit(&unit))),
            x_axis: Axis::Time,
            series: vec![Series { name: String::new(), points, style: Style::Line }],
            decimal_marker: marker(engine),
            ..Chart::default()
        };
        made.push_content(&figure(&chart, HALF_WIDTH_MM, 42.0)).push_code(", ");
    }
    made.push_code(");\n\n");
    Some(made)
}

/// A unit as it stands behind a solidus: a product in brackets.
pub(super) fn solidus(unit: &str) -> String {
    if unit.contains([' ', '\u{a0}']) { format!("({unit})") } else { unit.into() }
}

/// A subscript of one letter as a character of its own.
fn subscript(letters: &str) -> &'static str {
    match letters {
        "a" => "ₐ",
        "r" => "ᵣ",
        _ => "",
    }
}

/// Results of a combination with their standard uncertainties, and the combined result.
fn combined(engine: &Engine, name: &str) -> Option<Chart> {
    let found = engine.found::<Combined>(name)?;
    let kept = found.members.iter().map(|member| (&member.path, member.id));
    let left_out = found.excluded.iter().map(|(id, one)| (&one.path, *id));
    let (paths, ids): (Vec<&String>, Vec<NodeId>) = kept.chain(left_out).unzip();
    let figures: Vec<Figure> = ids.iter().map(|id| Figure::of(engine, *id)).collect::<Option<_>>()?;
    let own = Figure::of(engine, found.result)?;
    let unit = choose_unit(own.coverage.standard_uncertainty, &own.unit);
    let centre = own.value;
    let points = figures.iter().enumerate().map(|(index, figure)| {
        (
            index as f64,
            unit.difference_from_si(figure.value - centre),
            Some(unit.difference_from_si(figure.coverage.standard_uncertainty)),
        )
    });
    let mut points: Vec<(f64, f64, Option<f64>)> = points.collect();
    let left_out = points.split_off(found.members.len());
    let mut series = vec![Series { name: "results".into(), points, style: Style::Points }];
    if !left_out.is_empty() {
        series.push(Series { name: "left out".into(), points: left_out, style: Style::Points });
    }
    Some(Chart {
        title: format!("{name}: results combined, as departures from the combined result, with standard uncertainties"),
        x_label: "result".into(),
        y_label: format!("departure/{}", engine.laboratory.style.unit(&unit)),
        series,
        lines: vec![Mean {
            y: 0.0,
            half_width: Some(unit.difference_from_si(own.coverage.standard_uncertainty)),
            label: "combined result and its standard uncertainty".into(),
        }],
        x_ticks: paths.into_iter().cloned().collect(),
        decimal_marker: marker(engine),
        ..Chart::default()
    })
}
