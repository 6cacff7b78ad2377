//! A geometry becomes moieties: waters, oxyanions, ammonium, metals with what they coordinate, and hydrogen bonds.

use std::collections::BTreeMap;

use itertools::Itertools;
use nalgebra::Vector3;

use super::elements::{self, Element};
use super::normal_modes::BOHR_IN_ANGSTROM;

/// A bond is at most this times the sum of the covalent radii (common practice, no source: 1.2 to 1.3).
const BOND: f64 = 1.25;

/// A metal coordinates an oxygen up to this times the sum of the radii (a judgement of this project: Mg–O 2.07 Å in the
/// hexaaqua ion is 1.0, the long bonds of alkali hydrates reach 1.2).
const COORDINATION: f64 = 1.3;

/// A hydrogen bond has H···O below this, Å, and O–H···O above 120° (Steiner, Angew. Chem. Int. Ed. 41, 48 (2002): moderate
/// and weak bonds to 2.2 and 3.2 Å; from memory; 2.5 keeps what couples).
const HYDROGEN_BOND: f64 = 2.5;

/// What a group of atoms is.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub enum Group {
    /// H2O.
    Water,
    /// XOn or HXOn without its proton: one centre, two to four oxygens.
    Oxyanion,
    /// NH4.
    Ammonium,
    /// A bare metal ion.
    Metal,
    /// Anything else.
    Other,
}

/// One moiety of a geometry.
#[derive(Clone, Debug, PartialEq)]
pub struct Fragment {
    /// Name: `H2O-1`, `ClO4-2`, `Mg`; no number when it is alone of its kind.
    pub name: String,
    /// What it is.
    pub group: Group,
    /// Its atoms, the centre first.
    pub atoms: Vec<usize>,
    /// Bonds inside it.
    pub bonds: Vec<(usize, usize)>,
}

/// A hydrogen bond.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct HydrogenBond {
    /// Number of the fragment that gives the proton.
    pub donor: usize,
    /// Number of the fragment that takes it.
    pub acceptor: usize,
    /// H···O, Å.
    pub length: f64,
}

/// The moieties of a geometry and what ties them.
#[derive(Clone, Debug, PartialEq)]
pub struct Structure {
    /// Fragments, in order of their first atom.
    pub fragments: Vec<Fragment>,
    /// Fragment of each atom.
    pub fragment_of: Vec<usize>,
    /// For each fragment that a metal coordinates: the metal's fragment and the coordinated atom (nearest pair).
    pub coordination: Vec<Option<(usize, usize)>>,
    /// Name of the metal–oxygen skeleton of each metal fragment: `MgO6`.
    pub skeletons: BTreeMap<usize, String>,
    /// Hydrogen bonds between fragments, by donor, acceptor, length.
    pub hydrogen_bonds: Vec<HydrogenBond>,
}

impl Structure {
    /// Number of waters.
    pub fn waters(&self) -> usize {
        self.fragments.iter().filter(|f| f.group == Group::Water).count()
    }
}

