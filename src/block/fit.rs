//! A polynomial through points by least squares.

use super::columns::{COLUMN_FIELDS, Column, read_column};
use super::engine::{Block, Engine, shorten};
use super::field::{Field, Shape, needed, optional};
use super::fields::Fields;
use super::given::Given;
use super::{BlockKind, Output};
use crate::diagnostic::{Code, Complaints, Problem};
use crate::graph::{Decision, NodeId, Quantity, Value};
use crate::intake::Place;
use crate::method::polynomial_fit::{METHOD, PolynomialFit, Quality, Weighting, choose_degree};
use crate::method::statistic::Statistic;
use crate::quantity::{Dimension, Kind, Unit};
use std::sync::Arc;

const SEARCH_FIELDS: &[Field] = &[
    needed("largest", Shape::Number, "the largest degree that is tried"),
    needed("confidence", Shape::Number, "the level of the F tests, such as 0.99"),
];

const PREDICTION_FIELDS: &[Field] = &[
    needed("at", Shape::AnyValue, "the abscissa, with its uncertainty if it has one"),
    optional("label", Shape::Text, "what is predicted, in words"),
];

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
        optional(
            "u",
            Shape::Either(&Shape::Mapping(COLUMN_FIELDS), &Shape::AnyValue),
            "standard uncertainty of the ordinates, a column or one value for all, for a weighted fit",
        ),
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
        Output { path: "residual_deviation", meaning: "standard deviation of the residuals", unit: "" },
        Output { path: "chi_square", meaning: "chi-square of the residuals, where u is absolute", unit: "1" },
        Output { path: "lack_of_fit", meaning: "F of the test of lack of fit, where abscissae repeat", unit: "1" },
    ],
    check,
    build: |engine, block| {
        let _ = build(shorten(engine), block);
    },
};

/// What a fit found beyond its quantities, for the report.
pub struct Fitted {
    pub x: FittedColumn,
    pub y: FittedColumn,
    /// Observed less fitted, in coherent SI units.
    pub residuals: Vec<f64>,
    /// Standard uncertainties of the ordinates, where they were stated.
    pub uncertainties: Option<Vec<f64>>,
    pub quality: Quality,
    pub coefficients: Vec<NodeId>,
    /// The abscissa the powers are counted from.
    pub reference: f64,
    /// How the degree was chosen, and what the tests said.
    pub decisions: Vec<Decision>,
}

/// A column of a fit, without its node.
pub struct FittedColumn {
    pub label: String,
    pub unit: Unit,
    pub rows: Vec<f64>,
}

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
    let largest =
        fields.mapping("search").and_then(|search| Some((search.number("largest")?, search.place_of("largest"))));
    let degree = fields.number("degree").map(|degree| (degree, fields.place_of("degree"))).or(largest);
    if let Some((degree, place)) = degree.filter(|(degree, _)| !whole(*degree)) {
        let problem =
            Problem::new(Code::OutOfRange, format!("The degree {degree} is not a whole number from 1 to 12."));
        complaints.add_at(problem.hint("Take a lower degree, or scale the abscissae."), place);
    }
    if let Some(search) = fields.mapping("search")
        && let Some(confidence) = search.number("confidence").filter(|level| !(0.5..1.0).contains(level))
    {
        let message = format!("The level {confidence} of the F tests does not lie between 0.5 and 1.");
        complaints.add_at(
            Problem::new(Code::OutOfRange, message).hint("Write `confidence: 0.99`."),
            search.place_of("confidence"),
        );
    }
}

/// The columns of a fit, of one length.
struct Points<'e> {
    x: Column<'e>,
    y: Column<'e>,
    uncertainties: Option<Vec<f64>>,
}

