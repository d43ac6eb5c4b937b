//! Units: what they are, and exact conversion to and from coherent SI units.

use super::decimal::Decimal;
use super::dimension::{Dimension, superscript};
use super::exact::Exact;
use super::factor::Factor;
use super::symbol::{self, Symbol};
use rayon::prelude::*;

/// The zero of the Celsius scale, 273.15 K exactly (SI Brochure, 9th edition, 2.3.1).
pub(super) const CELSIUS_ZERO: Decimal = Decimal { negative: false, digits: 27_315, exponent: -2 };

/// One symbol with the power of ten of its prefix and its exponent.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Part {
    pub symbol: &'static Symbol,
    pub prefix: i32,
    pub exponent: i32,
}

/// A unit: a product of powers of symbols, with an exact factor to coherent SI units.
#[derive(Debug, Clone, PartialEq)]
pub struct Unit {
    pub(super) parts: Vec<Part>,
    dimension: Dimension,
    factor: Factor,
}

impl Unit {
    /// The unit of a number; it prints as nothing.
    pub fn one() -> Unit {
        Unit { parts: Vec::new(), dimension: Dimension::ONE, factor: Factor::ONE }
    }

    /// The product of parts; `None` when exponents or factor grow beyond what can be held.
    pub(super) fn from_parts(parts: Vec<Part>) -> Option<Unit> {
        let mut unit = Unit::one();
        for part in &parts {
            let factor = part.symbol.factor.times(Factor::ten(part.prefix))?.power(part.exponent)?;
            unit.factor = unit.factor.times(factor)?;
            unit.dimension = unit.dimension.checked_times(part.symbol.dimension.power(part.exponent)?)?;
        }
        unit.parts = parts;
        unit.parts.retain(|part| !symbol::is_one(part.symbol));
        Some(unit)
    }

    pub fn dimension(&self) -> Dimension {
        self.dimension
    }

    /// The exact factor to the coherent SI unit (of a difference, for the degree Celsius).
    pub fn factor(&self) -> Factor {
        self.factor
    }

    /// Whether it is the degree Celsius, a scale with an offset.
    pub fn is_celsius(&self) -> bool {
        matches!(self.parts.as_slice(), [part] if symbol::is_celsius(part.symbol))
    }

    /// Whether it is a unit of plane angle, which has the dimension of a number.
    pub fn is_angle(&self) -> bool {
        matches!(self.parts.as_slice(), [part] if symbol::is_angle(part.symbol) && part.exponent == 1)
    }

    /// Whether it is the number one.
    pub fn is_one(&self) -> bool {
        self.parts.is_empty()
    }

    /// A value in this unit, in coherent SI units, rounded once.
    pub fn to_si(&self, value: &Decimal) -> f64 {
        if self.is_celsius() {
            return self.exact(value).to_f64();
        }
        self.difference_decimal_to_si(value)
    }

    /// A value in this unit, in coherent SI units; the double is taken as the shortest decimal that reads back as it.
    pub fn to_si_f64(&self, value: f64) -> f64 {
        Decimal::from_f64_shortest(value).map_or(f64::NAN, |decimal| self.to_si(&decimal))
    }

    /// A value in coherent SI units, in this unit.
    pub fn from_si(&self, value: f64) -> f64 {
        if self.is_celsius() {
            return self.decimal_from_si(value).map_or(f64::NAN, |decimal| decimal.to_f64());
        }
        self.difference_from_si(value)
    }

    /// A difference in this unit, in coherent SI units: as [`Unit::to_si_f64`] without the offset of the Celsius scale.
    pub fn difference_to_si(&self, difference: f64) -> f64 {
        let decimal = Decimal::from_f64_shortest(difference);
        decimal.map_or(f64::NAN, |decimal| self.difference_decimal_to_si(&decimal))
    }

    /// [`Unit::difference_to_si`] of every value of a column: the same digits, sooner.
    ///
    /// A decimal of at most 15 digits is the only one of so few that reads as its double, so it is the shortest; it is
    /// found by trying, and one division of whole numbers below 10^15 by a power of ten up to 10^22 rounds once.
    pub fn differences_to_si(&self, differences: &[f64]) -> Vec<f64> {
        if self.factor == Factor::ONE {
            return differences.to_vec();
        }
        let plain = self.factor.is_power_of_ten();
        let convert = |places: &mut usize, difference: &f64| {
            let quick = if plain { quickly_shifted(*difference, self.factor.ten, places) } else { None };
            quick.unwrap_or_else(|| self.difference_to_si(*difference))
        };
        differences.par_iter().with_min_len(LONG).map_init(|| 0, convert).collect()
    }

    /// A difference typed in this unit, in coherent SI units, rounded once.
    pub fn difference_decimal_to_si(&self, difference: &Decimal) -> f64 {
        if self.factor.is_power_of_ten() {
            return difference.shifted(self.factor.ten).to_f64();
        }
        Exact::new(difference, &self.factor).to_f64()
    }

    /// A difference in coherent SI units, in this unit.
    pub fn difference_from_si(&self, difference: f64) -> f64 {
        let Some(decimal) = Decimal::from_f64_shortest(difference) else { return f64::NAN };
        if self.factor.is_power_of_ten() {
            return decimal.shifted(-self.factor.ten).to_f64();
        }
        Exact::new(&decimal, &self.factor.inverse()).to_f64()
    }

