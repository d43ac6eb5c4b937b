//! Gravimetric factors of an elastic Earth with a fluid core: what the tide of a rigid Earth is multiplied by.
//!
//! # Source    V. Dehant, Phys. Earth Planet. Inter. 49 (1987) 97 (model of Wahr, Dehant and Zschau; numbers as tidal
//!             prediction commonly uses them).
//! # Formula   S = sin²ψ;  δ_20 = 1.1576 + [−0.0016·0.335410 (35S² − 30S + 3) + 0.0054·0.894427]/(3S − 1)
//!             δ_21 = 1.1542 − 0.0018·0.612372 (7S − 3) + resonance,  δ_22 = 1.1600 − 0.0010·0.866025 (7S − 1)
//!             δ_3 = 1.0728,  δ_4 = 1.0363
//!             resonance: δ(f) − δ(O1) = −0.000625 (f − 13.943036)/(15.073729 − f),  f in °/h

use super::gravity_site::Geocentric;
use super::tidal_waves::Wave;
use crate::numeric::astronomy::tidal_argument::speed;

/// δ_20 without its latitude term.
pub const ZONAL: f64 = 1.1576;
/// δ_3.
pub const THIRD: f64 = 1.0728;
/// δ_4.
pub const FOURTH: f64 = 1.0363;

/// The factors of degree 2 at one latitude, as far as no wave is concerned.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Factors {
    /// The latitude term of δ_20 times 3S − 1, which is regular where 3S = 1.
    pub zonal_product: f64,
    /// δ_21 of the wave O1.
    pub diurnal: f64,
    /// δ_22.
    pub semidiurnal: f64,
}

impl Factors {
    /// The factors at a site.
    pub fn at(site: &Geocentric) -> Self {
        let s = site.sine * site.sine;
        Self {
            zonal_product: -0.0016 * 0.335_410 * (35.0 * s * s - 30.0 * s + 3.0) + 0.0054 * 0.894_427,
            diurnal: 1.1542 - 0.0018 * 0.612_372 * (7.0 * s - 3.0),
            semidiurnal: 1.1600 - 0.0010 * 0.866_025 * (7.0 * s - 1.0),
        }
    }

    /// The factor of one wave; that of the long-period ones without the latitude term.
    pub fn of(&self, wave: &Wave) -> f64 {
        match (wave.degree, wave.multipliers[0]) {
            (2, 0) => ZONAL,
            (2, 1) => self.diurnal + resonance(speed(&wave.multipliers)),
            (2, _) => self.semidiurnal,
            (3, _) => THIRD,
            _ => FOURTH,
        }
    }
}

/// δ(f) − δ(O1) of a diurnal wave of degree 2 with speed `f` in degrees per hour.
pub fn resonance(f: f64) -> f64 {
    -0.000_625 * (f - 13.943_036) / (15.073_729 - f)
}

#[cfg(test)]
mod tests {
    use super::*;

    /// O1 is the reference; K1 loses two hundredths by the resonance of the core.
    #[test]
    fn k1_is_lowered_by_the_core() {
        assert_eq!(resonance(13.943_036), 0.0);
        assert!((resonance(15.041_068_64) + 0.021_01).abs() < 1e-4, "{}", resonance(15.041_068_64));
        assert!(resonance(15.082_135) > 0.08, "beyond the resonance the factor rises");
    }
}
