//! First-order propagation beside propagation of distributions: table, histogram, verdict.
//!
//! # Source   JCGM 101:2008, clause 8 (validation of first-order propagation by trials); JCGM 100:2008, 5.1.2, NOTE
//!            (terms of second order).

use crate::block::Engine;
use crate::diagnostic::Problem;
use crate::graph::{
    Distributed, Graph, Histogram, NodeId, Validation, budget, distributed, histogram, propagate_distributions,
    second_order_uncertainty,
};
use crate::numeric::elementary::powi;
use crate::quantity::{Marker, Style, Unit, choose_unit};
use crate::report::Markup;
use crate::report::chart::{Chart, Series, Style as Look, figure, superscript};
use crate::report::figures::{Figure, fixed, per_cent};
use crate::report::parts::charts::solidus;
use crate::report::parts::results::nominal_probability;
use crate::report::table::{Cell, Table, head};

/// Significant digits of u that the comparison is to be meaningful to.
const DIGITS: usize = 1;
const CLASSES: usize = 60;

/// Both propagations of one result.
pub struct Comparison {
    pub figure: Figure,
    pub found: Distributed,
    pub histogram: Histogram,
    pub validation: Validation,
    /// Standard uncertainty with the terms of second order, where they matter.
    pub second_order: Option<f64>,
    /// A contribution that the trials drew from a normal distribution because its t has no variance.
    pub few: Option<String>,
}

/// The path of a contribution with two degrees of freedom or fewer: its t distribution has no variance, so trials draw it
/// from a normal one and say nothing about the interval.
pub fn drawn_as_normal(graph: &Graph, result: NodeId) -> Option<String> {
    budget(graph, result).lines.into_iter().find(|line| line.degrees_of_freedom <= 2.0).map(|line| line.path)
}

/// Terms of second order that change u by less than this part of it are not shown.
const SMALLEST_CHANGE: f64 = 1e-3;

impl Comparison {
    /// Runs the trials of one result.
    ///
    /// # Errors
    /// When a covariance on the way is impossible.
    pub fn of(engine: &Engine, result: NodeId) -> Result<Option<Comparison>, Problem> {
        let Some(figure) = Figure::of(engine, result) else { return Ok(None) };
        let trials = engine.laboratory.trials;
        let mut values = propagate_distributions(&engine.graph(), &[result], trials)?.values.swap_remove(0);
        let found = distributed(&mut values, figure.coverage.probability);
        let expanded = figure.coverage.expanded_uncertainty;
        let validation =
            Validation::new(figure.value, expanded, found.symmetric, figure.coverage.standard_uncertainty, DIGITS);
        let first = figure.coverage.standard_uncertainty;
        let second_order = second_order_uncertainty(&engine.graph(), result)
            .filter(|second| (second - first).abs() > SMALLEST_CHANGE * second);
        let few = drawn_as_normal(&engine.graph(), result);
        Ok(Some(Comparison { histogram: histogram(&values, CLASSES), figure, found, validation, second_order, few }))
    }

    /// The interval with the terms of second order, with the same coverage factor.
    fn second_order_interval(&self) -> Option<(f64, f64, f64)> {
        let u = self.second_order?;
        let half = self.figure.coverage.factor * u;
        Some((u, self.figure.value - half, self.figure.value + half))
    }

    /// The verdict: which interval is valid, and why.
    pub fn verdict(&self, style: Style) -> String {
        let scale = Scale::of(self);
        let ends = |(low, high): (f64, f64)| {
            let text = |value: f64| scale.text(style, value - self.figure.value, 2);
            let unit = match (scale.power, scale.unit_text(style).as_str()) {
                (0, "") => String::new(),
                (0, unit) => format!("\u{a0}{unit}"),
                (_, power) => format!("\u{a0}×\u{a0}{power}"),
            };
            format!("[{}, {}]{unit}", text(low), text(high))
        };
        if let Some(path) = &self.few {
            return format!(
                "{path} has two degrees of freedom or fewer: its t distribution has no variance and the trials drew a normal one, so they validate nothing; the interval stated is that of first order with its coverage factor from effective degrees of freedom, {} about the estimate.",
                ends(self.validation.first_order)
            );
        }
        match self.validation.is_valid() {
            true => format!(
                "Both ends agree within the numerical tolerance, so first-order propagation is validated; the interval stated is {} about the estimate.",
                ends(self.validation.first_order)
            ),
            false => format!(
                "An end departs by more than the numerical tolerance, so first-order propagation is not validated; the valid interval is that of the trials, {} about the first-order estimate.",
                ends(self.found.symmetric)
            ),
        }
    }
}

/// The comparison as table, chart and verdict.
///
/// # Errors
/// As [`Comparison::of`].
pub fn distribution_part(engine: &Engine, result: NodeId) -> Result<Markup, Problem> {
    let Some(comparison) = Comparison::of(engine, result)? else { return Ok(Markup::new()) };
    engine.builder.assume(
        format!(
            "Monte Carlo trials: {} with the constant seed “{}”",
            comparison.found.trials,
            crate::numeric::stream::SEED
        ),
        None,
    );
    let mut made = table(engine, &comparison);
    made.push(&figure(&chart(engine, &comparison), 150.0, 62.0)).push_code("\n\n");
    made.push_code("#note[").push_text(&comparison.verdict(engine.laboratory.style)).push_code("]\n\n");
    Ok(made)
}

/// How departures are shown: in a unit with a prefix that suits u, or in a power of ten where the unit is one.
struct Scale {
    unit: Unit,
    power: i32,
    /// The power of ten of the first digit of u on this scale.
    lead: i32,
}

