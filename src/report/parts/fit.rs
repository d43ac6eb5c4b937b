//! A fit: its residuals as a chart, its parameters as a table, what the tests say in words.

use crate::block::Engine;
use crate::block::fit::{Fitted, FittedColumn};
use crate::graph::{NodeId, correlation, sensitivities};
use crate::method::polynomial_fit::Tested;
use crate::quantity::{Style, Unit, choose_unit};
use crate::report::Markup;
use crate::report::chart::{Chart, Mean, Series, Style as Look, figure};
use crate::report::figures::{Figure, fixed, freedom, plain, significant};
use crate::report::parts::charts::{WIDTH_MM, marker, solidus};
use crate::report::parts::sentence;
use crate::report::table::{Cell, Table, symbol};

/// Probability below which a test is called significant in words.
const SIGNIFICANCE: f64 = 0.05;

/// Residuals against the abscissae, the parameters, and the tests.
pub fn residuals_part(engine: &Engine, name: &str, fit: &Fitted) -> Markup {
    let mut made = figure(&chart(engine, name, fit), WIDTH_MM, 58.0);
    made.push_code("\n\n").push(&parameters(engine, name, fit));
    made.push_code("#note[");
    for sentence in sentences(engine, fit) {
        made.push_text(&sentence).push_text(" ");
    }
    made.push_code("]\n\n");
    made
}

fn difference_unit(column: &FittedColumn) -> Unit {
    crate::block::columns::difference_unit(&column.unit)
}

/// A quantity and its unit as the label of an axis.
fn axis_label(words: &str, unit: &Unit, style: Style) -> String {
    let words = words.replace('_', " ");
    if unit.is_one() { words } else { format!("{words}/{}", solidus(&style.unit(unit))) }
}

fn chart(engine: &Engine, name: &str, fit: &Fitted) -> Chart {
    let style = engine.laboratory.style;
    let largest = fit.residuals.iter().fold(0.0, |largest: f64, residual| largest.max(residual.abs()));
    let size = if fit.quality.deviation > 0.0 { fit.quality.deviation } else { largest };
    let unit = choose_unit(size, &difference_unit(&fit.y));
    let bar = |row: usize| Some(unit.difference_from_si(*fit.uncertainties.as_ref()?.get(row)?));
    let points: Vec<(f64, f64, Option<f64>)> = fit
        .x
        .rows
        .iter()
        .zip(&fit.residuals)
        .enumerate()
        .map(|(row, (x, residual))| (fit.x.unit.from_si(*x), unit.difference_from_si(*residual), bar(row)))
        .collect();
    let deviation = unit.difference_from_si(fit.quality.deviation);
    let band = deviation.is_finite().then_some(deviation);
    let bars = if fit.uncertainties.is_some() { "residuals, with the stated u" } else { "residuals" };
    let label = if band.is_some() { "polynomial ± s" } else { "polynomial" };
    Chart {
        title: format!("{name}: residuals of the {}", degree_words(fit)),
        x_label: axis_label(&fit.x.label, &fit.x.unit, style),
        y_label: axis_label("residual", &unit, style),
        remark: remark(&points, band),
        series: vec![Series { name: bars.into(), points, style: Look::Points }],
        lines: vec![Mean { y: 0.0, half_width: band, label: label.into() }],
        decimal_marker: marker(engine),
        ..Chart::default()
    }
}

fn degree_words(fit: &Fitted) -> String {
    match fit.coefficients.len().saturating_sub(1) {
        1 => "straight line".into(),
        degree => format!("polynomial of degree {degree}"),
    }
}

/// How many residuals lie in the band, and how often their sign changes along the axis.
fn remark(points: &[(f64, f64, Option<f64>)], band: Option<f64>) -> String {
    let mut order: Vec<&(f64, f64, Option<f64>)> = points.iter().collect();
    order.sort_by(|a, b| a.0.total_cmp(&b.0));
    let changes = order.windows(2).filter(|pair| (pair[0].1 < 0.0) != (pair[1].1 < 0.0)).count();
    let inside = band.map_or(0, |band| points.iter().filter(|point| point.1.abs() <= band).count());
    let within = if band.is_some() {
        format!("{inside} of {} residuals lie within ± s. ", points.len())
    } else {
        String::new()
    };
    format!("{within}Along the axis their sign changes {changes} times.")
}

