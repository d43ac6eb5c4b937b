//! The gamma function's relatives: Stirling remainder, half-step ratio, incomplete gamma functions, gamma quantile.

use super::continued_fraction::continued_fraction;
use super::elementary::{exp, lgamma, ln, log1p, pow, sqrt};
use super::normal::normal_quantile;
use super::root::newton_in_logarithm;
use std::f64::consts::PI;

/// From here on the asymptotic series below are exact to the last digit.
const ASYMPTOTIC: f64 = 15.0;

/// ln Γ(z) - [(z - 1/2) ln z - z + (1/2) ln 2π] for z >= 15.
///
/// # Source
/// NIST Digital Library of Mathematical Functions, 5.11.1: terms B_2k / (2k (2k - 1) z^(2k-1)).
pub fn stirling_remainder(z: f64) -> f64 {
    const TERMS: [f64; 7] =
        [1.0 / 12.0, -1.0 / 360.0, 1.0 / 1260.0, -1.0 / 1680.0, 1.0 / 1188.0, -691.0 / 360_360.0, 1.0 / 156.0];
    odd_powers(&TERMS, z)
}

/// Γ(a + 1/2) / (Γ(a) √a), which tends to 1 for large a.
///
/// # Source
/// NIST Digital Library of Mathematical Functions, 5.11.8: the difference of the two expansions has the terms
/// (2^-n - 2) B_(n+1) / (n (n + 1) a^n), n odd. Below a = 15 the recurrence 5.5.1 leads there.
pub fn half_step_ratio(a: f64) -> f64 {
    const TERMS: [f64; 7] = [
        -1.0 / 8.0,
        1.0 / 192.0,
        -1.0 / 640.0,
        17.0 / 14_336.0,
        -31.0 / 18_432.0,
        691.0 / 180_224.0,
        -5461.0 / 425_984.0,
    ];
    let (mut shifted, mut product) = (a, 1.0);
    while shifted < ASYMPTOTIC {
        product *= shifted / (shifted + 0.5);
        shifted += 1.0;
    }
    let scale = if shifted > a { sqrt(shifted / a) } else { 1.0 };
    scale * product * exp(odd_powers(&TERMS, shifted))
}

/// c_0 / z + c_1 / z^3 + c_2 / z^5 + ...
fn odd_powers(coefficients: &[f64], z: f64) -> f64 {
    let square = 1.0 / (z * z);
    coefficients.iter().rev().fold(0.0, |sum, coefficient| sum * square + coefficient) / z
}

/// ln B(a, b) for a, b > 0 without the cancellation of large logarithms of Γ.
///
/// # Source
/// NIST Digital Library of Mathematical Functions, 5.12.1 with 5.11.1.
pub fn ln_beta(a: f64, b: f64) -> f64 {
    let (small, large) = if a <= b { (a, b) } else { (b, a) };
    if large < ASYMPTOTIC {
        return lgamma(small) + (lgamma(large) - lgamma(small + large));
    }
    let ratio = small / large;
    let remainders = stirling_remainder(large) - stirling_remainder(small + large);
    if small < ASYMPTOTIC {
        return lgamma(small) - (large - 0.5) * log1p(ratio) - small * ln(small + large) + small + remainders;
    }
    (small - 0.5) * ln(ratio / (1.0 + ratio)) - large * log1p(ratio)
        + 0.5 * ln(2.0 * PI / large)
        + stirling_remainder(small)
        + remainders
}

/// ln of x^a e^-x / Γ(a).
fn ln_front(a: f64, x: f64) -> f64 {
    if a < ASYMPTOTIC {
        return a * ln(x) - x - lgamma(a);
    }
    let excess = (x - a) / a;
    0.5 * ln(a / (2.0 * PI)) - a * (excess - log1p(excess)) - stirling_remainder(a)
}

/// ln of the regularised lower incomplete gamma function P(a, x), where it is the better one: x < a + 1.
fn ln_lower_series(a: f64, x: f64) -> f64 {
    let (mut term, mut total, mut n) = (1.0, 1.0, a);
    while term > total * f64::EPSILON / 4.0 {
        n += 1.0;
        term *= x / n;
        total += term;
    }
    ln_front(a, x) + ln(total / a)
}

/// ln of the regularised upper incomplete gamma function Q(a, x), where it is the better one: x >= a + 1.
fn ln_upper_fraction(a: f64, x: f64) -> f64 {
    ln_front(a, x) - ln(continued_fraction(x + 1.0 - a, |n| (n * (a - n), x + 2.0 * n + 1.0 - a)))
}

/// Natural logarithms of the regularised incomplete gamma functions P(a, x) and Q(a, x) = 1 - P(a, x).
///
/// # Source
/// NIST Digital Library of Mathematical Functions, 8.7.1 (series, x < a + 1) and 8.9.2 (continued fraction).
fn ln_incomplete_gamma(a: f64, x: f64) -> (f64, f64) {
    if !(a > 0.0 && x >= 0.0) {
        return (f64::NAN, f64::NAN);
    }
    if x == 0.0 {
        return (f64::NEG_INFINITY, 0.0);
    }
    if x == f64::INFINITY {
        return (0.0, f64::NEG_INFINITY);
    }
    if x < a + 1.0 {
        let lower = ln_lower_series(a, x).min(0.0);
        (lower, log1p(-exp(lower)))
    } else {
        let upper = ln_upper_fraction(a, x).min(0.0);
        (log1p(-exp(upper)), upper)
    }
}

