//! Gravity at the centre of mass of an artefact, at the time of weighing.
//!
//! # Source    definition of the International Gravity Reference System by the instantaneous free-fall acceleration and
//!             conventional corrections (Wziontek et al., J. Geodesy 95 (2021) 7); the sum of effects is arithmetic.
//! # Formula   g(t) = g_0 + Δ_height + Δ_tie + Δ_self + E_tide(t) + E_load(t) + E_air(t) + E_pole + E_water
//!     g_0       gravity at the mark, corrected to the conventions of its report        m/s²
//!     Δ_height  from the mark to the height of the centre of mass                      m/s²
//!     Δ_tie     from the place of the absolute value to the balance, at one height     m/s²
//!     Δ_self    attraction of the balance, absent when the absolute value was taken    m/s²
//!     E_…       effects on g: tide, ocean load, air pressure, polar motion, ground water; the conventional corrections
//!               of a report are their negatives, so that here they are added back         m/s²
//! # Valid for effects that follow the conventions of the report (permanent tide, normal pressure, zero pole). An effect is
//!             positive where it makes a mass weigh more.

use super::{Method, WorkedExample, exact};
use crate::graph::{Builder, MethodInfo, Quantity};

/// The registry's line.
pub static METHOD: Method = Method {
    info: MethodInfo {
        name: "gravity-transfer",
        title: "Gravity at the centre of mass at the time of weighing",
        source: "Wziontek et al., J. Geodesy 95 (2021) 7 (definition); sum of effects",
        formula: "g(t) = g_0 + Δ_height + Δ_tie + Δ_self + E_tide(t) + E_load(t) + E_air(t) + E_pole + E_water",
        symbols: &[
            ("g", "gravity at the centre of mass", "m/s2"),
            ("g_0", "gravity at the mark", "m/s2"),
            ("Δ_height", "change from the mark to the centre of mass", "m/s2"),
            ("Δ_tie", "change from the absolute site to the balance", "m/s2"),
            ("Δ_self", "attraction of the balance", "m/s2"),
            ("E_tide", "effect of the tide of the solid Earth", "m/s2"),
            ("E_load", "effect of the load of the ocean tide", "m/s2"),
            ("E_air", "effect of air pressure", "m/s2"),
            ("E_pole", "effect of polar motion", "m/s2"),
            ("E_water", "effect of ground water", "m/s2"),
        ],
        valid_for: "effects that follow the conventions of the gravimeter's report",
    },
    examples: &[WorkedExample {
        source: "decimal arithmetic of the sum, by hand",
        given: "g_0 = 9.8072945691 m/s²; effects −4121.2, −418.6, −54.81, +21.34, −475.754, −15.99 nm/s²",
        quantity: "g/(m/s²)",
        printed: "9.807289504086",
        found: || {
            let builder = Builder::default();
            let effects =
                [-4121.2, -418.6, -54.81, 21.34, -475.754, -15.99].map(|effect| exact(&builder, effect, "nm/s2"));
            at_mass(exact(&builder, 9.807_294_569_1, "m/s2"), &effects).number()
        },
    }],
};

/// Gravity with all effects added; a column where one of them is.
pub fn at_mass<'g>(reference: Quantity<'g>, effects: &[Quantity<'g>]) -> Quantity<'g> {
    effects.iter().fold(reference, |sum, effect| sum + *effect)
}
