//! What is known of a Kibble balance beside its standards: alignment, parasitic motion, coil, null meters, vacuum.

use super::calibration::check_dimension;
use super::engine::{Block, Engine, shorten};
use super::field::{Field, Shape, needed, optional};
use super::fields::Fields;
use super::{BlockKind, Output};
use crate::diagnostic::Complaints;
use crate::graph::{Quantity, Value};
use crate::method::unit;
use crate::quantity::Kind;
use crate::record::Text;

/// One property: its field, symbol, unit, kind, neutral value and meaning.
struct Property {
    field: &'static str,
    symbol: &'static str,
    unit: &'static str,
    kind: Kind,
    neutral: f64,
    meaning: &'static str,
}

/// A group of properties as a table of fields, a list, and a structure with one quantity each.
macro_rules! properties {
    ($(#[$doc:meta])* $group:ident $list:ident
     $($field:ident $symbol:literal $unit:literal $kind:ident $neutral:literal $meaning:literal;)*) => {
        $(#[$doc])*
        #[derive(Clone, Copy)]
        pub struct $group<'e> { $(#[doc = $meaning] pub $field: Quantity<'e>,)* }

        const $list: &[Property] = &[$(Property {
            field: stringify!($field), symbol: $symbol, unit: $unit, kind: Kind::$kind, neutral: $neutral, meaning: $meaning,
        }),*];

        impl<'e> $group<'e> {
            fn read(reader: &mut Reader<'e, '_>) -> Option<$group<'e>> {
                let mut list = $list.iter().map(|property| reader.read(property));
                Some($group { $($field: list.next()??,)* })
            }
        }
    };
}

properties! {
    /// Parasitic forces and torques over the vertical force, parasitic velocities over the vertical velocity.
    Parasitic PARASITIC
    force_x "F_x" "1" Plain 0.0 "horizontal force along x over the vertical force";
    force_y "F_y" "1" Plain 0.0 "horizontal force along y over the vertical force";
    velocity_x "v_x" "1" Plain 0.0 "horizontal velocity along x over the vertical velocity";
    velocity_y "v_y" "1" Plain 0.0 "horizontal velocity along y over the vertical velocity";
    torque_x "Γ_x" "m" Plain 0.0 "torque about x over the vertical force";
    torque_y "Γ_y" "m" Plain 0.0 "torque about y over the vertical force";
    torque_z "Γ_z" "m" Plain 0.0 "torque about z over the vertical force";
    angular_velocity_x "ω_x" "rad/m" Plain 0.0 "angular velocity about x over the vertical velocity";
    angular_velocity_y "ω_y" "rad/m" Plain 0.0 "angular velocity about y over the vertical velocity";
    angular_velocity_z "ω_z" "rad/m" Plain 0.0 "angular velocity about z over the vertical velocity";
}

properties! {
    /// What the apparatus adds to the measurement by itself.
    Properties PROPERTIES
    beam_tilt_x "θ_x" "rad" Angle 0.0 "tilt of the laser beam from the vertical, along x";
    beam_tilt_y "θ_y" "rad" Angle 0.0 "tilt of the laser beam from the vertical, along y";
    optical_offset_x "d_x" "m" Length 0.0 "horizontal offset of the optical centre along x";
    optical_offset_y "d_y" "m" Length 0.0 "horizontal offset of the optical centre along y";
    balance_tilt "α_beam" "rad" Angle 0.0 "tilt of the balance beam from the horizontal, along x";
    stiffness "k_b" "N/m" Plain 0.0 "stiffness of the balance: force over position off null";
    current_coefficient "α" "/A" Plain 0.0 "first relative change of the geometric factor with the current";
    second_current_coefficient "β" "A-2" Plain 0.0 "second relative change of the geometric factor with the current";
    geometric_factor_change "d_mod" "1" Plain 0.0 "relative change of the geometric factor between the phases";
    magnetic_force "d_mag" "1" Plain 0.0 "magnetic force on the artefact over its weight";
    null_gain_moving "g_1" "1" Plain 1.0 "null voltage over its reading in the moving phase";
    null_gain_weighing "g_2" "1" Plain 1.0 "null voltage over its reading in the weighing phase";
    leakage "l" "1" Plain 0.0 "relative error of the voltage across the resistor by leakage";
    vacuum_gauge_factor "k_p" "1" Plain 1.0 "pressure in the chamber over its indication";
    residual_gas_molar_mass "M_gas" "kg/mol" Plain 0.0 "molar mass of the residual gas";
    residual_gas_refractivity "r" "K/Pa" Plain 0.0 "refractivity of the residual gas: (n - 1) T/p";
}

