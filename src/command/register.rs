//! `register`: what was issued and how it stands; every entry; whether the register holds together.

use super::folder::Folder;
use super::{Outcome, Stopped, terminal};
use crate::intake::Intake;
use crate::register::state::{Filter, Standing, State, entry_words, standings};
use crate::register::tree::{Head, consistency_proof, hex};
use crate::register::verify::verify_against;
use crate::register::{REGISTER, Register as Chain};
use chrono::NaiveDate;
use serde_json::json;
use std::path::PathBuf;

/// Lists issued reports with their state, or with --entries everything entered. --verify checks the whole register and
/// names what is wrong; --against takes a head printed in a report and shows whether the register only grew since.
#[derive(Debug, clap::Args)]
pub struct Register {
    /// The laboratory folder, or any place in it
    #[arg(default_value = ".")]
    folder: PathBuf,
    /// List every entry instead of the reports
    #[arg(long)]
    entries: bool,
    /// Only what rests on, or speaks of, this record or raw data file (path in the laboratory folder)
    #[arg(long, value_name = "PATH")]
    record: Option<String>,
    /// Only reports that rest on this block: an instrument, a standard, an item
    #[arg(long, value_name = "NAME", alias = "instrument", alias = "standard")]
    uses: Option<String>,
    /// Only what this person had a part in, by role
    #[arg(long, value_name = "ROLE")]
    person: Option<String>,
    /// Only from this day on
    #[arg(long, value_name = "DATE")]
    from: Option<NaiveDate>,
    /// Only up to this day
    #[arg(long, value_name = "DATE")]
    to: Option<NaiveDate>,
    /// Only reports in this state
    #[arg(long, value_name = "STATE")]
    state: Option<State>,
    /// Check the register, the kept originals and the archived reports
    #[arg(long)]
    verify: bool,
    /// A head seen earlier, such as 13:9f2c…: check that the register only grew since, and print the proof
    #[arg(long, value_name = "HEAD")]
    against: Option<String>,
    /// Print as JSON
    #[arg(long)]
    json: bool,
}

impl Register {
    /// Runs the command.
    pub fn run(self) -> Result<Outcome, Stopped> {
        let folder = Folder::find(&self.folder)?;
        let bytes = folder.disk.read(REGISTER).map_err(|_| {
            Stopped(format!("{} has no register yet; `libripens lodge` makes its first entry", folder.root.display()))
        })?;
        let register = match Chain::read(&bytes) {
            Ok(register) => register,
            Err(damages) => {
                for damage in &damages {
                    terminal::say(&format!("register_damaged: {}\n", damage.says));
                }
                terminal::say("Put back the last copy of the register that is whole.\n");
                return Ok(Outcome::Faults);
            }
        };
        match (&self.against, self.verify) {
            (Some(head), _) => self.compare(&register, head),
            (None, true) => Ok(verify(&folder, &register)),
            (None, false) => {
                self.list(&register);
                Ok(Outcome::AllWell)
            }
        }
    }

    fn filter(&self) -> Filter {
        Filter {
            record: self.record.clone(),
            block: self.uses.clone(),
            person: self.person.clone(),
            from: self.from.map(|day| day.to_string()),
            to: self.to.map(|day| day.to_string()),
            state: self.state,
        }
    }

    fn list(&self, register: &Chain) {
        let filter = self.filter();
        if self.entries {
            let kept = register.entries.iter().filter(|entry| filter.keeps_entry(entry));
            if self.json {
                let lines: Vec<_> = kept.collect();
                terminal::print(&format!("{}\n", serde_json::to_string_pretty(&lines).unwrap_or_default()));
                return;
            }
            let heads = ["", "time", "who", "what", "of what", "why"].map(String::from).to_vec();
            let rows = kept.map(|entry| {
                let clock = match entry.clock {
                    crate::register::entry::Clock::System => "",
                    crate::register::entry::Clock::Set => " (clock set by hand)",
                };
                vec![
                    entry.sequence.to_string(),
                    format!("{}{clock}", entry.time),
                    entry.who.clone(),
                    entry.word().into(),
                    entry_words(entry),
                    entry.why.clone(),
                ]
            });
            let rows: Vec<Vec<String>> = std::iter::once(heads).chain(rows).collect();
            terminal::print(&terminal::columns(&rows, &[true, false, false, false, false, false]));
        } else {
            let all = standings(register);
            let kept: Vec<&Standing<'_>> = all.iter().filter(|one| filter.keeps(one)).collect();
            match self.json {
                true => terminal::print(&reports_json(&kept)),
                false => terminal::print(&reports_text(&kept)),
            }
        }
        if !self.json {
            terminal::print(&format!("head {}\n", register.head()));
        }
    }

