//! From answers to records.

use std::collections::BTreeMap;

use itertools::Itertools;

use super::report::{
    AssignReport, BandRecord, CandidateRecord, ChanceRecord, CoincidenceRecord, ExpectedWindow, FactorRecord,
    FamilyRecord, LevelRecord, MissingRecord, OtherOriginRecord, PredictReport, Share, TableSummary, UpdatedModeRecord,
    UsedConstant,
};
use crate::assign::chance::Coincidence;
use crate::assign::joint::{BandAnswer, JointAnswer};
use crate::assign::single::Ranked;
use crate::assign::verdict::Verdict;
use crate::band::{Band, BandList};
use crate::enumerate::prediction::{Predicted, family, family_text};
use crate::level::Level;
use crate::mode::{ModeTable, TableOrigin};
use crate::note::Note;
use crate::physics::position::{Model, Parameter};
use crate::physics::strength;

/// The summary of a table.
pub fn summary(table: &ModeTable) -> TableSummary {
    TableSummary {
        name: table.name.clone(),
        title: table.title.clone(),
        formula: table.formula.clone(),
        origin: match table.origin {
            TableOrigin::Measured => "measured",
            TableOrigin::Computed => "computed",
            TableOrigin::Composed => "composed",
            TableOrigin::Invented => "invented",
        }
        .to_owned(),
        source: table.source.clone(),
        point_group: table.point_group.clone(),
        temperature_k: table.temperature,
        modes: table.modes.len(),
        caution: table.caution.clone(),
    }
}

/// The constants behind a level's position.
pub fn used_constants(table: &ModeTable, model: &Model, level: &Level) -> Vec<UsedConstant> {
    let id = |index: usize| table.modes[index].id.as_str();
    model
        .gradient(level)
        .into_iter()
        .filter_map(|(parameter, _)| {
            let (quantity, sourced) = match parameter {
                Parameter::Nu(_) | Parameter::Resonance(_) => return None,
                Parameter::X(i, j) => (format!("x({},{})", id(j), id(i)), model.x(i, j)),
                Parameter::G(i) => (format!("g({})", id(i)), model.g[i].as_ref()?),
            };
            Some(UsedConstant {
                quantity,
                value_cm1: sourced.value,
                sigma_cm1: sourced.sigma,
                origin: format!("{:?}", sourced.origin).to_lowercase(),
            })
        })
        .collect()
}

/// The record of one predicted transition; its class is set by [`classify`].
pub fn level_record(table: &ModeTable, model: &Model, p: &Predicted) -> LevelRecord {
    let mut moieties: Vec<usize> =
        p.level.excitations().iter().map(|e| table.modes[usize::from(e.mode)].moiety).collect();
    moieties.sort_unstable();
    moieties.dedup();
    LevelRecord {
        label: p.level.label(table),
        family: family_text(&family(table, &p.level)),
        quanta: quanta(table, &p.level),
        order: p.level.order(),
        position_cm1: p.position,
        sigma_cm1: p.variance.sqrt(),
        position_um: 1.0e4 / p.position,
        moieties: moieties.into_iter().map(|m| table.moieties[m].name.clone()).collect(),
        species: p.species.iter().map(|(name, n)| if *n == 1 { name.clone() } else { format!("{n}{name}") }).collect(),
        ir: p.infrared.word().to_owned(),
        ir_reason: p.reason.clone().into_owned(),
        raman: p.raman.word().to_owned(),
        strength_log10: p.strength.log10,
        strength_sigma: p.strength.sigma,
        strength_class: String::new(),
        fwhm_cm1: p.width,
        from: p.from.as_ref().map_or_else(String::new, |from| from.label(table)),
        shares: p.shares.iter().map(|(level, share)| Share { label: level.label(table), share: *share }).collect(),
        constants: used_constants(table, model, &p.level),
    }
}

/// Quanta by mode id.
pub fn quanta(table: &ModeTable, level: &Level) -> BTreeMap<String, u8> {
    level.excitations().iter().map(|e| (table.modes[usize::from(e.mode)].id.clone(), e.quanta)).collect()
}

/// Gives every level its strength class, relative to the strongest of the list.
pub fn classify(levels: &mut [LevelRecord]) {
    let strongest = levels.iter().map(|l| l.strength_log10).fold(f64::NEG_INFINITY, f64::max);
    for level in levels {
        level.strength_class = strength::class(level.strength_log10 - strongest).to_owned();
    }
}

