//! Ocean loading: the effect of the ocean's tides on gravity, from a table of eleven constituents for the site.
//!
//! # Source    IERS Conventions (2010), section 7.1.2 (form of the table, Greenwich phase lags); A. T. Doodson,
//!             H. D. Warburg, Admiralty Manual of Tides (1941), nodal factors; J. L. Simon et al. (1994), arguments.
//! # Formula   E = ± Σ_j f_j A_j cos(χ_j + u_j − Φ_j)
//!     A_j, Φ_j  amplitude and Greenwich phase lag of the constituent     m/s², rad
//!     χ_j       argument at Greenwich, diurnal ones shifted by ±90°      rad
//!     f_j, u_j  nodal factor and phase                                   1, rad
//!     ±         plus for a table positive downward, minus for one positive upward
//! # Valid for 1999 to 2100. Eleven constituents leave a few hundredths of the load; programs that make such tables differ
//!             by 2 % to 5 %.

use super::{Method, WorkedExample};
use crate::graph::{Builder, MethodInfo, Quantity, Value};
use crate::numeric::astronomy::radians;
use crate::numeric::astronomy::tidal_argument::{angle, tidal_arguments};
use crate::numeric::astronomy::time_scale::Instant;
use crate::numeric::elementary::{cos, sin};
use crate::quantity::{Dimension, Kind};
use std::f64::consts::FRAC_PI_2;

/// The registry's line.
pub static METHOD: Method = Method {
    info: MethodInfo {
        name: "ocean-loading",
        title: "Ocean loading from eleven constituents",
        source: "IERS Conventions (2010), 7.1.2; Doodson, Warburg, Admiralty Manual of Tides (1941)",
        formula: "E = ± Σ_j f_j A_j cos(χ_j + u_j − Φ_j)",
        symbols: &[
            ("E", "effect on g, positive downward", "m/s2"),
            ("A_j", "amplitude of a constituent", "m/s2"),
            ("Φ_j", "Greenwich phase lag of a constituent", "rad"),
            ("χ_j", "argument of a constituent at Greenwich", "rad"),
            ("f_j", "nodal factor", "1"),
            ("u_j", "nodal phase", "rad"),
        ],
        valid_for: "1999 to 2100; a table with its sign stated",
    },
    examples: &[
        WorkedExample {
            source: "arguments of the IERS table, computed from its own constants apart from this project",
            given: "2006-06-11T19:10:00Z, M2",
            quantity: "χ/°, to 0.1",
            printed: "202.3",
            found: || argument_of(Constituent::M2),
        },
        WorkedExample {
            source: "arguments of the IERS table, computed from its own constants apart from this project",
            given: "2006-06-11T19:10:00Z, O1",
            quantity: "χ/°, to 0.1",
            printed: "104.8",
            found: || argument_of(Constituent::O1),
        },
    ],
};

/// A constituent of the ocean's tide.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord)]
pub enum Constituent {
    M2,
    S2,
    N2,
    K2,
    K1,
    O1,
    P1,
    Q1,
    Mf,
    Mm,
    Ssa,
}

use Constituent::*;

impl Constituent {
    /// All eleven, in the order of the tables.
    pub const ALL: [Constituent; 11] = [M2, S2, N2, K2, K1, O1, P1, Q1, Mf, Mm, Ssa];

    /// The name in the tables.
    pub fn name(self) -> &'static str {
        match self {
            M2 => "M2",
            S2 => "S2",
            N2 => "N2",
            K2 => "K2",
            K1 => "K1",
            O1 => "O1",
            P1 => "P1",
            Q1 => "Q1",
            Mf => "Mf",
            Mm => "Mm",
            Ssa => "Ssa",
        }
    }

    /// The constituent of a name.
    pub fn of_name(name: &str) -> Option<Self> {
        Self::ALL.into_iter().find(|constituent| constituent.name().eq_ignore_ascii_case(name))
    }

    /// Multipliers of τ, s, h, p, N', p_s, and the shift of the phase, rad.
    fn form(self) -> ([i8; 6], f64) {
        match self {
            M2 => ([2, 0, 0, 0, 0, 0], 0.0),
            S2 => ([2, 2, -2, 0, 0, 0], 0.0),
            N2 => ([2, -1, 0, 1, 0, 0], 0.0),
            K2 => ([2, 2, 0, 0, 0, 0], 0.0),
            K1 => ([1, 1, 0, 0, 0, 0], FRAC_PI_2),
            O1 => ([1, -1, 0, 0, 0, 0], -FRAC_PI_2),
            P1 => ([1, 1, -2, 0, 0, 0], -FRAC_PI_2),
            Q1 => ([1, -2, 0, 1, 0, 0], -FRAC_PI_2),
            Mf => ([0, 2, 0, 0, 0, 0], 0.0),
            Mm => ([0, 1, 0, -1, 0, 0], 0.0),
            Ssa => ([0, 0, 2, 0, 0, 0], 0.0),
        }
    }

    /// Coefficients of 1, cos N, cos 2N, cos 3N in f and of sin N, sin 2N, sin 3N in u (degrees).
    fn nodal_series(self) -> ([f64; 4], [f64; 3]) {
        match self {
            M2 | N2 => ([1.0004, -0.0373, 0.0002, 0.0], [-2.14, 0.0, 0.0]),
            K2 => ([1.0241, 0.2863, 0.0083, -0.0015], [-17.74, 0.68, -0.04]),
            K1 => ([1.0060, 0.1150, -0.0088, 0.0006], [-8.86, 0.68, -0.07]),
            O1 | Q1 => ([1.0089, 0.1871, -0.0147, 0.0014], [10.80, -1.34, 0.19]),
            Mf => ([1.0429, 0.4135, -0.0040, 0.0], [-23.74, 2.68, -0.38]),
            Mm => ([1.0000, -0.1300, 0.0013, 0.0], [0.0, 0.0, 0.0]),
            S2 | P1 | Ssa => ([1.0, 0.0, 0.0, 0.0], [0.0, 0.0, 0.0]),
        }
    }

    /// Argument χ at Greenwich, rad.
    pub fn argument(self, instant: Instant) -> f64 {
        self.argument_from(&tidal_arguments(instant, 0.0))
    }

    fn argument_from(self, arguments: &[f64; 6]) -> f64 {
        let (multipliers, shift) = self.form();
        angle(&multipliers, arguments) + shift
    }

    /// Nodal factor and phase (rad) at longitude `n` of the lunar node, rad.
    fn nodal(self, n: f64) -> (f64, f64) {
        let (factor, phase) = self.nodal_series();
        let f = factor[0] + factor[1] * cos(n) + factor[2] * cos(2.0 * n) + factor[3] * cos(3.0 * n);
        let u = phase[0] * sin(n) + phase[1] * sin(2.0 * n) + phase[2] * sin(3.0 * n);
        (f, u.to_radians())
    }
}

