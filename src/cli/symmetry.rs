//! `symmetry`: the everyday questions of selection rules on one screen.

use itertools::Itertools;
use serde::Serialize;

use super::output::{Format, OutputOptions};
use super::{Failure, Outcome};
use crate::physics::symmetry::correlation::{content_text, embeddings, induction, restriction};
use crate::physics::symmetry::{Irrep, PointGroup};
use crate::render::text::{Align, columns};

/// Point groups: classes, species, activities; products, powers, site and factor groups.
#[derive(Debug, clap::Args)]
pub struct Symmetry {
    /// Point group by its Schoenflies name: C2h, D3h, Td, Oh, Cinfv ...
    pub group: String,
    /// Species of a level: species joined by `*`, powers by `^`, like `F2^2*E`.
    #[arg(long, value_name = "SPECIES")]
    pub product: Option<String>,
    /// Species of 1 to N quanta of one mode, like `F2:4`.
    #[arg(long, value_name = "SPECIES:N")]
    pub power: Option<String>,
    /// Restrict every species to this site group; all choices of axes are listed.
    #[arg(long, value_name = "GROUP")]
    pub site: Option<String>,
    /// Carry the site species on to this factor group (needs --site).
    #[arg(long, value_name = "GROUP", requires = "site")]
    pub factor: Option<String>,
    /// Take only the choice of axes with this number (from the listing).
    #[arg(long, value_name = "N")]
    pub axes: Option<usize>,
    #[command(flatten)]
    output: OutputOptions,
}

/// One species on the screen.
#[derive(Serialize)]
struct SpeciesLine {
    species: String,
    dimension: u8,
    infrared: String,
    raman: String,
    characters: Vec<f64>,
}

/// One answer to a question.
#[derive(Serialize)]
struct Answer {
    question: String,
    content: String,
    infrared: bool,
    raman: bool,
}

/// The path of one species from molecule to site to crystal.
#[derive(Serialize)]
struct Path {
    choice: usize,
    axes: String,
    species: String,
    site: String,
    factor: Option<String>,
    components: Option<u32>,
    infrared_components: Option<u32>,
    raman_components: Option<u32>,
}

#[derive(Serialize)]
struct Report {
    schema: &'static str,
    group: String,
    order: usize,
    classes: Vec<String>,
    species: Vec<SpeciesLine>,
    answers: Vec<Answer>,
    paths: Vec<Path>,
}

fn named(name: &str) -> Result<PointGroup, Failure> {
    PointGroup::named(name).ok_or_else(|| {
        Failure::Usage(format!("no point group `{name}`\n  hint: Schoenflies names, like C2h, D3h, S4, Td, Oh, Cinfv"))
    })
}

fn species(group: &PointGroup, name: &str) -> Result<Irrep, Failure> {
    group.irrep(name).ok_or_else(|| {
        let known = group.irreps().map(|i| group.irrep_name(i).to_owned()).take(16).join(", ");
        Failure::Usage(format!("no species `{name}` in {}\n  hint: it has {known}", group.name()))
    })
}

/// `F2^2*E` as species with quanta.
fn factors(group: &PointGroup, text: &str) -> Result<Vec<(Irrep, u8)>, Failure> {
    text.split(['*', '×', ','])
        .map(|part| {
            let (name, power) = part.rsplit_once('^').unwrap_or((part, "1"));
            let quanta = power
                .trim()
                .parse::<u8>()
                .ok()
                .filter(|n| (1..=12).contains(n))
                .ok_or_else(|| Failure::Usage(format!("`{part}`: expected 1 to 12 quanta, found `{power}`")))?;
            Ok((species(group, name)?, quanta))
        })
        .collect()
}

impl Symmetry {
    /// Runs the command.
    ///
    /// # Errors
    /// [`Failure::Usage`] for unknown groups, species, and sites that do not lie in the group.
    pub fn run(self) -> Result<Outcome, Failure> {
        let group = named(&self.group)?;
        let mut answers = Vec::new();
        let mut ask = |question: String, levels: &[(Irrep, u8)]| {
            let content = group.level_species(levels);
            answers.push(Answer {
                question,
                infrared: content.iter().any(|(i, _)| group.infrared(*i)),
                raman: content.iter().any(|(i, _)| group.raman(*i)),
                content: content_text(&group, &content),
            });
        };
        if let Some(text) = &self.product {
            ask(text.clone(), &factors(&group, text)?);
        }
        if let Some(text) = &self.power {
            let (name, most) = text.rsplit_once(':').unwrap_or((text, "4"));
            let irrep = species(&group, name)?;
            let most =
                most.trim().parse::<u8>().ok().filter(|n| (1..=12).contains(n)).ok_or_else(|| {
                    Failure::Usage(format!("--power `{text}`: expected SPECIES:N with N from 1 to 12"))
                })?;
            for n in 1..=most {
                ask(format!("{}^{n}", group.irrep_name(irrep)), &[(irrep, n)]);
            }
        }
        let paths = match &self.site {
            Some(site) => self.paths(&group, &named(site)?)?,
            None => Vec::new(),
        };
        let report = Report {
            schema: "bandwright/symmetry/1",
            group: group.name().to_owned(),
            order: group.order(),
            classes: group.classes().to_vec(),
            species: group
                .irreps()
                .map(|i| SpeciesLine {
                    species: group.irrep_name(i).to_owned(),
                    dimension: group.dimension(i),
                    infrared: group.polarisation(i).join(" "),
                    raman: group.tensor(i).join(" "),
                    characters: group.characters(i),
                })
                .collect(),
            answers,
            paths,
        };
        let text = match self.output.format {
            Format::Table => screen(&report),
            Format::Json => serde_json::to_string_pretty(&report).unwrap_or_default() + "\n",
            _ => return Err(self.output.refuse("symmetry", "table, json")),
        };
        self.output.deliver(text.as_bytes(), &[])?;
        Ok(Outcome::Done)
    }

