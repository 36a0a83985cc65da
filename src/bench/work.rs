//! What a line has to do: an instrument's requests, framed once, and the steps of
//! each order. No I/O.

use std::collections::VecDeque;
use std::sync::Arc;

use tokio::sync::oneshot;

use super::block::{BlockForm, Pairs};
use super::codec::frame;
use super::error::{ExchangeError, Fault};
use super::lease::{Lease, LeaseState, OffConfirmed};
use super::order::{Asker, Change, Identity, Poll, Polled};
use super::request::{Expect, Manner, Reply, Request};
use super::setup::InstrumentSetup;
use crate::quantity::{Moment, Seconds, Waveform, near, shortest};
use crate::spec::driver::{ReadingQuery, SampleInterval, Setting, WaveformQuery};

/// Entries read from an error queue at most, before it counts as one that never empties.
const QUEUE_LIMIT: u32 = 32;
/// A setting read back within this share of what was set agrees (house default: an
/// instrument rounds to its own resolution).
const AGREES: f64 = 1e-3;
/// How often OFF is sent at least, before it counts as not confirmed.
const OFF_TRIES: u32 = 3;
/// Shortest polling interval.
const SHORTEST_INTERVAL_US: u64 = 1000;

/// An instrument on the line and what keeps it energised.
pub(super) struct Member {
    setup: InstrumentSetup,
    manner: Arc<Manner>,
    errors: Option<Request>,
    output: Option<Output>,
    pub lease: Option<Arc<LeaseState>>,
    /// Whether the lease was handed out; until then the line itself renews it.
    pub granted: bool,
    /// The last OFF that could not be confirmed, until one is.
    pub not_off: Option<ExchangeError>,
}

/// The requests of an energy path.
#[derive(Clone)]
pub(super) struct Output {
    on: Option<Request>,
    pub off: Request,
    pub state: Request,
}

impl Member {
    pub(super) fn new(number: usize, setup: InstrumentSetup, factor: f64) -> Self {
        let manner = Arc::new(Manner::new(number, &setup.driver, &setup.identity, factor));
        let mut member = Self {
            setup,
            manner,
            errors: None,
            output: None,
            lease: None,
            granted: false,
            not_off: None,
        };
        let settings = &member.setup.driver.settings;
        let (on, off) = (settings.output_on.as_ref(), settings.output_off.as_ref());
        if let (Some(off), Some(state)) = (off, settings.output_state.as_ref()) {
            member.output = Some(Output {
                on: on.map(|on| member.plain(on, Expect::Nothing)),
                off: member.plain(off, Expect::Nothing).once(),
                state: member.plain(state, Expect::Switch).once(),
            });
        }
        let errors = member.setup.driver.errors.as_ref();
        member.errors = errors.map(|ask| member.plain(ask, Expect::ErrorEntry));
        member
    }

    pub(super) fn name(&self) -> &str {
        &self.setup.name
    }

    /// The start of the identity reply that is expected.
    pub(super) fn identity(&self) -> &str {
        &self.setup.identity
    }

    pub(super) fn tries(&self) -> u32 {
        self.setup.driver.framing.tries.max(1)
    }

    pub(super) fn off_tries(&self) -> u32 {
        self.tries().max(OFF_TRIES)
    }

    /// How long the instrument is given before it is asked again for what it should have done.
    pub(super) fn update_us(&self) -> u64 {
        self.setup.driver.update_interval.as_micros()
    }

    pub(super) fn output(&self) -> Result<&Output, Fault> {
        self.output.as_ref().ok_or_else(|| {
            Fault::Refused(format!(
                "driver {} has no output that can be switched off and read back",
                self.setup.driver.name
            ))
        })
    }

    fn plain(&self, text: &str, expect: Expect) -> Request {
        let mut bytes = text.as_bytes().to_vec();
        bytes.extend_from_slice(self.setup.driver.framing.sends.bytes());
        Request::new(&self.manner, bytes, expect)
    }

    /// The request of one of the driver's readings.
    pub(super) fn reading(&self, query: usize, channel: Option<u32>) -> Result<Request, Fault> {
        let driver = &self.setup.driver;
        let ReadingQuery { ask, gives } = driver.readings.get(query).ok_or_else(|| {
            Fault::Refused(format!("driver {} has no query {query}", driver.name))
        })?;
        let bytes = frame(ask, None, channel, driver.framing.sends)?;
        let expect = Expect::Readings(gives.clone().into());
        Ok(Request::new(&self.manner, bytes, expect))
    }

