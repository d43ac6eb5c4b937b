//! Analysis of variance: readings in groups (days), or in groups of groups (series within days).
//!
//! # Source    JCGM 100:2008, H.5 (one way, balanced; F test of the between-group component). Unequal numbers and the
//!             second level: S. R. Searle, Linear Models (1971), chapters 9 and 10 (recalled).
//! # Formula   MS_b = Σ n_i (ȳ_i − ȳ)²/(k − 1);  MS_w = ΣΣ (y_ij − ȳ_i)²/(N − k);  F = MS_b/MS_w
//!             s_b² = max(0, (MS_b − MS_w)/n_0);  n_0 = (N − Σ n_i²/N)/(k − 1)
//!             u²(ȳ) = s_w²/N + s_b² Σ n_i²/N² with k − 1 degrees of freedom where the component counts (MS_b/N for
//!             equal n_i), else Σ (y − ȳ)²/[N (N − 1)] with N − 1
//! # Valid for groups drawn at random from the same process; two levels test days against series within days.

use super::statistic::{brief, probability, uncertainty_of_deviation};
use super::{Method, WorkedExample};
use crate::diagnostic::{Code, Problem};
use crate::graph::{Decision, Estimate, Estimator, MethodInfo};
use crate::numeric::distribution::f_upper;
use crate::numeric::sum::sum;

/// The registry's line.
pub static METHOD: Method = Method {
    info: MethodInfo {
        name: "analysis-of-variance",
        title: "Analysis of variance within and between groups",
        source: "JCGM 100:2008, H.5; unequal numbers and nested groups by the method of moments",
        formula: "F = MS_b/MS_w;  s_b² = max(0, (MS_b − MS_w)/n_0);  u²(ȳ) = s_w²/N + s_b² Σ n_i²/N²",
        symbols: &[
            ("ȳ", "mean of all readings", ""),
            ("MS_b", "mean square between groups", ""),
            ("MS_w", "mean square within groups", ""),
            ("s_b", "standard deviation between groups", ""),
            ("s_w", "standard deviation within groups", ""),
            ("n_0", "effective number of readings in a group", "1"),
            ("N", "number of readings", "1"),
        ],
        valid_for: "two groups or more, drawn at random",
    },
    examples: &[
        guide("standard deviation from the daily means, √MS_b/µV", "128", || {
            of_guide(|table| table.between.square().sqrt())
        }),
        guide("standard deviation within days, √MS_w/µV", "85", || of_guide(|table| table.within.square().sqrt())),
        guide("standard deviation between days/µV", "43", || of_guide(|table| table.between_deviation())),
        guide("u of the mean/µV", "18", || of_guide(|table| table.of_mean(0.05, false).0.sqrt())),
        certified("F", "1.18046237440", || SiliconTable::make().map_or(f64::NAN, |table| table.f_between())),
        certified("residual standard deviation/(Ω cm)", "0.104076068335", || {
            SiliconTable::make().map_or(f64::NAN, |table| table.within.square().sqrt())
        }),
    ],
};

const fn guide(quantity: &'static str, printed: &'static str, found: fn() -> f64) -> WorkedExample {
    WorkedExample {
        source: "JCGM 100:2008, H.5, table H.9",
        given: "means and standard deviations of 5 readings on 10 days",
        quantity,
        printed,
        found,
    }
}

const fn certified(quantity: &'static str, printed: &'static str, found: fn() -> f64) -> WorkedExample {
    WorkedExample {
        source: "Statistical Reference Datasets, one-way set SiRstv, certified values (recalled, reproduced by computation)",
        given: "25 resistivities of silicon in 5 groups",
        quantity,
        printed,
        found,
    }
}

/// The smallest group of readings.
#[derive(Debug, Clone, PartialEq)]
pub enum Group {
    /// Readings in these rows.
    Rows(Vec<usize>),
    /// The row holds the mean of `count` readings with an experimental standard deviation.
    Summary { row: usize, count: usize, standard_deviation: f64 },
}

/// A sum of squares with its degrees of freedom.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Squares {
    pub sum: f64,
    pub degrees_of_freedom: f64,
}

