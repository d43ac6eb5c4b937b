//! Tidal attraction of Moon and Sun on a rigid Earth, by degree and order, along the downward ellipsoidal normal.
//!
//! # Source    development of the tidal potential in spherical harmonics (W. Torge, J. Müller, Geodesy, 4th ed. (2012),
//!             section 3.5, recalled); GM of the Moon and of the Sun of the JPL ephemeris DE421.
//! # Formula   A_nm = −k_n q_nm [cos β · n P_nm(sin ψ) + sin β · dP_nm(sin ψ)/dψ],  k_n = GM r^(n−1)/d^(n+1),
//!             q_nm = (2 − δ_m0) (n − m)!/(n + m)! P_nm(sin δ) cos mH
//!     r, ψ  geocentric radius and latitude of the site; β angle of the normal to the radius
//!     d, δ, H  distance, declination and local hour angle of the body

use super::gravity_site::Geocentric;
use crate::numeric::astronomy::orientation::{Equatorial, Orientation};
use crate::numeric::astronomy::time_scale::Instant;
use crate::numeric::astronomy::{moon, sun};
use crate::numeric::elementary::{cos, powi, sin};

/// GM of the Moon, m³/s².
const MOON: f64 = 4.902_800_066e12;
/// GM of the Sun, m³/s².
const SUN: f64 = 1.327_124_400_18e20;

/// Attraction of one body, m/s², positive downward.
#[derive(Debug, Clone, Copy, PartialEq, Default)]
pub struct Attraction {
    /// Degree 2, orders 0 to 2.
    pub second: [f64; 3],
    /// Degree 3, orders 0 to 3.
    pub third: [f64; 4],
    /// Degree 4 as a whole.
    pub fourth: f64,
    /// k_2 q_20: the strength of the long-period part of degree 2, m/s².
    pub zonal_strength: f64,
}

impl Attraction {
    /// All degrees together.
    pub fn total(&self) -> f64 {
        self.second.iter().sum::<f64>() + self.third.iter().sum::<f64>() + self.fourth
    }
}

/// Attraction of the Moon (degrees 2 to 4) and of the Sun (degrees 2 and 3).
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct RigidTide {
    pub moon: Attraction,
    pub sun: Attraction,
}

impl RigidTide {
    /// The tide of a rigid Earth at a site of longitude `longitude` (rad, east positive).
    pub fn at(site: &Geocentric, longitude: f64, instant: Instant) -> Self {
        let orientation = Orientation::at(instant);
        let t = instant.terrestrial_centuries();
        let attraction = |gm: f64, place: Equatorial| {
            let hour_angle = orientation.sidereal_time + longitude - place.right_ascension;
            Body { gm, distance: place.distance, declination: place.declination, hour_angle }
        };
        let moon = attraction(MOON, orientation.equatorial(moon::place(t)));
        let sun = attraction(SUN, orientation.equatorial(sun::place(t)));
        let fourth = moon.fourth(site);
        Self { moon: Attraction { fourth, ..moon.second_and_third(site) }, sun: sun.second_and_third(site) }
    }

    /// Moon and Sun together.
    pub fn sum(&self) -> Attraction {
        let (moon, sun) = (&self.moon, &self.sun);
        Attraction {
            second: std::array::from_fn(|m| moon.second[m] + sun.second[m]),
            third: std::array::from_fn(|m| moon.third[m] + sun.third[m]),
            fourth: moon.fourth + sun.fourth,
            zonal_strength: moon.zonal_strength + sun.zonal_strength,
        }
    }
}

/// A body in the sky of the site; angles in rad.
struct Body {
    gm: f64,
    distance: f64,
    declination: f64,
    hour_angle: f64,
}

impl Body {
    /// k_n, m/s².
    fn strength(&self, radius: f64, n: i32) -> f64 {
        self.gm / (self.distance * self.distance) * powi(radius / self.distance, n - 1)
    }

    fn second_and_third(&self, site: &Geocentric) -> Attraction {
        let (k2, k3) = (self.strength(site.radius, 2), self.strength(site.radius, 3));
        let (s, c) = (sin(self.declination), cos(self.declination));
        let orders: [f64; 4] = std::array::from_fn(|m| cos(m as f64 * self.hour_angle));
        let (p2, p3) = (second_degree(s, c), third_degree(s, c));
        let (factors2, factors3) = ([1.0, 1.0 / 3.0, 1.0 / 12.0], [1.0, 1.0 / 6.0, 1.0 / 60.0, 1.0 / 360.0]);
        let second = normal_components(site, 2.0, second_degree, second_slope);
        let third = normal_components(site, 3.0, third_degree, third_slope);
        Attraction {
            second: std::array::from_fn(|m| -k2 * factors2[m] * p2[m] * orders[m] * second[m]),
            third: std::array::from_fn(|m| -k3 * factors3[m] * p3[m] * orders[m] * third[m]),
            fourth: 0.0,
            zonal_strength: k2 * p2[0],
        }
    }

