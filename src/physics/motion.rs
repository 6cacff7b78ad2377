//! What each normal mode does: its shares in the motions of the moieties.
//!
//! Every moiety has as many local motions as it has degrees of freedom; together they are an orthonormal basis in
//! mass-weighted coordinates, so the shares of a mode add up to one. Waters: translation (along or across the
//! metal–oxygen line), rock, wag, twist, two stretches, bend. Oxyanions: translation, libration, and ν1 to ν4, which are
//! the modes of the ion's own block of the Hessian, named by projection on the symmetric displacements.

use itertools::Itertools;
use nalgebra::{DMatrix, DVector, SymmetricEigen, Vector3};

use super::moieties::{Fragment, Group, Structure};
use super::normal_modes::{NormalModes, centre_of_mass, rigid_motions};
use crate::mode::Motion;
use crate::read::qcschema::HessianRecord;

/// A local motion of one moiety.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub enum Local {
    /// Both O–H bonds of a water in phase.
    StretchSymmetric,
    /// Both O–H bonds of a water out of phase.
    StretchAntisymmetric,
    /// H–O–H angle.
    Bend,
    /// A water turns in its plane.
    Rock,
    /// A water turns about the line through its hydrogens.
    Wag,
    /// A water turns about its bisector.
    Twist,
    /// A coordinated moiety moves along its metal–oxygen line.
    MetalOxygenStretch,
    /// A coordinated water moves across its metal–oxygen line.
    OxygenMetalOxygenBend,
    /// ν1 of an oxyanion: symmetric stretch.
    Nu1,
    /// ν2 of an oxyanion: symmetric (XO3: out of plane; XO4: twofold) bend.
    Nu2,
    /// ν3 of an oxyanion: degenerate stretch.
    Nu3,
    /// ν4 of an oxyanion: degenerate bend.
    Nu4,
    /// A whole moiety turns.
    Libration,
    /// A whole moiety moves.
    Translation,
    /// Any other stretch inside a moiety.
    OtherStretch,
    /// Any other deformation inside a moiety.
    OtherBend,
}

/// Local motions of one kind, as spectroscopists sum them.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub struct Class {
    /// What kind of moiety.
    pub group: Group,
    /// Which motion; the members of a family of water librations or water stretches are one class.
    pub family: Family,
}

/// The families of local motions.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub enum Family {
    /// O–H (N–H, other) stretches.
    Stretch,
    /// Bends.
    Bend,
    /// Librations.
    Libration,
    /// Metal–oxygen stretches.
    MetalOxygen,
    /// O–M–O bends.
    Skeleton,
    /// ν1 to ν4.
    Nu(u8),
    /// Translations.
    Translation,
}

impl Local {
    fn family(self) -> Family {
        match self {
            Local::StretchSymmetric | Local::StretchAntisymmetric | Local::OtherStretch => Family::Stretch,
            Local::Bend | Local::OtherBend => Family::Bend,
            Local::Rock | Local::Wag | Local::Twist | Local::Libration => Family::Libration,
            Local::MetalOxygenStretch => Family::MetalOxygen,
            Local::OxygenMetalOxygenBend => Family::Skeleton,
            Local::Nu1 => Family::Nu(1),
            Local::Nu2 => Family::Nu(2),
            Local::Nu3 => Family::Nu(3),
            Local::Nu4 => Family::Nu(4),
            Local::Translation => Family::Translation,
        }
    }

    fn word(self) -> &'static str {
        match self {
            Local::StretchSymmetric => "sym",
            Local::StretchAntisymmetric => "asym",
            Local::Rock => "rock",
            Local::Wag => "wag",
            Local::Twist => "twist",
            _ => "",
        }
    }
}

impl Class {
    /// In words: `water stretch`, `oxyanion nu3`, `M-O stretch`.
    pub fn words(self) -> String {
        let who = match self.group {
            Group::Water => "water",
            Group::Oxyanion => "oxyanion",
            Group::Ammonium => "ammonium",
            Group::Metal => "metal",
            Group::Other => "other",
        };
        match self.family {
            Family::MetalOxygen => "M-O stretch".to_owned(),
            Family::Skeleton => "O-M-O bend".to_owned(),
            Family::Stretch => format!("{who} stretch"),
            Family::Bend => format!("{who} bend"),
            Family::Libration => format!("{who} libration"),
            Family::Translation => format!("{who} translation"),
            Family::Nu(k) => format!("{who} nu{k}"),
        }
    }

