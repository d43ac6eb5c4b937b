//! Estimators: nodes with several outputs computed from columns, with an uncertainty of their own.
//!
//! A Type A mean, an elimination of drift, a least-squares fit or a combination of results is one estimator. It
//! takes columns (a scalar counts as a column of one), gives its outputs with their derivatives with respect to
//! every row, and the covariance that comes from the scatter it has seen, with its degrees of freedom. What it
//! decided on the way (order, exclusions, a between component) is frozen and printed.

use super::node::NodeId;
use crate::diagnostic::Problem;
use std::fmt;
use std::sync::Arc;

/// An estimator of the graph.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub struct EstimatorId(pub u32);

impl EstimatorId {
    /// The position in the graph's list.
    pub fn index(self) -> usize {
        self.0 as usize
    }
}

/// Something an estimator decided, in words, for the report.
#[derive(Debug, Clone, PartialEq)]
pub struct Decision {
    pub what: String,
    pub decided: String,
}

/// What an estimator found.
#[derive(Debug, Clone, Default)]
pub struct Estimate {
    /// The outputs, in coherent SI units.
    pub values: Vec<f64>,
    /// `jacobian[column][output][row]`: derivative of each output with respect to each row of each column.
    pub jacobian: Vec<Vec<Vec<f64>>>,
    /// Covariance of the outputs from the scatter seen, `outputs × outputs`.
    pub own_covariance: Vec<Vec<f64>>,
    /// Degrees of freedom of that covariance.
    pub degrees_of_freedom: f64,
    /// What was decided.
    pub decisions: Vec<Decision>,
    /// Observed minus fitted values, where that has a meaning.
    pub residuals: Vec<f64>,
}

/// A rule that turns columns into outputs.
pub trait Estimator: Send + Sync {
    /// How many outputs there are.
    fn outputs(&self) -> usize;
    /// The outputs for these columns.
    ///
    /// # Errors
    /// When the columns do not allow the estimate; nothing is guessed.
    fn estimate(&self, columns: &[&[f64]]) -> Result<Estimate, Problem>;
}

/// An estimator in the graph: its rule, its columns and what it found at the estimates of the inputs.
#[derive(Clone)]
pub struct EstimatorNode {
    pub rule: Arc<dyn Estimator>,
    pub columns: Vec<NodeId>,
    /// The node of output 0; the others follow it.
    pub first_output: NodeId,
    pub estimate: Estimate,
    /// Path of the estimator's own contribution in a budget, such as `W1.repeatability`.
    pub path: String,
    /// What that contribution is, in words.
    pub label: String,
}

impl fmt::Debug for EstimatorNode {
    fn fmt(&self, formatter: &mut fmt::Formatter<'_>) -> fmt::Result {
        formatter.debug_struct("EstimatorNode").field("path", &self.path).field("columns", &self.columns).finish()
    }
}
