//! A far side that answers like a small SCPI instrument, and misbehaves as told.

use std::collections::VecDeque;
use std::future::Future;
use std::sync::{Arc, Mutex, MutexGuard};

use tokio::sync::mpsc::{UnboundedReceiver, unbounded_channel};

use crate::bench::{
    Ears, FarSide, InstrumentSetup, LineHandle, LineSetup, Polled, Tap, Witness, simulated_line,
};
use crate::clock::Clock;
use crate::quantity::{Moment, Reading, Seconds};
use crate::spec::bench::Port;
use crate::spec::driver::{
    BlockFormat, Coupling, Driver, Framing, IdentityQuery, ReadingQuery, SampleInterval, Setting,
    Settings, Terminator, WaveformQuery,
};

/// A generic driver with everything.
pub fn driver() -> Driver {
    Driver {
        name: "example".into(),
        fills: Vec::new(),
        framing: Framing {
            sends: Terminator::Lf,
            replies: Terminator::Lf,
            reply_within: Seconds::of(0.5),
            gap: Seconds::ZERO,
            tries: 3,
        },
        identity: IdentityQuery {
            ask: "*IDN?".into(),
            fields: 4,
        },
        on_opening: vec!["*CLS".into()],
        readings: vec![
            ReadingQuery {
                ask: "MEAS:VOLT?;CURR?;POW?".into(),
                gives: vec![Reading::Voltage, Reading::Current, Reading::Power],
            },
            ReadingQuery {
                ask: "MEAS:TEMP? (@{channel})".into(),
                gives: vec![Reading::Temperature],
            },
        ],
        waveform: Some(WaveformQuery {
            arm: vec!["WAV:ARM".into()],
            ready: Some("WAV:READY?".into()),
            ask: "WAV:DATA?".into(),
            gives: vec![Reading::Voltage, Reading::Current],
            interval: SampleInterval::Asked("WAV:INT?".into()),
            points: 1500,
            format: BlockFormat::Float32Little,
            scale: None,
            reply_within: Seconds::of(5.0),
        }),
        settings: Settings {
            voltage: Some(Setting {
                set: "SOUR:VOLT {value}".into(),
                confirm: Some("SOUR:VOLT?".into()),
            }),
            frequency: None,
            position: Some(Setting {
                set: "ROUT:POS {value}".into(),
                confirm: None,
            }),
            output_on: Some("OUTP ON".into()),
            output_off: Some("OUTP OFF".into()),
            output_state: Some("OUTP?".into()),
        },
        errors: Some("SYST:ERR?".into()),
        accuracy: Vec::new(),
        update_interval: Seconds::of(0.1),
        channels: 8,
        temperature_effect: None,
        isolation: None,
        coupling: Coupling::Dc,
    }
}

/// One such instrument on a virtual line.
pub fn setup() -> LineSetup {
    LineSetup {
        name: "L1".into(),
        port: Port::Virtual,
        instruments: vec![InstrumentSetup {
            name: "example".into(),
            identity: "EXAMPLE,BENCH1".into(),
            driver: driver(),
        }],
    }
}

/// What becomes of the reply to a measuring query.
#[derive(Debug, Clone)]
pub enum Manners {
    Good,
    Late(f64),
    Never,
    Twice,
    Echo,
    Text(&'static str),
    Flood(usize),
}

/// The far side's state, open to tests.
#[derive(Debug, Default)]
pub struct Script {
    /// Lines received, with their moments.
    pub heard: Vec<(Moment, String)>,
    /// For the next measuring queries; then `Good`.
    pub manners: VecDeque<Manners>,
    /// Answers nothing at all, and does nothing.
    pub deaf: bool,
    /// Does what it is told and answers nothing.
    pub mute: bool,
    /// Refuses to switch off.
    pub stuck: bool,
    /// Refuses to switch on.
    pub dead: bool,
    pub on: bool,
    pub errors: VecDeque<&'static str>,
    pub volts: f64,
    /// The supply rounds to this.
    pub step: f64,
    pub latency_us: u64,
    /// Pieces of the next reply to the waveform's query, each so many seconds later.
    pub pieces: Vec<(f64, Vec<u8>)>,
    /// Replies to the next questions whether the waveform is ready; then `1`.
    pub ready: VecDeque<&'static str>,
    /// Reply to the interval's query; `2.0E-4` where it is empty.
    pub interval: &'static str,
    /// Counts the readings.
    pub count: u64,
    partial: Vec<u8>,
    out: VecDeque<(Moment, Vec<u8>)>,
}

impl Script {
    fn line(&mut self, line: &str, now: Moment) {
        self.heard.push((now, line.to_owned()));
        if self.deaf {
            return;
        }
        match line {
            "OUTP ON" => self.on = !self.dead,
            "OUTP OFF" => self.on &= self.stuck,
            _ => {}
        }
        if let Some(value) = line.strip_prefix("SOUR:VOLT ") {
            let step = if self.step > 0.0 { self.step } else { 1e-9 };
            self.volts = (value.parse::<f64>().unwrap() / step).round() * step;
        }
        if self.mute {
            return;
        }
        let at = now.plus_micros(self.latency_us);
        match line {
            "*IDN?" => self.say(at, "EXAMPLE,BENCH1,0001,1.0"),
            "OUTP?" => self.say(at, if self.on { "1" } else { "0" }),
            "SOUR:VOLT?" => self.say(at, &format!("{}", self.volts)),
            "SYST:ERR?" => {
                let entry = self.errors.pop_front().unwrap_or("+0,\"No error\"");
                self.say(at, entry);
            }
            "WAV:READY?" => {
                let ready = self.ready.pop_front().unwrap_or("1");
                self.say(at, ready);
            }
            "WAV:INT?" => {
                let interval = match self.interval {
                    "" => "2.0E-4",
                    other => other,
                };
                self.say(at, interval);
            }
            "WAV:DATA?" => {
                for (late, bytes) in std::mem::take(&mut self.pieces) {
                    self.out.push_back((at + Seconds::of(late), bytes));
                }
            }
            _ if line.starts_with("MEAS:TEMP?") => self.say(at, "23.5"),
            _ if line.starts_with("MEAS:") => self.measure(line, at),
            _ => {}
        }
    }

