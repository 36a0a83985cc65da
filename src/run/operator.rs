//! The person at the bench: what they are asked, and who may be asked to touch a unit.

use std::future::Future;
use std::pin::Pin;

use crate::bench::OffConfirmed;
use crate::spec::sequence::{AnswerKind, FindingClass, Question};

/// What the operator sees: always with bay and unit.
#[derive(Debug, Clone, PartialEq)]
pub struct Prompt {
    /// Bay.
    pub bay: String,
    /// The unit's number.
    pub unit: String,
    /// The text.
    pub text: String,
    /// What is wanted.
    pub want: Want,
}

/// What is wanted of the operator.
#[derive(Debug, Clone, PartialEq)]
pub enum Want {
    /// To have read the cautions.
    Acknowledge,
    /// To have done something to the unit.
    Done,
    /// To have brought a condition about.
    Condition {
        /// Its name.
        name: String,
    },
    /// To have set the unit's switch.
    Position {
        /// Its name.
        name: String,
    },
    /// An answer.
    Answer(Question),
}

impl Prompt {
    /// A prompt to touch the unit: only with proof that the output is off.
    pub(super) fn touching(
        _off: &OffConfirmed,
        bay: &str,
        unit: &str,
        text: String,
        want: Want,
    ) -> Self {
        Self {
            bay: bay.to_owned(),
            unit: unit.to_owned(),
            text,
            want,
        }
    }

    /// A prompt that asks for reading, looking or answering only.
    pub(super) fn looking(bay: &str, unit: &str, text: String, want: Want) -> Self {
        Self {
            bay: bay.to_owned(),
            unit: unit.to_owned(),
            text,
            want,
        }
    }
}

/// What comes back from a prompt.
#[derive(Debug, Clone, PartialEq, Eq)]
pub enum Reply {
    /// The answer, in words; empty for an acknowledgement.
    Given(String),
    /// End of input, or a wish to stop: never a yes.
    Stop,
}

/// A future that an operator's answer arrives by.
pub type Answering<'a> = Pin<Box<dyn Future<Output = Reply> + Send + 'a>>;

/// Answers prompts: a person at a terminal, or a virtual one.
pub trait Operator: Send {
    /// Who it is, for the record.
    fn name(&self) -> String;

    /// Asks; the future may be dropped before it is ready.
    fn ask<'a>(&'a mut self, prompt: &'a Prompt) -> Answering<'a>;
}

/// The answer in the words of the record, and the finding that it is; `None` where
/// it is not an answer to this question.
pub fn understand(question: &Question, answer: &str) -> Option<(String, Option<FindingClass>)> {
    let answer = answer.trim();
    let said = match &question.answer {
        AnswerKind::YesNo => yes_or_no(answer)?.to_owned(),
        AnswerKind::Choice(choices) => choice_of(choices, answer)?.to_owned(),
        AnswerKind::Number { unit, .. } => format!("{} {unit}", number_in(answer, unit)?)
            .trim_end()
            .to_owned(),
    };
    let found = question
        .finding
        .as_ref()
        .filter(|finding| match &question.answer {
            AnswerKind::Number {
                unit,
                at_least,
                at_most,
            } => {
                let value = number_in(answer, unit).unwrap_or(f64::NAN);
                let above = at_least.is_none_or(|limit| value >= limit);
                let below = at_most.is_none_or(|limit| value <= limit);
                !(above && below)
            }
            _ => said.eq_ignore_ascii_case(&finding.when),
        });
    Some((said, found.map(|finding| finding.class)))
}

fn yes_or_no(answer: &str) -> Option<&'static str> {
    match answer.to_ascii_lowercase().as_str() {
        "y" | "yes" => Some("yes"),
        "n" | "no" => Some("no"),
        _ => None,
    }
}

/// By its text, or by its number from 1.
fn choice_of<'a>(choices: &'a [String], answer: &str) -> Option<&'a str> {
    let by_text = choices
        .iter()
        .find(|choice| choice.eq_ignore_ascii_case(answer));
    let by_number = || choices.get(answer.parse::<usize>().ok()?.checked_sub(1)?);
    by_text.or_else(by_number).map(String::as_str)
}

fn number_in(answer: &str, unit: &str) -> Option<f64> {
    let text = answer.strip_suffix(unit).unwrap_or(answer).trim();
    text.parse::<f64>().ok().filter(|value| value.is_finite())
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::spec::sequence::QuestionFinding;

    fn question(answer: AnswerKind, when: &str) -> Question {
        let finding = Some(QuestionFinding {
            when: when.to_owned(),
            class: FindingClass::Major,
        });
        Question {
            text: "?".to_owned(),
            answer,
            finding,
        }
    }

    #[test]
    fn a_no_that_is_a_finding_is_found() {
        let q = question(AnswerKind::YesNo, "no");
        assert_eq!(
            understand(&q, "N"),
            Some(("no".to_owned(), Some(FindingClass::Major)))
        );
        assert_eq!(understand(&q, "yes"), Some(("yes".to_owned(), None)));
        assert_eq!(understand(&q, "maybe"), None);
        assert_eq!(understand(&q, ""), None);
    }

    #[test]
    fn a_number_outside_its_limits_is_a_finding() {
        let kind = AnswerKind::Number {
            unit: "mm".to_owned(),
            at_least: Some(1.0),
            at_most: Some(2.0),
        };
        let q = question(kind, "outside");
        assert_eq!(understand(&q, "1.0 mm"), Some(("1 mm".to_owned(), None)));
        assert_eq!(
            understand(&q, "2.1"),
            Some(("2.1 mm".to_owned(), Some(FindingClass::Major)))
        );
        assert_eq!(understand(&q, "NaN"), None);
    }

    #[test]
    fn a_choice_is_taken_by_text_or_number() {
        let kind = AnswerKind::Choice(vec!["none".to_owned(), "rattle".to_owned()]);
        let q = question(kind, "rattle");
        assert_eq!(understand(&q, "2").unwrap().1, Some(FindingClass::Major));
        assert_eq!(understand(&q, "None").unwrap(), ("none".to_owned(), None));
        assert_eq!(understand(&q, "0"), None);
    }
}
