//! The register: entries that cannot be taken back unseen, and what is done to it found and named.

#![allow(clippy::disallowed_methods)]

mod example;

use chrono::{DateTime, Utc};
use example::{PROGRAM, example_files, fresh, printed, write_files};
use libripens::register::entry::{Act, Clock, Decision, Duty, IssuedReport, ReportKind, Stamp};
use libripens::register::store::MemoryStore;
use libripens::register::tree::{consistency_proof, is_consistent};
use libripens::register::verify::{Cause, verify, verify_against};
use libripens::register::{Ledger, REGISTER, Register};
use std::path::Path;
use std::process::{Command, Output};

/// A time of the invented laboratory, that many minutes after nine.
fn at(minutes: i64) -> Stamp {
    let nine: DateTime<Utc> = "2041-05-20T09:00:00Z".parse().expect("a time");
    Stamp { time: nine + chrono::TimeDelta::minutes(minutes), clock: Clock::Set }
}

fn issued(place: u64, kind: ReportKind, of: Option<&str>) -> Act {
    Act::Issued(Box::new(IssuedReport {
        number: format!("R-{place}"),
        place,
        kind,
        of: of.map(String::from),
        report: "campaigns/one/report.md".into(),
        title: "Calibration of a mass standard".into(),
        seal: "5".repeat(64),
        pdf: "6".repeat(64),
        bytes: 1234,
        files: Vec::new(),
        blocks: Vec::new(),
        seen: "7".repeat(64),
        performed_by: "duty metrologist".into(),
        results: vec!["R1.mass".into()],
        left_out: Vec::new(),
    }))
}

/// A register of eight entries, half an hour apart.
fn register() -> Register {
    let store = MemoryStore::at(at(0));
    let mut ledger = Ledger::open(&store).expect("an empty register");
    let authorised = |duty| Act::Authorised { report: "campaigns/one/report.md".into(), seal: "5".repeat(64), duty };
    let acts = [
        Act::Lodged { files: Vec::new() },
        authorised(Duty::Review),
        authorised(Duty::Authorisation),
        issued(1, ReportKind::Original, None),
        Act::Sent { number: "R-1".into(), recipient: "client".into(), pdf: "6".repeat(64), bytes: 1234, copies: 1 },
        Act::Decided { number: "R-1".into(), findings: "8".repeat(64), decision: Decision::Amendment },
        issued(2, ReportKind::Amendment, Some("R-1")),
        Act::Withdrawn { number: "R-2".into() },
    ];
    for (index, act) in acts.into_iter().enumerate() {
        *store.now.borrow_mut() = at(30 * index as i64);
        ledger.enter(act, "technical manager", "as agreed “µ”").expect("an entry");
    }
    let kept = store.files.borrow()[REGISTER].clone();
    let read = Register::read(&kept).expect("a whole register");
    assert_eq!(read, ledger.register);
    read
}

fn lines(register: &Register) -> Vec<String> {
    String::from_utf8(register.bytes()).expect("text").lines().map(String::from).collect()
}

fn joined(lines: &[String]) -> Vec<u8> {
    lines.iter().flat_map(|line| line.bytes().chain([b'\n'])).collect()
}

fn causes(lines: &[String]) -> Vec<Cause> {
    verify(&joined(lines)).into_iter().map(|damage| damage.cause).collect()
}

/// The same acts entered anew, as the owner of the folder could: every hash is right again.
fn rebuilt(lines: &[String], change: impl Fn(usize, &mut Register, Act) -> Option<Act>) -> Register {
    let mut anew = Register::default();
    for (index, entry) in Register::read(&joined(lines)).expect("a whole register").entries.into_iter().enumerate() {
        let stamp = Stamp { time: entry.instant().expect("a time"), clock: entry.clock };
        if let Some(act) = change(index, &mut anew, entry.act.clone()) {
            anew.add(act, &entry.who, &entry.why, stamp).expect("an entry");
        }
    }
    anew
}

#[test]
fn an_untouched_register_is_whole() {
    let register = register();
    assert_eq!(verify(&register.bytes()), []);
    for size in 0..=register.entries.len() {
        assert_eq!(verify_against(&register, &register.head_of(size)), []);
        let proof = consistency_proof(&register.leaves(), size);
        assert!(is_consistent(&register.head_of(size), &register.head(), &proof));
    }
    assert_eq!(verify(b""), []);
}

#[test]
fn every_edit_of_every_line_but_the_last_is_seen_without_a_head() {
    let whole = lines(&register());
    for line in 0..whole.len() {
        for (old, new) in [("technical manager", "quality manager"), ("as agreed", "as argued"), ("0.1.0", "0.1.1")] {
            let mut edited = whole.clone();
            edited[line] = edited[line].replacen(old, new, 1);
            assert_ne!(edited[line], whole[line]);
            let found = causes(&edited);
            let head = register().head();
            match line + 1 < whole.len() {
                true => assert_eq!(found, [Cause::Edited], "line {line}"),
                false => {
                    let last = Register::read(&joined(&edited)).expect("the end has no entry behind it");
                    assert_eq!(verify_against(&last, &head)[0].cause, Cause::Rewritten);
                }
            }
        }
    }
}

#[test]
fn a_removed_entry_is_named() {
    let whole = lines(&register());
    for line in 0..whole.len() - 1 {
        let mut shorter = whole.clone();
        shorter.remove(line);
        let damages = verify(&joined(&shorter));
        assert_eq!(damages[0].cause, Cause::Missing);
        assert!(damages[0].says.contains(&format!("Entry {} ", line + 1)), "{}", damages[0].says);
    }
}

#[test]
fn a_doubled_and_a_moved_entry_are_named() {
    let whole = lines(&register());
    let mut doubled = whole.clone();
    doubled.insert(4, whole[3].clone());
    assert!(causes(&doubled).contains(&Cause::Doubled));
    for line in 0..whole.len() - 1 {
        let mut moved = whole.clone();
        moved.swap(line, line + 1);
        assert_eq!(causes(&moved)[0], Cause::Reordered, "line {line}");
    }
}

#[test]
fn a_cut_tail_needs_a_head_and_is_then_named() {
    let whole = register();
    let lines = lines(&whole);
    for kept in 0..lines.len() {
        let cut = Register::read(&joined(&lines[..kept])).expect("what is left holds together");
        assert_eq!(verify_against(&cut, &whole.head())[0].cause, Cause::CutTail);
        assert_eq!(verify_against(&cut, &whole.head_of(kept)), []);
    }
    let half = whole.bytes();
    assert_eq!(verify(&half[..half.len() - 40])[0].cause, Cause::Unreadable);
}

