//! Gravity stations: g at a mark from absolute determinations, and everything that carries it to a balance.

use super::engine::{Block, Engine, shorten};
use super::field::{Field, Shape, needed, optional};
use super::fields::Fields;
use super::gravity_check::check;
use super::gravity_reference::{correlate_determinations, determination, profile};
use super::{BlockKind, Output};
use crate::graph::{Name, NodeId, Quantity};
use crate::method::gravity_epoch::Determination;
use crate::method::gravity_profile::Profile;
use crate::method::gravity_site::Site;
use crate::method::permanent_tide::PermanentSystem;
use crate::method::{gravity_transfer, unit};
use crate::quantity::{Axis, Kind, parse_coordinate};
use crate::record::Text;
use std::rc::Rc;

/// The treatments of the permanent tide.
const PERMANENT_TIDES: &[&str] = &["zero-tide", "mean-tide", "tide-free"];

/// What a gravimeter's own report answers for.
pub(super) const GRAVIMETER_CORRECTIONS: &[&str] = &["diffraction", "self-attraction", "speed of light"];

const DETERMINATION_FIELDS: &[Field] = &[
    needed("value", Shape::AnyValue, "g with its uncertainty, corrected to the conventions of its report"),
    needed("date", Shape::Date, "the day the value holds for, at noon"),
    needed("height", Shape::Value(Kind::Height), "the height above the mark at which the value holds"),
    optional("effective_height", Shape::Value(Kind::Height), "the height at which the value depends on no gradient"),
    optional("gradient", Shape::AnyValue, "the gradient the report used between the two heights"),
    needed("permanent_tide", Shape::Choice(PERMANENT_TIDES), "how the report treats the permanent tide"),
    optional("permanent_tide_factor", Shape::Number, "the factor of a tide-free value"),
    optional("normal_pressure", Shape::Value(Kind::Pressure), "the normal pressure of the report"),
    optional("gravimeter", Shape::Text, "the gravimeter"),
    optional("certificate", Shape::Text, "the certificate or report"),
    optional("issued_by", Shape::Text, "who issued it"),
    optional(
        "corrected_for",
        Shape::Texts,
        "what the report corrects for in its gravimeter: diffraction, self-attraction, speed of light",
    ),
    optional("correlation", Shape::Number, "correlation coefficient with the determination listed before"),
];

const HEIGHT_TIE_FIELDS: &[Field] = &[
    needed("from", Shape::Value(Kind::Height), "the height of the first reading above the mark"),
    needed("to", Shape::Value(Kind::Height), "the height of the second reading"),
    needed("difference", Shape::AnyValue, "g at the second height less g at the first, with its uncertainty"),
];

const PROFILE_FIELDS: &[Field] = &[
    optional("gradient", Shape::AnyValue, "the change of g with height at the mark, upwards"),
    optional("second_coefficient", Shape::AnyValue, "the coefficient of the height squared"),
    optional("correlation", Shape::Number, "correlation coefficient of the two"),
    optional("ties", Shape::Mappings(HEIGHT_TIE_FIELDS), "measured differences, instead of coefficients"),
    optional("degree", Shape::Number, "degree of the profile fitted to ties: 1 or 2"),
    optional(
        "scatter",
        Shape::Choice(&["stated", "from residuals"]),
        "where the uncertainty of fitted ties comes from",
    ),
    optional("balance", Shape::Choice(&["absent", "present"]), "whether the balance stood in its place at the time"),
    optional("source", Shape::Text, "where they come from"),
];

const TIE_FIELDS: &[Field] = &[
    needed("value", Shape::AnyValue, "g at the balance less g at the absolute site, at one height"),
    optional("height", Shape::Value(Kind::Height), "that height, where the balance stands on a profile of its own"),
    optional("profile", Shape::Mapping(PROFILE_FIELDS), "the profile at the balance"),
    optional("source", Shape::Text, "where it comes from"),
];

const GROUP_FIELDS: &[Field] = &[
    needed("from", Shape::Number, "first frequency in cycles per day"),
    needed("to", Shape::Number, "last frequency in cycles per day"),
    needed("factor", Shape::Number, "observed gravimetric factor"),
    needed("phase_lead", Shape::Value(Kind::Angle), "observed phase lead"),
];

const TIDE_FIELDS: &[Field] = &[
    needed("source", Shape::Choice(&["computed", "series"]), "computed from place and time, or a series in a file"),
    optional("data", Shape::Name, "the raw data of a series, with the column time"),
    optional("column", Shape::Text, "the column of the effect, tide unless written"),
    optional("scale", Shape::AnyValue, "a factor of the tide with its uncertainty"),
    optional("permanent_tide", Shape::Choice(PERMANENT_TIDES), "how a series treats the permanent tide"),
    optional("permanent_tide_factor", Shape::Number, "the factor of a tide-free series"),
    optional("dut1", Shape::Value(Kind::Duration), "UT1 − UTC for a computed tide, zero unless written"),
    optional("wave_groups", Shape::Mappings(GROUP_FIELDS), "observed groups of waves in place of the body model"),
];

