//! Mean of the determinations of a campaign, with what they vary beyond their own uncertainties.
//!
//! # Source    between component: R. C. Paule, J. Mandel, J. Res. Natl. Bur. Stand. 87 (1982) 377; R. DerSimonian, N. Laird,
//!             Control. Clin. Trials 7 (1986) 177. Scatter of daily means: JCGM 100:2008, H.5. The larger of the two is
//!             taken: common practice without source.
//! # Formula   w_k ∝ 1/(u_k² + τ²),  y = Σ w_k x_k;  u_w² = 1/Σ 1/(u_k² + τ²)
//!             u_A² = max(u_w², MS_b/N)
//!     x_k   result of determination k                                               kg
//!     u_k   its standard uncertainty from what it shares with no other              kg
//!     τ     standard deviation between determinations                               kg
//!     MS_b  mean square between days, of determinations grouped by their day        kg²
//!     N     number of determinations                                                1
//! What all determinations share passes through the mean whole: it is not divided by √N.
//! # Valid for two determinations or more; a result of one alone is passed on.

use super::consistency::{consistency, dersimonian_laird, paule_mandel};
use super::statistic::{brief, probability};
use super::{Method, WorkedExample};
use crate::diagnostic::{Code, Problem};
use crate::graph::{Decision, Estimate, Estimator, MethodInfo};
use crate::numeric::linear::Matrix;
use crate::numeric::sum::{dot, sum};

/// The registry's line.
pub static METHOD: Method = Method {
    info: MethodInfo {
        name: "campaign-mean",
        title: "Mean of the determinations of a campaign",
        source: "Paule and Mandel (1982); DerSimonian and Laird (1986); JCGM 100:2008, H.5",
        formula: "y = Σ w_k x_k,  w_k ∝ 1/(u_k² + τ²);  u_A² = max(1/Σ 1/(u_k² + τ²), MS_b/N)",
        symbols: &[
            ("x_k", "result of one determination", "kg"),
            ("u_k", "its standard uncertainty from what it shares with no other", "kg"),
            ("τ", "standard deviation between determinations", "kg"),
            ("MS_b", "mean square between days", "kg2"),
            ("N", "number of determinations", "1"),
        ],
        valid_for: "two determinations or more",
    },
    examples: &[
        six("mean", "8.047225", || of_six(|made| made.values[0])),
        six("u_A", "4.077634", || of_six(|made| made.type_a_variance().sqrt())),
    ],
};

const fn six(quantity: &'static str, printed: &'static str, found: fn() -> f64) -> WorkedExample {
    WorkedExample {
        source: "invented; weights and between component computed by bisection in another language",
        given: "12.3(6.0), −4.1(5.0), 7.7(8.0), 25.0(7.0), 3.2(4.0), 9.8(10.0) on one day, Paule–Mandel",
        quantity,
        printed,
        found,
    }
}

/// How the variation between determinations enters.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Between {
    /// Determinations count alike; their scatter is that of days.
    EqualWeights,
    /// Weights by the uncertainties alone.
    None,
    PauleMandel,
    DerSimonianLaird,
}

/// The rule: one column of results; output their mean.
#[derive(Debug, Clone)]
pub struct CampaignMean {
    /// u_k², in the square of the unit of the results.
    pub variances: Vec<f64>,
    /// The day of each determination.
    pub days: Vec<i64>,
    pub between: Between,
}

/// What the rule finds, before it becomes an estimate.
#[derive(Debug, Clone)]
pub struct Found {
    pub values: Vec<f64>,
    pub weights: Vec<f64>,
    /// τ.
    pub between: f64,
    /// u_w² and MS_b/N.
    pub weighted_variance: f64,
    pub daily_variance: Option<f64>,
    pub degrees_of_freedom: f64,
    pub decisions: Vec<Decision>,
}

impl Found {
    /// u_A².
    pub fn type_a_variance(&self) -> f64 {
        self.daily_variance.map_or(self.weighted_variance, |daily| daily.max(self.weighted_variance))
    }
}

