//! README, DEVELOPERS and CHANGELOG agree with the code.
//!
//! Parts between `<!-- begin: NAME -->` and `<!-- end: NAME -->` are made from the code or checked against it. With
//! `RENEW_DOCUMENTS` set the made ones are rewritten.

#![allow(clippy::disallowed_methods)]

mod example;

use example::{PROGRAM, printed, repository};
use libripens::block::{Field, KINDS, Shape, outputs_table};
use libripens::diagnostic::{Code, Severity};
use libripens::method::METHODS;
use libripens::quantity::{Kind, parse_value};
use std::collections::BTreeSet;
use std::path::Path;
use std::process::Command;
use std::sync::Mutex;

/// One file is rewritten by one test at a time.
static REWRITING: Mutex<()> = Mutex::new(());

fn document(name: &str) -> String {
    std::fs::read_to_string(repository().join(name)).unwrap_or_else(|error| panic!("{name}: {error}"))
}

/// Where the text between the marks of a part begins and ends.
fn bounds(document: &str, part: &str) -> (usize, usize) {
    let (begin, end) = (format!("<!-- begin: {part} -->\n"), format!("<!-- end: {part} -->"));
    let start = document.find(&begin).unwrap_or_else(|| panic!("no {begin}")) + begin.len();
    let length = document[start..].find(&end).unwrap_or_else(|| panic!("no {end}"));
    (start, start + length)
}

fn part(name: &str, part: &str) -> String {
    let document = document(name);
    let (start, end) = bounds(&document, part);
    document[start..end].to_string()
}

/// Compares a part of the README with what the code says, or rewrites it.
fn holds(part: &str, made: &str) {
    let _alone = REWRITING.lock().unwrap_or_else(|poisoned| poisoned.into_inner());
    let readme = document("README.md");
    let (start, end) = bounds(&readme, part);
    if &readme[start..end] == made {
        return;
    }
    if std::env::var_os("RENEW_DOCUMENTS").is_some() {
        let renewed = format!("{}{made}{}", &readme[..start], &readme[end..]);
        std::fs::write(repository().join("README.md"), renewed).expect("README.md can be written");
        return;
    }
    panic!(
        "The part “{part}” of README.md differs from the code. `RENEW_DOCUMENTS=1 cargo test --test documents` rewrites \
         it; the right text is:\n\n{made}"
    );
}

/// A text as the cell of a table.
fn cell(text: &str) -> String {
    text.replace('|', "\\|").replace('<', "&lt;")
}

fn program(arguments: &[&str]) -> String {
    String::from_utf8(printed(Command::new(PROGRAM).args(arguments).env("COLUMNS", "400"))).expect("text")
}

/// Commands with their one-line help, from the program's own help.
fn commands() -> Vec<(String, String)> {
    let help = program(&["--help"]);
    let list = help.lines().skip_while(|line| *line != "Commands:").skip(1).take_while(|line| !line.is_empty());
    let pairs = list.filter_map(|line| line.trim().split_once("  ")).map(|(name, text)| (name, text.trim()));
    pairs.filter(|(name, _)| *name != "help").map(|(name, text)| (name.to_string(), text.to_string())).collect()
}

#[test]
fn commands_are_those_of_the_program() {
    let mut made = String::from("| command | does |\n|---|---|\n");
    for (name, text) in commands() {
        let help = program(&[&name, "--help"]);
        let usage = help.lines().find_map(|line| line.strip_prefix("Usage: ")).expect("a usage line");
        made += &format!("| `{}` | {} |\n", usage.trim(), cell(&text));
    }
    holds("commands", &made);
}

#[test]
fn methods_are_those_of_the_registry() {
    let mut made = String::from("| method | what it is | source | valid for |\n|---|---|---|---|\n");
    for method in METHODS {
        let info = &method.info;
        made +=
            &format!("| `{}` | {} | {} | {} |\n", info.name, cell(info.title), cell(info.source), cell(info.valid_for));
    }
    made += "\n<details>\n<summary>Formulas</summary>\n\n";
    for method in METHODS {
        made += &format!("`{}`\n\n    {}\n\n", method.info.name, method.info.formula);
    }
    holds("methods", &(made + "</details>\n"));
}

/// One check of the validation record: lines of a word and what it says.
fn checks() -> Vec<Vec<(String, String)>> {
    let record = program(&["validate"]);
    let mut checks: Vec<Vec<(String, String)>> = Vec::new();
    for line in record.lines().skip_while(|line| !line.trim_start().starts_with("1 ")) {
        let line = line.trim();
        let numbered = line.split_once("  ").filter(|(number, _)| number.parse::<usize>().is_ok());
        if numbered.is_some() {
            checks.push(Vec::new());
        }
        let rest = numbered.map_or(line, |(_, rest)| rest.trim());
        if let (Some((word, says)), Some(check)) = (rest.split_once("  "), checks.last_mut()) {
            check.push((word.to_string(), says.trim().to_string()));
        }
    }
    checks
}

