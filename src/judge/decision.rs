//! One value against its limits: the decision rules and their boundaries.

use crate::analysis::Estimate;
use crate::quantity::{at_least, at_most, shortest};
use crate::spec::sequence::Decision;
use crate::stats::normal_cdf;

use super::types::Outcome;

/// Limits of a value; either may be absent.
#[derive(Debug, Clone, Copy, PartialEq, Default)]
pub struct Limits {
    /// Lower limit, inclusive.
    pub at_least: Option<f64>,
    /// Upper limit, inclusive.
    pub at_most: Option<f64>,
}

/// To which side a value on its limit belongs, as it is printed with every judgement.
pub const CONVENTION: &str = "a value on a limit, or on the edge of a guard band, belongs to the better side; compared after rounding to 1e-9 of the limit";

/// A decision rule in words, with its guard band w.
pub fn in_words(decision: Decision, unit: &str) -> String {
    match decision {
        Decision::Simple => "simple, w = 0".to_owned(),
        Decision::SimpleUpTo { largest } => {
            format!("simple, w = 0, U at most {} {unit}", shortest(largest))
        }
        Decision::Guarded { ratio } => format!("guarded, w = {} U", shortest(ratio)),
        Decision::FourOutcomes => "four outcomes, w = U (ILAC-G8:09/2019, 4.2.3)".to_owned(),
    }
}

/// What a decision rule says of a value.
#[derive(Debug, Clone, PartialEq)]
pub struct Decided {
    /// The outcome.
    pub outcome: Outcome,
    /// Distance to the nearer limit, positive is good; absent without a limit.
    pub margin: Option<f64>,
    /// Probability that the true value conforms (JCGM 106, normal distribution of
    /// standard uncertainty U/k); absent without a limit.
    pub probability: Option<f64>,
    /// Why it is not judged; empty where it is.
    pub reason: String,
}

/// Decides by a rule with guard band w: none for the simple rule, r U for the
/// guarded one (accepted inside the guard bands, else rejected), U for four
/// outcomes (ILAC-G8:09/2019, 4.2.3): pass up to TL - w, conditional pass up to TL,
/// conditional fail up to TL + w, fail above; each boundary belongs to the better
/// side after rounding to 1e-9.
///
/// Where w exceeds half of the tolerance width no acceptance zone is left: not
/// judged, unless the value fails in any case. A simple decision that is stated up to
/// a largest U judges nothing beyond it.
pub fn decide(value: &Estimate, limits: Limits, decision: Decision) -> Decided {
    let margin = margin(value.value, limits);
    let band = guard_band(decision, value);
    let numbers = [value.value, value.expanded, band];
    if margin.is_none() || numbers.iter().any(|x| !x.is_finite()) {
        return Decided {
            outcome: Outcome::NotJudged,
            margin,
            probability: None,
            reason: "there is no limit, or no number to compare with it".to_owned(),
        };
    }
    let within = |w: f64| {
        limits
            .at_least
            .is_none_or(|low| at_least(value.value, low + w))
            && limits
                .at_most
                .is_none_or(|high| at_most(value.value, high - w))
    };
    let four = decision == Decision::FourOutcomes;
    let outcome = match (within(band), within(0.0), within(-band)) {
        (true, ..) => Outcome::Pass,
        (_, true, _) if four => Outcome::ConditionalPass,
        (.., true) if four => Outcome::ConditionalFail,
        _ => Outcome::Fail,
    };
    if let Decision::SimpleUpTo { largest } = decision
        && !at_most(value.expanded, largest)
    {
        return Decided {
            outcome: Outcome::NotJudged,
            margin,
            probability: probability(value, limits),
            reason: format!(
                "U is {}, and the simple decision is stated for U up to {} only",
                shortest(value.expanded),
                shortest(largest)
            ),
        };
    }
    // A guarded rule rejects inside the guard band too; it is only certain beyond it.
    let certain = outcome == Outcome::Fail && !within(-band);
    if no_zone(band, limits) && !certain {
        return Decided {
            outcome: Outcome::NotJudged,
            margin,
            probability: probability(value, limits),
            reason: "the uncertainty leaves no acceptance zone between the limits".to_owned(),
        };
    }
    Decided {
        outcome,
        margin,
        probability: probability(value, limits),
        reason: String::new(),
    }
}

/// The guard band w of a decision rule around a value.
pub fn guard_band(decision: Decision, value: &Estimate) -> f64 {
    match decision {
        Decision::Simple | Decision::SimpleUpTo { .. } => 0.0,
        Decision::Guarded { ratio } => ratio * value.expanded,
        Decision::FourOutcomes => value.expanded,
    }
}

