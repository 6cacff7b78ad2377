//! Spectra: the door for every file form, and what all forms share: units, medium, percent, deleted channels, order.
//!
//! A file that begins with `##` is read as JCAMP-DX, anything else as columns of text. What the file and the options leave
//! open is either settled by the values beyond doubt and noted, or complained about; it is never silently assumed.

use std::path::Path;

use itertools::Itertools;

use super::delimited::{Limits, utf8};
use super::error::{Complaint, Complaints, shown};
use super::{jcamp_dx, spectrum_text};
use crate::band::{Ordinate, Spectrum};
use crate::note::{Note, Noted};
use crate::quantity::{AxisUnit, Medium};

/// Most points of one spectrum. An interferometer gives at most some hundred thousand.
pub const MOST_POINTS: usize = 2_000_000;

/// Limits of a spectrum file: 128 MiB, [`MOST_POINTS`] rows, 100 000 characters a line.
pub const LIMITS: Limits = Limits { bytes: 128 << 20, rows: MOST_POINTS, line: 100_000 };

/// Complaints kept of one file; a file of the wrong kind has one a line.
pub(super) const MOST_COMPLAINTS: usize = 200;

/// Ordinates beyond this mark deleted channels: libraries write them as −1.23·10³⁴ (USGS splib07a) or similar.
const DELETED: f64 = 1.0e29;

/// Fractions of reflectance rarely exceed this (snow, specular light); percent do nearly everywhere.
const FRACTION: f64 = 1.6;

/// Share of the axis by which a detector may step back where two of them overlap.
const OVERLAP: f64 = 0.05;

/// What the user says about a spectrum file; everything that is `None` is looked for in the file.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct SpectrumOptions {
    /// Unit of the axis.
    pub axis: Option<AxisUnit>,
    /// What wavelengths were measured in.
    pub medium: Option<Medium>,
    /// What the ordinates are.
    pub ordinate: Option<Ordinate>,
    /// Whether the ordinates are percent (`Some(false)`: fractions).
    pub percent: Option<bool>,
    /// Column of the ordinates in a text of several columns: its name, or its number from one.
    pub column: Option<String>,
    /// Block of a compound JCAMP-DX file: its number from one among the spectra, or a part of its title.
    pub block: Option<String>,
}

/// The spectrum in a file: JCAMP-DX or columns of text, by content.
///
/// # Errors
/// All complaints about the file at once: not readable, too large, binary, not two columns of numbers, no unit, an axis that
/// turns round, compressed ordinates that fail their checks, a compound file without a choice of block.
pub fn read_spectrum(path: &Path, options: &SpectrumOptions) -> Result<Noted<Spectrum>, Complaints> {
    use std::io::Read;
    let name = path.display().to_string();
    let refuse = |expected: &str, found: String| Complaints::from(Complaint::about_file(&name, expected, found));
    let file = std::fs::File::open(path).map_err(|e| refuse("a file that can be read", e.to_string()))?;
    if file.metadata().is_ok_and(|m| m.is_dir()) {
        return Err(refuse("a file", "a folder".to_owned()));
    }
    let mut bytes = Vec::new();
    file.take(LIMITS.bytes + 1)
        .read_to_end(&mut bytes)
        .map_err(|e| refuse("a file that can be read", e.to_string()))?;
    read_bytes(&name, bytes, options)
}

/// The spectrum in `bytes`; `name` is shown in complaints. Text that is not UTF-8 is read as Latin-1 with a note.
///
/// # Errors
/// As for [`read_spectrum`].
pub fn read_bytes(name: &str, bytes: Vec<u8>, options: &SpectrumOptions) -> Result<Noted<Spectrum>, Complaints> {
    let mut encoding = None;
    let wide = bytes.starts_with(&[0xFF, 0xFE]) || bytes.starts_with(&[0xFE, 0xFF]);
    if !wide && let Some(at) = bytes.iter().position(|b| *b == 0) {
        let complaint = Complaint::about_file(name, "text", format!("binary data (byte {} is zero)", at + 1));
        return Err(complaint.hint("export the spectrum as JCAMP-DX or as two columns of text").into());
    }
    let text = if wide || bytes.len() as u64 > LIMITS.bytes || std::str::from_utf8(&bytes).is_ok() {
        utf8(name, bytes, LIMITS)?
    } else {
        encoding = Some(Note::new(format!("{name}: the text is not UTF-8; it was read as Latin-1")));
        bytes.iter().map(|&b| char::from(b)).collect()
    };
    let mut read = read_text(name, &text, options)?;
    read.notes.extend(encoding);
    Ok(read)
}

