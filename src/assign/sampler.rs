//! A population of joint assignments.
//!
//! # Method
//! Sequential Monte Carlo over the bands, least ambiguous first: each member takes the next band from its exact
//! conditional distribution; the mean weight of the step is a factor of an unbiased estimate of Z; systematic resampling
//! when the effective size falls below half. Then Gibbs sweeps of every member, band by band, then the inflation κ and
//! the strength model. Conditional probabilities are averaged, not visits. Sequential Monte Carlo: Doucet, de Freitas &
//! Gordon (2001); averaging of conditionals: Gelfand & Smith (1990) (both from memory). Compared with exact enumeration
//! in `tests/statistics.rs`.
//!
//! Member `i` draws from stream `i` of one seeded generator and sums are formed in a fixed order: the answer does not
//! depend on the number of threads.

use rand::{Rng, SeedableRng};
use rand_chacha::ChaCha8Rng;
use rayon::prelude::*;

use super::kernel::{Conditioned, Slopes, log_normal, log_sum};
use super::problem::{Problem, Shares};

/// How long to sample.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Effort {
    /// Members of the population.
    pub particles: usize,
    /// Sweeps of each member.
    pub sweeps: usize,
    /// Sweeps that are not averaged, at the start.
    pub discard: usize,
    /// Seed of the generator.
    pub seed: u64,
}

impl Default for Effort {
    fn default() -> Self {
        Self { particles: 256, sweeps: 8, discard: 3, seed: 1 }
    }
}

/// What sampling gives.
#[derive(Clone, Debug, PartialEq)]
pub struct Population {
    /// Probabilities of each band.
    pub shares: Vec<Shares>,
    /// The same from the first and from the second half of the population.
    pub halves: [Vec<Shares>; 2],
    /// log Z, the weight of the strength models included.
    pub log_z: f64,
    /// Probabilities of the strength models.
    pub models: Vec<f64>,
    /// Probabilities of the inflations.
    pub inflations: Vec<f64>,
    /// Probability of an enlarged uncertainty, per band.
    pub heavy: Vec<f64>,
    /// Mean of each scaled parameter (in units of its sigma) and its second moment about zero.
    pub parameters: Vec<(f64, f64)>,
}

type Choice = u16;
const UNSEEN: Choice = u16::MAX;
const FOREIGN: Choice = u16::MAX - 1;
const UNLISTED: Choice = u16::MAX - 2;
/// Offers beyond this many per band are not used.
pub const MOST_OFFERS: usize = 60_000;

/// Candidates whose greatest possible weight (unconditioned variance, narrowest peak) is this many nats below the best are
/// passed over: a hundred of them together weigh less than 0.5 % of the best even if all of them met that bound.
const NEGLIGIBLE: f64 = 10.0;

#[derive(Clone)]
struct Member {
    choice: Vec<Choice>,
    tail: Vec<u8>,
    inflation: u8,
    model: u16,
    /// Covariances of assigned bands at κ = 1.
    kernel: Vec<f64>,
    log_weight: f64,
}

/// Which parameters the offers of each band depend on.
type Relevant = Vec<Vec<bool>>;

fn relevant(problem: &Problem) -> Relevant {
    let of = |target: &super::problem::Target| {
        let mut list = vec![false; problem.parameters];
        for offer in &target.offers {
            offer.slopes.pairs().iter().for_each(|&(p, _)| list[p as usize] = true);
        }
        list
    };
    problem.targets.iter().map(of).collect()
}

struct Scratch<'a> {
    relevant: &'a Relevant,
    shift: Vec<f64>,
    /// Column of each parameter in the projection, [`NOWHERE`] for those no assigned band depends on.
    slot: Vec<u32>,
    columns: Vec<u32>,
    rows: Vec<f64>,
    projection: Vec<f64>,
    combination: Vec<f64>,
    entries: Vec<(Choice, u8, f64)>,
    covariances: Vec<f64>,
    assigned: Vec<usize>,
    used: Vec<usize>,
}

