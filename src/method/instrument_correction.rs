//! Correction of an instrument's indications by its calibration.
//!
//! # Source    JCGM 200:2012, 2.53 (correction), common practice for the linear interpolation of a table.
//! # Formula   x = x_ind + c + δ_drift;   table: c(x_ind) = c_0 + (c_1 − c_0)(x_ind − x_0)/(x_1 − x_0)
//!     x_ind    indication
//!     c        correction of the certificate, added to the indication; one quantity shared by all indications
//!     δ_drift  change since the calibration, estimate zero
//! # Valid between the first and the last point of the table; outside: a complaint.

use super::{Method, WorkedExample, exact};
use crate::diagnostic::{Code, Problem};
use crate::graph::{Builder, MethodInfo, Quantity, Value};
use crate::numeric::interpolate::bracket;
use crate::quantity::Kind;

/// The registry's line.
pub static METHOD: Method = Method {
    info: MethodInfo {
        name: "instrument-correction",
        title: "Correction of an instrument's indications",
        source: "JCGM 200:2012, 2.53; linear interpolation by common practice",
        formula: "x = x_ind + c + δ_drift",
        symbols: &[
            ("x", "corrected value", ""),
            ("x_ind", "indication", ""),
            ("c", "correction of the certificate", ""),
            ("δ_drift", "change since the calibration", ""),
        ],
        valid_for: "the calibrated range",
    },
    examples: &[WorkedExample {
        source: "linear interpolation, by hand",
        given: "corrections 0.10 hPa at 900 hPa and 0.20 hPa at 1000 hPa; indication 925 hPa",
        quantity: "c/hPa",
        printed: "0.1250",
        found: || {
            let builder = Builder::default();
            let corrections = [exact(&builder, 10.0, "Pa"), exact(&builder, 20.0, "Pa")];
            let reading = exact(&builder, 92_500.0, "Pa");
            interpolated(&builder, reading, &[90_000.0, 100_000.0], &corrections)
                .map_or(f64::NAN, |c| c.row(0).number() / 100.0)
        },
    }],
};

/// The correction at each indication, from a table with abscissae `points` (coherent SI, rising).
///
/// # Errors
/// `out_of_range` when an indication lies outside the table.
pub fn interpolated<'g>(
    builder: &'g Builder,
    indications: Quantity<'g>,
    points: &[f64],
    corrections: &[Quantity<'g>],
) -> Result<Quantity<'g>, Problem> {
    let rows = indications.rows();
    let brackets =
        rows.iter().map(|x| bracket(points, *x).ok_or(*x)).collect::<Result<Vec<_>, f64>>().map_err(|x| {
            let message = format!(
                "The indication {x} lies outside the calibrated points {} to {} (coherent SI units).",
                points.first().copied().unwrap_or(f64::NAN),
                points.last().copied().unwrap_or(f64::NAN)
            );
            Problem::new(Code::OutOfRange, message)
        })?;
    let Some(stack) = Quantity::stack(corrections) else {
        return Err(Problem::new(Code::CertificateMissing, "The table of corrections is empty."));
    };
    let dimension = indications.dimension();
    let column = |pick: fn(usize) -> usize| -> Vec<Vec<(u32, f64)>> {
        brackets.iter().map(|(index, _, _)| vec![(pick(*index) as u32, 1.0)]).collect()
    };
    let at = |pick: fn(usize) -> usize| -> Quantity<'g> {
        let abscissae: Vec<f64> =
            brackets.iter().map(|(index, _, _)| points[pick(*index).min(points.len() - 1)]).collect();
        builder.exact(Value::column(abscissae), dimension, Kind::Plain)
    };
    let plain = stack.as_kind(Kind::Plain);
    let last = corrections.len() - 1;
    let (lower, upper) = (plain.mix(column(|index| index)), plain.mix(clamp(column(|index| index + 1), last)));
    let (from, to) = (at(|index| index), at(|index| index + 1));
    let span: Vec<f64> =
        to.rows().iter().zip(from.rows()).map(|(to, from)| if *to > from { to - from } else { 1.0 }).collect();
    let span = builder.exact(Value::column(span), dimension, Kind::Plain);
    Ok(lower + (upper - lower) * ((indications.as_kind(Kind::Plain) - from) / span))
}

fn clamp(rows: Vec<Vec<(u32, f64)>>, last: usize) -> Vec<Vec<(u32, f64)>> {
    rows.into_iter()
        .map(|row| row.into_iter().map(|(index, weight)| (index.min(last as u32), weight)).collect())
        .collect()
}
