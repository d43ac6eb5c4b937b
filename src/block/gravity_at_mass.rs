//! From a gravity station to g at the centre of mass of an artefact, with one result for each effect.

use super::ambient::clock;
use super::gravity_station::{GravityStation, between, stated};
use super::raw_data::RawData;
use crate::diagnostic::{Code, Problem};
use crate::graph::{Distribution, Name, NodeId, Quantity, Value};
use crate::intake::Place;
use crate::method::{gravity_transfer, unit};
use crate::numeric::interpolate::bracket;
use crate::numeric::sum::mean;
use crate::quantity::{Dimension, Kind};

/// One effect on g over a run.
#[derive(Debug, Clone, PartialEq)]
pub struct Effect {
    /// The last part of its path, such as `tide`.
    pub name: &'static str,
    /// What it is, in words.
    pub label: &'static str,
    /// Its mean over the run.
    pub mean: NodeId,
    /// The effect as it was added: a number, or a column with a row for each sample.
    pub added: NodeId,
}

/// What a run took from a gravity station, for the report.
#[derive(Debug, Clone, PartialEq)]
pub struct GravityUse {
    pub station: String,
    /// Seconds since 1970, one for each sample.
    pub times: Vec<f64>,
    /// Gravity at the mark on the day.
    pub reference: NodeId,
    pub effects: Vec<Effect>,
    /// g at the centre of mass, a row for each sample.
    pub gravity: NodeId,
    pub mean: NodeId,
}

/// Effects as they gather.
struct Gathered<'e> {
    list: Vec<(&'static str, &'static str, &'static str, Quantity<'e>)>,
}

