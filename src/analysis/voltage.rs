//! Referring an input to another voltage, and which plate voltage a cell is for.

use crate::plan::{Cell, Plan, PlannedAppliance};
use crate::quantity::{at_most, shortest};
use crate::spec::plate::{self, PlatePoint};
use crate::spec::sequence::HeatingElement;
use crate::stats::RECTANGULAR;

use super::types::{Estimate, Figure, Share};

/// Beyond this share of the wanted voltage an input is not corrected (house default).
const CORRECTABLE: f64 = 0.06;

/// The interval in which d ln P / d ln V lies (house defaults, computed from the
/// PTC model): plain resistor 1.95..2; PTC in still air 0..0.3; PTC with a fan on
/// the mains 0..1.2. Never V squared for a PTC.
pub(super) fn exponents(appliance: &PlannedAppliance) -> (f64, f64) {
    match (appliance.element, appliance.fan) {
        (HeatingElement::Resistor, _) => (1.95, 2.0),
        (HeatingElement::Ptc, false) => (0.0, 0.3),
        (HeatingElement::Ptc, true) => (0.0, 1.2),
    }
}

/// How an input changes from one voltage to another.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Referral {
    /// Factor on the input.
    pub(super) factor: f64,
    /// Relative standard uncertainty that the exponent's interval adds.
    pub(super) relative: f64,
}

/// From `from` to `to` volts, with the middle exponent and the interval's width.
///
/// # Errors
/// Beyond the correctable distance, in words.
pub(super) fn referral(
    appliance: &PlannedAppliance,
    from: f64,
    to: f64,
) -> Result<Referral, String> {
    let distance = (from - to).abs() / to;
    if from <= 0.0 || !at_most(distance, CORRECTABLE) {
        return Err(format!(
            "{from:.1} V is {:.1} % off {} V, and beyond {} % an input is not corrected",
            100.0 * distance,
            shortest(to),
            shortest(100.0 * CORRECTABLE),
        ));
    }
    let (low, high) = exponents(appliance);
    let ratio = libm::log(to / from);
    Ok(Referral {
        factor: libm::exp(0.5 * (low + high) * ratio),
        relative: 0.5 * (high - low) * ratio.abs() / RECTANGULAR,
    })
}

/// An input estimated at `from` volts, referred to `to` volts.
pub fn at_voltage(plan: &Plan, input: &Estimate, from: f64, to: f64) -> Figure<Estimate> {
    let referral = match referral(&plan.appliance, from, to) {
        Ok(referral) => referral,
        Err(reason) => return Figure::Absent(reason),
    };
    let value = input.value * referral.factor;
    let added = referral.relative * value.abs();
    let mut budget: Vec<Share> = input.budget.clone();
    for share in &mut budget {
        share.standard *= referral.factor;
    }
    if added > 0.0 {
        budget.push(Share {
            from: format!(
                "input referred from {} V to {} V",
                shortest(from),
                shortest(to)
            ),
            standard: added,
        });
        budget.sort_by(|a, b| b.standard.total_cmp(&a.standard));
    }
    Figure::Known(Estimate {
        value,
        expanded: libm::hypot(input.expanded * referral.factor, input.coverage * added),
        coverage: input.coverage,
        budget,
    })
}

/// The plate's promises for one position: voltages at which it is judged. Entries
/// that rate a single element promise nothing of the whole and are left out.
pub fn plate_points(plan: &Plan, position: &str) -> Vec<PlatePoint> {
    plan.appliance
        .plate
        .iter()
        .filter(|entry| entry.position == position && entry.element.is_none())
        .flat_map(|entry| plate::points(entry.voltage, entry.power))
        .collect()
}

/// The plate's promise that a cell is run for: the nearest voltage of an entry for
/// its position and frequency, where the input can be referred to it.
pub fn plate_point(plan: &Plan, cell: &Cell) -> Option<PlatePoint> {
    let volts = cell.supply.voltage.get();
    let hertz = cell.supply.frequency.get();
    let distance = |point: &PlatePoint| (volts / point.voltage.get() - 1.0).abs();
    plan.appliance
        .plate
        .iter()
        .filter(|entry| entry.position == cell.position && entry.element.is_none())
        .filter(|entry| {
            let frequency = entry.frequency;
            // Half a hertz beside the plate's is the supply's own business.
            (frequency.low.get() - 0.5..=frequency.high.get() + 0.5).contains(&hertz)
        })
        .flat_map(|entry| plate::points(entry.voltage, entry.power))
        .filter(|point| at_most(distance(point), CORRECTABLE))
        .min_by(|a, b| distance(a).total_cmp(&distance(b)))
}
