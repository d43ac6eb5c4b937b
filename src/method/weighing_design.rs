//! Masses from a weighing design: any comparisons of groups of weights, with one restraint or more.
//!
//! # Source    least squares with restraints: e-Handbook of Statistical Methods (NIST/SEMATECH, 2012), 2.3.4 (designs,
//!             restraint, tests of precision and of the check standard). Solution by orthogonal reduction:
//!             C. L. Lawson, R. J. Hanson, Solving Least Squares Problems (1974), chapter 20 (recalled).
//! # Formula   minimise Σ (y_i − Σ_j A_ij m_j)²/σ_i² subject to H m = c
//!             H' = Q_1 R,  Q_2 orthogonal to Q_1;  m = Q_1 R'⁻¹ c + Q_2 z,  z by least squares
//!             m = S y + D c,  cov(m) = s² C + D cov(c) D',  C = Q_2 (Q_2' A'WA Q_2)⁻¹ Q_2'
//!             s² = Σ w_i r_i²/ν,  ν = n − p + r;  F = s²/s_p²;  t = (x − x̄)/(s_c √(1 + 1/N))
//!     y_i   observed difference of the groups of comparison i, corrected for buoyancy     kg
//!     A_ij  +1, −1 or 0: the side weight j stands on in comparison i                      1
//!     m_j   mass of weight j                                                              kg
//!     H, c  restraints: combinations of masses, and their known values                    1, kg
//!     s_p   accepted standard deviation of a comparison, ν_p degrees of freedom           kg
//!     x̄     mean of N earlier values of the check standard, s_c their standard deviation  kg
//! Nothing is squared before it is solved: normal equations would lose half the digits of micrograms on kilograms.
//! # Valid for comparisons and restraints that determine every mass; independent errors of the comparisons.

use super::design_control::{CheckStandard, checked, limit_of_f, precision};
use super::{Method, WorkedExample, scaled};
use crate::diagnostic::{Code, Problem};
use crate::graph::{Decision, Estimate, Estimator, MethodInfo};
use crate::numeric::elementary::{sqrt, square};
use crate::numeric::householder::{Dependent, Triangular};
use crate::numeric::least_squares::fit;
use crate::numeric::linear::{Matrix, product, propagate, times_vector, transpose};
use crate::numeric::sum::sum;

/// The registry's line.
pub static METHOD: Method = Method {
    info: MethodInfo {
        name: "weighing-design",
        title: "Masses from a weighing design with restraints",
        source: "e-Handbook of Statistical Methods (NIST/SEMATECH, 2012), 2.3.4",
        formula: "min Σ (y_i − Σ_j A_ij m_j)²/σ_i², H m = c;  F = s²/s_p²;  t = (x − x̄)/(s_c √(1 + 1/N))",
        symbols: &[
            ("y_i", "observed difference of comparison i, corrected for buoyancy", "kg"),
            ("A_ij", "+1, −1 or 0: side of weight j in comparison i", "1"),
            ("m_j", "mass of weight j", "kg"),
            ("H", "coefficients of the restraints", "1"),
            ("c", "known values of the restraints", "kg"),
            ("s", "standard deviation of a comparison from the residuals", "kg"),
            ("s_p", "accepted standard deviation of a comparison", "kg"),
            ("s_c", "standard deviation of N earlier values of the check standard", "kg"),
        ],
        valid_for: "comparisons and restraints that determine every mass; independent errors",
    },
    examples: &[
        handbook("1, 1, 1; restraint on the first", "0.8165", || factor(&ONES_3, &[&[1.0, 0.0, 0.0]], 1)),
        handbook("2, 2, 2, 1, 1; restraint on the sum of the first two", "0.6124", || {
            factor(&TWOS, &[&[1.0, 1.0, 0.0, 0.0, 0.0]], 2)
        }),
        handbook("2, 2, 2, 1, 1; restraint on the sum of the first two", "0.5863", || {
            factor(&TWOS, &[&[1.0, 1.0, 0.0, 0.0, 0.0]], 3)
        }),
        four("m_1/mg", "0.03145", || four_example(|found| found.masses[0])),
        four("m_4/mg", "−0.21765", || four_example(|found| found.masses[3])),
        four("s/mg", "0.00133041346957", || four_example(|found| sqrt(found.variance().unwrap_or(f64::NAN)))),
        WorkedExample {
            source: "exact fractions: C = 61/400 for the last weight",
            given: "1000 to 500, 200, 200*, 100, 100* in ten comparisons; restraint on 1000",
            quantity: "√C",
            printed: "0.390512484",
            found: || factor(&DECADE, &[&[1.0, 0.0, 0.0, 0.0, 0.0, 0.0]], 5),
        },
        WorkedExample {
            source: "computed in high precision",
            given: "probability 0.95, 5 and 60 degrees of freedom",
            quantity: "limit of F",
            printed: "2.368270235701",
            found: || limit_of_f(0.95, 5.0, 60.0),
        },
    ],
};