#[test]
fn published_checks_are_those_of_the_validation_record() {
    let mut made = String::from("| method | source | given | quantity | printed | ours |\n|---|---|---|---|---|---|\n");
    let checks = checks();
    let expected: usize = METHODS.iter().map(|method| method.examples.len()).sum();
    assert!(checks.len() >= expected, "{} checks read from the validation record, {expected} known", checks.len());
    for check in &checks {
        let says = |word: &str| {
            check
                .iter()
                .find(|(name, _)| name == word)
                .map(|(_, says)| cell(says))
                .unwrap_or_else(|| panic!("{word}: {check:?}"))
        };
        assert_eq!(says("agrees"), "yes", "{check:?}");
        let columns = ["method", "source", "given", "quantity", "printed", "found"].map(says);
        made += &format!("| {} |\n", columns.join(" | "));
    }
    holds("checks", &made);
}

#[test]
fn outputs_are_those_of_the_kinds() {
    holds("outputs", &outputs_table());
}

/// The rows of a table of fields, those of inner mappings behind their owner's name.
fn field_rows(fields: &[Field], owner: &str, rows: &mut String) {
    for field in fields {
        let name = format!("{owner}{}", field.name);
        let needed = if field.needed { "needed" } else { "" };
        *rows += &format!("| `{name}` | {needed} | {} | {} |\n", cell(&field.shape.words()), cell(field.meaning));
        inner_rows(field.shape, &name, rows);
    }
}

fn inner_rows(shape: Shape, owner: &str, rows: &mut String) {
    match shape {
        Shape::Mapping(fields) | Shape::Mappings(fields) => field_rows(fields, &format!("{owner}: "), rows),
        Shape::Named(fields) => field_rows(fields, &format!("{owner}: NAME: "), rows),
        Shape::Either(first, second) => {
            inner_rows(*first, owner, rows);
            inner_rows(*second, owner, rows);
        }
        _ => {}
    }
}

#[test]
fn fields_are_those_of_the_kinds() {
    let mut made = String::new();
    for kind in KINDS {
        made += &format!("\n`{}`: {}\n\n| field | | holds | meaning |\n|---|---|---|---|\n", kind.name, kind.meaning);
        field_rows(kind.fields, "", &mut made);
    }
    holds("fields", &made);
}

#[test]
fn complaints_are_those_of_the_code() {
    let mut made = String::from("| complaint | weight | meaning |\n|---|---|---|\n");
    for code in Code::ALL {
        let weight = if code.severity() == Severity::Fault { "fault" } else { "warning" };
        made += &format!("| `{}` | {weight} | {} |\n", code.word(), cell(code.meaning()));
    }
    holds("complaints", &made);
}

/// Every key below a value, with the keys of a list taken together.
fn keys(value: &serde_json::Value, owner: &str, found: &mut BTreeSet<String>) {
    match value {
        serde_json::Value::Object(fields) => {
            for (key, inner) in fields {
                let path = if owner.is_empty() { key.clone() } else { format!("{owner}.{key}") };
                keys(inner, &path, found);
                found.insert(path);
            }
        }
        serde_json::Value::Array(items) => items.iter().for_each(|item| keys(item, owner, found)),
        _ => {}
    }
}

#[test]
fn every_key_of_the_results_is_documented() {
    let results =
        Command::new(PROGRAM).args(["reduce", "--json", "example-records"]).current_dir(repository()).output();
    let results = serde_json::from_slice(&results.expect("the program starts").stdout).expect("JSON");
    let mut found = BTreeSet::new();
    keys(&results, "", &mut found);
    let documented: BTreeSet<String> = part("README.md", "json keys")
        .lines()
        .filter_map(|line| line.strip_prefix("| `")?.split('`').next())
        .map(String::from)
        .collect();
    assert_eq!(documented, found, "left: documented, right: found");
}

#[test]
fn every_documented_notation_is_read() {
    let notations = part("README.md", "notations");
    assert!(notations.lines().count() >= 10);
    for line in notations.lines() {
        let text = line.trim().split("   ").next().expect("a value");
        let kind = if text.ends_with("°C") || text.contains("°C ±") { Kind::Temperature } else { Kind::Plain };
        let read = parse_value(text, kind);
        assert!(read.is_ok(), "{text}: {read:?}");
    }
}

/// The words behind `usage:` in the table of functions.
fn usages() -> BTreeSet<String> {
    let source = document("src/report/expression.rs");
    let usages = source
        .split("usage: \"")
        .skip(1)
        .map(|rest| rest.split("\",").next().unwrap_or_default().replace("\\\"", "\""));
    usages.collect()
}

