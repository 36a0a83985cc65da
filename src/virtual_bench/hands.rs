//! The virtual operator's hands: they turn the switch, bring conditions about and
//! answer questions as for a good unit.

use std::sync::{Arc, Mutex, PoisonError};

use super::bay::Bay;
use crate::quantity::{Moment, shortest};
use crate::spec::sequence::{AnswerKind, Question};

/// Someone at the bay.
#[derive(Debug, Clone)]
pub struct Hands {
    bay: Arc<Mutex<Bay>>,
}

impl Hands {
    pub(super) fn at(bay: Arc<Mutex<Bay>>) -> Self {
        Self { bay }
    }

    /// Turns the unit's switch; `off` is off. Returns whether the switch has that
    /// position; where it has not, it stays where it is.
    pub fn turn(&self, position: &str, now: Moment) -> bool {
        let mut bay = self.bay.lock().unwrap_or_else(PoisonError::into_inner);
        bay.advance(now.as_micros());
        let number = match bay.positions.iter().position(|p| p == position) {
            Some(index) => index + 1,
            None if position == "off" => 0,
            None => return false,
        };
        bay.wiring.position = number;
        bay.redrive();
        true
    }

    /// Brings a condition about. Returns whether the unit knows it; one that it
    /// does not know changes nothing of its cooling.
    pub fn set_condition(&self, condition: &str, now: Moment) -> bool {
        let mut bay = self.bay.lock().unwrap_or_else(PoisonError::into_inner);
        bay.advance(now.as_micros());
        let known = bay.conditions.iter().find(|(name, _)| name == condition);
        let factor = known.map(|(_, factor)| *factor);
        bay.loss_factor = factor.unwrap_or(1.0);
        bay.redrive();
        factor.is_some()
    }

    /// The answer for a good unit: not the one that is a finding; of a number the
    /// middle of its limits.
    pub fn answer(question: &Question) -> String {
        let finding = question.finding.as_ref().map(|f| f.when.as_str());
        match &question.answer {
            AnswerKind::YesNo => if finding == Some("yes") { "no" } else { "yes" }.to_owned(),
            AnswerKind::Choice(choices) => choices
                .iter()
                .find(|choice| finding != Some(choice.as_str()))
                .cloned()
                .unwrap_or_default(),
            AnswerKind::Number {
                at_least, at_most, ..
            } => shortest(middle(*at_least, *at_most)),
        }
    }
}

/// A value well within limits of which one or both may be missing.
fn middle(at_least: Option<f64>, at_most: Option<f64>) -> f64 {
    match (at_least, at_most) {
        (Some(low), Some(high)) => f64::midpoint(low, high),
        (Some(low), None) => low + low.abs().max(1.0),
        (None, Some(high)) => high - 0.5 * high.abs(),
        (None, None) => 1.0,
    }
}

#[cfg(test)]
mod tests {
    use super::super::VirtualBench;
    use super::super::tests::dryer;
    use super::*;
    use crate::quantity::Seconds;
    use crate::spec::sequence::{FindingClass, QuestionFinding};

    fn hands() -> (VirtualBench, Hands) {
        let bench = VirtualBench::new(dryer(&[])).unwrap();
        let hands = bench.hands();
        (bench, hands)
    }

    fn answered(answer: AnswerKind, when: Option<&str>) -> String {
        Hands::answer(&Question {
            text: String::new(),
            answer,
            finding: when.map(|when| QuestionFinding {
                when: when.to_owned(),
                class: FindingClass::Major,
            }),
        })
    }

    #[test]
    fn answers_are_those_of_a_good_unit() {
        assert_eq!(answered(AnswerKind::YesNo, Some("no")), "yes");
        assert_eq!(answered(AnswerKind::YesNo, Some("yes")), "no");
        assert_eq!(answered(AnswerKind::YesNo, None), "yes");
        let choice = AnswerKind::Choice(vec!["broken".to_owned(), "whole".to_owned()]);
        assert_eq!(answered(choice, Some("broken")), "whole");
        assert_eq!(answered(AnswerKind::Choice(Vec::new()), None), "");
        let number = |at_least, at_most| AnswerKind::Number {
            unit: "Mohm".to_owned(),
            at_least,
            at_most,
        };
        for (low, high, middle) in [
            (Some(1.0), Some(4.0), "2.5"),
            (Some(2.0), None, "4"),
            (None, Some(0.3), "0.15"),
            (None, Some(3.5), "1.75"),
            (None, None, "1"),
        ] {
            assert_eq!(answered(number(low, high), Some("outside")), middle);
        }
    }

    #[test]
    fn hands_turn_the_switch_and_set_conditions() {
        let (bench, hands) = hands();
        let mut supply = bench.far_side("supply line");
        supply.receive(b"SOUR:VOLT 230\nOUTP ON\n", Moment::START);
        let later = |s: f64| Moment::START + Seconds::of(s);
        assert_eq!(bench.truth(later(1.0)).power.get(), 0.0);
        assert!(hands.turn("high", later(1.0)));
        let full = bench.truth(later(1500.0));
        assert!(full.power.get() > 8.0);
        assert!(hands.set_condition("dry", later(1500.0)));
        assert!(bench.truth(later(3000.0)).power.get() < 0.96 * full.power.get());
        assert!(!hands.set_condition("upside down", later(3000.0)));
        assert!(!hands.turn("turbo", later(3000.0)) && hands.turn("off", later(3000.0)));
        assert_eq!(bench.truth(later(3001.0)).power.get(), 0.0);
    }
}
