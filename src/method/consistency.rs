//! Whether results of one quantity agree, and how much they vary between them beyond their uncertainties.
//!
//! # Source    chi-square and Birge ratio: R. T. Birge, Phys. Rev. 40 (1932) 207; M. G. Cox, Metrologia 39 (2002) 589
//!             (procedure A, and correlated results). Between component: R. C. Paule, J. Mandel, J. Res. Natl. Bur.
//!             Stand. 87 (1982) 377; R. DerSimonian, N. Laird, Control. Clin. Trials 7 (1986) 177 (recalled).
//! # Formula   with the covariance V of the results, W = V⁻¹, y = (1ᵀW x)/(1ᵀW 1), r = x − y:
//!             χ² = rᵀW r,  ν = n − 1,  R_B = √(χ²/ν)
//!             Paule–Mandel: τ² ≥ 0 with rᵀ(V + τ² I)⁻¹ r = ν
//!             DerSimonian–Laird: τ² = max(0, (χ² − ν)/[tr W − (1ᵀW W 1)/(1ᵀW 1)])
//! For uncorrelated results these are the usual sums with weights 1/u². A part that all results share changes
//! neither χ² nor τ².
//! # Valid for two results or more, none wholly determined by the others.

use super::{Method, WorkedExample};
use crate::diagnostic::Problem;
use crate::graph::MethodInfo;
use crate::numeric::distribution::chi_square_upper;
use crate::numeric::linear::{Matrix, cholesky, solve_symmetric};
use crate::numeric::root::bisect;
use crate::numeric::sum::{dot, sum};

/// The registry's line.
pub static METHOD: Method = Method {
    info: MethodInfo {
        name: "consistency",
        title: "Consistency of results and variation between them",
        source: "Birge (1932); Cox, Metrologia 39 (2002) 589; Paule and Mandel (1982); DerSimonian and Laird (1986)",
        formula: "χ² = rᵀV⁻¹r,  R_B = √(χ²/(n − 1));  τ²: rᵀ(V + τ² I)⁻¹r = n − 1",
        symbols: &[
            ("r", "results less their generalised mean", ""),
            ("V", "covariance of the results", ""),
            ("R_B", "Birge ratio", "1"),
            ("τ", "standard deviation between results", ""),
            ("n", "number of results", "1"),
        ],
        valid_for: "two results or more, none determined by the others",
    },
    examples: &[
        planck("chi-square", "3.442127", || planck_consistency(|c| c.chi_square)),
        planck("p", "0.1788758", || planck_consistency(|c| c.probability)),
        planck("Birge ratio", "1.31189312", || planck_consistency(|c| c.birge_ratio)),
        special("h/(10⁻³⁴ J s)", "6.6260701563511", || special_adjustment(|c, _| c.mean)),
        special("chi-square", "23.0335", || special_adjustment(|c, _| c.chi_square)),
        special("expansion factor", "1.7", || special_adjustment(|c, u| expansion_factor(&c.residuals, u))),
        illustrated("h/(10⁻³⁴ J s)", "6.6260701530285", || illustrated_adjustment(|c| c.mean)),
        illustrated("chi-square", "25.1121", || illustrated_adjustment(|c| c.chi_square)),
        six("τ² of Paule and Mandel", "57.888175589", || paule_mandel(&SIX, &diagonal(&SIX_U)).unwrap_or(f64::NAN)),
        six("τ² of DerSimonian and Laird", "60.243114955", || {
            dersimonian_laird(&SIX, &diagonal(&SIX_U)).unwrap_or(f64::NAN)
        }),
        six("chi-square", "13.2165618627", || consistency(&SIX, &diagonal(&SIX_U)).map_or(f64::NAN, |c| c.chi_square)),
        six("p", "0.0214317001509", || consistency(&SIX, &diagonal(&SIX_U)).map_or(f64::NAN, |c| c.probability)),
    ],
};

const fn planck(quantity: &'static str, printed: &'static str, found: fn() -> f64) -> WorkedExample {
    WorkedExample {
        source: "three 2017 values of h; chi-square and p as printed in a public meta-analysis test file, the Birge ratio computed",
        given: "6.626070133(60), 6.62607005883(16.5e-8), 6.626069934(89)",
        quantity,
        printed,
        found,
    }
}

const fn special(quantity: &'static str, printed: &'static str, found: fn() -> f64) -> WorkedExample {
    WorkedExample {
        source: "data of the 2017 special adjustment for h and N_A (inputs recalled), correlations left out; the factor 1.7 as published",
        given: "four values of h and four of N_A",
        quantity,
        printed,
        found,
    }
}

const fn illustrated(quantity: &'static str, printed: &'static str, found: fn() -> f64) -> WorkedExample {
    WorkedExample {
        source: "the same data with an illustrative correlation, computed in high precision",
        given: "correlation 0.2 among the four values of N_A",
        quantity,
        printed,
        found,
    }
}

const fn six(quantity: &'static str, printed: &'static str, found: fn() -> f64) -> WorkedExample {
    WorkedExample {
        source: "invented, computed in high precision",
        given: "12.3(6.0), −4.1(5.0), 7.7(8.0), 25.0(7.0), 3.2(4.0), 9.8(10.0)",
        quantity,
        printed,
        found,
    }
}

