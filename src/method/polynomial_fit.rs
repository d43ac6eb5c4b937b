//! Straight line or polynomial by least squares, weighted or not, with jointly estimated coefficients.
//!
//! # Source    JCGM 100:2008, H.3 (straight line; covariance of the coefficients and of a prediction). Choice of the
//!             degree by the F test of each added term, lack of fit by replicates: N. R. Draper, H. Smith, Applied
//!             Regression Analysis, 3rd ed. (1998), chapters 2 and 6 (recalled).
//! # Formula   y_i = Σ_k c_k (x_i − x_0)^k;  s² = Σ w_i r_i²/(n − p);  covariance s² (AᵀWA)⁻¹, or (AᵀWA)⁻¹ with
//!             w_i = 1/u_i² where the u_i are taken as known
//!             added term: F = (RSS_(K−1) − RSS_K)/s_K² with 1 and n − p degrees of freedom
//!             lack of fit: F = [SS_lack/(m − p)]/[SS_pure/(n − m)] over m different abscissae
//! # Valid for abscissae whose uncertainty is far below that of the ordinates; it is propagated to first order.

use super::statistic::{brief, probability, uncertainty_of_deviation};
use super::{Method, WorkedExample, scaled};
use crate::diagnostic::{Code, Problem};
use crate::graph::{Decision, Estimate, Estimator, MethodInfo};
use crate::numeric::distribution::{chi_square_upper, f_upper};
use crate::numeric::elementary::powi;
use crate::numeric::least_squares::{Fit, fit};
use crate::numeric::linear::bilinear;
use crate::numeric::sum::sum;
use std::sync::Arc;

/// The registry's line.
pub static METHOD: Method = Method {
    info: MethodInfo {
        name: "polynomial-fit",
        title: "Straight line or polynomial by least squares",
        source: "JCGM 100:2008, H.3; degree by the F test of each added term, common practice",
        formula: "y_i = Σ_k c_k (x_i − x_0)^k;  cov(c) = s² (AᵀWA)⁻¹, or (AᵀWA)⁻¹ for known u(y_i)",
        symbols: &[
            ("c_k", "coefficient of the power k", ""),
            ("x_i", "abscissa", ""),
            ("x_0", "reference abscissa", ""),
            ("y_i", "ordinate", ""),
            ("s", "experimental standard deviation of the residuals", ""),
        ],
        valid_for: "more points than coefficients; uncertainty of the abscissae small",
    },
    examples: &[
        guide("c_0/°C", "-0.1712", || guide_example(0)),
        guide("c_1", "0.00218", || guide_example(1)),
        guide("u(c_0)/°C", "0.0029", || guide_example(2)),
        guide("u(c_1)", "0.00067", || guide_example(3)),
        guide("r(c_0, c_1)", "-0.930", || guide_example(4)),
        guide("prediction at 30 °C/°C", "-0.1494", || guide_example(5)),
        guide("u of the prediction at 30 °C/°C", "0.0041", || guide_example(6)),
        drift("slope/(µg/a)", "0.9332786997", || drift_example(0)),
        drift("prediction for 2026.2/µg", "1282.802044622", || drift_example(1)),
        drift("u of the prediction/µg", "3.889699601", || drift_example(2)),
        drift("chi-square", "2.997816111", || drift_example(3)),
    ],
};

const fn guide(quantity: &'static str, printed: &'static str, found: fn() -> f64) -> WorkedExample {
    WorkedExample {
        source: "JCGM 100:2008, H.3, table H.6",
        given: "11 corrections of a thermometer, x_0 = 20 °C",
        quantity,
        printed,
        found,
    }
}

const fn drift(quantity: &'static str, printed: &'static str, found: fn() -> f64) -> WorkedExample {
    WorkedExample {
        source: "invented recalibrations, computed in high precision from the weighted line centred at its weighted mean",
        given: "7 masses from 2008 to 2023 with u from 6 µg to 4 µg, taken as known",
        quantity,
        printed,
        found,
    }
}

/// What is known of the scatter of the ordinates; the numbers are their standard uncertainties.
#[derive(Debug, Clone, PartialEq)]
pub enum Weighting {
    /// One unknown scatter.
    Equal,
    /// Standard uncertainties taken as known.
    Absolute(Arc<[f64]>),
    /// Standard uncertainties known up to a common factor.
    Relative(Arc<[f64]>),
    /// Ordinates that carry their own uncertainty: they are weighted by it and pass it on, nothing is added.
    Carried(Arc<[f64]>),
}

