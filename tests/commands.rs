//! The commands as a person runs them: exit statuses, printed shapes, pipes, and a started laboratory folder.

#![allow(clippy::disallowed_methods)]

use std::path::{Path, PathBuf};
use std::process::{Command, Output, Stdio};

const PROGRAM: &str = env!("CARGO_BIN_EXE_libripens");

fn command(arguments: &[&str]) -> Command {
    let mut command = Command::new(PROGRAM);
    command.args(arguments).current_dir(env!("CARGO_MANIFEST_DIR")).env_remove("NO_COLOR").stdin(Stdio::null());
    command
}

fn run(arguments: &[&str]) -> Output {
    command(arguments).output().expect("the program starts")
}

fn printed(arguments: &[&str]) -> String {
    let output = run(arguments);
    assert_eq!(output.status.code(), Some(0), "{arguments:?}: {}", String::from_utf8_lossy(&output.stderr));
    String::from_utf8(output.stdout).expect("text")
}

fn said(output: &Output) -> String {
    String::from_utf8_lossy(&output.stderr).into_owned()
}

fn json(arguments: &[&str]) -> serde_json::Value {
    serde_json::from_str(&printed(arguments)).expect("JSON")
}

fn number(value: &serde_json::Value) -> f64 {
    value.as_f64().expect("a number")
}

/// A place of its own for a test to write in, empty.
fn fresh(name: &str) -> PathBuf {
    let folder = Path::new(env!("CARGO_TARGET_TMPDIR")).join(format!("commands-{name}"));
    let _ = std::fs::remove_dir_all(&folder);
    std::fs::create_dir_all(&folder).expect("a folder to write in");
    folder
}

fn text(path: &Path) -> &str {
    path.to_str().expect("a path in UTF-8")
}

fn files(folder: &Path) -> Vec<(PathBuf, Vec<u8>)> {
    let mut found = Vec::new();
    for entry in std::fs::read_dir(folder).expect("a folder") {
        let path = entry.expect("an entry").path();
        match path.is_dir() {
            true => found.extend(files(&path)),
            false => found.push((path.clone(), std::fs::read(&path).expect("a file"))),
        }
    }
    found.sort();
    found
}

#[test]
fn example_records_are_without_complaint() {
    let spoken = printed(&["examine", "example-records"]);
    assert!(spoken.ends_with("nothing to complain of.\n"), "{spoken}");
}

#[test]
fn reduce_prints_results_and_with_all_inputs_too() {
    let results = printed(&["reduce", "example-records"]);
    assert!(results.contains("R1.mass") && results.contains("160 values"));
    assert!(!results.contains("T4.correction"));
    // Millions of degrees of freedom are not spelt out.
    assert!(results.contains("> 10⁵"));
    assert!(printed(&["reduce", "example-records", "--all"]).contains("T4.correction"));
}

#[test]
fn reduce_json_has_its_documented_keys() {
    let results = json(&["reduce", "example-records", "--json"]);
    assert_eq!(results["format"], 1);
    assert_eq!(results["engine"], env!("CARGO_PKG_VERSION"));
    let quantities = results["quantities"].as_array().expect("a list");
    let mass = quantities.iter().find(|quantity| quantity["name"] == "R1.mass").expect("R1.mass");
    for key in [
        "symbol",
        "label",
        "kind",
        "state",
        "basis",
        "unit",
        "si_unit",
        "value",
        "standard_uncertainty",
        "printed",
        "origin",
    ] {
        assert!(!mass[key].is_null(), "{key}");
    }
    assert_eq!(mass["kind"], "mass");
    assert!((number(&mass["value"]) - 1.0).abs() < 1e-4);
    let column = quantities.iter().find(|quantity| quantity["name"] == "A1.density").expect("A1.density");
    assert_eq!(column["rows"], 160);
}

#[test]
fn reduce_csv_has_a_line_of_heads_and_one_line_a_quantity() {
    let table = printed(&["reduce", "example-records", "--csv"]);
    let heads =
        "name,label,kind,state,basis,unit,si_unit,value,standard_uncertainty,degrees_of_freedom,printed,file,line";
    assert_eq!(table.lines().next(), Some(heads));
    let quantities = json(&["reduce", "example-records", "--json"])["quantities"].as_array().map_or(0, Vec::len);
    assert_eq!(csv::Reader::from_reader(table.as_bytes()).records().filter(Result::is_ok).count(), quantities);
}

