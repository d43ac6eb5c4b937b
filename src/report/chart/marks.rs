//! Points, lines, steps and error bars: one curve a series, however many points it has.

use super::{Frame, Series, Style, mm};

/// A line through more points than the eye can part keeps its extremes in columns of this width.
const COLUMN_MM: f64 = 0.15;
/// From this many points on a series is drawn by its extremes.
const MANY: usize = 3000;
const RADIUS: f64 = 0.85;

/// A series as Typst code, empty when it has no points.
pub fn series(series: &Series, index: usize, frame: &Frame) -> String {
    let points: Vec<(f64, f64)> = series.points.iter().map(|(x, y, _)| (frame.x_mm(*x), frame.y_mm(*y))).collect();
    if points.is_empty() {
        return String::new();
    }
    let points = if points.len() > MANY { extremes(&points) } else { points };
    let bars = bars(series, frame);
    let drawn = match series.style {
        Style::Points => {
            let marks: String = points.iter().map(|point| mark(index, *point)).collect();
            format!("curve(fill: {}, stroke: 0.6pt + black, {marks})", fill(index))
        }
        Style::Line => line(&points, index),
        Style::Limits => limits(&points),
        Style::Steps => {
            let corners = points.windows(2).filter_map(|pair| Some((pair.get(1)?.0, pair.first()?.1)));
            let mut path: Vec<(f64, f64)> =
                points.iter().zip(corners).flat_map(|(point, corner)| [*point, corner]).collect();
            path.extend(points.last());
            line(&path, index)
        }
    };
    format!("{bars}place(top + left, {drawn})")
}

/// What the legend shows for a series, in a box six millimetres wide around the height zero.
pub fn sample(style: Style, index: usize) -> String {
    match style {
        Style::Points => format!("curve(fill: {}, stroke: 0.6pt + black, {})", fill(index), mark(index, (3.0, 0.0))),
        Style::Limits => format!(
            "curve(stroke: 0.5pt + black, {})",
            stroke((1.5, 0.0), (4.5, 0.0)) + &stroke((1.5, -0.8), (1.5, 0.8)) + &stroke((4.5, -0.8), (4.5, 0.8))
        ),
        Style::Line | Style::Steps => line(&[(0.0, 0.0), (6.0, 0.0)], index),
    }
}

fn line(points: &[(f64, f64)], index: usize) -> String {
    let dash =
        ["solid", "dashed", "dotted", "dash-dotted", "densely-dashed"].get(index % 5).copied().unwrap_or("solid");
    let mut path = String::new();
    for (number, (x, y)) in points.iter().enumerate() {
        path.push_str(&format!("curve.{}(({}, {})), ", if number == 0 { "move" } else { "line" }, mm(*x), mm(*y)));
    }
    format!("curve(stroke: (paint: black, thickness: 0.7pt, dash: \"{dash}\", join: \"round\"), {path})")
}

fn fill(index: usize) -> &'static str {
    if index.is_multiple_of(2) { "black" } else { "white" }
}

/// The mark of a series around a point: disc, square, triangle, diamond, cross, upright cross.
fn mark(index: usize, (x, y): (f64, f64)) -> String {
    let r = RADIUS;
    match index % 6 {
        0 => disc(x, y, 0.8 * r),
        1 => closed(&[
            (x - 0.8 * r, y - 0.8 * r),
            (x + 0.8 * r, y - 0.8 * r),
            (x + 0.8 * r, y + 0.8 * r),
            (x - 0.8 * r, y + 0.8 * r),
        ]),
        2 => closed(&[(x, y - 1.1 * r), (x + r, y + 0.7 * r), (x - r, y + 0.7 * r)]),
        3 => closed(&[(x, y - 1.2 * r), (x + 1.1 * r, y), (x, y + 1.2 * r), (x - 1.1 * r, y)]),
        4 => {
            stroke((x - 0.8 * r, y - 0.8 * r), (x + 0.8 * r, y + 0.8 * r))
                + &stroke((x - 0.8 * r, y + 0.8 * r), (x + 0.8 * r, y - 0.8 * r))
        }
        _ => stroke((x - 1.1 * r, y), (x + 1.1 * r, y)) + &stroke((x, y - 1.1 * r), (x, y + 1.1 * r)),
    }
}

