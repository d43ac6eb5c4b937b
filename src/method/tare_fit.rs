//! Apparent mass from the states of a weighing, with the drift of the tare.
//!
//! # Source    least squares on states with and without the artefact, common practice; for an evenly spaced
//!             off-on-off series and a linear drift it is the average of ABA triples without their overlap
//!             (Metrologia 2025, doi 10.1088/1681-7575/ae1dfc, section on the weighing mode).
//! # Formula   y_s = c_0 + c_1 q_s + … + c_K q_s^K − M on_s
//!     y_s   mean of a state: force of coil and balance over g       kg
//!     q_s   mean time of the state from the middle                  s
//!     on_s  1 with the artefact on the pan, 0 without               1
//!     M     apparent mass                                           kg
//!     c_k   drift of the tare                                       kg/s^k
//! States, not samples, are fitted: samples of one state are correlated.
//! # Valid for states of both sorts that enclose each other in time, more of them than coefficients.

use super::statistic::brief;
use super::{Method, WorkedExample, scaled};
use crate::diagnostic::{Code, Problem};
use crate::graph::{Decision, Estimate, Estimator, MethodInfo};
use crate::numeric::distribution::f_upper;
use crate::numeric::elementary::powi;
use crate::numeric::least_squares::{Fit, fit};
use crate::numeric::sum::sum;

/// The registry's line.
pub static METHOD: Method = Method {
    info: MethodInfo {
        name: "tare-fit",
        title: "Apparent mass from the states of a weighing",
        source: "least squares over states, common practice; Metrologia 2025, doi 10.1088/1681-7575/ae1dfc",
        formula: "y_s = c_0 + c_1 q_s + … + c_K q_s^K − M on_s",
        symbols: &[
            ("y_s", "mean of a state, force over g", "kg"),
            ("q_s", "mean time of the state from the middle", "s"),
            ("on_s", "1 with the artefact on the pan, 0 without", "1"),
            ("M", "apparent mass", "kg"),
            ("c_1", "drift of the tare", "kg/s"),
        ],
        valid_for: "states with and without the artefact that enclose each other in time",
    },
    examples: &[
        WorkedExample {
            source: "ABA cycle, d = B − (A_1 + A_2)/2, by hand",
            given: "off 0.5000, on −0.4996, off 0.5002, on −0.4994, off 0.5004 (linear drift 0.0001 a state), order 1",
            quantity: "M/kg",
            printed: "0.9997",
            found: || example(&[0.5000, -0.4996, 0.5002, -0.4994, 0.5004], 1).values[0],
        },
        WorkedExample {
            source: "normal equations, computed independently",
            given: "off 0.5001, on −0.4998, off 0.5003, on −0.4999, off 0.5002, on −0.4996, off 0.5005, order 1",
            quantity: "u(M)/kg",
            printed: "8.858e-5",
            found: || {
                example(&[0.5001, -0.4998, 0.5003, -0.4999, 0.5002, -0.4996, 0.5005], 1).own_covariance[0][0].sqrt()
            },
        },
    ],
};

/// One state.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct TareState {
    /// Mean time, s.
    pub time: f64,
    /// Whether the artefact is on the pan.
    pub on: bool,
}

/// The rule: one column of means of states; outputs M, c_0, …, c_K.
#[derive(Debug, Clone)]
pub struct TareFit {
    pub states: Vec<TareState>,
    pub order: usize,
    /// How the order was chosen.
    pub decisions: Vec<Decision>,
}

impl TareFit {
    fn middle(&self) -> f64 {
        sum(self.states.iter().map(|state| state.time)) / self.states.len().max(1) as f64
    }

    fn solve(&self, y: &[f64]) -> Result<Fit, Problem> {
        let needed = self.order + 3;
        if y.len() < needed || y.len() != self.states.len() {
            let message = format!(
                "A tare of order {} with its uncertainty needs {needed} states or more, found {}.",
                self.order,
                y.len()
            );
            return Err(Problem::new(Code::DesignIncomplete, message).hint("Weigh more states, or take a lower order."));
        }
        let middle = self.middle();
        let on: Vec<f64> = self.states.iter().map(|state| if state.on { -1.0 } else { 0.0 }).collect();
        let powers = (0..=self.order)
            .map(|k| self.states.iter().map(|state| powi(state.time - middle, k as i32)).collect::<Vec<f64>>());
        let columns: Vec<Vec<f64>> = std::iter::once(on).chain(powers).collect();
        fit(&columns.iter().map(Vec::as_slice).collect::<Vec<_>>(), y, None)
    }

    /// Weights of the states in the apparent mass.
    ///
    /// # Errors
    /// `design_incomplete` when the states do not determine it.
    pub fn weights(&self) -> Result<Vec<f64>, Problem> {
        Ok(self.solve(&vec![0.0; self.states.len()])?.jacobian.swap_remove(0))
    }
}

