//! The published criteria, asked of points: grid cells or whole cycles.

use std::collections::VecDeque;

use crate::quantity::{Seconds, at_most};
use crate::spec::sequence::{Criterion, CriterionKind};
use crate::stats::{Line, RunningLine, effective_of, line_through, student_quantile};

/// Three readings lie at least this far apart, seconds (UL 1278 39.1.8 in a restatement).
const READINGS_APART_S: f64 = 300.0;
/// And this share of the elapsed time.
const READINGS_APART_SHARE: f64 = 0.1;
/// A slope over fewer grid cells says nothing of its own uncertainty.
const FEWEST_CELLS: usize = 6;
/// The window must be filled to this share.
const FILLED: f64 = 0.8;
/// Cycles that a slope needs, and that a change needs.
const CYCLES_FOR_SLOPE: usize = 4;
const CYCLES_FOR_CHANGE: usize = 3;
/// A cycle longer ago than this many of the longest cycle is not the present.
const STALE_CYCLES: f64 = 3.0;
const PER_HOUR: f64 = 3600.0;

/// Means over a stretch, in seconds after energising.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Point {
    pub(super) from: f64,
    pub(super) to: f64,
    pub(super) power: Option<f64>,
    pub(super) rise: Option<f64>,
}

impl Point {
    pub(super) fn middle(&self) -> f64 {
        0.5 * (self.from + self.to)
    }
}

/// What a criterion says.
#[derive(Debug, Clone, PartialEq)]
pub(super) enum Answer {
    NotYet(String),
    Settled { from: f64, to: f64, found: String },
}

/// How far back a criterion looks at `now`, seconds.
pub(super) fn looks_back(kind: &CriterionKind, now: f64) -> f64 {
    match kind {
        CriterionKind::Slope { window } => window.get(),
        // Two spacings, half a cell beside each reading, and the cell itself.
        CriterionKind::ThreeReadings => 2.0 * apart(now) + 120.0,
        CriterionKind::ChangeWithin { interval } => interval.get(),
    }
}

/// Why a window is not full yet; nothing where it is.
pub(super) fn full(
    cells: &VecDeque<Point>,
    now: f64,
    window_s: f64,
    cell_s: f64,
) -> Option<Answer> {
    let from = cells.front().map_or(now, |cell| cell.from);
    let missing = from - (now - window_s);
    (missing > cell_s + 1e-6)
        .then(|| Answer::NotYet(format!("the window is full in {missing:.0} s")))
}

/// One quantity that a criterion watches.
#[derive(Clone, Copy)]
enum Quantity {
    /// With the relative limit.
    Power(f64),
    /// With the limit in kelvins.
    Rise(f64),
}

impl Quantity {
    fn of(self, point: &Point) -> Option<f64> {
        match self {
            Quantity::Power(_) => point.power,
            Quantity::Rise(_) => point.rise,
        }
    }

    fn word(self) -> &'static str {
        match self {
            Quantity::Power(_) => "power",
            Quantity::Rise(_) => "rise of the body",
        }
    }

    /// Change and limit as they are written: per cent of `mean`, or kelvins.
    /// Nothing where a share of the mean has no meaning.
    fn written(self, change: f64, mean: f64) -> Option<(f64, f64, &'static str)> {
        match self {
            Quantity::Power(_) if mean <= 0.0 => None,
            Quantity::Power(limit) => Some((100.0 * change / mean, 100.0 * limit, "%")),
            Quantity::Rise(limit) => Some((change, limit, "K")),
        }
    }
}

fn watched(criterion: &Criterion) -> Vec<Quantity> {
    let power = criterion.power_change.map(|r| Quantity::Power(r.get()));
    let rise = criterion
        .temperature_change
        .map(|k| Quantity::Rise(k.get()));
    power.into_iter().chain(rise).collect()
}

/// Asks every watched quantity; settled only where all of them are.
fn ask_all(
    criterion: &Criterion,
    window: (f64, f64),
    name: &str,
    ask: impl Fn(Quantity) -> Result<String, String>,
) -> Answer {
    let quantities = watched(criterion);
    if quantities.is_empty() {
        return Answer::NotYet("the criterion states no change to watch".to_owned());
    }
    let answers: Vec<_> = quantities.into_iter().map(ask).collect();
    let open: Vec<&str> = answers
        .iter()
        .filter_map(|a| a.as_ref().err().map(String::as_str))
        .collect();
    if !open.is_empty() {
        return Answer::NotYet(open.join("; "));
    }
    let found: Vec<String> = answers.into_iter().flatten().collect();
    Answer::Settled {
        from: window.0,
        to: window.1,
        found: format!("{name}: {}", found.join("; ")),
    }
}

