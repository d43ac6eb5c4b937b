//! `examine`: complaints only.

use super::folder::Folder;
use super::{Outcome, Stopped, terminal};
use std::path::PathBuf;

/// Reads the records, builds everything they compute, and prints what is wrong: file, line and column, the
/// marked line, what was expected, and how to mend it.
#[derive(Debug, clap::Args)]
pub struct Examine {
    /// The laboratory folder, or any place in it; a campaign's folder examines that campaign with the shared records
    #[arg(default_value = ".")]
    folder: PathBuf,
}

impl Examine {
    /// Runs the command.
    pub fn run(self) -> Result<Outcome, Stopped> {
        let folder = Folder::find(&self.folder)?;
        let progress = terminal::progress("examining the records");
        let engine = crate::reduce(&folder.disk, folder.campaign.as_deref()).map_err(Stopped::because)?;
        crate::report::examine_reports(&engine);
        progress.finish_and_clear();
        let complaints = engine.complaints();
        terminal::print(&terminal::complaints_text(&engine, &complaints));
        if complaints.list.is_empty() {
            let records = terminal::counted(engine.records.len(), "record");
            let blocks = terminal::counted(engine.blocks().len(), "measurement block");
            terminal::print(&format!("{records}, {blocks}: nothing to complain of.\n"));
        }
        Ok(terminal::outcome(&complaints))
    }
}
