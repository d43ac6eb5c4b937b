//! The notation of values in records: `1003.21(5) hPa`, `1 kg + 0.123(12) mg`, `20.1 °C ± 0.05 K rectangular`,
//! `1.10 kg/m3 to 1.30 kg/m3 rectangular`, `(1.234 56 ± 0.000 24) mg (k = 2)` and their like.

use super::decimal::Decimal;
use super::dimension::Dimension;
use super::exact::Exact;
use super::kind::Kind;
use super::pieces::{Operand, Pieces, Trailer};
use super::stated::{StatedUncertainty, StatedValue};
use super::unit::Unit;
use crate::diagnostic::{Code, Problem};

/// Longest text of a value, in bytes.
const MOST_BYTES: usize = 400;

/// Reads a value of a kind. The range of a problem counts in bytes of `text`.
///
/// # Errors
/// `BareNumber`, `DecimalComma`, `DimensionMismatch`, `KindMismatch` (°C for a difference), `UncertaintyIncomplete` (±
/// without coverage factor or distribution), `UnitUnknown`, or `NotationUnreadable` for everything else.
pub fn parse_value(text: &str, kind: Kind) -> Result<StatedValue, Problem> {
    if text.len() > MOST_BYTES {
        return Err(unreadable(
            "the value is too long; expected a number with its unit and uncertainty",
            (0, text.len()),
        ));
    }
    let Pieces { first, deviation, upper_limit, spread, trailer } = Pieces::read(text)?;
    let mut value = match (first, deviation, upper_limit) {
        (None, _, None) => spread_alone(spread, &trailer, kind)?,
        (Some(lower), None, Some(upper)) => between_limits(lower, upper, spread, &trailer, kind)?,
        (Some(nominal), Some(deviation), None) => nominal_and_deviation(nominal, deviation, spread, &trailer, kind)?,
        (Some(value), None, None) => single(value, spread, &trailer, kind)?,
        _ => {
            return Err(unreadable(
                "limits stand beside a deviation or ±; expected as in 1 mg to 2 mg",
                (0, text.len()),
            ));
        }
    };
    value.text = text.into();
    Ok(value)
}

/// Reads a value of any unit, or none.
///
/// # Errors
/// As [`parse_value`].
pub fn parse_plain_value(text: &str) -> Result<StatedValue, Problem> {
    parse_value(text, Kind::Plain)
}

/// `20.134(2) °C`, or with ± behind it.
fn single(value: Operand, spread: Option<Operand>, trailer: &Trailer, kind: Kind) -> Result<StatedValue, Problem> {
    check(&value, Role::value(kind))?;
    let uncertainty = uncertainty(&value, spread, trailer, kind)?;
    let si = value.unit.to_si(&value.value);
    Ok(stated(si, value.unit, &value.value, uncertainty, trailer))
}

/// `1 kg + 0.123(12) mg`.
fn nominal_and_deviation(
    nominal: Operand,
    deviation: Operand,
    spread: Option<Operand>,
    trailer: &Trailer,
    kind: Kind,
) -> Result<StatedValue, Problem> {
    check(&nominal, Role::value(kind))?;
    check(&deviation, Role::difference(kind, &nominal))?;
    if nominal.uncertainty.or(nominal.spread).is_some() {
        let message =
            "the nominal value carries an uncertainty; expected it on the deviation, as in 1 kg + 0.123(12) mg";
        return Err(unreadable(message, nominal.number_range));
    }
    let uncertainty = uncertainty(&deviation, spread, trailer, kind)?;
    let exact_nominal = nominal.unit.exact(&nominal.value);
    let exact_deviation = Exact::new(&deviation.value, &deviation.unit.factor());
    let (nominal_si, deviation_si) = (exact_nominal.to_f64(), exact_deviation.to_f64());
    let si = exact_nominal.plus(&exact_deviation).map_or(nominal_si + deviation_si, |sum| sum.to_f64());
    let mut value = stated(si, deviation.unit, &deviation.value, uncertainty, trailer);
    value.nominal = Some(nominal_si);
    value.deviation = Some(deviation_si);
    value.nominal_unit = Some(nominal.unit);
    Ok(value)
}

