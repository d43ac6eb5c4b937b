//! Charts in the report's own faces, drawn from lines and text.
//!
//! Everything is told apart by shape and dashes, never by colour alone, so that a grey copy reads the same.

mod axis;
mod marks;
mod words;

use super::literal::{typst_string, typst_text};
use super::markup::Markup;
use axis::{Tick, Ticks};

pub use axis::superscript;
pub use words::alternative_text;

/// What runs along the horizontal axis.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default)]
pub enum Axis {
    #[default]
    Number,
    /// Seconds since 1970-01-01T00:00:00Z, shown in UTC.
    Time,
    /// A number on a logarithmic scale; what is not above zero is left out.
    Logarithm,
}

/// How the points of a series are shown.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default)]
pub enum Style {
    #[default]
    Points,
    Line,
    /// A line that keeps its height up to the next point.
    Steps,
    /// Bars from a lower to an upper end: the points come in pairs.
    Limits,
}

/// One run of points.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct Series {
    pub name: String,
    /// Position, value, half length of the error bar. Points that are not finite are left out.
    pub points: Vec<(f64, f64, Option<f64>)>,
    pub style: Style,
}

/// A level across the chart with its band.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct Mean {
    pub y: f64,
    pub half_width: Option<f64>,
    pub label: String,
}

/// A chart. In the labels of the axes a symbol between underscores is set in italics: `_m_/mg`.
#[derive(Debug, Clone, PartialEq)]
pub struct Chart {
    pub title: String,
    pub x_label: String,
    pub y_label: String,
    pub x_axis: Axis,
    /// A number or its logarithm.
    pub y_axis: Axis,
    pub series: Vec<Series>,
    pub lines: Vec<Mean>,
    /// Names of the positions 0, 1, 2, … where the horizontal axis counts things instead of measuring.
    pub x_ticks: Vec<String>,
    /// `.` or `,`.
    pub decimal_marker: char,
    /// What the chart shows, in a sentence for those who cannot see it.
    pub remark: String,
}

impl Default for Chart {
    fn default() -> Self {
        Self {
            title: String::new(),
            x_label: String::new(),
            y_label: String::new(),
            x_axis: Axis::Number,
            y_axis: Axis::Number,
            series: Vec::new(),
            lines: Vec::new(),
            x_ticks: Vec::new(),
            decimal_marker: '.',
            remark: String::new(),
        }
    }
}

/// The width of a character of a label, a little more than the widest digit.
const CHARACTER_MM: f64 = 1.4;
const LINE_MM: f64 = 3.6;

/// The area of a chart between its axes, in millimetres from the upper left corner, and the values at its borders.
#[derive(Debug, Clone, Copy)]
struct Frame {
    left: f64,
    top: f64,
    width: f64,
    height: f64,
    x: (f64, f64),
    y: (f64, f64),
}

impl Frame {
    fn x_mm(&self, x: f64) -> f64 {
        self.left + self.width * (x - self.x.0) / (self.x.1 - self.x.0)
    }

    fn y_mm(&self, y: f64) -> f64 {
        self.top + self.height * (self.y.1 - y) / (self.y.1 - self.y.0)
    }

    fn bottom(&self) -> f64 {
        self.top + self.height
    }
}

/// The chart as a numbered figure with its title as caption and its text for those who cannot see it.
pub fn figure(chart: &Chart, width_mm: f64, height_mm: f64) -> Markup {
    Markup::code(format!(
        "#figure-block({}, caption: {}, alt: {});",
        draw(chart, width_mm, height_mm),
        typst_string(&chart.title),
        typst_string(&alternative_text(chart))
    ))
}

/// The chart as a Typst expression, without a number sign before it.
pub fn draw(chart: &Chart, width_mm: f64, height_mm: f64) -> String {
    let chart = &axis::in_decades(chart);
    let series: Vec<Series> = chart.series.iter().map(finite).collect();
    let legend = legend_rows(chart, width_mm);
    let y_range = axis::padded(values(chart, &series), 0.06);
    let top = 1.5 + LINE_MM * legend.len() as f64 + 1.0;
    let height = (height_mm - top - 2.0 * LINE_MM - 3.5).max(10.0);
    let y_ticks = axis::scale_ticks(chart.y_axis, y_range, (height / 9.0).clamp(4.0, 8.0), chart.decimal_marker);
    let note_room = if y_ticks.note.is_empty() { 0.0 } else { LINE_MM };
    let left = LINE_MM + 2.5 + widest(&y_ticks.list) + 1.5;
    let width = (width_mm - left - 5.0).max(10.0);
    let x_range = x_range(chart, &series);
    let frame =
        Frame { left, top: top + note_room, width, height: (height - note_room).max(8.0), x: x_range, y: y_range };
    let x_ticks = x_ticks(chart, &frame);

    let mut parts = vec![bands(chart, &frame)];
    parts.push(ticks_drawn(&frame, &x_ticks, &y_ticks));
    parts.push(levels(chart, &frame));
    parts.extend(series.iter().enumerate().map(|(index, series)| marks::series(series, index, &frame)));
    parts.push(labels(chart, &frame, &x_ticks, &y_ticks, height_mm));
    parts.push(legend_drawn(&legend, &frame));
    format!(
        "box(width: {}, height: {}, {{\nset text(size: 7.5pt, number-width: \"tabular\"); set par(justify: false, leading: 0.4em)\n{}\n}})",
        mm(width_mm),
        mm(height_mm),
        parts.into_iter().filter(|part| !part.is_empty()).collect::<Vec<_>>().join("\n")
    )
}

