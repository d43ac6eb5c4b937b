//! Kinds of quantity: what may be added to what.

use super::dimension::Dimension;

/// A kind of quantity. Two kinds of one dimension still do not mix: mass and conventional mass, a temperature and a
/// difference of temperatures.
#[derive(Copy, Clone, PartialEq, Eq, Hash, Debug, PartialOrd, Ord)]
pub enum Kind {
    Mass,
    ConventionalMass,
    MassDifference,
    ConventionalMassDifference,
    Temperature,
    TemperatureDifference,
    Pressure,
    PressureDifference,
    RelativeHumidity,
    RelativeHumidityDifference,
    DewPoint,
    AmountFraction,
    Density,
    Volume,
    Length,
    /// A height above a stated level.
    Height,
    CubicExpansion,
    /// A point in time, counted from a stated zero.
    Time,
    Duration,
    Angle,
    /// Anything else: its unit alone says what it is, and in a sum it takes the other's kind.
    Plain,
}

use Kind::*;

impl Kind {
    /// Every kind.
    pub const ALL: &'static [Kind] = &[
        Mass,
        ConventionalMass,
        MassDifference,
        ConventionalMassDifference,
        Temperature,
        TemperatureDifference,
        Pressure,
        PressureDifference,
        RelativeHumidity,
        RelativeHumidityDifference,
        DewPoint,
        AmountFraction,
        Density,
        Volume,
        Length,
        Height,
        CubicExpansion,
        Time,
        Duration,
        Angle,
        Plain,
    ];

    /// The dimension every value of this kind has; `None` for a plain quantity.
    pub fn dimension(self) -> Option<Dimension> {
        Some(match self {
            Mass | ConventionalMass | MassDifference | ConventionalMassDifference => Dimension::MASS,
            Temperature | TemperatureDifference | DewPoint => Dimension::TEMPERATURE,
            Pressure | PressureDifference => Dimension::PRESSURE,
            RelativeHumidity | RelativeHumidityDifference | AmountFraction | Angle => Dimension::ONE,
            Density => Dimension::DENSITY,
            Volume => Dimension::VOLUME,
            Length | Height => Dimension::LENGTH,
            CubicExpansion => Dimension::EXPANSION,
            Time | Duration => Dimension::TIME,
            Plain => return None,
        })
    }

    /// The trade word.
    pub fn word(self) -> &'static str {
        match self {
            Mass => "mass",
            ConventionalMass => "conventional mass",
            MassDifference => "mass difference",
            ConventionalMassDifference => "conventional mass difference",
            Temperature => "temperature",
            TemperatureDifference => "temperature difference",
            Pressure => "pressure",
            PressureDifference => "pressure difference",
            RelativeHumidity => "relative humidity",
            RelativeHumidityDifference => "relative humidity difference",
            DewPoint => "dew-point temperature",
            AmountFraction => "amount fraction",
            Density => "density",
            Volume => "volume",
            Length => "length",
            Height => "height",
            CubicExpansion => "cubic expansion coefficient",
            Time => "time",
            Duration => "duration",
            Angle => "angle",
            Plain => "quantity",
        }
    }

    /// The word with its article.
    pub fn phrase(self) -> String {
        let article = if self.word().starts_with(['a', 'e', 'i', 'o']) { "an" } else { "a" };
        format!("{article} {}", self.word())
    }

    /// The unit a value of this kind is usually written in.
    pub fn default_unit(self) -> &'static str {
        match self {
            Mass | ConventionalMass => "kg",
            MassDifference | ConventionalMassDifference => "mg",
            Temperature | DewPoint => "°C",
            TemperatureDifference => "K",
            Pressure | PressureDifference => "hPa",
            RelativeHumidity | RelativeHumidityDifference => "%",
            AmountFraction => "µmol/mol",
            Density => "kg/m3",
            Volume => "cm3",
            Length | Height => "mm",
            CubicExpansion => "/K",
            Time | Duration => "s",
            Angle => "rad",
            Plain => "1",
        }
    }

    /// Whether a number without a unit can be of this kind.
    pub fn allows_bare_number(self) -> bool {
        self == Plain
    }

    /// Whether the values count from the zero of a scale, so that °C is allowed.
    pub fn is_scale_temperature(self) -> bool {
        matches!(self, Temperature | DewPoint | Plain)
    }

    /// The kind of a difference of two values of this kind; also the kind of its uncertainty.
    pub fn of_difference(self) -> Kind {
        match self {
            Mass => MassDifference,
            ConventionalMass => ConventionalMassDifference,
            Temperature | DewPoint => TemperatureDifference,
            Pressure => PressureDifference,
            RelativeHumidity => RelativeHumidityDifference,
            Height => Length,
            Time => Duration,
            other => other,
        }
    }

    /// The kind of `a + b`; `None` when the two cannot be added.
    pub fn sum(a: Kind, b: Kind) -> Option<Kind> {
        match (a, b) {
            (Plain, other) | (other, Plain) => Some(other),
            (Temperature | DewPoint | RelativeHumidity | Time, _) if a == b => None,
            _ if a == b => Some(a),
            _ if a.takes(b) => Some(a),
            _ if b.takes(a) => Some(b),
            _ => None,
        }
    }

    /// The kind of `a - b`; `None` when the two cannot be subtracted.
    pub fn difference(a: Kind, b: Kind) -> Option<Kind> {
        match (a, b) {
            (Plain, other) | (other, Plain) => Some(other),
            (Temperature, DewPoint) | (DewPoint, Temperature) => Some(TemperatureDifference),
            _ if a == b => Some(a.of_difference()),
            _ if a.takes(b) => Some(a),
            _ => None,
        }
    }

    /// Whether `difference` is what may be added to a value of this kind.
    fn takes(self, difference: Kind) -> bool {
        self.of_difference() == difference && self != difference
    }
}

