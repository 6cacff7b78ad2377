//! Where a level falls, and how sure that is.
//!
//! # Method
//! Fundamentals basis, degenerate modes included (exact rewriting of the usual term formula):
//!
//! ```text
//! ν(v) = Σ vᵢ νᵢ + Σ xᵢᵢ vᵢ (vᵢ − 1) + Σᵢ<ⱼ xᵢⱼ vᵢ vⱼ
//!      + Σ_{d=2} gᵢᵢ (lᵢ² − vᵢ) + Σ_{d=3} gᵢᵢ (lᵢ (lᵢ + 1) − 2 vᵢ) + Σᵢ<ⱼ gᵢⱼ lᵢ lⱼ
//! ```
//!
//! Standard form of the terms: Herzberg, *Infrared and Raman Spectra* (1945); Nielsen, Rev. Mod. Phys. 23, 90 (1951)
//! (both from memory); the identity is checked row by row in `tests/published_values.rs`.

use serde::Serialize;

use crate::level::{Excitation, Level, UNSPLIT};
use crate::mode::{ConstantKind, ModeIndex, MoietyIndex, Origin};

/// A number with its uncertainty, origin and source.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct Sourced {
    /// Value, cm⁻¹.
    pub value: f64,
    /// One standard uncertainty, cm⁻¹.
    pub sigma: f64,
    /// Where it comes from.
    pub origin: Origin,
    /// Source in words.
    pub source: String,
}

/// A resonance element between the lowest pair of levels it ties, cm⁻¹.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct Resonance {
    /// Fermi, Darling-Dennison or 1:1.
    pub kind: ConstantKind,
    /// First mode.
    pub a: ModeIndex,
    /// Second mode.
    pub b: ModeIndex,
    /// Third mode of a 1:1:1 Fermi term.
    pub c: Option<ModeIndex>,
    /// The element.
    pub element: Sourced,
}

/// How the two OH stretches of one water are described.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Serialize)]
#[serde(rename_all = "kebab-case")]
pub enum Picture {
    /// Constants of the stretching pair as given in the table.
    Given,
    /// Two Morse bonds with harmonic coupling; constants follow from the two fundamentals.
    LocalPair,
    /// One unresolved broad envelope stands for both bonds: shifts of maxima instead of constants.
    Envelope,
    /// One resolved stretch (HDO, hydroxide, or a table that lists a single bond).
    SingleBond,
}

/// All that positions depend on, resolved: nothing is silently zero.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct Model {
    /// Fundamentals, cm⁻¹.
    pub nu: Vec<f64>,
    /// Their standard uncertainties, cm⁻¹.
    pub nu_sigma: Vec<f64>,
    /// Degeneracies.
    pub degeneracy: Vec<u8>,
    /// x_ij, lower triangle by rows: entry (i, j), j ≤ i, at i (i + 1) / 2 + j.
    pub x: Vec<Sourced>,
    /// Given g_ii: levels of that mode are split by l.
    pub g: Vec<Option<Sourced>>,
    /// Half-spread of the l components of a degenerate mode without a given g, cm⁻¹ per quantum: enters the variance.
    pub l_spread: Vec<f64>,
    /// Given g_ij of two degenerate modes.
    pub g_pairs: Vec<(ModeIndex, ModeIndex, Sourced)>,
    /// Resonance elements.
    pub resonances: Vec<Resonance>,
    /// Neglected higher terms: standard uncertainty per quantum above the first, cm⁻¹.
    pub floor: f64,
    /// The picture chosen for each water (moiety number, picture, reason).
    pub pictures: Vec<(MoietyIndex, Picture, String)>,
}

/// One parameter that positions depend on; before mixing they are linear in it.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub enum Parameter {
    /// Fundamental of a mode.
    Nu(usize),
    /// x_ij, i ≥ j.
    X(usize, usize),
    /// g_ii.
    G(usize),
    /// Entry of [`Model::resonances`]; only mixed levels depend on it.
    Resonance(usize),
}

/// A position's derivatives by the parameters it depends on: (parameter, derivative), in a fixed order.
pub type Gradient = Vec<(Parameter, f64)>;

/// One rung of a mode's ladder: an excitation with its own terms.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Rung {
    /// The excitation.
    pub excitation: Excitation,
    /// Its terms without other modes, cm⁻¹.
    pub own: f64,
    /// Variance of those terms, cm⁻².
    pub variance: f64,
}

