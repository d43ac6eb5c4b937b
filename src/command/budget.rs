//! `budget`: where the uncertainty of results comes from, and what they share.

use super::folder::{Folder, find_quantity};
use super::trials::{Amount, JsonTrials, Tried};
use super::{Outcome, Stopped, covariance, terminal};
use crate::block::Engine;
use crate::graph::{
    Budget as GraphBudget, BudgetLine, Coverage, Graph, NodeId, Sensitivities, Source, budget, coverage, joint,
    second_order_uncertainty, sensitivities, standard_uncertainty,
};
use crate::quantity::{Decimal, Style, Unit, choose_unit};
use crate::report::listing::print_quantity;
use serde::Serialize;
use std::collections::BTreeMap;
use std::path::{Path, PathBuf};

/// Prints each result with its standard uncertainty, coverage factor and expanded uncertainty, and the uncertainty
/// budget: one line for each input or scatter of readings, the largest contribution first.
///
/// The contribution is |c| u in a unit that suits the result; the share is its part of u_c². Only the blocks that the
/// results rest on are computed. Several results are followed by their covariance and correlation.
#[derive(Debug, clap::Args)]
#[command(override_usage = "libripens budget [OPTIONS] <QUANTITY>... [FOLDER]")]
pub struct Budget {
    /// The results by their paths, such as W1.mass W2.mass; `reduce` lists them, `reduce --all` lists inputs too. The
    /// laboratory folder, or any place in it, may stand last
    #[arg(value_name = "QUANTITY", required = true)]
    named: Vec<String>,
    /// Print lines with a share below 0.01 % too, instead of folding them into one
    #[arg(long)]
    all: bool,
    /// Print the budget as JSON, every line, in coherent SI units
    #[arg(long)]
    json: bool,
    #[command(flatten)]
    amount: Amount,
}

impl Budget {
    /// Runs the command.
    pub fn run(self) -> Result<Outcome, Stopped> {
        let (paths, place) = paths_and_folder(self.named);
        let folder = Folder::find(&place)?;
        let progress = terminal::progress("computing the budget");
        let engine = Engine::read(&folder.disk, folder.campaign.as_deref()).map_err(Stopped::because)?;
        let found: Vec<Option<NodeId>> =
            paths.iter().map(|path| find_quantity(&engine, path)).collect::<Result<_, _>>()?;
        let Some(ids) = found.into_iter().collect::<Option<Vec<NodeId>>>() else {
            progress.finish_and_clear();
            terminal::say_complaints(&engine);
            return Ok(Outcome::Faults);
        };
        let sheets: Vec<Sheet> =
            paths.iter().zip(&ids).map(|(path, id)| Sheet::draw_up(&engine, *id, path)).collect::<Result<_, _>>()?;
        let tried = self.amount.run(&engine, &ids)?;
        progress.finish_and_clear();
        let printed = match self.json {
            true => json(&engine, &sheets, &ids, tried.as_deref()),
            false => text(&engine, &sheets, &ids, tried.as_deref(), self.all),
        };
        terminal::print(&printed?);
        Ok(terminal::say_complaints(&engine))
    }
}

/// The quantities asked for and the folder, which stands last when it is there or looks like a path.
fn paths_and_folder(mut named: Vec<String>) -> (Vec<String>, PathBuf) {
    let is_folder = |last: &String| last.contains(['/', '\\']) || Path::new(last).exists();
    match named.len() > 1 && named.last().is_some_and(is_folder) {
        true => {
            let folder = named.pop().unwrap_or_default();
            (named, folder.into())
        }
        false => (named, ".".into()),
    }
}

fn text(
    engine: &Engine,
    sheets: &[Sheet],
    ids: &[NodeId],
    tried: Option<&[Tried]>,
    all: bool,
) -> Result<String, Stopped> {
    let mut parts = Vec::new();
    for (index, sheet) in sheets.iter().enumerate() {
        parts.push(sheet.text(all));
        parts.extend(tried.and_then(|tried| tried.get(index)).map(|one| one.text(sheet.style, &sheet.unit)));
    }
    if sheets.len() > 1 {
        let found = joint(&engine.graph(), ids).map_err(|problem| Stopped(problem.message))?;
        let paths: Vec<String> = sheets.iter().map(|sheet| sheet.path.clone()).collect();
        parts.push(covariance::text(&engine.graph(), &paths, ids, &found, engine.laboratory.style));
    }
    Ok(parts.join("\n"))
}

