//! One value against its limits: decision rules and probability of conformity.
//!
//! The boundary belongs to the better side: a value on the acceptance limit passes
//! (ILAC-G8:09/2019 4.2.3; JCGM 106 for the probability).

use super::types::Outcome;
use crate::analysis::Estimate;
use crate::quantity::at_most;
use crate::spec::sequence::Decision;
use crate::stats::normal_cdf;

/// Allowed values, both ends included.
#[derive(Debug, Clone, Copy, PartialEq, Default)]
pub struct Limits {
    /// Lower limit.
    pub at_least: Option<f64>,
    /// Upper limit.
    pub at_most: Option<f64>,
}

/// What a decision says of a value.
#[derive(Debug, Clone, PartialEq)]
pub struct Decided {
    /// The outcome.
    pub outcome: Outcome,
    /// Distance to the nearer limit, positive is good; absent without a limit.
    pub margin: Option<f64>,
    /// Probability that the true value lies within the limits.
    pub probability: Option<f64>,
    /// Why there is no decision.
    pub reason: Option<String>,
}

/// Decides by a rule.
pub fn decide(estimate: &Estimate, limits: Limits, decision: Decision) -> Decided {
    let (value, expanded) = (estimate.value, estimate.expanded);
    let above = limits.at_least.map(|limit| value - limit);
    let below = limits.at_most.map(|limit| limit - value);
    let margin = [above, below].into_iter().flatten().reduce(f64::min);
    let mut decided =
        Decided { outcome: Outcome::NotJudged, margin, probability: probability(estimate, limits), reason: None };
    let Some(_) = margin else {
        decided.reason = Some("the rule has no limit".to_owned());
        return decided;
    };
    if let (Some(low), Some(high)) = (limits.at_least, limits.at_most)
        && !at_most(expanded, (high - low) / 2.0)
    {
        decided.reason =
            Some(format!("U of {expanded:.3} exceeds half of the tolerance width: nothing could pass with this set-up"));
        return decided;
    }
    let upper = limits.at_most.map(|limit| against_upper(value, limit, expanded, decision));
    // A lower limit is an upper one seen in a mirror.
    let lower = limits.at_least.map(|limit| against_upper(-value, -limit, expanded, decision));
    let worse = [upper, lower].into_iter().flatten().max_by_key(|outcome| severity(*outcome));
    decided.outcome = worse.unwrap_or(Outcome::NotJudged);
    decided
}

fn against_upper(value: f64, limit: f64, expanded: f64, decision: Decision) -> Outcome {
    let within = |limit: f64| at_most(value, limit);
    match decision {
        Decision::Simple if within(limit) => Outcome::Pass,
        Decision::Guarded { ratio } if within(limit - ratio * expanded) => Outcome::Pass,
        Decision::Simple | Decision::Guarded { .. } => Outcome::Fail,
        Decision::FourOutcomes if within(limit - expanded) => Outcome::Pass,
        Decision::FourOutcomes if within(limit) => Outcome::ConditionalPass,
        Decision::FourOutcomes if within(limit + expanded) => Outcome::ConditionalFail,
        Decision::FourOutcomes => Outcome::Fail,
    }
}

/// How much an outcome weighs in a verdict: fail, then not judged, then the
/// conditional ones, then pass.
pub(super) fn severity(outcome: Outcome) -> u8 {
    match outcome {
        Outcome::Pass => 0,
        Outcome::ConditionalPass => 1,
        Outcome::ConditionalFail => 2,
        Outcome::NotJudged => 3,
        Outcome::Fail => 4,
    }
}

