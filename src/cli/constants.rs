//! `constants`: a force field becomes anharmonic constants.

use std::path::{Path, PathBuf};

use super::output::OutputOptions;
use super::table_output::{First, deliver};
use super::{Failure, Outcome, tell};
use crate::physics::perturbation::{self, Criterion};
use crate::read::force_field;

/// Anharmonic constants from a cubic and quartic force field (JSON; layout in docs/force_field.md).
#[derive(Debug, clap::Args)]
pub struct Constants {
    /// Force field, JSON.
    pub field: PathBuf,
    /// When a small denominator is a resonance, taken out of the constants and handed to the polyads.
    #[arg(long, value_enum, default_value_t = Resonances::Excess)]
    pub resonances: Resonances,
    /// Largest denominator that counts, cm-1 (excess: 200 without it; window: 250).
    #[arg(long, value_name = "CM-1")]
    pub window: Option<f64>,
    #[command(flatten)]
    output: OutputOptions,
}

/// Criteria for a resonance.
#[derive(Clone, Copy, Debug, PartialEq, Eq, clap::ValueEnum)]
pub enum Resonances {
    /// W⁴/|D|³ above 1 cm-1 and |D| inside the window.
    Excess,
    /// |W/D| above 0.076.
    Generator,
    /// |D| inside the window.
    Window,
    /// None: plain second order.
    Never,
}

impl Constants {
    /// Runs the command.
    ///
    /// # Errors
    /// See [`Failure`].
    pub fn run(self) -> Result<Outcome, Failure> {
        if self.window.is_some_and(|w| !(w.is_finite() && w > 0.0)) {
            return Err(Failure::Usage("--window needs a positive number of cm-1".to_owned()));
        }
        let criterion = match self.resonances {
            Resonances::Excess => Criterion::Excess { window: self.window.unwrap_or(200.0), excess: 1.0 },
            Resonances::Generator => Criterion::Generator(0.076),
            Resonances::Window => Criterion::Window(self.window.unwrap_or(250.0)),
            Resonances::Never => Criterion::Never,
        };
        let field = force_field::read_file(&self.field)?;
        let mut notes = field.notes;
        let answer = perturbation::table(&field.value, criterion).map_err(|e| Failure::Usage(e.to_string()))?;
        notes.extend(answer.notes);
        tell(&notes);
        let inputs: [&Path; 1] = [&self.field];
        deliver(&self.output, "constants", &answer.value, &notes, First::Constants, &inputs)?;
        Ok(Outcome::Done)
    }
}
