//! The parts of a report about fits, series, analyses and distributions, typeset together from the records of
//! `tests/parts/`.

#![allow(clippy::disallowed_methods)]

use libripens::block::Engine;
use libripens::diagnostic::Code;
use libripens::intake::MemoryIntake;
use libripens::report::{make_report, write_report};
use std::path::Path;

fn files() -> Vec<(&'static str, String)> {
    let folder = Path::new(env!("CARGO_MANIFEST_DIR")).join("tests/parts");
    let read = |name: &'static str| (name, std::fs::read_to_string(folder.join(name)).expect("a record"));
    ["laboratory.md", "record.md", "report.md"].into_iter().map(read).collect()
}

#[test]
fn every_part_is_typeset() {
    let intake = MemoryIntake::with(files());
    let engine = Engine::read(&intake, None).expect("readable");
    let report = make_report(&engine, "report.md").expect("a report");
    // The comparison loss bends within its uncertainty: that is why it stands here.
    let codes: Vec<Code> = engine.complaints().list.iter().map(|one| one.code).collect();
    assert_eq!(codes, [Code::FirstOrderShort], "{:#?}", engine.complaints());
    assert!(report.pages >= 4 && report.pdf.starts_with(b"%PDF"), "{} pages", report.pages);
}

/// What stands on the pages and in the alternative texts; the counts are those of the residuals of JCGM 100:2008, H.3.
#[test]
fn parts_say_what_they_show() {
    let intake = MemoryIntake::with(files());
    let engine = Engine::read(&intake, None).expect("readable");
    let source = write_report(&engine, "report.md").expect("a manuscript").document.source;
    let said = |words: &str| assert!(source.contains(words), "nowhere: {words}");
    said("9 of 11 residuals lie within ± s. Along the axis their sign changes 4 times.");
    said("Line polynomial ± s at 0 with a band of ± 0.00349756.");
    said("−0.1712(29)\u{a0}K");
    said("Lack of fit cannot be tested: no ordinates were repeated at one abscissa.");
    said("Lack of fit: F(17, 20) = 0.811, p = 0.67; not significant at the level 0.05");
    said(
        "Chi-square: χ² = 3.00 with 5 degrees of freedom, p = 0.70; the residuals agree with the stated uncertainties.",
    );
    said("Chart: NULL: Allan deviation of null voltage. It shows σ/µV against averaging time τ/s.");
    said("bars at 6 positions");
    said("Uncertainty of the mean: 28.9 effective readings of 96.");
    said("analysis of variance of mass difference");
    said("first-order propagation is not validated");
    said("first-order propagation is validated");
    said("with terms of second order");
    said("Bar chart. Shares of the squared standard uncertainty of the correction at 25 °C");
}

/// The difference of the ends and the tolerance are read on the scale of u, a power of ten where the unit is one.
#[test]
fn small_numbers_stand_over_a_power_of_ten() {
    let intake = MemoryIntake::with(files());
    let engine = Engine::read(&intake, None).expect("readable");
    let source = write_report(&engine, "report.md").expect("a manuscript").document.source;
    for words in ["lower end/10⁻⁶", "density × 10⁻⁶", "departure/10⁻⁶"] {
        assert!(source.contains(words), "nowhere: {words}");
    }
    // JCGM 101:2008, 9.4: u = 112 × 10⁻⁶ by trials, 100 × 10⁻⁶ to first order.
    assert!(source.contains("\"112\"") && source.contains("\"100\""));
}

#[test]
fn a_part_of_another_kind_is_refused() {
    let mut files = files();
    files[2].1 = files[2].1.replace("{{ allan(NULL) }}", "{{ allan(LINE) }}");
    let intake = MemoryIntake::with(files);
    let engine = Engine::read(&intake, None).expect("readable");
    write_report(&engine, "report.md");
    // The loss bends within its uncertainty, which is warned of in any case.
    let list = engine.complaints().list;
    assert_eq!(list.iter().map(|one| one.code).collect::<Vec<_>>(), [Code::FirstOrderShort, Code::TemplateFaulty]);
    assert!(list[1].message.contains("LINE is of the kind fit, but series-in-time is expected here"), "{list:#?}");
}
