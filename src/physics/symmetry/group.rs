//! Groups closed from generators, with their irreducible representations.

use nalgebra::{DMatrix, Matrix3, Vector3};

/// Number of an irreducible representation in its group.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub struct Irrep(pub u8);

/// One irreducible representation.
#[derive(Clone, Debug)]
struct Species {
    name: String,
    dimension: u8,
    /// Character of every element.
    characters: Vec<f64>,
    /// ⟨χ, χ⟩: 1, or 2 for a separably degenerate pair counted as one.
    norm: f64,
}

/// A point group.
#[derive(Clone, Debug)]
pub struct PointGroup {
    name: String,
    elements: Vec<Matrix3<f64>>,
    /// Number of the square of nothing, of R, R², ...: `powers[k][r]` is the number of Rᵏ.
    powers: Vec<Vec<usize>>,
    species: Vec<Species>,
    /// Class number of every element.
    classes: Vec<usize>,
    class_names: Vec<String>,
    /// Generators as numbers of elements.
    generators: Vec<usize>,
}

/// Highest power kept: quanta of one mode.
const MOST_QUANTA: usize = 12;

/// Half the order of the finite groups that stand for linear ones.
const LINEAR: u32 = 40;

/// Elements closer than this are equal (entries are cosines of multiples of 9° at the finest).
const SAME: f64 = 1.0e-6;

fn rotation(angle: f64) -> Matrix3<f64> {
    let (s, c) = angle.sin_cos();
    Matrix3::new(c, -s, 0.0, s, c, 0.0, 0.0, 0.0, 1.0)
}

fn turn(n: u32) -> f64 {
    std::f64::consts::TAU / f64::from(n)
}

fn plane(angle: f64) -> DMatrix<f64> {
    let (s, c) = angle.sin_cos();
    DMatrix::from_row_slice(2, 2, &[c, -s, s, c])
}

fn single(value: f64) -> DMatrix<f64> {
    DMatrix::from_element(1, 1, value)
}

fn mirror2() -> DMatrix<f64> {
    DMatrix::from_row_slice(2, 2, &[1.0, 0.0, 0.0, -1.0])
}

fn natural(m: &Matrix3<f64>) -> DMatrix<f64> {
    DMatrix::from_fn(3, 3, |i, j| m[(i, j)])
}

/// Generators and, per species, the matrices they are given.
struct Recipe {
    generators: Vec<Matrix3<f64>>,
    species: Vec<(String, Vec<DMatrix<f64>>)>,
}

/// Cₙ (or Sₙ with an improper generator): A, B, E₁, E₂ ...
fn cyclic(n: u32, generator: Matrix3<f64>) -> Recipe {
    let mut species = vec![("A".to_owned(), vec![single(1.0)])];
    if n.is_multiple_of(2) {
        species.push(("B".to_owned(), vec![single(-1.0)]));
    }
    let pairs = (n - 1) / 2;
    for k in 1..=pairs {
        let name = if pairs == 1 { "E".to_owned() } else { format!("E{k}") };
        species.push((name, vec![plane(f64::from(k) * turn(n))]));
    }
    Recipe { generators: vec![generator], species }
}

/// A cyclic group of order n with a second generator of order two that inverts it: Cₙᵥ, Dₙ, Dₙd.
fn dihedral(n: u32, first: Matrix3<f64>, second: Matrix3<f64>) -> Recipe {
    let mut species =
        vec![("A1".to_owned(), vec![single(1.0), single(1.0)]), ("A2".to_owned(), vec![single(1.0), single(-1.0)])];
    if n.is_multiple_of(2) {
        species.push(("B1".to_owned(), vec![single(-1.0), single(1.0)]));
        species.push(("B2".to_owned(), vec![single(-1.0), single(-1.0)]));
    }
    let pairs = (n - 1) / 2;
    for k in 1..=pairs {
        let name = if pairs == 1 { "E".to_owned() } else { format!("E{k}") };
        species.push((name, vec![plane(f64::from(k) * turn(n)), mirror2()]));
    }
    Recipe { generators: vec![first, second], species }
}

