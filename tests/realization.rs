//! The campaign of the example that realizes the kilogram: each determination against an independent reduction of the
//! same rows, against the truth behind them, and with each effect left out in turn.
//!
//! Source: `tests/synthetic/reference_realization.json` (another implementation's reduction, and what the generator put in).

#![allow(clippy::disallowed_methods)]

use libripens::block::Engine;
use libripens::graph::{
    NodeId, covariance, linearity_departure, propagate_distributions, sensitivities, standard_uncertainty,
    unshared_variances,
};
use libripens::intake::MemoryIntake;
use serde_json::Value;
use std::collections::BTreeMap;
use std::path::Path;
use std::sync::OnceLock;

const CAMPAIGN: &str = "realization";

fn read_into(root: &Path, folder: &Path, files: &mut BTreeMap<String, Vec<u8>>) {
    for entry in std::fs::read_dir(folder).expect("folder") {
        let path = entry.expect("entry").path();
        let name = path.strip_prefix(root).expect("inside").to_string_lossy().replace('\\', "/");
        match path.is_dir() {
            true => read_into(root, &path, files),
            false if name.ends_with(".pdf") => {}
            false => drop(files.insert(name, std::fs::read(&path).expect("file"))),
        }
    }
}

fn files() -> &'static BTreeMap<String, Vec<u8>> {
    static FILES: OnceLock<BTreeMap<String, Vec<u8>>> = OnceLock::new();
    FILES.get_or_init(|| {
        let root = Path::new(env!("CARGO_MANIFEST_DIR")).join("example-records");
        let mut files = BTreeMap::new();
        read_into(&root, &root, &mut files);
        files
    })
}

/// The records with a text of one of them replaced.
fn changed(path: &str, from: &str, to: &str) -> MemoryIntake {
    let mut files = files().clone();
    let text = String::from_utf8(files[path].clone()).expect("UTF-8");
    assert!(text.contains(from), "{path} holds no “{from}”");
    files.insert(path.into(), text.replace(from, to).into_bytes());
    MemoryIntake::with(files)
}

fn reduced(intake: &MemoryIntake) -> Engine<'_> {
    let engine = Engine::read(intake, Some(CAMPAIGN)).expect("readable");
    engine.build_all();
    assert!(!engine.complaints().has_faults(), "{:#?}", engine.complaints().list);
    engine
}

fn reference() -> Value {
    let path = Path::new(env!("CARGO_MANIFEST_DIR")).join("tests/synthetic/reference_realization.json");
    serde_json::from_slice(&std::fs::read(path).expect("file")).expect("JSON")
}

fn node(engine: &Engine, path: &str) -> NodeId {
    engine.graph().find(path).unwrap_or_else(|| panic!("no result {path}"))
}

fn number(engine: &Engine, path: &str) -> f64 {
    engine.graph().number(node(engine, path))
}

fn uncertainty(engine: &Engine, path: &str) -> f64 {
    let id = node(engine, path);
    let graph = engine.graph();
    standard_uncertainty(&graph, &sensitivities(&graph, id))
}

/// Uncertainty of a result from the scatter that an estimator of this path saw.
fn own(engine: &Engine, path: &str) -> f64 {
    let graph = engine.graph();
    let found = graph.estimators.iter().find(|found| found.path == path).unwrap_or_else(|| panic!("no fit {path}"));
    found.estimate.own_covariance[0][0].sqrt()
}

