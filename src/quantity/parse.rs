//! Reading `230 V`, `0.5 K/min`, `20 min`, and the same in JSON.

use std::fmt;
use std::str::FromStr;

use serde::{Deserialize, Deserializer, Serialize, Serializer};

use super::{
    Amps, Celsius, Hertz, Kelvins, KelvinsPerMinute, Ohms, Ratio, Seconds, VoltAmps, Volts,
    WattHours, Watts, shortest,
};

/// What kind of quantity a unit belongs to.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Hash)]
#[expect(missing_docs, reason = "the names are the quantities themselves")]
pub enum Dimension {
    Voltage,
    Current,
    Power,
    ApparentPower,
    Resistance,
    Frequency,
    Temperature,
    TemperatureDifference,
    TemperatureRate,
    Energy,
    Time,
    Ratio,
}

impl Dimension {
    /// In words, with an article: `a power`.
    pub fn name(self) -> &'static str {
        match self {
            Dimension::Voltage => "a voltage",
            Dimension::Current => "a current",
            Dimension::Power => "a power",
            Dimension::ApparentPower => "an apparent power",
            Dimension::Resistance => "a resistance",
            Dimension::Frequency => "a frequency",
            Dimension::Temperature => "a temperature",
            Dimension::TemperatureDifference => "a temperature difference",
            Dimension::TemperatureRate => "a rate of temperature change",
            Dimension::Energy => "an energy",
            Dimension::Time => "a time",
            Dimension::Ratio => "a ratio",
        }
    }

    /// A value of this kind as one would write it.
    pub fn example(self) -> &'static str {
        match self {
            Dimension::Voltage => "230 V",
            Dimension::Current => "0.5 A",
            Dimension::Power => "9 W",
            Dimension::ApparentPower => "10 VA",
            Dimension::Resistance => "1500 ohm",
            Dimension::Frequency => "50 Hz",
            Dimension::Temperature => "94 °C",
            Dimension::TemperatureDifference => "10 K",
            Dimension::TemperatureRate => "0.5 K/min",
            Dimension::Energy => "5 Wh",
            Dimension::Time => "20 min",
            Dimension::Ratio => "10 %",
        }
    }
}

/// A number with the unit that was written beside it, in the unit's base.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Written {
    /// The value in the base unit of its dimension (V, A, W, s, fraction, ...).
    pub value: f64,
    /// What the unit measures.
    pub dimension: Dimension,
}

/// Why a text is not the quantity that was asked for.
#[derive(Debug, Clone, PartialEq, Eq, thiserror::Error)]
pub enum ParseQuantityError {
    /// No number at the start.
    #[error("`{text}` does not start with a number")]
    NoNumber {
        /// The text as written.
        text: String,
    },
    /// A number alone.
    #[error("`{text}` has no unit")]
    NoUnit {
        /// The text as written.
        text: String,
    },
    /// A unit that is not known.
    #[error("`{unit}` is not a unit that is known here")]
    UnknownUnit {
        /// The unit as written.
        unit: String,
    },
    /// Infinite or not a number.
    #[error("`{text}` is not a finite number")]
    NotFinite {
        /// The text as written.
        text: String,
    },
    /// A right unit of the wrong kind.
    #[error("`{text}` is {found}, not {wanted}")]
    WrongDimension {
        /// The text as written.
        text: String,
        /// What was written.
        found: &'static str,
        /// What was wanted.
        wanted: &'static str,
    },
    /// A negative duration.
    #[error("`{text}` is negative")]
    Negative {
        /// The text as written.
        text: String,
    },
}

