//! Gravity stations: g at a mark from absolute determinations, and everything that carries it to a balance.

use super::engine::{Block, Engine};
use super::field::{Field, Shape, needed, optional};
use super::fields::Fields;
use super::given::Given;
use super::gravity_check::check;
use super::raw_data::epoch;
use super::{BlockKind, Output};
use crate::diagnostic::{Code, Problem};
use crate::graph::{Distribution, InputDraft, Name, NodeId, Origin, Quantity, Value};
use crate::intake::Place;
use crate::method::{gravity_transfer, unit};
use crate::quantity::Kind;
use crate::record::Text;
use chrono::NaiveDate;
use std::rc::Rc;

/// The treatments of the permanent tide.
pub const PERMANENT_TIDES: &[&str] = &["zero-tide", "mean-tide", "tide-free"];

const DETERMINATION_FIELDS: &[Field] = &[
    needed("value", Shape::AnyValue, "g with its uncertainty, corrected to the conventions of its report"),
    needed("date", Shape::Date, "the day the value holds for"),
    needed("height", Shape::Value(Kind::Height), "the height above the mark at which the value holds"),
    optional("effective_height", Shape::Value(Kind::Height), "the height at which the value depends on no gradient"),
    optional("gradient", Shape::AnyValue, "the gradient the report used between the two heights"),
    needed("permanent_tide", Shape::Choice(PERMANENT_TIDES), "how the report treats the permanent tide"),
    optional("permanent_tide_factor", Shape::Number, "the factor of a tide-free value"),
    optional("normal_pressure", Shape::Value(Kind::Pressure), "the normal pressure of the report"),
    optional("gravimeter", Shape::Text, "the gravimeter"),
    optional("certificate", Shape::Text, "the certificate or report"),
    optional("issued_by", Shape::Text, "who issued it"),
    optional("correlation", Shape::Number, "correlation coefficient with the determination listed before"),
];

const PROFILE_FIELDS: &[Field] = &[
    optional("gradient", Shape::AnyValue, "the change of g with height at the mark, upwards"),
    optional("second_coefficient", Shape::AnyValue, "the coefficient of the height squared"),
    optional("correlation", Shape::Number, "correlation coefficient of the two"),
    optional("source", Shape::Text, "where they come from"),
];

const TIE_FIELDS: &[Field] = &[
    needed("value", Shape::AnyValue, "g at the balance less g at the absolute site, at one height"),
    optional("source", Shape::Text, "where it comes from"),
];

const TIDE_FIELDS: &[Field] = &[
    needed("source", Shape::Choice(&["series"]), "a series in a file"),
    optional("data", Shape::Name, "the raw data with the column time"),
    optional("column", Shape::Text, "the column of the effect, tide unless written"),
    optional("scale", Shape::AnyValue, "a factor of the whole effect with its uncertainty"),
    optional("permanent_tide", Shape::Choice(PERMANENT_TIDES), "how the series treats the permanent tide"),
    optional("permanent_tide_factor", Shape::Number, "the factor of a tide-free series"),
];

const AIR_FIELDS: &[Field] = &[
    needed("admittance", Shape::AnyValue, "the change of g with pressure, with its uncertainty"),
    needed("normal_pressure", Shape::Value(Kind::Pressure), "the normal pressure"),
    optional(
        "data",
        Shape::Name,
        "the raw data with the columns time and pressure; else the weighing gives the pressure",
    ),
    optional("column", Shape::Text, "the column of the pressure, pressure unless written"),
];

const POLE_FIELDS: &[Field] = &[optional("effect", Shape::AnyValue, "the effect on g")];

