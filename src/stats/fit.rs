//! A first-order approach to an end value, fitted by least squares.
//!
//! The curve is linear in its end and its amplitude and not in its time constant.
//! So time constants are scanned, each with its best line, and the best one is
//! the start of Gauss-Newton steps on all points. Nothing is random, and the
//! exponentials are `libm`'s, so the same points give the same digits everywhere.

use super::autocorrelation::Worth;
use super::line_through;

/// Fewer points than this say nothing about three parameters.
const FEWEST: usize = 6;

/// Time constants looked for, as multiples of the span of the points. Shorter
/// ones show in the first few points only, longer ones look like a straight line.
const SHORTEST: f64 = 0.01;
const LONGEST: f64 = 20.0;
const SCANNED: usize = 64;

/// The scan works on the means of at most this many blocks of points.
const SCAN_BLOCKS: usize = 256;

/// Blocks whose means are tested for a trend.
const TREND_BLOCKS: usize = 24;

/// Share of the points in which a fast phase would show.
const FIRST_PART: usize = 12;

/// A fitted curve y = end + amplitude exp(-(t - t_first) / tau).
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct FirstOrder {
    /// Value that the curve approaches, in the unit of y.
    pub end: f64,
    /// How far the curve is from its end at the first point, signed: negative on
    /// a rise. (Not at t = 0, which may be long before the first point.)
    pub amplitude: f64,
    /// Time constant, in the unit of t.
    pub tau: f64,
    /// Standard error of the end, widened by the effective number of residuals.
    pub end_error: f64,
    /// Standard error of the time constant, widened alike.
    pub tau_error: f64,
    /// Standard deviation of the residuals, n - 3 degrees of freedom.
    pub residual_sd: f64,
    /// Number of independent residuals that the n are worth.
    pub effective: f64,
    /// Whether the residuals look like noise: the means of up to 24 blocks of
    /// consecutive ones don't follow each other, and the first twelfth, where a
    /// fast phase would show, is not rougher than the rest.
    pub trend_free: bool,
    /// Number of points.
    pub n: usize,
}

/// The least-squares curve y = end + A exp(-(t - t_first) / tau) through points of
/// time and value, equally spaced or not.
///
/// Standard errors come from the linearised fit with the variance of the residuals
/// taken over the effective number of residuals less 3 (at least 1), as
/// [`Line::slope_error_with`](super::Line::slope_error_with) does for a line. For
/// unequally spaced points the effective number goes by order, not by time.
///
/// Nothing from fewer than six points, where times do not rise, where a value is
/// not finite, where y does not change, or where the best time constant lies
/// outside 0.01 to 20 times the span of the points: such points say nothing
/// about an end.
pub fn first_order(points: &[(f64, f64)]) -> Option<FirstOrder> {
    let scaled = Scaled::of(points)?;
    let start = scan(&blocks(&scaled.points, SCAN_BLOCKS))?;
    let curve = refine(&scaled.points, start)?;
    let errors = curve.errors(&scaled.points)?;
    let residuals: Vec<f64> = scaled
        .points
        .iter()
        .map(|(t, y)| y - curve.at(*t))
        .collect();
    let squares: f64 = residuals.iter().map(|r| r * r).sum();
    let n = points.len();
    // Residuals of rounding alone are no noise.
    let exact = (squares / n as f64).sqrt() <= 1e-9 * curve.amplitude.abs();
    let effective = if exact {
        n as f64
    } else {
        Worth::of(&residuals, 3).effective
    };
    let sd = (squares / (effective - 3.0).max(1.0)).sqrt();
    let tau = curve.tau();
    Some(FirstOrder {
        end: scaled.value + scaled.height * curve.end,
        amplitude: scaled.height * curve.amplitude,
        tau: scaled.span * tau,
        end_error: scaled.height * sd * errors.end,
        tau_error: scaled.span * tau * sd * errors.log_tau,
        residual_sd: scaled.height * (squares / (n as f64 - 3.0)).sqrt(),
        effective,
        trend_free: exact || trend_free(&residuals),
        n,
    })
}

/// Points with times from 0 to 1 and values from -1 to 1 about their middle.
struct Scaled {
    points: Vec<(f64, f64)>,
    span: f64,
    value: f64,
    height: f64,
}