    /// The motion of mode tables.
    pub fn motion(self) -> Motion {
        match (self.group, self.family) {
            (Group::Water, Family::Stretch) => Motion::OhStretch,
            (Group::Water, Family::Bend) => Motion::HohBend,
            (Group::Water, Family::Libration) => Motion::Libration,
            (Group::Oxyanion, Family::Nu(1 | 3)) => Motion::XoStretch,
            (Group::Oxyanion, Family::Nu(_)) => Motion::OxoBend,
            (Group::Ammonium, Family::Nu(1 | 3)) => Motion::NhStretch,
            (Group::Ammonium, Family::Nu(_)) => Motion::NhBend,
            (_, Family::MetalOxygen) => Motion::MetalOxygen,
            (_, Family::Skeleton | Family::Libration | Family::Translation) => Motion::Lattice,
            _ => Motion::Other,
        }
    }
}

/// A local motion in mass-weighted coordinates of the whole geometry.
#[derive(Clone, Debug)]
struct LocalVector {
    fragment: usize,
    local: Local,
    vector: DVector<f64>,
}

/// Share of one local motion in a mode.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Share {
    /// Number of the fragment.
    pub fragment: usize,
    /// Its motion.
    pub local: Local,
    /// Share of the mode, 0 to 1.
    pub share: f64,
}

/// What one mode does.
#[derive(Clone, Debug, PartialEq)]
pub struct Description {
    /// The class with the largest share.
    pub class: Class,
    /// `sym`, `asym`, `rock`, `wag` or `twist` where one of them dominates its class, else empty.
    pub detail: &'static str,
    /// Share of the class: the purity.
    pub purity: f64,
    /// The class with the second largest share, and that share.
    pub second: Option<(Class, f64)>,
    /// Number of the moiety the mode is counted to, among those that carry its class.
    pub fragment: usize,
    /// Share of that moiety within the class.
    pub concentration: f64,
    /// Kinetic fraction of each fragment.
    pub fractions: Vec<f64>,
    /// All shares, by fragment and motion.
    pub shares: Vec<Share>,
}

impl Description {
    /// In words: `water libration rock`.
    pub fn words(&self) -> String {
        let class = self.class.words();
        if self.detail.is_empty() { class } else { format!("{class} {}", self.detail) }
    }

    /// The motion of mode tables.
    pub fn motion(&self) -> Motion {
        self.class.motion()
    }
}

/// A detail is told when it has this part of its class (a judgement of this project).
const DETAIL: f64 = 0.75;

