//! From levels and bands to the problem: who is offered for which band, at what weight.

use std::collections::{BTreeMap, HashMap};

use rayon::prelude::*;

use super::candidate::Candidate;
use super::kernel::{ParameterNumbers, Slopes, log_normal, log_sum, normal_cdf};
use super::prior::{Census, Steps, StrengthModel, StrengthPrior, Visibility};
use super::problem::{Offer, Problem, Target};
use super::witness::{Factor, Witness};
use crate::band::{Band, BandList};
use crate::mode::{ModeTable, Strength};
use crate::physics::position::{Model, Parameter};

/// How bands are weighed; the defaults are those of the calibration.
#[derive(Clone, Debug, PartialEq)]
pub struct Weighing {
    /// Expected strengths.
    pub strength: StrengthPrior,
    /// Learn an inflation of all uncertainties, and allow single bands an enlarged one.
    pub robust: bool,
    /// Average over the grid of strength models; otherwise [`StrengthModel::PLAIN`].
    pub models: bool,
    /// Expected share of foreign bands.
    pub foreign: f64,
    /// Whether the share of foreign bands is learnt around that.
    pub learn_foreign: bool,
    /// Probability that a visible band is not in the list.
    pub lost: f64,
    /// Measured range, cm⁻¹; replaces that of the band list. Without either: the bands and 100 cm⁻¹ beyond.
    pub range: Option<(f64, f64)>,
    /// Weakest strength that would have been listed, log₁₀ on the scale of the listed strengths.
    pub detection_limit: Option<f64>,
    /// Bands closer than this are not resolved, cm⁻¹.
    pub resolution: f64,
    /// Common relative error of all positions (one sigma).
    pub scale_sigma: f64,
    /// Common error of the zero, cm⁻¹ (one sigma).
    pub zero_sigma: f64,
    /// Most offers kept for a band.
    pub offers: usize,
}

impl Default for Weighing {
    fn default() -> Self {
        Self {
            strength: StrengthPrior::default(),
            robust: true,
            models: true,
            foreign: 0.12,
            learn_foreign: true,
            lost: 0.1,
            range: None,
            detection_limit: None,
            resolution: 25.0,
            scale_sigma: 0.0,
            zero_sigma: 0.0,
            offers: 250,
        }
    }
}

/// Inflations κ of the table's uncertainties and their prior weights (judgement, tried in simulation).
pub const INFLATIONS: [(f64, f64); 6] = [(0.7, 0.10), (1.0, 0.35), (1.4, 0.25), (2.0, 0.15), (2.8, 0.10), (4.0, 0.05)];

/// Factors on a band's own uncertainty for unmodelled resonances and their prior weights (judgement).
pub const TAILS: [(f64, f64); 3] = [(1.0, 0.85), (3.0, 0.11), (8.0, 0.04)];

/// A weight below this part of the best is not offered; the sum of such weights stays as *unlisted*.
const KEEP: f64 = 1.0e-5;

/// What is known of a level before any band is looked at.
#[derive(Clone, Copy, Debug)]
pub struct Placed {
    /// Position, cm⁻¹.
    pub mean: f64,
    /// Steps of its expected strength.
    pub steps: Steps,
    /// Shared variance, cm⁻².
    pub shared: f64,
    /// Private variance, cm⁻².
    pub private: f64,
    /// Probability that it lies within the resolution of a listed band.
    pub hidden: f64,
}

/// The problem with what is needed to tell about it.
#[derive(Clone, Debug)]
pub struct Weighed {
    /// The problem.
    pub problem: Problem,
    /// Every candidate as placed.
    pub levels: Vec<Placed>,
    /// Strength models with matched scale.
    pub visibilities: Vec<Visibility>,
    /// Parameters by number.
    pub numbers: ParameterNumbers,
    /// Measured range, cm⁻¹.
    pub range: (f64, f64),
    /// Listed strength and its uncertainty per band, log₁₀.
    pub strengths: Vec<Option<(f64, f64)>>,
    /// Factors of the witnesses, by band and offer.
    pub factors: Vec<Vec<Vec<Factor>>>,
    /// Factors of the witnesses about other origin, by band.
    pub other_factors: Vec<Vec<Factor>>,
}

/// Listed strength in decades with its uncertainty: words are coarse (judgement).
pub fn listed_strength(band: &Band) -> Option<(f64, f64)> {
    band.strength.map(|s| (s.log10(), if matches!(s, Strength::Word(_)) { 0.3 } else { 0.15 }))
}