const CORRECTION_FIELDS: &[Field] = &[
    needed("label", Shape::Text, "what is corrected, in words"),
    needed("relative", Shape::Value(Kind::Plain), "relative correction to the mass, with its uncertainty"),
    optional("source", Shape::Text, "where it comes from"),
];

const PARASITIC_FIELDS: &[Field] = &[
    optional("force_x", Shape::Value(Kind::Plain), "horizontal force along x over the vertical force"),
    optional("force_y", Shape::Value(Kind::Plain), "horizontal force along y over the vertical force"),
    optional("velocity_x", Shape::Value(Kind::Plain), "horizontal velocity along x over the vertical velocity"),
    optional("velocity_y", Shape::Value(Kind::Plain), "horizontal velocity along y over the vertical velocity"),
    optional("torque_x", Shape::Value(Kind::Plain), "torque about x over the vertical force"),
    optional("torque_y", Shape::Value(Kind::Plain), "torque about y over the vertical force"),
    optional("torque_z", Shape::Value(Kind::Plain), "torque about z over the vertical force"),
    optional("angular_velocity_x", Shape::Value(Kind::Plain), "angular velocity about x over the vertical velocity"),
    optional("angular_velocity_y", Shape::Value(Kind::Plain), "angular velocity about y over the vertical velocity"),
    optional("angular_velocity_z", Shape::Value(Kind::Plain), "angular velocity about z over the vertical velocity"),
];

/// An apparatus.
pub static KIND: BlockKind = BlockKind {
    name: "apparatus",
    meaning: "a Kibble balance: alignment, parasitic motion, coil, null meters, residual gas",
    fields: &[
        optional("label", Shape::Text, "what is printed for it"),
        optional("identification", Shape::Text, "the apparatus, where it stands"),
        optional("beam_tilt_x", Shape::Value(Kind::Angle), "tilt of the laser beam from the vertical, along x"),
        optional("beam_tilt_y", Shape::Value(Kind::Angle), "tilt of the laser beam from the vertical, along y"),
        optional("optical_offset_x", Shape::Value(Kind::Length), "horizontal offset of the optical centre along x"),
        optional("optical_offset_y", Shape::Value(Kind::Length), "horizontal offset of the optical centre along y"),
        optional("balance_tilt", Shape::Value(Kind::Angle), "tilt of the balance beam from the horizontal, along x"),
        optional("stiffness", Shape::Value(Kind::Plain), "stiffness of the balance: force over position off null"),
        optional(
            "current_coefficient",
            Shape::Value(Kind::Plain),
            "first relative change of the geometric factor with the current",
        ),
        optional(
            "second_current_coefficient",
            Shape::Value(Kind::Plain),
            "second relative change of the geometric factor with the current",
        ),
        optional(
            "geometric_factor_change",
            Shape::Value(Kind::Plain),
            "relative change of the geometric factor between the phases",
        ),
        optional("magnetic_force", Shape::Value(Kind::Plain), "magnetic force on the artefact over its weight"),
        optional("null_gain_moving", Shape::Value(Kind::Plain), "null voltage over its reading in the moving phase"),
        optional(
            "null_gain_weighing",
            Shape::Value(Kind::Plain),
            "null voltage over its reading in the weighing phase",
        ),
        optional("leakage", Shape::Value(Kind::Plain), "relative error of the voltage across the resistor by leakage"),
        optional("vacuum_gauge_factor", Shape::Value(Kind::Plain), "pressure in the chamber over its indication"),
        optional("residual_gas_molar_mass", Shape::Value(Kind::Plain), "molar mass of the residual gas"),
        optional(
            "residual_gas_refractivity",
            Shape::Value(Kind::Plain),
            "refractivity of the residual gas: (n - 1) T/p",
        ),
        optional("parasitic", Shape::Mapping(PARASITIC_FIELDS), "parasitic forces, torques and velocities"),
        optional("corrections", Shape::Mappings(CORRECTION_FIELDS), "further relative corrections to the mass"),
        optional("source", Shape::Text, "where these values come from"),
    ],
    outputs: &[
        Output { path: "FIELD", meaning: "each property that is stated, by the name of its field", unit: "" },
        Output { path: "parasitic.FIELD", meaning: "each parasitic ratio that is stated", unit: "" },
        Output { path: "correction_1, correction_2, …", meaning: "the further relative corrections", unit: "1" },
    ],
    check,
    build: |engine, block| {
        let _ = read(shorten(engine), block);
    },
};