/// `1.10 kg/m3 to 1.30 kg/m3 rectangular`.
fn between_limits(
    lower: Operand,
    upper: Operand,
    spread: Option<Operand>,
    trailer: &Trailer,
    kind: Kind,
) -> Result<StatedValue, Problem> {
    check(&lower, Role::value(kind))?;
    check(&upper, Role { expected: kind.dimension().or(Some(lower.unit.dimension())), ..Role::value(kind) })?;
    let whole = (lower.number_range.0, upper.unit_range.1);
    let extra = [&lower, &upper].iter().any(|limit| limit.uncertainty.or(limit.spread).is_some());
    if extra || spread.is_some() || trailer.coverage_factor.is_some() {
        return Err(unreadable("limits carry an uncertainty of their own; expected two plain values", whole));
    }
    let Some(shape) = trailer.shape else { return Err(incomplete("the limits have no distribution", whole)) };
    let (low, high) = (lower.unit.exact(&lower.value), upper.unit.exact(&upper.value));
    let width = high.plus(&low.clone().negated());
    if width.is_none_or(|width| width.is_negative() || width.is_zero()) {
        return Err(unreadable("the upper limit does not lie above the lower one", whole));
    }
    let (low_si, high_si) = (low.to_f64(), high.to_f64());
    let si = low.plus(&high).map_or((low_si + high_si) / 2.0, |sum| sum.halved().to_f64());
    let uncertainty = StatedUncertainty::Limits { lower: low_si, upper: high_si, shape };
    Ok(stated(si, lower.unit, &lower.value, uncertainty, trailer))
}

/// `± 0.006 mg rectangular`: a value of zero.
fn spread_alone(spread: Option<Operand>, trailer: &Trailer, kind: Kind) -> Result<StatedValue, Problem> {
    let Some(spread) = spread else { return Err(unreadable("a value is missing", (0, 0))) };
    if matches!(kind, Kind::Temperature | Kind::DewPoint) {
        return Err(unreadable("a temperature is missing before ±", spread.number_range));
    }
    check(&spread, Role { is_difference: true, ..Role::value(kind.of_difference()) })?;
    let (unit, number) = (spread.unit.clone(), spread.value);
    let uncertainty = spread_uncertainty(&spread, trailer)?;
    Ok(stated(0.0, unit, &number, uncertainty, trailer))
}

fn stated(value: f64, unit: Unit, typed: &Decimal, uncertainty: StatedUncertainty, trailer: &Trailer) -> StatedValue {
    StatedValue {
        text: String::new(),
        value,
        nominal: None,
        deviation: None,
        unit,
        nominal_unit: None,
        uncertainty,
        degrees_of_freedom: trailer.degrees_of_freedom.unwrap_or(f64::INFINITY),
        decimals: typed.decimals(),
    }
}

/// The uncertainty of `value` from its parentheses, its brackets, or from what stands behind ±.
fn uncertainty(
    value: &Operand,
    spread: Option<Operand>,
    trailer: &Trailer,
    kind: Kind,
) -> Result<StatedUncertainty, Problem> {
    let bracketed = value.spread.map(|spread| Operand { value: spread, ..value.clone() });
    match (value.uncertainty, bracketed, spread) {
        (None, Some(spread), None) => spread_uncertainty(&spread, trailer),
        (None, None, Some(spread)) => {
            check(&spread, Role::difference(kind, value))?;
            spread_uncertainty(&spread, trailer)
        }
        (Some(standard), None, None) => standard_uncertainty(value, &standard, trailer),
        (None, None, None) => no_uncertainty(trailer),
        _ => Err(unreadable("two uncertainties are stated; expected one", value.number_range)),
    }
}

fn standard_uncertainty(value: &Operand, typed: &Decimal, trailer: &Trailer) -> Result<StatedUncertainty, Problem> {
    if trailer.coverage_factor.is_some() || trailer.shape.is_some() {
        let message =
            "the digits in parentheses are a standard uncertainty, but a coverage factor or distribution follows";
        return Err(
            unreadable(message, trailer.range).hint("write an expanded uncertainty as in 1.234 mg ± 0.024 mg (k = 2)")
        );
    }
    Ok(StatedUncertainty::Standard { u: value.unit.difference_decimal_to_si(typed) })
}

fn no_uncertainty(trailer: &Trailer) -> Result<StatedUncertainty, Problem> {
    let Trailer { coverage_factor: None, degrees_of_freedom: None, shape: None, .. } = trailer else {
        let message = "a coverage factor, degrees of freedom or distribution stands behind a value without uncertainty";
        return Err(unreadable(message, trailer.range));
    };
    Ok(StatedUncertainty::None)
}

