//! Is the enumeration complete, without repeats, and equal to direct counts?

use std::collections::BTreeMap;
use std::path::Path;

use bandwright::enumerate::count::{harmonic_counts, levels_with_quanta};
use bandwright::enumerate::walk::{Filter, levels_in};
use bandwright::physics::position::Model;

fn rows(name: &str) -> Vec<BTreeMap<String, String>> {
    let mut reader =
        csv::ReaderBuilder::new().comment(Some(b'#')).from_path(Path::new("tests/data").join(name)).unwrap();
    let header = reader.headers().unwrap().clone();
    reader
        .records()
        .map(|record| header.iter().map(str::to_owned).zip(record.unwrap().iter().map(str::to_owned)).collect())
        .collect()
}

/// `0=1|1=4|2=10` as counts by quanta.
fn by_quanta(text: &str) -> Vec<u64> {
    text.split('|').map(|part| part.split_once('=').unwrap().1.parse().unwrap()).collect()
}

#[test]
fn level_and_state_counts_equal_the_direct_count_on_every_row() {
    let list = rows("state_count_checks.csv");
    assert!(list.len() > 50);
    for row in list {
        let modes: Vec<(usize, u8)> = row["modes_wavenumber:degeneracy"]
            .split(';')
            .map(|m| m.split_once(':').map(|(w, d)| (w.parse().unwrap(), d.parse().unwrap())).unwrap())
            .collect();
        let highest: usize = row["E_max_cm1"].parse().unwrap();
        let most = highest / modes.iter().map(|m| m.0).min().unwrap() + 1;
        let total = |modes: &[(usize, u8)]| harmonic_counts(modes, highest, most).iter().flatten().sum::<u64>();
        let context = format!("{} up to {highest}", row["set"]);
        assert_eq!(total(&modes), row["states_up_to_E"].parse::<u64>().unwrap(), "states of {context}");
        let single: Vec<(usize, u8)> = modes.iter().map(|m| (m.0, 1)).collect();
        assert_eq!(total(&single), row["levels_up_to_E"].parse::<u64>().unwrap(), "levels of {context}");

        let states = harmonic_counts(&modes, highest, 5);
        let listed = by_quanta(&row["states_by_total_quanta"]);
        for (q, expected) in listed.iter().enumerate() {
            assert_eq!(states[q].iter().sum::<u64>(), *expected, "states of {context} with {q} quanta");
        }

        // The walk itself: levels by quanta, each once.
        let mut model = Model::harmonic(modes.iter().map(|m| m.0 as f64).collect());
        model.degeneracy = modes.iter().map(|m| m.1).collect();
        let listed = by_quanta(&row["levels_by_total_quanta"]);
        let quanta = u8::try_from(listed.len() - 1).unwrap();
        let found = levels_in(&model, (0.0, highest as f64), quanta, &Filter::default(), 10_000_000).unwrap();
        for (q, expected) in listed.iter().enumerate().skip(1) {
            let walked = found.iter().filter(|f| f.level.order() as usize == q).count() as u64;
            assert_eq!(walked, *expected, "walked levels of {context} with {q} quanta");
        }
        let mut levels: Vec<_> = found.iter().map(|f| &f.level).collect();
        levels.sort();
        levels.dedup();
        assert_eq!(levels.len(), found.len(), "a level of {context} came twice");
    }
}

#[test]
fn numbers_of_quanta_vectors_equal_the_binomial_on_every_row() {
    let list = rows("quanta_count_checks.csv");
    assert!(list.len() >= 40);
    for row in list {
        let number = |column: &str| row[column].parse::<u64>().unwrap();
        let (modes, quanta) = (number("n_modes_nondegenerate"), number("total_quanta"));
        assert_eq!(
            levels_with_quanta(modes, quanta),
            Some(number("number_of_levels")),
            "{modes} modes, {quanta} quanta"
        );
        let cumulative: u64 = (1..=quanta).map(|q| levels_with_quanta(modes, q).unwrap()).sum();
        assert_eq!(cumulative, number("cumulative_1_to_q"));
        if number("number_of_levels") <= 20_000 {
            let n = usize::try_from(modes).unwrap();
            let model = Model::harmonic((0..n).map(|i| 300.0 + i as f64).collect());
            let most = u8::try_from(quanta).unwrap();
            let found = levels_in(&model, (0.0, 1.0e6), most, &Filter::default(), 10_000_000).unwrap();
            assert_eq!(found.len() as u64, cumulative, "{modes} modes, {quanta} quanta");
        }
    }
}

#[test]
fn the_same_levels_come_for_any_number_of_threads() {
    let table = bandwright::library::bundled("epsomite").unwrap().unwrap().value;
    let model = bandwright::physics::anharmonicity::resolve(&table).value;
    let with = |threads: usize| {
        let pool = rayon::ThreadPoolBuilder::new().num_threads(threads).build().unwrap();
        pool.install(|| levels_in(&model, (4000.0, 8000.0), 4, &Filter::default(), 10_000_000).unwrap())
    };
    let one = with(1);
    assert!(one.len() > 500);
    assert_eq!(one, with(2));
    assert_eq!(one, with(7));
}
