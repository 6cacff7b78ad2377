//! The command line: a file per command; arguments become library types before anything runs.
//!
//! Every command is a clap `Args` struct with `run(self) -> Result<Outcome, Failure>` in its own file below `cli/`, and
//! one variant of `Command`. Data goes to standard output or `--out FILE`; notes and progress to standard error.

/// Shared options: output format and destination.
pub mod output;

/// Inputs named on the command line.
pub mod input;

/// `predict`: where a table absorbs.
pub mod predict;

/// `pick`: a band list from a spectrum.
pub mod pick;

/// What `assign` and `advise` share.
pub mod ranking;

/// `assign`: which level is which band.
pub mod assign;

/// `advise`: the next measurement.
pub mod advise;
/// `exchange`: isotopologues.
pub mod exchange;

/// `constants`: from a force field.
pub mod constants;

/// A mode table as an answer.
pub mod table_output;

/// `check`: faults and doubts of tables.
pub mod check;

/// `symmetry`: selection rules.
pub mod symmetry;

/// `modes`: normal modes and a mode table from a Hessian.
pub mod modes;

/// `tables`: what is bundled.
pub mod tables;

/// `completions` and `manual`: from the same definitions.
pub mod manual;

use std::ffi::OsString;
use std::io::Write;
use std::process::ExitCode;

use clap::{CommandFactory, Parser, Subcommand};

use crate::note::Note;
use crate::read::Complaints;

/// How a run ended; the exit code of the process.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Outcome {
    /// Done (exit 0).
    Done,
    /// Done, but some band has no candidate better than *other origin*, or a check found faults (exit 1).
    Unexplained,
    /// Unusable input or command line (exit 2).
    Unusable,
}

impl From<Outcome> for ExitCode {
    fn from(outcome: Outcome) -> ExitCode {
        match outcome {
            Outcome::Done => ExitCode::SUCCESS,
            Outcome::Unexplained => ExitCode::from(1),
            Outcome::Unusable => ExitCode::from(2),
        }
    }
}

/// Why a command could not answer.
#[derive(Debug, thiserror::Error)]
pub enum Failure {
    /// The input files are unusable.
    #[error("{0}")]
    Input(#[from] Complaints),
    /// The command line asks for something that cannot be done.
    #[error("error: {0}")]
    Usage(String),
    /// Writing failed.
    #[error("error: cannot write {target}: {error}")]
    Write {
        /// Where to.
        target: String,
        /// What the system said.
        error: std::io::Error,
    },
}

/// Overtones and combinations of hydrated salts: predict them, assign observed bands, plan the next measurement.
#[derive(Debug, Parser)]
#[command(name = "bandwright", version, arg_required_else_help = true)]
pub struct Arguments {
    /// What to do.
    #[command(subcommand)]
    pub command: Command,
}

/// The commands.
#[derive(Debug, Subcommand)]
pub enum Command {
    /// Where a table absorbs: levels, uncertainty, species, strength class.
    Predict(predict::Predict),
    /// A band list from a spectrum.
    Pick(pick::Pick),
    /// Which level is which band: ranked candidates with probabilities and chance matches.
    Assign(assign::Assign),
    /// The next measurement for a band, with what each candidate predicts and cautions.
    Advise(advise::Advise),
    /// Mode table of an isotopologue.
    Exchange(exchange::Exchange),
    /// Anharmonic constants from a cubic and quartic force field.
    Constants(constants::Constants),
    /// Faults and doubts of mode tables.
    Check(check::Check),
    /// Normal modes, motions and a mode table from a Hessian.
    Modes(modes::Modes),
    /// What is bundled, with sources.
    Tables(tables::Tables),
    /// Selection rules: groups, species, products, powers, site and factor groups.
    Symmetry(symmetry::Symmetry),
    /// Shell completions.
    Completions(manual::Completions),
    /// The manual page.
    Manual(manual::Manual),
}

/// Prints notes to standard error, one a line.
pub fn tell(notes: &[Note]) {
    let mut err = std::io::stderr().lock();
    for note in notes {
        // A closed standard error is no reason to fail.
        let _ = writeln!(err, "note: {note}");
    }
}

/// The command-line definition, for completions and the manual page.
pub fn definition() -> clap::Command {
    Arguments::command()
}

/// Runs the program with these arguments (the first is the program's name).
pub fn run(arguments: impl IntoIterator<Item = OsString>) -> Outcome {
    let arguments = match Arguments::try_parse_from(arguments) {
        Ok(arguments) => arguments,
        Err(error) => {
            let _ = error.print();
            return if error.use_stderr() { Outcome::Unusable } else { Outcome::Done };
        }
    };
    let result = match arguments.command {
        Command::Predict(command) => command.run(),
        Command::Pick(command) => command.run(),
        Command::Assign(command) => command.run(),
        Command::Advise(command) => command.run(),
        Command::Exchange(command) => command.run(),
        Command::Constants(command) => command.run(),
        Command::Check(command) => command.run(),
        Command::Modes(command) => command.run(),
        Command::Tables(command) => command.run(),
        Command::Symmetry(command) => command.run(),
        Command::Completions(command) => command.run(),
        Command::Manual(command) => command.run(),
    };
    match result {
        Ok(outcome) => outcome,
        // A reader that closed the pipe has seen enough.
        Err(Failure::Write { error, .. }) if error.kind() == std::io::ErrorKind::BrokenPipe => Outcome::Done,
        Err(failure) => {
            let _ = writeln!(std::io::stderr().lock(), "{failure}");
            Outcome::Unusable
        }
    }
}
