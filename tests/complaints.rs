//! Every kind of complaint has a record that draws it, on the line that is to blame.
//!
//! The convention stands in `tests/complaints/README.md`.

#![allow(clippy::disallowed_methods)]

use libripens::diagnostic::{Code, Look, print_complaints};
use libripens::intake::MemoryIntake;
use std::collections::BTreeMap;
use std::fs;
use std::path::{Path, PathBuf};

/// Codes that no record of a comparison draws, with the test that covers them.
const COVERED_ELSEWHERE: &[(&str, &str)] = &[
    ("already_issued", "tests/register.rs"),
    ("clock_behind", "tests/register.rs"),
    ("content_missing", "tests/register.rs"),
    ("customer_foreign", "tests/register.rs"),
    ("not_authorised", "tests/register.rs"),
    ("not_lodged", "tests/register.rs"),
    ("pdf_unreadable", "register::pdf_file::tests"),
    ("person_unauthorised", "tests/register.rs"),
    ("register_unwritable", "tests/register.rs"),
    ("report_unknown", "tests/register.rs"),
    ("run_unexplained", "tests/register.rs"),
    ("run_unlisted", "tests/realization_report.rs"),
];

fn folder() -> PathBuf {
    Path::new(env!("CARGO_MANIFEST_DIR")).join("tests/complaints")
}

fn read_into(root: &Path, folder: &Path, files: &mut BTreeMap<String, Vec<u8>>) {
    for entry in fs::read_dir(folder).expect("folder of cases") {
        let path = entry.expect("entry").path();
        if path.is_dir() {
            read_into(root, &path, files);
        } else {
            let name = path.strip_prefix(root).expect("inside").to_string_lossy().replace('\\', "/");
            files.insert(name, fs::read(&path).expect("file"));
        }
    }
}

/// One case: its files over the common ones, and where which complaint is expected.
struct Case {
    code: String,
    files: BTreeMap<String, Vec<u8>>,
    expected: Vec<(String, String, usize)>,
}

fn cases() -> Vec<Case> {
    let root = folder();
    let mut cases = Vec::new();
    for entry in fs::read_dir(&root).expect("cases") {
        let path = entry.expect("entry").path();
        let name = path.file_name().expect("name").to_string_lossy().into_owned();
        let code = name.trim_end_matches(".md").to_string();
        if name == "common" || name == "README.md" || name.ends_with(".json") {
            continue;
        }
        let mut own = BTreeMap::new();
        if path.is_dir() {
            read_into(&path, &path, &mut own);
        } else {
            own.insert(name.clone(), fs::read(&path).expect("case"));
        }
        let mut files = BTreeMap::new();
        read_into(&root.join("common"), &root.join("common"), &mut files);
        let mut expected = Vec::new();
        for (file, bytes) in &own {
            let text = String::from_utf8_lossy(bytes);
            for (index, line) in text.lines().enumerate() {
                let marked =
                    line.trim().strip_prefix("# expect: ").or_else(|| line.trim().strip_prefix("<!-- expect: "));
                if let Some(marked) = marked {
                    // Line numbers count from 1, and the complaint stands on the line after the marker.
                    expected.push((marked.trim_end_matches("-->").trim().to_string(), file.clone(), index + 2));
                }
            }
        }
        let side = root.join(format!("{code}.expect.json"));
        if side.exists() {
            let listed: serde_json::Value = serde_json::from_slice(&fs::read(side).expect("side file")).expect("JSON");
            for one in listed.as_array().expect("a list") {
                let text = |key: &str| one[key].as_str().expect("text").to_string();
                expected.push((text("code"), text("file"), one["line"].as_u64().expect("line") as usize));
            }
        }
        files.extend(own);
        cases.push(Case { code, files, expected });
    }
    cases.sort_by(|a, b| a.code.cmp(&b.code));
    cases
}

fn complaints_of(case: &Case) -> (Vec<(String, String, usize)>, String, Vec<String>) {
    let intake = MemoryIntake { files: case.files.clone(), ..MemoryIntake::default() };
    let engine = libripens::reduce(&intake, None).expect("the folder can be listed");
    match case.code.as_str() {
        // Only the typesetter finds these.
        "typesetting_failed" => {
            for path in libripens::report::report_records(&engine) {
                libripens::report::make_report(&engine, &path);
            }
        }
        _ => libripens::report::examine_reports(&engine),
    }
    let complaints = engine.complaints();
    let sources = engine.sources();
    let mut found: Vec<(String, String, usize)> = complaints
        .list
        .iter()
        .map(|complaint| match complaint.place {
            Some(place) => {
                let (path, line, _) = sources.locate(place);
                (complaint.code.word().to_string(), path.to_string(), line)
            }
            None => (complaint.code.word().to_string(), String::new(), 0),
        })
        .collect();
    found.sort();
    let messages = complaints.list.iter().map(|complaint| complaint.message.clone()).collect();
    (found, print_complaints(&complaints, &sources, Look::Plain), messages)
}

#[test]
fn each_case_draws_its_complaint_and_no_other() {
    let mut faults = Vec::new();
    for case in cases() {
        let mut expected = case.expected.clone();
        expected.sort();
        let (found, printed, _) = complaints_of(&case);
        if expected.is_empty() {
            faults.push(format!("{}: the case says nowhere what it expects", case.code));
        } else if found != expected {
            faults.push(format!("{}: expected {expected:?}\n{printed}", case.code));
        }
    }
    assert!(faults.is_empty(), "{} cases are off:\n\n{}", faults.len(), faults.join("\n\n"));
}

#[test]
fn every_code_has_a_case() {
    let cases: Vec<String> = cases().into_iter().map(|case| case.code).collect();
    let without: Vec<&str> = Code::ALL
        .iter()
        .map(|code| code.word())
        .filter(|word| !cases.iter().any(|case| case == word))
        .filter(|word| !COVERED_ELSEWHERE.iter().any(|(code, _)| code == word))
        .collect();
    assert!(without.is_empty(), "no case for {without:?}");
}

#[test]
fn complaints_are_sentences_with_a_way_to_mend() {
    let mut faults = Vec::new();
    for case in cases() {
        let (_, printed, messages) = complaints_of(&case);
        for message in &messages {
            let first = message.chars().next().unwrap_or(' ');
            if first.is_lowercase() || !message.ends_with(['.', '?', '!']) {
                faults.push(format!("{}: no sentence: {message}", case.code));
            }
        }
        if !printed.contains("To mend it:") && !printed.contains("See ") {
            faults.push(format!("{}: no advice\n{printed}", case.code));
        }
    }
    assert!(faults.is_empty(), "{}", faults.join("\n\n"));
}
