//! The audit of a report from its PDF alone.
//!
//! One line a check, each passed, failed or not checked with the reason; never one verdict over all. The records and
//! raw data come from the PDF's own attachments; every computation is re-run and the pages are set anew.

use super::pdf_file::{PdfFile, read_pdf};
use super::present::{Against, check_issue, check_records, check_register};
use crate::block::Engine;
use crate::diagnostic::Problem;
use crate::intake::MemoryIntake;
use crate::report::dossier::{CONTENTS, Contents, DERIVATION, ISSUE, RESULTS, sha256, short_seal};
use crate::report::{Issue, Report, make_issued, make_report};
use serde::Serialize;
use std::collections::BTreeMap;

/// How a check ended.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize)]
#[serde(rename_all = "snake_case")]
pub enum Verdict {
    Passed,
    Failed,
    NotChecked,
}

impl Verdict {
    /// The word printed before a check.
    pub fn word(self) -> &'static str {
        match self {
            Verdict::Passed => "passed",
            Verdict::Failed => "failed",
            Verdict::NotChecked => "not checked",
        }
    }
}

/// One check.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct Check {
    /// What was checked, in a word or two.
    pub what: &'static str,
    pub verdict: Verdict,
    /// What was found.
    pub says: String,
}

/// The checks of one report, in order.
#[derive(Debug, Clone, Default, PartialEq, Serialize)]
pub struct Audit {
    pub checks: Vec<Check>,
}

/// What an audit of this kind cannot say.
pub const CANNOT_SAY: &str = "An audit cannot say that the readings are true, that the items are unchanged since, or that a report \
    was not made anew as a whole: for that, compare the seal with the one the laboratory keeps.";

impl Audit {
    pub(super) fn note(&mut self, what: &'static str, passed: bool, says: impl Into<String>) {
        let verdict = if passed { Verdict::Passed } else { Verdict::Failed };
        self.checks.push(Check { what, verdict, says: says.into() });
    }

    pub(super) fn skip(&mut self, what: &'static str, why: &str) {
        self.checks.push(Check { what, verdict: Verdict::NotChecked, says: why.into() });
    }

    /// Whether no check failed.
    pub fn is_clean(&self) -> bool {
        self.checks.iter().all(|check| check.verdict != Verdict::Failed)
    }
}

/// Audits a report from the bytes of its PDF.
///
/// # Errors
/// When the bytes are no PDF that can be read.
pub fn audit_report(bytes: &[u8]) -> Result<Audit, Problem> {
    audit_against(bytes, &Against::default())
}

/// Audits a report from the bytes of its PDF, and against the register and the records of the laboratory.
///
/// # Errors
/// When the bytes are no PDF that can be read.
pub fn audit_against(bytes: &[u8], against: &Against<'_>) -> Result<Audit, Problem> {
    let file = read_pdf(bytes)?;
    let mut audit = Audit::default();
    check_form(&file, &mut audit);
    let Some(contents) = check_contents(&file, &mut audit) else {
        for what in
            ["seal", "issue", "register", "status", "re-reduction", "printed digits", "derivation", "pages", "records"]
        {
            audit.skip(what, "there is no usable list of contents");
        }
        return Ok(audit);
    };
    check_seal(&file, &contents, &mut audit);
    let issue = check_issue(&file, &mut audit);
    check_register(bytes, issue.as_ref(), against, &mut audit);
    check_recomputation(bytes, &file, &contents, issue.as_ref(), &mut audit);
    check_records(&file, &contents, against, &mut audit);
    Ok(audit)
}

/// The original files of a report by their path in the laboratory folder.
///
/// # Errors
/// When the bytes are no PDF that can be read, or it has no list of contents.
pub fn originals(bytes: &[u8]) -> Result<BTreeMap<String, Vec<u8>>, Problem> {
    let file = read_pdf(bytes)?;
    let contents = read_contents(&file).map_err(|reason| Problem::new(crate::diagnostic::Code::FileMissing, reason))?;
    Ok(files_by_path(&file, &contents))
}

/// One attached file of a report, by the name it is attached under.
///
/// # Errors
/// When the bytes are no PDF that can be read, or nothing is attached under this name.
pub fn attached(bytes: &[u8], name: &str) -> Result<Vec<u8>, Problem> {
    let missing = || Problem::new(crate::diagnostic::Code::FileMissing, format!("{name} is not attached."));
    read_pdf(bytes)?.attachments.remove(name).ok_or_else(missing)
}

