//! The laser whose wavelength measures lengths.

use super::calibration::{calibration_path, certified_on, check_dimension, check_one_source};
use super::engine::{Block, Engine, shorten};
use super::field::{Field, Shape, needed, optional};
use super::fields::Fields;
use super::{BlockKind, Output};
use crate::diagnostic::Complaints;
use crate::graph::{Name, Quantity};
use crate::intake::Place;
use crate::method::interferometer_velocity::{METHOD, vacuum_wavelength};
use crate::method::unit;
use crate::quantity::Kind;
use crate::record::Text;
use chrono::NaiveDate;

const CALIBRATION_FIELDS: &[Field] = &[
    needed("certificate", Shape::Text, "the certificate's number"),
    optional("issued_by", Shape::Text, "who issued it"),
    needed("date", Shape::Date, "the date of the calibration"),
    optional("due", Shape::Date, "the day until which it may be used"),
    needed("frequency", Shape::Value(Kind::Plain), "the frequency in terms of the SI second"),
];

/// A laser.
pub static KIND: BlockKind = BlockKind {
    name: "laser",
    meaning: "a laser with its frequency, for lengths and velocities",
    fields: &[
        optional("label", Shape::Text, "what is printed for it"),
        optional("identification", Shape::Text, "marking, serial number"),
        optional("frequency", Shape::Value(Kind::Plain), "the frequency in terms of the SI second"),
        optional("calibrations", Shape::Mappings(CALIBRATION_FIELDS), "dated calibrations of the frequency"),
        optional("source", Shape::Text, "where the frequency comes from, such as a recommended radiation"),
    ],
    outputs: &[
        Output { path: "frequency", meaning: "frequency on the day of use", unit: "Hz" },
        Output { path: "vacuum_wavelength", meaning: "wavelength in vacuum", unit: "nm" },
    ],
    check,
    build: |engine, block| {
        if let Some(day) = block.date.or_else(|| block.fields().get("frequency").and(Some(NaiveDate::MIN))) {
            let _ = read(shorten(engine), block, day, block.raw.name.place);
        }
    },
};

fn check(fields: Fields<'_>, complaints: &mut Complaints) {
    check_one_source(fields, "frequency", complaints);
    for holder in [fields].into_iter().chain(fields.mappings("calibrations")) {
        check_dimension(holder, "frequency", "Hz", true, complaints);
    }
}

/// A laser ready for use.
#[derive(Clone, Copy)]
pub struct Laser<'e> {
    pub frequency: Quantity<'e>,
    pub vacuum_wavelength: Quantity<'e>,
}

impl<'e> Laser<'e> {
    /// The laser with this name, as calibrated for `day`; complained of when there is none.
    pub fn find(engine: &'e Engine<'_>, name: &Text, day: NaiveDate) -> Option<Laser<'e>> {
        let engine = shorten(engine);
        read(engine, engine.block(name, &["laser"])?, day, name.place)
    }
}

fn read<'e>(engine: &'e Engine<'e>, block: &'e Block, day: NaiveDate, used_at: Place) -> Option<Laser<'e>> {
    let field = ("frequency", Kind::Plain);
    let certified = certified_on(engine, block, field, ("frequency", "frequency"), day, used_at)?;
    let frequency = certified.input(engine, "f_laser", Kind::Plain)?;
    let path = calibration_path(block.name(), block.fields(), certified.holder, "vacuum_wavelength");
    let known = engine.graph().find(&path);
    if let Some(known) = known {
        return Some(Laser { frequency, vacuum_wavelength: engine.at(known) });
    }
    let _scope = engine.builder.scope("", Some(&METHOD.info));
    let vacuum_wavelength = vacuum_wavelength(frequency).as_kind(Kind::Length);
    let label = format!("wavelength of {} in vacuum", block.label());
    engine.builder.name(vacuum_wavelength.id, Name { path, symbol: "λ_0".into(), label, unit: unit("nm") });
    Some(Laser { frequency, vacuum_wavelength })
}
