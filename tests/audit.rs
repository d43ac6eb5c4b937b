//! What an audit finds in a report that was meddled with, and that it names the cause.

#![allow(clippy::disallowed_methods)]

mod example;

use example::{CAMPAIGN, PROGRAM, REPORT, example_files, example_report, fresh, printed, write_files};
use libripens::register::{Audit, Verdict, audit_report, originals};
use libripens::report::dossier::{CONTENTS, Contents, DERIVATION, RESULTS, sha256};
use lopdf::content::Content;
use lopdf::{Dictionary, Document, IncrementalDocument, Object, ObjectId, Stream, StringFormat};
use std::process::Command;

/// Every check of an audit, in order.
const CHECKS: [&str; 12] = [
    "single revision",
    "nothing active",
    "attachments",
    "seal",
    "issue",
    "register",
    "status",
    "re-reduction",
    "printed digits",
    "derivation",
    "pages",
    "records",
];
/// A raw data file of the example, as attached.
const RAW: &str = "campaigns--two-kilograms--raw--day-1.csv";

fn audit(bytes: &[u8]) -> Audit {
    audit_report(bytes).unwrap_or_else(|problem| panic!("{}", problem.message))
}

fn failed(audit: &Audit) -> Vec<&'static str> {
    audit.checks.iter().filter(|check| check.verdict == Verdict::Failed).map(|check| check.what).collect()
}

fn says(audit: &Audit, what: &str) -> String {
    audit.checks.iter().find(|check| check.what == what).map(|check| check.says.clone()).expect("the check")
}

/// The example report with something done to its objects.
fn meddled(meddle: impl FnOnce(&mut Document)) -> Vec<u8> {
    let mut document = Document::load_mem(&example_report().pdf).expect("loads");
    meddle(&mut document);
    saved(&mut document)
}

fn saved(document: &mut Document) -> Vec<u8> {
    let mut bytes = Vec::new();
    document.save_to(&mut bytes).expect("saves");
    bytes
}

/// The object number of the file specification with this name, and that of its bytes.
fn attachment(document: &Document, name: &str) -> (ObjectId, ObjectId) {
    let is_named = |dictionary: &Dictionary| {
        let text = dictionary.get(b"UF").and_then(Object::as_str).unwrap_or_default();
        let utf16: Vec<u8> = [0xfe, 0xff].into_iter().chain(name.encode_utf16().flat_map(u16::to_be_bytes)).collect();
        dictionary.has(b"EF") && (text == name.as_bytes() || text == utf16)
    };
    let found = document.objects.iter().find(|(_, object)| object.as_dict().is_ok_and(is_named));
    let (id, file) = found.unwrap_or_else(|| panic!("no attachment {name}"));
    let streams = file.as_dict().and_then(|file| file.get(b"EF")).and_then(Object::as_dict).expect("streams");
    (*id, streams.get(b"F").and_then(Object::as_reference).expect("a stream"))
}

/// Puts other bytes into every stream of an attachment.
fn replace(document: &mut Document, name: &str, bytes: &[u8]) {
    let (file, stream) = attachment(document, name);
    let file = document.get_dictionary(file).expect("a file specification").clone();
    let streams = file.get(b"EF").and_then(Object::as_dict).expect("streams").clone();
    let ids: Vec<ObjectId> =
        streams.iter().filter_map(|(_, object)| object.as_reference().ok()).chain([stream]).collect();
    for id in ids {
        let mut fields = document.get_object(id).and_then(Object::as_stream).expect("a stream").dict.clone();
        for key in [&b"Filter"[..], b"DecodeParms", b"Length"] {
            fields.remove(key);
        }
        document.set_object(id, Stream::new(fields, bytes.to_vec()));
    }
}

