//! Exact decimals: a number as it was typed, or a computed value turned once into fifteen digits.

use std::cmp::Ordering;

/// Digits that a decimal can hold.
pub(super) const MOST_DIGITS: usize = 38;
/// Exponents beyond these leave the range of double precision by far.
pub(super) const MOST_EXPONENT: i32 = 400;
/// Bound on exponents within the arithmetic, so that no text grows without end.
const MOST_SHIFT: i32 = 2000;

/// `± digits × 10^exponent`, exactly. Trailing zeros are kept: they say how finely a number was typed.
#[derive(Debug, Clone, Copy)]
pub struct Decimal {
    pub negative: bool,
    pub digits: u128,
    pub exponent: i32,
}

impl Decimal {
    pub const ZERO: Decimal = Decimal { negative: false, digits: 0, exponent: 0 };

    /// A plain number: sign (also U+2212), digits, point, digits, `e` and exponent; no spaces, no comma.
    pub fn parse(text: &str) -> Option<Decimal> {
        let (negative, rest) = split_sign(text);
        let (mantissa, exponent) = match rest.split_once(['e', 'E']) {
            Some((mantissa, exponent)) => (mantissa, parse_exponent(exponent)?),
            None => (rest, 0),
        };
        let (whole, fraction) = mantissa.split_once('.').unwrap_or((mantissa, ""));
        if whole.is_empty() || mantissa.ends_with('.') {
            return None;
        }
        let digits = append_digits(append_digits(0, whole)?, fraction)?;
        let exponent = exponent.checked_sub(i32::try_from(fraction.len()).ok()?)?;
        (exponent.abs() <= MOST_EXPONENT).then_some(Decimal { negative, digits, exponent })
    }

    /// A finite value turned once into a decimal of fifteen significant digits (ties of the binary value to even).
    pub fn from_f64_15(value: f64) -> Option<Decimal> {
        value.is_finite().then(|| Self::parse(&format!("{value:.14e}")))?
    }

    /// The shortest decimal that reads back as this finite value.
    pub fn from_f64_shortest(value: f64) -> Option<Decimal> {
        value.is_finite().then(|| Self::parse(&format!("{value:e}")))?
    }

    /// The nearest double, rounded once.
    pub fn to_f64(&self) -> f64 {
        // Both operands exact means one correctly rounded operation.
        let power = EXACT_POWERS.get(self.exponent.unsigned_abs() as usize);
        let magnitude = match power {
            Some(power) if self.digits < (1 << 53) && self.exponent < 0 => self.digits as f64 / power,
            Some(power) if self.digits < (1 << 53) => self.digits as f64 * power,
            _ => format!("{}e{}", self.digits, self.exponent).parse().unwrap_or(f64::NAN),
        };
        if self.negative { -magnitude } else { magnitude }
    }

    pub fn is_zero(&self) -> bool {
        self.digits == 0
    }

    /// Decimals after the marker as they stand; negative when the last digit lies left of the units.
    pub fn decimals(&self) -> i32 {
        -self.exponent
    }

    /// The power of ten of the first digit that is not zero; `None` for zero.
    pub fn leading_power(&self) -> Option<i32> {
        self.digits.checked_ilog10().map(|log| log as i32 + self.exponent)
    }

    pub fn negated(self) -> Decimal {
        Decimal { negative: !self.negative, ..self }
    }

    pub fn magnitude(self) -> Decimal {
        Decimal { negative: false, ..self }
    }

    /// Times ten to the `power`.
    pub fn shifted(self, power: i32) -> Decimal {
        Decimal { exponent: self.exponent.saturating_add(power).clamp(-MOST_SHIFT, MOST_SHIFT), ..self }
    }

    /// The exact sum; `None` when it needs more digits than a decimal holds.
    pub fn plus(&self, other: &Decimal) -> Option<Decimal> {
        let exponent = self.exponent.min(other.exponent);
        let (own, its) = (self.digits_at(exponent)?, other.digits_at(exponent)?);
        if self.negative == other.negative {
            return Some(Decimal { negative: self.negative, digits: own.checked_add(its)?, exponent });
        }
        let negative = if own >= its { self.negative } else { other.negative };
        Some(Decimal { negative: negative && own != its, digits: own.abs_diff(its), exponent })
    }

