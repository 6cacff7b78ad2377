//! Elements: numbers, isotopic masses, covalent radii.

/// One element.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Element {
    /// Symbol.
    pub symbol: &'static str,
    /// Mass of the most abundant isotope, u.
    pub mass: f64,
    /// Single-bond covalent radius, Å.
    pub radius: f64,
    /// Whether its bonds to oxygen are those of a metal ion: counted as coordination, not as part of a molecule.
    pub metal: bool,
}

const fn element(symbol: &'static str, mass: f64, radius: f64, metal: bool) -> Element {
    Element { symbol, mass, radius, metal }
}

/// Elements of hydrated salts. Masses: NIST, Atomic Weights and Isotopic Compositions (after the 2012 mass evaluation);
/// H, N, O, Na, Mg, S, Cl, Ca and Zn agree with the files of `tests/data/quantum_chemistry`, the others are from memory.
/// Radii: Cordero et al., Dalton Trans. 2008, 2832 (from memory); they decide what is bonded, within a quarter.
pub const ELEMENTS: [Element; 46] = [
    element("H", 1.007_825_032_23, 0.31, false),
    element("Li", 7.016_003_436_6, 1.28, true),
    element("Be", 9.012_183_065, 0.96, true),
    element("B", 11.009_305_36, 0.84, false),
    element("C", 12.0, 0.76, false),
    element("N", 14.003_074_004_43, 0.71, false),
    element("O", 15.994_914_619_57, 0.66, false),
    element("F", 18.998_403_162_73, 0.57, false),
    element("Na", 22.989_769_282, 1.66, true),
    element("Mg", 23.985_041_697, 1.41, true),
    element("Al", 26.981_538_53, 1.21, true),
    element("Si", 27.976_926_534_65, 1.11, false),
    element("P", 30.973_761_998_42, 1.07, false),
    element("S", 31.972_071_174_4, 1.05, false),
    element("Cl", 34.968_852_682, 1.02, false),
    element("K", 38.963_706_486_4, 2.03, true),
    element("Ca", 39.962_590_863, 1.76, true),
    element("Ti", 47.947_941_98, 1.60, true),
    element("V", 50.943_957_04, 1.53, true),
    element("Cr", 51.940_506_23, 1.39, true),
    element("Mn", 54.938_043_91, 1.50, true),
    element("Fe", 55.934_936_33, 1.42, true),
    element("Co", 58.933_194_29, 1.38, true),
    element("Ni", 57.935_342_41, 1.24, true),
    element("Cu", 62.929_597_72, 1.32, true),
    element("Zn", 63.929_142_01, 1.22, true),
    element("Ga", 68.925_573_5, 1.22, true),
    element("As", 74.921_594_57, 1.19, false),
    element("Se", 79.916_521_8, 1.20, false),
    element("Br", 78.918_337_6, 1.20, false),
    element("Rb", 84.911_789_737_9, 2.20, true),
    element("Sr", 87.905_612_5, 1.95, true),
    element("Y", 88.905_840_3, 1.90, true),
    element("Zr", 89.904_697_7, 1.75, true),
    element("Mo", 97.905_404_82, 1.54, false),
    element("Ag", 106.905_091_6, 1.45, true),
    element("Cd", 113.903_365_09, 1.44, true),
    element("Sn", 119.902_201_63, 1.39, true),
    element("Te", 129.906_222_748, 1.38, false),
    element("I", 126.904_471_9, 1.39, false),
    element("Cs", 132.905_451_961, 2.44, true),
    element("Ba", 137.905_247, 2.15, true),
    element("La", 138.906_356_3, 2.07, true),
    element("Ce", 139.905_443_1, 2.04, true),
    element("W", 183.950_930_92, 1.62, false),
    element("Pb", 207.976_652_5, 1.46, true),
];

