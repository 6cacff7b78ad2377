//! How strong a level is expected to be, and hence how likely it was to be seen.
//!
//! # Method
//! log₁₀ strength relative to a stretch fundamental, normal with mean
//!
//! ```text
//! μ(v) = g + tilt(ν) − d_order (n − 1) − d_moiety (moieties − 1) − d_noOH [no X–H stretch] + Σ vᵢ b_motion − d_forbidden
//! ```
//!
//! and standard deviation τ. The absolute scale g is never known; it is chosen by bisection so that the expected number
//! of resolved bands in the measured range equals the number of bands that are not foreign. d_order, d_moiety and τ are
//! averaged over a grid. The constants are judgement (common practice, no source): they span the measured steps of water
//! and ice, about 2.3 decades for the first overtone of hydrogen-bonded O–H and 1 to 2 for each further quantum.

use std::collections::BTreeMap;

use super::candidate::Candidate;
use super::kernel::normal_cdf;
use crate::mode::{ModeTable, Motion, Strength};

/// One point of the grid of strength models.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct StrengthModel {
    /// Decades lost per quantum after the first.
    pub order: f64,
    /// Decades lost per moiety after the first.
    pub moiety: f64,
    /// Scatter of single levels, decades.
    pub tau: f64,
    /// Prior weight.
    pub weight: f64,
}

impl StrengthModel {
    /// The single model used when averaging is off.
    pub const PLAIN: Self = Self { order: 1.1, moiety: 0.5, tau: 0.5, weight: 1.0 };

    /// The grid of 27 models used by default.
    pub fn grid() -> Vec<Self> {
        let mut list = Vec::with_capacity(27);
        for (order, a) in [(0.7, 0.25), (1.0, 0.45), (1.3, 0.30)] {
            for (moiety, b) in [(0.1, 0.3), (0.4, 0.4), (0.7, 0.3)] {
                for (tau, c) in [(0.5, 0.40), (0.7, 0.35), (1.0, 0.25)] {
                    list.push(Self { order, moiety, tau, weight: a * b * c });
                }
            }
        }
        list
    }
}

/// Constants of the strength prior that are not averaged over, and the models that are.
#[derive(Clone, Debug, PartialEq)]
pub struct StrengthPrior {
    /// Decades lost by a level without an X–H stretch.
    pub no_stretch: f64,
    /// Decades lost by a forbidden level.
    pub forbidden: f64,
    /// Decades by which the detection limit falls per 4000 cm⁻¹ above 4000 cm⁻¹ (weaker bands are seen towards the
    /// visible, away from the wings of the fundamentals).
    pub tilt: f64,
    /// Decades per quantum of each motion, in the order of [`Motion::ALL`].
    pub motion: [f64; 10],
    /// The strength models averaged over.
    pub models: Vec<StrengthModel>,
}

impl Default for StrengthPrior {
    fn default() -> Self {
        Self {
            no_stretch: 0.8,
            forbidden: 1.0,
            tilt: 1.2,
            //       O–H  bend lib  M–O   X–O   O–X–O N–H  bend lattice other
            motion: [0.0, 0.3, 0.2, -0.3, 0.05, -0.2, 0.0, 0.0, -0.3, 0.0],
            models: StrengthModel::grid(),
        }
    }
}

/// What the expected strength of a level is built from: the part common to all models, and the counts of steps.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub struct Steps {
    /// Common part in units of [`Steps::UNIT`] decades.
    pub fixed: i16,
    /// Quanta after the first.
    pub order: u8,
    /// Moieties after the first.
    pub moieties: u8,
}

impl Steps {
    /// Grain of the common part, decades: small against any τ, so that levels alike share one evaluation.
    pub const UNIT: f64 = 0.02;

    /// Expected strength in a model, scale g excluded.
    #[inline]
    pub fn strength(self, model: &StrengthModel) -> f64 {
        let fixed = f64::from(self.fixed) * Self::UNIT;
        fixed - model.order * f64::from(self.order) - model.moiety * f64::from(self.moieties)
    }
}

impl StrengthPrior {
    /// The steps of a candidate.
    pub fn steps(&self, table: &ModeTable, candidate: &Candidate) -> Steps {
        self.tilted(self.untilted(table, candidate), candidate.mean)
    }

    /// Steps with the tilt at `position` (cm⁻¹) added.
    pub fn tilted(&self, steps: Steps, position: f64) -> Steps {
        let tilt = self.tilt * (position - 4_000.0) / 4_000.0;
        let fixed = f64::from(steps.fixed) + tilt / Steps::UNIT;
        Steps { fixed: fixed.round().clamp(-32_000.0, 32_000.0) as i16, ..steps }
    }

