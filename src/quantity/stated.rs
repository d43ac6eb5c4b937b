//! A value as a record states it, with its uncertainty.

use super::unit::Unit;

/// Shape of a distribution between limits.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Hash)]
pub enum Shape {
    Rectangular,
    Triangular,
    /// Of a quantity that swings as a sine between its limits.
    Arcsine,
}

impl Shape {
    /// The shape with this word.
    pub fn from_word(word: &str) -> Option<Shape> {
        [Shape::Rectangular, Shape::Triangular, Shape::Arcsine].into_iter().find(|shape| shape.word() == word)
    }

    pub fn word(self) -> &'static str {
        match self {
            Shape::Rectangular => "rectangular",
            Shape::Triangular => "triangular",
            Shape::Arcsine => "arcsine",
        }
    }

    /// The standard uncertainty of a half-width a: a/√3, a/√6, a/√2 (JCGM 100:2008, 4.3.7 and 4.3.9; JCGM 101:2008,
    /// 6.4.6).
    pub fn standard_uncertainty(self, half_width: f64) -> f64 {
        let divisor: f64 = match self {
            Shape::Rectangular => 3.0,
            Shape::Triangular => 6.0,
            Shape::Arcsine => 2.0,
        };
        half_width / divisor.sqrt()
    }
}

/// An uncertainty as stated, in coherent SI units.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum StatedUncertainty {
    None,
    Standard { u: f64 },
    Expanded { expanded: f64, coverage_factor: f64 },
    HalfWidth { half_width: f64, shape: Shape },
    Limits { lower: f64, upper: f64, shape: Shape },
}

impl StatedUncertainty {
    /// The standard uncertainty; `None` where none is stated.
    pub fn standard_uncertainty(&self) -> Option<f64> {
        match *self {
            StatedUncertainty::None => None,
            StatedUncertainty::Standard { u } => Some(u),
            StatedUncertainty::Expanded { expanded, coverage_factor } => Some(expanded / coverage_factor),
            StatedUncertainty::HalfWidth { half_width, shape } => Some(shape.standard_uncertainty(half_width)),
            StatedUncertainty::Limits { lower, upper, shape } => {
                Some(shape.standard_uncertainty((upper - lower) / 2.0))
            }
        }
    }
}

/// A value in a record.
#[derive(Debug, Clone, PartialEq)]
pub struct StatedValue {
    /// As typed.
    pub text: String,
    /// In coherent SI units; nominal value and deviation are added exactly, then rounded once.
    pub value: f64,
    /// The nominal value alone, in coherent SI units, where the value was stated as nominal plus deviation.
    pub nominal: Option<f64>,
    /// The deviation alone, in coherent SI units.
    pub deviation: Option<f64>,
    /// Unit of the deviation where there is one, else of the value.
    pub unit: Unit,
    /// Unit of the nominal value.
    pub nominal_unit: Option<Unit>,
    /// In coherent SI units.
    pub uncertainty: StatedUncertainty,
    /// Infinite unless stated.
    pub degrees_of_freedom: f64,
    /// Decimals typed, counted in `unit`; negative when the last digit lies left of the units.
    pub decimals: i32,
}

impl StatedValue {
    /// The standard uncertainty in coherent SI units; `None` where none is stated.
    pub fn standard_uncertainty(&self) -> Option<f64> {
        self.uncertainty.standard_uncertainty()
    }
}
