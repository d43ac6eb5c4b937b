//! Equations as an author writes them: ordinary arithmetic, read into a tree whose every part knows its place.
//!
//! Grammar, from the weakest binding to the strongest:
//!
//!     sum     = product (("+" | "-" | "−") product)*
//!     product = sign (("*" | "·" | "×" | "/") sign)*
//!     sign    = ("-" | "−")* power                    so −x^2 is −(x^2)
//!     power   = atom ("^" exponent | "²" | "³")?      exponent: a whole number or ±0.5, also in brackets
//!     atom    = number | name | function "(" sum ")" | "(" sum ")"
//!
//! Products bind from left to right: a / b * c is (a / b) · c.

use crate::diagnostic::{Code, Problem};
use std::ops::Range;

/// Functions an equation may call.
pub const FUNCTIONS: &[&str] = &["acos", "asin", "atan", "cos", "exp", "ln", "log10", "sin", "sqrt", "tan"];

/// A part of an equation with the bytes it stands on.
#[derive(Debug, Clone, PartialEq)]
pub struct Part {
    pub range: Range<usize>,
    pub term: Term,
}

/// What a part is.
#[derive(Debug, Clone, PartialEq)]
pub enum Term {
    Number(f64),
    Name(String),
    Negative(Box<Part>),
    Sum(Box<Part>, Box<Part>),
    Difference(Box<Part>, Box<Part>),
    Product(Box<Part>, Box<Part>),
    Ratio(Box<Part>, Box<Part>),
    /// A power with twice its exponent, so that roots are whole.
    Power(Box<Part>, i32),
    Call(&'static str, Box<Part>),
}

/// How deep brackets may nest, and how long an equation may be.
const DEEPEST: usize = 64;
const LONGEST: usize = 4000;

/// Reads an equation.
///
/// # Errors
/// `notation_unreadable` with the bytes at fault.
pub fn parse_equation(text: &str) -> Result<Part, Problem> {
    if text.len() > LONGEST {
        return Err(unreadable(
            format!("The equation has {} bytes; at most {LONGEST} are read.", text.len()),
            0..LONGEST,
        ));
    }
    let mut reader = Reader { text, at: 0, depth: 0 };
    let part = reader.sum()?;
    reader.skip_spaces();
    match reader.peek() {
        None => Ok(part),
        Some(found) => Err(unreadable(
            format!("An operator is expected in the equation, but “{found}” stands there."),
            reader.at..reader.at + found.len_utf8(),
        )
        .hint("Write products with `*`: `2*x`, not `2x`.")),
    }
}

/// Every name an equation uses, in order of first use.
pub fn names(part: &Part) -> Vec<(String, Range<usize>)> {
    let mut found: Vec<(String, Range<usize>)> = Vec::new();
    collect(part, &mut found);
    found
}

fn collect(part: &Part, found: &mut Vec<(String, Range<usize>)>) {
    match &part.term {
        Term::Number(_) => {}
        Term::Name(name) => {
            if !found.iter().any(|(known, _)| known == name) {
                found.push((name.clone(), part.range.clone()));
            }
        }
        Term::Negative(a) | Term::Power(a, _) | Term::Call(_, a) => collect(a, found),
        Term::Sum(a, b) | Term::Difference(a, b) | Term::Product(a, b) | Term::Ratio(a, b) => {
            collect(a, found);
            collect(b, found);
        }
    }
}

fn unreadable(message: String, range: Range<usize>) -> Problem {
    Problem::new(Code::NotationUnreadable, message).range(range.start, range.end)
}

struct Reader<'t> {
    text: &'t str,
    at: usize,
    depth: usize,
}

