//! Statements made from what was actually used: uncertainty, assumptions.

use super::results::nominal_probability;
use crate::block::Engine;
use crate::graph::{DegreesOfFreedomRule, NodeId};
use crate::report::Markup;
use crate::report::figures::{Figure, freedom, per_cent};
use crate::report::listing::assumptions;
use crate::report::table::symbol;

/// How the uncertainty of one result is stated, from the k, p and ν used (JCGM 100, 7.2.3 and 7.2.4).
pub fn uncertainty_statement(engine: &Engine, result: NodeId) -> Markup {
    let style = engine.laboratory.style;
    let Some(figure) = Figure::of(engine, result) else { return Markup::new() };
    let coverage = figure.coverage;
    let probability = per_cent(style, nominal_probability(coverage.probability));
    let mut made = Markup::text("The expanded uncertainty of ");
    made.push(&symbol(&figure.symbol));
    made.push_text(&format!(
        " ({}) is {}: the combined standard uncertainty, {}, multiplied by the coverage factor ",
        figure.label,
        figure.expanded_uncertainty(),
        figure.standard_uncertainty()
    ));
    made.push(&symbol("k")).push_text(&format!(" = {}. ", figure.factor()));
    match coverage.degrees_of_freedom {
        nu if nu.is_finite() => {
            made.push_text("The factor is taken from the ").push_code("#emph(\"t\")").push_text(" distribution with ");
            let equals = if nu > 99_999.5 { "" } else { "= " };
            made.push(&symbol("ν_eff"))
                .push_text(&format!(" {equals}{} effective degrees of freedom", freedom(style, nu)));
            if engine.laboratory.settings.degrees_of_freedom == DegreesOfFreedomRule::Truncated {
                made.push_text(" (truncated to a whole number)");
            }
        }
        _ => {
            made.push_text(
                "The factor is taken from the normal distribution, for the degrees of freedom are unlimited",
            );
        }
    }
    made.push_text(&format!(
        ", for a coverage probability of about {probability}. Standard uncertainties were evaluated and combined according to JCGM 100:2008."
    ));
    made
}

/// Values used that nobody wrote.
pub fn assumptions_list(engine: &Engine) -> Markup {
    let list = assumptions(engine);
    match list.is_empty() {
        true => Markup::text("No value was used beyond those written in the records."),
        false => super::bullets(&list.into_iter().map(|text| format!("{text}.")).collect::<Vec<_>>()),
    }
}