/// One result as one object; several as a list of such objects with their covariance and correlation.
fn json(engine: &Engine, sheets: &[Sheet], ids: &[NodeId], tried: Option<&[Tried]>) -> Result<String, Stopped> {
    let trials = |index: usize| tried.and_then(|tried| tried.get(index)).map(Tried::json);
    let mut made: Vec<JsonSheet> = sheets.iter().enumerate().map(|(index, sheet)| sheet.json(trials(index))).collect();
    let text = match (made.pop(), made.is_empty()) {
        (Some(only), true) => serde_json::to_string_pretty(&only),
        (last, _) => {
            let found = joint(&engine.graph(), ids).map_err(|problem| Stopped(problem.message))?;
            let budgets = made.into_iter().chain(last).collect();
            serde_json::to_string_pretty(&JsonSheets {
                format: 1,
                engine: crate::VERSION,
                budgets,
                covariance: found.covariance,
                correlation: found.correlation,
            })
        }
    };
    Ok(text.unwrap_or_default() + "\n")
}

/// A budget with the result it belongs to.
struct Sheet {
    path: String,
    label: String,
    printed: String,
    unit: Unit,
    si_unit: String,
    value: f64,
    /// State and unit basis in words, for a mass that has them.
    holds: Vec<String>,
    budget: GraphBudget,
    /// The number of rows of each input that is a column.
    rows: BTreeMap<Source, usize>,
    coverage: Coverage,
    /// The standard uncertainty with terms of second order, where first order knows none.
    second_order: Option<String>,
    style: Style,
}

/// Shares below this are folded into one line.
const SMALLEST_SHARE: f64 = 1e-4;

/// u with terms of second order, where first order knows none although an input is uncertain.
fn second_order(graph: &Graph, measurand: NodeId, style: Style) -> Option<String> {
    let first = standard_uncertainty(graph, &sensitivities(graph, measurand));
    let second = second_order_uncertainty(graph, measurand).filter(|second| first == 0.0 && *second > 0.0)?;
    let unit = graph.node(measurand).name.as_ref().map_or_else(Unit::one, |name| name.unit.clone());
    style.difference(second, &choose_unit(second, &unit), 2).ok()
}

impl Sheet {
    fn draw_up(engine: &Engine, measurand: NodeId, path: &str) -> Result<Sheet, Stopped> {
        let (graph, laboratory) = (engine.graph(), &engine.laboratory);
        let node = graph.node(measurand);
        if let Some(rows) = graph.value(measurand).length() {
            return Err(Stopped(format!("{path} is a column of {rows} values; a budget belongs to a single value")));
        }
        let derivatives = sensitivities(&graph, measurand);
        let name = node.name.as_ref();
        let state = node.state.map(|state| format!("in {}", state.word()));
        let basis = node.basis.as_ref().map(|basis| format!("on the basis of the {}", laboratory.basis_label(basis)));
        Ok(Sheet {
            path: path.into(),
            label: name.map_or_else(String::new, |name| name.label.clone()),
            printed: print_quantity(&graph, measurand, &derivatives, laboratory.style),
            unit: name.map_or_else(Unit::one, |name| name.unit.clone()),
            si_unit: node.dimension.to_string(),
            value: graph.number(measurand),
            holds: state.into_iter().chain(basis).collect(),
            rows: rows_of_columns(&graph),
            budget: complete(budget(&graph, measurand), &graph, &derivatives),
            coverage: coverage(&graph, &derivatives, laboratory.settings),
            second_order: second_order(&graph, measurand, laboratory.style),
            style: laboratory.style,
        })
    }

    /// The unit of contributions: one in which the combined standard uncertainty reads well.
    fn contribution_unit(&self) -> Unit {
        choose_unit(self.budget.standard_uncertainty, &self.unit)
    }

    fn text(&self, all: bool) -> String {
        let title = format!("{}: {}\n\n", self.path, self.label);
        if self.budget.lines.is_empty() {
            let why = match &self.second_order {
                Some(u) => format!(
                    "First order knows no uncertainty here, because every slope vanishes at the estimate; with terms of second order u = {u}. `--trials 100000` gives the distribution."
                ),
                None => "It is exact, or nothing it rests on has an uncertainty: there is no budget.".into(),
            };
            return format!("{title}  {}\n\n{why}\n", self.printed);
        }
        format!("{title}{}\n{}", self.result(), self.table(all))
    }

