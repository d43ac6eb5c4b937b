//! Templates: Typst source with places for values.
//!
//! A value in double braces becomes text that cannot run ([`typst_text`]); finished [`Markup`] is put in as it is,
//! with its places; the filter `literal` writes a value as a Typst expression, for use as an argument.

use super::literal::{typst_string, typst_text};
use super::markup::Markup;
use crate::diagnostic::{Code, Problem};
use minijinja::value::{Object, ValueKind};
use minijinja::{AutoEscape, Environment, Error, ErrorKind, UndefinedBehavior, Value};
use std::collections::BTreeMap;
use std::sync::{Arc, Mutex, PoisonError};

impl Object for Markup {}

/// The page template and the functions it imports.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Templates {
    /// The layout of the pages; Typst source with values in double braces.
    pub report: String,
    /// Plain Typst functions that the layout and the parts of a report call.
    pub parts: String,
}

impl Templates {
    /// The path of the page template in a laboratory folder that brings its own.
    pub const REPORT_PATH: &'static str = "templates/report.typ";
    /// The path of the functions in a laboratory folder that brings its own.
    pub const PARTS_PATH: &'static str = "templates/parts.typ";

    /// The templates that come with the program.
    pub fn built_in() -> Self {
        Self {
            report: include_str!("../../templates/report.typ").into(),
            parts: include_str!("../../templates/parts.typ").into(),
        }
    }

    /// The files the rendered source imports, for [`super::typeset::TypstDocument::files`].
    pub fn files(&self) -> BTreeMap<String, Vec<u8>> {
        BTreeMap::from([("parts.typ".to_string(), self.parts.clone().into_bytes())])
    }

    /// Puts values into the page template.
    pub fn render(&self, values: &Value) -> Result<Markup, Problem> {
        render(&self.report, values)
    }
}

/// How much work one template may cause.
const FUEL: u64 = 5_000_000;
/// Enclose the number of a finished piece until it is put in; text never contains them unescaped.
const PIECE_OPEN: char = '\u{e000}';
const PIECE_CLOSE: char = '\u{e001}';

/// Puts values into a template.
pub fn render(template: &str, values: &Value) -> Result<Markup, Problem> {
    let pieces: Arc<Mutex<Vec<Markup>>> = Arc::default();
    let mut environment = Environment::new();
    environment.set_undefined_behavior(UndefinedBehavior::Strict);
    environment.set_auto_escape_callback(|_| AutoEscape::None);
    environment.set_fuel(Some(FUEL));
    environment.add_filter("literal", |value: Value| literal(&value).map(Value::from_object));
    let found = Arc::clone(&pieces);
    environment.set_formatter(move |output, _state, value| {
        if let Some(markup) = value.downcast_object_ref::<Markup>() {
            let mut pieces = found.lock().unwrap_or_else(PoisonError::into_inner);
            write!(output, "{PIECE_OPEN}{}{PIECE_CLOSE}", pieces.len()).map_err(Error::from)?;
            pieces.push(markup.clone());
            return Ok(());
        }
        output.write_str(&typst_text(&plain_text(value)?)).map_err(Error::from)
    });
    let rendered =
        environment.render_named_str("report.typ", template, values).map_err(|error| template_problem(&error))?;
    let pieces = pieces.lock().unwrap_or_else(PoisonError::into_inner);
    Ok(put_in(&rendered, &pieces))
}

/// The rendered text with the finished pieces in their places.
fn put_in(rendered: &str, pieces: &[Markup]) -> Markup {
    let mut whole = Markup::new();
    let mut parts = rendered.split(PIECE_OPEN);
    whole.push_code(parts.next().unwrap_or_default());
    for part in parts {
        let (number, rest) = part.split_once(PIECE_CLOSE).unwrap_or(("", part));
        if let Some(piece) = number.parse().ok().and_then(|number: usize| pieces.get(number)) {
            whole.push(piece);
        }
        whole.push_code(rest);
    }
    whole
}