impl Reader<'_> {
    fn peek(&self) -> Option<char> {
        self.text[self.at..].chars().next()
    }

    fn skip_spaces(&mut self) {
        while let Some(space) = self.peek().filter(|c| c.is_whitespace()) {
            self.at += space.len_utf8();
        }
    }

    /// Takes the next sign if it is one of these.
    fn take(&mut self, wanted: &[char]) -> Option<char> {
        self.skip_spaces();
        let found = self.peek().filter(|c| wanted.contains(c))?;
        self.at += found.len_utf8();
        Some(found)
    }

    fn sum(&mut self) -> Result<Part, Problem> {
        self.depth += 1;
        if self.depth > DEEPEST {
            return Err(unreadable(format!("Brackets nest deeper than {DEEPEST}."), self.at..self.at));
        }
        let mut left = self.product()?;
        while let Some(sign) = self.take(&['+', '-', '−']) {
            let right = self.product()?;
            let make = if sign == '+' { Term::Sum } else { Term::Difference };
            left = join(left, right, make);
        }
        self.depth -= 1;
        Ok(left)
    }

    fn product(&mut self) -> Result<Part, Problem> {
        let mut left = self.sign()?;
        while let Some(sign) = self.take(&['*', '·', '×', '/']) {
            let right = self.sign()?;
            let make = if sign == '/' { Term::Ratio } else { Term::Product };
            left = join(left, right, make);
        }
        Ok(left)
    }

    fn sign(&mut self) -> Result<Part, Problem> {
        self.skip_spaces();
        let start = self.at;
        let mut negative = false;
        while self.take(&['-', '−']).is_some() {
            negative = !negative;
        }
        let part = self.power()?;
        Ok(match negative {
            true => Part { range: start..part.range.end, term: Term::Negative(Box::new(part)) },
            false => part,
        })
    }

    fn power(&mut self) -> Result<Part, Problem> {
        let base = self.atom()?;
        if let Some(raised) = self.take(&['²', '³']) {
            let range = base.range.start..self.at;
            return Ok(Part { range, term: Term::Power(Box::new(base), if raised == '²' { 4 } else { 6 }) });
        }
        if self.take(&['^']).is_none() {
            return Ok(base);
        }
        self.skip_spaces();
        let start = self.at;
        let bracket = self.take(&['(']).is_some();
        let negative = self.take(&['-', '−']).is_some();
        let exponent = self.number();
        if bracket && self.take(&[')']).is_none() {
            return Err(unreadable("The bracket around the exponent is not closed.".into(), start..self.at));
        }
        let twice = exponent.map(|exponent| 2.0 * exponent * if negative { -1.0 } else { 1.0 });
        match twice.filter(|twice| twice.fract() == 0.0 && twice.abs() <= 40.0) {
            Some(twice) => {
                Ok(Part { range: base.range.start..self.at, term: Term::Power(Box::new(base), twice as i32) })
            }
            None => Err(unreadable(
                "An exponent is a whole or half number such as 2 or 0.5.".into(),
                start..self.at.max(start + 1).min(self.text.len()),
            )
            .hint("Write other powers with exp and ln: exp(0.3*ln(x)).")),
        }
    }

    fn atom(&mut self) -> Result<Part, Problem> {
        self.skip_spaces();
        let start = self.at;
        if self.take(&['(']).is_some() {
            let inner = self.sum()?;
            self.close(start)?;
            return Ok(Part { range: start..self.at, term: inner.term });
        }
        if let Some(number) = self.number() {
            return Ok(Part { range: start..self.at, term: Term::Number(number) });
        }
        let name = self.name();
        if name.is_empty() {
            let end = self.peek().map_or(start, |c| start + c.len_utf8());
            let found = self.peek().map_or("the end".into(), |c| format!("“{c}”"));
            return Err(unreadable(
                format!("A number, a name or a bracket is expected in the equation, but {found} stands there."),
                start..end,
            ));
        }
        self.skip_spaces();
        if self.peek() == Some('(') {
            let Some(function) = FUNCTIONS.iter().find(|function| **function == name) else {
                let problem = unreadable(format!("{name} is no function."), start..start + name.len());
                return Err(match crate::diagnostic::nearest(&name, FUNCTIONS.iter().copied()) {
                    Some(near) => problem.hint(format!("Did you mean {near}?")),
                    None => problem
                        .hint(format!("The functions are {}; a product is written with `*`.", FUNCTIONS.join(", "))),
                });
            };
            self.take(&['(']);
            let argument = self.sum()?;
            self.close(start)?;
            return Ok(Part { range: start..self.at, term: Term::Call(function, Box::new(argument)) });
        }
        Ok(Part { range: start..start + name.len(), term: Term::Name(name) })
    }

    fn close(&mut self, opened: usize) -> Result<(), Problem> {
        match self.take(&[')']) {
            Some(_) => Ok(()),
            None => Err(unreadable("A bracket is not closed.".into(), opened..opened + 1)),
        }
    }

    fn name(&mut self) -> String {
        let rest = &self.text[self.at..];
        let length = rest
            .char_indices()
            .find(|(index, c)| !(c.is_alphabetic() || (*index > 0 && (c.is_numeric() || *c == '_'))))
            .map_or(rest.len(), |(index, _)| index);
        // Raised figures are exponents, not letters of a name.
        let name = rest[..length].trim_end_matches(['²', '³']).to_string();
        self.at += name.len();
        name
    }

    /// A number with point and exponent; a sign of its own only in the exponent.
    fn number(&mut self) -> Option<f64> {
        self.skip_spaces();
        let bytes = self.text.as_bytes();
        let digits = |mut at: usize| {
            while bytes.get(at).is_some_and(u8::is_ascii_digit) {
                at += 1;
            }
            at
        };
        let mut end = digits(self.at);
        if end == self.at {
            return None;
        }
        if bytes.get(end) == Some(&b'.') && bytes.get(end + 1).is_some_and(u8::is_ascii_digit) {
            end = digits(end + 1);
        }
        if matches!(bytes.get(end), Some(b'e' | b'E')) {
            let sign = usize::from(matches!(bytes.get(end + 1), Some(b'+' | b'-')));
            if bytes.get(end + 1 + sign).is_some_and(u8::is_ascii_digit) {
                end = digits(end + 1 + sign);
            }
        }
        let number = self.text[self.at..end].parse().ok()?;
        self.at = end;
        Some(number)
    }
}

