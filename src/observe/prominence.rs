//! Local maxima and how far they stand out.

/// A local maximum.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Peak {
    /// Its point (the middle of a plateau).
    pub at: usize,
    /// How far it stands above the higher of the two lowest points between it and higher ground.
    pub prominence: f64,
    /// That lowest point on the left.
    pub left_base: usize,
    /// That lowest point on the right.
    pub right_base: usize,
}

/// All local maxima with their prominence, ascending in place; linear in time.
///
/// # Method
/// A stack of descending heights keeps, for each point, the lowest point since the last higher one; once from the left and
/// once from the right. Points at the ends are no maxima.
pub fn peaks(height: &[f64]) -> Vec<Peak> {
    let n = height.len();
    let left = bases(height, (0..n).collect::<Vec<_>>().as_slice());
    let right = bases(height, (0..n).rev().collect::<Vec<_>>().as_slice());
    let mut list = Vec::new();
    let mut at = 1;
    while at + 1 < n {
        if height[at] > height[at - 1] {
            let mut end = at;
            while end + 1 < n && height[end + 1] == height[at] {
                end += 1;
            }
            if end + 1 < n && height[end + 1] < height[at] {
                let (left_base, right_base) = (left[at], right[end]);
                let prominence = height[at] - height[left_base].max(height[right_base]);
                list.push(Peak { at: usize::midpoint(at, end), prominence, left_base, right_base });
            }
            at = end;
        }
        at += 1;
    }
    list
}

/// For each point the lowest point seen since the last point that is higher, walking in `order`.
fn bases(height: &[f64], order: &[usize]) -> Vec<usize> {
    let mut base = vec![0; height.len()];
    let mut stack: Vec<(usize, usize)> = Vec::new();
    for &at in order {
        let mut lowest = at;
        while let Some(&(top, under)) = stack.last()
            && height[top] <= height[at]
        {
            if height[under] < height[lowest] {
                lowest = under;
            }
            stack.pop();
        }
        base[at] = lowest;
        stack.push((at, lowest));
    }
    base
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn prominence_is_measured_from_the_higher_saddle() {
        //             0    1    2    3    4    5    6    7    8
        let height = [0.0, 3.0, 2.0, 5.0, 5.0, 1.0, 2.0, 0.5, 0.7];
        let list = peaks(&height);
        let found: Vec<(usize, f64)> = list.iter().map(|p| (p.at, p.prominence)).collect();
        assert_eq!(found, [(1, 1.0), (3, 4.5), (6, 1.0)]);
        assert_eq!((list[1].left_base, list[1].right_base), (0, 7));
    }

    #[test]
    fn a_long_saw_is_measured_in_no_time() {
        let height: Vec<f64> = (0..1_000_000).map(|i| f64::from(i % 2) + 1e-6 * f64::from(i)).collect();
        assert!(peaks(&height).len() > 400_000);
    }
}
