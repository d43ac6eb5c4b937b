//! Vertical profile of gravity above a mark: its fit from ties or readings of a relative gravimeter, and the step
//! between two heights.
//!
//! # Source    reports of comparisons of absolute gravimeters (profile of second degree); L. Timmen, Metrologia 40 (2003)
//!             178 (effective measurement height); least squares by JCGM 100:2008, H.3, with known uncertainties.
//! # Formula   g(z) = g_0 + γ_1 z + γ_2 z²;  Δ = γ_1 (z_m − z_r) + γ_2 (z_m² − z_r²)
//!             ties: Δg_i = γ_1 (z_j − z_i) + γ_2 (z_j² − z_i²);  readings: c_0 + γ_1 z + γ_2 z² + d_1 t + d_2 t²
//!             weights 1/u_i², covariance (AᵀWA)⁻¹, by χ²/ν only where asked
//!             g_eff = g_rep − γ_rep (z_rep − z_eff)
//!     z      height above the mark               m
//!     γ_1    linear coefficient                  1/s²
//!     γ_2    second coefficient                  m⁻¹ s⁻²
//! # Valid for heights within the span of the ties; γ_1 and γ_2 are strongly anticorrelated and are carried together.

use super::polynomial_fit::Tested;
use super::{Method, WorkedExample, scaled};
use crate::diagnostic::{Code, Problem};
use crate::graph::{Decision, Estimate, Estimator, MethodInfo, Quantity};
use crate::numeric::distribution::chi_square_upper;
use crate::numeric::elementary::powi;
use crate::numeric::least_squares::{Fit, fit};
use crate::quantity::Kind;
use std::sync::Arc;

/// The registry's line.
pub static METHOD: Method = Method {
    info: MethodInfo {
        name: "gravity-profile",
        title: "Vertical profile of gravity",
        source: "comparisons of absolute gravimeters; Timmen, Metrologia 40 (2003) 178; JCGM 100:2008, H.3",
        formula: "g(z) = g_0 + γ_1 z + γ_2 z²;  Δ = γ_1 (z_m − z_r) + γ_2 (z_m² − z_r²)",
        symbols: &[
            ("Δ", "gravity at the mass less gravity at the reference height", "m/s2"),
            ("γ_1", "linear coefficient of the profile", "s-2"),
            ("γ_2", "second coefficient of the profile", "m-1 s-2"),
            ("z_m", "height of the centre of mass above the mark", "m"),
            ("z_r", "height of the stated gravity above the mark", "m"),
        ],
        valid_for: "heights within the span of the ties",
    },
    examples: &[
        ties("γ_1/(µGal/m)", "-316.295529", || ties_example(0)),
        ties("γ_2/(µGal/m²)", "3.794071", || ties_example(1)),
        ties("u(γ_1)/(µGal/m)", "2.240433", || ties_example(2)),
        ties("u(γ_2)/(µGal/m²)", "1.179236", || ties_example(3)),
        ties("r(γ_1, γ_2)", "-0.954222", || ties_example(4)),
    ],
};

const fn ties(quantity: &'static str, printed: &'static str, found: fn() -> f64) -> WorkedExample {
    WorkedExample {
        source: "weighted least squares by an independent library",
        given: "four ties between 0.25 m, 0.85 m, 1.45 m and 1.95 m, degree 2",
        quantity,
        printed,
        found,
    }
}

/// γ_1 where nothing was measured: the free-air value, 1/s².
pub const FREE_AIR_GRADIENT: f64 = -3.086e-6;
/// Its standard uncertainty in a laboratory, 1/s²: cellars and pillars change it by up to 20 %.
pub const FREE_AIR_UNCERTAINTY: f64 = 3e-7;

/// The coefficients of a profile.
#[derive(Clone, Copy)]
pub struct Profile<'g> {
    /// γ_1, 1/s².
    pub gamma_1: Quantity<'g>,
    /// γ_2, m⁻¹ s⁻²; none for a straight profile.
    pub gamma_2: Option<Quantity<'g>>,
}

