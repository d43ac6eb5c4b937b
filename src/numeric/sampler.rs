//! From a uniform draw u, 0 < u < 1, to a draw of each input distribution: the quantile at u.
//!
//! One draw in, one draw out, so that a trial uses the same number of draws whatever the distribution.
//!
//! # Source
//! JCGM 101:2008, 6.4; the clause stands with each function. Where that guide combines two uniform draws, the
//! quantile of the same distribution takes their place.

use super::elementary::{exp, ln, log1p, sin, sqrt};
use super::gamma::gamma_quantile;
use super::normal::normal_quantile;
use super::student_t::student_t_quantile;
use std::f64::consts::PI;

/// Rectangular between limits (6.4.2).
pub fn rectangular(lower: f64, upper: f64, u: f64) -> f64 {
    lower + (upper - lower) * u
}

/// Rectangular with inexactly known limits: both lie within `d` of `lower` and `upper`, their middle is known (6.4.3).
///
/// Let w be half the width, W the true one, uniform within w - d and w + d, and z the distance from the middle:
///
/// ```text
/// P(z) = (z / 2d) ln((w + d) / (w - d))                        z <= w - d
/// 1 - P(z) = ((w + d) / 2d) (1 - (1 + s) e^-s)                 z = (w + d) e^-s beyond
/// ```
///
/// and the last bracket is the gamma distribution of shape 2.
pub fn rectangular_inexact_limits(lower: f64, upper: f64, d: f64, u: f64) -> f64 {
    let (middle, half_width) = (0.5 * (lower + upper), 0.5 * (upper - lower));
    if d <= 0.0 {
        return rectangular(lower, upper, u);
    }
    let (inner, outer) = (half_width - d, half_width + d);
    let from_end = 2.0 * u.min(1.0 - u);
    let slope = if inner > 0.0 { ln(outer / inner) / (2.0 * d) } else { f64::INFINITY };
    let distance = if inner > 0.0 && 1.0 - from_end <= inner * slope {
        (1.0 - from_end) / slope
    } else {
        outer * exp(-gamma_quantile(2.0, from_end * 2.0 * d / outer))
    };
    if u < 0.5 { middle - distance } else { middle + distance }
}

/// Trapezoidal between limits; `beta` is the ratio of the top to the base, 0 <= β <= 1 (6.4.4).
pub fn trapezoidal(lower: f64, upper: f64, beta: f64, u: f64) -> f64 {
    let half_width = 0.5 * (upper - lower);
    let from_end = u.min(1.0 - u);
    if from_end <= 0.5 * (1.0 - beta) / (1.0 + beta) {
        let inwards = half_width * sqrt(2.0 * from_end * (1.0 - beta) * (1.0 + beta));
        return if u < 0.5 { lower + inwards } else { upper - inwards };
    }
    0.5 * (lower + upper) + half_width * (1.0 + beta) * (u - 0.5)
}

/// Symmetric triangular between limits (6.4.5).
pub fn triangular(lower: f64, upper: f64, u: f64) -> f64 {
    trapezoidal(lower, upper, 0.0, u)
}

/// Arcsine (U-shaped) between limits (6.4.6).
pub fn arcsine(lower: f64, upper: f64, u: f64) -> f64 {
    0.5 * (lower + upper) + 0.5 * (upper - lower) * sin(PI * (u - 0.5))
}

/// Normal (6.4.7).
pub fn normal(mean: f64, standard_deviation: f64, u: f64) -> f64 {
    mean + standard_deviation * normal_quantile(u)
}

/// t scaled and shifted: `scale` is s/√n of a Type A evaluation, not the standard deviation (6.4.9).
pub fn student_t(location: f64, scale: f64, degrees_of_freedom: f64, u: f64) -> f64 {
    location + scale * student_t_quantile(u, degrees_of_freedom)
}

/// Exponential, of a non-negative quantity known by its mean alone (6.4.10).
pub fn exponential(mean: f64, u: f64) -> f64 {
    -mean * log1p(-u)
}

