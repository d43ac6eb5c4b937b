//! What a run of trials says of a measurand: estimate, standard uncertainty, coverage intervals, histogram.
//!
//! # Source   JCGM 101:2008, 7.5 to 7.7 and 5.3.4 (shortest interval).
//! # Formula  y = mean;  u² = Σ (y_r − y)² / (M − 1);  with sorted values y_(1) ≤ … ≤ y_(M) and q = p M:
//!            symmetric [y_(r), y_(r+q)], r = (M − q)/2;  shortest: the r with the least y_(r+q) − y_(r)
//!
//! Variances are sums of squared departures from the mean, never a difference of large squares.

use crate::numeric::sum::{experimental_standard_deviation, mean};
use rayon::slice::ParallelSliceMut;

/// What a run says of one measurand, in its coherent SI unit.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Distributed {
    pub trials: usize,
    pub estimate: f64,
    pub standard_uncertainty: f64,
    pub probability: f64,
    /// Probabilistically symmetric coverage interval.
    pub symmetric: (f64, f64),
    /// Shortest coverage interval.
    pub shortest: (f64, f64),
}

/// Summarises trials; the values are sorted in place.
pub fn distributed(values: &mut [f64], probability: f64) -> Distributed {
    let (estimate, standard_uncertainty) =
        (mean(values).unwrap_or(f64::NAN), experimental_standard_deviation(values).unwrap_or(0.0));
    // Values that compare equal have the same bits, so threads do not show in the order.
    values.par_sort_unstable_by(f64::total_cmp);
    Distributed {
        trials: values.len(),
        estimate,
        standard_uncertainty,
        probability,
        symmetric: symmetric_interval(values, probability),
        shortest: shortest_interval(values, probability),
    }
}

/// How many sorted values the interval spans: p M to the nearest whole number (7.7.1).
fn span(count: usize, probability: f64) -> usize {
    ((probability * count as f64 + 0.5).floor() as usize).clamp(1, count.saturating_sub(1).max(1))
}

/// The probabilistically symmetric interval of sorted values (7.7.2).
fn symmetric_interval(sorted: &[f64], probability: f64) -> (f64, f64) {
    let count = sorted.len();
    if count < 2 {
        return (f64::NAN, f64::NAN);
    }
    let q = span(count, probability);
    let r = ((count - q) as f64 / 2.0 + 0.5).floor() as usize;
    let low = r.saturating_sub(1).min(count - 1 - q);
    (sorted[low], sorted[low + q])
}

/// The shortest interval of sorted values (7.7.4).
fn shortest_interval(sorted: &[f64], probability: f64) -> (f64, f64) {
    let count = sorted.len();
    if count < 2 {
        return (f64::NAN, f64::NAN);
    }
    let q = span(count, probability);
    let width = |low: &usize| sorted[low + q] - sorted[*low];
    let low = (0..count - q).min_by(|a, b| width(a).total_cmp(&width(b))).unwrap_or(0);
    (sorted[low], sorted[low + q])
}

/// Counts of sorted values in equal classes: lower border, upper border, counts.
#[derive(Debug, Clone, PartialEq)]
pub struct Histogram {
    pub from: f64,
    pub to: f64,
    pub counts: Vec<u64>,
}

/// A histogram over the central part of the values that holds all but two in ten thousand.
pub fn histogram(sorted: &[f64], classes: usize) -> Histogram {
    let count = sorted.len();
    let at = |p: f64| sorted.get(((p * count as f64) as usize).min(count.saturating_sub(1))).copied().unwrap_or(0.0);
    let (from, to) = (at(1e-4), at(1.0 - 1e-4));
    let width = (to - from) / classes.max(1) as f64;
    let mut counts = vec![0; classes.max(1)];
    for value in sorted.iter().filter(|value| width > 0.0 && **value >= from && **value <= to) {
        let class = (((value - from) / width) as usize).min(classes - 1);
        counts[class] += 1;
    }
    Histogram { from, to, counts }
}

/// The numerical tolerance of an uncertainty that is to be meaningful to `digits` significant digits:
/// u = c × 10^l with c of that many digits, δ = ½ × 10^l (JCGM 101, 7.9.2).
pub fn numerical_tolerance(standard_uncertainty: f64, digits: usize) -> f64 {
    let rounded = crate::quantity::Decimal::from_f64_15(standard_uncertainty).map(|u| u.rounded_to_digits(digits));
    let power = rounded.and_then(|u| u.leading_power()).map(|lead| lead - digits as i32 + 1);
    power.map_or(0.0, |power| format!("0.5e{power}").parse().unwrap_or(0.0))
}

/// First-order propagation against the distribution found by trials (JCGM 101, clause 8).
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Validation {
    /// The interval of first-order propagation, y ± U.
    pub first_order: (f64, f64),
    /// Differences of the lower and of the upper ends.
    pub low_difference: f64,
    pub high_difference: f64,
    pub tolerance: f64,
}

impl Validation {
    /// Compares y ± U with the interval of the trials: the symmetric one, or the shortest where it is the one stated.
    pub fn new(
        estimate: f64,
        expanded: f64,
        found: (f64, f64),
        standard_uncertainty: f64,
        digits: usize,
    ) -> Validation {
        let first_order = (estimate - expanded, estimate + expanded);
        Validation {
            first_order,
            low_difference: (first_order.0 - found.0).abs(),
            high_difference: (first_order.1 - found.1).abs(),
            tolerance: numerical_tolerance(standard_uncertainty, digits),
        }
    }

    /// Whether first-order propagation is validated.
    pub fn is_valid(&self) -> bool {
        self.low_difference <= self.tolerance && self.high_difference <= self.tolerance
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn intervals_of_a_hundred_values() {
        let mut values: Vec<f64> = (1..=100).rev().map(f64::from).collect();
        let found = distributed(&mut values, 0.9);
        // JCGM 101, 7.7.2: q = 90, r = (100 - 90)/2 = 5: [y_(5), y_(95)].
        assert_eq!(found.symmetric, (5.0, 95.0));
        assert_eq!(found.estimate, 50.5);
    }

    #[test]
    fn the_shortest_interval_leaves_the_long_tail() {
        let mut values: Vec<f64> =
            (1..=1000).map(|index| (f64::from(index) / 1000.0) * (f64::from(index) / 1000.0)).collect();
        let found = distributed(&mut values, 0.95);
        assert!(found.shortest.0 < 1e-5 && found.shortest.1 < found.symmetric.1, "{found:?}");
    }

    #[test]
    fn variance_keeps_its_digits_beside_a_large_value() {
        let mut values: Vec<f64> = (0..1000).map(|index| 1e8 + f64::from(index % 2)).collect();
        let found = distributed(&mut values, 0.95);
        assert!((found.standard_uncertainty - 0.500_250_187_640_69).abs() < 1e-9, "{}", found.standard_uncertainty);
    }

    #[test]
    fn numerical_tolerances_of_the_guide() {
        // JCGM 101, 7.9.2 examples: u = 0.000 32 g with two digits gives δ = 0.000 005 g; u = 2 K with one digit gives 0.5 K.
        assert_eq!(numerical_tolerance(0.000_32, 2), 0.000_005);
        assert_eq!(numerical_tolerance(2.0, 1), 0.5);
        // 9.3.3: u = 0.075 mg with two digits gives δ = 0.0005; with one digit 0.005.
        assert_eq!(numerical_tolerance(0.0755, 1), 0.005);
    }
}
