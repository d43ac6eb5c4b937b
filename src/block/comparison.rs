//! Comparisons: weights compared by substitution on a comparator in air.

use super::ambient::LoggedAir;
use super::comparator::Comparator;
use super::engine::{Block, Engine, shorten};
use super::field::{Field, Shape, needed, optional};
use super::fields::Fields;
use super::weighing::{Comparison, CycleResult, Excluded, Weighings};
use super::weight::{VolumeAt, Weight};
use super::{BlockKind, Output};
use crate::diagnostic::{Code, Complaints, Problem};
use crate::graph::{Distribution, EstimatorId, Op, Quantity};
use crate::intake::Place;
use crate::method::air_density;
use crate::method::averaging_cycle::{self, AveragedDifferences, AveragingCycle};
use crate::method::weighing_cycle::{self, Cycle, Dispersion, MeanDifference, Scheme};
use crate::method::{conventional_mass, substitution, unit};
use crate::quantity::{Dimension, Kind};
use chrono::NaiveDate;
use std::sync::Arc;

const LEFT_OUT_FIELDS: &[Field] = &[
    needed("cycle", Shape::Number, "the number of the cycle in its series, from 1"),
    optional("rule", Shape::Name, "the rule it was left out by"),
    optional("reason", Shape::Text, "why, in words"),
];

const LEFT_OUT_OF_DATA_FIELDS: &[Field] = &[
    needed("series", Shape::Number, "the number of the series"),
    needed("cycle", Shape::Number, "the number of the cycle in its series"),
    optional("rule", Shape::Name, "the rule it was left out by"),
    optional("reason", Shape::Text, "why, in words"),
];

const SERIES_FIELDS: &[Field] = &[
    optional("start", Shape::Instant, "time of the first weighing"),
    optional("interval", Shape::Value(Kind::Duration), "time between weighings"),
    optional(
        "times",
        Shape::Either(&Shape::Texts, &Shape::Grid),
        "the time of each weighing, instead of start and interval",
    ),
    needed("indications", Shape::Grid, "the indications, one list a cycle"),
    optional("excluded", Shape::Mappings(LEFT_OUT_FIELDS), "cycles left out, with rule and reason"),
];

const ADDED_FIELDS: &[Field] = &[
    optional("a", Shape::Names, "small weights on the pan with a"),
    optional("b", Shape::Names, "small weights on the pan with b"),
];

const SCHEMES: &[&str] = &["ABBA", "ABA", "AB1…BnA", "AB1...BnA"];

