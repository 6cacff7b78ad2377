//! A mode table as the answer of a command: the modes, and beside them the constants.

use std::path::Path;

use serde::Serialize;

use super::Failure;
use super::output::{Format, OutputOptions};
use crate::mode::ModeTable;
use crate::note::Note;
use crate::render::mode_table;

/// Which of the two files goes to standard output.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum First {
    /// The modes.
    Modes,
    /// The constants.
    Constants,
}

#[derive(Serialize)]
struct Document<'a> {
    schema: String,
    table: &'a ModeTable,
    notes: &'a [Note],
}

/// Delivers a table. To a file `NAME.csv`: the modes there and the constants in `NAME.constants.csv` beside it, which is
/// where the readers look. To standard output: the one that `first` names. JSON holds both.
///
/// # Errors
/// See [`OutputOptions::deliver`]; [`Failure::Usage`] for a format that a table has not.
pub fn deliver(
    output: &OutputOptions,
    command: &str,
    table: &ModeTable,
    notes: &[Note],
    first: First,
    inputs: &[&Path],
) -> Result<(), Failure> {
    match output.format {
        Format::Json => {
            let document = Document { schema: format!("bandwright/{command}/1"), table, notes };
            let text = serde_json::to_string_pretty(&document)
                .map_err(|error| Failure::Write { target: "JSON".to_owned(), error: error.into() })?;
            output.deliver(format!("{text}\n").as_bytes(), inputs)
        }
        Format::Table | Format::Csv => {
            let constants = mode_table::constants_csv(table);
            let Some(target) = &output.out else {
                let text = if first == First::Modes { mode_table::csv(table) } else { constants };
                return output.deliver(text.as_bytes(), inputs);
            };
            output.deliver(mode_table::csv(table).as_bytes(), inputs)?;
            if table.constants.is_empty() {
                return Ok(());
            }
            let beside = OutputOptions { out: Some(target.with_extension("constants.csv")), ..output.clone() };
            beside.deliver(constants.as_bytes(), inputs)
        }
        Format::Html | Format::Svg => Err(output.refuse(command, "table, csv, json")),
    }
}
