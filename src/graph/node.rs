//! Nodes of the graph, and what is known of each.

use super::estimator::{EstimatorId, EstimatorNode};
use super::value::Value;
use crate::intake::{FileId, Place};
use crate::quantity::{Dimension, Kind, Unit};
use std::collections::BTreeMap;
use std::sync::Arc;

/// A node of the graph. Operands always have smaller numbers than the node that uses them.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub struct NodeId(pub u32);

impl NodeId {
    /// The position in the graph's lists.
    pub fn index(self) -> usize {
        self.0 as usize
    }
}

/// Whether a mass holds in vacuum or in air.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Hash)]
pub enum State {
    Vacuum,
    Air,
}

impl State {
    /// The word used in records and reports.
    pub fn word(self) -> &'static str {
        match self {
            State::Vacuum => "vacuum",
            State::Air => "air",
        }
    }
}

/// The unit basis of a mass: the realization or consensus value it refers to, by the laboratory's own name.
pub type Basis = Arc<str>;

/// What a node does with its operands. Operands are scalars or columns; a scalar serves every row of a column.
#[derive(Debug, Clone)]
pub enum Op {
    /// A number that is exact: a constant, a mask of rows, a frozen weight.
    Constant(Value),
    /// An input of the graph; the facts stand in [`Graph::inputs`].
    Input(u32),
    Add(NodeId, NodeId),
    Subtract(NodeId, NodeId),
    Multiply(NodeId, NodeId),
    Divide(NodeId, NodeId),
    Negate(NodeId),
    SquareRoot(NodeId),
    Exponential(NodeId),
    Logarithm(NodeId),
    Sine(NodeId),
    Cosine(NodeId),
    Tangent(NodeId),
    ArcSine(NodeId),
    ArcCosine(NodeId),
    ArcTangent(NodeId),
    Power(NodeId, i32),
    /// The sum over a column.
    Sum(NodeId),
    /// One row of a column.
    Row(NodeId, u32),
    /// Each row a weighted sum of rows of a column: selection, interpolation. Weights are frozen.
    Mix(NodeId, Arc<[Vec<(u32, f64)>]>),
    /// A column made of scalars.
    Stack(Arc<[NodeId]>),
    /// Output number `.1` of an estimator.
    Output(EstimatorId, u32),
}

impl Op {
    /// The operands, in order; an estimator's columns stand with the estimator.
    pub fn operands(&self) -> Vec<NodeId> {
        match self {
            Op::Constant(_) | Op::Input(_) | Op::Output(..) => Vec::new(),
            Op::Add(a, b) | Op::Subtract(a, b) | Op::Multiply(a, b) | Op::Divide(a, b) => vec![*a, *b],
            Op::Stack(list) => list.to_vec(),
            Op::Negate(a)
            | Op::SquareRoot(a)
            | Op::Exponential(a)
            | Op::Logarithm(a)
            | Op::Sine(a)
            | Op::Cosine(a)
            | Op::Tangent(a)
            | Op::ArcSine(a)
            | Op::ArcCosine(a)
            | Op::ArcTangent(a)
            | Op::Power(a, _)
            | Op::Sum(a)
            | Op::Row(a, _)
            | Op::Mix(a, _) => vec![*a],
        }
    }

    /// The word for the operation in the derivation attached to a report.
    pub fn word(&self) -> &'static str {
        match self {
            Op::Constant(_) => "constant",
            Op::Input(_) => "input",
            Op::Add(..) => "add",
            Op::Subtract(..) => "subtract",
            Op::Multiply(..) => "multiply",
            Op::Divide(..) => "divide",
            Op::Negate(_) => "negate",
            Op::SquareRoot(_) => "square_root",
            Op::Exponential(_) => "exp",
            Op::Logarithm(_) => "ln",
            Op::Sine(_) => "sin",
            Op::Cosine(_) => "cos",
            Op::Tangent(_) => "tan",
            Op::ArcSine(_) => "asin",
            Op::ArcCosine(_) => "acos",
            Op::ArcTangent(_) => "atan",
            Op::Power(..) => "power",
            Op::Sum(_) => "sum",
            Op::Row(..) => "row",
            Op::Mix(..) => "mix",
            Op::Stack(_) => "stack",
            Op::Output(..) => "output",
        }
    }
}

