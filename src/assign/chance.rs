//! What accident alone would give.

use std::collections::{BTreeMap, HashMap};

use rand::{Rng, SeedableRng};
use rand_chacha::ChaCha8Rng;
use rayon::prelude::*;
use serde::Serialize;

use super::candidate::Candidate;
use super::kernel::log_normal;
use super::offers::{Weighed, Weighing, band_variance, measured_range};
use super::prior::{Census, Steps, StrengthModel, StrengthPrior, Visibility};
use crate::band::BandList;
use crate::level::Level;
use crate::library::tables;
use crate::mode::{ModeTable, MoietyKind, Motion};
use crate::physics::position::Model;

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

/// Whether the list as a whole is better explained than by an unrelated table.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct Coincidence {
    /// p = (1 + number of null tables that explain the list at least as well) / (1 + trials).
    pub p_value: f64,
    /// The null in words.
    pub null: String,
    /// Null tables drawn.
    pub trials: usize,
    /// Seed of the draws.
    pub seed: u64,
    /// Score of the table: Σ_b log(1 + Σ_v p(v) N(y_b; m, k + s²)/λ₀).
    pub score: f64,
    /// Median score of the null tables.
    pub null_median: f64,
    /// p of the best single level of each band, uncorrected; times the number of bands for the list.
    pub bands: Vec<f64>,
    /// Most quanta counted in the score.
    pub quanta: u8,
}

/// A mode's motion, the kind of its moiety, and its fundamental, cm⁻¹.
type Known = (Motion, MoietyKind, f64);

/// The words of [`Coincidence::null`].
pub const NULL_WORDS: &str = "mode tables of the same make-up, each fundamental redrawn from the range of its motion";

/// Levels of the null tables are counted up to this many; quanta are lowered until they fit.
const MOST_LEVELS: usize = 60_000;

/// A level by its quanta, ready to be placed with other fundamentals.
struct Skeleton {
    quanta: Vec<(u16, f32)>,
    /// Position minus Σ vᵢ νᵢ, cm⁻¹.
    anharmonic: f64,
    variance: f64,
    /// Steps without the tilt.
    steps: Steps,
}

/// Ranges of the fundamentals of each mode's motion in the bundled tables, by kind of moiety; by motion alone where a
/// kind has fewer than three; the mode's own position ± 15 % where the bundled tables have none.
pub fn bundled_ranges(table: &ModeTable) -> Vec<(f64, f64)> {
    let mut known: Vec<Known> = Vec::new();
    for name in tables::names() {
        let Some(Ok(bundled)) = tables::bundled(name) else { continue };
        let natural = bundled.value.isotopes.is_empty();
        for (index, mode) in bundled.value.modes.iter().enumerate().filter(|_| natural) {
            known.push((mode.motion, bundled.value.moiety_of(index).kind, mode.wavenumber.inverse_cm()));
        }
    }
    let span = |keep: &dyn Fn(&Known) -> bool| -> Option<(f64, f64)> {
        let list: Vec<f64> = known.iter().filter(|k| keep(k)).map(|k| k.2).collect();
        let low = list.iter().copied().fold(f64::INFINITY, f64::min);
        let high = list.iter().copied().fold(0.0, f64::max);
        (list.len() >= 3 && high > low).then_some((low, high))
    };
    (0..table.modes.len())
        .map(|i| {
            let (motion, kind, nu) =
                (table.modes[i].motion, table.moiety_of(i).kind, table.modes[i].wavenumber.inverse_cm());
            span(&|k| k.0 == motion && k.1 == kind)
                .or_else(|| span(&|k| k.0 == motion))
                .unwrap_or((0.85 * nu, 1.15 * nu))
        })
        .collect()
}