/// A comparison of weights.
pub static KIND: BlockKind = BlockKind {
    name: "comparison",
    meaning: "weights compared by substitution on a comparator in air",
    fields: &[
        needed("cycle", Shape::Choice(SCHEMES), "the weighing cycle"),
        needed("a", Shape::Name, "the reference"),
        needed("b", Shape::Names, "the weight compared with it; several for AB1…BnA"),
        needed("result", Shape::Choice(&["b minus a"]), "what the difference is"),
        needed("comparator", Shape::Name, "the comparator"),
        optional("ambient", Shape::Name, "the logged conditions"),
        optional("air_density", Shape::Value(Kind::Density), "a stated density of the air, instead of conditions"),
        optional("air_temperature", Shape::Value(Kind::Temperature), "the air temperature that goes with it"),
        needed(
            "type_a",
            Shape::Choice(&["own", "pooled"]),
            "scatter of this comparison, or the comparator's repeatability",
        ),
        optional("unit", Shape::Text, "the unit of the indications written here"),
        optional("series", Shape::Mappings(SERIES_FIELDS), "series of cycles, written here"),
        optional("data", Shape::Name, "raw data with the columns series, cycle, which, time, indication"),
        optional(
            "excluded",
            Shape::Mappings(LEFT_OUT_OF_DATA_FIELDS),
            "cycles of the raw data left out, with rule and reason",
        ),
        optional("added", Shape::Mapping(ADDED_FIELDS), "small weights added on either pan"),
        optional("mass_of_a", Shape::Value(Kind::Mass), "the mass of a, instead of that of its calibration"),
    ],
    outputs: &[
        Output { path: "difference", meaning: "mass difference b − a (several b: NAME.B.difference)", unit: "mg" },
        Output { path: "mass", meaning: "mass of b (several b: NAME.B.mass)", unit: "kg" },
        Output {
            path: "conventional_mass",
            meaning: "conventional mass of b (several b: NAME.B.conventional_mass)",
            unit: "kg",
        },
        Output {
            path: "indication_difference",
            meaning: "mean difference of the indications times the sensitivity, before buoyancy",
            unit: "mg",
        },
        Output {
            path: "corrected_difference",
            meaning: "mean difference of the weighings corrected for buoyancy",
            unit: "mg",
        },
        Output { path: "buoyancy", meaning: "buoyancy correction of the difference", unit: "mg" },
        Output { path: "series.N", meaning: "mean of series N, corrected for buoyancy", unit: "mg" },
        Output { path: "air.density", meaning: "mean air density over the weighings", unit: "kg m⁻³" },
        Output { path: "air.density_at_weighings", meaning: "air density at each weighing", unit: "kg m⁻³" },
        Output { path: "air.temperature", meaning: "mean air temperature over the weighings", unit: "°C" },
        Output { path: "air.pressure", meaning: "mean air pressure over the weighings", unit: "hPa" },
    ],
    check,
    build: |engine, block| {
        let _ = Work::start(shorten(engine), block).and_then(Work::finish);
    },
};

fn check(fields: Fields<'_>, complaints: &mut Complaints) {
    if fields.get("series").is_some() == fields.get("data").is_some() {
        let problem = Problem::new(Code::FieldMissing, "A comparison needs either series or data.");
        complaints.add_at(
            problem.hint("Write the indications as `series:`, or name a raw-data block as `data:`."),
            fields.place(),
        );
    }
    if fields.get("ambient").is_some() == fields.get("air_density").is_some() {
        let problem = Problem::new(Code::FieldMissing, "A comparison needs either ambient or air_density.");
        complaints.add_at(problem.hint("Name the block with the logged conditions as `ambient:`."), fields.place());
    }
    let several = fields.words("cycle").starts_with("AB1");
    if !several && fields.texts("b").len() > 1 {
        let message = format!(
            "The cycle {} compares one weight with a, but b names {}.",
            fields.words("cycle"),
            fields.texts("b").len()
        );
        complaints.add_at(
            Problem::new(Code::DesignIncomplete, message)
                .hint("Write `cycle: AB1…BnA`, or one comparison for each weight."),
            fields.place_of("b"),
        );
    }
    let left_out = fields
        .mappings("excluded")
        .into_iter()
        .chain(fields.mappings("series").into_iter().flat_map(|series| series.mappings("excluded")));
    for cycle in left_out {
        if cycle.get("rule").is_none() || cycle.words("reason").trim().is_empty() {
            let message = format!("Cycle {} is left out without a rule and a reason.", cycle.words("cycle"));
            complaints.add_at(
                Problem::new(Code::ExclusionWithoutReason, message)
                    .hint("Write `rule:` with the name of a rule dated before the weighing, and `reason:`."),
                cycle.place(),
            );
        }
    }
}

/// The air of the weighings: one value a weighing, or one for all.
#[derive(Clone, Copy)]
struct Surroundings<'e> {
    density: Quantity<'e>,
    temperature: Option<Quantity<'e>>,
    pressure: Option<Quantity<'e>>,
}

/// What is known of one weight on the pan.
#[derive(Clone, Copy)]
struct Load<'e> {
    weight: Weight<'e>,
    volume: VolumeAt<'e>,
    /// Γ h of its mass centre.
    gradient: Quantity<'e>,
}

