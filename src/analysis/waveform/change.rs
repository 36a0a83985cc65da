//! Relative voltage change on a reference impedance, as IEC 61000-3-3 has it.

use serde::{Deserialize, Serialize};

use super::{HalfPeriod, Shape};
use crate::analysis::Figure;
use crate::quantity::at_most;

/// A change above this share counts towards the time that IEC 61000-3-3 limits.
pub const COUNTED: f64 = 0.033;
/// So much steady time a steady change needs, s (IEC 61000-3-3, from memory).
const STEADY_S: f64 = 1.0;

/// Voltage and impedance that a change is referred to.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Reference {
    /// Nominal voltage, V.
    pub volts: f64,
    /// Resistance, ohm.
    pub ohms: f64,
    /// Reactance, ohm.
    pub reactance_ohms: f64,
}

impl Reference {
    /// The reference impedance 0.40 + j0.25 ohm at a nominal voltage (IEC 61000-3-3
    /// with IEC 60725, from memory).
    ///
    /// # Errors
    /// Where the voltage is not one that it is meant for, 220 V to 250 V (from memory).
    pub fn at(volts: f64) -> Result<Self, String> {
        if !(220.0..=250.0).contains(&volts) {
            return Err(format!(
                "the reference impedance is one for 220 V to 250 V, not for {volts} V"
            ));
        }
        Ok(Self {
            volts,
            ohms: 0.40,
            reactance_ohms: 0.25,
        })
    }
}

/// What one switch-on does to the voltage: an indication, since the standard takes the
/// mean of many.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct VoltageChange {
    /// Largest relative change of any half-period.
    pub dmax: f64,
    /// When it began, seconds after the first current.
    pub dmax_after_s: f64,
    /// How long the change stayed above 3.3 %, s.
    pub over_s: f64,
    /// Whether it still did in the last half-period: the true time is longer.
    pub still_over: bool,
    /// Relative steady change, over the last second.
    pub dc: Figure<f64>,
}

/// d = |dIp R + dIq X| / U for a change of active and reactive current in A RMS.
pub fn relative_change(active_a: f64, reactive_a: f64, reference: Reference) -> f64 {
    let drop = active_a * reference.ohms + reactive_a * reference.reactance_ohms;
    drop.abs() / reference.volts
}

impl Shape {
    /// What the switch-on does to the voltage on a reference impedance.
    ///
    /// # Errors
    /// Where there is not one whole half-period.
    pub fn voltage_change(&self, reference: Reference) -> Result<VoltageChange, String> {
        let d = |half: &HalfPeriod| relative_change(half.active_a, half.reactive_a, reference);
        let halves = &self.half_periods;
        let first = halves.first().ok_or("it holds no whole half-period")?;
        let worst = halves.iter().fold(
            first,
            |worst, half| if d(half) > d(worst) { half } else { worst },
        );
        let half_s = 0.5 / self.frequency_hz;
        let over = |half: &&HalfPeriod| !at_most(d(half), COUNTED);
        Ok(VoltageChange {
            dmax: d(worst),
            dmax_after_s: (worst.from_s - self.t0_s).max(0.0),
            over_s: half_s * halves.iter().filter(over).count() as f64,
            // Of a half-wave load one half-period in two is loaded.
            still_over: halves.iter().rev().take(2).any(|half| over(&half)),
            dc: self.steady_change(d),
        })
    }

    fn steady_change(&self, d: impl Fn(&HalfPeriod) -> f64) -> Figure<f64> {
        let end = self.half_periods.last().map_or(0.0, |half| half.from_s);
        let from = end - STEADY_S;
        if from < self.t0_s {
            return Figure::Absent(format!(
                "the block holds {:.1} s after the first current, a steady change needs {STEADY_S} s",
                (end - self.t0_s).max(0.0)
            ));
        }
        let last: Vec<f64> = self
            .half_periods
            .iter()
            .filter(|half| half.from_s >= from)
            .map(d)
            .collect();
        Figure::Known(last.iter().sum::<f64>() / last.len().max(1) as f64)
    }
}

/// Amperes, their lagging power factor, and the change in per cent that they make, for
/// the tests. Computed: |dIp R + dIq X| / U at 230 V with 0.40 + j0.25 ohm.
#[cfg(test)]
pub(super) const COMPUTED: [(f64, f64, f64); 4] = [
    (10.0, 1.0, 1.739130),
    (18.975, 1.0, 3.3),
    (23.0, 1.0, 4.0),
    (8.0, 0.6, 1.530435),
];

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn the_relative_change_is_the_computed_one() {
        let reference = Reference::at(230.0).unwrap();
        for (amps, factor, percent) in COMPUTED {
            let reactive = amps * libm::sqrt(1.0_f64 - factor * factor);
            let d = relative_change(amps * factor, reactive, reference);
            assert!((100.0 * d - percent).abs() < 5e-7, "{amps} A: {d}");
        }
        assert!(Reference::at(120.0).is_err());
    }
}
