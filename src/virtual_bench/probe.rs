//! Temperature sensors: where each sits, what is wrong with it, and what it gives the
//! instrument, as a temperature or raw.

use super::Connection;
use super::chance::Chance;
use super::dial::Dial;
use super::faults::{Fault, Onset};
use super::instruments::Look;
use super::unit::State;
use crate::quantity::{Celsius, Reading};
use crate::sensor::{Couple, Sensor, class_range, raw_of, tolerance};

/// A surface sensor reads up to this share of its rise too low (house value).
const CONTACT: f64 = 0.01;
/// A sensor in the air beside the body still feels this share of its rise.
const FALLEN_SHARE: f64 = 0.05;
/// Time constant of a sensor that has just come off, s.
const FALLEN_LAG: f64 = 15.0;
/// A type K couple on an input set to type J (41 against 52 uV/K near room
/// temperature, from memory).
const WRONG_TYPE: f64 = 0.78;
/// A scanner's terminals end up so many kelvins above the room, with this time
/// constant in s: its own warmth (house values).
const TERMINALS: (f64, f64) = (2.0, 1800.0);
/// A Pt1000 where a Pt100 should be.
const WRONG_PLATINUM: f64 = 10.0;

/// A temperature sensor on a channel.
#[derive(Debug, Clone)]
pub struct Probe {
    /// The channel that it hangs on.
    pub channel: Option<u32>,
    place: SensorPlace,
    sensor: Option<Sensor>,
    /// Where within its class's tolerance this one lies, from -1 to 1.
    deviation: f64,
    dials: Vec<Dial>,
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

/// What a sensor feels, and what becomes of it on the way to the instrument.
struct Felt {
    room: f64,
    rise: f64,
    reversed: bool,
    wrong_type: bool,
}

/// Whether a reading is taken from a sensor on a channel.
pub fn reads(reading: Reading) -> bool {
    matches!(
        reading,
        Reading::Temperature | Reading::ThermocoupleVoltage | Reading::Resistance
    )
}

/// The true temperature of an instrument's terminals, °C: the room's at first, then
/// slowly warmer.
pub fn terminals(look: &Look) -> f64 {
    let (above, lag) = TERMINALS;
    look.state.ambient + above * (1.0 - libm::exp(-look.at / lag))
}

impl Probe {
    /// The sensor of a role, with what is wrong with it.
    pub fn new(connection: &Connection, seed: u64, faults: &[Fault]) -> Self {
        let role = &connection.role;
        let place = SensorPlace::of(role);
        let contact = Chance::of(seed, &format!("{role} contact"));
        let dials = Reading::ALL.into_iter().filter(|r| reads(*r));
        Self {
            channel: connection.channel,
            place,
            sensor: connection.sensor,
            deviation: Chance::of(seed, &format!("{role} sensor")).even(0),
            dials: dials
                .map(|reading| Dial::new(connection, reading, connection.channel, seed))
                .collect(),
            contact: match place {
                SensorPlace::Room => 0.0,
                _ => 0.5 * CONTACT * (1.0 + contact.even(0)),
            },
            troubles: faults
                .iter()
                .filter_map(|fault| trouble(fault, role, place))
                .collect(),
        }
    }

    /// How a reading of it is shown, with its true value; the value is absent where
    /// the sensor is open, or is none that gives such a reading.
    pub fn dial(&self, reading: Reading, look: &Look) -> Option<(&Dial, Option<f64>)> {
        let dial = self.dials.iter().find(|d| d.reading == reading)?;
        let felt = self.felt(look);
        let value = felt.and_then(|felt| match reading {
            Reading::Temperature => Some(self.degrees(&felt)),
            _ => self.raw(reading, &felt, terminals(look)),
        });
        Some((dial, value))
    }

    /// What it feels; nothing where it is open.
    fn felt(&self, look: &Look) -> Option<Felt> {
        let room = look.state.ambient;
        let mut felt = Felt {
            room,
            rise: (self.place.truth(&look.state) - room) * (1.0 - self.contact),
            reversed: false,
            wrong_type: false,
        };
        for (trouble, from) in &self.troubles {
            let since = look.at - from;
            if since < 0.0 {
                continue;
            }
            match trouble {
                Trouble::Fallen => {
                    let left = libm::exp(-since / FALLEN_LAG);
                    felt.rise *= FALLEN_SHARE + (1.0 - FALLEN_SHARE) * left;
                }
                Trouble::Elsewhere(place) => felt.rise = place.truth(&look.state) - room,
                Trouble::Open => return None,
                Trouble::Reversed => felt.reversed = true,
                Trouble::WrongType => felt.wrong_type = true,
            }
        }
        Some(felt)
    }

    /// What an instrument that converts by itself takes the temperature for.
    fn degrees(&self, felt: &Felt) -> f64 {
        let mut rise = felt.rise;
        if felt.reversed {
            rise = -rise;
        }
        if felt.wrong_type {
            rise *= WRONG_TYPE;
        }
        let at = felt.room + rise;
        at + self.off_by(at)
    }

    /// Volts or ohms as they reach the terminals.
    fn raw(&self, reading: Reading, felt: &Felt, terminals: f64) -> Option<f64> {
        let sensor = self.sensor?;
        let at = felt.room + felt.rise;
        let at = Celsius::new(at + self.off_by(at))?;
        let actual = if felt.wrong_type {
            mistaken(sensor)
        } else {
            sensor
        };
        let value = raw_of(actual, at, Celsius::new(terminals)?)?.get(reading)?;
        Some(match reading {
            Reading::ThermocoupleVoltage if felt.reversed => -value,
            Reading::Resistance if felt.wrong_type => value * WRONG_PLATINUM,
            // A resistance has no sign: its leads can be taken either way round.
            _ => value,
        })
    }

    /// How far this one is off its reference function, K; beyond its class's range as
    /// far as at the range's end.
    fn off_by(&self, at: f64) -> f64 {
        let wide = self.sensor.and_then(|sensor| {
            let (from, to) = class_range(sensor);
            tolerance(sensor, Celsius::new(at.clamp(from.get(), to.get()))?)
        });
        wide.map_or(0.0, |wide| self.deviation * wide.get())
    }
}

/// What hangs there by mistake. Another platinum thermometer is told by its resistance.
fn mistaken(sensor: Sensor) -> Sensor {
    match sensor {
        Sensor::Thermocouple { couple, class } => Sensor::Thermocouple {
            couple: match couple {
                Couple::K => Couple::J,
                Couple::J | Couple::T => Couple::K,
            },
            class,
        },
        Sensor::Pt100 { .. } => sensor,
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
