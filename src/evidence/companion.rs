//! Companions: what related samples show or lack, as one factor a candidate.
//!
//! # Method
//! A candidate needs every moiety it has quanta on. If the companion holds them all, the band is found there with
//! probability P = 1 − (1 − q)(1 − f): q that the level is strong enough and has not moved out of reach, f that some
//! other band lies there. If a moiety is lacking, P = f; for a band of other origin P = ½. A verdict *absent* takes 1 − P.
//! P stays within 0.02 and 0.98: no single verdict counts more than 50 to 1. After an isotope exchange each candidate
//! predicts its own place. Numbers without a source are judgement, tried in simulation.

use std::collections::{BTreeMap, BTreeSet};

use crate::assign::candidate::Candidate;
use crate::assign::kernel::{log_normal, normal_cdf};
use crate::assign::offers::listed_strength;
use crate::assign::witness::{Factor, Witness};
use crate::band::{BandList, CompanionRow, Companions, Verdict};
use crate::mode::{ModeTable, Motion};
use crate::note::{Note, Noted};
use crate::physics::position::Model;

/// A band is "there" within this distance, cm⁻¹.
pub const WINDOW: f64 = 60.0;

/// Shift of a band between related samples, cm⁻¹ a root quantum.
const SHIFT: f64 = 20.0;

/// Scatter of strengths between related samples, decades.
const STRENGTH_SCATTER: f64 = 0.35;

/// Chance of some other band within the window where nothing is known of the companion's bands.
const CHANCE: f64 = 0.15;

/// Probability that a level strong enough is seen, where the strength of the band is not listed.
const UNKNOWN_STRENGTH: f64 = 0.8;

/// Probability that a moved band is found in a list of the companion's bands.
const LISTED: f64 = 0.7;

/// Density of the companion's bands where a list does not tell, per cm⁻¹.
const DENSITY: f64 = 1.0 / 90.0;

/// Error of an isotope-shifted position besides that of the ratios, cm⁻¹.
const PLACE: f64 = 12.0;

/// Probability that a band of other origin is found at its place in the exchanged companion.
const OTHER_STAYS: f64 = 0.5;

/// Bounds of the probability of any single verdict.
const BOUNDS: (f64, f64) = (0.02, 0.98);

/// Probability of a verdict *present* for a level that the companion holds: strong enough by `excess` decades over the
/// limit (unknown: 0.8), `order` quanta, chance `f` of another band there.
pub fn found(excess: Option<f64>, order: u32, f: f64) -> f64 {
    let strong = excess.map_or(UNKNOWN_STRENGTH, |e| normal_cdf(e / STRENGTH_SCATTER));
    let near = 2.0 * normal_cdf(WINDOW / (SHIFT * f64::from(order.max(1)).sqrt())) - 1.0;
    1.0 - (1.0 - strong * near) * (1.0 - f)
}

/// Ratio of wavenumbers after an exchange and its standard uncertainty, by motion.
///
/// H=D: from memory of published pairs (OH .737, bend .735, libration .730). O=18O: from the masses of O–H and of pure
/// oxygen motion (√(16/18) = .943), in between where the central atom moves. Anything else moves nothing.
pub fn isotope_ratio(exchange: &str, motion: Motion) -> (f64, f64) {
    let exchange = exchange.replace(' ', "").to_uppercase();
    match exchange.as_str() {
        "H=D" | "H=2H" | "1H=2H" => match motion {
            Motion::OhStretch | Motion::NhStretch => (0.737, 0.008),
            Motion::HohBend | Motion::NhBend => (0.735, 0.006),
            Motion::Libration => (0.730, 0.020),
            Motion::MetalOxygen => (0.970, 0.015),
            Motion::XoStretch | Motion::OxoBend => (0.998, 0.004),
            Motion::Lattice => (0.970, 0.020),
            Motion::Other => (1.0, 0.010),
        },
        "O=18O" | "16O=18O" => match motion {
            Motion::OhStretch => (0.9967, 0.001),
            Motion::HohBend => (0.9962, 0.001),
            Motion::Libration => (0.995, 0.004),
            Motion::MetalOxygen => (0.955, 0.015),
            Motion::XoStretch | Motion::OxoBend => (0.955, 0.012),
            Motion::NhStretch | Motion::NhBend => (1.0, 0.001),
            Motion::Lattice => (0.970, 0.020),
            Motion::Other => (1.0, 0.020),
        },
        _ => (1.0, 0.005),
    }
}

/// Ratio of a level's position after an exchange, and its uncertainty; errors of one motion are fully correlated.
pub fn level_ratio(table: &ModeTable, nu: &[f64], candidate: &Candidate, exchange: &str) -> (f64, f64) {
    let mut sum = 0.0;
    let mut moved = 0.0;
    let mut by_motion: BTreeMap<Motion, f64> = BTreeMap::new();
    for e in candidate.level.excitations() {
        let i = usize::from(e.mode);
        let part = f64::from(e.quanta) * nu[i];
        let (ratio, sigma) = isotope_ratio(exchange, table.modes[i].motion);
        sum += part;
        moved += part * ratio;
        *by_motion.entry(table.modes[i].motion).or_default() += part * sigma;
    }
    let variance: f64 = by_motion.values().map(|s| s * s).sum();
    if sum > 0.0 { (moved / sum, variance.sqrt() / sum) } else { (1.0, 0.0) }
}

