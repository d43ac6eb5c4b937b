//! Density of water: air-free or with dissolved air, at a pressure, of stated isotopes.
//!
//! # Source    M. Tanaka, G. Girard, R. Davis, A. Peuto, N. Bignell, Metrologia 38 (2001) 301-309 (constants confirmed in
//!             public copys that agree; range of dissolved air, isotopes and uncertainty recalled).
//! # Formula   ρ = [ρ_t + x_a (s_0 + s_1 t) + Δ_iso] [1 + (k_0 + k_1 t + k_2 t²)(p − 101 325 Pa)] (1 + δ_eq)
//!             ρ_t = a_5 {1 − (t + a_1)² (t + a_2)/[a_3 (t + a_4)]},   Δ_iso = c_O δ_O + c_D δ_D
//!     t    temperature of the water in °C (ITS-90); T                      K
//!     p    absolute pressure at the depth of the water in question         Pa
//!     x_a  dissolved air: 0 free of air, 1 saturated                       1
//!     δ_O  departure of the ratio ¹⁸O/¹⁶O from that of V-SMOW, relative    1
//!     δ_D  departure of the ratio D/H from that of V-SMOW, relative        1
//!     δ_eq departure of the equation itself, value zero                    1
//!     a_5 = 999.974 950 kg/m³ is the greatest density of water of the isotopes of V-SMOW at 101 325 Pa.
//! # Valid for 0 °C ≤ t ≤ 40 °C (0 °C ≤ t ≤ 25 °C with dissolved air) and 50 kPa ≤ p ≤ 1 MPa. The limits of pressure are
//!             ours: at 1 MPa and 5 °C the density is 1.0e-6 above IAPWS-95, at 40 °C it is 1.2e-6 below.
//!
//! Water of other isotopes without their departures is a fault of the order of 2.5e-6: distilled tap water is about
//! 0.0025 kg/m³ lighter than V-SMOW. The departures of the isotopes are taken as those at the greatest density.

use super::{Method, WorkedExample, exact, unit};
use crate::diagnostic::{Code, Problem};
use crate::graph::{Builder, Distribution, InputDraft, MethodInfo, Origin, Quantity, Value};
use crate::quantity::Kind;

/// Relative standard uncertainty of the equation itself: half of 0.84e-3 kg/m³ (k = 2), recalled.
pub const EQUATION_UNCERTAINTY: f64 = 0.42e-6;

/// The registry's line.
pub static METHOD: Method = Method {
    info: MethodInfo {
        name: "water-density",
        title: "Density of water",
        source: "Tanaka et al., Metrologia 38 (2001) 301",
        formula: "ρ = [a_5 {1 − (t + a_1)² (t + a_2)/[a_3 (t + a_4)]} + x_a (s_0 + s_1 t) + c_O δ_O + c_D δ_D] [1 + (k_0 + k_1 t + k_2 t²)(p − 101325 Pa)] (1 + δ_eq)",
        symbols: &[
            ("ρ", "density of the water", "kg/m3"),
            ("T", "temperature of the water; t in °C", "K"),
            ("p", "absolute pressure at its depth", "Pa"),
            ("x_a", "dissolved air, 1 when saturated", "1"),
            ("δ_O", "departure of ¹⁸O/¹⁶O from V-SMOW", "1"),
            ("δ_D", "departure of D/H from V-SMOW", "1"),
            ("δ_eq", "departure of the equation itself", "1"),
        ],
        valid_for: "0 °C to 40 °C (to 25 °C with dissolved air), 50 kPa to 1 MPa; isotopes of V-SMOW unless their departures are given",
    },
    examples: &[
        example(TABLE, "20 °C, 101325 Pa, free of air", "998.2067", || air_free(20.0)),
        example(TABLE, "10 °C, 101325 Pa, free of air", "999.7027", || air_free(10.0)),
        example(TABLE, "30 °C, 101325 Pa, free of air", "995.6488", || air_free(30.0)),
        example(COMPUTED, "22.5 °C, 993 hPa, saturated with air", "997.6550074597", || {
            number(22.5, 99_300.0, Some(1.0), None)
        }),
        example(
            "by hand from the recalled coefficients",
            "3.983035 °C, 101325 Pa, free of air, δ_O = −10 ‰, δ_D = −70 ‰",
            "999.971458",
            || number(3.983_035, 101_325.0, None, Some([-10e-3, -70e-3])),
        ),
    ],
};

