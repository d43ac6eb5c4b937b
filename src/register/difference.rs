//! What changed between two lists of results: inputs, values, printed digits, and what did not.

use crate::block::Engine;
use crate::block::correction::Correction;
use crate::graph::trail;
use crate::quantity::choose_unit;
use crate::report::change::printed_ratio;
pub use crate::report::change::{InputChange, ValueChange};
use crate::report::listing::list_results;
use serde::{Deserialize, Serialize};
use std::collections::{BTreeMap, BTreeSet};

/// One quantity as a list of results says it.
#[derive(Debug, Clone, PartialEq, Deserialize)]
pub struct Listed {
    pub name: String,
    pub label: String,
    pub si_unit: String,
    pub value: Option<f64>,
    pub standard_uncertainty: Option<f64>,
    pub printed: String,
    pub origin: Origin,
    pub typed: Option<String>,
}

/// Where its number comes from.
#[derive(Debug, Clone, PartialEq, Deserialize)]
pub struct Origin {
    pub what: String,
    pub file: Option<String>,
    pub line: Option<u32>,
}

#[derive(Deserialize)]
struct List {
    quantities: Vec<Listed>,
}

/// Quantities by name.
pub type Quantities = BTreeMap<String, Listed>;

/// Reads `results.json`.
pub fn read_results(bytes: &[u8]) -> Option<Quantities> {
    let list: List = serde_json::from_slice(bytes).ok()?;
    Some(list.quantities.into_iter().map(|one| (one.name.clone(), one)).collect())
}

/// The quantities an engine has built so far.
pub fn present_results(engine: &Engine) -> Quantities {
    read_results(list_results(engine).json().as_bytes()).unwrap_or_default()
}

/// What is known to have been touched since.
#[derive(Debug, Clone, Default)]
pub struct Touched {
    /// Files whose bytes are others.
    pub files: BTreeSet<String>,
    /// Names of corrections made since.
    pub corrections: BTreeSet<String>,
}

impl Touched {
    /// The corrections made since that touch a quantity.
    fn corrections_of<'e>(&self, engine: &'e Engine, name: &str) -> Vec<&'e Correction> {
        let graph = engine.graph();
        let Some(id) = graph.find(name) else { return Vec::new() };
        let mut found = engine.corrections_of(&graph.node(id).origin);
        found.retain(|one| self.corrections.contains(&one.name));
        found
    }
}

/// What changed.
#[derive(Debug, Clone, Default, PartialEq, Serialize, Deserialize)]
pub struct Difference {
    pub inputs: Vec<InputChange>,
    /// Inputs that another takes the place of, as a newer certificate does on the day of use.
    pub superseded: Vec<InputChange>,
    /// Reported results that changed.
    pub results: Vec<ValueChange>,
    /// Other computed values whose printed digits changed.
    pub others: Vec<ValueChange>,
    /// Reported results that did not change.
    pub unchanged: Vec<String>,
}

impl Difference {
    /// Whether nothing changed.
    pub fn is_empty(&self) -> bool {
        self.inputs.is_empty() && self.superseded.is_empty() && self.results.is_empty() && self.others.is_empty()
    }

    /// Takes out of `then` and `now` what differs. `results` are the reported ones; `engine` has built what `now` lists.
    pub fn between(
        then: &Quantities,
        now: &Quantities,
        results: &[String],
        touched: &Touched,
        engine: &Engine,
    ) -> Difference {
        let mut difference = Difference::default();
        for (name, old) in then.iter().filter(|(_, old)| old.origin.what != "computed") {
            let new = now.get(name);
            let corrections = touched.corrections_of(engine, name);
            if is_same_input(old, new, touched) && (old.value.is_some() || corrections.is_empty()) {
                continue;
            }
            let change = input_change(old, new, &corrections);
            match is_superseded(old, engine) {
                true => difference.superseded.push(change),
                false => difference.inputs.push(change),
            }
        }
        difference.superseded.extend(newly_used(then, now, results, engine));
        let inputs: BTreeSet<&str> =
            difference.inputs.iter().chain(&difference.superseded).map(|change| change.name.as_str()).collect();
        let (mut reported, mut others) = (Vec::new(), Vec::new());
        for (name, old) in then.iter().filter(|(_, old)| old.origin.what == "computed") {
            let new = now.get(name);
            let is_result = results.contains(name);
            let is_same = new.is_some_and(|new| same_numbers(old, new) && old.printed == new.printed);
            if is_same {
                if is_result {
                    difference.unchanged.push(name.clone());
                }
                continue;
            }
            let change = value_change(engine, old, new, because_of(engine, name, &inputs));
            match is_result {
                true => reported.push(change),
                false if change.printed_digits_change => others.push(change),
                false => {}
            }
        }
        (difference.results, difference.others) = (reported, others);
        difference
    }