    /// Every species through every choice of axes.
    fn paths(&self, group: &PointGroup, site: &PointGroup) -> Result<Vec<Path>, Failure> {
        let choices = embeddings(group, site);
        if choices.is_empty() {
            let message = format!("{} is no subgroup of {}", site.name(), group.name());
            return Err(Failure::Usage(format!(
                "{message}\n  hint: a site group holds some of the molecule's operations"
            )));
        }
        let factor = match &self.factor {
            None => None,
            Some(name) => {
                let factor = named(name)?;
                let inside = embeddings(&factor, site).into_iter().next().ok_or_else(|| {
                    Failure::Usage(format!("site {} is no subgroup of the factor group {}", site.name(), factor.name()))
                })?;
                Some((factor, inside))
            }
        };
        let mut list = Vec::new();
        for (number, choice) in choices.iter().enumerate() {
            if self.axes.is_some_and(|wanted| wanted != number + 1) {
                continue;
            }
            for irrep in group.irreps() {
                let on_site = restriction(group, site, choice, irrep);
                let in_crystal = factor.as_ref().map(|(factor, inside)| {
                    let mut sums: Vec<(Irrep, u32)> = Vec::new();
                    for (s, times) in &on_site {
                        for (f, n) in induction(factor, site, inside, *s) {
                            match sums.iter_mut().find(|(i, _)| *i == f) {
                                Some((_, sum)) => *sum += n * times,
                                None => sums.push((f, n * times)),
                            }
                        }
                    }
                    sums.sort_unstable();
                    sums
                });
                let count = |active: &dyn Fn(&PointGroup, Irrep) -> bool| {
                    factor.as_ref().zip(in_crystal.as_ref()).map(|((factor, _), sums)| {
                        sums.iter().filter(|(i, _)| active(factor, *i)).map(|(_, n)| n).sum()
                    })
                };
                list.push(Path {
                    choice: number + 1,
                    axes: choice.axes.clone(),
                    species: group.irrep_name(irrep).to_owned(),
                    site: content_text(site, &on_site),
                    factor: factor.as_ref().zip(in_crystal.as_ref()).map(|((f, _), s)| content_text(f, s)),
                    components: count(&|_, _| true),
                    infrared_components: count(&|g, i| g.infrared(i)),
                    raman_components: count(&|g, i| g.raman(i)),
                });
            }
        }
        Ok(list)
    }
}

/// The text form.
fn screen(report: &Report) -> String {
    use Align::{Left, Right};
    let mut text = format!("{}: {} operations in {} classes\n\n", report.group, report.order, report.classes.len());
    // A linear group has more classes than a screen has columns.
    let shown = report.classes.len().min(12);
    let mut header = vec![("species", Left), ("dim.", Right)];
    header.extend(report.classes.iter().take(shown).map(|c| (c.as_str(), Right)));
    header.extend([("infrared", Left), ("Raman", Left)]);
    let number = |c: &f64| {
        let rounded = format!("{c:.2}");
        rounded.trim_end_matches('0').trim_end_matches('.').to_owned()
    };
    let dash = |s: &str| if s.is_empty() { "-".to_owned() } else { s.to_owned() };
    let rows: Vec<Vec<String>> = report
        .species
        .iter()
        .take(24)
        .map(|s| {
            let mut row = vec![s.species.clone(), s.dimension.to_string()];
            row.extend(s.characters.iter().take(shown).map(|c| if c.abs() < 1.0e-9 { "0".into() } else { number(c) }));
            row.extend([dash(&s.infrared), dash(&s.raman)]);
            row
        })
        .collect();
    text.push_str(&columns(&header, &rows));
    let yes = |active: bool| if active { "allowed" } else { "forbidden" }.to_owned();
    if !report.answers.is_empty() {
        let rows: Vec<Vec<String>> = report
            .answers
            .iter()
            .map(|a| vec![a.question.clone(), a.content.clone(), yes(a.infrared), yes(a.raman)])
            .collect();
        text.push('\n');
        text.push_str(&columns(&[("level", Left), ("species", Left), ("infrared", Left), ("Raman", Left)], &rows));
    }
    for (choice, paths) in &report.paths.iter().chunk_by(|p| p.choice) {
        let paths: Vec<&Path> = paths.collect();
        text.push_str(&format!("\nchoice {choice} of axes: {}\n", paths[0].axes));
        let number = |n: Option<u32>| n.map_or(String::new(), |n| n.to_string());
        let rows: Vec<Vec<String>> = paths
            .iter()
            .map(|p| {
                vec![
                    p.species.clone(),
                    p.site.clone(),
                    p.factor.clone().unwrap_or_default(),
                    number(p.components),
                    number(p.infrared_components),
                    number(p.raman_components),
                ]
            })
            .collect();
        let header = [
            ("molecule", Left),
            ("site", Left),
            ("crystal", Left),
            ("species", Right),
            ("infrared", Right),
            ("Raman", Right),
        ];
        text.push_str(&columns(&header, &rows));
    }
    text
}
