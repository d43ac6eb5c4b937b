//! Places of Moon and Sun, orientation of the Earth, time scales and tidal arguments, as far as tides need them.
//!
//! Angles are in degrees inside the series, as their sources print them, and in radians where they are handed on.
//!
//! | module | what it holds |
//! |---|---|
//! | [`time_scale`] | leap seconds; terrestrial and universal time of an instant |
//! | [`moon`], [`sun`] | geometric places in the mean ecliptic and equinox of date |
//! | [`orientation`] | nutation, obliquity, sidereal time; ecliptic to equatorial |
//! | [`tidal_argument`] | the six arguments of tidal waves and their speeds |

pub mod moon;
mod moon_terms;
pub mod orientation;
pub mod sun;
pub mod tidal_argument;
pub mod time_scale;

use std::f64::consts::PI;

/// A place by longitude and latitude (rad) and distance (m).
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Ecliptic {
    pub longitude: f64,
    pub latitude: f64,
    pub distance: f64,
}

/// Degrees of any size to radians of one turn.
pub fn radians(degrees: f64) -> f64 {
    degrees.rem_euclid(360.0) * (PI / 180.0)
}

/// Seconds of arc to radians.
pub fn arc_seconds(seconds: f64) -> f64 {
    seconds * (PI / 648_000.0)
}

/// c_0 + c_1 x + c_2 x² + …
fn polynomial(coefficients: &[f64], x: f64) -> f64 {
    coefficients.iter().rev().fold(0.0, |value, coefficient| value * x + coefficient)
}
