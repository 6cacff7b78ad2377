//! Does second-order theory give the constants that explicit sums and variational calculations give?

use std::collections::BTreeMap;
use std::path::Path;

use bandwright::level::Level;
use bandwright::mode::{ConstantKind, Origin};
use bandwright::physics::perturbation::{self, Criterion};
use bandwright::physics::position::{Model, Resonance, Sourced};
use bandwright::physics::{resonance, transition_moment};
use bandwright::read::force_field::{self, ForceField};

type Row = BTreeMap<String, String>;

fn fixture(name: &str) -> String {
    format!("{}/tests/data/{name}", env!("CARGO_MANIFEST_DIR"))
}

/// The rows of a fixture; the first line names its source.
fn rows(name: &str) -> Vec<Row> {
    let mut reader = csv::ReaderBuilder::new().comment(Some(b'#')).from_path(fixture(name)).unwrap();
    let header = reader.headers().unwrap().clone();
    let list: Vec<Row> = reader
        .records()
        .map(|record| header.iter().map(str::to_owned).zip(record.unwrap().iter().map(str::to_owned)).collect())
        .collect();
    assert!(!list.is_empty(), "{name} is empty");
    list
}

fn number(row: &Row, column: &str) -> f64 {
    row[column].parse().unwrap_or_else(|_| panic!("{column}: {}", row[column]))
}

/// A field built from entries (quantity, one-based indices, value).
#[derive(Default)]
struct Builder(ForceField);

impl Builder {
    fn add(&mut self, quantity: &str, indices: &[usize], value: f64) {
        let zero = |k: usize| indices[k] - 1;
        match quantity {
            "omega" => {
                let i = zero(0);
                self.0.omega.resize(self.0.omega.len().max(i + 1), 0.0);
                self.0.omega[i] = value;
            }
            "phi3" => {
                let mut key = [zero(0), zero(1), zero(2)];
                key.sort_unstable();
                self.0.cubic.insert(key, value);
            }
            "phi4" => {
                let mut key = [zero(0), zero(1), zero(2), zero(3)];
                key.sort_unstable();
                self.0.quartic.insert(key, value);
            }
            other => panic!("{other}"),
        }
    }

    fn axis(name: &str) -> usize {
        ["x", "y", "z"].iter().position(|a| *a == name).unwrap()
    }

    fn done(mut self) -> ForceField {
        self.0.names = (1..=self.0.omega.len()).map(|i| format!("q{i}")).collect();
        self.0.species = vec![None; self.0.omega.len()];
        self.0.motions = vec![bandwright::mode::Motion::Other; self.0.omega.len()];
        self.0.moiety = "molecule".into();
        self.0
    }
}

fn digits(text: &str) -> Vec<usize> {
    text.chars().filter(char::is_ascii_digit).map(|c| c.to_digit(10).unwrap() as usize).collect()
}

/// A field of `vpt2_fields.csv`.
fn synthetic(name: &str) -> ForceField {
    let mut builder = Builder::default();
    for row in rows("vpt2_fields.csv").iter().filter(|r| r["field"] == name) {
        let value = number(row, "value_cm1_or_dimensionless");
        match row["quantity"].as_str() {
            "B" => builder.0.rotational[Builder::axis(&row["indices"])] = Some(value),
            "zeta" => {
                let (axis, pair) = row["indices"].split_once(':').unwrap();
                let pair = digits(pair);
                builder.0.zeta[Builder::axis(axis)].insert((pair[0] - 1, pair[1] - 1), value);
            }
            quantity => builder.add(quantity, &digits(&row["indices"]), value),
        }
    }
    builder.done()
}

