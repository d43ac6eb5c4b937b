//! Several results of one quantity combined.

use super::engine::{Block, Engine};
use super::field::{Shape, needed, optional};
use super::weight::Weight;
use super::{BlockKind, Output, no_check};
use crate::diagnostic::{Code, Problem};
use crate::graph::{Quantity, sensitivities, standard_uncertainty};
use crate::method::{combination, conventional_mass, unit};
use crate::quantity::Kind;

/// A combination of results.
pub static KIND: BlockKind = BlockKind {
    name: "combined-result",
    meaning: "several results of one quantity combined; what they share is not divided by √n",
    fields: &[
        needed("results", Shape::Results, "the results to combine"),
        needed("weights", Shape::Choice(&["equal", "inverse_variance"]), "how they are weighted"),
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
    ],
    check: no_check,
    build,
};

fn build(engine: &Engine, block: &Block) {
    let _ = combine(shorten(engine), block);
}

fn combine<'e>(engine: &'e Engine<'e>, block: &'e Block) -> Option<()> {
    let fields = block.fields();
    let paths = fields.texts("results");
    let results: Vec<Quantity<'e>> =
        paths.iter().map(|path| engine.result(path)).collect::<Vec<_>>().into_iter().collect::<Option<_>>()?;
    let first = *results.first().or_else(|| {
        engine.complain(
            Problem::new(Code::DesignIncomplete, "There is no result to combine."),
            fields.place_of("results"),
        );
        None
    })?;
    if let Some((other, path)) = results
        .iter()
        .zip(&paths)
        .find(|(other, _)| other.kind() != first.kind() || other.dimension() != first.dimension())
    {
        let message = format!(
            "{} is {}, but {} is {}; only results of one kind are combined.",
            path.text,
            other.kind().phrase(),
            paths[0].text,
            first.kind().phrase()
        );
        engine.complain(Problem::new(Code::KindMismatch, message), path.place);
        return None;
    }
    let weights = match fields.words("weights").as_str() {
        "inverse_variance" => {
            let graph = engine.graph();
            let uncertainties: Vec<f64> =
                results.iter().map(|result| standard_uncertainty(&graph, &sensitivities(&graph, result.id))).collect();
            if let Some(index) = uncertainties.iter().position(|u| *u <= 0.0) {
                let problem = Problem::new(
                    Code::UncertaintyMissing,
                    format!("{} has no uncertainty, so it cannot be weighted by it.", paths[index].text),
                );
                drop(graph);
                engine.complain(problem, paths[index].place);
                return None;
            }
            combination::inverse_variance_weights(&uncertainties)
        }
        _ => combination::equal_weights(results.len()),
    };
    let combined = combination::weighted(&results, &weights)?;
    let listed = paths.iter().map(|path| path.text.as_str()).collect::<Vec<_>>().join(", ");
    let named = name(engine, block, combined, &listed);
    conventional(engine, block, named)
}

fn name<'e>(engine: &'e Engine<'e>, block: &Block, combined: Quantity<'e>, listed: &str) -> Quantity<'e> {
    let subject = subject(block);
    let of_item = block.fields().text("item").and_then(|item| engine.blocks().get(&item.text)).map(Block::label);
    let (path, symbol, words, shown) = match combined.kind() {
        Kind::Mass => ("mass", format!("m_{subject}"), "mass", "kg"),
        Kind::ConventionalMass => ("conventional_mass", format!("m_c,{subject}"), "conventional mass", "kg"),
        Kind::MassDifference => ("difference", format!("Δm_{subject}"), "mass difference", "mg"),
        kind => ("value", format!("y_{subject}"), kind.word(), kind.default_unit()),
    };
    let _scope = engine.builder.scope(block.name(), Some(&combination::METHOD.info));
    let label = of_item.map_or_else(|| format!("{words}, mean of {listed}"), |label| format!("{words} of {label}"));
    combined.alias().result(path, &symbol, &label, &unit(shown))
}

/// The conventional mass of a combined mass, with the density of the item.
fn conventional<'e>(engine: &'e Engine<'e>, block: &'e Block, combined: Quantity<'e>) -> Option<()> {
    let item = block.fields().text("item")?;
    if combined.kind() != Kind::Mass {
        return None;
    }
    let weight = Weight::find(engine, &item)?;
    let density = weight.density(Some(combined))?;
    let _scope = engine.builder.scope(block.name(), Some(&conventional_mass::METHOD.info));
    let made = conventional_mass::from_mass(&engine.builder, combined, density);
    let label = format!("conventional mass of {}", weight.block.label());
    made.result("conventional_mass", &format!("m_c,{}", item.text), &label, &unit("kg"));
    Some(())
}

fn subject(block: &Block) -> String {
    block.fields().text("item").map_or_else(|| block.name().to_string(), |item| item.text)
}

fn shorten<'e>(engine: &'e Engine<'_>) -> &'e Engine<'e> {
    engine
}
