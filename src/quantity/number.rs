//! Numbers alone, whose unit is given elsewhere: cells of raw data files, indications.

use super::decimal::Decimal;
use super::unit::Unit;
use crate::diagnostic::{Code, Problem};

/// A number whose unit is given elsewhere, such as a cell or an indication: in coherent SI units.
///
/// # Errors
/// `DecimalComma`, or `NotationUnreadable` for anything but sign, digits, point and exponent.
pub fn parse_number(text: &str, unit: &Unit) -> Result<f64, Problem> {
    let trimmed = text.trim();
    let start = text.len() - text.trim_start().len();
    let problem = match Decimal::parse(trimmed) {
        Some(number) => match in_range(&number) {
            true => return Ok(unit.to_si(&number)),
            false => Problem::new(Code::NotationUnreadable, format!("the number {trimmed} is out of range")),
        },
        None if has_decimal_comma(trimmed) => decimal_comma(trimmed),
        None => not_a_number(trimmed),
    };
    Err(problem.range(start, start + trimmed.len()))
}

fn not_a_number(text: &str) -> Problem {
    if text.is_empty() {
        return Problem::new(Code::NotationUnreadable, "nothing stands where a number is expected");
    }
    let problem =
        Problem::new(Code::NotationUnreadable, format!("\"{text}\" is no number; expected digits such as 0.1234"));
    if text.contains(char::is_whitespace) {
        return problem.hint("digits are not grouped here, and the unit is given once for all");
    }
    problem.hint("a sign, digits with a decimal point, and an exponent such as e-6 are read here")
}

/// Whether a comma stands between digits.
pub(super) fn has_decimal_comma(text: &str) -> bool {
    let digit = |byte: Option<u8>| byte.is_some_and(|byte| byte.is_ascii_digit());
    let bytes = text.as_bytes();
    let comma = |index: usize| bytes.get(index) == Some(&b',');
    (1..bytes.len())
        .any(|index| comma(index) && digit(bytes.get(index - 1).copied()) && digit(bytes.get(index + 1).copied()))
}

pub(super) fn decimal_comma(text: &str) -> Problem {
    let message = format!("a comma stands in the number {text}; expected a decimal point");
    Problem::new(Code::DecimalComma, message)
        .hint(format!("write {}, with spaces between groups of digits if any", text.replace(',', ".")))
}

/// Whether double precision can hold a decimal as what it is.
pub(super) fn in_range(number: &Decimal) -> bool {
    let double = number.to_f64();
    double.is_finite() && (double != 0.0 || number.is_zero())
}

#[cfg(test)]
mod tests {
    use super::*;

    fn number(text: &str, unit: &str) -> Result<f64, Code> {
        parse_number(text, &Unit::parse(unit).unwrap()).map_err(|problem| problem.code)
    }

    #[test]
    fn cells_and_indications() {
        assert_eq!(number("0.1234", "mg"), Ok(1.234e-7));
        assert_eq!(number(" -5 ", "hPa"), Ok(-500.0));
        assert_eq!(number("\u{2212}1.5e-3", "1"), Ok(-0.0015));
        assert_eq!(number("20.134", "°C"), Ok(293.284));
        assert_eq!(number("+7", "1"), Ok(7.0));
        assert_eq!(number("0,1234", "mg"), Err(Code::DecimalComma));
        assert_eq!(number("1,234.5", "mg"), Err(Code::DecimalComma));
        for bad in [
            "", " ", "nan", "NaN", "inf", "-inf", "1 234", "1.2 mg", "0.5(1)", ".5", "5.", "1e400", "1e-399", "0x10",
            "1_0",
        ] {
            assert_eq!(number(bad, "mg"), Err(Code::NotationUnreadable), "{bad}");
        }
    }

    #[test]
    fn a_problem_marks_the_number() {
        let problem = parse_number("  0,5 ", &Unit::one()).unwrap_err();
        assert_eq!(problem.range, Some((2, 5)));
    }
}
