//! `decide`: what is done about an issued report whose inputs changed.

use super::consequences::{decision_word, find, finding_text};
use super::folder::Folder;
use super::vault::Vault;
use super::{Outcome, Stopped, terminal};
use crate::block::Engine;
use crate::register::Ledger;
use crate::register::entry::{Act, Decision, Duty};
use crate::register::people::acting;
use crate::register::store::Store;
use std::path::PathBuf;

/// Records one decision on what `consequences` finds of a report. It holds for exactly these findings: when the records
/// change again, the report waits for a decision again.
#[derive(Debug, clap::Args)]
pub struct Decide {
    /// The number of the report
    number: String,
    /// What is done
    decision: Decision,
    /// The laboratory folder, or any place in it
    #[arg(default_value = ".")]
    folder: PathBuf,
    /// Who decides, by role: a person who may authorise reports
    #[arg(long = "as", value_name = "ROLE")]
    who: String,
    /// The reason
    #[arg(long)]
    why: String,
}

impl Decide {
    /// Runs the command.
    pub fn run(self) -> Result<Outcome, Stopped> {
        if self.why.trim().is_empty() {
            return Err(Stopped::because("a decision has a reason: write it behind --why"));
        }
        let folder = Folder::find(&self.folder)?;
        let vault = Vault::open(&folder.root)?;
        let engine = Engine::read(&folder.disk, None).map_err(Stopped::because)?;
        let activity = Some(Duty::Authorisation.activity());
        let person = match acting(&engine, &self.who, activity, vault.now().time.date_naive()) {
            Ok(person) => person,
            Err(problem) => return Ok(terminal::refuse_for(&engine, problem)),
        };
        let mut ledger = match Ledger::open(&vault) {
            Ok(ledger) => ledger,
            Err(problem) => return Ok(terminal::refuse_for(&engine, problem)),
        };
        let findings = find(&folder)?;
        let Some(finding) = findings.iter().find(|one| one.number == self.number) else {
            return Err(Stopped(format!(
                "no report {} holds at present; `libripens register` lists them",
                self.number
            )));
        };
        if finding.is_unchanged() {
            return Err(Stopped(format!("nothing changed for report {}: there is nothing to decide", self.number)));
        }
        let (number, findings) = (self.number.clone(), finding.findings.clone());
        match ledger.enter(Act::Decided { number, findings, decision: self.decision }, &person.role, &self.why) {
            Ok(entry) => terminal::print(&format!(
                "{}decided now: {} (entry {})\n",
                finding_text(finding)
                    .lines()
                    .filter(|line| !line.starts_with("  open:"))
                    .fold(String::new(), |all, line| all + line + "\n"),
                decision_word(self.decision),
                entry.sequence
            )),
            Err(problem) => return Ok(terminal::refuse_for(&engine, problem)),
        }
        Ok(Outcome::AllWell)
    }
}