fn three_fold_diagonal() -> Matrix3<f64> {
    Matrix3::new(0.0, 0.0, 1.0, 1.0, 0.0, 0.0, 0.0, 1.0, 0.0)
}

/// The direct product with a group of two, whose element is `other`: suffixes for the symmetric and antisymmetric part.
fn doubled(recipe: Recipe, other: Matrix3<f64>, suffixes: [&str; 2]) -> Recipe {
    let mut species = Vec::new();
    for (suffix, sign) in suffixes.into_iter().zip([1.0, -1.0]) {
        for (name, matrices) in &recipe.species {
            let size = matrices[0].nrows();
            let mut all = matrices.clone();
            all.push(DMatrix::identity(size, size) * sign);
            species.push((format!("{name}{suffix}"), all));
        }
    }
    let mut generators = recipe.generators;
    generators.push(other);
    Recipe { generators, species }
}

fn recipe(name: &str) -> Option<Recipe> {
    let inversion = -Matrix3::identity();
    let sigma_h = Matrix3::from_diagonal(&Vector3::new(1.0, 1.0, -1.0));
    let sigma_v = Matrix3::from_diagonal(&Vector3::new(1.0, -1.0, 1.0));
    let c2_x = Matrix3::from_diagonal(&Vector3::new(1.0, -1.0, -1.0));
    let parity = ["g", "u"];
    let primes = ["'", "''"];
    let cn = |n: u32| cyclic(n, rotation(turn(n)));
    let dn = |n: u32| {
        let mut recipe = dihedral(n, rotation(turn(n)), c2_x);
        if n == 2 {
            // Species of the three equal axes: B1 z, B2 y, B3 x.
            recipe.species[0].0 = "A".into();
            recipe.species[1].0 = "B1".into();
            recipe.species[2].0 = "B3".into();
            recipe.species[3].0 = "B2".into();
            recipe.species.swap(2, 3);
        }
        recipe
    };
    let tetrahedral = || Recipe {
        generators: vec![three_fold_diagonal(), rotation(turn(2))],
        species: vec![
            ("A".into(), vec![single(1.0), single(1.0)]),
            ("E".into(), vec![plane(turn(3)), DMatrix::identity(2, 2)]),
            ("F".into(), vec![natural(&three_fold_diagonal()), natural(&rotation(turn(2)))]),
        ],
    };
    // T_d and O share one structure: a threefold axis and a fourfold generator, proper or not.
    let cubic = |four: Matrix3<f64>, vector_is: &str, axial_is: &str| {
        let vector = vec![natural(&three_fold_diagonal()), natural(&four)];
        let axial = vec![natural(&three_fold_diagonal()), -natural(&four)];
        Recipe {
            generators: vec![three_fold_diagonal(), four],
            species: vec![
                ("A1".into(), vec![single(1.0), single(1.0)]),
                ("A2".into(), vec![single(1.0), single(-1.0)]),
                ("E".into(), vec![plane(turn(3)), mirror2()]),
                if vector_is == "F1" { ("F1".into(), vector.clone()) } else { ("F1".into(), axial.clone()) },
                if axial_is == "F2" { ("F2".into(), axial) } else { ("F2".into(), vector) },
            ],
        }
    };
    let linear = || {
        let mut recipe = dihedral(LINEAR, rotation(turn(LINEAR)), sigma_v);
        let greek = ["pi", "delta", "phi", "gamma"];
        for (index, (name, _)) in recipe.species.iter_mut().enumerate() {
            *name = match index {
                0 => "sigma+".to_owned(),
                1 => "sigma-".to_owned(),
                2 => "l20+".to_owned(),
                3 => "l20-".to_owned(),
                k => greek.get(k - 4).map_or_else(|| format!("l{}", k - 3), |g| (*g).to_owned()),
            };
        }
        recipe
    };
    let digit = |text: &str| text.parse::<u32>().ok().filter(|n| (1..=8).contains(n));
    Some(match name {
        "C1" => cyclic(1, Matrix3::identity()),
        "Cs" | "C1h" | "C1v" => {
            let recipe = doubled(cyclic(1, Matrix3::identity()), sigma_h, primes);
            Recipe { generators: vec![sigma_h], species: drop_first(recipe.species) }
        }
        "Ci" | "S2" => {
            let recipe = doubled(cyclic(1, Matrix3::identity()), inversion, parity);
            Recipe { generators: vec![inversion], species: drop_first(recipe.species) }
        }
        "S4" => cyclic(4, sigma_h * rotation(turn(4))),
        "S6" | "C3i" => doubled(cn(3), inversion, parity),
        "S8" => cyclic(8, sigma_h * rotation(turn(8))),
        "D2d" | "Vd" => dihedral(4, sigma_h * rotation(turn(4)), c2_x),
        "D3d" => doubled(dn(3), inversion, parity),
        "D4d" => dihedral(8, sigma_h * rotation(turn(8)), c2_x),
        "D5d" => doubled(dn(5), inversion, parity),
        "T" => tetrahedral(),
        "Th" => doubled(tetrahedral(), inversion, parity),
        "Td" => cubic(sigma_h * rotation(turn(4)), "F2", "F1"),
        "O" => cubic(rotation(turn(4)), "F1", "F2"),
        "Oh" => doubled(cubic(rotation(turn(4)), "F1", "F2"), inversion, parity),
        "Cinfv" => linear(),
        "Dinfh" => doubled(linear(), inversion, parity),
        _ => {
            let rest = name.get(1..)?;
            match name.chars().next()? {
                'C' if rest.ends_with('v') => {
                    dihedral(digit(&rest[..rest.len() - 1])?, rotation(turn(digit(&rest[..rest.len() - 1])?)), sigma_v)
                }
                'C' if rest.ends_with('h') => {
                    let n = digit(&rest[..rest.len() - 1])?;
                    if n.is_multiple_of(2) {
                        doubled(cn(n), inversion, parity)
                    } else {
                        doubled(cn(n), sigma_h, primes)
                    }
                }
                'D' if rest.ends_with('h') => {
                    let n = digit(&rest[..rest.len() - 1]).filter(|n| *n > 1)?;
                    if n.is_multiple_of(2) {
                        doubled(dn(n), inversion, parity)
                    } else {
                        doubled(dn(n), sigma_h, primes)
                    }
                }
                'C' => cn(digit(rest)?),
                'D' => dn(digit(rest).filter(|n| *n > 1)?),
                _ => return None,
            }
        }
    })
}

