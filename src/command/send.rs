//! `send`: record to whom an issued report went.

use super::folder::Folder;
use super::vault::Vault;
use super::{Outcome, Stopped, disk, terminal};
use crate::block::Engine;
use crate::register::Ledger;
use crate::register::entry::Act;
use crate::register::ledger::archive_path;
use crate::register::people::acting;
use crate::register::state::{State, find_report};
use crate::register::store::Store;
use crate::report::dossier::sha256;
use std::path::PathBuf;

/// Records the sending of an issued report: recipient, the exact file, date and number of copies. With --output it also
/// writes the archived file out, byte for byte. The program itself sends nothing.
#[derive(Debug, clap::Args)]
pub struct Send {
    /// The number of the report
    number: String,
    /// The laboratory folder, or any place in it
    #[arg(default_value = ".")]
    folder: PathBuf,
    /// To whom
    #[arg(long, value_name = "RECIPIENT")]
    to: String,
    /// Who sends it, by role
    #[arg(long = "as", value_name = "ROLE")]
    who: String,
    /// How many copies
    #[arg(long, default_value_t = 1, value_parser = clap::value_parser!(u64).range(1..=1000))]
    copies: u64,
    /// A remark for the register
    #[arg(long, default_value = "as ordered")]
    why: String,
    /// Write the file to be sent here
    #[arg(short, long)]
    output: Option<PathBuf>,
}

impl Send {
    /// Runs the command.
    pub fn run(self) -> Result<Outcome, Stopped> {
        let folder = Folder::find(&self.folder)?;
        let vault = Vault::open(&folder.root)?;
        let engine = Engine::read(&folder.disk, None).map_err(Stopped::because)?;
        let person = match acting(&engine, &self.who, None, vault.now().time.date_naive()) {
            Ok(person) => person,
            Err(problem) => return Ok(terminal::refuse_for(&engine, problem)),
        };
        let mut ledger = match Ledger::open(&vault) {
            Ok(ledger) => ledger,
            Err(problem) => return Ok(terminal::refuse_for(&engine, problem)),
        };
        let standing = match find_report(&ledger.register, &self.number) {
            Ok(standing) => standing,
            Err(problem) => return Ok(terminal::refuse_for(&engine, problem)),
        };
        if matches!(standing.state, State::Withdrawn | State::Replaced) {
            let by = standing.by.map(|by| format!(" by {by}")).unwrap_or_default();
            return Err(Stopped(format!(
                "report {} was {}{by} and is not sent any more",
                self.number,
                standing.state.word()
            )));
        }
        let path = archive_path(&self.number);
        let bytes = vault.read(&path).map_err(Stopped::because)?.unwrap_or_default();
        let (pdf, length) = (standing.issued.pdf.clone(), standing.issued.bytes);
        if sha256(&bytes) != pdf {
            return Err(Stopped(format!("{path} is not the file that was issued as {}; it is not sent", self.number)));
        }
        if let Some(output) = &self.output {
            disk::write_whole(output, &bytes)?;
        }
        let act = Act::Sent {
            number: self.number.clone(),
            recipient: self.to.clone(),
            pdf,
            bytes: length,
            copies: self.copies,
        };
        match ledger.enter(act, &person.role, &self.why) {
            Ok(entry) => terminal::print(&format!(
                "{}: {} to {}, {} bytes (entry {})\n",
                self.number,
                if self.copies == 1 { "1 copy".into() } else { format!("{} copies", self.copies) },
                self.to,
                bytes.len(),
                entry.sequence
            )),
            Err(problem) => return Ok(terminal::refuse_for(&engine, problem)),
        }
        Ok(Outcome::AllWell)
    }
}
