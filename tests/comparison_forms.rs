//! Comparisons in every form a record allows, against the mass equation solved by hand.
//!
//! The readings are made from known masses by the balance of forces, k I = (m − ρ V)(1 − Γ h) + zero + drift, so that
//! the reduction must give the masses back; common practice, no outside source.

use libripens::block::Engine;
use libripens::intake::MemoryIntake;

const LABORATORY: &str = "---\nformat: 1\nname: Test laboratory\naddress: Nowhere\ncoverage_probability: 95.45 %\ndecimal_marker: point\ndegrees_of_freedom: truncated\n---\n";

/// A weight on the pan with small ones beside it.
type Load<'a> = (Weight, &'a [Weight]);

/// The true state of one weight.
#[derive(Clone, Copy)]
struct Weight {
    mass: f64,
    density: f64,
    height: f64,
}

const AIR: f64 = 1.173;
const GRADIENT: f64 = 3.1e-7;
const SENSITIVITY: f64 = 1.000_13;

const REFERENCE: Weight = Weight { mass: 1.000_000_321, density: 8006.0, height: 0.031 };
const STEEL: Weight = Weight { mass: 0.999_998_5, density: 7843.0, height: 0.044 };
const BRASS: Weight = Weight { mass: 1.000_004_25, density: 8412.0, height: 0.029 };

/// The indication in mg of a weight on the pan, with small weights beside it, at time `t` in s.
fn indication(weight: Weight, added: &[Weight], t: f64) -> f64 {
    let apparent = |weight: &Weight| weight.mass * (1.0 - AIR / weight.density);
    let force = apparent(&weight) * (1.0 - GRADIENT * weight.height);
    let small: f64 = added.iter().map(apparent).sum();
    (force + small - 1.0) * 1e6 / SENSITIVITY + 0.37 + 2e-4 * t
}

fn standard(name: &str, weight: Weight, nominal: &str) -> String {
    format!(
        "```yaml mass-standard {name}\nnominal: {nominal}\ndensity: {{value: {}(1) kg/m3, at: 20 °C, origin: measured}}\n\
         mass_centre_height: {}(1) mm\ncalibrations:\n  - {{certificate: C-{name}, date: 2041-01-05, due: 2042-01-05, mass: {:.12}(1) kg}}\n```\n\n",
        weight.density,
        weight.height * 1e3,
        weight.mass
    )
}

fn item(name: &str, weight: Weight) -> String {
    format!(
        "```yaml item {name}\nnominal: 1 kg\ndensity: {{value: {}(2) kg/m3, at: 20 °C, origin: measured}}\nmass_centre_height: {}(2) mm\n```\n\n",
        weight.density,
        weight.height * 1e3
    )
}

fn comparator() -> String {
    format!(
        "```yaml comparator M1\nrepeatability: {{standard_deviation: 0.5 µg, degrees_of_freedom: 50}}\nsensitivity: {{factor: {SENSITIVITY}}}\n\
         gravity_gradient: {}(1)e-7 /m\n```\n\n",
        GRADIENT * 1e7
    )
}

/// Cycles of weights on the pan in this order, written as indication lists.
fn series(order: &[(Weight, &[Weight])], cycles: usize) -> String {
    let mut text =
        String::from("unit: mg\nseries:\n  - start: 2041-03-12T09:00:00Z\n    interval: 60 s\n    indications:\n");
    for cycle in 0..cycles {
        let row: Vec<String> = order
            .iter()
            .enumerate()
            .map(|(index, (weight, added))| {
                // Nine decimals of a milligram keep the numbers below what is tested.
                format!("{:.9}", indication(*weight, added, 60.0 * (cycle * order.len() + index) as f64))
            })
            .collect();
        text.push_str(&format!("      - [{}]\n", row.join(", ")));
    }
    text
}

fn comparison(cycle: &str, b: &str, series: &str, more: &str) -> String {
    format!(
        "```yaml comparison W1\ncycle: {cycle}\na: R\nb: {b}\nresult: b minus a\ncomparator: M1\nair_density: {AIR}(1) kg/m3\n\
         air_temperature: 20.0(1) °C\ntype_a: pooled\n{more}{series}```\n"
    )
}

fn reduce(blocks: &[String], check: impl FnOnce(&Engine)) {
    let record = format!("---\nrecord: T-1\ndate: 2041-03-12\n---\n\n{}", blocks.concat());
    let intake = MemoryIntake::with([("laboratory.md", LABORATORY.to_string()), ("record.md", record)]);
    let engine = libripens::reduce(&intake, None).expect("readable");
    let complaints = engine.complaints();
    let printed =
        libripens::diagnostic::print_complaints(&complaints, &engine.sources(), libripens::diagnostic::Look::Plain);
    assert!(!complaints.has_faults(), "{printed}");
    check(&engine);
}

fn number(engine: &Engine, path: &str) -> f64 {
    let graph = engine.graph();
    graph.number(graph.find(path).unwrap_or_else(|| panic!("no result {path}")))
}