impl Weighting {
    fn uncertainties(&self) -> Option<&[f64]> {
        match self {
            Weighting::Equal => None,
            Weighting::Absolute(list) | Weighting::Relative(list) | Weighting::Carried(list) => Some(list),
        }
    }

    /// Weights relative to that of the most certain point, and the standard uncertainty of unit weight.
    fn weights(&self) -> (Option<Vec<f64>>, f64) {
        let Some(list) = self.uncertainties() else { return (None, 1.0) };
        let smallest = list.iter().copied().fold(f64::INFINITY, f64::min);
        (Some(list.iter().map(|u| (smallest / u) * (smallest / u)).collect()), smallest)
    }

    /// Whether the uncertainties stand without a factor, so that chi-square can be judged.
    pub fn is_known(&self) -> bool {
        matches!(self, Weighting::Absolute(_) | Weighting::Carried(_))
    }
}

/// The rule: columns x and y; outputs c_0 … c_K.
#[derive(Debug, Clone)]
pub struct PolynomialFit {
    pub degree: usize,
    /// x_0 in the unit of the column.
    pub reference: f64,
    pub weighting: Weighting,
    /// How the degree was chosen and what the tests said.
    pub decisions: Vec<Decision>,
}

impl PolynomialFit {
    /// The fit by itself.
    ///
    /// # Errors
    /// `design_incomplete` when the points do not determine the coefficients.
    pub fn fit(&self, x: &[f64], y: &[f64]) -> Result<Fit, Problem> {
        if x.len() <= self.degree + 1 && !self.weighting.is_known() {
            let message = format!(
                "A polynomial of degree {} with its uncertainty needs {} points or more, found {}.",
                self.degree,
                self.degree + 2,
                x.len()
            );
            return Err(Problem::new(Code::DesignIncomplete, message).hint("Add points, or take a lower degree."));
        }
        let powers: Vec<Vec<f64>> =
            (0..=self.degree).map(|k| x.iter().map(|x| powi(x - self.reference, k as i32)).collect()).collect();
        let columns: Vec<&[f64]> = powers.iter().map(Vec::as_slice).collect();
        fit(&columns, y, self.weighting.weights().0.as_deref())
    }

    /// The numbers that say how well the polynomial fits.
    pub fn quality(&self, found: &Fit, x: &[f64], y: &[f64]) -> Quality {
        let freedom = found.degrees_of_freedom;
        let squares = sum(found.residuals.iter().map(|r| r * r));
        let deviation = if freedom > 0.0 { (squares / freedom).sqrt() } else { f64::NAN };
        let alike = self.weighting == Weighting::Equal && freedom > 0.0;
        Quality {
            deviation,
            deviation_uncertainty: if alike { uncertainty_of_deviation(deviation, freedom) } else { 0.0 },
            degrees_of_freedom: freedom,
            chi_square: self.chi_square(found),
            lack_of_fit: self.lack_of_fit(found, x, y),
        }
    }

    /// Chi-square of the residuals with its degrees of freedom and probability, where the uncertainties are known.
    pub fn chi_square(&self, found: &Fit) -> Option<Tested> {
        let (_, unit) = self.weighting.weights();
        let statistic = found.residual_sum_of_squares / (unit * unit);
        let known = self.weighting.is_known() && found.degrees_of_freedom > 0.0;
        known.then(|| Tested {
            statistic,
            degrees: (found.degrees_of_freedom, f64::INFINITY),
            probability: chi_square_upper(statistic, found.degrees_of_freedom),
        })
    }

