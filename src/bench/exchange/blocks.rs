//! A block as the reply of an exchange.

use super::{Exchange, Next, REPLY_LIMIT, State};
use crate::bench::block::{self, BLOCK_LIMIT, Found};
use crate::bench::codec;
use crate::bench::error::Fault;
use crate::bench::request::{Expect, Reply};
use crate::quantity::Moment;

impl Exchange {
    /// Reads on in a block, where one is asked for; nothing where what came does not
    /// begin like one, so that it is read as lines.
    pub(super) fn read_block(&mut self, now: Moment) -> Option<Next> {
        if !matches!(self.state, State::Asking { .. }) {
            return None;
        }
        self.pass_echo();
        let request = self.request.as_ref()?;
        let Expect::Block(form) = &request.expect else {
            return None;
        };
        let found = match block::find(&self.inbox, request.manner.replies) {
            Ok(Found::Part(_)) => return Some(Next::Wait),
            Ok(Found::NoBlock) => return None,
            Ok(Found::Whole(at, took)) => form.read(&self.inbox[at]).map(|pairs| (pairs, took)),
            Err(fault) => Err(fault),
        };
        Some(match found {
            Ok((pairs, took)) => {
                // What follows a reply is a surplus: whose it is nobody knows.
                if !codec::is_blank(&self.inbox[took..]) {
                    self.owe();
                }
                self.clear_inbox();
                self.over(Ok(Reply::Block(pairs)), now)
            }
            Err(fault @ Fault::Garbled(_)) => self.failed_try(fault, now),
            Err(fault) => {
                self.clear_inbox();
                self.over(Err(fault), now)
            }
        })
    }

    /// Drops echoed lines in front of a block, whose own bytes must not be read as lines.
    fn pass_echo(&mut self) {
        let Some(request) = &self.request else {
            return;
        };
        if !matches!(request.expect, Expect::Block(_)) {
            return;
        }
        let end = request.manner.replies;
        while let Some((line, took)) = codec::split_line(&self.inbox, end, 0) {
            if line.first() == Some(&b'#') || !self.is_echo(line) {
                return;
            }
            self.inbox.drain(..took);
            self.scanned = 0;
        }
    }

    /// Most bytes of a reply: a waveform in decimals is a long line.
    pub(super) fn limit(&self) -> usize {
        match self.request.as_ref().map(|r| &r.expect) {
            Some(Expect::Block(form)) if form.is_text() => BLOCK_LIMIT,
            _ => REPLY_LIMIT,
        }
    }

    /// Why what came until the deadline is no reply.
    pub(super) fn broken_off(&self) -> Fault {
        let request = self.request.as_ref();
        let block = request.filter(|r| matches!(r.expect, Expect::Block(_)));
        let part = block.map(|r| block::find(&self.inbox, r.manner.replies));
        match part {
            Some(Ok(Found::Part(why))) => Fault::Garbled(why),
            _ => Fault::Garbled("the reply has no line end".to_owned()),
        }
    }
}
