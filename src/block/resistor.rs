//! A resistor with its dated calibrations, its drift and its dependence on the conditions of use.

use super::calibration::check_dimension;
use super::engine::{Block, Engine, shorten};
use super::field::{Field, Shape, needed, optional};
use super::fields::Fields;
use super::given::Given;
use super::units_of_1990::{BASIS_SHAPE, CONVERSION_SHAPE, check_basis, is_of_1990, note_conversion};
use super::{BlockKind, Output};
use crate::diagnostic::{Code, Complaints, Problem};
use crate::graph::{Name, Quantity, Value, sensitivities, standard_uncertainty};
use crate::intake::Place;
use crate::method::resistor_line::{Environment, Load, METHOD, ResistorLine, in_use};
use crate::method::{conversion_1990, quantum_hall_resistance, unit};
use crate::quantity::{Kind, StatedUncertainty};
use crate::record::Text;
use chrono::{DateTime, NaiveDate, NaiveTime};
use std::sync::Arc;

const HALL_FIELDS: &[Field] = &[needed("plateau", Shape::Number, "the plateau i of the Hall resistance R_K/i")];

const CALIBRATION_FIELDS: &[Field] = &[
    needed("certificate", Shape::Text, "the certificate's number"),
    optional("issued_by", Shape::Text, "who issued it"),
    needed("date", Shape::Date, "the day of the calibration; it counts from 00:00 UTC unless its time is given"),
    optional("time", Shape::Instant, "the middle of the calibration"),
    optional("due", Shape::Date, "the day until which it may be used"),
    optional("ratio", Shape::Value(Kind::Plain), "ratio to the Hall resistance R_K/i, as the bridge indicates it"),
    optional("resistance", Shape::Value(Kind::Plain), "the resistance, where the certificate states it"),
    optional(
        "relative_uncertainty",
        Shape::Number,
        "relative standard uncertainty, when it does not stand with the value",
    ),
    optional(
        "temperature",
        Shape::Value(Kind::Temperature),
        "temperature of the resistor; the reference unless written",
    ),
    optional("pressure", Shape::Value(Kind::Pressure), "pressure of the air; the reference unless written"),
    optional("basis", BASIS_SHAPE, "the units of the certificate: SI unless written"),
    optional("conversion", CONVERSION_SHAPE, "carries a value of 1990 to the SI by the exact factor"),
];

/// A resistor.
pub static KIND: BlockKind = BlockKind {
    name: "resistor",
    meaning: "a resistor with dated calibrations, drift and coefficients",
    fields: &[
        optional("label", Shape::Text, "what is printed for it"),
        optional("identification", Shape::Text, "marking, serial number"),
        optional("quantum_hall", Shape::Mapping(HALL_FIELDS), "the Hall resistance that ratios refer to"),
        needed("calibrations", Shape::Mappings(CALIBRATION_FIELDS), "dated calibrations, before and after the use"),
        optional("bridge_error", Shape::Value(Kind::Plain), "relative error of the bridge, common to all ratios"),
        optional("reference_temperature", Shape::Value(Kind::Temperature), "temperature the line holds at"),
        optional("reference_pressure", Shape::Value(Kind::Pressure), "pressure the line holds at"),
        optional("temperature_coefficient", Shape::Value(Kind::Plain), "relative change with temperature"),
        optional("second_temperature_coefficient", Shape::Value(Kind::Plain), "and with its square"),
        optional("pressure_coefficient", Shape::Value(Kind::Plain), "relative change with pressure"),
        optional("load_coefficient", Shape::Value(Kind::Plain), "relative change with the power in it"),
        optional("calibration_power", Shape::Value(Kind::Plain), "the power at the calibrations"),
        optional("at", Shape::Instant, "the middle of the use; the middle of the calibrations unless written"),
        optional(
            "hold",
            Shape::Value(Kind::Plain),
            "relative change beyond the first or last calibration, zero with its bound",
        ),
        optional("source", Shape::Text, "where the coefficients come from"),
    ],
    outputs: &[
        Output {
            path: "resistance",
            meaning: "resistance at the reference conditions, in the middle of the use",
            unit: "Ω",
        },
        Output { path: "drift", meaning: "relative change with time", unit: "d⁻¹" },
    ],
    check,
    build: |engine, block| {
        let _ = build(shorten(engine), block);
    },
};

