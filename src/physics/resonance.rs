//! Resonances tie levels into polyads; here the polyads are diagonalised.
//!
//! # Method
//! A resonance is given by its element W between the lowest pair of levels it ties; all other elements follow from the
//! oscillator factors:
//!
//! | resonance | levels | element / W |
//! |---|---|---|
//! | Fermi 2:1 | (v_a, v_b) and (v_a − 1, v_b + 2) | [v_a (v_b + 1)(v_b + 2) / 2]^½ |
//! | the same, degenerate b | l of b kept | [v_a (v_b + 2 − l)(v_b + d + l) / 2d]^½ |
//! | Fermi 1:1:1 | (v_a, v_b, v_c) and (v_a − 1, v_b + 1, v_c + 1) | [v_a (v_b + 1)(v_c + 1)]^½ |
//! | Darling-Dennison 2:2 | (v_a, v_b) and (v_a − 2, v_b + 2) | ½ [v_a (v_a − 1)(v_b + 1)(v_b + 2)]^½ |
//! | 1:1 | (v_a, v_b) and (v_a − 1, v_b + 1) | [v_a (v_b + 1)]^½ |
//!
//! A degenerate mode b of a 2:1 term with a non-degenerate a is exact by angular momentum, for two and three components.
//! For other terms with degenerate modes (both degenerate, 1:1:1, 2:2, 1:1) the coupling is a tensor; these elements are
//! those of one stretched component, an approximation: `doubts` names them.
//!
//! A polyad is the closure of a level under the resonances: partners outside the given list enter the block. Blocks are
//! diagonalised with nalgebra. dE/dθ follows from the eigenvector (Hellmann-Feynman), so uncertainty passes through the
//! mixing. Checked by `tests/anharmonic.rs`.

use std::collections::{BTreeMap, HashMap, VecDeque};

use nalgebra::{DMatrix, DVector};

use super::position::{Gradient, Model, Parameter, Resonance};
use crate::level::{Excitation, Level, UNSPLIT};
use crate::mode::{ConstantKind, ModeIndex, ModeTable};
use crate::note::Note;

/// Largest block that is diagonalised; a larger closure is cut at this size, nearest partners first.
pub const LARGEST_BLOCK: usize = 800;

/// Most quanta in one mode inside a block (keeps a closure that has no end finite).
const MOST_QUANTA: u8 = 60;

/// Shares smaller than this are not listed.
const LEAST_SHARE: f64 = 1.0e-6;

/// A level after mixing.
#[derive(Clone, Debug, PartialEq)]
pub struct MixedLevel {
    /// Its name: the level with the largest share, each name once in a polyad. Where a Darling-Dennison term mixes two
    /// stretches, levels that differ in these quanta only are named in energy order, quanta of the lower stretch falling
    /// (each parity apart): the convention for water.
    pub level: Level,
    /// Position, cm⁻¹ above the ground level.
    pub position: f64,
    /// Derivatives by the parameters, resonance elements included, in order of parameter.
    pub gradient: Gradient,
    /// Variance that is not shared with other levels, cm⁻².
    pub private_variance: f64,
    /// Shares of the levels before mixing, largest first; they sum to one (shares below 10⁻⁶ are left out).
    pub shares: Vec<(Level, f64)>,
}

impl MixedLevel {
    /// A level that no resonance touches.
    fn unmixed(model: &Model, level: Level) -> Self {
        Self {
            position: model.position(&level),
            gradient: model.gradient(&level),
            private_variance: model.private_variance(&level),
            shares: vec![(level.clone(), 1.0)],
            level,
        }
    }

    /// Variance of the position: a′Ca + private part, cm⁻².
    pub fn variance(&self, model: &Model) -> f64 {
        let shared: f64 = self.gradient.iter().map(|&(p, a)| (a * model.sigma(p)).powi(2)).sum();
        shared + self.private_variance
    }

    /// Covariance with another level through shared parameters, cm⁻² (private parts excluded).
    pub fn covariance(&self, other: &Self, model: &Model) -> f64 {
        self.gradient
            .iter()
            .filter_map(|&(p, slope)| {
                let (_, theirs) = other.gradient.iter().find(|(q, _)| *q == p)?;
                Some(slope * theirs * model.sigma(p).powi(2))
            })
            .sum()
    }
}