fn build<'e>(engine: &'e Engine<'e>, block: &'e Block) -> Option<()> {
    let (fields, name) = (block.fields(), block.name());
    let points = read_points(engine, fields, name)?;
    let (x, y) = (&points.x, &points.y);
    let reference = match fields.get("about") {
        Some(_) => number_like(engine, fields, "about", x, &format!("the abscissae of {name}"))?,
        None => 0.0,
    };
    let place = block.raw.name.place;
    let mut rule = engine.keep(choose_rule(fields, &points, reference), place)?;
    let found = engine.keep(rule.fit(&x.rows, &y.rows), place)?;
    let quality = rule.quality(&found, &x.rows, &y.rows);
    for (what, tested) in [("chi-square", quality.chi_square), ("lack of fit", quality.lack_of_fit)] {
        let words = tested.map(|tested| Decision { what: what.into(), decided: tested.words() });
        rule.decisions.extend(words);
    }
    let outputs: Vec<(Dimension, Kind)> = (0..=rule.degree)
        .map(|k| Some((y.quantity.dimension().over(x.quantity.dimension().power(k as i32)?), Kind::Plain)))
        .collect::<Option<_>>()?;
    let made = engine.builder.estimator(
        Arc::new(rule.clone()),
        &[x.quantity, y.quantity],
        &outputs,
        &format!("{name}.scatter"),
        &format!("scatter of the points of {name}"),
    );
    let made = engine.keep(made, place)?;
    let _scope = engine.builder.scope(name, Some(&METHOD.info));
    let named = made.iter().enumerate().map(|(k, coefficient)| {
        let (unit, label) = (coefficient_unit(&points, k, *coefficient), format!("coefficient of power {k} of {name}"));
        coefficient.result(&format!("c{k}"), &format!("c_{k}"), &label, &unit).id
    });
    let coefficients = named.collect();
    describe(engine, name, &points, &rule, quality);
    predict(engine, fields, name, reference, &points, &made);
    engine.store(
        name,
        Fitted {
            residuals: found.residuals,
            quality,
            reference,
            coefficients,
            decisions: rule.decisions,
            uncertainties: points.uncertainties,
            x: FittedColumn { label: points.x.label, unit: points.x.unit, rows: points.x.rows },
            y: FittedColumn { label: points.y.label, unit: points.y.unit, rows: points.y.rows },
        },
    );
    Some(())
}

fn read_points<'e>(engine: &'e Engine<'e>, fields: Fields<'_>, name: &str) -> Option<Points<'e>> {
    let x = read_column(engine, fields.mapping("x")?, &format!("{name}.x"), "x", &format!("abscissae of {name}"));
    let y = read_column(engine, fields.mapping("y")?, &format!("{name}.y"), "y", &format!("ordinates of {name}"));
    let (x, y) = (x?, y?);
    same_length(engine, (&x.rows, "abscissae"), (&y.rows, "ordinates"), name, fields.place_of("y"))?;
    let owner = format!("the ordinates of {name}");
    let uncertainties = match (fields.get("u"), fields.mapping("u").filter(|u| u.get("value").is_none())) {
        (Some(_), Some(column)) => {
            let label = format!("standard uncertainties of the ordinates of {name}");
            let column = read_column(engine, column, &format!("{name}.u"), "u", &label)?;
            is_difference(engine, &column.unit, "u", fields.place_of("u"))?;
            same_dimension(engine, &column.unit, &y, "u", &owner, fields.place_of("u"))?;
            same_length(
                engine,
                (&y.rows, "ordinates"),
                (&column.rows, "standard uncertainties"),
                name,
                fields.place_of("u"),
            )?;
            Some(column.rows)
        }
        (Some(_), None) => {
            let u = number_like(engine, fields, "u", &y, &owner)?;
            Some(vec![u; y.rows.len()])
        }
        _ => None,
    };
    if let Some(worst) = uncertainties.iter().flatten().find(|u| !(u.is_finite() && **u > 0.0)) {
        let shown = y.difference_unit().difference_from_si(*worst);
        let message = format!(
            "A standard uncertainty of the ordinates of {name} is {shown} {}; a weight needs one above zero.",
            y.difference_unit().text()
        );
        let problem = Problem::new(Code::OutOfRange, message);
        engine.complain(
            problem.hint("State what is known of the ordinate, or leave the point out."),
            fields.place_of("u"),
        );
        return None;
    }
    Some(Points { x, y, uncertainties })
}

fn same_length(
    engine: &Engine,
    (first, first_words): (&[f64], &str),
    (second, second_words): (&[f64], &str),
    name: &str,
    place: Place,
) -> Option<()> {
    if first.len() == second.len() {
        return Some(());
    }
    let message = format!("{name} has {} {first_words}, but {} {second_words}.", first.len(), second.len());
    engine.complain(Problem::new(Code::DesignIncomplete, message).hint("Each point needs both."), place);
    None
}

