//! Which issued reports the present records would change, and by how much.

use super::chain::Register;
use super::difference::{Difference, Quantities, Touched, present_results, read_results};
use super::entry::{Act, Decision, Entry, IssuedReport};
use super::issuing::seen;
use super::requirements::runs_of;
use super::state::{Standing, State, standings};
use crate::block::Engine;
use crate::diagnostic::Problem;
use crate::intake::{Intake, IntakeError};
use crate::report::dossier::{RESULTS, sha256};
use serde::Serialize;
use std::cell::RefCell;
use std::collections::{BTreeMap, BTreeSet};

/// What became of one issued report.
#[derive(Debug, Clone, Serialize)]
pub struct Finding {
    pub number: String,
    pub title: String,
    pub issued: String,
    pub sent_to: Vec<String>,
    /// Every file it rests on, and every record its campaign saw, is as it was: nothing needed to be re-computed.
    pub proven_by_hash: bool,
    /// Files it rests on whose text is another now.
    pub files_changed: Vec<String>,
    /// Runs of its items that it could not know.
    pub runs_added: Vec<String>,
    pub difference: Difference,
    /// Why it could not be re-computed.
    pub failed: Option<String>,
    /// SHA-256 over what was found; a decision is bound to it.
    pub findings: String,
    pub decision: Option<Decided>,
}

/// A decision on record for these very findings.
#[derive(Debug, Clone, Serialize)]
pub struct Decided {
    pub decision: Decision,
    pub who: String,
    pub time: String,
    pub why: String,
}

impl Finding {
    /// Whether nothing changed.
    pub fn is_unchanged(&self) -> bool {
        self.failed.is_none() && self.runs_added.is_empty() && self.difference.is_empty()
    }

    /// Whether somebody has to decide.
    pub fn is_open(&self) -> bool {
        !self.is_unchanged() && self.decision.is_none()
    }
}

/// Gives an attached file of an archived report by its name.
pub type Archive<'a> = dyn Fn(&IssuedReport, &str) -> Result<Vec<u8>, Problem> + 'a;

/// The reports that hold at present: not withdrawn, not amended or replaced by another.
pub fn present(register: &Register) -> Vec<Standing<'_>> {
    let holds = |one: &Standing<'_>| one.state == State::Issued;
    standings(register).into_iter().filter(holds).collect()
}

/// One finding for every report that holds at present, in the order of issue. `archived` gives the bytes of an attached
/// file of an archived report.
///
/// # Errors
/// When the folder cannot be listed.
pub fn consequences(
    intake: &dyn Intake,
    register: &Register,
    archived: &Archive<'_>,
    progress: &mut dyn FnMut(usize, usize),
) -> Result<Vec<Finding>, IntakeError> {
    let reports = present(register);
    let mut by_campaign: BTreeMap<Option<String>, Vec<usize>> = BTreeMap::new();
    for (index, one) in reports.iter().enumerate() {
        by_campaign.entry(campaign_of(&one.issued.report)).or_default().push(index);
    }
    let mut findings: Vec<(usize, Finding)> = Vec::new();
    for (campaign, indices) in by_campaign {
        let engine = Engine::read(intake, campaign.as_deref())?;
        let seen = seen(&engine);
        let hashes = Hashes::of(&engine);
        let mut changed = Vec::new();
        for index in indices {
            let finding = blank(&reports[index]);
            let files_changed = files_changed(&hashes, reports[index].issued);
            match files_changed.is_empty() && reports[index].issued.seen == seen {
                true => findings.push((index, Finding { proven_by_hash: true, ..finding })),
                false => changed.push((index, Finding { files_changed, ..finding })),
            }
        }
        let then: Vec<_> = changed.iter().map(|(index, _)| then(archived, reports[*index].issued)).collect();
        build(&engine, then.iter().flatten());
        let now = if changed.is_empty() { Quantities::default() } else { present_results(&engine) };
        for ((index, mut finding), then) in changed.into_iter().zip(then) {
            let issued = reports[index].issued;
            finding.runs_added = runs_added(&engine, issued);
            match then {
                Ok(then) => {
                    let touched = hashes.touched(issued);
                    finding.difference = Difference::between(&then, &now, &issued.results, &touched, &engine);
                }
                Err(reason) => finding.failed = Some(reason),
            }
            findings.push((index, finding));
            progress(findings.len(), reports.len());
        }
    }
    findings.sort_by_key(|(index, _)| *index);
    let mut findings: Vec<Finding> = findings.into_iter().map(|(_, finding)| finding).collect();
    for finding in &mut findings {
        bind(finding, register);
    }
    Ok(findings)
}

