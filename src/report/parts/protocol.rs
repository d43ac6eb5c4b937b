//! The table that a comparison between laboratories asks for, made from the same records as the report.

use crate::block::Engine;
use crate::block::realization::Campaign;
use crate::graph::{NodeId, correlation, sensitivities};
use crate::quantity::Kind;
use crate::report::Markup;
use crate::report::figures::{Figure, fixed, freedom, significant};
use crate::report::table::{Cell, Table, head};
use chrono::DateTime;

/// The participant's table for these campaigns, one column each; with several, their correlations below.
pub fn protocol_table(engine: &Engine, names: &[String]) -> Option<Markup> {
    let mut header: Vec<Cell> = vec!["Item of the protocol".into()];
    header.extend(names.iter().map(|name| Cell::from(artefact(engine, name))));
    let mut table = Table::new("Table for the comparison protocol", header);
    let columns: Vec<Vec<(String, String)>> = names.iter().map(|name| column(engine, name)).collect::<Option<_>>()?;
    table.align = vec!["left"; names.len() + 1];
    for (index, (item, _)) in columns.first()?.iter().enumerate() {
        let mut row: Vec<Cell> = vec![item.clone().into()];
        row.extend(columns.iter().map(|column| Cell::from(column[index].1.clone())));
        table.rows.push(row);
    }
    table.columns = std::iter::once("auto").chain(names.iter().map(|_| "1fr")).collect();
    let mut made = table.markup();
    if names.len() > 1 {
        made.push(&correlations(engine, names)?);
    }
    Some(made)
}

fn artefact(engine: &Engine, name: &str) -> String {
    let named = engine.blocks().get(name).and_then(|block| block.fields().text("artefact"));
    named
        .and_then(|artefact| engine.blocks().get(&artefact.text))
        .map_or_else(|| name.to_string(), |block| block.label())
}

fn mass(engine: &Engine, name: &str) -> Option<NodeId> {
    engine.graph().find(&format!("{name}.mass"))
}

fn column(engine: &Engine, name: &str) -> Option<Vec<(String, String)>> {
    let block = engine.blocks().get(name)?;
    let (fields, campaign) = (block.fields(), engine.found::<Campaign>(name)?);
    let figure = Figure::of(engine, mass(engine, name)?)?;
    let style = engine.laboratory.style;
    let dressed = |text: &str| crate::report::prose_text::dress(text, style);
    let u = figure.coverage.standard_uncertainty;
    let micrograms = |value: f64| significant(style, value * 1e9, 2);
    let used: Vec<_> = campaign.determinations.iter().filter(|run| run.excluded.is_none()).collect();
    let measurand = fields.mapping("measurand")?;
    let values = ["temperature", "pressure"].iter().map(|field| dressed(&measurand.words(field)));
    let held = values.chain([measurand.words("after")]).filter(|words| !words.is_empty());
    let own = used.iter().map(|run| run.own_uncertainty).fold(0.0, f64::max);
    let mut rows = vec![
        ("participant", format!("{}, {}", engine.laboratory.name, engine.laboratory.address)),
        ("dates of measurement (UTC)", days(&campaign)),
        ("method", fields.mapping("method").map_or_else(String::new, |method| method.words("primary"))),
        ("determinations used, of all", format!("{} of {}", used.len(), campaign.determinations.len())),
        (
            "measurand",
            std::iter::once(format!("mass in {}", measurand.words("state"))).chain(held).collect::<Vec<_>>().join("; "),
        ),
        ("value", figure.standard()),
        ("standard uncertainty/µg", micrograms(u)),
        ("effective degrees of freedom", freedom(style, figure.coverage.effective_degrees_of_freedom)),
        ("relative standard uncertainty × 10⁹", significant(style, u / figure.value.abs() * 1e9, 2)),
        ("largest standard uncertainty of one determination alone/µg", micrograms(own)),
    ];
    rows.push((
        "correlation with the result before",
        fields.mapping("earlier_result").map_or_else(
            || "no earlier result stated".into(),
            |earlier| {
                format!("{} with the result of {}", dressed(&earlier.words("correlation")), earlier.words("date"))
            },
        ),
    ));
    rows.push((
        "handed in",
        fields.mapping("submitted").map_or_else(
            || "not yet".into(),
            |submitted| format!("{} on {}; frozen since", dressed(&submitted.words("mass")), submitted.words("date")),
        ),
    ));
    Some(rows.into_iter().map(|(item, text)| (item.to_string(), text)).collect())
}

fn days(campaign: &Campaign) -> String {
    let day = |seconds: f64| {
        DateTime::from_timestamp(seconds as i64, 0).map_or_else(String::new, |at| at.date_naive().to_string())
    };
    let first = campaign.determinations.iter().map(|run| run.at.start).fold(f64::INFINITY, f64::min);
    let last = campaign.determinations.iter().map(|run| run.at.end).fold(f64::NEG_INFINITY, f64::max);
    if day(first) == day(last) { day(first) } else { format!("{} to {}", day(first), day(last)) }
}

fn correlations(engine: &Engine, names: &[String]) -> Option<Markup> {
    let ids: Vec<NodeId> = names.iter().map(|name| mass(engine, name)).collect::<Option<_>>()?;
    let graph = engine.graph();
    let sweeps: Vec<_> = ids.iter().map(|id| sensitivities(&graph, *id)).collect();
    let mut header: Vec<Cell> = vec![head("r", "")];
    header.extend(names.iter().map(|name| Cell::from(artefact(engine, name))));
    let mut table = Table::new(format!("Correlation coefficients of the values ({})", Kind::Mass.word()), header);
    table.align = std::iter::once("left").chain(names.iter().map(|_| "right")).collect();
    for (index, name) in names.iter().enumerate() {
        let mut row: Vec<Cell> = vec![artefact(engine, name).into()];
        row.extend(
            sweeps
                .iter()
                .map(|other| Cell::from(fixed(engine.laboratory.style, correlation(&graph, &sweeps[index], other), 3))),
        );
        table.rows.push(row);
    }
    Some(table.markup())
}
