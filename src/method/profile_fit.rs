//! Profile of the geometric factor of a moving coil, from velocity and voltage gate by gate.
//!
//! # Source    least squares on the moving-mode model of a two-mode Kibble balance (Metrologia 2025,
//!             doi 10.1088/1681-7575/ae1dfc, section on the moving mode); gate averages by exact integration.
//! # Formula   U_i = v_i [Σ_k b_k <ζ^k>_i + b_d τ_i] + E_0 + E_1 τ_i
//!             <ζ^k> = [(ζ + D/2)^(k+1) − (ζ − D/2)^(k+1)] / [(k + 1) D],   D = |v| · gate
//!     U_i   voltage of the coil in gate i                         V
//!     v_i   velocity in gate i                                    m/s
//!     ζ_i   position from the weighing position at mid gate       m
//!     τ_i   time from the middle of the weighing                  s
//!     b_0   geometric factor at the weighing position and time    T m
//!     E_0   thermal voltage                                       V
//! Order K by a rule: K rises while F = (RSS_(K−1) − RSS_K)/s_K² of an added term is significant; since a profile may be
//! nearly symmetric, the search ends only when two terms in a row are not.
//! Multiplying by v leaves the thermal voltage an additive term: sweeps up and down tell it from b_0.
//! # Valid for sweeps in both directions that enclose the weighing position.

use super::statistic::brief;
use super::{Method, WorkedExample, scaled};
use crate::diagnostic::{Code, Problem};
use crate::graph::{Decision, Estimate, Estimator, MethodInfo};
use crate::numeric::distribution::f_upper;
use crate::numeric::least_squares::{Fit, fit};
use crate::numeric::tall::BLOCK;
use rayon::prelude::*;
use std::ops::Range;

/// The registry's line.
pub static METHOD: Method = Method {
    info: MethodInfo {
        name: "profile-fit",
        title: "Profile fit of the moving mode",
        source: "two-mode Kibble balance, moving-mode model; Metrologia 2025, doi 10.1088/1681-7575/ae1dfc",
        formula: "U_i = v_i [Σ_k b_k <ζ^k>_i + b_d τ_i] + E_0 + E_1 τ_i",
        symbols: &[
            ("U_i", "voltage of the coil in one gate", "V"),
            ("v_i", "velocity in one gate", "m/s"),
            ("ζ_i", "position from the weighing position", "m"),
            ("τ_i", "time from the middle of the weighing", "s"),
            ("b_0", "geometric factor at weighing position and time", "T m"),
            ("E_0", "thermal voltage", "V"),
        ],
        valid_for: "sweeps in both directions enclosing the weighing position",
    },
    examples: &[WorkedExample {
        source: "parameters put in by hand: b_0 = 540 T m, b_1 = 3 T, b_2 = −200 T/m, E_0 = 0.2 µV",
        given: "two noiseless sweeps of 41 gates, gate averages by exact integration",
        quantity: "b_0/(T m)",
        printed: "540.000000",
        found: noiseless_example,
    }],
};

/// The rule: columns v and U; outputs b_0 … b_K, b_d, E_0, E_1, all in coherent SI units.
#[derive(Debug, Clone)]
pub struct ProfileFit {
    /// Sweep of each gate; serial correlation is looked for inside a sweep only.
    pub sweeps: Vec<i64>,
    /// ζ at mid gate, m.
    pub positions: Vec<f64>,
    /// τ at mid gate, s.
    pub times: Vec<f64>,
    /// Length of a gate, s.
    pub gate: f64,
    /// Order K of the polynomial.
    pub order: usize,
    /// Whether drift of b and of the thermal voltage are fitted.
    pub drift: bool,
    /// How the order was chosen.
    pub decisions: Vec<Decision>,
}

impl ProfileFit {
    /// The same rule for some of the rows.
    pub fn of_rows(&self, rows: &[usize]) -> ProfileFit {
        let part = |column: &[f64]| rows.iter().filter_map(|row| column.get(*row).copied()).collect();
        ProfileFit {
            sweeps: rows.iter().filter_map(|row| self.sweeps.get(*row).copied()).collect(),
            positions: part(&self.positions),
            times: part(&self.times),
            decisions: self.decisions.clone(),
            ..*self
        }
    }

    /// The regressors that multiply v, and those that stand alone. Positions are scaled to centimetres inside.
    fn design(&self, v: &[f64]) -> (Vec<Vec<f64>>, Vec<Vec<f64>>) {
        let mut shaped: Vec<Vec<f64>> = (0..=self.order)
            .map(|k| {
                let average = GateAverage::new(k);
                let of = |(z, v): (&f64, &f64)| average.of(*z, v.abs() * self.gate);
                self.positions.par_iter().zip(v).map(of).collect()
            })
            .collect();
        let mut alone = vec![vec![1.0; v.len()]];
        if self.drift {
            shaped.push(self.times.clone());
            alone.push(self.times.clone());
        }
        (shaped, alone)
    }

