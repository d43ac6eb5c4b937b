//! Expressions in double braces: what an author asks for, and what stands there.
//!
//! minijinja evaluates the expression with strict undefined values into a request; the request is then answered
//! from the graph. A name that leads nowhere, or a result that could not be computed, leaves a marked gap.

use super::figures::Figure;
use super::markup::Markup;
use super::parts;
use super::prose::Inserted;
use crate::block::Engine;
use crate::diagnostic::{Code, Problem, nearest};
use crate::graph::NodeId;
use crate::intake::Place;
use crate::quantity::{Kind, Unit};
use crate::record::Text;
use minijinja::value::{Object, Rest, ValueKind};
use minijinja::{Environment, ErrorKind, UndefinedBehavior, Value};
use std::collections::BTreeMap;
use std::sync::Arc;

/// A path such as `W1.air.density`, not yet looked up.
#[derive(Debug)]
struct PathValue(String);

impl Object for PathValue {
    fn get_value(self: &Arc<Self>, key: &Value) -> Option<Value> {
        Some(Value::from_object(PathValue(format!("{}.{}", self.0, key.as_str()?))))
    }

    fn render(self: &Arc<Self>, _: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        // A path inside a larger expression has no text of its own.
        Err(std::fmt::Error)
    }
}

/// A call of a report function, not yet answered.
#[derive(Debug)]
struct CallValue {
    function: &'static str,
    arguments: Vec<Argument>,
}

impl Object for CallValue {
    fn render(self: &Arc<Self>, _: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        Err(std::fmt::Error)
    }
}

/// An argument of a report function.
#[derive(Debug, Clone, PartialEq)]
pub enum Argument {
    Path(String),
    Text(String),
}