/// The spectrum in `text`; `name` is shown in complaints.
///
/// # Errors
/// As for [`read_spectrum`].
pub fn read_text(name: &str, text: &str, options: &SpectrumOptions) -> Result<Noted<Spectrum>, Complaints> {
    let text = text.strip_prefix('\u{FEFF}').unwrap_or(text);
    if text.trim_start().starts_with("##") {
        jcamp_dx::read(name, text, options)
    } else {
        spectrum_text::read(name, text, options)
    }
}

/// The lines of a text with their numbers from one; lines end with LF, CRLF or a lone CR.
pub(super) fn numbered_lines(text: &str) -> impl Iterator<Item = (usize, &str)> {
    let ending = if text.contains('\n') { '\n' } else { '\r' };
    text.split(ending).enumerate().map(|(at, line)| (at + 1, line.strip_suffix('\r').unwrap_or(line)))
}

/// A complaint about a whole line that is not shown.
pub(super) fn about_line(name: &str, line: usize, expected: impl Into<String>, found: impl Into<String>) -> Complaint {
    let mut complaint = Complaint::about_file(name, expected, found);
    complaint.at.line = line;
    complaint
}

/// One point as it stands in the file, with its line; a deleted channel has no ordinate.
#[derive(Clone, Copy, Debug)]
pub(super) struct RawPoint {
    pub x: f64,
    pub y: Option<f64>,
    pub line: usize,
}

/// What a reader found, before units are settled.
#[derive(Debug, Default)]
pub(super) struct RawSpectrum {
    pub name: String,
    pub title: String,
    pub points: Vec<RawPoint>,
    /// Words that describe the axis: a column name, a unit.
    pub axis_words: String,
    /// Words that describe the ordinate.
    pub ordinate_words: String,
    /// Words that may state the medium.
    pub medium_words: String,
    /// Instrument resolution in the unit of the axis.
    pub resolution: Option<f64>,
}

/// The words of a description: lower case, split at everything that is not a letter, digit, `%`, `/`, `^` or hyphen.
fn words(text: &str) -> Vec<String> {
    let plain = text.to_lowercase().replace(['µ', 'μ'], "u").replace("⁻¹", "-1").replace('\u{2212}', "-");
    plain
        .split(|c: char| !(c.is_alphanumeric() || "%/^-".contains(c)))
        .filter(|w| !w.is_empty())
        .map(str::to_owned)
        .collect()
}

/// The axis unit that a description names.
pub(super) fn axis_of(text: &str) -> Option<AxisUnit> {
    let list = words(text);
    let has = |names: &[&str]| list.iter().any(|w| names.contains(&w.as_str()));
    let begins = |names: &[&str]| list.iter().any(|w| names.iter().any(|n| w.starts_with(n)));
    if begins(&["cm-1", "cm^-1", "1/cm", "wavenumber", "cm1", "cm^"]) || list.windows(2).any(|p| p == ["cm", "-1"]) {
        Some(AxisUnit::InverseCentimetre)
    } else if has(&["nm"]) || begins(&["nanomet"]) {
        Some(AxisUnit::Nanometre)
    } else if has(&["um"]) || begins(&["micron", "micromet"]) {
        Some(AxisUnit::Micrometre)
    } else {
        None
    }
}

/// The ordinate that a description names.
pub(super) fn ordinate_of(text: &str) -> Option<Ordinate> {
    let list = words(text);
    let begins = |names: &[&str]| list.iter().any(|w| names.iter().any(|n| w.starts_with(n)));
    let is = |names: &[&str]| list.iter().any(|w| names.contains(&w.as_str()));
    // One letter is a name only where it stands alone or beside a percent sign: `sample a` is no absorbance.
    let letter = |name: &str| {
        let letters: Vec<&str> = list.iter().map(|w| w.trim_matches('%')).filter(|w| !w.is_empty()).collect();
        letters == [name]
    };
    // `log(1/R)` is an absorbance although it names the reflectance: the logarithm is looked for first.
    if begins(&["absorb", "extinction", "kubelka"])
        || is(&["abs", "log", "log10", "lg", "-log", "-log10", "k-m"])
        || letter("a")
    {
        Some(Ordinate::Absorbance)
    } else if begins(&["transmi"]) || letter("t") {
        Some(Ordinate::Transmittance)
    } else if begins(&["reflect"]) || is(&["refl"]) || letter("r") {
        Some(Ordinate::Reflectance)
    } else {
        None
    }
}

/// Whether a description names the Kubelka–Munk function.
fn is_kubelka_munk(text: &str) -> bool {
    words(text).iter().any(|w| w.starts_with("kubelka") || w == "k-m")
}

/// The medium that a description names.
pub(super) fn medium_of(text: &str) -> Option<Medium> {
    let list = words(text);
    let is = |name: &str| list.iter().any(|w| w == name);
    match (is("air"), is("vacuum") || is("vac")) {
        (true, false) => Some(Medium::Air),
        (false, true) => Some(Medium::Vacuum),
        _ => None,
    }
}

