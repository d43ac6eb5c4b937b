//! Complaints: the one type for everything the program has to say about records.
//!
//! Deep code returns a [`Problem`], which knows no place; the caller that knows the place turns it into a
//! [`Complaint`]. Independent mistakes are gathered in [`Complaints`] and reported together.

mod code;
mod print;

pub use code::Code;
pub use print::{Look, print_complaints};

use crate::intake::Place;

/// What is wrong, before anybody knows where.
#[derive(Debug, Clone, PartialEq)]
pub struct Problem {
    pub code: Code,
    /// One sentence: what is wrong, what was found, what was expected.
    pub message: String,
    /// How to mend it.
    pub hints: Vec<String>,
    /// Bytes of the text examined that are meant, when the text is a part of the record.
    pub range: Option<(usize, usize)>,
}

impl Problem {
    /// A problem without advice.
    pub fn new(code: Code, message: impl Into<String>) -> Self {
        Self { code, message: message.into(), hints: Vec::new(), range: None }
    }

    /// Adds how to mend it.
    pub fn hint(mut self, hint: impl Into<String>) -> Self {
        self.hints.push(hint.into());
        self
    }

    /// Narrows the problem to bytes `start..end` of the text examined.
    pub fn range(mut self, start: usize, end: usize) -> Self {
        self.range = Some((start, end));
        self
    }

    /// The complaint at `place`, narrowed by the problem's own range.
    pub fn at(self, place: Place) -> Complaint {
        let place = match self.range {
            Some((start, end)) if place.start as usize + end <= place.end as usize => place.within(start, end),
            _ => place,
        };
        Complaint {
            severity: self.code.severity(),
            code: self.code,
            place: Some(place),
            message: sentence(self.message),
            hints: self.hints.into_iter().map(|text| Hint { text: sentence(text), place: None }).collect(),
        }
    }

    /// The complaint of something that has no place in a record.
    pub fn anywhere(self) -> Complaint {
        let mut complaint = self.at(Place::new(crate::intake::FileId(0), 0, 0));
        complaint.place = None;
        complaint
    }
}

/// Text as a sentence: a capital letter in front where it begins with a plain word, a full stop behind.
fn sentence(text: String) -> String {
    let text = text.trim();
    let first = text.split_whitespace().next().unwrap_or_default();
    let plain = first.chars().all(|c| c.is_alphabetic() || matches!(c, ',' | ':' | ';'));
    let mut letters = text.chars();
    let mut made: String = match letters.next() {
        Some(letter) if plain && letter.is_lowercase() && (first == "a" || first.chars().count() > 1) => {
            letter.to_uppercase().chain(letters).collect()
        }
        _ => text.to_string(),
    };
    if made.ends_with(|c: char| c.is_alphanumeric() || matches!(c, ')' | '`' | '”' | '"' | '…')) {
        made.push('.');
    }
    made
}

/// How much a complaint weighs.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord)]
pub enum Severity {
    /// Worth a look; results stand.
    Warning,
    /// Results or the report cannot stand.
    Fault,
}

/// Advice, which may point at a second place.
#[derive(Debug, Clone, PartialEq)]
pub struct Hint {
    pub text: String,
    pub place: Option<Place>,
}

/// A problem with its place: what a person reads.
#[derive(Debug, Clone, PartialEq)]
pub struct Complaint {
    pub severity: Severity,
    pub code: Code,
    pub place: Option<Place>,
    pub message: String,
    pub hints: Vec<Hint>,
}

impl Complaint {
    /// Adds advice that points at another place.
    pub fn hint_at(mut self, text: impl Into<String>, place: Place) -> Self {
        self.hints.push(Hint { text: text.into(), place: Some(place) });
        self
    }
}

/// All complaints of one run.
#[derive(Debug, Clone, Default, PartialEq)]
pub struct Complaints {
    pub list: Vec<Complaint>,
}

impl Complaints {
    /// Adds one, unless the same is said of the same place already.
    pub fn add(&mut self, complaint: Complaint) {
        let said = |other: &Complaint| {
            other.code == complaint.code && other.place == complaint.place && other.message == complaint.message
        };
        if !self.list.iter().any(said) {
            self.list.push(complaint);
        }
    }

    /// Adds a problem at a place.
    pub fn add_at(&mut self, problem: Problem, place: Place) {
        self.add(problem.at(place));
    }

    /// Keeps the value of a result, or files its problem at `place`.
    pub fn keep<T>(&mut self, result: Result<T, Problem>, place: Place) -> Option<T> {
        result.map_err(|problem| self.add_at(problem, place)).ok()
    }

    /// Whether any complaint is a fault.
    pub fn has_faults(&self) -> bool {
        self.list.iter().any(|complaint| complaint.severity == Severity::Fault)
    }

    /// Takes over another list.
    pub fn extend(&mut self, other: Complaints) {
        for complaint in other.list {
            self.add(complaint);
        }
    }

    /// In the order of files and places.
    pub fn sort(&mut self) {
        self.list.sort_by_key(|complaint| (complaint.place.is_none(), complaint.place));
    }
}

/// The candidate nearest to `word` by edit distance, if any is near enough to be meant.
pub fn nearest<'a>(word: &str, candidates: impl IntoIterator<Item = &'a str>) -> Option<&'a str> {
    let limit = 1 + word.chars().count() / 4;
    candidates
        .into_iter()
        .map(|candidate| (edit_distance(word, candidate), candidate))
        .filter(|(distance, _)| *distance <= limit)
        .min()
        .map(|(_, candidate)| candidate)
}

/// Insertions, deletions, replacements and swaps of neighbours between two words.
fn edit_distance(a: &str, b: &str) -> usize {
    let (a, b): (Vec<char>, Vec<char>) = (a.chars().collect(), b.chars().collect());
    let mut rows = vec![vec![0usize; b.len() + 1]; a.len() + 1];
    for (i, row) in rows.iter_mut().enumerate() {
        row[0] = i;
    }
    rows[0] = (0..=b.len()).collect();
    for i in 1..=a.len() {
        for j in 1..=b.len() {
            let replaced = rows[i - 1][j - 1] + usize::from(a[i - 1] != b[j - 1]);
            let mut best = replaced.min(rows[i - 1][j] + 1).min(rows[i][j - 1] + 1);
            if i > 1 && j > 1 && a[i - 1] == b[j - 2] && a[i - 2] == b[j - 1] {
                best = best.min(rows[i - 2][j - 2] + 1);
            }
            rows[i][j] = best;
        }
    }
    rows[a.len()][b.len()]
}
