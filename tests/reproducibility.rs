//! The same records give the same bytes: in any folder, on any day, on any number of threads, with any processor.

#![allow(clippy::disallowed_methods)]

mod example;

use example::{CAMPAIGN, PROGRAM, REPORT, example_files, example_report, fresh, printed, report_of, write_files};
use libripens::intake::MemoryIntake;
use libripens::report::dossier::{RESULTS, sha256};
use std::path::{Path, PathBuf};
use std::process::Command;

/// SHA-256 of `results.json` in the example report: changes when a reported digit does.
const RESULTS_SHA256: &str = "3ec5051cb5623422e267fa1b032a3970f77290c96af4f761525fcfab9d57c47f";
/// SHA-256 of the PDF of the example report: changes when a digit, a word, a template or the typesetter does.
const PDF_SHA256: &str = "9a4b8cd566711db24239ca26cf9198cbe9ef2c9d2cd6f4ca2021068fadb96174";

/// What to do when a golden hash no longer holds.
fn renewed(what: &str, constant: &str, found: &str) -> String {
    format!(
        "{what} of the example report changed. If that was meant, set {constant} in tests/reproducibility.rs to\n    {found}\n\
         and say in CHANGELOG.md which method, template or dependency changed it, with old and new digits where a reported \
         digit moved. If it was not meant, the change at hand has a side effect."
    )
}

#[test]
fn results_are_the_golden_ones() {
    let found = sha256(&example_report().dossier.files[RESULTS]);
    assert!(found == RESULTS_SHA256, "{}", renewed(RESULTS, "RESULTS_SHA256", &found));
}

#[test]
fn pdf_is_the_golden_one() {
    let found = sha256(&example_report().pdf);
    assert!(found == PDF_SHA256, "{}", renewed("The PDF", "PDF_SHA256", &found));
}

#[test]
fn today_changes_nothing() {
    for (year, month, day) in [(1999, 12, 31), (2041, 5, 19), (2077, 2, 28)] {
        let mut intake = MemoryIntake::with(example_files());
        intake.today = chrono::NaiveDate::from_ymd_opt(year, month, day).expect("a date");
        assert!(report_of(&intake).pdf == example_report().pdf, "the report differs on {year}-{month}-{day}");
    }
}

#[test]
fn order_and_company_of_files_change_nothing() {
    let mut files = example_files();
    files.insert("campaigns/another/notes.md".into(), b"# A campaign that this one does not see\n".to_vec());
    files.insert("campaigns/two-kilograms/sketch.png".into(), vec![0; 64]);
    assert!(report_of(&MemoryIntake::with(files)).pdf == example_report().pdf);
}

/// A copy of the example in a folder of the test's own.
fn copy(name: &str) -> PathBuf {
    let folder = fresh(&format!("reproducibility-{name}"));
    write_files(&folder, &example_files());
    folder
}

/// Results and report as the program makes them in a folder, under an environment.
fn made_in(folder: &Path, environment: &[(&str, &str)]) -> (Vec<u8>, Vec<u8>) {
    let pdf = folder.join("made.pdf");
    let program = || {
        let mut command = Command::new(PROGRAM);
        command.envs(environment.iter().copied());
        command
    };
    let campaign = folder.join("campaigns").join(CAMPAIGN);
    let results = printed(program().args(["reduce", "--json"]).arg(campaign));
    printed(program().arg("report").arg(folder.join(REPORT)).arg("--output").arg(&pdf));
    (results, std::fs::read(&pdf).expect("the report"))
}

#[test]
fn folders_and_time_zones_change_nothing() {
    let here = made_in(&copy("a"), &[("TZ", "Pacific/Kiritimati")]);
    let there = made_in(&copy("a folder of another name/deep"), &[("TZ", "America/Adak"), ("LANG", "de_DE.UTF-8")]);
    assert!(here.0 == there.0, "results differ between two folders");
    assert!(here.1 == there.1, "reports differ between two folders");
    assert!(here.1 == example_report().pdf, "the report differs between disk and memory");
}

#[test]
fn threads_change_nothing() {
    let folder = copy("threads");
    let one = made_in(&folder, &[("RAYON_NUM_THREADS", "1")]);
    for threads in ["2", "7"] {
        let more = made_in(&folder, &[("RAYON_NUM_THREADS", threads)]);
        assert!(one == more, "1 and {threads} threads differ");
    }
}

/// The C library picks its functions by what the processor can do; hidden from it, other variants are taken.
#[test]
fn variants_of_the_platforms_functions_change_nothing() {
    let folder = copy("variants");
    let as_is = made_in(&folder, &[]);
    for hidden in ["-FMA,-FMA4", "-AVX2,-FMA,-FMA4,-AVX512F,-AVX", "-AVX2,-FMA,-AVX512F,-AVX,-SSE4_2,-SSE4_1,-SSSE3"] {
        let tunables = format!("glibc.cpu.hwcaps={hidden}");
        let masked = made_in(&folder, &[("GLIBC_TUNABLES", &tunables)]);
        assert!(as_is == masked, "bits differ with {tunables}");
    }
}
