//! The normal distribution.

use super::elementary::{erfc, exp, ln, sqrt};
use std::f64::consts::{FRAC_1_SQRT_2, PI};

/// Probability that a standard normal variable is at most `x`.
///
/// Relative error below 2e-16 (1 + x²): the tail magnifies the rounding of its argument.
pub fn normal_cdf(x: f64) -> f64 {
    0.5 * erfc(-x * FRAC_1_SQRT_2)
}

/// Density of the standard normal distribution.
pub fn normal_density(x: f64) -> f64 {
    exp(-0.5 * x * x) / sqrt(2.0 * PI)
}

/// The x a standard normal variable stays below with probability `p`; no number outside 0 <= p <= 1.
pub fn normal_quantile(p: f64) -> f64 {
    if p < 0.5 { -quantile_of_halves(0.5 - p, p) } else { quantile_of_halves(p - 0.5, 1.0 - p) }
}

/// [`normal_quantile`] of every number: the centre for all at once, the tails one by one after it.
pub fn quantiles_in_place(numbers: &mut [f64]) {
    super::wide::widest!(fill_quantiles(numbers));
}

#[inline(always)]
fn fill_quantiles(numbers: &mut [f64]) {
    let mut centres = [0.0; 64];
    for part in numbers.chunks_mut(64) {
        let centres = &mut centres[..part.len()];
        for (centre, p) in centres.iter_mut().zip(part.iter()) {
            // Below one half the quantile is that of 1 - p with the other sign.
            let half = if *p < 0.5 { 0.5 - p } else { p - 0.5 };
            let size = half * quotient(&CENTRE, 0.180625 - half * half);
            *centre = if *p < 0.5 { -size } else { size };
        }
        for (p, centre) in part.iter_mut().zip(centres.iter()) {
            let half = if *p < 0.5 { 0.5 - *p } else { *p - 0.5 };
            *p = if half <= 0.425 { *centre } else { normal_quantile(*p) };
        }
    }
}

/// A polynomial divided by another, highest power first.
type Quotient = [[f64; 8]; 2];

/// The quantile in three regions: centre |p - 1/2| <= 0.425, then the tail by r = √(-ln tail): near for r <= 5,
/// far beyond.
///
/// # Source
/// M. J. Wichura, Algorithm AS 241, Applied Statistics 37 (1988) 477-484, routine PPND16 (about 1e-16 relative);
/// each coefficient stands as the shortest decimal of its nearest double.
const CENTRE: Quotient = [
    [
        2509.0809287301227,
        33430.57558358813,
        67265.7709270087,
        45921.95393154987,
        13731.69376550946,
        1971.5909503065513,
        133.14166789178438,
        3.3871328727963665,
    ],
    [
        5226.495278852854,
        28729.085735721943,
        39307.89580009271,
        21213.794301586597,
        5394.196021424751,
        687.1870074920579,
        42.31333070160091,
        1.0,
    ],
];

const NEAR: Quotient = [
    [
        0.0007745450142783414,
        0.022723844989269184,
        0.2417807251774506,
        1.2704582524523684,
        3.6478483247632045,
        5.769497221460691,
        4.630337846156546,
        1.4234371107496835,
    ],
    [
        1.0507500716444169e-09,
        0.0005475938084995345,
        0.015198666563616457,
        0.14810397642748008,
        0.6897673349851,
        1.6763848301838038,
        2.053191626637759,
        1.0,
    ],
];

const FAR: Quotient = [
    [
        2.0103343992922881e-07,
        2.7115555687434876e-05,
        0.0012426609473880784,
        0.026532189526576124,
        0.29656057182850487,
        1.7848265399172913,
        5.463784911164114,
        6.657904643501103,
    ],
    [
        2.0442631033899397e-15,
        1.421511758316446e-07,
        1.8463183175100548e-05,
        0.0007868691311456133,
        0.014875361290850615,
        0.1369298809227358,
        0.599832206555888,
        1.0,
    ],
];

/// The quantile x >= 0 from both its halves: the probability between 0 and x, and that beyond x.
///
/// Both are asked for, since each is exact where the other has lost digits.
pub(super) fn quantile_of_halves(central: f64, tail: f64) -> f64 {
    if central <= 0.425 {
        return central * quotient(&CENTRE, 0.180625 - central * central);
    }
    if tail == 0.0 {
        return f64::INFINITY;
    }
    let root = sqrt(-ln(tail));
    if root <= 5.0 { quotient(&NEAR, root - 1.6) } else { quotient(&FAR, root - 5.0) }
}

/// Value of a quotient of polynomials.
fn quotient([numerator, denominator]: &Quotient, r: f64) -> f64 {
    let polynomial = |coefficients: &[f64; 8]| coefficients.iter().fold(0.0, |sum, coefficient| sum * r + coefficient);
    polynomial(numerator) / polynomial(denominator)
}

#[cfg(test)]
mod tests {
    use super::*;
    use proptest::prelude::*;

    /// JCGM 106:2012, Table 1: z for five probabilities, as printed.
    #[test]
    fn quantiles_as_printed() {
        for (p, printed) in [(0.80, 0.84), (0.90, 1.28), (0.95, 1.64), (0.99, 2.33), (0.999, 3.09)] {
            assert!((normal_quantile(p) - printed).abs() <= 0.005, "{p}");
        }
    }

    #[test]
    fn ends_of_the_range() {
        assert_eq!(normal_quantile(0.5), 0.0);
        assert_eq!(normal_quantile(1.0), f64::INFINITY);
        assert_eq!(normal_quantile(0.0), f64::NEG_INFINITY);
        assert!(normal_quantile(1.1).is_nan() && normal_quantile(-0.1).is_nan() && normal_quantile(f64::NAN).is_nan());
        assert_eq!(normal_cdf(f64::INFINITY), 1.0);
        assert_eq!(normal_cdf(f64::NEG_INFINITY), 0.0);
    }

    proptest! {
        #[test]
        fn quantile_and_probability_are_inverse(exponent in -300.0f64..-0.31) {
            let p = libm::exp10(exponent);
            let x = normal_quantile(p);
            // dp/p = x² dx/x, so the tail magnifies the last digit of x.
            prop_assert!((normal_cdf(x) / p - 1.0).abs() < 1e-15 * (4.0 + x * x));
        }

        #[test]
        fn the_two_sides_mirror(steps in 1u64..1 << 53) {
            // A multiple of 2^-53, so that both p and 1 - p are exact.
            let p = steps as f64 / (1u64 << 53) as f64;
            prop_assert_eq!(normal_quantile(p), -normal_quantile(1.0 - p));
        }
    }
}
