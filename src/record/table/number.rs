//! Numbers in cells of raw data.

use crate::diagnostic::{Code, Problem};

/// Powers of ten that an `f64` holds exactly.
const POWERS: [f64; 23] = [
    1e0, 1e1, 1e2, 1e3, 1e4, 1e5, 1e6, 1e7, 1e8, 1e9, 1e10, 1e11, 1e12, 1e13, 1e14, 1e15, 1e16, 1e17, 1e18, 1e19, 1e20,
    1e21, 1e22,
];

/// The number in a cell without blanks around it, rounded once to the nearest `f64`.
///
/// # Errors
/// `cell_unreadable` or `decimal_comma`; the sentence goes on after "The cell".
pub fn parse_number(cell: &[u8]) -> Result<f64, Problem> {
    match parse_short(cell) {
        Some(number) => Ok(number),
        None => parse_any(cell),
    }
}

/// Numbers of at most 15 digits without exponent: digits and power of ten are exact, so one division rounds correctly.
fn parse_short(cell: &[u8]) -> Option<f64> {
    let (negative, digits) = match cell {
        [b'-', rest @ ..] => (true, rest),
        [b'+', rest @ ..] => (false, rest),
        _ => (false, cell),
    };
    if digits.len() > 16 {
        return None;
    }
    let (mut whole, mut count, mut point) = (0u64, 0usize, None);
    for &byte in digits {
        match byte {
            b'0'..=b'9' => {
                whole = whole * 10 + u64::from(byte - b'0');
                count += 1;
            }
            b'.' if point.is_none() => point = Some(count),
            _ => return None,
        }
    }
    if count == 0 || count > 15 {
        return None;
    }
    let power = POWERS.get(count - point.unwrap_or(count))?;
    let number = whole as f64 / power;
    Some(if negative { -number } else { number })
}

/// Every other number, and the complaint about what is none.
fn parse_any(cell: &[u8]) -> Result<f64, Problem> {
    let text = String::from_utf8_lossy(cell);
    let unreadable = |what: String| Problem::new(Code::CellUnreadable, what);
    if text.is_empty() {
        return Err(unreadable("is empty, but a number was expected".into()));
    }
    let plain = text.replace('\u{2212}', "-");
    match plain.parse::<f64>() {
        Ok(number) if number.is_finite() => Ok(number),
        Ok(_) if plain.contains(|c: char| c.is_ascii_digit()) => {
            Err(unreadable(format!("holds “{text}”, which is too large for a number")))
        }
        Ok(_) => Err(unreadable(format!("holds “{text}”, but a finite number was expected"))),
        Err(_) if plain.matches(',').count() == 1 && plain.replace(',', ".").parse::<f64>().is_ok() => {
            let problem = Problem::new(Code::DecimalComma, format!("holds “{text}” with a decimal comma"));
            Err(problem.hint("Write raw data with decimal points."))
        }
        Err(_) => {
            let shown: String = text.chars().take(40).collect();
            Err(unreadable(format!("holds “{shown}”, but a number was expected")))
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use proptest::prelude::*;

    #[test]
    fn reads_plain_numbers() {
        for text in [
            "0",
            "-0",
            "+1",
            "0.1",
            "-12.345",
            ".5",
            "5.",
            "123456789012345",
            "0.00000000000001",
            "1e5",
            "-1.5E-300",
            "0.1234567890123456789",
        ] {
            assert_eq!(
                parse_number(text.as_bytes()).unwrap().to_bits(),
                text.parse::<f64>().unwrap().to_bits(),
                "{text}"
            );
        }
        assert_eq!(parse_number("−1.5".as_bytes()).unwrap(), -1.5);
    }

    #[test]
    fn refuses_what_is_no_finite_number() {
        for text in
            ["", "NaN", "inf", "-Infinity", "1e999", "1 000", "0x1", "1.2.3", "-", ".", "--1", "1,2,3", "\u{fffd}"]
        {
            assert_eq!(parse_number(text.as_bytes()).unwrap_err().code, Code::CellUnreadable, "{text}");
        }
        assert_eq!(parse_number(b"1,5").unwrap_err().code, Code::DecimalComma);
        assert_eq!(parse_number(b"\xff").unwrap_err().code, Code::CellUnreadable);
    }

    proptest! {
        #[test]
        fn agrees_with_the_standard_library(text in "[-+]?[0-9]{0,12}\\.?[0-9]{0,8}(e-?[0-9]{1,2})?") {
            let expected = text.parse::<f64>().ok().map(f64::to_bits);
            prop_assert_eq!(parse_number(text.as_bytes()).ok().map(f64::to_bits), expected);
        }
    }
}