    pub(super) fn identify_steps(&self) -> VecDeque<Step> {
        let ask = self.plain(&self.setup.driver.identity.ask, Expect::Identity);
        [Step::Exchange(ask)].into()
    }

    pub(super) fn prepare_steps(&self) -> VecDeque<Step> {
        let commands = self.setup.driver.on_opening.iter();
        let commands = commands.map(|text| Step::Exchange(self.plain(text, Expect::Nothing)));
        commands.chain(self.error_step()).collect()
    }

    fn waveform_query(&self) -> Result<&WaveformQuery, Fault> {
        self.setup.driver.waveform.as_ref().ok_or_else(|| {
            let driver = &self.setup.driver.name;
            Fault::Refused(format!("driver {driver} fetches no waveform"))
        })
    }

    pub(super) fn arm_steps(&self) -> Result<VecDeque<Step>, Fault> {
        let commands = self.waveform_query()?.arm.iter();
        let commands = commands.map(|text| Step::Exchange(self.plain(text, Expect::Nothing)));
        Ok(commands.chain(self.error_step()).collect())
    }

    /// Whether it is ready, the interval, the block: the last two replies make a waveform.
    /// Each is tried once, so that a failure costs little of the readings' time.
    pub(super) fn waveform_steps(&self, at_most: Seconds) -> Result<VecDeque<Step>, Fault> {
        let query = self.waveform_query()?;
        let ready = query.ready.as_ref().map(|ask| Step::Confirm {
            ask: self.plain(ask, Expect::Switch).once(),
            wanted: Wanted::On,
            left: self.tries(),
        });
        let interval = match &query.interval {
            SampleInterval::Fixed(_) => None,
            SampleInterval::Asked(ask) => {
                Some(Step::Exchange(self.plain(ask, Expect::Number).once()))
            }
        };
        let form = Arc::new(BlockForm::of(query));
        let block = self.plain(&query.ask, Expect::Block(form));
        let block = Step::Exchange(block.within(query.reply_within, at_most).once());
        Ok(ready.into_iter().chain(interval).chain([block]).collect())
    }

    /// The waveform of a block, with the interval that was asked for, or the fixed one.
    pub(super) fn waveform(&self, pairs: Pairs, asked: Option<f64>) -> Result<Waveform, Fault> {
        let seconds = match (&self.waveform_query()?.interval, asked) {
            (SampleInterval::Fixed(span), _) => span.get(),
            (SampleInterval::Asked(_), asked) => asked.unwrap_or(f64::NAN),
        };
        // Whole nanoseconds: 0.0002 s is 200 us, not 199.99999999999997.
        let interval_us = libm::round(seconds * 1e9) / 1e3;
        Waveform::new(interval_us, pairs.volts, pairs.amps)
            .map_err(|error| Fault::Garbled(error.to_string()))
    }

    pub(super) fn change_steps(&self, change: Change) -> Result<VecDeque<Step>, Fault> {
        let settings = &self.setup.driver.settings;
        let (word, setting, value, exact) = match change {
            Change::Voltage(volts) => ("voltage", &settings.voltage, volts.get(), false),
            Change::Frequency(hertz) => ("frequency", &settings.frequency, hertz.get(), false),
            Change::Position(number) => ("position", &settings.position, f64::from(number), true),
        };
        let Some(Setting { set, confirm }) = setting else {
            let driver = &self.setup.driver.name;
            return Err(Fault::Refused(format!("driver {driver} sets no {word}")));
        };
        let bytes = frame(set, Some(value), None, self.setup.driver.framing.sends)?;
        let set = Step::Exchange(Request::new(&self.manner, bytes, Expect::Nothing));
        let confirm = confirm.as_ref().map(|ask| Step::Confirm {
            ask: self.plain(ask, Expect::Number),
            wanted: Wanted::Number { value, exact },
            left: self.tries(),
        });
        Ok([set]
            .into_iter()
            .chain(self.error_step())
            .chain(confirm)
            .collect())
    }

