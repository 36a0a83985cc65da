//! Draws at the level of a measurement: a true value that lies exactly on its limit,
//! errors from the distributions that a budget states, and the decision rule.

use super::proportion::Proportion;
use crate::analysis::{Distribution, Estimate};
use crate::judge::{Limits, Outcome, decide};
use crate::spec::sequence::Decision;
use crate::stats::RECTANGULAR;
use crate::virtual_bench::{Chance, Drawn};

/// A normal distribution's share above U = 2 u, which a guard band w = U leaves as
/// the largest share of false passes (ILAC-G8:09/2019, 4.2.3: below 2.5 %).
pub const FALSE_PASSES: f64 = 0.022_750_131_948_179_21;

/// False passes of one budget.
#[derive(Debug, Clone, PartialEq)]
pub struct AtLimit {
    /// Whose budget.
    pub of: String,
    /// From which distributions.
    pub drawn: Drawn,
    /// Passes of a true value on the limit.
    pub passes: Proportion,
}

impl AtLimit {
    /// The largest share that chance alone explains: 2.275 % and three standard errors.
    pub fn goal(&self) -> f64 {
        let n = self.passes.of.max(1) as f64;
        FALSE_PASSES + 3.0 * libm::sqrt(FALSE_PASSES * (1.0 - FALSE_PASSES) / n)
    }
}

/// Draws `count` values around a truth on the upper limit.
pub(super) fn draw(of: &str, budget: &Estimate, drawn: Drawn, count: u64, seed: u64) -> AtLimit {
    let mut lines = Vec::new();
    for share in &budget.budget {
        let stated = share.distribution == Distribution::Rectangular;
        let rectangular = stated && drawn != Drawn::Normal;
        let chance = Chance::of(seed, &format!("{of}, {}", share.from));
        lines.push((chance, share.standard, rectangular));
    }
    let limit = budget.value;
    let limits = Limits {
        at_least: None,
        at_most: Some(limit),
    };
    let mut passes = Proportion::default();
    let mut value = budget.clone();
    for number in 0..count {
        let error = |(chance, standard, rectangular): &(Chance, f64, bool)| {
            if *rectangular {
                standard * RECTANGULAR * chance.even(number)
            } else {
                standard * chance.normal(number)
            }
        };
        value.value = limit + lines.iter().map(error).sum::<f64>();
        let decided = decide(&value, limits, Decision::FourOutcomes);
        passes.add(decided.outcome == Outcome::Pass);
    }
    AtLimit {
        of: of.to_owned(),
        drawn,
        passes,
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::analysis::Share;

    fn budget(lines: &[(&str, f64)], expanded: f64) -> Estimate {
        let share = |(from, standard): &(&str, f64)| {
            if from.starts_with("accuracy") {
                Share::rectangular(*from, RECTANGULAR * standard, "W")
            } else {
                Share::normal(*from, *standard, "W")
            }
        };
        Estimate {
            expanded,
            ..Estimate::combined(100.0, lines.iter().map(share).collect())
        }
    }

    fn share_of(lines: &[(&str, f64)], expanded: f64, drawn: Drawn) -> f64 {
        let found = draw("x", &budget(lines, expanded), drawn, 20_000, 1);
        found.passes.share().unwrap()
    }

    #[test]
    fn an_honest_budget_passes_as_often_as_its_distribution_says() {
        let calibration = [("calibration, power of meter", 1.0)];
        let found = share_of(&calibration, 2.0, Drawn::AsStated);
        assert!((found - FALSE_PASSES).abs() < 0.0032, "{found}");
        // A single rectangular line never errs by U = 2 u: its half-width is 1.73 u.
        let accuracy = [("accuracy, power of meter", 1.0)];
        assert_eq!(share_of(&accuracy, 2.0, Drawn::AsStated), 0.0);
        let normal = share_of(&accuracy, 2.0, Drawn::Normal);
        assert!((normal - FALSE_PASSES).abs() < 0.0032, "{normal}");
        // Two equal rectangular lines: 3.37 % beyond 2 u on both sides together
        // (computed: (sqrt 3 - sqrt 2)^2 / 3).
        let two = [("accuracy, a", 1.0), ("accuracy, b", 1.0)];
        let found = share_of(&two, 2.0 * std::f64::consts::SQRT_2, Drawn::AsStated);
        assert!((found - 0.016_84).abs() < 0.003, "{found}");
    }

    #[test]
    fn half_of_a_budget_lets_too_many_pass() {
        let calibration = [("calibration, power of meter", 1.0)];
        let found = draw("x", &budget(&calibration, 1.0), Drawn::AsStated, 20_000, 1);
        assert!(found.passes.share().unwrap() > found.goal());
    }
}
