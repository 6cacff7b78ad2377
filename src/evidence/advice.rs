//! Which measurement tells the candidates of a band apart.
//!
//! # Method
//! For hypotheses h with weights w and outcome laws P(o|h), the expected information is
//!
//! ```text
//! I = Σ_h w_h Σ_o P(o|h) log₂ [P(o|h) / P(o)]
//! ```
//!
//! (Lindley 1956, from memory). A reading is "not found" with probability 1 − q_h or a number N(mean_h, sd_h²); the
//! one-dimensional mixture is integrated on 400 points over ± 5 standard deviations. Hypotheses are the families of the
//! band, each through its most probable level, and other origin. Outcome laws beyond position and presence are judgement.

use std::collections::BTreeSet;

use serde::Serialize;

use super::companion::{exchanged_place, found, level_ratio};
use crate::assign::candidate::Candidate;
use crate::assign::joint::BandAnswer;
use crate::assign::kernel::normal_cdf;
use crate::mode::{ModeTable, Motion};
use crate::physics::position::Model;

/// What one hypothesis predicts for a measurement: a reading, when there is one, with mean and standard deviation.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Law {
    /// Probability of a reading.
    pub found: f64,
    /// Its mean.
    pub mean: f64,
    /// Its standard deviation; zero when only presence is read.
    pub sd: f64,
}

/// Bits that a measurement with these outcome laws is expected to tell about hypotheses of these weights.
pub fn expected_information(weights: &[f64], laws: &[Law]) -> f64 {
    let total: f64 = weights.iter().sum();
    if total <= 0.0 {
        return 0.0;
    }
    let weights: Vec<f64> = weights.iter().map(|w| w / total).collect();
    let term = |p: f64, all: f64| if p > 0.0 && all > 0.0 { p * (p / all).log2() } else { 0.0 };
    let gone: f64 = weights.iter().zip(laws).map(|(w, l)| w * (1.0 - l.found)).sum();
    let mut bits: f64 = weights.iter().zip(laws).map(|(w, l)| w * term(1.0 - l.found, gone)).sum();
    if laws.iter().all(|l| l.sd == 0.0) {
        let there: f64 = weights.iter().zip(laws).map(|(w, l)| w * l.found).sum();
        bits += weights.iter().zip(laws).map(|(w, l)| w * term(l.found, there)).sum::<f64>();
        return bits;
    }
    let density = |l: &Law, x: f64| {
        let sd = l.sd.max(1.0);
        l.found * (-0.5 * ((x - l.mean) / sd).powi(2)).exp() / (sd * std::f64::consts::TAU.sqrt())
    };
    // Each hypothesis is integrated over its own peak: a common grid would be too coarse for narrow ones.
    for (w, l) in weights.iter().zip(laws) {
        let sd = l.sd.max(1.0);
        let step = 10.0 * sd / f64::from(POINTS);
        let sum: f64 = (0..POINTS)
            .map(|i| {
                let x = l.mean - 5.0 * sd + (f64::from(i) + 0.5) * step;
                let all: f64 = weights.iter().zip(laws).map(|(w, l)| w * density(l, x)).sum();
                term(density(l, x), all)
            })
            .sum();
        bits += w * sum * step;
    }
    bits.max(0.0)
}

const POINTS: u32 = 400;

/// What a measurement costs, in kind.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord, Serialize)]
#[serde(rename_all = "kebab-case")]
pub enum Cost {
    /// An hour with what a laboratory has.
    Small,
    /// A preparation or a cold stage.
    Medium,
    /// Enriched material or a grown crystal.
    Large,
}

/// A measurement that can be advised.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Serialize)]
#[serde(rename_all = "kebab-case")]
pub enum Measurement {
    /// Full exchange of hydrogen by deuterium.
    Deuteration,
    /// A few per cent of deuterium: isolated HDO.
    DiluteHdo,
    /// The salt without its water.
    Anhydrous,
    /// The hydrate of the same cation with another anion.
    OtherAnion,
    /// Water with oxygen-18.
    Oxygen18,
    /// Cooling to liquid nitrogen.
    Cooling,
    /// The Raman spectrum in the same range.
    Raman,
    /// A single crystal in polarised light.
    PolarisedCrystal,
}

