//! Pt100 by IEC 60751: the equations of Callendar and Van Dusen, and their inverse.

use super::solve::{polynomial, rising};
use crate::quantity::{Celsius, Ohms};

/// At 0 °C, ohm.
const R0: f64 = 100.0;
/// 1/K.
const A: f64 = 3.9083e-3;
/// 1/K^2.
const B: f64 = -5.775e-7;
/// 1/K^4, below 0 °C only.
const C: f64 = -4.183e-12;
/// The equations' range, °C.
const FROM: f64 = -200.0;
const TO: f64 = 850.0;

/// R0 (1 + A t + B t^2), multiplied out.
const ABOVE: [f64; 3] = [R0, R0 * A, R0 * B];
/// R0 (1 + A t + B t^2 + C (t - 100) t^3), multiplied out.
const BELOW: [f64; 5] = [R0, R0 * A, R0 * B, R0 * C * -100.0, R0 * C];

/// ohm and ohm/K.
fn function(t: f64) -> (f64, f64) {
    if t < 0.0 {
        polynomial(&BELOW, t)
    } else {
        polynomial(&ABOVE, t)
    }
}

/// A Pt100's resistance at `at`. `None` outside -200..850 °C.
pub fn pt100_resistance(at: Celsius) -> Option<Ohms> {
    known(at).and_then(|t| Ohms::new(function(t).0))
}

/// Its slope there, in ohm/K. `None` outside -200..850 °C.
pub fn pt100_slope(at: Celsius) -> Option<f64> {
    known(at).map(|t| function(t).1)
}

fn known(at: Celsius) -> Option<f64> {
    Some(at.get()).filter(|t| (FROM..=TO).contains(t))
}

/// The temperature of a Pt100 of this resistance, to better than 1 mK. `None`
/// outside -200..850 °C.
pub fn pt100_temperature(read: Ohms) -> Option<Celsius> {
    let wanted = read.get();
    // Sums in another order miss the ends by some last bits: 1 nohm is allowed for.
    let range = function(FROM).0 - 1e-9..=function(TO).0 + 1e-9;
    range
        .contains(&wanted)
        .then(|| rising(function, wanted, FROM, TO))
        .and_then(Celsius::new)
}
