//! Companions: what related samples show or lack.

use std::path::Path;

use super::delimited::{Delimited, Limits, closest, text_of};
use super::error::{Complaint, Complaints};
use super::mode_table::{not_negative, positive};
use crate::band::{BandList, CompanionRow, Companions, Verdict};
use crate::mode::ModeTable;
use crate::note::Noted;
use crate::quantity::{AxisUnit, Medium};

const COLUMNS: [&str; 10] =
    ["companion", "moieties", "exchange", "band", "verdict", "position", "unit", "sigma", "error_rate", "note"];

const REQUIRED: [&str; 4] = ["companion", "moieties", "band", "verdict"];

/// Reads the companions in a file, for these bands and this table.
///
/// # Errors
/// All complaints about the file at once.
pub fn read_file(path: &Path, table: &ModeTable, bands: &BandList) -> Result<Noted<Companions>, Complaints> {
    let text = text_of(path, Limits::default())?;
    read(&path.display().to_string(), &text, table, bands)
}

/// Reads the companions in `text`, for these bands and this table.
///
/// # Errors
/// All complaints at once: layout, unknown moieties, bands and verdicts, a moved band without a position.
pub fn read(name: &str, text: &str, table: &ModeTable, bands: &BandList) -> Result<Noted<Companions>, Complaints> {
    let sheet = Delimited::parse(name, text, &COLUMNS, &REQUIRED, Limits { rows: 5_000, ..Limits::default() })?;
    let mut complaints = Complaints::default();
    let [Some(companion_at), Some(moieties_at), Some(band_at), Some(verdict_at)] =
        REQUIRED.map(|wanted| sheet.column(wanted))
    else {
        return Err(Complaint::about_file(name, REQUIRED.join(", "), "fewer columns").into());
    };
    let medium = match sheet.metadatum("medium").map(|cell| (cell.text.to_lowercase(), cell)) {
        Some((word, _)) if word == "air" => Medium::Air,
        Some((word, cell)) if word != "vacuum" && !word.is_empty() => {
            complaints.0.push(cell.complain("`vacuum` or `air`"));
            Medium::Vacuum
        }
        _ => Medium::Vacuum,
    };
    let mut rows = Vec::new();
    for row in &sheet.rows {
        let before = complaints.0.len();
        let companion = &row[companion_at];
        if companion.text.is_empty() {
            complaints.0.push(companion.complain("a companion id"));
        }
        let moieties: Vec<String> = row[moieties_at]
            .text
            .split(';')
            .map(|m| m.trim().to_owned())
            .filter(|m| !m.is_empty() && m != "none" && m != "-")
            .collect();
        for moiety in &moieties {
            // A formula stands for all moieties of that formula: `H2O` for `H2O-1` and `H2O-2`.
            if !table.moieties.iter().any(|m| m.name == *moiety || m.formula() == moiety) {
                let names = table.moieties.iter().map(|m| m.name.as_str());
                let hint = closest(moiety, names.clone()).map_or_else(
                    || format!("`{}` has {}", table.name, names.collect::<Vec<_>>().join(", ")),
                    |near| format!("did you mean `{near}`?"),
                );
                complaints.0.push(row[moieties_at].complain("moieties of the mode table, separated by `;`").hint(hint));
            }
        }
        let band = &row[band_at];
        if !band.text.is_empty() && !bands.bands.iter().any(|b| b.id == band.text) {
            let ids = bands.bands.iter().map(|b| b.id.as_str());
            let hint = closest(&band.text, ids.clone()).map_or_else(
                || format!("the list has {}", ids.take(12).collect::<Vec<_>>().join(", ")),
                |near| format!("did you mean `{near}`?"),
            );
            complaints.0.push(band.complain("a band of the band list").hint(hint));
        }
        let verdict = match row[verdict_at].text.to_lowercase().as_str() {
            "present" => Verdict::Present,
            "absent" => Verdict::Absent,
            "moved" => Verdict::Moved,
            "unclear" => Verdict::Unclear,
            _ => {
                complaints.0.push(row[verdict_at].complain("`present`, `absent`, `moved` or `unclear`"));
                Verdict::Unclear
            }
        };
        let unit = sheet.filled(row, "unit").map(|cell| {
            AxisUnit::from_text(&cell.text).unwrap_or_else(|| {
                complaints.0.push(cell.complain("a unit").hint("um, nm or cm-1"));
                AxisUnit::InverseCentimetre
            })
        });
        let position_cell = sheet.filled(row, "position");
        let position = position_cell.as_ref().and_then(|cell| {
            let value = positive(cell, "a position", 1.0e5, &mut complaints);
            let Some(unit) = unit else {
                complaints.0.push(cell.complain("a unit beside the position").hint("fill the column `unit`"));
                return None;
            };
            unit.wavenumber(value, medium).ok().filter(|p| (50.0..=30_000.0).contains(&p.inverse_cm())).or_else(|| {
                if complaints.0.len() == before {
                    complaints.0.push(cell.complain("a position between 50 and 30000 cm⁻¹").hint("is the unit right?"));
                }
                None
            })
        });
        if verdict == Verdict::Moved && position_cell.is_none() {
            complaints.0.push(row[verdict_at].complain("a position beside `moved`").hint("say where it moved to"));
        }
        let sigma = sheet.filled(row, "sigma").map(|cell| not_negative(&cell, "an uncertainty", &mut complaints));
        let error_rate = sheet.filled(row, "error_rate").map(|cell| match cell.number("a probability below 0.5") {
            Ok(value) if (0.0..0.5).contains(&value) => value,
            Ok(_) => {
                complaints.0.push(cell.complain("a probability below 0.5").hint("0.05 is one error in twenty"));
                0.0
            }
            Err(complaint) => {
                complaints.0.push(complaint);
                0.0
            }
        });
        if complaints.0.len() > before {
            continue;
        }
        let sigma = match (sigma, unit, position) {
            (Some(sigma), Some(unit), Some(position)) => Some(unit.width_inverse_cm(sigma, position)),
            (sigma, _, _) => sigma,
        };
        rows.push(CompanionRow {
            companion: companion.text.clone(),
            moieties,
            exchange: sheet.filled(row, "exchange").map_or_else(String::new, |cell| cell.text),
            band: band.text.clone(),
            verdict,
            position,
            sigma,
            error_rate,
            note: sheet.filled(row, "note").map_or_else(String::new, |cell| cell.text),
        });
    }
    complaints.or(Noted { value: Companions { name: name.to_owned(), rows }, notes: sheet.notes.clone() })
}
