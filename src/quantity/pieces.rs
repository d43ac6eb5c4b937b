//! The pieces of a stated value, in the order in which they stand, before anybody asks whether they fit together.

use super::cursor::{Cursor, Numeral};
use super::decimal::Decimal;
use super::stated::Shape;
use super::unit::Unit;
use crate::diagnostic::{Code, Problem};

/// A number and its unit, or `(number ± number)` and their unit.
#[derive(Debug, Clone)]
pub(super) struct Operand {
    pub value: Decimal,
    /// Standard uncertainty from parentheses.
    pub uncertainty: Option<Decimal>,
    /// What stands behind ± within the same brackets.
    pub spread: Option<Decimal>,
    pub unit: Unit,
    pub has_unit: bool,
    /// Bytes of the number, and of the unit.
    pub number_range: (usize, usize),
    pub unit_range: (usize, usize),
}

/// What stands behind the last unit.
#[derive(Debug, Clone, Default)]
pub(super) struct Trailer {
    pub coverage_factor: Option<f64>,
    pub degrees_of_freedom: Option<f64>,
    pub shape: Option<Shape>,
    pub range: (usize, usize),
}

/// A whole stated value.
#[derive(Debug, Clone)]
pub(super) struct Pieces {
    /// Missing where the text begins with ±.
    pub first: Option<Operand>,
    /// With its sign.
    pub deviation: Option<Operand>,
    pub upper_limit: Option<Operand>,
    pub spread: Option<Operand>,
    pub trailer: Trailer,
}

impl Pieces {
    pub fn read(text: &str) -> Result<Pieces, Problem> {
        let mut cursor = Cursor::new(text);
        cursor.skip_spaces();
        let first = if cursor.peek() == Some('±') { None } else { Some(operand(&mut cursor)?) };
        refuse_typewriter_sign(&cursor)?;
        let deviation = first.as_ref().and_then(|_| deviation(&mut cursor).transpose()).transpose()?;
        let upper_limit = if take_word(&mut cursor, "to") { Some(operand(&mut cursor)?) } else { None };
        refuse_typewriter_sign(&cursor)?;
        let spread = if cursor.take('±') { Some(spread(&mut cursor)?) } else { None };
        let trailer = trailer(&mut cursor)?;
        Ok(Pieces { first, deviation, upper_limit, spread, trailer })
    }
}

/// `+/-` and `+-` are typewriter forms of ±.
fn refuse_typewriter_sign(cursor: &Cursor) -> Result<(), Problem> {
    let Some(form) = ["+/-", "+-", "-/+"].into_iter().find(|form| cursor.rest().starts_with(form)) else {
        return Ok(());
    };
    let problem = Problem::new(Code::NotationUnreadable, format!("\"{form}\" stands where ± is expected"));
    Err(problem.hint("write ±").range(cursor.at, cursor.at + form.len()))
}

fn operand(cursor: &mut Cursor) -> Result<Operand, Problem> {
    cursor.skip_spaces();
    let start = cursor.at;
    let (value, uncertainty, spread) = match cursor.take('(') {
        true => bracketed(cursor, start)?,
        false => {
            let Numeral { value, uncertainty } = cursor.numeral()?;
            (value, uncertainty, None)
        }
    };
    let number_range = (start, cursor.at);
    let (unit, unit_range) = unit(cursor)?;
    let has_unit = unit.is_some();
    let unit = unit.unwrap_or_else(Unit::one);
    Ok(Operand { value, uncertainty, spread, unit, has_unit, number_range, unit_range })
}

