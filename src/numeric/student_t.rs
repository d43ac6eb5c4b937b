//! Student's t distribution for any positive degrees of freedom, infinity included.
//!
//! # Formula
//! With x = ν / (ν + t²), y = t² / (ν + t²), t >= 0:
//!
//! ```text
//! P(T > t)     = (1/2) I_x(ν/2, 1/2)
//! P(0 < T < t) = (1/2) I_y(1/2, ν/2)
//! ```
//!
//! # Source
//! NIST Digital Library of Mathematical Functions, 8.17.8 (series of positive terms) and 8.17.22 (continued
//! fraction); the quotient of gamma functions in front by `gamma::half_step_ratio`, so that no digits are lost
//! however large ν is.

use super::beta::beta_fraction;
use super::elementary::{exp, expm1, ln, log1p, sqrt};
use super::gamma::half_step_ratio;
use super::normal::{normal_cdf, quantile_of_halves as normal_quantile_of_halves};
use super::root::newton_in_logarithm;
use std::f64::consts::PI;

/// The distribution with its constant factors worked out.
struct StudentT {
    /// Degrees of freedom, finite.
    nu: f64,
    /// Γ((ν+1)/2) / (Γ(ν/2) √π).
    front: f64,
}

/// The two incomplete beta arguments of a value t, and ln(1 + t²/ν).
struct Arguments {
    x: f64,
    y: f64,
    logarithm: f64,
}

impl StudentT {
    fn new(nu: f64) -> Self {
        Self { nu, front: half_step_ratio(nu / 2.0) * sqrt(nu / 2.0 / PI) }
    }

    fn arguments(&self, t: f64) -> Arguments {
        let ratio = t * t / self.nu;
        // Beyond this, the one is lost and the square might overflow.
        let logarithm = if t > 1e100 { 2.0 * ln(t) - ln(self.nu) } else { log1p(ratio) };
        Arguments { x: 1.0 / (1.0 + ratio), y: ratio / (1.0 + ratio).min(f64::MAX), logarithm }
    }

    /// Whether the continued fraction of the tail converges fast: x < (a + 1) / (a + b + 2), solved for t².
    fn is_tail(&self, t: f64) -> bool {
        t * t > 3.0 / (1.0 + 2.0 / self.nu)
    }

    /// ln P(T > t) by the continued fraction.
    fn ln_tail_fraction(&self, at: &Arguments) -> f64 {
        let (a, y) = (self.nu / 2.0, if at.x == 0.0 { 1.0 } else { at.y });
        // a - (a + b) x with b = 1/2, without cancellation for large ν.
        let lambda = a * y - 0.5 * at.x;
        ln(0.5 * self.front * beta_fraction(a, 0.5, at.x, y, lambda)) + 0.5 * ln(y) - a * at.logarithm
    }

    /// P(0 < T < t) by the series of positive terms.
    fn central_series(&self, at: &Arguments) -> f64 {
        let (mut term, mut total, mut n) = (1.0, 1.0, 0.0);
        while term > total * f64::EPSILON / 4.0 {
            term *= ((self.nu + 1.0) / 2.0 + n) / (1.5 + n) * at.y;
            total += term;
            n += 1.0;
        }
        total * self.front * sqrt(at.y) * exp(-self.nu / 2.0 * at.logarithm)
    }

    fn ln_tail(&self, t: f64) -> f64 {
        let at = self.arguments(t);
        if self.is_tail(t) { self.ln_tail_fraction(&at) } else { ln(0.5 - self.central_series(&at)) }
    }

    fn central(&self, t: f64) -> f64 {
        let at = self.arguments(t);
        if self.is_tail(t) { 0.5 - exp(self.ln_tail_fraction(&at)) } else { self.central_series(&at) }
    }

    /// ln of the density times t.
    fn ln_density_times_t(&self, t: f64) -> f64 {
        ln(self.front / sqrt(self.nu)) + ln(t) - (self.nu + 1.0) / 2.0 * self.arguments(t).logarithm
    }

    /// The t >= 0 with P(0 < T < t) = `central`; the start lies below it since the density falls from zero on.
    fn value_with_central(&self, central: f64) -> f64 {
        let start = central * sqrt(self.nu) / self.front;
        newton_in_logarithm(start, |t| {
            let reached = self.central(t);
            ln(reached / central) * reached / exp(self.ln_density_times_t(t))
        })
    }

    /// The t > 0 with P(T > t) = `tail`.
    fn value_with_tail(&self, tail: f64) -> f64 {
        newton_in_logarithm(self.tail_start(tail), |t| {
            let reached = self.ln_tail(t);
            (ln(tail) - reached) * exp(reached - self.ln_density_times_t(t))
        })
    }

    /// First guess: D. L. Wallace, Ann. Math. Stat. 30 (1959) 1124-1130, or for ν < 1 the bound by the power t^-ν.
    fn tail_start(&self, tail: f64) -> f64 {
        let nu = self.nu;
        if nu < 1.0 {
            return sqrt(nu) * exp(ln(self.front / nu / tail) / nu);
        }
        let z = normal_quantile_of_halves(0.5 - tail, tail) * (8.0 * nu + 3.0) / (8.0 * nu + 1.0);
        sqrt(nu * expm1((z * z / nu).min(600.0)))
    }
}

/// Probability that a t variable with `nu` degrees of freedom is at most `t`; no number unless ν > 0.
pub fn student_t_cdf(t: f64, nu: f64) -> f64 {
    if nu == f64::INFINITY {
        return normal_cdf(t);
    }
    if nu <= 0.0 || nu.is_nan() || t.is_nan() {
        return f64::NAN;
    }
    let distribution = StudentT::new(nu);
    if t > 0.0 { 0.5 + distribution.central(t) } else { exp(distribution.ln_tail(-t)) }
}

