//! Linear least squares, with the response of its coefficients to every reading and every design entry.
//!
//! # Formula
//! With the design A, weights W and C = (A' W A)^-1:
//!
//! ```text
//! beta = C A' W y                      coefficients
//! J    = C A' W                        d beta / d y
//! d beta_k / d A_ic = -J_ki beta_c + C_kc w_i r_i
//! ```
//!
//! The last line is the differential of the normal equations A' W (y - A beta) = 0. They serve to derive it only: all
//! is computed from the triangular form of the weighted design, which keeps twice the digits.

use super::elementary::sqrt;
use super::householder::{Dependent, Triangular};
use super::sum::{dot, sum};
use super::tall::{BLOCK, Tall};
use crate::diagnostic::{Code, Problem};
use rayon::prelude::*;

/// A linear fit.
#[derive(Debug, Clone, PartialEq)]
pub struct Fit {
    /// Coefficients, in the order of the columns.
    pub coefficients: Vec<f64>,
    /// (A' W A)^-1: times the variance of unit weight it is the covariance of the coefficients.
    pub unscaled_covariance: Vec<Vec<f64>>,
    /// Readings less fitted values.
    pub residuals: Vec<f64>,
    /// Σ w_i r_i².
    pub residual_sum_of_squares: f64,
    /// Rows less columns.
    pub degrees_of_freedom: f64,
    /// d coefficient_k / d y_i, one row per coefficient.
    pub jacobian: Vec<Vec<f64>>,
    /// Share of each reading in its own fitted value, between 0 and 1.
    pub leverages: Vec<f64>,
    /// The weights used; ones when none were given.
    pub weights: Vec<f64>,
}

impl Fit {
    /// Residual variance of unit weight; none without degrees of freedom.
    pub fn residual_variance(&self) -> Option<f64> {
        (self.degrees_of_freedom > 0.0).then(|| self.residual_sum_of_squares / self.degrees_of_freedom)
    }

    /// d coefficient_k / d A_ic for one column c: one row per coefficient; empty if there is no such column.
    pub fn design_response(&self, column: usize) -> Vec<Vec<f64>> {
        let Some(&coefficient) = self.coefficients.get(column) else { return Vec::new() };
        let weighted: Vec<f64> = self.weights.iter().zip(&self.residuals).map(|(w, r)| w * r).collect();
        self.jacobian
            .iter()
            .zip(&self.unscaled_covariance)
            .map(|(row, covariance)| {
                let shared = covariance.get(column).copied().unwrap_or(0.0);
                row.iter().zip(&weighted).map(|(j, wr)| shared * wr - j * coefficient).collect()
            })
            .collect()
    }
}

/// Fits y by a linear combination of the columns; weights are reciprocal variances up to a common factor.
///
/// # Errors
/// `design_incomplete` when lengths differ, there are fewer rows than columns, a weight is not positive, an entry is
/// not finite, or a column depends on those before it (the message names its place, from one).
pub fn fit(columns: &[&[f64]], y: &[f64], weights: Option<&[f64]>) -> Result<Fit, Problem> {
    check_shape(columns, y, weights)?;
    let weights = weights.map_or_else(|| vec![1.0; y.len()], <[f64]>::to_vec);
    let roots: Vec<f64> = weights.par_iter().with_min_len(BLOCK).map(|weight| sqrt(*weight)).collect();
    let weighted = |column: &[f64]| -> Vec<f64> { column.iter().zip(&roots).map(|(x, root)| x * root).collect() };
    let solved = if y.len() >= 2 * BLOCK {
        solve_tall(columns, &weighted(y), &roots)?
    } else {
        solve(columns.iter().map(|column| weighted(column)).collect(), weighted(y), &roots)?
    };
    let residuals = residuals(columns, y, &solved.coefficients);
    Ok(Fit {
        residual_sum_of_squares: sum(residuals.iter().zip(&weights).map(|(r, w)| w * r * r)),
        degrees_of_freedom: (y.len() - columns.len()) as f64,
        unscaled_covariance: solved.unscaled_covariance,
        leverages: solved.leverages,
        jacobian: solved.jacobian,
        coefficients: solved.coefficients,
        residuals,
        weights,
    })
}

