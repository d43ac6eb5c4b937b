//! `trail`: from one quantity down to the readings and stated values it rests on.

use super::folder::{Folder, find_quantity};
use super::{Outcome, Stopped, terminal};
use crate::block::Engine;
use crate::graph::{Graph, Node, NodeId, Op, Origin, ReadingColumn, TrailStep, sensitivities, trail};
use crate::intake::{Place, Sources};
use crate::quantity::Style;
use crate::report::listing::print_quantity;
use std::collections::{BTreeMap, BTreeSet};
use std::path::PathBuf;

/// Walks from one quantity down to its readings: each quantity with its value, the method and formula it was computed
/// by, then what it rests on, indented by one step.
///
/// A stated value shows its text as typed, with file and line; readings show their file, column and lines. Each
/// quantity is set out once, at its shortest distance from the one asked for.
#[derive(Debug, clap::Args)]
pub struct Trail {
    /// The quantity by its path, such as W1.mass; `reduce --all` lists every one
    quantity: String,
    /// The laboratory folder, or any place in it
    #[arg(default_value = ".")]
    folder: PathBuf,
    /// Go down so many steps at most
    #[arg(long, value_name = "N")]
    depth: Option<usize>,
}

impl Trail {
    /// Runs the command.
    pub fn run(self) -> Result<Outcome, Stopped> {
        let folder = Folder::find(&self.folder)?;
        let progress = terminal::progress("following the trail");
        let engine = Engine::read(&folder.disk, folder.campaign.as_deref()).map_err(Stopped::because)?;
        let found = find_quantity(&engine, &self.quantity)?;
        progress.finish_and_clear();
        let Some(quantity) = found else {
            terminal::say_complaints(&engine);
            return Ok(Outcome::Faults);
        };
        terminal::print(&trail_text(&engine, quantity, self.depth.unwrap_or(usize::MAX)));
        Ok(terminal::say_complaints(&engine))
    }
}

/// A walk down a trail.
struct Walk<'w> {
    engine: &'w Engine<'w>,
    graph: &'w Graph,
    sources: &'w Sources,
    style: Style,
    steps: BTreeMap<NodeId, TrailStep>,
    deepest: usize,
    set_out: BTreeSet<NodeId>,
    lines: Vec<String>,
}

impl Walk<'_> {
    /// Sets out one quantity and everything that is nearest to the top through it.
    fn descend(&mut self, id: NodeId, depth: usize) {
        self.set_out.insert(id);
        self.head(id, depth);
        let Some(rests_on) = self.steps.get(&id).map(|step| step.rests_on.clone()) else { return };
        if depth >= self.deepest {
            return;
        }
        let mut elsewhere = Vec::new();
        for operand in rests_on {
            let shortest = self.steps.get(&operand).map_or(0, |step| step.depth);
            match self.set_out.contains(&operand) {
                false if shortest == depth + 1 => self.descend(operand, depth + 1),
                seen => elsewhere.push((operand, seen)),
            }
        }
        self.mention(&elsewhere, depth + 1);
    }

    /// What a quantity also rests on, set out elsewhere in the trail.
    fn mention(&mut self, elsewhere: &[(NodeId, bool)], depth: usize) {
        for (seen, words) in [(true, "see above"), (false, "see below")] {
            let names: Vec<String> = elsewhere
                .iter()
                .filter(|(_, above)| *above == seen)
                .map(|(id, _)| path(self.graph.node(*id)))
                .collect();
            if !names.is_empty() {
                self.line(depth, &format!("{}: {words}", names.join(", ")));
            }
        }
    }

    /// Name, value and label; then method and formula, or where the number comes from.
    fn head(&mut self, id: NodeId, depth: usize) {
        let node = self.graph.node(id);
        let label = node.name.as_ref().map_or_else(String::new, |name| name.label.clone());
        self.line(depth, &format!("{} = {}   {label}", path(node), self.value(id)));
        for detail in self.details(id) {
            self.line(depth, &format!("  · {detail}"));
        }
    }

    fn value(&self, id: NodeId) -> String {
        let value = self.graph.value(id);
        match value.length() {
            None => print_quantity(self.graph, id, &sensitivities(self.graph, id), self.style),
            Some(rows) => format!("{}{}", terminal::counted(rows, "value"), self.span(id).unwrap_or_default()),
        }
    }

    /// From the smallest to the largest of a column, to seven digits.
    fn span(&self, id: NodeId) -> Option<String> {
        let (node, rows) = (self.graph.node(id), self.graph.value(id).rows());
        let unit = &node.name.as_ref()?.unit;
        let smallest = rows.iter().copied().min_by(f64::total_cmp)?;
        let largest = rows.iter().copied().max_by(f64::total_cmp)?;
        let number = |value: f64| Some(self.style.number(&unit.decimal_from_si(value)?.rounded_to_digits(7)));
        Some(format!(", {} to {} {}", number(smallest)?, number(largest)?, unit.text()).trim_end().to_string())
    }

    fn details(&self, id: NodeId) -> Vec<String> {
        let node = self.graph.node(id);
        let mut details = match &node.origin {
            Origin::Computed(method) => vec![format!("{}: {}", method.title, method.formula)],
            Origin::Constant(source) => vec![format!("constant: {source}")],
            Origin::Assumed(reason) => vec![format!("assumed, not written in a record: {reason}")],
            Origin::Stated(place) => vec![self.stated(id, "stated in", *place)],
            Origin::Reading(place) => vec![self.stated(id, "read in", *place)],
            Origin::Readings(column) => vec![self.column(column)],
            Origin::ReadingList(places) => vec![self.list(places)],
            Origin::Step => Vec::new(),
        };
        details.extend(self.engine.corrections_of(&node.origin).iter().map(|correction| correction.words()));
        details.extend(self.decisions(node));
        details
    }

    /// What an estimator found in its own readings.
    fn decisions(&self, node: &Node) -> Vec<String> {
        let Op::Output(estimator, _) = &node.op else { return Vec::new() };
        let Some(estimator) = self.graph.estimators.get(estimator.index()) else { return Vec::new() };
        estimator.estimate.decisions.iter().map(|decision| format!("{}: {}", decision.what, decision.decided)).collect()
    }

    fn stated(&self, id: NodeId, deed: &str, place: Place) -> String {
        let (file, line, _) = self.sources.locate(place);
        let Some(input) = self.graph.input(id) else { return format!("{deed} {file}, line {line}") };
        let typed = input.text.as_ref().map_or_else(String::new, |text| format!(" as \"{text}\""));
        let freedom = if input.degrees_of_freedom.is_finite() {
            format!(" with {} degrees of freedom", terminal::degrees_of_freedom(input.degrees_of_freedom))
        } else {
            String::new()
        };
        let distribution = match input.distribution.word() {
            "exact" => "no uncertainty of its own".to_string(),
            word => format!("{word} distribution{freedom}"),
        };
        format!("{deed} {file}, line {line}{typed}; {distribution}")
    }

    fn column(&self, column: &ReadingColumn) -> String {
        let rows = terminal::counted(column.lines.len(), "reading");
        format!(
            "{rows} in {}, column {}, {}",
            self.sources.file(column.file).path,
            column.column,
            line_ranges(&column.lines)
        )
    }

    fn list(&self, places: &[Place]) -> String {
        let readings = terminal::counted(places.len(), "reading");
        let Some(first) = places.first() else { return readings };
        let file = self.sources.file(first.file);
        let lines: Vec<u32> = places.iter().map(|place| file.line_of(place.start) as u32).collect();
        format!("{readings} in {}, {}", file.path, line_ranges(&lines))
    }

    fn line(&mut self, depth: usize, text: &str) {
        self.lines.push(format!("{}{}", "    ".repeat(depth), text.trim_end()));
    }
}

