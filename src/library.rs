//! Bundled mode tables and default constants, compiled in from `mode_tables/`, each row with its source.

/// Default constants by pair of roles.
pub mod defaults;

/// Bundled mode tables.
pub mod tables;

/// Scale factors from harmonic wavenumbers to fundamentals.
pub mod scale_factors;

pub use defaults::{Contact, Defaults, Role};
pub use tables::{bundled, names};