const TABLE: &str = "Tanaka et al. 2001, recommended table, in a public copy";
const COMPUTED: &str = "computed in high precision from the equation";

const fn example(
    source: &'static str,
    given: &'static str,
    printed: &'static str,
    found: fn() -> f64,
) -> WorkedExample {
    WorkedExample { source, given, quantity: "ρ/(kg/m³)", printed, found }
}

/// The water whose density is asked for; temperature, pressure and dissolved air may be columns.
#[derive(Clone, Copy)]
pub struct Water<'g> {
    /// In K.
    pub temperature: Quantity<'g>,
    /// Absolute, at the depth in question, in Pa.
    pub pressure: Quantity<'g>,
    /// From 0 to 1, saturated; nothing for water free of air.
    pub dissolved_air: Option<Quantity<'g>>,
    /// Nothing for the isotopes of V-SMOW.
    pub isotopes: Option<Isotopes<'g>>,
}

/// Relative departures of the ratios of isotopes from those of V-SMOW; −7 ‰ is −0.007.
#[derive(Clone, Copy)]
pub struct Isotopes<'g> {
    /// Of ¹⁸O/¹⁶O.
    pub oxygen: Quantity<'g>,
    /// Of D/H.
    pub hydrogen: Quantity<'g>,
}

/// Density of the water in kg/m³ (Tanaka 2001). Values outside the range leave a problem.
pub fn density<'g>(b: &'g Builder, water: Water<'g>) -> Quantity<'g> {
    refuse(b, water);
    let k = |value, unit| exact(b, value, unit);
    let t = water.temperature.as_kind(Kind::Plain) - k(273.15, "K");
    let mut rho = at_one_atmosphere(b, t);
    if let Some(air) = water.dissolved_air {
        rho = rho + air.as_kind(Kind::Plain) * (k(-4.612e-3, "kg/m3") + k(0.106e-3, "kg m-3 K-1") * t);
    }
    if let Some(isotopes) = water.isotopes {
        let oxygen = k(0.233, "kg/m3") * isotopes.oxygen.as_kind(Kind::Plain);
        rho = rho + oxygen + k(0.0166, "kg/m3") * isotopes.hydrogen.as_kind(Kind::Plain);
    }
    let compressibility =
        k(50.74e-11, "/Pa") + k(-0.326e-11, "Pa-1 K-1") * t + k(0.004_16e-11, "Pa-1 K-2") * t.squared();
    let pressed = 1.0 + compressibility * (water.pressure.as_kind(Kind::Plain) - k(101_325.0, "Pa"));
    (rho * pressed * (1.0 + equation_departure(b))).as_kind(Kind::Density)
}

/// Air-free water of the isotopes of V-SMOW at 101 325 Pa.
fn at_one_atmosphere<'g>(b: &'g Builder, t: Quantity<'g>) -> Quantity<'g> {
    let k = |value, unit| exact(b, value, unit);
    let below = (t - k(3.983_035, "K")).squared() * (t + k(301.797, "K"));
    k(999.974_950, "kg/m3") * (1.0 - below / (k(522_528.9, "K2") * (t + k(69.348_81, "K"))))
}

fn refuse(b: &Builder, water: Water<'_>) {
    let celsius: Vec<f64> = water.temperature.rows().iter().map(|t| t - 273.15).collect();
    let kilopascals: Vec<f64> = water.pressure.rows().iter().map(|p| p / 1000.0).collect();
    refuse_beyond(b, "temperature of the water in °C", &celsius, 0.0, 40.0);
    refuse_beyond(b, "pressure on the water in kPa", &kilopascals, 50.0, 1000.0);
    let Some(air) = water.dissolved_air else { return };
    refuse_beyond(b, "dissolved air as a part of saturation", &air.rows(), 0.0, 1.0);
    if celsius.iter().all(|t| (0.0 - HAIR..=40.0 + HAIR).contains(t)) {
        refuse_beyond(b, "temperature of water with dissolved air in °C", &celsius, 0.0, 25.0);
    }
}