    /// Results that one of two reports states and the other does not.
    pub fn note_reported(&mut self, then: (&[String], &Quantities), now: (&[String], &Quantities)) {
        let added = now.0.iter().filter(|name| !then.0.contains(name)).filter_map(|name| now.1.get(name));
        let added = added.map(|one| stated_in_one(one, "not reported".into(), one.printed.clone()));
        let dropped = then.0.iter().filter(|name| !now.0.contains(name)).filter_map(|name| then.1.get(name));
        let dropped = dropped.map(|one| stated_in_one(one, one.printed.clone(), "not reported".into()));
        let all: Vec<ValueChange> = added.chain(dropped).collect();
        for list in [&mut self.results, &mut self.others] {
            list.retain(|one| !all.iter().any(|other| other.name == one.name));
        }
        self.unchanged.retain(|name| !all.iter().any(|other| other.name == *name));
        self.results.extend(all);
    }
}

fn stated_in_one(one: &Listed, old: String, new: String) -> ValueChange {
    ValueChange {
        name: one.name.clone(),
        label: one.label.clone(),
        old,
        new,
        difference: None,
        si_unit: one.si_unit.clone(),
        printed_difference: "—".into(),
        relative_to_uncertainty: None,
        printed_relative: "—".into(),
        uncertainty_ratio: None,
        printed_digits_change: true,
        because_of: Vec::new(),
    }
}

/// Inputs a reported result rests on now that did not exist then: a newer certificate, a further effect.
fn newly_used(then: &Quantities, now: &Quantities, results: &[String], engine: &Engine) -> Vec<InputChange> {
    let graph = engine.graph();
    let steps = results.iter().filter_map(|name| graph.find(name)).flat_map(|id| trail(&graph, id).steps);
    let names: BTreeSet<&str> =
        steps.filter_map(|step| graph.node(step.node).name.as_ref()).map(|name| name.path.as_str()).collect();
    let is_new = |one: &&Listed| one.origin.what != "computed" && !then.contains_key(&one.name);
    let new = names.into_iter().filter_map(|name| now.get(name)).filter(is_new);
    new.map(|one| InputChange {
        name: one.name.clone(),
        label: one.label.clone(),
        old: "not used".into(),
        new: words(one),
        place: place_words(&one.origin),
    })
    .collect()
}

fn place_words(origin: &Origin) -> String {
    let line = origin.line.map(|line| format!(", line {line}")).unwrap_or_default();
    format!("{}{line}", origin.file.clone().unwrap_or_default())
}

fn same_numbers(old: &Listed, new: &Listed) -> bool {
    let bits = |value: Option<f64>| value.map(f64::to_bits);
    bits(old.value) == bits(new.value) && bits(old.standard_uncertainty) == bits(new.standard_uncertainty)
}

fn is_same_input(old: &Listed, new: Option<&Listed>, touched: &Touched) -> bool {
    let Some(new) = new else { return false };
    let is_column = old.value.is_none();
    let file_changed = old.origin.file.as_ref().is_some_and(|file| touched.files.contains(file));
    same_numbers(old, new) && old.printed == new.printed && !(is_column && file_changed)
}

