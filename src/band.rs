//! What was observed: bands, the list of one sample, companions, spectra.

use serde::Serialize;

use crate::mode::Strength;
use crate::quantity::{AxisUnit, Medium, Wavenumber};

/// What an observed feature looks like.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq, Serialize)]
#[serde(rename_all = "kebab-case")]
pub enum Feature {
    /// A resolved maximum of absorption.
    #[default]
    Band,
    /// A shoulder on another band.
    Shoulder,
    /// The edge of a broad absorption.
    Edge,
}

impl Feature {
    /// The name used in files.
    pub fn name(self) -> &'static str {
        match self {
            Self::Band => "band",
            Self::Shoulder => "shoulder",
            Self::Edge => "edge",
        }
    }
}

/// One observed band. Positions are already vacuum wavenumbers.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct Band {
    /// Unique name in its list.
    pub id: String,
    /// Vacuum wavenumber, cm⁻¹.
    pub position: Wavenumber,
    /// One standard uncertainty, cm⁻¹.
    pub sigma: f64,
    /// Whether the list gave the uncertainty (otherwise a default).
    pub sigma_given: bool,
    /// Full width at half maximum, cm⁻¹.
    pub fwhm: Option<f64>,
    /// Strength as listed.
    pub strength: Option<Strength>,
    /// What it looks like.
    pub feature: Feature,
    /// The user's note.
    pub note: String,
}

/// The bands of one sample, in file order.
#[derive(Clone, Debug, Default, PartialEq, Serialize)]
pub struct BandList {
    /// File name.
    pub name: String,
    /// The sample's name as written.
    pub sample: String,
    /// What the wavelengths were measured in.
    pub medium: Medium,
    /// Whether the medium was stated (wavelengths without a statement draw a note).
    pub medium_given: bool,
    /// Measured range, cm⁻¹, ascending.
    pub range: Option<(f64, f64)>,
    /// Weakest strength (same scale as `strength`) that would have been listed.
    pub detection_limit: Option<f64>,
    /// The bands.
    pub bands: Vec<Band>,
}

/// What a companion shows at a band of the main sample.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Serialize)]
#[serde(rename_all = "kebab-case")]
pub enum Verdict {
    /// The band is there.
    Present,
    /// The band is not there (weaker than the companion's limit).
    Absent,
    /// The band is there at another position.
    Moved,
    /// Nothing can be said.
    Unclear,
}

/// One statement about one companion.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct CompanionRow {
    /// Which companion.
    pub companion: String,
    /// Moieties of the main table that it contains.
    pub moieties: Vec<String>,
    /// Isotope exchange, for example `H=D`; empty for none.
    pub exchange: String,
    /// The band of the main list that is spoken of; empty when the row only lists a band of the companion.
    pub band: String,
    /// What is seen.
    pub verdict: Verdict,
    /// Position in the companion, where it is stated.
    pub position: Option<Wavenumber>,
    /// Uncertainty of that position, cm⁻¹.
    pub sigma: Option<f64>,
    /// Probability that the verdict is wrong; a default when not given.
    pub error_rate: Option<f64>,
    /// The user's note.
    pub note: String,
}

/// All statements about companions, in file order.
#[derive(Clone, Debug, Default, PartialEq, Serialize)]
pub struct Companions {
    /// File name.
    pub name: String,
    /// The rows.
    pub rows: Vec<CompanionRow>,
}

/// What the ordinate of a spectrum is.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq, Serialize)]
#[serde(rename_all = "kebab-case")]
pub enum Ordinate {
    /// Reflectance (bands are minima), as a fraction.
    #[default]
    Reflectance,
    /// Transmittance (bands are minima), as a fraction.
    Transmittance,
    /// Absorbance (bands are maxima).
    Absorbance,
}

/// A spectrum: ordinates over ascending vacuum wavenumbers.
#[derive(Clone, Debug, Default, PartialEq, Serialize)]
pub struct Spectrum {
    /// File name, and block name of a compound file.
    pub name: String,
    /// Title in the file.
    pub title: String,
    /// Vacuum wavenumbers, cm⁻¹, strictly ascending.
    pub wavenumbers: Vec<f64>,
    /// One ordinate a wavenumber; fractions, not percent.
    pub ordinates: Vec<f64>,
    /// What the ordinates are.
    pub ordinate: Ordinate,
    /// Unit of the file's axis.
    pub axis: Option<AxisUnit>,
    /// Medium the wavelengths were taken to be measured in.
    pub medium: Medium,
    /// Whether the medium was stated, or needs no statement (a wavenumber axis).
    pub medium_given: bool,
    /// Instrument resolution stated in the file: full width at half maximum, cm⁻¹.
    pub resolution: Option<f64>,
}