/// Isotopes that are exchanged in practice: name, element, mass in u (NIST as above, from memory but for D).
const ISOTOPES: [(&str, &str, f64); 22] = [
    ("D", "H", 2.014_101_778_12),
    ("T", "H", 3.016_049_277_9),
    ("6Li", "Li", 6.015_122_887_4),
    ("10B", "B", 10.012_936_95),
    ("13C", "C", 13.003_354_835_07),
    ("15N", "N", 15.000_108_898_88),
    ("17O", "O", 16.999_131_756_5),
    ("18O", "O", 17.999_159_612_86),
    ("25Mg", "Mg", 24.985_836_976),
    ("26Mg", "Mg", 25.982_592_968),
    ("29Si", "Si", 28.976_494_664_9),
    ("33S", "S", 32.971_458_909_8),
    ("34S", "S", 33.967_867_004),
    ("37Cl", "Cl", 36.965_902_602),
    ("41K", "K", 40.961_825_257_9),
    ("44Ca", "Ca", 43.955_481_56),
    ("54Fe", "Fe", 53.939_608_99),
    ("65Cu", "Cu", 64.927_789_7),
    ("66Zn", "Zn", 65.926_033_81),
    ("68Zn", "Zn", 67.924_844_55),
    ("81Br", "Br", 80.916_289_7),
    ("62Ni", "Ni", 61.928_345_37),
];

/// The element of that symbol. `D` and `T` are hydrogen.
pub fn named(symbol: &str) -> Option<&'static Element> {
    let symbol = if matches!(symbol, "D" | "T") { "H" } else { symbol };
    ELEMENTS.iter().find(|e| e.symbol == symbol)
}

/// Element and mass in u of an isotope as written: `D`, `2H`, `18O`, `37Cl`; an element alone is its most abundant isotope.
pub fn isotope(name: &str) -> Option<(&'static Element, f64)> {
    let name = match name.trim() {
        "2H" => "D",
        "3H" => "T",
        other => other,
    };
    if let Some((_, symbol, mass)) = ISOTOPES.iter().find(|(known, ..)| *known == name) {
        return Some((named(symbol)?, *mass));
    }
    let symbol = name.trim_start_matches(|c: char| c.is_ascii_digit());
    let element = named(symbol)?;
    let number = &name[..name.len() - symbol.len()];
    let common = number.is_empty() || number.parse() == Ok(element.mass.round());
    common.then_some((element, element.mass))
}

/// An exchange of isotopes.
#[derive(Clone, Debug, PartialEq)]
pub struct Exchange {
    /// As written: `H=D`.
    pub text: String,
    /// Symbol of the element.
    pub symbol: &'static str,
    /// New mass, u.
    pub mass: f64,
}

impl Exchange {
    /// The exchange that a person wrote: `H=D`, `O=18O`, `35Cl=37Cl`.
    ///
    /// # Errors
    /// A sentence that says what is wrong and what to write.
    pub fn from_text(text: &str) -> Result<Self, String> {
        let hint = "\n  hint: write an exchange like H=D, O=18O or Cl=37Cl";
        let (from, to) = text.split_once('=').ok_or_else(|| format!("`{text}` is no exchange of isotopes{hint}"))?;
        let (element, _) = isotope(from).ok_or_else(|| format!("`{}` is no element known here{hint}", from.trim()))?;
        let (other, mass) = isotope(to).ok_or_else(|| format!("`{}` is no isotope known here{hint}", to.trim()))?;
        if element.symbol != other.symbol {
            return Err(format!("`{text}` exchanges {} for {}, another element{hint}", element.symbol, other.symbol));
        }
        Ok(Self { text: text.trim().to_owned(), symbol: element.symbol, mass })
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn isotopes_are_named_in_both_ways() {
        assert_eq!(isotope("D").map(|i| i.1), isotope("2H").map(|i| i.1));
        assert_eq!(isotope("35Cl").map(|i| i.0.symbol), Some("Cl"));
        assert_eq!(isotope("99Cl"), None);
        assert!(Exchange::from_text("H=18O").unwrap_err().contains("another element"));
        assert!(Exchange::from_text("H").is_err());
    }

    #[test]
    fn every_isotope_weighs_about_its_mass_number_and_belongs_to_an_element() {
        for (name, symbol, mass) in ISOTOPES {
            assert!(named(symbol).is_some(), "{name}");
            // No mass excess of a stable nuclide reaches 0.1 u.
            assert!((mass - mass.round()).abs() < 0.1, "{name}");
            let digits: String = name.chars().take_while(char::is_ascii_digit).collect();
            assert!(digits.is_empty() || digits.parse() == Ok(mass.round()), "{name}");
        }
        assert!(ELEMENTS.iter().all(|e| (e.mass - e.mass.round()).abs() < 0.1));
    }
}
