//! One bay's task: it holds the lease, takes every sample, asks the guards, and
//! writes the record.

use std::future::Future;
use std::io;
use std::sync::{Arc, Mutex, MutexGuard, PoisonError};

use tokio::sync::watch;

use super::convert::{converted, raw_sensors};
use super::ears::{Heard, Told};
use super::goal::Goal;
use super::guard::{Trip, Watchman};
use super::operator::{Operator, Prompt, Reply};
use crate::bench::{ExchangeError, Fault, Lease, LineHandle, OffConfirmed, Poll, Polled};
use crate::clock::Clock;
use crate::plan::{Plan, PlannedRole};
use crate::quantity::{Moment, Reading, Readings, Seconds, Waveform};
use crate::record::{Event, Happening, Journal, Sample, Status, StepEnd};
use crate::sensor::Sensor;
use crate::settle::watched_in;
use crate::spec::sequence::RoleKind;

/// The bay wakes at least this often, to renew the lease and look at the guards.
const TICK_US: u64 = 250_000;

/// Most queries of one role; a poll's tag is `role * QUERIES + query`.
const QUERIES: u32 = 64;

/// Why a run was cut short.
#[derive(Debug)]
pub enum Cut {
    /// A guard.
    Tripped(Trip),
    /// The operator.
    Stopped,
    /// An exchange that was given up.
    Lost {
        /// Instrument.
        instrument: String,
        /// Port, line sent, bytes received, time waited.
        detail: String,
    },
    /// Something else that the run can't go on without.
    Failed(String),
    /// The record can't be written.
    Record(io::Error),
}

impl From<Trip> for Cut {
    fn from(trip: Trip) -> Self {
        Cut::Tripped(trip)
    }
}

impl From<io::Error> for Cut {
    fn from(error: io::Error) -> Self {
        Cut::Record(error)
    }
}

impl From<ExchangeError> for Cut {
    fn from(error: ExchangeError) -> Self {
        Cut::Lost {
            instrument: error.instrument.clone(),
            detail: error.to_string(),
        }
    }
}

/// Sees what happens, as it happens.
pub trait Observer: Send {
    /// An event was recorded.
    fn happened(&mut self, plan: &Plan, happening: &Happening);
}

/// A record that the bay writes and that outlives the bay's task.
pub type SharedJournal = Arc<Mutex<Journal>>;

/// The journal, also after a panic elsewhere: what is on disk must be closed truthfully.
pub fn lock(journal: &SharedJournal) -> MutexGuard<'_, Journal> {
    journal.lock().unwrap_or_else(PoisonError::into_inner)
}

/// Everything that one bay's task needs.
pub struct Bay {
    /// The plan.
    pub plan: Arc<Plan>,
    /// The unit's number.
    pub unit: String,
    /// Time.
    pub clock: Clock,
    /// Lines, in the plan's order.
    pub lines: Vec<LineHandle>,
    /// What the lines say.
    pub heard: Heard,
    /// The record.
    pub journal: SharedJournal,
    /// Who answers.
    pub operator: Box<dyn Operator>,
    /// Becomes true when the operator stops the run.
    pub stop: watch::Receiver<bool>,
    /// Who looks on.
    pub observer: Box<dyn Observer>,
}

/// A bay at work.
pub(super) struct Working {
    pub(super) plan: Arc<Plan>,
    pub(super) unit: String,
    pub(super) clock: Clock,
    pub(super) lines: Vec<LineHandle>,
    /// Line and index on it, by the plan's instrument.
    wiring: Vec<(usize, usize)>,
    heard: Heard,
    journal: SharedJournal,
    operator: Box<dyn Operator>,
    stop: watch::Receiver<bool>,
    observer: Box<dyn Observer>,
    pub(super) watchman: Watchman,
    pub(super) lease: Option<Lease>,
    pub(super) off: Option<OffConfirmed>,
    /// Why OFF could not be confirmed.
    pub(super) off_trouble: Option<String>,
    pub(super) step: u32,
    pub(super) cell: Option<usize>,
    pub(super) energised_at: Option<Moment>,
    /// Whether the meter waits for the first current, or has a waveform of it.
    pub(super) armed: bool,
    every: Vec<Option<Seconds>>,
    /// By role; raw replies are converted by it.
    sensors: Vec<Option<Sensor>>,
}

impl Working {
    pub(super) fn new(bay: Bay) -> Self {
        let plan = bay.plan;
        Self {
            wiring: wiring_of(&plan),
            watchman: Watchman::new(&plan),
            every: vec![None; plan.bay.roles.len()],
            sensors: raw_sensors(&plan),
            plan,
            unit: bay.unit,
            clock: bay.clock,
            lines: bay.lines,
            heard: bay.heard,
            journal: bay.journal,
            operator: bay.operator,
            stop: bay.stop,
            observer: bay.observer,
            lease: None,
            off: None,
            off_trouble: None,
            step: 0,
            cell: None,
            energised_at: None,
            armed: false,
        }
    }

    /// Records an event and shows it.
    pub(super) fn note(&mut self, event: Event) -> Result<(), Cut> {
        let happening = lock(&self.journal).event(self.clock.now(), event)?;
        self.observer.happened(&self.plan, &happening);
        Ok(())
    }

