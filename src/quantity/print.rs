//! Printing values with their uncertainties for people, and plainly for machines.
//!
//! # Source    SI Brochure, 9th edition, 5.4 (grouping, marker, spaces, parentheses); JCGM 100:2008, 7.2

use super::decimal::Decimal;
use super::dimension::raised;
use super::rounding::{finite, positive, round_decimals};
use super::unit::Unit;
use crate::diagnostic::{Code, Problem};

/// Significant digits of a printed uncertainty.
const SIGNIFICANT: usize = 2;
/// Values below this are printed with a power of ten when their unit takes no prefix.
const SMALL_POWER: i32 = -3;
/// Between groups of three digits: a narrow space that does not break.
const GROUP_SPACE: char = '\u{202f}';
/// Between number and unit: a space that does not break.
const SPACE: &str = "\u{a0}";
/// The minus sign.
const MINUS: &str = "\u{2212}";

/// The decimal marker of a document.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Hash, Default)]
pub enum Marker {
    #[default]
    Point,
    Comma,
}

/// How numbers are dressed.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Hash)]
pub struct Style {
    pub marker: Marker,
    /// Groups of three, true minus signs and spaces that do not break: for people.
    pub grouped: bool,
}

/// Value and uncertainty rounded, both to be multiplied by `10^power`.
struct Arranged {
    value: Decimal,
    uncertainty: Decimal,
    power: i32,
}

impl Style {
    /// For people, with a decimal point.
    pub const POINT: Style = Style { marker: Marker::Point, grouped: true };
    /// For people, with a decimal comma.
    pub const COMMA: Style = Style { marker: Marker::Comma, grouped: true };
    /// For machines.
    pub const PLAIN: Style = Style { marker: Marker::Point, grouped: false };

    /// `1.234 56(12) mg`: digits in parentheses are the standard uncertainty in the last digits.
    ///
    /// # Errors
    /// Nothing finite to print, or an uncertainty whose last digit lies left of the marker in this unit.
    pub fn standard(self, value_si: f64, uncertainty_si: f64, unit: &Unit) -> Result<String, Problem> {
        let value = finite(value_si, unit.decimal_from_si(value_si))?;
        let arranged = arrange(&value, &uncertainty_in(unit, uncertainty_si)?, unit)?;
        Ok(self.join(&self.parentheses(&arranged), unit))
    }

    /// `(1.234 56 ± 0.000 12) mg`: for an expanded uncertainty, whose coverage factor must stand nearby.
    ///
    /// # Errors
    /// As [`Style::standard`].
    pub fn expanded(self, value_si: f64, expanded_si: f64, unit: &Unit) -> Result<String, Problem> {
        let value = finite(value_si, unit.decimal_from_si(value_si))?;
        let arranged = arrange(&value, &uncertainty_in(unit, expanded_si)?, unit)?;
        Ok(self.join(&self.brackets(&arranged), unit))
    }

    /// `1 kg + 0.123(12) mg`: a nominal value as typed, and the deviation with its standard uncertainty.
    ///
    /// # Errors
    /// As [`Style::standard`].
    pub fn deviation(self, nominal: &str, deviation_si: f64, u_si: f64, unit: &Unit) -> Result<String, Problem> {
        let arranged = arrange_deviation(deviation_si, u_si, unit)?;
        let size = Arranged { value: arranged.value.magnitude(), ..arranged };
        Ok(self.append(nominal, arranged.value.negative, &self.join(&self.parentheses(&size), unit)))
    }

    /// `1 kg + (0.123 ± 0.024) mg`: as [`Style::deviation`] with an expanded uncertainty.
    ///
    /// # Errors
    /// As [`Style::standard`].
    pub fn expanded_deviation(
        self,
        nominal: &str,
        deviation_si: f64,
        expanded_si: f64,
        unit: &Unit,
    ) -> Result<String, Problem> {
        let arranged = arrange_deviation(deviation_si, expanded_si, unit)?;
        let size = Arranged { value: arranged.value.magnitude(), ..arranged };
        Ok(self.append(nominal, arranged.value.negative, &self.join(&self.brackets(&size), unit)))
    }

    /// A value alone, with so many decimals.
    ///
    /// # Errors
    /// Nothing finite to print.
    pub fn value(self, value_si: f64, unit: &Unit, decimals: i32) -> Result<String, Problem> {
        let value = finite(value_si, unit.decimal_from_si(value_si))?;
        Ok(self.join(&self.number(&value.rounded(decimals)), unit))
    }

