//! A stretch of a waveform whose ends may lie between samples.

use std::ops::Range;

/// From and to as sample numbers, with the weight of each sample in the integral of
/// the straight lines between samples.
#[derive(Debug, Clone)]
pub(super) struct Window {
    from: f64,
    to: f64,
    first: usize,
    weights: Vec<f64>,
}

impl Window {
    /// The stretch from sample number `from` to `to`; both at least 0, `to` not before
    /// `from`, and not beyond the last sample.
    pub(super) fn new(from: f64, to: f64) -> Self {
        let from = from.max(0.0);
        let to = to.max(from);
        let first = from as usize;
        let last = to.ceil() as usize;
        let mut weights = vec![0.0; last - first + 1];
        for n in first..last {
            // Part of the step from sample n to the next that lies within.
            let begin = (from - n as f64).max(0.0);
            let end = (to - n as f64).min(1.0);
            let next = 0.5 * (end * end - begin * begin);
            weights[n - first] += end - begin - next;
            weights[n + 1 - first] += next;
        }
        Self {
            from,
            to,
            first,
            weights,
        }
    }

    pub(super) fn from(&self) -> f64 {
        self.from
    }

    pub(super) fn to(&self) -> f64 {
        self.to
    }

    /// Its length in samples.
    pub(super) fn length(&self) -> f64 {
        self.to - self.from
    }

    /// Numbers of the samples that it rests on.
    pub(super) fn samples(&self) -> Range<usize> {
        self.first..self.first + self.weights.len()
    }

    /// Integral over it, in samples.
    pub(super) fn integral(&self, value: impl Fn(usize) -> f64) -> f64 {
        self.samples()
            .zip(&self.weights)
            .map(|(n, weight)| weight * value(n))
            .sum()
    }

    /// Mean over it; 0 where it has no length.
    pub(super) fn mean(&self, value: impl Fn(usize) -> f64) -> f64 {
        if self.length() <= 0.0 {
            return 0.0;
        }
        self.integral(value) / self.length()
    }

    /// Root of the mean square over it.
    pub(super) fn rms(&self, samples: &[f64]) -> f64 {
        libm::sqrt(self.mean(|n| samples[n] * samples[n]))
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_straight_line_is_integrated_exactly_between_samples() {
        let line = |n: usize| 2.0 * n as f64 + 1.0;
        for (from, to) in [
            (0.0, 4.0),
            (0.25, 0.75),
            (0.5, 3.25),
            (1.0, 1.5),
            (2.0, 2.0),
        ] {
            let exact = (to * to + to) - (from * from + from);
            let found = Window::new(from, to).integral(line);
            assert!(
                (found - exact).abs() < 1e-12,
                "{from} to {to}: {found}, not {exact}"
            );
        }
        assert_eq!(Window::new(2.0, 2.0).mean(line), 0.0);
        assert_eq!(Window::new(0.5, 3.0).samples(), 0..4);
    }
}
