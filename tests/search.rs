//! Does the fast search answer what listing every level answers?

use bandwright::enumerate::search::{Answer, PriorTerms, Question, Scored, Target, score, search};
use bandwright::enumerate::walk::Filter;
use bandwright::level::{Excitation, Level};
use bandwright::mode::Origin;
use bandwright::physics::position::{Model, Sourced};
use rand::{Rng, SeedableRng};
use rand_chacha::ChaCha8Rng;

/// Every level with quanta in wanted modes, from the definition.
fn every_level(
    model: &Model,
    wanted: &[bool],
    from: usize,
    left: u8,
    now: &mut Vec<Excitation>,
    list: &mut Vec<Level>,
) {
    for mode in (from..model.modes()).filter(|m| wanted[*m]) {
        for rung in model.ladder(mode, left) {
            now.push(rung.excitation);
            list.push(Level::new(now.iter().copied()));
            every_level(model, wanted, mode + 1, left - rung.excitation.quanta, now, list);
            now.pop();
        }
    }
}

fn by_listing(model: &Model, bands: &[Target], prior: &PriorTerms, q: &Question, wanted: &[bool]) -> Vec<Answer> {
    let mut levels = Vec::new();
    every_level(model, wanted, 0, q.quanta, &mut Vec::new(), &mut levels);
    bands
        .iter()
        .map(|band| {
            let orders = usize::from(q.quanta);
            let mut answer = Answer { evidence: vec![0.0; orders], matches: vec![0; orders], best: Vec::new() };
            for level in &levels {
                let n = level.order() as usize - 1;
                let distance = (model.position(level) - band.position).abs();
                answer.matches[n] += u64::from(distance <= q.tolerance);
                if let Some(scored) = score(model, prior, level, *band) {
                    answer.evidence[n] += scored.score.exp();
                    answer.best.push(scored);
                }
            }
            answer.best.sort_by(|a: &Scored, b| b.score.total_cmp(&a.score).then_with(|| a.level.cmp(&b.level)));
            answer.best.truncate(q.best);
            answer
        })
        .collect()
}

fn sourced(value: f64, sigma: f64) -> Sourced {
    Sourced { value, sigma, origin: Origin::Given, source: String::new() }
}

/// A random table: strong couplings of either sign in every third trial, degenerate modes with and without g.
fn random_model(random: &mut ChaCha8Rng, trial: usize) -> Model {
    let n = random.random_range(1..14);
    let mut model = Model::harmonic((0..n).map(|_| random.random_range(60.0..3700.0)).collect());
    let strength: f64 = [5.0, 60.0, 300.0][trial % 3];
    for x in &mut model.x {
        *x = sourced(random.random_range(-strength..strength), random.random_range(0.0..8.0));
    }
    model.floor = random.random_range(0.0..4.0);
    for i in 0..n {
        model.nu_sigma[i] = random.random_range(1.0..12.0);
        model.degeneracy[i] = random.random_range(1..4);
        model.l_spread[i] = if model.degeneracy[i] > 1 { random.random_range(0.0..4.0) } else { 0.0 };
        if model.degeneracy[i] > 1 && random.random_bool(0.5) {
            model.g[i] = Some(sourced(random.random_range(-5.0..5.0), 1.0));
        }
    }
    // Rarely, coupled angular momenta.
    if trial.is_multiple_of(11) && n > 2 && model.degeneracy[0] > 1 && model.degeneracy[1] > 1 {
        model.g_pairs.push((0, 1, sourced(2.0, 0.5)));
    }
    model
}

fn random_prior(random: &mut ChaCha8Rng, modes: usize) -> PriorTerms {
    let kinds = random.random_range(1..5);
    let mut contact = vec![0.0; kinds * kinds];
    for a in 0..kinds {
        for b in 0..a {
            contact[a * kinds + b] = random.random_range(-2.0..0.5);
            contact[b * kinds + a] = contact[a * kinds + b];
        }
    }
    PriorTerms {
        order: (0..6).map(|n| -1.5 * f64::from(n)).collect(),
        moieties: (0..4).map(|k| -0.8 * f64::from(k)).collect(),
        motion: (0..modes).map(|_| random.random_range(-1.5..0.5)).collect(),
        moiety: (0..modes).map(|_| random.random_range(0..kinds)).collect(),
        contact: if random.random_bool(0.7) { contact } else { Vec::new() },
    }
}

