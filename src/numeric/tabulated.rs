//! Slow quantiles as piecewise polynomials in the normal quantile.
//!
//! A distribution's quantile is a smooth function of the normal quantile z at the same probability, in the tails too.
//! A table of it costs a few hundred evaluations once and a polynomial a draw.
//!
//! # Formula
//! On each cell the polynomial through the roots of the Chebyshev polynomial T_n; its error is greatest near the ends
//! of the cell, and there every cell is checked.

use super::elementary::cos;
use super::gamma::gamma_quantile_of_tails;
use super::normal::{normal_cdf, normal_central};
use super::student_t::quantile_of_halves;
use std::f64::consts::PI;

/// Uniform draws are at least 2^-53 from 0 and 1, where the normal quantile is 8.21.
const END: f64 = 8.25;

/// Coefficients of a cell's polynomial.
const TERMS: usize = 10;

/// The greatest relative departure from the quantile itself.
const TOLERANCE: f64 = 5e-14;

/// A smooth function of the normal quantile that has no zero.
#[derive(Debug, Clone)]
struct Table {
    from: f64,
    /// Cells to a unit of z.
    fineness: f64,
    cells: Vec<Polynomial>,
}

/// Coefficients, highest power first, in a variable that goes from -1 to 1.
type Polynomial = [f64; TERMS];

impl Table {
    /// The coarsest table of `function` that meets it everywhere.
    fn new(from: f64, function: impl Fn(f64) -> f64) -> Option<Table> {
        [8.0, 16.0, 32.0].into_iter().find_map(|fineness| {
            let cells = (0..((END - from) * fineness) as usize).map(|cell| {
                let at = |s: f64| function(from + (cell as f64 + 0.5 * (s + 1.0)) / fineness);
                let polynomial = polynomial(at);
                let is_close = |s: f64| (value(&polynomial, s) - at(s)).abs() <= TOLERANCE * at(s).abs();
                [-0.999, 0.999].into_iter().all(is_close).then_some(polynomial)
            });
            Some(Table { from, fineness, cells: cells.collect::<Option<_>>()? })
        })
    }

    fn at(&self, z: f64) -> f64 {
        let cells = (z - self.from) * self.fineness;
        let index = (cells as usize).min(self.cells.len() - 1);
        value(&self.cells[index], 2.0 * (cells - index as f64) - 1.0)
    }
}

fn value(polynomial: &Polynomial, s: f64) -> f64 {
    polynomial.iter().fold(0.0, |sum, coefficient| sum * s + coefficient)
}

/// The polynomial that meets `function` at the roots of a Chebyshev polynomial.
fn polynomial(function: impl Fn(f64) -> f64) -> Polynomial {
    // cos(k π / 2n); whole turns taken off, so that large multiples are as exact as small ones.
    let cosine = |k: usize| cos((k % (4 * TERMS)) as f64 * PI / (2 * TERMS) as f64);
    let values: Polynomial = std::array::from_fn(|node| function(cosine(2 * node + 1)));
    let weight = |degree: usize| {
        let sum: f64 = (0..TERMS).map(|node| values[node] * cosine(degree * (2 * node + 1))).sum();
        sum * if degree == 0 { 1.0 } else { 2.0 } / TERMS as f64
    };
    // T_0 = 1, T_1 = s, T_(n+1) = 2 s T_n - T_(n-1), lowest power first.
    let (mut before, mut now, mut sum) = ([0.0; TERMS], [0.0; TERMS], [0.0; TERMS]);
    now[0] = 1.0;
    for degree in 0..TERMS {
        let weight = weight(degree);
        sum.iter_mut().zip(&now).for_each(|(sum, term)| *sum += weight * term);
        let factor = if degree == 0 { 1.0 } else { 2.0 };
        let times_s = |power: usize| power.checked_sub(1).map_or(0.0, |lower: usize| factor * now[lower]);
        (before, now) = (now, std::array::from_fn(|power| times_s(power) - before[power]));
    }
    sum.reverse();
    sum
}

/// Draws of the t distribution from normal ones.
#[derive(Debug, Clone)]
pub struct StudentT {
    /// t / z by |z|.
    ratio: Table,
}

impl StudentT {
    /// With `nu` degrees of freedom; none where the table is not as good as the quantile.
    pub fn new(nu: f64) -> Option<StudentT> {
        Table::new(0.0, |z| quantile_of_halves(normal_central(z), normal_cdf(-z), nu) / z)
            .map(|ratio| StudentT { ratio })
    }

    /// The t quantile at the probability where the normal one is `z`; relative error below 1e-13.
    pub fn at(&self, z: f64) -> f64 {
        z * self.ratio.at(z.abs())
    }
}

/// Draws of the gamma distribution with unit rate from normal ones.
#[derive(Debug, Clone)]
pub struct Gamma {
    quantile: Table,
}

impl Gamma {
    /// Of this shape; none where the table is not as good as the quantile.
    pub fn new(shape: f64) -> Option<Gamma> {
        let quantile = |z: f64| gamma_quantile_of_tails(shape, normal_cdf(z), normal_cdf(-z));
        Table::new(-END, quantile).map(|quantile| Gamma { quantile })
    }

    /// The gamma quantile at the probability where the normal one is `z`; relative error below 1e-13.
    pub fn at(&self, z: f64) -> f64 {
        self.quantile.at(z)
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::numeric::distribution::{gamma_quantile, normal_quantile, student_t_quantile};
    use proptest::prelude::*;

    #[test]
    fn polynomials_are_found_again() {
        let found = polynomial(|s| 3.0 - s + 0.5 * s * s * s);
        let expected = [0.0, 0.0, 0.0, 0.0, 0.0, 0.0, 0.5, 0.0, -1.0, 3.0];
        assert!(found.iter().zip(&expected).all(|(found, expected)| (found - expected).abs() < 2e-13), "{found:?}");
    }

    #[test]
    fn a_function_that_is_not_smooth_has_no_table() {
        assert!(Table::new(0.0, |z| 1.0 + (z - 3.05).abs()).is_none());
        assert!(StudentT::new(f64::NAN).is_none() && Gamma::new(-1.0).is_none());
    }

    #[test]
    fn degrees_of_freedom_of_the_trade_have_tables() {
        for nu in [2.1, 2.5, 3.0, 4.7, 9.0, 50.0, 1e3, 1e6] {
            assert!(StudentT::new(nu).is_some(), "t with {nu}");
            assert!(Gamma::new(nu / 2.0).is_some(), "gamma with {nu} / 2");
        }
    }

    proptest! {
        #![proptest_config(ProptestConfig::with_cases(32))]
        #[test]
        fn tables_meet_the_quantiles(nu in 2.1f64..200.0, draws in proptest::collection::vec(0.0f64..1.0, 100)) {
            let (t, gamma) = (StudentT::new(nu).unwrap(), Gamma::new(nu / 2.0).unwrap());
            let ends = [f64::EPSILON / 2.0, 1.0 - f64::EPSILON / 2.0, 0.5, 0.5 + f64::EPSILON, 1e-12];
            for u in draws.into_iter().chain(ends).filter(|u| *u > 0.0) {
                let z = normal_quantile(u);
                let (found, exact) = (t.at(z), student_t_quantile(u, nu));
                prop_assert!((found - exact).abs() <= 1e-13 * exact.abs(), "t {nu} at {u}: {found}, {exact}");
                let (found, exact) = (gamma.at(z), gamma_quantile(nu / 2.0, u));
                prop_assert!((found - exact).abs() <= 1e-13 * exact.abs(), "gamma {nu} at {u}: {found}, {exact}");
            }
        }
    }
}
