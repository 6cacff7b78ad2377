//! Quantum chemistry: a QCSchema JSON result with a Hessian.
//!
//! The published standard (MolSSI QCSchema, `AtomicResult` version 1 with `Molecule` version 2): geometry in bohr, masses
//! in u, Hessian in hartree/bohr², row by row. Dipole derivatives have no place in version 1 of the standard; they are
//! taken from `extras.dipole_derivatives`, 3 × 3N, all columns of x first, in e (atomic units).

use std::path::Path;

use serde_json::Value;

use super::error::{Complaint, Complaints, shown};
use super::json_place::{Step, line_and_column, offset_of};
use crate::note::{Note, Noted};

/// A geometry with its Hessian, as a quantum-chemical result gives it.
#[derive(Clone, Debug, PartialEq)]
pub struct HessianRecord {
    /// File name or the like, for messages.
    pub name: String,
    /// The molecule's own name, empty when it has none.
    pub title: String,
    /// Element symbols, one an atom.
    pub symbols: Vec<String>,
    /// Cartesian positions, bohr, one an atom.
    pub geometry: Vec<[f64; 3]>,
    /// Masses in u as the file gives them.
    pub masses: Option<Vec<f64>>,
    /// Hessian in hartree/bohr², 3N × 3N row by row; symmetrised.
    pub hessian: Vec<f64>,
    /// Largest difference between an element and its mirror image before symmetrising, hartree/bohr².
    pub asymmetry: f64,
    /// Gradient in hartree/bohr, 3N, where the file gives one.
    pub gradient: Option<Vec<f64>>,
    /// dμ/dx in e, 3 × 3N row by row, where the file gives them.
    pub dipole_derivatives: Option<Vec<f64>>,
    /// Method as written: `CCSD(T)`.
    pub method: String,
    /// Basis as written: `cc-pVTZ`; empty when the method has none to name.
    pub basis: String,
    /// Program and version that made the numbers, as written.
    pub creator: String,
    /// Total charge.
    pub charge: f64,
}

impl HessianRecord {
    /// Number of atoms.
    pub fn atoms(&self) -> usize {
        self.symbols.len()
    }

    /// The level of theory as people write it: `CCSD(T)/cc-pVTZ`, `GFN2-xTB`.
    pub fn level_of_theory(&self) -> String {
        if self.basis.is_empty() { self.method.clone() } else { format!("{}/{}", self.method, self.basis) }
    }
}

/// Most atoms taken; a Hessian of 500 atoms has 2.25 million numbers.
const MOST_ATOMS: usize = 500;

/// Largest file taken, bytes.
const MOST_BYTES: usize = 200_000_000;

/// Above this difference between mirror elements, hartree/bohr², a Hessian is not a Hessian: rows are shifted or units
/// mixed. Finite differences of gradients leave 1e-5 or less (see `scf_note` of such files); ten times what careless
/// steps leave is a judgement of this project.
pub const WORST_ASYMMETRY: f64 = 1.0e-2;

/// Above this difference a note is given.
const DOUBTFUL_ASYMMETRY: f64 = 1.0e-4;

/// Below this distance, bohr, two atoms stand in each other: no bond is shorter than that of H2 (1.40 bohr; Huber and
/// Herzberg 1979, from memory). O–H read in ångström as if it were bohr is 0.96.
const SHORTEST: f64 = 1.2;

/// Reads a file; see [`read`].
///
/// # Errors
/// As for [`read`], and when the file cannot be read as UTF-8 text.
pub fn read_file(path: &Path) -> Result<Noted<HessianRecord>, Complaints> {
    let name = path.display().to_string();
    match std::fs::read(path) {
        Ok(bytes) => match String::from_utf8(bytes) {
            Ok(text) => read(&name, &text),
            Err(_) => Err(Complaint::about_file(&name, "UTF-8 text", "other bytes").into()),
        },
        Err(error) => Err(Complaint::about_file(&name, "a readable file", error.to_string()).into()),
    }
}

