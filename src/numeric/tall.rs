//! Orthogonal triangular form of a very tall matrix, block of rows by block of rows.
//!
//! # Source    J. Demmel, L. Grigori, M. Hoemmen, J. Langou, SIAM J. Sci. Comput. 34 (2012) A206-A239 (recalled).
//! # Formula   A_b = Q_b R_b for each block b;  [R_1; R_2; …] = Q R;  A = diag(Q_b) Q R
//!
//! A block fits into the memory next to the processor, and blocks are worked on side by side. They have a fixed number
//! of rows and are joined in order, so the digits depend on nothing but the rows.

use super::householder::{Dependent, Triangular};
use rayon::prelude::*;
use std::ops::Range;

/// Rows in a block.
pub const BLOCK: usize = 4096;

/// A tall matrix decomposed.
pub struct Tall {
    blocks: Vec<(Range<usize>, Triangular)>,
    top: Triangular,
    /// Columns of the matrix.
    width: usize,
}

impl Tall {
    /// Decomposes the matrix with these columns, each row times its root of weight.
    pub fn new(columns: &[&[f64]], roots: &[f64]) -> Result<Tall, Dependent> {
        let width = columns.len();
        let blocks: Vec<(Range<usize>, Triangular)> = spans(roots.len(), width)
            .into_par_iter()
            .map(|rows| {
                let part = |column: &&[f64]| -> Vec<f64> {
                    column[rows.clone()].iter().zip(&roots[rows.clone()]).map(|(x, root)| x * root).collect()
                };
                let made = Triangular::without_check(columns.iter().map(part).collect());
                (rows, made)
            })
            .collect();
        let mut stacked = vec![Vec::with_capacity(blocks.len() * width); width];
        for (_, block) in &blocks {
            for (j, column) in stacked.iter_mut().enumerate() {
                column.extend(block.unscaled_column(j, width));
            }
        }
        Ok(Tall { top: Triangular::new(stacked)?, blocks, width })
    }

    /// The triangle of the whole.
    pub fn triangle(&self) -> &Triangular {
        &self.top
    }

    /// Coefficients of the columns for a right-hand side already times its roots of weight.
    pub fn solve(&self, y: &[f64]) -> Vec<f64> {
        let parts: Vec<Vec<f64>> = self
            .blocks
            .par_iter()
            .map(|(rows, block)| {
                let mut part = y[rows.clone()].to_vec();
                block.apply_transposed(&mut part);
                part.truncate(self.width);
                part
            })
            .collect();
        let mut stacked = parts.concat();
        self.top.apply_transposed(&mut stacked);
        self.top.solve(&stacked)
    }

    /// D R^-1 Q' times the roots of weight: the response of each coefficient to every row.
    pub fn response(&self, roots: &[f64]) -> Vec<Vec<f64>> {
        let across = self.top.orthonormal_columns(self.blocks.len() * self.width);
        let mut response = vec![vec![0.0; roots.len()]; self.width];
        self.blocks.par_iter().zip(self.shares(&mut response)).enumerate().for_each(
            |(index, ((rows, block), share))| {
                // Row j of the block's part of Q, seen through D R^-1.
                let through: Vec<Vec<f64>> = (0..self.width)
                    .map(|j| {
                        let row: Vec<f64> = across.iter().map(|column| column[index * self.width + j]).collect();
                        self.top.solve(&row)
                    })
                    .collect();
                let orthonormal = block.orthonormal_columns(rows.len());
                for (k, row) in share.into_iter().enumerate() {
                    combine(&orthonormal, &through, k, &roots[rows.clone()], row);
                }
            },
        );
        response
    }

