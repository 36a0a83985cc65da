//! Power input bands of IEC 60335-1 clause 10.1, by kind and rating.

use super::sequence::{ApplianceKind, Span};
use crate::quantity::Watts;

/// Where the bands come from, as it is printed beside a limit.
pub const SOURCE: &str = "IEC 60335-1 clause 10.1";

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
    use crate::quantity::{at_least, at_most, near};

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