    /// Replies `230.125;9.5625;n` where n counts the queries.
    fn measure(&mut self, line: &str, at: Moment) {
        self.count += 1;
        let good = format!("230.125;9.5625;{}", self.count);
        match self.manners.pop_front().unwrap_or(Manners::Good) {
            Manners::Good => self.say(at, &good),
            Manners::Late(s) => self.say(at + Seconds::of(s), &good),
            Manners::Never => {}
            Manners::Twice => {
                self.say(at, &good);
                self.say(at, &good);
            }
            Manners::Echo => {
                self.say(at, line);
                self.say(at, &good);
            }
            Manners::Text(text) => self.out.push_back((at, text.as_bytes().to_vec())),
            Manners::Flood(n) => self.out.push_back((at, vec![b'7'; n])),
        }
    }

    fn say(&mut self, at: Moment, line: &str) {
        self.out.push_back((at, format!("{line}\n").into_bytes()));
    }

    /// Speaks without being asked.
    pub fn say_now(&mut self, line: &str) {
        self.say(Moment::START, line);
    }

    pub fn receive(&mut self, bytes: &[u8], now: Moment) {
        self.partial.extend_from_slice(bytes);
        while let Some(end) = self.partial.iter().position(|b| *b == b'\n') {
            let line: Vec<u8> = self.partial.drain(..=end).collect();
            let line = String::from_utf8_lossy(&line[..end]).into_owned();
            self.line(&line, now);
        }
    }

    pub fn deliver(&mut self, now: Moment, out: &mut Vec<u8>) {
        // An instrument answers in the order in which it was asked.
        while self.out.front().is_some_and(|(at, _)| *at <= now) {
            out.extend(self.out.pop_front().unwrap().1);
        }
    }

    /// How often a line was heard.
    pub fn times(&self, line: &str) -> usize {
        self.heard.iter().filter(|(_, l)| l == line).count()
    }
}

/// A handle on the script: one for the line, one for the test.
#[derive(Clone, Default)]
pub struct Scripted(Arc<Mutex<Script>>);

impl Scripted {
    pub fn lock(&self) -> MutexGuard<'_, Script> {
        self.0.lock().unwrap()
    }

    pub fn with(self, manners: &[Manners]) -> Self {
        self.lock().manners = manners.iter().cloned().collect();
        self
    }
}

impl FarSide for Scripted {
    fn receive(&mut self, bytes: &[u8], now: Moment) {
        self.lock().receive(bytes, now);
    }
    fn deliver(&mut self, now: Moment, out: &mut Vec<u8>) {
        self.lock().deliver(now, out);
    }
    fn due(&self) -> Option<Moment> {
        self.lock().out.front().map(|(at, _)| *at)
    }
}

/// What the witness was told: moment, cause, confirmed.
pub type Offs = Arc<Mutex<Vec<(Moment, String, bool)>>>;

#[derive(Clone, Default)]
pub struct Listening {
    pub offs: Offs,
    pub wire: Arc<Mutex<Vec<u8>>>,
}

impl Tap for Listening {
    fn sent(&mut self, _: &str, _: Moment, bytes: &[u8]) {
        self.wire.lock().unwrap().extend_from_slice(bytes);
    }
    fn received(&mut self, _: &str, _: Moment, bytes: &[u8]) {
        self.wire.lock().unwrap().extend_from_slice(bytes);
    }
}

impl Witness for Listening {
    fn off(&mut self, at: Moment, _: &str, cause: &str, confirmed: bool) {
        self.offs
            .lock()
            .unwrap()
            .push((at, cause.into(), confirmed));
    }
}

/// A line under test.
pub struct Bench {
    pub line: LineHandle,
    pub far: Scripted,
    pub ears: Listening,
    pub samples: UnboundedReceiver<Polled>,
    pub clock: Clock,
}

impl Listening {
    pub fn ears(&self) -> (Ears, UnboundedReceiver<Polled>) {
        let (sender, samples) = unbounded_channel();
        let ears = Ears {
            tap: Box::new(self.clone()),
            witness: Box::new(self.clone()),
            samples: sender,
        };
        (ears, samples)
    }
}

/// Runs a test against a simulated line, on the paused clock.
pub fn on_a_line<F, T>(far: Scripted, test: F)
where
    F: FnOnce(Bench) -> T,
    T: Future<Output = ()>,
{
    paused().block_on(async {
        let clock = Clock::simulated();
        let ears = Listening::default();
        let (heard, samples) = ears.ears();
        let line = simulated_line(setup(), Box::new(far.clone()), clock.clone(), heard);
        test(Bench {
            line,
            far,
            ears,
            samples,
            clock,
        })
        .await;
    });
}

pub fn paused() -> tokio::runtime::Runtime {
    tokio::runtime::Builder::new_current_thread()
        .enable_time()
        .start_paused(true)
        .build()
        .unwrap()
}
