//! Ranges, ticks and their labels.

use super::{Axis, Chart, Mean, Series};
use crate::numeric::elementary::{log10, pow};
use chrono::{DateTime, Utc};

/// A tick and what stands beside it.
#[derive(Debug, Clone, PartialEq)]
pub struct Tick {
    pub at: f64,
    pub label: String,
}

/// The ticks of one axis and what holds for all their labels: a factor, an offset, a date.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct Ticks {
    pub list: Vec<Tick>,
    pub note: String,
}

/// The range of some values with room at both ends; never empty.
pub fn padded(values: Vec<f64>, share: f64) -> (f64, f64) {
    let low = values.iter().copied().fold(f64::INFINITY, f64::min);
    let high = values.iter().copied().fold(f64::NEG_INFINITY, f64::max);
    if !(low.is_finite() && high.is_finite() && (high - low).is_finite()) {
        return (0.0, 1.0);
    }
    // Below this width the ticks could not be told apart in binary numbers.
    let least = (low.abs().max(high.abs()) * 1e-12).max(1e-290);
    let pad = if high - low < least { (low.abs() * 1e-3).max(least) } else { (high - low) * share };
    let pad = if low == 0.0 && high == 0.0 { 1.0 } else { pad };
    (low - pad, high + pad)
}

/// Ten to a whole power, as the decimal literal reads.
fn power_of_ten(exponent: i32) -> f64 {
    format!("1e{exponent}").parse().unwrap_or(1.0)
}

/// Steps of 1, 2 or 5 times a power of ten, about `wanted` of them over the range.
pub fn number_ticks(range: (f64, f64), wanted: f64, marker: char) -> Ticks {
    let rough = (range.1 - range.0) / wanted;
    let mut exponent = libm::floor(log10(rough)) as i32;
    let lead = rough / power_of_ten(exponent);
    let mut unit = match lead {
        lead if lead <= 1.0 => 1,
        lead if lead <= 2.0 => 2,
        lead if lead <= 5.0 => 5,
        _ => 10,
    };
    if unit == 10 {
        unit = 1;
        exponent += 1;
    }
    if (range.1 - range.0) / (unit as f64 * power_of_ten(exponent)) < 2.5 {
        // One or two ticks tell no scale.
        (unit, exponent) = match unit {
            5 => (2, exponent),
            2 => (1, exponent),
            _ => (5, exponent - 1),
        };
    }
    let step = unit as f64 * power_of_ten(exponent);
    // Every tick is a whole number of 10^exponent, so that its label is exact.
    let first = libm::ceil(range.0 / step) as i64;
    let last = libm::floor(range.1 / step) as i64;
    let units: Vec<i64> =
        (first..=last.min(first.saturating_add(40))).map(|count| count.saturating_mul(unit)).collect();
    let at = |units: i64| units as f64 / unit as f64 * step;
    let largest = units.iter().map(|units| units.unsigned_abs()).max().unwrap_or(0);
    let offset = if largest > 999_999 { units.first().map_or(0, |first| first.div_euclid(1000) * 1000) } else { 0 };
    let shown: Vec<i64> = units.iter().map(|units| units - offset).collect();
    let factor = common_factor(shown.iter().map(|units| units.unsigned_abs()).max().unwrap_or(0), exponent);
    let list = units.iter().zip(&shown);
    let list = list.map(|(units, shown)| Tick { at: at(*units), label: decimal(*shown, exponent - factor, marker) });
    let mut note = Vec::new();
    if factor != 0 {
        note.push(format!("× 10{}", superscript(factor)));
    }
    if offset != 0 {
        note.push(format!(
            "{} {}",
            if offset < 0 { '−' } else { '+' },
            decimal(offset.saturating_abs(), exponent, marker)
        ));
    }
    Ticks { list: list.collect(), note: note.join(" ") }
}

/// The chart with the values along logarithmic axes as powers of ten.
pub fn in_decades(chart: &Chart) -> Chart {
    let (across, up) = (chart.x_axis == Axis::Logarithm, chart.y_axis == Axis::Logarithm);
    let scaled = |value: f64, logarithm: bool| match logarithm {
        true if value > 0.0 => log10(value),
        true => f64::NAN,
        false => value,
    };
    let point = |(x, y, bar): &(f64, f64, Option<f64>)| (scaled(*x, across), scaled(*y, up), bar.filter(|_| !up));
    let series = chart.series.iter();
    let lines = chart.lines.iter();
    Chart {
        series: series
            .map(|series| Series { points: series.points.iter().map(point).collect(), ..series.clone() })
            .collect(),
        lines: lines
            .map(|line| Mean { y: scaled(line.y, up), half_width: line.half_width.filter(|_| !up), ..line.clone() })
            .collect(),
        ..chart.clone()
    }
}