#[test]
fn constants_equal_explicit_second_order_sums() {
    let mut seen = 0;
    for row in rows("vpt2_checks.csv") {
        let mut field = synthetic(&row["field"]);
        let constants = perturbation::constants(&field, Criterion::Never).unwrap();
        let quantity = row["quantity"].as_str();
        let got = match quantity {
            "G0" => constants.g0,
            "zero_point_second_order" => constants.zero_point(&field),
            "x_tt" | "g_tt = x_12/2 - x_11" => {
                // The pair becomes one degenerate mode.
                field.degenerate = vec![vec![0, 1]];
                let table = perturbation::table(&field, Criterion::Never).unwrap().value;
                let kind = if quantity == "x_tt" { ConstantKind::X } else { ConstantKind::G };
                table.constant(kind, 0, 0).unwrap().value.0
            }
            _ => {
                let index = digits(quantity);
                if quantity.starts_with("nu") {
                    constants.fundamental(&field, index[0] - 1)
                } else {
                    constants.x(index[0] - 1, index[1] - 1)
                }
            }
        };
        // The file prints eight decimals; half of the last one, and rounding.
        assert!((got - number(&row, "formula_value_cm1")).abs() < 1.0e-8, "{} {quantity}: {got}", row["field"]);
        if !row["explicit_second_order_sum_cm1"].is_empty() {
            assert!(
                (got - number(&row, "explicit_second_order_sum_cm1")).abs() < 2.0e-8,
                "{} {quantity}",
                row["field"]
            );
        }
        seen += 1;
    }
    assert_eq!(seen, 43);
}

#[test]
fn a_degenerate_mode_has_one_fundamental() {
    let mut field = synthetic("E_mode_pair");
    let by_components = perturbation::constants(&field, Criterion::Never).unwrap().fundamental(&field, 0);
    field.degenerate = vec![vec![0, 1]];
    let table = perturbation::table(&field, Criterion::Never).unwrap().value;
    assert_eq!(table.modes.len(), 1);
    assert_eq!(table.modes[0].degeneracy, 2);
    assert!((table.modes[0].wavenumber.inverse_cm() - by_components).abs() < 1e-9);
}

#[test]
fn morse_oscillators_come_out_exactly() {
    for row in rows("morse_checks.csv") {
        let mut builder = Builder::default();
        builder.add("omega", &[1], number(&row, "omega_cm1"));
        builder.add("phi3", &[1, 1, 1], number(&row, "phi3_cm1"));
        builder.add("phi4", &[1, 1, 1, 1], number(&row, "phi4_cm1"));
        let field = builder.done();
        let constants = perturbation::constants(&field, Criterion::default()).unwrap();
        // The cubic constant is printed to 10⁻⁶ of some 2000 cm⁻¹.
        assert!((constants.x(0, 0) + number(&row, "omega_x_cm1")).abs() < 1.0e-6, "{}", row["case"]);
        assert!(constants.g0.abs() < 1.0e-6, "{}: G0 {}", row["case"], constants.g0);
        // The column G0_cm1 of the file is the zero-point level; T1 to T6 are the terms above it.
        assert!((constants.zero_point(&field) - number(&row, "G0_cm1")).abs() < 1.0e-5, "{}", row["case"]);
        let nu = constants.fundamental(&field, 0);
        for v in 1..=6 {
            let term = f64::from(v) * nu + f64::from(v * (v - 1)) * constants.x(0, 0);
            assert!((term - number(&row, &format!("T{v}_cm1"))).abs() < 1.0e-4, "{} v = {v}", row["case"]);
        }
    }
}

#[test]
fn water_of_a_published_valence_field_has_its_constants() {
    let mut builder = Builder::default();
    let list = rows("h2o_valence_field.csv");
    for row in &list {
        let indices: Vec<usize> = row["indices"].split(' ').filter_map(|i| i.parse().ok()).collect();
        match row["quantity"].as_str() {
            quantity @ ("omega" | "phi3" | "phi4") => builder.add(quantity, &indices, number(row, "value")),
            "B_e" => builder.0.rotational[Builder::axis(&row["indices"])] = Some(number(row, "value")),
            "zeta" => {
                let axis = row["indices"].split(' ').next().unwrap();
                builder.0.zeta[Builder::axis(axis)].insert((indices[0] - 1, indices[1] - 1), number(row, "value"));
            }
            _ => {}
        }
    }
    let field = builder.done();
    let constants = perturbation::constants(&field, Criterion::Never).unwrap();
    let mut seen = 0;
    for row in &list {
        let index: Vec<usize> = row["indices"].split(' ').filter_map(|i| i.parse().ok()).collect();
        let got = match row["quantity"].as_str() {
            "x_vpt2" => constants.x(index[0] - 1, index[1] - 1),
            "nu_vpt2" => constants.fundamental(&field, index[0] - 1),
            _ => continue,
        };
        seen += 1;
        // Inputs are printed to 10⁻⁶, results too; derivatives of x by the inputs are below one.
        assert!((got - number(row, "value")).abs() < 5.0e-6, "{} {}: {got}", row["quantity"], row["indices"]);
    }
    assert_eq!(seen, 9);
}

