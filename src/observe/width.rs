//! Widths, and what an instrument does to them. All widths are full widths at half maximum, in cm⁻¹.
//!
//! Source: two Gaussians fold to one with the squares of the widths added (elementary); the Voigt approximation is Olivero
//! and Longbothum, J. Quant. Spectrosc. Radiat. Transfer 17, 233 (1977) (from memory; within 0.02 % of the exact width).

use crate::quantity::{AxisUnit, Wavenumber};

/// The width at which a Gaussian band of width `intrinsic` is seen by a Gaussian instrument of width `instrument`.
pub fn seen_width(intrinsic: f64, instrument: f64) -> f64 {
    intrinsic.hypot(instrument)
}

/// The factor by which that instrument lowers the peak of that band.
pub fn seen_height(intrinsic: f64, instrument: f64) -> f64 {
    intrinsic / seen_width(intrinsic, instrument)
}

/// The width of a band before a Gaussian instrument widened it; `None` when the band is not wider than the instrument.
pub fn intrinsic_width(seen: f64, instrument: f64) -> Option<f64> {
    (seen > instrument).then(|| (seen * seen - instrument * instrument).sqrt())
}

/// Width of a Lorentzian of width `lorentz` folded with a Gaussian of width `gauss`.
pub fn voigt_width(lorentz: f64, gauss: f64) -> f64 {
    0.5346 * lorentz + (0.2166 * lorentz * lorentz + gauss * gauss).sqrt()
}

/// Position error of a Gaussian band from white noise: 0.69 (F step)^½ σ / D, never below a tenth of the step.
///
/// # Units and shapes
/// Width `fwhm` F and sampling `step` in cm⁻¹, `noise` σ a sample and `depth` D as fractions.
/// # Method
/// Fisher information of the position of a Gaussian (derived for this project); the lower bound is a judgement: sampling
/// and wavelength scale are hardly known better.
pub fn noise_limit(fwhm: f64, step: f64, noise: f64, depth: f64) -> f64 {
    (0.69 * (fwhm * step).sqrt() * noise / depth).max(0.1 * step)
}

/// An instrument resolution as written: a width and its unit, like `10nm` or `4cm-1`.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Resolution {
    width: f64,
    unit: AxisUnit,
}

impl Resolution {
    /// The resolution `width` in `unit`; `None` unless positive and finite.
    pub fn new(width: f64, unit: AxisUnit) -> Option<Self> {
        (width > 0.0 && width.is_finite()).then_some(Self { width, unit })
    }

    /// The resolution a person wrote; `None` when there is no number above zero or no unit.
    pub fn from_text(text: &str) -> Option<Self> {
        let text = text.trim();
        let end = text.find(|c: char| !(c.is_ascii_digit() || c == '.'))?;
        Self::new(text[..end].parse().ok()?, AxisUnit::from_text(&text[end..])?)
    }

    /// The width in cm⁻¹ at a wavenumber in cm⁻¹; a width in wavelength grows with its square.
    pub fn at(self, wavenumber: f64) -> f64 {
        Wavenumber::from_inverse_cm(wavenumber).map_or(0.0, |at| self.unit.width_inverse_cm(self.width, at))
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_resolution_in_wavelength_grows_with_the_square_of_the_wavenumber() {
        // Section "From reflectance to band positions" of the project's reference: 10 nm at 1.94 um is 27 cm-1, at 1.45 um 48.
        let resolution = Resolution::from_text("10 nm").unwrap();
        assert!((resolution.at(1.0e4 / 1.94) - 27.0).abs() < 0.5 && (resolution.at(1.0e4 / 1.45) - 48.0).abs() < 0.5);
        assert_eq!(Resolution::from_text("4cm-1").unwrap().at(5000.0), 4.0);
        for text in ["", "4", "nm", "-4nm", "0nm", "1e999nm"] {
            assert!(Resolution::from_text(text).is_none(), "{text}");
        }
    }
}
