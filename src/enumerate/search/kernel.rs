//! One pass over the levels of one order: prefixes, rows of pairs, blocks of eight.

use pulp::{Arch, Simd, WithSimd};

use super::tables::{LANES, Layer, Tables, Task};
use super::{Excitation, Level, MoietyIndex, REACH, Rung, Scored, Shortlist, score};

/// ½ log 2π.
const HALF_LOG_TAU: f64 = 0.918_938_533_204_672_8;

/// Running rows of a prefix of one depth.
struct Frame {
    /// Σₘ xⱼₘ vₘ.
    shift: Vec<f64>,
    /// Σₘ (σ(xⱼₘ) vₘ)².
    spread: Vec<f32>,
    /// Product of the contact factors with the prefix; zero where the moiety of j is in the prefix.
    fresh: Vec<f32>,
    /// Position added by the last excitation, for the layer at work.
    base: Vec<f64>,
    /// Variance added by it.
    variance: Vec<f32>,
    /// Bounds of `base` by block.
    low: Vec<f64>,
    high: Vec<f64>,
}

impl Frame {
    fn new(row: usize) -> Self {
        Self {
            shift: vec![0.0; row],
            spread: vec![0.0; row],
            fresh: vec![1.0; row],
            base: vec![0.0; row],
            variance: vec![0.0; row],
            low: vec![0.0; row / LANES],
            high: vec![0.0; row / LANES],
        }
    }
}

/// Scalars of a prefix.
#[derive(Clone, Copy)]
struct Prefix {
    depth: usize,
    /// First mode that may follow.
    from: usize,
    position: f64,
    variance: f64,
    /// Log prior of the quanta and contacts so far.
    log: f64,
    /// Quanta still to be placed.
    left: usize,
}

/// The state of one task.
pub(super) struct Pass<'t> {
    t: &'t Tables<'t>,
    arch: Arch,
    order: usize,
    /// Logarithm that f32 weights are relative to.
    reference: f64,
    frames: Vec<Frame>,
    now: Vec<Rung>,
    kinds: Vec<MoietyIndex>,
    sums: Sums,
    lists: Vec<Shortlist>,
    inherited: Vec<f64>,
    /// Smallest threshold of all bands.
    lowest: f64,
    /// Evidence of levels scored one by one.
    single: Vec<f64>,
    single_matches: Vec<u64>,
}

/// What the blocks add to.
struct Sums {
    evidence: Vec<[f64; LANES]>,
    matches: Vec<[u64; LANES]>,
    /// Scaled Gaussians above this may enter the list of a band.
    gate: Vec<f32>,
}

struct Pairs<'p, 't> {
    pass: &'p mut Pass<'t>,
    prefix: Prefix,
    layer: usize,
}

impl WithSimd for Pairs<'_, '_> {
    type Output = ();
    // The body is compiled once per instruction set; it uses no fused or reordered arithmetic, so results are equal.
    #[inline(always)]
    fn with_simd<S: Simd>(self, _: S) {
        if self.pass.t.question.best_only {
            self.pass.pairs::<false>(self.prefix, self.layer);
        } else {
            self.pass.pairs::<true>(self.prefix, self.layer);
        }
    }
}

impl<'t> Pass<'t> {
    pub fn new(t: &'t Tables<'t>, order: usize, best: &[Shortlist]) -> Self {
        let bands = t.bands.len();
        let mut pass = Self {
            t,
            arch: Arch::new(),
            order,
            reference: t.best_log_prior(order),
            frames: (0..order.max(2) - 1).map(|_| Frame::new(t.row)).collect(),
            now: Vec::with_capacity(order),
            kinds: Vec::with_capacity(order),
            sums: Sums {
                evidence: vec![[0.0; LANES]; bands],
                matches: vec![[0; LANES]; bands],
                gate: vec![0.0; bands],
            },
            lists: vec![Shortlist::new(t.question.best); bands],
            inherited: best.iter().map(Shortlist::threshold).collect(),
            lowest: f64::NEG_INFINITY,
            single: vec![0.0; bands],
            single_matches: vec![0; bands],
        };
        (0..bands).for_each(|band| pass.set_gate(band));
        pass.set_lowest();
        pass
    }

