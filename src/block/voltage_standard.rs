//! A Josephson voltage standard: its microwave frequency, its time base and the error bound of its array.

use super::calibration::{calibration_path, check_dimension, valid_calibration};
use super::engine::{Block, Engine, shorten};
use super::field::{Field, Shape, needed, optional};
use super::fields::Fields;
use super::given::Given;
use super::time_base::TimeBase;
use super::units_of_1990::{BASIS_SHAPE, CONVERSION_SHAPE, check_basis, is_of_1990, note_conversion};
use super::{BlockKind, Output};
use crate::diagnostic::{Code, Complaints, Problem};
use crate::graph::{Name, Quantity};
use crate::intake::Place;
use crate::method::{conversion_1990, josephson_voltage, unit};
use crate::quantity::Kind;
use crate::record::Text;
use chrono::NaiveDate;

const CALIBRATION_FIELDS: &[Field] = &[
    needed("certificate", Shape::Text, "the certificate's number"),
    optional("issued_by", Shape::Text, "who issued it"),
    needed("date", Shape::Date, "the date of the calibration"),
    optional("due", Shape::Date, "the day until which it may be used"),
    needed("step_voltage", Shape::Value(Kind::Plain), "the voltage of one step at the nominal frequency"),
    optional("basis", BASIS_SHAPE, "the units of the certificate: SI unless written"),
    optional("conversion", CONVERSION_SHAPE, "carries a value of 1990 to the SI by the exact factor"),
];

/// A voltage standard.
pub static KIND: BlockKind = BlockKind {
    name: "voltage-standard",
    meaning: "a Josephson voltage standard: frequency, time base, residual error",
    fields: &[
        optional("label", Shape::Text, "what is printed for it"),
        optional("identification", Shape::Text, "marking, serial number of the array"),
        needed("frequency", Shape::Value(Kind::Plain), "the nominal microwave frequency"),
        needed("time_base", Shape::Name, "the time base the microwave source is locked to"),
        needed("residual", Shape::Value(Kind::Plain), "relative error of the array, zero with its bound"),
        optional("calibrations", Shape::Mappings(CALIBRATION_FIELDS), "certificates, where the step is not f/K_J"),
        optional("source", Shape::Text, "the check of the array, and where the bound comes from"),
    ],
    outputs: &[
        Output { path: "frequency", meaning: "actual microwave frequency", unit: "GHz" },
        Output { path: "step_voltage", meaning: "voltage of one step", unit: "µV" },
    ],
    check,
    build: |engine, block| {
        if let Some(day) =
            block.date.or_else(|| block.fields().get("calibrations").map_or(Some(NaiveDate::MIN), |_| None))
        {
            let _ = read(shorten(engine), block, day, block.raw.name.place);
        }
    },
};

fn check(fields: Fields<'_>, complaints: &mut Complaints) {
    check_dimension(fields, "frequency", "Hz", false, complaints);
    check_dimension(fields, "residual", "1", true, complaints);
    if let Some(Given::Stated { value, place }) = fields.given("frequency", Kind::Plain)
        && value.unit.dimension() == unit("Hz").dimension()
        && value.value <= 0.0
    {
        let problem =
            Problem::new(Code::OutOfRange, format!("The microwave frequency {} is not positive.", value.text));
        complaints.add_at(problem.hint("The sign of a voltage comes from its number of steps."), place);
    }
    for calibration in fields.mappings("calibrations") {
        check_dimension(calibration, "step_voltage", "V", true, complaints);
        check_basis(calibration, complaints);
    }
}

/// A voltage standard ready for use.
#[derive(Clone, Copy)]
pub struct VoltageStandard<'e> {
    /// Voltage of one step, with its sign from the number of steps.
    pub step_voltage: Quantity<'e>,
    /// Actual microwave frequency.
    pub frequency: Quantity<'e>,
}

impl<'e> VoltageStandard<'e> {
    /// The voltage standard with this name, as it was on `day`; complained of when there is none.
    pub fn find(engine: &'e Engine<'_>, name: &Text, day: NaiveDate) -> Option<VoltageStandard<'e>> {
        let engine = shorten(engine);
        read(engine, engine.block(name, &["voltage-standard"])?, day, name.place)
    }
}

