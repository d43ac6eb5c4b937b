//! Every standard and instrument used, with the certificate that was valid.

use crate::block::{Block, Engine, Fields};
use crate::graph::Origin;
use crate::intake::Place;
use crate::report::Markup;
use crate::report::table::{Cell, Table};

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
    blocks.sort_by_key(|block| ORDER.iter().position(|kind| *kind == block.kind.name));
    for block in blocks {
        match block.kind.name {
            "mass-standard" | "instrument" | "item" | "resistor" | "voltage-standard" | "laser" | "time-base" => {
                let calibrations = block.fields().mappings("calibrations");
                let used = calibrations.into_iter().filter(|calibration| is_used(engine, calibration.place()));
                table.rows.extend(used.map(|calibration| row(engine, block, calibration)));
                table.rows.extend(row_of_stated(engine, block));
            }
            "gravity-station" => {
                let determinations = block.fields().mappings("determinations");
                let used = determinations.into_iter().filter(|one| is_used(engine, one.place()));
                table.rows.extend(used.map(|one| row(engine, block, one)));
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

/// Standards first, then what compared them, then what measured beside.
const ORDER: &[&str] = &[
    "mass-standard",
    "item",
    "comparator",
    "instrument",
    "voltage-standard",
    "resistor",
    "laser",
    "time-base",
    "gravity-station",
];

/// The row of a block that states its value by itself, or realizes it.
fn row_of_stated(engine: &Engine, block: &Block) -> Option<Vec<Cell>> {
    let fields = block.fields();
    let typed = |name: &str| dressed(engine, fields, name);
    let value = match block.kind.name {
        _ if fields.get("calibrations").is_some() => return None,
        "time-base" => format!("relative offset {}", typed("offset")),
        "laser" => format!("frequency {}", typed("frequency")),
        "voltage-standard" => {
            format!("f/K_J at {}, time base {}, K_J = 2e/h exact", typed("frequency"), fields.words("time_base"))
        }
        _ => return None,
    };
    let source = fields.words("source");
    let source = if source.is_empty() { "—".to_string() } else { source };
    Some(vec![title(block).into(), "—".into(), source.into(), "—".into(), "—".into(), value.into()])
}

fn row(engine: &Engine, block: &Block, calibration: Fields<'_>) -> Vec<Cell> {
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
    let typed = |name: &str| dressed(engine, calibration, name);
    if let Some(words) = electric_value(calibration, &typed) {
        return words;
    }
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

/// The value of a certificate of a frequency, voltage or resistance.
fn electric_value(calibration: Fields<'_>, typed: &dyn Fn(&str) -> String) -> Option<String> {
    let (name, words) = [
        ("ratio", "ratio"),
        ("resistance", "resistance"),
        ("step_voltage", "step"),
        ("frequency", "frequency"),
        ("offset", "relative offset"),
        ("value", "gravity at the mark"),
    ]
    .into_iter()
    .find(|(name, _)| calibration.get(name).is_some())?;
    let relative = match calibration.get("relative_uncertainty") {
        Some(_) => format!(", relative standard uncertainty {}", typed("relative_uncertainty")),
        None => String::new(),
    };
    let converted = if calibration.get("conversion").is_some() { "; units of 1990, carried to the SI" } else { "" };
    Some(format!("{words} {}{relative}{converted}", typed(name)))
}

/// A value as typed, in the style of the laboratory.
fn dressed(engine: &Engine, fields: Fields<'_>, name: &str) -> String {
    let dress = |text: &str| crate::report::prose_text::dress(text, engine.laboratory.style);
    match fields.mapping(name) {
        // The long form of a value.
        Some(long) => {
            let u = long.words("u");
            let u = if u.is_empty() { u } else { format!(", u = {}", dress(&u)) };
            format!("{}{u}", dress(&long.words("value")))
        }
        None => dress(&fields.words(name)),
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