/// Damage or extras in the file itself.
fn check_form(file: &PdfFile, audit: &mut Audit) {
    audit.note(
        "single revision",
        file.revisions == 1 && !file.trailing_bytes,
        match (file.revisions, file.trailing_bytes) {
            (1, false) => "one revision, nothing behind it".to_string(),
            (1, true) => "bytes stand behind the end of the file".to_string(),
            (count, _) => format!("{count} revisions; a report has one"),
        },
    );
    let found: Vec<&str> = [
        (file.scripts, "scripts"),
        (file.forms, "form fields"),
        (file.optional_content, "layers that can be hidden"),
        (file.other_annotations, "annotations other than links"),
    ]
    .iter()
    .filter(|(found, _)| *found)
    .map(|(_, word)| *word)
    .collect();
    audit.note(
        "nothing active",
        found.is_empty(),
        match found.is_empty() {
            true => "no scripts, forms, layers or annotations".to_string(),
            false => format!("the file carries {}", found.join(", ")),
        },
    );
}

fn read_contents(file: &PdfFile) -> Result<Contents, String> {
    let bytes = file.attachments.get(CONTENTS).ok_or_else(|| format!("{CONTENTS} is not attached"))?;
    serde_json::from_slice(bytes).map_err(|error| format!("{CONTENTS} cannot be read: {error}"))
}

/// Attachments against their list, both ways.
fn check_contents(file: &PdfFile, audit: &mut Audit) -> Option<Contents> {
    let contents = match read_contents(file) {
        Ok(contents) => contents,
        Err(reason) => {
            audit.note("attachments", false, reason);
            return None;
        }
    };
    let mut faults = Vec::new();
    for entry in &contents.files {
        match file.attachments.get(&entry.name) {
            None => faults.push(format!("{} is listed but not attached", entry.name)),
            Some(bytes) if sha256(bytes) != entry.sha256 => faults.push(format!("{} was changed", entry.name)),
            Some(_) => {}
        }
    }
    let listed =
        |name: &str| name == CONTENTS || name == ISSUE || contents.files.iter().any(|entry| entry.name == name);
    faults.extend(
        file.attachments.keys().filter(|name| !listed(name)).map(|name| format!("{name} is attached but not listed")),
    );
    let count = contents.files.len();
    audit.note(
        "attachments",
        faults.is_empty(),
        match faults.is_empty() {
            true => format!("{count} of {count} attached files match the list"),
            false => faults.join("; "),
        },
    );
    Some(contents)
}

fn check_seal(file: &PdfFile, contents: &Contents, audit: &mut Audit) {
    let seal = file.attachments.get(CONTENTS).map(|bytes| sha256(bytes)).unwrap_or_default();
    audit.note("seal", true, format!("{seal} (printed as {}), made by version {}", short_seal(&seal), contents.engine));
}

fn files_by_path(file: &PdfFile, contents: &Contents) -> BTreeMap<String, Vec<u8>> {
    let with_path = contents
        .files
        .iter()
        .filter_map(|entry| Some((entry.path.clone()?, file.attachments.get(&entry.name)?.clone())));
    with_path.collect()
}

/// Everything computed and typeset anew from the attachments.
fn check_recomputation(bytes: &[u8], file: &PdfFile, contents: &Contents, issue: Option<&Issue>, audit: &mut Audit) {
    let intake = MemoryIntake::with(files_by_path(file, contents));
    let campaign = campaign_of(&contents.report);
    let made = Engine::read(&intake, campaign.as_deref()).ok().and_then(|engine| {
        let report = match issue {
            None => make_report(&engine, &contents.report),
            Some(issue) => {
                make_issued(&engine, &contents.report, &mut |_| Some(issue.clone())).map(|(report, _)| report)
            }
        };
        let complaints = engine.complaints();
        report.map(|report| (report, complaints.has_faults()))
    });
    let Some((report, faulty)) = made else {
        audit.note("re-reduction", false, format!("no report can be made of the attached record {}", contents.report));
        audit.skip("printed digits", "no report can be made");
        audit.skip("derivation", "no report can be made");
        audit.skip("pages", "no report can be made");
        return;
    };
    check_results(file, &report, faulty, audit);
    check_derivation(file, &report, contents, audit);
    check_pages(bytes, file, &report, contents, audit);
}

/// What a results file says of one quantity, for comparison.
#[derive(serde::Deserialize)]
struct Said {
    name: String,
    value: Option<f64>,
    standard_uncertainty: Option<f64>,
    printed: String,
}

#[derive(serde::Deserialize)]
struct SaidResults {
    quantities: Vec<Said>,
}

