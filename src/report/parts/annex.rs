//! The annex: symbols used, and the files attached.

use super::budget::SMALLEST_SHARE;
use crate::block::Engine;
use crate::graph::{NodeId, budget};
use crate::report::Markup;
use crate::report::dossier::Dossier;
use crate::report::table::{Cell, Table, symbol};
use std::collections::BTreeMap;

/// Every symbol of the results and their budgets, with meaning and unit.
pub fn symbols_table(engine: &Engine, results: &[NodeId]) -> Markup {
    let graph = engine.graph();
    let mut used: BTreeMap<String, (String, String)> = BTreeMap::new();
    for id in results {
        if let Some(name) = &graph.node(*id).name {
            used.insert(name.symbol.clone(), (name.label.clone(), name.unit.text_or_one()));
        }
        for line in
            budget(&graph, *id).lines.into_iter().filter(|line| line.share >= SMALLEST_SHARE && !line.symbol.is_empty())
        {
            used.entry(line.symbol).or_insert((line.label, line.unit.text_or_one()));
        }
    }
    let fixed = [
        ("c_i", "sensitivity coefficient, derivative of the result with respect to a quantity"),
        ("k", "coverage factor"),
        ("u", "standard uncertainty"),
        ("u_c", "combined standard uncertainty"),
        ("U", "expanded uncertainty"),
        ("ν", "degrees of freedom"),
        ("ν_eff", "effective degrees of freedom"),
    ];
    let mut table =
        Table::new("Symbols used in results and budgets", vec!["Symbol".into(), "Quantity".into(), "Unit".into()]);
    table.columns = vec!["auto", "1fr", "auto"];
    for (text, (label, unit)) in used {
        table.rows.push(vec![Cell::Markup(symbol(&text)), label.into(), engine.laboratory.style.digits(&unit).into()]);
    }
    for (text, label) in fixed {
        table.rows.push(vec![Cell::Markup(symbol(text)), label.into(), "".into()]);
    }
    table.markup()
}

/// The corrections of the files used, with both texts; nothing when there are none.
pub fn corrections_table(engine: &Engine) -> Option<Markup> {
    let files = engine.used_files();
    let header = vec!["File and line".into(), "As first written".into(), "Corrected to".into(), "Reason".into()];
    let mut table = Table::new("Corrections of records and raw data this report rests on", header);
    table.columns = vec!["1.2fr", "1fr", "1fr", "1.2fr"];
    table.align = vec!["left"; 4];
    for one in engine.corrections().iter().filter(|one| files.contains(&one.record)) {
        let date = one.date.map(|date| date.to_string()).unwrap_or_default();
        table.rows.push(vec![
            format!("{}, line {}", one.record, one.line).into(),
            one.old.clone().into(),
            one.new.clone().into(),
            format!("{}: {} ({}, {date})", one.name, one.reason.trim_end_matches('.'), one.by).into(),
        ]);
    }
    (!table.rows.is_empty()).then(|| table.markup())
}

/// Every attached file with its path, size and digest.
pub fn files_table(engine: &Engine, dossier: &Dossier) -> Markup {
    let header =
        vec!["Attached as".into(), "Path in the laboratory folder".into(), "Bytes".into(), "SHA-256 begins".into()];
    let mut table = Table::new("Files attached to this report; their full digests stand in contents.json", header);
    table.columns = vec!["1fr", "1fr", "auto", "auto"];
    table.align = vec!["left", "left", "right", "left"];
    for entry in &dossier.contents.files {
        table.rows.push(vec![
            entry.name.clone().into(),
            entry.path.clone().unwrap_or_else(|| "made by the program".into()).into(),
            engine.laboratory.style.digits(&entry.bytes.to_string()).into(),
            entry.sha256.get(..16).unwrap_or_default().into(),
        ]);
    }
    table.markup()
}
