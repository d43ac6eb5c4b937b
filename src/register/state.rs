//! Issued reports and how they stand.

use super::chain::Register;
use super::entry::{Act, Entry, IssuedReport, ReportKind};
use crate::diagnostic::{Code, Problem, nearest};
use serde::Serialize;

/// How an issued report stands.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize, clap::ValueEnum)]
#[serde(rename_all = "snake_case")]
pub enum State {
    /// Holds as issued.
    Issued,
    /// Holds together with its amendment.
    Amended,
    /// Another report stands in its place.
    Replaced,
    /// No longer holds.
    Withdrawn,
}

impl State {
    /// The word printed.
    pub fn word(self) -> &'static str {
        match self {
            State::Issued => "issued",
            State::Amended => "amended",
            State::Replaced => "replaced",
            State::Withdrawn => "withdrawn",
        }
    }
}

/// One issued report with all that became of it.
#[derive(Debug, Clone)]
pub struct Standing<'r> {
    pub entry: &'r Entry,
    pub issued: &'r IssuedReport,
    pub state: State,
    /// The report that amends or replaces it.
    pub by: Option<&'r str>,
    /// The entry that withdrew it.
    pub withdrawn: Option<&'r Entry>,
    /// Entries of its sending.
    pub sent: Vec<&'r Entry>,
    /// Entries of review and authorisation of its seal before it was issued.
    pub authorised: Vec<&'r Entry>,
}

/// Every issued report, in the order of issue.
pub fn standings(register: &Register) -> Vec<Standing<'_>> {
    let mut all: Vec<Standing<'_>> = Vec::new();
    for entry in &register.entries {
        match &entry.act {
            Act::Issued(issued) => all.push(Standing {
                entry,
                issued,
                state: State::Issued,
                by: None,
                withdrawn: None,
                sent: Vec::new(),
                authorised: authorisations(register, issued, entry.sequence),
            }),
            Act::Withdrawn { number } => {
                if let Some(standing) = all.iter_mut().find(|one| one.issued.number == *number) {
                    (standing.state, standing.withdrawn) = (State::Withdrawn, Some(entry));
                }
            }
            Act::Sent { number, .. } => {
                if let Some(standing) = all.iter_mut().find(|one| one.issued.number == *number) {
                    standing.sent.push(entry);
                }
            }
            _ => {}
        }
    }
    follow(&mut all);
    all
}

fn authorisations<'r>(register: &'r Register, issued: &IssuedReport, before: u64) -> Vec<&'r Entry> {
    let of_this = |entry: &&Entry| match &entry.act {
        Act::Authorised { report, seal, .. } => {
            entry.sequence < before && *report == issued.report && *seal == issued.seal
        }
        _ => false,
    };
    register.entries.iter().filter(of_this).collect()
}

/// What follows a report changes how it stands; a replacement also stands for the amendments behind it.
fn follow(all: &mut [Standing<'_>]) {
    for index in 0..all.len() {
        let (kind, number) = (all[index].issued.kind, all[index].issued.number.as_str());
        let mut of = all[index].issued.of.as_deref();
        while let Some(at) = of.and_then(|of| all[..index].iter().position(|one| one.issued.number == of)) {
            let standing = &mut all[at];
            if standing.state != State::Withdrawn {
                standing.state = match kind {
                    ReportKind::Replacement => State::Replaced,
                    _ => State::Amended,
                };
            }
            standing.by = Some(number);
            of = match (kind, standing.issued.kind) {
                (ReportKind::Replacement, ReportKind::Amendment) => standing.issued.of.as_deref(),
                _ => None,
            };
        }
    }
}

/// The report with this number.
///
/// # Errors
/// `report_unknown`.
pub fn find_report<'r>(register: &'r Register, number: &str) -> Result<Standing<'r>, Problem> {
    let all = standings(register);
    let numbers: Vec<&str> = all.iter().map(|one| one.issued.number.as_str()).collect();
    if let Some(at) = numbers.iter().position(|one| *one == number) {
        return Ok(all[at].clone());
    }
    let problem = Problem::new(Code::ReportUnknown, format!("No report {number} was ever issued."));
    Err(match nearest(number, numbers.iter().copied()) {
        Some(near) => problem.hint(format!("Did you mean {near}?")),
        None => problem.hint("`libripens register` lists every report issued."),
    })
}

