//! Cubic and quartic force fields as JSON. The layout is this project's own and is described in `docs/force_field.md`.

use std::collections::BTreeMap;
use std::path::Path;

use serde::Deserialize;

use super::delimited::{Limits, text_of};
use super::error::{Complaint, Complaints};
use crate::mode::Motion;
use crate::note::{Note, Noted};

/// Most modes of one field: the sums of second-order theory grow with the cube of it.
const MOST_MODES: usize = 400;

/// A force field in dimensionless normal coordinates:
/// V/hc = ½ Σ ωᵢ qᵢ² + ⅙ Σ f_ijk qᵢ qⱼ q_k + 1/24 Σ f_ijkl qᵢ qⱼ q_k q_l, all sums unrestricted.
///
/// Degenerate modes appear by their real components. Invariant (kept by the reader): wavenumbers are positive, indices
/// are in range and ascending, every number is finite.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct ForceField {
    /// Title for people.
    pub title: String,
    /// Level of theory or citation.
    pub source: String,
    /// Name of each component.
    pub names: Vec<String>,
    /// Irreducible representation of each component, where it is given.
    pub species: Vec<Option<String>>,
    /// Point group, where it is given.
    pub point_group: Option<String>,
    /// Motion of each component.
    pub motions: Vec<Motion>,
    /// Name of the molecule or ion, used as the moiety.
    pub moiety: String,
    /// Harmonic wavenumbers, cm⁻¹.
    pub omega: Vec<f64>,
    /// f_ijk with i ≤ j ≤ k, cm⁻¹.
    pub cubic: BTreeMap<[usize; 3], f64>,
    /// f_ijkl with i ≤ j ≤ k ≤ l, cm⁻¹.
    pub quartic: BTreeMap<[usize; 4], f64>,
    /// Equilibrium rotational constants about the principal axes x, y, z, cm⁻¹; none for the axis of a linear molecule.
    pub rotational: [Option<f64>; 3],
    /// Coriolis ζ_ij (i < j) about x, y, z.
    pub zeta: [BTreeMap<(usize, usize), f64>; 3],
    /// Groups of two or three components that make one degenerate mode.
    pub degenerate: Vec<Vec<usize>>,
    /// Dipole derivatives ∂µ/∂qᵢ (x, y, z of each component), in any one unit; empty when not given.
    pub dipole: Vec<[f64; 3]>,
    /// Second derivatives ∂²µ/∂qᵢ∂qⱼ with i ≤ j, in the same unit.
    pub dipole_second: BTreeMap<(usize, usize), [f64; 3]>,
}

impl ForceField {
    /// f_ijk in any order of indices; zero when not listed.
    pub fn cubic(&self, i: usize, j: usize, k: usize) -> f64 {
        let mut key = [i, j, k];
        key.sort_unstable();
        self.cubic.get(&key).copied().unwrap_or(0.0)
    }

    /// f_ijkl in any order of indices; zero when not listed.
    pub fn quartic(&self, i: usize, j: usize, k: usize, l: usize) -> f64 {
        let mut key = [i, j, k, l];
        key.sort_unstable();
        self.quartic.get(&key).copied().unwrap_or(0.0)
    }

    /// Σ over the axes of B (ζ_ij)², cm⁻¹.
    pub fn coriolis(&self, i: usize, j: usize) -> f64 {
        let key = (i.min(j), i.max(j));
        (0..3)
            .filter_map(|axis| {
                let zeta = self.zeta[axis].get(&key)?;
                Some(self.rotational[axis]? * zeta * zeta)
            })
            .sum()
    }
}

/// Units a file may state; anything else is refused.
#[derive(Debug, Default, Deserialize)]
struct Units {
    omega: Option<String>,
    phi: Option<String>,
    #[serde(rename = "B")]
    rotational: Option<String>,
    zeta: Option<String>,
}

#[derive(Debug, Deserialize)]
struct Raw {
    #[serde(default)]
    title: String,
    #[serde(default)]
    source: String,
    #[serde(default)]
    level_of_theory: String,
    #[serde(default)]
    convention: Option<String>,
    #[serde(default)]
    units: Option<Units>,
    omega: Vec<f64>,
    #[serde(default)]
    mode_names: Vec<String>,
    #[serde(default)]
    mode_species: Vec<String>,
    #[serde(default)]
    mode_motions: Vec<String>,
    #[serde(default)]
    point_group: Option<String>,
    #[serde(default)]
    moiety: Option<String>,
    #[serde(default)]
    phi3: Vec<Vec<f64>>,
    #[serde(default)]
    phi4: Vec<Vec<f64>>,
    #[serde(default)]
    rotational_constants: BTreeMap<String, Option<f64>>,
    #[serde(default)]
    zeta: BTreeMap<String, Vec<Vec<f64>>>,
    #[serde(default)]
    degenerate: Vec<Vec<usize>>,
    #[serde(default)]
    dipole: Vec<[f64; 3]>,
    #[serde(default)]
    dipole_second: Vec<(usize, usize, [f64; 3])>,
    #[serde(flatten)]
    rest: BTreeMap<String, serde_json::Value>,
}