/// Stated coefficients with their units.
const COEFFICIENTS: &[(&str, &str)] = &[
    ("bridge_error", "1"),
    ("temperature_coefficient", "/K"),
    ("second_temperature_coefficient", "K-2"),
    ("pressure_coefficient", "/hPa"),
    ("load_coefficient", "/mW"),
    ("calibration_power", "mW"),
    ("hold", "1"),
];

fn check(fields: Fields<'_>, complaints: &mut Complaints) {
    for (field, unit) in COEFFICIENTS {
        check_dimension(fields, field, unit, *field == "bridge_error" || *field == "hold", complaints);
    }
    let mut need = |present: &str, needed: &str, hint: &str| {
        if fields.get(present).is_some() && fields.get(needed).is_none() {
            let problem = Problem::new(Code::FieldMissing, format!("A {present} needs {needed} beside it."));
            complaints.add_at(problem.hint(hint), fields.place_of(present));
        }
    };
    need("temperature_coefficient", "reference_temperature", "Write the temperature the line holds at.");
    need("second_temperature_coefficient", "reference_temperature", "Write the temperature the line holds at.");
    need("pressure_coefficient", "reference_pressure", "Write the pressure the line holds at.");
    need("load_coefficient", "calibration_power", "Write the power in the resistor at its calibrations.");
    if let Some(plateau) = plateau(fields)
        && (plateau < 1.0 || plateau.fract() != 0.0)
    {
        let problem = Problem::new(Code::OutOfRange, format!("The plateau {plateau} is not a whole number from 1."));
        let place = fields.mapping("quantum_hall").map_or(fields.place(), |hall| hall.place_of("plateau"));
        complaints.add_at(problem.hint("The usual plateaus are 2 and 4."), place);
    }
    for (index, calibration) in fields.mappings("calibrations").into_iter().enumerate() {
        check_calibration(fields, calibration, complaints);
        let earlier =
            fields.mappings("calibrations").into_iter().take(index).find(|one| seconds(*one) == seconds(calibration));
        if earlier.is_some() {
            let message = format!("Two calibrations are dated {}.", calibration.words("date"));
            let problem = Problem::new(Code::TimeUnreadable, message);
            complaints.add_at(
                problem.hint("Give their times, or their mean as one calibration."),
                calibration.place_of("date"),
            );
        }
    }
}

fn check_calibration(fields: Fields<'_>, calibration: Fields<'_>, complaints: &mut Complaints) {
    let certificate = calibration.words("certificate");
    check_basis(calibration, complaints);
    check_dimension(calibration, "ratio", "1", false, complaints);
    check_dimension(calibration, "resistance", "ohm", false, complaints);
    let (ratio, resistance) = (calibration.get("ratio"), calibration.get("resistance"));
    if ratio.is_some() == resistance.is_some() {
        let message = format!("The certificate {certificate} needs either a ratio or a resistance.");
        complaints.add_at(Problem::new(Code::FieldMissing, message), calibration.place());
    }
    if ratio.is_some() && fields.get("quantum_hall").is_none() {
        let problem = Problem::new(Code::FieldMissing, format!("The ratio of {certificate} refers to no plateau."));
        complaints.add_at(problem.hint("Write `quantum_hall: {plateau: 2}`."), calibration.place_of("ratio"));
    }
    if ratio.is_some() && is_of_1990(calibration) {
        let message = format!("A ratio needs no unit, but {certificate} is said to be on the basis 1990.");
        let problem = Problem::new(Code::ElectricBasis, message);
        complaints
            .add_at(problem.hint("Leave the basis out: R_K is computed from h and e."), calibration.place_of("basis"));
    }
    let field = if ratio.is_some() { "ratio" } else { "resistance" };
    let relative = calibration.number("relative_uncertainty");
    if let Some(Given::Stated { value, place }) = calibration.given(field, Kind::Plain) {
        let own = value.standard_uncertainty().is_some();
        if own && relative.is_some() {
            let message = format!("The certificate {certificate} states an uncertainty twice.");
            complaints
                .add_at(Problem::new(Code::DoubleUncertainty, message), calibration.place_of("relative_uncertainty"));
        } else if !own && relative.is_none_or(|relative| relative <= 0.0) {
            let message = format!("The {field} of certificate {certificate} has no uncertainty.");
            let problem = Problem::new(Code::UncertaintyMissing, message);
            complaints.add_at(problem.hint("Write it with the value, or as `relative_uncertainty: 1.2e-9`."), place);
        }
    }
}