/// The distribution assigned to an input about its estimate. Lengths are in the input's coherent SI unit.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum Distribution {
    Exact,
    Normal {
        standard_uncertainty: f64,
    },
    /// Scaled and shifted t with the input's degrees of freedom; `scale` is the standard uncertainty as stated.
    StudentT {
        scale: f64,
    },
    Rectangular {
        half_width: f64,
    },
    Triangular {
        half_width: f64,
    },
    Arcsine {
        half_width: f64,
    },
    /// Rectangular with limits that are themselves known to ± `inexactness` (JCGM 101, 6.4.3).
    RectangularInexact {
        half_width: f64,
        inexactness: f64,
    },
    /// Symmetric trapezoid whose top is `beta` times as wide as its base (6.4.4).
    Trapezoidal {
        half_width: f64,
        beta: f64,
    },
    /// Of a quantity that cannot be negative and is known by its mean alone (6.4.10).
    Exponential {
        mean: f64,
    },
    /// Of a rate known by a number of counts (6.4.11): shape and rate parameters.
    Gamma {
        shape: f64,
        rate: f64,
    },
}

impl Distribution {
    /// The standard uncertainty as first-order propagation uses it (JCGM 100, 4.3). A t distribution counts with its scale.
    pub fn standard_uncertainty(self) -> f64 {
        match self {
            Distribution::Exact => 0.0,
            Distribution::Normal { standard_uncertainty } => standard_uncertainty,
            Distribution::StudentT { scale } => scale,
            Distribution::Rectangular { half_width } => half_width / 3f64.sqrt(),
            Distribution::Triangular { half_width } => half_width / 6f64.sqrt(),
            Distribution::Arcsine { half_width } => half_width / 2f64.sqrt(),
            Distribution::RectangularInexact { half_width, inexactness } => {
                (half_width * half_width / 3.0 + inexactness * inexactness / 9.0).sqrt()
            }
            Distribution::Trapezoidal { half_width, beta } => half_width * ((1.0 + beta * beta) / 6.0).sqrt(),
            Distribution::Exponential { mean } => mean,
            Distribution::Gamma { shape, rate } => shape.sqrt() / rate,
        }
    }

    /// The word printed in a budget.
    pub fn word(self) -> &'static str {
        match self {
            Distribution::Exact => "exact",
            Distribution::Normal { .. } => "normal",
            Distribution::StudentT { .. } => "t",
            Distribution::Rectangular { .. } => "rectangular",
            Distribution::Triangular { .. } => "triangular",
            Distribution::Arcsine { .. } => "arcsine",
            Distribution::RectangularInexact { .. } => "rectangular, limits inexact",
            Distribution::Trapezoidal { .. } => "trapezoidal",
            Distribution::Exponential { .. } => "exponential",
            Distribution::Gamma { .. } => "gamma",
        }
    }

    /// Whether the input has no uncertainty.
    pub fn is_exact(self) -> bool {
        self.standard_uncertainty() == 0.0
    }
}

/// How the uncertainty of an input was evaluated (JCGM 100, 4.2 and 4.3).
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Evaluation {
    TypeA,
    TypeB,
}

impl Evaluation {
    /// The letter printed in a budget.
    pub fn letter(self) -> &'static str {
        match self {
            Evaluation::TypeA => "A",
            Evaluation::TypeB => "B",
        }
    }
}

/// A column of readings: where each row came from.
#[derive(Debug, Clone, PartialEq)]
pub struct ReadingColumn {
    pub file: FileId,
    pub column: String,
    /// The line, from 1, of each row.
    pub lines: Arc<[u32]>,
}