/// The measured range: as given, as listed, else the bands and 100 cm⁻¹ beyond.
pub fn measured_range(bands: &BandList, given: Option<(f64, f64)>) -> (f64, f64) {
    given.or(bands.range).unwrap_or_else(|| {
        let positions = bands.bands.iter().map(|b| b.position.inverse_cm());
        let (low, high) = positions.fold((f64::INFINITY, 0.0_f64), |(l, h), y| (l.min(y), h.max(y)));
        if low > high { (0.0, 1.0) } else { ((low - 100.0).max(0.0), high + 100.0) }
    })
}

/// The smallest uncertainty a band is credited with, cm⁻¹: keeps G positive definite.
pub const LEAST_SIGMA: f64 = 0.5;

/// Variance of a band's position, cm⁻².
pub fn band_variance(band: &Band) -> f64 {
    band.sigma.max(LEAST_SIGMA).powi(2)
}

/// Cap of the probability that a level would have been noticed as missing.
pub const MOST_NOTICED: f64 = 0.98;

/// q: the probability that a level would have been noticed as missing, from those of being seen at all and of lying
/// within the resolution of a listed band.
pub fn noticed(seen: f64, hidden: f64) -> f64 {
    (seen * (1.0 - hidden)).min(MOST_NOTICED)
}

/// log of f/(1 − q).
fn log_fit(visibility: &Visibility, level: &Placed, in_range: bool, listed: Option<(f64, f64)>) -> f64 {
    let seen = visibility.seen(level.steps);
    let log_seen = match listed {
        None => seen.max(1.0e-300).ln(),
        Some((strength, sigma)) => {
            let variance = visibility.model.tau.powi(2) + sigma * sigma;
            (1.0 - visibility.lost).ln() + log_normal(strength - visibility.strength(level.steps), variance)
        }
    };
    let missed = if in_range { noticed(seen, level.hidden) } else { 0.0 };
    log_seen - (1.0 - missed).ln()
}

