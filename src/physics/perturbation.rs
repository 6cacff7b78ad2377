//! From a cubic and quartic force field to anharmonic constants: second-order perturbation theory with resonances kept
//! out.
//!
//! # Method
//! x_ij and G₀ of an asymmetric top: Nielsen, Rev. Mod. Phys. 23, 90 (1951); Mills, in *Molecular Spectroscopy: Modern
//! Research* (1972); Papoušek & Aliev, *Molecular Vibrational-Rotational Spectra* (1982) (from memory; every formula is
//! checked against explicit second-order sums in `tests/perturbation.rs`). All denominators are written as partial
//! fractions,
//!
//! ```text
//! (8a² − 3b²) / (b (4a² − b²)) = ½ [4/b + 1/(2a + b) − 1/(2a − b)]
//! k (k² − i² − j²) / Ω_ijk     = ¼ [1/(i+j+k) − 1/(i+j−k) + 1/(i−j+k) + 1/(−i+j+k)]
//! ```
//!
//! so that a resonant one, 1/(ωᵢ + ωⱼ − ω_k), is left out exactly and its coupling handed to the polyads
//! (`physics::resonance`). Degenerate modes enter by real components (a, b) and leave as one mode: x_tt = x_aa,
//! g_tt = ½ x_ab − x_aa, x_st = x_sa. A linear molecule has no rotational constant about its axis.
//!
//! Darling-Dennison elements: Lehmann, Mol. Phys. 66, 1129 (1989) (from memory); where a Fermi term is kept out, its
//! share in K changes as the transformed Hamiltonian demands: half the sum of the two denominators becomes the one that is
//! not resonant (compare Krasnoshchekov, Isayeva & Stepanov, J. Chem. Phys. 141, 234114 (2014)).

use std::collections::BTreeSet;

use serde::Serialize;

use crate::mode::{Basis, Constant, ConstantKind, Mode, ModeTable, TableOrigin};
use crate::note::{Note, Noted};
use crate::quantity::{Shift, Wavenumber};
use crate::read::force_field::ForceField;

/// When a denominator is called resonant.
#[derive(Clone, Copy, Debug, PartialEq, Serialize)]
#[serde(rename_all = "kebab-case")]
pub enum Criterion {
    /// Never: plain second order.
    Never,
    /// |D| below `window` and W⁴/|D|³ above `excess`, both in cm⁻¹: the leading difference between the second-order shift
    /// W²/D and the two-level result. After Martin, Lee, Taylor & Francois, J. Chem. Phys. 103, 2589 (1995); thresholds
    /// 200 and 1 cm⁻¹ from memory.
    Excess {
        /// Largest |D|, cm⁻¹.
        window: f64,
        /// Least W⁴/|D|³, cm⁻¹.
        excess: f64,
    },
    /// |W/D| above this: size of the generator of the transformation, about 0.076 (Krasnoshchekov and co-workers, 2020,
    /// abstract read). Asked below |D| = 1000 cm⁻¹ only: a strong cubic term of a stretch exceeds the limit at thousands of
    /// cm⁻¹ without any resonance.
    Generator(f64),
    /// |D| below this many cm⁻¹, however weak the coupling.
    Window(f64),
}

impl Default for Criterion {
    fn default() -> Self {
        Criterion::Excess { window: 200.0, excess: 1.0 }
    }
}

impl Criterion {
    /// Whether a coupling `w` over a denominator `d` is resonant, both in cm⁻¹.
    pub fn holds(self, w: f64, d: f64) -> bool {
        if w == 0.0 {
            return false;
        }
        match self {
            Criterion::Never => false,
            Criterion::Excess { window, excess } => d.abs() < window && excess_of(w, d) > excess,
            Criterion::Generator(limit) => d.abs() < 1_000.0 && w.abs() > limit * d.abs(),
            Criterion::Window(window) => d.abs() < window,
        }
    }
}

/// W⁴/|D|³, cm⁻¹: how much second order overstates the shift of a coupled pair.
pub fn excess_of(w: f64, d: f64) -> f64 {
    w.powi(4) / d.abs().powi(3)
}

