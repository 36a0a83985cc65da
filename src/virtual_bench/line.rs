//! The far side of one line: bytes in, bytes out, with the time that a reply takes
//! and with the line's faults.

use std::collections::VecDeque;
use std::sync::{Arc, Mutex, PoisonError};

use super::bay::{Bay, Hearing};
use super::chance::Chance;
use super::error_queue::DeviceError;
use super::faults::{Fault, Onset};
use super::instruments::Instrument;
use crate::bench::FarSide;
use crate::quantity::Moment;
use crate::spec::sequence::RoleKind;

/// Bits per second that reply times are reckoned with, ten bits to a byte.
const BAUD: u64 = 115_200;
/// Time that an instrument takes to think, microseconds.
const THINKING: u64 = 1000;
/// Bytes that an instrument takes without a line's end.
const INPUT: usize = 4096;

/// What a line does wrong.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
enum Trouble {
    NoReply,
    Late,
    Garbled,
    Echo,
    Dead,
    Stranger,
    ErrorQueue,
}

/// One line with at most one instrument behind it.
#[derive(Debug)]
pub struct Line {
    bay: Arc<Mutex<Bay>>,
    /// The instrument's number in the bay; absent: nobody is there.
    instrument: Option<usize>,
    /// Last byte of what ends a message.
    end: u8,
    reply_end: &'static [u8],
    reply_within: u64,
    troubles: Vec<(Trouble, Moment)>,
    spoiling: Chance,
    replies: u64,
    input: Vec<u8>,
    reply: Vec<u8>,
    /// Replies on their way: when each is there and how many bytes it has.
    pending: VecDeque<(Moment, usize)>,
    output: VecDeque<u8>,
}

impl Line {
    /// The far side of the line `name`.
    pub fn new(bay: Arc<Mutex<Bay>>, name: &str, seed: u64, faults: &[Fault]) -> Self {
        let guard = bay.lock().unwrap_or_else(PoisonError::into_inner);
        let number = guard.instruments.iter().position(|i| i.line == name);
        let instrument = number.map(|n| &guard.instruments[n]);
        let framing = instrument.map(|i| &i.driver.framing);
        let end = framing.and_then(|f| f.sends.bytes().last().copied());
        let reply_end = framing.map_or(b"\n".as_slice(), |f| f.replies.bytes());
        let reply_within = framing.map_or(0, |f| f.reply_within.as_micros());
        let troubles = instrument.map_or_else(Vec::new, |i| {
            faults.iter().filter_map(|f| trouble(f, i)).collect()
        });
        drop(guard);
        Self {
            bay,
            instrument: number,
            end: end.unwrap_or(b'\n'),
            reply_end,
            reply_within,
            troubles,
            spoiling: Chance::of(seed, name),
            replies: 0,
            input: Vec::new(),
            reply: Vec::new(),
            pending: VecDeque::new(),
            output: VecDeque::new(),
        }
    }

    fn has(&self, trouble: Trouble, now: Moment) -> bool {
        // Most lines have none, and each exchange asks several times.
        !self.troubles.is_empty()
            && self
                .troubles
                .iter()
                .any(|(t, from)| *t == trouble && *from <= now)
    }

    /// One whole message, without its end.
    fn hear(&mut self, message: &[u8], sent: usize, now: Moment) {
        let Some(number) = self.instrument else {
            return;
        };
        let message = message.trim_ascii();
        if message.is_empty() {
            return;
        }
        let how = Hearing {
            stranger: self.has(Trouble::Stranger, now),
            in_trouble: self.has(Trouble::ErrorQueue, now),
        };
        self.reply.clear();
        if self.has(Trouble::Echo, now) {
            self.reply.extend_from_slice(message);
            self.reply.extend_from_slice(self.reply_end);
        }
        let echoed = self.reply.len();
        self.bay
            .lock()
            .unwrap_or_else(PoisonError::into_inner)
            .hear(number, message, now.as_micros(), how, &mut self.reply);
        if self.reply.len() > echoed {
            self.reply.extend_from_slice(self.reply_end);
        }
        if !self.reply.is_empty() && !self.has(Trouble::NoReply, now) {
            self.send(sent, now);
        }
    }