/// Agreement of results.
#[derive(Debug, Clone, PartialEq)]
pub struct Consistency {
    /// The mean weighted by the inverse covariance.
    pub mean: f64,
    pub chi_square: f64,
    pub degrees_of_freedom: f64,
    /// Probability of a larger chi-square by chance.
    pub probability: f64,
    pub birge_ratio: f64,
    /// Results less that mean.
    pub residuals: Vec<f64>,
}

/// The weights of least variance for results with this covariance; they sum to one, and some may be negative.
///
/// # Errors
/// `correlation_impossible` when one result is wholly determined by the others.
pub fn generalised_weights(covariance: &[Vec<f64>]) -> Result<Vec<f64>, Problem> {
    let solved = solve_symmetric(covariance, &vec![1.0; covariance.len()])?;
    let total = sum(solved.iter().copied());
    Ok(solved.iter().map(|weight| weight / total).collect())
}

/// The first result that those before it determine wholly, to within rounding; none when the covariance has an inverse.
pub fn first_determined(covariance: &[Vec<f64>]) -> Option<usize> {
    let leading = |size: usize| -> Matrix { covariance[..size].iter().map(|row| row[..size].to_vec()).collect() };
    (0..covariance.len()).find(|index| cholesky(&leading(index + 1)).is_err())
}

/// Chi-square, its probability and the Birge ratio.
///
/// # Errors
/// As [`generalised_weights`].
pub fn consistency(results: &[f64], covariance: &[Vec<f64>]) -> Result<Consistency, Problem> {
    let weights = generalised_weights(covariance)?;
    let first = results.first().copied().unwrap_or(f64::NAN);
    let mean = first + sum(results.iter().zip(&weights).map(|(x, w)| w * (x - first)));
    let residuals: Vec<f64> = results.iter().map(|x| x - mean).collect();
    let chi_square = dot(&residuals, &solve_symmetric(covariance, &residuals)?).max(0.0);
    let degrees_of_freedom = results.len() as f64 - 1.0;
    Ok(Consistency {
        mean,
        chi_square,
        degrees_of_freedom,
        probability: chi_square_upper(chi_square, degrees_of_freedom),
        birge_ratio: if degrees_of_freedom > 0.0 { (chi_square / degrees_of_freedom).sqrt() } else { 0.0 },
        residuals,
    })
}

/// The covariance with τ² added to each variance.
pub fn with_between(covariance: &[Vec<f64>], tau_squared: f64) -> Matrix {
    let cell = |i: usize, j: usize, value: f64| if i == j { value + tau_squared } else { value };
    covariance
        .iter()
        .enumerate()
        .map(|(i, row)| row.iter().enumerate().map(|(j, value)| cell(i, j, *value)).collect())
        .collect()
}

/// τ² of Paule and Mandel; zero where the results vary less than their uncertainties let expect.
///
/// # Errors
/// As [`generalised_weights`].
pub fn paule_mandel(results: &[f64], covariance: &[Vec<f64>]) -> Result<f64, Problem> {
    let expected = results.len() as f64 - 1.0;
    if consistency(results, covariance)?.chi_square <= expected {
        return Ok(0.0);
    }
    let missing = |tau_squared: f64| {
        consistency(results, &with_between(covariance, tau_squared))
            .map_or(f64::NAN, |found| expected - found.chi_square)
    };
    let mean = super::mean_or_nan(results);
    let most = sum(results.iter().map(|x| (x - mean) * (x - mean))) / expected;
    // Scaled so that halving ends after the digits, whatever the unit.
    Ok(bisect(0.0, 1.001, |share| missing(share * most)).unwrap_or(f64::NAN) * most)
}

/// τ² of DerSimonian and Laird.
///
/// # Errors
/// As [`generalised_weights`].
pub fn dersimonian_laird(results: &[f64], covariance: &[Vec<f64>]) -> Result<f64, Problem> {
    let size = covariance.len();
    let unit = |k: usize| -> Vec<f64> { (0..size).map(|i| f64::from(u8::from(i == k))).collect() };
    let inverse: Matrix = (0..size).map(|k| solve_symmetric(covariance, &unit(k))).collect::<Result<_, _>>()?;
    let row_sums: Vec<f64> = inverse.iter().map(|row| sum(row.iter().copied())).collect();
    let trace = sum(inverse.iter().enumerate().filter_map(|(k, row)| row.get(k).copied()));
    let divisor = trace - dot(&row_sums, &row_sums) / sum(row_sums.iter().copied());
    let found = consistency(results, covariance)?;
    Ok(((found.chi_square - found.degrees_of_freedom) / divisor).max(0.0))
}

/// The smallest factor with one decimal, not below one, that brings every residual within twice its enlarged
/// uncertainty: the rule of the 2017 special adjustment of the constants.
pub fn expansion_factor(residuals: &[f64], standard_uncertainties: &[f64]) -> f64 {
    let largest = residuals.iter().zip(standard_uncertainties).map(|(r, u)| (r / u).abs()).fold(0.0, f64::max);
    // The hair keeps a residual of exactly two uncertainties from asking for 1.1.
    (libm::ceil(largest * 5.0 * (1.0 - 1e-12)) / 10.0).max(1.0)
}

