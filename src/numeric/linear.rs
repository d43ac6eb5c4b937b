//! Small dense matrices in a fixed order of operations.
//!
//! A matrix is a list of rows. Shapes are the caller's care: a product reaches as far as the shorter factor.

use super::elementary::sqrt;
use super::sum::{dot, sum};
use crate::diagnostic::{Code, Problem};

/// A matrix as a list of rows.
pub type Matrix = Vec<Vec<f64>>;

/// Matrix times vector.
pub fn times_vector(matrix: &[Vec<f64>], vector: &[f64]) -> Vec<f64> {
    matrix.iter().map(|row| dot(row, vector)).collect()
}

/// Matrix product.
pub fn product(a: &[Vec<f64>], b: &[Vec<f64>]) -> Matrix {
    let columns = transpose(b);
    a.iter().map(|row| times_vector(&columns, row)).collect()
}

/// Rows become columns, as many as the shortest row has.
pub fn transpose(matrix: &[Vec<f64>]) -> Matrix {
    let width = matrix.iter().map(Vec::len).min().unwrap_or(0);
    (0..width).map(|j| matrix.iter().filter_map(|row| row.get(j).copied()).collect()).collect()
}

/// x' M y.
pub fn bilinear(x: &[f64], matrix: &[Vec<f64>], y: &[f64]) -> f64 {
    dot(x, &times_vector(matrix, y))
}

/// J C J': the covariance of linear functions, exactly symmetric. JCGM 102:2011, 6.2.1.3.
pub fn propagate(jacobian: &[Vec<f64>], covariance: &[Vec<f64>]) -> Matrix {
    let halfway: Matrix = jacobian.iter().map(|row| times_vector(covariance, row)).collect();
    let element = |i: usize, j: usize| match (jacobian.get(i.max(j)), halfway.get(i.min(j))) {
        (Some(row), Some(column)) => dot(row, column),
        _ => 0.0,
    };
    (0..jacobian.len()).map(|i| (0..jacobian.len()).map(|j| element(i, j)).collect()).collect()
}

/// Lower triangle L with L L' = M for a symmetric positive definite matrix.
///
/// # Errors
/// `correlation_impossible` when M is not square, singular or not positive definite, to within rounding.
pub fn cholesky(matrix: &[Vec<f64>]) -> Result<Matrix, Problem> {
    check_square(matrix)?;
    let size = matrix.len();
    let mut lower = vec![vec![0.0; size]; size];
    for j in 0..size {
        let remaining = matrix[j][j] - sum(lower[j][..j].iter().map(|l| l * l));
        let independent = remaining > tolerance(size) * matrix[j][j];
        if !independent {
            return Err(impossible(format!("Quantity {} is wholly determined by those before it.", j + 1)));
        }
        let pivot = sqrt(remaining);
        lower[j][j] = pivot;
        for i in j + 1..size {
            lower[i][j] = (matrix[i][j] - dot(&lower[i][..j], &lower[j][..j])) / pivot;
        }
    }
    Ok(lower)
}

/// B with B B' = M for a covariance matrix, which may be singular: B times independent draws has this covariance.
///
/// The Cholesky factor of the correlation matrix, the largest remaining variance first, so that rounding stays
/// harmless; columns stand in that order, and those left without variance are zero.
///
/// # Source
/// JCGM 102:2011, 6.5.4 and 6.5.5 (multivariate normal); N. J. Higham, Analysis of the Cholesky decomposition of a
/// semi-definite matrix, in: Reliable Numerical Computation (Oxford, 1990) 161-185 (order of pivots).
///
/// # Errors
/// `correlation_impossible` when M is not square or has a negative direction beyond rounding.
pub fn covariance_factor(covariance: &[Vec<f64>]) -> Result<Matrix, Problem> {
    check_square(covariance)?;
    let size = covariance.len();
    let deviations: Vec<f64> = (0..size).map(|i| sqrt(covariance[i][i])).collect();
    let mut remaining = correlations(covariance, &deviations)?;
    let mut factor = vec![vec![0.0; size]; size];
    for column in 0..size {
        let Some(pivot) = largest_diagonal(&remaining).filter(|k| remaining[*k][*k] > tolerance(size)) else { break };
        let root = sqrt(remaining[pivot][pivot]);
        let step: Vec<f64> = (0..size).map(|i| remaining[i][pivot] / root).collect();
        for (i, row) in factor.iter_mut().enumerate() {
            row[column] = step[i] * deviations[i];
            (0..size).for_each(|j| remaining[i][j] -= step[i] * step[j]);
        }
        // Exactly nothing is left of the pivot's own row.
        (0..size).for_each(|i| (remaining[i][pivot], remaining[pivot][i]) = (0.0, 0.0));
    }
    match remaining.iter().position(|row| !row.iter().all(|left| left.abs() <= 2.0 * tolerance(size))) {
        Some(row) => Err(contradictory(row)),
        None => Ok(factor),
    }
}

