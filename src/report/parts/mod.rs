//! The parts a report is put together from: tables, lists, charts and statements made from the graph.

pub mod annex;
pub mod budget;
pub mod campaign;
pub mod charts;
pub mod conditions;
pub mod consistency;
pub mod contents;
pub mod correlation;
pub mod distribution;
pub mod excluded;
pub mod protocol;
pub mod readings;
pub mod results;
pub mod shares;
pub mod statements;
pub mod traceability;
pub mod trail;

use super::Markup;

/// A list of short texts.
pub fn bullets(items: &[String]) -> Markup {
    let mut made = Markup::new();
    for item in items {
        made.push_code("- ").push_text(item).push_code("\n");
    }
    made.push_code("\n");
    made
}
