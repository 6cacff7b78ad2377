//! Known impostors: positions of water vapour and organic residue, which are not the sample's.

/// Lines of water vapour left over in library infrared spectra, cm⁻¹. Source: measured for this project on the Fourier
/// transform spectra of USGS Spectral Library 7 (Kokaly et al. 2017, doi 10.3133/ds1035).
pub const VAPOUR_LINES: [f64; 3] = [3854.0, 3869.0, 3902.0];

/// Region of those lines, cm⁻¹. It begins lower than the listed ones: picked with this program, equally sharp lines stand at
/// 3821.8 and 3838.5 cm⁻¹ in three different salts of that library (bassanite, calcite, epsomite), so they are not the salts'.
pub const VAPOUR_REGION: (f64, f64) = (3815.0, 3910.0);

/// Widest line that can be vapour, cm⁻¹ (a judgement: bands of solids are wider at these wavenumbers).
pub const VAPOUR_WIDEST: f64 = 15.0;

/// Region of the C–H stretches of organic residue, cm⁻¹: 2850 to 2960 with 2929 and 2856 measured in the same spectra, which
/// is common practice as well.
pub const ORGANIC_REGION: (f64, f64) = (2845.0, 2965.0);

/// A warning for a band at `position` of width `fwhm`, both in cm⁻¹, that may not be the sample's.
pub fn warning(position: f64, fwhm: Option<f64>) -> Option<&'static str> {
    let inside = |(low, high): (f64, f64)| (low..=high).contains(&position);
    if inside(VAPOUR_REGION) && fwhm.is_none_or(|w| w < VAPOUR_WIDEST) {
        Some("sharp and at 3820-3905 cm-1: left-over water vapour?")
    } else if inside(ORGANIC_REGION) {
        Some("at 2850-2960 cm-1: organic residue?")
    } else {
        None
    }
}
