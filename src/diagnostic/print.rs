//! Complaints on the terminal, laid out like a reviewer's notes in the margin.
//!
//! A note begins with the file, line and column, then shows the line with the place underlined, then says in full
//! sentences what is wrong and how to mend it:
//!
//! ```text
//! standards/k17.md, line 12, column 8: fault, certificate_expired
//!     due: 2040-11-02
//!          ‾‾‾‾‾‾‾‾‾‾
//!     The certificate C-38-091 was due on 2040-11-02, but K17 was used on 2041-03-12.
//!     To mend it: Enter the newer certificate.
//! ```

use super::{Code, Complaint, Complaints, Severity};
use crate::intake::{Place, Sources};
use std::fmt::Write;
use unicode_width::UnicodeWidthChar;

/// How complaints look.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Look {
    Plain,
    Coloured,
}

/// The indentation of what belongs to a note.
const INDENT: &str = "    ";
/// Columns of a record's line that are shown, at most; the rest is cut off with an ellipsis.
const WIDEST: usize = 92;
/// Columns kept before the place in a line that is cut.
const BEFORE: usize = 30;
/// Columns in which sentences are broken into lines.
const SENTENCE_WIDTH: usize = 92;
/// Columns of a tab stop.
const TAB: usize = 4;

/// All complaints as text for a person, in the order of places, with their count at the end; nothing if there are none.
pub fn print_complaints(complaints: &Complaints, sources: &Sources, look: Look) -> String {
    if complaints.list.is_empty() {
        return String::new();
    }
    let mut sorted = complaints.clone();
    sorted.list.sort_by_cached_key(|complaint| {
        let path = complaint.place.map(|place| sources.file(place.file).path.clone());
        (complaint.place.is_none(), path, complaint.place)
    });
    let mut out = String::new();
    for complaint in &sorted.list {
        print_complaint(&mut out, complaint, sources, look);
        out.push('\n');
    }
    out.push_str(&count(&sorted.list));
    out.push('\n');
    out
}

fn print_complaint(out: &mut String, complaint: &Complaint, sources: &Sources, look: Look) {
    let weight = weigh(complaint.severity, complaint.code, look);
    match complaint.place {
        Some(place) => {
            let (path, line, column) = sources.locate(place);
            // Writing to a string cannot fail.
            let _ = writeln!(out, "{}, line {line}, column {column}: {weight}", harmless(path));
            print_line(out, place, sources, look);
        }
        None => {
            let _ = writeln!(out, "{weight}");
        }
    }
    print_sentence(out, &complaint.message);
    for hint in &complaint.hints {
        match hint.place {
            None => print_sentence(out, &format!("To mend it: {}", hint.text)),
            Some(place) => {
                let (path, line, column) = sources.locate(place);
                print_sentence(out, &format!("See {path}, line {line}, column {column}: {}", hint.text));
                print_line(out, place, sources, look);
            }
        }
    }
}

/// Severity and code: "fault, certificate_expired".
fn weigh(severity: Severity, code: Code, look: Look) -> String {
    let (word, colour) = match severity {
        Severity::Fault => ("fault", "\u{1b}[31m"),
        Severity::Warning => ("warning", "\u{1b}[33m"),
    };
    match look {
        Look::Plain => format!("{word}, {}", code.word()),
        Look::Coloured => format!("{colour}{word}\u{1b}[0m, {}", code.word()),
    }
}

/// One column of a shown line.
struct Cell {
    shown: char,
    width: usize,
    marked: bool,
}

/// The line where the place begins, and a row that underlines the place.
fn print_line(out: &mut String, place: Place, sources: &Sources, look: Look) {
    let file = sources.file(place.file);
    let number = file.line_of(place.start);
    let cells = cells(file.line(number), place.start as usize - file.line_range(number).0, place);
    if cells.is_empty() {
        return;
    }
    let (cells, cut_before, cut_after) = window(&cells);
    let mut line = String::from(if cut_before { "… " } else { "" });
    let mut row = String::from(if cut_before { "  " } else { "" });
    for cell in cells {
        line.push(cell.shown);
        row.push_str(&if cell.marked { "‾" } else { " " }.repeat(cell.width));
    }
    line.push_str(if cut_after { " …" } else { "" });
    let _ = writeln!(out, "{INDENT}{}", line.trim_end());
    let row = row.trim_end();
    let _ = match look {
        Look::Plain => writeln!(out, "{INDENT}{row}"),
        Look::Coloured => writeln!(out, "{INDENT}\u{1b}[31m{row}\u{1b}[0m"),
    };
}

