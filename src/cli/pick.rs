//! `pick`: a band list from a spectrum.

use std::path::{Path, PathBuf};

use super::output::{Format, OutputOptions};
use super::{Failure, Outcome, tell};
use crate::band::{Ordinate, Spectrum};
use crate::note::Noted;
use crate::observe::label::Label;
use crate::observe::picking::FEWEST_POINTS;
use crate::observe::width::Resolution;
use crate::observe::{PickOptions, Picked, pick};
use crate::quantity::{AxisUnit, Medium, Window};
use crate::read::spectrum::{SpectrumOptions, read_spectrum};
use crate::render::pick as render;

/// What a spectrum file leaves open, and how its bands are picked.
#[derive(Clone, Debug, clap::Args)]
pub struct SpectrumArguments {
    /// What wavelengths were measured in (wavenumbers need no medium).
    #[arg(long, value_enum)]
    pub medium: Option<Medium>,
    /// Unit of the axis.
    #[arg(long, value_enum)]
    pub axis: Option<AxisUnit>,
    /// What the ordinates are.
    #[arg(long, value_enum)]
    pub ordinate: Option<OrdinateName>,
    /// Whether ordinates are percent.
    #[arg(long, value_name = "true|false")]
    pub percent: Option<bool>,
    /// Column of the ordinates in a text of several columns: name, or number from one.
    #[arg(long, value_name = "COLUMN")]
    pub column: Option<String>,
    /// Block of a compound JCAMP-DX file: number from one, or a part of its title.
    #[arg(long, value_name = "BLOCK")]
    pub block: Option<String>,
    /// Instrument resolution (full width at half maximum), like 10nm or 4cm-1: widths are freed of it.
    #[arg(long, value_name = "WIDTH")]
    pub resolution: Option<String>,
    /// Least depth by which a band stands out, as a fraction of the continuum.
    #[arg(long, value_name = "FRACTION", default_value_t = 0.012)]
    pub least_depth: f64,
    /// Do not look for shoulders and edges.
    #[arg(long)]
    pub no_shoulders: bool,
    /// Check that the spectrum fits its label: hydrate, anhydrous, or a formula like CaSO4.2H2O.
    #[arg(long, value_name = "LABEL")]
    pub label_check: Option<String>,
}

/// What the ordinates are.
#[derive(Clone, Copy, Debug, PartialEq, Eq, clap::ValueEnum)]
pub enum OrdinateName {
    /// Reflectance, bands are minima.
    Reflectance,
    /// Transmittance, bands are minima.
    Transmittance,
    /// Absorbance, bands are maxima.
    Absorbance,
}

impl SpectrumArguments {
    /// Reads the spectrum in `path` and picks its bands between `window` (all that is sensible without one).
    ///
    /// # Errors
    /// [`Failure::Usage`] for options that say nothing, [`Failure::Input`] for a file that cannot be used, or that has too
    /// few points in the window.
    pub fn observe(&self, path: &Path, window: Option<&str>) -> Result<Noted<(Spectrum, Picked)>, Failure> {
        let usage = |text: String| Err(Failure::Usage(text));
        // A window in wavelength is meant as the wavelengths of the file are.
        let medium = self.medium.unwrap_or_default();
        let window = match window.map(|text| Window::from_text(text, medium)).transpose() {
            Ok(window) => window,
            Err(error) => return usage(error.to_string()),
        };
        let resolution = match &self.resolution {
            None => None,
            Some(text) => match Resolution::from_text(text) {
                Some(resolution) => Some(resolution),
                None => {
                    return usage(format!(
                        "`{text}` is no resolution\n  hint: a width and its unit, like 10nm or 4cm-1"
                    ));
                }
            },
        };
        let label = match &self.label_check {
            None => None,
            Some(text) => match Label::from_text(text) {
                Some(label) => Some(label),
                None => {
                    return usage(format!(
                        "`{text}` is no label\n  hint: hydrate, anhydrous, or a formula like CaSO4.2H2O"
                    ));
                }
            },
        };
        if !(self.least_depth > 0.0 && self.least_depth < 1.0) {
            return usage(format!(
                "--least-depth {} is no fraction\n  hint: between 0 and 1, like 0.01",
                self.least_depth
            ));
        }
        let options = SpectrumOptions {
            axis: self.axis,
            medium: self.medium,
            ordinate: self.ordinate.map(|name| match name {
                OrdinateName::Reflectance => Ordinate::Reflectance,
                OrdinateName::Transmittance => Ordinate::Transmittance,
                OrdinateName::Absorbance => Ordinate::Absorbance,
            }),
            percent: self.percent,
            column: self.column.clone(),
            block: self.block.clone(),
        };
        let read = read_spectrum(path, &options)?;
        let picking = PickOptions {
            window,
            resolution,
            least_depth: self.least_depth,
            shoulders: !self.no_shoulders,
            label,
            ..PickOptions::default()
        };
        let picked = pick(&read.value, &picking);
        if picked.value.wavenumbers.len() < FEWEST_POINTS {
            let range = match (read.value.wavenumbers.first(), read.value.wavenumbers.last()) {
                (Some(low), Some(high)) => format!("{low:.0}:{high:.0}cm-1"),
                _ => "nothing".to_owned(),
            };
            return usage(format!(
                "{}: {} points lie in the window, too few to pick bands\n  hint: the spectrum covers {range}",
                path.display(),
                picked.value.wavenumbers.len()
            ));
        }
        let notes = read.notes.into_iter().chain(picked.notes).collect();
        Ok(Noted { value: (read.value, picked.value), notes })
    }
}

/// A band list from a spectrum: continuum removed, positions with uncertainty, widths, depths.
#[derive(Debug, clap::Args)]
pub struct Pick {
    /// Spectrum: JCAMP-DX, or columns of text (wavelength or wavenumber, and reflectance, transmittance or absorbance).
    pub spectrum: PathBuf,
    /// Part of the spectrum: `1.0:2.6um`, `4000:8000` (cm-1). Without it the near infrared, 2.55 to 0.85 um, as far as
    /// measured.
    #[arg(long, value_name = "RANGE")]
    pub window: Option<String>,
    #[command(flatten)]
    arguments: SpectrumArguments,
    #[command(flatten)]
    output: OutputOptions,
}

impl Pick {
    /// Runs the command.
    ///
    /// # Errors
    /// See [`Failure`].
    pub fn run(self) -> Result<Outcome, Failure> {
        if matches!(self.output.format, Format::Html | Format::Svg) {
            return Err(self.output.refuse("pick", "table, csv, json"));
        }
        let observed = self.arguments.observe(&self.spectrum, self.window.as_deref())?;
        let (_, picked) = &observed.value;
        let report = render::report(picked, &observed.notes);
        tell(&observed.notes);
        let text = match self.output.format {
            Format::Csv => render::csv(picked),
            Format::Json => render::json(&report),
            _ => render::table(&report),
        };
        self.output.deliver(text.as_bytes(), &[&self.spectrum])?;
        Ok(if picked.contradictions.is_empty() { Outcome::Done } else { Outcome::Unexplained })
    }
}