/// Levels mixed by the model's resonances: one answer a given level, in the given order.
///
/// Partners outside `levels` take part in the mixing but are not answered. A level with several quanta of a degenerate
/// mode that has to be split by angular momentum (see [`splits`]) is answered once for each l, highest first.
pub fn mix(model: &Model, levels: &[Level]) -> Vec<MixedLevel> {
    let split = splits(model);
    let wanted: Vec<Level> = levels.iter().flat_map(|level| resolved(level, model, &split)).collect();
    if model.resonances.is_empty() {
        return wanted.into_iter().map(|level| MixedLevel::unmixed(model, level)).collect();
    }
    let mut done: HashMap<Level, MixedLevel> = HashMap::new();
    let asked: HashMap<&Level, ()> = wanted.iter().map(|level| (level, ())).collect();
    for level in &wanted {
        if done.contains_key(level) {
            continue;
        }
        let block = Block::around(model, level, &split);
        if block.levels.len() == 1 {
            done.insert(level.clone(), MixedLevel::unmixed(model, level.clone()));
            continue;
        }
        // A cut block may miss a level that another seed reaches: the first answer stands.
        for mixed in block.diagonalised(model, |name| asked.contains_key(name)) {
            done.entry(mixed.level.clone()).or_insert(mixed);
        }
    }
    wanted
        .into_iter()
        .map(|level| match done.get(&level) {
            Some(mixed) => mixed.clone(),
            None => MixedLevel::unmixed(model, level),
        })
        .collect()
}

/// The whole polyad of a level: every member, ascending in position.
pub fn polyad(model: &Model, level: &Level) -> Vec<MixedLevel> {
    let split = splits(model);
    let mut all: Vec<MixedLevel> = resolved(level, model, &split)
        .into_iter()
        .flat_map(|seed| Block::around(model, &seed, &split).diagonalised(model, |_| true))
        .collect();
    all.sort_by(|a, b| a.position.total_cmp(&b.position).then_with(|| a.level.cmp(&b.level)));
    all.dedup_by(|a, b| a.level == b.level);
    all
}

/// The element of all resonances between two levels, cm⁻¹; zero where nothing ties them.
pub fn element(model: &Model, bra: &Level, ket: &Level) -> f64 {
    let split = splits(model);
    let ties = |r: &Resonance, up: bool| {
        partner(model, &split, r, bra, up).filter(|(level, _)| level == ket).map(|(_, factor)| factor * r.element.value)
    };
    model.resonances.iter().filter_map(|r| ties(r, true).or_else(|| ties(r, false))).sum()
}

/// Which modes are split by angular momentum: degenerate ones with a given g, and those whose pair of quanta is tied to
/// a non-degenerate mode.
pub fn splits(model: &Model) -> Vec<bool> {
    let mut split: Vec<bool> = (0..model.modes()).map(|i| model.degeneracy[i] > 1 && model.g[i].is_some()).collect();
    for r in &model.resonances {
        let pair = r.kind == ConstantKind::Fermi && (r.c.is_none() || r.c == Some(r.b));
        if pair && model.degeneracy[r.a] == 1 && model.degeneracy[r.b] > 1 {
            split[r.b] = true;
        }
    }
    split
}

/// What is approximate in the mixing of this model, one note a term.
pub fn doubts(model: &Model, table: &ModeTable) -> Vec<Note> {
    let id = |i: ModeIndex| table.modes.get(i).map_or("?", |m| m.id.as_str());
    let rough = |r: &&Resonance| {
        let members = [Some(r.a), Some(r.b), r.c];
        let degenerate = members.into_iter().flatten().any(|i| model.degeneracy[i] > 1);
        let exact = r.kind == ConstantKind::Fermi && r.c.is_none() && model.degeneracy[r.a] == 1;
        degenerate && !exact
    };
    model
        .resonances
        .iter()
        .filter(rough)
        .map(|r| {
            let third = r.c.map_or(String::new(), |c| format!(", {}", id(c)));
            Note::new(format!(
                "the {} term of {} and {}{third} ties degenerate modes: its elements above the lowest pair are approximate",
                r.kind.name(),
                id(r.a),
                id(r.b)
            ))
        })
        .collect()
}

