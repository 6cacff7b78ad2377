//! Evidence, best levels and chance matches of bands over every level, without listing the levels.
//!
//! # Method
//! A level of at least two modes is a prefix of excitations followed by a strict pair of later modes i < j that carries
//! the last quanta. For a prefix the sums Σₘ xⱼₘ vₘ (and their variances) of all later modes j stand in contiguous rows,
//! so that the positions of all pairs (i, ·) are one pass over a row. Rows are cut into blocks of eight; a block whose
//! positions, bounded with the coupling of its own modes, meet no band is skipped. Positions and residuals are f64,
//! Gaussians f32, sums f64 in an order that does not depend on threads. What may enter the best list is scored again
//! in f64 from the model itself.
//!
//! Orders are taken one after another: the best of the lower ones are the threshold for the next.

use rayon::prelude::*;

use super::walk::Filter;
use crate::level::{Excitation, Level};
use crate::mode::{ModeIndex, MoietyIndex};
use crate::physics::position::{Model, Rung};

mod kernel;

mod tables;

use kernel::Pass;
use tables::Tables;

/// A level further than this many standard deviations from a band is no candidate of it and adds no evidence. The
/// Gaussian beyond holds 2·10⁻⁹ of its mass.
pub const REACH: f64 = 6.0;

/// A band as the search sees it, cm⁻¹.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Target {
    /// Position.
    pub position: f64,
    /// One standard uncertainty.
    pub sigma: f64,
}

/// Natural logarithm of the prior of a level, in terms that add up:
/// `order[n] + moieties[k] + Σ vᵢ motion[i] + Σ contact[a, b]` for n quanta on k moieties, the last sum over pairs of
/// moieties that carry quanta. Within one order, levels more than about 55 nats below the best conceivable are left out.
#[derive(Clone, Debug, PartialEq)]
pub struct PriorTerms {
    /// By number of quanta; entry 0 is not used. Numbers beyond the end use the last entry; empty is zero.
    pub order: Vec<f64>,
    /// By number of distinct moieties; entry 0 is not used. Beyond the end as for `order`.
    pub moieties: Vec<f64>,
    /// Per quantum of each mode.
    pub motion: Vec<f64>,
    /// Moiety of each mode.
    pub moiety: Vec<MoietyIndex>,
    /// Square matrix over moieties by rows, symmetric; empty for none.
    pub contact: Vec<f64>,
}

impl PriorTerms {
    /// A prior that is equal for all levels of `modes` modes on one moiety.
    pub fn flat(modes: usize) -> Self {
        Self {
            order: Vec::new(),
            moieties: Vec::new(),
            motion: vec![0.0; modes],
            moiety: vec![0; modes],
            contact: Vec::new(),
        }
    }

    fn order(&self, n: usize) -> f64 {
        self.order.get(n).or(self.order.last()).copied().unwrap_or(0.0)
    }

    fn moieties(&self, k: usize) -> f64 {
        self.moieties.get(k).or(self.moieties.last()).copied().unwrap_or(0.0)
    }

    fn contact(&self, a: MoietyIndex, b: MoietyIndex) -> f64 {
        if self.contact.is_empty() {
            return 0.0;
        }
        let kinds = self.contact.len().isqrt();
        self.contact[a * kinds + b]
    }

    /// Natural logarithm of the prior of a level.
    pub fn log(&self, level: &Level) -> f64 {
        let mut seen: Vec<MoietyIndex> = Vec::with_capacity(level.excitations().len());
        let mut sum = self.order(level.order() as usize);
        for e in level.excitations() {
            let mode = usize::from(e.mode);
            sum += f64::from(e.quanta) * self.motion[mode];
            let moiety = self.moiety[mode];
            if !seen.contains(&moiety) {
                sum += seen.iter().map(|other| self.contact(*other, moiety)).sum::<f64>();
                seen.push(moiety);
            }
        }
        sum + self.moieties(seen.len())
    }
}

/// What to search for.
#[derive(Clone, Debug, PartialEq)]
pub struct Question {
    /// Most quanta of a level.
    pub quanta: u8,
    /// How many candidates to keep a band.
    pub best: usize,
    /// Levels at most this far from a band, cm⁻¹, are its chance matches.
    pub tolerance: f64,
    /// Only the best list: evidence and matches stay empty, and whole orders and prefixes that cannot enter are skipped.
    pub best_only: bool,
    /// Which levels.
    pub filter: Filter,
}