/// A cubic coupling with a small denominator, as examined.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct NearResonance {
    /// The component that takes the sum.
    pub upper: usize,
    /// The two components (equal for a 2:1 term).
    pub lower: [usize; 2],
    /// f of the three, cm⁻¹.
    pub f: f64,
    /// D = ωᵢ + ωⱼ − ω_k, cm⁻¹.
    pub denominator: f64,
    /// Element between the lowest pair of component levels: f/4 (2:1) or f/(2√2) (1:1:1), cm⁻¹.
    pub element: f64,
    /// Whether the term was taken out of the constants and handed to the polyads.
    pub removed: bool,
}

/// A Darling-Dennison coupling of two components.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct Pairing {
    /// The two components.
    pub modes: [usize; 2],
    /// K_iijj, cm⁻¹; ⟨2,0|H|0,2⟩ = K/2.
    pub k: f64,
    /// 2ωᵢ − 2ωⱼ, cm⁻¹.
    pub denominator: f64,
}

/// The constants of a field, by components.
#[derive(Clone, Debug, PartialEq)]
pub struct Constants {
    /// x_ij, lower triangle by rows, cm⁻¹.
    pub x: Vec<f64>,
    /// G₀, cm⁻¹.
    pub g0: f64,
    /// Cubic couplings with |D| below 500 cm⁻¹ or taken out.
    pub cubic: Vec<NearResonance>,
    /// Darling-Dennison couplings of components less than 500 cm⁻¹ apart.
    pub pairings: Vec<Pairing>,
}

/// The field has a denominator of zero that the criterion keeps.
#[derive(Clone, Debug, PartialEq, thiserror::Error)]
#[error(
    "{lower} and {upper} are exactly resonant and second order has no answer\n  hint: use a criterion that takes the \
     resonance out"
)]
pub struct Singular {
    /// Names of the lower pair.
    pub lower: String,
    /// Name of the upper component.
    pub upper: String,
}

/// Couplings further from resonance than this are not listed, cm⁻¹.
const LISTED: f64 = 500.0;

/// Resonant terms: (upper, lower pair ascending).
type Taken = BTreeSet<(usize, [usize; 2])>;

impl Constants {
    /// x_ij between two components.
    pub fn x(&self, i: usize, j: usize) -> f64 {
        self.x[super::position::triangle(i, j)]
    }

    /// Fundamental of a component, νᵢ = ωᵢ + 2 xᵢᵢ + ½ Σ xᵢⱼ, cm⁻¹ (before resonances).
    pub fn fundamental(&self, field: &ForceField, i: usize) -> f64 {
        let others: f64 = (0..field.omega.len()).filter(|j| *j != i).map(|j| 0.5 * self.x(i, j)).sum();
        field.omega[i] + 2.0 * self.x(i, i) + others
    }

    /// Zero-point level, ½ Σ ωᵢ + ¼ Σᵢ≤ⱼ xᵢⱼ + G₀, cm⁻¹.
    pub fn zero_point(&self, field: &ForceField) -> f64 {
        0.5 * field.omega.iter().sum::<f64>() + 0.25 * self.x.iter().sum::<f64>() + self.g0
    }
}

