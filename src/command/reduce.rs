//! `reduce`: re-run every computation.

use super::folder::Folder;
use super::{Outcome, Stopped, terminal};
use crate::report::listing::{Results, list_results};
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
    let shown = results.quantities.iter().filter(|one| all || one.origin.what == "computed");
    let rows: Vec<Vec<String>> = shown
        .map(|one| {
            let freedom = one.degrees_of_freedom.map_or_else(|| "∞".to_string(), |freedom| format!("{freedom:.1}"));
            let freedom = if one.standard_uncertainty.is_some_and(|u| u > 0.0) { freedom } else { String::new() };
            vec![one.name.clone(), one.printed.clone(), freedom, one.label.clone()]
        })
        .collect();
    let heads = vec!["result".to_string(), "value(u)".into(), "ν_eff".into(), "what it is".into()];
    terminal::columns(&[vec![heads], rows].concat(), &[false, true, true, false])
}
