//! Mass comparators: sensitivity, repeatability, resolution, eccentricity, linearity, gradient of gravity.

use super::engine::{Block, Engine, shorten};
use super::field::{Field, Shape, needed, optional};
use super::fields::Fields;
use super::given::Given;
use super::raw_data::RawData;
use super::weight::Weight;
use super::{BlockKind, Output, no_check};
use crate::diagnostic::{Code, Problem};
use crate::graph::{Distribution, InputDraft, Origin, Quantity, Value};
use crate::method::{self, comparator_sensitivity, type_a_mean::TypeAMean, unit, weighing_cycle::Dispersion};
use crate::quantity::{Kind, Unit, parse_number};
use std::sync::Arc;

const REPEATABILITY_FIELDS: &[Field] = &[
    needed("standard_deviation", Shape::Value(Kind::MassDifference), "standard deviation known from earlier work"),
    needed("degrees_of_freedom", Shape::Number, "its degrees of freedom"),
    optional(
        "of",
        Shape::Choice(&["cycle", "series"]),
        "what it is the standard deviation of: one cycle, or the mean of one series",
    ),
];

const SENSITIVITY_FIELDS: &[Field] = &[
    optional("factor", Shape::Value(Kind::Plain), "mass for a unit of indication"),
    optional(
        "weight",
        Shape::Either(&Shape::Value(Kind::Mass), &Shape::Name),
        "the sensitivity weight: its apparent mass, or the name of a standard",
    ),
    optional(
        "air_density",
        Shape::Value(Kind::Density),
        "density of the air, for a weight whose buoyancy is not yet taken off",
    ),
    optional("without", Shape::Numbers, "indications without the weight"),
    optional("with", Shape::Numbers, "indications with the weight"),
    optional("unit", Shape::Text, "the unit of these indications"),
    optional("data", Shape::Name, "raw data with the columns without and with"),
];

/// A mass comparator.
pub static KIND: BlockKind = BlockKind {
    name: "comparator",
    meaning: "a mass comparator",
    fields: &[
        optional("label", Shape::Text, "what is printed for it"),
        optional("identification", Shape::Text, "marking, serial number, firmware"),
        optional("capacity", Shape::Value(Kind::Mass), "its capacity"),
        optional("resolution", Shape::Value(Kind::MassDifference), "the scale interval"),
        optional(
            "repeatability",
            Shape::Mapping(REPEATABILITY_FIELDS),
            "its standard deviation with degrees of freedom, for `type_a: pooled`",
        ),
        needed(
            "sensitivity",
            Shape::Mapping(SENSITIVITY_FIELDS),
            "mass for a unit of indication: a factor, or a sensitivity weight",
        ),
        optional("eccentricity", Shape::Value(Kind::MassDifference), "bound for loads off the centre of the pan"),
        optional("linearity", Shape::Value(Kind::MassDifference), "bound for departure from a straight line"),
        optional("gravity_gradient", Shape::AnyValue, "|dg/dz|/g at its place"),
    ],
    outputs: &[
        Output { path: "sensitivity", meaning: "mass for a unit of indication", unit: "1" },
        Output { path: "gravity_gradient", meaning: "gradient of g over g", unit: "m⁻¹" },
    ],
    check: no_check,
    build,
};

fn build(engine: &Engine, block: &Block) {
    Comparator { engine: shorten(engine), block }.sensitivity();
}

/// A comparator ready for use.
#[derive(Clone, Copy)]
pub struct Comparator<'e> {
    pub engine: &'e Engine<'e>,
    pub block: &'e Block,
}