/// Keys that may stand in a file for its readers and are not needed here.
const DESCRIPTIVE: [&str; 7] = ["layout", "definitions", "symbols", "masses", "geometry", "L", "numerical_check"];

/// Reads the force field in a file.
///
/// # Errors
/// All complaints about the file at once.
pub fn read_file(path: &Path) -> Result<Noted<ForceField>, Complaints> {
    let text = text_of(path, Limits::default())?;
    read(&path.display().to_string(), &text)
}

/// Reads a force field from text; `file` is the name to show.
///
/// # Errors
/// All complaints about the text at once: JSON that does not parse, units that are not cm⁻¹, a convention that is not
/// known, indices out of range, a constant listed twice with two values, a ζ matrix that is not antisymmetric.
pub fn read(file: &str, text: &str) -> Result<Noted<ForceField>, Complaints> {
    let raw: Raw = serde_json::from_str(text).map_err(|error| not_json(file, text, &error))?;
    let mut complaints = Complaints::default();
    let mut notes = Vec::new();
    let n = raw.omega.len();
    let mut wrong = |expected: String, found: String, hint: &str| {
        complaints.0.push(Complaint::about_file(file, expected, found).hint(hint));
    };
    if n == 0 || n > MOST_MODES {
        wrong(format!("`omega`: 1 to {MOST_MODES} harmonic wavenumbers"), n.to_string(), "");
    }
    for (i, omega) in raw.omega.iter().enumerate() {
        if !(omega.is_finite() && *omega > 0.0) {
            wrong(
                format!("`omega`, entry {}: a positive wavenumber in cm⁻¹", i + 1),
                omega.to_string(),
                "a mode with an imaginary or zero wavenumber has no levels: leave translations, rotations and saddle \
                 points out",
            );
        }
    }
    let units = raw.units.unwrap_or_default();
    let mut unstated = Vec::new();
    for (key, unit, known) in [
        ("omega", &units.omega, &["cm-1", "cm^-1", "cm⁻¹", "1/cm"][..]),
        ("phi", &units.phi, &["cm-1", "cm^-1", "cm⁻¹", "1/cm"]),
        ("B", &units.rotational, &["cm-1", "cm^-1", "cm⁻¹", "1/cm"]),
        ("zeta", &units.zeta, &["none", "1", ""]),
    ] {
        match unit {
            Some(unit) if known.contains(&unit.trim()) => {}
            Some(unit) => wrong(
                format!("`units.{key}`: {}", known[0]),
                unit.clone(),
                "convert the numbers; only cm⁻¹ is read, so that no unit can be mistaken",
            ),
            None => unstated.push(key),
        }
    }
    if !unstated.is_empty() {
        notes.push(Note::new(format!("no unit is stated for {}; cm⁻¹ is taken (ζ has none)", unstated.join(", "))));
    }
    let restricted = match raw.convention.as_deref().map(str::trim) {
        None => {
            notes.push(Note::new(
                "no `convention` is stated; constants are taken as plain derivatives (unrestricted sums)",
            ));
            false
        }
        Some("unrestricted") => false,
        Some("restricted") => true,
        Some(other) => {
            wrong("`convention`: unrestricted or restricted".into(), other.to_owned(), "see docs/force_field.md");
            false
        }
    };
    let index = |value: f64| -> Option<usize> {
        #[expect(
            clippy::cast_possible_truncation,
            clippy::cast_sign_loss,
            reason = "checked to be a small whole number"
        )]
        let whole = value as usize;
        #[expect(clippy::cast_precision_loss, reason = "at most a few hundred")]
        let same = whole as f64 == value;
        (same && (1..=n).contains(&whole)).then(|| whole - 1)
    };
    let mut field = ForceField {
        title: raw.title,
        source: if raw.source.is_empty() { raw.level_of_theory } else { raw.source },
        point_group: raw.point_group,
        moiety: raw.moiety.unwrap_or_else(|| "molecule".to_owned()),
        ..ForceField::default()
    };
    for (at, entry) in raw.phi3.iter().enumerate() {
        match constant::<3>(entry, index) {
            Some((key, value)) => {
                let value = if restricted { value * multiplicity(&key) } else { value };
                if field.cubic.insert(key, value).is_some_and(|before| (before - value).abs() > 1.0e-6) {
                    wrong(format!("`phi3`, entry {}: one value a constant", at + 1), format!("{entry:?}"), "");
                }
            }
            None => wrong(
                format!("`phi3`, entry {}: three mode numbers from 1 to {n} and a number", at + 1),
                format!("{entry:?}"),
                "",
            ),
        }
    }
    for (at, entry) in raw.phi4.iter().enumerate() {
        match constant::<4>(entry, index) {
            Some((key, value)) => {
                let value = if restricted { value * multiplicity(&key) } else { value };
                if field.quartic.insert(key, value).is_some_and(|before| (before - value).abs() > 1.0e-6) {
                    wrong(format!("`phi4`, entry {}: one value a constant", at + 1), format!("{entry:?}"), "");
                }
            }
            None => wrong(
                format!("`phi4`, entry {}: four mode numbers from 1 to {n} and a number", at + 1),
                format!("{entry:?}"),
                "",
            ),
        }
    }
    for (axis, name) in ["x", "y", "z"].into_iter().enumerate() {
        field.rotational[axis] = raw.rotational_constants.get(name).copied().flatten();
        if let Some(b) = field.rotational[axis]
            && !(b.is_finite() && b >= 0.0)
        {
            wrong(format!("`rotational_constants.{name}`: a number in cm⁻¹, not negative"), b.to_string(), "");
        }
        let Some(matrix) = raw.zeta.get(name) else { continue };
        if matrix.len() != n || matrix.iter().any(|row| row.len() != n) {
            wrong(format!("`zeta.{name}`: {n} rows of {n} numbers"), format!("{} rows", matrix.len()), "");
            continue;
        }
        for (i, j) in (0..n).flat_map(|i| (i..n).map(move |j| (i, j))) {
            let (z, back) = (matrix[i][j], matrix[j][i]);
            if !((z + back).abs() < 1.0e-6 && z.abs() < 1.0 + 1.0e-6) {
                wrong(
                    format!("`zeta.{name}`: an antisymmetric matrix of numbers from −1 to 1"),
                    format!("({}, {}) = {z}, ({}, {}) = {back}", i + 1, j + 1, j + 1, i + 1),
                    "",
                );
            } else if i < j && z != 0.0 {
                field.zeta[axis].insert((i, j), z);
            }
        }
    }
    for key in raw.rotational_constants.keys().chain(raw.zeta.keys()) {
        if !["x", "y", "z"].contains(&key.as_str()) {
            wrong("principal axes x, y, z".into(), key.clone(), "");
        }
    }
    let mut used = vec![false; n];
    for group in &raw.degenerate {
        let members: Option<Vec<usize>> = group.iter().map(|i| i.checked_sub(1).filter(|i| *i < n)).collect();
        match members {
            Some(mut members) if (2..=3).contains(&members.len()) && members.iter().all(|i| !used[*i]) => {
                members.sort_unstable();
                members.dedup();
                members.iter().for_each(|i| used[*i] = true);
                let spread = members
                    .iter()
                    .map(|i| raw.omega[*i])
                    .fold(0.0, |m: f64, w| m.max((w - raw.omega[members[0]]).abs()));
                if members.len() != group.len() || spread > 0.5 {
                    wrong(
                        "`degenerate`: components of one wavenumber (within 0.5 cm⁻¹)".into(),
                        format!("{group:?}"),
                        "",
                    );
                } else {
                    field.degenerate.push(members);
                }
            }
            _ => wrong(
                format!("`degenerate`: groups of two or three mode numbers from 1 to {n}, each mode once"),
                format!("{group:?}"),
                "",
            ),
        }
    }
    for (key, list) in
        [("mode_names", &raw.mode_names), ("mode_species", &raw.mode_species), ("mode_motions", &raw.mode_motions)]
    {
        if !list.is_empty() && list.len() != n {
            wrong(format!("`{key}`: {n} entries, one a mode"), list.len().to_string(), "");
        }
    }
    if !raw.dipole.is_empty() && raw.dipole.len() != n {
        wrong(format!("`dipole`: {n} vectors, one a mode"), raw.dipole.len().to_string(), "");
    }
    for (i, j, vector) in &raw.dipole_second {
        match (i.checked_sub(1).filter(|i| *i < n), j.checked_sub(1).filter(|j| *j < n)) {
            (Some(i), Some(j)) => {
                field.dipole_second.insert((i.min(j), i.max(j)), *vector);
            }
            _ => wrong(format!("`dipole_second`: mode numbers from 1 to {n}"), format!("{i}, {j}"), ""),
        }
    }
    field.names = (0..n).map(|i| raw.mode_names.get(i).cloned().unwrap_or_else(|| format!("q{}", i + 1))).collect();
    let mut sorted = field.names.clone();
    sorted.sort_unstable();
    if let Some(twice) = sorted.windows(2).find(|w| w[0] == w[1]) {
        wrong("`mode_names`: a name of its own for each mode".into(), twice[0].clone(), "");
    }
    field.species = (0..n).map(|i| raw.mode_species.get(i).filter(|s| !s.trim().is_empty()).cloned()).collect();
    field.motions = vec![Motion::Other; n];
    for (i, name) in raw.mode_motions.iter().enumerate().take(n) {
        match Motion::from_name(name) {
            Some(motion) => field.motions[i] = motion,
            None => wrong(
                format!("`mode_motions`, entry {}: a motion", i + 1),
                name.clone(),
                "one of oh-stretch hoh-bend libration metal-oxygen xo-stretch oxo-bend nh-stretch nh-bend lattice other",
            ),
        }
    }
    field.omega = raw.omega;
    field.dipole = raw.dipole;
    let unknown: Vec<&str> = raw.rest.keys().map(String::as_str).filter(|k| !DESCRIPTIVE.contains(k)).collect();
    if !unknown.is_empty() {
        notes.push(Note::new(format!("ignored in {file}: {}", unknown.join(", "))));
    }
    if field.quartic.is_empty() {
        notes.push(Note::new("no quartic constants: x and g hold the cubic part only"));
    }
    if field.rotational.iter().all(Option::is_none) {
        notes.push(Note::new("no rotational constants: the Coriolis part of x is left out"));
    }
    complaints.or(Noted { value: field, notes })
}

