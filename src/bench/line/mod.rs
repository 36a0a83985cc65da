//! A line: orders in front of polls, and the guard of what it energises. No I/O:
//! both pumps drive this same object, so that what keeps a unit safe is tested
//! without ports and threads.

mod guard;
mod orders;

use std::collections::VecDeque;
use std::sync::{Arc, Weak};

use tokio::sync::mpsc::UnboundedSender;

use super::error::{ExchangeDetail, ExchangeError, Fault, escaped};
use super::exchange::{Exchange, Next};
use super::handle::{Door, Facts};
use super::order::{Act, Asker, Message, Poll, Polled};
use super::request::{Failure, Outcome, Reply};
use super::setup::{LineSetup, Witness};
use super::work::{Member, Off, Order, OrderAsker, Schedule, Step};
use crate::clock::Clock;
use crate::quantity::{Moment, Readings};

/// A lease that was not renewed for so long is over, in run time...
const LEASE_US: f64 = 1_000_000.0;
/// ...but never sooner than this in wall time.
const LEASE_WALL_US: f64 = 250_000.0;

const ALREADY_ON: &str = "a lease on this output is still alive";

/// What the line is doing.
enum Work {
    Poll { tag: u32, instrument: usize },
    Order(Order),
    Off(Off),
}

/// One line; see the module.
pub(super) struct Line {
    facts: Arc<Facts>,
    clock: Clock,
    door: Weak<Door>,
    members: Vec<Member>,
    lease_us: u64,
    exchange: Exchange,
    work: Option<Work>,
    offs: VecDeque<Off>,
    orders: VecDeque<Order>,
    polls: Vec<Schedule>,
    witness: Box<dyn Witness>,
    samples: UnboundedSender<Polled>,
    lost: Option<String>,
    closing: bool,
    closers: Vec<Asker<()>>,
}

impl Line {
    pub(super) fn new(
        setup: LineSetup,
        facts: Arc<Facts>,
        clock: Clock,
        door: Weak<Door>,
        witness: Box<dyn Witness>,
        samples: UnboundedSender<Polled>,
    ) -> Self {
        let factor = clock.factor();
        let members = setup.instruments.into_iter().enumerate();
        Self {
            facts,
            door,
            members: members
                .map(|(number, setup)| Member::new(number, setup, factor))
                .collect(),
            lease_us: LEASE_US.max(LEASE_WALL_US * factor) as u64,
            clock,
            exchange: Exchange::new(),
            work: None,
            offs: VecDeque::new(),
            orders: VecDeque::new(),
            polls: Vec::new(),
            witness,
            samples,
            lost: None,
            closing: false,
            closers: Vec::new(),
        }
    }

    /// The line's name.
    pub(super) fn name(&self) -> &str {
        self.facts.line()
    }

    /// The bytes to be written after [`Line::step`] said so.
    pub(super) fn outbox(&self) -> &[u8] {
        self.exchange.outbox()
    }

    /// Whether a reply is waited for.
    pub(super) fn is_listening(&self) -> bool {
        self.work.is_some()
    }

    /// Whether an output may be on.
    pub(super) fn is_energised(&self) -> bool {
        self.members.iter().any(|m| m.lease.is_some()) || !self.offs.is_empty()
    }

    /// Whether everything is done and the line is to end.
    pub(super) fn is_ended(&self) -> bool {
        self.closing && self.work.is_none() && self.offs.is_empty() && !self.is_energised()
    }

    /// When [`Line::step`] is to be called at the latest.
    pub(super) fn wake_at(&self) -> Option<Moment> {
        let work = match self.work {
            Some(_) => self.exchange.wake_at(),
            None => self.polls.iter().map(|poll| poll.due).min(),
        };
        let leases = self.members.iter().filter(|m| m.granted);
        let leases = leases.filter_map(|m| m.lease.as_ref());
        let runs_out = leases.map(|l| l.renewed().plus_micros(self.lease_us + 1));
        work.into_iter().chain(runs_out).min()
    }

    /// Takes a message from a handle.
    pub(super) fn take(&mut self, message: Message, now: Moment) {
        match message {
            Message::Order { instrument, act } => self.take_act(instrument, act, now),
            Message::Polls { polls, origin } => self.take_polls(&polls, origin, now),
            Message::Close(asker) => {
                self.closers.push(asker);
                self.close("the line is being closed", now);
            }
            Message::Look => {}
        }
    }

    /// Switches off what is energised, answers what waits, and ends.
    pub(super) fn close(&mut self, cause: &str, now: Moment) {
        if self.closing {
            return;
        }
        self.closing = true;
        self.polls.clear();
        for instrument in self.energised() {
            self.start_off(Off::new(instrument, cause), now);
        }
        match self.work.take() {
            Some(Work::Off(off)) => self.work = Some(Work::Off(off)),
            Some(Work::Order(order)) => {
                self.exchange.abort();
                self.orders.push_front(order);
            }
            Some(Work::Poll { .. }) => self.exchange.abort(),
            None => {}
        }
        self.fail_orders("the line was closed", now);
    }

