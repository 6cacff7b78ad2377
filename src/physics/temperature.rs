//! A table measured at one temperature, at another; and how much of a sample is thermally excited.
//!
//! # Method
//! Shifts and widths on cooling are judged by motion for 300 → 80 K (the range of published hydrates is wide, hence the
//! uncertainties) and carried to other temperatures by the occupation of a lattice mode of 150 cm⁻¹, n(T), which is the
//! cause of most of them: shift(T₀ → T) = shift(300 → 80) · [n(T₀) − n(T)] / [n(300) − n(80)]. Supported by liquid water
//! 240–273 K (libration −1.20, bend −0.26, O–H stretch +0.36 cm⁻¹ per K on warming; from the optical constants of Rowe,
//! Fergoda & Neshyba, J. Geophys. Res. Atmos. 125, e2020JD032624 (2020)) and by ν₁ of [Mg(OH₂)₆]²⁺ (−3 cm⁻¹ per 100 K,
//! abstract read). Phase transitions are not foreseen.

use crate::library::defaults::Role;
use crate::mode::{ModeTable, Motion};
use crate::note::{Note, Noted};
use crate::physics::position::Model;
use crate::quantity::Wavenumber;

/// k_B/hc, cm⁻¹ per K (CODATA 2018, exact constants).
pub const BOLTZMANN: f64 = 0.695_034_800_4;

/// Temperature of a table that names none, K.
pub const ROOM: f64 = 298.0;

/// Wavenumber of the lattice mode that carries the temperature dependence, cm⁻¹ (judgement).
const CARRIER: f64 = 150.0;

/// exp(−ν/kT): the share of molecules with at least one quantum in a non-degenerate mode. Zero at 0 K.
pub fn boltzmann_factor(wavenumber: f64, kelvin: f64) -> f64 {
    if kelvin > 0.0 { (-wavenumber / (BOLTZMANN * kelvin)).exp() } else { 0.0 }
}

/// Population of the level with `quanta` quanta of one mode with degeneracy d (all its states together):
/// C(v + d − 1, d − 1) x^v (1 − x)^d.
pub fn population(wavenumber: f64, degeneracy: u8, quanta: u8, kelvin: f64) -> f64 {
    let x = boltzmann_factor(wavenumber, kelvin);
    let v = f64::from(quanta);
    let states = match degeneracy {
        0 | 1 => 1.0,
        2 => v + 1.0,
        _ => 0.5 * (v + 1.0) * (v + 2.0),
    };
    states * x.powi(i32::from(quanta)) * (1.0 - x).powi(i32::from(degeneracy.max(1)))
}

/// Mean number of quanta of one oscillator, x / (1 − x).
pub fn occupation(wavenumber: f64, kelvin: f64) -> f64 {
    let x = boltzmann_factor(wavenumber, kelvin);
    x / (1.0 - x)
}

/// Mean displacement of the transitions of a mode by the excitation of all others, Σ x_ij d_j n_j, cm⁻¹: hot transitions
/// that are not resolved shift and broaden the band.
pub fn hot_band_shift(model: &Model, mode: usize, kelvin: f64) -> f64 {
    (0..model.modes())
        .filter(|j| *j != mode)
        .map(|j| model.x(mode, j).value * f64::from(model.degeneracy[j]) * occupation(model.nu[j].max(1.0), kelvin))
        .sum()
}

/// How a motion answers to cooling from 300 to 80 K.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Cooling {
    /// Shift, cm⁻¹; for lattice modes a fraction of the wavenumber.
    pub shift: f64,
    /// One standard uncertainty of the shift.
    pub sigma: f64,
    /// Whether shift and sigma are fractions of the wavenumber.
    pub relative: bool,
    /// Width at 80 K over width at 300 K.
    pub width: f64,
}

