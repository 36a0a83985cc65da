//! Is this soak settled, by which criterion, over which window? One object, asked
//! on a grid of recorded values, while running and from the record alike: the
//! same pushes give the same answer.
//!
//! What is pushed: every recorded value of the soak's own step, in the order of
//! the record, with the moment of its reply; [`watched_in`] says which. A cell is
//! closed, and the question decided, by the first value that lies beyond it. A cell
//! holds the means of its values, so that polling faster does not change what is
//! watched. The grid starts at `energised`; where rows come slower than every 5 s
//! (readings by hand), a cell is as long as their interval and the grid is centred
//! on the first of them, so that a reading a little early or late keeps its cell.
//!
//! The watched temperature is the body's rise over ambient; the body itself
//! where no ambient was ever pushed.
//!
//! # Criteria
//! | name | settled when | source |
//! |---|---|---|
//! | slope | the regression over the window, with its 95 % bound from the effective number of cells, lies within the limit per hour | IEC 60598-1 12.4.1 with 1 K/h, IEC 60034-1 with 2 K/h; the bound is a house default |
//! | three readings | three readings 10 % of the elapsed time apart, at least 5 min, differ by no more than the larger of the stated change and the resolution | UL 1278 39.1.8 |
//! | change within | largest less smallest within the interval lies within the limit | with 10 min and 1 K: IEC 61810-7; else house default |
//! | sampling method | logged for 15 min to 3 h at 1 s or faster, the first third dropped: the slope of the rest lies below 10 mW/h up to 1 W, 1 % of the power per hour above | IEC 62301 ed. 2, from memory |
//!
//! All watched quantities meet it on the same window, not before the least time (house
//! default 10 min), and not while the drift of ambient or supply over that window
//! explains more than half of the limit (house default).
//!
//! # Cycling loads
//! Where the appliance has a thermostat and its power has been seen to fall below
//! half of its highest, grid cells say nothing: every cycle breaks them. Then the
//! criterion is asked of *whole cycles*, from one switching on to the next, each
//! counting with its mean power and mean rise, over at least the last four. A load
//! that has not switched off yet is asked on the grid. Power that vanishes means
//! nothing there, and nothing is predicted.

mod bound;
mod criteria;
mod cycles;
mod drift;
mod limits;
mod points;
mod predict;
mod slow;

use std::collections::VecDeque;

use crate::quantity::{Moment, Reading, Readings, Seconds};
use crate::spec::sequence::{RoleKind, Soaking};

use criteria::{Answer, Asked, View, over_cells};
use cycles::Cycles;
use limits::{Quantity, watched};
use points::{Lines, Point, Sums};
use predict::{Fit, Forecast, told};
pub use predict::{Prediction, Predictions};

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
    /// Supply voltage at the power meter, V.
    Voltage,
    /// The watched body's temperature, degrees Celsius.
    Body,
    /// The bay's own ambient, degrees Celsius.
    Ambient,
}

impl Watched {
    /// What a reading of a role is watched as.
    pub fn of(kind: RoleKind, role: &str, reading: Reading) -> Option<Self> {
        match (kind, reading, role) {
            (RoleKind::PowerMeter, Reading::Power, _) => Some(Watched::Power),
            (RoleKind::PowerMeter, Reading::Voltage, _) => Some(Watched::Voltage),
            (RoleKind::Temperature, Reading::Temperature, "body") => Some(Watched::Body),
            (RoleKind::Temperature, Reading::Temperature, "ambient") => Some(Watched::Ambient),
            _ => None,
        }
    }
}

/// The watched values of one row, in the order in which they are pushed.
pub fn watched_in<'a>(
    kind: RoleKind,
    role: &'a str,
    readings: &'a Readings,
) -> impl Iterator<Item = (Watched, f64)> + 'a {
    readings
        .iter()
        .filter_map(move |(reading, value)| Some((Watched::of(kind, role, reading)?, value)))
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
    /// It was ended early: the sequence allows it, and predictions agree. It stays so.
    Extrapolated {
        /// Start of the stretch over which they agree.
        from: Moment,
        /// Its end.
        to: Moment,
        /// Predicted power; absent where the power itself meets the criterion, or is
        /// not predicted.
        power: Option<Prediction>,
        /// Predicted rise of the body, likewise.
        rise: Option<Prediction>,
        /// How, in words.
        criterion: String,
    },
    /// The power vanished while energised: a link, an element or the switch
    /// opened. It stays so and is never settled.
    WentOpen,
}