const NOWHERE: u32 = u32::MAX;

impl<'a> Scratch<'a> {
    fn new(problem: &Problem, relevant: &'a Relevant) -> Self {
        Self {
            relevant,
            shift: vec![0.0; problem.parameters],
            slot: vec![NOWHERE; problem.parameters],
            columns: Vec::new(),
            rows: Vec::new(),
            projection: Vec::new(),
            combination: Vec::new(),
            entries: Vec::new(),
            covariances: Vec::new(),
            assigned: Vec::new(),
            used: Vec::new(),
        }
    }
}

impl Member {
    fn slopes<'a>(&self, problem: &'a Problem, band: usize) -> &'a Slopes {
        &problem.targets[band].offers[usize::from(self.choice[band])].slopes
    }

    /// Bands assigned to a level, `except` one.
    fn assigned(&self, except: usize, list: &mut Vec<usize>) {
        list.clear();
        list.extend((0..self.choice.len()).filter(|&b| b != except && self.choice[b] < UNLISTED));
    }

    fn conditioned(&self, problem: &Problem, bands: &[usize], kappa_squared: f64) -> Conditioned {
        let k = self.choice.len();
        let offer = |b: usize| &problem.targets[b].offers[usize::from(self.choice[b])];
        let residuals = bands.iter().map(|&b| offer(b).residual).collect();
        Conditioned::new(residuals, |i, j| {
            let (a, b) = (bands[i], bands[j]);
            let shared = kappa_squared * self.kernel[a * k + b];
            if i == j {
                let tail = problem.tails[usize::from(self.tail[a])].0;
                shared + offer(a).private + tail * tail * problem.targets[a].variance
            } else {
                shared
            }
        })
    }

    /// Fills `scratch.projection` with L⁻¹ A, one column of length `assigned.len()` for every parameter that both an
    /// assigned band and an offer of `band` depend on.
    fn project(
        &self,
        problem: &Problem,
        band: usize,
        assigned: &[usize],
        conditioned: &Conditioned,
        kappa_squared: f64,
        scratch: &mut Scratch<'_>,
    ) {
        let wanted = &scratch.relevant[band];
        for &b in assigned {
            for &(p, _) in self.slopes(problem, b).pairs() {
                if wanted[p as usize] && scratch.slot[p as usize] == NOWHERE {
                    scratch.slot[p as usize] = scratch.columns.len() as u32;
                    scratch.columns.push(p);
                }
            }
        }
        let (n, columns) = (assigned.len(), scratch.columns.len());
        scratch.rows.clear();
        scratch.rows.resize(n * columns, 0.0);
        for (row, &b) in assigned.iter().enumerate() {
            for &(p, a) in self.slopes(problem, b).pairs() {
                let slot = scratch.slot[p as usize];
                if slot != NOWHERE {
                    scratch.rows[row * columns + slot as usize] = kappa_squared * a;
                }
            }
        }
        conditioned.project(&mut scratch.rows, columns);
        scratch.projection.clear();
        scratch.projection.resize(n * columns, 0.0);
        for row in 0..n {
            for column in 0..columns {
                scratch.projection[column * n + row] = scratch.rows[row * columns + column];
            }
        }
    }

    /// Fills `scratch.entries` with all choices for `band` and the log of their weights given the rest; returns the log
    /// of the sum and leaves probabilities in place of the logs.
    fn weigh(&self, problem: &Problem, band: usize, scratch: &mut Scratch<'_>) -> f64 {
        let target = &problem.targets[band];
        let kappa_squared = problem.inflations[usize::from(self.inflation)].0.powi(2);
        let model = usize::from(self.model);
        let mut assigned = std::mem::take(&mut scratch.assigned);
        self.assigned(band, &mut assigned);
        let conditioned = self.conditioned(problem, &assigned, kappa_squared);
        for (&b, w) in assigned.iter().zip(conditioned.weights()) {
            for &(p, a) in self.slopes(problem, b).pairs() {
                scratch.shift[p as usize] += kappa_squared * w * a;
            }
        }
        self.project(problem, band, &assigned, &conditioned, kappa_squared, scratch);
        let n = assigned.len();
        scratch.used.clear();
        scratch.used.extend(assigned.iter().map(|&b| problem.targets[b].offers[usize::from(self.choice[b])].candidate));
        let entries = &mut scratch.entries;
        entries.clear();
        let foreign = (0..self.choice.len()).filter(|&b| b != band && self.choice[b] == FOREIGN).count();
        entries.push((FOREIGN, 0, problem.log_foreign(band, foreign)));
        let mut top = entries[0].2;
        if target.unlisted > f64::NEG_INFINITY {
            entries.push((UNLISTED, 0, target.unlisted));
            top = top.max(target.unlisted);
        }
        // Per tail: its variance, the log of its prior weight, and the highest peak it allows.
        let tails: Vec<(f64, f64, f64)> = problem
            .tails
            .iter()
            .map(|&(tail, weight)| {
                let noise = tail * tail * target.variance;
                (noise, weight.ln(), weight.ln() - 0.5 * (std::f64::consts::TAU * noise).ln())
            })
            .collect();
        // The choice of before comes first: it is mostly a good one, and lets hopeless ones be passed over early.
        let before = usize::from(self.choice[band]);
        let first = (before < target.offers.len()).then_some(before);
        let rest = (0..target.offers.len()).filter(|&i| Some(i) != first);
        for number in first.into_iter().chain(rest) {
            let offer = &target.offers[number];
            let fit = offer.fit[model];
            if fit + tails[0].2 < top - NEGLIGIBLE {
                continue;
            }
            let shift: f64 = offer.slopes.pairs().iter().map(|&(p, a)| scratch.shift[p as usize] * a).sum();
            let difference = offer.residual - shift;
            let room = kappa_squared * offer.shared + offer.private;
            // No narrower than the band itself, no wider than unconditioned.
            let square = difference * difference;
            let possible =
                tails.iter().any(|&(noise, _, peak)| fit + peak - 0.5 * square / (room + noise) >= top - NEGLIGIBLE);
            if !possible {
                continue;
            }
            if scratch.used.contains(&offer.candidate) {
                continue;
            }
            scratch.combination.clear();
            scratch.combination.resize(n, 0.0);
            for &(p, a) in offer.slopes.pairs() {
                let slot = scratch.slot[p as usize];
                if slot != NOWHERE {
                    let column = &scratch.projection[slot as usize * n..(slot as usize + 1) * n];
                    scratch.combination.iter_mut().zip(column).for_each(|(c, w)| *c += a * w);
                }
            }
            let taken: f64 = scratch.combination.iter().map(|c| c * c).sum();
            let variance = (kappa_squared * offer.shared - taken).max(0.0) + offer.private;
            for (t, &(noise, log_weight, peak)) in tails.iter().enumerate() {
                if fit + peak < top - NEGLIGIBLE {
                    continue;
                }
                let log = fit + log_weight + log_normal(difference, variance + noise);
                if log >= top - NEGLIGIBLE {
                    top = top.max(log);
                    entries.push((number as Choice, t as u8, log));
                }
            }
        }
        for &b in &assigned {
            for &(p, _) in self.slopes(problem, b).pairs() {
                scratch.shift[p as usize] = 0.0;
            }
        }
        for p in scratch.columns.drain(..) {
            scratch.slot[p as usize] = NOWHERE;
        }
        scratch.assigned = assigned;
        let sum: f64 = scratch.entries.iter().map(|e| (e.2 - top).exp()).sum();
        let total = top + sum.ln();
        for entry in &mut scratch.entries {
            entry.2 = (entry.2 - total).exp();
        }
        total
    }

    /// Takes one of the weighed choices.
    fn take(&mut self, problem: &Problem, band: usize, scratch: &Scratch<'_>, rng: &mut ChaCha8Rng) {
        let mut left: f64 = rng.random();
        let mut picked = scratch.entries[0];
        for &entry in &scratch.entries {
            picked = entry;
            left -= entry.2;
            if left <= 0.0 {
                break;
            }
        }
        self.tail[band] = picked.1;
        if self.choice[band] == picked.0 {
            return;
        }
        self.choice[band] = picked.0;
        if picked.0 >= UNLISTED {
            return;
        }
        let k = self.choice.len();
        let own = self.slopes(problem, band);
        for b in 0..k {
            if self.choice[b] < UNLISTED {
                let shared = own.dot(self.slopes(problem, b));
                self.kernel[band * k + b] = shared;
                self.kernel[b * k + band] = shared;
            }
        }
    }

    fn draw_inflation(&mut self, problem: &Problem, assigned: &[usize], rng: &mut ChaCha8Rng) -> Vec<f64> {
        let logs: Vec<f64> = problem
            .inflations
            .iter()
            .map(|&(kappa, w)| w.ln() + self.conditioned(problem, assigned, kappa * kappa).log_evidence())
            .collect();
        let shares = normalised(&logs);
        self.inflation = pick(&shares, rng) as u8;
        shares
    }

    fn draw_model(&mut self, problem: &Problem, assigned: &[usize], rng: &mut ChaCha8Rng) -> Vec<f64> {
        let mut logs = problem.models.clone();
        for &b in assigned {
            let fit = &problem.targets[b].offers[usize::from(self.choice[b])].fit;
            logs.iter_mut().zip(fit).for_each(|(l, f)| *l += f);
        }
        let shares = normalised(&logs);
        self.model = pick(&shares, rng) as u16;
        shares
    }
}