fn levels(answer: &Answer) -> Vec<&Level> {
    answer.best.iter().map(|s| &s.level).collect()
}

#[test]
fn the_search_equals_listing_every_level_on_three_hundred_random_tables() {
    let mut random = ChaCha8Rng::seed_from_u64(11);
    let (mut seen, mut matched) = (0, 0);
    for trial in 0..300 {
        let model = random_model(&mut random, trial);
        let n = model.modes();
        let prior = random_prior(&mut random, n);
        let wanted: Vec<bool> = (0..n).map(|_| trial % 4 != 0 || random.random_bool(0.7)).collect();
        let bands: Vec<Target> = (0..random.random_range(1..9))
            .map(|_| Target { position: random.random_range(0.0..12_000.0), sigma: random.random_range(0.5..15.0) })
            .collect();
        let question = Question {
            quanta: random.random_range(1..if n > 9 { 5 } else { 6 }),
            best: random.random_range(0..12),
            tolerance: random.random_range(1.0..40.0),
            best_only: false,
            filter: Filter::modes(n, |m| wanted[m]),
        };
        let expected = by_listing(&model, &bands, &prior, &question, &wanted);
        let found = search(&model, &bands, &prior, &question);
        let best_only = search(&model, &bands, &prior, &Question { best_only: true, ..question.clone() });
        for (at, (e, f)) in expected.iter().zip(&found).enumerate() {
            let context = format!("trial {trial}, band {at}");
            assert_eq!(f.matches, e.matches, "{context}");
            assert_eq!(f.best, e.best, "{context}");
            assert_eq!(levels(&best_only[at]), levels(e), "{context}, best only");
            for (ours, theirs) in f.evidence.iter().zip(&e.evidence) {
                // f32 Gaussians: 1e-6 of the sum. Levels at the very edge of the reach may fall on either side of it;
                // they weigh exp(-18) of a peak of at most 1 per cm⁻¹.
                let off = (ours - theirs).abs();
                assert!(off <= 1.0e-6 * theirs + 2.0e-8, "{context}: {ours} instead of {theirs}");
            }
            seen += e.best.len();
            matched += e.matches.iter().sum::<u64>();
        }
    }
    assert!(seen > 1_500 && matched > 1_000, "the tables were too empty to test anything: {seen}, {matched}");
}

#[test]
fn the_answer_is_the_same_bytes_for_any_number_of_threads() {
    let mut random = ChaCha8Rng::seed_from_u64(3);
    let mut model = Model::harmonic((0..30).map(|_| random.random_range(100.0..3600.0)).collect());
    for x in &mut model.x {
        *x = sourced(random.random_range(-20.0..5.0), 3.0);
    }
    model.nu_sigma.fill(5.0);
    let prior = random_prior(&mut random, 30);
    let bands: Vec<Target> = (0..12).map(|k| Target { position: 4_000.0 + 300.0 * f64::from(k), sigma: 8.0 }).collect();
    let question = Question { quanta: 4, best: 20, tolerance: 10.0, best_only: false, filter: Filter::default() };
    let with = |threads| {
        let pool = rayon::ThreadPoolBuilder::new().num_threads(threads).build().unwrap();
        pool.install(|| search(&model, &bands, &prior, &question))
    };
    let one = with(1);
    assert!(one.iter().all(|a| a.best.len() == 20));
    assert_eq!(one, with(2));
    assert_eq!(one, with(7));
}

#[test]
fn nothing_to_search_gives_empty_answers() {
    let question = Question { quanta: 3, best: 5, tolerance: 10.0, best_only: false, filter: Filter::default() };
    let none = Model::harmonic(Vec::new());
    let band = Target { position: 5_000.0, sigma: 5.0 };
    let answers = search(&none, &[band], &PriorTerms::flat(0), &question);
    assert_eq!(answers[0].log_evidence(), f64::NEG_INFINITY);
    assert!(answers[0].best.is_empty());
    assert!(search(&Model::harmonic(vec![1_000.0]), &[], &PriorTerms::flat(1), &question).is_empty());
}
