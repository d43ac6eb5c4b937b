//! The law of propagation with its terms of second order, for models that bend within the uncertainty of an input.
//!
//! # Source   JCGM 100:2008, 5.1.2, NOTE; used in JCGM 100, H.1.7 and JCGM 101:2008, 9.3 and 9.4.
//! # Formula  u² = Σ c_i² u_i² + Σ_i Σ_j [½ (∂²f/∂x_i∂x_j)² + c_i ∂³f/∂x_i∂x_j²] u_i² u_j²
//! # Valid for independent inputs with symmetric distributions near the normal one.
//!
//! The sweep gives exact first derivatives; the second and third are differences of them between inputs displaced to
//! either side by a tenth of their standard uncertainty.

use super::evaluate::evaluate_displaced;
use super::node::*;
use super::sensitivity::{Sensitivities, sensitivities, sensitivities_at};
use super::uncertainty::standard_uncertainty;
use super::value::Value;
use crate::numeric::sum::sum;
use std::collections::BTreeMap;

/// Displacement of an input, in its standard uncertainty.
const STEP: f64 = 0.1;
/// With more inputs than this the differences are not worth their time.
const MOST_INPUTS: usize = 64;

/// A scalar input that shapes the measurand: its number, its node, its standard uncertainty.
type Scalar = (u32, NodeId, f64);

/// Standard uncertainty with the terms of second order, in the coherent SI unit of the measurand.
///
/// Nothing where inputs are correlated, where there are more than can be displaced one by one, or where the terms
/// would make the variance negative.
pub fn second_order_uncertainty(graph: &Graph, measurand: NodeId) -> Option<f64> {
    let first = sensitivities(graph, measurand);
    let scalars = scalars(graph, &first)?;
    let terms: Option<Vec<f64>> = scalars.iter().map(|input| terms_of(graph, &first, &scalars, *input)).collect();
    let linear = standard_uncertainty(graph, &first);
    let variance = sum(terms?.into_iter().chain([linear * linear]));
    (variance.is_finite() && variance >= 0.0).then(|| variance.sqrt())
}

fn scalars(graph: &Graph, of: &Sensitivities) -> Option<Vec<Scalar>> {
    let mut list = Vec::new();
    for number in of.inputs.keys() {
        let input = &graph.inputs[*number as usize];
        let u = input.distribution.standard_uncertainty();
        if graph.correlated.iter().any(|group| group.position(*number).is_some()) {
            return None;
        }
        if u > 0.0 && graph.value(input.node).length().is_none() {
            list.push((*number, input.node, u));
        }
    }
    (list.len() <= MOST_INPUTS).then_some(list)
}

/// Σ_i [½ (∂²f/∂x_i∂x_j)² + c_i ∂³f/∂x_i∂x_j²] u_i² u_j² for one input j.
fn terms_of(graph: &Graph, first: &Sensitivities, scalars: &[Scalar], (_, node, u): Scalar) -> Option<f64> {
    let step = STEP * u;
    let (above, below) =
        (displaced(graph, first.measurand, node, step)?, displaced(graph, first.measurand, node, -step)?);
    let slope =
        |of: &Sensitivities, number: u32| of.inputs.get(&number).and_then(|rows| rows.first()).copied().unwrap_or(0.0);
    Some(sum(scalars.iter().map(|(number, _, own)| {
        let (centre, high, low) = (slope(first, *number), slope(&above, *number), slope(&below, *number));
        let second = (high - low) / (2.0 * STEP) * own;
        let third = ((high - centre) + (low - centre)) / (STEP * STEP);
        0.5 * second * second + centre * third * own * own
    })))
}

/// The derivatives with one input moved.
fn displaced(graph: &Graph, measurand: NodeId, node: NodeId, by: f64) -> Option<Sensitivities> {
    let moved = BTreeMap::from([(node, Value::Scalar(graph.number(node) + by))]);
    let values = evaluate_displaced(graph, &moved, measurand).ok()?;
    Some(sensitivities_at(graph, &values, measurand))
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::graph::{Builder, Distribution, InputDraft, Origin};
    use crate::numeric::elementary::powi;
    use crate::quantity::{Kind, Unit};

    fn input<'b>(builder: &'b Builder, path: &str, value: f64, u: f64) -> crate::graph::Quantity<'b> {
        let origin = Origin::Assumed("test");
        let mut draft = InputDraft::new(path, path, path, Kind::Plain, Unit::one(), Value::Scalar(value), origin);
        draft.distribution = Distribution::Normal { standard_uncertainty: u };
        builder.input(draft)
    }

    /// x² + y² with normal inputs: Var = Σ (4 x² u² + 2 u⁴), exactly the terms of second order.
    #[test]
    fn squares_of_normal_inputs() {
        let builder = Builder::default();
        let (x, y) = (input(&builder, "x", 0.0, 0.005), input(&builder, "y", 0.01, 0.004));
        let id = (x.squared() + y.squared()).id;
        let (graph, _) = builder.finish();
        let exact = (2.0 * powi(0.005, 4) + 4.0 * 1e-4 * powi(0.004, 2) + 2.0 * powi(0.004, 4)).sqrt();
        let found = second_order_uncertainty(&graph, id).expect("independent inputs");
        assert!((found / exact - 1.0).abs() < 1e-12, "{found} against {exact}");
    }

    /// exp x about zero: c = f'' = f''' = 1, so u² + 3/2 u⁴.
    #[test]
    fn third_derivatives_count_too() {
        let builder = Builder::default();
        let id = input(&builder, "x", 0.0, 0.1).exponential().id;
        let (graph, _) = builder.finish();
        let found = second_order_uncertainty(&graph, id).expect("one input");
        assert!((found / (0.01f64 + 1.5e-4).sqrt() - 1.0).abs() < 1e-6, "{found}");
    }

    #[test]
    fn linear_models_gain_nothing() {
        let builder = Builder::default();
        let (x, y) = (input(&builder, "x", 3.0, 0.5), input(&builder, "y", 1.0, 0.2));
        let id = (x * 2.0 - y * 3.0).id;
        let (graph, _) = builder.finish();
        let found = second_order_uncertainty(&graph, id).expect("independent inputs");
        assert!((found / (1.0f64 + 0.36).sqrt() - 1.0).abs() < 1e-14, "{found}");
    }

    #[test]
    fn correlated_inputs_are_left_to_the_trials() {
        let builder = Builder::default();
        let (x, y) = (input(&builder, "x", 3.0, 0.5), input(&builder, "y", 1.0, 0.2));
        builder.correlate("r", &[x.id, y.id], vec![vec![1.0, 0.5], vec![0.5, 1.0]]).expect("possible");
        let id = (x * y).id;
        let (graph, _) = builder.finish();
        assert_eq!(second_order_uncertainty(&graph, id), None);
    }
}
