//! The mode table of an isotopologue, without a Hessian: ratios by motion, product rule where an ion is complete.
//!
//! # Method
//! | exchange | motion | ratio ν′/ν | from |
//! |---|---|---|---|
//! | H=D | O–H stretch | one Morse bond, ν_OD = ρ ω − 2 ρ² ωx; two bonds of one water with coupling λ; ± 0.008 | mass; prototype ratio from memory |
//! | | H–O–H bend | 0.735 ± 0.006 (HDO: 0.882 ± 0.008) | prototypes, from memory; gas D₂O 0.739, HDO 0.880 |
//! | | libration | 0.730 ± 0.020 (HDO: 0.86 ± 0.07) | from memory |
//! | | metal–oxygen | 0.970 ± 0.015 | from memory; 0.949 if the whole water moved |
//! | | X–O stretch, O–X–O bend | 0.998 ± 0.003 | from memory |
//! | | N–H stretch, bend | 0.740 ± 0.012, 0.745 ± 0.020 | solid NH₄/ND₄ salts, from memory |
//! | 16O=18O, 32S=34S, 35Cl=37Cl, 14N=15N, 12C=13C | modes of an ion | Teller-Redlich product rule by species, shared between the modes of one species as in model force fields | computed |
//!
//! Uncertainties are one standard deviation. Ratios are those of fundamentals; a table of harmonic wavenumbers is treated
//! alike except that its O–H stretch takes ρ itself. Constants: x and g scale as ρᵢ ρⱼ, Fermi elements as
//! (ρ_a ρ_b ρ_c)^½, Darling-Dennison as ρ_a ρ_b, 1:1 as (ρ_a ρ_b)^½; 5 % for hydrogen, 1 % for heavy atoms (on one
//! computed surface of water x_ij follows the rule within −6 and +5 % for D₂O, 0.7 % for H₂¹⁸O:
//! `tests/isotopes.rs`).

use std::fmt;

use super::local_pair::{self, LocalPair};
use crate::library::defaults::{Role, omega_x};
use crate::mode::{
    Basis, Constant, ConstantKind, Mode, ModeIndex, ModeTable, MoietyKind, Motion, Strength, TableOrigin,
};
use crate::note::{Note, Noted};
use crate::quantity::{Shift, Wavenumber};

/// An isotope that can be exchanged.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Isotope {
    /// Element symbol (H for deuterium too).
    pub element: &'static str,
    /// As it is written: `H`, `D`, `18O`.
    pub name: &'static str,
    /// Mass, u. Values of the atomic mass evaluation, from memory except H, D, ¹⁶O, ¹⁴N, ¹²C, ³⁵Cl, ³²S (read).
    pub mass: f64,
}

/// Known pairs, the common isotope first.
const PAIRS: [(Isotope, Isotope); 6] = [
    (isotope("H", "H", 1.007_825_032_23), isotope("H", "D", 2.014_101_778_12)),
    (isotope("O", "16O", 15.994_914_619_57), isotope("O", "18O", 17.999_159_612_86)),
    (isotope("S", "32S", 31.972_071_174), isotope("S", "34S", 33.967_867_004)),
    (isotope("Cl", "35Cl", 34.968_852_682), isotope("Cl", "37Cl", 36.965_902_602)),
    (isotope("N", "14N", 14.003_074_004_43), isotope("N", "15N", 15.000_108_898_88)),
    (isotope("C", "12C", 12.0), isotope("C", "13C", 13.003_354_835_07)),
];

const fn isotope(element: &'static str, name: &'static str, mass: f64) -> Isotope {
    Isotope { element, name, mass }
}

/// How much of the element is exchanged.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Extent {
    /// All atoms.
    All,
    /// One hydrogen of each water: HDO.
    Half,
}

/// An isotope exchange.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Exchange {
    /// What goes.
    pub from: Isotope,
    /// What comes.
    pub to: Isotope,
    /// How much of it.
    pub extent: Extent,
}

/// Text that is no exchange.
#[derive(Clone, Debug, PartialEq, Eq, thiserror::Error)]
#[error(
    "`{0}` is no isotope exchange that is known\n  hint: one of H=D, H=D(half) for HDO, 16O=18O, 32S=34S, 35Cl=37Cl, 14N=15N, 12C=13C"
)]
pub struct NoExchange(pub String);

