//! From results and prose to pages.
//!
//! Prose becomes Typst markup ([`prose`]), a template arranges it ([`template`]), the typesetter makes the pages and
//! the PDF ([`typeset`]).

pub mod chart;
pub mod listing;
pub mod literal;
pub mod markup;
pub mod math;
pub mod page;
pub mod prose;
pub mod template;
pub mod typeset;
mod world;

pub use markup::Markup;

/// Complaints of report records, without typesetting them.
pub fn examine_reports(_engine: &crate::block::Engine) {}
