//! A first-order approach to an end: y = end + amplitude exp(-t / tau).

use super::{effective_of, line_through};

/// Fewer points than this say nothing of three parameters.
const FEWEST: usize = 12;
/// Time constants that are tried, evenly in their logarithm.
const TRIED: usize = 24;
/// Blocks of residuals that are compared for a trend.
const BLOCKS: usize = 6;
/// Their means may scatter this much more than noise would let them.
const TREND_FREE: f64 = 3.0;

/// What a fit found; times count from the points' own zero.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct FirstOrder {
    /// Where it ends.
    pub end: f64,
    /// Distance from the end at time zero.
    pub amplitude: f64,
    /// Time constant, in the points' unit of time.
    pub tau: f64,
    /// Standard error of the end, from the effective number of residuals.
    pub end_error: f64,
    /// Standard error of the time constant.
    pub tau_error: f64,
    /// Standard deviation of the residuals.
    pub residual_sd: f64,
    /// What the residuals are worth in independent ones.
    pub effective: f64,
    /// Whether the residuals show no trend.
    pub trend_free: bool,
    /// Number of points.
    pub n: usize,
}

/// The least-squares fit; nothing from fewer than twelve points, from values that are
/// not finite, or where no time constant within reach of the points fits best.
pub fn first_order(points: &[(f64, f64)]) -> Option<FirstOrder> {
    let (first, last) = (points.first()?.0, points.last()?.0);
    let span = last - first;
    if points.len() < FEWEST || !span.is_finite() || span <= 0.0 {
        return None;
    }
    let squares = |log_tau: f64| linear(points, first, libm::exp(log_tau)).map(|fit| fit.2);
    let (low, high) = (libm::log(span / 50.0), libm::log(span * 10.0));
    let step = (high - low) / TRIED as f64;
    let best = (0..=TRIED)
        .filter_map(|k| Some((k, squares(low + step * k as f64)?)))
        .min_by(|a, b| a.1.total_cmp(&b.1))?;
    if best.0 == 0 || best.0 == TRIED {
        return None;
    }
    let middle = low + step * best.0 as f64;
    let tau = libm::exp(golden(middle - step, middle + step, |x| {
        squares(x).unwrap_or(f64::INFINITY)
    }));
    let (end, at_first, _) = linear(points, first, tau)?;
    let shape = |t: f64| libm::exp(-(t - first) / tau);
    let residuals: Vec<f64> = points
        .iter()
        .map(|(t, y)| y - end - at_first * shape(*t))
        .collect();
    let sum: f64 = residuals.iter().map(|r| r * r).sum();
    let n = points.len();
    let effective = effective_of(&residuals).map_or(0.0, |e| e.effective);
    let variance = sum / (effective.min(n as f64) - 3.0).max(1.0);
    let rows = points.iter().map(|(t, _)| {
        let e = shape(*t);
        [1.0, e, at_first * e * (t - first) / (tau * tau)]
    });
    let errors = errors(rows, variance)?;
    Some(FirstOrder {
        end,
        amplitude: at_first * libm::exp(first / tau),
        tau,
        end_error: errors[0],
        tau_error: errors[2],
        residual_sd: (sum / (n as f64 - 3.0)).sqrt(),
        effective,
        trend_free: is_trend_free(&residuals, 1e-6 * at_first.abs()),
        n,
    })
}

/// End, distance from it at `first`, and sum of squares, for a known time constant.
fn linear(points: &[(f64, f64)], first: f64, tau: f64) -> Option<(f64, f64, f64)> {
    let shaped = points
        .iter()
        .map(|(t, y)| (libm::exp(-(t - first) / tau), *y));
    let line = line_through(shaped)?;
    Some((line.at(0.0), line.slope, line.residual_squares))
}

fn golden(mut low: f64, mut high: f64, of: impl Fn(f64) -> f64) -> f64 {
    const SHARE: f64 = 0.618_033_988_749_894_8;
    let (mut a, mut b) = (high - SHARE * (high - low), low + SHARE * (high - low));
    let (mut at_a, mut at_b) = (of(a), of(b));
    for _ in 0..40 {
        if at_a < at_b {
            (high, b, at_b) = (b, a, at_a);
            a = high - SHARE * (high - low);
            at_a = of(a);
        } else {
            (low, a, at_a) = (a, b, at_b);
            b = low + SHARE * (high - low);
            at_b = of(b);
        }
    }
    0.5 * (low + high)
}

/// Standard errors from the inverse of the normal equations.
fn errors(rows: impl Iterator<Item = [f64; 3]>, variance: f64) -> Option<[f64; 3]> {
    let mut m = [[0.0; 3]; 3];
    for row in rows {
        for i in 0..3 {
            for j in 0..3 {
                m[i][j] += row[i] * row[j];
            }
        }
    }
    let minor = |i: usize, j: usize| {
        let (r, c) = ([(i + 1) % 3, (i + 2) % 3], [(j + 1) % 3, (j + 2) % 3]);
        m[r[0]][c[0]] * m[r[1]][c[1]] - m[r[0]][c[1]] * m[r[1]][c[0]]
    };
    let determinant: f64 = (0..3).map(|j| m[0][j] * minor(0, j)).sum();
    if determinant <= 0.0 || !determinant.is_finite() {
        return None;
    }
    Some([0, 1, 2].map(|i| (variance * (minor(i, i) / determinant).max(0.0)).sqrt()))
}

/// Whether the means of blocks scatter no more than noise lets them; noise is told
/// from the differences of neighbours.
fn is_trend_free(residuals: &[f64], negligible: f64) -> bool {
    let n = residuals.len() as f64;
    let differences: f64 = residuals.windows(2).map(|w| (w[1] - w[0]).powi(2)).sum();
    let noise = 0.5 * differences / (n - 1.0);
    let size = residuals.len().div_ceil(BLOCKS);
    let of_blocks: f64 = residuals
        .chunks(size)
        .map(|block| {
            let sum: f64 = block.iter().sum();
            sum * sum / block.len() as f64
        })
        .sum();
    let all: f64 = residuals.iter().map(|r| r * r).sum();
    // What rounding leaves has no trend that matters.
    all <= n * negligible * negligible || of_blocks / (BLOCKS as f64) <= TREND_FREE * noise
}
