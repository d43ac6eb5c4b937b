//! The value of a gravity station: its profile, its determinations referred to the mark, and the value on a day.

use super::engine::{Block, Engine};
use super::fields::Fields;
use super::gravity_station::{Determined, GravityStation, height, stated};
use super::raw_data::epoch;
use crate::diagnostic::{Code, Problem};
use crate::graph::{Distribution, InputDraft, NodeId, Origin, Quantity, Value};
use crate::intake::Place;
use crate::method::gravity_epoch::{self, Determination};
use crate::method::gravity_profile::{self, FREE_AIR_GRADIENT, FREE_AIR_UNCERTAINTY, Profile, Scatter, TiesFit};
use crate::method::{normal_gravity, unit};
use crate::quantity::{Dimension, Kind};
use chrono::NaiveDate;
use std::sync::Arc;

impl<'e> GravityStation<'e> {
    /// Gravity at the mark at a time (s since 1970): on the line between two determinations; on the day of one, that
    /// one; else the nearest with the stated change.
    pub(super) fn on_day(&self, time: f64) -> Option<Quantity<'e>> {
        let list = self.determinations();
        let (first, last) = (*list.first()?, *list.last()?);
        if first.time <= time && time <= last.time {
            let label = "departure of gravity from the line between two determinations";
            let zero = self.engine.builder.exact(Value::Scalar(0.0), Dimension::ACCELERATION, Kind::Plain);
            let inside = list.iter().all(|one| !same_day(one, time));
            let departure = if inside { self.change("change_between_determinations", label) } else { None };
            let found = gravity_epoch::between(&list, time, departure.unwrap_or(zero));
            return self.engine.keep(found, self.block.fields().place_of("determinations"));
        }
        let nearest = if time < first.time { first } else { last };
        if same_day(&nearest, time) {
            return Some(nearest.gravity);
        }
        match self.change("change_since_determination", "change of gravity since the determination") {
            Some(change) => Some(gravity_epoch::held(nearest, change)),
            None => {
                self.engine.complain(self.no_value_on(time), self.block.fields().place_of("determinations"));
                None
            }
        }
    }

    fn no_value_on(&self, time: f64) -> Problem {
        let days: Vec<String> = self.station.determinations.iter().map(|one| day(one.time)).collect();
        let message = format!(
            "Gravity is needed on {}, but {} was determined on {}.",
            day(time),
            self.block.name(),
            days.join(" and ")
        );
        Problem::new(Code::ConditionsOutOfSpan, message).hint(
            "Enter a determination on the other side of that day, or state how far g may have moved: `change_since_determination: 0.0(15) µGal`.",
        )
    }

    fn change(&self, field: &str, label: &str) -> Option<Quantity<'e>> {
        stated(self.engine, self.block.fields(), field, &format!("{}.{field}", self.block.name()), "d", label)
    }
}

/// Whether a time lies within half a day of noon on the day of a determination.
fn same_day(determination: &Determination<'_>, time: f64) -> bool {
    (time - determination.time).abs() <= 43_200.0
}

/// The day of a time in s since 1970.
pub fn day(time: f64) -> String {
    chrono::DateTime::from_timestamp(time as i64, 0).map_or_else(String::new, |at| at.date_naive().to_string())
}

/// Noon of a day, in s since 1970.
pub(super) fn noon(date: NaiveDate) -> f64 {
    (date - epoch().date_naive()).num_days() as f64 * 86_400.0 + 43_200.0
}

/// The profile under `path`: coefficients stated, fitted to ties, or the gradient of free air where nobody measured one.
pub(super) fn profile<'e>(
    engine: &'e Engine<'e>,
    block: &'e Block,
    fields: Option<Fields<'e>>,
    path: &str,
) -> Option<Profile<'e>> {
    let Some(fields) = fields else {
        return Some(Profile { gamma_1: free_air(engine, block), gamma_2: None });
    };
    if fields.get("ties").is_some() {
        return fitted(engine, block, fields, path);
    }
    let at = |field: &str| format!("{path}.{field}");
    let gradient = stated(engine, fields, "gradient", &at("gradient"), "γ_1", "change of gravity with height")?;
    let label = "coefficient of the height squared";
    let second = stated(engine, fields, "second_coefficient", &at("second_coefficient"), "γ_2", label);
    if let (Some(_), Some(r)) = (second, fields.number("correlation")) {
        let inputs = [at("gradient"), at("second_coefficient")];
        let matrix = vec![vec![1.0, r], vec![r, 1.0]];
        join(engine, &at("correlation"), &inputs, matrix, fields.place_of("correlation"))?;
    }
    Some(Profile { gamma_1: gradient, gamma_2: second })
}

