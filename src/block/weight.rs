//! Weights: the laboratory's standards and clients' items.

use super::calibration::{calibration_path, valid_calibration};
use super::engine::{Block, Engine, shorten};
use super::field::{Field, Shape, needed, optional};
use super::fields::Fields;
use super::given::Given;
use super::{BlockKind, Output};
use crate::diagnostic::{Code, Problem};
use crate::graph::{Quantity, State};
use crate::intake::Place;
use crate::method::{conventional_mass, mass_on_day, unit, volume};
use crate::quantity::Kind;
use crate::record::Text;
use chrono::NaiveDate;

/// Origins of a volume or density.
const ORIGINS: &[&str] = &["measured", "estimated", "customer"];

const VOLUME_FIELDS: &[Field] = &[
    needed("value", Shape::Value(Kind::Volume), "the volume with its uncertainty"),
    optional("u", Shape::Value(Kind::Volume), "its standard uncertainty, when it does not stand with the value"),
    needed("at", Shape::Value(Kind::Temperature), "the temperature it holds at"),
    needed("origin", Shape::Choice(ORIGINS), "whether it was measured or estimated, or comes from the client"),
];

const DENSITY_FIELDS: &[Field] = &[
    needed("value", Shape::Value(Kind::Density), "the density with its uncertainty"),
    optional("u", Shape::Value(Kind::Density), "its standard uncertainty, when it does not stand with the value"),
    needed("at", Shape::Value(Kind::Temperature), "the temperature it holds at"),
    needed("origin", Shape::Choice(ORIGINS), "whether it was measured or estimated, or comes from the client"),
];

const CALIBRATION_FIELDS: &[Field] = &[
    needed("certificate", Shape::Text, "the certificate's number"),
    optional("issued_by", Shape::Text, "who issued it"),
    needed("date", Shape::Date, "the date of the calibration"),
    optional("due", Shape::Date, "the day until which it may be used"),
    optional("mass", Shape::Value(Kind::Mass), "the mass with its uncertainty"),
    optional("conventional_mass", Shape::Value(Kind::ConventionalMass), "the conventional mass with its uncertainty"),
    optional("basis", Shape::Text, "the unit basis the value refers to"),
    optional("state", Shape::Choice(&["air", "vacuum"]), "the surroundings the value holds in; air unless written"),
];

macro_rules! weight_fields {
    ($($extra:expr),* $(,)?) => {
        &[
            optional("label", Shape::Text, "what is printed for it"),
            optional("identification", Shape::Text, "marking or serial number"),
            needed("nominal", Shape::Value(Kind::Mass), "the nominal mass"),
            optional("material", Shape::Text, "the material"),
            optional("maker", Shape::Text, "the maker"),
            optional("class", Shape::Text, "the accuracy class, where one is claimed"),
            optional("volume", Shape::Mapping(VOLUME_FIELDS), "the volume; or give the density"),
            optional("density", Shape::Mapping(DENSITY_FIELDS), "the density; or give the volume"),
            optional("expansion", Shape::Value(Kind::CubicExpansion), "the cubic expansion coefficient"),
            optional("mass_centre_height", Shape::Value(Kind::Height), "height of the mass centre above the base"),
            optional("surface_area", Shape::AnyValue, "the area of the surface"),
            optional("magnetic_susceptibility", Shape::AnyValue, "the volume magnetic susceptibility"),
            optional("magnetic_polarisation", Shape::AnyValue, "the permanent magnetic polarisation"),
            optional("calibrations", Shape::Mappings(CALIBRATION_FIELDS), "dated calibrations"),
            optional("drift_since_calibration", Shape::Value(Kind::MassDifference), "change since the calibration"),
            $($extra),*
        ]
    };
}

const OUTPUTS: &[Output] = &[
    Output { path: "mass", meaning: "mass on the day of use, from the calibration valid then", unit: "kg" },
    Output { path: "volume", meaning: "volume at its reference temperature", unit: "cm³" },
    Output { path: "expansion", meaning: "cubic expansion coefficient", unit: "K⁻¹" },
    Output { path: "mass_centre_height", meaning: "height of the mass centre above the base", unit: "mm" },
];

/// A standard of the laboratory.
pub static MASS_STANDARD: BlockKind = BlockKind {
    name: "mass-standard",
    meaning: "a mass standard of the laboratory with its dated calibrations",
    fields: weight_fields![],
    outputs: OUTPUTS,
    check,
    build,
};

/// A client's standard.
pub static ITEM: BlockKind = BlockKind {
    name: "item",
    meaning: "a client's standard: condition, and what is known of it",
    fields: weight_fields![
        optional("customer", Shape::Name, "the client it belongs to"),
        optional("received", Shape::Date, "the day it was received"),
        optional("condition", Shape::Text, "condition on receipt"),
        optional("adjusted", Shape::Text, "whether it was adjusted: no, or what was done"),
        optional("supplied_by_customer", Shape::Texts, "which of these data the client supplied"),
    ],
    outputs: OUTPUTS,
    check,
    build,
};

