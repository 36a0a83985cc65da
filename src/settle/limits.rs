//! What a criterion watches, and how far it may change.

use super::points::Point;
use crate::quantity::shortest;
use crate::spec::sequence::{Criterion, CriterionKind, PowerChange};

/// The sampling method's limits per hour: watts up to a power, above it a share of it
/// (IEC 62301 ed. 2, from memory).
const SAMPLED_W: f64 = 0.010;
const SAMPLED_UP_TO_W: f64 = 1.0;
const SAMPLED_SHARE: f64 = 0.01;

/// How far a power may change.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) enum PowerLimit {
    Share(f64),
    Watts(f64),
    Sampled,
}

/// One quantity that a criterion watches, with its limit.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) enum Quantity {
    Power(PowerLimit),
    /// With the limit in kelvins.
    Rise(f64),
}

/// A change and its limit in the unit in which they are written.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Written {
    pub(super) change: f64,
    pub(super) limit: f64,
    pub(super) unit: &'static str,
}

impl Quantity {
    pub(super) fn of(self, point: &Point) -> Option<f64> {
        match self {
            Quantity::Power(_) => point.power,
            Quantity::Rise(_) => point.rise,
        }
    }

    pub(super) fn word(self) -> &'static str {
        match self {
            Quantity::Power(_) => "power",
            Quantity::Rise(_) => "rise of the body",
        }
    }

    /// The limit in watts or kelvins at a mean; nothing where a power has no share.
    pub(super) fn limit(self, mean: f64) -> Option<f64> {
        match self {
            Quantity::Power(_) if mean <= 0.0 => None,
            Quantity::Power(PowerLimit::Share(share)) => Some(share * mean),
            Quantity::Power(PowerLimit::Watts(watts)) => Some(watts),
            Quantity::Power(PowerLimit::Sampled) if mean <= SAMPLED_UP_TO_W => Some(SAMPLED_W),
            Quantity::Power(PowerLimit::Sampled) => Some(SAMPLED_SHARE * mean),
            Quantity::Rise(kelvins) => Some(kelvins),
        }
    }

    /// A change beside its limit as they are written: per cent of `mean`, watts or
    /// kelvins. Nothing where [`Quantity::limit`] is nothing.
    pub(super) fn written(self, change: f64, mean: f64) -> Option<Written> {
        let limit = self.limit(mean)?;
        let shared = match self {
            Quantity::Power(PowerLimit::Share(_)) => true,
            Quantity::Power(PowerLimit::Sampled) => mean > SAMPLED_UP_TO_W,
            Quantity::Power(PowerLimit::Watts(_)) | Quantity::Rise(_) => false,
        };
        let (factor, unit) = match self {
            Quantity::Rise(_) => (1.0, "K"),
            Quantity::Power(_) if shared => (100.0 / mean, "%"),
            Quantity::Power(_) if limit < 1.0 => (1e3, "mW"),
            Quantity::Power(_) => (1.0, "W"),
        };
        Some(Written {
            change: change * factor,
            limit: limit * factor,
            unit,
        })
    }
}

/// What a criterion watches.
pub(super) fn watched(criterion: &Criterion) -> Vec<Quantity> {
    let power = match (criterion.kind, criterion.power_change) {
        (CriterionKind::SamplingMethod, _) => Some(PowerLimit::Sampled),
        (_, Some(PowerChange::Relative(share))) => Some(PowerLimit::Share(share.get())),
        (_, Some(PowerChange::Absolute(watts))) => Some(PowerLimit::Watts(watts.get())),
        (_, None) => None,
    };
    let rise = criterion.temperature_change.map(|k| k.get());
    let power = power.map(Quantity::Power);
    power.into_iter().chain(rise.map(Quantity::Rise)).collect()
}

/// A limit as it was stated, without what the conversion left in the last digits.
pub(super) fn round(value: f64) -> String {
    shortest((value * 1e6).round() / 1e6)
}
