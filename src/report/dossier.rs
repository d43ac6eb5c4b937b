//! The dossier: all that a report rests on, under flat names, with its list of contents and the seal over it.
//!
//! The layout is fixed by the first PDF made with it:
//! - every record, raw data file, template and image, byte for byte;
//! - `results.json`, every named quantity; `derivation.json`, how each is computed;
//! - `contents.json`, the list of all these with original path and SHA-256, and the program's version.
//!
//! The seal is the SHA-256 of the bytes of `contents.json`.

use super::derivation::derivation_json;
use super::issue::Issue;
use super::listing::list_results;
use super::typeset::{Attachment, Relationship};
use crate::block::Engine;
use serde::{Deserialize, Serialize};
use sha2::{Digest, Sha256};
use std::collections::{BTreeMap, BTreeSet};

/// The version of the layout of a dossier.
pub const DOSSIER_FORMAT: u32 = 1;
/// The list of contents.
pub const CONTENTS: &str = "contents.json";
/// Every named quantity.
pub const RESULTS: &str = "results.json";
/// How each quantity is computed.
pub const DERIVATION: &str = "derivation.json";
/// Number, date and authorisations of an issued report; outside the seal.
pub const ISSUE: &str = "issue.json";

/// One file of the dossier.
#[derive(Debug, Clone, PartialEq, Eq, Serialize, Deserialize)]
pub struct Entry {
    /// The name it is attached under.
    pub name: String,
    /// Its path in the laboratory folder; none for what the program made.
    pub path: Option<String>,
    pub bytes: u64,
    /// SHA-256 in hexadecimal digits.
    pub sha256: String,
}

/// The list of contents.
#[derive(Debug, Clone, PartialEq, Eq, Serialize, Deserialize)]
pub struct Contents {
    pub format: u32,
    /// Version of the program.
    pub engine: String,
    /// Path of the report record.
    pub report: String,
    pub files: Vec<Entry>,
}

/// A dossier with its seal.
#[derive(Debug, Clone, PartialEq)]
pub struct Dossier {
    pub contents: Contents,
    /// Bytes by attached name, the list of contents among them.
    pub files: BTreeMap<String, Vec<u8>>,
    /// SHA-256 of the list of contents, in hexadecimal digits.
    pub seal: String,
}

impl Dossier {
    /// The dossier of a report whose quantities are built.
    ///
    /// `extra` are files that are no records: templates and images, by path.
    pub fn new(engine: &Engine, report: &str, extra: &BTreeMap<String, Vec<u8>>) -> Dossier {
        let mut originals: BTreeMap<String, Vec<u8>> = extra.clone();
        for path in engine.used_files().into_iter().chain([report.to_string()]) {
            // A corrected file is attached as first written, beside its correction.
            if let Ok(bytes) = engine.original(&path) {
                originals.insert(path, bytes.to_vec());
            }
        }
        let mut files = BTreeMap::new();
        let mut entries = Vec::new();
        let mut taken: BTreeSet<String> = [CONTENTS, RESULTS, DERIVATION, ISSUE].map(String::from).into();
        for (path, bytes) in originals {
            let name = flat_name(&path, &mut taken);
            entries.push(entry(&name, Some(path), &bytes));
            files.insert(name, bytes);
        }
        for (name, text) in [(RESULTS, list_results(engine).json()), (DERIVATION, derivation_json(engine))] {
            entries.push(entry(name, None, text.as_bytes()));
            files.insert(name.into(), text.into_bytes());
        }
        entries.sort_by(|a, b| a.name.cmp(&b.name));
        let contents =
            Contents { format: DOSSIER_FORMAT, engine: crate::VERSION.into(), report: report.into(), files: entries };
        let mut text = serde_json::to_string_pretty(&contents).unwrap_or_default();
        text.push('\n');
        let seal = sha256(text.as_bytes());
        files.insert(CONTENTS.into(), text.into_bytes());
        Dossier { contents, files, seal }
    }

    /// The files as attachments, in order of name.
    pub fn attachments(&self) -> Vec<Attachment> {
        self.files.iter().map(|(name, bytes)| self.attachment(name, bytes)).collect()
    }

    fn attachment(&self, name: &str, bytes: &[u8]) -> Attachment {
        let original = self.contents.files.iter().find(|entry| entry.name == name).and_then(|entry| entry.path.clone());
        let (relationship, description) = match name {
            CONTENTS => {
                (Relationship::Supplement, "list of contents of the dossier, over which the seal is taken".to_string())
            }
            RESULTS => (Relationship::Data, "every named quantity with its standard uncertainty".into()),
            DERIVATION => (Relationship::Data, "operations and values from which every quantity is computed".into()),
            _ => (Relationship::Source, format!("file {} of the laboratory folder", original.unwrap_or_default())),
        };
        Attachment {
            name: name.into(),
            bytes: bytes.to_vec(),
            relationship,
            mime_type: mime_type(name).into(),
            description,
        }
    }
}

/// What is attached to an issued report beside its dossier.
pub fn issue_attachment(issue: &Issue) -> Attachment {
    Attachment {
        name: ISSUE.into(),
        bytes: issue.bytes(),
        relationship: Relationship::Supplement,
        mime_type: mime_type(ISSUE).into(),
        description: "number, date, authorisations and head of the register; outside the seal".into(),
    }
}

/// SHA-256 in hexadecimal digits.
pub fn sha256(bytes: &[u8]) -> String {
    Sha256::digest(bytes).iter().map(|byte| format!("{byte:02x}")).collect()
}

/// The seal as printed: its first sixteen digits in groups of four.
pub fn short_seal(seal: &str) -> String {
    let digits: Vec<char> = seal.chars().take(16).collect();
    digits.chunks(4).map(|group| group.iter().collect::<String>()).collect::<Vec<_>>().join(" ")
}

fn entry(name: &str, path: Option<String>, bytes: &[u8]) -> Entry {
    Entry { name: name.into(), path, bytes: bytes.len() as u64, sha256: sha256(bytes) }
}

/// A path as a name without `/`, different from all names taken.
fn flat_name(path: &str, taken: &mut BTreeSet<String>) -> String {
    let safe = |c: char| if c.is_ascii_alphanumeric() || matches!(c, '.' | '-' | '_') { c } else { '_' };
    let plain: String =
        path.split('/').map(|name| name.chars().map(safe).collect::<String>()).collect::<Vec<_>>().join("--");
    let mut name = plain.clone();
    let mut number = 2;
    while !taken.insert(name.clone()) {
        name = format!("{number}--{plain}");
        number += 1;
    }
    name
}

fn mime_type(name: &str) -> &'static str {
    match name.rsplit('.').next().unwrap_or_default() {
        "md" => "text/markdown",
        "csv" => "text/csv",
        "json" => "application/json",
        "png" => "image/png",
        "jpg" | "jpeg" => "image/jpeg",
        "svg" => "image/svg+xml",
        _ => "text/plain",
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn flat_names_are_unique() {
        let mut taken = BTreeSet::new();
        assert_eq!(flat_name("a/b.md", &mut taken), "a--b.md");
        assert_eq!(flat_name("a--b.md", &mut taken), "2--a--b.md");
        assert_eq!(flat_name("räw/µ.csv", &mut taken), "r_w--_.csv");
    }

    #[test]
    fn sha256_of_nothing() {
        // FIPS 180-4 test vector: the empty message.
        assert_eq!(sha256(b""), "e3b0c44298fc1c149afbf4c8996fb92427ae41e4649b934ca495991b7852b855");
    }
}
