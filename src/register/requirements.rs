//! What must be there before a report is issued.
//!
//! # Source    ISO/IEC 17025:2017, 7.8.1, 7.8.2 and 7.8.4 (clauses from working knowledge); OIML R 111-1:2004, 15.2

use super::chain::Register;
use super::lodge::never_lodged;
use crate::block::{Block, Engine, Fields};
use crate::diagnostic::{Code, Problem};
use crate::graph::{sensitivities, standard_uncertainty};
use crate::intake::Place;
use crate::record::{Node, Text};
use crate::report::front::calibration_span;
use chrono::NaiveDate;
use std::collections::BTreeSet;

/// Files every complaint that stands in the way of issuing the report at `path` on this day; its quantities are built.
pub fn check_requirements(engine: &Engine, register: &Register, path: &str, day: NaiveDate) {
    let file = engine.sources().find(path);
    let record = engine.records.iter().find(|record| Some(record.file) == file);
    let Some(front) = record.and_then(|record| record.front.as_ref()).map(|node| Fields { node }) else { return };
    let Some(report) = front.mapping("report") else { return };
    let check = Check { engine, report };
    check.content();
    check.results();
    check.dates(front, day);
    check.customers(path);
    check.runs();
    let mut rests_on = engine.used_files();
    rests_on.remove(path);
    let unlodged = never_lodged(register, &rests_on);
    if !unlodged.is_empty() {
        let message =
            format!("The report rests on {} never lodged: {}.", counted(unlodged.len()), first_few(&unlodged));
        let problem = Problem::new(Code::NotLodged, message);
        engine.complain(problem.hint("`libripens lodge` enters records and raw data as they are made."), check.place());
    }
}

fn counted(files: usize) -> String {
    if files == 1 { "1 file".into() } else { format!("{files} files") }
}

fn first_few(names: &[String]) -> String {
    match names.len() {
        0..=4 => names.join(", "),
        count => format!("{} and {} more", names[..4].join(", "), count - 4),
    }
}

struct Check<'e> {
    engine: &'e Engine<'e>,
    report: Fields<'e>,
}

impl<'e> Check<'e> {
    fn place(&self) -> Place {
        self.report.place_of("title")
    }

    fn missing(&self, message: impl Into<String>, hint: impl Into<String>, place: Place) {
        self.engine.complain(Problem::new(Code::ContentMissing, message).hint(hint), place);
    }

    /// The reason recorded for leaving content out.
    fn is_left_out(&self, content: &str) -> bool {
        let entries = self.report.mappings("content_left_out");
        entries.iter().any(|entry| entry.words("content") == content && !entry.words("reason").trim().is_empty())
    }

    /// Content that may be left out for a recorded reason.
    fn needed_or_reason(&self, content: &str, message: String) {
        if !self.is_left_out(content) {
            let hint = format!(
                "State it, or record why not in the report's front matter: `content_left_out: [{{content: {content}, reason: …}}]`."
            );
            self.missing(message, hint, self.place());
        }
    }

