//! Is the ranking's arithmetic right? Worked examples by another road, exact enumeration of small cases, and what must
//! hold for every sample. All numbers here are invented for the purpose; the expected ones were computed by hand or with
//! an independent numerical prototype.

use approx::assert_relative_eq;
use bandwright::assign::candidate::Candidate;
use bandwright::assign::kernel::{Conditioned, ParameterNumbers, Slopes, log_normal, log_sum, normal_cdf};
use bandwright::assign::offers::noticed;
use bandwright::assign::problem::{Offer, Problem, Shares, Target};
use bandwright::assign::sampler::{Effort, sample};
use bandwright::evidence::advice::{Law, expected_information};
use bandwright::evidence::companion::{exchanged_place, found, level_ratio, list_factor};
use bandwright::level::Level;
use bandwright::mode::{Mode, ModeTable, Motion};
use bandwright::physics::position::{Model, Parameter};
use bandwright::quantity::Wavenumber;
use rand::{Rng, SeedableRng};
use rand_chacha::ChaCha8Rng;

/// The printed digits of the worked examples: six to seven significant ones.
const PRINTED: f64 = 1.0e-6;

/// Modes a 3400(15), b 1640(5), c 620(8), d 1105(4) with their constants.
fn example() -> Model {
    let mut model = Model::harmonic(vec![3400.0, 1640.0, 620.0, 1105.0]);
    model.nu_sigma = vec![15.0, 5.0, 8.0, 4.0];
    let constants = [
        (0, 0, -70.0, 25.0),
        (1, 1, -17.0, 5.0),
        (2, 2, -10.0, 10.0),
        (3, 3, -3.0, 2.0),
        (0, 1, -20.0, 8.0),
        (0, 2, 0.0, 20.0),
        (0, 3, 0.0, 6.0),
        (1, 2, -5.0, 8.0),
        (1, 3, 0.0, 3.0),
        (2, 3, 0.0, 5.0),
    ];
    for (i, j, value, sigma) in constants {
        let x = model.x_mut(i, j);
        (x.value, x.sigma) = (value, sigma);
    }
    model
}

fn level(quanta: [u8; 4]) -> Level {
    Level::from_quanta(&quanta.iter().enumerate().map(|(i, &v)| (i, v)).collect::<Vec<_>>())
}

const AB: [u8; 4] = [1, 1, 0, 0];
const AA: [u8; 4] = [2, 0, 0, 0];
const ABC: [u8; 4] = [1, 1, 1, 0];
const ADD: [u8; 4] = [1, 0, 0, 2];
const ACC: [u8; 4] = [1, 0, 2, 0];

fn slopes(model: &Model, quanta: [u8; 4], numbers: &mut ParameterNumbers) -> Slopes {
    Slopes::new(model, &model.gradient(&level(quanta)), numbers)
}

fn offer(model: &Model, numbers: &mut ParameterNumbers, id: usize, quanta: [u8; 4], y: f64, fit: f64) -> Offer {
    let slopes = slopes(model, quanta, numbers);
    Offer {
        candidate: id,
        shared: slopes.norm_squared(),
        slopes,
        private: 0.0,
        residual: y - model.position(&level(quanta)),
        fit: vec![fit],
    }
}

fn odds(p: f64) -> f64 {
    (p / (1.0 - p)).ln()
}

const P_ABC: f64 = 0.080_757;

fn visibility_of_example() -> (f64, f64) {
    (normal_cdf((-1.9 + 1.2) / 0.5), normal_cdf((-2.3 + 1.2) / 0.5))
}

fn problem(targets: Vec<Target>, parameters: usize) -> Problem {
    Problem {
        targets,
        parameters,
        models: vec![0.0],
        foreign_density: 0.0006,
        foreign_expected: None,
        inflations: vec![(1.0, 1.0)],
        tails: vec![(1.0, 1.0)],
    }
}

fn two_bands() -> Problem {
    let model = example();
    let mut numbers = ParameterNumbers::default();
    let (abc, add) = visibility_of_example();
    let first = offer(&model, &mut numbers, 0, AB, 5030.0, odds(0.9));
    let offers = vec![
        offer(&model, &mut numbers, 1, ABC, 5655.0, odds(abc)),
        offer(&model, &mut numbers, 2, ADD, 5655.0, odds(add)),
    ];
    let target = |offers| Target { variance: 64.0, offers, foreign: 0.0, unlisted: f64::NEG_INFINITY };
    problem(vec![target(vec![first]), target(offers)], numbers.len())
}

