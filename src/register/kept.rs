//! What is kept with the register: originals and archived reports, against their entries.

use super::chain::Register;
use super::entry::Act;
use super::ledger::{archive_path, original_path, staged_path};
use super::verify::{Cause, Damage};
use crate::intake::Intake;
use crate::report::dossier::sha256;

/// Everything kept that is missing or is not what was entered.
pub fn check_kept(intake: &dyn Intake, register: &Register) -> Vec<Damage> {
    let mut damages = Vec::new();
    let mut note = |line: u64, cause, says| damages.push(Damage { cause, line: Some(line as usize), says });
    for entry in &register.entries {
        match &entry.act {
            Act::Lodged { files } => {
                for file in files {
                    let path = original_path(&file.sha256);
                    match intake.read(&path) {
                        Err(_) => note(
                            entry.sequence,
                            Cause::Missing,
                            format!("The original of {} is not kept as {path}.", file.path),
                        ),
                        Ok(bytes) if sha256(&bytes) != file.sha256 => note(
                            entry.sequence,
                            Cause::Edited,
                            format!("{path}, the original of {}, was changed.", file.path),
                        ),
                        Ok(_) => {}
                    }
                }
            }
            Act::Issued(issued) => {
                let path = archive_path(&issued.number);
                match intake.read(&path).or_else(|_| intake.read(&staged_path(&issued.number))) {
                    Err(_) => note(
                        entry.sequence,
                        Cause::Missing,
                        format!("Report {} is not archived as {path}.", issued.number),
                    ),
                    Ok(bytes) if sha256(&bytes) != issued.pdf => note(
                        entry.sequence,
                        Cause::Edited,
                        format!("{path} is not the file that was issued as {}.", issued.number),
                    ),
                    Ok(_) => {}
                }
            }
            _ => {}
        }
    }
    damages.extend(without_entry(intake, register));
    damages
}

/// A report in the archive that no entry names: its entry was cut off.
fn without_entry(intake: &dyn Intake, register: &Register) -> Vec<Damage> {
    let numbers: Vec<String> = register
        .entries
        .iter()
        .filter_map(|entry| match &entry.act {
            Act::Issued(issued) => Some(archive_path(&issued.number)),
            _ => None,
        })
        .collect();
    let archived = intake.list().unwrap_or_default();
    let archived = archived.into_iter().filter(|path| path.starts_with("register/reports/") && path.ends_with(".pdf"));
    let missing = archived.filter(|path| !numbers.contains(path));
    missing
        .map(|path| Damage {
            cause: Cause::CutTail,
            line: None,
            says: format!("{path} is archived, but the register has no entry of its issue: its end was cut off."),
        })
        .collect()
}