fn normalised(logs: &[f64]) -> Vec<f64> {
    let total = log_sum(logs.iter().copied());
    logs.iter().map(|l| (l - total).exp()).collect()
}

fn pick(shares: &[f64], rng: &mut ChaCha8Rng) -> usize {
    let mut left: f64 = rng.random();
    for (i, s) in shares.iter().enumerate() {
        left -= s;
        if left <= 0.0 {
            return i;
        }
    }
    shares.len() - 1
}

/// Systematic draws: for each of `n` evenly spaced points, the index whose share holds it.
fn systematic(shares: &[f64], n: usize, rng: &mut ChaCha8Rng) -> Vec<usize> {
    let offset: f64 = rng.random();
    let mut list = Vec::with_capacity(n);
    let (mut at, mut upto) = (0, shares[0]);
    for i in 0..n {
        let point = (i as f64 + offset) / n as f64;
        while upto < point && at + 1 < shares.len() {
            at += 1;
            upto += shares[at];
        }
        list.push(at);
    }
    list
}

#[derive(Clone)]
struct Sums {
    shares: Vec<Shares>,
    heavy: Vec<f64>,
    models: Vec<f64>,
    inflations: Vec<f64>,
    parameters: Vec<(f64, f64)>,
    sweeps: f64,
    members: f64,
}

