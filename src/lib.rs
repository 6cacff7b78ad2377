//! Overtones and combinations of hydrated salts: where they fall, which observed band is which, and what the evidence
//! is worth.
//!
//! The rooms below stand in the order the data flows; a room uses only rooms above it (`tests/architecture.rs` checks).
//! Positions are vacuum wavenumbers in cm⁻¹ everywhere inside; wavelengths live at the doors.

/// Words: a number with its unit; wavenumber, shift, wavelength, medium.
pub mod quantity;

/// Words: an answer together with what to know about it.
pub mod note;

/// Words: what vibrates, on which moiety, with which motion; the mode table of one sample.
pub mod mode;

/// Words: a set of quanta.
pub mod level;

/// Words: what was observed; bands, companions, spectra.
pub mod band;

/// Reading: files become a sample, or complaints with a place.
pub mod read;

/// Library: bundled mode tables and default constants, each row with its source.
pub mod library;

/// Physics: modes become levels. No files, no clock, no printing.
pub mod physics;

/// Enumeration: which levels fall in a window, each once.
pub mod enumerate;

/// Observation: a spectrum becomes bands.
pub mod observe;

/// Assignment: levels become ranked candidates of bands.
pub mod assign;

/// Evidence: companions, missing bands, advice, screening.
pub mod evidence;

/// Rendering: one report record, one function a format.
pub mod render;

/// Command line: a file per command.
pub mod cli;