/// |l| of an excitation of a split mode: one quantum has l = 1 without saying so.
fn momentum(e: Excitation) -> u8 {
    if e.l == UNSPLIT { u8::from(e.quanta % 2 == 1) } else { e.l }
}

/// The levels with angular momenta that an unresolved level stands for; resolved ones stay.
fn resolved(level: &Level, model: &Model, split: &[bool]) -> Vec<Level> {
    let mut list: Vec<Vec<Excitation>> = vec![Vec::new()];
    for e in level.excitations() {
        let open = split.get(usize::from(e.mode)).copied().unwrap_or(false) && e.l == UNSPLIT && e.quanta > 1;
        let rungs: Vec<Excitation> = if open {
            (0..=e.quanta).rev().filter(|l| (e.quanta - l) % 2 == 0).map(|l| Excitation { l, ..*e }).collect()
        } else {
            vec![*e]
        };
        list = list.into_iter().flat_map(|head| rungs.iter().map(move |r| [head.as_slice(), &[*r]].concat())).collect();
    }
    debug_assert!(model.modes() == split.len());
    list.into_iter().map(Level::new).collect()
}

/// Quanta and angular momentum of one mode while a resonance acts on it.
#[derive(Clone, Copy)]
struct Rung {
    quanta: u8,
    l: u8,
    degeneracy: u8,
    split: bool,
}

impl Rung {
    /// After one quantum more (`up`) or less: the rung and the square of the oscillator factor.
    fn step(self, up: bool) -> Option<(Self, f64)> {
        let (v, l) = (f64::from(self.quanta), f64::from(self.l));
        match (up, self.split) {
            (true, _) if self.quanta >= MOST_QUANTA => None,
            (true, false) => Some((Self { quanta: self.quanta + 1, ..self }, v + 1.0)),
            (true, true) => Some((Self { quanta: self.quanta + 1, l: self.l + 1, ..self }, 0.5 * (v + l + 2.0))),
            (false, _) if self.quanta == 0 => None,
            (false, false) => Some((Self { quanta: self.quanta - 1, ..self }, v)),
            (false, true) if self.l == 0 => None,
            (false, true) => Some((Self { quanta: self.quanta - 1, l: self.l - 1, ..self }, 0.5 * (v + l))),
        }
    }

    /// After two quanta more or less with l kept; the factor is one between 0 and 2 quanta.
    fn pair(self, up: bool) -> Option<(Self, f64)> {
        let d = if self.split { f64::from(self.degeneracy) } else { 1.0 };
        // Without splitting l is the parity of v, which makes the factor that of a single oscillator.
        let l = f64::from(if self.split { self.l } else { self.quanta % 2 });
        let factor = |lower: f64| (lower + 2.0 - l) * (lower + d + l) / (2.0 * d);
        if up {
            (self.quanta + 2 <= MOST_QUANTA)
                .then(|| (Self { quanta: self.quanta + 2, ..self }, factor(f64::from(self.quanta))))
        } else {
            let lower = self.quanta.checked_sub(2)?;
            (!self.split || lower >= self.l).then(|| (Self { quanta: lower, ..self }, factor(f64::from(lower))))
        }
    }
}

