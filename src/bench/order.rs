//! What can be asked of a line, and what it answers.

use tokio::sync::oneshot;

use super::error::ExchangeError;
use super::lease::{Lease, OffConfirmed};
use crate::quantity::{Hertz, Moment, Readings, Seconds, Volts, Waveform};

/// A query that is repeated on an absolute schedule.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Poll {
    /// Comes back in each [`Polled`].
    pub tag: u32,
    /// Which of the line's instruments.
    pub instrument: usize,
    /// Index into the driver's readings.
    pub query: usize,
    /// Which of the instrument's channels.
    pub channel: Option<u32>,
    /// The schedule's interval, in run time; at least 1 ms.
    pub every: Seconds,
}

/// One exchange and what it gave.
#[derive(Debug, Clone, PartialEq)]
pub struct Polled {
    /// The poll's tag; 0 where a single reading was asked for.
    pub tag: u32,
    /// When the request's first byte was written (the first request's, where it failed).
    pub request: Moment,
    /// When the reply was complete, or was given up.
    pub reply: Moment,
    /// The readings, all of the query's or none.
    pub result: Result<Readings, ExchangeError>,
}

/// A setting to be changed.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum Change {
    /// The supply's voltage.
    Voltage(Volts),
    /// The supply's frequency.
    Frequency(Hertz),
    /// The position switch; 0 is off, 1 the lowest position.
    Position(u32),
}

/// Who an instrument says it is.
#[derive(Debug, Clone, PartialEq)]
pub struct Identity {
    /// The whole reply.
    pub reply: String,
    /// Run seconds to a wall second of a virtual instrument; absent on a real one.
    pub virtual_speed: Option<f64>,
}

/// The word by which virtual instruments give themselves away (invariant 4).
const VIRTUAL: &str = "VIRTUAL";

impl Identity {
    /// Reads an identity reply: one that holds `VIRTUAL` comes from a virtual instrument,
    /// and ` x20` behind it says 20 run seconds to a wall second; without that it is 1.
    pub(super) fn of(reply: String) -> Self {
        let virtual_speed = reply.find(VIRTUAL).map(|at| speed_in(&reply[at..]));
        Self {
            reply,
            virtual_speed,
        }
    }
}

fn speed_in(text: &str) -> f64 {
    let stated = text.split(" x").skip(1).find_map(|number| {
        let is_part = |c: char| c.is_ascii_digit() || c == '.';
        let end = number.find(|c| !is_part(c)).unwrap_or(number.len());
        number[..end].parse::<f64>().ok()
    });
    stated
        .filter(|speed| *speed > 0.0 && speed.is_finite())
        .unwrap_or(1.0)
}

/// Who waits for an answer.
pub(super) type Asker<T> = oneshot::Sender<Result<T, ExchangeError>>;

/// What a handle tells its line.
pub(super) enum Message {
    /// Something to be done once.
    Order { instrument: usize, act: Act },
    /// The new polling set and the schedule's origin.
    Polls { polls: Vec<Poll>, origin: Moment },
    /// OFF where energised, then the end; answered when it is over.
    Close(Asker<()>),
    /// A lease was dropped: look at once.
    Look,
}

/// Something to be done once, with the one who waits for it.
pub(super) enum Act {
    Identify(Asker<Identity>),
    Prepare(Asker<()>),
    Read {
        query: usize,
        channel: Option<u32>,
        asker: oneshot::Sender<Polled>,
    },
    Arm(Asker<()>),
    Waveform(Seconds, Asker<Waveform>),
    Change(Change, Asker<()>),
    Energise(Asker<Lease>),
    Off(String, Asker<OffConfirmed>),
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn virtual_instruments_give_themselves_away() {
        for (reply, speed) in [
            ("EXAMPLE,BENCH1,0001,1.0", None),
            ("EXAMPLE,BENCH1,VIRTUAL,1.0", Some(1.0)),
            ("EXAMPLE,BENCH1,VIRTUAL x20,1.0", Some(20.0)),
            ("EXAMPLE,BENCH1,7,VIRTUAL x2.5", Some(2.5)),
            ("EXAMPLE,VIRTUAL-METER,0001,0.1 x20", Some(20.0)),
            ("EXAMPLE,VIRTUAL-METER,0 xy,0.1 x2", Some(2.0)),
            ("EXAMPLE x3,VIRTUAL,7,0.1", Some(1.0)),
            ("EXAMPLE,BENCH1,7,VIRTUAL x0", Some(1.0)),
            ("EXAMPLE,BENCH1,7,VIRTUAL xx", Some(1.0)),
        ] {
            assert_eq!(
                Identity::of(reply.to_owned()).virtual_speed,
                speed,
                "{reply}"
            );
        }
    }
}
