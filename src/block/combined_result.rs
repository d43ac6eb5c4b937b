//! Several results of one quantity combined.

use super::combining::{Combined, LeftOut, Member, decisions, left_out, warn_of_disagreement, warn_of_few_results};
use super::engine::{Block, Engine, shorten};
use super::field::{Field, Shape, needed, optional};
use super::fields::Fields;
use super::weight::Weight;
use super::{BlockKind, Output};
use crate::diagnostic::{Code, Complaints, Problem};
use crate::graph::{Quantity, joint};
use crate::method::combination::{self, Between, Choices, Combination, Disagreement, Expansion, Weights};
use crate::method::{consistency, conventional_mass, unit};
use crate::quantity::{Dimension, Kind, Unit, choose_unit};
use crate::record::Text;
use std::sync::Arc;

const LEFT_OUT_FIELDS: &[Field] = &[
    needed("result", Shape::Text, "the result left out; it stands among the results"),
    optional("rule", Shape::Name, "the rule it was left out by"),
    optional("reason", Shape::Text, "why, in words"),
];

/// A combination of results.
pub static KIND: BlockKind = BlockKind {
    name: "combined-result",
    meaning: "several results of one quantity combined; what they share is not divided by √n",
    fields: &[
        needed("results", Shape::Results, "the results to combine"),
        needed("weights", Shape::Choice(&["equal", "inverse_variance", "covariance"]), "how they are weighted"),
        optional(
            "between",
            Shape::Choice(&["none", "paule_mandel", "dersimonian_laird"]),
            "how what varies between the results is estimated; none unless written",
        ),
        optional(
            "expansion",
            Shape::Choice(&["none", "birge_ratio", "residuals"]),
            "what multiplies the whole uncertainty, never by less than one; none unless written",
        ),
        optional("excluded", Shape::Mappings(LEFT_OUT_FIELDS), "results left out, with rule and reason"),
        optional("item", Shape::Name, "the weight whose mass it is, for the conventional mass"),
        optional("label", Shape::Text, "what is printed for it"),
    ],
    outputs: &[
        Output { path: "mass", meaning: "combined mass, where masses are combined", unit: "kg" },
        Output {
            path: "conventional_mass",
            meaning: "combined conventional mass; from the mass where an item is named",
            unit: "kg",
        },
        Output { path: "difference", meaning: "combined mass difference, where differences are combined", unit: "mg" },
        Output { path: "value", meaning: "combined value of any other kind", unit: "" },
        Output { path: "chi_square", meaning: "chi-square of the results with their covariance", unit: "1" },
        Output { path: "reduced_chi_square", meaning: "chi-square over its degrees of freedom, n − 1", unit: "1" },
        Output { path: "chi_square_probability", meaning: "probability of a larger chi-square by chance", unit: "1" },
        Output { path: "birge_ratio", meaning: "square root of the reduced chi-square", unit: "1" },
        Output { path: "between", meaning: "standard deviation between the results, where it was asked for", unit: "" },
        Output {
            path: "expansion_factor",
            meaning: "what the uncertainty was multiplied by, where it was asked for",
            unit: "1",
        },
        Output {
            path: "departure",
            meaning: "a departure of zero that carries what was added for disagreement, where that was asked for",
            unit: "",
        },
        Output {
            path: "with_excluded.mass",
            meaning: "the same with the excluded results kept, where any was left out; so each output above",
            unit: "kg",
        },
    ],
    check,
    build: |engine, block| {
        let _ = Work { engine: shorten(engine), block, fields: block.fields() }.build();
    },
};

fn check(fields: Fields<'_>, complaints: &mut Complaints) {
    let asked = |name: &str| !matches!(fields.words(name).as_str(), "" | "none");
    if asked("between") && asked("expansion") {
        let message = "A component between the results and an expansion would count their disagreement twice.";
        complaints.add_at(
            Problem::new(Code::DesignIncomplete, message).hint("Keep `between:` or `expansion:`, not both."),
            fields.place_of("expansion"),
        );
    }
    for one in fields.mappings("excluded") {
        if one.get("rule").is_none() || one.words("reason").trim().is_empty() {
            let message = format!("{} is left out without a rule and a reason.", one.words("result"));
            complaints.add_at(
                Problem::new(Code::ExclusionWithoutReason, message)
                    .hint("Write `rule:` with the name of a rule dated before the measurement, and `reason:`."),
                one.place(),
            );
        }
    }
}

/// One result to combine, with where it is named.
#[derive(Clone)]
struct Entry<'e> {
    path: Text,
    result: Quantity<'e>,
}

