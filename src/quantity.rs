//! Numbers with their unit. Inside the program a position is a vacuum wavenumber in cm⁻¹; this room is the only place
//! where wavelengths are turned into wavenumbers and back.

use std::fmt;
use std::ops::{Add, Sub};

use serde::Serialize;

/// Position of a level or band as a vacuum wavenumber, in cm⁻¹. Invariant: finite and not negative.
#[derive(Clone, Copy, Debug, PartialEq, PartialOrd, Serialize)]
#[serde(transparent)]
pub struct Wavenumber(f64);

/// Signed difference of two wavenumbers, in cm⁻¹: an anharmonic constant, an isotope shift, a residual.
#[derive(Clone, Copy, Debug, Default, PartialEq, PartialOrd, Serialize)]
#[serde(transparent)]
pub struct Shift(pub f64);

/// A number that cannot be a wavenumber: negative, infinite or not a number.
#[derive(Clone, Copy, Debug, PartialEq, thiserror::Error)]
#[error("{0} is not a wavenumber: expected a finite number that is not negative")]
pub struct NotAWavenumber(pub f64);

impl Wavenumber {
    /// The wavenumber `value`, in cm⁻¹.
    ///
    /// # Errors
    /// [`NotAWavenumber`] when `value` is negative, infinite or not a number.
    pub fn from_inverse_cm(value: f64) -> Result<Self, NotAWavenumber> {
        if value.is_finite() && value >= 0.0 { Ok(Self(value)) } else { Err(NotAWavenumber(value)) }
    }

    /// The wavenumber of a vacuum wavelength in µm: ν̃ = 10⁴ / λ.
    ///
    /// # Errors
    /// [`NotAWavenumber`] when the wavelength is zero, negative or not a number.
    pub fn from_vacuum_micrometres(wavelength: f64) -> Result<Self, NotAWavenumber> {
        Self::from_inverse_cm(1.0e4 / wavelength)
    }

    /// The wavenumber of a wavelength in µm measured in `medium`.
    ///
    /// # Errors
    /// [`NotAWavenumber`] when the wavelength is zero, negative or not a number.
    pub fn from_micrometres(wavelength: f64, medium: Medium) -> Result<Self, NotAWavenumber> {
        match medium {
            Medium::Vacuum => Self::from_vacuum_micrometres(wavelength),
            Medium::Air => Self::from_vacuum_micrometres(vacuum_wavelength(wavelength)),
        }
    }

    /// The value in cm⁻¹.
    pub fn inverse_cm(self) -> f64 {
        self.0
    }

    /// The vacuum wavelength in µm; infinite for a wavenumber of zero.
    pub fn vacuum_micrometres(self) -> f64 {
        1.0e4 / self.0
    }
}

impl Sub for Wavenumber {
    type Output = Shift;
    fn sub(self, other: Self) -> Shift {
        Shift(self.0 - other.0)
    }
}

impl Add for Shift {
    type Output = Shift;
    fn add(self, other: Self) -> Shift {
        Shift(self.0 + other.0)
    }
}

impl fmt::Display for Wavenumber {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        self.0.fmt(f)
    }
}

impl fmt::Display for Shift {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        self.0.fmt(f)
    }
}

/// What the light went through when its wavelength was measured.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq, Hash, Serialize, clap::ValueEnum)]
#[serde(rename_all = "kebab-case")]
pub enum Medium {
    /// Wavelengths are vacuum wavelengths, or the axis was a wavenumber all along.
    #[default]
    Vacuum,
    /// Wavelengths are those in standard air (dry, 15 °C, 101 325 Pa, 450 ppm CO₂).
    Air,
}

/// Unit of a position at the door.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash, Serialize, clap::ValueEnum)]
pub enum AxisUnit {
    /// Wavelength in micrometres.
    #[serde(rename = "um")]
    #[value(name = "um")]
    Micrometre,
    /// Wavelength in nanometres.
    #[serde(rename = "nm")]
    #[value(name = "nm")]
    Nanometre,
    /// Wavenumber in cm⁻¹.
    #[serde(rename = "cm-1")]
    #[value(name = "cm-1")]
    InverseCentimetre,
}

