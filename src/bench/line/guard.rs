//! The guard of what a line energises: leases, and OFF in front of everything.

use super::{Line, Work};
use crate::bench::error::{ExchangeError, Fault};
use crate::bench::exchange::Next;
use crate::bench::lease::OffConfirmed;
use crate::bench::request::{Outcome, Reply};
use crate::bench::work::{Member, Off, Order, OrderAsker, on_or_off};
use crate::quantity::Moment;

impl Line {
    pub(super) fn watch_leases(&mut self, now: Moment) {
        for instrument in 0..self.members.len() {
            let member = &self.members[instrument];
            let Some(lease) = member.lease.as_ref().filter(|_| member.granted) else {
                continue;
            };
            let cause = if lease.is_urgent() {
                "the lease was dropped"
            } else if now.micros_since(lease.renewed()) > self.lease_us {
                "the lease was not renewed for 1 s"
            } else {
                continue;
            };
            self.start_off(Off::new(instrument, cause), now);
        }
    }

    /// Puts OFF in front of everything; what is in progress is put aside.
    pub(super) fn start_off(&mut self, mut off: Off, now: Moment) {
        let member = &mut self.members[off.instrument];
        member.granted = false;
        if let Some(lease) = &member.lease {
            lease.end();
        }
        if let Some(Work::Off(running)) = &mut self.work
            && running.instrument == off.instrument
        {
            running.askers.append(&mut off.askers);
            return;
        }
        if let Some(waiting) = self
            .offs
            .iter_mut()
            .find(|o| o.instrument == off.instrument)
        {
            waiting.askers.append(&mut off.askers);
            return;
        }
        self.put_aside(&mut off, now);
        self.offs.push_back(off);
    }

    pub(super) fn put_aside(&mut self, off: &mut Off, now: Moment) {
        match self.work.take() {
            Some(Work::Off(running)) => self.work = Some(Work::Off(running)),
            Some(Work::Poll { .. }) => self.exchange.abort(),
            Some(Work::Order(order)) => {
                self.exchange.abort();
                match order.asker {
                    // Never to be energised again behind its own OFF.
                    OrderAsker::Lease(asker) if order.instrument == off.instrument => {
                        let why = format!("switched off: {}", off.cause);
                        let error = self.facts.fault(order.instrument, Fault::Refused(why));
                        off.refused = Some((asker, error));
                    }
                    asker => self.orders.push_front(Order { asker, ..order }),
                }
            }
            None => {}
        }
        // Neither may one that waits behind it.
        let waiting = std::mem::take(&mut self.orders);
        for order in waiting {
            match order.asker {
                OrderAsker::Lease(asker) if order.instrument == off.instrument => {
                    let why = format!("switched off: {}", off.cause);
                    let error = self.facts.fault(order.instrument, Fault::Refused(why));
                    self.answer_failed(OrderAsker::Lease(asker), error, now);
                }
                asker => self.orders.push_back(Order { asker, ..order }),
            }
        }
    }

    pub(super) fn begin_off(&mut self, mut off: Off, now: Moment) -> Next {
        let output = match self.members[off.instrument].output() {
            Ok(output) => output.clone(),
            Err(fault) => {
                let error = self.facts.fault(off.instrument, fault);
                self.finish_off(off, Err(error), now);
                return Next::Wait;
            }
        };
        let request = if off.reading_back {
            output.state
        } else {
            off.sent += 1;
            off.first_sent.get_or_insert(now);
            self.facts.set_unconfirmed(true);
            output.off
        };
        self.work = Some(Work::Off(off));
        self.exchange.begin(request, now)
    }

    pub(super) fn follow_off(&mut self, mut off: Off, outcome: Outcome, now: Moment) -> Next {
        let error = match outcome.result {
            Ok(Reply::Switch(false)) => {
                self.finish_off(off, Ok(()), now);
                return Next::Wait;
            }
            Ok(Reply::Switch(on)) => self.facts.fault(
                off.instrument,
                Fault::NotConfirmed {
                    wanted: on_or_off(false).to_owned(),
                    found: on_or_off(on).to_owned(),
                },
            ),
            Ok(_) => {
                off.reading_back = true;
                return self.begin_off(off, now);
            }
            Err(failure) => self.error(off.instrument, *failure),
        };
        let member = &self.members[off.instrument];
        if off.sent >= member.off_tries() {
            self.finish_off(off, Err(error), now);
            return Next::Wait;
        }
        if matches!(error.fault, Fault::NotConfirmed { .. }) {
            // A contactor takes its time.
            self.exchange
                .pause_until(now.plus_micros(member.update_us()));
        }
        off.reading_back = false;
        self.begin_off(off, now)
    }

    pub(super) fn finish_off(&mut self, off: Off, result: Result<(), ExchangeError>, now: Moment) {
        let member = &mut self.members[off.instrument];
        if let Some(lease) = member.lease.take() {
            lease.end();
        }
        member.granted = false;
        let at = off.first_sent.unwrap_or(now);
        self.witness
            .off(at, member.name(), &off.cause, result.is_ok());
        self.members[off.instrument].not_off = result.clone().err();
        let open = |m: &Member| m.lease.is_some() || m.not_off.is_some();
        self.facts.set_unconfirmed(self.members.iter().any(open));
        for asker in off.askers {
            let answer = result.clone().map(|()| OffConfirmed::new(at));
            drop(asker.send(answer));
        }
        if let Some((asker, error)) = off.refused {
            drop(asker.send(Err(error)));
        }
    }
}
