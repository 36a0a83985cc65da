//! Simulated instruments: what they see of the truth, how well, and how they say it.
//!
//! Each instrument looks once per update interval and shows that value until the
//! next. Its gain, offset and contact errors are drawn once for a bench and seed,
//! evenly within the accuracy that its driver states; its noise is a function of
//! seed, channel and update tick.

use super::Connection;
use super::dial::{Dial, NO_VALUE};
use super::dialect::{Ask, Dialect, Display, Knob};
use super::error_queue::{DeviceError, ErrorQueue};
use super::faults::{Fault, Onset};
use super::probe::{self, Probe};
use super::scope::{Scope, interval_s, write_block};
use super::unit::State;
use crate::quantity::{Reading, shortest};
use crate::spec::driver::{Coupling, Driver};
use crate::spec::sequence::RoleKind;

/// Voltages and frequencies that a simulated supply accepts.
const VOLTS: std::ops::RangeInclusive<f64> = 0.0..=300.0;
const HERTZ: std::ops::RangeInclusive<f64> = 40.0..=70.0;

/// What the bay's wiring is set to.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Wiring {
    /// Voltage that the supply is set to, V.
    pub volts: f64,
    /// Frequency that the supply is set to, Hz.
    pub hertz: f64,
    /// Whether its output is on.
    pub on: bool,
    /// Position of the unit's switch, from 1; 0 is off.
    pub position: usize,
    /// How many positions there are.
    pub positions: usize,
}

/// What a message does to the bay.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum Effect {
    /// Nothing.
    Nothing,
    /// A setting changes.
    Set(Knob, f64),
    /// The output goes on or off.
    Output(Toggle),
}

/// What becomes of the output.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Toggle {
    On,
    Off,
}

/// The truth at an update tick.
#[derive(Debug, Clone, Copy, PartialEq, Default)]
pub struct Look {
    /// Number of the tick.
    pub tick: u64,
    /// Seconds of the run.
    pub at: f64,
    /// The unit and its room.
    pub state: State,
    /// Voltage at the plug, V.
    pub volts: f64,
    /// Frequency, Hz; 0 while the output is off.
    pub hertz: f64,
    /// Energy drawn from the beginning on, Wh; only for an instrument that counts it.
    pub watt_hours: f64,
}

/// One simulated instrument.
#[derive(Debug, Clone)]
pub struct Instrument {
    /// Its name on the bench.
    pub name: String,
    /// Its line.
    pub line: String,
    /// The roles that it fills.
    pub roles: Vec<(String, RoleKind)>,
    /// Its driver, for framing and times.
    pub driver: Driver,
    /// Time between looks, microseconds.
    pub interval: u64,
    /// The latest look.
    pub look: Option<Look>,
    /// What it takes a waveform with.
    pub scope: Scope,
    identity: Vec<u8>,
    impostor: Vec<u8>,
    dialect: Dialect,
    errors: ErrorQueue,
    dials: Vec<Dial>,
    probes: Vec<Probe>,
    setting: Display,
    /// From when on its current input loses the DC part, seconds of the run.
    loses_dc_from: f64,
}

impl Instrument {
    /// The instrument of these connections, which share its name. `first` gives
    /// line, identity and driver.
    pub fn new(
        first: &Connection,
        all: &[&Connection],
        seed: u64,
        speed: f64,
        faults: &[Fault],
    ) -> Self {
        let driver = &first.driver;
        let dial =
            |reading: Reading, channel: Option<u32>| Dial::new(first, reading, channel, seed);
        let of_its_own = Reading::ALL.into_iter().filter(|r| !probe::reads(*r));
        let probes = all
            .iter()
            .filter(|c| c.kind == RoleKind::Temperature)
            .map(|c| Probe::new(c, seed, faults))
            .collect();
        Self {
            name: first.instrument.clone(),
            line: first.line.clone(),
            roles: all.iter().map(|c| (c.role.clone(), c.kind)).collect(),
            interval: driver.update_interval.as_micros().max(1000),
            look: None,
            scope: Scope::default(),
            loses_dc_from: match driver.coupling {
                Coupling::Ac => 0.0,
                Coupling::Dc => loses_dc_from(faults, all),
            },
            identity: identity_reply(&first.identity, driver.identity.fields, speed),
            impostor: identity_reply("RATEPLATE,VIRTUAL-STRANGER", driver.identity.fields, speed),
            dialect: Dialect::of(driver),
            errors: ErrorQueue::default(),
            dials: of_its_own.map(|reading| dial(reading, None)).collect(),
            probes,
            setting: Display::of(0.001),
            driver: driver.clone(),
        }
    }

