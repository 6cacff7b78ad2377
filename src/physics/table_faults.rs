//! Faults and doubts of a mode table: what cannot be, and what looks odd.

use serde::Serialize;

use super::symmetry::PointGroup;
use crate::mode::{Basis, ConstantKind, ModeTable, MoietyKind, Motion};

/// How bad it is.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord, Serialize)]
#[serde(rename_all = "kebab-case")]
pub enum Severity {
    /// Predictions from it are wrong.
    Fault,
    /// It may be right, but look at it.
    Doubt,
}

/// One finding.
#[derive(Clone, Debug, PartialEq, Eq, PartialOrd, Ord, Serialize)]
pub struct Finding {
    /// How bad.
    pub severity: Severity,
    /// Mode, constant or moiety it is about; empty for the table.
    pub about: String,
    /// What is wrong, in a sentence.
    pub message: String,
}

/// Where a fundamental of a motion can lie, cm⁻¹ (common practice, no source; wide on purpose, deuterium and strong
/// hydrogen bonds included).
pub fn possible_range(motion: Motion) -> (f64, f64) {
    match motion {
        Motion::OhStretch => (1_600.0, 3_980.0),
        Motion::HohBend => (1_050.0, 1_850.0),
        Motion::Libration => (200.0, 1_200.0),
        Motion::MetalOxygen => (80.0, 850.0),
        Motion::XoStretch => (550.0, 1_700.0),
        Motion::OxoBend => (150.0, 1_000.0),
        Motion::NhStretch => (1_900.0, 3_550.0),
        Motion::NhBend => (950.0, 1_850.0),
        Motion::Lattice => (3.0, 700.0),
        Motion::Other => (3.0, 5_000.0),
    }
}