/// What each mode does, one description a mode.
///
/// # Method
/// Shares are squared projections of the mass-weighted eigenvector on the local motions. Modes are counted to moieties so
/// that each moiety gets as many modes of a class as it has local motions of it: pairs of mode and moiety are taken by
/// falling share. A mode that is spread over equal moieties is thus counted to one of them; `concentration` says how much
/// of it is there.
pub fn describe(record: &HessianRecord, modes: &NormalModes, structure: &Structure) -> Vec<Description> {
    let locals = local_motions(record, &modes.masses, structure);
    let class_of = |l: &LocalVector| Class { group: structure.fragments[l.fragment].group, family: l.local.family() };
    let mut list: Vec<Description> = modes
        .modes
        .iter()
        .map(|mode| {
            let vector = DVector::from_column_slice(&mode.vector);
            let shares: Vec<Share> = locals
                .iter()
                .map(|l| Share { fragment: l.fragment, local: l.local, share: l.vector.dot(&vector).powi(2) })
                .collect();
            let sums: Vec<(Class, f64)> = locals
                .iter()
                .zip(&shares)
                .map(|(l, s)| (class_of(l), s.share))
                .sorted_by_key(|(class, _)| *class)
                .chunk_by(|(class, _)| *class)
                .into_iter()
                .map(|(class, part)| (class, part.map(|p| p.1).sum::<f64>()))
                .sorted_by(|a, b| b.1.total_cmp(&a.1))
                .collect();
            let (class, purity) =
                sums.first().copied().unwrap_or((Class { group: Group::Other, family: Family::Bend }, 0.0));
            let inside = |l: &LocalVector| class_of(l) == class;
            let detail = locals
                .iter()
                .zip(&shares)
                .filter(|(l, _)| inside(l) && !l.local.word().is_empty())
                .map(|(l, s)| (l.local.word(), s.share))
                .sorted_by_key(|(word, _)| *word)
                .chunk_by(|(word, _)| *word)
                .into_iter()
                .map(|(word, part)| (word, part.map(|p| p.1).sum::<f64>()))
                .find(|(_, share)| *share >= DETAIL * purity)
                .map_or("", |(word, _)| word);
            let fractions =
                structure.fragments.iter().map(|f| f.atoms.iter().map(|a| mode.kinetic_share(*a)).sum()).collect();
            Description {
                class,
                detail,
                purity,
                second: sums.get(1).copied().filter(|(_, share)| *share > 0.1),
                fragment: 0,
                concentration: 0.0,
                fractions,
                shares,
            }
        })
        .collect();
    count_to_moieties(&mut list, &locals, class_of);
    list
}

fn count_to_moieties(list: &mut [Description], locals: &[LocalVector], class_of: impl Fn(&LocalVector) -> Class) {
    let classes: Vec<Class> = list.iter().map(|d| d.class).sorted().dedup().collect();
    for class in classes {
        let mut room: Vec<(usize, usize)> =
            locals.iter().filter(|l| class_of(l) == class).map(|l| l.fragment).counts().into_iter().sorted().collect();
        let mut pairs: Vec<(usize, usize, f64)> = Vec::new();
        for (number, description) in list.iter().enumerate().filter(|(_, d)| d.class == class) {
            for (place, (fragment, _)) in room.iter().enumerate() {
                let share: f64 = description
                    .shares
                    .iter()
                    .zip(locals)
                    .filter(|(s, l)| s.fragment == *fragment && class_of(l) == class)
                    .map(|(s, _)| s.share)
                    .sum();
                pairs.push((number, place, share / description.purity.max(f64::MIN_POSITIVE)));
            }
        }
        // Shares are rounded so that the noise of equal ones does not decide; order then does.
        let coarse = |share: f64| (share * 1.0e4).round() as i64;
        pairs.sort_by_key(|(number, place, share)| (-coarse(*share), *number, *place));
        let mut done: Vec<usize> = Vec::new();
        // A second round without limit takes the modes that are more than the local motions of their class.
        for limited in [true, false] {
            for (number, place, share) in &pairs {
                if done.contains(number) || (limited && room[*place].1 == 0) {
                    continue;
                }
                room[*place].1 = room[*place].1.saturating_sub(1);
                list[*number].fragment = room[*place].0;
                list[*number].concentration = *share;
                done.push(*number);
            }
        }
    }
}

fn local_motions(record: &HessianRecord, masses: &[f64], structure: &Structure) -> Vec<LocalVector> {
    let mut list = Vec::new();
    for (number, fragment) in structure.fragments.iter().enumerate() {
        let frame = Frame::new(record, masses, fragment);
        let line = structure.coordination[number].map(|(metal, atom)| {
            let centre = structure.fragments[metal].atoms[0];
            frame.position(record, atom) - frame.position(record, centre)
        });
        let own = match fragment.group {
            Group::Water => water(&frame, line),
            Group::Oxyanion | Group::Ammonium => central(&frame, line),
            Group::Metal | Group::Other => other(&frame),
        };
        for (local, vector) in own {
            let mut whole = DVector::zeros(3 * record.atoms());
            for (k, atom) in fragment.atoms.iter().enumerate() {
                (0..3).for_each(|c| whole[3 * atom + c] = vector[3 * k + c]);
            }
            list.push(LocalVector { fragment: number, local, vector: whole });
        }
    }
    list
}

