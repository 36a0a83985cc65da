//! `known-truth`: the judging measured against units whose truth is known.

use std::path::Path;
use std::time::Instant;

use super::args::KnownTruth;
use super::exit::Exit;
use super::say::{complain, say};
use crate::record::put_whole;
use crate::truth::{Campaign, Part, Report, csv, measure, text};

/// So many runs between two signs of life.
const SIGN_OF_LIFE: u64 = 500;

/// A part by its name.
pub fn part(name: &str) -> Result<Part, String> {
    let known = Part::ALL.into_iter().find(|part| part.name() == name);
    known.ok_or_else(|| format!("there are: {}", Part::ALL.map(Part::name).join(", ")))
}

/// Measures, prints the table, and says whether every goal is met.
pub fn known_truth(args: &KnownTruth) -> Exit {
    let mut campaign = Campaign::whole(args.units, args.seed);
    if !args.only.is_empty() {
        campaign.parts.clone_from(&args.only);
    }
    let before = Instant::now();
    let mut progress = |part: Part, runs: u64| {
        if runs.is_multiple_of(SIGN_OF_LIFE) {
            complain(&format!("{runs} runs, {}", part.name()));
        }
    };
    let report = match measure(&campaign, &mut progress) {
        Ok(report) => report,
        Err(error) => {
            complain(&format!("error: {error}"));
            return Exit::BadInput;
        }
    };
    let seconds = before.elapsed().as_secs_f64();
    say(text(&report).trim_end());
    say(&format!(
        "\n{} runs in {seconds:.1} s: {:.1} units per second on one thread",
        report.runs,
        report.runs as f64 / seconds
    ));
    if let Some(file) = &args.table
        && let Err(error) = write(file, &report)
    {
        complain(&format!("error: {}: {error}", file.display()));
        return Exit::Record;
    }
    if report.goals().iter().all(|goal| goal.met) {
        Exit::Good
    } else {
        Exit::Fail
    }
}

fn write(file: &Path, report: &Report) -> std::io::Result<()> {
    put_whole(file, text(report).as_bytes())?;
    put_whole(&file.with_extension("csv"), csv(report).as_bytes())
}
