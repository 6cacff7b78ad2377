//! Good and bad input files. Each bad file carries its expected complaints in `# complaint:` lines (as many as the
//! reader must make); kinds of file that cannot carry any are listed here.

use std::fs;
use std::path::Path;
use std::process::Command;

use bandwright::band::BandList;
use bandwright::mode::ModeTable;
use bandwright::read::{Complaints, band_list, companions, constants, mode_table};

/// Files that cannot carry their complaint, with it.
const CARRIED_HERE: [(&str, &str); 5] = [
    ("modes_empty.csv", "expected a header with mode, moiety, motion, wavenumber_cm1, found nothing"),
    ("modes_only_blank.csv", "expected a header with mode, moiety, motion, wavenumber_cm1, found nothing"),
    ("modes_latin1.csv", "3:8: expected UTF-8 text, found `byte 0xB2`"),
    ("modes_binary.csv", "expected UTF-8 text, found `byte 0x80`"),
    ("modes_broken_utf16.csv", "expected text, found `broken UTF-16`"),
];

fn water() -> ModeTable {
    mode_table::read_file(Path::new("tests/input/good/water.csv")).unwrap().value
}

fn bands() -> BandList {
    band_list::read_file(Path::new("tests/input/good/bands.csv")).unwrap().value
}

fn complaints_about(path: &Path) -> Complaints {
    let kind = path.file_name().unwrap().to_str().unwrap().split('_').next().unwrap().to_owned();
    let result = match kind.as_str() {
        "modes" => mode_table::read_file(path).map(|_| ()),
        "bands" => band_list::read_file(path).map(|_| ()),
        "constants" => constants::read_file(path, &water()).map(|_| ()),
        "companions" => companions::read_file(path, &water(), &bands()).map(|_| ()),
        _ => panic!("{}: the name does not say which reader it is for", path.display()),
    };
    result.err().unwrap_or_else(|| panic!("{} was read without complaint", path.display()))
}

fn bad_files() -> Vec<std::path::PathBuf> {
    let mut files: Vec<_> = fs::read_dir("tests/input/bad").unwrap().map(|e| e.unwrap().path()).collect();
    files.sort();
    files
}

#[test]
fn every_bad_file_draws_exactly_its_complaints() {
    let files = bad_files();
    assert!(files.len() >= 40, "only {} bad files", files.len());
    for path in files {
        let name = path.file_name().unwrap().to_str().unwrap();
        let bytes = fs::read(&path).unwrap();
        let text = String::from_utf8_lossy(&bytes);
        let mut expected: Vec<&str> = text.lines().filter_map(|l| l.trim().strip_prefix("# complaint: ")).collect();
        expected.extend(CARRIED_HERE.iter().filter(|(file, _)| *file == name).map(|(_, complaint)| *complaint));
        assert!(!expected.is_empty(), "{name} carries no complaint");
        let complaints = complaints_about(&path);
        let printed = complaints.to_string();
        for complaint in &expected {
            assert!(printed.contains(complaint), "{name}: expected\n  {complaint}\nin\n{printed}");
        }
        assert_eq!(complaints.0.len(), expected.len(), "{name}: {printed}");
        for complaint in &complaints.0 {
            assert_eq!(complaint.at.file, path.display().to_string());
            assert!(!complaint.expected.is_empty());
        }
    }
}

#[test]
fn most_complaints_carry_a_hint_and_a_caret() {
    let all: Vec<_> = bad_files().iter().flat_map(|path| complaints_about(path).0).collect();
    let hinted = all.iter().filter(|c| !c.hint.is_empty()).count();
    assert!(hinted * 10 >= all.len() * 7, "{hinted} of {} complaints have a hint", all.len());
    for complaint in all.iter().filter(|c| c.at.column > 0) {
        let text = complaint.to_string();
        assert!(text.contains(" | ") && text.contains('^'), "{text}");
    }
}

#[test]
fn bad_tables_end_the_program_with_code_two_and_no_answer() {
    for path in bad_files() {
        if !path.file_name().unwrap().to_str().unwrap().starts_with("modes_") {
            continue;
        }
        let run = Command::new(env!("CARGO_BIN_EXE_bandwright")).arg("check").arg(&path).output().unwrap();
        assert_eq!(run.status.code(), Some(2), "{}", path.display());
        assert!(run.stdout.is_empty(), "{}", path.display());
        let told = String::from_utf8(run.stderr).unwrap();
        assert!(told.contains("error: ") && told.contains(path.to_str().unwrap()), "{told}");
        assert!(!told.contains("panicked"), "{told}");
    }
}

