//! `correction`: a value of another record is put right without touching the text as first written.
//!
//! # Source    ISO/IEC 17025:2017, 7.5.2: the original and the altered data are both kept
//!
//! The record or raw data file named stays as it is, byte for byte; whatever is computed from it reads the line with the
//! new text in place of the old. Both texts stand in the trail.

use super::field::{Shape, check_fields, needed};
use super::{BlockKind, Fields, no_build, no_check};
use crate::diagnostic::{Code, Complaints, Problem};
use crate::intake::{FileId, Intake, Place, Sources};
use crate::record::{Record, Text};
use chrono::NaiveDate;
use std::collections::BTreeMap;
use std::sync::Arc;

/// The kind.
pub static KIND: BlockKind = BlockKind {
    name: "correction",
    meaning: "a correction of one line of another record or raw data file, which stays as first written",
    fields: &[
        needed("record", Shape::Text, "path of the record or raw data file in the laboratory folder"),
        needed("line", Shape::Number, "the line, counted in the file as first written"),
        needed("old", Shape::Text, "the text on that line that was wrong"),
        needed("new", Shape::Text, "the text that stands for it"),
        needed("reason", Shape::Text, "why"),
        needed("by", Shape::Text, "who corrects, by role"),
        needed("date", Shape::Date, "the day of the correction"),
    ],
    outputs: &[],
    check: no_check,
    build: no_build,
};

/// A correction that was applied.
#[derive(Debug, Clone, PartialEq)]
pub struct Correction {
    /// The name of its block.
    pub name: String,
    /// Path of the record its block stands in.
    pub stated_in: String,
    /// Path of the file it corrects.
    pub record: String,
    /// The line, counted in the file as first written.
    pub line: usize,
    pub old: String,
    pub new: String,
    pub reason: String,
    pub by: String,
    pub date: Option<NaiveDate>,
    /// The bytes of the corrected line in the text that is read.
    pub range: (usize, usize),
}

impl Correction {
    /// Whether the corrected text stands under this head of a file of columns; also where the heads cannot be told.
    pub fn is_in_column(&self, text: &[u8], head: &str) -> bool {
        let text = String::from_utf8_lossy(text);
        let delimiter = |c: char| matches!(c, ',' | ';' | '\t');
        let mut lines = text.lines().filter(|line| !line.starts_with('#'));
        let heads: Vec<&str> = lines.next().unwrap_or_default().split(delimiter).map(str::trim).collect();
        let Some(wanted) = heads.iter().position(|one| *one == head) else { return true };
        let line = text.get(self.range.0..self.range.1).unwrap_or_default();
        let Some(start) = line.find(&self.new) else { return true };
        let first = line[..start].matches(delimiter).count();
        let last = first + self.new.matches(delimiter).count();
        (first..=last).contains(&wanted)
    }

    /// Both texts, with who, when and why.
    pub fn words(&self) -> String {
        let date = self.date.map(|date| date.to_string()).unwrap_or_default();
        format!(
            "corrected by {}: “{}” to “{}” ({}; {}, {date})",
            self.name,
            self.old,
            self.new,
            self.reason.trim_end_matches('.'),
            self.by
        )
    }
}

/// What corrections make of the files they name.
#[derive(Debug, Default)]
pub struct Corrected {
    pub corrections: Vec<Correction>,
    /// The text that is read, by path.
    pub texts: BTreeMap<String, Arc<[u8]>>,
    /// The bytes as first written, by path.
    pub originals: BTreeMap<String, Arc<[u8]>>,
}

/// A correction as its block states it.
struct Stated {
    correction: Correction,
    line_place: Place,
    old: Text,
    record: Text,
    file: FileId,
}