impl Exchange {
    /// The exchange written as `H=D`, `H=D(half)`, `16O=18O`; case and spaces do not matter.
    ///
    /// # Errors
    /// [`NoExchange`] with the list of what is known.
    pub fn from_text(text: &str) -> Result<Self, NoExchange> {
        let plain: String = text.chars().filter(|c| !c.is_whitespace()).collect::<String>().to_lowercase();
        let (plain, extent) = match plain.strip_suffix("(half)") {
            Some(head) => (head.to_owned(), Extent::Half),
            None => (plain, Extent::All),
        };
        let refuse = || NoExchange(text.trim().to_owned());
        let (from, to) = plain.split_once('=').ok_or_else(refuse)?;
        let alias = |name: &str| match name {
            "1h" => "h".to_owned(),
            "2h" => "d".to_owned(),
            other => other.to_owned(),
        };
        let (from, to) = (alias(from), alias(to));
        let found = PAIRS
            .into_iter()
            .find(|(a, b)| a.name.to_lowercase() == from && b.name.to_lowercase() == to)
            .ok_or_else(refuse)?;
        if extent == Extent::Half && found.0.element != "H" {
            return Err(refuse());
        }
        Ok(Self { from: found.0, to: found.1, extent })
    }
}

impl fmt::Display for Exchange {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        let part = if self.extent == Extent::Half { "(half)" } else { "" };
        write!(f, "{}={}{part}", self.from.name, self.to.name)
    }
}

/// A ratio of wavenumbers with its uncertainty and where it comes from.
#[derive(Clone, Debug, PartialEq)]
pub struct Ratio {
    /// ν′/ν.
    pub value: f64,
    /// One standard uncertainty.
    pub sigma: f64,
    /// Source in words.
    pub source: String,
}

fn ratio(value: f64, sigma: f64, source: &str) -> Ratio {
    Ratio { value, sigma, source: source.to_owned() }
}

/// Shape of an oxyanion, for the product rule.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Shape {
    /// XO₄, Td.
    Tetrahedral,
    /// XO₃, D3h.
    Planar,
    /// XO₃, C3v: chlorate, sulfite, iodate.
    Pyramidal,
}

/// Product of ν′/ν over the modes of one species, harmonic.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct ProductRatio {
    /// Species.
    pub species: &'static str,
    /// Numbers of the modes in it (ν₁ to ν₄).
    pub modes: &'static [u8],
    /// Product of the ratios.
    pub value: f64,
}

/// The Teller-Redlich product rule of an XOₙ ion whose oxygens are all exchanged alike (masses in u: centre before and
/// after, oxygen before and after). Pyramidal ions have no answer without their angle.
///
/// # Method
/// Π(ω′/ω) = [Π (m/m′)^α (M′/M)^t]^½ by species. From memory, checked against numerical normal modes.
pub fn product_rule(shape: Shape, centre: (f64, f64), oxygen: (f64, f64)) -> Vec<ProductRatio> {
    let n = if shape == Shape::Tetrahedral { 4.0 } else { 3.0 };
    let (x, y) = (centre.0 / centre.1, oxygen.0 / oxygen.1);
    let total = (centre.1 + n * oxygen.1) / (centre.0 + n * oxygen.0);
    match shape {
        Shape::Tetrahedral => vec![
            ProductRatio { species: "A1", modes: &[1], value: y.sqrt() },
            ProductRatio { species: "E", modes: &[2], value: y.sqrt() },
            ProductRatio { species: "F2", modes: &[3, 4], value: (y * y * x * total).sqrt() },
        ],
        Shape::Planar => vec![
            ProductRatio { species: "A1'", modes: &[1], value: y.sqrt() },
            ProductRatio { species: "A2''", modes: &[2], value: (y * x * total).sqrt() },
            ProductRatio { species: "E'", modes: &[3, 4], value: (y * y * x * total).sqrt() },
        ],
        Shape::Pyramidal => Vec::new(),
    }
}

/// Mass of the most common isotope of a centre, u (rounded, from memory: the product rule needs no more).
fn centre_mass(element: &str) -> Option<f64> {
    Some(match element {
        "B" => 11.009,
        "C" => 12.0,
        "N" => 14.003_074,
        "Si" => 27.977,
        "P" => 30.974,
        "S" => 31.972_071,
        "Cl" => 34.968_853,
        "V" => 50.944,
        "Cr" => 51.941,
        "Mn" => 54.938,
        "As" => 74.922,
        "Se" => 79.917,
        "Br" => 78.918,
        "Mo" => 97.905,
        "I" => 126.904,
        "W" => 183.951,
        _ => return None,
    })
}