/// Where a node's number comes from.
#[derive(Debug, Clone, PartialEq)]
pub enum Origin {
    /// One reading in a record.
    Reading(Place),
    /// A column of readings in a raw data file.
    Readings(ReadingColumn),
    /// Readings written as a list in a record.
    ReadingList(Arc<[Place]>),
    /// A value stated in a record: a certificate, a specification.
    Stated(Place),
    /// A constant with its source.
    Constant(&'static str),
    /// A value that nobody wrote; the report lists it as an assumption.
    Assumed(&'static str),
    /// Computed by a method.
    Computed(&'static MethodInfo),
    /// A step inside a method.
    Step,
}

impl Origin {
    /// The word used in results and reports.
    pub fn word(&self) -> &'static str {
        match self {
            Origin::Reading(_) | Origin::Readings(_) | Origin::ReadingList(_) => "reading",
            Origin::Stated(_) => "stated input",
            Origin::Constant(_) => "constant",
            Origin::Assumed(_) => "assumption",
            Origin::Computed(_) => "computed",
            Origin::Step => "step",
        }
    }

    /// The place in a record, where there is a single one.
    pub fn place(&self) -> Option<Place> {
        match self {
            Origin::Reading(place) | Origin::Stated(place) => Some(*place),
            Origin::ReadingList(places) => Some(places.first()?.to(*places.last()?)),
            _ => None,
        }
    }
}

/// What a method says of itself: printed in trails, reports and the table of methods.
#[derive(Debug, PartialEq)]
pub struct MethodInfo {
    /// Lower case with hyphens; unique in the registry.
    pub name: &'static str,
    pub title: &'static str,
    /// Authors, journal or standard, year, equation or clause.
    pub source: &'static str,
    /// The model equation as plain text.
    pub formula: &'static str,
    /// Symbols of the formula: symbol, meaning, unit.
    pub symbols: &'static [(&'static str, &'static str, &'static str)],
    /// The range in which the formula holds, in words.
    pub valid_for: &'static str,
}

/// An input: a number from outside the graph with all that is known of it.
#[derive(Debug, Clone)]
pub struct Input {
    pub node: NodeId,
    pub distribution: Distribution,
    /// Degrees of freedom of the standard uncertainty; infinite when it is taken as known.
    pub degrees_of_freedom: f64,
    pub evaluation: Evaluation,
    /// The text as the author typed it, where there is one.
    pub text: Option<String>,
}

/// The name under which results, budgets and trails show a node.
#[derive(Debug, Clone, PartialEq)]
pub struct Name {
    /// Path such as `W1.air.density`.
    pub path: String,
    /// Symbol such as `ρ_a`; what follows the underscore is a subscript.
    pub symbol: String,
    /// What the quantity is, in words.
    pub label: String,
    /// The unit in which it is shown.
    pub unit: Unit,
}

/// One node.
#[derive(Debug, Clone)]
pub struct Node {
    pub op: Op,
    pub dimension: Dimension,
    pub kind: Kind,
    pub state: Option<State>,
    pub basis: Option<Basis>,
    pub origin: Origin,
    pub name: Option<Name>,
}

/// Inputs with stated correlation coefficients: a certificate's matrix.
#[derive(Debug, Clone, PartialEq)]
pub struct CorrelatedInputs {
    pub path: String,
    /// Numbers of scalar inputs.
    pub inputs: Vec<u32>,
    /// Correlation coefficients, symmetric, ones on the diagonal.
    pub coefficients: Vec<Vec<f64>>,
}

impl CorrelatedInputs {
    /// The position of an input in the group.
    pub fn position(&self, input: u32) -> Option<usize> {
        self.inputs.iter().position(|other| *other == input)
    }
}

/// The graph of quantities of one laboratory folder, with the value of every node.
#[derive(Debug, Default)]
pub struct Graph {
    pub nodes: Vec<Node>,
    pub values: Vec<Value>,
    pub inputs: Vec<Input>,
    pub estimators: Vec<EstimatorNode>,
    pub correlated: Vec<CorrelatedInputs>,
    /// Named nodes by path.
    pub names: BTreeMap<String, NodeId>,
}

impl Graph {
    /// The node behind an id.
    pub fn node(&self, id: NodeId) -> &Node {
        &self.nodes[id.index()]
    }

    /// The value behind an id.
    pub fn value(&self, id: NodeId) -> &Value {
        &self.values[id.index()]
    }

    /// The number of a scalar node; not a number for a column.
    pub fn number(&self, id: NodeId) -> f64 {
        self.value(id).number()
    }

    /// The node with this path.
    pub fn find(&self, path: &str) -> Option<NodeId> {
        self.names.get(path).copied()
    }

    /// The facts of an input node.
    pub fn input(&self, id: NodeId) -> Option<&Input> {
        match self.node(id).op {
            Op::Input(number) => self.inputs.get(number as usize),
            _ => None,
        }
    }

    /// The nodes a node is computed from, columns of estimators included.
    pub fn operands(&self, id: NodeId) -> Vec<NodeId> {
        match &self.node(id).op {
            Op::Output(estimator, _) => self.estimators[estimator.index()].columns.clone(),
            op => op.operands(),
        }
    }
}