fn check(fields: Fields<'_>, complaints: &mut Complaints) {
    let mut each = |holder: Fields<'_>, list: &[Property]| {
        list.iter().for_each(|property| check_dimension(holder, property.field, property.unit, false, complaints));
    };
    each(fields, PROPERTIES);
    if let Some(parasitic) = fields.mapping("parasitic") {
        each(parasitic, PARASITIC);
    }
    for correction in fields.mappings("corrections") {
        check_dimension(correction, "relative", "1", true, complaints);
    }
}

/// An apparatus ready for use: a quantity for every property, the neutral exact value where none is stated.
#[derive(Clone)]
pub struct Apparatus<'e> {
    pub properties: Properties<'e>,
    pub parasitic: Parasitic<'e>,
    /// Further relative corrections to the mass, with their labels.
    pub corrections: Vec<(String, Quantity<'e>)>,
}

impl<'e> Apparatus<'e> {
    /// The apparatus with this name; complained of when there is none.
    pub fn find(engine: &'e Engine<'_>, name: &Text) -> Option<Apparatus<'e>> {
        let engine = shorten(engine);
        read(engine, engine.block(name, &["apparatus"])?)
    }
}

/// Reads properties and remembers which were not stated.
struct Reader<'e, 'n> {
    engine: &'e Engine<'e>,
    block: &'e Block,
    holder: Option<Fields<'n>>,
    prefix: String,
    missing: Vec<String>,
}

impl<'e> Reader<'e, '_> {
    fn read(&mut self, property: &Property) -> Option<Quantity<'e>> {
        let given = self.holder.and_then(|holder| holder.given(property.field, property.kind));
        let Some(given) = given else {
            self.missing.push(property.field.replace('_', " "));
            let value = Value::Scalar(property.neutral);
            return Some(self.engine.builder.exact(value, unit(property.unit).dimension(), property.kind));
        };
        let path = format!("{}.{}", self.prefix, property.field);
        let label = format!("{}, {}", property.meaning, self.block.label());
        self.engine.given(&given, &path, property.symbol, &label, property.kind)
    }
}

fn read<'e>(engine: &'e Engine<'e>, block: &'e Block) -> Option<Apparatus<'e>> {
    let (fields, name) = (block.fields(), block.name());
    let mut reader = Reader { engine, block, holder: Some(fields), prefix: name.into(), missing: Vec::new() };
    let properties = Properties::read(&mut reader)?;
    reader.holder = fields.mapping("parasitic");
    reader.prefix = format!("{name}.parasitic");
    let parasitic = Parasitic::read(&mut reader)?;
    if !reader.missing.is_empty() {
        let text = format!(
            "{name} states nothing of {}: taken as exactly zero, factors as exactly one",
            reader.missing.join(", ")
        );
        engine.builder.assume(text, Some(block.raw.name.place));
    }
    let mut corrections = Vec::new();
    for (index, correction) in fields.mappings("corrections").into_iter().enumerate() {
        let (label, path) = (correction.words("label"), format!("{name}.correction_{}", index + 1));
        let given = correction.given("relative", Kind::Plain)?;
        let value = engine.given(&given, &path, &format!("d_{}", index + 1), &label, Kind::Plain)?;
        corrections.push((label, value));
    }
    Some(Apparatus { properties, parasitic, corrections })
}
