//! Default constants where a table gives none: by the roles of the two modes and by how their moieties touch.

use std::sync::OnceLock;

use crate::mode::{ModeIndex, ModeTable, MoietyIndex, MoietyKind, Motion};

/// What a mode is to the defaults: its motion, with the isotope of hydrogen and the number of the oxyanion mode.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub enum Role {
    /// O–H stretch.
    OhStretch,
    /// O–D stretch.
    OdStretch,
    /// H–O–H bend.
    HohBend,
    /// D–O–D bend.
    DodBend,
    /// Libration of a water.
    Libration,
    /// Metal–oxygen stretch.
    MetalOxygen,
    /// ν1 to ν4 of a three-oxygen ion.
    Xo3(u8),
    /// ν1 to ν4 of a four-oxygen ion.
    Xo4(u8),
    /// N–H stretch.
    NhStretch,
    /// H–N–H bend.
    NhBend,
    /// Lattice mode.
    Lattice,
    /// Anything else.
    Other,
}

/// Below this wavenumber a stretch in a deuterated table is O–D, cm⁻¹.
const DEUTERATED_STRETCH: f64 = 2_900.0;

/// Below this wavenumber a bend in a deuterated table is D–O–D, cm⁻¹ (HDO near 1400 stays with the protons).
const DEUTERATED_BEND: f64 = 1_300.0;

impl Role {
    /// The role of mode `index`.
    ///
    /// The number of an oxyanion mode is read from its id (`nu3a` is ν3); without one the lowest stretch of the ion is
    /// ν1 and the others ν3, the highest bend ν4 (four oxygens) or ν2 (three oxygens).
    pub fn of(table: &ModeTable, index: ModeIndex) -> Role {
        let mode = &table.modes[index];
        let wavenumber = mode.wavenumber.inverse_cm();
        let deuterated = table.isotopes.iter().any(|i| i.starts_with("H=D"));
        let kind = table.moiety_of(index).kind;
        match mode.motion {
            Motion::OhStretch if deuterated && wavenumber < DEUTERATED_STRETCH => Role::OdStretch,
            Motion::OhStretch => Role::OhStretch,
            Motion::HohBend if deuterated && wavenumber < DEUTERATED_BEND => Role::DodBend,
            Motion::HohBend => Role::HohBend,
            Motion::Libration => Role::Libration,
            Motion::MetalOxygen => Role::MetalOxygen,
            Motion::NhStretch => Role::NhStretch,
            Motion::NhBend => Role::NhBend,
            Motion::Lattice => Role::Lattice,
            Motion::Other => Role::Other,
            Motion::XoStretch | Motion::OxoBend => {
                let number = numbered(&mode.id).unwrap_or_else(|| {
                    let same = table.modes.iter().filter(|m| m.moiety == mode.moiety && m.motion == mode.motion);
                    let mut positions = same.map(|m| m.wavenumber.inverse_cm());
                    match mode.motion {
                        Motion::XoStretch if positions.all(|p| wavenumber <= p) => 1,
                        Motion::XoStretch => 3,
                        _ => {
                            let highest = positions.all(|p| wavenumber >= p);
                            if highest == (kind == MoietyKind::Oxyanion4) { 4 } else { 2 }
                        }
                    }
                });
                if kind == MoietyKind::Oxyanion4 { Role::Xo4(number) } else { Role::Xo3(number) }
            }
        }
    }

    /// The key used in the defaults file.
    pub fn key(self) -> String {
        match self {
            Role::OhStretch => "oh-stretch".into(),
            Role::OdStretch => "od-stretch".into(),
            Role::HohBend => "hoh-bend".into(),
            Role::DodBend => "dod-bend".into(),
            Role::Libration => "libration".into(),
            Role::MetalOxygen => "metal-oxygen".into(),
            Role::Xo3(n) => format!("xo3-nu{n}"),
            Role::Xo4(n) => format!("xo4-nu{n}"),
            Role::NhStretch => "nh-stretch".into(),
            Role::NhBend => "nh-bend".into(),
            Role::Lattice => "lattice".into(),
            Role::Other => "other".into(),
        }
    }
}

/// The digit after `nu` or `v` at the start of a mode id (or after a separator), 1 to 4.
fn numbered(id: &str) -> Option<u8> {
    let lower = id.to_lowercase();
    let mut parts = lower.split(|c: char| !c.is_alphanumeric());
    parts.find_map(|part| {
        let rest = part.strip_prefix("nu").or_else(|| part.strip_prefix('v')).or_else(|| part.strip_prefix('ν'))?;
        rest.chars().next()?.to_digit(10).filter(|d| (1..=4).contains(d)).and_then(|d| u8::try_from(d).ok())
    })
}

/// How the moieties of two modes touch.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord, Hash, serde::Serialize)]
#[serde(rename_all = "kebab-case")]
pub enum Contact {
    /// One moiety.
    SameMoiety,
    /// A ligand water and the metal–oxygen skeleton it belongs to.
    LigandMetal,
    /// Hydrogen-bonded neighbours: a water and an anion, ion and lattice.
    HydrogenBond,
    /// Two waters round one cation.
    DifferentWaters,
    /// No contact.
    None,
}

