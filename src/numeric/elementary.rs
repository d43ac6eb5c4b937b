//! Elementary functions, the same bits on every machine.
//!
//! The platform's own functions differ in the last digit from one machine to the next. These are computed in
//! plain Rust arithmetic by the `libm` crate; errors stay below one unit in the last place unless stated.

pub use libm::{
    acos, asin, atan, atan2, cos, cosh, erf, erfc, exp, expm1, lgamma, log1p, log10, pow, sin, sinh, tan, tanh, tgamma,
};

/// Natural logarithm.
pub fn ln(x: f64) -> f64 {
    libm::log(x)
}

/// Natural logarithm of a number that is neither zero, subnormal nor negative, without a branch: for rows of numbers.
///
/// The error stays below one unit in the last place for 0 < x < 1/4; nearer to 1 it grows to two.
///
/// # Formula
/// ```text
/// x = 2^k m, 1/√2 <= m < √2;   ln x = k ln 2 + 2 artanh s,   s = (m - 1) / (m + 1),   s² < 0.0295
/// artanh s = s + s³/3 + s⁵/5 + …
/// ```
#[inline(always)]
pub(super) fn ln_without_branch(x: f64) -> f64 {
    /// Bits from 1/√2 (rounded down) up to 1.
    const SHIFT: u64 = 0x3ff0_0000_0000_0000 - LEAST;
    const LEAST: u64 = 0x3fe6_a09e_0000_0000;
    /// ln 2 in two parts; the first has so few digits that its product with k is exact.
    const LN_2: [f64; 2] = [0.693_147_180_369_123_8, 1.908_214_929_270_587_7e-10];
    let shifted = x.to_bits().wrapping_add(SHIFT);
    let m = f64::from_bits((shifted & 0x000f_ffff_ffff_ffff) + LEAST);
    // The exponent as the last digits of a number between 2^52 and 2^53.
    const UNITS: f64 = (1u64 << 52) as f64;
    let k = f64::from_bits(UNITS.to_bits() | shifted >> 52) - (UNITS + 1023.0);
    let s = (m - 1.0) / (m + 1.0);
    let z = s * s;
    let mut series = 1.0 / 21.0;
    for odd in [19.0, 17.0, 15.0, 13.0, 11.0, 9.0, 7.0, 5.0, 3.0] {
        series = series * z + 1.0 / odd;
    }
    let twice = 2.0 * s;
    k * LN_2[0] + (twice + (twice * (z * series) + k * LN_2[1]))
}

/// Square root, correctly rounded as IEEE 754 requires.
pub fn sqrt(x: f64) -> f64 {
    x.sqrt()
}

/// Square.
pub fn square(x: f64) -> f64 {
    x * x
}

/// Whole power by repeated multiplication, from the lowest power up; negative exponents by one division.
///
/// The error grows by half a unit in the last place a multiplication.
pub fn powi(x: f64, exponent: i32) -> f64 {
    let product = (0..exponent.unsigned_abs()).fold(1.0, |product, _| product * x);
    if exponent < 0 { 1.0 / product } else { product }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn whole_powers_multiply_in_order() {
        assert_eq!(powi(3.0, 4), 81.0);
        assert_eq!(powi(2.0, -3), 0.125);
        assert_eq!(powi(7.0, 0), 1.0);
        assert_eq!(powi(1.1, 3), 1.1 * 1.1 * 1.1);
    }

    #[test]
    fn logarithms_of_rows_are_those_of_single_numbers() {
        for step in 1..200_000 {
            for x in [f64::from(step) / 800_000.0, libm::exp2(f64::from(-step) / 200.0)] {
                let (found, expected) = (ln_without_branch(x), ln(x));
                let close = if x < 0.25 { 1.2 } else { 3.0 } * f64::EPSILON;
                assert!((found - expected).abs() <= close * expected.abs(), "{x}: {found} and not {expected}");
            }
        }
        assert_eq!(ln_without_branch(1.0), 0.0);
    }

    /// Bits are part of the contract: a changed `libm` must not slip in unseen.
    #[test]
    fn bits_are_those_committed() {
        let bits = [exp(1.0), ln(10.0), sin(1.0), cos(1.0), tan(1.0), pow(2.5, 0.3), log10(2.0), atan(0.7)]
            .map(|value| value.to_bits());
        assert_eq!(bits, BITS, "{bits:#018x?}");
    }

    const BITS: [u64; 8] = [
        0x4005_bf0a_8b14_576a,
        0x4002_6bb1_bbb5_5516,
        0x3fea_ed54_8f09_0cee,
        0x3fe1_4a28_0fb5_068c,
        0x3ff8_eb24_5cbe_e3a6,
        0x3ff5_0fe6_c94a_6e58,
        0x3fd3_4413_509f_79ff,
        0x3fe3_8b11_2d7b_d4ad,
    ];
}
