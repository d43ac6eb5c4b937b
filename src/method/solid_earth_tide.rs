//! Tide of the solid Earth: the effect of Moon and Sun on gravity, with the yielding of the Earth.
//!
//! # Source    positions: J. Meeus, Astronomical Algorithms, 2nd ed. (1998), chapters 25 and 47; gravimetric factors:
//!             V. Dehant, Phys. Earth Planet. Inter. 49 (1987) 97; waves of the resonance: T. Hartmann, H.-G. Wenzel,
//!             Geophys. Res. Lett. 22 (1995) 3553.
//! # Formula   E = δ_20 (A_20 − A_perm) + zonal term + δ_21 A_21 + Σ_w [δ(f_w) − δ(O1)] B_w + δ_22 A_22
//!               + δ_3 Σ_m A_3m + δ_4 A_4 + δ_perm A_perm
//!     E       effect on g, positive downward: it adds to a value free of tide   m/s²
//!     A_nm    tide of a rigid Earth by degree and order                         m/s²
//!     A_perm  its permanent part                                                m/s²
//!     B_w     a diurnal wave of degree 2 near the resonance of the core         m/s²
//!     δ       gravimetric factors                                               1
//!     δ_perm  factor of the permanent part, 1 in the zero-tide system           1
//! # Valid for times from 1999 (table of leap seconds) to 2100; against a catalogue of 12 935 waves with the same factors
//!             the largest error is 0.023 µGal. The factors themselves are known to about 0.1 %.

use super::gravity_site::{Geocentric, Site};
use super::permanent_tide::{PermanentSystem, permanent_at, strength};
use super::tidal_attraction::RigidTide;
use super::tidal_groups::{GroupedWave, WaveGroup, geodetic_coefficient, grouped_waves};
use super::tidal_response::{FOURTH, Factors, THIRD, ZONAL, resonance};
use super::tidal_waves::RESONANT;
use super::{Method, WorkedExample, exact, unit};
use crate::diagnostic::{Code, Problem};
use crate::graph::{Builder, Distribution, InputDraft, MethodInfo, Origin, Quantity, Value};
use crate::numeric::astronomy::tidal_argument::{angle, speed, tidal_arguments};
use crate::numeric::astronomy::time_scale::{Instant, LEAP_SECONDS};
use crate::numeric::elementary::{cos, sin};
use crate::quantity::{Dimension, Kind};

/// The registry's line.
pub static METHOD: Method = Method {
    info: MethodInfo {
        name: "solid-earth-tide",
        title: "Tide of the solid Earth",
        source: "Meeus, Astronomical Algorithms (1998); Dehant, Phys. Earth Planet. Inter. 49 (1987) 97; \
                 Hartmann, Wenzel, Geophys. Res. Lett. 22 (1995) 3553",
        formula: "E = δ_20 (A_20 − A_perm) + δ_21 A_21 + Σ_w [δ(f_w) − δ(O1)] B_w + δ_22 A_22 + δ_3 Σ_m A_3m + δ_4 A_4 \
                  + δ_perm A_perm",
        symbols: &[
            ("E", "effect on g, positive downward", "m/s2"),
            ("A_nm", "tide of a rigid Earth by degree and order", "m/s2"),
            ("A_perm", "permanent part of the tide of a rigid Earth", "m/s2"),
            ("B_w", "diurnal wave near the resonance of the core", "m/s2"),
            ("δ", "gravimetric factor", "1"),
            ("δ_perm", "factor of the permanent part, 1 in the zero-tide system", "1"),
        ],
        valid_for: "1999 to 2100, any site on the Earth",
    },
    examples: &[
        WorkedExample {
            source: "HW95 catalogue of 12 935 waves times the gravimetric factors, evaluated apart from this project",
            given: "48.83° N, 2.22° E, 70 m, 2006-06-11T19:10:00Z, UT1 − UTC = 0.1996 s",
            quantity: "E/µGal to 0.1",
            printed: "84.3",
            found: || example(48.83, 2.22, 70.0, 1_150_053_000.0, 0.1996),
        },
        WorkedExample {
            source: "HW95 catalogue of 12 935 waves times the gravimetric factors, evaluated apart from this project",
            given: "48.83° N, 2.22° E, 70 m, 2000-01-01T12:00:00Z, UT1 − UTC = 0.3555 s",
            quantity: "E/µGal to 0.1",
            printed: "68.0",
            found: || example(48.83, 2.22, 70.0, 946_728_000.0, 0.3555),
        },
        WorkedExample {
            source: "J. Meeus, Astronomical Algorithms, 2nd ed. (1998), example 47.a",
            given: "1992-04-12, 0 h TD",
            quantity: "latitude of the Moon/°",
            printed: "-3.229126",
            found: || crate::numeric::astronomy::moon::place(-0.077_221_081_451).latitude.to_degrees(),
        },
        WorkedExample {
            source: "J. Meeus, Astronomical Algorithms, 2nd ed. (1998), example 47.a",
            given: "1992-04-12, 0 h TD",
            quantity: "distance of the Moon/km",
            printed: "368409.7",
            found: || crate::numeric::astronomy::moon::place(-0.077_221_081_451).distance / 1e3,
        },
    ],
};

