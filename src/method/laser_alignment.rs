//! Alignment of a velocity measured along a laser beam.
//!
//! # Source    projection of the vertical on the beam, derived here; magnitude as in Metrologia 2025,
//!             doi 10.1088/1681-7575/ae1dfc (100 µrad give 0.5e-8).
//! # Formula   v_z = v / cos θ  ≈  v [1 + (θ_x² + θ_y²)/2]
//!     v    velocity along the beam                             m/s
//!     θ_x  tilt of the beam from the vertical along x          rad
//!     θ_y  tilt of the beam from the vertical along y          rad
//! The expectation of θ² is θ_0² + u²(θ). First-order propagation keeps θ_0² alone and gives u = θ_0 u(θ), which is zero
//! for a beam found vertical; a propagation of distributions has both. Where θ_0 is below u(θ), judge by that.
//! # Valid for |θ| ≤ 3 mrad, where θ⁴/24 stays below 4e-12.

use super::{Method, WorkedExample};
use crate::diagnostic::{Code, Problem};
use crate::graph::{Builder, MethodInfo, Quantity};

/// The largest tilt, in rad.
pub const LARGEST_TILT: f64 = 3e-3;

/// The registry's line.
pub static METHOD: Method = Method {
    info: MethodInfo {
        name: "laser-alignment",
        title: "Alignment of a velocity measured along a laser beam",
        source: "projection on the beam; magnitude as in Metrologia 2025, doi 10.1088/1681-7575/ae1dfc",
        formula: "v_z = v [1 + (θ_x² + θ_y²)/2]",
        symbols: &[
            ("v", "velocity along the beam", "m/s"),
            ("θ_x", "tilt of the beam from the vertical along x", "rad"),
            ("θ_y", "tilt of the beam from the vertical along y", "rad"),
        ],
        valid_for: "tilts up to 3 mrad; by propagation of distributions where a tilt is below its uncertainty",
    },
    examples: &[WorkedExample {
        source: "Metrologia 2025, doi 10.1088/1681-7575/ae1dfc, as quoted: 100 µrad from the vertical",
        given: "θ_x = 100 µrad, θ_y = 0",
        quantity: "v_z/v − 1",
        printed: "0.5e-8",
        found: || {
            let b = Builder::default();
            (lengthening(b.number(1e-4), b.number(0.0)) - 1.0).number()
        },
    }],
};

/// v_z/v. A tilt beyond the validity leaves a problem.
pub fn lengthening<'g>(theta_x: Quantity<'g>, theta_y: Quantity<'g>) -> Quantity<'g> {
    for theta in [theta_x, theta_y] {
        if theta.number().abs() > LARGEST_TILT {
            let message = format!(
                "The beam is tilted by {:.3e} rad, more than the 3 mrad that the formula allows.",
                theta.number()
            );
            theta
                .builder()
                .problem(Problem::new(Code::OutOfValidity, message).hint("Align the beam, or check the unit."));
        }
    }
    1.0 + (theta_x.squared() + theta_y.squared()) * 0.5
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn validity_ends_at_three_milliradians() {
        let b = Builder::default();
        lengthening(b.number(LARGEST_TILT), b.number(-LARGEST_TILT));
        assert!(b.take_problems().is_empty());
        lengthening(b.number(0.0), b.number(-1.001 * LARGEST_TILT));
        assert_eq!(b.take_problems()[0].code, Code::OutOfValidity);
    }

    #[test]
    fn agrees_with_the_cosine() {
        let b = Builder::default();
        let found = lengthening(b.number(2e-3), b.number(0.0)).number();
        assert!((found - 1.0 / libm::cos(2e-3)).abs() < 4e-12, "{found}");
    }
}
