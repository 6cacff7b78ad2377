//! Mode tables: which modes a sample has.

use std::collections::BTreeMap;
use std::path::Path;

use super::delimited::{Cell, Delimited, Limits, closest, text_of};
use super::error::{Complaint, Complaints};
use crate::mode::{Basis, Mode, ModeTable, Motion, Strength, StrengthWord, TableOrigin};
use crate::note::{Note, Noted};
use crate::quantity::Wavenumber;

/// Known columns.
const COLUMNS: [&str; 13] = [
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
    "status",
    "note",
];

/// Columns without which there is no mode table.
const REQUIRED: [&str; 4] = ["mode", "moiety", "motion", "wavenumber_cm1"];

/// Known metadata keys.
const KEYS: [&str; 9] =
    ["title", "formula", "basis", "point_group", "temperature_k", "origin", "source", "caution", "isotopes"];

/// Most modes of one table: a crystal of a few thousand atoms, far beyond what can be enumerated.
const MOST_MODES: usize = 20_000;

/// Highest wavenumber a fundamental can have: H₂ lies at 4161 cm⁻¹; anything above 5000 is not a fundamental.
const HIGHEST: f64 = 5_000.0;

/// Standard uncertainty of a fundamental taken from the literature for the same salt, where the table gives none, cm⁻¹
/// (a judgement of this project, as in `mode_tables/defaults.csv`).
pub const LITERATURE_SIGMA: f64 = 5.0;

/// Relative standard uncertainty of a harmonic wavenumber from quantum chemistry, where the table gives none.
/// After Irikura, Johnson & Kacker, J. Phys. Chem. A 109, 8430 (2005).
pub const COMPUTED_RELATIVE_SIGMA: f64 = 0.02;

/// Standard uncertainty of a composed fundamental, where the table gives none, cm⁻¹ (a judgement of this project).
pub const COMPOSED_SIGMA: f64 = 25.0;

/// Reads the mode table in a file.
///
/// # Errors
/// All complaints about the file at once.
pub fn read_file(path: &Path) -> Result<Noted<ModeTable>, Complaints> {
    let limits = Limits::default();
    let text = text_of(path, limits)?;
    read(&path.display().to_string(), &text)
}