    fn compare(&self, register: &Chain, text: &str) -> Result<Outcome, Stopped> {
        let head: Head = text.parse().map_err(Stopped)?;
        let damages = verify_against(register, &head);
        for damage in &damages {
            terminal::say(&format!("register_damaged: {}\n", damage.says));
        }
        if !damages.is_empty() {
            return Ok(Outcome::Faults);
        }
        let later = register.head();
        let proof: Vec<String> =
            consistency_proof(&register.leaves(), head.size as usize).iter().map(|hash| hex(hash)).collect();
        if self.json {
            let shown = json!({ "earlier": head, "later": later, "proof": proof });
            terminal::print(&format!("{}\n", serde_json::to_string_pretty(&shown).unwrap_or_default()));
        } else {
            let added = later.size - head.size;
            let added = if added == 1 { "1 entry was".into() } else { format!("{added} entries were") };
            terminal::print(&format!(
                "The register holds the {} entries of that head as they were; {added} added since.\n",
                head.size
            ));
            terminal::print(&format!("head {later}\n"));
            for hash in proof {
                terminal::print(&format!("proof {hash}\n"));
            }
        }
        Ok(Outcome::AllWell)
    }
}

/// The register holds together; so must what is kept with it.
fn verify(folder: &Folder, register: &Chain) -> Outcome {
    let faults = crate::register::kept::check_kept(&folder.disk, register);
    for fault in &faults {
        terminal::say(&format!("register_damaged: {}\n", fault.says));
    }
    if !faults.is_empty() {
        return Outcome::Faults;
    }
    let reports = standings(register).len();
    terminal::print(&format!(
        "{} hold together; every kept original and {} archived as entered.\nhead {}\n",
        terminal::counted(register.entries.len(), "entry").replace("entrys", "entries"),
        if reports == 1 { "the 1 report is".into() } else { format!("all {reports} reports are") },
        register.head()
    ));
    Outcome::AllWell
}

fn reports_text(kept: &[&Standing<'_>]) -> String {
    if kept.is_empty() {
        return "No report.\n".into();
    }
    let heads = ["number", "issued", "state", "title", "record"].map(String::from).to_vec();
    let rows = kept.iter().map(|one| {
        let by = one.by.map(|by| format!(" by {by}")).unwrap_or_default();
        let why = one.withdrawn.map(|entry| format!(": {}", entry.why)).unwrap_or_default();
        vec![
            one.issued.number.clone(),
            one.entry.time[..10].to_string(),
            format!("{}{by}{why}", one.state.word()),
            one.issued.title.clone(),
            one.issued.report.clone(),
        ]
    });
    let rows: Vec<Vec<String>> = std::iter::once(heads).chain(rows).collect();
    terminal::columns(&rows, &[false; 5])
}

fn reports_json(kept: &[&Standing<'_>]) -> String {
    let list: Vec<_> = kept
        .iter()
        .map(|one| {
            json!({
                "number": one.issued.number,
                "issued": one.entry.time,
                "state": one.state,
                "by": one.by,
                "kind": one.issued.kind,
                "of": one.issued.of,
                "title": one.issued.title,
                "report": one.issued.report,
                "seal": one.issued.seal,
                "pdf": one.issued.pdf,
                "withdrawn_because": one.withdrawn.map(|entry| entry.why.as_str()),
                "sent_to": one.sent.iter().filter_map(|entry| match &entry.act {
                    crate::register::entry::Act::Sent { recipient, .. } => Some(recipient.as_str()),
                    _ => None,
                }).collect::<Vec<_>>(),
            })
        })
        .collect();
    format!("{}\n", serde_json::to_string_pretty(&list).unwrap_or_default())
}