/// What an expression asks for.
#[derive(Debug, Clone, PartialEq)]
pub enum Request {
    Path(String),
    Call(&'static str, Vec<Argument>),
    Text(String),
}

/// What a function of reports does with its arguments.
struct Function {
    name: &'static str,
    /// The arguments in words, for messages.
    usage: &'static str,
    answer: fn(&Engine, &Asked<'_>) -> Result<Inserted, Problem>,
}

/// The arguments of a call, and the results of the report.
struct Asked<'a> {
    arguments: &'a [Argument],
    results: &'a [NodeId],
}

/// Every function of reports, in order of name.
static FUNCTIONS: &[Function] = &[
    Function { name: "allan", usage: "allan(S1)", answer: allan },
    Function { name: "analysis", usage: "analysis(V1)", answer: analysis },
    Function {
        name: "assumptions",
        usage: "assumptions()",
        answer: |engine, _| block(parts::statements::assumptions_list(engine)),
    },
    Function {
        name: "budget",
        usage: "budget(W1.mass)",
        answer: |engine, asked| block(parts::budget::budget_table(engine, asked.quantity(engine)?)),
    },
    Function { name: "chart", usage: "chart(W1)", answer: chart },
    Function { name: "conditions", usage: "conditions(A1)", answer: conditions },
    Function { name: "consistency", usage: "consistency(R1)", answer: consistency },
    Function {
        name: "constants",
        usage: "constants()",
        answer: |engine, asked| block(parts::constants::constants_table(engine, asked.results)),
    },
    Function {
        name: "contents",
        usage: "contents(C1)",
        answer: |engine, asked| part_of(engine, asked, &["realization"], parts::contents::contents_table),
    },
    Function {
        name: "corrections",
        usage: "corrections(D1)",
        answer: |engine, asked| part_of(engine, asked, &["determination"], parts::phases::corrections_table),
    },
    Function { name: "correlation", usage: "correlation(W1.mass, W2.mass)", answer: correlation },
    Function {
        name: "current",
        usage: "current(WP1)",
        answer: |engine, asked| part_of(engine, asked, &["weighing-phase"], parts::phases::current_charts),
    },
    Function {
        name: "determinations",
        usage: "determinations(C1)",
        answer: |engine, asked| part_of(engine, asked, &["realization"], parts::campaign::determinations_table),
    },
    Function {
        name: "deviation",
        usage: "deviation(W1.mass, \"mg\")",
        answer: |engine, asked| deviation(engine, asked, false),
    },
    Function {
        name: "distribution",
        usage: "distribution(W1.mass)",
        answer: |engine, asked| block(parts::distribution::distribution_part(engine, asked.quantity(engine)?)?),
    },
    Function {
        name: "drifts",
        usage: "drifts(C1)",
        answer: |engine, asked| part_of(engine, asked, &["realization"], parts::campaign::drifts_table),
    },
    Function {
        name: "excluded",
        usage: "excluded()",
        answer: |engine, _| block(parts::excluded::excluded_table(engine)),
    },
    Function {
        name: "expanded",
        usage: "expanded(W1.mass)",
        answer: |engine, asked| inline(&asked.figure(engine)?.expanded()),
    },
    Function {
        name: "expanded_deviation",
        usage: "expanded_deviation(W1.mass, \"mg\")",
        answer: |engine, asked| deviation(engine, asked, true),
    },
    Function {
        name: "expanded_uncertainty",
        usage: "expanded_uncertainty(W1.mass)",
        answer: |engine, asked| inline(&asked.figure(engine)?.expanded_uncertainty()),
    },
    Function {
        name: "gravity",
        usage: "gravity(WP1)",
        answer: |engine, asked| gravity_part(engine, asked, parts::gravity::gravity_table),
    },
    Function {
        name: "gravity_charts",
        usage: "gravity_charts(WP1)",
        answer: |engine, asked| gravity_part(engine, asked, parts::gravity::gravity_charts),
    },
    Function {
        name: "profile",
        usage: "profile(MP1)",
        answer: |engine, asked| part_of(engine, asked, &["moving-phase"], parts::phases::profile_charts),
    },
    Function { name: "protocol", usage: "protocol(C1)", answer: protocol },
    Function { name: "readings", usage: "readings(W1)", answer: readings },
    Function { name: "relative_budget", usage: "relative_budget(C1.mass)", answer: relative_budget },
    Function { name: "residuals", usage: "residuals(F1)", answer: residuals },
    Function {
        name: "results",
        usage: "results()",
        answer: |engine, asked| block(parts::results::results_table(engine, asked.results)),
    },
    Function { name: "series", usage: "series(W1)", answer: series },
    Function {
        name: "shares",
        usage: "shares(W1.mass)",
        answer: |engine, asked| block(parts::shares::shares_chart(engine, asked.quantity(engine)?)),
    },
    Function {
        name: "traceability",
        usage: "traceability()",
        answer: |engine, _| block(parts::traceability::traceability_table(engine)),
    },
    Function {
        name: "trail",
        usage: "trail(W1.mass)",
        answer: |engine, asked| block(parts::trail::trail_table(engine, asked.quantity(engine)?)),
    },
    Function { name: "uncertainty_statement", usage: "uncertainty_statement(W1.mass)", answer: statement },
];

/// Evaluates expressions into requests.
pub struct Evaluator {
    environment: Environment<'static>,
    names: BTreeMap<String, Value>,
}

/// How much work one expression may cause.
const FUEL: u64 = 20_000;

impl Evaluator {
    /// An evaluator that knows the names of all blocks.
    pub fn new(engine: &Engine) -> Evaluator {
        let mut environment = Environment::new();
        environment.set_undefined_behavior(UndefinedBehavior::Strict);
        environment.set_fuel(Some(FUEL));
        for function in FUNCTIONS {
            let name = function.name;
            environment.add_function(name, move |arguments: Rest<Value>| -> Result<Value, minijinja::Error> {
                let arguments = arguments.0.iter().map(argument).collect::<Result<_, _>>()?;
                Ok(Value::from_object(CallValue { function: name, arguments }))
            });
        }
        let names =
            engine.blocks().keys().map(|name| (name.clone(), Value::from_object(PathValue(name.clone())))).collect();
        Evaluator { environment, names }
    }