    /// An uncertainty or another difference alone, with so many significant digits: `0.024 mg`.
    ///
    /// # Errors
    /// Nothing finite to print.
    pub fn difference(self, difference_si: f64, unit: &Unit, significant: usize) -> Result<String, Problem> {
        let value = finite(difference_si, unit.difference_decimal_from_si(difference_si))?;
        let value = value.rounded_to_digits(significant.clamp(1, 15));
        let lead = value.leading_power().unwrap_or(0);
        let untidy = value.exponent > 0 || lead < SMALL_POWER - 2;
        let power = if untidy && !value.is_zero() { lead } else { 0 };
        Ok(self.join(&self.with_power(self.number(&value.shifted(-power)), power), unit))
    }

    /// A decimal with grouping, marker and minus sign of this style.
    pub fn number(self, decimal: &Decimal) -> String {
        self.digits(&decimal.plain_text())
    }

    /// Plain digits dressed in this style.
    pub fn digits(self, plain: &str) -> String {
        let (sign, digits) = plain.strip_prefix('-').map_or(("", plain), |rest| (self.minus(), rest));
        let (whole, fraction) = digits.split_once('.').unwrap_or((digits, ""));
        let whole = self.group_from_right(whole);
        if fraction.is_empty() {
            return format!("{sign}{whole}");
        }
        let marker = if self.marker == Marker::Comma { ',' } else { '.' };
        format!("{sign}{whole}{marker}{}", self.group_from_left(fraction))
    }

    /// A unit as this style prints it.
    pub fn unit(self, unit: &Unit) -> String {
        self.spaced(&unit.text())
    }

    fn parentheses(self, arranged: &Arranged) -> String {
        let plain = arranged.uncertainty.plain_text();
        let below_one = arranged.uncertainty.leading_power().is_none_or(|power| power < 0);
        let inner = if below_one { arranged.uncertainty.digits.to_string() } else { self.digits(&plain) };
        self.with_power(format!("{}({inner})", self.number(&arranged.value)), arranged.power)
    }

    fn brackets(self, arranged: &Arranged) -> String {
        let space = self.space();
        let (value, uncertainty) = (self.number(&arranged.value), self.number(&arranged.uncertainty));
        self.with_power(format!("({value}{space}±{space}{uncertainty})"), arranged.power)
    }

    fn with_power(self, number: String, power: i32) -> String {
        let space = self.space();
        if power == 0 { number } else { format!("{number}{space}×{space}10{}", raised(power)) }
    }

    fn append(self, nominal: &str, negative: bool, deviation: &str) -> String {
        let space = self.space();
        let sign = if negative { self.minus() } else { "+" };
        format!("{}{space}{sign}{space}{deviation}", self.spaced(nominal.trim()))
    }

    fn join(self, number: &str, unit: &Unit) -> String {
        let space = if unit.stands_close() { "" } else { self.space() };
        format!("{number}{space}{}", self.unit(unit))
    }

    fn spaced(self, text: &str) -> String {
        text.replace(' ', self.space())
    }

    fn space(self) -> &'static str {
        if self.grouped { SPACE } else { " " }
    }

    fn minus(self) -> &'static str {
        if self.grouped { MINUS } else { "-" }
    }

    /// Groups of three counted from the left; four digits stay together.
    fn group_from_left(self, digits: &str) -> String {
        if !self.grouped || digits.len() <= 4 {
            return digits.into();
        }
        let grouped = digits.chars().enumerate();
        grouped.flat_map(|(index, digit)| [(index > 0 && index % 3 == 0).then_some(GROUP_SPACE), Some(digit)]).flatten().collect()
    }

    /// Groups of three counted from the right; four digits stay together.
    fn group_from_right(self, digits: &str) -> String {
        let mirrored: String = digits.chars().rev().collect();
        self.group_from_left(&mirrored).chars().rev().collect()
    }
}

/// [`Style::standard`] for people, with a decimal point.
///
/// # Errors
/// As [`Style::standard`].
pub fn print_standard(value_si: f64, uncertainty_si: f64, unit: &Unit) -> Result<String, Problem> {
    Style::POINT.standard(value_si, uncertainty_si, unit)
}

