//! An analysis of variance as a table: what varies between groups and within them, and what u rests on.

use crate::block::Engine;
use crate::block::analysis_of_variance::Analysed;
use crate::method::analysis_of_variance::Squares;
use crate::method::statistic::{brief, probability};
use crate::quantity::choose_unit;
use crate::report::Markup;
use crate::report::figures::{freedom, significant};
use crate::report::parts::{decisions_behind, sentence};
use crate::report::table::{Cell, Table, head};

/// Degrees of freedom, root mean square, F, probability and component of each source of scatter.
pub fn analysis_table(engine: &Engine, name: &str, found: &Analysed) -> Markup {
    let style = engine.laboratory.style;
    let analysis = &found.table;
    let unit = choose_unit(analysis.within.square().sqrt(), &found.unit);
    let unit_text = style.unit(&unit);
    let header: Vec<Cell> = vec![
        "Source".into(),
        head("ν", ""),
        with_unit("root mean square", &unit_text),
        head("F", ""),
        head("p", ""),
        with_unit("standard deviation", &unit_text),
    ];
    let mut table = Table::new(format!("{name}: analysis of variance of {}", found.label), header);
    table.align = vec!["left", "right", "right", "right", "right", "right"];
    let shown = |value: f64| Cell::from(significant(style, unit.difference_from_si(value), 3));
    let row = |source: &str, squares: Squares, test: Option<(f64, f64)>, component: f64| {
        let (f, p) = test.map_or((String::new(), String::new()), |(f, p)| {
            (style.digits(&brief(f)), probability(p).trim_start_matches("p ").trim_start_matches("= ").to_string())
        });
        vec![
            Cell::from(source),
            freedom(style, squares.degrees_of_freedom).into(),
            shown(squares.square().sqrt()),
            f.into(),
            p.into(),
            shown(component),
        ]
    };
    let (outer, inner) = if analysis.is_nested() { ("days", "series") } else { ("groups", "groups") };
    let of_outer = Some((analysis.f_between(), analysis.p_between()));
    table.rows.push(row(&format!("between {outer}"), analysis.between, of_outer, analysis.between_deviation()));
    if analysis.is_nested() {
        table.rows.push(row("between series of a day", analysis.inner, None, analysis.inner_deviation()));
    }
    let within = analysis.within;
    table.rows.push(row(&format!("within {inner}"), within, None, within.square().sqrt()));
    let mut made = table.markup();
    let said: Vec<String> = decisions_behind(engine, &format!("{name}.mean")).iter().map(sentence).collect();
    made.push_code("#note[").push_text(&said.join(" ")).push_code("]\n\n");
    made
}

fn with_unit(words: &str, unit: &str) -> Cell {
    match unit {
        "" => words.into(),
        unit if unit.contains([' ', '\u{a0}']) => format!("{words}/({unit})").into(),
        unit => format!("{words}/{unit}").into(),
    }
}