impl AxisUnit {
    /// The unit that a person wrote: `um`, `µm`, `μm`, `micron`, `nm`, `cm-1`, `cm^-1`, `cm⁻¹`, `1/cm`, in any case.
    pub fn from_text(text: &str) -> Option<Self> {
        let plain: String =
            text.trim().to_lowercase().replace(['µ', 'μ'], "u").replace("⁻¹", "-1").replace(['^', ' ', '(', ')'], "");
        match plain.as_str() {
            "um" | "micron" | "microns" | "micrometre" | "micrometer" | "micrometres" | "micrometers" => {
                Some(Self::Micrometre)
            }
            "nm" | "nanometre" | "nanometer" | "nanometres" | "nanometers" => Some(Self::Nanometre),
            "cm-1" | "1/cm" | "wavenumber" => Some(Self::InverseCentimetre),
            _ => None,
        }
    }

    /// The unit as it is written in files.
    pub fn name(self) -> &'static str {
        match self {
            Self::Micrometre => "um",
            Self::Nanometre => "nm",
            Self::InverseCentimetre => "cm-1",
        }
    }

    /// The wavenumber of `value` in this unit; `medium` matters for wavelengths only.
    ///
    /// # Errors
    /// [`NotAWavenumber`] when the value is zero (a wavelength), negative or not a number.
    pub fn wavenumber(self, value: f64, medium: Medium) -> Result<Wavenumber, NotAWavenumber> {
        match self {
            Self::Micrometre => Wavenumber::from_micrometres(value, medium),
            Self::Nanometre => Wavenumber::from_micrometres(value * 1.0e-3, medium),
            Self::InverseCentimetre => Wavenumber::from_inverse_cm(value),
        }
    }

    /// The width in cm⁻¹ of a small width in this unit at `at`: |dν̃| = dλ · ν̃² / 10⁴ (µm).
    pub fn width_inverse_cm(self, width: f64, at: Wavenumber) -> f64 {
        match self {
            Self::Micrometre => width * at.inverse_cm().powi(2) / 1.0e4,
            Self::Nanometre => width * 1.0e-3 * at.inverse_cm().powi(2) / 1.0e4,
            Self::InverseCentimetre => width,
        }
    }
}

/// A stretch of the spectrum, as vacuum wavenumbers in cm⁻¹. Invariant: 0 ≤ low < high, both finite.
#[derive(Clone, Copy, Debug, PartialEq, Serialize)]
pub struct Window {
    low: f64,
    high: f64,
}

/// Why a text is not a window, with what to write instead.
#[derive(Clone, Debug, PartialEq, Eq, thiserror::Error)]
#[error(
    "`{text}` is not a window: {reason}\n  hint: write two ends and a unit, like 1.0:2.6um, 1000:2600nm or 4000:8000cm-1"
)]
pub struct NotAWindow {
    /// What was written.
    pub text: String,
    /// What is wrong with it.
    pub reason: String,
}

impl Window {
    /// Every wavenumber a vibrational spectrum can have.
    pub const WHOLE: Self = Self { low: 0.0, high: 1.0e5 };

    /// Below this a number without a unit is more likely a wavelength in µm: the user is asked, nothing is assumed.
    const LOWEST_WITHOUT_UNIT: f64 = 100.0;

    /// The window between two vacuum wavenumbers in cm⁻¹, in either order; `None` when they are equal, negative or not
    /// finite.
    pub fn between(one: f64, other: f64) -> Option<Self> {
        let (low, high) = if one <= other { (one, other) } else { (other, one) };
        (low >= 0.0 && low < high && high.is_finite()).then_some(Self { low, high })
    }

