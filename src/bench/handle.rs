//! The handle on a line: what `run` holds. Every question is a message to the
//! line's pump and an answer through a one-shot channel.

use std::sync::atomic::{AtomicBool, Ordering};
use std::sync::{Arc, Mutex};
use std::thread::JoinHandle;
use std::time::Duration;

use tokio::sync::mpsc::UnboundedSender;
use tokio::sync::oneshot;

use super::error::{ExchangeDetail, ExchangeError, Fault};
use super::lease::{Lease, OffConfirmed};
use super::order::{Act, Asker, Change, Identity, Message, Poll, Polled};
use super::setup::LineSetup;
use crate::clock::Clock;
use crate::quantity::{Seconds, Waveform};

/// How long the end of a line's thread is waited for, in wall time.
const JOIN_WITHIN: Duration = Duration::from_secs(2);

/// What a line, its handles and its leases share.
#[derive(Debug)]
pub(super) struct Facts {
    line: String,
    port: String,
    instruments: Vec<String>,
    /// An output of this line was switched on and not yet read back as off.
    unconfirmed: AtomicBool,
}

impl Facts {
    pub(super) fn of(setup: &LineSetup) -> Arc<Self> {
        Arc::new(Self {
            line: setup.name.clone(),
            port: setup.port_name().to_owned(),
            instruments: setup.instruments.iter().map(|i| i.name.clone()).collect(),
            unconfirmed: AtomicBool::new(false),
        })
    }

    pub(super) fn line(&self) -> &str {
        &self.line
    }

    pub(super) fn port(&self) -> &str {
        &self.port
    }

    pub(super) fn set_unconfirmed(&self, unconfirmed: bool) {
        self.unconfirmed.store(unconfirmed, Ordering::Release);
    }

    /// Whether a line that is over has left everything off.
    fn left_off(&self) -> Result<(), ExchangeError> {
        if !self.unconfirmed.load(Ordering::Acquire) {
            return Ok(());
        }
        Err(self.not_confirmed("no answer: the line has ended"))
    }

    fn not_confirmed(&self, found: &str) -> ExchangeError {
        self.fault(
            0,
            Fault::NotConfirmed {
                wanted: "OFF".to_owned(),
                found: found.to_owned(),
            },
        )
    }

    pub(super) fn instrument(&self, number: usize) -> String {
        match self.instruments.get(number) {
            Some(name) => name.clone(),
            None => format!("instrument {number}"),
        }
    }

    /// A fault without an exchange.
    pub(super) fn fault(&self, instrument: usize, fault: Fault) -> ExchangeError {
        ExchangeError::from(ExchangeDetail {
            line: self.line.clone(),
            port: self.port.clone(),
            instrument: self.instrument(instrument),
            sent: String::new(),
            received: String::new(),
            waited: Seconds::ZERO,
            tries: 0,
            fault,
        })
    }

    pub(super) fn ended(&self, instrument: usize) -> ExchangeError {
        self.fault(instrument, Fault::Lost("the line has ended".to_owned()))
    }
}

/// The way to a pump; when the last handle goes it closes, and the line ends.
#[derive(Debug)]
pub(super) enum Door {
    /// To a task.
    Task(UnboundedSender<Message>),
    /// To a thread.
    Thread {
        messages: std::sync::mpsc::Sender<Message>,
        thread: Mutex<Option<JoinHandle<()>>>,
    },
}

impl Door {
    /// A message to an ended line is dropped, and so is the asker in it.
    pub(super) fn send(&self, message: Message) {
        match self {
            Door::Task(messages) => drop(messages.send(message)),
            Door::Thread { messages, .. } => drop(messages.send(message)),
        }
    }

    pub(super) async fn off(
        &self,
        facts: &Facts,
        instrument: usize,
        cause: &str,
    ) -> Result<OffConfirmed, ExchangeError> {
        let (asker, answer) = oneshot::channel();
        let act = Act::Off(cause.to_owned(), asker);
        self.send(Message::Order { instrument, act });
        answer
            .await
            .unwrap_or_else(|_| Err(facts.ended(instrument)))
    }
}

/// A handle on a line, cheap to clone; when the last one is dropped, the line
/// switches off what it keeps energised, and ends.
#[derive(Debug, Clone)]
pub struct LineHandle {
    door: Arc<Door>,
    facts: Arc<Facts>,
    clock: Clock,
}

impl LineHandle {
    pub(super) fn new(door: Arc<Door>, facts: Arc<Facts>, clock: Clock) -> Self {
        Self { door, facts, clock }
    }

    /// The line's name in the bench file.
    pub fn name(&self) -> &str {
        &self.facts.line
    }

    /// Asks an instrument who it is.
    ///
    /// # Errors
    /// [`Fault::WrongIdentity`] where the reply does not start as the bench file
    /// says; else what the exchange met.
    pub async fn identify(&self, instrument: usize) -> Result<Identity, ExchangeError> {
        self.ask(instrument, Act::Identify).await
    }

