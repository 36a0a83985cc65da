//! Means of quantities that were observed together.

use super::Correlation;

/// Means of paired observations, as inputs of a budget.
#[derive(Debug, Clone, PartialEq)]
pub struct PairedMeans {
    /// Observations of each quantity.
    pub n: usize,
    /// Degrees of freedom of each standard uncertainty: n - 1.
    pub freedom: f64,
    /// Mean of each quantity, in its own unit.
    pub means: Vec<f64>,
    /// Standard uncertainty of each mean, s / sqrt(n) (JCGM 100, 4.2.3).
    pub standards: Vec<f64>,
    /// Correlation of each pair of means (JCGM 100, 5.2.3); 0 where one of them does
    /// not vary. `a` is the earlier quantity.
    pub correlations: Vec<Correlation>,
}

/// Means, their standard uncertainties and their correlations from quantities that
/// were observed together: `series` holds the observations of each one in the same
/// order.
///
/// Nothing from fewer than two observations, from series of unequal length, or
/// where a value is not finite.
pub fn paired_means(series: &[&[f64]]) -> Option<PairedMeans> {
    let n = series.first()?.len();
    let usable = |values: &&[f64]| values.len() == n && values.iter().all(|v| v.is_finite());
    if n < 2 || !series.iter().all(usable) {
        return None;
    }
    let count = n as f64;
    let means: Vec<f64> = series.iter().map(|values| mean(values)).collect();
    let deviations: Vec<Vec<f64>> = series
        .iter()
        .zip(&means)
        .map(|(values, mean)| values.iter().map(|v| v - mean).collect())
        .collect();
    let product = |a: &[f64], b: &[f64]| a.iter().zip(b).map(|(x, y)| x * y).sum::<f64>();
    let squares: Vec<f64> = deviations.iter().map(|d| product(d, d)).collect();
    let standards: Vec<f64> = squares
        .iter()
        .map(|squares| (squares / (count - 1.0) / count).sqrt())
        .collect();
    let mut correlations = Vec::new();
    for b in 0..series.len() {
        for a in 0..b {
            let scale = squares[a].sqrt() * squares[b].sqrt();
            let r = if scale > 0.0 {
                (product(&deviations[a], &deviations[b]) / scale).clamp(-1.0, 1.0)
            } else {
                0.0
            };
            correlations.push(Correlation { a, b, r });
        }
    }
    let known = means.iter().chain(&standards).all(|v| v.is_finite());
    known.then_some(PairedMeans {
        n,
        freedom: count - 1.0,
        means,
        standards,
        correlations,
    })
}

/// About the first value, then corrected once, so that a large offset costs no digits.
fn mean(values: &[f64]) -> f64 {
    let first = values[0];
    let count = values.len() as f64;
    let rough = first + values.iter().map(|v| v - first).sum::<f64>() / count;
    rough + values.iter().map(|v| v - rough).sum::<f64>() / count
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn what_moves_together_is_correlated() {
        let (a, b) = ([1.0, 2.0, 3.0, 4.0], [-2.0, -4.0, -6.0, -8.0]);
        let flat = [5.0; 4];
        let found = paired_means(&[&a, &b, &flat]).unwrap();
        assert_eq!((found.n, found.freedom), (4, 3.0));
        assert_eq!(found.means, [2.5, -5.0, 5.0]);
        // s of 1..4 is sqrt(5/3), by hand.
        assert!((found.standards[0] - (5f64 / 12.0).sqrt()).abs() < 1e-15);
        let r: Vec<f64> = found.correlations.iter().map(|c| c.r).collect();
        assert!((r[0] + 1.0).abs() < 1e-15);
        assert_eq!(&r[1..], [0.0, 0.0]);
    }

    #[test]
    fn too_little_or_unequal_says_nothing() {
        assert_eq!(paired_means(&[]), None);
        assert_eq!(paired_means(&[&[1.0]]), None);
        assert_eq!(paired_means(&[&[1.0, 2.0], &[1.0]]), None);
        assert_eq!(paired_means(&[&[1.0, f64::NAN]]), None);
        assert_eq!(paired_means(&[&[f64::MAX, -f64::MAX]]), None);
    }
}
