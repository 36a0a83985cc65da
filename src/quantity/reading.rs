//! What an instrument can be read for, and a row of such readings.

use serde::{Deserialize, Serialize};

use super::Dimension;

/// One kind of value that an instrument delivers.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord, Hash, Serialize, Deserialize)]
#[serde(rename_all = "snake_case")]
#[expect(missing_docs, reason = "the names are the quantities themselves")]
pub enum Reading {
    Voltage,
    Current,
    Power,
    PowerFactor,
    Frequency,
    Temperature,
    Energy,
    /// Of a thermocouple, as read at its terminals.
    ThermocoupleVoltage,
    /// Of the terminals that a thermocouple is connected to.
    TerminalTemperature,
    /// Of a resistance thermometer.
    Resistance,
}

impl Reading {
    /// Every kind, in the order of the record's columns.
    pub const ALL: [Reading; 10] = [
        Reading::Voltage,
        Reading::Current,
        Reading::Power,
        Reading::PowerFactor,
        Reading::Frequency,
        Reading::Temperature,
        Reading::Energy,
        Reading::ThermocoupleVoltage,
        Reading::TerminalTemperature,
        Reading::Resistance,
    ];

    /// The column of a machine file, with its unit.
    pub fn column(self) -> &'static str {
        match self {
            Reading::Voltage => "voltage_v",
            Reading::Current => "current_a",
            Reading::Power => "power_w",
            Reading::PowerFactor => "power_factor",
            Reading::Frequency => "frequency_hz",
            Reading::Temperature => "temperature_degc",
            Reading::Energy => "energy_wh",
            Reading::ThermocoupleVoltage => "thermocouple_voltage_v",
            Reading::TerminalTemperature => "terminal_temperature_degc",
            Reading::Resistance => "resistance_ohm",
        }
    }

    /// The word in YAML files and messages.
    pub fn word(self) -> &'static str {
        match self {
            Reading::Voltage => "voltage",
            Reading::Current => "current",
            Reading::Power => "power",
            Reading::PowerFactor => "power factor",
            Reading::Frequency => "frequency",
            Reading::Temperature => "temperature",
            Reading::Energy => "energy",
            Reading::ThermocoupleVoltage => "thermocouple voltage",
            Reading::TerminalTemperature => "terminal temperature",
            Reading::Resistance => "resistance",
        }
    }

    /// The unit for people; empty for a plain number.
    pub fn unit(self) -> &'static str {
        match self {
            Reading::Voltage => "V",
            Reading::Current => "A",
            Reading::Power => "W",
            Reading::PowerFactor => "",
            Reading::Frequency => "Hz",
            Reading::Temperature | Reading::TerminalTemperature => "°C",
            Reading::Energy => "Wh",
            Reading::ThermocoupleVoltage => "V",
            Reading::Resistance => "ohm",
        }
    }

    /// What its values measure.
    pub fn dimension(self) -> Dimension {
        match self {
            Reading::Voltage => Dimension::Voltage,
            Reading::Current => Dimension::Current,
            Reading::Power => Dimension::Power,
            Reading::PowerFactor => Dimension::Ratio,
            Reading::Frequency => Dimension::Frequency,
            Reading::Temperature | Reading::TerminalTemperature => Dimension::Temperature,
            Reading::Energy => Dimension::Energy,
            Reading::ThermocoupleVoltage => Dimension::Voltage,
            Reading::Resistance => Dimension::Resistance,
        }
    }

    fn slot(self) -> usize {
        self as usize
    }
}

/// The values of one exchange, in base units; absent is absent, never 0.
#[derive(Debug, Clone, Copy, PartialEq, Default)]
pub struct Readings([Option<f64>; 10]);

impl Readings {
    /// No value at all.
    pub const NONE: Readings = Readings([None; 10]);

    /// A single value; a non-finite one is absent.
    pub fn one(reading: Reading, value: f64) -> Self {
        let mut all = Self::NONE;
        all.set(reading, value);
        all
    }

    /// Puts a value in; a non-finite one is absent.
    pub fn set(&mut self, reading: Reading, value: f64) {
        self.0[reading.slot()] = value.is_finite().then_some(value);
    }

    /// The value of one kind, in its base unit.
    pub fn get(&self, reading: Reading) -> Option<f64> {
        self.0[reading.slot()]
    }

    /// Kinds and values that are there.
    pub fn iter(&self) -> impl Iterator<Item = (Reading, f64)> + '_ {
        Reading::ALL
            .into_iter()
            .filter_map(|kind| Some((kind, self.get(kind)?)))
    }

    /// Whether nothing is there.
    pub fn is_empty(&self) -> bool {
        self.iter().next().is_none()
    }
}
