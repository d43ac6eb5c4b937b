//! Difference of two weights from weighing cycles ABA or ABBA, free of linear drift.
//!
//! # Source    OIML R 111-1:2004, C.4.1 (cycles ABBA and ABA), C.6.1 (scatter); EA-4/02 supplement S2 (numbers);
//!             least squares with drift where the times of a cycle are unequal.
//! # Formula   within each cycle  y_i = c + b t_i + d · [b on the pan];  equal times: d = (B_1 + B_2)/2 − (A_1 + A_2)/2
//!             D = mean of the series means;  u_A(D) = s / √n
//!     y_i    weighing, in mass, corrected for air buoyancy    kg
//!     t_i    time                                             s
//!     d      difference of one cycle                          kg
//!     s      standard deviation: of the series means (several series), of the cycles (one series), or the
//!            comparator's own                                 kg
//!     n      number of series, or of cycles
//! # Valid for drift that is linear within a cycle.

use super::{Method, WorkedExample, deviation_or_nan, mean_or_nan};
use crate::diagnostic::{Code, Problem};
use crate::graph::{Decision, Estimate, Estimator, MethodInfo};
use crate::numeric::least_squares::fit;

/// The registry's line.
pub static METHOD: Method = Method {
    info: MethodInfo {
        name: "weighing-cycle",
        title: "Weighing cycles ABA and ABBA with elimination of linear drift",
        source: "OIML R 111-1:2004, C.4.1 and C.6.1",
        formula: "y_i = c + b t_i + d [b on the pan] in each cycle;  D = mean of d;  u_A(D) = s/√n",
        symbols: &[
            ("y_i", "weighing in mass, corrected for air buoyancy", "kg"),
            ("t_i", "time of the weighing", "s"),
            ("d", "difference of one cycle", "kg"),
            ("D", "mean difference", "kg"),
            ("s", "standard deviation of one series mean or one cycle", "kg"),
            ("n", "number of series or cycles", "1"),
        ],
        valid_for: "drift linear within a cycle",
    },
    examples: &[
        WorkedExample {
            source: "EA-4/02 supplement S2, readings from memory",
            given: "(10, 20, 25, 15), (25, 50, 55, 20), (25, 45, 40, 20) mg, ABBA; s = 25 mg from earlier work",
            quantity: "mean difference/mg",
            printed: "20.0",
            found: || ea_example(0),
        },
        WorkedExample {
            source: "EA-4/02 supplement S2, readings from memory",
            given: "the same",
            quantity: "standard uncertainty of the mean difference/mg",
            printed: "14.4",
            found: || ea_example(1),
        },
        WorkedExample {
            source: "OIML R 111-1:2004, C.4.1, numbers invented and computed in high precision",
            given: "ABA: (0, 1.52, 0.004), (0.004, 1.526, 0.009), (0.009, 1.527, 0.011), (0.011, 1.531, 0.016), (0.016, 1.538, 0.019) mg",
            quantity: "standard uncertainty of the mean difference/mg",
            printed: "0.0006519202405203",
            found: aba_example,
        },
    ],
};

/// The scheme of a cycle.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Scheme {
    Aba,
    Abba,
}

impl Scheme {
    /// Which side is on the pan at each weighing of a cycle: false for a, true for b.
    pub fn order(self) -> &'static [bool] {
        match self {
            Scheme::Aba => &[false, true, false],
            Scheme::Abba => &[false, true, true, false],
        }
    }
}

/// One cycle: which rows of the column of weighings, at which times (s), and which side was on the pan.
#[derive(Debug, Clone, PartialEq)]
pub struct Cycle {
    pub series: u32,
    pub number: u32,
    pub rows: Vec<usize>,
    pub times: Vec<f64>,
    pub b_on_pan: Vec<bool>,
    pub excluded: bool,
}

/// Where the standard deviation comes from.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum Dispersion {
    /// From the scatter of this comparison.
    Own,
    /// Known from earlier work, for one cycle.
    PooledCycle { standard_deviation: f64, degrees_of_freedom: f64 },
    /// Known from earlier work, for the mean of one series.
    PooledSeries { standard_deviation: f64, degrees_of_freedom: f64 },
}

/// Weighted rows that make up one difference.
pub type Weights = Vec<(usize, f64)>;