/// Matrices of the second generator only: for groups whose first generator is the identity.
fn drop_first(species: Vec<(String, Vec<DMatrix<f64>>)>) -> Vec<(String, Vec<DMatrix<f64>>)> {
    species.into_iter().map(|(name, matrices)| (name, matrices[1..].to_vec())).collect()
}

fn same(a: &Matrix3<f64>, b: &Matrix3<f64>) -> bool {
    (a - b).amax() < SAME
}

/// The group's usual name: `c2v`, `C_2v`, `D∞h`, `D_inf_h` and so on.
fn usual_name(name: &str) -> String {
    let plain: String = name.trim().replace('∞', "inf").chars().filter(|c| !matches!(c, '_' | ' ' | '*')).collect();
    let mut usual = String::new();
    for (at, c) in plain.chars().enumerate() {
        if at == 0 { usual.extend(c.to_uppercase()) } else { usual.extend(c.to_lowercase()) }
    }
    usual
}

/// Icosahedral groups: characters from the vector representation by closed rules, since their matrices need golden ratios.
fn icosahedral(with_inversion: bool) -> PointGroup {
    let golden = 0.5 * (1.0 + 5.0f64.sqrt());
    // A fivefold axis through (0, 1, φ) and the threefold diagonal generate the rotation group.
    let axis = nalgebra::Unit::new_normalize(Vector3::new(0.0, 1.0, golden));
    let five = nalgebra::Rotation3::from_axis_angle(&axis, turn(5)).into_inner();
    let generators = vec![five, three_fold_diagonal()];
    let elements = close(&generators);
    let vector: Vec<f64> = elements.iter().map(Matrix3::trace).collect();
    let find = |m: &Matrix3<f64>| elements.iter().position(|e| same(e, m)).unwrap_or(0);
    let squares: Vec<usize> = elements.iter().map(|e| find(&(e * e))).collect();
    let order = |e: &Matrix3<f64>| {
        let mut power = *e;
        let mut n = 1;
        while !same(&power, &Matrix3::identity()) && n < 10 {
            power *= e;
            n += 1;
        }
        n
    };
    // The second three-dimensional species exchanges the two kinds of fivefold rotation.
    let other: Vec<f64> = elements
        .iter()
        .enumerate()
        .map(|(at, e)| if order(e) == 5 { vector[squares[at]] } else { vector[at] })
        .collect();
    let five_fold: Vec<f64> =
        (0..elements.len()).map(|at| 0.5 * (vector[at] * vector[at] + vector[squares[at]]) - 1.0).collect();
    let four_fold: Vec<f64> = (0..elements.len()).map(|at| vector[at] * other[at] - five_fold[at]).collect();
    let list = [
        ("A", 1, vec![1.0; elements.len()]),
        ("F1", 3, vector),
        ("F2", 3, other),
        ("G", 4, four_fold),
        ("H", 5, five_fold),
    ];
    let name = if with_inversion { "Ih" } else { "I" };
    if !with_inversion {
        let species = list.into_iter().map(|(n, d, c)| (n.to_owned(), d, c)).collect();
        return PointGroup::assemble(name, elements, &generators, species);
    }
    let inverted: Vec<Matrix3<f64>> = elements.iter().map(|e| -e).collect();
    let all: Vec<Matrix3<f64>> = elements.iter().copied().chain(inverted).collect();
    let mut species = Vec::new();
    for (suffix, sign) in [("g", 1.0), ("u", -1.0)] {
        for (n, d, c) in &list {
            let characters = c.iter().copied().chain(c.iter().map(|x| sign * x)).collect();
            species.push((format!("{n}{suffix}"), *d, characters));
        }
    }
    let generators: Vec<Matrix3<f64>> = generators.into_iter().chain([-Matrix3::identity()]).collect();
    PointGroup::assemble(name, all, &generators, species)
}

