//! Reducing a moving phase of a million gates, beside reading the same file with the `csv` crate and `str::parse`.
//!
//! `cargo bench --bench kibble_rows` prints both times and their ratio from one run. What the ratio leaves above 1 is column
//! arithmetic, checks of every row, and the least-squares fit with its response to every row.

#![allow(clippy::disallowed_methods)]

use libripens::intake::MemoryIntake;
use std::collections::BTreeMap;
use std::fmt::Write;
use std::time::{Duration, Instant};

const ROWS: usize = 1_000_000;
/// Gates in a sweep.
const SWEEP: usize = 1000;
const ROUNDS: usize = 5;
/// The ratio aimed at.
const GOAL: f64 = 2.5;

const RECORDS: &str = "---
record: bench
date: 2041-05-04
---

```yaml time-base TB1
offset: 2.353(400)e-10
```

```yaml laser L1
frequency: {value: 473612353772100 Hz, u: 19 kHz}
```

```yaml voltage-standard JA1
frequency: 74.96 GHz
time_base: TB1
residual: 0.0(5)e-9
```

```yaml apparatus KB1
null_gain_moving: 1.0000482(150)
vacuum_gauge_factor: 1.17(6)
residual_gas_molar_mass: 0.0280134 kg/mol
residual_gas_refractivity: 0.805(15)e-6 K/Pa
```

```yaml raw-data DM1
file: moving.csv
zero_time: 2041-05-04T00:00:00Z
columns:
  sweep: {head: sweep, unit: 1}
  direction: {head: direction, unit: 1}
  time: {head: t_s, unit: s}
  position: {head: z_mm, unit: mm}
  fringes: {head: fringes, unit: 1}
  steps: {head: steps, unit: 1}
  null: {head: null_uV, unit: µV}
```

```yaml moving-phase MP1
data: DM1
gate: 0.02 s
position: 0 mm
residual_gas: {pressure: 0.058 Pa, temperature: 20.2 °C}
laser: L1
time_base: TB1
voltage_standard: JA1
apparatus: KB1
order: 4
```
";

fn main() {
    let data = made_data();
    let files = [
        ("laboratory.md", "---\nformat: 1\nname: Bench\naddress: Bench\n---\n"),
        ("day.md", RECORDS),
        ("moving.csv", &data),
    ];
    let files: BTreeMap<String, Vec<u8>> =
        files.into_iter().map(|(path, text)| (path.to_string(), text.as_bytes().to_vec())).collect();
    let intake = MemoryIntake::with(files);
    reduce(&intake);
    let (mut of_reduce, mut of_parse) = (Vec::new(), Vec::new());
    for _ in 0..ROUNDS {
        of_parse.push(timed(|| parse(&data)));
        of_reduce.push(timed(|| reduce(&intake)));
    }
    let (of_reduce, of_parse) = (median(of_reduce), median(of_parse));
    println!("reduce of {ROWS} gates                   {of_reduce:>9.1} ms");
    println!("csv and parse of the same file            {of_parse:>9.1} ms");
    println!("ratio                                     {:>9.2}   (goal: at most {GOAL})", of_reduce / of_parse);
    println!("medians of {ROUNDS} runs each, taken in turn");
}

/// Sweeps up and down with velocity noise, made from a congruential sequence so that each run reads the same bytes.
fn made_data() -> String {
    let step = 74.96e9 * 6.626_070_15e-34 / (2.0 * 1.602_176_634e-19);
    let half_wavelength = 299_792_458.0 / 473_612_353_772_100.0 / 2.0;
    let mut text = String::from("sweep,direction,t_s,z_mm,fringes,steps,null_uV\n");
    let mut state = 2041u64;
    let mut draw = || {
        state = state.wrapping_mul(6_364_136_223_846_793_005).wrapping_add(1_442_695_040_888_963_407);
        (state >> 11) as f64 / (1u64 << 53) as f64 - 0.5
    };
    for row in 0..ROWS {
        let (sweep, inside) = (row / SWEEP, row % SWEEP);
        let sign = if sweep % 2 == 0 { 1.0 } else { -1.0 };
        let z = sign * (inside as f64 - (SWEEP as f64 - 1.0) / 2.0) * 4e-5;
        let v = sign * 2e-3 * (1.0 + 2e-4 * draw());
        let u = v * (541.3 + 0.5 * z - 900.0 * z * z + 4e5 * z * z * z * z) + 2e-7 + 3e-7 * draw();
        let n = sign * 6984.0;
        // Writing to a string cannot fail.
        let _ = writeln!(
            text,
            "{},{:+},{:.3},{:.4},{:.5},{:+},{:.4}",
            sweep + 1,
            sign,
            0.02 * row as f64 + 1.5 * sweep as f64,
            z * 1e3,
            v * 0.02 / half_wavelength,
            n,
            (u - n * step) * 1e6
        );
    }
    text
}

fn reduce(intake: &MemoryIntake) -> f64 {
    let engine = libripens::reduce(intake, None).expect("a folder in memory can be listed");
    assert!(engine.complaints().list.is_empty(), "{:#?}", engine.complaints().list);
    let graph = engine.graph();
    graph.number(graph.find("MP1.geometric_factor").expect("a geometric factor"))
}

fn parse(data: &str) -> f64 {
    let mut reader = csv::Reader::from_reader(data.as_bytes());
    let mut columns = vec![Vec::new(); 7];
    let mut record = csv::StringRecord::new();
    while reader.read_record(&mut record).expect("a row") {
        for (cell, column) in record.iter().zip(&mut columns) {
            column.push(cell.parse::<f64>().expect("a number"));
        }
    }
    columns.iter().map(|column| column[ROWS - 1]).sum()
}

fn timed(run: impl FnOnce() -> f64) -> Duration {
    let start = Instant::now();
    std::hint::black_box(run());
    start.elapsed()
}

/// In milliseconds.
fn median(mut times: Vec<Duration>) -> f64 {
    times.sort();
    times[times.len() / 2].as_secs_f64() * 1e3
}
