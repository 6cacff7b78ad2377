//! Are the groups right? Orthogonality, classes, and every row of independently computed tables.

use std::collections::BTreeMap;
use std::path::Path;

use bandwright::physics::symmetry::PointGroup;
use bandwright::physics::symmetry::correlation::{content_text, embeddings, induction, restriction};

/// The 32 crystallographic groups and others.
const GROUPS: [&str; 44] = [
    "C1", "Ci", "Cs", "C2", "C2h", "C2v", "D2", "D2h", "C4", "S4", "C4h", "D4", "C4v", "D2d", "D4h", "C3", "S6", "D3",
    "C3v", "D3d", "C6", "C3h", "C6h", "D6", "C6v", "D3h", "D6h", "T", "Th", "O", "Td", "Oh", "C5", "C5v", "D5", "D5h",
    "D5d", "C7", "S8", "D4d", "I", "Ih", "Cinfv", "Dinfh",
];

fn group(name: &str) -> PointGroup {
    PointGroup::named(name).unwrap_or_else(|| panic!("{name} is not known"))
}

fn rows(name: &str) -> Vec<BTreeMap<String, String>> {
    let mut reader =
        csv::ReaderBuilder::new().comment(Some(b'#')).from_path(Path::new("tests/data").join(name)).unwrap();
    let header = reader.headers().unwrap().clone();
    reader
        .records()
        .map(|record| header.iter().map(str::to_owned).zip(record.unwrap().iter().map(str::to_owned)).collect())
        .collect()
}

/// `A1+2E` as sorted parts.
fn content(text: &str) -> Vec<String> {
    let mut parts = Vec::new();
    for part in text.split('+').filter(|p| !p.is_empty()) {
        let digits: String = part.chars().take_while(char::is_ascii_digit).collect();
        let times: usize = digits.parse().unwrap_or(1);
        parts.extend(std::iter::repeat_n(part[digits.len()..].to_owned(), times));
    }
    parts.sort();
    parts
}

#[test]
fn characters_are_orthogonal_and_fill_the_group() {
    for name in GROUPS {
        let g = group(name);
        let n = g.order() as f64;
        let mut squares = 0.0;
        for a in g.irreps() {
            for b in g.irreps() {
                let overlap: f64 =
                    g.element_characters(a).iter().zip(g.element_characters(b)).map(|(x, y)| x * y).sum::<f64>() / n;
                if a == b {
                    // 1, or 2 for a separably degenerate pair of complex species counted as one.
                    assert!((overlap - 1.0).abs() < 1.0e-9 || (overlap - 2.0).abs() < 1.0e-9, "{name}: {overlap}");
                    squares += f64::from(g.dimension(a)).powi(2) / overlap;
                } else {
                    assert!(overlap.abs() < 1.0e-9, "{name}: {} and {}", g.irrep_name(a), g.irrep_name(b));
                }
            }
        }
        assert!((squares - n).abs() < 1.0e-6, "{name}: the squares of the dimensions sum to {squares} of {n}");
        // Characters are class functions.
        for irrep in g.irreps() {
            for (r, class) in g.class_of_elements().iter().enumerate() {
                assert!((g.element_characters(irrep)[r] - g.characters(irrep)[*class]).abs() < 1.0e-9, "{name}");
            }
        }
    }
}

#[test]
fn orders_of_the_crystallographic_groups_are_the_textbook_ones() {
    // Orders: any table of point groups (common practice).
    for (name, order, classes) in [
        ("C1", 1, 1),
        ("C2h", 4, 4),
        ("D2d", 8, 5),
        ("D3h", 12, 6),
        ("D6h", 24, 12),
        ("Td", 24, 5),
        ("Th", 24, 8),
        ("Oh", 48, 10),
        ("Ih", 120, 10),
        ("D5h", 20, 8),
    ] {
        let g = group(name);
        assert_eq!((g.order(), g.classes().len()), (order, classes), "{name}: {:?}", g.classes());
    }
}

#[test]
fn symmetrised_powers_equal_every_row() {
    let list = rows("symmetric_power_checks.csv");
    assert!(list.len() >= 160);
    for row in list {
        let g = group(&row["group"]);
        let irrep = g.irrep(&row["irrep"]).unwrap_or_else(|| panic!("{} in {}", row["irrep"], row["group"]));
        let found = g.level_species(&[(irrep, row["quanta"].parse().unwrap())]);
        assert_eq!(content(&content_text(&g, &found)), content(&row["symmetric_power"]), "{row:?}");
    }
}

#[test]
fn direct_products_equal_every_row() {
    let list = rows("direct_product_checks.csv");
    assert!(list.len() >= 55);
    for row in list {
        let g = group(&row["group"]);
        let found = g.product(&[g.irrep(&row["irrep_a"]).unwrap(), g.irrep(&row["irrep_b"]).unwrap()]);
        assert_eq!(content(&content_text(&g, &found)), content(&row["direct_product"]), "{row:?}");
    }
}

#[test]
fn activities_equal_every_row() {
    let list = rows("activity_checks.csv");
    assert!(list.len() >= 80);
    for row in list {
        let g = group(&row["group"]);
        let irrep = g.irrep(&row["irrep"]).unwrap_or_else(|| panic!("{} in {}", row["irrep"], row["group"]));
        let word = |yes: bool| if yes { "yes" } else { "no" };
        assert_eq!(word(g.infrared(irrep)), row["infrared_active"], "infrared {row:?}");
        assert_eq!(word(g.raman(irrep)), row["raman_active"], "Raman {row:?}");
        assert_eq!(word(g.rotation(irrep)), row["contains_rotation"], "rotation {row:?}");
        assert_eq!(g.dimension(irrep).to_string(), row["degeneracy"], "{row:?}");
        // The two roads to activity agree: reduction of the vector and projection of its components.
        assert_eq!(g.infrared(irrep), !g.polarisation(irrep).is_empty(), "{row:?}");
        assert_eq!(g.raman(irrep), !g.tensor(irrep).is_empty(), "{row:?}");
    }
}

