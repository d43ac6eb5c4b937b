//! Reading columns of raw data, beside the `csv` crate's byte records parsed cell by cell.
//!
//! 200 000 rows of 7 columns, the size of one measurement of a moving instrument.

use divan::Bencher;
use divan::counter::BytesCount;
use libripens::intake::{FileId, Place};
use libripens::record::{Content, Text, WantedColumn, read_columns};
use std::fmt::Write;
use std::sync::LazyLock;

const ROWS: u64 = 200_000;
const HEADS: [&str; 7] = ["t_s", "z_mm", "fringes", "voltage_v", "current_ma", "temperature_c", "pressure_hpa"];

/// The file, made from a congruential sequence so that each run reads the same bytes.
static FILE: LazyLock<String> = LazyLock::new(|| {
    let mut text = HEADS.join(",");
    text.push('\n');
    let mut state = 2041u64;
    let mut draw = |span: u64| {
        state = state.wrapping_mul(6_364_136_223_846_793_005).wrapping_add(1_442_695_040_888_963_407);
        (state >> 33) % span
    };
    for row in 0..ROWS {
        // Writing to a string cannot fail.
        let _ = writeln!(
            text,
            "{}.{:03},-{}.{:06},{},0.{:09},{}.{:07},20.{:04},1003.{:03}",
            row / 1000,
            row % 1000,
            draw(40),
            draw(1_000_000),
            draw(100_000_000),
            draw(1_000_000_000),
            draw(15),
            draw(10_000_000),
            draw(10_000),
            draw(1000),
        );
    }
    text
});

fn main() {
    divan::main();
}

#[divan::bench]
fn read_columns_of_seven(bencher: Bencher<'_, '_>) {
    let wanted: Vec<WantedColumn> = HEADS
        .iter()
        .map(|head| WantedColumn {
            head: Text { text: (*head).into(), place: Place::new(FileId(0), 0, 0) },
            content: Content::Number,
        })
        .collect();
    bencher.counter(BytesCount::of_str(FILE.as_str())).bench_local(|| {
        let (columns, complaints) = read_columns(FILE.as_bytes(), FileId(0), 1, &wanted, None);
        assert!(complaints.list.is_empty() && columns.rows.len() as u64 == ROWS);
        columns
    });
}

#[divan::bench]
fn csv_byte_records_parsed(bencher: Bencher<'_, '_>) {
    bencher.counter(BytesCount::of_str(FILE.as_str())).bench_local(|| {
        let mut reader = csv::Reader::from_reader(FILE.as_bytes());
        let mut record = csv::ByteRecord::new();
        let mut columns = vec![Vec::<f64>::new(); HEADS.len()];
        while reader.read_byte_record(&mut record).expect("the generated file is well-formed") {
            for (column, cell) in columns.iter_mut().zip(&record) {
                let text = std::str::from_utf8(cell).expect("the generated file is ASCII");
                column.push(text.parse().expect("the generated cells are numbers"));
            }
        }
        columns
    });
}
