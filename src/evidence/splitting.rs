//! Splitting on cooling: how many crystallographically different carriers a level has.
//!
//! # Method
//! A band that resolves into k components on cooling has at least k carriers. A level with m different carriers shows at
//! most m components: P(k ≤ m) = 0.9 in all, P(k > m) = 0.1 (judgement); within each case components are equally
//! probable up to [`MOST`].

use std::collections::BTreeSet;

use crate::assign::candidate::Candidate;
use crate::assign::witness::{Factor, Witness};
use crate::mode::ModeTable;

/// Most components that are told apart.
pub const MOST: usize = 6;

/// A band seen to split.
#[derive(Clone, Debug, PartialEq)]
pub struct Split {
    /// Number of the band.
    pub band: usize,
    /// Components seen.
    pub components: usize,
}

/// What splittings say.
#[derive(Clone, Debug)]
pub struct Splittings {
    carriers: Vec<usize>,
    table: ModeTable,
    splits: Vec<Split>,
}

/// Likelihood of `k` components for a level with `m` different carriers.
pub fn split_likelihood(k: usize, m: usize) -> f64 {
    let m = m.clamp(1, MOST);
    if k <= m { 0.9 / m as f64 } else { 0.1 / (MOST - m).max(1) as f64 }
}

impl Splittings {
    /// Carriers are counted from the table: modes of the same motion on moieties of the same formula.
    pub fn new(table: &ModeTable, splits: Vec<Split>) -> Self {
        let carriers = table
            .modes
            .iter()
            .map(|mode| {
                let formula = table.moieties[mode.moiety].formula();
                let same = table.modes.iter().filter(|m| m.motion == mode.motion);
                let on: BTreeSet<usize> =
                    same.map(|m| m.moiety).filter(|&m| table.moieties[m].formula() == formula).collect();
                on.len()
            })
            .collect();
        Self { carriers, table: table.clone(), splits }
    }

    /// Different carriers of a level: the most among its modes.
    pub fn carriers(&self, candidate: &Candidate) -> usize {
        let list = candidate.level.excitations().iter();
        list.map(|e| self.carriers[usize::from(e.mode)] * usize::from(self.table.modes[usize::from(e.mode)].degeneracy))
            .max()
            .unwrap_or(1)
    }
}

impl Witness for Splittings {
    fn about(&self, band: usize, candidate: &Candidate) -> Vec<Factor> {
        let carriers = self.carriers(candidate);
        let told = self.splits.iter().filter(|s| s.band == band);
        told.map(|s| {
            Factor::of_likelihood(
                split_likelihood(s.components, carriers),
                format!("splits into {} on cooling; this level has {carriers} different carriers", s.components),
            )
        })
        .collect()
    }

    fn other(&self, band: usize) -> Vec<Factor> {
        let told = self.splits.iter().filter(|s| s.band == band);
        told.map(|s| Factor::of_likelihood(1.0 / MOST as f64, format!("splits into {} on cooling", s.components)))
            .collect()
    }
}