    /// Evidence, matches and candidates by band.
    pub fn results(self) -> impl Iterator<Item = (f64, u64, Vec<Scored>)> {
        let scale = (self.reference - HALF_LOG_TAU).exp();
        let sums = self.sums.evidence.into_iter().zip(self.sums.matches);
        let singles = self.single.into_iter().zip(self.single_matches);
        sums.zip(singles).zip(self.lists).map(move |(((lanes, counts), (single, count)), list)| {
            (single + lanes.iter().sum::<f64>() * scale, count + counts.iter().sum::<u64>(), list.list)
        })
    }

    pub fn run(&mut self, task: Task) {
        let root = Prefix {
            depth: 0,
            from: 0,
            position: 0.0,
            variance: (self.t.model.floor * (self.order - 1) as f64).powi(2),
            log: self.t.prior.order(self.order),
            left: self.order,
        };
        match task {
            Task::OneByOne => self.walk(0, self.order),
            Task::Start => {
                let t = self.t;
                let order = self.order;
                for rung in t.ladders.iter().flatten().filter(|r| usize::from(r.excitation.quanta) == order) {
                    self.one(&Level::new([rung.excitation]));
                }
                self.all_pairs(root);
            }
            Task::First(mode, rung) => self.with(root, mode, &rung),
        }
    }

    /// Every level of this order, scored from the model itself.
    fn walk(&mut self, from: usize, left: usize) {
        let t = self.t;
        for mode in from..t.modes.len() {
            for rung in t.ladders[mode].iter().filter(|r| usize::from(r.excitation.quanta) <= left) {
                self.now.push(*rung);
                if usize::from(rung.excitation.quanta) == left {
                    let level = Level::new(self.now.iter().map(|r| r.excitation));
                    self.one(&level);
                } else {
                    self.walk(mode + 1, left - usize::from(rung.excitation.quanta));
                }
                self.now.pop();
            }
        }
    }

    fn one(&mut self, level: &Level) {
        let t = self.t;
        let position = t.model.position(level);
        for (at, band) in t.bands.iter().enumerate() {
            if (position - band.position).abs() <= t.question.tolerance {
                self.single_matches[at] += 1;
            }
            if let Some(scored) = score(t.model, t.prior, level, *band) {
                self.single[at] += scored.score.exp();
                self.offer(at, scored);
            }
        }
    }

    fn offer(&mut self, band: usize, scored: Scored) {
        if scored.score >= self.inherited[band] {
            self.lists[band].offer(scored);
            self.set_gate(band);
            self.set_lowest();
        }
    }

    fn threshold(&self, band: usize) -> f64 {
        self.inherited[band].max(self.lists[band].threshold())
    }

    fn set_gate(&mut self, band: usize) {
        // A little below the threshold: f32 decides who is looked at, f64 who enters.
        let gate = (self.threshold(band) - self.reference + HALF_LOG_TAU).exp() * (1.0 - 1.0e-4);
        self.sums.gate[band] = gate as f32;
    }

    fn set_lowest(&mut self) {
        self.lowest = (0..self.lists.len()).map(|b| self.threshold(b)).fold(f64::INFINITY, f64::min);
    }

    /// Upper bound of the score of what follows a prefix.
    fn cannot_enter(&self, p: &Prefix) -> bool {
        let t = self.t;
        let moieties = (1..=self.order).map(|k| t.prior.moieties(k)).fold(f64::NEG_INFINITY, f64::max);
        let pairs = (self.order * (self.order - 1) / 2) as f64 * t.best_contact.ln();
        let variance = p.variance + p.left as f64 * t.least_variance + t.narrowest_band * t.narrowest_band;
        let best = p.log + moieties + pairs + p.left as f64 * t.best_motion;
        best - HALF_LOG_TAU - 0.5 * variance.ln() + 1.0e-6 < self.lowest
    }