/// The kinds that can lie on a pan.
pub const KINDS: &[&str] = &["mass-standard", "item"];

fn check(fields: Fields<'_>, complaints: &mut crate::diagnostic::Complaints) {
    for calibration in fields.mappings("calibrations") {
        let stated = [calibration.get("mass"), calibration.get("conventional_mass")];
        let given = stated.iter().flatten().count();
        if given != 1 {
            let message = format!(
                "The certificate {} states {given} values; one of mass and conventional_mass is needed.",
                calibration.words("certificate")
            );
            complaints.add_at(Problem::new(Code::FieldMissing, message), calibration.place());
        }
        for name in ["mass", "conventional_mass"] {
            let kind = if name == "mass" { Kind::Mass } else { Kind::ConventionalMass };
            if let Some(Given::Stated { value, place }) = calibration.given(name, kind)
                && value.standard_uncertainty().is_none()
            {
                let problem = Problem::new(
                    Code::UncertaintyMissing,
                    format!(
                        "The {} of certificate {} has no uncertainty.",
                        kind.word(),
                        calibration.words("certificate")
                    ),
                );
                complaints.add_at(problem.hint("Write the certificate's uncertainty with its k: `± 0.026 mg (k = 2)`, or as a standard uncertainty: `(13)`."), place);
            }
        }
    }
}

fn build(engine: &Engine, block: &Block) {
    let weight = Weight { engine, block };
    if let Some(day) = block.date.filter(|_| block.fields().get("calibrations").is_some()) {
        weight.mass(day, block.raw.name.place);
    }
    if block.fields().get("volume").is_some() {
        weight.volume(None, block.raw.name.place);
    }
}

/// A weight ready for use.
#[derive(Clone, Copy)]
pub struct Weight<'e> {
    pub engine: &'e Engine<'e>,
    pub block: &'e Block,
}

/// The volume of a weight with what is needed to take it to another temperature.
#[derive(Clone, Copy)]
pub struct VolumeAt<'e> {
    pub volume: Quantity<'e>,
    pub reference: Quantity<'e>,
    pub expansion: Option<Quantity<'e>>,
}

