//! Expected strength and width of levels.
//!
//! # Method
//! log₁₀ of the strength relative to the OH stretch fundamental = strongest partner fundamental + steps: the second
//! quantum, every further one, and a step for every moiety beyond the first by how it touches the others. Steps were
//! measured on ice and liquid water (integrated optical constants of Warren & Brandt, J. Geophys. Res. 113, D14220
//! (2008), and Segelstein 1981) where marked; the others are judgements. One sigma is about half a decade a step: this
//! is a ranking aid, not a photometry.

use super::position::{Model, Picture};
use crate::level::Level;
use crate::library::defaults::{Contact, Defaults, Role};
use crate::mode::{ModeTable, MoietyIndex, Strength};

/// Expected strength: log₁₀ relative to the OH stretch fundamental (or the strongest fundamental of the ion in a salt
/// without water), with one standard uncertainty in decades.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct ExpectedStrength {
    /// log₁₀ relative strength.
    pub log10: f64,
    /// One standard uncertainty, decades.
    pub sigma: f64,
}

/// An OH stretch above this is not hydrogen-bonded, cm⁻¹ (judgement: bonded hydrate water lies below).
const FREE_STRETCH: f64 = 3_620.0;

/// Step to the second quantum when a hydrogen-bonded OH stretch is the strong partner (measured: 4·10⁻³ to 10⁻²).
const SECOND_BONDED: (f64, f64) = (-2.3, 0.4);

/// The same for a free OH (factor 10–50, from memory).
const SECOND_FREE: (f64, f64) = (-1.3, 0.4);

/// The same for anything else (judgement).
const SECOND_OTHER: (f64, f64) = (-1.5, 0.5);

/// Every further quantum (measured between the second, third and fourth stretch quanta of ice: 1.0 to 2.0).
const FURTHER: (f64, f64) = (-1.6, 0.4);

/// Bend + libration of one water against the bend: the association band (measured 0.4–0.7).
const ASSOCIATION: (f64, f64) = (-0.25, 0.25);

/// Strength of a level that symmetry forbids, decades below an allowed one (judgement: disorder and zone-edge pairs
/// relax the rules in hydrates).
pub const FORBIDDEN_STEP: f64 = -1.0;

/// log₁₀ strength of a fundamental by role, relative to the OH stretch, where the table gives none.
///
/// Bend −1.2, libration −0.8: integrated over ice bands (as above). The others are judgements: infrared-active ν3 about
/// as strong as the OH stretch, ν4 a little weaker, ν1 and ν2 activated by the site only.
fn fundamental(role: Role) -> f64 {
    match role {
        Role::OhStretch | Role::OdStretch | Role::NhStretch | Role::Other => 0.0,
        Role::HohBend | Role::DodBend => -1.2,
        Role::Libration => -0.8,
        Role::NhBend => -0.3,
        Role::Xo3(3) | Role::Xo4(3) => 0.0,
        Role::Xo4(4) | Role::Xo3(2) => -0.5,
        Role::Xo3(4) => -0.8,
        Role::Xo3(_) | Role::Xo4(_) => -1.2,
        Role::MetalOxygen | Role::Lattice => -0.7,
    }
}

fn contact_step(contact: Contact) -> (f64, f64) {
    match contact {
        Contact::SameMoiety | Contact::LigandMetal => (0.0, 0.0),
        Contact::HydrogenBond => (-1.0, 0.5),
        Contact::DifferentWaters => (-1.2, 0.5),
        Contact::None => (-2.5, 0.7),
    }
}

/// Strengths and widths of the levels of one table; roles and contacts are looked up once.
#[derive(Clone, Debug)]
pub struct Strengths {
    roles: Vec<Role>,
    base: Vec<f64>,
    width: Vec<f64>,
    free: Vec<bool>,
    moiety: Vec<MoietyIndex>,
    contacts: Vec<Vec<Contact>>,
    envelope: Vec<bool>,
}

