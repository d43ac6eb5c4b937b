//! `validate`: every published check built in, as a dated record.

use super::disk::today;
use super::{Outcome, Stopped, terminal};
use crate::method::{METHODS, WorkedExample};
use crate::numeric::distribution::coverage_factor;
use chrono::NaiveDate;
use serde::Serialize;

/// Computes every published or independently computed check built into the program and prints the validation record:
/// what was given, the printed value, the value found here, their difference and the tolerance.
///
/// The tolerance is half a unit of the last printed digit. Keep the record with the version of the program it names.
#[derive(Debug, clap::Args)]
pub struct Validate {
    /// Print the record as JSON
    #[arg(long)]
    json: bool,
}

impl Validate {
    /// Runs the command.
    pub fn run(self) -> Result<Outcome, Stopped> {
        let record = ValidationRecord::make(today());
        terminal::print(&if self.json { record.json() } else { record.text() });
        Ok(if record.agreeing == record.checks.len() { Outcome::AllWell } else { Outcome::Faults })
    }
}

/// Probability that a normal variable lies within two standard deviations.
const TWO_SIGMA: f64 = 0.954_499_736_103_641_6;

/// Coverage factors of the t distribution against the published table.
static COVERAGE_FACTORS: &[WorkedExample] = &[
    of_table("p = 95.45 %, ν = 1", "13.97", || coverage_factor(TWO_SIGMA, 1.0)),
    of_table("p = 95.45 %, ν = 2", "4.53", || coverage_factor(TWO_SIGMA, 2.0)),
    of_table("p = 95.45 %, ν = 5", "2.65", || coverage_factor(TWO_SIGMA, 5.0)),
    of_table("p = 95.45 %, ν = 10", "2.28", || coverage_factor(TWO_SIGMA, 10.0)),
    of_table("p = 95.45 %, ν = 20", "2.13", || coverage_factor(TWO_SIGMA, 20.0)),
    of_table("p = 95.45 %, ν = 50", "2.05", || coverage_factor(TWO_SIGMA, 50.0)),
    of_table("p = 95.45 %, ν = 100", "2.025", || coverage_factor(TWO_SIGMA, 100.0)),
    of_table("p = 95.45 %, ν infinite", "2.000", || coverage_factor(TWO_SIGMA, f64::INFINITY)),
    of_table("p = 95 %, ν = 10", "2.23", || coverage_factor(0.95, 10.0)),
    of_table("p = 99 %, ν = 10", "3.17", || coverage_factor(0.99, 10.0)),
];

const fn of_table(given: &'static str, printed: &'static str, found: fn() -> f64) -> WorkedExample {
    WorkedExample { source: "JCGM 100:2008, table G.2", given, quantity: "coverage factor t_p(ν)", printed, found }
}

#[derive(Serialize)]
struct ValidationRecord {
    format: u32,
    engine: &'static str,
    date: NaiveDate,
    checks: Vec<Check>,
    agreeing: usize,
}

#[derive(Serialize)]
struct Check {
    method: &'static str,
    source: &'static str,
    given: &'static str,
    quantity: &'static str,
    printed: &'static str,
    found: f64,
    difference: f64,
    tolerance: f64,
    agrees: bool,
}

impl Check {
    fn of(method: &'static str, example: &WorkedExample) -> Check {
        let found = (example.found)();
        Check {
            method,
            source: example.source,
            given: example.given,
            quantity: example.quantity,
            printed: example.printed,
            found,
            difference: found - example.value(),
            tolerance: example.tolerance(),
            agrees: example.agrees(),
        }
    }

    /// Our value with three digits more than the source prints.
    fn found_text(&self) -> String {
        let (mantissa, exponent) = self.printed.split_once('e').map_or((self.printed, None), |(m, e)| (m, Some(e)));
        let decimals = mantissa.split_once('.').map_or(0, |(_, fraction)| fraction.len()) + 3;
        let text = match exponent {
            Some(_) => format!("{:.decimals$e}", self.found),
            None => format!("{:.decimals$}", self.found),
        };
        text.replacen('-', if self.printed.starts_with('−') { "−" } else { "-" }, 1)
    }

    fn rows(&self, number: usize) -> Vec<Vec<String>> {
        let verdict = if self.agrees { "yes" } else { "NO" };
        let line = |head: &str, text: String| vec![String::new(), head.to_string(), text];
        vec![
            vec![format!("{number}"), "method".into(), self.method.into()],
            line("source", self.source.into()),
            line("given", self.given.into()),
            line("quantity", self.quantity.into()),
            line("printed", self.printed.into()),
            line("found", self.found_text()),
            line("difference", if self.difference == 0.0 { "0".into() } else { format!("{:.1e}", self.difference) }),
            line("tolerance", format!("{:.1e}", self.tolerance)),
            line("agrees", verdict.into()),
            vec![String::new()],
        ]
    }
}

impl ValidationRecord {
    fn make(date: NaiveDate) -> ValidationRecord {
        let of_methods = METHODS
            .iter()
            .flat_map(|method| method.examples.iter().map(|example| Check::of(method.info.name, example)));
        let of_factors = COVERAGE_FACTORS.iter().map(|example| Check::of("coverage factor", example));
        let checks: Vec<Check> = of_methods.chain(of_factors).collect();
        let agreeing = checks.iter().filter(|check| check.agrees).count();
        ValidationRecord { format: 1, engine: crate::VERSION, date, checks, agreeing }
    }

    fn text(&self) -> String {
        let rows: Vec<Vec<String>> =
            self.checks.iter().enumerate().flat_map(|(index, check)| check.rows(index + 1)).collect();
        format!(
            "Validation record\n\nprogram  libripens {}\ndate     {}\nchecks   {}\n\n{}{} of {} checks agree.\n",
            self.engine,
            self.date,
            self.checks.len(),
            terminal::columns(&rows, &[true, false, false]),
            self.agreeing,
            self.checks.len()
        )
    }

    fn json(&self) -> String {
        let mut text = serde_json::to_string_pretty(self).unwrap_or_default();
        text.push('\n');
        text
    }
}
