//! Straight lines through points: all at once, or over running sums that can
//! drop old points. Sums are kept about the mean, and points about the first one, so
//! that nothing cancels where offsets are large.

/// A line through points, with how well it is known.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Line {
    /// Number of points.
    pub n: usize,
    /// Mean of x.
    pub mean_x: f64,
    /// Mean of y.
    pub mean_y: f64,
    /// Slope, y per x.
    pub slope: f64,
    /// Sum of squared residuals.
    pub residual_squares: f64,
    /// Sum of squared deviations of x from its mean.
    pub spread_x: f64,
}

impl Line {
    /// The line's value at `x`.
    pub fn at(&self, x: f64) -> f64 {
        self.mean_y + self.slope * (x - self.mean_x)
    }

    /// What is left of a sum of squares by rounding alone is nothing.
    fn without_rounding(&self, squares: f64) -> f64 {
        let last_digits = 1e-14 * self.mean_y.abs();
        if squares <= self.n as f64 * last_digits * last_digits {
            0.0
        } else {
            squares
        }
    }

    /// Standard deviation of the residuals, n - 2 degrees of freedom.
    pub fn residual_sd(&self) -> f64 {
        (self.residual_squares / (self.n as f64 - 2.0)).sqrt()
    }

    /// Standard error of the slope for independent residuals.
    pub fn slope_error(&self) -> f64 {
        self.residual_sd() / self.spread_x.sqrt()
    }

    /// Standard error of the line's own value at `x` for independent residuals
    /// (JCGM 100, H.3.4), n - 2 degrees of freedom.
    pub fn error_at(&self, x: f64) -> f64 {
        let off = x - self.mean_x;
        self.residual_sd() * (1.0 / self.n as f64 + off * off / self.spread_x).sqrt()
    }

    /// Standard error of the slope and its degrees of freedom where the residuals
    /// are worth only `effective` independent ones: n is replaced by it in n - 2,
    /// never below 1 (adjusted standard error of Santer and others, 2000, from memory).
    pub fn slope_error_with(&self, effective: f64) -> (f64, f64) {
        let freedom = (effective.min(self.n as f64) - 2.0).max(1.0);
        let error = (self.residual_squares / freedom / self.spread_x).sqrt();
        (error, freedom)
    }
}

/// The least-squares line through points; nothing from fewer than three points,
/// or where all have the same x, or where a value is not finite.
pub fn line_through(points: impl IntoIterator<IntoIter: Clone, Item = (f64, f64)>) -> Option<Line> {
    let points = points.into_iter();
    let mut running = RunningLine::default();
    for (x, y) in points.clone() {
        running.add(x, y);
    }
    let line = running.line()?;
    let residual_squares = points
        .map(|(x, y)| {
            // About the first point, which no large offset rounds.
            let (x, y) = running.about_origin(x, y);
            (y - running.mean_y - line.slope * (x - running.mean_x)).powi(2)
        })
        .sum();
    Some(Line {
        residual_squares: line.without_rounding(residual_squares),
        ..line
    })
}

/// Running sums of a least-squares line, kept about the mean (Welford's update
/// and its inverse), which itself is kept about the first point.
#[derive(Debug, Clone, Copy, PartialEq, Default)]
pub struct RunningLine {
    n: usize,
    origin: (f64, f64),
    mean_x: f64,
    mean_y: f64,
    xx: f64,
    xy: f64,
    yy: f64,
}

impl RunningLine {
    /// Number of points.
    pub fn len(&self) -> usize {
        self.n
    }

    /// Whether there is no point.
    pub fn is_empty(&self) -> bool {
        self.n == 0
    }

    fn about_origin(&self, x: f64, y: f64) -> (f64, f64) {
        (x - self.origin.0, y - self.origin.1)
    }

    /// Takes a point in.
    pub fn add(&mut self, x: f64, y: f64) {
        if self.n == 0 {
            self.origin = (x, y);
        }
        let (x, y) = self.about_origin(x, y);
        self.n += 1;
        let n = self.n as f64;
        let (dx, dy) = (x - self.mean_x, y - self.mean_y);
        self.mean_x += dx / n;
        self.mean_y += dy / n;
        self.xx += dx * (x - self.mean_x);
        self.xy += dx * (y - self.mean_y);
        self.yy += dy * (y - self.mean_y);
    }

    /// Drops a point that was taken in before.
    pub fn remove(&mut self, x: f64, y: f64) {
        if self.n <= 1 {
            *self = Self::default();
            return;
        }
        let (x, y) = self.about_origin(x, y);
        self.n -= 1;
        let n = self.n as f64;
        let (dx, dy) = (x - self.mean_x, y - self.mean_y);
        self.mean_x -= dx / n;
        self.mean_y -= dy / n;
        self.xx -= dx * (x - self.mean_x);
        self.xy -= dx * (y - self.mean_y);
        self.yy -= dy * (y - self.mean_y);
    }