/// The line in columns, from its first sign on; `start` is the byte of the line where the place begins.
fn cells(line: &[u8], start: usize, place: Place) -> Vec<Cell> {
    let length = (place.end.saturating_sub(place.start) as usize).max(1);
    let mut cells = Vec::new();
    let (mut offset, mut column) = (0, 0);
    for chunk in line.utf8_chunks() {
        for c in chunk.valid().chars() {
            let marked = offset >= start && offset < start + length;
            push_cell(&mut cells, &mut column, c, marked);
            offset += c.len_utf8();
        }
        if !chunk.invalid().is_empty() {
            let marked = offset + chunk.invalid().len() > start && offset < start + length;
            push_cell(&mut cells, &mut column, char::REPLACEMENT_CHARACTER, marked);
            offset += chunk.invalid().len();
        }
    }
    if start >= offset {
        // A place behind the last sign is where something is missing.
        cells.push(Cell { shown: ' ', width: 1, marked: true });
    }
    let first = cells.iter().position(|cell| cell.shown != ' ' || cell.marked).unwrap_or(0);
    cells.split_off(first)
}

fn push_cell(cells: &mut Vec<Cell>, column: &mut usize, c: char, marked: bool) {
    if c == '\t' {
        for _ in 0..TAB - *column % TAB {
            cells.push(Cell { shown: ' ', width: 1, marked });
            *column += 1;
        }
        return;
    }
    if c == '\u{feff}' {
        return;
    }
    let shown = harmless_sign(c);
    let width = shown.width().unwrap_or(1);
    cells.push(Cell { shown, width, marked });
    *column += width;
}

/// The part of a long line that is shown around the mark, and whether something is cut before and behind it.
fn window(cells: &[Cell]) -> (&[Cell], bool, bool) {
    let total: usize = cells.iter().map(|cell| cell.width).sum();
    if total <= WIDEST {
        return (cells, false, false);
    }
    let mark = cells.iter().position(|cell| cell.marked).unwrap_or(0);
    let first = mark.saturating_sub(BEFORE);
    let mut width = 0;
    let last = cells[first..]
        .iter()
        .position(|cell| {
            width += cell.width;
            width > WIDEST
        })
        .map_or(cells.len(), |length| first + length);
    (&cells[first..last], first > 0, last < cells.len())
}

/// Indented text, broken at blanks.
fn print_sentence(out: &mut String, text: &str) {
    let mut column = 0;
    for word in harmless(text).split_whitespace() {
        let width: usize = word.chars().filter_map(UnicodeWidthChar::width).sum();
        if column == 0 {
            out.push_str(INDENT);
        } else if column + 1 + width > SENTENCE_WIDTH {
            out.push('\n');
            out.push_str(INDENT);
            column = 0;
        } else {
            out.push(' ');
            column += 1;
        }
        out.push_str(word);
        column += width;
    }
    out.push('\n');
}

/// Text without signs that could move the cursor, recolour the screen or turn the writing around.
fn harmless(text: &str) -> String {
    text.chars().map(|c| if c == '\n' || c == '\t' { ' ' } else { harmless_sign(c) }).collect()
}

fn harmless_sign(c: char) -> char {
    match c {
        '\0'..='\u{1f}' => char::from_u32(0x2400 + u32::from(c)).unwrap_or('\u{fffd}'),
        '\u{7f}' => '\u{2421}',
        '\u{80}'..='\u{9f}' | '\u{200b}'..='\u{200f}' | '\u{2028}'..='\u{202e}' | '\u{2060}'..='\u{206f}' => '\u{fffd}',
        _ => c,
    }
}

