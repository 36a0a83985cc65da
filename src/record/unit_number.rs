//! A unit's own number, safe in a path on every system.

use std::fmt;

/// Most characters of a unit number.
const LONGEST: usize = 64;

/// Names that one system keeps for devices, whatever their ending.
const RESERVED: [&str; 6] = ["CON", "PRN", "AUX", "NUL", "COM", "LPT"];

/// A unit's number: letters, digits, `-`, `_` and `.`, not first a `.`.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct UnitNumber(String);

/// Why a text is no unit number.
#[derive(Debug, Clone, PartialEq, Eq, thiserror::Error)]
pub enum UnitNumberError {
    /// Nothing there.
    #[error("the unit number is empty; give the number on the unit's label")]
    Empty,
    /// Too long.
    #[error("the unit number has {0} characters; 64 is the most")]
    TooLong(usize),
    /// A character that has no place in a file name.
    #[error(
        "the unit number holds {0:?}; only letters A-Z, digits, `-`, `_` and `.` are taken, so that it is safe as a folder's name"
    )]
    Character(char),
    /// A leading dot, or a name that one system keeps for devices.
    #[error(
        "the unit number `{0}` can't be a folder's name on every system; put a letter in front"
    )]
    Reserved(String),
}

impl UnitNumber {
    /// Takes `text` where it is safe as part of a file name.
    ///
    /// # Errors
    /// [`UnitNumberError`] says which character or name is in the way.
    pub fn new(text: &str) -> Result<Self, UnitNumberError> {
        let text = text.trim();
        if text.is_empty() {
            return Err(UnitNumberError::Empty);
        }
        let count = text.chars().count();
        if count > LONGEST {
            return Err(UnitNumberError::TooLong(count));
        }
        let safe = |c: char| c.is_ascii_alphanumeric() || matches!(c, '-' | '_' | '.');
        if let Some(c) = text.chars().find(|c| !safe(*c)) {
            return Err(UnitNumberError::Character(c));
        }
        let stem = text.split('.').next().unwrap_or("").to_ascii_uppercase();
        let stem = stem.trim_end_matches(|c: char| c.is_ascii_digit());
        if text.starts_with('.') || text.ends_with('.') || RESERVED.contains(&stem) {
            return Err(UnitNumberError::Reserved(text.to_owned()));
        }
        Ok(Self(text.to_owned()))
    }

    /// As text.
    pub fn as_str(&self) -> &str {
        &self.0
    }
}

impl fmt::Display for UnitNumber {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        f.write_str(&self.0)
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn ordinary_numbers_are_taken() {
        for text in ["0001", "CD9-2026-117", "a.b_c", " 17 "] {
            assert_eq!(UnitNumber::new(text).unwrap().as_str(), text.trim());
        }
    }

    #[test]
    fn whatever_could_leave_the_folder_is_refused() {
        for text in [
            "../../x", "a/b", "a\\b", "..", ".hidden", "x.", "nul", "COM1", "lpt2.txt", "", "  ",
        ] {
            assert!(UnitNumber::new(text).is_err(), "{text}");
        }
        assert!(UnitNumber::new("a\u{0}").is_err());
        assert!(UnitNumber::new("µ1").is_err());
        assert!(UnitNumber::new(&"9".repeat(65)).is_err());
    }
}