/// [`Style::expanded`] for people, with a decimal point.
///
/// # Errors
/// As [`Style::standard`].
pub fn print_expanded(value_si: f64, expanded_si: f64, unit: &Unit) -> Result<String, Problem> {
    Style::POINT.expanded(value_si, expanded_si, unit)
}

/// [`Style::value`] for people, with a decimal point.
///
/// # Errors
/// Nothing finite to print.
pub fn print_value(value_si: f64, unit: &Unit, decimals: i32) -> Result<String, Problem> {
    Style::POINT.value(value_si, unit, decimals)
}

/// [`Style::deviation`] for people, with a decimal point.
///
/// # Errors
/// As [`Style::standard`].
pub fn print_deviation(nominal: &str, deviation_si: f64, u_si: f64, unit: &Unit) -> Result<String, Problem> {
    Style::POINT.deviation(nominal, deviation_si, u_si, unit)
}

/// `base`, or the same unit with a prefix in which an uncertainty of this size prints well: its last digit never lies
/// left of the marker, and it does not drown in zeros.
pub fn choose_unit(uncertainty_si: f64, base: &Unit) -> Unit {
    let good = |unit: &Unit| {
        let lead = lead_in(unit, uncertainty_si);
        lead.is_none_or(|lead| (-4..=1).contains(&lead))
    };
    if good(base) {
        return base.clone();
    }
    let prefixes = [-30, -27, -24, -21, -18, -15, -12, -9, -6, -3, 0, 3, 6, 9, 12, 15, 18, 21, 24, 27, 30];
    let candidates = prefixes.iter().filter_map(|&prefix| base.with_prefix(prefix)).filter(good);
    // The prefix that leaves the first digit of the uncertainty nearest to the tenths.
    let nearest = candidates.min_by_key(|unit| lead_in(unit, uncertainty_si).map_or(0, |lead| (lead + 1).abs()));
    nearest.unwrap_or_else(|| base.clone())
}

/// The power of ten of the first printed digit of an uncertainty in this unit.
fn lead_in(unit: &Unit, uncertainty_si: f64) -> Option<i32> {
    unit.difference_decimal_from_si(uncertainty_si)?.rounded_to_digits(SIGNIFICANT).leading_power()
}

fn uncertainty_in(unit: &Unit, uncertainty_si: f64) -> Result<Decimal, Problem> {
    positive(uncertainty_si, unit.difference_decimal_from_si(uncertainty_si))
}

fn arrange_deviation(deviation_si: f64, uncertainty_si: f64, unit: &Unit) -> Result<Arranged, Problem> {
    let deviation = finite(deviation_si, unit.difference_decimal_from_si(deviation_si))?;
    arrange(&deviation, &uncertainty_in(unit, uncertainty_si)?, unit)
}

/// Rounds, and takes out a power of ten where the unit has no prefix that could do so.
fn arrange(value: &Decimal, uncertainty: &Decimal, unit: &Unit) -> Result<Arranged, Problem> {
    let power = power_to_take_out(value, uncertainty, unit);
    let (rounded, rounded_uncertainty) = round_decimals(&value.shifted(-power), &uncertainty.shifted(-power), SIGNIFICANT);
    if rounded_uncertainty.decimals() < 0 {
        return Err(too_small(&rounded_uncertainty, unit));
    }
    Ok(Arranged { value: rounded, uncertainty: rounded_uncertainty, power })
}

fn power_to_take_out(value: &Decimal, uncertainty: &Decimal, unit: &Unit) -> i32 {
    let (value, uncertainty) = round_decimals(value, uncertainty, SIGNIFICANT);
    let lead = value.leading_power().max(uncertainty.leading_power()).unwrap_or(0);
    let untidy = lead < SMALL_POWER || uncertainty.decimals() < 0;
    if untidy && unit.with_prefix(0).is_none() { lead } else { 0 }
}

fn too_small(uncertainty: &Decimal, unit: &Unit) -> Problem {
    let unit = unit.text_or_one();
    let message = format!(
        "the last digit of the uncertainty {} {unit} lies left of the decimal marker; expected a unit with a larger prefix",
        uncertainty.plain_text()
    );
    Problem::new(Code::FigureMissing, message).hint("choose a larger prefix")
}

#[cfg(test)]
mod tests {
    use super::super::{Decimal, Kind, StatedUncertainty, parse_plain_value, parse_value};
    use super::*;
    use proptest::prelude::*;