fn said(bytes: Option<&Vec<u8>>) -> Option<BTreeMap<String, Said>> {
    let results: SaidResults = serde_json::from_slice(bytes?).ok()?;
    Some(results.quantities.into_iter().map(|said| (said.name.clone(), said)).collect())
}

fn check_results(file: &PdfFile, report: &Report, faulty: bool, audit: &mut Audit) {
    let (Some(attached), Some(found)) = (said(file.attachments.get(RESULTS)), said(report.dossier.files.get(RESULTS)))
    else {
        audit.note("re-reduction", false, format!("{RESULTS} is missing or cannot be read"));
        audit.skip("printed digits", "there are no attached results");
        return;
    };
    let mut largest = 0.0f64;
    let mut differing = Vec::new();
    let mut digits = Vec::new();
    for (name, ours) in &found {
        let Some(theirs) = attached.get(name) else {
            differing.push(name.as_str());
            continue;
        };
        let apart =
            departure(ours.value, theirs.value).max(departure(ours.standard_uncertainty, theirs.standard_uncertainty));
        largest = largest.max(apart);
        if apart > 0.0 {
            differing.push(name);
        }
        if ours.printed != theirs.printed {
            digits.push(format!("{name}: attached {}, found {}", theirs.printed, ours.printed));
        }
    }
    differing.extend(attached.keys().filter(|name| !found.contains_key(*name)).map(String::as_str));
    let count = found.len();
    let equal = count.saturating_sub(differing.len());
    let remark = if faulty { "; the records draw complaints" } else { "" };
    audit.note("re-reduction", differing.is_empty(), match differing.is_empty() {
        true => format!("{count} of {count} quantities re-computed from the attached readings, largest relative difference 0{remark}"),
        false => format!(
            "{equal} of {count} quantities agree, largest relative difference {largest:.1e}; differing: {}{remark}",
            first_few(&differing)
        ),
    });
    audit.note(
        "printed digits",
        digits.is_empty(),
        match digits.is_empty() {
            true => format!("{count} of {count} printed values agree"),
            false => format!(
                "{} differ: {}",
                digits.len(),
                first_few(&digits.iter().map(String::as_str).collect::<Vec<_>>())
            ),
        },
    );
}

fn departure(ours: Option<f64>, theirs: Option<f64>) -> f64 {
    match (ours, theirs) {
        (Some(ours), Some(theirs)) if ours.to_bits() == theirs.to_bits() => 0.0,
        (Some(ours), Some(theirs)) => ((ours - theirs) / ours.abs().max(theirs.abs())).abs().max(f64::MIN_POSITIVE),
        (None, None) => 0.0,
        _ => f64::INFINITY,
    }
}

fn first_few(names: &[&str]) -> String {
    match names.len() {
        0..=5 => names.join(", "),
        count => format!("{} and {} more", names[..5].join(", "), count - 5),
    }
}

fn check_derivation(file: &PdfFile, report: &Report, contents: &Contents, audit: &mut Audit) {
    let same = file.attachments.get(DERIVATION) == report.dossier.files.get(DERIVATION);
    match (same, contents.engine == crate::VERSION) {
        (true, _) => audit.note("derivation", true, "the attached derivation is the one found"),
        (false, true) => audit.note("derivation", false, "the attached derivation differs from the one found"),
        (false, false) => audit.skip("derivation", "the report was made by another version of the program"),
    }
}

fn check_pages(bytes: &[u8], file: &PdfFile, report: &Report, contents: &Contents, audit: &mut Audit) {
    if bytes == report.pdf {
        audit.note(
            "pages",
            true,
            format!("{} pages set anew from the attachments: the same PDF, byte for byte", report.pages),
        );
        return;
    }
    if contents.engine != crate::VERSION {
        audit.skip("pages", &format!("the report was made by version {}, this is {}", contents.engine, crate::VERSION));
        return;
    }
    let at = bytes.iter().zip(&report.pdf).position(|(a, b)| a != b).unwrap_or(bytes.len().min(report.pdf.len()));
    let cause = if file.attachments == report.attached() {
        "the attachments are those of the report, so pages or structure were altered"
    } else {
        "the attachments differ as well"
    };
    audit.note(
        "pages",
        false,
        format!(
            "the PDF set anew differs from byte {at} on ({} pages there, {} here); {cause}",
            report.pages, file.pages
        ),
    );
}

fn campaign_of(path: &str) -> Option<String> {
    match path.split('/').collect::<Vec<_>>().as_slice() {
        ["campaigns", name, _, ..] => Some((*name).to_string()),
        _ => None,
    }
}
