//! Covariance and correlation of several results, for the terminal.

use super::terminal;
use crate::graph::{Graph, Joint, NodeId};
use crate::quantity::{Style, choose_unit};
use crate::report::figures::fixed;

/// Standard uncertainties with the lower triangles of correlation and covariance.
pub fn text(graph: &Graph, paths: &[String], ids: &[NodeId], found: &Joint, style: Style) -> String {
    let uncertainties = ids.iter().zip(&found.standard_uncertainties).map(|(id, u)| {
        let Some(name) = graph.node(*id).name.as_ref() else { return String::new() };
        style.difference(*u, &choose_unit(*u, &name.unit), 2).unwrap_or_default()
    });
    let coefficients = triangle(&found.correlation, |value| fixed(style, value, 4));
    let correlation: Vec<Vec<String>> = paths
        .iter()
        .zip(uncertainties)
        .enumerate()
        .map(|(row, (path, u))| [vec![format!("  {}", row + 1), path.clone(), u], coefficients[row].clone()].concat())
        .collect();
    let covariances = triangle(&found.covariance, |value| format!("{value:.4e}").replace('-', "−"));
    let covariance: Vec<Vec<String>> = paths
        .iter()
        .zip(ids)
        .enumerate()
        .map(|(row, (path, id))| {
            let unit = graph.node(*id).dimension.to_string();
            [vec![format!("  {}", row + 1), path.clone(), unit], covariances[row].clone()].concat()
        })
        .collect();
    format!(
        "Correlation coefficients\n{}\nCovariance, each in the product of the two SI units\n{}",
        matrix("u", correlation),
        matrix("SI unit", covariance)
    )
}

/// What stands in each row up to the diagonal.
fn triangle(matrix: &[Vec<f64>], print: impl Fn(f64) -> String) -> Vec<Vec<String>> {
    matrix.iter().enumerate().map(|(row, cells)| cells[..=row].iter().map(|cell| print(*cell)).collect()).collect()
}

/// Rows with their number, path and one more column, under the numbers of the columns.
fn matrix(third: &str, rows: Vec<Vec<String>>) -> String {
    let mut heads = vec![String::new(), "result".into(), third.into()];
    heads.extend((1..=rows.len()).map(|number| number.to_string()));
    let right: Vec<bool> = (0..heads.len()).map(|column| column != 1).collect();
    terminal::columns(&std::iter::once(heads).chain(rows).collect::<Vec<_>>(), &right)
}
