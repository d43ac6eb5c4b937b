//! The mean of readings in groups, with what varies between the groups.

use super::engine::{Block, Engine};
use super::field::{Field, Shape, needed, optional};
use super::fields::Fields;
use super::{BlockKind, Output};
use crate::diagnostic::{Code, Complaints, Problem};
use crate::graph::{InputDraft, Origin, Value};
use crate::method::analysis_of_variance::{Group, GroupedMean, METHOD, Table};
use crate::method::statistic::Statistic;
use crate::quantity::{Kind, Unit, parse_number};
use crate::record::Node;
use std::sync::Arc;

const SUMMARY_FIELDS: &[Field] = &[
    needed("mean", Shape::Number, "the mean of the group"),
    needed("count", Shape::Number, "how many readings it rests on"),
    needed("standard_deviation", Shape::Number, "their experimental standard deviation"),
];

/// An analysis of variance.
pub static KIND: BlockKind = BlockKind {
    name: "analysis-of-variance",
    meaning: "the mean of readings in groups, such as days, with the component between the groups",
    fields: &[
        optional("groups", Shape::Grid, "the readings, one list a group"),
        optional(
            "summaries",
            Shape::Mappings(SUMMARY_FIELDS),
            "mean, count and standard deviation of each group, instead of groups",
        ),
        needed("unit", Shape::Text, "the unit of all these numbers"),
        optional("label", Shape::Text, "what is measured, in words"),
        optional(
            "significance",
            Shape::Number,
            "probability below which the F test is significant; 0.05 unless written",
        ),
        optional("between", Shape::Choice(&["if significant", "always"]), "when the component between groups is taken"),
    ],
    outputs: &[
        Output { path: "mean", meaning: "mean of all readings", unit: "" },
        Output { path: "within", meaning: "standard deviation within groups", unit: "" },
        Output {
            path: "between",
            meaning: "standard deviation between groups, beyond what the scatter within explains",
            unit: "",
        },
    ],
    check,
    build: |engine, block| {
        let _ = build(shorten(engine), block);
    },
};

fn check(fields: Fields<'_>, complaints: &mut Complaints) {
    if fields.get("groups").is_some() == fields.get("summaries").is_some() {
        let problem = Problem::new(Code::FieldMissing, "An analysis of variance needs either groups or summaries.");
        complaints.add_at(problem.hint("Write the readings as `groups:`, one list a day."), fields.place());
    }
}

fn build<'e>(engine: &'e Engine<'e>, block: &'e Block) -> Option<()> {
    let (fields, name) = (block.fields(), block.name());
    let unit_text = fields.text("unit")?;
    let unit = engine.keep(Unit::parse(&unit_text.text), unit_text.place)?;
    let (mut rows, mut places, mut groups) = (Vec::new(), Vec::new(), Vec::new());
    for list in fields.get("groups").and_then(Node::as_list).unwrap_or_default() {
        let mut members = Vec::new();
        for node in list.as_list()? {
            members.push(rows.len());
            rows.push(engine.keep(parse_number(node.as_text().unwrap_or_default(), &unit), node.place)?);
            places.push(node.place);
        }
        groups.push(vec![Group::Rows(members)]);
    }
    for summary in fields.mappings("summaries") {
        let node = summary.get("mean")?;
        let deviation = unit.difference_to_si(summary.number("standard_deviation")?);
        groups.push(vec![Group::Summary {
            row: rows.len(),
            count: summary.number("count")? as usize,
            standard_deviation: deviation,
        }]);
        rows.push(engine.keep(parse_number(node.as_text().unwrap_or_default(), &unit), node.place)?);
        places.push(node.place);
    }
    let label = fields.text("label").map_or_else(|| format!("readings of {name}"), |text| text.text);
    let draft = InputDraft::new(
        &format!("{name}.readings"),
        "x",
        &label,
        Kind::Plain,
        unit.clone(),
        Value::column(rows),
        Origin::ReadingList(places.into()),
    );
    let column = engine.builder.input(draft);
    let significance = fields.number("significance").unwrap_or_else(|| {
        engine.builder.assume(
            format!("{name}: an F test counts as significant below a probability of 0.05"),
            Some(block.raw.name.place),
        );
        0.05
    });
    let rule =
        GroupedMean { groups: groups.clone(), significance, always_between: fields.words("between") == "always" };
    let output = [(unit.dimension(), Kind::Plain)];
    let place = block.raw.name.place;
    let made = engine.builder.estimator(
        Arc::new(rule),
        &[column],
        &output,
        &format!("{name}.scatter"),
        &format!("scatter of {label}"),
    );
    let mean = *engine.keep(made, place)?.first()?;
    let described = Statistic::new(2, move |columns| {
        let table = Table::new(&groups, columns.first().copied().unwrap_or_default());
        table.map_or(vec![f64::NAN; 2], |table| vec![table.within.square().sqrt(), table.between_deviation()])
    });
    let made = engine.builder.estimator(
        Arc::new(described),
        &[column],
        &[output[0], output[0]],
        &format!("{name}.deviations"),
        "standard deviations",
    );
    let deviations = engine.keep(made, place)?;
    let _scope = engine.builder.scope(name, Some(&METHOD.info));
    mean.result("mean", "x", &format!("mean of {label}"), &unit);
    for (deviation, (path, symbol)) in deviations.iter().zip([("within", "s_w"), ("between", "s_b")]) {
        deviation.result(path, symbol, &format!("standard deviation {path} groups of {label}"), &unit);
    }
    Some(())
}

fn shorten<'e>(engine: &'e Engine<'_>) -> &'e Engine<'e> {
    engine
}
