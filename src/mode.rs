//! What vibrates: modes on moieties, with their motions and constants; the mode table of one sample.

use serde::Serialize;

use crate::quantity::{Shift, Wavenumber};

/// What a mode does. Names are those of the mode-table column `motion`.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord, Hash, Serialize)]
#[serde(rename_all = "kebab-case")]
pub enum Motion {
    /// O–H (or O–D) stretch of a water or hydroxide.
    OhStretch,
    /// H–O–H bend.
    HohBend,
    /// Hindered rotation of a water: rock, wag, twist.
    Libration,
    /// Metal–oxygen stretch of the coordination polyhedron.
    MetalOxygen,
    /// X–O stretch of an oxyanion (ν1, ν3).
    XoStretch,
    /// O–X–O bend of an oxyanion (ν2, ν4).
    OxoBend,
    /// N–H stretch of ammonium.
    NhStretch,
    /// H–N–H bend of ammonium.
    NhBend,
    /// Translation or rotation of whole ions, lattice mode.
    Lattice,
    /// Anything else (gas molecules, other groups).
    Other,
}

impl Motion {
    /// All motions, in the order of the contract.
    pub const ALL: [Motion; 10] = [
        Motion::OhStretch,
        Motion::HohBend,
        Motion::Libration,
        Motion::MetalOxygen,
        Motion::XoStretch,
        Motion::OxoBend,
        Motion::NhStretch,
        Motion::NhBend,
        Motion::Lattice,
        Motion::Other,
    ];

    /// The name used in files.
    pub fn name(self) -> &'static str {
        match self {
            Motion::OhStretch => "oh-stretch",
            Motion::HohBend => "hoh-bend",
            Motion::Libration => "libration",
            Motion::MetalOxygen => "metal-oxygen",
            Motion::XoStretch => "xo-stretch",
            Motion::OxoBend => "oxo-bend",
            Motion::NhStretch => "nh-stretch",
            Motion::NhBend => "nh-bend",
            Motion::Lattice => "lattice",
            Motion::Other => "other",
        }
    }

    /// The motion of that name, case ignored.
    pub fn from_name(name: &str) -> Option<Self> {
        let lower = name.trim().to_lowercase();
        Self::ALL.into_iter().find(|motion| motion.name() == lower)
    }
}

impl std::fmt::Display for Motion {
    fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        f.pad(self.name())
    }
}

/// What kind of thing a moiety is; decides default constants and contacts.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord, Hash, Serialize)]
#[serde(rename_all = "kebab-case")]
pub enum MoietyKind {
    /// One water molecule (or all equivalent ones, as one).
    Water,
    /// A three-oxygen oxyanion: nitrate, carbonate, chlorate ...
    Oxyanion3,
    /// A four-oxygen oxyanion: sulfate, perchlorate ...
    Oxyanion4,
    /// The metal–oxygen skeleton.
    Skeleton,
    /// Ammonium.
    Ammonium,
    /// The lattice as a whole.
    Lattice,
    /// A free molecule or anything else.
    Other,
}

/// One moiety: its name in the table and its kind.
#[derive(Clone, Debug, PartialEq, Eq, Serialize)]
pub struct Moiety {
    /// Name as in the table's column `moiety`: `H2O-1`, `ClO4`, `MgO6`.
    pub name: String,
    /// Its kind, from its name and the motions of its modes.
    pub kind: MoietyKind,
}

impl Moiety {
    /// The formula part of the name, before the first of `-`, `_`, `#`, `(` or space: `H2O-1` is `H2O`.
    pub fn formula(&self) -> &str {
        self.name.split(['-', '_', '#', ' ', '(']).next().unwrap_or(&self.name)
    }
}

/// Number of a mode in its table.
pub type ModeIndex = usize;

/// Number of a moiety in its table.
pub type MoietyIndex = usize;

/// Where a number comes from.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord, Hash, Serialize)]
#[serde(rename_all = "kebab-case")]
pub enum Origin {
    /// Stands in the user's or a bundled table.
    Given,
    /// Filled in from the defaults by the pair of motions.
    Defaulted,
    /// Computed here from other numbers (force field, local pair, isotope rule).
    Computed,
    /// Carried over from a related sample.
    Transferred,
}