/// All products of generators.
fn close(generators: &[Matrix3<f64>]) -> Vec<Matrix3<f64>> {
    let mut elements = vec![Matrix3::identity()];
    let mut at = 0;
    while at < elements.len() {
        for g in generators {
            let next = elements[at] * g;
            if !elements.iter().any(|e| same(e, &next)) {
                elements.push(next);
            }
        }
        at += 1;
    }
    elements
}

impl PointGroup {
    /// The group of that name: the 32 crystallographic ones, others with axes up to eightfold, I, Ih, C∞v and D∞h.
    /// Schoenflies names in any case, with or without underscores.
    pub fn named(name: &str) -> Option<Self> {
        let usual = usual_name(name);
        match usual.as_str() {
            "I" => return Some(icosahedral(false)),
            "Ih" => return Some(icosahedral(true)),
            _ => {}
        }
        let recipe = recipe(&usual)?;
        // Elements and all representations are closed together, so every character belongs to its element.
        let mut elements = vec![Matrix3::identity()];
        let mut images: Vec<Vec<DMatrix<f64>>> =
            vec![recipe.species.iter().map(|(_, m)| DMatrix::identity(m[0].nrows(), m[0].nrows())).collect()];
        let mut at = 0;
        while at < elements.len() {
            for (g, generator) in recipe.generators.iter().enumerate() {
                let next = elements[at] * generator;
                if !elements.iter().any(|e| same(e, &next)) {
                    elements.push(next);
                    let image = images[at].iter().zip(&recipe.species).map(|(m, (_, s))| m * &s[g]).collect();
                    images.push(image);
                }
            }
            at += 1;
        }
        let species = recipe
            .species
            .iter()
            .enumerate()
            .map(|(s, (name, matrices))| {
                let characters = images.iter().map(|image| image[s].trace()).collect();
                (linear_name(&usual, name), matrices[0].nrows() as u8, characters)
            })
            .collect();
        Some(Self::assemble(&usual, elements, &recipe.generators, species))
    }

