//! Parasitic motion of the coil: power that the vertical force and velocity do not carry.
//!
//! # Source    reciprocity of the forces and voltages of one coil, derived here; the same statement in Metrologia 2025,
//!             doi 10.1088/1681-7575/ae1dfc.
//! # Formula   U I = F_z v_z (1 + ε)
//!             ε = f_x v_x + f_y v_y + g_x w_x + g_y w_y + g_z w_z
//!     f_x, f_y       horizontal forces of the coil over its vertical force          1
//!     v_x, v_y       horizontal velocities over the vertical velocity               1
//!     g_x, g_y, g_z  torques of the coil over its vertical force                    m
//!     w_x, w_y, w_z  angular velocities over the vertical velocity                  rad/m
//! U/(1 + ε) is the voltage that belongs to the vertical force alone.
//! # Valid for one attitude of the coil in both phases.

use super::{Method, WorkedExample, exact};
use crate::graph::{Builder, MethodInfo, Quantity};

/// The registry's line.
pub static METHOD: Method = Method {
    info: MethodInfo {
        name: "parasitic-motion",
        title: "Parasitic motion of the coil",
        source: "reciprocity of force and voltage; Metrologia 2025, doi 10.1088/1681-7575/ae1dfc",
        formula: "U I = F_z v_z (1 + ε),  ε = f_x v_x + f_y v_y + g_x w_x + g_y w_y + g_z w_z",
        symbols: &[
            ("f_x", "horizontal force over vertical force", "1"),
            ("v_x", "horizontal velocity over vertical velocity", "1"),
            ("g_x", "torque over vertical force", "m"),
            ("w_x", "angular velocity over vertical velocity", "/m"),
        ],
        valid_for: "one attitude of the coil in both phases",
    },
    examples: &[WorkedExample {
        source: "arithmetic of the definition, by hand",
        given: "f = (1, 2)e-6, v = (−200, −300)e-6, g = (3, 7, −1) µm, w = (−100, −200, 50) µrad/m",
        quantity: "ε",
        printed: "-2.55e-9",
        found: || {
            let b = Builder::default();
            let per_metre = |x: f64| exact(&b, x, "/m");
            let metre = |x: f64| exact(&b, x, "m");
            parasitic_power(&Parasitic {
                force: [b.number(1e-6), b.number(2e-6)],
                velocity: [b.number(-200e-6), b.number(-300e-6)],
                torque: [metre(3e-6), metre(7e-6), metre(-1e-6)],
                angular_velocity: [per_metre(-100e-6), per_metre(-200e-6), per_metre(50e-6)],
            })
            .number()
        },
    }],
};

/// Forces and torques over the vertical force; velocities and angular velocities over the vertical velocity.
#[derive(Clone, Copy)]
pub struct Parasitic<'g> {
    pub force: [Quantity<'g>; 2],
    pub velocity: [Quantity<'g>; 2],
    pub torque: [Quantity<'g>; 3],
    pub angular_velocity: [Quantity<'g>; 3],
}

/// ε, the power beside F_z v_z.
pub fn parasitic_power<'g>(p: &Parasitic<'g>) -> Quantity<'g> {
    let (f, v, g, w) = (p.force, p.velocity, p.torque, p.angular_velocity);
    f[0] * v[0] + f[1] * v[1] + g[0] * w[0] + g[1] * w[1] + g[2] * w[2]
}