/// Reads the mode table in `text`; `name` is shown in complaints and becomes the table's name (its stem).
///
/// # Errors
/// All complaints at once: layout, missing columns, unknown motions, duplicate modes, numbers that are none.
pub fn read(name: &str, text: &str) -> Result<Noted<ModeTable>, Complaints> {
    let sheet = Delimited::parse(name, text, &COLUMNS, &REQUIRED, Limits { rows: MOST_MODES, ..Limits::default() })?;
    let mut complaints = Complaints::default();
    let mut notes = sheet.notes.clone();
    let mut table = ModeTable { name: stem(name), ..ModeTable::default() };
    read_metadata(&sheet, &mut table, &mut complaints, &mut notes);

    let column = |wanted: &str| sheet.column(wanted);
    let (mode_at, moiety_at, motion_at, wavenumber_at) = match REQUIRED.map(column) {
        [Some(a), Some(b), Some(c), Some(d)] => (a, b, c, d),
        // The required columns were checked when the sheet was parsed.
        _ => return Err(Complaint::about_file(name, REQUIRED.join(", "), "fewer columns").into()),
    };

    let mut first_line: BTreeMap<String, usize> = BTreeMap::new();
    for row in &sheet.rows {
        let before = complaints.0.len();
        let id = &row[mode_at];
        if id.text.is_empty() {
            complaints.0.push(id.complain("a mode id").hint("every mode needs a unique name"));
        } else if let Some(first) = first_line.get(&id.text) {
            complaints.0.push(
                id.complain("a mode id that is new").hint(format!("`{}` is already defined at line {first}", id.text)),
            );
        } else {
            first_line.insert(id.text.clone(), id.line);
        }
        if id.text.contains(['+', ';', '{', '}']) {
            complaints
                .0
                .push(id.complain("a mode id without `+`, `;` or braces").hint("labels join mode ids with ` + `"));
        }
        let moiety = &row[moiety_at];
        if moiety.text.is_empty() {
            complaints.0.push(moiety.complain("a moiety").hint("the group that vibrates: H2O, SO4, MgO6, lattice"));
        }
        let motion = Motion::from_name(&row[motion_at].text).unwrap_or_else(|| {
            let names = Motion::ALL.map(Motion::name);
            let hint = closest(&row[motion_at].text.to_lowercase(), names)
                .map_or_else(|| format!("one of {}", names.join(", ")), |near| format!("did you mean `{near}`?"));
            complaints.0.push(row[motion_at].complain("a motion").hint(hint));
            Motion::Other
        });
        let wavenumber = positive(&row[wavenumber_at], "a wavenumber in cm⁻¹", HIGHEST, &mut complaints);
        let degeneracy = match sheet.filled(row, "degeneracy") {
            None => 1,
            Some(cell) => match cell.text.as_str() {
                "1" => 1,
                "2" => 2,
                "3" => 3,
                _ => {
                    complaints.0.push(cell.complain("a degeneracy of 1, 2 or 3"));
                    1
                }
            },
        };
        let sigma =
            sheet.filled(row, "sigma_cm1").map(|cell| not_negative(&cell, "an uncertainty in cm⁻¹", &mut complaints));
        let fwhm =
            sheet.filled(row, "fwhm_cm1").map(|cell| positive(&cell, "a width in cm⁻¹", 5_000.0, &mut complaints));
        let ir = sheet.filled(row, "ir").and_then(|cell| strength(&cell, &mut complaints));
        let raman = sheet.filled(row, "raman").and_then(|cell| strength(&cell, &mut complaints));
        if complaints.0.len() > before {
            continue;
        }
        let Ok(position) = Wavenumber::from_inverse_cm(wavenumber) else { continue };
        let default_sigma = match table.origin {
            TableOrigin::Measured | TableOrigin::Invented => LITERATURE_SIGMA,
            TableOrigin::Computed => COMPUTED_RELATIVE_SIGMA * wavenumber,
            TableOrigin::Composed => COMPOSED_SIGMA,
        };
        let status = sheet.filled(row, "status").map_or(String::new(), |cell| format!(" [{}]", cell.text));
        let source = sheet.filled(row, "source").map_or_else(|| table.source.clone(), |cell| cell.text);
        let moiety = table.intern_moiety(&moiety.text);
        table.modes.push(Mode {
            id: id.text.clone(),
            moiety,
            motion,
            wavenumber: position,
            sigma: sigma.unwrap_or(default_sigma),
            sigma_given: sigma.is_some(),
            degeneracy,
            species: sheet.filled(row, "species").map(|cell| cell.text),
            ir,
            raman,
            fwhm,
            source: source + &status,
        });
    }
    if sheet.rows.is_empty() {
        complaints
            .0
            .push(Complaint::about_file(name, "at least one mode", "").hint("the table has a header but no rows"));
    }
    table.settle_moieties();
    let without = table.modes.iter().filter(|m| !m.sigma_given).count();
    if without > 0 {
        notes.push(Note::new(format!(
            "{name}: {without} of {} modes have no sigma_cm1; {} is assumed",
            table.modes.len(),
            match table.origin {
                TableOrigin::Computed => "2 % of the wavenumber".to_owned(),
                TableOrigin::Composed => format!("{COMPOSED_SIGMA} cm⁻¹"),
                _ => format!("{LITERATURE_SIGMA} cm⁻¹"),
            }
        )));
    }
    complaints.or(Noted { value: table, notes })
}

/// The file name without folder and extension.
fn stem(name: &str) -> String {
    Path::new(name).file_stem().map_or_else(|| name.to_owned(), |stem| stem.to_string_lossy().into_owned())
}

