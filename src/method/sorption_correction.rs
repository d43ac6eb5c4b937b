//! Sorption on the surface of a mass between vacuum and air, from a pair of artefacts of unequal areas.
//!
//! # Source    definition of the sorption for each area; the pair of artefacts is common practice between vacuum and air.
//! # Formula   η = [(m_2 − m_1)_air − (m_2 − m_1)_vac]/(A_2 − A_1),   m_air = m_vac + η A + δ_cycle
//!     m_1, m_2   masses of the artefacts of smaller and larger area; the difference in air corrected for buoyancy    kg
//!     A_1, A_2   geometric areas of their surfaces                        m²
//!     η          mass taken up in air for each area                       kg/m²
//!     A          area of the mass carried from vacuum to air              m²
//!     δ_cycle    what a change between vacuum and air leaves, value zero  kg
//! # Valid for A_2 > A_1, |η| ≤ 1 µg/cm² (the limit is ours: clean metals and silicon take up about a tenth of it), artefacts of
//!             the alloy, finish, cleaning and history of the mass, and the humidity of the weighing in air.

use super::{Method, WorkedExample, exact};
use crate::diagnostic::{Code, Problem};
use crate::graph::{Builder, MethodInfo, Quantity, State};
use crate::quantity::Kind;

/// The largest amount of the mass taken up for each area, in kg/m²: 1 µg/cm².
pub const LARGEST_COEFFICIENT: f64 = 1e-5;

/// The registry's line.
pub static METHOD: Method = Method {
    info: MethodInfo {
        name: "sorption-correction",
        title: "Sorption between vacuum and air, from a pair of artefacts",
        source: "definition; common practice between vacuum and air",
        formula: "η = [(m_2 − m_1)_air − (m_2 − m_1)_vac]/(A_2 − A_1),  m_air = m_vac + η A + δ_cycle",
        symbols: &[
            ("η", "mass taken up in air for each area", "kg/m2"),
            ("m_1", "mass of the artefact of smaller area", "kg"),
            ("m_2", "mass of the artefact of larger area", "kg"),
            ("A_1", "smaller area", "m2"),
            ("A_2", "larger area", "m2"),
            ("A", "area of the mass carried to air", "m2"),
            ("δ_cycle", "what a change between vacuum and air leaves", "kg"),
        ],
        valid_for: "A_2 > A_1, up to 1 µg/cm², artefacts with the surface and history of the mass",
    },
    examples: &[
        WorkedExample {
            source: "arithmetic of the definition, by hand",
            given: "A_1 = 150 cm², A_2 = 450 cm², m_2 − m_1 = 27 µg in air and 12 µg in vacuum",
            quantity: "η/(µg/cm²)",
            printed: "0.0500000",
            found: || {
                let b = Builder::default();
                example_coefficient(&b).number() * 1e5
            },
        },
        WorkedExample {
            source: "arithmetic of the definition, by hand",
            given: "the same pair, m_vac = 1 kg, A = 140 cm²",
            quantity: "m_air/kg",
            printed: "1.000000007000",
            found: || {
                let b = Builder::default();
                let m = exact(&b, 1.0, "kg").as_kind(Kind::Mass);
                mass_in_air(m, example_coefficient(&b), exact(&b, 140.0, "cm2"), None).number()
            },
        },
    ],
};

fn example_coefficient(b: &Builder) -> Quantity<'_> {
    let k = |value, unit| exact(b, value, unit);
    coefficient(k(27.0, "µg"), k(12.0, "µg"), k(150.0, "cm2"), k(450.0, "cm2"))
}

/// η in kg/m² from m_2 − m_1 in air, corrected for buoyancy, and in vacuum.
///
/// Areas that do not differ as they must, differences in the wrong state and a coefficient beyond the limit leave a problem.
pub fn coefficient<'g>(
    in_air: Quantity<'g>,
    in_vacuum: Quantity<'g>,
    a_1: Quantity<'g>,
    a_2: Quantity<'g>,
) -> Quantity<'g> {
    refuse_state(in_air, State::Air);
    refuse_state(in_vacuum, State::Vacuum);
    let larger = a_2 - a_1;
    if let Some(by) = larger.rows().into_iter().find(|by| *by <= 0.0) {
        let message = format!(
            "The second area exceeds the first by {:.3} cm²; the artefact named second has the larger.",
            by * 1e4
        );
        let hint = "Name the artefact of smaller area first; equal areas tell nothing about sorption.";
        in_air.builder().problem(Problem::new(Code::OutOfValidity, message).hint(hint));
    }
    let eta = (stateless(in_air) - stateless(in_vacuum)) / larger;
    let hair = LARGEST_COEFFICIENT * (1.0 + 1e-9);
    if let Some(found) = eta.rows().into_iter().find(|eta| eta.is_finite() && eta.abs() > hair) {
        let message =
            format!("The artefacts take up {:.3} µg/cm² in air; a clean surface stays within 1 µg/cm².", found * 1e5);
        let hint =
            "Check the units of areas and differences, and that the difference in air is corrected for buoyancy.";
        in_air.builder().problem(Problem::new(Code::OutOfValidity, message).hint(hint));
    }
    eta
}