/// What stands behind ±, which needs a coverage factor or a distribution to mean something.
fn spread_uncertainty(spread: &Operand, trailer: &Trailer) -> Result<StatedUncertainty, Problem> {
    if spread.value.negative || spread.value.is_zero() {
        let problem = unreadable("the uncertainty behind ± is not above zero", spread.number_range);
        return Err(problem.hint("leave it out where there is none"));
    }
    let width = spread.unit.difference_decimal_to_si(&spread.value);
    match (trailer.coverage_factor, trailer.shape) {
        (Some(coverage_factor), None) => Ok(StatedUncertainty::Expanded { expanded: width, coverage_factor }),
        (None, Some(shape)) => Ok(StatedUncertainty::HalfWidth { half_width: width, shape }),
        (Some(_), Some(_)) => {
            Err(unreadable("both a coverage factor and a distribution are stated; expected one", trailer.range))
        }
        (None, None) => {
            let end = spread.unit_range.1.max(spread.number_range.1);
            Err(incomplete(
                "the uncertainty behind ± has no coverage factor and no distribution",
                (spread.number_range.0, end),
            ))
        }
    }
}

/// What the unit of a number must measure.
#[derive(Debug, Clone, Copy)]
struct Role {
    kind: Kind,
    expected: Option<Dimension>,
    is_difference: bool,
}

impl Role {
    fn value(kind: Kind) -> Role {
        Role { kind, expected: kind.dimension(), is_difference: false }
    }

    /// A deviation or uncertainty of `value`.
    fn difference(kind: Kind, value: &Operand) -> Role {
        let kind = kind.of_difference();
        Role { kind, expected: kind.dimension().or(Some(value.unit.dimension())), is_difference: true }
    }

    /// As in "a pressure such as hPa".
    fn phrase(&self) -> String {
        match self.expected {
            Some(expected) if self.kind == Kind::Plain => {
                let unit = expected.to_string();
                expected.word().map_or(format!("a unit such as {unit}"), |word| format!("{word} such as {unit}"))
            }
            _ => format!("{} such as {}", self.kind.phrase(), self.kind.default_unit()),
        }
    }

    fn allows_bare_number(&self) -> bool {
        self.kind.allows_bare_number() && self.expected.is_none_or(|expected| expected == Dimension::ONE)
    }

    /// Angles and ratios share a dimension but not their units.
    fn mixes_angle(&self, unit: &Unit) -> bool {
        let is_angle = self.kind == Kind::Angle;
        self.expected == Some(Dimension::ONE) && self.kind != Kind::Plain && is_angle != unit.is_angle()
    }
}

/// Whether the unit of a number measures what is wanted.
fn check(operand: &Operand, role: Role) -> Result<(), Problem> {
    let (unit, dimension) = (&operand.unit, operand.unit.dimension());
    if !operand.has_unit {
        return if role.allows_bare_number() { Ok(()) } else { Err(bare_number(operand, role)) };
    }
    if role.expected.is_some_and(|expected| expected != dimension) || role.mixes_angle(unit) {
        return Err(wrong_dimension(operand, role));
    }
    if unit.is_celsius() && (role.is_difference || !role.kind.is_scale_temperature()) {
        let message = "the unit °C belongs to a point on a temperature scale; expected K for a difference";
        return Err(Problem::new(Code::KindMismatch, message)
            .hint("write K")
            .range(operand.unit_range.0, operand.unit_range.1));
    }
    Ok(())
}

fn bare_number(operand: &Operand, role: Role) -> Problem {
    let (start, end) = operand.number_range;
    let number = operand.value.plain_text();
    let number = if number.len() > 40 { "here".into() } else { number };
    let message = format!("the number {number} has no unit; expected {}", role.phrase());
    Problem::new(Code::BareNumber, message).hint("write the unit behind the number").range(start, end)
}

fn wrong_dimension(operand: &Operand, role: Role) -> Problem {
    let dimension = operand.unit.dimension();
    let word = if operand.unit.is_angle() { Some("an angle") } else { dimension.word() };
    let found = word.map_or(format!("something measured in {dimension}"), str::to_owned);
    let message = format!("the unit {} belongs to {found}; expected {}", operand.unit, role.phrase());
    let problem = Problem::new(Code::DimensionMismatch, message).range(operand.unit_range.0, operand.unit_range.1);
    let coulomb = operand.unit.text() == "C" && role.expected == Some(Dimension::TEMPERATURE);
    if coulomb { problem.hint("write °C for degrees Celsius; C is the coulomb") } else { problem }
}

fn incomplete(message: &str, (start, end): (usize, usize)) -> Problem {
    let problem = Problem::new(Code::UncertaintyIncomplete, format!("{message}; expected (k = …) or a distribution"));
    problem
        .hint("add (k = 2) for an expanded uncertainty, or rectangular, triangular or arcsine for limits")
        .range(start, end)
}

fn unreadable(message: &str, (start, end): (usize, usize)) -> Problem {
    Problem::new(Code::NotationUnreadable, message).range(start, end.max(start))
}
