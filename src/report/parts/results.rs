//! The table of results.

use crate::block::Engine;
use crate::graph::NodeId;
use crate::quantity::Kind;
use crate::report::Markup;
use crate::report::figures::{Figure, freedom, per_cent};
use crate::report::table::{Cell, Table, head, symbol};

/// Results with expanded uncertainty, coverage factor and degrees of freedom.
pub fn results_table(engine: &Engine, results: &[NodeId]) -> Markup {
    let style = engine.laboratory.style;
    let header = vec![
        "Result of".into(),
        "Quantity".into(),
        "Value and expanded uncertainty".into(),
        head("k", ""),
        head("ν_eff", ""),
    ];
    let caption = format!(
        "Results with expanded uncertainty for a coverage probability of {}",
        per_cent(style, nominal_probability(engine.laboratory.settings.coverage_probability))
    );
    let mut table = Table::new(caption, header);
    table.align = vec!["left", "left", "left", "right", "right"];
    for id in results {
        let Some(figure) = Figure::of(engine, *id) else { continue };
        let kind = engine.graph().node(*id).kind;
        let mut quantity = Markup::text(&format!("{} ", kind.word()));
        quantity.push(&symbol(&figure.symbol));
        table.rows.push(vec![
            subject(&figure.label, kind).into(),
            Cell::Markup(quantity),
            figure.expanded().into(),
            figure.factor().into(),
            freedom(style, figure.coverage.effective_degrees_of_freedom).into(),
        ]);
    }
    table.markup()
}

/// The probability as settled: two sigma is written 95.45 %.
pub fn nominal_probability(probability: f64) -> f64 {
    if (probability - 0.954_499_736).abs() < 1e-9 { 0.9545 } else { probability }
}

/// What the label says beyond the kind: "conventional mass of HW 1" gives "HW 1".
fn subject(label: &str, kind: Kind) -> String {
    let rest = label.strip_prefix(kind.word()).map_or(label, |rest| rest.trim_start_matches(',').trim());
    rest.strip_prefix("of ").unwrap_or(rest).to_string()
}