    /// Adds an excitation to a prefix and visits all that follows.
    fn with(&mut self, p: Prefix, mode: usize, rung: &Rung) {
        let t = self.t;
        let v = f64::from(rung.excitation.quanta);
        let (row, span) = (t.row, mode * t.row..(mode + 1) * t.row);
        let frame = &self.frames[p.depth];
        let next = Prefix {
            depth: p.depth + 1,
            from: mode + 1,
            position: p.position + rung.own + v * frame.shift[mode],
            variance: p.variance + rung.variance + v * v * f64::from(frame.spread[mode]),
            log: p.log + v * t.prior.motion[t.modes[mode]],
            left: p.left - usize::from(rung.excitation.quanta),
        };
        let moiety = t.prior.moiety[t.modes[mode]];
        let fresh = !self.kinds.contains(&moiety);
        let contact: f64 = if fresh { self.kinds.iter().map(|k| t.prior.contact(*k, moiety)).sum() } else { 0.0 };
        let next = Prefix { log: next.log + contact, ..next };
        if t.question.best_only && self.cannot_enter(&next) {
            return;
        }
        let (before, after) = self.frames.split_at_mut(p.depth + 1);
        let (before, after) = (&before[p.depth], &mut after[0]);
        let v2 = (v * v) as f32;
        let factors = if fresh { &t.contact[span.clone()] } else { &t.contact[t.modes.len() * row..] };
        let (coupling, spread) = (&t.coupling[span.clone()], &t.spread[span]);
        for j in (mode + 1) / LANES * LANES..row {
            after.shift[j] = before.shift[j] + v * coupling[j];
            after.spread[j] = before.spread[j] + v2 * spread[j];
            after.fresh[j] = before.fresh[j] * factors[j];
        }
        self.now.push(*rung);
        if fresh {
            self.kinds.push(moiety);
        }
        self.all_pairs(next);
        if next.left >= 3 {
            for mode in next.from..t.modes.len().saturating_sub(2) {
                for rung in t.ladders[mode].iter().filter(|r| usize::from(r.excitation.quanta) <= next.left - 2) {
                    self.with(next, mode, rung);
                }
            }
        }
        if fresh {
            self.kinds.pop();
        }
        self.now.pop();
    }

    fn all_pairs(&mut self, prefix: Prefix) {
        if prefix.from + 1 >= self.t.modes.len() {
            return;
        }
        for layer in 0..self.t.layers.len() {
            if usize::from(self.t.layers[layer].quanta) < prefix.left {
                let arch = self.arch;
                arch.dispatch(Pairs { pass: self, prefix, layer });
            }
        }
    }

