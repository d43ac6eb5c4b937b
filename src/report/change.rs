//! What changed between an issued report and the one that amends or replaces it, as data and as pages.

use super::Markup;
use super::table::Table;
use serde::{Deserialize, Serialize};

/// A stated value, reading, constant or column that changed.
#[derive(Debug, Clone, PartialEq, Eq, Serialize, Deserialize)]
pub struct InputChange {
    pub name: String,
    pub label: String,
    pub old: String,
    pub new: String,
    /// File and line of the new one, else of the old.
    pub place: String,
}

/// A computed value that changed.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct ValueChange {
    pub name: String,
    pub label: String,
    /// As printed, value and standard uncertainty.
    pub old: String,
    pub new: String,
    /// New less old, in the unit of `si_unit`; none where one of them is missing, and in a statement of change, which
    /// holds text alone so that it reads back as it was written.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub difference: Option<f64>,
    pub si_unit: String,
    /// The difference in the unit of the quantity, to two digits.
    pub printed_difference: String,
    /// The difference in old standard uncertainties.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub relative_to_uncertainty: Option<f64>,
    /// The same to two decimals.
    pub printed_relative: String,
    /// New standard uncertainty over old.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub uncertainty_ratio: Option<f64>,
    pub printed_digits_change: bool,
    /// Changed inputs it rests on.
    pub because_of: Vec<String>,
}

impl ValueChange {
    /// The change as text alone.
    pub fn in_words(self) -> ValueChange {
        ValueChange { difference: None, relative_to_uncertainty: None, uncertainty_ratio: None, ..self }
    }
}

/// A ratio to two decimals, as printed.
pub fn printed_ratio(ratio: Option<f64>) -> String {
    match ratio.map(|ratio| format!("{ratio:.2}")) {
        None => "—".into(),
        Some(text) if text == "-0.00" => "0.00".into(),
        Some(text) => text.replace('-', "\u{2212}"),
    }
}

/// The statement of change of an amendment or a replacement.
#[derive(Debug, Clone, Default, PartialEq, Serialize, Deserialize)]
pub struct Change {
    /// The author's reason.
    pub reason: String,
    /// Attached files that are others than those of the earlier report.
    pub files: Vec<String>,
    pub inputs: Vec<InputChange>,
    /// Reported results that changed.
    pub results: Vec<ValueChange>,
    /// Other computed values whose printed digits changed.
    pub others: Vec<ValueChange>,
    /// Reported results that did not change.
    pub unchanged: Vec<String>,
}

/// The statement of change as pages.
pub fn statement_of_change(change: &Change, of: &str) -> Markup {
    let mut made = Markup::code("= Statement of change\n\n");
    made.push(&Markup::text(&format!(
        "This document states every value of report {of} that changed. Reason: {}.",
        change.reason.trim().trim_end_matches('.')
    )));
    made.push_code("\n\n");
    if !change.inputs.is_empty() {
        made.push(&inputs_table(&change.inputs));
        made.push_code("\n\n");
    }
    match change.results.is_empty() {
        true => {
            made.push(&Markup::text("No reported result changed."));
            made.push_code("\n\n");
        }
        false => {
            made.push(&values_table("Reported results that changed; value and standard uncertainty", &change.results));
            made.push_code("\n\n");
        }
    }
    if !change.others.is_empty() {
        made.push(&values_table("Other values that changed; value and standard uncertainty", &change.others));
        made.push_code("\n\n");
    }
    let unchanged = match change.unchanged.as_slice() {
        [] => "Of the reported results none is as before.".to_string(),
        names => format!("Not changed: {}.", names.join(", ")),
    };
    made.push(&Markup::text(&unchanged));
    made.push_code("\n\n");
    if !change.files.is_empty() {
        made.push(&Markup::text(&format!(
            "Attached files that differ from those of report {of}: {}.",
            change.files.join(", ")
        )));
        made.push_code("\n\n");
    }
    made
}

fn inputs_table(inputs: &[InputChange]) -> Markup {
    let header = vec!["Input".into(), "Was".into(), "Is".into(), "Where".into()];
    let mut table = Table::new("Inputs that changed", header);
    table.columns = vec!["1.2fr", "1fr", "1fr", "1.2fr"];
    table.align = vec!["left"; 4];
    for one in inputs {
        let what = format!("{}: {}", one.name, one.label);
        table.rows.push(vec![what.into(), one.old.clone().into(), one.new.clone().into(), one.place.clone().into()]);
    }
    table.markup()
}

fn values_table(caption: &str, values: &[ValueChange]) -> Markup {
    let header =
        vec!["Quantity".into(), "Was".into(), "Is".into(), "Difference".into(), "in standard uncertainties".into()];
    let mut table = Table::new(caption, header);
    table.columns = vec!["1.4fr", "auto", "auto", "auto", "auto"];
    table.align = vec!["left", "left", "left", "right", "right"];
    for one in values {
        table.rows.push(vec![
            format!("{}: {}", one.name, one.label).into(),
            one.old.clone().into(),
            one.new.clone().into(),
            one.printed_difference.clone().into(),
            one.printed_relative.clone().into(),
        ]);
    }
    table.markup()
}
