//! Fields of measurement blocks: what each kind may hold, and the check of what an author wrote against it.
//!
//! Every kind of block states its fields once as a table of [`Field`]. The check, the messages, the documentation
//! and later the schema come from that table.

use super::given::read_given;
use crate::diagnostic::{Code, Complaints, Problem, nearest};
use crate::quantity::Kind;
use crate::record::{Node, is_name, parse_date, parse_instant};

/// What a field holds.
#[derive(Debug, Clone, Copy)]
pub enum Shape {
    /// Free text.
    Text,
    /// One of a few words.
    Choice(&'static [&'static str]),
    /// The name of a block.
    Name,
    /// One name, or a list of names.
    Names,
    /// The path of a result, such as `W1.mass`.
    Results,
    /// A value of a kind of quantity in the notation of values.
    Value(Kind),
    /// A value of any unit.
    AnyValue,
    /// A number without unit.
    Number,
    Date,
    Instant,
    /// A mapping with these fields.
    Mapping(&'static [Field]),
    /// A list of mappings with these fields.
    Mappings(&'static [Field]),
    /// A list of numbers whose unit stands elsewhere in the block.
    Numbers,
    /// A list of such lists.
    Grid,
    /// A list of texts.
    Texts,
    /// A mapping from free names to mappings with these fields.
    Named(&'static [Field]),
    /// A mapping from free names to values: in short form, or as mappings with these fields.
    Inputs(&'static [Field]),
    /// A mapping from free names to texts.
    Equations,
    /// Either shape will do: the first that fits.
    Either(&'static Shape, &'static Shape),
}

/// One field of a block.
#[derive(Debug, Clone, Copy)]
pub struct Field {
    pub name: &'static str,
    pub shape: Shape,
    pub needed: bool,
    /// What it means, in a line.
    pub meaning: &'static str,
}

/// A field that must be there.
pub const fn needed(name: &'static str, shape: Shape, meaning: &'static str) -> Field {
    Field { name, shape, needed: true, meaning }
}

/// A field that may be left out.
pub const fn optional(name: &'static str, shape: Shape, meaning: &'static str) -> Field {
    Field { name, shape, needed: false, meaning }
}

impl Shape {
    /// What is expected, in words.
    pub fn words(self) -> String {
        match self {
            Shape::Text => "text".into(),
            Shape::Choice(words) => format!("one of {}", words.join(", ")),
            Shape::Name => "the name of a block".into(),
            Shape::Names => "the name of a block, or a list of names".into(),
            Shape::Results => "a list of results such as W1.mass".into(),
            Shape::Value(kind) => format!("{} such as 1 {}", kind.phrase(), kind.default_unit()),
            Shape::AnyValue => "a value with its unit".into(),
            Shape::Number => "a number without unit".into(),
            Shape::Date => "a date such as 2041-03-12".into(),
            Shape::Instant => "a time with its zone such as 2041-03-12T09:10:00Z".into(),
            Shape::Mapping(_) => "a mapping of fields".into(),
            Shape::Mappings(_) => "a list of mappings".into(),
            Shape::Numbers => "a list of numbers".into(),
            Shape::Grid => "a list of lists of numbers".into(),
            Shape::Texts => "a list of texts".into(),
            Shape::Inputs(_) => "a mapping from names to values".into(),
            Shape::Equations => "a mapping from names to equations".into(),
            Shape::Named(_) => "a mapping from names to their particulars".into(),
            Shape::Either(first, second) => format!("{}, or {}", first.words(), second.words()),
        }
    }
}

/// Checks a mapping against its table of fields: unknown and missing fields, shapes, and each value.
///
/// `owner` names the mapping in messages: "the mass-standard K17".
pub fn check_fields(node: &Node, fields: &[Field], owner: &str, complaints: &mut Complaints) {
    let Some(entries) = node.as_map() else {
        if !node.is_empty() || fields.iter().any(|field| field.needed) {
            complaints.add_at(mismatch(owner, "a mapping of fields".into(), node), node.place);
        }
        return;
    };
    for entry in entries {
        match fields.iter().find(|field| field.name == entry.key.text) {
            Some(field) => check_shape(&entry.value, field.shape, &format!("{} of {owner}", field.name), complaints),
            None => complaints.add_at(unknown_field(&entry.key.text, fields, owner), entry.key.place),
        }
    }
    for field in fields.iter().filter(|field| field.needed && node.get(field.name).is_none()) {
        let message = format!("The field {} is missing from {owner}: {}.", field.name, field.meaning);
        complaints.add_at(
            Problem::new(Code::FieldMissing, message).hint(format!(
                "Write `{}:` with {}.",
                field.name,
                field.shape.words()
            )),
            node.place,
        );
    }
}

fn unknown_field(found: &str, fields: &[Field], owner: &str) -> Problem {
    let problem = Problem::new(Code::FieldUnknown, format!("The field {found} is not known in {owner}."));
    match nearest(found, fields.iter().map(|field| field.name)) {
        Some(near) => problem.hint(format!("Did you mean {near}?")),
        None => problem
            .hint(format!("Known fields: {}.", fields.iter().map(|field| field.name).collect::<Vec<_>>().join(", "))),
    }
}

fn mismatch(owner: &str, expected: String, node: &Node) -> Problem {
    let message = format!("{} holds {}, but {expected} is expected.", capital(owner), node.describe());
    let problem = Problem::new(Code::ShapeMismatch, message);
    match (expected.contains("list"), node.as_list().is_some()) {
        (true, false) => {
            problem.hint("Write a list: each item on a line of its own behind a dash, or all in square brackets.")
        }
        (false, true) => problem.hint("Write one value, without dashes and square brackets."),
        _ => problem.hint(format!("Write {expected}.")),
    }
}

fn capital(text: &str) -> String {
    let mut letters = text.chars();
    letters.next().map_or_else(String::new, |first| first.to_uppercase().chain(letters).collect())
}

fn check_shape(node: &Node, shape: Shape, owner: &str, complaints: &mut Complaints) {
    match shape {
        Shape::Mapping(fields) => check_fields(node, fields, owner, complaints),
        Shape::Mappings(fields) => {
            each(node, shape, owner, complaints, |item, complaints| check_fields(item, fields, owner, complaints))
        }
        Shape::Named(fields) => match node.as_map() {
            Some(entries) => entries.iter().for_each(|entry| {
                check_fields(&entry.value, fields, &format!("{} in {owner}", entry.key.text), complaints);
            }),
            None => complaints.add_at(mismatch(owner, shape.words(), node), node.place),
        },
        Shape::Inputs(fields) => {
            named(node, shape, owner, complaints, |value, owner, complaints| match value.as_map() {
                Some(_) => check_fields(value, fields, owner, complaints),
                None => check_value(value, Shape::AnyValue, owner, complaints),
            })
        }
        Shape::Equations => named(node, shape, owner, complaints, |value, owner, complaints| {
            check_scalar(value, Shape::Text, owner, complaints);
        }),
        Shape::Texts | Shape::Numbers => {
            let inner = if matches!(shape, Shape::Texts) { Shape::Text } else { Shape::Number };
            each(node, shape, owner, complaints, |item, complaints| check_shape(item, inner, owner, complaints));
        }
        Shape::Grid => each(node, shape, owner, complaints, |item, complaints| {
            check_shape(item, Shape::Numbers, owner, complaints)
        }),
        Shape::Names | Shape::Results if node.as_list().is_some() => {
            let inner = if matches!(shape, Shape::Names) { Shape::Name } else { Shape::Results };
            each(node, shape, owner, complaints, |item, complaints| check_scalar(item, inner, owner, complaints));
        }
        Shape::Either(first, second) => {
            let mut tried = Complaints::default();
            check_shape(node, *first, owner, &mut tried);
            let wrong_shape = tried
                .list
                .iter()
                .any(|complaint| complaint.code == Code::ShapeMismatch && complaint.place == Some(node.place));
            if wrong_shape { check_shape(node, *second, owner, complaints) } else { complaints.extend(tried) }
        }
        Shape::Value(_) | Shape::AnyValue => check_value(node, shape, owner, complaints),
        _ => check_scalar(node, shape, owner, complaints),
    }
}

/// Checks every value of a mapping from free names.
fn named(
    node: &Node,
    shape: Shape,
    owner: &str,
    complaints: &mut Complaints,
    mut check: impl FnMut(&Node, &str, &mut Complaints),
) {
    let Some(entries) = node.as_map() else {
        complaints.add_at(mismatch(owner, shape.words(), node), node.place);
        return;
    };
    for entry in entries {
        let plain = entry.key.text.chars().all(|c| c.is_alphanumeric() || c == '_');
        if !plain || !entry.key.text.starts_with(char::is_alphabetic) {
            let message = format!(
                "“{}” is no name for a quantity: a letter followed by letters, digits and underscores.",
                entry.key.text
            );
            complaints.add_at(Problem::new(Code::NameInvalid, message).hint("Choose another name."), entry.key.place);
        }
        check(&entry.value, &format!("{} of {owner}", entry.key.text), complaints);
    }
}

fn each(
    node: &Node,
    shape: Shape,
    owner: &str,
    complaints: &mut Complaints,
    mut check: impl FnMut(&Node, &mut Complaints),
) {
    match node.as_list() {
        Some(items) => items.iter().for_each(|item| check(item, complaints)),
        None => complaints.add_at(mismatch(owner, shape.words(), node), node.place),
    }
}

fn check_value(node: &Node, shape: Shape, owner: &str, complaints: &mut Complaints) {
    let kind = if let Shape::Value(kind) = shape { kind } else { Kind::Plain };
    if node.is_empty() || node.as_list().is_some() {
        complaints.add_at(mismatch(owner, shape.words(), node), node.place);
    } else if let Err(complaint) = read_given(node, kind, owner) {
        complaints.add(*complaint);
    }
}

fn check_scalar(node: &Node, shape: Shape, owner: &str, complaints: &mut Complaints) {
    let Some(text) = node.as_text() else {
        complaints.add_at(mismatch(owner, shape.words(), node), node.place);
        return;
    };
    let verdict = match shape {
        Shape::Choice(words) if !words.contains(&text) => {
            let problem = mismatch(owner, shape.words(), node);
            Err(match nearest(text, words.iter().copied()) {
                Some(near) => problem.hint(format!("Did you mean {near}?")),
                None => problem,
            })
        }
        Shape::Name | Shape::Names if !is_name(text) => Err(Problem::new(
            Code::NameInvalid,
            format!(
                "{} is “{text}”, but a name is a letter followed by letters, digits and underscores.",
                capital(owner)
            ),
        )),
        Shape::Number => number(text).map(|_| ()),
        Shape::Date => parse_date(text).map(|_| ()),
        Shape::Instant => parse_instant(text).map(|_| ()),
        _ => Ok(()),
    };
    complaints.keep(verdict, node.place);
}

/// A plain number as typed in a field without unit.
///
/// # Errors
/// Those of [`crate::quantity::parse_number`].
pub fn number(text: &str) -> Result<f64, Problem> {
    crate::quantity::parse_number(text, &crate::quantity::Unit::one())
}
