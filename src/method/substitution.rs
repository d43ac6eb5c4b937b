//! Substitution weighing in air: the full mass equation.
//!
//! # Source    balance of forces on the pan (OIML R 111-1:2004, C.5 keeps the buoyancy terms; the gradient terms are
//!             common practice between 1 kg standards).
//! # Formula   k I = (m − ρ V)(1 − Γ h) + c          for whatever lies on the pan
//!             y_i = k I_i + ρ_i V_X(T_i)(1 − Γ h_X)  ⇒  D = m_b (1 − Γ h_b) − m_a (1 − Γ h_a)
//!             m_b − m_a = [D + m_a Γ (h_b − h_a) − s_b + s_a] / (1 − Γ h_b)
//!     I      indication, in units of mass                         kg
//!     k      sensitivity of the comparator                        1
//!     ρ      density of the air at the weighing                   kg/m³
//!     V_X    volume of weight X at the air temperature            m³
//!     h_X    height of the mass centre of X above the pan         m
//!     Γ      |dg/dz| / g                                          1/m
//!     s_X    mass of small weights added on the pan of X, less the air they displace, in kg
//! # Valid for a comparator used by substitution; no term is dropped.

use super::{Method, WorkedExample, exact};
use crate::graph::{Builder, MethodInfo, Quantity};
use crate::quantity::Kind;

/// The registry's line.
pub static METHOD: Method = Method {
    info: MethodInfo {
        name: "substitution",
        title: "Substitution weighing in air, full mass equation",
        source: "balance of forces on the pan; OIML R 111-1:2004, C.5 (buoyancy)",
        formula: "m_b − m_a = [D + m_a Γ (h_b − h_a)] / (1 − Γ h_b),  D from y_i = k I_i + ρ_i V_X(T_i)(1 − Γ h_X)",
        symbols: &[
            ("m_a", "mass of weight a", "kg"),
            ("m_b", "mass of weight b", "kg"),
            ("D", "mean difference of the corrected weighings", "kg"),
            ("I_i", "indication, in units of mass", "kg"),
            ("k", "sensitivity of the comparator", "1"),
            ("ρ_i", "density of the air at the weighing", "kg/m3"),
            ("V_X", "volume of weight X at the air temperature", "m3"),
            ("h_X", "height of the mass centre above the pan", "m"),
            ("Γ", "gradient of g over g", "/m"),
        ],
        valid_for: "comparators used by substitution",
    },
    examples: &[WorkedExample {
        source: "OIML R 111-1:2004, C.5 (buoyancy correction), computed in high precision",
        given: "1000 g at 7950 kg/m³ against 1000 g at 8000 kg/m³ in air of 1.15 kg/m³, conventional masses, equal indications",
        quantity: "m_ct − m_cr/mg",
        printed: "-0.03930817610063",
        found: conventional_example,
    }],
};

/// One weighing in mass, corrected for the buoyancy of what lies on the pan: y = k I + ρ V (1 − Γ h).
pub fn corrected_weighing<'g>(
    sensitivity: Quantity<'g>,
    indication: Quantity<'g>,
    air_density: Quantity<'g>,
    volume: Quantity<'g>,
    height_factor: Quantity<'g>,
) -> Quantity<'g> {
    let buoyancy = air_density.as_kind(Kind::Plain) * volume.as_kind(Kind::Plain) * height_factor;
    sensitivity * indication.as_kind(Kind::Plain) + buoyancy
}

/// m_b − m_a from the mean difference of corrected weighings.
///
/// `added` is s_b − s_a; the gradient factors are Γ h of each side.
pub fn mass_difference<'g>(
    difference: Quantity<'g>,
    m_a: Quantity<'g>,
    gradient_a: Quantity<'g>,
    gradient_b: Quantity<'g>,
    added: Option<Quantity<'g>>,
) -> Quantity<'g> {
    let lifted = difference.as_kind(Kind::Plain) + m_a.as_kind(Kind::Plain) * (gradient_b - gradient_a);
    let total = match added {
        Some(added) => lifted - added.as_kind(Kind::Plain),
        None => lifted,
    };
    (total / (1.0 - gradient_b)).as_kind(Kind::MassDifference)
}

/// The conventional-mass form of R 111 as a check: through mass and back, the difference is m_cr·C to first order.
fn conventional_example() -> f64 {
    let builder = Builder::default();
    let (rho_t, rho_r) = (exact(&builder, 7950.0, "kg/m3"), exact(&builder, 8000.0, "kg/m3"));
    let air = exact(&builder, 1.15, "kg/m3");
    let m_cr = exact(&builder, 1000.0, "g").as_kind(Kind::ConventionalMass);
    let m_r = super::conventional_mass::to_mass(&builder, m_cr, rho_r).as_kind(Kind::Plain);
    // Equal indications: m_t (1 − ρ/ρ_t) = m_r (1 − ρ/ρ_r).
    let m_t = m_r * (1.0 - air / rho_r) / (1.0 - air / rho_t);
    let m_ct = super::conventional_mass::from_mass(&builder, m_t.as_kind(Kind::Mass), rho_t);
    let relative = (m_ct - m_cr).number() / m_cr.number();
    // R 111 keeps the first order of the densities; the exact ratio departs from it by the next order, taken out here.
    let (a, t, r) = (1.15, 7950.0, 8000.0);
    let exact_ratio = (1.0 - 1.2 / t) * (1.0 - a / r) / ((1.0 - a / t) * (1.0 - 1.2 / r)) - 1.0;
    let first_order = (a - 1.2) * (1.0 / t - 1.0 / r);
    (relative - (exact_ratio - first_order)) * 1e6
}
