//! Latitudes and longitudes: `47.312° N`, `8° 24′ 54″ E`.

use super::cursor::Cursor;
use super::decimal::Decimal;
use super::unit::Unit;
use crate::diagnostic::{Code, Problem};

/// Which of the two angles of a place.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Hash)]
pub enum Axis {
    /// North positive.
    Latitude,
    /// East positive.
    Longitude,
}

impl Axis {
    pub fn word(self) -> &'static str {
        match self {
            Axis::Latitude => "latitude",
            Axis::Longitude => "longitude",
        }
    }

    /// Positive and negative letter.
    fn letters(self) -> (char, char) {
        match self {
            Axis::Latitude => ('N', 'S'),
            Axis::Longitude => ('E', 'W'),
        }
    }

    fn limit(self) -> f64 {
        match self {
            Axis::Latitude => 90.0,
            Axis::Longitude => 180.0,
        }
    }

    fn example(self) -> &'static str {
        match self {
            Axis::Latitude => "47.312° N",
            Axis::Longitude => "8.415° E",
        }
    }
}

/// A latitude or longitude, north and east positive.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Coordinate {
    pub degrees: f64,
    pub radians: f64,
}

/// Reads a latitude or a longitude with its letter.
///
/// # Errors
/// `NotationUnreadable`, `DecimalComma`, or `OutOfValidity` beyond 90° or 180°.
pub fn parse_coordinate(text: &str, axis: Axis) -> Result<Coordinate, Problem> {
    let mut cursor = Cursor::new(text);
    cursor.skip_spaces();
    let mut degrees = component(&mut cursor, '°', axis)?;
    for (sign, part) in [('′', 60.0), ('″', 3600.0)] {
        cursor.skip_spaces();
        if cursor.peek().is_some_and(|next| next.is_ascii_digit()) {
            degrees += component(&mut cursor, sign, axis)? / part;
        }
    }
    cursor.skip_spaces();
    let negative = letter(&mut cursor, axis)?;
    cursor.skip_spaces();
    if !cursor.at_end() {
        return Err(wrong(axis, "nothing more is expected here").range(cursor.at, text.len()));
    }
    if degrees > axis.limit() {
        let message = format!("the {} {degrees}° lies beyond {}°", axis.word(), axis.limit());
        return Err(Problem::new(Code::OutOfValidity, message).range(0, text.len()));
    }
    let degrees = if negative { -degrees } else { degrees };
    let radians = Unit::parse("°")?.to_si_f64(degrees);
    Ok(Coordinate { degrees, radians })
}

/// A number without sign, followed by `sign`.
fn component(cursor: &mut Cursor, sign: char, axis: Axis) -> Result<f64, Problem> {
    let start = cursor.at;
    let number: Decimal = cursor.numeral()?.value;
    if number.negative {
        let problem = wrong(axis, "its side is said by a letter, not by a sign");
        return Err(problem.range(start, cursor.at));
    }
    cursor.skip_spaces();
    if !cursor.take(sign) {
        return Err(wrong(axis, &format!("the sign {sign} is missing after a number")).range(start, cursor.at));
    }
    Ok(number.to_f64())
}

/// Whether the letter says south or west.
fn letter(cursor: &mut Cursor, axis: Axis) -> Result<bool, Problem> {
    let (positive, negative) = axis.letters();
    if cursor.take(positive) {
        return Ok(false);
    }
    if cursor.take(negative) {
        return Ok(true);
    }
    Err(wrong(axis, &format!("the letter {positive} or {negative} is missing")).range(cursor.at, cursor.text.len()))
}

fn wrong(axis: Axis, what: &str) -> Problem {
    let message = format!("the {} is unreadable: {what}", axis.word());
    Problem::new(Code::NotationUnreadable, message).hint(format!("write it as in {}", axis.example()))
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn both_forms() {
        let latitude = parse_coordinate("47.312° N", Axis::Latitude).unwrap();
        assert_eq!((latitude.degrees, latitude.radians), (47.312, 0.8257501757035572));
        let south = parse_coordinate("33° 30′ 36″ S", Axis::Latitude).unwrap();
        assert!((south.degrees + 33.51).abs() < 1e-13);
        assert_eq!(parse_coordinate("8.415 °E", Axis::Longitude).unwrap().degrees, 8.415);
        assert_eq!(parse_coordinate("170.5° W", Axis::Longitude).unwrap().degrees, -170.5);
    }

    #[test]
    fn what_is_wrong_is_said() {
        let code = |text, axis| parse_coordinate(text, axis).unwrap_err().code;
        for bad in ["", "47.312", "47.312°", "47.312 N", "47.312° E", "-47.3° N", "47.3° N x", "°N", "47.312° n"]
        {
            assert_eq!(code(bad, Axis::Latitude), Code::NotationUnreadable, "{bad}");
        }
        assert_eq!(code("47,3° N", Axis::Latitude), Code::DecimalComma);
        assert_eq!(code("91° N", Axis::Latitude), Code::OutOfValidity);
    }
}