#[test]
fn a_redated_entry_is_named() {
    let whole = lines(&register());
    // In place: the entry behind it holds another hash. Out of order as well: that too.
    let mut redated = whole.clone();
    redated[2] = redated[2].replace("T10:00:00Z", "T10:10:00Z");
    assert_eq!(causes(&redated), [Cause::Edited]);
    redated[2] = redated[2].replace("T10:10:00Z", "T08:00:00Z");
    assert_eq!(causes(&redated), [Cause::Edited, Cause::Redated]);
    // With all hashes made anew a date out of order still shows, and one in order shows against a head.
    let anew = Register::read(&joined(&whole)).expect("a register");
    let mut later = Register::default();
    for entry in &anew.entries {
        let minutes = if entry.sequence == 3 { 45 } else { 30 * (entry.sequence as i64 - 1) };
        later.add(entry.act.clone(), &entry.who, &entry.why, at(minutes)).expect("an entry");
    }
    assert_eq!(verify(&later.bytes()), []);
    assert_eq!(verify_against(&later, &anew.head())[0].cause, Cause::Rewritten);
    assert_eq!(verify_against(&later, &anew.head_of(2)), []);
}

#[test]
fn a_rebuilt_register_fails_against_any_head_after_the_change() {
    let whole = register();
    let without = rebuilt(&lines(&whole), |index, _, act| (index != 5).then_some(act));
    assert_eq!(verify(&without.bytes()), []);
    for size in 0..=whole.entries.len() {
        assert_eq!(verify_against(&without, &whole.head_of(size)).is_empty(), size <= 5, "head over {size}");
    }
}

#[test]
fn numbers_with_gaps_or_given_twice_and_two_present_reports_are_named() {
    let whole = lines(&register());
    let renumbered = |place: u64, number: &str, of: Option<&str>| {
        let act = issued(place, ReportKind::Replacement, of);
        let mut register = Register::read(&joined(&whole)).expect("a register");
        let Act::Issued(mut report) = act else { panic!("a report") };
        report.number = number.into();
        register.add(Act::Issued(report), "technical manager", "", at(600)).expect("an entry");
        verify(&register.bytes()).into_iter().map(|damage| damage.cause).collect::<Vec<_>>()
    };
    assert_eq!(renumbered(3, "R-3", None), []);
    assert_eq!(renumbered(4, "R-4", None), [Cause::Numbers]);
    assert_eq!(renumbered(3, "R-2", None), [Cause::Numbers]);
    assert_eq!(renumbered(3, "R-3", Some("R-9")), [Cause::Numbers]);
    assert_eq!(renumbered(3, "R-3", Some("R-2")), []);
    assert_eq!(renumbered(3, "R-3", Some("R-1")), [Cause::TwoCurrent]);
}

#[test]
fn lines_that_are_no_entries_are_named_and_never_panic() {
    let whole = register().bytes();
    for text in ["{}\n", "\n", "[1]\n", "{\"sequence\":1}\n", "null\n"] {
        assert_eq!(verify(text.as_bytes())[0].cause, Cause::Unreadable, "{text}");
    }
    assert_eq!(verify(b"\xff\n")[0].cause, Cause::Unreadable);
    let spaced = String::from_utf8(whole.clone()).expect("text").replacen("\":", "\": ", 1);
    assert_eq!(verify(spaced.as_bytes())[0].cause, Cause::Edited);
    for at in (0..whole.len()).step_by(7) {
        for byte in [b'0', b'"', b'\n', 0xff, b'}'] {
            let mut bytes = whole.clone();
            bytes[at] = byte;
            let same = bytes == whole;
            let head = register_head();
            let seen = match Register::read(&bytes) {
                Ok(register) => !verify_against(&register, &head).is_empty(),
                Err(_) => true,
            };
            assert_eq!(seen, !same, "byte {at} made {byte}");
        }
    }
}

fn register_head() -> libripens::register::tree::Head {
    static HEAD: std::sync::OnceLock<libripens::register::tree::Head> = std::sync::OnceLock::new();
    HEAD.get_or_init(|| register().head()).clone()
}

#[test]
fn nothing_is_entered_with_a_clock_that_runs_behind() {
    let store = MemoryStore::at(at(10));
    let mut ledger = Ledger::open(&store).expect("a register");
    ledger.enter(Act::Lodged { files: Vec::new() }, "duty metrologist", "").expect("an entry");
    *store.now.borrow_mut() = at(9);
    let problem = ledger.enter(Act::Lodged { files: Vec::new() }, "duty metrologist", "").expect_err("a refusal");
    assert_eq!(problem.code.word(), "clock_behind");
    assert_eq!(ledger.register.entries.len(), 1);
}

/// The example in a folder of the test's own.
fn laboratory(name: &str) -> std::path::PathBuf {
    let folder = fresh(&format!("register-{name}"));
    write_files(&folder, &example_files());
    folder
}

/// The program in a folder, on a day of the invented laboratory.
fn program(folder: &Path, day: &str, arguments: &[&str]) -> Command {
    let mut command = Command::new(PROGRAM);
    command.args(arguments).current_dir(folder).env("LIBRIPENS_CLOCK", format!("{day}T10:00:00Z"));
    command
}

fn told(command: &mut Command) -> (Option<i32>, String) {
    let Output { status, stdout, stderr } = command.output().expect("the program starts");
    (status.code(), format!("{}{}", String::from_utf8_lossy(&stdout), String::from_utf8_lossy(&stderr)))
}

#[test]
fn lodging_keeps_what_was_made_and_shows_what_was_changed() {
    let folder = laboratory("lodging");
    let lodge = |day: &str, place: &str| program(&folder, day, &["lodge", place, "--as", "duty metrologist"]);
    let said = String::from_utf8(printed(&mut lodge("2041-05-16", "."))).expect("text");
    assert!(said.contains("raw/day-1.csv") && !said.contains("report.md"), "{said}");
    let again = String::from_utf8(printed(&mut lodge("2041-05-17", "."))).expect("text");
    assert!(again.starts_with("0 files lodged, "), "{again}");
    let verified = String::from_utf8(printed(&mut program(&folder, "2041-05-17", &["register", "--verify"])));
    assert!(verified.expect("text").contains("hold together"));

    let raw = folder.join("campaigns/two-kilograms/raw/day-1.csv");
    let text = std::fs::read_to_string(&raw).expect("raw data");
    let changed = text.replacen('1', "2", 1);
    std::fs::write(&raw, &changed).expect("written");
    let report = folder.join("campaigns/two-kilograms/report.md");
    for arguments in [vec!["reduce"], vec!["examine"], vec!["report", report.to_str().expect("text")]] {
        let (status, said) = told(&mut program(&folder, "2041-05-17", &arguments));
        assert_eq!(status, Some(1), "{said}");
        assert!(said.contains("lodged_file_changed") && said.contains("day-1.csv"), "{said}");
    }
    let (status, said) = told(&mut lodge("2041-05-18", "."));
    assert!(status == Some(1) && said.contains("lodged_file_changed"), "{said}");

    // The kept copy is the file as lodged: put back, all is well.
    let hash = libripens::report::dossier::sha256(text.as_bytes());
    std::fs::copy(folder.join("register/originals").join(hash), &raw).expect("the kept copy");
    printed(&mut program(&folder, "2041-05-18", &["examine"]));
    std::fs::remove_file(&raw).expect("removed");
    let (status, said) = told(&mut program(&folder, "2041-05-18", &["examine"]));
    assert!(status == Some(1) && said.contains("is gone"), "{said}");
}

