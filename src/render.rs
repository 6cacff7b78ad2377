//! One report record, one function a format.

/// Mode tables and constants as files.
pub mod mode_table;