/// One fragment in its own numbering.
struct Frame<'a> {
    fragment: &'a Fragment,
    geometry: Vec<[f64; 3]>,
    masses: Vec<f64>,
    /// The fragment's block of the mass-weighted Hessian.
    block: DMatrix<f64>,
    rigid: Vec<DVector<f64>>,
}

impl<'a> Frame<'a> {
    fn new(record: &HessianRecord, masses: &[f64], fragment: &'a Fragment) -> Self {
        let geometry: Vec<[f64; 3]> = fragment.atoms.iter().map(|a| record.geometry[*a]).collect();
        let own: Vec<f64> = fragment.atoms.iter().map(|a| masses[*a]).collect();
        let size = 3 * record.atoms();
        let index = |i: usize| 3 * fragment.atoms[i / 3] + i % 3;
        let count = 3 * own.len();
        let block = DMatrix::from_fn(count, count, |i, j| {
            record.hessian[index(i) * size + index(j)] / (own[i / 3] * own[j / 3]).sqrt()
        });
        let rigid = rigid_motions(&geometry, &own);
        Self { fragment, geometry, masses: own, block, rigid }
    }

    fn position(&self, record: &HessianRecord, atom: usize) -> Vector3<f64> {
        Vector3::from(record.geometry[atom])
    }

    fn at(&self, atom: usize) -> Vector3<f64> {
        Vector3::from(self.geometry[atom])
    }

    fn size(&self) -> usize {
        self.geometry.len() * 3
    }

    /// Bonds in own numbering.
    fn bonds(&self) -> Vec<(usize, usize)> {
        let own = |atom: usize| self.fragment.atoms.iter().position(|a| *a == atom).unwrap_or(0);
        self.fragment.bonds.iter().map(|(i, j)| (own(*i), own(*j))).collect()
    }

    /// M^(−1/2) ∂r/∂x of a bond.
    fn stretch(&self, i: usize, j: usize) -> DVector<f64> {
        let direction = (self.at(j) - self.at(i)).normalize();
        self.gradient(&[(i, -direction), (j, direction)])
    }

    /// M^(−1/2) ∂θ/∂x of the angle i–centre–j (Wilson, Decius & Cross 1955, section 4-1).
    fn angle(&self, i: usize, centre: usize, j: usize) -> DVector<f64> {
        let (a, b) = (self.at(i) - self.at(centre), self.at(j) - self.at(centre));
        let (ea, eb) = (a.normalize(), b.normalize());
        let cosine = ea.dot(&eb);
        let sine = (1.0 - cosine * cosine).max(1.0e-8).sqrt();
        let si = (ea * cosine - eb) / (a.norm() * sine);
        let sj = (eb * cosine - ea) / (b.norm() * sine);
        self.gradient(&[(i, si), (j, sj), (centre, -si - sj)])
    }

    fn gradient(&self, parts: &[(usize, Vector3<f64>)]) -> DVector<f64> {
        let mut vector = DVector::zeros(self.size());
        for (atom, part) in parts {
            (0..3).for_each(|c| vector[3 * atom + c] += part[c] / self.masses[*atom].sqrt());
        }
        vector
    }

    fn translation(&self, direction: Vector3<f64>) -> DVector<f64> {
        let total: f64 = self.masses.iter().sum();
        DVector::from_fn(self.size(), |i, _| direction[i % 3] * (self.masses[i / 3] / total).sqrt())
    }

    fn rotation(&self, axis: Vector3<f64>) -> DVector<f64> {
        let centre = centre_of_mass(&self.geometry, &self.masses);
        let mut vector = DVector::zeros(self.size());
        for atom in 0..self.masses.len() {
            let turn = axis.cross(&(self.at(atom) - centre)) * self.masses[atom].sqrt();
            (0..3).for_each(|c| vector[3 * atom + c] = turn[c]);
        }
        vector
    }