/// Observed or estimated strength of a fundamental in infrared or Raman, as in the table.
#[derive(Clone, Copy, Debug, PartialEq, Serialize)]
#[serde(untagged)]
pub enum Strength {
    /// A relative number on the table's own scale.
    Relative(f64),
    /// A word: s, m, w, v (very weak).
    Word(StrengthWord),
}

/// Strength in words.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord, Hash, Serialize)]
pub enum StrengthWord {
    /// Strong.
    #[serde(rename = "s")]
    Strong,
    /// Medium.
    #[serde(rename = "m")]
    Medium,
    /// Weak.
    #[serde(rename = "w")]
    Weak,
    /// Very weak.
    #[serde(rename = "v")]
    VeryWeak,
}

impl Strength {
    /// Strength in decades below a strong band: s 0, m −0.5, w −1, v −1.5; a number is taken as it is.
    /// The half decade a word is a judgement of this project: the words have no fixed scale in the trade.
    pub fn log10(self) -> f64 {
        match self {
            Strength::Relative(value) => value.max(1.0e-6).log10(),
            Strength::Word(StrengthWord::Strong) => 0.0,
            Strength::Word(StrengthWord::Medium) => -0.5,
            Strength::Word(StrengthWord::Weak) => -1.0,
            Strength::Word(StrengthWord::VeryWeak) => -1.5,
        }
    }
}

/// One mode: a fundamental with what is known of it.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct Mode {
    /// Unique name in its table.
    pub id: String,
    /// Number of its moiety in [`ModeTable::moieties`].
    pub moiety: MoietyIndex,
    /// What it does.
    pub motion: Motion,
    /// Position of the fundamental (v = 1; |l| = 1 when degenerate); for a table read with `basis: harmonic` this is
    /// still the harmonic wavenumber until the physics room converts it.
    pub wavenumber: Wavenumber,
    /// One standard uncertainty, cm⁻¹.
    pub sigma: f64,
    /// Whether the table gave the uncertainty (otherwise it is a default).
    pub sigma_given: bool,
    /// 1, 2 or 3.
    pub degeneracy: u8,
    /// Irreducible representation in the table's point group.
    pub species: Option<String>,
    /// Infrared strength of the fundamental.
    pub ir: Option<Strength>,
    /// Raman strength of the fundamental.
    pub raman: Option<Strength>,
    /// Full width at half maximum, cm⁻¹, where the table gives one (optional column `fwhm_cm1`).
    pub fwhm: Option<f64>,
    /// The number's source, as written in the table.
    pub source: String,
}

/// Which constant a row of a constants table gives.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord, Hash, Serialize)]
#[serde(rename_all = "kebab-case")]
pub enum ConstantKind {
    /// x_ij, added with its own sign (negative for a stretch); a may equal b.
    X,
    /// g_ii of a degenerate mode (a = b) or g_ij of two degenerate modes.
    G,
    /// ⟨a=1|H|b=2⟩ (c empty; l = 0 for a degenerate b) or ⟨a=1|H|b=1, c=1⟩.
    Fermi,
    /// ⟨a=2|H|b=2⟩.
    DarlingDennison,
    /// ⟨a=1|H|b=1⟩.
    OneOne,
}

impl ConstantKind {
    /// The name used in files.
    pub fn name(self) -> &'static str {
        match self {
            Self::X => "x",
            Self::G => "g",
            Self::Fermi => "fermi",
            Self::DarlingDennison => "darling-dennison",
            Self::OneOne => "one-one",
        }
    }

    /// The constant of that name, case ignored.
    pub fn from_name(name: &str) -> Option<Self> {
        let lower = name.trim().to_lowercase();
        [Self::X, Self::G, Self::Fermi, Self::DarlingDennison, Self::OneOne].into_iter().find(|k| k.name() == lower)
    }

    /// Whether it ties levels together instead of moving one.
    pub fn is_resonance(self) -> bool {
        matches!(self, Self::Fermi | Self::DarlingDennison | Self::OneOne)
    }
}

/// One anharmonic constant or resonance element.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct Constant {
    /// What it is.
    pub kind: ConstantKind,
    /// First mode.
    pub a: ModeIndex,
    /// Second mode (equal to `a` for a diagonal constant).
    pub b: ModeIndex,
    /// Third mode of a Fermi 1:1:1 term.
    pub c: Option<ModeIndex>,
    /// Value in cm⁻¹.
    pub value: Shift,
    /// One standard uncertainty, cm⁻¹.
    pub sigma: f64,
    /// Where the number comes from.
    pub source: String,
}