impl Scaled {
    fn of(points: &[(f64, f64)]) -> Option<Self> {
        if points.len() < FEWEST || points.iter().any(|(t, y)| !t.is_finite() || !y.is_finite()) {
            return None;
        }
        if points.windows(2).any(|pair| pair[1].0 <= pair[0].0) {
            return None;
        }
        let first = points[0].0;
        let span = points[points.len() - 1].0 - first;
        let low = points.iter().map(|p| p.1).fold(f64::INFINITY, f64::min);
        let high = points.iter().map(|p| p.1).fold(f64::NEG_INFINITY, f64::max);
        let (value, height) = (low / 2.0 + high / 2.0, high / 2.0 - low / 2.0);
        let last_digits = 1e-13 * low.abs().max(high.abs());
        if !span.is_finite() || !height.is_finite() || height <= last_digits {
            return None;
        }
        let scale = |(t, y): &(f64, f64)| ((t - first) / span, (y - value) / height);
        Some(Self {
            points: points.iter().map(scale).collect(),
            span,
            value,
            height,
        })
    }
}

/// Means of consecutive points: at most `count` blocks of nearly equal size.
fn blocks(points: &[(f64, f64)], count: usize) -> Vec<(f64, f64)> {
    let count = count.min(points.len());
    let edge = |i: usize| i * points.len() / count;
    (0..count)
        .map(|i| {
            let block = &points[edge(i)..edge(i + 1)];
            let (t, y) = block
                .iter()
                .fold((0.0, 0.0), |sum, p| (sum.0 + p.0, sum.1 + p.1));
            (t / block.len() as f64, y / block.len() as f64)
        })
        .collect()
}

/// The curve in scaled units.
#[derive(Debug, Clone, Copy)]
struct Curve {
    end: f64,
    amplitude: f64,
    log_tau: f64,
}

/// Standard errors per unit of residual standard deviation.
struct Errors {
    end: f64,
    log_tau: f64,
}

/// Sums over the derivatives of a curve by amplitude and by log tau, taken about
/// their means and with the second one made orthogonal to the first.
struct Normal {
    mean_decay: f64,
    decay_squares: f64,
    mean_turn: f64,
    turn_squares: f64,
    turn_residuals: f64,
}

impl Curve {
    fn tau(&self) -> f64 {
        libm::exp(self.log_tau)
    }

    fn at(&self, t: f64) -> f64 {
        self.end + self.amplitude * libm::exp(-t / self.tau())
    }

    /// The best end and amplitude for a time constant, with the sum of squares.
    fn best(points: &[(f64, f64)], log_tau: f64) -> Option<(Self, f64)> {
        let tau = libm::exp(log_tau);
        let decays: Vec<(f64, f64)> = points
            .iter()
            .map(|(t, y)| (libm::exp(-t / tau), *y))
            .collect();
        let line = line_through(decays.iter().copied())?;
        let curve = Self {
            end: line.at(0.0),
            amplitude: line.slope,
            log_tau,
        };
        Some((curve, line.residual_squares))
    }

    fn normal(&self, points: &[(f64, f64)]) -> Normal {
        let tau = self.tau();
        let n = points.len() as f64;
        let mut rows: Vec<[f64; 3]> = points
            .iter()
            .map(|(t, y)| {
                let decay = libm::exp(-t / tau);
                let residual = y - self.end - self.amplitude * decay;
                [decay, self.amplitude * decay * t / tau, residual]
            })
            .collect();
        let mean_of = |rows: &[[f64; 3]], i: usize| rows.iter().map(|r| r[i]).sum::<f64>() / n;
        let product =
            |rows: &[[f64; 3]], i: usize, j: usize| rows.iter().map(|r| r[i] * r[j]).sum::<f64>();
        let (mean_decay, mean_turn) = (mean_of(&rows, 0), mean_of(&rows, 1));
        for row in &mut rows {
            row[0] -= mean_decay;
        }
        let decay_squares = product(&rows, 0, 0);
        let overlap = product(&rows, 0, 1) / decay_squares;
        for row in &mut rows {
            row[1] -= mean_turn + overlap * row[0];
        }
        Normal {
            mean_decay,
            decay_squares,
            mean_turn: mean_turn - overlap * mean_decay,
            turn_squares: product(&rows, 1, 1),
            turn_residuals: product(&rows, 1, 2),
        }
    }

    /// From the inverse of the normal equations, which the orthogonal derivatives
    /// make a sum: the end is the mean less what each derivative takes from it.
    fn errors(&self, points: &[(f64, f64)]) -> Option<Errors> {
        let normal = self.normal(points);
        let log_tau = 1.0 / normal.turn_squares;
        let end = 1.0 / points.len() as f64
            + normal.mean_decay * normal.mean_decay / normal.decay_squares
            + normal.mean_turn * normal.mean_turn * log_tau;
        let errors = Errors {
            end: end.sqrt(),
            log_tau: log_tau.sqrt(),
        };
        (errors.end.is_finite() && errors.log_tau.is_finite()).then_some(errors)
    }
}

