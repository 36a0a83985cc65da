//! Time as whole microseconds since a run's start, and durations in seconds.

use std::fmt;
use std::ops::{Add, Sub};

use serde::{Deserialize, Serialize};

/// A point in a run's time: whole microseconds since its start.
#[derive(
    Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord, Hash, Default, Serialize, Deserialize,
)]
#[serde(transparent)]
pub struct Moment(u64);

impl Moment {
    /// The run's start.
    pub const START: Moment = Moment(0);

    /// `us` microseconds after the start.
    pub const fn from_micros(us: u64) -> Self {
        Moment(us)
    }

    /// Whole microseconds since the start.
    pub const fn as_micros(self) -> u64 {
        self.0
    }

    /// Seconds since the start.
    pub fn as_secs_f64(self) -> f64 {
        self.0 as f64 * 1e-6
    }

    /// Seconds since `earlier`; zero where `earlier` is later.
    pub fn since(self, earlier: Moment) -> Seconds {
        Seconds::of(self.0.saturating_sub(earlier.0) as f64 * 1e-6)
    }

    /// Microseconds since `earlier`; zero where `earlier` is later.
    pub fn micros_since(self, earlier: Moment) -> u64 {
        self.0.saturating_sub(earlier.0)
    }

    /// This moment `us` microseconds later.
    #[must_use]
    pub const fn plus_micros(self, us: u64) -> Moment {
        Moment(self.0 + us)
    }
}

impl Add<Seconds> for Moment {
    type Output = Moment;
    fn add(self, span: Seconds) -> Moment {
        Moment(self.0 + span.as_micros())
    }
}

/// A duration, never negative, in seconds.
#[derive(Debug, Clone, Copy, PartialEq, PartialOrd, Default)]
pub struct Seconds(f64);

impl Seconds {
    /// No time at all.
    pub const ZERO: Seconds = Seconds(0.0);

    /// `s` seconds, or nothing where `s` is negative or not finite.
    pub fn new(s: f64) -> Option<Self> {
        (s.is_finite() && s >= 0.0).then_some(Seconds(s))
    }

    /// `s` seconds.
    ///
    /// # Panics
    /// On a negative or non-finite `s`: for constants and values checked before.
    pub fn of(s: f64) -> Self {
        Self::new(s).expect("a duration is finite and not negative")
    }

    /// A whole number of seconds, for constants.
    pub const fn whole(s: u32) -> Self {
        Seconds(s as f64)
    }

    /// The number of seconds.
    pub fn get(self) -> f64 {
        self.0
    }

    /// Whole microseconds, rounded.
    pub fn as_micros(self) -> u64 {
        (self.0 * 1e6).round() as u64
    }

    /// As a standard duration, in whole microseconds.
    pub fn to_std(self) -> std::time::Duration {
        std::time::Duration::from_micros(self.as_micros())
    }
}

impl Add for Seconds {
    type Output = Seconds;
    fn add(self, other: Seconds) -> Seconds {
        Seconds(self.0 + other.0)
    }
}

impl Sub for Seconds {
    type Output = Seconds;
    /// Saturates at zero.
    fn sub(self, other: Seconds) -> Seconds {
        Seconds((self.0 - other.0).max(0.0))
    }
}

impl fmt::Display for Seconds {
    /// In the largest unit that needs no fraction: `100 ms`, `90 s`, `20 min`, `2 h`.
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        let whole = |x: f64| x >= 1.0 && (x - x.round()).abs() < 1e-9;
        let s = self.0;
        let (value, unit) = if s == 0.0 {
            (0.0, "s")
        } else if whole(s / 3600.0) {
            (s / 3600.0, "h")
        } else if whole(s / 60.0) {
            (s / 60.0, "min")
        } else if s >= 1.0 {
            (s, "s")
        } else {
            (s * 1e3, "ms")
        };
        write!(f, "{} {unit}", super::shortest((value * 1e6).round() / 1e6))
    }
}
