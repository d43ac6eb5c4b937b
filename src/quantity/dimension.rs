//! Dimensions: the exponents of the base quantities of the SI that records use.

use std::fmt;

/// Exponents of length, mass, time, electric current, thermodynamic temperature and amount of substance.
#[derive(Copy, Clone, PartialEq, Eq, Hash, Debug, PartialOrd, Ord)]
pub struct Dimension {
    pub length: i8,
    pub mass: i8,
    pub time: i8,
    pub current: i8,
    pub temperature: i8,
    pub amount: i8,
}

const fn of(length: i8, mass: i8, time: i8, current: i8, temperature: i8, amount: i8) -> Dimension {
    Dimension { length, mass, time, current, temperature, amount }
}

impl Dimension {
    /// Of a number: also of angles, which count in radians.
    pub const ONE: Dimension = of(0, 0, 0, 0, 0, 0);
    pub const LENGTH: Dimension = of(1, 0, 0, 0, 0, 0);
    pub const MASS: Dimension = of(0, 1, 0, 0, 0, 0);
    pub const TIME: Dimension = of(0, 0, 1, 0, 0, 0);
    pub const CURRENT: Dimension = of(0, 0, 0, 1, 0, 0);
    pub const TEMPERATURE: Dimension = of(0, 0, 0, 0, 1, 0);
    pub const AMOUNT: Dimension = of(0, 0, 0, 0, 0, 1);
    pub const AREA: Dimension = of(2, 0, 0, 0, 0, 0);
    pub const VOLUME: Dimension = of(3, 0, 0, 0, 0, 0);
    pub const DENSITY: Dimension = of(-3, 1, 0, 0, 0, 0);
    pub const SPECIFIC_VOLUME: Dimension = of(3, -1, 0, 0, 0, 0);
    pub const VELOCITY: Dimension = of(1, 0, -1, 0, 0, 0);
    pub const ACCELERATION: Dimension = of(1, 0, -2, 0, 0, 0);
    /// Of a gradient of acceleration along a length.
    pub const ACCELERATION_GRADIENT: Dimension = of(0, 0, -2, 0, 0, 0);
    pub const FREQUENCY: Dimension = of(0, 0, -1, 0, 0, 0);
    pub const FORCE: Dimension = of(1, 1, -2, 0, 0, 0);
    pub const PRESSURE: Dimension = of(-1, 1, -2, 0, 0, 0);
    pub const ENERGY: Dimension = of(2, 1, -2, 0, 0, 0);
    pub const ACTION: Dimension = of(2, 1, -1, 0, 0, 0);
    pub const POWER: Dimension = of(2, 1, -3, 0, 0, 0);
    pub const CHARGE: Dimension = of(0, 0, 1, 1, 0, 0);
    pub const VOLTAGE: Dimension = of(2, 1, -3, -1, 0, 0);
    pub const RESISTANCE: Dimension = of(2, 1, -3, -2, 0, 0);
    pub const CONDUCTANCE: Dimension = of(-2, -1, 3, 2, 0, 0);
    pub const CAPACITANCE: Dimension = of(-2, -1, 4, 2, 0, 0);
    pub const INDUCTANCE: Dimension = of(2, 1, -2, -2, 0, 0);
    pub const MAGNETIC_FLUX: Dimension = of(2, 1, -2, -1, 0, 0);
    pub const MAGNETIC_FLUX_DENSITY: Dimension = of(0, 1, -2, -1, 0, 0);
    pub const EXPANSION: Dimension = of(0, 0, 0, 0, -1, 0);
    pub const MOLAR_MASS: Dimension = of(0, 1, 0, 0, 0, -1);

    /// Of a product.
    pub fn times(self, other: Dimension) -> Dimension {
        self.combine(other, i8::saturating_add)
    }

    /// Of a quotient.
    pub fn over(self, other: Dimension) -> Dimension {
        self.combine(other, i8::saturating_sub)
    }

    /// Of a whole power; `None` when an exponent leaves the range of this type.
    pub fn power(self, exponent: i32) -> Option<Dimension> {
        self.map(|own| i8::try_from(i32::from(own).checked_mul(exponent)?).ok())
    }

    /// Of a square root; `None` when an exponent is odd.
    pub fn square_root(self) -> Option<Dimension> {
        self.map(|own| (own % 2 == 0).then_some(own / 2))
    }

    /// Of a product, or `None` when an exponent leaves the range of this type.
    pub fn checked_times(self, other: Dimension) -> Option<Dimension> {
        let exponents = self.exponents().into_iter().zip(other.exponents()).map(|(own, its)| own.checked_add(its));
        Self::collect(exponents)
    }

    /// The trade word for this dimension with its article, where there is one.
    pub fn word(self) -> Option<&'static str> {
        WORDS.iter().find(|(dimension, _)| *dimension == self).map(|(_, word)| *word)
    }

    fn exponents(self) -> [i8; 6] {
        [self.length, self.mass, self.time, self.current, self.temperature, self.amount]
    }

    fn combine(self, other: Dimension, join: fn(i8, i8) -> i8) -> Dimension {
        of(
            join(self.length, other.length),
            join(self.mass, other.mass),
            join(self.time, other.time),
            join(self.current, other.current),
            join(self.temperature, other.temperature),
            join(self.amount, other.amount),
        )
    }

    fn map(self, change: impl Fn(i8) -> Option<i8>) -> Option<Dimension> {
        Self::collect(self.exponents().into_iter().map(change))
    }

    fn collect(exponents: impl Iterator<Item = Option<i8>>) -> Option<Dimension> {
        let exponents: Vec<i8> = exponents.collect::<Option<_>>()?;
        let [length, mass, time, current, temperature, amount] = <[i8; 6]>::try_from(exponents).ok()?;
        Some(of(length, mass, time, current, temperature, amount))
    }
}

