//! The example report seen by programs that know nothing of this one: the Poppler tools and qpdf.
//!
//! Where a tool is not installed the test says so and checks nothing; with `LIBRIPENS_TOOLS_REQUIRED` set, as in
//! `.ci/run`, a missing tool is a failure.

#![allow(clippy::disallowed_methods)]

mod example;

use example::{example_report, fresh};
use libripens::report::dossier::RESULTS;
use lopdf::{Dictionary, Document, Object};
use std::io::ErrorKind;
use std::path::PathBuf;
use std::process::Command;

/// The report as a file of the test's own.
fn pdf(test: &str) -> PathBuf {
    let path = fresh(&format!("pdf-tools-{test}")).join("report.pdf");
    std::fs::write(&path, &example_report().pdf).expect("a file to write");
    path
}

/// What a tool prints about the report; none where it is not installed.
fn tool(name: &str, arguments: &[&str]) -> Option<String> {
    match Command::new(name).args(arguments).output() {
        Ok(output) => {
            let said = String::from_utf8_lossy(&output.stderr);
            assert!(output.status.success(), "{name} {arguments:?}: {said}");
            Some(String::from_utf8(output.stdout).expect("text in UTF-8"))
        }
        Err(error) if error.kind() == ErrorKind::NotFound && std::env::var_os("LIBRIPENS_TOOLS_REQUIRED").is_none() => {
            eprintln!("NOT CHECKED: {name} is not installed (Debian: apt-get install poppler-utils qpdf)");
            None
        }
        Err(error) => panic!("{name} cannot be started: {error}"),
    }
}

/// The text of each page in reading order; none where the tool is not installed.
fn pages(test: &str) -> Option<Vec<String>> {
    let path = pdf(test);
    let text = tool("pdftotext", &["-layout", path.to_str().expect("a path in UTF-8"), "-"])?;
    let mut pages: Vec<String> = text.split('\u{c}').map(String::from).collect();
    assert_eq!(pages.pop().as_deref(), Some(""), "every page ends with a form feed");
    Some(pages)
}

/// The text with all white space taken as one space, thin and no-break spaces too.
fn plain(text: &str) -> String {
    text.split_whitespace().collect::<Vec<_>>().join(" ")
}

fn results() -> serde_json::Value {
    serde_json::from_slice(&example_report().dossier.files[RESULTS]).expect("results")
}

fn printed_of(name: &str) -> String {
    let results = results();
    let quantities = results["quantities"].as_array().expect("a list");
    let found = quantities.iter().find(|quantity| quantity["name"] == name).expect("the quantity");
    found["printed"].as_str().expect("a text").to_string()
}

#[test]
fn pdfinfo_reads_the_form_of_the_file() {
    let path = pdf("info");
    let Some(info) = tool("pdfinfo", &[path.to_str().expect("a path in UTF-8")]) else { return };
    let field = |name: &str| info.lines().find_map(|line| line.strip_prefix(name)).map(str::trim).unwrap_or_default();
    assert_eq!(field("PDF version:"), "1.7");
    assert_eq!(field("Tagged:"), "yes");
    assert_eq!(field("Title:"), "Calibration of two one-kilogram mass standards");
    assert_eq!(field("Author:"), "Northgate Institute of Mass Standards");
    assert_eq!(field("JavaScript:"), "no");
    assert_eq!(field("Encrypted:"), "no");
    assert!(field("Page size:").contains("A4"), "{info}");
    let pages: usize = field("Pages:").parse().expect("a number");
    assert!((4..=8).contains(&pages), "{pages} pages");
    assert_eq!(pages, example_report().pages);
}

#[test]
fn pdfinfo_finds_both_conformance_levels_claimed() {
    let path = pdf("metadata");
    let Some(metadata) = tool("pdfinfo", &["-meta", path.to_str().expect("a path in UTF-8")]) else { return };
    for claim in
        ["<pdfaid:part>3</pdfaid:part>", "<pdfaid:conformance>A</pdfaid:conformance>", "<pdfuaid:part>1</pdfuaid:part>"]
    {
        assert!(metadata.contains(claim), "{claim} is not in\n{metadata}");
    }
}

