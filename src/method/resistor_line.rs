//! Resistance on the day of use: a straight line through dated calibrations, and the conditions of use.
//!
//! # Source    weighted straight line: JCGM 100:2008, H.3, common practice; enlargement by √(χ²/ν): R. T. Birge, Physical
//!             Review 40 (1932) 207 (recalled); temperature, pressure and load terms: common practice.
//! # Formula   R_k = R_k,meas/E(T_k, p_k),  E = 1 + a (T − T_0) + b (T − T_0)² + c (p − p_0)
//!             R_0, Ṙ from R_k = R_0 + Ṙ (t_k − t_0), weights 1/u²(R_k), χ² = Σ [R_k − R_0 − Ṙ (t_k − t_0)]²/u²(R_k)
//!             covariance (AᵀWA)⁻¹ max(1, χ²/ν)
//!             R(t) = [R_0 + Ṙ (t − t_0)] E(T, p) + R_0 k_P (P − P_cal),  P = V²/R_0
//!     R_k,meas  resistance at a calibration, at T_k and p_k     Ω
//!     a, b      temperature coefficients                        1/K, 1/K²
//!     c         pressure coefficient                            1/Pa
//!     k_P       load coefficient                                1/W
//!     P_cal     power at the calibrations                       W
//! The calibrations carry their own uncertainty through the line; the estimator adds the excess χ²/ν − 1 where there is one.
//! # Valid for two calibrations or more, on different days, before and after the use.

use super::{Method, WorkedExample, exact, scaled};
use crate::diagnostic::{Code, Problem};
use crate::graph::{Builder, Decision, Estimate, Estimator, MethodInfo, Quantity};
use crate::method::statistic::{brief, probability};
use crate::numeric::distribution::chi_square_upper;
use crate::numeric::least_squares::fit;
use crate::quantity::Kind;
use std::sync::Arc;

/// The registry's line.
pub static METHOD: Method = Method {
    info: MethodInfo {
        name: "resistor-line",
        title: "Resistance on the day of use",
        source: "weighted straight line, JCGM 100:2008, H.3; Birge, Physical Review 40 (1932) 207; coefficients, common practice",
        formula: "R(t) = [R_0 + Ṙ (t − t_0)] [1 + a (T − T_0) + b (T − T_0)² + c (p − p_0)] + R_0 k_P (P − P_cal)",
        symbols: &[
            ("R_0", "resistance at the reference conditions and time", "ohm"),
            ("Ṙ", "change with time", "ohm/s"),
            ("a", "temperature coefficient", "/K"),
            ("b", "second temperature coefficient", "K-2"),
            ("c", "pressure coefficient", "/Pa"),
            ("k_P", "load coefficient", "/W"),
            ("P", "power in use, V²/R_0", "W"),
            ("P_cal", "power at the calibrations", "W"),
        ],
        valid_for: "two calibrations or more on different days, before and after the use",
    },
    examples: &[
        example("R_0/Ω", "100.0003269886", || line_example(0)),
        example("Ṙ/R_0 per day", "1.353822e-10", || line_example(1)),
        example("χ²", "7.27790", || line_example(2)),
        WorkedExample {
            source: "computed by hand from the formula",
            given: "R_0 = 100 Ω, a = 4e-7 /K, b = −3e-8 /K², c = −8e-10 /hPa, 1 K and −50 hPa off, k_P = 5e-10 /mW, P = 3.5 mW, P_cal = 2.5 mW",
            quantity: "R/Ω",
            printed: "100.00004105",
            found: || {
                let builder = Builder::default();
                let k = |value, unit| exact(&builder, value, unit);
                let environment = guide_environment(&builder).factor(k(297.15, "K"), k(963.25, "hPa"));
                let load = Load { coefficient: k(5e-10, "/mW"), calibration_power: k(2.5, "mW") };
                let r_0 = k(100.0, "ohm");
                in_use(r_0, environment, r_0, load, k(0.35_f64.sqrt(), "V")).number()
            },
        },
    ],
};

const fn example(quantity: &'static str, printed: &'static str, found: fn() -> f64) -> WorkedExample {
    WorkedExample {
        source: "independent reduction of invented calibrations by matrix algebra",
        given: "4 ratios to R_K/2 on days −31, −9, 12 and 28, u_r = 1.2e-9, reduced to 23 °C and 1013.25 hPa; t_0 = day 0",
        quantity,
        printed,
        found,
    }
}

