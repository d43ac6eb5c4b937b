//! `withdraw`: an issued report no longer holds.

use super::folder::Folder;
use super::vault::Vault;
use super::{Outcome, Stopped, terminal};
use crate::block::Engine;
use crate::register::Ledger;
use crate::register::entry::{Act, Duty};
use crate::register::people::acting;
use crate::register::state::{State, find_report};
use crate::register::store::Store;
use std::path::PathBuf;

/// Withdraws an issued report: its number stays in the register with the reason, and is never given again; its file
/// stays in the archive.
#[derive(Debug, clap::Args)]
pub struct Withdraw {
    /// The number of the report
    number: String,
    /// The laboratory folder, or any place in it
    #[arg(default_value = ".")]
    folder: PathBuf,
    /// Who withdraws it, by role: a person who may authorise reports
    #[arg(long = "as", value_name = "ROLE")]
    who: String,
    /// The reason
    #[arg(long)]
    why: String,
}

impl Withdraw {
    /// Runs the command.
    pub fn run(self) -> Result<Outcome, Stopped> {
        if self.why.trim().is_empty() {
            return Err(Stopped::because("a report is withdrawn for a reason: write it behind --why"));
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
        let sent = match find_report(&ledger.register, &self.number) {
            Ok(standing) if standing.state == State::Withdrawn => {
                return Err(Stopped(format!("report {} was withdrawn already", self.number)));
            }
            Ok(standing) => standing.sent.len(),
            Err(problem) => return Ok(terminal::refuse_for(&engine, problem)),
        };
        match ledger.enter(Act::Withdrawn { number: self.number.clone() }, &person.role, &self.why) {
            Ok(entry) => terminal::print(&format!(
                "{}: withdrawn {} (entry {}); {}\n",
                self.number,
                entry.time,
                entry.sequence,
                match sent {
                    0 => "it was sent to nobody".to_string(),
                    count => format!("it was sent {}; tell who received it", terminal::counted(count, "time")),
                }
            )),
            Err(problem) => return Ok(terminal::refuse_for(&engine, problem)),
        }
        Ok(Outcome::AllWell)
    }
}
