//! Where a soak will end, and when: a first-order fit y = end + A exp(-t / tau).
//!
//! It starts after the fast phase: the earliest of a few starts behind which the
//! residuals are without trend. Without 1.5 tau of data, or with a trend in every
//! stretch, there is no prediction. The uncertainty of the end holds the fit's own and
//! what a slow second time constant could do that the data can't exclude.

use super::limits::Quantity;
use super::points::Point;
use super::slow::possible_shift;
use crate::quantity::{Moment, Seconds};
use crate::spec::sequence::{CriterionKind, Soak};
use crate::stats::{coverage_factor, first_order};

use super::criteria::apart;

/// Points that a fit takes at most.
const MOST_POINTS: usize = 200;
/// And at least.
const FEWEST_POINTS: usize = 20;
/// A fit needs so many of its time constants of data (house default).
const TAUS_OF_DATA: f64 = 1.5;
/// Shares of the soak that may be left out as its fast phase.
const STARTS: [f64; 7] = [0.0, 0.1, 0.2, 0.3, 0.4, 0.5, 0.6];
/// Fits are this far apart, seconds.
const EVERY_S: f64 = 30.0;
/// Fits that agree span this share of the elapsed time (house default).
const AGREE_OVER: f64 = 0.1;
/// How far ahead a moment is looked for, in time constants.
const AHEAD: f64 = 30.0;
const PER_HOUR: f64 = 3600.0;

/// Where one quantity will end, in watts or kelvins.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Prediction {
    /// Where it ends.
    pub end: f64,
    /// Expanded uncertainty of the end, about 95 %.
    pub end_expanded: f64,
    /// Standard uncertainty of the end.
    pub end_standard: f64,
    /// Time constant, seconds.
    pub tau_s: f64,
    /// What is still to come, with its sign: slope times tau at the last grid cell.
    pub still_to_come: f64,
    /// When the criterion's limit will be met; absent where none is stated.
    pub settled_at: Option<Moment>,
    /// Time until then.
    pub to_go: Option<Seconds>,
}

/// Predictions of the power and of the body's rise; absent where there is none.
#[derive(Debug, Clone, Copy, PartialEq, Default)]
pub struct Predictions {
    /// In watts.
    pub power: Option<Prediction>,
    /// In kelvins.
    pub rise: Option<Prediction>,
}

/// One accepted fit.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Fit {
    pub(super) end: f64,
    pub(super) standard: f64,
    pub(super) expanded: f64,
    pub(super) tau_s: f64,
    /// End less the fitted value at the last point, where `at_s` is.
    pub(super) still: f64,
    at_s: f64,
}

/// The fits of one moment.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Round {
    at_s: f64,
    pub(super) power: Option<Fit>,
    pub(super) rise: Option<Fit>,
}

impl Round {
    pub(super) fn of(&self, quantity: Quantity) -> Option<Fit> {
        match quantity {
            Quantity::Power(_) => self.power,
            Quantity::Rise(_) => self.rise,
        }
    }
}

/// The soak so far, thinned, and the fits through it.
#[derive(Debug, Clone, Default)]
pub(super) struct Forecast {
    points: Vec<Point>,
    /// Cells per point.
    per_point: usize,
    pending: Option<(Point, usize)>,
    rounds: Vec<Round>,
}

impl Forecast {
    /// Takes a closed cell in.
    pub(super) fn take(&mut self, cell: Point) {
        let per_point = self.per_point.max(1);
        let (point, count) = match self.pending.take() {
            Some((point, count)) => (point.merged(&cell), count + 1),
            None => (cell, 1),
        };
        if count < per_point {
            self.pending = Some((point, count));
            return;
        }
        self.points.push(point);
        if self.points.len() >= MOST_POINTS {
            self.points = self
                .points
                .chunks(2)
                .map(|pair| pair.iter().skip(1).fold(pair[0], |a, b| a.merged(b)))
                .collect();
            self.per_point = 2 * per_point;
        }
    }

    /// Fits anew, unless the last fits are younger than half a minute.
    pub(super) fn refresh(&mut self, now: f64) {
        if self.rounds.last().is_some_and(|r| now - r.at_s < EVERY_S) {
            return;
        }
        self.fit(now);
    }

    /// Fits anew.
    pub(super) fn fit(&mut self, now: f64) {
        let fit = |of: fn(&Point) -> Option<f64>| {
            let track: Vec<(f64, f64)> = self
                .points
                .iter()
                .filter_map(|p| Some((p.middle(), of(p)?)))
                .collect();
            fit_of(&track, now)
        };
        let round = Round {
            at_s: now,
            power: fit(|p| p.power),
            rise: fit(|p| p.rise),
        };
        let oldest = now - 3.0 * AGREE_OVER * now - EVERY_S;
        self.rounds.retain(|r| r.at_s >= oldest && r.at_s < now);
        self.rounds.push(round);
    }

