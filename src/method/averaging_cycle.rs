//! Differences of several weights from cycles A B1 … Bn A, by averaging the two weighings of the reference.
//!
//! # Source    OIML R 111-1:2004, C.4.2 (cycle AB1…BnA; no interpolation of drift), C.6.1 (scatter).
//! # Formula   d_j = B_j − (A_1 + A_2)/2 in each cycle;  D_j = mean of d_j over the cycles;  u_A(D_j) = s_j/√n
//!     B_j       weighing of test weight number j, in mass    kg
//!     A_1, A_2  weighings of the reference                   kg
//! # Valid for up to five test weights of the same nominal value, weighed in one cycle.

use super::weighing_cycle::Dispersion;
use super::{Method, WorkedExample, deviation_or_nan, mean_or_nan};
use crate::diagnostic::{Code, Problem};
use crate::graph::{Decision, Estimate, Estimator, MethodInfo};

/// The registry's line.
pub static METHOD: Method = Method {
    info: MethodInfo {
        name: "averaging-cycle",
        title: "Weighing cycles A B1 … Bn A by averaging of the reference",
        source: "OIML R 111-1:2004, C.4.2 and C.6.1",
        formula: "d_j = B_j − (A_1 + A_2)/2 in each cycle;  D_j = mean of d_j;  u_A(D_j) = s_j/√n",
        symbols: &[
            ("B_j", "weighing of test weight j, in mass", "kg"),
            ("A_1", "first weighing of the reference", "kg"),
            ("A_2", "last weighing of the reference", "kg"),
            ("D_j", "mean difference", "kg"),
        ],
        valid_for: "up to five test weights in one cycle",
    },
    examples: &[WorkedExample {
        source: "OIML R 111-1:2004, C.4 (recalled), numbers invented and computed in high precision",
        given: "(0; 0.51, −0.22, 1.07; 0.06), (0.05; 0.57, −0.15, 1.15; 0.1) mg",
        quantity: "mean difference of the third weight/mg",
        printed: "1.0575",
        found: || {
            let readings = [0.0, 0.51, -0.22, 1.07, 0.06, 0.05, 0.57, -0.15, 1.15, 0.1];
            let rule =
                AveragedDifferences { weights: 3, cycles: vec![cycle(0, 3), cycle(5, 3)], dispersion: Dispersion::Own };
            rule.estimate(&[&readings]).map_or(f64::NAN, |estimate| estimate.values[2])
        },
    }],
};

/// Rows of one cycle: the reference, the test weights, the reference.
#[derive(Debug, Clone, PartialEq)]
pub struct AveragingCycle {
    pub first: usize,
    pub tests: Vec<usize>,
    pub last: usize,
}

/// The rule that gives one mean difference for each test weight.
#[derive(Debug, Clone)]
pub struct AveragedDifferences {
    pub weights: usize,
    /// Cycles in use.
    pub cycles: Vec<AveragingCycle>,
    pub dispersion: Dispersion,
}

impl AveragedDifferences {
    /// The differences of every cycle, weight by weight.
    pub fn differences(&self, y: &[f64]) -> Vec<Vec<f64>> {
        let of = |weight: usize| {
            self.cycles.iter().map(|cycle| y[cycle.tests[weight]] - (y[cycle.first] + y[cycle.last]) / 2.0).collect()
        };
        (0..self.weights).map(of).collect()
    }

    fn scatter(&self, differences: &[f64]) -> (f64, f64) {
        match self.dispersion {
            Dispersion::Own => (deviation_or_nan(differences), differences.len() as f64 - 1.0),
            Dispersion::PooledCycle { standard_deviation, degrees_of_freedom }
            | Dispersion::PooledSeries { standard_deviation, degrees_of_freedom } => {
                (standard_deviation, degrees_of_freedom)
            }
        }
    }

    fn check(&self, rows: usize) -> Result<(), Problem> {
        let complete = self.cycles.iter().all(|cycle| {
            cycle.tests.len() == self.weights
                && cycle.tests.iter().chain([&cycle.first, &cycle.last]).all(|row| *row < rows)
        });
        if !complete || self.cycles.is_empty() || (self.cycles.len() < 2 && self.dispersion == Dispersion::Own) {
            let message =
                format!("{} cycles of {} test weights are too few or incomplete.", self.cycles.len(), self.weights);
            return Err(
                Problem::new(Code::DesignIncomplete, message).hint("Weigh more cycles, or write `type_a: pooled`.")
            );
        }
        Ok(())
    }
}

impl Estimator for AveragedDifferences {
    fn outputs(&self) -> usize {
        self.weights
    }

    fn estimate(&self, columns: &[&[f64]]) -> Result<Estimate, Problem> {
        let y = columns.first().copied().unwrap_or_default();
        self.check(y.len())?;
        let differences = self.differences(y);
        let count = self.cycles.len() as f64;
        let mut jacobian = vec![vec![0.0; y.len()]; self.weights];
        for (weight, row) in jacobian.iter_mut().enumerate() {
            for cycle in &self.cycles {
                row[cycle.tests[weight]] += 1.0 / count;
                row[cycle.first] -= 0.5 / count;
                row[cycle.last] -= 0.5 / count;
            }
        }
        let mut own_covariance = vec![vec![0.0; self.weights]; self.weights];
        for (weight, row) in own_covariance.iter_mut().enumerate() {
            let (scatter, _) = self.scatter(&differences[weight]);
            row[weight] = scatter * scatter / count;
        }
        Ok(Estimate {
            values: differences.iter().map(|list| mean_or_nan(list)).collect(),
            jacobian: vec![jacobian],
            own_covariance,
            degrees_of_freedom: self.scatter(&differences[0]).1,
            decisions: vec![Decision {
                what: "cycles".into(),
                decided: format!("{} used, reference averaged", self.cycles.len()),
            }],
            residuals: Vec::new(),
        })
    }
}

fn cycle(start: usize, weights: usize) -> AveragingCycle {
    AveragingCycle { first: start, tests: (start + 1..=start + weights).collect(), last: start + weights + 1 }
}
