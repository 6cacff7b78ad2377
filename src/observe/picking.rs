//! Band picking: maxima of depth below the continuum that stand out from the noise; shoulders and edges by curvature.

use serde::Serialize;

use super::centre::{centroid, crossings, parabola};
use super::continuum::Continuum;
use super::impostor;
use super::label::{Label, contradictions, hydrate_in};
use super::noise;
use super::prominence::{Peak, peaks};
use super::reflectance::apparent_absorbance;
use super::shoulder;
use super::smoothing::{smoothed, thinned};
use super::width::{Resolution, intrinsic_width, noise_limit};
use crate::band::{Band, BandList, Feature, Ordinate, Spectrum};
use crate::mode::Strength;
use crate::note::{Note, Noted};
use crate::quantity::{AxisUnit, Wavenumber, Window, standard_air_refractivity};

/// Near infrared: the window without another choice, cm⁻¹ (2.55 to 0.85 µm). Below it the O–H stretches of hydrates saturate;
/// above it lies the electronic absorption of impurities. Common practice, no source.
pub const NEAR_INFRARED: (f64, f64) = (3922.0, 11_765.0);

/// Second choice when a spectrum does not reach the near infrared, cm⁻¹ (5.3 to 3.3 µm): below the O–H stretches, above
/// the fundamentals of the oxyanions.
pub const MIDDLE_INFRARED: (f64, f64) = (1887.0, 3030.0);

/// Below this a strong fundamental of a powder shows as a reststrahlen *peak* of reflectance, cm⁻¹ (common practice).
const RESTSTRAHLEN: f64 = 1850.0;

/// Fewest points in a window in which bands can be picked.
pub const FEWEST_POINTS: usize = 7;

/// Points at each end of the window that are no place for a band.
const END_POINTS: usize = 2;

/// Reflectance below which a band is saturated: its minimum is the surface's, not the band's (a common rule).
pub const SATURATED_REFLECTANCE: f64 = 0.05;

/// Depth above which a band is saturated.
pub const SATURATED_DEPTH: f64 = 0.8;

/// How bands are picked.
#[derive(Clone, Debug, PartialEq)]
pub struct PickOptions {
    /// Where; [`NEAR_INFRARED`] as far as measured when `None`.
    pub window: Option<Window>,
    /// Instrument resolution; widths are freed of it.
    pub resolution: Option<Resolution>,
    /// How far a band must stand out from its surroundings, as a fraction of the continuum.
    pub least_depth: f64,
    /// How many standard deviations of noise it must stand out.
    pub significance: f64,
    /// Whether shoulders and edges are looked for.
    pub shoulders: bool,
    /// What the sample's label says, to be checked; a hydrate named by its formula in the title is checked without it.
    pub label: Option<Label>,
}

impl Default for PickOptions {
    /// Near infrared, bands of 1.2 % and five standard deviations, shoulders too.
    fn default() -> Self {
        Self { window: None, resolution: None, least_depth: 0.012, significance: 5.0, shoulders: true, label: None }
    }
}

/// A band with what is known of it beyond the band list.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct PickedBand {
    /// The band as it stands in the list.
    #[serde(flatten)]
    pub band: Band,
    /// Depth below the continuum as a fraction of it.
    pub depth: f64,
    /// How far it stands out from its surroundings.
    pub prominence: f64,
    /// Vertex of the parabola through the deepest points, cm⁻¹.
    pub parabola: Option<f64>,
    /// Centroid of what is deeper than half, weighted by depth, cm⁻¹.
    pub centroid: Option<f64>,
    /// Middle between the flanks at half depth, cm⁻¹.
    pub midpoint: Option<f64>,
    /// Whether the band is saturated.
    pub saturated: bool,
}