/// Second-order constants of a field, resonant terms taken out by `criterion`.
///
/// # Errors
/// [`Singular`] when a denominator that stays is zero.
pub fn constants(field: &ForceField, criterion: Criterion) -> Result<Constants, Singular> {
    let n = field.omega.len();
    let w = &field.omega;
    let cubic = near_resonances(field, criterion);
    let taken: Taken = cubic.iter().filter(|r| r.removed).map(|r| (r.upper, r.lower)).collect();
    for r in &cubic {
        if r.denominator == 0.0 && !r.removed {
            let name = |i: usize| field.names[i].clone();
            return Err(Singular {
                lower: format!("{} + {}", name(r.lower[0]), name(r.lower[1])),
                upper: name(r.upper),
            });
        }
    }
    // 1/(w_p + w_q − w_r), or zero where that term is taken out.
    let small = |p: usize, q: usize, r: usize| {
        if taken.contains(&(r, [p.min(q), p.max(q)])) { 0.0 } else { 1.0 / (w[p] + w[q] - w[r]) }
    };
    let f3 = |i: usize, j: usize, k: usize| field.cubic(i, j, k);
    let mut x = vec![0.0; n * (n + 1) / 2];
    for i in 0..n {
        let mut own = field.quartic(i, i, i, i);
        for j in 0..n {
            let f = f3(i, i, j);
            if f != 0.0 {
                own -= 0.5 * f * f * (4.0 / w[j] + 1.0 / (2.0 * w[i] + w[j]) - small(i, i, j));
            }
        }
        x[super::position::triangle(i, i)] = own / 16.0;
        for j in 0..i {
            let mut between = 0.25 * field.quartic(i, i, j, j);
            for k in 0..n {
                between -= 0.25 * f3(i, i, k) * f3(k, j, j) / w[k];
                let f = f3(i, j, k);
                if f != 0.0 {
                    // For k = i two of the four terms are ∓1/w_j and cancel by themselves.
                    let four = 1.0 / (w[i] + w[j] + w[k]) - small(i, j, k) + small(i, k, j) + small(j, k, i);
                    between -= 0.125 * f * f * four;
                }
            }
            between += field.coriolis(i, j) * (w[i] / w[j] + w[j] / w[i]);
            x[super::position::triangle(i, j)] = between;
        }
    }
    Ok(Constants { x, g0: offset(field, small), pairings: pairings(field, &taken), cubic })
}

/// G₀, cm⁻¹.
fn offset(field: &ForceField, small: impl Fn(usize, usize, usize) -> f64) -> f64 {
    let n = field.omega.len();
    let w = &field.omega;
    let mut sum = 0.0;
    for i in 0..n {
        sum += field.quartic(i, i, i, i) / 64.0 - 7.0 / 576.0 * field.cubic(i, i, i).powi(2) / w[i];
        for j in (0..n).filter(|j| *j != i) {
            // wᵢ/(4wⱼ² − wᵢ²) = ½ [1/(2wⱼ − wᵢ) − 1/(2wⱼ + wᵢ)].
            let f = field.cubic(j, j, i);
            if f != 0.0 {
                sum += 3.0 / 128.0 * f * f * (small(j, j, i) - 1.0 / (2.0 * w[j] + w[i]));
            }
        }
        for j in 0..i {
            sum -= 0.5 * field.coriolis(i, j);
            for k in 0..j {
                let f = field.cubic(i, j, k);
                if f != 0.0 {
                    // wᵢwⱼw_k/Ω = ⅛ [1/(i+j+k) − 1/(i+j−k) − 1/(i−j+k) − 1/(−i+j+k)].
                    let part = 1.0 / (w[i] + w[j] + w[k]) - small(i, j, k) - small(i, k, j) - small(j, k, i);
                    sum -= f * f * part / 32.0;
                }
            }
        }
    }
    sum - 0.25 * field.rotational.iter().flatten().sum::<f64>()
}

/// Cubic couplings near resonance, by ascending |D|.
fn near_resonances(field: &ForceField, criterion: Criterion) -> Vec<NearResonance> {
    let mut list = Vec::new();
    let group = |i: usize| field.degenerate.iter().position(|g| g.contains(&i));
    for (&[i, j, k], &f) in &field.cubic {
        if f == 0.0 || (i == j && j == k) {
            continue;
        }
        // Which of the three takes the sum: for f_iij the candidates are (2i, j) and (2j, i) is another constant.
        let splits: Vec<(usize, [usize; 2])> = if i == j {
            vec![(k, [i, i])]
        } else if j == k {
            vec![(i, [j, j])]
        } else {
            vec![(k, [i, j]), (j, [i, k]), (i, [j, k])]
        };
        for (upper, lower) in splits {
            let denominator = field.omega[lower[0]] + field.omega[lower[1]] - field.omega[upper];
            let element = if lower[0] == lower[1] { f / 4.0 } else { f / 8.0_f64.sqrt() };
            // The polyads carry a non-degenerate upper level with any pair, and 1:1:1 of single modes: other terms are
            // tensors and stay in the constants.
            let carried = group(upper).is_none() && (lower[0] == lower[1] || lower.iter().all(|i| group(*i).is_none()));
            let removed = carried && criterion.holds(element, denominator);
            if removed || denominator.abs() < LISTED {
                list.push(NearResonance { upper, lower, f, denominator, element, removed });
            }
        }
    }
    // A degenerate pair goes as a whole.
    for at in 0..list.len() {
        if list[at].removed
            && let Some(g) = group(list[at].lower[0])
        {
            let upper = list[at].upper;
            for other in &mut list {
                other.removed |= other.upper == upper
                    && other.lower[0] == other.lower[1]
                    && field.degenerate[g].contains(&other.lower[0]);
            }
        }
    }
    list.sort_by(|a, b| a.denominator.abs().total_cmp(&b.denominator.abs()).then(a.lower.cmp(&b.lower)));
    list
}