/// `1.234 56 ± 0.000 24)` with a power of ten behind it, the opening bracket being read.
fn bracketed(cursor: &mut Cursor, start: usize) -> Result<(Decimal, Option<Decimal>, Option<Decimal>), Problem> {
    cursor.skip_spaces();
    let value = cursor.numeral()?;
    cursor.skip_spaces();
    if !cursor.take('±') {
        return Err(cursor.unreadable("± is expected within the brackets, as in (1.234 ± 0.012) mg".into(), start));
    }
    cursor.skip_spaces();
    let spread = cursor.numeral()?;
    cursor.skip_spaces();
    if !cursor.take(')') {
        return Err(
            cursor.unreadable("the bracket before ± is not closed behind the number that follows".into(), start)
        );
    }
    if value.uncertainty.or(spread.uncertainty).is_some() {
        return Err(cursor.unreadable("an uncertainty stands in parentheses and another behind ±".into(), start));
    }
    let power = cursor.power_of_ten()?;
    Ok((value.value.shifted(power), None, Some(spread.value.shifted(power))))
}

/// `+ 0.123(12) mg` behind a nominal value.
fn deviation(cursor: &mut Cursor) -> Result<Option<Operand>, Problem> {
    let Some(sign) = cursor.peek().filter(|next| matches!(next, '+' | '-' | '\u{2212}')) else { return Ok(None) };
    let start = cursor.at;
    cursor.skip_char();
    cursor.skip_spaces();
    if matches!(cursor.peek(), Some('+' | '-' | '\u{2212}')) {
        return Err(cursor.unreadable("two signs stand before the deviation".into(), start).hint("write one"));
    }
    let mut deviation = operand(cursor)?;
    if sign != '+' {
        deviation.value = deviation.value.negated();
    }
    Ok(Some(deviation))
}

/// `0.026 mg` behind ±.
fn spread(cursor: &mut Cursor) -> Result<Operand, Problem> {
    let start = cursor.at;
    let spread = operand(cursor)?;
    if spread.uncertainty.or(spread.spread).is_some() {
        return Err(cursor.unreadable("the uncertainty behind ± carries an uncertainty of its own".into(), start));
    }
    Ok(spread)
}

/// The unit at this place; `None` where none is written.
fn unit(cursor: &mut Cursor) -> Result<(Option<Unit>, (usize, usize)), Problem> {
    cursor.skip_spaces();
    let start = cursor.at;
    let length = unit_length(cursor.rest());
    let text = cursor.rest().get(..length).unwrap_or("").trim_end();
    let range = (start, start + text.len());
    cursor.at = range.1;
    cursor.skip_spaces();
    if text.is_empty() {
        return Ok((None, range));
    }
    let unit = Unit::parse(text).map_err(|mut problem| {
        let (from, to) = problem.range.unwrap_or((0, text.len()));
        problem.range = Some((start + from, start + to));
        problem
    })?;
    Ok((Some(unit), range))
}

/// How far a unit reaches: up to ±, a bracket that belongs to no solidus, a sign behind a space, or a word of the notation.
fn unit_length(text: &str) -> usize {
    let mut last = ' ';
    let mut last_mark = ' ';
    let mut brackets = 0usize;
    for (index, next) in text.char_indices() {
        let begins_word = last.is_whitespace();
        let ends = match next {
            '±' | '=' => true,
            '(' => !matches!(last_mark, '/' | '·' | '*'),
            '+' | '-' | '\u{2212}' => begins_word && brackets == 0,
            _ => begins_word && text.get(index..).is_some_and(starts_with_own_word),
        };
        if ends {
            return index;
        }
        brackets = if next == '(' { brackets + 1 } else { brackets.saturating_sub(usize::from(next == ')')) };
        last = next;
        last_mark = if next.is_whitespace() { last_mark } else { next };
    }
    text.len()
}

/// Whether the text goes on with a word of the notation rather than a unit.
fn starts_with_own_word(text: &str) -> bool {
    let word = first_word(text);
    let named = |name: &&str| word == *name;
    word == "to" || Shape::from_word(word).is_some() || OTHER_SHAPES.iter().any(named) || NAMES.iter().any(named)
}

/// Names of distributions that need another notation here.
const OTHER_SHAPES: &[&str] = &["uniform", "normal", "gaussian", "arcsin", "sine", "U-shaped", "triangle", "rectangle"];
/// What may be set equal to something behind a value.
const NAMES: &[&str] = &["k", "ν", "nu", "U", "u"];