/// The weights that turn the rows of one cycle into its difference b − a.
///
/// # Errors
/// `design_incomplete` when both sides are not seen often enough to tell the difference from the drift.
pub fn cycle_weights(cycle: &Cycle) -> Result<Weights, Problem> {
    let ones = vec![1.0; cycle.rows.len()];
    let middle = mean_or_nan(&cycle.times);
    let times: Vec<f64> = cycle.times.iter().map(|time| time - middle).collect();
    let sides: Vec<f64> = cycle.b_on_pan.iter().map(|b| f64::from(u8::from(*b))).collect();
    let zeros = vec![0.0; cycle.rows.len()];
    let design = fit(&[&sides, &ones, &times], &zeros, None).map_err(|_| {
        let message = format!(
            "Cycle {} of series {} cannot tell the difference from the drift: {} weighings at these times are too few or coincide.",
            cycle.number,
            cycle.series,
            cycle.rows.len()
        );
        Problem::new(Code::DesignIncomplete, message).hint("A cycle needs a, b, a or a, b, b, a at different times.")
    })?;
    Ok(cycle.rows.iter().copied().zip(design.jacobian[0].iter().copied()).collect())
}

/// The rule that gives the mean difference (output 0) and the mean of each series (outputs 1, 2, …).
#[derive(Debug, Clone)]
pub struct MeanDifference {
    cycles: Vec<(u32, Weights)>,
    series: Vec<u32>,
    dispersion: Dispersion,
    excluded: usize,
    rows: usize,
}

impl MeanDifference {
    /// The rule for these cycles; excluded ones do not count.
    ///
    /// # Errors
    /// As [`cycle_weights`]; `design_incomplete` when no cycle is left or its own scatter cannot be had.
    pub fn new(cycles: &[Cycle], dispersion: Dispersion) -> Result<Self, Problem> {
        let used: Vec<&Cycle> = cycles.iter().filter(|cycle| !cycle.excluded).collect();
        let weighted =
            used.iter().map(|cycle| Ok((cycle.series, cycle_weights(cycle)?))).collect::<Result<Vec<_>, Problem>>()?;
        let mut series: Vec<u32> = used.iter().map(|cycle| cycle.series).collect();
        series.dedup();
        series.sort_unstable();
        series.dedup();
        let units = if series.len() > 1 { series.len() } else { used.len() };
        if used.is_empty() || (units < 2 && dispersion == Dispersion::Own) {
            let message = format!("{} cycle left in use has no scatter of its own.", used.len());
            return Err(Problem::new(Code::DesignIncomplete, message)
                .hint("Write `type_a: pooled` and give the comparator its standard deviation and degrees of freedom, or weigh more cycles."));
        }
        let rows = cycles.iter().flat_map(|cycle| &cycle.rows).max().map_or(0, |last| last + 1);
        Ok(Self { cycles: weighted, series, dispersion, excluded: cycles.len() - used.len(), rows })
    }

    /// How many series are in use.
    pub fn series(&self) -> &[u32] {
        &self.series
    }

    /// Standard deviation of the unit that is averaged, how many of them, and the degrees of freedom.
    fn scatter(&self, differences: &[f64], means: &[f64]) -> (f64, usize, f64) {
        match self.dispersion {
            Dispersion::Own if self.series.len() > 1 => {
                (deviation_or_nan(means), means.len(), means.len() as f64 - 1.0)
            }
            Dispersion::Own => (deviation_or_nan(differences), differences.len(), differences.len() as f64 - 1.0),
            Dispersion::PooledCycle { standard_deviation, degrees_of_freedom } => {
                (standard_deviation, differences.len(), degrees_of_freedom)
            }
            Dispersion::PooledSeries { standard_deviation, degrees_of_freedom } => {
                (standard_deviation, means.len(), degrees_of_freedom)
            }
        }
    }

    fn decisions(&self, scatter: f64, count: usize, freedom: f64) -> Vec<Decision> {
        let source = match self.dispersion {
            Dispersion::Own if self.series.len() > 1 => "standard deviation of the series means",
            Dispersion::Own => "standard deviation of the cycles",
            Dispersion::PooledCycle { .. } => "comparator's standard deviation of one cycle",
            Dispersion::PooledSeries { .. } => "comparator's standard deviation of one series",
        };
        let nu = if freedom.is_finite() { format!("{freedom}") } else { "∞".into() };
        vec![
            Decision {
                what: "Type A evaluation".into(),
                decided: format!("{source}, {:.4} µg, over √{count}; ν = {nu}", scatter * 1e9),
            },
            Decision {
                what: "cycles".into(),
                decided: format!("{} used, {} excluded", self.cycles.len(), self.excluded),
            },
        ]
    }
}

impl Estimator for MeanDifference {
    fn outputs(&self) -> usize {
        1 + self.series.len()
    }

