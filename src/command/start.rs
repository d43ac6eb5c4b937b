//! `start`.
use super::{Outcome, Stopped};
/// x
#[derive(Debug, clap::Args)]
pub struct Start {}
impl Start {
    /// Runs the command.
    pub fn run(self) -> Result<Outcome, Stopped> { Err(Stopped::because("not yet")) }
}