    /// U less what the shape of a profile gives: U_i − v_i Σ_(k≥1) b_k <ζ^k>_i, with b_k from `coefficients`.
    pub fn without_shape(&self, v: &[f64], u: &[f64], coefficients: &[f64]) -> Vec<f64> {
        let mut rest = u.to_vec();
        for (k, coefficient) in coefficients.iter().enumerate().take(self.order + 1).skip(1) {
            let average = GateAverage::new(k);
            let shape = |(rest, (v, z)): (&mut f64, (&f64, &f64))| {
                *rest -= v * coefficient * average.of(*z, v.abs() * self.gate);
            };
            rest.par_iter_mut().zip(v.par_iter().zip(&self.positions)).for_each(shape);
        }
        rest
    }

    /// The fit, and the regressors that multiply v.
    fn solve(&self, v: &[f64], u: &[f64]) -> Result<(Fit, Vec<Vec<f64>>), Problem> {
        let (shaped, alone) = self.design(v);
        let regressors: Vec<Vec<f64>> = shaped
            .par_iter()
            .map(|shape| shape.iter().zip(v).map(|(shape, v)| shape * v).collect())
            .chain(alone)
            .collect();
        let references: Vec<&[f64]> = regressors.iter().map(Vec::as_slice).collect();
        Ok((fit(&references, u, None)?, shaped))
    }

    /// Lag-1 autocorrelation of residuals, averaged over sweeps.
    fn autocorrelation(&self, residuals: &[f64]) -> f64 {
        let (mut products, mut squares) = (0.0, 0.0);
        for index in 0..residuals.len() {
            squares += residuals[index] * residuals[index];
            if index > 0 && self.sweeps[index] == self.sweeps[index - 1] {
                products += residuals[index] * residuals[index - 1];
            }
        }
        if squares > 0.0 { products / squares } else { 0.0 }
    }
}

/// Raises the order from one while the F test of an added term is significant at `confidence`; ends when two terms in a
/// row are not.
///
/// # Errors
/// Those of the fits.
pub fn choose_order(
    rule: &ProfileFit,
    v: &[f64],
    u: &[f64],
    largest: usize,
    confidence: f64,
) -> Result<ProfileFit, Problem> {
    let mut decisions = Vec::new();
    let (mut order, mut idle) = (1, 0);
    let mut before = ProfileFit { order, ..rule.clone() }.solve(v, u)?.0.residual_sum_of_squares;
    for next in 2..=largest {
        let found = ProfileFit { order: next, ..rule.clone() }.solve(v, u)?.0;
        let freedom = found.degrees_of_freedom;
        let statistic = (before - found.residual_sum_of_squares).max(0.0) / (found.residual_sum_of_squares / freedom);
        let taken = f_upper(statistic, 1.0, freedom) < 1.0 - confidence;
        let verdict = if taken { "significant, taken" } else { "not significant, not taken" };
        decisions.push(Decision {
            what: format!("order {next} of the profile against {}", next - 1),
            decided: format!("F(1, {freedom}) = {}; {verdict}", brief(statistic)),
        });
        (order, idle) = if taken { (next, 0) } else { (order, idle + 1) };
        if idle == 2 {
            break;
        }
        before = found.residual_sum_of_squares;
    }
    let decided = format!("by F tests at the level {}, {largest} at most", brief(confidence));
    decisions.push(Decision { what: "rule for the order of the profile".into(), decided });
    Ok(ProfileFit { order, decisions, ..rule.clone() })
}

impl Estimator for ProfileFit {
    fn outputs(&self) -> usize {
        self.order + 2 + if self.drift { 2 } else { 0 }
    }

    fn estimate(&self, columns: &[&[f64]]) -> Result<Estimate, Problem> {
        let [v, u] = columns else {
            return Err(Problem::new(Code::DesignIncomplete, "A profile fit needs velocity and voltage."));
        };
        if v.len() != self.positions.len()
            || u.len() != v.len()
            || self.times.len() != v.len()
            || self.sweeps.len() != v.len()
        {
            return Err(Problem::new(
                Code::DesignIncomplete,
                "The columns of a moving phase have unlike numbers of gates.",
            ));
        }
        let (found, shaped) = self.solve(v, u)?;
        let (r1, by_velocity) =
            rayon::join(|| self.autocorrelation(&found.residuals), || velocity_response(&found, &shaped));
        let inflation = if r1 > 0.0 { (1.0 + r1) / (1.0 - r1) } else { 1.0 };
        let variance = inflation * found.residual_sum_of_squares / found.degrees_of_freedom;
        let described = [
            Decision { what: "order of the profile".into(), decided: format!("{}", self.order) },
            Decision {
                what: "lag-1 autocorrelation of residuals".into(),
                decided: format!("{r1:.3}, variance × {inflation:.3}"),
            },
        ];
        Ok(Estimate {
            own_covariance: scaled(&found.unscaled_covariance, variance),
            degrees_of_freedom: found.degrees_of_freedom,
            decisions: self.decisions.iter().cloned().chain(described).collect(),
            residuals: found.residuals,
            values: found.coefficients,
            jacobian: vec![by_velocity, found.jacobian],
        })
    }
}

