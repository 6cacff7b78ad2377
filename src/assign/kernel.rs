//! Positions of levels as a linear-Gaussian model, in level space.
//!
//! # Method
//! ν(v) = a(v)·θ with θ ~ N(m, C). Bands assigned to levels S with residuals r = y − m(S) have G = κ² K_SS + diag(noise),
//! K = a′Ca, and
//!
//! ```text
//! log evidence      = −½ r′G⁻¹r − ½ log|2πG|
//! mean of a level   = m(c) + κ² K_cS G⁻¹ r
//! variance of it    = κ² k(c,c) − κ⁴ K_cS G⁻¹ K_Sc
//! ```
//!
//! Conditioning of a Gaussian (any text on Gaussian processes); equal to the Kalman update of θ, checked by
//! `conditioning_in_level_space_equals_the_update_of_the_parameters` in `tests/statistics.rs`. C is diagonal and is never
//! stored: derivatives are scaled by the sigma of their parameter, so that a covariance is a sparse dot product.

use std::collections::BTreeMap;

use nalgebra::{Cholesky, DMatrix, DVector, Dyn};

use crate::physics::position::{Gradient, Model, Parameter};

/// Numbers of the parameters in use, in order of first appearance.
#[derive(Clone, Debug, Default)]
pub struct ParameterNumbers {
    list: Vec<Parameter>,
    numbers: BTreeMap<Parameter, u32>,
}

impl ParameterNumbers {
    /// The number of `parameter`, a new one when it is new.
    pub fn number(&mut self, parameter: Parameter) -> u32 {
        let next = u32::try_from(self.list.len()).unwrap_or(u32::MAX);
        *self.numbers.entry(parameter).or_insert_with(|| {
            self.list.push(parameter);
            next
        })
    }

    /// How many there are.
    pub fn len(&self) -> usize {
        self.list.len()
    }

    /// Whether there are none.
    pub fn is_empty(&self) -> bool {
        self.list.is_empty()
    }

    /// All of them by number.
    pub fn list(&self) -> &[Parameter] {
        &self.list
    }
}

/// Derivatives of a position by its parameters, each times the parameter's standard uncertainty (cm⁻¹), ascending by
/// parameter number.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct Slopes(Vec<(u32, f64)>);

impl Slopes {
    /// Scaled derivatives; parameters without uncertainty drop out.
    pub fn new(model: &Model, gradient: &Gradient, numbers: &mut ParameterNumbers) -> Self {
        Self::from_pairs(gradient.iter().map(|&(p, a)| (numbers.number(p), a * model.sigma(p))))
    }

    /// From (parameter number, derivative × sigma); a number given twice adds up.
    pub fn from_pairs(pairs: impl IntoIterator<Item = (u32, f64)>) -> Self {
        let mut list: Vec<(u32, f64)> = pairs.into_iter().filter(|&(_, a)| a != 0.0).collect();
        list.sort_unstable_by_key(|&(p, _)| p);
        list.dedup_by(|later, earlier| {
            let same = later.0 == earlier.0;
            if same {
                earlier.1 += later.1;
            }
            same
        });
        Self(list)
    }

    /// The pairs, ascending by number.
    pub fn pairs(&self) -> &[(u32, f64)] {
        &self.0
    }

    /// Covariance of two positions, cm⁻².
    pub fn dot(&self, other: &Self) -> f64 {
        let (mut i, mut j, mut sum) = (0, 0, 0.0);
        while i < self.0.len() && j < other.0.len() {
            let (a, b) = (self.0[i], other.0[j]);
            match a.0.cmp(&b.0) {
                std::cmp::Ordering::Less => i += 1,
                std::cmp::Ordering::Greater => j += 1,
                std::cmp::Ordering::Equal => {
                    sum += a.1 * b.1;
                    i += 1;
                    j += 1;
                }
            }
        }
        sum
    }

    /// Variance of the position, cm⁻².
    pub fn norm_squared(&self) -> f64 {
        self.0.iter().map(|&(_, a)| a * a).sum()
    }
}

/// log N(difference; 0, variance).
#[inline]
pub fn log_normal(difference: f64, variance: f64) -> f64 {
    -0.5 * (difference * difference / variance + (std::f64::consts::TAU * variance).ln())
}