/// Darling-Dennison constants of single modes less than 500 cm⁻¹ apart.
fn pairings(field: &ForceField, taken: &Taken) -> Vec<Pairing> {
    let single = |i: usize| field.degenerate.iter().all(|g| !g.contains(&i));
    let mut list = Vec::new();
    for i in 0..field.omega.len() {
        for j in 0..i {
            let gap = field.omega[j] - field.omega[i];
            if single(i) && single(j) && gap.abs() < LISTED {
                let k = darling_dennison(field, i, j, taken);
                list.push(Pairing { modes: [j, i], k, denominator: 2.0 * gap });
            }
        }
    }
    list
}

/// K_iijj with nothing taken out, cm⁻¹; ⟨vᵢ, vⱼ|H|vᵢ − 2, vⱼ + 2⟩ = ¼ K [vᵢ (vᵢ − 1)(vⱼ + 1)(vⱼ + 2)]^½.
pub fn plain_darling_dennison(field: &ForceField, i: usize, j: usize) -> f64 {
    darling_dennison(field, i, j, &Taken::new())
}

fn darling_dennison(field: &ForceField, i: usize, j: usize, taken: &Taken) -> f64 {
    let w = &field.omega;
    let out = |upper: usize, p: usize, q: usize| taken.contains(&(upper, [p.min(q), p.max(q)]));
    let mut k_sum = 0.25 * field.quartic(i, i, j, j);
    for k in 0..w.len() {
        let through = field.cubic(i, i, k) * field.cubic(j, j, k);
        if through != 0.0 {
            // ½ [1/(2i − k) + 1/(2j − k)] − ½ [1/(2i + k) + 1/(2j + k)], in units of f f/8.
            let resonant = match (out(k, i, i), out(k, j, j)) {
                (false, false) => 0.5 * (1.0 / (2.0 * w[i] - w[k]) + 1.0 / (2.0 * w[j] - w[k])),
                (true, false) => 1.0 / (2.0 * w[j] - w[k]),
                (false, true) => 1.0 / (2.0 * w[i] - w[k]),
                (true, true) => 0.0,
            };
            let far = 0.5 * (1.0 / (2.0 * w[i] + w[k]) + 1.0 / (2.0 * w[j] + w[k]));
            k_sum += through / 8.0 * (resonant - far);
        }
        let f = field.cubic(i, j, k);
        if f != 0.0 {
            // −w_k/(w_k² − (wᵢ − wⱼ)²) = ½ [1/(i − j − k) + 1/(j − i − k)].
            let both = match (out(i, j, k), out(j, i, k)) {
                (false, false) => 0.5 * (1.0 / (w[i] - w[j] - w[k]) + 1.0 / (w[j] - w[i] - w[k])),
                (true, _) => 1.0 / (w[j] - w[i] - w[k]),
                (false, true) => 1.0 / (w[i] - w[j] - w[k]),
            };
            k_sum += 0.5 * f * f * both;
        }
    }
    k_sum - field.coriolis(i, j) * (w[i] + w[j]).powi(2) / (w[i] * w[j])
}

