//! Constants tables: anharmonic constants and resonance elements of the modes of one table.

use std::collections::BTreeMap;
use std::path::Path;

use super::delimited::{Cell, Delimited, Limits, closest, text_of};
use super::error::{Complaint, Complaints};
use super::mode_table::not_negative;
use crate::mode::{Constant, ConstantKind, ModeTable};
use crate::note::{Note, Noted};
use crate::quantity::Shift;

const COLUMNS: [&str; 9] =
    ["quantity", "mode_a", "mode_b", "mode_c", "value_cm1", "sigma_cm1", "source", "status", "note"];

const REQUIRED: [&str; 4] = ["quantity", "mode_a", "mode_b", "value_cm1"];

/// Largest constant that can be meant, cm⁻¹.
const LARGEST: f64 = 2_000.0;

/// Relative uncertainty of a constant where the file gives none (a judgement of this project: the spread between
/// published sets of one molecule is of that size).
const RELATIVE_SIGMA: f64 = 0.1;

/// Reads the constants in a file for the modes of `table`.
///
/// # Errors
/// All complaints about the file at once.
pub fn read_file(path: &Path, table: &ModeTable) -> Result<Noted<Vec<Constant>>, Complaints> {
    let text = text_of(path, Limits::default())?;
    read(&path.display().to_string(), &text, table)
}

/// Reads the constants in `text` for the modes of `table`.
///
/// # Errors
/// All complaints at once: layout, unknown quantities and modes, constants given twice, g of a mode that is not
/// degenerate, resonances of a mode with itself.
pub fn read(name: &str, text: &str, table: &ModeTable) -> Result<Noted<Vec<Constant>>, Complaints> {
    let sheet = Delimited::parse(name, text, &COLUMNS, &REQUIRED, Limits::default())?;
    let mut complaints = Complaints::default();
    let mut notes = sheet.notes.clone();
    let [Some(kind_at), Some(a_at), Some(b_at), Some(value_at)] = REQUIRED.map(|wanted| sheet.column(wanted)) else {
        return Err(Complaint::about_file(name, REQUIRED.join(", "), "fewer columns").into());
    };
    let (c_at, sigma_at, source_at) = (sheet.column("mode_c"), sheet.column("sigma_cm1"), sheet.column("source"));
    let status_at = sheet.column("status");
    let mut seen: BTreeMap<(ConstantKind, usize, usize, Option<usize>), usize> = BTreeMap::new();
    let mut constants = Vec::new();
    let mut without = 0;
    for row in &sheet.rows {
        let before = complaints.0.len();
        let kind = ConstantKind::from_name(&row[kind_at].text);
        if kind.is_none() {
            complaints
                .0
                .push(row[kind_at].complain("a quantity").hint("one of x, g, fermi, darling-dennison, one-one"));
        }
        let a = mode_of(&row[a_at], table, &mut complaints);
        let b = mode_of(&row[b_at], table, &mut complaints);
        let c = c_at
            .map(|at| &row[at])
            .filter(|cell| !cell.text.is_empty())
            .map(|cell| (cell, mode_of(cell, table, &mut complaints)));
        let value = match row[value_at].number("a constant in cm⁻¹") {
            Ok(value) if value.abs() <= LARGEST => value,
            Ok(_) => {
                complaints.0.push(row[value_at].complain(format!("a constant of at most {LARGEST} cm⁻¹ in size")));
                0.0
            }
            Err(complaint) => {
                complaints.0.push(complaint);
                0.0
            }
        };
        let sigma = sigma_at
            .map(|at| &row[at])
            .filter(|cell| !cell.text.is_empty())
            .map(|cell| not_negative(cell, "an uncertainty in cm⁻¹", &mut complaints));
        if let (Some((cell, _)), Some(kind)) = (&c, kind)
            && kind != ConstantKind::Fermi
        {
            complaints.0.push(cell.complain("no third mode here").hint("only a fermi term of three modes has mode_c"));
        }
        let (Some(kind), Some(a), Some(b)) = (kind, a, b) else { continue };
        let c = c.and_then(|(_, mode)| mode);
        if kind.is_resonance() && a == b {
            complaints.0.push(row[b_at].complain("another mode").hint("a resonance ties two different modes"));
        }
        if kind == ConstantKind::G && (table.modes[a].degeneracy == 1 || table.modes[b].degeneracy == 1) {
            complaints.0.push(
                row[if table.modes[a].degeneracy == 1 { a_at } else { b_at }]
                    .complain("a degenerate mode")
                    .hint("g constants belong to modes of degeneracy 2 or 3"),
            );
        }
        let key = if kind == ConstantKind::Fermi { (kind, a, b, c) } else { (kind, a.min(b), a.max(b), None) };
        if let Some(first) = seen.insert(key, row[kind_at].line) {
            complaints
                .0
                .push(row[kind_at].complain("each constant once").hint(format!("it is already given at line {first}")));
        }
        if complaints.0.len() > before {
            continue;
        }
        without += usize::from(sigma.is_none());
        let status = status_at
            .map(|at| row[at].text.as_str())
            .filter(|s| !s.is_empty())
            .map_or(String::new(), |s| format!(" [{s}]"));
        constants.push(Constant {
            kind,
            a,
            b,
            c,
            value: Shift(value),
            sigma: sigma.unwrap_or(RELATIVE_SIGMA * value.abs()),
            source: source_at.map_or_else(String::new, |at| row[at].text.clone()) + &status,
        });
    }
    if without > 0 {
        notes
            .push(Note::new(format!("{name}: {without} constants have no sigma_cm1; a tenth of the value is assumed")));
    }
    complaints.or(Noted { value: constants, notes })
}

fn mode_of(cell: &Cell<'_>, table: &ModeTable, complaints: &mut Complaints) -> Option<usize> {
    let found = table.mode_index(&cell.text);
    if found.is_none() {
        let hint = closest(&cell.text, table.modes.iter().map(|m| m.id.as_str())).map_or_else(
            || {
                format!(
                    "`{}` has {}",
                    table.name,
                    table.modes.iter().take(12).map(|m| m.id.as_str()).collect::<Vec<_>>().join(", ")
                )
            },
            |near| format!("did you mean `{near}`?"),
        );
        complaints.0.push(cell.complain("a mode of the mode table").hint(hint));
    }
    found
}
