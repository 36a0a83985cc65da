//! Means over grid cells or cycles, and the running lines through them.

use super::Watched;
use crate::stats::RunningLine;

/// Means over a stretch, in seconds after energising.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Point {
    pub(super) from: f64,
    pub(super) to: f64,
    pub(super) power: Option<f64>,
    pub(super) rise: Option<f64>,
    pub(super) ambient: Option<f64>,
    pub(super) voltage: Option<f64>,
}

impl Point {
    pub(super) fn middle(&self) -> f64 {
        0.5 * (self.from + self.to)
    }

    /// Two neighbours as one, weighted by their lengths.
    pub(super) fn merged(&self, next: &Point) -> Point {
        let (own, other) = (self.to - self.from, next.to - next.from);
        let mean = |a: Option<f64>, b: Option<f64>| match (a, b) {
            (Some(a), Some(b)) => Some((own * a + other * b) / (own + other)),
            (one, other) => one.or(other),
        };
        Point {
            from: self.from,
            to: next.to,
            power: mean(self.power, next.power),
            rise: mean(self.rise, next.rise),
            ambient: mean(self.ambient, next.ambient),
            voltage: mean(self.voltage, next.voltage),
        }
    }
}

/// A sum that becomes a mean.
#[derive(Debug, Clone, Copy, Default)]
struct Sum {
    total: f64,
    count: u32,
}

impl Sum {
    fn add(&mut self, value: f64) {
        self.total += value;
        self.count += 1;
    }

    fn mean(&self) -> Option<f64> {
        (self.count > 0).then(|| self.total / f64::from(self.count))
    }
}

/// Sums of what is watched, over a grid cell or a cycle.
#[derive(Debug, Clone, Copy, Default)]
pub(super) struct Sums {
    power: Sum,
    voltage: Sum,
    body: Sum,
    ambient: Sum,
}

impl Sums {
    pub(super) fn add(&mut self, watched: Watched, value: f64) {
        match watched {
            Watched::Power => self.power.add(value),
            Watched::Voltage => self.voltage.add(value),
            Watched::Body => self.body.add(value),
            Watched::Ambient => self.ambient.add(value),
        }
    }

    /// The means of a stretch.
    pub(super) fn point(&self, from: f64, to: f64, ambient_known: bool) -> Point {
        Point {
            from,
            to,
            power: self.power.mean(),
            rise: self.rise(ambient_known),
            ambient: self.ambient.mean(),
            voltage: self.voltage.mean(),
        }
    }

    /// The body's rise over ambient; the body itself where no ambient is known.
    fn rise(&self, ambient_known: bool) -> Option<f64> {
        let body = self.body.mean()?;
        if !ambient_known {
            return Some(body);
        }
        self.ambient.mean().map(|ambient| body - ambient)
    }
}

/// Running lines through the watched quantities of the kept points.
#[derive(Debug, Clone, Copy, Default)]
pub(super) struct Lines {
    pub(super) power: RunningLine,
    pub(super) rise: RunningLine,
}

impl Lines {
    pub(super) fn add(&mut self, point: &Point) {
        self.each(point, RunningLine::add);
    }

    pub(super) fn remove(&mut self, point: &Point) {
        self.each(point, RunningLine::remove);
    }

    fn each(&mut self, point: &Point, change: fn(&mut RunningLine, f64, f64)) {
        if let Some(power) = point.power {
            change(&mut self.power, point.middle(), power);
        }
        if let Some(rise) = point.rise {
            change(&mut self.rise, point.middle(), rise);
        }
    }
}