/// The best scanned curve; nothing where the best is the first or the last one.
fn scan(points: &[(f64, f64)]) -> Option<Curve> {
    let (low, high) = (libm::log(SHORTEST), libm::log(LONGEST));
    let step = (high - low) / (SCANNED - 1) as f64;
    let mut best: Option<(usize, Curve, f64)> = None;
    for i in 0..SCANNED {
        let Some((curve, squares)) = Curve::best(points, low + i as f64 * step) else {
            continue;
        };
        if best.is_none_or(|(_, _, least)| squares < least) {
            best = Some((i, curve, squares));
        }
    }
    let (i, curve, _) = best?;
    (i > 0 && i < SCANNED - 1).then_some(curve)
}

/// Gauss-Newton steps on log tau, each with the best end and amplitude, halved
/// while they do not help.
fn refine(points: &[(f64, f64)], start: Curve) -> Option<Curve> {
    let (mut curve, mut squares) = Curve::best(points, start.log_tau)?;
    for _ in 0..50 {
        let normal = curve.normal(points);
        let mut step = (normal.turn_residuals / normal.turn_squares).clamp(-0.5, 0.5);
        if !step.is_finite() {
            return None;
        }
        let mut better = None;
        while step.abs() > 1e-12 && better.is_none() {
            better = Curve::best(points, curve.log_tau + step).filter(|(_, s)| *s < squares);
            step /= 2.0;
        }
        let Some(found) = better else { break };
        let moved = (found.0.log_tau - curve.log_tau).abs();
        (curve, squares) = found;
        if moved < 1e-12 {
            break;
        }
    }
    let inside = libm::log(SHORTEST)..=libm::log(LONGEST);
    inside.contains(&curve.log_tau).then_some(curve)
}

fn trend_free(residuals: &[f64]) -> bool {
    !follow_each_other(residuals) && !rough_start(residuals)
}

/// Whether the means of consecutive blocks of residuals follow each other more
/// than noise would: their lag-1 autocorrelation lies above the level that white
/// noise passes in about 1 of 100 fits. Three fitted parameters shift it by -3/m
/// and narrow it (computed by simulation for 6 to 36 blocks; no outside source).
/// Means of blocks thin out noise that is correlated over much less than a block.
fn follow_each_other(residuals: &[f64]) -> bool {
    let numbered: Vec<(f64, f64)> = residuals.iter().map(|r| (0.0, *r)).collect();
    let means = blocks(&numbered, TREND_BLOCKS);
    let m = means.len() as f64;
    let squares: f64 = means.iter().map(|(_, r)| r * r).sum();
    let products: f64 = means.windows(2).map(|pair| pair[0].1 * pair[1].1).sum();
    let limit = -3.0 / m + 2.33 * ((1.0 - 4.5 / m) / m).sqrt();
    products > limit * squares
}

/// Whether the residuals of the first twelfth of the points are rougher than the
/// others: the limit on the ratio of mean squares lies above the 99 % point of F
/// for white noise, and for noise of which ten values are worth one (simulated).
fn rough_start(residuals: &[f64]) -> bool {
    let (first, rest) = residuals.split_at((residuals.len() / FIRST_PART).max(1));
    let mean = |part: &[f64]| part.iter().map(|r| r * r).sum::<f64>() / part.len() as f64;
    mean(first) > (3.0 + 7.0 / first.len() as f64) * mean(rest)
}

#[cfg(test)]
mod tests {
    use super::*;
    use proptest::prelude::*;

    /// A rise from 20 towards 80 with tau 600, a reading every 10 s from 1000 s on.
    fn rise(n: usize, noise: impl Fn(usize) -> f64) -> Vec<(f64, f64)> {
        (0..n)
            .map(|i| {
                let t = i as f64 * 10.0;
                (
                    1000.0 + t,
                    80.0 - 60.0 * libm::exp(-t / 600.0) + 0.05 * noise(i),
                )
            })
            .collect()
    }

    /// Noise of standard deviation 1: the far digits of a sine.
    fn scatter(i: usize) -> f64 {
        let x = libm::sin(i as f64 * 12.9898) * 43_758.545_3;
        (x - x.floor() - 0.5) * 12f64.sqrt()
    }

    #[test]
    fn an_exact_rise_is_found_to_the_last_digits() {
        let fit = first_order(&rise(180, |_| 0.0)).unwrap();
        assert!((fit.end - 80.0).abs() < 1e-8, "{fit:?}");
        assert!((fit.amplitude + 60.0).abs() < 1e-8 && (fit.tau - 600.0).abs() < 1e-6);
        assert!(fit.trend_free && fit.n == 180 && fit.effective == 180.0);
    }