impl<'e> GravityStation<'e> {
    /// g at the centre of mass for each sample, as a column.
    ///
    /// `height` is that of the centre of mass above the mark; `times` are seconds since 1970, one for each sample;
    /// `pressure` is the air pressure at the samples in Pa, used where the station names no log of its own. Publishes
    /// under `prefix.gravity.` the mean of g and of each effect over the samples, and stores a [`GravityUse`] under
    /// `prefix`. What cannot be had is complained of at the station's own fields.
    pub fn at(
        &self,
        height: Quantity<'e>,
        times: &[f64],
        pressure: Option<Quantity<'e>>,
        prefix: &str,
    ) -> Option<Quantity<'e>> {
        let reference = self.on_day(mean(times)?)?;
        let effects = self.effects(height, times, pressure, prefix)?;
        let engine = self.engine;
        let _scope = engine.builder.scope("", Some(&gravity_transfer::METHOD.info));
        let added: Vec<Quantity<'e>> = effects.list.iter().map(|(.., effect)| *effect).collect();
        let rows = engine.builder.exact(Value::column(vec![0.0; times.len()]), Dimension::ACCELERATION, Kind::Plain);
        let gravity = gravity_transfer::at_mass(reference, &added) + rows;
        let path = |name: &str| format!("{prefix}.gravity.{name}");
        let publish = |quantity: Quantity<'e>, name: &str, symbol: &str, label: &str, unit_text: &str| {
            let made = quantity.alias();
            let name = Name { path: path(name), symbol: symbol.into(), label: label.into(), unit: unit(unit_text) };
            engine.builder.name(made.id, name);
            made
        };
        let label = format!("gravity at the mark of {} on the day of {prefix}", self.block.label());
        let reference = publish(reference, "reference", "g_0", &label, "m/s2");
        let effects = effects.list.into_iter().map(|(name, symbol, label, added)| {
            let column = engine.graph().value(added.id).length().is_some();
            let averaged = if column { added.mean() } else { added };
            let made = publish(averaged, name, symbol, &format!("{label} on gravity, {prefix}"), "nm/s2");
            Effect { name, label, mean: made.id, added: added.id }
        });
        let effects: Vec<Effect> = effects.collect();
        let label = format!("gravity at the centre of mass, mean over {prefix}");
        let mean = publish(gravity.mean(), "mean", "g", &label, "m/s2").id;
        let found = GravityUse {
            station: self.block.name().into(),
            times: times.to_vec(),
            reference: reference.id,
            effects,
            gravity: gravity.id,
            mean,
        };
        engine.store(prefix, found);
        Some(gravity)
    }

    fn effects(
        &self,
        height: Quantity<'e>,
        times: &[f64],
        pressure: Option<Quantity<'e>>,
        prefix: &str,
    ) -> Option<Gathered<'e>> {
        let mut gathered =
            Gathered { list: vec![("height", "Δ_height", "height above the mark", self.height(height))] };
        let fields = self.block.fields();
        let inner = |holder: &str, field: &str, path: &str, symbol: &str, label: &str| {
            let path = format!("{}.{path}", self.block.name());
            match holder {
                "" => stated(self.engine, fields, field, &path, symbol, label),
                holder => stated(self.engine, fields.mapping(holder)?, field, &path, symbol, label),
            }
        };
        let mut add = |present: bool, name, symbol, label: &'static str, made: Option<Quantity<'e>>| -> Option<()> {
            match (present, made) {
                (true, Some(effect)) => gathered.list.push((name, symbol, label, effect)),
                (true, None) => return None,
                (false, _) => self.neglected(label),
            }
            Some(())
        };
        let has = |name: &str| fields.get(name).is_some();
        let tie = inner("tie", "value", "tie", "Δ_tie", "tie from the absolute site to the balance");
        add(has("tie"), "tie", "Δ_tie", "tie to the balance", tie)?;
        let own = inner("", "self_attraction", "self_attraction", "Δ_self", "attraction of the balance");
        add(has("self_attraction"), "self_attraction", "Δ_self", "attraction of the balance", own)?;
        let tide = if has("tide") { self.tide(times, prefix) } else { None };
        add(has("tide"), "tide", "E_tide", "tide of the solid Earth", tide)?;
        let air = if has("air_pressure") { self.air_pressure(times, pressure, prefix) } else { None };
        add(has("air_pressure"), "air_pressure", "E_air", "air pressure", air)?;
        let pole = inner("polar_motion", "effect", "polar_motion", "E_pole", "effect of polar motion");
        add(has("polar_motion"), "polar_motion", "E_pole", "polar motion", pole)?;
        let water = inner("", "hydrology", "hydrology", "E_water", "effect of ground water");
        add(has("hydrology"), "hydrology", "E_water", "ground water", water)?;
        Some(gathered)
    }

    /// From the mark up to the centre of mass.
    fn height(&self, height: Quantity<'e>) -> Quantity<'e> {
        let z = height.as_kind(Kind::Plain);
        let zero = self.engine.builder.exact(Value::Scalar(0.0), Dimension::LENGTH, Kind::Plain);
        let second = self.station.second_coefficient.map(|id| self.engine.at(id));
        between(self.engine.at(self.station.gradient), second, zero, z)
    }

    fn neglected(&self, label: &str) {
        let text = format!("{}: no effect of {label} on gravity is stated; it is taken as zero", self.block.name());
        self.engine.builder.assume(text, Some(self.block.raw.name.place));
    }

    /// The tide at the samples, from the series.
    fn tide(&self, times: &[f64], prefix: &str) -> Option<Quantity<'e>> {
        let (engine, name) = (self.engine, self.block.name());
        let fields = self.block.fields().mapping("tide")?;
        let column = fields.text("column").map_or_else(|| "tide".to_string(), |text| text.text);
        let series = Series {
            path: format!("{name}.tide.series"),
            symbol: "E_tide",
            label: "tide of the solid Earth, series",
            kind: Kind::Plain,
            unit: "nm/s2",
            place: fields.place_of("data"),
        };
        let effect = self.series(&fields.text("data")?, &column, times, prefix, &series)?;
        let scale = stated(engine, fields, "scale", &format!("{name}.tide.scale"), "s_T", "factor of the tide");
        Some(scale.map_or(effect, |scale| scale * effect))
    }

    fn air_pressure(&self, times: &[f64], pressure: Option<Quantity<'e>>, prefix: &str) -> Option<Quantity<'e>> {
        let (engine, name) = (self.engine, self.block.name());
        let fields = self.block.fields().mapping("air_pressure")?;
        let path = format!("{name}.air_pressure.admittance");
        let admittance = stated(engine, fields, "admittance", &path, "α", "change of gravity with air pressure")?;
        let given = fields.given("normal_pressure", Kind::Pressure)?;
        let path = format!("{name}.air_pressure.normal_pressure");
        let normal = engine.given(&given, &path, "p_n", "normal pressure", Kind::Pressure)?.as_kind(Kind::Plain);
        let pressure = match (fields.text("data"), pressure) {
            (Some(data), _) => {
                let column = fields.text("column").map_or_else(|| "pressure".to_string(), |text| text.text);
                let series = Series {
                    path: format!("{name}.air_pressure.series"),
                    symbol: "p",
                    label: "air pressure, series",
                    kind: Kind::Pressure,
                    unit: "hPa",
                    place: fields.place_of("data"),
                };
                self.series(&data, &column, times, prefix, &series)?
            }
            (None, Some(pressure)) => pressure,
            (None, None) => {
                let message = format!("The air pressure during {prefix} is not known to {name}.");
                let problem = Problem::new(Code::FieldMissing, message);
                let hint =
                    "Name a log of the pressure as `data:` with `column:`, or give the weighing a column of pressure.";
                engine.complain(problem.hint(hint), fields.place());
                return None;
            }
        };
        Some(admittance * (pressure.as_kind(Kind::Plain) - normal))
    }

    /// A column of raw data interpolated linearly to the samples; times outside its span are refused.
    fn series(
        &self,
        data: &crate::record::Text,
        column: &str,
        times: &[f64],
        prefix: &str,
        series: &Series,
    ) -> Option<Quantity<'e>> {
        let engine = self.engine;
        let raw = RawData::find(engine, data)?;
        let known = raw.times(engine)?;
        if let Some(row) = known.windows(2).position(|pair| pair[0] >= pair[1]) {
            let problem =
                Problem::new(Code::TimeUnreadable, format!("The times of {} do not rise from row to row.", raw.name));
            engine.complain(problem.hint("Put the rows in order of time."), raw.line(engine, row + 1));
            return None;
        }
        let mut weights = Vec::with_capacity(times.len());
        for time in times {
            let Some((first, second, weight)) = bracket(&known, *time) else {
                engine.complain(outside(*time, &known, &raw.name, prefix), series.place);
                return None;
            };
            weights.push(vec![(first as u32, 1.0 - weight), (second as u32, weight)]);
        }
        let found =
            raw.input(engine, column, &series.path, series.symbol, series.label, series.kind, Distribution::Exact)?;
        if !super::gravity_check::fits(found.dimension(), series.unit) {
            let message =
                format!("The column {column} of {} has the wrong dimension: {} is expected.", raw.name, series.unit);
            engine.complain(
                Problem::new(Code::DimensionMismatch, message).hint("Correct its unit, or name another column."),
                series.place,
            );
            return None;
        }
        Some(found.mix(weights).as_kind(Kind::Plain))
    }
}

/// How a series stands in the graph, and where it is named.
struct Series {
    path: String,
    symbol: &'static str,
    label: &'static str,
    kind: Kind,
    unit: &'static str,
    place: Place,
}

fn outside(time: f64, known: &[f64], name: &str, prefix: &str) -> Problem {
    let (first, last) = (known.first().copied().unwrap_or(f64::NAN), known.last().copied().unwrap_or(f64::NAN));
    let message =
        format!("{prefix} needs a value at {}, but {name} runs from {} to {}.", clock(time), clock(first), clock(last));
    Problem::new(Code::ConditionsOutOfSpan, message)
        .hint("Take a series that encloses the whole run; it is not carried beyond its ends.")
}
