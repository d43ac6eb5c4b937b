//! A place that moves through a text, and the numbers it reads there: sign, grouped digits, digits of uncertainty in
//! parentheses, powers of ten.

use super::decimal::{Decimal, MOST_DIGITS, MOST_EXPONENT};
use super::dimension::lower;
use super::number::{decimal_comma, has_decimal_comma, in_range};
use crate::diagnostic::{Code, Problem};

/// A number, and the standard uncertainty in parentheses behind it.
#[derive(Debug, Clone, Copy)]
pub(super) struct Numeral {
    pub value: Decimal,
    pub uncertainty: Option<Decimal>,
}

/// A place within a text that moves forward.
#[derive(Debug, Clone)]
pub(super) struct Cursor<'t> {
    pub text: &'t str,
    pub at: usize,
}

impl<'t> Cursor<'t> {
    pub fn new(text: &'t str) -> Self {
        Self { text, at: 0 }
    }

    pub fn rest(&self) -> &'t str {
        self.text.get(self.at..).unwrap_or("")
    }

    pub fn at_end(&self) -> bool {
        self.rest().is_empty()
    }

    pub fn peek(&self) -> Option<char> {
        self.rest().chars().next()
    }

    pub fn skip_char(&mut self) {
        self.at += self.peek().map_or(0, char::len_utf8);
    }

    pub fn take(&mut self, wanted: char) -> bool {
        let found = self.peek() == Some(wanted);
        if found {
            self.skip_char();
        }
        found
    }

    pub fn skip_spaces(&mut self) {
        self.at += self.rest().len() - self.rest().trim_start().len();
    }

    /// A number with what belongs to it: `1 234.567(12)e-6`, `1.5 × 10⁻⁸`.
    pub fn numeral(&mut self) -> Result<Numeral, Problem> {
        let start = self.at;
        let typed = self.typed_digits()?;
        let value = Decimal::parse(&typed).ok_or_else(|| {
            let message = format!("the number {} has more than {MOST_DIGITS} digits", self.since(start));
            self.unreadable(message, start)
        })?;
        let uncertainty = self.parentheses(&value)?;
        let power = self.power_of_ten()?;
        if uncertainty.is_none() && power != 0 && self.rest().starts_with('(') && self.parentheses(&value)?.is_some() {
            let message = format!("the power of ten in {} stands before the parentheses", self.since(start));
            return Err(self.unreadable(message, start).hint("write it behind them, as in 45(2)e-6"));
        }
        let numeral = Numeral { value: value.shifted(power), uncertainty: uncertainty.map(|u| u.shifted(power)) };
        if in_range(&numeral.value) && numeral.uncertainty.is_none_or(|u| in_range(&u)) {
            return Ok(numeral);
        }
        Err(self.unreadable(format!("the number {} is out of range", self.since(start)), start))
    }

    /// Sign and digits, without the spaces that group them.
    fn typed_digits(&mut self) -> Result<String, Problem> {
        let start = self.at;
        let mut typed = String::new();
        if let Some(sign) = self.peek().filter(|next| matches!(next, '-' | '+' | '\u{2212}')) {
            typed.push(if sign == '+' { '+' } else { '-' });
            self.skip_char();
        }
        if !self.next_is_digit() {
            return Err(self.no_number(start));
        }
        self.groups(start, Side::BeforeMarker, &mut typed)?;
        self.refuse_comma(start)?;
        if !self.take('.') {
            return Ok(typed);
        }
        typed.push('.');
        if !self.next_is_digit() {
            let message = format!("no digit follows the decimal point of {}", self.since(start));
            return Err(self.unreadable(message, start));
        }
        self.groups(start, Side::AfterMarker, &mut typed)?;
        self.refuse_comma(start)?;
        Ok(typed)
    }

    /// Digits, closed or in groups of three with one space between.
    fn groups(&mut self, start: usize, side: Side, typed: &mut String) -> Result<(), Problem> {
        let mut lengths = vec![self.digit_run(typed)];
        while let Some(space) = self.group_space() {
            self.at += space;
            lengths.push(self.digit_run(typed));
        }
        if side.grouped_in_threes(&lengths) {
            return Ok(());
        }
        let message = format!("the digits of {} are not grouped in threes", self.since(start));
        Err(self.unreadable(message, start).hint("write groups of three on both sides of the point, or no spaces"))
    }

    fn digit_run(&mut self, typed: &mut String) -> usize {
        let length = self.rest().bytes().take_while(u8::is_ascii_digit).count();
        typed.push_str(self.rest().get(..length).unwrap_or(""));
        self.at += length;
        length
    }

    /// Bytes of a single space with a digit behind it.
    fn group_space(&self) -> Option<usize> {
        let mut next = self.rest().chars();
        let space = next.next().filter(|space| [' ', '\u{a0}', '\u{202f}', '\u{2009}'].contains(space))?;
        next.next()?.is_ascii_digit().then(|| space.len_utf8())
    }

    /// `(12)` counts in the last digits of `value`, `(1.2)` in its unit.
    fn parentheses(&mut self, value: &Decimal) -> Result<Option<Decimal>, Problem> {
        let inner = self.rest().trim_start();
        let Some(inner) =
            inner.strip_prefix('(').filter(|inner| inner.trim_start().starts_with(|c: char| c.is_ascii_digit()))
        else {
            return Ok(None);
        };
        let start = self.text.len() - inner.len() - 1;
        let Some((typed, _)) = inner.split_once(')') else {
            self.at = self.text.len();
            return Err(self.unreadable("a parenthesis is not closed".into(), start));
        };
        self.at = start + typed.len() + 2;
        if has_decimal_comma(typed) {
            return Err(decimal_comma(typed.trim()).range(start, self.at));
        }
        let plain = typed.bytes().all(|byte| byte.is_ascii_digit() || byte == b'.' || byte == b' ');
        let Some(number) = Decimal::parse(typed.trim()).filter(|_| plain) else {
            let message = format!("({typed}) is no standard uncertainty; expected digits alone, as in 1.234(12)");
            return Err(self.unreadable(message, start));
        };
        let uncertainty = if typed.contains('.') { number } else { number.shifted(value.exponent) };
        if uncertainty.is_zero() {
            return Err(self.unreadable("an uncertainty of zero is stated".into(), start).hint("leave it out"));
        }
        Ok(Some(uncertainty))
    }

    /// `e-6`, `× 10⁻⁶` or `× 10^-6`; 0 when none is written.
    pub fn power_of_ten(&mut self) -> Result<i32, Problem> {
        let start = self.at;
        let exponent_follows = |rest: &str| {
            let (_, digits) = super::decimal::split_sign(rest);
            digits.starts_with(|next: char| next.is_ascii_digit())
        };
        if let Some(rest) = self.rest().strip_prefix(['e', 'E']).filter(|rest| exponent_follows(rest)) {
            self.at = self.text.len() - rest.len();
            return self.exponent(start, false);
        }
        let Some(rest) = self.rest().trim_start().strip_prefix('×') else { return Ok(0) };
        let Some(rest) = rest.trim_start().strip_prefix("10") else {
            self.at = self.text.len() - rest.len();
            return Err(self.unreadable("a power of ten is expected behind ×".into(), start));
        };
        self.at = self.text.len() - rest.len();
        let raised = !self.take('^');
        self.exponent(start, raised)
    }

    fn exponent(&mut self, start: usize, raised: bool) -> Result<i32, Problem> {
        let plain = |next: char| if raised { lower(next) } else { Some(if next == '\u{2212}' { '-' } else { next }) };
        let mut typed = String::new();
        while let Some(next) = self.peek().and_then(plain) {
            if !(next.is_ascii_digit() || typed.is_empty() && matches!(next, '-' | '+')) {
                break;
            }
            typed.push(next);
            self.skip_char();
        }
        let power = typed.parse().ok().filter(|power: &i32| power.abs() <= MOST_EXPONENT);
        power.ok_or_else(|| {
            let message = format!("the power of ten \"{}\" is unreadable or too large", self.since(start).trim());
            self.unreadable(message, start)
        })
    }

    fn refuse_comma(&self, start: usize) -> Result<(), Problem> {
        let mut next = self.rest().chars();
        if next.next() != Some(',') || !next.next().is_some_and(|digit| digit.is_ascii_digit()) {
            return Ok(());
        }
        let tail = self.rest().bytes().take_while(|byte| byte.is_ascii_digit() || *byte == b',').count();
        let number = self.text.get(start..self.at + tail).unwrap_or("");
        Err(decimal_comma(number).range(start, self.at + tail))
    }

    fn no_number(&self, start: usize) -> Problem {
        let word: String =
            self.text.get(start..).unwrap_or("").chars().take_while(|next| !next.is_whitespace()).take(40).collect();
        let end = start + word.len();
        let message = match word.as_str() {
            "" => "nothing stands where a number is expected".into(),
            _ => format!("\"{word}\" stands where a number is expected"),
        };
        let problem = Problem::new(Code::NotationUnreadable, message).range(start, end);
        match word.starts_with('.') {
            true => problem.hint("write a zero before the decimal point"),
            false => problem,
        }
    }

    pub fn next_is_digit(&self) -> bool {
        self.peek().is_some_and(|next| next.is_ascii_digit())
    }

    /// The text from `start` to here.
    pub fn since(&self, start: usize) -> &'t str {
        self.text.get(start..self.at).unwrap_or("")
    }

    /// An unreadable notation from `start` to here.
    pub fn unreadable(&self, message: String, start: usize) -> Problem {
        Problem::new(Code::NotationUnreadable, message).range(start, self.at.max(start))
    }
}

