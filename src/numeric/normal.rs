//! The normal distribution.

use super::elementary::{erf, erfc, exp, ln, ln_without_branch, sqrt};
use std::f64::consts::{FRAC_1_SQRT_2, PI};

/// Probability that a standard normal variable is at most `x`.
///
/// Relative error below 2e-16 (1 + x²): the tail magnifies the rounding of its argument.
pub fn normal_cdf(x: f64) -> f64 {
    0.5 * erfc(-x * FRAC_1_SQRT_2)
}

/// Probability that a standard normal variable is between 0 and `x`.
pub(super) fn normal_central(x: f64) -> f64 {
    0.5 * erf(x * FRAC_1_SQRT_2)
}

/// Density of the standard normal distribution.
pub fn normal_density(x: f64) -> f64 {
    exp(-0.5 * x * x) / sqrt(2.0 * PI)
}

/// The x a standard normal variable stays below with probability `p`; no number outside 0 <= p <= 1.
pub fn normal_quantile(p: f64) -> f64 {
    if p < 0.5 { -quantile_of_halves(0.5 - p, p) } else { quantile_of_halves(p - 0.5, 1.0 - p) }
}

/// [`normal_quantile`] of every number.
pub fn quantiles_in_place(numbers: &mut [f64]) {
    super::wide::widest!(fill_quantiles(numbers: &mut [f64]));
}

/// Numbers worked on at a time; a power of two.
const PART: usize = 128;

/// The centre for all numbers at once; then the near tails, gathered side by side; then what is left one by one.
#[inline(always)]
fn fill_quantiles(numbers: &mut [f64]) {
    let (mut places, mut tails, mut found) = ([0; PART], [0.0; PART], [0.0; PART]);
    for part in numbers.chunks_mut(PART) {
        let mut count = 0;
        for (place, p) in part.iter().enumerate() {
            (places[count % PART], tails[count % PART]) = (place, *p);
            let is_central = (*p - 0.5).abs() <= CENTRAL;
            count += usize::from(!is_central);
        }
        for p in part.iter_mut() {
            *p = centre(*p - 0.5);
        }
        // Whole registers of tails; those behind the last one are of no interest.
        let whole = count.next_multiple_of(8);
        for (found, p) in found[..whole].iter_mut().zip(&tails[..whole]) {
            let (root, size) = near(p.min(1.0 - p));
            let signed = if *p < 0.5 { -size } else { size };
            *found = if root <= NEAR_END { signed } else { f64::NAN };
        }
        for ((place, p), found) in places[..count].iter().zip(&tails).zip(&found) {
            part[*place] = if found.is_nan() { normal_quantile(*p) } else { *found };
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

/// Where the centre ends, by distance of the probability from one half.
const CENTRAL: f64 = 0.425;

/// Where the near tail ends, by r.
const NEAR_END: f64 = 5.0;

/// The quantile x >= 0 from both its halves: the probability between 0 and x, and that beyond x.
///
/// Both are asked for, since each is exact where the other has lost digits.
pub(super) fn quantile_of_halves(central: f64, tail: f64) -> f64 {
    if central <= CENTRAL {
        return centre(central);
    }
    if tail == 0.0 {
        return f64::INFINITY;
    }
    match near(tail) {
        (root, size) if root <= NEAR_END => size,
        _ => quotient(&FAR, sqrt(-ln(tail)) - NEAR_END),
    }
}

/// The quantile in the centre, from the probability between 0 and it.
#[inline(always)]
fn centre(central: f64) -> f64 {
    central * quotient(&CENTRE, 0.180625 - central * central)
}

/// r of a tail that is no subnormal number, and the quantile as long as that is near.
#[inline(always)]
fn near(tail: f64) -> (f64, f64) {
    let root = sqrt(-ln_without_branch(tail));
    (root, quotient(&NEAR, root - 1.6))
}

/// Value of a quotient of polynomials.
#[inline(always)]
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
        fn many_quantiles_are_those_of_single_numbers(exponents in proptest::collection::vec(-330.0f64..0.5, 1..300)) {
            let numbers: Vec<f64> = exponents
                .iter()
                .flat_map(|exponent| [libm::exp10(*exponent), libm::exp10(exponent / 100.0), 1.0 - libm::exp10(exponent / 20.0)])
                .chain([f64::NAN, 0.0, 1.0, 0.5, -0.25, 2.0])
                .collect();
            let mut many = numbers.clone();
            quantiles_in_place(&mut many);
            for (p, found) in numbers.iter().zip(&many) {
                let single = normal_quantile(*p);
                prop_assert!(found.to_bits() == single.to_bits() || found.is_nan() && single.is_nan(), "{p}: {found}, {single}");
            }
        }

        #[test]
        fn the_two_sides_mirror(steps in 1u64..1 << 53) {
            // A multiple of 2^-53, so that both p and 1 - p are exact.
            let p = steps as f64 / (1u64 << 53) as f64;
            prop_assert_eq!(normal_quantile(p), -normal_quantile(1.0 - p));
        }
    }
}
