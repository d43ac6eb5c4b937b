//! Growing the graph.
//!
//! A [`Builder`] appends nodes and computes each value as it is appended, so that a method can look at numbers
//! where it must (validity, interpolation weights). A sum that cannot be built leaves a problem with the builder
//! and a node that is not a number; whoever builds collects the problems and gives them their place.

use super::Estimator;
use super::estimator::{EstimatorId, EstimatorNode};
use super::handle::Quantity;
use super::node::*;
use super::value::{Value, apply};
use crate::diagnostic::{Code, Problem};
use crate::intake::Place;
use crate::quantity::{Dimension, Kind, Unit};
use std::cell::{Ref, RefCell};
use std::sync::Arc;

/// A value nobody wrote, which the report lists.
#[derive(Debug, Clone, PartialEq)]
pub struct Assumption {
    pub text: String,
    pub place: Option<Place>,
}

#[derive(Debug, Default)]
struct Growing {
    graph: Graph,
    scopes: Vec<(String, Option<&'static MethodInfo>)>,
    problems: Vec<Problem>,
    assumptions: Vec<Assumption>,
}

/// Grows a [`Graph`].
#[derive(Debug, Default)]
pub struct Builder {
    growing: RefCell<Growing>,
}

/// Everything an input is made from.
#[derive(Debug, Clone)]
pub struct InputDraft {
    pub path: String,
    pub symbol: String,
    pub label: String,
    pub unit: Unit,
    pub kind: Kind,
    pub dimension: Dimension,
    pub value: Value,
    pub distribution: Distribution,
    pub degrees_of_freedom: f64,
    pub evaluation: Evaluation,
    pub origin: Origin,
    pub text: Option<String>,
    pub state: Option<State>,
    pub basis: Option<Basis>,
}

impl InputDraft {
    /// An exact input in `unit` at SI value `value`; fields are then set as needed.
    pub fn new(path: &str, symbol: &str, label: &str, kind: Kind, unit: Unit, value: Value, origin: Origin) -> Self {
        Self {
            path: path.into(),
            symbol: symbol.into(),
            label: label.into(),
            dimension: unit.dimension(),
            unit,
            kind,
            value,
            distribution: Distribution::Exact,
            degrees_of_freedom: f64::INFINITY,
            evaluation: Evaluation::TypeB,
            origin,
            text: None,
            state: None,
            basis: None,
        }
    }
}

/// Leaves a scope when dropped.
pub struct ScopeGuard<'g> {
    builder: &'g Builder,
}

impl Drop for ScopeGuard<'_> {
    fn drop(&mut self) {
        self.builder.growing.borrow_mut().scopes.pop();
    }
}