/// A comparison being reduced.
struct Work<'e> {
    engine: &'e Engine<'e>,
    block: &'e Block,
    several: bool,
    comparator: Comparator<'e>,
    weighings: Weighings<'e>,
    cycles: Vec<Cycle>,
    excluded: Vec<Excluded>,
    surroundings: Surroundings<'e>,
    day: NaiveDate,
    m_a: Quantity<'e>,
    a_is_known: bool,
    a: Load<'e>,
    b: Vec<Load<'e>>,
}

impl<'e> Work<'e> {
    /// Gathers everything the comparison rests on.
    fn start(engine: &'e Engine<'e>, block: &'e Block) -> Option<Work<'e>> {
        let fields = block.fields();
        let names = fields.texts("b");
        let several = fields.words("cycle").starts_with("AB1");
        let pans = match fields.words("cycle").as_str() {
            "ABA" => pans_of(Scheme::Aba),
            "ABBA" => pans_of(Scheme::Abba),
            _ => [0].into_iter().chain(1..=names.len() as u32).chain([0]).collect(),
        };
        let comparator = Comparator { engine, block: engine.block(&fields.text("comparator")?, &["comparator"])? };
        let weighings = Weighings::read(engine, block, &pans)?;
        let day = chrono::DateTime::from_timestamp(weighings.list.first()?.time as i64, 0)?.date_naive();
        let excluded = left_out(engine, fields, day)?;
        let cycles = weighings.cycles(engine, &pans, &excluded)?;
        let surroundings = surroundings(engine, block, &weighings)?;
        let a_name = fields.text("a")?;
        let weight_a = Weight::find(engine, &a_name)?;
        let a_is_known = fields.get("mass_of_a").is_some() || weight_a.is_calibrated();
        let m_a = match fields.given("mass_of_a", Kind::Mass) {
            Some(given) => engine.given(
                &given,
                &format!("{}.mass_of_a", block.name()),
                &format!("m_{}", a_name.text),
                &format!("mass of {}", weight_a.block.label()),
                Kind::Mass,
            )?,
            None if a_is_known => weight_a.mass_in_air(day, a_name.place)?,
            None => weight_a.nominal()?,
        };
        let gradient = comparator.gravity_gradient();
        let a = load(engine, weight_a, Some(m_a), gradient, a_name.place)?;
        let mut b = Vec::new();
        for name in &names {
            b.push(load(engine, Weight::find(engine, name)?, None, gradient, name.place)?);
        }
        Some(Work {
            engine,
            block,
            several,
            comparator,
            weighings,
            cycles,
            excluded,
            surroundings,
            day,
            m_a,
            a_is_known,
            a,
            b,
        })
    }

    /// Reduces the comparison and names its results.
    fn finish(self) -> Option<()> {
        self.name_air();
        let k = self.comparator.sensitivity()?;
        let several_series = self
            .cycles
            .iter()
            .filter(|cycle| !cycle.excluded)
            .map(|cycle| cycle.series)
            .collect::<std::collections::BTreeSet<_>>()
            .len()
            > 1;
        let dispersion = match self.block.fields().words("type_a").as_str() {
            "own" => Dispersion::Own,
            _ => self.comparator.repeatability(several_series, self.block.fields().place_of("type_a"))?,
        };
        let y = self.corrected_weighings(k);
        let indications = k * self.weighings.indications.as_kind(Kind::Plain);
        let found = match self.several {
            true => self.averaged(y, dispersion)?,
            false => self.by_cycles(y, dispersion)?,
        };
        let mut nodes = Vec::new();
        for (index, corrected) in found.iter().enumerate() {
            nodes.push(self.name_results(index, *corrected, indications)?);
        }
        self.warn_of_few_readings(found[0]);
        self.store(y, &found, nodes);
        Some(())
    }

    /// Path of results of weight number `index`.
    fn scope_name(&self, index: usize) -> String {
        match self.several {
            true => format!("{}.{}", self.block.name(), self.b[index].weight.block.name()),
            false => self.block.name().to_string(),
        }
    }

    fn name_air(&self) {
        let _scope = self.engine.builder.scope(&format!("{}.air", self.block.name()), Some(&air_density::METHOD.info));
        let air = self.surroundings;
        let name = |quantity: Quantity<'e>, path: &str, symbol: &str, label: &str, shown: &str| {
            let mean = if quantity.rows().len() > 1 { quantity.mean() } else { quantity.alias() };
            mean.result(
                path,
                symbol,
                &format!("mean {label} over the weighings of {}", self.block.name()),
                &unit(shown),
            );
        };
        name(air.density, "density", "ρ_a", "air density", "kg/m3");
        if let Some(temperature) = air.temperature {
            name(temperature, "temperature", "t", "air temperature", "°C");
        }
        if let Some(pressure) = air.pressure {
            name(pressure, "pressure", "p", "air pressure", "hPa");
        }
    }