/// Reads a QCSchema result with a Hessian from `text`; `name` is shown in messages.
///
/// # Errors
/// All complaints at once, each with its place: no JSON (a bare `NaN` is none), another or unknown schema, a failed
/// computation, no Hessian, wrong sizes, values that are no finite numbers, a Hessian that is not symmetric, atoms in each
/// other (ångström instead of bohr).
pub fn read(name: &str, text: &str) -> Result<Noted<HessianRecord>, Complaints> {
    if text.len() > MOST_BYTES {
        let found = format!("{} MB", text.len() / 1_000_000);
        return Err(Complaint::about_file(name, format!("at most {} MB", MOST_BYTES / 1_000_000), found).into());
    }
    let text = text.strip_prefix('\u{feff}').unwrap_or(text);
    let root: Value = serde_json::from_str(text).map_err(|error| not_json(name, text, &error))?;
    let mut reader = Reader { name, text, root: &root, complaints: Complaints::default(), notes: Vec::new() };
    let record = reader.record();
    let Reader { complaints, notes, .. } = reader;
    match record {
        Some(record) if complaints.0.is_empty() => Ok(Noted { value: record, notes }),
        _ if complaints.0.is_empty() => Err(Complaint::about_file(name, "a QCSchema result", "none").into()),
        _ => Err(complaints),
    }
}

fn not_json(name: &str, text: &str, error: &serde_json::Error) -> Complaints {
    let (number, column) = (error.line(), error.column().max(1));
    let line = text.lines().nth(number.saturating_sub(1)).unwrap_or("");
    // The parser counts bytes; people count characters.
    let bytes = column.saturating_sub(1).min(line.len());
    let column = 1 + line.char_indices().take_while(|(at, _)| *at < bytes).count();
    let around: String = line.chars().skip(column.saturating_sub(4)).take(8).collect();
    let message = error.to_string();
    let message = message.split(" at line ").next().unwrap_or("").to_owned();
    let complaint = Complaint::at(name, number, column, 1, line, "JSON", message);
    let not_finite = ["nan", "inf"].iter().any(|word| around.to_lowercase().contains(word));
    match (not_finite, text.trim_start().starts_with(['{', '['])) {
        (true, _) => complaint.hint("NaN and Infinity are no JSON numbers; the computation that wrote them failed"),
        (_, false) => complaint.hint("a QCSchema result begins with `{`; is this the right file?"),
        _ => complaint.hint("the file may be cut off or edited by hand"),
    }
    .into()
}

struct Reader<'a> {
    name: &'a str,
    text: &'a str,
    root: &'a Value,
    complaints: Complaints,
    notes: Vec<Note>,
}

