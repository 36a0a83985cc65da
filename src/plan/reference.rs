//! What a plate entry says at a supply: at which voltage, and which power.

use super::types::{Cell, Plan, PlannedAppliance, PlannedPlate};
use crate::quantity::{Volts, at_most};
use crate::spec::plate::{self, PlatePoint};

impl Plan {
    /// The plate entry that rates the whole appliance in a position.
    pub fn plate_of(&self, position: &str) -> Option<&PlannedPlate> {
        self.appliance
            .plate
            .iter()
            .find(|entry| rates_whole(entry, position))
    }

    /// What the plate promises for a cell: a narrow range at its mean, a wide one (or
    /// one with an input marked for both ends) at the end that the supply is nearer to,
    /// each end with its own power; of several entries the nearest.
    pub fn rated_in(&self, cell: &Cell) -> Option<PlatePoint> {
        rated_in(&self.appliance.plate, cell)
    }
}

/// A supply this near to an end of its range stands for it (house default).
const AT_END: f64 = 0.01;

impl PlannedAppliance {
    /// Lowest and highest voltage at which it may be used in a position: the sequence's
    /// supply range, else the plate's for that position, else the whole plate's.
    pub fn supply_ends(&self, position: &str) -> (Volts, Volts) {
        if let Some(range) = self.supply_range {
            return (range.low, range.high);
        }
        let of_it = |entry: &&PlannedPlate| entry.position == position;
        let mine: Vec<&PlannedPlate> = self.plate.iter().filter(of_it).collect();
        let entries: Vec<&PlannedPlate> = if mine.is_empty() {
            self.plate.iter().collect()
        } else {
            mine
        };
        let ends = entries.iter().map(|e| (e.voltage.low, e.voltage.high));
        ends.reduce(|a, b| {
            let low = if b.0 < a.0 { b.0 } else { a.0 };
            let high = if b.1 > a.1 { b.1 } else { a.1 };
            (low, high)
        })
        .unwrap_or((Volts::of(0.0), Volts::of(0.0)))
    }

    /// Whether a cell is run at an end of the supply range.
    pub fn is_at_end(&self, cell: &Cell, end: Volts) -> bool {
        let away = (cell.supply.voltage.get() - end.get()).abs();
        at_most(away, AT_END * end.get())
    }
}

/// See [`Plan::rated_in`].
pub(super) fn rated_in(plate: &[PlannedPlate], cell: &Cell) -> Option<PlatePoint> {
    let supply = cell.supply.voltage.get();
    let distance = |point: &PlatePoint| (point.voltage.get() - supply).abs();
    plate
        .iter()
        .filter(|entry| rates_whole(entry, &cell.position))
        .flat_map(|entry| rated_points(entry, false))
        .min_by(|a, b| distance(a).total_cmp(&distance(b)))
}

fn rates_whole(entry: &PlannedPlate, position: &str) -> bool {
    entry.position == position && entry.element.is_none()
}

/// The supplies at which an entry is judged, each with its power.
pub(super) fn rated_points(entry: &PlannedPlate, fan: bool) -> Vec<PlatePoint> {
    plate::points(entry.voltage, entry.frequency, entry.power, fan)
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::quantity::{Hertz, Watts};
    use crate::spec::sequence::{Span, SupplyPoint};

    fn entry(low: f64, high: f64, powers: (f64, f64)) -> PlannedPlate {
        PlannedPlate {
            position: "on".to_owned(),
            element: None,
            voltage: Span {
                low: Volts::of(low),
                high: Volts::of(high),
            },
            frequency: Span {
                low: Hertz::of(50.0),
                high: Hertz::of(50.0),
            },
            power: Span {
                low: Watts::of(powers.0),
                high: Watts::of(powers.1),
            },
        }
    }

    fn at(plate: &[PlannedPlate], volts: f64) -> (f64, f64, f64) {
        let cell = Cell {
            condition: None,
            position: "on".to_owned(),
            supply: SupplyPoint {
                voltage: Volts::of(volts),
                frequency: Hertz::of(50.0),
            },
        };
        let rated = rated_in(plate, &cell).unwrap();
        let Span { low, high } = rated.rated;
        (rated.voltage.get(), low.get(), high.get())
    }

    // IEC 60335-1 clause 10.1, from memory.
    #[test]
    fn a_narrow_range_is_judged_at_its_mean_and_a_wide_one_at_its_ends() {
        assert_eq!(
            at(&[entry(220.0, 240.0, (60.0, 60.0))], 235.0),
            (230.0, 60.0, 60.0)
        );
        let wide = [entry(100.0, 240.0, (40.0, 60.0))];
        assert_eq!(at(&wide, 110.0), (100.0, 40.0, 40.0));
        assert_eq!(at(&wide, 230.0), (240.0, 60.0, 60.0));
    }

    #[test]
    fn a_range_of_just_ten_per_cent_is_narrow() {
        assert_eq!(
            at(&[entry(209.0, 231.0, (9.0, 9.0))], 209.0),
            (220.0, 9.0, 9.0)
        );
        assert_eq!(
            at(&[entry(208.9, 231.0, (9.0, 9.0))], 209.0),
            (208.9, 9.0, 9.0)
        );
    }

    #[test]
    fn an_input_marked_for_both_ends_is_judged_at_both_even_of_a_narrow_range() {
        let marked = [entry(220.0, 240.0, (920.0, 1100.0))];
        assert_eq!(at(&marked, 220.0), (220.0, 920.0, 920.0));
        assert_eq!(at(&marked, 240.0), (240.0, 1100.0, 1100.0));
    }

    #[test]
    fn a_span_of_power_at_one_voltage_is_kept_whole() {
        assert_eq!(
            at(&[entry(230.0, 230.0, (45.0, 60.0))], 230.0),
            (230.0, 45.0, 60.0)
        );
    }

    #[test]
    fn of_two_entries_for_one_position_the_nearer_counts() {
        let two = [
            entry(120.0, 120.0, (9.0, 9.0)),
            entry(230.0, 230.0, (10.0, 10.0)),
        ];
        assert_eq!(at(&two, 127.0), (120.0, 9.0, 9.0));
        assert_eq!(at(&two, 220.0), (230.0, 10.0, 10.0));
    }
}