fn plateau(fields: Fields<'_>) -> Option<f64> {
    fields.mapping("quantum_hall")?.number("plateau")
}

/// When a calibration was made, in seconds since 1970.
fn seconds(calibration: Fields<'_>) -> Option<f64> {
    let stated = calibration.instant("time").map(|time| time.timestamp());
    let of_day = || Some(calibration.date("date")?.and_time(NaiveTime::MIN).and_utc().timestamp());
    stated.or_else(of_day).map(|seconds| seconds as f64)
}

/// Times of the calibrations in their order, in seconds since 1970.
fn times(fields: Fields<'_>) -> Option<Vec<f64>> {
    fields.mappings("calibrations").into_iter().map(seconds).collect()
}

/// The first and the last calibration, in seconds since 1970.
fn span(fields: Fields<'_>) -> Option<(f64, f64)> {
    let times = times(fields)?;
    let least = |so_far: Option<f64>, time: &f64| Some(so_far.map_or(*time, |least| least.min(*time)));
    let most = |so_far: Option<f64>, time: &f64| Some(so_far.map_or(*time, |most| most.max(*time)));
    Some((times.iter().fold(None, least)?, times.iter().fold(None, most)?))
}

/// A use outside the dates of the calibrations.
fn one_sided(name: &str, seconds: f64, (first, last): (f64, f64)) -> Problem {
    let dates = match day(first) == day(last) {
        true => day(first).to_string(),
        false => format!("{} to {}", day(first), day(last)),
    };
    let message = format!("{name} was used on {}, but its calibrations are of {dates}.", day(seconds));
    Problem::new(Code::CalibrationsOneSided, message)
}

/// The time that `resistance` holds at, in seconds since 1970.
fn reference_time(fields: Fields<'_>) -> Option<f64> {
    let stated = fields.instant("at").map(|time| time.timestamp() as f64);
    stated.or_else(|| crate::numeric::sum::mean(&times(fields)?))
}

/// What is stated of a resistor, as quantities; neutral where nothing is.
struct Stated<'e> {
    engine: &'e Engine<'e>,
    block: &'e Block,
}

