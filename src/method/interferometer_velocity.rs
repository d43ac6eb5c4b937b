//! Velocity from the fringes an interferometer counts in a gate.
//!
//! # Source    definition of the metre (SI Brochure, 9th edition, 2.3.1); two passes, so a fringe is half a wavelength.
//! # Formula   λ_0 = c/f,  τ = τ_nom/(1 + y),  v = N λ_0/(2 n τ) = N c (1 + y)/(2 n f τ_nom)
//!     N      fringes in the gate, with their sign    1
//!     f      frequency of the laser                  Hz
//!     n      refractive index                        1
//!     τ_nom  nominal length of the gate              s
//!     y      relative offset of the time base        1
//! # Valid for a target whose optical path changes by twice its way.

use super::{Method, WorkedExample, constants, exact};
use crate::graph::{Builder, MethodInfo, Quantity};

/// The registry's line.
pub static METHOD: Method = Method {
    info: MethodInfo {
        name: "interferometer-velocity",
        title: "Velocity from interference fringes",
        source: "definition of the metre, SI Brochure, 9th edition, 2.3.1",
        formula: "v = N c (1 + y)/(2 n f τ_nom),  λ_0 = c/f",
        symbols: &[
            ("v", "velocity along the beam", "m/s"),
            ("N", "fringes in the gate, with their sign", "1"),
            ("c", "speed of light in vacuum", "m/s"),
            ("y", "relative offset of the time base", "1"),
            ("n", "refractive index", "1"),
            ("f", "frequency of the laser", "Hz"),
            ("λ_0", "wavelength in vacuum", "m"),
            ("τ_nom", "nominal length of the gate", "s"),
        ],
        valid_for: "fringes of half a wavelength",
    },
    examples: &[
        example("λ_0/nm", "632.9912125785987", || {
            let builder = Builder::default();
            vacuum_wavelength(exact(&builder, 473_612_353_604_000.0, "Hz")).number() * 1e9
        }),
        example("v/(mm/s)", "2.0002522322284", || {
            let builder = Builder::default();
            let k = |value, unit| exact(&builder, value, unit);
            let laser = k(473_612_353_604_000.0, "Hz");
            velocity(k(632.0, "1"), laser, k(2.4e-10, "1"), k(1.0, "1"), k(0.1, "s")).number() * 1e3
        }),
    ],
};

const fn example(quantity: &'static str, printed: &'static str, found: fn() -> f64) -> WorkedExample {
    WorkedExample {
        source: "computed in high precision from the formula",
        given: "N = 632, f = 473 612 353 604 000 Hz, n = 1, τ_nom = 0.1 s, y = 2.4e-10",
        quantity,
        printed,
        found,
    }
}

/// λ_0.
pub fn vacuum_wavelength(f: Quantity<'_>) -> Quantity<'_> {
    constants::known(f.builder(), "c") / f
}

/// v; a column where `fringes` is one.
pub fn velocity<'g>(
    fringes: Quantity<'g>,
    f: Quantity<'g>,
    y: Quantity<'g>,
    n: Quantity<'g>,
    gate: Quantity<'g>,
) -> Quantity<'g> {
    let c = constants::known(f.builder(), "c");
    fringes * (c * (1.0 + y) / (2.0 * n * f * gate))
}
