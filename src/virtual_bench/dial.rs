//! How one reading is shown: gain, offset, noise, resolution, ranges.

use super::Connection;
use super::chance::Chance;
use super::dialect::Display;
use crate::quantity::Reading;
use crate::spec::driver::Accuracy;

/// What SCPI-1999 sends for "infinity": the value is above the highest range.
const OVERLOAD: &[u8] = b"9.9E37";
/// What SCPI-1999 sends for "not a number".
pub const NO_VALUE: &[u8] = b"9.91E37";
/// Noise, as a share of the accuracy's half-width and of the resolution (house values).
const NOISE: (f64, f64) = (0.03, 0.3);

/// How one reading is shown.
#[derive(Debug, Clone)]
pub struct Dial {
    /// Of what.
    pub reading: Reading,
    accuracy: Option<Accuracy>,
    display: Display,
    gain: f64,
    offset: f64,
    noise: Chance,
}

impl Dial {
    /// The dial of one reading; its errors are drawn once.
    pub fn new(connection: &Connection, reading: Reading, channel: Option<u32>, seed: u64) -> Self {
        let accuracy = connection.driver.accuracy_of(reading).cloned();
        let name = format!(
            "{} {} {}",
            connection.instrument,
            reading.word(),
            channel.unwrap_or(0)
        );
        let errors = Chance::of(seed, &name);
        Self {
            reading,
            display: Display::of(accuracy.as_ref().map_or(0.0, |a| a.resolution)),
            accuracy,
            gain: errors.even(0),
            offset: errors.even(1),
            noise: Chance::of(seed, &format!("{name} noise")),
        }
    }

    /// Appends what is shown of a true value; "not a number" where there is none.
    pub fn write(&self, truth: Option<f64>, tick: u64, out: &mut Vec<u8>) {
        let Some(truth) = truth.filter(|t| t.is_finite()) else {
            out.extend_from_slice(NO_VALUE);
            return;
        };
        let shown = self.shown(truth, tick);
        let top = self.accuracy.as_ref().and_then(|a| a.ranges.last());
        if top.is_some_and(|top| shown.abs() > *top) {
            out.extend_from_slice(OVERLOAD);
        } else {
            self.display.write(shown, out);
        }
    }

    /// What is shown of a true value: within the stated accuracy, plus noise.
    fn shown(&self, truth: f64, tick: u64) -> f64 {
        self.shown_on(truth, truth, tick)
    }

    /// The samples of a block, on the range that its highest one needs: gain and offset
    /// as for any other reading, noise of each sample's own.
    pub fn block(&self, truth: &[f64]) -> Vec<f64> {
        // Apart from the noise of the readings.
        const APART: u64 = 1 << 40;
        let highest = truth.iter().fold(0.0_f64, |top, v| top.max(v.abs()));
        let samples = (APART..).zip(truth);
        samples
            .map(|(number, value)| self.shown_on(*value, highest, number))
            .collect()
    }

    /// The same on the range that holds `ranged`.
    fn shown_on(&self, truth: f64, ranged: f64, tick: u64) -> f64 {
        let Some(accuracy) = &self.accuracy else {
            return truth;
        };
        let range = accuracy.range_for(ranged).unwrap_or(0.0);
        let share = accuracy.of_reading * truth;
        let constant = accuracy.of_range * range + accuracy.floor;
        let noise = NOISE.0 * (share.abs() + constant) + NOISE.1 * accuracy.resolution;
        truth + self.gain * share + self.offset * constant + noise * self.noise.bell(tick)
    }
}
