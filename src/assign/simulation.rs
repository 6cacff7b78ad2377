//! Simulated hydrates with a known truth: the ground on which probabilities are calibrated.
//!
//! Everything here is invented, within the ranges hydrates show. A table is drawn, the truth is drawn around the table
//! with the table's own uncertainties (or others, to see what a wrong model does), strengths are drawn level by level,
//! what is strong enough is seen, what is close together is one band, some bands are lost and some are foreign.

use rand::{Rng, SeedableRng};
use rand_chacha::ChaCha8Rng;

use super::candidate::Candidate;
use super::prior::{StrengthModel, StrengthPrior};
use crate::band::{Band, BandList, Feature};
use crate::enumerate::walk::{Filter, levels_in};
use crate::mode::{Mode, ModeIndex, ModeTable, Motion, Strength};
use crate::physics::position::{Gradient, Model, Parameter};
use crate::quantity::Wavenumber;

/// How the truth departs from what the ranking assumes.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Truth {
    /// Not at all.
    AsAssumed,
    /// All uncertainties are twice as large as stated.
    DoubleSigmas,
    /// Errors follow Student's t with three degrees of freedom, scaled by 1.5, and constants are off by one sigma.
    HeavyTails,
    /// Constants are half the stated ones and spread 1.5 times as much.
    OtherConstants,
    /// Four bands in ten are foreign.
    ManyForeign,
    /// Strengths: 0.8 decades a quantum, 0.2 a moiety, scatter 0.8 instead of 1.1, 0.5, 0.5.
    OtherStrengths,
}

impl Truth {
    /// All of them.
    pub const ALL: [Self; 6] = [
        Self::AsAssumed,
        Self::DoubleSigmas,
        Self::HeavyTails,
        Self::OtherConstants,
        Self::ManyForeign,
        Self::OtherStrengths,
    ];

    /// In words.
    pub fn name(self) -> &'static str {
        match self {
            Self::AsAssumed => "as assumed",
            Self::DoubleSigmas => "sigmas twice as large",
            Self::HeavyTails => "heavy tails x1.5, constants shifted",
            Self::OtherConstants => "other constants",
            Self::ManyForeign => "40 % foreign bands",
            Self::OtherStrengths => "other strengths",
        }
    }
}

/// What to simulate.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Design {
    /// Modes of the table: waters of six modes, oxyanions of up to nine, metal–oxygen modes for the rest.
    pub modes: usize,
    /// Most quanta of a level.
    pub quanta: u8,
    /// Resolved bands to aim at.
    pub bands: usize,
    /// Measured range, cm⁻¹.
    pub range: (f64, f64),
    /// How the truth departs.
    pub truth: Truth,
    /// Whether strengths are listed.
    pub strengths: bool,
}

impl Design {
    /// The design of the calibration: 4 quanta, 20 bands, 4000–8000 cm⁻¹.
    pub fn hydrate(modes: usize, truth: Truth) -> Self {
        Self { modes, quanta: 4, bands: 20, range: (4_000.0, 8_000.0), truth, strengths: true }
    }
}

/// A simulated sample.
#[derive(Clone, Debug)]
pub struct Sample {
    /// Its table.
    pub table: ModeTable,
    /// Its model.
    pub model: Model,
    /// All levels in and near the range.
    pub candidates: Vec<Candidate>,
    /// What was observed.
    pub bands: BandList,
    /// The true level of each band by its number among the candidates; `None` for a foreign band.
    pub truth: Vec<Option<usize>>,
    /// True strength of every candidate above the detection limit, decades.
    pub above_limit: Vec<f64>,
    /// True position of every candidate, cm⁻¹.
    pub positions: Vec<f64>,
}

/// A normal deviate (polar form of Box & Muller).
pub fn normal(rng: &mut ChaCha8Rng) -> f64 {
    loop {
        let (a, b) = (2.0 * rng.random::<f64>() - 1.0, 2.0 * rng.random::<f64>() - 1.0);
        let s = a * a + b * b;
        if s > 0.0 && s < 1.0 {
            return a * (-2.0 * s.ln() / s).sqrt();
        }
    }
}

fn student3(rng: &mut ChaCha8Rng) -> f64 {
    let chi: f64 = (0..3).map(|_| normal(rng).powi(2)).sum();
    normal(rng) / (chi / 3.0).sqrt()
}

/// Range of fundamentals and standard uncertainty of a simulated motion, cm⁻¹ (invented).
fn simulated_range(motion: Motion) -> (f64, f64, f64) {
    match motion {
        Motion::OhStretch => (3_200.0, 3_580.0, 12.0),
        Motion::HohBend => (1_610.0, 1_670.0, 4.0),
        Motion::Libration => (420.0, 850.0, 12.0),
        Motion::MetalOxygen => (250.0, 460.0, 8.0),
        Motion::XoStretch => (930.0, 1_180.0, 4.0),
        _ => (420.0, 660.0, 4.0),
    }
}