/// Place of (i, j) in a lower triangle by rows; order of arguments does not matter.
#[inline]
pub fn triangle(i: usize, j: usize) -> usize {
    let (high, low) = if i >= j { (i, j) } else { (j, i) };
    high * (high + 1) / 2 + low
}

impl Model {
    /// A model of `nu.len()` non-degenerate modes with zero constants and no uncertainty, to be filled in.
    pub fn harmonic(nu: Vec<f64>) -> Self {
        let n = nu.len();
        let zero = Sourced { value: 0.0, sigma: 0.0, origin: Origin::Given, source: String::new() };
        Self {
            nu_sigma: vec![0.0; n],
            degeneracy: vec![1; n],
            x: vec![zero; n * (n + 1) / 2],
            g: vec![None; n],
            l_spread: vec![0.0; n],
            g_pairs: Vec::new(),
            resonances: Vec::new(),
            floor: 0.0,
            pictures: Vec::new(),
            nu,
        }
    }

    /// Number of modes.
    pub fn modes(&self) -> usize {
        self.nu.len()
    }

    /// x_ij.
    #[inline]
    pub fn x(&self, i: ModeIndex, j: ModeIndex) -> &Sourced {
        &self.x[triangle(i, j)]
    }

    /// x_ij, to change it.
    pub fn x_mut(&mut self, i: ModeIndex, j: ModeIndex) -> &mut Sourced {
        &mut self.x[triangle(i, j)]
    }

    /// Factor of g_ii for an excitation: l² − v (d = 2), l (l + 1) − 2 v (d = 3), zero when unsplit.
    pub fn g_factor(&self, e: Excitation) -> f64 {
        if e.l == UNSPLIT {
            return 0.0;
        }
        let (v, l) = (f64::from(e.quanta), f64::from(e.l));
        match self.degeneracy[usize::from(e.mode)] {
            2 => l * l - v,
            3 => l * (l + 1.0) - 2.0 * v,
            _ => 0.0,
        }
    }

    /// Position of a level before resonances, cm⁻¹ above the ground level.
    pub fn position(&self, level: &Level) -> f64 {
        let list = level.excitations();
        let mut sum = 0.0;
        for (k, e) in list.iter().enumerate() {
            let (i, v) = (usize::from(e.mode), f64::from(e.quanta));
            sum += v * self.nu[i] + v * (v - 1.0) * self.x(i, i).value;
            if let Some(g) = &self.g[i] {
                sum += g.value * self.g_factor(*e);
            }
            for other in &list[..k] {
                sum += v * f64::from(other.quanta) * self.x(i, usize::from(other.mode)).value;
            }
        }
        sum
    }

    /// Term of a state with signed angular momenta, cm⁻¹ above the ground level: `(mode, v, l)`, l ignored for
    /// non-degenerate modes. Two degenerate modes with a given gᵢⱼ split by the sign of lᵢ lⱼ; a [`Level`] carries |l|
    /// only and stands for their centre.
    pub fn term(&self, state: &[(ModeIndex, u8, i32)]) -> f64 {
        let level = Level::new(state.iter().map(|&(mode, v, l)| {
            let l = u8::try_from(l.unsigned_abs()).unwrap_or(UNSPLIT);
            Excitation { l: if self.degeneracy[mode] > 1 { l } else { UNSPLIT }, ..Excitation::new(mode, v) }
        }));
        let momentum = |mode: ModeIndex| state.iter().find(|s| s.0 == mode).map_or(0, |s| s.2);
        let pairs = self.g_pairs.iter().map(|(a, b, g)| g.value * f64::from(momentum(*a) * momentum(*b)));
        self.position(&level) + pairs.sum::<f64>()
    }

    /// Derivatives of [`Self::position`] by the parameters.
    pub fn gradient(&self, level: &Level) -> Gradient {
        let list = level.excitations();
        let mut gradient = Gradient::with_capacity(list.len() * (list.len() + 3) / 2);
        for (k, e) in list.iter().enumerate() {
            let (i, v) = (usize::from(e.mode), f64::from(e.quanta));
            gradient.push((Parameter::Nu(i), v));
            if e.quanta > 1 {
                gradient.push((Parameter::X(i, i), v * (v - 1.0)));
            }
            if self.g[i].is_some() {
                let factor = self.g_factor(*e);
                if factor != 0.0 {
                    gradient.push((Parameter::G(i), factor));
                }
            }
            for other in &list[..k] {
                gradient.push((Parameter::X(i, usize::from(other.mode)), v * f64::from(other.quanta)));
            }
        }
        gradient
    }

