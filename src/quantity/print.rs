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
        grouped
            .flat_map(|(index, digit)| [(index > 0 && index % 3 == 0).then_some(GROUP_SPACE), Some(digit)])
            .flatten()
            .collect()
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

/// `base`, or the same unit with a prefix in which an uncertainty of this size prints well: its last digit does not lie
/// left of the marker, and it does not drown in zeros.
pub fn choose_unit(uncertainty_si: f64, base: &Unit) -> Unit {
    let Some(lead) = lead_in(base, uncertainty_si) else { return base.clone() };
    if READABLE_LEADS.contains(&lead) {
        return base.clone();
    }
    let candidates = PREFIXES_TO_CHOOSE.iter().filter_map(|&prefix| base.with_prefix(prefix));
    let candidates = candidates.filter_map(|unit| lead_in(&unit, uncertainty_si).map(|lead| (lead, unit)));
    // The first digit of the uncertainty is best in the tenths; many zeros are better than a refusal.
    let least_bad = candidates.min_by_key(|(lead, _)| (*lead > *READABLE_LEADS.end(), (lead + 1).abs()));
    least_bad.map_or_else(|| base.clone(), |(_, unit)| unit)
}

/// Powers of ten of the first of two digits of an uncertainty between which it reads well.
const READABLE_LEADS: std::ops::RangeInclusive<i32> = -4..=1;
/// Prefixes for thousands, the ones of everyday use first.
const PREFIXES_TO_CHOOSE: [i32; 21] =
    [0, -3, 3, -6, 6, -9, 9, -12, 12, -15, 15, -18, 18, -21, 21, -24, 24, -27, 27, -30, 30];

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
    let (rounded, rounded_uncertainty) =
        round_decimals(&value.shifted(-power), &uncertainty.shifted(-power), SIGNIFICANT);
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