#[test]
fn pdfdetach_saves_identical_files() {
    let path = pdf("detach");
    let folder = path.with_file_name("saved");
    std::fs::create_dir(&folder).expect("a folder to write in");
    let path = path.to_str().expect("a path in UTF-8");
    let Some(listed) = tool("pdfdetach", &["-list", path]) else { return };
    tool("pdfdetach", &["-saveall", "-o", folder.to_str().expect("a path in UTF-8"), path]);
    let files = &example_report().dossier.files;
    assert!(listed.starts_with(&format!("{} embedded files", files.len())), "{listed}");
    for (name, bytes) in files {
        assert!(listed.contains(&format!(": {name}\n")), "{name} is not in\n{listed}");
        assert!(std::fs::read(folder.join(name)).is_ok_and(|saved| saved == *bytes), "{name} was saved otherwise");
    }
    assert_eq!(std::fs::read_dir(&folder).expect("a folder").count(), files.len());
}

#[test]
fn pdftotext_finds_the_digits_of_every_result() {
    let Some(pages) = pages("text") else { return };
    let text = plain(&pages.concat());
    for name in [
        "W1.difference",
        "W2.difference",
        "W3.difference",
        "W4.difference",
        "W5.difference",
        "W6.difference",
        "W1.air.density",
    ] {
        let printed = plain(&printed_of(name));
        assert!(text.contains(&printed), "{name}: {printed} is on no page");
    }
    for name in ["R1.mass", "R1.conventional_mass", "R2.mass", "R2.conventional_mass"] {
        let printed = printed_of(name);
        let digits = plain(printed.split('(').next().expect("digits"));
        assert!(text.contains(&digits), "{name}: {digits} is on no page");
    }
}

#[test]
fn every_page_says_draft_and_its_number_and_the_last_one_ends() {
    let Some(pages) = pages("marks") else { return };
    let count = pages.len();
    let ends = |page: &str| plain(page).to_lowercase().contains("end of report");
    for (index, page) in pages.iter().enumerate() {
        let text = plain(page);
        assert!(text.contains("DRAFT"), "page {} does not say DRAFT", index + 1);
        assert!(
            text.to_lowercase().contains(&format!("page {} of {count}", index + 1)),
            "page {} of {count}:\n{text}",
            index + 1
        );
        assert_eq!(ends(page), index + 1 == count, "the end mark stands on the last page alone; page {}", index + 1);
    }
}

/// Attributes of an element of the word boxes: `<word xMin="1" yMin="2" …`.
fn attribute(line: &str, name: &str) -> f64 {
    let start = line.find(&format!("{name}=\"")).expect("the attribute") + name.len() + 2;
    line[start..].split('"').next().and_then(|number| number.parse().ok()).expect("a number")
}

#[test]
fn no_word_stands_outside_the_page() {
    let path = pdf("boxes");
    let Some(boxes) = tool("pdftotext", &["-bbox", path.to_str().expect("a path in UTF-8"), "-"]) else { return };
    /// Nothing printed comes nearer to the edge of the paper, in points.
    const EDGE: f64 = 18.0;
    let (mut width, mut height, mut words) = (0.0, 0.0, 0);
    for line in boxes.lines().map(str::trim) {
        if line.starts_with("<page ") {
            (width, height) = (attribute(line, "width"), attribute(line, "height"));
        } else if line.starts_with("<word ") {
            words += 1;
            let inside = attribute(line, "xMin") >= EDGE
                && attribute(line, "yMin") >= EDGE
                && attribute(line, "xMax") <= width - EDGE
                && attribute(line, "yMax") <= height - EDGE;
            assert!(inside, "outside a page of {width} × {height}: {line}");
        }
    }
    assert!(words > 1000, "{words} words");
}

#[test]
fn qpdf_finds_no_fault() {
    let path = pdf("qpdf");
    let Some(said) = tool("qpdf", &["--check", path.to_str().expect("a path in UTF-8")]) else { return };
    assert!(said.contains("No syntax or stream encoding errors"), "{said}");
}

/// Dictionaries of the structure tree with this role.
fn elements<'a>(document: &'a Document, role: &[u8]) -> Vec<&'a Dictionary> {
    let is = |dictionary: &&Dictionary| {
        dictionary.get(b"S").and_then(Object::as_name).is_ok_and(|name| name == role) && dictionary.has(b"P")
    };
    document.objects.values().filter_map(|object| object.as_dict().ok()).filter(is).collect()
}

#[test]
fn every_figure_and_formula_has_alternative_text() {
    let document = Document::load_mem(&example_report().pdf).expect("loads");
    let figures = elements(&document, b"Figure");
    assert!(!figures.is_empty(), "the report has charts");
    for element in figures.into_iter().chain(elements(&document, b"Formula")) {
        let text = element.get(b"Alt").ok().and_then(|object| document.dereference(object).ok());
        let length = text.and_then(|(_, object)| object.as_str().ok()).map_or(0, <[u8]>::len);
        assert!(length > 10, "an element without alternative text: {element:?}");
    }
}