    fn result(&self) -> String {
        let unit = self.contribution_unit();
        let amount = |uncertainty: f64| self.style.difference(uncertainty, &unit, 2).unwrap_or_default();
        let probability = format!("{:.2}", self.coverage.probability * 100.0);
        let probability = probability.trim_end_matches('0').trim_end_matches('.');
        let freedom = match terminal::degrees_of_freedom(self.coverage.degrees_of_freedom) {
            beyond if beyond.starts_with('>') => beyond,
            freedom => format!("= {freedom}"),
        };
        let mut rows = vec![
            ("value", self.printed.clone()),
            ("u_c", amount(self.coverage.standard_uncertainty)),
            ("ν_eff", terminal::degrees_of_freedom(self.coverage.effective_degrees_of_freedom)),
            ("k", format!("{} for p = {probability} % and ν {freedom}", self.number(self.coverage.factor, 3))),
            ("U = k u_c", amount(self.coverage.expanded_uncertainty)),
        ];
        if !self.holds.is_empty() {
            rows.insert(1, ("holds", self.holds.join(", ")));
        }
        let rows: Vec<Vec<String>> = rows.into_iter().map(|(head, text)| vec![format!("  {head}"), text]).collect();
        terminal::columns(&rows, &[false, false])
    }

    fn table(&self, all: bool) -> String {
        let unit = self.contribution_unit();
        let contribution = if unit.is_one() { "|c| u".to_string() } else { format!("|c| u/{}", bracketed(&unit)) };
        let heads = ["quantity", "symbol", "estimate", "u", "type", "distribution", "ν", "c", &contribution, "share"];
        let mut rows = vec![heads.map(String::from).to_vec()];
        let (shown, folded): (Vec<_>, Vec<_>) =
            self.budget.lines.iter().partition(|line| all || line.share >= SMALLEST_SHARE);
        rows.extend(shown.iter().map(|line| self.row(line, &unit)));
        if !folded.is_empty() {
            let share: f64 = folded.iter().map(|line| line.share).sum();
            let variance: f64 = folded.iter().map(|line| line.contribution * line.contribution).sum();
            rows.push(self.closing(&terminal::counted(folded.len(), "further line"), variance.sqrt(), share, &unit));
        }
        rows.push(self.closing("all together", self.budget.standard_uncertainty, 1.0, &unit));
        terminal::columns(&rows, &[false, false, true, true, false, false, true, true, true, true])
    }

    fn row(&self, line: &BudgetLine, unit: &Unit) -> Vec<String> {
        let own = self.own_unit(line);
        let uncertainty = self.style.difference(line.standard_uncertainty, &own, 2).unwrap_or_default();
        vec![
            line.path.clone(),
            line.symbol.clone(),
            self.estimate(line, &own),
            uncertainty,
            line.evaluation.letter().into(),
            line.distribution.into(),
            terminal::degrees_of_freedom(line.degrees_of_freedom),
            self.coefficient(line, &own, unit),
            self.contribution(line.contribution, unit),
            share(line.share),
        ]
    }

    fn closing(&self, words: &str, contribution: f64, part: f64, unit: &Unit) -> Vec<String> {
        let mut cells = vec![words.to_string()];
        cells.resize(8, String::new());
        cells.extend([self.contribution(contribution, unit), share(part)]);
        cells
    }

    /// The input's own unit, unless its uncertainty cannot be printed in it.
    fn own_unit(&self, line: &BudgetLine) -> Unit {
        let value = line.estimate.unwrap_or(0.0);
        match self.style.standard(value, line.standard_uncertainty, &line.unit) {
            Ok(_) => line.unit.clone(),
            Err(_) => choose_unit(line.standard_uncertainty, &line.unit),
        }
    }

    /// The estimate to the place of its uncertainty: the printed value without the digits in parentheses.
    fn estimate(&self, line: &BudgetLine, own: &Unit) -> String {
        let Some(value) = line.estimate else {
            return self.rows.get(&line.source).map_or_else(String::new, |rows| terminal::counted(*rows, "value"));
        };
        let printed = self.style.standard(value, line.standard_uncertainty, own).unwrap_or_default();
        match (printed.find('('), printed.find(')')) {
            _ if value == 0.0 && printed.contains('×') => format!("0 {}", own.text()).trim_end().to_string(),
            (Some(open), Some(close)) if open < close => [&printed[..open], &printed[close + 1..]].concat(),
            _ => printed,
        }
    }

