//! Expressions in double braces, taken out of the prose before it is read as Markdown.
//!
//! Markdown would take an expression apart: quotation marks, underscores and stars mean something to it. So each
//! `{{ … }}` gives way to a placeholder of the same length in bytes, one letter to Markdown, and offsets hold.

use super::markdown_options;
use crate::diagnostic::{Code, Problem};
use pulldown_cmark::{Event, Parser, Tag};
use std::ops::Range;

/// An expression `{{ … }}` of the prose.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Expression {
    /// Between the braces, without the blanks at either end.
    pub text: String,
    /// With the braces, in bytes of the text given.
    pub range: Range<usize>,
    /// The bytes of `text` itself, in bytes of the text given.
    pub inner: Range<usize>,
}

/// A piece of text that may hold placeholders.
#[derive(Debug, Clone, PartialEq, Eq)]
pub enum Piece<'a> {
    Text(&'a str),
    /// The index among the expressions.
    Expression(usize),
}

/// The first placeholder: private characters of four bytes, the length of the shortest expression `{{}}`.
const FIRST: u32 = 0xF0000;
/// As many expressions as there are private characters in that plane.
const MOST: usize = 0xFFFE;
/// What fills the placeholder up to the length of the expression.
const FILLER: &str = "x";

/// Replaces every expression outside code and formulas by a placeholder of the same length in bytes.
///
/// # Errors
/// `template_faulty` for an expression that is not closed in its paragraph and for `{%`, `prose_unreadable` for private
/// characters in the text; ranges count from the start of `body`.
pub fn blank_expressions(body: &str) -> (String, Vec<Expression>, Vec<Problem>) {
    let mut blanked = String::with_capacity(body.len());
    let (mut expressions, mut problems) = (Vec::new(), Vec::new());
    let mut verbatim = verbatim_ranges(body).into_iter().peekable();
    let mut at = 0;
    while let Some(c) = body[at..].chars().next() {
        while verbatim.next_if(|range| range.end <= at).is_some() {}
        let outside = verbatim.peek().is_none_or(|range| at < range.start);
        let step = match c {
            '{' if outside => take_brace(body, at, &mut expressions, &mut problems),
            c if is_placeholder(c) => Err(foreign_placeholder(at, &mut problems)),
            _ => Ok(at + c.len_utf8()),
        };
        match step {
            Ok(end) if expressions.last().is_some_and(|last: &Expression| last.range.start == at) => {
                push_placeholder(&mut blanked, expressions.len() - 1, end - at);
                at = end;
            }
            Ok(end) => {
                blanked.push_str(&body[at..end]);
                at = end;
            }
            Err(end) => {
                blanked.push_str("\u{fffd}?");
                at = end;
            }
        }
    }
    (blanked, expressions, problems)
}

/// Takes apart text of a Markdown event into plain text and expressions.
pub fn split_placeholders<'a>(text: &'a str, expressions: &[Expression]) -> Vec<Piece<'a>> {
    let mut pieces = Vec::new();
    let mut rest = text;
    while let Some((start, c)) = rest.char_indices().find(|(_, c)| is_placeholder(*c)) {
        let index = (u32::from(c) - FIRST) as usize;
        let length = expressions.get(index).map_or(c.len_utf8(), |expression| expression.range.len());
        if start > 0 {
            pieces.push(Piece::Text(&rest[..start]));
        }
        if index < expressions.len() {
            pieces.push(Piece::Expression(index));
        }
        rest = rest.get(start + length..).unwrap_or_default();
    }
    if !rest.is_empty() {
        pieces.push(Piece::Text(rest));
    }
    pieces
}

fn is_placeholder(c: char) -> bool {
    (FIRST..FIRST + MOST as u32).contains(&u32::from(c))
}

fn push_placeholder(blanked: &mut String, index: usize, length: usize) {
    let sign = char::from_u32(FIRST + index as u32).unwrap_or(char::REPLACEMENT_CHARACTER);
    blanked.push(sign);
    blanked.push_str(&FILLER.repeat(length.saturating_sub(sign.len_utf8())));
}

fn foreign_placeholder(at: usize, problems: &mut Vec<Problem>) -> usize {
    let message = "The prose holds a private character that no face can print.";
    problems.push(Problem::new(Code::ProseUnreadable, message).hint("Delete it.").range(at, at + 4));
    at + 4
}

/// Looks at the brace at `at`; returns where reading goes on, having pushed an expression if one begins here.
fn take_brace(
    body: &str,
    at: usize,
    expressions: &mut Vec<Expression>,
    problems: &mut Vec<Problem>,
) -> Result<usize, usize> {
    let rest = &body[at..];
    if rest.starts_with("{%") {
        let message = "A statement `{%` stands in the prose, but only expressions in double braces may.";
        let problem = Problem::new(Code::TemplateFaulty, message).range(at, at + 2);
        problems
            .push(problem.hint("Write what is meant in words, or put the text in backquotes if it is to be printed."));
        return Ok(at + 2);
    }
    if !rest.starts_with("{{") {
        return Ok(at + 1);
    }
    let Some(length) = closing(rest) else {
        let message = "The double braces opened here are not closed in this paragraph.";
        let problem = Problem::new(Code::TemplateFaulty, message).range(at, at + 2);
        problems.push(problem.hint("Close them with `}}`; put braces that are to be printed in backquotes."));
        return Ok(at + 2);
    };
    if expressions.len() >= MOST {
        let message = format!("The record has more than {MOST} expressions in double braces.");
        problems.push(Problem::new(Code::TemplateFaulty, message).range(at, at + length));
        return Ok(at + length);
    }
    let typed = &rest[2..length - 2];
    let text = typed.trim();
    let inner = at + 2 + (typed.len() - typed.trim_start().len());
    expressions.push(Expression { text: text.into(), range: at..at + length, inner: inner..inner + text.len() });
    Ok(at + length)
}

