//! A driver: the dialect of one family of instruments, and how accurate it is.
//!
//! Plain values without places: a driver is checked within its own file, and the
//! plan stores it whole, so that a record can be judged without today's files.

use serde::{Deserialize, Serialize};

use super::sequence::RoleKind;
use crate::quantity::{Celsius, Kelvins, Reading, Seconds, Volts};
use crate::sensor::Sensor;

/// A whole driver file.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct Driver {
    /// `driver:` its name, as bench files call it.
    pub name: String,
    /// `fills:` kinds of role that it can fill.
    pub fills: Vec<RoleKind>,
    /// `framing:`
    pub framing: Framing,
    /// `identity:`
    pub identity: IdentityQuery,
    /// `on opening:` commands sent once after identification.
    pub on_opening: Vec<String>,
    /// `readings:`
    pub readings: Vec<ReadingQuery>,
    /// `waveform:` how a block of voltage and current is taken and fetched.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub waveform: Option<WaveformQuery>,
    /// `settings:` commands with `{value}`.
    pub settings: Settings,
    /// `errors:` the error queue's query.
    pub errors: Option<String>,
    /// `accuracy:`
    pub accuracy: Vec<Accuracy>,
    /// `update interval:` how often a new value is there.
    pub update_interval: Seconds,
    /// `channels:` highest channel number; 0 where the instrument has none.
    pub channels: u32,
    /// `temperature effect:` beyond the room that the accuracy is stated for.
    #[serde(default)]
    pub temperature_effect: Option<TemperatureEffect>,
    /// `isolation:` of sensor inputs to earth and to each other; unknown counts as 0 V.
    pub isolation: Option<Volts>,
    /// `coupling: ac` where it loses the DC part of a current (default: `dc`).
    #[serde(default, skip_serializing_if = "Coupling::is_dc")]
    pub coupling: Coupling,
}

/// Whether an instrument sees the DC part of a current.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default, Serialize, Deserialize)]
#[serde(rename_all = "lowercase")]
pub enum Coupling {
    /// It does.
    #[default]
    Dc,
    /// It does not.
    Ac,
}

impl Coupling {
    /// Whether the DC part is seen.
    pub fn is_dc(&self) -> bool {
        *self == Coupling::Dc
    }
}

/// A single acquisition of voltage and current, and the block that it is fetched as.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct WaveformQuery {
    /// `arm:` commands sent before the unit is energised; the first current triggers.
    pub arm: Vec<String>,
    /// `ready:` query answered 1 once the block is complete.
    pub ready: Option<String>,
    /// `ask:` query answered by the block.
    pub ask: String,
    /// `gives:` voltage and current, in the order in which each pair of the block has them.
    pub gives: Vec<Reading>,
    /// `interval:` from sample to sample.
    pub interval: SampleInterval,
    /// `points:` most pairs in a block.
    pub points: u32,
    /// `format:` of its numbers.
    pub format: BlockFormat,
    /// `scale:` of whole numbers, volts and amperes to a count; absent for other formats.
    pub scale: Option<(f64, f64)>,
    /// `reply within:` for the whole block.
    pub reply_within: Seconds,
}

/// The time from sample to sample.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
#[serde(rename_all = "snake_case")]
pub enum SampleInterval {
    /// Always the same.
    Fixed(Seconds),
    /// Asked for, and answered in seconds.
    Asked(String),
}

/// How a block holds its numbers: IEEE 754 and two's complement, or text.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize, Deserialize)]
#[expect(missing_docs, reason = "the names say it")]
pub enum BlockFormat {
    Float32Little,
    Float32Big,
    Float64Little,
    Float64Big,
    Int16Little,
    Int16Big,
    /// Decimal numbers with commas between them, as one line or in a block.
    Text,
}

impl BlockFormat {
    /// Bytes of one number; of text, about.
    pub fn width(self) -> usize {
        match self {
            BlockFormat::Float32Little | BlockFormat::Float32Big => 4,
            BlockFormat::Float64Little | BlockFormat::Float64Big => 8,
            BlockFormat::Int16Little | BlockFormat::Int16Big => 2,
            BlockFormat::Text => 12,
        }
    }

    /// Whether its numbers are counts that need a scale.
    pub fn is_whole(self) -> bool {
        matches!(self, BlockFormat::Int16Little | BlockFormat::Int16Big)
    }
}

impl WaveformQuery {
    /// About how many bytes the longest block has.
    pub fn bytes(&self) -> u64 {
        u64::from(self.points) * (self.gives.len() * self.format.width()) as u64
    }
}

/// How messages are set apart on the wire.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct Framing {
    /// `sends:` terminator of what is sent (`LF`, `CRLF`, `CR`).
    pub sends: Terminator,
    /// `replies end with:`; one trailing CR is stripped in any case.
    pub replies: Terminator,
    /// `reply within:`
    pub reply_within: Seconds,
    /// `gap:` least time between a reply and the next message.
    pub gap: Seconds,
    /// `tries:` how often an exchange is tried in all.
    pub tries: u32,
}

/// Line ends.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize, Deserialize)]
#[expect(missing_docs, reason = "the names are the characters")]
pub enum Terminator {
    Lf,
    CrLf,
    Cr,
}

impl Terminator {
    /// The bytes.
    pub fn bytes(self) -> &'static [u8] {
        match self {
            Terminator::Lf => b"\n",
            Terminator::CrLf => b"\r\n",
            Terminator::Cr => b"\r",
        }
    }
}