/// A gravity station.
pub static KIND: BlockKind = BlockKind {
    name: "gravity-station",
    meaning: "gravity at a mark, and what carries it to the mass on a balance",
    fields: &[
        optional("label", Shape::Text, "what is printed for it"),
        needed("latitude", Shape::Text, "the geodetic latitude with its letter"),
        needed("longitude", Shape::Text, "the longitude with its letter"),
        optional("height_above_sea_level", Shape::Value(Kind::Height), "height of the mark above sea level"),
        optional("height_above_ellipsoid", Shape::Value(Kind::Height), "height of the mark above the ellipsoid"),
        optional("mark", Shape::Text, "the mark from which heights count"),
        needed("determinations", Shape::Mappings(DETERMINATION_FIELDS), "dated absolute values"),
        optional(
            "reference_date",
            Shape::Date,
            "the day for the printed value; the last determination's unless written",
        ),
        optional("change_since_determination", Shape::AnyValue, "change of g outside the determinations"),
        optional("change_between_determinations", Shape::AnyValue, "departure of g from the line between two"),
        optional("profile", Shape::Mapping(PROFILE_FIELDS), "the change of g with height"),
        optional("tie", Shape::Mapping(TIE_FIELDS), "the tie from the absolute site to the balance"),
        optional("self_attraction", Shape::AnyValue, "attraction of the balance on the artefact"),
        optional("tide", Shape::Mapping(TIDE_FIELDS), "the tide of the solid Earth"),
        optional("air_pressure", Shape::Mapping(AIR_FIELDS), "the effect of air pressure"),
        optional("polar_motion", Shape::Mapping(POLE_FIELDS), "the effect of polar motion"),
        optional("hydrology", Shape::AnyValue, "the effect of ground water against the determinations"),
    ],
    outputs: &[
        Output { path: "gravity", meaning: "gravity at the mark on the reference date, as reported", unit: "m s⁻²" },
        Output {
            path: "determination_1.at_mark, …",
            meaning: "each determination referred to the mark",
            unit: "m s⁻²",
        },
        Output {
            path: "profile.gradient", meaning: "change of gravity with height, upwards", unit: "nm s⁻² m⁻¹"
        },
        Output {
            path: "profile.second_coefficient", meaning: "coefficient of the height squared", unit: "nm s⁻² m⁻²"
        },
    ],
    check,
    build: |engine, block| {
        let _ = build(shorten(engine), block);
    },
};

/// A determination referred to the mark.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Determined {
    /// Noon of its day, seconds since 1970.
    pub time: f64,
    pub at_mark: NodeId,
}

/// What a station stores when it is built.
#[derive(Debug, Clone, PartialEq)]
pub struct Station {
    /// In order of time.
    pub determinations: Vec<Determined>,
    pub gradient: NodeId,
    pub second_coefficient: Option<NodeId>,
}

/// A gravity station ready for use.
#[derive(Clone)]
pub struct GravityStation<'e> {
    pub(super) engine: &'e Engine<'e>,
    pub block: &'e Block,
    pub station: Rc<Station>,
}

impl<'e> GravityStation<'e> {
    /// The gravity station with this name, built; complaints go to the engine.
    pub fn find(engine: &'e Engine<'e>, name: &Text) -> Option<Self> {
        let block = engine.block(name, &[KIND.name])?;
        engine.build(block.name(), name.place);
        let station = engine.found::<Station>(block.name())?;
        Some(Self { engine, block, station })
    }

    /// Gravity at the mark at a time (s since 1970): on the line between two determinations, or the nearest one with
    /// the stated change.
    pub(super) fn on_day(&self, time: f64) -> Option<Quantity<'e>> {
        let (engine, name) = (self.engine, self.block.name());
        let list = &self.station.determinations;
        let (first, last) = (list.first()?, list.last()?);
        if let Some(pair) = list.windows(2).find(|pair| pair[0].time <= time && time <= pair[1].time) {
            let part = (time - pair[0].time) / (pair[1].time - pair[0].time);
            let (before, after) = (engine.at(pair[0].at_mark), engine.at(pair[1].at_mark));
            let change = self.change(
                "change_between_determinations",
                "δ_b",
                "departure from the line between two determinations",
            );
            return Some(plus(before * (1.0 - part) + after * part, change));
        }
        let nearest = if time < first.time { first } else { last };
        let at_mark = engine.at(nearest.at_mark);
        let same_day = |determined: &Determined| (time - determined.time).abs() <= 43_200.0;
        if list.iter().any(same_day) {
            return Some(at_mark);
        }
        match self.change("change_since_determination", "δ_s", "change of gravity since the determination") {
            Some(change) => Some(at_mark + change),
            None => {
                let message = format!(
                    "Gravity is needed on {}, but {name} was determined on {}.",
                    day(time),
                    list.iter().map(|one| day(one.time)).collect::<Vec<_>>().join(" and ")
                );
                let problem = Problem::new(Code::ConditionsOutOfSpan, message).hint(
                    "Enter a determination on the other side of that day, or state how far g may have moved: `change_since_determination: 0.0(15) µGal`.",
                );
                engine.complain(problem, self.block.fields().place_of("determinations"));
                None
            }
        }
    }

    fn change(&self, field: &str, symbol: &str, label: &str) -> Option<Quantity<'e>> {
        stated(self.engine, self.block.fields(), field, &format!("{}.{field}", self.block.name()), symbol, label)
    }
}