/// Element of the centre and shape of an ion from its formula: `ClO4` is tetrahedral, `NO3` planar, `ClO3` pyramidal.
pub fn ion(formula: &str) -> Option<(String, Shape)> {
    let at = formula.find(|c: char| !c.is_ascii_alphabetic()).unwrap_or(formula.len());
    let letters = formula[..at].strip_suffix('O')?;
    let element = letters.strip_prefix('H').filter(|rest| !rest.is_empty()).unwrap_or(letters).to_owned();
    centre_mass(&element)?;
    let shape = match formula[at..].chars().next()? {
        '4' => Shape::Tetrahedral,
        '3' if matches!(element.as_str(), "C" | "N" | "B") => Shape::Planar,
        '3' => Shape::Pyramidal,
        _ => return None,
    };
    Some((element, shape))
}

/// The mode table of the isotopologue.
///
/// # Method
/// See the module. Modes keep their ids; waters are renamed (H2O to D2O or HDO). With [`Extent::Half`] a water whose two
/// bonds differ becomes two, one for each place of the deuterium. A second exchange of the same kind changes nothing and
/// says so.
pub fn exchange(table: &ModeTable, what: &Exchange) -> Noted<ModeTable> {
    let mut notes = Vec::new();
    let mut new = table.clone();
    let same_element = |done: &String| Exchange::from_text(done).is_ok_and(|e| e.from.element == what.from.element);
    if table.isotopes.iter().any(same_element) {
        notes.push(Note::new(format!(
            "the table is already an isotopologue of {} ({}); nothing was exchanged",
            what.from.element,
            table.isotopes.join(", ")
        )));
        return Noted { value: new, notes };
    }
    new.isotopes.push(what.to_string());
    if what.to_string() == "H=D" {
        new.formula = table.formula.replace("H2O", "D2O");
    }
    new.title = format!("{}, {what}", if table.title.is_empty() { &table.name } else { &table.title });
    new.name = format!("{}_{}", table.name, what.to_string().replace(['=', '(', ')'], "-").trim_end_matches('-'));
    // Derived numbers are no measurements.
    new.origin = TableOrigin::Composed;
    let mut ratios: Vec<Ratio> = (0..table.modes.len()).map(|i| by_motion(table, i, what, &mut notes)).collect();
    let mut split: Vec<(usize, [f64; 2], [f64; 2])> = Vec::new();
    if what.from.element == "H" {
        for moiety in 0..table.moieties.len() {
            stretches(table, moiety, what, &mut ratios, &mut split);
        }
    } else {
        for moiety in 0..table.moieties.len() {
            heavy_ion(table, moiety, what, &mut ratios, &mut notes);
        }
    }
    for (mode, r) in new.modes.iter_mut().zip(&ratios) {
        move_mode(mode, r, what);
    }
    scale_constants(&mut new, table, &ratios, what, &mut notes);
    if what.from.element == "H" {
        for moiety in &mut new.moieties {
            let heavy = if what.extent == Extent::Half { "HDO" } else { "D2O" };
            moiety.name = moiety.name.replace("H2O", heavy).replace("NH4", "ND4");
            if what.extent == Extent::All && moiety.name == "OH" {
                moiety.name = "OD".to_owned();
            }
        }
    }
    for (moiety, protons, deuterons) in split {
        twin(&mut new, table, moiety, protons, deuterons, what, &mut notes);
    }
    let unchanged = ratios.iter().filter(|r| r.value == 1.0).count();
    if unchanged == ratios.len() {
        notes.push(Note::new(format!("no mode of this table moves with {what}")));
    }
    new.settle_moieties();
    Noted { value: new, notes }
}

/// New wavenumber, uncertainty, width and strength of one mode.
fn move_mode(mode: &mut Mode, r: &Ratio, what: &Exchange) {
    let before = mode.wavenumber.inverse_cm();
    if r.value == 1.0 && r.sigma == 0.0 {
        return;
    }
    if let Ok(after) = Wavenumber::from_inverse_cm(before * r.value) {
        mode.wavenumber = after;
    }
    mode.sigma = (mode.sigma * r.value).hypot(before * r.sigma);
    mode.sigma_given = true;
    if what.from.element == "H" && r.value < 0.95 {
        // A harmonic fundamental's strength goes with (∂µ/∂Q)², hence with 1/mass ~ ρ²; widths of OD bands are about
        // two thirds of those of OH bands (judgement), like the ratio.
        if let Some(Strength::Relative(s)) = mode.ir {
            mode.ir = Some(Strength::Relative(s * r.value * r.value));
        }
        mode.fwhm = mode.fwhm.map(|w| w * r.value);
    }
    mode.source =
        format!("{what}: {before:.1} × {:.4} ± {:.4} ({}); before: {}", r.value, r.sigma, r.source, mode.source);
}