fn read_metadata(sheet: &Delimited<'_>, table: &mut ModeTable, complaints: &mut Complaints, notes: &mut Vec<Note>) {
    for entry in &sheet.metadata {
        let cell = &entry.value;
        let lower = cell.text.to_lowercase();
        match entry.key.as_str() {
            "title" => table.title = cell.text.clone(),
            "formula" => table.formula = cell.text.replace(['·', '•', '∙', '*'], "."),
            "source" => table.source = cell.text.clone(),
            "caution" if !cell.text.is_empty() => table.caution = Some(cell.text.clone()),
            "point_group" if !cell.text.is_empty() => table.point_group = Some(cell.text.clone()),
            "isotopes" => {
                table.isotopes =
                    cell.text.split([';', ',']).map(|s| s.trim().to_owned()).filter(|s| !s.is_empty()).collect();
            }
            "basis" => match lower.as_str() {
                "fundamental" | "" => table.basis = Basis::Fundamental,
                "harmonic" => table.basis = Basis::Harmonic,
                _ => complaints.0.push(cell.complain("`fundamental` or `harmonic`")),
            },
            "origin" => match lower.as_str() {
                "measured" | "" => table.origin = TableOrigin::Measured,
                "computed" => table.origin = TableOrigin::Computed,
                "composed" => table.origin = TableOrigin::Composed,
                "invented" => table.origin = TableOrigin::Invented,
                _ => complaints.0.push(cell.complain("`measured`, `computed`, `composed` or `invented`")),
            },
            "temperature_k" if !cell.text.is_empty() => {
                let value = positive(cell, "a temperature in K", 5_000.0, complaints);
                table.temperature = Some(value);
            }
            key if !KEYS.contains(&key) => {
                if let Some(near) = closest(key, KEYS) {
                    notes.push(Note::new(format!(
                        "{}:{}: metadata `{}` is not used; did you mean `{near}`?",
                        sheet.file,
                        cell.line,
                        super::error::shown(key)
                    )));
                }
            }
            _ => {}
        }
    }
}

/// A positive number up to `most`, 0 after a complaint.
pub(super) fn positive(cell: &Cell<'_>, what: &str, most: f64, complaints: &mut Complaints) -> f64 {
    match cell.number(what) {
        Ok(value) if value > 0.0 && value <= most => value,
        Ok(value) if value <= 0.0 => {
            let hint = if value < 0.0 && what.contains("wavenumber") {
                "a negative wavenumber stands for an imaginary mode: the structure is not a minimum"
            } else {
                "the value must be positive"
            };
            complaints.0.push(cell.complain(what).hint(hint));
            0.0
        }
        Ok(_) => {
            complaints.0.push(cell.complain(format!("{what}, at most {most}")).hint("is the unit right?"));
            0.0
        }
        Err(complaint) => {
            complaints.0.push(complaint);
            0.0
        }
    }
}

/// A number that is not negative, 0 after a complaint.
pub(super) fn not_negative(cell: &Cell<'_>, what: &str, complaints: &mut Complaints) -> f64 {
    match cell.number(what) {
        Ok(value) if (0.0..=1.0e6).contains(&value) => value,
        Ok(_) => {
            complaints.0.push(cell.complain(what).hint("it may not be negative"));
            0.0
        }
        Err(complaint) => {
            complaints.0.push(complaint);
            0.0
        }
    }
}

/// A strength: a number or one of the words s, m, w, v (vs, vw and the spelled-out words are read too).
pub(super) fn strength(cell: &Cell<'_>, complaints: &mut Complaints) -> Option<Strength> {
    let word = match cell.text.to_lowercase().as_str() {
        "s" | "vs" | "strong" => Some(StrengthWord::Strong),
        "m" | "medium" => Some(StrengthWord::Medium),
        "w" | "weak" => Some(StrengthWord::Weak),
        "v" | "vw" => Some(StrengthWord::VeryWeak),
        _ => None,
    };
    if let Some(word) = word {
        return Some(Strength::Word(word));
    }
    match cell.number("a strength") {
        Ok(value) if value >= 0.0 => Some(Strength::Relative(value)),
        _ => {
            complaints.0.push(cell.complain("a strength: s, m, w, v or a number that is not negative"));
            None
        }
    }
}
