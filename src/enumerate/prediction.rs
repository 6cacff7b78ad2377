//! Predicted transitions of a table in a window: position, uncertainty, strength, width, activity.

use std::borrow::Cow;

use rayon::prelude::*;

use super::walk::{Filter, TooManyLevels, levels_in};
use crate::level::{Excitation, Level};
use crate::mode::{ModeTable, Motion};
use crate::note::{Note, Noted};
use crate::physics::position::{Gradient, Model};
use crate::physics::resonance;
use crate::physics::strength::{ExpectedStrength, FORBIDDEN_STEP, Strengths};
use crate::physics::symmetry::{Activity, PointGroup};

/// What to predict.
#[derive(Clone, Debug)]
pub struct Request {
    /// Window, cm⁻¹, ascending.
    pub window: (f64, f64),
    /// Most quanta of a final level.
    pub quanta: u8,
    /// Most levels to hold.
    pub budget: usize,
    /// Hot transitions from single quanta of low modes, at this temperature, K.
    pub hot: Option<f64>,
}

/// Levels that fit into memory comfortably (about 200 bytes each).
pub const BUDGET: usize = 2_000_000;

/// Initial levels with less than this Boltzmann weight are left out.
const LEAST_POPULATION: f64 = 1.0e-3;

/// k/(hc), cm⁻¹/K: CODATA 2018 (0.695 034 800).
const BOLTZMANN: f64 = 0.695_034_8;

/// One predicted transition.
#[derive(Clone, Debug, PartialEq)]
pub struct Predicted {
    /// Final level; a mixed level has the name of its largest share.
    pub level: Level,
    /// Initial level when it is not the ground level.
    pub from: Option<Level>,
    /// Position, cm⁻¹.
    pub position: f64,
    /// Variance of the position, cm⁻².
    pub variance: f64,
    /// Expected strength.
    pub strength: ExpectedStrength,
    /// Expected full width at half maximum, cm⁻¹.
    pub width: f64,
    /// Species content with multiplicities; empty when unknown.
    pub species: Vec<(String, u32)>,
    /// Infrared activity.
    pub infrared: Activity,
    /// Why.
    pub reason: Cow<'static, str>,
    /// Raman activity.
    pub raman: Activity,
    /// Zero-order shares of a mixed level, largest first; empty when not mixed.
    pub shares: Vec<(Level, f64)>,
    /// Derivatives of the position of a mixed level; `None`: those of the model at `level`.
    pub gradient: Option<Gradient>,
}

/// Symmetry of the levels of one table: its group and the species of its modes, where it gives them.
pub struct LevelSymmetry {
    group: Option<PointGroup>,
    species: Vec<Option<crate::physics::symmetry::Irrep>>,
}

/// Species and activities of one level.
#[derive(Clone, Debug, PartialEq)]
pub struct LevelActivity {
    /// Species content with multiplicities; empty when unknown.
    pub species: Vec<(String, u32)>,
    /// Infrared activity.
    pub infrared: Activity,
    /// Why.
    pub reason: Cow<'static, str>,
    /// Raman activity.
    pub raman: Activity,
}

impl LevelSymmetry {
    /// Looks up the group and species of a table; unknown ones stay unknown.
    pub fn of(table: &ModeTable) -> Self {
        let group = table.point_group.as_deref().and_then(PointGroup::named);
        let species =
            table.modes.iter().map(|mode| group.as_ref().and_then(|g| g.irrep(mode.species.as_deref()?))).collect();
        Self { group, species }
    }

    /// Species and activities of the transition from the ground level.
    pub fn activity(&self, level: &Level) -> LevelActivity {
        let unknown = |reason: &'static str| LevelActivity {
            species: Vec::new(),
            infrared: Activity::Unknown,
            reason: Cow::Borrowed(reason),
            raman: Activity::Unknown,
        };
        let Some(group) = &self.group else { return unknown("the table names no point group") };
        let mut factors = Vec::with_capacity(level.excitations().len());
        for e in level.excitations() {
            match self.species[usize::from(e.mode)] {
                Some(irrep) => factors.push((irrep, e.quanta)),
                None => return unknown("a mode has no species"),
            }
        }
        let content = group.level_species(&factors);
        let infrared = content.iter().any(|(irrep, _)| group.infrared(*irrep));
        let raman = content.iter().any(|(irrep, _)| group.raman(*irrep));
        let word = |yes| if yes { Activity::Allowed } else { Activity::Forbidden };
        let reason = if infrared { Cow::Borrowed("") } else { Cow::Owned(group.forbidden_reason(&factors)) };
        LevelActivity {
            species: content.iter().map(|(irrep, n)| (group.irrep_name(*irrep).to_owned(), *n)).collect(),
            infrared: word(infrared),
            reason,
            raman: word(raman),
        }
    }
}

/// Predicts the transitions of a table.
///
/// Resonances of the model are mixed: levels are walked with a margin as wide as the couplings need, mixed, then
/// trimmed to the window. Output ascends by position, then level.
///
/// # Errors
/// [`TooManyLevels`] when the window holds more than `request.budget` levels.
pub fn predict(table: &ModeTable, model: &Model, request: &Request) -> Result<Noted<Vec<Predicted>>, TooManyLevels> {
    let strengths = Strengths::of(table, model);
    let symmetry = LevelSymmetry::of(table);
    let mut notes = Vec::new();
    let mut list = from_ground(model, request, &strengths, &symmetry)?;
    if let Some(kelvin) = request.hot {
        let hot = hot_transitions(table, model, request, &strengths, &symmetry, kelvin)?;
        notes.push(Note::new(format!(
            "{} hot transitions at {kelvin} K from modes with a Boltzmann weight of at least {LEAST_POPULATION}",
            hot.len()
        )));
        list.extend(hot);
    }
    // The walk gives its levels in this order already; mixing and hot transitions change it.
    if request.hot.is_some() || !model.resonances.is_empty() {
        list.sort_by(|a, b| {
            a.position.total_cmp(&b.position).then_with(|| a.level.cmp(&b.level)).then_with(|| a.from.cmp(&b.from))
        });
    }
    Ok(Noted { value: list, notes })
}

