//! Resistance in terms of the quantum Hall effect.
//!
//! # Source    mise en pratique for the ampere and other electric units (SI Brochure, 9th edition, appendix 2): R_H = R_K/i.
//! # Formula   R = r R_K/[i (1 + b)],  R_K = h/e²
//!     r    ratio of the resistor to the Hall resistance, as the bridge indicates it   1
//!     i    plateau                                                                    1
//!     b    relative error of the bridge, estimate zero                                1
//!     R_K  von Klitzing constant, computed from h and e                               Ω
//! # Valid for whole plateaus, i ≥ 1.

use super::{Method, WorkedExample, constants};
use crate::graph::{Builder, MethodInfo, Quantity};

/// The registry's line.
pub static METHOD: Method = Method {
    info: MethodInfo {
        name: "quantum-hall-resistance",
        title: "Resistance from the quantum Hall effect",
        source: "mise en pratique for the electric units, SI Brochure, 9th edition, appendix 2",
        formula: "R = r R_K/[i (1 + b)],  R_K = h/e²",
        symbols: &[
            ("R", "resistance", "ohm"),
            ("r", "ratio indicated by the bridge", "1"),
            ("R_K", "von Klitzing constant, exact", "ohm"),
            ("i", "plateau", "1"),
            ("b", "relative error of the bridge", "1"),
        ],
        valid_for: "whole plateaus",
    },
    examples: &[
        WorkedExample {
            source: "CODATA 2022, as listed: 25 812.807 45… Ω",
            given: "h and e, exact",
            quantity: "R_K/Ω",
            printed: "25812.807459",
            found: || constants::known(&Builder::default(), "R_K").number(),
        },
        WorkedExample {
            source: "computed in high precision from R = r R_K/i",
            given: "i = 2, r = 0.0077481168, b = 0",
            quantity: "R/Ω",
            printed: "100.000323565301",
            found: || {
                let builder = Builder::default();
                resistance(builder.number(0.007_748_116_8), 2.0, builder.number(0.0)).number()
            },
        },
    ],
};

/// R.
pub fn resistance<'g>(ratio: Quantity<'g>, plateau: f64, bridge: Quantity<'g>) -> Quantity<'g> {
    let r_k = constants::known(ratio.builder(), "R_K");
    ratio * (r_k / plateau) / (1.0 + bridge)
}
