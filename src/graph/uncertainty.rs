//! Combined standard uncertainty, covariance, effective degrees of freedom, coverage factor.
//!
//! # Source   JCGM 100:2008, 5.1 (law of propagation), 5.2 (correlation), G.4 (Welch–Satterthwaite), G.3 (Student's t).
//! # Formula  u_c² = Σ c_i² u_i² over independent sources;  cov(a, b) = Σ c_i(a) c_i(b) u_i²
//!            ν_eff = u_c⁴ / Σ (u_i(y)⁴ / ν_i)
//!
//! Two results that share an input share its node, so correlation needs no declaration.

use super::node::*;
use super::sensitivity::{Sensitivities, Source};
use crate::numeric;

/// Contribution of each source to a variance (or covariance of two measurands), in the order of [`Source`].
pub(super) fn variance_terms(graph: &Graph, a: &Sensitivities, b: &Sensitivities) -> Vec<(Source, f64)> {
    let inputs = a.inputs.iter().map(|(number, left)| {
        let term = match graph.correlated.iter().find_map(|group| Some((group, group.position(*number)?))) {
            Some((group, place)) => correlated_term(graph, group, place, left, b),
            None => b.inputs.get(number).map_or(0.0, |right| {
                let uncertainty = graph.inputs[*number as usize].distribution.standard_uncertainty();
                numeric::sum::sum(left.iter().zip(right).map(|(c, d)| (c * uncertainty) * (d * uncertainty)))
            }),
        };
        (Source::Input(*number), term)
    });
    let estimators = a.estimators.iter().filter_map(|(number, left)| {
        let right = b.estimators.get(number)?;
        let own = &graph.estimators[*number as usize].estimate.own_covariance;
        let term =
            own.iter().zip(left).map(|(row, c)| c * row.iter().zip(right).map(|(cell, d)| cell * d).sum::<f64>()).sum();
        Some((Source::Estimator(*number), term))
    });
    inputs.chain(estimators).filter(|(_, term)| *term != 0.0).collect()
}

/// c_i u_i Σ_j r_ij d_j u_j: what one of several correlated inputs brings.
fn correlated_term(graph: &Graph, group: &CorrelatedInputs, place: usize, left: &[f64], b: &Sensitivities) -> f64 {
    let u = |input: u32| graph.inputs[input as usize].distribution.standard_uncertainty();
    let own = left.first().copied().unwrap_or(0.0) * u(group.inputs[place]);
    let others = group.inputs.iter().zip(&group.coefficients[place]).map(|(input, r)| {
        let slope = b.inputs.get(input).and_then(|weights| weights.first()).copied().unwrap_or(0.0);
        r * slope * u(*input)
    });
    own * numeric::sum::sum(others)
}

/// Covariance of two measurands, in the product of their coherent SI units.
pub fn covariance(graph: &Graph, a: &Sensitivities, b: &Sensitivities) -> f64 {
    let terms: Vec<f64> = variance_terms(graph, a, b).into_iter().map(|(_, term)| term).collect();
    numeric::sum::sum(terms)
}

/// Combined standard uncertainty of a measurand, in its coherent SI unit.
pub fn standard_uncertainty(graph: &Graph, of: &Sensitivities) -> f64 {
    covariance(graph, of, of).max(0.0).sqrt()
}

/// Correlation coefficient of two measurands; zero when one has no uncertainty.
pub fn correlation(graph: &Graph, a: &Sensitivities, b: &Sensitivities) -> f64 {
    let scale = standard_uncertainty(graph, a) * standard_uncertainty(graph, b);
    if scale == 0.0 { 0.0 } else { (covariance(graph, a, b) / scale).clamp(-1.0, 1.0) }
}

/// The variance of each measurand from what it shares with none of the others, in the square of its coherent SI unit.
pub fn unshared_variances(graph: &Graph, of: &[Sensitivities]) -> Vec<f64> {
    let uses = |measurand: &Sensitivities, source: &Source| match source {
        Source::Input(number) => measurand.inputs.contains_key(number),
        Source::Estimator(number) => measurand.estimators.contains_key(number),
    };
    let users = |source: &Source| of.iter().filter(|measurand| uses(measurand, source)).count();
    let own = |measurand: &Sensitivities| {
        let terms = variance_terms(graph, measurand, measurand);
        numeric::sum::sum(terms.iter().filter(|(source, _)| users(source) == 1).map(|(_, term)| *term)).max(0.0)
    };
    of.iter().map(own).collect()
}