struct Work<'e> {
    engine: &'e Engine<'e>,
    block: &'e Block,
    fields: Fields<'e>,
}

/// A set of results combined.
struct Made<'e> {
    combined: Quantity<'e>,
    members: Vec<Member>,
    found: Combination,
    decisions: Vec<(String, String)>,
}

impl<'e> Work<'e> {
    fn build(&self) -> Option<()> {
        let all = self.entries()?;
        let excluded = left_out(self.engine, self.block, &all.iter().map(|entry| &entry.path).collect::<Vec<_>>())?;
        let is_kept = |entry: &&Entry| !excluded.iter().any(|one| one.path == entry.path.text);
        let kept: Vec<Entry> = all.iter().filter(is_kept).cloned().collect();
        if kept.is_empty() {
            let problem = Problem::new(Code::DesignIncomplete, "Every result is left out; there is none to combine.");
            self.engine.complain(
                problem.hint("Keep at least one result, or give the block other results."),
                self.fields.place_of("excluded"),
            );
            return None;
        }
        let made = self.combine(&kept, "")?;
        let place = self.fields.place_of("results");
        if self.choices() == (Choices { weights: self.choices().weights, ..Choices::default() }) {
            warn_of_disagreement(self.engine, made.found.consistency.as_ref(), place);
        } else if made.found.added_variance > 0.0 {
            warn_of_few_results(self.engine, kept.len(), place);
        }
        let with_excluded = if excluded.is_empty() { None } else { Some(self.combine(&all, "with_excluded.")?) };
        self.store(made, with_excluded, excluded, &all);
        Some(())
    }

    fn store(&self, made: Made<'e>, with: Option<Made<'e>>, excluded: Vec<LeftOut>, all: &[Entry<'e>]) {
        let id_of = |path: &str| all.iter().find(|entry| entry.path.text == path).map(|entry| entry.result.id);
        let choices = self.choices();
        self.engine.store(
            self.block.name(),
            Combined {
                result: made.combined.id,
                members: made.members,
                consistency: made.found.consistency,
                between: (choices.between != Between::None).then(|| made.found.between_variance.sqrt()),
                expansion: (choices.expansion != Expansion::None).then_some(made.found.expansion_factor),
                decisions: made.decisions,
                excluded: excluded.into_iter().filter_map(|one| Some((id_of(&one.path)?, one))).collect(),
                with_excluded: with.map(|with| with.combined.id),
            },
        );
    }

    /// The results in their order, of one kind.
    fn entries(&self) -> Option<Vec<Entry<'e>>> {
        let paths = self.fields.texts("results");
        let results: Vec<Quantity<'e>> =
            paths.iter().map(|path| self.engine.result(path)).collect::<Vec<_>>().into_iter().collect::<Option<_>>()?;
        let entries: Vec<Entry> = paths.into_iter().zip(results).map(|(path, result)| Entry { path, result }).collect();
        let Some(first) = entries.first() else {
            let problem = Problem::new(Code::DesignIncomplete, "There is no result to combine.");
            self.engine
                .complain(problem.hint("List them: `results: [W1.mass, W2.mass]`."), self.fields.place_of("results"));
            return None;
        };
        let differs = |entry: &&Entry| {
            entry.result.kind() != first.result.kind() || entry.result.dimension() != first.result.dimension()
        };
        if let Some(other) = entries.iter().find(differs) {
            let message = format!(
                "{} is {}, but {} is {}; only results of one kind are combined.",
                other.path.text,
                other.result.kind().phrase(),
                first.path.text,
                first.result.kind().phrase()
            );
            self.engine.complain(Problem::new(Code::KindMismatch, message), other.path.place);
            return None;
        }
        let twice =
            |(index, entry): &(usize, &Entry)| entries[..*index].iter().any(|one| one.path.text == entry.path.text);
        if let Some((_, again)) = entries.iter().enumerate().find(twice) {
            let message = format!("{} stands twice among the results.", again.path.text);
            self.engine.complain(
                Problem::new(Code::DesignIncomplete, message)
                    .hint("List each result once; weights are chosen by `weights:`."),
                again.path.place,
            );
            return None;
        }
        Some(entries)
    }

    fn choices(&self) -> Choices {
        Choices {
            weights: match self.fields.words("weights").as_str() {
                "inverse_variance" => Weights::InverseVariance,
                "covariance" => Weights::Covariance,
                _ => Weights::Equal,
            },
            between: match self.fields.words("between").as_str() {
                "paule_mandel" => Between::PauleMandel,
                "dersimonian_laird" => Between::DersimonianLaird,
                _ => Between::None,
            },
            expansion: match self.fields.words("expansion").as_str() {
                "birge_ratio" => Expansion::BirgeRatio,
                "residuals" => Expansion::Residuals,
                _ => Expansion::None,
            },
        }
    }