/// Whether the wavenumbers of a table are observed fundamentals or harmonic.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq, Serialize)]
#[serde(rename_all = "kebab-case")]
pub enum Basis {
    /// Fundamentals.
    #[default]
    Fundamental,
    /// Harmonic wavenumbers.
    Harmonic,
}

/// How a table came to be.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq, Serialize)]
#[serde(rename_all = "kebab-case")]
pub enum TableOrigin {
    /// From measurements.
    #[default]
    Measured,
    /// From quantum chemistry.
    Computed,
    /// From correlations (`compose`).
    Composed,
    /// Made up for a demonstration.
    Invented,
}

/// The modes and constants of one sample. Invariant (kept by the reader): mode ids are unique, indices are in range,
/// degeneracies are 1 to 3, sigmas are finite and not negative.
#[derive(Clone, Debug, Default, PartialEq, Serialize)]
pub struct ModeTable {
    /// File or bundled name.
    pub name: String,
    /// Title for people.
    pub title: String,
    /// Chemical formula as written.
    pub formula: String,
    /// What the wavenumbers are.
    pub basis: Basis,
    /// Point, site or factor group that `species` refers to.
    pub point_group: Option<String>,
    /// Temperature of the numbers, K.
    pub temperature: Option<f64>,
    /// How the table came to be.
    pub origin: TableOrigin,
    /// General source.
    pub source: String,
    /// Caution to show to people who handle the substance.
    pub caution: Option<String>,
    /// Isotopes exchanged against the natural ones, for example `H=D`; empty for natural.
    pub isotopes: Vec<String>,
    /// Moieties in order of first appearance.
    pub moieties: Vec<Moiety>,
    /// Modes in file order.
    pub modes: Vec<Mode>,
    /// Given constants.
    pub constants: Vec<Constant>,
}

impl ModeTable {
    /// The number of the mode called `id`.
    pub fn mode_index(&self, id: &str) -> Option<ModeIndex> {
        self.modes.iter().position(|mode| mode.id == id)
    }

    /// The moiety of mode `index`.
    pub fn moiety_of(&self, index: ModeIndex) -> &Moiety {
        &self.moieties[self.modes[index].moiety]
    }

    /// The given constant of that kind between two modes, in either order.
    pub fn constant(&self, kind: ConstantKind, a: ModeIndex, b: ModeIndex) -> Option<&Constant> {
        self.constants.iter().find(|k| k.kind == kind && ((k.a, k.b) == (a, b) || (k.a, k.b) == (b, a)))
    }

    /// Finds the number of a moiety by name, adding it when it is new. Its kind is guessed from its name now and from
    /// its motions by [`Self::settle_moieties`].
    pub fn intern_moiety(&mut self, name: &str) -> MoietyIndex {
        if let Some(found) = self.moieties.iter().position(|moiety| moiety.name == name) {
            return found;
        }
        self.moieties.push(Moiety { name: name.to_owned(), kind: MoietyKind::Other });
        self.moieties.len() - 1
    }

    /// Gives every moiety its kind from the motions of its modes and the oxygens in its name. Call it after changing
    /// modes.
    pub fn settle_moieties(&mut self) {
        for (index, moiety) in self.moieties.iter_mut().enumerate() {
            let has = |motion| self.modes.iter().any(|m| m.moiety == index && m.motion == motion);
            moiety.kind = if has(Motion::HohBend) || (has(Motion::OhStretch) && !has(Motion::XoStretch)) {
                MoietyKind::Water
            } else if has(Motion::XoStretch) || has(Motion::OxoBend) {
                if moiety.formula().contains("O4") { MoietyKind::Oxyanion4 } else { MoietyKind::Oxyanion3 }
            } else if has(Motion::NhStretch) || has(Motion::NhBend) {
                MoietyKind::Ammonium
            } else if has(Motion::MetalOxygen) {
                MoietyKind::Skeleton
            } else if has(Motion::Libration) {
                MoietyKind::Water
            } else if has(Motion::Lattice) {
                MoietyKind::Lattice
            } else {
                MoietyKind::Other
            };
        }
    }
}
