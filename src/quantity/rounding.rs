//! Rounding a value to the place of its uncertainty, once, on fifteen-digit decimals, ties to even.
//!
//! # Source    ISO 80000-1:2009, annex B, rule A (ties to even); JCGM 100:2008, 7.2.6 (digits of the uncertainty)

use super::decimal::Decimal;
use crate::diagnostic::{Code, Problem};

/// A value and its uncertainty rounded to the same place, as plain digits with a point and an ASCII minus.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct RoundedPair {
    pub value: String,
    pub uncertainty: String,
    /// Decimals after the marker; negative when the last digit lies left of the units.
    pub digits: i32,
}

/// Rounds `uncertainty` to so many `significant` digits and `value` to the same place. A carry keeps the count of
/// digits (0.0996 becomes 0.10); there is no negative zero.
///
/// # Errors
/// Value not finite; uncertainty not finite or not above zero.
pub fn round_pair(value: f64, uncertainty: f64, significant: usize) -> Result<RoundedPair, Problem> {
    let value = finite(value, Decimal::from_f64_15(value))?;
    let uncertainty = positive(uncertainty, Decimal::from_f64_15(uncertainty))?;
    let (value, uncertainty) = round_decimals(&value, &uncertainty, significant);
    let digits = uncertainty.decimals();
    Ok(RoundedPair { value: value.plain_text(), uncertainty: uncertainty.plain_text(), digits })
}

/// A value rounded once to so many decimals, as plain digits.
///
/// # Errors
/// Value not finite.
pub fn round_to_decimals(value: f64, decimals: i32) -> Result<String, Problem> {
    Ok(finite(value, Decimal::from_f64_15(value))?.rounded(decimals).plain_text())
}

/// Both rounded to the place of the last significant digit of `uncertainty`, which is not zero.
pub(super) fn round_decimals(value: &Decimal, uncertainty: &Decimal, significant: usize) -> (Decimal, Decimal) {
    let uncertainty = uncertainty.rounded_to_digits(significant.clamp(1, 15));
    (value.rounded(uncertainty.decimals()), uncertainty)
}

/// The decimal of a value that can be printed.
pub(super) fn finite(value: f64, decimal: Option<Decimal>) -> Result<Decimal, Problem> {
    decimal.ok_or_else(|| Problem::new(Code::FigureMissing, format!("the value {value} is no finite number")))
}

/// The decimal of an uncertainty that can be printed.
pub(super) fn positive(uncertainty: f64, decimal: Option<Decimal>) -> Result<Decimal, Problem> {
    decimal.filter(|decimal| !decimal.negative && !decimal.is_zero()).ok_or_else(|| {
        let message = format!("the uncertainty {uncertainty} cannot be printed; expected a finite number above zero");
        Problem::new(Code::UncertaintyMissing, message)
    })
}

#[cfg(test)]
mod tests {
    use super::*;
    use proptest::prelude::*;

    fn pair(value: f64, uncertainty: f64) -> (String, String, i32) {
        let pair = round_pair(value, uncertainty, 2).unwrap();
        (pair.value, pair.uncertainty, pair.digits)
    }

    #[test]
    fn place_of_the_uncertainty_ties_and_carries() {
        let expected = |value: &str, uncertainty: &str, digits| (value.to_owned(), uncertainty.to_owned(), digits);
        assert_eq!(pair(1.23456, 0.00012), expected("1.23456", "0.00012", 5));
        assert_eq!(pair(0.9999999875, 0.000000024), expected("0.999999988", "0.000000024", 9));
        assert_eq!(pair(100.02147, 0.0996), expected("100.02", "0.10", 2));
        assert_eq!(pair(12.3451, 0.995), expected("12.3", "1.0", 1));
        assert_eq!(pair(-0.0004, 0.05), expected("0.000", "0.050", 3));
        assert_eq!(pair(12.345, 0.0105), expected("12.345", "0.010", 3));
        assert_eq!(pair(12.345, 0.0115), expected("12.345", "0.012", 3));
        // JCGM 100:2008, 7.2.6.
        assert_eq!(pair(10.05762, 0.027), expected("10.058", "0.027", 3));
        assert_eq!(pair(432.10, 1.26), expected("432.1", "1.3", 1));
        assert_eq!(pair(1_234_567.0, 1234.0), expected("1234600", "1200", -2));
        assert_eq!(pair(0.0, 3e-10), expected("0.00000000000", "0.00000000030", 11));
    }

    #[test]
    fn never_in_steps_and_on_the_decimal_value() {
        assert_eq!(round_to_decimals(12.349, 1).as_deref(), Ok("12.3"));
        assert_eq!(round_to_decimals(2.675, 2).as_deref(), Ok("2.68"));
        assert_eq!(round_to_decimals(-0.001, 2).as_deref(), Ok("0.00"));
    }

    #[test]
    fn what_cannot_be_printed_is_refused() {
        for (value, uncertainty) in [(f64::NAN, 1.0), (f64::INFINITY, 1.0), (1.0, f64::NAN), (1.0, 0.0), (1.0, -1.0)] {
            assert!(round_pair(value, uncertainty, 2).is_err(), "{value} {uncertainty}");
        }
    }

    proptest! {
        #![proptest_config(ProptestConfig::with_cases(10_000))]
        #[test]
        fn off_by_half_a_place_at_most(value in -1e9..1e9f64, mantissa in 1.0..10.0f64, power in -12..3i32) {
            let uncertainty = Decimal::parse(&format!("{mantissa}e{power}")).unwrap().to_f64();
            let pair = round_pair(value, uncertainty, 2).unwrap();
            let place = Decimal { negative: false, digits: 1, exponent: -pair.digits }.to_f64();
            let rounded: f64 = pair.value.parse().unwrap();
            // Beside half a place, the fifteen digits of the value.
            prop_assert!((rounded - value).abs() <= place * 0.5000001 + value.abs() * 1e-14);
            let digits = pair.uncertainty.trim_start_matches(['0', '.']).replace('.', "");
            let shown = if pair.digits < 0 { digits.len() - pair.digits.unsigned_abs() as usize } else { digits.len() };
            prop_assert_eq!(shown, 2);
        }
    }
}
