//! Volume of a weight at the temperature of use, and density from mass and volume.
//!
//! # Source    definition of the cubic expansion coefficient (ISO 80000-5); OIML R 111-1:2004, B.7 uses the same form.
//! # Formula   V(T) = V_ref [1 + β (T − T_ref)],   ρ = m / V
//!     V_ref  volume at the reference temperature    m³
//!     β      cubic expansion coefficient            1/K
//!     T      temperature of use                     K
//! # Valid for temperatures near the reference temperature, where β is constant.

use super::{Method, WorkedExample, exact};
use crate::graph::{Builder, MethodInfo, Quantity};
use crate::quantity::Kind;

/// The registry's line.
pub static METHOD: Method = Method {
    info: MethodInfo {
        name: "volume",
        title: "Volume at the temperature of use",
        source: "ISO 80000-5, cubic expansion coefficient; OIML R 111-1:2004, B.7",
        formula: "V(T) = V_ref [1 + β (T − T_ref)],  ρ = m/V",
        symbols: &[
            ("V", "volume", "m3"),
            ("β", "cubic expansion coefficient", "/K"),
            ("T", "temperature", "K"),
            ("m", "mass", "kg"),
            ("ρ", "density", "kg/m3"),
        ],
        valid_for: "temperatures near the reference temperature",
    },
    examples: &[WorkedExample {
        source: "arithmetic of the definition, by hand",
        given: "V = 125 cm³ at 20 °C, β = 48e-6 /K, 22 °C",
        quantity: "V/cm³",
        printed: "125.0120",
        found: || {
            let builder = Builder::default();
            let volume = exact(&builder, 125.0, "cm3").as_kind(Kind::Volume);
            let (reference, used) = (exact(&builder, 293.15, "K"), exact(&builder, 295.15, "K"));
            let beta = exact(&builder, 48e-6, "/K");
            at_temperature(volume, beta, reference.as_kind(Kind::Temperature), used.as_kind(Kind::Temperature)).number()
                * 1e6
        },
    }],
};

/// Volume at temperature `t`; a column where `t` is one.
pub fn at_temperature<'g>(
    volume: Quantity<'g>,
    beta: Quantity<'g>,
    t_ref: Quantity<'g>,
    t: Quantity<'g>,
) -> Quantity<'g> {
    let rise = (t - t_ref).as_kind(Kind::Plain);
    (volume * (1.0 + beta.as_kind(Kind::Plain) * rise)).as_kind(Kind::Volume)
}

/// Volume of a weight of known density.
pub fn from_density<'g>(m: Quantity<'g>, rho: Quantity<'g>) -> Quantity<'g> {
    (m.as_kind(Kind::Plain) / rho.as_kind(Kind::Plain)).as_kind(Kind::Volume)
}

/// Density of a weight of known volume.
pub fn density<'g>(m: Quantity<'g>, volume: Quantity<'g>) -> Quantity<'g> {
    (m.as_kind(Kind::Plain) / volume.as_kind(Kind::Plain)).as_kind(Kind::Density)
}