#[test]
fn a_computed_field_of_water_is_read_and_has_its_constants_and_levels() {
    // CCSD(T)/cc-pVTZ field and, from an independent program, its second-order constants and levels.
    let field = force_field::read_file(Path::new(&fixture("h2o_field.json"))).unwrap().value;
    let constants = perturbation::constants(&field, Criterion::Never).unwrap();
    let text = std::fs::read_to_string(fixture("h2o_field_levels.json")).unwrap();
    let expected: serde_json::Value = serde_json::from_str(&text).unwrap();
    for i in 0..3 {
        for j in 0..3 {
            let x = expected["x_matrix_with_coriolis"][i][j].as_f64().unwrap();
            // Both are printed to 10⁻⁴ cm⁻¹.
            assert!((constants.x(i, j) - x).abs() < 1.0e-3, "x {i} {j}: {} against {x}", constants.x(i, j));
        }
    }
    // That file leaves −¼ (A + B + C) out of G0.
    let rotation = 0.25 * field.rotational.iter().flatten().sum::<f64>();
    let g0 = expected["G0_with_coriolis"].as_f64().unwrap();
    assert!((constants.g0 + rotation - g0).abs() < 1.0e-3, "{} against {g0}", constants.g0 + rotation);

    let table = perturbation::table(&field, Criterion::Never).unwrap().value;
    let mut model = Model::harmonic(table.modes.iter().map(|m| m.wavenumber.inverse_cm()).collect());
    for k in &table.constants {
        assert_eq!(k.kind, ConstantKind::X);
        model.x_mut(k.a, k.b).value = k.value.0;
    }
    let levels = expected["perturbation_levels"]["levels"].as_array().unwrap();
    assert!(levels.len() > 15);
    for level in levels {
        let v: Vec<(usize, u8)> =
            level[0].as_array().unwrap().iter().enumerate().map(|(i, v)| (i, v.as_u64().unwrap() as u8)).collect();
        let position = model.position(&Level::from_quanta(&v));
        // Ten quanta times the rounding of the printed constants.
        assert!((position - level[2].as_f64().unwrap()).abs() < 5.0e-3, "{v:?}: {position}");
    }
}

#[test]
fn water_gets_its_darling_dennison_pair_from_the_field() {
    let field = force_field::read_file(Path::new(&fixture("h2o_field.json"))).unwrap().value;
    let noted = perturbation::table(&field, Criterion::default()).unwrap();
    let pair = noted.value.constants.iter().find(|k| k.kind == ConstantKind::DarlingDennison).unwrap();
    // K/4 = −39.9 cm⁻¹ for this field in an independent calculation, so the element K/2 is −80; observed −74.
    assert!((pair.value.0 + 79.8).abs() < 0.2, "{}", pair.value.0);
    assert!(noted.notes.iter().any(|n| n.0.contains("Darling-Dennison pair")), "{:?}", noted.notes);
    // 2 bend and stretch are 500 cm⁻¹ apart: the generator criterion takes them out, the other does not.
    let fermi = |criterion| {
        let table = perturbation::table(&field, criterion).unwrap().value;
        table.constants.iter().filter(|k| k.kind == ConstantKind::Fermi).count()
    };
    assert_eq!(fermi(Criterion::default()), 0);
    assert_eq!(fermi(Criterion::Generator(0.076)), 1);
}

