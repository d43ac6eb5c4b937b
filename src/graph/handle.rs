//! Ordinary arithmetic on handles of nodes.
//!
//! A method reads like its formula: `p * m_a / (z * r * t)`. Each operator checks dimensions, kinds, states and
//! unit bases; what does not fit leaves a problem with the builder and a node that is not a number.

use super::build::{Builder, plain_node};
use super::node::*;
use super::value::Value;
use crate::diagnostic::Code;
use crate::quantity::{Dimension, Kind, Unit};
use std::ops::{Add, Div, Mul, Neg, Sub};
use std::sync::Arc;

/// A handle of a node: a number or a column with dimension and kind.
#[derive(Clone, Copy)]
pub struct Quantity<'g> {
    pub(super) builder: &'g Builder,
    /// The node.
    pub id: NodeId,
}

/// What two masses must agree in before they meet in a sum.
struct Meeting {
    kind: Kind,
    state: Option<State>,
    basis: Option<Basis>,
}

impl<'g> Quantity<'g> {
    /// The builder this handle belongs to.
    pub fn builder(self) -> &'g Builder {
        self.builder
    }

    /// The number of a scalar, in coherent SI units; not a number for a column.
    pub fn number(self) -> f64 {
        self.builder.graph().number(self.id)
    }

    /// All rows; a scalar as a column of one.
    pub fn rows(self) -> Vec<f64> {
        self.builder.graph().value(self.id).rows().to_vec()
    }

    /// The value; the rows of a column are shared.
    pub fn value(self) -> Value {
        self.builder.graph().value(self.id).clone()
    }

    /// The dimension.
    pub fn dimension(self) -> Dimension {
        self.builder.graph().node(self.id).dimension
    }

    /// The kind.
    pub fn kind(self) -> Kind {
        self.builder.graph().node(self.id).kind
    }

    /// The state, for a mass that holds in vacuum or in air.
    pub fn state(self) -> Option<State> {
        self.builder.graph().node(self.id).state
    }

    /// Words for messages: the name if there is one, else the kind or the dimension.
    pub fn words(self) -> String {
        let graph = self.builder.graph();
        let node = graph.node(self.id);
        match (&node.name, node.kind) {
            (Some(name), Kind::Plain) => name.path.clone(),
            (Some(name), kind) => format!("{} ({})", name.path, kind.word()),
            (None, Kind::Plain) => format!("a quantity of dimension {}", node.dimension),
            (None, kind) => format!("a quantity of the kind {}", kind.word()),
        }
    }

    /// Names this node in the open scope.
    pub fn result(self, name: &str, symbol: &str, label: &str, unit: &Unit) -> Self {
        let path = self.builder.path(name);
        let target = if self.builder.graph().node(self.id).name.is_some() { self.alias() } else { self };
        let name = Name { path, symbol: symbol.into(), label: label.into(), unit: unit.clone() };
        self.builder.name(target.id, name);
        target
    }

    /// The same quantity as a node of its own, so that it can bear a second name.
    pub fn alias(self) -> Self {
        let made = self.one_operand(|id| Op::Power(id, 1), self.dimension());
        self.builder.with_node(made.id, self.node());
        made
    }

    /// The same number understood as another kind; for a method's last step.
    pub fn as_kind(self, kind: Kind) -> Self {
        match kind.dimension() {
            Some(dimension) if dimension != self.dimension() => self.builder.faulty(
                Code::DimensionMismatch,
                format!("{} cannot be {}: its dimension is {}.", self.words(), kind.word(), self.dimension()),
            ),
            _ => {
                let made = self.alias();
                self.builder.set_kind(made.id, kind);
                made
            }
        }
    }

    /// The same number in another state; for a stated link between vacuum and air.
    pub fn in_state(self, state: Option<State>) -> Self {
        let made = self.alias();
        self.builder.set_state(made.id, state);
        made
    }

    /// The same mass on a stated unit basis.
    pub fn on_basis(self, basis: Option<Basis>) -> Self {
        let made = self.alias();
        self.builder.edit(made.id, |node| node.basis = basis);
        made
    }

    /// √x; the dimension must have a root.
    pub fn square_root(self) -> Self {
        match self.dimension().square_root() {
            Some(dimension) => self.one_operand(Op::SquareRoot, dimension),
            None => self.builder.faulty(
                Code::DimensionMismatch,
                format!("The square root of {} has no unit: its dimension is {}.", self.words(), self.dimension()),
            ),
        }
    }

    /// x to a whole power.
    pub fn power(self, exponent: i32) -> Self {
        match self.dimension().power(exponent) {
            Some(dimension) => self.one_operand(|id| Op::Power(id, exponent), dimension),
            None => self
                .builder
                .faulty(Code::DimensionMismatch, format!("{} to the power {exponent} has no unit.", self.words())),
        }
    }

    /// x².
    pub fn squared(self) -> Self {
        self.power(2)
    }

    /// e to the power x.
    pub fn exponential(self) -> Self {
        self.of_number(Op::Exponential, "exp")
    }

    /// Natural logarithm.
    pub fn logarithm(self) -> Self {
        self.of_number(Op::Logarithm, "ln")
    }

    /// sin x.
    pub fn sine(self) -> Self {
        self.of_number(Op::Sine, "sin")
    }

    /// cos x.
    pub fn cosine(self) -> Self {
        self.of_number(Op::Cosine, "cos")
    }

    /// tan x.
    pub fn tangent(self) -> Self {
        self.of_number(Op::Tangent, "tan")
    }

    /// asin x.
    pub fn arc_sine(self) -> Self {
        self.of_number(Op::ArcSine, "asin")
    }

    /// acos x.
    pub fn arc_cosine(self) -> Self {
        self.of_number(Op::ArcCosine, "acos")
    }

    /// atan x.
    pub fn arc_tangent(self) -> Self {
        self.of_number(Op::ArcTangent, "atan")
    }

    /// The sum of a column.
    pub fn sum(self) -> Self {
        let made = self.one_operand(Op::Sum, self.dimension());
        self.keep_nature(made)
    }

    /// The arithmetic mean of a column.
    pub fn mean(self) -> Self {
        let rows = self.builder.graph().value(self.id).rows().len().max(1);
        let made = self.sum() / rows as f64;
        self.keep_nature(made)
    }

    /// One row of a column.
    pub fn row(self, index: usize) -> Self {
        let made = self.one_operand(|id| Op::Row(id, index as u32), self.dimension());
        self.keep_nature(made)
    }

    /// Rows made of weighted sums of rows of this column, with frozen weights.
    pub fn mix(self, weights: Vec<Vec<(u32, f64)>>) -> Self {
        let made = self.one_operand(|id| Op::Mix(id, weights.into()), self.dimension());
        self.keep_nature(made)
    }

    /// A column made of scalars of one nature.
    pub fn stack(list: &[Quantity<'g>]) -> Option<Quantity<'g>> {
        let first = *list.first()?;
        if let Some(other) = list.iter().find(|other| other.dimension() != first.dimension()) {
            return Some(first.mismatch(*other, "listed together"));
        }
        let ids: Arc<[NodeId]> = list.iter().map(|quantity| quantity.id).collect();
        let made = first.builder.push(plain_node(Op::Stack(ids), first.dimension(), Kind::Plain));
        Some(first.keep_nature(made))
    }

    fn node(self) -> Node {
        self.builder.graph().node(self.id).clone()
    }

    fn keep_nature(self, made: Self) -> Self {
        self.builder.with_node(made.id, self.node());
        made
    }

    fn one_operand(self, op: impl FnOnce(NodeId) -> Op, dimension: Dimension) -> Self {
        self.builder.push(plain_node(op(self.id), dimension, Kind::Plain))
    }

    fn of_number(self, op: impl FnOnce(NodeId) -> Op, word: &str) -> Self {
        if self.dimension() != Dimension::ONE {
            let message =
                format!("{word} takes a number, but {} has the dimension {}.", self.words(), self.dimension());
            return self.builder.faulty(Code::DimensionMismatch, message);
        }
        self.one_operand(op, Dimension::ONE)
    }

    fn mismatch(self, other: Self, deed: &str) -> Self {
        let message = format!(
            "{} and {} cannot be {deed}: their dimensions are {} and {}.",
            self.words(),
            other.words(),
            self.dimension(),
            other.dimension()
        );
        self.builder.faulty(Code::DimensionMismatch, message)
    }

    fn meet(self, other: Self, deed: &str, kinds: fn(Kind, Kind) -> Option<Kind>) -> Result<Meeting, Self> {
        if self.dimension() != other.dimension() {
            return Err(self.mismatch(other, deed));
        }
        let (a, b) = (self.node(), other.node());
        let refuse = |code, why: String| {
            Err(self.builder.faulty(code, format!("{} and {} cannot be {deed}: {why}.", self.words(), other.words())))
        };
        let (Some(kind), lengths) = (kinds(a.kind, b.kind), self.lengths(other)) else {
            return refuse(Code::KindMismatch, format!("one is {}, the other {}", a.kind.word(), b.kind.word()));
        };
        if let Some((left, right)) = lengths {
            return refuse(Code::DesignIncomplete, format!("one has {left} rows, the other {right}"));
        }
        if let (Some(left), Some(right)) = (a.state, b.state)
            && left != right
        {
            return refuse(Code::StateMismatch, format!("one holds in {}, the other in {}", left.word(), right.word()));
        }
        if let (Some(left), Some(right)) = (&a.basis, &b.basis)
            && left != right
        {
            return refuse(Code::BasisMismatch, format!("one is on the basis {left}, the other on {right}"));
        }
        Ok(Meeting { kind, state: a.state.or(b.state), basis: sum_basis(kind, a, b) })
    }

    fn lengths(self, other: Self) -> Option<(usize, usize)> {
        let graph = self.builder.graph();
        match (graph.value(self.id).length(), graph.value(other.id).length()) {
            (Some(left), Some(right)) if left != right => Some((left, right)),
            _ => None,
        }
    }

    fn sum_node(self, other: Self, deed: &str, op: Op, kinds: fn(Kind, Kind) -> Option<Kind>) -> Self {
        match self.meet(other, deed, kinds) {
            Err(faulty) => faulty,
            Ok(meeting) => {
                let mut node = plain_node(op, self.dimension(), meeting.kind);
                node.state = meeting.state;
                node.basis = meeting.basis;
                self.builder.push(node)
            }
        }
    }

    fn product_node(self, other: Self, op: Op, dimension: Dimension) -> Self {
        if let Some((left, right)) = self.lengths(other) {
            let message = format!("Columns of {left} and of {right} rows cannot be multiplied.");
            return self.builder.faulty(Code::DesignIncomplete, message);
        }
        let (a, b) = (self.node(), other.node());
        let mut node = plain_node(op, dimension, Kind::Plain);
        let bearer = if b.is_number() {
            Some(a)
        } else if a.is_number() {
            Some(b)
        } else {
            None
        };
        if let Some(bearer) = bearer.filter(|bearer| bearer.dimension == dimension) {
            node.kind = bearer.kind;
            node.state = bearer.state;
            node.basis = bearer.basis;
        }
        self.builder.push(node)
    }

    fn constant(self, value: f64) -> Self {
        self.builder.number(value)
    }
}

/// A difference of masses is the same on every basis; a mass keeps its own.
fn sum_basis(kind: Kind, a: Node, b: Node) -> Option<Basis> {
    match kind {
        Kind::MassDifference | Kind::ConventionalMassDifference => None,
        _ => a.basis.or(b.basis),
    }
}

impl Node {
    fn is_number(&self) -> bool {
        self.dimension == Dimension::ONE && self.kind == Kind::Plain
    }
}

impl Builder {
    fn with_node(&self, id: NodeId, nature: Node) {
        self.edit(id, |node| {
            node.kind = nature.kind;
            node.state = nature.state;
            node.basis = nature.basis;
        });
    }

    fn set_kind(&self, id: NodeId, kind: Kind) {
        self.edit(id, |node| node.kind = kind);
    }

    fn set_state(&self, id: NodeId, state: Option<State>) {
        self.edit(id, |node| node.state = state);
    }
}

impl<'g> Add for Quantity<'g> {
    type Output = Quantity<'g>;
    fn add(self, other: Self) -> Self {
        self.sum_node(other, "added", Op::Add(self.id, other.id), Kind::sum)
    }
}

impl<'g> Sub for Quantity<'g> {
    type Output = Quantity<'g>;
    fn sub(self, other: Self) -> Self {
        self.sum_node(other, "subtracted", Op::Subtract(self.id, other.id), Kind::difference)
    }
}

impl<'g> Mul for Quantity<'g> {
    type Output = Quantity<'g>;
    fn mul(self, other: Self) -> Self {
        self.product_node(other, Op::Multiply(self.id, other.id), self.dimension().times(other.dimension()))
    }
}

impl<'g> Div for Quantity<'g> {
    type Output = Quantity<'g>;
    fn div(self, other: Self) -> Self {
        self.product_node(other, Op::Divide(self.id, other.id), self.dimension().over(other.dimension()))
    }
}

impl<'g> Neg for Quantity<'g> {
    type Output = Quantity<'g>;
    fn neg(self) -> Self {
        let made = self.one_operand(Op::Negate, self.dimension());
        self.keep_nature(made)
    }
}

macro_rules! with_numbers {
    ($($trait:ident $method:ident;)*) => {$(
        impl<'g> $trait<f64> for Quantity<'g> {
            type Output = Quantity<'g>;
            fn $method(self, number: f64) -> Quantity<'g> {
                $trait::$method(self, self.constant(number))
            }
        }
        impl<'g> $trait<Quantity<'g>> for f64 {
            type Output = Quantity<'g>;
            fn $method(self, quantity: Quantity<'g>) -> Quantity<'g> {
                $trait::$method(quantity.constant(self), quantity)
            }
        }
    )*};
}

with_numbers! { Add add; Sub sub; Mul mul; Div div; }

impl Value {
    /// A column of these rows.
    pub fn column(rows: impl Into<Arc<[f64]>>) -> Value {
        Value::Column(rows.into())
    }
}
