//! Voltage compensated by an array of junctions, and the rest read on a null meter.
//!
//! # Source    definition of the Josephson constant K_J = 2e/h (SI Brochure, 9th edition; Mise en pratique of the
//!             ampere); compensation method with a null meter, Metrologia 2025, doi 10.1088/1681-7575/ae1dfc.
//! # Formula   U = n U_step + g U_null
//!     n       number of steps, signed                          1
//!     U_step  voltage of one step, f (1 + y)(1 + j)/K_J        V
//!     g       gain of the null meter: true over indicated      1
//!     U_null  reading of the null meter                        V
//! # Valid for a null meter in its linear range and an array on the step that is written.

use super::{Method, WorkedExample, constants, exact};
use crate::graph::{Builder, MethodInfo, Quantity};

/// The registry's line.
pub static METHOD: Method = Method {
    info: MethodInfo {
        name: "compensated-voltage",
        title: "Voltage compensated by an array of junctions",
        source: "SI Brochure, 9th edition (K_J = 2e/h); compensation with a null meter, doi 10.1088/1681-7575/ae1dfc",
        formula: "U = n U_step + g U_null",
        symbols: &[
            ("n", "number of steps, signed", "1"),
            ("U_step", "voltage of one step", "V"),
            ("g", "gain of the null meter, true over indicated", "1"),
            ("U_null", "reading of the null meter", "V"),
        ],
        valid_for: "a null meter in its linear range; the array on the step written",
    },
    examples: &[WorkedExample {
        source: "exact constants of the SI in rational arithmetic",
        given: "6984 steps at 74.96 GHz, g = 1.0000482, null reading 829.8759 µV",
        quantity: "U/V",
        printed: "1.083383615660",
        found: || {
            let b = Builder::default();
            let step = exact(&b, 74.96e9, "Hz") / constants::known(&b, "K_J");
            compensated_voltage(b.number(6984.0), step, b.number(1.000_048_2), exact(&b, 829.8759e-6, "V")).number()
        },
    }],
};

/// The voltage row by row; steps and null reading are columns or numbers.
pub fn compensated_voltage<'g>(
    n: Quantity<'g>,
    u_step: Quantity<'g>,
    g: Quantity<'g>,
    u_null: Quantity<'g>,
) -> Quantity<'g> {
    n * u_step + g * u_null
}