/// Weighs all candidates against all bands.
pub fn weigh(
    model: &Model,
    table: &ModeTable,
    candidates: &[Candidate],
    bands: &BandList,
    witnesses: &[&dyn Witness],
    weighing: &Weighing,
) -> Weighed {
    let count = bands.bands.len();
    let range = measured_range(bands, weighing.range);
    let inflations: Vec<(f64, f64)> = if weighing.robust { INFLATIONS.to_vec() } else { vec![(1.0, 1.0)] };
    let tails: Vec<(f64, f64)> = if weighing.robust { TAILS.to_vec() } else { vec![(1.0, 1.0)] };
    let widest = inflations.iter().map(|i| i.0 * i.0).fold(1.0, f64::max);

    // Bands by position, to look up neighbours fast.
    let mut by_position: Vec<(f64, f64, f64, usize)> = bands
        .bands
        .iter()
        .enumerate()
        .map(|(i, b)| {
            let reach = weighing.resolution.max(b.fwhm.unwrap_or(0.0) / 2.0);
            (b.position.inverse_cm(), band_variance(b), reach, i)
        })
        .collect();
    by_position.sort_by(|a, b| a.0.total_cmp(&b.0));
    let levels: Vec<Placed> = candidates
        .par_iter()
        .map(|c| {
            let shared = c.shared_variance(model) + nuisance_variance(model, c, weighing);
            let private = model.private_variance(&c.level);
            let hidden: f64 = by_position
                .iter()
                .map(|&(y, s2, reach, _)| {
                    let distance = (y - c.mean).abs();
                    let sigma = (shared + private + s2).sqrt();
                    if distance > reach + 5.0 * sigma {
                        return 0.0;
                    }
                    normal_cdf((distance + reach) / sigma) - normal_cdf((distance - reach) / sigma)
                })
                .sum();
            let steps = weighing.strength.steps(table, c);
            Placed { mean: c.mean, steps, shared, private, hidden: hidden.clamp(0.0, 1.0) }
        })
        .collect();

    let strengths: Vec<Option<(f64, f64)>> = bands.bands.iter().map(listed_strength).collect();
    let weakest = strengths.iter().flatten().map(|s| s.0).fold(f64::INFINITY, f64::min);
    let limit = weighing
        .detection_limit
        .or(bands.detection_limit.filter(|l| *l > 0.0).map(f64::log10))
        .unwrap_or(if weakest.is_finite() { weakest - 0.05 } else { 0.0 })
        .min(if weakest.is_finite() { weakest } else { f64::INFINITY });
    let visibilities = visibilities(&levels, range, count, limit, weighing);
    let in_range = |level: &Placed| level.mean >= range.0 && level.mean < range.1;

    // Σ log(1 − q) per model; levels alike are summed together.
    let mut alike: BTreeMap<(Steps, u8), f64> = BTreeMap::new();
    for level in levels.iter().filter(|l| in_range(l)) {
        *alike.entry((level.steps, (level.hidden * 64.0).round() as u8)).or_default() += 1.0;
    }
    let models: Vec<f64> = visibilities
        .par_iter()
        .map(|visibility| {
            let silence: f64 = alike
                .iter()
                .map(|(&(steps, hidden), n)| n * (1.0 - noticed(visibility.seen(steps), f64::from(hidden) / 64.0)).ln())
                .sum();
            visibility.model.weight.ln() + silence
        })
        .collect();

    // Mean weight per steps, for choosing offers: with and without a listed strength.
    let average = log_sum(models.iter().copied());
    let shares: Vec<f64> = models.iter().map(|m| (m - average).exp()).collect();
    let prior_shares: Vec<f64> = visibilities.iter().map(|v| v.model.weight).collect();
    let mixed: Vec<f64> = shares.iter().zip(&prior_shares).map(|(a, b)| 0.5 * (a + b)).collect();
    let mut seen: HashMap<Steps, f64> = HashMap::new();
    for level in &levels {
        seen.entry(level.steps)
            .or_insert_with(|| visibilities.iter().zip(&mixed).map(|(v, w)| w * v.seen(level.steps)).sum());
    }
    let place = |difference: f64, level: &Placed, s2: f64| {
        let at = |kappa: f64, tail: f64| {
            log_normal(difference, kappa * kappa * level.shared + level.private + tail * tail * s2).exp()
        };
        if weighing.robust { 0.6 * at(1.0, 1.0) + 0.3 * at(2.0, 1.0) + 0.1 * at(1.0, 5.0) } else { at(1.0, 1.0) }
    };
    let lists: Vec<(Vec<(f64, usize)>, f64)> = bands
        .bands
        .par_iter()
        .enumerate()
        .map(|(b, band)| {
            let (y, s2) = (band.position.inverse_cm(), band_variance(band));
            let mut dense: HashMap<Steps, f64> = HashMap::new();
            let mut list: Vec<(f64, usize)> = Vec::new();
            for (i, level) in levels.iter().enumerate() {
                let difference = y - level.mean;
                if difference * difference > 20.25 * (widest * level.shared + level.private + s2) {
                    continue;
                }
                let p = seen[&level.steps];
                if p < 1.0e-9 {
                    continue;
                }
                let missed = if in_range(level) { noticed(p, level.hidden) } else { 0.0 };
                let f = match strengths[b] {
                    None => p,
                    Some((strength, sigma)) => *dense.entry(level.steps).or_insert_with(|| {
                        let density = |v: &Visibility| {
                            let variance = v.model.tau.powi(2) + sigma * sigma;
                            (1.0 - v.lost) * log_normal(strength - v.strength(level.steps), variance).exp()
                        };
                        visibilities.iter().zip(&mixed).map(|(v, w)| w * density(v)).sum()
                    }),
                };
                list.push((f / (1.0 - missed) * place(difference, level, s2), i));
            }
            list.sort_by(|a, b| b.0.total_cmp(&a.0).then(a.1.cmp(&b.1)));
            let best = list.first().map_or(0.0, |l| l.0);
            let kept = list.iter().take(weighing.offers).take_while(|l| l.0 >= KEEP * best && l.0 > 0.0).count();
            let left: f64 = list[kept..].iter().map(|l| l.0).sum();
            list.truncate(kept);
            (list, left)
        })
        .collect();

    let mut numbers = ParameterNumbers::default();
    let gradients: Vec<Vec<_>> =
        lists.iter().map(|(l, _)| l.iter().map(|&(_, i)| candidates[i].gradient(model)).collect()).collect();
    for (parameter, _) in gradients.iter().flatten().flatten() {
        numbers.number(*parameter);
    }
    let nuisance = u32::try_from(numbers.len()).unwrap_or(u32::MAX - 2);
    let mut factors = Vec::with_capacity(count);
    let mut other_factors = Vec::with_capacity(count);
    let mut targets = Vec::with_capacity(count);
    for (b, ((list, left), gradients)) in lists.iter().zip(&gradients).enumerate() {
        let y = bands.bands[b].position.inverse_cm();
        let mut offers = Vec::with_capacity(list.len());
        let mut band_factors = Vec::with_capacity(list.len());
        for (&(_, i), gradient) in list.iter().zip(gradients) {
            let said: Vec<Factor> = witnesses.iter().flat_map(|w| w.about(b, &candidates[i])).collect();
            let said_log: f64 = said.iter().map(|f| f.log10).sum::<f64>() * std::f64::consts::LN_10;
            let level = &levels[i];
            let fit =
                visibilities.iter().map(|v| log_fit(v, level, in_range(level), strengths[b]) + said_log).collect();
            let mut pairs: Vec<(u32, f64)> =
                gradient.iter().map(|&(p, a)| (numbers.number(p), a * model.sigma(p))).collect();
            pairs.push((nuisance, weighing.scale_sigma * harmonic_sum(model, &candidates[i])));
            pairs.push((nuisance + 1, weighing.zero_sigma));
            let slopes = Slopes::from_pairs(pairs);
            let shared = slopes.norm_squared();
            offers.push(Offer { candidate: i, slopes, shared, private: level.private, residual: y - level.mean, fit });
            band_factors.push(said);
        }
        let other: Vec<Factor> = witnesses.iter().flat_map(|w| w.other(b)).collect();
        let other_log: f64 = other.iter().map(|f| f.log10).sum::<f64>() * std::f64::consts::LN_10;
        let strength = strengths[b].map_or(0.0, |(i, _)| std::f64::consts::LN_2 - 2.0 * (i - limit));
        targets.push(Target {
            variance: band_variance(&bands.bands[b]),
            offers,
            foreign: strength + other_log,
            unlisted: left.ln() + other_log,
        });
        factors.push(band_factors);
        other_factors.push(other);
    }
    let expected = weighing.foreign * count as f64;
    let problem = Problem {
        targets,
        parameters: numbers.len() + 2,
        models,
        foreign_density: (expected / (range.1 - range.0).max(1.0)).max(1.0e-12),
        foreign_expected: weighing.learn_foreign.then_some(expected),
        inflations,
        tails,
    };
    Weighed { problem, levels, visibilities, numbers, range, strengths, factors, other_factors }
}