/// The text of a plain value. Numbers come as text already formed, for a bare number has no place to be rounded.
fn plain_text(value: &Value) -> Result<String, Error> {
    match value.kind() {
        ValueKind::String => Ok(value.as_str().unwrap_or_default().to_string()),
        ValueKind::Number if value.is_integer() => Ok(value.to_string()),
        ValueKind::Undefined => Err(Error::from(ErrorKind::UndefinedError)),
        other => Err(Error::new(ErrorKind::InvalidOperation, format!("a {other} cannot be printed as text"))),
    }
}

/// A value as a Typst expression.
fn literal(value: &Value) -> Result<Markup, Error> {
    if let Some(markup) = value.downcast_object_ref::<Markup>() {
        let mut content = Markup::new();
        content.push_content(markup);
        return Ok(content);
    }
    match value.kind() {
        ValueKind::String => Ok(Markup::code(typst_string(value.as_str().unwrap_or_default()))),
        ValueKind::None => Ok(Markup::code("none")),
        ValueKind::Bool => Ok(Markup::code(if value.is_true() { "true" } else { "false" })),
        ValueKind::Number if value.is_integer() => Ok(Markup::code(value.to_string())),
        ValueKind::Seq | ValueKind::Iterable => literal_list(value),
        ValueKind::Map => literal_map(value),
        ValueKind::Undefined => Err(Error::from(ErrorKind::UndefinedError)),
        other => Err(Error::new(ErrorKind::InvalidOperation, format!("a {other} cannot be written as an argument"))),
    }
}

fn literal_list(value: &Value) -> Result<Markup, Error> {
    let mut list = Markup::code("(");
    for item in value.try_iter()? {
        list.push(&literal(&item)?).push_code(", ");
    }
    list.push_code(")");
    Ok(list)
}

fn literal_map(value: &Value) -> Result<Markup, Error> {
    let mut map = Markup::code("(:");
    for (index, key) in value.try_iter()?.enumerate() {
        if index == 0 {
            map = Markup::code("(");
        }
        map.push_string(&plain_text(&key)?).push_code(": ").push(&literal(&value.get_item(&key)?)?).push_code(", ");
    }
    map.push_code(")");
    Ok(map)
}

fn template_problem(error: &Error) -> Problem {
    let line = error.line().map(|line| format!(" in line {line}")).unwrap_or_default();
    let reason =
        error.detail().map_or_else(|| error.kind().to_string(), |detail| format!("{}, {detail}", error.kind()));
    Problem::new(Code::TemplateFaulty, format!("The page template cannot be filled{line}: {reason}."))
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::intake::{FileId, Place};
    use minijinja::context;

    #[test]
    fn a_value_is_text_and_markup_is_markup_with_its_places() {
        let place = Place::new(FileId(3), 1, 4);
        let mut body = Markup::new();
        body.push_text_at("body", place);
        let values = context! { name => "#read(\"x\")", body => Value::from_object(body), n => 3 };
        let rendered = render("A {{ name }} {{ body }} {{ n }}.", &values).expect("renders");
        assert_eq!(rendered.source, "A #\"#read(\\\"x\\\")\"; #\"body\"; #\"3\";.");
        assert_eq!(&rendered.source[rendered.spans[0].0.clone()], "#\"body\";");
    }

    #[test]
    fn the_literal_filter_writes_arguments() {
        let values =
            context! { rows => vec![vec!["a\"", "b"]], yes => true, cell => Value::from_object(Markup::text("m")) };
        let rendered = render("{{ rows|literal }} {{ yes|literal }} {{ [cell, none, {'k': 1}]|literal }}", &values)
            .expect("renders");
        assert_eq!(rendered.source, "((\"a\\\"\", \"b\", ), ) true ([#\"m\";], none, (\"k\": 1, ), )");
    }

    #[test]
    fn an_undefined_value_and_a_bare_fraction_are_complaints() {
        assert_eq!(render("{{ nothing }}", &context! {}).expect_err("undefined").code, Code::TemplateFaulty);
        assert_eq!(render("{{ x }}", &context! { x => 0.1 }).expect_err("a float").code, Code::TemplateFaulty);
        assert!(render("{% for i in range(100000000) %}x{% endfor %}", &context! {}).is_err());
    }
}