    fn assemble(
        name: &str,
        elements: Vec<Matrix3<f64>>,
        generators: &[Matrix3<f64>],
        species: Vec<(String, u8, Vec<f64>)>,
    ) -> Self {
        let find = |m: &Matrix3<f64>| elements.iter().position(|e| same(e, m)).unwrap_or(0);
        let n = elements.len();
        let mut powers = vec![vec![find(&Matrix3::identity()); n]];
        for k in 1..=MOST_QUANTA {
            let previous = &powers[k - 1];
            powers.push((0..n).map(|r| find(&(elements[previous[r]] * elements[r]))).collect());
        }
        let mut classes = vec![usize::MAX; n];
        let mut class_names = Vec::new();
        for r in 0..n {
            if classes[r] != usize::MAX {
                continue;
            }
            let class = class_names.len();
            // Conjugating by the generators again and again reaches the whole class.
            let mut members = vec![r];
            let mut at = 0;
            while at < members.len() {
                for g in generators {
                    let other = find(&(g * elements[members[at]] * g.transpose()));
                    if !members.contains(&other) {
                        members.push(other);
                    }
                }
                at += 1;
            }
            for member in &members {
                classes[*member] = class;
            }
            let count = if members.len() == 1 { String::new() } else { members.len().to_string() };
            class_names.push(format!("{count}{}", operation(&elements[r])));
        }
        let species = species
            .into_iter()
            .map(|(name, dimension, characters)| {
                let norm = characters.iter().map(|c: &f64| c * c).sum::<f64>() / n as f64;
                Species { name, dimension, characters, norm: norm.round().max(1.0) }
            })
            .collect();
        let generators = generators.iter().map(find).collect();
        Self { name: name.to_owned(), elements, powers, species, classes, class_names, generators }
    }

    /// Schoenflies name.
    pub fn name(&self) -> &str {
        &self.name
    }

    /// Number of elements.
    pub fn order(&self) -> usize {
        self.elements.len()
    }

    /// The elements as matrices.
    pub fn elements(&self) -> &[Matrix3<f64>] {
        &self.elements
    }

    /// Numbers of the generators.
    pub fn generators(&self) -> &[usize] {
        &self.generators
    }

    /// Names of the classes with their sizes: `2C3`.
    pub fn classes(&self) -> &[String] {
        &self.class_names
    }

    /// Class of every element.
    pub fn class_of_elements(&self) -> &[usize] {
        &self.classes
    }

    /// All irreducible representations.
    pub fn irreps(&self) -> impl Iterator<Item = Irrep> {
        (0..self.species.len()).map(|i| Irrep(i as u8))
    }

    /// The irreducible representation of that name: case, `T` for `F`, `"` for `''` and underscores do not matter.
    pub fn irrep(&self, name: &str) -> Option<Irrep> {
        let wanted = plain_species(name);
        self.species.iter().position(|s| plain_species(&s.name) == wanted).map(|i| Irrep(i as u8))
    }

    /// Its name.
    pub fn irrep_name(&self, irrep: Irrep) -> &str {
        self.species.get(usize::from(irrep.0)).map_or("?", |s| &s.name)
    }

    /// Its dimension.
    pub fn dimension(&self, irrep: Irrep) -> u8 {
        self.species.get(usize::from(irrep.0)).map_or(1, |s| s.dimension)
    }

    /// Its character in every class.
    pub fn characters(&self, irrep: Irrep) -> Vec<f64> {
        let by_element = &self.species[usize::from(irrep.0)].characters;
        (0..self.class_names.len())
            .map(|class| self.classes.iter().position(|c| *c == class).map_or(0.0, |r| by_element[r]))
            .collect()
    }

    /// Character of every element.
    pub fn element_characters(&self, irrep: Irrep) -> &[f64] {
        &self.species[usize::from(irrep.0)].characters
    }

    /// Multiplicity of every irreducible representation in a character given by element; zeros are left out.
    pub fn reduce(&self, character: &[f64]) -> Vec<(Irrep, u32)> {
        let n = self.elements.len() as f64;
        self.species
            .iter()
            .enumerate()
            .filter_map(|(i, s)| {
                let overlap: f64 = s.characters.iter().zip(character).map(|(a, b)| a * b).sum();
                let times = (overlap / (n * s.norm)).round().max(0.0) as u32;
                (times > 0).then_some((Irrep(i as u8), times))
            })
            .collect()
    }