/// Coefficients by least squares from differences between pairs of heights.
fn fitted<'e>(engine: &'e Engine<'e>, block: &Block, fields: Fields<'_>, path: &str) -> Option<Profile<'e>> {
    let ties = fields.mappings("ties");
    let degree = if fields.number("degree") == Some(1.0) { 1 } else { 2 };
    let mut uncertainties = Vec::new();
    let mut columns: [(Vec<f64>, Vec<Place>); 3] = Default::default();
    for tie in &ties {
        for (column, (name, kind)) in
            columns.iter_mut().zip([("from", Kind::Height), ("to", Kind::Height), ("difference", Kind::Plain)])
        {
            column.0.push(super::gravity_check::stated_number(*tie, name, kind)?);
            column.1.push(tie.place_of(name));
        }
        uncertainties.push(super::gravity_check::stated_uncertainty(*tie, "difference")?);
    }
    let named = [
        ("lower_heights", "z_i", "lower heights of the ties", "m"),
        ("upper_heights", "z_j", "upper heights of the ties", "m"),
        ("differences", "Δg", "differences of gravity of the ties", "nm/s2"),
    ];
    let columns: Vec<Quantity<'e>> = columns
        .into_iter()
        .zip(named)
        .map(|((rows, places), (name, symbol, label, unit_text))| {
            let origin = Origin::ReadingList(places.into());
            let label = format!("{label} at {}", block.label());
            let path = format!("{path}.{name}");
            engine.builder.input(InputDraft::new(
                &path,
                symbol,
                &label,
                Kind::Plain,
                unit(unit_text),
                Value::column(rows),
                origin,
            ))
        })
        .collect();
    let scatter = if fields.words("scatter") == "from residuals" { Scatter::FromResiduals } else { Scatter::Stated };
    let rule = TiesFit { degree, uncertainties: uncertainties.into(), scatter };
    let per_metre = unit("nm s-2 m-2").dimension();
    let outputs = [(Dimension::ACCELERATION_GRADIENT, Kind::Plain), (per_metre, Kind::Plain)];
    let label = format!("profile of gravity at {}, fitted to ties", block.label());
    let made = engine.builder.estimator(Arc::new(rule), &columns, &outputs[..degree], &format!("{path}.ties"), &label);
    let made = engine.keep(made, fields.place_of("ties"))?;
    let _scope = engine.builder.scope(path, Some(&gravity_profile::METHOD.info));
    let gamma_1 = made.first()?.result("gradient", "γ_1", "change of gravity with height", &unit("nm s-2 m-1"));
    let second = |found: &Quantity<'e>| {
        found.result("second_coefficient", "γ_2", "coefficient of the height squared", &unit("nm s-2 m-2"))
    };
    Some(Profile { gamma_1, gamma_2: made.get(1).map(second) })
}

/// The free-air gradient with the uncertainty that laboratories depart from it by.
fn free_air<'e>(engine: &'e Engine<'e>, block: &'e Block) -> Quantity<'e> {
    let (name, place) = (block.name(), block.raw.name.place);
    let words = "that of free air, −308.6 µGal/m, is used with a standard uncertainty of 30 µGal/m";
    engine.builder.assume(format!("{name}: the gradient of gravity was not measured; {words}"), Some(place));
    let problem =
        Problem::new(Code::GradientAssumed, format!("The gradient of gravity at {name} was not measured; {words}."));
    engine.complain(problem.hint("Measure g at several heights and write `profile:`."), place);
    let mut draft = InputDraft::new(
        &format!("{name}.profile.gradient"),
        "γ_1",
        "change of gravity with height, free air",
        Kind::Plain,
        unit("nm s-2 m-1"),
        Value::Scalar(FREE_AIR_GRADIENT),
        Origin::Assumed("gradient of gravity not measured"),
    );
    draft.distribution = Distribution::Normal { standard_uncertainty: FREE_AIR_UNCERTAINTY };
    engine.builder.input(draft)
}

/// One determination: the path of its input, and its value referred to the mark.
pub(super) fn determination<'e>(
    engine: &'e Engine<'e>,
    block: &'e Block,
    fields: Fields<'e>,
    number: usize,
    profile: Profile<'e>,
) -> Option<(String, Determined)> {
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
        value = gravity_profile::at_effective_height(value, used, z, effective);
        z = effective;
    }
    let zero = engine.builder.exact(Value::Scalar(0.0), Dimension::LENGTH, Kind::Plain);
    let at_mark = value + profile.step(z, zero);
    let _scope = engine.builder.scope(&own, Some(&gravity_profile::METHOD.info));
    let label = format!("gravity {of}, at the mark");
    let at_mark = at_mark.alias().result("at_mark", &format!("g_0,{number}"), &label, &unit("m/s2"));
    Some((path, Determined { time: noon(fields.date("date")?), at_mark: at_mark.id }))
}

/// States the correlation of each determination with the one listed before it.
pub(super) fn correlate_determinations(engine: &Engine, block: &Block, inputs: &[(String, Option<f64>)]) -> Option<()> {
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

fn join(engine: &Engine, path: &str, inputs: &[String], matrix: Vec<Vec<f64>>, place: Place) -> Option<()> {
    let nodes: Vec<NodeId> = inputs.iter().map(|input| engine.graph().find(input)).collect::<Option<_>>()?;
    engine.keep(engine.builder.correlate(path, &nodes, matrix), place)
}

/// Judges each determination by the normal gravity of its site.
pub(super) fn judge(station: &GravityStation<'_>) -> Option<()> {
    let engine = station.engine;
    let site = crate::method::gravity_site::Site { height: station.station.above_sea_level, ..station.station.site };
    for fields in station.block.fields().mappings("determinations") {
        let Some(value) = super::gravity_check::stated_number(fields, "value", Kind::Plain) else { continue };
        let place = fields.place_of("value");
        engine.keep(normal_gravity::check(&site, value), place)?;
        if let Some(remark) = normal_gravity::remark(&site, value) {
            let problem = Problem::new(Code::ValueUnusual, remark);
            engine.complain(
                problem.hint("Check the digits of the value, and the latitude and height of the site."),
                place,
            );
        }
    }
    Some(())
}
