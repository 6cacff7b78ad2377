//! `advise`: the next measurement for a band.

use serde::Serialize;

use super::output::{Format, OutputOptions};
use super::ranking::RankingArguments;
use super::{Failure, Outcome, tell};
use crate::evidence::advice::{Advice, advise};
use crate::render::mode_table::sheet;
use crate::render::text::wrapped;

/// The next measurement for a band: what it is worth, what each leading family predicts, its cautions.
#[derive(Debug, clap::Args)]
pub struct Advise {
    #[command(flatten)]
    ranking: RankingArguments,
    /// The band to settle.
    #[arg(long, value_name = "ID")]
    pub band: String,
    #[command(flatten)]
    output: OutputOptions,
}

#[derive(Serialize)]
struct Report<'a> {
    schema: &'static str,
    band: &'a str,
    observed_cm1: f64,
    leading: Vec<(String, f64)>,
    other_origin: f64,
    measurements: &'a [Advice],
}

impl Advise {
    /// Runs the command.
    ///
    /// # Errors
    /// See [`Failure`]; a band that the list does not have is a usage failure.
    pub fn run(self) -> Result<Outcome, Failure> {
        let prepared = self.ranking.prepare()?;
        let Some(place) = prepared.bands.bands.iter().position(|b| b.id == self.band) else {
            let known: Vec<&str> = prepared.bands.bands.iter().map(|b| b.id.as_str()).take(20).collect();
            return Err(Failure::Usage(format!("no band `{}`\n  hint: the list has {}", self.band, known.join(", "))));
        };
        let answer = prepared.answer();
        let found = &answer.bands[place];
        let advice = advise(&prepared.model, &prepared.table, &prepared.candidates, found);
        let mut notes = prepared.notes.clone();
        notes.extend(answer.notes.clone());
        tell(&notes);
        let leading: Vec<(String, f64)> =
            found.families.iter().take(5).map(|f| (f.label.clone(), f.probability)).collect();
        let text = match self.output.format {
            Format::Table => {
                let mut text = format!("Band {}: {:.1} cm⁻¹\n", self.band, found.observed_cm1);
                for (family, p) in &leading {
                    text.push_str(&format!("  {p:.2}  {family}\n"));
                }
                text.push_str(&format!("  {:.2}  other origin\n", found.other_origin.probability));
                text.push_str("\nWhat would tell them apart, most informative first\n");
                for a in &advice {
                    let cost = format!("{:?}", a.cost).to_lowercase();
                    text.push_str(&format!("\n{}: {:.2} bit expected, {cost} cost\n", a.name, a.information_bits));
                    for outcome in &a.outcomes {
                        text.push_str(&format!("  {}: {}\n", outcome.candidate, outcome.predicts));
                    }
                    text.push_str(&format!("  caution: {}\n", wrapped(&a.caution, 110, "           ")));
                }
                text
            }
            Format::Csv => sheet(
                &["measurement", "information_bits", "cost", "candidate", "predicts", "caution"],
                advice.iter().flat_map(|a| {
                    a.outcomes.iter().map(move |o| {
                        vec![
                            a.name.to_owned(),
                            format!("{:.4}", a.information_bits),
                            format!("{:?}", a.cost).to_lowercase(),
                            o.candidate.clone(),
                            o.predicts.clone(),
                            a.caution.clone(),
                        ]
                    })
                }),
            ),
            Format::Json => {
                let report = Report {
                    schema: "bandwright/advise/1",
                    band: &self.band,
                    observed_cm1: found.observed_cm1,
                    leading,
                    other_origin: found.other_origin.probability,
                    measurements: &advice,
                };
                serde_json::to_string_pretty(&report).unwrap_or_default() + "\n"
            }
            Format::Html | Format::Svg => return Err(self.output.refuse("advise", "table, csv, json")),
        };
        self.output.deliver(text.as_bytes(), &self.ranking.inputs())?;
        Ok(Outcome::Done)
    }
}