/// Relative standard uncertainty of the gravimetric factors: modern body models differ by about 0.1 % in the main waves.
pub const BODY_MODEL_UNCERTAINTY: f64 = 1e-3;
/// Last second (since 1970) for which the series are used: the beginning of 2100.
pub const LAST: f64 = 4_102_444_800.0;
/// Step of the grid between whose points a series in time is interpolated, s. The cubic through four points departs from
/// the tide by less than 1e-4 µGal.
const STEP: f64 = 300.0;

/// The effect of the tide on g at a site, m/s², positive downward, at `utc` seconds since 1970: zero-tide system, UT1 = UTC.
pub fn tide(site: &Site, utc: f64) -> f64 {
    SolidEarthTide::new(*site).effect(utc)
}

/// Refuses times for which leap seconds or series are unknown; gives the first row at fault.
///
/// # Errors
/// `out_of_validity`, with the row.
pub fn check_times(times: &[f64]) -> Result<(), (usize, Problem)> {
    let first = LEAP_SECONDS[0].0;
    match times.iter().position(|time| !(first..=LAST).contains(time)) {
        None => Ok(()),
        Some(row) => {
            let message = "The tide is asked for at a time outside 1999 to 2100, where its series and the table of \
                           leap seconds hold.";
            Err((row, Problem::new(Code::OutOfValidity, message).hint("Check the year of the reading.")))
        }
    }
}

/// A wave near the resonance: multipliers of its argument, and cosine and sine of what the resonance adds, m/s².
#[derive(Debug, Clone, Copy, PartialEq)]
struct ResonantWave {
    multipliers: [i8; 6],
    cosine: f64,
    sine: f64,
}

/// The tide at one site, with all that does not change in time.
#[derive(Debug, Clone, PartialEq)]
pub struct SolidEarthTide {
    site: Site,
    geocentric: Geocentric,
    factors: Factors,
    permanent: f64,
    system: PermanentSystem,
    dut1: f64,
    resonant: Vec<ResonantWave>,
    grouped: Vec<GroupedWave>,
}

impl SolidEarthTide {
    /// The tide of the body model at a site, to be added to a value in the zero-tide system; UT1 = UTC, which is wrong by
    /// 0.020 µGal at most.
    pub fn new(site: Site) -> Self {
        let geocentric = site.geocentric();
        let coefficient = geodetic_coefficient(&geocentric, 2, 1);
        let resonant = RESONANT.iter().map(|wave| {
            let scale = coefficient * 1e-6 * resonance(speed(&wave.multipliers));
            ResonantWave { multipliers: wave.multipliers, cosine: scale * wave.cosine, sine: scale * wave.sine }
        });
        Self {
            site,
            geocentric,
            factors: Factors::at(&geocentric),
            permanent: permanent_at(&geocentric),
            system: PermanentSystem::ZeroTide,
            dut1: 0.0,
            resonant: resonant.collect(),
            grouped: Vec::new(),
        }
    }

    /// With UT1 − UTC in s.
    #[must_use]
    pub fn with_dut1(self, dut1: f64) -> Self {
        Self { dut1, ..self }
    }

    /// To be added to a value in another system.
    #[must_use]
    pub fn in_system(self, system: PermanentSystem) -> Self {
        Self { system, ..self }
    }

    /// With observed wave groups in place of the body model within their spans. Ocean loading is then inside.
    ///
    /// # Errors
    /// `out_of_validity` for groups out of order or impossible.
    pub fn with_groups(self, groups: &[WaveGroup]) -> Result<Self, Problem> {
        let grouped = grouped_waves(&self.geocentric, &self.factors, groups)?;
        Ok(Self { grouped, ..self })
    }

    /// The tide of a rigid Earth with its permanent part, by body, degree and order.
    pub fn rigid(&self, utc: f64) -> RigidTide {
        RigidTide::at(&self.geocentric, self.site.longitude, Instant::new(utc, self.dut1))
    }

    /// The permanent part as it stands in the effect, δ_perm A_perm, m/s².
    pub fn permanent(&self) -> f64 {
        self.system.factor() * self.permanent
    }

