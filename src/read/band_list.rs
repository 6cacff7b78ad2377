//! Band lists: what was observed on one sample.

use std::collections::BTreeMap;
use std::path::Path;

use super::delimited::{Delimited, Limits, closest, text_of};
use super::error::{Complaint, Complaints};
use super::mode_table::{not_negative, positive, strength};
use crate::band::{Band, BandList, Feature};
use crate::note::{Note, Noted};
use crate::quantity::{AxisUnit, Medium, Window};

const COLUMNS: [&str; 9] = ["band", "position", "unit", "sigma", "fwhm", "strength", "feature", "note", "source"];

const REQUIRED: [&str; 3] = ["band", "position", "unit"];

const KEYS: [&str; 5] = ["medium", "sample", "range", "detection_limit", "source"];

/// Most bands of one list. A person or `pick` finds tens; more is a spectrum.
const MOST_BANDS: usize = 2_000;

/// Highest position that can be meant, cm⁻¹ (0.33 µm).
const HIGHEST: f64 = 30_000.0;

/// Standard uncertainty of a band position where the list gives none, cm⁻¹ (a judgement of this project: the reading
/// error of a broad solid band).
pub const BAND_SIGMA: f64 = 8.0;

/// What an unstated medium of a wavelength can cost: 1.4 cm⁻¹ at 1.94 µm, half of it as shift and as uncertainty.
const MEDIUM_SIGMA: f64 = 0.7;

/// Reads the band list in a file.
///
/// # Errors
/// All complaints about the file at once.
pub fn read_file(path: &Path) -> Result<Noted<BandList>, Complaints> {
    let text = text_of(path, Limits::default())?;
    read(&path.display().to_string(), &text)
}

