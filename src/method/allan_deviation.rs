//! Overlapping Allan deviation of equally spaced readings, with confidence limits.
//!
//! # Source    D. W. Allan, Proc. IEEE 54 (1966) 221; overlapping estimate and degrees of freedom: D. A. Howe,
//!             D. W. Allan, J. A. Barnes, Proc. 35th Annual Frequency Control Symposium (1981), and W. J. Riley,
//!             Handbook of Frequency Stability Analysis, NIST SP 1065 (2008), 5.2.5 and table 5 (recalled).
//! # Formula   σ²(m) = 1/[2 (n − 2m + 1)] Σ_j (ȳ_(j+m) − ȳ_j)²,  ȳ_j the mean of m readings from the j-th on
//!             degrees of freedom, with N = n + 1:
//!             independent readings: [3 (N − 1)/(2m) − 2 (N − 2)/N] · 4m²/(4m² + 5)
//!             flicker noise: 2 (N − 2)²/(2.3 N − 4.9) for m = 1, else 5 N²/[4m (N + 3m)]
//!             limits: σ² ν/χ²_((1 ± p)/2)(ν)
//! # Valid for equal spacing; nothing is read where m exceeds a quarter of the readings.

use super::{Method, WorkedExample};
use crate::graph::MethodInfo;
use crate::numeric::distribution::gamma_quantile;
use crate::numeric::sum::{Sum, sum};

/// The registry's line.
pub static METHOD: Method = Method {
    info: MethodInfo {
        name: "allan-deviation",
        title: "Overlapping Allan deviation",
        source: "NIST SP 1065 (2008), 5.2.5 and table 5; Howe, Allan, Barnes (1981)",
        formula: "σ²(m) = 1/[2 (n − 2m + 1)] Σ_j (ȳ_(j+m) − ȳ_j)²",
        symbols: &[
            ("σ", "Allan deviation", ""),
            ("m", "readings averaged", "1"),
            ("n", "number of readings", "1"),
            ("ȳ_j", "mean of m readings from the j-th on", ""),
        ],
        valid_for: "equally spaced readings; m up to a quarter of them for conclusions",
    },
    examples: &[
        nine("σ(1)", "91.22945", || overlapping(&NINE, 1)),
        nine("σ(2), blocks side by side", "115.8082", || side_by_side(&NINE, 2)),
        nine("σ(2), overlapping", "85.95287", || overlapping(&NINE, 2)),
    ],
};

const NINE: [f64; 9] = [892.0, 809.0, 823.0, 798.0, 671.0, 644.0, 883.0, 903.0, 677.0];

const fn nine(quantity: &'static str, printed: &'static str, found: fn() -> f64) -> WorkedExample {
    WorkedExample {
        source: "NIST SP 1065 (2008), test set of nine points (recalled, reproduced)",
        given: "892 809 823 798 671 644 883 903 677",
        quantity,
        printed,
        found,
    }
}

/// Probability between the confidence limits.
pub const CONFIDENCE: f64 = 0.95;

/// The Allan deviation at one averaging length.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct AllanPoint {
    /// Readings averaged.
    pub length: usize,
    pub deviation: f64,
    pub degrees_of_freedom: f64,
    /// Confidence limits.
    pub low: f64,
    pub high: f64,
}

/// The overlapping Allan deviation at `m`; not a number where fewer than 2m readings stand.
pub fn overlapping(readings: &[f64], m: usize) -> f64 {
    deviation(readings, m, 1)
}

/// The Allan deviation from blocks side by side.
pub fn side_by_side(readings: &[f64], m: usize) -> f64 {
    deviation(readings, m, m)
}

fn deviation(readings: &[f64], m: usize, step: usize) -> f64 {
    if m == 0 || readings.len() < 2 * m {
        return f64::NAN;
    }
    let first = readings[0];
    let mut running = Sum::default();
    let mut sums = vec![0.0];
    for reading in readings {
        running.add(reading - first);
        sums.push(running.value());
    }
    let starts: Vec<usize> = (0..=readings.len() - 2 * m).step_by(step).collect();
    let jump = |j: &usize| (sums[j + 2 * m] - 2.0 * sums[j + m] + sums[*j]) / m as f64;
    (sum(starts.iter().map(|j| jump(j) * jump(j))) / (2.0 * starts.len() as f64)).sqrt()
}

