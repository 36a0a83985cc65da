//! How far a sensor of its class may be from its reference function.
//!
//! IEC 60584-1:2013 (read in restatements): K and J class 1 the greater of 1.5 °C
//! and 0.004 t, class 2 of 2.5 °C and 0.0075 t; T class 1 of 0.5 °C and 0.004 t,
//! class 2 of 1 °C and 0.0075 t. IEC 60751: AA 0.1 + 0.0017 t, A 0.15 + 0.002 t,
//! B 0.3 + 0.005 t, C 0.6 + 0.01 t. t counts without its sign.

use std::ops::RangeInclusive;

use super::kind::{Couple, CoupleClass, PlatinumClass, Sensor};
use crate::quantity::{Celsius, Kelvins};

/// Half-width of the class's tolerance at `at`. `None` outside the class's range:
/// what the standard does not say is not guessed.
pub fn tolerance(sensor: Sensor, at: Celsius) -> Option<Kelvins> {
    let t = at.get();
    if !range(sensor).contains(&t) {
        return None;
    }
    let t = t.abs();
    Kelvins::new(match sensor {
        Sensor::Thermocouple { couple, class } => {
            let (least, share) = greater_of(couple, class);
            least.max(share * t)
        }
        Sensor::Pt100 { class } => {
            let (constant, share) = sum_of(class);
            constant + share * t
        }
    })
}

/// From where to where the class says anything, °C.
pub fn class_range(sensor: Sensor) -> (Celsius, Celsius) {
    let range = range(sensor);
    (Celsius::of(*range.start()), Celsius::of(*range.end()))
}

fn greater_of(couple: Couple, class: CoupleClass) -> (f64, f64) {
    match (couple, class) {
        (Couple::K | Couple::J, CoupleClass::One) => (1.5, 0.004),
        (Couple::K | Couple::J, CoupleClass::Two) => (2.5, 0.0075),
        (Couple::T, CoupleClass::One) => (0.5, 0.004),
        (Couple::T, CoupleClass::Two) => (1.0, 0.0075),
    }
}

fn sum_of(class: PlatinumClass) -> (f64, f64) {
    match class {
        PlatinumClass::AA => (0.1, 0.0017),
        PlatinumClass::A => (0.15, 0.002),
        PlatinumClass::B => (0.3, 0.005),
        PlatinumClass::C => (0.6, 0.01),
    }
}

/// Platinum: IEC 60751 gives a wire-wound element a wider range than a film one,
/// and a bench file does not say which is inside. The film's range is within the
/// other's and holds for both (IEC 60751:2022 table 2, read in a restatement).
fn range(sensor: Sensor) -> RangeInclusive<f64> {
    match sensor {
        Sensor::Thermocouple { couple, class } => match (couple, class) {
            (Couple::K, CoupleClass::One) => -40.0..=1000.0,
            (Couple::K, CoupleClass::Two) => -40.0..=1200.0,
            (Couple::J, _) => -40.0..=750.0,
            (Couple::T, _) => -40.0..=350.0,
        },
        Sensor::Pt100 { class } => match class {
            PlatinumClass::AA => 0.0..=150.0,
            PlatinumClass::A => -30.0..=300.0,
            PlatinumClass::B => -50.0..=500.0,
            PlatinumClass::C => -50.0..=600.0,
        },
    }
}
