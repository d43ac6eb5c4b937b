//! Text of a record as Typst source that can only ever be text.
//!
//! Whatever a record says is handed to the typesetter inside a string literal. Markup escaping would depend on
//! knowing every character that may begin something; a string literal has two characters to mind.

/// `text` as a Typst string literal, quotes included. It evaluates to the very same text.
pub fn typst_string(text: &str) -> String {
    let mut literal = String::with_capacity(text.len() + 2);
    literal.push('"');
    for character in text.chars() {
        push_escaped(&mut literal, character);
    }
    literal.push('"');
    literal
}

/// `text` as Typst markup: a string expression closed by a semicolon, so that nothing after it can join in.
///
/// A long unbroken word gets invisible places where a line may break; they add no character to the text.
pub fn typst_text(text: &str) -> String {
    if text.is_empty() {
        return String::new();
    }
    pieces(text).iter().map(|piece| format!("#{};", typst_string(piece))).collect::<Vec<_>>().join("#h(0pt);")
}

/// Characters that could disturb the literal, the line structure or the splicing of parts are written as code points.
fn push_escaped(literal: &mut String, character: char) {
    match character {
        '"' => literal.push_str("\\\""),
        '\\' => literal.push_str("\\\\"),
        '\n' => literal.push_str("\\n"),
        '\r' => literal.push_str("\\r"),
        '\t' => literal.push_str("\\t"),
        other if needs_code_point(other) => literal.push_str(&format!("\\u{{{:x}}}", other as u32)),
        other => literal.push(other),
    }
}

fn needs_code_point(character: char) -> bool {
    character.is_control()
        || matches!(character, '\u{2028}' | '\u{2029}' | '\u{feff}' | '\u{e000}'..='\u{f8ff}')
        || matches!(character, '\u{200e}' | '\u{200f}' | '\u{202a}'..='\u{202e}' | '\u{2066}'..='\u{2069}')
}

/// Words longer than this many characters get places to break.
const LONG_WORD: usize = 24;
/// The longest run without a place to break inside such a word.
const LONG_RUN: usize = 12;

/// The text cut where a long word may break: after a joining mark, else after some characters.
fn pieces(text: &str) -> Vec<&str> {
    let mut cuts = Vec::new();
    for word in text.split_inclusive(char::is_whitespace) {
        if word.chars().count() > LONG_WORD {
            let base = word.as_ptr() as usize - text.as_ptr() as usize;
            cuts.extend(word_cuts(word).into_iter().map(|cut| base + cut));
        }
    }
    let mut pieces = Vec::new();
    let mut start = 0;
    for cut in cuts.into_iter().chain([text.len()]) {
        if let Some(piece) = text.get(start..cut).filter(|piece| !piece.is_empty()) {
            pieces.push(piece);
            start = cut;
        }
    }
    pieces
}

fn word_cuts(word: &str) -> Vec<usize> {
    let mut cuts = Vec::new();
    let mut run = 0;
    for (index, character) in word.char_indices() {
        run += 1;
        let joins = matches!(character, '_' | '/' | '-' | '.' | ':' | '\\' | '=' | '&' | '?');
        // A combining mark stays with its letter, a digit with its neighbour of the same number.
        let next = index + character.len_utf8();
        let combining =
            word[next..].chars().next().is_none_or(|after| matches!(after, '\u{300}'..='\u{36f}' | '\u{200d}'));
        if (joins && run > 2 || run >= LONG_RUN) && !combining {
            cuts.push(next);
            run = 0;
        }
    }
    cuts
}

#[cfg(test)]
mod tests {
    use super::*;
    use proptest::prelude::*;

    #[test]
    fn quotes_and_backslashes_cannot_end_the_literal() {
        assert_eq!(typst_string(r#"a"b\c"#), r#""a\"b\\c""#);
        assert_eq!(typst_string("a\nb\u{7}"), "\"a\\nb\\u{7}\"");
        assert_eq!(typst_text(r#""; #read("x")"#), r##"#"\"; #read(\"x\")";"##);
    }

    #[test]
    fn a_long_word_gets_places_to_break() {
        let text = typst_text("see the_volume_of_the_secondary_standard_K17 now");
        assert!(text.contains("the_volume_\";#h(0pt);") || text.contains("#h(0pt);"), "{text}");
        assert_eq!(typst_text("short words stay whole"), "#\"short words stay whole\";");
    }

    proptest! {
        #![proptest_config(ProptestConfig::with_cases(4000))]
        #[test]
        fn a_literal_parses_back_to_the_same_text(text in "\\PC*|[\\\\\"#;{}u$\\n\\r\\t0-9a-f]{0,40}|(?s:.{0,30})") {
            let root = typst_syntax::parse_code(&typst_string(&text));
            prop_assert!(root.errors_and_warnings().0.is_empty());
            let literals: Vec<_> = root.children().filter(|node| node.kind() == typst_syntax::SyntaxKind::Str).collect();
            prop_assert_eq!(literals.len(), 1);
            prop_assert_eq!(root.children().count(), 1);
            let string: typst_syntax::ast::Str = literals[0].cast().expect("a string");
            prop_assert_eq!(string.get().to_string(), text);
        }

        #[test]
        fn text_stays_text_in_markup(text in "\\PC*|[\\\\\"#;{}()u$\\n*_=/ -]{0,60}|(?s:.{0,30})") {
            let root = typst_syntax::parse(&typst_text(&text));
            prop_assert!(root.errors_and_warnings().0.is_empty());
            let mut back = String::new();
            for node in root.children() {
                match node.kind() {
                    typst_syntax::SyntaxKind::Str => back.push_str(&node.cast::<typst_syntax::ast::Str>().expect("text").get()),
                    typst_syntax::SyntaxKind::Hash | typst_syntax::SyntaxKind::Semicolon => {}
                    typst_syntax::SyntaxKind::FuncCall => prop_assert_eq!(node.full_text().to_string(), "h(0pt)"),
                    other => prop_assert!(false, "{:?}", other),
                }
            }
            prop_assert_eq!(back, text);
        }
    }
}
