//! When we say 70 %, are we right 70 % of the time? A small version; `examples/calibration.rs` prints the full table of
//! `docs/calibration.md`. Samples are simulated, seeds are fixed.

use bandwright::assign::candidate::Candidate;
use bandwright::assign::chance::list_test;
use bandwright::assign::joint::{JointAnswer, JointOptions, assign};
use bandwright::assign::reliability::{ByHand, Scores, by_hand};
use bandwright::assign::simulation::{Design, Sample, Truth, model_of, simulate};
use bandwright::enumerate::walk::{Filter, levels_in};
use bandwright::mode::Motion;

fn options() -> JointOptions {
    let mut options = JointOptions::default();
    options.effort.particles = 32;
    options.effort.sweeps = 5;
    options.effort.discard = 2;
    options
}

fn ranked(sample: &Sample, candidates: &[Candidate]) -> JointAnswer {
    assign(&sample.model, &sample.table, candidates, &sample.bands, &[], &options())
}

#[test]
fn claims_about_families_are_about_as_often_right_as_they_say() {
    let mut scores = Scores::default();
    let mut hand = (0, 0);
    for seed in 0..6 {
        let sample = simulate(&Design::hydrate(15, Truth::AsAssumed), 1_000 + seed);
        let (_, family, all) = by_hand(ByHand::FewestQuanta, &sample);
        hand = (hand.0 + family, hand.1 + all);
        scores.add(&sample, &ranked(&sample, &sample.candidates).bands);
    }
    let (right, claimed) = (scores.family.accuracy(), scores.family.mean_claim());
    let by_hand = hand.0 as f64 / hand.1 as f64;
    eprintln!("right {right:.2}, claimed {claimed:.2}, by hand {by_hand:.2}, of {}", hand.1);
    // About 120 bands: a share of 0.75 has a standard error of 0.04; three of them.
    assert!((right - claimed).abs() < 0.12, "claimed {claimed:.2}, right {right:.2}");
    assert!(right > by_hand + 0.05, "{right:.2} against {by_hand:.2} for the fewest quanta");
    assert!(scores.first_three.accuracy() > 0.88);
}

/// The range that simulated fundamentals are drawn from, cm⁻¹.
fn ranges(sample: &Sample) -> Vec<(f64, f64)> {
    let of = |motion| match motion {
        Motion::OhStretch => (3_200.0, 3_690.0),
        Motion::HohBend => (1_610.0, 1_670.0),
        Motion::Libration => (420.0, 850.0),
        Motion::MetalOxygen => (250.0, 460.0),
        Motion::XoStretch => (930.0, 1_170.0),
        _ => (430.0, 660.0),
    };
    sample.table.modes.iter().map(|m| of(m.motion)).collect()
}

#[test]
fn the_chance_test_knows_the_right_table_from_a_wrong_one() {
    let weighing = JointOptions::default().weighing;
    let (mut own, mut wrong) = (Vec::new(), Vec::new());
    for seed in 0..10 {
        let sample = simulate(&Design::hydrate(15, Truth::AsAssumed), 2_000 + seed);
        let stranger = simulate(&Design::hydrate(15, Truth::AsAssumed), 3_000 + seed).table;
        let ranges = ranges(&sample);
        let test = |table, model| list_test(model, table, &sample.bands, &weighing, 4, &ranges, (99, 7)).p_value;
        own.push(test(&sample.table, &sample.model));
        wrong.push(test(&stranger, &model_of(&stranger)));
    }
    eprintln!("own {own:?}\nwrong {wrong:?}");
    let below = |list: &[f64]| list.iter().filter(|p| **p <= 0.05).count();
    // Of ten wrong tables one in twenty should fall below 0.05; three or more happen once in ninety times.
    assert!(below(&wrong) <= 2, "{wrong:?}");
    assert!(below(&own) >= 4, "{own:?}");
}

#[test]
fn more_quanta_than_needed_change_little() {
    let sample = simulate(&Design::hydrate(15, Truth::AsAssumed), 4_001);
    let with = |quanta| {
        let found = levels_in(&sample.model, (3_500.0, 8_500.0), quanta, &Filter::default(), usize::MAX).unwrap();
        let list: Vec<Candidate> = found.into_iter().map(|f| Candidate::plain(&sample.model, f.level)).collect();
        ranked(&sample, &list)
    };
    let (four, five) = (with(4), with(5));
    let mut moved = Vec::new();
    for (a, b) in four.bands.iter().zip(&five.bands) {
        let best = &a.families[0];
        let same = b.families.iter().find(|f| f.key == best.key).map_or(0.0, |f| f.probability);
        moved.push((best.probability - same).abs());
    }
    let mean = moved.iter().sum::<f64>() / moved.len() as f64;
    eprintln!("leading families move by {mean:.3} on the mean: {moved:.2?}");
    // 32 members repeat to about 0.05 a band.
    assert!(mean < 0.08, "mean {mean}");
}

#[test]
fn the_ranking_is_the_same_for_any_number_of_threads() {
    let sample = simulate(&Design::hydrate(15, Truth::AsAssumed), 5_001);
    let run = |threads| {
        let pool = rayon::ThreadPoolBuilder::new().num_threads(threads).build().unwrap();
        pool.install(|| serde_json::to_string(&ranked(&sample, &sample.candidates)).unwrap())
    };
    assert_eq!(run(1), run(3));
}
