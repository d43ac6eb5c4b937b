//! Combination of several results of one quantity.
//!
//! # Source    weighted mean: JCGM 100:2008, 4.2.3 and common practice; covariance through shared inputs, 5.2;
//!             weights of least variance for correlated results: M. G. Cox, Metrologia 39 (2002) 589, appendix C.
//! # Formula   y = Σ w_i x_i,  Σ w_i = 1;  equal: w_i = 1/n;  inverse variance: w_i ∝ 1/(u²(x_i) + τ²);
//!             covariance: w ∝ (V + τ² I)⁻¹ 1
//!             u²(y) = wᵀV w + τ² Σ w_i²  with a component τ between the results, ν = n − 1 for its part
//!             u²(y) = f² wᵀV w           with an expansion factor f ≥ 1, ν = n − 1 for what it adds
//! The results are nodes of one graph: what they share is not divided by √n.
//! # Valid for results of one quantity. Whether they agree is tested by the method consistency.

use super::consistency::{self, Consistency, dersimonian_laird, expansion_factor, generalised_weights, paule_mandel};
use super::{Method, WorkedExample, exact};
use crate::diagnostic::Problem;
use crate::graph::{Builder, Decision, Estimate, Estimator, MethodInfo, Quantity};
use crate::numeric::linear::{Matrix, bilinear, times_vector};
use crate::numeric::sum::sum;

/// The registry's line.
pub static METHOD: Method = Method {
    info: MethodInfo {
        name: "combination",
        title: "Combination of several results",
        source: "weighted mean, common practice; JCGM 100:2008, 5.2 (covariance through shared inputs)",
        formula: "y = Σ w_i x_i,  Σ w_i = 1;  u²(y) = wᵀV w + τ² Σ w_i²",
        symbols: &[
            ("y", "combined result", ""),
            ("x_i", "result", ""),
            ("w_i", "weight", "1"),
            ("V", "covariance of the results", ""),
            ("τ", "standard deviation between results", ""),
        ],
        valid_for: "results of one quantity",
    },
    examples: &[
        WorkedExample {
            source: "three 2017 values of h (10⁻³⁴ J s) with uncertainties 60, 165 and 89 in the last digits; weighted mean of a public meta-analysis test file",
            given: "6.626070133(60), 6.62607005883(16.5e-8), 6.626069934(89)",
            quantity: "weighted mean",
            printed: "6.6260700698189",
            found: || {
                let builder = Builder::default();
                let list = [6.626_070_133, 6.626_070_058_83, 6.626_069_934].map(|x| exact(&builder, x, "1"));
                weighted(&list, &inverse_variance_weights(&[6.0e-8, 16.5e-8, 8.9e-8]))
                    .map_or(f64::NAN, Quantity::number)
            },
        },
        shared("mean", "17.80", || {
            runs_of_one_balance(|combination, x, _| sum(combination.weights.iter().zip(x).map(|(w, x)| w * x)))
        }),
        shared("u", "13.55", || {
            runs_of_one_balance(|combination, _, v| bilinear(&combination.weights, v, &combination.weights).sqrt())
        }),
        shared("weight of the third", "0.435", || runs_of_one_balance(|combination, _, _| combination.weights[2])),
        shared("chi-square", "0.374", || {
            runs_of_one_balance(|combination, _, _| combination.consistency.as_ref().map_or(f64::NAN, |c| c.chi_square))
        }),
    ],
};

const fn shared(quantity: &'static str, printed: &'static str, found: fn() -> f64) -> WorkedExample {
    WorkedExample {
        source: "invented, computed by hand: three results with a common part",
        given: "12, 25, 18 with uncertainties 14, 16, 12 of their own and 11 in common",
        quantity,
        printed,
        found,
    }
}