fn finite(series: &Series) -> Series {
    let keep = |point: &&(f64, f64, Option<f64>)| point.0.is_finite() && point.1.is_finite();
    let tidy =
        |point: &(f64, f64, Option<f64>)| (point.0, point.1, point.2.filter(|bar| bar.is_finite() && *bar > 0.0));
    Series { points: series.points.iter().filter(keep).map(tidy).collect(), ..series.clone() }
}

/// All heights that must find room.
fn values(chart: &Chart, series: &[Series]) -> Vec<f64> {
    let mut values = Vec::new();
    for (_, y, bar) in series.iter().flat_map(|series| &series.points) {
        values.extend([y - bar.unwrap_or(0.0), y + bar.unwrap_or(0.0)]);
    }
    for line in chart.lines.iter().filter(|line| line.y.is_finite()) {
        let half = line.half_width.filter(|half| half.is_finite()).unwrap_or(0.0);
        values.extend([line.y - half, line.y + half]);
    }
    values
}

fn x_range(chart: &Chart, series: &[Series]) -> (f64, f64) {
    if !chart.x_ticks.is_empty() {
        return (-0.5, chart.x_ticks.len() as f64 - 0.5);
    }
    axis::padded(series.iter().flat_map(|series| &series.points).map(|point| point.0).collect(), 0.03)
}

fn x_ticks(chart: &Chart, frame: &Frame) -> Ticks {
    if !chart.x_ticks.is_empty() {
        return axis::named_ticks(&chart.x_ticks, frame.width);
    }
    match chart.x_axis {
        Axis::Time => axis::time_ticks(frame.x, frame.width),
        scale => axis::scale_ticks(scale, frame.x, (frame.width / 16.0).clamp(2.0, 10.0), chart.decimal_marker),
    }
}

/// A length in Typst; thousandths of a millimetre are enough and always printed the same.
fn mm(value: f64) -> String {
    let text = format!("{value:.3}");
    if text == "-0.000" { "0.000mm".into() } else { format!("{text}mm") }
}

fn text_width(text: &str) -> f64 {
    CHARACTER_MM * text.chars().count() as f64
}

fn widest(ticks: &[Tick]) -> f64 {
    ticks.iter().map(|tick| text_width(&tick.label)).fold(4.0, f64::max)
}

/// Text in a box placed with its upper left corner at a point.
fn placed(x: f64, y: f64, width: f64, align: &str, content: &str) -> String {
    format!(
        "place(top + left, dx: {}, dy: {}, box(width: {}, height: {}, align({align} + horizon)[{content}]))",
        mm(x),
        mm(y),
        mm(width),
        mm(LINE_MM)
    )
}

/// A label with its symbols, marked by underscores, in italics.
fn label(text: &str) -> String {
    let parts: Vec<&str> = text.split('_').collect();
    if parts.len().is_multiple_of(2) {
        return typst_text(text);
    }
    let set = |(index, part): (usize, &&str)| {
        if index % 2 == 1 { format!("#emph[{}];", typst_text(part)) } else { typst_text(part) }
    };
    parts.iter().enumerate().map(set).collect()
}

fn bands(chart: &Chart, frame: &Frame) -> String {
    let with_band = chart.lines.iter().filter(|line| line.y.is_finite());
    let bands = with_band.filter_map(|line| {
        let half = line.half_width.filter(|half| half.is_finite() && *half > 0.0)?;
        let top = frame.y_mm(line.y + half);
        Some(format!(
            "place(top + left, dx: {}, dy: {}, rect(width: {}, height: {}, fill: luma(228), stroke: none))",
            mm(frame.left),
            mm(top),
            mm(frame.width),
            mm(frame.y_mm(line.y - half) - top)
        ))
    });
    bands.collect::<Vec<_>>().join("\n")
}

/// The dashes of a level, by its number.
fn level_dash(index: usize) -> &'static str {
    ["\"solid\"", "\"dashed\"", "\"dotted\"", "\"dash-dotted\""].get(index % 4).copied().unwrap_or("\"solid\"")
}

fn levels(chart: &Chart, frame: &Frame) -> String {
    let lines = chart.lines.iter().enumerate().filter(|(_, line)| line.y.is_finite());
    let lines = lines.map(|(index, line)| {
        format!(
            "place(top + left, dx: {}, dy: {}, line(length: {}, stroke: (paint: luma(60), thickness: 0.7pt, dash: {})))",
            mm(frame.left),
            mm(frame.y_mm(line.y)),
            mm(frame.width),
            level_dash(index)
        )
    });
    lines.collect::<Vec<_>>().join("\n")
}

