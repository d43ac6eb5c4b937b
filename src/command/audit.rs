//! `audit`: does a report prove itself?

use super::folder::Folder;
use super::{Outcome, Stopped, disk, terminal};
use crate::intake::Intake;
use crate::register::audit::CANNOT_SAY;
use crate::register::{Against, Audit as Checks, REGISTER, audit_against, originals};
use std::path::{Path, PathBuf};

/// Checks a report from its PDF alone: attachments against their list, every result re-computed from the attached
/// readings, every page set anew and compared byte for byte. One line a check. Needs no network and no laboratory folder.
#[derive(Debug, clap::Args)]
pub struct Audit {
    /// The report
    pdf: PathBuf,
    /// Print the checks as JSON
    #[arg(long)]
    json: bool,
    /// The laboratory folder whose register, or the register file, the report is held against
    #[arg(long, value_name = "FOLDER", conflicts_with = "extract")]
    register: Option<PathBuf>,
    /// The laboratory folder whose present records the attached ones are held against
    #[arg(long, value_name = "FOLDER", conflicts_with = "extract")]
    records: Option<PathBuf>,
    /// Write the attached records and raw data into this folder, which must not exist, instead of checking
    #[arg(long, value_name = "FOLDER", conflicts_with = "json")]
    extract: Option<PathBuf>,
}

/// A report larger than this is not read.
const LARGEST: u64 = 1 << 30;

impl Audit {
    /// Runs the command.
    pub fn run(self) -> Result<Outcome, Stopped> {
        let bytes = read(&self.pdf)?;
        if let Some(folder) = &self.extract {
            return extract(&bytes, folder);
        }
        let records = self.records.as_deref().map(Folder::find).transpose()?;
        let against = Against {
            register: self.register.as_deref().map(register_bytes).transpose()?,
            records: records.as_ref().map(|folder| &folder.disk as &dyn Intake),
        };
        let progress = terminal::progress("re-computing the report");
        let audit = audit_against(&bytes, &against)
            .map_err(|problem| Stopped(format!("{}: {}", self.pdf.display(), problem.message)))?;
        progress.finish_and_clear();
        match self.json {
            true => terminal::print(&format!("{}\n", serde_json::to_string_pretty(&audit).unwrap_or_default())),
            false => terminal::print(&lines(&audit)),
        }
        Ok(if audit.is_clean() { Outcome::AllWell } else { Outcome::Faults })
    }
}

/// The register of a laboratory folder, or the file given.
fn register_bytes(path: &Path) -> Result<Vec<u8>, Stopped> {
    if path.is_file() {
        return read(path);
    }
    read(&Folder::find(path)?.root.join(REGISTER))
}

fn read(path: &Path) -> Result<Vec<u8>, Stopped> {
    let unreadable = |error: std::io::Error| Stopped(format!("{} cannot be read: {error}", path.display()));
    let size = std::fs::metadata(path).map_err(unreadable)?.len();
    if size > LARGEST {
        return Err(Stopped(format!("{} has {size} bytes; a report has at most {LARGEST}", path.display())));
    }
    std::fs::read(path).map_err(unreadable)
}

fn lines(audit: &Checks) -> String {
    let rows: Vec<Vec<String>> = audit
        .checks
        .iter()
        .map(|check| vec![check.verdict.word().to_string(), check.what.to_string(), check.says.clone()])
        .collect();
    format!("{}\n{CANNOT_SAY}\n", terminal::columns(&rows, &[false, false, false]))
}

/// Writes the original files; nothing is overwritten and nothing leaves the folder.
fn extract(bytes: &[u8], folder: &Path) -> Result<Outcome, Stopped> {
    if folder.exists() {
        return Err(Stopped(format!("{} exists already; name a folder that does not", folder.display())));
    }
    let files = originals(bytes).map_err(|problem| Stopped(problem.message))?;
    let mut written = 0;
    for (path, content) in files.iter().filter(|(path, _)| !path.is_empty()) {
        let inside = crate::block::engine::resolve(path, "").map_err(|problem| Stopped(problem.message))?;
        let target = folder.join(inside);
        let parent = target.parent().unwrap_or(folder);
        std::fs::create_dir_all(parent)
            .map_err(|error| Stopped(format!("{} cannot be made: {error}", parent.display())))?;
        disk::write_whole(&target, content)?;
        written += 1;
    }
    terminal::print(&format!("{}: {written} files as they were attached\n", folder.display()));
    Ok(Outcome::AllWell)
}
