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