    /// Whether its driver asks for an energy counter.
    pub fn counts_energy(&self) -> bool {
        let queries = &self.driver.readings;
        queries.iter().any(|q| q.gives.contains(&Reading::Energy))
    }

    /// Adds an error of the instrument's own.
    pub fn fail(&mut self, error: DeviceError) {
        self.errors.push(error);
    }

    /// What `message` asks for.
    pub fn understand<'a>(&self, message: &'a [u8]) -> Option<(Ask, Option<&'a [u8]>)> {
        self.dialect.understand(message)
    }

    /// Answers a message that was understood; the reply, if any, is appended to `out`.
    pub fn answer(
        &mut self,
        ask: Ask,
        hole: Option<&[u8]>,
        (wiring, now): (&Wiring, f64),
        out: &mut Vec<u8>,
    ) -> Effect {
        match ask {
            Ask::Identity => out.extend_from_slice(&self.identity),
            Ask::Clear => self.errors.clear(),
            Ask::Accept => {}
            Ask::NextError => self.errors.answer(out),
            Ask::Read(number) => self.read(number, hole, out),
            Ask::Set(knob) => return self.set(knob, hole, wiring),
            Ask::Confirm(Knob::Voltage) => self.setting.write(wiring.volts, out),
            Ask::Confirm(Knob::Frequency) => self.setting.write(wiring.hertz, out),
            Ask::Confirm(Knob::Position) => Display::of(1.0).write(wiring.position as f64, out),
            Ask::On => return Effect::Output(Toggle::On),
            Ask::Off => return Effect::Output(Toggle::Off),
            Ask::OutputState => out.push(if wiring.on { b'1' } else { b'0' }),
            Ask::Arm => self.scope.arm(),
            Ask::WaveformReady => {
                let ready = self.scope.is_ready(&self.driver, now);
                out.push(if ready { b'1' } else { b'0' });
            }
            Ask::WaveformInterval => {
                out.extend_from_slice(shortest(interval_s(&self.driver)).as_bytes());
            }
            Ask::Waveform => self.waveform(out),
        }
        Effect::Nothing
    }

    /// Answers the identity query as another instrument would.
    pub fn answer_as_stranger(&self, out: &mut Vec<u8>) {
        out.extend_from_slice(&self.impostor);
    }

    fn set(&mut self, knob: Knob, hole: Option<&[u8]>, wiring: &Wiring) -> Effect {
        let text = hole.and_then(|hole| std::str::from_utf8(hole).ok());
        let value = text.and_then(|text| text.trim().parse::<f64>().ok());
        let Some(value) = value.filter(|v| v.is_finite()) else {
            self.errors.push(DeviceError::DataType);
            return Effect::Nothing;
        };
        let accepted = match knob {
            Knob::Voltage => VOLTS.contains(&value),
            Knob::Frequency => HERTZ.contains(&value),
            Knob::Position => {
                (0.0..=wiring.positions as f64).contains(&value) && value.fract() == 0.0
            }
        };
        if accepted {
            Effect::Set(knob, value)
        } else {
            self.errors.push(DeviceError::OutOfRange);
            Effect::Nothing
        }
    }

    /// The block, or an error where none was taken.
    fn waveform(&mut self, out: &mut Vec<u8>) {
        let truth = self.scope.samples(&self.driver);
        let (Some(query), Some(mut truth)) = (&self.driver.waveform, truth) else {
            self.errors.push(DeviceError::Specific);
            out.extend_from_slice(NO_VALUE);
            return;
        };
        if self.scope.taken_at() >= self.loses_dc_from {
            truth.lose_dc();
        }
        let shown = |reading: Reading, truth: &[f64]| {
            let dial = self.dials.iter().find(|d| d.reading == reading);
            dial.map_or_else(|| truth.to_vec(), |dial| dial.block(truth))
        };
        let volts = shown(Reading::Voltage, &truth.volts);
        let amps = shown(Reading::Current, &truth.amps);
        write_block(query, &volts, &amps, out);
    }

    fn read(&mut self, number: usize, hole: Option<&[u8]>, out: &mut Vec<u8>) {
        let Some(shape) = self.dialect.reply(number) else {
            return;
        };
        let look = self.look.unwrap_or_default();
        let mut channel = None;
        if shape.channelled {
            channel = hole.and_then(whole_number);
            let known = channel.is_some_and(|c| (1..=self.driver.channels.max(1)).contains(&c));
            if !known {
                self.errors.push(DeviceError::OutOfRange);
                return;
            }
        }
        for (place, reading) in shape.gives.iter().enumerate() {
            if place > 0 {
                out.push(shape.separator);
            }
            if probe::reads(*reading) {
                let probe = self.probes.iter().find(|p| p.channel == channel);
                // An input without a sensor is open.
                match probe.and_then(|probe| probe.dial(*reading, &look)) {
                    Some((dial, truth)) => dial.write(truth, look.tick, out),
                    None => out.extend_from_slice(NO_VALUE),
                }
            } else if let Some(dial) = self.dials.iter().find(|d| d.reading == *reading) {
                let mut truth = seen(*reading, &look);
                if look.at >= self.loses_dc_from {
                    truth = without_dc(*reading, &look).or(truth);
                }
                dial.write(truth, look.tick, out);
            }
        }
    }
}

