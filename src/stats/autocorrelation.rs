//! How many independent values correlated ones are worth.

use super::line_through;

/// The effective number of independent values among equally spaced ones.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Effective {
    /// Values in all.
    pub n: usize,
    /// What they are worth: between 0 and n. Below 2 it is reported, not used.
    pub effective: f64,
    /// Lags that were summed: the cut is at the first rho that is not positive.
    pub lags: usize,
    /// Standard deviation about the trend.
    pub scatter: f64,
    /// Change of the trend from one value to the next.
    pub trend: f64,
}

/// n_eff = n / (1 + 2 sum (1 - k/n) rho_k), with rho_k given for lags 1, 2, ...
pub fn effective_with(n: usize, rho: impl IntoIterator<Item = f64>) -> f64 {
    let count = n as f64;
    let sum: f64 = (1..n)
        .zip(rho)
        .map(|(lag, rho)| (1.0 - lag as f64 / count) * rho)
        .sum();
    count / (1.0 + 2.0 * sum)
}

/// The effective number of equally spaced `values`, from their own
/// autocorrelation: the trend is removed and the sum cut at the first rho_k <= 0,
/// because the full sum over estimated rho is always -1/2 and says nothing.
/// Nothing from fewer than three values.
pub fn effective_of(values: &[f64]) -> Option<Effective> {
    let n = values.len();
    let points = values.iter().enumerate().map(|(i, y)| (i as f64, *y));
    let line = line_through(points)?;
    let worth = |effective, lags| Effective {
        n,
        effective,
        lags,
        scatter: line.residual_sd(),
        trend: line.slope,
    };
    if line.residual_squares == 0.0 {
        return Some(worth(n as f64, 0));
    }
    let residuals: Vec<f64> = values
        .iter()
        .enumerate()
        .map(|(i, y)| y - line.at(i as f64))
        .collect();
    let (effective, lags) = worth_of_residuals(&residuals);
    Some(worth(effective, lags))
}

/// What residuals in order are worth, and the lags that were summed.
pub(super) fn worth_of_residuals(residuals: &[f64]) -> (f64, usize) {
    let n = residuals.len();
    let variance = residuals.iter().map(|r| r * r).sum::<f64>() / n as f64;
    let rho = |lag: usize| {
        let products = residuals.iter().zip(&residuals[lag..]).map(|(a, b)| a * b);
        products.sum::<f64>() / (n - lag) as f64 / variance
    };
    let positive: Vec<f64> = (1..n).map(rho).take_while(|rho| *rho > 0.0).collect();
    let lags = positive.len();
    (effective_with(n, positive).min(n as f64), lags)
}

#[cfg(test)]
mod tests {
    use super::*;

    fn first_order(phi: f64, n: usize) -> f64 {
        effective_with(n, (1..n).map(|lag| libm::pow(phi, lag as f64)))
    }

    // Computed from the AR(1) autocorrelation phi^k; no outside source.
    #[test]
    fn first_order_processes_with_known_correlation() {
        for (phi, n, expected) in [
            (0.5, 20, 7.142_856_7),
            (0.9, 100, 5.813_937_3),
            (0.99, 900, 5.084_671_2),
        ] {
            assert!((first_order(phi, n) - expected).abs() < 1e-6, "{phi}");
        }
        assert!((first_order(0.0, 20) - 20.0).abs() < 1e-12);
    }

    /// Uniform noise in -0.5..0.5 from a linear congruential generator (constants
    /// of Knuth's MMIX, from memory).
    fn noise(seed: u64) -> impl FnMut() -> f64 {
        let mut state = seed;
        move || {
            state = state
                .wrapping_mul(6_364_136_223_846_793_005)
                .wrapping_add(1_442_695_040_888_963_407);
            (state >> 11) as f64 / (1u64 << 53) as f64 - 0.5
        }
    }

    #[test]
    fn estimated_correlation_comes_near_the_known_one() {
        let mut next = noise(7);
        let mut y = 0.0;
        let values: Vec<f64> = (0..4000)
            .map(|_| {
                y = 0.9 * y + next();
                y
            })
            .collect();
        let found = effective_of(&values).unwrap();
        // n (1 - phi) / (1 + phi) = 210 for long series.
        assert!((120.0..350.0).contains(&found.effective), "{found:?}");
    }

    #[test]
    fn independent_values_keep_most_of_their_number_and_a_trend_costs_nothing() {
        let mut next = noise(3);
        let values: Vec<f64> = (0..500).map(|i| i as f64 * 0.3 + next()).collect();
        let found = effective_of(&values).unwrap();
        assert!(found.effective > 300.0 && found.effective <= 500.0);
        assert!((found.trend - 0.3).abs() < 0.001);
        assert!((found.scatter - 1.0 / 12f64.sqrt()).abs() < 0.03);
    }

    #[test]
    fn values_that_do_not_move_count_in_full() {
        let found = effective_of(&[4.0; 12]).unwrap();
        assert_eq!((found.effective, found.scatter), (12.0, 0.0));
        assert_eq!(effective_of(&[1.0, 2.0]), None);
    }
}
