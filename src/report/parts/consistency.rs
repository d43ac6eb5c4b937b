//! Results combined, beside each other: uncertainty, weight, difference from the combined result, test of consistency.

use crate::block::Engine;
use crate::block::combining::{Combined, Member};
use crate::quantity::{Style, Unit, choose_unit};
use crate::report::Markup;
use crate::report::figures::{Figure, fixed, freedom, significant};
use crate::report::table::{Cell, Table, head, symbol};

/// The results of a combination with the test of their consistency; nothing before it was built.
pub fn consistency_part(engine: &Engine, name: &str) -> Option<Markup> {
    let found = engine.found::<Combined>(name)?;
    let combined = Figure::of(engine, found.result)?;
    let figures: Vec<Figure> = found.members.iter().map(|one| Figure::of(engine, one.id)).collect::<Option<_>>()?;
    let sheet = Sheet::new(engine.laboratory.style, &combined, &found.members);
    let unit = sheet.style.unit(&sheet.unit);
    let header = vec![
        "Result".into(),
        "Value".into(),
        head("u", &unit),
        head("w", ""),
        head("d", &unit),
        head("u_d", &unit),
        ratio_head(),
    ];
    let caption = format!(
        "{name}: results combined; standard uncertainty u, weight w, difference d from the combined result with its own standard uncertainty, shared parts left out",
    );
    let mut table = Table::new(caption, header);
    table.columns = vec!["auto", "1fr", "auto", "auto", "auto", "auto", "auto"];
    table.align = vec!["left", "right", "right", "right", "right", "right", "right"];
    for (member, figure) in found.members.iter().zip(&figures) {
        table.rows.push(sheet.row(member, figure));
    }
    let u = combined.coverage.standard_uncertainty;
    let blank = || Cell::from("");
    table.closing.push(vec![
        "combined".into(),
        combined.standard().into(),
        sheet.amount(u).into(),
        fixed(sheet.style, 1.0, 3).into(),
        blank(),
        blank(),
        blank(),
    ]);
    for (what, value) in statistics(&found, &sheet) {
        table.closing.push(vec![what.into(), value.into(), blank(), blank(), blank(), blank(), blank()]);
    }
    let mut made = table.markup();
    made.push_code("#note[");
    for (what, decided) in &found.decisions {
        made.push_text(&format!("{}: {decided}. ", capital(what)));
    }
    made.push_code("]\n\n");
    Some(made)
}

/// The head of differences in units of their uncertainty.
fn ratio_head() -> Cell {
    let mut made = symbol("d");
    made.push_text("/").push(&symbol("u_d"));
    Cell::Markup(made)
}

/// How differences are printed beside the combined result.
struct Sheet {
    style: Style,
    unit: Unit,
    decimals: i32,
    /// Differences may be far more certain than the results.
    fine_decimals: i32,
    combined: f64,
}

impl Sheet {
    fn new(style: Style, combined: &Figure, members: &[Member]) -> Sheet {
        let u = combined.coverage.standard_uncertainty;
        let unit = choose_unit(u, &combined.unit);
        let decimals_of = |u: f64| {
            let lead = unit.difference_decimal_from_si(u).and_then(|u| u.rounded_to_digits(2).leading_power());
            lead.map_or(0, |lead| (1 - lead).max(0))
        };
        let largest = members.iter().map(|one| one.difference_uncertainty).fold(0.0, f64::max);
        let decimals = decimals_of(u);
        let fine_decimals = decimals_of(largest).clamp(decimals, decimals + 6);
        Sheet { style, decimals, fine_decimals, unit, combined: combined.value }
    }

    fn amount(&self, difference: f64) -> String {
        fixed(self.style, self.unit.difference_from_si(difference), self.decimals)
    }

    fn fine(&self, difference: f64) -> String {
        fixed(self.style, self.unit.difference_from_si(difference), self.fine_decimals)
    }

    fn row(&self, member: &Member, figure: &Figure) -> Vec<Cell> {
        let difference = figure.value - self.combined;
        let u = member.difference_uncertainty;
        let ratio = if u > 0.0 { fixed(self.style, difference / u, 2) } else { "—".into() };
        vec![
            member.path.clone().into(),
            figure.standard().into(),
            self.amount(member.standard_uncertainty).into(),
            fixed(self.style, member.weight, 3).into(),
            self.fine(difference).into(),
            self.fine(u).into(),
            ratio.into(),
        ]
    }
}

/// What stands below the results: the test, and what was added for disagreement.
fn statistics(found: &Combined, sheet: &Sheet) -> Vec<(&'static str, String)> {
    let style = sheet.style;
    let mut list = Vec::new();
    if let Some(test) = &found.consistency {
        list.push(("χ²", significant(style, test.chi_square, 3)));
        list.push(("ν", freedom(style, test.degrees_of_freedom)));
        list.push(("p", significant(style, test.probability, 2)));
        list.push(("Birge ratio", significant(style, test.birge_ratio, 3)));
    }
    if let Some(tau) = found.between {
        list.push(("between results", format!("{} {}", sheet.fine(tau), style.unit(&sheet.unit))));
    }
    if let Some(factor) = found.expansion {
        list.push(("expansion factor", significant(style, factor, 3)));
    }
    list
}

fn capital(text: &str) -> String {
    let mut letters = text.chars();
    letters.next().map_or_else(String::new, |first| first.to_uppercase().chain(letters).collect())
}