impl Estimator for TareFit {
    fn outputs(&self) -> usize {
        self.order + 2
    }

    fn estimate(&self, columns: &[&[f64]]) -> Result<Estimate, Problem> {
        let [y] = columns else {
            return Err(Problem::new(Code::DesignIncomplete, "A tare fit needs one column of states."));
        };
        let found = self.solve(y)?;
        let variance = found.residual_variance().unwrap_or(f64::NAN);
        Ok(Estimate {
            own_covariance: scaled(&found.unscaled_covariance, variance),
            degrees_of_freedom: found.degrees_of_freedom,
            decisions: self.decisions.clone(),
            residuals: found.residuals,
            values: found.coefficients,
            jacobian: vec![found.jacobian],
        })
    }
}

/// Raises the order from one while F of the added term is significant at `confidence`.
///
/// # Errors
/// Those of the fits.
pub fn choose_order(states: Vec<TareState>, y: &[f64], largest: usize, confidence: f64) -> Result<TareFit, Problem> {
    let mut chosen = TareFit { states, order: 1, decisions: Vec::new() };
    let mut found = chosen.solve(y)?;
    for order in 2..=largest {
        let next = TareFit { order, ..chosen.clone() };
        let Ok(higher) = next.solve(y) else { break };
        let Some(variance) = higher.residual_variance().filter(|variance| *variance > 0.0) else { break };
        let statistic = (found.residual_sum_of_squares - higher.residual_sum_of_squares).max(0.0) / variance;
        let taken = f_upper(statistic, 1.0, higher.degrees_of_freedom) < 1.0 - confidence;
        let verdict = if taken { "significant, taken" } else { "not significant, not taken" };
        chosen.decisions.push(Decision {
            what: format!("order {order} of the tare against {}", order - 1),
            decided: format!("F(1, {}) = {}; {verdict}", higher.degrees_of_freedom, brief(statistic)),
        });
        if !taken {
            break;
        }
        chosen.order = order;
        found = higher;
    }
    let decided = format!("{}, by F tests at the level {}, {largest} at most", chosen.order, brief(confidence));
    chosen.decisions.push(Decision { what: "order of the tare".into(), decided });
    Ok(chosen)
}

fn example(y: &[f64], order: usize) -> Estimate {
    let states =
        (0..y.len()).map(|index| TareState { time: 60.0 * index as f64, on: index % 2 == 1 }).collect::<Vec<_>>();
    TareFit { states, order, decisions: Vec::new() }.estimate(&[y]).unwrap_or_else(|_| Estimate {
        values: vec![f64::NAN],
        own_covariance: vec![vec![f64::NAN]],
        ..Estimate::default()
    })
}

#[cfg(test)]
mod tests {
    use super::*;

    fn states(count: usize) -> Vec<TareState> {
        (0..count).map(|index| TareState { time: 300.0 * index as f64, on: index % 2 == 1 }).collect()
    }

    #[test]
    fn a_parabola_of_the_tare_is_found_and_removed() {
        let list = states(17);
        let scatter = |index: usize| 1e-9 * libm::sin(37.0 * index as f64);
        let y: Vec<f64> = list
            .iter()
            .enumerate()
            .map(|(index, state)| {
                let q = (state.time - 2400.0) / 3600.0;
                0.5 + 3e-6 * q + 8e-7 * q * q - if state.on { 0.999_999 } else { 0.0 } + scatter(index)
            })
            .collect();
        let rule = choose_order(list, &y, 5, 0.99).expect("a fit");
        assert_eq!(rule.order, 2, "{:?}", rule.decisions);
        let found = rule.estimate(&[&y]).expect("a fit");
        assert!((found.values[0] - 0.999_999).abs() < 1e-9, "{}", found.values[0]);
        assert_eq!(found.degrees_of_freedom, 13.0);
        let weights = rule.weights().expect("weights");
        let by_weights: f64 = weights.iter().zip(&y).map(|(w, y)| w * y).sum();
        assert!((by_weights - found.values[0]).abs() < 1e-14);
    }

    #[test]
    fn too_few_states_and_one_sort_only_are_refused() {
        let rule = TareFit { states: states(4), order: 2, decisions: Vec::new() };
        assert_eq!(rule.estimate(&[&[0.0; 4]]).expect_err("too few").code, Code::DesignIncomplete);
        let off = states(9).into_iter().map(|state| TareState { on: false, ..state }).collect();
        let rule = TareFit { states: off, order: 1, decisions: Vec::new() };
        assert_eq!(rule.estimate(&[&[0.0; 9]]).expect_err("never on").code, Code::DesignIncomplete);
    }
}