#[test]
fn who_lodges_is_known_and_authorised_on_the_day() {
    let folder = laboratory("people");
    for (day, who, reason) in [
        ("2041-05-16", "duty metrologst", "Did you mean “duty metrologist”?"),
        ("2036-05-16", "duty metrologist", "authorised from 2037-02-01"),
    ] {
        let (status, said) = told(&mut program(&folder, day, &["lodge", ".", "--as", who]));
        assert!(status == Some(1) && said.contains("person_unauthorised") && said.contains(reason), "{said}");
    }
    assert!(!folder.join(REGISTER).exists());
}

#[test]
fn a_damaged_register_takes_nothing_and_every_run_says_so() {
    let folder = laboratory("damaged");
    for (day, place) in [("2041-05-14", "standards"), ("2041-05-15", "instruments")] {
        printed(&mut program(&folder, day, &["lodge", place, "--as", "duty metrologist"]));
    }
    let path = folder.join(REGISTER);
    let text = std::fs::read_to_string(&path).expect("the register");
    let entries = String::from_utf8(printed(&mut program(&folder, "2041-05-15", &["register", "--entries"])));
    let entries = entries.expect("text");
    let head = entries.lines().last().and_then(|line| line.strip_prefix("head ")).expect("a head").to_string();
    assert!(entries.contains("2041-05-14T10:00:00Z (clock set by hand)"), "{entries}");

    std::fs::write(&path, text.replacen("as made", "as read", 1)).expect("written");
    for arguments in [vec!["register"], vec!["lodge", "--as", "duty metrologist"], vec!["examine"]] {
        let (status, said) = told(&mut program(&folder, "2041-05-16", &arguments));
        assert!(status == Some(1) && said.contains("register_damaged") && said.contains("Entry 1"), "{said}");
    }
    let first = text.lines().next().expect("a line");
    std::fs::write(&path, format!("{first}\n")).expect("written");
    let (status, said) = told(&mut program(&folder, "2041-05-16", &["register", "--against", &head]));
    assert!(status == Some(1) && said.contains("1 at its end are missing"), "{said}");
    std::fs::write(&path, &text).expect("written");
    let (status, said) = told(&mut program(&folder, "2041-05-16", &["register", "--against", &head]));
    assert!(status == Some(0) && said.contains("0 entries were added since"), "{said}");
}

/// The report record of the example in its folder.
const REPORT: &str = "campaigns/two-kilograms/report.md";

/// The example lodged, reviewed and authorised.
fn authorised(name: &str) -> std::path::PathBuf {
    let folder = laboratory(name);
    authorise(&folder, REPORT);
    folder
}

fn authorise(folder: &Path, report: &str) {
    printed(&mut program(folder, "2041-05-20", &["lodge", "--as", "duty metrologist"]));
    for who in ["second metrologist", "technical manager"] {
        printed(&mut program(folder, "2041-05-20", &["authorise", report, "--as", who]));
    }
}

fn issue(folder: &Path, report: &str) -> Command {
    program(folder, "2041-05-21", &["issue", report, "--as", "technical manager"])
}

fn reports(folder: &Path) -> serde_json::Value {
    let listed = printed(&mut program(folder, "2041-06-01", &["register", "--json"]));
    serde_json::from_slice(&listed).expect("JSON")
}

fn audit(folder: &Path, pdf: &str) -> (Option<i32>, serde_json::Value) {
    let mut command = program(folder, "2041-06-01", &["audit", pdf, "--register", ".", "--records", ".", "--json"]);
    let output = command.output().expect("the program starts");
    (output.status.code(), serde_json::from_slice(&output.stdout).expect("JSON"))
}

fn check<'a>(audit: &'a serde_json::Value, what: &str) -> (&'a str, &'a str) {
    let checks = audit["checks"].as_array().expect("checks");
    let found = checks.iter().find(|check| check["what"] == what).unwrap_or_else(|| panic!("no check {what}"));
    (found["verdict"].as_str().expect("a verdict"), found["says"].as_str().expect("words"))
}

#[test]
fn a_report_is_issued_once_sent_and_withdrawn() {
    let folder = authorised("issue");
    let said = String::from_utf8(printed(&mut issue(&folder, REPORT))).expect("text");
    assert!(said.starts_with("0001: issued 2041-05-21T10:00:00Z"), "{said}");
    let (status, said) = told(&mut issue(&folder, REPORT));
    assert!(status == Some(1) && said.contains("already_issued") && said.contains("as 0001"), "{said}");

    let sent = ["send", "0001", "--to", "HARROWDALE", "--as", "duty metrologist", "--copies", "2", "-o", "sent.pdf"];
    let said = String::from_utf8(printed(&mut program(&folder, "2041-05-22", &sent))).expect("text");
    assert!(said.starts_with("0001: 2 copies to HARROWDALE"), "{said}");
    assert!(
        std::fs::read(folder.join("sent.pdf")).expect("sent")
            == std::fs::read(folder.join("register/reports/0001.pdf")).expect("archived")
    );
    let (status, found) = audit(&folder, "sent.pdf");
    assert_eq!(status, Some(0), "{found}");
    assert!(found["checks"].as_array().expect("checks").iter().all(|check| check["verdict"] == "passed"), "{found}");
    assert!(check(&found, "pages").1.contains("byte for byte"));

    let withdraw =
        |who: &str, why: &str| program(&folder, "2041-05-23", &["withdraw", "0001", "--as", who, "--why", why]);
    let (status, said) = told(&mut withdraw("duty metrologist", "K-17 was damaged"));
    assert!(status == Some(1) && said.contains("person_unauthorised"), "{said}");
    assert_eq!(told(&mut withdraw("technical manager", " ")).0, Some(2));
    let said = String::from_utf8(printed(&mut withdraw("technical manager", "K-17 was damaged"))).expect("text");
    assert!(said.contains("it was sent 1 time"), "{said}");
    assert_eq!(told(&mut program(&folder, "2041-05-24", &sent)).0, Some(2));
    let (status, found) = audit(&folder, "sent.pdf");
    assert_eq!((status, check(&found, "status").0), (Some(1), "failed"), "{found}");
    assert!(check(&found, "status").1.contains("withdrawn") && check(&found, "register").0 == "passed");
    let (status, said) =
        told(&mut program(&folder, "2041-05-24", &["withdraw", "0010", "--as", "technical manager", "--why", "x"]));
    assert!(status == Some(1) && said.contains("report_unknown") && said.contains("Did you mean 0001?"), "{said}");
    printed(&mut program(&folder, "2041-05-24", &["register", "--verify"]));
}

