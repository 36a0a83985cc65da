//! The step `soak` and its criterion.

use crate::quantity::{Dimension, Kelvins, Ratio, Seconds, Watts, parse_written};
use crate::spec::fields::{Field, Fields};
use crate::spec::scalars::{Allowed, choice, duration, interval, quantity, yes_no};
use crate::spec::sequence::{Criterion, CriterionKind, PowerChange, Soak};

use super::steps::fitting;

/// House default: shortest soak.
const SOAK_AT_LEAST: f64 = 600.0;

/// The sampling method's longest interval and shortest log, seconds (IEC 62301 ed. 2,
/// from memory).
const SAMPLED_EVERY: f64 = 1.0;
const SAMPLED_FOR: f64 = 900.0;

/// A soak: staying energised until settled.
pub(super) fn soak(field: Field<'_>) -> Option<Soak> {
    let fields = field.fields()?;
    let at_least = fields.or("at least", Seconds::of(SOAK_AT_LEAST), duration);
    let at_most = fields.required("at most", duration);
    let every = fields.required("every", interval);
    let until = fields.required("until", criterion);
    let early_finish = fields.or("early finish", false, yes_no);
    let ordered = match (at_least, at_most) {
        (Some(least), Some(most)) if most < least => fields.wrong(
            "at most",
            format!("`at most` is {most}, less than `at least`, {least}"),
            "`at least` is 10 min where it is left out",
        ),
        _ => Some(()),
    };
    let fits = fitting(&fields, ("at most", at_most), every);
    let sampled = match &until {
        Some(until) if until.kind == CriterionKind::SamplingMethod => {
            sampled(&fields, at_least, every)
        }
        _ => Some(()),
    };
    fields.finish()?;
    ordered.and(fits).and(sampled)?;
    Some(Soak {
        at_least: at_least?,
        at_most: at_most?,
        every: every?,
        until: until?,
        early_finish: early_finish?,
    })
}

/// The sampling method asks for a log of at least 15 min at 1 s or faster.
fn sampled(fields: &Fields<'_>, at_least: Option<Seconds>, every: Option<Seconds>) -> Option<()> {
    let fast = match every {
        Some(every) if every.get() > SAMPLED_EVERY => fields.wrong(
            "every",
            format!("the sampling method needs a reading each second, not every {every}"),
            "write `every: 1 s` or faster (IEC 62301 ed. 2, from memory)",
        ),
        _ => Some(()),
    };
    let long = match at_least {
        Some(least) if least.get() < SAMPLED_FOR => fields.wrong(
            if fields.find("at least").is_some() { "at least" } else { "at most" },
            format!("the sampling method logs for at least 15 min, and `at least` is {least}"),
            "write `at least: 15 min` or more (IEC 62301 ed. 2, from memory); left out it is 10 min",
        ),
        _ => Some(()),
    };
    fast.and(long)
}

#[derive(Clone, Copy)]
enum CriterionWord {
    Slope,
    ThreeReadings,
    ChangeWithin,
    SamplingMethod,
}

const CRITERIA: &[(&str, CriterionWord)] = &[
    ("slope", CriterionWord::Slope),
    ("three readings", CriterionWord::ThreeReadings),
    ("change within", CriterionWord::ChangeWithin),
    ("sampling method", CriterionWord::SamplingMethod),
];

fn criterion(field: Field<'_>) -> Option<Criterion> {
    let fields = field.fields()?;
    let word = fields.required("criterion", choice(CRITERIA));
    let power_change = fields.optional("power change", power_change);
    let temperature_change =
        fields.optional("temperature change", quantity::<Kelvins>(Allowed::Positive));
    let kind = match word {
        Some(CriterionWord::Slope) => fields
            .required("window", duration)
            .map(|window| CriterionKind::Slope { window }),
        Some(CriterionWord::ChangeWithin) => fields
            .required("interval", duration)
            .map(|interval| CriterionKind::ChangeWithin { interval }),
        Some(CriterionWord::ThreeReadings) => Some(CriterionKind::ThreeReadings),
        Some(CriterionWord::SamplingMethod) => Some(CriterionKind::SamplingMethod),
        None => {
            // Either may belong to the word that was meant.
            fields.optional("window", duration);
            fields.optional("interval", duration);
            None
        }
    };
    let own_limit = match (word, power_change) {
        (Some(CriterionWord::SamplingMethod), Some(Some(_))) => fields.wrong(
            "power change",
            "the sampling method brings its own limit of the power",
            "take it out: 10 mW/h up to 1 W, above that 1 % of the power per hour",
        ),
        _ => Some(()),
    };
    let watched = match (power_change, temperature_change) {
        _ if matches!(word, Some(CriterionWord::SamplingMethod)) => Some(()),
        (Some(None), Some(None)) => field.notes.error(
            field.key,
            "the criterion watches nothing",
            "add `power change: 2 %`, `temperature change: 3 K`, or both",
        ),
        _ => Some(()),
    };
    fields.finish()?;
    watched.and(own_limit)?;
    Some(Criterion {
        kind: kind?,
        power_change: power_change?,
        temperature_change: temperature_change?,
    })
}

