//! First-order sensitivities: one reverse sweep from a measurand to all its inputs.

use super::node::*;
use super::value::{Value, slope};
use crate::numeric::sum::sum;
use std::collections::BTreeMap;

/// Where a contribution to uncertainty comes from.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub enum Source {
    /// An input, by its number in [`Graph::inputs`]; a column of readings counts as one source.
    Input(u32),
    /// The scatter seen by an estimator, by its number.
    Estimator(u32),
}

/// Derivatives of one measurand with respect to everything uncertain below it.
#[derive(Debug, Clone)]
pub struct Sensitivities {
    pub measurand: NodeId,
    /// Derivative by input; one number for a scalar, one a row for a column.
    pub inputs: BTreeMap<u32, Vec<f64>>,
    /// Derivative by output of each estimator.
    pub estimators: BTreeMap<u32, Vec<f64>>,
}

/// Derivatives of `measurand` by one reverse sweep over the graph.
pub fn sensitivities(graph: &Graph, measurand: NodeId) -> Sensitivities {
    sensitivities_at(graph, &graph.values, measurand)
}

/// The same where the nodes have other values; estimators keep the response found at the estimates.
pub(super) fn sensitivities_at(graph: &Graph, values: &[Value], measurand: NodeId) -> Sensitivities {
    let mut sweep = Sweep::new(graph, values, measurand);
    for index in (0..=measurand.index()).rev() {
        if let Some(adjoint) = sweep.adjoints[index].take() {
            sweep.pass_down(NodeId(index as u32), adjoint);
        }
    }
    Sensitivities { measurand, inputs: sweep.inputs, estimators: sweep.estimators }
}

/// Derivatives of a scalar node with respect to the scalar nodes that shape the columns it reduces, together with
/// its derivatives by noisy columns and estimators on the way. The sweep stops at scalars.
pub(super) fn linear_response(graph: &Graph, boundary: NodeId) -> (BTreeMap<NodeId, f64>, Sensitivities) {
    let mut sweep = Sweep::new(graph, &graph.values, boundary);
    let mut scalars = BTreeMap::new();
    for index in (0..=boundary.index()).rev() {
        let Some(adjoint) = sweep.adjoints[index].take() else { continue };
        let id = NodeId(index as u32);
        match adjoint {
            Value::Scalar(weight) if id != boundary && !matches!(graph.node(id).op, Op::Constant(_)) => {
                scalars.insert(id, weight);
            }
            adjoint => sweep.pass_down(id, adjoint),
        }
    }
    (scalars, Sensitivities { measurand: boundary, inputs: sweep.inputs, estimators: sweep.estimators })
}

struct Sweep<'g> {
    graph: &'g Graph,
    values: &'g [Value],
    adjoints: Vec<Option<Value>>,
    inputs: BTreeMap<u32, Vec<f64>>,
    estimators: BTreeMap<u32, Vec<f64>>,
}

impl<'g> Sweep<'g> {
    fn new(graph: &'g Graph, values: &'g [Value], from: NodeId) -> Self {
        let mut adjoints = vec![None; from.index() + 1];
        adjoints[from.index()] = Some(Value::Scalar(1.0));
        Self { graph, values, adjoints, inputs: BTreeMap::new(), estimators: BTreeMap::new() }
    }