    /// After a panic: forgets what was in progress, switches off and ends.
    pub(super) fn abandon(&mut self, cause: &str, now: Moment) {
        self.exchange.abort();
        self.work = None;
        self.offs.clear();
        self.orders.clear();
        self.closing = false;
        self.close(cause, now);
    }

    /// The port is gone: nothing can be sent any more.
    pub(super) fn lose(&mut self, why: &str, now: Moment) {
        self.exchange.abort();
        self.lost = Some(why.to_owned());
        let lost = Fault::Lost(why.to_owned());
        match self.work.take() {
            Some(Work::Off(off)) => self.offs.push_front(off),
            Some(Work::Order(order)) => self.orders.push_front(order),
            Some(Work::Poll { .. }) | None => {}
        }
        // Leases first: whoever hears of the loss finds them dead.
        for instrument in self.energised() {
            if !self.offs.iter().any(|off| off.instrument == instrument) {
                self.offs
                    .push_back(Off::new(instrument, "the line was lost"));
            }
        }
        for off in std::mem::take(&mut self.offs) {
            let error = self.facts.fault(off.instrument, lost.clone());
            self.finish_off(off, Err(error), now);
        }
        self.fail_orders(why, now);
        for poll in std::mem::take(&mut self.polls) {
            let error = self.facts.fault(poll.poll.instrument, lost.clone());
            self.send_sample(poll.poll.tag, now, error);
        }
    }

    /// Goes on as far as it can at `now`; true where the outbox has to be written.
    pub(super) fn step(&mut self, now: Moment) -> bool {
        self.watch_leases(now);
        if self.work.is_some() {
            let next = self.exchange.expire(now);
            self.go_on(next, now);
        }
        while self.work.is_none() {
            let Some(next) = self.begin_next(now) else {
                break;
            };
            self.go_on(next, now);
        }
        self.exchange.is_writing()
    }

    /// The outbox was written at `now`, whole or in part.
    pub(super) fn written(&mut self, whole: bool, now: Moment) {
        let next = self.exchange.written(whole, now);
        self.go_on(next, now);
    }

    /// Bytes came at `now`.
    pub(super) fn feed(&mut self, bytes: &[u8], now: Moment) {
        let next = self.exchange.feed(bytes, now);
        self.go_on(next, now);
    }

    /// The OFF commands of everything that may be on: for a pump that cannot go on.
    pub(super) fn last_words(&self) -> Vec<Vec<u8>> {
        let energised = self.members.iter().filter(|m| m.lease.is_some());
        let outputs = energised.filter_map(|m| m.output().ok());
        outputs.map(|o| o.off.bytes().to_vec()).collect()
    }

    fn energised(&self) -> Vec<usize> {
        let members = self.members.iter().enumerate();
        members
            .filter(|(_, m)| m.lease.is_some())
            .map(|(number, _)| number)
            .collect()
    }

    fn take_act(&mut self, instrument: usize, act: Act, now: Moment) {
        let Some(member) = self.members.get(instrument) else {
            let fault = Fault::Refused("there is no such instrument on the line".to_owned());
            return self.refuse(instrument, act, fault, now);
        };
        if let Some(why) = &self.lost {
            let fault = Fault::Lost(why.clone());
            return self.refuse(instrument, act, fault, now);
        }
        if self.closing {
            let fault = Fault::Lost("the line was closed".to_owned());
            return self.refuse(instrument, act, fault, now);
        }
        let steps = match &act {
            Act::Identify(_) => Ok(member.identify_steps()),
            Act::Prepare(_) => Ok(member.prepare_steps()),
            Act::Read { query, channel, .. } => member
                .reading(*query, *channel)
                .map(|ask| [Step::Exchange(ask)].into()),
            Act::Arm(_) => member.arm_steps(),
            Act::Waveform(at_most, _) => member.waveform_steps(*at_most),
            Act::Change(change, _) => member.change_steps(*change),
            Act::Energise(_) => member.energise_steps(),
            Act::Off(..) => member.output().map(|_| VecDeque::new()),
        };
        let steps = match steps {
            Ok(steps) => steps,
            Err(fault) => return self.refuse(instrument, act, fault, now),
        };
        let asker = match act {
            Act::Identify(asker) => OrderAsker::Identity(asker),
            Act::Read { asker, .. } => OrderAsker::Polled(asker),
            Act::Prepare(asker) | Act::Arm(asker) | Act::Change(_, asker) => {
                OrderAsker::Done(asker)
            }
            Act::Waveform(_, asker) => OrderAsker::Waveform(asker),
            Act::Energise(asker) => OrderAsker::Lease(asker),
            Act::Off(cause, asker) => {
                let mut off = Off::new(instrument, &cause);
                off.askers.push(asker);
                return self.start_off(off, now);
            }
        };
        self.orders.push_back(Order {
            instrument,
            steps,
            reported: None,
            number: None,
            asker,
        });
    }