    /// A column replaced row by row by its mean over the row's cycle: within a cycle the conditions drift linearly at
    /// most, which the cycle eliminates, while the noise of single sensor readings would pass into the scatter.
    fn cycle_means(&self, column: Quantity<'e>) -> Quantity<'e> {
        if column.rows().len() < 2 {
            return column;
        }
        let mut weights = vec![Vec::new(); self.weighings.list.len()];
        for cycle in &self.cycles {
            let share = 1.0 / cycle.rows.len() as f64;
            for row in &cycle.rows {
                weights[*row] = cycle.rows.iter().map(|other| (*other as u32, share)).collect();
            }
        }
        column.mix(weights)
    }

    /// y = k I + ρ V (1 − Γ h), row by row.
    fn corrected_weighings(&self, k: Quantity<'e>) -> Quantity<'e> {
        let builder = &self.engine.builder;
        let density = self.cycle_means(self.surroundings.density);
        let temperature = self.surroundings.temperature.map(|temperature| self.cycle_means(temperature));
        let buoyancy = |load: &Load<'e>| {
            let volume = temperature.map_or(load.volume.volume, |temperature| load.volume.at(temperature));
            density.as_kind(Kind::Plain) * volume.as_kind(Kind::Plain) * (1.0 - load.gradient)
        };
        let mut y = k * self.weighings.indications.as_kind(Kind::Plain);
        for (pan, load) in [&self.a].into_iter().chain(&self.b).enumerate() {
            let mask: Vec<f64> =
                self.weighings.list.iter().map(|weighing| f64::from(u8::from(weighing.on_pan == pan as u32))).collect();
            y = y + buoyancy(load) * builder.column(mask);
        }
        y
    }

    fn by_cycles(&self, y: Quantity<'e>, dispersion: Dispersion) -> Option<Vec<Quantity<'e>>> {
        let (engine, name) = (self.engine, self.block.name());
        let place = self.block.raw.name.place;
        let rule =
            engine.keep(MeanDifference::new(&self.cycles, dispersion), self.block.fields().place_of("type_a"))?;
        let series = rule.series().to_vec();
        let outputs = vec![(Dimension::MASS, Kind::MassDifference); series.len() + 1];
        let label = format!("repeatability of the comparison {name}");
        let made = engine.builder.estimator(Arc::new(rule), &[y], &outputs, &format!("{name}.repeatability"), &label);
        let made = engine.keep(made, place)?;
        let _scope = engine.builder.scope(name, Some(&weighing_cycle::METHOD.info));
        for (series, mean) in series.iter().zip(&made[1..]) {
            mean.result(
                &format!("series.{series}"),
                &format!("D_{series}"),
                &format!("mean of series {series}"),
                &unit("mg"),
            );
        }
        Some(vec![made[0].result(
            "corrected_difference",
            "D",
            &format!("mean difference of the corrected weighings of {name}"),
            &unit("mg"),
        )])
    }

    fn averaged(&self, y: Quantity<'e>, dispersion: Dispersion) -> Option<Vec<Quantity<'e>>> {
        let (engine, name) = (self.engine, self.block.name());
        let of = |cycle: &Cycle| -> Option<AveragingCycle> {
            let (first, rest) = cycle.rows.split_first()?;
            let (last, tests) = rest.split_last()?;
            Some(AveragingCycle { first: *first, tests: tests.to_vec(), last: *last })
        };
        let cycles = self.cycles.iter().filter(|cycle| !cycle.excluded).map(of).collect::<Option<Vec<_>>>()?;
        let rule = AveragedDifferences { weights: self.b.len(), cycles, dispersion };
        let outputs = vec![(Dimension::MASS, Kind::MassDifference); self.b.len()];
        let label = format!("repeatability of the comparison {name}");
        let made = engine.builder.estimator(Arc::new(rule), &[y], &outputs, &format!("{name}.repeatability"), &label);
        let made = engine.keep(made, self.block.raw.name.place)?;
        let named = made.iter().enumerate().map(|(index, difference)| {
            let _scope = engine.builder.scope(&self.scope_name(index), Some(&averaging_cycle::METHOD.info));
            difference.result(
                "corrected_difference",
                "D",
                &format!("mean difference of the corrected weighings of {}", self.b[index].weight.block.label()),
                &unit("mg"),
            )
        });
        Some(named.collect())
    }

    /// Rounding, eccentricity and linearity: estimates zero, added to the difference.
    fn comparator_bounds(&self, index: usize) -> Vec<Quantity<'e>> {
        let (engine, comparator, name) = (self.engine, self.comparator, self.comparator.block.name());
        let fields = comparator.block.fields();
        let mut bounds = Vec::new();
        let rounding = comparator.resolution();
        if rounding != Distribution::Exact {
            let place = fields.place_of("resolution");
            for (side, on) in [("a", &self.a), ("b", &self.b[index])] {
                let path = format!("{}.rounding_{side}", self.scope_name(index));
                let label = format!(
                    "rounding of the indications of {} with {} on the pan",
                    comparator.block.label(),
                    on.weight.block.label()
                );
                let input = engine.derived_input(
                    &path,
                    &format!("δ_d,{side}"),
                    &label,
                    Kind::MassDifference,
                    &unit("µg"),
                    rounding,
                    place,
                );
                bounds.push(if side == "a" { -input } else { input });
            }
        }
        for (field, symbol, words) in
            [("eccentricity", "δ_E", "eccentric loading of"), ("linearity", "δ_lin", "departure from linearity of")]
        {
            let label = format!("{words} {}", comparator.block.label());
            bounds.extend(engine.bound(
                fields,
                field,
                &format!("{name}.{field}"),
                symbol,
                &label,
                Kind::MassDifference,
            ));
        }
        bounds
    }

    /// Small weights on the pans: what those with b weigh more than those with a, in air.
    fn added(&self) -> Option<Option<Quantity<'e>>> {
        let Some(added) = self.block.fields().mapping("added") else { return Some(None) };
        let air = self.mean_density()?.as_kind(Kind::Plain);
        let mut total: Option<Quantity<'e>> = None;
        for (side, sign) in [("a", -1.0), ("b", 1.0)] {
            for name in added.texts(side) {
                let small = Weight::find(self.engine, &name)?;
                let mass = small.mass_in_air(self.day, name.place)?;
                if let (Some(known), Some(reference)) = (self.basis_of(mass), self.basis_of(self.m_a))
                    && known != reference
                {
                    let message = format!(
                        "{} is on the unit basis {known}, but {} on {reference}; they cannot be added.",
                        name.text,
                        self.a.weight.block.name()
                    );
                    self.engine.complain(
                        Problem::new(Code::BasisMismatch, message)
                            .hint("Use the certificate on the same basis, or state the shift between the two."),
                        name.place,
                    );
                    return None;
                }
                let volume = small.volume(Some(mass), name.place)?;
                let apparent = (mass.as_kind(Kind::Plain) - air * volume.volume.as_kind(Kind::Plain)) * sign;
                total = Some(total.map_or(apparent, |total| total + apparent));
            }
        }
        Some(total)
    }

    fn basis_of(&self, quantity: Quantity<'e>) -> Option<crate::graph::Basis> {
        self.engine.graph().node(quantity.id).basis.clone()
    }

    fn mean_density(&self) -> Option<Quantity<'e>> {
        let found = self.engine.graph().find(&format!("{}.air.density", self.block.name()));
        found.map(|id| self.engine.at(id))
    }

