//! The exact constants that the results rest on.

use crate::block::Engine;
use crate::graph::{Graph, NodeId, trail};
use crate::method::constants;
use crate::report::Markup;
use crate::report::listing::print_constant;
use crate::report::table::{Cell, Table, symbol};
use std::collections::BTreeSet;

/// The constants under `results`, with their values, exactness and source; those of the whole graph when none is named.
pub fn constants_table(engine: &Engine, results: &[NodeId]) -> Markup {
    let graph = engine.graph();
    let used = used_constants(&graph, results);
    if used.is_empty() {
        return Markup::text("The results rest on none of the defining constants of the SI.");
    }
    let header = vec!["".into(), "Constant".into(), "Value".into(), "Uncertainty".into(), "Source".into()];
    let mut table = Table::new("Constants the results rest on", header);
    table.columns = vec!["auto", "1fr", "auto", "auto", "1.2fr"];
    table.rows = used.iter().filter_map(|path| row(engine, &graph, path)).collect();
    drop(graph);
    table.markup()
}

/// Paths of the constants, in order of name.
fn used_constants(graph: &Graph, results: &[NodeId]) -> BTreeSet<String> {
    let is_constant = |path: &&String| path.starts_with(constants::PREFIX);
    if results.is_empty() {
        return graph.names.keys().filter(is_constant).cloned().collect();
    }
    let steps = results.iter().flat_map(|result| trail(graph, *result).steps);
    let named = steps.filter_map(|step| graph.node(step.node).name.as_ref().map(|name| name.path.clone()));
    named.filter(|path| is_constant(&path)).collect()
}

fn row(engine: &Engine, graph: &Graph, path: &str) -> Option<Vec<Cell>> {
    let id = graph.find(path)?;
    let name = graph.node(id).name.as_ref()?;
    let formula =
        constants::DERIVED.iter().find(|derived| path.strip_prefix(constants::PREFIX) == Some(derived.symbol));
    let source = match formula {
        Some(derived) => format!("{}: computed, its decimals do not end", derived.formula),
        None => constants::SOURCE.into(),
    };
    Some(vec![
        Cell::Markup(symbol(&name.symbol)),
        name.label.clone().into(),
        print_constant(graph.number(id), &name.unit, engine.laboratory.style).into(),
        "exact".into(),
        source.into(),
    ])
}
