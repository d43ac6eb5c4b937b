//! libripens compiles calibration records into reports.
//!
//! The stages, in the order of the data, each with the type it hands on:
//!
//! | stage      | module                                    | hands on                                                 |
//! |------------|-------------------------------------------|----------------------------------------------------------|
//! | records    | [`intake`], [`record`]                    | [`record::Record`]: text with places, nothing interpreted |
//! | blocks     | [`block`]                                 | [`block::Block`]: fields checked against their kind       |
//! | graph      | [`graph`], [`method`]                     | [`graph::Graph`]: quantities and how they are computed    |
//! | evaluation | [`graph`], [`numeric`], [`quantity`]      | numbers, uncertainties, budgets, trails                   |
//! | report     | [`report`]                                | [`report::Report`]: a PDF with its dossier                |
//! | register   | [`register`]                              | [`register::Register`]: what was done, by whom, in a chain |
//!
//! A module imports only from the modules above it in this order: intake, diagnostic, numeric, quantity, graph,
//! method, record, block, report, register. The compiler proper reads through [`intake::Intake`] alone: it never
//! touches the disk, the environment or the clock. `command` and `main` are the only code that does.

pub mod block;
pub mod command;
pub mod diagnostic;
pub mod graph;
pub mod intake;
pub mod method;
pub mod numeric;
pub mod quantity;
pub mod record;
pub mod register;
pub mod report;

/// Version of the program; results and dossiers carry it.
pub const VERSION: &str = env!("CARGO_PKG_VERSION");

use block::Engine;
use intake::{Intake, IntakeError};

/// Reads the records that `campaign` sees and builds everything they compute.
///
/// Complaints are with the engine: [`Engine::complaints`].
///
/// # Errors
/// When the folder cannot be listed.
pub fn reduce<'i>(intake: &'i dyn Intake, campaign: Option<&str>) -> Result<Engine<'i>, IntakeError> {
    let engine = Engine::read(intake, campaign)?;
    engine.build_all();
    register::check_lodged(&engine);
    Ok(engine)
}
