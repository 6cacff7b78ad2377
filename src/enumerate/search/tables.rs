//! What all passes of one search share, laid out in rows over the modes.

use super::{ModeIndex, Model, PriorTerms, Question, REACH, Rung, Shortlist, Target};

/// Modes of one block.
pub(super) const LANES: usize = 8;

/// Stands for "no level here": further from any band than any reach.
pub(super) const NOWHERE: f64 = 1.0e30;

/// One rung of every mode with the same quanta: the first rung of each mode in layer (v, 0), further l in the next.
pub(super) struct Layer {
    pub quanta: u8,
    /// Own terms, cm⁻¹; [`NOWHERE`] where the mode has no such rung.
    pub own: Vec<f64>,
    /// Own variance, cm⁻².
    pub variance: Vec<f32>,
    /// exp(quanta · motion term).
    pub weight: Vec<f32>,
    /// The rungs themselves.
    pub rungs: Vec<Option<Rung>>,
    /// Largest of `weight`, as logarithm.
    pub log_weight: f64,
}

/// Where a pass begins: with an empty prefix, or with all prefixes whose first excitation is this one.
#[derive(Clone, Copy)]
pub(super) enum Task {
    /// Every level, one by one: for the rare tables with couplings between angular momenta.
    OneByOne,
    /// Levels of a single mode, and pairs without a prefix.
    Start,
    /// Mode and rung in its ladder.
    First(usize, Rung),
}

/// Shared, read-only tables; modes ascend by wavenumber here.
pub(super) struct Tables<'a> {
    pub model: &'a Model,
    pub prior: &'a PriorTerms,
    pub question: &'a Question,
    /// Original numbers of the modes.
    pub modes: Vec<ModeIndex>,
    /// Length of a row: modes rounded up to whole blocks.
    pub row: usize,
    pub ladders: Vec<Vec<Rung>>,
    pub layers: Vec<Layer>,
    /// x_ij by rows, both triangles.
    pub coupling: Vec<f64>,
    /// x_ij for j > i, [`NOWHERE`] elsewhere.
    pub later: Vec<f64>,
    /// σ² of x_ij.
    pub spread: Vec<f32>,
    /// Least and largest x_ij, j > i, by row and block.
    pub least: Vec<f64>,
    pub largest: Vec<f64>,
    /// Largest σ² of x_ij in a row.
    pub widest: Vec<f32>,
    /// exp(contact) by rows, zero on the same moiety; the last row is all ones.
    pub contact: Vec<f32>,
    /// Largest exp(contact), at least one.
    pub best_contact: f64,
    /// Bands by ascending position.
    pub bands: Vec<Target>,
    /// Their original numbers.
    pub original: Vec<usize>,
    /// First band at or above `bins_from + width · k`.
    pub bins: Vec<usize>,
    pub bins_from: f64,
    pub widest_band: f64,
    pub narrowest_band: f64,
    /// Least σ² of a fundamental.
    pub least_variance: f64,
    pub best_motion: f64,
}

/// Width of a bin of the band index, cm⁻¹.
const BIN: f64 = 16.0;

impl<'a> Tables<'a> {
    pub fn new(model: &'a Model, bands: &[Target], prior: &'a PriorTerms, question: &'a Question) -> Self {
        let quanta = question.quanta;
        let mut modes: Vec<ModeIndex> = (0..model.modes()).filter(|m| question.filter.takes(*m)).collect();
        modes.sort_by(|a, b| model.nu[*a].total_cmp(&model.nu[*b]).then(a.cmp(b)));
        let n = modes.len();
        let row = n.div_ceil(LANES).max(1) * LANES;
        // Unresolved l components belong to the variance of the mode's own terms.
        let ladders: Vec<Vec<Rung>> = modes
            .iter()
            .map(|m| {
                let mut rungs = model.ladder(*m, quanta);
                for r in rungs.iter_mut().filter(|r| r.excitation.quanta > 1) {
                    r.variance += (model.l_spread[*m] * f64::from(r.excitation.quanta)).powi(2);
                }
                rungs
            })
            .collect();
        let layers = layers(&ladders, &modes, prior, row, quanta);
        let blocks = row / LANES;
        let mut coupling = vec![0.0; n * row];
        let mut later = vec![NOWHERE; n * row];
        let mut spread = vec![0.0f32; n * row];
        let mut contact = vec![0.0f32; (n + 1) * row];
        contact[n * row..].fill(1.0);
        let (mut least, mut largest) = (vec![f64::INFINITY; n * blocks], vec![f64::NEG_INFINITY; n * blocks]);
        let mut widest = vec![0.0f32; n];
        let mut best_contact: f64 = 1.0;
        for i in 0..n {
            for j in 0..n {
                let (a, b) = (prior.moiety[modes[i]], prior.moiety[modes[j]]);
                if a != b {
                    let factor = prior.contact(a, b).exp().max(1.0e-30);
                    best_contact = best_contact.max(factor);
                    contact[i * row + j] = factor as f32;
                }
                if i == j {
                    continue;
                }
                let x = model.x(modes[i], modes[j]);
                coupling[i * row + j] = x.value;
                spread[i * row + j] = (x.sigma * x.sigma) as f32;
                widest[i] = widest[i].max((x.sigma * x.sigma) as f32);
                if j > i {
                    later[i * row + j] = x.value;
                    let block = i * blocks + j / LANES;
                    least[block] = least[block].min(x.value);
                    largest[block] = largest[block].max(x.value);
                }
            }
        }
        let mut original: Vec<usize> = (0..bands.len()).collect();
        original.sort_by(|a, b| bands[*a].position.total_cmp(&bands[*b].position).then(a.cmp(b)));
        let bands: Vec<Target> = original.iter().map(|at| bands[*at]).collect();
        let bins_from = bands.first().map_or(0.0, |b| b.position);
        let end = bands.last().map_or(0.0, |b| b.position);
        // More than 2^16 bins would be a list of nonsense positions; the index then only starts the scan earlier.
        let count = (((end - bins_from) / BIN).ceil() as usize).min(1 << 16) + 1;
        let bins = (0..count).map(|k| bands.partition_point(|b| b.position < bins_from + BIN * k as f64)).collect();
        let sigmas = || bands.iter().map(|b| b.sigma);
        Self {
            widest_band: sigmas().fold(0.0, f64::max),
            narrowest_band: sigmas().fold(f64::INFINITY, f64::min),
            least_variance: modes.iter().map(|m| model.nu_sigma[*m].powi(2)).fold(f64::INFINITY, f64::min),
            best_motion: modes.iter().map(|m| prior.motion[*m]).fold(f64::NEG_INFINITY, f64::max),
            model,
            prior,
            question,
            modes,
            row,
            ladders,
            layers,
            coupling,
            later,
            spread,
            least,
            largest,
            widest,
            contact,
            best_contact,
            bands,
            original,
            bins,
            bins_from,
        }
    }

