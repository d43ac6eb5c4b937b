//! The effects that carry g from a mark to a mass: height, tie, attraction, tide, load, air pressure, pole, water.

use super::ambient::clock;
use super::fields::Fields;
use super::gravity_check::{fits, stated_number};
use super::gravity_station::{GravityStation, stated};
use super::raw_data::RawData;
use crate::diagnostic::{Code, Problem};
use crate::graph::{Distribution, InputDraft, Origin, Quantity, Value};
use crate::method::ocean_loading::{self, Constituent, Load, OceanLoading, Positive};
use crate::method::permanent_tide::permanent;
use crate::method::solid_earth_tide::{self, SolidEarthTide, body_model, check_times};
use crate::method::tidal_groups::WaveGroup;
use crate::method::{air_pressure_effect, gravity_range, polar_motion, unit};
use crate::numeric::interpolate::bracket;
use crate::quantity::{Dimension, Kind};
use crate::record::Text;

/// An effect as it is added to g.
pub(super) struct Found<'e> {
    pub name: &'static str,
    pub symbol: &'static str,
    pub label: &'static str,
    pub added: Quantity<'e>,
}

/// The samples for which the effects are wanted.
struct Samples<'e, 't> {
    height: Quantity<'e>,
    times: &'t [f64],
    pressure: Option<Quantity<'e>>,
    /// Whose samples they are.
    user: &'t str,
}

/// One kind of effect: field, symbol, words, and how it is had when the field is there.
struct Kindred {
    field: &'static str,
    symbol: &'static str,
    label: &'static str,
    make: for<'e, 't> fn(&GravityStation<'e>, &Samples<'e, 't>) -> Option<Quantity<'e>>,
}

/// Every effect but that of height, in the order of the sum.
const EFFECTS: &[Kindred] = &[
    Kindred {
        field: "tie",
        symbol: "Δ_tie",
        label: "tie to the balance",
        make: |station, _| {
            station.inner(
                station.block.fields().mapping("tie")?,
                "value",
                "tie",
                "Δ_tie",
                "tie from the absolute site to the balance",
            )
        },
    },
    Kindred {
        field: "self_attraction",
        symbol: "Δ_self",
        label: "attraction of the balance",
        make: |station, _| {
            station.inner(
                station.block.fields(),
                "self_attraction",
                "self_attraction",
                "Δ_self",
                "attraction of the balance",
            )
        },
    },
    Kindred { field: "tide", symbol: "E_tide", label: "tide of the solid Earth", make: tide },
    Kindred { field: "ocean_loading", symbol: "E_load", label: "load of the ocean tide", make: loading },
    Kindred { field: "air_pressure", symbol: "E_air", label: "air pressure", make: air_pressure },
    Kindred { field: "polar_motion", symbol: "E_pole", label: "polar motion", make: |station, _| pole(station) },
    Kindred {
        field: "hydrology",
        symbol: "E_water",
        label: "ground water",
        make: |station, _| {
            station.inner(station.block.fields(), "hydrology", "hydrology", "E_water", "effect of ground water")
        },
    },
];

/// Every effect that is stated; those that are not are assumptions.
pub(super) fn effects<'e>(
    station: &GravityStation<'e>,
    height: Quantity<'e>,
    times: &[f64],
    pressure: Option<Quantity<'e>>,
    user: &str,
) -> Option<Vec<Found<'e>>> {
    let samples = Samples { height: height.as_kind(Kind::Plain), times, pressure, user };
    let label = "height above the mark";
    let mut found = vec![Found { name: "height", symbol: "Δ_height", label, added: by_height(station, &samples) }];
    let fields = station.block.fields();
    for kindred in EFFECTS {
        if fields.get(kindred.field).is_none() {
            station.neglected(kindred);
            continue;
        }
        let added = (kindred.make)(station, &samples)?;
        found.push(Found { name: kindred.field, symbol: kindred.symbol, label: kindred.label, added });
    }
    Some(found)
}

