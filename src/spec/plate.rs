//! Power input bands of IEC 60335-1 clause 10.1, by kind and rating.

use super::sequence::{ApplianceKind, Span};
use crate::quantity::{Hertz, Volts, Watts, at_most, near};

/// Where the bands come from, as it is printed beside a limit.
pub const SOURCE: &str = "IEC 60335-1 clause 10.1";

/// An input is corrected to a plate's voltage up to this share of it; beyond, it is
/// not judged (house default).
pub const CORRECTABLE: f64 = 0.06;

/// Half a hertz beside the plate's frequency is the supply's own business.
const FREQUENCY_WITHIN: f64 = 0.5;

/// A marked voltage range wider than this share of its mean is judged at both ends.
const WIDE_RANGE: f64 = 0.1;

/// What clause 10.1 allows at rated voltage in normal operation; both ends inclusive.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct PowerBand {
    /// Lower limit; absent where the clause sets none.
    pub at_least: Option<Watts>,
    /// Upper limit.
    pub at_most: Watts,
}

/// The band of clause 10.1 around a rated input, which may be a range marked for
/// both ends of the voltage range: then the lower limit is that of the lower end
/// and the upper limit that of the upper end.
///
/// A combined appliance is judged by the heating rows: that its motors take more
/// than half of the input is not declared anywhere.
///
/// Source: IEC 60335-1 clause 10.1 (a national adoption of 1994; later editions
/// alike from memory).
pub fn limits(kind: ApplianceKind, rated: Span<Watts>) -> PowerBand {
    PowerBand {
        at_least: lower(kind, rated.low.get()).map(Watts::of),
        at_most: Watts::of(upper(kind, rated.high.get())),
    }
}

/// A voltage at which the plate's promise is judged, and the input promised there.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct PlatePoint {
    /// The voltage.
    pub voltage: Volts,
    /// The frequencies at any of which it is judged.
    pub frequency: Span<Hertz>,
    /// Rated input at it.
    pub rated: Span<Watts>,
}

impl PlatePoint {
    /// Whether it is judged at a frequency.
    pub fn has_frequency(&self, frequency: Hertz) -> bool {
        let (low, high) = (self.frequency.low.get(), self.frequency.high.get());
        (low - FREQUENCY_WITHIN..=high + FREQUENCY_WITHIN).contains(&frequency.get())
    }
}

/// At which voltages a plate entry is judged: a rated voltage at itself; a range
/// wider than 10 % of its mean at both ends; a narrower one at its mean, unless
/// the input is marked for both ends (IEC 60335-1 clause 10.1, from memory). A plate
/// of 50 Hz to 60 Hz is judged at any of them, where a fan is present at both.
pub fn points(
    voltage: Span<Volts>,
    frequency: Span<Hertz>,
    power: Span<Watts>,
    fan: bool,
) -> Vec<PlatePoint> {
    let one = |frequency: Hertz| Span {
        low: frequency,
        high: frequency,
    };
    if fan && !near(frequency.low.get(), frequency.high.get()) {
        let at = |hertz| at_frequency(voltage, one(hertz), power);
        return [at(frequency.low), at(frequency.high)].concat();
    }
    at_frequency(voltage, frequency, power)
}

fn at_frequency(
    voltage: Span<Volts>,
    frequency: Span<Hertz>,
    power: Span<Watts>,
) -> Vec<PlatePoint> {
    let (low, high) = (voltage.low.get(), voltage.high.get());
    let mean = 0.5 * (low + high);
    let whole = |volts: f64| PlatePoint {
        voltage: Volts::of(volts),
        frequency,
        rated: power,
    };
    if near(low, high) {
        return vec![whole(low)];
    }
    let marked_for_both = power.low != power.high;
    if at_most(high - low, WIDE_RANGE * mean) && !marked_for_both {
        return vec![whole(mean)];
    }
    let end = |voltage: Volts, rated: Watts| PlatePoint {
        voltage,
        frequency,
        rated: Span {
            low: rated,
            high: rated,
        },
    };
    vec![end(voltage.low, power.low), end(voltage.high, power.high)]
}

fn lower(kind: ApplianceKind, rated: f64) -> Option<f64> {
    match kind {
        ApplianceKind::MotorOperated => None,
        ApplianceKind::Heating | ApplianceKind::Combined => (rated > 25.0).then_some(rated * 0.9),
    }
}

