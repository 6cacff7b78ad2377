//! What the picture formats share: a spectrum to draw, and the expected spectrum of a prediction.

use serde::Serialize;

use super::report::PredictReport;

/// A measured spectrum as it is drawn.
#[derive(Clone, Debug, Default, PartialEq, Serialize)]
pub struct PlottedSpectrum {
    /// Name of the spectrum.
    pub name: String,
    /// Vacuum wavenumbers, cm⁻¹, ascending.
    pub wavenumbers: Vec<f64>,
    /// One ordinate a wavenumber.
    pub ordinates: Vec<f64>,
    /// Upper hull at the same wavenumbers.
    pub continuum: Vec<f64>,
    /// Label of the ordinate: `reflectance`.
    pub ordinate: String,
}

/// The sum of all expected bands.
#[derive(Clone, Debug, Default, PartialEq, Serialize)]
pub struct ExpectedSpectrum {
    /// Vacuum wavenumbers, cm⁻¹, ascending.
    pub wavenumbers: Vec<f64>,
    /// Sum of Gaussian bands of expected strength and width.
    pub sharp: Vec<f64>,
    /// The same with every band widened by its uncertainty of position, areas kept.
    pub blurred: Vec<f64>,
}

/// Points of an expected spectrum.
const POINTS: usize = 1200;

/// Full width at half maximum of a Gaussian over its standard deviation, 2 √(2 ln 2).
const WIDTH_OVER_SIGMA: f64 = 2.354_820_045;

/// Narrowest standard deviation that is drawn, cm⁻¹.
const NARROWEST: f64 = 0.5;

/// Sum of Gaussian bands of height 10^strength and the stated width, over the window of the report. The blurred
/// curve adds the uncertainty of position in quadrature and keeps each area.
pub fn expected(report: &PredictReport) -> ExpectedSpectrum {
    let (low, high) = report.window_cm1;
    let step = (high - low) / (POINTS - 1) as f64;
    let wavenumbers: Vec<f64> = (0..POINTS).map(|i| low + step * i as f64).collect();
    let bands: Vec<(f64, f64, f64, f64)> = report
        .levels
        .iter()
        .map(|l| {
            let narrow = (l.fwhm_cm1 / WIDTH_OVER_SIGMA).max(NARROWEST);
            (l.position_cm1, 10f64.powf(l.strength_log10), narrow, narrow.hypot(l.sigma_cm1))
        })
        .collect();
    let sum = |blur: bool| {
        wavenumbers
            .iter()
            .map(|x| {
                bands
                    .iter()
                    .map(|&(centre, height, narrow, wide)| {
                        let (height, sigma) = if blur { (height * narrow / wide, wide) } else { (height, narrow) };
                        height * (-0.5 * ((x - centre) / sigma).powi(2)).exp()
                    })
                    .sum()
            })
            .collect()
    };
    let (sharp, blurred) = (sum(false), sum(true));
    ExpectedSpectrum { wavenumbers, sharp, blurred }
}
