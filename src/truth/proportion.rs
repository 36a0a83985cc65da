//! A share of a count, with its interval.

use crate::stats::clopper_pearson;

/// Level of the intervals.
const LEVEL: f64 = 0.95;

/// A count out of another.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default)]
pub struct Proportion {
    /// How many.
    pub count: u64,
    /// Of how many.
    pub of: u64,
}

impl Proportion {
    /// Counts one more; `hit` where it belongs to the share.
    pub fn add(&mut self, hit: bool) {
        self.of += 1;
        self.count += u64::from(hit);
    }

    /// The share; 0 of nothing is nothing.
    pub fn share(self) -> Option<f64> {
        (self.of > 0).then(|| self.count as f64 / self.of as f64)
    }

    /// Clopper and Pearson's interval at 95 %: the shares that a one-sided test at
    /// 2.5 % would not refuse on either side.
    pub fn interval(self) -> (f64, f64) {
        clopper_pearson(self.count, self.of, LEVEL).unwrap_or((0.0, 1.0))
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn of(count: u64, of: u64) -> (f64, f64) {
        Proportion { count, of }.interval()
    }

    // Closed form for none: 1 - 0.025^(1/n). The others computed term by term with
    // Python's math.lgamma and fsum, bisected.
    #[test]
    fn intervals_of_clopper_and_pearson() {
        for (k, n, low, high) in [
            (0, 10, 0.0, 0.308_497_1),
            (10, 10, 0.691_502_9, 1.0),
            (1, 10, 0.002_528_579, 0.445_016_117),
            (5, 20, 0.086_571_469, 0.491_045_87),
            (3818, 4000, 0.947_576_766, 0.960_749_042),
            (455, 20_000, 0.020_728_145, 0.024_912_178),
        ] {
            let found = of(k, n);
            assert!(
                (found.0 - low).abs() < 1e-6 && (found.1 - high).abs() < 1e-6,
                "{k} of {n}: {found:?}"
            );
        }
        assert_eq!(of(0, 0), (0.0, 1.0));
    }
}