#[test]
fn each_determination_agrees_with_an_independent_reduction() {
    let intake = MemoryIntake::with(files().clone());
    let engine = reduced(&intake);
    assert!(engine.complaints().list.is_empty(), "{:#?}", engine.complaints().list);
    let reference = reference();
    for (index, expected) in reference["determinations"].as_array().expect("a list").iter().enumerate() {
        let k = index + 1;
        let of = |key: &str| expected[key].as_f64().expect("a number");
        let factor = number(&engine, &format!("MP{k}.geometric_factor"));
        let off = (factor - of("geometric_factor")).abs() / of("u_geometric_factor");
        assert!(off < 0.05, "MP{k}: {factor} is {off} u off");
        let u = own(&engine, &format!("MP{k}.scatter"));
        assert!((u / of("u_geometric_factor") - 1.0).abs() < 0.03, "MP{k}: u {u}");
        let drift = number(&engine, &format!("MP{k}.drift")) * 3600.0 / factor;
        assert!((drift / of("drift_per_hour") - 1.0).abs() < 1e-3, "MP{k}: drift {drift}");
        let thermal = number(&engine, &format!("MP{k}.thermal_voltage")) * 1e6;
        assert!((thermal - of("thermal_voltage_uV")).abs() < 1e-3, "MP{k}: thermal voltage {thermal}");
        let mass = number(&engine, &format!("KD{k}.mass"));
        let off = (mass - of("mass")).abs() / of("u_own");
        assert!(off < 0.1, "KD{k}: {mass} is {off} u off");
        let u = own(&engine, &format!("KD{k}.scatter"));
        assert!((u / of("u_weighing") - 1.0).abs() < 0.03, "KD{k}: u {u}");
        let buoyancy = number(&engine, &format!("KD{k}.buoyancy"));
        assert!((buoyancy / of("buoyancy") - 1.0).abs() < 1e-6, "KD{k}: buoyancy {buoyancy}");
        let combined = uncertainty(&engine, &format!("KD{k}.mass"));
        let from_truth = (mass - of("true_mass")).abs() / combined;
        assert!(from_truth < 3.0, "KD{k}: {from_truth} u from the truth");
    }
}

/// The mean with the weights of the parts that are each one's own: value, u with all that the six share, and those parts.
#[test]
fn the_six_together_are_those_of_the_reference() {
    let intake = MemoryIntake::with(files().clone());
    let engine = reduced(&intake);
    let reference = reference();
    let graph = engine.graph();
    let ids: Vec<NodeId> = (1..=6).map(|k| graph.find(&format!("KD{k}.mass")).expect("a mass")).collect();
    let sweeps: Vec<_> = ids.iter().map(|id| sensitivities(&graph, *id)).collect();
    let unshared = unshared_variances(&graph, &sweeps);
    for (k, expected) in reference["determinations"].as_array().expect("a list").iter().enumerate() {
        let u = expected["u_own"].as_f64().expect("a number");
        assert!((unshared[k].sqrt() / u - 1.0).abs() < 0.03, "KD{}: own part {}", k + 1, unshared[k].sqrt());
    }
    let total: f64 = unshared.iter().map(|variance| 1.0 / variance).sum();
    let weights: Vec<f64> = unshared.iter().map(|variance| 1.0 / variance / total).collect();
    let mean: f64 = weights.iter().zip(&ids).map(|(weight, id)| weight * graph.number(*id)).sum();
    let mut variance = 0.0;
    for (a, first) in weights.iter().zip(&sweeps) {
        for (b, second) in weights.iter().zip(&sweeps) {
            variance += a * b * covariance(&graph, first, second);
        }
    }
    let of = |key: &str| reference["mass"][key].as_f64().expect("a number");
    assert!((mean - of("value")).abs() < 0.1 * of("u"), "mean {mean}");
    assert!((variance.sqrt() / of("u") - 1.0).abs() < 0.03, "u {}", variance.sqrt());
    assert!((mean - of("truth")).abs() < 3.0 * variance.sqrt());
}

const KIBBLE: &str = "instruments/apparatus.md";
const GRAVITY: &str = "instruments/gravity-station.md";
const RESISTOR: &str = "instruments/resistor.md";
const DAY: &str = "campaigns/realization/day-1.md";

