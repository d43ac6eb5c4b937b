//! Values of electric quantities in the units of 1990, carried to the SI.
//!
//! # Source    conventional values K_J-90 and R_K-90: CIPM recommendations 1 and 2 (CI-1988); ended on 20 May 2019
//!             (SI Brochure, 9th edition, appendix 2, mise en pratique for the electric units).
//! # Formula   U = {U}_90 V (K_J-90/K_J),  R = {R}_90 Ω (R_K/R_K-90)
//!     {U}_90  numerical value of a voltage in V_90
//!     {R}_90  numerical value of a resistance in Ω_90
//! # Valid for values traced to the Josephson and quantum Hall effects by the conventional constants.

use super::{Method, WorkedExample, constants, exact};
use crate::graph::{Builder, MethodInfo, Quantity};

/// The registry's line.
pub static METHOD: Method = Method {
    info: MethodInfo {
        name: "conversion-1990",
        title: "Electric units of 1990 to the SI",
        source: "CIPM recommendations 1 and 2 (CI-1988); mise en pratique for the electric units (2019)",
        formula: "U = {U}_90 V (K_J-90/K_J),  R = {R}_90 Ω (R_K/R_K-90)",
        symbols: &[
            ("U", "voltage", "V"),
            ("R", "resistance", "ohm"),
            ("K_J", "Josephson constant, exact", "Hz/V"),
            ("K_J-90", "conventional value of 1990, 483 597.9 GHz/V", "Hz/V"),
            ("R_K", "von Klitzing constant, exact", "ohm"),
            ("R_K-90", "conventional value of 1990, 25 812.807 Ω", "ohm"),
        ],
        valid_for: "values on certificates in the units of 1990",
    },
    examples: &[
        example("V_90/V − 1", "1.06665e-7", || voltage_factor(&Builder::default()).number() - 1.0),
        example("Ω_90/Ω − 1", "1.7794e-8", || resistance_factor(&Builder::default()).number() - 1.0),
    ],
};

const fn example(quantity: &'static str, printed: &'static str, found: fn() -> f64) -> WorkedExample {
    WorkedExample {
        source: "mise en pratique for the electric units (2019), with the digits computed in high precision",
        given: "K_J-90 = 483 597.9 GHz/V, R_K-90 = 25 812.807 Ω",
        quantity,
        printed,
        found,
    }
}

/// V_90/V.
pub fn voltage_factor(builder: &Builder) -> Quantity<'_> {
    exact(builder, 483_597.9, "GHz/V") / constants::known(builder, "K_J")
}

/// Ω_90/Ω.
pub fn resistance_factor(builder: &Builder) -> Quantity<'_> {
    constants::known(builder, "R_K") / exact(builder, 25_812.807, "ohm")
}