/// A stated value or the result it refers to, under `path` as a name of its own.
pub(super) fn stated<'e>(
    engine: &'e Engine<'e>,
    fields: Fields<'_>,
    field: &str,
    path: &str,
    symbol: &str,
    label: &str,
) -> Option<Quantity<'e>> {
    let found = engine.given(&fields.given(field, Kind::Plain)?, path, symbol, label, Kind::Plain)?;
    let named = engine.graph().find(path).is_some();
    if named {
        return Some(found.as_kind(Kind::Plain));
    }
    let made = found.as_kind(Kind::Plain);
    let shown = engine.graph().node(found.id).name.clone().map_or_else(|| unit("1"), |name| name.unit);
    engine.builder.name(made.id, Name { path: path.into(), symbol: symbol.into(), label: label.into(), unit: shown });
    Some(made)
}

/// A height in m as a plain quantity.
pub(super) fn height<'e>(
    engine: &'e Engine<'e>,
    fields: Fields<'_>,
    field: &str,
    path: &str,
    label: &str,
) -> Option<Quantity<'e>> {
    let found = engine.given(&fields.given(field, Kind::Height)?, path, "z", label, Kind::Height)?;
    Some(found.as_kind(Kind::Plain))
}

pub(super) fn plus<'e>(value: Quantity<'e>, change: Option<Quantity<'e>>) -> Quantity<'e> {
    change.map_or(value, |change| value + change)
}

/// The day of a time in s since 1970.
pub(super) fn day(time: f64) -> String {
    chrono::DateTime::from_timestamp(time as i64, 0).map_or_else(String::new, |at| at.date_naive().to_string())
}

/// Noon of a day, in s since 1970.
pub(super) fn noon(date: NaiveDate) -> f64 {
    (date - epoch().date_naive()).num_days() as f64 * 86_400.0 + 43_200.0
}

fn build<'e>(engine: &'e Engine<'e>, block: &'e Block) -> Option<()> {
    let (gradient, second) = profile(engine, block)?;
    let mut determinations = Vec::new();
    let mut inputs = Vec::new();
    for (index, fields) in block.fields().mappings("determinations").into_iter().enumerate() {
        let (value, at_mark) = determination(engine, block, fields, index + 1, gradient, second)?;
        determinations.push(Determined { time: noon(fields.date("date")?), at_mark: at_mark.id });
        inputs.push((value, fields.number("correlation")));
    }
    correlate_determinations(engine, block, &inputs)?;
    determinations.sort_by(|a, b| a.time.total_cmp(&b.time));
    let last = determinations.last()?.time;
    let station = Station { determinations, gradient: gradient.id, second_coefficient: second.map(|second| second.id) };
    engine.store(block.name(), station.clone());
    let station = GravityStation { engine, block, station: Rc::new(station) };
    let reference = block.fields().date("reference_date").map_or(last, noon);
    let gravity = station.on_day(reference)?;
    let _scope = engine.builder.scope(block.name(), Some(&gravity_transfer::METHOD.info));
    gravity.alias().result("gravity", "g_0", &format!("gravity at the mark of {}", block.label()), &unit("m/s2"));
    Some(())
}

/// Gradient and second coefficient: stated, or the gradient of free air where nobody measured one.
fn profile<'e>(engine: &'e Engine<'e>, block: &'e Block) -> Option<(Quantity<'e>, Option<Quantity<'e>>)> {
    let name = block.name();
    let Some(fields) = block.fields().mapping("profile") else {
        return Some((free_air(engine, block), None));
    };
    let path = |field: &str| format!("{name}.profile.{field}");
    let gradient = stated(engine, fields, "gradient", &path("gradient"), "γ_1", "change of gravity with height")?;
    let second = stated(
        engine,
        fields,
        "second_coefficient",
        &path("second_coefficient"),
        "γ_2",
        "coefficient of the height squared",
    );
    if let (Some(second), Some(r)) = (second, fields.number("correlation")) {
        correlate(
            engine,
            &path("correlation"),
            &[path("gradient"), path("second_coefficient")],
            r,
            fields.place_of("correlation"),
        )?;
        return Some((gradient, Some(second)));
    }
    Some((gradient, second))
}

