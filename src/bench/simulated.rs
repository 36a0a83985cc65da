//! The simulated pump: a task that calls the far side directly, on tokio's paused
//! clock. No threads, no bytes through the runtime; timers are whole milliseconds,
//! and every choice is biased, so that a run repeats byte for byte.

use std::panic::{AssertUnwindSafe, catch_unwind};
use std::sync::Arc;
use std::time::Duration;

use tokio::sync::mpsc::{UnboundedReceiver, unbounded_channel};

use super::handle::{Door, Facts, LineHandle};
use super::line::Line;
use super::order::Message;
use super::setup::{Ears, LineSetup, Tap};
use crate::clock::Clock;
use crate::quantity::Moment;

/// A far side that says it is due and delivers nothing is asked again after this.
const NOTHING_YET_US: u64 = 1000;
/// Without anything to wait for, a task wakes so often; it costs nothing.
const IDLE_US: u64 = 3_600_000_000;

/// So many panics in a row and the line ends without having read OFF back.
const PANICS: u32 = 3;

/// What is behind a line in memory: one or several simulated instruments.
pub trait FarSide: Send {
    /// Bytes arrive at the far side.
    fn receive(&mut self, bytes: &[u8], now: Moment);
    /// Appends the bytes that the far side has sent until `now`.
    fn deliver(&mut self, now: Moment, out: &mut Vec<u8>);
    /// When it will have bytes to deliver, as far as it knows.
    fn due(&self) -> Option<Moment>;
}

/// Opens a line in memory, driven by a task on the current runtime: the paused
/// current-thread runtime of a rehearsal or a test.
///
/// # Panics
/// Outside a tokio runtime.
pub fn simulated_line(
    setup: LineSetup,
    far: Box<dyn FarSide>,
    clock: Clock,
    ears: Ears,
) -> LineHandle {
    let (sender, messages) = unbounded_channel();
    let door = Arc::new(Door::Task(sender));
    let facts = Facts::of(&setup);
    let line = Line::new(
        setup,
        facts.clone(),
        clock.clone(),
        Arc::downgrade(&door),
        ears.witness,
        ears.samples,
    );
    tracing::debug!(line = line.name(), "simulated line opened");
    let pump = Pump {
        now: clock.now(),
        clock: clock.clone(),
        line,
        far,
        tap: Some(ears.tap),
        inbox: Vec::with_capacity(256),
        panics: 0,
    };
    tokio::spawn(pump.run(messages));
    LineHandle::new(door, facts, clock)
}

struct Pump {
    line: Line,
    far: Box<dyn FarSide>,
    clock: Clock,
    /// Absent after a panic: it may have been its cause.
    tap: Option<Box<dyn Tap>>,
    inbox: Vec<u8>,
    now: Moment,
    panics: u32,
}

impl Pump {
    async fn run(mut self, mut messages: UnboundedReceiver<Message>) {
        let (began, origin) = (tokio::time::Instant::now(), self.now);
        // One timer, moved along: cheaper than a new one for each wait.
        let mut timer = std::pin::pin!(tokio::time::sleep_until(began));
        // A closed channel is ready for ever: asked again, it would hold up time itself.
        let mut open = true;
        loop {
            let wake = self.guarded_turn();
            if self.line.is_ended() || self.panics > PANICS {
                break;
            }
            let ahead = Duration::from_micros(wake.micros_since(origin));
            timer.as_mut().reset(began + ahead);
            let message = tokio::select! {
                biased;
                message = messages.recv(), if open => Some(message),
                () = timer.as_mut() => None,
            };
            self.now = self.clock.now();
            match message {
                Some(Some(message)) => self.line.take(message, self.now),
                Some(None) => {
                    open = false;
                    self.line.close("the line's handle was dropped", self.now);
                }
                None => {}
            }
            while let Ok(message) = messages.try_recv() {
                self.line.take(message, self.now);
            }
        }
        tracing::debug!(line = self.line.name(), "simulated line ended");
        self.line.say_ended();
    }

    /// A turn; a panic in it (a tap's, a far side's) switches off and ends the line.
    fn guarded_turn(&mut self) -> Moment {
        match catch_unwind(AssertUnwindSafe(|| self.turn())) {
            Ok(wake) => wake,
            Err(_) => {
                self.panics += 1;
                self.tap = None;
                self.line.abandon("the line's pump panicked", self.now);
                self.now
            }
        }
    }

    /// Does all that can be done now, and says when to go on.
    fn turn(&mut self) -> Moment {
        loop {
            self.deliver();
            if !self.line.step(self.now) {
                break;
            }
            if let Some(tap) = &mut self.tap {
                tap.sent(self.line.name(), self.now, self.line.outbox());
            }
            self.far.receive(self.line.outbox(), self.now);
            self.line.written(true, self.now);
        }
        let soon = self.now.plus_micros(NOTHING_YET_US);
        let far = self
            .far
            .due()
            .map(|due| if due <= self.now { soon } else { due });
        let wake = far.into_iter().chain(self.line.wake_at()).min();
        wake.unwrap_or(self.now.plus_micros(IDLE_US))
    }

    fn deliver(&mut self) {
        self.inbox.clear();
        self.far.deliver(self.now, &mut self.inbox);
        if self.inbox.is_empty() {
            return;
        }
        if let Some(tap) = &mut self.tap {
            tap.received(self.line.name(), self.now, &self.inbox);
        }
        self.line.feed(&self.inbox, self.now);
    }
}

impl Drop for Pump {
    /// A task that is dropped with its runtime still says OFF.
    fn drop(&mut self) {
        for off in self.line.last_words() {
            let say = || self.far.receive(&off, self.now);
            let _ = catch_unwind(AssertUnwindSafe(say));
        }
    }
}
