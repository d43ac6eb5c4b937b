//! `report`: a draft PDF with its dossier.

use super::folder::Folder;
use super::{Outcome, Stopped, disk, terminal};
use crate::block::Engine;
use crate::register::authorise::standing_words;
use crate::register::lodge::register_of;
use crate::report::{make_report, report_records};
use std::path::{Path, PathBuf};

/// Re-runs every computation a report rests on and typesets it as a draft PDF (exported as PDF/A-3 and PDF/UA-1), with
/// every record, raw data file and result attached. A result that is missing leaves a marked gap and exit status 1.
#[derive(Debug, clap::Args)]
pub struct Report {
    /// A report record, or a folder that holds one or several
    #[arg(default_value = ".")]
    record: PathBuf,
    /// Where to write the PDF; beside the report record, under its name, unless given
    #[arg(short, long)]
    output: Option<PathBuf>,
}

impl Report {
    /// Runs the command.
    pub fn run(self) -> Result<Outcome, Stopped> {
        let folder = Folder::find(&self.record)?;
        let progress = terminal::progress("making the report");
        let survey = Engine::read(&folder.disk, folder.campaign.as_deref()).map_err(Stopped::because)?;
        let wanted: Vec<String> =
            report_records(&survey).into_iter().filter(|path| is_within(path, &folder.place)).collect();
        if wanted.is_empty() {
            progress.finish_and_clear();
            let outcome = terminal::say_complaints(&survey);
            terminal::say(&format!("No record under {} has `report:` in its front matter.\n", self.record.display()));
            return if outcome == Outcome::Faults {
                Ok(outcome)
            } else {
                Err(Stopped::because("there is no report to make"))
            };
        }
        if wanted.len() > 1 && self.output.is_some() {
            return Err(Stopped(format!(
                "{} reports would be written to one file; name one report record",
                wanted.len()
            )));
        }
        let mut outcome = Outcome::AllWell;
        for path in &wanted {
            if self.make(&folder, path)? == Outcome::Faults {
                outcome = Outcome::Faults;
            }
        }
        progress.finish_and_clear();
        Ok(outcome)
    }

    fn make(&self, folder: &Folder, path: &str) -> Result<Outcome, Stopped> {
        let campaign = campaign_of(path);
        let engine = Engine::read(&folder.disk, campaign.as_deref()).map_err(Stopped::because)?;
        let made = make_report(&engine, path);
        crate::register::check_lodged(&engine);
        let outcome = terminal::say_complaints(&engine);
        let Some(report) = made else {
            terminal::say(&format!("{path}: no PDF could be made.\n"));
            return Ok(Outcome::Faults);
        };
        let target = self.output.clone().unwrap_or_else(|| folder.root.join(path).with_extension("pdf"));
        disk::write_whole(&target, &report.pdf)?;
        let shown = shown_path(&target);
        terminal::print(&format!(
            "{shown}: draft, {} pages, {} attached files, seal {}\n",
            report.pages,
            report.dossier.files.len(),
            crate::report::dossier::short_seal(&report.dossier.seal)
        ));
        if let Some(register) = register_of(&engine) {
            for line in standing_words(&register, path, &report.dossier.seal) {
                terminal::print(&format!("  {line}\n"));
            }
        }
        Ok(outcome)
    }
}

fn shown_path(path: &Path) -> String {
    let here = std::env::current_dir().ok().and_then(|here| here.canonicalize().ok());
    let relative = here.and_then(|here| path.strip_prefix(here).ok().map(Path::to_path_buf));
    relative.unwrap_or_else(|| path.to_path_buf()).display().to_string()
}

/// The campaign a record belongs to.
pub fn campaign_of(path: &str) -> Option<String> {
    match path.split('/').collect::<Vec<_>>().as_slice() {
        ["campaigns", name, _, ..] => Some((*name).to_string()),
        _ => None,
    }
}

fn is_within(path: &str, place: &str) -> bool {
    place.is_empty() || path == place || path.strip_prefix(place).is_some_and(|rest| rest.starts_with('/'))
}