    /// The exact difference; `None` when it needs more digits than a decimal holds.
    pub fn minus(&self, other: &Decimal) -> Option<Decimal> {
        self.plus(&other.negated())
    }

    /// Rounded once to `decimals` places (which may be negative), ties to even; never a negative zero.
    pub fn rounded(&self, decimals: i32) -> Decimal {
        let exponent = decimals.clamp(-MOST_SHIFT, MOST_SHIFT).saturating_neg();
        if self.exponent >= exponent {
            return match self.digits_at(exponent) {
                Some(digits) => Decimal { negative: self.negative && digits > 0, digits, exponent },
                None => *self,
            };
        }
        let cut = exponent.saturating_sub(self.exponent).unsigned_abs();
        let digits = match 10u128.checked_pow(cut) {
            Some(unit) => round_quotient(self.digits, unit),
            // Below a tenth of the last place: nothing is left.
            None => 0,
        };
        Decimal { negative: self.negative && digits > 0, digits, exponent }
    }

    /// Rounded once to `count` significant digits, ties to even; a carry keeps the count.
    pub fn rounded_to_digits(&self, count: usize) -> Decimal {
        let Some(leading) = self.leading_power() else { return *self };
        let decimals = (count as i32).saturating_sub(1).saturating_sub(leading);
        let rounded = self.rounded(decimals);
        // The carry made a one with zeros, so this second step cuts a zero only.
        if rounded.leading_power() > Some(leading) { rounded.rounded(decimals - 1) } else { rounded }
    }

    /// Digits with a point and an ASCII minus, no grouping, no exponent.
    pub fn plain_text(&self) -> String {
        let sign = if self.negative { "-" } else { "" };
        let digits = self.digits.to_string();
        if self.exponent >= 0 {
            let zeros = if self.digits == 0 { 0 } else { self.exponent as usize };
            return format!("{sign}{digits}{}", "0".repeat(zeros));
        }
        let decimals = self.exponent.unsigned_abs() as usize;
        let digits = format!("{digits:0>width$}", width = decimals + 1);
        let (whole, fraction) = digits.split_at(digits.len() - decimals);
        format!("{sign}{whole}.{fraction}")
    }

    fn digits_at(&self, exponent: i32) -> Option<u128> {
        if self.digits == 0 {
            return Some(0);
        }
        let shift = u32::try_from(self.exponent.checked_sub(exponent)?).ok()?;
        self.digits.checked_mul(10u128.checked_pow(shift)?)
    }
}

impl PartialEq for Decimal {
    fn eq(&self, other: &Decimal) -> bool {
        self.partial_cmp(other) == Some(Ordering::Equal)
    }
}

impl PartialOrd for Decimal {
    /// By value, exactly: 1.0 equals 1.00.
    fn partial_cmp(&self, other: &Decimal) -> Option<Ordering> {
        let sign = |decimal: &Decimal| if decimal.digits == 0 { 0 } else { 1 - 2 * i32::from(decimal.negative) };
        let ordering = sign(self).cmp(&sign(other)).then_with(|| {
            let by_size = self.leading_power().cmp(&other.leading_power()).then_with(|| self.digits_against(other));
            if self.negative { by_size.reverse() } else { by_size }
        });
        Some(ordering)
    }
}

impl Decimal {
    /// Compares the digits of two magnitudes with the same leading power.
    fn digits_against(&self, other: &Decimal) -> Ordering {
        let (own, its) = (self.digits.to_string(), other.digits.to_string());
        let width = own.len().max(its.len());
        format!("{own:0<width$}").cmp(&format!("{its:0<width$}"))
    }
}

/// The sign and what follows it.
pub(super) fn split_sign(text: &str) -> (bool, &str) {
    match text.strip_prefix('-').or_else(|| text.strip_prefix('\u{2212}')) {
        Some(rest) => (true, rest),
        None => (false, text.strip_prefix('+').unwrap_or(text)),
    }
}

fn parse_exponent(text: &str) -> Option<i32> {
    let (negative, digits) = split_sign(text);
    let short = !digits.is_empty() && digits.len() <= 5 && digits.bytes().all(|byte| byte.is_ascii_digit());
    let value: i32 = short.then(|| digits.parse().ok())??;
    Some(if negative { -value } else { value })
}

fn append_digits(start: u128, text: &str) -> Option<u128> {
    text.chars().try_fold(start, |digits, next| digits.checked_mul(10)?.checked_add(next.to_digit(10)?.into()))
}

