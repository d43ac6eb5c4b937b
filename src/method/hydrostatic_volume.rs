//! Volume of a body by weighing it in water against exchange weights in air, by substitution on one balance.
//!
//! # Source    balance of forces on the pan and on the hanger in water; the exchange of weights cancels what the hanger weighs.
//! # Formula   d = k (I_B − I_A) = (m_x − ρ_w V) − m_s (1 − ρ_a/ρ_s)(1 − Γ Δh)
//!             V = [m_x − d − m_s (1 − ρ_a/ρ_s)(1 − Γ Δh)]/ρ_w,   V_ref = V/[1 + β (T_w − T_ref)]
//!     I_A    indication with the exchange weights on the pan, the hanger empty in the water           kg
//!     I_B    indication without them, the body on the hanger in the water                             kg
//!     m_x    mass of the body, known beforehand: 0.1 mg of it is 0.1 mm³                                kg
//!     m_s    mass of the exchange weights; ρ_s their density                                          kg, kg/m³
//!     ρ_a    density of the air at the exchange weights                                               kg/m³
//!     ρ_w    density of the water at the depth of the body                                            kg/m³
//!     Γ      |dg/dz|/g;  Δh height of the exchange weights above the body                             1/m, m
//!     β      cubic expansion of the body;  T_w temperature of the water;  T_ref of reference          1/K, K
//! # Valid for a body heavier than its buoyancy or held down, a hanger immersed alike in both states, ρ_a below ρ_w and ρ_s, Δh
//!             up to 10 m, and indications in mass at the level of the body.

use super::{Method, WorkedExample, exact};
use crate::diagnostic::{Code, Problem};
use crate::graph::{Builder, MethodInfo, Quantity};
use crate::quantity::Kind;

/// The largest height between exchange weights and body, in m.
pub const LARGEST_HEIGHT: f64 = 10.0;

/// The registry's line.
pub static METHOD: Method = Method {
    info: MethodInfo {
        name: "hydrostatic-volume",
        title: "Volume by weighing in water, by substitution",
        source: "balance of forces on the pan and in the water",
        formula: "V = [m_x − d − m_s (1 − ρ_a/ρ_s)(1 − Γ Δh)]/ρ_w,  V_ref = V/[1 + β (T_w − T_ref)]",
        symbols: &[
            ("V", "volume of the body in the water", "m3"),
            ("m_x", "mass of the body", "kg"),
            ("d", "body in the water less exchange weights, in mass", "kg"),
            ("m_s", "mass of the exchange weights", "kg"),
            ("ρ_s", "density of the exchange weights", "kg/m3"),
            ("ρ_a", "density of the air", "kg/m3"),
            ("ρ_w", "density of the water", "kg/m3"),
            ("Γ", "gradient of g over g", "/m"),
            ("Δh", "height of the exchange weights above the body", "m"),
            ("β", "cubic expansion coefficient of the body", "/K"),
            ("T_w", "temperature of the water", "K"),
        ],
        valid_for: "a hanger immersed alike in both states; air lighter than water and weights; heights up to 10 m",
    },
    examples: &[
        WorkedExample {
            source: "computed in high precision the other way: d of a body of exactly 125 cm³",
            given: "m_x = 1 kg, m_s = 875 g at 8000 kg/m³, d = 365.8659334625 mg, ρ_a = 1.2 kg/m³, ρ_w = 998.1 kg/m³, Γ = 3.15e-7 /m, Δh = 0.4 m, β = 48e-6 /K, 20.5 °C",
            quantity: "V_20/cm³",
            printed: "125.0000000000",
            found: || {
                let b = Builder::default();
                let k = |value, unit| exact(&b, value, unit);
                let given = example(&b, [1.0, 365.865_933_462_5e-6, 0.875, 8000.0, 1.2, 998.1, 3.15e-7, 0.4]);
                let (t_ref, t) = (k(20.0, "°C").as_kind(Kind::Temperature), k(20.5, "°C").as_kind(Kind::Temperature));
                at_reference(volume(given), k(48e-6, "/K"), t_ref, t).number() * 1e6
            },
        },
        WorkedExample {
            source: "computed in high precision from the formula",
            given: "m_x = 1.000123456 kg, m_s = 874 g at 7965 kg/m³, d = 812.345 mg, ρ_a = 1.18 kg/m³, ρ_w = 997.6550074597 kg/m³, Γ = 3.086e-7 /m, Δh = 0.65 m",
            quantity: "V/cm³",
            printed: "125.7356168547",
            found: || {
                let b = Builder::default();
                let given = [1.000_123_456, 812.345e-6, 0.874, 7965.0, 1.18, 997.655_007_459_7, 3.086e-7, 0.65];
                volume(example(&b, given)).number() * 1e6
            },
        },
    ],
};

