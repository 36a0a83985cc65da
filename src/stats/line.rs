//! Straight-line least squares.

use std::collections::VecDeque;

/// A fitted line and how well it is known.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Line {
    /// Value at the mean of x.
    pub at_mean: f64,
    /// Mean of x.
    pub mean_x: f64,
    /// Slope, y per x.
    pub slope: f64,
    /// Standard error of the slope, for independent residuals.
    pub slope_error: f64,
    /// Residual standard deviation.
    pub residual: f64,
    /// Points.
    pub n: usize,
}

impl Line {
    /// The fitted value at `x`.
    pub fn at(&self, x: f64) -> f64 {
        self.at_mean + self.slope * (x - self.mean_x)
    }
}

/// Least squares over points (x, y); nothing with fewer than three, or where every x
/// is the same.
pub fn fit(points: impl Iterator<Item = (f64, f64)> + Clone) -> Option<Line> {
    let n = points.clone().count();
    let count = n as f64;
    let (sx, sy) = points.clone().fold((0.0, 0.0), |(sx, sy), (x, y)| (sx + x, sy + y));
    let (mx, my) = (sx / count, sy / count);
    let sums = points.fold((0.0, 0.0, 0.0), |(xx, xy, yy), (x, y)| {
        let (dx, dy) = (x - mx, y - my);
        (xx + dx * dx, xy + dx * dy, yy + dy * dy)
    });
    from_sums(n, mx, my, sums)
}

fn from_sums(n: usize, mx: f64, my: f64, (xx, xy, yy): (f64, f64, f64)) -> Option<Line> {
    if n < 3 || xx <= 0.0 {
        return None;
    }
    let slope = xy / xx;
    let left = (yy - slope * xy).max(0.0);
    let residual = (left / (n as f64 - 2.0)).sqrt();
    Some(Line { at_mean: my, mean_x: mx, slope, slope_error: residual / xx.sqrt(), residual, n })
}

/// A line over a trailing window, kept by sums about an origin that moves along, so
/// that adding and dropping a point cost the same however long the window is.
#[derive(Debug, Clone, Default)]
pub struct RunningLine {
    points: VecDeque<(f64, f64)>,
    origin: (f64, f64),
    sums: [f64; 5],
    dropped: usize,
}

impl RunningLine {
    /// Adds a point; x must not fall.
    pub fn push(&mut self, x: f64, y: f64) {
        if self.points.is_empty() {
            self.origin = (x, y);
            self.sums = [0.0; 5];
        }
        self.points.push_back((x, y));
        self.count(x, y, 1.0);
    }

    /// Drops every point whose x is below `from`.
    pub fn drop_below(&mut self, from: f64) {
        while self.points.front().is_some_and(|(x, _)| *x < from) {
            if let Some((x, y)) = self.points.pop_front() {
                self.count(x, y, -1.0);
                self.dropped += 1;
            }
        }
        // Differences of sums lose digits for ever: start anew now and then.
        if self.dropped > 256 {
            self.renew();
        }
    }

    /// The points, oldest first.
    pub fn points(&self) -> impl DoubleEndedIterator<Item = (f64, f64)> + Clone + '_ {
        self.points.iter().copied()
    }

    /// The line over the points that are there.
    pub fn line(&self) -> Option<Line> {
        let n = self.points.len() as f64;
        let [sx, sy, xx, xy, yy] = self.sums;
        let sums = (xx - sx * sx / n, xy - sx * sy / n, yy - sy * sy / n);
        from_sums(self.points.len(), self.origin.0 + sx / n, self.origin.1 + sy / n, sums)
    }

    fn count(&mut self, x: f64, y: f64, sign: f64) {
        let (dx, dy) = (x - self.origin.0, y - self.origin.1);
        for (sum, term) in self.sums.iter_mut().zip([dx, dy, dx * dx, dx * dy, dy * dy]) {
            *sum += sign * term;
        }
    }

    fn renew(&mut self) {
        self.dropped = 0;
        let points = std::mem::take(&mut self.points);
        for (x, y) in points {
            self.push(x, y);
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    /// NIST StRD Norris, certified; pairs y x.
    const NORRIS: [(f64, f64); 36] = [
        (0.1, 0.2), (338.8, 337.4), (118.1, 118.2), (888.0, 884.6), (9.2, 10.1), (228.1, 226.5),
        (668.5, 666.3), (998.5, 996.3), (449.1, 448.6), (778.9, 777.0), (559.2, 558.2), (0.3, 0.4),
        (0.1, 0.6), (778.1, 775.5), (668.8, 666.9), (339.3, 338.0), (448.9, 447.5), (10.8, 11.6),
        (557.7, 556.0), (228.3, 228.1), (998.0, 995.8), (888.8, 887.6), (119.6, 120.2), (0.3, 0.3),
        (0.6, 0.3), (557.6, 556.8), (339.3, 339.1), (888.0, 887.2), (998.5, 999.0), (778.9, 779.0),
        (10.2, 11.1), (117.6, 118.3), (228.9, 229.2), (668.4, 669.1), (449.2, 448.9), (0.2, 0.5),
    ];

    fn near(a: f64, b: f64) -> bool {
        (a - b).abs() <= 1e-9 * b.abs()
    }

    #[test]
    fn the_certified_values_of_norris_are_met() {
        let line = fit(NORRIS.iter().map(|(y, x)| (*x, *y))).unwrap();
        assert!(near(line.slope, 1.002_116_818_020_45));
        assert!(near(line.at(0.0), -0.262_323_073_774_029));
        assert!(near(line.slope_error, 0.000_429_796_848_199_937));
        assert!(near(line.residual, 0.884_796_396_144_373));
    }

    #[test]
    fn running_sums_agree_with_a_fresh_fit_however_long_they_run() {
        let mut running = RunningLine::default();
        for n in 0..5000 {
            let x = 5.0 * f64::from(n);
            running.push(x, 1500.0 + 1e-4 * x + (f64::from(n) * 0.7).sin());
            running.drop_below(x - 600.0);
        }
        let fresh = fit(running.points()).unwrap();
        let found = running.line().unwrap();
        assert!((found.slope - fresh.slope).abs() < 1e-9 && (found.residual - fresh.residual).abs() < 1e-6);
    }

    #[test]
    fn two_points_or_one_instant_are_no_line() {
        assert_eq!(fit([(0.0, 1.0), (1.0, 2.0)].into_iter()), None);
        assert_eq!(fit([(1.0, 1.0); 5].into_iter()), None);
    }
}
