//! Reading units: `m/s2`, `nm s-2 hPa-1`, `kg·m⁻³`, `kg/(m·s²)`, `/K`, `µmol/mol`.

use super::dimension::lower;
use super::symbol::{self, Symbol};
use super::unit::{Part, Unit};
use crate::diagnostic::{Code, Problem};

/// Largest exponent of a symbol, either way.
const MOST_EXPONENT: i32 = 12;
/// Longest text of a unit, in bytes.
const MOST_BYTES: usize = 120;

impl Unit {
    /// Reads a unit. `1` is the unit of a number.
    ///
    /// # Errors
    /// `UnitUnknown` with the nearest symbol, or `NotationUnreadable` where the syntax does not hold.
    pub fn parse(text: &str) -> Result<Unit, Problem> {
        if text.trim().is_empty() {
            return Err(unreadable("a unit is missing here", 0, text.len()).hint("write 1 for the unit of a number"));
        }
        if text.len() > MOST_BYTES {
            return Err(unreadable(&format!("a unit takes at most {MOST_BYTES} bytes"), 0, text.len()));
        }
        let mut reader = Reader { text, at: 0, parts: Vec::new() };
        reader.read()?;
        let Reader { parts, .. } = reader;
        check_celsius(text, &parts)?;
        Unit::from_parts(parts).ok_or_else(|| {
            unreadable(&format!("the exponents of the unit \"{}\" are too large", text.trim()), 0, text.len())
        })
    }
}

/// The degree Celsius counts from its own zero, so nothing may be multiplied by it.
fn check_celsius(text: &str, parts: &[Part]) -> Result<(), Problem> {
    let composite = parts.iter().any(|part| symbol::is_celsius(part.symbol) && (parts.len() > 1 || part.exponent != 1));
    if !composite {
        return Ok(());
    }
    let message = format!("the unit \"{}\" combines °C with something else; expected K there", text.trim());
    Err(unreadable(&message, 0, text.len()).hint("write K for differences of temperature, as in /K"))
}

struct Reader<'t> {
    text: &'t str,
    at: usize,
    parts: Vec<Part>,
}

impl Reader<'_> {
    /// A product, then at most one solidus and what it divides by.
    fn read(&mut self) -> Result<(), Problem> {
        self.skip_spaces();
        if self.peek() != Some('/') {
            self.product(1)?;
        }
        if self.peek() == Some('/') {
            self.at += 1;
            self.skip_spaces();
            self.divisor()?;
        }
        self.skip_spaces();
        match self.peek() {
            None => Ok(()),
            Some('/') => Err(self.wrong("a second solidus makes the unit ambiguous").hint(BRACKETS)),
            Some(_) => Err(self.wrong("more than one symbol follows the solidus without brackets").hint(BRACKETS)),
        }
    }

    fn divisor(&mut self) -> Result<(), Problem> {
        if self.peek() != Some('(') {
            self.power(-1)?;
            return Ok(());
        }
        self.at += 1;
        self.skip_spaces();
        self.product(-1)?;
        if self.peek() != Some(')') {
            return Err(self.wrong("a bracket is not closed"));
        }
        self.at += 1;
        Ok(())
    }

    /// Symbols with exponents, joined by spaces or dots at half height; stops before `/` and `)`.
    fn product(&mut self, sign: i32) -> Result<(), Problem> {
        loop {
            self.power(sign)?;
            let spaced = self.skip_spaces();
            let dotted = matches!(self.peek(), Some('·' | '⋅' | '*'));
            if dotted {
                self.skip_char();
                self.skip_spaces();
            }
            match self.peek() {
                None | Some('/' | ')') if !dotted => return Ok(()),
                _ if dotted || spaced => {}
                _ => return Err(self.wrong("a space or · is missing between two symbols")),
            }
        }
    }

    fn power(&mut self, sign: i32) -> Result<(), Problem> {
        let (symbol, prefix) = self.symbol()?;
        let exponent = if symbol::is_one(symbol) { 1 } else { self.exponent()? };
        self.parts.push(Part { symbol, prefix, exponent: sign * exponent });
        Ok(())
    }

    fn symbol(&mut self) -> Result<(&'static Symbol, i32), Problem> {
        let start = self.at;
        if self.peek() == Some('1') {
            self.at += 1;
        } else {
            while self.peek().is_some_and(is_symbol_char) {
                self.skip_char();
            }
        }
        let word = self.text.get(start..self.at).unwrap_or("");
        if word.is_empty() {
            return Err(self.wrong("a unit symbol is missing here"));
        }
        symbol::find(word).ok_or_else(|| unknown(word, start))
    }

    /// `2`, `-3`, `^3`, `⁻³`; 1 when nothing is written.
    fn exponent(&mut self) -> Result<i32, Problem> {
        let start = self.at;
        let raised = self.peek().and_then(lower).is_some();
        let marked = self.peek() == Some('^');
        if marked {
            self.at += 1;
        }
        let mut digits = String::new();
        while let Some(next) = self.peek().and_then(|next| exponent_char(next, raised, digits.is_empty())) {
            digits.push(next);
            self.skip_char();
        }
        if digits.is_empty() && !marked {
            return Ok(1);
        }
        let exponent = digits.parse().ok().filter(|value: &i32| *value != 0 && value.abs() <= MOST_EXPONENT);
        exponent.ok_or_else(|| {
            let message = format!("an exponent of the unit \"{}\" is no whole number from -12 to 12", self.text.trim());
            unreadable(&message, start, self.at)
        })
    }

    fn peek(&self) -> Option<char> {
        self.text.get(self.at..)?.chars().next()
    }

    fn skip_char(&mut self) {
        self.at += self.peek().map_or(0, char::len_utf8);
    }

    fn skip_spaces(&mut self) -> bool {
        let start = self.at;
        while self.peek().is_some_and(char::is_whitespace) {
            self.skip_char();
        }
        self.at > start
    }

    fn wrong(&self, what: &str) -> Problem {
        let end = self.at + self.peek().map_or(0, char::len_utf8);
        unreadable(&format!("the unit \"{}\" is unreadable: {what}", self.text.trim()), self.at, end)
    }
}

