//! `tables`: what is bundled, with sources.

use serde::Serialize;

use super::output::{Format, OutputOptions};
use super::{Failure, Outcome, input};
use crate::library::{bundled, names};
use crate::mode::ModeTable;
use crate::render::mode_table;
use crate::render::records::summary;
use crate::render::report::TableSummary;
use crate::render::text::{Align, columns};

/// What is bundled, with sources.
#[derive(Debug, clap::Args)]
pub struct Tables {
    /// A bundled table to show whole; all are listed without it.
    pub name: Option<String>,
    #[command(flatten)]
    output: OutputOptions,
}

#[derive(Serialize)]
struct Whole<'a> {
    schema: &'static str,
    table: TableSummary,
    modes: &'a ModeTable,
}

#[derive(Serialize)]
struct Listing {
    schema: &'static str,
    tables: Vec<TableSummary>,
}

impl Tables {
    /// Runs the command.
    ///
    /// # Errors
    /// See [`Failure`].
    pub fn run(self) -> Result<Outcome, Failure> {
        let text = match &self.name {
            Some(name) => {
                let table = input::load_table(name)?.value;
                match self.output.format {
                    Format::Table | Format::Csv => {
                        let constants = if table.constants.is_empty() {
                            String::new()
                        } else if self.output.format == Format::Table {
                            format!("\nConstants\n{}", mode_table::constants_csv(&table))
                        } else {
                            String::new()
                        };
                        mode_table::csv(&table) + &constants
                    }
                    Format::Json => {
                        pretty(&Whole { schema: "bandwright/tables/1", table: summary(&table), modes: &table })
                    }
                    Format::Html | Format::Svg => return Err(self.output.refuse("tables", "table, csv, json")),
                }
            }
            None => {
                let mut list = Vec::new();
                for name in names() {
                    if let Some(result) = bundled(name) {
                        list.push(summary(&result?.value));
                    }
                }
                let header = ["name", "formula", "modes", "title", "source"];
                let rows: Vec<Vec<String>> = list
                    .iter()
                    .map(|t| {
                        vec![t.name.clone(), t.formula.clone(), t.modes.to_string(), t.title.clone(), t.source.clone()]
                    })
                    .collect();
                match self.output.format {
                    Format::Table => columns(&header.map(|h| (h, Align::Left)), &rows),
                    Format::Csv => mode_table::sheet(&header, rows.into_iter()),
                    Format::Json => pretty(&Listing { schema: "bandwright/tables/1", tables: list }),
                    Format::Html | Format::Svg => return Err(self.output.refuse("tables", "table, csv, json")),
                }
            }
        };
        self.output.deliver(text.as_bytes(), &[])?;
        Ok(Outcome::Done)
    }
}

fn pretty(value: &impl Serialize) -> String {
    serde_json::to_string_pretty(value).unwrap_or_default() + "\n"
}
