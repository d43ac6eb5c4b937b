//! Weighing phase of a two-mode balance: samples with and without the artefact, to currents and gravity.

use super::apparatus::Apparatus;
use super::engine::{Block, Engine, shorten};
use super::field::{Field, Shape, needed, optional};
use super::gravity_station::GravityStation;
use super::phase::{PhaseData, WantedColumn, mean_of};
use super::resistor::Resistor;
use super::voltage_standard::VoltageStandard;
use super::{BlockKind, Output, no_check};
use crate::diagnostic::{Code, Problem};
use crate::graph::NodeId;
use crate::method::tare_fit::TareState;
use crate::method::{coil_current, compensated_voltage, unit};
use crate::numeric::sum::sum;
use crate::quantity::Kind;
use crate::record::Text;
use std::rc::Rc;

/// Fields.
const FIELDS: &[Field] = &[
    optional("label", Shape::Text, "what is printed for it"),
    needed(
        "data",
        Shape::Name,
        "raw data with columns time, state_number, state, position, beam, steps, null, resistor_temperature, pressure, vacuum_pressure, vacuum_temperature",
    ),
    needed("artefact", Shape::Name, "the mass standard or item on the pan"),
    needed("voltage_standard", Shape::Name, "the voltage standard"),
    needed("resistor", Shape::Name, "the resistor"),
    needed("apparatus", Shape::Name, "the apparatus"),
    needed("gravity", Shape::Name, "the gravity station"),
    needed("mass_centre", Shape::Value(Kind::Height), "mass centre of the artefact above the mark"),
    optional(
        "position",
        Shape::Value(Kind::Length),
        "the weighing position of the coil; the mean position unless written",
    ),
];

/// A weighing phase.
pub static KIND: BlockKind = BlockKind {
    name: "weighing-phase",
    meaning: "the weighing phase of a determination: states with and without the artefact",
    fields: FIELDS,
    outputs: &[
        Output { path: "current", meaning: "current through the coil, sample by sample", unit: "mA" },
        Output { path: "current_off", meaning: "mean current without the artefact", unit: "mA" },
        Output { path: "current_on", meaning: "mean current with the artefact", unit: "mA" },
        Output { path: "asymmetry", meaning: "sum of both, zero for balanced currents", unit: "µA" },
        Output {
            path: "gravity.mean",
            meaning: "gravitational acceleration at the artefact, mean; its effects beside it",
            unit: "m s⁻²",
        },
        Output { path: "mean_resistance", meaning: "resistance in use, mean", unit: "Ω" },
        Output { path: "residual_pressure", meaning: "pressure of the residual gas, mean", unit: "Pa" },
        Output { path: "residual_temperature", meaning: "temperature of the residual gas, mean", unit: "°C" },
    ],
    check: no_check,
    build: |engine, block| {
        let _ = build(shorten(engine), block);
    },
};

const fn wanted(
    name: &'static str,
    symbol: &'static str,
    label: &'static str,
    kind: Kind,
    unit: &'static str,
    plausible: (f64, f64),
) -> WantedColumn {
    WantedColumn { name, symbol, label, kind, unit, plausible }
}

const STATE_NUMBER: WantedColumn = wanted("state_number", "s", "number of the state", Kind::Plain, "1", (0.0, 1e9));
const POSITION: WantedColumn = wanted("position", "z", "position of the coil", Kind::Plain, "m", (-1.0, 1.0));
const BEAM: WantedColumn = wanted("beam", "b", "position of the beam off null", Kind::Plain, "m", (-1e-3, 1e-3));
const STEPS: WantedColumn = wanted("steps", "n", "number of steps", Kind::Plain, "1", (-1e7, 1e7));
const NULL: WantedColumn = wanted("null", "U_null", "reading of the null meter", Kind::Plain, "V", (-0.1, 0.1));
const RESISTOR: WantedColumn =
    wanted("resistor_temperature", "T_R", "temperature of the resistor", Kind::Temperature, "°C", (273.15, 323.15));
const PRESSURE: WantedColumn =
    wanted("pressure", "p", "atmospheric pressure", Kind::Pressure, "Pa", (40_000.0, 115_000.0));
const VACUUM_PRESSURE: WantedColumn =
    wanted("vacuum_pressure", "p_v", "pressure in the chamber", Kind::Pressure, "Pa", (0.0, 1000.0));
