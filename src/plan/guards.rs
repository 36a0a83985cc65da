//! Guards: limits that trip. None may be absent.

use super::types::{
    Cell, Guards, PlannedAppliance, PlannedBay, PlannedInstrument, PlannedRule,
};
use crate::quantity::{Celsius, Kelvins, Seconds, Watts};
use crate::spec::plate;
use crate::spec::sequence::{GuardLimits, RuleKind};

/// House default: trip at this multiple of the upper limit of the input.
const INPUT_FACTOR: f64 = 1.3;

/// House default: from when on the input is guarded.
const INPUT_AFTER: Seconds = Seconds::whole(60);

/// House default: shortest silence that counts.
const SHORTEST_SILENCE: f64 = 2.0;

/// House default: updates that may be missed.
const MISSED_UPDATES: f64 = 3.0;

/// House default: a body that is believed rises by this much ...
const LEAST_RISE: f64 = 10.0;

/// ... within this time.
const RISE_WITHIN: Seconds = Seconds::whole(300);

/// Every guard of a plan.
pub(super) fn guards(
    stated: &GuardLimits,
    appliance: &PlannedAppliance,
    bay: &PlannedBay,
    instruments: &[PlannedInstrument],
    cells: &[Cell],
    rules: &[PlannedRule],
) -> Guards {
    let silence = bay.roles.iter().map(|role| {
        let update = instruments[role.instrument].driver.update_interval.get();
        Seconds::of((MISSED_UPDATES * update).max(SHORTEST_SILENCE))
    });
    Guards {
        body: body_limit(stated, appliance),
        current: bay.rated_current,
        input_after: stated.input_after.unwrap_or(INPUT_AFTER),
        input: cells
            .iter()
            .map(|cell| input_limit(appliance, cell, rules))
            .collect(),
        silence: silence.collect(),
        least_rise: Kelvins::of(LEAST_RISE),
        rise_within: RISE_WITHIN,
    }
}

/// House default min(Tf - 10 K, the sequence's).
fn body_limit(stated: &GuardLimits, appliance: &PlannedAppliance) -> Option<Celsius> {
    let stated = stated.body.as_ref().map(|body| body.value.get());
    let link = appliance.link.as_ref().map(|link| link.opens_from.get());
    let lowest = [stated, link].into_iter().flatten().reduce(f64::min);
    lowest.map(Celsius::of)
}

fn input_limit(appliance: &PlannedAppliance, cell: &Cell, rules: &[PlannedRule]) -> Watts {
    let upper = upper_limit_of(appliance, &cell.position, rules)
        .or_else(|| {
            highest(
                appliance
                    .plate
                    .iter()
                    .map(|entry| upper_of(appliance, entry)),
            )
        })
        .unwrap_or(0.0);
    Watts::of(INPUT_FACTOR * upper)
}

/// The explicit limit of a rule for the position, else its plate's band.
fn upper_limit_of(
    appliance: &PlannedAppliance,
    position: &str,
    rules: &[PlannedRule],
) -> Option<f64> {
    let explicit = rules
        .iter()
        .filter_map(|rule| match (&rule.kind, &rule.position) {
            (
                RuleKind::PowerLimits {
                    at_most: Some(at_most),
                    ..
                },
                Some(p),
            ) if p == position => Some(at_most.get()),
            _ => None,
        });
    let plate = appliance
        .plate
        .iter()
        .filter(|entry| entry.position == position && entry.element.is_none());
    highest(explicit).or_else(|| highest(plate.map(|entry| upper_of(appliance, entry))))
}

fn upper_of(appliance: &PlannedAppliance, entry: &super::types::PlannedPlate) -> f64 {
    plate::limits(appliance.kind, entry.power).at_most.get()
}

fn highest(values: impl Iterator<Item = f64>) -> Option<f64> {
    values.reduce(f64::max)
}