fn round_quotient(digits: u128, unit: u128) -> u128 {
    let (quotient, rest) = (digits / unit, digits % unit);
    match rest.cmp(&(unit - rest)) {
        Ordering::Less => quotient,
        Ordering::Greater => quotient + 1,
        Ordering::Equal => quotient + quotient % 2,
    }
}

/// Powers of ten that double precision holds exactly.
const EXACT_POWERS: [f64; 23] = [
    1e0, 1e1, 1e2, 1e3, 1e4, 1e5, 1e6, 1e7, 1e8, 1e9, 1e10, 1e11, 1e12, 1e13, 1e14, 1e15, 1e16, 1e17, 1e18, 1e19, 1e20,
    1e21, 1e22,
];

#[cfg(test)]
mod tests {
    use super::*;
    use proptest::prelude::*;

    fn decimal(text: &str) -> Decimal {
        Decimal::parse(text).unwrap_or_else(|| panic!("{text} is no decimal"))
    }

    #[test]
    fn reads_numbers_as_typed() {
        assert_eq!(decimal("-1.2300e-3").plain_text(), "-0.0012300");
        assert_eq!(decimal("\u{2212}5").to_f64(), -5.0);
        assert_eq!(decimal("1.10").decimals(), 2);
        for bad in ["", "-", ".5", "5.", "1,5", "1 000", "nan", "inf", "1e", "1e999999", "0x1", "1.2.3", "--1", "1_0"] {
            assert!(Decimal::parse(bad).is_none(), "{bad}");
        }
    }

    #[test]
    fn ties_go_to_even_on_the_decimal_value() {
        let rounded = |text: &str, decimals| decimal(text).rounded(decimals).plain_text();
        assert_eq!(rounded("2.675", 2), "2.68");
        assert_eq!(rounded("2.665", 2), "2.66");
        assert_eq!(rounded("12.349", 1), "12.3");
        assert_eq!(rounded("-0.0004", 3), "0.000");
        assert_eq!(rounded("1250", -2), "1200");
        assert_eq!(rounded("7", -2), "0");
        assert_eq!(rounded("1e-60", 3), "0.000");
        let binary = Decimal::from_f64_15(2.675).map(|value| value.rounded(2).plain_text());
        assert_eq!(binary.as_deref(), Some("2.68"));
    }

    #[test]
    fn a_carry_keeps_the_count_of_digits() {
        assert_eq!(decimal("0.0996").rounded_to_digits(2).plain_text(), "0.10");
        assert_eq!(decimal("0.995").rounded_to_digits(2).plain_text(), "1.0");
        assert_eq!(decimal("0.0105").rounded_to_digits(2).plain_text(), "0.010");
    }

    #[test]
    fn sums_are_exact() {
        let sum = decimal("20.134").plus(&decimal("273.15"));
        assert_eq!(sum.map(|sum| sum.plain_text()).as_deref(), Some("293.284"));
        assert_eq!(decimal("1").minus(&decimal("1.000")).map(|zero| zero.negative), Some(false));
        assert!(decimal("1e300").plus(&decimal("1e-300")).is_none());
        assert!(
            decimal("-2") < decimal("-1.99") && decimal("1.0") == decimal("1.00") && decimal("0") == decimal("-0.0")
        );
    }

    proptest! {
        #![proptest_config(ProptestConfig::with_cases(4096))]
        #[test]
        fn the_nearest_double_is_found(digits in any::<u64>(), exponent in -330..300i32, negative in any::<bool>()) {
            let sign = if negative { "-" } else { "" };
            let text = format!("{sign}{digits}e{exponent}");
            prop_assert_eq!(Some(decimal(&text).to_f64()), text.parse::<f64>().ok());
        }

        #[test]
        fn shortest_reads_back(value in proptest::num::f64::NORMAL) {
            prop_assert_eq!(Decimal::from_f64_shortest(value).map(|decimal| decimal.to_f64()), Some(value));
        }

        #[test]
        fn garbage_never_panics(text in "[-+0-9.eE\u{2212} ,]{0,60}") {
            if let Some(decimal) = Decimal::parse(&text) {
                decimal.to_f64();
                decimal.rounded_to_digits(2).plain_text();
            }
        }
    }
}
