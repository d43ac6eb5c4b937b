//! Uncertainties, covariance and correlation of any set of results.
//!
//! # Source   JCGM 100:2008, 5.2.2 and H.2; JCGM 102:2011, 6.2.1.3.
//! # Formula  u(a, b) = Σ c_i(a) c_i(b) u_i² over independent sources;  r(a, b) = u(a, b)/(u(a) u(b))

use super::node::*;
use super::sensitivity::{Sensitivities, sensitivities};
use super::uncertainty::{covariance, standard_uncertainty};
use crate::diagnostic::{Code, Problem};
use crate::numeric::linear::{Matrix, cholesky};

/// What is known of several results together, in coherent SI units.
#[derive(Debug, Clone, PartialEq)]
pub struct Joint {
    pub standard_uncertainties: Vec<f64>,
    pub covariance: Matrix,
    /// One on the diagonal; zero beside a result without uncertainty.
    pub correlation: Matrix,
}

/// What rounding may leave of a correlation matrix: more is a contradiction.
const ROUNDING: f64 = 1e-9;

/// Covariance and correlation of results, exactly symmetric.
///
/// # Errors
/// `correlation_impossible`, with the pair, when the matrix is not positive semidefinite.
pub fn joint(graph: &Graph, results: &[NodeId]) -> Result<Joint, Problem> {
    let derivatives: Vec<Sensitivities> = results.iter().map(|id| sensitivities(graph, *id)).collect();
    let standard_uncertainties: Vec<f64> = derivatives.iter().map(|of| standard_uncertainty(graph, of)).collect();
    let size = results.len();
    let mut shared = vec![vec![0.0; size]; size];
    for i in 0..size {
        for j in 0..=i {
            let cell = covariance(graph, &derivatives[i], &derivatives[j]);
            (shared[i][j], shared[j][i]) = (cell, cell);
        }
    }
    let correlation = coefficients(&shared, &standard_uncertainties);
    let name = |index: usize| graph.node(results[index]).name.as_ref().map_or("a quantity", |name| name.path.as_str());
    match contradiction(&correlation) {
        Some((a, b)) => {
            let message = format!(
                "{} and {} cannot be correlated by {:.6}: the correlations of these results contradict each other.",
                name(a),
                name(b),
                correlation[a][b]
            );
            Err(Problem::new(Code::CorrelationImpossible, message)
                .hint("Look at the stated correlations both rest on; coefficients rounded too far can cause this."))
        }
        None => Ok(Joint { standard_uncertainties, covariance: shared, correlation: clamped(correlation) }),
    }
}

fn coefficients(shared: &[Vec<f64>], u: &[f64]) -> Matrix {
    let cell = |i: usize, j: usize| match u[i] * u[j] {
        _ if i == j => 1.0,
        scale if scale > 0.0 => shared[i][j] / scale,
        _ => 0.0,
    };
    (0..u.len()).map(|i| (0..u.len()).map(|j| cell(i, j)).collect()).collect()
}

fn clamped(matrix: Matrix) -> Matrix {
    matrix.into_iter().map(|row| row.into_iter().map(|cell| cell.clamp(-1.0, 1.0)).collect()).collect()
}

/// The pair behind a negative direction of a correlation matrix: the first result that those before it forbid, and
/// the one among them it correlates with most.
fn contradiction(correlation: &[Vec<f64>]) -> Option<(usize, usize)> {
    let leading = |size: usize| -> Matrix {
        let cell = |i: usize, j: usize| correlation[i][j] + if i == j { ROUNDING } else { 0.0 };
        (0..size).map(|i| (0..size).map(|j| cell(i, j)).collect()).collect()
    };
    let forbidden = (2..=correlation.len()).find(|size| cholesky(&leading(*size)).is_err())? - 1;
    let row = &correlation[forbidden];
    (0..forbidden).max_by(|a, b| row[*a].abs().total_cmp(&row[*b].abs())).map(|most| (most, forbidden))
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::graph::{Builder, Distribution, InputDraft, Value};
    use crate::quantity::{Kind, Unit};

    #[test]
    fn what_is_shared_is_the_covariance() {
        let builder = Builder::default();
        let input = |path: &str, u: f64| {
            let origin = Origin::Assumed("test");
            let mut draft = InputDraft::new(path, path, path, Kind::Plain, Unit::one(), Value::Scalar(1.0), origin);
            draft.distribution = Distribution::Normal { standard_uncertainty: u };
            builder.input(draft)
        };
        let (common, a, b) = (input("c", 3.0), input("a", 4.0), input("b", 1.0));
        let ids = [(a + common).id, (b - common).id, (common + common).id, builder.number(2.0).id];
        let found = joint(&builder.graph(), &ids).expect("possible");
        assert_eq!(found.standard_uncertainties[0], 5.0);
        assert_eq!(found.covariance[0], [25.0, -9.0, 18.0, 0.0]);
        assert!((found.correlation[1][0] + 9.0 / (5.0 * 10f64.sqrt())).abs() < 1e-15);
        assert_eq!(found.correlation[3], [0.0, 0.0, 0.0, 1.0]);
        // A result beside itself is singular, not contradictory.
        assert_eq!(joint(&builder.graph(), &[ids[0], ids[0]]).expect("possible").correlation[0], [1.0, 1.0]);
    }

    #[test]
    fn a_contradiction_names_its_pair() {
        let matrix = vec![vec![1.0, 0.9, -0.9], vec![0.9, 1.0, 0.95], vec![-0.9, 0.95, 1.0]];
        assert_eq!(contradiction(&matrix), Some((1, 2)));
        assert_eq!(contradiction(&[vec![1.0, 1.1], vec![1.1, 1.0]]), Some((0, 1)));
        assert_eq!(contradiction(&[vec![1.0, 0.5], vec![0.5, 1.0]]), None);
    }
}