    fn value(&self, id: NodeId) -> &'g Value {
        &self.values[id.index()]
    }

    /// Hands a node's adjoint to its operands by the chain rule.
    fn pass_down(&mut self, id: NodeId, adjoint: Value) {
        let graph = self.graph;
        match &graph.node(id).op {
            Op::Constant(_) => {}
            Op::Input(number) => {
                self.inputs.insert(*number, adjoint.rows().to_vec());
            }
            Op::Add(a, b) => {
                self.give(*a, &adjoint);
                self.give(*b, &adjoint);
            }
            Op::Subtract(a, b) => {
                self.give(*a, &adjoint);
                self.give(*b, &adjoint.map(|weight| -weight));
            }
            Op::Multiply(a, b) => {
                self.give(*a, &adjoint.zip(self.value(*b), |weight, b| weight * b));
                self.give(*b, &adjoint.zip(self.value(*a), |weight, a| weight * a));
            }
            Op::Divide(a, b) => {
                let over = adjoint.zip(self.value(*b), |weight, b| weight / b);
                self.give(*b, &over.zip(self.value(id), |over, ratio| -over * ratio));
                self.give(*a, &over);
            }
            Op::Sum(a) => {
                let weight = adjoint.number();
                self.give(*a, &self.value(*a).map(|_| weight));
            }
            Op::Row(a, row) => self.give_row(*a, *row, adjoint.number()),
            Op::Mix(a, weights) => self.give_mix(*a, weights, &adjoint),
            Op::Stack(list) => {
                for (index, operand) in list.iter().enumerate() {
                    self.give(*operand, &Value::Scalar(adjoint.at(index)));
                }
            }
            Op::Output(estimator, output) => self.pass_estimator(estimator.index(), *output as usize, adjoint.number()),
            op => {
                for operand in op.operands() {
                    let pairs = self.value(operand).zip(self.value(id), |x, y| slope(op, x, y));
                    self.give(operand, &adjoint.zip(&pairs, |weight, slope| weight * slope));
                }
            }
        }
    }

    /// Adds to the adjoint of a node; a scalar operand of a column gathers over the rows.
    fn give(&mut self, to: NodeId, adjoint: &Value) {
        let adjoint = match (self.value(to), adjoint) {
            (Value::Scalar(_), Value::Column(rows)) => Value::Scalar(sum(rows.iter().copied())),
            (column @ Value::Column(_), Value::Scalar(weight)) => column.map(|_| *weight),
            _ => adjoint.clone(),
        };
        let slot = &mut self.adjoints[to.index()];
        *slot = Some(match slot.take() {
            Some(before) => before.zip(&adjoint, |a, b| a + b),
            None => adjoint,
        });
    }

    fn give_row(&mut self, to: NodeId, row: u32, weight: f64) {
        match self.value(to) {
            Value::Scalar(_) => self.give(to, &Value::Scalar(weight)),
            Value::Column(rows) => {
                let mut adjoint = vec![0.0; rows.len()];
                if let Some(place) = adjoint.get_mut(row as usize) {
                    *place = weight;
                }
                self.give(to, &Value::Column(adjoint.into()));
            }
        }
    }

    fn give_mix(&mut self, to: NodeId, weights: &[Vec<(u32, f64)>], adjoint: &Value) {
        let mut gathered = vec![0.0; self.value(to).rows().len()];
        for (row, mix) in weights.iter().enumerate() {
            for (index, weight) in mix {
                if let Some(place) = gathered.get_mut(*index as usize) {
                    *place += weight * adjoint.at(row);
                }
            }
        }
        match self.value(to) {
            Value::Scalar(_) => self.give(to, &Value::Scalar(sum(gathered.iter().copied()))),
            Value::Column(_) => self.give(to, &Value::Column(gathered.into())),
        }
    }

    /// Outputs are visited from the last to the first; the first hands everything to the columns.
    fn pass_estimator(&mut self, estimator: usize, output: usize, weight: f64) {
        let node = &self.graph.estimators[estimator];
        let outputs = node.estimate.values.len();
        let gathered = self.estimators.entry(estimator as u32).or_insert_with(|| vec![0.0; outputs]);
        gathered[output] += weight;
        let column_adjoints: Vec<Vec<f64>> = node
            .estimate
            .jacobian
            .iter()
            .map(|column| column[output].iter().map(|derivative| derivative * weight).collect())
            .collect();
        for (column, adjoint) in node.columns.iter().zip(column_adjoints) {
            self.give(*column, &Value::Column(adjoint.into()));
        }
    }
}
