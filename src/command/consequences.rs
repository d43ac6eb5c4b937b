//! `consequences`: which issued reports the present records would change.

use super::folder::Folder;
use super::{Outcome, Stopped, terminal};
use crate::diagnostic::{Code, Problem};
use crate::intake::Intake;
use crate::register::audit::attached;
use crate::register::consequences::{Finding, consequences};
use crate::register::difference::{InputChange, ValueChange};
use crate::register::entry::{Decision, IssuedReport};
use crate::register::ledger::archive_path;
use crate::register::{REGISTER, Register};
use crate::report::dossier::sha256;
use std::path::PathBuf;

/// Re-computes every issued report that still holds from the records as they are now: corrected inputs, inputs that a
/// newer certificate supersedes, runs added since. What rests on unchanged files is proven by hash and not re-computed.
/// Exit status 1 while a finding waits for a decision.
#[derive(Debug, clap::Args)]
pub struct Consequences {
    /// The laboratory folder, or any place in it
    #[arg(default_value = ".")]
    folder: PathBuf,
    /// Only this report
    #[arg(long, value_name = "NUMBER")]
    report: Option<String>,
    /// Print as JSON
    #[arg(long)]
    json: bool,
}

impl Consequences {
    /// Runs the command.
    pub fn run(self) -> Result<Outcome, Stopped> {
        let folder = Folder::find(&self.folder)?;
        let progress = terminal::progress("re-computing issued reports");
        let mut findings = find(&folder)?;
        progress.finish_and_clear();
        if let Some(number) = &self.report {
            findings.retain(|one| one.number == *number);
            if findings.is_empty() {
                return Err(Stopped(format!("no report {number} holds at present; `libripens register` lists them")));
            }
        }
        match self.json {
            true => terminal::print(&format!("{}\n", serde_json::to_string_pretty(&findings).unwrap_or_default())),
            false => terminal::print(&text(&findings)),
        }
        Ok(if findings.iter().any(Finding::is_open) { Outcome::Faults } else { Outcome::AllWell })
    }
}

/// One finding for every report of a folder that holds at present.
pub fn find(folder: &Folder) -> Result<Vec<Finding>, Stopped> {
    let bytes = folder.disk.read(REGISTER).map_err(|_| Stopped::because("nothing was issued from this folder yet"))?;
    let register = Register::read(&bytes).map_err(|damages| {
        Stopped(damages.first().map_or_else(|| "the register is damaged".into(), |damage| damage.says.clone()))
    })?;
    let archived = |issued: &IssuedReport, name: &str| archived(folder, issued, name);
    consequences(&folder.disk, &register, &archived, &mut |_, _| {}).map_err(Stopped::because)
}

fn archived(folder: &Folder, issued: &IssuedReport, name: &str) -> Result<Vec<u8>, Problem> {
    let path = archive_path(&issued.number);
    let bytes = folder.disk.read(&path).map_err(|error| Problem::new(Code::FileMissing, error.to_string()))?;
    if sha256(&bytes) != issued.pdf {
        return Err(Problem::new(Code::RegisterDamaged, format!("{path} is not the file that was issued.")));
    }
    attached(&bytes, name)
}

fn text(findings: &[Finding]) -> String {
    if findings.is_empty() {
        return "No issued report holds at present.\n".into();
    }
    let unchanged = findings.iter().filter(|one| one.is_unchanged()).count();
    let by_hash = findings.iter().filter(|one| one.proven_by_hash).count();
    let mut said = String::new();
    for one in findings.iter().filter(|one| !one.is_unchanged()) {
        said += &finding_text(one);
        said.push('\n');
    }
    said + &format!(
        "{} hold at present: {} changed, {unchanged} not ({by_hash} proven by hash).\n",
        terminal::counted(findings.len(), "report"),
        findings.len() - unchanged
    )
}

/// A finding as a person reads it.
pub fn finding_text(one: &Finding) -> String {
    let sent =
        if one.sent_to.is_empty() { "sent to nobody".into() } else { format!("sent to {}", one.sent_to.join(", ")) };
    let mut said = format!("{}, {}, issued {}, {sent}\n", one.number, one.title, &one.issued[..10]);
    if let Some(reason) = &one.failed {
        said += &format!("  not re-computed: {reason}\n");
    }
    let inputs = |word: &str, list: &[InputChange]| -> String {
        list.iter().map(|one| format!("  {word}: {}, {} to {} ({})\n", one.name, one.old, one.new, one.place)).collect()
    };
    said += &inputs("input changed", &one.difference.inputs);
    said += &inputs("input superseded", &one.difference.superseded);
    for run in &one.runs_added {
        said += &format!("  run added since: {run}\n");
    }
    for change in &one.difference.results {
        said += &format!("  result {}\n", change_text(change));
    }
    for change in &one.difference.others {
        said += &format!("  also {}\n", change_text(change));
    }
    if !one.difference.unchanged.is_empty() {
        said += &format!("  unchanged results: {}\n", one.difference.unchanged.join(", "));
    }
    said + &match &one.decision {
        Some(decided) => format!(
            "  decided {} by the {}: {} ({})\n",
            &decided.time[..10],
            decided.who,
            decision_word(decided.decision),
            decided.why
        ),
        None => format!("  open: `libripens decide {} --as ROLE DECISION --why REASON`\n", one.number),
    }
}

fn change_text(change: &ValueChange) -> String {
    let relative = change.relative_to_uncertainty.map(|ratio| format!(", {ratio:+.2} u")).unwrap_or_default();
    let uncertainty = change
        .uncertainty_ratio
        .filter(|ratio| (ratio - 1.0).abs() > 5e-4)
        .map(|ratio| format!(", u changed by {:+.1} %", 100.0 * (ratio - 1.0)))
        .unwrap_or_default();
    let digits = if change.printed_digits_change { "" } else { ", printed digits unchanged" };
    let because = match change.because_of.as_slice() {
        [] => String::new(),
        names => format!("; because of {}", names.join(", ")),
    };
    format!("{}: {} to {}{relative}{uncertainty}{digits}{because}", change.name, change.old, change.new)
}

/// A decision in words.
pub fn decision_word(decision: Decision) -> &'static str {
    match decision {
        Decision::NoAction => "no action",
        Decision::Amendment => "amendment",
        Decision::Replacement => "replacement",
        Decision::Withdrawal => "withdrawal",
    }
}
