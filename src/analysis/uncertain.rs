//! Uncertainty of one value: shares, degrees of freedom, k at 95.45 % (JCGM 100).

use super::types::{Estimate, Share};
use crate::plan::{Plan, PlannedRole};
use crate::quantity::Reading;
use crate::spec::bench::CalibrationPoint;
use crate::stats::{coverage_factor, effective_degrees};

/// A value that shares are added to.
#[derive(Debug, Clone)]
pub(super) struct Budget {
    value: f64,
    shares: Vec<(String, f64, f64)>,
}

impl Budget {
    /// A value without any uncertainty yet.
    pub(super) fn of(value: f64) -> Self {
        Self { value, shares: Vec::new() }
    }

    /// A reading of a role: corrected by its calibration once, with the shares of
    /// accuracy on the range in force, resolution and calibration.
    pub(super) fn reading(plan: &Plan, role: &PlannedRole, reading: Reading, indicated: f64) -> Self {
        let instrument = plan.instrument_of(role);
        let mut budget = Self::of(indicated);
        if let Some(accuracy) = instrument.driver.accuracy_of(reading) {
            budget.rectangular("accuracy of the instrument", accuracy.half_width(indicated));
            budget.rectangular("resolution", accuracy.resolution / 2.0);
        }
        if let Some((correction, standard)) = calibration(&instrument.calibration, reading, role.channel, indicated) {
            budget.value += correction;
            budget.normal("calibration", standard);
        }
        budget
    }

    /// A share that is equally likely within +-`half_width`.
    pub(super) fn rectangular(&mut self, from: &str, half_width: f64) {
        self.add(from, half_width.abs() / 3f64.sqrt(), f64::INFINITY);
    }

    /// A share with a known standard uncertainty.
    pub(super) fn normal(&mut self, from: &str, standard: f64) {
        self.add(from, standard, f64::INFINITY);
    }

    /// A share with degrees of freedom.
    pub(super) fn add(&mut self, from: &str, standard: f64, degrees: f64) {
        if standard > 0.0 {
            self.shares.push((from.to_owned(), standard, degrees.max(1.0)));
        }
    }

    /// Every share of another value that enters this one with a sensitivity.
    pub(super) fn include(&mut self, prefix: &str, other: &Budget, sensitivity: f64) {
        for (from, standard, degrees) in &other.shares {
            self.add(&format!("{prefix}{from}"), standard * sensitivity.abs(), *degrees);
        }
    }

    /// Multiplies value and shares.
    pub(super) fn scale(&mut self, factor: f64) {
        self.value *= factor;
        for (_, standard, _) in &mut self.shares {
            *standard *= factor.abs();
        }
    }

    /// Moves the value; shares stay.
    pub(super) fn shift(&mut self, by: f64) {
        self.value += by;
    }

    /// The value so far.
    pub(super) fn value(&self) -> f64 {
        self.value
    }

    /// The estimate, its budget largest first.
    pub(super) fn estimate(&self) -> Estimate {
        let pairs: Vec<(f64, f64)> = self.shares.iter().map(|(_, u, nu)| (*u, *nu)).collect();
        let combined = pairs.iter().map(|(u, _)| u * u).sum::<f64>().sqrt();
        let coverage = coverage_factor(effective_degrees(&pairs));
        let mut budget: Vec<Share> =
            self.shares.iter().map(|(from, standard, _)| Share { from: from.clone(), standard: *standard }).collect();
        budget.sort_by(|a, b| b.standard.total_cmp(&a.standard).then_with(|| a.from.cmp(&b.from)));
        Estimate { value: self.value, expanded: coverage * combined, coverage, budget }
    }
}

/// Correction and standard uncertainty at an indicated value: interpolated between
/// points, held beyond the outermost.
fn calibration(points: &[CalibrationPoint], reading: Reading, channel: Option<u32>, indicated: f64) -> Option<(f64, f64)> {
    let mut own: Vec<&CalibrationPoint> = points
        .iter()
        .filter(|p| p.reading == reading && (p.channel.is_none() || p.channel == channel))
        .collect();
    own.sort_by(|a, b| a.at.total_cmp(&b.at));
    let standard = |p: &CalibrationPoint| p.expanded / p.coverage;
    let above = own.partition_point(|p| p.at <= indicated);
    match (above.checked_sub(1).map(|n| own[n]), own.get(above)) {
        (Some(low), Some(high)) => {
            let share = (indicated - low.at) / (high.at - low.at);
            let correction = low.correction + share * (high.correction - low.correction);
            Some((correction, standard(low) + share * (standard(high) - standard(low))))
        }
        (Some(only), None) => Some((only.correction, standard(only))),
        (None, Some(only)) => Some((only.correction, standard(only))),
        (None, None) => None,
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn point(at: f64, correction: f64, expanded: f64) -> CalibrationPoint {
        CalibrationPoint { reading: Reading::Power, channel: None, at, correction, expanded, coverage: 2.0 }
    }

    #[test]
    fn calibration_is_interpolated_and_held_beyond_its_ends() {
        let points = [point(50.0, 0.2, 0.04), point(10.0, 0.1, 0.02)];
        let at = |value| calibration(&points, Reading::Power, None, value).unwrap();
        assert!((at(30.0).0 - 0.15).abs() < 1e-12 && (at(30.0).1 - 0.015).abs() < 1e-12);
        assert_eq!(at(5.0), (0.1, 0.01));
        assert_eq!(at(500.0), (0.2, 0.02));
        assert_eq!(at(50.0).0, 0.2);
        assert_eq!(calibration(&points, Reading::Voltage, None, 5.0), None);
    }

    #[test]
    fn the_end_gauge_of_jcgm_100_is_met() {
        // JCGM 100 H.1: u_c 31.71 nm, nu_eff 16.66 -> 16, U99 93 nm; here at 95.45 %.
        let mut gauge = Budget::of(50_000_838.0);
        gauge.add("standard", 25.0, 18.0);
        gauge.add("comparison", 9.7, 25.6);
        gauge.add("expansion", 2.9, 50.0);
        gauge.add("temperature", 16.675, 2.0);
        let estimate = gauge.estimate();
        let combined = estimate.expanded / estimate.coverage;
        assert!((combined - 31.71).abs() < 0.02, "{combined}");
        assert!((estimate.coverage - 2.17).abs() < 0.01, "t at 16 degrees, NIST TN 1297");
        assert_eq!(estimate.budget[0].from, "standard");
    }

    #[test]
    fn more_shares_never_shrink_u() {
        let mut budget = Budget::of(9.0);
        let mut last = 0.0;
        for n in 1..20 {
            budget.rectangular("more", 0.01 * f64::from(n));
            let expanded = budget.estimate().expanded;
            assert!(expanded > last);
            last = expanded;
        }
    }
}
