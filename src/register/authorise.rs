//! Review and authorisation of one seal.

use super::chain::Register;
use super::entry::{Act, Duty, Entry};
use super::people::{Person, acting};
use crate::block::{Engine, Fields};
use crate::diagnostic::{Code, Problem};
use crate::report::issue::Authorisation;
use chrono::NaiveDate;

/// Front matter of a report as the register needs it.
#[derive(Debug, Clone, Default, PartialEq, Eq)]
pub struct Duties {
    pub title: String,
    pub performed_by: String,
    pub reviewed_by: Option<String>,
    pub authorised_by: Option<String>,
    pub results: Vec<String>,
    pub runs_left_out: Vec<String>,
}

impl Duties {
    /// Reads the duties from the record at `path`.
    pub fn read(engine: &Engine, path: &str) -> Duties {
        let file = engine.sources().find(path);
        let record = engine.records.iter().find(|record| Some(record.file) == file);
        let front = record.and_then(|record| record.front.as_ref()).map(|node| Fields { node });
        let Some(report) = front.and_then(|front| front.mapping("report")) else { return Duties::default() };
        let text = |name: &str| report.text(name).map(|text| text.text).filter(|text| !text.is_empty());
        Duties {
            title: report.words("title"),
            performed_by: report.words("performed_by"),
            reviewed_by: text("reviewed_by"),
            authorised_by: text("authorised_by"),
            results: report.texts("results").into_iter().map(|text| text.text).collect(),
            runs_left_out: report.mappings("runs_left_out").iter().map(|run| run.words("run")).collect(),
        }
    }

    fn named(&self, duty: Duty) -> Option<&str> {
        match duty {
            Duty::Review => self.reviewed_by.as_deref(),
            Duty::Authorisation => self.authorised_by.as_deref(),
        }
    }
}

/// Who may do this duty for the report on this day, under the role `who`.
///
/// # Errors
/// `person_unauthorised`: unknown, not authorised for the activity, not the person the report names, or the performer
/// where the laboratory does not allow it.
pub fn may_do(engine: &Engine, duties: &Duties, duty: Duty, who: &str, day: NaiveDate) -> Result<Person, Problem> {
    let person = acting(engine, who, Some(duty.activity()), day)?;
    let refuse = |message: String| Err(Problem::new(Code::PersonUnauthorised, message));
    if let Some(named) = duties.named(duty).filter(|named| *named != person.role && *named != person.name) {
        let message = format!("The report is to be {} by the {named}, not by the {}.", duty.done(), person.role);
        return refuse(message).map_err(|problem| {
            problem.hint(format!("Or write another role behind `{}:` of the report.", duty.field()))
        });
    }
    let is_performer = duties.performed_by == person.role || duties.performed_by == person.name;
    if is_performer && !engine.laboratory.performer_may_authorise {
        let message = format!(
            "The {} performed the work, so another person must be the one by whom it is {}.",
            person.role,
            duty.done()
        );
        return refuse(message).map_err(|problem| {
            problem.hint("Where the laboratory's rules allow it, laboratory.md says `performer_may_authorise: yes`.")
        });
    }
    Ok(person)
}

/// The duty that a person with this role has for the report: the one the report names the role for, else the higher
/// one the person is authorised for.
pub fn duty_of(engine: &Engine, duties: &Duties, who: &str, day: NaiveDate) -> Duty {
    if duties.authorised_by.as_deref() == Some(who) {
        return Duty::Authorisation;
    }
    let may_authorise = acting(engine, who, Some(Duty::Authorisation.activity()), day).is_ok();
    match duties.reviewed_by.as_deref() == Some(who) || !may_authorise {
        true => Duty::Review,
        false => Duty::Authorisation,
    }
}

/// Every entry by which somebody reviewed or authorised this report, with its seal and duty.
pub fn on_file<'r>(register: &'r Register, report: &str) -> Vec<(&'r Entry, &'r str, Duty)> {
    let of_report = |entry: &'r Entry| match &entry.act {
        Act::Authorised { report: path, seal, duty } if path == report => Some((entry, seal.as_str(), *duty)),
        _ => None,
    };
    register.entries.iter().filter_map(of_report).collect()
}

/// The reviews and authorisations of this very seal.
///
/// # Errors
/// `not_authorised`, with what is on file instead.
pub fn authorisations(
    register: &Register,
    duties: &Duties,
    report: &str,
    seal: &str,
) -> Result<Vec<Authorisation>, Problem> {
    let on_file = on_file(register, report);
    let of_seal = |duty: Duty| on_file.iter().rev().find(|(_, sealed, done)| *sealed == seal && *done == duty);
    let mut found = Vec::new();
    let needed = [(Duty::Review, duties.reviewed_by.is_some()), (Duty::Authorisation, true)];
    for (duty, _) in needed.iter().filter(|(_, is_needed)| *is_needed) {
        let Some((entry, ..)) = of_seal(*duty) else {
            let other = on_file.iter().rev().find(|(_, _, done)| done == duty);
            return Err(match other {
                Some((entry, sealed, _)) => Problem::new(
                    Code::NotAuthorised,
                    format!(
                        "The report {report} with seal {} is not {}: the entry on file ({}, {}) is for seal {}, and the content has changed since.",
                        &seal[..16], duty.done(), entry.who, entry.time, &sealed[..sealed.len().min(16)]
                    ),
                ),
                None => Problem::new(
                    Code::NotAuthorised,
                    format!("The report {report} with seal {} is not {}.", &seal[..16], duty.done()),
                ),
            }
            .hint(format!("`libripens authorise {report} --as ROLE`, once the draft as it stands now has been read.")));
        };
        found.push(Authorisation {
            duty: *duty,
            who: entry.who.clone(),
            time: entry.time.clone(),
            entry: entry.sequence,
        });
    }
    Ok(found)
}

/// What is on file for a report as it stands now, a line each: what holds, and what is void.
pub fn standing_words(register: &Register, report: &str, seal: &str) -> Vec<String> {
    let word = |(entry, sealed, duty): &(&Entry, &str, Duty)| {
        let what = format!("{} by the {} at {} (entry {})", duty.done(), entry.who, entry.time, entry.sequence);
        match *sealed == seal {
            true => what,
            false => format!("void, for the content has changed since: {what}"),
        }
    };
    on_file(register, report).iter().map(word).collect()
}
