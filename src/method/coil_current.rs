//! Current through the coil, and what it does to the geometric factor.
//!
//! # Source    Ohm's law; dependence of the geometric factor on the current: Metrologia 2025,
//!             doi 10.1088/1681-7575/ae1dfc, equation 18. The difference of two states is derived here.
//! # Formula   I = V/[R (1 + l)]
//!             Bl(I) = Bl(0) (1 + α I + β I²)
//!             between two states: Bl (I_off − I_on) [1 + α (I_off + I_on) + β (I_off² + I_off I_on + I_on²)]
//!     V  voltage across the resistor            V
//!     R  resistance at its temperature          Ω
//!     l  leakage, relative                      1
//!     α  first current coefficient              1/A
//!     β  second current coefficient             1/A²
//! # Valid for one position of the coil in both states.

use super::{Method, WorkedExample, exact};
use crate::graph::{Builder, MethodInfo, Quantity};

/// The registry's line.
pub static METHOD: Method = Method {
    info: MethodInfo {
        name: "coil-current",
        title: "Current through the coil and its effect on the geometric factor",
        source: "Ohm's law; Metrologia 2025, doi 10.1088/1681-7575/ae1dfc, equation 18",
        formula: "I = V/[R (1 + l)];  Bl(I) = Bl(0) (1 + α I + β I²)",
        symbols: &[
            ("I", "current through the coil", "A"),
            ("V", "voltage across the resistor", "V"),
            ("R", "resistance", "ohm"),
            ("l", "leakage, relative", "1"),
            ("α", "first current coefficient", "/A"),
            ("β", "second current coefficient", "/A2"),
        ],
        valid_for: "one position of the coil in both states",
    },
    examples: &[
        WorkedExample {
            source: "Metrologia 2025, doi 10.1088/1681-7575/ae1dfc, as quoted: 8e-6 per mA and 2 µA of asymmetry",
            given: "α = 8e-3 /A, β = 0, I_off = 9.052 mA, I_on = −9.050 mA",
            quantity: "relative effect on the difference",
            printed: "1.6e-8",
            found: || {
                let b = Builder::default();
                let (off, on) = (exact(&b, 9.052e-3, "A"), exact(&b, -9.050e-3, "A"));
                let (first, second) = asymmetry_effect(exact(&b, 8e-3, "/A"), exact(&b, 0.0, "/A2"), off, on);
                (first + second).number()
            },
        },
        WorkedExample {
            source: "arithmetic of the definition, by hand",
            given: "α = 0, β = 1.401e-4 /A², I_off = 9 mA, I_on = −9 mA",
            quantity: "relative effect on the difference",
            printed: "1.13481e-8",
            found: || {
                let b = Builder::default();
                let (off, on) = (exact(&b, 9e-3, "A"), exact(&b, -9e-3, "A"));
                let (first, second) = asymmetry_effect(exact(&b, 0.0, "/A"), exact(&b, 1.401e-4, "/A2"), off, on);
                (first + second).number()
            },
        },
    ],
};

/// The current; voltage and resistance are columns or numbers.
pub fn current<'g>(v: Quantity<'g>, r: Quantity<'g>, l: Quantity<'g>) -> Quantity<'g> {
    v / (r * (1.0 + l))
}

/// Bl(I)/Bl(0) row by row.
pub fn factor_ratio<'g>(i: Quantity<'g>, alpha: Quantity<'g>, beta: Quantity<'g>) -> Quantity<'g> {
    1.0 + alpha * i + beta * i.squared()
}

/// The relative effects of the first and of the second coefficient on the difference of two states.
pub fn asymmetry_effect<'g>(
    alpha: Quantity<'g>,
    beta: Quantity<'g>,
    i_off: Quantity<'g>,
    i_on: Quantity<'g>,
) -> (Quantity<'g>, Quantity<'g>) {
    (alpha * (i_off + i_on), beta * (i_off.squared() + i_off * i_on + i_on.squared()))
}