    /// Difference, mass and conventional mass of weight number `index`.
    fn name_results(
        &self,
        index: usize,
        corrected: Quantity<'e>,
        indications: Quantity<'e>,
    ) -> Option<crate::graph::NodeId> {
        let (engine, load) = (self.engine, self.b[index]);
        let (name, label) = (load.weight.block.name(), load.weight.block.label());
        let total = self.comparator_bounds(index).into_iter().fold(corrected, |sum, bound| sum + bound);
        let added = self.added()?;
        let _scope = engine.builder.scope(&self.scope_name(index), Some(&substitution::METHOD.info));
        self.name_indication_difference(index, corrected, indications)?;
        let from_stated_volume = substitution::mass_difference(total, self.m_a, self.a.gradient, load.gradient, added);
        let difference = self.with_own_density(load, from_stated_volume)?;
        let basis_label = format!("mass difference {label} − {}", self.a.weight.block.label());
        let difference = difference.in_state(self.m_a.state()).result(
            "difference",
            &format!("Δm_{name}"),
            &basis_label,
            &unit("mg"),
        );
        if self.a_is_known {
            let mass =
                (self.m_a + difference).result("mass", &format!("m_{name}"), &format!("mass of {label}"), &unit("kg"));
            let density = load.weight.density(Some(mass))?;
            let _scope = engine.builder.scope("", Some(&conventional_mass::METHOD.info));
            conventional_mass::from_mass(&engine.builder, mass, density).result(
                "conventional_mass",
                &format!("m_c,{name}"),
                &format!("conventional mass of {label}"),
                &unit("kg"),
            );
        }
        Some(difference.id)
    }

