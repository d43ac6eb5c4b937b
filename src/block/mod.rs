//! Measurement blocks: one file a kind, dispatched by the table [`KINDS`].
//!
//! A kind states its fields, its outputs, and how to build what it computes. Adding a kind is one new file and one
//! line in the table.
//!
//! | file               | holds                                                        |
//! |--------------------|--------------------------------------------------------------|
//! | `field`            | tables of fields and the check against them                  |
//! | `fields`, `given`  | reading checked fields                                       |
//! | `engine`           | [`Engine`]: records to blocks to the graph, on demand        |
//! | `laboratory`       | what `laboratory.md` settles                                 |
//! | `calibration`      | the calibration valid on the day of use                      |
//! | `weight`           | what standards and items have in common                      |
//! | `combining`        | what a combination of results decides                        |
//! | the kinds          | `ambient`, `combined_result`, `comparator`, `comparison`, …  |

pub mod ambient;
pub mod analysis_of_variance;
pub mod apparatus;
pub mod calibration;
pub mod columns;
pub mod combined_result;
pub mod combining;
pub mod comparator;
pub mod comparison;
pub mod correction;
pub mod correlation;
pub mod determination;
pub mod engine;
pub mod equation;
pub mod field;
pub mod fields;
pub mod fit;
pub mod given;
pub mod gravity_at_mass;
mod gravity_check;
pub mod gravity_station;
pub mod instrument;
pub mod laboratory;
pub mod laser;
pub mod measurement_model;
pub mod moving_checks;
pub mod moving_phase;
pub mod particulars;
pub mod phase;
pub mod raw_data;
pub mod realization;
pub mod resistor;
pub mod series_in_time;
pub mod time_base;
pub mod units_of_1990;
pub mod voltage_standard;
pub mod weighing;
pub mod weighing_phase;
pub mod weight;

pub use engine::{Block, Engine};
pub use field::{Field, Shape};
pub use fields::Fields;
pub use laboratory::Laboratory;

use crate::diagnostic::Complaints;

/// What a block gives to the graph, for the documentation.
#[derive(Debug, Clone, Copy)]
pub struct Output {
    /// The path behind the block's name, such as `air.density`.
    pub path: &'static str,
    pub meaning: &'static str,
    pub unit: &'static str,
}

/// A kind of block.
pub struct BlockKind {
    /// The trade term, lower case with hyphens.
    pub name: &'static str,
    pub meaning: &'static str,
    pub fields: &'static [Field],
    pub outputs: &'static [Output],
    /// Checks beyond the table of fields that need no other block.
    pub check: fn(Fields<'_>, &mut Complaints),
    /// Adds what the block computes to the graph; complaints go to the engine.
    pub build: fn(&Engine, &Block),
}

/// Every kind, in order of name.
pub static KINDS: &[&BlockKind] = &[
    &ambient::KIND,
    &analysis_of_variance::KIND,
    &apparatus::KIND,
    &combined_result::KIND,
    &comparator::KIND,
    &comparison::KIND,
    &correction::KIND,
    &correlation::KIND,
    &particulars::CUSTOMER,
    &determination::KIND,
    &fit::KIND,
    &gravity_station::KIND,
    &instrument::KIND,
    &weight::ITEM,
    &laser::KIND,
    &weight::MASS_STANDARD,
    &measurement_model::KIND,
    &moving_phase::KIND,
    &particulars::PERSON,
    &raw_data::KIND,
    &realization::KIND,
    &resistor::KIND,
    &particulars::RULE,
    &series_in_time::KIND,
    &time_base::KIND,
    &voltage_standard::KIND,
    &weighing_phase::KIND,
];

/// The kind with this name.
pub fn find_kind(name: &str) -> Option<&'static BlockKind> {
    KINDS.iter().find(|kind| kind.name == name).copied()
}

/// The table of kinds and their outputs as Markdown, for the documentation.
pub fn outputs_table() -> String {
    let mut table = String::from("| block kind | output | meaning | unit |\n|---|---|---|---|\n");
    for kind in KINDS {
        for output in kind.outputs {
            table.push_str(&format!(
                "| `{}` | `NAME.{}` | {} | {} |\n",
                kind.name, output.path, output.meaning, output.unit
            ));
        }
        if kind.outputs.is_empty() {
            table.push_str(&format!("| `{}` | | {} | |\n", kind.name, kind.meaning));
        }
    }
    table
}

/// Nothing to check beyond the fields.
pub(crate) fn no_check(_: Fields<'_>, _: &mut Complaints) {}

/// Nothing to compute.
pub(crate) fn no_build(_: &Engine, _: &Block) {}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn kinds_are_sorted_and_documented() {
        let names: Vec<&str> = KINDS.iter().map(|kind| kind.name).collect();
        assert!(names.windows(2).all(|pair| pair[0] < pair[1]), "{names:?}");
        for kind in KINDS {
            assert!(!kind.meaning.is_empty() && !kind.fields.is_empty());
            assert!(kind.fields.iter().all(|field| !field.meaning.is_empty()), "{}", kind.name);
        }
    }
}
