//! Faults of a Hessian and of the modes it gives.

use itertools::Itertools;

use super::elements;
use super::moieties::{Group, Structure};
use super::motion::{Description, Family};
use super::normal_modes::{BOHR_IN_ANGSTROM, NormalModes};
use super::table_faults::{Finding, Severity};
use crate::read::qcschema::HessianRecord;

/// Above this component a geometry is not at rest, hartree/bohr: the loosest criterion in common use is 4.5e-4 for the
/// largest component (common practice, no source); a Hessian deserves better.
const AT_REST: f64 = 3.0e-4;

/// Residual translations above this, cm⁻¹, show a Hessian that is not invariant (integration grids leave a few; a judgement
/// of this project).
const RESIDUAL_TRANSLATION: f64 = 10.0;

/// The same for rotations; grids and small gradients leave up to some 10 cm⁻¹.
const RESIDUAL_ROTATION: f64 = 30.0;

/// No fundamental or harmonic wavenumber of a molecule lies above that of H2 (ω 4401 cm⁻¹, Huber & Herzberg 1979, from
/// memory).
const HIGHEST: f64 = 4_450.0;

/// All findings, faults first. `formula` is what the substance should be, where it is known.
pub fn findings(
    record: &HessianRecord,
    modes: &NormalModes,
    structure: &Structure,
    described: &[Description],
    formula: Option<&str>,
) -> Vec<Finding> {
    let mut list = Vec::new();
    let mut add = |severity, about: &str, message: String| {
        list.push(Finding { severity, about: about.to_owned(), message });
    };
    let imaginary: Vec<f64> = modes.modes.iter().map(|m| m.wavenumber).filter(|w| *w < 0.0).collect();
    if !imaginary.is_empty() {
        let values = imaginary.iter().map(|w| format!("{:.1}i", -w)).join(", ");
        let count = imaginary.len();
        let word = if count == 1 { "mode" } else { "modes" };
        add(
            Severity::Fault,
            "",
            format!("{count} imaginary {word} ({values} cm⁻¹): the geometry is not a minimum; optimise it further"),
        );
    }
    if let Some(gradient) = &record.gradient {
        let largest = gradient.iter().fold(0.0_f64, |a, b| a.max(b.abs()));
        if largest > AT_REST {
            add(
                Severity::Fault,
                "",
                format!(
                    "the geometry is not at rest: the gradient reaches {largest:.1e} hartree/bohr; its modes have no \
                     meaning as vibrations about a minimum"
                ),
            );
        }
    }
    // Away from rest a rotation changes the energy in second order: its residue says nothing about the Hessian.
    let at_rest = record.gradient.as_ref().is_none_or(|g| g.iter().all(|x| x.abs() <= AT_REST));
    let largest = |values: &[f64]| values.iter().fold(0.0_f64, |a, b| a.max(b.abs()));
    for (what, values, limit) in [
        ("translations", &modes.translations, RESIDUAL_TRANSLATION),
        ("rotations", &modes.rotations, RESIDUAL_ROTATION),
    ] {
        if what == "rotations" && !at_rest {
            continue;
        }
        let residue = largest(values);
        if residue > limit {
            add(
                Severity::Fault,
                "",
                format!("residual {what} of up to {residue:.1} cm⁻¹ before projection: the Hessian is not invariant"),
            );
        } else if residue > 0.5 * limit {
            add(Severity::Doubt, "", format!("residual {what} of up to {residue:.1} cm⁻¹ before projection"));
        }
    }
    for (number, mode) in modes.modes.iter().enumerate() {
        if mode.wavenumber > HIGHEST {
            add(
                Severity::Fault,
                &format!("{}", number + 1),
                format!("{:.0} cm⁻¹ is above every molecular vibration: wrong masses or units", mode.wavenumber),
            );
        }
    }
    check_masses(record, modes, &mut add);
    check_counts(structure, described, &mut add);
    check_tightness(record, structure, &mut add);
    if let Some(formula) = formula {
        check_formula(record, structure, formula, &mut add);
    }
    if let Some(split) = broken_symmetry(record, modes)
        && split > 1.0
    {
        let severity = if split > 10.0 { Severity::Fault } else { Severity::Doubt };
        add(
            severity,
            "",
            format!(
                "broken degeneracy: the Hessian has less symmetry than its geometry and moves modes by up to {split:.1} cm⁻¹"
            ),
        );
    }
    list.sort();
    list
}