    /// A weight of stated density displaces m/ρ, not the nominal mass over ρ that the rows were corrected with:
    /// m_b = m_0 + (m_b0 − m_0) / (1 − ρ_a/ρ_b).
    fn with_own_density(&self, load: Load<'e>, difference: Quantity<'e>) -> Option<Quantity<'e>> {
        if load.weight.block.fields().get("volume").is_some() {
            return Some(difference);
        }
        let ratio = self.mean_density()?.as_kind(Kind::Plain) / load.weight.density(None)?.as_kind(Kind::Plain);
        let departure = (self.m_a.as_kind(Kind::Plain) - load.weight.nominal()?.as_kind(Kind::Plain))
            + difference.as_kind(Kind::Plain);
        Some((difference.as_kind(Kind::Plain) + departure * (ratio / (1.0 - ratio))).as_kind(Kind::MassDifference))
    }

    /// The part of the difference seen by the comparator, and the buoyancy added to it.
    fn name_indication_difference(
        &self,
        index: usize,
        corrected: Quantity<'e>,
        indications: Quantity<'e>,
    ) -> Option<()> {
        let weights = self.row_weights(index)?;
        let columns: Vec<(u32, f64)> = weights.iter().map(|(row, weight)| (*row as u32, *weight)).collect();
        let label = self.b[index].weight.block.label();
        let seen = indications.mix(vec![columns]).row(0).as_kind(Kind::MassDifference);
        let seen = seen.result(
            "indication_difference",
            "k ΔI",
            &format!("mean difference of the indications with {label}, in mass"),
            &unit("mg"),
        );
        let buoyancy = (corrected.as_kind(Kind::Plain) - seen.as_kind(Kind::Plain)).as_kind(Kind::MassDifference);
        buoyancy.result("buoyancy", "B", &format!("buoyancy correction of the difference with {label}"), &unit("mg"));
        Some(())
    }

    /// How each row enters the mean difference of weight number `index`.
    fn row_weights(&self, index: usize) -> Option<Vec<(usize, f64)>> {
        let graph = self.engine.graph();
        let path = format!("{}.corrected_difference", self.scope_name(index));
        let Op::Output(EstimatorId(estimator), output) = graph.node(graph.find(&path)?).op else { return None };
        let jacobian = &graph.estimators[estimator as usize].estimate.jacobian[0][output as usize];
        Some(jacobian.iter().copied().enumerate().filter(|(_, weight)| *weight != 0.0).collect())
    }

    fn warn_of_few_readings(&self, corrected: Quantity<'e>) {
        let graph = self.engine.graph();
        let Op::Output(EstimatorId(estimator), _) = graph.node(corrected.id).op else { return };
        let freedom = graph.estimators[estimator as usize].estimate.degrees_of_freedom;
        drop(graph);
        if freedom <= 2.0 {
            let message = format!(
                "The Type A evaluation of {} has {freedom} degrees of freedom; a t distribution with so few has no variance.",
                self.block.name()
            );
            let problem = Problem::new(Code::FewReadings, message)
                .hint("Weigh more series, or use the comparator's repeatability: `type_a: pooled`.");
            self.engine.complain(problem, self.block.fields().place_of("type_a"));
        }
    }

    /// Keeps what the report shows.
    fn store(&self, y: Quantity<'e>, found: &[Quantity<'e>], differences: Vec<crate::graph::NodeId>) {
        let rows = y.rows();
        let cycle_result = |cycle: &Cycle| CycleResult {
            series: cycle.series,
            cycle: cycle.number,
            start: cycle.times.first().copied().unwrap_or(f64::NAN),
            differences: self.cycle_differences(cycle, &rows),
            excluded: cycle.excluded,
        };
        let decisions = {
            let graph = self.engine.graph();
            match graph.node(found[0].id).op {
                Op::Output(estimator, _) => graph.estimators[estimator.index()]
                    .estimate
                    .decisions
                    .iter()
                    .map(|d| (d.what.clone(), d.decided.clone()))
                    .collect(),
                _ => Vec::new(),
            }
        };
        let comparison = Comparison {
            a: self.a.weight.block.label(),
            b: self.b.iter().map(|load| load.weight.block.label()).collect(),
            comparator: self.comparator.block.label(),
            ambient: self.block.fields().text("ambient").map(|text| text.text),
            scheme: self.block.fields().words("cycle"),
            unit: self.weighings.unit.clone(),
            weighings: self.weighings.list.clone(),
            indications: self.weighings.indications.rows(),
            cycles: self.cycles.iter().map(cycle_result).collect(),
            excluded: self.excluded.clone(),
            with_and_without: self.with_all_cycles(&rows).map(|all| (all, found[0].number())),
            differences,
            decisions,
            source: self.weighings.source(self.engine),
        };
        self.engine.store(self.block.name(), comparison);
    }

    fn cycle_differences(&self, cycle: &Cycle, y: &[f64]) -> Vec<f64> {
        if self.several {
            let (Some(first), Some(last)) = (cycle.rows.first(), cycle.rows.last()) else { return Vec::new() };
            let reference = (y[*first] + y[*last]) / 2.0;
            return cycle.rows[1..cycle.rows.len() - 1].iter().map(|row| y[*row] - reference).collect();
        }
        weighing_cycle::cycle_weights(cycle)
            .map_or(Vec::new(), |weights| vec![weights.iter().map(|(row, weight)| weight * y[*row]).sum()])
    }

    /// The mean corrected difference had no cycle been left out.
    fn with_all_cycles(&self, y: &[f64]) -> Option<f64> {
        if self.excluded.is_empty() || self.several {
            return None;
        }
        let all: Vec<Cycle> = self.cycles.iter().cloned().map(|cycle| Cycle { excluded: false, ..cycle }).collect();
        let known = Dispersion::PooledCycle { standard_deviation: 0.0, degrees_of_freedom: f64::INFINITY };
        let rule = MeanDifference::new(&all, known).ok()?;
        crate::graph::Estimator::estimate(&rule, &[y]).ok()?.values.first().copied()
    }
}

