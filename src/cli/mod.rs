//! Arguments, messages, exit codes. The only room that prints, and the only one
//! that chooses real or virtual.

mod args;
mod cautions;
mod check;
mod exit;
mod files;
mod finish;
mod hands;
mod history;
mod judging;
mod known_truth;
mod live;
mod progress;
mod record_new;
mod rehearse;
mod say;
#[cfg(unix)]
mod stage;
mod staging;
mod table;
mod terminal;

use std::process::ExitCode;

use clap::Parser;

pub use exit::Exit;
pub use judging::{Judged, JudgingError, judge_record};

use args::{Arguments, Verb};

/// Reads the arguments and does what they say.
pub fn main() -> ExitCode {
    let arguments = match Arguments::try_parse() {
        Ok(arguments) => arguments,
        Err(error) => {
            let _ = error.print();
            let asked = !error.use_stderr();
            return if asked { Exit::Good } else { Exit::Usage }.into();
        }
    };
    log_where_asked();
    obey(&arguments.verb).into()
}

fn obey(verb: &Verb) -> Exit {
    match verb {
        Verb::Check(args) => check::check(args),
        Verb::Rehearse(args) => rehearse::rehearse(args),
        Verb::Run(args) => live::run(args),
        Verb::Judge(args) => judging::judge_again(&args.record, args.rules.as_deref()),
        Verb::Stage(args) => stage(args),
        Verb::KnownTruth(args) => known_truth::known_truth(args),
        Verb::Cautions => cautions::show(),
    }
}

#[cfg(unix)]
fn stage(args: &args::Stage) -> Exit {
    stage::stage(args)
}

#[cfg(not(unix))]
fn stage(_: &args::Stage) -> Exit {
    say::complain("error: this system has no pseudo-terminals; use `rehearse`");
    Exit::Usage
}

/// `RATEPLATE_LOG=debug` shows lines opening, closing and trying again.
fn log_where_asked() {
    use tracing_subscriber::filter::LevelFilter;
    use tracing_subscriber::prelude::*;
    let wanted = std::env::var("RATEPLATE_LOG")
        .ok()
        .and_then(|level| level.parse::<LevelFilter>().ok());
    if let Some(level) = wanted {
        let layer = tracing_subscriber::fmt::layer()
            .with_writer(std::io::stderr)
            .with_ansi(false);
        tracing_subscriber::registry()
            .with(level)
            .with(layer)
            .init();
    }
}

/// The end of `--help`: exit codes.
fn after_help() -> String {
    let rows = Exit::TABLE
        .iter()
        .map(|(exit, meaning)| format!("  {:>2}  {meaning}", exit.code()));
    format!("Exit codes:\n{}", rows.collect::<Vec<_>>().join("\n"))
}
