//! Entering records and raw data as they are made, and finding out whether they were changed since.

use super::chain::{REGISTER, Register};
use super::entry::{Act, Entry, LodgedFile};
use super::ledger::{Ledger, original_path};
use crate::block::Engine;
use crate::block::correction::Correction;
use crate::diagnostic::{Code, Problem};
use crate::intake::{IntakeError, Place};
use crate::record::{Node, Record};
use crate::report::dossier::sha256;
use std::collections::{BTreeMap, BTreeSet};

/// A file to be lodged.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct ToLodge {
    pub path: String,
    pub bytes: Vec<u8>,
    /// The date the record gives itself; of a raw data file, the record's that names it.
    pub stated: Option<String>,
}

/// What was lodged.
#[derive(Debug, Clone, Default, PartialEq, Eq)]
pub struct Lodging {
    pub entered: Vec<LodgedFile>,
    /// Corrections stated in them, each with an entry of its own.
    pub corrections: usize,
    /// Files that were lodged before and are as they were.
    pub known: usize,
}

/// Whether a record is a report: those are sealed and authorised, not lodged.
pub fn is_report(record: &Record) -> bool {
    record.front.as_ref().is_some_and(|front| front.get("report").is_some())
}

/// Records that are no reports, and the raw data files they name, at `place` or below it.
///
/// # Errors
/// `file_missing` for raw data that cannot be read.
pub fn files_to_lodge(engine: &Engine, place: &str) -> Result<Vec<ToLodge>, Problem> {
    let within = |path: &str| {
        place.is_empty() || path == place || path.strip_prefix(place).is_some_and(|rest| rest.starts_with('/'))
    };
    let mut found: BTreeMap<String, ToLodge> = BTreeMap::new();
    for record in engine.records.iter().filter(|record| !is_report(record)) {
        let path = engine.sources().file(record.file).path.clone();
        let date = record.front.as_ref().and_then(|front| front.get("date")?.as_text().map(String::from));
        for named in record.blocks.iter().flat_map(|block| named_files(&block.body)) {
            let raw = crate::block::engine::resolve(&named, &path)?;
            if within(&raw) && !found.contains_key(&raw) {
                let bytes = engine.original(&raw).map_err(|error| unreadable(&raw, &error))?;
                found.insert(raw.clone(), ToLodge { path: raw, bytes: bytes.to_vec(), stated: date.clone() });
            }
        }
        if within(&path) {
            let bytes = engine.original(&path).map_err(|error| unreadable(&path, &error))?;
            found.insert(path.clone(), ToLodge { path, bytes: bytes.to_vec(), stated: date });
        }
    }
    Ok(found.into_values().collect())
}

fn unreadable(path: &str, error: &IntakeError) -> Problem {
    Problem::new(Code::FileMissing, format!("The file {path} cannot be lodged: {error}."))
        .hint("The path counts from the folder of the record that names it.")
}

/// What stands behind every `file:` of a block.
fn named_files(node: &Node) -> Vec<String> {
    let mut found = Vec::new();
    for entry in node.as_map().unwrap_or_default() {
        match entry.value.as_text() {
            Some(text) if entry.key.text == "file" => found.push(text.to_string()),
            _ => found.extend(named_files(&entry.value)),
        }
    }
    found.extend(node.as_list().unwrap_or_default().iter().flat_map(named_files));
    found
}

/// Every lodged file with its entry, by path.
pub fn lodged(register: &Register) -> BTreeMap<&str, (&LodgedFile, &Entry)> {
    let files = register.entries.iter().filter_map(|entry| match &entry.act {
        Act::Lodged { files } => Some(files.iter().map(move |file| (file.path.as_str(), (file, entry)))),
        _ => None,
    });
    files.flatten().collect()
}