/// The list of attachments in the tree of names: pairs of name and file.
fn name_list(document: &mut Document) -> &mut Vec<Object> {
    let mut id = document.trailer.get(b"Root").and_then(Object::as_reference).expect("a catalog");
    let mut path: Vec<&[u8]> = Vec::new();
    for key in [&b"Names"[..], b"EmbeddedFiles", b"Names"] {
        path.push(key);
        let held = path.iter().fold(document.get_object(id).expect("an object"), |object, key| {
            object.as_dict().and_then(|dictionary| dictionary.get(key)).expect("an entry")
        });
        if let Ok(reference) = held.as_reference() {
            id = reference;
            path.clear();
        }
    }
    let holder = document.get_object_mut(id).expect("an object");
    let list = path.iter().fold(holder, |object, key| {
        object.as_dict_mut().and_then(|dictionary| dictionary.get_mut(key)).expect("an entry")
    });
    list.as_array_mut().expect("a list")
}

/// A file of the dossier with one text, the first behind `after`, replaced by another of the same length.
fn altered(name: &str, after: &str, old: &str, new: &str) -> Vec<u8> {
    assert_eq!(old.len(), new.len());
    let text = String::from_utf8(example_report().dossier.files[name].clone()).expect("text");
    let start = text.find(after).unwrap_or_else(|| panic!("{name} has no {after}"));
    let (before, rest) = text.split_at(start);
    assert!(rest.contains(old), "{name} has no {old} behind {after}");
    format!("{before}{}", rest.replacen(old, new, 1)).into_bytes()
}

/// A number as text with its digit at `from_end`, counted from the end, made another one.
fn other_digit(number: &str, from_end: usize) -> String {
    let at = number.len() - 1 - from_end;
    let digit = number[at..=at].parse::<u32>().expect("a digit");
    format!("{}{}{}", &number[..at], (digit + 1) % 10, &number[at + 1..])
}

/// The raw data with one digit of a reading changed.
fn altered_reading() -> Vec<u8> {
    let bytes = &example_report().dossier.files[RAW];
    let text = std::str::from_utf8(bytes).expect("text");
    let column =
        text.lines().next().expect("heads").split(',').position(|head| head == "reading_mg").expect("the column");
    let cell = text.lines().nth(1).expect("a row").split(',').nth(column).expect("a cell");
    altered(RAW, "\n", cell, &other_digit(cell, 0))
}

/// The list of contents with the hash of one file brought in line with other bytes.
fn covering_list(name: &str, bytes: &[u8]) -> Vec<u8> {
    let mut contents: Contents = serde_json::from_slice(&example_report().dossier.files[CONTENTS]).expect("a list");
    for entry in contents.files.iter_mut().filter(|entry| entry.name == name) {
        entry.sha256 = sha256(bytes);
        entry.bytes = bytes.len() as u64;
    }
    let mut text = serde_json::to_string_pretty(&contents).expect("a list");
    text.push('\n');
    text.into_bytes()
}

#[test]
fn an_untouched_report_passes_every_check() {
    let audit = audit(&example_report().pdf);
    assert_eq!(audit.checks.iter().map(|check| check.what).collect::<Vec<_>>(), CHECKS);
    // A draft says nothing of its issue, and nothing was given to hold it against.
    let unchecked = ["issue", "register", "status", "records"];
    for check in &audit.checks {
        let expected = if unchecked.contains(&check.what) { Verdict::NotChecked } else { Verdict::Passed };
        assert_eq!(check.verdict, expected, "{audit:#?}");
    }
    assert!(says(&audit, "seal").contains(&example_report().dossier.seal));
}

#[test]
fn a_digit_changed_in_an_attached_reading_is_named() {
    let audit = audit(&meddled(|document| replace(document, RAW, &altered_reading())));
    assert_eq!(failed(&audit), ["attachments", "re-reduction", "printed digits", "derivation", "pages"], "{audit:#?}");
    assert_eq!(says(&audit, "attachments"), format!("{RAW} was changed"));
    assert!(says(&audit, "re-reduction").contains("R1.mass"), "{audit:#?}");
}

