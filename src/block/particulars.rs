//! Blocks that hold particulars and compute nothing: customers, people, rules.

use super::field::{Shape, needed, optional};
use super::{BlockKind, no_build, no_check};

/// A client.
pub static CUSTOMER: BlockKind = BlockKind {
    name: "customer",
    meaning: "a client, as the report names it",
    fields: &[
        needed("name", Shape::Text, "the client's name"),
        needed("address", Shape::Text, "the client's address"),
        optional("contact", Shape::Text, "whom to reach, by role"),
    ],
    outputs: &[],
    check: no_check,
    build: no_build,
};

/// A person, by role.
pub static PERSON: BlockKind = BlockKind {
    name: "person",
    meaning: "a role with its authorised activities",
    fields: &[
        needed("role", Shape::Text, "the role, such as duty metrologist"),
        needed("activities", Shape::Texts, "what the person is authorised for: calibration, review, authorisation"),
        needed("from", Shape::Date, "first day of the authorisation"),
        optional("to", Shape::Date, "last day of the authorisation"),
    ],
    outputs: &[],
    check: no_check,
    build: no_build,
};

/// A rule, dated before the data it judges.
pub static RULE: BlockKind = BlockKind {
    name: "rule",
    meaning: "a rule for leaving out readings, dated before the data it judges",
    fields: &[
        needed("text", Shape::Text, "the rule in words"),
        needed("date", Shape::Date, "the day it was laid down"),
        optional("applies_to", Shape::Text, "what it judges"),
    ],
    outputs: &[],
    check: no_check,
    build: no_build,
};