/// Gamma, mean shape / rate (6.4.11, where counts are the shape).
pub fn gamma(shape: f64, rate: f64, u: f64) -> f64 {
    gamma_quantile(shape, u) / rate
}

#[cfg(test)]
mod tests {
    use super::*;
    use proptest::prelude::*;
    use serde_json::Value;

    fn ours(distribution: &str, parameters: &Value, u: f64) -> f64 {
        let named = |name: &str| parameters[name].as_f64().expect("a parameter");
        let limits = || (named("lower"), named("upper"));
        match distribution {
            "rectangular" => rectangular(limits().0, limits().1, u),
            "rectangular_inexact_limits" => rectangular_inexact_limits(limits().0, limits().1, named("d"), u),
            "trapezoidal" => trapezoidal(limits().0, limits().1, named("beta"), u),
            "triangular" => triangular(limits().0, limits().1, u),
            "arcsine" => arcsine(limits().0, limits().1, u),
            "normal" => normal(named("mean"), named("standard_deviation"), u),
            "exponential" => exponential(named("mean"), u),
            "gamma" => gamma(named("shape"), named("rate"), u),
            other => panic!("no sampler for {other}"),
        }
    }

    /// 56 quantiles of the distributions of JCGM 101:2008, closed forms in high precision (gamma by SciPy).
    #[test]
    fn quantiles_of_the_input_distributions() {
        let file: Value = serde_json::from_str(include_str!("../../tests/published/quantiles.json")).unwrap();
        let mut count = 0;
        for vector in file["quantiles"].as_array().unwrap().iter().filter(|v| v["distribution"] != "t") {
            let text = |name: &str| vector[name].as_str().unwrap();
            let (p, exact): (f64, f64) = (text("p").parse().unwrap(), text("quantile").parse().unwrap());
            let found = ours(text("distribution"), &vector["parameters"], p);
            assert!((found - exact).abs() <= 1e-13 * exact.abs() + 1e-16, "{vector}: {found}");
            count += 1;
        }
        assert_eq!(count, 56);
    }

    #[test]
    fn inexact_limits_may_reach_the_middle_or_be_exact() {
        assert_eq!(rectangular_inexact_limits(-1.0, 3.0, 0.0, 0.75), 2.0);
        // d = w: P(z) = (z / 2w)(1 + ln(2w / z)), which is 1 at z = 2w.
        let z = rectangular_inexact_limits(-1.0, 1.0, 1.0, 0.8);
        assert!((z / 2.0 * (1.0 + ln(2.0 / z)) - 0.6).abs() < 1e-14);
    }

    proptest! {
        #[test]
        fn a_larger_draw_gives_a_larger_value(u in 0.001f64..0.998, beta in 0.0f64..1.0, d in 0.01f64..1.0) {
            let v = u + 0.001;
            prop_assert!(trapezoidal(-1.0, 2.0, beta, u) < trapezoidal(-1.0, 2.0, beta, v));
            prop_assert!(arcsine(-1.0, 2.0, u) < arcsine(-1.0, 2.0, v));
            prop_assert!(rectangular_inexact_limits(-1.0, 1.0, d, u) < rectangular_inexact_limits(-1.0, 1.0, d, v));
            prop_assert!(student_t(1.0, 2.0, 3.5, u) < student_t(1.0, 2.0, 3.5, v));
        }

        #[test]
        fn inexact_limits_follow_their_distribution(u in 0.0001f64..0.9999, d in 0.01f64..0.99) {
            let z = rectangular_inexact_limits(-1.0, 1.0, d, u).abs();
            let inside = (z.max(1.0 - d) - (1.0 - d) + z * ln((1.0 + d) / z.max(1.0 - d))) / (2.0 * d);
            prop_assert!((inside - (2.0 * u - 1.0).abs()).abs() < 1e-12 / d);
        }
    }
}