/// A level offered for a band.
#[derive(Clone, Debug, PartialEq)]
pub struct Scored {
    /// The level.
    pub level: Level,
    /// Log prior plus log Gaussian of the residual.
    pub score: f64,
    /// Position before resonances, cm⁻¹.
    pub position: f64,
}

/// The answer for one band.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct Answer {
    /// Σ prior × Gaussian by order: entry n − 1 for n quanta.
    pub evidence: Vec<f64>,
    /// Number of levels within the tolerance, by order.
    pub matches: Vec<u64>,
    /// Best levels, best first; equal scores by level.
    pub best: Vec<Scored>,
}

impl Answer {
    /// Natural logarithm of the evidence of all orders; minus infinity where no level reaches the band.
    pub fn log_evidence(&self) -> f64 {
        self.evidence.iter().sum::<f64>().ln()
    }
}

/// Scores of a level for a band: log prior + log N(ν − y; 0, a′Ca + private + s²). `None` beyond [`REACH`].
pub fn score(model: &Model, prior: &PriorTerms, level: &Level, band: Target) -> Option<Scored> {
    let position = model.position(level);
    let variance = model.variance(level) + band.sigma * band.sigma;
    let z2 = (position - band.position).powi(2) / variance;
    (z2 <= REACH * REACH).then(|| Scored {
        level: level.clone(),
        score: prior.log(level) - 0.5 * (z2 + (std::f64::consts::TAU * variance).ln()),
        position,
    })
}

/// The best of a band so far: at most `most`, in total order.
#[derive(Clone, Debug)]
struct Shortlist {
    most: usize,
    list: Vec<Scored>,
}

impl Shortlist {
    fn new(most: usize) -> Self {
        Self { most, list: Vec::new() }
    }

    fn offer(&mut self, new: Scored) {
        let before = |a: &Scored| a.score.total_cmp(&new.score).reverse().then_with(|| a.level.cmp(&new.level)).is_lt();
        let at = self.list.partition_point(before);
        if at < self.most {
            self.list.insert(at, new);
            self.list.truncate(self.most);
        }
    }

    /// Scores below this cannot enter.
    fn threshold(&self) -> f64 {
        if self.most == 0 {
            return f64::INFINITY;
        }
        if self.list.len() < self.most { f64::NEG_INFINITY } else { self.list[self.most - 1].score }
    }
}

/// Searches all levels of 1 to `question.quanta` quanta for every band, in the order of `bands`. Equal for any number
/// of threads. Sigmas of bands must be positive.
///
/// Memory: about 20 bytes per pair of modes and the candidates; levels are never listed.
pub fn search(model: &Model, bands: &[Target], prior: &PriorTerms, question: &Question) -> Vec<Answer> {
    let tables = Tables::new(model, bands, prior, question);
    let quanta = usize::from(question.quanta);
    let nothing = if question.best_only { 0 } else { quanta };
    let mut answers: Vec<Answer> = bands
        .iter()
        .map(|_| Answer { evidence: vec![0.0; nothing], matches: vec![0; nothing], best: Vec::new() })
        .collect();
    // By ascending position, as the tables hold them.
    let mut best: Vec<Shortlist> = vec![Shortlist::new(question.best); bands.len()];
    for order in 1..=quanta {
        if question.best_only && tables.order_cannot_enter(order, &best) {
            continue;
        }
        let parts: Vec<Pass> = tables
            .tasks(order)
            .into_par_iter()
            .map(|task| {
                let mut pass = Pass::new(&tables, order, &best);
                pass.run(task);
                pass
            })
            .collect();
        for part in parts {
            for (at, (evidence, matches, list)) in part.results().enumerate() {
                if !question.best_only {
                    let answer = &mut answers[tables.original[at]];
                    answer.evidence[order - 1] += evidence;
                    answer.matches[order - 1] += matches;
                }
                for scored in list {
                    best[at].offer(scored);
                }
            }
        }
    }
    for (at, list) in best.into_iter().enumerate() {
        answers[tables.original[at]].best = list.list;
    }
    answers
}
