//! The example records in memory and the report made of them, for the tests that take a report apart.

#![allow(dead_code, clippy::disallowed_methods)]

use libripens::block::Engine;
use libripens::intake::MemoryIntake;
use libripens::report::{Report, make_report};
use std::collections::BTreeMap;
use std::path::{Path, PathBuf};
use std::process::{Command, Output};
use std::sync::OnceLock;

/// The program under test.
pub const PROGRAM: &str = env!("CARGO_BIN_EXE_libripens");
/// The campaign of the example, and its report record.
pub const CAMPAIGN: &str = "two-kilograms";
pub const REPORT: &str = "campaigns/two-kilograms/report.md";

/// The folder of the repository.
pub fn repository() -> &'static Path {
    Path::new(env!("CARGO_MANIFEST_DIR"))
}

/// Every file of the example but reports made of it, by path.
pub fn example_files() -> BTreeMap<String, Vec<u8>> {
    let mut found = BTreeMap::new();
    walk(&repository().join("example-records"), "", &mut found);
    found
}

fn walk(folder: &Path, prefix: &str, found: &mut BTreeMap<String, Vec<u8>>) {
    for entry in std::fs::read_dir(folder).expect("a folder") {
        let path = entry.expect("an entry").path();
        let name = path.file_name().and_then(|name| name.to_str()).expect("a name in UTF-8");
        let inside = if prefix.is_empty() { name.to_string() } else { format!("{prefix}/{name}") };
        if path.is_dir() {
            walk(&path, &inside, found);
        } else if !inside.ends_with(".pdf") {
            found.insert(inside, std::fs::read(&path).expect("a file"));
        }
    }
}

/// Makes the report of a laboratory folder that draws no complaint.
pub fn report_of(intake: &MemoryIntake) -> Report {
    let engine = Engine::read(intake, Some(CAMPAIGN)).expect("a folder in memory can be listed");
    let report = make_report(&engine, REPORT);
    let complaints = engine.complaints();
    assert!(!complaints.has_faults(), "{:#?}", complaints.list);
    report.expect("a report without complaints")
}

/// The report of the example, made once a test program.
pub fn example_report() -> &'static Report {
    static REPORT: OnceLock<Report> = OnceLock::new();
    REPORT.get_or_init(|| report_of(&MemoryIntake::with(example_files())))
}

/// A folder of its own for a test to write in, empty.
pub fn fresh(name: &str) -> PathBuf {
    let folder = Path::new(env!("CARGO_TARGET_TMPDIR")).join(name);
    let _ = std::fs::remove_dir_all(&folder);
    std::fs::create_dir_all(&folder).expect("a folder to write in");
    folder
}

/// Writes files under a folder.
pub fn write_files(folder: &Path, files: &BTreeMap<String, Vec<u8>>) {
    for (path, bytes) in files {
        let target = folder.join(path);
        std::fs::create_dir_all(target.parent().expect("a folder")).expect("a folder to write in");
        std::fs::write(target, bytes).expect("a file to write");
    }
}

/// What a command printed, when it ended with exit status 0.
pub fn printed(command: &mut Command) -> Vec<u8> {
    let output: Output = command.output().expect("the program starts");
    let said = String::from_utf8_lossy(&output.stderr);
    assert_eq!(output.status.code(), Some(0), "{command:?}: {said}");
    output.stdout
}