#[test]
fn filters_find_reports_by_record_block_person_day_and_state() {
    let folder = authorised("filters");
    printed(&mut issue(&folder, REPORT));
    let count = |filter: &[&str]| {
        let arguments: Vec<&str> = ["register", "--json"].iter().chain(filter).copied().collect();
        let listed: serde_json::Value =
            serde_json::from_slice(&printed(&mut program(&folder, "2041-06-01", &arguments))).expect("JSON");
        listed.as_array().expect("a list").len()
    };
    for filter in [
        vec!["--record", "standards/k17.md"],
        vec!["--record", "campaigns/two-kilograms/raw/day-2.csv"],
        vec!["--uses", "K17"],
        vec!["--instrument", "M1"],
        vec!["--person", "second metrologist"],
        vec!["--person", "duty metrologist"],
        vec!["--from", "2041-05-21", "--to", "2041-05-21"],
        vec!["--state", "issued"],
    ] {
        assert_eq!(count(&filter), 1, "{filter:?}");
    }
    for filter in [
        vec!["--record", "standards/k18.md"],
        vec!["--uses", "K18"],
        vec!["--person", "quality manager"],
        vec!["--from", "2041-05-22"],
        vec!["--to", "2041-05-20"],
        vec!["--state", "withdrawn"],
    ] {
        assert_eq!(count(&filter), 0, "{filter:?}");
    }
}

#[test]
fn authorisation_is_of_one_seal_by_one_who_may() {
    let folder = laboratory("authorise");
    let authorise = |who: &str| program(&folder, "2041-05-20", &["authorise", REPORT, "--as", who]);
    printed(&mut program(&folder, "2041-05-20", &["lodge", "--as", "duty metrologist"]));
    let (status, said) = told(&mut authorise("duty metrologist"));
    assert!(status == Some(1) && said.contains("person_unauthorised") && said.contains("not for review"), "{said}");
    let said = String::from_utf8(printed(&mut authorise("second metrologist"))).expect("text");
    assert!(said.contains("reviewed by the second metrologist"), "{said}");
    let (status, said) = told(&mut issue(&folder, REPORT));
    assert!(status == Some(1) && said.contains("not_authorised"), "{said}");
    printed(&mut authorise("technical manager"));

    // A word of the prose changed: both entries are void, and the draft says so.
    let path = folder.join(REPORT);
    let text = std::fs::read_to_string(&path).expect("the report");
    std::fs::write(&path, text.replacen("one fine old scratch", "one fine scratch", 1)).expect("written");
    let said = String::from_utf8(printed(&mut program(&folder, "2041-05-20", &["report", REPORT]))).expect("text");
    assert_eq!(said.matches("void, for the content has changed since").count(), 2, "{said}");
    let (status, said) = told(&mut issue(&folder, REPORT));
    assert!(status == Some(1) && said.contains("not_authorised") && said.contains("has changed since"), "{said}");
    assert!(reports(&folder).as_array().expect("a list").is_empty());
    // As it was, it is authorised again.
    std::fs::write(&path, &text).expect("written");
    let (status, said) = told(&mut program(
        &folder,
        "2041-05-20",
        &["authorise", REPORT, "--as", "technical manager", "--seal", "0123 4567 89ab cdef"],
    ));
    assert!(status == Some(2) && said.contains("has changed since it was read"), "{said}");
    printed(&mut issue(&folder, REPORT));
}

#[test]
fn the_performer_authorises_only_where_the_laboratory_says_so() {
    let folder = laboratory("performer");
    let path = folder.join(REPORT);
    let text = std::fs::read_to_string(&path).expect("the report");
    std::fs::write(&path, text.replace("  performed_by: duty metrologist", "  performed_by: technical manager"))
        .expect("written");
    let authorise = || program(&folder, "2041-05-20", &["authorise", REPORT, "--as", "technical manager"]);
    let (status, said) = told(&mut authorise());
    assert!(status == Some(1) && said.contains("person_unauthorised") && said.contains("performed the work"), "{said}");
    let laboratory = folder.join("laboratory.md");
    let text = std::fs::read_to_string(&laboratory).expect("the laboratory");
    std::fs::write(&laboratory, text.replacen("format: 1\n", "format: 1\nperformer_may_authorise: yes\n", 1))
        .expect("written");
    printed(&mut authorise());
}

/// Changes a file of a laboratory before it is lodged, authorises, and returns what issuing says.
fn refused(name: &str, path: &str, old: &str, new: &str) -> String {
    let folder = laboratory(name);
    let file = folder.join(path);
    let text = std::fs::read_to_string(&file).expect("a record");
    assert!(text.contains(old), "{path} has no {old}");
    std::fs::write(&file, text.replacen(old, new, 1)).expect("written");
    authorise(&folder, REPORT);
    let (status, said) = told(&mut issue(&folder, REPORT));
    assert_eq!(status, Some(1), "{said}");
    assert!(!folder.join("register/reports").exists(), "something was issued");
    said
}

#[test]
fn a_run_without_reason_missing_content_and_another_customer_stop_the_issue() {
    let others = "```yaml customer EASTFIELD\nname: Eastfield Works\naddress: 1 Mill Lane, Eastfield\n```\n";
    let order = "campaigns/two-kilograms/order.md";
    let said = refused("foreign", order, "```yaml item", &format!("{others}\n```yaml item"));
    assert!(said.contains("customer_foreign") && said.contains("EASTFIELD"), "{said}");

    let said = refused("no-customer", REPORT, "  customer: HARROWDALE\n", "");
    assert!(said.contains("content_missing") && said.contains("names no customer"), "{said}");

    let run = "```yaml comparison W7\ncycle: ABBA\na: K17\nb: S1\nresult: b minus a\ncomparator: M1\nambient: A3\ntype_a: own\n\
               unit: mg\ndata: D3_S1\n```\n\n## HW 2 against K-17";
    let said = refused("a-run-more", "campaigns/two-kilograms/day-3.md", "## HW 2 against K-17", run);
    assert!(said.contains("run_unexplained") && said.contains("W7"), "{said}");

    // With its reason recorded the report is authorised anew and issued.
    let folder = Path::new(env!("CARGO_TARGET_TMPDIR")).join("register-a-run-more");
    let path = folder.join(REPORT);
    let text = std::fs::read_to_string(&path).expect("the report");
    let reason =
        "  deviations: none\n  runs_left_out: [{run: W7, reason: readings of W3 reduced twice for comparison}]\n";
    std::fs::write(&path, text.replacen("  deviations: none\n", reason, 1)).expect("written");
    authorise(&folder, REPORT);
    printed(&mut issue(&folder, REPORT));
}