/// The frame, the ticks outside it and faint lines across it.
fn ticks_drawn(frame: &Frame, x_ticks: &Ticks, y_ticks: &Ticks) -> String {
    let (left, right, bottom) = (frame.left, frame.left + frame.width, frame.bottom());
    let stroke = |from: (f64, f64), to: (f64, f64)| {
        format!("curve.move(({}, {})), curve.line(({}, {})), ", mm(from.0), mm(from.1), mm(to.0), mm(to.1))
    };
    let (mut ticks, mut grid) = (String::new(), String::new());
    for tick in &y_ticks.list {
        let y = frame.y_mm(tick.at);
        ticks.push_str(&stroke((left - 1.2, y), (left, y)));
        grid.push_str(&stroke((left, y), (right, y)));
    }
    for tick in &x_ticks.list {
        let x = frame.x_mm(tick.at);
        ticks.push_str(&stroke((x, bottom), (x, bottom + 1.2)));
    }
    ticks.push_str(&stroke((left, frame.top), (left, bottom)));
    ticks.push_str(&stroke((left, bottom), (right, bottom)));
    let curve = |parts: &str, paint: &str| format!("place(top + left, curve(stroke: {paint}, {parts}))");
    let grid = if grid.is_empty() { grid } else { curve(&grid, "0.3pt + luma(215)") };
    format!("{grid}\n{}", curve(&ticks, "0.5pt + black"))
}

fn labels(chart: &Chart, frame: &Frame, x_ticks: &Ticks, y_ticks: &Ticks, height_mm: f64) -> String {
    let mut parts = Vec::new();
    let room = frame.left - LINE_MM - 2.5;
    for tick in &y_ticks.list {
        let y = frame.y_mm(tick.at) - LINE_MM / 2.0;
        parts.push(placed(LINE_MM + 1.0, y, room, "right", &typst_text(&tick.label)));
    }
    for tick in &x_ticks.list {
        let width = text_width(&tick.label) + 2.0;
        parts.push(placed(
            frame.x_mm(tick.at) - width / 2.0,
            frame.bottom() + 1.4,
            width,
            "center",
            &typst_text(&tick.label),
        ));
    }
    if !y_ticks.note.is_empty() {
        parts.push(placed(frame.left, frame.top - LINE_MM - 0.8, frame.width, "left", &typst_text(&y_ticks.note)));
    }
    let below = frame.bottom() + 1.6 + LINE_MM;
    let x_label = label(&chart.x_label)
        + &if x_ticks.note.is_empty() { String::new() } else { typst_text(&format!(", {}", x_ticks.note)) };
    parts.push(placed(frame.left, below.min(height_mm - LINE_MM), frame.width, "center", &x_label));
    parts.push(format!(
        "place(top + left, dx: 0mm, dy: {}, rotate(-90deg, reflow: true, box(width: {}, height: {}, align(center + horizon)[{}])))",
        mm(frame.top),
        mm(frame.height),
        mm(LINE_MM),
        label(&chart.y_label)
    ));
    parts.join("\n")
}

/// An entry of the legend: the sample as Typst code around (0, 0), its name, its width.
struct Entry {
    sample: String,
    name: String,
    width: f64,
}

/// The entries of the legend in rows; none when one unnamed series stands alone.
fn legend_rows(chart: &Chart, width_mm: f64) -> Vec<Vec<Entry>> {
    let series = chart
        .series
        .iter()
        .enumerate()
        .map(|(index, series)| (marks::sample(series.style, index), series.name.clone()));
    let lines = chart.lines.iter().enumerate().map(|(index, line)| {
        let sample = format!(
            "line(start: (0mm, 0mm), end: (6mm, 0mm), stroke: (paint: luma(60), thickness: 0.7pt, dash: {}))",
            level_dash(index)
        );
        (sample, line.label.clone())
    });
    let mut rows: Vec<Vec<Entry>> = Vec::new();
    let mut used = f64::INFINITY;
    for (sample, name) in series.chain(lines).filter(|(_, name)| !name.is_empty()) {
        let width = 8.0 + text_width(&name) + 3.0;
        if used + width > width_mm - 12.0 {
            rows.push(Vec::new());
            used = 0.0;
        }
        used += width;
        if let Some(row) = rows.last_mut() {
            row.push(Entry { sample, name, width });
        }
    }
    rows
}

fn legend_drawn(rows: &[Vec<Entry>], frame: &Frame) -> String {
    let mut parts = Vec::new();
    for (index, row) in rows.iter().enumerate() {
        let y = 0.5 + LINE_MM * index as f64;
        let mut x = frame.left;
        for entry in row {
            parts.push(format!("place(top + left, dx: {}, dy: {}, {})", mm(x), mm(y + LINE_MM / 2.0), entry.sample));
            parts.push(placed(x + 7.5, y, entry.width - 8.0, "left", &typst_text(&entry.name)));
            x += entry.width;
        }
    }
    parts.join("\n")
}
