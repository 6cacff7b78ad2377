//! The continuum: an upper convex hull, and what is left when it is removed.

/// A continuum: straight lines between the vertices of the upper convex hull.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct Continuum {
    /// Vertices (position, ordinate), ascending in position; the first and last point of the data are among them.
    pub vertices: Vec<(f64, f64)>,
}

impl Continuum {
    /// The upper convex hull of points that ascend in `x`.
    ///
    /// # Units and shapes
    /// `x` and `y` are equally long; the unit of `x` is free, but hulls over wavelength and wavenumber differ.
    /// # Method
    /// Monotone chain from left to right: a vertex that does not stand above the line past it is dropped. Linear in time.
    pub fn upper_hull(x: &[f64], y: &[f64]) -> Self {
        let mut vertices: Vec<(f64, f64)> = Vec::new();
        for (&x, &y) in x.iter().zip(y) {
            while let [.., a, b] = vertices.as_slice()
                && (b.1 - a.1) * (x - a.0) <= (y - a.1) * (b.0 - a.0)
            {
                vertices.pop();
            }
            vertices.push((x, y));
        }
        Self { vertices }
    }

    /// The continuum at each of `x`, which ascend; outside the hull its end values.
    pub fn over(&self, x: &[f64]) -> Vec<f64> {
        let mut right = 1;
        x.iter()
            .map(|&x| {
                while right + 1 < self.vertices.len() && self.vertices[right].0 < x {
                    right += 1;
                }
                match (self.vertices.get(right - 1), self.vertices.get(right)) {
                    (Some(a), Some(b)) if x <= a.0 || b.0 <= a.0 => {
                        if x <= a.0 {
                            a.1
                        } else {
                            b.1
                        }
                    }
                    (Some(_), Some(b)) if x >= b.0 => b.1,
                    (Some(a), Some(b)) => a.1 + (b.1 - a.1) * (x - a.0) / (b.0 - a.0),
                    (Some(a), None) => a.1,
                    _ => f64::NAN,
                }
            })
            .collect()
    }

    /// The ordinates divided by the continuum: 1 on it, 1 − depth below.
    pub fn removed(&self, x: &[f64], y: &[f64]) -> Vec<f64> {
        self.over(x).into_iter().zip(y).map(|(hull, y)| if hull > 0.0 { y / hull } else { 1.0 }).collect()
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_hull_lies_nowhere_below_the_data_and_bends_only_down() {
        let x: Vec<f64> = (0..200).map(f64::from).collect();
        let y: Vec<f64> = x.iter().map(|x| 1.0 + (x * 0.7).sin() * 0.1 + (x * 0.03).cos()).collect();
        let hull = Continuum::upper_hull(&x, &y);
        for (h, y) in hull.over(&x).iter().zip(&y) {
            assert!(h - y > -1e-12);
        }
        for v in hull.vertices.windows(3) {
            let (left, right) = ((v[1].1 - v[0].1) / (v[1].0 - v[0].0), (v[2].1 - v[1].1) / (v[2].0 - v[1].0));
            assert!(right < left);
        }
        assert_eq!(hull.vertices.first().map(|v| v.0), Some(0.0));
        assert_eq!(hull.vertices.last().map(|v| v.0), Some(199.0));
    }
}
