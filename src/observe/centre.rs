//! The centre of a band: parabola, centroid, midpoint.

/// The vertex of a parabola that opens downwards.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Vertex {
    /// Where it is.
    pub position: f64,
    /// The value there.
    pub height: f64,
    /// Minus half of the second derivative: height − value = curvature · (x − position)².
    pub curvature: f64,
    /// Standard deviation of the position for a standard deviation of one of every value.
    pub position_error: f64,
}

/// The vertex of the parabola through three points, or fitted to more by least squares; `None` when the
/// parabola does not open downwards, or its vertex lies outside the points.
///
/// # Units and shapes
/// `x` ascends and is as long as `depth`; a maximum of depth is looked for. With three points the parabola meets them.
/// # Method
/// Normal equations of a quadratic, in the coordinate u = (x − mean) / half-span, which keeps them well conditioned.
pub fn parabola(x: &[f64], depth: &[f64]) -> Option<Vertex> {
    let n = x.len();
    if n < 3 || depth.len() != n {
        return None;
    }
    let middle = x.iter().sum::<f64>() / n as f64;
    let span = (x[n - 1] - x[0]) / 2.0;
    let mut matrix = nalgebra::Matrix3::<f64>::zeros();
    let mut right = nalgebra::Vector3::<f64>::zeros();
    for (&x, &d) in x.iter().zip(depth) {
        let u = (x - middle) / span;
        let row = nalgebra::Vector3::new(1.0, u, u * u);
        matrix += row * row.transpose();
        right += row * d;
    }
    let solution = matrix.lu().solve(&right)?;
    let (a, b, c) = (solution[0], solution[1], solution[2]);
    // No maximum: c must be negative (not a number fails the test as well).
    if c.is_nan() || c >= 0.0 {
        return None;
    }
    let u = -b / (2.0 * c);
    let position = middle + u * span;
    // The vertex moves with the slope b, whose variance is that of a value over the sum of u².
    let spread = x.iter().map(|x| ((x - middle) / span).powi(2)).sum::<f64>().sqrt();
    (x[0] <= position && position <= x[n - 1]).then(|| Vertex {
        position,
        height: a + b * u + c * u * u,
        curvature: -c / (span * span),
        position_error: span / (2.0 * -c * spread),
    })
}

/// The centroid of `weight` over `x` by the trapezoid rule, ∫ x w dx / ∫ w dx; `None` when the weights vanish.
///
/// # Units and shapes
/// `x` ascends and is as long as `weight`; negative weights count as zero.
pub fn centroid(x: &[f64], weight: &[f64]) -> Option<f64> {
    let (mut moment, mut area) = (0.0, 0.0);
    for (x, w) in x.windows(2).zip(weight.windows(2)) {
        let (w0, w1, step) = (w[0].max(0.0), w[1].max(0.0), x[1] - x[0]);
        area += step * (w0 + w1) / 2.0;
        moment += step * (x[0] * w0 + x[1] * w1) / 2.0;
    }
    (area > 0.0).then(|| moment / area)
}

/// Where depth falls to `level` on both sides of the point `top`, within `from..=to`, by linear interpolation; `None` on a
/// side where it does not.
pub fn crossings(
    x: &[f64],
    depth: &[f64],
    top: usize,
    level: f64,
    from: usize,
    to: usize,
) -> (Option<f64>, Option<f64>) {
    let between = |inner: usize, outer: usize| {
        let share = (depth[inner] - level) / (depth[inner] - depth[outer]);
        x[inner] + share * (x[outer] - x[inner])
    };
    let left = (from + 1..=top).rev().find(|&i| depth[i - 1] < level && depth[i] >= level).map(|i| between(i, i - 1));
    let right = (top..to).find(|&i| depth[i + 1] < level && depth[i] >= level).map(|i| between(i, i + 1));
    (left, right)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_parabola_is_recovered_from_points_spaced_unevenly() {
        let x = [1000.0, 1003.0, 1004.0, 1010.0];
        let y: Vec<f64> = x.iter().map(|x: &f64| 0.5 - 0.01 * (x - 1005.25).powi(2)).collect();
        for n in [3, 4] {
            let vertex = parabola(&x[4 - n..], &y[4 - n..]).unwrap();
            // Exact but for rounding.
            assert!((vertex.position - 1005.25).abs() < 1e-9 && (vertex.height - 0.5).abs() < 1e-9);
            assert!((vertex.curvature - 0.01).abs() < 1e-9);
        }
        assert!(parabola(&[1.0, 2.0, 3.0], &[0.0, -1.0, 0.0]).is_none());
        assert!(parabola(&[1.0, 2.0, 3.0], &[0.0, 1.0, 4.0]).is_none());
    }

    #[test]
    fn half_depth_is_interpolated_on_both_sides() {
        let x = [0.0, 1.0, 2.0, 3.0, 4.0];
        let d = [0.0, 0.25, 1.0, 0.25, 0.0];
        let (left, right) = crossings(&x, &d, 2, 0.5, 0, 4);
        assert!(
            (left.unwrap() - (1.0 + 1.0 / 3.0)).abs() < 1e-12 && (right.unwrap() - (3.0 - 1.0 / 3.0)).abs() < 1e-12
        );
        assert_eq!(crossings(&x, &d, 2, 0.5, 2, 2), (None, None));
    }
}