#[test]
fn positions_and_covariances_of_the_worked_example_are_met() {
    let model = example();
    for (quanta, position, variance) in
        [(AB, 5020.0, 314.0), (AA, 6660.0, 3400.0), (ABC, 5635.0, 842.0), (ADD, 5604.0, 449.0), (ACC, 4620.0, 2481.0)]
    {
        assert_relative_eq!(model.position(&level(quanta)), position, max_relative = 1e-12);
        assert_relative_eq!(model.variance(&level(quanta)), variance, max_relative = 1e-12);
    }
    let mut numbers = ParameterNumbers::default();
    for (a, b, covariance) in [(AB, ABC, 314.0), (AA, AB, 450.0), (ABC, ACC, 1153.0)] {
        let by_slopes = slopes(&model, a, &mut numbers).dot(&slopes(&model, b, &mut numbers));
        assert_relative_eq!(by_slopes, covariance, max_relative = 1e-12);
        assert_relative_eq!(model.covariance(&level(a), &level(b)), covariance, max_relative = 1e-12);
    }
}

#[test]
fn one_band_on_its_own_has_the_worked_posterior() {
    let (abc, add) = visibility_of_example();
    assert!((abc - P_ABC).abs() < 5e-7 && (add - 0.013_903).abs() < 5e-7);
    assert!((odds(abc) + 2.432_110).abs() < 1e-6 && (odds(add) + 4.261_617).abs() < 1e-6);
    assert!((log_normal(20.0, 842.0 + 64.0) + 4.544_209).abs() < 1e-6);
    assert!((log_normal(51.0, 449.0 + 64.0) + 6.574_164).abs() < 1e-6);
    let mut both = two_bands();
    both.targets.remove(0);
    let (shares, log_z) = &both.independent()[0];
    assert!((shares.offers[0] - 0.601_084).abs() < PRINTED);
    assert!((shares.offers[1] - 0.012_670).abs() < PRINTED);
    assert!((shares.foreign - 0.386_245).abs() < PRINTED);
    assert!((log_z + 6.467_299).abs() < PRINTED);
}

#[test]
fn an_assigned_band_moves_means_and_narrows_variances() {
    let model = example();
    let mut numbers = ParameterNumbers::default();
    let ab = slopes(&model, AB, &mut numbers);
    let known = Conditioned::new(vec![10.0], |_, _| ab.norm_squared() + 64.0);
    for (quanta, mean, variance) in [(ABC, 5643.3069, 581.1640), (ADD, 5609.9524, 315.0714)] {
        let own = slopes(&model, quanta, &mut numbers);
        let mut covariances = vec![own.dot(&ab)];
        // Means and variances are printed to four decimals.
        assert!((model.position(&level(quanta)) + known.shift(&covariances) - mean).abs() < 5.1e-5);
        let left = own.norm_squared() - known.variance_taken(&mut covariances);
        assert!((left - variance).abs() < 5.1e-5, "{left}");
    }
}

#[test]
fn conditioning_in_level_space_equals_the_update_of_the_parameters() {
    let model = example();
    let mut numbers = ParameterNumbers::default();
    let ab = slopes(&model, AB, &mut numbers);
    let known = Conditioned::new(vec![10.0], |_, _| ab.norm_squared() + 64.0);
    let printed = [
        (Parameter::Nu(0), 3_405.952_38, 9.543_14, 15.0, 3400.0),
        (Parameter::Nu(1), 1_640.661_38, 4.831_83, 5.0, 1640.0),
        (Parameter::X(1, 0), -18.306_88, 7.291_37, 8.0, -20.0),
    ];
    // The Kalman update of the parameters, written out: gain = C a / (a′Ca + s²).
    let gradient = model.gradient(&level(AB));
    let innovation: f64 = gradient.iter().map(|&(p, a)| (a * model.sigma(p)).powi(2)).sum::<f64>() + 64.0;
    let mut seen = 0;
    for (parameter, mean, sigma, before_sigma, before) in printed {
        let slope = gradient.iter().find(|(p, _)| *p == parameter).map(|(_, a)| *a).unwrap();
        let gain = before_sigma * before_sigma * slope / innovation;
        assert!((before + gain * 10.0 - mean).abs() < 5.1e-6);
        let number = numbers.number(parameter);
        let unit = Slopes::from_pairs([(number, before_sigma)]);
        let mut covariances = vec![unit.dot(&ab)];
        assert!((before + known.shift(&covariances) - mean).abs() < 5.1e-6);
        let variance = before_sigma.powi(2) - known.variance_taken(&mut covariances);
        assert!((variance.sqrt() - sigma).abs() < 5.1e-6);
        assert!(((before_sigma.powi(2) - gain * gain * innovation).sqrt() - sigma).abs() < 5.1e-6);
        seen += 1;
    }
    assert_eq!(seen, 3);
}