fn same_dimension(
    engine: &Engine,
    unit: &Unit,
    column: &Column<'_>,
    field: &str,
    owner: &str,
    place: Place,
) -> Option<()> {
    if unit.dimension() == column.quantity.dimension() {
        return Some(());
    }
    let message = format!(
        "The field {field} is given in {}, but {owner} are in {}.",
        unit.text_or_one(),
        column.unit.text_or_one()
    );
    engine.complain(
        Problem::new(Code::DimensionMismatch, message)
            .hint("Correct the value and its unit, or the unit of the column."),
        place,
    );
    None
}

/// An uncertainty in °C would be counted from the wrong zero.
fn is_difference(engine: &Engine, unit: &Unit, field: &str, place: Place) -> Option<()> {
    if !unit.is_celsius() {
        return Some(());
    }
    let message = format!("The field {field} is given in °C, but an uncertainty is a difference of temperatures.");
    engine.complain(Problem::new(Code::KindMismatch, message).hint("Write it in K."), place);
    None
}

/// A number of the dimension of a column, in coherent SI units.
fn number_like(engine: &Engine<'_>, fields: Fields<'_>, field: &str, column: &Column<'_>, owner: &str) -> Option<f64> {
    let place = fields.place_of(field);
    match fields.given(field, Kind::Plain)? {
        Given::Stated { value, .. } => {
            if field == "u" {
                is_difference(engine, &value.unit, field, place)?;
            }
            same_dimension(engine, &value.unit, column, field, owner, place)?;
            Some(value.value)
        }
        Given::Reference(reference) => {
            let found = engine.result(&reference)?;
            let unit = Unit::parse(&found.dimension().to_string()).unwrap_or_else(|_| Unit::one());
            same_dimension(engine, &unit, column, field, owner, place)?;
            Some(found.number())
        }
    }
}

fn choose_rule(fields: Fields<'_>, points: &Points<'_>, reference: f64) -> Result<PolynomialFit, Problem> {
    let weighting = match (&points.uncertainties, fields.words("u_is").as_str()) {
        (Some(list), "absolute") => Weighting::Absolute(list.as_slice().into()),
        (Some(list), _) => Weighting::Relative(list.as_slice().into()),
        _ => Weighting::Equal,
    };
    let degree = fields.number("degree").unwrap_or(1.0) as usize;
    let rule = PolynomialFit { degree, reference, weighting, decisions: Vec::new() };
    let search = fields.mapping("search");
    match search.and_then(|search| Some((search.number("largest")? as usize, search.number("confidence")?))) {
        Some((largest, confidence)) => choose_degree(&rule, &points.x.rows, &points.y.rows, largest, confidence),
        None => Ok(rule),
    }
}

/// A unit for the coefficient of a power, from those of the columns where they can be joined.
fn coefficient_unit(points: &Points<'_>, power: usize, coefficient: Quantity<'_>) -> Unit {
    let coherent = || Unit::parse(&coefficient.dimension().to_string()).unwrap_or_else(|_| Unit::one());
    if power == 0 {
        return points.y.unit.clone();
    }
    let (y, x) = (points.y.difference_unit(), points.x.difference_unit());
    if x.is_one() {
        return y;
    }
    if x.text() == y.text() && power == 1 {
        return Unit::one();
    }
    let exponent = if power == 1 { String::new() } else { power.to_string() };
    let top = if y.is_one() { String::new() } else { y.text() };
    let joined = Unit::parse(&format!("{top}/{}{exponent}", x.text())).ok();
    joined.filter(|unit| unit.dimension() == coefficient.dimension()).unwrap_or_else(coherent)
}

