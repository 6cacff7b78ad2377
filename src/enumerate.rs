//! Which levels fall in a window, each once, the same for any number of threads.

/// Predicted transitions of a table.
pub mod prediction;

/// The pruned walk.
pub mod walk;

/// Exact counts.
pub mod count;

/// Evidence, best levels and chance matches over every level.
pub mod search;
