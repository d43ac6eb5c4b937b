//! Moving phase of a two-mode balance: gates of velocity and voltage to the geometric factor.

use super::apparatus::Apparatus;
use super::engine::{Block, Engine, shorten};
use super::field::{Field, Shape, needed, optional};
use super::fields::Fields;
use super::laser::Laser;
use super::moving_checks::Gates;
use super::phase::{PhaseData, WantedColumn};
use super::time_base::TimeBase;
use super::voltage_standard::VoltageStandard;
use super::weighing_phase::WeighingPhase;
use super::{BlockKind, Output};
use crate::diagnostic::{Code, Complaints, Problem};
use crate::graph::{Decision, Distribution, Estimator, NodeId, Quantity};
use crate::intake::Place;
use crate::method::parasitic_motion::{Parasitic, parasitic_power};
use crate::method::profile_fit::{self, ProfileFit, choose_order};
use crate::method::{
    abbe_offset, compensated_voltage, interferometer_velocity, laser_alignment, parasitic_motion,
    residual_gas_buoyancy, unit,
};
use crate::quantity::{Dimension, Kind};
use crate::record::{Node, Text};
use std::rc::Rc;
use std::sync::Arc;

const SEARCH_FIELDS: &[Field] = &[
    needed("largest", Shape::Number, "the largest order that is tried"),
    needed("confidence", Shape::Number, "the level of the F tests, such as 0.99"),
];

const SPREAD_FIELDS: &[Field] = &[
    needed("orders", Shape::Numbers, "the orders that could be defended"),
    optional("half_widths", Shape::Numbers, "half widths of windows about the weighing position, in mm"),
];

const GAS_FIELDS: &[Field] = &[
    needed("pressure", Shape::Value(Kind::Pressure), "pressure of the residual gas, as indicated"),
    needed("temperature", Shape::Value(Kind::Temperature), "temperature of the residual gas"),
];

const OUTLIER_FIELDS: &[Field] = &[
    needed("rule", Shape::Name, "the rule, dated before the data"),
    needed("limit", Shape::Number, "rows whose residual exceeds this multiple of the standard deviation are left out"),
];

/// A moving phase.
pub static KIND: BlockKind = BlockKind {
    name: "moving-phase",
    meaning: "the moving phase of a determination: sweeps of the coil, gate by gate",
    fields: &[
        optional("label", Shape::Text, "what is printed for it"),
        needed("data", Shape::Name, "raw data with columns sweep, direction, time, position, fringes, steps, null"),
        needed("gate", Shape::Value(Kind::Duration), "nominal length of a gate"),
        optional("weighing", Shape::Name, "the weighing phase whose position and mean time the profile is taken at"),
        optional("position", Shape::Value(Kind::Length), "the position, without a weighing phase"),
        needed("laser", Shape::Name, "the laser"),
        needed("time_base", Shape::Name, "the time base of the gates"),
        needed("voltage_standard", Shape::Name, "the voltage standard"),
        needed("apparatus", Shape::Name, "the apparatus"),
        optional("residual_gas", Shape::Mapping(GAS_FIELDS), "the residual gas; that of the weighing unless written"),
        needed(
            "order",
            Shape::Either(&Shape::Number, &Shape::Mapping(SEARCH_FIELDS)),
            "order of the profile: a number, or a rule",
        ),
        optional("spread", Shape::Mapping(SPREAD_FIELDS), "carry the spread over orders and windows as a component"),
        optional("outliers", Shape::Mapping(OUTLIER_FIELDS), "leave rows out by a rule"),
    ],
    outputs: &[
        Output { path: "velocity", meaning: "vertical velocity, gate by gate", unit: "mm s⁻¹" },
        Output { path: "coil_voltage", meaning: "voltage that belongs to the vertical force, gate by gate", unit: "V" },
        Output { path: "geometric_factor", meaning: "geometric factor at weighing position and time", unit: "T m" },
        Output { path: "coefficient_1, coefficient_2, …", meaning: "coefficients of the profile", unit: "T m/mᵏ" },
        Output { path: "drift", meaning: "drift of the geometric factor", unit: "T m h⁻¹" },
        Output { path: "thermal_voltage", meaning: "thermal voltage at the time of the weighing", unit: "µV" },
        Output { path: "thermal_voltage_drift", meaning: "its drift", unit: "µV h⁻¹" },
        Output { path: "alignment", meaning: "effect of the tilt of the beam on the velocity, relative", unit: "1" },
        Output { path: "abbe_error", meaning: "Abbe error of the velocity, relative", unit: "1" },
        Output { path: "parasitic_power", meaning: "power beside vertical force and velocity, relative", unit: "1" },
        Output { path: "refractive_index", meaning: "refractive index of the residual gas", unit: "1" },
        Output { path: "geometric_factor_with_all", meaning: "the same with the rows left out kept", unit: "T m" },
    ],
    check,
    build: |engine, block| {
        let _ = Work::start(shorten(engine), block).and_then(|work| work.finish());
    },
};