fn read<'e>(engine: &'e Engine<'e>, block: &'e Block, day: NaiveDate, used_at: Place) -> Option<VoltageStandard<'e>> {
    let (fields, name, label) = (block.fields(), block.name(), block.label());
    let nominal = engine.given(
        &fields.given("frequency", Kind::Plain)?,
        &format!("{name}.nominal_frequency"),
        "f_nom",
        &format!("nominal frequency of {label}"),
        Kind::Plain,
    )?;
    let y = TimeBase::find(engine, &fields.text("time_base")?, day)?.offset;
    let words = format!("relative error of {label}");
    let j = engine.bound(fields, "residual", &format!("{name}.residual"), "j", &words, Kind::Plain)?;
    let _scope = engine.builder.scope("", Some(&josephson_voltage::METHOD.info));
    let named = |path: String, make: &dyn Fn() -> Quantity<'e>, symbol: &str, label: String, text: &str| {
        let known = engine.graph().find(&path);
        known.map_or_else(
            || {
                let made = make();
                engine.builder.name(made.id, Name { path, symbol: symbol.into(), label, unit: unit(text) });
                made
            },
            |known| engine.at(known),
        )
    };
    let actual = || josephson_voltage::frequency(nominal, y);
    let frequency = named(format!("{name}.frequency"), &actual, "f", format!("actual frequency of {label}"), "GHz");
    let words = format!("voltage of one step of {label}");
    if fields.get("calibrations").is_none() {
        let step = || josephson_voltage::step_voltage(frequency, j);
        let step_voltage = named(format!("{name}.step_voltage"), &step, "U_1", words, "µV");
        return Some(VoltageStandard { step_voltage, frequency });
    }
    let calibration = valid_calibration(engine, name, fields, day, used_at)?;
    let certified = certified_step(engine, block, calibration)?;
    let step = || certified * (1.0 + y) * (1.0 + j);
    let path = calibration_path(name, fields, calibration, "step_voltage");
    Some(VoltageStandard { step_voltage: named(path, &step, "U_1", words, "µV"), frequency })
}

/// The step at the nominal frequency from a certificate, in the SI.
fn certified_step<'e>(engine: &'e Engine<'e>, block: &'e Block, calibration: Fields<'_>) -> Option<Quantity<'e>> {
    let (fields, name) = (block.fields(), block.name());
    let label = format!("step of {}, certificate {}", block.label(), calibration.words("certificate"));
    let path = calibration_path(name, fields, calibration, "certified_step");
    let given = calibration.given("step_voltage", Kind::Plain)?;
    let certified = engine.given(&given, &path, "U_cert", &label, Kind::Plain)?;
    if !is_of_1990(calibration) {
        return Some(certified);
    }
    note_conversion(engine, block, calibration);
    let _scope = engine.builder.scope("", Some(&conversion_1990::METHOD.info));
    let converted = certified * conversion_1990::voltage_factor(&engine.builder);
    let path = calibration_path(name, fields, calibration, "certified_step_si");
    let label = format!("{label}, carried from the units of 1990 to the SI");
    engine.builder.name(converted.id, Name { path, symbol: "U_SI".into(), label, unit: unit("µV") });
    Some(converted)
}

#[cfg(test)]
mod tests {
    use crate::block::Engine;
    use crate::intake::MemoryIntake;

    fn records(calibrations: &str) -> MemoryIntake {
        let text = format!(
            "---\nrecord: R1\ndate: 2041-05-04\n---\n\n```yaml time-base TB1\noffset: 2.353(400)e-10\n```\n\n\
             ```yaml laser L1\nfrequency: 473612353772100(19000) Hz\n```\n\n\
             ```yaml voltage-standard VS1\nfrequency: 74.96 GHz\ntime_base: TB1\nresidual: 0.0(5)e-9\n{calibrations}```\n"
        );
        MemoryIntake::with([
            ("laboratory.md", "---\nformat: 1\nname: L\naddress: A\n---\n".to_string()),
            ("standards/r.md", text),
        ])
    }

    fn number(engine: &Engine, path: &str) -> f64 {
        let graph = engine.graph();
        graph.find(path).map_or(f64::NAN, |id| graph.number(id))
    }

    #[test]
    fn step_and_wavelength_follow_from_frequencies() {
        let intake = records("");
        let engine = crate::reduce(&intake, None).expect("a folder");
        assert!(!engine.complaints().has_faults(), "{:?}", engine.complaints());
        let step = 74.96e9 * (1.0 + 2.353e-10) / 483_597_848_416_983.6;
        assert!((number(&engine, "VS1.step_voltage") / step - 1.0).abs() < 1e-15);
        assert!(
            (number(&engine, "L1.vacuum_wavelength") / (299_792_458.0 / 473_612_353_772_100.0) - 1.0).abs() < 1e-15
        );
        let id = engine.graph().find("VS1.step_voltage").expect("a step");
        let graph = engine.graph();
        let u = crate::graph::standard_uncertainty(&graph, &crate::graph::sensitivities(&graph, id)) / step;
        assert!((u - (25e-20f64 + 16e-22).sqrt()).abs() < 1e-13, "{u}");
    }

    #[test]
    fn a_step_of_1990_is_carried_over_by_the_exact_factor() {
        let stated = "calibrations:\n  - {certificate: V-1, date: 2018-11-05, step_voltage: 155.0050(2) µV, basis: 1990, conversion: 1990 to SI}\n";
        let intake = records(stated);
        let engine = crate::reduce(&intake, None).expect("a folder");
        assert!(!engine.complaints().has_faults(), "{:?}", engine.complaints());
        let ratio = number(&engine, "VS1.certified_step_si") / 155.005e-6 - 1.0;
        assert!((ratio - 1.06665e-7).abs() < 5e-13, "{ratio}");
        assert!(engine.builder.assumptions().iter().any(|assumption| assumption.text.contains("1990")));
    }
}
