//! Smoothing, where the noise asks for it and the sampling allows it.

/// Finest sampling that is kept, cm⁻¹: bands of solids are far wider, and a finer one only costs time.
const FINEST: f64 = 0.25;

/// Half-spans of the local parabolas that are tried, cm⁻¹: the narrowest bands of solids in the near infrared are some
/// 12 cm⁻¹ wide, and a parabola over as much keeps nine tenths of their depth.
const HALF_SPANS: [f64; 3] = [4.0, 7.0, 10.0];

/// Fewest points of a parabola that smooths.
const FEWEST: usize = 5;

/// Means over bins of 0.25 cm⁻¹ when the sampling is finer; otherwise the points as they are.
pub fn thinned(x: Vec<f64>, y: Vec<f64>) -> (Vec<f64>, Vec<f64>) {
    let (Some(first), Some(last)) = (x.first().copied(), x.last().copied()) else { return (x, y) };
    if (last - first) / x.len() as f64 >= FINEST {
        return (x, y);
    }
    let bin = |x: f64| ((x - first) / FINEST).floor();
    let (mut xs, mut ys) = (Vec::new(), Vec::new());
    let mut from = 0;
    while from < x.len() {
        let mut to = from;
        while to < x.len() && bin(x[to]) == bin(x[from]) {
            to += 1;
        }
        let count = (to - from) as f64;
        xs.push(x[from..to].iter().sum::<f64>() / count);
        ys.push(y[from..to].iter().sum::<f64>() / count);
        from = to;
    }
    (xs, ys)
}

/// What smoothing left.
#[derive(Clone, Debug, PartialEq)]
pub struct Smoothed {
    /// Smoothed ordinates.
    pub ordinates: Vec<f64>,
    /// Factor by which the noise a sample became less.
    pub noise_factor: f64,
    /// Full span of the parabolas, cm⁻¹; `None` when nothing was smoothed.
    pub span: Option<f64>,
}

/// Ordinates smoothed by the narrowest local parabola that lowers the noise by the factor `wanted` (below one), or by the
/// widest; as they are when `wanted` is one or more, or the sampling is too coarse.
///
/// # Units and shapes
/// `x` in cm⁻¹ ascends, `y` is as long; `step` is the typical step.
/// # Method
/// The value at the centre of a parabola fitted to m even points has 9/(4 m) of the variance of one point (for large m).
pub fn smoothed(x: &[f64], y: &[f64], step: f64, wanted: f64) -> Smoothed {
    let as_it_is = Smoothed { ordinates: y.to_vec(), noise_factor: 1.0, span: None };
    if wanted >= 1.0 || step <= 0.0 {
        return as_it_is;
    }
    let factor = |half: f64| (9.0 / (4.0 * (2.0 * (half / step).floor() + 1.0))).sqrt();
    let usable = |half: &f64| 2.0 * (half / step).floor() + 1.0 >= FEWEST as f64;
    let Some(half) = HALF_SPANS
        .into_iter()
        .filter(usable)
        .find(|half| factor(*half) <= wanted)
        .or_else(|| HALF_SPANS.into_iter().rfind(usable))
    else {
        return as_it_is;
    };
    let (mut from, mut to) = (0, 0);
    let ordinates = (0..x.len())
        .map(|at| {
            while x[at] - x[from] > half {
                from += 1;
            }
            while to + 1 < x.len() && x[to + 1] - x[at] <= half {
                to += 1;
            }
            // A window that is cut at an end is made symmetric, so that the ends are not extrapolated.
            let reach = (at - from).min(to - at);
            centre_of_parabola(x, y, at, reach, half).unwrap_or(y[at])
        })
        .collect();
    Smoothed { ordinates, noise_factor: factor(half).min(1.0), span: Some(2.0 * half) }
}

/// The value at point `at` of the parabola through `reach` points on each side; `None` with fewer than two.
fn centre_of_parabola(x: &[f64], y: &[f64], at: usize, reach: usize, half: f64) -> Option<f64> {
    if reach < 2 {
        return None;
    }
    let mut matrix = nalgebra::Matrix3::<f64>::zeros();
    let mut right = nalgebra::Vector3::<f64>::zeros();
    for i in at - reach..=at + reach {
        let u = (x[i] - x[at]) / half;
        let row = nalgebra::Vector3::new(1.0, u, u * u);
        matrix += row * row.transpose();
        right += row * y[i];
    }
    matrix.lu().solve(&right).map(|s| s[0])
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn smoothing_leaves_a_parabola_as_it_is() {
        let x: Vec<f64> = (0..100).map(f64::from).collect();
        let y: Vec<f64> = x.iter().map(|x| 1.0 + 0.01 * x - 0.001 * x * x).collect();
        let found = smoothed(&x, &y, 1.0, 0.5);
        assert!(found.span.is_some() && found.noise_factor <= 0.5);
        for (a, b) in found.ordinates.iter().zip(&y) {
            assert!((a - b).abs() < 1e-9);
        }
        assert_eq!(smoothed(&x, &y, 1.0, 1.0).span, None);
        assert_eq!(smoothed(&x, &y, 30.0, 0.1).span, None);
    }

    #[test]
    fn a_very_fine_sampling_is_averaged() {
        let x: Vec<f64> = (0..100_000).map(|i| 4000.0 + 0.01 * f64::from(i)).collect();
        let (xs, ys) = thinned(x.clone(), x.clone());
        assert!((3990..4010).contains(&xs.len()), "{}", xs.len());
        assert_eq!(xs, ys);
    }
}