/// Reads the band list in `text`.
///
/// # Errors
/// All complaints at once: layout, units, numbers, duplicate bands, a range that is none.
pub fn read(name: &str, text: &str) -> Result<Noted<BandList>, Complaints> {
    let sheet = Delimited::parse(name, text, &COLUMNS, &REQUIRED, Limits { rows: MOST_BANDS, ..Limits::default() })?;
    let mut complaints = Complaints::default();
    let mut notes = sheet.notes.clone();
    let [Some(band_at), Some(position_at), Some(unit_at)] = REQUIRED.map(|wanted| sheet.column(wanted)) else {
        return Err(Complaint::about_file(name, REQUIRED.join(", "), "fewer columns").into());
    };
    let mut list = BandList { name: name.to_owned(), ..BandList::default() };
    for entry in &sheet.metadata {
        if !KEYS.contains(&entry.key.as_str())
            && let Some(near) = closest(&entry.key, KEYS)
        {
            let key = super::error::shown(&entry.key);
            notes.push(Note::new(format!("{name}: metadata `{key}` is not used; did you mean `{near}`?")));
        }
    }
    if let Some(cell) = sheet.metadatum("medium").filter(|cell| !cell.text.is_empty()) {
        list.medium_given = true;
        match cell.text.to_lowercase().as_str() {
            "vacuum" => list.medium = Medium::Vacuum,
            "air" => list.medium = Medium::Air,
            _ => complaints.0.push(cell.complain("`vacuum` or `air`")),
        }
    }
    if let Some(cell) = sheet.metadatum("sample") {
        list.sample = cell.text.clone();
    }
    if let Some(cell) = sheet.metadatum("range").filter(|cell| !cell.text.is_empty()) {
        match Window::from_text(&cell.text, list.medium) {
            Ok(window) => list.range = Some((window.low(), window.high())),
            Err(_) => {
                complaints.0.push(cell.complain("a range with its unit").hint("like `1.0:2.6 um` or `4000:8000 cm-1`"))
            }
        }
    }
    if let Some(cell) = sheet.metadatum("detection_limit").filter(|cell| !cell.text.is_empty()) {
        list.detection_limit = Some(positive(cell, "a detection limit", 1.0e6, &mut complaints));
    }
    let mut first_line: BTreeMap<String, usize> = BTreeMap::new();
    let mut in_wavelength = false;
    let mut without = 0;
    for row in &sheet.rows {
        let before = complaints.0.len();
        let id = &row[band_at];
        if id.text.is_empty() {
            complaints.0.push(id.complain("a band id").hint("every band needs a unique name"));
        } else if let Some(first) = first_line.insert(id.text.clone(), id.line) {
            complaints.0.push(
                id.complain("a band id that is new").hint(format!("`{}` is already defined at line {first}", id.text)),
            );
        }
        let unit = AxisUnit::from_text(&row[unit_at].text);
        if unit.is_none() {
            complaints.0.push(row[unit_at].complain("a unit").hint("um, nm or cm-1"));
        }
        let value = positive(&row[position_at], "a position", 1.0e5, &mut complaints);
        let sigma = sheet.filled(row, "sigma").map(|cell| not_negative(&cell, "an uncertainty", &mut complaints));
        let fwhm = sheet.filled(row, "fwhm").map(|cell| positive(&cell, "a width", 1.0e5, &mut complaints));
        let band_strength = sheet.filled(row, "strength").and_then(|cell| strength(&cell, &mut complaints));
        let feature = match sheet.filled(row, "feature") {
            None => Feature::Band,
            Some(cell) => match cell.text.to_lowercase().as_str() {
                "band" => Feature::Band,
                "shoulder" => Feature::Shoulder,
                "edge" => Feature::Edge,
                _ => {
                    complaints.0.push(cell.complain("`band`, `shoulder` or `edge`"));
                    Feature::Band
                }
            },
        };
        let Some(unit) = unit else { continue };
        let position = match unit.wavenumber(value, list.medium) {
            Ok(position) if (50.0..=HIGHEST).contains(&position.inverse_cm()) => position,
            _ => {
                if complaints.0.len() == before {
                    let hint = match unit {
                        AxisUnit::Micrometre if value > 200.0 => "this looks like nm or cm-1: check the unit",
                        AxisUnit::Nanometre if value < 200.0 => "this looks like um: check the unit",
                        AxisUnit::InverseCentimetre if value < 50.0 => "this looks like um: check the unit",
                        _ => "is the unit right?",
                    };
                    complaints.0.push(row[position_at].complain("a position between 50 and 30000 cm⁻¹").hint(hint));
                }
                continue;
            }
        };
        if complaints.0.len() > before {
            continue;
        }
        let in_cm = |width: f64| unit.width_inverse_cm(width, position);
        let wavelength = unit != AxisUnit::InverseCentimetre;
        in_wavelength |= wavelength;
        without += usize::from(sigma.is_none());
        let mut sigma_cm = sigma.map_or(BAND_SIGMA, in_cm);
        if wavelength && !list.medium_given {
            sigma_cm = sigma_cm.hypot(MEDIUM_SIGMA);
        }
        list.bands.push(Band {
            id: id.text.clone(),
            position,
            sigma: sigma_cm,
            sigma_given: sigma.is_some(),
            fwhm: fwhm.map(in_cm),
            strength: band_strength,
            feature,
            note: sheet.filled(row, "note").map_or_else(String::new, |cell| cell.text),
        });
    }
    if sheet.rows.is_empty() {
        complaints
            .0
            .push(Complaint::about_file(name, "at least one band", "").hint("the list has a header but no rows"));
    }
    if in_wavelength && !list.medium_given {
        notes.push(Note::new(format!(
            "{name}: `# medium: air` or `# medium: vacuum` is not stated; wavelengths are taken as vacuum, which can be \
             1 to 2 cm⁻¹ off"
        )));
    }
    if without > 0 {
        notes.push(Note::new(format!(
            "{name}: {without} of {} bands have no sigma; {BAND_SIGMA} cm⁻¹ is assumed",
            list.bands.len()
        )));
    }
    if let Some((low, high)) = list.range {
        for band in &list.bands {
            if !(low..=high).contains(&band.position.inverse_cm()) {
                notes.push(Note::new(format!("{name}: band `{}` lies outside the stated range", band.id)));
            }
        }
    }
    complaints.or(Noted { value: list, notes })
}
