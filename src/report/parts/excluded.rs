//! Readings and results left out, with rule, reason, and the result with and without them.

use crate::block::Engine;
use crate::block::combining::Combined;
use crate::block::realization::Campaign;
use crate::report::Markup;
use crate::report::figures::{Figure, fixed};
use crate::report::table::{Table, head};

/// Every cycle left out of the comparisons used, and every result left out of their combinations.
pub fn excluded_table(engine: &Engine) -> Markup {
    match (excluded_cycles(engine), excluded_results(engine)) {
        (None, None) => Markup::text("No reading was left out."),
        (cycles, results) => {
            let mut made = Markup::new();
            cycles.iter().chain(&results).for_each(|table| {
                made.push(&table.markup());
            });
            made
        }
    }
}

fn excluded_results(engine: &Engine) -> Option<Table> {
    let header = vec![
        "Combination".into(),
        "Result left out".into(),
        "Rule and reason".into(),
        "With them".into(),
        "Without them".into(),
    ];
    let mut table = Table::new("Results left out of combinations; combined result with and without them", header);
    table.columns = vec!["auto", "auto", "1fr", "auto", "auto"];
    table.align = vec!["left", "left", "left", "right", "right"];
    for name in engine.used_blocks() {
        let Some(combined) = engine.found::<Combined>(&name) else { continue };
        let shown = |id| Figure::of(engine, id).map_or_else(String::new, |figure| figure.standard());
        for (id, left_out) in &combined.excluded {
            let value = Figure::of(engine, *id).map_or_else(String::new, |figure| figure.standard());
            table.rows.push(vec![
                name.clone().into(),
                format!("{}: {value}", left_out.path).into(),
                rule_and_reason(&left_out.rule, &left_out.rule_text, &left_out.reason).into(),
                combined.with_excluded.map_or_else(String::new, shown).into(),
                shown(combined.result).into(),
            ]);
        }
    }
    for name in engine.used_blocks() {
        let Some(campaign) = engine.found::<Campaign>(&name) else { continue };
        let shown = |path: &str| {
            let id = engine.graph().find(path);
            id.and_then(|id| Figure::of(engine, id)).map_or_else(String::new, |figure| figure.standard())
        };
        for run in &campaign.determinations {
            let Some((rule, reason)) = &run.excluded else { continue };
            table.rows.push(vec![
                name.clone().into(),
                format!("{}: {}", run.path, shown(&run.path)).into(),
                format!("{rule} Reason: {}.", reason.trim_end_matches('.')).into(),
                shown(&format!("{name}.with_excluded.mass")).into(),
                shown(&format!("{name}.mass")).into(),
            ]);
        }
    }
    (!table.rows.is_empty()).then_some(table)
}

fn rule_and_reason(rule: &str, rule_text: &str, reason: &str) -> String {
    format!("{rule}: {rule_text} Reason: {}.", reason.trim_end_matches('.'))
}

fn excluded_cycles(engine: &Engine) -> Option<Table> {
    let style = engine.laboratory.style;
    let header = vec![
        "Comparison".into(),
        "Series".into(),
        "Cycle".into(),
        "Rule and reason".into(),
        head("D_with", "µg"),
        head("D_without", "µg"),
    ];
    let mut table = Table::new("Cycles left out; mean difference D with and without them", header);
    table.columns = vec!["auto", "auto", "auto", "1fr", "auto", "auto"];
    table.align = vec!["left", "center", "center", "left", "right", "right"];
    for name in engine.used_blocks() {
        let Some(comparison) = engine.weighing(&name) else { continue };
        for left_out in &comparison.excluded {
            let micrograms =
                |value: Option<f64>| value.map_or_else(|| "—".to_string(), |value| fixed(style, value * 1e9, 2));
            table.rows.push(vec![
                name.clone().into(),
                left_out.series.to_string().into(),
                left_out.cycle.to_string().into(),
                rule_and_reason(&left_out.rule, &left_out.rule_text, &left_out.reason).into(),
                micrograms(comparison.with_and_without.map(|(with, _)| with)).into(),
                micrograms(comparison.with_and_without.map(|(_, without)| without)).into(),
            ]);
        }
    }
    (!table.rows.is_empty()).then_some(table)
}
