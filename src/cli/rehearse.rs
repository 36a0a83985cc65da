//! `rehearse`: the main job on the virtual bench, in simulated time.

use std::path::PathBuf;
use std::sync::{Arc, Mutex};

use super::args::Rehearse;
use super::exit::Exit;
use super::files::{Prepared, prepare};
use super::finish::finish;
use super::hands::VirtualOperator;
use super::progress::Lines;
use super::record_new::{self, Identity};
use super::say::{complain, say};
use super::staging::virtual_bench;
use crate::bench::simulated_line;
use crate::clock::Clock;
use crate::record::UnitNumber;
use crate::run::{self, Bay, Ended, Permissions, hearing, line_setups};
use crate::spec;
use crate::virtual_bench::VirtualBench;

/// Plays a sequence on the virtual bench and judges the record.
pub fn rehearse(args: &Rehearse) -> Exit {
    match rehearsal(args) {
        Ok((path, ended)) => finish(&path, &ended),
        Err(exit) => exit,
    }
}

fn rehearsal(args: &Rehearse) -> Result<(PathBuf, Ended), Exit> {
    let unit = UnitNumber::new(&args.recorded.unit).map_err(|e| {
        complain(&format!("error: --unit: {e}"));
        Exit::BadInput
    })?;
    let prepared = prepare(&args.files, args.bench.as_deref())?;
    if !prepared.warnings.is_empty() {
        complain(spec::render(&prepared.warnings).trim_end());
    }
    let bench = virtual_bench(&prepared, &args.virtually, 1.0)?;
    say("VIRTUAL BENCH: a rehearsal in simulated time; nothing is energised");
    let runtime = tokio::runtime::Builder::new_current_thread()
        .enable_time()
        .start_paused(true)
        .build();
    let runtime = runtime.map_err(|e| {
        complain(&format!("error: simulated time can't be started: {e}"));
        Exit::CutShort
    })?;
    runtime.block_on(play(args, &prepared, &bench, &unit))
}

async fn play(
    args: &Rehearse,
    prepared: &Prepared,
    bench: &VirtualBench,
    unit: &UnitNumber,
) -> Result<(PathBuf, Ended), Exit> {
    let clock = Clock::simulated();
    let identity = Identity {
        unit,
        operator: "virtual operator",
        seed: Some(args.virtually.seed),
    };
    let (path, journal) = record_new::open(&args.recorded.reports, prepared, &identity, &clock)?;
    let (mouth, heard) = hearing();
    let lines = line_setups(&prepared.plan)
        .into_iter()
        .map(|setup| {
            let far = bench.far_side(&setup.name);
            simulated_line(setup, far, clock.clone(), mouth.ears())
        })
        .collect();
    drop(mouth);
    // The sender lives as long as the run: a sender that is gone counts as a stop.
    let (_stop, stopped) = tokio::sync::watch::channel(false);
    let bay = Bay {
        plan: Arc::new(prepared.plan.clone()),
        unit: unit.to_string(),
        clock: clock.clone(),
        lines,
        heard,
        journal: Arc::new(Mutex::new(journal)),
        operator: Box::new(VirtualOperator::new(Some(bench.hands()), clock)),
        stop: stopped,
        observer: Box::new(Lines::new(args.recorded.quiet)),
    };
    let permissions = Permissions {
        unattended: true,
        speed: 1.0,
    };
    let ended = run::run(bay, permissions, super::cautions::short()).await;
    Ok((path, ended))
}