/// Factor to the base unit, and the dimension, of every unit that is known.
const UNITS: &[(&str, f64, Dimension)] = &[
    ("V", 1.0, Dimension::Voltage),
    ("mV", 1e-3, Dimension::Voltage),
    ("kV", 1e3, Dimension::Voltage),
    ("uV", 1e-6, Dimension::Voltage),
    // The micro sign and the Greek letter look alike.
    ("\u{b5}V", 1e-6, Dimension::Voltage),
    ("\u{3bc}V", 1e-6, Dimension::Voltage),
    ("A", 1.0, Dimension::Current),
    ("mA", 1e-3, Dimension::Current),
    ("W", 1.0, Dimension::Power),
    ("mW", 1e-3, Dimension::Power),
    ("kW", 1e3, Dimension::Power),
    ("VA", 1.0, Dimension::ApparentPower),
    ("ohm", 1.0, Dimension::Resistance),
    ("Ω", 1.0, Dimension::Resistance),
    ("mohm", 1e-3, Dimension::Resistance),
    ("mΩ", 1e-3, Dimension::Resistance),
    ("kohm", 1e3, Dimension::Resistance),
    ("kΩ", 1e3, Dimension::Resistance),
    ("Hz", 1.0, Dimension::Frequency),
    ("°C", 1.0, Dimension::Temperature),
    ("C", 1.0, Dimension::Temperature),
    ("degC", 1.0, Dimension::Temperature),
    ("K", 1.0, Dimension::TemperatureDifference),
    ("K/min", 1.0, Dimension::TemperatureRate),
    ("K/h", 1.0 / 60.0, Dimension::TemperatureRate),
    ("Wh", 1.0, Dimension::Energy),
    ("kWh", 1e3, Dimension::Energy),
    ("ms", 1e-3, Dimension::Time),
    ("s", 1.0, Dimension::Time),
    ("min", 60.0, Dimension::Time),
    ("h", 3600.0, Dimension::Time),
    ("%", 0.01, Dimension::Ratio),
];

/// Reads a number and its unit; a blank between the two is optional.
///
/// # Errors
/// [`ParseQuantityError`] without a number, without a unit, with an unknown
/// unit, or where the number is not finite.
pub fn parse_written(text: &str) -> Result<Written, ParseQuantityError> {
    let text = text.trim();
    let end = number_end(text);
    let (number, unit) = (&text[..end], text[end..].trim());
    let owned = || text.to_owned();
    let Ok(value) = number.parse::<f64>() else {
        return Err(if is_named_infinity(text) {
            ParseQuantityError::NotFinite { text: owned() }
        } else {
            ParseQuantityError::NoNumber { text: owned() }
        });
    };
    if unit.is_empty() {
        return Err(ParseQuantityError::NoUnit { text: owned() });
    }
    let Some(&(_, factor, dimension)) = UNITS.iter().find(|(name, ..)| *name == unit) else {
        return Err(ParseQuantityError::UnknownUnit {
            unit: unit.to_owned(),
        });
    };
    // Divided where the factor is a decimal fraction: 100 ms is 0.1 s to the last bit.
    let value = if factor < 1.0 {
        value / (1.0 / factor).round()
    } else {
        value * factor
    };
    if !value.is_finite() {
        return Err(ParseQuantityError::NotFinite { text: owned() });
    }
    Ok(Written { value, dimension })
}

fn number_end(text: &str) -> usize {
    let bytes = text.as_bytes();
    let mut end = 0;
    while end < bytes.len() {
        let exponent_sign = end > 0 && matches!(bytes[end - 1], b'e' | b'E');
        let part = match bytes[end] {
            b'0'..=b'9' | b'.' => true,
            b'+' | b'-' => end == 0 || exponent_sign,
            b'e' | b'E' => {
                end > 0
                    && bytes
                        .get(end + 1)
                        .is_some_and(|b| matches!(b, b'0'..=b'9' | b'+' | b'-'))
            }
            _ => false,
        };
        if !part {
            break;
        }
        end += 1;
    }
    end
}

fn is_named_infinity(text: &str) -> bool {
    let word = text
        .trim_start_matches(['+', '-', '.'])
        .to_ascii_lowercase();
    word.starts_with("nan") || word.starts_with("inf")
}

/// A quantity that can be read from text with its unit.
pub trait Quantity: Sized + fmt::Display {
    /// What its unit must measure.
    const DIMENSION: Dimension;

    /// From the value in the base unit; nothing where the type has no such value.
    fn from_base(value: f64) -> Option<Self>;

    /// Reads `text`.
    ///
    /// # Errors
    /// [`ParseQuantityError`] where the text is not this quantity.
    fn parse(text: &str) -> Result<Self, ParseQuantityError> {
        let written = parse_written(text)?;
        if written.dimension != Self::DIMENSION {
            return Err(ParseQuantityError::WrongDimension {
                text: text.trim().to_owned(),
                found: written.dimension.name(),
                wanted: Self::DIMENSION.name(),
            });
        }
        Self::from_base(written.value).ok_or_else(|| ParseQuantityError::Negative {
            text: text.trim().to_owned(),
        })
    }
}

