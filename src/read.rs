//! Files become a sample, or complaints with a place.
//!
//! Every reader takes text (or bytes) and the name to show, returns all complaints of a file at once, and never panics
//! whatever the bytes. What is doubtful but usable comes back as notes.

/// Complaints with a place.
pub mod error;

/// Delimited text: separators, decimal commas, header, cells with their places.
pub mod delimited;

/// Mode tables.
pub mod mode_table;

/// Constants of the modes of one table.
pub mod constants;

/// Observed bands of one sample.
pub mod band_list;

/// What related samples show.
pub mod companions;

/// Spectra: the door for every file form.
pub mod spectrum;

/// Spectra as columns of text.
mod spectrum_text;

/// Spectra as JCAMP-DX.
mod jcamp_dx;

/// Cubic and quartic force fields as JSON.
pub mod force_field;

/// Quantum-chemical results with a Hessian.
pub mod qcschema;

/// Places in JSON text.
mod json_place;

pub use error::{Complaint, Complaints, Location};