impl<'g> Profile<'g> {
    /// Gravity at height `z_m` less that at height `z_r`.
    pub fn step(&self, z_r: Quantity<'g>, z_m: Quantity<'g>) -> Quantity<'g> {
        let (z_r, z_m) = (z_r.as_kind(Kind::Plain), z_m.as_kind(Kind::Plain));
        let linear = self.gamma_1 * (z_m - z_r);
        match self.gamma_2 {
            Some(gamma_2) => linear + gamma_2 * (z_m.squared() - z_r.squared()),
            None => linear,
        }
    }
}

/// A reported value at the effective measurement height, where it does not depend on the gradient of the drop's fit.
pub fn at_effective_height<'g>(
    g_rep: Quantity<'g>,
    gamma_rep: Quantity<'g>,
    z_rep: Quantity<'g>,
    z_eff: Quantity<'g>,
) -> Quantity<'g> {
    g_rep - gamma_rep * (z_rep.as_kind(Kind::Plain) - z_eff.as_kind(Kind::Plain))
}

/// Where the covariance of a fit comes from.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Scatter {
    /// The stated uncertainties are taken as they are.
    Stated,
    /// They are taken as known up to a factor, found from the residuals.
    FromResiduals,
}

/// The rule for ties: columns z_i, z_j and Δg = g(z_j) − g(z_i); outputs γ_1 and, at degree 2, γ_2.
#[derive(Debug, Clone)]
pub struct TiesFit {
    /// 1 or 2.
    pub degree: usize,
    /// Standard uncertainty of each tie, m/s².
    pub uncertainties: Arc<[f64]>,
    pub scatter: Scatter,
}

impl TiesFit {
    /// The fit by itself; its sum of squares is chi-square.
    ///
    /// # Errors
    /// `design_incomplete` when the ties do not determine the coefficients.
    pub fn fit(&self, z_i: &[f64], z_j: &[f64], difference: &[f64]) -> Result<Fit, Problem> {
        if z_i.len() != z_j.len() {
            return Err(Problem::new(Code::DesignIncomplete, "Each tie needs two heights."));
        }
        let columns: Vec<Vec<f64>> = (1..=self.degree as i32)
            .map(|k| z_i.iter().zip(z_j).map(|(low, high)| powi(*high, k) - powi(*low, k)).collect())
            .collect();
        weighted(&columns, difference, &self.uncertainties)
    }
}

impl Estimator for TiesFit {
    fn outputs(&self) -> usize {
        self.degree
    }

    fn estimate(&self, columns: &[&[f64]]) -> Result<Estimate, Problem> {
        let [z_i, z_j, difference] = columns else {
            return Err(Problem::new(Code::DesignIncomplete, "A tie needs two heights and a difference."));
        };
        let found = self.fit(z_i, z_j, difference)?;
        let by_height = |heights: &[f64], sign: f64| {
            response(&found, (0..self.degree).map(|k| (k, powers(heights, k, sign * (k + 1) as f64))))
        };
        let jacobian = vec![by_height(z_i, -1.0), by_height(z_j, 1.0), found.jacobian.clone()];
        estimate(found, jacobian, self.scatter)
    }
}

/// The rule for readings of one instrument, free of tide: columns z and reading; outputs c_0, γ_1, (γ_2), d_1, (d_2).
#[derive(Debug, Clone)]
pub struct ReadingsFit {
    /// 1 or 2.
    pub degree: usize,
    /// Degree of the drift in time: 0, 1 or 2.
    pub drift_degree: usize,
    /// Time of each reading from the first, s.
    pub times: Arc<[f64]>,
    /// Standard uncertainty of each reading, m/s².
    pub uncertainties: Arc<[f64]>,
    pub scatter: Scatter,
}

