//! What accident alone would give.

use std::collections::BTreeMap;

use serde::Serialize;

use super::offers::Weighed;

/// Expected number of levels that meet a band by accident within two standard uncertainties.
#[derive(Clone, Debug, Default, PartialEq, Serialize)]
pub struct ExpectedMatches {
    /// All levels counted alike.
    pub expected: f64,
    /// Each level counted by its probability of being seen: the honest number of rivals.
    pub weighted: f64,
    /// The plain count by total quanta.
    pub by_order: BTreeMap<u8, f64>,
}

/// Half-width of the neighbourhood whose density of levels counts, cm⁻¹.
const NEIGHBOURHOOD: f64 = 200.0;

/// Expected accidental matches of a band at `position` (cm⁻¹) with uncertainty `sigma`: the mean density of levels within
/// 200 cm⁻¹ times the width ± 2 √(σ_level² + σ_band²) of each.
pub fn expected_matches(weighed: &Weighed, models: &[f64], position: f64, sigma: f64) -> ExpectedMatches {
    let mut answer = ExpectedMatches::default();
    for level in &weighed.levels {
        if (level.mean - position).abs() > NEIGHBOURHOOD {
            continue;
        }
        let width = 2.0 * (level.shared + level.private + sigma * sigma).sqrt();
        let hit = (width / NEIGHBOURHOOD).min(1.0);
        let seen: f64 = weighed
            .visibilities
            .iter()
            .zip(models)
            .map(|(v, p)| if *p < 1.0e-3 { 0.0 } else { p * v.seen(level.steps) })
            .sum();
        answer.expected += hit;
        answer.weighted += hit * seen;
        *answer.by_order.entry(level.steps.order + 1).or_default() += hit;
    }
    answer
}