/// Phi((TU - y)/u) - Phi((TL - y)/u) with u = U / k.
fn probability(estimate: &Estimate, limits: Limits) -> Option<f64> {
    let u = estimate.expanded / estimate.coverage;
    if u.is_nan() || u <= 0.0 {
        return None;
    }
    let up_to = |limit: f64| normal_cdf((limit - estimate.value) / u);
    match (limits.at_least, limits.at_most) {
        (None, None) => None,
        (low, high) => Some((high.map_or(1.0, up_to) - low.map_or(0.0, up_to)).max(0.0)),
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use proptest::prelude::*;

    fn estimate(value: f64, expanded: f64) -> Estimate {
        Estimate { value, expanded, coverage: 2.0, budget: Vec::new() }
    }

    fn upper(limit: f64) -> Limits {
        Limits { at_least: None, at_most: Some(limit) }
    }

    #[test]
    fn the_four_outcomes_fall_where_ilac_g8_puts_them() {
        // ILAC-G8:09/2019 4.2.3 (terms read); TL 24.0 W, U 0.4 W, w = U, computed.
        let rows = [
            (23.5, Outcome::Pass, 0.993_79),
            (23.6, Outcome::Pass, 0.977_25),
            (23.7, Outcome::ConditionalPass, 0.933_19),
            (24.0, Outcome::ConditionalPass, 0.5),
            (24.2, Outcome::ConditionalFail, 0.158_66),
            (24.5, Outcome::Fail, 0.006_21),
        ];
        for (value, outcome, p) in rows {
            let decided = decide(&estimate(value, 0.4), upper(24.0), Decision::FourOutcomes);
            assert_eq!(decided.outcome, outcome, "{value}");
            assert!((decided.probability.unwrap() - p).abs() < 1e-5, "{value}");
        }
    }

    #[test]
    fn a_link_with_th_94_is_decided_as_computed() {
        // Th 94 C from a data sheet, U = 2 K, guard band = U (computed).
        let rows = [
            (90.0, Outcome::Pass),
            (92.0, Outcome::Pass),
            (93.0, Outcome::ConditionalPass),
            (95.0, Outcome::ConditionalFail),
            (97.0, Outcome::Fail),
        ];
        for (body, outcome) in rows {
            let decided = decide(&estimate(body, 2.0), upper(94.0), Decision::FourOutcomes);
            assert_eq!(decided.outcome, outcome, "{body}");
            assert!((decided.margin.unwrap() - (94.0 - body)).abs() < 1e-12);
        }
    }

    #[test]
    fn probabilities_are_those_of_jcgm_106() {
        // y -5.47 V, u 0.05, TU -5.40 -> 0.9192433 (inputs from memory, computed).
        let decided = decide(&estimate(-5.47, 0.1), upper(-5.40), Decision::Simple);
        assert!((decided.probability.unwrap() - 0.919_243_3).abs() < 1e-6);
        let both = Limits { at_least: Some(-2.0), at_most: Some(2.0) };
        let decided = decide(&estimate(0.0, 2.0), both, Decision::Simple);
        assert!((decided.probability.unwrap() - 0.954_499_7).abs() < 1e-6);
    }

    #[test]
    fn a_lower_limit_mirrors_an_upper_one() {
        let lower = Limits { at_least: Some(23.4), at_most: None };
        for (value, outcome) in [(23.8, Outcome::Pass), (23.5, Outcome::ConditionalPass), (23.1, Outcome::ConditionalFail), (22.9, Outcome::Fail)] {
            assert_eq!(decide(&estimate(value, 0.4), lower, Decision::FourOutcomes).outcome, outcome, "{value}");
        }
    }

    #[test]
    fn decimal_boundaries_of_the_plate_pass_exactly() {
        // 4.5 W x 1.2: IEC 60335-1 clause 10.1.
        assert_eq!(decide(&estimate(5.4, 0.0), upper(4.5 * 1.2), Decision::Simple).outcome, Outcome::Pass);
        assert_eq!(decide(&estimate(5.400_01, 0.0), upper(4.5 * 1.2), Decision::Simple).outcome, Outcome::Fail);
    }

    #[test]
    fn without_an_acceptance_zone_nothing_is_judged() {
        let limits = Limits { at_least: Some(9.0), at_most: Some(11.0) };
        assert_eq!(decide(&estimate(10.0, 1.0), limits, Decision::FourOutcomes).outcome, Outcome::Pass);
        let decided = decide(&estimate(10.0, 1.001), limits, Decision::FourOutcomes);
        assert_eq!(decided.outcome, Outcome::NotJudged);
        assert!(decided.reason.is_some());
        assert_eq!(decide(&estimate(10.0, 0.1), Limits::default(), Decision::Simple).outcome, Outcome::NotJudged);
    }

    #[test]
    fn a_guard_band_of_r_u_narrows_the_acceptance() {
        let guarded = Decision::Guarded { ratio: 0.83 };
        assert_eq!(decide(&estimate(23.668, 0.4), upper(24.0), guarded).outcome, Outcome::Pass);
        assert_eq!(decide(&estimate(23.669, 0.4), upper(24.0), guarded).outcome, Outcome::Fail);
    }

    proptest! {
        #[test]
        fn a_wider_limit_never_worsens_an_outcome(value in -50.0..50.0f64, u in 0.0..5.0f64, limit in -40.0..40.0f64, wider in 0.0..20.0f64) {
            for decision in [Decision::Simple, Decision::FourOutcomes, Decision::Guarded { ratio: 0.83 }] {
                let narrow = decide(&estimate(value, u), upper(limit), decision).outcome;
                let wide = decide(&estimate(value, u), upper(limit + wider), decision).outcome;
                prop_assert!(severity(wide) <= severity(narrow));
            }
        }

        #[test]
        fn scaling_the_unit_leaves_the_outcome_alone(value in 1.0..50.0f64, u in 0.0..5.0f64, limit in 1.0..40.0f64) {
            let watts = decide(&estimate(value, u), upper(limit), Decision::FourOutcomes).outcome;
            let milliwatts = decide(&estimate(value * 1e3, u * 1e3), upper(limit * 1e3), Decision::FourOutcomes).outcome;
            prop_assert_eq!(watts, milliwatts);
        }

        #[test]
        fn more_uncertainty_never_turns_a_doubt_into_a_pass(value in 1.0..50.0f64, u in 0.0..5.0f64, more in 0.0..5.0f64, limit in 1.0..40.0f64) {
            let before = decide(&estimate(value, u), upper(limit), Decision::FourOutcomes).outcome;
            let after = decide(&estimate(value, u + more), upper(limit), Decision::FourOutcomes).outcome;
            prop_assert!(before == Outcome::Pass || after != Outcome::Pass);
        }
    }
}