/// Indices in ascending order and the value, when the entry is `N` mode numbers and a finite number.
fn constant<const N: usize>(entry: &[f64], index: impl Fn(f64) -> Option<usize>) -> Option<([usize; N], f64)> {
    let (value, indices) = entry.split_last()?;
    let list: Vec<usize> = indices.iter().map(|i| index(*i)).collect::<Option<_>>()?;
    let mut key: [usize; N] = list.try_into().ok()?;
    key.sort_unstable();
    value.is_finite().then_some((key, *value))
}

/// Product of the factorials of repeated indices: f = k times this.
fn multiplicity(key: &[usize]) -> f64 {
    let mut product = 1.0;
    let mut run = 1.0;
    for pair in key.windows(2) {
        run = if pair[0] == pair[1] { run + 1.0 } else { 1.0 };
        product *= run;
    }
    product
}

fn not_json(file: &str, text: &str, error: &serde_json::Error) -> Complaints {
    let line = text.lines().nth(error.line().saturating_sub(1)).unwrap_or("");
    let what = error.to_string();
    let what = what.split(" at line ").next().unwrap_or(&what);
    Complaint::at(file, error.line(), error.column(), 1, line, "a force field as JSON", what)
        .hint("the layout is described in docs/force_field.md")
        .into()
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn restricted_constants_are_turned_into_derivatives() {
        // k_iii = f_iii/6, k_iij = f_iij/2, k_iijj = f_iijj/4, k_iiii = f_iiii/24.
        let text = r#"{"omega": [1000, 1730], "convention": "restricted",
            "phi3": [[1,1,1,-10], [1,2,2,-15]], "phi4": [[1,1,2,2,3], [2,2,2,2,1]]}"#;
        let field = read("f.json", text).unwrap().value;
        assert_eq!((field.cubic(0, 0, 0), field.cubic(1, 0, 1)), (-60.0, -30.0));
        assert_eq!((field.quartic(1, 0, 1, 0), field.quartic(1, 1, 1, 1)), (12.0, 24.0));
    }

    #[test]
    fn everything_wrong_with_a_field_is_told_at_once() {
        let text = r#"{"omega": [1000, -5], "units": {"omega": "hartree"}, "convention": "mine",
            "phi3": [[1,1,3,2], [1,1]], "zeta": {"z": [[0,1],[1,0]]}, "degenerate": [[1]]}"#;
        let complaints = read("f.json", text).unwrap_err().0;
        let all = complaints.iter().map(ToString::to_string).collect::<Vec<_>>().join("\n");
        for part in [
            "entry 2: a positive",
            "units.omega",
            "convention",
            "`phi3`, entry 1",
            "`phi3`, entry 2",
            "zeta.z",
            "degenerate",
        ] {
            assert!(all.contains(part), "{part} in {all}");
        }
    }

    #[test]
    fn text_that_is_no_json_is_told_with_its_place() {
        let complaint = read("f.json", "{\n \"omega\": [1,,]}").unwrap_err().to_string();
        assert!(complaint.starts_with("error: f.json:2:"), "{complaint}");
    }
}