fn pans_of(scheme: Scheme) -> Vec<u32> {
    scheme.order().iter().map(|b| u32::from(*b)).collect()
}

fn load<'e>(
    engine: &'e Engine<'e>,
    weight: Weight<'e>,
    mass: Option<Quantity<'e>>,
    gradient: Option<Quantity<'e>>,
    used_at: Place,
) -> Option<Load<'e>> {
    let volume = weight.volume(mass, used_at)?;
    if volume.expansion.is_none() {
        engine.builder.assume(
            format!("{}: thermal expansion neglected, because no coefficient is recorded", weight.block.label()),
            Some(weight.block.raw.name.place),
        );
    }
    let gradient = match (gradient, weight.mass_centre_height()) {
        (Some(gradient), Some(height)) => gradient.as_kind(Kind::Plain) * height.as_kind(Kind::Plain),
        _ => {
            engine.builder.assume(
                format!("{}: difference in height of the mass centres neglected, because height or gradient of gravity is not recorded", weight.block.label()),
                Some(weight.block.raw.name.place),
            );
            engine.builder.number(0.0)
        }
    };
    Some(Load { weight, volume, gradient })
}

/// The cycles left out, with their rules.
fn left_out(engine: &Engine<'_>, fields: Fields<'_>, day: NaiveDate) -> Option<Vec<Excluded>> {
    let mut excluded = Vec::new();
    let of_data =
        fields.mappings("excluded").into_iter().map(|cycle| (cycle.number("series").unwrap_or(1.0) as u32, cycle));
    let of_series = fields.mappings("series").into_iter().enumerate().flat_map(|(index, series)| {
        series.mappings("excluded").into_iter().map(move |cycle| (index as u32 + 1, cycle))
    });
    for (series, cycle) in of_data.chain(of_series) {
        let name = cycle.text("rule")?;
        let rule = engine.block(&name, &["rule"])?;
        if let Some(date) = rule.fields().date("date").filter(|date| *date > day) {
            let message =
                format!("The rule {} is dated {date}, after the weighing of {day} that it judges.", name.text);
            engine.complain(
                Problem::new(Code::RuleDated, message)
                    .hint("A cycle is left out only by a rule laid down before the data."),
                name.place,
            );
            return None;
        }
        excluded.push(Excluded {
            series,
            cycle: cycle.number("cycle")? as u32,
            rule: name.text,
            rule_text: rule.fields().words("text"),
            reason: cycle.words("reason"),
        });
    }
    Some(excluded)
}

