//! What a campaign found, and whether its goals are met.

use super::coverage::Coverage;
use super::limit::AtLimit;
use super::outcomes::{FaultRow, Outcomes, Place};
use super::proportion::Proportion;
use super::setting::Kind;
use crate::judge::Outcome;
use crate::virtual_bench::Drawn;

/// Least share of values whose U covers the truth.
pub const LEAST_COVERAGE: f64 = 0.945;
/// From so many values on the share itself is held to it.
pub const COVERAGE_FROM: u64 = 1000;
/// Coverage of a normal distribution by k = 2, and how far the control may lie off.
pub const CONTROL: (f64, f64) = (0.954_5, 0.01);
/// From so many values on the control is precise enough to be held to its goal.
pub const CONTROL_FROM: u64 = 4000;
/// Aim of an early finish: this share of the soak time saved.
pub const TIME_SAVED: f64 = 0.5;

/// What can be measured.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord)]
pub enum Part {
    /// Good units and units around the limits, errors as the budget states them.
    Good,
    /// The same with all inputs normal.
    Control,
    /// Draws on the limit.
    Limit,
    /// Every fault of unit and sensor.
    Faults,
    /// The same units with and without an early finish.
    EarlyFinish,
}

impl Part {
    /// All.
    pub const ALL: [Part; 5] = [
        Part::Good,
        Part::Control,
        Part::Limit,
        Part::Faults,
        Part::EarlyFinish,
    ];

    /// Its name, as it is asked for.
    pub fn name(self) -> &'static str {
        match self {
            Part::Good => "good",
            Part::Control => "control",
            Part::Limit => "limit",
            Part::Faults => "faults",
            Part::EarlyFinish => "early-finish",
        }
    }
}

/// With an early finish beside without.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Early {
    /// The appliance.
    pub kind: Kind,
    /// Units that ran both ways.
    pub units: u64,
    /// Soak time without, seconds.
    pub usual_s: f64,
    /// Soak time with, seconds.
    pub early_s: f64,
    /// Units whose verdict changed.
    pub changed: u64,
    /// Of those, from any failing outcome to any passing one, conditional ones included:
    /// near a limit the noise of another minute does that too.
    pub across: u64,
    /// Of those, from a fail to a pass.
    pub to_pass: u64,
    /// Settled powers whose U covers the truth, with an early finish.
    pub power: Proportion,
    /// The same of worst cases.
    pub worst: Proportion,
}

impl Early {
    pub(super) fn new(kind: Kind) -> Self {
        Early {
            kind,
            units: 0,
            usual_s: 0.0,
            early_s: 0.0,
            changed: 0,
            across: 0,
            to_pass: 0,
            power: Proportion::default(),
            worst: Proportion::default(),
        }
    }

    pub(super) fn add(&mut self, soaked: [f64; 2], verdicts: [Outcome; 2]) {
        use Outcome::{ConditionalFail, ConditionalPass, Fail, Pass};
        let [was, is] = verdicts;
        self.units += 1;
        self.usual_s += soaked[0];
        self.early_s += soaked[1];
        self.changed += u64::from(was != is);
        let failed = matches!(was, Fail | ConditionalFail);
        self.across += u64::from(failed && matches!(is, Pass | ConditionalPass));
        self.to_pass += u64::from(was == Fail && is == Pass);
    }

    /// Share of the time that is saved.
    pub fn saved(&self) -> f64 {
        if self.usual_s > 0.0 {
            1.0 - self.early_s / self.usual_s
        } else {
            0.0
        }
    }
}

/// What a campaign found.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct Report {
    /// Units of each population.
    pub units: u64,
    /// The seed.
    pub seed: u64,
    /// Runs in all.
    pub runs: u64,
    /// Coverage as stated.
    pub good: Vec<Coverage>,
    /// Coverage with all inputs normal.
    pub control: Vec<Coverage>,
    /// How units were judged, by where their truth lies.
    pub places: Vec<(Place, Outcomes)>,
    /// False passes on the limit.
    pub limit: Vec<AtLimit>,
    /// Faults.
    pub faults: Vec<FaultRow>,
    /// Early finish; empty where it was not asked for, or where sequences know none.
    pub early: Vec<Early>,
}

/// One goal and whether it is met.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Goal {
    /// What was wanted.
    pub what: String,
    /// Whether it is so.
    pub met: bool,
}

impl Report {
    /// The goals of what was measured. An early finish is an aim, but a fail that it
    /// turns into a pass counts.
    pub fn goals(&self) -> Vec<Goal> {
        let mut goals = Vec::new();
        for row in self.good.iter().filter(|row| row.covered.of > 0) {
            goals.push(Goal {
                what: format!("coverage at least 94.5 %: {}", named(row)),
                met: covers(row),
            });
        }
        let precise = |row: &&Coverage| row.covered.of >= CONTROL_FROM;
        for row in self.control.iter().filter(precise) {
            let share = row.covered.share().unwrap_or(0.0);
            goals.push(Goal {
                what: format!("control 95.45 +-1 %: {}", named(row)),
                met: (share - CONTROL.0).abs() <= CONTROL.1,
            });
        }
        for row in &self.limit {
            goals.push(Goal {
                what: format!("false passes: {}, {}", row.of, drawn_words(row.drawn)),
                met: row.passes.share().is_some_and(|share| share <= row.goal()),
            });
        }
        for row in &self.faults {
            goals.push(Goal {
                what: format!("never passed: {}, {}", row.fault, row.kind.words()),
                met: row.outcomes.passed() == 0,
            });
        }
        for early in &self.early {
            goals.push(Goal {
                what: format!("no fail becomes a pass, {}", early.kind.words()),
                met: early.to_pass == 0,
            });
        }
        goals
    }
}

/// Few values can only refute the goal: then it is not met where even the upper end of
/// the interval lies below it.
fn covers(row: &Coverage) -> bool {
    let share = if row.covered.of < COVERAGE_FROM {
        row.covered.interval().1
    } else {
        row.covered.share().unwrap_or(0.0)
    };
    share >= LEAST_COVERAGE
}

/// Quantity and appliance of a row.
pub fn named(row: &Coverage) -> String {
    let kind = row.kind.map_or("both", Kind::words);
    format!("{}, {kind}", row.quantity.words())
}

/// Distributions in words.
pub fn drawn_words(drawn: Drawn) -> &'static str {
    match drawn {
        Drawn::House => "as in rehearsals",
        Drawn::AsStated => "as stated",
        Drawn::Normal => "all normal",
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn an_early_finish_counts_time_and_verdicts() {
        use Outcome::{ConditionalFail, ConditionalPass, Fail, Pass};
        let mut early = Early::new(Kind::Plain);
        early.add([600.0, 300.0], [Pass, Pass]);
        early.add([600.0, 300.0], [ConditionalFail, ConditionalPass]);
        assert_eq!((early.changed, early.across, early.to_pass), (1, 1, 0));
        assert!((early.saved() - 0.5).abs() < 1e-12);
        early.add([600.0, 600.0], [Fail, Pass]);
        assert_eq!((early.changed, early.across, early.to_pass), (2, 2, 1));
        let report = Report {
            early: vec![early],
            ..Report::default()
        };
        assert!(report.goals().iter().any(|goal| !goal.met));
    }
}
