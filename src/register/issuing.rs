//! Issuing a report: number, seal, pages without DRAFT, entry, archive.
//!
//! The PDF is written beside the archive first; the entry in the register is the one step that makes it issued; then
//! the PDF takes its name in the archive. A process that dies leaves no entry and no number used, or an entry whose PDF
//! the next one that opens the register gives its name.

use super::audit::attached;
use super::authorise::{Duties, authorisations};
use super::consequences::Hashes;
use super::difference::{Difference, read_results};
use super::entry::{Act, Entry, FileHash, IssuedReport, UsedBlock, written_time};
use super::ledger::{Ledger, archive_path, staged_path};
use super::lodge::{check_lodged, is_report};
use super::requirements::check_requirements;
use super::state::{State, find_report, standings};
use crate::block::Engine;
use crate::diagnostic::{Code, Problem};
use crate::report::change::{Change, ValueChange};
use crate::report::dossier::{Dossier, RESULTS, sha256};
use crate::report::issue::{ISSUE_FORMAT, Issue, ReportKind, Witness};
use crate::report::make_issued;
use std::collections::{BTreeMap, BTreeSet};

/// What is to be issued.
#[derive(Debug, Clone)]
pub struct Order<'o> {
    /// Path of the report record.
    pub report: &'o str,
    /// Who issues it, by role.
    pub who: &'o str,
    pub why: &'o str,
    pub kind: ReportKind,
    /// The number of the report it amends or replaces.
    pub of: Option<&'o str>,
}

/// A report issued.
#[derive(Debug, Clone)]
pub struct Done {
    pub entry: Entry,
    pub number: String,
    pub pages: usize,
    pub seal: String,
    /// Where the PDF is archived.
    pub archived: String,
}

/// Issues a report. Complaints are with the engine; where there is a fault, nothing was issued.
pub fn issue(ledger: &mut Ledger<'_>, engine: &Engine, order: &Order<'_>) -> Option<Done> {
    check_lodged(engine);
    let duties = Duties::read(engine, order.report);
    let made = make_issued(engine, order.report, &mut |dossier| prepare(ledger, engine, order, &duties, dossier));
    let (report, issue) = made?;
    if engine.complaints().has_faults() {
        return None;
    }
    let act = issued_act(ledger, engine, &report.dossier, &issue, &duties, &report.pdf);
    let entered = archive(ledger, act, &issue, order, &report.pdf);
    match entered {
        Ok(entry) => Some(Done {
            entry,
            pages: report.pages,
            seal: report.dossier.seal,
            archived: archive_path(&issue.number),
            number: issue.number,
        }),
        Err(problem) => {
            engine.complain_somewhere(problem, None);
            None
        }
    }
}

/// Everything that is known before the pages are set; nothing where something stands in the way.
fn prepare(
    ledger: &Ledger<'_>,
    engine: &Engine,
    order: &Order<'_>,
    duties: &Duties,
    dossier: &Dossier,
) -> Option<Issue> {
    let now = ledger.store.now();
    check_requirements(engine, &ledger.register, order.report, now.time.date_naive());
    let complain = |problem: Problem| engine.complain_somewhere(problem, None);
    let reports = standings(&ledger.register);
    if let Some(same) = reports.iter().find(|one| one.issued.report == order.report && one.issued.seal == dossier.seal)
    {
        let message =
            format!("The report {} was issued with this very content as {}.", order.report, same.issued.number);
        complain(Problem::new(Code::AlreadyIssued, message).hint(format!(
            "Send the archived file, {}; a copy has the same number.",
            archive_path(&same.issued.number)
        )));
    } else if let Some(earlier) =
        reports.iter().rev().find(|one| one.issued.report == order.report && order.of.is_none())
    {
        let message =
            format!("The report {} was issued as {} with other content.", order.report, earlier.issued.number);
        complain(
            Problem::new(Code::AlreadyIssued, message)
                .hint("A changed report is issued as an amendment or a replacement, from a record of its own."),
        );
    }
    let found = authorisations(&ledger.register, duties, order.report, &dossier.seal);
    let found = found.map_err(complain).ok();
    let change = order.of.map(|of| change(ledger, engine, order, of, duties, dossier));
    let change = change.transpose().map_err(complain).ok().flatten();
    if engine.complaints().has_faults() {
        return None;
    }
    let place = reports.len() as u64 + 1;
    let head = ledger.register.head();
    Some(Issue {
        format: ISSUE_FORMAT,
        number: format!("{}{place:04}", engine.laboratory.number_prefix),
        kind: order.kind,
        of: order.of.map(String::from),
        report: order.report.into(),
        seal: dossier.seal.clone(),
        time: written_time(now.time),
        clock: now.clock,
        issued_by: order.who.into(),
        authorisations: found?,
        register: Witness { size: head.size, head: head.head },
        change,
        engine: crate::VERSION.into(),
    })
}