/// Ratio of a mode by its motion alone.
fn by_motion(table: &ModeTable, index: ModeIndex, what: &Exchange, notes: &mut Vec<Note>) -> Ratio {
    let mode = &table.modes[index];
    let half = what.extent == Extent::Half;
    let memory = "prototype ratio, from memory";
    match (what.from.element, mode.motion) {
        ("H", Motion::OhStretch) => {
            let nu = mode.wavenumber.inverse_cm();
            if table.basis == Basis::Harmonic {
                ratio(local_pair::mass_ratio(), 0.004, "reduced masses of one bond")
            } else {
                let heavy = local_pair::deuterated_stretch(nu, omega_x(nu).0);
                ratio(heavy / nu, 0.008, "one Morse bond")
            }
        }
        ("H", Motion::HohBend) if half => ratio(0.882, 0.008, "HDO: gas 0.880, liquid 0.885"),
        ("H", Motion::HohBend) => ratio(0.735, 0.006, memory),
        ("H", Motion::Libration) if half => {
            ratio(0.86, 0.07, "HDO: between none and both hydrogens, by axis (judgement)")
        }
        ("H", Motion::Libration) => ratio(0.730, 0.020, memory),
        ("H", Motion::MetalOxygen) if half => ratio(0.985, 0.010, "half of the shift of D2O (judgement)"),
        ("H", Motion::MetalOxygen) => ratio(0.970, 0.015, memory),
        ("H", Motion::XoStretch | Motion::OxoBend) => ratio(0.998, 0.003, memory),
        ("H", Motion::NhStretch) => ratio(0.740, 0.012, memory),
        ("H", Motion::NhBend) => ratio(0.745, 0.020, memory),
        ("H", Motion::Lattice) => ratio(0.985, 0.015, "mass of water within the lattice (judgement)"),
        ("O", Motion::OhStretch) => ratio(0.9970, 0.0012, "H2-18O on a computed surface: 0.9962 to 0.9980"),
        ("O", Motion::HohBend) => ratio(0.9959, 0.0010, "H2-18O on a computed surface"),
        ("O", Motion::Libration) => ratio(0.995, 0.004, "rotation of a water moves little oxygen (judgement)"),
        ("O", Motion::MetalOxygen) => ratio(0.955, 0.015, "18 against 20 u of water: 0.949 if the metal stood still"),
        ("O", Motion::Lattice) => ratio(0.975, 0.020, "mass of ions and waters (judgement)"),
        // The ion itself follows by the product rule below.
        ("O", Motion::XoStretch | Motion::OxoBend) => ratio(0.965, 0.020, "18O, ion of unknown formula (judgement)"),
        (_, Motion::Other) => {
            notes.push(Note::new(format!(
                "`{}` has motion `other`: no ratio is known, it stays with 5 % more uncertainty",
                mode.id
            )));
            ratio(1.0, 0.05, "motion unknown")
        }
        (_, Motion::Lattice) => ratio(0.999, 0.002, "mass of one ion in the lattice (judgement)"),
        _ => ratio(1.0, 0.0, "does not move"),
    }
}

/// Coupling λ of the two O–H of one water, cm⁻¹, as in the defaults (uncertainty 15 cm⁻¹).
const COUPLING: f64 = -45.0;

/// Two stretches closer than 2 (|λ| + σ) are those of equal bonds, cm⁻¹.
const EQUAL_BONDS: f64 = 120.0;

