//! What does a person see on screen, and the shell as exit code?

use std::fs;
use std::process::{Command, Output};

use bandwright::render::report::{AssignReport, PredictReport};

fn run(arguments: &[&str]) -> Output {
    Command::new(env!("CARGO_BIN_EXE_bandwright")).args(arguments).output().unwrap()
}

fn told(output: &Output) -> String {
    String::from_utf8(output.stderr.clone()).unwrap()
}

fn answer(output: &Output) -> String {
    String::from_utf8(output.stdout.clone()).unwrap()
}

#[test]
fn predict_lists_the_strong_water_bands_of_gypsum() {
    let output = run(&["predict", "gypsum", "--window", "1.3:2.6um", "--quanta", "3"]);
    assert_eq!(output.status.code(), Some(0));
    let text = answer(&output);
    assert!(text.contains("oh-stretch + hoh-bend") && text.contains("OHb + bend"), "{text}");
    assert!(told(&output).contains("picture of H2O: local pair"), "the picture of the water is said");
    assert!(!text.contains('\u{1b}'), "no colour away from a terminal");
}

#[test]
fn predict_json_is_read_back_by_a_reader_that_refuses_unknown_fields() {
    let output = run(&["predict", "epsomite", "--quanta", "2", "--format", "json"]);
    let report: PredictReport = serde_json::from_str(&answer(&output)).unwrap();
    assert_eq!(report.schema, "bandwright/predict/1");
    assert!(!report.levels.is_empty());
    for level in &report.levels {
        assert!((level.position_um * level.position_cm1 - 1.0e4).abs() < 1.0e-6);
        assert_eq!(u32::from(level.quanta.values().sum::<u8>()), level.order);
        assert!(["allowed", "forbidden", "unknown"].contains(&level.ir.as_str()));
    }
    assert!(report.levels.windows(2).all(|w| w[0].position_cm1 <= w[1].position_cm1));
}

#[test]
fn assign_json_has_the_fields_of_the_contract() {
    let output = run(&["assign", "gypsum", "--bands", "examples/efflorescence/crust.csv", "--format", "json"]);
    assert!(matches!(output.status.code(), Some(0 | 1)), "{}", told(&output));
    let report: AssignReport = serde_json::from_str(&answer(&output)).unwrap();
    assert_eq!(report.schema, "bandwright/assign/1");
    assert_eq!(report.bands.len(), 7);
    for band in &report.bands {
        let sum: f64 = band.families.iter().map(|f| f.probability).sum::<f64>() + band.other_origin.probability;
        assert!((sum - 1.0).abs() < 1.0e-6, "{}: {sum}", band.band);
        assert!(!band.verdict.is_empty() && band.chance_matches.expected > 0.0);
    }
}

#[test]
fn csv_has_one_row_per_level_and_the_same_width_throughout() {
    let output = run(&["predict", "bassanite", "--quanta", "2", "--format", "csv"]);
    let text = answer(&output);
    let mut reader = csv::Reader::from_reader(text.as_bytes());
    let width = reader.headers().unwrap().len();
    let rows: Vec<_> = reader.records().map(Result::unwrap).collect();
    assert!(rows.len() > 10 && rows.iter().all(|r| r.len() == width));
}

#[test]
fn equal_input_gives_equal_bytes_for_any_number_of_threads() {
    let with = |threads: &str| {
        Command::new(env!("CARGO_BIN_EXE_bandwright"))
            .env("RAYON_NUM_THREADS", threads)
            .args([
                "assign",
                "epsomite",
                "--bands",
                "tests/data/gypsum_bands.csv",
                "--quanta",
                "3",
                "--trials",
                "19",
                "--format",
                "json",
            ])
            .output()
            .unwrap()
            .stdout
    };
    let one = with("1");
    assert!(!one.is_empty());
    assert_eq!(one, with("2"));
    assert_eq!(one, with("5"));
}

#[test]
fn a_wrong_table_name_is_told_the_near_one() {
    let output = run(&["predict", "gypsom"]);
    assert_eq!(output.status.code(), Some(2));
    assert!(told(&output).contains("did you mean `gypsum`?"), "{}", told(&output));
    assert!(output.stdout.is_empty());
}

