//! The trail of one result as a table: from the result down to readings, inputs and constants.

use crate::block::Engine;
use crate::graph::{Graph, NodeId, Origin, TrailStep, trail};
use crate::report::Markup;
use crate::report::listing::print_quantity;
use crate::report::table::{Cell, Table, symbol};

/// Every named quantity the result rests on.
pub fn trail_table(engine: &Engine, result: NodeId) -> Markup {
    let graph = engine.graph();
    let name = graph.node(result).name.as_ref().map(|name| name.path.clone()).unwrap_or_default();
    let header = vec!["Step".into(), "Quantity".into(), "".into(), "Value".into(), "From".into()];
    let mut table = Table::new(format!("Trail of {name}"), header);
    table.columns = vec!["auto", "1.2fr", "auto", "auto", "1.4fr"];
    table.align = vec!["right", "left", "left", "left", "left"];
    for step in trail(&graph, result).steps {
        table.rows.push(row(engine, &graph, &step));
    }
    drop(graph);
    table.markup()
}

fn row(engine: &Engine, graph: &Graph, step: &TrailStep) -> Vec<Cell> {
    let node = graph.node(step.node);
    let Some(name) = &node.name else { return Vec::new() };
    let value = match graph.value(step.node).length() {
        Some(rows) => format!("{rows} values"),
        None => {
            print_quantity(graph, step.node, &crate::graph::sensitivities(graph, step.node), engine.laboratory.style)
        }
    };
    vec![
        step.depth.to_string().into(),
        format!("{}: {}", name.path, name.label).into(),
        Cell::Markup(symbol(&name.symbol)),
        value.into(),
        from(engine, graph, step).into(),
    ]
}

fn from(engine: &Engine, graph: &Graph, step: &TrailStep) -> String {
    let sources = engine.sources();
    let at = |place| {
        let (path, line, _) = sources.locate(place);
        format!("{path}, line {line}")
    };
    let rests = || {
        step.rests_on
            .iter()
            .filter_map(|id| graph.node(*id).name.as_ref())
            .map(|name| name.path.as_str())
            .collect::<Vec<_>>()
            .join(", ")
    };
    let origin = &graph.node(step.node).origin;
    let corrected: String = engine.corrections_of(origin).iter().map(|one| format!("; {}", one.words())).collect();
    let from = match origin {
        Origin::Reading(place) => format!("reading, {}", at(*place)),
        Origin::Stated(place) => format!("stated, {}", at(*place)),
        Origin::ReadingList(_) => graph
            .node(step.node)
            .origin
            .place()
            .map_or_else(String::new, |place| format!("readings, {} and following", at(place))),
        Origin::Readings(column) => format!(
            "readings, {}, column {}, lines {} to {}",
            sources.file(column.file).path,
            column.column,
            column.lines.first().copied().unwrap_or(0),
            column.lines.last().copied().unwrap_or(0)
        ),
        Origin::Constant(source) => format!("constant: {source}"),
        Origin::Assumed(reason) => format!("assumed: {reason}"),
        Origin::Computed(method) => format!("{}: {}. From {}", method.title, method.formula, rests()),
        Origin::Step => format!("from {}", rests()),
    };
    from + &corrected
}