    /// Combines results and names what comes of them behind the prefix.
    fn combine(&self, entries: &[Entry<'e>], prefix: &str) -> Option<Made<'e>> {
        let (engine, choices) = (self.engine, self.choices());
        let ids: Vec<_> = entries.iter().map(|entry| entry.result.id).collect();
        let shared = joint(&engine.graph(), &ids);
        let shared = engine.keep(shared, self.fields.place_of("results"))?;
        self.check_uncertainties(entries, &shared.standard_uncertainties, &shared.covariance)?;
        let results: Vec<f64> = entries.iter().map(|entry| entry.result.number()).collect();
        let found = combination::combine(&results, &shared.covariance, choices);
        let found = engine.keep(found, self.fields.place_of("weights"))?;
        let names: Vec<&str> = entries.iter().map(|entry| entry.path.text.as_str()).collect();
        let shown = self.shown_unit(entries.first()?.result);
        let decided = decisions(&names, &found, choices, &shown, engine.laboratory.style);
        let quantities: Vec<Quantity<'e>> = entries.iter().map(|entry| entry.result).collect();
        let of_differences = combination::difference_uncertainties(&shared.covariance, &found.weights);
        let mut combined = combination::weighted(&quantities, &found.weights)?;
        if found.consistency.is_some() {
            let rule = Disagreement {
                covariance: shared.covariance.clone(),
                added_variance: found.added_variance,
                between: found.between_variance.sqrt(),
                expansion_factor: found.expansion_factor,
                decisions: decided.clone(),
            };
            let departure = self.disagreement(rule, &quantities, prefix, &shown)?;
            if choices.between != Between::None || choices.expansion != Expansion::None {
                combined = combined + departure;
            }
        }
        let named = self.name(combined, &names.join(", "), prefix, &shown);
        self.conventional(named, prefix);
        let member = |(index, entry): (usize, &Entry)| Member {
            path: entry.path.text.clone(),
            id: entry.result.id,
            standard_uncertainty: shared.standard_uncertainties[index],
            weight: found.weights[index],
            difference_uncertainty: of_differences[index],
        };
        let members = entries.iter().enumerate().map(member).collect();
        let decisions = decided.into_iter().map(|one| (one.what, one.decided)).collect();
        Some(Made { combined: named, members, found, decisions })
    }

    /// Complains where a choice needs an uncertainty, or one of its own, that a result has not.
    fn check_uncertainties(&self, entries: &[Entry<'e>], u: &[f64], covariance: &[Vec<f64>]) -> Option<()> {
        let choices = self.choices();
        if choices == Choices::default() {
            return Some(());
        }
        if let Some((entry, _)) = entries.iter().zip(u).find(|(_, u)| **u <= 0.0) {
            let message = format!("{} has no uncertainty, so it cannot be weighted or tested by it.", entry.path.text);
            self.engine.complain(
                Problem::new(Code::UncertaintyMissing, message)
                    .hint("Write `weights: equal` alone, or state its uncertainty."),
                entry.path.place,
            );
            return None;
        }
        let needs_inverse = choices != Choices { weights: Weights::InverseVariance, ..Choices::default() };
        if let Some(index) = consistency::first_determined(covariance).filter(|_| needs_inverse) {
            let message = format!(
                "{} is wholly determined by the results before it, so their covariance has no inverse.",
                entries[index].path.text
            );
            self.engine.complain(
                Problem::new(Code::CorrelationImpossible, message)
                    .hint("Leave it out, or write `weights: equal` without `between:` and `expansion:`."),
                entries[index].path.place,
            );
            return None;
        }
        Some(())
    }

    /// Adds the test of consistency with its named outputs; gives the departure that carries the added variance.
    fn disagreement(
        &self,
        rule: Disagreement,
        results: &[Quantity<'e>],
        prefix: &str,
        shown: &Unit,
    ) -> Option<Quantity<'e>> {
        let (engine, block, choices) = (self.engine, self.block, self.choices());
        let first = results.first()?;
        let one = (Dimension::ONE, Kind::Plain);
        let difference = (first.dimension(), first.kind().of_difference());
        let outputs = [difference, one, one, one, one, difference, one];
        let what = match choices.expansion {
            Expansion::None => "between_component",
            _ => "expansion",
        };
        let label = match choices.expansion {
            Expansion::None => format!("variation between the results of {}", block.name()),
            _ => format!("expansion for the disagreement of the results of {}", block.name()),
        };
        let path = format!("{}.{prefix}{what}", block.name());
        let added = rule.added_variance.sqrt();
        let made = engine.builder.estimator(Arc::new(rule), results, &outputs, &path, &label);
        let made = engine.keep(made, block.raw.name.place)?;
        let _scope = engine.builder.scope(block.name(), Some(&consistency::METHOD.info));
        let names = [
            ("chi_square", "χ²", "chi-square"),
            ("reduced_chi_square", "χ²_ν", "reduced chi-square"),
            ("chi_square_probability", "p", "probability of a larger chi-square"),
            ("birge_ratio", "R_B", "Birge ratio"),
        ];
        for (quantity, (path, symbol, words)) in made.iter().skip(1).zip(names) {
            quantity.result(&format!("{prefix}{path}"), symbol, &format!("{words} of {}", block.name()), &Unit::one());
        }
        if let (Some(between), true) = (made.get(5), choices.between != Between::None) {
            let words = format!("standard deviation between the results of {}", block.name());
            let shown = choose_unit(between.number(), shown);
            between.result(&format!("{prefix}between"), "τ", &words, &shown);
        }
        if let (Some(factor), true) = (made.get(6), choices.expansion != Expansion::None) {
            let words = format!("expansion factor of {}", block.name());
            factor.result(&format!("{prefix}expansion_factor"), "f", &words, &Unit::one());
        }
        let departure = made.first().copied()?;
        if choices.between != Between::None || choices.expansion != Expansion::None {
            let shown = choose_unit(added, shown);
            departure.result(&format!("{prefix}departure"), "δ", &label, &shown);
        }
        Some(departure)
    }

    /// The unit of differences between these results.
    fn shown_unit(&self, first: Quantity<'e>) -> Unit {
        let graph = self.engine.graph();
        match graph.node(first.id).name.as_ref() {
            Some(name) if first.kind() == Kind::Plain => name.unit.clone(),
            _ => unit(first.kind().of_difference().default_unit()),
        }
    }

    fn name(&self, combined: Quantity<'e>, listed: &str, prefix: &str, shown: &Unit) -> Quantity<'e> {
        let (engine, block) = (self.engine, self.block);
        let subject = self.subject(prefix);
        let of_item = self.fields.text("item").and_then(|item| engine.blocks().get(&item.text)).map(Block::label);
        let (path, symbol, words, printed_in) = match combined.kind() {
            Kind::Mass => ("mass", format!("m_{subject}"), "mass", unit("kg")),
            Kind::ConventionalMass => ("conventional_mass", format!("m_c,{subject}"), "conventional mass", unit("kg")),
            Kind::MassDifference => ("difference", format!("Δm_{subject}"), "mass difference", unit("mg")),
            Kind::Plain => ("value", format!("y_{subject}"), "value", shown.clone()),
            kind => ("value", format!("y_{subject}"), kind.word(), unit(kind.default_unit())),
        };
        let _scope = engine.builder.scope(block.name(), Some(&combination::METHOD.info));
        let with = if prefix.is_empty() { "" } else { ", with the excluded results" };
        let label = match (&of_item, self.fields.text("label")) {
            (Some(label), _) => format!("{words} of {label}{with}"),
            (None, Some(label)) if combined.kind() == Kind::Plain => format!("{}{with}", label.text),
            _ => format!("{words}, mean of {listed}"),
        };
        combined.alias().result(&format!("{prefix}{path}"), &symbol, &label, &printed_in)
    }

    /// The conventional mass of a combined mass, with the density of the item.
    fn conventional(&self, combined: Quantity<'e>, prefix: &str) -> Option<()> {
        let item = self.fields.text("item")?;
        if combined.kind() != Kind::Mass {
            return None;
        }
        let engine = self.engine;
        let weight = Weight::find(engine, &item)?;
        let density = weight.density(Some(combined))?;
        let _scope = engine.builder.scope(self.block.name(), Some(&conventional_mass::METHOD.info));
        let made = conventional_mass::from_mass(&engine.builder, combined, density);
        let with = if prefix.is_empty() { "" } else { ", with the excluded results" };
        let label = format!("conventional mass of {}{with}", weight.block.label());
        let symbol = format!("m_c,{}", self.subject(prefix));
        made.result(&format!("{prefix}conventional_mass"), &symbol, &label, &unit("kg"));
        Some(())
    }

    fn subject(&self, prefix: &str) -> String {
        let subject = self.fields.text("item").map_or_else(|| self.block.name().to_string(), |item| item.text);
        if prefix.is_empty() { subject } else { format!("{subject},all") }
    }
}
