//! `tables`: what is bundled, with sources.

use super::output::OutputOptions;
use super::{Failure, Outcome};

/// What is bundled, with sources.
#[derive(Debug, clap::Args)]
pub struct Tables {
    /// A bundled table to show whole; all are listed without it.
    pub name: Option<String>,
    #[command(flatten)]
    output: OutputOptions,
}

impl Tables {
    /// Runs the command.
    ///
    /// # Errors
    /// See [`Failure`].
    pub fn run(self) -> Result<Outcome, Failure> {
        Err(Failure::Usage(format!("no table is bundled yet ({:?})", self.name)))
    }
}
