//! The mean of readings in groups, with what varies between the groups.

use super::columns::difference_unit;
use super::engine::{Block, Engine, shorten};
use super::field::{Field, Shape, needed, optional};
use super::fields::Fields;
use super::{BlockKind, Output};
use crate::diagnostic::{Code, Complaints, Problem};
use crate::graph::{InputDraft, Origin, Quantity, Value};
use crate::intake::Place;
use crate::method::analysis_of_variance::{Group, GroupedMean, METHOD, Table};
use crate::method::statistic::Statistic;
use crate::quantity::{Dimension, Kind, Unit, parse_number};
use crate::record::Node;
use std::sync::Arc;

const SUMMARY_FIELDS: &[Field] = &[
    needed("mean", Shape::Number, "the mean of the group"),
    needed("count", Shape::Number, "how many readings it rests on"),
    needed("standard_deviation", Shape::Number, "their experimental standard deviation"),
];

const DAY_FIELDS: &[Field] = &[
    optional("date", Shape::Date, "the day"),
    needed("series", Shape::Grid, "the readings of the day, one list a series"),
];

/// An analysis of variance.
pub static KIND: BlockKind = BlockKind {
    name: "analysis-of-variance",
    meaning: "the mean of readings in groups, such as days, with the component between the groups",
    fields: &[
        optional("groups", Shape::Grid, "the readings, one list a group"),
        optional("days", Shape::Mappings(DAY_FIELDS), "readings in series within days, instead of groups"),
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
        Output { path: "inner", meaning: "standard deviation between series of one day, with days", unit: "" },
        Output { path: "f_between", meaning: "F of the test between groups", unit: "1" },
    ],
    check,
    build: |engine, block| {
        let _ = build(shorten(engine), block);
    },
};

/// What an analysis found beyond its quantities, for the report.
pub struct Analysed {
    pub label: String,
    /// The unit of differences of the readings.
    pub unit: Unit,
    pub table: Table,
    pub significance: f64,
}

fn check(fields: Fields<'_>, complaints: &mut Complaints) {
    let forms = ["groups", "days", "summaries"];
    if forms.iter().filter(|form| fields.get(form).is_some()).count() != 1 {
        let problem =
            Problem::new(Code::FieldMissing, "An analysis of variance needs one of groups, days and summaries.");
        complaints.add_at(problem.hint("Write the readings as `groups:`, one list a day."), fields.place());
    }
    let days = fields.mappings("days").into_iter().filter_map(|day| day.get("series"));
    let grids: Vec<&Node> = fields.get("groups").into_iter().chain(days).collect();
    let groups = grids.iter().filter_map(|grid| grid.as_list()).flatten();
    let is_empty = |list: &&Node| list.as_list().is_some_and(<[Node]>::is_empty);
    for list in groups.chain(grids.iter().copied()).filter(is_empty) {
        let problem = Problem::new(Code::DesignIncomplete, "A group has no readings.");
        complaints.add_at(problem.hint("Write its readings, or leave the group out."), list.place);
    }
    for summary in fields.mappings("summaries") {
        let count = summary.number("count").filter(|count| count.fract() != 0.0 || *count < 1.0);
        if let Some(count) = count {
            let problem = Problem::new(Code::OutOfRange, format!("A group cannot rest on {count} readings."));
            complaints.add_at(problem.hint("Write a whole number from 1 on."), summary.place_of("count"));
        }
        if let Some(deviation) = summary.number("standard_deviation").filter(|deviation| *deviation < 0.0) {
            let problem = Problem::new(Code::OutOfRange, format!("A standard deviation cannot be {deviation}."));
            complaints.add_at(problem.hint("Write it without a sign."), summary.place_of("standard_deviation"));
        }
    }
    if let Some(level) = fields.number("significance").filter(|level| !(*level > 0.0 && *level < 1.0)) {
        let problem = Problem::new(Code::OutOfRange, format!("The significance {level} does not lie between 0 and 1."));
        complaints.add_at(problem.hint("Write `significance: 0.05`."), fields.place_of("significance"));
    }
}

/// The readings of a block, or the means of its groups, with their arrangement.
#[derive(Default)]
struct Arranged {
    rows: Vec<f64>,
    places: Vec<Place>,
    groups: Vec<Vec<Group>>,
}

impl Arranged {
    fn read(engine: &Engine, fields: Fields<'_>, unit: &Unit) -> Option<Arranged> {
        let mut made = Arranged::default();
        for list in fields.get("groups").and_then(Node::as_list).unwrap_or_default() {
            let group = made.readings(engine, list, unit)?;
            made.groups.push(vec![group]);
        }
        for day in fields.mappings("days") {
            let series = day.get("series").and_then(Node::as_list).unwrap_or_default();
            let list = series.iter().map(|list| made.readings(engine, list, unit)).collect::<Option<_>>()?;
            made.groups.push(list);
        }
        for summary in fields.mappings("summaries") {
            let node = summary.get("mean")?;
            let standard_deviation = unit.difference_to_si(summary.number("standard_deviation")?);
            let count = summary.number("count")? as usize;
            made.groups.push(vec![Group::Summary { row: made.rows.len(), count, standard_deviation }]);
            made.reading(engine, node, unit)?;
        }
        Some(made)
    }