/// How an instrument says who it is.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct IdentityQuery {
    /// `ask:`
    pub ask: String,
    /// `fields:` comma fields of the reply (IEEE 488.2: 4).
    pub fields: usize,
}

/// One query and the readings in its reply.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct ReadingQuery {
    /// `ask:` with `{channel}` where the instrument has channels.
    pub ask: String,
    /// `gives:` one reading per field of the reply; fields are split at `;` or `,`.
    pub gives: Vec<Reading>,
}

/// How a driver tells a temperature.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Thermal {
    /// The instrument itself converts.
    Converted,
    /// A thermocouple's voltage and the temperature of its terminals, in one reply.
    Thermocouple,
    /// The resistance of a resistance thermometer.
    Resistance,
}

impl Thermal {
    /// The readings that it takes.
    pub fn readings(self) -> &'static [Reading] {
        match self {
            Thermal::Converted => &[Reading::Temperature],
            Thermal::Thermocouple => &[Reading::ThermocoupleVoltage, Reading::TerminalTemperature],
            Thermal::Resistance => &[Reading::Resistance],
        }
    }

    /// Whether a sensor of this kind says it.
    pub fn suits(self, sensor: Sensor) -> bool {
        match self {
            Thermal::Converted => true,
            Thermal::Thermocouple => matches!(sensor, Sensor::Thermocouple { .. }),
            Thermal::Resistance => matches!(sensor, Sensor::Pt100 { .. }),
        }
    }

    /// All the ways that queries tell a temperature in; a good driver has one.
    pub fn of(queries: &[ReadingQuery]) -> Vec<Thermal> {
        let all = [
            Thermal::Converted,
            Thermal::Thermocouple,
            Thermal::Resistance,
        ];
        let tells = |thermal: &Thermal| {
            let readings = thermal.readings();
            queries
                .iter()
                .any(|query| readings.iter().all(|reading| query.gives.contains(reading)))
        };
        all.into_iter().filter(tells).collect()
    }
}

/// Commands that change something; each absent where the instrument can't.
#[derive(Debug, Clone, PartialEq, Default, Serialize, Deserialize)]
pub struct Settings {
    /// `voltage:` with `{value}` in V.
    pub voltage: Option<Setting>,
    /// `frequency:` with `{value}` in Hz.
    pub frequency: Option<Setting>,
    /// `position:` with `{value}`, the position's number from 1 in the sequence's order; 0 is off.
    pub position: Option<Setting>,
    /// `output on:`
    pub output_on: Option<String>,
    /// `output off:`
    pub output_off: Option<String>,
    /// `output state:` query answered 1 or 0 (also ON and OFF).
    pub output_state: Option<String>,
}

/// A command and the query that reads it back.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct Setting {
    /// `set:` with `{value}`.
    pub set: String,
    /// `confirm:` query whose reply must agree.
    pub confirm: Option<String>,
}

/// Accuracy of one reading: +-(share of reading + share of range + floor).
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct Accuracy {
    /// Of what.
    pub reading: Reading,
    /// `of reading:` as a fraction.
    pub of_reading: f64,
    /// `of range:` as a fraction of the range in force.
    pub of_range: f64,
    /// `floor:` in the reading's base unit.
    pub floor: f64,
    /// `resolution:` in the reading's base unit.
    pub resolution: f64,
    /// `ranges:` full-scale values, rising, in the reading's base unit; empty: no range term.
    pub ranges: Vec<f64>,
    /// `of reactive power:` of a power, share of the reactive volt-amperes that adds to its
    /// error where the power factor lies below 1, as a fraction.
    #[serde(default)]
    pub of_reactive: f64,
    /// `correlation:` how far the errors of two channels, or of two values, are one and
    /// the same, 0 to 1; 0 where nothing is known, which is the safe side for differences.
    #[serde(default)]
    pub correlation: f64,
}

/// What a room away from the one that an accuracy is stated for adds to it.
#[derive(Debug, Clone, Copy, PartialEq, Serialize, Deserialize)]
pub struct TemperatureEffect {
    /// `per kelvin:` share of the reading, as a fraction.
    pub per_kelvin: f64,
    /// `reference:` the room that the accuracy is stated for.
    pub reference: Celsius,
    /// `within:` how far around it the accuracy still holds.
    pub within: Kelvins,
}

impl TemperatureEffect {
    /// Half-width of what a room adds, as a fraction of the reading.
    pub fn share_at(&self, room: Celsius) -> f64 {
        let away = (room.get() - self.reference.get()).abs();
        self.per_kelvin * (away - self.within.get()).max(0.0)
    }
}

impl Driver {
    /// How it tells a temperature; nothing where it tells none.
    pub fn thermal(&self) -> Option<Thermal> {
        Thermal::of(&self.readings).first().copied()
    }

    /// The accuracy of one reading, where the driver states one.
    pub fn accuracy_of(&self, reading: Reading) -> Option<&Accuracy> {
        self.accuracy.iter().find(|a| a.reading == reading)
    }
}

impl Accuracy {
    /// The smallest range that holds `value`, else the largest.
    pub fn range_for(&self, value: f64) -> Option<f64> {
        let holds = self
            .ranges
            .iter()
            .copied()
            .find(|full| value.abs() <= *full);
        holds.or(self.ranges.last().copied())
    }

    /// Half-width of the accuracy interval at `value`, in the reading's base unit.
    pub fn half_width(&self, value: f64) -> f64 {
        let range = self.range_for(value).unwrap_or(0.0);
        self.of_reading * value.abs() + self.of_range * range + self.floor
    }
}
