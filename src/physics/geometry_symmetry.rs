//! Which rotations and reflections a geometry has, and a Hessian averaged over them.

use nalgebra::{Matrix3, Vector3};

use super::normal_modes::centre_of_mass;

/// Atoms that an operation brings together lie within this of each other, bohr (what optimisers leave).
const TOGETHER: f64 = 2.0e-3;

/// An operation: a rotation or rotation-reflection about the centre of mass, and where each atom goes.
#[derive(Clone, Debug, PartialEq)]
pub struct Operation {
    /// Orthogonal matrix.
    pub matrix: Matrix3<f64>,
    /// Atom `i` goes to where atom `image[i]` was.
    pub image: Vec<usize>,
}

/// All operations of a geometry (bohr), the identity first among them; a geometry on a line has only the identity here.
pub fn operations(symbols: &[String], geometry: &[[f64; 3]], masses: &[f64]) -> Vec<Operation> {
    let n = symbols.len();
    let centre = centre_of_mass(geometry, masses);
    let at: Vec<Vector3<f64>> = geometry.iter().map(|p| Vector3::from(*p) - centre).collect();
    let like = |i: usize, j: usize| {
        symbols[i] == symbols[j]
            && (masses[i] - masses[j]).abs() < 1.0e-6
            && (at[i].norm() - at[j].norm()).abs() < TOGETHER
    };
    // Two arms from the centre that are far from parallel fix an operation up to a reflection in their plane; the pair with
    // the fewest images is cheapest, and any will do.
    let mut pair = None;
    'search: for i in 0..n {
        for j in 0..n {
            if at[i].norm() > 0.5 && at[j].norm() > 0.5 && at[i].normalize().cross(&at[j].normalize()).norm() > 0.3 {
                pair = Some((i, j));
                break 'search;
            }
        }
    }
    let identity = Operation { matrix: Matrix3::identity(), image: (0..n).collect() };
    let Some((one, two)) = pair else { return vec![identity] };
    let frame = |a: Vector3<f64>, b: Vector3<f64>, hand: f64| {
        let x = a.normalize();
        let z = a.cross(&b).normalize();
        Matrix3::from_columns(&[x, z.cross(&x), z * hand])
    };
    let start = frame(at[one], at[two], 1.0);
    let apart = (at[one] - at[two]).norm();
    let mut list: Vec<Operation> = Vec::new();
    for i in (0..n).filter(|i| like(one, *i)) {
        for j in (0..n).filter(|j| like(two, *j) && *j != i) {
            if ((at[i] - at[j]).norm() - apart).abs() > 2.0 * TOGETHER {
                continue;
            }
            for hand in [1.0, -1.0] {
                let matrix = frame(at[i], at[j], hand) * start.transpose();
                let image: Option<Vec<usize>> = (0..n)
                    .map(|k| {
                        let moved = matrix * at[k];
                        (0..n).find(|m| like(k, *m) && (at[*m] - moved).norm() < TOGETHER)
                    })
                    .collect();
                if let Some(image) = image
                    && !list.iter().any(|o| (o.matrix - matrix).norm() < 1.0e-2)
                {
                    list.push(Operation { matrix, image });
                }
            }
        }
    }
    if list.is_empty() { vec![identity] } else { list }
}

/// The mean of a Hessian over the operations.
pub fn averaged(hessian: &[f64], operations: &[Operation]) -> Vec<f64> {
    let size = (hessian.len() as f64).sqrt().round() as usize;
    let n = size / 3;
    let mut sum = vec![0.0; hessian.len()];
    for operation in operations {
        let r = &operation.matrix;
        for i in 0..n {
            for j in 0..n {
                let block = Matrix3::from_fn(|a, b| hessian[(3 * i + a) * size + 3 * j + b]);
                let turned = r * block * r.transpose();
                let (k, l) = (operation.image[i], operation.image[j]);
                for a in 0..3 {
                    for b in 0..3 {
                        sum[(3 * k + a) * size + 3 * l + b] += turned[(a, b)] / operations.len() as f64;
                    }
                }
            }
        }
    }
    sum
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_tetrahedron_has_24_operations_and_a_bent_molecule_4() {
        let tetrahedron = [[0.0; 3], [1.6, 1.6, 1.6], [1.6, -1.6, -1.6], [-1.6, 1.6, -1.6], [-1.6, -1.6, 1.6]];
        let symbols: Vec<String> = ["Cl", "O", "O", "O", "O"].map(String::from).to_vec();
        assert_eq!(operations(&symbols, &tetrahedron, &[35.0, 16.0, 16.0, 16.0, 16.0]).len(), 24);
        let water = [[0.0, 0.125, 0.0], [1.42, -0.996, 0.0], [-1.42, -0.996, 0.0]];
        let symbols: Vec<String> = ["O", "H", "H"].map(String::from).to_vec();
        assert_eq!(operations(&symbols, &water, &[16.0, 1.0, 1.0]).len(), 4);
        // One deuterium leaves the plane.
        assert_eq!(operations(&symbols, &water, &[16.0, 1.0, 2.0]).len(), 2);
    }
}