#[test]
fn darling_dennison_constants_equal_numerical_elements() {
    let field = synthetic("dd_field");
    let mut seen = 0;
    for row in rows("resonance_element_checks.csv").iter().filter(|r| r["type"].starts_with("darling")) {
        let (name, value) = row["constant_cm1"].split_once('=').unwrap();
        let index = digits(name);
        let k = perturbation::plain_darling_dennison(&field, index[0] - 1, index[2] - 1);
        assert!((k - value.parse::<f64>().unwrap()).abs() < 1.0e-7, "{name}: {k}");
        seen += 1;
    }
    assert_eq!(seen, 3);
}

#[test]
fn criteria_flag_what_the_check_file_flags() {
    for row in rows("fermi_criterion_checks.csv") {
        let phi = number(&row, "phi_cm1");
        let element = if row["type"] == "2:1" { phi / 4.0 } else { phi / 8.0_f64.sqrt() };
        let d = number(&row, "denominator_cm1");
        assert!((perturbation::excess_of(element, d) - number(&row, "test_quantity_cm1")).abs() < 1.0e-6);
        let flagged = row["flag_at_1cm1_and_200cm1_window"] == "yes";
        assert_eq!(Criterion::default().holds(element, d), flagged, "{row:?}");
        // What the test quantity stands for: second order minus the exact shift of two levels.
        let exact = 0.5 * ((d * d + 4.0 * element * element).sqrt() - d);
        assert!((exact - number(&row, "two_level_exact_shift")).abs() < 1.0e-5);
    }
}

/// The two-mode field of `deperturbation_checks.csv`.
fn resonant_field() -> ForceField {
    let row = &rows("deperturbation_checks.csv")[0];
    let mut builder = Builder::default();
    for part in row["parameters"].split(';') {
        let (key, value) = part.split_once('=').unwrap();
        if key == "omega" {
            for (i, w) in value.split(',').enumerate() {
                builder.add("omega", &[i + 1], w.parse().unwrap());
            }
        } else {
            let index = digits(key);
            builder.add(if index.len() == 3 { "phi3" } else { "phi4" }, &index, value.parse().unwrap());
        }
    }
    builder.done()
}

#[test]
fn a_resonance_taken_out_and_diagonalised_meets_the_variational_levels() {
    let field = resonant_field();
    let constants = perturbation::constants(&field, Criterion::default()).unwrap();
    let plain = perturbation::constants(&field, Criterion::Never).unwrap();
    let taken: Vec<_> = constants.cubic.iter().filter(|r| r.removed).collect();
    assert_eq!(taken.len(), 1);
    assert_eq!((taken[0].upper, taken[0].lower), (1, [0, 0]));
    assert!((taken[0].element - 70.0 / 4.0).abs() < 1e-12);

    let mut model = Model::harmonic(vec![constants.fundamental(&field, 0), constants.fundamental(&field, 1)]);
    for (i, j) in [(0, 0), (0, 1), (1, 1)] {
        model.x_mut(i, j).value = constants.x(i, j);
    }
    model.resonances = vec![Resonance {
        kind: ConstantKind::Fermi,
        a: 1,
        b: 0,
        c: None,
        element: Sourced { value: taken[0].element, sigma: 0.0, origin: Origin::Computed, source: String::new() },
    }];
    let mut levels: Vec<f64> = vec![0.0];
    for polyad in 1..=6 {
        levels.extend(resonance::polyad(&model, &Level::from_quanta(&[(0, polyad)])).iter().map(|m| m.position));
    }
    levels.sort_by(f64::total_cmp);
    let mut seen = 0;
    for row in rows("deperturbation_checks.csv") {
        if row["parameters"] == "deperturbed constants" {
            let expected = number(&row, "deperturbed_plus_diagonalised_cm1");
            let got = match row["state_rank"].as_str() {
                "x_11" => constants.x(0, 0),
                "x_12" => constants.x(0, 1),
                "x_22" => constants.x(1, 1),
                "G0" => constants.g0,
                "x_11 plain" => plain.x(0, 0),
                "x_12 plain" => plain.x(0, 1),
                "G0 plain" => plain.g0,
                other => panic!("{other}"),
            };
            assert!((got - expected).abs() < 1.0e-6, "{}: {got} against {expected}", row["state_rank"]);
        } else {
            let rank: usize = row["state_rank"].parse().unwrap();
            let got = levels[rank] + constants.zero_point(&field);
            assert!((got - number(&row, "deperturbed_plus_diagonalised_cm1")).abs() < 2.0e-5, "{rank}: {got}");
            // Six bend quanta: plain second order is wrong by 154 cm⁻¹, this by less than 4.5.
            assert!((got - number(&row, "variational_cm1")).abs() < 4.5, "{rank}");
        }
        seen += 1;
    }
    assert_eq!(seen, 17);
}

