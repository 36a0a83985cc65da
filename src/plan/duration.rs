//! How long a plan takes: an estimate, and the longest.

use super::types::{Action, Plan, PlannedStep};
use crate::quantity::Seconds;

/// Estimate: a soak ends half-way between its least and its longest time, and a unit
/// is cool after half of the longest time that it may take (house default, no source).
const SHARE: f64 = 0.5;

/// How long the steps are expected to take, the operator's own time left out.
pub(super) fn expected(steps: &[PlannedStep]) -> Seconds {
    total(steps, |(least, most)| least + SHARE * (most - least))
}

impl Plan {
    /// The longest that it can take, without the operator.
    pub fn longest(&self) -> Seconds {
        total(&self.steps, |(_, most)| most)
    }
}

fn total(steps: &[PlannedStep], of_step: impl Fn((f64, f64)) -> f64) -> Seconds {
    let total: f64 = steps
        .iter()
        .map(|step| of_step(span_of(&step.action)))
        .sum();
    Seconds::new(total.round()).unwrap_or_default()
}

/// Least and longest time of a step in seconds.
fn span_of(action: &Action) -> (f64, f64) {
    match action {
        Action::Inrush(timed) | Action::Measure(timed) | Action::RunIn(timed) => {
            (timed.length.get(), timed.length.get())
        }
        Action::Abnormal { length, .. } => (length.get(), length.get()),
        Action::Soak {
            at_least, at_most, ..
        } => (at_least.get(), at_most.get()),
        Action::Rest(waiting) | Action::Acclimatise(waiting) => (0.0, waiting.at_most.get()),
        Action::Instruct(_)
        | Action::SetCondition { .. }
        | Action::Ask(_)
        | Action::SetSupply(_)
        | Action::SetPosition { .. }
        | Action::Energise
        | Action::Deenergise => (0.0, 0.0),
    }
}