    /// Modes of the fragment's own block without its rigid motions, by rising eigenvalue.
    fn inner_modes(&self) -> Vec<DVector<f64>> {
        let rigid = DMatrix::from_columns(&self.rigid);
        let projector = DMatrix::identity(self.size(), self.size()) - &rigid * rigid.transpose();
        let far = 4.0 * self.block.norm() + 1.0;
        let matrix = &projector * &self.block * &projector + &rigid * rigid.transpose() * far;
        let eigen = SymmetricEigen::new(0.5 * (&matrix + matrix.transpose()));
        let order = (0..self.size()).sorted_by(|a, b| eigen.eigenvalues[*a].total_cmp(&eigen.eigenvalues[*b]));
        order.take(self.size() - self.rigid.len()).map(|k| eigen.eigenvectors.column(k).into_owned()).collect()
    }

    /// Translations: along the metal–oxygen line and across it, or just three.
    fn translations(&self, line: Option<Vector3<f64>>, across: Local) -> Vec<(Local, DVector<f64>)> {
        match line {
            None => (0..3).map(|k| (Local::Translation, self.translation(Vector3::ith(k, 1.0)))).collect(),
            Some(line) => {
                let along = line.normalize();
                let one = perpendicular(along);
                let rest = [one, along.cross(&one)].map(|v| (across, self.translation(v)));
                std::iter::once((Local::MetalOxygenStretch, self.translation(along))).chain(rest).collect()
            }
        }
    }
}

fn perpendicular(direction: Vector3<f64>) -> Vector3<f64> {
    let helper = Vector3::ith(direction.iamin(), 1.0);
    direction.cross(&helper).normalize()
}

/// What is left of `vector` beside orthonormal `others`, of length one; `None` when nothing is.
fn beside<'a>(vector: &DVector<f64>, others: impl IntoIterator<Item = &'a DVector<f64>>) -> Option<DVector<f64>> {
    let before = vector.norm();
    let mut rest = vector.clone();
    for other in others {
        rest -= other * other.dot(&rest);
    }
    (rest.norm() > 1.0e-6 * before).then(|| rest.normalize())
}

/// The orthonormal set nearest to these independent vectors (symmetric orthogonalisation: Löwdin, J. Chem. Phys. 18, 365
/// (1950)); `None` when they are dependent.
fn nearest_orthonormal(vectors: &[DVector<f64>]) -> Option<Vec<DVector<f64>>> {
    let unit: Vec<DVector<f64>> = vectors.iter().map(|v| v.normalize()).collect();
    let matrix = DMatrix::from_columns(&unit);
    let eigen = SymmetricEigen::new(matrix.transpose() * &matrix);
    if eigen.eigenvalues.min() < 1.0e-6 {
        return None;
    }
    let power = DMatrix::from_diagonal(&eigen.eigenvalues.map(|v| v.powf(-0.5)));
    let result = &matrix * &eigen.eigenvectors * power * eigen.eigenvectors.transpose();
    Some(result.column_iter().map(|c| c.into_owned()).collect())
}

fn water(frame: &Frame<'_>, line: Option<Vector3<f64>>) -> Vec<(Local, DVector<f64>)> {
    // The centre of a water, its oxygen, is atom 0.
    let mut list = frame.translations(line, Local::OxygenMetalOxygenBend);
    let (one, two) = (frame.at(1) - frame.at(0), frame.at(2) - frame.at(0));
    let bisector = one.normalize() + two.normalize();
    let normal = one.cross(&two);
    if bisector.norm() < 1.0e-3 || normal.norm() < 1.0e-3 {
        return other(frame);
    }
    let (bisector, normal) = (bisector.normalize(), normal.normalize());
    let axes = [(Local::Twist, bisector), (Local::Rock, normal), (Local::Wag, bisector.cross(&normal))];
    let turns = axes.map(|(local, axis)| (local, frame.rotation(axis)));
    // The principal axes of HDO are not these axes; the nearest orthonormal set keeps the names.
    let vectors: Vec<DVector<f64>> = turns.iter().map(|t| t.1.clone()).collect();
    let Some(vectors) = nearest_orthonormal(&vectors) else { return other(frame) };
    list.extend(turns.iter().map(|t| t.0).zip(vectors));
    let (a, b) = (frame.stretch(0, 1), frame.stretch(0, 2));
    let inner = [&a + &b, &a - &b, frame.angle(1, 0, 2)];
    let Some(inner) = nearest_orthonormal(&inner) else { return other(frame) };
    list.extend([Local::StretchSymmetric, Local::StretchAntisymmetric, Local::Bend].into_iter().zip(inner));
    list
}

