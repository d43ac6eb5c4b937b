//! The readings of a comparison: cycle by cycle, or by reference where there are many.

use crate::block::Engine;
use crate::block::ambient::clock;
use crate::block::weighing::{Comparison, CycleResult, pan_letter};
use crate::quantity::{Decimal, Unit};
use crate::report::Markup;
use crate::report::figures::fixed;
use crate::report::parts::capital;
use crate::report::table::{Cell, Table, head};

/// More cycles than this are shown by series, with the readings in the attached files.
const MOST_CYCLES: usize = 80;

/// Indications and difference of every cycle; of many cycles, the series.
pub fn readings_table(engine: &Engine, name: &str) -> Markup {
    let Some(comparison) = engine.weighing(name) else { return Markup::new() };
    match comparison.cycles.len() > MOST_CYCLES {
        true => series_table(engine, name),
        false => with_source(by_cycle(engine, name, &comparison), name, &comparison),
    }
}

/// The mean difference of every series; the readings stand in the attached files.
pub fn series_table(engine: &Engine, name: &str) -> Markup {
    let Some(comparison) = engine.weighing(name) else { return Markup::new() };
    with_source(by_series(engine, name, &comparison), name, &comparison)
}

fn with_source(mut made: Markup, name: &str, comparison: &Comparison) -> Markup {
    made.push_code("#note[").push_text(&format!("Readings of {name}: {}. ", comparison.source));
    for (what, decided) in &comparison.decisions {
        made.push_text(&format!("{}: {decided}. ", capital(what)));
    }
    made.push_code("]\n\n");
    made
}

fn by_cycle(engine: &Engine, name: &str, comparison: &Comparison) -> Markup {
    let per_cycle = comparison.weighings.len() / comparison.cycles.len().max(1);
    let unit = engine.laboratory.style.unit(&comparison.unit);
    let mut header: Vec<Cell> = vec!["Series".into(), "Cycle".into(), "Start (UTC)".into()];
    let pans: Vec<u32> = comparison.weighings.iter().take(per_cycle).map(|weighing| weighing.on_pan).collect();
    header.extend(pans.iter().map(|pan| head(&format!("I_{}", pan_letter(*pan, per_cycle)), &unit)));
    header.extend(comparison.b.iter().map(|_| head("d", "µg")));
    header.push("".into());
    let mut table = Table::new(
        format!(
            "{name}: {} against {}, cycle {}; d is corrected for buoyancy",
            comparison.b.join(", "),
            comparison.a,
            comparison.scheme
        ),
        header,
    );
    table.align = ["center", "center", "left"]
        .into_iter()
        .chain((0..per_cycle + comparison.b.len()).map(|_| "right"))
        .chain(["left"])
        .collect();
    for cycle in &comparison.cycles {
        table.rows.push(row(engine, comparison, cycle));
    }
    table.markup()
}

fn row(engine: &Engine, comparison: &Comparison, cycle: &CycleResult) -> Vec<Cell> {
    let style = engine.laboratory.style;
    let decimals = decimals_of(&comparison.indications, &comparison.unit);
    let mut cells: Vec<Cell> =
        vec![cycle.series.to_string().into(), cycle.cycle.to_string().into(), time_of_day(cycle.start).into()];
    let rows = comparison.weighings.iter().zip(&comparison.indications);
    for (_, indication) in rows.filter(|(weighing, _)| weighing.series == cycle.series && weighing.cycle == cycle.cycle)
    {
        cells.push(fixed(style, comparison.unit.difference_from_si(*indication), decimals).into());
    }
    cells.extend(cycle.differences.iter().map(|difference| Cell::from(fixed(style, difference * 1e9, 2))));
    cells.push(if cycle.excluded { "left out".into() } else { "".into() });
    cells
}

fn by_series(engine: &Engine, name: &str, comparison: &Comparison) -> Markup {
    let style = engine.laboratory.style;
    let header =
        vec!["Series".into(), "Start (UTC)".into(), "Cycles used".into(), "Cycles left out".into(), head("d", "µg")];
    let mut table = Table::new(
        format!(
            "{name}: {} against {}, cycle {}; mean difference of each series",
            comparison.b.join(", "),
            comparison.a,
            comparison.scheme
        ),
        header,
    );
    let mut series: Vec<u32> = comparison.cycles.iter().map(|cycle| cycle.series).collect();
    series.dedup();
    for number in series {
        let cycles: Vec<&CycleResult> = comparison.cycles.iter().filter(|cycle| cycle.series == number).collect();
        let used: Vec<f64> = cycles
            .iter()
            .filter(|cycle| !cycle.excluded)
            .filter_map(|cycle| cycle.differences.first().copied())
            .collect();
        let mean = used.iter().sum::<f64>() / used.len().max(1) as f64;
        table.rows.push(vec![
            number.to_string().into(),
            cycles.first().map_or_else(String::new, |cycle| clock(cycle.start)).into(),
            used.len().to_string().into(),
            (cycles.len() - used.len()).to_string().into(),
            fixed(style, mean * 1e9, 2).into(),
        ]);
    }
    table.markup()
}

/// The decimals the indications were written with, as far as the values show.
fn decimals_of(indications: &[f64], unit: &Unit) -> i32 {
    let decimals = |value: &f64| {
        Decimal::from_f64_shortest(unit.difference_from_si(*value)).map_or(0, |decimal| decimal.decimals())
    };
    indications.iter().map(decimals).filter(|decimals| *decimals <= 9).max().unwrap_or(4).max(0)
}

fn time_of_day(time: f64) -> String {
    clock(time).get(11..19).unwrap_or_default().to_string()
}