#[test]
fn a_digit_changed_in_an_attached_reading_and_in_the_list_is_found_by_recomputing() {
    let reading = altered_reading();
    let bytes = meddled(|document| {
        replace(document, RAW, &reading);
        replace(document, CONTENTS, &covering_list(RAW, &reading));
    });
    let audit = audit(&bytes);
    let failed = failed(&audit);
    assert!(
        !failed.contains(&"attachments") && failed.contains(&"re-reduction") && failed.contains(&"pages"),
        "{audit:#?}"
    );
}

#[test]
fn a_digit_changed_in_the_attached_results_is_named() {
    let value = result("R1.mass")["value"].to_string();
    let results = altered(RESULTS, "\"R1.mass\"", &value, &other_digit(&value, 5));
    let audit = audit(&meddled(|document| replace(document, RESULTS, &results)));
    assert_eq!(failed(&audit), ["attachments", "re-reduction", "pages"], "{audit:#?}");
    assert!(says(&audit, "re-reduction").contains("differing: R1.mass"), "{audit:#?}");
}

#[test]
fn a_digit_changed_in_the_attached_printed_text_is_named() {
    let printed = result("R1.mass")["printed"].as_str().expect("a text").to_string();
    let other = printed.replacen("999", "899", 1);
    let results = altered(RESULTS, "\"R1.mass\"", &printed, &other);
    let audit = audit(&meddled(|document| replace(document, RESULTS, &results)));
    assert_eq!(failed(&audit), ["attachments", "printed digits", "pages"], "{audit:#?}");
    assert!(says(&audit, "printed digits").contains(&other), "{audit:#?}");
}

#[test]
fn a_changed_derivation_is_named() {
    let derivation = altered(DERIVATION, "\"nodes\"", "\"operation\"", "\"operatiom\"");
    let audit = audit(&meddled(|document| replace(document, DERIVATION, &derivation)));
    assert_eq!(failed(&audit), ["attachments", "derivation", "pages"], "{audit:#?}");
}

fn result(name: &str) -> serde_json::Value {
    let results: serde_json::Value = serde_json::from_slice(&example_report().dossier.files[RESULTS]).expect("results");
    results["quantities"]
        .as_array()
        .expect("a list")
        .iter()
        .find(|one| one["name"] == name)
        .expect("the result")
        .clone()
}

#[test]
fn a_glyph_changed_on_a_page_is_found_although_the_attachments_are_whole() {
    let bytes = meddled(|document| {
        let page = document.page_iter().nth(1).expect("a page");
        let mut content = Content::decode(&document.get_page_content(page)).expect("content");
        let strings =
            content.operations.iter_mut().filter(|operation| matches!(operation.operator.as_str(), "Tj" | "TJ"));
        let mut bytes = strings.flat_map(|operation| operation.operands.iter_mut()).flat_map(strings_in);
        // Two glyphs change places: the page shows another number, no new letter.
        let string = bytes.find(|string| string.len() >= 8 && string[..2] != string[2..4]).expect("a text on the page");
        string[..4].rotate_left(2);
        document.change_page_content(page, content.encode().expect("content")).expect("a page");
    });
    let audit = audit(&bytes);
    assert_eq!(failed(&audit), ["pages"], "{audit:#?}");
    assert!(says(&audit, "pages").contains("pages or structure were altered"), "{audit:#?}");
}

fn strings_in(operand: &mut Object) -> Vec<&mut Vec<u8>> {
    match operand {
        Object::String(bytes, StringFormat::Literal | StringFormat::Hexadecimal) => vec![bytes],
        Object::Array(items) => items.iter_mut().flat_map(strings_in).collect(),
        _ => Vec::new(),
    }
}

#[test]
fn a_removed_attachment_is_named() {
    let audit = audit(&meddled(|document| {
        let (file, _) = attachment(document, RAW);
        let list = name_list(document);
        let at = list.iter().position(|object| object.as_reference().is_ok_and(|id| id == file)).expect("in the list");
        list.drain(at - 1..=at);
    }));
    assert!(failed(&audit).contains(&"attachments"), "{audit:#?}");
    assert_eq!(says(&audit, "attachments"), format!("{RAW} is listed but not attached"));
    assert!(failed(&audit).contains(&"pages"), "{audit:#?}");
}