const fn handbook(given: &'static str, printed: &'static str, found: fn() -> f64) -> WorkedExample {
    let source = "e-Handbook of Statistical Methods (NIST/SEMATECH, 2012), 2.3.4.1";
    WorkedExample { source, given, quantity: "√C", printed, found }
}

const fn four(quantity: &'static str, printed: &'static str, found: fn() -> f64) -> WorkedExample {
    let given = "1, 1, 1, 1, six differences 21, −133.5, 248, −152.2, 229.1, 383.8 µg; sum of the first two 43 µg";
    WorkedExample { source: "differences invented, solution in exact fractions", given, quantity, printed, found }
}

/// Where the uncertainty of the comparisons comes from.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum Scatter {
    /// From the residuals of this design.
    Observed,
    /// Accepted from earlier designs: standard deviation of a comparison of unit weight in kg, degrees of freedom.
    Accepted { deviation: f64, degrees_of_freedom: f64 },
}

/// The rule. Its columns, put end to end, are the observed differences and then the values of the restraints, in kg;
/// however many columns they come in. Outputs are the masses in the order of `weights`.
#[derive(Debug, Clone)]
pub struct WeighingDesign {
    /// Names of the weights.
    pub weights: Vec<String>,
    /// One row for each comparison, one entry for each weight.
    pub comparisons: Matrix,
    /// One row for each restraint.
    pub restraints: Matrix,
    /// Standard deviation of each comparison relative to unit weight; alike when none.
    pub relative: Option<Vec<f64>>,
    pub scatter: Scatter,
    pub check: Option<CheckStandard>,
    /// Level of the tests, such as 0.95.
    pub confidence: f64,
}

/// What a design gives.
#[derive(Debug, Clone, PartialEq)]
pub struct Solution {
    /// kg.
    pub masses: Vec<f64>,
    /// S: d mass / d difference.
    pub by_difference: Matrix,
    /// D: d mass / d value of a restraint.
    pub by_restraint: Matrix,
    /// C: covariance of the masses for unit variance of a comparison.
    pub unscaled_covariance: Matrix,
    /// Observed less fitted differences, kg.
    pub residuals: Vec<f64>,
    /// Σ w_i r_i², kg².
    pub residual_sum_of_squares: f64,
    /// Comparisons and restraints less weights.
    pub degrees_of_freedom: f64,
}

impl Solution {
    /// s²; none without degrees of freedom.
    pub fn variance(&self) -> Option<f64> {
        (self.degrees_of_freedom > 0.0).then(|| self.residual_sum_of_squares / self.degrees_of_freedom)
    }
}

impl WeighingDesign {
    /// The masses for these differences and values of the restraints, in kg.
    ///
    /// # Errors
    /// `design_incomplete` when lists are of unlike length, an entry is not finite or a deviation not positive, a
    /// restraint follows from those before it, or a mass is not determined: then the direction left free is named.
    pub fn solve(&self, differences: &[f64], values: &[f64]) -> Result<Solution, Problem> {
        self.check_shape(differences, values)?;
        let restrained = Triangular::new(self.restraints.clone()).map_err(|at| self.dependent_restraint(at))?;
        self.check_determined()?;
        let (size, known) = (self.weights.len(), self.restraints.len());
        // Row k of Q is Q' applied to the k-th unit vector.
        let basis: Matrix = (0..size)
            .map(|k| {
                let mut row: Vec<f64> = (0..size).map(|i| f64::from(u8::from(i == k))).collect();
                restrained.apply_transposed(&mut row);
                row
            })
            .collect();
        let particular: Matrix = basis.iter().map(|row| restrained.solve(&row[..known])).collect();
        let free: Matrix = basis.iter().map(|row| row[known..].to_vec()).collect();
        let (by_difference, unscaled_covariance) = self.free_part(&free, differences.len())?;
        let by_restraint = remaining(&particular, &by_difference, &product(&self.comparisons, &particular));
        let combine = |(s, d): (&Vec<f64>, &Vec<f64>)| {
            sum(s.iter().zip(differences).chain(d.iter().zip(values)).map(|(factor, value)| factor * value))
        };
        let masses: Vec<f64> = by_difference.iter().zip(&by_restraint).map(combine).collect();
        let residuals: Vec<f64> =
            self.comparisons.iter().zip(differences).map(|(row, y)| less(*y, row, &masses)).collect();
        let weights = self.inverse_variances(differences.len());
        Ok(Solution {
            residual_sum_of_squares: sum(residuals.iter().zip(&weights).map(|(r, w)| w * r * r)),
            degrees_of_freedom: (differences.len() + known) as f64 - size as f64,
            masses,
            by_difference,
            by_restraint,
            unscaled_covariance,
            residuals,
        })
    }

