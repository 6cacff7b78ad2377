//! The ranking: every band's families and candidates with honest probabilities.

use std::collections::BTreeMap;

use serde::Serialize;

use super::candidate::{Candidate, Family};
use super::chance::{ExpectedMatches, expected_matches};
use super::kernel::{log_normal, log_sum};
use super::offers::{Weighed, Weighing, noticed, parameter_label, weigh};
use super::problem::Shares;
use super::sampler::{Effort, Population, sample};
use super::witness::{Factor, Witness};
use crate::band::BandList;
use crate::level::Level;
use crate::mode::{ModeIndex, ModeTable};
use crate::note::Note;
use crate::physics::position::{Model, Parameter};

/// Everything that can be chosen about a ranking.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct JointOptions {
    /// How long to sample.
    pub effort: Effort,
    /// How to weigh.
    pub weighing: Weighing,
}

/// The answer for a list of bands.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct JointAnswer {
    /// One a band, in the order of the list.
    pub bands: Vec<BandAnswer>,
    /// log₁₀ of the evidence of the table: all assignments, strength models and missing bands together.
    pub log10_evidence: f64,
    /// Fundamentals and constants after the assignment.
    pub updated: Vec<Updated>,
    /// Posterior mean of the factor on the table's uncertainties.
    pub inflation: f64,
    /// Error of the sampler: the largest change of a family's probability between half-populations, halved.
    pub error_bar: f64,
    /// Levels that should have been seen in the range and were not, most surprising first.
    pub missing: Vec<Missing>,
    /// What to know.
    pub notes: Vec<Note>,
    /// Measured range used, cm⁻¹.
    pub range: (f64, f64),
}

/// The answer for one band.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct BandAnswer {
    /// Name of the band.
    pub band: String,
    /// Observed position, cm⁻¹.
    pub observed_cm1: f64,
    /// Its uncertainty, cm⁻¹.
    pub sigma_cm1: f64,
    /// Families, most probable first.
    pub families: Vec<FamilyAnswer>,
    /// Candidates, most probable first.
    pub candidates: Vec<CandidateAnswer>,
    /// Everything else.
    pub other_origin: OtherOrigin,
    /// Probability that the position is off by more than its uncertainty says (an unmodelled resonance).
    pub heavy_tail: f64,
    /// Accidental matches to be expected.
    pub chance_matches: ExpectedMatches,
}

/// One family of one band.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct FamilyAnswer {
    /// Motions, one a quantum.
    pub family: Vec<&'static str>,
    /// Formulas of the moieties.
    pub moieties: Vec<String>,
    /// Name for people.
    pub label: String,
    /// Probability.
    pub probability: f64,
    /// The family itself.
    #[serde(skip)]
    pub key: Family,
}

/// One candidate of one band.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct CandidateAnswer {
    /// Number in the list of candidates that was given.
    #[serde(skip)]
    pub candidate: usize,
    /// The level.
    #[serde(skip)]
    pub level: Level,
    /// Its name.
    pub label: String,
    /// Name of its family.
    pub family: String,
    /// Total quanta.
    pub order: u32,
    /// Position before any assignment, cm⁻¹.
    pub position_cm1: f64,
    /// Its uncertainty, cm⁻¹.
    pub position_sigma_cm1: f64,
    /// Observed minus predicted, cm⁻¹.
    pub offset_cm1: f64,
    /// Probability.
    pub probability: f64,
    /// Expected strength above the detection limit, decades, averaged over strength models.
    pub strength_log10: f64,
    /// Why, each relative to a foreign origin.
    pub factors: Vec<Factor>,
}

/// Probability that no listed candidate is right.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct OtherOrigin {
    /// All of it.
    pub probability: f64,
    /// Another substance, an artefact, a level beyond the quanta looked at.
    pub foreign: f64,
    /// Levels of this table that were too improbable to be listed one by one.
    pub unlisted: f64,
    /// What companions say about it.
    pub factors: Vec<Factor>,
}