/// Moieties of atoms at `geometry` (bohr). `masses` (u) tell deuterium from hydrogen in the names.
///
/// Unknown elements count as metals of radius 1.5 Å: they take part in no molecule.
pub fn structure(symbols: &[String], geometry: &[[f64; 3]], masses: &[f64]) -> Structure {
    let n = symbols.len();
    let unknown = Element { symbol: "X", mass: 0.0, radius: 1.5, metal: true };
    let kinds: Vec<Element> = symbols.iter().map(|s| elements::named(s).copied().unwrap_or(unknown)).collect();
    let at = |i: usize| Vector3::from(geometry[i]) * BOHR_IN_ANGSTROM;
    let distance = |i: usize, j: usize| (at(i) - at(j)).norm();
    // A hydrogen has one partner, its nearest; everything else bonds within reach.
    let mut bonds: Vec<(usize, usize)> = Vec::new();
    for (i, j) in (0..n).tuple_combinations() {
        let (a, b) = (&kinds[i], &kinds[j]);
        let hydrogens = [a, b].iter().filter(|e| e.symbol == "H").count();
        if !a.metal && !b.metal && hydrogens == 0 && distance(i, j) < BOND * (a.radius + b.radius) {
            bonds.push((i, j));
        }
    }
    for h in (0..n).filter(|h| kinds[*h].symbol == "H") {
        let partner = (0..n)
            .filter(|j| *j != h && !kinds[*j].metal)
            .min_by(|a, b| distance(h, *a).total_cmp(&distance(h, *b)))
            .filter(|j| distance(h, *j) < 1.35 * (kinds[h].radius + kinds[*j].radius));
        if let Some(j) = partner {
            bonds.push((h.min(j), h.max(j)));
        }
    }
    bonds.sort_unstable();
    bonds.dedup();
    let mut fragment_of: Vec<usize> = (0..n).collect();
    for (i, j) in &bonds {
        let (from, to) = (fragment_of[*i].max(fragment_of[*j]), fragment_of[*i].min(fragment_of[*j]));
        fragment_of.iter_mut().filter(|f| **f == from).for_each(|f| *f = to);
    }
    let roots: Vec<usize> = fragment_of.iter().copied().sorted_unstable().dedup().collect();
    for fragment in &mut fragment_of {
        *fragment = roots.iter().position(|r| r == fragment).unwrap_or(0);
    }
    let mut fragments: Vec<Fragment> = (0..roots.len())
        .map(|number| {
            let atoms: Vec<usize> = (0..n).filter(|a| fragment_of[*a] == number).collect();
            let inner: Vec<(usize, usize)> = bonds.iter().copied().filter(|(i, _)| fragment_of[*i] == number).collect();
            fragment(atoms, inner, &kinds, masses)
        })
        .collect();
    number_names(&mut fragments);
    let metals: Vec<usize> = (0..fragments.len()).filter(|f| fragments[*f].group == Group::Metal).collect();
    let mut coordinated: BTreeMap<usize, Vec<usize>> = BTreeMap::new();
    let coordination: Vec<Option<(usize, usize)>> = fragments
        .iter()
        .map(|fragment| {
            let mut nearest: Option<(usize, usize, f64)> = None;
            for (metal, atom) in metals.iter().cartesian_product(&fragment.atoms) {
                let centre = fragments[*metal].atoms[0];
                let reach = COORDINATION * (kinds[centre].radius + kinds[*atom].radius);
                let apart = distance(centre, *atom);
                if fragment.group != Group::Metal && kinds[*atom].symbol != "H" && apart < reach {
                    coordinated.entry(*metal).or_default().push(*atom);
                    if nearest.is_none_or(|(.., best)| apart < best) {
                        nearest = Some((*metal, *atom, apart));
                    }
                }
            }
            nearest.map(|(metal, atom, _)| (metal, atom))
        })
        .collect();
    let skeletons = coordinated
        .iter()
        .map(|(metal, atoms)| {
            let counts = atoms.iter().map(|a| kinds[*a].symbol).counts();
            let ligands =
                counts.iter().sorted().map(|(s, n)| if *n == 1 { (*s).to_owned() } else { format!("{s}{n}") });
            let own = &fragments[*metal].name;
            let (symbol, number) =
                own.split_once('-').map_or((own.as_str(), String::new()), |(s, n)| (s, format!("-{n}")));
            (*metal, format!("{symbol}{}{number}", ligands.collect::<String>()))
        })
        .collect();
    let mut hydrogen_bonds = Vec::new();
    for &(i, j) in &bonds {
        let (h, o) = if kinds[i].symbol == "H" { (i, j) } else { (j, i) };
        if kinds[h].symbol != "H" || !matches!(kinds[o].symbol, "O" | "N") {
            continue;
        }
        for acceptor in (0..n).filter(|a| matches!(kinds[*a].symbol, "O" | "N" | "F" | "Cl")) {
            let (donor, taker) = (fragment_of[h], fragment_of[acceptor]);
            // The chlorine of an oxyanion is shielded by its oxygens.
            let shielded = kinds[acceptor].symbol == "Cl" && fragments[taker].atoms.len() > 1;
            let length = distance(h, acceptor);
            let angle = (at(o) - at(h)).angle(&(at(acceptor) - at(h)));
            if donor != taker && !shielded && length < HYDROGEN_BOND && angle > 120.0_f64.to_radians() {
                hydrogen_bonds.push(HydrogenBond { donor, acceptor: taker, length });
            }
        }
    }
    hydrogen_bonds
        .sort_by(|a, b| (a.donor, a.acceptor).cmp(&(b.donor, b.acceptor)).then(a.length.total_cmp(&b.length)));
    Structure { fragments, fragment_of, coordination, skeletons, hydrogen_bonds }
}

fn fragment(mut atoms: Vec<usize>, bonds: Vec<(usize, usize)>, kinds: &[Element], masses: &[f64]) -> Fragment {
    let count = |symbol: &str| atoms.iter().filter(|a| kinds[**a].symbol == symbol).count();
    let (hydrogens, oxygens) = (count("H"), count("O"));
    let others: Vec<usize> = atoms.iter().copied().filter(|a| !matches!(kinds[*a].symbol, "H" | "O")).collect();
    let group = match (others.len(), oxygens, hydrogens, atoms.len()) {
        (0, 1, 2, 3) => Group::Water,
        (1, 2..=4, 0, _) if bonds.len() == oxygens => Group::Oxyanion,
        (1, 0, 4, 5) if kinds[others[0]].symbol == "N" => Group::Ammonium,
        (1, 0, 0, 1) if kinds[others[0]].metal => Group::Metal,
        _ => Group::Other,
    };
    // The centre first: the atom with the most bonds, the lowest number among equals.
    let degree = |a: usize| bonds.iter().filter(|(i, j)| *i == a || *j == a).count();
    atoms.sort_by_key(|a| (usize::MAX - degree(*a), *a));
    let symbol = |a: usize| match kinds[a].symbol {
        "H" if (masses[a] - 2.0).abs() < 0.1 => "D",
        "H" if (masses[a] - 3.0).abs() < 0.1 => "T",
        other => other,
    };
    // Customary order: hydrogens before the oxygen of a water, else the centre, the others, oxygen.
    let rank = |s: &str| match (group, s) {
        (Group::Water, "H") => 0,
        (Group::Water, "D") => 1,
        (Group::Water, "T") => 2,
        (_, "O") => 5,
        (_, "H" | "D" | "T") => 4,
        _ => 3,
    };
    let counts = atoms.iter().map(|a| symbol(*a)).counts();
    let name = counts
        .iter()
        .sorted_by_key(|(s, _)| (rank(s), **s))
        .map(|(s, n)| if *n == 1 { (*s).to_owned() } else { format!("{s}{n}") })
        .collect();
    Fragment { name, group, atoms, bonds }
}

fn number_names(fragments: &mut [Fragment]) {
    let totals = fragments.iter().map(|f| f.name.clone()).counts();
    let mut seen: BTreeMap<String, usize> = BTreeMap::new();
    for fragment in fragments {
        if totals.get(&fragment.name).is_some_and(|n| *n > 1) {
            let number = seen.entry(fragment.name.clone()).or_default();
            *number += 1;
            fragment.name = format!("{}-{number}", fragment.name);
        }
    }
}
