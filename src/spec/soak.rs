//! Soaks of a sequence: when they count as settled, and by whose criterion.

use std::fmt;

use serde::{Deserialize, Serialize};

use super::sequence::HeatingElement;
use crate::quantity::{Kelvins, Ratio, Seconds, Watts};

/// Staying energised until settled.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct Soak {
    /// `at least:` (house default 10 min).
    pub at_least: Seconds,
    /// `at most:`
    pub at_most: Seconds,
    /// `every:` polling interval.
    pub every: Seconds,
    /// `until:`
    pub until: Criterion,
    /// `early finish:` whether two predictions that agree may end it (default no).
    #[serde(default)]
    pub early_finish: bool,
}

/// When a soak counts as settled: every stated change is within its limit.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct Criterion {
    /// `criterion:`
    pub kind: CriterionKind,
    /// `power change:` of the mean power; per hour where the criterion is a slope.
    /// The sampling method brings its own.
    pub power_change: Option<PowerChange>,
    /// `temperature change:` of the body's rise over ambient; per hour where the criterion is a slope.
    pub temperature_change: Option<Kelvins>,
}

/// How much a power may change: `2 %` of its mean, or `50 mW`.
#[derive(Debug, Clone, Copy, PartialEq, Serialize, Deserialize)]
#[serde(untagged)]
pub enum PowerChange {
    /// Of the mean power.
    Relative(Ratio),
    /// Absolute.
    Absolute(Watts),
}

impl fmt::Display for PowerChange {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self {
            PowerChange::Relative(share) => share.fmt(f),
            PowerChange::Absolute(watts) => watts.fmt(f),
        }
    }
}

/// Published ways to call a quantity steady.
#[derive(Debug, Clone, Copy, PartialEq, Serialize, Deserialize)]
pub enum CriterionKind {
    /// `slope`: regression over a trailing window, its confidence bound within the limit.
    Slope {
        /// `window:`
        window: Seconds,
    },
    /// `three readings`: 10 % of the elapsed time apart, at least 5 min, without change
    /// (UL 1278 39.1.8 in a restatement).
    ThreeReadings,
    /// `change within`: largest change within an interval.
    ChangeWithin {
        /// `interval:`
        interval: Seconds,
    },
    /// `sampling method`: logged for at least 15 min at 1 s or faster, the first third
    /// dropped, regression over the rest: below 10 mW/h up to 1 W, above that below 1 %
    /// of the power per hour, within 3 h (IEC 62301 ed. 2, from memory).
    SamplingMethod,
}

impl Criterion {
    /// Where it comes from, for what is printed.
    pub fn source(&self) -> &'static str {
        let kelvins = self.temperature_change.map(Kelvins::get);
        match self.kind {
            CriterionKind::Slope { .. } if kelvins == Some(1.0) => {
                "1 K/h as in IEC 60598-1 12.4.1; its 95 % bound is a house default"
            }
            CriterionKind::Slope { .. } if kelvins == Some(2.0) => {
                "2 K/h as in IEC 60034-1; its 95 % bound is a house default"
            }
            CriterionKind::ChangeWithin { interval }
                if kelvins == Some(1.0) && interval == Seconds::whole(600) =>
            {
                "three readings 5 min apart within 1 K as in IEC 61810-7"
            }
            CriterionKind::Slope { .. } | CriterionKind::ChangeWithin { .. } => "house default",
            CriterionKind::ThreeReadings => "UL 1278 39.1.8",
            CriterionKind::SamplingMethod => "IEC 62301 ed. 2, from memory",
        }
    }
}

/// What settling needs to know of a soak beside its rows.
#[derive(Debug, Clone, PartialEq)]
pub struct Soaking {
    /// The soak; `every` is that of the slowest watched instrument.
    pub soak: Soak,
    /// Whether a thermostat is declared.
    pub cycling: bool,
    /// How the input depends on voltage and ambient.
    pub element: HeatingElement,
    /// Whether a fan runs on the mains.
    pub fan: bool,
    /// Resolution of the power reading; zero where none is stated.
    pub power_resolution: Watts,
    /// Resolution of the coarser one of body and ambient; zero where none is stated.
    pub temperature_resolution: Kelvins,
}