/// d coefficient / d v_i: v_i shapes every regressor it multiplies.
///
/// From d β_k / d A_ic = C_kc r_i − J_ki β_c, summed over the regressors c that v_i multiplies by their shapes.
fn velocity_response(found: &Fit, shaped: &[Vec<f64>]) -> Vec<Vec<f64>> {
    let mut response = vec![vec![0.0; found.residuals.len()]; found.jacobian.len()];
    let mut blocks: Vec<Vec<&mut [f64]>> = Vec::new();
    for row in &mut response {
        for (index, part) in row.chunks_mut(BLOCK).enumerate() {
            match blocks.get_mut(index) {
                Some(block) => block.push(part),
                None => blocks.push(vec![part]),
            }
        }
    }
    // A block of rows at a time, so that it stays near the processor.
    blocks.into_par_iter().enumerate().for_each(|(index, block)| {
        let rows = index * BLOCK..(index * BLOCK + BLOCK).min(found.residuals.len());
        let mut factor = vec![0.0; rows.len()];
        add_shapes(&mut factor, shaped, &found.coefficients, &rows);
        for ((part, row), covariance) in block.into_iter().zip(&found.jacobian).zip(&found.unscaled_covariance) {
            add_shapes(part, shaped, covariance, &rows);
            let others = found.residuals[rows.clone()].iter().zip(row[rows.clone()].iter().zip(&factor));
            part.iter_mut().zip(others).for_each(|(cell, (r, (j, factor)))| *cell = *cell * r - j * factor);
        }
    });
    response
}

/// Adds Σ_c factor_c shape_c over some rows.
fn add_shapes(sums: &mut [f64], shaped: &[Vec<f64>], factors: &[f64], rows: &Range<usize>) {
    for (shape, factor) in shaped.iter().zip(factors) {
        sums.iter_mut().zip(&shape[rows.clone()]).for_each(|(sum, shape)| *sum += factor * shape);
    }
}

/// The mean of ζ^k over a gate of length D: Σ_i C(k, 2i)/(2i + 1) ζ^(k − 2i) (D/2)^(2i), which cancels no digits.
struct GateAverage {
    odd: bool,
    weights: Vec<f64>,
}

impl GateAverage {
    fn new(k: usize) -> GateAverage {
        let (mut binomial, mut weights) = (1.0, vec![1.0]);
        for j in 1..=k {
            binomial = binomial * (k + 1 - j) as f64 / j as f64;
            if j % 2 == 0 {
                weights.push(binomial / (j + 1) as f64);
            }
        }
        GateAverage { odd: k % 2 == 1, weights }
    }

    fn of(&self, zeta: f64, d: f64) -> f64 {
        let (square, quarter) = (zeta * zeta, d * d / 4.0);
        let (mut total, mut power) = (0.0, 1.0);
        for weight in &self.weights {
            total = total * square + weight * power;
            power *= quarter;
        }
        if self.odd { total * zeta } else { total }
    }
}

fn noiseless_example() -> f64 {
    let gates = 41;
    let position = |index: usize| (index as f64 - 20.0) * 1e-3;
    // By exact integration over the gate.
    let cube = |z: f64| z * z * z;
    let average = |z: f64| (cube(z + 1e-4) - cube(z - 1e-4)) / (3.0 * 2e-4);
    let mut rule = ProfileFit {
        sweeps: vec![],
        positions: vec![],
        times: vec![],
        gate: 0.1,
        order: 2,
        drift: false,
        decisions: vec![],
    };
    let (mut v, mut u) = (Vec::new(), Vec::new());
    for sweep in [1i64, -1] {
        for index in 0..gates {
            let speed = sweep as f64 * 2e-3;
            let zeta = position(index);
            rule.sweeps.push(sweep);
            rule.positions.push(zeta);
            rule.times.push(0.0);
            v.push(speed);
            u.push(speed * (540.0 + 3.0 * zeta - 200.0 * average(zeta)) + 0.2e-6);
        }
    }
    rule.estimate(&[&v, &u]).map_or(f64::NAN, |estimate| estimate.values[0])
}