    /// S and C from the comparisons in the directions the restraints leave free.
    fn free_part(&self, free: &[Vec<f64>], count: usize) -> Result<(Matrix, Matrix), Problem> {
        let directions = transpose(free);
        if directions.is_empty() {
            return Ok((vec![vec![0.0; count]; free.len()], vec![vec![0.0; free.len()]; free.len()]));
        }
        let columns: Matrix = directions.iter().map(|direction| times_vector(&self.comparisons, direction)).collect();
        let columns: Vec<&[f64]> = columns.iter().map(Vec::as_slice).collect();
        let found = fit(&columns, &vec![0.0; count], Some(&self.inverse_variances(count)))?;
        let covariance = propagate(free, &found.unscaled_covariance);
        Ok((product(free, &found.jacobian), covariance))
    }

    /// 1/σ_i² relative to unit weight.
    fn inverse_variances(&self, count: usize) -> Vec<f64> {
        self.relative.as_ref().map_or_else(|| vec![1.0; count], |list| list.iter().map(|u| 1.0 / square(*u)).collect())
    }

    fn check_shape(&self, differences: &[f64], values: &[f64]) -> Result<(), Problem> {
        let size = self.weights.len();
        for (what, rows, list) in
            [("comparisons", &self.comparisons, differences), ("restraints", &self.restraints, values)]
        {
            if rows.len() != list.len() {
                let message = format!("The design has {} {what}, but {} values for them.", rows.len(), list.len());
                return Err(incomplete(message).hint("Give one value for each row of the design."));
            }
            if let Some(row) = rows.iter().position(|row| row.len() != size) {
                let (place, found) = (row + 1, rows[row].len());
                let message = format!("Row {place} of the {what} has {found} entries for {size} weights.");
                return Err(incomplete(message).hint("Each row needs one entry for each weight, 0 where it rests."));
            }
            if let Some(row) =
                (0..rows.len()).find(|row| !rows[*row].iter().chain([&list[*row]]).all(|x| x.is_finite()))
            {
                let message = format!("Row {} of the {what} has an entry that is no number.", row + 1);
                return Err(incomplete(message).hint("Give a number in each place, or leave the row out."));
            }
        }
        let Some(relative) = &self.relative else { return Ok(()) };
        let usable = |u: &f64| *u > 0.0 && u.is_finite() && (1.0 / square(*u)).is_finite();
        if relative.len() != differences.len() || !relative.iter().all(usable) {
            let message = format!("{} comparisons need as many positive standard deviations.", differences.len());
            return Err(incomplete(message).hint("Give one for each comparison, or none when all are alike."));
        }
        Ok(())
    }

    fn dependent_restraint(&self, Dependent(index): Dependent) -> Problem {
        let message = format!("Restraint {} says nothing that those before it do not say.", index + 1);
        incomplete(message).hint("Leave it out, or restrain another combination of the weights.")
    }

