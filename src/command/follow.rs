//! `amend` and `replace`: an issued report is followed by another form of it.

use super::folder::Folder;
use super::issue::issue_as;
use super::{Outcome, Stopped};
use crate::intake::Intake;
use crate::register::state::find_report;
use crate::register::{REGISTER, Register};
use crate::report::issue::ReportKind;
use std::path::PathBuf;

/// Issues an amendment to a report: a supplement with a number of its own that states every value that changed, old and
/// new, valid only together with the report it names. The report record, re-computed, is authorised first.
#[derive(Debug, clap::Args)]
pub struct Amend {
    #[command(flatten)]
    follow: Follow,
}

/// Issues a complete new report in place of another: a number of its own, the number it replaces, and a statement of
/// every value that changed. The report record, re-computed, is authorised first.
#[derive(Debug, clap::Args)]
pub struct Replace {
    #[command(flatten)]
    follow: Follow,
}

#[derive(Debug, clap::Args)]
struct Follow {
    /// The number of the issued report
    number: String,
    /// The laboratory folder, or any place in it
    #[arg(default_value = ".")]
    folder: PathBuf,
    /// The report record it is made from; that of the issued report unless given
    #[arg(long, value_name = "RECORD")]
    report: Option<PathBuf>,
    /// Who issues, by role
    #[arg(long = "as", value_name = "ROLE")]
    who: String,
    /// The reason of the change, as it is printed
    #[arg(long)]
    why: String,
    /// Write a copy of the issued PDF here; it is archived in any case
    #[arg(short, long)]
    output: Option<PathBuf>,
}

impl Amend {
    /// Runs the command.
    pub fn run(self) -> Result<Outcome, Stopped> {
        self.follow.run(ReportKind::Amendment)
    }
}

impl Replace {
    /// Runs the command.
    pub fn run(self) -> Result<Outcome, Stopped> {
        self.follow.run(ReportKind::Replacement)
    }
}

impl Follow {
    fn run(self, kind: ReportKind) -> Result<Outcome, Stopped> {
        if self.why.trim().is_empty() {
            return Err(Stopped::because("a report is changed for a reason: write it behind --why"));
        }
        let record = match self.report {
            Some(record) => record,
            None => {
                let folder = Folder::find(&self.folder)?;
                let bytes = folder
                    .disk
                    .read(REGISTER)
                    .map_err(|_| Stopped::because("nothing was issued from this folder yet"))?;
                let register = Register::read(&bytes)
                    .map_err(|_| Stopped::because("the register is damaged; `libripens register` names every fault"))?;
                let standing = find_report(&register, &self.number);
                let standing =
                    standing.map_err(|problem| Stopped(format!("{} {}", problem.message, problem.hints.join(" "))))?;
                folder.root.join(&standing.issued.report)
            }
        };
        issue_as(&record, &self.who, &self.why, self.output.as_deref(), kind, Some(&self.number))
    }
}