/// The axis unit that the values leave possible: an axis that begins below 5 and ends below 1000 is one of micrometres.
/// Nanometres and wavenumbers overlap, so they are asked about.
fn axis_of_values(name: &str, points: &[RawPoint], notes: &mut Vec<Note>) -> Result<AxisUnit, Complaints> {
    let (low, high) = points.iter().map(|p| p.x).minmax().into_option().unwrap_or((0.0, 0.0));
    if low < 5.0 && high < 1000.0 && low > 0.05 {
        notes.push(Note::new(format!(
            "{name}: the axis has no unit; its values, {low} to {high}, are taken as wavelengths in um (--axis says it)"
        )));
        return Ok(AxisUnit::Micrometre);
    }
    let complaint =
        Complaint::about_file(name, "a unit of the axis", format!("values from {low} to {high} without one"));
    Err(complaint.hint("say --axis um, --axis nm or --axis cm-1, or name the column like `wavelength_nm`").into())
}

/// A spectrum over ascending vacuum wavenumbers from the points of a file.
pub(super) fn assemble(
    raw: RawSpectrum,
    options: &SpectrumOptions,
    mut notes: Vec<Note>,
) -> Result<Noted<Spectrum>, Complaints> {
    let RawSpectrum { name, title, mut points, axis_words, ordinate_words, medium_words, resolution } = raw;
    let axis = match options.axis.or_else(|| axis_of(&axis_words)) {
        Some(axis) => axis,
        None => axis_of_values(&name, &points, &mut notes)?,
    };
    let stated = options.medium.or_else(|| medium_of(&medium_words));
    let medium_given = stated.is_some() || axis == AxisUnit::InverseCentimetre;
    if axis == AxisUnit::InverseCentimetre && stated == Some(Medium::Air) {
        notes.push(Note::new(format!("{name}: a wavenumber axis is taken as vacuum wavenumbers; `air` has no effect")));
    }
    let medium = if axis == AxisUnit::InverseCentimetre { Medium::Vacuum } else { stated.unwrap_or_default() };
    if !medium_given {
        notes.push(Note::new(format!(
            "{name}: whether wavelengths are those in air or in vacuum is not stated; vacuum is taken, and if it was air all \
             wavenumbers are 1 to 3 cm⁻¹ too high (--medium says it)"
        )));
    }
    let all = points.len();
    points.retain(|p| p.y.is_some_and(|y| y.is_finite() && y.abs() < DELETED));
    if points.len() < all {
        notes.push(Note::new(format!(
            "{name}: {} of {all} channels are marked as deleted and left out",
            all - points.len()
        )));
    }
    order(&name, &mut points, &mut notes)?;
    let mut wavenumbers = Vec::with_capacity(points.len());
    let mut ordinates = Vec::with_capacity(points.len());
    for point in &points {
        let wavenumber = axis.wavenumber(point.x, medium).map_err(|_| {
            let found = shown(&point.x.to_string());
            about_line(&name, point.line, format!("a position in {}", axis.name()), found)
                .hint("a wavelength is above zero; is the axis the first column?")
        })?;
        wavenumbers.push(wavenumber.inverse_cm());
        ordinates.push(point.y.unwrap_or(0.0));
    }
    if wavenumbers.first() > wavenumbers.last() {
        wavenumbers.reverse();
        ordinates.reverse();
    }
    // Two wavelengths that differ in the last digit only can meet in wavenumber.
    let kept: Vec<bool> =
        std::iter::once(true).chain(wavenumbers.windows(2).map(|pair| pair[1] > pair[0])).take(all).collect();
    let mut keep = kept.iter();
    wavenumbers.retain(|_| *keep.next().unwrap_or(&false));
    let mut keep = kept.iter();
    ordinates.retain(|_| *keep.next().unwrap_or(&false));
    if wavenumbers.len() < 3 {
        let found = match wavenumbers.len() {
            0 => String::new(),
            n => n.to_string(),
        };
        let complaint = Complaint::about_file(&name, "at least three points of a spectrum", found);
        return Err(complaint.hint("two columns of numbers: position and ordinate, one point a line").into());
    }
    let mut ordinate = ordinate(&name, options, &ordinate_words, &mut notes);
    if options.ordinate.is_none() && is_kubelka_munk(&ordinate_words) {
        // The inverse of F = (1 − R)² / (2 R), in the form that loses no digits.
        for value in &mut ordinates {
            let f = value.max(0.0);
            *value = 1.0 / (1.0 + f + (f * f + 2.0 * f).sqrt());
        }
        ordinate = Ordinate::Reflectance;
        notes.push(Note::new(format!(
            "{name}: the ordinate is the Kubelka-Munk function; it was turned into reflectance"
        )));
    }
    scale(&name, options, ordinate, &ordinate_words, &mut ordinates, &mut notes);
    let middle = axis.wavenumber(points[points.len() / 2].x, medium).ok();
    let resolution = resolution
        .filter(|r| r.is_finite() && *r > 0.0)
        .and_then(|r| middle.map(|at| axis.width_inverse_cm(r, at)))
        .filter(|r| r.is_finite());
    let value =
        Spectrum { name, title, wavenumbers, ordinates, ordinate, axis: Some(axis), medium, medium_given, resolution };
    Ok(Noted { value, notes })
}