/// All joint assignments with their log weights (choices per band: offer number, or the number of offers for foreign).
fn enumerate(problem: &Problem) -> Vec<(Vec<usize>, f64)> {
    let k = problem.targets.len();
    let mut list = Vec::new();
    let mut choice = vec![0; k];
    loop {
        let offers: Vec<Option<&Offer>> = (0..k).map(|b| problem.targets[b].offers.get(choice[b])).collect();
        let mut levels: Vec<usize> = offers.iter().flatten().map(|o| o.candidate).collect();
        levels.sort_unstable();
        if levels.windows(2).all(|w| w[0] != w[1]) {
            list.push((choice.clone(), log_weight(problem, &offers)));
        }
        let mut b = 0;
        loop {
            if b == k {
                return list;
            }
            choice[b] += 1;
            if choice[b] <= problem.targets[b].offers.len() {
                break;
            }
            choice[b] = 0;
            b += 1;
        }
    }
}

/// log W summed over models, inflations and tails, density of foreign bands included; by determinants, not by the
/// program's own kernel.
fn log_weight(problem: &Problem, offers: &[Option<&Offer>]) -> f64 {
    let assigned: Vec<(usize, &Offer)> = offers.iter().enumerate().filter_map(|(b, o)| Some((b, (*o)?))).collect();
    let n = assigned.len();
    let mut foreign = 0.0;
    let mut count = 0;
    for (b, offer) in offers.iter().enumerate() {
        if offer.is_none() {
            foreign += problem.foreign_density.ln() + problem.targets[b].foreign;
            count += 1;
        }
    }
    if let Some(fk) = problem.foreign_expected {
        // ∫ xⁿ e^(−fK x) Gamma(x; 2, 2) dx
        foreign += libm::lgamma(f64::from(count) + 2.0) - (f64::from(count) + 2.0) * (fk + 2.0).ln() + 4.0_f64.ln();
    }
    let mut logs = Vec::new();
    let combinations = problem.tails.len().pow(n as u32);
    for (m, model) in problem.models.iter().enumerate() {
        let fits: f64 = assigned.iter().map(|(_, o)| o.fit[m]).sum();
        for &(kappa, weight) in &problem.inflations {
            for combination in 0..combinations {
                let mut rest = combination;
                let mut prior = weight.ln();
                let mut noise = Vec::new();
                for &(b, offer) in &assigned {
                    let (tail, share) = problem.tails[rest % problem.tails.len()];
                    rest /= problem.tails.len();
                    prior += share.ln();
                    noise.push(offer.private + tail * tail * problem.targets[b].variance);
                }
                let g = nalgebra::DMatrix::from_fn(n, n, |i, j| {
                    let shared = kappa * kappa * assigned[i].1.slopes.dot(&assigned[j].1.slopes);
                    if i == j { shared + noise[i] } else { shared }
                });
                let r = nalgebra::DVector::from_iterator(n, assigned.iter().map(|(_, o)| o.residual));
                let density = if n == 0 {
                    0.0
                } else {
                    let quadratic = r.dot(&g.clone().lu().solve(&r).unwrap());
                    -0.5 * (quadratic + g.determinant().ln() + n as f64 * std::f64::consts::TAU.ln())
                };
                logs.push(model + fits + prior + density);
            }
        }
    }
    foreign + log_sum(logs.iter().copied())
}

