//! Combination of several results of one quantity.
//!
//! # Source    weighted mean: JCGM 100:2008, 4.2.3 and common practice; covariance through shared inputs, 5.2.
//! # Formula   y = Σ w_i x_i,  Σ w_i = 1;  equal: w_i = 1/n;  inverse variance: w_i ∝ 1/u²(x_i)
//! The results are nodes of one graph: what they share is not divided by √n.
//! # Valid for results of one quantity; consistency is for the author to judge.

use super::{Method, WorkedExample, exact};
use crate::graph::{Builder, MethodInfo, Quantity};

/// The registry's line.
pub static METHOD: Method = Method {
    info: MethodInfo {
        name: "combination",
        title: "Combination of several results",
        source: "weighted mean, common practice; JCGM 100:2008, 5.2 (covariance through shared inputs)",
        formula: "y = Σ w_i x_i,  Σ w_i = 1",
        symbols: &[("y", "combined result", ""), ("x_i", "result", ""), ("w_i", "weight", "1")],
        valid_for: "results of one quantity",
    },
    examples: &[WorkedExample {
        source: "three 2017 values of h (10⁻³⁴ J s) with uncertainties 60, 165 and 89 in the last digits; weighted mean of a public meta-analysis test file",
        given: "6.626070133(60), 6.62607005883(16.5e-8), 6.626069934(89)",
        quantity: "weighted mean",
        printed: "6.6260700698189",
        found: || {
            let builder = Builder::default();
            let list = [6.626_070_133, 6.626_070_058_83, 6.626_069_934].map(|x| exact(&builder, x, "1"));
            weighted(&list, &inverse_variance_weights(&[6.0e-8, 16.5e-8, 8.9e-8])).map_or(f64::NAN, Quantity::number)
        },
    }],
};

/// Equal weights for `count` results.
pub fn equal_weights(count: usize) -> Vec<f64> {
    vec![1.0 / count.max(1) as f64; count]
}

/// Weights by inverse variance of the standard uncertainties given.
pub fn inverse_variance_weights(standard_uncertainties: &[f64]) -> Vec<f64> {
    let smallest = standard_uncertainties.iter().copied().fold(f64::INFINITY, f64::min);
    let raw: Vec<f64> = standard_uncertainties.iter().map(|u| (smallest / u) * (smallest / u)).collect();
    let total = crate::numeric::sum::sum(raw.iter().copied());
    raw.iter().map(|weight| weight / total).collect()
}

/// Σ w_i x_i, summed about the first result so that no digits are lost; `None` for an empty list.
pub fn weighted<'g>(results: &[Quantity<'g>], weights: &[f64]) -> Option<Quantity<'g>> {
    let first = *results.first()?;
    let departures = results.iter().zip(weights).skip(1).map(|(result, weight)| (*result - first) * *weight);
    let sum = departures.reduce(|sum, term| sum + term);
    Some(match sum {
        Some(sum) => first + sum,
        None => first.alias(),
    })
}