    fn block(&self, name: &Text) -> Option<&'e Block> {
        self.engine.blocks().get(&name.text)
    }

    fn content(&self) {
        if self.report.words("authorised_by").is_empty() {
            let hint = "Name the role behind `authorised_by:` in the report's front matter.";
            self.missing("The report does not say who authorises it.", hint, self.place());
        }
        if self.report.get("customer").is_none() {
            self.needed_or_reason("customer", "The report names no customer.".into());
        }
        let items = self.report.texts("items");
        if items.is_empty() {
            self.needed_or_reason("items", "The report names no item.".into());
        }
        for item in items.iter().filter_map(|name| self.block(name)).filter(|block| block.kind.name == "item") {
            let fields = item.fields();
            if fields.words("identification").is_empty() {
                let message =
                    format!("The item {} has no identification, such as a serial number or marking.", item.label());
                self.missing(message, "Write `identification:` in the item's block.", item.raw.name.place);
            }
            if fields.words("condition").is_empty() {
                self.needed_or_reason(
                    "condition",
                    format!("The condition of {} on receipt is not stated.", item.label()),
                );
            }
            if fields.words("adjusted").is_empty() {
                self.needed_or_reason("adjusted", format!("It is not stated whether {} was adjusted.", item.label()));
            }
        }
    }

    fn results(&self) {
        let graph = self.engine.graph();
        for result in self.report.texts("results") {
            let Some(id) = graph.find(&result.text) else { continue };
            let u = standard_uncertainty(&graph, &sensitivities(&graph, id));
            if u.is_nan() || u <= 0.0 {
                let message = format!("The result {} has no uncertainty.", result.text);
                self.missing(message, "A result is reported with its uncertainty, or not at all.", result.place);
            }
        }
    }

    fn dates(&self, front: Fields<'_>, day: NaiveDate) {
        let last = calibration_span(self.engine).map(|(_, last)| last);
        for (what, date) in
            [("The record of the report is dated", front.date("date")), ("The last weighing was on", last)]
        {
            if let Some(date) = date.filter(|date| *date > day) {
                let message = format!("{what} {date}, after the day of issue, {day}.");
                let problem = Problem::new(Code::TimeUnreadable, message);
                let hint = "Look at the year in the record, and at the clock of this machine.";
                self.engine.complain(problem.hint(hint), front.place_of("date"));
            }
        }
    }

    /// Blocks in the attached files that belong to another customer.
    fn customers(&self, path: &str) {
        let own = self.report.words("customer");
        let mut files = self.engine.used_files();
        files.insert(path.to_string());
        for block in self.engine.blocks().values().filter(|block| files.contains(&block.path)) {
            let (whose, place) = match block.kind.name {
                "customer" => (block.name().to_string(), block.raw.name.place),
                _ => match block.fields().text("customer") {
                    Some(text) => (text.text, text.place),
                    None => continue,
                },
            };
            if whose != own {
                let message = format!(
                    "The record {}, which would be attached to the report, holds data of the customer {whose}: {}.",
                    block.path,
                    block.label()
                );
                let hint = "Keep what belongs to another customer in a record of its own.";
                self.engine.complain(Problem::new(Code::CustomerForeign, message).hint(hint), place);
            }
        }
    }

    /// Runs of the same items that the report does not use (cherry-picking leaves a trace).
    fn runs(&self) {
        let items: BTreeSet<String> = self.report.texts("items").into_iter().map(|text| text.text).collect();
        let used = self.engine.used_blocks();
        let explained: Vec<Fields<'_>> = self.report.mappings("runs_left_out");
        let blocks = self.engine.blocks();
        let runs = runs_of(self.engine, &items).into_iter().filter(|name| !used.contains(name));
        for run in runs.filter_map(|name| blocks.get(&name)) {
            let reason = explained.iter().find(|entry| entry.words("run") == run.name());
            if reason.is_some_and(|entry| !entry.words("reason").trim().is_empty()) {
                continue;
            }
            let message = format!("{} is a run of an item of this report, but the report does not use it.", run.name());
            let hint = format!(
                "Use it, or say why not in the report's front matter: `runs_left_out: [{{run: {}, rule: …, reason: …}}]`.",
                run.name()
            );
            let complaint = Problem::new(Code::RunUnexplained, message).hint(hint);
            self.engine.complain(complaint, run.raw.name.place);
        }
    }
}

/// Blocks that compute something of one of these items.
pub fn runs_of(engine: &Engine, items: &BTreeSet<String>) -> Vec<String> {
    let is_run = |block: &&Block| {
        !block.kind.outputs.is_empty()
            && !matches!(block.kind.name, "item" | "mass-standard")
            && names_one_of(&block.raw.body, items)
    };
    engine.blocks().values().filter(is_run).map(|block| block.name().to_string()).collect()
}

/// Whether some text of a block is the name of one of these.
fn names_one_of(node: &Node, names: &BTreeSet<String>) -> bool {
    if node.as_text().is_some_and(|text| names.contains(text)) {
        return true;
    }
    let of_list = node.as_list().unwrap_or_default().iter().any(|item| names_one_of(item, names));
    of_list || node.as_map().unwrap_or_default().iter().any(|entry| names_one_of(&entry.value, names))
}