/// The length of the expression that `rest` begins with, braces included: quoted text may hold braces.
fn closing(rest: &str) -> Option<usize> {
    let paragraph = ["\n\n", "\n\r\n"].iter().filter_map(|gap| rest.find(gap)).min().unwrap_or(rest.len());
    let inside = rest.get(2..paragraph)?;
    let mut quote = None;
    let mut escaped = false;
    for (offset, c) in inside.char_indices() {
        match (quote, c) {
            _ if escaped => escaped = false,
            (Some(_), '\\') => escaped = true,
            (Some(mark), c) if mark == c => quote = None,
            (None, '"' | '\'') => quote = Some(c),
            (None, '}') if inside[offset..].starts_with("}}") => return Some(offset + 4),
            _ => {}
        }
    }
    // Quotation marks that do not match: the expression itself will be found faulty, so end it at the first braces.
    inside.find("}}").map(|offset| offset + 4)
}

/// The ranges of code and formulas, in order.
fn verbatim_ranges(body: &str) -> Vec<Range<usize>> {
    let events = Parser::new_ext(body, markdown_options()).into_offset_iter();
    let is_verbatim = |event: &Event<'_>| {
        matches!(event, Event::Code(_) | Event::InlineMath(_) | Event::DisplayMath(_) | Event::Start(Tag::CodeBlock(_)))
    };
    let mut ranges: Vec<_> = events.filter(|(event, _)| is_verbatim(event)).map(|(_, range)| range).collect();
    ranges.sort_by_key(|range| (range.start, range.end));
    ranges
}

#[cfg(test)]
mod tests {
    use super::*;

    /// What the events of the blanked text hold, with expressions as «text».
    fn seen(body: &str) -> String {
        let (blanked, expressions, problems) = blank_expressions(body);
        assert_eq!(blanked.len(), body.len());
        assert_eq!(problems, []);
        let mut out = String::new();
        for event in Parser::new_ext(&blanked, markdown_options()) {
            match event {
                Event::Text(text) | Event::Code(text) => {
                    for piece in split_placeholders(&text, &expressions) {
                        match piece {
                            Piece::Text(text) => out.push_str(text),
                            Piece::Expression(index) => out.push_str(&format!("«{}»", expressions[index].text)),
                        }
                    }
                }
                Event::Start(Tag::Strong | Tag::Emphasis) => out.push('<'),
                Event::End(pulldown_cmark::TagEnd::Strong | pulldown_cmark::TagEnd::Emphasis) => out.push('>'),
                Event::Start(Tag::Heading { .. }) => out.push('='),
                Event::Start(Tag::TableCell) => out.push('|'),
                Event::Start(Tag::Link { dest_url, .. }) => {
                    out.push_str(&format!("[{}]", split_placeholders(&dest_url, &expressions).len()))
                }
                _ => {}
            }
        }
        out
    }

    #[test]
    fn placeholders_survive_markdown() {
        assert_eq!(seen("The mass is {{ R1.mass }}x, {{a}}{{b}}."), "The mass is «R1.mass»x, «a»«b».");
        assert_eq!(seen("# Mass {{ R1.mass }}"), "=Mass «R1.mass»");
        assert_eq!(seen("**{{ a_b_c }}** and *{{ x * y * z }}*."), "<«a_b_c»> and <«x * y * z»>.");
        assert_eq!(
            seen("| a | b |\n|---|---|\n| {{ x }} | {{ deviation(R1.mass, \"mg\") }} |"),
            "|a|b|«x»|«deviation(R1.mass, \"mg\")»"
        );
        assert_eq!(seen("[{{ t }}]({{ url }})"), "[1]«t»");
        assert_eq!(seen("- {{ results() }}\n\n> {{ f(\"}}\") }}\n"), "«results()»«f(\"}}\")»");
        assert_eq!(seen("{{}}"), "«»");
    }

    #[test]
    fn code_and_formulas_stay() {
        let body = "`{{ a }}` ``{% b`` $\\frac{a}{{b}}$\n\n```\n{{ c }}\n{% d\n```\n\n    {{ e }}\n";
        let (blanked, expressions, problems) = blank_expressions(body);
        assert_eq!((blanked.as_str(), expressions.len(), problems.len()), (body, 0, 0));
    }

    #[test]
    fn keeps_offsets() {
        let body = "µ {{  R1.mass }} and {{ x }}";
        let (_, expressions, _) = blank_expressions(body);
        assert_eq!(&body[expressions[0].range.clone()], "{{  R1.mass }}");
        assert_eq!(&body[expressions[0].inner.clone()], "R1.mass");
        assert_eq!(&body[expressions[1].inner.clone()], "x");
    }

    #[test]
    fn complains_of_statements_and_open_braces() {
        let codes = |body: &str| {
            blank_expressions(body).2.iter().map(|problem| (problem.code, problem.range)).collect::<Vec<_>>()
        };
        assert_eq!(codes("a {% for x %}"), [(Code::TemplateFaulty, Some((2, 4)))]);
        assert_eq!(codes("a {{ b\n\nc }}"), [(Code::TemplateFaulty, Some((2, 4)))]);
        assert_eq!(codes("a \u{f0001} b"), [(Code::ProseUnreadable, Some((2, 6)))]);
        assert_eq!(codes("a {{ b\nc }} {#id} }}"), []);
    }
}