fn runs_of_one_balance(what: impl Fn(&Combination, &[f64], &[Vec<f64>]) -> f64) -> f64 {
    let (x, own, common) = ([12.0, 25.0, 18.0], [14.0, 16.0, 12.0], 11.0);
    let cell = |i: usize, j: usize| common * common + if i == j { own[i] * own[i] } else { 0.0 };
    let covariance: Matrix = (0..3).map(|i| (0..3).map(|j| cell(i, j)).collect()).collect();
    let choices = Choices { weights: Weights::Covariance, ..Choices::default() };
    combine(&x, &covariance, choices).map_or(f64::NAN, |combination| what(&combination, &x, &covariance))
}

/// How results are weighted.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default)]
pub enum Weights {
    #[default]
    Equal,
    InverseVariance,
    /// From the whole covariance of the results.
    Covariance,
}

/// How what varies between the results, beyond their uncertainties, is estimated.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default)]
pub enum Between {
    #[default]
    None,
    PauleMandel,
    DersimonianLaird,
}

/// By what the uncertainty of the mean is multiplied when the results disagree; never by less than one.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default)]
pub enum Expansion {
    #[default]
    None,
    /// The Birge ratio.
    BirgeRatio,
    /// The smallest factor of one decimal that brings each result within twice its enlarged uncertainty.
    Residuals,
}

/// What an author chooses.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default)]
pub struct Choices {
    pub weights: Weights,
    pub between: Between,
    pub expansion: Expansion,
}

/// Weights and what is added to the uncertainty of the mean.
#[derive(Debug, Clone, PartialEq)]
pub struct Combination {
    pub weights: Vec<f64>,
    /// None for one result, and where the covariance allows no test.
    pub consistency: Option<Consistency>,
    /// τ², in the square of the results' unit.
    pub between_variance: f64,
    /// At least one.
    pub expansion_factor: f64,
    /// The variance added to wᵀV w.
    pub added_variance: f64,
}

/// Weights, test of consistency and added variance for results with this covariance.
///
/// # Errors
/// `correlation_impossible` when a choice needs the inverse of the covariance, and one result is determined by others.
pub fn combine(results: &[f64], covariance: &[Vec<f64>], choices: Choices) -> Result<Combination, Problem> {
    let tested = if results.len() > 1 { Some(consistency::consistency(results, covariance)) } else { None };
    let needs_test = choices.between != Between::None || choices.expansion != Expansion::None;
    let consistency = match tested {
        Some(Err(problem)) if needs_test => return Err(problem),
        Some(found) => found.ok(),
        None => None,
    };
    let between_variance = match (choices.between, results.len()) {
        (Between::None, _) | (_, 0 | 1) => 0.0,
        (Between::PauleMandel, _) => paule_mandel(results, covariance)?,
        (Between::DersimonianLaird, _) => dersimonian_laird(results, covariance)?,
    };
    let enlarged = consistency::with_between(covariance, between_variance);
    let deviation = |matrix: &[Vec<f64>], i: usize| matrix[i][i].max(0.0).sqrt();
    let weights = match choices.weights {
        Weights::Equal => equal_weights(results.len()),
        Weights::InverseVariance => {
            inverse_variance_weights(&(0..results.len()).map(|i| deviation(&enlarged, i)).collect::<Vec<_>>())
        }
        Weights::Covariance => generalised_weights(&enlarged)?,
    };
    let expansion_factor = match (choices.expansion, &consistency) {
        (Expansion::BirgeRatio, Some(found)) => found.birge_ratio.max(1.0),
        (Expansion::Residuals, Some(found)) => expansion_factor(
            &found.residuals,
            &(0..results.len()).map(|i| deviation(covariance, i)).collect::<Vec<_>>(),
        ),
        _ => 1.0,
    };
    let propagated = bilinear(&weights, covariance, &weights);
    let added_variance = between_variance * sum(weights.iter().map(|w| w * w))
        + (expansion_factor * expansion_factor - 1.0) * propagated.max(0.0);
    Ok(Combination { weights, consistency, between_variance, expansion_factor, added_variance })
}