/// Correlation matrix, with zero rows for quantities without variance; those may not covary with any other.
fn correlations(covariance: &[Vec<f64>], deviations: &[f64]) -> Result<Matrix, Problem> {
    let mut matrix = covariance.to_vec();
    for (i, row) in matrix.iter_mut().enumerate() {
        for (j, entry) in row.iter_mut().enumerate() {
            let scale = deviations[i] * deviations[j];
            *entry = match (i == j, scale > 0.0) {
                (true, true) => 1.0,
                (false, true) => *entry / scale,
                // Without variance there is nothing to share; a negative variance has no scale at all.
                (_, false) if scale == 0.0 && *entry == 0.0 => 0.0,
                (_, false) => return Err(contradictory(i)),
            };
        }
    }
    Ok(matrix)
}

/// The first of the largest diagonal elements.
fn largest_diagonal(matrix: &[Vec<f64>]) -> Option<usize> {
    (0..matrix.len()).fold(None, |best: Option<usize>, k| match best {
        Some(index) if matrix[k][k] <= matrix[index][index] => best,
        _ => Some(k),
    })
}

/// What rounding leaves of a correlation matrix of this size.
fn tolerance(size: usize) -> f64 {
    64.0 * f64::EPSILON * size as f64
}

fn check_square(matrix: &[Vec<f64>]) -> Result<(), Problem> {
    let size = matrix.len();
    match matrix.iter().find(|row| row.len() != size) {
        Some(row) => Err(impossible(format!("A covariance matrix has {size} rows, but {} entries in one.", row.len()))),
        None => Ok(()),
    }
}

fn contradictory(row: usize) -> Problem {
    impossible(format!(
        "The stated covariances contradict each other: no quantity {} could have all of its own.",
        row + 1
    ))
    .hint("correlation coefficients rounded too far can cause this; state more of their digits")
}

fn impossible(message: String) -> Problem {
    Problem::new(Code::CorrelationImpossible, message)
}

/// x with M x = b for a symmetric positive definite matrix.
///
/// # Errors
/// Those of [`cholesky`].
pub fn solve_symmetric(matrix: &[Vec<f64>], b: &[f64]) -> Result<Vec<f64>, Problem> {
    let lower = cholesky(matrix)?;
    Ok(solve_upper(&transpose(&lower), &solve_lower(&lower, b)))
}

/// x with L x = b, L lower triangular; nothing beyond the shorter of the two.
pub fn solve_lower(lower: &[Vec<f64>], b: &[f64]) -> Vec<f64> {
    let mut x: Vec<f64> = Vec::with_capacity(b.len());
    for (i, (row, right)) in lower.iter().zip(b).enumerate() {
        x.push((right - dot(row, &x)) / row[i]);
    }
    x
}

/// x with U x = b, U upper triangular and square.
pub fn solve_upper(upper: &[Vec<f64>], b: &[f64]) -> Vec<f64> {
    let mut x = b.to_vec();
    for (i, row) in upper.iter().enumerate().take(b.len()).rev() {
        x[i] = (x[i] - dot(&row[i + 1..], &x[i + 1..])) / row[i];
    }
    x
}