#[test]
fn a_wrong_option_or_window_ends_with_code_two() {
    for arguments in [
        vec!["predict", "gypsum", "--quanta", "0"],
        vec!["predict", "gypsum", "--window", "wide"],
        vec!["predict", "gypsum", "--format", "xml"],
        vec!["assign", "gypsum"],
        vec!["assign", "gypsum", "--bands", "no/such/file.csv"],
        vec!["dance"],
        vec![],
    ] {
        let output = run(&arguments);
        assert_eq!(output.status.code(), Some(2), "{arguments:?}: {}", answer(&output));
        assert!(!told(&output).is_empty(), "{arguments:?}");
    }
}

#[test]
fn an_answer_is_written_whole_and_never_over_an_input() {
    let folder = tempfile::tempdir().unwrap();
    let table = folder.path().join("mine.csv");
    fs::copy("mode_tables/gypsum.csv", &table).unwrap();
    let before = fs::read(&table).unwrap();
    let table = table.to_str().unwrap();
    let output = run(&["predict", table, "--out", table]);
    assert_eq!(output.status.code(), Some(2));
    assert!(told(&output).contains("is an input"), "{}", told(&output));
    assert_eq!(fs::read(table).unwrap(), before);
    let target = folder.path().join("answer.csv");
    let output = run(&["predict", table, "--format", "csv", "--out", target.to_str().unwrap()]);
    assert_eq!(output.status.code(), Some(0), "{}", told(&output));
    assert!(output.stdout.is_empty() && fs::read_to_string(&target).unwrap().starts_with("label,"));
    let output = run(&["predict", table, "--out", "/no/such/folder/answer.txt"]);
    assert_eq!(output.status.code(), Some(2));
}

#[test]
fn check_finds_the_faults_it_is_made_for() {
    let folder = tempfile::tempdir().unwrap();
    let path = folder.path().join("odd.csv");
    fs::write(
        &path,
        "# formula: CaSO4\n# point_group: C2v\nmode,moiety,motion,wavenumber_cm1,sigma_cm1,degeneracy,species,source\n\
         OHa,H2O,oh-stretch,3400,5,1,A1,invented\nOHb,H2O,oh-stretch,3500,5,1,B9,invented\n\
         b1,H2O,hoh-bend,1620,5,1,,invented\nb2,H2O,hoh-bend,1650,0,1,,invented\n\
         low,H2O,oh-stretch,900,5,1,,invented\nnu3,SO4,xo-stretch,1100,400,3,,\n",
    )
    .unwrap();
    fs::write(
        folder.path().join("odd.constants.csv"),
        "quantity,mode_a,mode_b,value_cm1,sigma_cm1,source\nx,OHa,OHa,42,5,invented\nx,OHa,OHb,-165,5,invented\n\
         one-one,OHa,OHb,-45,5,invented\n",
    )
    .unwrap();
    let output = run(&["check", path.to_str().unwrap()]);
    assert_eq!(output.status.code(), Some(1), "{}", told(&output));
    let text = answer(&output);
    for part in [
        "species `B9` is not in point group C2v",
        "900 cm⁻¹ is impossible for a oh-stretch",
        "an uncertainty of zero",
        "2 bends in one water",
        "more than a fifth of the wavenumber",
        "no source",
        "has no water",
        "the diagonal constant of an OH stretch is negative",
        "two pictures of one water are mixed",
    ] {
        assert!(text.contains(part), "`{part}` is missing in\n{text}");
    }
    assert_eq!(run(&["check", "gypsum", "epsomite"]).status.code(), Some(0));
}

#[test]
fn completions_and_manual_come_from_the_same_definitions() {
    let completions = answer(&run(&["completions", "bash"]));
    let manual = answer(&run(&["manual", "predict"]));
    for text in [&completions, &manual] {
        assert!(text.contains("quanta") && text.contains("window"), "{text}");
    }
    assert!(answer(&run(&["manual"])).contains("assign"));
}

