//! Numbers and columns of numbers, and the elementary operations on them.

use super::node::{NodeId, Op};
use crate::numeric::elementary as f;
use std::sync::Arc;

/// A number, or a column of numbers.
#[derive(Debug, Clone, PartialEq)]
pub enum Value {
    Scalar(f64),
    Column(Arc<[f64]>),
}

impl Value {
    /// The number; not a number for a column.
    pub fn number(&self) -> f64 {
        match self {
            Value::Scalar(number) => *number,
            Value::Column(_) => f64::NAN,
        }
    }

    /// All numbers, a scalar as a column of one.
    pub fn rows(&self) -> &[f64] {
        match self {
            Value::Scalar(number) => std::slice::from_ref(number),
            Value::Column(rows) => rows,
        }
    }

    /// The number that serves row `index`.
    pub fn at(&self, index: usize) -> f64 {
        match self {
            Value::Scalar(number) => *number,
            Value::Column(rows) => rows.get(index).copied().unwrap_or(f64::NAN),
        }
    }

    /// The number of rows of a column.
    pub fn length(&self) -> Option<usize> {
        match self {
            Value::Scalar(_) => None,
            Value::Column(rows) => Some(rows.len()),
        }
    }

    /// Whether every number is finite.
    pub fn is_finite(&self) -> bool {
        self.rows().iter().all(|number| number.is_finite())
    }

    /// The operation on every row.
    pub fn map(&self, operation: impl Fn(f64) -> f64) -> Value {
        match self {
            Value::Scalar(number) => Value::Scalar(operation(*number)),
            Value::Column(rows) => Value::Column(rows.iter().map(|&row| operation(row)).collect()),
        }
    }

    /// The operation on pairs of rows; a scalar serves every row of the other.
    pub fn zip(&self, other: &Value, operation: impl Fn(f64, f64) -> f64) -> Value {
        match (self, other) {
            (Value::Scalar(a), Value::Scalar(b)) => Value::Scalar(operation(*a, *b)),
            (Value::Scalar(a), Value::Column(rows)) => Value::Column(rows.iter().map(|&b| operation(*a, b)).collect()),
            (Value::Column(rows), Value::Scalar(b)) => Value::Column(rows.iter().map(|&a| operation(a, *b)).collect()),
            (Value::Column(left), Value::Column(right)) => {
                Value::Column(left.iter().zip(right.iter()).map(|(&a, &b)| operation(a, b)).collect())
            }
        }
    }
}

/// The value of an operation, given the values of its operands. Inputs and estimator outputs are set by the caller.
pub(super) fn apply<'v>(op: &Op, value: impl Fn(NodeId) -> &'v Value) -> Option<Value> {
    Some(match op {
        Op::Constant(constant) => constant.clone(),
        Op::Input(_) | Op::Output(..) => return None,
        Op::Add(a, b) => value(*a).zip(value(*b), |a, b| a + b),
        Op::Subtract(a, b) => value(*a).zip(value(*b), |a, b| a - b),
        Op::Multiply(a, b) => value(*a).zip(value(*b), |a, b| a * b),
        Op::Divide(a, b) => value(*a).zip(value(*b), |a, b| a / b),
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
        | Op::Power(a, _) => value(*a).map(|a| apply_scalar(op, a)),
        Op::Sum(a) => Value::Scalar(crate::numeric::sum::sum(value(*a).rows().iter().copied())),
        Op::Row(a, row) => Value::Scalar(value(*a).at(*row as usize)),
        Op::Mix(a, weights) => {
            let source = value(*a);
            Value::Column(
                weights
                    .iter()
                    .map(|row| row.iter().map(|(index, weight)| weight * source.at(*index as usize)).sum())
                    .collect(),
            )
        }
        Op::Stack(list) => Value::Column(list.iter().map(|id| value(*id).number()).collect()),
    })
}

/// A one-operand operation on one number.
pub(super) fn apply_scalar(op: &Op, x: f64) -> f64 {
    match op {
        Op::Negate(_) => -x,
        Op::SquareRoot(_) => f::sqrt(x),
        Op::Exponential(_) => f::exp(x),
        Op::Logarithm(_) => f::ln(x),
        Op::Sine(_) => f::sin(x),
        Op::Cosine(_) => f::cos(x),
        Op::Tangent(_) => f::tan(x),
        Op::ArcSine(_) => f::asin(x),
        Op::ArcCosine(_) => f::acos(x),
        Op::ArcTangent(_) => f::atan(x),
        Op::Power(_, exponent) => f::powi(x, *exponent),
        _ => f64::NAN,
    }
}

/// The derivative of a one-operand operation, given its operand and its value.
pub(super) fn slope(op: &Op, operand: f64, result: f64) -> f64 {
    match op {
        Op::Negate(_) => -1.0,
        Op::SquareRoot(_) => 0.5 / result,
        Op::Exponential(_) => result,
        Op::Logarithm(_) => 1.0 / operand,
        Op::Sine(_) => f::cos(operand),
        Op::Cosine(_) => -f::sin(operand),
        Op::Tangent(_) => 1.0 + result * result,
        Op::ArcSine(_) => 1.0 / f::sqrt(1.0 - operand * operand),
        Op::ArcCosine(_) => -1.0 / f::sqrt(1.0 - operand * operand),
        Op::ArcTangent(_) => 1.0 / (1.0 + operand * operand),
        Op::Power(_, exponent) => f64::from(*exponent) * f::powi(operand, exponent - 1),
        _ => 1.0,
    }
}