/// All findings about a table, faults first.
pub fn findings(table: &ModeTable) -> Vec<Finding> {
    let mut list = Vec::new();
    let mut add = |severity, about: &str, message: String| {
        list.push(Finding { severity, about: about.to_owned(), message });
    };
    let group = table.point_group.as_deref().map(|name| (name, PointGroup::named(name)));
    if let Some((name, None)) = group {
        add(Severity::Fault, "", format!("point group `{name}` is not known"));
    }
    for mode in &table.modes {
        let wavenumber = mode.wavenumber.inverse_cm();
        let (low, high) = possible_range(mode.motion);
        // Harmonic stretches lie up to a tenth above the fundamentals.
        let high = if table.basis == Basis::Harmonic { 1.1 * high } else { high };
        if !(low..=high).contains(&wavenumber) {
            add(
                Severity::Fault,
                &mode.id,
                format!("{wavenumber} cm⁻¹ is impossible for a {}: expected {low:.0} to {high:.0}", mode.motion),
            );
        }
        if mode.sigma_given && mode.sigma == 0.0 {
            add(Severity::Fault, &mode.id, "an uncertainty of zero: no fundamental of a solid is known exactly".into());
        } else if mode.sigma > 0.2 * wavenumber {
            add(
                Severity::Doubt,
                &mode.id,
                format!("an uncertainty of {} cm⁻¹ is more than a fifth of the wavenumber", mode.sigma),
            );
        } else if !mode.sigma_given {
            add(Severity::Doubt, &mode.id, format!("no uncertainty given; {} cm⁻¹ is assumed", mode.sigma));
        }
        if mode.source.trim().is_empty() {
            add(Severity::Doubt, &mode.id, "no source".into());
        }
        match (&mode.species, &group) {
            (Some(species), Some((name, Some(known)))) => match known.irrep(species) {
                None => add(Severity::Fault, &mode.id, format!("species `{species}` is not in point group {name}")),
                Some(irrep) if u32::from(mode.degeneracy) != u32::from(known.dimension(irrep)) => add(
                    Severity::Doubt,
                    &mode.id,
                    format!(
                        "species `{species}` has dimension {}, the table says degeneracy {}",
                        known.dimension(irrep),
                        mode.degeneracy
                    ),
                ),
                Some(_) => {}
            },
            (Some(species), None) => {
                add(Severity::Doubt, &mode.id, format!("species `{species}` without a point group in the metadata"));
            }
            _ => {}
        }
    }
    for (index, moiety) in table.moieties.iter().enumerate() {
        let of = |motion: Motion| table.modes.iter().filter(move |m| m.moiety == index && m.motion == motion);
        if moiety.kind == MoietyKind::Water {
            let bends = of(Motion::HohBend).count();
            if bends > 1 {
                add(
                    Severity::Doubt,
                    &moiety.name,
                    format!("{bends} bends in one water: two waters that differ are two moieties"),
                );
            }
            let stretches: u32 = of(Motion::OhStretch).map(|m| u32::from(m.degeneracy)).sum();
            if stretches > 2 {
                add(Severity::Doubt, &moiety.name, format!("{stretches} OH stretches in one water: it has two bonds"));
            }
            if bends > 0 && stretches == 0 {
                add(
                    Severity::Doubt,
                    &moiety.name,
                    "a bend but no OH stretch: overtones near 1.45 µm are missing".into(),
                );
            }
        }
        for (position, mode) in table.modes.iter().enumerate().filter(|(_, m)| m.moiety == index) {
            let Some(species) = mode.species.as_deref().filter(|s| s.to_uppercase().starts_with('E')) else { continue };
            let twin = table.modes[..position].iter().find(|m| {
                m.moiety == index
                    && m.species.as_deref() == Some(species)
                    && m.motion == mode.motion
                    && m.degeneracy == 1
            });
            if let Some(twin) = twin
                && mode.degeneracy == 1
            {
                let gap = (twin.wavenumber.inverse_cm() - mode.wavenumber.inverse_cm()).abs();
                if gap > 1.0 && gap < 100.0 {
                    add(
                        Severity::Fault,
                        &mode.id,
                        format!(
                            "`{}` and `{}` are a degenerate pair ({species}) but differ by {gap:.1} cm⁻¹",
                            twin.id, mode.id
                        ),
                    );
                }
            }
        }
        let water_in_formula = moiety.kind == MoietyKind::Water && !table.formula.is_empty();
        if water_in_formula && !["H2O", "D2O", "HDO", "HOD", "NH4"].iter().any(|w| table.formula.contains(w)) {
            add(Severity::Doubt, &moiety.name, format!("the formula {} has no water", table.formula));
        }
    }
    for constant in &table.constants {
        let about = format!("{}({},{})", constant.kind.name(), table.modes[constant.a].id, table.modes[constant.b].id);
        let stretch = |index: usize| table.modes[index].motion == Motion::OhStretch;
        let size = constant.value.0;
        if constant.kind == ConstantKind::X && constant.a == constant.b && stretch(constant.a) && size > 0.0 {
            add(
                Severity::Fault,
                &about,
                format!(
                    "{size:+} cm⁻¹: the diagonal constant of an OH stretch is negative (x is added with its own sign)"
                ),
            );
        }
        if constant.kind == ConstantKind::X && size.abs() > 200.0 {
            add(Severity::Doubt, &about, format!("{size:+} cm⁻¹ is larger than any constant known for such modes"));
        }
        if constant.source.trim().is_empty() {
            add(Severity::Doubt, &about, "no source".into());
        }
        let pair = constant.a != constant.b
            && stretch(constant.a)
            && stretch(constant.b)
            && table.modes[constant.a].moiety == table.modes[constant.b].moiety;
        if pair && constant.kind == ConstantKind::X && size < -100.0 {
            let local = table.constants.iter().any(|k| {
                k.kind == ConstantKind::OneOne
                    && (k.a.min(k.b), k.a.max(k.b)) == (constant.a.min(constant.b), constant.a.max(constant.b))
            });
            if local {
                add(
                    Severity::Fault,
                    &about,
                    "two pictures of one water are mixed: a large pair constant belongs to normal modes, a 1:1 coupling to \
                     local bonds; keep one"
                        .into(),
                );
            }
        }
    }
    list.sort();
    list
}
