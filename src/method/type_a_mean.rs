//! Mean of repeated readings with its Type A standard uncertainty.
//!
//! # Source    JCGM 100:2008, 4.2.1 to 4.2.3 (equations 3 to 5), example in 4.4.3.
//! # Formula   q = Σ q_k / n;  s² = Σ (q_k − q)² / (n − 1);  u(q) = s/√n;  ν = n − 1
//! # Valid for independent readings under repeatability conditions; n ≥ 2.

use super::{Method, WorkedExample, deviation_or_nan, mean_or_nan};
use crate::diagnostic::{Code, Problem};
use crate::graph::{Estimate, Estimator, MethodInfo};

/// The registry's line.
pub static METHOD: Method = Method {
    info: MethodInfo {
        name: "type-a-mean",
        title: "Mean of repeated readings",
        source: "JCGM 100:2008, 4.2",
        formula: "q = Σ q_k/n;  s² = Σ (q_k − q)²/(n − 1);  u(q) = s/√n;  ν = n − 1",
        symbols: &[
            ("q_k", "reading", ""),
            ("q", "mean", ""),
            ("s", "experimental standard deviation", ""),
            ("n", "number of readings", "1"),
        ],
        valid_for: "independent readings, n ≥ 2",
    },
    examples: &[
        WorkedExample {
            source: "JCGM 100:2008, 4.4.3, table 1",
            given: "20 temperatures from 96.90 °C to 102.72 °C",
            quantity: "mean/°C",
            printed: "100.145",
            found: || guide_example(0),
        },
        WorkedExample {
            source: "JCGM 100:2008, 4.4.3, table 1",
            given: "the same",
            quantity: "standard uncertainty of the mean/°C",
            printed: "0.333",
            found: || guide_example(1),
        },
    ],
};

/// The rule: one column, one output.
#[derive(Debug, Clone, Copy)]
pub struct TypeAMean;

impl Estimator for TypeAMean {
    fn outputs(&self) -> usize {
        1
    }

    fn estimate(&self, columns: &[&[f64]]) -> Result<Estimate, Problem> {
        let readings = columns.first().copied().unwrap_or_default();
        if readings.len() < 2 {
            let message = format!(
                "{} reading has no scatter; a mean with its own uncertainty needs two or more.",
                readings.len()
            );
            return Err(Problem::new(Code::DesignIncomplete, message));
        }
        let count = readings.len() as f64;
        let mean = mean_or_nan(readings);
        let s = deviation_or_nan(readings);
        Ok(Estimate {
            values: vec![mean],
            jacobian: vec![vec![vec![1.0 / count; readings.len()]]],
            own_covariance: vec![vec![s * s / count]],
            degrees_of_freedom: count - 1.0,
            decisions: Vec::new(),
            residuals: readings.iter().map(|reading| reading - mean).collect(),
        })
    }
}

fn guide_example(which: usize) -> f64 {
    let readings = [
        96.90, 98.18, 98.25, 98.61, 99.03, 99.49, 99.56, 99.74, 99.89, 100.07, 100.33, 100.42, 100.68, 100.95, 101.11,
        101.20, 101.57, 101.84, 102.36, 102.72,
    ];
    TypeAMean.estimate(&[&readings]).map_or(f64::NAN, |estimate| match which {
        0 => estimate.values[0],
        _ => estimate.own_covariance[0][0].sqrt(),
    })
}
