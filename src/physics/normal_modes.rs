//! A Hessian and masses become harmonic normal modes.

use nalgebra::{DMatrix, DVector, SymmetricEigen, Vector3};

use super::elements::{self, Exchange};
use crate::read::qcschema::HessianRecord;

/// CODATA 2018 (Tiesinga et al., Rev. Mod. Phys. 93, 025010 (2021)), SI units.
mod constant {
    /// Hartree, J.
    pub const HARTREE: f64 = 4.359_744_722_207_1e-18;
    /// Bohr radius, m.
    pub const BOHR: f64 = 5.291_772_109_03e-11;
    /// Atomic mass constant, kg.
    pub const DALTON: f64 = 1.660_539_066_60e-27;
    /// Speed of light, m/s (exact).
    pub const LIGHT: f64 = 299_792_458.0;
    /// Elementary charge, C (exact).
    pub const CHARGE: f64 = 1.602_176_634e-19;
    /// Electric constant, F/m.
    pub const ELECTRIC: f64 = 8.854_187_812_8e-12;
    /// Avogadro constant, 1/mol (exact).
    pub const AVOGADRO: f64 = 6.022_140_76e23;
}

/// One bohr in ångström.
pub const BOHR_IN_ANGSTROM: f64 = constant::BOHR * 1.0e10;

/// ω̃ in cm⁻¹ of an eigenvalue of one hartree/(bohr² u).
fn wavenumber_unit() -> f64 {
    let angular = (constant::HARTREE / (constant::BOHR.powi(2) * constant::DALTON)).sqrt();
    angular / (2.0 * std::f64::consts::PI * constant::LIGHT * 100.0)
}

/// Infrared strength in km/mol of |dμ/dQ|² = 1 e²/u: N_A / (12 ε₀ c²).
fn infrared_unit() -> f64 {
    let square = constant::CHARGE.powi(2) / constant::DALTON;
    constant::AVOGADRO * square / (12.0 * constant::ELECTRIC * constant::LIGHT.powi(2)) * 1.0e-3
}

/// One normal mode.
#[derive(Clone, Debug, PartialEq)]
pub struct NormalMode {
    /// Harmonic wavenumber, cm⁻¹; negative when imaginary.
    pub wavenumber: f64,
    /// Mass-weighted displacement, 3N, of length one.
    pub vector: Vec<f64>,
    /// 1 / Σ (Cartesian displacement)², u.
    pub reduced_mass: f64,
    /// Infrared strength, km/mol (harmonic in both senses), where dipole derivatives are known.
    pub infrared: Option<f64>,
}

impl NormalMode {
    /// Share of atom `atom` in the kinetic energy.
    pub fn kinetic_share(&self, atom: usize) -> f64 {
        self.vector.iter().skip(3 * atom).take(3).map(|x| x * x).sum()
    }
}

/// The normal modes of one geometry.
#[derive(Clone, Debug, PartialEq)]
pub struct NormalModes {
    /// Modes, ascending.
    pub modes: Vec<NormalMode>,
    /// Masses used, u.
    pub masses: Vec<f64>,
    /// Whether all atoms lie on a line (one rotation less).
    pub linear: bool,
    /// What the Hessian says of the three translations, cm⁻¹, negative when imaginary; zero in a perfect one.
    pub translations: Vec<f64>,
    /// The same of the rotations; zero in a perfect Hessian at rest.
    pub rotations: Vec<f64>,
}

/// The masses of a record, u: its own, or those of the most abundant isotopes, with `exchanges` applied.
///
/// # Errors
/// A sentence when an element is unknown and has no mass, or an exchange meets no atom.
pub fn masses(record: &HessianRecord, exchanges: &[Exchange]) -> Result<Vec<f64>, String> {
    let mut masses = match &record.masses {
        Some(masses) => masses.clone(),
        None => record
            .symbols
            .iter()
            .map(|symbol| {
                elements::isotope(symbol)
                    .map(|(_, mass)| mass)
                    .ok_or_else(|| format!("{}: no mass given for `{symbol}`, and none known here", record.name))
            })
            .collect::<Result<_, _>>()?,
    };
    for exchange in exchanges {
        let mut met = false;
        for (mass, symbol) in masses.iter_mut().zip(&record.symbols) {
            if elements::named(symbol).is_some_and(|e| e.symbol == exchange.symbol) {
                *mass = exchange.mass;
                met = true;
            }
        }
        if !met {
            return Err(format!(
                "{}: the exchange {} meets no atom of {}",
                record.name, exchange.text, exchange.symbol
            ));
        }
    }
    Ok(masses)
}