/// The free-air gradient with the uncertainty that laboratories depart from it by.
fn free_air<'e>(engine: &'e Engine<'e>, block: &'e Block) -> Quantity<'e> {
    let name = block.name();
    let place = block.raw.name.place;
    engine.builder.assume(
        format!("{name}: the gradient of gravity was not measured; that of free air, −308.6 µGal/m, is used with a standard uncertainty of 30 µGal/m"),
        Some(place),
    );
    let problem = Problem::new(
        Code::GradientAssumed,
        format!(
            "{name} has no measured profile of gravity; the gradient of free air is used with a standard uncertainty of 30 µGal/m."
        ),
    );
    engine.complain(problem.hint("Measure g at several heights and write `profile:`."), place);
    let mut draft = InputDraft::new(
        &format!("{name}.profile.gradient"),
        "γ_1",
        "change of gravity with height, free air",
        Kind::Plain,
        unit("nm s-2 m-1"),
        Value::Scalar(-3.086e-6),
        Origin::Assumed("gradient of gravity not measured"),
    );
    draft.distribution = Distribution::Normal { standard_uncertainty: 3e-7 };
    engine.builder.input(draft)
}

/// One determination: its input, and its value referred to the mark.
fn determination<'e>(
    engine: &'e Engine<'e>,
    block: &'e Block,
    fields: Fields<'e>,
    number: usize,
    gradient: Quantity<'e>,
    second: Option<Quantity<'e>>,
) -> Option<(String, Quantity<'e>)> {
    let own = format!("{}.determination_{number}", block.name());
    let of = format!("of determination {number} of {}", block.label());
    let path = format!("{own}.value");
    let mut value = stated(engine, fields, "value", &path, &format!("g_{number}"), &format!("gravity {of}"))?;
    let mut z = height(engine, fields, "height", &format!("{own}.height"), &format!("height {of}"))?;
    if fields.get("effective_height").is_some() {
        let label = format!("effective height {of}");
        let effective = height(engine, fields, "effective_height", &format!("{own}.effective_height"), &label)?;
        let label = format!("gradient in the report {of}");
        let used = stated(engine, fields, "gradient", &format!("{own}.gradient"), "γ_r", &label)?;
        value = value + used * (effective - z);
        z = effective;
    }
    let zero = engine.builder.exact(Value::Scalar(0.0), z.dimension(), Kind::Plain);
    let at_mark = value + between(gradient, second, z, zero);
    let _scope = engine.builder.scope(&own, Some(&gravity_transfer::METHOD.info));
    let label = format!("gravity {of}, at the mark");
    Some((path, at_mark.alias().result("at_mark", &format!("g_0,{number}"), &label, &unit("m/s2"))))
}

/// Change of gravity from one height to another.
pub(super) fn between<'e>(
    gradient: Quantity<'e>,
    second: Option<Quantity<'e>>,
    from: Quantity<'e>,
    to: Quantity<'e>,
) -> Quantity<'e> {
    plus(gradient * (to - from), second.map(|second| second * (to.squared() - from.squared())))
}

/// States the correlation of each determination with the one listed before it.
fn correlate_determinations(engine: &Engine, block: &Block, inputs: &[(String, Option<f64>)]) -> Option<()> {
    let coefficients: Vec<f64> = inputs.iter().map(|(_, r)| r.unwrap_or(0.0)).collect();
    if coefficients.iter().skip(1).all(|r| *r == 0.0) {
        return Some(());
    }
    let cell = |i: usize, j: usize| match i.abs_diff(j) {
        0 => 1.0,
        1 => coefficients[i.max(j)],
        _ => 0.0,
    };
    let matrix = (0..inputs.len()).map(|i| (0..inputs.len()).map(|j| cell(i, j)).collect()).collect();
    let paths: Vec<String> = inputs.iter().map(|(path, _)| path.clone()).collect();
    join(engine, &format!("{}.correlation", block.name()), &paths, matrix, block.fields().place_of("determinations"))
}

fn correlate(engine: &Engine, path: &str, inputs: &[String], r: f64, place: Place) -> Option<()> {
    join(engine, path, inputs, vec![vec![1.0, r], vec![r, 1.0]], place)
}

fn join(engine: &Engine, path: &str, inputs: &[String], matrix: Vec<Vec<f64>>, place: Place) -> Option<()> {
    let nodes: Vec<NodeId> = inputs.iter().map(|input| engine.graph().find(input)).collect::<Option<_>>()?;
    engine.keep(engine.builder.correlate(path, &nodes, matrix), place)
}

/// A stated number in coherent SI units; nothing for a reference.
pub(super) fn stated_number(fields: Fields<'_>, field: &str, kind: Kind) -> Option<f64> {
    match fields.given(field, kind)? {
        Given::Stated { value, .. } => Some(value.value),
        Given::Reference(_) => None,
    }
}

fn shorten<'e>(engine: &'e Engine<'_>) -> &'e Engine<'e> {
    engine
}