/// "2 faults, 1 warning."
fn count(list: &[Complaint]) -> String {
    let faults = list.iter().filter(|complaint| complaint.severity == Severity::Fault).count();
    let counted = |number: usize, word: &str| match number {
        0 => None,
        1 => Some(format!("1 {word}")),
        _ => Some(format!("{number} {word}s")),
    };
    let parts: Vec<_> =
        [counted(faults, "fault"), counted(list.len() - faults, "warning")].into_iter().flatten().collect();
    format!("{}.", parts.join(", "))
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::diagnostic::Problem;

    fn printed(text: &[u8], mark: (usize, usize), look: Look) -> String {
        let mut sources = Sources::default();
        let file = sources.add("standards/k17.md", text);
        let mut complaints = Complaints::default();
        let problem = Problem::new(Code::CertificateExpired, "The certificate was due.").hint("Enter the newer one.");
        complaints.add_at(problem, Place::new(file, mark.0, mark.1));
        print_complaints(&complaints, &sources, look)
    }

    fn row(text: &[u8], mark: (usize, usize)) -> Vec<String> {
        printed(text, mark, Look::Plain).lines().skip(1).take(2).map(String::from).collect()
    }

    #[test]
    fn reads_like_a_note() {
        let expected = "standards/k17.md, line 2, column 8: fault, certificate_expired
    due: 2040-11-02
         ‾‾‾‾‾‾‾‾‾‾
    The certificate was due.
    To mend it: Enter the newer one.

1 fault.
";
        assert_eq!(printed(b"a\r\n  due: 2040-11-02\r\n", (10, 20), Look::Plain), expected);
    }

    #[test]
    fn marks_columns_as_they_show() {
        assert_eq!(row("µ重\t20 °C x".as_bytes(), (6, 12)), ["    µ重 20 °C x", "        ‾‾‾‾‾"]);
        assert_eq!(row(b"a\xff\xfe b", (1, 2)), ["    a\u{fffd}\u{fffd} b", "     ‾"]);
        assert_eq!(row(b"a: \x1b[31mx", (3, 4)), ["    a: \u{241b}[31mx", "       ‾"]);
        assert_eq!(row(b"a:\nb", (2, 2)), ["    a:", "      ‾"]);
        assert_eq!(row(b"a: b\nc: d\n", (3, 8)), ["    a: b", "       ‾"]);
        assert_eq!(row("\u{feff}ab".as_bytes(), (4, 5)), ["    ab", "     ‾"]);
    }

    #[test]
    fn cuts_long_lines_around_the_place() {
        let lines = row(format!("{}MARK{}", "x".repeat(200), "y".repeat(200)).as_bytes(), (200, 204));
        assert_eq!(lines[0], format!("    … {}MARK{} …", "x".repeat(30), "y".repeat(58)));
        assert_eq!(lines[1], format!("    {}‾‾‾‾", " ".repeat(32)));
    }

    #[test]
    fn counts_and_sorts() {
        let mut sources = Sources::default();
        let (later, first) = (sources.add("b.md", &b"one\n"[..]), sources.add("a.md", &b"one\ntwo\n"[..]));
        let mut complaints = Complaints::default();
        complaints.add(Problem::new(Code::FewReadings, "General.").anywhere());
        complaints.add_at(Problem::new(Code::FewReadings, "Third."), Place::new(later, 0, 1));
        complaints.add_at(Problem::new(Code::BareNumber, "Second."), Place::new(first, 4, 5));
        let seen = Problem::new(Code::BareNumber, "First.")
            .at(Place::new(first, 0, 1))
            .hint_at("It too.", Place::new(later, 1, 2));
        complaints.add(seen);
        let text = print_complaints(&complaints, &sources, Look::Plain);
        let order: Vec<_> = ["First.", "See b.md, line 1, column 2: It too.", "Second.", "Third.", "General."]
            .iter()
            .map(|word| text.find(word).unwrap())
            .collect();
        assert!(order.is_sorted());
        assert!(text.ends_with("\n2 faults, 2 warnings.\n"));
        assert_eq!(print_complaints(&Complaints::default(), &sources, Look::Plain), "");
    }

    #[test]
    fn colours_only_when_asked() {
        assert!(!printed(b"a\x1b[0m", (0, 1), Look::Plain).contains('\u{1b}'));
        assert!(printed(b"a", (0, 1), Look::Coloured).contains("\u{1b}[31mfault\u{1b}[0m, certificate_expired"));
    }
}
