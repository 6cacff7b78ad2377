//! The answer of `predict` in every format.

use super::mode_table::sheet;
use super::report::{LevelRecord, PredictReport};
use super::text::{Align, columns, wrapped};

/// How many levels the text form lists; the other forms list all.
const SHOWN: usize = 60;

/// How many families the text form lists.
const FAMILIES: usize = 24;

/// JSON.
pub fn json(report: &PredictReport) -> String {
    serde_json::to_string_pretty(report).unwrap_or_default() + "\n"
}

/// One row per level.
pub fn csv(report: &PredictReport) -> String {
    let header = [
        "label",
        "family",
        "order",
        "position_cm1",
        "sigma_cm1",
        "position_um",
        "moieties",
        "species",
        "ir",
        "raman",
        "strength_log10",
        "strength_class",
        "fwhm_cm1",
        "from",
        "shares",
        "constants",
    ];
    sheet(
        &header,
        report.levels.iter().map(|l| {
            vec![
                l.label.clone(),
                l.family.clone(),
                l.order.to_string(),
                format!("{:.2}", l.position_cm1),
                format!("{:.2}", l.sigma_cm1),
                format!("{:.5}", l.position_um),
                l.moieties.join("; "),
                l.species.join(" + "),
                l.ir.clone(),
                l.raman.clone(),
                format!("{:.2}", l.strength_log10),
                l.strength_class.clone(),
                format!("{:.0}", l.fwhm_cm1),
                l.from.clone(),
                l.shares.iter().map(|s| format!("{} {:.3}", s.label, s.share)).collect::<Vec<_>>().join("; "),
                constants(l),
            ]
        }),
    )
}

fn constants(level: &LevelRecord) -> String {
    let one =
        |k: &super::report::UsedConstant| format!("{} {:+.1}±{:.1} {}", k.quantity, k.value_cm1, k.sigma_cm1, k.origin);
    level.constants.iter().map(one).collect::<Vec<_>>().join("; ")
}

/// How the constants of a level came to be, in short: `2 given, 1 defaulted`.
fn origins(level: &LevelRecord) -> String {
    let parts = ["given", "computed", "transferred", "defaulted"].into_iter().filter_map(|origin| {
        let count = level.constants.iter().filter(|k| k.origin == origin).count();
        (count > 0).then(|| format!("{count} {origin}"))
    });
    let text = parts.collect::<Vec<_>>().join(", ");
    if text.is_empty() { "-".to_owned() } else { text }
}

/// Text for people: where to look first, then the strongest levels by position.
pub fn table(report: &PredictReport) -> String {
    let (low, high) = report.window_cm1;
    let mut text = format!(
        "{}\n{}; {} modes; levels up to {} quanta from {:.0} to {:.0} cm⁻¹ ({:.3} to {:.3} µm vacuum)\n",
        heading(report),
        report.table.origin,
        report.table.modes,
        report.quanta,
        low,
        high,
        1.0e4 / high,
        1.0e4 / low.max(1.0e-9)
    );
    if let Some(caution) = &report.table.caution {
        text.push_str(&format!("caution: {}\n", wrapped(caution, 110, "         ")));
    }
    text.push_str("\nWhere to look, strongest first (levels of one family that run together)\n");
    let rows: Vec<Vec<String>> = report
        .windows
        .iter()
        .take(FAMILIES)
        .map(|w| {
            vec![
                format!("{:.0}-{:.0}", w.low_cm1, w.high_cm1),
                format!("{:.3}-{:.3}", 1.0e4 / w.high_cm1, 1.0e4 / w.low_cm1),
                w.strength_class.clone(),
                format!("{:.1}", w.strength_log10),
                w.levels.to_string(),
                w.family.clone(),
                w.moieties.join(", "),
            ]
        })
        .collect();
    use Align::{Left, Right};
    text.push_str(&columns(
        &[
            ("cm-1", Left),
            ("um", Left),
            ("strength", Left),
            ("log10", Right),
            ("levels", Right),
            ("family", Left),
            ("moieties", Left),
        ],
        &rows,
    ));
    if report.windows.len() > FAMILIES {
        text.push_str(&format!("… and {} weaker ones (all with --format json)\n", report.windows.len() - FAMILIES));
    }
    let mut strongest: Vec<&LevelRecord> = report.levels.iter().collect();
    strongest.sort_by(|a, b| {
        b.strength_log10
            .total_cmp(&a.strength_log10)
            .then(a.position_cm1.total_cmp(&b.position_cm1))
            .then(a.label.cmp(&b.label))
    });
    strongest.truncate(SHOWN);
    strongest.sort_by(|a, b| a.position_cm1.total_cmp(&b.position_cm1).then(a.label.cmp(&b.label)));
    let total = report.levels.len() + report.left_out;
    text.push_str(&match total {
        0 => "\nNo level falls into the window.\n".to_owned(),
        n if n > strongest.len() => {
            format!("\nLevels by position: the {} strongest of {n} (--format csv gives all)\n", strongest.len())
        }
        n => format!("\nLevels by position: all {n}\n"),
    });
    let rows: Vec<Vec<String>> = strongest
        .iter()
        .map(|l| {
            let from = if l.from.is_empty() { String::new() } else { format!("{} → ", l.from) };
            let shares = match l.shares.as_slice() {
                [] => String::new(),
                [first, ..] => format!(" ({:.0} %)", 100.0 * first.share),
            };
            vec![
                format!("{:.1}", l.position_cm1),
                format!("{:.1}", l.sigma_cm1),
                format!("{:.4}", l.position_um),
                format!("{from}{}{shares}", l.label),
                l.species.join("+"),
                l.ir.clone(),
                format!("{:.1}", l.strength_log10),
                l.strength_class.clone(),
                origins(l),
            ]
        })
        .collect();
    if !rows.is_empty() {
        text.push_str(&columns(
            &[
                ("cm-1", Right),
                ("sigma", Right),
                ("um", Right),
                ("level", Left),
                ("species", Left),
                ("infrared", Left),
                ("log10", Right),
                ("strength", Left),
                ("constants", Left),
            ],
            &rows,
        ));
    }
    text
}

fn heading(report: &PredictReport) -> String {
    let t = &report.table;
    match (t.title.as_str(), t.formula.as_str()) {
        ("", "") => t.name.clone(),
        (title, "") => title.to_owned(),
        ("", formula) => format!("{}, {formula}", t.name),
        (title, formula) => format!("{title}, {formula}"),
    }
}
