//! The table of unit symbols and SI prefixes, with exact factors.

use super::dimension::Dimension;
use super::factor::Factor;

/// A unit symbol: its spellings (the first is printed), dimension, exact factor to coherent SI units.
#[derive(Debug, PartialEq)]
pub(super) struct Symbol {
    pub spellings: &'static [&'static str],
    pub dimension: Dimension,
    pub factor: Factor,
    /// Whether SI prefixes may stand before it.
    pub prefixable: bool,
}

const fn with_prefixes(spellings: &'static [&'static str], dimension: Dimension, factor: Factor) -> Symbol {
    Symbol { spellings, dimension, factor, prefixable: true }
}

const fn alone(spellings: &'static [&'static str], dimension: Dimension, factor: Factor) -> Symbol {
    Symbol { spellings, dimension, factor, prefixable: false }
}

/// The radian measure of one part in `parts` of a straight angle.
const fn angle(parts: u64, ten: i32) -> Factor {
    Factor { numerator: 1, denominator: parts, ten, pi: 1 }
}

use Dimension as D;

/// Every symbol.
pub(super) static SYMBOLS: &[Symbol] = &[
    alone(&["1"], D::ONE, Factor::ONE),
    with_prefixes(&["m"], D::LENGTH, Factor::ONE),
    // The kilogram is read as prefix and gram.
    with_prefixes(&["g"], D::MASS, Factor::ten(-3)),
    with_prefixes(&["s"], D::TIME, Factor::ONE),
    with_prefixes(&["A"], D::CURRENT, Factor::ONE),
    with_prefixes(&["K"], D::TEMPERATURE, Factor::ONE),
    with_prefixes(&["mol"], D::AMOUNT, Factor::ONE),
    // Its zero is at 273.15 K exactly (SI Brochure, 9th edition, 2.3.1); see Unit.
    alone(&["°C", "℃"], D::TEMPERATURE, Factor::ONE),
    with_prefixes(&["t"], D::MASS, Factor::ten(3)),
    // CODATA 2022: 1.660 539 068 92(52) × 10⁻²⁷ kg.
    with_prefixes(&["Da"], D::MASS, Factor::whole(166_053_906_892, -38)),
    with_prefixes(&["L", "l"], D::VOLUME, Factor::ten(-3)),
    alone(&["min"], D::TIME, Factor::whole(6, 1)),
    alone(&["h"], D::TIME, Factor::whole(36, 2)),
    alone(&["d"], D::TIME, Factor::whole(864, 2)),
    // The Julian year of 365.25 d.
    alone(&["a"], D::TIME, Factor::whole(315_576, 2)),
    with_prefixes(&["Hz"], D::FREQUENCY, Factor::ONE),
    with_prefixes(&["N"], D::FORCE, Factor::ONE),
    with_prefixes(&["Pa"], D::PRESSURE, Factor::ONE),
    with_prefixes(&["bar"], D::PRESSURE, Factor::ten(5)),
    with_prefixes(&["J"], D::ENERGY, Factor::ONE),
    // Exact since 2019 (SI Brochure, 9th edition, table 8).
    with_prefixes(&["eV"], D::ENERGY, Factor::whole(1_602_176_634, -28)),
    with_prefixes(&["W"], D::POWER, Factor::ONE),
    with_prefixes(&["C"], D::CHARGE, Factor::ONE),
    with_prefixes(&["V"], D::VOLTAGE, Factor::ONE),
    with_prefixes(&["Ω", "\u{2126}", "ohm"], D::RESISTANCE, Factor::ONE),
    with_prefixes(&["S"], D::CONDUCTANCE, Factor::ONE),
    with_prefixes(&["F"], D::CAPACITANCE, Factor::ONE),
    with_prefixes(&["H"], D::INDUCTANCE, Factor::ONE),
    with_prefixes(&["Wb"], D::MAGNETIC_FLUX, Factor::ONE),
    with_prefixes(&["T"], D::MAGNETIC_FLUX_DENSITY, Factor::ONE),
    // 1 Gal = 1 cm/s².
    with_prefixes(&["Gal"], D::ACCELERATION, Factor::ten(-2)),
    with_prefixes(&["rad"], D::ONE, Factor::ONE),
    alone(&["°"], D::ONE, angle(18, -1)),
    alone(&["′"], D::ONE, angle(108, -2)),
    alone(&["″"], D::ONE, angle(648, -3)),
    alone(&["%"], D::ONE, Factor::ten(-2)),
    alone(&["‰"], D::ONE, Factor::ten(-3)),
    alone(&["ppm"], D::ONE, Factor::ten(-6)),
];

/// The number one as a unit.
pub(super) fn is_one(symbol: &Symbol) -> bool {
    symbol.spellings.contains(&"1")
}

/// The degree Celsius.
pub(super) fn is_celsius(symbol: &Symbol) -> bool {
    symbol.spellings.contains(&"°C")
}

/// Units of plane angle.
pub(super) fn is_angle(symbol: &Symbol) -> bool {
    symbol.spellings.contains(&"rad") || is_angle_sign(symbol)
}

/// The signs of plane angle, which stand close to their number.
pub(super) fn is_angle_sign(symbol: &Symbol) -> bool {
    symbol.spellings.iter().any(|spelling| ["°", "′", "″"].contains(spelling))
}

