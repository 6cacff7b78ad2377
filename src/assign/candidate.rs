//! Candidates: levels as the ranking sees them, and the families they belong to.

use std::collections::BTreeSet;

use serde::Serialize;

use crate::level::Level;
use crate::mode::{ModeTable, MoietyIndex, Motion};
use crate::physics::position::{Gradient, Model};

/// A level offered for bands.
#[derive(Clone, Debug, PartialEq)]
pub struct Candidate {
    /// The level; a mixed level carries the name of its largest share.
    pub level: Level,
    /// Position, cm⁻¹.
    pub mean: f64,
    /// Whether a selection rule forbids the transition.
    pub forbidden: bool,
    /// Expected strength, log₁₀ on any scale common to the candidates, selection rules not counted; steps per quantum and
    /// per moiety are then varied around it. `None`: from the motions and the table.
    pub strength: Option<f64>,
    /// Derivatives of the position of a mixed level; `None`: those of the model at `level`.
    pub mixed: Option<Box<Gradient>>,
}

impl Candidate {
    /// An unmixed, allowed level at its modelled position.
    pub fn plain(model: &Model, level: Level) -> Self {
        let mean = model.position(&level);
        Self { level, mean, forbidden: false, strength: None, mixed: None }
    }

    /// Derivatives of the position by the parameters.
    pub fn gradient(&self, model: &Model) -> Gradient {
        self.mixed.as_ref().map_or_else(|| model.gradient(&self.level), |g| (**g).clone())
    }

    /// Variance of the position that is shared with other levels, cm⁻².
    pub fn shared_variance(&self, model: &Model) -> f64 {
        if let Some(gradient) = &self.mixed {
            return gradient.iter().map(|&(p, a)| (a * model.sigma(p)).powi(2)).sum();
        }
        let list = self.level.excitations();
        if model.g_pairs.is_empty() && list.iter().all(|e| model.g[usize::from(e.mode)].is_none()) {
            // The common case without the detour over a gradient: large tables hold half a million levels.
            let mut sum = 0.0;
            for (k, e) in list.iter().enumerate() {
                let (i, v) = (usize::from(e.mode), f64::from(e.quanta));
                sum += (v * model.nu_sigma[i]).powi(2) + (v * (v - 1.0) * model.x(i, i).sigma).powi(2);
                for other in &list[..k] {
                    sum += (v * f64::from(other.quanta) * model.x(i, usize::from(other.mode)).sigma).powi(2);
                }
            }
            return sum;
        }
        model.gradient(&self.level).iter().map(|&(p, a)| (a * model.sigma(p)).powi(2)).sum()
    }

    /// Moieties that hold quanta, ascending, each once.
    pub fn moieties(&self, table: &ModeTable) -> Vec<MoietyIndex> {
        let list = self.level.excitations();
        let set: BTreeSet<_> = list.iter().map(|e| table.modes[usize::from(e.mode)].moiety).collect();
        set.into_iter().collect()
    }
}

/// A family: the motions of a level with the formula of the moiety that carries each, whichever water or component it
/// is; ascending, one entry a quantum.
#[derive(Clone, Debug, PartialEq, Eq, PartialOrd, Ord, Hash, Serialize)]
pub struct Family(pub Vec<(Motion, String)>);

impl Family {
    /// The family of a level.
    pub fn of(table: &ModeTable, level: &Level) -> Self {
        let mut list = Vec::new();
        for e in level.excitations() {
            let index = usize::from(e.mode);
            let part = (table.modes[index].motion, table.moiety_of(index).formula().to_owned());
            list.extend(std::iter::repeat_n(part, usize::from(e.quanta)));
        }
        list.sort();
        Self(list)
    }

    /// The motions, one a quantum.
    pub fn motions(&self) -> Vec<&'static str> {
        self.0.iter().map(|(motion, _)| motion.name()).collect()
    }

    /// Formulas of the moieties, each once.
    pub fn moieties(&self) -> Vec<String> {
        let set: BTreeSet<&String> = self.0.iter().map(|(_, formula)| formula).collect();
        set.into_iter().cloned().collect()
    }

    /// The name for people: `H2O oh-stretch + ClO4 xo-stretch`, `2 H2O oh-stretch`.
    pub fn label(&self) -> String {
        let mut parts: Vec<(String, usize)> = Vec::new();
        for (motion, formula) in &self.0 {
            let name = format!("{formula} {motion}");
            match parts.last_mut() {
                Some((last, count)) if *last == name => *count += 1,
                _ => parts.push((name, 1)),
            }
        }
        let words = parts.into_iter().map(|(name, n)| if n == 1 { name } else { format!("{n} {name}") });
        words.collect::<Vec<_>>().join(" + ")
    }
}