/// How a resistor depends on temperature and pressure.
#[derive(Clone, Copy)]
pub struct Environment<'g> {
    /// T_0, p_0.
    pub reference_temperature: Quantity<'g>,
    pub reference_pressure: Quantity<'g>,
    /// a.
    pub temperature_coefficient: Quantity<'g>,
    /// b.
    pub second_temperature_coefficient: Quantity<'g>,
    /// c.
    pub pressure_coefficient: Quantity<'g>,
}

impl<'g> Environment<'g> {
    /// E at temperature and pressure; columns where these are.
    pub fn factor(&self, temperature: Quantity<'g>, pressure: Quantity<'g>) -> Quantity<'g> {
        let rise = (temperature - self.reference_temperature).as_kind(Kind::Plain);
        let excess = (pressure - self.reference_pressure).as_kind(Kind::Plain);
        1.0 + self.temperature_coefficient * rise
            + self.second_temperature_coefficient * rise.squared()
            + self.pressure_coefficient * excess
    }
}

/// How a resistor depends on the power in it.
#[derive(Clone, Copy)]
pub struct Load<'g> {
    /// k_P.
    pub coefficient: Quantity<'g>,
    /// P_cal.
    pub calibration_power: Quantity<'g>,
}

/// R in use, from the line's value `r` at the time, E, R_0 and the voltage; columns where these are.
pub fn in_use<'g>(
    r: Quantity<'g>,
    environment: Quantity<'g>,
    r_0: Quantity<'g>,
    load: Load<'g>,
    voltage: Quantity<'g>,
) -> Quantity<'g> {
    let power = voltage.squared() / r_0;
    r * environment + r_0 * load.coefficient * (power - load.calibration_power)
}

/// The rule: columns t and R; outputs R_0 (at `reference`) and Ṙ.
#[derive(Debug, Clone)]
pub struct ResistorLine {
    /// t_0 in the unit of the column.
    pub reference: f64,
    /// u(R_k), for the weights.
    pub uncertainties: Arc<[f64]>,
}

impl Estimator for ResistorLine {
    fn outputs(&self) -> usize {
        2
    }

    fn estimate(&self, columns: &[&[f64]]) -> Result<Estimate, Problem> {
        let [t, r] = columns else {
            return Err(Problem::new(Code::DesignIncomplete, "A line needs dates and resistances."));
        };
        if t.len() < 2 || t.len() != r.len() || r.len() != self.uncertainties.len() {
            let message = format!("A line through calibrations needs two or more of them, found {}.", t.len());
            return Err(Problem::new(Code::DesignIncomplete, message).hint("State `hold:` for a single calibration."));
        }
        let smallest = self.uncertainties.iter().copied().fold(f64::INFINITY, f64::min);
        let weights: Vec<f64> = self.uncertainties.iter().map(|u| (smallest / u) * (smallest / u)).collect();
        let (ones, from) = (vec![1.0; t.len()], r[0]);
        let centred: Vec<f64> = t.iter().map(|t| t - self.reference).collect();
        // Differences from the first calibration keep the digits that the line is about.
        let differences: Vec<f64> = r.iter().map(|r| r - from).collect();
        let line = fit(&[&ones, &centred], &differences, Some(&weights))?;
        let chi_square = line.residual_sum_of_squares / (smallest * smallest);
        let freedom = line.degrees_of_freedom;
        let birge = if freedom > 0.0 { (chi_square / freedom).sqrt() } else { 1.0 };
        let excess = (birge * birge - 1.0).max(0.0);
        Ok(Estimate {
            own_covariance: scaled(&line.unscaled_covariance, smallest * smallest * excess),
            degrees_of_freedom: if excess > 0.0 { freedom } else { f64::INFINITY },
            decisions: decisions(t.len(), chi_square, freedom, birge),
            residuals: line.residuals.clone(),
            values: vec![from + line.coefficients[0], line.coefficients[1]],
            jacobian: vec![line.design_response(1), line.jacobian],
        })
    }
}

fn decisions(points: usize, chi_square: f64, freedom: f64, birge: f64) -> Vec<Decision> {
    let mut list = vec![Decision { what: "line".into(), decided: format!("weighted, through {points} calibrations") }];
    if freedom > 0.0 {
        let p = probability(chi_square_upper(chi_square, freedom));
        let decided = format!("{} with {freedom} degrees of freedom, {p}", brief(chi_square));
        list.push(Decision { what: "χ²".into(), decided });
        let decided = match birge > 1.0 {
            true => format!("the uncertainty of the line is enlarged by {}", brief(birge)),
            false => "the uncertainty of the line is not enlarged".into(),
        };
        list.push(Decision { what: "Birge ratio".into(), decided });
    }
    list
}

