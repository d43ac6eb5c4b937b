//! The graph evaluated anew with some inputs displaced: for checks of linearity and of sensitivities.

use super::node::*;
use super::value::{Value, apply};
use crate::diagnostic::Problem;
use std::collections::BTreeMap;

/// The values of every node up to `last` when the given input nodes take other values.
///
/// # Errors
/// Those of an estimator that cannot work with the displaced columns.
pub fn evaluate_displaced(
    graph: &Graph,
    displaced: &BTreeMap<NodeId, Value>,
    last: NodeId,
) -> Result<Vec<Value>, Problem> {
    let mut values: Vec<Value> = Vec::with_capacity(last.index() + 1);
    let mut outputs: BTreeMap<u32, Vec<f64>> = BTreeMap::new();
    for index in 0..=last.index() {
        let id = NodeId(index as u32);
        let value = match (&graph.nodes[index].op, displaced.get(&id)) {
            (_, Some(value)) => value.clone(),
            (Op::Input(_), None) => graph.values[index].clone(),
            (Op::Output(estimator, output), None) => {
                let node = &graph.estimators[estimator.index()];
                if let std::collections::btree_map::Entry::Vacant(e) = outputs.entry(estimator.0) {
                    let columns: Vec<&[f64]> =
                        node.columns.iter().map(|column| values[column.index()].rows()).collect();
                    e.insert(node.rule.estimate(&columns)?.values);
                }
                Value::Scalar(outputs[&estimator.0].get(*output as usize).copied().unwrap_or(f64::NAN))
            }
            (op, None) => apply(op, |operand| &values[operand.index()]).unwrap_or(Value::Scalar(f64::NAN)),
        };
        values.push(value);
    }
    Ok(values)
}