/// SI prefixes with their powers of ten; where two spellings share a power the first is printed.
pub(super) static PREFIXES: &[(&str, i32)] = &[
    ("q", -30),
    ("r", -27),
    ("y", -24),
    ("z", -21),
    ("a", -18),
    ("f", -15),
    ("p", -12),
    ("n", -9),
    ("µ", -6),
    ("\u{3bc}", -6),
    ("m", -3),
    ("c", -2),
    ("d", -1),
    ("da", 1),
    ("h", 2),
    ("k", 3),
    ("M", 6),
    ("G", 9),
    ("T", 12),
    ("P", 15),
    ("E", 18),
    ("Z", 21),
    ("Y", 24),
    ("R", 27),
    ("Q", 30),
];

/// The printed prefix of a power of ten; nothing for 0, `None` where the SI has none.
pub(super) fn prefix_of(power: i32) -> Option<&'static str> {
    if power == 0 {
        return Some("");
    }
    PREFIXES.iter().find(|(_, own)| *own == power).map(|(prefix, _)| *prefix)
}

/// The symbol spelt so, with the power of ten of its prefix.
pub(super) fn find(text: &str) -> Option<(&'static Symbol, i32)> {
    if let Some(symbol) = SYMBOLS.iter().find(|symbol| symbol.spellings.contains(&text)) {
        return Some((symbol, 0));
    }
    PREFIXES.iter().find_map(|(prefix, power)| {
        let rest = text.strip_prefix(prefix)?;
        let mut prefixed = SYMBOLS.iter().filter(|symbol| symbol.prefixable);
        prefixed.find(|symbol| symbol.spellings.contains(&rest)).map(|symbol| (symbol, *power))
    })
}

/// What a person meant who wrote something that is no unit symbol.
pub(super) fn suggestion(text: &str) -> Option<String> {
    if let Some((_, meant)) = MISSPELT.iter().find(|(word, _)| *word == text.to_lowercase()) {
        return Some((*meant).into());
    }
    if let Some(meant) = text.strip_prefix('u').map(|rest| format!("µ{rest}")).filter(|meant| find(meant).is_some()) {
        return Some(meant);
    }
    let same = COMMON.iter().find(|symbol| symbol.to_lowercase() == text.to_lowercase());
    let near = same.copied().or_else(|| crate::diagnostic::nearest(text, COMMON.iter().copied()));
    near.map(str::to_owned)
}

/// Forms that are no SI symbols, and what they stand for.
const MISSPELT: &[(&str, &str)] = &[
    ("c°", "°C"),
    ("cc", "cm3"),
    ("ccm", "cm3"),
    ("celsius", "°C"),
    ("deg", "°"),
    ("degc", "°C"),
    ("deg c", "°C"),
    ("º", "°"),
    ("ºc", "°C"),
    ("°k", "K"),
    ("gr", "g"),
    ("gram", "g"),
    ("grams", "g"),
    ("hr", "h"),
    ("hrs", "h"),
    ("hour", "h"),
    ("hours", "h"),
    ("kelvin", "K"),
    ("kilo", "kg"),
    ("kilogram", "kg"),
    ("kgs", "kg"),
    ("litre", "L"),
    ("liter", "L"),
    ("mcg", "µg"),
    ("metre", "m"),
    ("micron", "µm"),
    ("mins", "min"),
    ("minute", "min"),
    ("minutes", "min"),
    ("ohms", "Ω"),
    ("pascal", "Pa"),
    ("percent", "%"),
    ("ppb", "nmol/mol"),
    ("ppt", "pmol/mol"),
    ("%rh", "%"),
    ("rh", "%"),
    ("sec", "s"),
    ("secs", "s"),
    ("second", "s"),
    ("seconds", "s"),
    ("torr", "Pa"),
    ("mmhg", "hPa"),
    ("atm", "hPa"),
    ("year", "a"),
    ("yr", "a"),
    ("day", "d"),
    ("days", "d"),
];

/// Symbols of the trade that a slip of the pen may be near to.
const COMMON: &[&str] = &[
    "kg", "g", "mg", "µg", "ng", "m", "mm", "cm", "µm", "nm", "s", "ms", "min", "A", "mA", "µA", "V", "mV", "Ω", "kΩ",
    "Hz", "kHz", "MHz", "GHz", "K", "mK", "°C", "Pa", "hPa", "kPa", "mbar", "bar", "N", "mN", "J", "W", "mW", "T",
    "mol", "mmol", "µmol", "nmol", "ppm", "rad", "µrad", "Gal", "µGal", "L", "mL",
];

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn no_spelling_stands_for_two_units() {
        let mut seen = std::collections::BTreeMap::new();
        for symbol in SYMBOLS {
            for spelling in symbol.spellings {
                assert_eq!(seen.insert((*spelling).to_owned(), symbol.spellings), None, "{spelling}");
            }
        }
        for (prefix, power) in PREFIXES {
            for symbol in SYMBOLS.iter().filter(|symbol| symbol.prefixable) {
                for spelling in symbol.spellings {
                    let text = format!("{prefix}{spelling}");
                    let alone = seen.contains_key(&text);
                    assert!(alone || find(&text) == Some((symbol, *power)), "{text}");
                }
            }
        }
    }

    #[test]
    fn what_is_suggested_is_a_unit() {
        for meant in COMMON.iter().chain(MISSPELT.iter().map(|(_, meant)| meant)) {
            assert!(super::super::Unit::parse(meant).is_ok(), "{meant}");
        }
        assert_eq!(suggestion("ug").as_deref(), Some("µg"));
        assert_eq!(suggestion("Kg").as_deref(), Some("kg"));
        assert_eq!(suggestion("hpa").as_deref(), Some("hPa"));
        assert_eq!(suggestion("frobnicate"), None);
    }
}