    fn readings(&mut self, engine: &Engine, list: &Node, unit: &Unit) -> Option<Group> {
        let start = self.rows.len();
        for node in list.as_list()? {
            self.reading(engine, node, unit)?;
        }
        Some(Group::Rows((start..self.rows.len()).collect()))
    }

    fn reading(&mut self, engine: &Engine, node: &Node, unit: &Unit) -> Option<()> {
        self.rows.push(engine.keep(parse_number(node.as_text().unwrap_or_default(), unit), node.place)?);
        self.places.push(node.place);
        Some(())
    }
}

fn build<'e>(engine: &'e Engine<'e>, block: &'e Block) -> Option<()> {
    let (fields, name, place) = (block.fields(), block.name(), block.raw.name.place);
    let unit_text = fields.text("unit")?;
    let unit = engine.keep(Unit::parse(&unit_text.text), unit_text.place)?;
    let arranged = Arranged::read(engine, fields, &unit)?;
    let table = engine.keep(Table::new(&arranged.groups, &arranged.rows), place)?;
    let label = fields.text("label").map_or_else(|| format!("readings of {name}"), |text| text.text);
    let draft = InputDraft::new(
        &format!("{name}.readings"),
        "x",
        &label,
        Kind::Plain,
        unit.clone(),
        Value::column(arranged.rows),
        Origin::ReadingList(arranged.places.into()),
    );
    let column = engine.builder.input(draft);
    let significance = fields.number("significance").unwrap_or_else(|| {
        let words = format!("{name}: an F test counts as significant below a probability of 0.05");
        engine.builder.assume(words, Some(place));
        0.05
    });
    let always_between = fields.words("between") == "always";
    let rule = GroupedMean { groups: arranged.groups.clone(), significance, always_between };
    let output = [(unit.dimension(), Kind::Plain)];
    let (path, words) = (format!("{name}.scatter"), format!("scatter of {label}"));
    let made = engine.builder.estimator(Arc::new(rule), &[column], &output, &path, &words);
    let mean = *engine.keep(made, place)?.first()?;
    let _scope = engine.builder.scope(name, Some(&METHOD.info));
    mean.result("mean", "x", &format!("mean of {label}"), &unit);
    describe(engine, name, &label, &unit, column, &table, arranged.groups);
    engine.store(name, Analysed { label, unit: difference_unit(&unit), table, significance });
    Some(())
}

/// The standard deviations within and between groups, and F.
fn describe(
    engine: &Engine<'_>,
    name: &str,
    label: &str,
    unit: &Unit,
    column: Quantity<'_>,
    table: &Table,
    groups: Vec<Vec<Group>>,
) {
    let (own, number) = ((unit.dimension(), Kind::Plain), (Dimension::ONE, Kind::Plain));
    let inner = if table.is_nested() { "days" } else { "groups" };
    let mut named = vec![
        (
            "within",
            "s_w",
            format!("standard deviation within {} of {label}", if table.is_nested() { "series" } else { inner }),
        ),
        ("between", "s_b", format!("standard deviation between {inner} of {label}")),
        ("f_between", "F", format!("F between {inner} of {label}")),
    ];
    let [within, between, inner_u] = table.uncertainties();
    let (mut outputs, mut uncertainties) = (vec![own, own, number], vec![within, between, 0.0]);
    if table.is_nested() {
        named.push(("inner", "s_i", format!("standard deviation between series of one day of {label}")));
        outputs.push(own);
        uncertainties.push(inner_u);
    }
    let count = outputs.len();
    let rule = Statistic::new(count, move |columns| {
        let table = Table::new(&groups, columns.first().copied().unwrap_or_default());
        let numbers = table.map(|table| {
            [table.within.square().sqrt(), table.between_deviation(), table.f_between(), table.inner_deviation()]
        });
        numbers.map_or(vec![f64::NAN; count], |numbers| numbers.into_iter().take(count).collect())
    });
    let rule = Arc::new(rule.with_uncertainties(uncertainties));
    let path = format!("{name}.deviations");
    let made = engine.builder.estimator(rule, &[column], &outputs, &path, "limited number of readings");
    for (quantity, (path, symbol, words)) in made.unwrap_or_default().iter().zip(&named) {
        let unit = if *path == "f_between" { Unit::one() } else { difference_unit(unit) };
        quantity.result(path, symbol, words, &unit);
    }
}
