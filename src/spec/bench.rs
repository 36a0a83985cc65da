//! The bench file: lines, the instruments on them, and the bays they serve.

use serde::{Deserialize, Serialize};

use super::Located;
use crate::quantity::{Amps, Ohms, Ratio, Reading};
use crate::sensor::Sensor;

/// A whole bench file.
#[derive(Debug, Clone, PartialEq)]
pub struct Bench {
    /// `bench:` its name.
    pub name: Located<String>,
    /// `lines:`
    pub lines: Vec<Line>,
    /// `instruments:`
    pub instruments: Vec<Instrument>,
    /// `bays:`
    pub bays: Vec<Bay>,
}

/// A port that one or more instruments share.
#[derive(Debug, Clone, PartialEq)]
pub struct Line {
    /// Its name in this file.
    pub name: Located<String>,
    /// What is behind it.
    pub port: Port,
}

/// What is behind a line.
#[derive(Debug, Clone, PartialEq, Eq, Serialize, Deserialize)]
pub enum Port {
    /// `port: virtual` the simulated far side, in memory.
    Virtual,
    /// `port: /dev/ttyUSB0` with settings.
    Serial(SerialSettings),
}

/// Settings of a serial port.
#[derive(Debug, Clone, PartialEq, Eq, Serialize, Deserialize)]
pub struct SerialSettings {
    /// `port:` device path or COM name.
    pub path: String,
    /// `baud:` (default 9600); 0 leaves the speed alone (pseudo-terminals).
    pub baud: u32,
    /// `data bits:` 7 or 8 (default 8).
    pub data_bits: u8,
    /// `parity:` (default none).
    pub parity: Parity,
    /// `stop bits:` 1 or 2 (default 1).
    pub stop_bits: u8,
}

/// Parity of a serial character.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize, Deserialize)]
#[serde(rename_all = "lowercase")]
#[expect(missing_docs, reason = "the names are the trade's")]
pub enum Parity {
    None,
    Odd,
    Even,
}

/// One device on a line.
#[derive(Debug, Clone, PartialEq)]
pub struct Instrument {
    /// Its name in this file.
    pub name: Located<String>,
    /// `line:`
    pub line: Located<String>,
    /// `driver:`
    pub driver: Located<String>,
    /// `identity:` the start of its identity reply, which proves that it is this one.
    pub identity: Located<String>,
    /// `certificate:` of its calibration.
    pub certificate: Option<String>,
    /// `due:` the calibration's due date, `YYYY-MM-DD`.
    pub due: Option<chrono::NaiveDate>,
    /// `calibration:`
    pub calibration: Vec<CalibrationPoint>,
}

/// One line of a calibration certificate.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct CalibrationPoint {
    /// `reading:` of what.
    pub reading: Reading,
    /// `channel:` where it is for one channel only.
    pub channel: Option<u32>,
    /// `at:` the indicated value, base unit.
    pub at: f64,
    /// `correction:` to be added to the indicated value, base unit.
    pub correction: f64,
    /// `U:` expanded uncertainty, base unit.
    pub expanded: f64,
    /// `k:` its coverage factor.
    pub coverage: f64,
}

/// One fixture that holds one unit.
#[derive(Debug, Clone, PartialEq)]
pub struct Bay {
    /// Its name.
    pub name: Located<String>,
    /// `rated current:` of its wiring and socket; the current trip.
    pub rated_current: Amps,
    /// `source:` what feeds the bay, as far as it is known.
    pub source: Source,
    /// `roles:`
    pub roles: Vec<RoleFilled>,
}

/// What feeds a bay.
#[derive(Debug, Clone, Copy, PartialEq, Default, Serialize, Deserialize)]
pub struct Source {
    /// `impedance:` at the unit's plug; a source that regulates there has none.
    pub impedance: Option<Ohms>,
    /// `current limit:` above which it gives no more, RMS.
    pub current_limit: Option<Amps>,
}

/// Which instrument fills a role in a bay.
#[derive(Debug, Clone, PartialEq)]
pub struct RoleFilled {
    /// The role's name, as sequences call it.
    pub role: Located<String>,
    /// `instrument:`
    pub instrument: Located<String>,
    /// `channel:`
    pub channel: Option<Located<u32>>,
    /// How it is connected, as far as it changes what is read.
    pub connection: Connection,
    /// `sensor:` what hangs on the channel; needed where the driver delivers raw values.
    pub sensor: Option<Located<Sensor>>,
}

/// How a role's instrument is connected to the unit.
#[derive(Debug, Clone, PartialEq, Default, Serialize, Deserialize)]
pub struct Connection {
    /// `attachment:` how a sensor is held, in words.
    #[serde(default)]
    pub attachment: Option<String>,
    /// `contact error:` by which share of the rise over ambient a surface sensor reads
    /// too low at the most.
    #[serde(default)]
    pub contact_error: Option<Ratio>,
    /// `lead resistance:` of both conductors between a power meter and the unit's plug.
    #[serde(default)]
    pub lead_resistance: Option<Ohms>,
}