    pub(super) fn energise_steps(&self) -> Result<VecDeque<Step>, Fault> {
        let output = self.output()?;
        let Some(on) = output.on.clone() else {
            let driver = &self.setup.driver.name;
            return Err(Fault::Refused(format!(
                "driver {driver} switches nothing on"
            )));
        };
        let confirm = Step::Confirm {
            ask: output.state.clone(),
            wanted: Wanted::On,
            left: self.tries(),
        };
        Ok([Step::Exchange(on)]
            .into_iter()
            .chain(self.error_step())
            .chain([confirm])
            .collect())
    }

    fn error_step(&self) -> Option<Step> {
        self.errors.clone().map(|ask| Step::Errors {
            ask,
            left: QUEUE_LIMIT,
        })
    }
}

/// One step of an order.
pub(super) enum Step {
    /// A command, or a query whose reply is the order's.
    Exchange(Request),
    /// The error queue, until it is empty.
    Errors { ask: Request, left: u32 },
    /// Reading back, until it agrees.
    Confirm {
        ask: Request,
        wanted: Wanted,
        left: u32,
    },
}

impl Step {
    pub(super) fn request(&self) -> &Request {
        match self {
            Step::Exchange(ask) | Step::Errors { ask, .. } | Step::Confirm { ask, .. } => ask,
        }
    }
}

/// What reading back must find.
#[derive(Debug, Clone, Copy)]
pub(super) enum Wanted {
    Number { value: f64, exact: bool },
    On,
}

impl Wanted {
    /// The disagreement, where there is one.
    pub(super) fn check(self, reply: &Reply) -> Result<(), Fault> {
        let (agrees, wanted, found) = match (self, reply) {
            (Wanted::Number { value, exact }, Reply::Number(found)) => {
                let within = if exact { 0.0 } else { AGREES * value.abs() };
                let agrees = (found - value).abs() <= within || near(*found, value);
                (agrees, shortest(value), shortest(*found))
            }
            (Wanted::On, Reply::Switch(on)) => (*on, "on".to_owned(), on_or_off(*on).to_owned()),
            (_, other) => (false, format!("{self:?}"), format!("{other:?}")),
        };
        if agrees {
            return Ok(());
        }
        Err(Fault::NotConfirmed { wanted, found })
    }
}

pub(super) fn on_or_off(on: bool) -> &'static str {
    if on { "on" } else { "off" }
}

/// An order in progress or waiting; its first step is the one that is due.
pub(super) struct Order {
    pub instrument: usize,
    pub steps: VecDeque<Step>,
    /// The first entry that the error queue held.
    pub reported: Option<Fault>,
    /// The last number that was answered, for an order that needs two replies.
    pub number: Option<f64>,
    pub asker: OrderAsker,
}

/// Who waits for an order, by what is answered.
pub(super) enum OrderAsker {
    Identity(Asker<Identity>),
    Polled(oneshot::Sender<Polled>),
    Done(Asker<()>),
    Lease(Asker<Lease>),
    Waveform(Asker<Waveform>),
}

/// An energising that failed: answered when the output is off again.
pub(super) type Refused = (Asker<Lease>, ExchangeError);

/// Switching off.
pub(super) struct Off {
    pub instrument: usize,
    pub cause: String,
    /// OFF commands sent.
    pub sent: u32,
    /// When the first was.
    pub first_sent: Option<Moment>,
    /// Whether the state is being read back.
    pub reading_back: bool,
    pub askers: Vec<Asker<OffConfirmed>>,
    pub refused: Option<Refused>,
}

impl Off {
    pub(super) fn new(instrument: usize, cause: &str) -> Self {
        Self {
            instrument,
            cause: cause.to_owned(),
            sent: 0,
            first_sent: None,
            reading_back: false,
            askers: Vec::new(),
            refused: None,
        }
    }
}

/// A poll and where it stands on its schedule.
pub(super) struct Schedule {
    pub poll: Poll,
    pub request: Request,
    origin: Moment,
    every_us: u64,
    /// The next tick.
    pub due: Moment,
}

impl Schedule {
    pub(super) fn new(poll: Poll, request: Request, origin: Moment) -> Self {
        Self {
            poll,
            request,
            origin,
            every_us: poll.every.as_micros().max(SHORTEST_INTERVAL_US),
            due: origin,
        }
    }

    /// Takes the tick that is due at `now`; those missed since are skipped, so that
    /// they neither bunch nor shift the schedule.
    pub(super) fn take_tick(&mut self, now: Moment) {
        let passed = now.micros_since(self.origin) / self.every_us;
        self.due = self.origin.plus_micros((passed + 1) * self.every_us);
    }
}