    /// The part of each row that belongs to each block.
    fn shares<'r>(&self, rows: &'r mut [Vec<f64>]) -> Vec<Vec<&'r mut [f64]>> {
        let mut shares: Vec<Vec<&'r mut [f64]>> = self.blocks.iter().map(|_| Vec::with_capacity(self.width)).collect();
        for row in rows {
            let mut rest = row.as_mut_slice();
            for (share, (rows, _)) in shares.iter_mut().zip(&self.blocks) {
                let (part, behind) = rest.split_at_mut(rows.len());
                share.push(part);
                rest = behind;
            }
        }
        shares
    }
}

/// Adds Σ_j q_j through_jk to a row of zeros, then multiplies by the roots.
fn combine(orthonormal: &[Vec<f64>], through: &[Vec<f64>], k: usize, roots: &[f64], row: &mut [f64]) {
    for (column, weights) in orthonormal.iter().zip(through) {
        row.iter_mut().zip(column).for_each(|(sum, q)| *sum += weights[k] * q);
    }
    row.iter_mut().zip(roots).for_each(|(entry, root)| *entry *= root);
}

/// Blocks of rows; the last takes what would be less than the width.
fn spans(rows: usize, width: usize) -> Vec<Range<usize>> {
    let count = (rows / BLOCK.max(width)).max(1);
    let size = BLOCK.max(width);
    (0..count).map(|index| index * size..if index + 1 == count { rows } else { (index + 1) * size }).collect()
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::numeric::least_squares::fit;

    /// Columns as a sweep has them: a block of one direction alone cannot tell the first two apart.
    fn columns(rows: usize) -> (Vec<Vec<f64>>, Vec<f64>) {
        let sign = |i: usize| if (i / 5000).is_multiple_of(2) { 1.0 } else { -1.0 };
        let z = |i: usize| (i % 5000) as f64 / 2500.0 - 1.0;
        let speed = (0..rows).map(sign).collect();
        let ones = vec![1.0; rows];
        let shape = (0..rows).map(|i| sign(i) * z(i) * z(i)).collect();
        let y = (0..rows).map(|i| sign(i) * (540.0 - 3.0 * z(i) * z(i)) + 0.2 + 1e-3 * libm::sin(i as f64)).collect();
        (vec![speed, ones, shape], y)
    }

    #[test]
    fn many_blocks_agree_with_one() {
        let (columns, y) = columns(23_001);
        let references: Vec<&[f64]> = columns.iter().map(Vec::as_slice).collect();
        let roots: Vec<f64> = (0..y.len()).map(|i| 1.0 + 0.5 * libm::cos(i as f64)).collect();
        let weights: Vec<f64> = roots.iter().map(|root| root * root).collect();
        let found = fit(&references, &y, Some(&weights)).expect("a fit");
        let weighted = |column: &[f64]| -> Vec<f64> { column.iter().zip(&roots).map(|(x, root)| x * root).collect() };
        let whole = Triangular::new(references.iter().map(|column| weighted(column)).collect()).expect("independent");
        let mut reflected = weighted(&y);
        whole.apply_transposed(&mut reflected);
        for (one, many) in whole.solve(&reflected).iter().zip(&found.coefficients) {
            assert!((one / many - 1.0).abs() < 1e-11, "{one} {many}");
        }
        let response = whole.solve_rows(whole.orthonormal_columns(y.len()));
        for (one, many) in response.iter().zip(&found.jacobian) {
            for row in 0..y.len() {
                assert!((one[row] * roots[row] - many[row]).abs() < 1e-15, "{row}");
            }
        }
        let leverage: f64 = found.leverages.iter().sum();
        assert!((leverage - 3.0).abs() < 1e-10, "{leverage}");
    }

    #[test]
    fn a_dependent_column_of_many_blocks_is_named() {
        let (mut columns, y) = columns(20_000);
        let third = columns[0].iter().zip(&columns[2]).map(|(a, b)| 2.0 * a - b).collect();
        columns.push(third);
        let references: Vec<&[f64]> = columns.iter().map(Vec::as_slice).collect();
        let problem = fit(&references, &y, None).expect_err("dependent");
        assert!(problem.message.contains("term 4"), "{}", problem.message);
    }
}