#[test]
fn every_function_of_reports_is_documented() {
    let documented: BTreeSet<String> = part("README.md", "functions")
        .lines()
        .filter_map(|line| line.strip_prefix("| `")?.split('`').next())
        .map(String::from)
        .collect();
    assert_eq!(documented, usages(), "left: documented, right: known to the program");
}

#[test]
fn records_shown_are_parts_of_the_example() {
    for (part_name, path) in [("record of a day", "day-1.md"), ("record of the report", "report.md")] {
        let shown = part("README.md", part_name);
        let shown = shown.trim().trim_start_matches("````markdown\n").trim_end_matches("````").trim();
        let record = document(&format!("example-records/campaigns/two-kilograms/{path}"));
        for paragraph in shown.split("\n\n") {
            assert!(record.contains(paragraph), "{path} does not say\n{paragraph}");
        }
    }
}

#[test]
fn exit_statuses_are_those_of_the_help() {
    let help = program(&["--help"]).split_whitespace().collect::<Vec<_>>().join(" ");
    let readme = document("README.md");
    for status in
        ["0 all well", "1 records or report have faults, each was printed", "2 the command could not be carried out"]
    {
        assert!(help.contains(status), "the help does not say: {status}");
        let (number, meaning) = status.split_once(' ').expect("a number and its meaning");
        assert!(
            readme.contains(&format!("| {number} | {} |", meaning.replace(", each", "; each"))),
            "README.md lacks status {status}"
        );
    }
}

#[test]
fn the_two_commands_are_those_of_ci() {
    let readme = document("README.md");
    let commands: Vec<&str> = readme.lines().filter_map(|line| line.strip_prefix("    cargo ")).collect();
    assert_eq!(commands, ["run --release -- report example-records/campaigns/two-kilograms/report.md", "test"]);
    let checks = document(".ci/run");
    for line in ["cargo fmt --check", "cargo clippy --all-targets -- -D warnings", "cargo test"] {
        assert!(checks.lines().any(|own| own == line), ".ci/run does not run {line}");
    }
    assert_eq!(part("DEVELOPERS.md", "test command").trim(), "cargo test");
}

/// Folders below a folder, with `/` at their ends.
fn folders(root: &Path, prefix: &str, found: &mut BTreeSet<String>) {
    for entry in std::fs::read_dir(root.join(prefix)).expect("a folder") {
        let entry = entry.expect("an entry");
        if entry.file_type().is_ok_and(|kind| kind.is_dir()) {
            let inside = format!("{prefix}{}/", entry.file_name().to_string_lossy());
            folders(root, &inside, found);
            found.insert(inside);
        }
    }
}

#[test]
fn the_tree_is_that_of_the_repository() {
    let mut found = BTreeSet::new();
    folders(repository(), "src/", &mut found);
    found.extend(["templates/", "tests/", "example-records/", "benches/"].map(String::from));
    let documented: BTreeSet<String> = part("DEVELOPERS.md", "tree")
        .lines()
        .filter_map(|line| line.strip_prefix("| `")?.split('`').next())
        .map(String::from)
        .collect();
    assert_eq!(documented, found, "left: documented, right: found");
}

#[test]
fn tests_and_benches_named_are_those_there() {
    let developers = document("DEVELOPERS.md");
    for (folder, form) in [("tests", "`tests/NAME.rs`"), ("benches", "`cargo bench --bench NAME`")] {
        for entry in std::fs::read_dir(repository().join(folder)).expect("a folder") {
            let file = entry.expect("an entry").file_name().to_string_lossy().into_owned();
            let Some(name) = file.strip_suffix(".rs") else { continue };
            assert!(developers.contains(&form.replace("NAME", name)), "DEVELOPERS.md does not name {folder}/{file}");
        }
    }
}

#[test]
fn links_between_files_lead_somewhere() {
    for name in ["README.md", "DEVELOPERS.md", "CHANGELOG.md"] {
        let text = document(name);
        for link in text.split("](").skip(1).filter_map(|rest| rest.split(')').next()) {
            assert!(
                link.contains("://") || repository().join(link).is_file(),
                "{name} links to {link}, which is not there"
            );
        }
    }
}

#[test]
fn changes_tell_of_this_version() {
    let heading = format!("## {}", env!("CARGO_PKG_VERSION"));
    assert!(document("CHANGELOG.md").lines().any(|line| line == heading), "CHANGELOG.md has no {heading}");
}

#[test]
fn the_picture_is_small() {
    let size = std::fs::metadata(repository().join("example-records/report-page.png")).expect("the picture").len();
    assert!(size < 200_000, "{size} bytes");
}
