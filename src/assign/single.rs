//! Each band by itself: position, expected strength against the detection limit, and *other origin*.
//!
//! # Method
//! A level with expected log₁₀ strength µ is visible with probability p = (1 − lost) Φ((µ − limit)/τ). A band at y is
//! that level with weight p N(y; ν, σ² + s²), or of other origin with weight λ₀ (foreign bands per cm⁻¹). The limit is
//! matched so that the expected number of resolved bands in the measured range equals the number listed, less the
//! foreign share: the number of levels grows faster with the quanta than any constant penalty could hold back, the
//! matched limit does. Probabilities are normalised over all levels within 4.5 σ and other origin.

use std::collections::BTreeMap;

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
    let mut bins: BTreeMap<i64, Vec<f64>> = BTreeMap::new();
    for level in levels.iter().filter(|l| (range.0..=range.1).contains(&l.position)) {
        bins.entry((level.position / width).floor() as i64).or_default().push(level.strength.log10);
    }
    let expected = |limit: f64| -> f64 {
        let seen = bins
            .values()
            .map(|bin| 1.0 - bin.iter().map(|mu| 1.0 - normal_cdf((mu - limit) / assume.tau)).product::<f64>());
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
    bands.bands.iter().map(|band| rank_one(levels, band, limit, density, assume)).collect()
}

fn rank_one(levels: &[Predicted], band: &Band, limit: f64, foreign_density: f64, assume: &Assumptions) -> Ranked {
    let y = band.position.inverse_cm();
    let mut weights: Vec<(usize, f64, Vec<Factor>)> = Vec::new();
    for (index, level) in levels.iter().enumerate() {
        let variance = level.variance + band.sigma * band.sigma;
        let offset = y - level.position;
        if offset * offset > REACH * REACH * variance {
            continue;
        }
        let visible = (1.0 - assume.lost) * normal_cdf((level.strength.log10 - limit) / assume.tau);
        let match_density = (-0.5 * offset * offset / variance).exp() / (std::f64::consts::TAU * variance).sqrt();
        let mut factors = vec![
            Factor {
                reason: format!("{:+.0} cm⁻¹ off at a standard uncertainty of {:.0}", offset, variance.sqrt()),
                log10: (match_density / foreign_density).log10(),
            },
            Factor {
                reason: format!("visible with probability {visible:.2} at its expected strength"),
                log10: visible.max(1.0e-300).log10(),
            },
        ];
        if level.infrared == Activity::Forbidden {
            factors
                .push(Factor { reason: format!("forbidden: {}; counted in the strength", level.reason), log10: 0.0 });
        }
        weights.push((index, visible * match_density, factors));
    }
    let total = foreign_density + weights.iter().map(|(_, w, _)| w).sum::<f64>();
    weights.sort_by(|a, b| b.1.total_cmp(&a.1).then(a.0.cmp(&b.0)));
    let offers = weights
        .into_iter()
        .map(|(level, weight, factors)| Offer { level, probability: weight / total, factors })
        .collect();
    Ranked { offers, foreign: foreign_density / total, chance: chance(levels, band, limit, assume) }
}

fn chance(levels: &[Predicted], band: &Band, limit: f64, assume: &Assumptions) -> Chance {
    let y = band.position.inverse_cm();
    let near: Vec<&Predicted> = levels.iter().filter(|l| (l.position - y).abs() <= DENSITY_REACH).collect();
    let mut sigmas: Vec<f64> = near.iter().map(|l| (l.variance + band.sigma * band.sigma).sqrt()).collect();
    sigmas.sort_by(f64::total_cmp);
    let tolerance = 2.0 * sigmas.get(sigmas.len() / 2).copied().unwrap_or(band.sigma);
    let share = (tolerance / DENSITY_REACH).min(1.0);
    let mut by_order: BTreeMap<u32, f64> = BTreeMap::new();
    let mut weighted = 0.0;
    for level in near {
        *by_order.entry(level.level.order()).or_default() += share;
        weighted += share * (1.0 - assume.lost) * normal_cdf((level.strength.log10 - limit) / assume.tau);
    }
    Chance { tolerance, by_order, weighted }
}

/// Verdict of a band in one of four words, and a sentence.
///
/// # Rule
/// *secure*: the leading family has at least 0.9 and at most one and a half visible levels are expected there (weighted count, itself included);
/// *leading*: at least 0.6; *no better than chance*: other origin leads, or the leading family has less than 0.3 and two
/// or more rivals are expected; *open* otherwise. Thresholds are conventions of this project.
pub fn verdict(leading: f64, other: f64, rivals: f64) -> &'static str {
    if other >= leading || (leading < 0.3 && rivals >= 2.0) {
        "no better than chance"
    } else if leading >= 0.9 && rivals < 1.5 {
        "secure"
    } else if leading >= 0.6 {
        "leading"
    } else {
        "open"
    }
}