/// Two coupled O–H bonds of one water: their difference and their coupling scale differently, so the pair is treated as
/// a whole.
fn stretches(
    table: &ModeTable,
    moiety: usize,
    what: &Exchange,
    ratios: &mut [Ratio],
    split: &mut Vec<(usize, [f64; 2], [f64; 2])>,
) {
    if table.moieties[moiety].kind != MoietyKind::Water || table.basis == Basis::Harmonic {
        return;
    }
    let mut pair: Vec<ModeIndex> = (0..table.modes.len())
        .filter(|i| table.modes[*i].moiety == moiety && Role::of(table, *i) == Role::OhStretch)
        .collect();
    pair.sort_by(|a, b| table.modes[*a].wavenumber.inverse_cm().total_cmp(&table.modes[*b].wavenumber.inverse_cm()));
    let &[low, high] = pair.as_slice() else { return };
    let nu = |i: ModeIndex| table.modes[i].wavenumber.inverse_cm();
    let (nu_low, nu_high) = (nu(low), nu(high));
    // A splitting that λ alone can explain within its uncertainty is taken for the coupling of equal bonds.
    let lambda = if nu_high - nu_low < EQUAL_BONDS { 0.5 * (nu_low - nu_high) } else { COUPLING };
    let bonds = LocalPair::observed(nu_low, nu_high, omega_x(nu_low).0, omega_x(nu_high).0, lambda);
    let heavy = |bond: f64| local_pair::deuterated_stretch(bond, omega_x(bond).0);
    let deuterons = bonds.bond.map(heavy);
    let set = |ratios: &mut [Ratio], i: ModeIndex, after: f64, source: &str| {
        ratios[i] = ratio(after / nu(i), 0.008, source);
    };
    match what.extent {
        Extent::All => {
            let mean = 0.5 * (bonds.bond[0] + bonds.bond[1]);
            let lambda = local_pair::deuterated_coupling(bonds.lambda, mean, omega_x(mean).0);
            let half = (0.5 * (deuterons[1] - deuterons[0])).hypot(lambda);
            let centre = 0.5 * (deuterons[0] + deuterons[1]);
            set(ratios, low, centre - half, "two Morse bonds with coupling");
            set(ratios, high, centre + half, "two Morse bonds with coupling");
        }
        Extent::Half => {
            // One O–D and one O–H, uncoupled: the lower mode of the table becomes O–D.
            let same = nu_high - nu_low < EQUAL_BONDS;
            let (proton, deuteron) = if same {
                let mean = 0.5 * (bonds.bond[0] + bonds.bond[1]);
                (mean, heavy(mean))
            } else {
                split.push((moiety, bonds.bond, deuterons));
                (bonds.bond[1], deuterons[0])
            };
            set(ratios, low, deuteron, "one Morse bond, uncoupled");
            ratios[high] = ratio(proton / nu(high), 0.003, "bare O–H bond without its coupling");
        }
    }
}

/// The second place of the deuterium in a water with unequal bonds: a moiety of its own.
fn twin(
    new: &mut ModeTable,
    table: &ModeTable,
    moiety: usize,
    protons: [f64; 2],
    deuterons: [f64; 2],
    what: &Exchange,
    notes: &mut Vec<Note>,
) {
    let name = new.moieties[moiety].name.clone();
    let other = new.intern_moiety(&format!("{name}-b"));
    new.moieties[moiety].name = format!("{name}-a");
    notes.push(Note::new(format!(
        "the bonds of {} differ: {name}-a has D on its stronger hydrogen bond, {name}-b on the weaker one",
        table.moieties[moiety].name
    )));
    let members: Vec<Mode> = new.modes.iter().filter(|m| m.moiety == moiety).cloned().collect();
    for mut mode in members {
        let id = mode.id.clone();
        mode.moiety = other;
        mode.id = format!("{id}-b");
        if mode.motion == Motion::OhStretch {
            let before = mode.wavenumber.inverse_cm();
            // The lower mode of the first is O–D on the lower bond; here O–D sits on the higher one.
            let after = if before < 0.5 * (protons[0] + deuterons[1]) { deuterons[1] } else { protons[0] };
            if let Ok(w) = Wavenumber::from_inverse_cm(after) {
                mode.wavenumber = w;
            }
            mode.source = format!("{what}: bare bond of the pair, the other place of D");
        }
        new.modes.push(mode);
    }
}

/// Share of ln(product) that ν₃ takes of the species it shares with ν₄ (model force fields: SO₄, ClO₄, NO₃, CO₃), with
/// one standard uncertainty.
fn stretch_share(shape: Shape, heavy_centre: bool) -> (f64, f64) {
    match (shape, heavy_centre) {
        (Shape::Tetrahedral, true) => (0.63, 0.05),
        (Shape::Tetrahedral, false) => (0.42, 0.05),
        (_, true) => (0.89, 0.04),
        (_, false) => (0.23, 0.05),
    }
}

