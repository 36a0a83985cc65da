//! Words for the values of a plan.

use std::fmt::Display;

use crate::quantity::{Celsius, Seconds, Watts, shortest};
use crate::spec::sequence::{
    AnswerKind, ApplianceKind, Criterion, CriterionKind, FindingClass, MeasuredAt, Question, Span,
};

/// The word in YAML.
pub(super) fn kind(kind: ApplianceKind) -> &'static str {
    match kind {
        ApplianceKind::Heating => "heating",
        ApplianceKind::Combined => "combined",
        ApplianceKind::MotorOperated => "motor-operated",
    }
}

/// A temperature that may not be stated.
pub(super) fn degrees(temperature: Option<Celsius>) -> String {
    temperature.map_or_else(|| "not stated".to_owned(), |t| t.to_string())
}

/// Where the link's temperature is measured, with its allowance.
pub(super) fn measured(at: &MeasuredAt) -> String {
    match at {
        MeasuredAt::LinkBody => "measured at the link's body".to_owned(),
        MeasuredAt::Elsewhere {
            place,
            allowance,
            source,
            self_heating,
        } => {
            let heating = self_heating.map_or_else(
                || "no self-heating stated".to_owned(),
                |heating| format!("self-heating {} at {}", heating.rise, heating.at),
            );
            let allowance = allowance.map_or_else(
                || "no allowance stated".to_owned(),
                |allowance| format!("allowance {allowance}"),
            );
            let source = source
                .as_ref()
                .map_or_else(String::new, |source| format!(" ({source})"));
            format!("measured at {place}, {allowance}{source}, {heating}")
        }
        MeasuredAt::OutsideOnly { place, limit } => {
            format!("not measured: only {place} is, against a house limit of {limit}")
        }
    }
}

/// What can be answered, and which answer is a finding.
pub(super) fn answers(question: &Question) -> String {
    let answers = match &question.answer {
        AnswerKind::YesNo => "yes or no".to_owned(),
        AnswerKind::Number {
            unit,
            at_least,
            at_most,
        } => {
            let low = at_least.map_or_else(String::new, |x| format!(", at least {}", shortest(x)));
            let high = at_most.map_or_else(String::new, |x| format!(", at most {}", shortest(x)));
            format!("a number in {unit}{low}{high}")
        }
        AnswerKind::Choice(choices) => choices.join(", "),
    };
    let finding = question
        .finding
        .as_ref()
        .map_or_else(String::new, |finding| {
            let class = match finding.class {
                FindingClass::Minor => "minor",
                FindingClass::Major => "major",
                FindingClass::Critical => "critical",
            };
            format!("; {} is {class}", finding.when)
        });
    format!("{answers}{finding}")
}

/// A criterion with its limits and its source.
pub(super) fn criterion(criterion: &Criterion) -> String {
    let (what, per) = match criterion.kind {
        CriterionKind::Slope { window } => (format!("slope over {window}"), " per hour"),
        CriterionKind::ThreeReadings => ("three readings at 10 % of the time".to_owned(), ""),
        CriterionKind::ChangeWithin { interval } => (format!("change within {interval}"), ""),
        CriterionKind::SamplingMethod => (
            "the sampling method, power 10 mW per hour up to 1 W, else 1 % per hour".to_owned(),
            " per hour",
        ),
    };
    let power = criterion
        .power_change
        .map(|change| format!(", power {change}{per}"));
    let body = criterion
        .temperature_change
        .map(|change| format!(", body {change}{per}"));
    let source = Some(format!(" ({})", criterion.source()));
    [Some(what), power, body, source]
        .into_iter()
        .flatten()
        .collect()
}

/// Limits of a power, to the hundredth of a watt.
pub(super) fn between(at_least: Option<Watts>, at_most: Option<Watts>) -> String {
    match (at_least, at_most) {
        (Some(low), Some(high)) => format!("{low:.2} to {high:.2}"),
        (None, Some(high)) => format!("at most {high:.2}, no lower limit"),
        (Some(low), None) => format!("at least {low:.2}, no upper limit"),
        (None, None) => "without limits".to_owned(),
    }
}

/// Two ends, or one where they coincide.
pub(super) fn span<T: Display + PartialEq>(span: Span<T>) -> String {
    if span.low == span.high {
        span.low.to_string()
    } else {
        format!("{} to {}", span.low, span.high)
    }
}

/// A long time for people, to the minute.
pub(super) fn time(time: Seconds) -> String {
    let minutes = (time.get() / 60.0).round() as u64;
    match minutes {
        0 => time.to_string(),
        1..120 => format!("{minutes} min"),
        _ => format!("{} h {:02} min", minutes / 60, minutes % 60),
    }
}
