//! Typed requests and typed replies, framed for one instrument. No I/O.

use std::sync::Arc;

use super::block::{BlockForm, Pairs};
use super::codec::{self, ErrorEntry, Number};
use super::error::Fault;
use crate::quantity::{Moment, Reading, Readings, Seconds};
use crate::spec::driver::{Driver, Terminator};

/// How one instrument is talked to.
#[derive(Debug)]
pub struct Manner {
    /// Which of the line's instruments.
    pub instrument: usize,
    pub(super) sends: Terminator,
    pub(super) replies: Terminator,
    pub(super) reply_within_us: u64,
    pub(super) gap_us: u64,
    tries: u32,
    /// The identity query, framed.
    pub(super) identity_query: Vec<u8>,
    /// The start of its reply.
    identity: String,
    identity_fields: usize,
    factor: f64,
}

impl Manner {
    /// The manner of an instrument whose identity reply starts with `identity`;
    /// reply times are wall time, `factor` run seconds to a wall second.
    pub fn new(instrument: usize, driver: &Driver, identity: &str, factor: f64) -> Self {
        let framing = &driver.framing;
        let scaled = |span: Seconds| (span.as_micros() as f64 * factor) as u64;
        let mut identity_query = driver.identity.ask.clone().into_bytes();
        identity_query.extend_from_slice(framing.sends.bytes());
        Self {
            instrument,
            sends: framing.sends,
            replies: framing.replies,
            reply_within_us: scaled(framing.reply_within).max(1000),
            gap_us: scaled(framing.gap),
            tries: framing.tries.max(1),
            identity_query,
            identity: identity.to_owned(),
            identity_fields: driver.identity.fields,
            factor,
        }
    }

    /// Whether a line is this instrument's identity reply.
    pub(super) fn is_identity(&self, line: &[u8]) -> bool {
        codec::identity(line, self.identity_fields)
            .is_ok_and(|reply| reply.starts_with(&self.identity))
    }
}

/// What a reply must be.
#[derive(Debug, Clone)]
pub enum Expect {
    /// A command: no reply comes.
    Nothing,
    /// An identity.
    Identity,
    /// One number per reading.
    Readings(Arc<[Reading]>),
    /// One number.
    Number,
    /// A boolean.
    Switch,
    /// An error queue's entry.
    ErrorEntry,
    /// A block of voltage and current.
    Block(Arc<BlockForm>),
}

/// What is sent and what must come back; cheap to clone.
#[derive(Debug, Clone)]
pub struct Request {
    pub(super) manner: Arc<Manner>,
    pub(super) bytes: Arc<[u8]>,
    pub(super) expect: Expect,
    pub(super) tries: u32,
    /// Time for the reply, where it is not the driver's usual one.
    pub(super) within_us: u64,
}

impl Request {
    /// The bytes to be sent, framed, and what must come back.
    pub fn new(manner: &Arc<Manner>, bytes: Vec<u8>, expect: Expect) -> Self {
        Self {
            manner: manner.clone(),
            bytes: bytes.into(),
            expect,
            tries: manner.tries,
            within_us: manner.reply_within_us,
        }
    }

    /// The same, tried once only.
    #[must_use]
    pub fn once(mut self) -> Self {
        self.tries = 1;
        self
    }

    /// The same with another time for the whole reply: `span` of wall time, but no more
    /// than `at_most` of run time.
    #[must_use]
    pub fn within(mut self, span: Seconds, at_most: Seconds) -> Self {
        let us = span.as_micros() as f64 * self.manner.factor;
        self.within_us = (us as u64).min(at_most.as_micros()).max(1000);
        self
    }

    /// The framed bytes.
    pub fn bytes(&self) -> &[u8] {
        &self.bytes
    }
}

/// What came back.
#[derive(Debug, Clone, PartialEq)]
pub enum Reply {
    Done,
    Identity(String),
    Readings(Readings),
    Number(f64),
    Switch(bool),
    ErrorEntry(ErrorEntry),
    Block(Pairs),
}

/// An exchange that is over.
#[derive(Debug)]
pub struct Outcome {
    /// When the answered request was written; the first one, where none was answered.
    pub requested: Moment,
    /// When the reply was complete, or was given up.
    pub replied: Moment,
    /// What came back.
    pub result: Result<Reply, Box<Failure>>,
}

/// Why nothing useful came back.
#[derive(Debug)]
pub struct Failure {
    /// Why.
    pub fault: Fault,
    /// What was sent.
    pub sent: Arc<[u8]>,
    /// The first bytes received since the last request.
    pub heard: Vec<u8>,
    /// How many came.
    pub heard_total: usize,
    /// From the first request to giving up.
    pub waited: Seconds,
    /// How often it was tried.
    pub tries: u32,
}

/// What a line means as a reply to `expect`.
///
/// # Errors
/// [`Fault::Garbled`], [`Fault::Overload`] or [`Fault::NoValue`].
pub fn read(line: &[u8], expect: &Expect, manner: &Manner) -> Result<Reply, Fault> {
    Ok(match expect {
        Expect::Nothing => Reply::Done,
        Expect::Identity => Reply::Identity(codec::identity(line, manner.identity_fields)?),
        Expect::Readings(gives) => Reply::Readings(codec::readings(line, gives)?),
        Expect::Number => Reply::Number(codec::number(line).and_then(Number::value)?),
        Expect::Switch => Reply::Switch(codec::switch(line)?),
        Expect::ErrorEntry => Reply::ErrorEntry(codec::error_entry(line)?),
        Expect::Block(form) if form.is_text() => Reply::Block(form.read(line)?),
        // A line where a block was asked for: a sentinel at the best.
        Expect::Block(_) => {
            codec::number(line).and_then(Number::value)?;
            return Err(Fault::Garbled(
                "a number where a block was asked for".to_owned(),
            ));
        }
    })
}
