//! Effect of polar motion and of the length of day on gravity.
//!
//! # Source    IAGBN 1992 (International Absolute Gravity Basestation Network), processing standards.
//! # Formula   E = δ_p · 2 ω² a sin φ cos φ (x cos λ − y sin λ);  E_LOD = δ · 2 (LOD/86400 s) ω² a cos²φ
//!     E     effect on g, positive downward                   m/s²
//!     δ_p   1.164, yielding of the Earth                     1
//!     ω     7.292115e-5, angular velocity of the Earth       rad/s
//!     a     6378136 m, equatorial radius of the Earth        m
//!     x, y  coordinates of the pole (IERS)                   rad
//!     LOD   excess of the length of day                      s
//! # Valid for pole coordinates within one second of arc. No mean pole is subtracted.

use super::gravity_site::Site;
use super::{Method, WorkedExample, exact};
use crate::graph::{Builder, MethodInfo, Quantity};
use crate::numeric::astronomy::arc_seconds;
use crate::numeric::elementary::{cos, sin, square};
use crate::quantity::Kind;

/// The registry's line.
pub static METHOD: Method = Method {
    info: MethodInfo {
        name: "polar-motion",
        title: "Effect of polar motion on gravity",
        source: "IAGBN 1992, processing standards of absolute gravity",
        formula: "E = δ_p · 2 ω² a sin φ cos φ (x cos λ − y sin λ)",
        symbols: &[
            ("E", "effect on g, positive downward", "m/s2"),
            ("δ_p", "gravimetric factor of the pole tide, 1.164", "1"),
            ("ω", "angular velocity of the Earth, 7.292 115e-5 rad/s", "rad/s"),
            ("a", "equatorial radius, 6 378 136 m", "m"),
            ("φ", "geodetic latitude", "rad"),
            ("λ", "longitude, east positive", "rad"),
            ("x", "coordinate of the pole towards Greenwich", "rad"),
            ("y", "coordinate of the pole towards 90° W", "rad"),
        ],
        valid_for: "coordinates of the pole within one second of arc",
    },
    examples: &[
        WorkedExample {
            source: "pole tide of an independent program, factor 1.164",
            given: "48.83° N, 2.22° E, x = 0.12359″, y = 0.32334″",
            quantity: "E/µGal",
            printed: "2.105",
            found: || example(48.83, 2.22, 0.123_59, 0.323_34),
        },
        WorkedExample {
            source: "pole tide of an independent program, factor 1.164",
            given: "39.13° N, 77.22° W, x = 0.00463″, y = 0.37957″",
            quantity: "E/µGal",
            printed: "6.956",
            found: || example(39.13, -77.22, 0.004_63, 0.379_57),
        },
    ],
};

/// Gravimetric factor of the pole tide.
const FACTOR: f64 = 1.164;
/// Gravimetric factor of a change of the length of day.
const LENGTH_OF_DAY_FACTOR: f64 = 1.16;
/// Angular velocity of the Earth, rad/s.
const ANGULAR_VELOCITY: f64 = 7.292_115e-5;
/// Equatorial radius as the standard has it, m.
const RADIUS: f64 = 6_378_136.0;

/// dE/dx and dE/dy, m s⁻² per rad.
fn coefficients(site: &Site) -> (f64, f64) {
    let scale = FACTOR * 2.0 * square(ANGULAR_VELOCITY) * RADIUS * sin(site.latitude) * cos(site.latitude);
    (scale * cos(site.longitude), -scale * sin(site.longitude))
}

/// Effect on g, m/s², of a pole at `x`, `y` (rad).
pub fn effect_number(site: &Site, x: f64, y: f64) -> f64 {
    let (by_x, by_y) = coefficients(site);
    by_x * x + by_y * y
}

/// Effect on g of a pole at `x`, `y` (rad); columns where they are.
pub fn effect<'g>(builder: &'g Builder, site: &Site, x: Quantity<'g>, y: Quantity<'g>) -> Quantity<'g> {
    let (by_x, by_y) = coefficients(site);
    exact(builder, by_x, "m/s2") * x.as_kind(Kind::Plain) + exact(builder, by_y, "m/s2") * y.as_kind(Kind::Plain)
}

/// Effect on g of an excess of the length of day (s), m/s²: 0.09 µGal for 1 ms.
pub fn length_of_day_effect<'g>(builder: &'g Builder, site: &Site, excess: Quantity<'g>) -> Quantity<'g> {
    let scale = LENGTH_OF_DAY_FACTOR * 2.0 / 86_400.0 * square(ANGULAR_VELOCITY) * RADIUS * square(cos(site.latitude));
    exact(builder, scale, "m s-3") * excess.as_kind(Kind::Plain)
}

fn example(latitude: f64, longitude: f64, x: f64, y: f64) -> f64 {
    let site = Site { latitude: latitude.to_radians(), longitude: longitude.to_radians(), height: 0.0 };
    effect_number(&site, arc_seconds(x), arc_seconds(y)) * 1e8
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn the_graph_gives_the_same_and_the_day_a_tenth_of_a_microgal() {
        let builder = Builder::default();
        let site = Site { latitude: 0.8, longitude: -1.2, height: 0.0 };
        let (x, y) = (exact(&builder, 1e-6, "1"), exact(&builder, -2e-6, "1"));
        let found = effect(&builder, &site, x, y).number();
        assert!((found - effect_number(&site, 1e-6, -2e-6)).abs() < 1e-22 && found != 0.0);
        let equator = Site { latitude: 0.0, ..site };
        let day = length_of_day_effect(&builder, &equator, exact(&builder, 1e-3, "s")).number();
        assert!((day * 1e8 - 0.091).abs() < 0.001, "{day}");
    }
}
