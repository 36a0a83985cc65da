//! The published ways to call a quantity steady; sources in
//! [`crate::spec::sequence::CriterionKind`].

use crate::quantity::at_most;
use crate::spec::sequence::{Criterion, CriterionKind};
use crate::stats::{effective_number, fit, student_t};

use super::cycles::tops;

/// Whole cycles that a window must hold.
const CYCLES: usize = 4;

/// Confidence of a slope's bound, two-sided.
const CONFIDENCE: f64 = 0.975;

/// UL 1278 39.1.8: readings at 10 % of the elapsed time, at least 5 min apart (read).
const SHARE_OF_ELAPSED: f64 = 0.1;
const LEAST_APART_S: f64 = 300.0;

/// What a criterion is asked of.
pub(super) struct Asked<'a> {
    /// Power over seconds since energising, where it is watched.
    pub(super) power: Option<&'a [(f64, f64)]>,
    /// The body's rise, where it is watched.
    pub(super) rise: Option<&'a [(f64, f64)]>,
    /// Whether the load cycles.
    pub(super) cycling: bool,
    /// Seconds since energising.
    pub(super) elapsed: f64,
    /// Length of a grid cell, s.
    pub(super) grid: f64,
}

/// The length of the window that shows it settled, in seconds, or why it is not.
pub(super) fn ask(criterion: &Criterion, asked: &Asked) -> Result<f64, String> {
    let power_limit = criterion.power_change.map(|change| change.get());
    let rise_limit = criterion.temperature_change.map(|change| change.get());
    let mut length = 0.0_f64;
    if let (Some(series), Some(share)) = (asked.power, power_limit) {
        length = length.max(one(criterion.kind, series, asked, "power", Limit::OfMean(share))?);
    }
    if let (Some(series), Some(kelvins)) = (asked.rise, rise_limit) {
        length = length.max(one(criterion.kind, series, asked, "body", Limit::Absolute(kelvins))?);
    }
    if length > 0.0 { Ok(length) } else { Err("no quantity is watched".to_owned()) }
}

/// A limit of a change.
#[derive(Clone, Copy)]
enum Limit {
    OfMean(f64),
    Absolute(f64),
}

impl Limit {
    fn over(self, points: &[(f64, f64)]) -> f64 {
        match self {
            Limit::Absolute(limit) => limit,
            Limit::OfMean(share) => share * points.iter().map(|(_, y)| y).sum::<f64>().abs() / points.len() as f64,
        }
    }
}

fn one(kind: CriterionKind, series: &[(f64, f64)], asked: &Asked, name: &str, limit: Limit) -> Result<f64, String> {
    match kind {
        CriterionKind::Slope { window } => {
            let points = trailing(series, asked, window.get(), name)?;
            slope(&points, limit.over(&points), name)?;
            Ok(window.get())
        }
        CriterionKind::ChangeWithin { interval } => {
            let points = trailing(series, asked, interval.get(), name)?;
            within(points.iter().map(|(_, y)| *y), limit.over(&points), name)?;
            Ok(interval.get())
        }
        CriterionKind::ThreeReadings => three_readings(series, asked, name, limit),
    }
}

/// The points of the trailing window, or the tops of its cycles.
fn trailing(series: &[(f64, f64)], asked: &Asked, length: f64, name: &str) -> Result<Vec<(f64, f64)>, String> {
    let from = asked.elapsed - length;
    let first = series.first().map_or(f64::INFINITY, |(x, _)| *x);
    // The first cell's middle may lie a whole cell behind the window's start.
    if first > from + asked.grid {
        return Err(format!("{name}: the window of {length} s is not full yet"));
    }
    let start = series.partition_point(|(x, _)| *x < from);
    let points = &series[start..];
    if points.len() < 3 {
        return Err(format!("{name}: fewer than three readings in the window of {length} s"));
    }
    if !asked.cycling {
        return Ok(points.to_vec());
    }
    let tops = tops(points);
    if tops.len() < CYCLES {
        return Err(format!("{name}: {} whole cycles in the window, {CYCLES} are needed", tops.len()));
    }
    Ok(tops)
}

/// The slope's confidence bound per hour, from the effective number of readings.
fn slope(points: &[(f64, f64)], limit: f64, name: &str) -> Result<(), String> {
    let line = fit(points.iter().copied()).ok_or_else(|| format!("{name}: no line fits"))?;
    let plain = line.slope.abs() * 3600.0;
    if !at_most(plain, limit) {
        return Err(format!("{name} changes by {plain:.3} per hour, limit {limit:.3}"));
    }
    let n = points.len() as f64;
    let effective = effective_number(points);
    let degrees = (effective - 2.0).max(1.0);
    let t = student_t(CONFIDENCE, degrees).unwrap_or(2.0);
    let bound = plain + t * line.slope_error * (n / effective).sqrt() * 3600.0;
    if at_most(bound, limit) {
        Ok(())
    } else {
        Err(format!("{name} may change by up to {bound:.3} per hour, limit {limit:.3}"))
    }
}

fn within(values: impl Iterator<Item = f64>, limit: f64, name: &str) -> Result<(), String> {
    let (low, high) = values.fold((f64::INFINITY, f64::NEG_INFINITY), |(l, h), y| (l.min(y), h.max(y)));
    let change = high - low;
    if at_most(change, limit) {
        Ok(())
    } else {
        Err(format!("{name} changed by {change:.3}, limit {limit:.3}"))
    }
}

fn three_readings(series: &[(f64, f64)], asked: &Asked, name: &str, limit: Limit) -> Result<f64, String> {
    let apart = (SHARE_OF_ELAPSED * asked.elapsed).max(LEAST_APART_S);
    let last = asked.elapsed - asked.grid / 2.0;
    let cells = if asked.cycling { tops(series) } else { series.to_vec() };
    let reading = |at: f64| {
        let near = cells.iter().rev().find(|(x, _)| *x <= at + asked.grid / 2.0);
        near.filter(|(x, _)| at - x < apart / 2.0).copied()
    };
    let readings: Option<Vec<(f64, f64)>> = (0..3).map(|n| reading(last - f64::from(n) * apart)).collect();
    let readings = readings.ok_or_else(|| format!("{name}: three readings {apart} s apart are not there yet"))?;
    within(readings.iter().map(|(_, y)| *y), limit.over(&readings), name)?;
    Ok(2.0 * apart)
}

/// A criterion in words.
pub(super) fn words(criterion: &Criterion) -> String {
    let (what, per) = match criterion.kind {
        CriterionKind::Slope { window } => (format!("slope over {window}"), " per hour"),
        CriterionKind::ThreeReadings => ("three readings at 10 % of the elapsed time".to_owned(), ""),
        CriterionKind::ChangeWithin { interval } => (format!("change within {interval}"), ""),
    };
    let power = criterion.power_change.map(|change| format!("power {change}{per}"));
    let body = criterion.temperature_change.map(|change| format!("body {change}{per}"));
    [Some(what), power, body].into_iter().flatten().collect::<Vec<_>>().join(", ")
}