/// What the triangular form gives.
struct Solved {
    coefficients: Vec<f64>,
    unscaled_covariance: Vec<Vec<f64>>,
    jacobian: Vec<Vec<f64>>,
    leverages: Vec<f64>,
}

/// From the weighted design and readings, in one piece.
fn solve(design: Vec<Vec<f64>>, mut reflected: Vec<f64>, roots: &[f64]) -> Result<Solved, Problem> {
    let size = design.len();
    let triangular = Triangular::new(design).map_err(dependent)?;
    triangular.apply_transposed(&mut reflected);
    let orthonormal = triangular.orthonormal_columns(roots.len());
    Ok(Solved {
        coefficients: triangular.solve(&reflected),
        unscaled_covariance: unscaled_covariance(&triangular, size),
        leverages: (0..roots.len()).map(|i| orthonormal.iter().map(|q| q[i] * q[i]).fold(0.0, |a, b| a + b)).collect(),
        jacobian: jacobian(&triangular, orthonormal, roots),
    })
}

/// The same block by block, for many rows.
fn solve_tall(columns: &[&[f64]], weighted_y: &[f64], roots: &[f64]) -> Result<Solved, Problem> {
    let tall = Tall::new(columns, roots).map_err(dependent)?;
    let jacobian = tall.response(roots);
    let leverage =
        |i: usize| columns.iter().zip(&jacobian).map(|(column, row)| column[i] * row[i]).fold(0.0, |a, b| a + b);
    Ok(Solved {
        coefficients: tall.solve(weighted_y),
        unscaled_covariance: unscaled_covariance(tall.triangle(), columns.len()),
        leverages: (0..roots.len()).into_par_iter().map(leverage).collect(),
        jacobian,
    })
}

/// y - A beta, each summed with compensation.
fn residuals(columns: &[&[f64]], y: &[f64], coefficients: &[f64]) -> Vec<f64> {
    let fitted = |i: usize| columns.iter().zip(coefficients).map(move |(column, beta)| -column[i] * beta);
    let residual = |i: usize| sum(std::iter::once(y[i]).chain(fitted(i)));
    (0..y.len()).into_par_iter().with_min_len(BLOCK).map(residual).collect()
}

/// D R^-1 Q' W^1/2.
fn jacobian(triangular: &Triangular, orthonormal: Vec<Vec<f64>>, roots: &[f64]) -> Vec<Vec<f64>> {
    let mut rows = triangular.solve_rows(orthonormal);
    rows.iter_mut().for_each(|row| row.iter_mut().zip(roots).for_each(|(entry, root)| *entry *= root));
    rows
}

/// (D R^-1)(D R^-1)', exactly symmetric.
fn unscaled_covariance(triangular: &Triangular, size: usize) -> Vec<Vec<f64>> {
    let unit = |j: usize| -> Vec<f64> { (0..size).map(|i| f64::from(u8::from(i == j))).collect() };
    let inverse_columns: Vec<Vec<f64>> = (0..size).map(|j| triangular.solve(&unit(j))).collect();
    let rows: Vec<Vec<f64>> = (0..size).map(|k| inverse_columns.iter().map(|column| column[k]).collect()).collect();
    rows.iter().map(|a| rows.iter().map(|b| dot(a, b)).collect()).collect()
}

fn dependent(Dependent(index): Dependent) -> Problem {
    incomplete(format!(
        "The fit cannot separate its terms: term {} is a combination of those before it at the points measured.",
        index + 1
    ))
    .hint("leave the term out, or measure at more different points")
}

fn incomplete(message: String) -> Problem {
    Problem::new(Code::DesignIncomplete, message)
}

