//! Files become a sample, or complaints with a place.
//!
//! Every reader takes text (or bytes) and the name to show, returns all complaints of a file at once, and never panics
//! whatever the bytes. What is doubtful but usable comes back as notes.

/// Complaints with a place.
pub mod error;

/// Delimited text: separators, decimal commas, header, cells with their places.
pub mod delimited;

pub use error::{Complaint, Complaints, Location};