/// A value that was not touched but is no longer the one used.
fn is_superseded(old: &Listed, engine: &Engine) -> bool {
    let (Some(typed), Some(file), Some(line)) = (&old.typed, &old.origin.file, old.origin.line) else { return false };
    let Some(file) = engine.sources().find(file) else { return false };
    let sources = engine.sources();
    let text = sources.file(file).line(line as usize).to_vec();
    String::from_utf8_lossy(&text).contains(typed.as_str())
}

fn words(one: &Listed) -> String {
    one.typed.clone().unwrap_or_else(|| one.printed.clone())
}

fn input_change(old: &Listed, new: Option<&Listed>, corrections: &[&Correction]) -> InputChange {
    let origin = new.map_or(&old.origin, |new| &new.origin);
    if let (None, [first, ..]) = (old.value, corrections) {
        let join =
            |text: fn(&Correction) -> &str| corrections.iter().map(|one| text(one)).collect::<Vec<_>>().join("; ");
        let lines: Vec<String> = corrections.iter().map(|one| one.line.to_string()).collect();
        return InputChange {
            name: old.name.clone(),
            label: old.label.clone(),
            old: join(|one| &one.old),
            new: join(|one| &one.new),
            place: format!("{}, line {}, by {}", first.record, lines.join(", "), join(|one| &one.name)),
        };
    }
    let (was, is) = (words(old), new.map_or_else(|| "none".into(), words));
    InputChange {
        name: old.name.clone(),
        label: old.label.clone(),
        new: if was == is && old.value.is_none() { format!("{is}, changed") } else { is },
        old: was,
        place: place_words(origin),
    }
}

/// A difference in a unit that suits it, to two digits.
fn printed(engine: &Engine, name: &str, difference: f64, uncertainty: Option<f64>) -> String {
    // Sums taken in another order differ in their last bits.
    let is_rounding = uncertainty.is_some_and(|u| difference.abs() < 1e-9 * u);
    let graph = engine.graph();
    let unit = graph.find(name).and_then(|id| graph.node(id).name.as_ref()).map(|name| name.unit.clone());
    let Some(unit) = unit else { return "—".into() };
    if difference == 0.0 || is_rounding {
        return format!("0 {}", unit.text()).trim_end().to_string();
    }
    let unit = choose_unit(difference.abs(), &unit);
    engine.laboratory.style.difference(difference, &unit, 2).unwrap_or_else(|_| "—".into())
}

fn value_change(engine: &Engine, old: &Listed, new: Option<&Listed>, because_of: Vec<String>) -> ValueChange {
    let difference = new.and_then(|new| Some(new.value? - old.value?));
    let old_uncertainty = old.standard_uncertainty.filter(|u| *u > 0.0);
    ValueChange {
        name: old.name.clone(),
        label: old.label.clone(),
        old: old.printed.clone(),
        new: new.map_or_else(|| "none".into(), |new| new.printed.clone()),
        printed_difference: difference
            .map_or_else(|| "—".into(), |one| printed(engine, &old.name, one, old_uncertainty)),
        difference,
        si_unit: old.si_unit.clone(),
        printed_relative: printed_ratio(difference.zip(old_uncertainty).map(|(difference, u)| difference / u)),
        relative_to_uncertainty: difference.zip(old_uncertainty).map(|(difference, u)| difference / u),
        uncertainty_ratio: new
            .and_then(|new| new.standard_uncertainty)
            .zip(old_uncertainty)
            .map(|(new, old)| new / old),
        printed_digits_change: new.is_none_or(|new| new.printed != old.printed),
        because_of,
    }
}

/// The changed inputs in the trail of a quantity.
fn because_of(engine: &Engine, name: &str, inputs: &BTreeSet<&str>) -> Vec<String> {
    let graph = engine.graph();
    let Some(id) = graph.find(name) else { return Vec::new() };
    let names = trail(&graph, id).steps.into_iter().filter_map(|step| graph.node(step.node).name.as_ref());
    names.map(|name| name.path.clone()).filter(|path| inputs.contains(path.as_str())).collect()
}