/// Small reports on the results of the example, as many as asked for.
fn small_reports(folder: &Path, count: usize) -> Vec<String> {
    let text = std::fs::read_to_string(folder.join(REPORT)).expect("the report");
    let front = text.split("---\n").nth(1).expect("front matter");
    let mut paths = Vec::new();
    for number in 1..=count {
        let path = format!("campaigns/two-kilograms/part-{number}.md");
        let front = front.replace("record: TK-20", &format!("record: TK-2{number}"));
        std::fs::write(folder.join(&path), format!("---\n{front}---\n\n# Part {number}\n\n{{{{ R1.mass }}}}\n"))
            .expect("written");
        paths.push(path);
    }
    paths
}

/// Comparisons that these small reports do not cite are explained in none of them: they cite the combined result of S1 alone.
fn only_first_item(folder: &Path) {
    for entry in std::fs::read_dir(folder.join("campaigns/two-kilograms")).expect("a folder") {
        let path = entry.expect("an entry").path();
        if path.file_name().is_some_and(|name| name.to_string_lossy().starts_with("part-")) {
            let text = std::fs::read_to_string(&path).expect("a report");
            let text = text.replace("items: [S1, S2]", "items: [S1]");
            let text = text.replace(
                "results: [R1.mass, R1.conventional_mass, R2.mass, R2.conventional_mass]",
                "results: [R1.mass]",
            );
            std::fs::write(&path, text).expect("written");
        }
    }
}

/// Reports of the example laboratory ready to be issued.
fn ready(name: &str, count: usize) -> (std::path::PathBuf, Vec<String>) {
    let folder = laboratory(name);
    let paths = small_reports(&folder, count);
    only_first_item(&folder);
    for path in &paths {
        authorise(&folder, path);
    }
    (folder, paths)
}

/// Every report stands in the register once, with numbers from 1 on, and its file in the archive proves itself.
fn all_issued(folder: &Path, paths: &[String]) {
    let listed = reports(folder);
    let listed = listed.as_array().expect("a list");
    let numbers: Vec<&str> = listed.iter().map(|one| one["number"].as_str().expect("a number")).collect();
    let expected: Vec<String> = (1..=paths.len()).map(|number| format!("{number:04}")).collect();
    assert_eq!(numbers, expected);
    let mut records: Vec<&str> = listed.iter().map(|one| one["report"].as_str().expect("a path")).collect();
    records.sort_unstable();
    let mut wanted: Vec<&str> = paths.iter().map(String::as_str).collect();
    wanted.sort_unstable();
    assert_eq!(records, wanted);
    printed(&mut program(folder, "2041-06-01", &["register", "--verify"]));
    for number in expected {
        let (status, found) = audit(folder, &format!("register/reports/{number}.pdf"));
        assert_eq!(status, Some(0), "{number}: {found}");
    }
}

#[test]
fn four_issue_at_once_and_none_gets_the_number_of_another() {
    let (folder, paths) = ready("four", 4);
    let started: Vec<_> = paths
        .iter()
        .map(|path| issue(&folder, path).stdout(std::process::Stdio::null()).spawn().expect("the program starts"))
        .collect();
    for mut child in started {
        assert!(child.wait().expect("an end").success());
    }
    all_issued(&folder, &paths);
}

#[test]
fn a_process_killed_at_any_instant_leaves_a_whole_report_or_none() {
    let (folder, paths) = ready("killed", 6);
    let begun = std::time::Instant::now();
    printed(&mut issue(&folder, &paths[0]));
    let whole = begun.elapsed();
    let (mut state, mut kills) = (0x9e37_79b9_7f4a_7c15_u64, 0);
    for path in &paths[1..] {
        for attempt in 0.. {
            state = state.wrapping_mul(6_364_136_223_846_793_005).wrapping_add(1_442_695_040_888_963_407);
            // Instants over the whole run, most of them near its end, where files are written; then one run in peace.
            let share = ((state >> 33) % 1000) as f64 / 1000.0;
            let wait = whole.mul_f64(if attempt % 2 == 0 { share } else { 0.8 + 0.3 * share });
            let mut child = issue(&folder, path)
                .stdout(std::process::Stdio::null())
                .stderr(std::process::Stdio::null())
                .spawn()
                .expect("the program starts");
            if attempt < 8 {
                std::thread::sleep(wait);
                kills += usize::from(child.kill().is_ok());
            }
            let _ = child.wait();
            printed(&mut program(&folder, "2041-06-01", &["register", "--verify"]));
            let listed = reports(&folder);
            if listed.as_array().expect("a list").iter().any(|one| one["report"] == path.as_str()) {
                break;
            }
        }
    }
    assert!(kills >= paths.len() - 1, "{kills} kills");
    all_issued(&folder, &paths);
    let left = std::fs::read_dir(folder.join("register/reports")).expect("the archive").count();
    printed(&mut program(&folder, "2041-06-01", &["lodge", "--as", "duty metrologist"]));
    assert!(left <= paths.len() + 1, "{left} files in the archive");
}

/// The number of the line that holds a text.
fn line_of(path: &Path, text: &str) -> usize {
    let whole = std::fs::read_to_string(path).expect("a record");
    1 + whole.lines().position(|line| line.contains(text)).unwrap_or_else(|| panic!("no {text}"))
}

/// Writes a record with one correction.
fn correct(folder: &Path, home: &str, name: &str, record: &str, old: &str, new: &str) {
    let line = line_of(&folder.join(record), old);
    let escaped = |text: &str| text.replace('\\', "\\\\").replace('"', "\\\"").replace('\n', "\\n");
    let text = format!(
        "---\nrecord: {name}\ndate: 2041-05-25\nperformed_by: second metrologist\n---\n\n# A correction\n\n\
         ```yaml correction {name}\nrecord: {record}\nline: {line}\nold: \"{}\"\nnew: \"{}\"\n\
         reason: digits exchanged when written down\nby: second metrologist\ndate: 2041-05-25\n```\n",
        escaped(old),
        escaped(new)
    );
    std::fs::write(folder.join(home), text).expect("written");
}

/// A reading of the first day, and what it should have been.
const RAW: &str = "campaigns/two-kilograms/raw/day-1.csv";
const MISREAD: (&str, &str) = ("-147.68322", "-147.63822");

