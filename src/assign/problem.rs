//! The joint assignment as a problem in numbers: bands, offers, weights.
//!
//! # Method
//! For a joint assignment (band → level or other origin, each level at most once) the weight is
//!
//! ```text
//! W = Π_{assigned b} [f_b(v) / (1 − q(v))] N(y_S; m_S, G) · Π_{foreign b} [λ h_b] · Π_{v in range} (1 − q(v))
//! ```
//!
//! f is the probability (or, with a listed strength, the density) of seeing the level as the band shows it, q the
//! probability that it would have been noticed as missing. The density λ of foreign bands has a gamma prior of shape 2
//! around λ₀ and is integrated exactly: n foreign bands weigh λ₀ⁿ Γ(n + 2) / (2 + fK)ⁿ⁺² · 4, hence the next one
//! λ₀ (n + 2) / (2 + fK).

use super::kernel::{Slopes, log_normal, log_sum};

/// A candidate offered for one band.
#[derive(Clone, Debug)]
pub struct Offer {
    /// Number of the candidate.
    pub candidate: usize,
    /// Scaled derivatives of its position.
    pub slopes: Slopes,
    /// Variance shared with other levels, cm⁻².
    pub shared: f64,
    /// Variance of its own, cm⁻².
    pub private: f64,
    /// Band position minus modelled position, cm⁻¹.
    pub residual: f64,
    /// log of f/(1 − q) times the factors of companions, per strength model.
    pub fit: Vec<f64>,
}

/// One band with its offers.
#[derive(Clone, Debug)]
pub struct Target {
    /// Variance of the observed position, cm⁻².
    pub variance: f64,
    /// Offers.
    pub offers: Vec<Offer>,
    /// log weight of a foreign band besides the density λ.
    pub foreign: f64,
    /// log weight of all levels that were too improbable to be kept, −∞ for none.
    pub unlisted: f64,
}

/// All there is to sample from.
#[derive(Clone, Debug)]
pub struct Problem {
    /// Bands.
    pub targets: Vec<Target>,
    /// How many parameters slopes refer to.
    pub parameters: usize,
    /// Strength models: log prior weight plus Σ log(1 − q).
    pub models: Vec<f64>,
    /// Expected density of foreign bands λ₀, per cm⁻¹.
    pub foreign_density: f64,
    /// Expected number fK of foreign bands when their density is learnt; `None` keeps λ₀.
    pub foreign_expected: Option<f64>,
    /// Inflation κ of all uncertainties: (factor, prior weight).
    pub inflations: Vec<(f64, f64)>,
    /// Factors on a band's own uncertainty: (factor, prior weight); a heavy tail when there is more than one.
    pub tails: Vec<(f64, f64)>,
}

/// Probabilities of one band: of its offers in order, of a foreign origin, of the levels left out.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct Shares {
    /// One an offer.
    pub offers: Vec<f64>,
    /// Foreign origin.
    pub foreign: f64,
    /// Levels that were not kept.
    pub unlisted: f64,
}

impl Problem {
    /// log weight of one more foreign band when `others` already are.
    #[inline]
    pub fn log_foreign(&self, band: usize, others: usize) -> f64 {
        let learnt = self.foreign_expected.map_or(0.0, |fk| ((others as f64 + 2.0) / (fk + 2.0)).ln());
        self.foreign_density.ln() + learnt + self.targets[band].foreign
    }

    /// log of the constant that goes with a learnt density of foreign bands: no foreign band at all.
    pub fn log_no_foreign(&self) -> f64 {
        self.foreign_expected.map_or(0.0, |fk| (4.0 / (fk + 2.0).powi(2)).ln())
    }

    /// Probabilities of every band on its own, and the log of the sum of its weights: no exclusion between bands, no
    /// update of parameters, averaged over inflation, tails and models as their priors say.
    pub fn independent(&self) -> Vec<(Shares, f64)> {
        let all_models = log_sum(self.models.iter().copied());
        (0..self.targets.len())
            .map(|band| {
                let target = &self.targets[band];
                let mut logs: Vec<f64> = Vec::with_capacity(target.offers.len() + 2);
                for offer in &target.offers {
                    let fits = self.models.iter().zip(&offer.fit).map(|(m, f)| m - all_models + f);
                    let places = self.inflations.iter().flat_map(|&(kappa, a)| {
                        self.tails.iter().map(move |&(tail, b)| {
                            let variance = kappa * kappa * offer.shared + offer.private + tail * tail * target.variance;
                            (a * b).ln() + log_normal(offer.residual, variance)
                        })
                    });
                    logs.push(log_sum(fits) + log_sum(places));
                }
                logs.push(self.foreign_density.ln() + target.foreign);
                logs.push(target.unlisted);
                let total = log_sum(logs.iter().copied());
                let mut shares: Vec<f64> = logs.iter().map(|l| (l - total).exp()).collect();
                let unlisted = shares.pop().unwrap_or_default();
                let foreign = shares.pop().unwrap_or_default();
                (Shares { offers: shares, foreign, unlisted }, total)
            })
            .collect()
    }
}