/// A fundamental or constant before and after.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct Updated {
    /// Name: the mode's id for a fundamental, `x(a, b)` for a constant.
    pub name: String,
    /// The mode, for a fundamental.
    #[serde(skip)]
    pub mode: Option<ModeIndex>,
    /// Value before, cm⁻¹.
    pub before_cm1: f64,
    /// Its uncertainty, cm⁻¹.
    pub before_sigma_cm1: f64,
    /// Value after, cm⁻¹.
    pub after_cm1: f64,
    /// Its uncertainty, cm⁻¹.
    pub sigma_cm1: f64,
    /// Moved by more than two of its uncertainties: the table or an assignment is wrong.
    pub suspicious: bool,
}

/// A level that should have been seen.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct Missing {
    /// Number in the list of candidates that was given.
    #[serde(skip)]
    pub candidate: usize,
    /// The level's name.
    pub label: String,
    /// Name of its family.
    pub family: String,
    /// Position, cm⁻¹.
    pub position_cm1: f64,
    /// Its uncertainty, cm⁻¹.
    pub sigma_cm1: f64,
    /// Probability that it would have been seen apart from all listed bands.
    pub expected: f64,
}

/// Candidates with a smaller probability are not told one by one.
const TOLD: f64 = 1.0e-4;

/// Ranks `candidates` for every band of `bands`, jointly.
///
/// # Units and shapes
/// `candidates`: all levels near and inside the measured range, each once; positions in cm⁻¹. `witnesses` speak about
/// bands by their place in the list.
/// # Method
/// Weights: [`super::problem`]; expected strength: [`super::prior`]; sampling: [`super::sampler`].
pub fn assign(
    model: &Model,
    table: &ModeTable,
    candidates: &[Candidate],
    bands: &BandList,
    witnesses: &[&dyn Witness],
    options: &JointOptions,
) -> JointAnswer {
    let weighed = weigh(model, table, candidates, bands, witnesses, &options.weighing);
    let population = sample(&weighed.problem, &options.effort);
    tell(model, table, candidates, bands, &weighed, &population)
}

/// Sums of probabilities by family, most probable first.
fn families(
    table: &ModeTable,
    candidates: &[Candidate],
    weighed: &Weighed,
    band: usize,
    shares: &Shares,
) -> Vec<(Family, f64)> {
    let mut sums: BTreeMap<Family, f64> = BTreeMap::new();
    for (offer, p) in weighed.problem.targets[band].offers.iter().zip(&shares.offers) {
        *sums.entry(Family::of(table, &candidates[offer.candidate].level)).or_default() += p;
    }
    let mut list: Vec<(Family, f64)> = sums.into_iter().collect();
    list.sort_by(|a, b| b.1.total_cmp(&a.1).then(a.0.cmp(&b.0)));
    list
}

