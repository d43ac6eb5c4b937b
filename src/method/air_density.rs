//! Density of moist air.
//!
//! # Source    A. Picard, R. S. Davis, M. Gläser, K. Fujii, Revised formula for the density of moist air (CIPM-2007),
//!             Metrologia 45 (2008) 149–155, equations 1 to 7 and A1.1 to A1.4.
//! # Formula   ρ = p M_a / (Z R T) · [1 − x_v (1 − M_v / M_a)]
//!     p      pressure                              Pa
//!     t, T   temperature                           °C, K
//!     h      relative humidity, 0 to 1             1
//!     t_d    dew point                             °C
//!     x_v    mole fraction of water vapour         1       x_v = h f(p, t) p_sv(t) / p = f(p, t_d) p_sv(t_d) / p
//!     p_sv   saturation vapour pressure            Pa      p_sv = exp(A T² + B T + C + D / T)
//!     f      enhancement factor                    1       f = α + β p + γ t²
//!     Z      compressibility factor                1
//!     M_a    molar mass of dry air                 kg/mol  M_a = [28.96546 + 12.011 (x_CO2 − 0.0004)] g/mol
//!     M_v    molar mass of water                   kg/mol
//!     R      molar gas constant, 8.314472 as printed with the equation; the exact value of 2019 would raise ρ by
//!            1.1 parts in 10⁶, a twentieth of the equation's own uncertainty   J/(mol K)
//! # Valid for 600 hPa ≤ p ≤ 1100 hPa, 15 °C ≤ t ≤ 27 °C; outside: a complaint.
//!
//! The equation's own relative standard uncertainty, 22 parts in 10⁶ (table 2), is one input shared by all densities.

use super::{Method, WorkedExample, exact, unit};
use crate::diagnostic::{Code, Problem};
use crate::graph::{Builder, Distribution, InputDraft, MethodInfo, Origin, Quantity, Value};
use crate::quantity::Kind;

/// The registry's line.
pub static METHOD: Method = Method {
    info: MethodInfo {
        name: "air-density",
        title: "Density of moist air, CIPM-2007",
        source: "Picard, Davis, Gläser, Fujii, Metrologia 45 (2008) 149–155",
        formula: "ρ_a = p M_a / (Z R T) · [1 − x_v (1 − M_v/M_a)]",
        symbols: &[
            ("ρ_a", "density of the air", "kg/m3"),
            ("p", "air pressure", "Pa"),
            ("T", "thermodynamic temperature", "K"),
            ("x_v", "mole fraction of water vapour", "1"),
            ("x_CO2", "mole fraction of carbon dioxide", "1"),
            ("M_a", "molar mass of dry air", "kg/mol"),
            ("M_v", "molar mass of water", "kg/mol"),
            ("Z", "compressibility factor", "1"),
            ("R", "molar gas constant, 8.314 472 J/(mol K) as printed with the equation", "J/(mol K)"),
        ],
        valid_for: "600 hPa to 1100 hPa, 15 °C to 27 °C",
    },
    examples: &[
        WorkedExample {
            source: "computed from the published equation in high precision; second implementation agrees to 1e-12",
            given: "20 °C, 1013.25 hPa, 50 %, 400 µmol/mol",
            quantity: "ρ_a / (kg/m³)",
            printed: "1.199313895474",
            found: || number(|b| dry_run(b, 293.15, 101_325.0, Moisture::Relative(0.5), 4e-4)),
        },
        WorkedExample {
            source: "computed from the published equation in high precision; second implementation agrees to 1e-12",
            given: "22 °C, 1000 hPa, dew point 0 °C, 400 µmol/mol",
            quantity: "ρ_a / (kg/m³)",
            printed: "1.177998649383",
            found: || number(|b| dry_run(b, 295.15, 100_000.0, Moisture::Dew(273.15), 4e-4)),
        },
    ],
};

/// Relative standard uncertainty of the equation itself (table 2 of the paper).
pub const EQUATION_UNCERTAINTY: f64 = 22e-6;

/// The humidity of air: relative humidity from 0 to 1, or the dew point.
#[derive(Clone, Copy)]
pub enum Humidity<'g> {
    Relative(Quantity<'g>),
    DewPoint(Quantity<'g>),
}

/// What the density is computed from: scalars, or columns of equal length.
#[derive(Clone, Copy)]
pub struct Air<'g> {
    pub temperature: Quantity<'g>,
    pub pressure: Quantity<'g>,
    pub humidity: Humidity<'g>,
    /// Mole fraction.
    pub carbon_dioxide: Quantity<'g>,
}

/// Density of moist air in kg/m³, with the equation's own uncertainty.
pub fn density<'g>(builder: &'g Builder, air: Air<'g>) -> Quantity<'g> {
    let (p, big_t) = (air.pressure.as_kind(Kind::Plain), air.temperature.as_kind(Kind::Plain));
    let t = big_t - exact(builder, 273.15, "K");
    let x_v = vapour_fraction(builder, &air, p, big_t, t);
    let m_a = dry_air_molar_mass(builder, air.carbon_dioxide.as_kind(Kind::Plain));
    let m_v = exact(builder, 18.015_28e-3, "kg/mol");
    let r = exact(builder, 8.314_472, "J mol-1 K-1");
    let z = compressibility(builder, p, big_t, t, x_v);
    let rho = p * m_a / (z * r * big_t) * (1.0 - x_v * (1.0 - m_v / m_a));
    (rho * (1.0 + equation_departure(builder))).as_kind(Kind::Density)
}

