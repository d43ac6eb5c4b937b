//! Straight line by least squares, with jointly estimated parameters.
//!
//! # Source    JCGM 100:2008, H.3 (equations H.13 to H.17), ordinary least squares.
//! # Formula   b_k = y_1 + y_2 (t_k − t_0);  s² = Σ residual²/(n − 2);  covariance s² (AᵀA)⁻¹;  ν = n − 2
//! # Valid for readings of equal, unknown scatter; n ≥ 3 at two or more different abscissae.

use super::{Method, WorkedExample, scaled};
use crate::diagnostic::{Code, Problem};
use crate::graph::{Decision, Estimate, Estimator, MethodInfo};
use crate::numeric::least_squares::fit;

/// The registry's line.
pub static METHOD: Method = Method {
    info: MethodInfo {
        name: "straight-line",
        title: "Straight line by least squares",
        source: "JCGM 100:2008, H.3",
        formula: "b_k = y_1 + y_2 (t_k − t_0);  s² = Σ r_k²/(n − 2);  cov = s² (AᵀA)⁻¹",
        symbols: &[
            ("y_1", "ordinate at the reference abscissa", ""),
            ("y_2", "slope", ""),
            ("t_k", "abscissa", ""),
            ("t_0", "reference abscissa", ""),
            ("b_k", "observed ordinate", ""),
        ],
        valid_for: "equal scatter of the ordinates, n ≥ 3",
    },
    examples: &[
        example("y_1/°C", "-0.1712", || guide_example(0)),
        example("y_2", "0.00218", || guide_example(1)),
        example("u(y_1)/°C", "0.0029", || guide_example(2)),
        example("u(y_2)", "0.00067", || guide_example(3)),
        example("r(y_1, y_2)", "-0.930", || guide_example(4)),
    ],
};

const fn example(quantity: &'static str, printed: &'static str, found: fn() -> f64) -> WorkedExample {
    WorkedExample {
        source: "JCGM 100:2008, H.3, table H.6",
        given: "11 corrections of a thermometer, t_0 = 20 °C",
        quantity,
        printed,
        found,
    }
}

/// The rule: columns t and b; outputs y_1 (at `reference`) and y_2.
#[derive(Debug, Clone, Copy)]
pub struct StraightLine {
    /// Reference abscissa, in the unit of the column.
    pub reference: f64,
}

impl Estimator for StraightLine {
    fn outputs(&self) -> usize {
        2
    }

    fn estimate(&self, columns: &[&[f64]]) -> Result<Estimate, Problem> {
        let [t, b] = columns else {
            return Err(Problem::new(Code::DesignIncomplete, "A line needs abscissae and ordinates."));
        };
        if t.len() < 3 || t.len() != b.len() {
            return Err(Problem::new(
                Code::DesignIncomplete,
                format!("A line with its uncertainty needs three points or more, found {}.", t.len()),
            ));
        }
        let ones = vec![1.0; t.len()];
        let centred: Vec<f64> = t.iter().map(|t| t - self.reference).collect();
        let line = fit(&[&ones, &centred], b, None)?;
        let variance = line.residual_sum_of_squares / line.degrees_of_freedom;
        let by_t = line.design_response(1);
        Ok(Estimate {
            own_covariance: scaled(&line.unscaled_covariance, variance),
            degrees_of_freedom: line.degrees_of_freedom,
            decisions: vec![Decision { what: "fit".into(), decided: format!("straight line, {} points", t.len()) }],
            residuals: line.residuals.clone(),
            values: line.coefficients.clone(),
            jacobian: vec![by_t, line.jacobian],
        })
    }
}

fn guide_example(which: usize) -> f64 {
    let t = [21.521, 22.012, 22.512, 23.003, 23.507, 23.999, 24.513, 25.002, 25.503, 26.010, 26.511];
    let b = [-0.171, -0.169, -0.166, -0.159, -0.164, -0.165, -0.156, -0.157, -0.159, -0.161, -0.160];
    let Ok(estimate) = (StraightLine { reference: 20.0 }).estimate(&[&t, &b]) else { return f64::NAN };
    let covariance = &estimate.own_covariance;
    match which {
        0 | 1 => estimate.values[which],
        2 => covariance[0][0].sqrt(),
        3 => covariance[1][1].sqrt(),
        _ => covariance[0][1] / (covariance[0][0] * covariance[1][1]).sqrt(),
    }
}