/// The statement of change against the report that is amended or replaced.
fn change(
    ledger: &Ledger<'_>,
    engine: &Engine,
    order: &Order<'_>,
    of: &str,
    duties: &Duties,
    dossier: &Dossier,
) -> Result<Change, Problem> {
    let standing = find_report(&ledger.register, of)?;
    if standing.state != State::Issued {
        let by = standing.by.map(|by| format!(" by {by}")).unwrap_or_default();
        let problem = Problem::new(Code::ReportUnknown, format!("The report {of} was {}{by}.", standing.state.word()));
        return Err(match standing.by {
            Some(by) => problem.hint(format!("What holds at present is amended or replaced: name {by}.")),
            None => problem.hint("A withdrawn report is followed by a new one: `libripens issue`."),
        });
    }
    let issued = standing.issued;
    let path = archive_path(of);
    let archived = ledger.store.read(&path)?.filter(|bytes| sha256(bytes) == issued.pdf);
    let archived = archived.ok_or_else(|| {
        Problem::new(Code::RegisterDamaged, format!("The archived file {path} is not the one that was issued as {of}."))
            .hint("Put it back from a copy that was sent or saved.")
    })?;
    let unreadable = || Problem::new(Code::PdfUnreadable, format!("The results attached to {path} cannot be read."));
    let then = read_results(&attached(&archived, RESULTS)?).ok_or_else(unreadable)?;
    let now = dossier.files.get(RESULTS).and_then(|bytes| read_results(bytes)).ok_or_else(unreadable)?;
    let files = changed_files(issued, dossier);
    let touched = Hashes::of(engine).touched(issued);
    let mut difference = Difference::between(&then, &now, &issued.results, &touched, engine);
    difference.note_reported((&issued.results, &then), (&duties.results, &now));
    Ok(Change {
        reason: order.why.into(),
        files,
        inputs: difference.inputs.into_iter().chain(difference.superseded).collect(),
        results: difference.results.into_iter().map(ValueChange::in_words).collect(),
        others: difference.others.into_iter().map(ValueChange::in_words).collect(),
        unchanged: difference.unchanged,
    })
}

/// Files of the folder attached to one of the two and not, or not the same, to the other.
fn changed_files(issued: &IssuedReport, dossier: &Dossier) -> Vec<String> {
    let then: BTreeMap<&str, &str> =
        issued.files.iter().map(|file| (file.path.as_str(), file.sha256.as_str())).collect();
    let now: BTreeMap<&str, &str> =
        dossier.contents.files.iter().filter_map(|file| Some((file.path.as_deref()?, file.sha256.as_str()))).collect();
    let all: BTreeSet<&str> = then.keys().chain(now.keys()).copied().collect();
    all.into_iter().filter(|path| then.get(path) != now.get(path)).map(String::from).collect()
}

fn issued_act(
    ledger: &Ledger<'_>,
    engine: &Engine,
    dossier: &Dossier,
    issue: &Issue,
    duties: &Duties,
    pdf: &[u8],
) -> Act {
    let files = dossier
        .contents
        .files
        .iter()
        .filter_map(|file| Some(FileHash { path: file.path.clone()?, sha256: file.sha256.clone() }));
    let blocks = engine.used_blocks().into_iter().filter_map(|name| {
        let kind = engine.blocks().get(&name)?.kind.name.to_string();
        Some(UsedBlock { kind, name })
    });
    Act::Issued(Box::new(IssuedReport {
        number: issue.number.clone(),
        place: standings(&ledger.register).len() as u64 + 1,
        kind: issue.kind,
        of: issue.of.clone(),
        report: issue.report.clone(),
        title: duties.title.clone(),
        seal: issue.seal.clone(),
        pdf: sha256(pdf),
        bytes: pdf.len() as u64,
        files: files.collect(),
        blocks: blocks.collect(),
        seen: seen(engine),
        performed_by: duties.performed_by.clone(),
        results: duties.results.clone(),
        left_out: duties.runs_left_out.clone(),
    }))
}

/// SHA-256 over paths and hashes of all records that the campaign sees, but for those that are reports.
pub fn seen(engine: &Engine) -> String {
    let mut lines: Vec<String> = engine
        .records
        .iter()
        .filter(|record| !is_report(record))
        .map(|record| engine.sources().file(record.file).path.clone())
        .map(|path| format!("{} {path}\n", engine.original(&path).map(|bytes| sha256(&bytes)).unwrap_or_default()))
        .collect();
    lines.sort();
    sha256(lines.concat().as_bytes())
}

fn archive(ledger: &mut Ledger<'_>, act: Act, issue: &Issue, order: &Order<'_>, pdf: &[u8]) -> Result<Entry, Problem> {
    let staged = staged_path(&issue.number);
    ledger.store.write(&staged, pdf)?;
    let entry = ledger.enter(act, order.who, order.why)?;
    ledger.store.rename(&staged, &archive_path(&issue.number))?;
    Ok(entry)
}