const CONSTITUENT_FIELDS: &[Field] = &[
    needed("amplitude", Shape::AnyValue, "the amplitude"),
    needed("phase", Shape::Value(Kind::Angle), "the Greenwich phase lag"),
];

const LOADING_FIELDS: &[Field] = &[
    needed("sign", Shape::Choice(&["up", "down"]), "the direction in which the table counts gravity positive"),
    needed("constituents", Shape::Named(CONSTITUENT_FIELDS), "the table"),
    optional("scale", Shape::AnyValue, "1 with the relative uncertainty of the table, 5 % unless written"),
    optional("source", Shape::Text, "the model of the ocean, and who computed the load"),
];

const AIR_FIELDS: &[Field] = &[
    needed("admittance", Shape::AnyValue, "the change of g with pressure, with its uncertainty"),
    optional("normal_pressure", Shape::Value(Kind::Pressure), "the normal pressure; by DIN 5450 unless written"),
    optional("data", Shape::Name, "raw data with the columns time and pressure; else the weighing gives the pressure"),
    optional("column", Shape::Text, "the column of the pressure, pressure unless written"),
];

const POLE_FIELDS: &[Field] = &[
    optional("effect", Shape::AnyValue, "the effect on g"),
    optional("x", Shape::Value(Kind::Angle), "coordinate x of the pole, instead of the effect"),
    optional("y", Shape::Value(Kind::Angle), "coordinate y of the pole"),
];

const POINT_FIELDS: &[Field] = &[
    needed("x", Shape::Value(Kind::Length), "first coordinate in the room"),
    needed("y", Shape::Value(Kind::Length), "second coordinate in the room"),
    needed("difference", Shape::AnyValue, "g there less g at the mark"),
];

const MAP_FIELDS: &[Field] = &[
    needed("points", Shape::Mappings(POINT_FIELDS), "the points"),
    optional("height", Shape::Value(Kind::Height), "the height above the mark"),
    optional("source", Shape::Text, "when and how it was measured"),
];

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
        optional("ocean_loading", Shape::Mapping(LOADING_FIELDS), "the load of the ocean tide"),
        optional("air_pressure", Shape::Mapping(AIR_FIELDS), "the effect of air pressure"),
        optional("polar_motion", Shape::Mapping(POLE_FIELDS), "the effect of polar motion"),
        optional("hydrology", Shape::AnyValue, "the effect of ground water against the determinations"),
        optional("room_map", Shape::Mapping(MAP_FIELDS), "differences of g over the room, for the report"),
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

/// A profile by the numbers of its nodes.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct StoredProfile {
    pub gradient: NodeId,
    pub second_coefficient: Option<NodeId>,
}

impl StoredProfile {
    pub(super) fn of(profile: Profile<'_>) -> Self {
        Self { gradient: profile.gamma_1.id, second_coefficient: profile.gamma_2.map(|second| second.id) }
    }

    pub(super) fn handles<'e>(self, engine: &'e Engine<'e>) -> Profile<'e> {
        Profile { gamma_1: engine.at(self.gradient), gamma_2: self.second_coefficient.map(|id| engine.at(id)) }
    }
}

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
    /// Height above the ellipsoid, or above sea level where that alone is known.
    pub site: Site,
    /// Height of the mark above sea level, or above the ellipsoid where that alone is known, m.
    pub above_sea_level: f64,
    pub system: PermanentSystem,
    /// In order of time.
    pub determinations: Vec<Determined>,
    pub profile: StoredProfile,
    /// Height of the tie and the profile above it, where the balance stands on a profile of its own.
    pub at_balance: Option<(NodeId, StoredProfile)>,
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

    /// The determinations as the method takes them.
    pub(super) fn determinations(&self) -> Vec<Determination<'e>> {
        let handle = |one: &Determined| Determination { time: one.time, gravity: self.engine.at(one.at_mark) };
        self.station.determinations.iter().map(handle).collect()
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
    let made = found.as_kind(Kind::Plain);
    if engine.graph().find(path).is_none() {
        let shown = engine.graph().node(found.id).name.clone().map_or_else(|| unit("1"), |name| name.unit);
        let name = Name { path: path.into(), symbol: symbol.into(), label: label.into(), unit: shown };
        engine.builder.name(made.id, name);
    }
    Some(made)
}

/// A height above the mark as a plain quantity.
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

