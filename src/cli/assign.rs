//! `assign`: which level is which band.

use super::output::{Format, OutputOptions};
use super::ranking::RankingArguments;
use super::{Failure, Outcome, tell};
use crate::assign::single::{Assumptions, rank};
use crate::band::Spectrum;
use crate::observe::Picked;
use crate::render::drawing::PlottedSpectrum;
use crate::render::{assign as render, html, records};

/// Ranks the levels of a table as candidates for observed bands.
#[derive(Debug, clap::Args)]
pub struct Assign {
    #[command(flatten)]
    ranking: RankingArguments,
    /// Candidates listed per band.
    #[arg(long, default_value_t = 10, value_name = "N")]
    pub top: usize,
    /// Rank every band by itself instead of all jointly.
    #[arg(long, conflicts_with = "companions")]
    pub separately: bool,
    #[command(flatten)]
    output: OutputOptions,
}

impl Assign {
    /// Runs the command.
    ///
    /// # Errors
    /// See [`Failure`].
    pub fn run(self) -> Result<Outcome, Failure> {
        let prepared = self.ranking.prepare()?;
        let mut notes = prepared.notes.clone();
        let input = records::AssignInput {
            table: &prepared.table,
            model: &prepared.model,
            bands: &prepared.bands,
            quanta: self.ranking.quanta,
            predicted: &prepared.predicted,
            top: self.top,
        };
        let report = if self.separately {
            let assume = Assumptions { listed: self.top, ..Assumptions::default() };
            let ranked = rank(&prepared.predicted, &prepared.bands, &assume);
            records::assign_report(&input, &ranked, &notes)
        } else {
            let answer = prepared.answer();
            let coincidence = self.ranking.coincidence(&prepared);
            let report = records::joint_report(&input, &answer, coincidence.as_ref(), &notes);
            notes.extend(answer.notes);
            report
        };
        tell(&notes);
        let text = match self.output.format {
            Format::Table => render::table(&report),
            Format::Csv => render::csv(&report),
            Format::Json => render::json(&report),
            Format::Html => {
                let plotted = prepared.observed.as_ref().map(|(spectrum, picked)| plotted(spectrum, picked));
                html::assign(&report, plotted.as_ref())
            }
            Format::Svg => return Err(self.output.refuse("assign", "table, csv, json, html")),
        };
        self.output.deliver(text.as_bytes(), &self.ranking.inputs())?;
        let unexplained =
            report.bands.iter().any(|b| b.families.first().is_none_or(|f| f.probability <= b.other_origin.probability));
        Ok(if unexplained { Outcome::Unexplained } else { Outcome::Done })
    }
}

/// The measured spectrum over its continuum, as far as the picked window goes.
fn plotted(spectrum: &Spectrum, picked: &Picked) -> PlottedSpectrum {
    let inside = |x: f64| picked.window.contains(x);
    let (wavenumbers, ordinates): (Vec<f64>, Vec<f64>) =
        spectrum.wavenumbers.iter().zip(&spectrum.ordinates).filter(|(x, _)| inside(**x)).unzip();
    PlottedSpectrum {
        name: spectrum.name.clone(),
        continuum: picked.continuum.over(&wavenumbers),
        wavenumbers,
        ordinates,
        ordinate: format!("{:?}", spectrum.ordinate).to_lowercase(),
    }
}
