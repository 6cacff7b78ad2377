//! `modes`: normal modes, motions and a mode table from a Hessian.

use std::path::PathBuf;

use super::output::{Format, OutputOptions};
use super::{Failure, Outcome, tell};
use crate::library::scale_factors::{ScaleFactor, relative_sigma, scale_factor};
use crate::note::Note;
use crate::physics::computed_table::{mode_table, moiety_name};
use crate::physics::elements::Exchange;
use crate::physics::hessian_faults::findings;
use crate::physics::moieties::structure;
use crate::physics::motion::describe;
use crate::physics::normal_modes::{masses, normal_modes};
use crate::physics::table_faults::Severity;
use crate::read::qcschema;
use crate::render::mode_table::csv;
use crate::render::modes::{BondRecord, ModeRecord, ModesReport, json, table};

/// Normal modes, motions and a mode table from a Hessian (QCSchema JSON); exit code 1 when a fault is found.
///
/// With `--format csv` the answer is a mode table that `predict` reads: harmonic wavenumbers, or with `--scale`
/// fundamentals.
#[derive(Debug, clap::Args)]
pub struct Modes {
    /// QCSchema result with driver `hessian`.
    #[arg(value_name = "HESSIAN.json")]
    pub hessian: PathBuf,
    /// Exchange isotopes: `H=D`, `O=18O` (several separated by commas).
    #[arg(long, value_name = "H=D", value_delimiter = ',')]
    pub exchange: Vec<String>,
    /// Fundamentals by a scale factor: `auto` (published for the level of theory) or a number.
    #[arg(long, value_name = "auto|VALUE")]
    pub scale: Option<String>,
    /// What the substance should be, to check atoms and waters: `Mg(H2O)6(ClO4)2`.
    #[arg(long, value_name = "FORMULA")]
    pub formula: Option<String>,
    #[command(flatten)]
    output: OutputOptions,
}

impl Modes {
    /// Runs the command.
    ///
    /// # Errors
    /// See [`Failure`].
    pub fn run(self) -> Result<Outcome, Failure> {
        let exchanges = self
            .exchange
            .iter()
            .map(|text| Exchange::from_text(text))
            .collect::<Result<Vec<_>, _>>()
            .map_err(Failure::Usage)?;
        let read = qcschema::read_file(&self.hessian)?;
        let (record, mut notes) = (read.value, read.notes);
        let scale = self.scale_of(&record)?;
        let masses = masses(&record, &exchanges).map_err(Failure::Usage)?;
        let modes = normal_modes(&record, &masses);
        let structure = structure(&record.symbols, &record.geometry, &masses);
        let described = describe(&record, &modes, &structure);
        let faults = findings(&record, &modes, &structure, &described, self.formula.as_deref());
        let built = mode_table(&record, &modes, &structure, &described, scale.as_ref(), &exchanges);
        notes.extend(built.notes);
        let mut built = built.value;
        built.formula = self.formula.clone().unwrap_or_default();
        notes.extend(scale.iter().map(|s| Note::new(format!("scale factor {:.4}: {}", s.factor, s.source))));
        let name = |fragment: usize| structure.fragments[fragment].name.clone();
        let rounded = |value: f64, digits: i32| (value * 10.0_f64.powi(digits)).round() / 10.0_f64.powi(digits) + 0.0;
        let report = ModesReport {
            schema: "bandwright/modes/1",
            file: self.hessian.display().to_string(),
            level_of_theory: record.level_of_theory(),
            basis: if scale.is_some() { "fundamental" } else { "harmonic" },
            scale: scale.as_ref().map(|s| s.factor),
            scale_sigma: scale.as_ref().map(|s| s.relative_sigma),
            exchange: self.exchange.clone(),
            moieties: structure
                .fragments
                .iter()
                .map(|f| f.name.clone())
                .chain(structure.skeletons.values().cloned())
                .collect(),
            hydrogen_bonds: structure
                .hydrogen_bonds
                .iter()
                .map(|b| BondRecord {
                    donor: name(b.donor),
                    acceptor: name(b.acceptor),
                    length_angstrom: rounded(b.length, 3),
                })
                .collect(),
            residual_cm1: modes.translations.iter().chain(&modes.rotations).map(|v| rounded(*v, 2)).collect(),
            modes: modes
                .modes
                .iter()
                .zip(&described)
                .enumerate()
                .map(|(number, (mode, d))| ModeRecord {
                    mode: format!("q{}", number + 1),
                    wavenumber_cm1: rounded(mode.wavenumber, 4),
                    scaled_cm1: scale.as_ref().map(|s| rounded(s.factor * mode.wavenumber, 2)),
                    reduced_mass_amu: rounded(mode.reduced_mass, 5),
                    motion: d.motion().name().to_owned(),
                    description: d.words(),
                    purity: rounded(d.purity, 4),
                    moiety: moiety_name(&structure, d),
                    concentration: rounded(d.concentration, 4),
                    fractions: structure
                        .fragments
                        .iter()
                        .zip(&d.fractions)
                        .map(|(f, share)| (f.name.clone(), rounded(*share, 4)))
                        .collect(),
                    ir_km_mol: mode.infrared.map(|i| rounded(i, 4)),
                })
                .collect(),
            faults,
            notes: notes.iter().map(ToString::to_string).collect(),
        };
        tell(&notes);
        let text = match self.output.format {
            Format::Table => table(&report),
            Format::Json => json(&report),
            Format::Csv => {
                // A mode table has no room for faults; they are told beside it.
                let told: Vec<Note> =
                    report.faults.iter().map(|f| Note::new(format!("fault or doubt: {}", f.message))).collect();
                tell(&told);
                csv(&built)
            }
            Format::Html | Format::Svg => return Err(self.output.refuse("modes", "table, csv, json")),
        };
        self.output.deliver(text.as_bytes(), &[self.hessian.as_path()])?;
        let faulty = report.faults.iter().any(|f| f.severity == Severity::Fault);
        Ok(if faulty { Outcome::Unexplained } else { Outcome::Done })
    }

    fn scale_of(&self, record: &qcschema::HessianRecord) -> Result<Option<ScaleFactor>, Failure> {
        let Some(text) = self.scale.as_deref().map(str::trim) else { return Ok(None) };
        if text.eq_ignore_ascii_case("auto") {
            return scale_factor(&record.method, &record.basis).map(Some).ok_or_else(|| {
                Failure::Usage(format!(
                    "no scale factor is published here for {}\n  hint: give a number with --scale, or leave the option out \
                     and keep the harmonic wavenumbers",
                    record.level_of_theory()
                ))
            });
        }
        match text.parse::<f64>() {
            // Published factors lie between 0.88 and 1.01; others are slips like 96 for 0.96.
            Ok(factor) if (0.5..=1.5).contains(&factor) => {
                let source = "given on the command line".to_owned();
                Ok(Some(ScaleFactor { factor, relative_sigma: relative_sigma(&record.method), source }))
            }
            _ => {
                Err(Failure::Usage(format!("--scale {text}: expected auto or a factor between 0.5 and 1.5, like 0.96")))
            }
        }
    }
}
