//! Refractive index of air by the equation of Ciddor.
//!
//! # Source    P. E. Ciddor, Applied Optics 35 (1996) 1566-1573 (constants recalled, confirmed by its tables 1 and 2).
//! # Formula   s = (1 µm/λ_0)²
//!             r_as = 1e-8 [5792105/(238.0185 − s) + 167917/(57.362 − s)],  r_axs = r_as [1 + 0.534 (x_c − 450e-6)]
//!             r_vs = 1.022e-8 (295.235 + 2.6422 s − 0.032380 s² + 0.004028 s³)
//!             ρ_a = p M_a (1 − x_v)/(Z R T),  ρ_v = p M_v x_v/(Z R T)
//!             n = 1 + (ρ_a/ρ_axs) r_axs + (ρ_v/ρ_vs) r_vs
//!     ρ_axs  dry air at 15 °C, 101 325 Pa; ρ_vs water vapour at 20 °C, 1333 Pa      kg/m³
//!     M_a    1e-3 [28.9635 + 12.011 (x_c − 400e-6)] kg/mol;  M_v = 0.018 015 kg/mol
//!     R      8.314 510 J/(mol K), as in the source; it leaves the ratios of densities
//!     Z      compressibility of moist air, as in the equation of air density
//!     x_v    mole fraction of water vapour, enhancement included                    1
//!     x_c    mole fraction of carbon dioxide                                        1
//! # Valid for 300 nm ≤ λ_0 ≤ 1690 nm, −40 °C ≤ t ≤ 100 °C, 800 hPa ≤ p ≤ 1200 hPa, x_c ≤ 2000 µmol/mol.

use super::refractive_index_edlen::refuse;
use super::{Method, WorkedExample, air_density, exact};
use crate::graph::{Builder, MethodInfo, Quantity};
use crate::quantity::Kind;

/// The registry's line.
pub static METHOD: Method = Method {
    info: MethodInfo {
        name: "refractive-index-ciddor",
        title: "Refractive index of air, equation of Ciddor",
        source: "Ciddor, Applied Optics 35 (1996) 1566",
        formula: "n = 1 + (ρ_a/ρ_axs) r_axs + (ρ_v/ρ_vs) r_vs",
        symbols: &[
            ("n", "refractive index", "1"),
            ("ρ_a", "density of the dry part of the air", "kg/m3"),
            ("ρ_axs", "density of dry air at 15 °C and 101 325 Pa", "kg/m3"),
            ("r_axs", "refractivity of that air at the wavelength", "1"),
            ("ρ_v", "density of the water vapour in the air", "kg/m3"),
            ("ρ_vs", "density of water vapour at 20 °C and 1333 Pa", "kg/m3"),
            ("r_vs", "refractivity of that vapour at the wavelength", "1"),
        ],
        valid_for: "300 nm to 1690 nm, −40 °C to 100 °C, 800 hPa to 1200 hPa, carbon dioxide up to 2000 µmol/mol",
    },
    examples: &[
        dry("20 °C, 800 hPa", "21458.0", || example_index(20.0, 80_000.0, 0.0, 450.0)),
        dry("20 °C, 1000 hPa", "26824.4", || example_index(20.0, 100_000.0, 0.0, 450.0)),
        dry("20 °C, 1200 hPa", "32191.6", || example_index(20.0, 120_000.0, 0.0, 450.0)),
        dry("10 °C, 1000 hPa", "27774.7", || example_index(10.0, 100_000.0, 0.0, 450.0)),
        dry("30 °C, 1000 hPa", "25937.2", || example_index(30.0, 100_000.0, 0.0, 450.0)),
        // DIFFERENCE: a fourth row of table 2 (19.173 °C, 27682.4) comes out as 27682.454, 0.004 beyond half its last
        // digit: the source's vapour fraction is rounded. The vectors hold it with their own tolerance.
        moist("19.526 °C, 1020.948 hPa, x_v = 0.010473617, x_c = 510 µmol/mol", "27392.9", || {
            example_index(19.526, 102_094.8, 0.010_473_617_054_537_218, 510.0)
        }),
        moist("19.188 °C, 1029.188 hPa, x_v = 0.006887613, x_c = 450 µmol/mol", "27658.7", || {
            example_index(19.188, 102_918.8, 0.006_887_612_647_168_097, 450.0)
        }),
        moist("19.532 °C, 1036.032 hPa, x_v = 0.009555975, x_c = 600 µmol/mol", "27802.0", || {
            example_index(19.532, 103_603.2, 0.009_555_974_767_327_379, 600.0)
        }),
    ],
};

const fn dry(given: &'static str, printed: &'static str, found: fn() -> f64) -> WorkedExample {
    let source = "Ciddor 1996, table 1 (633 nm, dry, 450 µmol/mol), seen in a public copy";
    WorkedExample { source, given, quantity: "(n − 1)/10⁻⁸", printed, found }
}

const fn moist(given: &'static str, printed: &'static str, found: fn() -> f64) -> WorkedExample {
    let source = "Ciddor 1996, table 2 (633 nm), seen in a public copy";
    WorkedExample { source, given, quantity: "(n − 1)/10⁻⁸", printed, found }
}