impl Sums {
    fn new(problem: &Problem) -> Self {
        let shares = problem.targets.iter().map(|t| Shares { offers: vec![0.0; t.offers.len()], ..Shares::default() });
        Self {
            shares: shares.collect(),
            heavy: vec![0.0; problem.targets.len()],
            models: vec![0.0; problem.models.len()],
            inflations: vec![0.0; problem.inflations.len()],
            parameters: vec![(0.0, 0.0); problem.parameters],
            sweeps: 0.0,
            members: 0.0,
        }
    }

    fn record(&mut self, band: usize, entries: &[(Choice, u8, f64)]) {
        for &(choice, tail, share) in entries {
            match choice {
                FOREIGN => self.shares[band].foreign += share,
                UNLISTED => self.shares[band].unlisted += share,
                number => self.shares[band].offers[usize::from(number)] += share,
            }
            if tail > 0 {
                self.heavy[band] += share;
            }
        }
    }

    fn record_parameters(&mut self, problem: &Problem, member: &Member, scratch: &mut Scratch<'_>) {
        let kappa_squared = problem.inflations[usize::from(member.inflation)].0.powi(2);
        let mut assigned = Vec::new();
        member.assigned(usize::MAX, &mut assigned);
        let conditioned = member.conditioned(problem, &assigned, kappa_squared);
        let mut touched: Vec<u32> = Vec::new();
        for (column, &b) in assigned.iter().enumerate() {
            for &(p, a) in member.slopes(problem, b).pairs() {
                scratch.shift[p as usize] += kappa_squared * a * conditioned.weights()[column];
                touched.push(p);
            }
        }
        touched.sort_unstable();
        touched.dedup();
        for entry in &mut self.parameters {
            entry.1 += kappa_squared;
        }
        for &p in &touched {
            scratch.covariances.clear();
            for &b in &assigned {
                let pairs = member.slopes(problem, b).pairs();
                let slope = pairs.binary_search_by_key(&p, |&(q, _)| q).map_or(0.0, |at| pairs[at].1);
                scratch.covariances.push(kappa_squared * slope);
            }
            let taken = conditioned.variance_taken(&mut scratch.covariances);
            let mean = std::mem::take(&mut scratch.shift[p as usize]);
            self.parameters[p as usize].0 += mean;
            self.parameters[p as usize].1 += mean * mean - taken;
        }
        self.members += 1.0;
    }