/// The direction in which a table counts gravity positive; a table without it cannot be used.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Positive {
    /// Upward: a positive entry lowers g, as in most tables made for gravimetry.
    Up,
    /// Downward: a positive entry raises g.
    Down,
}

/// One line of a table.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Load {
    pub constituent: Constituent,
    /// m/s²
    pub amplitude: f64,
    /// Greenwich phase lag, rad.
    pub phase_lag: f64,
}

/// A table of ocean loading at a site.
#[derive(Debug, Clone, PartialEq)]
pub struct OceanLoading {
    pub loads: Vec<Load>,
    pub positive: Positive,
    /// UT1 − UTC, s.
    pub dut1: f64,
}

impl OceanLoading {
    /// The effect on g, m/s², positive downward, at `utc` seconds since 1970.
    pub fn effect(&self, utc: f64) -> f64 {
        let arguments = self.arguments(utc);
        let n = radians(-arguments[4]);
        self.signed(self.loads.iter().fold(0.0, |sum, load| {
            let (f, u) = load.constituent.nodal(n);
            sum + f * load.amplitude * cos(load.constituent.argument_from(&arguments) + u - load.phase_lag)
        }))
    }

    /// The effect with f = 1 and u = 0, as older reports took it.
    pub fn effect_without_nodal_factors(&self, utc: f64) -> f64 {
        let arguments = self.arguments(utc);
        self.signed(self.loads.iter().fold(0.0, |sum, load| {
            sum + load.amplitude * cos(load.constituent.argument_from(&arguments) - load.phase_lag)
        }))
    }

    /// The largest effect there can be, but for the nodal factors, m/s².
    pub fn amplitude(&self) -> f64 {
        self.loads.iter().fold(0.0, |sum, load| sum + load.amplitude.abs())
    }

    fn arguments(&self, utc: f64) -> [f64; 6] {
        tidal_arguments(Instant::new(utc, self.dut1), 0.0)
    }

    fn signed(&self, sum: f64) -> f64 {
        match self.positive {
            Positive::Up => -sum,
            Positive::Down => sum,
        }
    }
}

/// The effect at many times as a column; `scale` is 1 with the relative uncertainty of the table, 5 % where none is known.
pub fn effect_column<'g>(
    builder: &'g Builder,
    loading: &OceanLoading,
    times: &[f64],
    scale: Quantity<'g>,
) -> Quantity<'g> {
    let rows: Vec<f64> = times.iter().map(|time| loading.effect(*time)).collect();
    scale * builder.exact(Value::column(rows), Dimension::ACCELERATION, Kind::Plain)
}

fn argument_of(constituent: Constituent) -> f64 {
    let instant = Instant::new(1_150_053_000.0, 0.0);
    constituent.argument(instant).to_degrees().rem_euclid(360.0)
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Means over a revolution of the node: f averages near 1 and u to zero.
    #[test]
    fn nodal_factors_average_out() {
        for constituent in Constituent::ALL {
            let steps = 360;
            let (mut f, mut u) = (0.0, 0.0);
            for step in 0..steps {
                let nodal = constituent.nodal(f64::from(step).to_radians());
                f += nodal.0 / f64::from(steps);
                u += nodal.1 / f64::from(steps);
            }
            assert!((f - 1.0).abs() < 0.05 && u.abs() < 1e-12, "{}", constituent.name());
        }
    }

    #[test]
    fn a_table_positive_upward_lowers_g() {
        let load = Load { constituent: M2, amplitude: 1e-8, phase_lag: 0.3 };
        let up = OceanLoading { loads: vec![load], positive: Positive::Up, dut1: 0.0 };
        let down = OceanLoading { positive: Positive::Down, ..up.clone() };
        assert_eq!(up.effect(1e9), -down.effect(1e9));
        assert!(up.effect(1e9) != 0.0 && up.effect(1e9).abs() <= 1.04 * up.amplitude());
        assert_eq!(Constituent::of_name("ssa"), Some(Ssa));
        assert_eq!(Constituent::of_name("M4"), None);
    }
}
