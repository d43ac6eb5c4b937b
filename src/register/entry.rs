//! One entry of the register: what was done, when, by whom and why.

use super::canonical::canonical;
use super::tree::Hash;
use crate::report::dossier::sha256;
pub use crate::report::issue::{Clock, Duty, ReportKind};
use chrono::{DateTime, NaiveDateTime, SubsecRound, Utc};
use serde::{Deserialize, Serialize};

/// What stands before the first entry.
pub const NOTHING_BEFORE: &str = "0000000000000000000000000000000000000000000000000000000000000000";

/// How times are written: UTC, whole seconds.
const TIME_FORMAT: &str = "%Y-%m-%dT%H:%M:%SZ";

/// A point in time, and where it was read.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct Stamp {
    pub time: DateTime<Utc>,
    pub clock: Clock,
}

/// One entry. Its text is canonical: the same entry always has the same bytes.
#[derive(Debug, Clone, PartialEq, Eq, Serialize, Deserialize)]
pub struct Entry {
    /// From 1, without gaps.
    pub sequence: u64,
    /// When it was entered, in UTC.
    pub time: String,
    pub clock: Clock,
    /// Who did it, by role.
    pub who: String,
    pub why: String,
    /// Version of the program.
    pub program: String,
    /// SHA-256 of the entry before, as it stands in the register.
    pub before: String,
    #[serde(flatten)]
    pub act: Act,
}

/// What was done.
#[derive(Debug, Clone, PartialEq, Eq, Serialize, Deserialize)]
#[serde(tag = "what", rename_all = "snake_case")]
pub enum Act {
    /// Records and raw data were entered as made; a copy of each is kept.
    Lodged { files: Vec<LodgedFile> },
    /// A value of a lodged record was corrected by an entry of its own.
    Corrected { correction: String, file: String, line: u64, old: String, new: String, by: String },
    /// One seal was reviewed or authorised.
    Authorised { report: String, seal: String, duty: Duty },
    /// A report was issued.
    Issued(Box<IssuedReport>),
    /// An issued report was sent.
    Sent { number: String, recipient: String, pdf: String, bytes: u64, copies: u64 },
    /// An issued report no longer holds.
    Withdrawn { number: String },
    /// What is done about an issued report whose inputs changed.
    Decided { number: String, findings: String, decision: Decision },
}

/// A file as it was lodged.
#[derive(Debug, Clone, PartialEq, Eq, Serialize, Deserialize)]
pub struct LodgedFile {
    pub path: String,
    pub sha256: String,
    pub bytes: u64,
    /// The date the record gives itself; of a raw data file, the record's that names it.
    pub stated: Option<String>,
}

/// An issued report.
#[derive(Debug, Clone, PartialEq, Eq, Serialize, Deserialize)]
pub struct IssuedReport {
    pub number: String,
    /// Its place in the series of numbers, from 1.
    pub place: u64,
    pub kind: ReportKind,
    /// The number of the report it amends or replaces.
    pub of: Option<String>,
    /// Path of the report record.
    pub report: String,
    pub title: String,
    pub seal: String,
    /// SHA-256 of the PDF.
    pub pdf: String,
    pub bytes: u64,
    /// Files the report rests on.
    pub files: Vec<FileHash>,
    /// Blocks the report rests on.
    pub blocks: Vec<UsedBlock>,
    /// SHA-256 over paths and hashes of all records the campaign saw, but for those that are reports.
    pub seen: String,
    pub performed_by: String,
    /// The results it reports.
    pub results: Vec<String>,
    /// Runs of its items that it leaves out with a reason.
    pub left_out: Vec<String>,
}

/// A file a report rests on.
#[derive(Debug, Clone, PartialEq, Eq, Serialize, Deserialize)]
pub struct FileHash {
    pub path: String,
    pub sha256: String,
}

/// A block a report rests on.
#[derive(Debug, Clone, PartialEq, Eq, Serialize, Deserialize)]
pub struct UsedBlock {
    pub kind: String,
    pub name: String,
}

/// What is done about a report whose inputs changed.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize, Deserialize, clap::ValueEnum)]
#[serde(rename_all = "snake_case")]
pub enum Decision {
    NoAction,
    Amendment,
    Replacement,
    Withdrawal,
}

impl Entry {
    /// The entry as it stands in the register, without its line break.
    pub fn line(&self) -> String {
        canonical(&serde_json::to_value(self).unwrap_or_default())
    }

    /// The time it was entered.
    pub fn instant(&self) -> Option<DateTime<Utc>> {
        NaiveDateTime::parse_from_str(&self.time, TIME_FORMAT).ok().map(|time| time.and_utc())
    }

    /// What was done, in one word.
    pub fn word(&self) -> &'static str {
        match &self.act {
            Act::Lodged { .. } => "lodged",
            Act::Corrected { .. } => "corrected",
            Act::Authorised { duty, .. } => duty.done(),
            Act::Issued(_) => "issued",
            Act::Sent { .. } => "sent",
            Act::Withdrawn { .. } => "withdrawn",
            Act::Decided { .. } => "decided",
        }
    }
}

/// A time as entries write it.
pub fn written_time(time: DateTime<Utc>) -> String {
    time.trunc_subsecs(0).format(TIME_FORMAT).to_string()
}

/// The hash of one line, as the next entry holds it.
pub fn line_hash(line: &str) -> String {
    sha256(line.as_bytes())
}

/// The hash of one line in the tree.
pub fn line_leaf(line: &str) -> Hash {
    super::tree::leaf_hash(line.as_bytes())
}