/// Lodges files: keeps a copy of each, then makes one entry, and one more for each correction they state. What is known and unchanged is left as it is.
///
/// # Errors
/// `lodged_file_changed`, one for each file that is not as it was lodged: then nothing is entered.
pub fn lodge(
    ledger: &mut Ledger<'_>,
    files: &[ToLodge],
    corrections: &[Correction],
    who: &str,
    why: &str,
) -> Result<Lodging, Vec<Problem>> {
    let known = lodged(&ledger.register);
    let (mut lodging, mut problems, mut fresh) = (Lodging::default(), Vec::new(), Vec::new());
    for file in files {
        let hash = sha256(&file.bytes);
        match known.get(file.path.as_str()) {
            Some((before, _)) if before.sha256 == hash => lodging.known += 1,
            Some((before, entry)) => problems.push(changed(before, entry)),
            None => fresh.push((file, hash)),
        }
    }
    if !problems.is_empty() {
        return Err(problems);
    }
    if fresh.is_empty() {
        return Ok(lodging);
    }
    let one = |problem: Problem| vec![problem];
    for (file, hash) in &fresh {
        ledger.store.write(&original_path(hash), &file.bytes).map_err(|error| one(error.into()))?;
        let (path, bytes) = (file.path.clone(), file.bytes.len() as u64);
        lodging.entered.push(LodgedFile { path, sha256: hash.clone(), bytes, stated: file.stated.clone() });
    }
    let mut acts = vec![(Act::Lodged { files: lodging.entered.clone() }, who.to_string(), why.to_string())];
    let is_new = |one: &&Correction| fresh.iter().any(|(file, _)| file.path == one.stated_in);
    for one in corrections.iter().filter(is_new) {
        let act = Act::Corrected {
            correction: one.name.clone(),
            file: one.record.clone(),
            line: one.line as u64,
            old: one.old.clone(),
            new: one.new.clone(),
            by: one.by.clone(),
        };
        acts.push((act, who.to_string(), one.reason.clone()));
        lodging.corrections += 1;
    }
    ledger.enter_all(acts).map_err(one)?;
    Ok(lodging)
}

fn changed(file: &LodgedFile, entry: &Entry) -> Problem {
    let message = format!(
        "The file {} is not what the {} lodged at {} (entry {} of the register), and no correction says why.",
        file.path, entry.who, entry.time, entry.sequence
    );
    Problem::new(Code::LodgedFileChanged, message).hint(format!(
        "Put back the copy kept as {}, and state the change in a `correction` block of another record.",
        original_path(&file.sha256)
    ))
}

/// The register of the folder that an engine reads; nothing when there is none yet.
///
/// # Errors
/// `register_damaged`, filed at its lines with the engine.
pub fn register_of(engine: &Engine) -> Option<Register> {
    let bytes = engine.original(REGISTER).ok()?;
    match Register::read(&bytes) {
        Ok(register) => Some(register),
        Err(damages) => {
            for damage in damages {
                let problem = Problem::new(Code::RegisterDamaged, damage.says)
                    .hint("Put back the last copy of the register that is whole; nothing is added to a damaged one.");
                let place = damage.line.and_then(|line| line_place(engine, REGISTER, line));
                engine.complain_somewhere(problem, place);
            }
            None
        }
    }
}

fn line_place(engine: &Engine, path: &str, line: usize) -> Option<Place> {
    let file = engine.take_in(path).ok()?;
    let (start, end) = engine.sources().file(file).line_range(line);
    Some(Place::new(file, start, end.min(start + 1)))
}

/// Complains of every lodged file that was changed or removed since.
pub fn check_lodged(engine: &Engine) {
    let Some(register) = register_of(engine) else { return };
    for (path, (file, entry)) in lodged(&register).into_iter().filter(|(path, _)| engine.sees(path)) {
        match engine.original(path) {
            Ok(bytes) if sha256(&bytes) == file.sha256 => {}
            Ok(_) => engine.complain_somewhere(changed(file, entry), line_place(engine, path, 1)),
            Err(error) => {
                let message = format!(
                    "The file {path} was lodged (entry {} of the register), but it is gone: {error}.",
                    entry.sequence
                );
                let hint = format!("Put back the copy kept as {}.", original_path(&file.sha256));
                engine.complain_somewhere(Problem::new(Code::LodgedFileChanged, message).hint(hint), None);
            }
        }
    }
}

/// Files of a list that were never lodged.
pub fn never_lodged(register: &Register, paths: &BTreeSet<String>) -> Vec<String> {
    let lodged = lodged(register);
    paths.iter().filter(|path| !lodged.contains_key(path.as_str())).cloned().collect()
}