/// Mass in air from the mass in vacuum; on the basis of the latter. A mass that holds in air leaves a problem.
pub fn mass_in_air<'g>(
    in_vacuum: Quantity<'g>,
    eta: Quantity<'g>,
    area: Quantity<'g>,
    cycle: Option<Quantity<'g>>,
) -> Quantity<'g> {
    refuse_state(in_vacuum, State::Vacuum);
    in_vacuum.in_state(Some(State::Air)) + taken_up(eta, area, cycle)
}

/// Mass in vacuum from the mass in air, the way back. A mass that holds in vacuum leaves a problem.
pub fn mass_in_vacuum<'g>(
    in_air: Quantity<'g>,
    eta: Quantity<'g>,
    area: Quantity<'g>,
    cycle: Option<Quantity<'g>>,
) -> Quantity<'g> {
    refuse_state(in_air, State::Air);
    in_air.in_state(Some(State::Vacuum)) - taken_up(eta, area, cycle)
}

/// η A + δ_cycle in kg.
fn taken_up<'g>(eta: Quantity<'g>, area: Quantity<'g>, cycle: Option<Quantity<'g>>) -> Quantity<'g> {
    let sorbed = eta * area;
    let total = cycle.map_or(sorbed, |cycle| sorbed + stateless(cycle));
    total.as_kind(Kind::MassDifference)
}

fn stateless(difference: Quantity<'_>) -> Quantity<'_> {
    difference.in_state(None).as_kind(Kind::Plain)
}

fn refuse_state(mass: Quantity<'_>, wanted: State) {
    if let Some(state) = mass.state().filter(|state| *state != wanted) {
        let message = format!("{} holds in {}; here it must hold in {}.", mass.words(), state.word(), wanted.word());
        let hint = "Name the weighing in vacuum as such and the one in air as such; the order tells the sign.";
        mass.builder().problem(Problem::new(Code::StateMismatch, message).hint(hint));
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn refused(in_air: f64, a_1: f64, a_2: f64) -> Vec<Code> {
        let b = Builder::default();
        let k = |value, unit| exact(&b, value, unit);
        coefficient(k(in_air, "µg"), k(0.0, "µg"), k(a_1, "cm2"), k(a_2, "cm2"));
        b.take_problems().iter().map(|problem| problem.code).collect()
    }

    #[test]
    fn areas_and_coefficient_are_held_to_their_limits() {
        assert!(refused(300.0, 150.0, 450.0).is_empty() && refused(-300.0, 150.0, 450.0).is_empty());
        assert_eq!(refused(300.1, 150.0, 450.0), [Code::OutOfValidity]);
        assert_eq!(refused(-300.1, 150.0, 450.0), [Code::OutOfValidity]);
        assert_eq!(refused(15.0, 450.0, 150.0), [Code::OutOfValidity]);
        assert_eq!(refused(15.0, 150.0, 150.0), [Code::OutOfValidity]);
    }

    #[test]
    fn states_are_kept_apart_and_the_way_back_is_exact() {
        let b = Builder::default();
        let (eta, area) = (exact(&b, 5e-7, "kg/m2"), exact(&b, 0.014, "m2"));
        let m = exact(&b, 1.0, "kg").as_kind(Kind::Mass).in_state(Some(State::Vacuum));
        let cycle = Some(exact(&b, 0.5, "µg"));
        let air = mass_in_air(m, eta, area, cycle);
        assert_eq!((air.state(), air.kind()), (Some(State::Air), Kind::Mass));
        let back = mass_in_vacuum(air, eta, area, cycle);
        assert_eq!(back.state(), Some(State::Vacuum));
        assert!((air.number() - 1.000_000_007_5).abs() < 1e-15 && (back.number() - 1.0).abs() < 1e-15);
        assert!(b.take_problems().is_empty());
        mass_in_air(air, eta, area, None);
        mass_in_vacuum(m, eta, area, None);
        let difference = exact(&b, 1.0, "µg");
        let (small, large) = (exact(&b, 0.01, "m2"), exact(&b, 0.02, "m2"));
        coefficient(difference.in_state(Some(State::Vacuum)), difference.in_state(Some(State::Air)), small, large);
        let codes: Vec<Code> = b.take_problems().iter().map(|problem| problem.code).collect();
        assert_eq!(codes, [Code::StateMismatch; 4]);
    }
}
