//! The answer of `assign` in text, CSV and JSON.

use super::mode_table::sheet;
use super::report::{AssignReport, BandRecord};
use super::text::{Align, columns, probability, wrapped};

/// Factors shown per candidate in the text form.
const FACTORS: usize = 4;

/// Part of its uncertainty that a mode must move to be shown in the text form; JSON has all.
const MOVED: f64 = 0.3;

/// Families shown per band in the text form.
const FAMILIES: usize = 5;

/// JSON.
pub fn json(report: &AssignReport) -> String {
    serde_json::to_string_pretty(report).unwrap_or_default() + "\n"
}

/// One row per candidate; *other origin* has a row of its own per band.
pub fn csv(report: &AssignReport) -> String {
    let header = [
        "band",
        "observed_cm1",
        "sigma_cm1",
        "rank",
        "label",
        "family",
        "moieties",
        "probability",
        "predicted_cm1",
        "predicted_sigma_cm1",
        "offset_cm1",
        "order",
        "species",
        "ir",
        "strength_log10",
        "chance_matches",
        "verdict",
        "factors",
    ];
    let mut rows = Vec::new();
    for band in &report.bands {
        let common = |rank: String| {
            vec![band.band.clone(), format!("{:.2}", band.observed_cm1), format!("{:.2}", band.sigma_cm1), rank]
        };
        for (rank, c) in band.candidates.iter().enumerate() {
            let mut row = common((rank + 1).to_string());
            row.extend([
                c.level.label.clone(),
                c.level.family.clone(),
                c.level.moieties.join("; "),
                format!("{:.5}", c.probability),
                format!("{:.2}", c.level.position_cm1),
                format!("{:.2}", c.level.sigma_cm1),
                format!("{:.2}", c.offset_cm1),
                c.level.order.to_string(),
                c.level.species.join(" + "),
                c.level.ir.clone(),
                format!("{:.2}", c.level.strength_log10),
                format!("{:.2}", band.chance_matches.expected),
                band.verdict.clone(),
                c.factors.iter().map(|f| format!("{} ({:+.2})", f.reason, f.log10)).collect::<Vec<_>>().join("; "),
            ]);
            rows.push(row);
        }
        let mut row = common(String::new());
        row.extend(["other origin".to_owned(), String::new(), String::new()]);
        row.push(format!("{:.5}", band.other_origin.probability));
        row.extend(std::iter::repeat_n(String::new(), 7));
        row.extend([format!("{:.2}", band.chance_matches.expected), band.verdict.clone(), String::new()]);
        rows.push(row);
    }
    sheet(&header, rows.into_iter())
}

/// Text for people: a line per band first, then each band with its families, levels and reasons.
pub fn table(report: &AssignReport) -> String {
    use Align::{Left, Right};
    let t = &report.table;
    let sample = if report.sample.is_empty() { String::new() } else { format!(" of {}", report.sample) };
    let mut text = format!(
        "{} bands{sample} with {} ({}), levels up to {} quanta\n{}\n",
        report.bands.len(),
        if t.title.is_empty() { &t.name } else { &t.title },
        t.origin,
        report.quanta,
        report.method
    );
    if let Some(caution) = &t.caution {
        text.push_str(&format!("caution: {}\n", wrapped(caution, 110, "         ")));
    }
    text.push_str("\nIn short\n");
    let rows: Vec<Vec<String>> = report
        .bands
        .iter()
        .map(|b| {
            let (family, p) = b.families.first().map_or(("-".to_owned(), 0.0), |f| (family_text(f), f.probability));
            vec![
                b.band.clone(),
                format!("{:.0}", b.observed_cm1),
                format!("{:.3}", b.observed_um),
                family,
                probability(p),
                probability(b.other_origin.probability),
                count(b.chance_matches.expected),
                b.verdict.clone(),
            ]
        })
        .collect();
    text.push_str(&columns(
        &[
            ("band", Left),
            ("cm-1", Right),
            ("um", Right),
            ("leading family", Left),
            ("prob.", Right),
            ("other origin", Right),
            ("chance matches", Right),
            ("verdict", Left),
        ],
        &rows,
    ));
    let c = &report.coincidence;
    if c.trials > 0 {
        text.push_str(&format!(
            "\nThe whole list against chance: p = {} ({} trials, seed {}; {})\n",
            probability(c.p_value),
            c.trials,
            c.seed,
            c.null
        ));
    }
    for band in &report.bands {
        text.push_str(&one_band(band));
    }
    if !report.missing.is_empty() {
        text.push_str("\nStrong predictions in the measured range that were not seen\n");
        let rows: Vec<Vec<String>> = report
            .missing
            .iter()
            .map(|m| {
                vec![
                    format!("{:.0}", m.position_cm1),
                    format!("{:.0}", m.sigma_cm1),
                    m.label.clone(),
                    probability(m.probability),
                ]
            })
            .collect();
        let header = [("cm-1", Right), ("sigma", Right), ("level", Left), ("prob. of being seen", Right)];
        text.push_str(&columns(&header, &rows));
    }
    if !report.updated_modes.is_empty() {
        text.push_str("\nModes and constants that the assignment moved\n");
        let rows: Vec<Vec<String>> = report
            .updated_modes
            .iter()
            .filter(|m| m.flagged || (m.after_cm1 - m.before_cm1).abs() >= MOVED * m.before_sigma_cm1)
            .map(|m| {
                vec![
                    m.mode.clone(),
                    format!("{:.1} ± {:.1}", m.before_cm1, m.before_sigma_cm1),
                    format!("{:.1} ± {:.1}", m.after_cm1, m.sigma_cm1),
                    if m.flagged { "moved by more than 2 sigma".to_owned() } else { String::new() },
                ]
            })
            .collect();
        text.push_str(&columns(&[("mode", Left), ("before", Right), ("after", Right), ("", Left)], &rows));
    }
    text
}