#[test]
fn an_exact_resonance_has_no_plain_answer_but_a_treated_one() {
    let mut field = resonant_field();
    field.omega[1] = 2.0 * field.omega[0];
    let refused = perturbation::constants(&field, Criterion::Never).unwrap_err().to_string();
    assert!(refused.contains("exactly resonant"), "{refused}");
    let treated = perturbation::constants(&field, Criterion::default()).unwrap();
    assert!(treated.x.iter().all(|x| x.is_finite()) && treated.g0.is_finite());
}

#[test]
fn a_darling_dennison_constant_stays_finite_beside_a_fermi_resonance() {
    // K of a pair whose common Fermi partner is taken out must not feel the small denominator.
    let mut builder = Builder::default();
    for (i, w) in [1000.0, 1030.0, 2001.0].into_iter().enumerate() {
        builder.add("omega", &[i + 1], w);
    }
    builder.add("phi3", &[1, 1, 3], 60.0);
    builder.add("phi3", &[2, 2, 3], 60.0);
    let field = builder.done();
    let plain = perturbation::plain_darling_dennison(&field, 0, 1);
    let treated = perturbation::constants(&field, Criterion::default()).unwrap();
    let k = treated.pairings.iter().find(|p| p.modes == [0, 1]).unwrap().k;
    assert!(plain.abs() > 200.0, "{plain}");
    assert!(k.abs() < 10.0, "{k}");
}

#[test]
fn two_quanta_amplitudes_equal_full_diagonalisation() {
    let list = rows("transition_amplitude_checks.csv");
    let text = list[0]["formula_amplitude"].clone();
    let mut builder = Builder::default();
    let mut dipole = Vec::new();
    let mut second = BTreeMap::new();
    for part in text.split(';') {
        // `key=value` or the continuation `indices:value` of the key before.
        let (key, value) = part.split_once('=').unwrap_or(("", part));
        match key {
            "omega" => {
                value.split(',').enumerate().for_each(|(i, w)| builder.add("omega", &[i + 1], w.parse().unwrap()))
            }
            "mu_i" => dipole = value.split(',').map(|m| [m.parse::<f64>().unwrap(), 0.0, 0.0]).collect(),
            _ => {
                let (index, value) = value.split_once(':').unwrap();
                let (index, value) = (digits(index), value.parse::<f64>().unwrap());
                if index.len() == 2 {
                    second.insert((index[0] - 1, index[1] - 1), [value, 0.0, 0.0]);
                } else {
                    builder.add("phi3", &index, value);
                }
            }
        }
    }
    let mut field = builder.done();
    field.dipole = dipole;
    field.dipole_second = second;
    let mut seen = 0;
    for row in &list[1..] {
        let index = digits(&row["transition"]);
        let amplitude = transition_moment::two_quanta(&field, index[0] - 1, index[1] - 1)[0];
        assert!((amplitude - number(row, "numeric_amplitude")).abs() < 6.0e-9, "{}: {amplitude}", row["transition"]);
        seen += 1;
    }
    assert_eq!(seen, 6);
    assert!((transition_moment::fundamental(&field, 2)[0] - 0.5_f64.sqrt()).abs() < 1e-12);
}
