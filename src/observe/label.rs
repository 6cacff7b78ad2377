//! Whether a spectrum fits the label of its sample.
//!
//! A band near 1.9 µm (stretch and bend of one molecule) says molecular water; 1.4 µm (first overtone of the stretch)
//! appears for hydroxyl as well. Source: positions in Bishop, Bell and Moersch (eds), *Remote Compositional Analysis*, chapter
//! 4; the use is common practice.

use super::picking::PickedBand;
use crate::band::Feature;
use crate::note::Note;
use crate::quantity::Window;

/// What the label says.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Label {
    /// The sample holds molecular water.
    Hydrate,
    /// The sample holds none.
    Anhydrous,
}

/// Where the 1.4 µm band of water is looked for, cm⁻¹ (1.38 to 1.54 µm).
pub const OVERTONE_REGION: (f64, f64) = (6500.0, 7250.0);

/// Where the 1.9 µm band of water is looked for, cm⁻¹ (1.89 to 2.03 µm: ice is the longest known here).
pub const COMBINATION_REGION: (f64, f64) = (4930.0, 5300.0);

/// Weakest band that speaks for water, depth as a fraction (a judgement: below it adsorbed water is everywhere).
pub const WEAKEST: f64 = 0.01;

impl Label {
    /// The label in a word (`hydrate`, `anhydrous`) or of a formula: with water in it, or without; `None` for anything else.
    pub fn from_text(text: &str) -> Option<Self> {
        match text.trim().to_lowercase().as_str() {
            "hydrate" | "hydrated" => return Some(Self::Hydrate),
            "anhydrous" | "anhydrate" => return Some(Self::Anhydrous),
            _ => {}
        }
        let formula = text.trim().replace('₂', "2");
        let shape = formula.starts_with(|c: char| c.is_uppercase() || "([".contains(c))
            && formula.chars().all(|c| c.is_alphanumeric() || "()[].·*+-/".contains(c));
        let water = formula.contains("H2O") || formula.contains("D2O") || formula.contains("HDO");
        shape.then_some(if water { Self::Hydrate } else { Self::Anhydrous })
    }
}

/// The hydrate that a title names by its formula, like `Gypsum CaSO4.2H2O`; other titles say nothing that can be checked.
pub fn hydrate_in(title: &str) -> Option<Label> {
    title
        .split([' ', ',', ';', '_'])
        .filter(|word| word.len() > 4 && word.contains("H2O"))
        .find_map(|word| Label::from_text(word).filter(|label| *label == Label::Hydrate))
}

/// How the bands contradict a label; no notes when they do not. What the window does not show cannot be judged, and that is
/// said in the second list.
pub fn contradictions(label: Label, bands: &[PickedBand], window: Window) -> (Vec<Note>, Vec<Note>) {
    let regions = [("1.4", OVERTONE_REGION), ("1.9", COMBINATION_REGION)];
    let (mut against, mut unseen, mut wet) = (Vec::new(), Vec::new(), Vec::new());
    for (name, (low, high)) in regions {
        if window.low() > low || window.high() < high {
            unseen.push(Note::new(format!("the window does not show the {name} um region, where water would be seen")));
            continue;
        }
        let found = bands
            .iter()
            .filter(|b| b.band.feature == Feature::Band && b.depth >= WEAKEST)
            .find(|b| (low..=high).contains(&b.band.position.inverse_cm()));
        match (label, found) {
            (Label::Hydrate, None) => against.push(Note::new(format!(
                "the label says hydrate, but there is no band in the {name} um region ({low:.0} to {high:.0} cm-1): has the \
                 sample dried, or is it another one?"
            ))),
            (Label::Anhydrous, Some(band)) => wet.push((name, band)),
            _ => {}
        }
    }
    if let Some((_, deepest)) = wet.iter().find(|(name, _)| *name == "1.9") {
        let places: Vec<String> = wet.iter().map(|(name, b)| format!("{name} um (depth {:.3})", b.depth)).collect();
        against.push(Note::new(format!(
            "the label says anhydrous, but there are water bands near {}: moisture, a hydrate, or another sample? The band at \
             {:.0} cm-1 needs molecular water",
            places.join(" and "),
            deepest.band.position.inverse_cm()
        )));
    }
    (against, unseen)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn labels_are_read_from_words_and_formulas() {
        for text in ["hydrate", "CaSO4.2H2O", "MgSO4·7H₂O", "Mg(ClO4)2.6H2O"] {
            assert_eq!(Label::from_text(text), Some(Label::Hydrate), "{text}");
        }
        for text in ["anhydrous", "CaSO4", "KNO3", "NaCl"] {
            assert_eq!(Label::from_text(text), Some(Label::Anhydrous), "{text}");
        }
        assert_eq!(Label::from_text("wet?"), None);
        assert_eq!(Label::from_text(""), None);
        assert_eq!(hydrate_in("Gypsum CaSO4.2H2O, HS333.3B"), Some(Label::Hydrate));
        assert_eq!(hydrate_in("H2O vapour over CaSO4"), None);
    }
}