/// A weighing in water by substitution; the difference may be a column.
#[derive(Clone, Copy)]
pub struct Weighing<'g> {
    /// m_x, in kg.
    pub mass: Quantity<'g>,
    /// d = k (I_B − I_A), in kg.
    pub difference: Quantity<'g>,
    /// m_s, in kg.
    pub exchange_mass: Quantity<'g>,
    /// ρ_s, in kg/m³.
    pub exchange_density: Quantity<'g>,
    /// ρ_a, in kg/m³.
    pub air_density: Quantity<'g>,
    /// ρ_w, in kg/m³.
    pub water_density: Quantity<'g>,
    /// Γ, in 1/m.
    pub gradient: Quantity<'g>,
    /// Δh, in m.
    pub height: Quantity<'g>,
}

/// Volume of the body at the temperature of the water, in m³. Values beyond the validity leave a problem.
pub fn volume<'g>(given: Weighing<'g>) -> Quantity<'g> {
    let plain = |quantity: Quantity<'g>| quantity.as_kind(Kind::Plain);
    refuse(given);
    let lifted = 1.0 - plain(given.air_density) / plain(given.exchange_density);
    let raised = 1.0 - plain(given.gradient) * plain(given.height);
    let exchange = plain(given.exchange_mass) * lifted * raised;
    let displaced = plain(given.mass) - plain(given.difference) - exchange;
    let found = displaced / plain(given.water_density);
    if let Some(value) = found.rows().into_iter().find(|value| *value <= 0.0) {
        let message = format!("The body would displace {:.3} cm³ of water; a body displaces some.", value * 1e6);
        let hint =
            "The difference is that of the body in the water less the exchange weights; check its sign and the masses.";
        given.mass.builder().problem(Problem::new(Code::OutOfValidity, message).hint(hint));
    }
    found.as_kind(Kind::Volume)
}

/// Volume at the temperature of reference from that in the water.
pub fn at_reference<'g>(
    found: Quantity<'g>,
    beta: Quantity<'g>,
    t_ref: Quantity<'g>,
    t_w: Quantity<'g>,
) -> Quantity<'g> {
    let rise = (t_w - t_ref).as_kind(Kind::Plain);
    (found.as_kind(Kind::Plain) / (1.0 + beta.as_kind(Kind::Plain) * rise)).as_kind(Kind::Volume)
}

fn refuse(given: Weighing<'_>) {
    let air = given.air_density.rows();
    let others = [given.water_density.rows(), given.exchange_density.rows()].concat();
    let clash = others.into_iter().find_map(|rho| Some((*air.iter().find(|air| **air >= rho)?, rho)));
    if let Some((air, rho)) = clash {
        let message = format!(
            "Air of {air:.3} kg/m³ stands beside water or exchange weights of {rho:.3} kg/m³; air is lighter than both."
        );
        let hint = "Check the units of the densities, and that those of air and water are not exchanged.";
        given.mass.builder().problem(Problem::new(Code::OutOfValidity, message).hint(hint));
    }
    if let Some(height) = given.height.rows().into_iter().find(|height| height.abs() > LARGEST_HEIGHT) {
        let message =
            format!("The exchange weights stand {height:.3} m above the body; the gradient is used up to 10 m.");
        let hint = "Check the unit of the height between the pan and the body.";
        given.mass.builder().problem(Problem::new(Code::OutOfValidity, message).hint(hint));
    }
}

/// In the order of the fields, in SI units.
fn example<'g>(b: &'g Builder, values: [f64; 8]) -> Weighing<'g> {
    let k = |place: usize, unit| exact(b, values[place], unit);
    Weighing {
        mass: k(0, "kg"),
        difference: k(1, "kg"),
        exchange_mass: k(2, "kg"),
        exchange_density: k(3, "kg/m3"),
        air_density: k(4, "kg/m3"),
        water_density: k(5, "kg/m3"),
        gradient: k(6, "/m"),
        height: k(7, "m"),
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn what_cannot_be_is_refused() {
        let good = [1.0, 0.0, 0.875, 8000.0, 1.2, 998.1, 3e-7, 0.4];
        let refused = |place: usize, value: f64| {
            let b = Builder::default();
            let mut values = good;
            values[place] = value;
            volume(example(&b, values));
            let problems = b.take_problems();
            assert!(problems.iter().all(|problem| problem.code == Code::OutOfValidity), "{problems:?}");
            problems.len()
        };
        for (place, value) in [(0, 1.0), (1, 0.12), (4, 0.0), (4, 998.0), (7, 10.0), (7, -10.0)] {
            assert_eq!(refused(place, value), 0, "{place} {value}");
        }
        for (place, value) in [(1, 0.126), (0, 0.87), (4, 998.1), (5, 1.2), (3, 1.1), (7, 10.01), (7, -10.01)] {
            assert_eq!(refused(place, value), 1, "{place} {value}");
        }
    }
}
