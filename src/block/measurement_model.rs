//! A user's own measurement model: a measurand, its inputs, an equation in ordinary arithmetic.

use super::engine::{Block, Engine, shorten};
use super::equation::{Part, Term, names, parse_equation};
use super::field::{Field, Shape, needed, optional};
use super::fields::Fields;
use super::given::Given;
use super::{BlockKind, Output};
use crate::diagnostic::{Code, Complaints, Problem, nearest};
use crate::graph::{
    Distribution, Estimate, Estimator, InputDraft, Origin, Quantity, Value, second_order_uncertainty, sensitivities,
    standard_uncertainty,
};
use crate::intake::Place;
use crate::method::{constants, measurement_model::METHOD, statistic::brief};
use crate::numeric::sum::{dot, mean};
use crate::quantity::{Kind, Unit, parse_number};
use crate::record::{Entry, Node};
use std::collections::BTreeMap;
use std::sync::Arc;

const POOLED_FIELDS: &[Field] = &[
    needed("standard_deviation", Shape::AnyValue, "standard deviation of one reading, known from earlier work"),
    needed("degrees_of_freedom", Shape::Number, "its degrees of freedom"),
];

/// The long form of an input.
const INPUT_FIELDS: &[Field] = &[
    optional("value", Shape::AnyValue, "the value with its uncertainty, or a reference"),
    optional("u", Shape::AnyValue, "its standard uncertainty, when it does not stand with the value"),
    optional("degrees_of_freedom", Shape::Number, "degrees of freedom of the standard uncertainty"),
    optional("label", Shape::Text, "what the quantity is, in words"),
    optional("note", Shape::Text, "a remark"),
    optional("readings", Shape::Numbers, "repeated readings; their mean enters with its scatter"),
    optional("unit", Shape::Text, "the unit of readings, limits and mean"),
    optional("pooled", Shape::Mapping(POOLED_FIELDS), "a known scatter of the readings"),
    optional(
        "distribution",
        Shape::Choice(&["trapezoidal", "rectangular_inexact_limits", "exponential", "gamma"]),
        "a distribution that the short notation has no words for",
    ),
    optional("lower", Shape::Number, "lower limit"),
    optional("upper", Shape::Number, "upper limit"),
    optional("beta", Shape::Number, "width of the top of a trapezoid over that of its base"),
    optional("inexactness", Shape::Number, "how far each limit may be off, ±"),
    optional("mean", Shape::Number, "mean of an exponential distribution"),
    optional("shape", Shape::Number, "shape parameter of a gamma distribution"),
    optional("rate", Shape::Number, "rate parameter of a gamma distribution"),
];

/// A measurement model.
pub static KIND: BlockKind = BlockKind {
    name: "measurement-model",
    meaning: "a measurand computed from inputs by an equation",
    fields: &[
        needed("measurand", Shape::Text, "what is measured, in words"),
        optional("symbol", Shape::Text, "its symbol; what follows an underscore is a subscript"),
        needed("unit", Shape::Text, "the unit it is shown in"),
        needed("inputs", Shape::Inputs(INPUT_FIELDS), "the inputs by name"),
        optional("where", Shape::Equations, "further equations by name, for use in the equation"),
        needed("equation", Shape::Text, "the measurand in ordinary arithmetic"),
        optional(
            "simultaneous",
            Shape::Choice(&["yes", "no"]),
            "whether the readings of all inputs were taken together, so that their means correlate",
        ),
    ],
    outputs: &[
        Output { path: "value", meaning: "the measurand", unit: "" },
        Output { path: "INPUT", meaning: "each input, by its name", unit: "" },
    ],
    check,
    build: |engine, block| {
        let _ = Model { engine: shorten(engine), block }.build();
    },
};

fn check(fields: Fields<'_>, complaints: &mut Complaints) {
    let unit_text = fields.text("unit");
    if let Some(text) = unit_text {
        complaints.keep(Unit::parse(&text.text), text.place);
    }
    if let Some(text) = fields.text("equation") {
        complaints.keep(parse_equation(&text.text), text.place);
    }
    for entry in fields.get("where").and_then(Node::as_map).unwrap_or_default() {
        complaints.keep(parse_equation(entry.value.as_text().unwrap_or_default()), entry.value.place);
    }
}

struct Model<'e> {
    engine: &'e Engine<'e>,
    block: &'e Block,
}

