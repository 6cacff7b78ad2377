//! Reflectance as absorption.

/// Kubelka–Munk function of an optically thick powder, F(R) = (1 − R)² / (2 R) = K/S; infinite for R = 0.
///
/// Maxima of F are less distorted than minima of R for strong bands; it fails with specular light, and where scattering
/// depends on wavelength. Source: Kubelka and Munk, Z. Tech. Phys. 12, 593 (1931) (from memory).
pub fn kubelka_munk(reflectance: f64) -> f64 {
    (1.0 - reflectance).powi(2) / (2.0 * reflectance)
}

/// Apparent absorbance log10(1/R); infinite for R = 0.
pub fn apparent_absorbance(reflectance: f64) -> f64 {
    -reflectance.log10()
}