    fn unit(text: &str) -> Unit {
        Unit::parse(text).unwrap()
    }

    /// Printed text with its spaces made ordinary, for reading.
    fn readable(printed: Result<String, Problem>) -> String {
        printed.unwrap().replace(['\u{202f}', '\u{a0}'], " ")
    }

    fn standard(value: f64, uncertainty: f64, symbol: &str) -> String {
        let unit = unit(symbol);
        readable(print_standard(unit.to_si_f64(value), unit.difference_to_si(uncertainty), &unit))
    }

    fn expanded(value: f64, uncertainty: f64, symbol: &str) -> String {
        let unit = unit(symbol);
        readable(print_expanded(unit.to_si_f64(value), unit.difference_to_si(uncertainty), &unit))
    }

    #[test]
    fn both_forms_of_every_rounding() {
        let rows = [
            (1.23456, 0.00012, "1.234 56(12) mg", "(1.234 56 ± 0.000 12) mg"),
            (0.9999999875, 0.000000024, "0.999 999 988(24) mg", "(0.999 999 988 ± 0.000 000 024) mg"),
            (100.02147, 0.0996, "100.02(10) mg", "(100.02 ± 0.10) mg"),
            (12.3451, 0.995, "12.3(1.0) mg", "(12.3 ± 1.0) mg"),
            (-0.0004, 0.05, "0.000(50) mg", "(0.000 ± 0.050) mg"),
            (12.345, 0.0105, "12.345(10) mg", "(12.345 ± 0.010) mg"),
            (12.345, 0.0115, "12.345(12) mg", "(12.345 ± 0.012) mg"),
            (10.05762, 0.027, "10.058(27) mg", "(10.058 ± 0.027) mg"),
            (432.10, 1.26, "432.1(1.3) mg", "(432.1 ± 1.3) mg"),
            (-12345.6, 12.0, "−12 346(12) mg", "(−12 346 ± 12) mg"),
            (1234.5, 12.0, "1234(12) mg", "(1234 ± 12) mg"),
        ];
        for (value, uncertainty, parentheses, brackets) in rows {
            assert_eq!(standard(value, uncertainty, "mg"), parentheses);
            assert_eq!(expanded(value, uncertainty, "mg"), brackets);
        }
        let refused = print_standard(1.234567, 0.001234, &unit("mg"));
        assert!(refused.is_err_and(|problem| problem.hints.iter().any(|hint| hint.contains("larger prefix"))));
    }

    #[test]
    fn units_powers_and_styles() {
        assert_eq!(standard(20.134, 0.012, "°C"), "20.134(12) °C");
        assert_eq!(standard(45.3, 1.2, "%"), "45.3(1.2) %");
        assert_eq!(standard(0.0, 5e-10, "1"), "0.0(5.0) × 10⁻¹⁰");
        assert_eq!(standard(4.5e-5, 2e-6, "/K"), "4.50(20) × 10⁻⁵ K⁻¹");
        assert_eq!(standard(0.999999987, 2.4e-8, "1"), "0.999 999 987(24)");
        assert_eq!(standard(1234567.0, 1234.0, "1"), "1.2346(12) × 10⁶");
        assert_eq!(standard(47.312, 0.012, "°"), "47.312(12)°");
        assert_eq!(standard(1.1834, 0.0012, "kg/m3"), "1.1834(12) kg m⁻³");
        assert_eq!(readable(Style::COMMA.standard(1234567.8, 0.12, &Unit::one())), "1 234 567,80(12)");
        assert_eq!(Style::PLAIN.standard(-0.0123456789, 1.2e-8, &unit("kg")).as_deref(), Ok("-0.012345679(12) kg"));
        assert_eq!(readable(print_value(293.284, &unit("°C"), 3)), "20.134 °C");
        assert_eq!(readable(print_value(1e-3, &unit("dm3"), 1)), "1.0 dm³");
        assert_eq!(readable(Style::POINT.difference(2.4e-8, &unit("mg"), 2)), "0.024 mg");
        assert_eq!(readable(Style::POINT.difference(2.4e-12, &Unit::one(), 2)), "2.4 × 10⁻¹²");
    }

