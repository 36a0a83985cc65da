//! From what an instrument read to a temperature, and what an error of the one
//! does to the other.

use super::kind::Sensor;
use super::platinum::{pt100_resistance, pt100_slope, pt100_temperature};
use super::thermocouple::{seebeck, temperature_at, voltage};
use crate::quantity::{Celsius, Ohms, Reading, Readings, Volts};

/// Readings that are no temperature of the sensor's yet.
pub const RAW: [Reading; 3] = [
    Reading::ThermocoupleVoltage,
    Reading::TerminalTemperature,
    Reading::Resistance,
];

/// Whether a reading needs a sensor before it says a temperature.
pub fn is_raw(reading: Reading) -> bool {
    RAW.contains(&reading)
}

/// The temperature that the raw readings of a sensor say. `None` where one that is
/// needed is missing, or lies outside the sensor's range.
pub fn temperature_of(sensor: Sensor, raw: &Readings) -> Option<Celsius> {
    match sensor {
        Sensor::Thermocouple { couple, .. } => {
            let volts = Volts::new(raw.get(Reading::ThermocoupleVoltage)?)?;
            let terminals = Celsius::new(raw.get(Reading::TerminalTemperature)?)?;
            temperature_at(couple, volts, terminals)
        }
        Sensor::Pt100 { .. } => pt100_temperature(Ohms::new(raw.get(Reading::Resistance)?)?),
    }
}

/// The raw readings of a sensor at `at` whose terminals are at `terminals`. `None`
/// outside its range.
pub fn raw_of(sensor: Sensor, at: Celsius, terminals: Celsius) -> Option<Readings> {
    match sensor {
        Sensor::Thermocouple { couple, .. } => {
            let volts = voltage(couple, at)?.get() - voltage(couple, terminals)?.get();
            let mut raw = Readings::one(Reading::ThermocoupleVoltage, volts);
            raw.set(Reading::TerminalTemperature, terminals.get());
            Some(raw)
        }
        Sensor::Pt100 { .. } => Some(Readings::one(
            Reading::Resistance,
            pt100_resistance(at)?.get(),
        )),
    }
}

/// By how many kelvins a sensor at `at` moves per base unit of a raw reading: K/V,
/// K/ohm, and K/K for the temperature of the terminals, which are at `terminals`
/// (t = E^-1(V + E(tt)), so dt/dV = 1/E'(t) and dt/dtt = E'(tt)/E'(t)). 1 for a
/// temperature that the instrument itself converted. `None` outside the range, and
/// for readings that the sensor does not give.
pub fn sensitivity(
    sensor: Sensor,
    reading: Reading,
    at: Celsius,
    terminals: Celsius,
) -> Option<f64> {
    match (sensor, reading) {
        (_, Reading::Temperature) => Some(1.0),
        (Sensor::Thermocouple { couple, .. }, Reading::ThermocoupleVoltage) => {
            Some(1.0 / seebeck(couple, at)?)
        }
        (Sensor::Thermocouple { couple, .. }, Reading::TerminalTemperature) => {
            Some(seebeck(couple, terminals)? / seebeck(couple, at)?)
        }
        (Sensor::Pt100 { .. }, Reading::Resistance) => Some(1.0 / pt100_slope(at)?),
        _ => None,
    }
}
