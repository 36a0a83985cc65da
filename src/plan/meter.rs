//! Whether the power meter can carry a decision, known before anything is energised.

use super::notes::Notes;
use super::reference::rated_points;
use super::types::{PlannedAppliance, PlannedInstrument, PlannedRule};
use super::wiring::Wired;
use crate::quantity::{Reading, Watts, at_most};
use crate::spec::plate;
use crate::spec::sequence::{Decision, RoleKind, RuleKind, Sequence};
use crate::spec::{Located, Place};

/// Coverage factor of an expected uncertainty.
const COVERAGE: f64 = 2.0;

/// Warns of every power rule whose limits are nearer to each other than the meter's
/// uncertainty allows.
pub(super) fn meter_fits(
    sequence: &Sequence,
    appliance: &PlannedAppliance,
    rules: &[PlannedRule],
    wired: &Wired,
    notes: &mut Notes,
) {
    let role = wired
        .bay
        .roles
        .iter()
        .find(|r| r.kind == RoleKind::PowerMeter);
    let Some(meter) = role.map(|role| &wired.instruments[role.instrument]) else {
        return;
    };
    for (rule, written) in rules.iter().zip(&sequence.rules) {
        let band = share_of_u(rule.decision);
        match rule.kind {
            RuleKind::PlatePower => {
                let entries = appliance.plate.iter().zip(&sequence.appliance.plate);
                let wanted =
                    |position: &String| rule.position.as_ref().is_none_or(|p| p == position);
                for (entry, at) in entries.filter(|(entry, _)| wanted(&entry.position)) {
                    for rated in rated_points(entry, appliance.fan) {
                        let limits = plate::limits(appliance.kind, rated.rated);
                        let room = Room {
                            at: rated.rated.high,
                            at_least: limits.at_least,
                            at_most: limits.at_most,
                        };
                        room.holds(meter, band, &at.power.place, notes);
                        simple_fits(meter, rule.decision, room.at, &at.power.place, notes);
                    }
                }
            }
            RuleKind::PowerLimits {
                at_least: Some(low),
                at_most: Some(high),
            } => {
                let room = Room {
                    at: Watts::of(0.5 * (low.get() + high.get())),
                    at_least: Some(low),
                    at_most: high,
                };
                room.holds(meter, band, &written.kind.place, notes);
                simple_fits(meter, rule.decision, room.at, &written.kind.place, notes);
            }
            _ => {}
        }
    }
    for (entry, at) in appliance.plate.iter().zip(&sequence.appliance.plate) {
        within_ranges(meter, entry.power.high, &at.power, notes);
    }
}

/// How many U the limits must leave room for: the guard band, and U itself, beyond
/// which no measurement is fit for them.
fn share_of_u(decision: Decision) -> f64 {
    match decision {
        Decision::Guarded { ratio } => ratio.max(1.0),
        Decision::Simple | Decision::SimpleUpTo { .. } | Decision::FourOutcomes => 1.0,
    }
}

/// A simple decision is good for a stated U only.
fn simple_fits(
    meter: &PlannedInstrument,
    decision: Decision,
    at: Watts,
    place: &Place,
    notes: &mut Notes,
) {
    let (Decision::SimpleUpTo { largest }, Some(expanded)) = (decision, expanded(meter, at.get()))
    else {
        return;
    };
    if !at_most(expanded, largest) {
        notes.warning(
            place,
            format!(
                "at {at} the meter's U is {}, and the simple decision is stated for U up to {} only: the power will be not judged",
                rounded(expanded),
                rounded(largest)
            ),
            "state a larger U, or use a more accurate meter",
        );
    }
}

/// Limits around a value.
struct Room {
    at: Watts,
    at_least: Option<Watts>,
    at_most: Watts,
}

impl Room {
    /// Guard bands on both sides leave nothing between them where they exceed half of
    /// the distance between the limits; an upper limit alone leaves nothing for a unit
    /// that draws what it is rated for.
    fn holds(&self, meter: &PlannedInstrument, band: f64, place: &Place, notes: &mut Notes) {
        let Some(expanded) = expanded(meter, self.at.get()) else {
            return;
        };
        let high = self.at_most.get();
        let (room, then) = match self.at_least {
            Some(low) => (0.5 * (high - low.get()), "the power will be not judged"),
            None => (high - self.at.get(), "the power will be not judged"),
        };
        if !at_most(band * expanded, room) {
            notes.warning(
                place,
                format!(
                    "at {} the meter's U is {}, the limits leave {}: {then}",
                    self.at,
                    rounded(expanded),
                    rounded(room)
                ),
                "use a meter with a range that fits, or a more accurate one",
            );
        }
    }
}

/// Three significant digits, for a message.
fn rounded(watts: f64) -> Watts {
    let digits = format!("{watts:.2e}");
    Watts::of(digits.parse().unwrap_or(watts))
}

/// Expected U at a power: accuracy on the range in force and resolution as rectangular
/// distributions, calibration as its certificate states it (JCGM 100, 4.3.7 and F.2.2.1).
fn expanded(meter: &PlannedInstrument, watts: f64) -> Option<f64> {
    let accuracy = meter.driver.accuracy_of(Reading::Power)?;
    let standard = [
        accuracy.half_width(watts) / 3f64.sqrt(),
        accuracy.resolution / 12f64.sqrt(),
        calibrated(meter, watts),
    ];
    let squares: f64 = standard.iter().map(|u| u * u).sum();
    Some(COVERAGE * squares.sqrt())
}

/// Standard uncertainty of the calibration point nearest to a power; none stated is 0,
/// which the missing certificate is warned of by.
fn calibrated(meter: &PlannedInstrument, watts: f64) -> f64 {
    meter
        .calibration
        .iter()
        .filter(|point| point.reading == Reading::Power && point.coverage > 0.0)
        .min_by(|a, b| (a.at - watts).abs().total_cmp(&(b.at - watts).abs()))
        .map_or(0.0, |point| point.expanded / point.coverage)
}

fn within_ranges<T>(meter: &PlannedInstrument, power: Watts, at: &Located<T>, notes: &mut Notes) {
    let accuracy = meter.driver.accuracy_of(Reading::Power);
    let largest = accuracy.and_then(|accuracy| accuracy.ranges.last().copied());
    if let Some(largest) = largest
        && !at_most(power.get(), largest)
    {
        notes.warning(
            &at.place,
            format!(
                "{power} is above the largest range of `{}`, {}",
                meter.name,
                Watts::of(largest)
            ),
            "use a meter with a larger range",
        );
    }
}