impl Builder {
    /// The graph grown so far.
    pub fn graph(&self) -> Ref<'_, Graph> {
        Ref::map(self.growing.borrow(), |growing| &growing.graph)
    }

    /// The finished graph with its assumptions.
    pub fn finish(self) -> (Graph, Vec<Assumption>) {
        let growing = self.growing.into_inner();
        (growing.graph, growing.assumptions)
    }

    /// The handle of a node.
    pub fn at(&self, id: NodeId) -> Quantity<'_> {
        Quantity { builder: self, id }
    }

    /// Opens a named scope: names given inside stand behind `name.`, and results carry the method.
    pub fn scope(&self, name: &str, method: Option<&'static MethodInfo>) -> ScopeGuard<'_> {
        let mut growing = self.growing.borrow_mut();
        let path = match growing.scopes.last() {
            Some((outer, _)) if !name.is_empty() => format!("{outer}.{name}"),
            Some((outer, _)) => outer.clone(),
            None => name.to_string(),
        };
        let method = method.or_else(|| growing.scopes.last().and_then(|(_, method)| *method));
        growing.scopes.push((path, method));
        ScopeGuard { builder: self }
    }

    /// The path of the open scope followed by `name`.
    pub fn path(&self, name: &str) -> String {
        match self.growing.borrow().scopes.last() {
            Some((scope, _)) => format!("{scope}.{name}"),
            None => name.to_string(),
        }
    }

    /// Notes a problem; the block that builds will give it its place.
    pub fn problem(&self, problem: Problem) {
        let mut growing = self.growing.borrow_mut();
        if !growing.problems.contains(&problem) {
            growing.problems.push(problem);
        }
    }

    /// Takes the problems noted so far.
    pub fn take_problems(&self) -> Vec<Problem> {
        std::mem::take(&mut self.growing.borrow_mut().problems)
    }

    /// Notes a value that nobody wrote.
    pub fn assume(&self, text: impl Into<String>, place: Option<Place>) {
        let assumption = Assumption { text: text.into(), place };
        let mut growing = self.growing.borrow_mut();
        if !growing.assumptions.contains(&assumption) {
            growing.assumptions.push(assumption);
        }
    }

    /// The assumptions noted so far.
    pub fn assumptions(&self) -> Vec<Assumption> {
        self.growing.borrow().assumptions.clone()
    }

    /// States correlation coefficients between inputs, by the numbers of their nodes.
    ///
    /// # Errors
    /// When the matrix is impossible, or an input stands in another group already.
    pub fn correlate(&self, path: &str, nodes: &[NodeId], coefficients: Vec<Vec<f64>>) -> Result<(), Problem> {
        crate::numeric::linear::covariance_factor(&coefficients)?;
        let mut growing = self.growing.borrow_mut();
        let graph = &mut growing.graph;
        let mut inputs = Vec::new();
        for node in nodes {
            match graph.nodes[node.index()].op {
                Op::Input(number) if graph.values[node.index()].length().is_none() => inputs.push(number),
                _ => {
                    let message =
                        "Only stated single values are correlated by a block; results are by what they share.";
                    return Err(Problem::new(Code::KindMismatch, message));
                }
            }
        }
        let taken = |group: &CorrelatedInputs| inputs.iter().any(|input| group.position(*input).is_some());
        if let Some(group) = graph.correlated.iter().find(|group| taken(group)) {
            let message = format!("One of the inputs is correlated by {} already.", group.path);
            return Err(Problem::new(Code::CorrelationImpossible, message));
        }
        graph.correlated.push(CorrelatedInputs { path: path.into(), inputs, coefficients });
        Ok(())
    }

    /// An exact number without dimension.
    pub fn number(&self, value: f64) -> Quantity<'_> {
        self.exact(Value::Scalar(value), Dimension::ONE, Kind::Plain)
    }

    /// An exact column without dimension, such as a mask of rows.
    pub fn column(&self, rows: impl Into<Arc<[f64]>>) -> Quantity<'_> {
        self.exact(Value::Column(rows.into()), Dimension::ONE, Kind::Plain)
    }

    /// An exact value of any dimension (coherent SI).
    pub fn exact(&self, value: Value, dimension: Dimension, kind: Kind) -> Quantity<'_> {
        self.push(plain_node(Op::Constant(value), dimension, kind))
    }

    /// A constant with its source; it is named and stands in the trail.
    #[allow(clippy::too_many_arguments)]
    pub fn constant(
        &self,
        path: &str,
        symbol: &str,
        label: &str,
        value: f64,
        unit: &Unit,
        kind: Kind,
        source: &'static str,
    ) -> Quantity<'_> {
        if let Some(known) = self.graph().find(path) {
            return self.at(known);
        }
        let mut node = plain_node(Op::Constant(Value::Scalar(value)), unit.dimension(), kind);
        node.origin = Origin::Constant(source);
        let quantity = self.push(node);
        self.name(
            quantity.id,
            Name { path: path.into(), symbol: symbol.into(), label: label.into(), unit: unit.clone() },
        );
        quantity
    }

    /// A new input under its full path. A path already there gives the input it names.
    pub fn input(&self, draft: InputDraft) -> Quantity<'_> {
        if let Some(known) = self.graph().find(&draft.path) {
            return self.at(known);
        }
        let id = {
            let mut growing = self.growing.borrow_mut();
            let graph = &mut growing.graph;
            let id = NodeId(graph.nodes.len() as u32);
            graph.nodes.push(Node {
                op: Op::Input(graph.inputs.len() as u32),
                dimension: draft.dimension,
                kind: draft.kind,
                state: draft.state,
                basis: draft.basis,
                origin: draft.origin,
                name: None,
            });
            graph.values.push(draft.value);
            graph.inputs.push(Input {
                node: id,
                distribution: draft.distribution,
                degrees_of_freedom: draft.degrees_of_freedom,
                evaluation: draft.evaluation,
                text: draft.text,
            });
            id
        };
        self.name(id, Name { path: draft.path, symbol: draft.symbol, label: draft.label, unit: draft.unit });
        self.at(id)
    }

    /// Adds an estimator over columns; gives its outputs.
    ///
    /// `outputs` says dimension and kind of each output; `path` and `label` name its own contribution.
    ///
    /// # Errors
    /// Those of the rule.
    pub fn estimator(
        &self,
        rule: Arc<dyn Estimator>,
        columns: &[Quantity<'_>],
        outputs: &[(Dimension, Kind)],
        path: &str,
        label: &str,
    ) -> Result<Vec<Quantity<'_>>, Problem> {
        let estimate = {
            let graph = self.graph();
            let rows: Vec<&[f64]> = columns.iter().map(|column| graph.value(column.id).rows()).collect();
            rule.estimate(&rows)?
        };
        let values = estimate.values.clone();
        let estimator = {
            let mut growing = self.growing.borrow_mut();
            let graph = &mut growing.graph;
            graph.estimators.push(EstimatorNode {
                rule,
                columns: columns.iter().map(|column| column.id).collect(),
                first_output: NodeId(graph.nodes.len() as u32),
                estimate,
                path: path.into(),
                label: label.into(),
            });
            EstimatorId(graph.estimators.len() as u32 - 1)
        };
        let made = values.iter().zip(outputs).enumerate().map(|(index, (value, (dimension, kind)))| {
            let node = plain_node(Op::Output(estimator, index as u32), *dimension, *kind);
            self.push_with(node, Value::Scalar(*value))
        });
        Ok(made.collect())
    }

    /// Names a node: it becomes visible in results, budgets and trails.
    pub fn name(&self, id: NodeId, name: Name) {
        let mut growing = self.growing.borrow_mut();
        let method = growing.scopes.last().and_then(|(_, method)| *method);
        let graph = &mut growing.graph;
        let node = &mut graph.nodes[id.index()];
        if matches!(node.origin, Origin::Step)
            && let Some(method) = method
        {
            node.origin = Origin::Computed(method);
        }
        graph.names.insert(name.path.clone(), id);
        node.name = Some(name);
    }

    pub(super) fn push(&self, node: Node) -> Quantity<'_> {
        let value = {
            let graph = self.graph();
            apply(&node.op, |id| graph.value(id)).unwrap_or(Value::Scalar(f64::NAN))
        };
        self.push_with(node, value)
    }

    pub(super) fn edit(&self, id: NodeId, change: impl FnOnce(&mut Node)) {
        change(&mut self.growing.borrow_mut().graph.nodes[id.index()]);
    }

    fn push_with(&self, node: Node, value: Value) -> Quantity<'_> {
        let mut growing = self.growing.borrow_mut();
        let graph = &mut growing.graph;
        graph.nodes.push(node);
        graph.values.push(value);
        Quantity { builder: self, id: NodeId(graph.nodes.len() as u32 - 1) }
    }

    /// A node that stands for a fault already noted.
    pub(super) fn faulty(&self, code: Code, message: String) -> Quantity<'_> {
        self.problem(Problem::new(code, message));
        self.number(f64::NAN)
    }
}

pub(super) fn plain_node(op: Op, dimension: Dimension, kind: Kind) -> Node {
    Node { op, dimension, kind, state: None, basis: None, origin: Origin::Step, name: None }
}