#[test]
fn restrictions_to_sites_are_among_the_embeddings() {
    let list = rows("site_correlation_checks.csv");
    assert!(list.len() >= 160);
    let mut pairs: BTreeMap<(String, String), Vec<BTreeMap<String, String>>> = BTreeMap::new();
    for row in list {
        pairs.entry((row["group"].clone(), row["subgroup"].clone())).or_default().push(row);
    }
    for ((name, sub), rows) in pairs {
        let (g, h) = (group(&name), group(sub.split('(').next().unwrap()));
        let all = embeddings(&g, &h);
        assert!(!all.is_empty(), "{sub} does not lie in {name}");
        // One embedding must give all rows of the pair at once.
        let fits = all.iter().any(|e| {
            rows.iter().all(|row| {
                let found = restriction(&g, &h, e, g.irrep(&row["irrep"]).unwrap());
                content(&content_text(&h, &found)) == content(&row["restriction"])
            })
        });
        assert!(fits, "no embedding of {sub} in {name} gives {rows:?}");
    }
}

#[test]
fn parity_rules_follow() {
    let g = group("Oh");
    let species = |name: &str| g.irrep(name).unwrap();
    // Two quanta of u modes are g, hence silent in infrared; u with g is active (common practice).
    let overtone = g.level_species(&[(species("F1u"), 2)]);
    assert!(overtone.iter().all(|(i, _)| !g.infrared(*i)));
    assert!(g.forbidden_reason(&[(species("F1u"), 2)]).contains("even overtone of a u mode is g"));
    let mixed = g.level_species(&[(species("F1u"), 1), (species("A1g"), 1)]);
    assert!(mixed.iter().any(|(i, _)| g.infrared(*i)));
    for irrep in g.irreps() {
        assert!(!(g.infrared(irrep) && g.raman(irrep)), "mutual exclusion: {}", g.irrep_name(irrep));
    }
}

#[test]
fn a_linear_bend_gives_the_angular_momenta_of_its_quanta() {
    // n quanta of π: l = n, n − 2, ... (Herzberg 1945, from memory): 2π_u = Σg+ + Δg, 3π_u = Π_u + Φ_u.
    let g = group("D∞h");
    let pi = g.irrep("pi_u").unwrap();
    let text = |n| content_text(&g, &g.level_species(&[(pi, n)]));
    assert_eq!(text(2), "sigma_g++delta_g");
    assert_eq!(text(3), "pi_u+phi_u");
    assert!(g.infrared(pi) && g.infrared(g.irrep("sigma_u+").unwrap()) && !g.infrared(g.irrep("sigma_g+").unwrap()));
}

#[test]
fn gypsum_internal_modes_follow_from_its_sites() {
    // Gypsum, factor group C2h with two formula units in the primitive cell: sulfate on C2 sites, water on general
    // positions. Internal sulfate modes ν1 A1, ν2 E, ν3 F2, ν4 F2 of Td become Ag/Au and Bg/Bu:
    // 9 internal modes x 2 ions = 5 Ag + 5 Au + 4 Bg + 4 Bu; every internal mode of water gives Ag + Au + Bg + Bu.
    // (Factor-group counts as usually given for gypsum: from memory.)
    let (td, c2, c2h) = (group("Td"), group("C2"), group("C2h"));
    let site = &embeddings(&td, &c2)[0];
    let crystal = &embeddings(&c2h, &c2)[0];
    let mut counts: BTreeMap<String, u32> = BTreeMap::new();
    for molecular in ["A1", "E", "F2", "F2"] {
        for (s, times) in restriction(&td, &c2, site, td.irrep(molecular).unwrap()) {
            for (f, n) in induction(&c2h, &c2, crystal, s) {
                *counts.entry(c2h.irrep_name(f).to_owned()).or_default() += n * times;
            }
        }
    }
    let expected: BTreeMap<String, u32> =
        [("Ag", 5), ("Au", 5), ("Bg", 4), ("Bu", 4)].into_iter().map(|(n, k)| (n.to_owned(), k)).collect();
    assert_eq!(counts, expected);
    let c1 = group("C1");
    let general = induction(&c2h, &c1, &embeddings(&c2h, &c1)[0], c1.irrep("A").unwrap());
    assert_eq!(content(&content_text(&c2h, &general)), ["Ag", "Au", "Bg", "Bu"]);
}

#[test]
fn names_are_read_as_people_write_them() {
    for (name, species) in
        [("c2v", "b1"), ("Td", "T2"), ("D3h", "E\""), ("D3h", "a2''"), ("D_inf_h", "Σu+"), ("C∞v", "π")]
    {
        let g = group(name);
        assert!(g.irrep(species).is_some(), "{species} in {name}");
    }
    assert!(PointGroup::named("C9x").is_none() && PointGroup::named("").is_none() && PointGroup::named("Q").is_none());
    assert!(PointGroup::named("∞").is_none() && PointGroup::named("C").is_none() && PointGroup::named("D1h").is_none());
}
