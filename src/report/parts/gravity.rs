//! What a report shows of gravity: the effects of a run with sign and uncertainty, a station's determinations, charts.

use crate::block::Engine;
use crate::block::ambient::clock;
use crate::block::gravity_at_mass::GravityUse;
use crate::block::gravity_reference::day;
use crate::block::gravity_station::{GravityStation, Station};
use crate::graph::{NodeId, sensitivities, standard_uncertainty};
use crate::quantity::{Marker, Unit};
use crate::record::Text;
use crate::report::Markup;
use crate::report::chart::{Axis, Chart, Series, Style, figure};
use crate::report::figures::{Figure, fixed};
use crate::report::table::{Cell, Table, head};

/// Nanometres per second squared in a metre per second squared.
const NANO: f64 = 1e9;

/// The table that suits a block: effects of a run, or the determinations and runs of a station.
pub fn gravity_table(engine: &Engine, name: &str) -> Option<Markup> {
    match engine.found::<GravityUse>(name) {
        Some(run) => effects_table(engine, name, &run),
        None => station_tables(engine, name),
    }
}

/// A number with its sign, also when it is positive.
fn signed(engine: &Engine, value: f64, decimals: i32) -> Cell {
    let text = fixed(engine.laboratory.style, value, decimals);
    if value > 0.0 { format!("+{text}") } else { text }.into()
}

fn uncertainty(engine: &Engine, id: NodeId) -> f64 {
    let graph = engine.graph();
    standard_uncertainty(&graph, &sensitivities(&graph, id))
}

/// A word with a capital letter.
fn capital(text: &str) -> String {
    let mut letters = text.chars();
    letters.next().map_or_else(String::new, |first| first.to_uppercase().chain(letters).collect())
}

/// Each effect with its sign, its uncertainty and its part of a mass; gravity at the mark and at the mass.
fn effects_table(engine: &Engine, name: &str, run: &GravityUse) -> Option<Markup> {
    let style = engine.laboratory.style;
    let gravity = engine.graph().number(run.mean);
    let caption = format!(
        "{name}: gravity from the mark of {} to the centre of mass, effects averaged from {} to {}; an effect is positive where the mass weighs more",
        run.station,
        clock(run.times.iter().copied().fold(f64::INFINITY, f64::min)),
        clock(run.times.iter().copied().fold(f64::NEG_INFINITY, f64::max)),
    );
    let relative = |value: f64| value / gravity * NANO;
    let mut parts_of_mass = Markup::new();
    parts_of_mass.push(&crate::report::table::symbol("u")).push_text("/").push(&crate::report::table::symbol("g"));
    parts_of_mass.push_text(" × 10⁹");
    let header =
        vec!["Effect".into(), "".into(), head("E", "nm s⁻²"), head("u", "nm s⁻²"), Cell::Markup(parts_of_mass)];
    let mut table = Table::new(caption, header);
    table.columns = vec!["1fr", "auto", "auto", "auto", "auto"];
    table.align = vec!["left", "left", "right", "right", "right"];
    for effect in &run.effects {
        let (value, u) = (engine.graph().number(effect.mean), uncertainty(engine, effect.mean));
        let symbol = engine.graph().node(effect.mean).name.clone()?.symbol;
        table.rows.push(vec![
            capital(effect.label).into(),
            Cell::Markup(crate::report::table::symbol(&symbol)),
            signed(engine, value * NANO, 2),
            fixed(style, u * NANO, 2).into(),
            fixed(style, relative(u), 2).into(),
        ]);
    }
    for (words, symbol, id) in
        [("gravity at the mark", "g_0", run.reference), ("gravity at the centre of mass, mean", "g", run.mean)]
    {
        let u = uncertainty(engine, id);
        table.closing.push(vec![
            format!("{}: {}", capital(words), Figure::of(engine, id)?.standard()).into(),
            Cell::Markup(crate::report::table::symbol(symbol)),
            "".into(),
            fixed(style, u * NANO, 2).into(),
            fixed(style, relative(u), 2).into(),
        ]);
    }
    let mut made = table.markup();
    made.push_code("#note[").push_text(&run_note(engine, run)?).push_code("]\n\n");
    Some(made)
}

