//! Is this soak settled, by which criterion, over which window? One object, asked
//! on a grid of recorded values, while running and from the record alike: the
//! same pushes give the same answer.
//!
//! What is pushed: every recorded value of the soak's own step, in the order of
//! the record, with the moment of its reply. The grid starts at `energised`; a
//! cell is closed, and the question decided, by the first value that lies beyond
//! it. A cell holds the means of its values, so that polling faster does not
//! change what is watched.
//!
//! The watched temperature is the body's rise over ambient; the body itself
//! where no ambient was ever pushed.
//!
//! # Cycling loads
//! Where the appliance has a thermostat and its power has been seen to fall below
//! half of its highest, grid cells say nothing: every cycle breaks them. Then the
//! criterion is asked of *whole cycles*, from one switching on to the next, each
//! counting with its mean power and mean rise: a slope over the cycles in the
//! window (at least the last four), three readings that are cycles, the change
//! between the cycles within the interval (at least the last three). A load that
//! has not switched off yet is asked on the grid. Power that vanishes means
//! nothing there.

mod criteria;
mod cycles;

use std::collections::VecDeque;

use crate::quantity::{Moment, Seconds};
use crate::spec::sequence::{Criterion, CriterionKind};
use crate::stats::RunningLine;

use criteria::{Answer, Point};
use cycles::Cycles;

/// A grid cell is never shorter than this, seconds.
const SHORTEST_CELL_S: f64 = 5.0;
/// Power below this share of its highest has vanished.
const VANISHED: f64 = 0.01;
/// For so long, seconds.
const VANISHED_FOR_S: f64 = 10.0;

/// What a value is of.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Watched {
    /// Active power, W.
    Power,
    /// The watched body's temperature, degrees Celsius.
    Body,
    /// The bay's own ambient, degrees Celsius.
    Ambient,
}

/// Whether a soak is settled.
#[derive(Debug, Clone, PartialEq)]
pub enum Settling {
    /// The least time has not passed.
    TooEarly,
    /// It is not, and this is what still changes, in words.
    NotYet(String),
    /// It is, and stays so.
    Settled {
        /// Start of the criterion's window.
        from: Moment,
        /// Its end.
        to: Moment,
        /// The criterion with what was found, in words.
        criterion: String,
    },
    /// The power vanished while energised: a link, an element or the switch
    /// opened. It stays so and is never settled.
    WentOpen,
}

/// Watches one soak.
#[derive(Debug, Clone)]
pub struct Settle {
    criterion: Criterion,
    at_least_s: f64,
    cell_us: u64,
    cycling: bool,
    energised: Moment,
    open_cell: u64,
    sums: Sums,
    ambient_known: bool,
    cells: VecDeque<Point>,
    power_line: RunningLine,
    rise_line: RunningLine,
    cycles: Cycles,
    highest_w: f64,
    vanished_since: Option<Moment>,
    state: Settling,
}

impl Settle {
    /// Watches a soak by `criterion`, not before `at_least` after `energised` (the
    /// moment at which energising was announced), polled `every` so often; `cycling` where a thermostat is declared.
    pub fn new(
        criterion: &Criterion,
        at_least: Seconds,
        every: Seconds,
        cycling: bool,
        energised: Moment,
    ) -> Self {
        let cell_s = every.get().max(SHORTEST_CELL_S);
        Settle {
            criterion: criterion.clone(),
            at_least_s: at_least.get(),
            cell_us: Seconds::of(cell_s).as_micros(),
            cycling,
            energised,
            open_cell: 0,
            sums: Sums::default(),
            ambient_known: false,
            cells: VecDeque::new(),
            power_line: RunningLine::default(),
            rise_line: RunningLine::default(),
            cycles: Cycles::default(),
            highest_w: 0.0,
            vanished_since: None,
            state: Settling::TooEarly,
        }
    }

