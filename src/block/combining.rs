//! What a combination of results found and decided, and what is said when the results disagree.

use super::engine::{Block, Engine};
use crate::diagnostic::{Code, Problem};
use crate::graph::{Decision, NodeId};
use crate::intake::Place;
use crate::method::combination::{Between, Choices, Combination, Expansion, Weights};
use crate::method::consistency::Consistency;
use crate::method::statistic::{brief, probability};
use crate::quantity::{Style, Unit, choose_unit};
use crate::record::Text;

/// A combination, for the report.
pub struct Combined {
    /// The node of the combined result.
    pub result: NodeId,
    pub members: Vec<Member>,
    /// The test of the results kept, where it could be made.
    pub consistency: Option<Consistency>,
    /// Standard deviation between the results in their SI unit, where it was asked for.
    pub between: Option<f64>,
    /// The expansion factor, where one was asked for.
    pub expansion: Option<f64>,
    /// What was decided, and how.
    pub decisions: Vec<(String, String)>,
    /// Results left out, each with its node.
    pub excluded: Vec<(NodeId, LeftOut)>,
    /// The combined result with them.
    pub with_excluded: Option<NodeId>,
}

/// A result combined.
pub struct Member {
    pub path: String,
    pub id: NodeId,
    /// In its coherent SI unit.
    pub standard_uncertainty: f64,
    pub weight: f64,
    /// Standard uncertainty of its difference from the combined result, with what both share.
    pub difference_uncertainty: f64,
}

/// A result left out.
#[derive(Debug, Clone, PartialEq)]
pub struct LeftOut {
    pub path: String,
    pub rule: String,
    pub rule_text: String,
    pub reason: String,
}

/// Chi-square with a smaller probability than this is called a disagreement (Cox, Metrologia 39 (2002) 589, 5.1), one
/// with a larger probability than its complement to 0.975 a suspiciously close agreement.
const DISAGREEMENT: f64 = 0.05;
const TOO_CLOSE: f64 = 0.975;

/// The results left out, each by a rule dated before its data; complained of otherwise.
pub fn left_out(engine: &Engine, block: &Block, results: &[&Text]) -> Option<Vec<LeftOut>> {
    let mut found = Vec::new();
    for one in block.fields().mappings("excluded") {
        let (path, rule_name) = (one.text("result")?, one.text("rule")?);
        if !results.iter().any(|result| result.text == path.text) {
            let message = format!("{} is left out, but it is not among the results.", path.text);
            let listed = results.iter().map(|result| result.text.as_str()).collect::<Vec<_>>().join(", ");
            engine.complain(
                Problem::new(Code::UndefinedReference, message)
                    .hint(format!("The results are {listed}; list there what was measured, and leave it out here.")),
                path.place,
            );
            return None;
        }
        let rule = engine.block(&rule_name, &["rule"])?;
        let of_data = engine.blocks().get(path.text.split('.').next().unwrap_or_default());
        let day = of_data.and_then(|data| data.date).or(block.date);
        if let (Some(date), Some(day)) = (rule.fields().date("date"), day)
            && date > day
        {
            let message = format!("The rule {} is dated {date}, after the {day} of {}.", rule_name.text, path.text);
            let problem = Problem::new(Code::RuleDated, message)
                .hint("A result is left out only by a rule laid down before the data.");
            engine.complain(problem, rule_name.place);
            return None;
        }
        found.push(LeftOut {
            path: path.text,
            rule: rule_name.text,
            rule_text: rule.fields().words("text"),
            reason: one.words("reason"),
        });
    }
    Some(found)
}

