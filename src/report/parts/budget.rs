//! The uncertainty budget of one result as a table.

use crate::block::Engine;
use crate::graph::{BudgetLine, NodeId, budget};
use crate::quantity::{Style, Unit, choose_unit};
use crate::report::Markup;
use crate::report::figures::{Figure, freedom, plain, significant};
use crate::report::table::{Cell, Table, head, symbol};

/// Shares below this part of the variance are gathered in one line.
pub const SMALLEST_SHARE: f64 = 1e-4;

/// The budget in falling order of contribution.
pub fn budget_table(engine: &Engine, result: NodeId) -> Markup {
    let Some(figure) = Figure::of(engine, result) else { return Markup::new() };
    let style = engine.laboratory.style;
    let made = budget(&engine.graph(), result);
    let unit = choose_unit(figure.coverage.standard_uncertainty, &figure.unit);
    let shown_unit = style.unit(&unit);
    let header = vec![
        "Quantity".into(),
        head("x_i", ""),
        "Estimate".into(),
        Cell::Markup(sum_of("u", "(", "x_i", ")", "")),
        "Type".into(),
        head("ν_i", ""),
        head("c_i", ""),
        Cell::Markup(sum_of("|", "", "c_i", "| ", &format!("u(x_i)/{shown_unit}"))),
        "Share/%".into(),
    ];
    let mut table = Table::new(format!("Uncertainty budget of the {}", figure.label), header);
    table.helper = "budget-table";
    table.columns = vec!["1fr", "auto", "auto", "auto", "auto", "auto", "auto", "auto", "auto"];
    table.align = vec!["left", "left", "right", "right", "left", "right", "right", "right", "right"];
    let (large, small): (Vec<_>, Vec<_>) = made.lines.iter().partition(|line| line.share >= SMALLEST_SHARE);
    for line in &large {
        table.rows.push(row(line, &unit, style));
    }
    if !small.is_empty() {
        table.rows.push(gathered(&small, &unit, style));
    }
    table.closing = closing(&figure, &unit, style);
    table.markup()
}

fn sum_of(first: &str, open: &str, inner: &str, close: &str, rest: &str) -> Markup {
    let mut made = if first == "|" { Markup::text("|") } else { symbol(first) };
    made.push_text(open).push(&symbol(inner)).push_text(close);
    if let Some(tail) = rest.strip_prefix("u(x_i)") {
        made.push(&symbol("u")).push_text("(").push(&symbol("x_i")).push_text(")").push_text(tail);
    }
    made
}

fn row(line: &BudgetLine, unit: &Unit, style: Style) -> Vec<Cell> {
    let uncertainty = difference_in(line.standard_uncertainty, &line.unit, style);
    vec![
        line.label.clone().into(),
        Cell::Markup(symbol(&line.symbol)),
        line.estimate.map_or_else(|| "column".into(), |estimate| estimate_text(estimate, line, style)).into(),
        uncertainty.into(),
        format!("{}, {}", line.evaluation.letter(), line.distribution).into(),
        freedom(style, line.degrees_of_freedom).into(),
        line.sensitivity_coefficient
            .map_or_else(|| "by row".into(), |c| coefficient(c, unit, &line.unit, style))
            .into(),
        significant(style, unit.difference_from_si(line.contribution), 3).into(),
        share(line.share, style).into(),
    ]
}

/// The estimate rounded where its uncertainty ends.
fn estimate_text(estimate: f64, line: &BudgetLine, style: Style) -> String {
    // A mass stated as nominal plus deviation is shown whole, in the coherent unit.
    let large = line.unit.difference_from_si(estimate).abs() >= 1e5;
    let coherent =
        if large { Unit::parse("kg").ok().filter(|kg| kg.dimension() == line.unit.dimension()) } else { None };
    if let Some(kilogram) = coherent {
        let u = kilogram
            .difference_decimal_from_si(line.standard_uncertainty)
            .and_then(|u| u.rounded_to_digits(2).leading_power());
        return style
            .value(estimate, &kilogram, u.map_or(9, |lead| 1 - lead))
            .unwrap_or_else(|problem| problem.message);
    }
    let spread = line.unit.difference_decimal_from_si(line.standard_uncertainty);
    let decimals = spread.and_then(|u| u.rounded_to_digits(2).leading_power()).map_or(6, |lead| 1 - lead);
    if !(0..=12).contains(&decimals) {
        return plain(style, estimate, &line.unit);
    }
    style.value(estimate, &line.unit, decimals).unwrap_or_else(|problem| problem.message)
}

fn difference_in(value: f64, unit: &Unit, style: Style) -> String {
    // A difference of temperatures is printed in kelvin.
    let unit =
        if unit.is_celsius() { Unit::parse("K").unwrap_or_else(|_| unit.clone()) } else { choose_unit(value, unit) };
    style.difference(value, &unit, 2).unwrap_or_else(|problem| problem.message)
}

/// ∂y/∂x in the units of contribution over the input's unit.
fn coefficient(c: f64, unit: &Unit, of: &Unit, style: Style) -> String {
    let number = significant(style, unit.difference_from_si(c * of.difference_to_si(1.0)), 3);
    let of_text = if of.is_celsius() { "K".to_string() } else { of.text_or_one() };
    match (unit.text_or_one(), of_text) {
        (top, bottom) if top == bottom => number,
        (top, bottom) if bottom == "1" => format!("{number} {top}"),
        (top, bottom) if bottom.contains(' ') => format!("{number} {top}/({bottom})"),
        (top, bottom) => format!("{number} {top}/{bottom}"),
    }
}

fn share(share: f64, style: Style) -> String {
    crate::report::figures::fixed(style, share * 100.0, 2)
}

fn gathered(lines: &[&BudgetLine], unit: &Unit, style: Style) -> Vec<Cell> {
    let variance: f64 = lines.iter().map(|line| line.contribution * line.contribution).sum();
    let total: f64 = lines.iter().map(|line| line.share).sum();
    let mut cells: Vec<Cell> = vec![format!("{} further contributions, each below 0.01 %", lines.len()).into()];
    cells.extend((0..6).map(|_| Cell::from("")));
    cells.push(significant(style, unit.difference_from_si(variance.sqrt()), 3).into());
    cells.push(share(total, style).into());
    cells
}

fn closing(figure: &Figure, unit: &Unit, style: Style) -> Vec<Vec<Cell>> {
    let coverage = figure.coverage;
    let line = |label: &str, symbol_text: &str, text: String| {
        let mut cells = vec![Cell::from(label), Cell::Markup(symbol(symbol_text)), Cell::from(text)];
        cells.extend((0..6).map(|_| Cell::from("")));
        cells
    };
    let combined = style.difference(coverage.standard_uncertainty, unit, 2).unwrap_or_else(|problem| problem.message);
    let expanded = style.difference(coverage.expanded_uncertainty, unit, 2).unwrap_or_else(|problem| problem.message);
    let mut first = line("combined standard uncertainty", "u_c", combined);
    first[5] = freedom(style, coverage.effective_degrees_of_freedom).into();
    first[7] = significant(style, unit.difference_from_si(coverage.standard_uncertainty), 3).into();
    first[8] = share(1.0, style).into();
    let mut second = line("expanded uncertainty", "U", expanded);
    second[4] = format!("k = {}", figure.factor()).into();
    vec![first, second]
}