    /// The test of lack of fit against the scatter of ordinates at equal abscissae.
    pub fn lack_of_fit(&self, found: &Fit, x: &[f64], y: &[f64]) -> Option<Tested> {
        let mut order: Vec<usize> = (0..x.len().min(y.len())).collect();
        order.sort_by(|a, b| x[*a].total_cmp(&x[*b]).then(a.cmp(b)));
        let groups: Vec<&[usize]> = order.chunk_by(|a, b| x[*a] == x[*b]).collect();
        let weight = |row: usize| found.weights.get(row).copied().unwrap_or(1.0);
        let pure = sum(groups.iter().map(|rows| {
            let first = y[rows[0]];
            let total = sum(rows.iter().map(|row| weight(*row)));
            let mean = sum(rows.iter().map(|row| weight(*row) * (y[*row] - first))) / total;
            sum(rows.iter().map(|row| weight(*row) * (y[*row] - first - mean) * (y[*row] - first - mean)))
        }));
        let (lack, replicates) = (groups.len() as f64 - (self.degree + 1) as f64, (x.len() - groups.len()) as f64);
        if lack < 1.0 || replicates < 1.0 || pure <= 0.0 {
            return None;
        }
        let statistic = ((found.residual_sum_of_squares - pure).max(0.0) / lack) / (pure / replicates);
        Some(Tested { statistic, degrees: (lack, replicates), probability: f_upper(statistic, lack, replicates) })
    }
}

/// How well a polynomial fits its points.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Quality {
    /// √(Σ r_i²/(n − p)), in the unit of the ordinates; not a number without degrees of freedom.
    pub deviation: f64,
    /// Its own standard uncertainty where all points count alike, else zero.
    pub deviation_uncertainty: f64,
    pub degrees_of_freedom: f64,
    pub chi_square: Option<Tested>,
    pub lack_of_fit: Option<Tested>,
}

impl Quality {
    /// Standard deviation of the residuals, chi-square, F of the lack of fit; not a number where there is none.
    pub fn numbers(&self) -> [f64; 3] {
        let statistic = |tested: Option<Tested>| tested.map_or(f64::NAN, |tested| tested.statistic);
        [self.deviation, statistic(self.chi_square), statistic(self.lack_of_fit)]
    }
}

/// A test: its statistic, its degrees of freedom, and the probability of a larger value.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Tested {
    pub statistic: f64,
    /// Of chi-square (the second infinite), or of numerator and denominator of F.
    pub degrees: (f64, f64),
    pub probability: f64,
}

impl Tested {
    /// `F(3, 8) = 1.23, p = 0.36` or `χ² = 5.1 with 4 degrees of freedom, p = 0.28`.
    pub fn words(&self) -> String {
        let p = probability(self.probability);
        match self.degrees {
            (first, second) if second.is_finite() => format!("F({first}, {second}) = {}, {p}", brief(self.statistic)),
            (freedom, _) => format!("χ² = {} with {freedom} degrees of freedom, {p}", brief(self.statistic)),
        }
    }
}

/// Raises the degree from one while the F test of the added term is significant at `probability`; the first
/// term that is not ends the search.
///
/// # Errors
/// Those of the fits.
pub fn choose_degree(
    rule: &PolynomialFit,
    x: &[f64],
    y: &[f64],
    largest: usize,
    confidence: f64,
) -> Result<PolynomialFit, Problem> {
    let mut chosen = PolynomialFit { degree: 1, ..rule.clone() };
    let mut found = chosen.fit(x, y)?;
    for degree in 2..=largest {
        let next = PolynomialFit { degree, ..rule.clone() };
        let Ok(higher) = next.fit(x, y) else { break };
        let Some(variance) = higher.residual_variance() else { break };
        let statistic = (found.residual_sum_of_squares - higher.residual_sum_of_squares).max(0.0) / variance;
        let tested = Tested {
            statistic,
            degrees: (1.0, higher.degrees_of_freedom),
            probability: f_upper(statistic, 1.0, higher.degrees_of_freedom),
        };
        let taken = tested.probability < 1.0 - confidence;
        chosen.decisions.push(Decision {
            what: format!("degree {degree} against {}", degree - 1),
            decided: format!(
                "{}; {}",
                tested.words(),
                if taken { "significant, taken" } else { "not significant, not taken" }
            ),
        });
        if !taken {
            break;
        }
        let decisions = std::mem::take(&mut chosen.decisions);
        chosen = PolynomialFit { decisions, ..next };
        found = higher;
    }
    let limit = format!("{}, by F tests at the level {}, degree {largest} at most", chosen.degree, brief(confidence));
    chosen.decisions.push(Decision { what: "degree".into(), decided: limit });
    Ok(chosen)
}

impl Estimator for PolynomialFit {
    fn outputs(&self) -> usize {
        self.degree + 1
    }

