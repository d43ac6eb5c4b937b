//! The shares of an uncertainty budget as bars.

use super::budget::SMALLEST_SHARE;
use crate::block::Engine;
use crate::graph::{NodeId, budget};
use crate::report::Markup;
use crate::report::figures::{Figure, per_cent};
use crate::report::literal::typst_string;

/// The longest bar, in millimetres.
const LONGEST_MM: f64 = 70.0;
/// Bars shown; the rest is one bar.
const MOST_BARS: usize = 10;

/// Bars of the largest shares of u², with the rest gathered.
pub fn shares_chart(engine: &Engine, result: NodeId) -> Markup {
    let Some(figure) = Figure::of(engine, result) else { return Markup::new() };
    let style = engine.laboratory.style;
    let lines = budget(&engine.graph(), result).lines;
    let mut bars: Vec<(String, f64)> = lines
        .iter()
        .filter(|line| line.share >= SMALLEST_SHARE)
        .take(MOST_BARS)
        .map(|line| (line.label.clone(), line.share))
        .collect();
    let rest = 1.0 - bars.iter().map(|(_, share)| share).sum::<f64>();
    if lines.len() > bars.len() {
        bars.push((format!("{} further contributions", lines.len() - bars.len()), rest.max(0.0)));
    }
    let largest = bars.iter().map(|(_, share)| *share).fold(0.0, f64::max);
    let text = |share: f64| per_cent(style, (share * 1e4).round() / 1e4);
    let mut cells = String::new();
    for (label, share) in &bars {
        let width = if largest > 0.0 { LONGEST_MM * share / largest } else { 0.0 };
        cells.push_str(&format!(
            "text(size: 8.5pt, {}), rect(width: {width:.2}mm, height: 2.6mm, fill: luma(110), stroke: none), text(size: 8.5pt, {}), ",
            typst_string(label),
            typst_string(&text(*share))
        ));
    }
    let words: Vec<String> = bars.iter().map(|(label, share)| format!("{label} {}", text(*share))).collect();
    let caption = format!("Shares of the squared standard uncertainty of the {}", figure.label);
    Markup::code(format!(
        "#figure-block(grid(columns: (62mm, {LONGEST_MM}mm, auto), column-gutter: 3mm, row-gutter: 1.6mm, align: (right + horizon, left + horizon, left + horizon), {cells}), caption: {}, alt: {});\n\n",
        typst_string(&caption),
        typst_string(&format!("Bar chart. {caption}: {}.", words.join("; ")))
    ))
}