impl Squares {
    /// The mean square; zero without degrees of freedom.
    pub fn square(self) -> f64 {
        if self.degrees_of_freedom > 0.0 { self.sum / self.degrees_of_freedom } else { 0.0 }
    }

    fn with(self, other: Squares) -> Squares {
        Squares { sum: self.sum + other.sum, degrees_of_freedom: self.degrees_of_freedom + other.degrees_of_freedom }
    }
}

/// The table of an analysis of variance.
#[derive(Debug, Clone, PartialEq)]
pub struct Table {
    pub mean: f64,
    /// Readings.
    pub count: f64,
    pub between: Squares,
    /// Between the inner groups within the outer ones; without degrees of freedom in a one-way analysis.
    pub inner: Squares,
    pub within: Squares,
    /// Σ n² over outer and over inner groups, and Σ over outer groups of (Σ n² inner)/n.
    squared_counts: (f64, f64, f64),
    /// Numbers of outer and of inner groups.
    groups: (f64, f64),
}

/// What decided the uncertainty of the mean.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Basis {
    Between,
    Inner,
    AllReadings,
}

impl Table {
    /// The table of readings in groups: the outer list holds days, the inner one series within a day.
    ///
    /// # Errors
    /// `design_incomplete` without two groups and a scatter within.
    pub fn new(groups: &[Vec<Group>], rows: &[f64]) -> Result<Table, Problem> {
        let origin = rows.first().copied().unwrap_or(0.0);
        let outer: Vec<Vec<Moments>> =
            groups.iter().map(|inner| inner.iter().map(|group| Moments::of(group, rows, origin)).collect()).collect();
        let days: Vec<Moments> = outer.iter().map(|inner| Moments::joined(inner)).collect();
        let all = Moments::joined(&days);
        let inner_count = outer.iter().map(Vec::len).sum::<usize>() as f64;
        let within = sum(outer.iter().flatten().map(|group| group.squares));
        let between = sum(days.iter().map(|day| day.count * (day.mean - all.mean) * (day.mean - all.mean)));
        let inner = sum(outer.iter().zip(&days).flat_map(|(list, day)| {
            list.iter().map(|group| group.count * (group.mean - day.mean) * (group.mean - day.mean))
        }));
        let table = Table {
            mean: origin + all.mean,
            count: all.count,
            between: Squares { sum: between, degrees_of_freedom: days.len() as f64 - 1.0 },
            inner: Squares { sum: inner, degrees_of_freedom: inner_count - days.len() as f64 },
            within: Squares { sum: within, degrees_of_freedom: all.count - inner_count },
            squared_counts: (
                sum(days.iter().map(|day| day.count * day.count)),
                sum(outer.iter().flatten().map(|group| group.count * group.count)),
                sum(outer
                    .iter()
                    .zip(&days)
                    .map(|(list, day)| sum(list.iter().map(|group| group.count * group.count)) / day.count)),
            ),
            groups: (days.len() as f64, inner_count),
        };
        let enough =
            table.between.degrees_of_freedom >= 1.0 && table.within.degrees_of_freedom >= 1.0 && table.within.sum > 0.0;
        if enough {
            return Ok(table);
        }
        let message = format!(
            "An analysis of variance needs two groups or more with a scatter within them, found {} with {} readings.",
            days.len(),
            all.count
        );
        Err(Problem::new(Code::DesignIncomplete, message)
            .hint("Give each group its readings, two or more in some of them."))
    }

    /// Whether the groups are groups of groups.
    pub fn is_nested(&self) -> bool {
        self.inner.degrees_of_freedom > 0.0
    }

    /// What the between mean square is tested against: the inner groups where there are any, else the readings.
    fn error_of_between(&self) -> Squares {
        if self.is_nested() { self.inner } else { self.within }
    }

    /// F of the outer groups.
    pub fn f_between(&self) -> f64 {
        self.between.square() / self.error_of_between().square()
    }

    /// Probability of a larger F by chance, for the outer groups.
    pub fn p_between(&self) -> f64 {
        f_upper(self.f_between(), self.between.degrees_of_freedom, self.error_of_between().degrees_of_freedom)
    }