    /// The latest fits.
    pub(super) fn latest(&self) -> Option<&Round> {
        self.rounds.last()
    }

    /// The latest fit of a quantity, where every one over at least a tenth of the elapsed
    /// time agrees with its end within U, and U lies within the criterion's own limit.
    pub(super) fn agreed(&self, quantity: Quantity, now: f64) -> Option<(Fit, f64)> {
        let latest = self.latest()?.of(quantity)?;
        let limit = quantity.limit(latest.end)?;
        let since = latest.at_s - AGREE_OVER * now;
        let first = self.rounds.iter().rposition(|r| r.at_s <= since)?;
        let agree = self.rounds[first..].iter().all(|round| {
            round
                .of(quantity)
                .is_some_and(|fit| (fit.end - latest.end).abs() <= latest.expanded)
        });
        (agree && latest.expanded <= limit).then(|| (latest, latest.at_s - self.rounds[first].at_s))
    }
}

/// The fit after the fast phase.
fn fit_of(track: &[(f64, f64)], now: f64) -> Option<Fit> {
    let (first, last) = (track.first()?.0, track.last()?.0);
    STARTS.iter().find_map(|share| {
        let from = first + share * (last - first);
        let fit = accepted(track, from)?;
        let stretch = behind(track, from);
        let slow = possible_shift(stretch, fit.end, fit.tau, fit.effective)?;
        let standard = libm::hypot(fit.end_error, slow);
        let expanded = coverage_factor(fit.effective - 3.0) * standard;
        // The amplitude is that of the stretch's first point.
        let still = -fit.amplitude * libm::exp(-(now - stretch.first()?.0) / fit.tau);
        let known = [standard, expanded, still, fit.end];
        known.iter().all(|x| x.is_finite()).then_some(Fit {
            end: fit.end,
            standard,
            expanded,
            tau_s: fit.tau,
            still,
            at_s: now,
        })
    })
}

fn behind(track: &[(f64, f64)], from: f64) -> &[(f64, f64)] {
    &track[track.partition_point(|p| p.0 < from)..]
}

/// A fit from `from` on with enough data and residuals without trend.
fn accepted(track: &[(f64, f64)], from: f64) -> Option<crate::stats::FirstOrder> {
    let stretch = behind(track, from);
    if stretch.len() < FEWEST_POINTS {
        return None;
    }
    let span = stretch[stretch.len() - 1].0 - stretch[0].0;
    first_order(stretch).filter(|fit| fit.trend_free && span >= TAUS_OF_DATA * fit.tau)
}

/// A fit as it is told: with the moment at which the criterion's limit is met.
pub(super) fn told(
    fit: &Fit,
    quantity: Option<Quantity>,
    soak: &Soak,
    energised: Moment,
    log_from: f64,
) -> Prediction {
    let met = quantity
        .and_then(|quantity| quantity.limit(fit.end))
        .and_then(|limit| met_after(fit, limit, soak, log_from));
    Prediction {
        end: fit.end,
        end_expanded: fit.expanded,
        end_standard: fit.standard,
        tau_s: fit.tau_s,
        still_to_come: fit.still,
        settled_at: met.map(|t| energised + Seconds::of(t.max(0.0))),
        to_go: met.map(|t| Seconds::of((t - fit.at_s).max(0.0))),
    }
}

/// When the fitted curve itself meets the limit, seconds after energising.
fn met_after(fit: &Fit, limit: f64, soak: &Soak, log_from: f64) -> Option<f64> {
    let distance = |t: f64| fit.still.abs() * libm::exp(-(t - fit.at_s) / fit.tau_s);
    let slope = |t: f64| distance(t) / fit.tau_s * PER_HOUR;
    let change = |t: f64| match soak.until.kind {
        CriterionKind::Slope { window } => slope(t - 0.5 * window.get()),
        CriterionKind::SamplingMethod => slope(t - (t - log_from) / 3.0),
        CriterionKind::ThreeReadings => distance(t - 2.0 * apart(t)) - distance(t),
        CriterionKind::ChangeWithin { interval } => distance(t - interval.get()) - distance(t),
    };
    let (mut before, mut after) = (fit.at_s, fit.at_s + AHEAD * fit.tau_s);
    if change(after) > limit {
        return None;
    }
    if change(before) > limit {
        for _ in 0..50 {
            let middle = f64::midpoint(before, after);
            if change(middle) > limit {
                before = middle;
            } else {
                after = middle;
            }
        }
    } else {
        after = before;
    }
    let found = after.max(soak.at_least.get());
    found.is_finite().then_some(found)
}
