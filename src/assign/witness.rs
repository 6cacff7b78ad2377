//! What else speaks for or against a candidate.

use serde::Serialize;

use super::candidate::Candidate;

/// One piece of evidence: a sentence and its likelihood factor.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct Factor {
    /// The sentence.
    pub reason: String,
    /// log₁₀ of the factor; comparable between the candidates of one band and its other origin.
    pub log10: f64,
}

impl Factor {
    /// A factor given as a likelihood.
    pub fn of_likelihood(likelihood: f64, reason: String) -> Self {
        Self { reason, log10: likelihood.max(1.0e-300).log10() }
    }
}

/// Someone who has seen something about bands: companions, splittings.
pub trait Witness: Sync {
    /// What is said if `candidate` explains band number `band`.
    fn about(&self, band: usize, candidate: &Candidate) -> Vec<Factor>;

    /// What is said if the band has another origin.
    fn other(&self, band: usize) -> Vec<Factor>;
}