/// An effect left out, and what that does to determination 1, in 1e-9: from the independent reduction.
const OMISSIONS: &[(&str, &str, &str, &str, f64, f64)] = &[
    ("tide", GRAVITY, "scale: 1.00223(300)", "scale: 0.0", 55.019, 0.02),
    ("height of the artefact", DAY, "mass_centre: 1384.59(1.50) mm", "mass_centre: 0.00(1.50) mm", -420.22, 0.05),
    ("pillar tie", GRAVITY, "value: -418.6(10.0)", "value: 0.0(10.0)", -42.7, 0.1),
    (
        "first current coefficient",
        KIBBLE,
        "current_coefficient: 4.725(260)e-3",
        "current_coefficient: 0.0(2)e-3",
        2.787,
        0.01,
    ),
    ("second current coefficient", KIBBLE, "140.1(31.5)e-6", "0.0(31.5)e-6", -11.497, 0.01),
    ("load coefficient", RESISTOR, "load_coefficient: 0.558(300)e-9", "load_coefficient: 0.0(3)e-9", 3.184, 0.01),
    (
        "pressure coefficient",
        RESISTOR,
        "pressure_coefficient: -0.7577(500)e-9",
        "pressure_coefficient: 0.0(5)e-9",
        34.55,
        0.05,
    ),
    ("order of the profile", DAY, "order: 4", "order: 3", 3144.55, 0.1),
    (
        "Abbe offset",
        KIBBLE,
        "optical_offset_x: 6.1(10.0) µm\noptical_offset_y: -17.3(10.0) µm",
        "optical_offset_x: 0.0(10.0) µm\noptical_offset_y: 0.0(10.0) µm",
        -3.6,
        0.1,
    ),
    ("tilt of the laser beam", KIBBLE, "beam_tilt_x: 78.1(25.0)", "beam_tilt_x: 0.0(25.0)", 3.05, 0.1),
    ("magnetic force", KIBBLE, "magnetic_force: 1.875(800)e-9", "magnetic_force: 0.0(8)e-9", 1.875, 0.01),
];

#[test]
fn an_effect_left_out_moves_the_result_as_expected() {
    let whole = MemoryIntake::with(files().clone());
    let engine = reduced(&whole);
    let mass = number(&engine, "KD1.mass");
    for (what, path, from, to, expected, tolerance) in OMISSIONS {
        let intake = changed(path, from, to);
        let engine = Engine::read(&intake, Some(CAMPAIGN)).expect("readable");
        engine.build("KD1", engine.blocks()["KD1"].raw.name.place);
        let moved = (number(&engine, "KD1.mass") - mass) * 1e9;
        assert!((moved - expected).abs() <= *tolerance, "{what}: {moved}e-9, expected {expected}e-9");
    }
}

#[test]
fn the_order_by_rule_is_the_stated_one_and_its_spread_is_carried() {
    let rule = "order: {largest: 7, confidence: 0.99}\nspread: {orders: [4, 5, 6]}";
    let intake = changed(DAY, "order: 4", rule);
    let engine = reduced(&intake);
    let whole = MemoryIntake::with(files().clone());
    let stated = reduced(&whole);
    let factor = number(&engine, "MP1.geometric_factor");
    assert_eq!(factor, number(&stated, "MP1.geometric_factor"));
    // The three orders of the independent reduction: 541.3004057674, …7368, …6686.
    let spread = uncertainty(&engine, "MP1.profile_spread") * factor;
    assert!((spread - 5.39e-7).abs() < 0.05e-7, "spread {spread}");
    assert!(uncertainty(&engine, "KD1.mass") > uncertainty(&stated, "KD1.mass"));
}

#[test]
fn corrections_stand_as_lines_of_their_own() {
    let intake = MemoryIntake::with(files().clone());
    let engine = reduced(&intake);
    for (name, expected) in [
        ("alignment", -3.0757e-9),
        ("abbe_offset", 3.60872e-9),
        ("current", -2.787e-9),
        ("second_current", 11.4975e-9),
        ("magnetic_force", -1.875e-9),
        ("geometric_factor_change", 0.0),
        ("leakage", 0.0),
    ] {
        let found = number(&engine, &format!("KD1.correction.{name}"));
        assert!((found - expected).abs() < 2e-12, "{name}: {found}");
        let mass = number(&engine, &format!("KD1.correction_mass.{name}"));
        assert!((mass - found).abs() < 1e-14, "{name}: {mass} kg");
    }
    // A bound of zero is no correction, but an uncertainty.
    let change = uncertainty(&engine, "KD1.correction.geometric_factor_change");
    assert!((change - 4e-9).abs() < 1e-15, "{change}");
    let graph = engine.graph();
    let sweep = sensitivities(&graph, graph.find("KD1.mass").expect("a mass"));
    let number = match graph.node(graph.find("KB1.geometric_factor_change").expect("an input")).op {
        libripens::graph::Op::Input(number) => number,
        _ => panic!("an input"),
    };
    assert!((sweep.inputs[&number][0] - 1.0).abs() < 1e-6);
}

