//! A mode table and its constants as the CSV files that the readers read.

use std::fmt::Write;

use crate::mode::{Basis, ModeTable, Strength, StrengthWord, TableOrigin};

/// The mode table as a CSV file, metadata first.
pub fn csv(table: &ModeTable) -> String {
    let mut text = String::new();
    let mut put = |key: &str, value: &str| {
        if !value.is_empty() {
            // A metadatum is one line.
            let _ = writeln!(text, "# {key}: {}", value.replace(['\n', '\r'], " "));
        }
    };
    put("title", &table.title);
    put("formula", &table.formula);
    let basis = match table.basis {
        Basis::Fundamental => "fundamental",
        Basis::Harmonic => "harmonic",
    };
    put("basis", basis);
    put("point_group", table.point_group.as_deref().unwrap_or(""));
    put("temperature_K", &table.temperature.map_or(String::new(), |t| t.to_string()));
    let origin = match table.origin {
        TableOrigin::Measured => "measured",
        TableOrigin::Computed => "computed",
        TableOrigin::Composed => "composed",
        TableOrigin::Invented => "invented",
    };
    put("origin", origin);
    put("isotopes", &table.isotopes.join("; "));
    put("source", &table.source);
    put("caution", table.caution.as_deref().unwrap_or(""));
    let header = [
        "mode",
        "moiety",
        "motion",
        "wavenumber_cm1",
        "sigma_cm1",
        "degeneracy",
        "species",
        "ir",
        "raman",
        "fwhm_cm1",
        "source",
    ];
    let rows = table.modes.iter().map(|m| {
        vec![
            m.id.clone(),
            table.moieties[m.moiety].name.clone(),
            m.motion.name().to_owned(),
            decimal(m.wavenumber.inverse_cm()),
            decimal(m.sigma),
            m.degeneracy.to_string(),
            m.species.clone().unwrap_or_default(),
            strength(m.ir),
            strength(m.raman),
            m.fwhm.map_or(String::new(), decimal),
            m.source.clone(),
        ]
    });
    text + &sheet(&header, rows)
}

/// The constants of a table as a CSV file.
pub fn constants_csv(table: &ModeTable) -> String {
    let id = |index: usize| table.modes[index].id.clone();
    let header = ["quantity", "mode_a", "mode_b", "mode_c", "value_cm1", "sigma_cm1", "source"];
    let rows = table.constants.iter().map(|k| {
        vec![
            k.kind.name().to_owned(),
            id(k.a),
            id(k.b),
            k.c.map_or(String::new(), id),
            decimal(k.value.0),
            decimal(k.sigma),
            k.source.clone(),
        ]
    });
    sheet(&header, rows)
}

/// A header and rows as CSV text.
pub fn sheet(header: &[&str], rows: impl Iterator<Item = Vec<String>>) -> String {
    let mut writer = csv::Writer::from_writer(Vec::new());
    // Writing to memory cannot fail, and all rows are as long as the header.
    let _ = writer.write_record(header);
    for row in rows {
        let _ = writer.write_record(&row);
    }
    String::from_utf8(writer.into_inner().unwrap_or_default()).unwrap_or_default()
}

/// A number with up to four decimals, without trailing zeros.
pub fn decimal(value: f64) -> String {
    let text = format!("{value:.4}");
    let short = text.trim_end_matches('0').trim_end_matches('.');
    if short == "-0" { "0".to_owned() } else { short.to_owned() }
}

fn strength(value: Option<Strength>) -> String {
    match value {
        None => String::new(),
        Some(Strength::Relative(number)) => number.to_string(),
        Some(Strength::Word(word)) => match word {
            StrengthWord::Strong => "s",
            StrengthWord::Medium => "m",
            StrengthWord::Weak => "w",
            StrengthWord::VeryWeak => "v",
        }
        .to_owned(),
    }
}
