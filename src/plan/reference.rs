//! What a plate entry says at a supply: at which voltage, and which power.

use super::types::{Cell, Plan, PlannedPlate};
use crate::quantity::{Volts, Watts, at_most};
use crate::spec::sequence::Span;

/// A range at most this wide, relative to its mean, is judged at its mean
/// (IEC 60335-1 clause 10.1, from memory).
const NARROW: f64 = 0.1;

/// What the plate promises at one voltage.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Rated {
    /// Voltage that it is for.
    pub voltage: Volts,
    /// Power.
    pub power: Span<Watts>,
}

impl Plan {
    /// The plate entry that rates the whole appliance in a position.
    pub fn plate_of(&self, position: &str) -> Option<&PlannedPlate> {
        self.appliance.plate.iter().find(|entry| entry.position == position && entry.element.is_none())
    }

    /// What the plate promises for a cell: a narrow range at its mean, a wide one at
    /// the end that the supply is nearer to, each end with its own power.
    pub fn rated_in(&self, cell: &Cell) -> Option<Rated> {
        let nearest = |entry: &&PlannedPlate| {
            let rated = rated_at(entry, cell.supply.voltage);
            (rated.voltage.get() - cell.supply.voltage.get()).abs()
        };
        let entries = self.appliance.plate.iter().filter(|e| e.position == cell.position && e.element.is_none());
        let entry = entries.min_by(|a, b| nearest(a).total_cmp(&nearest(b)))?;
        Some(rated_at(entry, cell.supply.voltage))
    }
}

fn rated_at(entry: &PlannedPlate, supply: Volts) -> Rated {
    let (low, high) = (entry.voltage.low.get(), entry.voltage.high.get());
    let mean = (low + high) / 2.0;
    if at_most((high - low) / mean, NARROW) {
        return Rated { voltage: Volts::of(mean), power: entry.power };
    }
    if supply.get() < mean {
        Rated { voltage: entry.voltage.low, power: Span { low: entry.power.low, high: entry.power.low } }
    } else {
        Rated { voltage: entry.voltage.high, power: Span { low: entry.power.high, high: entry.power.high } }
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::quantity::Hertz;

    fn entry(low: f64, high: f64, powers: (f64, f64)) -> PlannedPlate {
        PlannedPlate {
            position: "on".to_owned(),
            element: None,
            voltage: Span { low: Volts::of(low), high: Volts::of(high) },
            frequency: Span { low: Hertz::of(50.0), high: Hertz::of(50.0) },
            power: Span { low: Watts::of(powers.0), high: Watts::of(powers.1) },
        }
    }

    #[test]
    fn a_narrow_range_is_judged_at_its_mean_and_a_wide_one_at_its_ends() {
        // IEC 60335-1 clause 10.1, from memory: 220 V to 240 V is narrower than 10 % of its mean.
        assert_eq!(rated_at(&entry(220.0, 240.0, (60.0, 60.0)), Volts::of(235.0)).voltage, Volts::of(230.0));
        let wide = entry(100.0, 240.0, (40.0, 60.0));
        let at_low = rated_at(&wide, Volts::of(110.0));
        assert_eq!((at_low.voltage, at_low.power.high), (Volts::of(100.0), Watts::of(40.0)));
        let at_high = rated_at(&wide, Volts::of(230.0));
        assert_eq!((at_high.voltage, at_high.power.low), (Volts::of(240.0), Watts::of(60.0)));
    }
}