/// Applies the corrections among the blocks of these records.
pub fn apply(
    intake: &dyn Intake,
    records: &[Record],
    sources: &Sources,
    campaign: Option<&str>,
    complaints: &mut Complaints,
) -> Corrected {
    let mut by_target: BTreeMap<String, Vec<Stated>> = BTreeMap::new();
    for stated in records.iter().flat_map(|record| stated_in(record, sources)) {
        let of_another = |inside: &str| campaign.is_some_and(|own| inside.split('/').next() != Some(own));
        if !stated.record.text.strip_prefix("campaigns/").is_some_and(of_another) {
            by_target.entry(stated.record.text.clone()).or_default().push(stated);
        }
    }
    let homes: Vec<FileId> = by_target.values().flatten().map(|stated| stated.file).collect();
    let mut corrected = Corrected::default();
    for (path, mut list) in by_target {
        list.sort_by(|a, b| (a.correction.date, &a.correction.name).cmp(&(b.correction.date, &b.correction.name)));
        let is_home = sources.find(&path).is_some_and(|file| homes.contains(&file));
        list.retain(|stated| complaints.keep(fits(stated, is_home), stated.record.place).is_some());
        let Some(first) = list.first() else { continue };
        let bytes = match sources.find(&path) {
            Some(file) => Some(sources.file(file).bytes.clone()),
            None => intake.read(&path).ok().map(Arc::from),
        };
        let Some(bytes) = bytes else {
            let problem = unfit(format!("There is no file {path} to correct."));
            complaints.add_at(problem.hint("Write its path from the laboratory folder on."), first.record.place);
            continue;
        };
        corrected.take(&path, &bytes, list, complaints);
    }
    corrected
}

impl Corrected {
    fn take(&mut self, path: &str, bytes: &Arc<[u8]>, list: Vec<Stated>, complaints: &mut Complaints) {
        let Ok(text) = std::str::from_utf8(bytes) else { return };
        let mut lines: Vec<String> = text.split('\n').map(String::from).collect();
        let mut applied = Vec::new();
        for stated in list {
            if complaints.keep(put_right(&mut lines, &stated.correction), place_of(&stated)).is_some() {
                applied.push(stated.correction);
            }
        }
        let mut starts = vec![0];
        for line in &lines {
            starts.push(starts.last().copied().unwrap_or(0) + line.len() + 1);
        }
        for mut correction in applied {
            correction.range = (starts[correction.line - 1], starts[correction.line] - 1);
            self.corrections.push(correction);
        }
        self.texts.insert(path.into(), lines.join("\n").into_bytes().into());
        self.originals.insert(path.into(), bytes.clone());
    }
}

/// A line that is not there is the fault of `line:`, a text that is not on it that of `old:`.
fn place_of(stated: &Stated) -> Place {
    if stated.correction.line == 0 { stated.line_place } else { stated.old.place }
}

fn put_right(lines: &mut [String], correction: &Correction) -> Result<(), Problem> {
    let (number, old) = (correction.line, correction.old.as_str());
    let elsewhere = lines.iter().position(|line| line.contains(old)).map(|index| index + 1);
    let line = number.checked_sub(1).and_then(|index| lines.get_mut(index));
    let message = match line.as_ref().map(|line| line.matches(old).count()) {
        Some(1) if !old.is_empty() => None,
        Some(0) => Some(format!("Line {number} of {} does not hold the text “{old}”.", correction.record)),
        Some(_) => Some(format!("Line {number} of {} holds the text “{old}” more than once.", correction.record)),
        None => Some(format!("The file {} has no line {number}.", correction.record)),
    };
    match (message, line) {
        (None, Some(line)) => {
            *line = line.replacen(old, &correction.new, 1);
            Ok(())
        }
        (message, _) => {
            let problem = unfit(message.unwrap_or_default());
            Err(match elsewhere.filter(|at| *at != number && !old.is_empty()) {
                Some(at) => problem.hint(format!("Line {at} holds it.")),
                None => {
                    problem.hint("Write the text as it stands in the file, and so much of it that it is found once.")
                }
            })
        }
    }
}

fn unfit(message: String) -> Problem {
    Problem::new(Code::CorrectionUnfit, message)
}

/// Whoever sees the file must see its correction, and a correction is not itself corrected.
fn fits(stated: &Stated, is_home: bool) -> Result<(), Problem> {
    let target = stated.record.text.as_str();
    let campaign =
        |path: &str| path.strip_prefix("campaigns/").and_then(|path| path.split('/').next()).map(String::from);
    if let Some(own) = campaign(&stated.correction.stated_in).filter(|own| campaign(target).as_deref() != Some(own)) {
        return Err(unfit(format!(
            "{target} is used outside the campaign {own} as well, where this correction would not be seen."
        ))
        .hint("Put the correction beside the shared records, or into the campaign of the file."));
    }
    if is_home {
        return Err(unfit(format!("The record {target} holds corrections; it is not corrected itself."))
            .hint("State a further correction of the same line, with the text as it stands now as `old:`."));
    }
    Ok(())
}