fn stroke(from: (f64, f64), to: (f64, f64)) -> String {
    format!("curve.move(({}, {})), curve.line(({}, {})), ", mm(from.0), mm(from.1), mm(to.0), mm(to.1))
}

fn closed(corners: &[(f64, f64)]) -> String {
    let mut path = String::new();
    for (number, (x, y)) in corners.iter().enumerate() {
        path.push_str(&format!("curve.{}(({}, {})), ", if number == 0 { "move" } else { "line" }, mm(*x), mm(*y)));
    }
    path + "curve.close(), "
}

/// A disc of four cubic arcs; the constant places their control points within 0.03 % of the circle.
fn disc(x: f64, y: f64, r: f64) -> String {
    let k = 0.552_284_75 * r;
    let point = |dx: f64, dy: f64| format!("({}, {})", mm(x + dx), mm(y + dy));
    let arc = |a: (f64, f64), b: (f64, f64), end: (f64, f64)| {
        format!("curve.cubic({}, {}, {}), ", point(a.0, a.1), point(b.0, b.1), point(end.0, end.1))
    };
    format!("curve.move({}), ", point(r, 0.0))
        + &arc((r, k), (k, r), (0.0, r))
        + &arc((-k, r), (-r, k), (-r, 0.0))
        + &arc((-r, -k), (-k, -r), (0.0, -r))
        + &arc((k, -r), (r, -k), (r, 0.0))
        + "curve.close(), "
}

/// Bars with short caps from the first to the second point of each pair.
fn limits(points: &[(f64, f64)]) -> String {
    let mut path = String::new();
    for pair in points.chunks_exact(2) {
        let (x, low, high) = (pair[0].0, pair[0].1, pair[1].1);
        path.push_str(&stroke((x, low), (x, high)));
        path.push_str(&stroke((x - 0.8, low), (x + 0.8, low)));
        path.push_str(&stroke((x - 0.8, high), (x + 0.8, high)));
    }
    format!("curve(stroke: 0.5pt + black, {path})")
}

/// Error bars with short caps.
fn bars(series: &Series, frame: &Frame) -> String {
    let mut path = String::new();
    for (x, y, bar) in series.points.iter().take(MANY) {
        let Some(bar) = bar else { continue };
        let (x, low, high) = (frame.x_mm(*x), frame.y_mm(y - bar), frame.y_mm(y + bar));
        path.push_str(&stroke((x, low), (x, high)));
        path.push_str(&stroke((x - 0.8, low), (x + 0.8, low)));
        path.push_str(&stroke((x - 0.8, high), (x + 0.8, high)));
    }
    if path.is_empty() { path } else { format!("place(top + left, curve(stroke: 0.5pt + black, {path}))\n") }
}

/// First, highest, lowest and last point of every column; points must come in the order of their positions.
fn extremes(points: &[(f64, f64)]) -> Vec<(f64, f64)> {
    let column = |point: &(f64, f64)| libm::floor(point.0 / COLUMN_MM) as i64;
    let mut kept = Vec::new();
    for group in points.chunk_by(|a, b| column(a) == column(b)) {
        let by_height = |a: &(usize, &(f64, f64)), b: &(usize, &(f64, f64))| a.1.1.total_cmp(&b.1.1);
        let highest = group.iter().enumerate().min_by(by_height).map_or(0, |(index, _)| index);
        let lowest = group.iter().enumerate().max_by(by_height).map_or(0, |(index, _)| index);
        let mut chosen = [0, highest, lowest, group.len() - 1];
        chosen.sort_unstable();
        let mut last = usize::MAX;
        for index in chosen {
            if index != last {
                kept.extend(group.get(index));
                last = index;
            }
        }
    }
    kept
}