fn ends<'a>(points: impl Iterator<Item = &'a Point>) -> (f64, f64) {
    points.fold((f64::INFINITY, 0.0), |(from, to), p| {
        (from.min(p.from), to.max(p.to))
    })
}

// ---- slope ----

/// Regression over the kept cells: the two-sided 95 % bound of the slope, from the
/// effective number of cells, lies within the limit per hour.
pub(super) fn slope(
    criterion: &Criterion,
    cells: &VecDeque<Point>,
    (power, rise): (&RunningLine, &RunningLine),
) -> Answer {
    let window = ends(cells.iter());
    let name = format!("slope over {}", length(window));
    ask_all(criterion, window, &name, |quantity| {
        let running = match quantity {
            Quantity::Power(_) => power,
            Quantity::Rise(_) => rise,
        };
        let enough =
            running.len() >= FEWEST_CELLS && running.len() as f64 >= FILLED * cells.len() as f64;
        let line = running.line().filter(|_| enough);
        let values = || cells.iter().filter_map(|p| quantity.of(p)).collect();
        slope_within(quantity, line, values)
    })
}

fn slope_within(
    quantity: Quantity,
    line: Option<Line>,
    values: impl Fn() -> Vec<f64>,
) -> Result<String, String> {
    let word = quantity.word();
    let Some(line) = line else {
        return Err(format!("too few readings of the {word} in the window"));
    };
    let written = quantity.written(line.slope * PER_HOUR, line.mean_y);
    let Some((change, limit, unit)) = written else {
        return Err("no power is drawn".to_owned());
    };
    let limit_text = format!("within {} {unit}/h", round(limit));
    // The bound only adds to the slope: while that alone is too steep, it is spared.
    if !at_most(change.abs(), limit) {
        return Err(format!("{word} {change:+.2} {unit}/h, not {limit_text}"));
    }
    let values = values();
    let effective = effective_of(&values).map_or(0.0, |e| e.effective);
    let (error, freedom) = line.slope_error_with(effective);
    let t = student_quantile(0.975, freedom).unwrap_or(f64::INFINITY);
    let bound = if error == 0.0 { 0.0 } else { t * error };
    let bound = quantity
        .written(bound * PER_HOUR, line.mean_y)
        .map_or(f64::INFINITY, |(bound, ..)| bound);
    let text = format!("{word} {change:+.2} ± {bound:.2} {unit}/h");
    if at_most(change.abs() + bound, limit) {
        Ok(format!("{text} {limit_text}"))
    } else {
        Err(format!("{text}, not {limit_text}"))
    }
}

// ---- three readings ----

fn apart(elapsed: f64) -> f64 {
    READINGS_APART_S.max(READINGS_APART_SHARE * elapsed)
}

/// The last cell and those one and two spacings before it, without change; the
/// spacing is 10 % of the elapsed time, at least 5 min.
pub(super) fn three_readings(
    criterion: &Criterion,
    cells: &VecDeque<Point>,
    now: f64,
    cell_s: f64,
) -> Answer {
    let spacing = apart(now);
    let nearest = |ago: f64| {
        let wanted = now - 0.5 * cell_s - ago;
        let distance = |p: &Point| (p.middle() - wanted).abs();
        cells
            .iter()
            .filter(|p| distance(p) <= cell_s)
            .min_by(|a, b| distance(a).total_cmp(&distance(b)))
    };
    let readings = [2.0, 1.0, 0.0].map(|n| nearest(n * spacing));
    let [Some(first), Some(second), Some(third)] = readings else {
        return Answer::NotYet(format!(
            "three readings {} apart are not there yet",
            minutes(spacing)
        ));
    };
    let name = format!("three readings {} apart", minutes(spacing));
    unchanged(criterion, &[first, second, third], &name)
}

// ---- change within ----

/// Largest less smallest of the kept cells.
pub(super) fn change_within(criterion: &Criterion, cells: &VecDeque<Point>) -> Answer {
    let points: Vec<&Point> = cells.iter().collect();
    let name = format!("change within {}", length(ends(cells.iter())));
    unchanged(criterion, &points, &name)
}

