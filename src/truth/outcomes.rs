//! What is said of units whose truth is known: by how near it lies to a limit, and by
//! what is wrong with them.

use super::coverage::Quantity;
use super::equilibrium::Settled;
use super::play::Played;
use super::setting::{Kind, Setting};
use crate::judge::Outcome;
use crate::plan::Plan;
use crate::spec::plate;
use crate::spec::sequence::RuleKind;

/// How the units of one group were judged.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default)]
pub struct Outcomes {
    /// By [`Outcome`], in the order of [`Outcomes::ORDER`].
    pub counts: [u64; 5],
}

impl Outcomes {
    /// The order of the counts.
    pub const ORDER: [Outcome; 5] = [
        Outcome::Pass,
        Outcome::ConditionalPass,
        Outcome::ConditionalFail,
        Outcome::Fail,
        Outcome::NotJudged,
    ];

    pub(super) fn add(&mut self, outcome: Outcome) {
        if let Some(at) = Self::ORDER.iter().position(|o| *o == outcome) {
            self.counts[at] += 1;
        }
    }

    /// How many came out so.
    pub fn of(&self, outcome: Outcome) -> u64 {
        let at = Self::ORDER.iter().position(|o| *o == outcome);
        at.map_or(0, |at| self.counts[at])
    }

    /// How many there are.
    pub fn all(&self) -> u64 {
        self.counts.iter().sum()
    }

    /// Passed, conditionally or not.
    pub fn passed(&self) -> u64 {
        self.of(Outcome::Pass) + self.of(Outcome::ConditionalPass)
    }

    /// Failed, conditionally or not.
    pub fn found(&self) -> u64 {
        self.of(Outcome::Fail) + self.of(Outcome::ConditionalFail)
    }
}

/// Where the truth of a unit lies.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord)]
pub enum Place {
    /// Within every limit by more than 2 U.
    Clear,
    /// Within every limit, nearer than 2 U to one.
    Near,
    /// Beyond a limit by less than 2 U.
    Beyond,
    /// Beyond a limit by more than 2 U.
    FarBeyond,
}

impl Place {
    /// All.
    pub const ALL: [Place; 4] = [Place::Clear, Place::Near, Place::Beyond, Place::FarBeyond];

    /// In words.
    pub fn words(self) -> &'static str {
        match self {
            Place::Clear => "within every limit by more than 2 U",
            Place::Near => "within every limit, nearer than 2 U to one",
            Place::Beyond => "beyond a limit by less than 2 U",
            Place::FarBeyond => "beyond a limit by more than 2 U",
        }
    }

    /// From the smallest true margin in units of U.
    fn of(margin: f64) -> Self {
        match margin {
            m if m > 2.0 => Place::Clear,
            m if m >= 0.0 => Place::Near,
            m if m > -2.0 => Place::Beyond,
            _ => Place::FarBeyond,
        }
    }
}

/// What U is about where a run left none: 0.6 % of the power, 1.8 K.
const USUAL: (f64, f64) = (0.006, 1.8);

/// Where the truth of a unit lies among the limits of its plan.
pub(super) fn place(setting: &Setting, played: &Played, truths: &[Settled]) -> Place {
    let plan = &*setting.plan;
    let mut least = f64::INFINITY;
    for (cell, truth) in plan.cells.iter().zip(truths) {
        let u = |quantity: Quantity, usual: f64| {
            let result = played.cell(&cell.position);
            let estimate = result.and_then(|result| quantity.of(result));
            estimate.map_or(usual, |estimate| estimate.expanded)
        };
        let power = u(Quantity::Power, USUAL.0 * truth.power_w);
        let warmth = u(Quantity::Worst, USUAL.1);
        for (low, high) in power_limits(plan, &cell.position) {
            let margin = (truth.power_w - low).min(high - truth.power_w);
            least = least.min(margin / power);
        }
        for limit in link_limits(plan) {
            least = least.min((limit - truth.worst_degc) / warmth);
        }
    }
    Place::of(least)
}

/// Limits of the power in a position: its plate's band and the sequence's own.
fn power_limits(plan: &Plan, position: &str) -> Vec<(f64, f64)> {
    let entries = &plan.appliance.plate;
    let bands = entries.iter().filter(|e| e.position == position).map(|e| {
        let band = plate::limits(plan.appliance.kind, e.power);
        let low = band.at_least.map_or(f64::NEG_INFINITY, |w| w.get());
        (low, band.at_most.get())
    });
    let own = plan.rules.iter().filter_map(|rule| match rule.kind {
        RuleKind::PowerLimits { at_least, at_most }
            if rule.position.as_deref().is_none_or(|p| p == position) =>
        {
            let low = at_least.map_or(f64::NEG_INFINITY, |w| w.get());
            Some((low, at_most.map_or(f64::INFINITY, |w| w.get())))
        }
        _ => None,
    });
    bands.chain(own).collect()
}

fn link_limits(plan: &Plan) -> Vec<f64> {
    let link = plan.appliance.link.as_ref();
    let limit = |rule: &crate::plan::PlannedRule| match rule.kind {
        RuleKind::LinkHolding => link?.th.map(|th| th.get()),
        RuleKind::LinkOpening => Some(link?.opens_from.get()),
        _ => None,
    };
    plan.rules.iter().filter_map(limit).collect()
}

/// One fault in one appliance.
#[derive(Debug, Clone, PartialEq)]
pub struct FaultRow {
    /// The fault's name.
    pub fault: &'static str,
    /// The appliance.
    pub kind: Kind,
    /// How its units were judged.
    pub outcomes: Outcomes,
}

/// Faults of the unit, and whether only the fan appliance can have them.
pub(super) const UNIT_FAULTS: [(&str, bool); 8] = [
    ("dead-unit", false),
    ("link-opens-mid-soak", false),
    ("wrong-element", false),
    ("loose-clamp", false),
    ("stuck-fan", true),
    ("wrong-link", false),
    ("swapped-positions", true),
    ("shorted-element", false),
];

/// Faults of the sensor, and whether they can come up while it is energised.
pub(super) const SENSOR_FAULTS: [(&str, bool); 5] = [
    ("sensor-fallen-off", true),
    ("swapped-channels", false),
    ("sensor-open", true),
    ("sensor-reversed", false),
    ("sensor-wrong-type", false),
];

#[cfg(test)]
mod tests {
    use super::*;
    use crate::virtual_bench::Fault;

    #[test]
    fn every_fault_of_unit_and_sensor_is_tried() {
        let tried: Vec<&str> = UNIT_FAULTS
            .iter()
            .chain(&SENSOR_FAULTS)
            .map(|f| f.0)
            .collect();
        for (name, fault) in Fault::ALL.map(|name| (name, name.parse::<Fault>().unwrap())) {
            let of_a_line_or_meter = matches!(
                fault,
                Fault::NoReply(_)
                    | Fault::LateReply(_)
                    | Fault::Garbled(_)
                    | Fault::Echo(_)
                    | Fault::Disconnect(_)
                    | Fault::WrongIdentity(_)
                    | Fault::ErrorQueue(_)
                    // Shows on a half-wave load only, of which the population has none.
                    | Fault::MeterLosesDc(_)
            );
            assert_eq!(tried.contains(&name), !of_a_line_or_meter, "{name}");
        }
    }

    #[test]
    fn places_part_at_zero_and_two() {
        for (margin, place) in [
            (2.1, Place::Clear),
            (2.0, Place::Near),
            (0.0, Place::Near),
            (-0.1, Place::Beyond),
            (-2.0, Place::FarBeyond),
        ] {
            assert_eq!(Place::of(margin), place, "{margin}");
        }
    }
}