fn guide_environment(builder: &Builder) -> Environment<'_> {
    let k = |value, unit| exact(builder, value, unit);
    Environment {
        reference_temperature: k(296.15, "K"),
        reference_pressure: k(1013.25, "hPa"),
        temperature_coefficient: k(4e-7, "/K"),
        second_temperature_coefficient: k(-3e-8, "K-2"),
        pressure_coefficient: k(-8e-10, "/hPa"),
    }
}

fn line_example(which: usize) -> f64 {
    let builder = Builder::default();
    let k = |value, unit| exact(&builder, value, unit);
    let environment = Environment {
        temperature_coefficient: k(3.824e-7, "/K"),
        second_temperature_coefficient: k(-3.087e-8, "K-2"),
        pressure_coefficient: k(-7.577e-10, "/hPa"),
        ..guide_environment(&builder)
    };
    let list: Vec<f64> = [
        (0.007_748_116_968_9, 296.138, 1016.48),
        (0.007_748_117_155_9, 296.1462, 997.68),
        (0.007_748_117_029_4, 296.148, 1018.45),
        (0.007_748_117_091_9, 296.1619, 1019.93),
    ]
    .into_iter()
    .map(|(ratio, temperature, pressure)| {
        let measured = super::quantum_hall_resistance::resistance(builder.number(ratio), 2.0, builder.number(0.0));
        (measured / environment.factor(k(temperature, "K"), k(pressure, "hPa"))).number()
    })
    .collect();
    let uncertainties: Vec<f64> = list.iter().map(|r| 1.2e-9 * r).collect();
    let rule = ResistorLine { reference: 0.0, uncertainties: uncertainties.clone().into() };
    let days = [-31.0, -9.0, 12.0, 28.0];
    let Ok(estimate) = rule.estimate(&[&days, &list]) else { return f64::NAN };
    match which {
        0 => estimate.values[0],
        1 => estimate.values[1] / estimate.values[0],
        _ => estimate.residuals.iter().zip(&uncertainties).map(|(r, u)| (r / u) * (r / u)).sum(),
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn rule(reference: f64) -> ResistorLine {
        ResistorLine { reference, uncertainties: Arc::from([1e-7, 2e-7, 1e-7, 1e-7]) }
    }

    const DAYS: [f64; 4] = [-30.0, -10.0, 12.0, 28.0];
    const SCATTERED: [f64; 4] = [100.000_01, 100.000_012, 100.000_010_6, 100.000_011];

    #[test]
    fn scatter_beyond_the_certificates_enlarges_and_less_does_not_shrink() {
        let wide = rule(0.0).estimate(&[&DAYS, &SCATTERED]).expect("a line");
        assert!(wide.own_covariance[0][0] > 0.0 && wide.degrees_of_freedom == 2.0);
        let straight = DAYS.map(|t| 100.0 + 1e-9 * t);
        let exact = rule(0.0).estimate(&[&DAYS, &straight]).expect("a line");
        assert_eq!((exact.own_covariance[0][0], exact.own_covariance[1][1]), (0.0, 0.0));
        assert!((exact.values[1] - 1e-9).abs() < 1e-15, "{}", exact.values[1]);
    }

    #[test]
    fn derivatives_agree_with_differences() {
        let found = rule(3.0).estimate(&[&DAYS, &SCATTERED]).expect("a line");
        for row in 0..4 {
            let moved = |by: f64| {
                let mut list = SCATTERED;
                list[row] += by;
                rule(3.0).estimate(&[&DAYS, &list]).expect("a line").values
            };
            let (up, down) = (moved(1e-4), moved(-1e-4));
            for output in 0..2 {
                let slope = (up[output] - down[output]) / 2e-4;
                assert!((slope - found.jacobian[1][output][row]).abs() < 1e-9, "{output} {row}: {slope}");
            }
        }
    }

    #[test]
    fn one_calibration_makes_no_line() {
        let rule = ResistorLine { reference: 0.0, uncertainties: Arc::from([1e-7]) };
        assert!(rule.estimate(&[&[0.0], &[100.0]]).is_err());
        assert!(rule.estimate(&[&[0.0, 1.0]]).is_err());
    }
}