impl<'e> GravityStation<'e> {
    fn inner(&self, fields: Fields<'_>, field: &str, path: &str, symbol: &str, label: &str) -> Option<Quantity<'e>> {
        stated(self.engine, fields, field, &format!("{}.{path}", self.block.name()), symbol, label)
    }

    /// Lists as an assumption what is not stated; for the tide with the permanent pull that is then left out.
    fn neglected(&self, kindred: &Kindred) {
        let (name, label) = (self.block.name(), kindred.label);
        let mut text = format!("{name}: no effect of {label} on gravity is stated; it is taken as zero");
        let lacking = self.station.system.factor() * permanent(&self.station.site) * 1e8;
        if kindred.field == "tide" && lacking != 0.0 {
            let word = self.station.system.word();
            text.push_str(&format!(
                ", though a {word} value lacks a permanent attraction of {lacking:.1} µGal, and the tide itself"
            ));
        }
        self.engine.builder.assume(text, Some(self.block.raw.name.place));
    }

    /// A column of raw data interpolated linearly to the samples; times outside its span are refused.
    fn series(&self, samples: &Samples<'e, '_>, series: &Series) -> Option<Quantity<'e>> {
        let engine = self.engine;
        let raw = RawData::find(engine, &series.data)?;
        let known = raw.times(engine)?;
        if let Some(row) = known.windows(2).position(|pair| pair[0] >= pair[1]) {
            let message = format!("The times of {} do not rise from row to row.", raw.name);
            let problem = Problem::new(Code::TimeUnreadable, message).hint("Put the rows in order of time.");
            engine.complain(problem, raw.line(engine, row + 1));
            return None;
        }
        let mut weights = Vec::with_capacity(samples.times.len());
        for time in samples.times {
            let Some((first, second, weight)) = bracket(&known, *time) else {
                engine.complain(outside(*time, &known, &raw.name, samples.user), series.data.place);
                return None;
            };
            weights.push(vec![(first as u32, 1.0 - weight), (second as u32, weight)]);
        }
        let (path, column) = (format!("{}.{}", self.block.name(), series.path), series.column.as_str());
        let found = raw.input(engine, column, &path, series.symbol, series.label, series.kind, Distribution::Exact)?;
        if !fits(found.dimension(), series.unit) {
            let message = format!("The column {column} of {} is not in a unit such as {}.", raw.name, series.unit);
            let problem = Problem::new(Code::DimensionMismatch, message);
            engine.complain(problem.hint("Correct its unit, or name another column."), series.data.place);
            return None;
        }
        Some(found.mix(weights).as_kind(Kind::Plain))
    }
}

/// Where a series is, and how it stands in the graph.
struct Series {
    data: Text,
    column: String,
    path: &'static str,
    symbol: &'static str,
    label: &'static str,
    kind: Kind,
    unit: &'static str,
}

fn outside(time: f64, known: &[f64], name: &str, user: &str) -> Problem {
    let (first, last) = (known.first().copied().unwrap_or(f64::NAN), known.last().copied().unwrap_or(f64::NAN));
    let message =
        format!("{user} needs a value at {}, but {name} runs from {} to {}.", clock(time), clock(first), clock(last));
    Problem::new(Code::ConditionsOutOfSpan, message)
        .hint("Take a series that encloses the whole run; it is not carried beyond its ends.")
}

/// From the mark up to the centre of mass, by the profile at the absolute site or, above the tie, by that at the balance.
fn by_height<'e>(station: &GravityStation<'e>, samples: &Samples<'e, '_>) -> Quantity<'e> {
    let engine = station.engine;
    let zero = engine.builder.exact(Value::Scalar(0.0), Dimension::LENGTH, Kind::Plain);
    let own = station.station.profile.handles(engine);
    match station.station.at_balance {
        None => own.step(zero, samples.height),
        Some((level, profile)) => {
            let level = engine.at(level).as_kind(Kind::Plain);
            own.step(zero, level) + profile.handles(engine).step(level, samples.height)
        }
    }
}

fn tide<'e>(station: &GravityStation<'e>, samples: &Samples<'e, '_>) -> Option<Quantity<'e>> {
    let fields = station.block.fields().mapping("tide")?;
    let scale = station.inner(fields, "scale", "tide.scale", "s_T", "factor of the tide");
    if fields.words("source") == "series" {
        let series = Series {
            data: fields.text("data")?,
            column: fields.text("column").map_or_else(|| "tide".to_string(), |text| text.text),
            path: "tide.series",
            symbol: "E_tide",
            label: "tide of the solid Earth, series",
            kind: Kind::Plain,
            unit: "nm/s2",
        };
        let effect = station.series(samples, &series)?;
        return Some(scale.map_or(effect, |scale| scale * effect));
    }
    let engine = station.engine;
    let checked = check_times(samples.times).map_err(|(_, problem)| problem);
    engine.keep(checked, fields.place_of("source"))?;
    let dut1 = stated_number(fields, "dut1", Kind::Duration).unwrap_or(0.0);
    let body = SolidEarthTide::new(station.station.site).with_dut1(dut1).in_system(station.station.system);
    let groups = wave_groups(fields)?;
    let body = engine.keep(body.with_groups(&groups), fields.place_of("wave_groups"))?;
    let scale = scale.unwrap_or_else(|| body_model(&engine.builder));
    Some(solid_earth_tide::effect_column(&engine.builder, &body, samples.times, scale))
}

fn wave_groups(fields: Fields<'_>) -> Option<Vec<WaveGroup>> {
    let read = |group: Fields<'_>| {
        Some(WaveGroup {
            from: group.number("from")?,
            to: group.number("to")?,
            factor: group.number("factor")?,
            phase_lead: stated_number(group, "phase_lead", Kind::Angle)?,
        })
    };
    fields.mappings("wave_groups").into_iter().map(read).collect()
}

