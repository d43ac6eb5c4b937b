//! The Moon's geometric place in the mean ecliptic and equinox of date.
//!
//! # Source    J. Meeus, Astronomical Algorithms, 2nd ed. (1998), chapter 47; the mean longitude without the constant
//!             for light time that the printed one holds (0.000207°).
//! # Formula   λ = L' + Σl,  β = Σb,  distance = 385 000 560 m + Σr, each term of argument dD + mM + m'M' + fF
//!             times E^|m|

use super::moon_terms::{LATITUDE, LONGITUDE_AND_DISTANCE, Term};
use super::{Ecliptic, polynomial, radians};
use crate::numeric::elementary::{cos, powi, sin};

/// The place at `t` Julian centuries of terrestrial time since 2000-01-01 12 h.
pub fn place(t: f64) -> Ecliptic {
    let mean_longitude = mean_longitude(t);
    let arguments = [elongation(t), sun_anomaly(t), moon_anomaly(t), latitude_argument(t)];
    let e = 1.0 - 0.002_516 * t - 0.000_007_4 * t * t;
    let (mut longitude, mut latitude, mut distance) = (0.0, 0.0, 0.0);
    for term in &LONGITUDE_AND_DISTANCE {
        let (angle, scale) = (argument(term, &arguments), powi(e, i32::from(term.multipliers[1].abs())));
        longitude += scale * term.sine * sin(angle);
        distance += scale * term.cosine * cos(angle);
    }
    for term in &LATITUDE {
        latitude += powi(e, i32::from(term.multipliers[1].abs())) * term.sine * sin(argument(term, &arguments));
    }
    longitude += additive_longitude(t, mean_longitude, arguments[3]);
    latitude += additive_latitude(t, mean_longitude, arguments[2], arguments[3]);
    Ecliptic {
        longitude: radians(mean_longitude + longitude * 1e-6),
        latitude: latitude * 1e-6 * (std::f64::consts::PI / 180.0),
        distance: 385_000_560.0 + distance,
    }
}

/// Mean longitude L', degrees.
fn mean_longitude(t: f64) -> f64 {
    polynomial(&[218.316_654_36, 481_267.881_234_21, -0.001_578_6, 1.0 / 538_841.0, -1.0 / 65_194_000.0], t)
}

/// Mean elongation D of the Moon from the Sun, degrees.
pub(super) fn elongation(t: f64) -> f64 {
    polynomial(&[297.850_192_1, 445_267.111_403_4, -0.001_881_9, 1.0 / 545_868.0, -1.0 / 113_065_000.0], t)
}

/// Mean anomaly M of the Sun, degrees.
fn sun_anomaly(t: f64) -> f64 {
    polynomial(&[357.529_109_2, 35_999.050_290_9, -0.000_153_6, 1.0 / 24_490_000.0], t)
}

/// Mean anomaly M' of the Moon, degrees.
fn moon_anomaly(t: f64) -> f64 {
    polynomial(&[134.963_396_4, 477_198.867_505_5, 0.008_741_4, 1.0 / 69_699.0, -1.0 / 14_712_000.0], t)
}

/// Argument F of latitude of the Moon, degrees.
fn latitude_argument(t: f64) -> f64 {
    polynomial(&[93.272_095_0, 483_202.017_523_3, -0.003_653_9, -1.0 / 3_526_000.0, 1.0 / 863_310_000.0], t)
}

fn argument(term: &Term, arguments: &[f64; 4]) -> f64 {
    radians(term.multipliers.iter().zip(arguments).fold(0.0, |sum, (k, angle)| sum + f64::from(*k) * angle))
}

/// Action of Venus, of the Earth's flattening, and of Jupiter on the longitude, 1e-6°.
fn additive_longitude(t: f64, mean_longitude: f64, f: f64) -> f64 {
    let (a1, a2) = (119.75 + 131.849 * t, 53.09 + 479_264.290 * t);
    3958.0 * sin(radians(a1)) + 1962.0 * sin(radians(mean_longitude - f)) + 318.0 * sin(radians(a2))
}

/// Action of the same on the latitude, 1e-6°.
fn additive_latitude(t: f64, mean_longitude: f64, m: f64, f: f64) -> f64 {
    let (a1, a3) = (119.75 + 131.849 * t, 313.45 + 481_266.484 * t);
    -2235.0 * sin(radians(mean_longitude))
        + 382.0 * sin(radians(a3))
        + 175.0 * (sin(radians(a1 - f)) + sin(radians(a1 + f)))
        + 127.0 * sin(radians(mean_longitude - m))
        - 115.0 * sin(radians(mean_longitude + m))
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Meeus, example 47.a (1992-04-12, 0 h): printed 133.162655°, −3.229126°, 368409.7 km.
    #[test]
    fn the_printed_example_is_reproduced() {
        let moon = place(-0.077_221_081_451);
        assert!((moon.longitude.to_degrees() - (133.162_655 + 0.000_207)).abs() < 2e-6);
        assert!((moon.latitude.to_degrees() + 3.229_126).abs() < 1e-6);
        assert!((moon.distance / 1e3 - 368_409.7).abs() < 0.05);
    }
}