/// The level that `resonance` ties to `level` in one direction (`up`: a gains), and the element in units of W.
fn partner(model: &Model, split: &[bool], r: &Resonance, level: &Level, up: bool) -> Option<(Level, f64)> {
    if r.a == r.b || r.c == Some(r.a) {
        return None;
    }
    let rung = |mode: ModeIndex| {
        let e = level.excitations().iter().find(|e| usize::from(e.mode) == mode);
        Rung {
            quanta: e.map_or(0, |e| e.quanta),
            l: e.map_or(0, |e| momentum(*e)),
            degeneracy: model.degeneracy[mode],
            split: split[mode],
        }
    };
    let (a, b) = (rung(r.a), rung(r.b));
    let mut changed: Vec<(ModeIndex, Rung)> = Vec::with_capacity(3);
    let mut square = 1.0;
    let mut take = |mode: ModeIndex, moved: Option<(Rung, f64)>| -> Option<()> {
        let (rung, factor) = moved?;
        changed.push((mode, rung));
        square *= factor;
        Some(())
    };
    match (r.kind, r.c) {
        (ConstantKind::Fermi, Some(c)) if c != r.b => {
            take(r.a, a.step(up))?;
            take(r.b, b.step(!up))?;
            take(c, rung(c).step(!up))?;
        }
        (ConstantKind::Fermi, _) => {
            take(r.a, a.step(up))?;
            take(r.b, b.pair(!up))?;
        }
        (ConstantKind::DarlingDennison, _) => {
            take(r.a, a.pair(up))?;
            take(r.b, b.pair(!up))?;
        }
        (ConstantKind::OneOne, _) => {
            take(r.a, a.step(up))?;
            take(r.b, b.step(!up))?;
        }
        (ConstantKind::X | ConstantKind::G, _) => return None,
    }
    let rest = level.excitations().iter().filter(|e| changed.iter().all(|(mode, _)| *mode != usize::from(e.mode)));
    let new = changed.iter().map(|(mode, rung)| Excitation {
        l: if rung.split && rung.quanta > 1 { rung.l } else { UNSPLIT },
        ..Excitation::new(*mode, rung.quanta)
    });
    Some((Level::new(rest.copied().chain(new)), square.sqrt()))
}

/// One polyad before diagonalisation.
struct Block {
    levels: Vec<Level>,
    /// (row, column, number of the resonance, element in units of W), row < column.
    ties: Vec<(usize, usize, usize, f64)>,
}

impl Block {
    fn around(model: &Model, seed: &Level, split: &[bool]) -> Self {
        let mut at: HashMap<Level, usize> = HashMap::from([(seed.clone(), 0)]);
        let mut levels = vec![seed.clone()];
        let mut ties = Vec::new();
        let mut queue = VecDeque::from([0]);
        while let Some(here) = queue.pop_front() {
            let level = levels[here].clone();
            for (number, resonance) in model.resonances.iter().enumerate() {
                if resonance.element.value == 0.0 {
                    continue;
                }
                for up in [true, false] {
                    let Some((other, factor)) = partner(model, split, resonance, &level, up) else { continue };
                    let there = match at.get(&other) {
                        Some(&there) => there,
                        None if levels.len() >= LARGEST_BLOCK => continue,
                        None => {
                            let there = levels.len();
                            at.insert(other.clone(), there);
                            levels.push(other);
                            queue.push_back(there);
                            there
                        }
                    };
                    // Each tie is met from both ends; it is kept once.
                    if here < there {
                        ties.push((here, there, number, factor));
                    }
                }
            }
        }
        Self { levels, ties }
    }

