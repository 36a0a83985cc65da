//! Which sensor hangs on a channel.

use serde::{Deserialize, Serialize};

/// A thermocouple's type, by its letter in IEC 60584-1.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize, Deserialize)]
#[expect(missing_docs, reason = "the letters are the standard's")]
pub enum Couple {
    K,
    J,
    T,
}

/// A thermocouple's tolerance class (IEC 60584-1).
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize, Deserialize)]
#[expect(missing_docs, reason = "the numbers are the standard's")]
pub enum CoupleClass {
    #[serde(rename = "1")]
    One,
    #[serde(rename = "2")]
    Two,
}

/// A platinum thermometer's tolerance class (IEC 60751).
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize, Deserialize)]
#[expect(missing_docs, reason = "the letters are the standard's")]
pub enum PlatinumClass {
    AA,
    A,
    B,
    C,
}

/// A sensor with its class. A class of the wrong standard can't be said.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize, Deserialize)]
#[serde(rename_all = "snake_case")]
pub enum Sensor {
    /// Its voltage, with the temperature of the terminals, tells the temperature.
    Thermocouple {
        /// Its type.
        couple: Couple,
        /// Its class.
        class: CoupleClass,
    },
    /// Its resistance tells the temperature.
    Pt100 {
        /// Its class.
        class: PlatinumClass,
    },
}

impl Couple {
    /// Every type that is known here.
    pub const ALL: [Couple; 3] = [Couple::K, Couple::J, Couple::T];

    /// The letter.
    pub fn letter(self) -> &'static str {
        match self {
            Couple::K => "K",
            Couple::J => "J",
            Couple::T => "T",
        }
    }
}

impl CoupleClass {
    /// Every class that is known here.
    pub const ALL: [CoupleClass; 2] = [CoupleClass::One, CoupleClass::Two];
}

impl PlatinumClass {
    /// Every class.
    pub const ALL: [PlatinumClass; 4] = [
        PlatinumClass::AA,
        PlatinumClass::A,
        PlatinumClass::B,
        PlatinumClass::C,
    ];
}

impl Sensor {
    /// The type in one word: `K`, `J`, `T`, `Pt100`.
    pub fn type_word(self) -> &'static str {
        match self {
            Sensor::Thermocouple { couple, .. } => couple.letter(),
            Sensor::Pt100 { .. } => "Pt100",
        }
    }

    /// The class in one word: `1`, `2`, `AA`, `A`, `B`, `C`.
    pub fn class_word(self) -> &'static str {
        match self {
            Sensor::Thermocouple { class, .. } => match class {
                CoupleClass::One => "1",
                CoupleClass::Two => "2",
            },
            Sensor::Pt100 { class } => match class {
                PlatinumClass::AA => "AA",
                PlatinumClass::A => "A",
                PlatinumClass::B => "B",
                PlatinumClass::C => "C",
            },
        }
    }

    /// The standard that its class is from.
    pub fn standard(self) -> &'static str {
        match self {
            Sensor::Thermocouple { .. } => "IEC 60584-1",
            Sensor::Pt100 { .. } => "IEC 60751",
        }
    }

    /// In words: `thermocouple K, class 1 (IEC 60584-1)`.
    pub fn words(self) -> String {
        let (kind, class, standard) = (self.type_word(), self.class_word(), self.standard());
        match self {
            Sensor::Thermocouple { .. } => {
                format!("thermocouple {kind}, class {class} ({standard})")
            }
            Sensor::Pt100 { .. } => format!("{kind}, class {class} ({standard})"),
        }
    }
}
