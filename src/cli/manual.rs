//! `completions` and `manual`: made from the definitions that the program parses with.

use clap_complete::Shell;

use super::output::OutputOptions;
use super::{Failure, Outcome, definition};

/// Shell completions, to source or to install.
#[derive(Debug, clap::Args)]
pub struct Completions {
    /// Which shell.
    pub shell: Shell,
}

impl Completions {
    /// Runs the command.
    ///
    /// # Errors
    /// [`Failure::Write`] when standard output refuses.
    pub fn run(self) -> Result<Outcome, Failure> {
        let mut text = Vec::new();
        clap_complete::generate(self.shell, &mut definition(), "bandwright", &mut text);
        OutputOptions::default().deliver(&text, &[])?;
        Ok(Outcome::Done)
    }
}

/// The manual page (roff), of the program or of one command.
#[derive(Debug, clap::Args)]
pub struct Manual {
    /// Command whose page to write; the program's page without it.
    pub command: Option<String>,
}

impl Manual {
    /// Runs the command.
    ///
    /// # Errors
    /// [`Failure::Usage`] for an unknown command, [`Failure::Write`] when standard output refuses.
    pub fn run(self) -> Result<Outcome, Failure> {
        let mut program = definition();
        program.build();
        let page = match &self.command {
            None => program,
            Some(name) => program.find_subcommand(name).cloned().ok_or_else(|| {
                Failure::Usage(format!("no command `{name}`\n  hint: `bandwright --help` lists them"))
            })?,
        };
        let mut text = Vec::new();
        clap_mangen::Man::new(page)
            .render(&mut text)
            .map_err(|error| Failure::Write { target: "the manual page".to_owned(), error })?;
        OutputOptions::default().deliver(&text, &[])?;
        Ok(Outcome::Done)
    }
}