fn exact(problem: &Problem) -> (Vec<Shares>, f64) {
    let all = enumerate(problem);
    let log_z = log_sum(all.iter().map(|(_, w)| *w));
    let mut shares: Vec<Shares> =
        problem.targets.iter().map(|t| Shares { offers: vec![0.0; t.offers.len()], ..Shares::default() }).collect();
    for (choice, weight) in &all {
        for (b, &c) in choice.iter().enumerate() {
            let share = (weight - log_z).exp();
            match shares[b].offers.get_mut(c) {
                Some(place) => *place += share,
                None => shares[b].foreign += share,
            }
        }
    }
    (shares, log_z)
}

#[test]
fn both_bands_free_have_the_worked_joint_posterior() {
    let problem = two_bands();
    let all = enumerate(&problem);
    let weight = |choice: [usize; 2]| all.iter().find(|(c, _)| c == &choice).unwrap().1;
    for (choice, printed) in [
        ([0, 0], -8.513_202),
        ([0, 1], -12.647_511),
        ([0, 2], -9.240_017),
        ([1, 0], -14.394_900),
        ([1, 1], -18.254_363),
        ([1, 2], -14.837_162),
    ] {
        assert!((weight(choice) - printed).abs() < PRINTED, "{choice:?}: {}", weight(choice));
    }
    let (shares, log_z) = exact(&problem);
    assert!((log_z + 8.105_006).abs() < PRINTED);
    assert!((shares[0].offers[0] - 0.996_914).abs() < PRINTED);
    assert!((shares[1].offers[0] - 0.666_704).abs() < PRINTED);
    assert!((shares[1].offers[1] - 0.010_686).abs() < PRINTED);
    // With the first band fixed: worked example 3.
    let fixed: Vec<f64> = (0..3).map(|c| weight([0, c])).collect();
    let total = log_sum(fixed.iter().copied());
    for (w, printed) in fixed.iter().zip([0.666_907, 0.010_680, 0.322_414]) {
        assert!(((w - total).exp() - printed).abs() < PRINTED);
    }
    // The sampler meets them within its error: conditionals vary little here.
    let population = sample(&problem, &Effort::default());
    assert!((population.shares[1].offers[0] - 0.666_704).abs() < 0.004, "{:?}", population.shares);
    assert!((population.log_z - log_z).abs() < 0.02, "{} {log_z}", population.log_z);
}

#[test]
fn a_scale_and_a_zero_add_the_worked_covariance() {
    // Scale 1.5 %, zero 3 cm⁻¹; the scale column is the plain sum.
    let column = |sum: f64| Slopes::from_pairs([(0, 0.015 * sum), (1, 3.0)]);
    let (ab, abc) = (column(3400.0 + 1640.0), column(3400.0 + 1640.0 + 620.0));
    assert!((ab.norm_squared() - 5724.36).abs() < 5.1e-3);
    assert!((ab.dot(&abc) - 6427.44).abs() < 5.1e-3);
}

#[test]
fn inflation_multiplies_every_uncertainty_of_the_table() {
    let model = example();
    let mut numbers = ParameterNumbers::default();
    let rows = [slopes(&model, AB, &mut numbers), slopes(&model, ABC, &mut numbers)];
    for (kappa, printed) in [(1.0, -8.278_316), (2.0, -9.349_444), (4.0, -10.649_317)] {
        let known = Conditioned::new(vec![10.0, 20.0], |i, j| {
            kappa * kappa * rows[i].dot(&rows[j]) + if i == j { 64.0 } else { 0.0 }
        });
        assert!((known.log_evidence() - printed).abs() < PRINTED);
    }
}