#[test]
fn tables_lists_what_is_bundled_and_shows_one_whole() {
    let listing = answer(&run(&["tables"]));
    assert!(listing.contains("gypsum") && listing.contains("Mg(ClO4)2.6H2O"));
    let whole = answer(&run(&["tables", "water"]));
    assert!(whole.contains("darling-dennison") && whole.contains("3657.053"), "{whole}");
}

#[test]
fn a_spectrum_is_picked_and_assigned_in_one_go() {
    let output = run(&[
        "assign",
        "gypsum",
        "--spectrum",
        "examples/spectra/gypsum_beckman.csv",
        "--medium",
        "air",
        "--trials",
        "39",
        "--format",
        "json",
    ]);
    let report: AssignReport = serde_json::from_str(&answer(&output)).unwrap_or_else(|_| panic!("{}", told(&output)));
    let near = |cm1: f64| report.bands.iter().find(|b| (b.observed_cm1 - cm1).abs() < 25.0).unwrap();
    // 1.944 µm is stretch + bend, 1.446 µm a stretch overtone (Bishop and others 2014: from memory).
    assert_eq!(near(5146.0).families[0].family, ["oh-stretch", "hoh-bend"]);
    assert_eq!(near(6920.0).families[0].family, ["2 oh-stretch"]);
    assert!(report.coincidence.p_value <= 0.1 && report.coincidence.trials == 39, "{:?}", report.coincidence);
    assert!(report.bands.iter().all(|b| b.sigma_cm1 > 0.0));
}

#[test]
fn companions_of_the_puzzle_favour_sums_of_water_and_perchlorate() {
    let bands = "examples/perchlorate/bands.csv";
    let with = |companions: Option<&str>| {
        let mut arguments = vec!["assign", "magnesium_perchlorate_hexahydrate", "--bands", bands, "--trials", "0"];
        if let Some(file) = companions {
            arguments.extend(["--companions", file]);
        }
        arguments.extend(["--format", "json"]);
        let report: AssignReport = serde_json::from_str(&answer(&run(&arguments))).unwrap();
        let both = |f: &&bandwright::render::report::FamilyRecord| {
            ["H2O", "ClO4"].iter().all(|m| f.moieties.iter().any(|n| n == m))
        };
        let sum: f64 = report.bands[0].families.iter().filter(both).map(|f| f.probability).sum();
        (sum, report)
    };
    let (alone, _) = with(None);
    let (told, report) = with(Some("examples/perchlorate/companions.csv"));
    assert!(told > alone + 0.05, "{alone} without, {told} with companions");
    let reasons: Vec<&str> = report.bands[0].candidates[0].factors.iter().map(|f| f.reason.as_str()).collect();
    assert!(reasons.iter().any(|r| r.contains("chloride hydrate")), "{reasons:?}");
}

#[test]
fn advice_names_what_each_family_predicts_and_its_cautions() {
    let output = run(&[
        "advise",
        "magnesium_perchlorate_hexahydrate",
        "--bands",
        "examples/perchlorate/bands.csv",
        "--band",
        "puzzle",
        "--format",
        "json",
    ]);
    assert_eq!(output.status.code(), Some(0), "{}", told(&output));
    let report: serde_json::Value = serde_json::from_str(&answer(&output)).unwrap();
    let list = report["measurements"].as_array().unwrap();
    assert!(list.len() >= 6);
    let bits: Vec<f64> = list.iter().map(|m| m["information_bits"].as_f64().unwrap()).collect();
    assert!(bits.windows(2).all(|w| w[0] >= w[1]) && bits[0] > 0.2, "{bits:?}");
    for measurement in list {
        let caution = measurement["caution"].as_str().unwrap();
        assert!(caution.contains("oxidiser") && caution.contains("local rules"), "{caution}");
        assert!(!measurement["outcomes"].as_array().unwrap().is_empty());
    }
    assert_eq!(
        run(&["advise", "gypsum", "--bands", "examples/efflorescence/crust.csv", "--band", "no"]).status.code(),
        Some(2)
    );
}
