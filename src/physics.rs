//! Modes become levels. No files, no clock, no printing.

/// Positions and uncertainties of levels from a resolved set of constants.
pub mod position;