/// The bands of a spectrum, and what they were picked from.
#[derive(Clone, Debug, PartialEq)]
pub struct Picked {
    /// The band list, ascending in wavenumber.
    pub list: BandList,
    /// The same bands with details.
    pub bands: Vec<PickedBand>,
    /// The continuum in the ordinate of the spectrum.
    pub continuum: Continuum,
    /// Wavenumbers in the window, cm⁻¹.
    pub wavenumbers: Vec<f64>,
    /// Depth below the continuum at those wavenumbers, as a fraction.
    pub depths: Vec<f64>,
    /// Standard deviation of the noise, as a fraction of the continuum (median over the window).
    pub noise: f64,
    /// The window that was searched.
    pub window: Window,
    /// How the bands contradict the label; empty when they do not, or no label was given.
    pub contradictions: Vec<Note>,
}

/// Picks the bands of a spectrum.
///
/// # Units and shapes
/// Bands ascend in wavenumber and are called `b1`, `b2` … from the low end. `strength` is the apparent absorbance of the band
/// below its continuum, −log10(1 − depth); the list's detection limit is on the same scale. `sigma` is in cm⁻¹.
/// # Method
/// Continuum and depth over wavenumber; maxima of depth whose prominence exceeds the least depth and the noise. The position
/// is the vertex of the parabola through the deepest points; its uncertainty joins the noise limit, the scatter of parabola,
/// centroid and midpoint, the pull of neighbours, the flat bottom of a saturated band, the choice of continuum, and an unstated
/// medium.
pub fn pick(spectrum: &Spectrum, options: &PickOptions) -> Noted<Picked> {
    let mut notes = Vec::new();
    let name = &spectrum.name;
    let window = search_window(spectrum, options, &mut notes);
    let inside: Vec<usize> = (0..spectrum.wavenumbers.len().min(spectrum.ordinates.len()))
        .filter(|&i| window.contains(spectrum.wavenumbers[i]))
        .collect();
    let x: Vec<f64> = inside.iter().map(|&i| spectrum.wavenumbers[i]).collect();
    let y: Vec<f64> = inside.iter().map(|&i| spectrum.ordinates[i]).collect();
    let (x, y) = thinned(x, y);
    let mut picked = Picked {
        list: BandList {
            name: name.clone(),
            sample: spectrum.title.clone(),
            medium_given: true,
            ..BandList::default()
        },
        bands: Vec::new(),
        continuum: Continuum::default(),
        wavenumbers: x.clone(),
        depths: Vec::new(),
        noise: 0.0,
        window,
        contradictions: Vec::new(),
    };
    if x.len() < FEWEST_POINTS {
        notes.push(Note::new(format!(
            "{name}: {} points between {:.0} and {:.0} cm-1, too few to pick bands",
            x.len(),
            window.low(),
            window.high()
        )));
        return Noted { value: picked, notes };
    }
    picked.list.range = Some((x[0], x[x.len() - 1]));
    let absorbing = spectrum.ordinate == Ordinate::Absorbance;
    // Noise of an absorbance A is a relative noise of ln 10 · δA.
    let relative = |noise: f64, hull: f64| {
        if absorbing { noise * std::f64::consts::LN_10 } else { noise / hull.abs().max(1.0e-6) }
    };
    let typical_step = median(&x.windows(2).map(|pair| pair[1] - pair[0]).collect::<Vec<_>>());
    let raw_noise = noise::along(&y, typical_step, 256);
    let raw_hull = depths_below(&x, &y, absorbing).0.over(&x);
    let raw_relative: Vec<f64> = raw_noise.iter().zip(&raw_hull).map(|(n, h)| relative(*n, *h)).collect();
    picked.noise = median(&raw_relative);
    let least = options.least_depth.max(1.0e-6);
    // The largest of many samples of noise is larger than that of few: as √ln n, the reference being a hundred.
    let significance = options.significance * ((x.len() as f64).ln() / 100.0_f64.ln()).sqrt().max(1.0);
    let smooth = smoothed(&x, &y, typical_step, least / (significance * picked.noise.max(1.0e-12)));
    if let Some(span) = smooth.span {
        notes.push(Note::new(format!(
            "{name}: noise of {:.2} % of the continuum; the spectrum was smoothed by parabolas over {span:.0} cm-1",
            100.0 * picked.noise
        )));
    }
    let y = smooth.ordinates;
    let (continuum, depths) = depths_below(&x, &y, absorbing);
    let sample_noise: Vec<f64> = raw_relative.iter().map(|n| n * smooth.noise_factor).collect();
    picked.wavenumbers.clone_from(&x);
    let kept: Vec<Peak> = peaks(&depths)
        .into_iter()
        .filter(|p| p.prominence >= least.max(significance * sample_noise[p.at]))
        // The continuum touches the ends of the window, so that the very last points can look like a band.
        .filter(|p| p.at >= END_POINTS && p.at + END_POINTS < x.len())
        .collect();
    let data = Data {
        spectrum,
        options,
        x: &x,
        y: &y,
        depths: &depths,
        noise: &sample_noise,
        raw_noise: &raw_relative,
        continuum: &continuum,
    };
    for (k, peak) in kept.iter().enumerate() {
        let from = k.checked_sub(1).map_or(0, |before| lowest(&depths, kept[before].at, peak.at));
        let to = kept.get(k + 1).map_or(x.len() - 1, |next| lowest(&depths, peak.at, next.at));
        picked.bands.extend(data.band(*peak, from, to));
    }
    if options.shoulders {
        let tops: Vec<usize> = kept.iter().map(|p| p.at).collect();
        let noise = picked.noise * smooth.noise_factor;
        let least = (2.0 * least).max(2.0 * significance * noise);
        for found in shoulder::shoulders(&x, &depths, &tops, least, noise) {
            // The rounded corners of a saturated band bend like shoulders.
            let beside = |b: &PickedBand| {
                let reach = 1.5 * b.band.fwhm.unwrap_or(0.0);
                b.saturated && (b.band.position.inverse_cm() - found.position).abs() < reach
            };
            if !picked.bands.iter().any(beside) {
                picked.bands.extend(data.shoulder(&found));
            }
        }
        picked.bands.extend(data.edges(&kept));
    }
    picked.bands.sort_by(|a, b| a.band.position.inverse_cm().total_cmp(&b.band.position.inverse_cm()));
    for (k, found) in picked.bands.iter_mut().enumerate() {
        found.band.id = format!("b{}", k + 1);
    }
    picked.list.bands = picked.bands.iter().map(|b| b.band.clone()).collect();
    let limit = least.max(significance * picked.noise * smooth.noise_factor).min(0.99);
    picked.list.detection_limit = Some(apparent_absorbance(1.0 - limit));
    remarks(spectrum, options, &picked, &x, &mut notes);
    // A formula in the title is a label as well, but nobody asked: what contradicts it is only noted.
    if let Some(label) = options.label.or_else(|| hydrate_in(&spectrum.title)) {
        let covered = Window::between(x[0], x[x.len() - 1]).unwrap_or(window);
        let (against, unseen) = contradictions(label, &picked.bands, covered);
        notes.extend(against.clone());
        if options.label.is_some() {
            picked.contradictions = against;
            notes.extend(unseen);
        }
    }
    picked.continuum = continuum;
    picked.depths = depths;
    Noted { value: picked, notes }
}