/// What to list.
#[derive(Debug, Clone, Default)]
pub struct Filter {
    /// Path of a record or raw data file.
    pub record: Option<String>,
    /// Name of a block: an instrument, a standard, an item.
    pub block: Option<String>,
    /// A role.
    pub person: Option<String>,
    /// First and last day, as written in entries.
    pub from: Option<String>,
    pub to: Option<String>,
    pub state: Option<State>,
}

impl Filter {
    /// Whether a report is asked for.
    pub fn keeps(&self, one: &Standing<'_>) -> bool {
        let day = &one.entry.time[..one.entry.time.len().min(10)];
        let persons: Vec<&str> = one
            .authorised
            .iter()
            .chain(&one.sent)
            .chain(&one.withdrawn)
            .map(|entry| entry.who.as_str())
            .chain([one.entry.who.as_str(), one.issued.performed_by.as_str()])
            .collect();
        let has = |asked: &Option<String>, found: &dyn Fn(&str) -> bool| asked.as_deref().is_none_or(found);
        has(&self.record, &|path| one.issued.report == path || one.issued.files.iter().any(|file| file.path == path))
            && has(&self.block, &|name| one.issued.blocks.iter().any(|block| block.name == name))
            && has(&self.person, &|role| persons.contains(&role))
            && has(&self.from, &|from| day >= from)
            && has(&self.to, &|to| day <= to)
            && self.state.is_none_or(|state| state == one.state)
    }

    /// Whether an entry is asked for: by person, day, and the record it speaks of.
    pub fn keeps_entry(&self, entry: &Entry) -> bool {
        let day = &entry.time[..entry.time.len().min(10)];
        self.person.as_deref().is_none_or(|role| entry.who == role)
            && self.from.as_deref().is_none_or(|from| day >= from)
            && self.to.as_deref().is_none_or(|to| day <= to)
            && self.record.as_deref().is_none_or(|path| concerns(entry, path))
    }
}

/// Whether an entry speaks of a file.
fn concerns(entry: &Entry, path: &str) -> bool {
    match &entry.act {
        Act::Lodged { files } => files.iter().any(|file| file.path == path),
        Act::Corrected { file, .. } => file == path,
        Act::Authorised { report, .. } => report == path,
        Act::Issued(issued) => issued.report == path || issued.files.iter().any(|file| file.path == path),
        Act::Sent { .. } | Act::Withdrawn { .. } | Act::Decided { .. } => false,
    }
}

/// What an entry says, in a line.
pub fn entry_words(entry: &Entry) -> String {
    match &entry.act {
        Act::Lodged { files } => match files.as_slice() {
            [one] => one.path.clone(),
            [first, .., last] => format!("{} files, {} to {}", files.len(), first.path, last.path),
            [] => "nothing".into(),
        },
        Act::Corrected { file, line, old, new, correction, .. } => {
            format!("{file}, line {line}, by {correction}: “{old}” to “{new}”")
        }
        Act::Authorised { report, seal, .. } => format!("{report}, seal {}", crate::report::dossier::short_seal(seal)),
        Act::Issued(issued) => match (&issued.of, issued.kind) {
            (Some(of), ReportKind::Amendment) => format!("{}, amendment of {of}", issued.number),
            (Some(of), _) => format!("{} in place of {of}", issued.number),
            (None, _) => format!("{}, {}", issued.number, issued.title),
        },
        Act::Sent { number, recipient, copies, .. } => {
            format!("{number} to {recipient}{}", if *copies > 1 { format!(", {copies} copies") } else { String::new() })
        }
        Act::Withdrawn { number } => number.clone(),
        Act::Decided { number, decision, .. } => {
            let word = serde_json::to_value(decision).ok().and_then(|word| word.as_str().map(String::from));
            format!("{number}: {}", word.unwrap_or_default().replace('_', " "))
        }
    }
}