fn join(left: Part, right: Part, make: fn(Box<Part>, Box<Part>) -> Term) -> Part {
    Part { range: left.range.start..right.range.end, term: make(Box::new(left), Box::new(right)) }
}

#[cfg(test)]
mod tests {
    use super::*;
    use proptest::prelude::*;

    fn value(part: &Part) -> f64 {
        match &part.term {
            Term::Number(number) => *number,
            Term::Name(_) => 3.0,
            Term::Negative(a) => -value(a),
            Term::Sum(a, b) => value(a) + value(b),
            Term::Difference(a, b) => value(a) - value(b),
            Term::Product(a, b) => value(a) * value(b),
            Term::Ratio(a, b) => value(a) / value(b),
            Term::Power(a, twice) => crate::numeric::elementary::pow(value(a), f64::from(*twice) / 2.0),
            Term::Call(_, a) => value(a),
        }
    }

    #[test]
    fn operators_bind_as_in_ordinary_arithmetic() {
        for (text, expected) in [
            ("1 + 2*3", 7.0),
            ("-x^2", -9.0),
            ("(-x)^2", 9.0),
            ("8/2*3", 12.0),
            ("2 - 3 - 4", -5.0),
            ("2·x − 1e-1", 5.9),
            ("4^0.5 + x²", 11.0),
            ("2^(-1)", 0.5),
            ("2*-x", -6.0),
            ("((x))", 3.0),
        ] {
            let found = value(&parse_equation(text).expect(text));
            assert!((found - expected).abs() < 1e-12, "{text}: {found}");
        }
    }

    #[test]
    fn faults_point_at_their_place() {
        for (text, range) in
            [("2x", (1, 2)), ("a + ", (4, 4)), ("(a", (0, 1)), ("sine(a)", (0, 4)), ("a^b", (2, 3)), ("a $ b", (2, 3))]
        {
            let problem = parse_equation(text).expect_err(text);
            assert_eq!(
                (problem.code, problem.range),
                (Code::NotationUnreadable, Some(range)),
                "{text}: {}",
                problem.message
            );
        }
        assert!(parse_equation(&"(".repeat(1000)).is_err());
        assert!(parse_equation(&"1+".repeat(3000)).is_err());
    }

    #[test]
    fn names_are_listed_once() {
        let part = parse_equation("ρ_a * (m_1 - m_2)/ρ_a").expect("reads");
        let found: Vec<String> = names(&part).into_iter().map(|(name, _)| name).collect();
        assert_eq!(found, ["ρ_a", "m_1", "m_2"]);
    }

    proptest! {
        #[test]
        fn garbage_is_refused_or_read_but_never_panics(text in "[-+*/^()0-9a-zπρ.e²³ ·×−µ]{0,60}") {
            let _ = parse_equation(&text);
        }
    }
}
