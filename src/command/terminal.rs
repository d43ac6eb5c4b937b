//! What goes to the terminal: results to standard output, everything said about them to standard error.
//!
//! A closed pipe ends the output quietly. Colour only on a terminal, and never with NO_COLOR set: the streams below
//! take colours out wherever they are not wanted.

use super::Outcome;
use crate::block::Engine;
use crate::diagnostic::{Complaints, Look, Problem, Severity, print_complaints};
use std::io::{IsTerminal, Write};
use std::sync::mpsc::{Receiver, RecvTimeoutError, Sender, channel};
use std::thread::JoinHandle;
use std::time::{Duration, Instant};
use unicode_width::UnicodeWidthStr;

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

/// Prints what the complaints of an engine and further problems say, and that nothing was done.
pub fn refuse(engine: &Engine, problems: Vec<Problem>) -> Outcome {
    let mut complaints = engine.complaints();
    complaints.list.retain(|complaint| complaint.severity == Severity::Fault);
    for problem in problems {
        complaints.add(problem.anywhere());
    }
    say(&complaints_text(engine, &complaints));
    say("Nothing was entered into the register.\n");
    Outcome::Faults
}

/// Prints why nothing was done, without the complaints of records it has nothing to do with.
pub fn refuse_for(engine: &Engine, problem: Problem) -> Outcome {
    let complaints = Complaints { list: vec![problem.anywhere()] };
    say(&complaints_text(engine, &complaints));
    say("Nothing was entered into the register.\n");
    Outcome::Faults
}

/// The complaints as text; nothing when there are none.
pub fn complaints_text(engine: &Engine, complaints: &Complaints) -> String {
    print_complaints(complaints, &engine.sources(), Look::Coloured)
}

/// Faults make exit status 1; warnings do not.
pub fn outcome(complaints: &Complaints) -> Outcome {
    if complaints.has_faults() { Outcome::Faults } else { Outcome::AllWell }
}

/// Work shorter than this shows no sign of life.
const PATIENCE: Duration = Duration::from_secs(1);

/// A sign of life on standard error, shown only when the work takes longer than [`PATIENCE`].
pub struct Progress {
    /// Carries what is being done; dropped when the work is done, which wakes the thread.
    working: Option<Sender<&'static str>>,
    shown_by: Option<JoinHandle<()>>,
}

/// A sign of life for work over a second; nothing when standard error is no terminal.
pub fn progress(message: &'static str) -> Progress {
    if !std::io::stderr().is_terminal() {
        return Progress { working: None, shown_by: None };
    }
    let (working, news) = channel::<&'static str>();
    let shown_by = std::thread::spawn(move || show(message, &news));
    Progress { working: Some(working), shown_by: Some(shown_by) }
}

/// Waits out the patience, then shows what is being done until the work is done.
fn show(mut message: &'static str, news: &Receiver<&'static str>) {
    let begun = Instant::now();
    loop {
        match news.recv_timeout(PATIENCE.saturating_sub(begun.elapsed())) {
            Ok(next) => message = next,
            Err(RecvTimeoutError::Timeout) => break,
            Err(RecvTimeoutError::Disconnected) => return,
        }
    }
    let spinner = indicatif::ProgressBar::new_spinner().with_message(message);
    spinner.enable_steady_tick(Duration::from_millis(120));
    while let Ok(next) = news.recv() {
        spinner.set_message(next);
    }
    spinner.finish_and_clear();
}

impl Progress {
    /// Takes the sign of life away before anything is printed.
    pub fn finish_and_clear(self) {}
}

impl Drop for Progress {
    fn drop(&mut self) {
        self.working = None;
        if let Some(thread) = self.shown_by.take() {
            let _ = thread.join();
        }
    }
}

/// Degrees of freedom for a table. Beyond 10⁵ they say no more than that the uncertainty is as good as known.
pub fn degrees_of_freedom(freedom: f64) -> String {
    match freedom {
        freedom if freedom.is_infinite() => "∞".into(),
        freedom if freedom > 1e5 => "> 10⁵".into(),
        freedom if freedom.fract() == 0.0 => format!("{freedom}"),
        freedom => format!("{freedom:.1}"),
    }
}

/// `1 record`, `2 records`.
pub fn counted(number: usize, noun: &str) -> String {
    if number == 1 { format!("1 {noun}") } else { format!("{number} {noun}s") }
}

/// Columns of text padded to their widest cell; `right` says which columns are flush right.
pub fn columns(rows: &[Vec<String>], right: &[bool]) -> String {
    let count = rows.iter().map(Vec::len).max().unwrap_or(0);
    let widest =
        |column: usize| rows.iter().filter_map(|row| row.get(column)).map(|cell| cell.width()).max().unwrap_or(0);
    let widths: Vec<usize> = (0..count).map(widest).collect();
    let mut text = String::new();
    for row in rows {
        let mut line = String::new();
        for (column, (cell, width)) in row.iter().zip(&widths).enumerate() {
            let padding = " ".repeat(width.saturating_sub(cell.width()));
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

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn columns_align_by_what_shows() {
        let rows = vec![vec!["a".to_string(), "1".into()], vec!["重µ".into(), "22".into()]];
        assert_eq!(columns(&rows, &[false, true]), "a     1\n重µ  22\n");
        assert_eq!(columns(&[], &[]), "");
    }

    #[test]
    fn large_degrees_of_freedom_are_not_spelt_out() {
        let printed = [9.0, 70.04, 99_999.94, 100_001.0, f64::INFINITY].map(degrees_of_freedom);
        assert_eq!(printed, ["9", "70.0", "99999.9", "> 10⁵", "∞"]);
    }
}