#[test]
fn a_correction_leaves_the_original_and_shows_both_texts() {
    let folder = laboratory("correction");
    printed(&mut program(&folder, "2041-05-16", &["lodge", "--as", "duty metrologist"]));
    let before = printed(&mut program(&folder, "2041-05-16", &["reduce", "--csv"]));
    let raw = std::fs::read(folder.join(RAW)).expect("raw data");
    correct(&folder, "campaigns/two-kilograms/corrections.md", "C1", RAW, MISREAD.0, MISREAD.1);
    let after = printed(&mut program(&folder, "2041-05-25", &["reduce", "--csv"]));
    assert_ne!(before, after, "the correction changes nothing");
    assert!(std::fs::read(folder.join(RAW)).expect("raw data") == raw);
    let trail =
        String::from_utf8(printed(&mut program(&folder, "2041-05-25", &["trail", "W1.difference"]))).expect("text");
    assert!(trail.contains("corrected by C1: “-147.68322” to “-147.63822” (digits exchanged when written down; second metrologist, 2041-05-25)"), "{trail}");
    // Not lodged, the correction stops the issue; lodged, it has an entry of its own.
    for who in ["second metrologist", "technical manager"] {
        printed(&mut program(&folder, "2041-05-26", &["authorise", REPORT, "--as", who]));
    }
    let (status, said) = told(&mut program(&folder, "2041-05-26", &["issue", REPORT, "--as", "technical manager"]));
    assert!(status == Some(1) && said.contains("not_lodged") && said.contains("corrections.md"), "{said}");
    printed(&mut program(&folder, "2041-05-26", &["lodge", "--as", "duty metrologist"]));
    let entries =
        String::from_utf8(printed(&mut program(&folder, "2041-05-26", &["register", "--entries", "--record", RAW])));
    let entries = entries.expect("text");
    assert!(entries.contains("corrected") && entries.contains("“-147.68322” to “-147.63822”"), "{entries}");
    printed(&mut program(&folder, "2041-05-26", &["issue", REPORT, "--as", "technical manager"]));
    // The PDF carries the file as first written and the correction, and proves itself by applying it again.
    let (status, found) = audit(&folder, "register/reports/0001.pdf");
    assert_eq!(status, Some(0), "{found}");
    let pdf = std::fs::read(folder.join("register/reports/0001.pdf")).expect("the report");
    let originals = libripens::register::originals(&pdf).expect("attached files");
    assert!(originals[RAW] == raw && originals.contains_key("campaigns/two-kilograms/corrections.md"));
}

#[test]
fn a_correction_by_a_stranger_is_not_lodged() {
    let folder = laboratory("stranger");
    correct(&folder, "campaigns/two-kilograms/corrections.md", "C1", RAW, MISREAD.0, MISREAD.1);
    let path = folder.join("campaigns/two-kilograms/corrections.md");
    let text = std::fs::read_to_string(&path).expect("the correction");
    std::fs::write(&path, text.replace("by: second metrologist", "by: night watch")).expect("written");
    let (status, said) = told(&mut program(&folder, "2041-05-25", &["lodge", "--as", "duty metrologist"]));
    assert!(status == Some(1) && said.contains("person_unauthorised") && said.contains("night watch"), "{said}");
}

fn findings(folder: &Path) -> (Option<i32>, serde_json::Value) {
    let output = program(folder, "2041-06-01", &["consequences", "--json"]).output().expect("the program starts");
    (output.status.code(), serde_json::from_slice(&output.stdout).expect("JSON"))
}

fn texts(list: &serde_json::Value, key: &str) -> Vec<String> {
    list.as_array().expect("a list").iter().map(|one| one[key].as_str().expect("text").to_string()).collect()
}

#[test]
fn consequences_find_what_changed_and_a_decision_holds_for_exactly_that() {
    let folder = authorised("consequences");
    printed(&mut issue(&folder, REPORT));
    let (status, found) = findings(&folder);
    assert_eq!((status, &found[0]["proven_by_hash"]), (Some(0), &true.into()), "{found}");
    assert_eq!(
        told(&mut program(
            &folder,
            "2041-06-01",
            &["decide", "0001", "no-action", "--as", "technical manager", "--why", "x"]
        ))
        .0,
        Some(2)
    );

    // A record the campaign sees but does not use is re-computed, and nothing is found.
    std::fs::write(folder.join("standards/notes.md"), "# Notes\n").expect("written");
    let (status, found) = findings(&folder);
    assert_eq!((status, &found[0]["proven_by_hash"]), (Some(0), &false.into()), "{found}");

    correct(&folder, "campaigns/two-kilograms/corrections.md", "C1", RAW, MISREAD.0, MISREAD.1);
    let (status, found) = findings(&folder);
    let difference = &found[0]["difference"];
    assert_eq!(status, Some(1), "{found}");
    assert_eq!(found[0]["files_changed"], serde_json::json!([RAW]));
    let results = texts(&difference["results"], "name");
    assert_eq!(results, ["R1.conventional_mass", "R1.mass"], "{difference}");
    assert_eq!(difference["unchanged"], serde_json::json!(["R2.conventional_mass", "R2.mass"]));
    assert!(difference["results"][1]["because_of"].as_array().is_some_and(|names| !names.is_empty()), "{difference}");
    assert!(difference["results"][1]["relative_to_uncertainty"].as_f64().is_some_and(|ratio| ratio.abs() > 0.01));

    let decide = ["decide", "0001", "no-action", "--as", "technical manager", "--why", "far below the uncertainty"];
    printed(&mut program(&folder, "2041-06-01", &decide));
    let (status, found) = findings(&folder);
    assert_eq!((status, &found[0]["decision"]["decision"]), (Some(0), &"no_action".into()), "{found}");

    // Another change: the decision no longer holds.
    let newer = "calibrations:\n  - {certificate: C-41-200, date: 2041-05-01, due: 2043-05-01, mass: 1 kg + 0.300(12) mg, basis: consensus_8}";
    correct(&folder, "standards/corrections.md", "C2", "standards/k17.md", "calibrations:", newer);
    let (status, found) = findings(&folder);
    assert_eq!(status, Some(1), "{found}");
    assert!(
        found[0]["decision"].is_null() && !found[0]["difference"]["superseded"].as_array().expect("a list").is_empty(),
        "{found}"
    );
}

#[test]
fn a_run_added_since_is_found() {
    let folder = authorised("run-added");
    printed(&mut issue(&folder, REPORT));
    let run = "---\nrecord: TK-14\ndate: 2041-05-28\n---\n\n```yaml comparison W8\ncycle: ABBA\na: K17\nb: S1\nresult: b minus a\n\
               comparator: M1\nambient: A3\ntype_a: own\nunit: mg\ndata: D3_S1\n```\n";
    std::fs::write(folder.join("campaigns/two-kilograms/day-4.md"), run).expect("written");
    let (status, found) = findings(&folder);
    assert_eq!((status, &found[0]["runs_added"]), (Some(1), &serde_json::json!(["W8"])), "{found}");
    assert!(found[0]["difference"]["results"].as_array().expect("a list").is_empty(), "{found}");
}

