//! `budget`.
use super::{Outcome, Stopped};
/// x
#[derive(Debug, clap::Args)]
pub struct Budget {}
impl Budget {
    /// Runs the command.
    pub fn run(self) -> Result<Outcome, Stopped> { Err(Stopped::because("not yet")) }
}
