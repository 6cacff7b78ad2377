//! What `assign` and `advise` share: a table, bands, companions, and the joint answer.

use std::path::{Path, PathBuf};

use super::pick::SpectrumArguments;
use super::{Failure, input};
use crate::assign::candidate::Candidate;
use crate::assign::chance::{Coincidence, bundled_ranges, list_test};
use crate::assign::joint::{self, JointAnswer, JointOptions};
use crate::assign::sampler::Effort;
use crate::assign::single::range_of;
use crate::assign::witness::Witness;
use crate::band::{BandList, Spectrum};
use crate::enumerate::prediction::{BUDGET, Predicted, Request, predict};
use crate::evidence::companion::Testimony;
use crate::mode::ModeTable;
use crate::note::Note;
use crate::observe::Picked;
use crate::physics::anharmonicity::resolve;
use crate::physics::position::Model;
use crate::physics::strength::FORBIDDEN_STEP;
use crate::physics::symmetry::Activity;
use crate::read::{Complaint, band_list, companions};

/// Options of a ranking.
#[derive(Debug, clap::Args)]
pub struct RankingArguments {
    /// Mode table: a file or a bundled name (`bandwright tables`).
    pub table: String,
    /// Band list.
    #[arg(long, value_name = "FILE", required_unless_present = "spectrum", conflicts_with = "spectrum")]
    pub bands: Option<PathBuf>,
    /// Spectrum whose bands are picked first.
    #[arg(long, value_name = "FILE")]
    pub spectrum: Option<PathBuf>,
    /// Part of the spectrum to pick in: `1.0:2.6um`, `4000:8000` (cm-1).
    #[arg(long, value_name = "RANGE", requires = "spectrum")]
    pub window: Option<String>,
    /// How to read the spectrum.
    #[command(flatten)]
    pub reading: SpectrumArguments,
    /// What related samples show or lack.
    #[arg(long, value_name = "FILE")]
    pub companions: Option<PathBuf>,
    /// Constants file to use instead of the one beside the table.
    #[arg(long, value_name = "FILE")]
    pub constants: Option<PathBuf>,
    /// Most quanta of a level.
    #[arg(long, default_value_t = 4, value_parser = clap::value_parser!(u8).range(1..=9))]
    pub quanta: u8,
    /// Decades of strength that a level forbidden by symmetry loses; `exclude` leaves such levels out.
    #[arg(long, default_value = "1", value_name = "DECADES|exclude")]
    pub forbidden_penalty: String,
    /// Members of the sampler's population.
    #[arg(long, default_value_t = 256, value_name = "N", value_parser = clap::value_parser!(u32).range(8..=100_000))]
    pub particles: u32,
    /// Tables drawn for the test of the whole list against chance; 0 leaves the test out.
    #[arg(long, default_value_t = 199, value_name = "N", value_parser = clap::value_parser!(u32).range(0..=100_000))]
    pub trials: u32,
    /// Seed of the sampler and of the test against chance.
    #[arg(long, default_value_t = 1)]
    pub seed: u64,
}

/// Levels this far beyond the outermost bands are still looked at, cm⁻¹.
const MARGIN: f64 = 400.0;

/// Everything loaded and predicted, before the ranking.
pub struct Prepared {
    /// The table.
    pub table: ModeTable,
    /// Its model.
    pub model: Model,
    /// The bands.
    pub bands: BandList,
    /// The spectrum they were picked from.
    pub observed: Option<(Spectrum, Picked)>,
    /// Transitions near and in the range.
    pub predicted: Vec<Predicted>,
    /// The same as the ranking sees them, one for one.
    pub candidates: Vec<Candidate>,
    /// What companions say.
    pub testimony: Option<Testimony>,
    /// How to rank.
    pub options: JointOptions,
    /// What to know.
    pub notes: Vec<Note>,
}

impl RankingArguments {
    /// Files that an answer may not be written over.
    pub fn inputs(&self) -> Vec<&Path> {
        let files = [&self.bands, &self.spectrum, &self.companions, &self.constants];
        files.into_iter().flatten().map(PathBuf::as_path).chain([Path::new(&self.table)]).collect()
    }

    /// Loads the files and predicts the transitions.
    ///
    /// # Errors
    /// See [`Failure`].
    pub fn prepare(&self) -> Result<Prepared, Failure> {
        let penalty = penalty(&self.forbidden_penalty)?;
        let loaded = input::load_table_with(&self.table, self.constants.as_deref())?;
        let (table, mut notes) = (loaded.value, loaded.notes);
        let (bands, observed) = match (&self.bands, &self.spectrum) {
            (Some(file), _) => {
                let listed = band_list::read_file(file)?;
                notes.extend(listed.notes);
                (listed.value, None)
            }
            (None, Some(file)) => {
                let seen = self.reading.observe(file, self.window.as_deref())?;
                notes.extend(seen.notes);
                let list = seen.value.1.list.clone();
                if list.bands.is_empty() {
                    let name = file.display().to_string();
                    let complaint =
                        Complaint::about_file(&name, "a spectrum with at least one band", "none stands out");
                    return Err(Failure::Input(complaint.hint("widen --window or lower --least-depth").into()));
                }
                (list, Some(seen.value))
            }
            (None, None) => return Err(Failure::Usage("give --bands or --spectrum".to_owned())),
        };
        let model = resolve(&table);
        notes.extend(model.notes);
        let model = model.value;
        let testimony = match &self.companions {
            None => None,
            Some(file) => {
                let read = companions::read_file(file, &table, &bands)?;
                notes.extend(read.notes);
                let heard = Testimony::new(&table, &model, &bands, &read.value);
                notes.extend(heard.notes);
                Some(heard.value)
            }
        };
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
        let mut predicted = predict(&table, &model, &request).map_err(|e| Failure::Usage(e.to_string()))?;
        notes.extend(predicted.notes);
        match penalty {
            None => predicted.value.retain(|p| p.infrared != Activity::Forbidden),
            Some(decades) => {
                for p in predicted.value.iter_mut().filter(|p| p.infrared == Activity::Forbidden) {
                    p.strength.log10 -= FORBIDDEN_STEP + decades;
                }
            }
        }
        let candidates = predicted.value.iter().map(|p| candidate(p, penalty.unwrap_or(0.0))).collect();
        let effort = Effort { particles: self.particles as usize, seed: self.seed, ..Effort::default() };
        let mut options = JointOptions { effort, ..JointOptions::default() };
        options.weighing.strength.forbidden = penalty.unwrap_or(0.0);
        Ok(Prepared {
            table,
            model,
            bands,
            observed,
            predicted: predicted.value,
            candidates,
            testimony,
            options,
            notes,
        })
    }

    /// The whole list against chance; `None` when no trials are wanted.
    pub fn coincidence(&self, prepared: &Prepared) -> Option<Coincidence> {
        (self.trials > 0).then(|| {
            let ranges = bundled_ranges(&prepared.table);
            let draws = (self.trials as usize, self.seed);
            let weighing = &prepared.options.weighing;
            list_test(&prepared.model, &prepared.table, &prepared.bands, weighing, self.quanta, &ranges, draws)
        })
    }
}

impl Prepared {
    /// The joint answer.
    pub fn answer(&self) -> JointAnswer {
        let witnesses: Vec<&dyn Witness> = self.testimony.iter().map(|t| t as &dyn Witness).collect();
        joint::assign(&self.model, &self.table, &self.candidates, &self.bands, &witnesses, &self.options)
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
        mixed: predicted.gradient.clone().map(Box::new),
    }
}
