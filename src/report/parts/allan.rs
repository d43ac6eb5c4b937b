//! The Allan deviation of a series against averaging time, with confidence limits: chart, table, what follows.

use crate::block::Engine;
use crate::block::series_in_time::TimedSeries;
use crate::method::allan_deviation::{AllanPoint, CONFIDENCE};
use crate::quantity::{Unit, choose_unit};
use crate::report::Markup;
use crate::report::chart::{Axis, Chart, Series, Style, figure};
use crate::report::figures::{fixed, freedom, per_cent, plain, significant};
use crate::report::parts::charts::{WIDTH_MM, marker, solidus};
use crate::report::parts::{decisions_behind, sentence};
use crate::report::table::{Cell, Table, head};

/// Chart, table and remark of one series.
pub fn allan_part(engine: &Engine, name: &str, series: &TimedSeries) -> Markup {
    let Some(first) = series.allan.first() else { return Markup::new() };
    let unit = choose_unit(first.deviation, &series.unit);
    let mut made = figure(&chart(engine, name, series, &unit), WIDTH_MM, 70.0);
    made.push_code("\n\n").push(&table(engine, name, series, &unit));
    made.push_code("#note[").push_text(&remark(engine, series, &unit));
    for decision in decisions_behind(engine, &format!("{name}.mean")) {
        made.push_text(" ").push_text(&sentence(&decision));
    }
    made.push_code("]\n\n");
    made
}

fn seconds() -> Unit {
    crate::method::unit("s")
}

fn chart(engine: &Engine, name: &str, series: &TimedSeries, unit: &Unit) -> Chart {
    let style = engine.laboratory.style;
    let time = |point: &AllanPoint| point.length as f64 * series.interval;
    let shown = |value: f64| unit.difference_from_si(value);
    let deviations = series.allan.iter().map(|point| (time(point), shown(point.deviation), None)).collect();
    let limits = series
        .allan
        .iter()
        .flat_map(|point| [(time(point), shown(point.low), None), (time(point), shown(point.high), None)])
        .collect();
    let slope = series.allan.first().into_iter().flat_map(|first| {
        let falling = |point: &AllanPoint| first.deviation / (point.length as f64 / first.length as f64).sqrt();
        series.allan.iter().map(move |point| (time(point), shown(falling(point)), None))
    });
    let unit_text = solidus(&style.unit(unit));
    Chart {
        title: format!("{name}: Allan deviation of {}", series.label),
        x_label: "averaging time _τ_/s".into(),
        y_label: if unit.is_one() { "_σ_".into() } else { format!("_σ_/{unit_text}") },
        x_axis: Axis::Logarithm,
        y_axis: Axis::Logarithm,
        series: vec![
            Series { name: "overlapping Allan deviation".into(), points: deviations, style: Style::Points },
            Series { name: format!("{} limits", per_cent(style, CONFIDENCE)), points: limits, style: Style::Limits },
            Series { name: "slope −1/2, independent readings".into(), points: slope.collect(), style: Style::Line },
        ],
        decimal_marker: marker(engine),
        remark: remark(engine, series, unit),
        ..Chart::default()
    }
}

fn table(engine: &Engine, name: &str, series: &TimedSeries, unit: &Unit) -> Markup {
    let style = engine.laboratory.style;
    let unit_text = style.unit(unit);
    let header: Vec<Cell> = vec![
        head("m", ""),
        head("τ", "s"),
        head("σ", &unit_text),
        head("ν", ""),
        head("σ_low", &unit_text),
        head("σ_high", &unit_text),
    ];
    let caption = format!(
        "{name}: overlapping Allan deviation over m of {} readings, with {} limits for independent readings",
        series.count,
        per_cent(style, CONFIDENCE)
    );
    let mut table = Table::new(caption, header);
    table.align = vec!["right"; 6];
    let decimals = decimals_of(series, unit);
    let shown = |value: f64| Cell::from(fixed(style, unit.difference_from_si(value), decimals));
    for point in &series.allan {
        let time = plain(style, point.length as f64 * series.interval, &seconds());
        table.rows.push(vec![
            point.length.to_string().into(),
            time.trim_end_matches('s').trim_end().to_string().into(),
            shown(point.deviation),
            freedom(style, point.degrees_of_freedom).into(),
            shown(point.low),
            shown(point.high),
        ]);
    }
    table.markup()
}

/// Decimals that show three digits of the least deviation.
fn decimals_of(series: &TimedSeries, unit: &Unit) -> i32 {
    let least = series.allan.iter().map(|point| point.low).fold(f64::INFINITY, f64::min);
    let lead = unit.difference_decimal_from_si(least).and_then(|least| least.rounded_to_digits(3).leading_power());
    lead.map_or(3, |lead| (2 - lead).clamp(0, 9))
}

/// Where the deviation is least, and what independent readings would give there.
fn remark(engine: &Engine, series: &TimedSeries, unit: &Unit) -> String {
    let style = engine.laboratory.style;
    let within = series.allan.iter().filter(|point| 4 * point.length <= series.count);
    let least = within.min_by(|a, b| a.deviation.total_cmp(&b.deviation));
    let (Some(first), Some(least)) = (series.allan.first(), least) else {
        return "The readings are too few for a conclusion: it needs averages of a quarter of them at most.".into();
    };
    let text = |value: f64| {
        let number = significant(style, unit.difference_from_si(value), 3);
        if unit.is_one() { number } else { format!("{number}\u{a0}{}", style.unit(unit)) }
    };
    format!(
        "The least deviation over up to a quarter of the readings is {} at {}; independent readings would give {} there.",
        text(least.deviation),
        plain(style, least.length as f64 * series.interval, &seconds()),
        text(first.deviation / (least.length as f64).sqrt())
    )
}
