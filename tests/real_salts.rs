//! Real salts: do the accepted kinds of assignment lead on measured bands?

use std::path::Path;

use bandwright::assign::single::{Assumptions, range_of, rank};
use bandwright::enumerate::prediction::{BUDGET, Predicted, Request, predict};
use bandwright::library;
use bandwright::mode::ModeTable;
use bandwright::physics::anharmonicity::resolve;
use bandwright::read::band_list;
use bandwright::render::records::{AssignInput, assign_report};
use bandwright::render::report::AssignReport;

fn table(name: &str) -> ModeTable {
    library::bundled(name).unwrap().unwrap().value
}

/// Ranks the bands of a file with a bundled table, each band by itself.
fn assigned(name: &str, file: &str, quanta: u8) -> AssignReport {
    let table = table(name);
    let bands = band_list::read_file(Path::new(file)).unwrap().value;
    let model = resolve(&table).value;
    let (low, high) = range_of(&bands);
    let request = Request { window: (low - 400.0, high + 400.0), quanta, budget: BUDGET, hot: None };
    let predicted: Vec<Predicted> = predict(&table, &model, &request).unwrap().value;
    let ranked = rank(&predicted, &bands, &Assumptions::default());
    let input = AssignInput { table: &table, model: &model, bands: &bands, quanta, predicted: &predicted, top: 10 };
    assign_report(&input, &ranked, &[])
}

/// Families of a band with probability, by band id.
fn families(report: &AssignReport, band: &str) -> Vec<(String, f64)> {
    let record = report.bands.iter().find(|b| b.band == band).unwrap();
    record.families.iter().map(|f| (f.family.join(" + "), f.probability)).collect()
}

#[test]
fn probabilities_of_every_band_sum_to_one() {
    for (name, file) in [
        ("gypsum", "tests/data/gypsum_bands.csv"),
        ("gypsum", "tests/data/gypsum_sulfate_bands.csv"),
        ("sodium_carbonate", "tests/data/sodium_carbonate_bands.csv"),
    ] {
        for band in assigned(name, file, 3).bands {
            let families: f64 = band.families.iter().map(|f| f.probability).sum();
            assert!((families + band.other_origin.probability - 1.0).abs() < 1.0e-9, "{name} {}", band.band);
        }
    }
}

#[test]
fn gypsum_bands_get_the_accepted_kinds() {
    // Accepted kinds: stretch overtones near 1.45 µm, stretch + bend at 1.94 µm (Bishop and others 2014, Cloutis and
    // others 2006: from memory); three-partner water sums at 1.75 µm (Laukamp and others, Minerals 11, 347 (2021), read).
    let report = assigned("gypsum", "tests/data/gypsum_bands.csv", 4);
    for band in ["overtone-1", "overtone-2", "overtone-3"] {
        assert_eq!(families(&report, band)[0].0, "2 oh-stretch", "{band}: {:?}", families(&report, band));
    }
    assert_eq!(families(&report, "strongest")[0].0, "oh-stretch + hoh-bend");
    assert_eq!(families(&report, "three-partners")[0].0, "oh-stretch + hoh-bend + libration");
    // 2.217 and 2.267 µm are given to stretch + libration/rotation in one compilation (from memory) and to sums with
    // sulfate in others: the strongest candidates must be stretch sums with a low partner.
    for band in ["doublet-1", "doublet-2"] {
        let leading = &families(&report, band)[0].0;
        assert!(leading.starts_with("oh-stretch + "), "{band}: {leading}");
    }
}

#[test]
fn gypsum_second_order_sulfate_modes_are_two_sulfate_quanta() {
    // Am. Mineral. 90 (2005) 672 (abstract, read): 2117 to 2245 cm⁻¹ are second-order modes of sulfate.
    let report = assigned("gypsum", "tests/data/gypsum_sulfate_bands.csv", 3);
    for band in ["s1", "s2", "s4"] {
        let list = families(&report, band);
        assert_eq!(list[0].0, "2 xo-stretch", "{band}: {list:?}");
    }
    // At 2200 cm⁻¹ the association band of water (bend + libration) lies in the way: by position and strength alone it
    // leads. What decides is that the anhydrous salt shows the same group (2163, 2236 cm⁻¹ in γ-CaSO4, same source).
    let list = families(&report, "s3");
    assert_eq!(list[0].0, "hoh-bend + libration", "{list:?}");
    assert_eq!(list[1].0, "2 xo-stretch", "{list:?}");
}

