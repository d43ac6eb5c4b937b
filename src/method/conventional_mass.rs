//! Conventional mass from mass, and mass from conventional mass.
//!
//! # Source    OIML R 111-1:2004, 2.7 and OIML D 28:2004; the formula is confirmed in JCGM 101:2008, 9.3.1.2.
//! # Formula   m_c = m (1 − ρ_0 / ρ) / (1 − ρ_0 / ρ_c)
//!     m      mass                                            kg
//!     m_c    conventional mass                               kg
//!     ρ      density of the weight at 20 °C                  kg/m³
//!     ρ_0    reference density of air, 1.2                   kg/m³   exact by convention
//!     ρ_c    density of the reference weight, 8000           kg/m³   exact by convention
//! # Valid for weights in the sense of the convention, at 20 °C.

use super::{Method, WorkedExample, exact};
use crate::graph::{Builder, MethodInfo, Quantity, State};
use crate::quantity::Kind;

/// The registry's line.
pub static METHOD: Method = Method {
    info: MethodInfo {
        name: "conventional-mass",
        title: "Mass and conventional mass",
        source: "OIML R 111-1:2004, 2.7; OIML D 28:2004",
        formula: "m_c = m (1 − ρ_0/ρ) / (1 − ρ_0/ρ_c)",
        symbols: &[
            ("m_c", "conventional mass", "kg"),
            ("m", "mass", "kg"),
            ("ρ", "density of the weight at 20 °C", "kg/m3"),
            ("ρ_0", "reference density of air, 1.2 kg/m³", "kg/m3"),
            ("ρ_c", "density of the reference weight, 8000 kg/m³", "kg/m3"),
        ],
        valid_for: "the conventional conditions: 20 °C, air of 1.2 kg/m³",
    },
    examples: &[
        WorkedExample {
            source: "OIML D 28 convention, computed in high precision",
            given: "m = 1000 g, ρ = 7950 kg/m³",
            quantity: "m_c/g",
            printed: "999.999056462243",
            found: || check(|b| from_mass(b, grams(b, 1000.0), density(b, 7950.0))),
        },
        WorkedExample {
            source: "OIML D 28 convention, computed in high precision",
            given: "m_c = 1000 g, ρ = 7950 kg/m³",
            quantity: "m/g",
            printed: "1000.00094353865",
            found: || check(|b| to_mass(b, grams(b, 1000.0).as_kind(Kind::ConventionalMass), density(b, 7950.0))),
        },
    ],
};

/// Conventional mass of a weight of mass `m` and density `rho`.
pub fn from_mass<'g>(builder: &'g Builder, m: Quantity<'g>, rho: Quantity<'g>) -> Quantity<'g> {
    (m * factor(builder, rho)).as_kind(Kind::ConventionalMass).in_state(None)
}

/// Mass of a weight of conventional mass `m_c` and density `rho`; it holds in air.
pub fn to_mass<'g>(builder: &'g Builder, m_c: Quantity<'g>, rho: Quantity<'g>) -> Quantity<'g> {
    (m_c / factor(builder, rho)).as_kind(Kind::Mass).in_state(Some(State::Air))
}

/// (1 − ρ_0/ρ) / (1 − ρ_0/ρ_c)
fn factor<'g>(builder: &'g Builder, rho: Quantity<'g>) -> Quantity<'g> {
    let (rho_0, rho_c) = (exact(builder, 1.2, "kg/m3"), exact(builder, 8000.0, "kg/m3"));
    (1.0 - rho_0 / rho.as_kind(Kind::Plain)) / (1.0 - rho_0 / rho_c)
}

fn grams<'g>(builder: &'g Builder, value: f64) -> Quantity<'g> {
    exact(builder, value, "g").as_kind(Kind::Mass)
}

fn density<'g>(builder: &'g Builder, value: f64) -> Quantity<'g> {
    exact(builder, value, "kg/m3")
}

fn check(make: impl for<'g> Fn(&'g Builder) -> Quantity<'g>) -> f64 {
    let builder = Builder::default();

    make(&builder).number() * 1e3
}
