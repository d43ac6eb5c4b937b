//! Checks of a moving phase: what a row, a sweep and the whole file must agree in before a profile is fitted.

use super::phase::PhaseData;
use crate::diagnostic::{Code, Problem};
use crate::numeric::sum::{mean, sum};
use rayon::prelude::*;
use std::ops::Range;

/// The rows of a moving phase, in coherent SI units.
pub struct Gates {
    pub sweeps: Vec<i64>,
    pub directions: Vec<f64>,
    /// Seconds since 1970.
    pub times: Vec<f64>,
    pub positions: Vec<f64>,
    pub fringes: Vec<f64>,
    pub steps: Vec<f64>,
    pub null: Vec<f64>,
}

/// Faults of one sort that are printed, at most.
const MOST: usize = 5;

impl Gates {
    /// The first and last row of each sweep.
    pub fn spans(&self) -> Vec<Range<usize>> {
        let mut spans: Vec<Range<usize>> = Vec::new();
        for row in 0..self.sweeps.len() {
            match spans.last_mut() {
                Some(span) if self.sweeps[span.start] == self.sweeps[row] => span.end = row + 1,
                _ => spans.push(row..row + 1),
            }
        }
        spans
    }

    /// Everything that can be said of the rows before the fit; nothing where a fault was found.
    pub fn check(&self, data: &PhaseData<'_>, gate: f64, half_wavelength: f64, step_voltage: f64) -> Option<()> {
        self.check_null(data, step_voltage)?;
        self.check_velocity(data, gate, half_wavelength)?;
        self.check_signs(data)?;
        self.check_directions(data)?;
        self.note_gaps(data);
        Some(())
    }

    /// Direction, fringes and steps of a row have one sign.
    fn check_signs(&self, data: &PhaseData<'_>) -> Option<()> {
        let agree = |row: usize| {
            let direction = self.directions[row];
            self.fringes[row] * direction > 0.0 && self.steps[row] * direction > 0.0
        };
        let faulty: Vec<usize> = (0..self.sweeps.len()).filter(|row| !agree(*row)).collect();
        for row in faulty.iter().take(MOST) {
            let message = format!(
                "Direction {}, fringes {} and steps {} of this row have not one sign.",
                self.directions[*row], self.fringes[*row], self.steps[*row]
            );
            let hint = "Correct the row, or leave its sweep out by a rule.";
            data.engine.complain(Problem::new(Code::SignContradicts, message).hint(hint), data.line(*row));
        }
        faulty.is_empty().then_some(())
    }

    /// Sweeps in both directions tell the thermal voltage from the geometric factor.
    fn check_directions(&self, data: &PhaseData<'_>) -> Option<()> {
        let up = self.directions.iter().any(|direction| *direction > 0.0);
        if up && self.directions.iter().any(|direction| *direction < 0.0) {
            return Some(());
        }
        let message = format!(
            "All sweeps go {}; the thermal voltage cannot be told from the geometric factor.",
            if up { "up" } else { "down" }
        );
        let hint = "Sweep in both directions equally often; look whether rows were left out.";
        data.engine.complain(Problem::new(Code::SweepsOneWay, message).hint(hint), data.column("direction"));
        None
    }

    /// The velocity from fringes is that from positions.
    fn check_velocity(&self, data: &PhaseData<'_>, gate: f64, half_wavelength: f64) -> Option<()> {
        let ratio = |span: Range<usize>| {
            let (first, last) = (span.start, span.end - 1);
            let by_position = (self.positions[last] - self.positions[first]) / (self.times[last] - self.times[first]);
            let by_fringes = mean(&self.fringes[span]).unwrap_or(f64::NAN) * half_wavelength / gate;
            by_fringes / by_position
        };
        let mut ratios: Vec<f64> = self.spans().into_par_iter().filter(|span| span.len() >= 3).map(ratio).collect();
        ratios.sort_by(f64::total_cmp);
        let Some(ratio) = ratios.get(ratios.len() / 2).copied() else { return Some(()) };
        let near = |expected: f64| (ratio / expected - 1.0).abs() < 0.05;
        if near(1.0) {
            return Some(());
        }
        let place = data.column("fringes");
        if near(2.0) || near(0.5) {
            let message =
                format!("The velocity from fringes is {ratio:.3} times that from positions: a factor of two.");
            let hint = "Fringes count half wavelengths; check what the counter counts, and the gate.";
            data.engine.complain(Problem::new(Code::FringeFactor, message).hint(hint), place);
        } else {
            let message = format!("The velocity from fringes is {ratio:.3e} times that from positions.");
            let hint = "Look whether two columns are exchanged, and at the units of gate, time and position.";
            data.engine.complain(Problem::new(Code::ColumnImplausible, message).hint(hint), place);
        }
        None
    }

    /// A null reading is a rest, not a voltage of its own.
    fn check_null(&self, data: &PhaseData<'_>, step_voltage: f64) -> Option<()> {
        let whole = mean(&self.steps.iter().map(|n| n.abs() * step_voltage).collect::<Vec<_>>())?;
        let Some(row) = (0..self.null.len()).find(|row| self.null[*row].abs() > 0.05 * whole) else { return Some(()) };
        let message = format!("The null meter reads {:.4e} V here, beside {whole:.4e} V of the array.", self.null[row]);
        let hint = "Look whether two columns are exchanged, and at the unit of the null reading.";
        data.engine.complain(Problem::new(Code::ColumnImplausible, message).hint(hint), data.line(row));
        None
    }

