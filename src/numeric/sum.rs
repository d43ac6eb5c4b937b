//! Sums in a fixed order, and the averages made of them.

use super::elementary::sqrt;

/// A running sum that keeps the part rounding would lose.
///
/// # Source
/// A. Neumaier, Rundungsfehleranalyse einiger Verfahren zur Summation endlicher Summen,
/// ZAMM 54 (1974) 39-51.
#[derive(Debug, Clone, Copy, Default, PartialEq)]
pub struct Sum {
    total: f64,
    lost: f64,
}

impl Sum {
    /// Adds one term.
    pub fn add(&mut self, term: f64) {
        let total = self.total + term;
        self.lost +=
            if self.total.abs() >= term.abs() { (self.total - total) + term } else { (term - total) + self.total };
        self.total = total;
    }

    /// The sum so far, rounded once.
    pub fn value(&self) -> f64 {
        // An infinite or undefined total makes the lost part meaningless.
        if self.total.is_finite() { self.total + self.lost } else { self.total }
    }
}

/// Compensated sum of the terms in their order.
pub fn sum(terms: impl IntoIterator<Item = f64>) -> f64 {
    let mut sum = Sum::default();
    terms.into_iter().for_each(|term| sum.add(term));
    sum.value()
}

/// Compensated sum of products of two lists, as far as the shorter one reaches.
pub fn dot(a: &[f64], b: &[f64]) -> f64 {
    sum(a.iter().zip(b).map(|(a, b)| a * b))
}

/// Arithmetic mean; none of no values.
pub fn mean(values: &[f64]) -> Option<f64> {
    let first = *values.first()?;
    // Summing deviations from the first value keeps the digits in which the values differ.
    Some(first + sum(values.iter().map(|value| value - first)) / values.len() as f64)
}

/// Experimental variance of single values, n - 1 degrees of freedom; none of fewer than two values.
///
/// # Source
/// JCGM 100:2008, 4.2.2, equation (4). The second sum removes what the rounding of the mean leaves:
/// T. F. Chan, G. H. Golub, R. J. LeVeque, The American Statistician 37 (1983) 242-247.
pub fn experimental_variance(values: &[f64]) -> Option<f64> {
    if values.len() < 2 {
        return None;
    }
    let (mean, count) = (mean(values)?, values.len() as f64);
    let squares = sum(values.iter().map(|value| (value - mean) * (value - mean)));
    let remainder = sum(values.iter().map(|value| value - mean));
    Some(((squares - remainder * remainder / count) / (count - 1.0)).max(0.0))
}

/// Experimental standard deviation of single values; none of fewer than two values.
pub fn experimental_standard_deviation(values: &[f64]) -> Option<f64> {
    experimental_variance(values).map(sqrt)
}

/// Pooled variance and its degrees of freedom, of pairs (variance, degrees of freedom).
///
/// None when no pair has degrees of freedom.
///
/// # Source
/// JCGM 100:2008, H.3.6, note.
pub fn pooled_variance(pairs: &[(f64, f64)]) -> Option<(f64, f64)> {
    let degrees_of_freedom = sum(pairs.iter().map(|(_, degrees)| *degrees));
    let weighted = sum(pairs.iter().map(|(variance, degrees)| variance * degrees));
    (degrees_of_freedom > 0.0).then(|| (weighted / degrees_of_freedom, degrees_of_freedom))
}

#[cfg(test)]
mod tests {
    use super::*;
    use proptest::prelude::*;

    #[test]
    fn small_terms_survive_large_ones() {
        assert_eq!(sum([1.0, 1e100, 1.0, -1e100]), 2.0);
        assert_eq!(sum([f64::INFINITY, 1.0]), f64::INFINITY);
        assert_eq!(sum([]), 0.0);
    }

    #[test]
    fn too_few_values_have_no_average() {
        assert_eq!(mean(&[]), None);
        assert_eq!(experimental_variance(&[1.0]), None);
        assert_eq!(pooled_variance(&[]), None);
    }

    /// JCGM 100:2008, 4.4.3: twenty temperatures, printed mean 100.145 °C, s 1.489 °C.
    #[test]
    fn twenty_temperatures_as_printed() {
        let readings = [
            96.90, 98.18, 98.25, 98.61, 99.03, 99.49, 99.56, 99.74, 99.89, 100.07, 100.33, 100.42, 100.68, 100.95,
            101.11, 101.20, 101.57, 101.84, 102.36, 102.72,
        ];
        assert!((mean(&readings).unwrap() - 100.145).abs() < 1e-12);
        let deviation = experimental_standard_deviation(&readings).unwrap();
        assert!((deviation - 1.489).abs() < 0.0005);
        assert!((deviation - 1.48884448306).abs() < 1e-11);
    }

    /// JCGM 100:2008, H.3.6, note: formula; numbers computed with exact fractions.
    #[test]
    fn pooled_standard_deviation() {
        let pairs = [(12.1, 4.0), (13.4, 9.0), (9.8, 2.0), (14.0, 9.0)].map(|(s, nu): (f64, f64)| (s * s, nu));
        let (variance, degrees) = pooled_variance(&pairs).unwrap();
        assert!((variance.sqrt() - 13.16206670702).abs() < 1e-10);
        assert_eq!(degrees, 24.0);
    }

    proptest! {
        #[test]
        fn a_large_offset_leaves_the_variance(values in prop::collection::vec(-1000i32..1000, 2..50)) {
            let near: Vec<f64> = values.iter().map(|v| f64::from(*v)).collect();
            let far: Vec<f64> = near.iter().map(|v| v + 1e12).collect();
            let (near, far) = (experimental_variance(&near).unwrap(), experimental_variance(&far).unwrap());
            prop_assert!((near - far).abs() <= 1e-9 * near.max(1.0));
        }
    }
}
