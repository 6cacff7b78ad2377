//! How often claims are right: reliability, calibration error, scores.

use super::candidate::Family;
use super::joint::BandAnswer;
use super::simulation::Sample;

/// Claims and whether they were right.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct Claims(pub Vec<(f64, bool)>);

/// One bin of a reliability table: claims, their mean, the share that was right.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Bin {
    /// How many claims.
    pub count: usize,
    /// Their mean probability.
    pub claimed: f64,
    /// The share that was right.
    pub right: f64,
}

impl Claims {
    /// Ten bins of equal width.
    pub fn bins(&self) -> Vec<Bin> {
        let mut sums = [(0_usize, 0.0, 0.0); 10];
        for &(p, right) in &self.0 {
            let bin = &mut sums[((p * 10.0) as usize).min(9)];
            bin.0 += 1;
            bin.1 += p;
            bin.2 += f64::from(u8::from(right));
        }
        sums.iter()
            .map(|&(count, p, right)| {
                let n = count.max(1) as f64;
                Bin { count, claimed: p / n, right: right / n }
            })
            .collect()
    }

    /// Expected calibration error over ten bins: mean of |claimed − right| weighted by the claims.
    pub fn calibration_error(&self) -> f64 {
        let n = self.0.len().max(1) as f64;
        self.bins().iter().map(|b| b.count as f64 / n * (b.claimed - b.right).abs()).sum()
    }

    /// Share of right claims.
    pub fn accuracy(&self) -> f64 {
        self.0.iter().filter(|c| c.1).count() as f64 / self.0.len().max(1) as f64
    }

    /// Mean claim.
    pub fn mean_claim(&self) -> f64 {
        self.0.iter().map(|c| c.0).sum::<f64>() / self.0.len().max(1) as f64
    }
}

/// Scores over many bands.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct Scores {
    /// Best level or other origin.
    pub level: Claims,
    /// Best family or other origin.
    pub family: Claims,
    /// All families of all bands.
    pub all_families: Claims,
    /// Whether the true family is among the first three.
    pub first_three: Claims,
    /// log probabilities of the true level and the true family.
    pub log_scores: Vec<(f64, f64)>,
}

/// Smallest probability that a log score counts: one bad band must not decide a mean.
const LEAST: f64 = 1.0e-4;

impl Scores {
    /// Adds the answers for one sample.
    pub fn add(&mut self, sample: &Sample, answers: &[BandAnswer]) {
        for (answer, truth) in answers.iter().zip(&sample.truth) {
            let other = answer.other_origin.probability;
            let true_family = truth.map(|t| Family::of(&sample.table, &sample.candidates[t].level));
            let (claim, right) = match answer.candidates.first() {
                Some(best) if best.probability > other => (best.probability, Some(best.candidate) == *truth),
                _ => (other, truth.is_none()),
            };
            self.level.0.push((claim, right));
            let mut list: Vec<(f64, bool)> = answer
                .families
                .iter()
                .map(|f| (f.probability, true_family.as_ref() == Some(&f.key)))
                .chain([(other, truth.is_none())])
                .collect();
            list.sort_by(|a, b| b.0.total_cmp(&a.0));
            self.family.0.push(list[0]);
            self.first_three.0.push((0.0, list.iter().take(3).any(|c| c.1)));
            let family_p = list.iter().filter(|c| c.1).map(|c| c.0).sum::<f64>();
            self.all_families.0.extend(list.into_iter().filter(|c| c.0 >= 0.01));
            let level_p = truth
                .map_or(other, |t| answer.candidates.iter().find(|c| c.candidate == t).map_or(0.0, |c| c.probability));
            self.log_scores.push((level_p.max(LEAST).ln(), family_p.max(LEAST).ln()));
        }
    }

    /// Mean log scores of level and family.
    pub fn mean_log_scores(&self) -> (f64, f64) {
        let n = self.log_scores.len().max(1) as f64;
        let (a, b) = self.log_scores.iter().fold((0.0, 0.0), |(a, b), s| (a + s.0, b + s.1));
        (a / n, b / n)
    }

    /// Joins the scores of other samples.
    pub fn join(&mut self, other: Self) {
        self.level.0.extend(other.level.0);
        self.family.0.extend(other.family.0);
        self.all_families.0.extend(other.all_families.0);
        self.first_three.0.extend(other.first_three.0);
        self.log_scores.extend(other.log_scores);
    }
}

/// A ranking made by hand: picks one level for a band, or none.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum ByHand {
    /// The nearest plain sum of fundamentals.
    NearestSum,
    /// The nearest level with constants taken into account.
    NearestLevel,
    /// The fewest quanta within 60 cm⁻¹, the nearest of those.
    FewestQuanta,
}

impl ByHand {
    /// All of them.
    pub const ALL: [Self; 3] = [Self::NearestSum, Self::NearestLevel, Self::FewestQuanta];

    /// In words.
    pub fn name(self) -> &'static str {
        match self {
            Self::NearestSum => "nearest plain sum",
            Self::NearestLevel => "nearest level, constants included",
            Self::FewestQuanta => "fewest quanta within 60 cm-1",
        }
    }

    /// Its pick for a band at `y` cm⁻¹.
    pub fn pick(self, sample: &Sample, y: f64) -> Option<usize> {
        let list = sample.candidates.iter().enumerate();
        let distance = |c: &super::candidate::Candidate| (c.mean - y).abs();
        match self {
            Self::NearestLevel => list.min_by(|a, b| distance(a.1).total_cmp(&distance(b.1))).map(|(i, _)| i),
            Self::NearestSum => {
                let sum = |c: &super::candidate::Candidate| -> f64 {
                    let nu = &sample.model.nu;
                    let parts = c.level.excitations().iter().map(|e| f64::from(e.quanta) * nu[usize::from(e.mode)]);
                    (parts.sum::<f64>() - y).abs()
                };
                list.min_by(|a, b| sum(a.1).total_cmp(&sum(b.1))).map(|(i, _)| i)
            }
            Self::FewestQuanta => list
                .filter(|(_, c)| distance(c) <= 60.0)
                .min_by(|a, b| a.1.level.order().cmp(&b.1.level.order()).then(distance(a.1).total_cmp(&distance(b.1))))
                .map(|(i, _)| i),
        }
    }
}

/// Level and family accuracy of a ranking made by hand, as (right levels, right families, bands).
pub fn by_hand(rule: ByHand, sample: &Sample) -> (usize, usize, usize) {
    let mut counts = (0, 0, 0);
    for (band, truth) in sample.bands.bands.iter().zip(&sample.truth) {
        let pick = rule.pick(sample, band.position.inverse_cm());
        let family = |i: usize| Family::of(&sample.table, &sample.candidates[i].level);
        counts.2 += 1;
        counts.0 += usize::from(pick == *truth);
        counts.1 += usize::from(pick.map(family) == truth.map(family));
    }
    counts
}