/// Modes of an oxyanion by the product rule.
fn heavy_ion(table: &ModeTable, moiety: usize, what: &Exchange, ratios: &mut [Ratio], notes: &mut Vec<Note>) {
    let entry = &table.moieties[moiety];
    if !matches!(entry.kind, MoietyKind::Oxyanion3 | MoietyKind::Oxyanion4) {
        return;
    }
    let members: Vec<ModeIndex> = (0..table.modes.len()).filter(|i| table.modes[*i].moiety == moiety).collect();
    let Some((element, shape)) = ion(entry.formula()) else {
        if what.from.element == "O" {
            notes.push(Note::new(format!("the formula of {} is not known; its shifts with 18O are rough", entry.name)));
        }
        return;
    };
    let centre_moves = what.from.element == element;
    if !centre_moves && what.from.element != "O" {
        return;
    }
    let number = |i: ModeIndex| match Role::of(table, i) {
        Role::Xo3(n) | Role::Xo4(n) => Some(n),
        _ => None,
    };
    let mass = centre_mass(&element).unwrap_or(what.from.mass);
    let centre = if centre_moves { (what.from.mass, what.to.mass) } else { (mass, mass) };
    let light = PAIRS[1].0.mass;
    let oxygen = if centre_moves { (light, light) } else { (what.from.mass, what.to.mass) };
    if shape == Shape::Pyramidal {
        // C3v: the species mix stretch and bend, and the moment of inertia enters; rough numbers between those of planar
        // and tetrahedral ions (judgement).
        for &i in &members {
            ratios[i] = match (centre_moves, number(i)) {
                (true, Some(3)) => ratio(0.991, 0.004, "pyramidal ion (judgement)"),
                (true, Some(1)) => ratio(0.995, 0.003, "pyramidal ion (judgement)"),
                (true, _) => ratio(0.998, 0.002, "pyramidal ion (judgement)"),
                (false, Some(3)) => ratio(0.965, 0.012, "pyramidal ion (judgement)"),
                (false, _) => ratio(0.953, 0.012, "pyramidal ion (judgement)"),
            };
        }
        return;
    }
    for species in product_rule(shape, centre, oxygen) {
        let whole = species.value.ln();
        for &i in &members {
            let Some(n) = number(i).filter(|n| species.modes.contains(n)) else { continue };
            // Site and anharmonicity change a harmonic ratio by a few parts in ten thousand.
            ratios[i] = if species.modes.len() == 1 {
                let sigma = if whole == 0.0 { 0.0 } else { 0.0015 };
                ratio(species.value, sigma, &format!("product rule, {}", species.species))
            } else {
                let (share, sigma) = stretch_share(shape, centre_moves);
                let share = if n == 3 { share } else { 1.0 - share };
                let source = format!("product rule, {}, shared as in model force fields", species.species);
                ratio((share * whole).exp(), (sigma * whole).abs() + 0.0005, &source)
            };
        }
        let complete = species.modes.iter().all(|n| members.iter().any(|i| number(*i) == Some(*n)));
        if !complete && species.modes.len() > 1 {
            notes.push(Note::new(format!(
                "{} lists only part of species {}: the product rule cannot close its shifts",
                entry.name, species.species
            )));
        }
    }
}

/// Constants scale with the modes; those of a broken pair go.
fn scale_constants(new: &mut ModeTable, table: &ModeTable, ratios: &[Ratio], what: &Exchange, notes: &mut Vec<Note>) {
    let relative = if what.from.element == "H" { 0.05 } else { 0.01 };
    let broken = |k: &Constant| {
        what.extent == Extent::Half
            && [Some(k.a), Some(k.b), k.c]
                .into_iter()
                .flatten()
                .any(|i| table.modes[i].motion == Motion::OhStretch && table.moiety_of(i).kind == MoietyKind::Water)
    };
    let before = new.constants.len();
    new.constants.retain(|k| !broken(k));
    if new.constants.len() < before {
        notes.push(Note::new(format!(
            "{} constants of O–H stretches were dropped: HDO has one O–H and one O–D bond, its constants come from the \
             defaults",
            before - new.constants.len()
        )));
    }
    for k in &mut new.constants {
        let (a, b) = (ratios[k.a].value, ratios[k.b].value);
        let factor = match k.kind {
            ConstantKind::X | ConstantKind::G | ConstantKind::DarlingDennison => a * b,
            ConstantKind::Fermi => (a * b * ratios[k.c.unwrap_or(k.b)].value).sqrt(),
            ConstantKind::OneOne => (a * b).sqrt(),
        };
        if (factor - 1.0).abs() < 1.0e-12 {
            continue;
        }
        k.value = Shift(k.value.0 * factor);
        k.sigma = (k.sigma * factor).hypot(relative * k.value.0);
        k.source = format!("{what}: × {factor:.4}; before: {}", k.source);
    }
}
