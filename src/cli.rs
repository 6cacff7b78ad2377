//! The command line: a file per command; arguments become library types before anything runs.

use std::ffi::OsString;
use std::process::ExitCode;

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

/// Runs the program with these arguments (the first is the program's name).
pub fn run(arguments: impl IntoIterator<Item = OsString>) -> Outcome {
    let _ = arguments;
    Outcome::Unusable
}
