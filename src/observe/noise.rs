//! Noise of a spectrum.

/// Widest spacing, cm⁻¹, at which neighbouring samples of a fine spectrum are compared: bands of solids are wider, while
/// interpolated interferometer spectra have noise that is the same over a few samples.
const SPACING: f64 = 8.0;

/// Standard deviation of the noise a sample, from the spectrum itself; `None` with fewer than nine points.
///
/// # Units and shapes
/// `step` is the typical sampling step in cm⁻¹; the result is in the unit of the ordinates.
/// # Method
/// Fourth and sixth differences remove what varies slowly; their spread over √70 and √924 is the noise, and the smaller of
/// the two is taken, for both are upper bounds where bands fill the spectrum. The spread is 1.4826 times the median magnitude,
/// so that the few points on sharp bands do not count. Differences are taken between neighbours and, in fine spectra, over
/// twice, four times … the step; the largest result counts, since noise that neighbours share is seen only so.
pub fn estimate(ordinates: &[f64], step: f64) -> Option<f64> {
    let mut largest = None;
    let mut stride = 1;
    while let Some(found) = white(ordinates, stride) {
        largest = Some(largest.map_or(found, |l: f64| l.max(found)));
        stride *= 2;
        if stride as f64 * step.abs() > SPACING {
            break;
        }
    }
    largest
}

/// Noise from differences over `stride` samples.
fn white(ordinates: &[f64], stride: usize) -> Option<f64> {
    let spread = |weights: &[f64]| {
        let reach = (weights.len() - 1) * stride;
        let mut magnitudes: Vec<f64> = (0..ordinates.len().checked_sub(reach)?)
            .map(|at| weights.iter().enumerate().map(|(k, w)| w * ordinates[at + k * stride]).sum::<f64>().abs())
            .collect();
        let middle = magnitudes.len() / 2;
        if magnitudes.len() < 3 {
            return None;
        }
        let (_, median, _) = magnitudes.select_nth_unstable_by(middle, f64::total_cmp);
        let norm = weights.iter().map(|w| w * w).sum::<f64>().sqrt();
        Some(1.4826 * *median / norm)
    };
    let fourth = spread(&[1.0, -4.0, 6.0, -4.0, 1.0])?;
    Some(fourth.min(spread(&[1.0, -6.0, 15.0, -20.0, 15.0, -6.0, 1.0])?))
}

/// Noise at each point: [`estimate`] in blocks of up to `block` points, for instruments whose noise grows along the axis.
pub fn along(ordinates: &[f64], step: f64, block: usize) -> Vec<f64> {
    let block = block.max(32);
    let whole = estimate(ordinates, step).unwrap_or(0.0);
    let mut noise = Vec::with_capacity(ordinates.len());
    for part in ordinates.chunks(block) {
        let value = if part.len() >= 32 { estimate(part, step) } else { noise.last().copied() };
        noise.extend(std::iter::repeat_n(value.unwrap_or(whole), part.len()));
    }
    noise
}

#[cfg(test)]
mod tests {
    use super::*;
    use rand::{Rng, SeedableRng};

    #[test]
    fn noise_shared_by_neighbours_is_seen() {
        let mut random = rand_chacha::ChaCha8Rng::seed_from_u64(2);
        // Each value stands twice with a value between: interpolated as by zero filling.
        let values: Vec<f64> = (0..2000).map(|_| random.random::<f64>()).collect();
        let curve: Vec<f64> = values.windows(2).flat_map(|p| [p[0], (p[0] + p[1]) / 2.0]).collect();
        let found = estimate(&curve, 2.0).unwrap();
        // A uniform number has standard deviation 0.289, its mean with another 0.204.
        assert!((0.18..0.33).contains(&found), "{found}");
    }

    #[test]
    fn the_noise_put_on_a_smooth_curve_is_found() {
        let mut random = rand_chacha::ChaCha8Rng::seed_from_u64(1);
        // A sum of twelve uniform numbers has unit variance.
        let mut normal = || (0..12).map(|_| random.random::<f64>()).sum::<f64>() - 6.0;
        let curve: Vec<f64> = (0..4000).map(|i| (f64::from(i) * 0.002).sin() + 0.003 * normal()).collect();
        let found = estimate(&curve, 10.0).unwrap();
        // A median of 4000 magnitudes is known to about 3 %.
        assert!((found / 0.003 - 1.0).abs() < 0.1, "{found}");
        assert_eq!(estimate(&curve[..8], 10.0), None);
    }
}
