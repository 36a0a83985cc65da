//! One exchange: a typed request, its tries, and a typed reply. No I/O: bytes and
//! moments come in as arguments, and the pump writes what stands in the outbox.
//!
//! **Resynchronisation.** Replies carry no number, so after a time-out or a garbled
//! reply nobody knows whether the next line belongs to the former query. An
//! instrument answers in the order in which it was asked; so before the next query
//! its identity is asked for, and every line up to its identity reply is stale and
//! dropped. Bytes that come while nothing is asked have the same effect.

mod blocks;

use std::sync::Arc;

use super::codec;
use super::error::Fault;
use super::request::{Expect, Failure, Manner, Outcome, Reply, Request, read};
use crate::quantity::Moment;

/// A reply of more bytes than this is garbled.
pub const REPLY_LIMIT: usize = 64 * 1024;
/// Received bytes that are kept for the error message.
const HEARD_LIMIT: usize = 256;
/// After so many reply times of uninterrupted noise from another instrument a
/// request is sent all the same.
const NOISE_LIMIT: u64 = 4;

/// What the pump does next.
#[derive(Debug)]
pub enum Next {
    /// Write [`Exchange::outbox`], then call [`Exchange::written`].
    Write,
    /// Wait for bytes or for [`Exchange::wake_at`].
    Wait,
    /// It is over.
    Over(Outcome),
}

/// Replies that may still come from an instrument that was given up.
#[derive(Debug)]
struct Owed {
    instrument: usize,
    /// Identity queries sent since, and whether one was answered in this round.
    identities: u32,
    answered: bool,
}

#[derive(Debug, Clone, Copy, PartialEq, Eq)]
enum State {
    Idle,
    /// The gap before the next message.
    Holding,
    /// Waiting until another instrument's late bytes are through.
    Quiet {
        until: Moment,
        at_most: Moment,
    },
    /// The outbox waits for being written.
    Writing {
        identity: bool,
    },
    /// Waiting for the identity reply behind the stale ones.
    Syncing {
        deadline: Moment,
    },
    /// Waiting for the reply.
    Asking {
        deadline: Moment,
    },
}

/// The exchanges of one line, one after the other.
#[derive(Debug)]
pub struct Exchange {
    state: State,
    request: Option<Request>,
    outbox: Vec<u8>,
    inbox: Vec<u8>,
    scanned: usize,
    /// Within a line that was too long: drop up to its end.
    skipping: bool,
    /// The last message was cut off: end it before the next one.
    torn: bool,
    owed: Option<Owed>,
    last_instrument: usize,
    /// The end of the gap after the last message.
    not_before: Moment,
    /// The end of a pause that was asked for.
    pause_until: Moment,
    writing_at: Moment,
    first_sent: Option<Moment>,
    last_sent: Moment,
    tries: u32,
    heard: Vec<u8>,
    heard_total: usize,
    /// What was wrong with a line that was passed over.
    passed_over: Option<Fault>,
    /// The last command, whose echo may still come.
    last_command: Option<Arc<[u8]>>,
}

impl Exchange {
    /// Nothing asked, nothing owed.
    pub fn new() -> Self {
        Self {
            state: State::Idle,
            request: None,
            outbox: Vec::with_capacity(128),
            inbox: Vec::with_capacity(256),
            scanned: 0,
            skipping: false,
            torn: false,
            owed: None,
            last_instrument: 0,
            not_before: Moment::START,
            pause_until: Moment::START,
            writing_at: Moment::START,
            first_sent: None,
            last_sent: Moment::START,
            tries: 0,
            heard: Vec::with_capacity(HEARD_LIMIT),
            heard_total: 0,
            passed_over: None,
            last_command: None,
        }
    }

    /// The bytes to be written after [`Next::Write`].
    pub fn outbox(&self) -> &[u8] {
        &self.outbox
    }

    /// Whether the outbox waits for being written.
    pub fn is_writing(&self) -> bool {
        matches!(self.state, State::Writing { .. })
    }

    /// When [`Exchange::expire`] is to be called.
    pub fn wake_at(&self) -> Option<Moment> {
        match self.state {
            State::Idle => None,
            State::Writing { .. } => Some(Moment::START),
            State::Holding => Some(self.held_until()),
            State::Quiet { until, at_most } => Some(until.min(at_most)),
            State::Syncing { deadline } | State::Asking { deadline } => Some(deadline),
        }
    }

    /// Begins an exchange; the former one must be over or aborted.
    pub fn begin(&mut self, request: Request, now: Moment) -> Next {
        self.last_instrument = request.manner.instrument;
        self.request = Some(request);
        self.first_sent = None;
        self.tries = 0;
        self.passed_over = None;
        self.forget_heard();
        if let Some(owed) = &mut self.owed {
            owed.answered = false;
        }
        self.advance(now)
    }

    /// No message before `moment`, unless the exchange is aborted.
    pub fn pause_until(&mut self, moment: Moment) {
        self.pause_until = moment;
    }

    fn held_until(&self) -> Moment {
        self.not_before.max(self.pause_until)
    }