impl<'e> Stated<'e> {
    fn value(&self, field: &str, symbol: &str, words: &str, text: &str, kind: Kind) -> Option<Quantity<'e>> {
        let (engine, name) = (self.engine, self.block.name());
        match self.block.fields().given(field, kind) {
            Some(given) => engine.given(
                &given,
                &format!("{name}.{field}"),
                symbol,
                &format!("{words} of {}", self.block.label()),
                kind,
            ),
            None => Some(engine.builder.exact(Value::Scalar(0.0), unit(text).dimension(), kind)),
        }
    }

    fn environment(&self) -> Option<Environment<'e>> {
        Some(Environment {
            reference_temperature: self.value(
                "reference_temperature",
                "T_0",
                "reference temperature",
                "K",
                Kind::Temperature,
            )?,
            reference_pressure: self.value("reference_pressure", "p_0", "reference pressure", "Pa", Kind::Pressure)?,
            temperature_coefficient: self.value(
                "temperature_coefficient",
                "a_R",
                "temperature coefficient",
                "/K",
                Kind::Plain,
            )?,
            second_temperature_coefficient: self.value(
                "second_temperature_coefficient",
                "b_R",
                "second temperature coefficient",
                "K-2",
                Kind::Plain,
            )?,
            pressure_coefficient: self.value(
                "pressure_coefficient",
                "c_R",
                "pressure coefficient",
                "/Pa",
                Kind::Plain,
            )?,
        })
    }

    fn load(&self) -> Option<Load<'e>> {
        Some(Load {
            coefficient: self.value("load_coefficient", "k_P", "load coefficient", "/W", Kind::Plain)?,
            calibration_power: self.value(
                "calibration_power",
                "P_cal",
                "power at the calibrations",
                "W",
                Kind::Plain,
            )?,
        })
    }

    /// The resistance of one calibration at the reference conditions, and the standard uncertainty that weights it.
    fn calibrated(
        &self,
        index: usize,
        calibration: Fields<'_>,
        environment: &Environment<'e>,
    ) -> Option<(Quantity<'e>, f64)> {
        let (engine, name) = (self.engine, self.block.name());
        let of = format!("{}, certificate {}", self.block.label(), calibration.words("certificate"));
        let input = |field: &str, symbol: &str, kind: Kind| {
            let path = format!("{name}.{field}_{}", index + 1);
            let mut given = calibration.given(field, kind)?;
            if matches!(field, "ratio" | "resistance") {
                given = with_relative(given, calibration);
            }
            engine.given(
                &given,
                &path,
                &format!("{symbol}_{}", index + 1),
                &format!("{} of {of}", field.replace('_', " ")),
                kind,
            )
        };
        let (stated, measured) = match calibration.get("ratio") {
            Some(_) => {
                let _scope = engine.builder.scope("", Some(&quantum_hall_resistance::METHOD.info));
                let ratio = input("ratio", "r", Kind::Plain)?;
                let bridge = self.value("bridge_error", "b", "bridge error", "1", Kind::Plain)?;
                (ratio, quantum_hall_resistance::resistance(ratio, plateau(self.block.fields())?, bridge))
            }
            None => {
                let certified = input("resistance", "R", Kind::Plain)?;
                (certified, self.in_si(index, calibration, certified))
            }
        };
        let mut factor = engine.builder.number(1.0);
        if calibration.get("temperature").is_some() || calibration.get("pressure").is_some() {
            let or = |given: Option<Quantity<'e>>, reference: Quantity<'e>| given.unwrap_or(reference);
            let temperature = calibration.get("temperature").and_then(|_| input("temperature", "T", Kind::Temperature));
            let pressure = calibration.get("pressure").and_then(|_| input("pressure", "p", Kind::Pressure));
            factor = environment.factor(
                or(temperature, environment.reference_temperature),
                or(pressure, environment.reference_pressure),
            );
        }
        let relative = {
            let graph = engine.graph();
            standard_uncertainty(&graph, &sensitivities(&graph, stated.id)) / graph.number(stated.id)
        };
        let reduced = measured / factor;
        Some((reduced, (relative * reduced.number()).abs()))
    }

    /// A certified resistance in the SI.
    fn in_si(&self, index: usize, calibration: Fields<'_>, certified: Quantity<'e>) -> Quantity<'e> {
        if !is_of_1990(calibration) {
            return certified;
        }
        let engine = self.engine;
        note_conversion(engine, self.block, calibration);
        let _scope = engine.builder.scope("", Some(&conversion_1990::METHOD.info));
        let converted = certified * conversion_1990::resistance_factor(&engine.builder);
        let path = format!("{}.resistance_{}_si", self.block.name(), index + 1);
        let certificate = calibration.words("certificate");
        let label = format!("resistance of certificate {certificate}, carried from the units of 1990 to the SI");
        let symbol = format!("R_{},SI", index + 1);
        engine.builder.name(converted.id, Name { path, symbol, label, unit: unit("ohm") });
        converted
    }
}

/// A certified value with the relative uncertainty that stands beside it.
fn with_relative(given: Given, calibration: Fields<'_>) -> Given {
    let Given::Stated { mut value, place } = given else { return given };
    if let Some(relative) = calibration.number("relative_uncertainty")
        && value.uncertainty == StatedUncertainty::None
    {
        value.uncertainty = StatedUncertainty::Standard { u: (relative * value.value).abs() };
        value.text = format!("{}, u_r = {}", value.text, calibration.words("relative_uncertainty"));
    }
    Given::Stated { value, place }
}

fn build<'e>(engine: &'e Engine<'e>, block: &'e Block) -> Option<()> {
    let (fields, name, label) = (block.fields(), block.name(), block.label());
    let stated = Stated { engine, block };
    let environment = stated.environment()?;
    let mut list = Vec::new();
    let mut uncertainties = Vec::new();
    for (index, calibration) in fields.mappings("calibrations").into_iter().enumerate() {
        let (reduced, u) = stated.calibrated(index, calibration, &environment)?;
        list.push(reduced);
        uncertainties.push(u);
    }
    if let (Some(at), Some((first, last))) = (fields.instant("at"), span(fields))
        && !(first..=last).contains(&(at.timestamp() as f64))
    {
        let problem = one_sided(name, at.timestamp() as f64, (first, last));
        let hint = "Enter a calibration on the other side; or leave `at` out and state `hold:` for uses beyond the calibrations.";
        engine.complain(problem.hint(hint), fields.place_of("at"));
        return None;
    }
    let (resistance, drift) = match list.as_slice() {
        [] => return None,
        [only] => (only.alias(), engine.builder.exact(Value::Scalar(0.0), unit("s-1").dimension(), Kind::Plain)),
        list => line(engine, block, list, uncertainties)?,
    };
    let _scope = engine.builder.scope(name, Some(&METHOD.info));
    resistance.result(
        "resistance",
        &format!("R_{name}"),
        &format!("resistance of {label} at the reference conditions"),
        &unit("ohm"),
    );
    drift.result(
        "drift",
        &format!("Ṙ_{name}/R_{name}"),
        &format!("relative change of {label} with time"),
        &unit("d-1"),
    );
    Some(())
}

