//! `trail`.
use super::{Outcome, Stopped};
/// x
#[derive(Debug, clap::Args)]
pub struct Trail {}
impl Trail {
    /// Runs the command.
    pub fn run(self) -> Result<Outcome, Stopped> { Err(Stopped::because("not yet")) }
}
