//! Sensitivity of a mass comparator from a sensitivity weight.
//!
//! # Source    OIML R 111-1:2004, C.6.4.1; buoyancy of the small weight as in C.5.
//! # Formula   k = m_s (1 − ρ_a/ρ_s) / ΔI_s
//!     k      mass for a unit of indication             1      (indications are in units of mass)
//!     m_s    mass of the sensitivity weight            kg
//!     ρ_s    its density; the bracket falls away when the stated value is already corrected for buoyancy   kg/m³
//!     ΔI_s   mean step of the indication with the weight on the pan   kg
//! # Valid for a comparator that is linear over the step.

use super::{Method, WorkedExample, exact};
use crate::graph::{Builder, MethodInfo, Quantity};
use crate::quantity::Kind;

/// The registry's line.
pub static METHOD: Method = Method {
    info: MethodInfo {
        name: "comparator-sensitivity",
        title: "Sensitivity of a mass comparator",
        source: "OIML R 111-1:2004, C.6.4.1 and C.5",
        formula: "k = m_s (1 − ρ_a/ρ_s) / ΔI_s",
        symbols: &[
            ("k", "mass for a unit of indication", "1"),
            ("m_s", "mass of the sensitivity weight", "kg"),
            ("ρ_a", "density of the air", "kg/m3"),
            ("ρ_s", "density of the sensitivity weight", "kg/m3"),
            ("ΔI_s", "mean step of the indication", "kg"),
        ],
        valid_for: "a comparator linear over the step",
    },
    examples: &[WorkedExample {
        source: "arithmetic of the definition, by hand",
        given: "m_s = 20.000 mg, corrected for buoyancy, step 19.998 mg",
        quantity: "k",
        printed: "1.0001000",
        found: || {
            let builder = Builder::default();
            sensitivity(exact(&builder, 20.0, "mg"), exact(&builder, 19.998, "mg")).number()
        },
    }],
};

/// k for a sensitivity weight of apparent mass `apparent` and mean step `step`.
pub fn sensitivity<'g>(apparent: Quantity<'g>, step: Quantity<'g>) -> Quantity<'g> {
    apparent.as_kind(Kind::Plain) / step.as_kind(Kind::Plain)
}

/// What a sensitivity weight of mass `m` and density `rho` weighs in air of density `air`.
pub fn apparent_mass<'g>(m: Quantity<'g>, rho: Quantity<'g>, air: Quantity<'g>) -> Quantity<'g> {
    m.as_kind(Kind::Plain) * (1.0 - air.as_kind(Kind::Plain) / rho.as_kind(Kind::Plain))
}
