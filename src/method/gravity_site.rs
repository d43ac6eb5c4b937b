//! A site of weighing on the reference ellipsoid, and what attraction there needs of its geometry.
//!
//! # Source    H. Moritz, Geodetic Reference System 1980, J. Geodesy 74 (2000) 128 (constants).
//! # Formula   N = a/√(1 − e² sin²φ), x = (N + h) cos φ, z = (N (1 − e²) + h) sin φ, ψ = atan(z/x), r = √(x² + z²)

use crate::diagnostic::{Code, Problem};
use crate::numeric::elementary::{atan2, cos, sin, sqrt, square};
use std::f64::consts::PI;

/// Semi-major axis a, m (GRS80).
pub const SEMI_MAJOR_AXIS: f64 = 6_378_137.0;
/// First eccentricity squared e² (GRS80).
pub const ECCENTRICITY_SQUARED: f64 = 0.006_694_380_022_90;

/// A site; longitude east and height up are positive.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Site {
    /// Geodetic latitude φ, rad.
    pub latitude: f64,
    /// Longitude λ, rad, east positive.
    pub longitude: f64,
    /// Height above the ellipsoid h, m.
    pub height: f64,
}

/// The site seen from the centre of the Earth.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Geocentric {
    /// r, m.
    pub radius: f64,
    /// sin ψ and cos ψ of the geocentric latitude ψ.
    pub sine: f64,
    pub cosine: f64,
    /// sin β and cos β of the angle β = φ − ψ between the ellipsoidal normal and the radius.
    pub normal_sine: f64,
    pub normal_cosine: f64,
}

impl Site {
    /// A site from angles in rad and height in m.
    ///
    /// # Errors
    /// `out_of_validity` where there is no such latitude, longitude or height.
    pub fn new(latitude: f64, longitude: f64, height: f64) -> Result<Self, Problem> {
        let fault = |message: String, hint: &str| Err(Problem::new(Code::OutOfValidity, message).hint(hint));
        if latitude.is_nan() || latitude.abs() > PI / 2.0 {
            let message = format!("The latitude {:.4}° is outside 90° S to 90° N.", latitude.to_degrees());
            return fault(message, "Write the geodetic latitude with its letter, such as 47.312° N.");
        }
        if longitude.is_nan() || longitude.abs() > 2.0 * PI {
            let message = format!("The longitude {:.4}° is more than a whole turn.", longitude.to_degrees());
            return fault(message, "Write the longitude with its letter, such as 8.415° E.");
        }
        if !(-430.0..=6000.0).contains(&height) {
            let message = format!("The height {height} m is outside -430 m to 6000 m, where weighing is done.");
            return fault(message, "Write the height of the site above the ellipsoid, in metres.");
        }
        Ok(Self { latitude, longitude, height })
    }

    /// The site seen from the centre of the Earth.
    pub fn geocentric(&self) -> Geocentric {
        let (sin_phi, cos_phi) = (sin(self.latitude), cos(self.latitude));
        let n = SEMI_MAJOR_AXIS / sqrt(1.0 - ECCENTRICITY_SQUARED * square(sin_phi));
        let x = (n + self.height) * cos_phi;
        let z = (n * (1.0 - ECCENTRICITY_SQUARED) + self.height) * sin_phi;
        let psi = atan2(z, x);
        let beta = self.latitude - psi;
        Geocentric {
            radius: sqrt(x * x + z * z),
            sine: sin(psi),
            cosine: cos(psi),
            normal_sine: sin(beta),
            normal_cosine: cos(beta),
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn normal_and_radius_agree_at_equator_and_pole() {
        let equator = Site { latitude: 0.0, longitude: 1.0, height: 100.0 }.geocentric();
        assert_eq!((equator.radius, equator.normal_sine), (SEMI_MAJOR_AXIS + 100.0, 0.0));
        let pole = Site { latitude: PI / 2.0, longitude: 0.0, height: 0.0 }.geocentric();
        // Polar radius of GRS80, 6 356 752.3141 m.
        assert!((pole.radius - 6_356_752.314_1).abs() < 1e-4 && pole.normal_sine.abs() < 1e-15);
    }

    #[test]
    fn impossible_sites_are_refused() {
        assert!(Site::new(PI / 2.0, 2.0 * PI, 6000.0).is_ok());
        for (latitude, longitude, height) in
            [(1.6, 0.0, 0.0), (f64::NAN, 0.0, 0.0), (0.0, 6.3, 0.0), (0.0, 0.0, 6001.0), (0.0, 0.0, f64::NAN)]
        {
            let problem = Site::new(latitude, longitude, height).expect_err("refused");
            assert_eq!(problem.code, Code::OutOfValidity);
        }
    }
}