/// Five bands, up to eight candidates each that share parameters and, now and then, the very level.
fn small_case(seed: u64, bands: usize, most: usize) -> Problem {
    let mut rng = ChaCha8Rng::seed_from_u64(seed);
    let mut uniform = |low: f64, high: f64| low + (high - low) * rng.random::<f64>();
    let parameters = 10;
    let levels: Vec<Slopes> = (0..24)
        .map(|_| {
            Slopes::from_pairs((0..4).map(|_| (uniform(0.0, parameters as f64 - 0.01) as u32, uniform(4.0, 22.0))))
        })
        .collect();
    let targets = (0..bands)
        .map(|_| {
            let count = uniform(3.0, most as f64 + 0.99) as usize;
            let mut used = Vec::new();
            let mut offers = Vec::new();
            for _ in 0..count {
                let candidate = uniform(0.0, levels.len() as f64 - 0.01) as usize;
                if used.contains(&candidate) {
                    continue;
                }
                used.push(candidate);
                let slopes = levels[candidate].clone();
                let residual = uniform(-45.0, 45.0);
                let fit = vec![uniform(-5.0, 0.5), uniform(-5.0, 0.5)];
                offers.push(Offer { candidate, shared: slopes.norm_squared(), slopes, private: 4.0, residual, fit });
            }
            Target { variance: 64.0, offers, foreign: 0.0, unlisted: f64::NEG_INFINITY }
        })
        .collect();
    Problem { models: vec![0.4_f64.ln(), 0.6_f64.ln()], ..problem(targets, parameters) }
}

fn total_variation(a: &Shares, b: &Shares) -> f64 {
    let offers: f64 = a.offers.iter().zip(&b.offers).map(|(x, y)| (x - y).abs()).sum();
    0.5 * (offers + (a.foreign - b.foreign).abs())
}

#[test]
fn the_population_meets_exact_enumeration() {
    let mut distances = Vec::new();
    for seed in 0..8 {
        let problem = small_case(seed, 5, 8);
        let (truth, log_z) = exact(&problem);
        let population = sample(&problem, &Effort { seed: seed + 100, ..Effort::default() });
        distances.extend(truth.iter().zip(&population.shares).map(|(a, b)| total_variation(a, b)));
        assert!((population.log_z - log_z).abs() < 0.1, "seed {seed}: {} against {log_z}", population.log_z);
    }
    let mean = distances.iter().sum::<f64>() / distances.len() as f64;
    let worst = distances.iter().copied().fold(0.0, f64::max);
    eprintln!("total variation: mean {mean:.4}, worst {worst:.4}");
    assert!(mean <= 0.015 && worst <= 0.06, "mean {mean}, worst {worst}");
}

#[test]
fn inflation_heavy_tails_and_a_learnt_foreign_density_meet_exact_enumeration() {
    let mut distances = Vec::new();
    for seed in 0..6 {
        let mut problem = small_case(seed + 50, 3, 5);
        problem.inflations = vec![(1.0, 0.6), (2.0, 0.4)];
        problem.tails = vec![(1.0, 0.85), (3.0, 0.15)];
        problem.foreign_expected = Some(0.4);
        let (truth, log_z) = exact(&problem);
        let population = sample(&problem, &Effort { seed, ..Effort::default() });
        distances.extend(truth.iter().zip(&population.shares).map(|(a, b)| total_variation(a, b)));
        assert!((population.log_z - log_z).abs() < 0.1, "seed {seed}: {} against {log_z}", population.log_z);
    }
    let mean = distances.iter().sum::<f64>() / distances.len() as f64;
    let worst = distances.iter().copied().fold(0.0, f64::max);
    eprintln!("total variation: mean {mean:.4}, worst {worst:.4}");
    assert!(mean <= 0.015 && worst <= 0.06, "mean {mean}, worst {worst}");
}

#[test]
fn the_number_of_threads_changes_nothing() {
    let problem = small_case(3, 5, 8);
    let run = |threads| {
        let pool = rayon::ThreadPoolBuilder::new().num_threads(threads).build().unwrap();
        pool.install(|| sample(&problem, &Effort { particles: 64, ..Effort::default() }))
    };
    assert_eq!(run(1), run(2));
    assert_eq!(run(1), run(5));
}

#[test]
fn probabilities_of_a_band_sum_to_one() {
    for seed in 0..4 {
        let problem = small_case(seed, 5, 8);
        for shares in sample(&problem, &Effort { particles: 32, ..Effort::default() }).shares {
            let sum = shares.offers.iter().sum::<f64>() + shares.foreign + shares.unlisted;
            assert!((sum - 1.0).abs() < 1e-9, "{sum}");
        }
    }
}