/// The answer of a motion to cooling from 300 to 80 K (judgement of this project from the ranges observed in hydrates:
/// O–H −5 to −40, O–D 0.7 of it, librations +10 to +40, M–O +2 to +8, ions ±3 cm⁻¹, lattice +3 to +10 %; widths fall by
/// 1.5 to 4, librations and lattice most).
pub fn cooling(motion: Motion, deuterated: bool) -> Cooling {
    let absolute = |shift, sigma, width| Cooling { shift, sigma, relative: false, width };
    match motion {
        Motion::OhStretch if deuterated => absolute(-15.0, 8.0, 0.5),
        Motion::OhStretch => absolute(-22.0, 11.0, 0.5),
        Motion::HohBend => absolute(2.0, 5.0, 0.6),
        Motion::Libration => absolute(25.0, 10.0, 0.35),
        Motion::MetalOxygen => absolute(5.0, 2.0, 0.5),
        Motion::XoStretch | Motion::OxoBend => absolute(0.0, 3.0, 0.6),
        Motion::NhStretch => absolute(-10.0, 10.0, 0.5),
        Motion::NhBend => absolute(2.0, 5.0, 0.6),
        Motion::Lattice => Cooling { shift: 0.065, sigma: 0.02, relative: true, width: 0.35 },
        Motion::Other => absolute(0.0, 5.0, 0.6),
    }
}

/// Part of the step 300 → 80 K that lies between two temperatures; negative on warming.
fn part(from: f64, to: f64) -> f64 {
    let n = |kelvin: f64| occupation(CARRIER, kelvin);
    (n(from) - n(to)) / (n(300.0) - n(80.0))
}

/// The table at another temperature: positions, uncertainties and given widths move by motion; notes say what moved and
/// how sure it is, and name the cautions of getting there.
pub fn at_temperature(table: &ModeTable, kelvin: f64) -> Noted<ModeTable> {
    let mut new = table.clone();
    let mut notes = Vec::new();
    if !(kelvin.is_finite() && (1.0..=1000.0).contains(&kelvin)) {
        notes.push(Note::new(format!("{kelvin} K is outside 1 to 1000 K; nothing was moved")));
        return Noted { value: new, notes };
    }
    let from = table.temperature.unwrap_or_else(|| {
        notes.push(Note::new(format!("the table names no temperature; {ROOM} K is taken")));
        ROOM
    });
    new.temperature = Some(kelvin);
    let fraction = part(from, kelvin);
    if fraction == 0.0 {
        return Noted { value: new, notes };
    }
    let mut moved: Vec<(Motion, f64, f64)> = Vec::new();
    for (i, mode) in new.modes.iter_mut().enumerate() {
        let answer = cooling(mode.motion, matches!(Role::of(table, i), Role::OdStretch));
        let before = mode.wavenumber.inverse_cm();
        let scale = if answer.relative { before } else { 1.0 };
        let (shift, sigma) = (fraction * answer.shift * scale, (fraction * answer.sigma * scale).abs());
        if let Ok(after) = Wavenumber::from_inverse_cm(before + shift) {
            mode.wavenumber = after;
            mode.sigma = mode.sigma.hypot(sigma);
            mode.sigma_given = true;
            mode.fwhm = mode.fwhm.map(|w| w * answer.width.powf(fraction));
            mode.source = format!("{before:.1} at {from} K {shift:+.1} ± {sigma:.1}; {}", mode.source);
        }
        if !moved.iter().any(|(motion, ..)| *motion == mode.motion) {
            moved.push((mode.motion, shift, sigma));
        }
    }
    moved.sort_by_key(|m| m.0);
    let list: Vec<String> = moved.iter().map(|(m, shift, sigma)| format!("{m} {shift:+.1} ± {sigma:.1}")).collect();
    notes.push(Note::new(format!(
        "moved from {from} to {kelvin} K by motion, cm⁻¹: {} (judged ranges; a phase transition between the two \
         temperatures is not foreseen)",
        list.join(", ")
    )));
    if kelvin < 200.0 {
        notes.push(Note::new(
            "caution: cryogens burn skin, displace air and build pressure when closed in; follow local rules",
        ));
    }
    if kelvin > 330.0 {
        notes.push(Note::new(
            "caution: heating drives water off hydrates, and perchlorates, chlorates and nitrates can decompose violently, \
             above all near organic matter; follow local rules and trained practice",
        ));
    }
    Noted { value: new, notes }
}
