//! `exchange`: the mode table of an isotopologue.

use std::path::{Path, PathBuf};

use super::output::OutputOptions;
use super::table_output::{First, deliver};
use super::{Failure, Outcome, input, tell};
use crate::note::Note;
use crate::physics::isotopes;

/// Mode table of the isotopologue: H=D, H=D(half) for HDO, 16O=18O, 32S=34S, 35Cl=37Cl, 14N=15N, 12C=13C.
#[derive(Debug, clap::Args)]
pub struct Exchange {
    /// Mode table: a file or a bundled name (`bandwright tables`).
    pub table: String,
    /// What is exchanged for what: H=D, 16O=18O ...; several are done one after the other.
    #[arg(required = true, value_name = "A=B")]
    pub exchanges: Vec<String>,
    /// Constants file to use instead of the one beside the table.
    #[arg(long, value_name = "FILE")]
    pub constants: Option<PathBuf>,
    #[command(flatten)]
    output: OutputOptions,
}

impl Exchange {
    /// Runs the command.
    ///
    /// # Errors
    /// See [`Failure`].
    pub fn run(self) -> Result<Outcome, Failure> {
        let wanted = self
            .exchanges
            .iter()
            .map(|text| isotopes::Exchange::from_text(text))
            .collect::<Result<Vec<_>, _>>()
            .map_err(|error| Failure::Usage(error.to_string()))?;
        let loaded = input::load_table_with(&self.table, self.constants.as_deref())?;
        let (mut table, mut notes) = (loaded.value, loaded.notes);
        for what in &wanted {
            let noted = isotopes::exchange(&table, what);
            table = noted.value;
            notes.extend(noted.notes);
        }
        if !table.constants.is_empty() && self.output.out.is_none() {
            notes.push(Note::new("the constants were scaled too: --out NAME.csv writes them beside the table"));
        }
        tell(&notes);
        let inputs: Vec<&Path> =
            [Some(Path::new(&self.table)), self.constants.as_deref()].into_iter().flatten().collect();
        deliver(&self.output, "exchange", &table, &notes, First::Modes, &inputs)?;
        Ok(Outcome::Done)
    }
}