    /// Character of `quanta` quanta of one mode: the symmetrised power,
    /// χₙ(R) = (1/n) Σₖ χ(Rᵏ) χₙ₋ₖ(R), χ₀ = 1 (Newton's identity; equal to the usual closed forms for E and F).
    pub fn symmetrised_power(&self, irrep: Irrep, quanta: u8) -> Vec<f64> {
        let characters = &self.species[usize::from(irrep.0)].characters;
        let quanta = usize::from(quanta).min(MOST_QUANTA);
        let n = self.elements.len();
        let mut powers: Vec<Vec<f64>> = vec![vec![1.0; n]];
        for q in 1..=quanta {
            let next = (0..n)
                .map(|r| (1..=q).map(|k| characters[self.powers[k][r]] * powers[q - k][r]).sum::<f64>() / q as f64)
                .collect();
            powers.push(next);
        }
        powers.swap_remove(quanta)
    }

    /// Species content of a level: the product over modes of their symmetrised powers, with multiplicities.
    pub fn level_species(&self, quanta: &[(Irrep, u8)]) -> Vec<(Irrep, u32)> {
        let mut product = vec![1.0; self.elements.len()];
        for (irrep, n) in quanta {
            if *n == 1 {
                multiply(&mut product, &self.species[usize::from(irrep.0)].characters);
            } else {
                multiply(&mut product, &self.symmetrised_power(*irrep, *n));
            }
        }
        self.reduce(&product)
    }

    /// Direct product of two or more representations.
    pub fn product(&self, irreps: &[Irrep]) -> Vec<(Irrep, u32)> {
        let mut product = vec![1.0; self.elements.len()];
        for irrep in irreps {
            multiply(&mut product, &self.species[usize::from(irrep.0)].characters);
        }
        self.reduce(&product)
    }

    /// Whether it is infrared-active (a component of x, y, z).
    pub fn infrared(&self, irrep: Irrep) -> bool {
        self.contains(irrep, &self.vector())
    }

    /// Whether it is Raman-active (a component of the symmetric square of x, y, z).
    pub fn raman(&self, irrep: Irrep) -> bool {
        let squares: Vec<f64> = self.elements.iter().map(|e| 0.5 * (e.trace() * e.trace() + (e * e).trace())).collect();
        self.contains(irrep, &squares)
    }

    /// Whether a rotation about an axis belongs to it.
    pub fn rotation(&self, irrep: Irrep) -> bool {
        let axial: Vec<f64> = self.elements.iter().map(|e| e.determinant() * e.trace()).collect();
        self.contains(irrep, &axial)
    }

    fn vector(&self) -> Vec<f64> {
        self.elements.iter().map(Matrix3::trace).collect()
    }

    fn contains(&self, irrep: Irrep, character: &[f64]) -> bool {
        self.reduce(character).iter().any(|(i, _)| *i == irrep)
    }