/// Brings the points into strict order along their axis. Detectors that overlap a little are sorted with a note, equal
/// positions are averaged with a note; an axis that turns round is two spectra and refused.
fn order(name: &str, points: &mut Vec<RawPoint>, notes: &mut Vec<Note>) -> Result<(), Complaints> {
    let Some((low, high)) = points.iter().map(|p| p.x).minmax().into_option() else { return Ok(()) };
    let up = points.windows(2).filter(|pair| pair[1].x > pair[0].x).count();
    let rising = up >= points.windows(2).filter(|pair| pair[1].x < pair[0].x).count();
    let back = |pair: &[RawPoint]| if rising { pair[0].x - pair[1].x } else { pair[1].x - pair[0].x };
    let (mut steps_back, mut equal) = (0_usize, 0_usize);
    for pair in points.windows(2) {
        let step = back(pair);
        steps_back += usize::from(step > 0.0);
        equal += usize::from(step == 0.0);
        if step > OVERLAP * (high - low) {
            let direction = if rising { "ascend" } else { "descend" };
            let expected = format!("positions that keep on {direction}ing after {}", pair[0].x);
            let complaint = about_line(name, pair[1].line, expected, pair[1].x.to_string());
            return Err(complaint.hint("one spectrum a file: are there two, one after the other?").into());
        }
    }
    if steps_back * 5 > points.len() {
        let complaint = Complaint::about_file(name, "positions in ascending or descending order", "neither");
        return Err(complaint.hint("is the axis the first column, and is the decimal sign a point?").into());
    }
    if equal * 2 > points.len() {
        let complaint = Complaint::about_file(name, "positions that differ", "the same position in most lines");
        return Err(complaint.hint("is the axis the first column, and is the decimal sign a point?").into());
    }
    if steps_back > 0 {
        notes.push(Note::new(format!(
            "{name}: the axis steps back {steps_back} times by little, as where detectors overlap; the points were sorted"
        )));
        points.sort_by(|a, b| if rising { a.x.total_cmp(&b.x) } else { b.x.total_cmp(&a.x) });
    }
    let before = points.len();
    let merged: Vec<RawPoint> = points
        .chunk_by(|a, b| a.x == b.x)
        .map(|run| {
            let mean = run.iter().filter_map(|p| p.y).sum::<f64>() / run.len() as f64;
            RawPoint { y: Some(mean), ..run[0] }
        })
        .collect();
    *points = merged;
    if points.len() < before {
        notes.push(Note::new(format!(
            "{name}: {} points share their position with another; their ordinates were averaged",
            before - points.len()
        )));
    }
    Ok(())
}

/// What the ordinate is, noted when nobody says it.
fn ordinate(name: &str, options: &SpectrumOptions, described: &str, notes: &mut Vec<Note>) -> Ordinate {
    options.ordinate.or_else(|| ordinate_of(described)).unwrap_or_else(|| {
        notes.push(Note::new(format!(
            "{name}: what the ordinate is, is not stated; it is taken as reflectance, bands being minima (--ordinate says it)"
        )));
        Ordinate::Reflectance
    })
}

/// Turns percent into fractions.
fn scale(
    name: &str,
    options: &SpectrumOptions,
    ordinate: Ordinate,
    described: &str,
    ordinates: &mut [f64],
    notes: &mut Vec<Note>,
) {
    if ordinate == Ordinate::Absorbance && options.percent != Some(true) {
        return;
    }
    let described = described.to_lowercase();
    let percent = options.percent.unwrap_or_else(|| {
        let mut sorted = ordinates.to_vec();
        sorted.sort_by(f64::total_cmp);
        let most = sorted[sorted.len() * 9 / 10];
        let says = described.contains('%') || described.contains("percent");
        if most > FRACTION {
            if !says {
                notes.push(Note::new(format!(
                    "{name}: ordinates up to {most:.4} cannot be fractions; they are taken as percent (--percent false says \
                     otherwise)"
                )));
            }
            true
        } else if says {
            notes.push(Note::new(format!(
                "{name}: the ordinate is called percent, but its values are fractions; they are taken as fractions (--percent \
                 true says otherwise)"
            )));
            false
        } else {
            false
        }
    });
    if percent {
        for value in ordinates.iter_mut() {
            *value *= 0.01;
        }
    }
}
