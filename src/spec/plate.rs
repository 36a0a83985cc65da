//! The bands of rated power input: IEC 60335-1 clause 10.1 (rows read in a national
//! adoption of 1994; later editions alike from memory: check against your copy).

use super::sequence::{ApplianceKind, Span};
use crate::quantity::{Watts, at_most};

/// Allowed input, both ends included.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct PowerBand {
    /// Lower limit; absent where the clause sets none.
    pub at_least: Option<Watts>,
    /// Upper limit.
    pub at_most: Watts,
}

/// The band around a rated input: at a range, the lower limit of its lower end and
/// the upper limit of its upper end.
pub fn limits(kind: ApplianceKind, rated: Span<Watts>) -> PowerBand {
    let low = at_one_value(kind, rated.low.get());
    let high = at_one_value(kind, rated.high.get());
    PowerBand {
        at_least: low.0.map(Watts::of),
        at_most: Watts::of(high.1),
    }
}

/// Lower and upper limit in W at one rated input in W.
fn at_one_value(kind: ApplianceKind, p: f64) -> (Option<f64>, f64) {
    let motor = kind == ApplianceKind::MotorOperated;
    if at_most(p, 25.0) {
        (None, p * 1.2)
    } else if motor && at_most(p, 300.0) {
        (None, p * 1.2)
    } else if motor {
        (None, (p * 1.15).max(p + 60.0))
    } else if at_most(p, 200.0) {
        (Some(p * 0.9), p * 1.1)
    } else {
        (Some(p * 0.9), (p * 1.05).max(p + 20.0))
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::quantity::near;

    /// Check values of IEC 60335-1 clause 10.1, computed from its rows.
    #[test]
    fn every_boundary_of_the_clause_is_met() {
        use ApplianceKind::{Combined, Heating, MotorOperated};
        let rows: [(ApplianceKind, f64, Option<f64>, f64); 13] = [
            (Heating, 4.5, None, 5.4),
            (Heating, 25.0, None, 30.0),
            (Combined, 25.0, None, 30.0),
            (MotorOperated, 25.0, None, 30.0),
            (Heating, 26.0, Some(23.4), 28.6),
            (Combined, 26.0, Some(23.4), 28.6),
            (Heating, 200.0, Some(180.0), 220.0),
            (Heating, 400.0, Some(360.0), 420.0),
            (Heating, 1500.0, Some(1350.0), 1575.0),
            (Heating, 201.0, Some(180.9), 221.0),
            (MotorOperated, 26.0, None, 31.2),
            (MotorOperated, 300.0, None, 360.0),
            (MotorOperated, 400.0, None, 460.0),
        ];
        for (kind, rated, low, high) in rows {
            let watts = Watts::of(rated);
            let band = limits(
                kind,
                Span {
                    low: watts,
                    high: watts,
                },
            );
            assert!(near(band.at_most.get(), high), "{kind:?} {rated}: {band:?}");
            let same = match (band.at_least, low) {
                (Some(found), Some(low)) => near(found.get(), low),
                (None, None) => true,
                _ => false,
            };
            assert!(same, "{kind:?} {rated}: {band:?}");
        }
    }

    #[test]
    fn a_power_range_takes_the_lower_limit_of_its_low_end_and_the_upper_of_its_high_end() {
        let rated = Span {
            low: Watts::of(1000.0),
            high: Watts::of(1200.0),
        };
        let band = limits(ApplianceKind::Heating, rated);
        assert!(near(band.at_least.unwrap().get(), 900.0) && near(band.at_most.get(), 1260.0));
    }
}