/// Strength models with the scale at which as many bands are expected as are listed, foreign ones apart.
pub fn visibilities(
    levels: &[Placed],
    range: (f64, f64),
    bands: usize,
    limit: f64,
    weighing: &Weighing,
) -> Vec<Visibility> {
    let census = Census::new(levels.iter().map(|l| (l.mean, l.steps)), range, 2.0 * weighing.resolution);
    let models = if weighing.models { weighing.strength.models.clone() } else { vec![StrengthModel::PLAIN] };
    let expected = bands as f64 * (1.0 - weighing.foreign);
    models
        .into_par_iter()
        .map(|model| {
            let scale = census.matched_scale(&model, limit, weighing.lost, expected);
            Visibility { model, scale, limit, lost: weighing.lost }
        })
        .collect()
}

/// Σ vᵢ νᵢ, cm⁻¹: what a common relative error multiplies.
fn harmonic_sum(model: &Model, candidate: &Candidate) -> f64 {
    candidate.level.excitations().iter().map(|e| f64::from(e.quanta) * model.nu[usize::from(e.mode)]).sum()
}

fn nuisance_variance(model: &Model, candidate: &Candidate, weighing: &Weighing) -> f64 {
    if weighing.scale_sigma == 0.0 && weighing.zero_sigma == 0.0 {
        return 0.0;
    }
    (weighing.scale_sigma * harmonic_sum(model, candidate)).powi(2) + weighing.zero_sigma.powi(2)
}

/// The name of a parameter for people.
pub fn parameter_label(table: &ModeTable, parameter: Parameter) -> String {
    let id = |i: usize| table.modes.get(i).map_or("?", |m| m.id.as_str());
    match parameter {
        Parameter::Nu(i) => id(i).to_owned(),
        Parameter::X(i, j) => format!("x({}, {})", id(i), id(j)),
        Parameter::G(i) => format!("g({})", id(i)),
        // The model keeps the resonance rows of the table in their order.
        Parameter::Resonance(at) => match table.constants.iter().filter(|k| k.kind.is_resonance()).nth(at) {
            Some(k) => format!("{}({}, {})", k.kind.name(), id(k.a), id(k.b)),
            None => "resonance".to_owned(),
        },
    }
}
