//! Readings at equal intervals of time: their mean, and how far they depend on each other.

use super::columns::{COLUMN_FIELDS, read_column};
use super::engine::{Block, Engine};
use super::field::{Shape, needed, optional};
use super::{BlockKind, Output, no_check};
use crate::diagnostic::{Code, Problem};
use crate::graph::Decision;
use crate::method::allan_deviation;
use crate::method::autocorrelation::{METHOD, MeanRule, SeriesMean, at_distance, effective_number, is_correlated};
use crate::method::statistic::{Statistic, brief};
use crate::quantity::{Dimension, Kind, Unit};
use std::sync::Arc;

/// A series in time.
pub static KIND: BlockKind = BlockKind {
    name: "series-in-time",
    meaning: "equally spaced readings: mean, autocorrelation, Allan deviation",
    fields: &[
        needed("readings", Shape::Mapping(COLUMN_FIELDS), "the readings, in order of time"),
        needed("interval", Shape::Value(Kind::Duration), "the time between readings"),
        needed(
            "uncertainty",
            Shape::Choice(&["independent readings", "effective number", "least Allan deviation"]),
            "how the uncertainty of the mean is evaluated",
        ),
        optional("label", Shape::Text, "what is measured, in words"),
    ],
    outputs: &[
        Output { path: "mean", meaning: "mean of the readings", unit: "" },
        Output { path: "autocorrelation", meaning: "autocorrelation of neighbours", unit: "1" },
        Output { path: "effective_number", meaning: "number of independent readings the series is worth", unit: "1" },
        Output {
            path: "allan_1, allan_2",
            meaning: "overlapping Allan deviation over one and over two readings",
            unit: "",
        },
    ],
    check: no_check,
    build: |engine, block| {
        let _ = build(shorten(engine), block);
    },
};

fn build<'e>(engine: &'e Engine<'e>, block: &'e Block) -> Option<()> {
    let (fields, name) = (block.fields(), block.name());
    let label = fields.text("label").map_or_else(|| format!("readings of {name}"), |text| text.text);
    let column = read_column(engine, fields.mapping("readings")?, &format!("{name}.readings"), "x", &label)?;
    let rows = column.rows();
    let rule = match fields.words("uncertainty").as_str() {
        "effective number" => MeanRule::EffectiveNumber,
        "least Allan deviation" => MeanRule::AllanMinimum,
        _ => MeanRule::Independent,
    };
    if rule == MeanRule::Independent && rows.len() > 2 && is_correlated(&rows) {
        let message = format!(
            "The readings of {name} depend on their neighbours (autocorrelation {}), so s/√n is no standard uncertainty of their mean.",
            brief(at_distance(&rows, 1))
        );
        let problem = Problem::new(Code::ReadingsCorrelated, message);
        engine.complain(
            problem.hint("Write `uncertainty: effective number`, or `least Allan deviation`."),
            fields.place_of("uncertainty"),
        );
    }
    let decisions =
        vec![Decision { what: "autocorrelation of neighbours".into(), decided: brief(at_distance(&rows, 1)) }];
    let unit = engine.graph().node(column.id).name.as_ref().map_or_else(Unit::one, |name| name.unit.clone());
    let (place, output) = (block.raw.name.place, (column.dimension(), Kind::Plain));
    let made = engine.builder.estimator(
        Arc::new(SeriesMean { rule, decisions }),
        &[column],
        &[output],
        &format!("{name}.scatter"),
        &format!("scatter of {label}"),
    );
    let mean = *engine.keep(made, place)?.first()?;
    let described = Statistic::new(4, |columns| {
        let rows = columns.first().copied().unwrap_or_default();
        vec![
            at_distance(rows, 1),
            effective_number(rows).0,
            allan_deviation::overlapping(rows, 1),
            allan_deviation::overlapping(rows, 2),
        ]
    });
    let number = (Dimension::ONE, Kind::Plain);
    let made = engine.builder.estimator(
        Arc::new(described),
        &[column],
        &[number, number, output, output],
        &format!("{name}.description"),
        "description",
    );
    let described = engine.keep(made, place)?;
    let _scope = engine.builder.scope(name, Some(&METHOD.info));
    mean.result("mean", "x", &format!("mean of {label}"), &unit);
    described[0].result("autocorrelation", "r_1", &format!("autocorrelation of neighbours in {label}"), &Unit::one());
    described[1].result("effective_number", "n_eff", &format!("effective number of {label}"), &Unit::one());
    let _allan = engine.builder.scope("", Some(&allan_deviation::METHOD.info));
    described[2].result("allan_1", "σ_y(1)", &format!("Allan deviation of {label}, one reading"), &unit);
    described[3].result("allan_2", "σ_y(2)", &format!("Allan deviation of {label}, two readings"), &unit);
    Some(())
}

fn shorten<'e>(engine: &'e Engine<'_>) -> &'e Engine<'e> {
    engine
}
