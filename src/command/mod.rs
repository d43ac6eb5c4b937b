//! The commands, one file each: the only code that touches the disk, the clock and the environment.

#![allow(clippy::disallowed_methods)]

mod audit;
mod authorise;
mod budget;
mod consequences;
mod covariance;
mod decide;
mod disk;
mod examine;
mod folder;
mod follow;
mod issue;
mod lodge;
mod reduce;
mod register;
mod report;
mod send;
mod start;
mod terminal;
mod trail;
mod trials;
mod validate;
mod vault;
mod withdraw;

use clap::{Parser, Subcommand};
use std::process::ExitCode;

/// Compiles calibration records into reports in which every number leads back to a reading.
///
/// Records are Markdown files with YAML measurement blocks, kept in a laboratory folder. Every computation is
/// re-run from the raw data each time; nothing is copied by hand.
#[derive(Debug, Parser)]
#[command(name = "libripens", version, max_term_width = 100, after_help = AFTER_HELP)]
struct Arguments {
    #[command(subcommand)]
    command: Command,
}

const AFTER_HELP: &str = "\
A first session:
  libripens start my-laboratory                 write a laboratory folder to begin with
  libripens examine my-laboratory               what is wrong with the records
  libripens reduce my-laboratory                every result with its uncertainty
  libripens budget W1.mass my-laboratory        where the uncertainty of one result comes from
  libripens trail W1.mass my-laboratory         from the result down to the readings
  libripens report my-laboratory/campaigns/first/report.md
  libripens audit report.pdf                    does the PDF prove itself?

Exit status: 0 all well; 1 records or report have faults, each was printed; 2 the command could not be carried out.";

#[derive(Debug, Subcommand)]
enum Command {
    /// Write a laboratory folder, or a campaign inside one, to begin with
    Start(start::Start),
    /// Print what is wrong with the records, and nothing else
    Examine(examine::Examine),
    /// Re-run every computation and print the results
    Reduce(reduce::Reduce),
    /// Walk from one result down to its readings
    Trail(trail::Trail),
    /// Print the uncertainty budget of results, and their covariance when there are several
    Budget(budget::Budget),
    /// Typeset a report as a draft PDF with its dossier
    Report(report::Report),
    /// Enter records and raw data into the register as they are made
    Lodge(lodge::Lodge),
    /// Record that a report was reviewed or authorised as it stands
    Authorise(authorise::Authorise),
    /// Give an authorised report its number and its final form
    Issue(issue::Issue),
    /// Record to whom an issued report went
    Send(send::Send),
    /// Issue an amendment to a report: what changed, valid together with it
    Amend(follow::Amend),
    /// Issue a complete new report in place of another
    Replace(follow::Replace),
    /// Withdraw an issued report
    Withdraw(withdraw::Withdraw),
    /// Find which issued reports the present records would change
    Consequences(consequences::Consequences),
    /// Record what is done about an issued report whose inputs changed
    Decide(decide::Decide),
    /// List issued reports and entries of the register, or verify it
    Register(register::Register),
    /// Check a report from its PDF alone
    Audit(audit::Audit),
    /// Run every published check built in and print the validation record
    Validate(validate::Validate),
}

/// How a command ended.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Outcome {
    AllWell,
    /// Records or report have faults; each was printed.
    Faults,
}

/// Why a command could not be carried out.
#[derive(Debug, thiserror::Error)]
#[error("{0}")]
pub struct Stopped(pub String);

impl Stopped {
    /// A reason in words.
    pub fn because(reason: impl std::fmt::Display) -> Stopped {
        Stopped(reason.to_string())
    }
}

/// Runs the command named on the command line.
pub fn run() -> ExitCode {
    let arguments = match Arguments::try_parse() {
        Ok(arguments) => arguments,
        Err(error) => {
            let _ = error.print();
            return ExitCode::from(if error.use_stderr() { 2 } else { 0 });
        }
    };
    let outcome = match arguments.command {
        Command::Start(command) => command.run(),
        Command::Examine(command) => command.run(),
        Command::Reduce(command) => command.run(),
        Command::Trail(command) => command.run(),
        Command::Budget(command) => command.run(),
        Command::Report(command) => command.run(),
        Command::Lodge(command) => command.run(),
        Command::Authorise(command) => command.run(),
        Command::Issue(command) => command.run(),
        Command::Send(command) => command.run(),
        Command::Amend(command) => command.run(),
        Command::Replace(command) => command.run(),
        Command::Withdraw(command) => command.run(),
        Command::Consequences(command) => command.run(),
        Command::Decide(command) => command.run(),
        Command::Register(command) => command.run(),
        Command::Audit(command) => command.run(),
        Command::Validate(command) => command.run(),
    };
    match outcome {
        Ok(Outcome::AllWell) => ExitCode::SUCCESS,
        Ok(Outcome::Faults) => ExitCode::from(1),
        Err(Stopped(reason)) => {
            terminal::say(&format!("libripens: {reason}\n"));
            ExitCode::from(2)
        }
    }
}