    /// What an expression asks for.
    ///
    /// # Errors
    /// `figure_missing` for a name that leads nowhere, `template_faulty` for what cannot be evaluated.
    pub fn request(&self, text: &str) -> Result<Request, Problem> {
        let faulty = |error: &minijinja::Error| self.faulty(text, error);
        let expression = self.environment.compile_expression(text).map_err(|error| faulty(&error))?;
        let unknown = expression.undeclared_variables(false).into_iter().find(|name| !self.is_known(name));
        if let Some(name) = unknown {
            return Err(self.unknown(&name));
        }
        let value = expression.eval(&self.names).map_err(|error| faulty(&error))?;
        if let Some(path) = value.downcast_object_ref::<PathValue>() {
            return Ok(Request::Path(path.0.clone()));
        }
        if let Some(call) = value.downcast_object_ref::<CallValue>() {
            return Ok(Request::Call(call.function, call.arguments.clone()));
        }
        match value.kind() {
            ValueKind::String => Ok(Request::Text(value.as_str().unwrap_or_default().into())),
            ValueKind::Number if value.is_integer() => Ok(Request::Text(value.to_string())),
            other => {
                let problem = Problem::new(
                    Code::TemplateFaulty,
                    format!("The expression {text} gives a {other}, which cannot be printed."),
                );
                Err(problem.hint("Cite a result such as `W1.mass`, or call a function such as `expanded(W1.mass)`."))
            }
        }
    }

    fn is_known(&self, name: &str) -> bool {
        self.names.contains_key(name) || FUNCTIONS.iter().any(|function| function.name == name)
    }

    fn unknown(&self, name: &str) -> Problem {
        let problem = Problem::new(
            Code::FigureMissing,
            format!("The report cites {name}, but no block and no function has that name."),
        );
        let known = self.names.keys().map(String::as_str).chain(FUNCTIONS.iter().map(|function| function.name));
        match nearest(name, known) {
            Some(near) => problem.hint(format!("Did you mean {near}?")),
            None => problem,
        }
    }

