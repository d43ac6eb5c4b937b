//! From a gravity station to g at the centre of mass of an artefact, with one result for each effect.

use super::gravity_effects::effects;
use super::gravity_station::GravityStation;
use crate::graph::{Name, NodeId, Quantity, Value};
use crate::method::{gravity_transfer, unit};
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
    /// Height of the centre of mass above the mark.
    pub height: NodeId,
    /// Seconds since 1970, one for each sample.
    pub times: Vec<f64>,
    /// Gravity at the mark on the day.
    pub reference: NodeId,
    pub effects: Vec<Effect>,
    /// g at the centre of mass, a row for each sample.
    pub gravity: NodeId,
    pub mean: NodeId,
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
        let found = effects(self, height, times, pressure, prefix)?;
        let engine = self.engine;
        let _scope = engine.builder.scope("", Some(&gravity_transfer::METHOD.info));
        let added: Vec<Quantity<'e>> = found.iter().map(|effect| effect.added).collect();
        let rows = engine.builder.exact(Value::column(vec![0.0; times.len()]), Dimension::ACCELERATION, Kind::Plain);
        let gravity = gravity_transfer::at_mass(reference, &added) + rows;
        let publish = |quantity: Quantity<'e>, name: &str, symbol: &str, label: &str, unit_text: &str| {
            let made = quantity.alias();
            let path = format!("{prefix}.gravity.{name}");
            let name = Name { path, symbol: symbol.into(), label: label.into(), unit: unit(unit_text) };
            engine.builder.name(made.id, name);
            made.id
        };
        let label = format!("gravity at the mark of {} on the day of {prefix}", self.block.label());
        let reference = publish(reference, "reference", "g_0", &label, "m/s2");
        let listed = found.into_iter().map(|effect| {
            let column = engine.graph().value(effect.added.id).length().is_some();
            let averaged = if column { effect.added.mean() } else { effect.added };
            let label = format!("effect on gravity during {prefix}: {}", effect.label);
            let mean = publish(averaged, effect.name, effect.symbol, &label, "nm/s2");
            Effect { name: effect.name, label: effect.label, mean, added: effect.added.id }
        });
        let effects: Vec<Effect> = listed.collect();
        let label = format!("gravity at the centre of mass, mean over {prefix}");
        let mean = publish(gravity.mean(), "mean", "g", &label, "m/s2");
        let station = self.block.name().into();
        let times = times.to_vec();
        let gravity_use =
            GravityUse { station, height: height.id, times, reference, effects, gravity: gravity.id, mean };
        engine.store(prefix, gravity_use);
        Some(gravity)
    }
}
