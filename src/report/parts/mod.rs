//! The parts a report is put together from: tables, lists, charts and statements made from the graph.

pub mod allan;
pub mod analysis;
pub mod annex;
pub mod budget;
pub mod campaign;
pub mod charts;
pub mod conditions;
pub mod consistency;
pub mod constants;
pub mod contents;
pub mod correlation;
pub mod distribution;
pub mod excluded;
pub mod fit;
pub mod gravity;
pub mod phases;
pub mod protocol;
pub mod readings;
pub mod results;
pub mod shares;
pub mod statements;
pub mod traceability;
pub mod trail;

use super::Markup;
use crate::block::Engine;
use crate::graph::{Decision, Op};

/// A list of short texts.
pub fn bullets(items: &[String]) -> Markup {
    let mut made = Markup::new();
    for item in items {
        made.push_code("- ").push_text(item).push_code("\n");
    }
    made.push_code("\n");
    made
}

/// What the estimator behind a result decided.
pub fn decisions_behind(engine: &Engine, path: &str) -> Vec<Decision> {
    let graph = engine.graph();
    let found = graph.find(path).map(|id| graph.node(id).op.clone());
    match found {
        Some(Op::Output(estimator, _)) => graph.estimators[estimator.index()].estimate.decisions.clone(),
        _ => Vec::new(),
    }
}

/// A decision as a sentence.
pub fn sentence(decision: &Decision) -> String {
    format!("{}: {}.", capital(&decision.what), decision.decided)
}

/// With a capital first letter.
pub fn capital(text: &str) -> String {
    let mut letters = text.chars();
    letters.next().map_or_else(String::new, |first| first.to_uppercase().chain(letters).collect())
}