impl Reader<'_> {
    fn at(&self, path: &[Step<'_>], expected: impl Into<String>, found: impl Into<String>) -> Complaint {
        // A missing value is complained about at the nearest thing that holds it.
        let offset = (0..=path.len()).rev().find_map(|length| offset_of(self.text, &path[..length])).unwrap_or(0);
        let (line, column, text) = line_and_column(self.text, offset);
        Complaint::at(self.name, line, column, 1, text, expected, found)
    }

    fn value(&self, keys: &[&str]) -> Option<&Value> {
        keys.iter().try_fold(self.root, |value, key| value.get(key)).filter(|value| !value.is_null())
    }

    fn text_of(&self, keys: &[&str]) -> String {
        self.value(keys).and_then(Value::as_str).unwrap_or("").to_owned()
    }

    fn record(&mut self) -> Option<HessianRecord> {
        if !self.is_known_schema() {
            return None;
        }
        if self.value(&["success"]).and_then(Value::as_bool) == Some(false) {
            let why = self.text_of(&["error", "error_message"]);
            let complaint = self.at(&[Step::Key("success")], "a computation that ended well", "false");
            let hint =
                if why.is_empty() { "repeat the computation".to_owned() } else { format!("it says: {}", shown(&why)) };
            self.complaints.0.push(complaint.hint(hint));
            return None;
        }
        let symbols = self.symbols()?;
        let n = symbols.len();
        let geometry = self.numbers(&["molecule", "geometry"], 3 * n, "3 coordinates an atom, bohr");
        let masses = match self.value(&["molecule", "masses"]).is_some() {
            true => self.numbers(&["molecule", "masses"], n, "one mass an atom, u"),
            false => {
                self.notes.push(Note::new(format!(
                    "{}: no masses given; the most abundant isotope of each element is taken",
                    self.name
                )));
                None
            }
        };
        if let Some(masses) = &masses
            && let Some(atom) = masses.iter().position(|m| *m <= 0.0)
        {
            let path = [Step::Key("molecule"), Step::Key("masses"), Step::Index(atom)];
            let complaint = self.at(&path, "a mass above zero, u", masses[atom].to_string());
            self.complaints.0.push(complaint.hint("a ghost atom has no place in a Hessian of normal modes"));
        }
        let raw = self.hessian(n);
        let gradient = match self.value(&["properties", "return_gradient"]).is_some() {
            true => self.numbers(&["properties", "return_gradient"], 3 * n, "3 components an atom, hartree/bohr"),
            false => None,
        };
        let dipole_derivatives = self.dipole_derivatives(n);
        let geometry: Vec<[f64; 3]> = geometry?.chunks_exact(3).map(|c| [c[0], c[1], c[2]]).collect();
        self.check_distances(&geometry, &symbols);
        let raw = raw?;
        let size = 3 * n;
        let mut asymmetry: f64 = 0.0;
        let mut place = (0, 0);
        let mut hessian = raw.clone();
        for i in 0..size {
            for j in 0..i {
                let (one, other) = (raw[i * size + j], raw[j * size + i]);
                if (one - other).abs() > asymmetry {
                    asymmetry = (one - other).abs();
                    place = (i, j);
                }
                let mean = 0.5 * (one + other);
                hessian[i * size + j] = mean;
                hessian[j * size + i] = mean;
            }
        }
        if asymmetry > WORST_ASYMMETRY {
            let (i, j) = place;
            let key = if self.driver_is_hessian() { vec![Step::Key("return_result")] } else { self.property_path() };
            let path = [key, vec![Step::Index(i * size + j)]].concat();
            let expected = format!("a symmetric Hessian: row {i}, column {j} equal to row {j}, column {i} (from 0)");
            let found = format!("{} and {}", raw[i * size + j], raw[j * size + i]);
            let complaint = self.at(&path, expected, found);
            self.complaints.0.push(complaint.hint("rows may be shifted, or only one triangle filled"));
        } else if asymmetry > DOUBTFUL_ASYMMETRY {
            self.notes.push(Note::new(format!(
                "{}: mirror elements of the Hessian differ by up to {asymmetry:.1e} hartree/bohr²; their mean is taken",
                self.name
            )));
        }
        let creator = [self.text_of(&["provenance", "creator"]), self.text_of(&["provenance", "version"])];
        Some(HessianRecord {
            name: self.name.to_owned(),
            title: self.text_of(&["molecule", "name"]),
            symbols,
            geometry,
            masses,
            hessian,
            asymmetry,
            gradient,
            dipole_derivatives,
            method: self.text_of(&["model", "method"]),
            basis: self.text_of(&["model", "basis"]),
            creator: creator.join(" ").trim().to_owned(),
            charge: self.value(&["molecule", "molecular_charge"]).and_then(Value::as_f64).unwrap_or(0.0),
        })
    }

    fn is_known_schema(&mut self) -> bool {
        let hint = "write an AtomicResult of QCSchema version 1 (driver hessian)";
        if !self.root.is_object() {
            let complaint = self.at(&[], "a QCSchema result (an object)", kind(self.root)).hint(hint);
            self.complaints.0.push(complaint);
            return false;
        }
        let schema = self.text_of(&["schema_name"]);
        if !matches!(schema.as_str(), "qcschema_output" | "qc_schema_output") {
            let complaint = self.at(&[Step::Key("schema_name")], "schema_name `qcschema_output`", schema.clone());
            let hint = match schema.contains("molecule") || schema.contains("input") {
                true => "this is what goes into a computation; the result has the Hessian",
                false => hint,
            };
            self.complaints.0.push(complaint.hint(hint));
        }
        for (path, known) in [(vec!["schema_version"], [1, 1]), (vec!["molecule", "schema_version"], [2, 1])] {
            let steps: Vec<Step<'_>> = path.iter().map(|key| Step::Key(key)).collect();
            let complaint = match self.value(&path) {
                Some(version) if version.as_i64().is_some_and(|v| known.contains(&v)) => continue,
                // A molecule without version is read as the current one.
                None if path.len() == 2 => continue,
                Some(version) => self.at(&steps, format!("{} {}", path.join("."), known[0]), version.to_string()),
                None => self.at(&steps, format!("{} {}", path.join("."), known[0]), ""),
            };
            self.complaints
                .0
                .push(complaint.hint("other versions may mean other units or another order; convert the file"));
        }
        self.complaints.0.is_empty()
    }

    fn symbols(&mut self) -> Option<Vec<String>> {
        let path = [Step::Key("molecule"), Step::Key("symbols")];
        let Some(list) = self.value(&["molecule", "symbols"]).and_then(Value::as_array) else {
            let complaint = self.at(&path, "molecule.symbols: a list of element symbols", "");
            self.complaints.0.push(complaint);
            return None;
        };
        if !(2..=MOST_ATOMS).contains(&list.len()) {
            let complaint = self.at(&path, format!("2 to {MOST_ATOMS} atoms"), list.len().to_string());
            self.complaints.0.push(complaint);
            return None;
        }
        let symbols: Vec<String> = list.iter().filter_map(Value::as_str).map(normal_case).collect();
        if symbols.len() < list.len() {
            let complaint = self.at(&path, "element symbols", "something else in the list");
            self.complaints.0.push(complaint);
            return None;
        }
        Some(symbols)
    }

    fn driver_is_hessian(&self) -> bool {
        self.text_of(&["driver"]).eq_ignore_ascii_case("hessian")
    }

    fn property_path(&self) -> Vec<Step<'static>> {
        vec![Step::Key("properties"), Step::Key("return_hessian")]
    }

    fn hessian(&mut self, atoms: usize) -> Option<Vec<f64>> {
        let size = 9 * atoms * atoms;
        let what = "3N × 3N numbers, hartree/bohr²";
        if self.driver_is_hessian() {
            return self.numbers(&["return_result"], size, what);
        }
        if self.value(&["properties", "return_hessian"]).is_some() {
            self.notes.push(Note::new(format!("{}: the Hessian is that of properties.return_hessian", self.name)));
            return self.numbers(&["properties", "return_hessian"], size, what);
        }
        let driver = self.text_of(&["driver"]);
        let complaint = self.at(&[Step::Key("driver")], "driver `hessian`: a result with a Hessian", driver);
        let hint = "a gradient or an energy has no normal modes; run the computation again with driver hessian";
        self.complaints.0.push(complaint.hint(hint));
        None
    }

    fn dipole_derivatives(&mut self, atoms: usize) -> Option<Vec<f64>> {
        let keys = ["extras", "dipole_derivatives"];
        self.value(&keys)?;
        let unit = self.text_of(&["extras", "dipole_derivatives_unit"]);
        let known = unit.is_empty() || unit == "e" || unit.starts_with("e ") || unit.contains("atomic unit");
        if !known {
            let path = [Step::Key("extras"), Step::Key("dipole_derivatives_unit")];
            let complaint = self.at(&path, "dipole derivatives in e (atomic units)", unit);
            self.complaints.0.push(complaint.hint("1 D/Å = 0.2081943 e"));
            return None;
        }
        if unit.is_empty() {
            self.notes.push(Note::new(format!(
                "{}: dipole derivatives without unit are taken as e (atomic units)",
                self.name
            )));
        }
        self.numbers(&keys, 9 * atoms, "3 × 3N numbers, e")
    }

    /// A list of finite numbers, flat or by rows; the wanted length is checked.
    fn numbers(&mut self, keys: &[&str], length: usize, what: &str) -> Option<Vec<f64>> {
        let steps: Vec<Step<'_>> = keys.iter().map(|key| Step::Key(key)).collect();
        let path = keys.join(".");
        let Some(list) = self.value(keys).and_then(Value::as_array) else {
            let found = self.value(keys).map_or("", kind).to_owned();
            let complaint = self.at(&steps, format!("{path}: {what}"), found);
            self.complaints.0.push(complaint);
            return None;
        };
        let mut numbers = Vec::new();
        let mut bad: Vec<Complaint> = Vec::new();
        let mut take = |value: &Value, place: &[Step<'_>], bad: &mut Vec<Complaint>| match value.as_f64() {
            Some(number) if number.is_finite() => numbers.push(number),
            _ => {
                numbers.push(0.0);
                // One NaN seldom comes alone; the first few places are enough.
                if bad.len() < 5 {
                    let full = [steps.as_slice(), place].concat();
                    let complaint = self.at(&full, format!("a finite number in {path}"), value.to_string());
                    bad.push(match value.is_null() {
                        true => complaint.hint("null stands where the computation gave NaN"),
                        false => complaint,
                    });
                }
            }
        };
        for (row, value) in list.iter().enumerate() {
            match value.as_array() {
                Some(inner) => {
                    for (column, value) in inner.iter().enumerate() {
                        take(value, &[Step::Index(row), Step::Index(column)], &mut bad);
                    }
                }
                None => take(value, &[Step::Index(row)], &mut bad),
            }
        }
        let count = numbers.len();
        if count != length {
            let complaint = self.at(&steps, format!("{length} numbers in {path} ({what})"), format!("{count} numbers"));
            self.complaints.0.push(complaint.hint("the number of atoms is that of molecule.symbols"));
        }
        let sound = bad.is_empty() && count == length;
        self.complaints.0.extend(bad);
        sound.then_some(numbers)
    }

    fn check_distances(&mut self, geometry: &[[f64; 3]], symbols: &[String]) {
        for (i, one) in geometry.iter().enumerate() {
            for (j, other) in geometry.iter().enumerate().take(i) {
                let distance = one.iter().zip(other).map(|(a, b)| (a - b).powi(2)).sum::<f64>().sqrt();
                if distance < SHORTEST {
                    let path = [Step::Key("molecule"), Step::Key("geometry")];
                    let pair = format!("{} {j} and {} {i} at {distance:.3} bohr", symbols[j], symbols[i]);
                    let complaint = self.at(&path, format!("atoms at least {SHORTEST} bohr apart"), pair);
                    let hint = "the standard asks for bohr (1 Å = 1.8897 bohr); is the geometry in ångström?";
                    self.complaints.0.push(complaint.hint(hint));
                    return;
                }
            }
        }
    }
}

/// `CL` and `cl` are `Cl`.
fn normal_case(symbol: &str) -> String {
    let mut letters = symbol.trim().chars();
    let first = letters.next().map(|c| c.to_ascii_uppercase());
    first.into_iter().chain(letters.map(|c| c.to_ascii_lowercase())).collect()
}

fn kind(value: &Value) -> &'static str {
    match value {
        Value::Null => "null",
        Value::Bool(_) => "true or false",
        Value::Number(_) => "a number",
        Value::String(_) => "a text",
        Value::Array(_) => "a list",
        Value::Object(_) => "an object",
    }
}