    /// Puts the reply on its way.
    fn send(&mut self, sent: usize, now: Moment) {
        self.replies += 1;
        if self.has(Trouble::Garbled, now) {
            self.spoil();
        }
        let bytes = (sent + self.reply.len()) as u64;
        let takes = THINKING + bytes * 10 * 1_000_000 / BAUD;
        let mut due = now.plus_micros(takes.div_ceil(1000) * 1000);
        if self.has(Trouble::Late, now) {
            due = due.plus_micros(self.reply_within + self.reply_within / 2);
        }
        // A line delivers in order.
        if let Some((last, _)) = self.pending.back() {
            due = due.max(*last);
        }
        self.pending.push_back((due, self.reply.len()));
        self.output.extend(&self.reply);
    }

    /// Sets the highest bit of about a third of the reply's bytes, at least of the
    /// first; its end stays.
    fn spoil(&mut self) {
        let bits = self.spoiling.bits(self.replies);
        let body = self.reply.len().saturating_sub(self.reply_end.len());
        for (place, byte) in self.reply[..body].iter_mut().enumerate() {
            if place == 0 || (bits >> (place % 60)) & 3 == 0 {
                *byte |= 0x80;
            }
        }
    }
}

impl FarSide for Line {
    fn receive(&mut self, bytes: &[u8], now: Moment) {
        if self.has(Trouble::Dead, now) {
            return;
        }
        let mut input = std::mem::take(&mut self.input);
        input.extend_from_slice(bytes);
        let mut begin = 0;
        while let Some(length) = input[begin..].iter().position(|b| *b == self.end) {
            self.hear(&input[begin..begin + length], length + 1, now);
            begin += length + 1;
        }
        input.drain(..begin);
        if input.len() > INPUT {
            input.clear();
            let mut bay = self.bay.lock().unwrap_or_else(PoisonError::into_inner);
            if let Some(instrument) = self.instrument.and_then(|n| bay.instruments.get_mut(n)) {
                instrument.fail(DeviceError::InputOverrun);
            }
        }
        self.input = input;
    }

    fn deliver(&mut self, now: Moment, out: &mut Vec<u8>) {
        let dead = self.has(Trouble::Dead, now);
        while let Some((due, length)) = self.pending.front().copied() {
            if due > now {
                break;
            }
            self.pending.pop_front();
            let reply = self.output.drain(..length);
            if !dead {
                out.extend(reply);
            }
        }
    }

    fn due(&self) -> Option<Moment> {
        self.pending.front().map(|(due, _)| *due)
    }
}

/// What a fault does to the line of `instrument`, and from when on.
fn trouble(fault: &Fault, instrument: &Instrument) -> Option<(Trouble, Moment)> {
    let (trouble, usual) = match fault {
        Fault::NoReply(_) => (Trouble::NoReply, RoleKind::PowerMeter),
        Fault::LateReply(_) => (Trouble::Late, RoleKind::PowerMeter),
        Fault::Garbled(_) => (Trouble::Garbled, RoleKind::PowerMeter),
        Fault::Echo(_) => (Trouble::Echo, RoleKind::PowerMeter),
        Fault::Disconnect(_) => (Trouble::Dead, RoleKind::PowerMeter),
        Fault::WrongIdentity(_) => (Trouble::Stranger, RoleKind::PowerMeter),
        Fault::ErrorQueue(_) => (Trouble::ErrorQueue, RoleKind::Supply),
        _ => return None,
    };
    let Onset { role, from } = fault.onset()?;
    let hit = instrument.roles.iter().any(|(name, kind)| match role {
        Some(role) => name == role,
        None => *kind == usual,
    });
    hit.then_some((trouble, *from))
}