const fn wanted(
    name: &'static str,
    symbol: &'static str,
    label: &'static str,
    unit: &'static str,
    plausible: (f64, f64),
) -> WantedColumn {
    WantedColumn { name, symbol, label, kind: Kind::Plain, unit, plausible }
}

const SWEEP: WantedColumn = wanted("sweep", "s", "number of the sweep", "1", (-1e9, 1e9));
const DIRECTION: WantedColumn = wanted("direction", "d", "direction of the sweep", "1", (-1.0, 1.0));
const POSITION: WantedColumn = wanted("position", "z", "position of the coil", "m", (-1.0, 1.0));
const FRINGES: WantedColumn = wanted("fringes", "N", "fringes in a gate", "1", (-1e9, 1e9));
const STEPS: WantedColumn = wanted("steps", "n", "number of steps", "1", (-1e7, 1e7));
const NULL: WantedColumn = wanted("null", "U_null", "reading of the null meter", "V", (-1e3, 1e3));

/// What a moving phase found beyond its named quantities.
#[derive(Debug, Clone)]
pub struct MovingPhase {
    /// b_0, b_1, … about `position` at `time`.
    pub coefficients: Vec<NodeId>,
    /// b_d, per second.
    pub drift: NodeId,
    /// m
    pub position: f64,
    /// The fit, with the gates used.
    pub rule: Arc<ProfileFit>,
    /// Seconds since 1970.
    pub time: f64,
    /// First and last gate, seconds since 1970.
    pub span: (f64, f64),
    pub alignment: NodeId,
    pub abbe_error: NodeId,
    pub parasitic_power: NodeId,
    pub refractive_index: NodeId,
    pub decisions: Vec<Decision>,
    /// The rows left out, by their lines, with the rule.
    pub left_out: Vec<Place>,
}

impl MovingPhase {
    /// Position of each gate used from the weighing position, m.
    pub fn offsets(&self) -> &[f64] {
        &self.rule.positions
    }

    /// The moving phase of this name, built; complaints go to the engine.
    pub fn find(engine: &Engine, name: &Text) -> Option<Rc<MovingPhase>> {
        let block = engine.block(name, &[KIND.name])?;
        engine.build(block.name(), name.place);
        engine.found(block.name())
    }
}