#[test]
fn an_added_attachment_is_named() {
    let audit = audit(&meddled(|document| {
        let stream =
            document.add_object(Stream::new(lopdf::dictionary! { "Type" => "EmbeddedFile" }, b"1,2\n".to_vec()));
        let name = || Object::string_literal("raw--day-4.csv");
        let streams = lopdf::dictionary! { "F" => stream, "UF" => stream };
        let file = document
            .add_object(lopdf::dictionary! { "Type" => "Filespec", "F" => name(), "UF" => name(), "EF" => streams });
        name_list(document).extend([name(), file.into()]);
    }));
    assert_eq!(failed(&audit), ["attachments", "pages"], "{audit:#?}");
    assert_eq!(says(&audit, "attachments"), "raw--day-4.csv is attached but not listed");
}

#[test]
fn a_list_of_attachments_in_another_order_is_found() {
    let audit = audit(&meddled(|document| name_list(document).rotate_left(2)));
    assert_eq!(failed(&audit), ["pages"], "{audit:#?}");
    let mut contents: Contents = serde_json::from_slice(&example_report().dossier.files[CONTENTS]).expect("a list");
    contents.files.reverse();
    let audit = audit_with_list(&serde_json::to_vec_pretty(&contents).expect("a list"));
    assert_eq!(failed(&audit), ["pages"], "{audit:#?}");
    assert!(!says(&audit, "seal").contains(&example_report().dossier.seal), "another list has another seal");
}

/// The audit of the example with another list of contents.
fn audit_with_list(contents: &[u8]) -> Audit {
    audit(&meddled(|document| replace(document, CONTENTS, contents)))
}

#[test]
fn a_list_of_contents_that_is_missing_or_unreadable_leaves_the_rest_unchecked() {
    let audit = audit_with_list(b"{\"format\": 1");
    assert_eq!(failed(&audit), ["attachments"], "{audit:#?}");
    assert!(says(&audit, "attachments").starts_with("contents.json cannot be read"), "{audit:#?}");
    let unchecked = audit.checks.iter().filter(|check| check.verdict == Verdict::NotChecked).count();
    assert_eq!(unchecked, 9, "{audit:#?}");
}

#[test]
fn an_appended_revision_is_named() {
    let original = &example_report().pdf;
    let mut update = IncrementalDocument::create_from(original.clone(), Document::load_mem(original).expect("loads"));
    update.new_document.add_object(Object::string_literal("later"));
    let mut bytes = Vec::new();
    update.save_to(&mut bytes).expect("saves");
    let audit = audit(&bytes);
    assert!(failed(&audit).contains(&"single revision") && failed(&audit).contains(&"pages"), "{audit:#?}");
    assert!(says(&audit, "single revision").contains("2 revisions"), "{audit:#?}");
}

#[test]
fn bytes_behind_the_end_are_named() {
    let mut bytes = example_report().pdf.clone();
    bytes.extend(b"\nanother word\n");
    match audit_report(&bytes) {
        Ok(audit) => {
            assert_eq!(failed(&audit), ["single revision", "pages"], "{audit:#?}");
            assert_eq!(says(&audit, "single revision"), "bytes stand behind the end of the file");
        }
        Err(problem) => assert!(problem.message.starts_with("The PDF cannot be read back"), "{}", problem.message),
    }
}

#[test]
fn a_script_is_named() {
    let audit = audit(&meddled(|document| {
        let action =
            document.add_object(lopdf::dictionary! { "S" => "JavaScript", "JS" => Object::string_literal("1") });
        document.catalog_mut().expect("a catalog").set("OpenAction", action);
    }));
    assert_eq!(failed(&audit), ["nothing active", "pages"], "{audit:#?}");
    assert!(says(&audit, "nothing active").contains("scripts"), "{audit:#?}");
}