const WORDS: &[(Dimension, &str)] = &[
    (Dimension::ONE, "a number"),
    (Dimension::LENGTH, "a length"),
    (Dimension::MASS, "a mass"),
    (Dimension::TIME, "a time"),
    (Dimension::CURRENT, "an electric current"),
    (Dimension::TEMPERATURE, "a temperature"),
    (Dimension::AMOUNT, "an amount of substance"),
    (Dimension::AREA, "an area"),
    (Dimension::VOLUME, "a volume"),
    (Dimension::DENSITY, "a density"),
    (Dimension::SPECIFIC_VOLUME, "a specific volume"),
    (Dimension::VELOCITY, "a velocity"),
    (Dimension::ACCELERATION, "an acceleration"),
    (Dimension::ACCELERATION_GRADIENT, "a gradient of acceleration"),
    (Dimension::FREQUENCY, "a frequency"),
    (Dimension::FORCE, "a force"),
    (Dimension::PRESSURE, "a pressure"),
    (Dimension::ENERGY, "an energy"),
    (Dimension::ACTION, "an action"),
    (Dimension::POWER, "a power"),
    (Dimension::CHARGE, "an electric charge"),
    (Dimension::VOLTAGE, "a voltage"),
    (Dimension::RESISTANCE, "a resistance"),
    (Dimension::CONDUCTANCE, "a conductance"),
    (Dimension::CAPACITANCE, "a capacitance"),
    (Dimension::INDUCTANCE, "an inductance"),
    (Dimension::MAGNETIC_FLUX, "a magnetic flux"),
    (Dimension::MAGNETIC_FLUX_DENSITY, "a magnetic flux density"),
    (Dimension::EXPANSION, "an expansion per kelvin"),
    (Dimension::MOLAR_MASS, "a molar mass"),
];

impl fmt::Display for Dimension {
    /// The coherent SI unit, as in `kg m⁻³`; `1` for a number.
    fn fmt(&self, out: &mut fmt::Formatter<'_>) -> fmt::Result {
        let symbols = [
            ("kg", self.mass),
            ("m", self.length),
            ("s", self.time),
            ("A", self.current),
            ("K", self.temperature),
            ("mol", self.amount),
        ];
        let present = symbols.iter().filter(|(_, exponent)| *exponent != 0);
        let words: Vec<String> =
            present.map(|(symbol, exponent)| format!("{symbol}{}", superscript(i32::from(*exponent)))).collect();
        out.write_str(if words.is_empty() { "1".into() } else { words.join(" ") }.as_str())
    }
}

/// An exponent in raised digits; nothing for 1.
pub(super) fn superscript(exponent: i32) -> String {
    if exponent == 1 {
        return String::new();
    }
    raised(exponent)
}

/// A whole number in raised digits.
pub fn raised(number: i32) -> String {
    number.to_string().chars().map(raise).collect()
}

fn raise(digit: char) -> char {
    match digit {
        '-' => '⁻',
        '1' => '¹',
        '2' => '²',
        '3' => '³',
        _ => digit.to_digit(10).and_then(|value| char::from_u32(0x2070 + value)).unwrap_or(digit),
    }
}

/// The ordinary character for a raised digit or sign.
pub(super) fn lower(raised: char) -> Option<char> {
    match raised {
        '⁻' => Some('-'),
        '⁺' => Some('+'),
        '¹' => Some('1'),
        '²' => Some('2'),
        '³' => Some('3'),
        '⁰' | '⁴'..='⁹' => char::from_digit(raised as u32 - 0x2070, 10),
        _ => None,
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn products_quotients_and_powers() {
        assert_eq!(Dimension::MASS.over(Dimension::VOLUME), Dimension::DENSITY);
        assert_eq!(Dimension::PRESSURE.times(Dimension::AREA), Dimension::FORCE);
        assert_eq!(Dimension::LENGTH.power(3), Some(Dimension::VOLUME));
        assert_eq!(Dimension::LENGTH.power(200), None);
        assert_eq!(Dimension::AREA.square_root(), Some(Dimension::LENGTH));
        assert_eq!(Dimension::VOLUME.square_root(), None);
        assert_eq!(Dimension::VOLTAGE.over(Dimension::CURRENT), Dimension::RESISTANCE);
    }

    #[test]
    fn printing_as_units() {
        assert_eq!(Dimension::DENSITY.to_string(), "kg m⁻³");
        assert_eq!(Dimension::ONE.to_string(), "1");
        assert_eq!(Dimension::RESISTANCE.to_string(), "kg m² s⁻³ A⁻²");
        assert_eq!(raised(-10), "⁻¹⁰");
        assert_eq!(raised(40).chars().map(|c| lower(c).unwrap_or('?')).collect::<String>(), "40");
    }
}