fn upper(kind: ApplianceKind, rated: f64) -> f64 {
    if rated <= 25.0 {
        return rated * 1.2;
    }
    match kind {
        ApplianceKind::Heating | ApplianceKind::Combined if rated <= 200.0 => rated * 1.1,
        ApplianceKind::Heating | ApplianceKind::Combined => rated + (rated * 0.05).max(20.0),
        ApplianceKind::MotorOperated if rated <= 300.0 => rated * 1.2,
        ApplianceKind::MotorOperated => rated + (rated * 0.15).max(60.0),
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::quantity::at_least;

    fn band(kind: ApplianceKind, rated: f64) -> (Option<f64>, f64) {
        let rated = Watts::of(rated);
        let band = limits(
            kind,
            Span {
                low: rated,
                high: rated,
            },
        );
        (band.at_least.map(Watts::get), band.at_most.get())
    }

    fn same(found: (Option<f64>, f64), low: Option<f64>, high: f64) {
        match (found.0, low) {
            (Some(found), Some(low)) => assert!(near(found, low), "{found} is not {low}"),
            (found, low) => assert_eq!(found, low),
        }
        assert!(near(found.1, high), "{} is not {high}", found.1);
    }

    // IEC 60335-1 clause 10.1, read in a national adoption of 1994.
    #[test]
    fn bands_at_every_boundary() {
        use ApplianceKind::{Combined, Heating, MotorOperated};
        for kind in [Heating, Combined, MotorOperated] {
            same(band(kind, 4.5), None, 5.4);
            same(band(kind, 25.0), None, 30.0);
        }
        for kind in [Heating, Combined] {
            same(band(kind, 25.0001), Some(22.50009), 27.50011);
            same(band(kind, 26.0), Some(23.4), 28.6);
            same(band(kind, 200.0), Some(180.0), 220.0);
            same(band(kind, 200.0001), Some(180.00009), 220.0001);
            same(band(kind, 400.0), Some(360.0), 420.0);
            same(band(kind, 1500.0), Some(1350.0), 1575.0);
        }
        same(band(MotorOperated, 26.0), None, 31.2);
        same(band(MotorOperated, 300.0), None, 360.0);
        same(band(MotorOperated, 300.0001), None, 360.0001);
        same(band(MotorOperated, 400.0), None, 460.0);
    }

    #[test]
    fn limits_are_inclusive_where_binary_misses_them() {
        for (kind, rated, high) in [
            (ApplianceKind::Combined, 4.5, 5.4),
            (ApplianceKind::MotorOperated, 400.0, 460.0),
        ] {
            assert!(at_most(high, band(kind, rated).1));
        }
        let low = band(ApplianceKind::Heating, 26.0).0;
        assert!(low.is_some_and(|low| at_least(23.4, low)));
    }

    fn judged_at(voltage: (f64, f64), power: (f64, f64)) -> Vec<(f64, f64, f64)> {
        let voltage = Span {
            low: Volts::of(voltage.0),
            high: Volts::of(voltage.1),
        };
        let power = Span {
            low: Watts::of(power.0),
            high: Watts::of(power.1),
        };
        let flat = |p: PlatePoint| (p.voltage.get(), p.rated.low.get(), p.rated.high.get());
        let frequency = Span {
            low: Hertz::of(50.0),
            high: Hertz::of(50.0),
        };
        points(voltage, frequency, power, true)
            .into_iter()
            .map(flat)
            .collect()
    }

    #[test]
    fn a_fan_is_judged_at_both_frequencies_of_its_plate() {
        let voltage = Span {
            low: Volts::of(230.0),
            high: Volts::of(230.0),
        };
        let frequency = Span {
            low: Hertz::of(50.0),
            high: Hertz::of(60.0),
        };
        let power = Span {
            low: Watts::of(9.0),
            high: Watts::of(9.0),
        };
        let with_fan = points(voltage, frequency, power, true);
        assert_eq!(with_fan.len(), 2);
        assert!(with_fan[0].has_frequency(Hertz::of(50.1)));
        assert!(!with_fan[0].has_frequency(Hertz::of(60.0)));
        let without = points(voltage, frequency, power, false);
        assert_eq!(without.len(), 1);
        assert!(without[0].has_frequency(Hertz::of(60.0)));
    }

    // IEC 60335-1 clause 10.1, from memory.
    #[test]
    fn the_voltages_at_which_a_plate_is_judged() {
        assert_eq!(judged_at((230.0, 230.0), (9.0, 9.0)), [(230.0, 9.0, 9.0)]);
        assert_eq!(judged_at((220.0, 240.0), (9.0, 9.0)), [(230.0, 9.0, 9.0)]);
        let marked = [(220.0, 920.0, 920.0), (240.0, 1100.0, 1100.0)];
        assert_eq!(judged_at((220.0, 240.0), (920.0, 1100.0)), marked);
        let wide = [(100.0, 9.0, 9.0), (240.0, 9.0, 9.0)];
        assert_eq!(judged_at((100.0, 240.0), (9.0, 9.0)), wide);
        // 209..231 V is exactly 10 % of its mean: not wider.
        assert_eq!(judged_at((209.0, 231.0), (9.0, 9.0)), [(220.0, 9.0, 9.0)]);
    }

    #[test]
    fn a_marked_range_is_held_at_both_ends() {
        let band = limits(
            ApplianceKind::Heating,
            Span {
                low: Watts::of(920.0),
                high: Watts::of(1100.0),
            },
        );
        assert!(near(band.at_most.get(), 1155.0));
        assert!(band.at_least.is_some_and(|low| near(low.get(), 828.0)));
    }
}
