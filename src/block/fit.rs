//! A polynomial through points by least squares.

use super::columns::{COLUMN_FIELDS, read_column};
use super::engine::{Block, Engine};
use super::field::{Field, Shape, needed, optional};
use super::fields::Fields;
use super::given::Given;
use super::{BlockKind, Output};
use crate::diagnostic::{Code, Complaints, Problem};
use crate::graph::{Decision, Quantity};
use crate::method::polynomial_fit::{METHOD, PolynomialFit, Weighting, choose_degree};
use crate::quantity::{Dimension, Kind, Unit};
use std::sync::Arc;

const SEARCH_FIELDS: &[Field] = &[
    needed("largest", Shape::Number, "the largest degree that is tried"),
    needed("confidence", Shape::Number, "the level of the F tests, such as 0.99"),
];

const PREDICTION_FIELDS: &[Field] =
    &[needed("at", Shape::AnyValue, "the abscissa"), optional("label", Shape::Text, "what is predicted, in words")];

/// A fit.
pub static KIND: BlockKind = BlockKind {
    name: "fit",
    meaning: "a straight line or polynomial through points by least squares",
    fields: &[
        needed("x", Shape::Mapping(COLUMN_FIELDS), "the abscissae"),
        needed("y", Shape::Mapping(COLUMN_FIELDS), "the ordinates"),
        optional("degree", Shape::Number, "the degree of the polynomial"),
        optional("search", Shape::Mapping(SEARCH_FIELDS), "choose the degree by F tests instead"),
        optional("about", Shape::AnyValue, "the abscissa the powers are counted from; zero unless written"),
        optional("u", Shape::AnyValue, "standard uncertainty of one ordinate, for a weighted fit"),
        optional(
            "u_is",
            Shape::Choice(&["absolute", "relative"]),
            "whether that uncertainty stands as it is, or up to a factor",
        ),
        optional("predictions", Shape::Mappings(PREDICTION_FIELDS), "abscissae at which the polynomial is wanted"),
    ],
    outputs: &[
        Output { path: "c0", meaning: "ordinate at the abscissa the powers are counted from", unit: "" },
        Output { path: "c1, c2, …", meaning: "coefficients of the powers, jointly estimated", unit: "" },
        Output { path: "at_1, at_2, …", meaning: "the polynomial at the abscissae asked for", unit: "" },
    ],
    check,
    build: |engine, block| {
        let _ = build(shorten(engine), block);
    },
};

fn check(fields: Fields<'_>, complaints: &mut Complaints) {
    if fields.get("degree").is_some() == fields.get("search").is_some() {
        let problem = Problem::new(Code::FieldMissing, "A fit needs either degree or search.");
        complaints.add_at(problem.hint("Write `degree: 1` for a straight line."), fields.place());
    }
    if fields.get("u").is_some() != fields.get("u_is").is_some() {
        let problem = Problem::new(Code::FieldMissing, "A weighted fit needs u together with u_is.");
        complaints.add_at(
            problem.hint("Write `u_is: absolute` when u is known as it stands, `relative` when only up to a factor."),
            fields.place(),
        );
    }
    let whole = |number: f64| number.fract() == 0.0 && (1.0..=12.0).contains(&number);
    let degree = fields.number("degree").or_else(|| fields.mapping("search")?.number("largest"));
    if let Some(degree) = degree.filter(|degree| !whole(*degree)) {
        let problem =
            Problem::new(Code::OutOfRange, format!("The degree {degree} is not a whole number from 1 to 12."));
        complaints.add_at(problem.hint("Take a lower degree, or scale the abscissae."), fields.place_of("degree"));
    }
}

/// A scalar in coherent SI units, scale temperatures in kelvin.
fn scalar(engine: &Engine<'_>, fields: Fields<'_>, name: &str) -> Option<f64> {
    match fields.given(name, Kind::Plain)? {
        Given::Stated { value, .. } => Some(value.value),
        Given::Reference(reference) => engine.result(&reference).map(Quantity::number),
    }
}

