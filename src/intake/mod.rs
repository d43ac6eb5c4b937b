//! Where text comes from.
//!
//! Everything the compiler proper reads passes through one door, [`Intake`], so that a run depends on
//! nothing unseen: a folder on disk, the attachments of a report under audit and a test in memory look alike.

mod place;

pub use place::{FileId, Place, SourceFile, Sources};

use chrono::NaiveDate;
use std::collections::BTreeMap;

/// Why a file could not be had.
#[derive(Debug, Clone, PartialEq, Eq, thiserror::Error)]
pub enum IntakeError {
    #[error("no file {0}")]
    Missing(String),
    #[error("{0} leaves the laboratory folder")]
    Outside(String),
    #[error("{path} could not be read: {reason}")]
    Unreadable { path: String, reason: String },
}

/// The door through which records, raw data, templates, images and today's date come in.
///
/// Paths are relative to the laboratory folder, with `/` between names whatever the machine.
pub trait Intake: Send + Sync {
    /// Every file of the laboratory folder, sorted.
    fn list(&self) -> Result<Vec<String>, IntakeError>;
    /// The bytes of one file.
    fn read(&self, path: &str) -> Result<Vec<u8>, IntakeError>;
    /// Today's date; scaffolds use it, results never do.
    fn today(&self) -> NaiveDate;
}

/// A laboratory folder held in memory: for tests, and for the attachments of a report under audit.
#[derive(Debug, Clone, Default)]
pub struct MemoryIntake {
    pub files: BTreeMap<String, Vec<u8>>,
    pub today: NaiveDate,
}

impl MemoryIntake {
    /// A folder made of pairs of path and text.
    pub fn with<P: Into<String>, T: Into<Vec<u8>>>(files: impl IntoIterator<Item = (P, T)>) -> Self {
        Self {
            files: files.into_iter().map(|(path, text)| (path.into(), text.into())).collect(),
            today: NaiveDate::default(),
        }
    }
}

impl Intake for MemoryIntake {
    fn list(&self) -> Result<Vec<String>, IntakeError> {
        Ok(self.files.keys().cloned().collect())
    }

    fn read(&self, path: &str) -> Result<Vec<u8>, IntakeError> {
        self.files.get(path).cloned().ok_or_else(|| IntakeError::Missing(path.into()))
    }

    fn today(&self) -> NaiveDate {
        self.today
    }
}