#[test]
fn tables_are_read_in_every_usual_form() {
    for (file, shift) in [
        ("water.csv", 0.0),
        ("water_semicolon_decimal_comma.csv", 0.5),
        ("water_tabs.csv", 0.5),
        ("water_crlf_bom_blank.csv", 0.5),
        ("water_utf16.csv", 0.5),
    ] {
        let path = Path::new("tests/input/good").join(file);
        let table = mode_table::read_file(&path).unwrap_or_else(|c| panic!("{c}")).value;
        let positions: Vec<f64> = table.modes.iter().map(|m| m.wavenumber.inverse_cm()).collect();
        assert_eq!(positions, [3405.0 + shift, 3547.0 + shift, 1621.0 + shift], "{file}");
    }
    let path = Path::new("tests/input/good/water_semicolon_decimal_comma.csv");
    assert_eq!(mode_table::read_file(path).unwrap().value.formula, "CaSO4.2H2O", "the middle dot is read as a point");
}

#[test]
fn band_lists_take_every_unit_and_scale_the_uncertainty() {
    let list = bands();
    let positions: Vec<f64> = list.bands.iter().map(|b| b.position.inverse_cm()).collect();
    for (position, expected) in positions.iter().zip([1.0e4 / 1.94, 1.0e7 / 1450.0, 4717.0]) {
        assert!((position - expected).abs() < 1.0e-9);
    }
    // dν̃ = dλ · 10⁴/λ²: 0.004 µm at 1.94 µm.
    assert!((list.bands[0].sigma - 0.004 * 1.0e4 / 1.94f64.powi(2)).abs() < 1.0e-9);
    let (low, high) = list.range.unwrap();
    assert!((low - 1.0e4 / 2.6).abs() < 1.0e-9 && (high - 1.0e4).abs() < 1.0e-9);
}

#[test]
fn a_million_rows_and_endless_lines_are_refused_with_a_reason() {
    let mut text = String::from("mode,moiety,motion,wavenumber_cm1\n");
    for index in 0..1_000_000 {
        text.push_str(&format!("m{index},H2O,other,1\n"));
    }
    let refused = mode_table::read("million.csv", &text).unwrap_err().to_string();
    assert!(refused.contains("expected at most 20000 rows, found `more`"), "{refused}");
    let line = format!("mode,moiety,motion,wavenumber_cm1\n{}", "x".repeat(10_000_000));
    let refused = mode_table::read("line.csv", &line).unwrap_err().to_string();
    assert!(refused.contains("expected a line of at most 100000 characters"), "{refused}");
    assert!(refused.len() < 1_000, "the message repeats the line");
    let folder = tempfile::tempdir().unwrap();
    let large = folder.path().join("large.csv");
    // A sparse file of 1 GB: only the limit is read.
    fs::File::create(&large).unwrap().set_len(1 << 30).unwrap();
    let refused = mode_table::read_file(&large).unwrap_err().to_string();
    assert!(refused.contains("at most 16 MiB"), "{refused}");
}

mod any_bytes {
    use super::*;
    use proptest::prelude::*;

    /// Text made of the pieces real files are made of, and of noise.
    fn texts() -> impl Strategy<Value = String> {
        let piece = prop_oneof![
            Just("mode,moiety,motion,wavenumber_cm1\n".to_owned()),
            Just("band,position,unit,sigma\n".to_owned()),
            Just("companion,moieties,band,verdict\n".to_owned()),
            Just("quantity,mode_a,mode_b,value_cm1\n".to_owned()),
            Just("# range: 1:2 um\n".to_owned()),
            Just("# medium: air\n".to_owned()),
            Just("OH,H2O,oh-stretch,3400\n".to_owned()),
            Just("\"".to_owned()),
            Just("\r\n".to_owned()),
            Just("\u{feff}".to_owned()),
            Just("1e308,±,−5;\t".to_owned()),
            any::<String>(),
        ];
        proptest::collection::vec(piece, 0..12).prop_map(|pieces| pieces.concat())
    }

    proptest! {
        #![proptest_config(ProptestConfig { cases: 400, failure_persistence: None, ..ProptestConfig::default() })]

        #[test]
        fn no_text_makes_a_reader_panic(text in texts()) {
            let (table, list) = (water(), bands());
            // What is asserted: no panic, and a refusal always says something.
            let results = [
                mode_table::read("any.csv", &text).err(),
                band_list::read("any.csv", &text).err(),
                constants::read("any.csv", &text, &table).err(),
                companions::read("any.csv", &text, &table, &list).err(),
            ];
            for complaints in results.into_iter().flatten() {
                prop_assert!(!complaints.0.is_empty());
                prop_assert!(complaints.to_string().starts_with("error: any.csv"));
            }
        }

        #[test]
        fn no_bytes_make_the_decoder_panic(bytes in proptest::collection::vec(any::<u8>(), 0..300)) {
            let limits = bandwright::read::delimited::Limits::default();
            if let Err(complaints) = bandwright::read::delimited::utf8("any.csv", bytes, limits) {
                prop_assert!(!complaints.to_string().is_empty());
            }
        }
    }
}