    fn estimate(&self, columns: &[&[f64]]) -> Result<Estimate, Problem> {
        let [x, y] = columns else {
            return Err(Problem::new(Code::DesignIncomplete, "A fit needs abscissae and ordinates."));
        };
        if x.len() != y.len() {
            let message = format!("A fit has {} abscissae, but {} ordinates.", x.len(), y.len());
            return Err(Problem::new(Code::DesignIncomplete, message).hint("Each ordinate needs its abscissa."));
        }
        let found = self.fit(x, y)?;
        let (_, unit) = self.weighting.weights();
        let (variance, degrees_of_freedom) = match self.weighting {
            Weighting::Equal | Weighting::Relative(_) => {
                (found.residual_variance().unwrap_or(f64::NAN), found.degrees_of_freedom)
            }
            Weighting::Absolute(_) => (unit * unit, f64::INFINITY),
            Weighting::Carried(_) => (0.0, f64::INFINITY),
        };
        Ok(Estimate {
            own_covariance: scaled(&found.unscaled_covariance, variance),
            degrees_of_freedom,
            decisions: self.decisions.clone(),
            residuals: found.residuals.clone(),
            values: found.coefficients.clone(),
            jacobian: vec![self.abscissa_response(&found, x), found.jacobian],
        })
    }
}

impl PolynomialFit {
    /// d coefficient / d x_i: an abscissa shapes every power.
    fn abscissa_response(&self, found: &Fit, x: &[f64]) -> Vec<Vec<f64>> {
        let mut response = vec![vec![0.0; x.len()]; self.degree + 1];
        for k in 1..=self.degree {
            let slopes: Vec<f64> = x.iter().map(|x| k as f64 * powi(x - self.reference, k as i32 - 1)).collect();
            for (row, by_entry) in response.iter_mut().zip(found.design_response(k)) {
                row.iter_mut()
                    .zip(by_entry)
                    .zip(&slopes)
                    .for_each(|((cell, derivative), slope)| *cell += derivative * slope);
            }
        }
        response
    }
}

fn guide_example(which: usize) -> f64 {
    let x = [21.521, 22.012, 22.512, 23.003, 23.507, 23.999, 24.513, 25.002, 25.503, 26.010, 26.511];
    let y = [-0.171, -0.169, -0.166, -0.159, -0.164, -0.165, -0.156, -0.157, -0.159, -0.161, -0.160];
    let rule = PolynomialFit { degree: 1, reference: 20.0, weighting: Weighting::Equal, decisions: Vec::new() };
    let Ok(found) = rule.estimate(&[&x, &y]) else { return f64::NAN };
    let (c, cov, ahead) = (&found.values, &found.own_covariance, [1.0, 10.0]);
    match which {
        0 | 1 => c[which],
        2 => cov[0][0].sqrt(),
        3 => cov[1][1].sqrt(),
        4 => cov[0][1] / (cov[0][0] * cov[1][1]).sqrt(),
        5 => c[0] + 10.0 * c[1],
        _ => bilinear(&ahead, cov, &ahead).sqrt(),
    }
}

