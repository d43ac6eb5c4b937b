//! Abbe error of a velocity: the target turns while it moves.
//!
//! # Source    rigid-body kinematics, v_P = v_O + ω × r (derived here).
//! # Formula   v_z = v (1 − a),   a = w_x d_y − w_y d_x
//!     w_x, w_y  angular velocity per unit of vertical velocity                              rad/m
//!     d_x, d_y  horizontal offset of the effective optical centre from the point meant      m
//! # Valid for small offsets of a rigid target.

use super::{Method, WorkedExample, exact};
use crate::graph::{Builder, MethodInfo, Quantity};

/// The registry's line.
pub static METHOD: Method = Method {
    info: MethodInfo {
        name: "abbe-offset",
        title: "Abbe error of a velocity",
        source: "rigid-body kinematics, v_P = v_O + ω × r",
        formula: "v_z = v (1 − a),  a = w_x d_y − w_y d_x",
        symbols: &[
            ("w_x", "angular velocity about x per unit of velocity", "/m"),
            ("w_y", "angular velocity about y per unit of velocity", "/m"),
            ("d_x", "offset of the optical centre along x", "m"),
            ("d_y", "offset of the optical centre along y", "m"),
        ],
        valid_for: "small offsets of a rigid target",
    },
    examples: &[WorkedExample {
        source: "arithmetic of the definition, by hand",
        given: "w = (−137.9, −200.5) µrad/m, d = (6.1, −17.3) µm",
        quantity: "a",
        printed: "3.60872e-9",
        found: || {
            let b = Builder::default();
            let w = [exact(&b, -137.9e-6, "/m"), exact(&b, -200.5e-6, "/m")];
            let d = [exact(&b, 6.1e-6, "m"), exact(&b, -17.3e-6, "m")];
            abbe_error(w, d).number()
        },
    }],
};

/// The relative error a of the velocity measured.
pub fn abbe_error<'g>(w: [Quantity<'g>; 2], d: [Quantity<'g>; 2]) -> Quantity<'g> {
    let ([w_x, w_y], [d_x, d_y]) = (w, d);
    w_x * d_y - w_y * d_x
}
