//! Readings left out, with rule, reason, and the result with and without them.

use crate::block::Engine;
use crate::report::Markup;
use crate::report::figures::fixed;
use crate::report::table::{Table, head};

/// Every cycle left out of the comparisons used.
pub fn excluded_table(engine: &Engine) -> Markup {
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
                format!("{}: {} Reason: {}.", left_out.rule, left_out.rule_text, left_out.reason.trim_end_matches('.'))
                    .into(),
                micrograms(comparison.with_and_without.map(|(with, _)| with)).into(),
                micrograms(comparison.with_and_without.map(|(_, without)| without)).into(),
            ]);
        }
    }
    if table.rows.is_empty() { Markup::text("No reading was left out.") } else { table.markup() }
}
