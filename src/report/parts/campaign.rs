//! What a report shows of a campaign: its determinations, their chart, the budget in relative terms.

use crate::block::Engine;
use crate::block::determination::Determination;
use crate::block::realization::Campaign;
use crate::graph::{NodeId, Sensitivities, Source, budget, sensitivities};
use crate::numeric::least_squares::fit;
use crate::quantity::Marker;
use crate::report::Markup;
use crate::report::chart::{Axis, Chart, Mean, Series, Style, figure};
use crate::report::figures::{Figure, fixed, freedom, significant};
use crate::report::table::{Cell, Table, head, symbol};
use chrono::DateTime;

/// Micrograms in a kilogram.
const MICROGRAMS: f64 = 1e9;
/// Shares below this part of the variance are gathered in one line.
const SMALLEST_SHARE: f64 = 1e-4;

/// The nominal mass of the artefact of a campaign, as typed and in kg.
fn nominal(engine: &Engine, name: &str) -> (String, f64) {
    let artefact = engine.blocks().get(name).and_then(|block| block.fields().text("artefact"));
    let weight = artefact.and_then(|artefact| crate::block::weight::Weight::find(engine, &artefact));
    weight.map_or_else(|| ("nominal".into(), f64::NAN), |weight| weight.nominal_text())
}

fn moment(seconds: f64) -> String {
    DateTime::from_timestamp(seconds as i64, 0).map_or_else(String::new, |at| at.format("%Y-%m-%d %H:%M").to_string())
}

/// Every determination with its uncertainties, whether used or not; below, both results and what was decided.
pub fn determinations_table(engine: &Engine, name: &str) -> Option<Markup> {
    let campaign = engine.found::<Campaign>(name)?;
    let style = engine.laboratory.style;
    let (nominal_text, nominal) = nominal(engine, name);
    let header = vec![
        "Determination".into(),
        "Start (UTC)".into(),
        "End (UTC)".into(),
        "Performed by".into(),
        head("Δm", "µg"),
        head("u_own", "µg"),
        head("u", "µg"),
        head("w", ""),
        "Status".into(),
    ];
    let caption = format!(
        "Determinations: departure Δm from {}, own standard uncertainty (from what a determination shares with no other), whole standard uncertainty, weight",
        crate::report::prose_text::dress(&nominal_text, style)
    );
    let mut table = Table::new(caption, header);
    table.columns = vec!["auto", "auto", "auto", "1fr", "auto", "auto", "auto", "auto", "auto"];
    table.align = vec!["left", "left", "left", "left", "right", "right", "right", "right", "left"];
    let micrograms = |value: f64, decimals: i32| fixed(style, value * MICROGRAMS, decimals);
    for run in &campaign.determinations {
        let status = if run.excluded.is_none() { "used" } else { "not used" };
        table.rows.push(vec![
            run.path.split('.').next().unwrap_or_default().into(),
            moment(run.at.start).into(),
            if run.at.end > run.at.start { moment(run.at.end) } else { "—".into() }.into(),
            run.performed_by.clone().into(),
            micrograms(run.value - nominal, 1).into(),
            micrograms(run.own_uncertainty, 1).into(),
            micrograms(run.standard_uncertainty, 1).into(),
            fixed(style, run.weight, 3).into(),
            status.into(),
        ]);
    }
    table.closing = results_below(engine, name, nominal);
    let mut made = table.markup();
    for run in &campaign.determinations {
        if let Some((rule, reason)) = &run.excluded {
            let name = run.path.split('.').next().unwrap_or_default();
            let words =
                format!("{name} is not used. Rule {} Reason: {}.", sentence(rule), reason.trim_end_matches('.'));
            made.push_code("- ").push_text(&words).push_code("\n");
        }
    }
    for (what, decided) in &campaign.decisions {
        made.push_code("- ").push_text(&format!("{what}: {decided}.")).push_code("\n");
    }
    made.push_code("\n");
    Some(made)
}

fn sentence(text: &str) -> String {
    let text = text.trim();
    if text.ends_with('.') { text.into() } else { format!("{text}.") }
}

fn results_below(engine: &Engine, name: &str, nominal: f64) -> Vec<Vec<Cell>> {
    let style = engine.laboratory.style;
    let row = |words: &str, path: &str| -> Option<Vec<Cell>> {
        let id = engine.graph().find(&format!("{name}.{path}"))?;
        let figure = Figure::of(engine, id)?;
        let u = figure.coverage.standard_uncertainty;
        let mut cells: Vec<Cell> = vec![words.into(), "".into(), "".into(), "".into()];
        cells.push(fixed(style, (figure.value - nominal) * MICROGRAMS, 1).into());
        cells.push("".into());
        cells.push(fixed(style, u * MICROGRAMS, 1).into());
        cells.extend(["".into(), "".into()]);
        Some(cells)
    };
    [row("mean", "mass"), row("mean of all", "with_excluded.mass")].into_iter().flatten().collect()
}