/// XOn and NH4: translations, librations, and the modes of the own block named ν1 to ν4.
fn central(frame: &Frame<'_>, line: Option<Vector3<f64>>) -> Vec<(Local, DVector<f64>)> {
    let ligands = frame.masses.len() - 1;
    let linear = frame.rigid.len() == 5;
    if linear || !(3..=4).contains(&ligands) {
        return other(frame);
    }
    let mut list = match line {
        // An ion in the first shell has its metal–oxygen stretch; across it, it just moves.
        Some(line) => frame.translations(Some(line), Local::Translation),
        None => frame.translations(None, Local::Translation),
    };
    list.extend(frame.rigid.iter().skip(3).map(|v| (Local::Libration, v.clone())));
    let mut inner = frame.inner_modes();
    let stretches: Vec<DVector<f64>> = frame.bonds().iter().map(|(i, j)| frame.stretch(*i, *j)).collect();
    let Some(space) = nearest_orthonormal(&stretches) else { return other(frame) };
    let overlap = |mode: &DVector<f64>, space: &[DVector<f64>]| space.iter().map(|v| v.dot(mode).powi(2)).sum::<f64>();
    inner.sort_by(|a, b| overlap(b, &space).total_cmp(&overlap(a, &space)));
    let mut bends = inner.split_off(ligands.min(inner.len()));
    let breathing: DVector<f64> = stretches.iter().sum();
    let breathing = breathing.normalize();
    inner.sort_by(|a, b| breathing.dot(b).abs().total_cmp(&breathing.dot(a).abs()));
    let symmetric_bends: Vec<DVector<f64>> = if ligands == 4 {
        let angle = |i: usize, j: usize| frame.angle(i, 0, j);
        vec![
            (angle(1, 2) + angle(3, 4)) * 2.0 - angle(1, 3) - angle(1, 4) - angle(2, 3) - angle(2, 4),
            angle(1, 3) - angle(1, 4) - angle(2, 3) + angle(2, 4),
        ]
    } else {
        // The umbrella: the centre against the plane of the three.
        let axis = (frame.at(2) - frame.at(1)).cross(&(frame.at(3) - frame.at(1))).normalize();
        vec![frame.gradient(&[(0, axis * 3.0), (1, -axis), (2, -axis), (3, -axis)])]
    };
    let removed: Vec<&DVector<f64>> = frame.rigid.iter().collect();
    let symmetric_bends: Vec<DVector<f64>> =
        symmetric_bends.iter().filter_map(|v| beside(v, removed.iter().copied())).collect();
    bends.sort_by(|a, b| overlap(b, &symmetric_bends).total_cmp(&overlap(a, &symmetric_bends)));
    let first = symmetric_bends.len();
    list.extend(inner.into_iter().enumerate().map(|(k, v)| (if k == 0 { Local::Nu1 } else { Local::Nu3 }, v)));
    list.extend(bends.into_iter().enumerate().map(|(k, v)| (if k < first { Local::Nu2 } else { Local::Nu4 }, v)));
    list
}

/// Anything: translations, rotations, the modes of the own block; as many stretches as bonds.
fn other(frame: &Frame<'_>) -> Vec<(Local, DVector<f64>)> {
    let mut list = frame.translations(None, Local::Translation);
    list.extend(frame.rigid.iter().skip(3).map(|v| (Local::Libration, v.clone())));
    if frame.masses.len() > 1 {
        let inner = frame.inner_modes();
        let bends = inner.len().saturating_sub(frame.fragment.bonds.len());
        let name = |k: usize| if k < bends { Local::OtherBend } else { Local::OtherStretch };
        list.extend(inner.into_iter().enumerate().map(|(k, v)| (name(k), v)));
    }
    list
}
