//! The verdict about a band in one of four words.

use serde::Serialize;

/// What may be said about a band. The rule stands in `docs/verdicts.md`; a test of the whole list can only lower it.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Serialize)]
pub enum Verdict {
    /// The family can be relied upon.
    #[serde(rename = "secure")]
    Secure,
    /// One family leads.
    #[serde(rename = "leading")]
    Leading,
    /// Several families are possible.
    #[serde(rename = "open")]
    Open,
    /// The candidates explain the band no better than an accident would.
    #[serde(rename = "no better than chance")]
    Chance,
}

/// Probability of the leading family from which it is secure, if the list stands above chance.
pub const SECURE: f64 = 0.9;

/// Probability of the leading family from which it leads.
pub const LEADING: f64 = 0.6;

/// With this many visible levels expected by accident a family is not secure.
pub const RIVALS: f64 = 1.5;

/// p value of the list up to which it stands above chance.
pub const ABOVE_CHANCE: f64 = 0.05;

/// p value of the list from which nothing leads.
pub const LIKE_CHANCE: f64 = 0.2;

impl Verdict {
    /// From the probabilities of the leading family and of other origin, the visible levels expected by accident (the
    /// weighted count), and the p value of the whole list where it was tested.
    pub fn of(leading: f64, other: f64, rivals: f64, list_p: Option<f64>) -> Self {
        if other >= leading || (leading < 0.3 && rivals >= 2.0) {
            Self::Chance
        } else if leading >= SECURE && rivals < RIVALS && list_p.is_none_or(|p| p <= ABOVE_CHANCE) {
            Self::Secure
        } else if leading >= LEADING && list_p.is_none_or(|p| p < LIKE_CHANCE) {
            Self::Leading
        } else {
            Self::Open
        }
    }

    /// The word.
    pub fn word(self) -> &'static str {
        match self {
            Self::Secure => "secure",
            Self::Leading => "leading",
            Self::Open => "open",
            Self::Chance => "no better than chance",
        }
    }
}

#[cfg(test)]
mod tests {
    use super::Verdict;

    #[test]
    fn a_sure_family_is_secure_only_when_the_list_stands_above_chance() {
        let of = |leading, other, p| Verdict::of(leading, other, 0.5, p);
        assert_eq!(of(0.97, 0.01, Some(0.01)), Verdict::Secure);
        assert_eq!(of(0.97, 0.01, Some(0.1)), Verdict::Leading);
        assert_eq!(of(0.97, 0.01, Some(0.6)), Verdict::Open);
        assert_eq!(of(0.97, 0.01, None), Verdict::Secure);
        assert_eq!(of(0.4, 0.3, Some(0.01)), Verdict::Open);
        assert_eq!(of(0.4, 0.5, Some(0.01)), Verdict::Chance);
        assert_eq!(Verdict::of(0.97, 0.01, 3.0, Some(0.01)), Verdict::Leading);
    }
}