fn tell(
    model: &Model,
    table: &ModeTable,
    candidates: &[Candidate],
    bands: &BandList,
    weighed: &Weighed,
    population: &Population,
) -> JointAnswer {
    let problem = &weighed.problem;
    let mut error_bar: f64 = 0.0;
    let mut answers = Vec::with_capacity(bands.bands.len());
    let mut assigned: BTreeMap<usize, f64> = BTreeMap::new();
    for (b, band) in bands.bands.iter().enumerate() {
        let shares = &population.shares[b];
        let list = families(table, candidates, weighed, b, shares);
        let half: Vec<BTreeMap<Family, f64>> = population
            .halves
            .iter()
            .map(|h| families(table, candidates, weighed, b, &h[b]).into_iter().collect())
            .collect();
        for (family, _) in &list {
            let change = half[0].get(family).unwrap_or(&0.0) - half[1].get(family).unwrap_or(&0.0);
            error_bar = error_bar.max(0.5 * change.abs());
        }
        let mut order: Vec<usize> = (0..shares.offers.len()).collect();
        order.sort_by(|&i, &j| shares.offers[j].total_cmp(&shares.offers[i]).then(i.cmp(&j)));
        for (offer, p) in problem.targets[b].offers.iter().zip(&shares.offers) {
            *assigned.entry(offer.candidate).or_default() += p;
        }
        let told = order.iter().filter(|&&i| shares.offers[i] >= TOLD);
        let candidate_answers = told.map(|&i| candidate_answer(table, candidates, weighed, population, b, i)).collect();
        let told_families = list.into_iter().filter(|(_, p)| *p >= TOLD).map(|(key, probability)| FamilyAnswer {
            family: key.motions(),
            moieties: key.moieties(),
            label: key.label(),
            probability,
            key,
        });
        answers.push(BandAnswer {
            band: band.id.clone(),
            observed_cm1: band.position.inverse_cm(),
            sigma_cm1: band.sigma,
            families: told_families.collect(),
            candidates: candidate_answers,
            other_origin: OtherOrigin {
                probability: shares.foreign + shares.unlisted,
                foreign: shares.foreign,
                unlisted: shares.unlisted,
                factors: weighed.other_factors[b].clone(),
            },
            heavy_tail: population.heavy[b],
            chance_matches: expected_matches(weighed, &population.models, band.position.inverse_cm(), band.sigma),
        });
    }
    let inflation = problem.inflations.iter().zip(&population.inflations).map(|((k, _), p)| k * p).sum();
    let updated = updated(model, table, weighed, population);
    let mut notes = Vec::new();
    if inflation > 2.0 {
        notes.push(Note::new(format!(
            "the table's uncertainties look too small: the bands ask for about {inflation:.1} times as much"
        )));
    }
    let suspicious: Vec<&str> = updated.iter().filter(|u| u.suspicious).map(|u| u.name.as_str()).collect();
    if !suspicious.is_empty() {
        notes.push(Note::new(format!(
            "moved by more than two of its uncertainties: {}; the table or an assignment is doubtful",
            suspicious.join(", ")
        )));
    }
    if error_bar > 0.05 {
        notes.push(Note::new(format!(
            "the sampler's own error is {error_bar:.2} in the worst family; more particles make it smaller"
        )));
    }
    JointAnswer {
        bands: answers,
        log10_evidence: population.log_z / std::f64::consts::LN_10,
        updated,
        inflation,
        error_bar,
        missing: missing(table, candidates, weighed, population, &assigned),
        notes,
        range: weighed.range,
    }
}

fn candidate_answer(
    table: &ModeTable,
    candidates: &[Candidate],
    weighed: &Weighed,
    population: &Population,
    band: usize,
    number: usize,
) -> CandidateAnswer {
    let problem = &weighed.problem;
    let target = &problem.targets[band];
    let offer = &target.offers[number];
    let level = &weighed.levels[offer.candidate];
    let shares = &population.shares[band];
    let ten = std::f64::consts::LN_10;
    let sigma = (offer.shared + offer.private).sqrt();
    let places = problem.inflations.iter().flat_map(|&(kappa, a)| {
        problem.tails.iter().map(move |&(tail, b)| {
            let variance = kappa * kappa * offer.shared + offer.private + tail * tail * target.variance;
            (a * b).ln() + log_normal(offer.residual, variance)
        })
    });
    let position = (log_sum(places) - problem.foreign_density.ln()) / ten;
    let said: f64 = weighed.factors[band][number].iter().map(|f| f.log10).sum();
    let said_other: f64 = weighed.other_factors[band].iter().map(|f| f.log10).sum();
    let fits = population.models.iter().zip(&offer.fit).map(|(p, f)| p.max(1.0e-300).ln() + f);
    let strength = log_sum(fits) / ten - said - (target.foreign / ten - said_other);
    let above: f64 =
        weighed.visibilities.iter().zip(&population.models).map(|(v, p)| p * (v.strength(level.steps) - v.limit)).sum();
    let mut factors = vec![
        Factor {
            reason: format!(
                "{:+.0} cm-1 from {:.0} +- {:.0} against a band anywhere",
                offer.residual, level.mean, sigma
            ),
            log10: position,
        },
        Factor {
            reason: format!(
                "expected {:.1} decades {} the detection limit",
                above.abs(),
                if above >= 0.0 { "above" } else { "below" }
            ),
            log10: strength,
        },
    ];
    factors.extend(weighed.factors[band][number].iter().cloned());
    let total = (shares.offers[number].max(1.0e-300) / shares.foreign.max(1.0e-300)).log10();
    factors.push(Factor {
        reason: "the other bands, assigned together with this one".to_owned(),
        log10: total + said_other - position - strength - said,
    });
    let candidate = &candidates[offer.candidate];
    CandidateAnswer {
        candidate: offer.candidate,
        level: candidate.level.clone(),
        label: candidate.level.label(table),
        family: Family::of(table, &candidate.level).label(),
        order: candidate.level.order(),
        position_cm1: level.mean,
        position_sigma_cm1: sigma,
        offset_cm1: offer.residual,
        probability: shares.offers[number],
        strength_log10: above,
        factors,
    }
}

