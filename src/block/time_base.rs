//! The time base that counters, gates and microwave sources are locked to.

use super::calibration::{certified_on, check_dimension, check_one_source};
use super::engine::{Block, Engine, shorten};
use super::field::{Field, Shape, needed, optional};
use super::fields::Fields;
use super::{BlockKind, Output};
use crate::diagnostic::Complaints;
use crate::graph::Quantity;
use crate::intake::Place;
use crate::quantity::Kind;
use crate::record::Text;
use chrono::NaiveDate;

const CALIBRATION_FIELDS: &[Field] = &[
    needed("certificate", Shape::Text, "the certificate's number"),
    optional("issued_by", Shape::Text, "who issued it"),
    needed("date", Shape::Date, "the date of the comparison"),
    optional("due", Shape::Date, "the day until which it may be used"),
    needed("offset", Shape::Value(Kind::Plain), "actual over nominal frequency, less one"),
];

/// A time base.
pub static KIND: BlockKind = BlockKind {
    name: "time-base",
    meaning: "a reference oscillator with its offset from the SI second",
    fields: &[
        optional("label", Shape::Text, "what is printed for it"),
        optional("identification", Shape::Text, "marking, serial number"),
        optional("offset", Shape::Value(Kind::Plain), "actual over nominal frequency, less one"),
        optional("calibrations", Shape::Mappings(CALIBRATION_FIELDS), "dated comparisons, where there are several"),
        optional("source", Shape::Text, "where the offset comes from, such as the comparison with UTC(k)"),
    ],
    outputs: &[Output {
        path: "offset",
        meaning: "relative offset y: actual over nominal frequency, less one",
        unit: "1",
    }],
    check,
    build: |engine, block| {
        if let Some(day) = block.date.or_else(|| block.fields().get("offset").and(Some(NaiveDate::MIN))) {
            let _ = read(shorten(engine), block, day, block.raw.name.place);
        }
    },
};

fn check(fields: Fields<'_>, complaints: &mut Complaints) {
    check_one_source(fields, "offset", complaints);
    for holder in [fields].into_iter().chain(fields.mappings("calibrations")) {
        check_dimension(holder, "offset", "1", true, complaints);
    }
}

/// A time base ready for use.
#[derive(Clone, Copy)]
pub struct TimeBase<'e> {
    /// y: actual frequency = nominal frequency × (1 + y).
    pub offset: Quantity<'e>,
}

impl<'e> TimeBase<'e> {
    /// The time base with this name, as it was on `day`; complained of when there is none.
    pub fn find(engine: &'e Engine<'_>, name: &Text, day: NaiveDate) -> Option<TimeBase<'e>> {
        let engine = shorten(engine);
        read(engine, engine.block(name, &["time-base"])?, day, name.place)
    }
}

fn read<'e>(engine: &'e Engine<'e>, block: &'e Block, day: NaiveDate, used_at: Place) -> Option<TimeBase<'e>> {
    let name = ("offset", "relative offset");
    let certified = certified_on(engine, block, ("offset", Kind::Plain), name, day, used_at)?;
    Some(TimeBase { offset: certified.input(engine, "y", Kind::Plain)? })
}
