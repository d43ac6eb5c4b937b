//! Whether a weighing design is in control: its scatter against an accepted one, its check standard against its past.
//!
//! # Source    e-Handbook of Statistical Methods (NIST/SEMATECH, 2012), 2.3.4 (recalled).
//! # Formula   F = s²/s_p² against the F distribution;  t = (x − x̄)/(s_c √(1 + 1/N)) against that of t with N − 1
//! A failed F means a bad run; a failed t with a good F means a bias of reference, density or handling.

use super::statistic::{brief, probability};
use crate::numeric::distribution::{chi_square_upper, coverage_factor, f_upper, student_t_cdf};
use crate::numeric::elementary::{sqrt, square};
use crate::numeric::root::bisect;

/// What is known of the check standard: mean and standard deviation of earlier values, and how many.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct CheckStandard {
    /// Place of its weight in the list.
    pub weight: usize,
    /// Accepted mass, kg.
    pub accepted: f64,
    /// Standard deviation of one value over the long run, kg.
    pub deviation: f64,
    pub count: usize,
}

/// Outcome of a test: the statistic, what it may be at most, and whether it is.
#[derive(Debug, Clone, PartialEq)]
pub struct Verdict {
    /// Such as `F(5, 60)`.
    pub name: String,
    pub statistic: f64,
    /// Of a larger F, or of a t farther from zero.
    pub probability: f64,
    pub limit: f64,
    pub passed: bool,
}

impl Verdict {
    /// `F(5, 60) = 0.721, p = 0.61; limit 2.37 at the level 0.95, passed`.
    pub fn words(&self, confidence: f64) -> String {
        let (found, p) = (brief(self.statistic), probability(self.probability));
        let (limit, level) = (brief(self.limit), brief(confidence));
        let verdict = if self.passed { "passed" } else { "failed" };
        format!("{} = {found}, {p}; limit {limit} at the level {level}, {verdict}", self.name)
    }
}

/// F of the scatter within a design, (s² in kg², ν), against an accepted one, (s_p in kg, ν_p).
///
/// None without degrees of freedom or without a positive accepted deviation.
pub fn precision(found: (f64, f64), accepted: (f64, f64), confidence: f64) -> Option<Verdict> {
    let ((variance, freedom), (deviation, accepted_freedom)) = (found, accepted);
    if !(deviation > 0.0 && freedom > 0.0 && accepted_freedom > 0.0) {
        return None;
    }
    let statistic = variance / square(deviation);
    let second = if accepted_freedom.is_finite() { accepted_freedom.to_string() } else { "∞".into() };
    let limit = limit_of_f(confidence, freedom, accepted_freedom);
    Some(Verdict {
        name: format!("F({freedom}, {second})"),
        statistic,
        probability: beyond(statistic, freedom, accepted_freedom),
        limit,
        passed: statistic <= limit,
    })
}

/// t of the mass in kg found for the check standard against its accepted value.
///
/// None without two earlier values or a positive standard deviation.
pub fn checked(mass: f64, check: &CheckStandard, confidence: f64) -> Option<Verdict> {
    if check.count < 2 || check.deviation.is_nan() || check.deviation <= 0.0 {
        return None;
    }
    let (count, freedom) = (check.count as f64, check.count as f64 - 1.0);
    let statistic = (mass - check.accepted) / (check.deviation * sqrt(1.0 + 1.0 / count));
    let limit = coverage_factor(confidence, freedom);
    Some(Verdict {
        name: format!("t({freedom})"),
        statistic,
        probability: 2.0 * student_t_cdf(-statistic.abs(), freedom),
        limit,
        passed: statistic.abs() <= limit,
    })
}

/// Probability of a larger F; with a deviation known exactly, ν_1 F is chi-square.
fn beyond(statistic: f64, nu_1: f64, nu_2: f64) -> f64 {
    if nu_2 == f64::INFINITY { chi_square_upper(nu_1 * statistic, nu_1) } else { f_upper(statistic, nu_1, nu_2) }
}

/// The value that F exceeds with probability 1 − `confidence`; no number for impossible degrees of freedom.
pub fn limit_of_f(confidence: f64, nu_1: f64, nu_2: f64) -> f64 {
    // With z = x/(1 + x) the whole half-line is searched.
    let rising = |z: f64| 1.0 - confidence - beyond(z / (1.0 - z), nu_1, nu_2);
    bisect(0.0, 1.0 - f64::EPSILON, rising).map_or(f64::NAN, |z| z / (1.0 - z))
}

#[cfg(test)]
mod tests {
    use super::*;

    /// s² = 5.31e-6/3 mg² against 0.25e-6 mg²; F(0.95; 3, 40) = 2.839, χ²(0.95; 3) = 7.815 in any table.
    #[test]
    fn precision_by_hand() {
        let found = precision((5.31e-6 / 3.0, 3.0), (0.0005, 40.0), 0.95).expect("a test");
        assert!((found.statistic - 7.08).abs() < 1e-9 && !found.passed, "{found:?}");
        assert!((found.limit - 2.839).abs() < 5e-4, "{found:?}");
        let known = precision((5.31e-6 / 3.0, 3.0), (0.0005, f64::INFINITY), 0.95).expect("a test");
        assert!((known.limit * 3.0 - 7.815).abs() < 5e-4 && known.name == "F(3, ∞)", "{known:?}");
        assert!(precision((1.0, 3.0), (0.5, 40.0), 0.95).is_some_and(|test| !test.passed));
        assert!(precision((0.5, 3.0), (0.5, 40.0), 0.95).is_some_and(|test| test.passed));
        for (found, accepted) in [((1.0, 0.0), (1.0, 9.0)), ((1.0, 3.0), (0.0, 9.0)), ((1.0, 3.0), (1.0, f64::NAN))] {
            assert!(precision(found, accepted, 0.95).is_none());
        }
    }

    /// t = (0.01155 − 0.0105)/(0.0005 √(1 + 1/16)) = 2.0373; t(0.975; 15) = 2.131 in any table.
    #[test]
    fn check_standard_by_hand() {
        let check = CheckStandard { weight: 1, accepted: 0.0105, deviation: 0.0005, count: 16 };
        let found = checked(0.01155, &check, 0.95).expect("a test");
        assert!((found.statistic - 2.0373).abs() < 5e-5 && found.passed, "{found:?}");
        assert!((found.limit - 2.131).abs() < 5e-4 && (found.probability - 0.0596).abs() < 5e-4, "{found:?}");
        assert!(checked(0.0094, &check, 0.95).is_some_and(|test| !test.passed && test.statistic < 0.0));
        for bad in [CheckStandard { count: 1, ..check }, CheckStandard { deviation: f64::NAN, ..check }] {
            assert!(checked(0.01155, &bad, 0.95).is_none());
        }
    }
}