/// A file attached to an archived report.
fn attached(folder: &Path, number: &str, name: &str) -> serde_json::Value {
    let pdf = std::fs::read(folder.join(format!("register/reports/{number}.pdf"))).expect("the archived report");
    let bytes = libripens::register::audit::attached(&pdf, name).expect("an attached file");
    serde_json::from_slice(&bytes).expect("JSON")
}

/// Printed values of everything computed, by name.
fn printed_values(folder: &Path, number: &str) -> std::collections::BTreeMap<String, String> {
    let results = attached(folder, number, "results.json");
    let list = results["quantities"].as_array().expect("a list").iter();
    let computed = list.filter(|one| one["origin"]["what"] == "computed");
    let text = |value: &serde_json::Value| value.as_str().expect("text").to_string();
    computed.map(|one| (text(&one["name"]), text(&one["printed"]))).collect()
}

fn states(folder: &Path) -> Vec<String> {
    let listed = reports(folder);
    let state = |one: &serde_json::Value| format!("{} {} {}", one["number"], one["state"], one["by"]).replace('"', "");
    listed.as_array().expect("a list").iter().map(state).collect()
}

/// Corrects, lodges, and has the report authorised as it then stands.
fn corrected(folder: &Path, day: &str, home: &str, name: &str, old: &str, new: &str) {
    correct(folder, home, name, RAW, old, new);
    printed(&mut program(folder, day, &["lodge", "--as", "duty metrologist"]));
    for who in ["second metrologist", "technical manager"] {
        printed(&mut program(folder, day, &["authorise", REPORT, "--as", who]));
    }
}

#[test]
fn an_amendment_and_a_replacement_state_every_value_that_changed() {
    let folder = authorised("follow");
    printed(&mut issue(&folder, REPORT));
    let follow = |how: &str, number: &str| {
        let why = "a reading of the first day was written down with exchanged digits";
        program(&folder, "2041-05-27", &[how, number, "--as", "technical manager", "--why", why])
    };
    let (status, said) = told(&mut follow("amend", "0001"));
    assert!(status == Some(1) && said.contains("already_issued"), "{said}");

    corrected(&folder, "2041-05-26", "campaigns/two-kilograms/corrections.md", "C1", MISREAD.0, MISREAD.1);
    let (status, said) = told(&mut program(&folder, "2041-05-27", &["issue", REPORT, "--as", "technical manager"]));
    assert!(
        status == Some(1) && said.contains("already_issued") && said.contains("amendment or a replacement"),
        "{said}"
    );
    printed(&mut follow("amend", "0001"));
    assert_eq!(states(&folder), ["0001 amended 0002", "0002 issued null"]);
    let (then, now) = (printed_values(&folder, "0001"), printed_values(&folder, "0002"));
    let change = attached(&folder, "0002", "issue.json")["change"].clone();
    let stated: Vec<String> = ["results", "others"].iter().flat_map(|list| texts(&change[list], "name")).collect();
    let changed: Vec<&String> =
        now.iter().filter(|(name, value)| then.get(*name) != Some(*value)).map(|(name, _)| name).collect();
    assert!(changed.len() > 3, "{changed:?}");
    assert!(changed.iter().all(|name| stated.contains(name)), "{changed:?} are not all among {stated:?}");
    assert!(
        change["unchanged"]
            .as_array()
            .expect("a list")
            .iter()
            .all(|name| then[name.as_str().expect("text")] == now[name.as_str().expect("text")])
    );
    assert_eq!(texts(&change["inputs"], "name"), ["W1.indications"], "{change}");
    assert_eq!((&change["inputs"][0]["old"], &change["inputs"][0]["new"]), (&MISREAD.0.into(), &MISREAD.1.into()));
    for number in ["0001", "0002"] {
        let (_, found) = audit(&folder, &format!("register/reports/{number}.pdf"));
        assert_eq!(
            (check(&found, "register").0, check(&found, "status").0, check(&found, "pages").0),
            ("passed", "passed", "passed"),
            "{found}"
        );
    }
    // Of the report amended already, another amendment would be a second present one.
    let (status, said) = told(&mut follow("amend", "0001"));
    assert!(status == Some(1) && said.contains("report_unknown") && said.contains("name 0002"), "{said}");

    corrected(&folder, "2041-05-27", "campaigns/two-kilograms/more-corrections.md", "C2", "-147.68257", "-147.68275");
    printed(&mut follow("replace", "0002"));
    assert_eq!(states(&folder), ["0001 replaced 0003", "0002 replaced 0003", "0003 issued null"]);
    let (status, found) = audit(&folder, "register/reports/0003.pdf");
    assert_eq!(status, Some(0), "{found}");
    let (status, found) = audit(&folder, "register/reports/0001.pdf");
    assert_eq!((status, check(&found, "status").0), (Some(1), "failed"), "{found}");
    assert!(check(&found, "status").1.contains("replaced by 0003"));
    assert_eq!(findings(&folder).0, Some(0));
    printed(&mut program(&folder, "2041-06-01", &["register", "--verify"]));
}