fn assert_mass(engine: &Engine, path: &str, weight: Weight) {
    let found = number(engine, path);
    assert!((found - weight.mass).abs() < 2e-14, "{path}: {found} against {}", weight.mass);
}

#[test]
fn abba_and_aba_give_the_mass_back_through_the_full_equation() {
    let (a, b): (Load<'_>, Load<'_>) = ((REFERENCE, &[]), (STEEL, &[]));
    for (cycle, order) in [("ABBA", vec![a, b, b, a]), ("ABA", vec![a, b, a])] {
        let blocks = [
            standard("R", REFERENCE, "1 kg"),
            item("T", STEEL),
            comparator(),
            comparison(cycle, "T", &series(&order, 3), ""),
        ];
        reduce(&blocks, |engine| {
            assert_mass(engine, "W1.mass", STEEL);
            let difference = number(engine, "W1.difference");
            assert!((difference - (STEEL.mass - REFERENCE.mass)).abs() < 2e-14, "{difference}");
            let conventional = STEEL.mass * (1.0 - 1.2 / STEEL.density) / (1.0 - 1.2 / 8000.0);
            assert!((number(engine, "W1.conventional_mass") - conventional).abs() < 2e-14);
        });
    }
}

#[test]
fn several_weights_in_one_cycle_average_the_reference() {
    let order: Vec<(Weight, &[Weight])> = vec![(REFERENCE, &[]), (STEEL, &[]), (BRASS, &[]), (REFERENCE, &[])];
    let blocks = [
        standard("R", REFERENCE, "1 kg"),
        item("T1", STEEL),
        item("T2", BRASS),
        comparator(),
        comparison("AB1…BnA", "[T1, T2]", &series(&order, 2), ""),
    ];
    reduce(&blocks, |engine| {
        // The drift is not interpolated: the weights stand half an interval before and behind the middle of the cycle.
        let drift = 2e-4 * 30.0 * 1e-6 * SENSITIVITY;
        for (path, weight, off) in [("W1.T1.mass", STEEL, -drift), ("W1.T2.mass", BRASS, drift)] {
            let found = number(engine, path);
            assert!((found - weight.mass - off).abs() < 1e-12, "{path}: {found}, drift {off}");
        }
    });
}

#[test]
fn small_weights_on_either_pan_count_with_their_own_buoyancy() {
    let small = Weight { mass: 5.000_21e-6, density: 2700.0, height: 0.0 };
    let other = Weight { mass: 2.000_04e-6, density: 21_400.0, height: 0.0 };
    let (on_a, on_b) = ([other], [small]);
    let order: Vec<(Weight, &[Weight])> = vec![(REFERENCE, &on_a), (STEEL, &on_b), (STEEL, &on_b), (REFERENCE, &on_a)];
    let blocks = [
        standard("R", REFERENCE, "1 kg"),
        standard("A5", small, "5 mg").replace("0(1) mm", "0.0(1) mm"),
        standard("P2", other, "2 mg").replace("0(1) mm", "0.0(1) mm"),
        item("T", STEEL),
        comparator(),
        comparison("ABBA", "T", &series(&order, 2), "added: {a: P2, b: A5}\n"),
    ];
    reduce(&blocks, |engine| {
        let found = number(engine, "W1.mass");
        // The certificates state twelve decimals of a kilogram.
        assert!((found - STEEL.mass).abs() < 1e-12, "{found} against {}", STEEL.mass);
    });
}

#[test]
fn a_reference_certified_in_conventional_mass_is_converted() {
    let conventional = REFERENCE.mass * (1.0 - 1.2 / REFERENCE.density) / (1.0 - 1.2 / 8000.0);
    let reference = standard("R", REFERENCE, "1 kg").replace(
        &format!("mass: {:.12}(1) kg", REFERENCE.mass),
        &format!("conventional_mass: {conventional:.14}(1) kg"),
    );
    let order: Vec<(Weight, &[Weight])> = vec![(REFERENCE, &[]), (STEEL, &[]), (STEEL, &[]), (REFERENCE, &[])];
    let blocks = [reference, item("T", STEEL), comparator(), comparison("ABBA", "T", &series(&order, 2), "")];
    reduce(&blocks, |engine| assert_mass(engine, "W1.mass", STEEL));
}

#[test]
fn a_comparison_without_a_calibrated_reference_gives_the_difference_alone() {
    let order: Vec<(Weight, &[Weight])> = vec![(STEEL, &[]), (BRASS, &[]), (BRASS, &[]), (STEEL, &[])];
    let blocks = [item("R", STEEL), item("T", BRASS), comparator(), comparison("ABBA", "T", &series(&order, 2), "")];
    reduce(&blocks, |engine| {
        assert!(engine.graph().find("W1.mass").is_none());
        // The nominal mass stands for the unknown one in the buoyancy of a: a part in 10⁶ of 150 mg.
        let difference = number(engine, "W1.difference");
        assert!((difference - (BRASS.mass - STEEL.mass)).abs() < 5e-10, "{difference}");
    });
}