    /// All strict pairs after a prefix whose second mode is on a rung of this layer.
    #[inline(always)]
    fn pairs<const EVIDENCE: bool>(&mut self, p: Prefix, layer: usize) {
        let t = self.t;
        let layer: &Layer = &t.layers[layer];
        let b = f64::from(layer.quanta);
        let a = p.left - usize::from(layer.quanta);
        let (row, blocks, modes) = (t.row, t.row / LANES, t.modes.len());
        let begin = (p.from + 1) / LANES;
        let frame = &mut self.frames[p.depth];
        let (mut widest, mut narrowest) = (0.0f32, f32::INFINITY);
        for block in begin..blocks {
            let (mut low, mut high) = (f64::INFINITY, f64::NEG_INFINITY);
            let at = block * LANES;
            let own = &layer.own[at..at + LANES];
            let own_variance = &layer.variance[at..at + LANES];
            let (shift, spread) = (&frame.shift[at..at + LANES], &frame.spread[at..at + LANES]);
            let base = &mut frame.base[at..at + LANES];
            let variance = &mut frame.variance[at..at + LANES];
            let b2 = (b * b) as f32;
            for k in 0..LANES {
                let x = own[k] + b * shift[k];
                base[k] = x;
                low = if x < low { x } else { low };
                // What stands for "no level" must not widen the block.
                let there = if own[k] < 1.0e29 { x } else { f64::NEG_INFINITY };
                high = if there > high { there } else { high };
                let s = own_variance[k] + b2 * spread[k];
                variance[k] = s;
                widest = if s > widest { s } else { widest };
                narrowest = if s < narrowest { s } else { narrowest };
            }
            frame.low[block] = low;
            frame.high[block] = high;
        }
        let known = self.kinds.len();
        for i in p.from..modes - 1 {
            let moiety = t.prior.moiety[t.modes[i]];
            for rung in t.ladders[i].iter().filter(|r| usize::from(r.excitation.quanta) == a) {
                let frame = &self.frames[p.depth];
                let fresh = frame.fresh[i] != 0.0;
                let k = known + usize::from(fresh);
                let contact: f64 =
                    if fresh { self.kinds.iter().map(|m| t.prior.contact(*m, moiety)).sum() } else { 0.0 };
                let a = a as f64;
                let log = p.log + contact + a * t.prior.motion[t.modes[i]];
                let start = p.position + rung.own + a * frame.shift[i];
                let variance = p.variance + rung.variance + a * a * f64::from(frame.spread[i]);
                let ab = a * b;
                let ab2 = (ab * ab) as f32;
                let (same, new) = (log + t.prior.moieties(k), log + t.prior.moieties(k + 1));
                let largest = variance + f64::from(widest + ab2 * t.widest[i]);
                let mut reach = t.reach(largest);
                if !EVIDENCE && self.lowest > f64::NEG_INFINITY {
                    let least = variance + f64::from(narrowest) * 0.999 + t.narrowest_band * t.narrowest_band;
                    let best = same.max(new + k as f64 * t.best_contact.ln()) + layer.log_weight;
                    let room = 2.0 * (best - HALF_LOG_TAU - 0.5 * least.ln() + 1.0e-6 - self.lowest);
                    if room < 0.0 {
                        continue;
                    }
                    let close = (room * (largest + t.widest_band * t.widest_band)).sqrt() * 1.001;
                    reach = reach.min(close);
                }
                let weigh_same = (same - self.reference).exp() as f32;
                let weigh_new = (new - self.reference).exp() as f32;
                let factors = if fresh { &t.contact[i * row..(i + 1) * row] } else { &t.contact[modes * row..] };
                for block in (i + 1) / LANES..blocks {
                    let low = start + frame.low[block] + ab * t.least[i * blocks + block] - reach;
                    let high = start + frame.high[block] + ab * t.largest[i * blocks + block] + reach;
                    let mut band = t.first_band(low);
                    if band >= t.bands.len() || t.bands[band].position > high {
                        continue;
                    }
                    while band < t.bands.len() && t.bands[band].position < low {
                        band += 1;
                    }
                    if band >= t.bands.len() || t.bands[band].position > high {
                        continue;
                    }
                    let from = block * LANES;
                    let block_row = Block {
                        start,
                        variance: variance as f32,
                        ab,
                        ab2,
                        base: lanes(&frame.base, from),
                        later: lanes(&t.later, i * row + from),
                        own_variance: lanes(&frame.variance, from),
                        spread: lanes(&t.spread, i * row + from),
                        fresh: lanes(&frame.fresh, from),
                        factors: lanes(factors, from),
                        weight: lanes(&layer.weight, from),
                        same: weigh_same,
                        new: weigh_new,
                    };
                    block_row.visit::<EVIDENCE>(t, &mut self.sums, band, high, |sums, band, lane| {
                        let Some(last) = &layer.rungs[from + lane] else { return };
                        let excitations = self.now.iter().map(|r| r.excitation);
                        let pair = [rung.excitation, last.excitation];
                        let now: Vec<Excitation> = excitations.chain(pair).collect();
                        consider(t, &mut self.lists[band], self.inherited[band], band, now, self.reference, sums);
                    });
                    if !EVIDENCE {
                        let lists = self.lists.iter().zip(&self.inherited);
                        self.lowest =
                            lists.map(|(l, inherited)| l.threshold().max(*inherited)).fold(f64::INFINITY, f64::min);
                    }
                }
            }
        }
    }
}

/// Scores a level that passed the gate, in f64 and from the model itself.
#[cold]
#[inline(never)]
fn consider(
    t: &Tables,
    list: &mut Shortlist,
    inherited: f64,
    band: usize,
    excitations: Vec<Excitation>,
    reference: f64,
    sums: &mut Sums,
) {
    let level = Level::new(excitations);
    let Some(scored) = score(t.model, t.prior, &level, t.bands[band]) else { return };
    if scored.score < inherited {
        return;
    }
    list.offer(scored);
    let threshold = list.threshold().max(inherited);
    sums.gate[band] = ((threshold - reference + HALF_LOG_TAU).exp() * (1.0 - 1.0e-4)) as f32;
}

#[inline(always)]
fn lanes<T>(list: &[T], from: usize) -> &[T; LANES] {
    list[from..from + LANES].first_chunk().expect("rows are whole blocks")
}