/// Resistance at the reference time and relative drift, from the line through two calibrations or more.
fn line<'e>(
    engine: &'e Engine<'e>,
    block: &'e Block,
    list: &[Quantity<'e>],
    uncertainties: Vec<f64>,
) -> Option<(Quantity<'e>, Quantity<'e>)> {
    let (fields, name) = (block.fields(), block.name());
    let second = unit("s").dimension();
    let t = engine.builder.exact(Value::column(times(fields)?), second, Kind::Plain);
    let r = Quantity::stack(list)?;
    let rule = ResistorLine { reference: reference_time(fields)?, uncertainties: uncertainties.into() };
    let outputs = [(r.dimension(), Kind::Plain), (r.dimension().over(second), Kind::Plain)];
    let label = format!("scatter of the calibrations of {} beyond their certificates", block.label());
    let made = engine.builder.estimator(Arc::new(rule), &[t, r], &outputs, &format!("{name}.scatter"), &label);
    let made = engine.keep(made, fields.place_of("calibrations"))?;
    Some((made[0], made[1] / made[0]))
}

/// A resistor ready for use.
#[derive(Clone, Copy)]
pub struct Resistor<'e> {
    engine: &'e Engine<'e>,
    block: &'e Block,
    used_at: Place,
    /// At the reference conditions and the reference time.
    pub resistance: Quantity<'e>,
    /// Relative change with time, in 1/s.
    pub drift: Quantity<'e>,
}

impl<'e> Resistor<'e> {
    /// The resistor with this name; complained of when there is none.
    pub fn find(engine: &'e Engine<'_>, name: &Text) -> Option<Resistor<'e>> {
        let engine = shorten(engine);
        let block = engine.block(name, &["resistor"])?;
        let result = |output: &str| engine.result(&Text { text: format!("{}.{output}", name.text), place: name.place });
        Some(Resistor {
            engine,
            block,
            used_at: name.place,
            resistance: result("resistance")?,
            drift: result("drift")?,
        })
    }

    /// The resistance in use: formula of the method `resistor-line`.
    ///
    /// `seconds` since 1970 is the middle of the use; temperature, pressure and the voltage across the resistor may be
    /// columns. A use outside the dates of the calibrations is complained of, unless the record states how to hold.
    pub fn at(
        &self,
        seconds: f64,
        temperature: Quantity<'e>,
        pressure: Quantity<'e>,
        voltage: Quantity<'e>,
    ) -> Option<Quantity<'e>> {
        let (engine, fields) = (self.engine, self.block.fields());
        let stated = Stated { engine, block: self.block };
        let (held, beyond) = self.hold(seconds)?;
        let since = Value::Scalar(held - reference_time(fields)?);
        let since = engine.builder.exact(since, unit("s").dimension(), Kind::Plain);
        let mut line = self.resistance * (1.0 + self.drift * since);
        if beyond {
            line = line * (1.0 + stated.value("hold", "δ_hold", "change beyond the calibrations", "1", Kind::Plain)?);
        }
        let factor = stated.environment()?.factor(temperature, pressure);
        Some(in_use(line, factor, self.resistance, stated.load()?, voltage))
    }

    /// The time the line is taken at, and whether the use lies beyond the calibrations.
    fn hold(&self, seconds: f64) -> Option<(f64, bool)> {
        let fields = self.block.fields();
        let (first, last) = span(fields)?;
        if (first..=last).contains(&seconds) && first < last {
            return Some((seconds, false));
        }
        let name = self.block.name();
        if fields.get("hold").is_none() {
            let problem = one_sided(name, seconds, (first, last))
                .hint("Enter a calibration on the other side, or state `hold: 0.0(20)e-9`, the relative change beyond the nearest calibration with its uncertainty.");
            self.refuse(problem, fields.place_of("calibrations"));
            return None;
        }
        let nearest = seconds.clamp(first, last);
        let of = fields.mappings("calibrations").into_iter().find(|one| self::seconds(*one) == Some(nearest))?;
        if let Some(due) = of.date("due").filter(|due| *due < day(seconds)) {
            let message = format!(
                "The certificate {} of {name} was due on {due}, but {name} was used on {}.",
                of.words("certificate"),
                day(seconds)
            );
            let problem = Problem::new(Code::CertificateExpired, message);
            self.refuse(problem.hint("Enter the newer calibration."), of.place_of("due"));
            return None;
        }
        Some((nearest, true))
    }

    fn refuse(&self, problem: Problem, place: Place) {
        let complaint = problem.at(place).hint_at("It is used here.", self.used_at);
        self.engine.complain_all(Complaints { list: vec![complaint] });
    }
}

