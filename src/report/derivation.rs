//! The derivation: every node of the graph with its operation and value, for a recomputation by other means.

use crate::block::Engine;
use crate::graph::{Graph, Node, NodeId, Op, Origin, Value};
use serde_json::{Map, Value as Json, json};

/// The version of the JSON shape of derivations.
pub const DERIVATION_FORMAT: u32 = 1;

/// Columns longer than this are given by file and column instead of row by row.
const LONGEST_COLUMN: usize = 4096;

/// The derivation as JSON, one node a line.
pub fn derivation_json(engine: &Engine) -> String {
    let graph = engine.graph();
    let sources = engine.sources();
    let mut text = format!("{{\"format\": {DERIVATION_FORMAT}, \"engine\": \"{}\",\n\"nodes\": [\n", crate::VERSION);
    let nodes: Vec<String> = (0..graph.nodes.len())
        .map(|index| {
            let id = NodeId(index as u32);
            let mut made = node_json(&graph, id);
            if let Origin::Readings(column) = &graph.node(id).origin {
                made.insert("file".into(), json!(sources.file(column.file).path));
                made.insert("column".into(), json!(column.column));
                made.insert("first_line".into(), json!(column.lines.first()));
            }
            Json::Object(made).to_string()
        })
        .collect();
    text.push_str(&nodes.join(",\n"));
    text.push_str("\n],\n\"estimators\": [\n");
    text.push_str(
        &(0..graph.estimators.len())
            .map(|index| estimator_json(&graph, index).to_string())
            .collect::<Vec<_>>()
            .join(",\n"),
    );
    text.push_str("\n]}\n");
    text
}

fn node_json(graph: &Graph, id: NodeId) -> Map<String, Json> {
    let node = graph.node(id);
    let mut made = Map::new();
    made.insert("id".into(), json!(id.0));
    if let Some(name) = &node.name {
        made.insert("name".into(), json!(name.path));
    }
    made.insert("operation".into(), json!(node.op.word()));
    operands(node, &mut made);
    made.insert("value".into(), value_json(graph.value(id)));
    if let Some(input) = graph.input(id) {
        made.insert("distribution".into(), json!(input.distribution.word()));
        made.insert("standard_uncertainty".into(), json!(input.distribution.standard_uncertainty()));
        made.insert("degrees_of_freedom".into(), finite(input.degrees_of_freedom));
    }
    if let Origin::Computed(method) = &node.origin {
        made.insert("method".into(), json!(method.name));
    }
    made
}

fn operands(node: &Node, made: &mut Map<String, Json>) {
    match &node.op {
        Op::Power(a, exponent) => {
            made.insert("of".into(), json!([a.0]));
            made.insert("exponent".into(), json!(exponent));
        }
        Op::Row(a, row) => {
            made.insert("of".into(), json!([a.0]));
            made.insert("row".into(), json!(row));
        }
        Op::Mix(a, weights) => {
            made.insert("of".into(), json!([a.0]));
            made.insert("weights".into(), json!(weights.iter().collect::<Vec<_>>()));
        }
        Op::Output(estimator, output) => {
            made.insert("estimator".into(), json!(estimator.0));
            made.insert("output".into(), json!(output));
        }
        op if op.operands().is_empty() => {}
        op => {
            made.insert("of".into(), json!(op.operands().iter().map(|operand| operand.0).collect::<Vec<_>>()));
        }
    }
}

fn value_json(value: &Value) -> Json {
    match value {
        Value::Scalar(number) => finite(*number),
        Value::Column(rows) if rows.len() <= LONGEST_COLUMN => json!(rows.to_vec()),
        Value::Column(rows) => json!({ "rows": rows.len() }),
    }
}

fn finite(number: f64) -> Json {
    if number.is_finite() { json!(number) } else { Json::Null }
}

fn estimator_json(graph: &Graph, index: usize) -> Json {
    let node = &graph.estimators[index];
    let rows = node.estimate.jacobian.iter().flatten().map(Vec::len).max().unwrap_or(0);
    json!({
        "id": index,
        "name": node.path,
        "columns": node.columns.iter().map(|column| column.0).collect::<Vec<_>>(),
        "values": node.estimate.values,
        "jacobian": if rows <= LONGEST_COLUMN { json!(node.estimate.jacobian) } else { Json::Null },
        "own_covariance": node.estimate.own_covariance,
        "degrees_of_freedom": finite(node.estimate.degrees_of_freedom),
        "decisions": node.estimate.decisions.iter().map(|decision| json!([decision.what, decision.decided])).collect::<Vec<_>>(),
    })
}