/// Tests the whole list against tables redrawn from `ranges` (cm⁻¹, one a mode).
///
/// # Method
/// The score of a table is S = Σ_b log(1 + Σ_v p(v) N(y_b; m, k + s²)/λ₀), with the scale of strengths matched anew for
/// every null table. Every level of every band is tried in each null trial: looking elsewhere is part of S. Shifting or
/// scattering the bands would be the wrong null: any hydrate has bands near 5100 and 6900 cm⁻¹, so that it would only
/// prove that the sample holds water.
pub fn list_test(
    model: &Model,
    table: &ModeTable,
    bands: &BandList,
    weighing: &Weighing,
    quanta: u8,
    ranges: &[(f64, f64)],
    (trials, seed): (usize, u64),
) -> Coincidence {
    let range = measured_range(bands, weighing.range);
    let count = bands.bands.len();
    let mut quanta = quanta;
    while quanta > 2 && levels_up_to(table.modes.len(), quanta) > MOST_LEVELS as f64 {
        quanta -= 1;
    }
    let skeletons = skeletons(model, table, &weighing.strength, quanta);
    let density = weighing.foreign * count as f64 / (range.1 - range.0).max(1.0);
    let mut targets: Vec<(f64, f64, usize)> =
        bands.bands.iter().enumerate().map(|(b, band)| (band.position.inverse_cm(), band_variance(band), b)).collect();
    targets.sort_by(|a, b| a.0.total_cmp(&b.0));
    let strength = central(&weighing.strength.models);
    let score = |nu: &[f64]| -> (f64, Vec<f64>) {
        let placed: Vec<(f64, Steps, f64)> = skeletons
            .iter()
            .filter_map(|s| {
                let sum: f64 = s.quanta.iter().map(|&(i, v)| f64::from(v) * nu[usize::from(i)]).sum();
                let position = sum + s.anharmonic;
                let inside = position > range.0 - 500.0 && position < range.1 + 500.0;
                inside.then(|| (position, weighing.strength.tilted(s.steps, position), s.variance))
            })
            .collect();
        let census = Census::new(placed.iter().map(|p| (p.0, p.1)), range, 2.0 * weighing.resolution);
        let expected = count as f64 * (1.0 - weighing.foreign);
        let scale = census.matched_scale(&strength, 0.0, weighing.lost, expected);
        let visibility = Visibility { model: strength, scale, limit: 0.0, lost: weighing.lost };
        let mut sums = vec![0.0; count];
        let mut best = vec![0.0_f64; count];
        let mut seen: HashMap<Steps, f64> = HashMap::new();
        for &(position, steps, variance) in &placed {
            let p = *seen.entry(steps).or_insert_with(|| visibility.seen(steps));
            if p < 1.0e-7 {
                continue;
            }
            let reach = 4.5 * (variance + 400.0).sqrt();
            let from = targets.partition_point(|t| t.0 < position - reach);
            for &(y, s2, b) in targets[from..].iter().take_while(|t| t.0 <= position + reach) {
                let weight = p * log_normal(y - position, variance + s2).exp();
                sums[b] += weight;
                best[b] = best[b].max(weight);
            }
        }
        (sums.iter().map(|s| (s / density).ln_1p()).sum(), best)
    };
    let (own, own_best) = score(&model.nu);
    let drawn: Vec<(f64, Vec<f64>)> = (0..trials)
        .into_par_iter()
        .map(|trial| {
            let mut rng = ChaCha8Rng::seed_from_u64(seed);
            rng.set_stream(1 + trial as u64);
            let nu: Vec<f64> = ranges.iter().map(|&(low, high)| low + (high - low) * rng.random::<f64>()).collect();
            score(&nu)
        })
        .collect();
    let share = |n: usize| (1 + n) as f64 / (1 + trials) as f64;
    let mut scores: Vec<f64> = drawn.iter().map(|d| d.0).collect();
    scores.sort_by(f64::total_cmp);
    Coincidence {
        p_value: share(drawn.iter().filter(|d| d.0 >= own).count()),
        null: NULL_WORDS.to_owned(),
        trials,
        seed,
        score: own,
        null_median: scores.get(scores.len() / 2).copied().unwrap_or(f64::NAN),
        bands: (0..count).map(|b| share(drawn.iter().filter(|d| d.1[b] >= own_best[b]).count())).collect(),
        quanta,
    }
}

/// C(modes + quanta, quanta).
fn levels_up_to(modes: usize, quanta: u8) -> f64 {
    (1..=usize::from(quanta)).map(|k| (modes + k) as f64 / k as f64).product()
}

fn central(models: &[StrengthModel]) -> StrengthModel {
    let weight: f64 = models.iter().map(|m| m.weight).sum();
    let mean = |of: fn(&StrengthModel) -> f64| models.iter().map(|m| m.weight * of(m)).sum::<f64>() / weight;
    StrengthModel { order: mean(|m| m.order), moiety: mean(|m| m.moiety), tau: mean(|m| m.tau), weight: 1.0 }
}

fn skeletons(model: &Model, table: &ModeTable, prior: &StrengthPrior, quanta: u8) -> Vec<Skeleton> {
    let mut list = Vec::new();
    let start: Vec<(usize, u8)> = Vec::new();
    let mut stack = vec![(start, 0, quanta)];
    while let Some((now, from, left)) = stack.pop() {
        for mode in from..table.modes.len() {
            for v in 1..=left {
                let mut next = now.clone();
                next.push((mode, v));
                let level = Level::from_quanta(&next);
                let candidate = Candidate::plain(model, level);
                let sum: f64 = next.iter().map(|&(i, v)| f64::from(v) * model.nu[i]).sum();
                list.push(Skeleton {
                    quanta: next.iter().map(|&(i, v)| (i as u16, f32::from(v))).collect(),
                    anharmonic: candidate.mean - sum,
                    variance: candidate.shared_variance(model) + model.private_variance(&candidate.level),
                    steps: prior.untilted(table, &candidate),
                });
                if v < left {
                    stack.push((next, mode + 1, left - v));
                }
            }
        }
    }
    list
}
