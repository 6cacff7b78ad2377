//! Levels become ranked candidates of bands.
//!
//! All bands are assigned jointly: a level explains at most one band, an assigned band moves fundamentals and constants,
//! levels that were not seen count as well, and *other origin* is always a hypothesis. Equations stand beside the code
//! that holds them; `docs/calibration.md` shows how often the answers are right in simulation.

pub mod candidate;

pub mod kernel;

pub mod prior;

pub mod problem;

pub mod sampler;

pub mod witness;

pub mod offers;

pub mod chance;

pub mod verdict;

pub mod joint;

pub mod simulation;

pub mod reliability;

/// Each band by itself.
pub mod single;