fn loading<'e>(station: &GravityStation<'e>, samples: &Samples<'e, '_>) -> Option<Quantity<'e>> {
    let engine = station.engine;
    let fields = station.block.fields().mapping("ocean_loading")?;
    let mut loads = Vec::new();
    for entry in fields.get("constituents")?.as_map()? {
        let particulars = Fields { node: &entry.value };
        loads.push(Load {
            constituent: Constituent::of_name(&entry.key.text)?,
            amplitude: stated_number(particulars, "amplitude", Kind::Plain)?,
            phase_lag: stated_number(particulars, "phase", Kind::Angle)?,
        });
    }
    let positive = if fields.words("sign") == "up" { Positive::Up } else { Positive::Down };
    let dut1 = station.block.fields().mapping("tide").and_then(|tide| stated_number(tide, "dut1", Kind::Duration));
    let table = OceanLoading { loads, positive, dut1: dut1.unwrap_or(0.0) };
    let path = format!("{}.ocean_loading.scale", station.block.name());
    let scale = station.inner(fields, "scale", "ocean_loading.scale", "s_L", "factor of the ocean load");
    let scale = scale.unwrap_or_else(|| {
        let text = format!(
            "{}: the table of the ocean load is taken with a relative standard uncertainty of 5 %",
            station.block.name()
        );
        engine.builder.assume(text, Some(fields.place()));
        let origin = Origin::Assumed("uncertainty of the ocean load not stated");
        let label = "factor of the ocean load";
        let mut draft = InputDraft::new(&path, "s_L", label, Kind::Plain, unit("1"), Value::Scalar(1.0), origin);
        draft.distribution = Distribution::Normal { standard_uncertainty: 0.05 };
        engine.builder.input(draft)
    });
    Some(ocean_loading::effect_column(&engine.builder, &table, samples.times, scale))
}

fn air_pressure<'e>(station: &GravityStation<'e>, samples: &Samples<'e, '_>) -> Option<Quantity<'e>> {
    let (engine, name) = (station.engine, station.block.name());
    let fields = station.block.fields().mapping("air_pressure")?;
    let label = "change of gravity with air pressure";
    let admittance = station.inner(fields, "admittance", "air_pressure.admittance", "α", label)?;
    let normal = normal_pressure(station, fields)?;
    let pressure = match (fields.text("data"), samples.pressure) {
        (Some(data), _) => {
            let series = Series {
                data,
                column: fields.text("column").map_or_else(|| "pressure".to_string(), |text| text.text),
                path: "air_pressure.series",
                symbol: "p",
                label: "air pressure, series",
                kind: Kind::Pressure,
                unit: "hPa",
            };
            station.series(samples, &series)?
        }
        (None, Some(pressure)) => pressure.as_kind(Kind::Plain),
        (None, None) => {
            let message = format!("The air pressure during {} is not known to {name}.", samples.user);
            let hint =
                "Name a log of the pressure as `data:` with `column:`, or give the weighing a column of pressure.";
            engine.complain(Problem::new(Code::FieldMissing, message).hint(hint), fields.place());
            return None;
        }
    };
    for value in pressure.rows() {
        engine.keep(gravity_range::PRESSURE.check(value), fields.place())?;
    }
    Some(air_pressure_effect::effect(admittance, pressure, normal))
}

/// The normal pressure as stated, else that of the height above sea level.
fn normal_pressure<'e>(station: &GravityStation<'e>, fields: Fields<'_>) -> Option<Quantity<'e>> {
    let engine = station.engine;
    let path = format!("{}.air_pressure.normal_pressure", station.block.name());
    if let Some(given) = fields.given("normal_pressure", Kind::Pressure) {
        return Some(engine.given(&given, &path, "p_n", "normal pressure", Kind::Pressure)?.as_kind(Kind::Plain));
    }
    let value = air_pressure_effect::normal_pressure(station.station.above_sea_level);
    let source = "DIN 5450, at the height of the mark above sea level";
    Some(engine.builder.constant(&path, "p_n", "normal pressure", value, &unit("hPa"), Kind::Plain, source))
}

fn pole<'e>(station: &GravityStation<'e>) -> Option<Quantity<'e>> {
    let engine = station.engine;
    let fields = station.block.fields().mapping("polar_motion")?;
    if fields.get("effect").is_some() {
        return station.inner(fields, "effect", "polar_motion", "E_pole", "effect of polar motion");
    }
    let coordinate = |field: &str| {
        let path = format!("{}.polar_motion.{field}", station.block.name());
        engine.given(
            &fields.given(field, Kind::Angle)?,
            &path,
            field,
            &format!("coordinate {field} of the pole"),
            Kind::Angle,
        )
    };
    Some(polar_motion::effect(&engine.builder, &station.station.site, coordinate("x")?, coordinate("y")?))
}