impl CampaignMean {
    /// Weights, mean and variance.
    ///
    /// # Errors
    /// `design_incomplete` without results or with an uncertainty of zero.
    pub fn find(&self, results: &[f64]) -> Result<Found, Problem> {
        if results.is_empty() || results.len() != self.variances.len() || self.days.len() != results.len() {
            return Err(Problem::new(Code::DesignIncomplete, "A campaign needs at least one determination."));
        }
        if self.variances.iter().any(|variance| *variance <= 0.0) {
            let message = "A determination has no uncertainty of its own, so it cannot be weighted against others.";
            return Err(Problem::new(Code::UncertaintyMissing, message));
        }
        let covariance = diagonal(&self.variances);
        let tau_squared = match self.between {
            Between::PauleMandel if results.len() > 1 => paule_mandel(results, &covariance)?,
            Between::DerSimonianLaird if results.len() > 1 => dersimonian_laird(results, &covariance)?,
            _ => 0.0,
        };
        let raw: Vec<f64> = match self.between {
            Between::EqualWeights => vec![1.0; results.len()],
            _ => self.variances.iter().map(|variance| self.variances[0] / (variance + tau_squared)).collect(),
        };
        let total = sum(raw.iter().copied());
        let weights: Vec<f64> = raw.iter().map(|weight| weight / total).collect();
        let departures: Vec<f64> = results.iter().map(|x| x - results[0]).collect();
        let spread = |weight: &f64, variance: &f64| weight * weight * (variance + tau_squared);
        let daily = self.daily(&departures);
        let mut found = Found {
            values: vec![results[0] + dot(&weights, &departures)],
            weighted_variance: sum(weights.iter().zip(&self.variances).map(|(w, v)| spread(w, v))),
            weights,
            between: tau_squared.sqrt(),
            daily_variance: daily.map(|(variance, _)| variance),
            degrees_of_freedom: results.len() as f64 - 1.0,
            decisions: Vec::new(),
        };
        if let Some((variance, freedom)) = daily
            && variance > found.weighted_variance
        {
            found.degrees_of_freedom = freedom;
        }
        found.decisions = self.decide(results, &covariance, &found)?;
        Ok(found)
    }

    /// MS_b/N and its degrees of freedom; nothing where one day, or no two on a day, leave it unknown.
    fn daily(&self, departures: &[f64]) -> Option<(f64, f64)> {
        let mut days = self.days.clone();
        days.sort_unstable();
        days.dedup();
        if days.len() < 2 || days.len() == departures.len() {
            return None;
        }
        let count = departures.len() as f64;
        let mean = sum(departures.iter().copied()) / count;
        let square = |day: &i64| {
            let of_day = |row: &usize| self.days[*row] == *day;
            let rows: Vec<f64> = (0..departures.len()).filter(of_day).map(|row| departures[row]).collect();
            let own = sum(rows.iter().copied()) / rows.len() as f64;
            rows.len() as f64 * (own - mean) * (own - mean)
        };
        let freedom = days.len() as f64 - 1.0;
        Some((sum(days.iter().map(square)) / freedom / count, freedom))
    }

    fn decide(&self, results: &[f64], covariance: &Matrix, found: &Found) -> Result<Vec<Decision>, Problem> {
        let mut list = Vec::new();
        if results.len() > 1 {
            let agreement = consistency(results, covariance)?;
            list.push(Decision {
                what: "agreement of the determinations".into(),
                decided: format!(
                    "χ² = {} for {} degrees of freedom, {}; Birge ratio {}",
                    brief(agreement.chi_square),
                    agreement.degrees_of_freedom,
                    probability(agreement.probability),
                    brief(agreement.birge_ratio)
                ),
            });
        }
        let ratio = found.between / found.weighted_variance.sqrt();
        list.push(Decision {
            what: "variation between determinations".into(),
            decided: match self.between {
                Between::EqualWeights => "equal weights".into(),
                Between::None => "weights by the determinations' own uncertainties; no between component".into(),
                _ if found.between == 0.0 => "none beyond their own uncertainties".into(),
                _ => {
                    format!("standard deviation between them {} times the Type A uncertainty of the mean", brief(ratio))
                }
            },
        });
        if let Some(daily) = found.daily_variance {
            let rests = if daily > found.weighted_variance { "the daily means" } else { "the determinations" };
            let ratio = (daily / found.weighted_variance).sqrt();
            list.push(Decision {
                what: "Type A uncertainty of the mean".into(),
                decided: format!(
                    "from {rests}; daily means alone would give {} times that of the determinations",
                    brief(ratio)
                ),
            });
        }
        Ok(list)
    }
}