    fn estimate(&self, columns: &[&[f64]]) -> Result<Estimate, Problem> {
        let y = columns.first().copied().unwrap_or_default();
        if y.len() < self.rows {
            return Err(Problem::new(
                Code::DesignIncomplete,
                format!("{} weighings are needed, {} are there.", self.rows, y.len()),
            ));
        }
        let weigh = |weights: &Weights| weights.iter().map(|(row, weight)| weight * y[*row]).sum::<f64>();
        let differences: Vec<f64> = self.cycles.iter().map(|(_, weights)| weigh(weights)).collect();
        let mut means = Vec::new();
        let mut jacobian = vec![vec![0.0; y.len()]; self.outputs()];
        for (index, series) in self.series.iter().enumerate() {
            let members: Vec<usize> = (0..self.cycles.len()).filter(|cycle| self.cycles[*cycle].0 == *series).collect();
            let own: Vec<f64> = members.iter().map(|cycle| differences[*cycle]).collect();
            means.push(mean_or_nan(&own));
            for (row, weight) in members.iter().flat_map(|cycle| &self.cycles[*cycle].1) {
                jacobian[index + 1][*row] += weight / members.len() as f64;
                jacobian[0][*row] += weight / (members.len() * self.series.len()) as f64;
            }
        }
        let (scatter, count, freedom) = self.scatter(&differences, &means);
        let residuals = self.cycles.iter().zip(&differences).map(|((series, _), difference)| {
            difference - means[self.series.iter().position(|known| known == series).unwrap_or(0)]
        });
        Ok(Estimate {
            residuals: residuals.collect(),
            values: std::iter::once(mean_or_nan(&means)).chain(means.iter().copied()).collect(),
            jacobian: vec![jacobian],
            own_covariance: own_covariance(scatter, count, self.series.len()),
            degrees_of_freedom: freedom,
            decisions: self.decisions(scatter, count, freedom),
        })
    }
}

/// Covariance of the mean difference and the series means: each series scatters on its own around the mean.
fn own_covariance(scatter: f64, count: usize, series: usize) -> Vec<Vec<f64>> {
    let of_mean = scatter * scatter / count as f64;
    let of_series = of_mean * series as f64;
    let mut covariance = vec![vec![0.0; series + 1]; series + 1];
    for (row, cells) in covariance.iter_mut().enumerate() {
        for (column, cell) in cells.iter_mut().enumerate() {
            *cell = match (row, column) {
                (0, _) | (_, 0) => of_mean,
                (row, column) if row == column => of_series,
                _ => 0.0,
            };
        }
    }
    covariance
}

/// Cycles of one scheme at equal times, all in one series; for examples and tests.
pub fn regular_cycles(scheme: Scheme, count: usize, one_series: bool) -> Vec<Cycle> {
    let order = scheme.order();
    let cycle = |number: usize| Cycle {
        series: if one_series { 1 } else { number as u32 + 1 },
        number: if one_series { number as u32 + 1 } else { 1 },
        rows: (0..order.len()).map(|row| number * order.len() + row).collect(),
        times: (0..order.len()).map(|row| (number * order.len() + row) as f64).collect(),
        b_on_pan: order.to_vec(),
        excluded: false,
    };
    (0..count).map(cycle).collect()
}

fn ea_example(which: usize) -> f64 {
    let readings = [10.0, 20.0, 25.0, 15.0, 25.0, 50.0, 55.0, 20.0, 25.0, 45.0, 40.0, 20.0];
    let pooled = Dispersion::PooledSeries { standard_deviation: 25.0, degrees_of_freedom: f64::INFINITY };
    run(&regular_cycles(Scheme::Abba, 3, false), pooled, &readings, which)
}

fn aba_example() -> f64 {
    let readings =
        [0.0, 1.52, 0.004, 0.004, 1.526, 0.009, 0.009, 1.527, 0.011, 0.011, 1.531, 0.016, 0.016, 1.538, 0.019];
    run(&regular_cycles(Scheme::Aba, 5, true), Dispersion::Own, &readings, 1)
}

fn run(cycles: &[Cycle], dispersion: Dispersion, readings: &[f64], which: usize) -> f64 {
    let estimate = MeanDifference::new(cycles, dispersion).and_then(|rule| rule.estimate(&[readings]));
    estimate.map_or(f64::NAN, |estimate| match which {
        0 => estimate.values[0],
        _ => estimate.own_covariance[0][0].sqrt(),
    })
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn unequal_times_do_not_let_drift_through() {
        let mut cycles = regular_cycles(Scheme::Abba, 2, true);
        cycles[0].times = vec![0.0, 1.0, 5.0, 6.5];
        cycles[1].times = vec![10.0, 11.0, 13.0, 20.0];
        let readings: Vec<f64> = cycles
            .iter()
            .flat_map(|cycle| {
                cycle.times.iter().zip(&cycle.b_on_pan).map(|(t, b)| 3.0 + 0.7 * t + if *b { 2.0 } else { 0.0 })
            })
            .collect();
        let found = run(&cycles, Dispersion::Own, &readings, 0);
        assert!((found - 2.0).abs() < 1e-12, "{found}");
    }

    #[test]
    fn a_single_cycle_needs_a_known_scatter() {
        let problem = MeanDifference::new(&regular_cycles(Scheme::Abba, 1, true), Dispersion::Own).unwrap_err();
        assert_eq!(problem.code, Code::DesignIncomplete);
    }
}
