//! Simulated seconds per wall second of a rehearsal whose three readings are taken at
//! 10 Hz throughout, beside the far side alone in the same run.
//!
//! `cargo bench`

use std::io::{self, Write};
use std::sync::{Arc, Mutex};
use std::time::Instant;

use rateplate::bench::simulated_line;
use rateplate::clock::Clock;
use rateplate::plan::{Plan, PlannedRole, resolve};
use rateplate::quantity::{Celsius, Moment, Seconds};
use rateplate::record::{Flushing, FolderStore, Heading, Journal};
use rateplate::run::{
    self, Answering, Bay, Observer, Operator, Permissions, Prompt, Reply, hearing, line_setups,
};
use rateplate::spec::{self, shipped};
use rateplate::virtual_bench::{Connection, Staging, VirtualBench};

/// The demo's appliance, every step polled at 10 Hz.
const SEQUENCE: &str = include_str!("../tests/data/ten-hertz.yaml");

struct Nodding;

impl Operator for Nodding {
    fn name(&self) -> String {
        "bench".to_owned()
    }

    fn ask<'a>(&'a mut self, _: &'a Prompt) -> Answering<'a> {
        Box::pin(std::future::ready(Reply::Given("yes".to_owned())))
    }
}

struct Silent;

impl Observer for Silent {
    fn happened(&mut self, _: &Plan, _: &rateplate::record::Happening) {}
}

fn plan() -> Plan {
    let sequence = spec::load_sequence("ten-hertz.yaml", SEQUENCE.as_bytes())
        .value
        .expect("a sequence");
    let bench = spec::load_bench("bench.yaml", shipped::VIRTUAL_BENCH.text.as_bytes())
        .value
        .expect("a bench");
    let drivers = shipped::DRIVERS.iter().map(|file| {
        let mut driver = spec::load_driver(file.path, file.text.as_bytes())
            .value
            .expect("a driver");
        driver.update_interval = Seconds::of(0.1);
        driver
    });
    let drivers: Vec<_> = drivers.collect();
    resolve(&sequence, &bench, &drivers, None, None)
        .plan
        .expect("a plan")
}

fn virtual_bench(plan: &Plan) -> VirtualBench {
    let units = shipped::VIRTUAL_UNITS
        .iter()
        .filter_map(|f| spec::load_virtual_unit(f.path, f.text.as_bytes()).value);
    let unit = units
        .into_iter()
        .find(|unit| unit.model.value == plan.appliance.model)
        .expect("a unit");
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
    let staging = Staging {
        unit,
        positions: plan.appliance.positions.clone(),
        connections: plan.bay.roles.iter().map(connect).collect(),
        seed: 1,
        faults: Vec::new(),
        ambient: Celsius::of(23.0),
        speed: 1.0,
    };
    VirtualBench::new(staging).expect("a virtual bench")
}

/// Simulated and wall seconds of the whole way: wire, physics, guards, record.
fn whole(plan: &Plan) -> (f64, f64) {
    let folder = tempfile::tempdir().expect("a folder");
    let bench = virtual_bench(plan);
    let runtime = tokio::runtime::Builder::new_current_thread()
        .enable_time()
        .start_paused(true)
        .build();
    let before = Instant::now();
    let simulated = runtime.expect("a runtime").block_on(async {
        let clock = Clock::simulated();
        let store = Box::new(FolderStore::create(&folder.path().join("run")).expect("a folder"));
        let heading = Heading {
            record: "bench".to_owned(),
            unit: "B-1".to_owned(),
            operator: "bench".to_owned(),
            seed: Some(1),
            started: clock.started().to_rfc3339(),
        };
        let journal =
            Journal::open(store, heading, plan, &[], Flushing::EachSecond).expect("a journal");
        let (mouth, heard) = hearing();
        let open = |setup: rateplate::bench::LineSetup| {
            let far = bench.far_side(&setup.name);
            simulated_line(setup, far, clock.clone(), mouth.ears())
        };
        let lines = line_setups(plan).into_iter().map(open).collect();
        let (_stop, stop) = tokio::sync::watch::channel(false);
        let bay = Bay {
            plan: Arc::new(plan.clone()),
            unit: "B-1".to_owned(),
            clock: clock.clone(),
            lines,
            heard,
            journal: Arc::new(Mutex::new(journal)),
            operator: Box::new(Nodding),
            stop,
            observer: Box::new(Silent),
        };
        let permissions = Permissions {
            unattended: true,
            speed: 1.0,
        };
        let ended = run::run(bay, permissions, "cautions").await;
        assert_eq!(ended.outcome, rateplate::record::RunOutcome::Complete);
        clock.now().as_secs_f64()
    });
    (simulated, before.elapsed().as_secs_f64())
}

/// Simulated and wall seconds of the far side alone: three queries each 100 ms, in a
/// plain loop without a runtime, a codec or a record.
fn far_side_alone(plan: &Plan, seconds: u64) -> (f64, f64) {
    let bench = virtual_bench(plan);
    let mut meter = bench.far_side("meter line");
    let mut scanner = bench.far_side("scanner line");
    let mut reply = Vec::new();
    let before = Instant::now();
    for tick in 0..seconds * 10 {
        let start = tick * 100_000;
        let asked: [(bool, &[u8]); 3] = [
            (true, b":MEAS:VOLT:AC?;:MEAS:CURR:AC?;:MEAS:POW:ACT?\n"),
            (false, b"MEAS:TEMP? (@1)\n"),
            (false, b"MEAS:TEMP? (@2)\n"),
        ];
        for (n, (of_meter, query)) in asked.into_iter().enumerate() {
            let far = if of_meter { &mut meter } else { &mut scanner };
            far.receive(query, Moment::from_micros(start + n as u64 * 30_000));
            let due = far.due().expect("a reply is on its way");
            reply.clear();
            far.deliver(due, &mut reply);
            assert!(reply.ends_with(b"\n"));
        }
    }
    (seconds as f64, before.elapsed().as_secs_f64())
}

fn main() -> io::Result<()> {
    let plan = plan();
    let mut out = io::stdout().lock();
    writeln!(
        out,
        "simulated seconds per wall second, three readings at 10 Hz (median of 3 runs)"
    )?;
    let mut rates = [Vec::new(), Vec::new()];
    for _ in 0..3 {
        for (n, (simulated, wall)) in [far_side_alone(&plan, 20_000), whole(&plan)]
            .into_iter()
            .enumerate()
        {
            rates[n].push(simulated / wall);
        }
    }
    for (name, rates) in ["far side alone (baseline)", "whole run with record"]
        .iter()
        .zip(&mut rates)
    {
        rates.sort_by(f64::total_cmp);
        writeln!(
            out,
            "{name:28} {:>10.0}   {:.0} to {:.0}",
            rates[1], rates[0], rates[2]
        )?;
    }
    writeln!(out, "whole / baseline {:.3}", rates[1][1] / rates[0][1])
}
