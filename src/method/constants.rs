//! The exact constants of the SI, and what follows from them: the one place where they stand.
//!
//! # Source    SI Brochure, 9th edition (2019), 2.2: numerical values fixed by the definition of the units.
//! # Formula   K_J = 2 e/h,  R_K = h/e²,  R = N_A k_B
//! Derived constants are computed, never typed: their decimals do not end.

use super::{exact, unit};
use crate::graph::{Builder, Name, Quantity};
use crate::quantity::Kind;

/// Where the values of the defining constants are laid down.
pub const SOURCE: &str = "SI Brochure, 9th edition, 2.2: exact";

/// A constant whose value is fixed by the definition of a unit.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Constant {
    pub symbol: &'static str,
    /// In the coherent SI unit.
    pub value: f64,
    pub unit: &'static str,
    pub meaning: &'static str,
}

/// The defining constants, in order of symbol.
pub static CONSTANTS: &[Constant] = &[
    Constant { symbol: "N_A", value: 6.022_140_76e23, unit: "mol-1", meaning: "Avogadro constant" },
    Constant { symbol: "c", value: 299_792_458.0, unit: "m/s", meaning: "speed of light in vacuum" },
    Constant { symbol: "e", value: 1.602_176_634e-19, unit: "C", meaning: "elementary charge" },
    Constant { symbol: "h", value: 6.626_070_15e-34, unit: "J s", meaning: "Planck constant" },
    Constant { symbol: "k_B", value: 1.380_649e-23, unit: "J/K", meaning: "Boltzmann constant" },
];

/// A constant computed from the defining ones.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Derived {
    pub symbol: &'static str,
    pub formula: &'static str,
    /// The unit it is shown in.
    pub unit: &'static str,
    pub meaning: &'static str,
}

/// The derived constants, in order of symbol.
pub static DERIVED: &[Derived] = &[
    Derived { symbol: "K_J", formula: "K_J = 2e/h", unit: "GHz/V", meaning: "Josephson constant" },
    Derived { symbol: "R", formula: "R = N_A k_B", unit: "J mol-1 K-1", meaning: "molar gas constant" },
    Derived { symbol: "R_K", formula: "R_K = h/e²", unit: "ohm", meaning: "von Klitzing constant" },
];

/// The paths of constants begin with this.
pub const PREFIX: &str = "constant.";

/// A constant by its symbol, under the path `constant.SYMBOL`; nothing for a symbol unknown here.
pub fn constant<'g>(builder: &'g Builder, symbol: &str) -> Option<Quantity<'g>> {
    let path = format!("{PREFIX}{symbol}");
    if let Some(found) = CONSTANTS.iter().find(|constant| constant.symbol == symbol) {
        let unit = unit(found.unit);
        return Some(builder.constant(&path, symbol, found.meaning, found.value, &unit, Kind::Plain, SOURCE));
    }
    let derived = DERIVED.iter().find(|derived| derived.symbol == symbol)?;
    let known = builder.graph().find(&path);
    if let Some(known) = known {
        return Some(builder.at(known));
    }
    let made = match symbol {
        "K_J" => 2.0 * constant(builder, "e")? / constant(builder, "h")?,
        "R_K" => constant(builder, "h")? / constant(builder, "e")?.squared(),
        _ => constant(builder, "N_A")? * constant(builder, "k_B")?,
    };
    let unit = unit(derived.unit);
    builder.name(made.id, Name { path, symbol: symbol.into(), label: derived.meaning.into(), unit });
    Some(made)
}

/// A constant that the program's own formulas use; a symbol unknown here would be a fault of ours.
pub fn known<'g>(builder: &'g Builder, symbol: &str) -> Quantity<'g> {
    constant(builder, symbol).unwrap_or_else(|| exact(builder, f64::NAN, "1"))
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn derived_constants_have_their_values_and_units() {
        let builder = Builder::default();
        for (symbol, value, text) in [
            ("K_J", 483_597_848_416_983.6, "Hz/V"),
            ("R_K", 25_812.807_459_304_506, "ohm"),
            ("R", 8.314_462_618_153_24, "J mol-1 K-1"),
        ] {
            let found = known(&builder, symbol);
            assert!((found.number() / value - 1.0).abs() < 1e-15, "{symbol}: {}", found.number());
            assert_eq!(found.dimension(), unit(text).dimension(), "{symbol}");
            assert!(
                DERIVED
                    .iter()
                    .any(|derived| derived.symbol == symbol && unit(derived.unit).dimension() == found.dimension())
            );
        }
        assert!(constant(&builder, "G").is_none());
    }

    /// K_J² R_K = 4/h: the elementary charge leaves the mass.
    #[test]
    fn josephson_and_von_klitzing_leave_the_planck_constant() {
        let builder = Builder::default();
        let product = known(&builder, "K_J").squared() * known(&builder, "R_K") * known(&builder, "h");
        assert!((product.number() / 4.0 - 1.0).abs() < 1e-15, "{}", product.number());
        assert_eq!(product.dimension(), crate::quantity::Dimension::ONE);
    }
}