fn updated(model: &Model, table: &ModeTable, weighed: &Weighed, population: &Population) -> Vec<Updated> {
    let mut list: Vec<(Parameter, Updated)> = Vec::new();
    for (&parameter, &(mean, square)) in weighed.numbers.list().iter().zip(&population.parameters) {
        let sigma = model.sigma(parameter);
        if sigma == 0.0 {
            continue;
        }
        let spread = (square - mean * mean).max(0.0).sqrt();
        let fundamental = matches!(parameter, Parameter::Nu(_));
        // A constant the bands say nothing about is not worth a line.
        if !fundamental && mean.abs() < 0.1 && (spread - 1.0).abs() < 0.1 {
            continue;
        }
        let before = model.value(parameter);
        list.push((
            parameter,
            Updated {
                name: parameter_label(table, parameter),
                mode: if let Parameter::Nu(i) = parameter { Some(i) } else { None },
                before_cm1: before,
                before_sigma_cm1: sigma,
                after_cm1: before + mean * sigma,
                sigma_cm1: spread * sigma,
                suspicious: mean.abs() > 2.0,
            },
        ));
    }
    list.sort_by_key(|(parameter, _)| *parameter);
    list.into_iter().map(|(_, u)| u).collect()
}

/// Most missing levels told.
const MOST_MISSING: usize = 30;

fn missing(
    table: &ModeTable,
    candidates: &[Candidate],
    weighed: &Weighed,
    population: &Population,
    assigned: &BTreeMap<usize, f64>,
) -> Vec<Missing> {
    let mut list: Vec<(f64, usize)> = Vec::new();
    for (i, level) in weighed.levels.iter().enumerate() {
        if level.mean < weighed.range.0 || level.mean >= weighed.range.1 || level.hidden > 0.5 {
            continue;
        }
        let seen: f64 = weighed.visibilities.iter().zip(&population.models).map(|(v, p)| p * v.seen(level.steps)).sum();
        let expected = noticed(seen, level.hidden);
        if expected > 0.5 && assigned.get(&i).is_none_or(|p| *p < 0.5) {
            list.push((expected, i));
        }
    }
    list.sort_by(|a, b| b.0.total_cmp(&a.0).then(a.1.cmp(&b.1)));
    list.truncate(MOST_MISSING);
    list.into_iter()
        .map(|(expected, i)| Missing {
            candidate: i,
            label: candidates[i].level.label(table),
            family: Family::of(table, &candidates[i].level).label(),
            position_cm1: weighed.levels[i].mean,
            sigma_cm1: (weighed.levels[i].shared + weighed.levels[i].private).sqrt(),
            expected,
        })
        .collect()
}