impl Estimator for CampaignMean {
    fn outputs(&self) -> usize {
        1
    }

    fn estimate(&self, columns: &[&[f64]]) -> Result<Estimate, Problem> {
        let found = self.find(columns.first().copied().unwrap_or_default())?;
        // What the determinations bring themselves comes through their own nodes.
        let passed = sum(found.weights.iter().zip(&self.variances).map(|(w, v)| w * w * v));
        let own = (found.type_a_variance() - passed).max(0.0);
        // Hair of rounding is no variation.
        let own = if own > 1e-12 * passed { own } else { 0.0 };
        Ok(Estimate {
            own_covariance: vec![vec![own]],
            degrees_of_freedom: found.degrees_of_freedom,
            decisions: found.decisions,
            values: found.values,
            jacobian: vec![vec![found.weights]],
            residuals: Vec::new(),
        })
    }
}

fn diagonal(variances: &[f64]) -> Matrix {
    let cell = |i: usize, j: usize| if i == j { variances[i] } else { 0.0 };
    (0..variances.len()).map(|i| (0..variances.len()).map(|j| cell(i, j)).collect()).collect()
}

const SIX: [f64; 6] = [12.3, -4.1, 7.7, 25.0, 3.2, 9.8];
const SIX_U: [f64; 6] = [6.0, 5.0, 8.0, 7.0, 4.0, 10.0];

fn of_six(what: impl Fn(&Found) -> f64) -> f64 {
    let rule = CampaignMean {
        variances: SIX_U.iter().map(|u| u * u).collect(),
        days: vec![1; 6],
        between: Between::PauleMandel,
    };
    rule.find(&SIX).map_or(f64::NAN, |found| what(&found))
}

#[cfg(test)]
mod tests {
    use super::*;

    /// With equal weights and two a day, MS_b/N by hand: daily means 2, 6, 10 of 1 and 3, 5 and 7, 9 and 11.
    #[test]
    fn days_that_differ_set_the_uncertainty() {
        let rule =
            CampaignMean { variances: vec![1.0; 6], days: vec![1, 1, 2, 2, 3, 3], between: Between::EqualWeights };
        let found = rule.find(&[1.0, 3.0, 5.0, 7.0, 9.0, 11.0]).expect("found");
        assert!((found.values[0] - 6.0).abs() < 1e-14);
        // MS_b = 2 (16 + 0 + 16)/2 = 32; over N = 6.
        assert!((found.type_a_variance() - 32.0 / 6.0).abs() < 1e-12);
        assert_eq!(found.degrees_of_freedom, 2.0);
        let made = rule.estimate(&[&[1.0, 3.0, 5.0, 7.0, 9.0, 11.0]]).expect("estimate");
        assert!((made.own_covariance[0][0] - (32.0 / 6.0 - 1.0 / 6.0)).abs() < 1e-12);
    }

    /// Determinations that agree better than they claim leave the uncertainty what they claim.
    #[test]
    fn agreement_never_shrinks_the_uncertainty() {
        let rule = CampaignMean { variances: vec![4.0; 4], days: vec![1, 1, 2, 2], between: Between::PauleMandel };
        let made = rule.estimate(&[&[1.0, 1.0, 1.0, 1.0]]).expect("estimate");
        assert_eq!(made.own_covariance[0][0], 0.0);
        assert_eq!(rule.find(&[1.0; 4]).expect("found").type_a_variance(), 1.0);
    }

    #[test]
    fn results_without_uncertainty_are_refused() {
        let rule = CampaignMean { variances: vec![0.0, 1.0], days: vec![1, 1], between: Between::None };
        assert_eq!(rule.find(&[1.0, 2.0]).expect_err("refused").code, Code::UncertaintyMissing);
        assert!(CampaignMean { variances: vec![], days: vec![], between: Between::None }.find(&[]).is_err());
    }
}
