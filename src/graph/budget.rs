//! The uncertainty budget of one measurand.
//!
//! # Source   JCGM 100:2008, 7.2.7 and table H.1 (columns); shares as contribution to u_c².

use super::node::*;
use super::sensitivity::{Sensitivities, Source, sensitivities};
use super::uncertainty::{source_degrees_of_freedom, variance_terms};
use crate::quantity::Unit;

/// One line of a budget.
#[derive(Debug, Clone, PartialEq)]
pub struct BudgetLine {
    pub source: Source,
    /// Path of the input, or of the estimator's own contribution.
    pub path: String,
    pub symbol: String,
    pub label: String,
    /// The unit of estimate and uncertainty.
    pub unit: Unit,
    /// In coherent SI units; absent for a column.
    pub estimate: Option<f64>,
    pub standard_uncertainty: f64,
    pub evaluation: Evaluation,
    pub distribution: &'static str,
    pub degrees_of_freedom: f64,
    /// ∂y/∂x in coherent SI units; absent for a column, where each row has its own.
    pub sensitivity_coefficient: Option<f64>,
    /// |c| u in the measurand's coherent SI unit.
    pub contribution: f64,
    /// Part of u_c², from 0 to 1.
    pub share: f64,
}

/// A budget: lines in falling order of contribution.
#[derive(Debug, Clone, PartialEq)]
pub struct Budget {
    pub measurand: NodeId,
    pub lines: Vec<BudgetLine>,
    pub standard_uncertainty: f64,
}

/// The budget of `measurand`.
pub fn budget(graph: &Graph, measurand: NodeId) -> Budget {
    let derivatives = sensitivities(graph, measurand);
    let terms = variance_terms(graph, &derivatives, &derivatives);
    let variance: f64 = terms.iter().map(|(_, term)| term).sum();
    let mut lines: Vec<BudgetLine> =
        terms.iter().map(|(source, term)| line(graph, &derivatives, *source, *term, variance)).collect();
    lines.sort_by(|a, b| b.contribution.total_cmp(&a.contribution).then_with(|| a.path.cmp(&b.path)));
    Budget { measurand, lines, standard_uncertainty: variance.max(0.0).sqrt() }
}

fn line(graph: &Graph, derivatives: &Sensitivities, source: Source, term: f64, variance: f64) -> BudgetLine {
    let contribution = own_contribution(graph, derivatives, source, term);
    let share = if variance > 0.0 { term / variance } else { 0.0 };
    let degrees_of_freedom = source_degrees_of_freedom(graph, source);
    match source {
        Source::Input(number) => {
            let input = &graph.inputs[number as usize];
            let weights = &derivatives.inputs[&number];
            let name = graph.node(input.node).name.clone();
            let scalar = graph.value(input.node).length().is_none();
            let (path, symbol, label, unit) = name.map_or_else(
                || (format!("input {number}"), String::new(), String::new(), Unit::one()),
                |name| (name.path, name.symbol, name.label, name.unit),
            );
            BudgetLine {
                source,
                path,
                symbol,
                label,
                unit,
                estimate: scalar.then(|| graph.number(input.node)),
                standard_uncertainty: input.distribution.standard_uncertainty(),
                evaluation: input.evaluation,
                distribution: input.distribution.word(),
                degrees_of_freedom,
                sensitivity_coefficient: if scalar { weights.first().copied() } else { None },
                contribution,
                share,
            }
        }
        Source::Estimator(number) => estimator_line(graph, derivatives, number, contribution, share),
    }
}

/// |c| u: without what correlation adds or takes away, which stands in the share.
fn own_contribution(graph: &Graph, derivatives: &Sensitivities, source: Source, term: f64) -> f64 {
    match source {
        Source::Input(number) => {
            let u = graph.inputs[number as usize].distribution.standard_uncertainty();
            let squares = derivatives.inputs[&number].iter().map(|c| (c * u) * (c * u));
            crate::numeric::sum::sum(squares).sqrt()
        }
        Source::Estimator(_) => term.max(0.0).sqrt(),
    }
}

fn estimator_line(
    graph: &Graph,
    derivatives: &Sensitivities,
    number: u32,
    contribution: f64,
    share: f64,
) -> BudgetLine {
    let node = &graph.estimators[number as usize];
    let weights = &derivatives.estimators[&number];
    let single = node.estimate.values.len() == 1;
    let output = graph.node(node.first_output);
    let unit = output.name.as_ref().map_or_else(
        || Unit::parse(&output.dimension.to_string()).unwrap_or_else(|_| Unit::one()),
        |name| name.unit.clone(),
    );
    let own = node.estimate.own_covariance.first().and_then(|row| row.first()).copied().unwrap_or(0.0).max(0.0).sqrt();
    BudgetLine {
        source: Source::Estimator(number),
        path: node.path.clone(),
        symbol: output.name.as_ref().map(|name| name.symbol.clone()).unwrap_or_default(),
        label: node.label.clone(),
        unit,
        estimate: if single { node.estimate.values.first().copied() } else { None },
        standard_uncertainty: own,
        evaluation: Evaluation::TypeA,
        distribution: "t",
        degrees_of_freedom: node.estimate.degrees_of_freedom,
        sensitivity_coefficient: if single { weights.first().copied() } else { None },
        contribution,
        share,
    }
}
