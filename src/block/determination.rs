//! Determination of a mass: one moving phase and one weighing phase joined by the mass equation.

use super::apparatus::Apparatus;
use super::engine::{Block, Engine, shorten};
use super::field::{Field, Shape, needed, optional};
use super::fields::Fields;
use super::moving_phase::MovingPhase;
use super::phase::{exact_column, means_of};
use super::realization::MeasuredAt;
use super::weighing_phase::WeighingPhase;
use super::weight::Weight;
use super::{BlockKind, Output};
use crate::diagnostic::{Code, Complaints, Problem};
use crate::graph::{Decision, Quantity, State};
use crate::method::kibble_mass::{self, Balance};
use crate::method::tare_fit::{self, TareFit, choose_order};
use crate::method::{coil_current, residual_gas_buoyancy, unit};
use crate::quantity::{Dimension, Kind};
use std::rc::Rc;
use std::sync::Arc;

const SEARCH_FIELDS: &[Field] = &[
    needed("largest", Shape::Number, "the largest order that is tried"),
    needed("confidence", Shape::Number, "the level of the F tests, such as 0.99"),
];

/// A determination.
pub static KIND: BlockKind = BlockKind {
    name: "determination",
    meaning: "one determination of a mass from a moving phase and a weighing phase",
    fields: &[
        optional("label", Shape::Text, "what is printed for it"),
        needed("moving", Shape::Name, "the moving phase"),
        needed("weighing", Shape::Name, "the weighing phase"),
        needed(
            "tare_order",
            Shape::Either(&Shape::Number, &Shape::Mapping(SEARCH_FIELDS)),
            "order of the drift of the tare: a number, or a rule",
        ),
        optional("basis", Shape::Text, "the name of the unit basis of the result; own realization unless written"),
    ],
    outputs: &[
        Output { path: "mass", meaning: "mass of the artefact in vacuum", unit: "kg" },
        Output { path: "apparent_mass", meaning: "mass before buoyancy and magnetic force", unit: "kg" },
        Output { path: "buoyancy", meaning: "buoyancy in the residual gas", unit: "µg" },
        Output { path: "state_reading", meaning: "force over gravitational acceleration, state by state", unit: "kg" },
        Output { path: "tare", meaning: "tare at the middle of the weighing", unit: "kg" },
        Output { path: "correction.NAME", meaning: "each correction to the mass, relative", unit: "1" },
        Output { path: "correction_mass.NAME", meaning: "the same as a mass", unit: "µg" },
    ],
    check,
    build: |engine, block| {
        let _ = Work::start(shorten(engine), block).and_then(Work::finish);
    },
};

fn check(fields: Fields<'_>, complaints: &mut Complaints) {
    let order = fields.number("tare_order").or_else(|| fields.mapping("tare_order")?.number("largest"));
    if let Some(order) = order.filter(|order| order.fract() != 0.0 || !(0.0..=8.0).contains(order)) {
        let problem = Problem::new(Code::OutOfRange, format!("The order {order} is not a whole number from 0 to 8."));
        complaints.add_at(problem.hint("Two is usual for a weighing of an hour."), fields.place_of("tare_order"));
    }
}

/// A weighing other than the one the moving phase was taken about, outside its span, is said.
fn check_span(engine: &Engine, fields: Fields<'_>, moving: &MovingPhase, weighing: &WeighingPhase) {
    let (first, last) = moving.span;
    if weighing.mean_time == moving.time || (first..=last).contains(&weighing.mean_time) {
        return;
    }
    let away = (first - weighing.mean_time).max(weighing.mean_time - last);
    let message = format!(
        "The weighing {} lies {:.1} min outside the moving phase {}: the geometric factor is extrapolated.",
        fields.words("weighing"),
        away / 60.0,
        fields.words("moving")
    );
    let problem = Problem::new(Code::Extrapolated, message);
    engine.complain(
        problem.hint("Pair each weighing with the moving phase before and after it."),
        fields.place_of("weighing"),
    );
}