/// log Σ exp, −∞ for none.
pub fn log_sum(logs: impl IntoIterator<Item = f64> + Clone) -> f64 {
    let top = logs.clone().into_iter().fold(f64::NEG_INFINITY, f64::max);
    if top == f64::NEG_INFINITY {
        return top;
    }
    top + logs.into_iter().map(|l| (l - top).exp()).sum::<f64>().ln()
}

/// Standard normal distribution function.
#[inline]
pub fn normal_cdf(z: f64) -> f64 {
    0.5 * libm::erfc(-z * std::f64::consts::FRAC_1_SQRT_2)
}

/// What the assigned bands say about all other positions.
#[derive(Clone, Debug)]
pub struct Conditioned {
    factor: Option<Cholesky<f64, Dyn>>,
    weights: DVector<f64>,
    residuals: DVector<f64>,
}

impl Conditioned {
    /// From the covariance G of the assigned bands (`covariance(i, j)`, cm⁻², noise on the diagonal included) and their
    /// residuals, cm⁻¹. A G that is not positive definite to working precision gains a millionth of its diagonal.
    pub fn new(residuals: Vec<f64>, covariance: impl Fn(usize, usize) -> f64) -> Self {
        let n = residuals.len();
        let residuals = DVector::from_vec(residuals);
        if n == 0 {
            return Self { factor: None, weights: DVector::zeros(0), residuals };
        }
        let g = DMatrix::from_fn(n, n, |i, j| if i >= j { covariance(i, j) } else { 0.0 });
        let factor = Cholesky::new(g.clone()).or_else(|| {
            let mut firm = g;
            for i in 0..n {
                firm[(i, i)] = firm[(i, i)] * (1.0 + 1.0e-6) + 1.0e-6;
            }
            Cholesky::new(firm)
        });
        let weights = factor.as_ref().map_or_else(|| DVector::zeros(n), |f| f.solve(&residuals));
        Self { factor, weights, residuals }
    }

    /// G⁻¹ r.
    pub fn weights(&self) -> &[f64] {
        self.weights.as_slice()
    }

    /// log density of the residuals.
    pub fn log_evidence(&self) -> f64 {
        let Some(factor) = &self.factor else { return 0.0 };
        let n = self.residuals.len() as f64;
        let half_log_determinant: f64 = factor.l_dirty().diagonal().iter().map(|d| d.ln()).sum();
        -0.5 * self.residuals.dot(&self.weights) - half_log_determinant - 0.5 * n * std::f64::consts::TAU.ln()
    }

    /// Mean shift (cm⁻¹) of a quantity with these covariances to the assigned bands.
    pub fn shift(&self, covariances: &[f64]) -> f64 {
        covariances.iter().zip(self.weights.iter()).map(|(k, w)| k * w).sum()
    }

    /// By how much the assigned bands lower the variance of that quantity, cm⁻². Overwrites `covariances`.
    pub fn variance_taken(&self, covariances: &mut [f64]) -> f64 {
        let Some(factor) = &self.factor else { return 0.0 };
        let l = factor.l_dirty();
        let n = covariances.len();
        let all = l.as_slice();
        let mut taken = 0.0;
        // Forward substitution by columns: columns of L are contiguous.
        for j in 0..n {
            let column = &all[j * n..(j + 1) * n];
            let (head, tail) = covariances.split_at_mut(j + 1);
            let x = head[j] / column[j];
            taken += x * x;
            tail.iter_mut().zip(&column[j + 1..]).for_each(|(c, l)| *c -= l * x);
        }
        taken
    }

    /// L⁻¹ A in place, for a matrix A with one row an assigned band and `columns` columns, by rows: the squared norm of a
    /// combination of its columns is what [`Self::variance_taken`] gives for that combination.
    pub fn project(&self, matrix: &mut [f64], columns: usize) {
        let Some(factor) = &self.factor else { return };
        let l = factor.l_dirty();
        for row in 0..self.residuals.len() {
            let (above, from) = matrix.split_at_mut(row * columns);
            let own = &mut from[..columns];
            for j in 0..row {
                let weight = l[(row, j)];
                own.iter_mut().zip(&above[j * columns..(j + 1) * columns]).for_each(|(o, a)| *o -= weight * a);
            }
            let inverse = 1.0 / l[(row, row)];
            own.iter_mut().for_each(|o| *o *= inverse);
        }
    }
}
