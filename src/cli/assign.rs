//! `assign`: which level is which band.

use std::path::{Path, PathBuf};

use super::output::{Format, OutputOptions};
use super::{Failure, Outcome, input, tell};
use crate::assign::candidate::Candidate;
use crate::assign::joint::{self, JointOptions};
use crate::assign::sampler::Effort;
use crate::assign::single::{Assumptions, range_of, rank};
use crate::enumerate::prediction::{BUDGET, Predicted, Request, predict};
use crate::physics::anharmonicity::resolve;
use crate::physics::strength::FORBIDDEN_STEP;
use crate::physics::symmetry::Activity;
use crate::read::band_list;
use crate::render::{assign as render, records};

/// Ranks the levels of a table as candidates for observed bands.
#[derive(Debug, clap::Args)]
pub struct Assign {
    /// Mode table: a file or a bundled name (`bandwright tables`).
    pub table: String,
    /// Band list.
    #[arg(long, value_name = "FILE")]
    pub bands: PathBuf,
    /// Constants file to use instead of the one beside the table.
    #[arg(long, value_name = "FILE")]
    pub constants: Option<PathBuf>,
    /// Most quanta of a level.
    #[arg(long, default_value_t = 4, value_parser = clap::value_parser!(u8).range(1..=9))]
    pub quanta: u8,
    /// Candidates listed per band.
    #[arg(long, default_value_t = 10, value_name = "N")]
    pub top: usize,
    /// Rank every band by itself instead of all jointly.
    #[arg(long)]
    pub separately: bool,
    /// Decades of strength that a level forbidden by symmetry loses; `exclude` leaves such levels out.
    #[arg(long, default_value = "1", value_name = "DECADES|exclude")]
    pub forbidden_penalty: String,
    /// Members of the sampler's population.
    #[arg(long, default_value_t = 256, value_name = "N", value_parser = clap::value_parser!(u32).range(8..=100_000))]
    pub particles: u32,
    /// Seed of the sampler.
    #[arg(long, default_value_t = 1)]
    pub seed: u64,
    #[command(flatten)]
    output: OutputOptions,
}

/// Levels this far beyond the outermost bands are still looked at, cm⁻¹.
const MARGIN: f64 = 400.0;

impl Assign {
    /// Runs the command.
    ///
    /// # Errors
    /// See [`Failure`].
    pub fn run(self) -> Result<Outcome, Failure> {
        let loaded = input::load_table_with(&self.table, self.constants.as_deref())?;
        let listed = band_list::read_file(&self.bands)?;
        let mut notes = loaded.notes;
        notes.extend(listed.notes);
        let (table, bands) = (loaded.value, listed.value);
        let model = resolve(&table);
        notes.extend(model.notes);
        let (low, high) = range_of(&bands);
        let positions = bands.bands.iter().map(|b| b.position.inverse_cm());
        let request = Request {
            window: (
                (positions.clone().fold(low, f64::min) - MARGIN).max(1.0),
                positions.fold(high, f64::max) + MARGIN,
            ),
            quanta: self.quanta,
            budget: BUDGET,
            hot: None,
        };
        let penalty = penalty(&self.forbidden_penalty)?;
        let mut predicted = predict(&table, &model.value, &request).map_err(|e| Failure::Usage(e.to_string()))?;
        match penalty {
            None => predicted.value.retain(|p| p.infrared != Activity::Forbidden),
            Some(decades) => {
                for p in predicted.value.iter_mut().filter(|p| p.infrared == Activity::Forbidden) {
                    p.strength.log10 -= FORBIDDEN_STEP + decades;
                }
            }
        }
        let report = if self.separately {
            let assume = Assumptions { listed: self.top, ..Assumptions::default() };
            let ranked = rank(&predicted.value, &bands, &assume);
            records::assign_report(
                &table,
                &model.value,
                &bands,
                self.quanta,
                &predicted.value,
                &ranked,
                self.top,
                &notes,
            )
        } else {
            let candidates: Vec<Candidate> =
                predicted.value.iter().map(|p| candidate(p, penalty.unwrap_or(0.0))).collect();
            let effort = Effort { particles: self.particles as usize, seed: self.seed, ..Effort::default() };
            let mut options = JointOptions { effort, ..JointOptions::default() };
            options.weighing.strength.forbidden = penalty.unwrap_or(0.0);
            let answer = joint::assign(&model.value, &table, &candidates, &bands, &[], &options);
            let input = records::AssignInput {
                table: &table,
                model: &model.value,
                bands: &bands,
                quanta: self.quanta,
                predicted: &predicted.value,
                top: self.top,
            };
            let report = records::joint_report(&input, &answer, &notes);
            notes.extend(answer.notes);
            report
        };
        tell(&notes);
        let text = match self.output.format {
            Format::Table => render::table(&report),
            Format::Csv => render::csv(&report),
            Format::Json => render::json(&report),
            Format::Html | Format::Svg => return Err(self.output.refuse("assign", "table, csv, json")),
        };
        let inputs: Vec<&Path> = [Some(Path::new(&self.table)), Some(self.bands.as_path()), self.constants.as_deref()]
            .into_iter()
            .flatten()
            .collect();
        self.output.deliver(text.as_bytes(), &inputs)?;
        let unexplained = report.bands.iter().any(|b| {
            b.candidates.first().is_none_or(|c| c.probability <= b.other_origin.probability)
                && b.families.first().is_none_or(|f| f.probability <= b.other_origin.probability)
        });
        Ok(if unexplained { Outcome::Unexplained } else { Outcome::Done })
    }
}

/// `--forbidden-penalty`: decades, or `None` to leave forbidden levels out.
fn penalty(text: &str) -> Result<Option<f64>, Failure> {
    if text == "exclude" {
        return Ok(None);
    }
    match text.parse::<f64>() {
        Ok(decades) if (0.0..=20.0).contains(&decades) => Ok(Some(decades)),
        _ => Err(Failure::Usage(format!(
            "--forbidden-penalty: expected decades from 0 to 20 or `exclude`, found `{text}`"
        ))),
    }
}

/// A predicted transition as the ranking sees it. The ranking takes off the penalty of a selection rule by itself.
fn candidate(predicted: &Predicted, penalty: f64) -> Candidate {
    let forbidden = predicted.infrared == Activity::Forbidden;
    Candidate {
        level: predicted.level.clone(),
        mean: predicted.position,
        forbidden,
        strength: Some(if forbidden { predicted.strength.log10 + penalty } else { predicted.strength.log10 }),
        mixed: None,
    }
}