/// The end of the report's own words about the register, changed by one who has the folder and the report.
#[test]
fn what_is_done_to_register_archive_and_report_is_named_by_the_audit() {
    let folder = authorised("tampered");
    printed(&mut issue(&folder, REPORT));
    let register = folder.join(REGISTER);
    let whole = std::fs::read_to_string(&register).expect("the register");
    let pdf = folder.join("register/reports/0001.pdf");
    let report = std::fs::read(&pdf).expect("the report");
    std::fs::write(folder.join("client.pdf"), &report).expect("written");
    let failed = |what: &str, says: &str| {
        let (status, found) = audit(&folder, "client.pdf");
        assert_eq!((status, check(&found, what).0), (Some(1), "failed"), "{says}: {found}");
        assert!(check(&found, what).1.contains(says), "{says}: {found}");
    };
    let lines: Vec<&str> = whole.lines().collect();
    // The entry of the issue cut off; the register is short of what the report saw; the time of the issue changed.
    std::fs::write(&register, lines[..lines.len() - 1].join("\n") + "\n").expect("written");
    failed("register", "No report 0001 was ever issued");
    let (status, said) = told(&mut program(&folder, "2041-06-01", &["register", "--verify"]));
    assert!(status == Some(1) && said.contains("its end was cut off"), "{said}");
    std::fs::write(&register, lines[..1].join("\n") + "\n").expect("written");
    failed("register", "at its end are missing");
    let redated = whole.replace("2041-05-21T10:00:00Z", "2041-05-21T10:00:01Z");
    std::fs::write(&register, redated).expect("written");
    failed("register", "has the time 2041-05-21T10:00:01Z, the report 2041-05-21T10:00:00Z");
    // Another file under the number, with the register made to fit.
    let hash = libripens::report::dossier::sha256(&report);
    std::fs::write(&register, whole.replace(&hash, &"0".repeat(64))).expect("written");
    failed("register", "is bound to the file 0000000000000000");
    std::fs::write(&register, &whole).expect("written");
    // A record of the folder changed behind the report's back.
    let order = folder.join("campaigns/two-kilograms/order.md");
    let text = std::fs::read_to_string(&order).expect("a record");
    std::fs::write(&order, text.replace("Market Hill", "Market Lane")).expect("written");
    failed("records", "order.md was changed since");
    std::fs::write(&order, &text).expect("written");
    // The archived file itself.
    let mut other = report.clone();
    let middle = other.len() / 2;
    other[middle] ^= 1;
    std::fs::write(&pdf, &other).expect("written");
    let (status, said) = told(&mut program(&folder, "2041-06-01", &["register", "--verify"]));
    assert!(status == Some(1) && said.contains("0001.pdf is not the file that was issued"), "{said}");
    let send = ["send", "0001", "--to", "HARROWDALE", "--as", "duty metrologist"];
    let (status, said) = told(&mut program(&folder, "2041-06-01", &send));
    assert!(status == Some(2) && said.contains("it is not sent"), "{said}");
    std::fs::write(&pdf, &report).expect("written");
    assert_eq!(audit(&folder, "client.pdf").0, Some(0));
}

/// The example with every step up to the issue made in memory: its files, and the store with register and archive.
fn issued_in_memory() -> (std::collections::BTreeMap<String, Vec<u8>>, MemoryStore, Register) {
    use libripens::register::issuing::{Order, issue};
    use libripens::register::lodge::{files_to_lodge, lodge};
    let files = example_files();
    let intake = libripens::intake::MemoryIntake::with(files.clone());
    let engine = libripens::block::Engine::read(&intake, Some(example::CAMPAIGN)).expect("a folder in memory");
    let store = MemoryStore::at(at(0));
    let mut ledger = Ledger::open(&store).expect("an empty register");
    let all = files_to_lodge(&engine, "").expect("files");
    lodge(&mut ledger, &all, &[], "duty metrologist", "as made").expect("lodged");
    let seal = example::example_report().dossier.seal.clone();
    for (duty, who) in [(Duty::Review, "second metrologist"), (Duty::Authorisation, "technical manager")] {
        let act = Act::Authorised { report: REPORT.into(), seal: seal.clone(), duty };
        ledger.enter(act, who, "").expect("an entry");
    }
    let order = Order { report: REPORT, who: "technical manager", why: "", kind: ReportKind::Original, of: None };
    issue(&mut ledger, &engine, &order).unwrap_or_else(|| panic!("{:#?}", engine.complaints().list));
    let register = ledger.register.clone();
    (files, store, register)
}

/// The text with the last digit of its first number made another one.
fn other_number(text: &str) -> Option<String> {
    let start = text.find(|c: char| c.is_ascii_digit())?;
    let end = text[start..].find(|c: char| !c.is_ascii_digit() && c != '.').map_or(text.len(), |length| start + length);
    let at = text[start..end].rfind(|c: char| c.is_ascii_digit())? + start;
    let digit = text[at..=at].parse::<u32>().ok()?;
    Some(format!("{}{}{}", &text[..at], (digit + 1) % 10, &text[at + 1..]))
}

#[test]
fn every_input_changed_once_is_found_by_consequences() {
    use libripens::register::consequences::consequences;
    use libripens::register::store::Store;
    let (files, store, register) = issued_in_memory();
    let archived = |issued: &IssuedReport, name: &str| {
        let path = libripens::register::ledger::archive_path(&issued.number);
        let bytes = store.read(&path).expect("the archive").expect("the report");
        libripens::register::audit::attached(&bytes, name)
    };
    let finding = |files: std::collections::BTreeMap<String, Vec<u8>>| {
        let intake = libripens::intake::MemoryIntake::with(files);
        let mut found = consequences(&intake, &register, &archived, &mut |_, _| {}).expect("a folder in memory");
        assert_eq!(found.len(), 1);
        found.remove(0)
    };
    let untouched = finding(files.clone());
    assert!(untouched.proven_by_hash && untouched.is_unchanged(), "{untouched:#?}");

    let results = &example::example_report().dossier.files["results.json"];
    let results: serde_json::Value = serde_json::from_slice(results).expect("JSON");
    let (mut changed, mut left_out) = (0, Vec::new());
    for one in results["quantities"].as_array().expect("a list") {
        let (Some(typed), Some(file), Some(line)) =
            (one["typed"].as_str(), one["origin"]["file"].as_str(), one["origin"]["line"].as_u64())
        else {
            continue;
        };
        let name = one["name"].as_str().expect("a name");
        let text = String::from_utf8(files[file].clone()).expect("text");
        let mut lines: Vec<String> = text.split('\n').map(String::from).collect();
        let stands = &mut lines[line as usize - 1];
        let Some(other) = other_number(typed).filter(|_| stands.contains(typed)) else {
            left_out.push(name.to_string());
            continue;
        };
        *stands = stands.replacen(typed, &other, 1);
        let mut with = files.clone();
        with.insert(file.into(), lines.join("\n").into_bytes());
        let found = finding(with);
        assert!(!found.is_unchanged() && found.is_open(), "{name}: {typed} to {other} was missed");
        assert_eq!(found.files_changed, [file], "{name}");
        assert!(
            found.difference.inputs.iter().any(|input| input.name == name),
            "{name}: {typed} to {other}\n{found:#?}"
        );
        changed += 1;
    }
    assert!(changed >= 20 && left_out.len() * 5 < changed, "{changed} changed, left out {left_out:?}");
    for (path, bytes) in files.iter().filter(|(path, _)| path.contains("/raw/day-")) {
        let text = String::from_utf8(bytes.clone()).expect("text");
        let row = text.lines().nth(20).expect("a row");
        let mut with = files.clone();
        let other = other_number(&row[row.find('-').expect("a reading")..]).expect("a number");
        let start = row.find('-').expect("a reading");
        with.insert(path.clone(), text.replacen(row, &format!("{}{other}", &row[..start]), 1).into_bytes());
        if with[path] != *bytes {
            let found = finding(with);
            assert!(found.files_changed == [path.clone()] && found.is_open(), "{path}: {found:#?}");
        }
    }
}
