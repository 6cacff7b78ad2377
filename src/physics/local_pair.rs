//! The two O–H bonds of one water as Morse oscillators with harmonic coupling.
//!
//! # Method
//! Diagonal terms v ν − ωx v (v − 1) a bond (ν: its bare 0→1 wavenumber), coupling λ √((vᵢ + 1) vⱼ) between states that
//! exchange one quantum; blocks of equal v₁ + v₂ are diagonalised. Model: Mortensen, Henry & Mohammadi, J. Chem. Phys. 75,
//! 4800 (1981) (from memory); Child & Lawton, Faraday Discuss. Chem. Soc. 71, 273 (1981). For equal bonds it has the
//! spectrum of a normal-mode pair with a Darling-Dennison term (`NormalModePair`); relations of Mills & Robiette,
//! Mol. Phys. 56, 743 (1985) (from memory), checked to 10⁻⁷ in `tests/anharmonic.rs`.
//!
//! A pair is either described by its bonds or by normal-mode constants such as x₁₃ = −165 cm⁻¹, never by both.

use nalgebra::DMatrix;

/// Constants in the basis of the observed fundamentals that reproduce the two-quanta levels of a local pair, cm⁻¹.
#[derive(Clone, Copy, Debug, Default, PartialEq)]
pub struct EffectiveConstants {
    /// x of the lower stretch.
    pub x_ll: f64,
    /// x between the two.
    pub x_lh: f64,
    /// x of the higher stretch.
    pub x_hh: f64,
}

/// A number with one standard uncertainty, cm⁻¹.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Uncertain {
    /// Value.
    pub value: f64,
    /// One standard uncertainty.
    pub sigma: f64,
}

/// Two coupled bonds.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct LocalPair {
    /// Bare 0→1 wavenumbers of the two bonds, the lower first, cm⁻¹.
    pub bond: [f64; 2],
    /// ωx of each bond, cm⁻¹ (positive; the overtone of a bare bond lies at 2 ν − 2 ωx).
    pub omega_x: [f64; 2],
    /// ⟨1,0|H|0,1⟩, cm⁻¹; negative where the lower level is the in-phase one.
    pub lambda: f64,
}

impl LocalPair {
    /// The pair whose one-quantum levels are the two observed fundamentals.
    ///
    /// The difference of the bare bonds follows from the observed splitting, D² = D_obs² − 4 λ², cut off at zero: a
    /// splitting smaller than 2 |λ| is taken for the coupling of equal bonds, and λ shrinks to half of it.
    pub fn observed(nu_low: f64, nu_high: f64, omega_x_low: f64, omega_x_high: f64, lambda: f64) -> Self {
        let split = nu_high - nu_low;
        let difference = (split * split - 4.0 * lambda * lambda).max(0.0).sqrt();
        let size = 0.5 * (split * split - difference * difference).max(0.0).sqrt();
        let mean = 0.5 * (nu_low + nu_high);
        Self {
            bond: [mean - 0.5 * difference, mean + 0.5 * difference],
            omega_x: [omega_x_low, omega_x_high],
            lambda: size.copysign(lambda),
        }
    }

    /// Levels with `quanta` quanta in the two bonds, ascending, cm⁻¹ above the ground level.
    pub fn levels(&self, quanta: u8) -> Vec<f64> {
        let n = usize::from(quanta);
        let own = |bond: usize, v: f64| v * self.bond[bond] - self.omega_x[bond] * v * (v - 1.0);
        #[expect(clippy::cast_precision_loss, reason = "quanta are below 256")]
        let block = DMatrix::from_fn(n + 1, n + 1, |i, j| {
            // State i has i quanta in the first bond and n − i in the second.
            match i.abs_diff(j) {
                0 => own(0, i as f64) + own(1, (n - i) as f64),
                1 => self.lambda * (i.max(j) as f64 * (n - i.min(j)) as f64).sqrt(),
                _ => 0.0,
            }
        });
        let mut levels: Vec<f64> = block.symmetric_eigenvalues().iter().copied().collect();
        levels.sort_by(f64::total_cmp);
        levels
    }