    /// ∂y/∂x in the unit of contributions over the input's own unit; a plain number where both are of one dimension.
    fn coefficient(&self, line: &BudgetLine, own: &Unit, unit: &Unit) -> String {
        let Some(coefficient) = line.sensitivity_coefficient else {
            return if self.rows.contains_key(&line.source) { "by row".into() } else { String::new() };
        };
        if own.dimension() == unit.dimension() {
            return self.number(coefficient, 3);
        }
        let printed = self.number(unit.difference_from_si(coefficient * own.difference_to_si(1.0)), 3);
        format!("{printed} {}", quotient(unit, own))
    }

    /// A number with so many significant digits.
    fn number(&self, value: f64, significant: usize) -> String {
        self.style.difference(value, &Unit::one(), significant).unwrap_or_default()
    }

    /// A contribution to the third digit of the combined standard uncertainty, so that the column adds up by eye.
    fn contribution(&self, contribution: f64, unit: &Unit) -> String {
        let decimal = |amount: f64, unit: &Unit| unit.difference_decimal_from_si(amount);
        let Some(whole) = decimal(self.budget.standard_uncertainty, unit) else { return String::new() };
        let decimals = whole.rounded_to_digits(3).decimals().max(0);
        let Some(rounded) = decimal(contribution, unit).map(|amount| amount.rounded(decimals)) else {
            return String::new();
        };
        if rounded.is_zero() && contribution > 0.0 {
            let last_digit = Decimal { negative: false, digits: 1, exponent: -decimals };
            return format!("< {}", self.style.number(&last_digit));
        }
        self.style.number(&rounded)
    }

    fn json(&self, trials: Option<JsonTrials>) -> JsonSheet<'_> {
        let finite = |number: f64| Some(number).filter(|number| number.is_finite());
        JsonSheet {
            format: 1,
            engine: crate::VERSION,
            quantity: &self.path,
            label: &self.label,
            printed: &self.printed,
            si_unit: &self.si_unit,
            value: self.value,
            standard_uncertainty: self.coverage.standard_uncertainty,
            effective_degrees_of_freedom: finite(self.coverage.effective_degrees_of_freedom),
            coverage_probability: self.coverage.probability,
            degrees_of_freedom: finite(self.coverage.degrees_of_freedom),
            coverage_factor: self.coverage.factor,
            expanded_uncertainty: self.coverage.expanded_uncertainty,
            lines: self.budget.lines.iter().map(JsonLine::of).collect(),
            trials,
        }
    }
}

/// The rows of every input that is a column.
fn rows_of_columns(graph: &Graph) -> BTreeMap<Source, usize> {
    let columns = graph.inputs.iter().enumerate();
    columns
        .filter_map(|(number, input)| Some((Source::Input(number as u32), graph.value(input.node).length()?)))
        .collect()
}

/// An estimator of which the measurand uses the first output alone has that output as estimate.
fn complete(mut budget: GraphBudget, graph: &Graph, derivatives: &Sensitivities) -> GraphBudget {
    for line in &mut budget.lines {
        let Source::Estimator(number) = line.source else { continue };
        let weights = derivatives.estimators.get(&number).map_or(&[][..], Vec::as_slice);
        if let [first, rest @ ..] = weights
            && rest.iter().all(|weight| *weight == 0.0)
        {
            line.sensitivity_coefficient = Some(*first);
            line.estimate =
                graph.estimators.get(number as usize).and_then(|node| node.estimate.values.first().copied());
        }
    }
    budget
}

/// A unit that can stand behind a solidus.
fn bracketed(unit: &Unit) -> String {
    let text = unit.text_or_one();
    if text.contains([' ', '·', '/', '⁻']) { format!("({text})") } else { text }
}

