use super::*;
use crate::intake::FileId;
use crate::record::blank_expressions;
use crate::report::template::Templates;
use crate::report::typeset::{TypstDocument, typeset};
use proptest::prelude::*;

/// Inserts a block for an expression that begins with a capital letter, else a text.
struct Sample<'a>(&'a [Expression]);

impl Insert for Sample<'_> {
    fn expression(&mut self, index: usize) -> Inserted {
        let text = &self.0[index].text;
        let block = text.starts_with(|c: char| c.is_uppercase());
        Inserted { markup: if block { Markup::code("#block[B];") } else { Markup::text(text) }, block }
    }

    fn image(&mut self, path: &str) -> Result<String, Problem> {
        path_in_folder("campaigns/a", path)
    }
}

fn set(text: &str) -> (Markup, Complaints) {
    let (blanked, expressions, problems) = blank_expressions(text);
    assert!(problems.is_empty(), "{problems:?}");
    let body = Place::new(FileId(0), 100, 100 + text.len());
    let prose = Prose { blanked: &blanked, expressions: &expressions, body, leave_out: &[], top_level: 1 };
    let mut complaints = Complaints::default();
    let markup = typeset_prose(&prose, &mut Sample(&expressions), &mut complaints);
    (markup, complaints)
}

fn source(text: &str) -> String {
    let (markup, complaints) = set(text);
    assert_eq!(complaints, Complaints::default());
    markup.source.trim().to_string()
}

fn complaint(text: &str) -> (Code, u32) {
    let (_, complaints) = set(text);
    let first = complaints.list.first().expect("a complaint");
    (first.code, first.place.expect("a place").start - 100)
}

#[test]
fn text_lists_and_tables() {
    assert_eq!(source("a *b* **c**\nd"), "#\"a \";#emph[#\"b\";]; #strong[#\"c\";]; #\"d\";");
    assert!(source("- a\n- b\n").starts_with("#list(tight: true, [#\"a\";\n\n], [#\"b\";"));
    assert!(source("3. a\n\n4. b\n").starts_with("#enum(tight: false, start: 3, ["));
    let table = source("| a | b |\n|---|--:|\n| 1 | {{ x }} |\n");
    assert_eq!(
        table,
        "#data-table(align: (left, right, ), header: ([#\"a\";], [#\"b\";], ), rows: (([#\"1\";], [#\"x\";], ), ));"
    );
}

#[test]
fn headings_have_no_gaps() {
    assert_eq!(source("## a\n\n#### b\n\n## c").matches("level: 1").count(), 2);
    assert!(source("## a\n\n#### b").contains("level: 2"));
    assert!(source("### a\n\n# b").matches("level: 1").count() == 2);
}

#[test]
fn an_expression_enters_where_it_stands() {
    assert_eq!(source("m is {{ m }}."), "#\"m is \";#\"m\";#\".\";");
    assert_eq!(source("*m* {{ m }}"), "#emph[#\"m\";]; #\"m\";");
    assert_eq!(source("{{ Table }}"), "#block[B];");
    assert_eq!(source("{{ Table }}\n{{ Chart }}"), "#block[B];\n\n#block[B];");
    assert_eq!(complaint("see {{ Table }}"), (Code::ProseUnreadable, 4));
    assert_eq!(complaint("# {{ Table }}"), (Code::ProseUnreadable, 2));
}

#[test]
fn places_lead_back_to_the_record() {
    let (markup, _) = set("ab {{ m }} cd");
    let place_of =
        |needle: &str| markup.place_of(markup.source.find(needle).expect("there") + 1).expect("a place").start - 100;
    assert_eq!(place_of("#\"ab"), 0);
    assert_eq!(place_of("#\"m\""), 3);
    assert_eq!(place_of("#\" cd"), 10);
}

#[test]
fn what_cannot_be_set_is_named() {
    assert_eq!(complaint("a <b>c</b>"), (Code::ProseUnreadable, 2));
    assert_eq!(complaint("<div>\nx\n</div>\n"), (Code::ProseUnreadable, 0));
    assert_eq!(complaint("x $\\foo$"), (Code::ProseUnreadable, 3));
    assert_eq!(complaint("[a](javascript:x)"), (Code::ProseUnreadable, 0));
    assert_eq!(complaint("[a](../b.md)"), (Code::ProseUnreadable, 0));
    assert_eq!(complaint("![](a.png)"), (Code::ProseUnreadable, 0));
    assert_eq!(complaint("![a](/a.png)"), (Code::PathOutside, 0));
    assert_eq!(complaint("![a](../../../a.png)"), (Code::PathOutside, 0));
    assert_eq!(complaint("a[^1]\n\n[^1]: b[^1]"), (Code::ProseUnreadable, 14));
    assert_eq!(complaint(&format!("{} x", ">".repeat(60))).0, Code::ProseUnreadable);
    assert_eq!(source("<!-- unseen -->\n\na <!-- unseen --> b"), "#\"a \";#\" b\";");
}

#[test]
fn paths_stay_in_the_folder() {
    assert_eq!(path_in_folder("campaigns/a", "../b/./c.png"), Ok("campaigns/b/c.png".to_string()));
    for path in ["/a", "..", "../../..", "c:a", "a\\b", "https://x/y.png", ""] {
        assert!(path_in_folder("a", path).is_err() || path == "..", "{path}");
    }
}

fn pages(markup: Markup) -> Result<usize, String> {
    let source = format!("#import \"/parts.typ\": *\n{}", markup.source);
    let document = TypstDocument { source, files: Templates::built_in().files(), ..Default::default() };
    typeset(&document).map(|typeset| typeset.page_count()).map_err(|faults| format!("{faults:?}"))
}

proptest! {
    #![proptest_config(ProptestConfig::with_cases(250))]
    #[test]
    fn whatever_stands_in_prose_typesets(
        parts in proptest::collection::vec(prop_oneof![
            "[a-z\\[\\]()*_`~#>|$\\\\!:;\"'{}&<=+.0-9 \n-]{0,24}",
            Just("\n\n".to_string()), Just("- ".to_string()), Just("> ".to_string()), Just("| a | b |\n|---|---|\n| c | d |\n".to_string()),
            Just("{{ m }}".to_string()), Just("\n\n{{ T }}\n\n".to_string()), Just("[^1]".to_string()), Just("\n\n[^1]: note\n\n".to_string()),
            Just("$\\frac{a}{b_1}^2$".to_string()), Just("$$\\left( x, y \\right| + (a; b) : c$$".to_string()), Just("```\ncode\n```\n".to_string()),
            Just("#read(\"x\")".to_string()), Just("<https://a.b/c>".to_string()), Just("&amp;".to_string()),
        ], 0..12)
    ) {
        let text = parts.concat();
        let (blanked, expressions, _) = blank_expressions(&text);
        let body = Place::new(FileId(0), 0, text.len());
        let prose = Prose { blanked: &blanked, expressions: &expressions, body, leave_out: &[], top_level: 1 };
        let mut complaints = Complaints::default();
        let markup = typeset_prose(&prose, &mut Sample(&expressions), &mut complaints);
        for pair in markup.spans.windows(2) {
            prop_assert!(pair[0].0.end <= pair[1].0.start);
        }
        let found = pages(markup);
        prop_assert!(found.is_ok(), "{}", found.unwrap_err());
    }
}
