//! From a raw reply to a temperature, before it is recorded and before anything
//! decides on it.

use crate::plan::{Plan, PlannedRole};
use crate::quantity::{Reading, Readings};
use crate::record::Status;
use crate::sensor::{RAW, Sensor, temperature_of};

/// Converted temperatures are rounded to so many parts of a kelvin: a tenth of what
/// the inverses promise, and the same on every machine.
const PARTS: f64 = 1e4;

/// The sensors of a plan's roles, where raw replies are to be converted.
pub(super) fn raw_sensors(plan: &Plan) -> Vec<Option<Sensor>> {
    let of = |role: &PlannedRole| plan.raw_sensor(role);
    plan.bay.roles.iter().map(of).collect()
}

/// The raw readings with the temperature that they say. Where they lie outside the
/// sensor's range there is none: the raw readings stay, the row has no value.
pub(super) fn converted(sensor: Option<Sensor>, mut readings: Readings) -> (Status, Readings) {
    let raw = || RAW.iter().any(|kind| readings.get(*kind).is_some());
    let Some(sensor) = sensor.filter(|_| raw()) else {
        return (Status::Ok, readings);
    };
    match temperature_of(sensor, &readings) {
        Some(temperature) => {
            let rounded = (temperature.get() * PARTS).round() / PARTS;
            readings.set(Reading::Temperature, rounded);
            (Status::Ok, readings)
        }
        None => (Status::NoValue, readings),
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::sensor::{Couple, CoupleClass, PlatinumClass};

    const K: Sensor = Sensor::Thermocouple {
        couple: Couple::K,
        class: CoupleClass::One,
    };
    const PT: Sensor = Sensor::Pt100 {
        class: PlatinumClass::A,
    };

    fn couple(volts: f64, terminals: f64) -> Readings {
        let mut raw = Readings::one(Reading::ThermocoupleVoltage, volts);
        raw.set(Reading::TerminalTemperature, terminals);
        raw
    }

    #[test]
    fn a_temperature_stands_beside_its_raw_readings() {
        let (status, row) = converted(Some(K), couple(0.004_096, 25.0));
        assert_eq!(status, Status::Ok);
        // NIST SRD 60: 5.096 mV lies between 5.084 mV (124 °C) and 5.124 mV (125 °C).
        let t = row.get(Reading::Temperature).unwrap();
        assert!((t - 124.3).abs() < 0.05, "{t}");
        assert_eq!(t, (t * PARTS).round() / PARTS);
        assert_eq!(row.get(Reading::ThermocoupleVoltage), Some(0.004_096));
        assert_eq!(row.get(Reading::TerminalTemperature), Some(25.0));
        // 100 ohm is 0 °C by definition.
        let (_, row) = converted(Some(PT), Readings::one(Reading::Resistance, 100.0));
        assert_eq!(row.get(Reading::Temperature), Some(0.0));
    }

    #[test]
    fn what_no_sensor_can_say_is_no_temperature() {
        for (sensor, raw) in [
            // Above the function, below it, terminals that can't be, the other's reading.
            (K, couple(0.060, 25.0)),
            (K, couple(-0.009, 25.0)),
            (K, couple(0.004, 2000.0)),
            (K, Readings::one(Reading::ThermocoupleVoltage, 0.004)),
            (PT, Readings::one(Reading::Resistance, 0.1)),
            (PT, Readings::one(Reading::Resistance, 1e6)),
            (PT, couple(0.004, 25.0)),
        ] {
            let (status, row) = converted(Some(sensor), raw);
            assert_eq!(status, Status::NoValue, "{raw:?}");
            assert_eq!(row, raw);
        }
    }

    #[test]
    fn other_replies_pass_untouched() {
        let power = Readings::one(Reading::Power, 9.0);
        assert_eq!(converted(Some(K), power), (Status::Ok, power));
        let degrees = Readings::one(Reading::Temperature, 94.0);
        assert_eq!(converted(None, degrees), (Status::Ok, degrees));
    }
}