/// Standard uncertainty of each result's difference from the mean: √(V_ii − 2 (V w)_i + wᵀV w).
pub fn difference_uncertainties(covariance: &[Vec<f64>], weights: &[f64]) -> Vec<f64> {
    let (shared, own) = (times_vector(covariance, weights), bilinear(weights, covariance, weights));
    (0..weights.len()).map(|i| (covariance[i][i] - 2.0 * shared[i] + own).max(0.0).sqrt()).collect()
}

/// The rule of what disagreement adds to the mean: a departure of zero with a variance of its own, and the statistics
/// of the test: chi-square, chi-square over its degrees of freedom, its probability, the Birge ratio; then τ and the
/// expansion factor.
pub struct Disagreement {
    pub covariance: Matrix,
    pub added_variance: f64,
    /// τ in the results' unit, and the expansion factor: frozen, as the weights are.
    pub between: f64,
    pub expansion_factor: f64,
    pub decisions: Vec<Decision>,
}

/// How many outputs [`Disagreement`] has.
pub const DISAGREEMENT_OUTPUTS: usize = 7;

impl Estimator for Disagreement {
    fn outputs(&self) -> usize {
        DISAGREEMENT_OUTPUTS
    }

    fn estimate(&self, columns: &[&[f64]]) -> Result<Estimate, Problem> {
        let results: Vec<f64> = columns.iter().filter_map(|column| column.first().copied()).collect();
        let found = consistency::consistency(&results, &self.covariance)?;
        let reduced = found.chi_square / found.degrees_of_freedom;
        let own = |i: usize, j: usize| if (i, j) == (0, 0) { self.added_variance } else { 0.0 };
        Ok(Estimate {
            values: vec![
                0.0,
                found.chi_square,
                reduced,
                found.probability,
                found.birge_ratio,
                self.between,
                self.expansion_factor,
            ],
            jacobian: columns.iter().map(|column| vec![vec![0.0; column.len()]; DISAGREEMENT_OUTPUTS]).collect(),
            own_covariance: (0..DISAGREEMENT_OUTPUTS)
                .map(|i| (0..DISAGREEMENT_OUTPUTS).map(|j| own(i, j)).collect())
                .collect(),
            degrees_of_freedom: found.degrees_of_freedom,
            decisions: self.decisions.clone(),
            residuals: found.residuals,
        })
    }
}

/// Equal weights for `count` results.
pub fn equal_weights(count: usize) -> Vec<f64> {
    vec![1.0 / count.max(1) as f64; count]
}

/// Weights by inverse variance of the standard uncertainties given.
pub fn inverse_variance_weights(standard_uncertainties: &[f64]) -> Vec<f64> {
    let smallest = standard_uncertainties.iter().copied().fold(f64::INFINITY, f64::min);
    let raw: Vec<f64> = standard_uncertainties.iter().map(|u| (smallest / u) * (smallest / u)).collect();
    let total = sum(raw.iter().copied());
    raw.iter().map(|weight| weight / total).collect()
}

/// Σ w_i x_i, summed about the first result so that no digits are lost; `None` for an empty list.
pub fn weighted<'g>(results: &[Quantity<'g>], weights: &[f64]) -> Option<Quantity<'g>> {
    let first = *results.first()?;
    let departures = results.iter().zip(weights).skip(1).map(|(result, weight)| (*result - first) * *weight);
    let total = departures.reduce(|total, term| total + term);
    Some(match total {
        Some(total) => first + total,
        None => first.alias(),
    })
}

#[cfg(test)]
mod tests {
    use super::*;

    fn diagonal(u: &[f64]) -> Matrix {
        (0..u.len()).map(|i| (0..u.len()).map(|j| if i == j { u[i] * u[i] } else { 0.0 }).collect()).collect()
    }