/// The numbers that say how well the polynomial fits.
fn describe(engine: &Engine<'_>, name: &str, points: &Points<'_>, rule: &PolynomialFit, quality: Quality) {
    let (number, own) = ((Dimension::ONE, Kind::Plain), (points.y.quantity.dimension(), Kind::Plain));
    let named = [
        ("residual_deviation", "s", "standard deviation of the residuals", own),
        ("chi_square", "χ²", "chi-square of the residuals", number),
        ("lack_of_fit", "F", "F of the lack of fit", number),
    ];
    let known: Vec<usize> = (0..named.len()).filter(|index| quality.numbers()[*index].is_finite()).collect();
    let outputs: Vec<(Dimension, Kind)> = known.iter().map(|index| named[*index].3).collect();
    let uncertainties = known.iter().map(|index| if *index == 0 { quality.deviation_uncertainty } else { 0.0 });
    let (again, wanted) = (rule.clone(), known.clone());
    let statistic = Statistic::new(known.len(), move |columns| {
        let [x, y] = columns else { return vec![f64::NAN; wanted.len()] };
        let numbers = again.fit(x, y).map(|found| again.quality(&found, x, y).numbers());
        wanted.iter().map(|index| numbers.as_ref().map_or(f64::NAN, |numbers| numbers[*index])).collect()
    });
    let statistic = Arc::new(statistic.with_uncertainties(uncertainties.collect()));
    let columns = [points.x.quantity, points.y.quantity];
    let path = format!("{name}.description");
    let made = engine.builder.estimator(statistic, &columns, &outputs, &path, "limited number of points");
    for (quantity, index) in made.unwrap_or_default().iter().zip(known) {
        let (path, symbol, words, output) = named[index];
        let unit = if output == own && index == 0 { points.y.difference_unit() } else { Unit::one() };
        quantity.result(path, symbol, &format!("{words} of {name}"), &unit);
    }
}

/// The polynomial where it is asked for, by Horner's rule on the jointly estimated coefficients.
fn predict<'e>(
    engine: &'e Engine<'e>,
    fields: Fields<'_>,
    name: &str,
    reference: f64,
    points: &Points<'e>,
    coefficients: &[Quantity<'e>],
) {
    let x = &points.x;
    for (index, prediction) in fields.mappings("predictions").into_iter().enumerate() {
        let number = index + 1;
        let words = prediction.words("at");
        let label = prediction.text("label").map_or_else(|| format!("{name} at {words}"), |text| text.text);
        let place = prediction.place_of("at");
        let path = format!("{name}.abscissa_{number}");
        let Some(given) = prediction.given("at", Kind::Plain) else { continue };
        let symbol = format!("x_{number}");
        let Some(at) = engine.given(&given, &path, &symbol, &format!("abscissa of {label}"), Kind::Plain) else {
            continue;
        };
        let unit = Unit::parse(&at.dimension().to_string()).unwrap_or_else(|_| Unit::one());
        let unit = if let Given::Stated { value, .. } = &given { value.unit.clone() } else { unit };
        if same_dimension(engine, &unit, x, "at", &format!("the abscissae of {name}"), place).is_none() {
            continue;
        }
        warn_outside(engine, name, x, at.number(), place);
        let step = at.as_kind(Kind::Plain)
            - engine.builder.exact(Value::Scalar(reference), x.quantity.dimension(), Kind::Plain);
        let value = coefficients.iter().rev().copied().reduce(|sum, next| sum * step + next);
        if let Some(value) = value {
            value.alias().result(&format!("at_{number}"), &format!("y_{number}"), &label, &points.y.unit);
        }
    }
}

/// Points say nothing about what lies beyond them.
fn warn_outside(engine: &Engine, name: &str, x: &Column<'_>, at: f64, place: Place) {
    let low = x.rows.iter().copied().fold(f64::INFINITY, f64::min);
    let high = x.rows.iter().copied().fold(f64::NEG_INFINITY, f64::max);
    if (low..=high).contains(&at) {
        return;
    }
    let shown = |value: f64| {
        let text = x.unit.decimal_from_si(value).map_or_else(|| value.to_string(), |decimal| decimal.plain_text());
        if text.contains('.') { text.trim_end_matches('0').trim_end_matches('.').to_string() } else { text }
    };
    let message = format!(
        "{name} is asked for at {}, but its points reach only from {} to {} {}.",
        shown(at),
        shown(low),
        shown(high),
        x.unit.text_or_one()
    );
    let hint = "Take points on both sides, or say in the record why the polynomial holds there too.";
    engine.complain(Problem::new(Code::Extrapolated, message).hint(hint), place);
}