    /// The steps of a candidate before the detection limit's dependence on position.
    pub fn untilted(&self, table: &ModeTable, candidate: &Candidate) -> Steps {
        let mut hydrogenic = false;
        let (mut fixed, mut order) = (0.0, 0_u32);
        let mut moieties = [usize::MAX; 8];
        let mut count = 0;
        for e in candidate.level.excitations() {
            let mode = &table.modes[usize::from(e.mode)];
            order += u32::from(e.quanta);
            hydrogenic |= matches!(mode.motion, Motion::OhStretch | Motion::NhStretch);
            let own = mode.ir.map_or(self.motion[mode.motion as usize], Strength::log10);
            fixed += f64::from(e.quanta) * own;
            if count < moieties.len() && !moieties[..count].contains(&mode.moiety) {
                moieties[count] = mode.moiety;
                count += 1;
            }
        }
        if !hydrogenic {
            fixed -= self.no_stretch;
        }
        if let Some(strength) = candidate.strength {
            // The strength as expected contains the steps; what is varied are departures from the central ones.
            let mean = |of: fn(&StrengthModel) -> f64| {
                let weights: f64 = self.models.iter().map(|m| m.weight).sum();
                self.models.iter().map(|m| m.weight * of(m)).sum::<f64>() / weights
            };
            let (order, count) = (f64::from(order.saturating_sub(1)), count.saturating_sub(1) as f64);
            fixed = strength + order * mean(|m| m.order) + count * mean(|m| m.moiety);
        }
        if candidate.forbidden {
            fixed -= self.forbidden;
        }
        Steps {
            fixed: (fixed / Steps::UNIT).round().clamp(-32_000.0, 32_000.0) as i16,
            order: u8::try_from(order.saturating_sub(1)).unwrap_or(u8::MAX),
            moieties: u8::try_from(count.saturating_sub(1)).unwrap_or(u8::MAX),
        }
    }
}

/// A strength model with its matched scale.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Visibility {
    /// The model.
    pub model: StrengthModel,
    /// Scale g, decades.
    pub scale: f64,
    /// Detection limit on the same scale.
    pub limit: f64,
    /// Probability that a visible band was not listed.
    pub lost: f64,
}

impl Visibility {
    /// Expected strength, decades.
    #[inline]
    pub fn strength(&self, steps: Steps) -> f64 {
        self.scale + steps.strength(&self.model)
    }

    /// p(v): the probability that the level was seen and listed.
    #[inline]
    pub fn seen(&self, steps: Steps) -> f64 {
        (1.0 - self.lost) * normal_cdf((self.strength(steps) - self.limit) / self.model.tau)
    }
}

/// Levels of the measured range counted by bin and steps: all that matching the scale needs.
#[derive(Clone, Debug, Default)]
pub struct Census {
    bins: Vec<Vec<(Steps, u32)>>,
}

/// log(1 − Φ(z)) by linear interpolation in a table; below 1e-5 in error.
struct LogUpperTail(Vec<f64>);

impl LogUpperTail {
    const STEP: f64 = 0.01;
    const END: f64 = 8.0;

    fn new() -> Self {
        let n = (2.0 * Self::END / Self::STEP) as usize + 2;
        Self((0..n).map(|i| normal_cdf(Self::END - i as f64 * Self::STEP).max(1.0e-15).ln()).collect())
    }

    #[inline]
    fn at(&self, z: f64) -> f64 {
        if z <= -Self::END {
            return 0.0;
        }
        let x = ((z.min(Self::END - 1.0e-9) + Self::END) / Self::STEP).max(0.0);
        let i = x as usize;
        let part = x - i as f64;
        self.0[i] * (1.0 - part) + self.0[i + 1] * part
    }
}

impl Census {
    /// Counts levels (position, steps) in bins of `width` cm⁻¹ over the range.
    pub fn new(levels: impl IntoIterator<Item = (f64, Steps)>, range: (f64, f64), width: f64) -> Self {
        let n = (((range.1 - range.0) / width).ceil() as usize).clamp(1, 100_000);
        let mut bins: Vec<BTreeMap<Steps, u32>> = vec![BTreeMap::new(); n];
        for (position, steps) in levels {
            if position >= range.0 && position < range.1 {
                let bin = (((position - range.0) / width) as usize).min(n - 1);
                *bins[bin].entry(steps).or_default() += 1;
            }
        }
        Self { bins: bins.into_iter().map(|b| b.into_iter().collect()).collect() }
    }

    /// The scale g at which the expected number of resolved, listed bands equals `bands`: Σ over bins of
    /// (1 − lost) [1 − Π_v (1 − Φ((μ − limit)/τ))]. Clamped to ±20 decades when the count cannot be met.
    pub fn matched_scale(&self, model: &StrengthModel, limit: f64, lost: f64, bands: f64) -> f64 {
        let tail = LogUpperTail::new();
        let merge = |bin: &Vec<(Steps, u32)>| {
            let mut merged: BTreeMap<i64, f64> = BTreeMap::new();
            for &(steps, n) in bin {
                *merged.entry((steps.strength(model) / Steps::UNIT).round() as i64).or_default() += f64::from(n);
            }
            merged.into_iter().map(|(k, n)| (k as f64 * Steps::UNIT, n)).collect::<Vec<_>>()
        };
        let cells: Vec<Vec<(f64, f64)>> = self.bins.iter().map(merge).collect();
        let expected = |g: f64| -> f64 {
            let seen = |bin: &Vec<(f64, f64)>| {
                let silent: f64 = bin.iter().map(|&(mu, n)| n * tail.at((g + mu - limit) / model.tau)).sum();
                -silent.exp_m1()
            };
            (1.0 - lost) * cells.iter().map(seen).sum::<f64>()
        };
        let (mut low, mut high) = (limit - 20.0, limit + 20.0);
        for _ in 0..32 {
            let middle = 0.5 * (low + high);
            if expected(middle) < bands {
                low = middle;
            } else {
                high = middle;
            }
        }
        0.5 * (low + high)
    }
}