    /// Gates missing inside a sweep are said.
    fn note_gaps(&self, data: &PhaseData<'_>) {
        let inside = |row: &usize| self.sweeps[*row] == self.sweeps[row - 1];
        let interval = |row: usize| self.times[row] - self.times[row - 1];
        let mut intervals: Vec<f64> = (1..self.times.len()).filter(inside).map(interval).collect();
        if intervals.is_empty() {
            return;
        }
        let middle = intervals.len() / 2;
        let usual = *intervals.select_nth_unstable_by(middle, f64::total_cmp).1;
        for row in (1..self.times.len()).filter(inside).filter(|row| interval(*row) > 1.5 * usual).take(MOST) {
            let message = format!(
                "Between this row and the one above pass {:.3} s, but {usual:.3} s is usual in a sweep.",
                interval(row)
            );
            let hint =
                "Say in the record what happened; the fit goes on, its serial correlation is that of neighbours.";
            data.engine.complain(Problem::new(Code::TimeGap, message).hint(hint), data.line(row));
        }
    }

    /// The weighing position and time lie inside what was swept.
    ///
    /// A position outside is a fault; a position within a tenth of the ends, or a time outside, a warning.
    pub fn check_weighing(&self, data: &PhaseData<'_>, position: f64, time: Option<f64>) -> Option<()> {
        let least = self.positions.iter().copied().fold(f64::INFINITY, f64::min);
        let largest = self.positions.iter().copied().fold(f64::NEG_INFINITY, f64::max);
        let span = format!("{:.3} mm to {:.3} mm", least * 1e3, largest * 1e3);
        if !(least..=largest).contains(&position) {
            let message = format!(
                "The weighing position {:.3} mm lies outside the sweeps, which go from {span}.",
                position * 1e3
            );
            let hint = "Sweep across the weighing position; a profile is not extrapolated.";
            data.engine.complain(Problem::new(Code::OutOfValidity, message).hint(hint), data.place);
            return None;
        }
        let margin = 0.1 * (largest - least);
        if position < least + margin || position > largest - margin {
            let message = format!(
                "The weighing position {:.3} mm is within a tenth of the ends of the sweeps, {span}.",
                position * 1e3
            );
            let hint = "Sweep farther on that side: at its ends a polynomial is least certain.";
            data.engine.complain(Problem::new(Code::Extrapolated, message).hint(hint), data.place);
        }
        if let (Some(time), Some(first), Some(last)) = (time, self.times.first(), self.times.last())
            && !(*first..=*last).contains(&time)
        {
            let (side, by) = if time < *first { ("before", first - time) } else { ("after", time - last) };
            let message = format!(
                "The middle of the weighing lies {:.1} min {side} the moving phase: the geometric factor is extrapolated.",
                by / 60.0
            );
            let hint = "Move before and after the weighing, so that drift is interpolated.";
            data.engine.complain(Problem::new(Code::Extrapolated, message).hint(hint), data.place);
        }
        Some(())
    }

    /// A sweep or a gate that stands off the others by about a step was measured on another step than written.
    ///
    /// `rest` is the voltage less the shape of the profile, which leaves v times one geometric factor; thermal voltages and
    /// drift are far below a step.
    pub fn check_steps(&self, data: &PhaseData<'_>, velocity: &[f64], rest: &[f64], step_voltage: f64) -> Option<()> {
        let spans = self.spans();
        let over = |span: &Range<usize>, term: &(dyn Fn(usize) -> f64 + Sync)| sum(span.clone().map(term));
        let factor = |span: &Range<usize>| {
            over(span, &|row| rest[row] * velocity[row]) / over(span, &|row| velocity[row] * velocity[row])
        };
        let factors: Vec<f64> = spans.par_iter().map(factor).collect();
        let mut sorted = factors.clone();
        sorted.sort_by(f64::total_cmp);
        let middle = (sorted.get((sorted.len() - 1) / 2)? + sorted.get(sorted.len() / 2)?) / 2.0;
        let speed = |span: &Range<usize>| over(span, &|row| velocity[row].abs()) / span.len() as f64;
        let off = |(span, factor): (&Range<usize>, &f64)| (factor - middle) * speed(span);
        let offs: Vec<f64> = spans.par_iter().zip(&factors).map(off).collect();
        let hint = "Correct the number of steps by an entry of its own, or leave the sweep out by a rule.";
        let complain = |what: String, off: f64, row: usize| {
            let message = format!(
                "{what} lies {:.1} µV off the others, where one step is {:.1} µV: its steps are miscounted.",
                off * 1e6,
                step_voltage * 1e6
            );
            data.engine.complain(Problem::new(Code::StepMiscount, message).hint(hint), data.line(row));
        };
        let worst = (0..spans.len()).max_by(|a, b| offs[*a].abs().total_cmp(&offs[*b].abs()))?;
        if offs[worst].abs() > 0.3 * step_voltage {
            let first = spans[worst].start;
            complain(format!("Sweep {}", self.sweeps[first]), offs[worst], first);
            return None;
        }
        let off = |row: usize| (rest[row] - velocity[row] * middle) * self.directions[row];
        if let Some(row) = (0..rest.len()).find(|row| off(*row).abs() > 0.5 * step_voltage) {
            complain("This gate".into(), off(row), row);
            return None;
        }
        Some(())
    }
}
