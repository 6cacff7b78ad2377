//! Levels in a window, each once.

use crate::level::{Excitation, Level};
use crate::physics::position::Model;

/// Which levels are wanted; everything by default.
#[derive(Clone, Debug, Default)]
pub struct Filter;

/// The window holds more levels than wanted.
#[derive(Clone, Debug, PartialEq, Eq, thiserror::Error)]
#[error("the window holds more than {0} levels\n  hint: narrow --window or lower --quanta")]
pub struct TooManyLevels(pub usize);

/// A level in the window.
#[derive(Clone, Debug, PartialEq)]
pub struct Found {
    /// The level.
    pub level: Level,
    /// Its position before resonances, cm⁻¹.
    pub position: f64,
}

/// All levels with 1 to `quanta` quanta whose position falls inside `window`, by position, then level.
///
/// # Errors
/// [`TooManyLevels`] beyond `budget`.
pub fn levels_in(
    model: &Model,
    window: (f64, f64),
    quanta: u8,
    _filter: &Filter,
    budget: usize,
) -> Result<Vec<Found>, TooManyLevels> {
    let mut found = Vec::new();
    let mut now = Vec::new();
    descend(model, 0, quanta, &mut now, &mut |excitations| {
        let level = Level::new(excitations.iter().copied());
        let position = model.position(&level);
        if (window.0..=window.1).contains(&position) {
            found.push(Found { level, position });
        }
        found.len() <= budget
    });
    if found.len() > budget {
        return Err(TooManyLevels(budget));
    }
    found.sort_by(|a, b| a.position.total_cmp(&b.position).then_with(|| a.level.cmp(&b.level)));
    Ok(found)
}

fn descend(
    model: &Model,
    from: usize,
    left: u8,
    now: &mut Vec<Excitation>,
    visit: &mut impl FnMut(&[Excitation]) -> bool,
) -> bool {
    if !now.is_empty() && !visit(now) {
        return false;
    }
    for mode in from..model.modes() {
        for rung in model.ladder(mode, left) {
            now.push(rung.excitation);
            let go_on = descend(model, mode + 1, left - rung.excitation.quanta, now, visit);
            now.pop();
            if !go_on {
                return false;
            }
        }
    }
    true
}