    /// Takes a recorded value in; `at` is the moment of its reply. Values from
    /// before energising and values that are not finite are passed over.
    pub fn take(&mut self, at: Moment, watched: Watched, value: f64) {
        let over = matches!(self.state, Settling::Settled { .. } | Settling::WentOpen);
        if over || at < self.energised || !value.is_finite() {
            return;
        }
        let cell = at.micros_since(self.energised) / self.cell_us;
        if cell > self.open_cell {
            self.close_cell();
            self.open_cell = cell;
            if matches!(self.state, Settling::Settled { .. }) {
                return;
            }
        }
        self.ambient_known |= watched == Watched::Ambient;
        self.sums.add(watched, value);
        if self.cycling {
            let t = at.since(self.energised).get();
            self.cycles.take(t, watched, value);
        } else if watched == Watched::Power {
            self.watch_for_vanishing(at, value);
        }
    }

    /// Whether it is settled, as of the last closed cell.
    pub fn state(&self) -> &Settling {
        &self.state
    }

    fn watch_for_vanishing(&mut self, at: Moment, power_w: f64) {
        self.highest_w = self.highest_w.max(power_w);
        if self.highest_w <= 0.0 || power_w >= VANISHED * self.highest_w {
            self.vanished_since = None;
            return;
        }
        let since = *self.vanished_since.get_or_insert(at);
        if at.since(since).get() >= VANISHED_FOR_S {
            self.state = Settling::WentOpen;
        }
    }

    fn close_cell(&mut self) {
        let cell_s = self.cell_us as f64 * 1e-6;
        let from = self.open_cell as f64 * cell_s;
        let point = Point {
            from,
            to: from + cell_s,
            power: self.sums.power.mean(),
            rise: self.sums.rise(self.ambient_known),
        };
        self.sums = Sums::default();
        self.keep(point);
        let now = from + cell_s;
        self.state = if now < self.at_least_s {
            Settling::TooEarly
        } else {
            self.decide(now, cell_s)
        };
    }

    /// Keeps a point and drops those that no criterion looks at any more.
    fn keep(&mut self, point: Point) {
        let (middle, now) = (point.middle(), point.to);
        if let Some(power) = point.power {
            self.power_line.add(middle, power);
        }
        if let Some(rise) = point.rise {
            self.rise_line.add(middle, rise);
        }
        self.cells.push_back(point);
        let oldest = now - criteria::looks_back(&self.criterion.kind, now) - 1e-6;
        while let Some(first) = self.cells.front().copied().filter(|p| p.from < oldest) {
            self.cells.pop_front();
            if let Some(power) = first.power {
                self.power_line.remove(first.middle(), power);
            }
            if let Some(rise) = first.rise {
                self.rise_line.remove(first.middle(), rise);
            }
        }
    }

    fn decide(&self, now: f64, cell_s: f64) -> Settling {
        let answer = if self.cycling && self.cycles.has_switched_off() {
            criteria::over_cycles(&self.criterion, self.cycles.complete(), now)
        } else {
            self.over_cells(now, cell_s)
        };
        match answer {
            Answer::NotYet(why) => Settling::NotYet(why),
            Answer::Settled { from, to, found } => Settling::Settled {
                from: self.energised + Seconds::of(from.max(0.0)),
                to: self.energised + Seconds::of(to.max(0.0)),
                criterion: found,
            },
        }
    }

    fn over_cells(&self, now: f64, cell_s: f64) -> Answer {
        match self.criterion.kind {
            CriterionKind::Slope { window } => {
                let full = criteria::full(&self.cells, now, window.get(), cell_s);
                let lines = (&self.power_line, &self.rise_line);
                full.unwrap_or_else(|| criteria::slope(&self.criterion, &self.cells, lines))
            }
            CriterionKind::ThreeReadings => {
                criteria::three_readings(&self.criterion, &self.cells, now, cell_s)
            }
            CriterionKind::ChangeWithin { interval } => {
                let full = criteria::full(&self.cells, now, interval.get(), cell_s);
                full.unwrap_or_else(|| criteria::change_within(&self.criterion, &self.cells))
            }
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
struct Sums {
    power: Sum,
    body: Sum,
    ambient: Sum,
}

impl Sums {
    fn add(&mut self, watched: Watched, value: f64) {
        match watched {
            Watched::Power => self.power.add(value),
            Watched::Body => self.body.add(value),
            Watched::Ambient => self.ambient.add(value),
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

#[cfg(test)]
mod tests;
