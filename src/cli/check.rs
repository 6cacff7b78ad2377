//! `check`: faults and doubts of tables.

use std::path::Path;

use itertools::Itertools;
use serde::Serialize;

use super::output::{Format, OutputOptions};
use super::{Failure, Outcome, input, tell};
use crate::physics::table_faults::{Finding, Severity, findings};
use crate::read::Complaints;
use crate::render::mode_table::sheet;

/// Faults and doubts of mode tables; exit code 1 when there is a fault.
#[derive(Debug, clap::Args)]
pub struct Check {
    /// Mode tables: files or bundled names.
    #[arg(required = true)]
    pub tables: Vec<String>,
    #[command(flatten)]
    output: OutputOptions,
}

#[derive(Serialize)]
struct Checked<'a> {
    table: &'a str,
    findings: Vec<Finding>,
}

#[derive(Serialize)]
struct Report<'a> {
    schema: &'static str,
    tables: Vec<Checked<'a>>,
}

impl Check {
    /// Runs the command.
    ///
    /// # Errors
    /// All complaints of all unreadable tables together.
    pub fn run(self) -> Result<Outcome, Failure> {
        let mut complaints = Complaints::default();
        let mut checked = Vec::new();
        for name in &self.tables {
            match input::load_table(name) {
                Ok(loaded) => {
                    tell(&loaded.notes);
                    checked.push(Checked { table: name, findings: findings(&loaded.value) });
                }
                Err(Failure::Input(more)) => complaints.0.extend(more.0),
                Err(other) => return Err(other),
            }
        }
        if !complaints.0.is_empty() {
            return Err(Failure::Input(complaints));
        }
        let faults = checked.iter().flat_map(|c| &c.findings).filter(|f| f.severity == Severity::Fault).count();
        let word = |severity| if severity == Severity::Fault { "fault" } else { "doubt" };
        let text = match self.output.format {
            Format::Table => checked
                .iter()
                .map(|c| {
                    let lines = c.findings.iter().map(|f| {
                        let about = if f.about.is_empty() { String::new() } else { format!("{}: ", f.about) };
                        format!("  {}: {about}{}\n", word(f.severity), f.message)
                    });
                    let body: String = lines.collect();
                    format!(
                        "{}\n{}",
                        c.table,
                        if body.is_empty() { "  nothing to complain about\n".to_owned() } else { body }
                    )
                })
                .join("\n"),
            Format::Csv => sheet(
                &["table", "severity", "about", "message"],
                checked.iter().flat_map(|c| {
                    c.findings.iter().map(move |f| {
                        vec![c.table.to_owned(), word(f.severity).to_owned(), f.about.clone(), f.message.clone()]
                    })
                }),
            ),
            Format::Json => {
                let report = Report { schema: "bandwright/check/1", tables: checked };
                serde_json::to_string_pretty(&report).unwrap_or_default() + "\n"
            }
            Format::Html | Format::Svg => return Err(self.output.refuse("check", "table, csv, json")),
        };
        let inputs: Vec<&Path> = self.tables.iter().map(Path::new).collect();
        self.output.deliver(text.as_bytes(), &inputs)?;
        Ok(if faults > 0 { Outcome::Unexplained } else { Outcome::Done })
    }
}
