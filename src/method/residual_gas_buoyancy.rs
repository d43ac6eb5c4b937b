//! Residual gas in the vacuum chamber: its density, its buoyancy, its refractive index.
//!
//! # Source    equation of state of an ideal gas, R = N_A k exact (SI Brochure, 9th edition); refractivity in proportion
//!             to pressure over temperature (Lorentz and Lorenz, thin gas).
//! # Formula   ρ = p M/(R T),   Δm = ρ V,   n − 1 = r p/T
//!     p  pressure of the residual gas              Pa
//!     T  its temperature                           K
//!     M  molar mass                                kg/mol
//!     V  volume of the artefact at T               m³
//!     r  refractivity                              K/Pa
//! # Valid for p ≤ 1000 Pa, where the departure from the ideal gas stays below 1e-5 of the effect.

use super::{Method, WorkedExample, constants, exact};
use crate::diagnostic::{Code, Problem};
use crate::graph::{Builder, MethodInfo, Quantity};

/// The largest pressure, in Pa.
pub const LARGEST_PRESSURE: f64 = 1000.0;

/// The registry's line.
pub static METHOD: Method = Method {
    info: MethodInfo {
        name: "residual-gas-buoyancy",
        title: "Residual gas: density, buoyancy, refractive index",
        source: "ideal gas with R = N_A k (SI Brochure, 9th edition); refractivity in proportion to p/T",
        formula: "ρ = p M/(R T),  Δm = ρ V,  n − 1 = r p/T",
        symbols: &[
            ("p", "pressure of the residual gas", "Pa"),
            ("T", "temperature of the residual gas", "K"),
            ("M", "molar mass", "kg/mol"),
            ("V", "volume of the artefact", "m3"),
            ("r", "refractivity", "K/Pa"),
        ],
        valid_for: "pressures up to 1000 Pa",
    },
    examples: &[
        WorkedExample {
            source: "arithmetic of the definition with the exact R, in high precision",
            given: "p = 8 Pa, T = 293.15 K, M = 28.0134 g/mol, V = 125 cm³",
            quantity: "Δm/kg",
            printed: "1.14932e-8",
            found: || {
                let b = Builder::default();
                let (p, t) = (exact(&b, 8.0, "Pa"), exact(&b, 293.15, "K"));
                (density(p, t, exact(&b, 28.0134e-3, "kg/mol")) * exact(&b, 125e-6, "m3")).number()
            },
        },
        WorkedExample {
            source: "magnitude commonly quoted for nitrogen, recalled: 8 Pa give 2e-8",
            given: "p = 8 Pa, T = 293.15 K, r = 7.85e-7 K/Pa",
            quantity: "n − 1",
            printed: "2e-8",
            found: || {
                let b = Builder::default();
                (refractive_index(exact(&b, 8.0, "Pa"), exact(&b, 293.15, "K"), exact(&b, 7.85e-7, "K/Pa")) - 1.0)
                    .number()
            },
        },
    ],
};

/// Density of the gas. A pressure beyond the validity leaves a problem.
pub fn density<'g>(p: Quantity<'g>, t: Quantity<'g>, m: Quantity<'g>) -> Quantity<'g> {
    refuse_beyond(p);
    p * m / (constants::known(p.builder(), "R") * t)
}

/// Refractive index of the gas. A pressure beyond the validity leaves a problem.
pub fn refractive_index<'g>(p: Quantity<'g>, t: Quantity<'g>, r: Quantity<'g>) -> Quantity<'g> {
    refuse_beyond(p);
    1.0 + r * p / t
}

fn refuse_beyond(p: Quantity<'_>) {
    if !(0.0..=LARGEST_PRESSURE).contains(&p.number()) {
        let message = format!("The residual gas is at {} Pa; the formula holds from 0 Pa to 1000 Pa.", p.number());
        let hint = "Check the unit of the gauge; in air the density and index of moist air are needed instead.";
        p.builder().problem(Problem::new(Code::OutOfValidity, message).hint(hint));
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn validity_ends_at_a_thousand_pascals() {
        let b = Builder::default();
        let at = |p: f64| {
            density(exact(&b, p, "Pa"), exact(&b, 293.0, "K"), exact(&b, 0.028, "kg/mol"));
            b.take_problems().first().map(|problem| problem.code)
        };
        assert_eq!((at(0.0), at(1000.0)), (None, None));
        assert_eq!((at(1000.1), at(-0.1)), (Some(Code::OutOfValidity), Some(Code::OutOfValidity)));
    }
}