    fn faulty(&self, text: &str, error: &minijinja::Error) -> Problem {
        let reason = match error.kind() {
            ErrorKind::SyntaxError => "it is not written as an expression",
            ErrorKind::BadSerialization | ErrorKind::WriteFailure => {
                "a result cannot be joined with text inside an expression"
            }
            ErrorKind::OutOfFuel => "it takes too much work",
            _ => error.detail().unwrap_or("it has no value"),
        };
        let problem =
            Problem::new(Code::TemplateFaulty, format!("The expression {text} cannot be evaluated: {reason}."));
        problem.hint(format!(
            "Functions of reports: {}.",
            FUNCTIONS.iter().map(|function| function.usage).collect::<Vec<_>>().join(", ")
        ))
    }
}

fn argument(value: &Value) -> Result<Argument, minijinja::Error> {
    if let Some(path) = value.downcast_object_ref::<PathValue>() {
        return Ok(Argument::Path(path.0.clone()));
    }
    match value.as_str() {
        Some(text) => Ok(Argument::Text(text.into())),
        None => Err(minijinja::Error::new(
            ErrorKind::InvalidOperation,
            "arguments are results such as W1.mass, block names, or texts in quotes",
        )),
    }
}

/// Particulars of a quantity that can be asked for behind its path.
const PARTICULARS: &[&str] = &["u", "k", "U", "label", "symbol"];

/// Builds what a request needs; complaints about it are filed at `place`.
pub fn prepare(engine: &Engine, request: &Request, place: Place) {
    let paths: Vec<&String> = match request {
        Request::Path(path) => vec![path],
        Request::Call(_, arguments) => arguments
            .iter()
            .filter_map(|argument| if let Argument::Path(path) = argument { Some(path) } else { None })
            .collect(),
        Request::Text(_) => Vec::new(),
    };
    for path in paths {
        engine.build(path.split('.').next().unwrap_or_default(), place);
    }
}

/// The block that a request fails on although its name is right: its cause was complained of already.
pub fn failed_block(engine: &Engine, request: &Request) -> Option<String> {
    let paths: Vec<&str> = match request {
        Request::Path(path) => vec![path],
        Request::Call(_, arguments) => arguments.iter().filter_map(Argument::path).collect(),
        Request::Text(_) => Vec::new(),
    };
    let name = |path: &&str| path.split('.').next().unwrap_or_default().to_string();
    paths.iter().map(name).find(|name| engine.has_failed(name))
}

impl Argument {
    fn path(&self) -> Option<&str> {
        match self {
            Argument::Path(path) => Some(path),
            Argument::Text(_) => None,
        }
    }
}

/// What stands in place of a request.
///
/// # Errors
/// `figure_missing` when the result is not there; `template_faulty` for wrong arguments.
pub fn answer(engine: &Engine, request: &Request, results: &[NodeId]) -> Result<Inserted, Problem> {
    match request {
        Request::Text(text) => inline(text),
        Request::Path(path) => particular(engine, path),
        Request::Call(name, arguments) => {
            let asked = Asked { arguments, results };
            match FUNCTIONS.iter().find(|function| function.name == *name) {
                Some(function) => {
                    (function.answer)(engine, &asked).map_err(|problem| problem.hint_once(function.usage))
                }
                None => Err(Problem::new(Code::TemplateFaulty, format!("No function is called {name}."))),
            }
        }
    }
}

impl Problem {
    fn hint_once(mut self, usage: &str) -> Problem {
        if self.code == Code::TemplateFaulty && self.hints.is_empty() {
            self.hints.push(format!("It is used as {usage}."));
        }
        self
    }
}

/// A marked gap for what cannot be shown yet.
pub fn gap(text: &str) -> Inserted {
    let mut markup = Markup::code("#gap(");
    markup.push_string(text).push_code(");");
    Inserted { markup, block: false }
}

fn inline(text: &str) -> Result<Inserted, Problem> {
    Ok(Inserted { markup: Markup::text(text), block: false })
}

fn block(markup: Markup) -> Result<Inserted, Problem> {
    Ok(Inserted { markup, block: true })
}

fn particular(engine: &Engine, path: &str) -> Result<Inserted, Problem> {
    if let Some((quantity, particular)) = path.rsplit_once('.')
        && PARTICULARS.contains(&particular)
        && engine.graph().find(path).is_none()
    {
        let figure = figure_at(engine, quantity)?;
        return inline(&match particular {
            "u" => figure.standard_uncertainty(),
            "U" => figure.expanded_uncertainty(),
            "k" => figure.factor(),
            "symbol" => figure.symbol.clone(),
            _ => figure.label.clone(),
        });
    }
    inline(&figure_at(engine, path)?.standard())
}

fn node_at(engine: &Engine, path: &str) -> Result<NodeId, Problem> {
    let found = engine.graph().find(path);
    let finite = |id: &NodeId| engine.graph().value(*id).is_finite();
    found.filter(finite).ok_or_else(|| missing(engine, path))
}

fn figure_at(engine: &Engine, path: &str) -> Result<Figure, Problem> {
    let id = node_at(engine, path)?;
    Figure::of(engine, id).ok_or_else(|| {
        Problem::new(Code::FigureMissing, format!("{path} is a column of values and cannot be printed as one number."))
            .hint("Cite its mean over a comparison, such as `W1.air.temperature`, or show it with `chart(A1)`.")
    })
}

fn missing(engine: &Engine, path: &str) -> Problem {
    let name = path.split('.').next().unwrap_or_default();
    let prefix = format!("{name}.");
    let graph = engine.graph();
    let outputs: Vec<&str> =
        graph.names.keys().filter(|known| known.starts_with(&prefix)).map(String::as_str).collect();
    let problem = Problem::new(Code::FigureMissing, format!("The report cites {path}, but there is no such result."));
    match nearest(path, outputs.iter().copied()) {
        Some(near) => problem.hint(format!("Did you mean {near}?")),
        None if outputs.is_empty() => problem.hint(format!("{name} could not be computed; see the other complaints.")),
        None => problem.hint(format!("{name} gives {}.", outputs.join(", "))),
    }
}

impl Asked<'_> {
    fn path(&self) -> Result<&str, Problem> {
        match self.arguments.first() {
            Some(Argument::Path(path)) => Ok(path),
            _ => Err(Problem::new(
                Code::TemplateFaulty,
                "This function needs a result or a block as its first argument.",
            )),
        }
    }

    fn quantity(&self, engine: &Engine) -> Result<NodeId, Problem> {
        node_at(engine, self.path()?)
    }

    fn figure(&self, engine: &Engine) -> Result<Figure, Problem> {
        figure_at(engine, self.path()?)
    }