    /// Gives the exchange in progress up without an outcome.
    pub fn abort(&mut self) {
        if matches!(self.state, State::Syncing { .. } | State::Asking { .. }) {
            self.owe();
        }
        self.state = State::Idle;
        self.pause_until = Moment::START;
        self.clear_inbox();
    }

    /// The outbox was written, whole or in part.
    pub fn written(&mut self, whole: bool, now: Moment) -> Next {
        let (State::Writing { identity }, Some(request)) = (self.state, &self.request) else {
            return Next::Wait;
        };
        let (manner, within_us) = (request.manner.clone(), request.within_us);
        self.torn = !whole;
        self.first_sent.get_or_insert(self.writing_at);
        if !whole {
            return self.failed_try(Fault::Lost("the port takes no bytes".to_owned()), now);
        }
        let deadline = now.plus_micros(manner.reply_within_us);
        if identity {
            if let Some(owed) = &mut self.owed {
                owed.identities += 1;
            }
            self.state = State::Syncing { deadline };
            return Next::Wait;
        }
        self.last_sent = self.writing_at;
        if matches!(request.expect, Expect::Nothing) {
            self.last_command = Some(request.bytes.clone());
            return self.over(Ok(Reply::Done), now);
        }
        let deadline = now.plus_micros(within_us);
        self.state = State::Asking { deadline };
        Next::Wait
    }

    /// Bytes came.
    pub fn feed(&mut self, bytes: &[u8], now: Moment) -> Next {
        self.hear(bytes);
        match self.state {
            State::Idle | State::Holding | State::Writing { .. } => {
                if codec::is_blank(bytes) {
                    return Next::Wait;
                }
                self.owe();
                match self.state {
                    // The request must not go out in front of the synchronising one.
                    State::Writing { .. } => self.advance(now),
                    _ => Next::Wait,
                }
            }
            State::Quiet { at_most, .. } => {
                let within = self
                    .request
                    .as_ref()
                    .map_or(0, |r| r.manner.reply_within_us);
                let until = now.plus_micros(within);
                self.state = State::Quiet { until, at_most };
                Next::Wait
            }
            State::Syncing { .. } | State::Asking { .. } => {
                self.inbox.extend_from_slice(bytes);
                self.read_block(now).unwrap_or_else(|| self.read_lines(now))
            }
        }
    }

    /// Time has passed.
    pub fn expire(&mut self, now: Moment) -> Next {
        match self.state {
            State::Writing { .. } => Next::Write,
            State::Holding if now >= self.held_until() => self.advance(now),
            State::Quiet { until, at_most } if now >= until || now >= at_most => {
                self.owed = None;
                self.advance(now)
            }
            State::Syncing { deadline } if now >= deadline => {
                if self.owed.as_ref().is_some_and(|owed| owed.answered) {
                    return self.synchronised(now);
                }
                self.failed_try(Fault::NoReply, now)
            }
            State::Asking { deadline } if now >= deadline => {
                let fault = self.why_nothing();
                self.failed_try(fault, now)
            }
            _ => Next::Wait,
        }
    }

    fn why_nothing(&mut self) -> Fault {
        match self.passed_over.take() {
            Some(fault) => fault,
            None if codec::is_blank(&self.inbox) => Fault::NoReply,
            None => self.broken_off(),
        }
    }

    /// Puts what has to be sent next into the outbox.
    fn advance(&mut self, now: Moment) -> Next {
        let Some(request) = &self.request else {
            self.state = State::Idle;
            return Next::Wait;
        };
        if now < self.held_until() {
            self.state = State::Holding;
            return Next::Wait;
        }
        let manner = &request.manner;
        let mut identity = false;
        // A command needs no reply and OFF must not wait; an identity finds itself.
        let needs_sync = !matches!(request.expect, Expect::Nothing | Expect::Identity);
        if let Some(owed) = self.owed.as_ref().filter(|_| needs_sync) {
            if owed.instrument != manner.instrument {
                let at_most = now.plus_micros(NOISE_LIMIT * manner.reply_within_us);
                let until = now.plus_micros(manner.reply_within_us);
                self.state = State::Quiet { until, at_most };
                return Next::Wait;
            }
            identity = true;
        }
        self.outbox.clear();
        if self.torn {
            self.outbox.extend_from_slice(manner.sends.bytes());
        }
        let bytes = if identity {
            &manner.identity_query
        } else {
            &*request.bytes
        };
        self.outbox.extend_from_slice(bytes);
        self.writing_at = now;
        self.state = State::Writing { identity };
        if !identity {
            self.clear_inbox();
            self.forget_heard();
        }
        Next::Write
    }

