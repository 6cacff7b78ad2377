//! Each band by itself: position, expected strength against the detection limit, and *other origin*.
//!
//! # Method
//! A level with expected log₁₀ strength µ is visible with probability p = (1 − lost) Φ((µ − limit)/τ). A band at y is
//! that level with weight p N(y; ν, σ² + s²), or of other origin with weight λ₀ (foreign bands per cm⁻¹). The limit is
//! matched so that the expected number of resolved bands in the measured range equals the number listed, less the
//! foreign share: the number of levels grows faster with the quanta than any constant penalty could hold back, the
//! matched limit does. Probabilities are normalised over all levels within 4.5 σ and other origin.

use std::collections::{BTreeMap, BTreeSet};

use rayon::prelude::*;

use crate::band::{Band, BandList};
use crate::enumerate::prediction::Predicted;
use crate::physics::symmetry::Activity;

/// What the ranking assumes.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Assumptions {
    /// Spread of true strengths about the expected ones, decades.
    pub tau: f64,
    /// Share of bands that are foreign to the table.
    pub foreign: f64,
    /// Probability that a visible band was not listed.
    pub lost: f64,
    /// Bands closer than this are one, cm⁻¹.
    pub resolution: f64,
    /// Candidates listed per band.
    pub listed: usize,
}

impl Default for Assumptions {
    fn default() -> Self {
        Self { tau: 0.7, foreign: 0.12, lost: 0.1, resolution: 25.0, listed: 10 }
    }
}

/// One reason that moved a candidate's odds.
#[derive(Clone, Debug, PartialEq)]
pub struct Factor {
    /// One sentence.
    pub reason: String,
    /// log₁₀ of the factor.
    pub log10: f64,
}

/// A level offered for a band.
#[derive(Clone, Debug, PartialEq)]
pub struct Offer {
    /// Its place in the list of predicted transitions.
    pub level: usize,
    /// Probability.
    pub probability: f64,
    /// What moved its odds.
    pub factors: Vec<Factor>,
}

/// Accidental matches of one band.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct Chance {
    /// Tolerance, cm⁻¹ to each side.
    pub tolerance: f64,
    /// Expected number by order, from the density of levels around the band.
    pub by_order: BTreeMap<u32, f64>,
    /// The same, each level weighted by its probability of being visible.
    pub weighted: f64,
}

impl Chance {
    /// Expected number over all orders.
    pub fn expected(&self) -> f64 {
        self.by_order.values().sum()
    }
}

/// The answer for one band.
#[derive(Clone, Debug, PartialEq)]
pub struct Ranked {
    /// Candidates, most probable first, all that matter.
    pub offers: Vec<Offer>,
    /// Probability of another substance, an artefact, or a mode the table lacks.
    pub foreign: f64,
    /// Accidental matches.
    pub chance: Chance,
}

/// Half-width of the window in which the density of levels is counted for chance matches, cm⁻¹: wide against gaps
/// between levels, narrow against the change of their density.
const DENSITY_REACH: f64 = 250.0;

/// How many standard deviations away a candidate is still looked at.
const REACH: f64 = 4.5;

/// The standard normal distribution function.
pub fn normal_cdf(x: f64) -> f64 {
    0.5 * libm::erfc(-x / std::f64::consts::SQRT_2)
}

/// The measured range: as stated, else from the outermost bands.
pub fn range_of(bands: &BandList) -> (f64, f64) {
    bands.range.unwrap_or_else(|| {
        let positions = bands.bands.iter().map(|b| b.position.inverse_cm());
        let low = positions.clone().fold(f64::INFINITY, f64::min) - 100.0;
        (low.max(1.0), positions.fold(0.0, f64::max) + 100.0)
    })
}

/// Detection limit (log₁₀ on the scale of the expected strengths) at which the expected number of resolved bands in
/// `range` equals `wanted`.
fn matched_limit(levels: &[Predicted], range: (f64, f64), wanted: f64, assume: &Assumptions) -> f64 {
    let width = 2.0 * assume.resolution;
    // Strengths on a grid of a hundredth of a decade: far below their uncertainty, and each Φ is needed once per step.
    let step = 0.01;
    let mut bins: BTreeMap<i64, BTreeMap<i64, u32>> = BTreeMap::new();
    for level in levels.iter().filter(|l| (range.0..=range.1).contains(&l.position)) {
        let strength = (level.strength.log10.max(-40.0) / step).round() as i64;
        *bins.entry((level.position / width).floor() as i64).or_default().entry(strength).or_default() += 1;
    }
    let strengths: BTreeSet<i64> = bins.values().flat_map(|bin| bin.keys().copied()).collect();
    let expected = |limit: f64| -> f64 {
        let unseen: BTreeMap<i64, f64> = strengths
            .iter()
            .map(|s| (*s, (-normal_cdf((*s as f64 * step - limit) / assume.tau)).ln_1p().max(-700.0)))
            .collect();
        let seen = bins.values().map(|bin| {
            let log: f64 = bin.iter().map(|(s, n)| f64::from(*n) * unseen[s]).sum();
            1.0 - log.exp()
        });
        (1.0 - assume.lost) * seen.sum::<f64>()
    };
    let (mut low, mut high) = (-15.0, 3.0);
    for _ in 0..60 {
        let middle = 0.5 * (low + high);
        if expected(middle) > wanted { low = middle } else { high = middle }
    }
    0.5 * (low + high)
}

