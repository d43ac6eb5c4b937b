//! Text typed by an author, dressed for print: true minus signs, spaces that do not break.

use crate::quantity::Style;

/// A typed value in print: a hyphen before a digit becomes a minus sign, spaces do not break.
pub fn dress(typed: &str, style: Style) -> String {
    let mut dressed = String::with_capacity(typed.len());
    let mut letters = typed.chars().peekable();
    while let Some(letter) = letters.next() {
        match letter {
            '-' if letters.peek().is_some_and(|next| next.is_ascii_digit() || *next == ' ') => dressed.push('\u{2212}'),
            ' ' => dressed.push('\u{a0}'),
            '.' if style.marker == crate::quantity::Marker::Comma
                && letters.peek().is_some_and(char::is_ascii_digit) =>
            {
                dressed.push(',')
            }
            letter => dressed.push(letter),
        }
    }
    dressed
}
