//! What a chart shows, in words.

use super::{Axis, Chart, Series, Style};
use chrono::{DateTime, Utc};

/// The text that stands for the chart where it cannot be seen.
pub fn alternative_text(chart: &Chart) -> String {
    let plain = |label: &str| label.replace('_', "");
    let mut text = format!("Chart: {}. ", chart.title.trim_end_matches('.'));
    text.push_str(&format!("It shows {} against {}. ", plain(&chart.y_label), plain(&chart.x_label)));
    for series in &chart.series {
        text.push_str(&series_words(chart, series));
    }
    for line in chart.lines.iter().filter(|line| line.y.is_finite()) {
        let band =
            line.half_width.filter(|half| half.is_finite()).map(|half| format!(" with a band of ± {}", number(half)));
        text.push_str(&format!("Line {} at {}{}. ", line.label, number(line.y), band.unwrap_or_default()));
    }
    text.push_str(&chart.remark);
    text.trim_end().to_string()
}

fn series_words(chart: &Chart, series: &Series) -> String {
    let points: Vec<_> = series.points.iter().filter(|point| point.0.is_finite() && point.1.is_finite()).collect();
    let name = if series.name.is_empty() { "The series".to_string() } else { format!("Series {}", series.name) };
    let (Some(x), Some(y)) = (range(points.iter().map(|point| point.0)), range(points.iter().map(|point| point.1)))
    else {
        return format!("{name} has no points. ");
    };
    if series.style == Style::Limits {
        let (low, high) = (number(y.0), number(y.1));
        return format!("{name}: bars at {} positions, between {low} and {high}. ", points.len() / 2);
    }
    let count = if points.len() == 1 { "1 point".to_string() } else { format!("{} points", points.len()) };
    let mean = points.iter().map(|point| point.1 / points.len() as f64).sum::<f64>();
    format!(
        "{name}: {count}, from {} to {} along the axis, values from {} to {}, mean {}. ",
        position(chart, x.0),
        position(chart, x.1),
        number(y.0),
        number(y.1),
        number(mean)
    )
}

fn range(values: impl Iterator<Item = f64>) -> Option<(f64, f64)> {
    values.fold(None, |range, value| match range {
        None => Some((value, value)),
        Some((low, high)) => Some((f64::min(low, value), f64::max(high, value))),
    })
}

fn position(chart: &Chart, x: f64) -> String {
    if !chart.x_ticks.is_empty() {
        return chart.x_ticks.get(x.max(0.0) as usize).cloned().unwrap_or_else(|| number(x));
    }
    match chart.x_axis {
        Axis::Number | Axis::Logarithm => number(x),
        Axis::Time => DateTime::<Utc>::from_timestamp(libm::floor(x) as i64, 0)
            .map_or_else(|| number(x), |time| time.format("%Y-%m-%d %H:%M:%S UTC").to_string()),
    }
}

/// A number to six significant digits.
fn number(value: f64) -> String {
    let rounded: f64 = format!("{value:.5e}").parse().unwrap_or(value);
    let size = rounded.abs();
    let text = if size != 0.0 && !(1e-4..1e9).contains(&size) {
        let scientific = format!("{rounded:e}");
        let (digits, exponent) = scientific.split_once('e').unwrap_or((&scientific, "0"));
        format!("{digits} times 10 to the power {exponent}")
    } else {
        format!("{rounded}")
    };
    text.replace('-', "minus ")
}
