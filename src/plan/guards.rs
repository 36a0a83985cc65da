//! Guards: limits that trip. None may be absent.

use super::reference::rated_in;
use super::types::{Cell, Guards, PlannedAppliance, PlannedBay, PlannedInstrument, PlannedRule};
use crate::quantity::{Celsius, Kelvins, Seconds, Watts};
use crate::spec::plate;
use crate::spec::sequence::{GuardLimits, RuleKind, RuleWeight, Span};

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
    let input = cells.iter().map(|cell| {
        // Without plate and rule the bay's wiring is all that is known.
        let wiring = bay.rated_current.get() * cell.supply.voltage.get();
        let upper = upper_limit(appliance, cell, rules);
        Watts::of(upper.map_or(wiring, |upper| INPUT_FACTOR * upper))
    });
    Guards {
        body: body_limit(stated, appliance),
        current: bay.rated_current,
        input_after: stated.input_after.unwrap_or(INPUT_AFTER),
        input: input.collect(),
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

/// The upper limit of a cell's input: an explicit limit that decides, else the band of
/// its plate entry, else an explicit limit that only informs (it must not cut short
/// what the plate allows), else the band of the highest entry.
fn upper_limit(appliance: &PlannedAppliance, cell: &Cell, rules: &[PlannedRule]) -> Option<f64> {
    explicit(cell, rules, RuleWeight::Required)
        .or_else(|| of_plate(appliance, cell))
        .or_else(|| explicit(cell, rules, RuleWeight::Information))
        .or_else(|| highest(appliance.plate.iter().map(|e| upper(appliance, e.power))))
}

fn explicit(cell: &Cell, rules: &[PlannedRule], weight: RuleWeight) -> Option<f64> {
    let limits = rules
        .iter()
        .filter(|rule| rule.weight == weight && rule.is_for(cell))
        .filter_map(|rule| match rule.kind {
            RuleKind::PowerLimits { at_most, .. } => at_most,
            _ => None,
        });
    highest(limits.map(Watts::get))
}

fn of_plate(appliance: &PlannedAppliance, cell: &Cell) -> Option<f64> {
    if let Some(rated) = rated_in(&appliance.plate, cell) {
        return Some(upper(appliance, rated.rated));
    }
    // Rated element by element: together they are the whole.
    let elements: Vec<f64> = appliance
        .plate
        .iter()
        .filter(|entry| entry.position == cell.position)
        .map(|entry| upper(appliance, entry.power))
        .collect();
    (!elements.is_empty()).then(|| elements.iter().sum())
}

fn upper(appliance: &PlannedAppliance, power: Span<Watts>) -> f64 {
    plate::limits(appliance.kind, power).at_most.get()
}

fn highest(values: impl Iterator<Item = f64>) -> Option<f64> {
    values.reduce(f64::max)
}
