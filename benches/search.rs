//! The search against listing every level, as ratios in one run: `cargo bench --bench search`.
//!
//! The baseline is what a careful person writes first: recursion over the modes, position and variance of every level,
//! a Gaussian per band, the best fifty kept. Where it would take more than half a minute it is timed on a part of the
//! levels and extrapolated by their number, and the row says so. The tables are invented.

use std::hint::black_box;
use std::io::Write;
use std::time::Instant;

use bandwright::enumerate::count::levels_with_quanta;
use bandwright::enumerate::search::{PriorTerms, Question, Target, search};
use bandwright::enumerate::walk::Filter;
use bandwright::level::Excitation;
use bandwright::mode::Origin;
use bandwright::physics::position::{Model, Sourced};
use rand::{Rng, SeedableRng};
use rand_chacha::ChaCha8Rng;

/// An invented table: a third stretches, a sixth bends, the rest below 1200 cm⁻¹.
fn model(modes: usize) -> Model {
    let mut random = ChaCha8Rng::seed_from_u64(modes as u64);
    let place = |i: usize, random: &mut ChaCha8Rng| match i % 6 {
        0 | 1 => random.random_range(3300.0..3600.0),
        2 => random.random_range(1600.0..1680.0),
        _ => random.random_range(150.0..1200.0),
    };
    let nu = (0..modes).map(|i| place(i, &mut random)).collect();
    let mut model = Model::harmonic(nu);
    for i in 0..modes {
        model.nu_sigma[i] = random.random_range(3.0..15.0);
        for j in 0..=i {
            let value = if i == j && i % 6 < 2 { -90.0 } else { random.random_range(-8.0..4.0) };
            let sigma = random.random_range(1.0..8.0);
            *model.x_mut(i, j) = Sourced { value, sigma, origin: Origin::Given, source: String::new() };
        }
    }
    model.floor = 2.0;
    model
}

/// What the baseline keeps.
struct Listing<'m> {
    model: &'m Model,
    bands: &'m [Target],
    prior: &'m PriorTerms,
    evidence: Vec<f64>,
    best: Vec<Vec<f64>>,
    levels: u64,
    until: Option<Instant>,
}

impl Listing<'_> {
    fn visit(&mut self, now: &[Excitation]) {
        self.levels += 1;
        let (mut position, mut variance, mut log) = (0.0, 0.0, 0.0);
        for (k, e) in now.iter().enumerate() {
            let (i, v) = (usize::from(e.mode), f64::from(e.quanta));
            let own = self.model.x(i, i);
            position += v * self.model.nu[i] + v * (v - 1.0) * own.value;
            variance += (v * self.model.nu_sigma[i]).powi(2) + (v * (v - 1.0) * own.sigma).powi(2);
            log += v * self.prior.motion[i];
            for other in &now[..k] {
                let x = self.model.x(i, usize::from(other.mode));
                let n = v * f64::from(other.quanta);
                position += n * x.value;
                variance += (n * x.sigma).powi(2);
            }
        }
        let order: f64 = now.iter().map(|e| f64::from(e.quanta)).sum();
        variance += (self.model.floor * (order - 1.0)).powi(2);
        for (b, band) in self.bands.iter().enumerate() {
            let total = variance + band.sigma * band.sigma;
            let offset = band.position - position;
            let score = log - 0.5 * (offset * offset / total + (std::f64::consts::TAU * total).ln());
            self.evidence[b] += score.exp();
            let best = &mut self.best[b];
            if best.len() < 50 || score > best[best.len() - 1] {
                let at = best.partition_point(|s| *s >= score);
                best.insert(at, score);
                best.truncate(50);
            }
        }
    }

    /// Whether to go on.
    fn descend(&mut self, from: usize, left: u8, now: &mut Vec<Excitation>) -> bool {
        if self.levels.is_multiple_of(4096) && self.until.is_some_and(|until| Instant::now() > until) {
            return false;
        }
        for mode in from..self.model.modes() {
            for v in 1..=left {
                now.push(Excitation::new(mode, v));
                self.visit(now);
                let go_on = v == left || self.descend(mode + 1, left - v, now);
                now.pop();
                if !go_on {
                    return false;
                }
            }
        }
        true
    }
}

fn main() {
    let mut out = std::io::stdout().lock();
    let cores = std::thread::available_parallelism().map_or(1, usize::from);
    // One thread for both sides: the ratio is of the work, not of the cores.
    let pool = rayon::ThreadPoolBuilder::new().num_threads(1).build().expect("a pool of one thread");
    let _ = writeln!(out, "one thread of a machine with {cores}; 20 bands, best 50; seconds");
    let _ = writeln!(out, "modes quanta       levels    listing     search      ratio   best only      ratio");
    let quick = std::env::args().any(|a| a == "--test");
    let cases: &[(usize, u8)] =
        if quick { &[(30, 3)] } else { &[(30, 5), (69, 4), (69, 5), (174, 4), (174, 5), (348, 4)] };
    for &(modes, quanta) in cases {
        let model = model(modes);
        let bands: Vec<Target> =
            (0..20).map(|b| Target { position: 4000.0 + 200.0 * f64::from(b), sigma: 8.0 }).collect();
        let prior = PriorTerms { motion: vec![-2.5; modes], ..PriorTerms::flat(modes) };
        let question = Question { quanta, best: 50, tolerance: 30.0, best_only: false, filter: Filter::default() };
        let total: u64 = (1..=u64::from(quanta)).filter_map(|q| levels_with_quanta(modes as u64, q)).sum();

        let start = Instant::now();
        let mut listing = Listing {
            model: &model,
            bands: &bands,
            prior: &prior,
            evidence: vec![0.0; bands.len()],
            best: vec![Vec::new(); bands.len()],
            levels: 0,
            until: (total > 20_000_000).then(|| start + std::time::Duration::from_secs(10)),
        };
        let whole = listing.descend(0, quanta, &mut Vec::new());
        black_box(&listing.evidence);
        let naive = start.elapsed().as_secs_f64() * total as f64 / listing.levels as f64;

        let timed = |question: &Question| {
            let runs = (0..3).map(|_| {
                let start = Instant::now();
                black_box(pool.install(|| search(&model, &bands, &prior, question)));
                start.elapsed().as_secs_f64()
            });
            runs.fold(f64::INFINITY, f64::min)
        };
        let all = timed(&question);
        let best = timed(&Question { best_only: true, ..question.clone() });
        let mark = if whole { ' ' } else { '~' };
        let _ = writeln!(
            out,
            "{modes:>5} {quanta:>6} {total:>12} {mark}{naive:>9.3} {all:>10.4} {:>9.0}x {best:>11.5} {:>9.0}x",
            naive / all,
            naive / best
        );
        // The two sides agree on the evidence where the listing is whole.
        if whole {
            let found = pool.install(|| search(&model, &bands, &prior, &question));
            for (b, answer) in found.iter().enumerate() {
                let (ours, theirs) = (answer.evidence.iter().sum::<f64>(), listing.evidence[b]);
                assert!((ours - theirs).abs() <= 1.0e-5 * theirs + 1.0e-7, "band {b}: {ours} against {theirs}");
            }
        }
    }
    let _ = writeln!(out, "~ extrapolated from ten seconds of listing");
}