/// What a combination decided, in words.
pub fn decisions(names: &[&str], found: &Combination, choices: Choices, shown: &Unit, style: Style) -> Vec<Decision> {
    let mut made = vec![weighting(names, found, choices)];
    made.extend(negative_weights(names, found));
    made.push(test(found));
    let amount = |value: f64| style.difference(value, &choose_unit(value, shown), 2).unwrap_or_default();
    let by = match choices.between {
        Between::None => None,
        Between::PauleMandel => Some("Paule and Mandel"),
        Between::DersimonianLaird => Some("DerSimonian and Laird"),
    };
    if let Some(by) = by {
        let decided = match found.between_variance.sqrt() {
            tau if tau > 0.0 => format!(
                "τ = {} by {by}; it enters the combined result as a Type A contribution of {} with {} degrees of freedom",
                amount(tau),
                amount(found.added_variance.sqrt()),
                names.len() - 1
            ),
            _ => format!("none by {by}: the results vary no more than their uncertainties let expect"),
        };
        made.push(Decision { what: "component between the results".into(), decided });
    }
    let by = match choices.expansion {
        Expansion::None => None,
        Expansion::BirgeRatio => Some("the Birge ratio, not below one"),
        Expansion::Residuals => Some("the smallest factor that brings each result within twice its uncertainty"),
    };
    if let Some(by) = by {
        let decided = format!("the standard uncertainty is multiplied by {}: {by}", brief(found.expansion_factor));
        made.push(Decision { what: "expansion".into(), decided });
    }
    made
}

fn weighting(names: &[&str], found: &Combination, choices: Choices) -> Decision {
    let words = match choices.weights {
        Weights::Equal => "equal",
        Weights::InverseVariance => "by inverse variance",
        Weights::Covariance => "of least variance, from the whole covariance of the results",
    };
    let list = names.iter().zip(&found.weights).map(|(name, weight)| format!("{name} {weight:.3}").replace('-', "−"));
    Decision { what: "weights".into(), decided: format!("{words}: {}", list.collect::<Vec<_>>().join(", ")) }
}

/// Why a weight is below zero.
fn negative_weights(names: &[&str], found: &Combination) -> Option<Decision> {
    let negative: Vec<&str> =
        names.iter().zip(&found.weights).filter(|(_, weight)| **weight < 0.0).map(|(name, _)| *name).collect();
    let decided = format!(
        "of {}: so much of its uncertainty is shared with better results that its departure from them says which way they err; the weights still sum to one",
        negative.join(", ")
    );
    (!negative.is_empty()).then(|| Decision { what: "weight below zero".into(), decided })
}

fn test(found: &Combination) -> Decision {
    let what = "consistency".to_string();
    let Some(test) = &found.consistency else {
        let decided = match found.weights.len() {
            1 => "not tested: there is one result",
            _ => "not tested: a result has no uncertainty of its own beside the others",
        };
        return Decision { what, decided: decided.into() };
    };
    let verdict = match test.probability {
        p if p < DISAGREEMENT => "the results disagree by more than their uncertainties let expect",
        p if p > TOO_CLOSE => {
            "the results agree better than their uncertainties let expect: these may be overstated, or shared"
        }
        _ => "the results agree within their uncertainties",
    };
    let decided = format!(
        "χ² = {} for ν = {}, {}, Birge ratio {}: {verdict}",
        brief(test.chi_square),
        test.degrees_of_freedom,
        probability(test.probability),
        brief(test.birge_ratio)
    );
    Decision { what, decided }
}

/// Warns of results that disagree when nothing was added for it.
pub fn warn_of_disagreement(engine: &Engine, test: Option<&Consistency>, place: Place) {
    let Some(test) = test.filter(|test| test.probability < DISAGREEMENT) else { return };
    let message = format!(
        "The results disagree by more than their uncertainties let expect: χ² is {} for {} degrees of freedom, {}.",
        brief(test.chi_square),
        test.degrees_of_freedom,
        probability(test.probability)
    );
    let hint = "Look for the cause; else write `between: paule_mandel`, which adds what varies between the results to the uncertainty.";
    engine.complain(Problem::new(Code::ResultsInconsistent, message).hint(hint), place);
}

/// Warns of a component between so few results that its t distribution has no variance (n − 1 ≤ 2).
pub fn warn_of_few_results(engine: &Engine, results: usize, place: Place) {
    if results > 3 {
        return;
    }
    let message = format!(
        "What is added for the disagreement of {results} results has {} degrees of freedom, and its t distribution no variance.",
        results - 1
    );
    let hint = "Read the interval, not the standard uncertainty: the coverage factor takes these degrees of freedom into account. Four results or more are better.";
    engine.complain(Problem::new(Code::FewReadings, message).hint(hint), place);
}
