//! Monte Carlo trials beside first-order propagation, for the terminal.
//!
//! # Source   JCGM 101:2008, 7.9 (adaptive procedure) and clause 8 (validation of first-order propagation).

use super::{Stopped, terminal};
use crate::block::Engine;
use crate::graph::{
    Coverage, Distributed, NodeId, Validation, coverage, distributed, propagate_distributions, propagate_until_stable,
    sensitivities,
};
use crate::quantity::{Style, Unit, choose_unit};
use crate::report::figures::fixed;
use crate::report::parts::distribution::drawn_as_normal;
use serde::Serialize;

/// How many trials are made.
#[derive(Debug, Clone, Copy, PartialEq, clap::Args)]
pub struct Amount {
    /// Make so many Monte Carlo trials too, and compare first order with them
    #[arg(long, value_name = "N", value_parser = clap::value_parser!(u32).range(1000..=100_000_000))]
    trials: Option<u32>,
    /// Make trials until the results are stable to so many significant digits of u, at most ten million or --trials
    #[arg(long, value_name = "DIGITS", value_parser = clap::value_parser!(u8).range(1..=4))]
    until_stable: Option<u8>,
}

/// The most trials of an adaptive run when nothing else is said.
const MOST: usize = 10_000_000;
/// Significant digits of u that the comparison is made to, when nothing else is said.
const DIGITS: usize = 1;

/// What trials say of one result, beside first order.
pub struct Tried {
    found: Distributed,
    validation: Validation,
    coverage: Coverage,
    estimate: f64,
    digits: usize,
    /// For an adaptive run, whether it became stable.
    stable: Option<bool>,
    /// A contribution with so few degrees of freedom that its t distribution has no variance; it is drawn as normal.
    few: Option<String>,
}

impl Amount {
    /// Runs the trials of all results together; nothing when none were asked for.
    pub fn run(self, engine: &Engine, results: &[NodeId]) -> Result<Option<Vec<Tried>>, Stopped> {
        let graph = engine.graph();
        let settings = engine.laboratory.settings;
        let probability = settings.coverage_probability;
        let said = |problem: crate::diagnostic::Problem| Stopped(problem.message);
        let (values, stable) = match (self.until_stable, self.trials) {
            (Some(digits), most) => {
                let most = most.map_or(MOST, |most| most as usize);
                let run = propagate_until_stable(&graph, results, probability, digits as usize, most).map_err(said)?;
                (run.trials.values, Some(run.is_stable))
            }
            (None, Some(trials)) => {
                (propagate_distributions(&graph, results, trials as usize).map_err(said)?.values, None)
            }
            (None, None) => return Ok(None),
        };
        let digits = self.until_stable.map_or(DIGITS, usize::from);
        let one = |(id, mut values): (&NodeId, Vec<f64>)| {
            let coverage = coverage(&graph, &sensitivities(&graph, *id), settings);
            let found = distributed(&mut values, probability);
            let (estimate, u) = (graph.number(*id), coverage.standard_uncertainty);
            let validation = Validation::new(estimate, coverage.expanded_uncertainty, found.symmetric, u, digits);
            let few = drawn_as_normal(&graph, *id);
            Tried { found, validation, coverage, estimate, digits, stable, few }
        };
        Ok(Some(results.iter().zip(values).map(one).collect()))
    }
}

impl Tried {
    /// The comparison as text; `unit` is that of the result.
    pub fn text(&self, style: Style, unit: &Unit) -> String {
        let unit = choose_unit(self.coverage.standard_uncertainty, unit);
        let amount = |value: f64| fixed(style, unit.difference_from_si(value), 4);
        let row = |words: &str, y: f64, u: f64, (low, high): (f64, f64)| {
            vec![
                format!("  {words}"),
                amount(y - self.estimate),
                amount(u),
                amount(low - self.estimate),
                amount(high - self.estimate),
            ]
        };
        let (found, validation) = (&self.found, &self.validation);
        let first = row("first order", self.estimate, self.coverage.standard_uncertainty, validation.first_order);
        let heads = ["  departures from the estimate", "y", "u", "lower end", "upper end"];
        let mut rows = vec![heads.map(String::from).to_vec(), first];
        rows.push(row("trials, symmetric interval", found.estimate, found.standard_uncertainty, found.symmetric));
        rows.push(row("trials, shortest interval", found.estimate, found.standard_uncertainty, found.shortest));
        let blank = String::new;
        let ends = [amount(validation.low_difference), amount(validation.high_difference)];
        rows.push([["  difference of the ends".to_string(), blank(), blank()].to_vec(), ends.to_vec()].concat());
        rows.push(vec!["  numerical tolerance δ".into(), blank(), blank(), amount(validation.tolerance)]);
        let no_verdict = |path: &String| {
            format!(
                "Nothing is validated: {path} has two degrees of freedom or fewer and was drawn as normal, so state the interval of first order"
            )
        };
        let verdict = match validation.is_valid() {
            true => "First-order propagation is validated: both ends agree within δ",
            false => "First-order propagation is not validated: the valid interval is that of the trials",
        };
        let verdict = self.few.as_ref().map_or_else(|| verdict.to_string(), no_verdict);
        let steady = match self.stable {
            None => String::new(),
            Some(true) => format!(", stable to {}", terminal::counted(self.digits, "significant digit")),
            Some(false) => format!(", NOT yet stable to {}", terminal::counted(self.digits, "significant digit")),
        };
        format!(
            "Monte Carlo: {} trials{steady}; in {}\n{}{verdict} (JCGM 101, clause 8; {} of u).\n",
            style.digits(&found.trials.to_string()),
            unit.text_or_one(),
            terminal::columns(&rows, &[false, true, true, true, true]),
            terminal::counted(self.digits, "significant digit")
        )
    }

    /// The comparison for JSON, in coherent SI units.
    pub fn json(&self) -> JsonTrials {
        let pair = |(low, high): (f64, f64)| [low, high];
        JsonTrials {
            trials: self.found.trials,
            estimate: self.found.estimate,
            standard_uncertainty: self.found.standard_uncertainty,
            symmetric_interval: pair(self.found.symmetric),
            shortest_interval: pair(self.found.shortest),
            first_order_interval: pair(self.validation.first_order),
            digits: self.digits,
            numerical_tolerance: self.validation.tolerance,
            is_validated: self.few.is_none() && self.validation.is_valid(),
            drawn_as_normal: self.few.clone(),
            is_stable: self.stable,
        }
    }
}

/// Trials as JSON; `is_stable` is null when their number was given.
#[derive(Serialize)]
pub struct JsonTrials {
    trials: usize,
    estimate: f64,
    standard_uncertainty: f64,
    symmetric_interval: [f64; 2],
    shortest_interval: [f64; 2],
    first_order_interval: [f64; 2],
    digits: usize,
    numerical_tolerance: f64,
    is_validated: bool,
    drawn_as_normal: Option<String>,
    is_stable: Option<bool>,
}