    fn add(&mut self, other: &Self) {
        fn plus(a: &mut [f64], b: &[f64]) {
            a.iter_mut().zip(b).for_each(|(a, b)| *a += b);
        }
        for (a, b) in self.shares.iter_mut().zip(&other.shares) {
            plus(&mut a.offers, &b.offers);
            a.foreign += b.foreign;
            a.unlisted += b.unlisted;
        }
        plus(&mut self.heavy, &other.heavy);
        plus(&mut self.models, &other.models);
        plus(&mut self.inflations, &other.inflations);
        for (a, b) in self.parameters.iter_mut().zip(&other.parameters) {
            a.0 += b.0;
            a.1 += b.1;
        }
        self.sweeps += other.sweeps;
        self.members += other.members;
    }

    fn mean_shares(&self) -> Vec<Shares> {
        let n = self.sweeps.max(1.0);
        let scale = |s: &Shares| Shares {
            offers: s.offers.iter().map(|p| p / n).collect(),
            foreign: s.foreign / n,
            unlisted: s.unlisted / n,
        };
        self.shares.iter().map(scale).collect()
    }
}

/// Members that share one set of sums.
const CHUNK: usize = 16;

/// Samples joint assignments of `problem`.
pub fn sample(problem: &Problem, effort: &Effort) -> Population {
    let k = problem.targets.len();
    let particles = effort.particles.max(2);
    let mut master = ChaCha8Rng::seed_from_u64(effort.seed);
    let mut rngs: Vec<ChaCha8Rng> = (0..particles)
        .map(|i| {
            let mut rng = ChaCha8Rng::seed_from_u64(effort.seed);
            rng.set_stream(1 + i as u64);
            rng
        })
        .collect();

    // Least ambiguous bands first: entropy of the independent posteriors, ties by position in the list.
    let independent = problem.independent();
    let entropy = |s: &Shares| -> f64 {
        let all = s.offers.iter().chain([&s.foreign, &s.unlisted]);
        all.filter(|p| **p > 0.0).map(|p| -p * p.ln()).sum()
    };
    let mut order: Vec<(f64, usize)> = independent.iter().enumerate().map(|(b, (s, _))| (entropy(s), b)).collect();
    order.sort_by(|a, b| a.0.total_cmp(&b.0).then(a.1.cmp(&b.1)));

    let log_models = log_sum(problem.models.iter().copied());
    let mut starts = Vec::with_capacity(problem.models.len() * problem.inflations.len());
    for m in &problem.models {
        starts.extend(problem.inflations.iter().map(|&(_, w)| (m - log_models).exp() * w));
    }
    let all: f64 = starts.iter().sum();
    starts.iter_mut().for_each(|s| *s /= all);
    let mut members: Vec<Member> = systematic(&starts, particles, &mut master)
        .into_iter()
        .map(|at| Member {
            choice: vec![UNSEEN; k],
            tail: vec![0; k],
            inflation: (at % problem.inflations.len()) as u8,
            model: (at / problem.inflations.len()) as u16,
            kernel: vec![0.0; k * k],
            log_weight: 0.0,
        })
        .collect();

    let relevant = relevant(problem);
    let mut log_z = log_models + problem.log_no_foreign();
    for (step, &(_, band)) in order.iter().enumerate() {
        members.par_chunks_mut(CHUNK).zip(rngs.par_chunks_mut(CHUNK)).for_each(|(members, rngs)| {
            let mut scratch = Scratch::new(problem, &relevant);
            for (member, rng) in members.iter_mut().zip(rngs) {
                member.log_weight += member.weigh(problem, band, &mut scratch);
                member.take(problem, band, &scratch, rng);
            }
        });
        let logs: Vec<f64> = members.iter().map(|m| m.log_weight).collect();
        let weights = normalised(&logs);
        let effective = 1.0 / weights.iter().map(|w| w * w).sum::<f64>();
        if effective < 0.5 * particles as f64 || step + 1 == k {
            log_z += log_sum(logs.iter().copied()) - (particles as f64).ln();
            let ancestors = systematic(&weights, particles, &mut master);
            members = ancestors.into_iter().map(|a| Member { log_weight: 0.0, ..members[a].clone() }).collect();
        }
    }

    let sums: Vec<Sums> = members
        .par_chunks_mut(CHUNK)
        .zip(rngs.par_chunks_mut(CHUNK))
        .map(|(members, rngs)| {
            let mut sums = Sums::new(problem);
            let mut scratch = Scratch::new(problem, &relevant);
            let mut assigned = Vec::new();
            for (member, rng) in members.iter_mut().zip(rngs) {
                for sweep in 0..effort.sweeps {
                    let kept = sweep >= effort.discard;
                    for &(_, band) in &order {
                        member.weigh(problem, band, &mut scratch);
                        if kept {
                            sums.record(band, &scratch.entries);
                        }
                        member.take(problem, band, &scratch, rng);
                    }
                    member.assigned(usize::MAX, &mut assigned);
                    let inflations = member.draw_inflation(problem, &assigned, rng);
                    let models = member.draw_model(problem, &assigned, rng);
                    if kept {
                        sums.inflations.iter_mut().zip(&inflations).for_each(|(a, b)| *a += b);
                        sums.models.iter_mut().zip(&models).for_each(|(a, b)| *a += b);
                        sums.sweeps += 1.0;
                    }
                }
                sums.record_parameters(problem, member, &mut scratch);
            }
            sums
        })
        .collect();

    let mut halves = [Sums::new(problem), Sums::new(problem)];
    for (i, part) in sums.iter().enumerate() {
        halves[usize::from(2 * i >= sums.len())].add(part);
    }
    let mut whole = halves[0].clone();
    whole.add(&halves[1]);
    let n = whole.sweeps.max(1.0);
    Population {
        shares: whole.mean_shares(),
        halves: [halves[0].mean_shares(), halves[1].mean_shares()],
        log_z,
        models: whole.models.iter().map(|m| m / n).collect(),
        inflations: whole.inflations.iter().map(|m| m / n).collect(),
        heavy: whole.heavy.iter().map(|h| h / n).collect(),
        parameters: whole.parameters.iter().map(|(a, b)| (a / whole.members, b / whole.members)).collect(),
    }
}
