//! Temperature sensors: from the raw voltage or resistance to a temperature, how
//! far a sensor of its class may be off, and how strongly an error of what was
//! read moves the temperature.
//!
//! Thermocouples of the types K, J and T by the reference functions of the ITS-90
//! (NIST SRD 60, public domain); Pt100 by IEC 60751. Nothing is known outside a
//! function's range: there is no temperature then, never an extrapolated one.

mod class;
mod kind;
mod platinum;
mod raw;
mod solve;
mod thermocouple;

pub use class::{class_range, tolerance};
pub use kind::{Couple, CoupleClass, PlatinumClass, Sensor};
pub use platinum::{pt100_resistance, pt100_slope, pt100_temperature};
pub use raw::{RAW, is_raw, raw_of, sensitivity, temperature_of};
pub use thermocouple::{seebeck, temperature_at, voltage};

#[cfg(test)]
mod tests;