    /// Refuses a design that leaves a direction free, and names it.
    fn check_determined(&self) -> Result<(), Problem> {
        let rows = || self.restraints.iter().chain(&self.comparisons);
        let columns: Matrix = (0..self.weights.len()).map(|j| rows().map(|row| row[j]).collect()).collect();
        let Err(Dependent(index)) = Triangular::new(columns.clone()) else { return Ok(()) };
        let mut direction = vec![0.0; self.weights.len()];
        direction[index] = 1.0;
        if let Ok(before) = Triangular::new(columns[..index].to_vec()) {
            let mut reflected = columns[index].clone();
            before.apply_transposed(&mut reflected);
            before.solve(&reflected).iter().zip(&mut direction).for_each(|(share, cell)| *cell = -share);
        }
        // Counted in the smallest share, what rounding leaves taken for nothing.
        let taking_part = |share: &f64| share.abs() > 1e-9;
        let smallest =
            direction.iter().copied().filter(taking_part).fold(1.0, |least: f64, share| least.min(share.abs()));
        let words: Vec<String> = self
            .weights
            .iter()
            .zip(&direction)
            .filter(|(_, share)| taking_part(share))
            .map(|(name, share)| format!("{name} by {}", signed(share / smallest)))
            .collect();
        let message = format!(
            "The design does not determine the mass of {}: no comparison or restraint sees masses change together as {}.",
            self.weights[index],
            words.join(", ")
        );
        Err(incomplete(message).hint("Add a comparison or a restraint that tells these weights apart."))
    }

    fn decisions(&self, found: &Solution) -> Result<Vec<Decision>, Problem> {
        let precision = match self.scatter {
            Scatter::Accepted { deviation, degrees_of_freedom } => found.variance().and_then(|s| {
                precision((s, found.degrees_of_freedom), (deviation, degrees_of_freedom), self.confidence)
            }),
            Scatter::Observed => None,
        };
        let precision = precision.map(|test| Decision {
            what: "scatter within the design against the accepted one".into(),
            decided: test.words(self.confidence),
        });
        let Some(check) = &self.check else { return Ok(precision.into_iter().collect()) };
        let place = self.weights.get(check.weight).zip(found.masses.get(check.weight));
        let tested = place.and_then(|(name, mass)| Some((name, checked(*mass, check, self.confidence)?)));
        let Some((name, test)) = tested else {
            let message = "The check standard has no test: its weight, its standard deviation or its number of values is impossible.";
            let hint = "Name a weight of the design, a positive standard deviation and two earlier values or more.";
            return Err(incomplete(message.into()).hint(hint));
        };
        let what = format!("check standard {name} against its accepted mass");
        let check = Decision { what, decided: test.words(self.confidence) };
        Ok(precision.into_iter().chain([check]).collect())
    }

    /// Variance of a comparison of unit weight in kg², and its degrees of freedom.
    fn variance(&self, found: &Solution) -> Result<(f64, f64), Problem> {
        match self.scatter {
            Scatter::Accepted { deviation, degrees_of_freedom } if deviation >= 0.0 && degrees_of_freedom > 0.0 => {
                Ok((square(deviation), degrees_of_freedom))
            }
            Scatter::Accepted { .. } => {
                let message = "The accepted standard deviation or its degrees of freedom are not positive.";
                Err(incomplete(message.into()).hint("State both as positive numbers."))
            }
            Scatter::Observed => {
                let none = || {
                    let message = "The design has no comparison to spare, so that its residuals show no scatter.";
                    incomplete(message.into()).hint("Add a comparison, or state an accepted standard deviation.")
                };
                found.variance().map(|variance| (variance, found.degrees_of_freedom)).ok_or_else(none)
            }
        }
    }
}

impl Estimator for WeighingDesign {
    fn outputs(&self) -> usize {
        self.weights.len()
    }

    fn estimate(&self, columns: &[&[f64]]) -> Result<Estimate, Problem> {
        let rows: Vec<f64> = columns.iter().flat_map(|column| column.iter().copied()).collect();
        let (differences, values) = rows.split_at(self.comparisons.len().min(rows.len()));
        let found = self.solve(differences, values)?;
        let (variance, degrees_of_freedom) = self.variance(&found)?;
        let whole: Matrix =
            found.by_difference.iter().zip(&found.by_restraint).map(|(s, d)| [s.as_slice(), d].concat()).collect();
        let mut start = 0;
        let mut part = |column: &&[f64]| {
            let range = start..start + column.len();
            start = range.end;
            whole.iter().map(|row| row[range.clone()].to_vec()).collect()
        };
        Ok(Estimate {
            jacobian: columns.iter().map(&mut part).collect(),
            own_covariance: scaled(&found.unscaled_covariance, variance),
            degrees_of_freedom,
            decisions: self.decisions(&found)?,
            residuals: found.residuals,
            values: found.masses,
        })
    }
}