/// The t a variable with `nu` degrees of freedom stays below with probability `p`.
///
/// Relative error below 2e-14 (1 + 1/ν); no number unless 0 <= p <= 1 and ν > 0.
pub fn student_t_quantile(p: f64, nu: f64) -> f64 {
    if p < 0.5 { -quantile_of_halves(0.5 - p, p, nu) } else { quantile_of_halves(p - 0.5, 1.0 - p, nu) }
}

/// The quantile t >= 0 from both its halves: the probability between 0 and t, and that beyond t.
pub(super) fn quantile_of_halves(central: f64, tail: f64, nu: f64) -> f64 {
    if nu == f64::INFINITY {
        return normal_quantile_of_halves(central, tail);
    }
    if !(nu > 0.0 && central >= 0.0 && tail >= 0.0) {
        return f64::NAN;
    }
    if central == 0.0 || tail == 0.0 {
        return if central == 0.0 { 0.0 } else { f64::INFINITY };
    }
    let distribution = StudentT::new(nu);
    if central < 0.4 { distribution.value_with_central(central) } else { distribution.value_with_tail(tail) }
}

#[cfg(test)]
mod tests {
    use super::*;
    use proptest::prelude::*;
    use statrs::distribution::{ContinuousCDF, StudentsT};

    #[test]
    fn closed_forms() {
        // ν = 1: tan π(p - 1/2); ν = 2: (2p - 1) √2 / √(1 - (2p - 1)²).
        for p in [0.5001, 0.6, 0.75, 0.9, 0.975, 0.999, 1.0 - 1e-9] {
            let (angle, complement) = (PI * (p - 0.5), PI * (1.0 - p));
            let one = if p < 0.7 { libm::tan(angle) } else { 1.0 / libm::tan(complement) };
            let two = (2.0 * p - 1.0) / sqrt(2.0 * p * (1.0 - p));
            assert!((student_t_quantile(p, 1.0) / one - 1.0).abs() < 1e-14, "{p}");
            assert!((student_t_quantile(p, 2.0) / two - 1.0).abs() < 1e-14, "{p}");
        }
    }

    /// Series in 1/ν of the quantile about the normal one: R. A. Fisher, E. A. Cornish, Technometrics 2 (1960) 209-225.
    #[test]
    fn large_degrees_of_freedom_follow_the_series() {
        for nu in [1e4, 1e5, 1e6, 1e9, 1e15, 1e100, 1e300] {
            for p in [0.51, 0.6, 0.9, 0.975, 0.999, 0.999_999] {
                let x = super::super::normal::normal_quantile(p);
                let q = x * x;
                let g_1 = x * (q + 1.0) / 4.0;
                let g_2 = x * ((5.0 * q + 16.0) * q + 3.0) / 96.0;
                let g_3 = x * (((3.0 * q + 19.0) * q + 17.0) * q - 15.0) / 384.0;
                let g_4 = x * ((((79.0 * q + 776.0) * q + 1482.0) * q - 1920.0) * q - 945.0) / 92_160.0;
                let series = x + (g_1 + (g_2 + (g_3 + g_4 / nu) / nu) / nu) / nu;
                let ours = student_t_quantile(p, nu);
                assert!((ours / series - 1.0).abs() < 2e-14, "{nu} {p}: {ours} {series}");
            }
        }
    }

    #[test]
    fn ends_and_nonsense() {
        assert_eq!(student_t_quantile(0.5, 3.0), 0.0);
        assert_eq!(student_t_quantile(1.0, 3.0), f64::INFINITY);
        assert_eq!(student_t_quantile(0.0, 3.0), f64::NEG_INFINITY);
        for (p, nu) in [(f64::NAN, 3.0), (1.5, 3.0), (-0.1, 3.0), (0.9, 0.0), (0.9, -1.0), (0.9, f64::NAN)] {
            assert!(student_t_quantile(p, nu).is_nan(), "{p} {nu}");
        }
        assert_eq!(student_t_cdf(0.0, 4.0), 0.5);
        assert_eq!(student_t_cdf(f64::INFINITY, 4.0), 1.0);
        assert_eq!(student_t_cdf(f64::NEG_INFINITY, 4.0), 0.0);
    }

    proptest! {
        #![proptest_config(ProptestConfig::with_cases(2000))]

        #[test]
        fn quantile_and_probability_are_inverse(exponent in -1.0f64..12.0, tail in -15.0f64..-0.31) {
            let (nu, p) = (libm::exp10(exponent), libm::exp10(tail));
            let t = student_t_quantile(p, nu);
            prop_assert!((student_t_cdf(t, nu) / p - 1.0).abs() < 1e-13, "{} {} {}", nu, p, t);
        }

        #[test]
        fn agrees_with_another_library(nu in 0.5f64..1000.0, t in -30.0f64..30.0) {
            let other = StudentsT::new(0.0, 1.0, nu).unwrap().cdf(t);
            // Near zero the other library loses digits in 1 - ν / (ν + t²).
            prop_assume!(t.abs() > 0.1);
            prop_assert!((student_t_cdf(t, nu) - other).abs() < 1e-11);
        }

        #[test]
        fn more_degrees_of_freedom_need_a_smaller_factor(nu in 0.1f64..1e6, p in 0.51f64..0.9999) {
            prop_assert!(student_t_quantile(p, nu) > student_t_quantile(p, nu * 1.01));
        }
    }
}