#[test]
fn shares_of_a_budget_sum_to_one() {
    for quantity in ["R1.mass", "W2.difference", "W5.air.density"] {
        let budget = json(&["budget", quantity, "example-records", "--json"]);
        let lines = budget["lines"].as_array().expect("lines");
        let shares: f64 = lines.iter().map(|line| number(&line["share"])).sum();
        assert!((shares - 1.0).abs() < 1e-9, "{quantity}: {shares}");
        let variance: f64 = lines.iter().map(|line| number(&line["contribution"]).powi(2)).sum();
        let uncertainty = number(&budget["standard_uncertainty"]);
        assert!((variance.sqrt() / uncertainty - 1.0).abs() < 1e-9, "{quantity}");
        let expanded = number(&budget["coverage_factor"]) * uncertainty;
        assert!((expanded / number(&budget["expanded_uncertainty"]) - 1.0).abs() < 1e-12);
    }
}

#[test]
fn several_budgets_are_followed_by_what_they_share() {
    let found = json(&["budget", "R1.mass", "R2.mass", "W1.difference", "example-records", "--json"]);
    let cell = |matrix: &str, row: usize, column: usize| number(&found[matrix][row][column]);
    let budgets = found["budgets"].as_array().expect("budgets");
    assert_eq!(budgets.len(), 3);
    for (row, budget) in budgets.iter().enumerate() {
        let u = number(&budget["standard_uncertainty"]);
        assert!((cell("covariance", row, row) / (u * u) - 1.0).abs() < 1e-12);
        assert_eq!(cell("correlation", row, row), 1.0);
        for (column, other) in budgets.iter().enumerate().take(row) {
            let scale = u * number(&other["standard_uncertainty"]);
            assert!((cell("covariance", row, column) / scale - cell("correlation", row, column)).abs() < 1e-12);
            assert_eq!(cell("correlation", row, column), cell("correlation", column, row));
        }
    }
    // Two items against one reference standard; a difference alone does not contain the standard.
    assert!(cell("correlation", 0, 1) > 0.9 && cell("correlation", 0, 2).abs() < 0.3, "{found}");
    let text = printed(&["budget", "R1.mass", "R2.mass", "example-records"]);
    let heads = ["R1.mass: mass of HW 1", "R2.mass: mass of HW 2", "Correlation coefficients", "Covariance,"];
    let places: Vec<usize> =
        heads.iter().map(|head| text.find(head).unwrap_or_else(|| panic!("{head}: {text}"))).collect();
    assert!(places.is_sorted());
}

#[test]
fn trials_stand_beside_first_order() {
    let found = json(&["budget", "R1.mass", "example-records", "--trials", "50000", "--json"]);
    let trials = &found["trials"];
    assert_eq!(trials["trials"], 50_000);
    assert_eq!(trials["is_validated"], true);
    let ratio = number(&trials["standard_uncertainty"]) / number(&found["standard_uncertainty"]);
    assert!((ratio - 1.0).abs() < 0.02, "{ratio}");
    // The tolerance of u = 10 µg to one digit is 5 µg.
    assert_eq!(number(&trials["numerical_tolerance"]), 0.5e-8);
    let steady = json(&["budget", "W1.difference", "example-records", "--until-stable", "1", "--json"]);
    assert_eq!(steady["trials"]["is_stable"], true);
    let text = printed(&["budget", "W1.difference", "example-records", "--until-stable", "1"]);
    assert!(text.contains("stable to 1 significant digit") && text.contains("JCGM 101, clause 8"), "{text}");
    assert!(json(&["budget", "R1.mass", "example-records", "--json"]).get("trials").is_none());
    assert_eq!(run(&["budget", "R1.mass", "example-records", "--trials", "0"]).status.code(), Some(2));
}

#[test]
fn budget_falls_by_contribution_and_folds_the_smallest() {
    let budget = json(&["budget", "R1.mass", "example-records", "--json"]);
    let contributions: Vec<f64> =
        budget["lines"].as_array().expect("lines").iter().map(|line| number(&line["contribution"])).collect();
    assert!(contributions.is_sorted_by(|a, b| a >= b));
    let (short, long) = (
        printed(&["budget", "R1.mass", "example-records"]),
        printed(&["budget", "R1.mass", "example-records", "--all"]),
    );
    assert!(short.contains("further lines") && !long.contains("further lines"));
    assert!(long.contains("T4.correction") && !short.contains("T4.correction"));
    assert!(short.contains("all together") && short.contains("100.00 %"));
}