const VACUUM_TEMPERATURE: WantedColumn =
    wanted("vacuum_temperature", "T_v", "temperature in the chamber", Kind::Temperature, "°C", (273.15, 323.15));

/// What a weighing phase found beyond its named quantities.
#[derive(Debug, Clone)]
pub struct WeighingPhase {
    /// Seconds since 1970, sample by sample.
    pub times: Vec<f64>,
    pub mean_time: f64,
    /// The weighing position, m.
    pub position: f64,
    /// Position of the coil in each sample, m.
    pub positions: Vec<f64>,
    pub states: Vec<TareState>,
    /// The rows of each state.
    pub rows: Vec<Vec<usize>>,
    pub current: NodeId,
    pub current_off: NodeId,
    pub current_on: NodeId,
    pub gravity: NodeId,
    /// Position of the beam, where it was read.
    pub beam: Option<NodeId>,
    pub gas_pressure: NodeId,
    pub gas_temperature: NodeId,
    pub artefact: Text,
    pub apparatus: Text,
}

impl WeighingPhase {
    /// The weighing phase of this name, built; complaints go to the engine.
    pub fn find(engine: &Engine, name: &Text) -> Option<Rc<WeighingPhase>> {
        let block = engine.block(name, &[KIND.name])?;
        engine.build(block.name(), name.place);
        engine.found(block.name())
    }
}

fn build<'e>(engine: &'e Engine<'e>, block: &'e Block) -> Option<()> {
    let (fields, name) = (block.fields(), block.name());
    let data = PhaseData::find(engine, name, &fields.text("data")?)?;
    let apparatus_name = fields.text("apparatus")?;
    let (times, states) = (data.times()?, States::read(&data)?);
    let positions = data.rows(&POSITION)?;
    let pressure = data.input(&PRESSURE)?;
    let temperature = data.input(&RESISTOR)?;
    let (steps, null) = (data.input(&STEPS)?, data.input(&NULL)?);
    let (gas_pressure, gas_temperature) = (data.input(&VACUUM_PRESSURE)?, data.input(&VACUUM_TEMPERATURE)?);
    let beam = if data.raw.has("beam") { Some(data.input(&BEAM)?) } else { None };
    let day = data.day(&times)?;
    let standard = VoltageStandard::find(engine, &fields.text("voltage_standard")?, day)?;
    let resistor = Resistor::find(engine, &fields.text("resistor")?)?;
    let apparatus = Apparatus::find(engine, &apparatus_name)?;
    let station = GravityStation::find(engine, &fields.text("gravity")?)?;
    let height = engine.given(
        &fields.given("mass_centre", Kind::Height)?,
        &format!("{name}.mass_centre"),
        "h_m",
        &format!("mass centre above the mark in {name}"),
        Kind::Height,
    )?;
    let mean_time = sum(times.iter().copied()) / times.len() as f64;
    let voltage = {
        let _scope = engine.builder.scope(name, Some(&compensated_voltage::METHOD.info));
        compensated_voltage::compensated_voltage(
            steps,
            standard.step_voltage,
            apparatus.properties.null_gain_weighing,
            null,
        )
        .result("voltage", "V", &format!("voltage across the resistor in {name}"), &unit("V"))
    };
    let resistance = resistor.at(mean_time, temperature, pressure, voltage)?;
    let gravity = station.at(height, &times, Some(pressure), name)?;
    let _scope = engine.builder.scope(name, Some(&coil_current::METHOD.info));
    let current = coil_current::current(voltage, resistance, apparatus.properties.leakage).result(
        "current",
        "I",
        &format!("current through the coil in {name}"),
        &unit("mA"),
    );
    let of = |on: bool| -> Vec<usize> {
        let chosen = states.states.iter().zip(&states.rows).filter(|(state, _)| state.on == on);
        chosen.flat_map(|(_, rows)| rows.iter().copied()).collect()
    };
    let off =
        mean_of(current, &of(false)).result("current_off", "I_off", "mean current without the artefact", &unit("mA"));
    let on = mean_of(current, &of(true)).result("current_on", "I_on", "mean current with the artefact", &unit("mA"));
    (off + on).result("asymmetry", "I_off + I_on", "asymmetry of the currents", &unit("µA"));
    resistance.mean().result("mean_resistance", "R", &format!("resistance in use, mean of {name}"), &unit("ohm"));
    let gas_pressure = (apparatus.properties.vacuum_gauge_factor * gas_pressure.mean()).result(
        "residual_pressure",
        "p_v",
        &format!("pressure of the residual gas, mean of {name}"),
        &unit("Pa"),
    );
    let gas_temperature = gas_temperature.mean().result(
        "residual_temperature",
        "T_v",
        &format!("temperature of the residual gas, mean of {name}"),
        &unit("°C"),
    );
    let position = match fields.given("position", Kind::Length) {
        Some(given) => engine
            .given(&given, &format!("{name}.position"), "z_w", &format!("weighing position of {name}"), Kind::Length)?
            .number(),
        None => {
            let mean = sum(positions.iter().copied()) / positions.len() as f64;
            let text =
                format!("{name}: the weighing position is the mean position of its samples, {:.4} mm", mean * 1e3);
            engine.builder.assume(text, Some(block.raw.name.place));
            mean
        }
    };
    let tare = states.tare_states(&times);
    engine.store(
        name,
        WeighingPhase {
            mean_time,
            position,
            positions,
            states: tare,
            rows: states.rows,
            current: current.id,
            current_off: off.id,
            current_on: on.id,
            gravity: gravity.id,
            beam: beam.map(|beam| beam.id),
            gas_pressure: gas_pressure.id,
            gas_temperature: gas_temperature.id,
            artefact: fields.text("artefact")?,
            apparatus: apparatus_name,
            times,
        },
    );
    Some(())
}