fn build<'e>(engine: &'e Engine<'e>, block: &'e Block) -> Option<()> {
    let (fields, name) = (block.fields(), block.name());
    let x = read_column(engine, fields.mapping("x")?, &format!("{name}.x"), "x", &format!("abscissae of {name}"))?;
    let y = read_column(engine, fields.mapping("y")?, &format!("{name}.y"), "y", &format!("ordinates of {name}"))?;
    let reference = scalar(engine, fields, "about").unwrap_or(0.0);
    let weighting = match (scalar(engine, fields, "u"), fields.words("u_is").as_str()) {
        (Some(u), "absolute") => Weighting::Absolute(vec![u; y.rows().len()].into()),
        (Some(u), _) => Weighting::Relative(vec![u; y.rows().len()].into()),
        _ => Weighting::Equal,
    };
    let degree = fields.number("degree").unwrap_or(1.0) as usize;
    let mut rule = PolynomialFit { degree, reference, weighting, decisions: Vec::new() };
    let place = block.raw.name.place;
    if let Some(search) = fields.mapping("search") {
        let (largest, confidence) = (search.number("largest")? as usize, search.number("confidence")?);
        rule = engine.keep(choose_degree(&rule, &x.rows(), &y.rows(), largest, confidence), place)?;
    }
    note_tests(&mut rule, &x.rows(), &y.rows());
    let dimensions = (0..=rule.degree).map(|k| Some((y.dimension().over(x.dimension().power(k as i32)?), Kind::Plain)));
    let outputs: Vec<(Dimension, Kind)> = dimensions.collect::<Option<_>>()?;
    let made = engine.builder.estimator(
        Arc::new(rule),
        &[x, y],
        &outputs,
        &format!("{name}.scatter"),
        &format!("scatter of the points of {name}"),
    );
    let made = engine.keep(made, place)?;
    let _scope = engine.builder.scope(name, Some(&METHOD.info));
    for (k, coefficient) in made.iter().enumerate() {
        let unit = Unit::parse(&coefficient.dimension().to_string()).unwrap_or_else(|_| Unit::one());
        coefficient.result(&format!("c{k}"), &format!("c_{k}"), &format!("coefficient of power {k} of {name}"), &unit);
    }
    predict(engine, fields, name, reference, x, &made)
}

/// The polynomial where it is asked for, by Horner's rule on the jointly estimated coefficients.
fn predict<'e>(
    engine: &'e Engine<'e>,
    fields: Fields<'_>,
    name: &str,
    reference: f64,
    x: Quantity<'e>,
    coefficients: &[Quantity<'e>],
) -> Option<()> {
    for (index, prediction) in fields.mappings("predictions").into_iter().enumerate() {
        let at = scalar(engine, prediction, "at")?;
        let step = engine.builder.exact(crate::graph::Value::Scalar(at - reference), x.dimension(), Kind::Plain);
        let value = coefficients.iter().rev().copied().reduce(|sum, next| sum * step + next)?;
        let unit = Unit::parse(&value.dimension().to_string()).unwrap_or_else(|_| Unit::one());
        let label =
            prediction.text("label").map_or_else(|| format!("{name} at {}", prediction.words("at")), |text| text.text);
        value.alias().result(&format!("at_{}", index + 1), &format!("y_{}", index + 1), &label, &unit);
    }
    Some(())
}

/// Adds what the tests of the fit say.
fn note_tests(rule: &mut PolynomialFit, x: &[f64], y: &[f64]) {
    let Ok(found) = rule.fit(x, y) else { return };
    let tests = [("chi-square", rule.chi_square(&found)), ("lack of fit", rule.lack_of_fit(&found, x, y))];
    for (what, tested) in tests {
        if let Some(tested) = tested {
            rule.decisions.push(Decision { what: what.into(), decided: tested.words() });
        }
    }
}

fn shorten<'e>(engine: &'e Engine<'_>) -> &'e Engine<'e> {
    engine
}