    /// Index to start from when looking for bands at or above `position`.
    #[inline(always)]
    pub fn first_band(&self, position: f64) -> usize {
        // The cast takes what lies below the first bin, and what is not a number, to bin 0.
        let bin = ((position - self.bins_from) * (1.0 / BIN)) as usize;
        self.bins[bin.min(self.bins.len() - 1)]
    }

    /// Upper bound of the log prior of a level of `order` quanta.
    pub fn best_log_prior(&self, order: usize) -> f64 {
        let moieties = (1..=order).map(|k| self.prior.moieties(k)).fold(f64::NEG_INFINITY, f64::max);
        let pairs = (order * (order - 1) / 2) as f64;
        self.prior.order(order) + moieties + order as f64 * self.best_motion + pairs * self.best_contact.ln()
    }

    /// Variance that every level of this order has at least.
    pub fn least_order_variance(&self, order: usize) -> f64 {
        (self.model.floor * (order - 1) as f64).powi(2) + order as f64 * self.least_variance
    }

    /// Whether no level of this order can enter any of the lists.
    pub fn order_cannot_enter(&self, order: usize, best: &[Shortlist]) -> bool {
        let prior = self.best_log_prior(order);
        let variance = self.least_order_variance(order);
        self.bands.iter().zip(best).all(|(band, list)| {
            let peak = -0.5 * (std::f64::consts::TAU * (variance + band.sigma * band.sigma)).ln();
            prior + peak + 1.0e-9 < list.threshold()
        })
    }

    /// Tasks of a pass, in canonical order.
    pub fn tasks(&self, order: usize) -> Vec<Task> {
        if self.bands.is_empty() || self.modes.is_empty() {
            return Vec::new();
        }
        if !self.model.g_pairs.is_empty() {
            return vec![Task::OneByOne];
        }
        let mut list = vec![Task::Start];
        if order >= 3 {
            for (mode, ladder) in self.ladders.iter().enumerate() {
                let short = ladder.iter().filter(|r| usize::from(r.excitation.quanta) <= order - 2);
                list.extend(short.map(|r| Task::First(mode, *r)));
            }
        }
        list
    }

    /// Standard deviations within which a level concerns a band, as distance, for a largest variance.
    #[inline(always)]
    pub fn reach(&self, variance: f64) -> f64 {
        // A thousandth more than needed, so that f32 variances lose nothing.
        let reach = 1.001 * REACH * (variance + self.widest_band * self.widest_band).sqrt();
        if self.question.best_only { reach } else { reach.max(self.question.tolerance + 1.0e-6) }
    }
}

fn layers(ladders: &[Vec<Rung>], modes: &[ModeIndex], prior: &PriorTerms, row: usize, quanta: u8) -> Vec<Layer> {
    let mut layers = Vec::new();
    for v in 1..quanta {
        for depth in 0.. {
            let mut layer = Layer {
                quanta: v,
                own: vec![NOWHERE; row],
                variance: vec![0.0; row],
                weight: vec![0.0; row],
                rungs: vec![None; row],
                log_weight: f64::NEG_INFINITY,
            };
            for (at, ladder) in ladders.iter().enumerate() {
                let Some(rung) = ladder.iter().filter(|r| r.excitation.quanta == v).nth(depth) else { continue };
                let log = f64::from(v) * prior.motion[modes[at]];
                layer.own[at] = rung.own;
                layer.variance[at] = rung.variance as f32;
                layer.weight[at] = log.exp() as f32;
                layer.rungs[at] = Some(*rung);
                layer.log_weight = layer.log_weight.max(log);
            }
            if layer.log_weight == f64::NEG_INFINITY {
                break;
            }
            layers.push(layer);
        }
    }
    layers
}
