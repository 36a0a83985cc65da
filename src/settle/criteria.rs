//! The published criteria, asked of grid cells.

use std::collections::VecDeque;

use super::bound::slope_bound;
use super::drift::Drift;
use super::limits::{Quantity, round, watched};
use super::points::{Lines, Point};
use crate::quantity::{Seconds, at_most};
use crate::spec::sequence::{CriterionKind, Soaking};
use crate::stats::Line;

/// Three readings lie at least this far apart, seconds (UL 1278 39.1.8).
const READINGS_APART_S: f64 = 300.0;
/// The grid's own coarseness: a reading may be half of the finest cell early, seconds.
const EARLY_S: f64 = 2.5;
/// And this share of the elapsed time.
const READINGS_APART_SHARE: f64 = 0.1;
/// A slope over fewer grid cells says nothing of its own uncertainty.
const FEWEST_CELLS: usize = 6;
/// The window must be filled to this share.
const FILLED: f64 = 0.8;
/// The sampling method: shortest and longest log, the share that is dropped, and the
/// slowest reading, seconds (IEC 62301 ed. 2, from memory).
const LOG_LEAST_S: f64 = 900.0;
const LOG_MOST_S: f64 = 10_800.0;
const LOG_DROPPED: f64 = 1.0 / 3.0;
const LOG_EVERY_S: f64 = 1.0;
const PER_HOUR: f64 = 3600.0;

/// What a criterion says of every watched quantity over one window.
#[derive(Debug, Clone, PartialEq)]
pub(super) struct Asked {
    pub(super) from: f64,
    pub(super) to: f64,
    pub(super) name: String,
    /// What was found, or what is still open.
    pub(super) each: Vec<(Quantity, Result<String, String>)>,
}

impl Asked {
    /// The quantities that meet the criterion by themselves.
    pub(super) fn met(&self) -> impl Iterator<Item = Quantity> + '_ {
        self.each
            .iter()
            .filter(|(_, found)| found.is_ok())
            .map(|(quantity, _)| *quantity)
    }
}

/// Nothing to ask yet, and why; or the answers.
pub(super) type Answer = Result<Asked, String>;

/// Everything that grid criteria look at.
pub(super) struct View<'a> {
    pub(super) soaking: &'a Soaking,
    pub(super) cells: &'a VecDeque<Point>,
    pub(super) lines: &'a Lines,
    pub(super) now: f64,
    pub(super) cell_s: f64,
    /// Start of the first cell with a value.
    pub(super) log_from: f64,
}

/// How far back a criterion looks at `now`, seconds.
pub(super) fn looks_back(kind: &CriterionKind, now: f64, log_from: f64, cell_s: f64) -> f64 {
    match kind {
        CriterionKind::Slope { window } => window.get(),
        // Readings may be a cell older than they need be.
        CriterionKind::ThreeReadings => 2.0 * apart(now) + 4.0 * cell_s,
        // From the middle of the first cell to the middle of the last.
        CriterionKind::ChangeWithin { interval } => {
            ((interval.get() / cell_s - 1e-9).ceil() + 1.0) * cell_s
        }
        CriterionKind::SamplingMethod => (1.0 - LOG_DROPPED) * (now - log_from),
    }
}

/// The spacing of three readings.
pub(super) fn apart(elapsed: f64) -> f64 {
    READINGS_APART_S.max(READINGS_APART_SHARE * elapsed)
}

/// Asks the criterion of the kept cells.
pub(super) fn over_cells(view: &View) -> Answer {
    let back = looks_back(
        &view.soaking.soak.until.kind,
        view.now,
        view.log_from,
        view.cell_s,
    );
    match view.soaking.soak.until.kind {
        CriterionKind::Slope { window } => {
            possible(window.get(), view.cell_s)?;
            full(view, back)?;
            let span = ends(view.cells.iter());
            slope(view, &format!("slope over {}", length(span)), Bound::With)
        }
        CriterionKind::ThreeReadings => three_readings(view),
        CriterionKind::ChangeWithin { interval } => {
            full(view, back)?;
            let points: Vec<&Point> = view.cells.iter().collect();
            let name = format!("change within {interval}");
            unchanged(view.soaking, &points, &points, &name, Least::Stated)
        }
        CriterionKind::SamplingMethod => sampling(view, back),
    }
}

/// Whether a slope's window can ever hold enough rows.
fn possible(window_s: f64, cell_s: f64) -> Result<(), String> {
    let most = (window_s / cell_s + 1e-9).floor();
    if most >= FEWEST_CELLS as f64 {
        return Ok(());
    }
    Err(format!(
        "it can never settle: a window of {} holds {most:.0} readings at one every {}, and a slope \
         needs {FEWEST_CELLS}",
        seconds(window_s),
        seconds(cell_s)
    ))
}