#[test]
fn alkali_carbonate_bands_have_the_published_combination_among_the_first_three() {
    let report = assigned("sodium_carbonate", "tests/data/sodium_carbonate_bands.csv", 4);
    for (band, published) in [("E", "2 nu1 + 2 nu3"), ("F", "2 nu1 + 2 nu3"), ("G", "nu1 + 3 nu3")] {
        let record = report.bands.iter().find(|b| b.band == band).unwrap();
        let labels: Vec<&str> = record.candidates.iter().take(3).map(|c| c.level.label.as_str()).collect();
        assert!(labels.contains(&published), "{band}: {labels:?}");
    }
}

#[test]
fn a_perchlorate_hydrate_shows_water_plus_perchlorate_sums_near_the_puzzle() {
    // 4717 cm⁻¹ in perchlorate hydrates, neither in anhydrous perchlorates nor in chloride hydrates: common practice, no
    // source.
    for name in ["magnesium_perchlorate_hexahydrate", "sodium_perchlorate_monohydrate"] {
        let report = assigned(name, "examples/perchlorate/bands.csv", 4);
        let band = &report.bands[0];
        let both = |moieties: &[String]| moieties.iter().any(|m| m == "H2O") && moieties.iter().any(|m| m == "ClO4");
        assert!(both(&band.families[0].moieties), "{name}: {:?}", band.families[0]);
        assert!(band.candidates.iter().filter(|c| both(&c.level.moieties)).count() >= 2, "{name}");
        // Honest odds: the count of chance matches stands beside them, and the band is not called secure on position.
        assert!(band.chance_matches.expected > 5.0, "{name}: {:?}", band.chance_matches);
        assert_ne!(band.verdict, "secure", "{name}");
    }
}

#[test]
fn a_chloride_hydrate_and_the_anhydrous_perchlorate_have_no_such_sum() {
    let labels = |name: &str| -> Vec<String> {
        let table = table(name);
        let model = resolve(&table).value;
        let request = Request { window: (4650.0, 4780.0), quanta: 2, budget: BUDGET, hot: None };
        predict(&table, &model, &request).unwrap().value.iter().map(|p| p.level.label(&table)).collect()
    };
    // Two quanta of water alone or of perchlorate alone do not reach the puzzle's position.
    assert!(labels("magnesium_chloride_hexahydrate").is_empty(), "{:?}", labels("magnesium_chloride_hexahydrate"));
    assert!(labels("sodium_perchlorate").is_empty());
    assert!(!labels("sodium_perchlorate_monohydrate").is_empty());
}

#[test]
fn nearly_every_hydrate_has_an_edge_near_two_point_four_micrometres() {
    // Common practice, no source: stretch + libration makes the edge near 2.4 µm.
    for name in
        ["gypsum", "bassanite", "epsomite", "magnesium_chloride_hexahydrate", "magnesium_perchlorate_hexahydrate"]
    {
        let table = table(name);
        let model = resolve(&table).value;
        let request = Request { window: (1.0e4 / 2.65, 1.0e4 / 2.3), quanta: 2, budget: BUDGET, hot: None };
        let found = predict(&table, &model, &request).unwrap().value;
        let edge = found.iter().any(|p| {
            let motions: Vec<_> =
                p.level.excitations().iter().map(|e| table.modes[usize::from(e.mode)].motion.name()).collect();
            motions.contains(&"oh-stretch") && motions.contains(&"libration")
        });
        assert!(edge, "{name}");
    }
}

#[test]
fn every_bundled_row_has_a_source_and_a_status() {
    let names: Vec<&str> = library::names().collect();
    assert!(names.len() >= 18);
    for name in names {
        let table = table(name);
        for mode in &table.modes {
            let stated = ["[read]", "[memory]", "[computed]", "[common practice]"];
            assert!(stated.iter().any(|s| mode.source.ends_with(s)), "{name} {}: {}", mode.id, mode.source);
            assert!(mode.source.len() > 12, "{name} {}", mode.id);
        }
        let oxidiser = ["ClO4", "NO3"].iter().any(|ion| table.formula.contains(ion));
        assert!(!oxidiser || table.caution.as_deref().is_some_and(|c| c.contains("oxidiser")), "{name}");
    }
    let folder: Vec<String> = std::fs::read_dir("mode_tables")
        .unwrap()
        .map(|e| e.unwrap().file_name().into_string().unwrap())
        .filter(|f| f.ends_with(".csv") && !f.contains(".constants."))
        .map(|f| f.trim_end_matches(".csv").to_owned())
        .collect();
    for file in folder.iter().filter(|f| !NOT_TABLES.contains(&f.as_str())) {
        assert!(library::names().any(|n| n == file), "mode_tables/{file}.csv is not bundled");
    }
}

/// Data files of `mode_tables/` that are no mode tables.
const NOT_TABLES: [&str; 6] = ["defaults", "ions", "cations", "scale_factors", "sites", "correlations"];
