//! Text typed by an author, dressed for print: true minus signs, spaces that do not break.

use crate::quantity::Style;

/// A typed value in print: a hyphen before a digit becomes a minus sign, spaces do not break, `e-9` becomes a power of
/// ten.
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
            'e' | 'E' if dressed.ends_with(|before: char| before.is_ascii_digit() || before == ')') => {
                let mut exponent = String::new();
                while let Some(digit) = letters.next_if(|next| next.is_ascii_digit() || matches!(next, '-' | '+')) {
                    exponent.push(digit);
                }
                match exponent.parse() {
                    Ok(power) => dressed.push_str(&format!("\u{a0}×\u{a0}10{}", crate::quantity::raised(power))),
                    Err(_) => dressed.push_str(&format!("{letter}{exponent}")),
                }
            }
            letter => dressed.push(letter),
        }
    }
    dressed
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn typed_values_are_dressed() {
        assert_eq!(dress("-7.1(20.2) µg", Style::POINT), "\u{2212}7.1(20.2)\u{a0}µg");
        assert_eq!(dress("2.353(400)e-10", Style::COMMA), "2,353(400)\u{a0}×\u{a0}10⁻¹⁰");
        assert_eq!(dress("1 kg + 0.1(1) mg", Style::POINT), "1\u{a0}kg\u{a0}+\u{a0}0.1(1)\u{a0}mg");
        assert_eq!(dress("2e", Style::POINT), "2e");
    }
}