impl ReadingsFit {
    /// The fit by itself; its sum of squares is chi-square.
    ///
    /// # Errors
    /// `design_incomplete` when the readings do not determine the coefficients.
    pub fn fit(&self, z: &[f64], reading: &[f64]) -> Result<Fit, Problem> {
        if z.len() != self.times.len() {
            return Err(Problem::new(Code::DesignIncomplete, "Each reading needs a height and a time."));
        }
        let heights = (0..=self.degree).map(|k| powers(z, k, 1.0));
        let drift = (1..=self.drift_degree).map(|k| powers(&self.times, k, 1.0));
        let columns: Vec<Vec<f64>> = heights.chain(drift).collect();
        weighted(&columns, reading, &self.uncertainties)
    }
}

impl Estimator for ReadingsFit {
    fn outputs(&self) -> usize {
        1 + self.degree + self.drift_degree
    }

    fn estimate(&self, columns: &[&[f64]]) -> Result<Estimate, Problem> {
        let [z, reading] = columns else {
            return Err(Problem::new(Code::DesignIncomplete, "A profile needs heights and readings."));
        };
        let found = self.fit(z, reading)?;
        let by_height = response(&found, (1..=self.degree).map(|k| (k, powers(z, k - 1, k as f64))));
        let jacobian = vec![by_height, found.jacobian.clone()];
        estimate(found, jacobian, self.scatter)
    }
}

fn powers(values: &[f64], exponent: usize, scale: f64) -> Vec<f64> {
    values.iter().map(|value| scale * powi(*value, exponent as i32)).collect()
}

fn weighted(columns: &[Vec<f64>], y: &[f64], uncertainties: &[f64]) -> Result<Fit, Problem> {
    let references: Vec<&[f64]> = columns.iter().map(Vec::as_slice).collect();
    let weights: Vec<f64> = uncertainties.iter().map(|u| 1.0 / (u * u)).collect();
    fit(&references, y, Some(&weights))
}

/// d coefficient / d height: Σ over columns of (d coefficient / d entry)(d entry / d height).
fn response(found: &Fit, slopes: impl Iterator<Item = (usize, Vec<f64>)>) -> Vec<Vec<f64>> {
    let mut by_height = vec![vec![0.0; found.residuals.len()]; found.coefficients.len()];
    for (column, slope) in slopes {
        for (row, by_entry) in by_height.iter_mut().zip(found.design_response(column)) {
            row.iter_mut().zip(by_entry).zip(&slope).for_each(|((cell, entry), slope)| *cell += entry * slope);
        }
    }
    by_height
}

fn estimate(found: Fit, jacobian: Vec<Vec<Vec<f64>>>, scatter: Scatter) -> Result<Estimate, Problem> {
    let freedom = found.degrees_of_freedom;
    let (factor, degrees_of_freedom) = match scatter {
        Scatter::Stated => (1.0, f64::INFINITY),
        Scatter::FromResiduals if freedom > 0.0 => (found.residual_sum_of_squares / freedom, freedom),
        Scatter::FromResiduals => {
            let message = "The scatter of the ties cannot be found from as many ties as there are coefficients.";
            return Err(
                Problem::new(Code::DesignIncomplete, message).hint("Add ties, or take the stated uncertainties.")
            );
        }
    };
    let words = match chi_square(&found) {
        Some(tested) => tested.words(),
        None => "no degrees of freedom".into(),
    };
    Ok(Estimate {
        own_covariance: scaled(&found.unscaled_covariance, factor),
        degrees_of_freedom,
        decisions: vec![Decision { what: "residuals of the profile".into(), decided: words }],
        residuals: found.residuals.clone(),
        values: found.coefficients,
        jacobian,
    })
}

/// Chi-square of a fit weighted by known uncertainties, with its probability.
pub fn chi_square(found: &Fit) -> Option<Tested> {
    let (statistic, freedom) = (found.residual_sum_of_squares, found.degrees_of_freedom);
    (freedom > 0.0).then(|| Tested {
        statistic,
        degrees: (freedom, f64::INFINITY),
        probability: chi_square_upper(statistic, freedom),
    })
}

