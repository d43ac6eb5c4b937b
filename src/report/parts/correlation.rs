//! Correlation of results: standard uncertainties, and the lower triangle of correlation coefficients.

use crate::block::Engine;
use crate::diagnostic::Problem;
use crate::graph::{NodeId, joint};
use crate::report::Markup;
use crate::report::figures::{Figure, fixed};
use crate::report::table::{Cell, Table, head};

/// The table of correlation of any set of scalar results.
///
/// # Errors
/// `correlation_impossible`, with the pair, when the coefficients contradict each other.
pub fn correlation_table(engine: &Engine, results: &[NodeId]) -> Result<Markup, Problem> {
    let found = joint(&engine.graph(), results)?;
    let style = engine.laboratory.style;
    let mut header = vec!["".into(), "Result".into(), head("u", "")];
    header.extend((1..=results.len()).map(|number| Cell::from(number.to_string())));
    let mut table = Table::new("Standard uncertainties and correlation coefficients of the results", header);
    table.columns = vec!["auto", "1fr", "auto"];
    table.columns.extend(results.iter().map(|_| "auto"));
    table.align = vec!["right", "left", "right"];
    table.align.extend(results.iter().map(|_| "right"));
    for (row, id) in results.iter().enumerate() {
        let Some(figure) = Figure::of(engine, *id) else { continue };
        let path = engine.graph().node(*id).name.as_ref().map_or_else(String::new, |name| name.path.clone());
        let mut cells: Vec<Cell> =
            vec![(row + 1).to_string().into(), path.into(), figure.standard_uncertainty().into()];
        cells.extend((0..results.len()).map(|column| match column {
            column if column > row => Cell::from(""),
            column if column == row => Cell::from("1"),
            column => coefficient(found.correlation[row][column], style),
        }));
        table.rows.push(cells);
    }
    Ok(table.markup())
}

fn coefficient(value: f64, style: crate::quantity::Style) -> Cell {
    fixed(style, value, 3).into()
}