/// Place and its standard uncertainty (cm⁻¹) of a band at `y` in the exchanged companion.
pub fn exchanged_place(y: f64, ratio: (f64, f64)) -> (f64, f64) {
    (ratio.0 * y, ((y * ratio.1).powi(2) + PLACE * PLACE).sqrt())
}

/// Factor of a list of the companion's bands for a level expected at `place`: (1 − q) + (q/ρ) Σ N.
pub fn list_factor(q: f64, density: f64, bands: &[f64], place: (f64, f64)) -> f64 {
    let sum: f64 = bands.iter().map(|d| log_normal(d - place.0, place.1 * place.1).exp()).sum();
    (1.0 - q) + q / density * sum
}

/// What one row, or the list of one companion, says about one band.
#[derive(Clone, Debug)]
enum Said {
    /// Found or not at the unchanged place.
    There(bool),
    /// Found at this place (cm⁻¹, variance).
    At(f64, f64),
    /// The companion's bands are these.
    List(Vec<f64>, f64),
}

#[derive(Clone, Debug)]
struct Statement {
    companion: String,
    holds: BTreeSet<usize>,
    exchange: String,
    said: Said,
    chance: f64,
    cap: f64,
}

/// All statements about companions, ready to be weighed.
#[derive(Clone, Debug)]
pub struct Testimony {
    table: ModeTable,
    nu: Vec<f64>,
    positions: Vec<f64>,
    excess: Vec<Option<f64>>,
    statements: Vec<Vec<Statement>>,
}

/// Moieties of the table that a row names, by name or by formula.
fn held(table: &ModeTable, row: &CompanionRow) -> BTreeSet<usize> {
    let named = |name: &str, formula: &str| row.moieties.iter().any(|m| m == name || m == formula);
    table.moieties.iter().enumerate().filter(|(_, m)| named(&m.name, m.formula())).map(|(i, _)| i).collect()
}

impl Testimony {
    /// Prepares the statements; a second verdict of one companion about one band is one verdict, and noted.
    pub fn new(table: &ModeTable, model: &Model, bands: &BandList, companions: &Companions) -> Noted<Self> {
        let mut notes = Vec::new();
        let limit = bands.detection_limit.filter(|l| *l > 0.0).map(f64::log10).or_else(|| {
            let listed = bands.bands.iter().filter_map(listed_strength).map(|s| s.0);
            listed.min_by(f64::total_cmp).map(|weakest| weakest - 0.05)
        });
        let excess = bands.bands.iter().map(|b| Some(listed_strength(b)?.0 - limit?)).collect();
        let positions: Vec<f64> = bands.bands.iter().map(|b| b.position.inverse_cm()).collect();
        let mut statements: Vec<Vec<Statement>> = vec![Vec::new(); positions.len()];
        let mut heard: BTreeSet<(String, usize)> = BTreeSet::new();
        let mut lists: BTreeMap<String, (Vec<f64>, &CompanionRow)> = BTreeMap::new();
        for row in &companions.rows {
            if row.band.is_empty() {
                if let Some(position) = row.position {
                    let entry = lists.entry(row.companion.clone()).or_insert_with(|| (Vec::new(), row));
                    entry.0.push(position.inverse_cm());
                }
                continue;
            }
            let Some(band) = bands.bands.iter().position(|b| b.id == row.band) else { continue };
            let said = match (row.verdict, row.position) {
                (Verdict::Present, None) => Said::There(true),
                (Verdict::Absent, _) => Said::There(false),
                (Verdict::Present | Verdict::Moved, Some(at)) => {
                    Said::At(at.inverse_cm(), row.sigma.unwrap_or(0.0).powi(2))
                }
                (Verdict::Moved, None) | (Verdict::Unclear, _) => continue,
            };
            if !heard.insert((row.companion.clone(), band)) {
                notes.push(Note::new(format!(
                    "`{}` speaks twice about band `{}`: only the first verdict counts",
                    row.companion, row.band
                )));
                continue;
            }
            statements[band].push(Statement {
                companion: row.companion.clone(),
                holds: held(table, row),
                exchange: row.exchange.clone(),
                said,
                chance: row.error_rate.unwrap_or(CHANCE),
                cap: row.error_rate.map_or(1.0, |e| 1.0 - e),
            });
        }
        for (companion, (mut list, row)) in lists {
            list.sort_by(f64::total_cmp);
            let span = list.last().unwrap_or(&0.0) - list.first().unwrap_or(&0.0);
            let density = if list.len() > 2 && span > 0.0 { (list.len() - 1) as f64 / span } else { DENSITY };
            for (band, y) in positions.iter().enumerate() {
                if heard.contains(&(companion.clone(), band)) {
                    continue;
                }
                let said = if row.exchange.is_empty() {
                    Said::There(list.iter().any(|d| (d - y).abs() < WINDOW))
                } else {
                    Said::List(list.clone(), density)
                };
                statements[band].push(Statement {
                    companion: companion.clone(),
                    holds: held(table, row),
                    exchange: row.exchange.clone(),
                    said,
                    chance: 1.0 - (-2.0 * WINDOW * density).exp(),
                    cap: 1.0,
                });
            }
        }
        let testimony = Self { table: table.clone(), nu: model.nu.clone(), positions, excess, statements };
        Noted { value: testimony, notes }
    }