/// Whether the window is full, without a gap.
fn full(view: &View, window_s: f64) -> Result<(), String> {
    let from = view.cells.front().map_or(view.now, |cell| cell.from);
    let missing = from - (view.now - window_s);
    if missing > view.cell_s + 1e-6 {
        return Err(format!("the window is full in {missing:.0} s"));
    }
    let whole = (window_s / view.cell_s).floor();
    if (view.cells.len() as f64) < FILLED * whole {
        return Err(format!(
            "readings are missing: {} of {whole:.0} cells of the window hold any",
            view.cells.len()
        ));
    }
    Ok(())
}

/// Whether a change is per hour, or over the window of so many hours.
#[derive(Clone, Copy)]
pub(super) enum Per {
    Hour,
    Window(f64),
}

impl Per {
    fn hours(self) -> f64 {
        match self {
            Per::Hour => 1.0,
            Per::Window(hours) => hours,
        }
    }

    fn word(self) -> &'static str {
        match self {
            Per::Hour => "/h",
            Per::Window(_) => "",
        }
    }
}

/// Asks every watched quantity on one window; what a drift explains is not settled.
pub(super) fn ask_all(
    soaking: &Soaking,
    points: &[&Point],
    name: &str,
    per: Per,
    ask: impl Fn(Quantity) -> Result<String, String>,
) -> Answer {
    let (from, to) = ends(points.iter().copied());
    let mut each: Vec<_> = watched(&soaking.soak.until)
        .into_iter()
        .map(|quantity| (quantity, ask(quantity)))
        .collect();
    if each.is_empty() {
        return Err("the criterion states no change to watch".to_owned());
    }
    let power = mean(points, |p| p.power);
    if power.is_some_and(|mean| mean <= 0.0) {
        return Err("no power is drawn".to_owned());
    }
    let mut name = format!("{name} ({})", soaking.soak.until.source());
    if each.iter().any(|(_, found)| found.is_ok()) {
        let drift = Drift::over(points);
        for (quantity, found) in &mut each {
            let mean = mean(points, |p| quantity.of(p)).unwrap_or(0.0);
            let allowed = drift.allows(soaking, *quantity, mean, per.hours(), per.word());
            if let (true, Err(why)) = (found.is_ok(), allowed) {
                *found = Err(why);
            }
        }
        name = format!("{name}; {}", drift.words());
    }
    Ok(Asked {
        from,
        to,
        name,
        each,
    })
}

fn mean(points: &[&Point], of: impl Fn(&Point) -> Option<f64>) -> Option<f64> {
    let values: Vec<f64> = points.iter().filter_map(|p| of(p)).collect();
    (!values.is_empty()).then(|| values.iter().sum::<f64>() / values.len() as f64)
}

pub(super) fn ends<'a>(points: impl Iterator<Item = &'a Point>) -> (f64, f64) {
    points.fold((f64::INFINITY, 0.0), |(from, to), p| {
        (from.min(p.from), to.max(p.to))
    })
}

// ---- slope ----

/// Whether the slope alone counts, or with its confidence bound.
#[derive(Clone, Copy, PartialEq)]
pub(super) enum Bound {
    With,
    Without,
}

/// Regression over the kept cells: the two-sided 95 % bound of the slope, from the
/// effective number of cells, lies within the limit per hour.
fn slope(view: &View, name: &str, bound: Bound) -> Answer {
    let points: Vec<&Point> = view.cells.iter().collect();
    ask_all(view.soaking, &points, name, Per::Hour, |quantity| {
        let running = match quantity {
            Quantity::Power(_) => &view.lines.power,
            Quantity::Rise(_) => &view.lines.rise,
        };
        let enough = running.len() >= FEWEST_CELLS
            && running.len() as f64 >= FILLED * view.cells.len() as f64;
        let line = running.line().filter(|_| enough);
        let track = || {
            let value = |p: &Point| Some((p.middle(), quantity.of(p)?));
            view.cells.iter().filter_map(value).collect()
        };
        slope_within(quantity, line, track, bound)
    })
}

pub(super) fn slope_within(
    quantity: Quantity,
    line: Option<Line>,
    track: impl Fn() -> Vec<(f64, f64)>,
    bound: Bound,
) -> Result<String, String> {
    let word = quantity.word();
    let Some(line) = line else {
        return Err(format!("too few readings of the {word} in the window"));
    };
    let per_hour = |slope: f64| quantity.written(slope * PER_HOUR, line.mean_y);
    let Some(slope) = per_hour(line.slope) else {
        return Err("no power is drawn".to_owned());
    };
    let (change, unit) = (slope.change, slope.unit);
    let limit_text = format!("within {} {unit}/h", round(slope.limit));
    // The bound only adds to the slope: while that alone is too steep, it is spared.
    if !at_most(change.abs(), slope.limit) {
        return Err(format!("{word} {change:+.2} {unit}/h, not {limit_text}"));
    }
    if bound == Bound::Without {
        return Ok(format!("{word} {change:+.2} {unit}/h {limit_text}"));
    }
    let bound =
        per_hour(slope_bound(&track(), &line)).map_or(f64::INFINITY, |written| written.change);
    let text = format!("{word} {change:+.2} ± {bound:.2} {unit}/h");
    if at_most(change.abs() + bound, slope.limit) {
        Ok(format!("{text} {limit_text}"))
    } else {
        Err(format!("{text}, not {limit_text}"))
    }
}