fn check_masses(record: &HessianRecord, modes: &NormalModes, add: &mut impl FnMut(Severity, &str, String)) {
    let mut told = std::collections::BTreeSet::new();
    for (symbol, mass) in record.symbols.iter().zip(&modes.masses) {
        if !told.insert(symbol) {
            continue;
        }
        // The mass excess of every stable nuclide is below 0.1 u.
        if (mass - mass.round()).abs() > 0.1 {
            add(
                Severity::Fault,
                symbol,
                format!("mass {mass} u is not that of an isotope; an average mass belongs to no molecule"),
            );
        } else if let Some(element) = elements::named(symbol) {
            let off = (mass - element.mass).abs();
            // Isotopes in use lie within 15 % and 2.1 u (hydrogen to tritium) of the common one.
            if off > 0.15 * element.mass + 2.1 {
                add(
                    Severity::Fault,
                    symbol,
                    format!("wrong mass: {mass} u is no isotope of {symbol} (the common one is {} u)", element.mass),
                );
            }
        } else {
            add(Severity::Doubt, symbol, "element without data here; counted as a metal ion".to_owned());
        }
    }
}

fn check_counts(structure: &Structure, described: &[Description], add: &mut impl FnMut(Severity, &str, String)) {
    let waters = structure.waters();
    for (family, each, word) in [(Family::Stretch, 2, "O–H stretches"), (Family::Bend, 1, "bends")] {
        let found = described.iter().filter(|d| d.class.group == Group::Water && d.class.family == family).count();
        let expected = waters * each;
        if found != expected {
            let which = if found < expected { "missing" } else { "extra" };
            let message = format!("{which} modes: {found} water {word} for {waters} waters, expected {expected}");
            add(Severity::Fault, "", message);
        }
    }
}

fn check_tightness(record: &HessianRecord, structure: &Structure, add: &mut impl FnMut(Severity, &str, String)) {
    let ratios: Vec<f64> = structure
        .fragments
        .iter()
        .flat_map(|f| &f.bonds)
        .filter_map(|(i, j)| {
            let sum = elements::named(&record.symbols[*i])?.radius + elements::named(&record.symbols[*j])?.radius;
            let square: f64 = record.geometry[*i].iter().zip(&record.geometry[*j]).map(|(a, b)| (a - b).powi(2)).sum();
            Some(square.sqrt() * BOHR_IN_ANGSTROM / sum)
        })
        .collect();
    // Multiple bonds are down to 0.75 of the sum of single-bond radii.
    if ratios.iter().any(|r| *r < 0.7) {
        add(Severity::Fault, "", "bonds far too short: is the geometry in ångström instead of bohr?".to_owned());
    }
    if ratios.is_empty() && record.atoms() > 1 {
        add(Severity::Doubt, "", "no bonds were found: check the unit of the geometry".to_owned());
    }
}

fn check_formula(
    record: &HessianRecord,
    structure: &Structure,
    formula: &str,
    add: &mut impl FnMut(Severity, &str, String),
) {
    let Some(wanted) = composition(formula) else {
        add(Severity::Doubt, "", format!("the formula `{formula}` was not understood; the water count is not checked"));
        return;
    };
    let claimed = claimed_waters(formula);
    let waters = structure.waters();
    if let Some(claimed) = claimed
        && claimed != waters
    {
        add(
            Severity::Fault,
            "",
            format!(
                "the water count does not match the formula: {waters} waters in the geometry, {claimed} in {formula}"
            ),
        );
    }
    let found = record.symbols.iter().map(|s| elements::named(s).map_or(s.as_str(), |e| e.symbol)).counts();
    let differ: Vec<String> = wanted
        .keys()
        .map(String::as_str)
        .chain(found.keys().copied())
        .sorted()
        .dedup()
        .filter_map(|s| {
            let (is, should) = (found.get(s).copied().unwrap_or(0), wanted.get(s).copied().unwrap_or(0));
            (is != should).then(|| format!("{s} {is} for {should}"))
        })
        .collect();
    if !differ.is_empty() {
        let message = format!("the atoms are not those of {formula}: {}", differ.join(", "));
        add(Severity::Fault, "", message);
    }
}

/// Atoms of a formula with brackets and dots: `Mg(H2O)6(ClO4)2`, `CaSO4.2H2O`; a charge at the end is ignored.
pub fn composition(formula: &str) -> Option<std::collections::BTreeMap<String, usize>> {
    let mut total = std::collections::BTreeMap::new();
    let plain = formula.trim().replace(['·', '*', '•'], ".").replace('[', "(").replace(']', ")");
    let plain = plain.split_once('^').map_or(plain.clone(), |(body, _)| body.to_owned());
    let plain = plain.trim_end_matches(['+', '-']);
    for part in plain.split('.') {
        let digits = part.len() - part.trim_start_matches(|c: char| c.is_ascii_digit()).len();
        let times: usize = if digits == 0 { 1 } else { part[..digits].parse().ok()? };
        let letters: Vec<char> = part[digits..].chars().collect();
        let (counts, end) = part_composition(&letters, 0, 0)?;
        if end < letters.len() || counts.is_empty() || times > 1_000 {
            return None;
        }
        for (symbol, count) in counts {
            *total.entry(symbol).or_insert(0) += count * times;
        }
    }
    Some(total)
}