/// What a limit may be missed by: the rounding of kelvin.
const HAIR: f64 = 1e-9;

fn refuse_beyond(b: &Builder, what: &str, values: &[f64], from: f64, to: f64) {
    if let Some(value) = values.iter().find(|value| !(from - HAIR..=to + HAIR).contains(*value)) {
        let message = format!("The {what} is {value:.3}; the equation of Tanaka 2001 holds from {from} to {to}.");
        let hint = "Check the value and its unit; the equation is not used outside its range.";
        b.problem(Problem::new(Code::OutOfValidity, message).hint(hint));
    }
}

fn equation_departure(b: &Builder) -> Quantity<'_> {
    let origin = Origin::Constant("Tanaka et al. 2001: 0.84e-3 kg/m³ (k = 2) of the equation itself, recalled");
    let mut draft = InputDraft::new(
        "tanaka_2001.equation",
        "δ_eq",
        "water-density equation: true over computed, less 1",
        Kind::Plain,
        unit("1"),
        Value::Scalar(0.0),
        origin,
    );
    draft.distribution = Distribution::Normal { standard_uncertainty: EQUATION_UNCERTAINTY };
    b.input(draft)
}

fn air_free(celsius: f64) -> f64 {
    number(celsius, 101_325.0, None, None)
}

fn number(celsius: f64, p: f64, air: Option<f64>, isotopes: Option<[f64; 2]>) -> f64 {
    let b = Builder::default();
    let k = |value, unit| exact(&b, value, unit);
    let one = |value| exact(&b, value, "1");
    let isotopes = isotopes.map(|[oxygen, hydrogen]| Isotopes { oxygen: one(oxygen), hydrogen: one(hydrogen) });
    let (temperature, pressure) = (k(celsius, "°C"), k(p, "Pa"));
    density(&b, Water { temperature, pressure, dissolved_air: air.map(one), isotopes }).number()
}

#[cfg(test)]
mod tests {
    use super::*;

    fn refused(celsius: f64, kilopascals: f64, air: Option<f64>) -> usize {
        let b = Builder::default();
        let temperature = exact(&b, celsius, "°C");
        let pressure = exact(&b, kilopascals, "kPa");
        let dissolved_air = air.map(|air| exact(&b, air, "1"));
        density(&b, Water { temperature, pressure, dissolved_air, isotopes: None });
        let problems = b.take_problems();
        assert!(problems.iter().all(|problem| problem.code == Code::OutOfValidity), "{problems:?}");
        problems.len()
    }

    #[test]
    fn the_range_holds_to_its_edges() {
        for (celsius, kilopascals, air) in
            [(0.0, 50.0, None), (40.0, 1000.0, None), (0.0, 101.325, Some(0.0)), (25.0, 101.325, Some(1.0))]
        {
            assert_eq!(refused(celsius, kilopascals, air), 0, "{celsius} °C, {kilopascals} kPa, {air:?}");
        }
        for (celsius, kilopascals, air) in [
            (-0.001, 101.325, None),
            (40.001, 101.325, None),
            (20.0, 49.99, None),
            (20.0, 1000.01, None),
            (25.001, 101.325, Some(1.0)),
            (40.001, 101.325, Some(0.5)),
            (20.0, 101.325, Some(-0.001)),
            (20.0, 101.325, Some(1.001)),
        ] {
            assert_eq!(refused(celsius, kilopascals, air), 1, "{celsius} °C, {kilopascals} kPa, {air:?}");
        }
    }

    #[test]
    fn one_row_of_a_column_outside_is_refused() {
        let b = Builder::default();
        let kelvin = exact(&b, 1.0, "K");
        let temperature = b.column(vec![293.15, 314.0, 293.2]) * kelvin;
        let water = Water { temperature, pressure: exact(&b, 1e5, "Pa"), dissolved_air: None, isotopes: None };
        assert_eq!(density(&b, water).rows().len(), 3);
        assert!(b.take_problems()[0].message.contains("40.850"));
    }
}
