//! How many levels there are: exactly, by order and by energy, without listing them.

use super::walk::{Filter, TooManyLevels, levels_in};
use crate::physics::position::Model;

/// Direct count of harmonic states on a grid of 1 cm⁻¹ (Beyer & Swinehart, Commun. ACM 16, 379 (1973), from memory).
///
/// # Units and shapes
/// `modes`: wavenumber in whole cm⁻¹ and how often the mode counts (its degeneracy for states, 1 for levels).
/// Returns counts by order and energy: entry `[q][e]` holds the states with q quanta at e cm⁻¹, ground state included.
pub fn harmonic_counts(modes: &[(usize, u8)], highest: usize, quanta: usize) -> Vec<Vec<u64>> {
    let mut counts = vec![vec![0u64; highest + 1]; quanta + 1];
    counts[0][0] = 1;
    for &(wavenumber, times) in modes {
        for _ in 0..times {
            for energy in wavenumber..=highest {
                for q in 1..=quanta {
                    counts[q][energy] += counts[q - 1][energy - wavenumber];
                }
            }
        }
    }
    counts
}

/// Number of levels with exactly `quanta` quanta in `modes` non-degenerate modes: C(modes + quanta − 1, quanta); `None`
/// beyond 2⁶⁴.
pub fn levels_with_quanta(modes: u64, quanta: u64) -> Option<u64> {
    if modes == 0 {
        return Some(u64::from(quanta == 0));
    }
    // Each partial product is a binomial coefficient, so the division is exact.
    (1..=u128::from(quanta))
        .try_fold(1u128, |sum, k| sum.checked_mul(u128::from(modes) - 1 + k).map(|p| p / k))
        .and_then(|n| u64::try_from(n).ok())
}

/// Levels of a model in a window by order: entry `q − 1` for q quanta.
///
/// # Errors
/// [`TooManyLevels`] beyond `budget`.
pub fn levels_by_order(
    model: &Model,
    window: (f64, f64),
    quanta: u8,
    budget: usize,
) -> Result<Vec<u64>, TooManyLevels> {
    let mut counts = vec![0; usize::from(quanta)];
    for found in levels_in(model, window, quanta, &Filter::default(), budget)? {
        counts[found.level.order() as usize - 1] += 1;
    }
    Ok(counts)
}
