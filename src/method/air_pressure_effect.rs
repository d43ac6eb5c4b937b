//! Effect of the air pressure on gravity: attraction and loading of the atmosphere by a single admittance.
//!
//! # Source    DIN 5450 (normal pressure); IAG 1983, resolution 9 (admittance −0.3 µGal/hPa).
//! # Formula   p_n(h) = 1013.25 hPa (1 − 0.0065 h/288.15)^5.2559;  E = α (p − p_n)
//!     E    effect on g, positive downward      m/s²
//!     α    admittance, −3.0e-11 typical        m s⁻² Pa⁻¹
//!     p    air pressure                        Pa
//!     p_n  normal pressure at the height h     Pa
//!     h    height above sea level              m
//! # Valid for −430 m ≤ h ≤ 6000 m; the admittance of a site lies between −0.2 and −0.42 µGal/hPa.

use super::{Method, WorkedExample};
use crate::graph::{MethodInfo, Quantity};
use crate::numeric::elementary::pow;
use crate::quantity::Kind;

/// The registry's line.
pub static METHOD: Method = Method {
    info: MethodInfo {
        name: "air-pressure-effect",
        title: "Effect of the air pressure on gravity",
        source: "DIN 5450; IAG 1983, resolution 9",
        formula: "p_n(h) = 1013.25 hPa (1 − 0.0065 h/288.15)^5.2559;  E = α (p − p_n)",
        symbols: &[
            ("E", "effect on g, positive downward", "m/s2"),
            ("α", "admittance", "m s-2 Pa-1"),
            ("p", "air pressure", "Pa"),
            ("p_n", "normal pressure at the height of the site", "Pa"),
            ("h", "height above sea level", "m"),
        ],
        valid_for: "heights from −430 m to 6000 m",
    },
    examples: &[
        WorkedExample {
            source: "DIN 5450, the formula in 40-digit arithmetic",
            given: "550 m above sea level",
            quantity: "p_n/hPa",
            printed: "948.89849",
            found: || normal_pressure(550.0) / 100.0,
        },
        WorkedExample {
            source: "DIN 5450, the formula in 40-digit arithmetic",
            given: "952.6 hPa at 550 m, −0.3 µGal/hPa",
            quantity: "E/µGal",
            printed: "-1.11045",
            found: || -0.3 * (952.6 - normal_pressure(550.0) / 100.0),
        },
    ],
};

/// Admittance where a report states no other, m s⁻² Pa⁻¹ (IAG 1983).
pub const ADMITTANCE: f64 = -3.0e-11;
/// Standard uncertainty of the admittance where none is stated, m s⁻² Pa⁻¹.
pub const ADMITTANCE_UNCERTAINTY: f64 = 5e-12;

/// Normal pressure, Pa, at a height above sea level, m.
pub fn normal_pressure(height: f64) -> f64 {
    101_325.0 * pow(1.0 - 0.0065 * height / 288.15, 5.2559)
}

/// Effect on g; a column where `p` is one.
pub fn effect<'g>(alpha: Quantity<'g>, p: Quantity<'g>, p_n: Quantity<'g>) -> Quantity<'g> {
    alpha * (p.as_kind(Kind::Plain) - p_n.as_kind(Kind::Plain))
}