/// The trail of a quantity as text, at most so many steps deep.
fn trail_text(engine: &Engine, quantity: NodeId, deepest: usize) -> String {
    let (graph, sources) = (engine.graph(), engine.sources());
    let steps = trail(&graph, quantity).steps;
    let (count, longest) = (steps.len(), steps.iter().map(|step| step.depth).max().unwrap_or(0));
    let mut walk = Walk {
        engine,
        graph: &graph,
        sources: &sources,
        style: engine.laboratory.style,
        steps: steps.into_iter().map(|step| (step.node, step)).collect(),
        deepest,
        set_out: BTreeSet::new(),
        lines: Vec::new(),
    };
    walk.descend(quantity, 0);
    let whole = format!("{} in all, at most {} from the top.", quantities(count), terminal::counted(longest, "step"));
    let hidden = count - walk.set_out.len();
    let rest = if hidden > 0 { format!(" Left out by --depth: {}.", quantities(hidden)) } else { String::new() };
    format!("{}\n\n{whole}{rest}\n", walk.lines.join("\n"))
}

fn quantities(count: usize) -> String {
    if count == 1 { "1 quantity".into() } else { format!("{count} quantities") }
}

fn path(node: &Node) -> String {
    node.name.as_ref().map_or_else(String::new, |name| name.path.clone())
}

/// `line 4`, `lines 2 to 17`, `lines 2 to 17 and 34 to 49`; the outermost lines alone when the runs are many.
fn line_ranges(lines: &[u32]) -> String {
    let distinct: BTreeSet<u32> = lines.iter().copied().collect();
    let mut runs: Vec<(u32, u32)> = Vec::new();
    for line in distinct {
        match runs.last_mut() {
            Some((_, end)) if *end + 1 == line => *end = line,
            _ => runs.push((line, line)),
        }
    }
    let run = |(start, end): &(u32, u32)| if start == end { format!("{start}") } else { format!("{start} to {end}") };
    match runs.as_slice() {
        [] => "no lines".into(),
        [(start, end)] if start == end => format!("line {start}"),
        [one] => format!("lines {}", run(one)),
        [first, second] => format!("lines {} and {}", run(first), run(second)),
        [(start, _), .., (_, end)] => format!("among lines {start} to {end}"),
    }
}

#[cfg(test)]
mod tests {
    use super::line_ranges;

    #[test]
    fn lines_read_as_a_person_would_say_them() {
        assert_eq!(line_ranges(&[]), "no lines");
        assert_eq!(line_ranges(&[4, 4]), "line 4");
        assert_eq!(line_ranges(&[4, 3, 5]), "lines 3 to 5");
        assert_eq!(line_ranges(&[1, 2, 7, 8]), "lines 1 to 2 and 7 to 8");
        assert_eq!(line_ranges(&[1, 3, 5]), "among lines 1 to 5");
    }
}