    /// The constants that give the three two-quanta levels exactly when added to the two fundamentals; labels follow
    /// energy order, 2 low < low + high < 2 high, the convention for the polyads of water.
    pub fn effective_constants(&self) -> EffectiveConstants {
        let one = self.levels(1);
        let two = self.levels(2);
        EffectiveConstants {
            x_ll: 0.5 * (two[0] - 2.0 * one[0]),
            x_lh: two[1] - one[0] - one[1],
            x_hh: 0.5 * (two[2] - 2.0 * one[1]),
        }
    }
}

/// Effective constants of the pair with these fundamentals; see [`LocalPair::observed`] and
/// [`LocalPair::effective_constants`]. All numbers in cm⁻¹.
pub fn effective_constants(
    nu_low: f64,
    nu_high: f64,
    omega_x_low: f64,
    omega_x_high: f64,
    lambda: f64,
) -> EffectiveConstants {
    LocalPair::observed(nu_low, nu_high, omega_x_low, omega_x_high, lambda).effective_constants()
}

/// Standard uncertainties of the effective constants, from those of ωx and λ.
///
/// # Method
/// Finite differences over one sigma. The two ωx come from one rule, so they move together; λ is tried both ways and
/// the larger change counts, because the cut-off at equal bonds makes its effect one-sided.
pub fn effective_sigmas(nu_low: f64, nu_high: f64, omega_x: [Uncertain; 2], lambda: Uncertain) -> EffectiveConstants {
    let at = |step_x: f64, step_lambda: f64| {
        effective_constants(
            nu_low,
            nu_high,
            omega_x[0].value + step_x * omega_x[0].sigma,
            omega_x[1].value + step_x * omega_x[1].sigma,
            lambda.value + step_lambda * lambda.sigma,
        )
    };
    let (centre, by_x, up, down) = (at(0.0, 0.0), at(1.0, 0.0), at(0.0, 1.0), at(0.0, -1.0));
    let spread = |pick: fn(&EffectiveConstants) -> f64| {
        let c = pick(&centre);
        (pick(&by_x) - c).hypot((pick(&up) - c).abs().max((pick(&down) - c).abs()))
    };
    EffectiveConstants { x_ll: spread(|k| k.x_ll), x_lh: spread(|k| k.x_lh), x_hh: spread(|k| k.x_hh) }
}

/// Normal-mode constants with the spectrum of two equal coupled bonds: the x–K relations.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct NormalModePair {
    /// Harmonic wavenumbers of the in-phase and the out-of-phase stretch, ω ± λ, cm⁻¹.
    pub omega: [f64; 2],
    /// x_ss = x_aa = −ωx / 2, cm⁻¹.
    pub x_own: f64,
    /// x_sa = −2 ωx, cm⁻¹.
    pub x_between: f64,
    /// ⟨2,0|H|0,2⟩ = K/2 = −ωx, cm⁻¹: the Darling-Dennison element between the lowest pair.
    pub darling_dennison: f64,
}

impl NormalModePair {
    /// The normal-mode pair of two equal bonds with harmonic wavenumber `omega`, anharmonicity `omega_x` and coupling
    /// `lambda`, all in cm⁻¹.
    pub fn of_equal_bonds(omega: f64, omega_x: f64, lambda: f64) -> Self {
        Self {
            omega: [omega + lambda, omega - lambda],
            x_own: -0.5 * omega_x,
            x_between: -2.0 * omega_x,
            darling_dennison: -omega_x,
        }
    }
}

/// Masses of hydrogen, deuterium and oxygen-16, u (CODATA/AME values as used in quantum chemistry).
const MASS: [f64; 3] = [1.007_825_032_23, 2.014_101_778_12, 15.994_914_619_57];

/// (µ_OH / µ_OD)^½ = 0.72801: ratio of the harmonic wavenumbers of one O–D and one O–H bond.
pub fn mass_ratio() -> f64 {
    let reduced = |m: f64| m * MASS[2] / (m + MASS[2]);
    (reduced(MASS[0]) / reduced(MASS[1])).sqrt()
}

/// Fundamental of the O–D bond from that of the O–H bond, cm⁻¹.
///
/// # Method
/// One Morse bond: ω = ν_OH + 2 ωx, ν_OD = ρ ω − 2 ρ² ωx with ρ of [`mass_ratio`]. Below about 3000 cm⁻¹ (very strong
/// hydrogen bonds) one bond is no longer a Morse oscillator and the ratio is too high.
pub fn deuterated_stretch(nu_oh: f64, omega_x: f64) -> f64 {
    let rho = mass_ratio();
    rho * (nu_oh + 2.0 * omega_x) - 2.0 * rho * rho * omega_x
}