/// Heights, gradient and conventions behind a run.
fn run_note(engine: &Engine, run: &GravityUse) -> Option<String> {
    let station = engine.found::<Station>(&run.station)?;
    let gradient =
        Figure::of(engine, station.profile.gradient).or_else(|| named(engine, &run.station, "profile.gradient"))?;
    let height = Figure::of(engine, run.height);
    let height = height.map_or_else(String::new, |height| {
        format!("Height of the centre of mass above the mark: {}. ", height.standard())
    });
    let unstated: Vec<&str> =
        ["tie", "self_attraction", "tide", "ocean_loading", "air_pressure", "polar_motion", "hydrology"]
            .into_iter()
            .filter(|name| run.effects.iter().all(|effect| effect.name != *name))
            .collect();
    let unstated = match unstated.as_slice() {
        [] => String::new(),
        names => format!(" Not stated and taken as zero: {}.", names.join(", ").replace('_', " ")),
    };
    Some(format!("{height}Gradient: {}. Permanent tide: {}.{unstated}", gradient.standard(), station.system.word()))
}

fn named(engine: &Engine, station: &str, path: &str) -> Option<Figure> {
    let id = engine.graph().find(&format!("{station}.{path}"))?;
    Figure::of(engine, id)
}

/// The determinations of a station, referred to the mark, and the runs that used it.
fn station_tables(engine: &Engine, name: &str) -> Option<Markup> {
    let station = station_of(engine, name)?;
    let fields = station.block.fields();
    let mark = fields.words("mark");
    let mark = if mark.is_empty() { mark } else { format!(" ({mark})") };
    let caption = format!("{name}: absolute determinations of gravity, and their values at the mark{mark}");
    let header = vec![
        "Day".into(),
        "Gravimeter".into(),
        "Certificate".into(),
        "Reported value".into(),
        "Height".into(),
        "Permanent tide".into(),
        "At the mark".into(),
    ];
    let mut table = Table::new(caption, header);
    table.columns = vec!["auto", "1fr", "auto", "auto", "auto", "auto", "auto"];
    let figure = |path: String| engine.graph().find(&path).and_then(|id| Figure::of(engine, id));
    let shown = |path: String| figure(path).map_or_else(String::new, |figure| figure.standard());
    for (index, determination) in fields.mappings("determinations").into_iter().enumerate() {
        let own = format!("{name}.determination_{}", index + 1);
        let effective = determination.get("effective_height").is_some();
        let height = if effective { "effective_height" } else { "height" };
        table.rows.push(vec![
            determination.words("date").into(),
            determination.words("gravimeter").into(),
            determination.words("certificate").into(),
            shown(format!("{own}.value")).into(),
            crate::report::prose_text::dress(&determination.words(height), engine.laboratory.style).into(),
            treatment(determination).into(),
            shown(format!("{own}.at_mark")).into(),
        ]);
    }
    let reference = fields.date("reference_date").map(|date| date.to_string());
    let reference = reference.or_else(|| station.station.determinations.last().map(|last| day(last.time)))?;
    let mut closing: Vec<Cell> = vec![reference.into(), "value at the mark".into()];
    closing.extend(std::iter::repeat_n("".into(), 4));
    closing.push(shown(format!("{name}.gravity")).into());
    table.closing.push(closing);
    let mut made = table.markup();
    made.push_code("#note[").push_text(&station_note(engine, name, &station)).push_code("]\n\n");
    if let Some(runs) = runs_table(engine, name) {
        made.push(&runs);
    }
    Some(made)
}

fn treatment(determination: crate::block::Fields<'_>) -> String {
    let factor = determination.words("permanent_tide_factor");
    let word = determination.words("permanent_tide");
    if factor.is_empty() { word } else { format!("{word}, {factor}") }
}

fn station_note(engine: &Engine, name: &str, station: &GravityStation<'_>) -> String {
    let fields = station.block.fields();
    let mut text = format!("Place: {}, {}", fields.words("latitude"), fields.words("longitude"));
    for (field, words) in
        [("height_above_sea_level", "above sea level"), ("height_above_ellipsoid", "above the ellipsoid")]
    {
        if fields.get(field).is_some() {
            text.push_str(&format!(
                ", {} {words}",
                crate::report::prose_text::dress(&fields.words(field), engine.laboratory.style)
            ));
        }
    }
    text.push('.');
    for (path, words) in
        [("profile.gradient", "Gradient"), ("profile.second_coefficient", "Coefficient of the height squared")]
    {
        if let Some(figure) = named(engine, name, path) {
            text.push_str(&format!(" {words}: {}.", figure.standard()));
        }
    }
    let graph = engine.graph();
    let sweep = |path: &str| graph.find(&format!("{name}.{path}")).map(|id| sensitivities(&graph, id));
    if let (Some(first), Some(second)) = (sweep("profile.gradient"), sweep("profile.second_coefficient")) {
        let r = crate::graph::correlation(&graph, &first, &second);
        text.push_str(&format!(" Correlation of the two: {}.", fixed(engine.laboratory.style, r, 3)));
    }
    text
}

