//! The steps of an order, one exchange after the other.

use std::sync::Arc;

use super::{ALREADY_ON, Line, Work};
use crate::bench::error::{ExchangeError, Fault, escaped};
use crate::bench::exchange::Next;
use crate::bench::lease::{Lease, LeaseState};
use crate::bench::order::{Asker, Identity, Polled};
use crate::bench::request::{Outcome, Reply};
use crate::bench::work::{Off, Order, OrderAsker, Step};
use crate::quantity::{Moment, Readings};

impl Line {
    pub(super) fn begin_order(&mut self, order: Order, now: Moment) -> Next {
        let Some(step) = order.steps.front() else {
            self.finish_order(order, Ok(Reply::Done), (now, now));
            return Next::Wait;
        };
        let request = step.request().clone();
        let switches_on = matches!(
            (&order.asker, step),
            (OrderAsker::Lease(_), Step::Exchange(_))
        );
        if switches_on {
            if self.members[order.instrument].granted {
                let why = Fault::Refused(ALREADY_ON.to_owned());
                let error = self.facts.fault(order.instrument, why);
                self.answer_failed(order.asker, error, now);
                return Next::Wait;
            }
            // From here on the output counts as on, whatever becomes of the order.
            let member = &mut self.members[order.instrument];
            member.lease = Some(Arc::new(LeaseState::new(now)));
            member.granted = false;
            self.facts.set_unconfirmed(true);
        }
        self.work = Some(Work::Order(order));
        self.exchange.begin(request, now)
    }

    pub(super) fn follow_order(&mut self, mut order: Order, outcome: Outcome, now: Moment) -> Next {
        let instrument = order.instrument;
        let times = (outcome.requested, outcome.replied);
        let reply = match outcome.result {
            Ok(reply) => reply,
            Err(failure) => {
                let error = self.error(instrument, *failure);
                return self.finish_order(order, Err(error), times);
            }
        };
        if let Reply::Number(number) = &reply {
            order.number = Some(*number);
        }
        let mut fault = None;
        match (order.steps.front_mut(), &reply) {
            (Some(Step::Errors { left, .. }), Reply::ErrorEntry(entry)) => {
                if entry.code != 0 && *left > 1 {
                    *left -= 1;
                    order.reported.get_or_insert(Fault::Reported {
                        code: entry.code,
                        text: entry.text.clone(),
                    });
                    return self.begin_order(order, now);
                }
                fault = order.reported.take();
            }
            (Some(Step::Confirm { wanted, left, .. }), reply) => {
                if let Err(disagrees) = wanted.check(reply) {
                    if *left > 1 {
                        *left -= 1;
                        let pause = self.members[instrument].update_us();
                        self.exchange.pause_until(now.plus_micros(pause));
                        return self.begin_order(order, now);
                    }
                    fault = Some(disagrees);
                }
            }
            _ => {}
        }
        if let Some(fault) = fault {
            let error = self.facts.fault(instrument, fault);
            return self.finish_order(order, Err(error), times);
        }
        order.steps.pop_front();
        if order.steps.is_empty() {
            return self.finish_order(order, Ok(reply), times);
        }
        self.begin_order(order, now)
    }

    pub(super) fn finish_order(
        &mut self,
        order: Order,
        result: Result<Reply, ExchangeError>,
        times: (Moment, Moment),
    ) -> Next {
        let (request, reply_at) = times;
        let instrument = order.instrument;
        match (order.asker, result) {
            (OrderAsker::Lease(asker), Ok(_)) => self.grant(instrument, asker, reply_at),
            (OrderAsker::Lease(asker), Err(error)) => {
                let mut off = Off::new(instrument, "energising failed");
                off.refused = Some((asker, error));
                self.start_off(off, reply_at);
            }
            (OrderAsker::Identity(asker), Ok(Reply::Identity(text))) => {
                drop(asker.send(self.recognise(instrument, text)));
            }
            (OrderAsker::Waveform(asker), Ok(Reply::Block(pairs))) => {
                let wave = self.members[instrument].waveform(pairs, order.number);
                drop(asker.send(wave.map_err(|fault| self.facts.fault(instrument, fault))));
            }
            (OrderAsker::Polled(asker), Ok(reply)) => {
                let result = match reply {
                    Reply::Readings(readings) => Ok(readings),
                    _ => Ok(Readings::NONE),
                };
                drop(asker.send(Polled {
                    tag: 0,
                    request,
                    reply: reply_at,
                    result,
                }));
            }
            (OrderAsker::Polled(asker), Err(error)) => drop(asker.send(Polled {
                tag: 0,
                request,
                reply: reply_at,
                result: Err(error),
            })),
            (OrderAsker::Done(asker), result) => drop(asker.send(result.map(drop))),
            (asker, Err(error)) => self.answer_failed(asker, error, reply_at),
            (asker, Ok(_)) => {
                let why = Fault::Garbled("the reply is of another kind".to_owned());
                let error = self.facts.fault(instrument, why);
                self.answer_failed(asker, error, reply_at);
            }
        }
        Next::Wait
    }

    pub(super) fn recognise(
        &self,
        instrument: usize,
        text: String,
    ) -> Result<Identity, ExchangeError> {
        let expected = self.members[instrument].identity();
        if text.starts_with(expected) {
            return Ok(Identity::of(text));
        }
        let mut detail = (*self.facts.fault(
            instrument,
            Fault::WrongIdentity {
                expected: expected.to_owned(),
            },
        ))
        .clone();
        let steps = self.members[instrument].identify_steps();
        if let Some(step) = steps.front() {
            let sent = step.request().bytes();
            detail.sent = escaped(sent, sent.len());
        }
        detail.received = escaped(text.as_bytes(), text.len());
        detail.tries = 1;
        Err(detail.into())
    }

    /// The output is read back as on: hand the lease out.
    pub(super) fn grant(&mut self, instrument: usize, asker: Asker<Lease>, now: Moment) {
        let member = &mut self.members[instrument];
        let state = member
            .lease
            .get_or_insert_with(|| Arc::new(LeaseState::new(now)));
        state.renew(now);
        member.granted = true;
        let lease = Lease::new(
            state.clone(),
            self.clock.clone(),
            self.door.clone(),
            self.facts.clone(),
            instrument,
        );
        // Where nobody waits any more the lease is dropped here, and so it ends.
        drop(asker.send(Ok(lease)));
    }
}