    fn refuse(&self, instrument: usize, act: Act, fault: Fault, now: Moment) {
        let error = self.facts.fault(instrument, fault);
        match act {
            Act::Identify(asker) => drop(asker.send(Err(error))),
            Act::Prepare(asker) | Act::Arm(asker) | Act::Change(_, asker) => {
                drop(asker.send(Err(error)));
            }
            Act::Waveform(_, asker) => drop(asker.send(Err(error))),
            Act::Read { asker, .. } => drop(asker.send(failed_sample(0, now, error))),
            Act::Energise(asker) => drop(asker.send(Err(error))),
            Act::Off(_, asker) => drop(asker.send(Err(error))),
        }
    }

    fn take_polls(&mut self, polls: &[Poll], origin: Moment, now: Moment) {
        self.polls.clear();
        for poll in polls {
            let request = match (self.members.get(poll.instrument), &self.lost) {
                (_, Some(why)) => Err(Fault::Lost(why.clone())),
                (None, _) => Err(Fault::Refused(
                    "there is no such instrument on the line".to_owned(),
                )),
                (Some(member), None) => member.reading(poll.query, poll.channel),
            };
            match request {
                Ok(request) => self.polls.push(Schedule::new(*poll, request, origin)),
                Err(fault) => {
                    let error = self.facts.fault(poll.instrument, fault);
                    self.send_sample(poll.tag, now, error);
                }
            }
        }
    }

    fn fail_orders(&mut self, why: &str, now: Moment) {
        for order in std::mem::take(&mut self.orders) {
            let error = self
                .facts
                .fault(order.instrument, Fault::Lost(why.to_owned()));
            self.answer_failed(order.asker, error, now);
        }
    }

    /// Begins the next piece of work; nothing where there is none at `now`.
    fn begin_next(&mut self, now: Moment) -> Option<Next> {
        if let Some(off) = self.offs.pop_front() {
            return Some(self.begin_off(off, now));
        }
        if let Some(order) = self.orders.pop_front() {
            return Some(self.begin_order(order, now));
        }
        let due = self.polls.iter_mut().filter(|poll| poll.due <= now);
        let poll = due.min_by_key(|poll| poll.due)?;
        poll.take_tick(now);
        self.work = Some(Work::Poll {
            tag: poll.poll.tag,
            instrument: poll.poll.instrument,
        });
        Some(self.exchange.begin(poll.request.clone(), now))
    }

    /// Follows an exchange through what comes next, until it has to write or to wait.
    fn go_on(&mut self, next: Next, now: Moment) {
        let mut next = next;
        while let Next::Over(outcome) = next {
            next = match self.work.take() {
                Some(Work::Poll { tag, instrument }) => {
                    let sample = self.sample(tag, instrument, outcome);
                    drop(self.samples.send(sample));
                    Next::Wait
                }
                Some(Work::Order(order)) => self.follow_order(order, outcome, now),
                Some(Work::Off(off)) => self.follow_off(off, outcome, now),
                None => Next::Wait,
            };
        }
    }

    /// Tells those who waited for the end; the pump's last act.
    pub(super) fn say_ended(&mut self) {
        let not_off = self.members.iter().find_map(|m| m.not_off.as_ref());
        for asker in std::mem::take(&mut self.closers) {
            drop(asker.send(not_off.cloned().map_or(Ok(()), Err)));
        }
    }

    fn sample(&self, tag: u32, instrument: usize, outcome: Outcome) -> Polled {
        let result = match outcome.result {
            Ok(Reply::Readings(readings)) => Ok(readings),
            Ok(_) => Ok(Readings::NONE),
            Err(failure) => Err(self.error(instrument, *failure)),
        };
        Polled {
            tag,
            request: outcome.requested,
            reply: outcome.replied,
            result,
        }
    }

    fn send_sample(&self, tag: u32, now: Moment, error: ExchangeError) {
        drop(self.samples.send(failed_sample(tag, now, error)));
    }

    fn answer_failed(&self, asker: OrderAsker, error: ExchangeError, now: Moment) {
        match asker {
            OrderAsker::Identity(asker) => drop(asker.send(Err(error))),
            OrderAsker::Done(asker) => drop(asker.send(Err(error))),
            OrderAsker::Lease(asker) => drop(asker.send(Err(error))),
            OrderAsker::Waveform(asker) => drop(asker.send(Err(error))),
            OrderAsker::Polled(asker) => drop(asker.send(failed_sample(0, now, error))),
        }
    }

    fn error(&self, instrument: usize, failure: Failure) -> ExchangeError {
        ExchangeError::from(ExchangeDetail {
            line: self.facts.line().to_owned(),
            port: self.facts.port().to_owned(),
            instrument: self.facts.instrument(instrument),
            sent: escaped(&failure.sent, failure.sent.len()),
            received: escaped(&failure.heard, failure.heard_total),
            waited: failure.waited,
            tries: failure.tries,
            fault: failure.fault,
        })
    }
}

impl Drop for Line {
    fn drop(&mut self) {
        for lease in self.members.iter().filter_map(|m| m.lease.as_ref()) {
            lease.end();
        }
    }
}

fn failed_sample(tag: u32, now: Moment, error: ExchangeError) -> Polled {
    Polled {
        tag,
        request: now,
        reply: now,
        result: Err(error),
    }
}