/// Ticks of an axis of numbers, or of their logarithms over a range of powers of ten.
pub fn scale_ticks(axis: Axis, range: (f64, f64), wanted: f64, marker: char) -> Ticks {
    if axis != Axis::Logarithm {
        return number_ticks(range, wanted, marker);
    }
    let decades = range.1 - range.0;
    if decades < 0.7 {
        // Less than a decade holds too few of 1, 2 and 5.
        let ends = (ten_to(range.0), ten_to(range.1));
        let ticks = number_ticks(ends, wanted, marker);
        let moved = ticks.list.into_iter().filter(|tick| tick.at > 0.0);
        return Ticks { list: moved.map(|tick| Tick { at: log10(tick.at), ..tick }).collect(), note: ticks.note };
    }
    decade_ticks(range, if decades <= wanted / 2.0 { &[1, 2, 5] } else { &[1] }, wanted, marker)
}

/// Ticks at these multiples of the powers of ten; where there are many powers, at every second or third.
fn decade_ticks(range: (f64, f64), multiples: &[i64], wanted: f64, marker: char) -> Ticks {
    let (first, last) = (libm::floor(range.0) as i32, libm::floor(range.1) as i32);
    let every = libm::ceil((range.1 - range.0) / wanted.max(1.0)).max(1.0) as usize;
    let factor = if first >= -3 && last <= 4 { 0 } else { last.div_euclid(3) * 3 };
    let mut list = Vec::new();
    for exponent in (first..=last).step_by(every) {
        for multiple in multiples {
            let at = f64::from(exponent) + log10(*multiple as f64);
            if at < range.0 || at > range.1 {
                continue;
            }
            let label = match (multiples.len(), factor) {
                (1, factor) if factor != 0 => format!("10{}", superscript(exponent)),
                _ => decimal(*multiple, exponent - factor, marker),
            };
            list.push(Tick { at, label });
        }
    }
    let note = if factor != 0 && multiples.len() > 1 { format!("× 10{}", superscript(factor)) } else { String::new() };
    Ticks { list, note }
}

fn ten_to(exponent: f64) -> f64 {
    pow(10.0, exponent)
}

/// The power of ten, a multiple of three, to be taken out of labels that would be too long or too small.
fn common_factor(largest: u64, exponent: i32) -> i32 {
    let digits = largest.max(1).to_string().len() as i32;
    let magnitude = exponent + digits - 1;
    if (-3..=5).contains(&magnitude) && exponent >= -6 { 0 } else { magnitude.div_euclid(3) * 3 }
}

/// `units` times ten to `exponent`, in digits grouped by thin spaces, with a true minus.
pub fn decimal(units: i64, exponent: i32, marker: char) -> String {
    let mut digits = units.unsigned_abs().to_string();
    let places = (-exponent).max(0) as usize;
    if exponent > 0 && units != 0 {
        digits.push_str(&"0".repeat(exponent as usize));
    }
    while digits.len() <= places {
        digits.insert(0, '0');
    }
    let (whole, fraction) = digits.split_at(digits.len() - places);
    let mut text = if units < 0 { "\u{2212}".to_string() } else { String::new() };
    text.push_str(&grouped(whole, true));
    if !fraction.is_empty() {
        text.push(marker);
        text.push_str(&grouped(fraction, false));
    }
    text
}

/// Digits in groups of three, from the right or from the left; four stay together.
fn grouped(digits: &str, from_right: bool) -> String {
    if digits.len() <= 4 {
        return digits.to_string();
    }
    let shift = if from_right { digits.len() % 3 } else { 0 };
    let mut text = String::new();
    for (index, digit) in digits.chars().enumerate() {
        if index > 0 && index % 3 == shift % 3 {
            text.push('\u{202f}');
        }
        text.push(digit);
    }
    text
}

/// A whole number in raised digits.
pub fn superscript(number: i32) -> String {
    let raise = |c: char| match c {
        '-' => '⁻',
        '1' => '¹',
        '2' => '²',
        '3' => '³',
        digit => digit.to_digit(10).and_then(|digit| char::from_u32(0x2070 + digit)).unwrap_or(digit),
    };
    number.to_string().chars().map(raise).collect()
}

const DAY: i64 = 86_400;
/// Steps of time, in seconds.
const TIME_STEPS: &[i64] = &[
    1,
    2,
    5,
    10,
    15,
    30,
    60,
    120,
    300,
    600,
    900,
    1800,
    3600,
    7200,
    10_800,
    21_600,
    43_200,
    DAY,
    2 * DAY,
    5 * DAY,
    10 * DAY,
    20 * DAY,
    50 * DAY,
    100 * DAY,
    200 * DAY,
    500 * DAY,
    1000 * DAY,
    5000 * DAY,
];