    /// Standard uncertainty of a parameter, cm⁻¹.
    pub fn sigma(&self, parameter: Parameter) -> f64 {
        match parameter {
            Parameter::Nu(i) => self.nu_sigma[i],
            Parameter::X(i, j) => self.x(i, j).sigma,
            Parameter::G(i) => self.g[i].as_ref().map_or(0.0, |g| g.sigma),
            Parameter::Resonance(at) => self.resonances[at].element.sigma,
        }
    }

    /// Value of a parameter, cm⁻¹.
    pub fn value(&self, parameter: Parameter) -> f64 {
        match parameter {
            Parameter::Nu(i) => self.nu[i],
            Parameter::X(i, j) => self.x(i, j).value,
            Parameter::G(i) => self.g[i].as_ref().map_or(0.0, |g| g.value),
            Parameter::Resonance(at) => self.resonances[at].element.value,
        }
    }

    /// Variance that is not shared with other levels: neglected terms and unresolved l components, cm⁻².
    pub fn private_variance(&self, level: &Level) -> f64 {
        let floor = self.floor * f64::from(level.order().saturating_sub(1));
        let spread: f64 = level
            .excitations()
            .iter()
            .filter(|e| e.quanta > 1)
            .map(|e| (self.l_spread[usize::from(e.mode)] * f64::from(e.quanta)).powi(2))
            .sum();
        // The two components ±gᵢⱼ lᵢ lⱼ are not told apart.
        let pairs: f64 = self
            .g_pairs
            .iter()
            .filter(|(a, b, _)| level.quanta_in(*a) > 0 && level.quanta_in(*b) > 0)
            .map(|(_, _, g)| g.value * g.value)
            .sum();
        floor * floor + spread + pairs
    }

    /// Variance of the position: a′Ca + private part, cm⁻².
    pub fn variance(&self, level: &Level) -> f64 {
        let list = level.excitations();
        if list.iter().any(|e| self.g[usize::from(e.mode)].is_some()) {
            let shared: f64 = self.gradient(level).iter().map(|&(p, a)| (a * self.sigma(p)).powi(2)).sum();
            return shared + self.private_variance(level);
        }
        // The common case without the detour over a gradient: large tables hold half a million levels.
        let mut sum = 0.0;
        for (k, e) in list.iter().enumerate() {
            let (i, v) = (usize::from(e.mode), f64::from(e.quanta));
            sum += (v * self.nu_sigma[i]).powi(2) + (v * (v - 1.0) * self.x(i, i).sigma).powi(2);
            for other in &list[..k] {
                sum += (v * f64::from(other.quanta) * self.x(i, usize::from(other.mode)).sigma).powi(2);
            }
        }
        sum + self.private_variance(level)
    }

    /// Covariance of two levels through shared parameters, cm⁻² (private parts excluded).
    pub fn covariance(&self, a: &Level, b: &Level) -> f64 {
        let gradient_b = self.gradient(b);
        self.gradient(a)
            .iter()
            .filter_map(|&(p, slope)| {
                let other = gradient_b.iter().find(|(q, _)| *q == p)?;
                Some(slope * other.1 * self.sigma(p).powi(2))
            })
            .sum()
    }

    /// The rungs of one mode up to `quanta`: one per number of quanta, or one per (v, |l|) where g is given.
    pub fn ladder(&self, mode: ModeIndex, quanta: u8) -> Vec<Rung> {
        let mut rungs = Vec::new();
        for v in 1..=quanta {
            let plain = Excitation::new(mode, v);
            let split = self.g[mode].is_some() && self.degeneracy[mode] > 1 && v > 1;
            let momenta: Vec<u8> =
                if split { (0..=v).rev().filter(|l| (v - l) % 2 == 0).collect() } else { vec![UNSPLIT] };
            for l in momenta {
                let excitation = Excitation { l, ..plain };
                let level = Level::new([excitation]);
                let own = self.position(&level);
                let variance = self.gradient(&level).iter().map(|&(p, a)| (a * self.sigma(p)).powi(2)).sum();
                rungs.push(Rung { excitation, own, variance });
            }
        }
        rungs
    }
}