/// Merges levels of one family on the same kinds of moiety that cannot be told apart: neighbours closer than the sum
/// of their uncertainties and a quarter of their widths run together. Levels more than two decades below the strongest
/// of their window do not stretch it.
pub fn windows(levels: &[LevelRecord]) -> Vec<ExpectedWindow> {
    let formula = |name: &String| name.split(['-', '_', '#', ' ', '(']).next().unwrap_or(name).to_owned();
    let mut groups: BTreeMap<(String, Vec<String>), Vec<&LevelRecord>> = BTreeMap::new();
    for level in levels.iter().filter(|l| l.from.is_empty()) {
        let moieties = level.moieties.iter().map(formula).sorted().dedup().collect();
        groups.entry((level.family.clone(), moieties)).or_default().push(level);
    }
    let mut list = Vec::new();
    for ((family, moieties), mut members) in groups {
        members.sort_by(|a, b| a.position_cm1.total_cmp(&b.position_cm1));
        let mut start = 0;
        for at in 1..=members.len() {
            let apart = at == members.len() || {
                let (a, b) = (members[at - 1], members[at]);
                let reach = a.sigma_cm1 + b.sigma_cm1 + 0.25 * (a.fwhm_cm1 + b.fwhm_cm1);
                b.position_cm1 - a.position_cm1 > reach
            };
            if !apart {
                continue;
            }
            let run = &members[start..at];
            start = at;
            let Some(best) = run.iter().max_by(|a, b| {
                a.strength_log10.total_cmp(&b.strength_log10).then(b.position_cm1.total_cmp(&a.position_cm1))
            }) else {
                continue;
            };
            let seen = run.iter().filter(|l| l.strength_log10 > best.strength_log10 - 2.0);
            let low = seen.clone().map(|l| l.position_cm1 - l.sigma_cm1).fold(f64::INFINITY, f64::min);
            let high = seen.map(|l| l.position_cm1 + l.sigma_cm1).fold(0.0, f64::max);
            list.push(ExpectedWindow {
                family: family.clone(),
                moieties: moieties.clone(),
                low_cm1: low.max(1.0),
                high_cm1: high,
                centre_cm1: best.position_cm1,
                strength_log10: best.strength_log10,
                strength_class: String::new(),
                levels: run.len(),
            });
        }
    }
    list.sort_by(|a, b| b.strength_log10.total_cmp(&a.strength_log10).then(a.centre_cm1.total_cmp(&b.centre_cm1)));
    let strongest = list.first().map_or(0.0, |w| w.strength_log10);
    for window in &mut list {
        window.strength_class = strength::class(window.strength_log10 - strongest).to_owned();
    }
    list
}

/// The report of `predict`.
pub fn predict_report(
    table: &ModeTable,
    model: &Model,
    window: (f64, f64),
    quanta: u8,
    predicted: &[Predicted],
    notes: &[Note],
) -> PredictReport {
    let mut levels: Vec<LevelRecord> = predicted.iter().map(|p| level_record(table, model, p)).collect();
    classify(&mut levels);
    PredictReport {
        schema: "bandwright/predict/1".to_owned(),
        table: summary(table),
        window_cm1: window,
        quanta,
        windows: windows(&levels),
        levels,
        left_out: 0,
        notes: notes.iter().map(|n| n.0.clone()).collect(),
    }
}