/// The runs that took gravity from a station, with their spans and effects of tide and air.
fn runs_table(engine: &Engine, name: &str) -> Option<Markup> {
    let runs = runs_of(engine, name);
    if runs.is_empty() {
        return None;
    }
    let header = vec![
        "Run".into(),
        "From".into(),
        "To".into(),
        head("E_tide", "nm s⁻²"),
        head("E_air", "nm s⁻²"),
        head("g", "m s⁻²"),
    ];
    let mut table = Table::new(format!("{name}: gravity at the centre of mass in each run"), header);
    table.columns = vec!["1fr", "auto", "auto", "auto", "auto", "auto"];
    table.align = vec!["left", "left", "left", "right", "right", "left"];
    for (run, found) in runs {
        let effect = |name: &str| {
            let effect = found.effects.iter().find(|effect| effect.name == name);
            effect.map_or("—".into(), |effect| signed(engine, engine.graph().number(effect.mean) * NANO, 1))
        };
        table.rows.push(vec![
            run.into(),
            clock(found.times.first().copied()?).into(),
            clock(found.times.last().copied()?).into(),
            effect("tide"),
            effect("air_pressure"),
            Figure::of(engine, found.mean)?.standard().into(),
        ]);
    }
    Some(table.markup())
}

type Runs = Vec<(String, std::rc::Rc<GravityUse>)>;

/// The runs of a station in order of their beginning.
fn runs_of(engine: &Engine, name: &str) -> Runs {
    let all = engine.blocks().keys().filter_map(|run| Some((run.clone(), engine.found::<GravityUse>(run)?)));
    let mut runs: Runs = all.filter(|(_, found)| found.station == name).collect();
    let start = |run: &(String, std::rc::Rc<GravityUse>)| run.1.times.first().copied().unwrap_or(f64::NAN);
    runs.sort_by(|a, b| start(a).total_cmp(&start(b)));
    runs
}

fn station_of<'e>(engine: &'e Engine<'_>, name: &str) -> Option<GravityStation<'e>> {
    let engine: &'e Engine<'e> = engine;
    let block = engine.blocks().get(name)?;
    GravityStation::find(engine, &Text { text: name.into(), place: block.raw.name.place })
}

fn marker(engine: &Engine) -> char {
    if engine.laboratory.style.marker == Marker::Comma { ',' } else { '.' }
}

/// The charts that suit a block: tide and gravity over a run; over all runs, and the map of the room, of a station.
pub fn gravity_charts(engine: &Engine, name: &str) -> Option<Markup> {
    if let Some(run) = engine.found::<GravityUse>(name) {
        return Some(beside(engine, name, &[(name.to_string(), run)]));
    }
    let runs = runs_of(engine, name);
    let mut made = if runs.is_empty() { Markup::new() } else { beside(engine, name, &runs) };
    if let Some(map) = room_map(engine, name) {
        made.push(&map);
    }
    (!made.is_empty()).then_some(made)
}

/// Tide and gravity beside each other.
fn beside(engine: &Engine, name: &str, runs: &[(String, std::rc::Rc<GravityUse>)]) -> Markup {
    let mut made = Markup::code("#grid(columns: (1fr, 1fr), column-gutter: 6mm, ");
    for chart in [tide_chart(engine, name, runs), gravity_chart(engine, name, runs)] {
        made.push_content(&figure(&chart, 76.0, 48.0)).push_code(", ");
    }
    made.push_code(");\n\n");
    made
}

fn rows(engine: &Engine, id: NodeId, times: &[f64], shown: impl Fn(f64) -> f64) -> Vec<(f64, f64, Option<f64>)> {
    let graph = engine.graph();
    let value = graph.value(id);
    times.iter().enumerate().map(|(row, time)| (*time, shown(value.at(row)), None)).collect()
}

