//! Instruments: what they measure, their calibrations, resolution, drift and range.

use super::calibration::{calibration_path, valid_calibration};
use super::engine::{Block, Engine};
use super::field::{Field, Shape, needed, optional};
use super::fields::Fields;
use super::{BlockKind, Output, no_build};
use crate::diagnostic::{Code, Complaints, Problem};
use crate::graph::{Distribution, Quantity};
use crate::intake::Place;
use crate::method::instrument_correction;
use crate::quantity::Kind;
use crate::record::Text;
use chrono::NaiveDate;

const RANGE_FIELDS: &[Field] =
    &[needed("from", Shape::AnyValue, "the lower end"), needed("to", Shape::AnyValue, "the upper end")];

const POINT_FIELDS: &[Field] = &[
    needed("at", Shape::AnyValue, "the indication"),
    needed("correction", Shape::AnyValue, "the correction to be added there, with its uncertainty"),
];

const CALIBRATION_FIELDS: &[Field] = &[
    needed("certificate", Shape::Text, "the certificate's number"),
    optional("issued_by", Shape::Text, "who issued it"),
    needed("date", Shape::Date, "the date of the calibration"),
    optional("due", Shape::Date, "the day until which it may be used"),
    optional("correction", Shape::AnyValue, "the correction to be added to every reading"),
    optional("table", Shape::Mappings(POINT_FIELDS), "corrections at several indications, interpolated linearly"),
];

/// An instrument.
pub static KIND: BlockKind = BlockKind {
    name: "instrument",
    meaning: "an instrument with its dated calibrations",
    fields: &[
        needed(
            "measures",
            Shape::Choice(&["temperature", "pressure", "humidity", "dew_point", "carbon_dioxide"]),
            "what it measures",
        ),
        optional("label", Shape::Text, "what is printed for it"),
        optional("identification", Shape::Text, "marking, serial number, firmware"),
        optional("range", Shape::Mapping(RANGE_FIELDS), "the range of its indications"),
        needed("calibrations", Shape::Mappings(CALIBRATION_FIELDS), "dated calibrations"),
        optional("resolution", Shape::AnyValue, "the scale interval"),
        optional("drift_since_calibration", Shape::AnyValue, "change since the calibration"),
    ],
    outputs: &[
        Output { path: "correction", meaning: "correction of the certificate valid on the day of use", unit: "" },
        Output { path: "drift", meaning: "change since the calibration", unit: "" },
    ],
    check,
    build: no_build,
};

/// The kind of an indication, and of its corrections.
pub fn kinds_of(measures: &str) -> (Kind, Kind) {
    let kind = match measures {
        "temperature" => Kind::Temperature,
        "pressure" => Kind::Pressure,
        "humidity" => Kind::RelativeHumidity,
        "dew_point" => Kind::DewPoint,
        _ => Kind::AmountFraction,
    };
    (kind, kind.of_difference())
}

fn check(fields: Fields<'_>, complaints: &mut Complaints) {
    let (kind, difference) = kinds_of(&fields.words("measures"));
    let mut verify = |holder: Fields<'_>, name: &str, kind: Kind| {
        if let Some(node) = holder.get(name)
            && let Err(complaint) = super::given::read_given(node, kind, name)
        {
            complaints.add(*complaint);
        }
    };
    verify(fields, "resolution", difference);
    verify(fields, "drift_since_calibration", difference);
    if let Some(range) = fields.mapping("range") {
        verify(range, "from", kind);
        verify(range, "to", kind);
    }
    for calibration in fields.mappings("calibrations") {
        verify(calibration, "correction", difference);
        for point in calibration.mappings("table") {
            verify(point, "at", kind);
            verify(point, "correction", difference);
        }
    }
    for calibration in fields.mappings("calibrations") {
        if calibration.get("correction").is_some() == calibration.get("table").is_some() {
            let message =
                format!("The certificate {} needs either a correction or a table.", calibration.words("certificate"));
            complaints.add_at(Problem::new(Code::FieldMissing, message), calibration.place());
        }
        let stated = [calibration].into_iter().chain(calibration.mappings("table"));
        for holder in stated {
            if let Some(super::given::Given::Stated { value, place }) = holder.given("correction", difference)
                && value.standard_uncertainty().is_none()
            {
                let problem = Problem::new(
                    Code::UncertaintyMissing,
                    format!(
                        "The correction {} of certificate {} has no uncertainty.",
                        value.text,
                        calibration.words("certificate")
                    ),
                );
                complaints.add_at(problem.hint("Write it with the certificate's uncertainty, such as `-0.012(3) K` or `-0.012 K ± 0.006 K (k = 2)`."), place);
            }
        }
    }
}