fn from_ground(
    model: &Model,
    request: &Request,
    strengths: &Strengths,
    symmetry: &LevelSymmetry,
) -> Result<Vec<Predicted>, TooManyLevels> {
    let (low, high) = request.window;
    // Mixing moves a level by at most the norm of its couplings, which grow with the quanta.
    let margin: f64 =
        model.resonances.iter().map(|r| r.element.value.abs() * f64::from(request.quanta).powi(2)).fold(0.0, f64::max);
    let found = levels_in(model, (low - margin, high + margin), request.quanta, &Filter::default(), request.budget)?;
    if model.resonances.is_empty() {
        return Ok(found
            .into_par_iter()
            .map(|f| {
                let variance = model.variance(&f.level);
                describe(f.level, f.position, variance, Vec::new(), strengths, symmetry)
            })
            .collect());
    }
    let levels: Vec<Level> = found.into_iter().map(|f| f.level).collect();
    let mixed = resonance::mix(model, &levels);
    Ok(mixed
        .into_iter()
        .filter(|m| (low..=high).contains(&m.position))
        .map(|m| {
            let variance = m.variance(model);
            if m.shares.len() < 2 {
                return describe(m.level, m.position, variance, Vec::new(), strengths, symmetry);
            }
            let mut mixed = describe(m.level, m.position, variance, m.shares, strengths, symmetry);
            mixed.gradient = Some(m.gradient);
            mixed
        })
        .collect())
}

fn describe(
    level: Level,
    position: f64,
    variance: f64,
    shares: Vec<(Level, f64)>,
    strengths: &Strengths,
    symmetry: &LevelSymmetry,
) -> Predicted {
    let activity = symmetry.activity(&level);
    let mut strength = strengths.expected(&level);
    if shares.len() > 1 {
        // Strength is shared like the squared coefficients: a dark level borrows what a bright partner gives.
        let power: f64 = shares.iter().map(|(zero, share)| share * 10f64.powf(strengths.expected(zero).log10)).sum();
        strength.log10 = power.max(1.0e-30).log10();
    }
    if activity.infrared == Activity::Forbidden {
        strength.log10 += FORBIDDEN_STEP;
    }
    Predicted {
        width: strengths.width(&level),
        from: None,
        position,
        variance,
        strength,
        species: activity.species,
        infrared: activity.infrared,
        reason: activity.reason,
        raman: activity.raman,
        shares,
        gradient: None,
        level,
    }
}

/// Transitions that start from one quantum of a thermally excited mode.
fn hot_transitions(
    table: &ModeTable,
    model: &Model,
    request: &Request,
    strengths: &Strengths,
    symmetry: &LevelSymmetry,
    kelvin: f64,
) -> Result<Vec<Predicted>, TooManyLevels> {
    let mut list = Vec::new();
    for mode in 0..table.modes.len() {
        let population = (-model.nu[mode] / (BOLTZMANN * kelvin)).exp();
        if population < LEAST_POPULATION {
            continue;
        }
        let start = Level::new([Excitation::new(mode, 1)]);
        let window = (request.window.0 + model.nu[mode], request.window.1 + model.nu[mode]);
        for found in levels_in(model, window, request.quanta, &Filter::default(), request.budget)? {
            if found.level == start {
                continue;
            }
            // The transition changes the level by these quanta; its strength is that of the same change from ground.
            let same = found.level.quanta_in(mode) > 0;
            let change = Level::new(found.level.excitations().iter().map(|e| Excitation {
                quanta: if usize::from(e.mode) == mode { e.quanta - 1 } else { e.quanta },
                ..*e
            }));
            let carrier = if same {
                change.clone()
            } else {
                Level::new(found.level.excitations().iter().copied().chain([Excitation::new(mode, 1)]))
            };
            if change.order() == 0 {
                continue;
            }
            let variance =
                model.variance(&found.level) + model.variance(&start) - 2.0 * model.covariance(&found.level, &start);
            let position = found.position - model.nu[mode];
            let mut predicted = describe(carrier, position, variance.max(0.0), Vec::new(), strengths, symmetry);
            predicted.strength.log10 += population.log10();
            predicted.level = found.level;
            predicted.from = Some(start.clone());
            list.push(predicted);
        }
    }
    Ok(list)
}

/// The motions of a level with their counts, in the order of the contract: `2 oh-stretch + hoh-bend`.
pub fn family(table: &ModeTable, level: &Level) -> Vec<(Motion, u32)> {
    let mut counts: Vec<(Motion, u32)> = Vec::new();
    for e in level.excitations() {
        let motion = table.modes[usize::from(e.mode)].motion;
        match counts.iter_mut().find(|(m, _)| *m == motion) {
            Some((_, n)) => *n += u32::from(e.quanta),
            None => counts.push((motion, u32::from(e.quanta))),
        }
    }
    counts.sort_unstable();
    counts
}

/// A family as text.
pub fn family_text(family: &[(Motion, u32)]) -> String {
    let part = |(motion, n): &(Motion, u32)| if *n == 1 { motion.name().to_owned() } else { format!("{n} {motion}") };
    family.iter().map(part).collect::<Vec<_>>().join(" + ")
}
