//! `reduce`: re-run every computation.

use super::folder::Folder;
use super::{Outcome, Stopped, terminal};
use crate::report::listing::{Listed, Results, list_results};
use std::path::PathBuf;

/// Re-runs every computation from the records and raw data, and prints each result with its standard uncertainty.
#[derive(Debug, clap::Args)]
pub struct Reduce {
    /// The laboratory folder, or any place in it; a campaign's folder reduces that campaign
    #[arg(default_value = ".")]
    folder: PathBuf,
    /// Print every named quantity as JSON (shape: see README)
    #[arg(long, conflicts_with = "csv")]
    json: bool,
    /// Print every named quantity as CSV
    #[arg(long)]
    csv: bool,
    /// Print stated inputs, readings and constants too
    #[arg(long)]
    all: bool,
}

impl Reduce {
    /// Runs the command.
    pub fn run(self) -> Result<Outcome, Stopped> {
        let folder = Folder::find(&self.folder)?;
        let progress = terminal::progress("reducing the records");
        let engine = crate::reduce(&folder.disk, folder.campaign.as_deref()).map_err(Stopped::because)?;
        let results = list_results(&engine);
        progress.finish_and_clear();
        match (self.json, self.csv) {
            (true, _) => terminal::print(&results.json()),
            (_, true) => terminal::print(&results.csv()),
            _ => terminal::print(&table(&results, self.all)),
        }
        Ok(terminal::say_complaints(&engine))
    }
}

fn table(results: &Results, all: bool) -> String {
    let shown: Vec<&Listed> = results.quantities.iter().filter(|one| all || one.origin.what == "computed").collect();
    if shown.is_empty() {
        return String::new();
    }
    let heads = vec!["result".to_string(), "value(u)".into(), "ν_eff".into(), "what it is".into()];
    let rows: Vec<Vec<String>> = std::iter::once(heads).chain(shown.into_iter().map(row)).collect();
    terminal::columns(&rows, &[false, true, true, false])
}

fn row(one: &Listed) -> Vec<String> {
    let printed = one.rows.map_or_else(|| one.printed.clone(), |rows| terminal::counted(rows, "value"));
    // A column has its degrees of freedom row by row, an exact value none.
    let uncertain = one.standard_uncertainty.is_some_and(|uncertainty| uncertainty > 0.0);
    let freedom = if uncertain {
        terminal::degrees_of_freedom(one.degrees_of_freedom.unwrap_or(f64::INFINITY))
    } else {
        String::new()
    };
    vec![one.name.clone(), printed, freedom, one.label.clone()]
}
