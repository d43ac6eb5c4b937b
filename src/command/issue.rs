//! `issue`: give an authorised report its number and its final form.

use super::folder::Folder;
use super::vault::Vault;
use super::{Outcome, Stopped, disk, terminal};
use crate::block::Engine;
use crate::register::Ledger;
use crate::register::issuing::{Order, issue};
use crate::register::people::acting;
use crate::register::store::Store;
use crate::report::dossier::short_seal;
use crate::report::issue::ReportKind;
use std::path::PathBuf;

/// Issues a report that was reviewed and authorised as it stands: the next number of the series, pages without DRAFT,
/// an entry in the register, the exact file in the archive. Refused while anything is open: a complaint, content that
/// is missing without a reason, a run of the same item left out without one, records never lodged.
#[derive(Debug, clap::Args)]
pub struct Issue {
    /// The report record
    report: PathBuf,
    /// Who issues, by role
    #[arg(long = "as", value_name = "ROLE")]
    who: String,
    /// A remark for the register
    #[arg(long, default_value = "authorised")]
    why: String,
    /// Write a copy of the issued PDF here; it is archived in any case
    #[arg(short, long)]
    output: Option<PathBuf>,
}

impl Issue {
    /// Runs the command.
    pub fn run(self) -> Result<Outcome, Stopped> {
        issue_as(&self.report, &self.who, &self.why, self.output.as_deref(), ReportKind::Original, None)
    }
}

/// Issues a report record in one of its forms.
pub fn issue_as(
    report: &std::path::Path,
    who: &str,
    why: &str,
    output: Option<&std::path::Path>,
    kind: ReportKind,
    of: Option<&str>,
) -> Result<Outcome, Stopped> {
    let folder = Folder::find_report(report)?;
    let vault = Vault::open(&folder.root)?;
    let progress = terminal::progress("issuing the report");
    let engine = Engine::read(&folder.disk, folder.campaign.as_deref()).map_err(Stopped::because)?;
    let person = acting(&engine, who, None, vault.now().time.date_naive());
    let opened = Ledger::open(&vault);
    let (person, mut ledger) = match (person, opened) {
        (Ok(person), Ok(ledger)) => (person, ledger),
        (person, opened) => {
            progress.finish_and_clear();
            return Ok(terminal::refuse(&engine, person.err().into_iter().chain(opened.err()).collect()));
        }
    };
    let done = issue(&mut ledger, &engine, &Order { report: &folder.place, who: &person.role, why, kind, of });
    progress.finish_and_clear();
    let Some(done) = done else {
        terminal::say_complaints(&engine);
        terminal::say("Nothing was issued, and no number was used.\n");
        return Ok(Outcome::Faults);
    };
    if let Some(output) = output {
        let bytes = vault.read(&done.archived).map_err(Stopped::because)?.unwrap_or_default();
        disk::write_whole(output, &bytes)?;
    }
    terminal::print(&format!(
        "{}: issued {}, {} pages, seal {}\narchived as {}\nhead {}\n",
        done.number,
        done.entry.time,
        done.pages,
        short_seal(&done.seal),
        done.archived,
        ledger.register.head()
    ));
    Ok(terminal::say_complaints(&engine))
}