/// What a determination found beyond its named quantities, for the report.
#[derive(Debug, Clone)]
pub struct Determination {
    pub moving: String,
    pub weighing: String,
    pub artefact: String,
    pub decisions: Vec<Decision>,
    /// Names of the corrections, in the order of the model.
    pub corrections: Vec<String>,
}

struct Work<'e> {
    engine: &'e Engine<'e>,
    block: &'e Block,
    moving: Rc<MovingPhase>,
    weighing: Rc<WeighingPhase>,
    apparatus: Apparatus<'e>,
    weight: Weight<'e>,
}

impl<'e> Work<'e> {
    fn start(engine: &'e Engine<'e>, block: &'e Block) -> Option<Work<'e>> {
        let fields = block.fields();
        let weighing = WeighingPhase::find(engine, &fields.text("weighing")?)?;
        let moving = MovingPhase::find(engine, &fields.text("moving")?)?;
        let apparatus = Apparatus::find(engine, &weighing.apparatus)?;
        check_span(engine, fields, &moving, &weighing);
        let weight = Weight::find(engine, &weighing.artefact)?;
        Some(Work { engine, block, moving, weighing, apparatus, weight })
    }

    fn finish(self) -> Option<()> {
        let (engine, name) = (self.engine, self.block.name());
        let beam_force =
            (self.apparatus.properties.balance_tilt * self.apparatus.parasitic.force_x).as_kind(Kind::Plain);
        let reading = self.state_reading(beam_force)?;
        let (rule, tare) = self.tare(reading)?;
        let buoyancy = self.buoyancy()?;
        let _scope = engine.builder.scope(name, Some(&kibble_mass::METHOD.info));
        let label = self.weight.block.label();
        let apparent = tare[0];
        let further = self.further();
        let ideal = kibble_mass::mass(apparent, buoyancy, self.apparatus.properties.magnetic_force);
        let corrected = further.iter().fold(ideal, |mass, (_, relative)| mass * (1.0 + *relative));
        let basis = self.block.fields().text("basis").map_or_else(|| "own realization".into(), |basis| basis.text);
        let mass = corrected.as_kind(Kind::Mass).in_state(Some(State::Vacuum)).on_basis(Some(basis.into())).result(
            "mass",
            &format!("m_{}", self.weight.block.name()),
            &format!("mass of {label} in vacuum, {name}"),
            &unit("kg"),
        );
        let corrections = self.corrections(apparent, buoyancy, beam_force, &rule, &further)?;
        self.store(mass, &rule, corrections);
        Some(())
    }

    /// Force over gravitational acceleration, averaged over each state.
    fn state_reading(&self, beam_force: Quantity<'e>) -> Option<Quantity<'e>> {
        let (engine, weighing, properties) = (self.engine, &self.weighing, &self.apparatus.properties);
        let current = engine.at(weighing.current);
        let ratio =
            coil_current::factor_ratio(current, properties.current_coefficient, properties.second_current_coefficient);
        let zero = || engine.builder.exact(crate::graph::Value::Scalar(0.0), Dimension::LENGTH, Kind::Plain);
        let _scope = engine.builder.scope(self.block.name(), Some(&kibble_mass::METHOD.info));
        let sample = kibble_mass::balance_reading(&Balance {
            effective_current: current * ratio,
            geometric_factor: self.geometric_factor()?,
            factor_change: properties.geometric_factor_change,
            beam_force,
            stiffness: properties.stiffness,
            beam: weighing.beam.map_or_else(zero, |beam| engine.at(beam)),
            gravity: engine.at(weighing.gravity),
        });
        let states = means_of(sample, &weighing.rows).as_kind(Kind::Plain);
        Some(states.result(
            "state_reading",
            "y",
            &format!("force over gravitational acceleration, state by state, in {}", self.block.name()),
            &unit("kg"),
        ))
    }

    /// The geometric factor at position and time of each sample: Σ b_k ζ^k + b_d τ.
    fn geometric_factor(&self) -> Option<Quantity<'e>> {
        let (engine, moving, weighing) = (self.engine, &self.moving, &self.weighing);
        let zeta: Vec<f64> = weighing.positions.iter().map(|z| z - moving.position).collect();
        let tau: Vec<f64> = weighing.times.iter().map(|t| t - moving.time).collect();
        let mut factor = engine.at(*moving.coefficients.first()?);
        for (k, coefficient) in moving.coefficients.iter().enumerate().skip(1) {
            let power = |z: &f64| crate::numeric::elementary::powi(*z, k as i32);
            let column = exact_column(engine, zeta.iter().map(power).collect(), Dimension::LENGTH.power(k as i32)?);
            factor = factor + engine.at(*coefficient) * column;
        }
        Some(factor + engine.at(moving.drift) * exact_column(engine, tau, Dimension::TIME))
    }

    /// The tare fit and its outputs.
    fn tare(&self, reading: Quantity<'e>) -> Option<(TareFit, Vec<Quantity<'e>>)> {
        let (fields, name, engine) = (self.block.fields(), self.block.name(), self.engine);
        let place = fields.place_of("tare_order");
        let states = self.weighing.states.clone();
        let rule = match fields.mapping("tare_order") {
            None => TareFit { states, order: fields.number("tare_order")? as usize, decisions: Vec::new() },
            Some(search) => {
                let (largest, confidence) = (search.number("largest")? as usize, search.number("confidence")?);
                engine.keep(choose_order(states, &reading.rows(), largest, confidence), place)?
            }
        };
        let drift = |k: usize| Some(reading.dimension().over(Dimension::TIME.power(k as i32)?));
        let dimensions: Option<Vec<Dimension>> =
            std::iter::once(Some(reading.dimension())).chain((0..=rule.order).map(drift)).collect();
        let outputs: Vec<(Dimension, Kind)> = dimensions?.into_iter().map(|one| (one, Kind::Plain)).collect();
        let made = engine.builder.estimator(
            Arc::new(rule.clone()),
            &[reading],
            &outputs,
            &format!("{name}.scatter"),
            &format!("scatter of the states of {name}"),
        );
        let made = engine.keep(made, place)?;
        let _scope = engine.builder.scope(name, Some(&tare_fit::METHOD.info));
        let apparent = format!("apparent mass of {} in {name}", self.weight.block.label());
        made[0].result("apparent_mass", "M", &apparent, &unit("kg"));
        made[1].result("tare", "c_0", &format!("tare at the middle of {name}"), &unit("kg"));
        Some((rule, made))
    }

    /// ρ V in the residual gas.
    fn buoyancy(&self) -> Option<Quantity<'e>> {
        let (engine, weighing) = (self.engine, &self.weighing);
        let (pressure, temperature) = (engine.at(weighing.gas_pressure), engine.at(weighing.gas_temperature));
        let volume = self.weight.volume(None, weighing.artefact.place)?.at(temperature);
        let _scope = engine.builder.scope(self.block.name(), Some(&residual_gas_buoyancy::METHOD.info));
        let density =
            residual_gas_buoyancy::density(pressure, temperature, self.apparatus.properties.residual_gas_molar_mass);
        let buoyancy = (density * volume).as_kind(Kind::Plain);
        Some(buoyancy.result("buoyancy", "ρ V", "buoyancy in the residual gas", &unit("µg")))
    }