/// The day of a time in seconds since 1970, in UTC.
fn day(seconds: f64) -> NaiveDate {
    DateTime::from_timestamp(seconds as i64, 0).map_or(NaiveDate::MIN, |time| time.date_naive())
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::intake::MemoryIntake;

    const COEFFICIENTS: &str = "quantum_hall: {plateau: 2}\nbridge_error: 0.0(15)e-9\nreference_temperature: 23.0 °C\nreference_pressure: 1013.25 hPa\n\
        temperature_coefficient: 3.824(200)e-7 /K\nsecond_temperature_coefficient: -3.087(300)e-8 K-2\npressure_coefficient: -7.577(500)e-10 /hPa\n\
        load_coefficient: 5.58(300)e-10 /mW\ncalibration_power: 2.5 mW\n";
    const CALIBRATIONS: &str = "calibrations:\n\
        \x20 - {certificate: R-41-07, date: 2041-04-03, ratio: 0.0077481169689, relative_uncertainty: 1.2e-9, temperature: 22.988 °C, pressure: 1016.48 hPa}\n\
        \x20 - {certificate: R-41-11, date: 2041-04-25, ratio: 0.0077481171559, relative_uncertainty: 1.2e-9, temperature: 22.9962 °C, pressure: 997.68 hPa}\n\
        \x20 - {certificate: R-41-15, date: 2041-05-16, ratio: 0.0077481170294, relative_uncertainty: 1.2e-9, temperature: 22.998 °C, pressure: 1018.45 hPa}\n\
        \x20 - {certificate: R-41-19, date: 2041-06-01, ratio: 0.0077481170919, relative_uncertainty: 1.2e-9, temperature: 23.0119 °C, pressure: 1019.93 hPa}\n";
    /// Day 0 of the calibrations' count, 2041-05-04.
    const DAY_0: f64 = 2_251_238_400.0;

    fn records(resistor: &str) -> MemoryIntake {
        let text = format!("---\nrecord: R1\ndate: 2041-05-04\n---\n\n```yaml resistor R1\n{resistor}```\n");
        MemoryIntake::with([
            ("laboratory.md", "---\nformat: 1\nname: L\naddress: A\n---\n".to_string()),
            ("standards/r.md", text),
        ])
    }

    fn in_use_on<'e>(engine: &'e Engine<'_>, seconds: f64) -> Option<Quantity<'e>> {
        let place = engine.blocks()["R1"].raw.name.place;
        let resistor = Resistor::find(engine, &Text { text: "R1".into(), place })?;
        let k = |value: f64, text: &str, kind| {
            shorten(engine).builder.exact(Value::Scalar(value), unit(text).dimension(), kind)
        };
        let temperature = k(296.15, "K", Kind::Temperature);
        // At the reference conditions and the power of the calibrations only the line is left.
        resistor.at(
            seconds,
            temperature,
            k(101_325.0, "Pa", Kind::Pressure),
            k((0.25f64 * (100.000_326_988_573_79 / 100.0)).sqrt(), "V", Kind::Plain),
        )
    }

    fn relative_uncertainty(engine: &Engine, quantity: Quantity<'_>) -> f64 {
        let graph = engine.graph();
        standard_uncertainty(&graph, &sensitivities(&graph, quantity.id)) / graph.number(quantity.id)
    }

    /// The line of an independent reduction at day 0, and its uncertainty assembled by hand: statistical part
    /// 6.0e-10 × √(7.2779/2), bridge 1.5e-9, pressure coefficient times the mean of the pressures at the calibrations.
    #[test]
    fn the_line_agrees_with_an_independent_reduction() {
        let intake = records(&format!("{COEFFICIENTS}at: 2041-05-04T00:00:00Z\n{CALIBRATIONS}"));
        let engine = crate::reduce(&intake, None).expect("a folder");
        assert!(!engine.complaints().has_faults(), "{:?}", engine.complaints());
        let found = in_use_on(&engine, DAY_0).expect("a resistance");
        assert!((found.number() / 100.000_326_988_573_79 - 1.0).abs() < 1e-12, "{:.15}", found.number());
        let graph = engine.graph();
        let number = |path: &str| graph.number(graph.find(path).expect(path));
        assert!((number("R1.drift") * 86_400.0 / 1.353_822_353_151_215_7e-10 - 1.0).abs() < 1e-6);
        let statistical: f64 = 6.0e-10 * (7.277_903_7f64 / 2.0).sqrt();
        let (pressure, temperature): (f64, f64) = (5e-11 * 0.11, 2e-8 * 0.0015);
        let coefficients = pressure * pressure + temperature * temperature;
        let by_hand = (statistical * statistical + 2.25e-18 + coefficients).sqrt();
        let u = relative_uncertainty(&engine, found);
        assert!((u / by_hand - 1.0).abs() < 0.01, "{u} {by_hand}");
    }

    #[test]
    fn a_use_beyond_the_calibrations_needs_a_stated_hold() {
        let late = DAY_0 + 60.0 * 86_400.0;
        let intake = records(&format!("{COEFFICIENTS}{CALIBRATIONS}"));
        let engine = crate::reduce(&intake, None).expect("a folder");
        assert!(in_use_on(&engine, late).is_none());
        assert_eq!(engine.complaints().list[0].code, Code::CalibrationsOneSided);

        let intake = records(&format!("{COEFFICIENTS}hold: 0.0(40)e-9\n{CALIBRATIONS}"));
        let engine = crate::reduce(&intake, None).expect("a folder");
        let held = in_use_on(&engine, late).expect("held");
        let last = in_use_on(&engine, DAY_0 + 28.0 * 86_400.0).expect("at the last calibration");
        assert!((held.number() / last.number() - 1.0).abs() < 1e-15);
        let (u, u_last) = (relative_uncertainty(&engine, held), relative_uncertainty(&engine, last));
        assert!(((u * u - u_last * u_last).sqrt() / 4e-9 - 1.0).abs() < 1e-6);
    }

    #[test]
    fn a_resistance_of_1990_grows_by_the_exact_factor() {
        let text = "hold: 0.0(40)e-9\ncalibrations:\n  - {certificate: R-18-3, date: 2018-03-01, resistance: 100.0003 ohm, relative_uncertainty: 5e-8, basis: 1990, conversion: 1990 to SI}\n";
        let intake = records(text);
        let engine = crate::reduce(&intake, None).expect("a folder");
        assert!(!engine.complaints().has_faults(), "{:?}", engine.complaints());
        let graph = engine.graph();
        let found = graph.number(graph.find("R1.resistance").expect("a resistance"));
        assert!((found / 100.0003 - 1.0 - 1.7794e-8).abs() < 5e-13, "{found}");
    }

    #[test]
    fn a_column_of_conditions_gives_a_column() {
        let intake = records(&format!("{COEFFICIENTS}{CALIBRATIONS}"));
        let engine = crate::reduce(&intake, None).expect("a folder");
        let place = engine.blocks()["R1"].raw.name.place;
        let resistor = Resistor::find(&engine, &Text { text: "R1".into(), place }).expect("a resistor");
        let column =
            |rows: [f64; 2], text: &str| engine.builder.exact(Value::column(rows), unit(text).dimension(), Kind::Plain);
        let voltage = column([1.0, -1.0], "V");
        let found = resistor.at(DAY_0, column([296.15, 297.15], "K"), column([101_325.0, 96_325.0], "Pa"), voltage);
        let rows = found.expect("a column").rows();
        let expected = 3.824e-7 - 3.087e-8 + 7.577e-10 * 50.0;
        assert!((rows[1] / rows[0] - 1.0 - expected).abs() < 1e-13, "{rows:?}");
        let load = rows[0]
            / resistor.resistance.number()
            / (1.0 + resistor.drift.number() * (DAY_0 - reference_time(resistor.block.fields()).unwrap_or(0.0)))
            - 1.0;
        assert!((load - 5.58e-10 * (10.0 - 2.5)).abs() < 1e-13, "{load}");
    }
}
