//! The records that every format is a function of. Field names are the JSON contract.

use std::collections::BTreeMap;

use serde::{Deserialize, Serialize};

/// What a report says about the table it used.
#[derive(Clone, Debug, Default, PartialEq, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct TableSummary {
    /// Name.
    pub name: String,
    /// Title.
    pub title: String,
    /// Formula.
    pub formula: String,
    /// How it came to be: measured, computed, composed, invented.
    pub origin: String,
    /// Source.
    pub source: String,
    /// Point group that species refer to.
    pub point_group: Option<String>,
    /// Temperature of the numbers, K.
    pub temperature_k: Option<f64>,
    /// Number of modes.
    pub modes: usize,
    /// Caution for people who handle the substance.
    pub caution: Option<String>,
}

/// One constant behind a position.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct UsedConstant {
    /// `x(OHa,bend)`.
    pub quantity: String,
    /// Value, cm⁻¹.
    pub value_cm1: f64,
    /// One standard uncertainty, cm⁻¹.
    pub sigma_cm1: f64,
    /// given, defaulted, computed or transferred.
    pub origin: String,
}

/// Share of a zero-order level in a mixed one.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct Share {
    /// Zero-order level.
    pub label: String,
    /// Squared coefficient.
    pub share: f64,
}

/// One predicted level (or hot transition).
#[derive(Clone, Debug, Default, PartialEq, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct LevelRecord {
    /// Name: `2 OHa + bend`.
    pub label: String,
    /// Motions joined: `2 oh-stretch + hoh-bend`.
    pub family: String,
    /// Quanta by mode.
    pub quanta: BTreeMap<String, u8>,
    /// Total quanta.
    pub order: u32,
    /// Position, cm⁻¹ (vacuum).
    pub position_cm1: f64,
    /// One standard uncertainty, cm⁻¹.
    pub sigma_cm1: f64,
    /// Vacuum wavelength, µm.
    pub position_um: f64,
    /// Moieties with quanta.
    pub moieties: Vec<String>,
    /// Species content in the table's point group.
    pub species: Vec<String>,
    /// allowed, forbidden or unknown.
    pub ir: String,
    /// Why, where there is something to say.
    pub ir_reason: String,
    /// allowed, forbidden or unknown.
    pub raman: String,
    /// Expected strength, log₁₀ relative to the strongest fundamental of its kind.
    pub strength_log10: f64,
    /// One standard uncertainty of it, decades.
    pub strength_sigma: f64,
    /// strong, medium, weak or trace within this report.
    pub strength_class: String,
    /// Expected full width at half maximum, cm⁻¹.
    pub fwhm_cm1: f64,
    /// Initial level of a hot transition; empty from the ground level.
    #[serde(default, skip_serializing_if = "String::is_empty")]
    pub from: String,
    /// Shares of a mixed level; empty when it is not mixed.
    #[serde(default, skip_serializing_if = "Vec::is_empty")]
    pub shares: Vec<Share>,
    /// Constants behind the position.
    #[serde(default, skip_serializing_if = "Vec::is_empty")]
    pub constants: Vec<UsedConstant>,
}

/// A stretch of the spectrum where levels of one family cannot be told apart.
#[derive(Clone, Debug, Default, PartialEq, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct ExpectedWindow {
    /// Family: `oh-stretch + hoh-bend`.
    pub family: String,
    /// Moieties that carry it.
    pub moieties: Vec<String>,
    /// Low edge, cm⁻¹ (strength-weighted centre minus one uncertainty of the outermost levels).
    pub low_cm1: f64,
    /// High edge, cm⁻¹.
    pub high_cm1: f64,
    /// Position of the strongest level, cm⁻¹.
    pub centre_cm1: f64,
    /// Strength of the strongest level.
    pub strength_log10: f64,
    /// strong, medium, weak or trace within this report.
    pub strength_class: String,
    /// How many levels it holds.
    pub levels: usize,
}

/// What `predict` answers.
#[derive(Clone, Debug, Default, PartialEq, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct PredictReport {
    /// `bandwright/predict/1`.
    pub schema: String,
    /// The table.
    pub table: TableSummary,
    /// Window, cm⁻¹, ascending.
    pub window_cm1: (f64, f64),
    /// Most quanta.
    pub quanta: u8,
    /// Families by expected strength.
    pub windows: Vec<ExpectedWindow>,
    /// Levels by position.
    pub levels: Vec<LevelRecord>,
    /// Levels left out by a limit.
    pub left_out: usize,
    /// What to know.
    pub notes: Vec<String>,
}

/// One reason that moved a candidate's odds.
#[derive(Clone, Debug, Default, PartialEq, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct FactorRecord {
    /// One sentence.
    pub reason: String,
    /// log₁₀ of the factor.
    pub log10: f64,
}