type Counts = std::collections::BTreeMap<String, usize>;

fn part_composition(letters: &[char], mut at: usize, depth: usize) -> Option<(Counts, usize)> {
    let mut counts = Counts::new();
    while let Some(letter) = letters.get(at) {
        let inner = match letter {
            // Formulas nest twice at most.
            '(' if depth < 4 => {
                let (inner, end) = part_composition(letters, at + 1, depth + 1)?;
                (letters.get(end) == Some(&')')).then_some(())?;
                at = end + 1;
                inner
            }
            ')' if depth > 0 => return Some((counts, at)),
            letter if letter.is_ascii_uppercase() => {
                let mut symbol = letter.to_string();
                at += 1;
                if let Some(small) = letters.get(at).filter(|c| c.is_ascii_lowercase()) {
                    symbol.push(*small);
                    at += 1;
                }
                let symbol = elements::named(&symbol)?.symbol.to_owned();
                Counts::from([(symbol, 1)])
            }
            _ => return None,
        };
        let start = at;
        while letters.get(at).is_some_and(char::is_ascii_digit) {
            at += 1;
        }
        let digits: String = letters[start..at].iter().collect();
        let times = if digits.is_empty() { 1 } else { digits.parse().ok().filter(|n| *n <= 1_000)? };
        for (symbol, count) in inner {
            *counts.entry(symbol).or_insert(0) += count * times;
        }
    }
    Some((counts, at))
}

/// Waters that a formula names: `(H2O)6`, `.6H2O`.
fn claimed_waters(formula: &str) -> Option<usize> {
    let plain = formula.replace("D2O", "H2O").replace(' ', "");
    let at = plain.find("H2O")?;
    let behind: String =
        plain[at + 3..].strip_prefix([')', ']']).unwrap_or("").chars().take_while(char::is_ascii_digit).collect();
    let before: String =
        plain[..at].chars().rev().take_while(char::is_ascii_digit).collect::<Vec<_>>().into_iter().rev().collect();
    Some(behind.parse().or_else(|_| before.parse()).unwrap_or(1))
}

/// Largest shift, cm⁻¹, of a mode when the Hessian is given the full symmetry of its geometry; `None` when the geometry
/// has none.
///
/// # Method
/// Operations are found by mapping three atoms that span the geometry on all like triples; the Hessian is averaged over
/// the operations, and the modes of both are compared. Modes are compared where they are real and above 50 cm⁻¹: soft
/// ones move by grid noise alone.
fn broken_symmetry(record: &HessianRecord, modes: &NormalModes) -> Option<f64> {
    let operations = super::geometry_symmetry::operations(&record.symbols, &record.geometry, &modes.masses);
    if operations.len() < 2 {
        return None;
    }
    let mut symmetric = record.clone();
    symmetric.hessian = super::geometry_symmetry::averaged(&record.hessian, &operations);
    symmetric.dipole_derivatives = None;
    let other = super::normal_modes::normal_modes(&symmetric, &modes.masses);
    let shifts = modes.modes.iter().zip(&other.modes).filter(|(a, b)| a.wavenumber.min(b.wavenumber) > 50.0);
    shifts.map(|(a, b)| (a.wavenumber - b.wavenumber).abs()).max_by(f64::total_cmp)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn formulas_of_hydrates_are_counted() {
        let counts = composition("Mg(H2O)6(ClO4)2").unwrap();
        assert_eq!(
            counts.into_iter().collect::<Vec<_>>(),
            [("Cl".into(), 2), ("H".into(), 12), ("Mg".into(), 1), ("O".into(), 14)]
        );
        assert_eq!(composition("Mg(ClO4)2.6H2O"), composition("Mg(H2O)6(ClO4)2"));
        assert_eq!(composition("nonsense"), None);
        assert_eq!(claimed_waters("Mg(ClO4)2.6H2O"), Some(6));
        assert_eq!(claimed_waters("[Mg(H2O)6](ClO4)2"), Some(6));
        assert_eq!(claimed_waters("NaClO4.H2O"), Some(1));
        assert_eq!(claimed_waters("KClO4"), None);
    }
}