/// P − S (A P).
fn remaining(particular: &[Vec<f64>], by_difference: &[Vec<f64>], seen: &[Vec<f64>]) -> Matrix {
    let columns = transpose(seen);
    particular
        .iter()
        .zip(by_difference)
        .map(|(row, s)| row.iter().zip(&columns).map(|(p, column)| less(*p, s, column)).collect())
        .collect()
}

/// start − a · b, summed with compensation.
fn less(start: f64, a: &[f64], b: &[f64]) -> f64 {
    sum(std::iter::once(start).chain(a.iter().zip(b).map(|(x, y)| -x * y)))
}

/// `+5`, to three decimals.
fn signed(share: f64) -> String {
    let rounded: f64 = format!("{share:.3}").parse().unwrap_or(share);
    format!("{rounded:+}").replace('-', "−")
}

fn incomplete(message: String) -> Problem {
    Problem::new(Code::DesignIncomplete, message)
}

const ONES_3: [&[f64]; 3] = [&[1.0, -1.0, 0.0], &[1.0, 0.0, -1.0], &[0.0, 1.0, -1.0]];
const ONES_4: [&[f64]; 6] = [
    &[1.0, -1.0, 0.0, 0.0],
    &[1.0, 0.0, -1.0, 0.0],
    &[1.0, 0.0, 0.0, -1.0],
    &[0.0, 1.0, -1.0, 0.0],
    &[0.0, 1.0, 0.0, -1.0],
    &[0.0, 0.0, 1.0, -1.0],
];
const TWOS: [&[f64]; 7] = [
    &[1.0, -1.0, 0.0, 0.0, 0.0],
    &[1.0, 0.0, -1.0, 0.0, 0.0],
    &[0.0, 1.0, -1.0, 0.0, 0.0],
    &[1.0, 0.0, 0.0, -1.0, -1.0],
    &[0.0, 1.0, 0.0, -1.0, -1.0],
    &[0.0, 0.0, 1.0, -1.0, -1.0],
    &[0.0, 0.0, 0.0, 1.0, -1.0],
];
const DECADE: [&[f64]; 10] = [
    &[1.0, -1.0, -1.0, -1.0, -1.0, 0.0],
    &[1.0, -1.0, -1.0, -1.0, 0.0, -1.0],
    &[0.0, 1.0, -1.0, -1.0, -1.0, 0.0],
    &[0.0, 1.0, -1.0, -1.0, 0.0, -1.0],
    &[0.0, 0.0, 1.0, -1.0, 1.0, -1.0],
    &[0.0, 0.0, 1.0, -1.0, -1.0, 1.0],
    &[0.0, 0.0, 1.0, -1.0, 0.0, 0.0],
    &[0.0, 0.0, 1.0, 0.0, -1.0, -1.0],
    &[0.0, 0.0, 0.0, 1.0, -1.0, -1.0],
    &[0.0, 0.0, 0.0, 0.0, 1.0, -1.0],
];

fn design(comparisons: &[&[f64]], restraints: &[&[f64]]) -> WeighingDesign {
    let rows = |list: &[&[f64]]| list.iter().map(|row| row.to_vec()).collect();
    WeighingDesign {
        weights: (1..=restraints[0].len()).map(|number| format!("W{number}")).collect(),
        comparisons: rows(comparisons),
        restraints: rows(restraints),
        relative: None,
        scatter: Scatter::Observed,
        check: None,
        confidence: 0.95,
    }
}

/// Standard deviation of a mass for unit standard deviation of a comparison.
fn factor(comparisons: &[&[f64]], restraints: &[&[f64]], weight: usize) -> f64 {
    let (differences, values) = (vec![0.0; comparisons.len()], vec![0.0; restraints.len()]);
    let found = design(comparisons, restraints).solve(&differences, &values);
    found.map_or(f64::NAN, |found| sqrt(found.unscaled_covariance[weight][weight]))
}

fn four_example(what: impl Fn(&Solution) -> f64) -> f64 {
    let differences = [0.021, -0.1335, 0.248, -0.1522, 0.2291, 0.3838];
    let found = design(&ONES_4, &[&[1.0, 1.0, 0.0, 0.0]]).solve(&differences, &[0.043]);
    found.map_or(f64::NAN, |found| what(&found))
}

#[cfg(test)]
#[path = "weighing_design_tests.rs"]
mod tests;
