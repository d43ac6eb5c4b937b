//! What goes to the terminal: results to standard output, everything said about them to standard error.
//!
//! A closed pipe ends the output quietly. Colour only on a terminal, and never with NO_COLOR set.

use super::Outcome;
use crate::block::Engine;
use crate::diagnostic::{Complaints, Look, print_complaints};
use std::io::{IsTerminal, Write};
use std::time::Duration;

/// Prints results.
pub fn print(text: &str) {
    let _ = anstream::stdout().write_all(text.as_bytes());
    let _ = std::io::stdout().flush();
}

/// Prints what is said about results.
pub fn say(text: &str) {
    let _ = anstream::stderr().write_all(text.as_bytes());
}

/// Prints the complaints of an engine and says how the command ended.
pub fn say_complaints(engine: &Engine) -> Outcome {
    let complaints = engine.complaints();
    say(&complaints_text(engine, &complaints));
    outcome(&complaints)
}

/// The complaints as text in the look the terminal allows.
pub fn complaints_text(engine: &Engine, complaints: &Complaints) -> String {
    let coloured = std::io::stderr().is_terminal() && std::env::var_os("NO_COLOR").is_none_or(|value| value.is_empty());
    let look = if coloured { Look::Coloured } else { Look::Plain };
    if complaints.list.is_empty() { String::new() } else { print_complaints(complaints, &engine.sources(), look) }
}

/// Faults make exit status 1; warnings do not.
pub fn outcome(complaints: &Complaints) -> Outcome {
    if complaints.has_faults() { Outcome::Faults } else { Outcome::AllWell }
}

/// A sign of life for work over a second; nothing when standard error is no terminal.
pub fn progress(message: &'static str) -> indicatif::ProgressBar {
    let bar = indicatif::ProgressBar::new_spinner();
    bar.set_draw_target(indicatif::ProgressDrawTarget::stderr());
    bar.set_message(message);
    bar.enable_steady_tick(Duration::from_secs(1));
    bar
}

/// Columns of text padded to their widest cell; `right` says which columns are flush right.
pub fn columns(rows: &[Vec<String>], right: &[bool]) -> String {
    let width = |text: &str| unicode_width::UnicodeWidthStr::width(text);
    let count = rows.iter().map(Vec::len).max().unwrap_or(0);
    let widths: Vec<usize> =
        (0..count).map(|column| rows.iter().filter_map(|row| row.get(column)).map(|cell| width(cell)).max().unwrap_or(0)).collect();
    let mut text = String::new();
    for row in rows {
        let mut line = String::new();
        for (column, cell) in row.iter().enumerate() {
            let padding = " ".repeat(widths[column] - width(cell));
            match right.get(column).copied().unwrap_or(false) {
                true => line.extend([padding.as_str(), cell]),
                false => line.extend([cell.as_str(), &padding]),
            }
            line.push_str("  ");
        }
        text.push_str(line.trim_end());
        text.push('\n');
    }
    text
}