const BRACKETS: &str = "write one solidus and brackets, as in kg/(m s2), or negative exponents, as in kg m-1 s-2";

fn is_symbol_char(next: char) -> bool {
    !next.is_whitespace()
        && !next.is_ascii_digit()
        && lower(next).is_none()
        && !matches!(next, '/' | '(' | ')' | '·' | '⋅' | '*' | '^' | '-' | '+' | '\u{2212}')
}

/// The ordinary character of an exponent, if `next` continues one.
fn exponent_char(next: char, raised: bool, first: bool) -> Option<char> {
    let plain = if raised { lower(next)? } else { next };
    match plain {
        '0'..='9' => Some(plain),
        '-' | '+' if first => Some(plain),
        '\u{2212}' if first => Some('-'),
        _ => None,
    }
}

fn unreadable(message: &str, start: usize, end: usize) -> Problem {
    Problem::new(Code::NotationUnreadable, message).range(start, end)
}

fn unknown(word: &str, start: usize) -> Problem {
    let problem = Problem::new(Code::UnitUnknown, format!("\"{word}\" is no known unit symbol"));
    let problem = problem.range(start, start + word.len());
    match symbol::suggestion(word) {
        Some(meant) => problem.hint(format!("write {meant} if that is meant")),
        None => problem.hint("expected SI symbols such as mg, hPa, K, m/s2, joined by spaces, · and one /"),
    }
}

#[cfg(test)]
mod tests {
    use super::super::{Decimal, Dimension};
    use super::*;

    fn unit(text: &str) -> Unit {
        Unit::parse(text).unwrap_or_else(|problem| panic!("{text}: {}", problem.message))
    }

    fn si(number: &str, text: &str) -> f64 {
        unit(text).to_si(&Decimal::parse(number).unwrap())
    }

    #[test]
    fn all_ways_to_write_a_density() {
        for text in
            ["kg/m3", "kg m-3", "kg·m⁻³", "kg/m^3", "kg m^-3", "kg*m-3", "kg\u{a0}m⁻³", " kg / m³ ", "kg m\u{2212}3"]
        {
            assert_eq!(unit(text).dimension(), Dimension::DENSITY, "{text}");
            assert_eq!(unit(text).text(), "kg m⁻³", "{text}");
        }
        assert_eq!(unit("kg/(m·s²)").dimension(), Dimension::PRESSURE);
        assert_eq!(unit("/K").text(), "K⁻¹");
        assert_eq!(unit("1/K"), unit("/K"));
        assert_eq!(unit("nm s-2 hPa-1").text(), "nm s⁻² hPa⁻¹");
        assert_eq!(unit("1"), Unit::one());
        assert_eq!(unit("1").text(), "");
        assert_eq!(unit("µg"), unit("\u{3bc}g"));
        assert_eq!(unit("Ω"), unit("ohm"));
        assert_eq!(unit("kohm").text(), "kΩ");
    }