/// Air density, temperature and pressure at each weighing.
fn surroundings<'e>(engine: &'e Engine<'e>, block: &Block, weighings: &Weighings<'e>) -> Option<Surroundings<'e>> {
    let fields = block.fields();
    if let Some(given) = fields.given("air_density", Kind::Density) {
        let density = engine.given(
            &given,
            &format!("{}.stated_air_density", block.name()),
            "ρ_a",
            "stated density of the air",
            Kind::Density,
        )?;
        let temperature = match fields.given("air_temperature", Kind::Temperature) {
            Some(given) => Some(engine.given(
                &given,
                &format!("{}.stated_air_temperature", block.name()),
                "t",
                "stated temperature of the air",
                Kind::Temperature,
            )?),
            None => None,
        };
        return Some(Surroundings { density, temperature, pressure: None });
    }
    let name = fields.text("ambient")?;
    let logged = LoggedAir::find(engine, &name, name.place)?;
    let times: Vec<f64> = weighings.list.iter().map(|weighing| weighing.time).collect();
    let air = logged.at(&times, |row| weighings.place(engine, row))?;
    let _scope = engine.builder.scope(&format!("{}.air", block.name()), Some(&air_density::METHOD.info));
    let label = format!("air density at the weighings of {}", block.name());
    let density =
        air_density::density(&engine.builder, air).result("density_at_weighings", "ρ_i", &label, &unit("kg/m3"));
    Some(Surroundings { density, temperature: Some(air.temperature), pressure: Some(air.pressure) })
}
