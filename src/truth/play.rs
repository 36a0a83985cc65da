//! One unit the whole way: plan, run in simulated time, record in memory, the reader,
//! analysis, judge.

use std::path::Path;
use std::sync::{Arc, Mutex};

use tokio::runtime::Runtime;

use super::TruthError;
use super::equilibrium::staging;
use super::memory::MemoryStore;
use super::setting::Setting;
use super::unit::Unit;
use crate::analysis::{Analysis, CellResult, Input, analyse};
use crate::bench::simulated_line;
use crate::clock::Clock;
use crate::judge::{Judgement, judge};
use crate::plan::Plan;
use crate::record::{Flushing, Folder, Happening, Heading, Journal};
use crate::run::{
    self, Answering, Bay, Observer, Operator, Permissions, Prompt, Reply, Want, hearing,
    line_setups,
};
use crate::virtual_bench::{Drawn, Hands, VirtualBench};

/// What a run left.
#[derive(Debug)]
pub(super) struct Played {
    pub(super) analysis: Analysis,
    pub(super) judgement: Judgement,
}

impl Played {
    /// The results of a position.
    pub(super) fn cell(&self, position: &str) -> Option<&CellResult> {
        let mut cells = self.analysis.cells.iter();
        cells.find(|result| result.cell.position == position)
    }

    /// How long it was energised in all cells, seconds.
    pub(super) fn energised_s(&self) -> f64 {
        let length = |cell: &CellResult| {
            let (on, off) = (cell.energised_s.known()?, cell.off_s.known()?);
            Some(off - on)
        };
        self.analysis.cells.iter().filter_map(length).sum()
    }
}

/// Simulated time; one runtime serves any number of units, one after another.
pub(super) fn simulated() -> Result<Runtime, TruthError> {
    let runtime = tokio::runtime::Builder::new_current_thread()
        .enable_time()
        .start_paused(true)
        .build();
    runtime.map_err(|e| TruthError::Time(e.to_string()))
}

/// Plays a unit.
pub(super) fn play(
    runtime: &Runtime,
    setting: &Setting,
    unit: &Unit,
    drawn: Drawn,
) -> Result<Played, TruthError> {
    let errors = setting.errors(drawn, unit.supply);
    let bench = VirtualBench::with_errors(staging(setting, unit), &errors)?;
    let store = MemoryStore::default();
    let ended = runtime.block_on(async {
        let bay = bay(setting, unit, &bench, &store)?;
        let permissions = Permissions {
            unattended: true,
            speed: 1.0,
        };
        Ok::<_, std::io::Error>(run::run(bay, permissions, "").await)
    });
    ended
        .and_then(|ended| ended.manifest)
        .map_err(|e| TruthError::Record(e.to_string()))?;
    let record = Folder::from_files(Path::new("memory"), &store.take())
        .map_err(|e| TruthError::Record(e.to_string()))?;
    let outcome = &record.manifest.outcome;
    let analysis = analyse(&Input {
        plan: &record.plan,
        samples: &record.samples,
        happenings: &record.happenings,
        waveforms: &record.waveforms,
        outcome,
    });
    let judgement = judge(&record.plan, outcome, &analysis);
    Ok(Played {
        analysis,
        judgement,
    })
}

fn bay(
    setting: &Setting,
    unit: &Unit,
    bench: &VirtualBench,
    store: &MemoryStore,
) -> std::io::Result<Bay> {
    let clock = Clock::simulated();
    let heading = Heading {
        record: format!("known-truth-{}", unit.number),
        unit: format!("KT-{}", unit.number),
        operator: "virtual operator".to_owned(),
        seed: Some(unit.seed),
        started: clock.started().to_rfc3339(),
    };
    let plan = &setting.plan;
    let journal = Journal::open(
        Box::new(store.clone()),
        heading,
        plan,
        &[],
        Flushing::EachSecond,
    )?;
    let (mouth, heard) = hearing();
    let lines = line_setups(plan)
        .into_iter()
        .map(|line| {
            let far = bench.far_side(&line.name);
            simulated_line(line, far, clock.clone(), mouth.ears())
        })
        .collect();
    let (never, stop) = tokio::sync::watch::channel(false);
    Ok(Bay {
        plan: plan.clone(),
        unit: format!("KT-{}", unit.number),
        clock: clock.clone(),
        lines,
        heard,
        journal: Arc::new(Mutex::new(journal)),
        operator: Box::new(Willing {
            hands: bench.hands(),
            clock,
            _never: never,
        }),
        stop,
        observer: Box::new(Silent),
    })
}

/// Whoever answers every prompt well at once, and never stops the run.
struct Willing {
    hands: Hands,
    clock: Clock,
    /// A sender that is gone counts as a stop.
    _never: tokio::sync::watch::Sender<bool>,
}

impl Operator for Willing {
    fn name(&self) -> String {
        "virtual operator".to_owned()
    }

    fn ask<'a>(&'a mut self, prompt: &'a Prompt) -> Answering<'a> {
        let now = self.clock.now();
        let answer = match &prompt.want {
            Want::Answer(question) => Hands::answer(question),
            Want::Position { name } => {
                self.hands.turn(name, now);
                String::new()
            }
            Want::Condition { name } => {
                self.hands.set_condition(name, now);
                String::new()
            }
            Want::Acknowledge | Want::Done => String::new(),
        };
        Box::pin(std::future::ready(Reply::Given(answer)))
    }
}

/// Sees everything and says nothing.
struct Silent;

impl Observer for Silent {
    fn happened(&mut self, _: &Plan, _: &Happening) {}
}