    /// The window a person wrote: two ends in either order, separated by `:`, `..`, `–`, `-` or ` to `, and a unit
    /// behind the second end or behind both. Without a unit the ends are wavenumbers, unless they are so small that
    /// micrometres may be meant: that is an error. `medium` matters for wavelengths only.
    ///
    /// # Errors
    /// [`NotAWindow`] with the reason.
    pub fn from_text(text: &str, medium: Medium) -> Result<Self, NotAWindow> {
        let refuse = |reason: &str| {
            let text = text.chars().take(60).flat_map(char::escape_debug).collect();
            NotAWindow { text, reason: reason.to_owned() }
        };
        let plain = text.trim().replace('\u{2212}', "-").replace("⁻¹", "-1");
        let (first, second) = halves(&plain).ok_or_else(|| refuse("it has not two ends"))?;
        let ((first, first_unit), (second, second_unit)) = (number_and_unit(first), number_and_unit(second));
        let number = |part: &str| part.parse::<f64>().ok().filter(|v| v.is_finite() && *v >= 0.0);
        let (Some(first), Some(second)) = (number(first), number(second)) else {
            return Err(refuse("an end is not a number, or is negative"));
        };
        let unit = |word: &str| match word.is_empty() {
            true => Ok(None),
            false => AxisUnit::from_text(word).map(Some).ok_or_else(|| refuse("the unit is not um, nm or cm-1")),
        };
        let (unit_of_first, unit_of_second) = (unit(first_unit)?, unit(second_unit)?);
        let Some(second_unit) = unit_of_second.or(unit_of_first) else {
            if first.min(second) < Self::LOWEST_WITHOUT_UNIT {
                return Err(refuse("it has no unit, and micrometres may be meant"));
            }
            return Self::between(first, second).ok_or_else(|| refuse("its ends are equal"));
        };
        let at = |value: f64, unit: AxisUnit| {
            let wavenumber = unit.wavenumber(value, medium).map_err(|_| refuse("a wavelength must be above zero"))?;
            Ok(wavenumber.inverse_cm())
        };
        let (one, other) = (at(first, unit_of_first.unwrap_or(second_unit))?, at(second, second_unit)?);
        Self::between(one, other).ok_or_else(|| refuse("its ends are equal"))
    }

    /// Lower end, cm⁻¹.
    pub fn low(self) -> f64 {
        self.low
    }

    /// Upper end, cm⁻¹.
    pub fn high(self) -> f64 {
        self.high
    }

    /// Whether a wavenumber in cm⁻¹ lies inside, the ends included.
    pub fn contains(self, wavenumber: f64) -> bool {
        self.low <= wavenumber && wavenumber <= self.high
    }
}

/// The two ends of a written window. A hyphen separates only behind a digit or unit letter and before a digit or point,
/// so that the one in `cm-1` and the one of an exponent stay where they are.
fn halves(text: &str) -> Option<(&str, &str)> {
    for separator in [":", "..", "–", "—", " to "] {
        if let Some((first, second)) = text.split_once(separator) {
            return Some((first.trim(), second.trim()));
        }
    }
    text.match_indices('-').find_map(|(at, _)| {
        let (first, second) = (text[..at].trim_end(), text[at + 1..].trim_start());
        let lower = first.to_lowercase();
        let inside = lower.is_empty()
            || lower.ends_with("cm")
            || lower.ends_with("cm^")
            || lower.ends_with("cm^(")
            || lower.strip_suffix('e').is_some_and(|rest| rest.ends_with(|c: char| c.is_ascii_digit() || c == '.'));
        (!inside && second.starts_with(|c: char| c.is_ascii_digit() || c == '.')).then_some((first, second))
    })
}

/// A number and the unit behind it; an `e` belongs to the number when digits follow.
fn number_and_unit(text: &str) -> (&str, &str) {
    let mut end = 0;
    let mut characters = text.char_indices().peekable();
    while let Some((at, c)) = characters.next() {
        let exponent = matches!(c, 'e' | 'E') && characters.peek().is_some_and(|(_, n)| "+-0123456789".contains(*n));
        let sign = matches!(c, '+' | '-') && (at == 0 || text[..at].ends_with(['e', 'E']));
        if !(c.is_ascii_digit() || c == '.' || exponent || sign) {
            break;
        }
        end = at + c.len_utf8();
    }
    (&text[..end], text[end..].trim())
}

/// Refractivity (n − 1) of standard air at a vacuum wavelength in µm.
///
/// # Method and source
/// Ciddor, Appl. Opt. 35, 1566 (1996): (n − 1)·10⁸ = 5792105/(238.0185 − σ²) + 167917/(57.362 − σ²), σ = 1/λ in µm⁻¹.
/// Printed for 0.23–1.69 µm; extrapolated to 4 µm it differs from Mathar, J. Opt. A 9, 470 (2007), by less than
/// 2.2·10⁻⁴ cm⁻¹ in position, so one formula serves.
pub fn standard_air_refractivity(vacuum_micrometres: f64) -> f64 {
    let sigma_squared = vacuum_micrometres.powi(-2);
    1.0e-8 * (5_792_105.0 / (238.0185 - sigma_squared) + 167_917.0 / (57.362 - sigma_squared))
}