    #[test]
    fn nominal_plus_deviation() {
        let mg = unit("mg");
        assert_eq!(readable(print_deviation("1 kg", 1.23e-7, 1.2e-8, &mg)), "1 kg + 0.123(12) mg");
        assert_eq!(readable(print_deviation("1 kg", -1.23e-7, 1.2e-8, &mg)), "1 kg − 0.123(12) mg");
        assert_eq!(readable(print_deviation("1 kg", -1e-12, 1.2e-8, &mg)), "1 kg + 0.000(12) mg");
        let expanded = Style::POINT.expanded_deviation("1 kg", -1.23e-7, 2.4e-8, &mg);
        assert_eq!(readable(expanded), "1 kg − (0.123 ± 0.024) mg");
    }

    #[test]
    fn a_unit_is_found_that_prints() {
        let text = |uncertainty: f64, symbol: &str| choose_unit(uncertainty, &unit(symbol)).text();
        assert_eq!(text(1.2e-8, "mg"), "mg");
        assert_eq!(text(1.2e-8, "kg"), "mg");
        assert_eq!(text(0.0012, "mg"), "kg");
        assert_eq!(text(99.6e-6, "mg"), "g");
        assert_eq!(text(6e-10, "cm3"), "cm³");
        assert_eq!(text(1e-9, "1"), "");
        assert_eq!(text(0.0, "mg"), "mg");
        assert_eq!(text(f64::NAN, "mg"), "mg");
    }

    #[test]
    fn nothing_infinite_is_printed() {
        assert!(print_standard(f64::NAN, 1.0, &unit("mg")).is_err());
        assert!(print_standard(1.0, 0.0, &unit("mg")).is_err());
        assert!(print_value(f64::INFINITY, &unit("mg"), 3).is_err());
    }

    proptest! {
        #![proptest_config(ProptestConfig::with_cases(10_000))]

        #[test]
        fn a_chosen_unit_never_refuses(value in -1e12..1e12f64, mantissa in 1.0..10.0f64, power in -28..25i32, index in 0..8usize) {
            let symbol = ["mg", "kg", "cm3", "°C", "1", "hPa", "kg/m3", "m/s2"][index];
            let uncertainty = Decimal::parse(&format!("{mantissa}e{power}")).unwrap().to_f64();
            let unit = choose_unit(uncertainty, &unit(symbol));
            let printed = print_standard(value, uncertainty, &unit);
            prop_assert!(printed.is_ok(), "{printed:?} {unit}");
        }

        #[test]
        fn what_is_printed_reads_back_and_prints_the_same(
            value in -1e4..1e4f64, mantissa in 1.0..10.0f64, power in -9..2i32, index in 0..7usize, grouped in any::<bool>(),
        ) {
            let unit = unit(["mg", "°C", "1", "hPa", "g/cm3", "°", "%"][index]);
            let uncertainty = Decimal::parse(&format!("{mantissa}e{power}")).unwrap().to_f64();
            let style = Style { marker: Marker::Point, grouped };
            let (value, uncertainty) = (unit.to_si_f64(value), unit.difference_to_si(uncertainty));
            if let Ok(printed) = style.standard(value, uncertainty, &unit) {
                let read = parse_plain_value(&printed).map_err(|problem| TestCaseError::fail(format!("{printed}: {problem:?}")))?;
                let StatedUncertainty::Standard { u } = read.uncertainty else { return Err(TestCaseError::fail(printed)) };
                prop_assert_eq!(style.standard(read.value, u, &unit).unwrap(), printed);
            }
            if let Ok(printed) = style.expanded(value, uncertainty, &unit) {
                let read = parse_plain_value(&format!("{printed} (k = 2)")).unwrap();
                let StatedUncertainty::Expanded { expanded, .. } = read.uncertainty else { return Err(TestCaseError::fail(printed)) };
                prop_assert_eq!(style.expanded(read.value, expanded, &unit).unwrap(), printed);
            }
        }

        #[test]
        fn a_printed_deviation_reads_back(deviation in -1e-4..1e-4f64, mantissa in 1.0..10.0f64, power in -12..-6i32) {
            let mg = unit("mg");
            let uncertainty = Decimal::parse(&format!("{mantissa}e{power}")).unwrap().to_f64();
            let printed = print_deviation("1 kg", deviation, uncertainty, &mg).unwrap();
            let read = parse_value(&printed, Kind::Mass).unwrap();
            let again = print_deviation("1 kg", read.deviation.unwrap(), read.standard_uncertainty().unwrap(), &mg).unwrap();
            prop_assert_eq!(again, printed);
        }
    }
}