impl Measurement {
    /// All of them.
    pub const ALL: [Self; 8] = [
        Self::Deuteration,
        Self::DiluteHdo,
        Self::Anhydrous,
        Self::OtherAnion,
        Self::Oxygen18,
        Self::Cooling,
        Self::Raman,
        Self::PolarisedCrystal,
    ];

    /// In words.
    pub fn name(self) -> &'static str {
        match self {
            Self::Deuteration => "deuteration (recrystallise from D2O)",
            Self::DiluteHdo => "isolated HDO (a few per cent D)",
            Self::Anhydrous => "the anhydrous salt",
            Self::OtherAnion => "the hydrate of another anion",
            Self::Oxygen18 => "oxygen-18 water",
            Self::Cooling => "cooling to 80 K",
            Self::Raman => "Raman spectrum of the same range",
            Self::PolarisedCrystal => "polarised light on a single crystal",
        }
    }

    /// What it costs.
    pub fn cost(self) -> Cost {
        match self {
            Self::Raman => Cost::Small,
            Self::Deuteration | Self::DiluteHdo | Self::Anhydrous | Self::OtherAnion | Self::Cooling => Cost::Medium,
            Self::Oxygen18 | Self::PolarisedCrystal => Cost::Large,
        }
    }

    /// Cautions for a salt with these moieties (formulas). Local rules and licensed practice always come first.
    pub fn caution(self, formulas: &[&str]) -> String {
        const OXIDISERS: [&str; 8] = ["ClO4", "ClO3", "NO3", "BrO3", "IO3", "MnO4", "NO2", "ClO2"];
        let oxidiser = formulas.iter().find(|f| OXIDISERS.iter().any(|o| f.starts_with(o)));
        let mut list: Vec<String> = Vec::new();
        if let Some(anion) = oxidiser {
            let heat = match self {
                Self::Anhydrous => {
                    "; drying it means heating an oxidiser: small amounts, behind a shield, never to decomposition"
                }
                Self::Raman => "; a focused laser heats: low power, no dark or organic support",
                _ => "",
            };
            list.push(format!(
                "{anion} is an oxidiser: keep it from organics, reducing agents and grinding with them{heat}"
            ));
        } else if self == Self::Anhydrous {
            list.push("heating a hydrate may spatter or melt it in its own water".to_owned());
        } else if self == Self::Raman {
            list.push("laser light: the eye protection of the instrument".to_owned());
        }
        match self {
            Self::Cooling => list.push(
                "liquid nitrogen: cold burns, loss of oxygen in closed rooms, no sealed vessels; hydrates may change phase or crack"
                    .to_owned(),
            ),
            Self::Anhydrous => list.push("check by weight that the water is gone: a lower hydrate is another substance".to_owned()),
            Self::Deuteration | Self::DiluteHdo => {
                list.push("moist air exchanges the deuterium back: a closed or purged cell".to_owned());
            }
            _ => {}
        }
        list.push("local rules and licensed practice come first".to_owned());
        list.join("; ")
    }
}

/// What one hypothesis predicts, in words.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct Outcome {
    /// Family, or `other origin`.
    pub candidate: String,
    /// What it predicts.
    pub predicts: String,
}

/// One measurement with what it is worth for a band.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct Advice {
    /// The measurement.
    pub measurement: Measurement,
    /// Its name.
    pub name: &'static str,
    /// Expected information about the family, bits.
    pub information_bits: f64,
    /// What the leading hypotheses predict.
    pub outcomes: Vec<Outcome>,
    /// Cost class.
    pub cost: Cost,
    /// Cautions.
    pub caution: String,
}

