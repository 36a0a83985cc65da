//! Voltages and currents against what plate, bay, supply and sensors bear.

use super::notes::Notes;
use super::reference::rated_points;
use super::types::PlannedAppliance;
use super::wiring::Wired;
use crate::quantity::{Volts, at_least, at_most};
use crate::spec::Located;
use crate::spec::bench::Bay;
use crate::spec::sequence::{RoleKind, RuleKind, Sequence, StepAction, SupplyPoint};

/// A supply further than this from the plate's range is warned of.
const FAR_FROM_PLATE: f64 = 0.1;

/// Reports everything that does not fit.
pub(super) fn ratings(
    sequence: &Sequence,
    appliance: &PlannedAppliance,
    bay: &Bay,
    wired: &Wired,
    notes: &mut Notes,
) {
    let supplies = supplies(sequence, notes);
    for supply in &supplies {
        near_the_plate(appliance, supply, notes);
    }
    frequency_can_be_set(&supplies, wired, notes);
    current_fits(sequence, appliance, bay, notes);
    inrush_fits(sequence, bay, notes);
    body_is_isolated(&supplies, bay, wired, notes);
}

/// Every supply that is named; within a block each once.
fn supplies<'a>(sequence: &'a Sequence, notes: &mut Notes) -> Vec<&'a Located<SupplyPoint>> {
    let mut supplies: Vec<&Located<SupplyPoint>> = Vec::new();
    for step in &sequence.steps {
        match &step.action {
            StepAction::Supply(point) => supplies.push(point),
            StepAction::Each(each) => {
                for (n, point) in each.supplies.iter().enumerate() {
                    let before = &each.supplies[..n];
                    if before.iter().any(|other| other.value == point.value) {
                        notes.error(&point.place, "this supply is listed twice", "take one out");
                    }
                    supplies.push(point);
                }
            }
            _ => {}
        }
    }
    supplies
}

fn near_the_plate(appliance: &PlannedAppliance, supply: &Located<SupplyPoint>, notes: &mut Notes) {
    let volts = supply.value.voltage.get();
    let near = appliance.plate.iter().any(|entry| {
        let (low, high) = (entry.voltage.low.get(), entry.voltage.high.get());
        at_least(volts, low * (1.0 - FAR_FROM_PLATE))
            && at_most(volts, high * (1.0 + FAR_FROM_PLATE))
    });
    if !appliance.plate.is_empty() && !near {
        notes.warning(
            &supply.place,
            format!(
                "{} is more than 10 % away from every voltage of the plate",
                supply.value.voltage
            ),
            "results at this supply can't be referred to the plate",
        );
    }
}

/// A supply that can't set a frequency feeds the one that it has.
fn frequency_can_be_set(supplies: &[&Located<SupplyPoint>], wired: &Wired, notes: &mut Notes) {
    let Some(role) = wired.bay.roles.iter().find(|r| r.kind == RoleKind::Supply) else {
        return;
    };
    let driver = &wired.instruments[role.instrument].driver;
    let Some((first, rest)) = supplies.split_first() else {
        return;
    };
    if driver.settings.frequency.is_some() {
        return;
    }
    let frequency = first.value.frequency;
    for other in rest.iter().filter(|s| s.value.frequency != frequency) {
        notes.error(
            &other.place,
            format!(
                "the supply can't change its frequency from {frequency} to {}",
                other.value.frequency
            ),
            format!(
                "driver `{}` has no `frequency` below `settings:`; add it, or keep to one frequency",
                driver.name
            ),
        );
    }
}

/// The plate's current at the voltages at which it is judged.
fn current_fits(sequence: &Sequence, appliance: &PlannedAppliance, bay: &Bay, notes: &mut Notes) {
    for (entry, written) in appliance.plate.iter().zip(&sequence.appliance.plate) {
        let amps = rated_points(entry, appliance.fan)
            .into_iter()
            .map(|rated| rated.rated.high.get() / rated.voltage.get())
            .fold(0.0, f64::max);
        if !at_most(amps, bay.rated_current.get()) {
            notes.error(
                &written.power.place,
                format!(
                    "the plate's {amps:.2} A is above the rated current of bay `{}`, {}",
                    bay.name.value, bay.rated_current
                ),
                "use a bay that is rated for it",
            );
        }
    }
}

fn inrush_fits(sequence: &Sequence, bay: &Bay, notes: &mut Notes) {
    for rule in &sequence.rules {
        let RuleKind::Inrush { at_most: limit } = rule.kind.value else {
            continue;
        };
        if !at_most(limit.get(), bay.rated_current.get()) {
            notes.warning(
                &rule.kind.place,
                format!(
                    "the limit {limit} is above the rated current of bay `{}`, {}: the guard trips first",
                    bay.name.value, bay.rated_current
                ),
                "use a bay that is rated for it, or a lower limit",
            );
        }
    }
}

/// The body that is watched may be live.
fn body_is_isolated(
    supplies: &[&Located<SupplyPoint>],
    bay: &Bay,
    wired: &Wired,
    notes: &mut Notes,
) {
    let body = wired.bay.roles.iter().find(|role| role.name == "body");
    let filled = bay.roles.iter().find(|filled| filled.role.value == "body");
    let highest = supplies
        .iter()
        .map(|supply| supply.value.voltage.get())
        .reduce(f64::max);
    let (Some(body), Some(filled), Some(highest)) = (body, filled, highest) else {
        return;
    };
    let driver = &wired.instruments[body.instrument].driver;
    let states = match driver.isolation {
        Some(isolation) if at_least(isolation.get(), highest) => return,
        Some(isolation) => format!("isolates its sensor inputs up to {isolation} only"),
        None => "states no isolation of its sensor inputs".to_owned(),
    };
    let highest = Volts::of(highest);
    notes.warning(
        &filled.instrument.place,
        format!(
            "driver `{}` {states}: a sensor on a body that is live at {highest} makes every channel live",
            driver.name
        ),
        format!(
            "use insulated sensors rated for {highest}, and state `isolation:` in the driver from the instrument's manual"
        ),
    );
}