    /// The mixed levels whose name is wanted, ascending in position.
    fn diagonalised(&self, model: &Model, wanted: impl Fn(&Level) -> bool) -> Vec<MixedLevel> {
        let n = self.levels.len();
        let mut h = DMatrix::<f64>::zeros(n, n);
        for (k, level) in self.levels.iter().enumerate() {
            h[(k, k)] = model.position(level);
        }
        for &(row, column, number, factor) in &self.ties {
            let element = factor * model.resonances[number].element.value;
            h[(row, column)] += element;
            h[(column, row)] += element;
        }
        let eigen = h.symmetric_eigen();
        let mut order: Vec<usize> = (0..n).collect();
        order.sort_by(|a, b| eigen.eigenvalues[*a].total_cmp(&eigen.eigenvalues[*b]));
        let vectors: Vec<DVector<f64>> = order.iter().map(|k| eigen.eigenvectors.column(*k).into_owned()).collect();
        let names = self.names(model, &vectors);

        let gradients: Vec<Gradient> = self.levels.iter().map(|level| model.gradient(level)).collect();
        let private: Vec<f64> = self.levels.iter().map(|level| model.private_variance(level)).collect();
        let mut mixed = Vec::new();
        for (state, vector) in vectors.iter().enumerate() {
            let level = &self.levels[names[state]];
            if !wanted(level) {
                continue;
            }
            let mut slopes: BTreeMap<Parameter, f64> = BTreeMap::new();
            let mut private_variance = 0.0;
            for (k, gradient) in gradients.iter().enumerate() {
                let share = vector[k] * vector[k];
                if share < 1.0e-12 {
                    continue;
                }
                private_variance += share * private[k];
                for &(parameter, slope) in gradient {
                    *slopes.entry(parameter).or_default() += share * slope;
                }
            }
            for &(row, column, number, factor) in &self.ties {
                *slopes.entry(Parameter::Resonance(number)).or_default() += 2.0 * vector[row] * vector[column] * factor;
            }
            let mut shares: Vec<(Level, f64)> = (0..n)
                .map(|k| (self.levels[k].clone(), vector[k] * vector[k]))
                .filter(|(_, share)| *share >= LEAST_SHARE)
                .collect();
            shares.sort_by(|a, b| b.1.total_cmp(&a.1).then_with(|| a.0.cmp(&b.0)));
            mixed.push(MixedLevel {
                level: level.clone(),
                position: eigen.eigenvalues[order[state]],
                gradient: slopes.into_iter().collect(),
                private_variance,
                shares,
            });
        }
        mixed
    }

    /// For every state (ascending) the number of the level that names it; each name once.
    fn names(&self, model: &Model, vectors: &[DVector<f64>]) -> Vec<usize> {
        let n = self.levels.len();
        // Equal shares (two equal bonds) must not be decided by the last bit: shares count to nine decimals.
        #[expect(clippy::cast_possible_truncation, reason = "a share is at most one")]
        let rank = |share: f64| (share * 1.0e9).round() as i64;
        let mut claims: Vec<(i64, usize, usize)> = Vec::with_capacity(n * n.min(8));
        for (state, vector) in vectors.iter().enumerate() {
            claims.extend((0..n).map(|k| (rank(vector[k] * vector[k]), state, k)));
        }
        claims.sort_unstable_by(|a, b| {
            b.0.cmp(&a.0).then(a.1.cmp(&b.1)).then_with(|| self.levels[b.2].cmp(&self.levels[a.2]))
        });
        let mut names = vec![usize::MAX; n];
        let mut taken = vec![false; n];
        for (_, state, k) in claims {
            if names[state] == usize::MAX && !taken[k] {
                names[state] = k;
                taken[k] = true;
            }
        }
        for r in model.resonances.iter().filter(|r| r.kind == ConstantKind::DarlingDennison && r.a != r.b) {
            self.order_names(model, r, &mut names);
        }
        names
    }

    /// Levels that differ only in the quanta of the two modes of a Darling-Dennison term are named in energy order.
    fn order_names(&self, model: &Model, r: &Resonance, names: &mut [usize]) {
        let (low, high) = if model.nu[r.a] <= model.nu[r.b] { (r.a, r.b) } else { (r.b, r.a) };
        let mut families: BTreeMap<(Vec<Excitation>, u32, u8), Vec<usize>> = BTreeMap::new();
        for (state, name) in names.iter().enumerate() {
            let level = &self.levels[*name];
            let rest: Vec<Excitation> = level
                .excitations()
                .iter()
                .filter(|e| usize::from(e.mode) != low && usize::from(e.mode) != high)
                .copied()
                .collect();
            let (v, w) = (level.quanta_in(low), level.quanta_in(high));
            families.entry((rest, u32::from(v) + u32::from(w), w % 2)).or_default().push(state);
        }
        for states in families.values() {
            let mut own: Vec<usize> = states.iter().map(|state| names[*state]).collect();
            own.sort_by(|a, b| {
                let quanta = |k: &usize| self.levels[*k].quanta_in(low);
                quanta(b).cmp(&quanta(a)).then_with(|| self.levels[*a].cmp(&self.levels[*b]))
            });
            for (state, name) in states.iter().zip(own) {
                names[*state] = name;
            }
        }
    }
}

