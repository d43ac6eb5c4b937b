//! Trials per second of the graph, of a hand-written loop of the same arithmetic, and (by `benches/monte_carlo.py`)
//! of vectorised NumPy; ratios from one run.
//!
//! `cargo bench --bench monte_carlo` prints the table; the NumPy column needs python3 with numpy and is left out
//! without it.

#![allow(clippy::disallowed_methods)]

use libripens::graph::{Builder, Distribution, InputDraft, NodeId, Origin, Quantity, Value, propagate_distributions};
use libripens::method::unit;
use libripens::numeric::stream::Stream;
use libripens::quantity::Kind;
use rayon::prelude::*;
use std::process::Command;
use std::time::Instant;

fn input<'g>(
    builder: &'g Builder,
    path: &str,
    unit_text: &str,
    value: f64,
    distribution: Distribution,
) -> Quantity<'g> {
    let shown = unit(unit_text);
    let value = Value::Scalar(shown.to_si_f64(value));
    let mut draft = InputDraft::new(path, "x", path, Kind::Plain, shown, value, Origin::Assumed("benchmark"));
    draft.distribution = distribution;
    builder.input(draft)
}

/// JCGM 101, 9.3: mass calibration, model (23) as δm.
fn mass_calibration(builder: &Builder) -> NodeId {
    let normal = |u: f64| Distribution::Normal { standard_uncertainty: u };
    let flat = |half_width: f64| Distribution::Rectangular { half_width };
    let m = input(builder, "m_Rc", "mg", 100_000.0, normal(50e-9));
    let dm = input(builder, "dm_Rc", "mg", 1.234, normal(20e-9));
    let air = input(builder, "rho_a", "kg/m3", 1.20, flat(0.10));
    let w = input(builder, "rho_W", "kg/m3", 8000.0, flat(1000.0));
    let r = input(builder, "rho_R", "kg/m3", 8000.0, flat(50.0));
    let (nominal, reference) =
        (libripens::method::exact(builder, 100.0, "g"), libripens::method::exact(builder, 1.2, "kg/m3"));
    let y = (m + dm) * (1.0 + (air - reference) * (1.0 / w - 1.0 / r)) - nominal;
    y.id
}

/// The same arithmetic as a loop over trials, one block of 1024 at a time.
fn mass_calibration_loop(trials: usize) -> f64 {
    let block = |block: usize| -> f64 {
        let mut streams = ["m_Rc", "dm_Rc", "rho_a", "rho_W", "rho_R"].map(|path| Stream::new(path, block as u64));
        let mut sum = 0.0;
        for _ in 0..1024 {
            let m = 0.1 + 50e-9 * streams[0].normal();
            let dm = 1.234e-6 + 20e-9 * streams[1].normal();
            let air = 1.2 + 0.1 * (2.0 * streams[2].uniform() - 1.0);
            let w = 8000.0 + 1000.0 * (2.0 * streams[3].uniform() - 1.0);
            let r = 8000.0 + 50.0 * (2.0 * streams[4].uniform() - 1.0);
            sum += (m + dm) * (1.0 + (air - 1.2) * (1.0 / w - 1.0 / r)) - 0.1;
        }
        sum
    };
    (0..trials / 1024).into_par_iter().map(block).collect::<Vec<f64>>().iter().sum()
}

/// About 500 nodes, mostly arithmetic: 20 inputs, rounds of products, sums and ratios of neighbours.
fn arithmetic_graph(builder: &Builder) -> NodeId {
    let mut row: Vec<Quantity<'_>> = (0..20)
        .map(|index| {
            input(
                builder,
                &format!("x{index}"),
                "1",
                1.0 + 0.01 * f64::from(index),
                Distribution::Rectangular { half_width: 0.01 },
            )
        })
        .collect();
    for round in 0..24 {
        row = (0..20)
            .map(|index| {
                let (a, b) = (row[index], row[(index + 1) % 20]);
                match (round + index) % 4 {
                    0 => a * b,
                    1 => a + b * 0.5,
                    2 => a / b,
                    _ => a - b * 0.25,
                }
            })
            .collect();
    }
    row.into_iter().reduce(|sum, next| sum + next).map_or(NodeId(0), |sum| sum.id)
}