    /// Sends the driver's commands on opening and empties the error queue.
    ///
    /// # Errors
    /// [`Fault::Reported`] where the queue held an entry; else what the exchanges met.
    pub async fn prepare(&self, instrument: usize) -> Result<(), ExchangeError> {
        self.ask(instrument, Act::Prepare).await
    }

    /// Reads once, in front of the polls.
    pub async fn read(&self, instrument: usize, query: usize, channel: Option<u32>) -> Polled {
        let (asker, answer) = oneshot::channel();
        let act = Act::Read {
            query,
            channel,
            asker,
        };
        let asked = self.clock.now();
        self.door.send(Message::Order { instrument, act });
        answer.await.unwrap_or_else(|_| Polled {
            tag: 0,
            request: asked,
            reply: self.clock.now(),
            result: Err(self.facts.ended(instrument)),
        })
    }

    /// Arms the driver's single acquisition and reads the error queue.
    ///
    /// # Errors
    /// [`Fault::Refused`] where the driver fetches no waveform; [`Fault::Reported`];
    /// else what the exchanges met.
    pub async fn arm(&self, instrument: usize) -> Result<(), ExchangeError> {
        self.ask(instrument, Act::Arm).await
    }

    /// Fetches the block of the acquisition that was armed, in front of the polls; it is
    /// tried once, and takes at most `at_most` of run time.
    ///
    /// # Errors
    /// [`Fault::Refused`] where the driver fetches none; [`Fault::NotConfirmed`] where the
    /// acquisition is not complete; else what the exchanges met.
    pub async fn waveform(
        &self,
        instrument: usize,
        at_most: Seconds,
    ) -> Result<Waveform, ExchangeError> {
        self.ask(instrument, |asker| Act::Waveform(at_most, asker))
            .await
    }

    /// Changes a setting, reads the error queue, and confirms by reading back.
    ///
    /// # Errors
    /// [`Fault::Refused`] where the driver has no such setting; [`Fault::Reported`];
    /// [`Fault::NotConfirmed`]; else what the exchanges met.
    pub async fn change(&self, instrument: usize, change: Change) -> Result<(), ExchangeError> {
        self.ask(instrument, |asker| Act::Change(change, asker))
            .await
    }

    /// Replaces the line's polling set; each poll runs on its own absolute schedule
    /// from now on, and what it gives comes out of the samples' channel.
    pub fn poll(&self, polls: Vec<Poll>) {
        let origin = self.clock.now();
        self.door.send(Message::Polls { polls, origin });
    }

    /// Switches the output on under a lease, reads the error queue, and reads back.
    ///
    /// # Errors
    /// As for [`LineHandle::change`]; the output has been switched off again before
    /// the error is returned.
    pub async fn energise(&self, instrument: usize) -> Result<Lease, ExchangeError> {
        self.ask(instrument, Act::Energise).await
    }

    /// Switches the output off whether it is on or not; a lease on it is over.
    ///
    /// # Errors
    /// Where OFF could not be confirmed.
    pub async fn ensure_off(
        &self,
        instrument: usize,
        cause: &str,
    ) -> Result<OffConfirmed, ExchangeError> {
        self.door.off(&self.facts, instrument, cause).await
    }

    /// Switches off what is energised and ends the line for all its handles; a
    /// line's thread is waited for at most 2 s.
    ///
    /// # Errors
    /// Where OFF was needed and could not be confirmed, or the thread did not end in time.
    pub async fn close(self) -> Result<(), ExchangeError> {
        let (asker, answer) = oneshot::channel();
        self.door.send(Message::Close(asker));
        let ended = async { answer.await.unwrap_or_else(|_| self.facts.left_off()) };
        let Door::Thread { thread, .. } = &*self.door else {
            return ended.await;
        };
        let thread = thread.lock().ok().and_then(|mut thread| thread.take());
        let deadline = tokio::time::Instant::now() + JOIN_WITHIN;
        let answer = tokio::time::timeout_at(deadline, ended).await;
        // The port may take its time to close; whether OFF was confirmed is known by now.
        if let (Ok(_), Some(thread)) = (&answer, thread) {
            let _ = tokio::time::timeout_at(deadline, finished(thread)).await;
        }
        answer.unwrap_or_else(|_| {
            let found = "no answer from the line's thread within 2 s";
            Err(self.facts.not_confirmed(found))
        })
    }

    async fn ask<T>(
        &self,
        instrument: usize,
        act: impl FnOnce(Asker<T>) -> Act,
    ) -> Result<T, ExchangeError> {
        let (asker, answer) = oneshot::channel();
        let act = act(asker);
        self.door.send(Message::Order { instrument, act });
        answer
            .await
            .unwrap_or_else(|_| Err(self.facts.ended(instrument)))
    }
}

/// Waits until a thread has ended, without blocking.
async fn finished(thread: JoinHandle<()>) {
    while !thread.is_finished() {
        tokio::time::sleep(Duration::from_millis(1)).await;
    }
    let _ = thread.join();
}