/// The well-formed corrections of a record; the others are complained of as blocks.
fn stated_in(record: &Record, sources: &Sources) -> Vec<Stated> {
    let path = &sources.file(record.file).path;
    let own = record.blocks.iter().filter(|block| block.kind.text == KIND.name && block.readable);
    let read = |block: &crate::record::MeasurementBlock| {
        let mut faults = Complaints::default();
        check_fields(&block.body, KIND.fields, "", &mut faults);
        let fields = Fields { node: &block.body };
        let (record_named, old) = (fields.text("record")?, fields.text("old")?);
        let line = fields.number("line").filter(|line| line.fract() == 0.0 && (1.0..1e9).contains(line)).unwrap_or(0.0);
        let correction = Correction {
            name: block.name.text.clone(),
            stated_in: path.clone(),
            record: record_named.text.clone(),
            line: line as usize,
            old: old.text.clone(),
            new: fields.words("new"),
            reason: fields.words("reason"),
            by: fields.words("by"),
            date: fields.date("date"),
            range: (0, 0),
        };
        let line_place = fields.place_of("line");
        (!faults.has_faults()).then_some(Stated {
            correction,
            line_place,
            old,
            record: record_named,
            file: record.file,
        })
    };
    own.filter_map(read).collect()
}

#[cfg(test)]
mod tests {
    use crate::block::Engine;
    use crate::intake::MemoryIntake;

    const LABORATORY: &str = "---\nformat: 1\nname: N\naddress: A\n---\n";

    fn correction(name: &str, record: &str, line: usize, old: &str, new: &str) -> String {
        format!(
            "```yaml correction {name}\nrecord: {record}\nline: {line}\nold: \"{old}\"\nnew: \"{new}\"\nreason: misread\nby: duty metrologist\ndate: 2041-05-20\n```\n"
        )
    }

    fn codes(files: &[(&str, String)]) -> Vec<String> {
        let intake = MemoryIntake::with(files.iter().map(|(path, text)| (*path, text.clone())));
        let engine = Engine::read(&intake, None).expect("a folder in memory");
        engine.complaints().list.iter().map(|complaint| complaint.message.clone()).collect()
    }

    #[test]
    fn corrections_follow_each_other_over_the_untouched_original() {
        let day = "# Day\n\n```yaml rule R1\ntext: first\ndate: 2041-05-01\n```\n";
        let both = correction("C1", "day.md", 4, "first", "second") + &correction("C2", "day.md", 4, "second", "third");
        let files = [("laboratory.md", LABORATORY.to_string()), ("day.md", day.into()), ("c.md", both)];
        let intake = MemoryIntake::with(files);
        let engine = Engine::read(&intake, None).expect("a folder in memory");
        assert!(engine.complaints().list.is_empty(), "{:?}", engine.complaints());
        assert_eq!(engine.blocks()["R1"].fields().words("text"), "third");
        assert_eq!(&*engine.original("day.md").expect("a file"), day.as_bytes());
        assert_eq!(engine.corrections().len(), 2);
    }

    #[test]
    fn what_does_not_fit_is_said() {
        let day = ("day.md", "# Day\n\nred red\n".to_string());
        let laboratory = ("laboratory.md", LABORATORY.to_string());
        let said = |text: String| codes(&[laboratory.clone(), day.clone(), ("c.md", text)]);
        assert!(said(correction("C1", "day.md", 3, "blue", "green"))[0].contains("does not hold"));
        assert!(said(correction("C1", "day.md", 3, "red", "green"))[0].contains("more than once"));
        assert!(said(correction("C1", "day.md", 30, "red", "green"))[0].contains("no line 30"));
        assert!(said(correction("C1", "night.md", 3, "red", "green"))[0].contains("no file night.md"));
        assert!(said(correction("C1", "c.md", 3, "red", "green"))[0].contains("holds corrections"));
        let inside = codes(&[laboratory, day, ("campaigns/a/c.md", correction("C1", "day.md", 1, "Day", "Night"))]);
        assert!(inside[0].contains("outside the campaign a"), "{inside:?}");
    }
}