fn margin(value: f64, limits: Limits) -> Option<f64> {
    let below = limits.at_least.map(|low| value - low);
    let above = limits.at_most.map(|high| high - value);
    below.into_iter().chain(above).reduce(f64::min)
}

fn no_zone(band: f64, limits: Limits) -> bool {
    match (limits.at_least, limits.at_most) {
        (Some(low), Some(high)) => !at_most(band, 0.5 * (high - low)),
        _ => false,
    }
}

/// p = Phi((TU - y)/u) - Phi((TL - y)/u) (JCGM 106); an absent limit is infinite.
fn probability(value: &Estimate, limits: Limits) -> Option<f64> {
    let u = value.expanded / value.coverage;
    if u.is_nan() || u < 0.0 {
        return None;
    }
    let below = |limit: f64| {
        if u > 0.0 {
            normal_cdf((limit - value.value) / u)
        } else if at_most(value.value, limit) {
            1.0
        } else {
            0.0
        }
    };
    let upper = limits.at_most.map_or(1.0, below);
    // Without uncertainty a value on its lower limit conforms.
    let lower = limits.at_least.map_or(0.0, |low| {
        if u == 0.0 && at_least(value.value, low) {
            0.0
        } else {
            below(low)
        }
    });
    Some((upper - lower).clamp(0.0, 1.0))
}

#[cfg(test)]
mod tests {
    use super::*;
    use proptest::prelude::*;

    fn estimate(value: f64, expanded: f64) -> Estimate {
        Estimate {
            value,
            expanded,
            coverage: 2.0,
            freedom: None,
            budget: Vec::new(),
        }
    }

    fn upper(limit: f64) -> Limits {
        Limits {
            at_least: None,
            at_most: Some(limit),
        }
    }

    fn both(low: f64, high: f64) -> Limits {
        Limits {
            at_least: Some(low),
            at_most: Some(high),
        }
    }

    fn four(value: f64, expanded: f64, limits: Limits) -> Outcome {
        decide(&estimate(value, expanded), limits, Decision::FourOutcomes).outcome
    }

    // Decision terms of ILAC-G8:09/2019 4.2.3; limit 24.0 W, U 0.4 W, w = U
    // (values and probabilities computed).
    #[test]
    fn four_outcomes_and_their_probabilities() {
        use Outcome::{ConditionalFail, ConditionalPass, Fail, Pass};
        for (value, outcome, p) in [
            (23.5, Pass, 0.993_79),
            (23.6, Pass, 0.977_25),
            (23.7, ConditionalPass, 0.933_19),
            (24.0, ConditionalPass, 0.5),
            (24.2, ConditionalFail, 0.158_66),
            (24.4, ConditionalFail, 0.022_75),
            (24.5, Fail, 0.006_21),
        ] {
            let found = decide(&estimate(value, 0.4), upper(24.0), Decision::FourOutcomes);
            assert_eq!(found.outcome, outcome, "{value}");
            assert!((found.probability.unwrap() - p).abs() < 1e-5, "{value}");
            assert!((found.margin.unwrap() - (24.0 - value)).abs() < 1e-9);
        }
    }

    // Th 94 °C from a data sheet, U 2 K, w = U (computed).
    #[test]
    fn thermal_link_check_values() {
        use Outcome::{ConditionalFail, ConditionalPass, Fail, Pass};
        for (body, outcome) in [
            (90.0, Pass),
            (92.0, Pass),
            (93.0, ConditionalPass),
            (95.0, ConditionalFail),
            (97.0, Fail),
        ] {
            assert_eq!(four(body, 2.0, upper(94.0)), outcome, "{body}");
        }
    }

    #[test]
    fn lower_limits_mirror_upper_ones() {
        let low = Limits {
            at_least: Some(10.0),
            at_most: None,
        };
        for (value, outcome) in [
            (10.5, Outcome::Pass),
            (10.4, Outcome::ConditionalPass),
            (9.6, Outcome::ConditionalFail),
            (9.4, Outcome::Fail),
        ] {
            assert_eq!(four(value, 0.5, low), outcome, "{value}");
        }
    }