/// The report of `assign` from bands ranked one by one.
pub fn assign_report(input: &AssignInput<'_>, ranked: &[Ranked], notes: &[Note]) -> AssignReport {
    let AssignInput { table, model, bands, quanta: most_quanta, predicted, top } = *input;
    let records = bands.bands.iter().zip(ranked).map(|(band, answer)| {
        let mut families: BTreeMap<(Vec<String>, Vec<String>), f64> = BTreeMap::new();
        // Offers below this cannot show in any digit, and large tables have tens of thousands of them.
        for offer in answer.offers.iter().filter(|o| o.probability > 1.0e-15) {
            *families.entry(family_key(table, &predicted[offer.level].level)).or_default() += offer.probability;
        }
        let mut families: Vec<FamilyRecord> = families
            .into_iter()
            .map(|((family, moieties), probability)| FamilyRecord {
                carriers: carriers(
                    table,
                    answer.offers.iter().take(200).map(|o| &predicted[o.level].level),
                    &family,
                    &moieties,
                ),
                family,
                moieties,
                probability,
            })
            .collect();
        families.sort_by(|a, b| {
            b.probability
                .total_cmp(&a.probability)
                .then_with(|| (&a.family, &a.moieties).cmp(&(&b.family, &b.moieties)))
        });
        let mut levels: Vec<LevelRecord> =
            answer.offers.iter().take(top).map(|o| level_record(table, model, &predicted[o.level])).collect();
        classify(&mut levels);
        let candidates = levels
            .into_iter()
            .zip(&answer.offers)
            .map(|(level, offer)| CandidateRecord {
                offset_cm1: band.position.inverse_cm() - level.position_cm1,
                level,
                probability: offer.probability,
                factors: offer
                    .factors
                    .iter()
                    .map(|f| FactorRecord { reason: f.reason.clone(), log10: f.log10 })
                    .collect(),
            })
            .collect();
        let leading = families.first().map_or(0.0, |f| f.probability);
        let word = Verdict::of(leading, answer.foreign, answer.chance.weighted, None).word();
        let reason = verdict_sentence(families.first(), answer.chance.expected(), answer.chance.weighted, None);
        BandRecord {
            band: band.id.clone(),
            observed_cm1: band.position.inverse_cm(),
            sigma_cm1: band.sigma,
            observed_um: band.position.vacuum_micrometres(),
            candidates,
            families,
            other_origin: OtherOriginRecord { probability: answer.foreign, foreign: answer.foreign, unlisted: 0.0 },
            chance_matches: ChanceRecord {
                expected: answer.chance.expected(),
                tolerance_cm1: answer.chance.tolerance,
                weighted: answer.chance.weighted,
                by_order: answer.chance.by_order.iter().map(|(order, n)| (order.to_string(), *n)).collect(),
            },
            verdict: word.to_owned(),
            verdict_reason: reason,
        }
    });
    AssignReport {
        schema: "bandwright/assign/1".to_owned(),
        table: summary(table),
        bands_from: bands.name.clone(),
        sample: bands.sample.clone(),
        quanta: most_quanta,
        method: "each band by itself: position, expected strength against the matched detection limit, other origin"
            .to_owned(),
        bands: records.collect(),
        inflation: 1.0,
        notes: notes.iter().map(|n| n.0.clone()).collect(),
        ..AssignReport::default()
    }
}

/// The family of a level as records name it: motions with counts, formulas of moieties.
pub fn family_key(table: &ModeTable, level: &Level) -> (Vec<String>, Vec<String>) {
    let motions = family(table, level)
        .iter()
        .map(|(motion, n)| if *n == 1 { motion.name().to_owned() } else { format!("{n} {motion}") })
        .collect();
    let moieties = level
        .excitations()
        .iter()
        .map(|e| table.moiety_of(usize::from(e.mode)).formula().to_owned())
        .sorted()
        .dedup()
        .collect();
    (motions, moieties)
}

/// What a report of `assign` is made from, besides the answer.
pub struct AssignInput<'a> {
    /// The table.
    pub table: &'a ModeTable,
    /// Its model.
    pub model: &'a Model,
    /// The bands.
    pub bands: &'a BandList,
    /// Most quanta.
    pub quanta: u8,
    /// Transitions, one a candidate.
    pub predicted: &'a [Predicted],
    /// Candidates listed per band.
    pub top: usize,
}

