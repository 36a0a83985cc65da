//! Simulated instruments: what they see of the truth, how well, and how they say it.
//!
//! Each instrument looks once per update interval and shows that value until the
//! next. Its gain, offset and contact errors are drawn once for a bench and seed, as
//! [`Errors`] says; its noise is a function of seed, channel and update tick.

use super::chance::Chance;
use super::dialect::{Ask, Dialect, Display, Knob};
use super::error_queue::{DeviceError, ErrorQueue};
use super::errors::{Errors, Flaw};
use super::faults::{Fault, Onset};
use super::unit::State;
use super::{Connection, Staging};
use crate::quantity::{Reading, shortest};
use crate::spec::driver::{Accuracy, Driver};
use crate::spec::sequence::RoleKind;

/// What SCPI-1999 sends for "infinity": the value is above the highest range.
const OVERLOAD: &[u8] = b"9.9E37";
/// What SCPI-1999 sends for "not a number".
const NO_VALUE: &[u8] = b"9.91E37";
/// Noise, as a share of the accuracy's half-width and of the resolution (house values).
const NOISE: (f64, f64) = (0.03, 0.3);
/// A sensor in the air beside the body still feels this share of its rise.
const FALLEN_SHARE: f64 = 0.05;
/// Time constant of a sensor that has just come off, s.
const FALLEN_LAG: f64 = 15.0;
/// A type K couple on an input set to type J (41 against 52 uV/K near room
/// temperature, from memory).
const WRONG_TYPE: f64 = 0.78;
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
    identity: Vec<u8>,
    impostor: Vec<u8>,
    dialect: Dialect,
    errors: ErrorQueue,
    dials: Vec<Dial>,
    probes: Vec<Probe>,
    setting: Display,
}

/// How one reading is shown.
#[derive(Debug, Clone)]
struct Dial {
    reading: Reading,
    accuracy: Option<Accuracy>,
    display: Display,
    flaw: Flaw,
    noise: Chance,
}

/// A temperature sensor on a channel.
#[derive(Debug, Clone)]
struct Probe {
    channel: Option<u32>,
    place: SensorPlace,
    dial: Dial,
    contact: f64,
    troubles: Vec<(Trouble, f64)>,
}

/// Where a sensor sits.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
enum SensorPlace {
    Block,
    Link,
    Enclosure,
    Room,
}

/// What is wrong with a sensor.
#[derive(Debug, Clone, Copy, PartialEq)]
enum Trouble {
    Fallen,
    Elsewhere(SensorPlace),
    Open,
    Reversed,
    WrongType,
}

impl Instrument {
    /// The instrument of these connections, which share its name. `first` gives
    /// line, identity and driver.
    pub fn new(
        first: &Connection,
        all: &[&Connection],
        staging: &Staging,
        errors: &Errors,
    ) -> Self {
        let (seed, speed) = (staging.seed, staging.speed);
        let driver = &first.driver;
        let dial = |reading: Reading, channel: Option<u32>| {
            Dial::new(first, reading, channel, seed, errors)
        };
        let electrical = Reading::ALL
            .into_iter()
            .filter(|r| *r != Reading::Temperature);
        let probes = all
            .iter()
            .filter(|c| c.kind == RoleKind::Temperature)
            .map(|c| Probe::new(c, dial(Reading::Temperature, c.channel), staging, errors))
            .collect();
        Self {
            name: first.instrument.clone(),
            line: first.line.clone(),
            roles: all.iter().map(|c| (c.role.clone(), c.kind)).collect(),
            interval: driver.update_interval.as_micros().max(1000),
            look: None,
            identity: identity_reply(&first.identity, driver.identity.fields, speed),
            impostor: identity_reply("RATEPLATE,VIRTUAL-STRANGER", driver.identity.fields, speed),
            dialect: Dialect::of(driver),
            errors: ErrorQueue::default(),
            dials: electrical.map(|reading| dial(reading, None)).collect(),
            probes,
            setting: Display::of(0.001),
            driver: driver.clone(),
        }
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
        wiring: &Wiring,
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
            if *reading == Reading::Temperature {
                match self.probes.iter().find(|p| p.channel == channel) {
                    Some(probe) => probe.write(&look, out),
                    // An input without a sensor is open.
                    None => out.extend_from_slice(NO_VALUE),
                }
            } else if let Some(dial) = self.dials.iter().find(|d| d.reading == *reading) {
                dial.write(electrical(*reading, &look), look.tick, out);
            }
        }
    }
}

/// A channel's number.
fn whole_number(digits: &[u8]) -> Option<u32> {
    std::str::from_utf8(digits).ok()?.trim().parse().ok()
}

/// The true value of an electrical reading; nothing where there is none.
fn electrical(reading: Reading, look: &Look) -> Option<f64> {
    let apparent = look.volts * look.state.amps;
    match reading {
        Reading::Voltage => Some(look.volts),
        Reading::Current => Some(look.state.amps),
        Reading::Power => Some(look.state.watts),
        Reading::PowerFactor => (apparent > 0.0).then(|| look.state.watts / apparent),
        Reading::Frequency => Some(look.hertz),
        Reading::Temperature => None,
    }
}