#[test]
fn trials_run_on_whole_columns_and_agree() {
    let intake = MemoryIntake::with(files().clone());
    let engine = reduced(&intake);
    let id = node(&engine, "KD1.mass");
    let first_order = uncertainty(&engine, "KD1.mass");
    let graph = engine.graph();
    // Scalars by the thousand would be rows that became nodes.
    assert!(graph.nodes.len() < 6000, "{} nodes", graph.nodes.len());
    assert!(linearity_departure(&graph, id).expect("fits again") < 1e-3);
    let found = propagate_distributions(&graph, &[id], 100_000).expect("runs").summary(0, 0.95);
    assert!((found.standard_uncertainty / first_order - 1.0).abs() < 0.02, "{found:?} against {first_order}");
    // <θ²> = θ₀² + u²: two tilts of u = 25 µrad lower the mean by 6.25e-10 beyond first order.
    let shift = found.estimate - graph.number(id);
    let noise = first_order / 100_000f64.sqrt();
    assert!((shift + 6.25e-10).abs() < 5.0 * noise, "shift {shift}, noise {noise}");
}

const MOVING: &str = "campaigns/realization/raw/moving-1.csv";
const WEIGHING: &str = "campaigns/realization/raw/weighing-1.csv";

/// The complaints about determination 1: code, file, line.
fn complaints_of(intake: &MemoryIntake) -> Vec<(String, String, usize)> {
    let engine = Engine::read(intake, Some(CAMPAIGN)).expect("readable");
    engine.build("KD1", engine.blocks()["KD1"].raw.name.place);
    let sources = engine.sources();
    let found = engine.complaints().list.into_iter().map(|complaint| {
        assert!(!complaint.hints.is_empty(), "{complaint:?}");
        let place = complaint.place.expect("a place");
        let file = sources.file(place.file);
        let line = file.bytes[..place.start as usize].iter().filter(|byte| **byte == b'\n').count() + 1;
        (complaint.code.word().to_string(), file.path.clone(), line)
    });
    found.collect()
}

/// The rows of a raw data file, each changed or left out.
fn with_rows(path: &str, change: impl Fn(usize, &str) -> Option<String>) -> MemoryIntake {
    let mut files = files().clone();
    let text = String::from_utf8(files[path].clone()).expect("UTF-8");
    let rows: Vec<String> = text.lines().enumerate().filter_map(|(index, line)| change(index + 1, line)).collect();
    files.insert(path.into(), (rows.join("\n") + "\n").into_bytes());
    MemoryIntake::with(files)
}

fn one(code: &str, path: &str, line: usize) -> Vec<(String, String, usize)> {
    vec![(code.to_string(), path.to_string(), line)]
}

fn line_of(path: &str, text: &str) -> usize {
    let whole = String::from_utf8(files()[path].clone()).expect("UTF-8");
    whole.lines().position(|line| line.contains(text)).unwrap_or_else(|| panic!("{path} holds no “{text}”")) + 1
}

