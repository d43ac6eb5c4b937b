//! Voltage of an array of Josephson junctions.
//!
//! # Source    mise en pratique for the ampere and other electric units (SI Brochure, 9th edition, appendix 2): U = n f/K_J.
//! # Formula   f = f_nom (1 + y),  U_1 = f (1 + j)/K_J,  U = n U_1,  K_J = 2 e/h
//!     f_nom  nominal microwave frequency                      Hz
//!     y      relative offset of the time base                 1
//!     j      relative error of the array, estimate zero       1
//!     K_J    Josephson constant, computed from e and h        Hz/V
//!     n      number of steps, with its sign                   1
//! # Valid for a whole number of steps.

use super::{Method, WorkedExample, constants, exact};
use crate::graph::{Builder, MethodInfo, Quantity};

/// The registry's line.
pub static METHOD: Method = Method {
    info: MethodInfo {
        name: "josephson-voltage",
        title: "Voltage of an array of Josephson junctions",
        source: "mise en pratique for the electric units, SI Brochure, 9th edition, appendix 2",
        formula: "U = n U_1,  U_1 = f (1 + j)/K_J,  f = f_nom (1 + y),  K_J = 2 e/h",
        symbols: &[
            ("U", "voltage", "V"),
            ("n", "number of steps, with its sign", "1"),
            ("U_1", "voltage of one step", "V"),
            ("f_nom", "nominal microwave frequency", "Hz"),
            ("y", "relative offset of the time base", "1"),
            ("j", "relative error of the array", "1"),
            ("K_J", "Josephson constant, exact", "Hz/V"),
        ],
        valid_for: "whole numbers of steps",
    },
    examples: &[
        WorkedExample {
            source: "CODATA 2022, as listed: 483 597.848 4… × 10⁹ Hz/V",
            given: "e and h, exact",
            quantity: "K_J/(10⁹ Hz/V)",
            printed: "483597.8484",
            found: || constants::known(&Builder::default(), "K_J").number() * 1e-9,
        },
        WorkedExample {
            source: "computed in high precision from U = n f/K_J",
            given: "n = 6984, f = 74.96 GHz",
            quantity: "U/V",
            printed: "1.08255369976045",
            found: || {
                let builder = Builder::default();
                let zero = exact(&builder, 0.0, "1");
                let f = frequency(exact(&builder, 74.96, "GHz"), zero);
                (6984.0 * step_voltage(f, zero)).number()
            },
        },
    ],
};

/// f: the actual frequency of a source locked to a time base of relative offset `y`.
pub fn frequency<'g>(f_nom: Quantity<'g>, y: Quantity<'g>) -> Quantity<'g> {
    f_nom * (1.0 + y)
}

/// U_1: the voltage of one step at the actual frequency `f`.
pub fn step_voltage<'g>(f: Quantity<'g>, j: Quantity<'g>) -> Quantity<'g> {
    let k_j = constants::known(f.builder(), "K_J");
    f * (1.0 + j) / k_j
}
