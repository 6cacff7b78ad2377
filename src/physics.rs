//! Modes become levels. No files, no clock, no printing.

/// Positions and uncertainties of levels from a resolved set of constants.
pub mod position;

/// Constants of a table resolved into a model.
pub mod anharmonicity;

/// Expected strengths and widths.
pub mod strength;

/// Faults and doubts of a table.
pub mod table_faults;

/// Two OH bonds of one water.
pub mod local_pair;

/// A force field becomes anharmonic constants.
pub mod perturbation;

/// Strengths of two-quanta transitions from a force field and dipole derivatives.
pub mod transition_moment;

/// Whether the constants of a water belong to one picture.
pub mod pictures;

/// The mode table of an isotopologue.
pub mod isotopes;

/// A table at another temperature; thermal populations.
pub mod temperature;

/// Resonances and polyads.
pub mod resonance;

/// Point groups.
pub mod symmetry;

/// Elements and isotopes.
pub mod elements;

/// Harmonic normal modes from a Hessian.
pub mod normal_modes;

/// Moieties from a geometry.
pub mod moieties;

/// What each normal mode does.
pub mod motion;

/// Rotations and reflections of a geometry.
pub mod geometry_symmetry;

/// Faults of a Hessian.
pub mod hessian_faults;

/// A mode table from normal modes.
pub mod computed_table;