fn drift_example(which: usize) -> f64 {
    let x = [2008.3, 2010.6, 2013.1, 2015.4, 2018.0, 2020.5, 2023.2];
    let y = [1264.5, 1266.4, 1275.2, 1270.1, 1281.3, 1274.8, 1279.9];
    let weighting = Weighting::Absolute(Arc::from([6.0, 6.0, 6.0, 5.0, 5.0, 4.0, 4.0]));
    let rule = PolynomialFit { degree: 1, reference: 2026.2, weighting, decisions: Vec::new() };
    let (Ok(estimate), Ok(found)) = (rule.estimate(&[&x, &y]), rule.fit(&x, &y)) else { return f64::NAN };
    match which {
        0 => estimate.values[1],
        1 => estimate.values[0],
        2 => estimate.own_covariance[0][0].sqrt(),
        _ => rule.chi_square(&found).map_or(f64::NAN, |tested| tested.statistic),
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn rule(degree: usize, weighting: Weighting) -> PolynomialFit {
        PolynomialFit { degree, reference: 1.5, weighting, decisions: Vec::new() }
    }

    /// A cubic with a scatter a thousand times smaller than its cubic term.
    fn cubic() -> (Vec<f64>, Vec<f64>) {
        let x: Vec<f64> = (0..24).map(|i| f64::from(i) / 8.0).collect();
        let y = x
            .iter()
            .enumerate()
            .map(|(i, x)| 2.0 + x - 0.5 * x * x + 0.3 * x * x * x + 1e-4 * libm::sin(7.0 * i as f64))
            .collect();
        (x, y)
    }

    #[test]
    fn the_degree_rises_while_terms_are_significant() {
        let (x, y) = cubic();
        let chosen = choose_degree(&rule(1, Weighting::Equal), &x, &y, 6, 0.99).expect("a fit");
        assert_eq!(chosen.degree, 3);
        assert_eq!(chosen.decisions.len(), 4, "{:?}", chosen.decisions);
        assert!(chosen.decisions[2].decided.contains("not significant"));
    }

    #[test]
    fn responses_agree_with_differences() {
        let (x, y) = cubic();
        let u: Arc<[f64]> = (0..24).map(|i| 1e-4 * (1.0 + f64::from(i % 3))).collect();
        let rule = rule(2, Weighting::Relative(u));
        let centre = rule.estimate(&[&x, &y]).expect("a fit");
        for column in 0..2 {
            let moved = |step: f64| {
                let mut columns = [x.clone(), y.clone()];
                columns[column][5] += step;
                rule.estimate(&[&columns[0], &columns[1]]).expect("a fit").values
            };
            let (up, down) = (moved(1e-5), moved(-1e-5));
            for k in 0..3 {
                let difference = (up[k] - down[k]) / 2e-5;
                let ours = centre.jacobian[column][k][5];
                assert!((ours - difference).abs() < 1e-6 * (1.0 + ours.abs()), "{column} {k}: {ours} {difference}");
            }
        }
    }

    /// Known uncertainties keep their size; relative ones are scaled by the scatter found.
    #[test]
    fn absolute_and_relative_differ_by_the_scatter() {
        let (x, y) = cubic();
        let u: Arc<[f64]> = vec![0.5; 24].into();
        let known = rule(1, Weighting::Absolute(u.clone())).estimate(&[&x, &y]).expect("a fit");
        let scaled = rule(1, Weighting::Relative(u.clone())).estimate(&[&x, &y]).expect("a fit");
        let equal = rule(1, Weighting::Equal).estimate(&[&x, &y]).expect("a fit");
        assert!((scaled.own_covariance[0][0] / equal.own_covariance[0][0] - 1.0).abs() < 1e-12);
        let variance = equal.residuals.iter().map(|r| r * r).sum::<f64>() / 22.0;
        assert!((known.own_covariance[0][0] / equal.own_covariance[0][0] - 0.25 / variance).abs() < 1e-9);
        assert_eq!((known.degrees_of_freedom, equal.degrees_of_freedom), (f64::INFINITY, 22.0));
        let carried = rule(1, Weighting::Carried(u)).estimate(&[&x, &y]).expect("a fit");
        assert_eq!(carried.own_covariance[0][0], 0.0);
    }

    /// Replicates at three abscissae off a line: SS_pure = 0.04, SS_lack = 2/3 · 3 by hand.
    #[test]
    fn lack_of_fit_by_hand() {
        let (x, y) = ([1.0, 1.0, 2.0, 2.0, 3.0, 3.0], [0.9, 1.1, 1.0, 1.0, 2.9, 3.1]);
        let rule = rule(1, Weighting::Equal);
        let found = rule.fit(&x, &y).expect("a fit");
        let tested = rule.lack_of_fit(&found, &x, &y).expect("replicates");
        // Means 1, 1, 3: line through 2/3, 5/3, 8/3; lack of fit 2 (1/9 + 4/9 + 1/9) = 4/3.
        assert!((tested.statistic - (4.0 / 3.0) / (0.04 / 3.0)).abs() < 1e-9, "{tested:?}");
        assert_eq!(tested.degrees, (1.0, 3.0));
        assert!(rule.lack_of_fit(&found, &[1.0, 2.0, 3.0], &[1.0, 1.0, 3.0]).is_none());
    }

    #[test]
    fn too_few_points_are_refused() {
        assert!(rule(1, Weighting::Equal).estimate(&[&[1.0, 2.0], &[1.0, 2.0]]).is_err());
        assert!(rule(1, Weighting::Equal).estimate(&[&[1.0, 2.0], &[1.0]]).is_err());
        assert!(rule(1, Weighting::Equal).estimate(&[&[1.0; 4], &[1.0, 2.0, 3.0, 4.0]]).is_err());
    }
}