/// A level offered for a band.
#[derive(Clone, Debug, Default, PartialEq, Serialize, Deserialize)]
pub struct CandidateRecord {
    /// The level.
    #[serde(flatten)]
    pub level: LevelRecord,
    /// Probability that it is the origin of the band.
    pub probability: f64,
    /// Observed minus predicted, cm⁻¹.
    pub offset_cm1: f64,
    /// What moved its odds.
    pub factors: Vec<FactorRecord>,
}

/// A family of candidates.
#[derive(Clone, Debug, Default, PartialEq, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct FamilyRecord {
    /// Motions with their counts.
    pub family: Vec<String>,
    /// Moieties that carry them, by formula.
    pub moieties: Vec<String>,
    /// Probability, summed over its levels.
    pub probability: f64,
    /// How many different sets of moieties carry it: on cooling the band can resolve into as many components.
    #[serde(default)]
    pub carriers: usize,
}

/// Probability that a band is none of the listed candidates.
#[derive(Clone, Copy, Debug, Default, PartialEq, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct OtherOriginRecord {
    /// Sum of the two.
    pub probability: f64,
    /// Another substance, an artefact, a mode the table lacks.
    pub foreign: f64,
    /// Higher or weaker levels of the table that were not listed.
    pub unlisted: f64,
}

/// Accidental matches.
#[derive(Clone, Debug, Default, PartialEq, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct ChanceRecord {
    /// Expected number of levels within the tolerance.
    pub expected: f64,
    /// Tolerance, cm⁻¹ (each side).
    pub tolerance_cm1: f64,
    /// Expected number weighted by the prior of visibility: the honest number of rivals.
    pub weighted: f64,
    /// By order: quanta → expected number.
    pub by_order: BTreeMap<String, f64>,
}

/// One band with its answer.
#[derive(Clone, Debug, Default, PartialEq, Serialize, Deserialize)]
pub struct BandRecord {
    /// Band id.
    pub band: String,
    /// Observed position, cm⁻¹ (vacuum).
    pub observed_cm1: f64,
    /// One standard uncertainty, cm⁻¹.
    pub sigma_cm1: f64,
    /// Observed vacuum wavelength, µm.
    pub observed_um: f64,
    /// Candidates, most probable first.
    pub candidates: Vec<CandidateRecord>,
    /// Families, most probable first.
    pub families: Vec<FamilyRecord>,
    /// None of them.
    pub other_origin: OtherOriginRecord,
    /// Expected accidental matches.
    pub chance_matches: ChanceRecord,
    /// secure, leading, open, no better than chance; then a sentence.
    pub verdict: String,
    /// The sentence.
    pub verdict_reason: String,
}

/// The test of the whole list against chance.
#[derive(Clone, Debug, Default, PartialEq, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct CoincidenceRecord {
    /// p value.
    pub p_value: f64,
    /// Which null.
    pub null: String,
    /// Trials.
    pub trials: usize,
    /// Seed.
    pub seed: u64,
}

/// A mode (or constant) that the assignment moved.
#[derive(Clone, Debug, Default, PartialEq, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct UpdatedModeRecord {
    /// Mode id or `x(a,b)`.
    pub mode: String,
    /// Before, cm⁻¹.
    pub before_cm1: f64,
    /// Its standard uncertainty before, cm⁻¹.
    pub before_sigma_cm1: f64,
    /// After, cm⁻¹.
    pub after_cm1: f64,
    /// Standard uncertainty after, cm⁻¹.
    pub sigma_cm1: f64,
    /// Whether it moved by more than two of its standard uncertainties.
    pub flagged: bool,
}

/// A strong prediction that was not seen.
#[derive(Clone, Debug, Default, PartialEq, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct MissingRecord {
    /// Level.
    pub label: String,
    /// Position, cm⁻¹.
    pub position_cm1: f64,
    /// Its standard uncertainty, cm⁻¹.
    pub sigma_cm1: f64,
    /// Probability that it would have been seen.
    pub probability: f64,
}

/// What `assign` answers.
#[derive(Clone, Debug, Default, PartialEq, Serialize, Deserialize)]
pub struct AssignReport {
    /// `bandwright/assign/1`.
    pub schema: String,
    /// The table.
    pub table: TableSummary,
    /// Name of the band list.
    pub bands_from: String,
    /// Sample as written there.
    pub sample: String,
    /// Most quanta.
    pub quanta: u8,
    /// How the ranking was made.
    pub method: String,
    /// The bands in file order.
    pub bands: Vec<BandRecord>,
    /// The list against chance.
    pub coincidence: CoincidenceRecord,
    /// What moved.
    pub updated_modes: Vec<UpdatedModeRecord>,
    /// Strong predictions that were not seen.
    pub missing: Vec<MissingRecord>,
    /// Variance inflation kappa.
    pub inflation: f64,
    /// Sampler's error of probabilities.
    pub error_bar: f64,
    /// log₁₀ evidence of the list.
    pub log10_evidence: f64,
    /// What to know.
    pub notes: Vec<String>,
}