    /// Results closer together than their uncertainties let expect: the factor stays one, u stays as propagated.
    #[test]
    fn an_uncertainty_is_never_reduced() {
        let (x, v) = ([1.0, 1.1, 0.9], diagonal(&[0.5, 0.5, 0.5]));
        for expansion in [Expansion::BirgeRatio, Expansion::Residuals] {
            let choices = Choices { expansion, weights: Weights::InverseVariance, ..Choices::default() };
            let found = combine(&x, &v, choices).expect("combined");
            assert!(found.consistency.as_ref().expect("tested").birge_ratio < 1.0);
            assert_eq!((found.expansion_factor, found.added_variance), (1.0, 0.0));
        }
    }

    /// An inconsistent set of four, invented: weighted mean 1.233 573 072, u 0.002 035 361, Birge ratio 2.922 302.
    #[test]
    fn disagreement_enlarges_the_uncertainty() {
        let (x, v) = ([1.234, 1.25, 1.219, 1.241], diagonal(&[0.003, 0.005, 0.004, 0.006]));
        let choices =
            Choices { expansion: Expansion::BirgeRatio, weights: Weights::InverseVariance, ..Choices::default() };
        let found = combine(&x, &v, choices).expect("combined");
        let u = (bilinear(&found.weights, &v, &found.weights) + found.added_variance).sqrt();
        assert!((u / 0.00594794610499 - 1.0).abs() < 1e-8, "{u}");
    }

    /// With uncorrelated results the two weightings are one; with a part in common the weights are those of the rest.
    #[test]
    fn weights_of_the_whole_covariance() {
        let (x, alone) = ([12.0, 25.0, 18.0], diagonal(&[14.0, 16.0, 12.0]));
        let shared: Matrix = alone.iter().map(|row| row.iter().map(|cell| cell + 121.0).collect()).collect();
        let weights = |v: &[Vec<f64>], weights| {
            combine(&x, v, Choices { weights, ..Choices::default() }).expect("combined").weights
        };
        let by_variance = weights(&alone, Weights::InverseVariance);
        for found in [weights(&alone, Weights::Covariance), weights(&shared, Weights::Covariance)] {
            assert!(found.iter().zip(&by_variance).all(|(a, b)| (a - b).abs() < 1e-12), "{found:?}");
        }
        let equal = weights(&shared, Weights::Equal);
        assert_eq!(equal, [1.0 / 3.0; 3]);
    }

    /// A mean of least variance and its differences from the results are independent: u²(d) = u²(x) − u²(y).
    #[test]
    fn differences_are_as_certain_as_what_is_not_shared() {
        let (x, alone) = ([12.0, 25.0, 18.0], diagonal(&[14.0, 16.0, 12.0]));
        let shared: Matrix = alone.iter().map(|row| row.iter().map(|cell| cell + 121.0).collect()).collect();
        let weights = combine(&x, &shared, Choices { weights: Weights::Covariance, ..Choices::default() })
            .expect("combined")
            .weights;
        let of_mean = bilinear(&weights, &shared, &weights);
        for (i, u) in difference_uncertainties(&shared, &weights).into_iter().enumerate() {
            assert!((u * u - (shared[i][i] - of_mean)).abs() < 1e-9);
        }
    }

    #[test]
    fn one_result_and_determined_results() {
        let one = combine(&[3.0], &[vec![4.0]], Choices { between: Between::PauleMandel, ..Choices::default() })
            .expect("one");
        assert_eq!((one.weights, one.consistency, one.added_variance), (vec![1.0], None, 0.0));
        let twins = vec![vec![1.0, 1.0], vec![1.0, 1.0]];
        assert!(combine(&[1.0, 1.0], &twins, Choices::default()).expect("equal weights").consistency.is_none());
        for choices in [
            Choices { weights: Weights::Covariance, ..Choices::default() },
            Choices { between: Between::PauleMandel, ..Choices::default() },
        ] {
            assert!(combine(&[1.0, 1.0], &twins, choices).is_err());
        }
    }
}