#[test]
fn a_listed_strength_has_the_worked_density() {
    // Strength −0.9 with 0.15, τ 0.5, limit −1.2.
    let variance = 0.25 + 0.15 * 0.15;
    assert!((log_normal(-0.9 + 1.9, variance) + 2.103_743).abs() < PRINTED);
    assert!((log_normal(-0.9 + 2.3, variance) + 3.865_210).abs() < PRINTED);
    let other = std::f64::consts::LN_2 - 2.0 * (-0.9 + 1.2);
    assert!((other - 0.093_147).abs() < PRINTED);
}

#[test]
fn companions_have_the_worked_factors() {
    let present = found(Some(0.3), 3, 0.15);
    assert!((present - 0.776_744).abs() < PRINTED);
    // Nothing is seen in the hydrate of another anion: applied to the posterior with the first band assigned.
    let weights = [0.666_907 * (1.0 - present), 0.010_680 * (1.0 - 0.15), 0.322_414 * 0.5];
    let total: f64 = weights.iter().sum();
    for (w, printed) in weights.iter().zip([0.466_486, 0.028_441, 0.505_073]) {
        // The posterior that enters is printed to six decimals.
        assert!((w / total - printed).abs() < 2e-6);
    }
    // A list of the deuterated companion, {4111, 4700} with one band in 90 cm⁻¹.
    let (model, table) = (example(), table_of_example());
    for (quanta, ratio, place, factor) in [
        (ABC, (0.735_654, 0.005_560), (4160.122, 33.655), 0.557_400),
        (ADD, (0.839_818, 0.005_098), (4749.172, 31.228), 0.532_973),
    ] {
        let found = level_ratio(&table, &model.nu, &Candidate::plain(&model, level(quanta)), "H=D");
        assert!((found.0 - ratio.0).abs() < PRINTED && (found.1 - ratio.1).abs() < PRINTED, "{found:?}");
        let there = exchanged_place(5655.0, found);
        // Places are printed to three decimals.
        assert!((there.0 - place.0).abs() < 5.1e-4 && (there.1 - place.1).abs() < 5.1e-4, "{there:?}");
        assert!((list_factor(0.7, 1.0 / 90.0, &[4111.0, 4700.0], there) - factor).abs() < PRINTED);
    }
}

fn table_of_example() -> ModeTable {
    let mut table = ModeTable::default();
    let motions = [Motion::OhStretch, Motion::HohBend, Motion::Libration, Motion::XoStretch];
    for ((id, motion), nu) in ["a", "b", "c", "d"].into_iter().zip(motions).zip(example().nu) {
        let moiety = table.intern_moiety(if id == "d" { "ClO4" } else { "H2O" });
        table.modes.push(Mode {
            id: id.to_owned(),
            moiety,
            motion,
            wavenumber: Wavenumber::from_inverse_cm(nu).unwrap(),
            sigma: 5.0,
            sigma_given: true,
            degeneracy: 1,
            species: None,
            ir: None,
            raman: None,
            fwhm: None,
            source: "invented".to_owned(),
        });
    }
    table.settle_moieties();
    table
}

#[test]
fn a_level_that_was_not_listed_has_the_worked_factor() {
    // p = 0.8, hidden with probability 0.1: 1 − q.
    assert!((1.0 - noticed(0.8, 0.1) - 0.28).abs() < 1e-12);
    // However sure a level is, one missing band counts no more than 50 to 1.
    assert!((1.0 - noticed(1.0, 0.0) - 0.02).abs() < 1e-12);
}

#[test]
fn expected_information_has_the_worked_bits() {
    let weights = [0.6, 0.3, 0.1];
    let presence = |found: f64| Law { found, mean: 0.0, sd: 0.0 };
    let bits = expected_information(&weights, &[presence(0.15), presence(0.8), presence(0.5)]);
    assert!((bits - 0.275_559).abs() < PRINTED, "{bits}");
    let prior: f64 = weights.iter().map(|w: &f64| -w * w.log2()).sum();
    assert!((prior - 1.295_462).abs() < PRINTED);
    let law = |found, mean, sd| Law { found, mean, sd };
    let bits = expected_information(&weights, &[law(0.7, -1493.0, 40.0), law(0.7, -1150.0, 25.0), law(0.5, 0.0, 12.0)]);
    // 400 points over ± 5 standard deviations leave out 6e-7 of each peak.
    assert!((bits - 0.847_438).abs() < 3e-6, "{bits}");
}
