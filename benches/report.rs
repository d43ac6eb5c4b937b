//! Making a report, beside typesetting and exporting the same Typst source.
//!
//! `cargo bench --bench report` prints both times and their ratio from one run. What the ratio leaves above 1 is
//! everything that is not typesetting: reading records, reducing, budgets, charts, the dossier.

#![allow(clippy::disallowed_methods)]

use libripens::block::Engine;
use libripens::intake::MemoryIntake;
use libripens::report::typeset::typeset;
use libripens::report::{Manuscript, make_report, write_report};
use std::collections::BTreeMap;
use std::path::Path;
use std::time::{Duration, Instant};

const CAMPAIGN: &str = "two-kilograms";
const REPORT: &str = "campaigns/two-kilograms/report.md";
const ROUNDS: usize = 21;
/// The ratio aimed at.
const GOAL: f64 = 1.5;

fn main() {
    let mut files = BTreeMap::new();
    walk(&Path::new(env!("CARGO_MANIFEST_DIR")).join("example-records"), "", &mut files);
    let intake = MemoryIntake::with(files);
    let manuscript = write(&intake);
    // A first run of each reads the fonts.
    assert!(whole(&intake) == pages(&manuscript), "both make the same PDF");
    let (mut of_whole, mut of_pages) = (Vec::new(), Vec::new());
    for _ in 0..ROUNDS {
        of_whole.push(timed(|| whole(&intake)));
        of_pages.push(timed(|| pages(&manuscript)));
    }
    let (of_whole, of_pages) = (median(of_whole), median(of_pages));
    println!("report from records in memory            {:>7.1} ms", milliseconds(of_whole));
    println!("compile and export of the same source    {:>7.1} ms", milliseconds(of_pages));
    println!(
        "ratio                                    {:>7.2}   (goal: at most {GOAL})",
        milliseconds(of_whole) / milliseconds(of_pages)
    );
    println!("medians of {ROUNDS} runs each, taken in turn, the typesetter's memory empty before each");
}

fn whole(intake: &MemoryIntake) -> Vec<u8> {
    let engine = Engine::read(intake, Some(CAMPAIGN)).expect("a folder in memory can be listed");
    make_report(&engine, REPORT).expect("the example makes a report").pdf
}

fn write(intake: &MemoryIntake) -> Manuscript {
    let engine = Engine::read(intake, Some(CAMPAIGN)).expect("a folder in memory can be listed");
    write_report(&engine, REPORT).expect("the example makes a report")
}

fn pages(manuscript: &Manuscript) -> Vec<u8> {
    let typeset = typeset(&manuscript.document).unwrap_or_else(|faults| panic!("{faults:?}"));
    typeset.pdf(&manuscript.options).unwrap_or_else(|faults| panic!("{faults:?}"))
}

fn timed(run: impl FnOnce() -> Vec<u8>) -> Duration {
    let start = Instant::now();
    let made = run();
    let taken = start.elapsed();
    std::hint::black_box(made);
    taken
}

fn median(mut times: Vec<Duration>) -> Duration {
    times.sort();
    times[times.len() / 2]
}

fn milliseconds(time: Duration) -> f64 {
    time.as_secs_f64() * 1e3
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
