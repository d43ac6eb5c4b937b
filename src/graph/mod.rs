//! The graph of quantities: what is computed, what uncertainty is propagated through, and what the trail prints.
//!
//! | file            | holds                                                                    |
//! |-----------------|--------------------------------------------------------------------------|
//! | `node`          | nodes, operations, inputs, origins                                       |
//! | `value`         | numbers and columns of numbers, and the elementary operations on them    |
//! | `build`         | [`Builder`]: growing the graph, scopes, names                            |
//! | `handle`        | [`Quantity`]: ordinary arithmetic on handles                             |
//! | `estimator`     | several outputs from columns: means, fits, combinations                  |
//! | `evaluate`      | the graph with some inputs displaced                                     |
//! | `sensitivity`   | one reverse sweep per measurand                                          |
//! | `second_order`  | the law of propagation with its terms of second order                    |
//! | `uncertainty`   | standard uncertainty, covariance, effective degrees of freedom, coverage |
//! | `joint`         | uncertainties, covariance and correlation of any set of results          |
//! | `adaptive`      | trials until the results are stable                                       |
//! | `draw`          | draws of inputs, singly and jointly                                      |
//! | `tape`          | scalars as operations on rows of trials                                   |
//! | `budget`        | the uncertainty budget                                                   |
//! | `trail`         | from a result down to readings                                           |
//! | `interval`      | estimate, uncertainty and coverage intervals of a run of trials           |
//! | `monte_carlo`   | propagation of distributions in blocks of trials                         |
//!
//! Values are in coherent SI units. A sum of unlike dimensions, kinds, states or unit bases cannot be built.

mod adaptive;
mod budget;
mod build;
mod draw;
mod estimator;
mod evaluate;
mod handle;
mod interval;
mod joint;
mod monte_carlo;
mod node;
mod second_order;
mod sensitivity;
mod tape;
mod trail;
mod uncertainty;
mod value;

pub use adaptive::{Adaptive, propagate_until_stable};
pub use budget::{Budget, BudgetLine, budget};
pub use build::{Assumption, Builder, InputDraft, ScopeGuard};
pub use estimator::{Decision, Estimate, Estimator, EstimatorId, EstimatorNode};
pub use evaluate::evaluate_displaced;
pub use handle::Quantity;
pub use interval::{Distributed, Histogram, Validation, distributed, histogram, numerical_tolerance};
pub use joint::{Joint, joint};
pub use monte_carlo::{Sampler, Trials, linearity_departure, propagate_distributions};
pub use node::{
    Basis, CorrelatedInputs, Distribution, Evaluation, Graph, Input, MethodInfo, Name, Node, NodeId, Op, Origin,
    ReadingColumn, State,
};
pub use second_order::second_order_uncertainty;
pub use sensitivity::{Sensitivities, Source, sensitivities};
pub use trail::{TrailStep, TrailSteps, trail};
pub use uncertainty::{
    Coverage, DegreesOfFreedomRule, Settings, correlation, covariance, coverage, degrees_of_freedom,
    standard_uncertainty, unshared_variances,
};
pub use value::Value;