fn push(table: &mut ModeTable, moiety: &str, motion: Motion, value: f64) {
    let moiety = table.intern_moiety(moiety);
    let id = format!("m{}", table.modes.len() + 1);
    let wavenumber = Wavenumber::from_inverse_cm(value.max(0.0)).unwrap_or_else(|_| unreachable!("a finite draw"));
    table.modes.push(Mode {
        id,
        moiety,
        motion,
        wavenumber,
        sigma: simulated_range(motion).2,
        sigma_given: true,
        degeneracy: 1,
        species: None,
        ir: None,
        raman: None,
        fwhm: None,
        source: "invented".to_owned(),
    });
}

/// A table of `modes` modes: a water for every ten modes or so, one or two oxyanions, metal–oxygen modes.
pub fn draw_table(modes: usize, rng: &mut ChaCha8Rng) -> ModeTable {
    let mut table = ModeTable { name: "simulated".to_owned(), ..ModeTable::default() };
    let waters = (modes / 10).max(1);
    let draw = |motion: Motion, rng: &mut ChaCha8Rng| {
        let (low, high, _) = simulated_range(motion);
        low + (high - low) * rng.random::<f64>()
    };
    for water in 1..=waters {
        let name = format!("H2O-{water}");
        let first = draw(Motion::OhStretch, rng);
        push(&mut table, &name, Motion::OhStretch, first);
        push(&mut table, &name, Motion::OhStretch, first + 20.0 + 90.0 * rng.random::<f64>());
        for motion in [Motion::HohBend, Motion::Libration, Motion::Libration, Motion::Libration] {
            let value = draw(motion, rng);
            push(&mut table, &name, motion, value);
        }
    }
    let left = modes.saturating_sub(table.modes.len());
    let anions: &[&str] = if left >= 20 { &["SO4", "ClO4"] } else { &["SO4"] };
    for anion in anions {
        let stretch = 930.0 + 60.0 * rng.random::<f64>();
        let third = stretch + 100.0 + 60.0 * rng.random::<f64>();
        let mut list = vec![(Motion::XoStretch, stretch)];
        list.extend((0..3).map(|_| (Motion::XoStretch, third + 40.0 * rng.random::<f64>() - 20.0)));
        let (second, fourth) = (430.0 + 40.0 * rng.random::<f64>(), 600.0 + 40.0 * rng.random::<f64>());
        list.extend((0..2).map(|_| (Motion::OxoBend, second + 20.0 * rng.random::<f64>())));
        list.extend((0..3).map(|_| (Motion::OxoBend, fourth + 20.0 * rng.random::<f64>())));
        for (motion, value) in list {
            if table.modes.len() < modes {
                push(&mut table, anion, motion, value);
            }
        }
    }
    while table.modes.len() < modes {
        let value = draw(Motion::MetalOxygen, rng);
        push(&mut table, "MgO6", Motion::MetalOxygen, value);
    }
    table.settle_moieties();
    table
}

/// Constant and uncertainty between two simulated modes, cm⁻¹ (invented, of the size of the defaults).
fn constant(table: &ModeTable, i: ModeIndex, j: ModeIndex) -> (f64, f64) {
    use Motion::{HohBend, Libration, MetalOxygen, OhStretch, OxoBend, XoStretch};
    let mut pair = [table.modes[i].motion, table.modes[j].motion];
    pair.sort();
    let same = table.modes[i].moiety == table.modes[j].moiety;
    match (pair, same) {
        ([OhStretch, OhStretch], true) if i == j => (-70.0, 15.0),
        ([OhStretch, OhStretch], true) => (-25.0, 20.0),
        ([OhStretch, HohBend], true) => (-18.0, 8.0),
        ([OhStretch, Libration], true) => (5.0, 15.0),
        ([HohBend, HohBend], true) => (-17.0, 4.0),
        ([HohBend, Libration], true) => (5.0, 12.0),
        ([Libration, Libration], true) => (-6.0, 10.0),
        ([MetalOxygen, MetalOxygen], true) => (-1.5, 2.0),
        ([XoStretch, XoStretch], true) => (-4.0, 3.0),
        ([XoStretch | OxoBend, OxoBend], true) => (-1.0, 2.0),
        ([OhStretch, _], false) => (0.0, 4.0),
        _ => (0.0, 2.0),
    }
}

/// The model of a simulated table.
pub fn model_of(table: &ModeTable) -> Model {
    let mut model = Model::harmonic(table.modes.iter().map(|m| m.wavenumber.inverse_cm()).collect());
    model.nu_sigma = table.modes.iter().map(|m| m.sigma).collect();
    for i in 0..table.modes.len() {
        for j in 0..=i {
            let (value, sigma) = constant(table, i, j);
            let x = model.x_mut(i, j);
            (x.value, x.sigma) = (value, sigma);
        }
    }
    model
}

