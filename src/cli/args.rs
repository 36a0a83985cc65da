//! Arguments: the verbs and what each takes.

use std::path::PathBuf;

use clap::{Args, Parser, Subcommand};

/// Qualifies plug-in electrical appliances on a bench.
#[derive(Debug, Parser)]
#[command(name = "rateplate", version, about, after_help = super::after_help())]
pub struct Arguments {
    /// What to do.
    #[command(subcommand)]
    pub verb: Verb,
}

/// The verbs.
#[derive(Debug, Subcommand)]
pub enum Verb {
    /// Read a sequence, say everything that is wrong with it, and print the plan
    Check(Check),
    /// Play a sequence on the virtual bench in simulated time
    Rehearse(Rehearse),
    /// Run a sequence on a bench, on a real unit
    Run(Run),
    /// Judge a closed record again and write a new judgement beside the others
    Judge(Judge),
    /// Put the virtual bench's instruments on pseudo-terminals (Unix)
    Stage(Stage),
    /// Measure the judging against units of the virtual bench whose truth is known
    KnownTruth(KnownTruth),
    /// Show the cautions
    Cautions,
}

/// What is tested, and with what.
#[derive(Debug, Args)]
pub struct Files {
    /// The sequence file; a shipped one is found by its name wherever you are
    pub sequence: PathBuf,
    /// The bay to use [default: the bench's first]
    #[arg(long)]
    pub bay: Option<String>,
    /// Folder of driver files that come before the shipped ones
    #[arg(long, value_name = "FOLDER", default_value = "drivers")]
    pub drivers: PathBuf,
}

/// `check`
#[derive(Debug, Args)]
pub struct Check {
    /// Files.
    #[command(flatten)]
    pub files: Files,
    /// The bench file [default: the virtual demo bench]
    #[arg(long, value_name = "FILE")]
    pub bench: Option<PathBuf>,
}

/// The virtual unit that a virtual bay holds.
#[derive(Debug, Args)]
pub struct Virtually {
    /// Seed of every draw: unit, instruments, noise
    #[arg(long, default_value_t = 1)]
    pub seed: u64,
    /// A fault of unit, sensor or line by name, `name` or `name@300s`; may be given again
    #[arg(long = "fault", value_name = "NAME")]
    pub faults: Vec<String>,
    /// A virtual unit's file [default: the shipped one of the sequence's model]
    #[arg(long, value_name = "FILE")]
    pub virtual_unit: Option<PathBuf>,
    /// Ambient temperature around the virtual bay
    #[arg(long, default_value = "23 °C")]
    pub ambient: String,
}

/// Where a record goes, and whose it is.
#[derive(Debug, Args)]
pub struct Recorded {
    /// The unit's number
    #[arg(long, value_name = "NUMBER", default_value = "VIRTUAL-1")]
    pub unit: String,
    /// Folder that the record is made in
    #[arg(long, value_name = "FOLDER", default_value = "reports")]
    pub reports: PathBuf,
    /// Only the verdict, the record's path and complaints
    #[arg(long)]
    pub quiet: bool,
}

/// `rehearse`
#[derive(Debug, Args)]
pub struct Rehearse {
    /// Files.
    #[command(flatten)]
    pub files: Files,
    /// A bench file whose lines are all virtual [default: the virtual demo bench]
    #[arg(long, value_name = "FILE")]
    pub bench: Option<PathBuf>,
    /// The virtual unit.
    #[command(flatten)]
    pub virtually: Virtually,
    /// The record.
    #[command(flatten)]
    pub recorded: Recorded,
}

/// `run`
#[derive(Debug, Args)]
pub struct Run {
    /// Files.
    #[command(flatten)]
    pub files: Files,
    /// The bench file
    #[arg(long, value_name = "FILE")]
    pub bench: PathBuf,
    /// The unit's number
    #[arg(long, value_name = "NUMBER")]
    pub unit: String,
    /// Your name, for the record
    #[arg(long, value_name = "NAME")]
    pub operator: String,
    /// Folder that the record is made in
    #[arg(long, value_name = "FOLDER", default_value = "reports")]
    pub reports: PathBuf,
    /// Only the verdict, the record's path, prompts and complaints
    #[arg(long)]
    pub quiet: bool,
    /// The unit has a new thermal link: a mark `link stressed` from earlier records is gone
    #[arg(long)]
    pub link_replaced: bool,
    /// Answer every prompt well; refused unless every instrument says that it is virtual
    #[arg(long)]
    pub yes: bool,
    /// Run seconds to a wall second; refused unless every instrument says the same
    #[arg(long, default_value_t = 1.0)]
    pub speed: f64,
}

/// `judge`
#[derive(Debug, Args)]
pub struct Judge {
    /// The record's folder
    pub record: PathBuf,
    /// Judge by the rules of another sequence than the one that was run; every output says so
    #[arg(long, value_name = "SEQUENCE")]
    pub rules: Option<PathBuf>,
}

/// `stage`
#[derive(Debug, Args)]
pub struct Stage {
    /// Files.
    #[command(flatten)]
    pub files: Files,
    /// A bench file whose lines are all virtual [default: the virtual demo bench]
    #[arg(long, value_name = "FILE")]
    pub bench: Option<PathBuf>,
    /// The virtual unit.
    #[command(flatten)]
    pub virtually: Virtually,
    /// Bench seconds to a wall second
    #[arg(long, default_value_t = 1.0)]
    pub speed: f64,
    /// The bench file to write, which names the pseudo-terminals
    #[arg(long, value_name = "FILE", default_value = "staged-bench.yaml")]
    pub write: PathBuf,
}

/// `known-truth`
#[derive(Debug, Args)]
pub struct KnownTruth {
    /// Units of each population; each fault takes a twentieth of it, early finish a quarter
    #[arg(long, default_value_t = 4000, value_parser = clap::value_parser!(u64).range(1..=1_000_000))]
    pub units: u64,
    /// Chooses every unit, error and noise
    #[arg(long, default_value_t = 1)]
    pub seed: u64,
    /// Only this part: good, control, limit, faults or early-finish; may be given again
    #[arg(long, value_name = "PART", value_parser = super::known_truth::part)]
    pub only: Vec<crate::truth::Part>,
    /// Write the table to this file too, and its numbers beside it as .csv
    #[arg(long, value_name = "FILE")]
    pub table: Option<PathBuf>,
}