impl<'e> Weight<'e> {
    /// The weight with this name; complained of when there is none.
    pub fn find(engine: &'e Engine<'_>, name: &Text) -> Option<Weight<'e>> {
        // The handle outlives no engine: both borrow the same one.
        let block = engine.block(name, KINDS)?;
        Some(Weight { engine: shorten(engine), block })
    }

    /// The nominal mass, an exact number.
    pub fn nominal(self) -> Option<Quantity<'e>> {
        let Some(Given::Stated { value, .. }) = self.block.fields().given("nominal", Kind::Mass) else { return None };
        Some(self.engine.builder.exact(crate::graph::Value::Scalar(value.value), Kind::Mass.dimension()?, Kind::Mass))
    }

    /// The nominal mass as typed, and its value in kg.
    pub fn nominal_text(self) -> (String, f64) {
        match self.block.fields().given("nominal", Kind::Mass) {
            Some(Given::Stated { value, .. }) => (value.text.clone(), value.value),
            _ => (String::new(), f64::NAN),
        }
    }

    /// Whether a calibration gives the mass.
    pub fn is_calibrated(self) -> bool {
        self.block.fields().get("calibrations").is_some()
    }

    /// The mass on `day`, from the calibration valid then, with the drift since.
    pub fn mass(self, day: NaiveDate, used_at: Place) -> Option<Quantity<'e>> {
        let (engine, fields, name) = (self.engine, self.block.fields(), self.block.name());
        let calibration = valid_calibration(engine, name, fields, day, used_at)?;
        let path = calibration_path(name, fields, calibration, "mass");
        let known = engine.graph().find(&path);
        if let Some(known) = known {
            return Some(engine.at(known));
        }
        let certified = self.certified(calibration)?;
        let drift = engine.bound(
            fields,
            "drift_since_calibration",
            &format!("{name}.drift"),
            "δ_drift",
            &format!("change of {} since its calibration", self.block.label()),
            Kind::MassDifference,
        );
        let state = if calibration.words("state") == "vacuum" { State::Vacuum } else { State::Air };
        let total = mass_on_day::on_day(certified, drift);
        let made = total.in_state(Some(state)).on_basis(calibration.text("basis").map(|basis| basis.text.into()));
        let _scope = engine.builder.scope("", Some(&mass_on_day::METHOD.info));
        let label = format!("mass of {}", self.block.label());
        engine.builder.name(made.id, crate::graph::Name { path, symbol: format!("m_{name}"), label, unit: unit("kg") });
        Some(made)
    }

    /// The mass on `day` for a weighing in air; a value in vacuum is refused, for the sorbed layers differ.
    pub fn mass_in_air(self, day: NaiveDate, used_at: Place) -> Option<Quantity<'e>> {
        let mass = self.mass(day, used_at)?;
        if mass.state() != Some(State::Vacuum) {
            return Some(mass);
        }
        let name = self.block.name();
        let calibrations = self.block.fields().mappings("calibrations");
        let in_vacuum = calibrations.iter().find(|calibration| calibration.words("state") == "vacuum");
        let place = in_vacuum.map_or(self.block.raw.name.place, |calibration| calibration.place_of("state"));
        let message =
            format!("The mass of {name} holds in vacuum, but {name} is weighed in air without a stated link.");
        let problem = Problem::new(Code::StateMismatch, message)
            .hint("Use a certificate that holds in air, or a result that carries the mass from vacuum to air.");
        let complaint = problem.at(place).hint_at("It is used here.", used_at);
        self.engine.complain_all(crate::diagnostic::Complaints { list: vec![complaint] });
        None
    }

    /// The certificate's mass; a conventional mass is converted with the density.
    fn certified(self, calibration: Fields<'_>) -> Option<Quantity<'e>> {
        let (engine, fields, name) = (self.engine, self.block.fields(), self.block.name());
        let label = format!("{}, certificate {}", self.block.label(), calibration.words("certificate"));
        if let Some(given) = calibration.given("mass", Kind::Mass) {
            let path = calibration_path(name, fields, calibration, "certified_mass");
            return engine.given(&given, &path, &format!("m_{name},cert"), &format!("mass of {label}"), Kind::Mass);
        }
        let given = calibration.given("conventional_mass", Kind::ConventionalMass)?;
        let path = calibration_path(name, fields, calibration, "certified_conventional_mass");
        let conventional = engine.given(
            &given,
            &path,
            &format!("m_c,{name}"),
            &format!("conventional mass of {label}"),
            Kind::ConventionalMass,
        )?;
        let density = self.density(Some(conventional))?;
        Some(conventional_mass::to_mass(&engine.builder, conventional, density))
    }

    /// The density at the reference temperature: stated, or from mass and volume.
    pub fn density(self, mass: Option<Quantity<'e>>) -> Option<Quantity<'e>> {
        let (engine, fields, name) = (self.engine, self.block.fields(), self.block.name());
        if let Some(stated) = fields.mapping("density") {
            let given = super::given::read_given(stated.node, Kind::Density, "density").ok()?;
            return engine.given(
                &given,
                &format!("{name}.density"),
                &format!("ρ_{name}"),
                &format!("density of {}", self.block.label()),
                Kind::Density,
            );
        }
        let at = self.volume(None, fields.place())?;
        let mass = mass.or_else(|| self.nominal())?;
        Some(volume::density(mass, at.volume))
    }

    /// The volume; `mass` serves a weight of stated density, the nominal mass where it is unknown.
    pub fn volume(self, mass: Option<Quantity<'e>>, used_at: Place) -> Option<VolumeAt<'e>> {
        let (engine, fields, name) = (self.engine, self.block.fields(), self.block.name());
        let stated = fields.mapping("volume").or_else(|| fields.mapping("density"));
        let Some(stated) = stated else {
            let problem = Problem::new(
                Code::FieldMissing,
                format!("{name} has neither volume nor density, so its buoyancy cannot be computed."),
            );
            engine.complain(
                problem.hint("Write `volume: {value: …, at: 20 °C, origin: …}` or `density: …` in its block."),
                used_at,
            );
            return None;
        };
        let reference = match stated.given("at", Kind::Temperature)? {
            Given::Stated { value, .. } => engine.builder.exact(
                crate::graph::Value::Scalar(value.value),
                Kind::Temperature.dimension()?,
                Kind::Temperature,
            ),
            Given::Reference(reference) => engine.result(&reference)?,
        };
        let volume = match fields.mapping("volume") {
            Some(stated) => {
                let given = super::given::read_given(stated.node, Kind::Volume, "volume").ok()?;
                engine.given(
                    &given,
                    &format!("{name}.volume"),
                    &format!("V_{name}"),
                    &format!("volume of {}", self.block.label()),
                    Kind::Volume,
                )?
            }
            None => volume::from_density(mass.or_else(|| self.nominal())?, self.density(mass)?),
        };
        let expansion = self.stated("expansion", "β", "cubic expansion coefficient of", Kind::CubicExpansion);
        Some(VolumeAt { volume, reference, expansion })
    }

    /// Height of the mass centre above the pan.
    pub fn mass_centre_height(self) -> Option<Quantity<'e>> {
        self.stated("mass_centre_height", "h", "height of the mass centre of", Kind::Height)
    }

    fn stated(self, field: &str, symbol: &str, label: &str, kind: Kind) -> Option<Quantity<'e>> {
        let name = self.block.name();
        let given = self.block.fields().given(field, kind)?;
        self.engine.given(
            &given,
            &format!("{name}.{field}"),
            &format!("{symbol}_{name}"),
            &format!("{label} {}", self.block.label()),
            kind,
        )
    }
}

impl<'e> VolumeAt<'e> {
    /// The volume at temperature `t`; a weight without expansion coefficient keeps its volume, which is assumed.
    pub fn at(self, t: Quantity<'e>) -> Quantity<'e> {
        match self.expansion {
            Some(beta) => volume::at_temperature(self.volume, beta, self.reference, t),
            None => self.volume,
        }
    }
}