/// Eight pairs (i, j..j + 8).
struct Block<'r> {
    start: f64,
    variance: f32,
    ab: f64,
    ab2: f32,
    base: &'r [f64; LANES],
    later: &'r [f64; LANES],
    own_variance: &'r [f32; LANES],
    spread: &'r [f32; LANES],
    fresh: &'r [f32; LANES],
    factors: &'r [f32; LANES],
    weight: &'r [f32; LANES],
    same: f32,
    new: f32,
}

impl Block<'_> {
    /// Adds the block to every band from `band` on up to `high`; `enter` is called for lanes above the gate.
    #[inline(always)]
    fn visit<const EVIDENCE: bool>(
        &self,
        t: &Tables,
        sums: &mut Sums,
        first: usize,
        high: f64,
        mut enter: impl FnMut(&mut Sums, usize, usize),
    ) {
        let mut at = [0.0f64; LANES];
        let mut variance = [0.0f32; LANES];
        let mut weight = [0.0f32; LANES];
        for k in 0..LANES {
            at[k] = self.start + self.base[k] + self.ab * self.later[k];
            variance[k] = self.variance + self.own_variance[k] + self.ab2 * self.spread[k];
            let factor = self.fresh[k] * self.factors[k];
            weight[k] = self.weight[k] * if factor == 0.0 { self.same } else { self.new * factor };
        }
        let (mut inverse, mut peak) = ([0.0f32; LANES], [0.0f32; LANES]);
        let mut sigma = f64::NAN;
        for (band, target) in t.bands.iter().enumerate().skip(first) {
            if target.position > high {
                break;
            }
            if target.sigma != sigma {
                sigma = target.sigma;
                let s2 = (sigma * sigma) as f32;
                for k in 0..LANES {
                    inverse[k] = 1.0 / (variance[k] + s2);
                    peak[k] = weight[k] * inverse[k].sqrt();
                }
            }
            let mut gaussian = [0.0f32; LANES];
            let gate = sums.gate[band];
            let mut above = 0u32;
            for k in 0..LANES {
                let d = (at[k] - target.position) as f32;
                let z2 = d * d * inverse[k];
                let e = peak[k] * exp_half(z2);
                gaussian[k] = if z2 <= (REACH * REACH) as f32 { e } else { 0.0 };
                above |= u32::from(gaussian[k] > gate);
            }
            if EVIDENCE {
                let (evidence, matches) = (&mut sums.evidence[band], &mut sums.matches[band]);
                for k in 0..LANES {
                    evidence[k] += f64::from(gaussian[k]);
                    matches[k] += u64::from((at[k] - target.position).abs() <= t.question.tolerance);
                }
            }
            if above != 0 {
                for (k, g) in gaussian.into_iter().enumerate() {
                    if g > sums.gate[band] {
                        enter(sums, band, k);
                    }
                }
            }
        }
    }
}

/// exp(−z²/2) for z² of at least 0, to 2·10⁻⁷; constant beyond z² = 40, which the caller leaves out.
///
/// Splits off the power of two with the usual trick of adding 1.5·2²³; the rest is the Taylor series of 2ᶠ, |f| ≤ ½.
#[inline(always)]
fn exp_half(z2: f32) -> f32 {
    const ROUND: f32 = 12_582_912.0;
    let z2 = if z2 < 40.0 { z2 } else { 40.0 };
    let x = z2 * (-0.5 * std::f32::consts::LOG2_E);
    let rounded = x + ROUND;
    let f = (x - (rounded - ROUND)) * std::f32::consts::LN_2;
    let series =
        1.0 + f * (1.0 + f * (0.5 + f * (1.0 / 6.0 + f * (1.0 / 24.0 + f * (1.0 / 120.0 + f * (1.0 / 720.0))))));
    series * f32::from_bits(rounded.to_bits().wrapping_add(127) << 23)
}

#[cfg(test)]
mod tests {
    use super::exp_half;

    #[test]
    fn the_fast_exponential_is_good_to_single_precision() {
        for k in 0..=36_000u16 {
            let z2 = f32::from(k) * 1.0e-3;
            let exact = (-0.5 * f64::from(z2)).exp();
            // Rounding of the argument (up to 26 in powers of two) costs about 26 · 6e-8.
            assert!((f64::from(exp_half(z2)) / exact - 1.0).abs() < 1.5e-6, "z² = {z2}");
        }
    }
}
