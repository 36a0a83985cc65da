//! Is this soak settled? One object, fed with recorded values only, asked by `run`
//! while running and by `analysis` from the record, so that both say the same.
//!
//! Values are averaged on a grid of 5 s (or the polling interval, where that is
//! longer), counted from energising; a decision is taken only when a grid cell
//! closes. Temperatures are the body's rise over the bay's own ambient.
//!
//! A load that cycles (thermostat) is judged by the highest temperatures of its
//! cycles, of which the window must hold four: a cycle's own swing is neither a
//! trend nor scatter. Its power is not watched.

mod criterion;
mod cycles;

use crate::quantity::{Moment, Seconds};
use crate::spec::sequence::Criterion;

use criterion::{Asked, ask};

/// Least length of a grid cell.
const GRID_S: f64 = 5.0;

/// Power below this share of its highest in the soak has vanished ...
const VANISHED: f64 = 0.01;

/// ... where it lasts this long.
const VANISHED_S: f64 = 10.0;

/// What a value is of.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Watched {
    /// Power, W.
    Power,
    /// The body's temperature, degrees Celsius.
    Body,
    /// The bay's own ambient, degrees Celsius.
    Ambient,
}

/// Where a soak stands.
#[derive(Debug, Clone, PartialEq)]
pub enum Settling {
    /// Before the shortest soak.
    TooEarly,
    /// Not yet, and why.
    NotYet(String),
    /// Settled, for good.
    Settled {
        /// Start of the window that shows it.
        from: Moment,
        /// Its end.
        to: Moment,
        /// The criterion in words.
        criterion: String,
    },
    /// The current vanished: never settled.
    WentOpen,
}

/// A soak as far as it is known.
#[derive(Debug, Clone)]
pub struct Settle {
    criterion: Criterion,
    at_least: f64,
    grid: f64,
    cycling: bool,
    energised: Moment,
    cell: Option<u64>,
    sums: [Sum; 3],
    last_ambient: Option<f64>,
    series: Series,
    highest: f64,
    vanished_since: Option<Moment>,
    state: Settling,
}

/// Grid values so far: seconds since energising, W or K.
#[derive(Debug, Clone, Default)]
struct Series {
    power: Vec<(f64, f64)>,
    rise: Vec<(f64, f64)>,
}

#[derive(Debug, Clone, Copy, Default)]
struct Sum {
    sum: f64,
    n: f64,
}

impl Sum {
    fn take(&mut self) -> Option<f64> {
        let mean = (self.n > 0.0).then(|| self.sum / self.n);
        *self = Sum::default();
        mean
    }
}

impl Settle {
    /// A soak that is polled each `every` and was energised at `energised`; `cycling`
    /// where a thermostat switches.
    pub fn new(criterion: &Criterion, at_least: Seconds, every: Seconds, cycling: bool, energised: Moment) -> Self {
        Self {
            criterion: criterion.clone(),
            at_least: at_least.get(),
            grid: every.get().max(GRID_S),
            cycling,
            energised,
            cell: None,
            sums: [Sum::default(); 3],
            last_ambient: None,
            series: Series::default(),
            highest: 0.0,
            vanished_since: None,
            state: Settling::TooEarly,
        }
    }

    /// Takes a recorded value; times must not fall. Values after the end change nothing.
    pub fn take(&mut self, at: Moment, watched: Watched, value: f64) {
        if matches!(self.state, Settling::Settled { .. } | Settling::WentOpen) {
            return;
        }
        let cell = (at.since(self.energised).get() / self.grid) as u64;
        if self.cell.is_some_and(|open| cell > open) {
            self.close_cell();
        }
        self.cell = Some(self.cell.map_or(cell, |open| open.max(cell)));
        let sum = &mut self.sums[watched as usize];
        sum.sum += value;
        sum.n += 1.0;
        if watched == Watched::Power && !self.cycling {
            self.watch_vanishing(at, value);
        }
    }

    /// Where the soak stands.
    pub fn state(&self) -> &Settling {
        &self.state
    }

    fn watch_vanishing(&mut self, at: Moment, power: f64) {
        self.highest = self.highest.max(power);
        if power >= VANISHED * self.highest || self.highest <= 0.0 {
            self.vanished_since = None;
            return;
        }
        let since = *self.vanished_since.get_or_insert(at);
        if at.since(since).get() >= VANISHED_S {
            self.state = Settling::WentOpen;
        }
    }

    fn close_cell(&mut self) {
        let Some(cell) = self.cell else { return };
        let middle = (cell as f64 + 0.5) * self.grid;
        let [power, body, ambient] = [0, 1, 2].map(|n| self.sums[n].take());
        self.last_ambient = ambient.or(self.last_ambient);
        self.series.power.extend(power.map(|p| (middle, p)));
        let rise = body.zip(self.last_ambient).map(|(body, ambient)| body - ambient);
        self.series.rise.extend(rise.map(|r| (middle, r)));
        if self.state == Settling::WentOpen {
            return;
        }
        self.state = self.decide((cell + 1) as f64 * self.grid);
    }

    fn decide(&self, elapsed: f64) -> Settling {
        if elapsed < self.at_least {
            return Settling::TooEarly;
        }
        let asked = Asked {
            power: if self.cycling { None } else { self.criterion.power_change.map(|_| self.series.power.as_slice()) },
            rise: self.criterion.temperature_change.map(|_| self.series.rise.as_slice()),
            cycling: self.cycling,
            elapsed,
            grid: self.grid,
        };
        match ask(&self.criterion, &asked) {
            Err(reason) => Settling::NotYet(reason),
            Ok(window) => Settling::Settled {
                from: self.energised + Seconds::new(elapsed - window).unwrap_or_default(),
                to: self.energised + Seconds::of(elapsed),
                criterion: criterion::words(&self.criterion),
            },
        }
    }
}

#[cfg(test)]
mod tests;