    /// A value in coherent SI units, in this unit as a decimal of fifteen digits; `None` when it is not finite.
    pub fn decimal_from_si(&self, value: f64) -> Option<Decimal> {
        if !self.is_celsius() {
            return self.difference_decimal_from_si(value);
        }
        Decimal::from_f64_15(value)?.minus(&CELSIUS_ZERO)
    }

    /// A difference in coherent SI units, in this unit as a decimal of fifteen digits; `None` when it is not finite.
    pub fn difference_decimal_from_si(&self, difference: f64) -> Option<Decimal> {
        if self.factor.is_power_of_ten() {
            return Some(Decimal::from_f64_15(difference)?.shifted(-self.factor.ten));
        }
        Exact::new(&Decimal::from_f64_shortest(difference)?, &self.factor.inverse()).to_decimal(15)
    }

    /// A typed value, exactly, in coherent SI units.
    pub(super) fn exact(&self, value: &Decimal) -> Exact {
        let exact = Exact::new(value, &self.factor);
        if !self.is_celsius() {
            return exact;
        }
        exact.plus(&Exact::new(&CELSIUS_ZERO, &Factor::ONE)).unwrap_or(exact)
    }

    /// SI style with negative exponents, as in `kg m⁻³`; nothing for the number one. Reads back as the same unit.
    pub fn text(&self) -> String {
        let words: Vec<String> = self.parts.iter().map(Part::text).collect();
        words.join(" ")
    }

    /// As [`Unit::text`], but `1` for the number one.
    pub fn text_or_one(&self) -> String {
        if self.is_one() { "1".into() } else { self.text() }
    }

    /// What stands between a number and this unit: nothing before ° ′ ″ and the number one.
    pub(super) fn stands_close(&self) -> bool {
        match self.parts.first() {
            None => true,
            Some(part) => symbol::is_angle_sign(part.symbol),
        }
    }

    /// The same unit with another prefix on its first symbol; `None` where it takes none or stands below a solidus.
    pub(super) fn with_prefix(&self, prefix: i32) -> Option<Unit> {
        symbol::prefix_of(prefix)?;
        let mut parts = self.parts.clone();
        let first = parts.first_mut().filter(|part| part.symbol.prefixable && part.exponent > 0)?;
        first.prefix = prefix;
        Unit::from_parts(parts)
    }
}

impl Part {
    fn text(&self) -> String {
        let prefix = symbol::prefix_of(self.prefix).unwrap_or("");
        let symbol = self.symbol.spellings.first().copied().unwrap_or("");
        format!("{prefix}{symbol}{}", superscript(self.exponent))
    }
}

impl std::fmt::Display for Unit {
    fn fmt(&self, out: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        out.write_str(&self.text_or_one())
    }
}
/// Powers of ten that are exact as doubles.
const TENS: [f64; 23] = [
    1e0, 1e1, 1e2, 1e3, 1e4, 1e5, 1e6, 1e7, 1e8, 1e9, 1e10, 1e11, 1e12, 1e13, 1e14, 1e15, 1e16, 1e17, 1e18, 1e19, 1e20,
    1e21, 1e22,
];

/// Rows of a column that are worth a thread of their own, at least.
const LONG: usize = 1 << 15;

/// `value` × 10^`ten`, rounded once, for a value of few decimal places; `places` is where the search begins and ends.
fn quickly_shifted(value: f64, ten: i32, places: &mut usize) -> Option<f64> {
    for (tried, factor) in TENS.iter().enumerate().take(10).skip(*places) {
        let whole = (value * factor).round();
        if whole.abs() >= 1e15 {
            return None;
        }
        if whole / factor == value {
            *places = tried;
            let power = ten - tried as i32;
            let tens = *TENS.get(power.unsigned_abs() as usize)?;
            return Some(if power < 0 { whole / tens } else { whole * tens });
        }
    }
    None
}

#[cfg(test)]
mod tests {
    use super::*;
    use proptest::prelude::*;

    fn agrees(unit_text: &str, values: &[f64]) {
        let unit = Unit::parse(unit_text).expect("a unit");
        for (value, quick) in values.iter().zip(unit.differences_to_si(values)) {
            assert_eq!(quick.to_bits(), unit.difference_to_si(*value).to_bits(), "{value} {unit_text}");
        }
    }

    #[test]
    fn columns_convert_as_their_values() {
        let values = [0.0, 0.1, -19.8751, 829.8759, 1e-9, 123_456_789.123_456, 1e23, 5e-324, 1e15];
        ["mm", "µV", "nm", "hPa", "kHz", "1", "s", "h", "°C", "mrad", "GHz"]
            .iter()
            .for_each(|unit| agrees(unit, &values));
    }

    proptest! {
        #[test]
        fn any_column_converts_as_its_values(
            list in prop::collection::vec((-999_999_999_999_999i64..=999_999_999_999_999, 0u32..12), 1..20),
            odd in prop::collection::vec(any::<f64>().prop_filter("finite", |x| x.is_finite()), 0..5),
        ) {
            let mut values: Vec<f64> = list
                .iter()
                .map(|(digits, places)| format!("{digits}e-{places}").parse().unwrap_or(0.0))
                .collect();
            values.extend(odd);
            ["mm", "µV", "hPa", "GHz", "h"].iter().for_each(|unit| agrees(unit, &values));
        }
    }
}