/// Each coefficient with its uncertainty and its correlation with the others.
fn parameters(engine: &Engine, name: &str, fit: &Fitted) -> Markup {
    let style = engine.laboratory.style;
    let mut header: Vec<Cell> = vec!["Parameter".into(), "".into(), "Value".into(), "u".into()];
    header[3] = Cell::Markup(symbol("u"));
    for power in 0..fit.coefficients.len().saturating_sub(1) {
        let mut made = symbol("r");
        made.push_text("(").push(&symbol("c_k")).push_text(", ").push(&symbol(&format!("c_{power}"))).push_text(")");
        header.push(Cell::Markup(made));
    }
    let mut table = Table::new(format!("{name}: parameters, jointly estimated"), header);
    table.align =
        ["left", "left", "right", "right"].into_iter().chain((1..fit.coefficients.len()).map(|_| "right")).collect();
    for (power, id) in fit.coefficients.iter().enumerate() {
        let Some(figure) = Figure::of(engine, *id) else { continue };
        let words = match power {
            0 => format!("ordinate at {}", plain(style, fit.reference, &fit.x.unit)),
            power => format!("coefficient of power {power}"),
        };
        let mut cells: Vec<Cell> = vec![
            words.into(),
            Cell::Markup(symbol(&format!("c_{power}"))),
            readable(engine, &figure).into(),
            figure.standard_uncertainty().into(),
        ];
        for other in 0..fit.coefficients.len().saturating_sub(1) {
            cells.push(match other < power {
                true => fixed(style, correlation_of(engine, *id, fit.coefficients[other]), 3).into(),
                false => "".into(),
            });
        }
        table.rows.push(cells);
    }
    table.markup()
}

/// Value and standard uncertainty in a unit in which they do not drown in zeros.
fn readable(engine: &Engine, figure: &Figure) -> String {
    let u = figure.coverage.standard_uncertainty;
    let made = engine.laboratory.style.standard(figure.value, u, &choose_unit(u, &figure.unit));
    made.unwrap_or_else(|_| figure.standard())
}

fn correlation_of(engine: &Engine, a: NodeId, b: NodeId) -> f64 {
    let graph = engine.graph();
    correlation(&graph, &sensitivities(&graph, a), &sensitivities(&graph, b))
}

/// Scatter, degree and tests in words.
fn sentences(engine: &Engine, fit: &Fitted) -> Vec<String> {
    let style = engine.laboratory.style;
    let quality = &fit.quality;
    let mut said = Vec::new();
    if quality.deviation.is_finite() {
        let unit = choose_unit(quality.deviation, &difference_unit(&fit.y));
        let deviation = style.difference(quality.deviation, &unit, 2).unwrap_or_else(|problem| problem.message);
        said.push(format!(
            "Standard deviation of the residuals s = {deviation}, {} degrees of freedom.",
            freedom(style, quality.degrees_of_freedom)
        ));
    }
    let tests = ["chi-square", "lack of fit"];
    for decision in fit.decisions.iter().filter(|decision| !tests.contains(&decision.what.as_str())) {
        said.push(sentence(decision));
    }
    said.push(match quality.lack_of_fit {
        Some(tested) => format!("Lack of fit: {}; {}.", tested.words(), lack_words(tested)),
        None => "Lack of fit cannot be tested: no ordinates were repeated at one abscissa.".into(),
    });
    if let Some(tested) = quality.chi_square {
        said.push(format!("Chi-square: {}; {}.", tested.words(), chi_square_words(tested)));
    }
    said
}

fn lack_words(tested: Tested) -> String {
    let level = significant(Style::POINT, SIGNIFICANCE, 1);
    match tested.probability < SIGNIFICANCE {
        true => format!(
            "significant at the level {level}: the polynomial departs from the points by more than repeated readings scatter"
        ),
        false => format!(
            "not significant at the level {level}: the points depart from the polynomial no more than repeated readings scatter"
        ),
    }
}

fn chi_square_words(tested: Tested) -> &'static str {
    match tested.probability {
        p if p < SIGNIFICANCE => "the residuals are larger than the stated uncertainties explain",
        p if p > 1.0 - SIGNIFICANCE => {
            "the residuals are smaller than the stated uncertainties let expect; these are kept"
        }
        _ => "the residuals agree with the stated uncertainties",
    }
}