    #[test]
    fn unequal_steps_and_few_points_do_too() {
        let t = [0.0, 100.0, 150.0, 400.0, 900.0, 1000.0, 2200.0];
        let points = t.map(|t| (t, 5.0 + 3.0 * libm::exp(-t / 700.0)));
        let fit = first_order(&points).unwrap();
        assert!((fit.end - 5.0).abs() < 1e-8 && (fit.tau - 700.0).abs() < 1e-5);
        assert!((fit.amplitude - 3.0).abs() < 1e-8);
    }

    #[test]
    fn noise_is_noise() {
        let fit = first_order(&rise(180, scatter)).unwrap();
        assert!((fit.end - 80.0).abs() < 3.0 * fit.end_error, "{fit:?}");
        assert!((fit.tau - 600.0).abs() < 3.0 * fit.tau_error, "{fit:?}");
        assert!((fit.residual_sd - 0.05).abs() < 0.01, "{fit:?}");
        assert!(fit.trend_free && fit.end_error < 0.05, "{fit:?}");
    }

    #[test]
    fn a_second_time_constant_leaves_a_trend() {
        let points = rise(180, |i| {
            scatter(i) - 100.0 * libm::exp(-(i as f64) * 10.0 / 150.0)
        });
        let fit = first_order(&points).unwrap();
        assert!(!fit.trend_free, "{fit:?}");
    }

    #[test]
    fn a_fast_phase_is_noticed() {
        let points = rise(180, |i| {
            scatter(i) - 100.0 * libm::exp(-(i as f64) * 10.0 / 20.0)
        });
        let fit = first_order(&points).unwrap();
        assert!(!fit.trend_free, "{fit:?}");
    }

    #[test]
    fn points_without_an_end_have_none() {
        let line: Vec<(f64, f64)> = (0..50).map(|i| (i as f64, 2.0 * i as f64)).collect();
        assert_eq!(first_order(&line), None);
        let flat: Vec<(f64, f64)> = (0..50).map(|i| (i as f64, 4.0)).collect();
        assert_eq!(first_order(&flat), None);
        let grows: Vec<(f64, f64)> = (0..50)
            .map(|i| (i as f64, libm::exp(i as f64 / 10.0)))
            .collect();
        assert_eq!(first_order(&grows), None);
        assert_eq!(first_order(&rise(5, |_| 0.0)), None);
    }

    #[test]
    fn points_out_of_order_or_not_finite_are_refused() {
        let good = rise(20, |_| 0.0);
        let mut swapped = good.clone();
        swapped.swap(3, 4);
        let mut broken = good.clone();
        broken[7].1 = f64::NAN;
        let mut twice = good.clone();
        twice[5].0 = twice[4].0;
        for points in [swapped, broken, twice] {
            assert_eq!(first_order(&points), None);
        }
        let huge = [f64::MAX, -f64::MAX, 0.0, 1.0, 2.0, 3.0, 4.0];
        let points: Vec<(f64, f64)> = huge
            .iter()
            .enumerate()
            .map(|(i, y)| (i as f64, *y))
            .collect();
        // No panic, whatever it says.
        let _ = first_order(&points);
    }

    proptest! {
        #[test]
        fn another_unit_changes_nothing_but_the_unit(
            end in -50.0..150.0f64, amplitude in 1.0..80.0f64, tau in 200.0..2000.0f64,
            unit in 0.1..10.0f64, falls in any::<bool>(),
        ) {
            let height = if falls { amplitude } else { -amplitude };
            let points: Vec<(f64, f64)> = (0..120)
                .map(|i| (i as f64 * 20.0, i))
                .map(|(t, i)| (t, end + height * libm::exp(-t / tau) + 0.01 * scatter(i)))
                .collect();
            let scaled: Vec<(f64, f64)> =
                points.iter().map(|(t, y)| (t * unit, y * unit)).collect();
            let (one, other) = (first_order(&points).unwrap(), first_order(&scaled).unwrap());
            prop_assert!((one.end - end).abs() < 6.0 * one.end_error, "{:?}", one);
            prop_assert!((other.end / unit - one.end).abs() < 1e-4 * one.end_error);
            prop_assert!((other.tau / unit - one.tau).abs() < 1e-4 * one.tau_error);
            prop_assert!((other.end_error / unit / one.end_error - 1.0).abs() < 1e-4);
        }
    }
}