    /// The name of a block of some kind.
    fn block_of(&self, engine: &Engine, kinds: &[&str]) -> Result<String, Problem> {
        let path = self.path()?;
        match engine.blocks().get(path) {
            Some(found) if kinds.contains(&found.kind.name) => Ok(path.to_string()),
            Some(found) => Err(Problem::new(
                Code::TemplateFaulty,
                format!("{path} is of the kind {}, but {} is expected here.", found.kind.name, kinds.join(" or ")),
            )),
            None => Err(Problem::new(
                Code::TemplateFaulty,
                format!("{path} is no block; {} is expected here.", kinds.join(" or ")),
            )),
        }
    }
}

fn uncomputed(name: &str) -> Problem {
    Problem::new(Code::FigureMissing, format!("{name} could not be computed, so there is nothing to show."))
        .hint("See the other complaints.")
}

fn readings(engine: &Engine, asked: &Asked<'_>) -> Result<Inserted, Problem> {
    let name = asked.block_of(engine, &["comparison"])?;
    engine.weighing(&name).ok_or_else(|| uncomputed(&name))?;
    block(parts::readings::readings_table(engine, &name))
}

fn series(engine: &Engine, asked: &Asked<'_>) -> Result<Inserted, Problem> {
    let name = asked.block_of(engine, &["comparison"])?;
    engine.weighing(&name).ok_or_else(|| uncomputed(&name))?;
    block(parts::readings::series_table(engine, &name))
}

fn residuals(engine: &Engine, asked: &Asked<'_>) -> Result<Inserted, Problem> {
    let name = asked.block_of(engine, &["fit"])?;
    let fit = engine.found(&name).ok_or_else(|| uncomputed(&name))?;
    block(parts::fit::residuals_part(engine, &name, &fit))
}

fn allan(engine: &Engine, asked: &Asked<'_>) -> Result<Inserted, Problem> {
    let name = asked.block_of(engine, &["series-in-time"])?;
    let series = engine.found(&name).ok_or_else(|| uncomputed(&name))?;
    block(parts::allan::allan_part(engine, &name, &series))
}

fn analysis(engine: &Engine, asked: &Asked<'_>) -> Result<Inserted, Problem> {
    let name = asked.block_of(engine, &["analysis-of-variance"])?;
    let found = engine.found(&name).ok_or_else(|| uncomputed(&name))?;
    block(parts::analysis::analysis_table(engine, &name, &found))
}

fn conditions(engine: &Engine, asked: &Asked<'_>) -> Result<Inserted, Problem> {
    let name = asked.block_of(engine, &["ambient"])?;
    engine.conditions(&name).ok_or_else(|| uncomputed(&name))?;
    block(parts::conditions::conditions_table(engine, &name))
}

fn consistency(engine: &Engine, asked: &Asked<'_>) -> Result<Inserted, Problem> {
    let name = asked.block_of(engine, &["combined-result"])?;
    block(parts::consistency::consistency_part(engine, &name).ok_or_else(|| uncomputed(&name))?)
}

fn correlation(engine: &Engine, asked: &Asked<'_>) -> Result<Inserted, Problem> {
    let paths: Vec<&str> = asked.arguments.iter().filter_map(Argument::path).collect();
    if paths.len() < 2 || paths.len() < asked.arguments.len() {
        let message = "A correlation is asked for between two results or more, each by its path.";
        return Err(Problem::new(Code::TemplateFaulty, message));
    }
    let each = paths.iter().map(|path| figure_at(engine, path).and_then(|_| node_at(engine, path)));
    block(parts::correlation::correlation_table(engine, &each.collect::<Result<Vec<NodeId>, _>>()?)?)
}

fn chart(engine: &Engine, asked: &Asked<'_>) -> Result<Inserted, Problem> {
    let name = asked.block_of(engine, &["comparison", "ambient", "combined-result", "realization"])?;
    block(parts::charts::chart_of(engine, &name).ok_or_else(|| uncomputed(&name))?)
}

fn part_of(
    engine: &Engine,
    asked: &Asked<'_>,
    kinds: &[&str],
    part: fn(&Engine, &str) -> Option<Markup>,
) -> Result<Inserted, Problem> {
    let name = asked.block_of(engine, kinds)?;
    block(part(engine, &name).ok_or_else(|| uncomputed(&name))?)
}