fn one_band(band: &BandRecord) -> String {
    use Align::{Left, Right};
    let mut text = format!(
        "\nBand {}: {:.1} ± {:.1} cm⁻¹ ({:.4} µm). {}\n  {}\n",
        band.band,
        band.observed_cm1,
        band.sigma_cm1,
        band.observed_um,
        band.verdict,
        wrapped(&band.verdict_reason, 110, "  ")
    );
    let orders: Vec<String> =
        band.chance_matches.by_order.iter().map(|(order, n)| format!("{} with {order} quanta", count(*n))).collect();
    if !orders.is_empty() {
        text.push_str(&format!(
            "  chance matches within ±{:.0} cm⁻¹: {} ({}); weighted by what could be seen: {}\n",
            band.chance_matches.tolerance_cm1,
            count(band.chance_matches.expected),
            orders.join(", "),
            count(band.chance_matches.weighted)
        ));
    }
    let families: Vec<Vec<String>> = band
        .families
        .iter()
        .take(FAMILIES)
        .map(|f| {
            let split =
                if f.carriers > 1 { format!(", {} carriers: may split on cooling", f.carriers) } else { String::new() };
            vec![String::new(), probability(f.probability), family_text(f) + &split]
        })
        .chain([vec![
            String::new(),
            probability(band.other_origin.probability),
            format!(
                "other origin (foreign {}, higher or weaker levels {})",
                probability(band.other_origin.foreign),
                probability(band.other_origin.unlisted)
            ),
        ]])
        .collect();
    text.push_str(&columns(&[("", Left), ("prob.", Right), ("family", Left)], &families));
    let rows: Vec<Vec<String>> = band
        .candidates
        .iter()
        .map(|c| {
            vec![
                String::new(),
                probability(c.probability),
                c.level.label.clone(),
                format!("{:.0} ± {:.0}", c.level.position_cm1, c.level.sigma_cm1),
                format!("{:+.0}", c.offset_cm1),
                c.level.species.join("+"),
                c.level.ir.clone(),
                c.factors
                    .iter()
                    .take(FACTORS)
                    .map(|f| format!("{} ({:+.1})", f.reason, f.log10))
                    .collect::<Vec<_>>()
                    .join("; "),
            ]
        })
        .collect();
    if !rows.is_empty() {
        text.push_str(&columns(
            &[
                ("", Left),
                ("prob.", Right),
                ("level", Left),
                ("predicted", Right),
                ("offset", Right),
                ("species", Left),
                ("infrared", Left),
                ("reasons (log10)", Left),
            ],
            &rows,
        ));
    }
    text
}

/// A family with its moieties: `oh-stretch + hoh-bend (H2O)`.
fn family_text(f: &super::report::FamilyRecord) -> String {
    format!("{} ({})", f.family.join(" + "), f.moieties.join(", "))
}

/// An expected number: two digits that matter.
fn count(n: f64) -> String {
    match n {
        n if n >= 9.95 => format!("{n:.0}"),
        n if n >= 0.095 => format!("{n:.1}"),
        n if n > 0.0 => format!("{n:.2}"),
        _ => "0".to_owned(),
    }
}
