//! The 95 % bound of a slope over a window.
//!
//! A course that bends is no noise: the regression's slope is the mean slope of a
//! parabola over the window all the same. So where there are points enough, the bend
//! is taken out of the residuals before they say how well the slope is known.

use crate::stats::{Line, effective_of, student_quantile};

/// From so many points on the bend is taken out.
const BEND_FROM: usize = 12;

/// Half-width of the two-sided 95 % interval of a line's slope, from the effective
/// number of its residuals; infinite where nothing can be said.
pub(super) fn slope_bound(points: &[(f64, f64)], line: &Line) -> f64 {
    let straight: Vec<f64> = points.iter().map(|(x, y)| y - line.at(*x)).collect();
    let (residuals, parameters) = match points.len() {
        n if n >= BEND_FROM => (unbent(points, &straight), 3.0),
        _ => (straight, 2.0),
    };
    let n = residuals.len() as f64;
    let squares: f64 = residuals.iter().map(|r| r * r).sum();
    // What rounding leaves is nothing.
    let last_digits = 1e-13 * line.mean_y.abs();
    if squares <= n * last_digits * last_digits {
        return 0.0;
    }
    let effective = effective_of(&residuals).map_or(0.0, |e| e.effective);
    let freedom = (effective.min(n) - parameters).max(1.0);
    let error = (squares / freedom / line.spread_x).sqrt();
    student_quantile(0.975, freedom).map_or(f64::INFINITY, |t| t * error)
}

/// Residuals about the least-squares parabola, from those about the line.
fn unbent(points: &[(f64, f64)], straight: &[f64]) -> Vec<f64> {
    let n = points.len() as f64;
    let mean = points.iter().map(|(x, _)| x).sum::<f64>() / n;
    let spread: f64 = points.iter().map(|(x, _)| (x - mean).powi(2)).sum();
    let skew: f64 = points.iter().map(|(x, _)| (x - mean).powi(3)).sum();
    // The square's own part, beside constant and slope.
    let bend: Vec<f64> = points
        .iter()
        .map(|(x, _)| {
            let d = x - mean;
            d * d - spread / n - skew / spread * d
        })
        .collect();
    let squares: f64 = bend.iter().map(|b| b * b).sum();
    if squares <= 0.0 || !squares.is_finite() {
        return straight.to_vec();
    }
    let along: f64 = bend.iter().zip(straight).map(|(b, r)| b * r).sum();
    let share = along / squares;
    bend.iter()
        .zip(straight)
        .map(|(b, r)| r - share * b)
        .collect()
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::stats::line_through;

    fn bound(points: &[(f64, f64)]) -> f64 {
        let line = line_through(points.iter().copied()).expect("a line");
        slope_bound(points, &line)
    }

    fn noisy(n: usize, size: f64) -> Vec<(f64, f64)> {
        (0..n)
            .map(|i| {
                let x = i as f64 * 5.0;
                let hash = (i as u64 + 1).wrapping_mul(0x9E37_79B9_7F4A_7C15);
                let noise = (hash >> 11) as f64 / (1u64 << 53) as f64 - 0.5;
                (x, 9.0 + 1e-3 * x + size * noise)
            })
            .collect()
    }

    #[test]
    fn a_bend_is_no_noise_and_noise_is() {
        let bent: Vec<(f64, f64)> = (0..30)
            .map(|i| {
                (
                    f64::from(i),
                    20.0 + 0.1 * f64::from(i) - 2e-3 * f64::from(i * i),
                )
            })
            .collect();
        assert!(bound(&bent) < 1e-12, "{}", bound(&bent));
        assert!(bound(&noisy(60, 0.1)) > 1e-5);
        assert!(bound(&noisy(60, 0.2)) > 1.9 * bound(&noisy(60, 0.1)));
    }

    // White noise of 60 points: t(57) sd sqrt(12) / (span sqrt(n)), computed; the span
    // is that of 60 points 5 s apart, sd of even noise its width over sqrt(12).
    #[test]
    fn white_noise_has_the_textbook_bound() {
        let found = bound(&noisy(60, 0.1));
        let textbook = 2.0 * 0.1 / (295.0 * 60.0_f64.sqrt());
        assert!(
            (0.5 * textbook..2.5 * textbook).contains(&found),
            "{found} {textbook}"
        );
    }

    #[test]
    fn few_points_keep_their_bend_as_doubt() {
        let bent: Vec<(f64, f64)> = (0..6)
            .map(|i| (f64::from(i), 20.0 - 0.1 * f64::from(i * i)))
            .collect();
        assert!(bound(&bent) > 0.1);
    }
}