/// Relative and absolute standard uncertainty of a constant from a computed field: second-order constants of water from a
/// good field agree with the observed ones within 1 cm⁻¹ or 3 % (judgement built on that one comparison).
fn constant_sigma(value: f64) -> f64 {
    (0.05 * value).hypot(1.0)
}

/// The mode table of a field: fundamentals (resonances kept out), x, g, Fermi and Darling-Dennison constants.
///
/// Every removed resonance draws a note, as does every near one that stays.
///
/// # Errors
/// [`Singular`] when a denominator that stays is zero.
pub fn table(field: &ForceField, criterion: Criterion) -> Result<Noted<ModeTable>, Singular> {
    let by_components = constants(field, criterion)?;
    let mut notes = Vec::new();
    // Components in groups: one mode each.
    let mut groups: Vec<Vec<usize>> = field.degenerate.clone();
    groups.extend((0..field.omega.len()).filter(|i| field.degenerate.iter().all(|g| !g.contains(i))).map(|i| vec![i]));
    groups.sort();
    let mode_of = |component: usize| groups.iter().position(|g| g.contains(&component)).unwrap_or(0);
    let mean = |a: &[usize], b: &[usize]| {
        let pairs: Vec<f64> =
            a.iter().flat_map(|i| b.iter().map(move |j| (*i, *j))).map(|(i, j)| by_components.x(i, j)).collect();
        #[expect(clippy::cast_precision_loss, reason = "at most nine pairs")]
        let count = pairs.len() as f64;
        let mean = pairs.iter().sum::<f64>() / count;
        (mean, pairs.iter().map(|x| (x - mean).abs()).fold(0.0, f64::max))
    };
    let own = |group: &[usize]| {
        #[expect(clippy::cast_precision_loss, reason = "at most three")]
        let count = group.len() as f64;
        group.iter().map(|i| by_components.x(*i, *i)).sum::<f64>() / count
    };
    let source =
        format!("second order from {}", if field.source.is_empty() { "the force field" } else { &field.source });
    let mut table = ModeTable {
        name: field.title.clone(),
        title: field.title.clone(),
        formula: if field.moiety == "molecule" { String::new() } else { field.moiety.clone() },
        basis: Basis::Fundamental,
        point_group: field.point_group.clone(),
        origin: TableOrigin::Computed,
        source: field.source.clone(),
        ..ModeTable::default()
    };
    let moiety = table.intern_moiety(&field.moiety);
    let push = |table: &mut ModeTable, kind, a, b, c, value: f64, source: &str| {
        table.constants.push(Constant {
            kind,
            a,
            b,
            c,
            value: Shift(value),
            sigma: constant_sigma(value),
            source: source.to_owned(),
        });
    };
    for (a, group) in groups.iter().enumerate() {
        #[expect(clippy::cast_possible_truncation, reason = "a group has one to three components")]
        let degeneracy = group.len() as u8;
        let x = own(group);
        let g = (degeneracy > 1).then(|| {
            let (mut sum, mut count) = (0.0, 0.0);
            for (k, i) in group.iter().enumerate() {
                for j in &group[..k] {
                    sum += 0.5 * by_components.x(*i, *j) - x;
                    count += 1.0;
                }
            }
            sum / count
        });
        let others: f64 = groups
            .iter()
            .enumerate()
            .filter(|(b, _)| *b != a)
            .map(|(_, other)| {
                #[expect(clippy::cast_precision_loss, reason = "at most three")]
                let d = other.len() as f64;
                0.5 * d * mean(group, other).0
            })
            .sum();
        let lift = g.map_or(0.0, |g| if degeneracy == 3 { 2.0 * g } else { g });
        let omega = field.omega[group[0]];
        let nu = omega + x * (1.0 + f64::from(degeneracy)) + others + lift;
        let id = match group.as_slice() {
            [one] => field.names[*one].clone(),
            many => {
                // `nu4a` and `nu4b` are the components of `nu4`.
                let first = &field.names[many[0]];
                let stem = first.strip_suffix(['a', 'x', '1']).filter(|s| !s.is_empty()).unwrap_or(first);
                stem.trim_end_matches(['-', '_', ' ']).to_owned()
            }
        };
        table.modes.push(Mode {
            id,
            moiety,
            motion: field.motions[group[0]],
            wavenumber: Wavenumber::from_inverse_cm(nu).unwrap_or_else(|_| {
                notes.push(Note::new(format!(
                    "the corrections of {} exceed its harmonic wavenumber: second order has broken down there",
                    field.names[group[0]]
                )));
                Wavenumber::from_inverse_cm(omega)
                    .unwrap_or_else(|_| Wavenumber::from_vacuum_micrometres(1.0e4).expect("one"))
            }),
            // What a fundamental of a good computed field is worth.
            sigma: (0.012 * omega).max(1.0),
            sigma_given: true,
            degeneracy,
            species: field.species[group[0]].clone(),
            ir: None,
            raman: None,
            fwhm: None,
            source: format!("{source}; harmonic {omega:.1}"),
        });
        push(&mut table, ConstantKind::X, a, a, None, x, &source);
        if let Some(g) = g {
            push(&mut table, ConstantKind::G, a, a, None, g, &source);
        }
        for (b, other) in groups.iter().enumerate().take(a) {
            let (x, spread) = mean(group, other);
            if spread > 0.05 && group.len().min(other.len()) == 1 {
                notes.push(Note::new(format!(
                    "components of a degenerate mode differ in x with {} by {spread:.2} cm⁻¹: the field is not symmetric",
                    field.names[other[0]]
                )));
            }
            push(&mut table, ConstantKind::X, a, b, None, x, &source);
        }
    }
    for near in &by_components.cubic {
        let name = |i: usize| field.names[i].as_str();
        let pair = if near.lower[0] == near.lower[1] {
            format!("2 {}", name(near.lower[0]))
        } else {
            format!("{} + {}", name(near.lower[0]), name(near.lower[1]))
        };
        let numbers = format!(
            "D = {:.1} cm⁻¹, element {:.1} cm⁻¹, W⁴/|D|³ = {:.2} cm⁻¹, |W/D| = {:.3}",
            near.denominator,
            near.element,
            excess_of(near.element, near.denominator),
            (near.element / near.denominator).abs()
        );
        if near.removed {
            notes.push(Note::new(format!(
                "resonance {pair} with {}: {numbers}; taken out of the constants and handed to the polyads",
                name(near.upper)
            )));
            let (a, b) = (mode_of(near.upper), mode_of(near.lower[0]));
            let group = &groups[b];
            if near.lower[0] != near.lower[1] {
                push(&mut table, ConstantKind::Fermi, a, b, Some(mode_of(near.lower[1])), near.element, &source);
            } else if near.lower[0] == group[0] {
                // ⟨1|H|2, l = 0⟩ gathers the components: f/4 times √d.
                #[expect(clippy::cast_precision_loss, reason = "at most three")]
                let element = near.element * (group.len() as f64).sqrt();
                push(&mut table, ConstantKind::Fermi, a, b, None, element, &source);
            }
        } else if (near.element / near.denominator).abs() > 0.076 {
            notes.push(Note::new(format!(
                "near resonance {pair} with {}: {numbers}; kept in the constants",
                name(near.upper)
            )));
        }
    }
    for pairing in &by_components.pairings {
        // A pair at a distance that second-order x cannot feel: the same test, without a window of its own.
        let element = 0.5 * pairing.k;
        if criterion != Criterion::Never && excess_of(element, pairing.denominator) > 1.0 {
            let (a, b) = (mode_of(pairing.modes[0]), mode_of(pairing.modes[1]));
            notes.push(Note::new(format!(
                "Darling-Dennison pair {} and {}: element {element:.1} cm⁻¹ over {:.1} cm⁻¹",
                field.names[pairing.modes[0]], field.names[pairing.modes[1]], pairing.denominator
            )));
            push(&mut table, ConstantKind::DarlingDennison, a, b, None, element, &source);
        }
    }
    table.settle_moieties();
    Ok(Noted { value: table, notes })
}
