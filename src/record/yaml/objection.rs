//! The YAML parser's objections in plain words.

use crate::diagnostic::{Code, Problem};

/// What the parser's own words mean to the author, and how to mend it.
pub fn in_plain_words(theirs: &str) -> Problem {
    let known = OBJECTIONS.iter().find(|(words, ..)| theirs.contains(words));
    let (code, message, hint) = known.map_or(OTHER_OBJECTION, |&(_, code, message, hint)| (code, message, hint));
    Problem::new(code, message).hint(hint)
}

const QUOTE_IT: &str = "If the text itself contains such a sign, put it in double quotes.";
const LINE_UP: &str = "Fields of one mapping begin in the same column; indent with spaces.";

/// What is said of an objection that is not listed.
const OTHER_OBJECTION: (Code, &str, &str) =
    (Code::YamlUnreadable, "The block cannot be read from here on; a field `name: value` was expected.", LINE_UP);

/// Words of the parser's objections, and what they mean to the author.
const OBJECTIONS: &[(&str, Code, &str, &str)] = &[
    (
        "unknown anchor",
        Code::YamlForbidden,
        "An alias `*…` stands here, but a block states its own values only.",
        "Write the value out, or refer to a named value with `from NAME.field`.",
    ),
    (
        "alphabetic or numeric",
        Code::YamlUnreadable,
        "A value cannot begin with this sign unless it is in quotes.",
        "Put the value in double quotes.",
    ),
    ("directive", Code::YamlForbidden, "A line cannot begin with `%` in a block.", QUOTE_IT),
    ("tag", Code::YamlForbidden, "A value cannot begin with `!` unless it is in quotes.", QUOTE_IT),
    (
        "mapping values are not allowed",
        Code::YamlUnreadable,
        "A second colon followed by a space stands in one value, or this line is indented too far.",
        "Put a value that contains `: ` in double quotes, or line the field up with its neighbours.",
    ),
    (
        "comment intercepting",
        Code::YamlUnreadable,
        "A comment stands between the lines of one text.",
        "Move the comment above the field.",
    ),
    (
        "simple key expect",
        Code::YamlUnreadable,
        "A field `name: value` was expected here, but the line has no colon followed by a space.",
        "Write the colon and a space behind the field's name; indent the further lines of a text.",
    ),
    (
        "unexpected character",
        Code::YamlUnreadable,
        "A value cannot begin with this sign unless it is in quotes.",
        "Put the value in double quotes.",
    ),
    (
        "unexpected end of plain scalar",
        Code::YamlUnreadable,
        "A value cannot begin with this sign unless it is in quotes.",
        "Put the value in double quotes.",
    ),
    (
        "quoted scalar",
        Code::YamlUnreadable,
        "The quotation marks opened here are not closed, or the quoted text is damaged.",
        "Close the quotation marks; inside double quotes write `\\` for a backslash.",
    ),
    ("unprintable", Code::YamlUnreadable, "An invisible character stands here.", "Delete it and type the text anew."),
    ("tab", Code::YamlUnreadable, "The line is indented with a tab, but spaces were expected.", LINE_UP),
    (
        "flow",
        Code::YamlUnreadable,
        "The brackets opened before are not closed, or a comma is missing between two entries.",
        "Close each `{` with `}` and each `[` with `]`, and put commas between the entries.",
    ),
    ("bracket", Code::YamlUnreadable, "A closing bracket stands here without the opening one.", QUOTE_IT),
    ("\"-\"", Code::YamlUnreadable, "A dash for a list item cannot stand here.", LINE_UP),
    ("block sequence", Code::YamlUnreadable, "A dash for a list item cannot stand here.", LINE_UP),
    ("block mapping", Code::YamlUnreadable, "This line does not line up with the fields above it.", LINE_UP),
    ("indentation", Code::YamlUnreadable, "This line does not line up with the lines above it.", LINE_UP),
    (
        "recursion limit",
        Code::YamlUnreadable,
        "Brackets lie too deep in each other here.",
        "Write the block with fewer levels.",
    ),
];
