//! A band list as the CSV file that its reader reads.

use std::fmt::Write;

use super::mode_table::sheet;
use crate::band::BandList;
use crate::mode::{Strength, StrengthWord};

/// The columns.
pub const HEADER: [&str; 8] = ["band", "position", "unit", "sigma", "fwhm", "strength", "feature", "note"];

/// A strength as it stands in files.
pub fn strength(value: Option<Strength>) -> String {
    match value {
        None => String::new(),
        Some(Strength::Relative(number)) => short(number, 5),
        Some(Strength::Word(word)) => match word {
            StrengthWord::Strong => "s",
            StrengthWord::Medium => "m",
            StrengthWord::Weak => "w",
            StrengthWord::VeryWeak => "v",
        }
        .to_owned(),
    }
}

/// A number with up to `decimals` decimals, without trailing zeros.
pub fn short(value: f64, decimals: usize) -> String {
    let text = format!("{value:.decimals$}");
    if !text.contains('.') {
        return text;
    }
    let short = text.trim_end_matches('0').trim_end_matches('.');
    if short == "-0" { "0".to_owned() } else { short.to_owned() }
}

/// The band list as CSV: vacuum wavenumbers in cm⁻¹, metadata first.
pub fn csv(list: &BandList) -> String {
    let mut text = String::new();
    let mut put = |key: &str, value: &str| {
        if !value.is_empty() {
            // A metadatum is one line.
            let _ = writeln!(text, "# {key}: {}", value.replace(['\n', '\r'], " "));
        }
    };
    put("sample", &list.sample);
    put("medium", "vacuum");
    put("range", &list.range.map_or(String::new(), |(low, high)| format!("{low:.1}:{high:.1} cm-1")));
    put("detection_limit", &list.detection_limit.map_or(String::new(), |l| short(l, 6)));
    let rows = list.bands.iter().map(|band| {
        vec![
            band.id.clone(),
            format!("{:.2}", band.position.inverse_cm()),
            "cm-1".to_owned(),
            if band.sigma_given { format!("{:.2}", band.sigma) } else { String::new() },
            band.fwhm.map_or(String::new(), |w| short(w, 2)),
            strength(band.strength),
            band.feature.name().to_owned(),
            band.note.replace(['\n', '\r'], " "),
        ]
    });
    text + &sheet(&HEADER, rows)
}