#[test]
fn trail_leads_from_a_result_to_readings_in_ten_steps_or_fewer() {
    let trail = printed(&["trail", "R1.mass", "example-records"]);
    let depth = |line: &str| line.chars().take_while(|c| *c == ' ').count() / 4;
    let readings: Vec<&str> = trail.lines().filter(|line| line.contains(" readings in ")).collect();
    assert!(readings.iter().any(|line| line.contains("raw/day-1.csv, column reading_mg, ")), "{trail}");
    assert!(readings.iter().any(|line| line.contains("day-2.md, ")), "{trail}");
    assert!(readings.iter().all(|line| depth(line) <= 10), "{trail}");
    assert!(trail.contains("stated in standards/k17.md, line "));
}

#[test]
fn trail_sets_out_each_quantity_once() {
    let trail = printed(&["trail", "R1.mass", "example-records"]);
    let named: Vec<&str> = trail
        .lines()
        .filter_map(|line| line.trim_start().split_once(" = "))
        .map(|(name, _)| name)
        .filter(|name| !name.contains(' '))
        .collect();
    let mut once = named.clone();
    once.sort_unstable();
    once.dedup();
    assert_eq!(named.len(), once.len());
    assert!(trail.contains("see above"));
    assert!(trail.contains(&format!("{} quantities in all", named.len())));
    let short = printed(&["trail", "R1.mass", "example-records", "--depth", "1"]);
    assert!(
        short.contains("W1.mass = ") && !short.contains("W1.difference = ") && short.contains("Left out by --depth")
    );
}

#[test]
fn unknown_quantity_stops_with_the_nearest() {
    for (asked, answer) in [
        ("R1.mas", "R1.mass"),
        ("w1.mass", "W1.mass"),
        ("K17.mass", "K17.mass.SM_41_0207"),
        ("W1.foo", "W1.difference"),
    ] {
        for name in ["budget", "trail"] {
            let output = run(&[name, asked, "example-records"]);
            assert_eq!(output.status.code(), Some(2));
            assert!(said(&output).contains(asked) && said(&output).contains(answer), "{}", said(&output));
            assert!(output.stdout.is_empty());
        }
    }
}

#[test]
fn what_cannot_be_carried_out_is_exit_status_two() {
    for arguments in [
        &["examine", "no-such-folder"][..],
        &["examine", "/"],
        &["reduce", "--xml"],
        &["budget", "A1.density", "example-records"],
        &[],
    ] {
        let output = run(arguments);
        assert_eq!(output.status.code(), Some(2), "{arguments:?}");
        assert!(!output.stderr.is_empty());
    }
    assert_eq!(run(&["--version"]).status.code(), Some(0));
    assert_eq!(run(&["budget", "--help"]).status.code(), Some(0));
}

#[test]
fn faults_of_records_are_exit_status_one() {
    let root = fresh("faults").join("laboratory");
    printed(&["start", text(&root)]);
    let record = root.join("campaigns/first/weighing.md");
    let changed = std::fs::read_to_string(&record).expect("the record").replace("a: K1\n", "a: K2\n");
    std::fs::write(&record, changed).expect("the record changed");
    for arguments in [
        &["examine", text(&root)][..],
        &["reduce", text(&root)],
        &["budget", "W1.mass", text(&root)],
        &["trail", "W1.mass", text(&root)],
    ] {
        let output = run(arguments);
        assert_eq!(output.status.code(), Some(1), "{arguments:?}: {}", said(&output));
        let all = format!("{}{}", String::from_utf8_lossy(&output.stdout), said(&output));
        assert!(all.contains("weighing.md, line ") && all.contains("Did you mean K1?"), "{all}");
    }
}

#[test]
fn every_published_check_agrees() {
    let record = printed(&["validate"]);
    let last = record.lines().last().expect("a last line");
    let (agreeing, all) = last.strip_suffix(" checks agree.").and_then(|line| line.split_once(" of ")).expect("n of n");
    assert_eq!(agreeing, all);
    assert!(
        record.starts_with("Validation record") && record.contains(concat!("libripens ", env!("CARGO_PKG_VERSION")))
    );
    let checks = json(&["validate", "--json"]);
    for check in checks["checks"].as_array().expect("checks") {
        assert_eq!(check["agrees"], true, "{check}");
    }
}

