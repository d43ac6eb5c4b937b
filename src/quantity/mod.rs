//! Quantities as people write them: dimensions, units, the number notation in and out, rounding.
//!
//! In: a text such as `1 kg + 0.123(12) mg` becomes a [`StatedValue`] in coherent SI units, exact up to one rounding.
//! Out: a value with its uncertainty becomes a printed text, rounded once on its 15-digit decimal.
//! Nothing here knows places in files; what is wrong is a [`Problem`](crate::diagnostic::Problem) with a byte range.

mod coordinate;
mod cursor;
mod decimal;
mod dimension;
mod exact;
mod factor;
mod kind;
mod natural;
mod notation;
#[cfg(test)]
mod notation_tests;
mod number;
mod pieces;
mod print;
#[cfg(test)]
mod print_tests;
mod rounding;
mod stated;
mod symbol;
mod unit;
mod unit_text;

pub use coordinate::{Axis, Coordinate, parse_coordinate};
pub use decimal::Decimal;
pub use dimension::{Dimension, raised};
pub use factor::Factor;
pub use kind::Kind;
pub use notation::{parse_plain_value, parse_value};
pub use number::parse_number;
pub use print::{Marker, Style, choose_unit, print_deviation, print_expanded, print_standard, print_value};
pub use rounding::{RoundedPair, round_pair, round_to_decimals};
pub use stated::{Shape, StatedUncertainty, StatedValue};
pub use unit::Unit;