/// Continuum in the ordinate given, and depths as fractions. Absorbance has its continuum below: the hull of −A.
fn depths_below(x: &[f64], y: &[f64], absorbing: bool) -> (Continuum, Vec<f64>) {
    if absorbing {
        let negative: Vec<f64> = y.iter().map(|a| -a).collect();
        let mut hull = Continuum::upper_hull(x, &negative);
        let depths = hull.over(x).into_iter().zip(&negative).map(|(h, n)| 1.0 - 10.0_f64.powf(n - h)).collect();
        for vertex in &mut hull.vertices {
            vertex.1 = -vertex.1;
        }
        (hull, depths)
    } else {
        let hull = Continuum::upper_hull(x, y);
        let depths = hull.removed(x, y).into_iter().map(|r| 1.0 - r).collect();
        (hull, depths)
    }
}

/// The window to search, noted when it was not chosen.
fn search_window(spectrum: &Spectrum, options: &PickOptions, notes: &mut Vec<Note>) -> Window {
    let name = &spectrum.name;
    let (low, high) = match (spectrum.wavenumbers.first(), spectrum.wavenumbers.last()) {
        (Some(low), Some(high)) => (*low, *high),
        _ => (0.0, 0.0),
    };
    let whole = Window::between(low, high).unwrap_or_else(|| Window::between(low, low + 1.0).unwrap_or(EVERYTHING));
    if let Some(window) = options.window {
        if spectrum.ordinate == Ordinate::Reflectance && window.low().max(low) < RESTSTRAHLEN {
            notes.push(Note::new(format!(
                "{name}: below {RESTSTRAHLEN} cm-1 strong fundamentals of powders are reststrahlen peaks of reflectance, not \
                 minima; bands picked there are doubtful"
            )));
        }
        return window;
    }
    let part = |(from, to): (f64, f64)| {
        let inside = spectrum.wavenumbers.iter().filter(|v| (from..=to).contains(*v)).count();
        Window::between(low.max(from), high.min(to)).filter(|_| inside >= 2 * FEWEST_POINTS)
    };
    let window = part(NEAR_INFRARED).or_else(|| part(MIDDLE_INFRARED)).unwrap_or(whole);
    if window != whole {
        notes.push(Note::new(format!(
            "{name}: measured from {low:.0} to {high:.0} cm-1, searched from {:.0} to {:.0} cm-1: O-H stretches saturate near \
             3 um, and fundamentals of powders are no minima of reflectance (--window chooses another part)",
            window.low(),
            window.high()
        )));
    }
    window
}