/// The determinations with their own uncertainties over time, those left out apart, and the mean.
pub fn determinations_chart(engine: &Engine, name: &str) -> Option<Markup> {
    let campaign = engine.found::<Campaign>(name)?;
    let (nominal_text, nominal) = nominal(engine, name);
    let points = |excluded: bool| -> Vec<(f64, f64, Option<f64>)> {
        let chosen = campaign.determinations.iter().filter(|run| run.excluded.is_some() == excluded);
        chosen
            .map(|run| (run.at.start, (run.value - nominal) * MICROGRAMS, Some(run.own_uncertainty * MICROGRAMS)))
            .collect()
    };
    let mut series = vec![Series {
        name: "determinations, with own standard uncertainty".into(),
        points: points(false),
        style: Style::Points,
    }];
    let left_out = points(true);
    if !left_out.is_empty() {
        series.push(Series { name: "not used".into(), points: left_out, style: Style::Points });
    }
    let mean = engine.graph().find(&format!("{name}.mass")).and_then(|id| Figure::of(engine, id))?;
    let chart = Chart {
        title: format!(
            "{name}: determinations as departures from {nominal_text}, their mean and its standard uncertainty"
        ),
        x_label: "time (UTC)".into(),
        y_label: "Δ_m_/µg".into(),
        x_axis: Axis::Time,
        series,
        lines: vec![Mean {
            y: (mean.value - nominal) * MICROGRAMS,
            half_width: Some(mean.coverage.standard_uncertainty * MICROGRAMS),
            label: "mean and its standard uncertainty".into(),
        }],
        decimal_marker: if engine.laboratory.style.marker == Marker::Comma { ',' } else { '.' },
        ..Chart::default()
    };
    Some(figure(&chart, 150.0, 62.0))
}

/// How many determinations a source of uncertainty enters.
fn users(sweeps: &[Sensitivities], source: Source) -> usize {
    let uses = |sweep: &&Sensitivities| match source {
        Source::Input(number) => sweep.inputs.contains_key(&number),
        Source::Estimator(number) => sweep.estimators.contains_key(&number),
    };
    sweeps.iter().filter(uses).count()
}

/// The budget of a campaign's mass in relative terms and in micrograms; each line says whether all determinations
/// share it or each has its own.
pub fn relative_budget(engine: &Engine, name: &str, result: NodeId) -> Option<Markup> {
    let campaign = engine.found::<Campaign>(name)?;
    let figure = Figure::of(engine, result)?;
    let style = engine.laboratory.style;
    let made = budget(&engine.graph(), result);
    let header = vec![
        "Quantity".into(),
        head("x_i", ""),
        "Type".into(),
        head("ν_i", ""),
        Cell::Markup({
            let mut made = symbol("u_i");
            made.push_text("(").push(&symbol("m")).push_text(")/µg");
            made
        }),
        Cell::Markup({
            let mut made = symbol("u_i");
            made.push_text("(").push(&symbol("m")).push_text(")/").push(&symbol("m")).push_text(" × 10⁹");
            made
        }),
        "Share/%".into(),
        "Enters".into(),
    ];
    let mut table =
        Table::new(format!("Uncertainty budget of the {}, in relative terms and in micrograms", figure.label), header);
    table.helper = "budget-table";
    table.columns = vec!["1fr", "auto", "auto", "auto", "auto", "auto", "auto", "auto"];
    table.align = vec!["left", "left", "left", "right", "right", "right", "right", "left"];
    let row =
        |label: String, symbol_text: &str, kind: String, nu: String, u: f64, share: f64, enters: String| -> Vec<Cell> {
            vec![
                label.into(),
                Cell::Markup(symbol(symbol_text)),
                kind.into(),
                nu.into(),
                significant(style, u * MICROGRAMS, 3).into(),
                significant(style, u / figure.value * 1e9, 3).into(),
                fixed(style, share * 100.0, 2).into(),
                enters.into(),
            ]
        };
    let sweeps: Vec<Sensitivities> = {
        let graph = engine.graph();
        let used = campaign.determinations.iter().filter(|run| run.excluded.is_none());
        used.filter_map(|run| Some(sensitivities(&graph, graph.find(&run.path)?))).collect()
    };
    let (large, small): (Vec<_>, Vec<_>) = made.lines.iter().partition(|line| line.share >= SMALLEST_SHARE);
    for line in large {
        let enters = match users(&sweeps, line.source) {
            0 => "the mean".to_string(),
            1 => "one run".into(),
            count if count == sweeps.len() => "every run".into(),
            count => format!("{count} runs"),
        };
        let kind = format!("{}, {}", line.evaluation.letter(), line.distribution);
        table.rows.push(row(
            line.label.clone(),
            &line.symbol,
            kind,
            freedom(style, line.degrees_of_freedom),
            line.contribution,
            line.share,
            enters,
        ));
    }
    if !small.is_empty() {
        let variance: f64 = small.iter().map(|line| line.contribution * line.contribution).sum();
        let share = small.iter().map(|line| line.share).sum();
        let label = format!("{} further contributions, each below 0.01 %", small.len());
        table.rows.push(row(label, "", String::new(), String::new(), variance.sqrt(), share, String::new()));
    }
    let mut sums = |label: &str, keep: &dyn Fn(&crate::graph::BudgetLine) -> bool| {
        let lines: Vec<_> = made.lines.iter().filter(|line| keep(line)).collect();
        let variance: f64 = lines.iter().map(|line| line.contribution * line.contribution).sum();
        let share: f64 = lines.iter().map(|line| line.share).sum();
        table.closing.push(row(label.into(), "", String::new(), String::new(), variance.sqrt(), share, String::new()));
    };
    let shared = |line: &crate::graph::BudgetLine| users(&sweeps, line.source) > 1;
    sums("what determinations share (not divided by √n)", &shared);
    sums("what each determination has of its own, and variation between them", &|line| !shared(line));
    let coverage = figure.coverage;
    table.closing.push(row(
        "combined standard uncertainty".into(),
        "u_c",
        String::new(),
        freedom(style, coverage.effective_degrees_of_freedom),
        coverage.standard_uncertainty,
        1.0,
        String::new(),
    ));
    Some(table.markup())
}