    /// Records an event whose effect must wait until it is on the disk.
    /// The moment is the one in the record.
    pub(super) fn announce(&mut self, event: Event) -> Result<Moment, Cut> {
        let happening = lock(&self.journal).announce(self.clock.now(), event)?;
        self.observer.happened(&self.plan, &happening);
        Ok(happening.at)
    }

    /// Stores a waveform of the cell and shows it.
    pub(super) fn store(&mut self, cell: usize, wave: &Waveform) -> Result<(), Cut> {
        let happening = lock(&self.journal).waveform(self.clock.now(), cell, wave)?;
        self.observer.happened(&self.plan, &happening);
        Ok(())
    }

    pub(super) fn mark_virtual(&self) {
        lock(&self.journal).mark_virtual();
    }

    pub(super) fn operator_name(&self) -> String {
        self.operator.name()
    }

    /// Line and index on it of a role's instrument.
    pub(super) fn instrument_of(&self, role: &PlannedRole) -> (LineHandle, usize) {
        self.instrument(role.instrument)
    }

    /// Line and index on it of the plan's instrument.
    pub(super) fn instrument(&self, instrument: usize) -> (LineHandle, usize) {
        let (line, index) = self.wiring[instrument];
        (self.lines[line].clone(), index)
    }

    /// Polls every role that can be read, each no faster than its instrument updates.
    pub(super) fn poll_every(&mut self, every: Seconds) {
        let wanted: Vec<Option<Seconds>> = self
            .plan
            .bay
            .roles
            .iter()
            .map(|role| {
                let driver = &self.plan.instrument_of(role).driver;
                let polled = matches!(role.kind, RoleKind::PowerMeter | RoleKind::Temperature);
                let slowest = every.get().max(driver.update_interval.get());
                (polled && !driver.readings.is_empty()).then(|| Seconds::of(slowest))
            })
            .collect();
        if wanted != self.every {
            self.every = wanted;
            self.send_polls();
        }
    }

    /// Polls nothing.
    pub(super) fn poll_nothing(&mut self) {
        if self.every.iter().any(Option::is_some) {
            self.every.fill(None);
            self.send_polls();
        }
    }

    fn send_polls(&mut self) {
        self.watchman.polling(self.clock.now(), &self.every);
        for (number, line) in self.lines.iter().enumerate() {
            line.poll(self.polls_of(number));
        }
    }

    fn polls_of(&self, line: usize) -> Vec<Poll> {
        let mut polls = Vec::new();
        for (role_number, role) in self.plan.bay.roles.iter().enumerate() {
            let (on_line, instrument) = self.wiring[role.instrument];
            let Some(every) = self.every[role_number].filter(|_| on_line == line) else {
                continue;
            };
            for query in 0..self.plan.instrument_of(role).driver.readings.len() {
                let tag = role_number as u32 * QUERIES + query as u32;
                polls.push(Poll {
                    tag,
                    instrument,
                    query,
                    channel: role.channel,
                    every,
                });
            }
        }
        polls
    }

    /// Roles that are polled now.
    pub(super) fn polled_roles(&self) -> Vec<usize> {
        (0..self.every.len())
            .filter(|role| self.every[*role].is_some())
            .collect()
    }

    /// Attends to samples, guards, lease and stop until the goal is reached.
    pub(super) async fn attend(&mut self, goal: &mut Goal) -> Result<StepEnd, Cut> {
        loop {
            let now = self.clock.now();
            if let Some(end) = goal.end(now) {
                return Ok(end);
            }
            let wake = goal.limit().min(now.plus_micros(TICK_US));
            tokio::select! {
                biased;
                () = stopped(&mut self.stop) => return Err(Cut::Stopped),
                polled = self.heard.samples.recv() => self.take_all(polled, goal)?,
                () = self.clock.sleep_until(wake) => {}
            }
            self.look_around()?;
        }
    }

    /// Renews the lease, asks the guards, writes what lines told.
    fn look_around(&mut self) -> Result<(), Cut> {
        self.write_told()?;
        if let Some(lease) = &self.lease {
            if !lease.is_alive() {
                return Err(Cut::Failed(
                    "the lease ended: the line switched the output off by itself".to_owned(),
                ));
            }
            lease.renew();
        }
        Ok(self.watchman.tick(self.clock.now())?)
    }

    fn take_all(&mut self, first: Option<Polled>, goal: &mut Goal) -> Result<(), Cut> {
        let Some(first) = first else {
            return Err(Cut::Failed("every line has ended".to_owned()));
        };
        self.take(first, Some(goal))?;
        while let Ok(polled) = self.heard.samples.try_recv() {
            self.take(polled, Some(goal))?;
        }
        Ok(())
    }

