//! Which promise of the plate a cell is run for.

use crate::plan::{Cell, Plan};
use crate::quantity::at_most;
use crate::spec::plate::{self, CORRECTABLE, PlatePoint};

/// The plate's promises for one position: supplies at which it is judged. Entries
/// that rate a single element promise nothing of the whole and are left out.
pub fn plate_points(plan: &Plan, position: &str) -> Vec<PlatePoint> {
    let fan = plan.appliance.fan;
    plan.appliance
        .plate
        .iter()
        .filter(|entry| entry.position == position && entry.element.is_none())
        .flat_map(|entry| plate::points(entry.voltage, entry.frequency, entry.power, fan))
        .collect()
}

/// The plate's promise that a cell is run for: the nearest voltage of an entry for
/// its position and frequency, where the input can be referred to it.
pub fn plate_point(plan: &Plan, cell: &Cell) -> Option<PlatePoint> {
    let distance = |point: &PlatePoint| off(point, cell);
    points_in_reach(plan, cell)
        .into_iter()
        .min_by(|a, b| distance(a).total_cmp(&distance(b)))
}

/// Every promise of the plate that a cell's input can be referred to.
pub fn points_in_reach(plan: &Plan, cell: &Cell) -> Vec<PlatePoint> {
    let mut points = plate_points(plan, &cell.position);
    points.retain(|point| point.has_frequency(cell.supply.frequency));
    points.retain(|point| at_most(off(point, cell), CORRECTABLE));
    points
}

fn off(point: &PlatePoint, cell: &Cell) -> f64 {
    (cell.supply.voltage.get() / point.voltage.get() - 1.0).abs()
}
