//! Mean of equally spaced readings that may depend on their neighbours.
//!
//! # Source    autocorrelation: G. E. P. Box, G. M. Jenkins, Time Series Analysis (1970), chapter 2; effective number of
//!             readings: N. F. Zhang, Metrologia 43 (2006) S276; sum up to the first zero and the correction of s²:
//!             A. Zięba, P. Ramza, Metrol. Meas. Syst. 18 (2011) 529 (recalled).
//! # Formula   r_k = Σ (y_i − ȳ)(y_(i+k) − ȳ)/Σ (y_i − ȳ)²;  n_eff = n/[1 + 2 Σ_k (1 − k/n) r_k], at most n
//!             u²(ȳ) = s² (n − 1)/[n (n_eff − 1)], n_eff − 1 degrees of freedom; s²/n for independent readings
//!             or u(ȳ) = the least overlapping Allan deviation at lengths up to n/4
//! # Valid for equal spacing and a process without drift; |r_1| above 2/√n speaks against independence.

use super::allan_deviation::{degrees_of_freedom_flicker, least};
use super::statistic::brief;
use super::{Method, WorkedExample, deviation_or_nan, mean_or_nan};
use crate::diagnostic::{Code, Problem};
use crate::graph::{Decision, Estimate, Estimator, MethodInfo};
use crate::numeric::sum::sum;

/// The registry's line.
pub static METHOD: Method = Method {
    info: MethodInfo {
        name: "autocorrelation",
        title: "Mean of readings in time",
        source: "Zhang, Metrologia 43 (2006) S276; Zięba and Ramza, Metrol. Meas. Syst. 18 (2011) 529",
        formula: "r_k = Σ (y_i − ȳ)(y_(i+k) − ȳ)/Σ (y_i − ȳ)²;  n_eff = n/[1 + 2 Σ_k (1 − k/n) r_k];  u²(ȳ) = s² (n − 1)/[n (n_eff − 1)]",
        symbols: &[
            ("r_k", "autocorrelation at a distance of k readings", "1"),
            ("n_eff", "effective number of readings", "1"),
            ("y_i", "reading", ""),
            ("s", "experimental standard deviation", ""),
        ],
        valid_for: "equally spaced readings without drift",
    },
    examples: &[
        WorkedExample {
            source: "by hand",
            given: "1, 2, 4, 3, 5",
            quantity: "r_1",
            printed: "0.1000000000",
            found: || at_distance(&[1.0, 2.0, 4.0, 3.0, 5.0], 1),
        },
        WorkedExample {
            source: "computed by another program from the formula",
            given: "5 6 8 9 8 7 5 4 3 4 6 7 9 8 6 5",
            quantity: "n_eff",
            printed: "6.621948900",
            found: || effective_number(&WAVE).0,
        },
        WorkedExample {
            source: "computed by another program from the formula",
            given: "5 6 8 9 8 7 5 4 3 4 6 7 9 8 6 5",
            quantity: "u of the mean",
            printed: "0.7529768944",
            found: || {
                SeriesMean { rule: MeanRule::EffectiveNumber, decisions: Vec::new() }
                    .estimate(&[&WAVE])
                    .map_or(f64::NAN, |found| found.own_covariance[0][0].sqrt())
            },
        },
    ],
};

const WAVE: [f64; 16] = [5.0, 6.0, 8.0, 9.0, 8.0, 7.0, 5.0, 4.0, 3.0, 4.0, 6.0, 7.0, 9.0, 8.0, 6.0, 5.0];

/// Autocorrelation at a distance of `k` readings; zero for readings without scatter.
pub fn at_distance(readings: &[f64], k: usize) -> f64 {
    let mean = mean_or_nan(readings);
    let squares = sum(readings.iter().map(|y| (y - mean) * (y - mean)));
    let products = sum(readings.iter().zip(readings.iter().skip(k)).map(|(a, b)| (a - mean) * (b - mean)));
    if squares > 0.0 { products / squares } else { 0.0 }
}

/// The effective number of readings, and the distance at which the autocorrelation first reaches zero.
pub fn effective_number(readings: &[f64]) -> (f64, usize) {
    let count = readings.len() as f64;
    let mut total = 0.0;
    let mut k = 1;
    while k < readings.len() {
        let r = at_distance(readings, k);
        // The rest is mostly noise of the estimate itself.
        if r <= 0.0 {
            break;
        }
        total += (1.0 - k as f64 / count) * r;
        k += 1;
    }
    ((count / (1.0 + 2.0 * total)).min(count), k)
}

/// Whether neighbours depend on each other more than chance allows: |r_1| > 2/√n.
pub fn is_correlated(readings: &[f64]) -> bool {
    at_distance(readings, 1).abs() > 2.0 / (readings.len() as f64).sqrt()
}