impl Dial {
    fn new(
        connection: &Connection,
        reading: Reading,
        channel: Option<u32>,
        seed: u64,
        errors: &Errors,
    ) -> Self {
        let accuracy = connection.driver.accuracy_of(reading).cloned();
        let name = format!(
            "{} {} {}",
            connection.instrument,
            reading.word(),
            channel.unwrap_or(0)
        );
        let chance = Chance::of(seed, &name);
        Self {
            reading,
            display: Display::of(accuracy.as_ref().map_or(0.0, |a| a.resolution)),
            accuracy,
            flaw: errors.flaw(chance, &connection.instrument, reading, channel),
            noise: Chance::of(seed, &format!("{name} noise")),
        }
    }

    fn write(&self, truth: Option<f64>, tick: u64, out: &mut Vec<u8>) {
        let Some(truth) = truth.filter(|t| t.is_finite()) else {
            out.extend_from_slice(NO_VALUE);
            return;
        };
        let shown = self.shown(truth, tick);
        let top = self.accuracy.as_ref().and_then(|a| a.ranges.last());
        if top.is_some_and(|top| shown.abs() > *top) {
            out.extend_from_slice(OVERLOAD);
        } else {
            self.display.write(shown, out);
        }
    }

    /// What is shown of a true value: within the stated accuracy, plus noise.
    fn shown(&self, truth: f64, tick: u64) -> f64 {
        let Some(accuracy) = &self.accuracy else {
            return truth;
        };
        let range = accuracy.range_for(truth).unwrap_or(0.0);
        let share = accuracy.of_reading * truth;
        let constant = accuracy.of_range * range + accuracy.floor;
        let noise = NOISE.0 * (share.abs() + constant) + NOISE.1 * accuracy.resolution;
        truth + self.flaw.of(truth, share, constant) + noise * self.noise.bell(tick)
    }
}

impl Probe {
    fn new(connection: &Connection, dial: Dial, staging: &Staging, errors: &Errors) -> Self {
        let name = format!("{} contact", connection.role);
        let place = SensorPlace::of(&connection.role);
        let contact = errors.contact(Chance::of(staging.seed, &name));
        let troubles = staging
            .faults
            .iter()
            .filter_map(|fault| trouble(fault, &connection.role, place))
            .collect();
        Self {
            channel: connection.channel,
            place,
            dial,
            contact: if place == SensorPlace::Room {
                0.0
            } else {
                contact
            },
            troubles,
        }
    }

    fn write(&self, look: &Look, out: &mut Vec<u8>) {
        let room = look.state.ambient;
        let mut rise = (self.place.truth(&look.state) - room) * (1.0 - self.contact);
        for (trouble, from) in &self.troubles {
            let since = look.at - from;
            if since < 0.0 {
                continue;
            }
            match trouble {
                Trouble::Fallen => {
                    let left = libm::exp(-since / FALLEN_LAG);
                    rise *= FALLEN_SHARE + (1.0 - FALLEN_SHARE) * left;
                }
                Trouble::Elsewhere(place) => rise = place.truth(&look.state) - room,
                Trouble::Open => {
                    out.extend_from_slice(NO_VALUE);
                    return;
                }
                Trouble::Reversed => rise = -rise,
                Trouble::WrongType => rise *= WRONG_TYPE,
            }
        }
        self.dial.write(Some(room + rise), look.tick, out);
    }
}

impl SensorPlace {
    /// Where the sensor of a role sits: other names than the known ones count as enclosure.
    fn of(role: &str) -> Self {
        match role {
            "body" => SensorPlace::Link,
            "ambient" => SensorPlace::Room,
            "block" => SensorPlace::Block,
            _ => SensorPlace::Enclosure,
        }
    }

    fn truth(self, state: &State) -> f64 {
        match self {
            SensorPlace::Block => state.block,
            SensorPlace::Link => state.link,
            SensorPlace::Enclosure => state.enclosure,
            SensorPlace::Room => state.ambient,
        }
    }
}

/// What a fault does to the sensor of `role`, and from when on in seconds.
fn trouble(fault: &Fault, role: &str, place: SensorPlace) -> Option<(Trouble, f64)> {
    let hits = |onset: &Onset| onset.role.as_deref().unwrap_or("body") == role;
    let trouble = match fault {
        Fault::SensorFallenOff(onset) if hits(onset) => Trouble::Fallen,
        Fault::SensorOpen(onset) if hits(onset) => Trouble::Open,
        Fault::SensorReversed(onset) if hits(onset) => Trouble::Reversed,
        Fault::SensorWrongType(onset) if hits(onset) => Trouble::WrongType,
        Fault::SwappedChannels(_) => match place {
            SensorPlace::Link => Trouble::Elsewhere(SensorPlace::Room),
            SensorPlace::Room => Trouble::Elsewhere(SensorPlace::Link),
            _ => return None,
        },
        _ => return None,
    };
    Some((trouble, fault.onset()?.from.as_secs_f64()))
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
