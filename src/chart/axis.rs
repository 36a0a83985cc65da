//! Panels with their axes: round steps, own numbers, labels that never overlap.

use super::canvas::{Anchor, Canvas, Lettering, Point};
use super::ink::{Dash, GRID, INK, SOFT};
use super::DrawError;

/// Size of small lettering; nothing is smaller.
pub(super) const SMALL: f64 = 15.0;

/// A line of values along one side of a panel.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Axis {
    low: f64,
    high: f64,
    from: f64,
    to: f64,
}

impl Axis {
    /// Values from `low` to `high` between two pixels. Ends that coincide or are not
    /// finite are spread.
    pub(super) fn new(low: f64, high: f64, from: f64, to: f64) -> Self {
        let (low, high) = match (low.is_finite(), high.is_finite()) {
            (true, true) if high - low > 1e-12 * high.abs().max(1e-9) => (low, high),
            (true, _) => (low - 0.5, low + 0.5),
            _ => (0.0, 1.0),
        };
        Self { low, high, from, to }
    }

    /// The pixel of a value, which may lie outside.
    pub(super) fn at(&self, value: f64) -> f64 {
        self.from + (value - self.low) / (self.high - self.low) * (self.to - self.from)
    }

    /// The pixel of a value, kept inside.
    pub(super) fn within(&self, value: f64) -> f64 {
        self.at(value.clamp(self.low, self.high))
    }

    pub(super) fn holds(&self, value: f64) -> bool {
        self.low <= value && value <= self.high
    }

    /// Round values with about `wanted` steps.
    pub(super) fn ticks(&self, wanted: f64) -> Vec<f64> {
        let step = round_step((self.high - self.low) / wanted);
        let first = (self.low / step).ceil() as i64;
        let last = (self.high / step).floor() as i64;
        (first..=last.min(first + 60)).map(|n| n as f64 * step).collect()
    }
}

/// 1, 2 or 5 times a power of ten, the next above.
fn round_step(raw: f64) -> f64 {
    let magnitude = 10f64.powf(raw.log10().floor());
    let part = raw / magnitude;
    let round = [1.0, 2.0, 5.0].into_iter().find(|r| part <= r * 1.000_001).unwrap_or(10.0);
    round * magnitude
}

/// A number as short as it can be read, with at most four decimals.
pub(super) fn number(value: f64) -> String {
    let text = format!("{:.4}", if value.abs() < 5e-5 { 0.0 } else { value });
    text.trim_end_matches('0').trim_end_matches('.').to_owned()
}

/// A rectangle with an axis on its left and one below.
#[derive(Debug, Clone, Copy)]
pub(super) struct Panel {
    pub(super) left: f64,
    pub(super) top: f64,
    pub(super) right: f64,
    pub(super) bottom: f64,
    pub(super) x: Axis,
    pub(super) y: Axis,
}

impl Panel {
    /// A panel over a rectangle and two ranges of values.
    pub(super) fn new([left, top, right, bottom]: [f64; 4], x: (f64, f64), y: (f64, f64)) -> Self {
        Self {
            left,
            top,
            right,
            bottom,
            x: Axis::new(x.0, x.1, left, right),
            y: Axis::new(y.0, y.1, bottom, top),
        }
    }

    /// Grid, frame and numbers; the axes' names.
    pub(super) fn draw(&self, canvas: &Canvas, title: &str, x_name: &str, y_name: &str) -> Result<(), DrawError> {
        let small = Lettering::plain(SMALL, SOFT);
        for tick in self.x.ticks((self.right - self.left) / 95.0) {
            let x = self.x.at(tick);
            canvas.line(&[(x, self.top), (x, self.bottom)], GRID, 1.0, Dash::Solid)?;
            canvas.text(&number(tick), (x, self.bottom + 14.0), Anchor::Centre, small)?;
        }
        for tick in self.y.ticks((self.bottom - self.top) / 55.0) {
            let y = self.y.at(tick);
            canvas.line(&[(self.left, y), (self.right, y)], GRID, 1.0, Dash::Solid)?;
            canvas.text(&number(tick), (self.left - 8.0, y), Anchor::Right, small)?;
        }
        canvas.frame((self.left, self.top), (self.right, self.bottom), INK)?;
        canvas.text(title, (self.left, self.top - 16.0), Anchor::Left, Lettering::bold(17.0, INK))?;
        let middle = (self.left + self.right) / 2.0;
        canvas.text(x_name, (middle, self.bottom + 36.0), Anchor::Centre, Lettering::plain(SMALL, INK))?;
        let middle = (self.top + self.bottom) / 2.0;
        canvas.text_upwards(y_name, (self.left - 62.0, middle), Lettering::plain(SMALL, INK))
    }

    /// The point of two values, kept inside the panel.
    pub(super) fn at(&self, x: f64, y: f64) -> Point {
        (self.x.within(x), self.y.within(y))
    }
}

/// Pushes labels apart that would overlap: their middles are at least `apart` from
/// each other and stay between `top` and `bottom` where there is room.
pub(super) fn spread(wanted: &[f64], apart: f64, top: f64, bottom: f64) -> Vec<f64> {
    let mut order: Vec<usize> = (0..wanted.len()).collect();
    order.sort_by(|a, b| wanted[*a].total_cmp(&wanted[*b]));
    let mut places = wanted.to_vec();
    let mut lowest_free = top;
    for n in &order {
        places[*n] = places[*n].max(lowest_free);
        lowest_free = places[*n] + apart;
    }
    let mut highest_free = bottom;
    for n in order.iter().rev() {
        places[*n] = places[*n].min(highest_free);
        highest_free = places[*n] - apart;
    }
    places
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn ticks_are_round_and_inside() {
        assert_eq!(Axis::new(0.0, 10.0, 0.0, 1.0).ticks(5.0), [0.0, 2.0, 4.0, 6.0, 8.0, 10.0]);
        assert_eq!(Axis::new(8.93, 9.21, 0.0, 1.0).ticks(3.0), [9.0, 9.1, 9.200000000000001]);
        for (low, high) in [(0.0, 0.0), (f64::NAN, 1.0), (5.0, f64::INFINITY), (1e12, 1e12 + 1.0), (-3.0, -3.0)] {
            assert!(Axis::new(low, high, 0.0, 100.0).ticks(5.0).len() < 62);
            assert!(Axis::new(low, high, 0.0, 100.0).at(1.0).is_finite());
        }
    }

    #[test]
    fn numbers_are_short() {
        assert_eq!([2500.0, 0.1, 9.2000000001, -0.0, 1e-9].map(number), ["2500", "0.1", "9.2", "0", "0"]);
    }

    #[test]
    fn labels_are_pushed_apart_and_stay_inside() {
        let places = spread(&[100.0, 101.0, 99.0, 300.0], 20.0, 0.0, 305.0);
        let mut sorted = places.clone();
        sorted.sort_by(f64::total_cmp);
        assert!(sorted.windows(2).all(|p| p[1] - p[0] >= 20.0 - 1e-9), "{places:?}");
        assert!(sorted[3] <= 305.0 && places[2] < places[0] && places[0] < places[1]);
    }
}
