//! How often are claims right? Simulated hydrates with a known truth, ranked with the defaults.
//!
//! `cargo run --release --example calibration -- --modes 15 --samples 100`

use std::io::Write;
use std::time::Instant;

use bandwright::assign::joint::{JointOptions, assign};
use bandwright::assign::reliability::{ByHand, Scores, by_hand};
use bandwright::assign::simulation::{Design, Truth, simulate};
use clap::Parser;

/// Calibration of the ranking on simulated hydrates.
#[derive(Parser)]
struct Arguments {
    /// Modes of the simulated tables.
    #[arg(long, default_value_t = 15)]
    modes: usize,
    /// Samples per row.
    #[arg(long, default_value_t = 100)]
    samples: u64,
    /// Members of the population.
    #[arg(long, default_value_t = 256)]
    particles: usize,
    /// First seed.
    #[arg(long, default_value_t = 1)]
    seed: u64,
    /// Only this row: the number of a truth, counted from 0.
    #[arg(long)]
    row: Option<usize>,
    /// Also the ranking without robustness and strength models.
    #[arg(long)]
    plain: bool,
    /// Print the reliability table of each row.
    #[arg(long)]
    reliability: bool,
}

fn main() -> std::io::Result<()> {
    let arguments = Arguments::parse();
    let mut out = std::io::stdout().lock();
    writeln!(out, "{} modes, 4 quanta, {} samples a row", arguments.modes, arguments.samples)?;
    writeln!(out)?;
    writeln!(
        out,
        "| truth | ranking | bands | level | family | first 3 | ECE level | ECE family | log level | log family | claimed .7-.8, right |"
    )?;
    writeln!(out, "| --- | --- | --- | --- | --- | --- | --- | --- | --- | --- | --- |")?;
    for (row, truth) in Truth::ALL.into_iter().enumerate() {
        if arguments.row.is_some_and(|r| r != row) {
            continue;
        }
        let design = Design::hydrate(arguments.modes, truth);
        let mut hand = [(0, 0, 0); 3];
        let mut rankings = vec![("default", JointOptions::default(), Scores::default())];
        if arguments.plain {
            let mut options = JointOptions::default();
            options.weighing.robust = false;
            options.weighing.models = false;
            rankings.push(("plain", options, Scores::default()));
        }
        let start = Instant::now();
        for number in 0..arguments.samples {
            let sample = simulate(&design, arguments.seed + number);
            for (sum, rule) in hand.iter_mut().zip(ByHand::ALL) {
                let (level, family, all) = by_hand(rule, &sample);
                *sum = (sum.0 + level, sum.1 + family, sum.2 + all);
            }
            for (_, options, scores) in &mut rankings {
                options.effort.particles = arguments.particles;
                options.effort.seed = number;
                let answer = assign(&sample.model, &sample.table, &sample.candidates, &sample.bands, &[], options);
                scores.add(&sample, &answer.bands);
            }
        }
        for (rule, (level, family, all)) in ByHand::ALL.into_iter().zip(hand) {
            let share = |n: usize| n as f64 / all as f64;
            writeln!(
                out,
                "| {} | {} | {all} | {:.2} | {:.2} | | | | | | |",
                truth.name(),
                rule.name(),
                share(level),
                share(family)
            )?;
        }
        for (name, _, scores) in &rankings {
            let (log_level, log_family) = scores.mean_log_scores();
            let bin = scores.family.bins()[7];
            writeln!(
                out,
                "| {} | joint, {name} | {} | {:.2} | {:.2} | {:.2} | {:.3} | {:.3} | {log_level:.2} | {log_family:.2} | {:.2}, {:.2} |",
                truth.name(),
                scores.level.0.len(),
                scores.level.accuracy(),
                scores.family.accuracy(),
                scores.first_three.accuracy(),
                scores.level.calibration_error(),
                scores.family.calibration_error(),
                bin.claimed,
                bin.right,
            )?;
            if arguments.reliability {
                for bin in scores.all_families.bins() {
                    writeln!(out, "    claimed {:.2} right {:.2} ({})", bin.claimed, bin.right, bin.count)?;
                }
            }
        }
        out.flush()?;
        eprintln!("{}: {:.1} s", truth.name(), start.elapsed().as_secs_f64());
    }
    Ok(())
}
