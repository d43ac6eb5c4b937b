//! Ambient conditions: range and mean of each quantity.

use crate::block::Engine;
use crate::block::ambient::clock;
use crate::quantity::Kind;
use crate::report::Markup;
use crate::report::figures::{Figure, fixed};
use crate::report::table::{Cell, Table, head};

/// The range of the logged conditions and of the air density.
pub fn conditions_table(engine: &Engine, name: &str) -> Markup {
    let Some(conditions) = engine.conditions(name) else { return Markup::new() };
    let style = engine.laboratory.style;
    let span =
        (conditions.times.first().copied().unwrap_or(f64::NAN), conditions.times.last().copied().unwrap_or(f64::NAN));
    let caption = format!(
        "{name}: conditions from {} to {}, {} readings, corrected",
        clock(span.0),
        clock(span.1),
        conditions.times.len()
    );
    let mut table =
        Table::new(caption, vec!["Quantity".into(), "".into(), "Lowest".into(), "Highest".into(), "Mean".into()]);
    let density = ("air density", "ρ_a", crate::method::unit("kg/m3"), conditions.density);
    for (words, symbol, unit, id) in conditions.columns.iter().cloned().chain([density]) {
        let decimals = match engine.graph().node(id).kind {
            Kind::Density => 5,
            Kind::RelativeHumidity => 2,
            _ => 3,
        };
        let rows = engine.graph().value(id).rows().to_vec();
        let shown = |value: f64| -> Cell { fixed(style, unit.from_si(value), decimals).into() };
        let lowest = rows.iter().copied().fold(f64::INFINITY, f64::min);
        let highest = rows.iter().copied().fold(f64::NEG_INFINITY, f64::max);
        let mean = rows.iter().sum::<f64>() / rows.len().max(1) as f64;
        table.rows.push(vec![
            words.into(),
            head(symbol, &style.unit(&unit)),
            shown(lowest),
            shown(highest),
            shown(mean),
        ]);
    }
    table.align = vec!["left", "left", "right", "right", "right"];
    let mut made = table.markup();
    let carbon_dioxide = engine.graph().value(conditions.carbon_dioxide).length().is_none();
    if carbon_dioxide && let Some(figure) = Figure::of(engine, conditions.carbon_dioxide) {
        made.push_code("#note[")
            .push_text(&format!("Mole fraction of carbon dioxide: {}. Air density by CIPM-2007.", figure.standard()))
            .push_code("]\n\n");
    }
    made
}
