//! Source texts, places in them, and problems found at those places.

use std::fmt;
use std::ops::Range;
use std::sync::Arc;

/// A file's name and text, shared by every place in it.
#[derive(PartialEq, Eq)]
pub struct Source {
    /// The name as the user gave it, for messages.
    pub name: String,
    /// The whole text.
    pub text: String,
}

impl fmt::Debug for Source {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        write!(f, "Source({}, {} bytes)", self.name, self.text.len())
    }
}

/// A byte range of a source.
#[derive(Clone, PartialEq, Eq)]
pub struct Place {
    /// The file.
    pub source: Arc<Source>,
    /// Bytes of its text, on character boundaries.
    pub bytes: Range<usize>,
}

impl Place {
    /// Line and column of the start, both from 1; columns count characters.
    pub fn line_column(&self) -> (usize, usize) {
        let before = &self.source.text[..self.bytes.start.min(self.source.text.len())];
        let line = before.matches('\n').count() + 1;
        let column = before.rsplit('\n').next().unwrap_or("").chars().count() + 1;
        (line, column)
    }

    /// The text of the place.
    pub fn text(&self) -> &str {
        self.source.text.get(self.bytes.clone()).unwrap_or("")
    }
}

impl fmt::Debug for Place {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        let (line, column) = self.line_column();
        write!(f, "{}:{line}:{column}", self.source.name)
    }
}

/// A value and where it was written.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Located<T> {
    /// The value.
    pub value: T,
    /// Where it stands.
    pub place: Place,
}

impl<T> Located<T> {
    /// The value of another type at the same place.
    pub fn map<U>(self, change: impl FnOnce(T) -> U) -> Located<U> {
        Located {
            value: change(self.value),
            place: self.place,
        }
    }
}

impl<T> std::ops::Deref for Located<T> {
    type Target = T;
    fn deref(&self) -> &T {
        &self.value
    }
}

/// How much a problem weighs.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Weight {
    /// Nothing can be run with it.
    Error,
    /// It can be run, and should be known.
    Warning,
}

/// Something wrong in a file: where, what, and what to do.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Problem {
    /// Error or warning.
    pub weight: Weight,
    /// Where it stands.
    pub place: Place,
    /// What is wrong: a lowercase fragment.
    pub message: String,
    /// What to do about it.
    pub hint: Option<String>,
}

impl Problem {
    /// An error at a place.
    pub fn error(place: &Place, message: impl Into<String>) -> Self {
        Self {
            weight: Weight::Error,
            place: place.clone(),
            message: message.into(),
            hint: None,
        }
    }

    /// A warning at a place.
    pub fn warning(place: &Place, message: impl Into<String>) -> Self {
        Self {
            weight: Weight::Warning,
            ..Self::error(place, message)
        }
    }

    /// With a hint.
    #[must_use]
    pub fn hint(mut self, hint: impl Into<String>) -> Self {
        self.hint = Some(hint.into());
        self
    }
}

impl fmt::Display for Problem {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        let (line, column) = self.place.line_column();
        write!(
            f,
            "{}:{line}:{column}: {}",
            self.place.source.name, self.message
        )
    }
}
