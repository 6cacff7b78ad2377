//! The answer of `modes`: text and JSON. The CSV form is a mode table.

use std::collections::BTreeMap;
use std::fmt::Write;

use serde::Serialize;

use crate::physics::table_faults::{Finding, Severity};

/// One mode.
#[derive(Clone, Debug, Serialize)]
pub struct ModeRecord {
    /// Name, as in the mode table.
    pub mode: String,
    /// Harmonic wavenumber, cm⁻¹; negative when imaginary.
    pub wavenumber_cm1: f64,
    /// Fundamental by scale factor, cm⁻¹, where one was asked for.
    pub scaled_cm1: Option<f64>,
    /// Reduced mass, u.
    pub reduced_mass_amu: f64,
    /// Motion, as in mode tables.
    pub motion: String,
    /// The motion in words.
    pub description: String,
    /// Share of that motion.
    pub purity: f64,
    /// Moiety the mode is counted to.
    pub moiety: String,
    /// Part of the motion on that moiety.
    pub concentration: f64,
    /// Kinetic fraction by moiety.
    pub fractions: BTreeMap<String, f64>,
    /// Infrared strength, km/mol.
    pub ir_km_mol: Option<f64>,
}

/// A hydrogen bond between moieties.
#[derive(Clone, Debug, Serialize)]
pub struct BondRecord {
    /// Gives the proton.
    pub donor: String,
    /// Takes it.
    pub acceptor: String,
    /// H···O, Å.
    pub length_angstrom: f64,
}

/// All of the answer.
#[derive(Clone, Debug, Serialize)]
pub struct ModesReport {
    /// `bandwright/modes/1`.
    pub schema: &'static str,
    /// File.
    pub file: String,
    /// Level of theory.
    pub level_of_theory: String,
    /// `harmonic` or `fundamental`: what the mode table holds.
    pub basis: &'static str,
    /// Scale factor, where one was asked for.
    pub scale: Option<f64>,
    /// Relative uncertainty of a scaled wavenumber.
    pub scale_sigma: Option<f64>,
    /// Isotopes exchanged.
    pub exchange: Vec<String>,
    /// Moieties found in the geometry.
    pub moieties: Vec<String>,
    /// Hydrogen bonds between them.
    pub hydrogen_bonds: Vec<BondRecord>,
    /// Translations and rotations before projection, cm⁻¹.
    pub residual_cm1: Vec<f64>,
    /// Modes, ascending.
    pub modes: Vec<ModeRecord>,
    /// What is wrong or doubtful.
    pub faults: Vec<Finding>,
    /// What to know.
    pub notes: Vec<String>,
}

/// JSON.
pub fn json(report: &ModesReport) -> String {
    serde_json::to_string_pretty(report).unwrap_or_default() + "\n"
}

/// Text for people.
pub fn table(report: &ModesReport) -> String {
    let mut text = String::new();
    // Writing to a string cannot fail.
    let _ = writeln!(text, "{} at {}", report.file, report.level_of_theory);
    let _ = writeln!(text, "moieties: {}", report.moieties.join(", "));
    if let (Some(scale), Some(sigma)) = (report.scale, report.scale_sigma) {
        let _ = writeln!(text, "fundamentals: harmonic × {scale:.4}, each uncertain by {:.1} %", 100.0 * sigma);
    }
    let _ = writeln!(
        text,
        "\nmode    cm-1{}    km/mol  reduced/u  purity  motion",
        if report.scale.is_some() { "    scaled" } else { "" }
    );
    for mode in &report.modes {
        let scaled = mode.scaled_cm1.map_or(String::new(), |s| format!("  {s:8.1}"));
        let infrared = mode.ir_km_mol.map_or("-".to_owned(), |i| format!("{i:.2}"));
        let _ = writeln!(
            text,
            "{:<5}{:8.1}{scaled}  {infrared:>8}  {:9.3}  {:6.2}  {} ({}, {:.0} % there)",
            mode.mode,
            mode.wavenumber_cm1,
            mode.reduced_mass_amu,
            mode.purity,
            mode.description,
            mode.moiety,
            100.0 * mode.concentration
        );
    }
    if !report.faults.is_empty() {
        text.push('\n');
    }
    for fault in &report.faults {
        let word = if fault.severity == Severity::Fault { "fault" } else { "doubt" };
        let about = if fault.about.is_empty() { String::new() } else { format!("{}: ", fault.about) };
        let _ = writeln!(text, "{word}: {about}{}", fault.message);
    }
    text
}