fn unchanged(criterion: &Criterion, points: &[&Point], name: &str) -> Answer {
    let window = ends(points.iter().copied());
    ask_all(criterion, window, name, |quantity| {
        let values: Vec<f64> = points.iter().filter_map(|p| quantity.of(p)).collect();
        let word = quantity.word();
        if values.len() < 2 || (values.len() as f64) < FILLED * points.len() as f64 {
            return Err(format!("too few readings of the {word}"));
        }
        let highest = values.iter().copied().fold(f64::NEG_INFINITY, f64::max);
        let lowest = values.iter().copied().fold(f64::INFINITY, f64::min);
        let mean = values.iter().sum::<f64>() / values.len() as f64;
        let Some((change, limit, unit)) = quantity.written(highest - lowest, mean) else {
            return Err("no power is drawn".to_owned());
        };
        let text = format!("{word} changes by {change:.2} {unit}");
        let limit_text = format!("within {} {unit}", round(limit));
        if at_most(change, limit) {
            Ok(format!("{text}, {limit_text}"))
        } else {
            Err(format!("{text}, not {limit_text}"))
        }
    })
}

// ---- cycles ----

/// Any criterion, asked of whole cycles.
pub(super) fn over_cycles(criterion: &Criterion, cycles: &[Point], now: f64) -> Answer {
    let longest = cycles.iter().map(|c| c.to - c.from).fold(0.0, f64::max);
    let stale = cycles
        .last()
        .is_some_and(|c| now - c.to > STALE_CYCLES * longest);
    if stale {
        return Answer::NotYet("it has stopped cycling".to_owned());
    }
    match criterion.kind {
        CriterionKind::Slope { window } => cycle_slope(criterion, cycles, now - window.get()),
        CriterionKind::ThreeReadings => cycle_readings(criterion, cycles, apart(now)),
        CriterionKind::ChangeWithin { interval } => {
            let since = now - interval.get();
            match latest(cycles, since, CYCLES_FOR_CHANGE) {
                Err(not_yet) => not_yet,
                Ok(cycles) => {
                    let points: Vec<&Point> = cycles.iter().collect();
                    let name = format!("change between {} cycles", cycles.len());
                    unchanged(criterion, &points, &name)
                }
            }
        }
    }
}

/// The cycles that began after `since`, and at least the last `fewest`.
fn latest(cycles: &[Point], since: f64, fewest: usize) -> Result<&[Point], Answer> {
    let Some(last_ones) = cycles.len().checked_sub(fewest) else {
        let have = cycles.len();
        return Err(Answer::NotYet(format!("{have} of {fewest} whole cycles")));
    };
    let inside = cycles.partition_point(|c| c.from < since);
    Ok(&cycles[inside.min(last_ones)..])
}

fn cycle_slope(criterion: &Criterion, cycles: &[Point], since: f64) -> Answer {
    let cycles = match latest(cycles, since, CYCLES_FOR_SLOPE) {
        Ok(cycles) => cycles,
        Err(not_yet) => return not_yet,
    };
    let name = format!("slope over {} cycles", cycles.len());
    ask_all(criterion, ends(cycles.iter()), &name, |quantity| {
        let points: Vec<(f64, f64)> = cycles
            .iter()
            .filter_map(|c| Some((c.middle(), quantity.of(c)?)))
            .collect();
        let line = line_through(points.iter().copied());
        slope_within(quantity, line, || points.iter().map(|p| p.1).collect())
    })
}

fn cycle_readings(criterion: &Criterion, cycles: &[Point], spacing: f64) -> Answer {
    let before = |t: f64| cycles.iter().rev().find(|c| c.middle() <= t + 1e-6);
    let third = cycles.last();
    let second = third.and_then(|c| before(c.middle() - spacing));
    let first = second.and_then(|c| before(c.middle() - spacing));
    match (first, second, third) {
        (Some(a), Some(b), Some(c)) => {
            let name = format!("three cycles {} apart", minutes(spacing));
            unchanged(criterion, &[a, b, c], &name)
        }
        _ => Answer::NotYet(format!(
            "three cycles {} apart are not there yet",
            minutes(spacing)
        )),
    }
}

// ---- words ----

fn length((from, to): (f64, f64)) -> String {
    Seconds::new((to - from).round()).map_or_else(String::new, |s| s.to_string())
}

fn minutes(seconds: f64) -> String {
    format!("{:.1} min", seconds / 60.0)
}

fn round(value: f64) -> String {
    crate::quantity::shortest((value * 1e6).round() / 1e6)
}
