//! `pick` in every format.

use std::fmt::Write;

use serde::Serialize;

use super::band_list;
use super::text::{Align, columns};
use crate::note::Note;
use crate::observe::Picked;

/// One picked band, as it is printed.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct PickedRecord {
    /// Name in the list.
    pub band: String,
    /// Vacuum wavenumber, cm⁻¹.
    pub position: f64,
    /// Unit of position, sigma and width.
    pub unit: String,
    /// One standard uncertainty.
    pub sigma: f64,
    /// Full width at half maximum.
    pub fwhm: Option<f64>,
    /// Apparent absorbance below the continuum.
    pub strength: Option<f64>,
    /// band, shoulder or edge.
    pub feature: String,
    /// What to know.
    pub note: String,
    /// Vacuum wavelength, µm.
    pub position_um: f64,
    /// Depth below the continuum, a fraction of it.
    pub depth: f64,
    /// How far it stands out.
    pub prominence: f64,
    /// Vertex of the parabola, cm⁻¹.
    pub parabola_cm1: Option<f64>,
    /// Depth-weighted centroid, cm⁻¹.
    pub centroid_cm1: Option<f64>,
    /// Middle at half depth, cm⁻¹.
    pub midpoint_cm1: Option<f64>,
    /// Whether it is saturated.
    pub saturated: bool,
}

/// All that `pick` says.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct PickReport {
    /// `bandwright/pick/1`.
    pub schema: String,
    /// The spectrum.
    pub spectrum: String,
    /// Its title.
    pub sample: String,
    /// Window searched, cm⁻¹.
    pub window_cm1: [f64; 2],
    /// Noise, a fraction of the continuum.
    pub noise: f64,
    /// Weakest strength that would have been listed.
    pub detection_limit: Option<f64>,
    /// The bands, ascending in wavenumber.
    pub bands: Vec<PickedRecord>,
    /// Vertices of the continuum: [cm⁻¹, ordinate].
    pub continuum: Vec<[f64; 2]>,
    /// How the bands contradict the label.
    pub contradictions: Vec<String>,
    /// What to know.
    pub notes: Vec<String>,
}

/// The record of what was picked.
pub fn report(picked: &Picked, notes: &[Note]) -> PickReport {
    // Digits that mean something: hundredths of a wavenumber, a hundred-thousandth of depth.
    let round = |value: f64, digits: i32| {
        let scale = 10.0_f64.powi(digits);
        (value * scale).round() / scale
    };
    let bands = picked
        .bands
        .iter()
        .map(|found| {
            let band = &found.band;
            let strength = match band.strength {
                Some(crate::mode::Strength::Relative(value)) => Some(round(value, 5)),
                _ => None,
            };
            PickedRecord {
                band: band.id.clone(),
                position: round(band.position.inverse_cm(), 2),
                unit: "cm-1".to_owned(),
                sigma: round(band.sigma, 2),
                fwhm: band.fwhm.map(|w| round(w, 2)),
                strength,
                feature: band.feature.name().to_owned(),
                note: band.note.clone(),
                position_um: round(band.position.vacuum_micrometres(), 5),
                depth: round(found.depth, 5),
                prominence: round(found.prominence, 5),
                parabola_cm1: found.parabola.map(|v| round(v, 2)),
                centroid_cm1: found.centroid.map(|v| round(v, 2)),
                midpoint_cm1: found.midpoint.map(|v| round(v, 2)),
                saturated: found.saturated,
            }
        })
        .collect();
    PickReport {
        schema: "bandwright/pick/1".to_owned(),
        spectrum: picked.list.name.clone(),
        sample: picked.list.sample.clone(),
        window_cm1: picked
            .list
            .range
            .map_or([picked.window.low(), picked.window.high()], |(low, high)| [round(low, 2), round(high, 2)]),
        noise: round(picked.noise, 7),
        detection_limit: picked.list.detection_limit.map(|l| round(l, 6)),
        bands,
        continuum: picked.continuum.vertices.iter().map(|v| [round(v.0, 3), round(v.1, 6)]).collect(),
        contradictions: picked.contradictions.iter().map(|n| n.0.clone()).collect(),
        notes: notes.iter().map(|n| n.0.clone()).collect(),
    }
}

/// Text for people.
pub fn table(report: &PickReport) -> String {
    let mut text = String::new();
    let sample = if report.sample.is_empty() { &report.spectrum } else { &report.sample };
    let [low, high] = report.window_cm1;
    let _ = writeln!(text, "Bands of {sample}, {low:.0} to {high:.0} cm-1, continuum removed");
    let _ = writeln!(text, "noise {:.5} of the continuum\n", report.noise);
    let header = [
        ("band", Align::Left),
        ("cm-1", Align::Right),
        ("sigma", Align::Right),
        ("um", Align::Right),
        ("fwhm", Align::Right),
        ("depth", Align::Right),
        ("feature", Align::Left),
        ("note", Align::Left),
    ];
    let rows: Vec<Vec<String>> = report
        .bands
        .iter()
        .map(|b| {
            vec![
                b.band.clone(),
                format!("{:.1}", b.position),
                format!("{:.1}", b.sigma),
                format!("{:.4}", b.position_um),
                b.fwhm.map_or("-".to_owned(), |w| format!("{w:.0}")),
                format!("{:.3}", b.depth),
                b.feature.clone(),
                b.note.clone(),
            ]
        })
        .collect();
    text.push_str(&columns(&header, &rows));
    text.push_str(
        "\ncm-1: vacuum wavenumber and its uncertainty; um: vacuum wavelength; fwhm in cm-1; depth: below the continuum.\n",
    );
    text
}

/// The band list.
pub fn csv(picked: &Picked) -> String {
    band_list::csv(&picked.list)
}

/// JSON, schema `bandwright/pick/1`.
pub fn json(report: &PickReport) -> String {
    serde_json::to_string_pretty(report).unwrap_or_default() + "\n"
}