/// `2 %` of the mean, or `50 mW`.
fn power_change(field: Field<'_>) -> Option<PowerChange> {
    let text = field.scalar("2 %")?;
    match parse_written(text) {
        Ok(written) if written.dimension == Dimension::Power => {
            quantity::<Watts>(Allowed::Positive)(field).map(PowerChange::Absolute)
        }
        _ => quantity::<Ratio>(Allowed::Positive)(field).map(PowerChange::Relative),
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::spec::load_sequence;
    use crate::spec::sequence::StepAction;
    use crate::spec::wrong_files::Kind;

    fn soak_of(changes: &[(&str, &str)]) -> (Option<Soak>, Vec<String>) {
        let text = Kind::Sequence.changed(changes);
        let loaded = load_sequence("file", text.as_bytes());
        let messages = loaded.problems.iter().map(|p| p.message.clone()).collect();
        let soak = loaded.value.and_then(|sequence| {
            sequence
                .steps
                .into_iter()
                .find_map(|step| match step.action {
                    StepAction::Each(each) => each.steps.into_iter().find_map(|s| match s.action {
                        StepAction::Soak(soak) => Some(soak),
                        _ => None,
                    }),
                    _ => None,
                })
        });
        (soak, messages)
    }

    #[test]
    fn a_power_change_is_a_share_or_watts_and_an_early_finish_is_asked_for() {
        let soak = soak_of(&[]).0.expect("a soak");
        assert!(!soak.early_finish);
        let share = PowerChange::Relative(Ratio::of(0.02));
        assert_eq!(soak.until.power_change, Some(share));
        let changes = [
            ("power change: 2 %", "power change: 50 mW"),
            (
                "at most: 45 min",
                "early finish: yes\n            at most: 45 min",
            ),
        ];
        let soak = soak_of(&changes).0.expect("a soak");
        assert!(soak.early_finish);
        let watts = PowerChange::Absolute(Watts::of(0.05));
        assert_eq!(soak.until.power_change, Some(watts));
        // A plan stores it as it is written, and old plans hold shares.
        for change in [share, watts] {
            let text = serde_json::to_string(&change).unwrap();
            assert_eq!(serde_json::from_str::<PowerChange>(&text).unwrap(), change);
        }
        assert_eq!(
            serde_json::from_str::<PowerChange>("\"2 %\"").unwrap(),
            share
        );
    }

    #[test]
    fn the_sampling_method_asks_for_a_second_and_a_quarter_of_an_hour() {
        let slope = "criterion: slope, window: 5 min, power change: 2 %, temperature change: 3 K";
        let sampling = (slope, "criterion: sampling method");
        let (soak, problems) = soak_of(&[sampling]);
        assert!(soak.is_none());
        assert_eq!(problems.len(), 2, "{problems:?}");
        assert!(problems[0].contains("at least 15 min") || problems[1].contains("at least 15 min"));
        assert!(problems[0].contains("each second") || problems[1].contains("each second"));
        let changes = [
            sampling,
            ("at least: 10 min", "at least: 15 min"),
            ("every: 2 s", "every: 1 s"),
        ];
        let (soak, problems) = soak_of(&changes);
        assert_eq!(problems, Vec::<String>::new());
        let until = soak.expect("a soak").until;
        assert_eq!(until.kind, CriterionKind::SamplingMethod);
        assert_eq!(until.power_change, None);
    }
}