#[test]
fn a_started_laboratory_is_clean_and_never_written_over() {
    let root = fresh("start").join("laboratory");
    assert!(printed(&["start", text(&root)]).contains("laboratory.md"));
    assert!(printed(&["examine", text(&root)]).ends_with("nothing to complain of.\n"));
    assert!(printed(&["reduce", text(&root)]).contains("W1.conventional_mass"));
    assert!(printed(&["budget", "W1.mass", text(&root)]).contains("K1.certified_mass"));
    let before = files(&root);
    assert_eq!(run(&["start", text(&root)]).status.code(), Some(2));
    assert_eq!(run(&["start", text(&root.join("inside"))]).status.code(), Some(2));
    assert_eq!(files(&root), before);
}

#[test]
fn start_refuses_a_folder_that_holds_one_of_its_files() {
    let root = fresh("occupied");
    std::fs::create_dir_all(root.join("standards")).expect("a folder");
    std::fs::write(root.join("standards/k1.md"), "kept\n").expect("a file");
    let before = files(&root);
    let output = run(&["start", text(&root)]);
    assert_eq!(output.status.code(), Some(2));
    assert!(said(&output).contains("k1.md exists already"), "{}", said(&output));
    assert_eq!(files(&root), before);
}

#[test]
fn a_campaign_is_added_beside_the_first() {
    let root = fresh("campaign").join("laboratory");
    printed(&["start", text(&root)]);
    printed(&["start", text(&root), "--campaign", "second"]);
    assert!(printed(&["examine", text(&root)]).ends_with("nothing to complain of.\n"));
    let second = printed(&["reduce", text(&root.join("campaigns/second"))]);
    assert!(second.contains("W2.mass") && !second.contains("W1.mass"));
    let before = files(&root);
    for name in ["second", "../out", "a/b", ""] {
        assert_eq!(run(&["start", text(&root), "--campaign", name]).status.code(), Some(2), "{name}");
    }
    assert_eq!(files(&root), before);
}

#[test]
fn a_started_report_is_typeset() {
    let root = fresh("report").join("laboratory");
    printed(&["start", text(&root)]);
    printed(&["report", text(&root.join("campaigns/first/report.md"))]);
    let pdf = std::fs::read(root.join("campaigns/first/report.pdf")).expect("the draft");
    assert!(pdf.starts_with(b"%PDF-"));
}

#[test]
fn a_closed_pipe_is_no_panic() {
    for arguments in [
        &["reduce", "example-records", "--all", "--json"][..],
        &["trail", "R1.mass", "example-records"],
        &["validate"],
        &["--help"],
    ] {
        let mut child =
            command(arguments).stdout(Stdio::piped()).stderr(Stdio::piped()).spawn().expect("the program starts");
        drop(child.stdout.take());
        let output = child.wait_with_output().expect("the program ends");
        assert!(!said(&output).contains("panicked"), "{arguments:?}: {}", said(&output));
        assert!(output.status.code().is_some_and(|code| code <= 1), "{arguments:?}");
    }
}

#[test]
fn a_pipe_carries_no_escape_bytes_and_no_sign_of_life() {
    let root = fresh("plain").join("laboratory");
    printed(&["start", text(&root)]);
    std::fs::write(root.join("campaigns/first/odd.md"), "```yaml comparisn W9\na: \u{1b}[31mK1\n```\n")
        .expect("a record");
    for value in [None, Some("1")] {
        for name in ["examine", "reduce", "--help"] {
            let mut command = command(&[name, text(&root)]);
            value.inspect(|value| {
                command.env("NO_COLOR", value);
            });
            let output = command.output().expect("the program starts");
            assert!(!output.stdout.contains(&0x1b) && !output.stderr.contains(&0x1b), "{name}");
            assert!(!said(&output).contains("examining the records") && !said(&output).contains('\r'), "{name}");
        }
    }
}

#[test]
fn two_runs_print_the_same_bytes() {
    for arguments in [&["reduce", "example-records", "--json"][..], &["budget", "R1.mass", "example-records", "--json"]]
    {
        assert_eq!(printed(arguments), printed(arguments));
    }
}
