//! Mass of a standard on the day of use.
//!
//! # Source    JCGM 100:2008, 4.3.1 (values from a certificate) and F.2.4.5 (change since the calibration); common practice.
//! # Formula   m = m_cert + δ_drift
//!     m_cert   mass on the certificate valid on the day      kg
//!     δ_drift  change since the calibration, estimate zero   kg
//! # Valid for a certificate in its calibration period.

use super::{Method, WorkedExample, exact};
use crate::graph::{Builder, MethodInfo, Quantity};

/// The registry's line.
pub static METHOD: Method = Method {
    info: MethodInfo {
        name: "mass-on-day",
        title: "Mass of a standard on the day of use",
        source: "JCGM 100:2008, 4.3.1; common practice for the change since the calibration",
        formula: "m = m_cert + δ_drift",
        symbols: &[
            ("m", "mass on the day of use", "kg"),
            ("m_cert", "mass on the certificate valid on that day", "kg"),
            ("δ_drift", "change since the calibration", "kg"),
        ],
        valid_for: "certificates in their calibration period",
    },
    examples: &[WorkedExample {
        source: "arithmetic of the definition, by hand",
        given: "m_cert = 1 kg + 0.123 mg, δ_drift = 0.004 mg",
        quantity: "m/kg",
        printed: "1.000000127",
        found: || {
            let builder = Builder::default();
            on_day(exact(&builder, 1.000_000_123, "kg"), Some(exact(&builder, 0.004, "mg"))).number()
        },
    }],
};

/// The certified mass with the change since.
pub fn on_day<'g>(certified: Quantity<'g>, drift: Option<Quantity<'g>>) -> Quantity<'g> {
    match drift {
        Some(drift) => certified + drift,
        None => certified.alias(),
    }
}