    /// Which of x, y, z belong to it, by projecting each axis: its infrared polarisation.
    pub fn polarisation(&self, irrep: Irrep) -> Vec<&'static str> {
        let projector = self.projector(irrep, |e| DMatrix::from_fn(3, 3, |i, j| e[(i, j)]), 3);
        ["x", "y", "z"]
            .into_iter()
            .enumerate()
            .filter(|(i, _)| projector.column(*i).norm() > 0.1)
            .map(|(_, n)| n)
            .collect()
    }

    /// Which products of x, y, z belong to it: its Raman tensor elements.
    pub fn tensor(&self, irrep: Irrep) -> Vec<&'static str> {
        // Symmetric tensors in the basis xx, yy, zz, xy, xz, yz: T → R T Rᵀ.
        let pairs = [(0, 0), (1, 1), (2, 2), (0, 1), (0, 2), (1, 2)];
        let action = |e: &Matrix3<f64>| {
            DMatrix::from_fn(6, 6, |row, column| {
                let ((a, b), (i, j)) = (pairs[row], pairs[column]);
                if i == j { e[(a, i)] * e[(b, j)] } else { e[(a, i)] * e[(b, j)] + e[(a, j)] * e[(b, i)] }
            })
        };
        let projector = self.projector(irrep, action, 6);
        let names = ["xx", "yy", "zz", "xy", "xz", "yz"];
        names.into_iter().enumerate().filter(|(i, _)| projector.column(*i).norm() > 0.1).map(|(_, n)| n).collect()
    }

    fn projector(&self, irrep: Irrep, action: impl Fn(&Matrix3<f64>) -> DMatrix<f64>, size: usize) -> DMatrix<f64> {
        let s = &self.species[usize::from(irrep.0)];
        let mut sum = DMatrix::zeros(size, size);
        for (e, character) in self.elements.iter().zip(&s.characters) {
            sum += action(e) * *character;
        }
        sum * (f64::from(s.dimension) / (self.elements.len() as f64 * s.norm))
    }

    /// Whether the group has an inversion centre.
    pub fn centrosymmetric(&self) -> bool {
        self.elements.iter().any(|e| same(e, &-Matrix3::identity()))
    }

    /// Why a level with this content has no infrared-active species.
    pub fn forbidden_reason(&self, quanta: &[(Irrep, u8)]) -> String {
        let content = self.level_species(quanta);
        let names: Vec<&str> = content.iter().map(|(i, _)| self.irrep_name(*i)).collect();
        let even = self.centrosymmetric() && names.iter().all(|n| is_even(n));
        match quanta {
            [(irrep, n)] if even && !is_even(self.irrep_name(*irrep)) && n % 2 == 0 => {
                format!("an even overtone of a u mode is g ({}): silent in infrared", names.join(" + "))
            }
            _ if even => format!("its parity is g ({}): silent in infrared at the zone centre", names.join(" + ")),
            _ => format!("{} holds no component of x, y, z", names.join(" + ")),
        }
    }
}

/// Whether a species of a centrosymmetric group is even.
fn is_even(name: &str) -> bool {
    name.trim_end_matches(['+', '-']).ends_with('g')
}

fn multiply(product: &mut [f64], by: &[f64]) {
    for (p, b) in product.iter_mut().zip(by) {
        *p *= b;
    }
}

/// In linear groups the parity stands before the sign: `sigma_g+`.
fn linear_name(group: &str, name: &str) -> String {
    if group != "Dinfh" {
        return name.to_owned();
    }
    match name.find(['+', '-']) {
        Some(at) => format!("{}_{}{}", &name[..at], &name[at + 1..], &name[at..=at]),
        None => format!("{}_{}", &name[..name.len() - 1], &name[name.len() - 1..]),
    }
}

/// A species name without what people write differently.
fn plain_species(name: &str) -> String {
    let spelled = name
        .trim()
        .replace(['"', '″', '”'], "''")
        .replace(['′', '’'], "'")
        .replace(['Σ', 'σ'], "sigma")
        .replace(['Π', 'π'], "pi")
        .replace(['Δ', 'δ'], "delta")
        .replace(['Φ', 'φ'], "phi")
        .replace(['_', ' ', '(', ')'], "");
    let lower = spelled.to_lowercase();
    // T for F in the older and the chemists' spelling.
    match lower.strip_prefix('t') {
        Some(rest) if !lower.contains("ta") => format!("f{rest}"),
        _ => lower,
    }
}

/// Name of an operation from its matrix: E, i, σ, Cₙ, Sₙ with the power where it matters.
fn operation(m: &Matrix3<f64>) -> String {
    let proper = m.determinant() > 0.0;
    let rotation = if proper { *m } else { -m };
    let angle = (0.5 * (rotation.trace() - 1.0)).clamp(-1.0, 1.0).acos();
    if angle < SAME {
        return if proper { "E".into() } else { "i".into() };
    }
    if (angle - std::f64::consts::PI).abs() < 1.0e-4 && !proper {
        return "σ".into();
    }
    // An improper rotation −R(α) is S with angle α + π.
    let turned = if proper { angle } else { std::f64::consts::PI - angle };
    for n in 2..=80u32 {
        for k in 1..=n / 2 {
            if (turned - f64::from(k) * turn(n)).abs() < 1.0e-5 {
                let letter = if proper { 'C' } else { 'S' };
                return if k == 1 { format!("{letter}{n}") } else { format!("{letter}{n}^{k}") };
            }
        }
    }
    if proper { "C".into() } else { "S".into() }
}