fn blank(one: &Standing<'_>) -> Finding {
    let recipient = |entry: &&Entry| match &entry.act {
        Act::Sent { recipient, .. } => Some(recipient.clone()),
        _ => None,
    };
    Finding {
        number: one.issued.number.clone(),
        title: one.issued.title.clone(),
        issued: one.entry.time.clone(),
        sent_to: one.sent.iter().filter_map(recipient).collect(),
        proven_by_hash: false,
        files_changed: Vec::new(),
        runs_added: Vec::new(),
        difference: Difference::default(),
        failed: None,
        findings: String::new(),
        decision: None,
    }
}

/// Files whose bytes are others, or which a correction made since touches.
fn files_changed(hashes: &Hashes<'_>, issued: &IssuedReport) -> Vec<String> {
    let touched = hashes.touched(issued);
    let corrected = hashes.engine.corrections().iter().filter(|one| touched.corrections.contains(&one.name));
    let corrected = corrected.map(|one| one.record.clone());
    let corrected = corrected.filter(|path| issued.files.iter().any(|file| file.path == *path));
    let all: BTreeSet<String> = corrected.chain(touched.files.iter().cloned()).collect();
    all.into_iter().collect()
}

/// The hashes of the files of a folder, each taken once however many reports rest on it.
pub struct Hashes<'e> {
    engine: &'e Engine<'e>,
    known: RefCell<BTreeMap<String, Option<String>>>,
}

impl<'e> Hashes<'e> {
    /// The hashes of the files that an engine reads.
    pub fn of(engine: &'e Engine<'e>) -> Hashes<'e> {
        Hashes { engine, known: RefCell::default() }
    }

    fn hash(&self, path: &str) -> Option<String> {
        if let Some(known) = self.known.borrow().get(path) {
            return known.clone();
        }
        let hash = self.engine.original(path).ok().map(|bytes| sha256(&bytes));
        self.known.borrow_mut().insert(path.into(), hash.clone());
        hash
    }

    /// What was touched of the files a report rests on since it was issued.
    pub fn touched(&self, issued: &IssuedReport) -> Touched {
        let paths: BTreeSet<&str> = issued.files.iter().map(|file| file.path.as_str()).collect();
        let is_same = |path: &str, was: &str| match self.hash(path) {
            Some(hash) => hash == was,
            // The program's own templates are attached although no folder holds them.
            None => path.starts_with("templates/"),
        };
        let others =
            issued.files.iter().filter(|file| file.path != issued.report && !is_same(&file.path, &file.sha256));
        let new = self.engine.corrections().iter().filter(|one| !paths.contains(one.stated_in.as_str()));
        Touched {
            files: others.map(|file| file.path.clone()).collect(),
            corrections: new.map(|one| one.name.clone()).collect(),
        }
    }
}

fn then(archived: &Archive<'_>, issued: &IssuedReport) -> Result<Quantities, String> {
    let bytes = archived(issued, RESULTS).map_err(|problem| problem.message)?;
    read_results(&bytes).ok_or_else(|| format!("{RESULTS} of {} cannot be read", issued.number))
}

/// Builds every block that gave a quantity of one of these reports.
fn build<'q>(engine: &Engine, reports: impl Iterator<Item = &'q Quantities>) {
    let names: BTreeSet<&str> =
        reports.flat_map(|one| one.keys()).map(|name| name.split('.').next().unwrap_or_default()).collect();
    for name in names {
        if let Some(block) = engine.blocks().get(name) {
            engine.build(name, block.raw.name.place);
        }
    }
}

fn runs_added(engine: &Engine, issued: &IssuedReport) -> Vec<String> {
    let items: BTreeSet<String> =
        issued.blocks.iter().filter(|block| block.kind == "item").map(|block| block.name.clone()).collect();
    let known = |name: &str| {
        issued.blocks.iter().any(|block| block.name == name) || issued.left_out.iter().any(|run| run == name)
    };
    runs_of(engine, &items).into_iter().filter(|name| !known(name)).collect()
}

/// Hashes what was found and looks for a decision on it.
fn bind(finding: &mut Finding, register: &Register) {
    let found = (&finding.files_changed, &finding.runs_added, &finding.difference, &finding.failed);
    finding.findings = sha256(serde_json::to_string(&found).unwrap_or_default().as_bytes());
    let decided = register.entries.iter().rev().find_map(|entry| match &entry.act {
        Act::Decided { number, findings, decision } if *number == finding.number && *findings == finding.findings => {
            let (who, time, why) = (entry.who.clone(), entry.time.clone(), entry.why.clone());
            Some(Decided { decision: *decision, who, time, why })
        }
        _ => None,
    });
    finding.decision = decided;
}

fn campaign_of(path: &str) -> Option<String> {
    match path.split('/').collect::<Vec<_>>().as_slice() {
        ["campaigns", name, _, ..] => Some((*name).to_string()),
        _ => None,
    }
}