/// A window for a spectrum without points.
const EVERYTHING: Window = Window::WHOLE;

fn median(values: &[f64]) -> f64 {
    let mut sorted = values.to_vec();
    sorted.sort_by(f64::total_cmp);
    sorted.get(sorted.len() / 2).copied().unwrap_or(0.0)
}

/// The point of least depth between two points.
fn lowest(depths: &[f64], from: usize, to: usize) -> usize {
    (from..=to).min_by(|a, b| depths[*a].total_cmp(&depths[*b])).unwrap_or(from)
}

/// What the measures of one band are taken from.
struct Data<'a> {
    spectrum: &'a Spectrum,
    options: &'a PickOptions,
    x: &'a [f64],
    y: &'a [f64],
    depths: &'a [f64],
    noise: &'a [f64],
    raw_noise: &'a [f64],
    continuum: &'a Continuum,
}

/// Share of the prominence that the points of the parabola may lie below the top.
const CORE: f64 = 0.03;

/// Most points of the parabola on each side of the top.
const CORE_POINTS: usize = 50;

impl Data<'_> {
    fn step(&self, at: usize) -> f64 {
        let (from, to) = (at.saturating_sub(1), (at + 1).min(self.x.len() - 1));
        (self.x[to] - self.x[from]) / (to - from).max(1) as f64
    }

    /// The uncertainty of an unstated medium: the truth lies between vacuum and air, ν (n − 1) below, evenly.
    fn medium_sigma(&self, position: f64) -> f64 {
        let in_wavelength = self.spectrum.axis.is_some_and(|a| a != AxisUnit::InverseCentimetre);
        if in_wavelength && !self.spectrum.medium_given && position > 0.0 {
            position * standard_air_refractivity(1.0e4 / position) / 3.0_f64.sqrt()
        } else {
            0.0
        }
    }

    fn resolution(&self, position: f64) -> Option<f64> {
        self.options.resolution.map(|r| r.at(position)).or(self.spectrum.resolution)
    }

    /// The band at a maximum of depth whose own ground reaches from point `from` to point `to`.
    fn band(&self, peak: Peak, from: usize, to: usize) -> Option<PickedBand> {
        let (x, depths, top) = (self.x, self.depths, peak.at);
        // Noise asks for a parabola that is wide enough to average it, up to a third of what stands out.
        let core_level = depths[top] - (CORE * peak.prominence).max((3.0 * self.noise[top]).min(0.3 * peak.prominence));
        let walk = |end: usize, step: isize| {
            let mut at = top;
            while at != end && at.abs_diff(top) < CORE_POINTS {
                let next = at.checked_add_signed(step).unwrap_or(end);
                if depths[next] < core_level {
                    break;
                }
                at = next;
            }
            at
        };
        let (core_from, core_to) = (walk(from, -1).min(top.saturating_sub(1)), walk(to, 1).max(top + 1));
        let three = (top.saturating_sub(1), (top + 1).min(x.len() - 1));
        let vertex = parabola(&x[core_from..=core_to.min(x.len() - 1)], &depths[core_from..=core_to.min(x.len() - 1)])
            .or_else(|| parabola(&x[three.0..=three.1], &depths[three.0..=three.1]));
        let (position, depth) = vertex.map_or((x[top], depths[top]), |v| (v.position, v.height.max(core_level)));
        let depth = depth.clamp(0.0, 0.9999);

        // What is deeper than half: of the whole depth where the flanks reach it, else of what stands out.
        let out_level = depths[top] - 0.5 * peak.prominence;
        let half = crossings(x, depths, top, 0.5 * depths[top], from, to);
        let out = crossings(x, depths, top, out_level, from, to);
        let midpoint = match (half, out) {
            ((Some(l), Some(r)), _) | (_, (Some(l), Some(r))) => Some((l + r) / 2.0),
            _ => None,
        };
        let level = if let (Some(_), Some(_)) = half { 0.5 * depths[top] } else { out_level };
        let weight: Vec<f64> = depths[from..=to].iter().map(|d| if *d >= level { *d } else { 0.0 }).collect();
        let centre = centroid(&x[from..=to], &weight);
        let seen = match half {
            (Some(l), Some(r)) => Some(r - l),
            // One flank only: the other is hidden under a neighbour.
            (Some(l), None) => Some(2.0 * (position - l)),
            (None, Some(r)) => Some(2.0 * (r - position)),
            (None, None) => None,
        }
        .filter(|w| *w > 0.0);
        let out_width = match out {
            (Some(l), Some(r)) => r - l,
            (Some(l), None) => 2.0 * (position - l),
            (None, Some(r)) => 2.0 * (r - position),
            (None, None) => x[to] - x[from],
        }
        .abs();

        let step = self.step(top);
        let mut remarks: Vec<String> = Vec::new();
        let mut fwhm = seen;
        if let (Some(width), Some(instrument)) = (seen, self.resolution(position)) {
            match intrinsic_width(width, instrument) {
                Some(intrinsic) => fwhm = Some(intrinsic),
                None => {
                    remarks.push("not wider than the resolution".to_owned());
                    fwhm = None;
                }
            }
        }
        let estimates: Vec<f64> = [Some(position), centre, midpoint].into_iter().flatten().collect();
        // The noise of the very parabola, and never less than the limit that no estimate beats. Smoothed neighbours share
        // their noise: what counts is the noise of the samples as measured.
        let limit = noise_limit(seen.unwrap_or(out_width), step, self.raw_noise[top], peak.prominence)
            .max(vertex.map_or(step, |v| v.position_error * self.raw_noise[top]));
        // The maximum of a band on the flank of a deeper one is pulled towards it.
        let pull = 0.25 * out_width * (1.0 - peak.prominence / depths[top]).max(0.0);
        let saturated = self.is_saturated(top, depth);
        let bottom = if saturated {
            remarks.push("saturated: position and strength are doubtful".to_owned());
            let (l, r) = crossings(x, depths, top, 0.95 * depths[top], from, to);
            (r.unwrap_or(position) - l.unwrap_or(position)).abs() / 12.0_f64.sqrt()
        } else {
            0.0
        };
        let (continuum_sigma, open) = self.continuum_sigma(position, depth, seen.unwrap_or(out_width));
        if open {
            remarks.push("one flank is not closed within the window".to_owned());
        }
        remarks.extend(impostor::warning(position, Some(out_width)).map(str::to_owned));
        let parts = [limit, scatter(&estimates), pull, bottom, continuum_sigma, self.medium_sigma(position)];
        let sigma = parts.into_iter().map(|s| s * s).sum::<f64>().sqrt();
        let band = Band {
            id: String::new(),
            position: Wavenumber::from_inverse_cm(position).ok()?,
            sigma,
            sigma_given: true,
            fwhm,
            strength: Some(Strength::Relative(apparent_absorbance(1.0 - depth))),
            feature: Feature::Band,
            note: remarks.join("; "),
        };
        Some(PickedBand {
            band,
            depth,
            prominence: peak.prominence,
            parabola: vertex.map(|v| v.position),
            centroid: centre,
            midpoint,
            saturated,
        })
    }

    fn is_saturated(&self, at: usize, depth: f64) -> bool {
        match self.spectrum.ordinate {
            Ordinate::Absorbance => depth > 0.99,
            _ => depth > SATURATED_DEPTH || self.y[at] < SATURATED_REFLECTANCE,
        }
    }

    /// What the choice of continuum may move a band by, and whether the band lies on an open flank: between the last two
    /// vertices of a continuum that ends lower, with the window and not with the band.
    ///
    /// A slope moves a Gaussian by (H′/H)(1 − D) s² / D (derived for this project). Whether the continuum multiplies (then the
    /// division undoes it) or adds (then all of it stays) is not known: evenly between, hence a share of 1/√12; half of it
    /// where the flank is open and the slope itself is in doubt.
    fn continuum_sigma(&self, position: f64, depth: f64, width: f64) -> (f64, bool) {
        let vertices = &self.continuum.vertices;
        let right = vertices.partition_point(|v| v.0 <= position).clamp(1, vertices.len().saturating_sub(1).max(1));
        let (Some(a), Some(b)) = (vertices.get(right - 1), vertices.get(right)) else { return (0.0, false) };
        let absorbing = self.spectrum.ordinate == Ordinate::Absorbance;
        let slope = if absorbing {
            std::f64::consts::LN_10 * (b.1 - a.1) / (b.0 - a.0)
        } else {
            (b.1 - a.1) / (b.0 - a.0) / (0.5 * (a.1 + b.1)).abs().max(1.0e-6)
        };
        // A continuum that comes back to its height has closed the band.
        let falls = |outer: f64, inner: f64| if absorbing { outer > 1.1 * inner } else { outer < 0.9 * inner };
        let open = (right == 1 && falls(a.1, b.1)) || (right + 1 == vertices.len() && falls(b.1, a.1));
        let s = width / 2.355;
        let shift = (slope.abs() * (1.0 - depth) * s * s / depth.max(1.0e-3)).min(width);
        (if open { 0.5 * shift } else { shift / 12.0_f64.sqrt() }, open)
    }

    /// A band of the list from a shoulder.
    fn shoulder(&self, found: &shoulder::Shoulder) -> Option<PickedBand> {
        let warning = impostor::warning(found.position, Some(found.width)).unwrap_or("");
        let band = Band {
            id: String::new(),
            position: Wavenumber::from_inverse_cm(found.position).ok()?,
            // A shoulder is found to about a fifth of its width (a judgement), never better than the sampling.
            sigma: (found.width / 5.0).hypot(self.step(found.at)).hypot(self.medium_sigma(found.position)),
            sigma_given: true,
            fwhm: Some(found.width),
            strength: Some(Strength::Relative(apparent_absorbance(1.0 - found.depth.clamp(1.0e-6, 0.9999)))),
            feature: Feature::Shoulder,
            note: warning.to_owned(),
        };
        let depth = self.depths[found.at];
        let saturated = self.is_saturated(found.at, depth);
        Some(PickedBand {
            band,
            depth,
            prominence: found.depth,
            parabola: None,
            centroid: None,
            midpoint: None,
            saturated,
        })
    }

    /// Steep ends: the last piece of continuum falls by more than a third towards an end of the window without a band on it.
    fn edges(&self, kept: &[Peak]) -> Vec<PickedBand> {
        let vertices = &self.continuum.vertices;
        let n = vertices.len();
        if n < 3 || self.spectrum.ordinate == Ordinate::Absorbance {
            return Vec::new();
        }
        let ends = [(vertices[1], vertices[0]), (vertices[n - 2], vertices[n - 1])];
        ends.into_iter().filter_map(|(inner, outer)| self.edge(inner, outer, kept)).collect()
    }

    fn edge(&self, inner: (f64, f64), outer: (f64, f64), kept: &[Peak]) -> Option<PickedBand> {
        let (low, high) = (inner.0.min(outer.0), inner.0.max(outer.0));
        let occupied = kept.iter().any(|p| (low..=high).contains(&self.x[p.at]));
        if occupied || outer.1 > 0.67 * inner.1 {
            return None;
        }
        let half = 0.5 * (inner.1 + outer.1);
        let first = self.x.partition_point(|v| *v < low);
        let last = self.x.partition_point(|v| *v <= high);
        let at = (first..last).min_by(|a, b| (self.y[*a] - half).abs().total_cmp(&(self.y[*b] - half).abs()))?;
        let position = self.x[at];
        let drop = 1.0 - outer.1 / inner.1;
        let band = Band {
            id: String::new(),
            position: Wavenumber::from_inverse_cm(position).ok()?,
            sigma: ((high - low) / 4.0).hypot(self.step(at)),
            sigma_given: true,
            fwhm: None,
            strength: Some(Strength::Relative(apparent_absorbance(1.0 - drop.clamp(0.0, 0.9999)))),
            feature: Feature::Edge,
            note: "the spectrum falls towards the end of the window".to_owned(),
        };
        Some(PickedBand {
            band,
            depth: drop,
            prominence: drop,
            parabola: None,
            centroid: None,
            midpoint: None,
            saturated: false,
        })
    }
}

