//! Mass by a balance that compares electrical and mechanical power.
//!
//! # Source    Metrologia 2025, doi 10.1088/1681-7575/ae1dfc, equation 9 (without corrections) and 19; mise en pratique of the
//!             kilogram. The corrections to first order are derived here.
//! # Formula   y = [I (1 + α I + β I²) Bl (1 + d)(1 + ε_F) − k_b b]/g       one value a sample
//!             m = (M + ρ V)/(1 + d_mag)
//!             everything ideal: m = h i n_1 f_1 n_2 f_2/(4 ρ_R g v)
//!     I      current                                              A
//!     Bl     geometric factor at position and time                T m
//!     d      change of Bl between the phases, relative            1
//!     ε_F    tilt of the beam times horizontal over vertical force 1
//!     k_b    stiffness of the balance                             N/m
//!     b      position of the beam off null                        m
//!     g      gravitational acceleration at the artefact           m/s²
//!     M      apparent mass from the tare fit                      kg
//!     ρ V    buoyancy in the residual gas                         kg
//!     d_mag  magnetic force on the artefact over its weight       1
//!     h      Planck constant, exact                               J s
//!     i      plateau of the quantum Hall effect; ρ_R = R i/R_K    1
//! e cancels, h does not: u(h) = 0 makes this a realization.
//! # Valid for coil and artefact in one vacuum, and one geometric factor in both phases but for d.

use super::{Method, WorkedExample, constants, exact};
use crate::graph::{Builder, MethodInfo, Quantity};

/// The registry's line.
pub static METHOD: Method = Method {
    info: MethodInfo {
        name: "kibble-mass",
        title: "Mass from electrical and mechanical power",
        source: "Metrologia 2025, doi 10.1088/1681-7575/ae1dfc, equations 9 and 19; mise en pratique of the kilogram",
        formula: "y = [I (1 + α I + β I²) Bl (1 + d)(1 + ε_F) − k_b b]/g;  m = (M + ρ V)/(1 + d_mag)",
        symbols: &[
            ("y", "force over gravitational acceleration", "kg"),
            ("I", "current", "A"),
            ("Bl", "geometric factor", "T m"),
            ("d", "change of the geometric factor between the phases", "1"),
            ("ε_F", "tilt of the beam times horizontal force", "1"),
            ("k_b", "stiffness of the balance", "N/m"),
            ("b", "position of the beam off null", "m"),
            ("g", "gravitational acceleration", "m/s2"),
            ("M", "apparent mass", "kg"),
            ("d_mag", "magnetic force over weight", "1"),
        ],
        valid_for: "coil and artefact in one vacuum; one geometric factor in both phases but for d",
    },
    examples: &[WorkedExample {
        source: "m = h i n_1 n_2 f_1 f_2/(4 ρ_R g v) in rational arithmetic, and the same by way of Bl = U/v and I = V/R",
        given: "n_1 = 6984, n_2 = 11688, f = 74.96 GHz, i = 2, ρ_R = 0.007748117, g = 9.8072905 m/s², v = 2 mm/s",
        quantity: "m/kg",
        printed: "0.9998950484",
        found: ideal_example,
    }],
};

/// The balance in one sample: what its force is worth in mass.
#[derive(Clone, Copy)]
pub struct Balance<'g> {
    /// I (1 + α I + β I²).
    pub effective_current: Quantity<'g>,
    pub geometric_factor: Quantity<'g>,
    /// d.
    pub factor_change: Quantity<'g>,
    /// ε_F.
    pub beam_force: Quantity<'g>,
    /// k_b.
    pub stiffness: Quantity<'g>,
    /// b.
    pub beam: Quantity<'g>,
    pub gravity: Quantity<'g>,
}

/// y, sample by sample.
pub fn balance_reading<'g>(s: &Balance<'g>) -> Quantity<'g> {
    let force = s.effective_current * s.geometric_factor * ((1.0 + s.factor_change) * (1.0 + s.beam_force));
    (force - s.stiffness * s.beam) / s.gravity
}

/// m from the apparent mass, the buoyancy and the magnetic force.
pub fn mass<'g>(apparent: Quantity<'g>, buoyancy: Quantity<'g>, d_mag: Quantity<'g>) -> Quantity<'g> {
    (apparent + buoyancy) / (1.0 + d_mag)
}

fn ideal_example() -> f64 {
    let b = Builder::default();
    let step = exact(&b, 74.96e9, "Hz") / constants::known(&b, "K_J");
    let geometric_factor = 6984.0 * step / exact(&b, 2e-3, "m/s");
    let resistance = 0.007_748_117 * constants::known(&b, "R_K") / 2.0;
    let zero = b.number(0.0);
    let y = balance_reading(&Balance {
        effective_current: 11_688.0 * step / resistance,
        geometric_factor,
        factor_change: zero,
        beam_force: zero,
        stiffness: exact(&b, 0.0, "N/m"),
        beam: exact(&b, 0.0, "m"),
        gravity: exact(&b, 9.807_290_5, "m/s2"),
    });
    mass(y, exact(&b, 0.0, "kg"), zero).number()
}
