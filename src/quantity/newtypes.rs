//! One type per quantity, from one macro.

use std::fmt;
use std::ops::{Add, Sub};

use super::shortest;

macro_rules! quantity {
    ($(#[$doc:meta])* $name:ident, $unit:literal) => {
        $(#[$doc])*
        #[derive(Debug, Clone, Copy, PartialEq, PartialOrd, Default)]
        pub struct $name(f64);

        impl $name {
            /// The unit as it is written for people.
            pub const UNIT: &'static str = $unit;

            /// The value in the type's unit, or nothing where it is not finite.
            pub fn new(value: f64) -> Option<Self> {
                value.is_finite().then_some(Self(value))
            }

            /// The value in the type's unit.
            ///
            /// # Panics
            /// On a non-finite value: for constants and values checked before.
            pub fn of(value: f64) -> Self {
                Self::new(value).expect("a quantity is finite")
            }

            /// The number in the type's unit.
            pub fn get(self) -> f64 {
                self.0
            }
        }

        impl fmt::Display for $name {
            fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
                match f.precision() {
                    Some(places) => write!(f, "{:.*} {}", places, self.0, $unit),
                    None => write!(f, "{} {}", shortest(self.0), $unit),
                }
            }
        }
    };
}

quantity!(
    /// Electric potential difference, root mean square where it alternates.
    Volts, "V"
);
quantity!(
    /// Electric current, root mean square where it alternates.
    Amps, "A"
);
quantity!(
    /// Active power.
    Watts, "W"
);
quantity!(
    /// Apparent power.
    VoltAmps, "VA"
);
quantity!(
    /// Resistance.
    Ohms, "ohm"
);
quantity!(
    /// Frequency.
    Hertz, "Hz"
);
quantity!(
    /// A temperature: a point on the Celsius scale.
    Celsius, "°C"
);
quantity!(
    /// A temperature difference or rise.
    Kelvins, "K"
);
quantity!(
    /// A rate of change of temperature.
    KelvinsPerMinute, "K/min"
);
quantity!(
    /// Energy.
    WattHours, "Wh"
);

impl Sub for Celsius {
    type Output = Kelvins;
    fn sub(self, other: Celsius) -> Kelvins {
        Kelvins(self.0 - other.0)
    }
}

impl Add<Kelvins> for Celsius {
    type Output = Celsius;
    fn add(self, rise: Kelvins) -> Celsius {
        Celsius(self.0 + rise.0)
    }
}

impl Sub<Kelvins> for Celsius {
    type Output = Celsius;
    fn sub(self, rise: Kelvins) -> Celsius {
        Celsius(self.0 - rise.0)
    }
}

impl std::ops::Mul<Amps> for Volts {
    type Output = VoltAmps;
    fn mul(self, current: Amps) -> VoltAmps {
        VoltAmps(self.0 * current.0)
    }
}

/// A ratio, kept as a fraction and written in per cent.
#[derive(Debug, Clone, Copy, PartialEq, PartialOrd, Default)]
pub struct Ratio(f64);

impl Ratio {
    /// The fraction (0.1 is 10 %), or nothing where it is not finite.
    pub fn new(fraction: f64) -> Option<Self> {
        fraction.is_finite().then_some(Self(fraction))
    }

    /// The fraction (0.1 is 10 %).
    ///
    /// # Panics
    /// On a non-finite fraction.
    pub fn of(fraction: f64) -> Self {
        Self::new(fraction).expect("a ratio is finite")
    }

    /// The fraction.
    pub fn get(self) -> f64 {
        self.0
    }
}

impl fmt::Display for Ratio {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        // Twelve digits: 0.07 x 100 is 7.000000000000001 in binary.
        let percent = (self.0 * 1e14).round() / 1e12;
        write!(f, "{} %", shortest(percent))
    }
}