/// The change of quanta that each resonance of a model makes (a gains): one integer a mode.
pub fn vectors(model: &Model) -> Vec<Vec<i64>> {
    model
        .resonances
        .iter()
        .map(|r| {
            let mut vector = vec![0; model.modes()];
            let (gain, loss) = match r.kind {
                ConstantKind::Fermi if r.c.is_none() => (1, 2),
                ConstantKind::DarlingDennison => (2, 2),
                _ => (1, 1),
            };
            vector[r.a] += gain;
            vector[r.b] -= loss;
            if let (ConstantKind::Fermi, Some(c)) = (r.kind, r.c) {
                vector[c] -= 1;
            }
            vector
        })
        .collect()
}

/// The polyad numbers that the resonances conserve: integer vectors N with N · r = 0 for every resonance vector r, as
/// many as modes minus the rank of the vectors, without negative entries where that is possible.
///
/// # Method
/// Exact elimination on integers. Source of the idea: Kellman, J. Chem. Phys. 93, 6630 (1990); Fried & Ezra, J. Chem.
/// Phys. 86, 6270 (1987) (both from memory). No vectors: the answer has as many unit vectors as `modes`.
pub fn polyad_numbers(resonances: &[Vec<i64>], modes: usize) -> Vec<Vec<i64>> {
    let wide = |row: &Vec<i64>| -> Vec<i128> { (0..modes).map(|k| i128::from(*row.get(k).unwrap_or(&0))).collect() };
    let mut rows: Vec<Vec<i128>> = resonances.iter().map(wide).collect();
    let mut pivots: Vec<usize> = Vec::new();
    for column in 0..modes {
        let at = pivots.len();
        let Some(found) = (at..rows.len()).find(|row| rows[*row][column] != 0) else { continue };
        rows.swap(at, found);
        let pivot = rows[at].clone();
        for (number, row) in rows.iter_mut().enumerate() {
            let factor = row[column];
            if number != at && factor != 0 {
                for (entry, p) in row.iter_mut().zip(&pivot) {
                    *entry = *entry * pivot[column] - factor * p;
                }
                reduce(row);
            }
        }
        pivots.push(column);
    }
    let mut answer: Vec<Vec<i128>> = Vec::new();
    for free in (0..modes).filter(|column| !pivots.contains(column)) {
        // Row: p x_pivot + Σ f x_free = 0; a common multiple of the pivots keeps everything whole.
        let common = pivots.iter().enumerate().fold(1, |m, (row, column)| {
            let p = rows[row][*column].abs();
            m / gcd(m, p) * p
        });
        let mut vector = vec![0; modes];
        vector[free] = common;
        for (row, column) in pivots.iter().enumerate() {
            vector[*column] = -rows[row][free] * common / rows[row][*column];
        }
        reduce(&mut vector);
        answer.push(vector);
    }
    // Adding another conserved vector conserves; it can lift a negative entry.
    for k in 0..answer.len() {
        for entry in 0..modes {
            if answer[k][entry] >= 0 {
                continue;
            }
            let lift =
                (0..answer.len()).find(|j| *j != k && answer[*j][entry] > 0 && answer[*j].iter().all(|e| *e >= 0));
            if let Some(j) = lift {
                let by = answer[j].clone();
                let times = (-answer[k][entry] + by[entry] - 1) / by[entry];
                for (e, b) in answer[k].iter_mut().zip(by) {
                    *e += times * b;
                }
            }
        }
    }
    let narrow = |v: Vec<i128>| v.into_iter().map(|e| i64::try_from(e).unwrap_or(0)).collect();
    answer.into_iter().map(narrow).collect()
}

fn gcd(a: i128, b: i128) -> i128 {
    if b == 0 { a.abs().max(1) } else { gcd(b, a % b) }
}

fn reduce(row: &mut [i128]) {
    let common = row.iter().filter(|e| **e != 0).fold(0, |g, e| if g == 0 { e.abs() } else { gcd(g, *e) });
    if common > 1 {
        row.iter_mut().for_each(|e| *e /= common);
    }
}
