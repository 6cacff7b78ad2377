//! First-order strengths of combinations and overtones from a force field and dipole derivatives.
//!
//! # Method
//! With µ = µ₀ + Σ µ_k q_k + ½ Σ µ_ij qᵢ qⱼ and the cubic field of [`crate::read::force_field`],
//!
//! ```text
//! A(i + j) = ½ µ_ij + ½ Σ_k µ_k f_ijk ω_k / ((ωᵢ + ωⱼ)² − ω_k²)     (i ≠ j)
//! A(2i)    = the same with j = i, divided by √2
//! A(k)     = µ_k / √2
//! ```
//!
//! the first term electrical, the second mechanical anharmonicity; in O–H bonds they often have opposite signs. Strength is
//! proportional to transition wavenumber × |A|². Checked against full diagonalisation in `tests/perturbation.rs`. A term
//! with ω_k close to ωᵢ + ωⱼ is a Fermi resonance and belongs to the polyad.

use crate::read::force_field::ForceField;

/// Amplitude of the fundamental of a component, one number an axis, in the unit of the dipole derivatives.
pub fn fundamental(field: &ForceField, k: usize) -> [f64; 3] {
    field.dipole.get(k).map_or([0.0; 3], |m| m.map(|v| v / 2.0_f64.sqrt()))
}

/// Amplitude of the two-quanta transition to i + j (or 2i), one number an axis.
pub fn two_quanta(field: &ForceField, i: usize, j: usize) -> [f64; 3] {
    let w = &field.omega;
    let sum = w[i] + w[j];
    let second = field.dipole_second.get(&(i.min(j), i.max(j))).copied().unwrap_or([0.0; 3]);
    let mut amplitude = second.map(|m| 0.5 * m);
    for (k, first) in field.dipole.iter().enumerate() {
        let mechanical = 0.5 * field.cubic(i, j, k) * w[k] / (sum * sum - w[k] * w[k]);
        for (a, m) in amplitude.iter_mut().zip(first) {
            *a += m * mechanical;
        }
    }
    if i == j { amplitude.map(|a| a / 2.0_f64.sqrt()) } else { amplitude }
}

/// Relative strength of a transition: wavenumber × |A|².
pub fn strength(wavenumber: f64, amplitude: [f64; 3]) -> f64 {
    wavenumber * amplitude.iter().map(|a| a * a).sum::<f64>()
}
