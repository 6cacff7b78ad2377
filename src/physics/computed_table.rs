//! Normal modes become a mode table: harmonic wavenumbers as they are, or fundamentals by a scale factor; never both.

use super::elements::Exchange;
use super::moieties::Structure;
use super::motion::{Description, Family};
use super::normal_modes::NormalModes;
use crate::library::scale_factors::{ScaleFactor, relative_sigma};
use crate::mode::{Basis, Mode, ModeTable, Strength, TableOrigin};
use crate::note::{Note, Noted};
use crate::quantity::Wavenumber;
use crate::read::qcschema::HessianRecord;

/// Uncertainty, cm⁻¹, that every computed mode has beside the relative one: surroundings that the model leaves out (a
/// judgement of this project).
const LEAST_SIGMA: f64 = 10.0;

/// The moiety name of a mode: its fragment, or the metal–oxygen skeleton for motions of the metal and against it.
pub fn moiety_name(structure: &Structure, described: &Description) -> String {
    let fragment = described.fragment;
    let skeleton = |metal: usize| structure.skeletons.get(&metal).cloned();
    let of_metal = match described.class.family {
        Family::MetalOxygen | Family::Skeleton => {
            structure.coordination[fragment].and_then(|(metal, _)| skeleton(metal))
        }
        Family::Translation => skeleton(fragment),
        _ => None,
    };
    of_metal.unwrap_or_else(|| structure.fragments[fragment].name.clone())
}

/// The mode table of normal modes.
///
/// Without `scale` the wavenumbers are harmonic and the table says so: whoever reads it adds anharmonic constants. With it
/// they are fundamentals: a scale factor contains the mean anharmonicity, so no constant is added to reach them.
/// Imaginary modes are left out with a note.
pub fn mode_table(
    record: &HessianRecord,
    modes: &NormalModes,
    structure: &Structure,
    described: &[Description],
    scale: Option<&ScaleFactor>,
    exchanges: &[Exchange],
) -> Noted<ModeTable> {
    let level = record.level_of_theory();
    let mut notes = Vec::new();
    let strongest = modes.modes.iter().filter_map(|m| m.infrared).fold(0.0_f64, f64::max);
    let title = if record.title.is_empty() { record.name.as_str() } else { record.title.as_str() };
    let mut table = ModeTable {
        name: title.to_owned(),
        title: format!("{title}, computed"),
        basis: if scale.is_some() { Basis::Fundamental } else { Basis::Harmonic },
        origin: TableOrigin::Computed,
        source: match scale {
            None => format!("{level} ({}), harmonic", record.creator),
            Some(scale) => {
                format!("{level} ({}), harmonic × {:.4}: {}", record.creator, scale.factor, scale.source)
            }
        },
        isotopes: exchanges.iter().map(|e| e.text.clone()).collect(),
        ..ModeTable::default()
    };
    let relative = scale.map_or_else(|| relative_sigma(&record.method), |s| s.relative_sigma);
    let factor = scale.map_or(1.0, |s| s.factor);
    let mut spread = 0_usize;
    for (number, (mode, described)) in modes.modes.iter().zip(described).enumerate() {
        let Ok(wavenumber) = Wavenumber::from_inverse_cm(mode.wavenumber * factor) else {
            notes.push(Note::new(format!("mode {} is imaginary and left out of the mode table", number + 1)));
            continue;
        };
        spread += usize::from(described.concentration < 0.5);
        let moiety = table.intern_moiety(&moiety_name(structure, described));
        table.modes.push(Mode {
            id: format!("q{}", number + 1),
            moiety,
            motion: described.motion(),
            wavenumber,
            sigma: (relative * wavenumber.inverse_cm()).hypot(LEAST_SIGMA),
            sigma_given: true,
            degeneracy: 1,
            species: None,
            ir: mode
                .infrared
                .filter(|_| strongest > 0.0)
                .map(|i| Strength::Relative((i / strongest * 1.0e4).round() / 1.0e4)),
            raman: None,
            fwhm: None,
            source: format!("{}, purity {:.2}", described.words(), described.purity),
        });
    }
    if spread > 0 {
        notes.push(Note::new(format!(
            "{spread} modes are spread over like moieties with less than half on any one; each is counted to one of them, \
             so that every moiety has its own set"
        )));
    }
    if scale.is_none() {
        notes.push(Note::new(
            "the wavenumbers are harmonic, not fundamentals: anharmonic constants or a scale factor lead there, never both",
        ));
    }
    table.settle_moieties();
    Noted { value: table, notes }
}
