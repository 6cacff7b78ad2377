//! Published scale factors from harmonic wavenumbers to fundamentals, compiled in from `mode_tables/scale_factors.csv`.

use itertools::Itertools;

/// The table as text.
const TEXT: &str = include_str!("../../mode_tables/scale_factors.csv");

/// A scale factor with the uncertainty of one scaled wavenumber.
#[derive(Clone, Debug, PartialEq)]
pub struct ScaleFactor {
    /// Fundamental = factor × harmonic wavenumber.
    pub factor: f64,
    /// Relative standard uncertainty of one fundamental from it (not of the mean factor).
    pub relative_sigma: f64,
    /// Where it comes from.
    pub source: String,
}

/// One row of the table.
#[derive(Clone, Debug, PartialEq)]
pub struct Published {
    /// Method.
    pub method: String,
    /// Basis.
    pub basis: String,
    /// Factor.
    pub factor: f64,
    /// Paper or database.
    pub origin: String,
}

/// Relative standard uncertainty of one scaled wavenumber by method.
///
/// # Source
/// HF 0.024 and 0.02 for density functionals and MP2 after Irikura, Johnson & Kacker, J. Phys. Chem. A 109, 8430 (2005)
/// (HF/6-31G(d): 0.8982 ± 0.0230); 0.012 for CCSD(T) and 0.06 for tight binding are judgements of this project, the latter
/// from water bends that come out 8 % low.
pub fn relative_sigma(method: &str) -> f64 {
    let plain = plain(method);
    if plain.starts_with("gfn") || plain.contains("xtb") || plain.contains("dftb") {
        0.06
    } else if plain.starts_with("ccsd(t)") {
        0.012
    } else if matches!(plain.as_str(), "hf" | "rhf" | "uhf" | "scf") {
        0.024
    } else {
        0.02
    }
}

/// All rows.
pub fn published() -> Vec<Published> {
    let body = TEXT.lines().filter(|line| !line.starts_with('#')).join("\n");
    csv::Reader::from_reader(body.as_bytes())
        .records()
        .filter_map(|record| {
            let record = record.ok()?;
            Some(Published {
                method: record.get(0)?.to_owned(),
                basis: record.get(1)?.to_owned(),
                factor: record.get(2)?.parse().ok()?,
                origin: record.get(3)?.to_owned(),
            })
        })
        .collect()
}

/// The published factor of a level of theory: the mean of what is published for it, or, where the basis has none, the mean
/// over the bases of the method with a uncertainty widened by their spread; `None` when the method has none.
pub fn scale_factor(method: &str, basis: &str) -> Option<ScaleFactor> {
    let rows = published();
    let of_method: Vec<&Published> = rows.iter().filter(|r| plain(&r.method) == plain(method)).collect();
    let exact: Vec<&Published> = of_method.iter().copied().filter(|r| plain(&r.basis) == plain(basis)).collect();
    let (used, what) = if exact.is_empty() {
        (of_method, format!("other bases of {method} (none is published for {basis})"))
    } else {
        (exact, format!("{method}/{basis}"))
    };
    if used.is_empty() {
        return None;
    }
    let count = used.len() as f64;
    let factor = used.iter().map(|r| r.factor).sum::<f64>() / count;
    let spread = (used.iter().map(|r| (r.factor - factor).powi(2)).sum::<f64>() / count).sqrt();
    let origins = used.iter().map(|r| r.origin.as_str()).sorted().dedup().take(4).join("; ");
    Some(ScaleFactor {
        factor,
        relative_sigma: relative_sigma(method).hypot(spread / factor),
        source: format!("mean of {} published factors for {what}: {origins}", used.len()),
    })
}

/// Names are compared without case, blanks and hyphens.
fn plain(name: &str) -> String {
    name.to_lowercase().replace([' ', '-', '_'], "")
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn every_row_is_read_and_plausible() {
        let rows = published();
        let lines = TEXT.lines().filter(|l| !l.starts_with('#')).count() - 1;
        assert_eq!(rows.len(), lines);
        assert!(rows.iter().all(|r| (0.8..1.1).contains(&r.factor) && !r.origin.is_empty()));
    }

    #[test]
    fn the_factor_of_a_common_level_is_among_the_published_ones() {
        // Merrick, Moran & Radom, J. Phys. Chem. A 111, 11683 (2007): 0.9613; Scott & Radom, J. Phys. Chem. 100, 16502
        // (1996): 0.9614; other groups print 0.952 to 0.960.
        let factor = scale_factor("b3lyp", "6-31G(d)").expect("it is published");
        assert!((0.952..=0.9614).contains(&factor.factor), "{factor:?}");
        assert!(factor.relative_sigma >= 0.02);
    }

    #[test]
    fn a_level_without_factor_has_none() {
        assert_eq!(scale_factor("GFN2-xTB", ""), None);
    }
}
