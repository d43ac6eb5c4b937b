//! `lodge`: enter records and raw data as made.

use super::folder::Folder;
use super::vault::{Vault, now};
use super::{Outcome, Stopped, terminal};
use crate::block::Engine;
use crate::register::Ledger;
use crate::register::lodge::{files_to_lodge, lodge};
use crate::register::people::acting;
use std::path::PathBuf;

/// Enters records and the raw data they name into the register as they are made: hash, kept copy, the record's own
/// date and the time of entry. A file changed afterwards is complained of by every run; a change is stated in a
/// `correction` block of another record.
#[derive(Debug, clap::Args)]
pub struct Lodge {
    /// A record, a raw data file or a folder; everything in the laboratory folder unless given
    #[arg(default_value = ".")]
    path: PathBuf,
    /// Who lodges, by role
    #[arg(long = "as", value_name = "ROLE")]
    who: String,
    /// Why now, where that needs a word
    #[arg(long, default_value = "as made")]
    why: String,
}

impl Lodge {
    /// Runs the command.
    pub fn run(self) -> Result<Outcome, Stopped> {
        let folder = Folder::find(&self.path)?;
        let vault = Vault::open(&folder.root)?;
        let engine = Engine::read(&folder.disk, None).map_err(Stopped::because)?;
        let today = now()?.time.date_naive();
        let person = match acting(&engine, &self.who, None, today) {
            Ok(person) => person,
            Err(problem) => return Ok(terminal::refuse(&engine, vec![problem])),
        };
        let unknown = engine.corrections().iter().find_map(|one| acting(&engine, &one.by, None, today).err());
        if let Some(problem) = unknown {
            return Ok(terminal::refuse(&engine, vec![problem]));
        }
        let files = match files_to_lodge(&engine, &folder.place) {
            Ok(files) if files.is_empty() => {
                return Err(Stopped(format!(
                    "{} holds no record and no raw data that a record names",
                    self.path.display()
                )));
            }
            Ok(files) => files,
            Err(problem) => return Ok(terminal::refuse(&engine, vec![problem])),
        };
        let mut ledger = match Ledger::open(&vault) {
            Ok(ledger) => ledger,
            Err(problem) => return Ok(terminal::refuse(&engine, vec![problem])),
        };
        match lodge(&mut ledger, &files, engine.corrections(), &person.role, &self.why) {
            Ok(lodging) => {
                let mut said = String::new();
                for file in &lodging.entered {
                    said += &format!("lodged {}  {}\n", &file.sha256[..16], file.path);
                }
                if lodging.corrections > 0 {
                    said += &format!("{} entered\n", terminal::counted(lodging.corrections, "correction"));
                }
                let (new, known) = (terminal::counted(lodging.entered.len(), "file"), lodging.known);
                said +=
                    &format!("{new} lodged, {known} lodged before and unchanged; head {}\n", ledger.register.head());
                terminal::print(&said);
                Ok(Outcome::AllWell)
            }
            Err(problems) => Ok(terminal::refuse(&engine, problems)),
        }
    }
}
