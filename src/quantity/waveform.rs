//! Voltage and current of one stretch of time, sample by sample.

/// Why values are no waveform.
#[derive(Debug, Clone, Copy, PartialEq, Eq, thiserror::Error)]
pub enum WaveformError {
    /// The interval is no positive number.
    #[error("the interval between its samples is no positive time")]
    Interval,
    /// The two differ in length.
    #[error("it holds not as many voltages as currents")]
    Lengths,
    /// There is nothing in it.
    #[error("it holds no sample")]
    Empty,
    /// A value is infinite or not a number.
    #[error("a sample of it is no finite number")]
    NotFinite,
}

/// Equally spaced samples of voltage and current, taken at the same moments: never
/// empty, as many of one as of the other, every value finite.
#[derive(Debug, Clone, PartialEq)]
pub struct Waveform {
    interval_us: f64,
    voltage_v: Vec<f64>,
    current_a: Vec<f64>,
}

impl Waveform {
    /// Puts one together; `interval_us` is the time from sample to sample in microseconds.
    ///
    /// # Errors
    /// [`WaveformError`] where it would not be what its type promises.
    pub fn new(
        interval_us: f64,
        voltage_v: Vec<f64>,
        current_a: Vec<f64>,
    ) -> Result<Self, WaveformError> {
        if !(interval_us.is_finite() && interval_us > 0.0) {
            return Err(WaveformError::Interval);
        }
        if voltage_v.len() != current_a.len() {
            return Err(WaveformError::Lengths);
        }
        if voltage_v.is_empty() {
            return Err(WaveformError::Empty);
        }
        let finite = |values: &[f64]| values.iter().all(|value| value.is_finite());
        if !finite(&voltage_v) || !finite(&current_a) {
            return Err(WaveformError::NotFinite);
        }
        Ok(Self {
            interval_us,
            voltage_v,
            current_a,
        })
    }

    /// Time from sample to sample, microseconds.
    pub fn interval_us(&self) -> f64 {
        self.interval_us
    }

    /// Time from sample to sample, seconds.
    pub fn interval_s(&self) -> f64 {
        self.interval_us / 1e6
    }

    /// Voltages, V.
    pub fn voltage_v(&self) -> &[f64] {
        &self.voltage_v
    }

    /// Currents, A.
    pub fn current_a(&self) -> &[f64] {
        &self.current_a
    }

    /// How many samples there are; at least one.
    #[expect(clippy::len_without_is_empty, reason = "it is never empty")]
    pub fn len(&self) -> usize {
        self.voltage_v.len()
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn what_is_no_waveform_is_refused() {
        for (interval, volts, amps, why) in [
            (0.0, vec![1.0], vec![1.0], WaveformError::Interval),
            (f64::NAN, vec![1.0], vec![1.0], WaveformError::Interval),
            (100.0, vec![1.0, 2.0], vec![1.0], WaveformError::Lengths),
            (100.0, vec![], vec![], WaveformError::Empty),
            (
                100.0,
                vec![f64::INFINITY],
                vec![1.0],
                WaveformError::NotFinite,
            ),
        ] {
            assert_eq!(Waveform::new(interval, volts, amps), Err(why));
        }
        let wave = Waveform::new(100.0, vec![325.0], vec![1.0]).unwrap();
        assert_eq!((wave.len(), wave.interval_s()), (1, 1e-4));
    }
}