/// Wavelength in standard air of a vacuum wavelength, both in µm.
pub fn air_wavelength(vacuum_micrometres: f64) -> f64 {
    vacuum_micrometres / (1.0 + standard_air_refractivity(vacuum_micrometres))
}

/// Vacuum wavelength of a wavelength in standard air, both in µm.
///
/// The index is a function of the vacuum wavelength, hence the iteration; each step gains about eight digits.
pub fn vacuum_wavelength(air_micrometres: f64) -> f64 {
    let mut vacuum = air_micrometres;
    for _ in 0..5 {
        vacuum = air_micrometres * (1.0 + standard_air_refractivity(vacuum));
    }
    vacuum
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn air_wavelengths_meet_published_points() {
        // Vacuum to air in standard air: Ciddor 1996 as implemented in public libraries, nm. Status: read.
        for (vacuum_nm, air_nm) in [(550.0, 549.84723175), (400.0, 399.88692724)] {
            let air = 1.0e3 * air_wavelength(vacuum_nm * 1.0e-3);
            assert!((air - air_nm).abs() < 1.0e-7, "{vacuum_nm}: {air} against {air_nm}");
            assert!((1.0e3 * vacuum_wavelength(air_nm * 1.0e-3) - vacuum_nm).abs() < 1.0e-7);
        }
    }

    #[test]
    fn units_are_known_in_the_spellings_people_use() {
        for text in ["um", "µm", "μm", "Micron", " um "] {
            assert_eq!(AxisUnit::from_text(text), Some(AxisUnit::Micrometre), "{text}");
        }
        for text in ["cm-1", "cm^-1", "cm⁻¹", "1/cm", "cm^(-1)"] {
            assert_eq!(AxisUnit::from_text(text), Some(AxisUnit::InverseCentimetre), "{text}");
        }
        assert_eq!(AxisUnit::from_text("furlong"), None);
    }

    #[test]
    fn a_window_is_read_in_the_forms_people_write() {
        let vacuum = |text: &str| Window::from_text(text, Medium::Vacuum).map(|w| (w.low(), w.high()));
        for text in [
            "4000:8000",
            "8000:4000",
            "4000-8000cm-1",
            "4000 - 8000 cm^-1",
            "4000..8000 cm⁻¹",
            "4e3-8e3cm-1",
            "4000 to 8000",
            "4000cm-1:8000cm-1",
            "4000cm-1-8000cm-1",
            "4000–8000",
            "2.5:1.25um",
            "1.25um-2500nm",
            "1.25-2.5 µm",
            "1250:2500nm",
            "4000:1.25um",
        ] {
            // The last form names one unit only, so it means 4000 µm and is not the same window.
            let expected = if text == "4000:1.25um" { (2.5, 8000.0) } else { (4000.0, 8000.0) };
            let (low, high) = vacuum(text).unwrap();
            assert!((low - expected.0).abs() < 1e-9 && (high - expected.1).abs() < 1e-9, "{text}: {low} to {high}");
        }
        // 1.0 µm in standard air is 9997.26 cm⁻¹: n − 1 = 2.741e-4 by Ciddor's formula at 1 µm.
        let air = Window::from_text("1.0:2.6um", Medium::Air).unwrap();
        assert!((air.high() - 9997.26).abs() < 0.01, "{}", air.high());
        for (text, word) in [
            ("", "two ends"),
            ("4000", "two ends"),
            ("1.0:2.6", "no unit"),
            ("0:2um", "above zero"),
            ("4000:4000", "equal"),
            ("a:b", "not a number"),
            ("1:2furlong", "unit"),
            ("-5:10um", "negative"),
            ("1:nan", "not a number"),
            ("1e999:5um", "not a number"),
        ] {
            let message = vacuum(text).unwrap_err().to_string();
            assert!(message.contains(word) && message.contains("1.0:2.6um"), "{text}: {message}");
        }
    }

    #[test]
    fn a_wavenumber_is_never_negative_nor_infinite() {
        assert!(Wavenumber::from_inverse_cm(-1.0).is_err());
        assert!(Wavenumber::from_inverse_cm(f64::NAN).is_err());
        assert!(Wavenumber::from_vacuum_micrometres(0.0).is_err());
    }
}