    #[test]
    fn factors_are_exact() {
        assert_eq!(si("1", "dm3"), 1e-3);
        assert_eq!(si("1", "cm3"), 1e-6);
        assert_eq!(si("1", "mL"), 1e-6);
        assert_eq!(si("1", "g/cm3"), 1000.0);
        assert_eq!(si("8000", "kg/m3"), 8000.0);
        assert_eq!(si("1013.25", "hPa"), 101_325.0);
        assert_eq!(si("1013.25", "mbar"), 101_325.0);
        assert_eq!(si("1", "µGal"), 1e-8);
        assert_eq!(si("1", "a"), 31_557_600.0);
        assert_eq!(si("90", "min"), 5400.0);
        assert_eq!(si("3.6", "km/h"), 1.0);
        assert_eq!(si("1", "µmol/mol"), 1e-6);
        assert_eq!(si("45.3", "%"), 0.453);
        assert_eq!(si("1", "Da"), 1.66053906892e-27);
        assert_eq!(si("1", "ppm"), 1e-6);
        assert_eq!(si("20.134", "°C"), 293.284);
        assert_eq!(si("180", "°"), std::f64::consts::PI);
        assert_eq!(si("1", "°"), 0.017453292519943295);
        assert_eq!(si("10800", "′"), std::f64::consts::PI);
        assert_eq!(si("1", "rad/°"), 180.0 / std::f64::consts::PI);
        assert_eq!(unit("°").from_si(std::f64::consts::PI), 180.0);
        assert_eq!(unit("°C").from_si(293.284), 20.134);
        assert_eq!(unit("°C").difference_to_si(0.5), 0.5);
        assert_eq!(unit("mg").from_si(1.23e-7), 0.123);
        assert_eq!(unit("h").from_si(5400.0), 1.5);
    }

    #[test]
    fn bad_units_say_why() {
        let code = |text: &str| Unit::parse(text).map(|unit| unit.text()).unwrap_err().code;
        for bad in ["ug", "Kg", "hpa", "m°C", "ha", "xyz", "kPA", "%RH", "µ", "ppb", "k1"] {
            assert_eq!(code(bad), Code::UnitUnknown, "{bad}");
        }
        for bad in [
            "",
            " ",
            "/",
            "kg/",
            "kg/m/s2",
            "J/kg K",
            "kg//m",
            "kg/(m s2",
            "m^",
            "m0",
            "m13",
            "m2kg",
            "m·",
            "/°C",
            "°C/h",
            "°C2",
            "kg)",
            "·m",
            "2 m",
            "m 2",
            "m-",
            "12",
            "1²",
            "10/K",
            "Da12 Da12",
            "m⁻",
        ] {
            assert_eq!(code(bad), Code::NotationUnreadable, "{bad}");
        }
        let problem = Unit::parse("kg/ug").unwrap_err();
        assert_eq!(problem.range, Some((3, 5)));
        assert!(problem.hints.iter().any(|hint| hint.contains("µg")));
    }

    proptest::proptest! {
        #![proptest_config(proptest::prelude::ProptestConfig::with_cases(10_000))]
        #[test]
        fn garbage_never_panics_and_text_reads_back(text in "[kgmsKPah°CµΩ/()·^⁻²³0-9 \\-]{0,12}") {
            if let Ok(unit) = Unit::parse(&text) {
                let again = Unit::parse(&unit.text_or_one());
                proptest::prop_assert_eq!(again.ok(), Some(unit));
            }
        }

        #[test]
        fn a_trip_to_si_and_back_keeps_fourteen_digits(value in -1e6..1e6f64, index in 0..8usize) {
            let unit = unit(["mg", "°", "h", "hPa", "dm3", "Da", "km/h", "µmol/mol"][index]);
            let back = unit.from_si(unit.to_si_f64(value));
            proptest::prop_assert!((back - value).abs() <= value.abs() * 4e-16, "{} {}", back, value);
        }
    }
}