    /// F of the inner groups, all of them taken together when the outer ones do not differ.
    fn inner_pooled(&self) -> Squares {
        self.between.with(self.inner)
    }

    fn p_inner(&self) -> f64 {
        let pooled = self.inner_pooled();
        f_upper(pooled.square() / self.within.square(), pooled.degrees_of_freedom, self.within.degrees_of_freedom)
    }

    /// Standard deviation between inner groups of one outer group.
    pub fn inner_deviation(&self) -> f64 {
        self.inner_variance().sqrt()
    }

    fn inner_variance(&self) -> f64 {
        let n_0 = (self.count - self.squared_counts.2) / self.inner.degrees_of_freedom;
        if self.is_nested() { ((self.inner.square() - self.within.square()) / n_0).max(0.0) } else { 0.0 }
    }

    fn outer_number(&self) -> f64 {
        (self.count - self.squared_counts.0 / self.count) / self.between.degrees_of_freedom
    }

    fn between_variance(&self) -> f64 {
        let inner_weight =
            (self.squared_counts.2 - self.squared_counts.1 / self.count) / self.between.degrees_of_freedom;
        let expected = self.within.square() + if self.is_nested() { inner_weight * self.inner_variance() } else { 0.0 };
        ((self.between.square() - expected) / self.outer_number()).max(0.0)
    }

    /// Standard deviation between outer groups; zero where the groups differ less than their scatter.
    pub fn between_deviation(&self) -> f64 {
        self.between_variance().sqrt()
    }

    /// Standard uncertainties of the standard deviations within, between, and between inner groups.
    pub fn uncertainties(&self) -> [f64; 3] {
        let of_component = |deviation: f64, above: Squares, below: Squares, number: f64| {
            let term = |squares: Squares| squares.square() * squares.square() / squares.degrees_of_freedom;
            if deviation > 0.0 { (2.0 * (term(above) + term(below))).sqrt() / number / (2.0 * deviation) } else { 0.0 }
        };
        let inner_number = (self.count - self.squared_counts.2) / self.inner.degrees_of_freedom;
        [
            uncertainty_of_deviation(self.within.square().sqrt(), self.within.degrees_of_freedom),
            of_component(self.between_deviation(), self.between, self.error_of_between(), self.outer_number()),
            of_component(self.inner_deviation(), self.inner, self.within, inner_number),
        ]
    }

    /// Variance of the mean, its degrees of freedom, and what it rests on.
    pub fn of_mean(&self, significance: f64, always: bool) -> (f64, f64, Basis) {
        let total = self.between.with(self.inner).with(self.within);
        let of_all = (total.square() / self.count, total.degrees_of_freedom, Basis::AllReadings);
        let squared = self.count * self.count;
        if self.p_between() < significance || always {
            let variance = self.within.square() / self.count
                + self.inner_variance() * self.squared_counts.1 / squared
                + self.between_variance() * self.squared_counts.0 / squared;
            // A between component that is always taken never makes the uncertainty smaller.
            return (variance.max(of_all.0), self.between.degrees_of_freedom, Basis::Between);
        }
        if self.is_nested() && self.p_inner() < significance {
            let pooled = self.inner_pooled();
            let n_0 = (self.count - self.squared_counts.1 / self.count) / pooled.degrees_of_freedom;
            let component = ((pooled.square() - self.within.square()) / n_0).max(0.0);
            let variance = self.within.square() / self.count + component * self.squared_counts.1 / squared;
            return (variance, pooled.degrees_of_freedom, Basis::Inner);
        }
        of_all
    }

