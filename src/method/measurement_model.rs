//! A measurement model stated by a user.
//!
//! # Source    JCGM 100:2008, 4.1.1: Y = f(X_1, …, X_N).
//! # Formula   as written in the record
//! # Valid for what the author states.

use super::{Method, WorkedExample, exact};
use crate::graph::{Builder, MethodInfo};

/// The registry's line.
pub static METHOD: Method = Method {
    info: MethodInfo {
        name: "measurement-model",
        title: "Measurement model of the record",
        source: "JCGM 100:2008, 4.1.1",
        formula: "Y = f(X_1, …, X_N), as written in the record",
        symbols: &[("Y", "measurand", ""), ("X_i", "input quantity", "")],
        valid_for: "what the author of the record states",
    },
    examples: &[WorkedExample {
        source: "JCGM 101:2008, 9.4.3.1: comparison loss 1 − … = x_1² + x_2²",
        given: "x_1 = 0.050, x_2 = 0",
        quantity: "δY",
        printed: "0.002500",
        found: || {
            let builder = Builder::default();
            let (a, b) = (exact(&builder, 0.050, "1"), exact(&builder, 0.0, "1"));
            (a.squared() + b.squared()).number()
        },
    }],
};
