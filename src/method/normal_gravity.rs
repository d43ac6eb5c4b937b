//! Normal gravity of the reference ellipsoid, for the plausibility of a stated value.
//!
//! # Source    H. Moritz, Geodetic Reference System 1980, J. Geodesy 74 (2000) 128.
//! # Formula   γ_0 = γ_e (1 + k sin²φ)/√(1 − e² sin²φ)
//!             γ_h = γ_0 [1 − (2/a)(1 + f + m − 2f sin²φ) h + 3 h²/a²]
//!     γ_e  9.7803267715, normal gravity at the equator   m/s²
//!     k    0.001931851353
//!     e²   0.00669438002290;  f = 1/298.257222101;  m = 0.00344978600308
//!     a    6378137 m, semi-major axis
//!     φ    geodetic latitude                             rad
//!     h    height above the ellipsoid                    m
//! # Valid for −430 m ≤ h ≤ 6000 m; at 2.2 km the series errs by 2e-7 m/s².

use super::gravity_range::Verdict;
use super::gravity_site::{ECCENTRICITY_SQUARED, SEMI_MAJOR_AXIS, Site};
use super::{Method, WorkedExample};
use crate::diagnostic::{Code, Problem};
use crate::graph::MethodInfo;
use crate::numeric::elementary::{sin, sqrt, square};

/// The registry's line.
pub static METHOD: Method = Method {
    info: MethodInfo {
        name: "normal-gravity",
        title: "Normal gravity, GRS80",
        source: "Moritz, Geodetic Reference System 1980, J. Geodesy 74 (2000) 128",
        formula: "γ_h = γ_e (1 + k sin²φ)/√(1 − e² sin²φ) · [1 − (2/a)(1 + f + m − 2f sin²φ) h + 3 h²/a²]",
        symbols: &[
            ("γ_h", "normal gravity at the height h", "m/s2"),
            ("γ_e", "normal gravity at the equator, 9.780 326 771 5 m/s²", "m/s2"),
            ("k", "constant of the normal formula, 0.001 931 851 353", "1"),
            ("e²", "first eccentricity squared, 0.006 694 380 022 90", "1"),
            ("f", "flattening, 1/298.257 222 101", "1"),
            ("m", "ratio of centrifugal force to gravity, 0.003 449 786 003 08", "1"),
            ("a", "semi-major axis, 6 378 137 m", "m"),
            ("φ", "geodetic latitude", "rad"),
            ("h", "height above the ellipsoid", "m"),
        ],
        valid_for: "heights from −430 m to 6000 m",
    },
    examples: &[
        example("0° N, 0 m", "9.7803267715", || at(0.0, 0.0)),
        example("90° N, 0 m", "9.8321863685", || at(90.0, 0.0)),
        WorkedExample {
            source: "GRS80 in ellipsoidal coordinates, 40-digit arithmetic apart from this project",
            given: "45° N, 0 m",
            quantity: "γ/(m/s²)",
            printed: "9.8061992025",
            found: || at(45.0, 0.0),
        },
    ],
};

const fn example(given: &'static str, printed: &'static str, found: fn() -> f64) -> WorkedExample {
    WorkedExample { source: "Moritz, J. Geodesy 74 (2000) 128", given, quantity: "γ/(m/s²)", printed, found }
}

/// Normal gravity at the equator, m/s².
const EQUATOR: f64 = 9.780_326_771_5;
/// Constant k of the normal formula.
const K: f64 = 0.001_931_851_353;
/// Flattening f.
const FLATTENING: f64 = 1.0 / 298.257_222_101;
/// Ratio m of centrifugal force to gravity at the equator.
const CENTRIFUGAL_RATIO: f64 = 0.003_449_786_003_08;
/// Farthest that surface gravity ordinarily departs from the normal value, m/s² (300 mGal).
const USUAL: f64 = 3e-3;
/// Farthest that it can depart, m/s² (1000 mGal).
const POSSIBLE: f64 = 1e-2;

/// Normal gravity at a site, m/s².
pub fn normal_gravity(site: &Site) -> f64 {
    let sine = square(sin(site.latitude));
    let surface = EQUATOR * (1.0 + K * sine) / sqrt(1.0 - ECCENTRICITY_SQUARED * sine);
    let h = site.height / SEMI_MAJOR_AXIS;
    let linear = 2.0 * (1.0 + FLATTENING + CENTRIFUGAL_RATIO - 2.0 * FLATTENING * sine);
    surface * (1.0 - linear * h + 3.0 * h * h)
}

/// The verdict on a stated value of gravity, m/s².
pub fn verdict(site: &Site, g: f64) -> Verdict {
    match (g - normal_gravity(site)).abs() {
        departure if departure <= USUAL => Verdict::Accept,
        departure if departure <= POSSIBLE => Verdict::Warn,
        _ => Verdict::Reject,
    }
}

/// A sentence on a value that is not accepted; none on one that is.
pub fn remark(site: &Site, g: f64) -> Option<String> {
    let (verb, limit) = match verdict(site, g) {
        Verdict::Accept => return None,
        Verdict::Warn => ("unusual", USUAL),
        Verdict::Reject => ("impossible", POSSIBLE),
    };
    let (normal, limit) = (normal_gravity(site), limit * 1e5);
    let departure = (g - normal) * 1e5;
    Some(format!(
        "The gravity {g:.6} m/s² is {verb} at this latitude and height: it departs by {departure:.0} mGal from the \
         normal value {normal:.6} m/s², expected within {limit:.0} mGal."
    ))
}

/// Refuses an impossible value.
///
/// # Errors
/// `out_of_validity` beyond 1000 mGal from the normal value.
pub fn check(site: &Site, g: f64) -> Result<(), Problem> {
    match (verdict(site, g), remark(site, g)) {
        (Verdict::Reject, Some(message)) => Err(Problem::new(Code::OutOfValidity, message)
            .hint("Check the digits of the value, and the latitude and height of the site.")),
        _ => Ok(()),
    }
}

fn at(degrees: f64, height: f64) -> f64 {
    normal_gravity(&Site { latitude: degrees.to_radians(), longitude: 0.0, height })
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn verdicts_at_the_edges() {
        let site = Site { latitude: 0.8, longitude: 0.0, height: 200.0 };
        let normal = normal_gravity(&site);
        let cases = [
            (2.999e-3, Verdict::Accept),
            (3.001e-3, Verdict::Warn),
            (9.999e-3, Verdict::Warn),
            (1.0001e-2, Verdict::Reject),
            (f64::NAN, Verdict::Reject),
        ];
        for (departure, expected) in cases {
            assert_eq!(verdict(&site, normal + departure), expected, "{departure}");
            assert_eq!(check(&site, normal - departure).is_err(), expected == Verdict::Reject);
            assert_eq!(remark(&site, normal + departure).is_none(), expected == Verdict::Accept);
        }
    }
}