fn check_shape(columns: &[&[f64]], y: &[f64], weights: Option<&[f64]>) -> Result<(), Problem> {
    let rows = y.len();
    if columns.is_empty() || rows < columns.len() {
        return Err(incomplete(format!("A fit of {} terms has {rows} readings; it needs as many.", columns.len())));
    }
    if let Some(odd) = columns.iter().copied().chain(weights).find(|list| list.len() != rows) {
        return Err(incomplete(format!("A fit has {rows} readings, but {} entries beside them.", odd.len())));
    }
    let odd = |column: &[f64]| column.iter().any(|entry| !entry.is_finite());
    let any_odd = if rows >= 2 * BLOCK {
        columns.par_iter().any(|column| odd(column))
    } else {
        columns.iter().any(|column| odd(column))
    };
    if any_odd || odd(y) {
        return Err(incomplete("A fit meets an entry that is not a finite number.".into()));
    }
    match weights.unwrap_or(&[]).iter().find(|weight| !(weight.is_finite() && **weight > 0.0)) {
        Some(weight) => Err(incomplete(format!("A fit has the weight {weight}; weights must be positive."))),
        None => Ok(()),
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use nalgebra::{DMatrix, DVector};
    use proptest::prelude::*;

    /// JCGM 100:2008, H.3: calibration line of a thermometer, printed digits, then the same in full.
    #[test]
    fn thermometer_line_as_printed() {
        let t = [21.521, 22.012, 22.512, 23.003, 23.507, 23.999, 24.513, 25.002, 25.503, 26.010, 26.511];
        let b = [-0.171, -0.169, -0.166, -0.159, -0.164, -0.165, -0.156, -0.157, -0.159, -0.161, -0.160];
        let (ones, from_20) = ([1.0; 11], t.map(|t| t - 20.0));
        let fit = fit(&[&ones, &from_20], &b, None).unwrap();
        let (y, c, s2) = (&fit.coefficients, &fit.unscaled_covariance, fit.residual_variance().unwrap());
        let u = [(c[0][0] * s2).sqrt(), (c[1][1] * s2).sqrt()];
        let r = c[0][1] / (c[0][0] * c[1][1]).sqrt();
        let b_30 = y[0] + 10.0 * y[1];
        let u_30 = ((c[0][0] + 20.0 * c[0][1] + 100.0 * c[1][1]) * s2).sqrt();
        let printed = [
            (y[0], -0.1712, 4, -0.171_203_790_131_3),
            (y[1], 0.002_18, 5, 0.002_182_697_739_887),
            (u[0], 0.0029, 4, 0.002_877_597_835_16),
            (u[1], 0.000_67, 5, 0.000_667_938_773_227_8),
            (r, -0.930, 3, -0.930_429_603_093_4),
            (s2.sqrt(), 0.0035, 4, 0.003_497_563_963_505),
            (b_30, -0.1494, 4, -0.149_376_812_732_5),
            (u_30, 0.0041, 4, 0.004_138_595_752_855),
        ];
        for (ours, printed, places, full) in printed {
            assert!((ours - printed).abs() <= 0.5 * libm::exp10(-f64::from(places)), "{ours} {printed}");
            assert!((ours / full - 1.0).abs() < 1e-11, "{ours} {full}");
        }
        assert_eq!(fit.degrees_of_freedom, 9.0);
        assert!((fit.leverages.iter().sum::<f64>() - 2.0).abs() < 1e-14);
    }

    /// Cubic through x = 100 to 110, not centred: condition 2e12. Coefficients are exact fractions.
    #[test]
    fn ill_conditioned_cubic() {
        let x: Vec<f64> = (100..=110).map(f64::from).collect();
        let powers: Vec<Vec<f64>> =
            (0..4).map(|k| x.iter().map(|x| (0..k).fold(1.0, |p, _| p * x)).collect()).collect();
        let columns: Vec<&[f64]> = powers.iter().map(Vec::as_slice).collect();
        let fit = fit(&columns, &[3.0, -1.0, 4.0, 1.0, -5.0, 9.0, 2.0, -6.0, 5.0, 3.0, 5.0], None).unwrap();
        let exact = [-16150.710955710956, 472.61732711732714, -4.606643356643357, 0.014957264957264958];
        for (ours, exact) in fit.coefficients.iter().zip(exact) {
            assert!((ours / exact - 1.0).abs() < 1e-7, "{ours} {exact}");
        }
    }

    #[test]
    fn a_dependent_term_is_named() {
        let problem = fit(&[&[1.0; 4], &[1.0, 2.0, 3.0, 4.0], &[3.0, 5.0, 7.0, 9.0]], &[0.0; 4], None).unwrap_err();
        assert_eq!(problem.code, Code::DesignIncomplete);
        assert!(problem.message.contains("term 3"), "{}", problem.message);
    }

    #[test]
    fn faulty_input_is_refused() {
        let ones: &[f64] = &[1.0; 3];
        for (columns, y, weights) in [
            (vec![], vec![1.0], None),
            (vec![ones; 4], vec![1.0; 3], None),
            (vec![ones], vec![1.0; 4], None),
            (vec![ones], vec![f64::NAN; 3], None),
            (vec![ones], vec![1.0; 3], Some(&[1.0, 0.0, 1.0][..])),
            (vec![ones], vec![1.0; 3], Some(&[1.0][..])),
        ] {
            assert_eq!(fit(&columns, &y, weights).unwrap_err().code, Code::DesignIncomplete);
        }
    }

    #[test]
    fn a_single_reading_is_its_own_fit() {
        let fit = fit(&[&[2.0]], &[3.0], None).unwrap();
        assert_eq!((fit.coefficients, fit.degrees_of_freedom), (vec![1.5], 0.0));
    }

    #[test]
    fn three_thousand_rows() {
        let time: Vec<f64> = (0..3000).map(|i| f64::from(i) / 3000.0).collect();
        let columns: Vec<Vec<f64>> =
            (0..8).map(|k| time.iter().map(|t| libm::cos(f64::from(k) * t)).collect()).collect();
        let y: Vec<f64> = time.iter().map(|t| 3.0 + libm::cos(5.0 * t)).collect();
        let fit = fit(&columns.iter().map(Vec::as_slice).collect::<Vec<_>>(), &y, None).unwrap();
        assert!((fit.coefficients[5] - 1.0).abs() < 1e-3, "{:?}", fit.coefficients);
        assert!(fit.residuals.iter().all(|r| r.abs() < 1e-13));
    }

    /// A random problem of 9 rows and 3 columns with weights.
    fn problem() -> impl Strategy<Value = (Vec<Vec<f64>>, Vec<f64>, Vec<f64>)> {
        let entries = |count| prop::collection::vec(-1.0f64..1.0, count);
        (prop::collection::vec(entries(9), 3), entries(9), prop::collection::vec(0.1f64..10.0, 9))
    }

    fn fitted(columns: &[Vec<f64>], y: &[f64], weights: &[f64]) -> Fit {
        fit(&columns.iter().map(Vec::as_slice).collect::<Vec<_>>(), y, Some(weights)).unwrap()
    }

    fn is_well_conditioned(fit: &Fit) -> bool {
        (0..3).all(|k| fit.unscaled_covariance[k][k] < 100.0)
    }

    proptest! {
        #[test]
        fn agrees_with_another_library((columns, y, weights) in problem()) {
            let ours = fitted(&columns, &y, &weights);
            prop_assume!(is_well_conditioned(&ours));
            let root = |i: usize| weights[i].sqrt();
            let design = DMatrix::from_fn(9, 3, |i, j| columns[j][i] * root(i));
            let qr = design.qr();
            let inverse = qr.r().try_inverse().unwrap() * qr.q().transpose();
            let theirs = &inverse * DVector::from_fn(9, |i, _| y[i] * root(i));
            let covariance = &inverse * inverse.transpose();
            for k in 0..3 {
                prop_assert!((ours.coefficients[k] - theirs[k]).abs() < 1e-11);
                for c in 0..3 {
                    prop_assert!((ours.unscaled_covariance[k][c] - covariance[(k, c)]).abs() < 1e-10);
                    prop_assert_eq!(ours.unscaled_covariance[k][c], ours.unscaled_covariance[c][k]);
                }
                for i in 0..9 {
                    prop_assert!((ours.jacobian[k][i] - inverse[(k, i)] * root(i)).abs() < 1e-11);
                }
            }
        }

        #[test]
        fn responses_agree_with_differences((columns, y, weights) in problem(), row in 0usize..9, column in 0usize..3) {
            let centre = fitted(&columns, &y, &weights);
            prop_assume!(is_well_conditioned(&centre));
            let step = 1e-6;
            let moved = |sign: f64| {
                let mut columns = columns.clone();
                columns[column][row] += sign * step;
                fitted(&columns, &y, &weights).coefficients
            };
            let (up, down, response) = (moved(1.0), moved(-1.0), centre.design_response(column));
            for k in 0..3 {
                let difference = (up[k] - down[k]) / (2.0 * step);
                prop_assert!((response[k][row] - difference).abs() < 1e-6 * (1.0 + difference.abs()), "{} {}", response[k][row], difference);
            }
        }
    }
}