/// Slope of values over days by least squares, with its standard uncertainty from the scatter about the line.
fn slope(days: &[f64], values: &[f64]) -> Option<(f64, f64)> {
    let ones = vec![1.0; days.len()];
    let found = fit(&[&ones, days], values, None).ok()?;
    let variance = found.residual_variance()?;
    Some((found.coefficients[1], (found.unscaled_covariance[1][1] * variance).sqrt()))
}

/// Geometric factor and gravity of each determination, as departures from their means, and their slopes.
pub fn drifts_table(engine: &Engine, name: &str) -> Option<Markup> {
    let campaign = engine.found::<Campaign>(name)?;
    let style = engine.laboratory.style;
    let mut rows = Vec::new();
    for run in campaign.determinations.iter().filter(|run| run.excluded.is_none()) {
        let block = run.path.split('.').next().unwrap_or_default();
        let found = engine.found::<Determination>(block)?;
        let number = |path: String| engine.graph().find(&path).map(|id| engine.graph().number(id));
        let factor = number(format!("{}.geometric_factor", found.moving))?;
        let gravity = number(format!("{}.gravity.mean", found.weighing))?;
        rows.push((block.to_string(), (run.at.start + run.at.end) / 2.0, factor, gravity));
    }
    let first = rows.first()?.clone();
    let days: Vec<f64> = rows.iter().map(|row| (row.1 - first.1) / 86_400.0).collect();
    let mean =
        |values: &[f64], near: f64| near + values.iter().map(|value| value - near).sum::<f64>() / values.len() as f64;
    let factors: Vec<f64> = rows.iter().map(|row| row.2).collect();
    let gravities: Vec<f64> = rows.iter().map(|row| row.3).collect();
    let (factor, gravity) = (mean(&factors, first.2), mean(&gravities, first.3));
    let factors: Vec<f64> = factors.iter().map(|value| (value / factor - 1.0) * 1e9).collect();
    let gravities: Vec<f64> = gravities.iter().map(|value| (value - gravity) * 1e9).collect();
    let caption = format!(
        "Geometric factor and gravity of the determinations used, as departures from their means {} T m and {} m s⁻²",
        significant(style, factor, 8),
        significant(style, gravity, 9)
    );
    let header = vec!["Determination".into(), "Middle (UTC)".into(), head("ΔBl/Bl", "10⁻⁹"), head("Δg", "nm s⁻²")];
    let mut table = Table::new(caption, header);
    table.align = vec!["left", "left", "right", "right"];
    for (index, row) in rows.iter().enumerate() {
        let cells = [fixed(style, factors[index], 0), fixed(style, gravities[index], 1)];
        table.rows.push(vec![
            row.0.clone().into(),
            moment(row.1).into(),
            cells[0].clone().into(),
            cells[1].clone().into(),
        ]);
    }
    if let (Some(of_factor), Some(of_gravity)) = (slope(&days, &factors), slope(&days, &gravities)) {
        let words =
            |(b, u): (f64, f64), decimals| format!("{} (u = {})", fixed(style, b, decimals), fixed(style, u, decimals));
        table.closing.push(vec![
            "slope in a day".into(),
            "".into(),
            words(of_factor, 0).into(),
            words(of_gravity, 1).into(),
        ]);
    }
    Some(table.markup())
}
