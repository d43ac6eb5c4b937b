//! The six arguments of tidal waves, and their speeds.
//!
//! # Source    J. L. Simon et al., Astron. Astrophys. 282 (1994) 663, mean elements; T. Hartmann, H.-G. Wenzel (1995) for
//!             the count of τ from the lower transit of the mean Moon.
//! # Formula   τ = h − s + 15° UT1 + λ_E − 0.0027 · 15° ΔT/h,  ΔT = TT − UTC

use super::time_scale::Instant;
use super::{polynomial, radians};

/// Mean longitude of the Moon s, in Julian centuries; degrees.
const MOON: [f64; 5] = [218.316_645_63, 481_267.881_195_75, -0.001_466_388_9, 0.000_001_851_4, -0.000_000_015_3];
/// Mean longitude of the Sun h, in Julian millennia, as the other arguments; degrees.
const SUN: [f64; 5] = [280.466_450_16, 360_007.697_488_055_6, 0.030_322_222_2, 0.000_02, -0.000_065_361_1];
/// Longitude of the lunar perigee p.
const PERIGEE: [f64; 5] = [83.353_243_12, 40_690.136_352_5, -1.032_172_222_2, -0.012_491_666_7, 0.000_526_333_3];
/// Negative longitude of the lunar node N'.
const NODE: [f64; 5] = [234.955_444_99, 19_341.362_619_722_2, -0.207_561_111_1, -0.002_139_444_4, 0.000_164_972_2];
/// Longitude of the solar perigee p_s.
const SOLAR_PERIGEE: [f64; 5] = [282.937_340_98, 17.194_576_666_6, 0.045_688_888_9, -0.000_017_777_8, -0.000_033_444_4];

/// τ, s, h, p, N' and p_s in degrees at an instant, at a longitude in degrees east.
pub fn tidal_arguments(instant: Instant, east_longitude: f64) -> [f64; 6] {
    let t = instant.terrestrial_centuries();
    let thousand = t / 10.0;
    let (s, h) = (polynomial(&MOON, t), polynomial(&SUN, thousand));
    let delta_t = 15.0 * 0.002_7 * instant.terrestrial_minus_utc() / 3600.0;
    let tau = h - s + 15.0 * instant.universal_hours() + east_longitude - delta_t;
    [tau, s, h, polynomial(&PERIGEE, thousand), polynomial(&NODE, thousand), polynomial(&SOLAR_PERIGEE, thousand)]
}

/// Speeds of the arguments at 2000-01-01 12 h, degrees per hour.
pub fn argument_speeds() -> [f64; 6] {
    let hours = 36_525.0 * 24.0;
    let (s, h) = (MOON[1] / hours, SUN[1] / (10.0 * hours));
    let slow = |series: &[f64; 5]| series[1] / (10.0 * hours);
    [15.0 + h - s, s, h, slow(&PERIGEE), slow(&NODE), slow(&SOLAR_PERIGEE)]
}

/// Σ k_i times the arguments (degrees), as an angle in rad.
pub fn angle(multipliers: &[i8; 6], arguments: &[f64; 6]) -> f64 {
    radians(weighted(multipliers, arguments))
}

/// Speed of a wave, degrees per hour.
pub fn speed(multipliers: &[i8; 6]) -> f64 {
    weighted(multipliers, &argument_speeds())
}

fn weighted(multipliers: &[i8; 6], values: &[f64; 6]) -> f64 {
    multipliers.iter().zip(values).fold(0.0, |sum, (k, value)| sum + f64::from(*k) * value)
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Speeds as tables of tides print them, degrees per hour; theories differ in the seventh decimal.
    #[test]
    fn speeds_are_those_of_the_tables() {
        let cases = [
            ([2, 0, 0, 0, 0, 0], 28.984_104_2),
            ([2, 2, -2, 0, 0, 0], 30.0),
            ([1, 1, 0, 0, 0, 0], 15.041_068_6),
            ([1, -1, 0, 0, 0, 0], 13.943_035_6),
            ([0, 2, 0, 0, 0, 0], 1.098_033_1),
            ([0, 1, 0, -1, 0, 0], 0.544_374_7),
        ];
        for (multipliers, printed) in cases {
            assert!((speed(&multipliers) - printed).abs() < 1e-7, "{multipliers:?}");
        }
    }
}