impl<'e> Comparator<'e> {
    /// Mass for a unit of indication.
    pub fn sensitivity(self) -> Option<Quantity<'e>> {
        let (engine, name) = (self.engine, self.block.name());
        let path = format!("{name}.sensitivity");
        let known = engine.graph().find(&path);
        if let Some(known) = known {
            return Some(engine.at(known));
        }
        let fields = self.block.fields().mapping("sensitivity")?;
        if let Some(factor) = fields.given("factor", Kind::Plain) {
            return engine.given(
                &factor,
                &path,
                &format!("k_{name}"),
                &format!("sensitivity of {}", self.block.label()),
                Kind::Plain,
            );
        }
        let step = self.mean_step(fields)?;
        let apparent = self.apparent_weight(fields)?;
        let _scope = engine.builder.scope(name, Some(&comparator_sensitivity::METHOD.info));
        let k = comparator_sensitivity::sensitivity(apparent, step);
        Some(k.result(
            "sensitivity",
            &format!("k_{name}"),
            &format!("sensitivity of {}", self.block.label()),
            &Unit::one(),
        ))
    }

    fn apparent_weight(self, fields: Fields<'_>) -> Option<Quantity<'e>> {
        let (engine, name) = (self.engine, self.block.name());
        let label = format!("sensitivity weight of {}", self.block.label());
        let Some(weight) = fields.text("weight") else {
            let problem =
                Problem::new(Code::FieldMissing, format!("The sensitivity of {name} has neither factor nor weight."));
            engine.complain(
                problem.hint("Write `factor: 1.00002(3)` or `weight: 99.998(1) mg` with `without:` and `with:`."),
                fields.place(),
            );
            return None;
        };
        if !crate::record::is_name(&weight.text) {
            return engine.given(
                &fields.given("weight", Kind::Mass)?,
                &format!("{name}.sensitivity_weight"),
                "m_s",
                &label,
                Kind::Mass,
            );
        }
        let standard = Weight::find(engine, &weight)?;
        let Some(air) = fields.given("air_density", Kind::Density) else {
            let problem = Problem::new(
                Code::FieldMissing,
                format!("The weight {} is not corrected for buoyancy, and air_density is missing.", weight.text),
            );
            engine.complain(
                problem.hint("Write `air_density:` with the density of the air at the time."),
                fields.place(),
            );
            return None;
        };
        let air = engine.given(
            &air,
            &format!("{name}.sensitivity_air_density"),
            "ρ_a,s",
            "density of the air when the sensitivity was determined",
            Kind::Density,
        )?;
        let mass = standard.mass(self.block.date?, weight.place)?;
        let density = standard.density(Some(mass))?;
        Some(comparator_sensitivity::apparent_mass(mass, density, air))
    }

    /// Mean step of the indication with its own scatter.
    fn mean_step(self, fields: Fields<'_>) -> Option<Quantity<'e>> {
        let (engine, name) = (self.engine, self.block.name());
        let (without, with) = match fields.text("data") {
            Some(data) => self.columns(&data)?,
            None => (self.list(fields, "without")?, self.list(fields, "with")?),
        };
        if without.rows().len() != with.rows().len() {
            let problem = Problem::new(
                Code::DesignIncomplete,
                format!(
                    "{} indications without and {} with the sensitivity weight do not pair.",
                    without.rows().len(),
                    with.rows().len()
                ),
            );
            engine.complain(problem, fields.place());
            return None;
        }
        let difference = with - without;
        let path = format!("{name}.step_scatter");
        let label = format!("scatter of the sensitivity steps of {}", self.block.label());
        let made = engine.builder.estimator(
            Arc::new(TypeAMean),
            &[difference],
            &[(difference.dimension(), Kind::MassDifference)],
            &path,
            &label,
        );
        let step = *engine.keep(made, fields.place())?.first()?;
        let _scope = engine.builder.scope(name, Some(&method::type_a_mean::METHOD.info));
        Some(step.result(
            "sensitivity_step",
            "ΔI_s",
            &format!("mean step of {} with its sensitivity weight", self.block.label()),
            &unit("mg"),
        ))
    }

    fn columns(self, data: &crate::record::Text) -> Option<(Quantity<'e>, Quantity<'e>)> {
        let raw = RawData::find(self.engine, data)?;
        let column = |which: &str, symbol: &str| {
            let label = format!("indications of {} {which} its sensitivity weight", self.block.label());
            raw.input(
                self.engine,
                which,
                &format!("{}.indications_{which}", self.block.name()),
                symbol,
                &label,
                Kind::MassDifference,
                Distribution::Exact,
            )
        };
        Some((column("without", "I_0")?, column("with", "I_s")?))
    }

    fn list(self, fields: Fields<'_>, which: &str) -> Option<Quantity<'e>> {
        let Some(items) = fields.get(which).and_then(crate::record::Node::as_list) else {
            let problem = Problem::new(
                Code::FieldMissing,
                format!("The sensitivity of {} lacks the indications {which} its weight.", self.block.name()),
            );
            self.engine.complain(problem, fields.place());
            return None;
        };
        let unit_text = fields.text("unit").map_or_else(|| "mg".to_string(), |text| text.text);
        let unit = self.engine.keep(Unit::parse(&unit_text), fields.place_of("unit"))?;
        let mut rows = Vec::new();
        for item in items {
            rows.push(self.engine.keep(parse_number(item.as_text().unwrap_or_default(), &unit), item.place)?);
        }
        let places = items.iter().map(|item| item.place).collect();
        let path = format!("{}.indications_{which}", self.block.name());
        let label = format!("indications of {} {which} its sensitivity weight", self.block.label());
        Some(self.engine.builder.input(InputDraft::new(
            &path,
            "I",
            &label,
            Kind::MassDifference,
            unit,
            Value::column(rows),
            Origin::ReadingList(places),
        )))
    }

    /// The known standard deviation: of one cycle or one series as stated, else of what is averaged.
    pub fn repeatability(self, several_series: bool, used_at: crate::intake::Place) -> Option<Dispersion> {
        let Some(fields) = self.block.fields().mapping("repeatability") else {
            let problem = Problem::new(
                Code::FieldMissing,
                format!(
                    "`type_a: pooled` needs the repeatability of {}, which its block does not state.",
                    self.block.name()
                ),
            );
            self.engine.complain(problem.hint("Write `repeatability: {standard_deviation: …, degrees_of_freedom: …}` in the comparator, or `type_a: own`."), used_at);
            return None;
        };
        let Given::Stated { value, .. } = fields.given("standard_deviation", Kind::MassDifference)? else {
            return None;
        };
        let (standard_deviation, degrees_of_freedom) = (value.value, fields.number("degrees_of_freedom")?);
        let of_series = match fields.words("of").as_str() {
            "series" => true,
            "cycle" => false,
            _ => several_series,
        };
        Some(if of_series {
            Dispersion::PooledSeries { standard_deviation, degrees_of_freedom }
        } else {
            Dispersion::PooledCycle { standard_deviation, degrees_of_freedom }
        })
    }

    /// Half the scale interval, rectangular.
    pub fn resolution(self) -> Distribution {
        match self.block.fields().given("resolution", Kind::MassDifference) {
            Some(Given::Stated { value, .. }) => Distribution::Rectangular { half_width: value.value / 2.0 },
            _ => Distribution::Exact,
        }
    }

    /// Gradient of g over g; none when the block does not state it.
    pub fn gravity_gradient(self) -> Option<Quantity<'e>> {
        let given = self.block.fields().given("gravity_gradient", Kind::Plain)?;
        let name = self.block.name();
        self.engine.given(
            &given,
            &format!("{name}.gravity_gradient"),
            "Γ",
            &format!("gradient of g over g at {}", self.block.label()),
            Kind::Plain,
        )
    }
}