/// Standard deviation of a few estimates of one position; zero for fewer than two.
fn scatter(values: &[f64]) -> f64 {
    if values.len() < 2 {
        return 0.0;
    }
    let mean = values.iter().sum::<f64>() / values.len() as f64;
    (values.iter().map(|v| (v - mean).powi(2)).sum::<f64>() / (values.len() - 1) as f64).sqrt()
}

/// Notes about the spectrum as a whole.
fn remarks(spectrum: &Spectrum, options: &PickOptions, picked: &Picked, x: &[f64], notes: &mut Vec<Note>) {
    let name = &spectrum.name;
    let steps: Vec<f64> = x.windows(2).map(|pair| pair[1] - pair[0]).collect();
    // A step grows with the square of the wavenumber where wavelengths are evenly spaced: neighbours are compared.
    for (k, pair) in steps.windows(2).enumerate() {
        if pair[1] > 8.0 * pair[0] && pair[1] > 25.0 {
            notes.push(Note::new(format!(
                "{name}: nothing was measured between {:.0} and {:.0} cm-1; a band there is not seen",
                x[k + 1],
                x[k + 2]
            )));
        }
    }
    if let (Some(resolution), None, false) = (spectrum.resolution, options.resolution, picked.bands.is_empty()) {
        notes.push(Note::new(format!(
            "{name}: widths are freed of the resolution that the file states, {resolution:.1} cm-1 (--resolution says another)"
        )));
    }
    let say = |notes: &mut Vec<Note>, which: Vec<&str>, what: &str| {
        if !which.is_empty() {
            notes.push(Note::new(format!("{name}: {}: {what}", which.join(", "))));
        }
    };
    let ids = |test: &dyn Fn(&PickedBand) -> bool| {
        picked.bands.iter().filter(|b| test(b)).map(|b| b.band.id.as_str()).collect::<Vec<_>>()
    };
    say(
        notes,
        ids(&|b| b.saturated),
        "saturated; position and strength are doubtful, a thinner or diluted sample helps",
    );
    let vapour = |b: &PickedBand| b.band.note.contains("water vapour");
    say(
        notes,
        ids(&vapour),
        "sharp, between 3820 and 3905 cm-1: water vapour left over in the instrument, not the sample?",
    );
    let organic = |b: &PickedBand| b.band.note.contains("organic");
    say(
        notes,
        ids(&organic),
        "at the C-H stretches: organic residue, not the sample? Overtones of carbonates and nitrates lie here too",
    );
    if picked.bands.is_empty() {
        notes
            .push(Note::new(format!("{name}: no band stands out from the continuum by the least depth and the noise")));
    }
}