    /// The effect without its permanent part, m/s².
    pub fn variable(&self, utc: f64) -> f64 {
        let instant = Instant::new(utc, self.dut1);
        let a = RigidTide::at(&self.geocentric, self.site.longitude, instant).sum();
        let arguments = tidal_arguments(instant, self.site.longitude.to_degrees());
        let zonal_strength = a.zonal_strength - strength(&self.geocentric);
        ZONAL * (a.second[0] - self.permanent)
            - zonal_strength * self.geocentric.normal_cosine * self.factors.zonal_product
            + self.factors.diurnal * a.second[1]
            + self.resonance(&arguments)
            + self.factors.semidiurnal * a.second[2]
            + THIRD * (a.third[0] + a.third[1] + a.third[2] + a.third[3])
            + FOURTH * a.fourth
            + self.grouped.iter().fold(0.0, |sum, wave| sum + wave.departure(&arguments))
    }

    /// Σ_w [δ(f_w) − δ(O1)] B_w.
    fn resonance(&self, arguments: &[f64; 6]) -> f64 {
        self.resonant.iter().fold(0.0, |sum, wave| {
            let angle = angle(&wave.multipliers, arguments);
            sum + wave.cosine * cos(angle) + wave.sine * sin(angle)
        })
    }

    /// The effect on g, m/s², at `utc` seconds since 1970.
    pub fn effect(&self, utc: f64) -> f64 {
        self.variable(utc) + self.permanent()
    }

    /// The variable part at many times, interpolated between grid points 300 s apart (error below 1e-4 µGal).
    ///
    /// The grid is the same for every series, so that a row's value does not depend on the other rows.
    pub fn variable_at(&self, times: &[f64]) -> Vec<f64> {
        let mut grid = Grid { tide: self, first: 0, known: [f64::NAN; 4] };
        times.iter().map(|time| grid.at(*time)).collect()
    }

    /// The effect on g at many times, interpolated as [`Self::variable_at`].
    pub fn effects(&self, times: &[f64]) -> Vec<f64> {
        self.variable_at(times).into_iter().map(|variable| variable + self.permanent()).collect()
    }

    /// Mean effect over a span that begins at `start` and lasts `duration` s: Simpson's rule, panels of 5 min or less.
    pub fn mean(&self, start: f64, duration: f64) -> f64 {
        if duration <= 0.0 {
            return self.effect(start);
        }
        let panels = 2 * (duration / (2.0 * STEP)).ceil().max(1.0) as usize;
        let width = duration / panels as f64;
        let weighted = |index: usize| {
            let weight = if index == 0 || index == panels { 1.0 } else { 2.0 * (1 + index % 2) as f64 };
            weight * self.variable(start + index as f64 * width)
        };
        (0..=panels).fold(0.0, |sum, index| sum + weighted(index)) / (3.0 * panels as f64) + self.permanent()
    }
}

/// Four neighbouring grid points, kept while times stay between the inner two.
struct Grid<'t> {
    tide: &'t SolidEarthTide,
    /// Number of the first of the four, in steps since 1970.
    first: i64,
    known: [f64; 4],
}

impl Grid<'_> {
    fn at(&mut self, time: f64) -> f64 {
        if !time.is_finite() {
            return f64::NAN;
        }
        let steps = time / STEP;
        let first = steps.floor() as i64 - 1;
        self.move_to(first);
        let x = steps - (first + 1) as f64;
        let [a, b, c, d] = self.known;
        // Lagrange's cubic through −1, 0, 1, 2.
        -x * (x - 1.0) * (x - 2.0) / 6.0 * a + (x + 1.0) * (x - 1.0) * (x - 2.0) / 2.0 * b
            - (x + 1.0) * x * (x - 2.0) / 2.0 * c
            + (x + 1.0) * x * (x - 1.0) / 6.0 * d
    }

    fn move_to(&mut self, first: i64) {
        let shift = first - self.first;
        if shift == 0 && self.known[0].is_finite() {
            return;
        }
        let before = self.known;
        self.known = std::array::from_fn(|index| {
            let known = usize::try_from(index as i64 + shift).ok().and_then(|old| before.get(old));
            match known {
                Some(value) if value.is_finite() => *value,
                _ => self.tide.variable((first + index as i64) as f64 * STEP),
            }
        });
        self.first = first;
    }
}

/// The factor 1 with the uncertainty of the body model, one input for all tides.
pub fn body_model(builder: &Builder) -> Quantity<'_> {
    let origin = Origin::Constant("differences between models of the yielding Earth, about 0.1 % in the main waves");
    let mut draft = InputDraft::new(
        "solid_earth_tide.body_model",
        "s_T",
        "tide factor: true over computed",
        Kind::Plain,
        unit("1"),
        Value::Scalar(1.0),
        origin,
    );
    draft.distribution = Distribution::Normal { standard_uncertainty: BODY_MODEL_UNCERTAINTY };
    builder.input(draft)
}