/// The site and the height above sea level; where one height is missing the other serves for both.
fn site(engine: &Engine, block: &Block) -> Option<(Site, f64)> {
    let fields = block.fields();
    let angle = |name: &str, axis: Axis| Some(parse_coordinate(&fields.text(name)?.text, axis).ok()?.radians);
    let height = |name: &str| super::gravity_check::stated_number(fields, name, Kind::Height);
    let (sea, ellipsoid) = (height("height_above_sea_level"), height("height_above_ellipsoid"));
    let above_ellipsoid = ellipsoid.or(sea)?;
    let made = Site::new(angle("latitude", Axis::Latitude)?, angle("longitude", Axis::Longitude)?, above_ellipsoid);
    let place = fields.place_of("height_above_sea_level");
    let text = match (sea, ellipsoid) {
        (Some(_), None) => Some("ellipsoid is not stated; that above sea level"),
        (None, Some(_)) => Some("sea level is not stated; that above the ellipsoid"),
        _ => None,
    };
    if let Some(text) = text {
        let text = format!("{}: the height of the mark above the {text} stands in", block.name());
        engine.builder.assume(text.replace("the sea", "sea"), Some(place));
    }
    Some((engine.keep(made, place)?, sea.or(ellipsoid)?))
}

/// The system of the first determination; the check has seen that the others agree.
fn system(fields: Fields<'_>) -> Option<PermanentSystem> {
    let first = fields.mappings("determinations").into_iter().next()?;
    Some(match first.words("permanent_tide").as_str() {
        "mean-tide" => PermanentSystem::MeanTide,
        "tide-free" => PermanentSystem::TideFree { factor: first.number("permanent_tide_factor")? },
        _ => PermanentSystem::ZeroTide,
    })
}

fn build<'e>(engine: &'e Engine<'e>, block: &'e Block) -> Option<()> {
    let (site, above_sea_level) = site(engine, block)?;
    let fields = block.fields();
    let profile = profile(engine, block, fields.mapping("profile"), &format!("{}.profile", block.name()))?;
    let mut determinations = Vec::new();
    let mut inputs = Vec::new();
    for (index, fields) in fields.mappings("determinations").into_iter().enumerate() {
        let (input, determined) = determination(engine, block, fields, index + 1, profile)?;
        determinations.push(determined);
        inputs.push((input, fields.number("correlation")));
    }
    correlate_determinations(engine, block, &inputs)?;
    assume_corrections(engine, block);
    determinations.sort_by(|a, b| a.time.total_cmp(&b.time));
    let last = determinations.last()?.time;
    let profile = StoredProfile::of(profile);
    let at_balance = match fields.mapping("tie").filter(|tie| tie.get("profile").is_some()) {
        Some(tie) => Some(profile_at_balance(engine, block, tie)?),
        None => None,
    };
    let system = system(fields)?;
    let station = Station { site, above_sea_level, system, determinations, profile, at_balance };
    engine.store(block.name(), station.clone());
    let station = GravityStation { engine, block, station: Rc::new(station) };
    super::gravity_reference::judge(&station)?;
    let reference = fields.date("reference_date").map_or(last, super::gravity_reference::noon);
    let gravity = station.on_day(reference)?;
    let _scope = engine.builder.scope(block.name(), Some(&gravity_transfer::METHOD.info));
    gravity.alias().result("gravity", "g_0", &format!("gravity at the mark of {}", block.label()), &unit("m/s2"));
    Some(())
}

/// Lists as an assumption what a report does not say of its gravimeter.
fn assume_corrections(engine: &Engine, block: &Block) {
    for (index, determination) in block.fields().mappings("determinations").into_iter().enumerate() {
        let said = determination.texts("corrected_for");
        let lacks = |what: &&&str| !said.iter().any(|text| text.text == **what);
        let missing: Vec<&str> = GRAVIMETER_CORRECTIONS.iter().filter(lacks).copied().collect();
        if !missing.is_empty() {
            let text = format!(
                "{}: determination {} is taken as corrected for {} of its gravimeter",
                block.name(),
                index + 1,
                missing.join(", ")
            );
            engine.builder.assume(text, Some(determination.place()));
        }
    }
}

/// The height of the tie, and the profile of the balance above it.
fn profile_at_balance<'e>(
    engine: &'e Engine<'e>,
    block: &'e Block,
    tie: Fields<'e>,
) -> Option<(NodeId, StoredProfile)> {
    let path = format!("{}.tie", block.name());
    let level = height(engine, tie, "height", &format!("{path}.height"), "height of the tie")?;
    let found = profile(engine, block, tie.mapping("profile"), &format!("{path}.profile"))?;
    Some((level.id, StoredProfile::of(found)))
}
