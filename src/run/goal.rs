//! When a polled step is over: pure, fed with the samples that are recorded.

use std::collections::VecDeque;

use crate::quantity::{Kelvins, Moment, Seconds};
use crate::record::StepEnd;
use crate::settle::{Settle, Settling, Watched};

/// After-heat is watched for this long at least (the body climbs when a fan stops).
const AFTER_HEAT: Seconds = seconds(120);

/// Over this time the body must not fall by more than [`FALLING_FAST`].
const FALLING_WINDOW: Seconds = seconds(60);

/// A body that falls faster than this in [`FALLING_WINDOW`] is not cool inside.
const FALLING_FAST: f64 = 1.0;

const fn seconds(s: u32) -> Seconds {
    Seconds::whole(s)
}

/// What a polled step waits for.
pub enum Goal {
    /// A moment.
    Until(Moment),
    /// A first believable reading of every polled role, at the latest at a moment.
    Heard {
        /// Roles still to be heard.
        missing: Vec<usize>,
        /// The latest.
        limit: Moment,
    },
    /// Settled, at the latest at a moment.
    Settled {
        /// Asked with every sample.
        settle: Box<Settle>,
        /// The latest.
        limit: Moment,
    },
    /// The body near ambient, and not falling fast.
    Cool(Cooling),
}

/// A body on its way to ambient.
pub struct Cooling {
    within: Kelvins,
    earliest: Moment,
    limit: Moment,
    body: VecDeque<(Moment, f64)>,
    ambient: Option<f64>,
}

impl Cooling {
    /// Waits from `now` on; after an energised stretch the after-heat is watched too.
    pub fn new(within: Kelvins, at_most: Seconds, now: Moment, after_heat: bool) -> Self {
        let earliest = if after_heat { now + AFTER_HEAT } else { now };
        Self {
            within,
            earliest,
            limit: now + at_most,
            body: VecDeque::new(),
            ambient: None,
        }
    }

    fn take(&mut self, at: Moment, watched: Watched, value: f64) {
        match watched {
            Watched::Body => {
                self.body.push_back((at, value));
                while self.body.len() > 1 && at.since(self.body[1].0) >= FALLING_WINDOW {
                    self.body.pop_front();
                }
            }
            Watched::Ambient => self.ambient = Some(value),
            Watched::Power | Watched::Voltage => {}
        }
    }

    /// Near is meant of the last minute's mean: a single reading's noise must not end a
    /// rest that the next reading would find too short.
    fn is_cool(&self, now: Moment) -> bool {
        let (Some(ambient), Some((_, body)), Some((from, first))) =
            (self.ambient, self.body.back(), self.body.front())
        else {
            return false;
        };
        let mean = self.body.iter().map(|(_, body)| body).sum::<f64>() / self.body.len() as f64;
        let near = (mean - ambient).abs() < self.within.get();
        let steady = now.since(*from) < FALLING_WINDOW || first - body <= FALLING_FAST;
        now >= self.earliest && near && steady
    }
}

impl Goal {
    /// A role gave a believable reading.
    pub fn heard(&mut self, role: usize) {
        if let Goal::Heard { missing, .. } = self {
            missing.retain(|other| *other != role);
        }
    }

    /// A recorded value of a watched quantity.
    pub fn take(&mut self, at: Moment, watched: Watched, value: f64) {
        match self {
            Goal::Settled { settle, .. } => settle.take(at, watched, value),
            Goal::Cool(cooling) => cooling.take(at, watched, value),
            Goal::Until(_) | Goal::Heard { .. } => {}
        }
    }

    /// How the step ended, where it has.
    pub fn end(&self, now: Moment) -> Option<StepEnd> {
        let limit = self.limit();
        let reached = match self {
            Goal::Until(_) => (now >= limit).then_some(StepEnd::Done),
            Goal::Heard { missing, .. } => missing.is_empty().then_some(StepEnd::Done),
            Goal::Settled { settle, .. } => match settle.state() {
                Settling::Settled { .. } => Some(StepEnd::Settled),
                Settling::Extrapolated { .. } => Some(StepEnd::Extrapolated),
                Settling::WentOpen => Some(StepEnd::WentOpen),
                Settling::TooEarly | Settling::NotYet(_) => None,
            },
            Goal::Cool(cooling) => cooling.is_cool(now).then_some(StepEnd::Done),
        };
        reached.or_else(|| (now >= limit).then_some(StepEnd::TimeLimit))
    }

    /// The latest moment of its end.
    pub fn limit(&self) -> Moment {
        match self {
            Goal::Until(limit) | Goal::Heard { limit, .. } | Goal::Settled { limit, .. } => *limit,
            Goal::Cool(cooling) => cooling.limit,
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn at(s: f64) -> Moment {
        Moment::START + Seconds::of(s)
    }

    fn cooling() -> Goal {
        Goal::Cool(Cooling::new(
            Kelvins::of(3.0),
            Seconds::of(3600.0),
            at(0.0),
            true,
        ))
    }

    fn feed(goal: &mut Goal, s: f64, body: f64) -> Option<StepEnd> {
        goal.take(at(s), Watched::Ambient, 23.0);
        goal.take(at(s), Watched::Body, body);
        goal.end(at(s))
    }

    #[test]
    fn a_rest_watches_the_after_heat_although_the_body_looks_cool() {
        let mut goal = cooling();
        for s in 0..23 {
            assert_eq!(feed(&mut goal, f64::from(s) * 5.0, 24.0), None);
        }
        assert_eq!(feed(&mut goal, 120.0, 24.0), Some(StepEnd::Done));
    }

    #[test]
    fn a_body_that_falls_fast_is_not_cool() {
        let mut goal = cooling();
        for s in 0..30 {
            let body = 60.0 - f64::from(s) * 1.2;
            assert_eq!(feed(&mut goal, 100.0 + f64::from(s) * 5.0, body), None);
        }
        assert_eq!(feed(&mut goal, 250.0, 25.0), None);
        assert_eq!(feed(&mut goal, 320.0, 24.8), Some(StepEnd::Done));
    }

    #[test]
    fn without_a_body_only_the_time_limit_ends_a_rest() {
        let goal = cooling();
        assert_eq!(goal.end(at(3599.0)), None);
        assert_eq!(goal.end(at(3600.0)), Some(StepEnd::TimeLimit));
    }
}
