//! `run`: a sequence on a bench over its serial lines, in real time.

use std::path::PathBuf;
use std::sync::{Arc, Mutex};

use tokio::sync::watch;

use super::args::Run;
use super::exit::Exit;
use super::files::{Prepared, prepare};
use super::finish::finish;
use super::hands::VirtualOperator;
use super::history;
use super::progress::Lines;
use super::record_new::{self, Identity};
use super::say::complain;
use super::terminal::Terminal;
use crate::bench::{LineHandle, serial_line};
use crate::clock::Clock;
use crate::plan::Plan;
use crate::record::UnitNumber;
use crate::run::{self, Bay, Ended, Mouth, Operator, Permissions, hearing, line_setups};
use crate::spec;
use crate::spec::bench::Port;

/// The shortest wall time in which an instrument's silence can be told from a pause.
const SHORTEST_SILENCE_S: f64 = 0.25;

/// Runs a sequence on a bench and judges the record.
pub fn run(args: &Run) -> Exit {
    match running(args) {
        Ok((path, ended)) => finish(&path, &ended),
        Err(exit) => exit,
    }
}

fn running(args: &Run) -> Result<(PathBuf, Ended), Exit> {
    let unit = UnitNumber::new(&args.unit).map_err(|e| {
        complain(&format!("error: --unit: {e}"));
        Exit::BadInput
    })?;
    let prepared = prepare(&args.files, Some(&args.bench))?;
    if !prepared.warnings.is_empty() {
        complain(spec::render(&prepared.warnings).trim_end());
    }
    no_line_virtual(&prepared.plan)?;
    speed_allowed(args.speed, &prepared.plan)?;
    let runtime = tokio::runtime::Builder::new_multi_thread()
        .worker_threads(2)
        .enable_all()
        .build();
    let runtime = runtime.map_err(|e| {
        complain(&format!("error: the program can't be started: {e}"));
        Exit::CutShort
    })?;
    let result = runtime.block_on(on_bench(args, prepared, unit));
    // A detached read of standard input must not hold up the end.
    runtime.shutdown_background();
    result
}

fn no_line_virtual(plan: &Plan) -> Result<(), Exit> {
    match plan.lines.iter().find(|line| line.port == Port::Virtual) {
        None => Ok(()),
        Some(line) => {
            complain(&format!(
                "error: line `{}` is virtual: `run` drives real ports; use `rehearse`, or `stage` for pseudo-terminals",
                line.name
            ));
            Err(Exit::BadInput)
        }
    }
}

fn speed_allowed(speed: f64, plan: &Plan) -> Result<(), Exit> {
    let shortest = plan
        .guards
        .silence
        .iter()
        .map(|s| s.get())
        .fold(f64::INFINITY, f64::min);
    if !(speed.is_finite() && speed > 0.0) {
        complain("error: --speed: give a positive number; 1 is real time");
        return Err(Exit::Usage);
    }
    if speed != 1.0 && shortest / speed < SHORTEST_SILENCE_S {
        complain(&format!(
            "error: --speed {speed}: an instrument's silence limit of {shortest} s would be {:.0} ms of wall time; below {:.0} ms it can't be told from a pause: at most --speed {}",
            shortest / speed * 1e3,
            SHORTEST_SILENCE_S * 1e3,
            (shortest / SHORTEST_SILENCE_S).floor()
        ));
        return Err(Exit::Usage);
    }
    Ok(())
}

async fn on_bench(
    args: &Run,
    prepared: Prepared,
    unit: UnitNumber,
) -> Result<(PathBuf, Ended), Exit> {
    let clock = Clock::scaled(args.speed);
    let (mouth, heard) = hearing();
    let lines = open_lines(&prepared.plan, &clock, &mouth)?;
    drop(mouth);
    let identity = Identity {
        unit: &unit,
        operator: &args.operator,
        seed: None,
    };
    // Only an instrument's reply says that it is virtual; these are refused on real ones.
    let virtual_bench = args.yes || args.speed != 1.0;
    let history = history::of_unit(
        &args.reports,
        unit.as_str(),
        virtual_bench,
        args.link_replaced,
    );
    let (path, mut journal) = record_new::open(&args.reports, &prepared, &identity, &clock)?;
    record_new::tell(&path, &mut journal, history)?;
    let (stop, stopped) = watch::channel(false);
    tokio::spawn(watch_signals(stop));
    let bay = Bay {
        plan: Arc::new(prepared.plan),
        unit: unit.to_string(),
        clock: clock.clone(),
        lines,
        heard,
        journal: Arc::new(Mutex::new(journal)),
        operator: operator(args, clock),
        stop: stopped,
        observer: Box::new(Lines::new(args.quiet)),
    };
    let permissions = Permissions {
        unattended: args.yes,
        speed: args.speed,
    };
    // A task of its own: should it ever die, its lease dies with it.
    let task = tokio::spawn(run::run(bay, permissions, super::cautions::short()));
    match task.await {
        Ok(ended) => Ok((path, ended)),
        Err(error) => {
            complain(&format!(
                "OFF WAS NOT CONFIRMED: press the emergency stop or pull the plug before you touch the unit\n  the bay's task died: {error}"
            ));
            Err(Exit::OffUnconfirmed)
        }
    }
}

fn operator(args: &Run, clock: Clock) -> Box<dyn Operator> {
    if args.yes {
        Box::new(VirtualOperator::new(None, clock))
    } else {
        Box::new(Terminal::new(&args.operator))
    }
}

fn open_lines(plan: &Plan, clock: &Clock, mouth: &Mouth) -> Result<Vec<LineHandle>, Exit> {
    let mut lines = Vec::new();
    for setup in line_setups(plan) {
        match serial_line(setup, clock.clone(), mouth.ears()) {
            Ok(line) => lines.push(line),
            Err(error) => {
                complain(&format!("error: {error}\n  nothing was energised"));
                return Err(Exit::CutShort);
            }
        }
    }
    Ok(lines)
}

/// Ctrl-C once stops the run; so do closing the terminal and a request to end.
async fn watch_signals(stop: watch::Sender<bool>) {
    loop {
        asked_to_stop().await;
        if stop.send_replace(true) {
            complain("stopping already: the unit is being switched off");
        }
    }
}

#[cfg(unix)]
async fn asked_to_stop() {
    use tokio::signal::unix::{SignalKind, signal};
    let (Ok(mut terminate), Ok(mut hang_up)) = (
        signal(SignalKind::terminate()),
        signal(SignalKind::hangup()),
    ) else {
        let _ = tokio::signal::ctrl_c().await;
        return;
    };
    tokio::select! {
        _ = tokio::signal::ctrl_c() => {}
        _ = terminate.recv() => {}
        _ = hang_up.recv() => {}
    }
}

#[cfg(not(unix))]
async fn asked_to_stop() {
    let _ = tokio::signal::ctrl_c().await;
}