fn check(fields: Fields<'_>, complaints: &mut Complaints) {
    let whole = |number: f64, least: f64| number.fract() == 0.0 && (least..=12.0).contains(&number);
    let order = fields.number("order").or_else(|| fields.mapping("order")?.number("largest"));
    if let Some(order) = order.filter(|order| !whole(*order, 0.0)) {
        let problem = Problem::new(Code::OutOfRange, format!("The order {order} is not a whole number from 0 to 12."));
        complaints.add_at(problem.hint("Four is usual for a sweep of some centimetres."), fields.place_of("order"));
    }
    let orders = fields.mapping("spread").and_then(|spread| spread.get("orders")?.as_list()).unwrap_or_default();
    for item in orders {
        let order = item.as_text().and_then(|text| super::field::number(text).ok());
        if order.is_some_and(|order| !whole(order, 1.0)) {
            let message = "An order of the spread is not a whole number from 1 to 12.";
            complaints.add_at(Problem::new(Code::OutOfRange, message).hint("Write `orders: [4, 5, 6]`."), item.place);
        }
    }
    if fields.get("weighing").is_none() && fields.get("position").is_none() {
        let problem = Problem::new(Code::FieldMissing, "A moving phase needs weighing, or a position of its own.");
        complaints.add_at(problem.hint("Write `weighing: WP1`."), fields.place());
    }
    if fields.get("weighing").is_none() && fields.get("residual_gas").is_none() {
        let problem = Problem::new(Code::FieldMissing, "Without a weighing phase, residual_gas is needed.");
        complaints.add_at(problem.hint("Write `residual_gas: {pressure: …, temperature: …}`."), fields.place());
    }
}

/// Stands in the store once the tilts of an apparatus were warned of.
struct TiltsNoted;

struct Work<'e> {
    engine: &'e Engine<'e>,
    block: &'e Block,
    data: PhaseData<'e>,
    gates: Gates,
    weighing: Option<Rc<WeighingPhase>>,
    apparatus: Apparatus<'e>,
    apparatus_name: Text,
    laser: Laser<'e>,
    step_voltage: Quantity<'e>,
    offset: Quantity<'e>,
    gate: Quantity<'e>,
    position: f64,
    time: f64,
}

impl<'e> Work<'e> {
    fn start(engine: &'e Engine<'e>, block: &'e Block) -> Option<Work<'e>> {
        let (fields, name) = (block.fields(), block.name());
        let data = PhaseData::find(engine, name, &fields.text("data")?)?;
        let gates = Gates {
            times: data.times()?,
            sweeps: data.rows(&SWEEP)?.into_iter().map(|sweep| sweep as i64).collect(),
            directions: data.rows(&DIRECTION)?,
            positions: data.rows(&POSITION)?,
            fringes: data.rows(&FRINGES)?,
            steps: data.rows(&STEPS)?,
            null: data.rows(&NULL)?,
        };
        let day = data.day(&gates.times)?;
        let laser = Laser::find(engine, &fields.text("laser")?, day)?;
        let time_base = TimeBase::find(engine, &fields.text("time_base")?, day)?;
        let standard = VoltageStandard::find(engine, &fields.text("voltage_standard")?, day)?;
        let apparatus_name = fields.text("apparatus")?;
        let apparatus = Apparatus::find(engine, &apparatus_name)?;
        let weighing = match fields.text("weighing") {
            Some(name) => Some(WeighingPhase::find(engine, &name)?),
            None => None,
        };
        let given = |field: &str, symbol: &str, label: &str, kind: Kind| {
            let path = format!("{name}.{field}");
            engine.given(&fields.given(field, kind)?, &path, symbol, &format!("{label} of {name}"), kind)
        };
        let gate = given("gate", "τ", "nominal length of a gate", Kind::Duration)?;
        let position = match &weighing {
            Some(weighing) => weighing.position,
            None => given("position", "z_w", "weighing position", Kind::Length)?.number(),
        };
        let middle = (gates.times.first()? + gates.times.last()?) / 2.0;
        let time = weighing.as_ref().map_or(middle, |weighing| weighing.mean_time);
        Some(Work {
            engine,
            block,
            data,
            gates,
            weighing,
            apparatus,
            apparatus_name,
            laser,
            step_voltage: standard.step_voltage,
            offset: time_base.offset,
            gate,
            position,
            time,
        })
    }

    fn finish(self) -> Option<()> {
        let (gate, step) = (self.gate.number(), self.step_voltage.number());
        self.gates.check(&self.data, gate, self.laser.vacuum_wavelength.number() / 2.0, step)?;
        self.gates.check_weighing(&self.data, self.position, self.weighing.as_ref().map(|found| found.mean_time))?;
        let effects = self.effects()?;
        let (velocity, voltage) = (self.velocity(&effects)?, self.voltage(&effects)?);
        let (v, u) = (velocity.value(), voltage.value());
        let (v, u) = (v.rows(), u.rows());
        let rule = self.rule(v, u)?;
        let coefficients = self.fit(&rule, velocity, voltage, "")?;
        let fitted: Vec<f64> = coefficients.iter().map(|coefficient| coefficient.number()).collect();
        self.gates.check_steps(&self.data, v, &rule.without_shape(v, u, &fitted), step)?;
        let left_out = self.outliers()?;
        if left_out.is_empty() {
            let spread = self.spread(&rule, v, u)?;
            return self.name_results(&rule, coefficients, spread, effects, &left_out);
        }
        self.name_with_all(coefficients[0]);
        let kept: Vec<usize> = (0..v.len()).filter(|row| left_out.binary_search(row).is_err()).collect();
        let single = |column: Quantity<'e>| column.mix(kept.iter().map(|row| vec![(*row as u32, 1.0)]).collect());
        let (rule, velocity, voltage) = (Arc::new(rule.of_rows(&kept)), single(velocity), single(voltage));
        let coefficients = self.fit(&rule, velocity, voltage, ".kept")?;
        let spread = self.spread(&rule, &velocity.rows(), &voltage.rows())?;
        self.name_results(&rule, coefficients, spread, effects, &left_out)
    }

    fn name_with_all(&self, factor: Quantity<'e>) {
        let _scope = self.engine.builder.scope(self.block.name(), Some(&profile_fit::METHOD.info));
        let label = "geometric factor with the rows left out kept";
        factor.result("geometric_factor_with_all", "Bl_all", label, &unit("T m"));
    }

    fn keep<T>(&self, result: Result<T, Problem>) -> Option<T> {
        self.engine.keep(result, self.block.raw.name.place)
    }
}

/// What acts on velocity and voltage beside the readings.
#[derive(Clone, Copy)]
struct Effects<'e> {
    lengthening: Quantity<'e>,
    abbe_error: Quantity<'e>,
    parasitic_power: Quantity<'e>,
    refractive_index: Quantity<'e>,
}