/// Hypotheses of one band, weighed.
struct Hypothesis {
    name: String,
    weight: f64,
    candidate: Option<Candidate>,
}

/// Advice for one band, most informative first; equal information by cost.
pub fn advise(model: &Model, table: &ModeTable, candidates: &[Candidate], answer: &BandAnswer) -> Vec<Advice> {
    let mut hypotheses: Vec<Hypothesis> = answer
        .families
        .iter()
        .map(|family| {
            let best = answer.candidates.iter().find(|c| c.family == family.label);
            let candidate = best.map(|b| candidates[b.candidate].clone());
            Hypothesis { name: family.label.clone(), weight: family.probability, candidate }
        })
        .filter(|h| h.candidate.is_some() && h.weight > 1.0e-3)
        .collect();
    let other =
        Hypothesis { name: "other origin".to_owned(), weight: answer.other_origin.probability, candidate: None };
    hypotheses.push(other);
    let weights: Vec<f64> = hypotheses.iter().map(|h| h.weight).collect();
    let formulas: BTreeSet<&str> = table.moieties.iter().map(|m| m.formula()).collect();
    let formulas: Vec<&str> = formulas.into_iter().collect();
    let hydrated = table.modes.iter().any(|m| m.motion == Motion::OhStretch);
    let anionic = table.modes.iter().any(|m| matches!(m.motion, Motion::XoStretch | Motion::OxoBend));
    let mut list: Vec<Advice> = Measurement::ALL
        .into_iter()
        .filter(|m| match m {
            Measurement::Anhydrous | Measurement::Deuteration | Measurement::DiluteHdo => hydrated,
            Measurement::OtherAnion => hydrated && anionic,
            _ => true,
        })
        .map(|measurement| {
            let laws: Vec<(Law, String)> =
                hypotheses.iter().map(|h| law(measurement, model, table, h.candidate.as_ref(), answer)).collect();
            let only: Vec<Law> = laws.iter().map(|l| l.0).collect();
            Advice {
                measurement,
                name: measurement.name(),
                information_bits: expected_information(&weights, &only),
                outcomes: hypotheses
                    .iter()
                    .zip(&laws)
                    .filter(|(h, _)| h.weight >= 0.02)
                    .map(|(h, l)| Outcome { candidate: h.name.clone(), predicts: l.1.clone() })
                    .collect(),
                cost: measurement.cost(),
                caution: measurement.caution(&formulas),
            }
        })
        .collect();
    list.sort_by(|a, b| b.information_bits.total_cmp(&a.information_bits).then(a.cost.cmp(&b.cost)));
    list
}

/// Uncertainty of a position read in a related sample, cm⁻¹.
const READING: f64 = 12.0;