/// Watches one soak.
#[derive(Debug, Clone)]
pub struct Settle {
    soaking: Soaking,
    cell_us: u64,
    energised: Moment,
    /// Start of the grid, microseconds after energising; known from the first value on.
    grid_us: Option<i64>,
    open_cell: i64,
    sums: Sums,
    ambient_known: bool,
    log_from: Option<f64>,
    cells: VecDeque<Point>,
    lines: Lines,
    cycles: Cycles,
    forecast: Forecast,
    /// End of the last closed cell.
    closed_to: f64,
    highest_w: f64,
    vanished_since: Option<Moment>,
    state: Settling,
}

impl Settle {
    /// Watches a soak; `energised` is the moment at which energising was announced.
    pub fn new(soaking: Soaking, energised: Moment) -> Self {
        let cell_s = soaking.soak.every.get().max(SHORTEST_CELL_S);
        Settle {
            soaking,
            cell_us: Seconds::of(cell_s).as_micros().max(1),
            energised,
            grid_us: None,
            open_cell: 0,
            sums: Sums::default(),
            ambient_known: false,
            log_from: None,
            cells: VecDeque::new(),
            lines: Lines::default(),
            cycles: Cycles::default(),
            forecast: Forecast::default(),
            closed_to: 0.0,
            highest_w: 0.0,
            vanished_since: None,
            state: Settling::TooEarly,
        }
    }

    /// Takes a recorded value in; `at` is the moment of its reply. Values from
    /// before energising and values that are not finite are passed over.
    pub fn take(&mut self, at: Moment, watched: Watched, value: f64) {
        if self.is_over() || at < self.energised || !value.is_finite() {
            return;
        }
        // Before a cell is closed: what vanishes beyond it must not be called settled.
        if watched == Watched::Power && !self.soaking.cycling {
            self.watch_for_vanishing(at, value);
        }
        let cell = self.cell_of(at);
        if self.is_over() {
            return;
        }
        if cell > self.open_cell {
            self.close_cell();
            self.open_cell = cell;
            if self.is_over() {
                return;
            }
        }
        self.ambient_known |= watched == Watched::Ambient;
        self.sums.add(watched, value);
        if self.soaking.cycling {
            let t = at.since(self.energised).get();
            self.cycles.take(t, watched, value);
        }
    }

    /// Whether it is settled, as of the last closed cell.
    pub fn state(&self) -> &Settling {
        &self.state
    }

    /// Where it will end and when, as of the recorded grid; fitted anew at most every
    /// half minute of the soak. Nothing of a load that cycles.
    pub fn prediction(&mut self) -> Predictions {
        if self.soaking.cycling && self.cycles.has_switched_off() {
            return Predictions::default();
        }
        // Where predictions may end the soak, they are made while it is closed.
        if !self.soaking.soak.early_finish && !self.is_over() {
            self.forecast.refresh(self.closed_to);
        }
        let Some(round) = self.forecast.latest().copied() else {
            return Predictions::default();
        };
        let quantities = watched(&self.soaking.soak.until);
        let limit = |power: bool| {
            let is = |q: &&Quantity| matches!(q, Quantity::Power(_)) == power;
            quantities.iter().find(is).copied()
        };
        Predictions {
            power: round.power.map(|fit| self.told(&fit, limit(true))),
            rise: round.rise.map(|fit| self.told(&fit, limit(false))),
        }
    }

    fn told(&self, fit: &Fit, quantity: Option<Quantity>) -> Prediction {
        let log_from = self.log_from.unwrap_or(0.0);
        told(fit, quantity, &self.soaking.soak, self.energised, log_from)
    }

    fn is_over(&self) -> bool {
        matches!(
            self.state,
            Settling::Settled { .. } | Settling::Extrapolated { .. } | Settling::WentOpen
        )
    }

    fn cell_s(&self) -> f64 {
        self.cell_us as f64 * 1e-6
    }

    fn cell_of(&mut self, at: Moment) -> i64 {
        let t = i64::try_from(at.micros_since(self.energised)).unwrap_or(i64::MAX);
        let cell = i64::try_from(self.cell_us).unwrap_or(i64::MAX);
        let sparse = self.cell_s() > SHORTEST_CELL_S;
        let centred = if sparse { t - cell / 2 } else { 0 };
        let start = *self.grid_us.get_or_insert(centred);
        t.saturating_sub(start).div_euclid(cell)
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
        let cell_s = self.cell_s();
        let start = self.grid_us.unwrap_or(0) as f64 * 1e-6;
        let from = start + self.open_cell as f64 * cell_s;
        let now = from + cell_s;
        let point = self.sums.point(from, now, self.ambient_known);
        self.sums = Sums::default();
        if point.power.is_some() || point.rise.is_some() {
            self.log_from.get_or_insert(from);
        }
        self.closed_to = now;
        self.forecast.take(point);
        self.keep(point, cell_s);
        if self.soaking.soak.early_finish {
            self.forecast.refresh(now);
        }
        self.state = if now < self.soaking.soak.at_least.get() {
            Settling::TooEarly
        } else if self.vanished_since.is_some() {
            Settling::NotYet("the power has vanished".to_owned())
        } else {
            self.decide(now, cell_s)
        };
    }

