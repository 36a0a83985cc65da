//! `check`: every problem at once, else the plan.

use super::args::Check;
use super::exit::Exit;
use super::files::prepare;
use super::say::{complain, say};
use crate::spec;

/// Checks a sequence against a bench and prints the plan.
pub fn check(args: &Check) -> Exit {
    let prepared = match prepare(&args.files, args.bench.as_deref()) {
        Ok(prepared) => prepared,
        Err(exit) => return exit,
    };
    if !prepared.warnings.is_empty() {
        complain(spec::render(&prepared.warnings).trim_end());
    }
    say(&prepared.plan.lines_of_text().join("\n"));
    Exit::Good
}