fn true_model(model: &Model, truth: Truth, rng: &mut ChaCha8Rng) -> Model {
    let mut real = model.clone();
    let error = |rng: &mut ChaCha8Rng| match truth {
        Truth::DoubleSigmas => 2.0 * normal(rng),
        Truth::HeavyTails => 1.5 * student3(rng),
        _ => normal(rng),
    };
    for (nu, sigma) in real.nu.iter_mut().zip(&model.nu_sigma) {
        *nu += sigma * error(rng);
    }
    for x in &mut real.x {
        x.value = match truth {
            Truth::HeavyTails => x.value + x.sigma * (1.0 + error(rng)),
            Truth::OtherConstants => 0.5 * x.value + 1.5 * x.sigma * normal(rng),
            _ => x.value + x.sigma * error(rng),
        };
    }
    real
}

fn position_in(real: &Model, gradient: &Gradient) -> f64 {
    gradient.iter().map(|&(p, a): &(Parameter, f64)| a * real.value(p)).sum()
}

/// Simulates one sample.
pub fn simulate(design: &Design, seed: u64) -> Sample {
    let mut rng = ChaCha8Rng::seed_from_u64(seed);
    let rng = &mut rng;
    let table = draw_table(design.modes, rng);
    let model = model_of(&table);
    let real = true_model(&model, design.truth, rng);
    let window = (design.range.0 - 500.0, design.range.1 + 500.0);
    let found = levels_in(&model, window, design.quanta, &Filter::default(), usize::MAX).unwrap_or_default();
    let candidates: Vec<Candidate> = found.into_iter().map(|f| Candidate::plain(&model, f.level)).collect();
    let positions: Vec<f64> = candidates.iter().map(|c| position_in(&real, &c.gradient(&model))).collect();
    let prior = StrengthPrior::default();
    let strength = match design.truth {
        Truth::OtherStrengths => StrengthModel { order: 0.8, moiety: 0.2, tau: 0.8, weight: 1.0 },
        _ => StrengthModel::PLAIN,
    };
    let strengths: Vec<f64> =
        candidates.iter().map(|c| prior.steps(&table, c).strength(&strength) + strength.tau * normal(rng)).collect();
    // Strongest first; a level closer than the resolution to a stronger seen one is part of its band.
    let mut order: Vec<usize> =
        (0..candidates.len()).filter(|&i| positions[i] >= design.range.0 && positions[i] < design.range.1).collect();
    order.sort_by(|&a, &b| strengths[b].total_cmp(&strengths[a]));
    let foreign_share = if design.truth == Truth::ManyForeign { 0.4 } else { 0.12 };
    let wanted = (design.bands as f64 * (1.0 - foreign_share) / 0.9).round() as usize;
    let mut resolved: Vec<usize> = Vec::new();
    let mut limit = f64::INFINITY;
    for &i in &order {
        if resolved.iter().any(|&r| (positions[r] - positions[i]).abs() < 25.0) {
            continue;
        }
        if resolved.len() == wanted {
            // The limit lies between the last band seen and the first not seen.
            limit = 0.5 * (strengths[resolved[wanted - 1]] + strengths[i]);
            break;
        }
        resolved.push(i);
    }
    if limit.is_infinite() {
        limit = resolved.last().map_or(0.0, |&i| strengths[i] - 0.05);
    }
    let mut seen: Vec<(f64, f64, Option<usize>)> = Vec::new();
    for i in resolved {
        if rng.random::<f64>() > 0.1 {
            let listed = strengths[i] - limit + 0.15 * normal(rng);
            seen.push((positions[i] + 8.0 * normal(rng), listed.max(0.0), Some(i)));
        }
    }
    let expected_foreign = foreign_share * design.bands as f64;
    for _ in 0..poisson(expected_foreign, rng) {
        let y = design.range.0 + (design.range.1 - design.range.0) * rng.random::<f64>();
        seen.push((y, -0.5 * rng.random::<f64>().max(1.0e-12).ln(), None));
    }
    seen.sort_by(|a, b| a.0.total_cmp(&b.0));
    let bands = seen.iter().enumerate().map(|(n, &(y, listed, _))| Band {
        id: format!("b{}", n + 1),
        position: Wavenumber::from_inverse_cm(y.max(0.0)).unwrap_or_else(|_| unreachable!("a finite draw")),
        sigma: 8.0,
        sigma_given: true,
        fwhm: None,
        strength: design.strengths.then(|| Strength::Relative(10.0_f64.powf(listed))),
        feature: Feature::Band,
        note: String::new(),
    });
    let bands = BandList {
        name: "simulated".to_owned(),
        range: Some(design.range),
        detection_limit: design.strengths.then_some(1.0),
        bands: bands.collect(),
        ..BandList::default()
    };
    let above_limit = strengths.iter().map(|s| s - limit).collect();
    Sample { table, model, candidates, bands, truth: seen.into_iter().map(|s| s.2).collect(), above_limit, positions }
}

fn poisson(mean: f64, rng: &mut ChaCha8Rng) -> usize {
    let floor = (-mean).exp();
    let (mut n, mut product) = (0, rng.random::<f64>());
    while product > floor {
        n += 1;
        product *= rng.random::<f64>();
    }
    n
}