/// A side of the decimal marker.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
enum Side {
    BeforeMarker,
    AfterMarker,
}

impl Side {
    fn grouped_in_threes(self, lengths: &[usize]) -> bool {
        let (Some(&first), Some(&last)) = (lengths.first(), lengths.last()) else { return false };
        let inner = lengths.get(1..lengths.len().saturating_sub(1)).unwrap_or(&[]);
        let ends = match self {
            Side::BeforeMarker => first <= 3 && last == 3,
            Side::AfterMarker => first == 3 && last <= 3,
        };
        lengths.len() == 1 || ends && inner.iter().all(|&length| length == 3)
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn grouping_and_powers() {
        let read = |text: &str| {
            Cursor::new(text).numeral().map(|numeral| numeral.value.plain_text()).map_err(|problem| problem.code)
        };
        assert_eq!(read("1 234.567 89").as_deref(), Ok("1234.56789"));
        assert_eq!(read("1\u{202f}234\u{a0}567").as_deref(), Ok("1234567"));
        assert_eq!(read("0.0001").as_deref(), Ok("0.0001"));
        assert_eq!(read("1.5 × 10⁻⁸").as_deref(), Ok("0.000000015"));
        assert_eq!(read("1.5×10^-2").as_deref(), Ok("0.015"));
        assert_eq!(read("15e-1").as_deref(), Ok("1.5"));
        for bad in [
            "12 34",
            "1234 567",
            "1.23 4",
            "1.234 5678",
            "1. 5",
            "1.5 × 10",
            "1.5 × 20",
            "1e-5(2)",
            "--1",
            "1.5 × 10⁻⁹⁹⁹",
        ] {
            assert_eq!(read(bad), Err(Code::NotationUnreadable), "{bad}");
        }
    }
}
