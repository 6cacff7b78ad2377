//! Do Hessians give the modes, strengths and motions that an independent calculation gave?
//!
//! Files and check lists: see `tests/data/quantum_chemistry/README.md`.

use std::fs;

use bandwright::physics::elements::Exchange;
use bandwright::physics::hessian_faults::findings;
use bandwright::physics::moieties::{Group, Structure, structure};
use bandwright::physics::motion::{Description, describe};
use bandwright::physics::normal_modes::{NormalModes, masses, normal_modes};
use bandwright::read::qcschema::{self, HessianRecord};

const NAMES: [&str; 6] = ["h2o", "no3", "clo4", "mg_h2o6", "mg_h2o6_clo4_2", "bad_not_a_minimum"];

fn text(name: &str) -> String {
    fs::read_to_string(format!("tests/data/quantum_chemistry/{name}")).unwrap()
}

fn record(name: &str) -> HessianRecord {
    let file = format!("{name}.qcschema.json");
    qcschema::read(&file, &text(&file)).unwrap().value
}

struct Checked {
    wavenumber: f64,
    reduced_mass: f64,
    infrared: f64,
    water: f64,
    oxyanion: f64,
    metal: f64,
    motion: String,
    purity: f64,
}

fn check_list(name: &str) -> Vec<Checked> {
    text(&format!("{name}.modes.csv"))
        .lines()
        .skip(1)
        .map(|line| {
            let cells: Vec<&str> = line.split(',').collect();
            let number = |k: usize| cells[k].parse::<f64>().unwrap();
            Checked {
                wavenumber: number(1),
                reduced_mass: number(2),
                infrared: number(3),
                water: number(4),
                oxyanion: number(5),
                metal: number(6),
                motion: cells[7].to_owned(),
                purity: number(8),
            }
        })
        .collect()
}

struct Computed {
    structure: Structure,
    modes: NormalModes,
    described: Vec<Description>,
}

fn computed(record: &HessianRecord, exchanges: &[Exchange]) -> Computed {
    let masses = masses(record, exchanges).unwrap();
    let modes = normal_modes(record, &masses);
    let structure = structure(&record.symbols, &record.geometry, &masses);
    let described = describe(record, &modes, &structure);
    Computed { structure, modes, described }
}

/// Ranges of modes whose wavenumbers touch within 0.05 cm⁻¹: their eigenvectors are free up to a rotation.
fn groups(list: &[Checked]) -> Vec<std::ops::Range<usize>> {
    let mut groups: Vec<std::ops::Range<usize>> = std::iter::once(0..1).collect();
    for k in 1..list.len() {
        if list[k].wavenumber - list[k - 1].wavenumber < 0.05 {
            groups.last_mut().unwrap().end = k + 1;
        } else {
            groups.push(k..k + 1);
        }
    }
    groups
}

#[test]
fn wavenumbers_strengths_and_fractions_are_those_of_the_check_lists() {
    for name in NAMES {
        let list = check_list(name);
        let found = computed(&record(name), &[]);
        assert_eq!(found.modes.modes.len(), list.len(), "{name}");
        for (mode, expected) in found.modes.modes.iter().zip(&list) {
            // The lists have four decimals; 0.01 leaves room for the last digits of the constants.
            assert!(
                (mode.wavenumber - expected.wavenumber).abs() < 0.01,
                "{name}: {} {}",
                mode.wavenumber,
                expected.wavenumber
            );
        }
        for group in groups(&list) {
            let sum = |f: &dyn Fn(usize) -> f64| group.clone().map(f).sum::<f64>();
            let at = format!("{name} near {}", list[group.start].wavenumber);
            let (got, expected) = (sum(&|k| found.modes.modes[k].infrared.unwrap()), sum(&|k| list[k].infrared));
            assert!((got - expected).abs() < 0.01 * expected + 2.0e-3, "{at}: infrared {got} for {expected}");
            let fraction = |k: usize, group: Group| {
                let both = found.structure.fragments.iter().zip(&found.described[k].fractions);
                both.filter(|(f, _)| f.group == group).map(|(_, share)| share).sum::<f64>()
            };
            for (kind, expected) in [
                (Group::Water, sum(&|k| list[k].water)),
                (Group::Oxyanion, sum(&|k| list[k].oxyanion)),
                (Group::Metal, sum(&|k| list[k].metal)),
            ] {
                let got = sum(&|k| fraction(k, kind));
                assert!((got - expected).abs() < 0.01, "{at}: {kind:?} {got} for {expected}");
            }
            // Σ 1/μ is free of the choice of eigenvectors.
            let (got, expected) =
                (sum(&|k| 1.0 / found.modes.modes[k].reduced_mass), sum(&|k| 1.0 / list[k].reduced_mass));
            assert!((got / expected - 1.0).abs() < 1.0e-3, "{at}: reduced mass {got} for {expected}");
        }
    }
}

#[test]
fn shares_of_local_motions_add_up_to_one() {
    for name in NAMES {
        let found = computed(&record(name), &[]);
        for described in &found.described {
            let sum: f64 = described.shares.iter().map(|s| s.share).sum();
            assert!((sum - 1.0).abs() < 1.0e-8, "{name}: {sum}");
        }
    }
}

#[test]
fn motions_agree_with_the_check_lists() {
    let mut differing = Vec::new();
    let mut modes = 0;
    for name in NAMES {
        let list = check_list(name);
        let found = computed(&record(name), &[]);
        for (k, expected) in list.iter().enumerate() {
            modes += 1;
            let got = found.described[k].words();
            // A detail (rock, sym, ...) that only one side tells is no disagreement.
            let agrees = got.starts_with(&expected.motion) || expected.motion.starts_with(&got);
            if !agrees {
                differing.push(format!(
                    "{name} {} at {:.1}: {got} {:.3} for {} {:.3}",
                    k + 1,
                    expected.wavenumber,
                    found.described[k].purity,
                    expected.motion,
                    expected.purity
                ));
            }
        }
    }
    assert!(differing.is_empty(), "{} of {modes}:\n{}", differing.len(), differing.join("\n"));
}

