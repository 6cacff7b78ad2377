//! Levels become ranked candidates of bands.

/// Each band by itself.
pub mod single;
