//! One picture per water: two local bonds, or normal modes with their own constants, never a mixture.

use crate::library::defaults::Role;
use crate::mode::{ConstantKind, ModeIndex, ModeTable, MoietyIndex, MoietyKind};

/// A water whose stretching constants belong to two pictures.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct MixedPicture {
    /// The water.
    pub moiety: MoietyIndex,
    /// What contradicts what, and why it matters.
    pub reason: String,
}

/// Waters whose given constants mix the local-bond and the normal-mode description of the two O–H stretches.
///
/// # Method
/// In normal modes of a pair of bonds with anharmonicity ωx the own constants are −ωx/2 and the mutual one −2 ωx (x₁₃ =
/// −165 cm⁻¹ in water vapour); in local bonds they are −ωx and about zero. Own constants near −ωx beside a mutual one near
/// −2 ωx count the same anharmonicity twice. Thresholds lie halfway, for ωx of 80 cm⁻¹ at 3700 cm⁻¹ and scaled with the
/// square of the wavenumber (ωx of O–D is half of that of O–H). Own constants that are missing would be filled in with −ωx.
pub fn mixed_pictures(table: &ModeTable) -> Vec<MixedPicture> {
    let mut found = Vec::new();
    for (moiety, entry) in table.moieties.iter().enumerate() {
        if entry.kind != MoietyKind::Water {
            continue;
        }
        let pair: Vec<ModeIndex> = (0..table.modes.len())
            .filter(|i| table.modes[*i].moiety == moiety)
            .filter(|i| matches!(Role::of(table, *i), Role::OhStretch | Role::OdStretch))
            .collect();
        let &[a, b] = pair.as_slice() else { continue };
        let scale =
            (0.5 * (table.modes[a].wavenumber.inverse_cm() + table.modes[b].wavenumber.inverse_cm()) / 3_700.0).powi(2);
        let given = |kind, i, j| table.constant(kind, i, j).map(|k| k.value.0);
        let own = [given(ConstantKind::X, a, a), given(ConstantKind::X, b, b)];
        let mutual = given(ConstantKind::X, a, b);
        let normal = mutual.is_some_and(|x| x < -100.0 * scale);
        let local_own = own.iter().flatten().any(|x| *x < -65.0 * scale);
        let tie = given(ConstantKind::OneOne, a, b).is_some();
        let darling = given(ConstantKind::DarlingDennison, a, b).is_some();
        let name = |i: ModeIndex| table.modes[i].id.as_str();
        let mut add = |what: String| {
            found.push(MixedPicture {
                moiety,
                reason: format!(
                    "{}: {what}; choose one picture: normal modes (own constants near −40, mutual one near −165 and a \
                     darling-dennison row) or local bonds (no constants of the pair at all)",
                    entry.name
                ),
            });
        };
        let x = mutual.unwrap_or(0.0);
        if normal && tie {
            add(format!(
                "x({}, {}) = {x:.0} belongs to normal modes, the one-one row to local bonds",
                name(a),
                name(b)
            ));
        } else if normal && local_own {
            add(format!(
                "x({}, {}) = {x:.0} belongs to normal modes, the own constants below −65 to local bonds; together they \
                 count one anharmonicity twice",
                name(a),
                name(b)
            ));
        } else if normal && own.iter().any(Option::is_none) {
            add(format!(
                "x({}, {}) = {x:.0} belongs to normal modes, but an own constant is missing and would be that of a local \
                 bond (about −80)",
                name(a),
                name(b)
            ));
        } else if darling && local_own {
            add("the darling-dennison row belongs to normal modes, the own constants below −65 to local bonds"
                .to_owned());
        } else if darling && tie {
            add("the darling-dennison row belongs to normal modes, the one-one row to local bonds".to_owned());
        }
    }
    found
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::mode::{Constant, Mode, Motion};
    use crate::quantity::{Shift, Wavenumber};

    fn water(constants: &[(ConstantKind, usize, usize, f64)]) -> ModeTable {
        let mut table = ModeTable::default();
        let moiety = table.intern_moiety("H2O");
        for (id, nu) in [("nu1", 3657.0), ("nu3", 3756.0)] {
            table.modes.push(Mode {
                id: id.into(),
                moiety,
                motion: Motion::OhStretch,
                wavenumber: Wavenumber::from_inverse_cm(nu).unwrap(),
                sigma: 1.0,
                sigma_given: true,
                degeneracy: 1,
                species: None,
                ir: None,
                raman: None,
                fwhm: None,
                source: String::new(),
            });
        }
        for &(kind, a, b, value) in constants {
            table.constants.push(Constant {
                kind,
                a,
                b,
                c: None,
                value: Shift(value),
                sigma: 1.0,
                source: String::new(),
            });
        }
        table.settle_moieties();
        table
    }

    #[test]
    fn whole_pictures_pass_and_mixtures_are_found() {
        use ConstantKind::{DarlingDennison, OneOne, X};
        let normal = [(X, 0, 0, -42.6), (X, 1, 1, -47.6), (X, 0, 1, -165.8)];
        assert!(mixed_pictures(&water(&[])).is_empty());
        assert!(mixed_pictures(&water(&normal)).is_empty());
        assert!(mixed_pictures(&water(&[&normal[..], &[(DarlingDennison, 0, 1, -74.5)]].concat())).is_empty());
        assert!(mixed_pictures(&water(&[(X, 0, 0, -80.0), (X, 1, 1, -80.0), (OneOne, 0, 1, -45.0)])).is_empty());

        assert_eq!(mixed_pictures(&water(&[(X, 0, 1, -165.0)])).len(), 1, "own constants would be those of bonds");
        assert_eq!(mixed_pictures(&water(&[(X, 0, 0, -80.0), (X, 1, 1, -80.0), (X, 0, 1, -165.0)])).len(), 1);
        assert_eq!(mixed_pictures(&water(&[&normal[..], &[(OneOne, 0, 1, -45.0)]].concat())).len(), 1);
        assert_eq!(mixed_pictures(&water(&[(X, 0, 0, -80.0), (DarlingDennison, 0, 1, -74.5)])).len(), 1);
    }
}