fn first_word(text: &str) -> &str {
    text.split(|next: char| next.is_whitespace() || matches!(next, '(' | ')' | '=' | ',' | ';')).next().unwrap_or("")
}

fn take_word(cursor: &mut Cursor, word: &str) -> bool {
    cursor.skip_spaces();
    let found = first_word(cursor.rest()) == word;
    if found {
        cursor.at += word.len();
        cursor.skip_spaces();
    }
    found
}

/// `(k = 2.13, ν = 20)` or `rectangular`, to the end of the text.
fn trailer(cursor: &mut Cursor) -> Result<Trailer, Problem> {
    cursor.skip_spaces();
    let start = cursor.at;
    let mut trailer = Trailer::default();
    while !cursor.at_end() {
        match cursor.take('(') {
            true => settings(cursor, &mut trailer)?,
            false => distribution(cursor, &mut trailer)?,
        }
        cursor.skip_spaces();
    }
    trailer.range = (start, cursor.text.trim_end().len().max(start));
    Ok(trailer)
}

fn distribution(cursor: &mut Cursor, trailer: &mut Trailer) -> Result<(), Problem> {
    let start = cursor.at;
    let word = first_word(cursor.rest());
    let shape = Shape::from_word(word);
    if let Some(shape) = shape.filter(|_| trailer.shape.is_none()) {
        cursor.at += word.len();
        trailer.shape = Some(shape);
        return Ok(());
    }
    cursor.at = cursor.text.trim_end().len();
    let problem = cursor.unreadable(format!("\"{}\" is not expected behind a value", cursor.since(start)), start);
    Err(match word {
        "uniform" | "rectangle" => problem.hint("write rectangular"),
        "triangle" => problem.hint("write triangular"),
        "arcsin" | "sine" | "U-shaped" => problem.hint("write arcsine"),
        "normal" | "gaussian" => problem.hint("state the coverage factor instead, as in (k = 2)"),
        _ if NAMES.contains(&word) => problem.hint("write brackets, as in (k = 2, ν = 20)"),
        _ => problem.hint("expected (k = 2), or one of rectangular, triangular, arcsine"),
    })
}

/// `k = 2.13, ν = 20)`, the opening bracket being read.
fn settings(cursor: &mut Cursor, trailer: &mut Trailer) -> Result<(), Problem> {
    loop {
        cursor.skip_spaces();
        setting(cursor, trailer)?;
        cursor.skip_spaces();
        if cursor.take(')') {
            return Ok(());
        }
        if !cursor.take(',') && !cursor.take(';') {
            let start = cursor.at;
            cursor.at = cursor.text.trim_end().len();
            return Err(cursor
                .unreadable("a bracket behind the value is not closed; expected as in (k = 2, ν = 20)".into(), start));
        }
    }
}

fn setting(cursor: &mut Cursor, trailer: &mut Trailer) -> Result<(), Problem> {
    let start = cursor.at;
    let name = first_word(cursor.rest());
    cursor.at += name.len();
    cursor.skip_spaces();
    let slot = match name {
        "k" => &mut trailer.coverage_factor,
        "ν" | "nu" => &mut trailer.degrees_of_freedom,
        _ => {
            let problem = cursor.unreadable(format!("\"{name}\" is not expected in brackets behind a value"), start);
            return Err(problem.hint("expected the coverage factor and degrees of freedom, as in (k = 2.13, ν = 20)"));
        }
    };
    if slot.is_some() || !cursor.take('=') {
        return Err(cursor.unreadable(format!("{name} is not set to one value; expected as in ({name} = 2)"), start));
    }
    cursor.skip_spaces();
    if name != "k" && cursor.take('∞') {
        *slot = Some(f64::INFINITY);
        return Ok(());
    }
    let number = cursor.numeral()?;
    if number.value.negative || number.value.is_zero() || number.uncertainty.is_some() {
        return Err(
            cursor.unreadable(format!("{} is unreadable; expected a number above zero", cursor.since(start)), start)
        );
    }
    *slot = Some(number.value.to_f64());
    Ok(())
}
