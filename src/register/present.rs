//! A report against what the laboratory has now: its register and its records.

use super::audit::Audit;
use super::chain::Register;
use super::entry::Act;
use super::pdf_file::PdfFile;
use super::state::{State, find_report};
use super::tree::Head;
use super::verify::verify_against;
use crate::intake::Intake;
use crate::report::dossier::{CONTENTS, Contents, ISSUE, sha256, short_seal};
use crate::report::issue::{Clock, Issue, ReportKind};

/// What a report is held against besides itself.
#[derive(Default)]
pub struct Against<'a> {
    /// The bytes of the laboratory's register.
    pub register: Option<Vec<u8>>,
    /// The laboratory folder as it stands now.
    pub records: Option<&'a dyn Intake>,
}

/// What the report says of its issue, and whether that is about this dossier.
pub fn check_issue(file: &PdfFile, audit: &mut Audit) -> Option<Issue> {
    let Some(bytes) = file.attachments.get(ISSUE) else {
        audit.skip("issue", "a draft: it carries no number and no authorisation");
        return None;
    };
    let issue: Issue = match serde_json::from_slice(bytes) {
        Ok(issue) => issue,
        Err(error) => {
            audit.note("issue", false, format!("{ISSUE} cannot be read: {error}"));
            return None;
        }
    };
    let seal = file.attachments.get(CONTENTS).map(|bytes| sha256(bytes)).unwrap_or_default();
    if issue.seal != seal {
        let says = format!(
            "{} was authorised with the seal {}, but the attached list of contents has the seal {}",
            issue.number,
            short_seal(&issue.seal),
            short_seal(&seal)
        );
        audit.note("issue", false, says);
        return Some(issue);
    }
    let done = issue.authorisations.iter().map(|one| format!("{} by the {} at {}", one.duty.done(), one.who, one.time));
    let done: Vec<String> = done.collect();
    let clock = if issue.clock == Clock::Set { "; the clock was set by hand" } else { "" };
    let kind = match (issue.kind, &issue.of) {
        (ReportKind::Amendment, Some(of)) => format!(", amendment to {of}"),
        (ReportKind::Replacement, Some(of)) => format!(", in place of {of}"),
        _ => String::new(),
    };
    let says = format!(
        "says of itself: {}{kind}, issued {} by the {}; this seal {}{clock}",
        issue.number,
        issue.time,
        issue.issued_by,
        done.join(", ")
    );
    audit.note("issue", !issue.authorisations.is_empty(), says);
    Some(issue)
}

/// Whether the register knows this very file, and how the report stands.
pub fn check_register(bytes: &[u8], issue: Option<&Issue>, against: &Against<'_>, audit: &mut Audit) {
    let skip = |audit: &mut Audit, why: &str| {
        audit.skip("register", why);
        audit.skip("status", why);
    };
    let Some(kept) = &against.register else { return skip(audit, "no register was given (--register)") };
    let Some(issue) = issue else { return skip(audit, "a draft is not in the register") };
    let register = match Register::read(kept) {
        Ok(register) => register,
        Err(damages) => {
            let says: Vec<String> = damages.into_iter().map(|damage| damage.says).collect();
            audit.note("register", false, says.join(" "));
            audit.skip("status", "the register does not hold together");
            return;
        }
    };
    let faults = register_faults(bytes, issue, &register);
    match find_report(&register, &issue.number) {
        Err(problem) => {
            audit.note("register", false, [faults, vec![problem.message]].concat().join(" "));
            audit.skip("status", "the register does not know the number");
        }
        Ok(standing) => {
            let entry = standing.entry.sequence;
            let held = match faults.is_empty() {
                true => format!(
                    "entry {entry} holds the SHA-256 of exactly this file; the register still has the head printed in it, and {} entries since",
                    register.entries.len() as u64 - issue.register.size
                ),
                false => faults.join(" "),
            };
            audit.note("register", faults.is_empty(), held);
            let by = standing.by.map(|by| format!(" by {by}")).unwrap_or_default();
            let why = standing.withdrawn.map(|entry| format!(" at {}: {}", entry.time, entry.why)).unwrap_or_default();
            let last = register.entries.last().map_or("", |entry| entry.time.as_str());
            let says = match standing.state {
                State::Issued => format!("the present report, as of the last entry of the register, {last}"),
                State::Amended => format!("holds only together with its amendment{by}, as of {last}"),
                state => format!("holds no longer: {}{by}{why}", state.word()),
            };
            audit.note("status", matches!(standing.state, State::Issued | State::Amended), says);
        }
    }
}

fn register_faults(bytes: &[u8], issue: &Issue, register: &Register) -> Vec<String> {
    let head = Head { size: issue.register.size, head: issue.register.head.clone() };
    let mut faults: Vec<String> = verify_against(register, &head).into_iter().map(|damage| damage.says).collect();
    let Ok(standing) = find_report(register, &issue.number) else { return faults };
    let (entry, issued) = (standing.entry, standing.issued);
    let mut differ = |what: &str, there: &str, here: &str| {
        if there != here {
            let says = format!("Entry {} has the {what} {there}, the report {here}.", entry.sequence);
            faults.push(says);
        }
    };
    differ("time", &entry.time, &issue.time);
    differ("seal", &issued.seal, &issue.seal);
    let found = sha256(bytes);
    if issued.pdf != found {
        let (there, here) = (&issued.pdf[..issued.pdf.len().min(16)], &found[..16]);
        faults.push(format!(
            "{} is bound to the file {there}… by entry {}, but this file is {here}….",
            issue.number, entry.sequence
        ));
    }
    for one in &issue.authorisations {
        let on_file = register.entries.get((one.entry as usize).wrapping_sub(1));
        let holds = on_file.is_some_and(|entry| {
            let act = &entry.act;
            let is_this = matches!(act, Act::Authorised { seal, duty, .. } if *seal == issue.seal && *duty == one.duty);
            is_this && entry.who == one.who && entry.time == one.time
        });
        if !holds {
            faults.push(format!(
                "Entry {} does not say that the {} {} this seal.",
                one.entry,
                one.who,
                one.duty.done()
            ));
        }
    }
    faults
}

/// Attached records against those of the laboratory folder.
pub fn check_records(file: &PdfFile, contents: &Contents, against: &Against<'_>, audit: &mut Audit) {
    let Some(records) = against.records else { return audit.skip("records", "no records were given (--records)") };
    let (mut faults, mut same) = (Vec::new(), 0);
    for entry in &contents.files {
        let Some(path) = &entry.path else { continue };
        match (records.read(path), file.attachments.get(&entry.name)) {
            (Ok(now), Some(then)) if now == *then => same += 1,
            (Ok(_), Some(_)) => faults.push(format!("{path} was changed since")),
            // The program's own templates are attached although no folder holds them.
            (Err(_), _) if path.starts_with("templates/") => same += 1,
            (Err(_), _) => faults.push(format!("{path} is gone")),
            (_, None) => faults.push(format!("{path} is not attached")),
        }
    }
    let says = match faults.is_empty() {
        true => format!("{same} of {same} attached files are those of the folder"),
        false => faults.join("; "),
    };
    audit.note("records", faults.is_empty(), says);
}
