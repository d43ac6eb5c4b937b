//! Numbers in print: values, uncertainties, coverage, in the laboratory's style.

use super::listing::exact_decimals;
use crate::block::Engine;
use crate::graph::{Coverage, NodeId, coverage, sensitivities};
use crate::quantity::{Style, Unit, choose_unit};

/// A scalar quantity with its coverage, ready to be printed.
pub struct Figure {
    pub value: f64,
    pub coverage: Coverage,
    pub unit: Unit,
    pub symbol: String,
    pub label: String,
    /// Decimals of the value where it has no uncertainty.
    exact_decimals: i32,
    style: Style,
}

impl Figure {
    /// The figure of a named scalar node.
    pub fn of(engine: &Engine, id: NodeId) -> Option<Figure> {
        let graph = engine.graph();
        let name = graph.node(id).name.clone()?;
        let coverage = coverage(&graph, &sensitivities(&graph, id), engine.laboratory.settings);
        let value = graph.number(id);
        value.is_finite().then_some(Figure {
            value,
            coverage,
            exact_decimals: exact_decimals(&graph, id, value, &name.unit),
            unit: name.unit,
            symbol: name.symbol,
            label: name.label,
            style: engine.laboratory.style,
        })
    }

    /// A unit in which an uncertainty of this size prints without being cut.
    fn unit_for(&self, uncertainty: f64) -> Unit {
        match self.style.standard(self.value, uncertainty, &self.unit) {
            Ok(_) => self.unit.clone(),
            Err(_) => choose_unit(uncertainty, &self.unit),
        }
    }

    /// `0.999 999 119(10) kg`; the value alone when it is exact.
    pub fn standard(&self) -> String {
        let u = self.coverage.standard_uncertainty;
        if u <= 0.0 {
            return self.exact();
        }
        self.style.standard(self.value, u, &self.unit_for(u)).unwrap_or_else(|problem| problem.message)
    }

    /// The value alone, for one without uncertainty.
    fn exact(&self) -> String {
        let decimals = self.exact_decimals.clamp(0, 12);
        self.style.value(self.value, &self.unit, decimals).unwrap_or_else(|problem| problem.message)
    }

    /// `(0.999 999 119 ± 0.000 000 021) kg`.
    pub fn expanded(&self) -> String {
        let expanded = self.coverage.expanded_uncertainty;
        if expanded <= 0.0 {
            return self.exact();
        }
        self.style.expanded(self.value, expanded, &self.unit_for(expanded)).unwrap_or_else(|problem| problem.message)
    }

    /// The standard uncertainty alone, in a unit that suits it.
    pub fn standard_uncertainty(&self) -> String {
        self.small(self.coverage.standard_uncertainty)
    }

    /// The expanded uncertainty alone, in a unit that suits it.
    pub fn expanded_uncertainty(&self) -> String {
        self.small(self.coverage.expanded_uncertainty)
    }

    fn small(&self, uncertainty: f64) -> String {
        let unit = choose_unit(uncertainty, &self.unit);
        self.style.difference(uncertainty, &unit, 2).unwrap_or_else(|problem| problem.message)
    }

    /// The coverage factor with two decimals.
    pub fn factor(&self) -> String {
        fixed(self.style, self.coverage.factor, 2)
    }
}

/// An exact value with the digits it has.
pub fn plain(style: Style, value: f64, unit: &Unit) -> String {
    let digits = unit.decimal_from_si(value).map(|decimal| decimal.plain_text()).unwrap_or_default();
    let fraction = digits.split_once('.').map_or("", |(_, fraction)| fraction.trim_end_matches('0'));
    let decimals = (fraction.len() as i32).min(12);
    style.value(value, unit, decimals).unwrap_or_else(|problem| problem.message)
}

/// A number with so many decimals.
pub fn fixed(style: Style, value: f64, decimals: i32) -> String {
    style.value(value, &Unit::one(), decimals).unwrap_or_else(|problem| problem.message).trim_end().to_string()
}

/// A number with so many significant digits, with a power of ten where it is far from one.
pub fn significant(style: Style, value: f64, digits: usize) -> String {
    if value == 0.0 {
        return "0".into();
    }
    style.difference(value, &Unit::one(), digits).unwrap_or_else(|problem| problem.message).trim_end().to_string()
}

/// Degrees of freedom as printed: one decimal, ∞, or that there are very many.
pub fn freedom(style: Style, value: f64) -> String {
    match value {
        value if !value.is_finite() => "∞".into(),
        value if value > 99_999.5 => "> 10⁵".into(),
        value if value == value.floor() => fixed(style, value, 0),
        value => fixed(style, value, 1),
    }
}

/// A probability in per cent, without trailing zeros: 95.45 %.
pub fn per_cent(style: Style, probability: f64) -> String {
    let decimals =
        if (probability * 1e4 - (probability * 1e4).round()).abs() < 0.005 && (probability * 1e2).fract() == 0.0 {
            0
        } else {
            2
        };
    let unit = Unit::parse("%").unwrap_or_else(|_| Unit::one());
    style.value(probability, &unit, decimals).unwrap_or_else(|problem| problem.message)
}