    /// Keeps a point and drops those that no criterion looks at any more.
    fn keep(&mut self, point: Point, cell_s: f64) {
        let now = point.to;
        self.lines.add(&point);
        self.cells.push_back(point);
        let kind = &self.soaking.soak.until.kind;
        let log_from = self.log_from.unwrap_or(now);
        let oldest = now - criteria::looks_back(kind, now, log_from, cell_s) - 1e-6;
        while let Some(first) = self.cells.front().copied().filter(|p| p.from < oldest) {
            self.cells.pop_front();
            self.lines.remove(&first);
        }
    }

    fn decide(&mut self, now: f64, cell_s: f64) -> Settling {
        let log_from = self.log_from.unwrap_or(now);
        let by_cycles = self.soaking.cycling && self.cycles.has_switched_off();
        let answer = if by_cycles {
            self.cycles.ask(&self.soaking, now, log_from)
        } else {
            over_cells(&View {
                soaking: &self.soaking,
                cells: &self.cells,
                lines: &self.lines,
                now,
                cell_s,
                log_from,
            })
        };
        let met: Vec<Quantity> = answer.iter().flat_map(Asked::met).collect();
        let why = match said(answer, self.energised) {
            Ok(settled) => {
                if !by_cycles {
                    self.forecast.fit(now);
                }
                return settled;
            }
            Err(why) => why,
        };
        if self.soaking.soak.early_finish
            && !by_cycles
            && let Some(extrapolated) = self.extrapolated(now, &met)
        {
            return extrapolated;
        }
        Settling::NotYet(why)
    }

    /// Ended by predictions that agree, for every watched quantity that does not meet the
    /// criterion by itself.
    fn extrapolated(&self, now: f64, met: &[Quantity]) -> Option<Settling> {
        let points: Vec<&Point> = self.cells.iter().collect();
        let drift = drift::Drift::over(&points);
        let mut words = Vec::new();
        let mut least = f64::INFINITY;
        let (mut power, mut rise) = (None, None);
        for quantity in watched(&self.soaking.soak.until) {
            if met.contains(&quantity) {
                words.push(format!("{} meets the criterion", quantity.word()));
                continue;
            }
            let (fit, over) = self.forecast.agreed(quantity, now)?;
            drift
                .allows(&self.soaking, quantity, fit.end, 1.0, "/h")
                .ok()?;
            least = least.min(over);
            let told = Some(self.told(&fit, Some(quantity)));
            let unit = match quantity {
                Quantity::Power(_) => {
                    power = told;
                    "W"
                }
                Quantity::Rise(_) => {
                    rise = told;
                    "K"
                }
            };
            words.push(format!(
                "{} ends at {:.3} ± {:.3} {unit} (tau {})",
                quantity.word(),
                fit.end,
                fit.expanded,
                criteria::minutes(fit.tau_s)
            ));
        }
        if power.is_none() && rise.is_none() {
            return None;
        }
        Some(Settling::Extrapolated {
            from: self.energised + Seconds::of((now - least).max(0.0)),
            to: self.energised + Seconds::of(now.max(0.0)),
            power,
            rise,
            criterion: format!(
                "extrapolated by first-order fits that agree over {} (house default): {}",
                criteria::minutes(least),
                words.join("; ")
            ),
        })
    }
}

/// Settled where every quantity is, else what is still open.
fn said(answer: Answer, energised: Moment) -> Result<Settling, String> {
    let asked = answer?;
    let open: Vec<&str> = asked
        .each
        .iter()
        .filter_map(|(_, found)| found.as_ref().err().map(String::as_str))
        .collect();
    if !open.is_empty() {
        return Err(open.join("; "));
    }
    let found: Vec<String> = asked.each.into_iter().flat_map(|(_, f)| f.ok()).collect();
    Ok(Settling::Settled {
        from: energised + Seconds::of(asked.from.max(0.0)),
        to: energised + Seconds::of(asked.to.max(0.0)),
        criterion: format!("{}: {}", asked.name, found.join("; ")),
    })
}

#[cfg(test)]
mod tests;