/// The report of `assign` from a joint answer.
pub fn joint_report(
    input: &AssignInput<'_>,
    answer: &JointAnswer,
    coincidence: Option<&Coincidence>,
    notes: &[Note],
) -> AssignReport {
    let AssignInput { table, model, bands, quanta, predicted, top } = *input;
    let list_p = coincidence.map(|c| c.p_value);
    let record = |(band, found): (&Band, &BandAnswer)| {
        let mut levels: Vec<LevelRecord> =
            found.candidates.iter().take(top).map(|c| level_record(table, model, &predicted[c.candidate])).collect();
        classify(&mut levels);
        let candidates = levels
            .into_iter()
            .zip(&found.candidates)
            .map(|(level, c)| CandidateRecord {
                level,
                probability: c.probability,
                offset_cm1: c.offset_cm1,
                factors: c.factors.iter().map(joint_factor).collect(),
            })
            .collect();
        let families: Vec<FamilyRecord> = found
            .families
            .iter()
            .map(|f| {
                let (family, moieties) = grouped(&f.family, &f.moieties);
                FamilyRecord {
                    carriers: carriers(table, found.candidates.iter().map(|c| &c.level), &family, &moieties),
                    family,
                    moieties,
                    probability: f.probability,
                }
            })
            .collect();
        // Families too improbable to be told one by one are levels that are not listed.
        let told: f64 = families.iter().map(|f| f.probability).sum();
        let foreign = found.other_origin.foreign;
        let unlisted = (1.0 - told - foreign).max(0.0);
        let leading = families.first().map_or(0.0, |f| f.probability);
        let chance = &found.chance_matches;
        let word = Verdict::of(leading, foreign + unlisted, chance.weighted, list_p).word();
        let tolerance = 2.0 * found.candidates.first().map_or(band.sigma, |c| c.position_sigma_cm1.hypot(band.sigma));
        BandRecord {
            band: band.id.clone(),
            observed_cm1: band.position.inverse_cm(),
            sigma_cm1: band.sigma,
            observed_um: band.position.vacuum_micrometres(),
            candidates,
            verdict: word.to_owned(),
            verdict_reason: verdict_sentence(families.first(), chance.expected, chance.weighted, list_p),
            families,
            other_origin: OtherOriginRecord { probability: foreign + unlisted, foreign, unlisted },
            chance_matches: ChanceRecord {
                expected: chance.expected,
                tolerance_cm1: tolerance,
                weighted: chance.weighted,
                by_order: chance.by_order.iter().map(|(order, n)| (order.to_string(), *n)).collect(),
            },
        }
    };
    AssignReport {
        schema: "bandwright/assign/1".to_owned(),
        table: summary(table),
        bands_from: bands.name.clone(),
        sample: bands.sample.clone(),
        quanta,
        method:
            "all bands jointly: positions move fundamentals and constants, a level explains at most one band, strength \
                 models and inflated uncertainties are averaged over"
                .to_owned(),
        bands: bands.bands.iter().zip(&answer.bands).map(record).collect(),
        coincidence: coincidence.map_or_else(CoincidenceRecord::default, |c| CoincidenceRecord {
            p_value: c.p_value,
            null: c.null.clone(),
            trials: c.trials,
            seed: c.seed,
        }),
        updated_modes: answer
            .updated
            .iter()
            .map(|u| UpdatedModeRecord {
                mode: u.name.clone(),
                before_cm1: u.before_cm1,
                before_sigma_cm1: u.before_sigma_cm1,
                after_cm1: u.after_cm1,
                sigma_cm1: u.sigma_cm1,
                flagged: u.suspicious,
            })
            .collect(),
        missing: answer
            .missing
            .iter()
            .map(|m| MissingRecord {
                label: m.label.clone(),
                position_cm1: m.position_cm1,
                sigma_cm1: m.sigma_cm1,
                probability: m.expected,
            })
            .collect(),
        inflation: answer.inflation,
        error_bar: answer.error_bar,
        log10_evidence: answer.log10_evidence,
        notes: notes.iter().chain(&answer.notes).map(|n| n.0.clone()).collect(),
    }
}

fn joint_factor(factor: &crate::assign::witness::Factor) -> FactorRecord {
    FactorRecord { reason: factor.reason.clone(), log10: factor.log10 }
}

/// Motions with counts and moieties, each once.
fn grouped(motions: &[&'static str], moieties: &[String]) -> (Vec<String>, Vec<String>) {
    let counted = motions
        .iter()
        .dedup_with_count()
        .map(|(n, motion)| if n == 1 { (*motion).to_owned() } else { format!("{n} {motion}") });
    (counted.collect(), moieties.iter().cloned().sorted().dedup().collect())
}

/// The sentence beside a verdict.
fn verdict_sentence(leading: Option<&FamilyRecord>, expected: f64, weighted: f64, list_p: Option<f64>) -> String {
    let Some(f) = leading else {
        return "no level of the table comes near; another substance, an artefact, or more quanta".to_owned();
    };
    let list = list_p.map_or(String::new(), |p| format!("; p of the whole list against chance {p:.3}"));
    format!(
        "{} on {} has {:.2}; {expected:.1} sums meet this position by chance, {weighted:.2} of them strong enough to be \
         seen{list}",
        f.family.join(" + "),
        f.moieties.join(", "),
        f.probability
    )
}

/// How many different sets of moieties carry a family among the levels offered for a band.
fn carriers<'l>(
    table: &ModeTable,
    levels: impl Iterator<Item = &'l Level>,
    motions: &[String],
    formulas: &[String],
) -> usize {
    levels
        .filter(|level| {
            let (m, f) = family_key(table, level);
            m == motions && f == formulas
        })
        .map(|level| {
            let moieties = level.excitations().iter().map(|e| table.modes[usize::from(e.mode)].moiety);
            moieties.sorted().dedup().collect::<Vec<_>>()
        })
        .unique()
        .count()
}