#[test]
fn mistakes_of_a_day_are_found_where_they_stand() {
    let data_of_moving = line_of(DAY, "data: DM1");
    let at = |position: &str| changed(DAY, "position: 0.35 mm", &format!("position: {position}"));
    assert_eq!(complaints_of(&at("25 mm")), one("out_of_validity", DAY, data_of_moving));
    assert_eq!(complaints_of(&at("18 mm")), one("extrapolated", DAY, data_of_moving));
    // Sweeps before the weighing only.
    let before = with_rows(MOVING, |line, row| {
        let sweep: i64 = row.split(',').next().and_then(|cell| cell.parse().ok()).unwrap_or(0);
        (line == 1 || sweep <= 6).then(|| row.to_string())
    });
    assert_eq!(complaints_of(&before), one("extrapolated", DAY, data_of_moving));
    let swapped = changed(DAY, "{head: p_hPa, unit: hPa}", "{head: p_vac_Pa, unit: hPa}");
    assert_eq!(complaints_of(&swapped), one("column_implausible", WEIGHING, 2));
    let volts = changed(DAY, "null: {head: null_uV, unit: µV}", "null: {head: null_uV, unit: mV}");
    assert!(complaints_of(&volts).iter().all(|(code, ..)| code == "column_implausible"));
    let lengths = changed(DAY, "position: {head: z_mm, unit: mm}", "position: {head: z_mm, unit: s}");
    assert!(complaints_of(&lengths).iter().any(|(code, path, _)| code == "dimension_mismatch" && path == DAY));
    let state =
        with_rows(WEIGHING, |line, row| Some(if line == 40 { row.replace(",on,", ",off,") } else { row.into() }));
    assert_eq!(complaints_of(&state), one("sign_contradicts", WEIGHING, 40));
    let word =
        with_rows(WEIGHING, |line, row| Some(if line == 11 { row.replace(",off,", ",of,") } else { row.into() }));
    assert_eq!(complaints_of(&word), one("cell_unreadable", WEIGHING, 11));
    let backwards =
        with_rows(MOVING, |line, row| Some(if line == 30 { row.replace(",3419", ",3418") } else { row.into() }));
    assert_eq!(complaints_of(&backwards), one("time_unreadable", MOVING, 30));
    // A weighing paired with the moving phase of another hour.
    let paired = changed(DAY, "moving: MP1\nweighing: WP1", "moving: MP1\nweighing: WP2");
    assert_eq!(complaints_of(&paired), one("extrapolated", DAY, line_of(DAY, "moving: MP1") + 1));
    let halved = changed(DAY, "gate: 0.1 s", "gate: 0.05 s");
    assert!(complaints_of(&halved).iter().all(|(code, ..)| code == "fringe_factor"));
    assert!(!complaints_of(&halved).is_empty());
}

#[test]
fn outliers_go_by_a_rule_laid_down_before() {
    let rule = |date: &str| {
        let text = format!(
            "order: 4\noutliers: {{rule: FAR, limit: 3}}\n```\n\n```yaml rule FAR\ndate: {date}\ntext: gates farther than three standard deviations are left out\n"
        );
        let mut files = files().clone();
        let day = String::from_utf8(files[DAY].clone()).expect("UTF-8").replacen("order: 4\n", &text, 1);
        files.insert(DAY.into(), day.into_bytes());
        MemoryIntake::with(files)
    };
    let late = rule("2041-05-05");
    let found = complaints_of(&late);
    assert_eq!(found.len(), 1, "{found:?}");
    assert_eq!(found[0].0, "rule_dated");
    let early = rule("2041-05-01");
    let engine = Engine::read(&early, Some(CAMPAIGN)).expect("readable");
    engine.build("MP1", engine.blocks()["MP1"].raw.name.place);
    assert!(engine.complaints().list.is_empty(), "{:#?}", engine.complaints().list);
    let (kept, all) = (number(&engine, "MP1.geometric_factor"), number(&engine, "MP1.geometric_factor_with_all"));
    let whole = MemoryIntake::with(files().clone());
    let plain = reduced(&whole);
    assert_eq!(all, number(&plain, "MP1.geometric_factor"));
    assert!(kept != all && (kept / all - 1.0).abs() < 3e-9, "{kept} {all}");
    let found = engine.found::<libripens::block::moving_phase::MovingPhase>("MP1").expect("a moving phase");
    assert!((1..40).contains(&found.left_out.len()), "{} rows left out", found.left_out.len());
}