    fn read_lines(&mut self, now: Moment) -> Next {
        let Some(manner) = self.request.as_ref().map(|r| r.manner.clone()) else {
            return Next::Wait;
        };
        // Taken out, so that a line can be looked at while the state changes.
        let inbox = std::mem::take(&mut self.inbox);
        let (mut start, mut from) = (0, self.scanned);
        let mut next = Next::Wait;
        while let Some((line, took)) = codec::split_line(&inbox[start..], manner.replies, from) {
            start += took;
            from = 0;
            let rest = &inbox[start..];
            if std::mem::take(&mut self.skipping) || codec::is_blank(line) {
                continue;
            }
            next = self.take_line(line, rest, &manner, now);
            if !matches!(next, Next::Wait) {
                // What follows a reply is a surplus: whose it is nobody knows.
                if matches!(next, Next::Over(_)) && !codec::is_blank(rest) {
                    self.owe();
                }
                start = inbox.len();
                break;
            }
        }
        self.inbox = inbox;
        self.inbox.drain(..start);
        self.scanned = self.inbox.len();
        if self.inbox.len() > self.limit() {
            return self.too_long(now);
        }
        next
    }

    fn too_long(&mut self, now: Moment) -> Next {
        let asking = matches!(self.state, State::Asking { .. });
        self.clear_inbox();
        self.skipping = true;
        if asking {
            let why = format!("more than {} bytes without a line end", self.limit());
            return self.failed_try(Fault::Garbled(why), now);
        }
        Next::Wait
    }

    fn take_line(&mut self, line: &[u8], rest: &[u8], manner: &Manner, now: Moment) -> Next {
        if matches!(self.state, State::Syncing { .. }) {
            return self.take_stale(line, rest, manner, now);
        }
        if self.is_echo(line) {
            return Next::Wait;
        }
        let Some(request) = &self.request else {
            return Next::Wait;
        };
        match read(line, &request.expect, manner) {
            Ok(reply) => self.over(Ok(reply), now),
            // Nothing but an identity is wanted: other lines are stale ones.
            Err(fault) if matches!(request.expect, Expect::Identity) => {
                self.passed_over = Some(fault);
                Next::Wait
            }
            Err(fault @ Fault::Garbled(_)) => self.failed_try(fault, now),
            Err(fault) => self.over(Err(fault), now),
        }
    }

    /// A line while synchronising: stale, unless it is the identity reply.
    fn take_stale(&mut self, line: &[u8], rest: &[u8], manner: &Manner, now: Moment) -> Next {
        let Some(owed) = self.owed.as_mut().filter(|_| manner.is_identity(line)) else {
            return Next::Wait;
        };
        owed.answered = true;
        owed.identities = owed.identities.saturating_sub(1);
        if owed.identities > 0 || !codec::is_blank(rest) {
            // Replies to former identity queries may follow: wait for them, or for silence.
            let deadline = now.plus_micros(manner.reply_within_us);
            self.state = State::Syncing { deadline };
            return Next::Wait;
        }
        self.synchronised(now)
    }

    fn synchronised(&mut self, now: Moment) -> Next {
        let Some(request) = &self.request else {
            return Next::Wait;
        };
        self.owed = None;
        self.not_before = now.plus_micros(request.manner.gap_us);
        self.advance(now)
    }

    /// Some adapters give back what was sent: that is no reply.
    fn is_echo(&self, line: &[u8]) -> bool {
        let same = |sent: &[u8]| sent.trim_ascii_end() == line.trim_ascii_end();
        self.request.as_ref().is_some_and(|r| same(&r.bytes))
            || self.last_command.as_ref().is_some_and(|c| same(c))
    }

    fn failed_try(&mut self, fault: Fault, now: Moment) -> Next {
        self.owe();
        self.clear_inbox();
        let Some(request) = &self.request else {
            self.state = State::Idle;
            return Next::Wait;
        };
        self.tries += 1;
        self.not_before = now.plus_micros(request.manner.gap_us);
        if self.tries < request.tries {
            return self.advance(now);
        }
        self.over(Err(fault), now)
    }

    fn over(&mut self, result: Result<Reply, Fault>, now: Moment) -> Next {
        self.state = State::Idle;
        let Some(request) = self.request.take() else {
            return Next::Wait;
        };
        self.not_before = now.plus_micros(request.manner.gap_us);
        let first = self.first_sent.unwrap_or(now);
        let requested = match &result {
            Ok(_) | Err(Fault::Overload | Fault::NoValue) => self.last_sent,
            Err(_) => first,
        };
        let result = result.map_err(|fault| {
            Box::new(Failure {
                fault,
                sent: request.bytes,
                heard: self.heard.clone(),
                heard_total: self.heard_total,
                waited: now.since(first),
                tries: self.tries.max(1),
            })
        });
        Next::Over(Outcome {
            requested,
            replied: now,
            result,
        })
    }

    /// From now on the last instrument may still owe a reply.
    fn owe(&mut self) {
        let instrument = self.last_instrument;
        if self
            .owed
            .as_ref()
            .is_none_or(|o| o.instrument != instrument)
        {
            self.owed = Some(Owed {
                instrument,
                identities: 0,
                answered: false,
            });
        }
    }

    fn hear(&mut self, bytes: &[u8]) {
        let room = HEARD_LIMIT - self.heard.len().min(HEARD_LIMIT);
        self.heard
            .extend_from_slice(&bytes[..bytes.len().min(room)]);
        self.heard_total += bytes.len();
    }

    fn forget_heard(&mut self) {
        self.heard.clear();
        self.heard_total = 0;
    }

    fn clear_inbox(&mut self) {
        self.inbox.clear();
        self.scanned = 0;
    }
}