/// The effects that change in time: of one run a line each, of several runs the tide alone.
fn tide_chart(engine: &Engine, name: &str, runs: &[(String, std::rc::Rc<GravityUse>)]) -> Chart {
    let mut series = Vec::new();
    for (run, found) in runs {
        let changing = found.effects.iter().filter(|effect| engine.graph().value(effect.added).length().is_some());
        for effect in changing.filter(|effect| runs.len() == 1 || effect.name == "tide") {
            let label = if runs.len() == 1 { effect.label.to_string() } else { run.clone() };
            let points = rows(engine, effect.added, &found.times, |value| value * NANO);
            series.push(Series { name: label, points, style: Style::Line });
        }
    }
    Chart {
        title: format!("{name}: effects on gravity that change in time"),
        x_label: "time (UTC)".into(),
        y_label: "_E_/(nm s⁻²)".into(),
        x_axis: Axis::Time,
        series,
        decimal_marker: marker(engine),
        ..Chart::default()
    }
}

/// Gravity at the centre of mass, as its departure from the first run's mean.
fn gravity_chart(engine: &Engine, name: &str, runs: &[(String, std::rc::Rc<GravityUse>)]) -> Chart {
    let first = runs.first().map_or(f64::NAN, |(_, found)| engine.graph().number(found.mean));
    let series = runs.iter().map(|(run, found)| Series {
        name: if runs.len() == 1 { String::new() } else { run.clone() },
        points: rows(engine, found.gravity, &found.times, |value| (value - first) * NANO),
        style: Style::Line,
    });
    let about = crate::report::figures::fixed(engine.laboratory.style, first, 8);
    Chart {
        title: format!("{name}: gravity at the centre of mass, less {about} m s⁻²"),
        x_label: "time (UTC)".into(),
        y_label: "(_g_ − mean)/(nm s⁻²)".into(),
        x_axis: Axis::Time,
        series: series.collect(),
        decimal_marker: marker(engine),
        ..Chart::default()
    }
}

/// Classes of the map: few enough to be told apart by their marks.
const CLASSES: usize = 5;

/// The differences of gravity over the room, in classes of equal width told apart by their marks.
fn room_map(engine: &Engine, name: &str) -> Option<Markup> {
    let map = engine.blocks().get(name)?.fields().mapping("room_map")?;
    let unit = Unit::parse("nm/s2").ok()?;
    let mut points = Vec::new();
    for point in map.mappings("points") {
        let number = |field: &str, kind| match point.given(field, kind)? {
            crate::block::given::Given::Stated { value, .. } => Some(value.value),
            crate::block::given::Given::Reference(path) => Some(engine.result(&path)?.number()),
        };
        let length = crate::quantity::Kind::Length;
        let difference = number("difference", crate::quantity::Kind::Plain)?;
        points.push((number("x", length)?, number("y", length)?, unit.difference_from_si(difference)));
    }
    let lowest = points.iter().map(|point| point.2).fold(f64::INFINITY, f64::min);
    let highest = points.iter().map(|point| point.2).fold(f64::NEG_INFINITY, f64::max);
    let width = ((highest - lowest) / CLASSES as f64).max(f64::MIN_POSITIVE);
    let class = |value: f64| (((value - lowest) / width).floor() as usize).min(CLASSES - 1);
    let style = engine.laboratory.style;
    let series = (0..CLASSES).map(|number| {
        let from = lowest + width * number as f64;
        let inside = points.iter().filter(|point| class(point.2) == number);
        Series {
            name: format!("{} to {}", fixed(style, from, 0), fixed(style, from + width, 0)),
            points: inside.map(|point| (point.0, point.1, None)).collect(),
            style: Style::Points,
        }
    });
    let at = match map.get("height").is_some() {
        true => format!(" at {} above it", crate::report::prose_text::dress(&map.words("height"), style)),
        false => String::new(),
    };
    let chart = Chart {
        title: format!("{name}: gravity over the room less that at the mark{at}, in nm s⁻²"),
        x_label: "_x_/m".into(),
        y_label: "_y_/m".into(),
        series: series.filter(|series| !series.points.is_empty()).collect(),
        decimal_marker: marker(engine),
        ..Chart::default()
    };
    Some(figure(&chart, 110.0, 80.0))
}