impl Contact {
    /// The contact of two moieties, from their kinds. In a hydrate every water touches cation and anion; a table that
    /// knows better gives its own constants.
    pub fn of(table: &ModeTable, a: MoietyIndex, b: MoietyIndex) -> Contact {
        use MoietyKind::{Ammonium, Lattice, Other, Oxyanion3, Oxyanion4, Skeleton, Water};
        if a == b {
            return Contact::SameMoiety;
        }
        match (table.moieties[a].kind, table.moieties[b].kind) {
            (Water, Skeleton) | (Skeleton, Water) => Contact::LigandMetal,
            (Water, Water) => Contact::DifferentWaters,
            (Water, Oxyanion3 | Oxyanion4 | Ammonium | Lattice | Other)
            | (Oxyanion3 | Oxyanion4 | Ammonium | Lattice | Other, Water) => Contact::HydrogenBond,
            (Oxyanion3 | Oxyanion4 | Ammonium, Lattice) | (Lattice, Oxyanion3 | Oxyanion4 | Ammonium) => {
                Contact::HydrogenBond
            }
            (Ammonium, Oxyanion3 | Oxyanion4) | (Oxyanion3 | Oxyanion4, Ammonium) => Contact::HydrogenBond,
            _ => Contact::None,
        }
    }

    /// The key used in the defaults file.
    pub fn key(self) -> &'static str {
        match self {
            Contact::SameMoiety => "same-moiety",
            Contact::LigandMetal => "same-water-metal",
            Contact::HydrogenBond => "hydrogen-bond",
            Contact::DifferentWaters => "different-waters",
            Contact::None => "no-contact",
        }
    }
}

/// One row of the defaults.
#[derive(Clone, Debug, PartialEq, serde::Deserialize)]
pub struct DefaultRow {
    /// What it is a default of: `x`, `lambda`, `log10-strength-step`, `fwhm`, `sigma-input`.
    pub quantity: String,
    /// First role key, or `any`.
    pub a: String,
    /// Second role key, or `any`, or empty.
    pub b: String,
    /// `same-mode` or a contact key.
    pub relation: String,
    /// Mean; empty where a formula in the code gives it.
    pub mean: Option<f64>,
    /// One standard uncertainty; a factor for widths.
    pub sigma: Option<f64>,
    /// Unit.
    pub unit: String,
    /// Source or reason.
    pub source: String,
}

/// The defaults of `mode_tables/defaults.csv`.
#[derive(Clone, Debug, Default)]
pub struct Defaults {
    /// Rows in file order.
    pub rows: Vec<DefaultRow>,
}

impl Defaults {
    /// The bundled defaults.
    pub fn bundled() -> &'static Defaults {
        static BUNDLED: OnceLock<Defaults> = OnceLock::new();
        BUNDLED.get_or_init(|| {
            let text = include_str!("../../mode_tables/defaults.csv");
            let mut reader =
                csv::ReaderBuilder::new().comment(Some(b'#')).trim(csv::Trim::All).from_reader(text.as_bytes());
            // The file is compiled in; a test reads every row, so a bad row cannot reach a user.
            Defaults { rows: reader.deserialize().filter_map(Result::ok).collect() }
        })
    }

    /// The row of `quantity` for two roles in either order: named roles first, then one `any`, then both.
    pub fn find(&self, quantity: &str, a: Role, b: Role, relation: &str) -> Option<&DefaultRow> {
        let (a, b) = (a.key(), b.key());
        let pick = |x: &str, y: &str| {
            self.rows.iter().find(|r| {
                r.quantity == quantity && r.relation == relation && ((r.a == x && r.b == y) || (r.a == y && r.b == x))
            })
        };
        pick(&a, &b).or_else(|| pick(&a, "any")).or_else(|| pick("any", &b)).or_else(|| pick("any", "any"))
    }

    /// Full width at half maximum of a fundamental, cm⁻¹, and the factor of its uncertainty.
    ///
    /// OH stretch: max(20, 0.3 (3700 − ν)); OD stretch 0.6 of the OH value at the corresponding wavenumber; the others
    /// from the file. Judgement, from ice, liquid water and crystals.
    pub fn width(&self, role: Role, wavenumber: f64) -> (f64, f64) {
        let row = self.rows.iter().find(|r| r.quantity == "fwhm" && r.a == role.key());
        let factor = row.and_then(|r| r.sigma).unwrap_or(2.0);
        let width = match role {
            Role::OhStretch => (0.3 * (3_700.0 - wavenumber)).max(20.0),
            Role::OdStretch => 0.6 * (0.3 * (3_700.0 - wavenumber * 1.355)).max(20.0),
            Role::NhStretch => 60.0,
            _ => row.and_then(|r| r.mean).unwrap_or(20.0),
        };
        (width, factor)
    }
}

/// ωx of an OH bond from its stretch wavenumber, cm⁻¹, with one standard uncertainty.
///
/// # Method
/// ωx(ν) = 80 + 0.088 D + 3.5·10⁻⁵ D², D = 3700 − ν, 0 ≤ D ≤ 600: a fit (residual 2 cm⁻¹) to the field maps of
/// Auer & Skinner, J. Chem. Phys. 128, 224511 (2008), and Gruenbaum and others, J. Chem. Theory Comput. 9, 3109
/// (2013), whose coefficients were read; one sigma is 12 % + 3 cm⁻¹ (judgement).
pub fn omega_x(stretch: f64) -> (f64, f64) {
    let d = (3_700.0 - stretch).clamp(0.0, 600.0);
    let value = 80.0 + 0.088 * d + 3.5e-5 * d * d;
    (value, 0.12 * value + 3.0)
}

/// ωx of an OD bond, cm⁻¹, with one standard uncertainty: 0.53 of that of the OH bond whose stretch lies 1.355 times
/// higher (Morse scaling ωx ~ 1/µ; ratio from gas and hydrate pairs).
pub fn omega_x_deuterated(stretch: f64) -> (f64, f64) {
    let (value, sigma) = omega_x(1.355 * stretch);
    (0.53 * value, 0.53 * sigma)
}
