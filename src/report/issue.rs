//! What an issued report carries outside its seal: number, time, authorisations and the head of the register.

use super::change::Change;
use serde::{Deserialize, Serialize};

/// The version of the shape of `issue.json`.
pub const ISSUE_FORMAT: u32 = 1;

/// The issue of a report; kept beside the dossier, not in it.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct Issue {
    pub format: u32,
    pub number: String,
    pub kind: ReportKind,
    /// The number of the report it amends or replaces.
    pub of: Option<String>,
    /// Path of the report record.
    pub report: String,
    /// The seal that was authorised.
    pub seal: String,
    /// When it was issued, in UTC.
    pub time: String,
    pub clock: Clock,
    pub issued_by: String,
    pub authorisations: Vec<Authorisation>,
    /// The register as it stood just before the entry of this issue.
    pub register: Witness,
    /// Of an amendment or replacement, what changed.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub change: Option<Change>,
    /// Version of the program.
    pub engine: String,
}

/// A head of the register: the hash over its first entries (RFC 6962).
#[derive(Debug, Clone, PartialEq, Eq, Serialize, Deserialize)]
pub struct Witness {
    pub size: u64,
    /// In hexadecimal digits.
    pub head: String,
}

/// One review or authorisation of the seal.
#[derive(Debug, Clone, PartialEq, Eq, Serialize, Deserialize)]
pub struct Authorisation {
    pub duty: Duty,
    /// By role.
    pub who: String,
    pub time: String,
    /// The entry of the register.
    pub entry: u64,
}

/// What a person did for a report.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord, Serialize, Deserialize)]
#[serde(rename_all = "snake_case")]
pub enum Duty {
    Review,
    Authorisation,
}

impl Duty {
    /// The activity that a `person` block must list.
    pub fn activity(self) -> &'static str {
        match self {
            Duty::Review => "review",
            Duty::Authorisation => "authorisation",
        }
    }

    /// The past participle.
    pub fn done(self) -> &'static str {
        match self {
            Duty::Review => "reviewed",
            Duty::Authorisation => "authorised",
        }
    }

    /// The field of the report's front matter that names the person.
    pub fn field(self) -> &'static str {
        match self {
            Duty::Review => "reviewed_by",
            Duty::Authorisation => "authorised_by",
        }
    }
}

/// What sort of report (ISO/IEC 17025:2017, 7.8.8).
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize, Deserialize)]
#[serde(rename_all = "snake_case")]
pub enum ReportKind {
    Original,
    /// A supplement, read together with the report it amends.
    Amendment,
    /// A complete new report in place of another.
    Replacement,
}

/// Where a time comes from.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize, Deserialize)]
#[serde(rename_all = "snake_case")]
pub enum Clock {
    /// The clock of the machine.
    System,
    /// Set by hand, for a demonstration or a test.
    Set,
}

impl Issue {
    /// The bytes of `issue.json`.
    pub fn bytes(&self) -> Vec<u8> {
        let mut text = serde_json::to_string_pretty(self).unwrap_or_default();
        text.push('\n');
        text.into_bytes()
    }

    /// The day of issue, as it stands in `time`.
    pub fn day(&self) -> Option<chrono::NaiveDate> {
        day_of(&self.time)
    }
}

/// The day of a time in UTC.
pub fn day_of(time: &str) -> Option<chrono::NaiveDate> {
    time.get(..10)?.parse().ok()
}