/// How the uncertainty of the mean is evaluated.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum MeanRule {
    /// s/√n.
    Independent,
    EffectiveNumber,
    /// The least Allan deviation.
    AllanMinimum,
}

/// The rule: one column; output its mean.
#[derive(Debug, Clone)]
pub struct SeriesMean {
    pub rule: MeanRule,
    /// Words about the readings that hold whatever the rule.
    pub decisions: Vec<Decision>,
}

impl SeriesMean {
    /// Variance of the mean with its degrees of freedom, and what it rests on.
    fn variance(&self, readings: &[f64]) -> Result<(f64, f64, String), Problem> {
        let count = readings.len() as f64;
        let s = deviation_or_nan(readings);
        let refuse = |message: String| {
            Problem::new(Code::DesignIncomplete, message).hint("Take more readings, or evaluate the mean another way.")
        };
        match self.rule {
            MeanRule::Independent => Ok((s * s / count, count - 1.0, "s/√n".into())),
            MeanRule::EffectiveNumber => {
                let (effective, _) = effective_number(readings);
                if effective <= 1.5 {
                    return Err(refuse(format!(
                        "{count} readings count as {} independent ones, too few for an uncertainty of their mean.",
                        brief(effective)
                    )));
                }
                let variance = s * s * (count - 1.0) / (count * (effective - 1.0));
                Ok((variance, effective - 1.0, format!("{} effective readings of {count}", brief(effective))))
            }
            MeanRule::AllanMinimum => {
                let point = least(readings)
                    .ok_or_else(|| refuse(format!("{count} readings are too few for an Allan deviation.")))?;
                let freedom = degrees_of_freedom_flicker(readings.len(), point.length);
                let words = format!(
                    "Allan deviation at {} readings, the least up to a quarter of them; {} degrees of freedom (flicker noise)",
                    point.length,
                    brief(freedom)
                );
                Ok((point.deviation * point.deviation, freedom, words))
            }
        }
    }
}

impl Estimator for SeriesMean {
    fn outputs(&self) -> usize {
        1
    }

    fn estimate(&self, columns: &[&[f64]]) -> Result<Estimate, Problem> {
        let readings = columns.first().copied().unwrap_or_default();
        if readings.len() < 3 {
            let message = format!(
                "A series of {} readings shows nothing of their dependence in time; three or more are needed.",
                readings.len()
            );
            return Err(Problem::new(Code::DesignIncomplete, message).hint("Take more readings."));
        }
        let mean = mean_or_nan(readings);
        let (variance, degrees_of_freedom, rests) = self.variance(readings)?;
        let mut decisions = self.decisions.clone();
        decisions.push(Decision { what: "uncertainty of the mean".into(), decided: rests });
        Ok(Estimate {
            values: vec![mean],
            jacobian: vec![vec![vec![1.0 / readings.len() as f64; readings.len()]]],
            own_covariance: vec![vec![variance]],
            degrees_of_freedom,
            decisions,
            residuals: readings.iter().map(|reading| reading - mean).collect(),
        })
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn alternating_readings_do_not_count_for_more() {
        let readings: Vec<f64> = (0..20).map(|i| if i % 2 == 0 { 1.0 } else { -1.0 }).collect();
        assert!(at_distance(&readings, 1) < -0.9);
        assert_eq!(effective_number(&readings), (20.0, 1));
        assert!(is_correlated(&readings));
    }

    #[test]
    fn a_slow_wave_counts_for_few() {
        let readings: Vec<f64> = (0..100).map(|i| libm::sin(0.05 * f64::from(i))).collect();
        let (effective, _) = effective_number(&readings);
        assert!(effective < 5.0, "{effective}");
        let rule = |rule| SeriesMean { rule, decisions: Vec::new() };
        let simple = rule(MeanRule::Independent).estimate(&[&readings]).expect("a mean").own_covariance[0][0];
        let least = rule(MeanRule::AllanMinimum).estimate(&[&readings]).expect("a mean").own_covariance[0][0];
        assert!(
            rule(MeanRule::EffectiveNumber)
                .estimate(&[&readings])
                .map_or(true, |found| found.own_covariance[0][0] > 10.0 * simple)
        );
        assert!(least > 0.0);
    }

    #[test]
    fn readings_without_scatter_or_number() {
        assert_eq!(at_distance(&[3.0; 8], 1), 0.0);
        let rule = SeriesMean { rule: MeanRule::AllanMinimum, decisions: Vec::new() };
        assert!(rule.estimate(&[&[1.0, 2.0]]).is_err());
        assert!(rule.estimate(&[&[1.0, 2.0, 1.0]]).is_err());
    }
}
