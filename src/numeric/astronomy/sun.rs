//! The Sun's geometric place in the mean ecliptic and equinox of date, seen from the centre of the Earth.
//!
//! # Source    J. Meeus, Astronomical Algorithms, 2nd ed. (1998), chapter 25, geometric longitude and radius; the step
//!             from the barycentre of Earth and Moon to the Earth, 6.454″ sin D and 3.08e-5 au cos D.
//!
//! There is no aberration and no light time: attraction points to the geometric place.

use super::{Ecliptic, moon, polynomial, radians};
use crate::numeric::elementary::{cos, sin};

/// The astronomical unit, m (IAU 2012, rounded as the series is).
const ASTRONOMICAL_UNIT: f64 = 1.495_978_707e11;

/// The place at `t` Julian centuries of terrestrial time since 2000-01-01 12 h; the latitude, below 1.2″, is left out.
pub fn place(t: f64) -> Ecliptic {
    let mean_longitude = polynomial(&[280.466_46, 36_000.769_83, 0.000_303_2], t);
    let anomaly = polynomial(&[357.529_11, 35_999.050_29, -0.000_153_7], t);
    let eccentricity = polynomial(&[0.016_708_634, -0.000_042_037, -0.000_000_126_7], t);
    let centre = polynomial(&[1.914_602, -0.004_817, -0.000_014], t) * sin(radians(anomaly))
        + (0.019_993 - 0.000_101 * t) * sin(radians(2.0 * anomaly))
        + 0.000_289 * sin(radians(3.0 * anomaly));
    let d = radians(moon::elongation(t));
    let radius = 1.000_001_018 * (1.0 - eccentricity * eccentricity)
        / (1.0 + eccentricity * cos(radians(anomaly + centre)))
        + 3.08e-5 * cos(d);
    Ecliptic {
        longitude: radians(mean_longitude + centre + 6.454 / 3600.0 * sin(d)),
        latitude: 0.0,
        distance: radius * ASTRONOMICAL_UNIT,
    }
}
