//! The list of contents that a report on a primary realization states, each row with what stands for it.
//!
//! The rows follow the mise en pratique of the kilogram (SI Brochure, appendix 2), the note of the CCM on dissemination
//! (2019), JCGM 100:2008, clause 7, and the practice of comparison protocols.

use crate::block::realization::Campaign;
use crate::block::{Engine, Fields};
use crate::report::Markup;
use crate::report::table::Table;

/// How a row is met.
pub enum Met {
    /// By what the record or the report states.
    Stated(String),
    /// Left out, with the reason given.
    LeftOut(String),
    /// Not met: what to write.
    Missing(&'static str),
}

/// One row: number, content, what stands for it.
pub struct Row {
    pub number: &'static str,
    pub content: &'static str,
    pub met: Met,
}

type Look = fn(&Engine, Fields<'_>, &Campaign) -> Option<String>;

struct Rule {
    number: &'static str,
    content: &'static str,
    /// What to write where it is missing.
    mend: &'static str,
    look: Look,
}

static RULES: &[Rule] = &[
    Rule {
        number: "R1",
        content: "definition used, method, statement that it is a primary method",
        mend: "write `method: {primary: …}`",
        look: |_, fields, _| {
            let method = fields.mapping("method")?;
            Some(format!("definition of 2019 with exact h; primary method: {}", method.words("primary")))
        },
    },
    Rule {
        number: "R2",
        content: "peer-reviewed description with budget, evidence of stability, u ≤ 2 × 10⁻⁷",
        mend: "write `description:` and `stability:` under method",
        look: |engine, fields, _| {
            let method = fields.mapping("method")?;
            let (description, stability) = (words(method, "description")?, words(method, "stability")?);
            let relative = relative_uncertainty(engine, fields)?;
            (relative <= 2e-7).then(|| format!("{description}; {stability}; relative u = {:.1} × 10⁻⁹", relative * 1e9))
        },
    },
    Rule {
        number: "R3",
        content: "artefact: material, volume, expansion, mass centre, surface area, magnetic properties",
        mend: "complete the artefact's record: material, volume, expansion, mass_centre_height, surface_area, magnetic_susceptibility, magnetic_polarisation",
        look: |engine, fields, _| {
            let artefact = engine.blocks().get(&fields.text("artefact")?.text)?;
            let needed = [
                "material",
                "volume",
                "expansion",
                "mass_centre_height",
                "surface_area",
                "magnetic_susceptibility",
                "magnetic_polarisation",
            ];
            let all = needed.iter().all(|name| artefact.fields().get(name).is_some());
            all.then(|| format!("record of {}", artefact.label()))
        },
    },
    Rule {
        number: "R4",
        content: "measurand: in vacuum or air, at which temperature, pressure, time after pumping down",
        mend: "write temperature, pressure and after under measurand",
        look: |engine, fields, _| {
            let measurand = fields.mapping("measurand")?;
            Some(format!(
                "mass in {} at {}, {}; {}",
                measurand.words("state"),
                value(engine, measurand, "temperature")?,
                value(engine, measurand, "pressure")?,
                words(measurand, "after")?
            ))
        },
    },
    Rule {
        number: "R5",
        content: "history of the artefact: cleaning, storage, vacuum and air, transport",
        mend: "write `history:` with dates",
        look: |_, fields, _| {
            let events = fields.mappings("history");
            let last = events.last()?;
            Some(format!("{} events, the last {}: {}", events.len(), last.words("date"), last.words("event")))
        },
    },
    Rule {
        number: "R6",
        content: "every determination with its status and reason",
        mend: "list every run under determinations",
        look: |_, _, campaign| {
            let used = campaign.determinations.iter().filter(|run| run.excluded.is_none()).count();
            let all = campaign.determinations.len();
            Some(format!("{all} determinations, {used} used, {} not used", all - used))
        },
    },
    Rule {
        number: "R7",
        content: "rejection rule fixed before the campaign; result with and without",
        mend: "write `rejection_rule:`",
        look: |engine, fields, _| {
            let rule = engine.blocks().get(&fields.text("rejection_rule")?.text)?;
            Some(format!("rule {} of {}", rule.name(), rule.fields().words("date")))
        },
    },
    Rule {
        number: "R8",
        content: "model equation and every correction with sign, value, u, source",
        mend: "show `corrections(…)` of the determinations",
        look: |_, _, _| Some("tables of corrections; equations in the annex".into()),
    },
    Rule {
        number: "R9",
        content: "full uncertainty budget",
        mend: "show the budget",
        look: |engine, fields, _| {
            relative_uncertainty(engine, fields).map(|_| "budget, recomputed from the readings".into())
        },
    },
    Rule {
        number: "R10",
        content: "parts common to all determinations not divided by √n",
        mend: "show the budget",
        look: |_, _, _| Some("each line of the budget says what it enters; common inputs are one quantity each".into()),
    },
    Rule {
        number: "R11",
        content: "covariances: between determinations, and with the previous result",
        mend: "write `earlier_result:` with its correlation",
        look: |engine, fields, _| {
            let earlier = fields.mapping("earlier_result")?;
            Some(format!(
                "through shared quantities; correlation {} with the result of {}",
                value(engine, earlier, "correlation")?,
                earlier.words("date")
            ))
        },
    },
    Rule {
        number: "R12",
        content: "traceability of every auxiliary quantity",
        mend: "show `traceability()`",
        look: |_, _, _| Some("table of standards and instruments".into()),
    },
    Rule {
        number: "R13",
        content: "maintenance between realizations: alignment, velocity, g, current, voltage",
        mend: "write `maintenance:` with dates",
        look: |_, fields, _| {
            let checks = fields.mappings("maintenance");
            let named: Vec<String> =
                checks.iter().map(|check| format!("{} ({})", check.words("check"), check.words("date"))).collect();
            (!named.is_empty()).then(|| named.join("; "))
        },
    },
    Rule {
        number: "R14",
        content: "drift of the primary standard since the realization, with u",
        mend: "write `drift:` with the day of use",
        look: |engine, fields, _| {
            let drift = fields.mapping("drift")?;
            Some(format!("{} until {}", value(engine, drift, "change")?, drift.words("to")))
        },
    },
    Rule {
        number: "R15",
        content: "result: value, u, degrees of freedom, U with k; relative value; departure from nominal",
        mend: "see the other complaints",
        look: |engine, fields, _| relative_uncertainty(engine, fields).map(|_| "results".into()),
    },
    Rule {
        number: "R16",
        content: "consistency: χ², Birge ratio, trend",
        mend: "two determinations or more are needed",
        look: |_, _, campaign| {
            let (freedom, probability) = campaign.agreement?;
            let verdict =
                if probability < 0.05 { "not consistent at the level 0.05" } else { "consistent at the level 0.05" };
            Some(format!("p = {probability:.2} for {freedom} degrees of freedom: {verdict}"))
        },
    },
    Rule {
        number: "R17",
        content: "unit basis used for dissemination and its link",
        mend: "write `dissemination:` with basis and shift",
        look: |engine, fields, _| {
            let dissemination = fields.mapping("dissemination")?;
            let basis = dissemination.words("basis");
            let basis = engine.laboratory.basis_label(&basis);
            Some(format!("{basis}, shift {}", value(engine, dissemination, "shift")?))
        },
    },
    Rule {
        number: "R18",
        content: "software, its version and validation; where the data are kept",
        mend: "write `archive:`",
        look: |_, fields, _| {
            Some(format!(
                "libripens {}, with the dossier attached to this report; {}",
                crate::VERSION,
                words(fields, "archive")?
            ))
        },
    },
    Rule {
        number: "R19",
        content: "blindness: who held an offset, when it was opened, what was changed afterwards",
        mend: "write `blind_offset:`",
        look: |_, fields, _| {
            let offset = fields.mapping("blind_offset")?;
            Some(format!(
                "held by the {}, opened {}; changed afterwards: {}",
                offset.words("held_by"),
                offset.words("opened"),
                offset.words("changed_afterwards")
            ))
        },
    },
    Rule {
        number: "R20",
        content: "notes on safety and transport that travel with the artefact",
        mend: "write `handling:`",
        look: |_, fields, _| words(fields, "handling"),
    },
];

fn words(fields: Fields<'_>, name: &str) -> Option<String> {
    Some(fields.words(name)).filter(|words| !words.trim().is_empty())
}

/// A value as typed, in the style of the report.
fn value(engine: &Engine, fields: Fields<'_>, name: &str) -> Option<String> {
    Some(crate::report::prose_text::dress(&words(fields, name)?, engine.laboratory.style))
}

fn relative_uncertainty(engine: &Engine, fields: Fields<'_>) -> Option<f64> {
    let block = engine.blocks().values().find(|block| std::ptr::eq(block.fields().node, fields.node))?;
    let graph = engine.graph();
    let id = graph.find(&format!("{}.mass", block.name()))?;
    let u = crate::graph::standard_uncertainty(&graph, &crate::graph::sensitivities(&graph, id));
    Some(u / graph.number(id).abs()).filter(|relative| relative.is_finite())
}

/// The rows of a campaign; nothing where it could not be computed.
pub fn rows(engine: &Engine, name: &str) -> Option<Vec<Row>> {
    let block = engine.blocks().get(name)?;
    let campaign = engine.found::<Campaign>(name)?;
    let left_out = block.fields().mappings("left_out");
    let row = |rule: &Rule| {
        let reason = left_out.iter().find(|entry| entry.words("row") == rule.number).map(|entry| entry.words("reason"));
        let met = match ((rule.look)(engine, block.fields(), &campaign), reason) {
            (Some(words), _) => Met::Stated(words),
            (None, Some(reason)) => Met::LeftOut(reason),
            (None, None) => Met::Missing(rule.mend),
        };
        Row { number: rule.number, content: rule.content, met }
    };
    Some(RULES.iter().map(row).collect())
}

/// The rows as a table.
pub fn contents_table(engine: &Engine, name: &str) -> Option<Markup> {
    let header = vec!["Row".into(), "Content of a report on a primary realization".into(), "Stated".into()];
    let mut table = Table::new("Contents checked one by one", header);
    table.columns = vec!["auto", "1fr", "1.3fr"];
    table.align = vec!["left", "left", "left"];
    for row in rows(engine, name)? {
        let stated = match row.met {
            Met::Stated(words) => words,
            Met::LeftOut(reason) => format!("left out: {reason}"),
            Met::Missing(mend) => format!("missing: {}", mend.replace('`', "")),
        };
        table.rows.push(vec![row.number.into(), row.content.into(), stated.into()]);
    }
    Some(table.markup())
}