    /// Degree 4 from the zenith angle: n P_4 and its change with latitude.
    fn fourth(&self, site: &Geocentric) -> f64 {
        let (s, c, cos_h) = (sin(self.declination), cos(self.declination), cos(self.hour_angle));
        let zenith = site.sine * s + site.cosine * c * cos_h;
        let by_latitude = site.cosine * s - site.sine * c * cos_h;
        let square = zenith * zenith;
        let p = (35.0 * square * square - 30.0 * square + 3.0) / 8.0;
        let slope = (35.0 * square * zenith - 15.0 * zenith) / 2.0;
        let normal = site.normal_cosine * 4.0 * p + site.normal_sine * slope * by_latitude;
        -self.strength(site.radius, 4) * normal
    }
}

/// cos β · n P_nm + sin β · dP_nm/dψ for every order.
fn normal_components<const M: usize>(
    site: &Geocentric,
    n: f64,
    values: fn(f64, f64) -> [f64; M],
    slopes: fn(f64, f64) -> [f64; M],
) -> [f64; M] {
    let (p, slope) = (values(site.sine, site.cosine), slopes(site.sine, site.cosine));
    std::array::from_fn(|m| site.normal_cosine * n * p[m] + site.normal_sine * slope[m])
}

/// The normal components of degree 2 or 3 at an order, for the waves of the potential; zero for others.
pub fn normal_component(site: &Geocentric, degree: usize, order: usize) -> f64 {
    match degree {
        2 => normal_components(site, 2.0, second_degree, second_slope).get(order).copied().unwrap_or(0.0),
        3 => normal_components(site, 3.0, third_degree, third_slope).get(order).copied().unwrap_or(0.0),
        _ => 0.0,
    }
}

/// P_20, P_21, P_22 of sine s and cosine c of a latitude, without the factor (−1)^m.
fn second_degree(s: f64, c: f64) -> [f64; 3] {
    [(3.0 * s * s - 1.0) / 2.0, 3.0 * s * c, 3.0 * c * c]
}

/// Their derivatives by latitude.
fn second_slope(s: f64, c: f64) -> [f64; 3] {
    [3.0 * s * c, 3.0 * (c * c - s * s), -6.0 * s * c]
}

/// P_30 to P_33.
fn third_degree(s: f64, c: f64) -> [f64; 4] {
    [(5.0 * s * s - 3.0) * s / 2.0, 1.5 * c * (5.0 * s * s - 1.0), 15.0 * s * c * c, 15.0 * c * c * c]
}

/// Their derivatives by latitude.
fn third_slope(s: f64, c: f64) -> [f64; 4] {
    [
        (15.0 * s * s - 3.0) / 2.0 * c,
        1.5 * s * (10.0 * c * c - 5.0 * s * s + 1.0),
        15.0 * c * (c * c - 2.0 * s * s),
        -45.0 * c * c * s,
    ]
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn slopes_are_derivatives() {
        let (psi, step) = (0.7_f64, 1e-6);
        let central = |f: &dyn Fn(f64) -> f64| (f(psi + step) - f(psi - step)) / (2.0 * step);
        for m in 0..3 {
            let numeric = central(&|x| second_degree(sin(x), cos(x))[m]);
            assert!((numeric - second_slope(sin(psi), cos(psi))[m]).abs() < 1e-8, "degree 2, order {m}");
        }
        for m in 0..4 {
            let numeric = central(&|x| third_degree(sin(x), cos(x))[m]);
            assert!((numeric - third_slope(sin(psi), cos(psi))[m]).abs() < 1e-7, "degree 3, order {m}");
        }
    }

    /// Degrees 2 and 3 by orders add up to the Legendre polynomial of the zenith angle.
    #[test]
    fn orders_add_up_to_the_zenith_angle() {
        let site = super::super::gravity_site::Site { latitude: 0.8, longitude: 0.3, height: 500.0 }.geocentric();
        let body = Body { gm: MOON, distance: 3.8e8, declination: 0.35, hour_angle: 1.1 };
        let (s, c, cos_h) = (sin(body.declination), cos(body.declination), cos(body.hour_angle));
        let z = site.sine * s + site.cosine * c * cos_h;
        let by_latitude = site.cosine * s - site.sine * c * cos_h;
        let whole = |n: f64, p: f64, slope: f64| {
            -body.strength(site.radius, n as i32)
                * (site.normal_cosine * n * p + site.normal_sine * slope * by_latitude)
        };
        let found = body.second_and_third(&site);
        let second = whole(2.0, (3.0 * z * z - 1.0) / 2.0, 3.0 * z);
        let third = whole(3.0, (5.0 * z * z - 3.0) * z / 2.0, (15.0 * z * z - 3.0) / 2.0);
        assert!((found.second.iter().sum::<f64>() - second).abs() < 1e-20);
        assert!((found.third.iter().sum::<f64>() - third).abs() < 1e-21);
    }
}