/// The sampling method: the first third of the log dropped, the plain slope of the rest.
fn sampling(view: &View, back: f64) -> Answer {
    if view.soaking.soak.every.get() > LOG_EVERY_S + 1e-9 {
        return Err(format!(
            "it can never settle: the sampling method needs a reading each second, and they come \
             every {}",
            view.soaking.soak.every
        ));
    }
    let logged = view.now - view.log_from;
    if logged < LOG_LEAST_S - 1e-6 {
        return Err(format!(
            "the log is 15 min long in {:.0} s",
            LOG_LEAST_S - logged
        ));
    }
    if logged > LOG_MOST_S + view.cell_s {
        return Err(
            "not steady within 3 h, which is as far as the sampling method goes".to_owned(),
        );
    }
    full(view, back)?;
    let name = format!(
        "sampling method, the last two thirds of {}",
        length((view.log_from, view.now))
    );
    slope(view, &name, Bound::Without)
}

// ---- readings ----

/// The last cell and the latest ones one and two spacings before it, without
/// change; the spacing is 10 % of the elapsed time, at least 5 min.
fn three_readings(view: &View) -> Answer {
    let spacing = apart(view.now);
    let at_or_before = |t: f64| {
        let found = view.cells.iter().rev().find(|p| p.middle() <= t + EARLY_S);
        found.filter(|p| t - p.middle() <= view.cell_s)
    };
    let third = at_or_before(view.now - 0.5 * view.cell_s);
    let second = third.and_then(|p| at_or_before(p.middle() - spacing));
    let first = second.and_then(|p| at_or_before(p.middle() - spacing));
    let (Some(first), Some(second), Some(third)) = (first, second, third) else {
        return Err(format!(
            "three readings {} apart are not there yet",
            minutes(spacing)
        ));
    };
    let name = format!("three readings {} apart", minutes(spacing));
    // A drift is told from all the cells between them.
    let between: Vec<&Point> = view.cells.iter().filter(|p| p.from >= first.from).collect();
    let three = [first, second, third];
    unchanged(view.soaking, &between, &three, &name, Least::Resolution)
}

/// The least limit: the stated one, or no less than the instrument's resolution.
#[derive(Clone, Copy, PartialEq)]
pub(super) enum Least {
    Stated,
    Resolution,
}

/// Largest less smallest of `readings`; the drift is that of all of `points`.
pub(super) fn unchanged(
    soaking: &Soaking,
    points: &[&Point],
    readings: &[&Point],
    name: &str,
    least: Least,
) -> Answer {
    let (from, to) = ends(points.iter().copied());
    let per = Per::Window((to - from) / PER_HOUR);
    ask_all(soaking, points, name, per, |quantity| {
        let values: Vec<f64> = readings.iter().filter_map(|p| quantity.of(p)).collect();
        let word = quantity.word();
        if values.len() < 2 || (values.len() as f64) < FILLED * readings.len() as f64 {
            return Err(format!("too few readings of the {word}"));
        }
        let highest = values.iter().copied().fold(f64::NEG_INFINITY, f64::max);
        let lowest = values.iter().copied().fold(f64::INFINITY, f64::min);
        let mean = values.iter().sum::<f64>() / values.len() as f64;
        let Some(written) = quantity.written(highest - lowest, mean) else {
            return Err("no power is drawn".to_owned());
        };
        let (change, unit) = (written.change, written.unit);
        let resolution = resolution(soaking, quantity, least);
        let resolution = quantity
            .written(resolution, mean)
            .map_or(0.0, |resolution| resolution.change);
        let limit = written.limit.max(resolution);
        let by = if limit > written.limit {
            ", the resolution"
        } else {
            ""
        };
        let text = format!("{word} changes by {change:.2} {unit}");
        let limit_text = format!("within {} {unit}{by}", round(limit));
        if at_most(change, limit) {
            Ok(format!("{text}, {limit_text}"))
        } else {
            Err(format!("{text}, not {limit_text}"))
        }
    })
}

fn resolution(soaking: &Soaking, quantity: Quantity, least: Least) -> f64 {
    match (least, quantity) {
        (Least::Stated, _) => 0.0,
        (Least::Resolution, Quantity::Power(_)) => soaking.power_resolution.get(),
        (Least::Resolution, Quantity::Rise(_)) => soaking.temperature_resolution.get(),
    }
}

// ---- words ----

pub(super) fn length((from, to): (f64, f64)) -> String {
    seconds((to - from).round())
}

fn seconds(s: f64) -> String {
    Seconds::new(s).map_or_else(String::new, |s| s.to_string())
}

pub(super) fn minutes(seconds: f64) -> String {
    format!("{:.1} min", seconds / 60.0)
}