/// The table of a comparison's protocol, for one campaign or several.
fn protocol(engine: &Engine, asked: &Asked<'_>) -> Result<Inserted, Problem> {
    let first = asked.path()?;
    let mut names = Vec::new();
    for argument in asked.arguments {
        let one = Asked { arguments: std::slice::from_ref(argument), results: asked.results };
        names.push(one.block_of(engine, &["realization"])?);
    }
    block(parts::protocol::protocol_table(engine, &names).ok_or_else(|| uncomputed(first))?)
}

/// A part about gravity: of a gravity station, or of a block that took gravity from one.
fn gravity_part(
    engine: &Engine,
    asked: &Asked<'_>,
    part: fn(&Engine, &str) -> Option<Markup>,
) -> Result<Inserted, Problem> {
    let name = asked.path()?.to_string();
    if engine.found::<crate::block::gravity_at_mass::GravityUse>(&name).is_none() {
        asked.block_of(engine, &["gravity-station"])?;
    }
    block(part(engine, &name).ok_or_else(|| uncomputed(&name))?)
}

fn relative_budget(engine: &Engine, asked: &Asked<'_>) -> Result<Inserted, Problem> {
    let (id, name) = (asked.quantity(engine)?, asked.path()?.split('.').next().unwrap_or_default());
    block(parts::campaign::relative_budget(engine, name, id).ok_or_else(|| uncomputed(name))?)
}

fn statement(engine: &Engine, asked: &Asked<'_>) -> Result<Inserted, Problem> {
    let id = asked.quantity(engine)?;
    Ok(Inserted { markup: parts::statements::uncertainty_statement(engine, id), block: false })
}

/// Nominal value and deviation from it: `1 kg + 0.123(12) mg`.
fn deviation(engine: &Engine, asked: &Asked<'_>, expanded: bool) -> Result<Inserted, Problem> {
    let path = asked.path()?.to_string();
    let figure = asked.figure(engine)?;
    let kind = engine.graph().node(asked.quantity(engine)?).kind;
    if !matches!(kind, Kind::Mass | Kind::ConventionalMass) {
        return Err(Problem::new(
            Code::TemplateFaulty,
            format!("{path} is {}, which has no nominal value to deviate from.", kind.phrase()),
        ));
    }
    let unit = match asked.arguments.get(1) {
        Some(Argument::Text(text)) => Unit::parse(text).map_err(|problem| Problem { range: None, ..problem })?,
        _ => return Err(Problem::new(Code::TemplateFaulty, "The unit of the deviation is missing.")),
    };
    let block = path.split('.').next().unwrap_or_default();
    let (nominal_text, nominal) = nominal_of(engine, block).ok_or_else(|| {
        Problem::new(Code::FigureMissing, format!("The nominal value of {path} is not known."))
            .hint("Name the item in the combined-result: `item: S1`.")
    })?;
    let style = engine.laboratory.style;
    let text = match expanded {
        true => {
            style.expanded_deviation(&nominal_text, figure.value - nominal, figure.coverage.expanded_uncertainty, &unit)
        }
        false => style.deviation(&nominal_text, figure.value - nominal, figure.coverage.standard_uncertainty, &unit),
    };
    inline(&text?)
}

/// Nominal value, as typed and in kg, of the weight a block is about.
fn nominal_of(engine: &Engine, name: &str) -> Option<(String, f64)> {
    let block = engine.blocks().get(name)?;
    let fields = block.fields();
    match block.kind.name {
        "mass-standard" | "item" => match fields.given("nominal", Kind::Mass)? {
            crate::block::given::Given::Stated { value, .. } => Some((value.text.clone(), value.value)),
            crate::block::given::Given::Reference(_) => None,
        },
        "comparison" => nominal_of(engine, &fields.texts("b").first()?.text),
        "realization" => nominal_of(engine, &fields.text("artefact")?.text),
        "combined-result" => match fields.text("item") {
            Some(item) => nominal_of(engine, &item.text),
            None => nominal_of(engine, fields.texts("results").first()?.text.split('.').next()?),
        },
        _ => None,
    }
}

/// The node of a result named in a report's front matter; complained of at its place when missing.
pub fn named_result(engine: &Engine, path: &Text) -> Option<NodeId> {
    let name = path.text.split('.').next().unwrap_or_default();
    engine.build(name, path.place);
    match node_at(engine, &path.text) {
        Err(_) if engine.has_failed(name) => None,
        found => engine.keep(found, path.place),
    }
}
