//! Shoulders: places where depth bends down like a band without a maximum of its own.

/// A shoulder.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Shoulder {
    /// Its point of strongest curvature.
    pub at: usize,
    /// The same as a wavenumber, cm⁻¹.
    pub position: f64,
    /// Depth of the Gaussian with that curvature and width.
    pub depth: f64,
    /// Full width at half maximum of that Gaussian, cm⁻¹.
    pub width: f64,
}

/// Points on each side of the parabola that gives the curvature.
const HALF: usize = 3;

/// Width of the region of negative curvature of a Gaussian, in full widths at half maximum: 2 s / (2.355 s).
const NEGATIVE_REGION: f64 = 0.849;

/// Shoulders between the maxima `tops`, at least `least` deep.
///
/// # Units and shapes
/// `x` in cm⁻¹ ascends and is as long as `depths`; `noise` is the standard deviation of a depth.
/// # Method
/// The second derivative from local parabolas of seven points (or as many as span a fortieth of a typical near-infrared
/// width). A run of negative curvature without a maximum in it is a shoulder. A Gaussian of depth d and width F has
/// curvature −8 ln2 d/F² at its centre and negative curvature over 0.849 F, so that run and curvature give F and d.
pub fn shoulders(x: &[f64], depths: &[f64], tops: &[usize], least: f64, noise: f64) -> Vec<Shoulder> {
    let n = x.len();
    if n < 4 * HALF {
        return Vec::new();
    }
    let bend = curvature(x, depths);
    let mut list = Vec::new();
    let mut at = 0;
    while at < n {
        if bend[at] >= 0.0 || bend[at].is_nan() {
            at += 1;
            continue;
        }
        let from = at;
        while at < n && bend[at] < 0.0 {
            at += 1;
        }
        let to = at - 1;
        let open = from <= HALF || to + HALF + 1 >= n;
        let taken = tops.iter().any(|top| (from.saturating_sub(1)..=to + 1).contains(top));
        if open || taken || to < from + 2 {
            continue;
        }
        let Some(strongest) = (from..=to).min_by(|a, b| bend[*a].total_cmp(&bend[*b])) else { continue };
        let width = (x[to] - x[from]) / NEGATIVE_REGION;
        let depth = -bend[strongest] * width * width / (8.0 * std::f64::consts::LN_2);
        let points = (to - from + 1) as f64;
        // Noise of a curvature over the run, carried over to the depth of the Gaussian: many points average it.
        let doubt = 30.0 * noise / points.sqrt();
        if depth >= least.max(doubt) && depths[strongest] >= least && depths[strongest] > 0.5 * depth {
            list.push(Shoulder { at: strongest, position: x[strongest], depth: depth.min(depths[strongest]), width });
        }
    }
    list
}

/// Second derivative of `y` over `x` from local parabolas; zero where there is none.
fn curvature(x: &[f64], y: &[f64]) -> Vec<f64> {
    /// Least half-span of a parabola, cm⁻¹: finer samplings take more points.
    const SPAN: f64 = 12.0;
    let n = x.len();
    let mut bend = vec![0.0; n];
    let (mut from, mut to) = (0, 0);
    for at in 0..n {
        while x[at] - x[from] > SPAN {
            from += 1;
        }
        while to + 1 < n && x[to + 1] - x[at] <= SPAN {
            to += 1;
        }
        let (low, high) = (from.min(at.saturating_sub(HALF)), to.max((at + HALF).min(n - 1)));
        // Very fine samplings are thinned: fifty points settle a parabola.
        let stride = (high - low) / 50 + 1;
        bend[at] = second_derivative(x, y, at, (low..=high).step_by(stride)).unwrap_or(0.0);
    }
    bend
}

fn second_derivative(x: &[f64], y: &[f64], at: usize, points: impl Iterator<Item = usize> + Clone) -> Option<f64> {
    let span = points.clone().map(|i| (x[i] - x[at]).abs()).fold(0.0, f64::max);
    if span <= 0.0 {
        return None;
    }
    let mut matrix = nalgebra::Matrix3::<f64>::zeros();
    let mut right = nalgebra::Vector3::<f64>::zeros();
    for i in points {
        let u = (x[i] - x[at]) / span;
        let row = nalgebra::Vector3::new(1.0, u, u * u);
        matrix += row * row.transpose();
        right += row * y[i];
    }
    let solution = matrix.lu().solve(&right)?;
    Some(2.0 * solution[2] / (span * span))
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_shoulder_without_a_maximum_is_found_near_its_band() {
        let gauss = |x: f64, c: f64, f: f64| (-4.0 * std::f64::consts::LN_2 * ((x - c) / f).powi(2)).exp();
        let x: Vec<f64> = (0..400).map(|i| 5000.0 + 2.0 * f64::from(i)).collect();
        let y: Vec<f64> = x.iter().map(|&x| 0.5 * gauss(x, 5300.0, 120.0) + 0.12 * gauss(x, 5395.0, 70.0)).collect();
        let tops: Vec<usize> = crate::observe::prominence::peaks(&y).iter().map(|p| p.at).collect();
        assert_eq!(tops.len(), 1, "the second band has no maximum of its own");
        let found = shoulders(&x, &y, &tops, 0.01, 1.0e-5);
        assert_eq!(found.len(), 1, "{found:?}");
        // Pulled by its neighbour, but within a fifth of its width.
        assert!((found[0].position - 5395.0).abs() < 14.0, "{found:?}");
    }

    #[test]
    fn a_single_band_has_no_shoulder() {
        let x: Vec<f64> = (0..400).map(|i| 5000.0 + 2.0 * f64::from(i)).collect();
        let y: Vec<f64> = x.iter().map(|&x| 0.5 / (1.0 + ((x - 5300.0) / 50.0).powi(2))).collect();
        assert!(shoulders(&x, &y, &[150], 0.005, 1.0e-5).is_empty());
    }
}