/// γ_1, γ_2, their uncertainties and correlation, in µGal and m.
fn ties_example(which: usize) -> f64 {
    let (low, high) = ([0.25, 0.25, 0.85, 1.45], [0.85, 1.45, 1.45, 1.95]);
    let difference = [-187.4e-8, -371.9e-8, -184.1e-8, -152.2e-8];
    let rule = TiesFit { degree: 2, uncertainties: [0.9e-8, 1.1e-8, 0.9e-8, 1.3e-8].into(), scatter: Scatter::Stated };
    let Ok(estimate) = rule.estimate(&[&low, &high, &difference]) else { return f64::NAN };
    let covariance = &estimate.own_covariance;
    match which {
        0 | 1 => estimate.values[which] * 1e8,
        2 => covariance[0][0].sqrt() * 1e8,
        3 => covariance[1][1].sqrt() * 1e8,
        _ => covariance[0][1] / (covariance[0][0] * covariance[1][1]).sqrt(),
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn differences(rule: &dyn Estimator, columns: &[Vec<f64>], steps: &[f64]) {
        let references = |columns: &[Vec<f64>]| -> Estimate {
            let slices: Vec<&[f64]> = columns.iter().map(Vec::as_slice).collect();
            rule.estimate(&slices).expect("an estimate")
        };
        let found = references(columns);
        for (column, step) in steps.iter().enumerate() {
            for row in 0..columns[column].len() {
                let displaced = |sign: f64| {
                    let mut moved = columns.to_vec();
                    moved[column][row] += sign * step;
                    references(&moved).values
                };
                let (above, below) = (displaced(1.0), displaced(-1.0));
                for output in 0..found.values.len() {
                    let numeric = (above[output] - below[output]) / (2.0 * step);
                    let analytic = found.jacobian[column][output][row];
                    let scale = found.jacobian[column][output].iter().fold(0.0_f64, |top, cell| top.max(cell.abs()));
                    assert!((numeric - analytic).abs() < 1e-5 * scale, "column {column}, row {row}, output {output}");
                }
            }
        }
    }

    #[test]
    fn sensitivities_of_ties_agree_with_differences() {
        let rule =
            TiesFit { degree: 2, uncertainties: [0.9e-8, 1.1e-8, 0.9e-8, 1.3e-8].into(), scatter: Scatter::Stated };
        let columns = [
            vec![0.25, 0.25, 0.85, 1.45],
            vec![0.85, 1.45, 1.45, 1.95],
            vec![-187.4e-8, -371.9e-8, -184.1e-8, -152.2e-8],
        ];
        differences(&rule, &columns, &[1e-4, 1e-4, 1e-9]);
    }

    #[test]
    fn sensitivities_of_readings_agree_with_differences() {
        let times: Vec<f64> = (0..7).map(|index| 600.0 * f64::from(index)).collect();
        let rule = ReadingsFit {
            degree: 2,
            drift_degree: 1,
            times: times.into(),
            uncertainties: [1e-8; 7].into(),
            scatter: Scatter::FromResiduals,
        };
        let z = vec![0.2, 0.8, 1.3, 0.2, 0.8, 1.3, 0.2];
        let readings = vec![400.0e-8, 210.0e-8, 60.0e-8, 403.0e-8, 214.0e-8, 66.0e-8, 407.0e-8];
        differences(&rule, &[z, readings], &[1e-4, 1e-9]);
    }

    #[test]
    fn too_few_ties_are_refused() {
        let rule = |count: usize, scatter| TiesFit { degree: 2, uncertainties: vec![1e-8; count].into(), scatter };
        let (low, high, difference) = ([0.2, 0.2], [0.8, 1.3], [-180e-8, -330e-8]);
        assert!(rule(2, Scatter::Stated).estimate(&[&low, &high, &difference]).is_ok());
        let refused = rule(2, Scatter::FromResiduals).estimate(&[&low, &high, &difference]);
        assert_eq!(refused.err().map(|problem| problem.code), Some(Code::DesignIncomplete));
        let one = rule(1, Scatter::Stated).estimate(&[&low[..1], &high[..1], &difference[..1]]);
        assert_eq!(one.err().map(|problem| problem.code), Some(Code::DesignIncomplete));
    }
}