impl Scale {
    fn of(comparison: &Comparison) -> Scale {
        // At a point without slope first order knows no u.
        let u = comparison.figure.coverage.standard_uncertainty.max(comparison.found.standard_uncertainty);
        let unit = choose_unit(u, &comparison.figure.unit);
        let lead = unit.difference_decimal_from_si(u).and_then(|u| u.rounded_to_digits(2).leading_power()).unwrap_or(0);
        let power = if unit.is_one() && !(-2..=3).contains(&lead) { lead.div_euclid(3) * 3 } else { 0 };
        Scale { unit, power, lead: lead - power }
    }

    fn shown(&self, value: f64) -> f64 {
        self.unit.difference_from_si(value) * powi(10.0, -self.power)
    }

    /// With as many decimals as show u to so many digits.
    fn text(&self, style: Style, value: f64, digits: i32) -> String {
        fixed(style, self.shown(value), (digits - 1 - self.lead).max(0))
    }

    fn unit_text(&self, style: Style) -> String {
        match self.power {
            0 => style.unit(&self.unit),
            power => format!("10{}", superscript(power)),
        }
    }
}

/// Values as departures from the first-order estimate, which keeps their digits beside a large value.
fn table(engine: &Engine, comparison: &Comparison) -> Markup {
    let style = engine.laboratory.style;
    let scale = Scale::of(comparison);
    let estimate = comparison.figure.value;
    let shown = |value: f64| Cell::from(scale.text(style, value, 3));
    let probability = per_cent(style, nominal_probability(comparison.found.probability));
    let unit_text = scale.unit_text(style);
    let header = vec![
        "Propagation".into(),
        head("y", &unit_text),
        head("u", &unit_text),
        over("lower end", &unit_text).into(),
        over("upper end", &unit_text).into(),
    ];
    let caption = format!(
        "{}: first order and {} trials, {probability} coverage intervals, as departures from {}",
        comparison.figure.label,
        style.digits(&comparison.found.trials.to_string()),
        comparison.figure.standard()
    );
    let mut table = Table::new(caption, header);
    table.align = vec!["left", "right", "right", "right", "right"];
    let row = |name: &str, y: f64, u: f64, ends: (f64, f64)| {
        vec![name.into(), shown(y - estimate), shown(u), shown(ends.0 - estimate), shown(ends.1 - estimate)]
    };
    let (found, validation) = (&comparison.found, &comparison.validation);
    table.rows.push(row(
        "first order",
        estimate,
        comparison.figure.coverage.standard_uncertainty,
        validation.first_order,
    ));
    if let Some((u, low, high)) = comparison.second_order_interval() {
        table.rows.push(row("with terms of second order", estimate, u, (low, high)));
    }
    table.rows.push(row("trials, symmetric interval", found.estimate, found.standard_uncertainty, found.symmetric));
    table.rows.push(row("trials, shortest interval", found.estimate, found.standard_uncertainty, found.shortest));
    let blank = || Cell::from("");
    table.closing.push(vec![
        "difference of the ends".into(),
        blank(),
        blank(),
        shown(validation.low_difference),
        shown(validation.high_difference),
    ]);
    table.closing.push(vec![
        "numerical tolerance δ".into(),
        blank(),
        blank(),
        scale.text(style, validation.tolerance, 2).into(),
        blank(),
    ]);
    table.markup()
}

/// A word over the unit it is counted in.
fn over(word: &str, unit: &str) -> String {
    if unit.is_empty() { word.into() } else { format!("{word}/{}", solidus(unit)) }
}

fn chart(engine: &Engine, comparison: &Comparison) -> Chart {
    let scale = Scale::of(comparison);
    let unit_text = scale.unit_text(engine.laboratory.style);
    let (estimate, u) = (comparison.figure.value, comparison.figure.coverage.standard_uncertainty);
    let at = |value: f64| scale.shown(value - estimate);
    let classes = &comparison.histogram;
    let width = (classes.to - classes.from) / classes.counts.len() as f64;
    let total: f64 = classes.counts.iter().map(|count| *count as f64).sum();
    let density = |count: u64| count as f64 / (total * scale.shown(width));
    let mut steps = vec![(at(classes.from), 0.0, None)];
    let class = |(index, count): (usize, &u64)| (at(classes.from + width * index as f64), density(*count), None);
    steps.extend(classes.counts.iter().enumerate().map(class));
    steps.push((at(classes.to), 0.0, None));
    let highest = steps.iter().map(|(_, y, _)| *y).fold(0.0, f64::max);
    let spread = scale.shown(u);
    let normal = (0..=80).map(|index| {
        let z = -4.0 + f64::from(index) * 0.1;
        (z * spread, crate::numeric::distribution::normal_density(z) / spread, None)
    });
    let bar = |ends: (f64, f64), height: f64| {
        vec![(at(ends.0), height * highest, None), (at(ends.1), height * highest, None)]
    };
    let probability = per_cent(engine.laboratory.style, nominal_probability(comparison.found.probability));
    Chart {
        title: format!(
            "{}: distribution of the trials, and the density of first-order propagation",
            comparison.figure.label
        ),
        x_label: over("departure", &unit_text),
        y_label: if unit_text.is_empty() { "density".into() } else { format!("density × {unit_text}") },
        series: vec![
            Series { name: "trials".into(), points: steps, style: Look::Steps },
            Series { name: "first order".into(), points: normal.collect(), style: Look::Line },
            Series {
                name: format!("{probability} interval, trials"),
                points: bar(comparison.found.symmetric, 0.10),
                style: Look::Line,
            },
            Series {
                name: format!("{probability} interval, first order"),
                points: bar(comparison.validation.first_order, 0.05),
                style: Look::Line,
            },
        ],
        decimal_marker: if engine.laboratory.style.marker == Marker::Comma { ',' } else { '.' },
        ..Chart::default()
    }
}