/// The effect at many times as a column: `scale` times the variable part, plus the permanent part.
pub fn effect_column<'g>(
    builder: &'g Builder,
    tide: &SolidEarthTide,
    times: &[f64],
    scale: Quantity<'g>,
) -> Quantity<'g> {
    let variable = builder.exact(Value::column(tide.variable_at(times)), Dimension::ACCELERATION, Kind::Plain);
    scale * variable + exact(builder, tide.permanent(), "m/s2")
}

/// The mean effect over a span as a scalar: `scale` times the variable part, plus the permanent part.
pub fn mean_effect<'g>(
    builder: &'g Builder,
    tide: &SolidEarthTide,
    start: f64,
    duration: f64,
    scale: Quantity<'g>,
) -> Quantity<'g> {
    let variable = exact(builder, tide.mean(start, duration) - tide.permanent(), "m/s2");
    scale * variable + exact(builder, tide.permanent(), "m/s2")
}

fn example(latitude: f64, longitude: f64, height: f64, utc: f64, dut1: f64) -> f64 {
    let site = Site { latitude: latitude.to_radians(), longitude: longitude.to_radians(), height };
    SolidEarthTide::new(site).with_dut1(dut1).effect(utc) * 1e8
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::graph::{sensitivities, standard_uncertainty};

    const SITE: Site = Site { latitude: 0.823, longitude: 0.147, height: 450.0 };
    /// 2041-05-04, 0 h UTC.
    const START: f64 = 2_251_238_400.0;

    /// The grid against the series itself: every seventh second of two hours, and one place of every hour for a month.
    #[test]
    fn interpolation_is_far_below_the_method_s_error() {
        let tide = SolidEarthTide::new(SITE);
        let dense = (0..1000).map(|index| START + 7.3 * f64::from(index));
        let sparse = (0..700).map(|index| START + 3737.0 * f64::from(index));
        let times: Vec<f64> = dense.chain(sparse).collect();
        let largest = tide
            .effects(&times)
            .iter()
            .zip(&times)
            .map(|(found, time)| (found - tide.effect(*time)).abs())
            .fold(0.0, f64::max);
        assert!(largest < 1e-12, "{largest} m/s²");
    }

    /// A row's bits do not depend on the rows before it.
    #[test]
    fn a_row_is_the_same_in_every_series() {
        let tide = SolidEarthTide::new(SITE);
        let times: Vec<f64> = (0..40).map(|index| START + 171.0 * f64::from(index)).collect();
        let together = tide.effects(&times);
        for (time, found) in times.iter().zip(&together).rev() {
            assert_eq!(tide.effects(&[*time])[0].to_bits(), found.to_bits());
        }
        assert!(tide.effects(&[f64::NAN])[0].is_nan());
    }

    /// The mean follows a fine sum; over no time it is the effect itself.
    #[test]
    fn the_mean_is_that_of_a_fine_sum() {
        let tide = SolidEarthTide::new(SITE);
        let fine = (0..3600).map(|second| tide.effects(&[START + f64::from(second) + 0.5])[0]).sum::<f64>() / 3600.0;
        assert!((tide.mean(START, 3600.0) - fine).abs() < 1e-13);
        assert_eq!(tide.mean(START, 0.0), tide.effect(START));
    }

    #[test]
    fn systems_differ_by_the_permanent_part() {
        let zero = SolidEarthTide::new(SITE);
        let mean = zero.clone().in_system(PermanentSystem::MeanTide);
        let free = zero.clone().in_system(PermanentSystem::TideFree { factor: 1.16 });
        let permanent = super::super::permanent_tide::permanent(&SITE);
        assert_eq!(mean.permanent(), 0.0);
        assert!((free.effect(START) - zero.effect(START) - 0.16 * permanent).abs() < 1e-20);
    }

    #[test]
    fn times_outside_the_tables_are_refused() {
        assert!(check_times(&[LEAP_SECONDS[0].0, LAST]).is_ok());
        assert_eq!(check_times(&[START, LEAP_SECONDS[0].0 - 1.0]).expect_err("refused").0, 1);
        assert_eq!(check_times(&[LAST + 1.0]).expect_err("refused").1.code, Code::OutOfValidity);
        assert!(check_times(&[f64::NAN]).is_err());
    }

    /// The permanent part is a convention: only the variable part carries the uncertainty of the body model.
    #[test]
    fn only_the_variable_part_is_uncertain() {
        let builder = Builder::default();
        let tide = SolidEarthTide::new(SITE);
        let found = effect_column(&builder, &tide, &[START, START + 1.0], body_model(&builder)).row(1);
        let value = found.number();
        assert!((value - tide.effect(START + 1.0)).abs() < 1e-14);
        let (graph, id) = (builder.graph(), found.id);
        let u = standard_uncertainty(&graph, &sensitivities(&graph, id));
        assert!((u - 1e-3 * (value - tide.permanent()).abs()).abs() < 1e-18);
    }
}