fn law(
    measurement: Measurement,
    model: &Model,
    table: &ModeTable,
    candidate: Option<&Candidate>,
    answer: &BandAnswer,
) -> (Law, String) {
    let y = answer.observed_cm1;
    let presence = |p: f64| {
        let word = if p >= 0.5 { "present" } else { "absent" };
        (Law { found: p, mean: 0.0, sd: 0.0 }, format!("{word} (present with probability {p:.2})"))
    };
    let reading = |found: f64, mean: f64, sd: f64| {
        (Law { found, mean, sd }, format!("a shift of {mean:+.0} +- {sd:.0} cm-1 (found with probability {found:.2})"))
    };
    let Some(c) = candidate else {
        return match measurement {
            Measurement::Deuteration | Measurement::Oxygen18 | Measurement::Cooling => reading(0.5, 0.0, READING),
            Measurement::DiluteHdo | Measurement::PolarisedCrystal | Measurement::Raman => presence(0.5),
            Measurement::Anhydrous | Measurement::OtherAnion => presence(0.5),
        };
    };
    let list = c.level.excitations();
    let motion = |e: &crate::level::Excitation| table.modes[usize::from(e.mode)].motion;
    let quanta = |wanted: &[Motion]| -> u32 {
        list.iter().filter(|e| wanted.contains(&motion(e))).map(|e| u32::from(e.quanta)).sum()
    };
    let water = quanta(&[Motion::OhStretch, Motion::HohBend, Motion::Libration]);
    let anion = quanta(&[Motion::XoStretch, Motion::OxoBend]);
    let order = c.level.order();
    match measurement {
        Measurement::Deuteration | Measurement::Oxygen18 => {
            let exchange = if measurement == Measurement::Deuteration { "H=D" } else { "O=18O" };
            let (ratio, sd) = level_ratio(table, &model.nu, c, exchange);
            // Oxygen-18 water exchanges the water; the oxyanion keeps its oxygen.
            let (ratio, sd) =
                if measurement == Measurement::Oxygen18 { water_only(table, model, c) } else { (ratio, sd) };
            let (place, error) = exchanged_place(y, (ratio, sd));
            reading(0.7, place - y, error)
        }
        Measurement::DiluteHdo => {
            // Quanta of both bonds or of the bend with a bond survive in neither HDO nor as they were; one bond does.
            let stretches = quanta(&[Motion::OhStretch]);
            let modes = list.iter().filter(|e| motion(e) == Motion::OhStretch).count();
            let bends = quanta(&[Motion::HohBend]);
            presence(match (stretches, modes, bends) {
                (0, _, 0) => 0.9,
                (_, 0 | 1, 0) => 0.8,
                (_, 0 | 1, _) => 0.3,
                _ => 0.15,
            })
        }
        Measurement::Anhydrous => presence(if water > 0 { 0.05 } else { found(None, order, 0.15) }),
        Measurement::OtherAnion => presence(if anion > 0 { 0.15 } else { found(None, order, 0.15) }),
        Measurement::Cooling => {
            // Shifts from 300 to 80 K by motion (judgement): stretch −20 ± 12, bend +2 ± 5, libration +25 ± 12, M–O +5 ± 3.
            let mut mean = 0.0;
            let mut variance = 16.0;
            for e in list {
                let v = f64::from(e.quanta);
                let (shift, sd) = match motion(e) {
                    Motion::OhStretch | Motion::NhStretch => (-20.0, 12.0),
                    Motion::HohBend | Motion::NhBend => (2.0, 5.0),
                    Motion::Libration => (25.0, 12.0),
                    Motion::MetalOxygen => (5.0, 3.0),
                    Motion::Lattice => (10.0, 6.0),
                    _ => (0.0, 3.0),
                };
                mean += v * shift;
                variance += (v * sd) * (v * sd);
            }
            reading(0.95, mean, variance.sqrt())
        }
        Measurement::Raman => presence(normal_cdf(-1.0 - 0.5 * f64::from(order.saturating_sub(2)))),
        Measurement::PolarisedCrystal => {
            // A one-moiety level keeps a sharp polarisation; sums over several are mixed.
            let moieties = c.moieties(table).len();
            presence(if moieties <= 1 { 0.7 } else { 0.5 })
        }
    }
}

fn water_only(table: &ModeTable, model: &Model, candidate: &Candidate) -> (f64, f64) {
    let mut sum = 0.0;
    let mut moved = 0.0;
    let mut variance = 0.0;
    for e in candidate.level.excitations() {
        let i = usize::from(e.mode);
        let part = f64::from(e.quanta) * model.nu[i];
        let motion = table.modes[i].motion;
        let (ratio, sd) = match motion {
            Motion::XoStretch | Motion::OxoBend | Motion::NhStretch | Motion::NhBend => (1.0, 0.0),
            _ => super::companion::isotope_ratio("O=18O", motion),
        };
        sum += part;
        moved += part * ratio;
        variance += (part * sd) * (part * sd);
    }
    if sum > 0.0 { (moved / sum, variance.sqrt() / sum) } else { (1.0, 0.0) }
}
