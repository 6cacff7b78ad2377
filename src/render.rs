//! One report record, one function a format.

/// Mode tables and constants as files.
pub mod mode_table;

/// The records that every format is a function of.
pub mod report;

/// Aligned text.
pub mod text;

/// `predict` in every format.
pub mod predict;

/// From answers to records.
pub mod records;

/// `assign` in text, CSV and JSON.
pub mod assign;

/// Band lists as files.
pub mod band_list;

/// `pick` in every format.
pub mod pick;

/// `modes` as text and JSON.
pub mod modes;

/// What the picture formats share.
pub mod drawing;

/// One self-contained page.
pub mod html;