/// Regularised lower incomplete gamma function P(a, x).
pub fn lower_gamma(a: f64, x: f64) -> f64 {
    exp(ln_incomplete_gamma(a, x).0)
}

/// Regularised upper incomplete gamma function Q(a, x).
pub fn upper_gamma(a: f64, x: f64) -> f64 {
    exp(ln_incomplete_gamma(a, x).1)
}

/// Quantile of the gamma distribution with unit rate: the x for which P(shape, x) = p.
///
/// # Source
/// Newton's method on ln P or ln Q, whichever is smaller; start after E. B. Wilson and M. M. Hilferty,
/// Proc. Natl. Acad. Sci. 17 (1931) 684-688, or from P(a, x) <= x^a / Γ(a + 1).
pub fn gamma_quantile(shape: f64, p: f64) -> f64 {
    gamma_quantile_of_tails(shape, p, 1.0 - p)
}

/// [`gamma_quantile`] from the probabilities below and above it, each exact where the other has lost digits.
pub(super) fn gamma_quantile_of_tails(shape: f64, below: f64, above: f64) -> f64 {
    if !(shape > 0.0 && shape.is_finite() && below >= 0.0 && above >= 0.0) {
        return f64::NAN;
    }
    if below == 0.0 || above == 0.0 {
        return if below == 0.0 { 0.0 } else { f64::INFINITY };
    }
    let density = |x: f64| exp(ln_front(shape, x));
    newton_in_logarithm(gamma_start(shape, below, above), |x| {
        let (lower, upper) = ln_incomplete_gamma(shape, x);
        if below <= 0.5 {
            (lower - ln(below)) * exp(lower) / density(x)
        } else {
            (ln(above) - upper) * exp(upper) / density(x)
        }
    })
}

/// A first guess of the gamma quantile.
fn gamma_start(shape: f64, below: f64, above: f64) -> f64 {
    let z = if below < above { normal_quantile(below) } else { -normal_quantile(above) };
    let cube_root = 1.0 - 1.0 / (9.0 * shape) + z / (3.0 * sqrt(shape));
    if shape > 0.5 && cube_root > 0.3 {
        return shape * cube_root * cube_root * cube_root;
    }
    pow(below, 1.0 / shape) * exp(lgamma(shape + 1.0) / shape)
}

#[cfg(test)]
mod tests {
    use super::*;
    use proptest::prelude::*;
    use statrs::distribution::{ContinuousCDF, Gamma};

    #[test]
    fn half_step_ratio_meets_closed_forms() {
        // a = 1/2: Γ(1) / (√π √(1/2)); a = 1: √π / 2; a = 15.5: by the recurrence from 0.5.
        let from_half =
            (0..15).fold(sqrt(2.0 / PI) * sqrt(0.5), |g, k| g * (f64::from(k) + 1.0) / (f64::from(k) + 0.5));
        for (a, exact) in [(0.5, sqrt(2.0 / PI)), (1.0, sqrt(PI) / 2.0), (15.5, from_half / sqrt(15.5))] {
            assert!((half_step_ratio(a) / exact - 1.0).abs() < 2e-15, "{a}");
        }
    }

    #[test]
    fn beta_function_meets_closed_forms() {
        // B(a, 1) = 1 / a; B(1/2, 1/2) = π; B(a, 2) = 1 / (a (a + 1)); B(20, 20) and B(100, 3) exact fractions.
        let cases =
            [(7.0, 1.0, 1.0 / 7.0), (0.5, 0.5, PI), (1e6, 2.0, 1e-12 / 1.000001), (100.0, 3.0, 2.0 / 1030200.0)];
        for (a, b, exact) in cases {
            assert!((exp(ln_beta(a, b)) / exact - 1.0).abs() < 1e-13, "{a} {b}");
        }
        assert!((ln_beta(20.0, 20.0) + lgamma(40.0) - 2.0 * lgamma(20.0)).abs() < 1e-13);
    }

    #[test]
    fn limits_are_values_not_failures() {
        assert_eq!(gamma_quantile(2.0, 0.0), 0.0);
        assert_eq!(gamma_quantile(2.0, 1.0), f64::INFINITY);
        assert!(gamma_quantile(-1.0, 0.5).is_nan() && gamma_quantile(1.0, f64::NAN).is_nan());
        assert_eq!(upper_gamma(3.0, f64::INFINITY), 0.0);
        assert_eq!(lower_gamma(3.0, 0.0), 0.0);
    }

    /// Shape 1 is the exponential distribution.
    #[test]
    fn shape_one_is_exponential() {
        for p in [1e-12, 0.2, 0.5, 0.7, 1.0 - 1e-12] {
            assert!((gamma_quantile(1.0, p) / -log1p(-p) - 1.0).abs() < 1e-14, "{p}");
        }
    }

    proptest! {
        #[test]
        fn quantile_inverts_the_distribution(shape in 0.05f64..500.0, p in 1e-6f64..1.0) {
            let x = gamma_quantile(shape, p);
            prop_assert!((lower_gamma(shape, x) - p).abs() < 1e-12 * (1.0 + sqrt(shape)) * p.max(1e-3));
        }

        #[test]
        fn the_distribution_agrees_with_another_library(shape in 0.2f64..60.0, x in 0.01f64..150.0) {
            let other = Gamma::new(shape, 1.0).unwrap().cdf(x);
            prop_assert!((lower_gamma(shape, x) - other).abs() < 1e-10);
        }
    }
}
