//! A share of a count, with its interval.

use crate::stats::normal_cdf;

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
        let (n, k) = (self.of, self.count);
        if n == 0 {
            return (0.0, 1.0);
        }
        // P(X <= k) falls with p.
        let low = match k {
            0 => 0.0,
            _ => bisected(|p| 1.0 - at_most(n, k - 1, p) < 0.025),
        };
        let high = if k == n {
            1.0
        } else {
            bisected(|p| at_most(n, k, p) > 0.025)
        };
        (low, high)
    }
}

/// Where `holds` ceases to hold between 0 and 1.
fn bisected(holds: impl Fn(f64) -> bool) -> f64 {
    let (mut low, mut high) = (0.0, 1.0);
    for _ in 0..60 {
        let middle = f64::midpoint(low, high);
        if holds(middle) {
            low = middle;
        } else {
            high = middle;
        }
    }
    f64::midpoint(low, high)
}

/// Probability of at most `k` hits in `n` trials of probability `p`: the sum of its
/// terms outwards from the largest of them that counts.
fn at_most(n: u64, k: u64, p: f64) -> f64 {
    if k >= n || p <= 0.0 {
        return 1.0;
    }
    if p >= 1.0 {
        return 0.0;
    }
    let mean = n as f64 * p;
    let deviation = libm::sqrt(mean * (1.0 - p));
    let z = (k as f64 + 0.5 - mean) / deviation;
    // Far out the sum is 0 or 1 to more digits than an interval is asked for.
    if z.abs() > 12.0 && deviation > 3.0 {
        return normal_cdf(z);
    }
    let (n, ratio) = (n as f64, p / (1.0 - p));
    let ln_term = |i: f64| {
        libm::lgamma(n + 1.0) - libm::lgamma(i + 1.0) - libm::lgamma(n - i + 1.0)
            + i * libm::log(p)
            + (n - i) * libm::log1p(-p)
    };
    // The side with the fewer probable terms is summed, away from k.
    let below = k as f64 <= mean;
    let mut i = if below { k as f64 } else { k as f64 + 1.0 };
    let mut term = libm::exp(ln_term(i));
    let mut sum = 0.0;
    while term > 1e-18 * sum && (0.0..=n).contains(&i) {
        sum += term;
        if below {
            term *= i / ((n - i + 1.0) * ratio);
            i -= 1.0;
        } else {
            term *= (n - i) * ratio / (i + 1.0);
            i += 1.0;
        }
    }
    if below { sum } else { 1.0 - sum }
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

    #[test]
    fn a_binomial_sum_is_what_its_terms_say() {
        let direct = |n: u64, k: u64, p: f64| -> f64 {
            let mut term = libm::pow(1.0 - p, n as f64);
            let mut sum = term;
            for i in 0..k {
                term *= (n - i) as f64 / (i + 1) as f64 * p / (1.0 - p);
                sum += term;
            }
            sum
        };
        for (n, k, p) in [(20, 3, 0.1), (20, 17, 0.5), (30, 0, 0.01), (30, 29, 0.9)] {
            assert!((at_most(n, k, p) - direct(n, k, p)).abs() < 1e-12);
        }
    }
}
