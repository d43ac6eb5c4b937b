//! Every standard and instrument used, with the certificate that was valid.

use crate::block::{Block, Engine, Fields};
use crate::graph::Origin;
use crate::intake::Place;
use crate::report::Markup;
use crate::report::table::Table;

/// The certificates the results rest on.
pub fn traceability_table(engine: &Engine) -> Markup {
    let header = vec![
        "Standard or instrument".into(),
        "Certificate".into(),
        "Issued by".into(),
        "Date".into(),
        "Due".into(),
        "Value used".into(),
    ];
    let mut table = Table::new("Standards and instruments, with the certificates valid on the days of use", header);
    table.columns = vec!["1fr", "auto", "1fr", "auto", "auto", "1.1fr"];
    let used = engine.used_blocks();
    let mut blocks: Vec<&Block> = used.iter().filter_map(|name| engine.blocks().get(name)).collect();
    // Standards first, then what weighed them, then what measured the air.
    blocks.sort_by_key(|block| {
        ["mass-standard", "item", "comparator", "instrument"].iter().position(|kind| *kind == block.kind.name)
    });
    for block in blocks {
        match block.kind.name {
            "mass-standard" | "instrument" | "item" => {
                for calibration in block
                    .fields()
                    .mappings("calibrations")
                    .into_iter()
                    .filter(|calibration| is_used(engine, calibration.place()))
                {
                    table.rows.push(row(engine, block, calibration));
                }
            }
            "comparator" => table.rows.push(vec![
                title(block).into(),
                "—".into(),
                "—".into(),
                "—".into(),
                "—".into(),
                comparator_words(block).into(),
            ]),
            _ => {}
        }
    }
    table.markup()
}

fn row(engine: &Engine, block: &Block, calibration: Fields<'_>) -> Vec<crate::report::table::Cell> {
    let text = |name: &str| {
        let words = calibration.words(name);
        if words.is_empty() { "—".to_string() } else { words }
    };
    vec![
        title(block).into(),
        text("certificate").into(),
        text("issued_by").into(),
        text("date").into(),
        text("due").into(),
        value_used(engine, calibration).into(),
    ]
}

fn title(block: &Block) -> String {
    let identification = block.fields().words("identification");
    match identification.is_empty() || identification.starts_with(&block.label()) {
        true if !identification.is_empty() => identification,
        true => block.label(),
        false => format!("{} ({identification})", block.label()),
    }
}

fn value_used(engine: &Engine, calibration: Fields<'_>) -> String {
    let typed = |name: &str| crate::report::prose_text::dress(&calibration.words(name), engine.laboratory.style);
    let basis = calibration.words("basis");
    let basis = if basis.is_empty() {
        String::new()
    } else {
        format!("; unit basis: {}", engine.laboratory.basis_label(&basis))
    };
    if calibration.get("mass").is_some() {
        return format!("mass {}{basis}", typed("mass"));
    }
    if calibration.get("conventional_mass").is_some() {
        return format!("conventional mass {}{basis}", typed("conventional_mass"));
    }
    match calibration.get("correction") {
        Some(_) => format!("correction {}", typed("correction")),
        None => format!("table of {} corrections", calibration.mappings("table").len()),
    }
}

fn comparator_words(block: &Block) -> String {
    match block.fields().mapping("sensitivity").and_then(|sensitivity| sensitivity.text("weight")) {
        Some(_) => "sensitivity determined with its sensitivity weight".into(),
        None => "sensitivity stated in its record".into(),
    }
}

/// Whether an input of the graph stands inside this place.
fn is_used(engine: &Engine, place: Place) -> bool {
    let graph = engine.graph();
    graph.inputs.iter().any(|input| match &graph.node(input.node).origin {
        Origin::Stated(at) => at.file == place.file && at.start >= place.start && at.end <= place.end,
        _ => false,
    })
}
