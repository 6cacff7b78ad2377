//! Observation: a spectrum becomes bands.
//!
//! # Method
//! Everything happens over vacuum wavenumber. An upper convex hull over the window is the continuum; ordinates divided by it
//! give the depth of a band; maxima of depth that stand out from their surroundings by more than the noise are bands. Hull,
//! parabola and centroid are not invariant under λ ↔ 1/λ, so one axis has to be chosen, and it is the one of the levels.
//! Source of the continuum: Clark and Roush, J. Geophys. Res. 89, 6329 (1984) (from memory).

/// The continuum: an upper convex hull, and what is left when it is removed.
pub mod continuum;

/// The centre of a band: parabola, centroid, midpoint.
pub mod centre;

/// Widths, and what an instrument does to them.
pub mod width;

/// Reflectance as absorption.
pub mod reflectance;

/// Noise of a spectrum.
pub mod noise;

/// Smoothing where the noise asks for it.
pub mod smoothing;

/// Local maxima and how far they stand out.
pub mod prominence;

/// Shoulders by curvature.
pub mod shoulder;

/// Known impostors: positions of water vapour and organic residue.
pub mod impostor;

/// Whether a spectrum fits the label of its sample.
pub mod label;

/// Band picking.
pub mod picking;

pub use picking::{PickOptions, Picked, PickedBand, pick};