#[test]
fn a_truncated_file_is_refused_in_words() {
    let original = &example_report().pdf;
    for length in [0, 1, 9, 1024, original.len() / 2, original.len() - 40] {
        let problem = audit_report(&original[..length]).expect_err("no whole PDF");
        assert!(problem.message.starts_with("The PDF cannot be read back"), "{}", problem.message);
    }
    // What is not a PDF at all.
    assert!(audit_report(b"# A record\n").is_err());
}

#[test]
fn a_flipped_bit_never_passes_and_never_panics() {
    let original = &example_report().pdf;
    let mut state = 0x2545_f491_4f6c_dd1d_u64;
    let mut random = move |below: usize| {
        state ^= state << 13;
        state ^= state >> 7;
        state ^= state << 17;
        (state % below as u64) as usize
    };
    for _ in 0..24 {
        let mut bytes = original.clone();
        let at = random(bytes.len());
        bytes[at] ^= 1 << random(8);
        let clean = audit_report(&bytes).is_ok_and(|audit| audit.is_clean());
        assert!(!clean, "a bit flipped in byte {at} passes");
    }
}

#[test]
fn the_command_tells_by_its_exit_status() {
    let folder = fresh("audit-command");
    let status = |name: &str, bytes: &[u8]| {
        let path = folder.join(name);
        std::fs::write(&path, bytes).expect("a file to write");
        Command::new(PROGRAM).arg("audit").arg(&path).output().expect("the program starts").status.code()
    };
    assert_eq!(status("whole.pdf", &example_report().pdf), Some(0));
    assert_eq!(status("altered.pdf", &meddled(|document| replace(document, RAW, &altered_reading()))), Some(1));
    assert_eq!(status("half.pdf", &example_report().pdf[..1000]), Some(2));
}

#[test]
fn originals_are_the_files_of_the_folder() {
    let files = example_files();
    for (path, bytes) in originals(&example_report().pdf).expect("originals") {
        match files.get(&path) {
            Some(own) => assert!(*own == bytes, "{path} was attached otherwise"),
            None => assert!(path.starts_with("templates/"), "{path} is not in the folder"),
        }
    }
}

#[test]
fn extracted_records_give_the_same_results_and_the_same_pdf() {
    let folder = fresh("audit-extract");
    let pdf = folder.join("report.pdf");
    std::fs::write(&pdf, &example_report().pdf).expect("a file to write");
    let program = || Command::new(PROGRAM);
    let extracted = folder.join("extracted");
    printed(program().arg("audit").arg(&pdf).arg("--extract").arg(&extracted));
    let original = folder.join("original");
    write_files(&original, &example_files());
    let campaign = |root: &std::path::Path| root.join("campaigns").join(CAMPAIGN);
    let reduced = |root: &std::path::Path| -> Vec<serde_json::Value> {
        let printed = printed(program().args(["reduce", "--json"]).arg(campaign(root)));
        let made: serde_json::Value = serde_json::from_slice(&printed).expect("JSON");
        made["quantities"].as_array().expect("quantities").clone()
    };
    // The folder holds records of other campaigns' standards as well; what the report rests on is the same.
    let (alone, among_others) = (reduced(&extracted), reduced(&original));
    assert!(alone.len() > 100 && alone.len() < among_others.len());
    for quantity in &alone {
        assert!(among_others.contains(quantity), "the extracted records give another {}", quantity["name"]);
    }
    let again = folder.join("again.pdf");
    printed(program().arg("report").arg(extracted.join(REPORT)).arg("--output").arg(&again));
    assert!(std::fs::read(&again).expect("a report") == example_report().pdf, "the extracted records give another PDF");
    // A second extraction overwrites nothing.
    let refused =
        program().arg("audit").arg(&pdf).arg("--extract").arg(&extracted).output().expect("the program starts");
    assert_eq!(refused.status.code(), Some(2));
}