impl std::fmt::Display for Kind {
    fn fmt(&self, out: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        out.write_str(self.word())
    }
}

#[cfg(test)]
mod tests {
    use super::super::Unit;
    use super::*;

    #[test]
    fn sums_and_differences() {
        assert_eq!(Kind::difference(Mass, Mass), Some(MassDifference));
        assert_eq!(Kind::sum(Mass, MassDifference), Some(Mass));
        assert_eq!(Kind::sum(MassDifference, Mass), Some(Mass));
        assert_eq!(Kind::difference(Mass, MassDifference), Some(Mass));
        assert_eq!(Kind::sum(Mass, Mass), Some(Mass));
        assert_eq!(Kind::sum(Mass, ConventionalMass), None);
        assert_eq!(Kind::difference(ConventionalMass, MassDifference), None);
        assert_eq!(Kind::difference(Temperature, Temperature), Some(TemperatureDifference));
        assert_eq!(Kind::sum(Temperature, Temperature), None);
        assert_eq!(Kind::sum(Temperature, TemperatureDifference), Some(Temperature));
        assert_eq!(Kind::difference(TemperatureDifference, Temperature), None);
        assert_eq!(Kind::sum(TemperatureDifference, TemperatureDifference), Some(TemperatureDifference));
        assert_eq!(Kind::difference(Pressure, Pressure), Some(PressureDifference));
        assert_eq!(Kind::sum(Pressure, PressureDifference), Some(Pressure));
        assert_eq!(Kind::difference(Temperature, DewPoint), Some(TemperatureDifference));
        assert_eq!(Kind::difference(Height, Height), Some(Length));
        assert_eq!(Kind::difference(Time, Time), Some(Duration));
        assert_eq!(Kind::sum(Time, Time), None);
        assert_eq!(Kind::sum(Plain, Density), Some(Density));
        assert_eq!(Kind::difference(Volume, Density), None);
    }

    #[test]
    fn every_rule_keeps_the_dimension_and_sums_commute() {
        for &a in Kind::ALL {
            assert_eq!(
                Unit::parse(a.default_unit()).ok().map(|unit| unit.dimension()),
                a.dimension().or(Some(Dimension::ONE))
            );
            for &b in Kind::ALL {
                assert_eq!(Kind::sum(a, b), Kind::sum(b, a));
                for result in [Kind::sum(a, b), Kind::difference(a, b)].into_iter().flatten() {
                    assert!(a == Plain || a.dimension() == result.dimension());
                    assert!(b == Plain || b.dimension() == result.dimension());
                }
            }
        }
    }
}