/// An instrument ready for use.
#[derive(Clone, Copy)]
pub struct Instrument<'e> {
    engine: &'e Engine<'e>,
    pub block: &'e Block,
}

impl<'e> Instrument<'e> {
    /// The instrument with this name, which must measure `measures`.
    pub fn find(engine: &'e Engine<'e>, name: &Text, measures: &str) -> Option<Self> {
        let block = engine.block(name, &["instrument"])?;
        let found = block.fields().words("measures");
        if found != measures {
            let problem = Problem::new(
                Code::KindMismatch,
                format!("{} measures {found}, but an instrument for {measures} is expected here.", name.text),
            );
            engine.complain(problem, name.place);
            return None;
        }
        Some(Self { engine, block })
    }

    /// The distribution of the rounding of one indication.
    pub fn resolution(self) -> Distribution {
        let (_, difference) = kinds_of(&self.block.fields().words("measures"));
        match self.block.fields().given("resolution", difference) {
            Some(super::given::Given::Stated { value, .. }) => {
                Distribution::Rectangular { half_width: value.value / 2.0 }
            }
            _ => Distribution::Exact,
        }
    }

    /// The range of indications, in coherent SI units.
    pub fn range(self) -> Option<(f64, f64)> {
        let (kind, _) = kinds_of(&self.block.fields().words("measures"));
        let range = self.block.fields().mapping("range")?;
        let end = |name: &str| match range.given(name, kind) {
            Some(super::given::Given::Stated { value, .. }) => Some(value.value),
            _ => None,
        };
        Some((end("from")?, end("to")?))
    }

    /// Indications with correction and drift added; one correction serves all.
    pub fn corrected(self, indications: Quantity<'e>, day: NaiveDate, used_at: Place) -> Option<Quantity<'e>> {
        let (engine, fields, name) = (self.engine, self.block.fields(), self.block.name());
        let (kind, difference) = kinds_of(&fields.words("measures"));
        let calibration = valid_calibration(engine, name, fields, day, used_at)?;
        let path = calibration_path(name, fields, calibration, "correction");
        let label = format!("correction of {}, certificate {}", self.block.label(), calibration.words("certificate"));
        let correction = match calibration.given("correction", difference) {
            Some(given) => engine.given(&given, &path, &format!("c_{name}"), &label, difference)?,
            None => self.interpolated_correction(calibration, indications, &path, &label, used_at)?,
        };
        let mut corrected = indications.as_kind(Kind::Plain) + correction.as_kind(Kind::Plain);
        let drift_label = format!("change of {} since its calibration", self.block.label());
        if let Some(drift) = engine.bound(
            fields,
            "drift_since_calibration",
            &format!("{name}.drift"),
            &format!("δ_{name}"),
            &drift_label,
            difference,
        ) {
            corrected = corrected + drift.as_kind(Kind::Plain);
        }
        Some(corrected.as_kind(kind))
    }

    fn interpolated_correction(
        self,
        calibration: Fields<'_>,
        indications: Quantity<'e>,
        path: &str,
        label: &str,
        used_at: Place,
    ) -> Option<Quantity<'e>> {
        let (engine, name) = (self.engine, self.block.name());
        let (kind, difference) = kinds_of(&self.block.fields().words("measures"));
        let mut points = Vec::new();
        let mut corrections = Vec::new();
        for (index, point) in calibration.mappings("table").iter().enumerate() {
            let super::given::Given::Stated { value, .. } = point.given("at", kind)? else { return None };
            points.push(value.value);
            let given = point.given("correction", difference)?;
            let at = format!("{label}, at {}", value.text);
            corrections.push(engine.given(
                &given,
                &format!("{path}.{}", index + 1),
                &format!("c_{name},{}", index + 1),
                &at,
                difference,
            )?);
        }
        if points.windows(2).any(|pair| pair[0] >= pair[1]) {
            let problem = Problem::new(
                Code::DesignIncomplete,
                format!(
                    "The table of certificate {} does not rise from point to point.",
                    calibration.words("certificate")
                ),
            );
            engine.complain(
                problem.hint("List the points from the lowest to the highest indication."),
                calibration.place_of("table"),
            );
            return None;
        }
        let found = instrument_correction::interpolated(&engine.builder, indications, &points, &corrections);
        engine.keep(found, used_at)
    }
}
