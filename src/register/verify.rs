//! What is wrong with a register, found and named.
//!
//! The chain shows that something was changed after the next entry was made; only a head seen elsewhere (in an issued
//! report, in a letter) shows that the end was cut off or that the whole was written anew.

use super::chain::Register;
use super::entry::{Act, Entry, NOTHING_BEFORE, line_hash};
use super::tree::{Head, hex, tree_head};
use std::collections::{BTreeMap, BTreeSet};

/// One thing that is wrong.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Damage {
    pub cause: Cause,
    /// The line it is seen on, from 1; none for the register as a whole.
    pub line: Option<usize>,
    /// In words.
    pub says: String,
}

/// What was done to a register.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord)]
pub enum Cause {
    /// A line that is no entry, or cut.
    Unreadable,
    Edited,
    Redated,
    Missing,
    Doubled,
    Reordered,
    /// Entries at the end are gone.
    CutTail,
    /// Entries were written anew, hashes and all.
    Rewritten,
    /// A report number is left out or given twice.
    Numbers,
    /// Two reports claim to be the present one.
    TwoCurrent,
}

fn damage(cause: Cause, line: usize, says: String) -> Damage {
    Damage { cause, line: Some(line), says }
}

/// Everything that is wrong with a register, from its own bytes.
pub fn verify(bytes: &[u8]) -> Vec<Damage> {
    let Ok(text) = std::str::from_utf8(bytes) else {
        let line = bytes.split(|byte| *byte == b'\n').position(|line| std::str::from_utf8(line).is_err()).unwrap_or(0);
        return vec![damage(Cause::Unreadable, line + 1, format!("Line {} of the register is no text.", line + 1))];
    };
    let lines: Vec<&str> = text.split_inclusive('\n').collect();
    let mut damages = Vec::new();
    let mut entries: Vec<(&str, Entry)> = Vec::new();
    for (index, line) in lines.iter().enumerate() {
        match read_line(line, index + 1) {
            Ok(entry) => entries.push((line.trim_end_matches('\n'), entry)),
            Err(found) => damages.push(found),
        }
    }
    if !damages.is_empty() {
        return damages;
    }
    check_sequence(&entries, &mut damages);
    if damages.is_empty() {
        check_links(&entries, &mut damages);
        check_times(&entries, &mut damages);
    }
    let entries: Vec<&Entry> = entries.iter().map(|(_, entry)| entry).collect();
    check_numbers(&entries, &mut damages);
    damages
}

fn read_line(line: &str, number: usize) -> Result<Entry, Damage> {
    let Some(line) = line.strip_suffix('\n') else {
        return Err(damage(Cause::Unreadable, number, format!("Line {number} of the register is cut off.")));
    };
    let entry: Entry = serde_json::from_str(line).map_err(|error| {
        damage(Cause::Unreadable, number, format!("Line {number} of the register is no entry: {error}."))
    })?;
    if entry.line() != line || entry.instant().is_none() {
        let says = format!("Line {number} of the register is not written as the program writes it: it was edited.");
        return Err(damage(Cause::Edited, number, says));
    }
    Ok(entry)
}

/// Sequence numbers count from 1 in the order of the lines.
fn check_sequence(entries: &[(&str, Entry)], damages: &mut Vec<Damage>) {
    let numbers: Vec<u64> = entries.iter().map(|(_, entry)| entry.sequence).collect();
    let Some(line) = numbers.iter().enumerate().position(|(index, number)| *number != index as u64 + 1) else { return };
    let (present, last) =
        (numbers.iter().copied().collect::<BTreeSet<u64>>(), numbers.iter().copied().max().unwrap_or(0));
    let before = damages.len();
    if last as usize <= 2 * numbers.len() + 1000 {
        for missing in (1..=last).filter(|number| !present.contains(number)) {
            damages.push(damage(Cause::Missing, line + 1, format!("Entry {missing} of the register is missing.")));
        }
    } else {
        damages.push(damage(Cause::Missing, line + 1, format!("Entries up to {last} of the register are missing.")));
    }
    let mut seen = BTreeSet::new();
    for (index, number) in numbers.iter().enumerate().filter(|(_, number)| !seen.insert(**number)) {
        damages.push(damage(Cause::Doubled, index + 1, format!("Entry {number} stands twice in the register.")));
    }
    if let Some(at) = numbers.windows(2).position(|pair| pair[0] > pair[1]) {
        let says = format!("Entry {} stands before entry {}: the order was changed.", numbers[at], numbers[at + 1]);
        damages.push(damage(Cause::Reordered, at + 1, says));
    }
    debug_assert!(damages.len() > before);
}

