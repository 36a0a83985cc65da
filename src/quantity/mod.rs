//! Quantities: numbers that never travel without their unit.
//!
//! A temperature ([`Celsius`]) is a point and a rise ([`Kelvins`]) is a
//! difference; volts times amperes are [`VoltAmps`], not [`Watts`]. Each type is
//! written for people as `230 V` and is read back from the same text, in YAML
//! and in JSON alike, so that no file holds a bare number.

mod moment;
mod newtypes;
mod parse;
mod reading;
mod rounding;
mod waveform;

pub use moment::{Moment, Seconds};
pub use newtypes::{
    Amps, Celsius, Hertz, Kelvins, KelvinsPerMinute, Ohms, Ratio, VoltAmps, Volts, WattHours, Watts,
};
pub use parse::{Dimension, ParseQuantityError, Quantity, Written, parse_written};
pub use reading::{Reading, Readings};
pub use rounding::{at_least, at_most, near, shortest, significant};
pub use waveform::{Waveform, WaveformError};
