//! The permanent part of the tide, and the three systems in which values of gravity are given.
//!
//! # Source    IAG 1983, resolution 16 (zero-tide system); T. Hartmann, H.-G. Wenzel, Geophys. Res. Lett. 22 (1995) 3553
//!             (constant term of the tidal potential, −0.8695547·√5 m²/s²).
//! # Formula   A_perm = −V_20 (r/a)²/r · [cos β (3 sin²ψ − 1) + sin β · 3 sin ψ cos ψ]
//!             g_mean = g_zero + A_perm,  g_free = g_zero − (δ_0 − 1) A_perm
//!     A_perm  permanent attraction on a rigid Earth, positive downward   m/s²
//!     δ_0     permanent factor used by a tide-free report, 1.16 typical  1
//! # Valid for any site on the Earth.

use super::gravity_site::{Geocentric, Site};
use super::{Method, WorkedExample, exact};
use crate::graph::{Builder, MethodInfo, Quantity};

/// The registry's line.
pub static METHOD: Method = Method {
    info: MethodInfo {
        name: "permanent-tide",
        title: "Permanent tide and the systems of gravity values",
        source: "IAG 1983, resolution 16; Hartmann, Wenzel, Geophys. Res. Lett. 22 (1995) 3553",
        formula: "A_perm = −V_20 (r/a)²/r · [cos β (3 sin²ψ − 1) + sin β · 3 sin ψ cos ψ];  \
                  g_mean = g_zero + A_perm,  g_free = g_zero − (δ_0 − 1) A_perm",
        symbols: &[
            ("A_perm", "permanent attraction of Moon and Sun, positive downward", "m/s2"),
            ("V_20", "constant term of the tidal potential, −1.944 384 m²/s²", "m2/s2"),
            ("r", "geocentric radius of the site", "m"),
            ("a", "equatorial radius of the Earth", "m"),
            ("ψ", "geocentric latitude", "rad"),
            ("β", "angle between ellipsoidal normal and radius", "rad"),
            ("g_zero", "gravity in the zero-tide system", "m/s2"),
            ("g_mean", "gravity in the mean-tide system", "m/s2"),
            ("g_free", "gravity in the tide-free system", "m/s2"),
            ("δ_0", "permanent factor of a tide-free value", "1"),
        ],
        valid_for: "any site on the Earth",
    },
    examples: &[
        WorkedExample {
            source: "constant term of the HW95 catalogue, evaluated apart from this project",
            given: "48.83° N, 2.22° E, 70 m",
            quantity: "A_perm/µGal",
            printed: "21.15",
            found: || permanent(&Site { latitude: 48.83_f64.to_radians(), longitude: 0.0, height: 70.0 }) * 1e8,
        },
        WorkedExample {
            source: "constant term of the HW95 catalogue, evaluated apart from this project",
            given: "0° N, 0° E, 0 m",
            quantity: "A_perm/µGal",
            printed: "-30.49",
            found: || permanent(&Site { latitude: 0.0, longitude: 0.0, height: 0.0 }) * 1e8,
        },
    ],
};

/// Constant term V_20 of the tidal potential of Moon and Sun, m²/s².
pub const CONSTANT_TERM: f64 = -1.944_384;
/// Equatorial radius to which the potential is referred, m (Hartmann and Wenzel 1995).
pub const POTENTIAL_RADIUS: f64 = 6_378_136.3;

/// The system in which a value of gravity is given.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum PermanentSystem {
    /// The normal case: the permanent attraction is taken out, the permanent yielding of the Earth stays.
    ZeroTide,
    /// The permanent attraction and yielding are left in.
    MeanTide,
    /// Both are taken out by a factor, 1.16 in most reports.
    TideFree { factor: f64 },
}

impl PermanentSystem {
    /// The factor of the permanent part in the tide added to a value of this system.
    pub fn factor(self) -> f64 {
        match self {
            PermanentSystem::ZeroTide => 1.0,
            PermanentSystem::MeanTide => 0.0,
            PermanentSystem::TideFree { factor } => factor,
        }
    }

    /// What is added to a value of this system to have it in the zero-tide system, m/s².
    pub fn to_zero_tide(self, site: &Site) -> f64 {
        (self.factor() - 1.0) * permanent(site)
    }

    /// The word for it.
    pub fn word(self) -> &'static str {
        match self {
            PermanentSystem::ZeroTide => "zero-tide",
            PermanentSystem::MeanTide => "mean-tide",
            PermanentSystem::TideFree { .. } => "tide-free",
        }
    }
}

/// Permanent attraction at a site, m/s², positive downward.
pub fn permanent(site: &Site) -> f64 {
    permanent_at(&site.geocentric())
}

/// Strength of the permanent part, V_20 (r/a)²/r, m/s².
pub(super) fn strength(site: &Geocentric) -> f64 {
    let ratio = site.radius / POTENTIAL_RADIUS;
    CONSTANT_TERM * ratio * ratio / site.radius
}

pub(super) fn permanent_at(site: &Geocentric) -> f64 {
    let (s, c) = (site.sine, site.cosine);
    -strength(site) * (site.normal_cosine * (3.0 * s * s - 1.0) + site.normal_sine * 3.0 * s * c)
}

/// A stated value of gravity brought to the zero-tide system.
pub fn zero_tide<'g>(builder: &'g Builder, g: Quantity<'g>, site: &Site, system: PermanentSystem) -> Quantity<'g> {
    match system {
        PermanentSystem::ZeroTide => g,
        other => g + exact(builder, other.to_zero_tide(site), "m/s2"),
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    /// The series in sin²φ printed with the formula, at three latitudes.
    #[test]
    fn the_series_in_latitude_agrees() {
        for degrees in [0.0_f64, 45.0, 90.0] {
            let site = Site { latitude: degrees.to_radians(), longitude: 0.0, height: 0.0 };
            let s = crate::numeric::elementary::sin(site.latitude);
            let series = -30.485 + 90.944 * s * s + 0.307 * s * s * s * s;
            assert!((permanent(&site) * 1e8 - series).abs() < 0.02, "{degrees}°");
        }
    }

    #[test]
    fn the_three_systems_meet_in_zero_tide() {
        let site = Site { latitude: 0.9, longitude: 0.0, height: 100.0 };
        let (zero, permanent) = (9.81, permanent(&site));
        for (system, stated) in [
            (PermanentSystem::ZeroTide, zero),
            (PermanentSystem::MeanTide, zero + permanent),
            (PermanentSystem::TideFree { factor: 1.16 }, zero - 0.16 * permanent),
        ] {
            let builder = Builder::default();
            let found = zero_tide(&builder, exact(&builder, stated, "m/s2"), &site, system).number();
            assert!((found - zero).abs() < 1e-14, "{}", system.word());
        }
    }
}
