//! The lease that keeps a unit energised, and the proof that it is not.

use std::sync::atomic::{AtomicBool, AtomicU64, Ordering};
use std::sync::{Arc, Weak};

use super::error::ExchangeError;
use super::handle::{Door, Facts};
use super::order::Message;
use crate::clock::Clock;
use crate::quantity::Moment;

/// What a lease and its line share. The line alone decides that it is dead.
#[derive(Debug)]
pub(super) struct LeaseState {
    renewed_us: AtomicU64,
    urgent: AtomicBool,
    alive: AtomicBool,
}

impl LeaseState {
    pub(super) fn new(now: Moment) -> Self {
        Self {
            renewed_us: AtomicU64::new(now.as_micros()),
            urgent: AtomicBool::new(false),
            alive: AtomicBool::new(true),
        }
    }

    pub(super) fn renew(&self, now: Moment) {
        self.renewed_us.store(now.as_micros(), Ordering::Release);
    }

    pub(super) fn renewed(&self) -> Moment {
        Moment::from_micros(self.renewed_us.load(Ordering::Acquire))
    }

    pub(super) fn is_urgent(&self) -> bool {
        self.urgent.load(Ordering::Acquire)
    }

    pub(super) fn end(&self) {
        self.alive.store(false, Ordering::Release);
    }
}

/// The right to keep an output on: renewed at least once a second, or it is over.
///
/// Dropping it, letting it run out or closing the line switches the output off;
/// [`Lease::close`] does so and waits for the proof.
#[must_use = "a dropped lease switches the output off"]
#[derive(Debug)]
pub struct Lease {
    state: Arc<LeaseState>,
    clock: Clock,
    door: Weak<Door>,
    facts: Arc<Facts>,
    instrument: usize,
}

impl Lease {
    pub(super) fn new(
        state: Arc<LeaseState>,
        clock: Clock,
        door: Weak<Door>,
        facts: Arc<Facts>,
        instrument: usize,
    ) -> Self {
        Self {
            state,
            clock,
            door,
            facts,
            instrument,
        }
    }

    /// Keeps the output on for another second; cheap.
    pub fn renew(&self) {
        self.state.renew(self.clock.now());
    }

    /// Whether the output may still be on: false as soon as the line has decided to
    /// switch it off, for whatever cause.
    pub fn is_alive(&self) -> bool {
        self.state.alive.load(Ordering::Acquire)
    }

    /// Switches the output off and waits until it is read back as off.
    ///
    /// # Errors
    /// Where that could not be confirmed, or the line has ended before.
    pub async fn close(self, cause: &str) -> Result<OffConfirmed, ExchangeError> {
        match self.door.upgrade() {
            Some(door) => door.off(&self.facts, self.instrument, cause).await,
            None => Err(self.facts.ended(self.instrument)),
        }
    }
}

impl Drop for Lease {
    fn drop(&mut self) {
        if self.is_alive() {
            self.state.urgent.store(true, Ordering::Release);
            if let Some(door) = self.door.upgrade() {
                door.send(Message::Look);
            }
        }
    }
}

/// Proof that an output was switched off and read back as off. Only this room makes it.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct OffConfirmed {
    at: Moment,
}

impl OffConfirmed {
    pub(super) fn new(at: Moment) -> Self {
        Self { at }
    }

    /// When OFF was sent.
    pub fn at(&self) -> Moment {
        self.at
    }
}