/// A greater ratio of the uncertainties of second and of first order is said.
const FIRST_ORDER_SHORT: f64 = 1.1;

impl<'e> Model<'e> {
    fn build(&self) -> Option<()> {
        let (engine, fields, name) = (self.engine, self.block.fields(), self.block.name());
        let mut known = self.inputs(fields)?;
        let _scope = engine.builder.scope(name, Some(&METHOD.info));
        for entry in fields.get("where").and_then(Node::as_map).unwrap_or_default() {
            let made = self.evaluate(entry.value.as_text()?, entry.value.place, &known)?;
            if known.contains_key(&entry.key.text) {
                let problem = Problem::new(
                    Code::DuplicateName,
                    format!("{} names an input and an equation of {name}.", entry.key.text),
                );
                engine.complain(problem, entry.key.place);
                return None;
            }
            let unit = Unit::parse(&made.dimension().to_string()).unwrap_or_else(|_| Unit::one());
            let made = made.result(&entry.key.text, &entry.key.text, &format!("{} in {name}", entry.key.text), &unit);
            known.insert(entry.key.text.clone(), made);
        }
        let equation = fields.text("equation")?;
        let made = self.evaluate(&equation.text, equation.place, &known)?;
        let unit_text = fields.text("unit")?;
        let unit = engine.keep(Unit::parse(&unit_text.text), unit_text.place)?;
        if made.dimension() != unit.dimension() {
            let message = format!(
                "The equation gives the dimension {}, but the unit of {name} is {}.",
                made.dimension(),
                unit.text_or_one()
            );
            engine.complain(
                Problem::new(Code::DimensionMismatch, message).hint("Check the units of the inputs and the equation."),
                equation.place,
            );
            return None;
        }
        let symbol = fields.text("symbol").map_or_else(|| format!("y_{name}"), |symbol| symbol.text);
        let value = made.alias().result("value", &symbol, &fields.words("measurand"), &unit);
        self.judge_first_order(value, equation.place);
        Some(())
    }

    /// Warns where terms of second order change the uncertainty, as at a point where the slope vanishes.
    fn judge_first_order(&self, value: Quantity<'e>, place: Place) {
        let (first, second) = {
            let graph = self.engine.graph();
            let first = standard_uncertainty(&graph, &sensitivities(&graph, value.id));
            (first, second_order_uncertainty(&graph, value.id))
        };
        let Some(second) = second.filter(|second| *second > FIRST_ORDER_SHORT * first && *second > 0.0) else { return };
        let found = match first {
            0.0 => "every slope vanishes at the estimate, so first order knows no uncertainty".to_string(),
            first => format!("first order reaches {} % of the uncertainty", brief(100.0 * first / second)),
        };
        let message =
            format!("The equation of {} bends within the uncertainty of its inputs: {found}.", self.block.name());
        self.engine.complain(
            Problem::new(Code::FirstOrderShort, message).hint(format!(
                "State the interval of the trials: `budget {}.value --trials 1000000`, or `distribution({}.value)` in the report.",
                self.block.name(),
                self.block.name()
            )),
            place,
        );
    }

    fn inputs(&self, fields: Fields<'_>) -> Option<BTreeMap<String, Quantity<'e>>> {
        let entries = fields.get("inputs")?.as_map()?;
        let mut known = BTreeMap::new();
        let together = fields.words("simultaneous") == "yes";
        if together {
            known = self.simultaneous(entries)?;
        }
        for entry in entries {
            if !known.contains_key(&entry.key.text) {
                known.insert(entry.key.text.clone(), self.input(entry)?);
            }
        }
        Some(known)
    }

    fn input(&self, entry: &Entry) -> Option<Quantity<'e>> {
        let path = format!("{}.{}", self.block.name(), entry.key.text);
        let long = entry.value.as_map().map(|_| Fields { node: &entry.value });
        let label = long.and_then(|long| long.text("label")).map_or_else(|| entry.key.text.clone(), |text| text.text);
        if let Some(long) = long {
            if long.get("readings").is_some() {
                return self.readings(long, &path, &entry.key.text, &label);
            }
            if long.get("distribution").is_some() {
                return self.distributed(long, &path, &entry.key.text, &label);
            }
        }
        let given = self.long_or_short(&entry.value)?;
        self.engine.given(&given, &path, &entry.key.text, &label, Kind::Plain)
    }