impl Strengths {
    /// Looks up what the strengths of `table` depend on.
    pub fn of(table: &ModeTable, model: &Model) -> Self {
        let n = table.modes.len();
        let roles: Vec<Role> = (0..n).map(|i| Role::of(table, i)).collect();
        let base = (0..n)
            .map(|i| match table.modes[i].ir {
                None => fundamental(roles[i]),
                Some(Strength::Relative(_)) => table.modes[i].ir.map_or(0.0, |s| s.log10().clamp(-3.0, 0.0)),
                // A word has no fixed scale between tables: it counts half, what the motion usually shows counts half.
                Some(Strength::Word(word)) => 0.5 * (fundamental(roles[i]) + Strength::Word(word).log10()),
            })
            .collect();
        let width = (0..n)
            .map(|i| table.modes[i].fwhm.unwrap_or_else(|| Defaults::bundled().width(roles[i], model.nu[i]).0))
            .collect();
        let kinds = 0..table.moieties.len();
        Self {
            free: model.nu.iter().map(|nu| *nu > FREE_STRETCH).collect(),
            moiety: table.modes.iter().map(|m| m.moiety).collect(),
            contacts: kinds.clone().map(|a| kinds.clone().map(|b| Contact::of(table, a, b)).collect()).collect(),
            envelope: kinds
                .map(|m| model.pictures.iter().any(|(at, picture, _)| *at == m && *picture == Picture::Envelope))
                .collect(),
            roles,
            base,
            width,
        }
    }

    /// Moieties of a level, ascending, each once.
    pub fn moieties(&self, level: &Level) -> Vec<MoietyIndex> {
        let mut list: Vec<MoietyIndex> = level.excitations().iter().map(|e| self.moiety[usize::from(e.mode)]).collect();
        list.sort_unstable();
        list.dedup();
        list
    }

    /// Expected strength of the transition from the ground level.
    pub fn expected(&self, level: &Level) -> ExpectedStrength {
        let list = level.excitations();
        let order = level.order();
        let Some(strongest) = list
            .iter()
            .map(|e| usize::from(e.mode))
            .max_by(|a, b| self.base[*a].total_cmp(&self.base[*b]).then(b.cmp(a)))
        else {
            return ExpectedStrength { log10: f64::NEG_INFINITY, sigma: 0.0 };
        };
        let mut log10 = self.base[strongest];
        let mut variance = 0.04;
        let mut step = |(mean, sigma): (f64, f64)| {
            log10 += mean;
            variance += sigma * sigma;
        };
        if order > 1 {
            step(if self.is_association(level) {
                ASSOCIATION
            } else if matches!(self.roles[strongest], Role::OhStretch | Role::OdStretch) {
                if self.free[strongest] { SECOND_FREE } else { SECOND_BONDED }
            } else {
                SECOND_OTHER
            });
            for _ in 2..order {
                step(FURTHER);
            }
        }
        // Every further moiety joins by its best contact with those already there, starting from the strongest.
        let mut joined = vec![self.moiety[strongest]];
        let mut rest = self.moieties(level);
        rest.retain(|m| *m != joined[0]);
        while !rest.is_empty() {
            let best = rest
                .iter()
                .enumerate()
                .map(|(at, m)| {
                    let contact =
                        joined.iter().map(|k| contact_step(self.contacts[*k][*m])).max_by(|a, b| a.0.total_cmp(&b.0));
                    (at, contact.unwrap_or((-2.5, 0.7)))
                })
                .max_by(|a, b| a.1.0.total_cmp(&b.1.0).then(b.0.cmp(&a.0)));
            let Some((at, contact)) = best else { break };
            step(contact);
            joined.push(rest.remove(at));
        }
        ExpectedStrength { log10, sigma: variance.sqrt() }
    }

    fn is_association(&self, level: &Level) -> bool {
        let list = level.excitations();
        list.len() == 2 && level.order() == 2 && self.moieties(level).len() == 1 && {
            let roles = [self.roles[usize::from(list[0].mode)], self.roles[usize::from(list[1].mode)]];
            roles.contains(&Role::HohBend) && roles.contains(&Role::Libration)
        }
    }

    /// Expected full width at half maximum, cm⁻¹: quanta of one mode add linearly (correlated), modes in quadrature.
    pub fn width(&self, level: &Level) -> f64 {
        let squares =
            level.excitations().iter().map(|e| (self.width[usize::from(e.mode)] * f64::from(e.quanta)).powi(2));
        squares.sum::<f64>().sqrt()
    }

    /// Whether a broad OH envelope takes part: the listed position is that of a shifted maximum.
    pub fn in_envelope(&self, level: &Level) -> bool {
        level.excitations().iter().any(|e| {
            let i = usize::from(e.mode);
            self.envelope[self.moiety[i]] && matches!(self.roles[i], Role::OhStretch | Role::OdStretch)
        })
    }
}

/// Words for a strength relative to the strongest level of a list: strong within 0.7 decades, medium within 1.7, weak
/// within 3, trace below (a convention of this project).
pub fn class(log10_below_strongest: f64) -> &'static str {
    match -log10_below_strongest {
        d if d <= 0.7 => "strong",
        d if d <= 1.7 => "medium",
        d if d <= 3.0 => "weak",
        _ => "trace",
    }
}
