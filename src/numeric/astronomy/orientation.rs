//! Orientation of the Earth: nutation, obliquity, sidereal time; from ecliptic to equatorial place.
//!
//! # Source    J. Meeus, Astronomical Algorithms, 2nd ed. (1998), chapters 12, 13 and 22 (nutation to 0.5″).
//! # Formula   tan α = (sin λ cos ε − tan β sin ε) / cos λ,  sin δ = sin β cos ε + cos β sin ε sin λ,
//!             with λ + Δψ and ε = ε_0 + Δε;  GAST = GMST + Δψ cos ε

use super::time_scale::Instant;
use super::{Ecliptic, arc_seconds, polynomial, radians};
use crate::numeric::elementary::{asin, atan2, cos, sin};

/// A place by right ascension and declination (rad) and distance (m).
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Equatorial {
    pub right_ascension: f64,
    pub declination: f64,
    pub distance: f64,
}

/// Orientation of the Earth at one instant; angles in rad.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Orientation {
    /// Δψ
    pub nutation_in_longitude: f64,
    /// ε
    pub obliquity: f64,
    /// Greenwich apparent sidereal time.
    pub sidereal_time: f64,
}

impl Orientation {
    /// The orientation at an instant.
    pub fn at(instant: Instant) -> Self {
        let t = instant.terrestrial_centuries();
        let node = radians(125.044_52 - 1_934.136_261 * t);
        let sun = radians(2.0 * (280.466_5 + 36_000.769_8 * t));
        let moon = radians(2.0 * (218.316_5 + 481_267.881_3 * t));
        let psi = -17.20 * sin(node) - 1.32 * sin(sun) - 0.23 * sin(moon) + 0.21 * sin(2.0 * node);
        let epsilon = 9.20 * cos(node) + 0.57 * cos(sun) + 0.10 * cos(moon) - 0.09 * cos(2.0 * node);
        let mean_obliquity = polynomial(&[84_381.448, -46.815_0, -0.000_59, 0.001_813], t);
        let obliquity = arc_seconds(mean_obliquity + epsilon);
        let nutation_in_longitude = arc_seconds(psi);
        Self {
            nutation_in_longitude,
            obliquity,
            sidereal_time: mean_sidereal_time(instant.universal_days()) + nutation_in_longitude * cos(obliquity),
        }
    }

    /// From the mean ecliptic of date to the true equator.
    pub fn equatorial(&self, place: Ecliptic) -> Equatorial {
        let longitude = place.longitude + self.nutation_in_longitude;
        let (sin_e, cos_e) = (sin(self.obliquity), cos(self.obliquity));
        let (sin_b, cos_b) = (sin(place.latitude), cos(place.latitude));
        let (sin_l, cos_l) = (sin(longitude), cos(longitude));
        Equatorial {
            right_ascension: atan2(sin_l * cos_e * cos_b - sin_b * sin_e, cos_l * cos_b),
            declination: asin(sin_b * cos_e + cos_b * sin_e * sin_l),
            distance: place.distance,
        }
    }
}

/// Greenwich mean sidereal time (rad) at `d` days of UT1 since 2000-01-01 12 h.
fn mean_sidereal_time(d: f64) -> f64 {
    let t = d / 36_525.0;
    // Whole turns leave first, so that the fast term keeps its digits.
    let turned = 360.0 * d.rem_euclid(1.0) + 0.985_647_366_29 * d;
    radians(280.460_618_37 + turned + 0.000_387_933 * t * t - t * t * t / 38_710_000.0)
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Meeus, example 22.a (1987-04-10, 0 h TD): Δψ = −3.788″, Δε = +9.443″ by the full series; the four terms give 0.5″.
    #[test]
    fn nutation_is_near_the_full_series() {
        let instant = Instant { utc: 545_011_200.0 - 32.184, tai_minus_utc: 0.0, dut1: 0.0 };
        let found = Orientation::at(instant);
        assert!((found.nutation_in_longitude / arc_seconds(1.0) + 3.788).abs() < 0.5);
        let t = instant.terrestrial_centuries();
        let mean = 84_381.448 - 46.815 * t;
        assert!((found.obliquity / arc_seconds(1.0) - mean - 9.443).abs() < 0.1);
    }

    /// Meeus, example 12.a (1987-04-10, 0 h UT): mean sidereal time 13 h 10 min 46.3668 s.
    #[test]
    fn mean_sidereal_time_is_that_printed() {
        let found = mean_sidereal_time(-4_649.5).to_degrees() / 15.0 * 3600.0;
        assert!((found - (13.0 * 3600.0 + 10.0 * 60.0 + 46.366_8)).abs() < 6e-5, "{found}");
    }
}