/// Refuses temperature (K) and pressure (Pa) outside the equation's range; gives the first row at fault.
///
/// # Errors
/// `out_of_validity`, with the row, the value and the limits.
pub fn check_validity(temperatures: &[f64], pressures: &[f64]) -> Result<(), (usize, Problem)> {
    let outside = |value: &f64, from: f64, to: f64| !(from - 1e-9..=to + 1e-9).contains(value);
    if let Some(row) = temperatures.iter().position(|t| outside(t, 288.15, 300.15)) {
        let message = format!(
            "The air temperature {:.3} °C is outside 15 °C to 27 °C, where CIPM-2007 holds.",
            temperatures[row] - 273.15
        );
        return Err((
            row,
            Problem::new(Code::OutOfValidity, message)
                .hint("Check the reading and its unit; the equation is not used outside its range."),
        ));
    }
    if let Some(row) = pressures.iter().position(|p| outside(p, 60_000.0, 110_000.0)) {
        let message = format!(
            "The air pressure {:.2} hPa is outside 600 hPa to 1100 hPa, where CIPM-2007 holds.",
            pressures[row] / 100.0
        );
        return Err((
            row,
            Problem::new(Code::OutOfValidity, message)
                .hint("Check the reading and its unit; the equation is not used outside its range."),
        ));
    }
    Ok(())
}

fn equation_departure(builder: &Builder) -> Quantity<'_> {
    let origin = Origin::Constant("Picard et al. 2008, table 2: u_r = 22e-6 of the equation itself");
    let mut draft = InputDraft::new(
        "cipm_2007.equation",
        "δ_eq",
        "air-density equation: true over computed, less 1",
        Kind::Plain,
        unit("1"),
        Value::Scalar(0.0),
        origin,
    );
    draft.distribution = Distribution::Normal { standard_uncertainty: EQUATION_UNCERTAINTY };
    builder.input(draft)
}

fn dry_air_molar_mass<'g>(builder: &'g Builder, x_co2: Quantity<'g>) -> Quantity<'g> {
    (28.965_46 + 12.011 * (x_co2 - 0.0004)) * exact(builder, 1e-3, "kg/mol")
}

fn vapour_fraction<'g>(
    builder: &'g Builder,
    air: &Air<'g>,
    p: Quantity<'g>,
    big_t: Quantity<'g>,
    t: Quantity<'g>,
) -> Quantity<'g> {
    match air.humidity {
        Humidity::Relative(h) => {
            h.as_kind(Kind::Plain) * enhancement(builder, p, t) * saturation_pressure(builder, big_t) / p
        }
        Humidity::DewPoint(dew) => {
            let big_td = dew.as_kind(Kind::Plain);
            let td = big_td - exact(builder, 273.15, "K");
            enhancement(builder, p, td) * saturation_pressure(builder, big_td) / p
        }
    }
}

/// f = α + β p + γ t²
fn enhancement<'g>(builder: &'g Builder, p: Quantity<'g>, t: Quantity<'g>) -> Quantity<'g> {
    1.000_62 + exact(builder, 3.14e-8, "/Pa") * p + exact(builder, 5.6e-7, "K-2") * t.squared()
}

/// p_sv = 1 Pa · exp(A T² + B T + C + D / T)
fn saturation_pressure<'g>(builder: &'g Builder, big_t: Quantity<'g>) -> Quantity<'g> {
    let (a, b) = (exact(builder, 1.237_884_7e-5, "K-2"), exact(builder, -1.912_131_6e-2, "/K"));
    let (c, d) = (33.937_110_47, exact(builder, -6.343_164_5e3, "K"));
    exact(builder, 1.0, "Pa") * (a * big_t.squared() + b * big_t + c + d / big_t).exponential()
}

/// Z = 1 − (p/T)[a0 + a1 t + a2 t² + (b0 + b1 t) x_v + (c0 + c1 t) x_v²] + (p/T)² (d + e x_v²)
pub(super) fn compressibility<'g>(
    builder: &'g Builder,
    p: Quantity<'g>,
    big_t: Quantity<'g>,
    t: Quantity<'g>,
    x_v: Quantity<'g>,
) -> Quantity<'g> {
    let k = |value, unit| exact(builder, value, unit);
    let (a0, a1, a2) = (k(1.581_23e-6, "K/Pa"), k(-2.933_1e-8, "/Pa"), k(1.104_3e-10, "K-1 Pa-1"));
    let (b0, b1) = (k(5.707e-6, "K/Pa"), k(-2.051e-8, "/Pa"));
    let (c0, c1) = (k(1.989_8e-4, "K/Pa"), k(-2.376e-6, "/Pa"));
    let (d, e) = (k(1.83e-11, "K2 Pa-2"), k(-0.765e-8, "K2 Pa-2"));
    let ratio = p / big_t;
    let x_v2 = x_v.squared();
    1.0 - ratio * (a0 + a1 * t + a2 * t.squared() + (b0 + b1 * t) * x_v + (c0 + c1 * t) * x_v2)
        + ratio.squared() * (d + e * x_v2)
}

enum Moisture {
    Relative(f64),
    Dew(f64),
}

fn dry_run<'g>(
    builder: &'g Builder,
    temperature: f64,
    pressure: f64,
    moisture: Moisture,
    carbon_dioxide: f64,
) -> Quantity<'g> {
    let humidity = match moisture {
        Moisture::Relative(h) => Humidity::Relative(exact(builder, h, "1")),
        Moisture::Dew(t) => Humidity::DewPoint(exact(builder, t, "K")),
    };
    let air = Air {
        temperature: exact(builder, temperature, "K"),
        pressure: exact(builder, pressure, "Pa"),
        humidity,
        carbon_dioxide: exact(builder, carbon_dioxide, "1"),
    };
    density(builder, air)
}

fn number(make: impl for<'g> Fn(&'g Builder) -> Quantity<'g>) -> f64 {
    let builder = Builder::default();
    let made = make(&builder);
    made.number()
}
