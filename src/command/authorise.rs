//! `authorise`: record the review or authorisation of a report as it stands now.

use super::folder::Folder;
use super::vault::Vault;
use super::{Outcome, Stopped, terminal};
use crate::block::Engine;
use crate::register::authorise::{Duties, duty_of, may_do, on_file, standing_words};
use crate::register::entry::{Act, Duty};
use crate::register::store::Store;
use crate::register::{Ledger, check_lodged};
use crate::report::dossier::short_seal;
use crate::report::make_report;
use std::path::PathBuf;

/// Re-runs every computation of a report and records that the person has reviewed or authorised exactly this content,
/// by its seal. Any later change of a record, raw data, template or prose gives another seal and so voids the entry.
#[derive(Debug, clap::Args)]
pub struct Authorise {
    /// The report record
    report: PathBuf,
    /// Who reviews or authorises, by role
    #[arg(long = "as", value_name = "ROLE")]
    who: String,
    /// Record a review, also where the role may authorise
    #[arg(long)]
    review: bool,
    /// The seal that was read, as printed on the draft; refused if the report has another by now
    #[arg(long, value_name = "SEAL")]
    seal: Option<String>,
    /// A remark for the register
    #[arg(long, default_value = "read and found in order")]
    why: String,
}

impl Authorise {
    /// Runs the command.
    pub fn run(self) -> Result<Outcome, Stopped> {
        let folder = Folder::find_report(&self.report)?;
        let vault = Vault::open(&folder.root)?;
        let path = folder.place.as_str();
        let progress = terminal::progress("making the report");
        let engine = Engine::read(&folder.disk, folder.campaign.as_deref()).map_err(Stopped::because)?;
        let made = make_report(&engine, path);
        check_lodged(&engine);
        progress.finish_and_clear();
        let Some(report) = made.filter(|_| !engine.complaints().has_faults()) else {
            return Ok(terminal::refuse(&engine, Vec::new()));
        };
        let mut ledger = match Ledger::open(&vault) {
            Ok(ledger) => ledger,
            Err(problem) => return Ok(terminal::refuse(&engine, vec![problem])),
        };
        let (day, duties) = (vault.now().time.date_naive(), Duties::read(&engine, path));
        let seal = report.dossier.seal;
        if let Some(read) = self.seal.as_deref().filter(|read| !is_same_seal(read, &seal)) {
            return Err(Stopped(format!(
                "{path} has the seal {} now, not {read}: the content has changed since it was read",
                short_seal(&seal)
            )));
        }
        let duty = if self.review { Duty::Review } else { duty_of(&engine, &duties, &self.who, day) };
        let person = match may_do(&engine, &duties, duty, &self.who, day) {
            Ok(person) => person,
            Err(problem) => return Ok(terminal::refuse(&engine, vec![problem])),
        };
        let is_known = on_file(&ledger.register, path)
            .iter()
            .any(|(entry, sealed, done)| *sealed == seal && *done == duty && entry.who == person.role);
        if !is_known {
            let act = Act::Authorised { report: path.into(), seal: seal.clone(), duty };
            if let Err(problem) = ledger.enter(act, &person.role, &self.why) {
                return Ok(terminal::refuse(&engine, vec![problem]));
            }
        }
        let mut said = format!("{path}, seal {}:\n", short_seal(&seal));
        for line in standing_words(&ledger.register, path, &seal) {
            said += &format!("  {line}\n");
        }
        terminal::print(&said);
        Ok(terminal::say_complaints(&engine))
    }
}

/// Whether a seal as printed or written out is this one.
fn is_same_seal(read: &str, seal: &str) -> bool {
    let digits: String = read.chars().filter(|c| !c.is_whitespace()).collect();
    digits.len() >= 16 && seal.starts_with(&digits.to_lowercase())
}