#[cfg(test)]
mod tests {
    use super::*;
    use proptest::prelude::*;

    #[test]
    fn products() {
        let (a, b) = (vec![vec![1.0, 2.0], vec![3.0, 4.0]], vec![vec![0.0, 1.0], vec![1.0, 1.0]]);
        assert_eq!(product(&a, &b), [[2.0, 3.0], [4.0, 7.0]]);
        assert_eq!(bilinear(&[1.0, 1.0], &a, &[1.0, -1.0]), -2.0);
        assert_eq!(propagate(&[vec![1.0, 1.0]], &[vec![4.0, 1.0], vec![1.0, 9.0]]), [[15.0]]);
        assert!(transpose(&[]).is_empty());
    }

    #[test]
    fn fully_correlated_quantities_have_a_factor() {
        let factor = covariance_factor(&[vec![4.0, 4.0, 2.0], vec![4.0, 4.0, 2.0], vec![2.0, 2.0, 5.0]]).unwrap();
        let exact = [[2.0, 0.0, 0.0], [2.0, 0.0, 0.0], [1.0, 2.0, 0.0]];
        for (row, exact) in factor.iter().zip(exact) {
            assert!(row.iter().zip(exact).all(|(x, y)| (x - y).abs() < 1e-15), "{factor:?}");
        }
        assert_eq!(covariance_factor(&[vec![0.0, 0.0], vec![0.0, 1.0]]).unwrap(), [[0.0, 0.0], [1.0, 0.0]]);
        assert!(covariance_factor(&[]).unwrap().is_empty());
    }

    #[test]
    fn unlike_units_do_not_hide_a_variance() {
        let factor = covariance_factor(&[vec![1e10, 0.0], vec![0.0, 1e-30]]).unwrap();
        assert_eq!(factor, [[1e5, 0.0], [0.0, 1e-15]]);
    }

    #[test]
    fn impossible_correlations_are_refused() {
        let over_one = [vec![1.0, 1.1], vec![1.1, 1.0]];
        let circle = [vec![1.0, 0.9, -0.9], vec![0.9, 1.0, 0.9], vec![-0.9, 0.9, 1.0]];
        let without_variance = [vec![0.0, 0.5], vec![0.5, 1.0]];
        let negative = [vec![-1.0]];
        let ragged = [vec![1.0, 0.0]];
        let undefined = [vec![f64::NAN]];
        for matrix in [&over_one[..], &circle, &without_variance, &negative, &ragged, &undefined] {
            assert_eq!(covariance_factor(matrix).unwrap_err().code, Code::CorrelationImpossible);
            assert_eq!(cholesky(matrix).unwrap_err().code, Code::CorrelationImpossible);
        }
        assert!(solve_symmetric(&[vec![1.0, 1.0], vec![1.0, 1.0]], &[1.0, 1.0]).is_err());
    }

    proptest! {
        #[test]
        fn the_factor_gives_the_matrix_back(
            entries in prop::collection::vec(-2.0f64..2.0, 12), b in prop::collection::vec(-1.0f64..1.0, 4)
        ) {
            // Rank 3 in four dimensions, then made definite.
            let root: Matrix = entries.chunks(3).map(<[f64]>::to_vec).collect();
            let mut matrix = product(&root, &transpose(&root));
            let lower = covariance_factor(&matrix).unwrap();
            let again = product(&lower, &transpose(&lower));
            for (row, row_again) in matrix.iter().zip(&again) {
                for (x, y) in row.iter().zip(row_again) {
                    prop_assert!((x - y).abs() < 1e-11);
                }
            }
            (0..4).for_each(|i| matrix[i][i] += 1.0);
            let x = solve_symmetric(&matrix, &b).unwrap();
            for (left, right) in times_vector(&matrix, &x).iter().zip(&b) {
                prop_assert!((left - right).abs() < 1e-12);
            }
        }
    }
}