macro_rules! readable {
    ($($name:ident => $dimension:ident),* $(,)?) => {$(
        impl Quantity for $name {
            const DIMENSION: Dimension = Dimension::$dimension;
            fn from_base(value: f64) -> Option<Self> {
                $name::new(value)
            }
        }

        impl FromStr for $name {
            type Err = ParseQuantityError;
            fn from_str(text: &str) -> Result<Self, Self::Err> {
                <$name as Quantity>::parse(text)
            }
        }

        impl Serialize for $name {
            fn serialize<S: Serializer>(&self, out: S) -> Result<S::Ok, S::Error> {
                out.serialize_str(&self.exact())
            }
        }

        impl<'de> Deserialize<'de> for $name {
            fn deserialize<D: Deserializer<'de>>(input: D) -> Result<Self, D::Error> {
                let text = String::deserialize(input)?;
                text.parse().map_err(serde::de::Error::custom)
            }
        }
    )*};
}

readable! {
    Volts => Voltage,
    Amps => Current,
    Watts => Power,
    VoltAmps => ApparentPower,
    Ohms => Resistance,
    Hertz => Frequency,
    Celsius => Temperature,
    Kelvins => TemperatureDifference,
    KelvinsPerMinute => TemperatureRate,
    WattHours => Energy,
    Seconds => Time,
    Ratio => Ratio,
}

/// Text that reads back to the last bit, for files that machines read.
trait Exact {
    fn exact(&self) -> String;
}

macro_rules! exact {
    ($($name:ident),*) => {$(
        impl Exact for $name {
            fn exact(&self) -> String {
                format!("{} {}", shortest(self.get()), $name::UNIT)
            }
        }
    )*};
}

exact!(
    Volts,
    Amps,
    Watts,
    VoltAmps,
    Ohms,
    Hertz,
    Celsius,
    Kelvins,
    KelvinsPerMinute,
    WattHours
);

impl Exact for Seconds {
    fn exact(&self) -> String {
        format!("{} s", shortest(self.get()))
    }
}

impl Exact for Ratio {
    fn exact(&self) -> String {
        self.to_string()
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn values_with_units_are_read_in_the_base_unit() {
        assert_eq!("230 V".parse(), Ok(Volts::of(230.0)));
        assert_eq!("1.5kW".parse(), Ok(Watts::of(1500.0)));
        assert_eq!("20 min".parse(), Ok(Seconds::of(1200.0)));
        assert_eq!("100 ms".parse(), Ok(Seconds::of(0.1)));
        assert_eq!("10 %".parse(), Ok(Ratio::of(0.1)));
        assert_eq!("-5 °C".parse(), Ok(Celsius::of(-5.0)));
        assert_eq!("1e3 ohm".parse(), Ok(Ohms::of(1000.0)));
    }

    #[test]
    fn what_is_wrong_is_named() {
        assert!(matches!(
            "9".parse::<Watts>(),
            Err(ParseQuantityError::NoUnit { .. })
        ));
        assert!(matches!(
            "9 V".parse::<Watts>(),
            Err(ParseQuantityError::WrongDimension { .. })
        ));
        assert!(matches!(
            "9 Watt".parse::<Watts>(),
            Err(ParseQuantityError::UnknownUnit { .. })
        ));
        assert!(matches!(
            ".nan".parse::<Watts>(),
            Err(ParseQuantityError::NotFinite { .. })
        ));
        assert!(matches!(
            "1e999 W".parse::<Watts>(),
            Err(ParseQuantityError::NotFinite { .. })
        ));
        assert!(matches!(
            "-20 min".parse::<Seconds>(),
            Err(ParseQuantityError::Negative { .. })
        ));
        assert!(matches!(
            "W".parse::<Watts>(),
            Err(ParseQuantityError::NoNumber { .. })
        ));
    }

    #[test]
    fn display_and_json_read_back() {
        for text in ["100 ms", "90 s", "20 min", "2 h", "7 %", "0.5 K/min"] {
            let shown = match parse_written(text).unwrap().dimension {
                Dimension::Time => text.parse::<Seconds>().unwrap().to_string(),
                Dimension::Ratio => text.parse::<Ratio>().unwrap().to_string(),
                _ => text.parse::<KelvinsPerMinute>().unwrap().to_string(),
            };
            assert_eq!(shown, text);
        }
        let w = Watts::of(9.530000000000001);
        let json = serde_json::to_string(&w).unwrap();
        assert_eq!(serde_json::from_str::<Watts>(&json).unwrap(), w);
    }
}