    /// Further stated corrections of the apparatus.
    fn further(&self) -> Vec<(String, Quantity<'e>)> {
        self.apparatus
            .corrections
            .iter()
            .map(|(label, relative)| (label.clone(), relative.as_kind(Kind::Plain)))
            .collect()
    }

    /// Each correction that the model makes, as a line of its own: relative and as a mass, to first order.
    fn corrections(
        &self,
        apparent: Quantity<'e>,
        buoyancy: Quantity<'e>,
        beam_force: Quantity<'e>,
        rule: &TareFit,
        further: &[(String, Quantity<'e>)],
    ) -> Option<Vec<String>> {
        let (engine, moving, weighing) = (self.engine, &self.moving, &self.weighing);
        let p = &self.apparatus.properties;
        let (alpha, beta) = coil_current::asymmetry_effect(
            p.current_coefficient,
            p.second_current_coefficient,
            engine.at(weighing.current_off),
            engine.at(weighing.current_on),
        );
        let mut lines: Vec<(String, &str, Quantity<'e>)> = vec![
            ("alignment".into(), "tilt of the laser beam", 1.0 - engine.at(moving.alignment)),
            ("abbe_offset".into(), "Abbe error of the velocity", engine.at(moving.abbe_error)),
            ("parasitic_motion".into(), "parasitic motion of the coil", -engine.at(moving.parasitic_power)),
            (
                "refractive_index".into(),
                "refractive index of the residual gas",
                engine.at(moving.refractive_index) - 1.0,
            ),
            ("beam_force".into(), "tilt of the balance beam", beam_force),
            ("current".into(), "first current coefficient", alpha),
            ("second_current".into(), "second current coefficient", beta),
            (
                "geometric_factor_change".into(),
                "change of the geometric factor between the phases",
                p.geometric_factor_change,
            ),
            ("leakage".into(), "leakage", -p.leakage),
            ("magnetic_force".into(), "magnetic force on the artefact", -p.magnetic_force),
            ("buoyancy".into(), "buoyancy in the residual gas", buoyancy / apparent),
        ];
        if let Some(beam) = weighing.beam {
            let weights = engine.keep(rule.weights(), self.block.raw.name.place)?;
            let force = p.stiffness * engine.at(beam) / engine.at(weighing.gravity);
            let by_state = means_of(force, &weighing.rows);
            let total = by_state.mix(vec![weights.iter().enumerate().map(|(s, w)| (s as u32, *w)).collect()]).row(0);
            lines.push(("beam_position".into(), "beam off null", -(total / apparent)));
        }
        for (index, (_, relative)) in further.iter().enumerate() {
            lines.push((format!("further_{}", index + 1), "further correction", *relative));
        }
        for (index, (name, label, relative)) in lines.iter().enumerate() {
            let label = match index.checked_sub(lines.len() - further.len()) {
                Some(stated) => further[stated].0.clone(),
                None => (*label).to_string(),
            };
            let relative = relative.as_kind(Kind::Plain);
            let symbol = format!("δ_{}", name.replace('_', " "));
            let shown =
                relative.result(&format!("correction.{name}"), &symbol, &format!("correction for {label}"), &unit("1"));
            let mass = (shown * apparent).as_kind(Kind::MassDifference);
            mass.result(
                &format!("correction_mass.{name}"),
                &symbol,
                &format!("correction for {label}, as a mass"),
                &unit("µg"),
            );
        }
        Some(lines.into_iter().map(|(name, ..)| name).collect())
    }

    fn store(&self, _mass: Quantity<'e>, rule: &TareFit, corrections: Vec<String>) {
        let (fields, name) = (self.block.fields(), self.block.name());
        let (first, last) = (self.weighing.times.first(), self.weighing.times.last());
        if let (Some(first), Some(last)) = (first, last) {
            let (start, end) = (first.min(self.moving.span.0), last.max(self.moving.span.1));
            self.engine.store(name, MeasuredAt { start, end });
        }
        let mut decisions = self.moving.decisions.clone();
        decisions.extend(rule.decisions.clone());
        decisions.push(Decision { what: "order of the tare".into(), decided: rule.order.to_string() });
        self.engine.store(
            name,
            Determination {
                moving: fields.words("moving"),
                weighing: fields.words("weighing"),
                artefact: self.weighing.artefact.text.clone(),
                decisions,
                corrections,
            },
        );
    }
}