    /// The line; nothing where [`line_through`] gives nothing.
    pub fn line(&self) -> Option<Line> {
        let known = self.xx.is_finite() && self.xy.is_finite() && self.yy.is_finite();
        if self.n < 3 || !known || self.xx <= 0.0 {
            return None;
        }
        let slope = self.xy / self.xx;
        let residual_squares = (self.yy - slope * self.xy).max(0.0);
        let line = Line {
            n: self.n,
            mean_x: self.origin.0 + self.mean_x,
            mean_y: self.origin.1 + self.mean_y,
            slope,
            residual_squares: if residual_squares <= 1e-14 * self.yy.abs() {
                0.0
            } else {
                residual_squares
            },
            spread_x: self.xx,
        };
        Some(Line {
            residual_squares: line.without_rounding(line.residual_squares),
            ..line
        })
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use proptest::prelude::*;

    // NIST StRD, linear regression, dataset Norris: pairs of y and x.
    const NORRIS: [(f64, f64); 36] = [
        (0.1, 0.2),
        (338.8, 337.4),
        (118.1, 118.2),
        (888.0, 884.6),
        (9.2, 10.1),
        (228.1, 226.5),
        (668.5, 666.3),
        (998.5, 996.3),
        (449.1, 448.6),
        (778.9, 777.0),
        (559.2, 558.2),
        (0.3, 0.4),
        (0.1, 0.6),
        (778.1, 775.5),
        (668.8, 666.9),
        (339.3, 338.0),
        (448.9, 447.5),
        (10.8, 11.6),
        (557.7, 556.0),
        (228.3, 228.1),
        (998.0, 995.8),
        (888.8, 887.6),
        (119.6, 120.2),
        (0.3, 0.3),
        (0.6, 0.3),
        (557.6, 556.8),
        (339.3, 339.1),
        (888.0, 887.2),
        (998.5, 999.0),
        (778.9, 779.0),
        (10.2, 11.1),
        (117.6, 118.3),
        (228.9, 229.2),
        (668.4, 669.1),
        (449.2, 448.9),
        (0.2, 0.5),
    ];

    fn close(found: f64, certified: f64, relative: f64) {
        assert!(
            ((found - certified) / certified).abs() < relative,
            "{found} is not {certified}"
        );
    }

    fn certified(line: &Line, relative: f64) {
        close(line.slope, 1.002_116_818_020_45, relative);
        close(line.at(0.0), -0.262_323_073_774_029, relative * 1e2);
        close(line.residual_sd(), 0.884_796_396_144_373, relative * 1e2);
        close(
            line.slope_error(),
            0.000_429_796_848_199_937,
            relative * 1e2,
        );
    }

    // Certified values of NIST StRD Norris.
    #[test]
    fn norris_of_nist_strd() {
        certified(&line_through(NORRIS.map(|(y, x)| (x, y))).unwrap(), 1e-13);
    }

    #[test]
    fn norris_after_other_points_came_and_went() {
        let mut running = RunningLine::default();
        let others = [(-1e3, 4e3), (2e3, 7.0), (12.0, -9e2)];
        for (x, y) in others {
            running.add(x, y);
        }
        for (y, x) in NORRIS {
            running.add(x, y);
        }
        for (x, y) in others {
            running.remove(x, y);
        }
        assert_eq!(running.len(), 36);
        certified(&running.line().unwrap(), 1e-11);
    }

    #[test]
    fn too_little_says_nothing() {
        assert_eq!(line_through([(0.0, 1.0), (1.0, 2.0)]), None);
        assert_eq!(line_through([(1.0, 1.0); 5]), None);
        assert_eq!(
            line_through([(0.0, f64::NAN), (1.0, 1.0), (2.0, 1.0)]),
            None
        );
        let mut empty = RunningLine::default();
        empty.remove(1.0, 1.0);
        assert!(empty.is_empty());
    }

    #[test]
    fn fewer_independent_residuals_widen_the_slope() {
        let line = line_through(NORRIS.map(|(y, x)| (x, y))).unwrap();
        let (all, freedom) = line.slope_error_with(36.0);
        close(all, line.slope_error(), 1e-12);
        assert_eq!(freedom, 34.0);
        assert!(line.slope_error_with(9.0).0 > all);
        assert_eq!(line.slope_error_with(0.5).1, 1.0);
    }

    proptest! {
        #[test]
        fn a_sliding_window_equals_its_own_line(
            ys in prop::collection::vec(-50.0..50.0f64, 40..120),
            offset in -1e4..1e4f64,
        ) {
            let at = |i: usize| (i as f64 * 5.0, offset + ys[i]);
            let mut running = RunningLine::default();
            for i in 0..ys.len() {
                let (x, y) = at(i);
                running.add(x, y);
                if i >= 30 {
                    let (x, y) = at(i - 30);
                    running.remove(x, y);
                }
            }
            let sliding = running.line().unwrap();
            let whole = line_through((ys.len() - 30..ys.len()).map(at)).unwrap();
            prop_assert!((sliding.slope - whole.slope).abs() < 1e-9);
            prop_assert!((sliding.residual_squares - whole.residual_squares).abs()
                < 1e-7 * (1.0 + whole.residual_squares));
        }
    }
}