/// Normal modes of a Hessian with these masses (u, one an atom).
///
/// # Method
/// Mass weighting; translations and rotations about the centre of mass are projected out of the Hessian (Eckart
/// conditions; Wilson, Decius & Cross, *Molecular Vibrations*, 1955) and shifted above everything else, so that the
/// 3N − 6 (linear: 3N − 5) lowest eigenvectors are the vibrations whatever their sign.
/// Checked by: `tests/quantum_chemistry.rs`.
pub fn normal_modes(record: &HessianRecord, masses: &[f64]) -> NormalModes {
    let n = record.atoms();
    let size = 3 * n;
    let root: Vec<f64> = (0..size).map(|i| masses[i / 3].sqrt()).collect();
    let weighted = DMatrix::from_fn(size, size, |i, j| record.hessian[i * size + j] / (root[i] * root[j]));
    let frame = rigid_motions(&record.geometry, masses);
    let linear = frame.len() == 5;
    let rigid = DMatrix::from_columns(&frame);
    // P W P with P = 1 − T Tᵀ, then the rigid motions are put far above.
    let product = &weighted * &rigid;
    let inner = rigid.transpose() * &product;
    let half = &product * rigid.transpose();
    let far = 4.0 * weighted.norm() + 1.0;
    let projected = &weighted - &half - half.transpose()
        + &rigid * (&inner + DMatrix::identity(frame.len(), frame.len()) * far) * rigid.transpose();
    let eigen = SymmetricEigen::new(projected);
    let mut order: Vec<usize> = (0..size).collect();
    order.sort_by(|a, b| eigen.eigenvalues[*a].total_cmp(&eigen.eigenvalues[*b]));
    order.truncate(size - frame.len());
    let signed = |value: f64| value.signum() * value.abs().sqrt() * wavenumber_unit();
    let modes = order
        .into_iter()
        .map(|column| {
            let mut vector: Vec<f64> = eigen.eigenvectors.column(column).iter().copied().collect();
            // The sign of an eigenvector is free; the largest component is made positive so that equal input gives equal
            // output.
            let largest = vector.iter().copied().fold(0.0_f64, |a, b| if b.abs() > a.abs() + 1.0e-9 { b } else { a });
            if largest < 0.0 {
                vector.iter_mut().for_each(|x| *x = -*x);
            }
            let cartesian: Vec<f64> = vector.iter().zip(&root).map(|(x, r)| x / r).collect();
            let infrared = record.dipole_derivatives.as_ref().map(|rows| {
                let square: f64 = rows
                    .chunks_exact(size)
                    .map(|row| row.iter().zip(&cartesian).map(|(d, x)| d * x).sum::<f64>().powi(2))
                    .sum();
                square * infrared_unit()
            });
            NormalMode {
                wavenumber: signed(eigen.eigenvalues[column]),
                reduced_mass: 1.0 / cartesian.iter().map(|x| x * x).sum::<f64>(),
                infrared,
                vector,
            }
        })
        .collect();
    let block = |start: usize, count: usize| {
        let part = inner.view((start, start), (count, count)).into_owned();
        let mut list: Vec<f64> = SymmetricEigen::new(part).eigenvalues.iter().map(|v| signed(*v)).collect();
        list.sort_by(f64::total_cmp);
        list
    };
    NormalModes {
        modes,
        masses: masses.to_vec(),
        linear,
        translations: block(0, 3),
        rotations: block(3, frame.len() - 3),
    }
}

