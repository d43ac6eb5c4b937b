//! From results and prose to pages.
//!
//! Prose becomes Typst markup ([`prose`]), a template arranges it ([`template`]), the typesetter makes the pages and
//! the PDF ([`typeset`]).

pub mod change;
pub mod chart;
pub mod compile;
pub mod derivation;
pub mod dossier;
pub mod expression;
pub mod figures;
pub mod front;
pub mod issue;
pub mod listing;
pub mod literal;
pub mod markup;
pub mod math;
pub mod page;
pub mod parts;
pub mod prose;
pub mod prose_text;
pub mod table;
pub mod template;
pub mod typeset;
mod world;

pub use compile::{Manuscript, Report, examine_reports, make_issued, make_report, report_records, write_report};
pub use issue::Issue;
pub use markup::Markup;
