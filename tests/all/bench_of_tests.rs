//! What the tests share: the program as a process, and a bay on a virtual bench.

use std::path::{Path, PathBuf};
use std::process::{Command, Output};
use std::sync::{Arc, Mutex};

use rateplate::bench::simulated_line;
use rateplate::clock::Clock;
use rateplate::plan::{Plan, PlannedRole, resolve};
use rateplate::quantity::Celsius;
use rateplate::record::{Flushing, Heading, Journal, Store};
use rateplate::run::{
    self, Answering, Bay, Ended, Observer, Operator, Permissions, Prompt, Reply, Want, hearing,
    line_setups,
};
use rateplate::spec::{self, shipped};
use rateplate::virtual_bench::{Connection, Fault, Hands, Staging, VirtualBench};

/// The short sequence that most tests run.
pub const SHORT: &str = include_str!("../data/short.yaml");

/// The program, in a folder.
pub fn program(folder: &Path, arguments: &[&str]) -> Output {
    let mut command = Command::new(env!("CARGO_BIN_EXE_rateplate"));
    command
        .current_dir(folder)
        .args(arguments)
        .stdin(std::process::Stdio::null());
    command.output().expect("the program starts")
}

/// What a process printed, on both ways.
pub fn printed(output: &Output) -> String {
    let text = [&output.stdout[..], &output.stderr[..]].concat();
    String::from_utf8(text).expect("the program prints UTF-8")
}

/// The only record below `reports` in a folder.
pub fn only_record(folder: &Path) -> PathBuf {
    let entries: Vec<PathBuf> = std::fs::read_dir(folder.join("reports"))
        .unwrap()
        .map(|e| e.unwrap().path())
        .collect();
    assert_eq!(entries.len(), 1, "{entries:?}");
    entries.into_iter().next().unwrap()
}

/// A sequence against the shipped virtual bench.
pub fn plan_of(sequence: &str) -> Plan {
    let sequence = spec::load_sequence("sequence.yaml", sequence.as_bytes());
    let bench = spec::load_bench("bench.yaml", shipped::VIRTUAL_BENCH.text.as_bytes());
    let problems = spec::render(&sequence.problems);
    let (sequence, bench) = (sequence.value.expect(&problems), bench.value.unwrap());
    let drivers: Vec<_> = shipped::DRIVERS
        .iter()
        .map(|d| spec::load_driver(d.path, d.text.as_bytes()).value.unwrap())
        .collect();
    let resolved = resolve(&sequence, &bench, &drivers, None, None);
    let problems = spec::render(&resolved.problems);
    resolved.plan.expect(&problems)
}

/// A virtual bench for a plan, its unit with faults.
pub fn virtual_bench(plan: &Plan, seed: u64, faults: &[&str]) -> VirtualBench {
    let mut units = shipped::VIRTUAL_UNITS
        .iter()
        .filter_map(|f| spec::load_virtual_unit(f.path, f.text.as_bytes()).value);
    let unit = units
        .find(|unit| unit.model.value == plan.appliance.model)
        .unwrap();
    let connect = |role: &PlannedRole| {
        let instrument = plan.instrument_of(role);
        Connection {
            line: plan.lines[instrument.line].name.clone(),
            instrument: instrument.name.clone(),
            identity: instrument.identity.clone(),
            driver: instrument.driver.clone(),
            role: role.name.clone(),
            kind: role.kind,
            channel: role.channel,
            sensor: role.sensor,
        }
    };
    VirtualBench::new(Staging {
        unit,
        positions: plan.appliance.positions.clone(),
        connections: plan.bay.roles.iter().map(connect).collect(),
        seed,
        faults: faults
            .iter()
            .map(|name| name.parse::<Fault>().unwrap())
            .collect(),
        ambient: Celsius::of(23.0),
        speed: 1.0,
    })
    .unwrap()
}

/// What a test may change about a run.
pub struct Setup {
    pub operator: Box<dyn Operator>,
    pub observer: Box<dyn Observer>,
    pub stop: tokio::sync::watch::Receiver<bool>,
}

impl Setup {
    /// A willing operator, and nobody who looks on.
    pub fn willing(
        bench: &VirtualBench,
        clock: &Clock,
        stop: tokio::sync::watch::Receiver<bool>,
    ) -> Self {
        Self {
            operator: Box::new(Willing(bench.hands(), clock.clone())),
            observer: Box::new(Silent),
            stop,
        }
    }
}

/// Whoever answers every prompt well at once.
pub struct Willing(pub Hands, pub Clock);

impl Operator for Willing {
    fn name(&self) -> String {
        "test".to_owned()
    }

    fn ask<'a>(&'a mut self, prompt: &'a Prompt) -> Answering<'a> {
        let answer = match &prompt.want {
            Want::Answer(question) => Hands::answer(question),
            Want::Position { name } => {
                self.0.turn(name, self.1.now());
                String::new()
            }
            Want::Condition { name } => {
                self.0.set_condition(name, self.1.now());
                String::new()
            }
            Want::Acknowledge | Want::Done => String::new(),
        };
        Box::pin(std::future::ready(Reply::Given(answer)))
    }
}

/// Sees everything and says nothing.
pub struct Silent;

impl Observer for Silent {
    fn happened(&mut self, _: &Plan, _: &rateplate::record::Happening) {}
}

/// A paused runtime, as rehearsals use it.
pub fn paused() -> tokio::runtime::Runtime {
    tokio::runtime::Builder::new_current_thread()
        .enable_time()
        .start_paused(true)
        .build()
        .unwrap()
}

/// A bay on a virtual bench, ready to run, inside a paused runtime.
pub fn bay(
    plan: &Plan,
    bench: &VirtualBench,
    store: Box<dyn Store>,
    clock: &Clock,
    setup: Setup,
) -> std::io::Result<Bay> {
    let heading = Heading {
        record: "test".to_owned(),
        unit: "T-1".to_owned(),
        operator: "test".to_owned(),
        seed: Some(1),
        started: clock.started().to_rfc3339(),
    };
    let journal = Journal::open(store, heading, plan, &[], Flushing::EachSecond)?;
    let (mouth, heard) = hearing();
    let lines = line_setups(plan)
        .into_iter()
        .map(|line| {
            let far = bench.far_side(&line.name);
            simulated_line(line, far, clock.clone(), mouth.ears())
        })
        .collect();
    Ok(Bay {
        plan: Arc::new(plan.clone()),
        unit: "T-1".to_owned(),
        clock: clock.clone(),
        lines,
        heard,
        journal: Arc::new(Mutex::new(journal)),
        operator: setup.operator,
        stop: setup.stop,
        observer: setup.observer,
    })
}

/// The run's permissions in simulated time.
pub const SIMULATED: Permissions = Permissions {
    unattended: true,
    speed: 1.0,
};

/// Runs a bay to its end.
pub async fn run_bay(bay: Bay) -> Ended {
    run::run(bay, SIMULATED, "cautions").await
}
