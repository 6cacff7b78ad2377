//! A level is a set of quanta: which modes are excited, how often, and with which vibrational angular momentum.

use serde::Serialize;

use crate::mode::{ModeIndex, ModeTable};

/// Quanta in one mode. Fields order as they compare: mode, quanta, l.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord, Hash, Serialize)]
pub struct Excitation {
    /// Which mode.
    pub mode: u16,
    /// How many quanta, at least one.
    pub quanta: u8,
    /// |l| of a degenerate mode whose levels are split by a given g; [`UNSPLIT`] otherwise.
    pub l: u8,
}

/// The mark of an excitation that is not resolved by angular momentum.
pub const UNSPLIT: u8 = u8::MAX;

impl Excitation {
    /// `quanta` in `mode`, not resolved by angular momentum.
    ///
    /// # Panics
    /// Never for tables read by this program: they hold fewer than 65 536 modes.
    pub fn new(mode: ModeIndex, quanta: u8) -> Self {
        Self { mode: u16::try_from(mode).expect("tables hold fewer than 65536 modes"), quanta, l: UNSPLIT }
    }
}

/// A level: excitations in ascending order of mode, each mode once. The ground level is empty.
#[derive(Clone, Debug, Default, PartialEq, Eq, PartialOrd, Ord, Hash, Serialize)]
pub struct Level(Vec<Excitation>);

impl Level {
    /// The level with these excitations; sorted here, zero quanta dropped, a mode named twice added up.
    pub fn new(excitations: impl IntoIterator<Item = Excitation>) -> Self {
        let mut list: Vec<Excitation> = excitations.into_iter().filter(|e| e.quanta > 0).collect();
        list.sort_unstable();
        list.dedup_by(|later, earlier| {
            let same = later.mode == earlier.mode;
            if same {
                earlier.quanta += later.quanta;
                earlier.l = UNSPLIT;
            }
            same
        });
        Self(list)
    }

    /// The level with `(mode, quanta)` pairs, not resolved by angular momentum.
    pub fn from_quanta(pairs: &[(ModeIndex, u8)]) -> Self {
        Self::new(pairs.iter().map(|&(mode, quanta)| Excitation::new(mode, quanta)))
    }

    /// The excitations, ascending by mode.
    pub fn excitations(&self) -> &[Excitation] {
        &self.0
    }

    /// Total quanta.
    pub fn order(&self) -> u32 {
        self.0.iter().map(|e| u32::from(e.quanta)).sum()
    }

    /// Quanta in one mode.
    pub fn quanta_in(&self, mode: ModeIndex) -> u8 {
        self.0.iter().find(|e| usize::from(e.mode) == mode).map_or(0, |e| e.quanta)
    }

    /// The name for people: mode ids joined by ` + `, with the count in front: `2 oh-1 + bend-1`, `2 nu2(l=0)`.
    pub fn label(&self, table: &ModeTable) -> String {
        if self.0.is_empty() {
            return "ground".to_owned();
        }
        let part = |e: &Excitation| {
            let id = table.modes.get(usize::from(e.mode)).map_or("?", |mode| mode.id.as_str());
            let count = if e.quanta == 1 { String::new() } else { format!("{} ", e.quanta) };
            let momentum = if e.l == UNSPLIT || e.quanta == 1 { String::new() } else { format!("(l={})", e.l) };
            format!("{count}{id}{momentum}")
        };
        self.0.iter().map(part).collect::<Vec<_>>().join(" + ")
    }
}
