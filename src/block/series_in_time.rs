//! Readings at equal intervals of time: their mean, and how far they depend on each other.

use super::columns::{COLUMN_FIELDS, Column, read_column};
use super::engine::{Block, Engine, shorten};
use super::field::{Shape, needed, optional};
use super::fields::Fields;
use super::given::Given;
use super::{BlockKind, Output};
use crate::diagnostic::{Code, Complaints, Problem};
use crate::graph::Decision;
use crate::method::allan_deviation::{self, AllanPoint, CONFIDENCE, allan_points};
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
            path: "allan_1, allan_2, allan_4, …",
            meaning: "overlapping Allan deviation over so many readings, up to half of them",
            unit: "",
        },
        Output {
            path: "allan_1.low, allan_1.high, …",
            meaning: "95 % confidence limits of the Allan deviation, for independent readings",
            unit: "",
        },
    ],
    check,
    build: |engine, block| {
        let _ = build(shorten(engine), block);
    },
};

/// What a series was found to be beyond its quantities, for the report.
pub struct TimedSeries {
    pub label: String,
    /// The unit of differences of its readings.
    pub unit: Unit,
    /// The time between readings, in seconds.
    pub interval: f64,
    pub count: usize,
    pub allan: Vec<AllanPoint>,
}

fn check(fields: Fields<'_>, complaints: &mut Complaints) {
    if let Some(Given::Stated { value, place }) = fields.given("interval", Kind::Duration)
        && value.value <= 0.0
    {
        let problem = Problem::new(Code::OutOfRange, format!("The time between readings is {}.", value.text));
        complaints
            .add_at(problem.hint("Write the time from one reading to the next, such as `interval: 10 s`."), place);
    }
}

fn build<'e>(engine: &'e Engine<'e>, block: &'e Block) -> Option<()> {
    let (fields, name) = (block.fields(), block.name());
    let label = fields.text("label").map_or_else(|| format!("readings of {name}"), |text| text.text);
    let column = read_column(engine, fields.mapping("readings")?, &format!("{name}.readings"), "x", &label)?;
    let interval = match fields.given("interval", Kind::Duration)? {
        Given::Stated { value, .. } => value.value,
        Given::Reference(reference) => engine.result(&reference)?.number(),
    };
    let rule = match fields.words("uncertainty").as_str() {
        "effective number" => MeanRule::EffectiveNumber,
        "least Allan deviation" => MeanRule::AllanMinimum,
        _ => MeanRule::Independent,
    };
    warn_correlated(engine, fields, name, rule, &column.rows);
    let neighbours = brief(at_distance(&column.rows, 1));
    let decisions = vec![Decision { what: "autocorrelation of neighbours".into(), decided: neighbours }];
    let made = engine.builder.estimator(
        Arc::new(SeriesMean { rule, decisions }),
        &[column.quantity],
        &[(column.quantity.dimension(), Kind::Plain)],
        &format!("{name}.scatter"),
        &format!("scatter of {label}"),
    );
    let mean = *engine.keep(made, block.raw.name.place)?.first()?;
    let _scope = engine.builder.scope(name, Some(&METHOD.info));
    mean.result("mean", "x", &format!("mean of {label}"), &column.unit);
    describe(engine, name, &label, &column);
    let (unit, allan) = (column.difference_unit(), allan_points(&column.rows));
    engine.store(name, TimedSeries { label, unit, interval, count: column.rows.len(), allan });
    Some(())
}

fn warn_correlated(engine: &Engine, fields: Fields<'_>, name: &str, rule: MeanRule, rows: &[f64]) {
    if rule != MeanRule::Independent || rows.len() < 3 || !is_correlated(rows) {
        return;
    }
    let message = format!(
        "The readings of {name} depend on their neighbours (autocorrelation {}), so s/√n is no standard uncertainty of their mean.",
        brief(at_distance(rows, 1))
    );
    let problem = Problem::new(Code::ReadingsCorrelated, message);
    engine.complain(
        problem.hint("Write `uncertainty: effective number`, or `least Allan deviation`."),
        fields.place_of("uncertainty"),
    );
}

/// Autocorrelation, effective number, and the Allan deviation with its limits.
fn describe(engine: &Engine<'_>, name: &str, label: &str, column: &Column<'_>) {
    let unit = column.difference_unit();
    let one = Unit::one();
    let mut named = vec![
        ("autocorrelation".to_string(), "r_1".to_string(), format!("autocorrelation of neighbours in {label}"), &one),
        ("effective_number".into(), "n_eff".into(), format!("effective number of {label}"), &one),
    ];
    let lengths: Vec<usize> = allan_points(&column.rows).iter().map(|point| point.length).collect();
    for m in &lengths {
        let over = format!("Allan deviation of {label} over {m} reading{}", if *m == 1 { "" } else { "s" });
        let limit = |which: &str| format!("{which} {} % limit of the {over}", 100.0 * CONFIDENCE);
        named.push((format!("allan_{m}"), format!("σ({m})"), over.clone(), &unit));
        named.push((format!("allan_{m}.low"), format!("σ({m})_low"), limit("lower"), &unit));
        named.push((format!("allan_{m}.high"), format!("σ({m})_high"), limit("upper"), &unit));
    }
    let outputs: Vec<(Dimension, Kind)> = named.iter().map(|(.., unit)| (unit.dimension(), Kind::Plain)).collect();
    let rule = Statistic::new(outputs.len(), |columns| {
        let rows = columns.first().copied().unwrap_or_default();
        let points = allan_points(rows);
        let of_points = points.iter().flat_map(|point| [point.deviation, point.low, point.high]);
        [at_distance(rows, 1), effective_number(rows).0].into_iter().chain(of_points).collect()
    });
    let path = format!("{name}.description");
    let made = engine.builder.estimator(Arc::new(rule), &[column.quantity], &outputs, &path, "description");
    for (index, (quantity, (path, symbol, words, unit))) in made.unwrap_or_default().iter().zip(&named).enumerate() {
        let method = if index < 2 { &METHOD.info } else { &allan_deviation::METHOD.info };
        let _scope = engine.builder.scope("", Some(method));
        quantity.result(path, symbol, words, unit);
    }
}
