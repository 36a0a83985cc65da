//! The rules of a sequence as typed values: what is compared, and how it is decided.

use serde::{Deserialize, Serialize};

use super::Located;
use crate::quantity::{Amps, Dimension, Kelvins, Ratio, Seconds, Watts};

/// One rule of the verdict.
#[derive(Debug, Clone, PartialEq)]
pub struct Rule {
    /// What it compares.
    pub kind: Located<RuleKind>,
    /// `decision:` (house default: four outcomes).
    pub decision: Decision,
    /// `weight:` (default: required).
    pub weight: RuleWeight,
    /// `position:` that it is for; absent: every position it can be for.
    pub position: Option<Located<String>>,
    /// `condition:` that it is for; absent: the worst.
    pub condition: Option<Located<String>>,
    /// `source:` of its limits; absent: the standard that the rule names, or `house limit`.
    pub source: Option<String>,
    /// `process:` what units of the appliance are known to spread by; the risks of the
    /// decision are then said beside it.
    pub process: Option<ProcessSpread>,
    /// `cycling:` which input of a cycling load a power rule compares.
    pub cycling: CyclingRule,
}

/// How a quantity spreads over the units of an appliance (a normal distribution).
#[derive(Debug, Clone, Copy, PartialEq, Serialize, Deserialize)]
pub struct ProcessSpread {
    /// `mean:` base unit of the rule's quantity.
    pub mean: f64,
    /// `spread:` standard deviation, base unit.
    pub spread: f64,
}

/// Which input of a cycling load is judged.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default, Serialize, Deserialize)]
#[serde(rename_all = "snake_case")]
pub enum CyclingRule {
    /// `on-state`: while it is on.
    #[default]
    OnState,
    /// `representative period`: where the maximum exceeds twice the mean, the value
    /// exceeded for more than 10 % of the period; else the mean (IEC 60335-1 clause
    /// 10.1, from memory).
    RepresentativePeriod,
}

impl CyclingRule {
    /// The words in YAML.
    pub fn word(self) -> &'static str {
        match self {
            CyclingRule::OnState => "on-state",
            CyclingRule::RepresentativePeriod => "representative period",
        }
    }
}

/// What a rule compares.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub enum RuleKind {
    /// `power: plate` bands of IEC 60335-1 clause 10.1.
    PlatePower,
    /// `power: {at least, at most}` explicit limits.
    PowerLimits {
        /// Lower limit.
        at_least: Option<Watts>,
        /// Upper limit.
        at_most: Option<Watts>,
    },
    /// `thermal link: holding` worst body temperature against Th.
    LinkHolding,
    /// `thermal link: earliest opening` worst body temperature against Tf - 10 K.
    LinkOpening,
    /// `thermal link: {below Tf}` worst body temperature against a house limit,
    /// the lower of Th and Tf less this.
    LinkHouse {
        /// Kelvins below Tf.
        below_tf: Kelvins,
    },
    /// `thermal link: after opening` body after the link opened, against Tm.
    LinkMaximum,
    /// `inrush: {at most}` highest RMS current from a cold start.
    Inrush {
        /// Upper limit.
        at_most: Amps,
    },
    /// `inrush: {momentary at most}` highest momentary current from a cold start, of a
    /// waveform.
    MomentaryInrush {
        /// Upper limit.
        at_most: Amps,
    },
    /// `harmonics: class A` of IEC 61000-3-2, of a waveform.
    HarmonicsClassA,
    /// `voltage change: {dmax, dc, time above 3.3 %}` on the reference impedance of
    /// IEC 61000-3-3, of a waveform; at least one is there.
    VoltageChange {
        /// Largest relative change.
        dmax: Option<Ratio>,
        /// Steady relative change.
        dc: Option<Ratio>,
        /// Longest time above 3.3 %.
        time_above: Option<Seconds>,
    },
    /// `order of positions: rising` the input rises in the declared order.
    PositionOrder,
    /// `temperature: {role, rise at most}` another temperature as a rise over ambient.
    TemperatureRise {
        /// The role.
        role: String,
        /// Upper limit.
        at_most: Kelvins,
    },
}

impl RuleKind {
    /// What it compares, as its U is stated in; absent where that is more than one.
    pub fn dimension(&self) -> Option<Dimension> {
        match self {
            RuleKind::PlatePower | RuleKind::PowerLimits { .. } | RuleKind::PositionOrder => {
                Some(Dimension::Power)
            }
            RuleKind::LinkHolding
            | RuleKind::LinkOpening
            | RuleKind::LinkHouse { .. }
            | RuleKind::LinkMaximum
            | RuleKind::TemperatureRise { .. } => Some(Dimension::TemperatureDifference),
            RuleKind::Inrush { .. }
            | RuleKind::MomentaryInrush { .. }
            | RuleKind::HarmonicsClassA => Some(Dimension::Current),
            // Several quantities in one rule.
            RuleKind::VoltageChange { .. } => None,
        }
    }
}

/// How a value near a limit is decided.
#[derive(Debug, Clone, Copy, PartialEq, Serialize, Deserialize)]
pub enum Decision {
    /// The value alone, whatever its uncertainty: findings of the house that compare
    /// no uncertain value.
    Simple,
    /// `simple`: the value alone, where U is at most what is stated; else not judged.
    SimpleUpTo {
        /// `largest U:` base unit of the rule's quantity.
        largest: f64,
    },
    /// `guarded`: guard band of `ratio` times U.
    Guarded {
        /// `guard:` r of r U.
        ratio: f64,
    },
    /// `four outcomes`: guard band U on both sides of the limit.
    FourOutcomes,
}

/// Whether a rule decides or only informs.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize, Deserialize)]
#[serde(rename_all = "lowercase")]
pub enum RuleWeight {
    /// It takes part in the unit's verdict.
    Required,
    /// It is printed and decides nothing.
    Information,
}