/// Orthonormal mass-weighted translations and rotations of a group of atoms; a group on a line has two rotations, a
/// single atom none.
pub fn rigid_motions(geometry: &[[f64; 3]], masses: &[f64]) -> Vec<DVector<f64>> {
    let n = geometry.len();
    let total: f64 = masses.iter().sum();
    let centre = centre_of_mass(geometry, masses);
    let mut list: Vec<DVector<f64>> = (0..3)
        .map(|axis| DVector::from_fn(3 * n, |i, _| if i % 3 == axis { (masses[i / 3] / total).sqrt() } else { 0.0 }))
        .collect();
    let arms: Vec<Vector3<f64>> = geometry.iter().map(|p| Vector3::from(*p) - centre).collect();
    let inertia = arms.iter().zip(masses).fold(nalgebra::Matrix3::zeros(), |sum, (arm, mass)| {
        sum + (nalgebra::Matrix3::identity() * arm.norm_squared() - arm * arm.transpose()) * *mass
    });
    let eigen = SymmetricEigen::new(inertia);
    let largest = eigen.eigenvalues.max();
    for k in 0..3 {
        // A line has one moment of zero; 1e-6 of the largest is an angle of 0.06°.
        if largest > 0.0 && eigen.eigenvalues[k] > 1.0e-6 * largest {
            let axis = eigen.eigenvectors.column(k).into_owned();
            let mut vector = DVector::zeros(3 * n);
            for (atom, arm) in arms.iter().enumerate() {
                let turn = axis.cross(arm) * masses[atom].sqrt();
                (0..3).for_each(|c| vector[3 * atom + c] = turn[c]);
            }
            list.push(vector.normalize());
        }
    }
    list
}

/// Centre of mass.
pub fn centre_of_mass(geometry: &[[f64; 3]], masses: &[f64]) -> Vector3<f64> {
    let total: f64 = masses.iter().sum();
    geometry.iter().zip(masses).map(|(p, m)| Vector3::from(*p) * *m).sum::<Vector3<f64>>() / total
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn units_follow_from_the_constants() {
        // 1 hartree = 219474.6314 cm⁻¹ and 1 u = 1822.888486 mₑ (CODATA 2018): sqrt(Eh/(a0² u)) = 219474.6314/sqrt(1822.888486).
        assert!((wavenumber_unit() - 219_474.631_4 / 1_822.888_486_f64.sqrt()).abs() < 1.0e-4);
        // 974.88 km/mol per e²/u is the customary factor (from memory).
        assert!((infrared_unit() - 974.88).abs() < 0.05, "{}", infrared_unit());
    }

    fn diatomic(distance: f64) -> HessianRecord {
        // A spring of 0.3 hartree/bohr² along z between two atoms.
        let mut hessian = vec![0.0; 36];
        for (i, j, v) in [(2, 2, 0.3), (5, 5, 0.3), (2, 5, -0.3), (5, 2, -0.3)] {
            hessian[i * 6 + j] = v;
        }
        HessianRecord {
            name: "spring".into(),
            title: String::new(),
            symbols: vec!["H".into(), "Cl".into()],
            geometry: vec![[0.0; 3], [0.0, 0.0, distance]],
            masses: Some(vec![1.0, 35.0]),
            hessian,
            asymmetry: 0.0,
            gradient: None,
            dipole_derivatives: None,
            method: String::new(),
            basis: String::new(),
            creator: String::new(),
            charge: 0.0,
        }
    }

    #[test]
    fn a_linear_molecule_has_one_mode_more_and_a_spring_its_textbook_wavenumber() {
        let record = diatomic(2.4);
        let modes = normal_modes(&record, &[1.0, 35.0]);
        assert!(modes.linear);
        assert_eq!(modes.modes.len(), 1);
        let expected = wavenumber_unit() * (0.3_f64 * 36.0 / 35.0).sqrt();
        assert!((modes.modes[0].wavenumber - expected).abs() < 1.0e-8);
    }

    #[test]
    fn an_exchange_that_meets_no_atom_is_told() {
        let record = diatomic(2.4);
        let heavy = Exchange::from_text("O=18O").unwrap();
        assert!(masses(&record, &[heavy]).unwrap_err().contains("meets no atom"));
        let deuterated = masses(&record, &[Exchange::from_text("H=D").unwrap()]).unwrap();
        assert!((deuterated[0] - 2.014_101_778).abs() < 1.0e-8);
    }
}