/// The unit of a sensitivity coefficient: `mg/cm³`, or with the exponents turned round, `mg kg⁻¹ m³`.
fn quotient(unit: &Unit, own: &Unit) -> String {
    let (unit, own) = (unit.text(), own.text());
    if own.is_empty() {
        return unit;
    }
    if !own.contains([' ', '⁻']) {
        return if unit.is_empty() { format!("1/{own}") } else { format!("{unit}/{own}") };
    }
    let is_exponent = |c: char| "⁻¹²³⁴⁵⁶⁷⁸⁹⁰".contains(c);
    let turned = own.split_whitespace().map(|factor| {
        let (symbol, exponent) = factor.split_at(factor.find(is_exponent).unwrap_or(factor.len()));
        match exponent.strip_prefix('⁻') {
            Some("¹") => symbol.to_string(),
            Some(exponent) => format!("{symbol}{exponent}"),
            None if exponent.is_empty() => format!("{symbol}⁻¹"),
            None => format!("{symbol}⁻{exponent}"),
        }
    });
    std::iter::once(unit).filter(|unit| !unit.is_empty()).chain(turned).collect::<Vec<_>>().join(" ")
}

fn share(part: f64) -> String {
    if part > 0.0 && part < 0.5 * SMALLEST_SHARE { "< 0.01 %".into() } else { format!("{:.2} %", part * 100.0) }
}

/// A budget as JSON; degrees of freedom are null when infinite.
#[derive(Serialize)]
struct JsonSheet<'s> {
    format: u32,
    engine: &'static str,
    quantity: &'s str,
    label: &'s str,
    printed: &'s str,
    si_unit: &'s str,
    value: f64,
    standard_uncertainty: f64,
    effective_degrees_of_freedom: Option<f64>,
    coverage_probability: f64,
    degrees_of_freedom: Option<f64>,
    coverage_factor: f64,
    expanded_uncertainty: f64,
    lines: Vec<JsonLine<'s>>,
    #[serde(skip_serializing_if = "Option::is_none")]
    trials: Option<JsonTrials>,
}

/// Several budgets with what their results share, in coherent SI units, in the order asked for.
#[derive(Serialize)]
struct JsonSheets<'s> {
    format: u32,
    engine: &'static str,
    budgets: Vec<JsonSheet<'s>>,
    covariance: Vec<Vec<f64>>,
    correlation: Vec<Vec<f64>>,
}

#[derive(Serialize)]
struct JsonLine<'s> {
    quantity: &'s str,
    symbol: &'s str,
    label: &'s str,
    si_unit: String,
    estimate: Option<f64>,
    standard_uncertainty: f64,
    #[serde(rename = "type")]
    evaluation: &'static str,
    distribution: &'static str,
    degrees_of_freedom: Option<f64>,
    sensitivity_coefficient: Option<f64>,
    contribution: f64,
    share: f64,
}

impl<'s> JsonLine<'s> {
    fn of(line: &'s BudgetLine) -> JsonLine<'s> {
        JsonLine {
            quantity: &line.path,
            symbol: &line.symbol,
            label: &line.label,
            si_unit: line.unit.dimension().to_string(),
            estimate: line.estimate,
            standard_uncertainty: line.standard_uncertainty,
            evaluation: line.evaluation.letter(),
            distribution: line.distribution,
            degrees_of_freedom: Some(line.degrees_of_freedom).filter(|freedom| freedom.is_finite()),
            sensitivity_coefficient: line.sensitivity_coefficient,
            contribution: line.contribution,
            share: line.share,
        }
    }
}

#[cfg(test)]
mod tests {
    use super::{paths_and_folder, quotient};
    use crate::quantity::Unit;

    #[test]
    fn units_of_coefficients_read_as_printed_elsewhere() {
        let of = |unit: &str, own: &str| quotient(&Unit::parse(unit).unwrap(), &Unit::parse(own).unwrap());
        assert_eq!(of("mg", "cm3"), "mg/cm³");
        assert_eq!(of("mg", "kg/m3"), "mg kg⁻¹ m³");
        assert_eq!(of("mg", "/K"), "mg K");
        assert_eq!(of("mg", "1"), "mg");
        assert_eq!(of("1", "K"), "1/K");
    }

    #[test]
    fn the_folder_may_stand_last() {
        let split = |named: &[&str]| {
            let (paths, folder) = paths_and_folder(named.iter().map(|name| name.to_string()).collect());
            (paths.join(" "), folder.to_string_lossy().into_owned())
        };
        assert_eq!(split(&["W1.mass"]), ("W1.mass".into(), ".".into()));
        assert_eq!(split(&["W1.mass", "W2.mass"]), ("W1.mass W2.mass".into(), ".".into()));
        assert_eq!(split(&["W1.mass", "W2.mass", "src"]), ("W1.mass W2.mass".into(), "src".into()));
        assert_eq!(split(&["W1.mass", "not/there"]), ("W1.mass".into(), "not/there".into()));
    }
}