/// λ of the two O–D bonds from λ of the two O–H bonds, cm⁻¹.
///
/// # Method
/// The kinetic part is ½ ω G₁₂/G₁₁ with the G-matrix elements of a bent XY₂ molecule, G₁₂ = cos α / m_O and
/// G₁₁ = 1/m_H + 1/m_O (Wilson, Decius & Cross, *Molecular Vibrations*, 1955, from memory), α = 104.5°; the rest is
/// potential coupling and scales like ω. Water vapour: −49 becomes −54 (half of the observed splitting of D₂O: −59).
pub fn deuterated_coupling(lambda: f64, nu_oh: f64, omega_x: f64) -> f64 {
    let cosine = 104.5_f64.to_radians().cos();
    let share = |m: f64| cosine / MASS[2] / (1.0 / m + 1.0 / MASS[2]);
    let omega = nu_oh + 2.0 * omega_x;
    let kinetic = 0.5 * omega * share(MASS[0]);
    // A coupling weaker than its kinetic part has a potential part of the other sign; the rule still holds.
    0.5 * omega * mass_ratio() * share(MASS[1]) + mass_ratio() * (lambda - kinetic)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn effective_constants_give_the_levels_of_the_pair_back() {
        for (low, high) in [(3657.05, 3755.93), (3400.0, 3500.0), (3200.0, 3550.0), (3500.0, 3500.0)] {
            let pair = LocalPair::observed(low, high, 85.0, 90.0, -45.0);
            let one = pair.levels(1);
            // Arithmetic only.
            assert!((one[0] - low).abs() < 1e-9 && (one[1] - high).abs() < 1e-9, "{one:?}");
            let k = effective_constants(low, high, 85.0, 90.0, -45.0);
            let two = pair.levels(2);
            for (level, sum) in two.iter().zip([2.0 * (low + k.x_ll), low + high + k.x_lh, 2.0 * (high + k.x_hh)]) {
                assert!((level - sum).abs() < 1e-9, "{level} against {sum}");
            }
        }
    }

    #[test]
    fn far_apart_bonds_are_two_separate_oscillators() {
        let k = effective_constants(2724.0, 3707.0, 44.0, 84.0, -45.0);
        // λ²/D is 2 cm⁻¹ here, and the overtones feel a few of it.
        assert!((k.x_ll + 44.0).abs() < 5.0 && k.x_lh.abs() < 5.0 && (k.x_hh + 84.0).abs() < 5.0, "{k:?}");
    }

    #[test]
    fn water_vapour_has_its_two_quanta_levels() {
        // Band origins: IUPAC critical evaluation, Tennyson et al., J. Quant. Spectrosc. Radiat. Transfer 117, 29
        // (2013), from memory. The pair: ω 3859.0, ωx 79.5, λ −43.9, a fit to eleven levels that leaves 6.3 cm⁻¹ rms.
        let bond = 3859.0 - 2.0 * 79.5;
        let two = LocalPair { bond: [bond; 2], omega_x: [79.5; 2], lambda: -43.9 }.levels(2);
        for (level, observed) in two.iter().zip([7201.54, 7249.82, 7445.06]) {
            assert!((level - observed).abs() < 12.0, "{level} against {observed}");
        }
    }

    #[test]
    fn coupling_of_heavy_water_is_stronger_than_its_mass_ratio() {
        let half = 0.5 * (2787.92 - 2669.4); // D2O gas, Chaplin, Water Structure and Science (table of vibrations)
        let lambda = deuterated_coupling(-0.5 * (3755.93 - 3657.05), 3706.5, 80.0);
        assert!((lambda + half).abs() < 8.0, "{lambda} against {}", -half);
    }

    #[test]
    fn sigmas_grow_with_those_of_the_bonds() {
        let bond = |sigma| Uncertain { value: 85.0, sigma };
        let lambda = Uncertain { value: -45.0, sigma: 10.0 };
        let narrow = effective_sigmas(3400.0, 3550.0, [bond(3.0); 2], lambda);
        let wide = effective_sigmas(3400.0, 3550.0, [bond(12.0); 2], lambda);
        assert!(wide.x_ll > narrow.x_ll && wide.x_hh > narrow.x_hh && narrow.x_ll > 0.0);
    }
}