    /// Records a sample first, then lets the guards and the goal see it.
    fn take(&mut self, polled: Polled, goal: Option<&mut Goal>) -> Result<(), Cut> {
        let role = (polled.tag / QUERIES) as usize;
        let (status, readings) = match &polled.result {
            Ok(readings) => converted(self.sensors[role], *readings),
            Err(error) => (status_of(&error.fault), Readings::NONE),
        };
        let mut sample = Sample {
            seq: 0,
            request: polled.request,
            reply: polled.reply,
            step: self.step,
            cell: self.cell,
            role,
            energised: self.energised_at.is_some_and(|on| polled.request >= on),
            status,
            readings,
        };
        lock(&self.journal).sample(&mut sample)?;
        self.watchman
            .sample(sample.reply, role, status, &readings)?;
        if let Some(goal) = goal {
            let planned = &self.plan.bay.roles[role];
            if main_reading(planned.kind).is_some_and(|main| readings.get(main).is_some()) {
                goal.heard(role);
            }
            for (watched, value) in watched_in(planned.kind, &planned.name, &readings) {
                goal.take(sample.reply, watched, value);
            }
        }
        match polled.result {
            Err(error) if is_failure(&error.fault) => Err(error.into()),
            _ => Ok(()),
        }
    }

    /// Writes what the lines told beside samples.
    pub(super) fn write_told(&mut self) -> Result<(), Cut> {
        while let Ok(told) = self.heard.told.try_recv() {
            match told {
                Told::Wire {
                    line,
                    at,
                    way,
                    bytes,
                } => lock(&self.journal).wire(&line, at, way, &bytes)?,
                Told::Off {
                    at,
                    instrument,
                    cause,
                    confirmed,
                } => {
                    let cause = format!("{instrument}: {cause}");
                    let happening =
                        lock(&self.journal).event(at, Event::Off { cause, confirmed })?;
                    self.observer.happened(&self.plan, &happening);
                }
            }
        }
        Ok(())
    }

    /// Writes what is still on its way, after the lines have ended; every row is
    /// tried, and the first failure is told.
    pub(super) fn write_rest(&mut self) -> Result<(), Cut> {
        let mut result = Ok(());
        while let Ok(polled) = self.heard.samples.try_recv() {
            if let Err(Cut::Record(error)) = self.take(polled, None) {
                result = Err(Cut::Record(error));
            }
        }
        self.write_told().and(result)
    }

    /// Asks the operator while attending to everything else.
    pub(super) async fn ask(&mut self, prompt: &Prompt) -> Result<String, Cut> {
        self.note(Event::Prompted {
            text: prompt.text.clone(),
        })?;
        let mut operator = std::mem::replace(&mut self.operator, Box::new(Nobody));
        let reply = self.attend_to(operator.ask(prompt)).await;
        self.operator = operator;
        match reply? {
            Reply::Given(answer) => Ok(answer),
            Reply::Stop => Err(Cut::Stopped),
        }
    }

    /// Awaits something that is not a sample, with guards and lease kept alive.
    pub(super) async fn attend_to<T>(&mut self, wanted: impl Future<Output = T>) -> Result<T, Cut> {
        tokio::pin!(wanted);
        let mut nothing = Goal::Until(Moment::from_micros(u64::MAX / 2));
        loop {
            let wake = self.clock.now().plus_micros(TICK_US);
            let ticking = self.lease.is_some();
            tokio::select! {
                biased;
                () = stopped(&mut self.stop) => return Err(Cut::Stopped),
                polled = self.heard.samples.recv() => self.take_all(polled, &mut nothing)?,
                done = &mut wanted => return Ok(done),
                () = self.clock.sleep_until(wake), if ticking => {}
            }
            self.look_around()?;
        }
    }
}

/// Stands in while the operator is being asked.
struct Nobody;

impl Operator for Nobody {
    fn name(&self) -> String {
        String::new()
    }

    fn ask<'a>(&'a mut self, _: &'a Prompt) -> super::operator::Answering<'a> {
        Box::pin(std::future::ready(Reply::Stop))
    }
}

/// Ready once the run is stopped; a sender that is gone counts as a stop.
async fn stopped(stop: &mut watch::Receiver<bool>) {
    let _ = stop.wait_for(|stop| *stop).await;
}

/// What a role of a kind is polled for.
fn main_reading(kind: RoleKind) -> Option<Reading> {
    match kind {
        RoleKind::PowerMeter => Some(Reading::Power),
        RoleKind::Temperature => Some(Reading::Temperature),
        RoleKind::Supply | RoleKind::PositionSwitch => None,
    }
}

/// Instruments are numbered on their line in the plan's order.
fn wiring_of(plan: &Plan) -> Vec<(usize, usize)> {
    let mut on_line = vec![0; plan.lines.len()];
    let number = |instrument: &crate::plan::PlannedInstrument| {
        let index = on_line[instrument.line];
        on_line[instrument.line] += 1;
        (instrument.line, index)
    };
    plan.instruments.iter().map(number).collect()
}

fn status_of(fault: &Fault) -> Status {
    match fault {
        Fault::Overload => Status::Overload,
        Fault::NoValue => Status::NoValue,
        Fault::NoReply | Fault::Lost(_) => Status::NoReply,
        _ => Status::Garbled,
    }
}

/// A sentinel is an answer; everything else, after all tries, is a failure.
fn is_failure(fault: &Fault) -> bool {
    !matches!(fault, Fault::Overload | Fault::NoValue)
}