/// A channel's number.
fn whole_number(digits: &[u8]) -> Option<u32> {
    std::str::from_utf8(digits).ok()?.trim().parse().ok()
}

/// The true value of what is no sensor's; nothing where there is none.
fn seen(reading: Reading, look: &Look) -> Option<f64> {
    let apparent = look.volts * look.state.amps;
    match reading {
        Reading::Voltage => Some(look.volts),
        Reading::Current => Some(look.state.amps),
        Reading::Power => Some(look.state.watts),
        Reading::PowerFactor => (apparent > 0.0).then(|| look.state.watts / apparent),
        Reading::Frequency => Some(look.hertz),
        Reading::Energy => Some(look.watt_hours),
        Reading::TerminalTemperature => Some(probe::terminals(look)),
        Reading::Temperature | Reading::ThermocoupleVoltage | Reading::Resistance => None,
    }
}

/// What an AC-coupled current input makes of current and power factor; its power is
/// right under a sine voltage, and so is everything else.
fn without_dc(reading: Reading, look: &Look) -> Option<f64> {
    let State { amps, dc_amps, .. } = look.state;
    let amps = libm::sqrt((amps * amps - dc_amps * dc_amps).max(0.0));
    match reading {
        Reading::Current => Some(amps),
        Reading::PowerFactor => {
            let apparent = look.volts * amps;
            (apparent > 0.0).then(|| look.state.watts / apparent)
        }
        _ => None,
    }
}

/// From when on the instrument of these connections loses the DC part, seconds; never
/// is infinity.
fn loses_dc_from(faults: &[Fault], all: &[&Connection]) -> f64 {
    let from = faults.iter().filter_map(|fault| match fault {
        Fault::MeterLosesDc(onset) => Some(onset),
        _ => None,
    });
    let hits = |onset: &&Onset| {
        all.iter().any(|c| match &onset.role {
            Some(role) => c.role == *role,
            None => c.kind == RoleKind::PowerMeter,
        })
    };
    from.filter(hits)
        .map(|onset| onset.from.as_secs_f64())
        .fold(f64::INFINITY, f64::min)
}

/// The identity reply: what the bench file expects, completed to the driver's
/// number of comma fields, the last of which ends with the speed.
fn identity_reply(expected: &str, fields: usize, speed: f64) -> Vec<u8> {
    // Nothing that ends a line may stand in a reply.
    let mut reply: String = expected.chars().filter(|c| !c.is_control()).collect();
    let mut have = reply.split(',').count();
    while have + 1 < fields {
        reply.push_str(",0001");
        have += 1;
    }
    reply.push_str(if have < fields { ",0.1" } else { " 0.1" });
    if !reply.contains("VIRTUAL") {
        reply.push_str(" VIRTUAL");
    }
    reply.push_str(" x");
    reply.push_str(&shortest(speed));
    reply.into_bytes()
}

#[cfg(test)]
mod tests {
    use super::*;

    fn identity(expected: &str, fields: usize, speed: f64) -> String {
        String::from_utf8(identity_reply(expected, fields, speed)).unwrap()
    }

    #[test]
    fn the_identity_is_completed_and_says_virtual_and_its_speed() {
        let meter = identity("RATEPLATE,VIRTUAL-METER", 4, 1.0);
        assert_eq!(meter, "RATEPLATE,VIRTUAL-METER,0001,0.1 x1");
        assert_eq!(identity("A,B,C", 4, 20.0), "A,B,C,0.1 VIRTUAL x20");
        assert_eq!(identity("A,B,C,VIRTUAL", 4, 0.5), "A,B,C,VIRTUAL 0.1 x0.5");
        assert_eq!(identity("A\nB", 1, 1.0), "AB 0.1 VIRTUAL x1");
        assert_eq!(identity("", 4, 1.0), ",0001,0001,0.1 VIRTUAL x1");
    }
}