fn example_index(celsius: f64, pascals: f64, x_v: f64, ppm: f64) -> f64 {
    let b = Builder::default();
    let k = |value, unit| exact(&b, value, unit);
    let n = index(k(633.0, "nm"), k(celsius, "°C"), k(pascals, "Pa"), k(x_v, "1"), k(ppm, "µmol/mol"));
    (n - 1.0).number() * 1e8
}

/// n; columns where temperature, pressure and vapour fraction are. Values outside the range leave a problem.
pub fn index<'g>(
    wavelength: Quantity<'g>,
    t: Quantity<'g>,
    p: Quantity<'g>,
    x_v: Quantity<'g>,
    x_c: Quantity<'g>,
) -> Quantity<'g> {
    let b = wavelength.builder();
    let k = |value, unit| exact(b, value, unit);
    let (t, p) = (t.as_kind(Kind::Plain), p.as_kind(Kind::Plain));
    let (x_v, x_c) = (x_v.as_kind(Kind::Plain), x_c.as_kind(Kind::Plain));
    refuse(b, "wavelength in nm", 1e9, wavelength, 300e-9, 1690e-9);
    refuse(b, "temperature in K", 1.0, t, 233.15, 373.15);
    refuse(b, "pressure in hPa", 0.01, p, 80_000.0, 120_000.0);
    refuse(b, "mole fraction of water vapour", 1.0, x_v, 0.0, 1.0);
    refuse(b, "mole fraction of carbon dioxide in µmol/mol", 1e6, x_c, 0.0, 2000e-6);
    let s = (k(1.0, "µm") / wavelength.as_kind(Kind::Plain)).squared();
    let r_as = 1e-8 * (5_792_105.0 / (238.0185 - s) + 167_917.0 / (57.362 - s));
    let r_axs = r_as * (1.0 + 0.534 * (x_c - 450e-6));
    let r_vs = 1.022e-8 * (295.235 + 2.6422 * s - 0.032_380 * s.squared() + 0.004_028 * s.power(3));
    let m_a = (28.9635 + 12.011 * (x_c - 400e-6)) * k(1e-3, "kg/mol");
    let m_v = k(0.018_015, "kg/mol");
    let none = b.number(0.0);
    let rho_axs = density(k(288.15, "K"), k(101_325.0, "Pa"), m_a, none, 1.0 - none);
    let rho_vs = density(k(293.15, "K"), k(1333.0, "Pa"), m_v, 1.0 - none, 1.0 - none);
    let (rho_a, rho_v) = (density(t, p, m_a, x_v, 1.0 - x_v), density(t, p, m_v, x_v, x_v));
    1.0 + rho_a / rho_axs * r_axs + rho_v / rho_vs * r_vs
}

/// Density of the part with molar mass `m` and mole fraction `part` of air with vapour fraction `x_v`.
fn density<'g>(
    big_t: Quantity<'g>,
    p: Quantity<'g>,
    m: Quantity<'g>,
    x_v: Quantity<'g>,
    part: Quantity<'g>,
) -> Quantity<'g> {
    let b = p.builder();
    let z = air_density::compressibility(b, p, big_t, big_t - exact(b, 273.15, "K"), x_v);
    p * m * part / (z * exact(b, 8.314_510, "J mol-1 K-1") * big_t)
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::diagnostic::Code;

    #[test]
    fn the_range_holds_to_its_edges() {
        let b = Builder::default();
        let refused = |nanometres: f64, celsius: f64, hectopascals: f64, ppm: f64| {
            let k = |value, unit| exact(&b, value, unit);
            index(k(nanometres, "nm"), k(celsius, "°C"), k(hectopascals, "hPa"), k(0.0, "1"), k(ppm, "µmol/mol"));
            b.take_problems().first().map(|problem| problem.code)
        };
        for (nm, celsius, hpa, ppm) in [(300.0, -40.0, 800.0, 0.0), (1690.0, 100.0, 1200.0, 2000.0)] {
            assert_eq!(refused(nm, celsius, hpa, ppm), None);
        }
        for (nm, celsius, hpa, ppm) in [
            (299.0, 20.0, 1000.0, 400.0),
            (1691.0, 20.0, 1000.0, 400.0),
            (633.0, -40.1, 1000.0, 400.0),
            (633.0, 100.1, 1000.0, 400.0),
            (633.0, 20.0, 799.0, 400.0),
            (633.0, 20.0, 1201.0, 400.0),
            (633.0, 20.0, 1000.0, 2001.0),
        ] {
            assert_eq!(refused(nm, celsius, hpa, ppm), Some(Code::OutOfValidity));
        }
    }

    /// The two equations of the index agree in ordinary dry air within what their sources state of them.
    #[test]
    fn it_agrees_with_the_modified_edlen_equation_in_dry_air() {
        let b = Builder::default();
        let k = |value, unit| exact(&b, value, unit);
        let (wavelength, t, p) = (k(633.0, "nm"), k(20.0, "°C"), k(1000.0, "hPa"));
        let other = super::super::refractive_index_edlen::index(wavelength, t, p, k(0.0, "Pa"));
        let difference = index(wavelength, t, p, k(0.0, "1"), k(450.0, "µmol/mol")).number() - other.number();
        assert!(difference.abs() < 0.3e-8, "{difference}");
    }
}
