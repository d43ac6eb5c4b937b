//! The trail: from one named quantity down to readings, inputs and constants.
//!
//! Only named nodes show; the single additions and products between them are the named method's formula.

use super::node::*;
use std::collections::{BTreeMap, BTreeSet};

/// One named quantity in a trail.
#[derive(Debug, Clone, PartialEq)]
pub struct TrailStep {
    pub node: NodeId,
    /// Steps from the quantity asked for; 0 is that quantity itself.
    pub depth: usize,
    /// The named quantities it is computed from, in order of first use.
    pub rests_on: Vec<NodeId>,
}

/// A trail, in the order a reader walks down: each quantity once, at its shallowest depth.
#[derive(Debug, Clone, PartialEq)]
pub struct TrailSteps {
    pub steps: Vec<TrailStep>,
}

/// The trail of a named quantity.
pub fn trail(graph: &Graph, of: NodeId) -> TrailSteps {
    let mut depths: BTreeMap<NodeId, usize> = BTreeMap::from([(of, 0)]);
    let mut steps = Vec::new();
    let mut level = vec![of];
    while !level.is_empty() {
        let mut next = Vec::new();
        for node in level {
            let rests_on = named_operands(graph, node);
            let depth = depths[&node];
            for operand in &rests_on {
                if !depths.contains_key(operand) {
                    depths.insert(*operand, depth + 1);
                    next.push(*operand);
                }
            }
            steps.push(TrailStep { node, depth, rests_on });
        }
        level = next;
    }
    TrailSteps { steps }
}

/// The named nodes that `node` is directly computed from.
pub(crate) fn named_operands(graph: &Graph, node: NodeId) -> Vec<NodeId> {
    let mut found = Vec::new();
    let mut seen = BTreeSet::new();
    let mut waiting: Vec<NodeId> = graph.operands(node).into_iter().rev().collect();
    while let Some(id) = waiting.pop() {
        if !seen.insert(id) {
            continue;
        }
        if graph.node(id).name.is_some() {
            found.push(id);
        } else {
            waiting.extend(graph.operands(id).into_iter().rev());
        }
    }
    found
}
