//! Numbers that describe columns: a test statistic, a number of readings, a scatter.
//!
//! They stand in results and trails with the columns they come from, but pass no uncertainty on: what a reading's
//! uncertainty does to a test of consistency is no part of a measurement.

use crate::diagnostic::Problem;
use crate::graph::{Decision, Estimate, Estimator};

type Compute = Box<dyn Fn(&[&[f64]]) -> Vec<f64> + Send + Sync>;

/// The rule of an estimator whose outputs only describe its columns.
pub struct Statistic {
    outputs: usize,
    compute: Compute,
    standard_uncertainties: Vec<f64>,
    decisions: Vec<Decision>,
}

impl Statistic {
    /// A rule with so many outputs.
    pub fn new(outputs: usize, compute: impl Fn(&[&[f64]]) -> Vec<f64> + Send + Sync + 'static) -> Statistic {
        let standard_uncertainties = vec![0.0; outputs];
        Statistic { outputs, compute: Box::new(compute), standard_uncertainties, decisions: Vec::new() }
    }

    /// With a standard uncertainty for each output, from the number of readings alone.
    pub fn with_uncertainties(mut self, standard_uncertainties: Vec<f64>) -> Statistic {
        self.standard_uncertainties = standard_uncertainties;
        self
    }

    /// With what was decided.
    pub fn with_decisions(mut self, decisions: Vec<Decision>) -> Statistic {
        self.decisions = decisions;
        self
    }
}

impl Estimator for Statistic {
    fn outputs(&self) -> usize {
        self.outputs
    }

    fn estimate(&self, columns: &[&[f64]]) -> Result<Estimate, Problem> {
        let silent = |column: &&[f64]| vec![vec![0.0; column.len()]; self.outputs];
        let own =
            |i: usize, j: usize| if i == j { self.standard_uncertainties.get(i).map_or(0.0, |u| u * u) } else { 0.0 };
        Ok(Estimate {
            values: (self.compute)(columns),
            jacobian: columns.iter().map(silent).collect(),
            own_covariance: (0..self.outputs).map(|i| (0..self.outputs).map(|j| own(i, j)).collect()).collect(),
            degrees_of_freedom: f64::INFINITY,
            decisions: self.decisions.clone(),
            residuals: Vec::new(),
        })
    }
}

/// Standard uncertainty of an experimental standard deviation, s/√(2ν), for normal readings (JCGM 100:2008, E.4.3).
pub fn uncertainty_of_deviation(deviation: f64, degrees_of_freedom: f64) -> f64 {
    if degrees_of_freedom > 0.0 { deviation / (2.0 * degrees_of_freedom).sqrt() } else { 0.0 }
}

/// A number to three significant digits, for the words of a decision.
pub fn brief(value: f64) -> String {
    let rounded: f64 = format!("{value:.2e}").parse().unwrap_or(value);
    match rounded.abs() {
        size if size >= 1e6 || (size < 1e-4 && size > 0.0) => format!("{rounded:e}"),
        size if size >= 100.0 || size == 0.0 => format!("{rounded:.0}"),
        size if size >= 10.0 => format!("{rounded:.1}"),
        size if size >= 1.0 => format!("{rounded:.2}"),
        _ => format!("{rounded}"),
    }
}

/// A probability in words: two significant digits, or that it is very small.
pub fn probability(p: f64) -> String {
    match p {
        p if p < 1e-4 => "p < 0.0001".into(),
        p if p > 0.9999 => "p > 0.9999".into(),
        p if p >= 0.1 => format!("p = {p:.2}"),
        p => format!("p = {}", format!("{p:.1e}").parse::<f64>().unwrap_or(p)),
    }
}
