//! Levels in a window, each once: a depth-first walk over quanta with bounds that cannot lose a level.
//!
//! # Method
//! Modes are taken in order; a prefix of excitations carries its position and, for every later mode, the coupling shift
//! Σⱼ xᵢⱼ vⱼ of one more quantum there. The last quantum is one pass over a contiguous row. A prefix is given up when
//! even the largest (smallest) steps that the remaining quanta can take do not reach the window; steps are bounded with
//! every coupling at its most favourable sign, so strong couplings of either sign lose nothing.

use rayon::prelude::*;

use crate::level::{Excitation, Level};
use crate::mode::ModeIndex;
use crate::physics::position::{Model, Rung};

/// Which levels are wanted; everything by default.
#[derive(Clone, Debug, Default, PartialEq, Eq)]
pub struct Filter {
    /// Only levels whose quanta all lie in these modes; one entry a mode.
    pub modes: Option<Vec<bool>>,
}

impl Filter {
    /// Only levels whose quanta all lie in modes for which `wanted` holds.
    pub fn modes(count: usize, wanted: impl Fn(ModeIndex) -> bool) -> Self {
        Self { modes: Some((0..count).map(wanted).collect()) }
    }

    /// Whether quanta in this mode are wanted.
    pub fn takes(&self, mode: ModeIndex) -> bool {
        self.modes.as_ref().is_none_or(|list| list.get(mode).copied().unwrap_or(false))
    }
}

/// The window holds more levels than wanted.
#[derive(Clone, Debug, PartialEq, Eq, thiserror::Error)]
#[error("the window holds more than {0} levels\n  hint: narrow the window or lower --quanta")]
pub struct TooManyLevels(pub usize);

/// A level in the window.
#[derive(Clone, Debug, PartialEq)]
pub struct Found {
    /// The level.
    pub level: Level,
    /// Its position before resonances, cm⁻¹.
    pub position: f64,
}

/// What the walk needs of a model, laid out for it.
struct Grid {
    modes: Vec<ModeIndex>,
    ladders: Vec<Vec<Rung>>,
    /// Full matrix of x_ij between different modes of `modes`, by rows; zero on the diagonal.
    coupling: Vec<f64>,
    /// Largest step of one quantum in this or a later mode, every coupling at its best.
    highest_step: Vec<f64>,
    /// Smallest such step.
    lowest_step: Vec<f64>,
    window: (f64, f64),
}

impl Grid {
    fn new(model: &Model, window: (f64, f64), quanta: u8, filter: &Filter) -> Self {
        let modes: Vec<ModeIndex> = (0..model.modes()).filter(|m| filter.takes(*m)).collect();
        let n = modes.len();
        let ladders: Vec<Vec<Rung>> = modes.iter().map(|m| model.ladder(*m, quanta)).collect();
        let mut coupling = vec![0.0; n * n];
        for i in 0..n {
            for j in 0..n {
                if i != j {
                    coupling[i * n + j] = model.x(modes[i], modes[j]).value;
                }
            }
        }
        let mut highest_step = vec![f64::NEG_INFINITY; n + 1];
        let mut lowest_step = vec![f64::INFINITY; n + 1];
        for i in (0..n).rev() {
            // Average step per quantum of the mode alone, over all its rungs.
            let own = ladders[i].iter().map(|r| r.own / f64::from(r.excitation.quanta));
            let row = &coupling[i * n..(i + 1) * n];
            // Among `quanta` quanta a pair sum Σ x vᵢ vⱼ is at most (quanta − 1) |x| per quantum.
            let reach = f64::from(quanta.saturating_sub(1));
            let up = reach * row.iter().copied().fold(0.0, f64::max);
            let down = reach * row.iter().copied().fold(0.0, f64::min);
            highest_step[i] = highest_step[i + 1].max(own.clone().fold(f64::NEG_INFINITY, f64::max) + up);
            lowest_step[i] = lowest_step[i + 1].min(own.fold(f64::INFINITY, f64::min) + down);
        }
        Self { modes, ladders, coupling, highest_step, lowest_step, window }
    }

