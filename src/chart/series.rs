//! From samples to lines: runs without gaps, thinned to what a pixel column can
//! show.

use std::collections::BTreeMap;

use super::Scene;
use super::axis::drawable;
use crate::plan::Action;
use crate::quantity::Reading;
use crate::record::{Sample, Status};

/// A value at a time.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Point {
    /// Seconds since the record's start.
    pub t: f64,
    /// Value in its base unit.
    pub v: f64,
}

/// What one role said in one cell.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct Trace {
    /// Points without a gap between them, run by run.
    pub runs: Vec<Vec<Point>>,
}

/// An interval this many times the polling interval, and this many seconds more,
/// is a gap.
const GAP_TIMES: f64 = 4.0;
const GAP_MORE: f64 = 2.0;

impl Trace {
    /// The readings of `reading` by role `role` in `cell`, of the samples to `keep`.
    /// A line ends where a sample has no value and where samples are missing.
    pub fn of(
        scene: &Scene,
        cell: usize,
        role: usize,
        reading: Reading,
        keep: impl Fn(&Sample) -> bool,
    ) -> Self {
        let every = intervals(scene);
        let mut runs: Vec<Vec<Point>> = Vec::new();
        let mut run: Vec<Point> = Vec::new();
        let mut last = (0.0, 0.0);
        for sample in scene.samples {
            if sample.cell != Some(cell) || sample.role != role || !keep(sample) {
                continue;
            }
            let t = sample.reply.as_secs_f64();
            let interval = every.get(&sample.step).copied().unwrap_or(10.0);
            let longest = GAP_TIMES * interval.max(last.1) + GAP_MORE;
            let value = match sample.status {
                Status::Ok => sample.readings.get(reading).and_then(drawable),
                _ => None,
            };
            if value.is_none() || t - last.0 > longest || t < last.0 {
                end_run(&mut runs, &mut run);
            }
            if let Some(v) = value {
                run.push(Point { t, v });
            }
            last = (t, interval);
        }
        end_run(&mut runs, &mut run);
        Self { runs }
    }

    /// Every point.
    pub fn points(&self) -> impl Iterator<Item = Point> + '_ {
        self.runs.iter().flatten().copied()
    }

    /// The highest point; the first of several.
    pub fn highest(&self) -> Option<Point> {
        self.points().fold(None, |found: Option<Point>, point| {
            if found.is_some_and(|found| found.v >= point.v) {
                found
            } else {
                Some(point)
            }
        })
    }

    /// The last point.
    pub fn last(&self) -> Option<Point> {
        self.runs.last().and_then(|run| run.last()).copied()
    }
}

/// When a cell was sampled and energised, in seconds since the record's start.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Span {
    /// First and last sample, energised or not.
    pub sampled: Option<(f64, f64)>,
    /// The output went on; where nothing says when, the first sample.
    pub energised: f64,
    /// The output went off; absent where nothing says when.
    pub off: Option<f64>,
    /// The last sample of a step that watches the switch-on.
    pub inrush: Option<f64>,
}

impl Span {
    /// Of cell `index`.
    pub fn of(scene: &Scene, index: usize) -> Self {
        let mine = || scene.samples.iter().filter(|s| s.cell == Some(index));
        let time = |sample: &Sample| sample.reply.as_secs_f64();
        let result = scene.analysis.cells.get(index);
        let first = mine().next().map(time);
        let first_energised = mine().find(|sample| sample.energised).map(time);
        let said = result.and_then(|result| result.energised_s.known());
        let watches = |step: u32| {
            let step = scene.plan.steps.iter().find(|s| s.number == step);
            step.is_some_and(|step| matches!(step.action, Action::Inrush(_)))
        };
        let last_of_run = mine().rev().map(time).next();
        Self {
            sampled: first.zip(last_of_run),
            energised: said
                .copied()
                .and_then(drawable)
                .or(first_energised)
                .or(first)
                .unwrap_or(0.0),
            off: result
                .and_then(|result| result.off_s.known())
                .copied()
                .and_then(drawable),
            inrush: mine().rev().find(|s| watches(s.step)).map(time),
        }
    }
}

fn end_run(runs: &mut Vec<Vec<Point>>, run: &mut Vec<Point>) {
    if !run.is_empty() {
        runs.push(std::mem::take(run));
    }
}

/// The polling interval of each step that has one, in seconds.
fn intervals(scene: &Scene) -> BTreeMap<u32, f64> {
    let every = |action: &Action| match action {
        Action::Acclimatise(waiting) | Action::Rest(waiting) => Some(waiting.every),
        Action::Inrush(timed) | Action::Measure(timed) | Action::RunIn(timed) => Some(timed.every),
        Action::Soak { every, .. } | Action::Abnormal { every, .. } => Some(*every),
        _ => None,
    };
    let steps = scene.plan.steps.iter();
    steps
        .filter_map(|step| Some((step.number, every(&step.action)?.get())))
        .collect()
}

/// The run thinned to a few points for each pixel column: first, lowest, highest
/// and last, in the order in which they came, so that no peak is lost.
pub fn thinned(run: &[Point], x: impl Fn(f64) -> f64) -> Vec<Point> {
    let column = |point: &Point| x(point.t).floor();
    let mut kept = Vec::new();
    for group in run.chunk_by(|a, b| column(a) == column(b)) {
        if group.len() <= 4 {
            kept.extend_from_slice(group);
            continue;
        }
        let by_value = |a: &usize, b: &usize| group[*a].v.total_cmp(&group[*b].v);
        let lowest = (0..group.len()).min_by(by_value).unwrap_or(0);
        let highest = (0..group.len()).max_by(by_value).unwrap_or(0);
        let mut chosen = [0, lowest, highest, group.len() - 1];
        chosen.sort_unstable();
        for (n, i) in chosen.iter().enumerate() {
            if n == 0 || chosen[n - 1] != *i {
                kept.push(group[*i]);
            }
        }
    }
    kept
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn thinning_keeps_every_extreme() {
        let mut run: Vec<Point> = (0..10_000)
            .map(|i| Point {
                t: f64::from(i) * 0.01,
                v: 9.0,
            })
            .collect();
        run[4321].v = 25.0;
        run[777].v = 1.0;
        let kept = thinned(&run, |t| t);
        assert!(kept.len() <= 4 * 101);
        assert!(kept.iter().any(|p| p.v == 25.0) && kept.iter().any(|p| p.v == 1.0));
        assert!(kept.windows(2).all(|pair| pair[0].t < pair[1].t));
        assert_eq!((kept[0], kept[kept.len() - 1]), (run[0], run[9999]));
    }

    #[test]
    fn the_highest_and_the_last_point_are_found() {
        let p = |t, v| Point { t, v };
        let trace = Trace {
            runs: vec![vec![p(0.0, 1.0), p(2.0, 3.0)], vec![p(10.0, 5.0)]],
        };
        assert_eq!(trace.highest(), Some(p(10.0, 5.0)));
    }
}