    /// A value in short form, or in a mapping whose further fields this kind knows.
    fn long_or_short(&self, node: &Node) -> Option<Given> {
        let Some(entries) = node.as_map() else { return super::given::read_given(node, Kind::Plain, "an input").ok() };
        let kept = entries
            .iter()
            .filter(|entry| ["value", "u", "degrees_of_freedom", "note"].contains(&entry.key.text.as_str()))
            .cloned();
        let node = Node { place: node.place, data: crate::record::NodeData::Map(kept.collect()) };
        match super::given::read_given(&node, Kind::Plain, "an input") {
            Ok(given) => Some(given),
            Err(complaint) => {
                self.engine.complain_all(Complaints { list: vec![*complaint] });
                None
            }
        }
    }

    fn unit_of(&self, long: Fields<'_>) -> Option<Unit> {
        let Some(text) = long.text("unit") else {
            let problem = Problem::new(Code::FieldMissing, "The unit of the readings or limits is missing.");
            self.engine.complain(problem.hint("Write `unit: K`, or `unit: 1` for plain numbers."), long.place());
            return None;
        };
        self.engine.keep(Unit::parse(&text.text), text.place)
    }

    /// A column of readings.
    fn column(&self, long: Fields<'_>, path: &str, symbol: &str, label: &str) -> Option<Quantity<'e>> {
        let unit = self.unit_of(long)?;
        let items = long.get("readings")?.as_list()?;
        let mut rows = Vec::new();
        for item in items {
            rows.push(self.engine.keep(parse_number(item.as_text().unwrap_or_default(), &unit), item.place)?);
        }
        let places = items.iter().map(|item| item.place).collect();
        let draft = InputDraft::new(
            &format!("{path}_readings"),
            symbol,
            &format!("readings of {label}"),
            Kind::Plain,
            unit,
            Value::column(rows),
            Origin::ReadingList(places),
        );
        Some(self.engine.builder.input(draft))
    }

    fn readings(&self, long: Fields<'_>, path: &str, symbol: &str, label: &str) -> Option<Quantity<'e>> {
        let column = self.column(long, path, symbol, label)?;
        let pooled = match long.mapping("pooled") {
            Some(pooled) => Some((self.number_of(pooled, "standard_deviation")?, pooled.number("degrees_of_freedom")?)),
            None => None,
        };
        let mut made = self.means(
            &[(column, path.to_string(), symbol.to_string(), label.to_string())],
            pooled,
            long.place(),
            path,
            label,
        )?;
        made.pop()
    }

    fn number_of(&self, fields: Fields<'_>, name: &str) -> Option<f64> {
        match fields.given(name, Kind::Plain)? {
            Given::Stated { value, .. } => Some(value.value),
            Given::Reference(reference) => self.engine.result(&reference).map(Quantity::number),
        }
    }

    /// The means of readings taken together, as one estimator whose outputs correlate (JCGM 100, 5.2.3 and H.2).
    fn simultaneous(&self, entries: &[Entry]) -> Option<BTreeMap<String, Quantity<'e>>> {
        let name = self.block.name();
        let mut columns = Vec::new();
        for entry in entries {
            let long = Fields { node: &entry.value };
            if long.get("readings").is_some() {
                let label = long.text("label").map_or_else(|| entry.key.text.clone(), |text| text.text);
                let path = format!("{name}.{}", entry.key.text);
                columns.push((self.column(long, &path, &entry.key.text, &label)?, path, entry.key.text.clone(), label));
            }
        }
        let made = self.means(
            &columns,
            None,
            self.block.raw.name.place,
            &format!("{name}.readings"),
            "readings taken together",
        )?;
        Some(columns.iter().map(|(_, _, symbol, _)| symbol.clone()).zip(made).collect())
    }

    fn means(
        &self,
        columns: &[(Quantity<'e>, String, String, String)],
        pooled: Option<(f64, f64)>,
        place: Place,
        path: &str,
        label: &str,
    ) -> Option<Vec<Quantity<'e>>> {
        let builder = &self.engine.builder;
        let rows: Vec<Quantity<'e>> = columns.iter().map(|(column, ..)| *column).collect();
        let outputs: Vec<_> = rows.iter().map(|column| (column.dimension(), Kind::Plain)).collect();
        let rule = MeansTogether { count: rows.len(), pooled };
        let made = self.engine.keep(
            builder.estimator(
                Arc::new(rule),
                &rows,
                &outputs,
                &format!("{path}_scatter"),
                &format!("scatter of {label}"),
            ),
            place,
        )?;
        let _scope = builder.scope("", Some(&crate::method::type_a_mean::METHOD.info));
        let named = made.iter().zip(columns).map(|(mean, (column, path, symbol, label))| {
            let unit =
                self.engine.graph().node(column.id).name.as_ref().map_or_else(Unit::one, |name| name.unit.clone());
            builder.name(
                mean.id,
                crate::graph::Name { path: path.clone(), symbol: symbol.clone(), label: label.clone(), unit },
            );
            *mean
        });
        Some(named.collect())
    }

    /// An input with a distribution beyond the short notation (JCGM 101, table 1).
    fn distributed(&self, long: Fields<'_>, path: &str, symbol: &str, label: &str) -> Option<Quantity<'e>> {
        let unit = self.unit_of(long)?;
        let si = |number: f64| unit.difference_to_si(number);
        let need = |name: &str| {
            let found = long.number(name);
            if found.is_none() {
                let problem = Problem::new(
                    Code::FieldMissing,
                    format!("The distribution {} needs {name}.", long.words("distribution")),
                );
                self.engine.complain(problem.hint(format!("Write `{name}:` with a number.")), long.place());
            }
            found
        };
        let word = long.words("distribution");
        let (value, distribution) = match word.as_str() {
            "exponential" => (si(need("mean")?), Distribution::Exponential { mean: si(need("mean")?) }),
            "gamma" => {
                let (shape, rate) = (need("shape")?, need("rate")? / si(1.0));
                (shape / rate, Distribution::Gamma { shape, rate })
            }
            word => {
                let (lower, upper) = (need("lower")?, need("upper")?);
                let (centre, half_width) = (si((lower + upper) / 2.0), si((upper - lower) / 2.0));
                let distribution = match word {
                    "trapezoidal" => Distribution::Trapezoidal { half_width, beta: need("beta")? },
                    _ => Distribution::RectangularInexact { half_width, inexactness: si(need("inexactness")?) },
                };
                (centre, distribution)
            }
        };
        if !(distribution.standard_uncertainty() > 0.0 && value.is_finite()) {
            let problem = Problem::new(
                Code::NotationUnreadable,
                format!("The parameters of the {word} distribution give no uncertainty above zero."),
            );
            self.engine.complain(problem.hint("Check the order of the limits and the signs."), long.place());
            return None;
        }
        let mut draft =
            InputDraft::new(path, symbol, label, Kind::Plain, unit, Value::Scalar(value), Origin::Stated(long.place()));
        draft.distribution = distribution;
        draft.degrees_of_freedom = long.number("degrees_of_freedom").unwrap_or(f64::INFINITY);
        Some(self.engine.builder.input(draft))
    }

    /// The value of an equation; what does not fit points into it.
    fn evaluate(&self, text: &str, place: Place, known: &BTreeMap<String, Quantity<'e>>) -> Option<Quantity<'e>> {
        let part = self.engine.keep(parse_equation(text), place)?;
        for (name, range) in names(&part) {
            let is_constant = is_constant(&name);
            if !known.contains_key(&name) && !is_constant {
                let problem = Problem::new(
                    Code::UndefinedReference,
                    format!("{name} is no input of {} and no constant.", self.block.name()),
                )
                .range(range.start, range.end);
                let problem = match nearest(&name, known.keys().map(String::as_str)) {
                    Some(near) => problem.hint(format!("Did you mean {near}?")),
                    None => problem
                        .hint(format!("The inputs are {}.", known.keys().cloned().collect::<Vec<_>>().join(", "))),
                };
                self.engine.complain(problem, place);
                return None;
            }
        }
        let made = self.value(&part, place, known);
        made.number().is_finite().then_some(made).or_else(|| {
            if !self.engine.complaints().has_faults() {
                let problem = Problem::new(
                    Code::OutOfValidity,
                    "The equation has no finite value at the estimates of the inputs.",
                );
                self.engine.complain(
                    problem.hint("Look for a division by zero, a root or a logarithm of a negative number."),
                    place,
                );
            }
            None
        })
    }

    fn value(&self, part: &Part, place: Place, known: &BTreeMap<String, Quantity<'e>>) -> Quantity<'e> {
        let of = |inner: &Part| self.value(inner, place, known);
        let made = match &part.term {
            Term::Number(number) => self.engine.builder.number(*number),
            Term::Name(name) => known.get(name).copied().unwrap_or_else(|| self.constant(name)),
            Term::Negative(a) => -of(a),
            Term::Sum(a, b) => of(a) + of(b),
            Term::Difference(a, b) => of(a) - of(b),
            Term::Product(a, b) => of(a) * of(b),
            Term::Ratio(a, b) => of(a) / of(b),
            Term::Power(a, twice) if twice % 2 == 0 => of(a).power(twice / 2),
            Term::Power(a, twice) => of(a).square_root().power(*twice),
            Term::Call(function, a) => call(function, of(a)),
        };
        for problem in self.engine.builder.take_problems() {
            self.engine.complain(problem.range(part.range.start, part.range.end), place);
        }
        made
    }

    fn constant(&self, name: &str) -> Quantity<'e> {
        let builder = &self.engine.builder;
        match name {
            "π" | "pi" => builder.number(std::f64::consts::PI),
            name => constants::known(builder, name),
        }
    }
}

/// Constants made of the defining ones, and π.
fn is_constant(name: &str) -> bool {
    let defining = constants::CONSTANTS.iter().map(|constant| constant.symbol);
    defining
        .chain(constants::DERIVED.iter().map(|derived| derived.symbol))
        .chain(["π", "pi"])
        .any(|constant| constant == name)
}

fn call<'g>(function: &str, x: Quantity<'g>) -> Quantity<'g> {
    match function {
        "sqrt" => x.square_root(),
        "exp" => x.exponential(),
        "ln" => x.logarithm(),
        "log10" => x.logarithm() / std::f64::consts::LN_10,
        "sin" => x.sine(),
        "cos" => x.cosine(),
        "tan" => x.tangent(),
        "asin" => x.arc_sine(),
        "acos" => x.arc_cosine(),
        _ => x.arc_tangent(),
    }
}

/// Means of several columns read together, with their covariance s_ij / n (JCGM 100:2008, 5.2.3, equation 17).
struct MeansTogether {
    count: usize,
    /// Known standard deviation of one reading and its degrees of freedom, for a single column.
    pooled: Option<(f64, f64)>,
}

impl Estimator for MeansTogether {
    fn outputs(&self) -> usize {
        self.count
    }

    fn estimate(&self, columns: &[&[f64]]) -> Result<Estimate, Problem> {
        let length = columns.first().map_or(0, |column| column.len());
        if let Some(other) = columns.iter().find(|column| column.len() != length) {
            let message =
                format!("Readings taken together must be equal in number, found {length} and {}.", other.len());
            return Err(Problem::new(Code::DesignIncomplete, message)
                .hint("Complete the shorter list, or write `simultaneous: no`."));
        }
        if length < 2 && self.pooled.is_none() || length == 0 {
            let message =
                format!("{length} reading has no scatter; a mean with its own uncertainty needs two or more.");
            return Err(Problem::new(Code::DesignIncomplete, message).hint("Give a known scatter as `pooled:`."));
        }
        let means: Vec<f64> = columns.iter().map(|column| mean(column).unwrap_or(f64::NAN)).collect();
        let departures: Vec<Vec<f64>> =
            columns.iter().zip(&means).map(|(column, mean)| column.iter().map(|x| x - mean).collect()).collect();
        let n = length as f64;
        let covariance = |a: &[f64], b: &[f64]| dot(a, b) / ((n - 1.0) * n);
        let own_covariance = match self.pooled {
            Some((s, _)) => vec![vec![s * s / n]],
            None => departures.iter().map(|a| departures.iter().map(|b| covariance(a, b)).collect()).collect(),
        };
        let jacobian = (0..self.count).map(|column| {
            (0..self.count).map(|output| vec![if column == output { 1.0 / n } else { 0.0 }; length]).collect()
        });
        Ok(Estimate {
            values: means,
            jacobian: jacobian.collect(),
            own_covariance,
            degrees_of_freedom: self.pooled.map_or(n - 1.0, |(_, freedom)| freedom),
            decisions: Vec::new(),
            residuals: departures.concat(),
        })
    }
}
