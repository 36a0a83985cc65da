//! Scales and their ticks.

use super::number;

/// Beyond this no value is drawn true to scale; it keeps sums finite.
const FARTHEST: f64 = 1e15;

/// A value that can be drawn: finite, and cut at the farthest.
pub fn drawable(value: f64) -> Option<f64> {
    value.is_finite().then(|| value.clamp(-FARTHEST, FARTHEST))
}

/// A linear scale from values to pixels.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Scale {
    /// Value at the first pixel.
    pub low: f64,
    /// Value at the last pixel, above `low`.
    pub high: f64,
    /// First pixel.
    pub from: f64,
    /// Last pixel; below `from` on an upright scale.
    pub to: f64,
}

impl Scale {
    /// The pixel of `value`; far outside it stays far outside, but finite.
    pub fn at(&self, value: f64) -> f64 {
        let share = (value - self.low) / (self.high - self.low);
        self.from + share.clamp(-20.0, 20.0) * (self.to - self.from)
    }

    /// Whether `value` lies on it.
    pub fn holds(&self, value: f64) -> bool {
        self.low <= value && value <= self.high
    }

    /// Ticks at round values, at most about `most` of them, with their labels.
    pub fn ticks(&self, most: usize) -> Vec<(f64, String)> {
        let step = round_step((self.high - self.low) / most.max(1) as f64);
        let first = (self.low / step - 1e-9).ceil();
        let places = usize::try_from(-(step * 1.000_001).log10().floor() as i64).unwrap_or(0);
        (0..=2 * most)
            .map(|i| (first + i as f64) * step)
            .take_while(|value| *value <= self.high + 1e-9 * step)
            .map(|value| (value, label(value, places)))
            .collect()
    }
}

fn label(value: f64, places: usize) -> String {
    if value.abs() >= 1e6 || places > 6 {
        number::short(value, 6)
    } else {
        number::fixed(value, places)
    }
}

/// The next 1, 2 or 5 times a power of ten from `least` up.
fn round_step(least: f64) -> f64 {
    let least = least.max(1e-12);
    let power = 10f64.powi(least.log10().floor() as i32);
    let found = [1.0, 2.0, 5.0]
        .into_iter()
        .map(|step| step * power)
        .find(|step| *step >= least * (1.0 - 1e-9));
    found.unwrap_or(10.0 * power)
}

/// Lowest and highest of `values`, those that can be drawn; absent where none can.
pub fn extent(values: impl IntoIterator<Item = f64>) -> Option<(f64, f64)> {
    values
        .into_iter()
        .filter_map(drawable)
        .fold(None, |found, v| {
            let (low, high) = found.unwrap_or((v, v));
            Some((low.min(v), high.max(v)))
        })
}

/// A range somewhat wider than `(low, high)`, by `share` of it at each end, and
/// never without width.
pub fn widened((low, high): (f64, f64), share: f64) -> (f64, f64) {
    let least = 0.02 * low.abs().max(high.abs()).max(1e-3);
    if high - low < least {
        let middle = 0.5 * (low + high);
        return (middle - least, middle + least);
    }
    let more = share * (high - low);
    (low - more, high + more)
}

#[cfg(test)]
mod tests {
    use super::*;

    fn labels(low: f64, high: f64, most: usize) -> Vec<String> {
        let scale = Scale {
            low,
            high,
            from: 0.0,
            to: 100.0,
        };
        scale.ticks(most).into_iter().map(|tick| tick.1).collect()
    }

    #[test]
    fn ticks_are_round_and_carry_no_idle_digits() {
        assert_eq!(
            labels(0.0, 60.0, 6),
            ["0", "10", "20", "30", "40", "50", "60"]
        );
        assert_eq!(labels(8.1, 10.9, 6), ["8.5", "9.0", "9.5", "10.0", "10.5"]);
        assert_eq!(labels(0.0, 3000.0, 4), ["0", "1000", "2000", "3000"]);
        assert_eq!(labels(-2.0, 2.0, 2), ["−2", "0", "2"]);
        assert_eq!(labels(0.0, 4e9, 4), ["0", "1e9", "2e9", "3e9", "4e9"]);
    }

    #[test]
    fn a_range_without_width_gets_one() {
        for value in [0.0, 9.0, -1e15, 1e-9] {
            let (low, high) = widened((value, value), 0.1);
            assert!(low < high, "{value}");
            assert!(!labels(low, high, 5).is_empty());
        }
        assert_eq!(extent([f64::NAN, f64::INFINITY]), None);
        assert_eq!(extent([1.0, f64::MAX]), Some((1.0, FARTHEST)));
    }
}