    fn lacking(&self, statement: &Statement, candidate: &Candidate) -> Vec<String> {
        let needed = candidate.moieties(&self.table);
        let lacking = needed.into_iter().filter(|m| !statement.holds.contains(m));
        let names: BTreeSet<&str> = lacking.map(|m| self.table.moieties[m].formula()).collect();
        names.into_iter().map(str::to_owned).collect()
    }
}

fn verdict_likelihood(present: bool, p: f64) -> f64 {
    let p = p.clamp(BOUNDS.0, BOUNDS.1);
    if present { p } else { 1.0 - p }
}

impl Witness for Testimony {
    fn about(&self, band: usize, candidate: &Candidate) -> Vec<Factor> {
        let y = self.positions[band];
        let order = candidate.level.order();
        self.statements[band]
            .iter()
            .map(|s| {
                let lacking = self.lacking(s, candidate);
                let needs = if lacking.is_empty() {
                    format!("{} holds all it needs", s.companion)
                } else {
                    format!("it needs {}, which {} lacks", lacking.join(" and "), s.companion)
                };
                match &s.said {
                    Said::There(present) => {
                        let word = if *present { "the band is present" } else { "the band is absent" };
                        let p = if !lacking.is_empty() {
                            s.chance
                        } else if s.exchange.is_empty() {
                            found(self.excess[band], order, s.chance).min(s.cap.max(s.chance))
                        } else {
                            let place = exchanged_place(y, level_ratio(&self.table, &self.nu, candidate, &s.exchange));
                            let near = |d: f64| normal_cdf((d - place.0) / place.1);
                            let stays = near(y + WINDOW) - near(y - WINDOW);
                            let q = (UNKNOWN_STRENGTH * stays).min(s.cap);
                            1.0 - (1.0 - q) * (1.0 - s.chance)
                        };
                        Factor::of_likelihood(
                            verdict_likelihood(*present, p),
                            format!("{needs}, and {word} there (expected present with probability {p:.2})"),
                        )
                    }
                    Said::At(at, variance) => {
                        if !lacking.is_empty() {
                            return Factor::of_likelihood(1.0, format!("{needs}: a band at {at:.0} cm-1 says nothing"));
                        }
                        let place = if s.exchange.is_empty() {
                            (y, SHIFT * f64::from(order.max(1)).sqrt())
                        } else {
                            exchanged_place(y, level_ratio(&self.table, &self.nu, candidate, &s.exchange))
                        };
                        let total = place.1 * place.1 + variance;
                        let error = (1.0 - s.cap).max(BOUNDS.0);
                        let density = (1.0 - error) / DENSITY * log_normal(at - place.0, total).exp();
                        Factor::of_likelihood(
                            error + density,
                            format!(
                                "{}: predicted at {:.0} +- {:.0} cm-1, found at {at:.0}",
                                s.companion,
                                place.0,
                                total.sqrt()
                            ),
                        )
                    }
                    Said::List(list, density) => {
                        if !lacking.is_empty() {
                            return Factor::of_likelihood(1.0, format!("{needs}: its bands say nothing"));
                        }
                        let place = exchanged_place(y, level_ratio(&self.table, &self.nu, candidate, &s.exchange));
                        let near =
                            list.iter().copied().min_by(|a, b| (a - place.0).abs().total_cmp(&(b - place.0).abs()));
                        Factor::of_likelihood(
                            list_factor(LISTED, *density, list, place).max(BOUNDS.0),
                            format!(
                                "{}: predicted at {:.0} +- {:.0} cm-1, nearest band {:.0}",
                                s.companion,
                                place.0,
                                place.1,
                                near.unwrap_or_default()
                            ),
                        )
                    }
                }
            })
            .collect()
    }

    fn other(&self, band: usize) -> Vec<Factor> {
        let y = self.positions[band];
        self.statements[band]
            .iter()
            .map(|s| {
                let (likelihood, what) = match &s.said {
                    Said::There(present) => (0.5, if *present { "present" } else { "absent" }.to_owned()),
                    Said::At(at, variance) => {
                        let stays = log_normal(at - y, PLACE * PLACE + variance).exp();
                        (1.0 - OTHER_STAYS + OTHER_STAYS / DENSITY * stays, format!("found at {at:.0} cm-1"))
                    }
                    Said::List(list, density) => {
                        (list_factor(OTHER_STAYS, *density, list, (y, PLACE)), "its list of bands".to_owned())
                    }
                };
                Factor::of_likelihood(likelihood, format!("{}: {what}; another origin may stay or go", s.companion))
            })
            .collect()
    }
}