fn found_faults(record: &HessianRecord, formula: Option<&str>) -> String {
    let found = computed(record, &[]);
    let list = findings(record, &found.modes, &found.structure, &found.described, formula);
    list.iter().map(|f| format!("{:?}: {}\n", f.severity, f.message)).collect()
}

#[test]
fn the_bad_case_is_caught_and_the_good_ones_are_not_blamed() {
    let words = found_faults(&record("bad_not_a_minimum"), None);
    assert!(words.contains("2 imaginary modes (126.1i, 67.1i cm⁻¹)"), "{words}");
    assert!(words.contains("not at rest: the gradient reaches 8.7e-3"), "{words}");
    for (name, formula) in [("h2o", "H2O"), ("mg_h2o6", "Mg(H2O)6"), ("mg_h2o6_clo4_2", "Mg(ClO4)2.6H2O")] {
        assert_eq!(found_faults(&record(name), Some(formula)), "", "{name}");
    }
}

#[test]
fn planted_faults_are_told() {
    let mut heavy = record("h2o");
    heavy.masses = Some(vec![15.999, 1.008, 1.008]);
    assert_eq!(found_faults(&heavy, None), "", "1.008 and 15.999 are within the error of an isotope");
    let mut average = record("clo4");
    average.masses.as_mut().unwrap()[0] = 35.45;
    assert!(found_faults(&average, None).contains("is not that of an isotope"));
    let mut wrong = record("h2o");
    wrong.masses.as_mut().unwrap()[0] = 31.972;
    assert!(found_faults(&wrong, None).contains("wrong mass"));
    assert!(found_faults(&record("mg_h2o6"), Some("Mg(H2O)5")).contains("water count does not match the formula"));
    // One diagonal element off: neither invariant nor as symmetric as the tetrahedron.
    let mut broken = record("clo4");
    let size = 15;
    broken.hessian[3 * size + 3] += 0.05;
    let words = found_faults(&broken, None);
    assert!(words.contains("broken degeneracy") && words.contains("residual translations"), "{words}");
}

#[test]
fn unusable_files_are_refused_with_place_and_words() {
    let good = text("h2o.qcschema.json");
    let refuse = |from: &str, to: &str| {
        assert!(good.contains(from), "{from}");
        qcschema::read("x.json", &good.replacen(from, to, 1)).unwrap_err().to_string()
    };
    for (from, to, words) in [
        ("\"driver\":\"hessian\"", "\"driver\":\"gradient\"", "driver `hessian`"),
        ("\"schema_version\":1", "\"schema_version\":7", "schema_version 1"),
        ("\"qcschema_output\"", "\"qcschema_input\"", "schema_name `qcschema_output`"),
        ("\"return_result\":[", "\"return_result\":[NaN,", "NaN and Infinity are no JSON numbers"),
        ("\"return_result\":[", "\"return_result\":[1.0,", "81 numbers in return_result"),
        ("0.680246767939", "null", "null stands where the computation gave NaN"),
        ("-0.340123383955", "0.340123383955", "a symmetric Hessian"),
        ("1.4246221707423", "0.0", "bohr apart"),
    ] {
        let message = refuse(from, to);
        assert!(message.contains(words) && message.contains("x.json:1:"), "{from}: {message}");
    }
    assert!(qcschema::read("x.json", "").is_err() && qcschema::read("x.json", "[]").is_err());
}

#[test]
fn heavy_water_has_the_wavenumbers_of_the_product_rule() {
    // Teller-Redlich (Redlich 1935, as in Wilson, Decius & Cross 1955, 8-5): of the A1 modes of water the product of the
    // ratios is sqrt((m_H/m_D)² · M_D2O/M_H2O), of the B2 mode sqrt((m_H/m_D)² · M_D2O/M_H2O · I/I') for its rotation.
    // For all three together: ratio² = (m_H/m_D)^6 (M'/M)^3 Π(I'/I), over both planes' axes.
    let record = record("h2o");
    let light = computed(&record, &[]);
    let heavy = computed(&record, &[Exchange::from_text("H=D").unwrap()]);
    let product = |c: &Computed| c.modes.modes.iter().map(|m| m.wavenumber).product::<f64>();
    let moments = |masses: &[f64]| -> f64 {
        let total: f64 = masses.iter().sum();
        let centre: Vec<f64> =
            (0..3).map(|c| record.geometry.iter().zip(masses).map(|(p, m)| p[c] * m).sum::<f64>() / total).collect();
        // The molecule lies in the plane z = 0 with its axis along y.
        let (x, y) = record.geometry.iter().zip(masses).fold((0.0, 0.0), |(x, y), (p, m)| {
            (x + m * (p[0] - centre[0]).powi(2), y + m * (p[1] - centre[1]).powi(2))
        });
        x * y * (x + y)
    };
    let (m, n) = (&light.modes.masses, &heavy.modes.masses);
    let sum = |masses: &[f64]| masses.iter().sum::<f64>();
    let expected = ((m[1] / n[1]).powi(6) * (sum(n) / sum(m)).powi(3) * moments(n) / moments(m)).sqrt();
    let found = product(&heavy) / product(&light);
    assert!((found / expected - 1.0).abs() < 1.0e-8, "{found} for {expected}");
    assert_eq!(heavy.structure.fragments[0].name, "D2O");
}
