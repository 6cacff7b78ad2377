//! `predict`: where a table absorbs.

use std::path::{Path, PathBuf};

use super::output::{Format, OutputOptions};
use super::{Failure, Outcome, input, tell};
use crate::enumerate::prediction::{BUDGET, Request, predict};
use crate::physics::anharmonicity::resolve;
use crate::physics::resonance;
use crate::physics::temperature::at_temperature;
use crate::quantity::{Medium, Window};
use crate::render::{html, predict as render, records};

/// Where a table absorbs: levels, uncertainty, species, strength class.
#[derive(Debug, clap::Args)]
pub struct Predict {
    /// Mode table: a file or a bundled name (`bandwright tables`).
    pub table: String,
    /// Constants file to use instead of the one beside the table.
    #[arg(long, value_name = "FILE")]
    pub constants: Option<PathBuf>,
    /// Part of the spectrum: `1.0:2.6um`, `4000:8000` (cm-1).
    #[arg(long, default_value = "1.0:2.6um", value_name = "RANGE")]
    pub window: String,
    /// Most quanta of a level.
    #[arg(long, default_value_t = 3, value_parser = clap::value_parser!(u8).range(1..=9))]
    pub quanta: u8,
    /// Move the table to this temperature, K: shifts and widths by motion, with their uncertainty.
    #[arg(long, value_name = "K")]
    pub temperature: Option<f64>,
    /// Add hot transitions, at the table's temperature or 298 K.
    #[arg(long)]
    pub hot: bool,
    /// List only this many levels, the strongest (all without it).
    #[arg(long, value_name = "N")]
    pub limit: Option<usize>,
    #[command(flatten)]
    output: OutputOptions,
}

/// Temperature of a table that names none, K.
const ROOM: f64 = 298.0;

impl Predict {
    /// Runs the command.
    ///
    /// # Errors
    /// See [`Failure`].
    pub fn run(self) -> Result<Outcome, Failure> {
        let window = Window::from_text(&self.window, Medium::Vacuum).map_err(|e| Failure::Usage(e.to_string()))?;
        let loaded = input::load_table_with(&self.table, self.constants.as_deref())?;
        let mut notes = loaded.notes;
        let mut table = loaded.value;
        if let Some(kelvin) = self.temperature {
            if !(kelvin.is_finite() && (1.0..=1000.0).contains(&kelvin)) {
                return Err(Failure::Usage(format!("--temperature {kelvin} is not between 1 and 1000 K")));
            }
            let moved = at_temperature(&table, kelvin);
            table = moved.value;
            notes.extend(moved.notes);
        }
        let model = resolve(&table);
        notes.extend(model.notes);
        notes.extend(resonance::doubts(&model.value, &table));
        let request = Request {
            window: (window.low(), window.high()),
            quanta: self.quanta,
            budget: BUDGET,
            hot: self.hot.then(|| table.temperature.unwrap_or(ROOM)),
        };
        let predicted = predict(&table, &model.value, &request).map_err(|e| Failure::Usage(e.to_string()))?;
        notes.extend(predicted.notes);
        let mut report =
            records::predict_report(&table, &model.value, request.window, self.quanta, &predicted.value, &notes);
        if let Some(limit) = self.limit
            && report.levels.len() > limit
        {
            report.left_out = report.levels.len() - limit;
            report.levels.sort_by(|a, b| {
                b.strength_log10.total_cmp(&a.strength_log10).then(a.position_cm1.total_cmp(&b.position_cm1))
            });
            report.levels.truncate(limit);
            report.levels.sort_by(|a, b| a.position_cm1.total_cmp(&b.position_cm1).then(a.label.cmp(&b.label)));
        }
        tell(&notes);
        let text = match self.output.format {
            Format::Table => render::table(&report),
            Format::Csv => render::csv(&report),
            Format::Json => render::json(&report),
            Format::Html => html::predict(&report),
            Format::Svg => return Err(self.output.refuse("predict", "table, csv, json, html")),
        };
        let inputs: Vec<&Path> =
            [Some(Path::new(&self.table)), self.constants.as_deref()].into_iter().flatten().collect();
        self.output.deliver(text.as_bytes(), &inputs)?;
        Ok(Outcome::Done)
    }
}
