//! Point groups: none is known yet, so every activity is unknown.

/// Whether a transition may absorb.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Activity {
    /// It may.
    Allowed,
    /// It may not.
    Forbidden,
    /// Nothing is known.
    Unknown,
}

impl Activity {
    /// The word used in files.
    pub fn word(self) -> &'static str {
        match self {
            Self::Allowed => "allowed",
            Self::Forbidden => "forbidden",
            Self::Unknown => "unknown",
        }
    }
}

/// An irreducible representation of a group.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Irrep(pub u8);

/// A point group.
pub struct PointGroup;

impl PointGroup {
    /// The group of that name.
    pub fn named(_name: &str) -> Option<Self> {
        None
    }
    /// The irreducible representation of that name.
    pub fn irrep(&self, _name: &str) -> Option<Irrep> {
        None
    }
    /// Its dimension.
    pub fn dimension(&self, _irrep: Irrep) -> u8 {
        1
    }
    /// Its name.
    pub fn irrep_name(&self, _irrep: Irrep) -> &str {
        ""
    }
    /// Species content of a level.
    pub fn level_species(&self, _quanta: &[(Irrep, u8)]) -> Vec<(Irrep, u32)> {
        Vec::new()
    }
    /// Infrared-active.
    pub fn infrared(&self, _irrep: Irrep) -> bool {
        true
    }
    /// Raman-active.
    pub fn raman(&self, _irrep: Irrep) -> bool {
        true
    }
    /// Why a level is forbidden.
    pub fn forbidden_reason(&self, _quanta: &[(Irrep, u8)]) -> String {
        String::new()
    }
}
