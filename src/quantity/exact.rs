//! Decimals times unit factors, exactly, with one rounding at the end.

use super::decimal::Decimal;
use super::factor::Factor;
use super::natural::Natural;

/// π × 10³⁷, cut after 38 digits.
const PI: u128 = 31_415_926_535_897_932_384_626_433_832_795_028_841;
/// 1/π × 10³⁸, cut after 38 digits.
const INVERSE_PI: u128 = 31_830_988_618_379_067_153_776_752_674_502_872_406;
/// Digits kept of a quotient that does not end.
const KEPT_DIGITS: u32 = 45;

/// `± numerator / denominator × 10^ten`, where powers of π have been put in with 38 digits.
#[derive(Debug, Clone)]
pub(super) struct Exact {
    negative: bool,
    numerator: Natural,
    denominator: u64,
    ten: i32,
}

impl Exact {
    /// A decimal times a factor.
    pub fn new(value: &Decimal, factor: &Factor) -> Exact {
        let mut numerator = Natural::new(value.digits).times(&Natural::new(factor.numerator.into()));
        let (digits, scale) = if factor.pi < 0 { (INVERSE_PI, -38) } else { (PI, -37) };
        let mut ten = value.exponent.saturating_add(factor.ten);
        for _ in 0..factor.pi.abs() {
            numerator = numerator.times(&Natural::new(digits));
            ten = ten.saturating_add(scale);
        }
        Exact { negative: value.negative, numerator, denominator: factor.denominator, ten }
    }

    /// The exact sum; `None` when the common denominator no longer fits.
    pub fn plus(&self, other: &Exact) -> Option<Exact> {
        let ten = self.ten.min(other.ten);
        let own = self.numerator_at(ten).times(&Natural::new(other.denominator.into()));
        let its = other.numerator_at(ten).times(&Natural::new(self.denominator.into()));
        let denominator = self.denominator.checked_mul(other.denominator)?;
        if self.negative == other.negative {
            return Some(Exact { negative: self.negative, numerator: own.plus(&its), denominator, ten });
        }
        let negative = if own.compare(&its).is_ge() { self.negative } else { other.negative };
        Some(Exact { negative, numerator: own.distance(&its), denominator, ten })
    }

    /// The same below zero, and the other way round.
    pub fn negated(mut self) -> Exact {
        self.negative = !self.negative;
        self
    }

    /// Half of it.
    pub fn halved(mut self) -> Exact {
        self.numerator = self.numerator.times(&Natural::new(5));
        self.ten = self.ten.saturating_sub(1);
        self
    }

    /// Whether it lies below zero.
    pub fn is_negative(&self) -> bool {
        self.negative && !self.numerator.is_zero()
    }

    pub fn is_zero(&self) -> bool {
        self.numerator.is_zero()
    }

    /// The nearest double.
    pub fn to_f64(&self) -> f64 {
        let (digits, exponent) = self.quotient();
        let magnitude: f64 = format!("{digits}e{exponent}").parse().unwrap_or(f64::NAN);
        if self.is_negative() { -magnitude } else { magnitude }
    }

    /// A decimal of `count` significant digits, rounded once.
    pub fn to_decimal(&self, count: usize) -> Option<Decimal> {
        let (digits, exponent) = self.quotient();
        // A last digit 1 below the cut tells a tie from a little more than a tie.
        let kept = digits.get(..37).unwrap_or(&digits);
        let more = digits.get(37..).is_some_and(|rest| rest.bytes().any(|byte| byte != b'0'));
        let value: u128 = format!("{kept}{}", u8::from(more)).parse().ok()?;
        let exponent = exponent.checked_add(i32::try_from(digits.len() - kept.len()).ok()?)?.checked_sub(1)?;
        Some(Decimal { negative: self.is_negative(), digits: value, exponent }.rounded_to_digits(count))
    }

    /// Digits and power of ten; a quotient that does not end has a further 1 as its last digit.
    fn quotient(&self) -> (String, i32) {
        if self.denominator == 1 {
            return (self.numerator.digits(), self.ten);
        }
        let (quotient, whole) = self.numerator.shifted(KEPT_DIGITS).divided(self.denominator);
        let exponent = self.ten.saturating_sub(KEPT_DIGITS as i32);
        let mut digits = quotient.digits();
        if whole {
            return (digits, exponent);
        }
        digits.push('1');
        (digits, exponent.saturating_sub(1))
    }

    fn numerator_at(&self, ten: i32) -> Natural {
        self.numerator.shifted(self.ten.saturating_sub(ten).unsigned_abs())
    }
}