const SIX: [f64; 6] = [12.3, -4.1, 7.7, 25.0, 3.2, 9.8];
const SIX_U: [f64; 6] = [6.0, 5.0, 8.0, 7.0, 4.0, 10.0];

fn diagonal(standard_uncertainties: &[f64]) -> Matrix {
    let cell = |i: usize, j: usize, u: f64| if i == j { u * u } else { 0.0 };
    standard_uncertainties
        .iter()
        .enumerate()
        .map(|(i, u)| (0..standard_uncertainties.len()).map(|j| cell(i, j, *u)).collect())
        .collect()
}

fn planck_consistency(what: impl Fn(&Consistency) -> f64) -> f64 {
    let found = consistency(&[6.626070133, 6.62607005883, 6.626069934], &diagonal(&[6e-8, 16.5e-8, 8.9e-8]));
    found.map_or(f64::NAN, |found| what(&found))
}

const ADJUSTED: [f64; 8] = [
    6.62606936,
    6.626070133,
    6.626069934,
    6.62607041,
    6.62606993780177,
    6.62607021287297,
    6.62607040432254,
    6.62607012485019,
];
const ADJUSTED_U: [f64; 8] =
    [3.8e-7, 6e-8, 8.9e-8, 3.8e-7, 1.98051257635e-7, 1.32034182719e-7, 7.70199443703e-8, 1.65042724014e-7];

fn special_adjustment(what: impl Fn(&Consistency, &[f64]) -> f64) -> f64 {
    consistency(&ADJUSTED, &diagonal(&ADJUSTED_U)).map_or(f64::NAN, |found| what(&found, &ADJUSTED_U))
}

/// With a correlation of 0.2 among the values of N_A; the true coefficients are others.
fn illustrated_adjustment(what: impl Fn(&Consistency) -> f64) -> f64 {
    let mut covariance = diagonal(&ADJUSTED_U);
    for (i, row) in covariance.iter_mut().enumerate().skip(4) {
        for (j, cell) in row.iter_mut().enumerate().skip(4).filter(|(j, _)| *j != i) {
            *cell = 0.2 * ADJUSTED_U[i] * ADJUSTED_U[j];
        }
    }
    consistency(&ADJUSTED, &covariance).map_or(f64::NAN, |found| what(&found))
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Means and uncertainties with each between component: invented data, computed in high precision.
    #[test]
    fn means_with_a_between_component() {
        for (tau_squared, mean, u) in [
            (paule_mandel(&SIX, &diagonal(&SIX_U)), 8.047225022400466, 4.077633733698948),
            (dersimonian_laird(&SIX, &diagonal(&SIX_U)), 8.071737413211414, 4.12812417238061),
        ] {
            let covariance = with_between(&diagonal(&SIX_U), tau_squared.expect("a component"));
            let found = consistency(&SIX, &covariance).expect("a mean");
            let weights = generalised_weights(&covariance).expect("weights");
            let variance = crate::numeric::linear::bilinear(&weights, &covariance, &weights);
            assert!((found.mean / mean - 1.0).abs() < 1e-9 && (variance.sqrt() / u - 1.0).abs() < 1e-9);
        }
    }

    /// A part shared by all results leaves chi-square and τ² as they were.
    #[test]
    fn a_shared_part_changes_nothing() {
        let alone = diagonal(&SIX_U);
        let shared: Matrix = alone.iter().map(|row| row.iter().map(|cell| cell + 81.0).collect()).collect();
        let pairs = [
            (
                consistency(&SIX, &alone).expect("found").chi_square,
                consistency(&SIX, &shared).expect("found").chi_square,
            ),
            (paule_mandel(&SIX, &alone).expect("found"), paule_mandel(&SIX, &shared).expect("found")),
            (dersimonian_laird(&SIX, &alone).expect("found"), dersimonian_laird(&SIX, &shared).expect("found")),
        ];
        assert!(pairs.iter().all(|(a, b)| (a / b - 1.0).abs() < 1e-9), "{pairs:?}");
    }

    #[test]
    fn agreeing_results_have_no_between_component() {
        let (x, v) = ([1.0, 1.1, 0.9], diagonal(&[0.5, 0.5, 0.5]));
        assert_eq!((paule_mandel(&x, &v).expect("found"), dersimonian_laird(&x, &v).expect("found")), (0.0, 0.0));
        assert_eq!(expansion_factor(&[0.5, -1.0], &[1.0, 0.5]), 1.0);
        assert_eq!(expansion_factor(&[3.2], &[1.0]), 1.6);
    }

    #[test]
    fn results_that_are_one_are_refused() {
        let twins = [vec![1.0, 1.0], vec![1.0, 1.0]];
        assert!(consistency(&[1.0, 1.0], &twins).is_err());
        assert_eq!((first_determined(&twins), first_determined(&diagonal(&SIX_U))), (Some(1), None));
    }
}