    #[test]
    fn boundaries_belong_to_the_better_side_in_decimal() {
        // 5.4 - 0.1 and 4.5 x 1.2 are not exact in binary.
        assert_eq!(four(5.3, 0.1, upper(4.5 * 1.2)), Outcome::Pass);
        assert_eq!(four(5.4, 0.1, upper(4.5 * 1.2)), Outcome::ConditionalPass);
        assert_eq!(four(5.5, 0.1, upper(4.5 * 1.2)), Outcome::ConditionalFail);
        assert_eq!(four(23.4, 0.0, both(26.0 * 0.9, 28.6)), Outcome::Pass);
    }

    #[test]
    fn the_simple_rule_looks_at_the_value_and_the_guarded_one_at_its_band() {
        let at = |value, decision| decide(&estimate(value, 0.4), upper(24.0), decision).outcome;
        assert_eq!(at(24.0, Decision::Simple), Outcome::Pass);
        assert_eq!(at(24.01, Decision::Simple), Outcome::Fail);
        // ISO 14253-1 style: w = 0.83 U = 0.332 W.
        let guarded = Decision::Guarded { ratio: 0.83 };
        assert_eq!(at(23.668, guarded), Outcome::Pass);
        assert_eq!(at(23.669, guarded), Outcome::Fail);
    }

    #[test]
    fn an_uncertainty_wider_than_half_the_tolerance_judges_nothing_but_a_certain_fail() {
        let narrow = both(9.0, 11.0);
        let found = decide(&estimate(10.0, 1.01), narrow, Decision::FourOutcomes);
        assert_eq!(found.outcome, Outcome::NotJudged);
        assert!(!found.reason.is_empty());
        assert_eq!(four(10.0, 1.0, narrow), Outcome::Pass);
        assert_eq!(four(13.0, 1.5, narrow), Outcome::Fail);
    }

    #[test]
    fn without_limit_or_number_nothing_is_judged() {
        for (value, limits) in [(1.0, Limits::default()), (f64::NAN, upper(2.0))] {
            let found = decide(&estimate(value, 0.1), limits, Decision::Simple);
            assert_eq!(found.outcome, Outcome::NotJudged);
            assert!(!found.reason.is_empty());
        }
    }

    // JCGM 106: y -5.47 V, u 0.05 V, limit -5.40 V (inputs from memory).
    #[test]
    fn probability_of_jcgm_106() {
        let found = decide(&estimate(-5.47, 0.1), upper(-5.40), Decision::Simple);
        assert!((found.probability.unwrap() - 0.919_243_3).abs() < 1e-7);
    }

    fn any_decision() -> impl Strategy<Value = Decision> {
        prop_oneof![
            Just(Decision::Simple),
            Just(Decision::FourOutcomes),
            (0.0..1.5f64).prop_map(|ratio| Decision::Guarded { ratio }),
        ]
    }

    proptest! {
        #[test]
        fn a_wider_limit_never_worsens_an_outcome(
            value in -5.0..15.0f64, expanded in 0.0..6.0f64, low in 0.0..5.0f64, width in 0.0..5.0f64,
            more in 0.0..3.0f64, decision in any_decision(),
        ) {
            let it = estimate(value, expanded);
            let narrow = decide(&it, both(low, low + width), decision).outcome;
            let wide = decide(&it, both(low - more, low + width + more), decision).outcome;
            // A guarded rule that had no acceptance zone could not judge at all; given
            // one, it may well reject.
            let could_not = narrow == Outcome::NotJudged && matches!(decision, Decision::Guarded { .. });
            prop_assert!(could_not || wide.rank() <= narrow.rank(), "{narrow:?} -> {wide:?}");
            let one = decide(&it, upper(low), decision).outcome;
            let higher = decide(&it, upper(low + more), decision).outcome;
            prop_assert!(higher.rank() <= one.rank());
        }

        #[test]
        fn not_judged_always_says_why(
            value in -5.0..15.0f64, expanded in 0.0..6.0f64, low in 0.0..5.0f64, width in 0.0..5.0f64,
            decision in any_decision(),
        ) {
            let found = decide(&estimate(value, expanded), both(low, low + width), decision);
            prop_assert_eq!(found.outcome == Outcome::NotJudged, !found.reason.is_empty());
            prop_assert!((0.0..=1.0).contains(&found.probability.unwrap()));
        }

        #[test]
        fn a_larger_uncertainty_never_turns_a_doubt_into_a_pass(
            value in -5.0..15.0f64, expanded in 0.0..6.0f64, more in 0.0..3.0f64, limit in 0.0..10.0f64,
        ) {
            let less = four(value, expanded, upper(limit));
            let doubted = four(value, expanded + more, upper(limit));
            prop_assert!(doubted != Outcome::Pass || less == Outcome::Pass);
        }
    }
}
