//! Ranges of what is typed for the transfer of gravity: accepted, unusual, refused.
//!
//! # Source    extremes of the quantities: IERS coordinates of the pole since 1962, |UT1 − UTC| < 0.9 s by definition,
//!             gradients of laboratories within some 30 % of the free-air one, records of the air pressure.

use crate::diagnostic::{Code, Problem};

/// What a range says of a value.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Verdict {
    Accept,
    /// Possible but unusual.
    Warn,
    Reject,
}

/// A range in the unit of the trade: unusual outside the inner pair, refused outside the outer one.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Range {
    /// What it is of, in words.
    pub what: &'static str,
    /// The unit in which limits are printed.
    pub unit: &'static str,
    /// One of that unit in coherent SI units.
    pub in_si: f64,
    /// Limits of refusal.
    pub outer: (f64, f64),
    /// Limits of the usual.
    pub inner: (f64, f64),
    /// The slip most often behind a refused value.
    pub hint: &'static str,
}

/// Air pressure.
pub const PRESSURE: Range = Range {
    what: "air pressure",
    unit: "hPa",
    in_si: 100.0,
    outer: (500.0, 1100.0),
    inner: (800.0, 1060.0),
    hint: "Check the unit: pascal and hectopascal are easily mistaken.",
};
/// Coordinate x of the pole.
pub const POLE_X: Range = Range {
    what: "pole coordinate x",
    unit: "″",
    in_si: std::f64::consts::PI / 648_000.0,
    outer: (-1.0, 1.0),
    inner: (-0.6, 0.6),
    hint: "Check the unit: seconds of arc and thousandths of them are easily mistaken.",
};
/// Coordinate y of the pole.
pub const POLE_Y: Range = Range { what: "pole coordinate y", inner: (-0.2, 0.8), ..POLE_X };
/// UT1 − UTC.
pub const DUT1: Range = Range {
    what: "difference UT1 − UTC",
    unit: "s",
    in_si: 1.0,
    outer: (-1.0, 1.0),
    inner: (-0.9, 0.9),
    hint: "UT1 − UTC stays within 0.9 s; TAI − UTC, 37 s since 2017, is another difference.",
};
/// Linear coefficient γ_1 of the vertical profile.
pub const GRADIENT: Range = Range {
    what: "vertical gradient",
    unit: "µGal/m",
    in_si: 1e-8,
    outer: (-600.0, -50.0),
    inner: (-420.0, -180.0),
    hint: "Gravity falls with height, by about 308.6 µGal/m or 3.086e-6 s⁻²: check sign and unit.",
};
/// Admittance of the air pressure.
pub const ADMITTANCE: Range = Range {
    what: "admittance of the air pressure",
    unit: "µGal/hPa",
    in_si: 1e-10,
    outer: (-0.5, -0.05),
    inner: (-0.42, -0.18),
    hint: "Gravity falls when the pressure rises, by about 0.3 µGal/hPa: check sign and unit.",
};
/// Height of the site.
pub const HEIGHT: Range = Range {
    what: "height of the site",
    unit: "m",
    in_si: 1.0,
    outer: (-430.0, 6000.0),
    inner: (-100.0, 4000.0),
    hint: "Write the height above sea level, in metres.",
};

impl Range {
    /// The verdict on a value in coherent SI units.
    pub fn verdict(&self, value: f64) -> Verdict {
        // A hair for the conversion of limits typed as decimals.
        let hair = 1e-12;
        let within = |(from, to): (f64, f64)| {
            let typed = value / self.in_si;
            from - hair * from.abs() <= typed && typed <= to + hair * to.abs()
        };
        match (within(self.inner), within(self.outer)) {
            (true, _) => Verdict::Accept,
            (false, true) => Verdict::Warn,
            _ => Verdict::Reject,
        }
    }

    /// A sentence on a value that is not accepted; none on one that is.
    pub fn remark(&self, value: f64) -> Option<String> {
        let (verb, (from, to)) = match self.verdict(value) {
            Verdict::Accept => return None,
            Verdict::Warn => ("is unusual: expected", self.inner),
            Verdict::Reject => ("is impossible: expected", self.outer),
        };
        let (what, unit, typed) = (self.what, self.unit, value / self.in_si);
        Some(format!("The {what} {typed:.6} {unit} {verb} {from} {unit} to {to} {unit}."))
    }

    /// Refuses an impossible value.
    ///
    /// # Errors
    /// `out_of_validity` outside the outer limits.
    pub fn check(&self, value: f64) -> Result<(), Problem> {
        match (self.verdict(value), self.remark(value)) {
            (Verdict::Reject, Some(message)) => Err(Problem::new(Code::OutOfValidity, message).hint(self.hint)),
            _ => Ok(()),
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn limits_belong_to_the_range() {
        for range in [PRESSURE, POLE_X, POLE_Y, DUT1, GRADIENT, ADMITTANCE, HEIGHT] {
            let si = |typed: f64| typed * range.in_si;
            let width = range.outer.1 - range.outer.0;
            for (limit, outward) in [(range.inner.0, -1.0), (range.inner.1, 1.0)] {
                assert_eq!(range.verdict(si(limit)), Verdict::Accept, "{}", range.what);
                assert_eq!(range.verdict(si(limit + outward * 1e-4 * width)), Verdict::Warn, "{}", range.what);
                assert!(range.check(si(limit + outward * 1e-4 * width)).is_ok());
            }
            for (limit, outward) in [(range.outer.0, -1.0), (range.outer.1, 1.0)] {
                assert_eq!(range.verdict(si(limit)), Verdict::Warn, "{}", range.what);
                let problem = range.check(si(limit + outward * 1e-4 * width)).expect_err("refused");
                assert!(problem.message.contains(range.unit), "{}", problem.message);
            }
            assert_eq!(range.verdict(f64::NAN), Verdict::Reject);
        }
    }
}