    /// Whether levels below this prefix can meet the window with 1 to `left` more quanta from mode `from` on.
    fn reachable(&self, position: f64, from: usize, left: u8) -> bool {
        if left == 0 || from >= self.modes.len() {
            return false;
        }
        let left = f64::from(left);
        let (up, down) = (self.highest_step[from], self.lowest_step[from]);
        // The extreme of 1..=left steps lies at either end, depending on the sign of the step.
        position + up.max(up * left) >= self.window.0 && position + down.min(down * left) <= self.window.1
    }
}

/// One branch of the walk: a prefix and the coupling shifts it causes.
struct Branch<'g> {
    grid: &'g Grid,
    now: Vec<Excitation>,
    /// Coupling shift per quantum in each mode, one row per depth.
    shifts: Vec<Vec<f64>>,
    found: Vec<Found>,
    budget: usize,
}

impl Branch<'_> {
    fn push(&mut self, mode: usize, rung: &Rung) {
        let grid = self.grid;
        let n = grid.modes.len();
        let v = f64::from(rung.excitation.quanta);
        let row = &grid.coupling[mode * n..(mode + 1) * n];
        let next = match self.shifts.last() {
            Some(last) => last.iter().zip(row).map(|(s, x)| s + v * x).collect(),
            None => row.iter().map(|x| v * x).collect(),
        };
        self.shifts.push(next);
        self.now.push(rung.excitation);
    }

    fn pop(&mut self) {
        self.shifts.pop();
        self.now.pop();
    }

    fn keep(&mut self, position: f64) {
        if (self.grid.window.0..=self.grid.window.1).contains(&position) && self.found.len() <= self.budget {
            self.found.push(Found { level: Level::new(self.now.iter().copied()), position });
        }
    }

    /// Visits all levels that add quanta from mode `from` on to the prefix at `position`.
    fn descend(&mut self, position: f64, from: usize, left: u8) {
        let grid = self.grid;
        if !grid.reachable(position, from, left) || self.found.len() > self.budget {
            return;
        }
        if left == 1 {
            // One quantum more: a pass over the row, no prefix is built unless it hits.
            for mode in from..grid.modes.len() {
                let rung = grid.ladders[mode][0];
                let at = position + rung.own + self.shifts.last().map_or(0.0, |s| s[mode]);
                if (grid.window.0..=grid.window.1).contains(&at) {
                    self.now.push(rung.excitation);
                    self.keep(at);
                    self.now.pop();
                }
            }
            return;
        }
        for mode in from..grid.modes.len() {
            if !grid.reachable(position, mode, left) {
                continue;
            }
            for rung in &grid.ladders[mode] {
                let v = rung.excitation.quanta;
                if v > left {
                    break;
                }
                let at = position + rung.own + f64::from(v) * self.shifts.last().map_or(0.0, |s| s[mode]);
                if v == left || !grid.reachable(at, mode + 1, left - v) {
                    if (grid.window.0..=grid.window.1).contains(&at) {
                        self.now.push(rung.excitation);
                        self.keep(at);
                        self.now.pop();
                    }
                    continue;
                }
                self.push(mode, rung);
                self.keep(at);
                self.descend(at, mode + 1, left - v);
                self.pop();
            }
        }
    }
}