/// Degrees of freedom of one source.
pub(super) fn source_degrees_of_freedom(graph: &Graph, source: Source) -> f64 {
    match source {
        Source::Input(number) => graph.inputs[number as usize].degrees_of_freedom,
        Source::Estimator(number) => graph.estimators[number as usize].estimate.degrees_of_freedom,
    }
}

/// Effective degrees of freedom of a measurand (JCGM 100, G.4.1); infinite when no source has finitely many.
pub fn degrees_of_freedom(graph: &Graph, of: &Sensitivities) -> f64 {
    let terms = variance_terms(graph, of, of);
    let total: f64 = terms.iter().map(|(_, term)| term).sum();
    let group_of = |source: &Source| match source {
        Source::Input(number) => graph.correlated.iter().position(|group| group.position(*number).is_some()),
        Source::Estimator(_) => None,
    };
    let alone = terms.iter().filter(|(source, _)| group_of(source).is_none());
    let mut weighted: f64 = alone.map(|(source, term)| term * term / source_degrees_of_freedom(graph, *source)).sum();
    for index in 0..graph.correlated.len() {
        // Correlated inputs are one component; the fewest degrees of freedom among them are taken for all.
        let members: Vec<_> = terms.iter().filter(|(source, _)| group_of(source) == Some(index)).collect();
        let part: f64 = members.iter().map(|(_, term)| term).sum();
        let fewest =
            members.iter().map(|(source, _)| source_degrees_of_freedom(graph, *source)).fold(f64::INFINITY, f64::min);
        weighted += part * part / fewest;
    }
    if weighted > 0.0 { total * total / weighted } else { f64::INFINITY }
}

/// How the coverage factor uses effective degrees of freedom (JCGM 100, G.4.1, NOTE 1).
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default)]
pub enum DegreesOfFreedomRule {
    /// Truncated to the next lower whole number.
    #[default]
    Truncated,
    /// Used as computed.
    AsComputed,
}

/// What the laboratory has settled about coverage.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Settings {
    pub coverage_probability: f64,
    pub degrees_of_freedom: DegreesOfFreedomRule,
}

/// Probability that a normal variable lies within two standard deviations, erf(√2).
pub const TWO_SIGMA: f64 = 0.954_499_736_103_641_6;

impl Settings {
    /// A settled probability; 95.45 % is understood as the two-sigma probability it abbreviates (JCGM 100, table G.1).
    pub fn new(probability: f64, degrees_of_freedom: DegreesOfFreedomRule) -> Self {
        let coverage_probability = if (probability - 0.9545).abs() < 1e-12 { TWO_SIGMA } else { probability };
        Self { coverage_probability, degrees_of_freedom }
    }
}

/// A result with its expanded uncertainty.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Coverage {
    pub standard_uncertainty: f64,
    pub effective_degrees_of_freedom: f64,
    /// The degrees of freedom the factor was taken at.
    pub degrees_of_freedom: f64,
    pub probability: f64,
    pub factor: f64,
    pub expanded_uncertainty: f64,
}

/// Coverage factor and expanded uncertainty of a measurand.
pub fn coverage(graph: &Graph, of: &Sensitivities, settings: Settings) -> Coverage {
    let standard_uncertainty = standard_uncertainty(graph, of);
    let effective = degrees_of_freedom(graph, of);
    let used = match settings.degrees_of_freedom {
        // A hair of rounding must not turn 19 into 18.
        DegreesOfFreedomRule::Truncated if effective.is_finite() => (effective * (1.0 + 1e-12)).floor().max(1.0),
        _ => effective,
    };
    let factor = numeric::distribution::coverage_factor(settings.coverage_probability, used);
    Coverage {
        standard_uncertainty,
        effective_degrees_of_freedom: effective,
        degrees_of_freedom: used,
        probability: settings.coverage_probability,
        factor,
        expanded_uncertainty: factor * standard_uncertainty,
    }
}
