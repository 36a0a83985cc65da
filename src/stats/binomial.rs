//! Counts: the binomial distribution and the exact interval for a share.

use super::special::{beta, root};

/// Trials for which the digits hold, checked against SciPy.
const MOST: u64 = 100_000_000;

/// Probability of at most `k` successes in `n` trials that each succeed with
/// probability `p`: I_{1-p}(n - k, k + 1), Abramowitz and Stegun 26.5.24.
///
/// Nothing where `n` is above 1e8 or `p` lies outside 0 to 1.
pub fn binomial_cdf(k: u64, n: u64, p: f64) -> Option<f64> {
    if n > MOST || !(0.0..=1.0).contains(&p) {
        return None;
    }
    if k >= n {
        return Some(1.0);
    }
    Some(beta((n - k) as f64, (k + 1) as f64, 1.0 - p, p))
}

/// The exact interval of Clopper and Pearson (1934) for the share behind `k` of
/// `n`: each end leaves (1 - level) / 2. With k = 0 or k = n one end is 0 or 1, and
/// the other one still leaves (1 - level) / 2.
///
/// Nothing where `n` is 0 or above 1e8, `k` above `n`, or `level` outside
/// 0.5 to 1 - 1e-6.
pub fn clopper_pearson(k: u64, n: u64, level: f64) -> Option<(f64, f64)> {
    if n == 0 || n > MOST || k > n || !(0.5..=1.0 - 1e-6).contains(&level) {
        return None;
    }
    let tail = (1.0 - level) / 2.0;
    let low = if k == 0 { 0.0 } else { lower_end(k, n, tail) };
    let high = if k == n {
        1.0
    } else {
        1.0 - lower_end(n - k, n, tail)
    };
    Some((low, high))
}

/// The share at which `k` or more of `n` have the probability `tail`; found on the
/// scale of log odds, so that small shares keep their digits.
fn lower_end(k: u64, n: u64, tail: f64) -> f64 {
    if k == n {
        return libm::exp(libm::log(tail) / n as f64);
    }
    if k == 1 {
        return -libm::expm1(libm::log1p(-tail) / n as f64);
    }
    let share = |odds: f64| {
        (
            1.0 / (1.0 + libm::exp(-odds)),
            1.0 / (1.0 + libm::exp(odds)),
        )
    };
    let misses = |odds: f64| {
        let (x, y) = share(odds);
        beta(k as f64, (n - k + 1) as f64, x, y) - tail
    };
    // From two successes on, every lower end lies between 1e-7 / n and k / n.
    let observed = libm::log(k as f64 / (n - k) as f64);
    let least = libm::log(1e-7 / n as f64);
    share(root(misses, least, observed)).0
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_coin_by_hand() {
        for (k, expected) in [
            (0, 1.0),
            (1, 5.0),
            (2, 11.0),
            (3, 15.0),
            (4, 16.0),
            (9, 16.0),
        ] {
            let p = binomial_cdf(k, 4, 0.5).unwrap();
            assert!((p - expected / 16.0).abs() < 1e-15, "{k}: {p}");
        }
        assert_eq!(binomial_cdf(3, 10, 0.0), Some(1.0));
        assert_eq!(binomial_cdf(3, 10, 1.0), Some(0.0));
    }

    // Of very many trials half lie at most at the middle; the crate that was used
    // before says 0.365 at 1e7 (measured).
    #[test]
    fn very_many_trials() {
        // 0.5 + the half of the middle's own share, 1 / sqrt(2 pi n).
        for n in [100_000u64, 10_000_000, 100_000_000] {
            let n_real = n as f64;
            let expected =
                0.5 + (1.0 - 0.25 / n_real) / (2.0 * std::f64::consts::PI * n_real).sqrt();
            let p = binomial_cdf(n / 2, n, 0.5).unwrap();
            assert!((p - expected).abs() < 1e-9, "{n}: {p}");
        }
    }

    #[test]
    fn none_and_all() {
        // Success-run: 0 of n failed, 1 - (tail)^(1/n), computed.
        let (low, high) = clopper_pearson(0, 20, 0.9).unwrap();
        assert_eq!(low, 0.0);
        assert!((high - (1.0 - libm::pow(0.05, 1.0 / 20.0))).abs() < 1e-14);
        let (low, high) = clopper_pearson(20, 20, 0.9).unwrap();
        assert!((low - libm::pow(0.05, 1.0 / 20.0)).abs() < 1e-14);
        assert_eq!(high, 1.0);
    }

    #[test]
    fn each_end_leaves_its_share() {
        for (k, n) in [(1, 2), (3, 10), (9, 10), (17, 4000), (50_000, 100_000)] {
            let (low, high) = clopper_pearson(k, n, 0.95).unwrap();
            let above = 1.0 - binomial_cdf(k - 1, n, low).unwrap();
            let below = binomial_cdf(k, n, high).unwrap();
            assert!((above - 0.025).abs() < 1e-11 && (below - 0.025).abs() < 1e-11);
            assert!(low < k as f64 / n as f64 && k as f64 / (n as f64) < high);
        }
    }

    #[test]
    fn what_cannot_be_said_is_not_said() {
        assert_eq!(binomial_cdf(1, MOST + 1, 0.5), None);
        assert_eq!(binomial_cdf(1, 2, 1.1), None);
        assert_eq!(binomial_cdf(1, 2, f64::NAN), None);
        for (k, n, level) in [(0, 0, 0.9), (3, 2, 0.9), (1, 2, 1.0), (1, 2, f64::NAN)] {
            assert_eq!(clopper_pearson(k, n, level), None);
        }
    }
}
