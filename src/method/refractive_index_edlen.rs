//! Refractive index of air by the modified Edlén equation.
//!
//! # Source    K. P. Birch, M. J. Downs, Metrologia 30 (1993) 155-162 and 31 (1994) 315-316 (constants confirmed in public
//!             copies that agree; the range is recalled).
//! # Formula   s = (1 µm/λ_0)²
//!             n_s − 1 = 1e-8 [8342.54 + 2406147/(130 − s) + 15998/(38.9 − s)]
//!             n_tp − 1 = (n_s − 1) (p/96095.43 Pa) [1 + 1e-8 (0.601 − 0.00972 t) p/Pa]/(1 + 0.0036610 t)
//!             n = n_tp − (p_v/Pa) (292.75 K/T) (3.7345 − 0.0401 s) 1e-10
//!     λ_0  wavelength in vacuum             m
//!     t    temperature of the air in °C; T  K
//!     p    pressure of the air              Pa
//!     p_v  partial pressure of water        Pa
//! # Valid for 350 nm ≤ λ_0 ≤ 650 nm, 10 °C ≤ t ≤ 30 °C, 800 hPa ≤ p ≤ 1200 hPa and ordinary air: carbon dioxide at 450 µmol/mol.

use super::{Method, WorkedExample, exact};
use crate::diagnostic::{Code, Problem};
use crate::graph::{Builder, MethodInfo, Quantity};
use crate::quantity::Kind;

/// The registry's line.
pub static METHOD: Method = Method {
    info: MethodInfo {
        name: "refractive-index-edlen",
        title: "Refractive index of air, modified Edlén equation",
        source: "Birch and Downs, Metrologia 30 (1993) 155 and 31 (1994) 315",
        formula: "n = 1 + (n_s − 1) (p/96095.43 Pa) [1 + 1e-8 (0.601 − 0.00972 t) p/Pa]/(1 + 0.0036610 t) − (p_v/Pa) (292.75 K/T) (3.7345 − 0.0401 s) 1e-10",
        symbols: &[
            ("n", "refractive index", "1"),
            ("n_s", "index of standard air, from the wavelength", "1"),
            ("s", "(1 µm/λ_0)²", "1"),
            ("p", "pressure", "Pa"),
            ("T", "temperature; t in °C", "K"),
            ("p_v", "partial pressure of water", "Pa"),
        ],
        valid_for: "350 nm to 650 nm, 10 °C to 30 °C, 800 hPa to 1200 hPa, carbon dioxide near 450 µmol/mol",
    },
    examples: &[
        example("633 nm, 20 °C, 1000 hPa, dry", "26824.32838", || example_index(0.633, 20.0, 100_000.0, 0.0)),
        example("632.991212 nm, 20.4 °C, 975 hPa, p_v = 11 hPa", "26077.85872", || {
            example_index(0.632_991_212, 20.4, 97_500.0, 1100.0)
        }),
        example("532.245 nm, 22 °C, 1013 hPa, p_v = 9 hPa", "27119.61913", || {
            example_index(0.532_245, 22.0, 101_300.0, 900.0)
        }),
    ],
};

const fn example(given: &'static str, printed: &'static str, found: fn() -> f64) -> WorkedExample {
    WorkedExample {
        source: "computed in high precision from the equation",
        given,
        quantity: "(n − 1)/10⁻⁸",
        printed,
        found,
    }
}

fn example_index(micrometres: f64, celsius: f64, p: f64, p_v: f64) -> f64 {
    let b = Builder::default();
    let k = |value, unit| exact(&b, value, unit);
    let n = index(k(micrometres, "µm"), k(celsius, "°C"), k(p, "Pa"), k(p_v, "Pa"));
    (n - 1.0).number() * 1e8
}

/// n; columns where temperature, pressure and vapour pressure are. Values outside the range leave a problem.
pub fn index<'g>(wavelength: Quantity<'g>, t: Quantity<'g>, p: Quantity<'g>, p_v: Quantity<'g>) -> Quantity<'g> {
    let b = wavelength.builder();
    let k = |value, unit| exact(b, value, unit);
    let (big_t, p) = (t.as_kind(Kind::Plain), p.as_kind(Kind::Plain));
    refuse(b, "wavelength in nm", 1e9, wavelength, 350e-9, 650e-9);
    refuse(b, "temperature in K", 1.0, big_t, 283.15, 303.15);
    refuse(b, "pressure in hPa", 0.01, p, 80_000.0, 120_000.0);
    let s = (k(1.0, "µm") / wavelength.as_kind(Kind::Plain)).squared();
    let t = (big_t - k(273.15, "K")) / k(1.0, "K");
    let standard = 1e-8 * (8342.54 + 2_406_147.0 / (130.0 - s) + 15_998.0 / (38.9 - s));
    let pascals = p / k(1.0, "Pa");
    let dry =
        standard * (pascals / 96_095.43) * (1.0 + 1e-8 * (0.601 - 0.009_72 * t) * pascals) / (1.0 + 0.003_661_0 * t);
    let vapour = p_v.as_kind(Kind::Plain) / k(1.0, "Pa");
    1.0 + dry - vapour * (k(292.75, "K") / big_t) * (3.7345 - 0.0401 * s) * 1e-10
}

/// Leaves a problem for a value outside the range of an equation of the index of air.
pub(super) fn refuse(b: &Builder, what: &str, scale: f64, quantity: Quantity<'_>, from: f64, to: f64) {
    let hair = 1e-9 * to.abs();
    if let Some(value) = quantity.rows().into_iter().find(|value| !(from - hair..=to + hair).contains(value)) {
        let message = format!(
            "The {what} is {:.3}; the equation of the index of air holds from {:.2} to {:.2}.",
            value * scale,
            from * scale,
            to * scale
        );
        let hint = "Check the value and its unit; the equation is not used outside its range.";
        b.problem(Problem::new(Code::OutOfValidity, message).hint(hint));
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn the_range_holds_to_its_edges() {
        let b = Builder::default();
        let refused = |nanometres: f64, celsius: f64, hectopascals: f64| {
            let k = |value, unit| exact(&b, value, unit);
            index(k(nanometres, "nm"), k(celsius, "°C"), k(hectopascals, "hPa"), k(0.0, "Pa"));
            b.take_problems().first().map(|problem| problem.code)
        };
        for (nanometres, celsius, hectopascals) in [(350.0, 10.0, 800.0), (650.0, 30.0, 1200.0)] {
            assert_eq!(refused(nanometres, celsius, hectopascals), None);
        }
        for (nanometres, celsius, hectopascals) in [
            (349.9, 20.0, 1000.0),
            (650.1, 20.0, 1000.0),
            (633.0, 9.9, 1000.0),
            (633.0, 30.1, 1000.0),
            (633.0, 20.0, 799.0),
            (633.0, 20.0, 1201.0),
        ] {
            assert_eq!(refused(nanometres, celsius, hectopascals), Some(Code::OutOfValidity));
        }
    }
}
