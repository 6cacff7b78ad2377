//! Resonances and polyads.

use super::position::Model;
use crate::level::Level;

/// A level after mixing.
pub struct MixedLevel {
    /// Named by its largest share.
    pub level: Level,
    /// Position, cm⁻¹.
    pub position: f64,
    /// Zero-order shares, largest first.
    pub shares: Vec<(Level, f64)>,
}

impl MixedLevel {
    /// Variance of the position, cm⁻².
    pub fn variance(&self, model: &Model) -> f64 {
        model.variance(&self.level)
    }
}

/// Levels before mixing: the polyad code is not in yet, so resonance elements move nothing.
pub fn mix(model: &Model, levels: &[Level]) -> Vec<MixedLevel> {
    levels
        .iter()
        .map(|level| MixedLevel {
            position: model.position(level),
            shares: vec![(level.clone(), 1.0)],
            level: level.clone(),
        })
        .collect()
}