impl<'e> Work<'e> {
    fn effects(&self) -> Option<Effects<'e>> {
        let (a, p, name) = (&self.apparatus.properties, &self.apparatus.parasitic, self.block.name());
        let one = unit("1");
        let builder = &self.engine.builder;
        let lengthening = {
            let _scope = builder.scope(name, Some(&laser_alignment::METHOD.info));
            let lengthening = laser_alignment::lengthening(a.beam_tilt_x, a.beam_tilt_y);
            self.note_tilts();
            (lengthening - 1.0).result("alignment", "θ²/2", "effect of the tilt of the beam on the velocity", &one);
            lengthening
        };
        let abbe_error = {
            let _scope = builder.scope(name, Some(&abbe_offset::METHOD.info));
            let turning = [p.angular_velocity_x, p.angular_velocity_y];
            abbe_offset::abbe_error(turning, [a.optical_offset_x, a.optical_offset_y]).result(
                "abbe_error",
                "a",
                "Abbe error of the velocity",
                &one,
            )
        };
        let parasitic_power = {
            let _scope = builder.scope(name, Some(&parasitic_motion::METHOD.info));
            let parasitic = Parasitic {
                force: [p.force_x, p.force_y],
                velocity: [p.velocity_x, p.velocity_y],
                torque: [p.torque_x, p.torque_y, p.torque_z],
                angular_velocity: [p.angular_velocity_x, p.angular_velocity_y, p.angular_velocity_z],
            };
            parasitic_power(&parasitic).result("parasitic_power", "ε", "power beside vertical force and velocity", &one)
        };
        let (pressure, temperature) = self.residual_gas()?;
        let _scope = builder.scope(name, Some(&residual_gas_buoyancy::METHOD.info));
        let refractive_index = residual_gas_buoyancy::refractive_index(
            pressure,
            temperature,
            a.residual_gas_refractivity,
        )
        .result("refractive_index", "n", "refractive index of the residual gas", &one);
        Some(Effects { lengthening, abbe_error, parasitic_power, refractive_index })
    }

    /// What first order leaves out of the cosine is said: the expectation of θ² is θ_0² + u², and its variance
    /// 4 θ_0² u² + 2 u⁴.
    fn note_tilts(&self) {
        let engine = self.engine;
        let tilts = [self.apparatus.properties.beam_tilt_x, self.apparatus.properties.beam_tilt_y];
        let uncertainty = |tilt: &Quantity<'e>| {
            engine.graph().input(tilt.id).map_or(0.0, |input| input.distribution.standard_uncertainty())
        };
        let (mut left, mut first, mut second) = (0.0, 0.0, 0.0);
        for tilt in &tilts {
            let (theta, u) = (tilt.number(), uncertainty(tilt));
            left += u * u / 2.0;
            first += theta * theta * u * u;
            second += u * u * u * u / 2.0;
        }
        if left <= 0.0 {
            return;
        }
        engine.builder.assume(
            format!(
                "tilt of the laser beam: corrected at its estimate; the expectation of its square would add {left:.1e} to the relative correction"
            ),
            None,
        );
        let widest = if uncertainty(&tilts[0]) >= uncertainty(&tilts[1]) { tilts[0] } else { tilts[1] };
        let place = engine.graph().node(widest.id).origin.place();
        if let Some(place) = place.filter(|_| second > 0.5 * first)
            && engine.found::<TiltsNoted>(&self.apparatus_name.text).is_none()
        {
            engine.store(&self.apparatus_name.text, TiltsNoted);
            let message = format!(
                "The laser beam is vertical within its uncertainty: first order gives its correction u = {:.1e}, with second order it is {:.1e}.",
                first.sqrt(),
                (first + second).sqrt()
            );
            let hint = "Judge the result by trials, `budget RESULT --trials 100000`, or find the tilt apart from zero.";
            engine.complain(Problem::new(Code::FirstOrderShort, message).hint(hint), place);
        }
    }

    /// True pressure and temperature of the residual gas.
    fn residual_gas(&self) -> Option<(Quantity<'e>, Quantity<'e>)> {
        let (engine, name) = (self.engine, self.block.name());
        if let Some(gas) = self.block.fields().mapping("residual_gas") {
            let given = |field: &str, symbol: &str, kind: Kind| {
                let path = format!("{name}.residual_gas.{field}");
                engine.given(&gas.given(field, kind)?, &path, symbol, &format!("{field} of the residual gas"), kind)
            };
            let indicated = given("pressure", "p_v", Kind::Pressure)?;
            return Some((
                self.apparatus.properties.vacuum_gauge_factor * indicated,
                given("temperature", "T_v", Kind::Temperature)?,
            ));
        }
        let weighing = self.weighing.as_ref()?;
        Some((engine.at(weighing.gas_pressure), engine.at(weighing.gas_temperature)))
    }

    /// The vertical velocity, gate by gate.
    fn velocity(&self, effects: &Effects<'e>) -> Option<Quantity<'e>> {
        let fringes = self.data.declare(&FRINGES, &self.gates.fringes)?;
        let _scope = self.engine.builder.scope(self.block.name(), Some(&interferometer_velocity::METHOD.info));
        let measured = interferometer_velocity::velocity(
            fringes,
            self.laser.frequency,
            self.offset,
            effects.refractive_index,
            self.gate.as_kind(Kind::Plain),
        );
        let vertical = measured * (effects.lengthening * (1.0 - effects.abbe_error));
        let label = format!("vertical velocity, gate by gate, in {}", self.block.name());
        Some(vertical.result("velocity", "v", &label, &unit("mm/s")))
    }

    /// The voltage that belongs to the vertical force, gate by gate.
    fn voltage(&self, effects: &Effects<'e>) -> Option<Quantity<'e>> {
        let (steps, null) =
            (self.data.declare(&STEPS, &self.gates.steps)?, self.data.declare(&NULL, &self.gates.null)?);
        let _scope = self.engine.builder.scope(self.block.name(), Some(&compensated_voltage::METHOD.info));
        let whole = compensated_voltage::compensated_voltage(
            steps,
            self.step_voltage,
            self.apparatus.properties.null_gain_moving,
            null,
        );
        let label = format!("voltage that belongs to the vertical force, gate by gate, in {}", self.block.name());
        Some((whole / (1.0 + effects.parasitic_power)).result("coil_voltage", "U", &label, &unit("V")))
    }

    /// The rule of the fit, its order chosen.
    fn rule(&self, velocity: &[f64], voltage: &[f64]) -> Option<Arc<ProfileFit>> {
        let fields = self.block.fields();
        let rule = ProfileFit {
            sweeps: self.gates.sweeps.clone(),
            positions: self.gates.positions.iter().map(|z| z - self.position).collect(),
            times: self.gates.times.iter().map(|t| t - self.time).collect(),
            gate: self.gate.number(),
            order: fields.number("order").unwrap_or(1.0) as usize,
            drift: true,
            decisions: Vec::new(),
        };
        match fields.mapping("order") {
            None => Some(Arc::new(rule)),
            Some(search) => {
                let (largest, confidence) = (search.number("largest")? as usize, search.number("confidence")?);
                self.keep(choose_order(&rule, velocity, voltage, largest, confidence)).map(Arc::new)
            }
        }
    }

    /// The rows that the rule for outliers leaves out, by the residuals of the fit just made.
    fn outliers(&self) -> Option<Vec<usize>> {
        let Some(outliers) = self.block.fields().mapping("outliers") else { return Some(Vec::new()) };
        let (rule, limit) = (outliers.text("rule")?, outliers.number("limit")?);
        let laid_down = self.engine.block(&rule, &["rule"])?.fields().date("date")?;
        let first = super::raw_data::epoch() + chrono::Duration::seconds(*self.gates.times.first()? as i64);
        if laid_down > first.date_naive() {
            let message = format!("The rule {} is dated {laid_down}, after the data it judges.", rule.text);
            let problem = Problem::new(Code::RuleDated, message);
            self.engine
                .complain(problem.hint("Rows are left out only by a rule laid down before the data."), rule.place);
            return None;
        }
        let graph = self.engine.graph();
        let all = &graph.estimators.last()?.estimate;
        let squares = crate::numeric::sum::sum(all.residuals.iter().map(|r| r * r));
        let deviation = (squares / all.degrees_of_freedom).sqrt();
        Some((0..all.residuals.len()).filter(|row| all.residuals[*row].abs() > limit * deviation).collect())
    }

    fn fit(
        &self,
        rule: &Arc<ProfileFit>,
        velocity: Quantity<'e>,
        voltage: Quantity<'e>,
        suffix: &str,
    ) -> Option<Vec<Quantity<'e>>> {
        let name = self.block.name();
        let base = voltage.dimension().over(velocity.dimension());
        let mut dimensions: Vec<Dimension> =
            (0..=rule.order).map(|k| Some(base.over(Dimension::LENGTH.power(k as i32)?))).collect::<Option<_>>()?;
        dimensions.push(base.over(Dimension::TIME));
        dimensions.push(voltage.dimension());
        dimensions.push(voltage.dimension().over(Dimension::TIME));
        let outputs: Vec<(Dimension, Kind)> = dimensions.into_iter().map(|one| (one, Kind::Plain)).collect();
        self.keep(self.engine.builder.estimator(
            Arc::<ProfileFit>::clone(rule),
            &[velocity, voltage],
            &outputs,
            &format!("{name}.scatter{suffix}"),
            &format!("scatter of the gates of {name}"),
        ))
    }

    /// The spread of the geometric factor over defensible orders and windows, as an input of estimate zero.
    ///
    /// Each phase has its own: what its spread shares with that of another phase is not known from the rows.
    fn spread(&self, rule: &ProfileFit, velocity: &[f64], voltage: &[f64]) -> Option<Option<Quantity<'e>>> {
        let Some(asked) = self.block.fields().mapping("spread") else { return Some(None) };
        let numbers = |name: &str| -> Vec<f64> {
            let items = asked.get(name).and_then(Node::as_list).unwrap_or_default();
            items.iter().filter_map(|item| super::field::number(item.as_text()?).ok()).collect()
        };
        let mut half_widths: Vec<f64> = numbers("half_widths").into_iter().map(|width| width * 1e-3).collect();
        half_widths.push(f64::INFINITY);
        let mut found = Vec::new();
        for order in numbers("orders") {
            for half_width in &half_widths {
                let rows: Vec<usize> =
                    (0..rule.positions.len()).filter(|row| rule.positions[*row].abs() <= *half_width).collect();
                let part = ProfileFit { order: order as usize, ..rule.of_rows(&rows) };
                let of = |column: &[f64]| -> Vec<f64> { rows.iter().map(|row| column[*row]).collect() };
                found.push(self.keep(part.estimate(&[&of(velocity), &of(voltage)]))?.values[0]);
            }
        }
        let place = self.block.fields().place_of("spread");
        let Some(deviation) = crate::numeric::sum::experimental_standard_deviation(&found) else {
            let problem = Problem::new(Code::DesignIncomplete, "A spread needs two orders or windows, or more.");
            self.engine.complain(problem.hint("Write `orders: [4, 5, 6]`."), place);
            return None;
        };
        let scale = crate::numeric::sum::mean(&found).map_or(f64::NAN, f64::abs);
        let name = self.block.name();
        Some(Some(self.engine.derived_input(
            &format!("{name}.profile_spread"),
            "δ_profile",
            &format!("spread of the geometric factor over {} orders and windows in {name}", found.len()),
            Kind::Plain,
            &unit("1"),
            Distribution::Normal { standard_uncertainty: deviation / scale },
            place,
        )))
    }

    fn name_results(
        &self,
        rule: &Arc<ProfileFit>,
        mut coefficients: Vec<Quantity<'e>>,
        spread: Option<Quantity<'e>>,
        effects: Effects<'e>,
        left_out: &[usize],
    ) -> Option<()> {
        let name = self.block.name();
        let _scope = self.engine.builder.scope(name, Some(&profile_fit::METHOD.info));
        let label = format!("geometric factor at weighing position and time in {name}");
        let fitted = coefficients[0];
        let factor = spread.map_or(fitted, |spread| fitted * (1.0 + spread));
        coefficients[0] = factor.result("geometric_factor", "Bl", &label, &unit("T m"));
        let order = rule.order;
        for (k, coefficient) in coefficients.iter().enumerate().take(order + 1).skip(1) {
            let shown = if k == 1 { unit("T") } else { unit(&format!("T/m{}", k - 1)) };
            let label = format!("coefficient of power {k} of the profile in {name}");
            coefficient.result(&format!("coefficient_{k}"), &format!("b_{k}"), &label, &shown);
        }
        let drift = coefficients[order + 1].result("drift", "b_d", "drift of the geometric factor", &unit("T m/h"));
        coefficients[order + 2].result("thermal_voltage", "E_0", "thermal voltage at the weighing", &unit("µV"));
        coefficients[order + 3].result("thermal_voltage_drift", "E_1", "drift of the thermal voltage", &unit("µV/h"));
        let decisions = self.engine.graph().estimators.last().map(|found| found.estimate.decisions.clone());
        self.engine.store(
            name,
            MovingPhase {
                coefficients: coefficients[..=order].iter().map(|coefficient| coefficient.id).collect(),
                drift: drift.id,
                position: self.position,
                rule: rule.clone(),
                time: self.time,
                span: (*self.gates.times.first()?, *self.gates.times.last()?),
                alignment: effects.lengthening.id,
                abbe_error: effects.abbe_error.id,
                parasitic_power: effects.parasitic_power.id,
                refractive_index: effects.refractive_index.id,
                decisions: decisions.unwrap_or_default(),
                left_out: left_out.iter().map(|row| self.data.line(*row)).collect(),
            },
        );
        Some(())
    }
}
