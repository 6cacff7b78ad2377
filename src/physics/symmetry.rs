//! Point groups: species of levels, infrared and Raman activity, site and factor groups.
//!
//! # Conventions
//! Mulliken names with F (not T) for triply degenerate; separably degenerate pairs are one E. z is the principal axis;
//! the reflection σᵥ of Cₙᵥ is the xz plane, the twofold axis C₂′ of Dₙ and Dₙd is x. In C2v, B1 is symmetric under the
//! xz plane (x belongs to B1). In D2, B1, B2, B3 are the species of z, y, x. Linear groups are named Σ, Π, Δ, Φ as
//! `sigma+`, `pi_u` and so on.
//!
//! # Method
//! Nothing is typed but generators: each group is closed from 3 × 3 matrices, each irreducible representation from the
//! matrices it gives the generators, so that characters, classes, powers and the species of x, y, z, their rotations and
//! squares all follow. Tests check orthogonality, the sum of squares, and independently computed tables. C∞v and D∞h
//! stand as groups of order 80 and 160 (rotations by 9°): exact while |l| < 20.

/// Groups from generators.
pub mod group;

/// Restriction to subgroups, with every embedding.
pub mod correlation;

pub use group::{Irrep, PointGroup};

use serde::Serialize;

/// Whether a transition may absorb or scatter.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord, Hash, Serialize)]
#[serde(rename_all = "kebab-case")]
pub enum Activity {
    /// It may.
    Allowed,
    /// It may not, by symmetry.
    Forbidden,
    /// Nothing is known.
    Unknown,
}

impl Activity {
    /// The word used in files.
    pub fn word(self) -> &'static str {
        match self {
            Self::Allowed => "allowed",
            Self::Forbidden => "forbidden",
            Self::Unknown => "unknown",
        }
    }
}