/// All levels with 1 to `quanta` quanta whose position before resonances falls inside `window` (cm⁻¹, ends included), by
/// position, then level; levels of modes with a given g are resolved by |l|. Equal for any number of threads.
///
/// # Errors
/// [`TooManyLevels`] when the window holds more than `budget` levels.
pub fn levels_in(
    model: &Model,
    window: (f64, f64),
    quanta: u8,
    filter: &Filter,
    budget: usize,
) -> Result<Vec<Found>, TooManyLevels> {
    let grid = Grid::new(model, window, quanta, filter);
    // One task per first excitation; tasks are joined in order, so threads do not change the result.
    let tasks: Vec<(usize, Rung)> =
        grid.ladders.iter().enumerate().flat_map(|(mode, ladder)| ladder.iter().map(move |r| (mode, *r))).collect();
    let parts: Vec<Vec<Found>> = tasks
        .into_par_iter()
        .map(|(mode, rung)| {
            let mut branch = Branch { grid: &grid, now: Vec::new(), shifts: Vec::new(), found: Vec::new(), budget };
            branch.push(mode, &rung);
            branch.keep(rung.own);
            branch.descend(rung.own, mode + 1, quanta - rung.excitation.quanta);
            branch.found
        })
        .collect();
    let total: usize = parts.iter().map(Vec::len).sum();
    if total > budget {
        return Err(TooManyLevels(budget));
    }
    let mut found: Vec<Found> = parts.into_iter().flatten().collect();
    // The canonical position is that of the model, so that no sum order of the walk shows.
    found.par_iter_mut().for_each(|one| one.position = model.position(&one.level));
    found.par_sort_by(|a, b| a.position.total_cmp(&b.position).then_with(|| a.level.cmp(&b.level)));
    Ok(found)
}

#[cfg(test)]
mod tests {
    use super::*;
    use rand::{Rng, SeedableRng};

    /// Every level up to `quanta`, without any bound.
    fn naive(model: &Model, from: usize, left: u8, now: &mut Vec<Excitation>, list: &mut Vec<Level>) {
        for mode in from..model.modes() {
            for rung in model.ladder(mode, left) {
                now.push(rung.excitation);
                list.push(Level::new(now.iter().copied()));
                naive(model, mode + 1, left - rung.excitation.quanta, now, list);
                now.pop();
            }
        }
    }

    #[test]
    fn the_walk_finds_what_the_naive_one_finds_on_random_tables() {
        use crate::mode::Origin;
        use crate::physics::position::Sourced;
        let mut random = rand_chacha::ChaCha8Rng::seed_from_u64(7);
        for trial in 0..300 {
            let n = random.random_range(1..7);
            let mut model = Model::harmonic((0..n).map(|_| random.random_range(60.0..3700.0)).collect());
            // Strong couplings of either sign on purpose: some steps become negative.
            let strength: f64 = [5.0, 60.0, 300.0][trial % 3];
            for x in &mut model.x {
                x.value = random.random_range(-strength..strength);
            }
            for i in 0..n {
                model.degeneracy[i] = random.random_range(1..4);
                if model.degeneracy[i] > 1 && random.random_bool(0.5) {
                    let value = random.random_range(-5.0..5.0);
                    model.g[i] = Some(Sourced { value, sigma: 1.0, origin: Origin::Given, source: String::new() });
                }
            }
            let low = random.random_range(0.0..8000.0);
            let window = (low, low + random.random_range(1.0..3000.0));
            let quanta = random.random_range(1..6);
            let mut all = Vec::new();
            naive(&model, 0, quanta, &mut Vec::new(), &mut all);
            let mut expected: Vec<Level> =
                all.into_iter().filter(|l| (window.0..=window.1).contains(&model.position(l))).collect();
            expected.sort();
            let found = levels_in(&model, window, quanta, &Filter::default(), 1 << 20).unwrap();
            let mut levels: Vec<Level> = found.iter().map(|f| f.level.clone()).collect();
            levels.sort();
            assert_eq!(levels, expected, "trial {trial}");
            levels.dedup();
            assert_eq!(levels.len(), found.len(), "trial {trial}: a level twice");
        }
    }

    #[test]
    fn a_window_with_too_many_levels_is_refused() {
        let model = Model::harmonic((0..20).map(|i| 100.0 + f64::from(i)).collect());
        assert_eq!(levels_in(&model, (0.0, 1.0e4), 4, &Filter::default(), 100), Err(TooManyLevels(100)));
    }
}