/// Each entry holds the hash of the one before.
fn check_links(entries: &[(&str, Entry)], damages: &mut Vec<Damage>) {
    if let Some((_, first)) = entries.first().filter(|(_, first)| first.before != NOTHING_BEFORE) {
        let says = format!("Entry {} names an entry before it, but there is none.", first.sequence);
        damages.push(damage(Cause::Edited, 1, says));
    }
    for (index, pair) in entries.windows(2).enumerate() {
        let [(line, changed), (_, next)] = pair else { continue };
        if line_hash(line) == next.before {
            continue;
        }
        let says = format!(
            "Entry {} ({}, {}) is not the one that entry {} was added to: it was edited, or entry {} was exchanged.",
            changed.sequence,
            changed.word(),
            changed.time,
            next.sequence,
            next.sequence
        );
        damages.push(damage(Cause::Edited, index + 1, says));
    }
}

/// Times never run backwards.
fn check_times(entries: &[(&str, Entry)], damages: &mut Vec<Damage>) {
    for (index, pair) in entries.windows(2).enumerate() {
        let [(_, first), (_, second)] = pair else { continue };
        if first.time <= second.time {
            continue;
        }
        // Of two that contradict each other, the one off its other neighbour was re-dated.
        let before = index.checked_sub(1).and_then(|at| entries.get(at)).map(|(_, entry)| entry.time.as_str());
        let first_is_off = before.is_none_or(|before| before <= second.time.as_str());
        let (line, entry) = if first_is_off { (index + 1, first) } else { (index + 2, second) };
        let says = format!(
            "Entry {} is dated {}, entry {} {}: entry {} was dated anew.",
            first.sequence, first.time, second.sequence, second.time, entry.sequence
        );
        damages.push(damage(Cause::Redated, line, says));
    }
}

/// Report numbers run without gaps, and of each report there is one present form.
fn check_numbers(entries: &[&Entry], damages: &mut Vec<Damage>) {
    let mut place = 0;
    let mut numbers: BTreeMap<&str, u64> = BTreeMap::new();
    let mut followed: BTreeMap<&str, &str> = BTreeMap::new();
    for (index, entry) in entries.iter().enumerate() {
        let Act::Issued(issued) = &entry.act else { continue };
        place += 1;
        if issued.place != place {
            let says = format!(
                "Report {} is number {} of its series, but {place} is the next: a number is left out or given twice.",
                issued.number, issued.place
            );
            damages.push(damage(Cause::Numbers, index + 1, says));
            place = issued.place;
        }
        if let Some(first) = numbers.insert(&issued.number, entry.sequence) {
            let says = format!("Report number {} is given by entries {first} and {}.", issued.number, entry.sequence);
            damages.push(damage(Cause::Numbers, index + 1, says));
        }
        let Some(of) = issued.of.as_deref() else { continue };
        if !numbers.contains_key(of) {
            let says = format!("Report {} follows {of}, which was never issued.", issued.number);
            damages.push(damage(Cause::Numbers, index + 1, says));
        }
        if let Some(other) = followed.insert(of, &issued.number) {
            let says = format!("Two reports are present at once: {other} and {} both follow {of}.", issued.number);
            damages.push(damage(Cause::TwoCurrent, index + 1, says));
        }
    }
}

/// What is wrong with a register measured by a head that was seen earlier.
pub fn verify_against(register: &Register, head: &Head) -> Vec<Damage> {
    let (have, had) = (register.entries.len() as u64, head.size);
    let whole = |cause, says| vec![Damage { cause, line: None, says }];
    if have < had {
        let says = format!(
            "The register has {have} entries, but the head was taken over {had}: {} at its end are missing.",
            had - have
        );
        return whole(Cause::CutTail, says);
    }
    let leaves: Vec<_> = register.leaves().into_iter().take(had as usize).collect();
    if hex(&tree_head(&leaves)) == head.head {
        return Vec::new();
    }
    whole(
        Cause::Rewritten,
        format!("The first {had} entries of the register are not those the head was taken over: it was written anew."),
    )
}