/// Ranks the candidates of every band. `levels` holds all transitions of the range, a few hundred cm⁻¹ beyond it
/// included, ascending by position.
pub fn rank(levels: &[Predicted], bands: &BandList, assume: &Assumptions) -> Vec<Ranked> {
    let range = range_of(bands);
    let count = bands.bands.len() as f64;
    let limit = matched_limit(levels, range, count * (1.0 - assume.foreign), assume);
    let density = assume.foreign * count.max(1.0) / (range.1 - range.0).max(1.0);
    let visible: Vec<f64> = levels
        .par_iter()
        .map(|level| (1.0 - assume.lost) * normal_cdf((level.strength.log10 - limit) / assume.tau))
        .collect();
    let widest = levels.iter().map(|l| l.variance).fold(0.0, f64::max);
    bands
        .bands
        .par_iter()
        .map(|band| {
            let reach = REACH * (widest + band.sigma * band.sigma).sqrt();
            let near = within(levels, band.position.inverse_cm(), reach);
            rank_one(levels, &visible, near, band, density, assume)
        })
        .collect()
}

/// Places of the levels within `reach` of `y`; `levels` ascend by position.
fn within(levels: &[Predicted], y: f64, reach: f64) -> std::ops::Range<usize> {
    let start = levels.partition_point(|l| l.position < y - reach);
    start..levels.partition_point(|l| l.position <= y + reach).max(start)
}

fn rank_one(
    levels: &[Predicted],
    visible: &[f64],
    near: std::ops::Range<usize>,
    band: &Band,
    foreign_density: f64,
    assume: &Assumptions,
) -> Ranked {
    let y = band.position.inverse_cm();
    let density_of = |level: &Predicted| {
        let variance = level.variance + band.sigma * band.sigma;
        let offset = y - level.position;
        (offset * offset <= REACH * REACH * variance)
            .then(|| (-0.5 * offset * offset / variance).exp() / (std::f64::consts::TAU * variance).sqrt())
    };
    let mut weights: Vec<(usize, f64)> =
        near.filter_map(|index| Some((index, density_of(&levels[index])? * visible[index]))).collect();
    let total = foreign_density + weights.iter().map(|(_, w)| w).sum::<f64>();
    weights.sort_by(|a, b| b.1.total_cmp(&a.1).then(a.0.cmp(&b.0)));
    let reasons = |index: usize| {
        let level = &levels[index];
        let (p, variance) = (visible[index], level.variance + band.sigma * band.sigma);
        let odds = (density_of(level).unwrap_or(0.0) / foreign_density).max(1.0e-300).log10();
        let mut factors = vec![
            Factor {
                reason: format!(
                    "{:+.0} cm⁻¹ off at a standard uncertainty of {:.0}",
                    y - level.position,
                    variance.sqrt()
                ),
                log10: odds,
            },
            Factor {
                reason: format!("visible with probability {p:.2} at its expected strength"),
                log10: p.max(1.0e-300).log10(),
            },
        ];
        if level.infrared == Activity::Forbidden {
            factors
                .push(Factor { reason: format!("forbidden: {}; counted in the strength", level.reason), log10: 0.0 });
        }
        factors
    };
    let offers = weights
        .into_iter()
        .enumerate()
        .map(|(place, (level, weight))| Offer {
            level,
            probability: weight / total,
            factors: if place < assume.listed { reasons(level) } else { Vec::new() },
        })
        .collect();
    Ranked { offers, foreign: foreign_density / total, chance: chance(levels, visible, band) }
}

fn chance(levels: &[Predicted], visible: &[f64], band: &Band) -> Chance {
    let y = band.position.inverse_cm();
    let range = within(levels, y, DENSITY_REACH);
    let near = &levels[range.clone()];
    let mut sigmas: Vec<f64> = near.iter().map(|l| (l.variance + band.sigma * band.sigma).sqrt()).collect();
    sigmas.sort_by(f64::total_cmp);
    let tolerance = 2.0 * sigmas.get(sigmas.len() / 2).copied().unwrap_or(band.sigma);
    let share = (tolerance / DENSITY_REACH).min(1.0);
    let mut by_order: BTreeMap<u32, f64> = BTreeMap::new();
    let mut weighted = 0.0;
    for (level, visible) in near.iter().zip(&visible[range]) {
        *by_order.entry(level.level.order()).or_default() += share;
        weighted += share * visible;
    }
    Chance { tolerance, by_order, weighted }
}