/// Degrees of freedom of the overlapping estimate for independent readings.
pub fn degrees_of_freedom_independent(readings: usize, m: usize) -> f64 {
    let (n, m) = (readings as f64 + 1.0, m as f64);
    ((3.0 * (n - 1.0) / (2.0 * m) - 2.0 * (n - 2.0) / n) * 4.0 * m * m / (4.0 * m * m + 5.0)).max(1.0)
}

/// Degrees of freedom of the overlapping estimate where the deviation has stopped falling.
pub fn degrees_of_freedom_flicker(readings: usize, m: usize) -> f64 {
    let n = readings as f64 + 1.0;
    let found = match m {
        1 => 2.0 * (n - 2.0) * (n - 2.0) / (2.3 * n - 4.9),
        m => 5.0 * n * n / (4.0 * m as f64 * (n + 3.0 * m as f64)),
    };
    found.max(1.0)
}

/// The deviation at lengths of 1, 2, 4, … readings up to half of them, with confidence limits for independent ones.
pub fn allan_points(readings: &[f64]) -> Vec<AllanPoint> {
    let lengths = std::iter::successors(Some(1usize), |m| m.checked_mul(2)).take_while(|m| 2 * m <= readings.len());
    let point = |length: usize| {
        let deviation = overlapping(readings, length);
        let freedom = degrees_of_freedom_independent(readings.len(), length);
        let limit = |p: f64| deviation * (freedom / (2.0 * gamma_quantile(freedom / 2.0, p))).sqrt();
        AllanPoint {
            length,
            deviation,
            degrees_of_freedom: freedom,
            low: limit((1.0 + CONFIDENCE) / 2.0),
            high: limit((1.0 - CONFIDENCE) / 2.0),
        }
    };
    lengths.map(point).collect()
}

/// The least deviation at lengths up to a quarter of the readings.
pub fn least(readings: &[f64]) -> Option<AllanPoint> {
    let defensible = allan_points(readings).into_iter().filter(|point| 4 * point.length <= readings.len());
    defensible.min_by(|a, b| a.deviation.total_cmp(&b.deviation))
}

#[cfg(test)]
mod tests {
    use super::*;

    /// A drift of D a reading gives D m/√2; a constant gives nothing.
    #[test]
    fn drift_and_constant() {
        let drift: Vec<f64> = (0..40).map(|i| 1e6 + 3.0 * f64::from(i)).collect();
        for m in [1, 2, 5, 20] {
            assert!((overlapping(&drift, m) / (3.0 * m as f64 / 2f64.sqrt()) - 1.0).abs() < 1e-12);
        }
        assert_eq!(overlapping(&[7.0; 9], 2), 0.0);
        assert!(overlapping(&drift, 21).is_nan() && overlapping(&drift, 0).is_nan());
    }

    /// For independent readings m = 1 the degrees of freedom tend to two thirds of the number of readings.
    #[test]
    fn degrees_of_freedom_of_many_readings() {
        assert!((degrees_of_freedom_independent(1_000_000, 1) / 1e6 - 2.0 / 3.0).abs() < 1e-5);
        assert!((degrees_of_freedom_flicker(1_000_000, 1) / 1e6 - 2.0 / 2.3).abs() < 1e-5);
        // N = 5, m = 2 by hand: (3 − 6/5) · 16/21.
        assert!((degrees_of_freedom_independent(4, 2) - 1.8 * 16.0 / 21.0).abs() < 1e-14);
    }

    #[test]
    fn limits_enclose_and_the_least_is_defensible() {
        let readings: Vec<f64> =
            (0..64).map(|i| libm::sin(12.9 * f64::from(i)) + 0.1 * libm::sin(0.1 * f64::from(i))).collect();
        let points = allan_points(&readings);
        assert_eq!(points.iter().map(|point| point.length).collect::<Vec<_>>(), [1, 2, 4, 8, 16, 32]);
        assert!(points.iter().all(|point| point.low < point.deviation && point.deviation < point.high));
        assert!(least(&readings).expect("a least").length <= 16);
        assert!(least(&[1.0, 2.0, 3.0]).is_none());
    }
}