fn arithmetic_loop(trials: usize) -> f64 {
    let block = |block: usize| -> f64 {
        let mut streams: Vec<Stream> = (0..20).map(|index| Stream::new(&format!("x{index}"), block as u64)).collect();
        let mut total = 0.0;
        for _ in 0..1024 {
            let mut row = [0.0f64; 20];
            for (index, stream) in streams.iter_mut().enumerate() {
                row[index] = 1.0 + 0.01 * index as f64 + 0.01 * (2.0 * stream.uniform() - 1.0);
            }
            for round in 0..24 {
                let mut next = [0.0f64; 20];
                for (index, cell) in next.iter_mut().enumerate() {
                    let (a, b) = (row[index], row[(index + 1) % 20]);
                    *cell = match (round + index) % 4 {
                        0 => a * b,
                        1 => a + b * 0.5,
                        2 => a / b,
                        _ => a - b * 0.25,
                    };
                }
                row = next;
            }
            total += row.iter().sum::<f64>();
        }
        total
    };
    (0..trials / 1024).into_par_iter().map(block).collect::<Vec<f64>>().iter().sum()
}

/// Trials per second, the best of five runs.
fn rate(trials: usize, mut run: impl FnMut()) -> f64 {
    let time = |run: &mut dyn FnMut()| {
        let start = Instant::now();
        run();
        start.elapsed().as_secs_f64()
    };
    let best = (0..5).map(|_| time(&mut run)).fold(f64::INFINITY, f64::min);
    trials as f64 / best
}

/// Trials per second of the NumPy script, if it can be run.
fn numpy(case: &str) -> Option<f64> {
    let output = Command::new("python3")
        .args([concat!(env!("CARGO_MANIFEST_DIR"), "/benches/monte_carlo.py"), case])
        .output()
        .ok()?;
    String::from_utf8_lossy(&output.stdout).trim().parse().ok()
}

/// The most memory the process held while ten million trials were made and summed up.
fn print_memory() {
    let builder = Builder::default();
    let measurand = mass_calibration(&builder);
    let (graph, _) = builder.finish();
    let found = propagate_distributions(&graph, &[measurand], 10_000_000).map(|trials| trials.summary(0, 0.95));
    let status = std::fs::read_to_string("/proc/self/status").unwrap_or_default();
    let peak = status.lines().find_map(|line| line.strip_prefix("VmHWM:")).map(str::trim).unwrap_or("unknown");
    println!(
        "10 000 000 trials with intervals: u = {:.5} mg, peak memory {peak}",
        found.map_or(f64::NAN, |found| found.standard_uncertainty * 1e6)
    );
}

fn main() {
    let trials = 1 << 20;
    print_memory();
    #[allow(clippy::type_complexity)]
    let cases: [(&str, fn(&Builder) -> NodeId, fn(usize) -> f64); 2] = [
        ("mass_calibration", mass_calibration, mass_calibration_loop),
        ("arithmetic", arithmetic_graph, arithmetic_loop),
    ];
    println!(
        "{:18} {:>12} {:>12} {:>8} {:>12} {:>8}",
        "case", "graph Mt/s", "loop Mt/s", "ratio", "NumPy Mt/s", "ratio"
    );
    for (name, build, plain) in cases {
        let builder = Builder::default();
        let measurand = build(&builder);
        let (graph, _) = builder.finish();
        let (mut ours, mut theirs, mut python) = (0.0f64, 0.0f64, None::<f64>);
        // In turns, so that another program's work falls on all of them.
        for _ in 0..3 {
            ours = ours.max(rate(trials, || {
                std::hint::black_box(
                    propagate_distributions(&graph, &[measurand], trials).map(|trials| trials.values[0][0]).ok(),
                );
            }));
            theirs = theirs.max(rate(trials, || {
                std::hint::black_box(plain(trials));
            }));
            python = numpy(name).map(|rate| rate.max(python.unwrap_or(0.0))).or(python);
        }
        let (python, against) = match python {
            Some(rate) => (format!("{:12.2}", rate / 1e6), format!("{:8.2}", ours / rate)),
            None => (format!("{:>12}", "no numpy"), String::new()),
        };
        println!("{name:18} {:12.2} {:12.2} {:8.2} {python} {against}", ours / 1e6, theirs / 1e6, ours / theirs);
    }
}