    /// What the tests said and what the uncertainty of the mean rests on.
    pub fn decisions(&self, significance: f64, always: bool) -> Vec<Decision> {
        let (_, freedom, basis) = self.of_mean(significance, always);
        let verdict = |p: f64| if p < significance { "significant" } else { "not significant" };
        let error = self.error_of_between();
        let p = self.p_between();
        let mut list = vec![Decision {
            what: "between groups".into(),
            decided: format!(
                "F({}, {}) = {}, {}; {} at the level {}",
                self.between.degrees_of_freedom,
                error.degrees_of_freedom,
                brief(self.f_between()),
                probability(p),
                verdict(p),
                brief(significance)
            ),
        }];
        if self.is_nested() {
            let (pooled, p) = (self.inner_pooled(), self.p_inner());
            list.push(Decision {
                what: "between inner groups".into(),
                decided: format!(
                    "F({}, {}) = {}, {}; {}",
                    pooled.degrees_of_freedom,
                    self.within.degrees_of_freedom,
                    brief(pooled.square() / self.within.square()),
                    probability(p),
                    verdict(p)
                ),
            });
        }
        let rests = match basis {
            Basis::Between if p < significance => "the scatter between groups",
            Basis::Between => "the scatter between groups, taken in any case, and not less than that of all readings",
            Basis::Inner => "the scatter between inner groups",
            Basis::AllReadings => "all readings taken together",
        };
        list.push(Decision {
            what: "uncertainty of the mean".into(),
            decided: format!("from {rests}, {freedom} degrees of freedom"),
        });
        list
    }
}

/// Number, mean and sum of squared departures of readings, counted from a common origin.
#[derive(Debug, Clone, Copy)]
struct Moments {
    count: f64,
    mean: f64,
    squares: f64,
}

impl Moments {
    fn of(group: &Group, rows: &[f64], origin: f64) -> Moments {
        let at = |row: &usize| rows.get(*row).map_or(f64::NAN, |value| value - origin);
        match group {
            Group::Rows(list) => {
                let count = list.len() as f64;
                let mean = sum(list.iter().map(at)) / count;
                Moments { count, mean, squares: sum(list.iter().map(|row| (at(row) - mean) * (at(row) - mean))) }
            }
            Group::Summary { row, count, standard_deviation } => {
                let count = *count as f64;
                Moments { count, mean: at(row), squares: standard_deviation * standard_deviation * (count - 1.0) }
            }
        }
    }

    fn joined(parts: &[Moments]) -> Moments {
        let count = sum(parts.iter().map(|part| part.count));
        Moments { count, mean: sum(parts.iter().map(|part| part.count * part.mean)) / count, squares: 0.0 }
    }
}

/// The rule: one column; output the mean of all readings.
#[derive(Debug, Clone)]
pub struct GroupedMean {
    pub groups: Vec<Vec<Group>>,
    /// The probability below which an F test counts as significant.
    pub significance: f64,
    /// Whether the between component is taken in any case.
    pub always_between: bool,
}

impl Estimator for GroupedMean {
    fn outputs(&self) -> usize {
        1
    }

    fn estimate(&self, columns: &[&[f64]]) -> Result<Estimate, Problem> {
        let rows = columns.first().copied().unwrap_or_default();
        let table = Table::new(&self.groups, rows)?;
        let (variance, degrees_of_freedom, _) = table.of_mean(self.significance, self.always_between);
        let mut weights = vec![0.0; rows.len()];
        for group in self.groups.iter().flatten() {
            let (list, share) = match group {
                Group::Rows(list) => (list.as_slice(), 1.0),
                Group::Summary { row, count, .. } => (std::slice::from_ref(row), *count as f64),
            };
            for row in list {
                if let Some(weight) = weights.get_mut(*row) {
                    *weight = share / table.count;
                }
            }
        }
        Ok(Estimate {
            values: vec![table.mean],
            jacobian: vec![vec![weights]],
            own_covariance: vec![vec![variance]],
            degrees_of_freedom,
            decisions: table.decisions(self.significance, self.always_between),
            residuals: rows.iter().map(|row| row - table.mean).collect(),
        })
    }
}

fn of_guide(what: impl Fn(&Table) -> f64) -> f64 {
    let means = [172.0, 116.0, 13.0, 144.0, 106.0, 31.0, 60.0, 125.0, 163.0, 41.0];
    let deviations = [60.0, 77.0, 111.0, 101.0, 67.0, 93.0, 80.0, 73.0, 88.0, 86.0];
    let groups: Vec<Vec<Group>> = deviations
        .iter()
        .enumerate()
        .map(|(row, s)| vec![Group::Summary { row, count: 5, standard_deviation: *s }])
        .collect();
    Table::new(&groups, &means).map_or(f64::NAN, |table| what(&table))
}

/// The certified set of resistivities.
struct SiliconTable;