/// Ticks at round times of UTC.
pub fn time_ticks(range: (f64, f64), width_mm: f64) -> Ticks {
    let span = range.1 - range.0;
    let room = |step: i64| {
        let label = if step >= DAY {
            20.0
        } else if step < 60 {
            16.0
        } else {
            12.0
        };
        span / step as f64 * label <= width_mm
    };
    let step = TIME_STEPS.iter().copied().find(|step| room(*step)).unwrap_or(50_000 * DAY);
    let first = libm::ceil(range.0 / step as f64) as i64;
    let last = libm::floor(range.1 / step as f64) as i64;
    let ticks = (first..=last.min(first.saturating_add(60))).filter_map(|count| {
        let second = count.checked_mul(step)?;
        let time = DateTime::<Utc>::from_timestamp(second, 0)?;
        let pattern = match step {
            step if step >= DAY => "%Y-%m-%d",
            _ if second % DAY == 0 => "%m-%d",
            step if step < 60 => "%H:%M:%S",
            _ => "%H:%M",
        };
        Some(Tick { at: second as f64, label: time.format(pattern).to_string() })
    });
    let date = |second: f64| {
        DateTime::<Utc>::from_timestamp(libm::floor(second) as i64, 0).map(|time| time.date_naive().to_string())
    };
    let note = match (date(range.0), date(range.1)) {
        _ if step >= DAY => String::new(),
        (Some(from), Some(to)) if from == to => from,
        (Some(from), Some(to)) => format!("{from} to {to}"),
        _ => String::new(),
    };
    Ticks { list: ticks.collect(), note }
}

/// Ticks at 0, 1, 2, … with names; names that would touch are left out at equal distances.
pub fn named_ticks(names: &[String], width_mm: f64) -> Ticks {
    let slot = width_mm / names.len().max(1) as f64;
    let widest = names.iter().map(|name| super::text_width(name)).fold(0.0, f64::max) + 2.0;
    let every = (libm::ceil(widest / slot) as usize).max(1);
    let list = names.iter().enumerate().step_by(every);
    Ticks {
        list: list.map(|(index, name)| Tick { at: index as f64, label: name.clone() }).collect(),
        note: String::new(),
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn labels(low: f64, high: f64) -> (Vec<String>, String) {
        let ticks = number_ticks((low, high), 5.0, '.');
        (ticks.list.into_iter().map(|tick| tick.label).collect(), ticks.note)
    }

    #[test]
    fn labels_are_exact_and_short() {
        assert_eq!(labels(-0.11, 0.32).0, ["−0.1", "0.0", "0.1", "0.2", "0.3"]);
        assert_eq!(labels(0.0, 52_000.0).0, ["0", "20\u{202f}000", "40\u{202f}000"]);
        assert_eq!(
            labels(1e-9, 6e-9),
            (vec!["1".into(), "2".into(), "3".into(), "4".into(), "5".into(), "6".into()], "× 10⁻⁹".into())
        );
        assert_eq!(labels(0.119_234_5, 0.119_234_9).0.len(), 5);
        assert_eq!(labels(1_000.000_000_1, 1_000.000_000_4).1, "× 10⁻⁹ + 1000.000\u{202f}000\u{202f}0");
    }

    #[test]
    fn ranges_are_never_empty() {
        for values in
            [vec![], vec![0.0], vec![5.0], vec![-1e300, 1e300], vec![f64::MAX, f64::MIN], vec![1.0, 1.0 + 1e-15]]
        {
            let (low, high) = padded(values, 0.05);
            assert!(low < high);
            assert!(!number_ticks((low, high), 5.0, '.').list.is_empty());
        }
    }

    #[test]
    fn logarithmic_scales_bear_decades_and_their_parts() {
        let labels = |low: f64, high: f64| {
            let ticks = scale_ticks(Axis::Logarithm, (low, high), 6.0, '.');
            (ticks.list.into_iter().map(|tick| tick.label).collect::<Vec<_>>().join(" "), ticks.note)
        };
        assert_eq!(labels(-0.1, 2.1), ("1 2 5 10 20 50 100".into(), String::new()));
        assert_eq!(labels(-7.2, -5.9), ("0.1 0.2 0.5 1".into(), "× 10⁻⁶".into()));
        assert_eq!(labels(-9.0, -1.0).0, "10⁻⁹ 10⁻⁷ 10⁻⁵ 10⁻³ 10⁻¹");
        assert_eq!(labels(1.51, 1.92).0, "40 50 60 70 80");
        let ticks = scale_ticks(Axis::Logarithm, (0.0, 2.0), 6.0, '.');
        assert!((ticks.list[1].at - std::f64::consts::LOG10_2).abs() < 1e-15);
    }

    #[test]
    fn what_is_not_above_zero_has_no_place_on_a_logarithmic_scale() {
        let points = vec![(1.0, 100.0, Some(1.0)), (10.0, 0.0, None), (-1.0, 10.0, None)];
        let series = vec![Series { points, ..Series::default() }];
        let chart = Chart { x_axis: Axis::Logarithm, y_axis: Axis::Logarithm, series, ..Chart::default() };
        let points = in_decades(&chart).series[0].points.clone();
        assert_eq!(points[0], (0.0, 2.0, None));
        assert!(points[1].1.is_nan() && points[2].0.is_nan());
    }

    #[test]
    fn times_are_round() {
        let start = 2_246_521_200.0;
        let ticks = time_ticks((start + 100.0, start + 7000.0), 100.0);
        assert!(ticks.list.iter().all(|tick| tick.at % 900.0 == 0.0));
        assert!(ticks.list.len() > 3);
        assert_eq!(ticks.note.len(), 10);
    }
}
