//! Two OH bonds of one water as Morse oscillators with harmonic coupling.

/// Constants in the basis of the observed fundamentals that reproduce the two-quanta levels of a local pair.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct EffectiveConstants {
    /// x of the lower stretch.
    pub x_ll: f64,
    /// x between the two.
    pub x_lh: f64,
    /// x of the higher stretch.
    pub x_hh: f64,
}

/// Effective constants.
pub fn effective_constants(nu_low: f64, nu_high: f64, wx_low: f64, wx_high: f64, lambda: f64) -> EffectiveConstants {
    let split = nu_high - nu_low;
    let local = (split * split - 4.0 * lambda * lambda).max(0.0).sqrt();
    let coupling = 0.5 * (split * split - local * local).max(0.0).sqrt();
    let mean = 0.5 * (nu_low + nu_high);
    let (a, b) = (mean - 0.5 * local, mean + 0.5 * local);
    let r2 = std::f64::consts::SQRT_2 * coupling;
    let block =
        nalgebra::Matrix3::new(2.0 * a - 2.0 * wx_low, r2, 0.0, r2, a + b, r2, 0.0, r2, 2.0 * b - 2.0 * wx_high);
    let mut e: Vec<f64> = block.symmetric_eigen().eigenvalues.iter().copied().collect();
    e.sort_by(f64::total_cmp);
    EffectiveConstants {
        x_ll: 0.5 * (e[0] - 2.0 * nu_low),
        x_lh: e[1] - nu_low - nu_high,
        x_hh: 0.5 * (e[2] - 2.0 * nu_high),
    }
}