impl SiliconTable {
    fn make() -> Option<Table> {
        let rows = [
            196.3052, 196.124, 196.189, 196.2569, 196.3403, 196.3042, 196.3825, 196.1669, 196.3257, 196.0422, 196.1303,
            196.2005, 196.2889, 196.0343, 196.1811, 196.2795, 196.1748, 196.1494, 196.1485, 195.9885, 196.2119,
            196.1051, 196.185, 196.0052, 196.209,
        ];
        let groups: Vec<Vec<Group>> =
            (0..5).map(|group| vec![Group::Rows((5 * group..5 * group + 5).collect())]).collect();
        Table::new(&groups, &rows).ok()
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn near(ours: f64, other: f64) {
        assert!((ours / other - 1.0).abs() < 1e-12, "{ours} {other}");
    }

    /// Three days of two series of three readings; mean squares from another program.
    #[test]
    fn series_within_days() {
        let rows = [1.0, 1.2, 1.1, 1.4, 1.5, 1.3, 2.0, 2.1, 2.3, 1.8, 1.7, 1.9, 0.9, 1.0, 0.8, 1.2, 1.1, 1.3];
        let series = |start: usize| Group::Rows((start..start + 3).collect());
        let groups: Vec<Vec<Group>> = (0..3).map(|day| vec![series(6 * day), series(6 * day + 3)]).collect();
        let table = Table::new(&groups, &rows).expect("a table");
        near(table.between.square(), 1.3938888888888885);
        near(table.inner.square(), 0.14555555555555552);
        near(table.within.square(), 0.012222222222222212);
        near(table.inner_deviation(), 0.21081851067789192);
        near(table.between_deviation(), 0.4561310727801336);
        near(table.f_between(), 9.576335877862595);
        // F(2, 3) = 9.58 lies just beyond the 5 % point of 9.55.
        assert!(table.p_between() < 0.05 && table.p_between() > 0.049);
        let (variance, freedom, basis) = table.of_mean(0.05, false);
        near(variance.sqrt(), 0.2782773285859598);
        assert_eq!((freedom, basis), (2.0, Basis::Between));
        let (variance, freedom, basis) = table.of_mean(0.01, false);
        near(variance.sqrt(), 0.18928063951135402);
        assert_eq!((freedom, basis), (5.0, Basis::Inner));
    }

    #[test]
    fn unequal_groups() {
        let rows = [3.1, 3.4, 3.3, 2.8, 2.9, 3.6, 3.5, 3.9, 3.8];
        let groups = [0..3, 3..5, 5..9].map(|rows| vec![Group::Rows(rows.collect())]);
        let table = Table::new(&groups, &rows).expect("a table");
        near(table.mean, 3.3666666666666667);
        near(table.between.square(), 0.5041666666666671);
        near(table.within.square(), 0.025277777777777757);
        near(table.between_deviation(), 0.40714767685599157);
        near(table.of_mean(0.05, false).0.sqrt(), 0.2493153016926954);
    }

    /// Days that differ less than their readings: a component taken in any case makes nothing smaller.
    #[test]
    fn the_uncertainty_is_never_made_smaller() {
        let rows = [1.0, 3.0, 1.1, 2.9, 0.9, 3.1];
        let groups: Vec<Vec<Group>> = (0..3).map(|day| vec![Group::Rows(vec![2 * day, 2 * day + 1])]).collect();
        let table = Table::new(&groups, &rows).expect("a table");
        assert_eq!(table.between_deviation(), 0.0);
        let (free, nu, _) = table.of_mean(0.05, false);
        let (always, fewer, _) = table.of_mean(0.05, true);
        assert!(always >= free && nu == 5.0 && fewer == 2.0);
    }

    #[test]
    fn one_group_is_refused() {
        let single = vec![vec![Group::Rows(vec![0, 1, 2])]];
        assert_eq!(Table::new(&single, &[1.0, 2.0, 3.0]).expect_err("one group").code, Code::DesignIncomplete);
        let alone = vec![vec![Group::Rows(vec![0])], vec![Group::Rows(vec![1])]];
        assert!(Table::new(&alone, &[1.0, 2.0]).is_err());
    }
}
