//! Whole cycles of a load that a thermostat switches, and the criteria asked of them.

use super::Watched;
use super::criteria::{
    Answer, Bound, Least, Per, apart, ask_all, minutes, slope_within, unchanged,
};
use super::points::{Point, Sums};
use crate::spec::sequence::{CriterionKind, Soaking};
use crate::stats::line_through;

/// A load is off below this share of its highest power, and on above the other:
/// half of it, with a hysteresis so that noise does not switch it.
const OFF_BELOW: f64 = 0.45;
const ON_ABOVE: f64 = 0.55;

/// Cycles are kept up to this number; no criterion looks further back.
const KEPT: usize = 64;
/// Cycles that a window holds at least: fewer say nothing of on-state power, mean and
/// duty (house default).
const FEWEST: usize = 4;
/// A cycle longer ago than this many of the longest cycle is not the present.
const STALE_CYCLES: f64 = 3.0;

/// Cuts values into cycles, each from one switching on to the next.
#[derive(Debug, Clone, Default)]
pub(super) struct Cycles {
    highest_w: f64,
    on: bool,
    switched_off: bool,
    began: Option<f64>,
    sums: Sums,
    ambient_known: bool,
    complete: Vec<Point>,
}

impl Cycles {
    /// Takes a value in, at `t` seconds after energising.
    pub(super) fn take(&mut self, t: f64, watched: Watched, value: f64) {
        if watched == Watched::Power {
            self.switch(t, value);
        }
        self.ambient_known |= watched == Watched::Ambient;
        self.sums.add(watched, value);
    }

    /// Whether the load was on and went off.
    pub(super) fn has_switched_off(&self) -> bool {
        self.switched_off
    }

    fn switch(&mut self, t: f64, power_w: f64) {
        self.highest_w = self.highest_w.max(power_w);
        if self.highest_w <= 0.0 {
            return;
        }
        if self.on && power_w < OFF_BELOW * self.highest_w {
            self.on = false;
            self.switched_off = true;
        } else if !self.on && power_w > ON_ABOVE * self.highest_w {
            self.on = true;
            // The first time on starts cold and is no cycle.
            if self.switched_off {
                self.close(t);
            }
        }
    }

    fn close(&mut self, t: f64) {
        if let Some(from) = self.began {
            self.complete
                .push(self.sums.point(from, t, self.ambient_known));
            if self.complete.len() > KEPT {
                self.complete.remove(0);
            }
        }
        self.began = Some(t);
        self.sums = Sums::default();
    }

    /// Any criterion, asked of whole cycles.
    pub(super) fn ask(&self, soaking: &Soaking, now: f64, log_from: f64) -> Answer {
        let cycles = self.complete.as_slice();
        let longest = cycles.iter().map(|c| c.to - c.from).fold(0.0, f64::max);
        let stale = cycles
            .last()
            .is_some_and(|c| now - c.to > STALE_CYCLES * longest);
        if stale {
            return Err("it has stopped cycling".to_owned());
        }
        match soaking.soak.until.kind {
            CriterionKind::Slope { window } => {
                slope(soaking, latest(cycles, now - window.get())?, Bound::With)
            }
            CriterionKind::SamplingMethod => {
                let since = log_from + (now - log_from) / 3.0;
                slope(soaking, latest(cycles, since)?, Bound::Without)
            }
            CriterionKind::ThreeReadings => readings(soaking, cycles, apart(now)),
            CriterionKind::ChangeWithin { interval } => {
                let points: Vec<&Point> = latest(cycles, now - interval.get())?.iter().collect();
                let name = format!("change between {} cycles", points.len());
                unchanged(soaking, &points, &points, &name, Least::Stated)
            }
        }
    }
}

/// The cycles that began after `since`, and at least the last four.
fn latest(cycles: &[Point], since: f64) -> Result<&[Point], String> {
    let Some(last_ones) = cycles.len().checked_sub(FEWEST) else {
        return Err(format!("{} of {FEWEST} whole cycles", cycles.len()));
    };
    let inside = cycles.partition_point(|c| c.from < since);
    Ok(&cycles[inside.min(last_ones)..])
}

fn slope(soaking: &Soaking, cycles: &[Point], bound: Bound) -> Answer {
    let points: Vec<&Point> = cycles.iter().collect();
    let method = match bound {
        Bound::With => "slope",
        Bound::Without => "sampling method",
    };
    let name = format!("{method} over {} cycles", cycles.len());
    ask_all(soaking, &points, &name, Per::Hour, |quantity| {
        let track: Vec<(f64, f64)> = cycles
            .iter()
            .filter_map(|c| Some((c.middle(), quantity.of(c)?)))
            .collect();
        let line = line_through(track.iter().copied());
        slope_within(quantity, line, || track.clone(), bound)
    })
}

fn readings(soaking: &Soaking, cycles: &[Point], spacing: f64) -> Answer {
    let Some(last_ones) = cycles.len().checked_sub(FEWEST) else {
        return Err(format!("{} of {FEWEST} whole cycles", cycles.len()));
    };
    let before = |t: f64| cycles.iter().rposition(|c| c.middle() <= t + 1e-6);
    let third = cycles.len() - 1;
    let second = before(cycles[third].middle() - spacing);
    let first = second.and_then(|c| before(cycles[c].middle() - spacing));
    let (Some(first), Some(second)) = (first, second) else {
        return Err(format!(
            "three cycles {} apart are not there yet",
            minutes(spacing)
        ));
    };
    let name = format!("three cycles {} apart", minutes(spacing));
    let points: Vec<&Point> = cycles[first.min(last_ones)..].iter().collect();
    let three = [&cycles[first], &cycles[second], &cycles[third]];
    unchanged(soaking, &points, &three, &name, Least::Resolution)
}