/// The states of a weighing: rows with one state number.
struct States {
    rows: Vec<Vec<usize>>,
    states: Vec<TareState>,
}

impl States {
    fn read(data: &PhaseData<'_>) -> Option<States> {
        let numbers = data.rows(&STATE_NUMBER)?;
        let words = data.raw.texts(data.engine, "state")?;
        if let Some(row) = words.iter().position(|word| word != "on" && word != "off") {
            let message = format!("The state “{}” is neither on nor off.", words[row]);
            let problem = Problem::new(Code::CellUnreadable, message);
            data.engine
                .complain(problem.hint("Write on with the artefact on the pan, off without it."), data.line(row));
            return None;
        }
        let steps = data.rows(&STEPS)?;
        check_reversal(data, words, &steps)?;
        let mut rows: Vec<Vec<usize>> = Vec::new();
        let mut states = Vec::new();
        for row in 0..numbers.len() {
            if row == 0 || numbers[row] != numbers[row - 1] {
                rows.push(Vec::new());
                states.push(TareState { time: 0.0, on: words[row] == "on" });
            }
            rows.last_mut()?.push(row);
        }
        Some(States { rows, states })
    }

    /// The states with their mean times.
    fn tare_states(&self, times: &[f64]) -> Vec<TareState> {
        let mean = |rows: &Vec<usize>| sum(rows.iter().map(|row| times[*row])) / rows.len() as f64;
        self.states.iter().zip(&self.rows).map(|(state, rows)| TareState { time: mean(rows), on: state.on }).collect()
    }
}

/// The current changes its sign with the state, in every sample.
fn check_reversal(data: &PhaseData<'_>, words: &[String], steps: &[f64]) -> Option<()> {
    let balance = |word: &str| {
        let chosen = words.iter().zip(steps).filter(|(state, _)| *state == word);
        chosen.map(|(_, steps)| if *steps < 0.0 { -1.0 } else { 1.0 }).sum::<f64>()
    };
    let sign_off = if balance("off") < 0.0 { -1.0 } else { 1.0 };
    if balance("on") * balance("off") >= 0.0 {
        let message = "The number of steps has one sign with and without the artefact: the current is not reversed.";
        let problem = Problem::new(Code::SignContradicts, message);
        data.engine
            .complain(problem.hint("Check the column of states and the sign of the steps."), data.column("steps"));
        return None;
    }
    let mut sound = Some(());
    for row in 0..steps.len() {
        let expected = if words[row] == "off" { sign_off } else { -sign_off };
        if steps[row] * expected <= 0.0 {
            let message = format!(
                "The state is {}, but the number of steps is {}: its sign is that of the other state.",
                words[row], steps[row]
            );
            let problem = Problem::new(Code::SignContradicts, message);
            data.engine
                .complain(problem.hint("Correct the state or the sign of the steps in this row."), data.line(row));
            sound = None;
        }
    }
    sound
}
