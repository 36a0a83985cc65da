//! The steps of a sequence.

use crate::quantity::{Hertz, Kelvins, Seconds, Volts};
use crate::spec::fields::{Field, Fields, all_different, located, shown, some};
use crate::spec::scalars::{
    Allowed, choice, duration, interval, located_name, name, number, quantity, temperature, text,
    yes_no,
};
use crate::spec::sequence::{
    Abnormal, AnswerKind, Each, FindingClass, Question, QuestionFinding, Step, StepAction,
    SupplyPoint, Timed, Waiting,
};
use crate::spec::yaml::NodeKind;
use crate::spec::{Located, nearest};

use super::sequence::{EachAllowed, axis, limits, names};
use super::soak::soak;

/// House default: a body this near to ambient counts as cool.
const COOL_WITHIN: f64 = 3.0;

/// Verbs that need nothing further.
const BARE: &[&str] = &["energise", "de-energise"];

/// Verbs with a value.
const VERBS: &[&str] = &[
    "instruct",
    "ask",
    "acclimatise",
    "supply",
    "position",
    "condition",
    "inrush",
    "soak",
    "measure",
    "rest",
    "run in",
    "abnormal",
    "each",
];

/// One step: a bare verb, or `verb: ...`.
pub(super) fn step<'a>(each: EachAllowed) -> impl Fn(Field<'a>) -> Option<Step> {
    move |field| {
        if let NodeKind::Scalar(word) = &field.node.kind {
            return bare(field, word);
        }
        if field.node.kind == NodeKind::Nothing {
            return field.wrong("a step without a verb", "take its dash out");
        }
        let NodeKind::Map(entries) = &field.node.kind else {
            return field.wrong(
                "a step must be a verb, or `verb: ...`",
                format!("verbs: {}, {}", BARE.join(", "), VERBS.join(", ")),
            );
        };
        let [entry] = entries.as_slice() else {
            return field.notes.error(
                entries.get(1).map_or(field.place(), |e| &e.key.place),
                "a step has one verb",
                "begin each step with its own dash, and indent what belongs to it",
            );
        };
        let value = Field {
            node: &entry.value,
            name: &entry.key.value,
            key: &entry.key.place,
            notes: field.notes,
        };
        Some(Step {
            verb: entry.key.clone(),
            action: action(value, each)?,
        })
    }
}

fn bare(field: Field<'_>, word: &str) -> Option<Step> {
    let action = match word {
        "energise" => StepAction::Energise,
        "de-energise" => StepAction::Deenergise,
        _ if VERBS.contains(&word) => {
            return field.wrong(
                format!("`{word}` needs a value"),
                format!("write `{word}: ...`"),
            );
        }
        _ => return unknown_verb(field, word),
    };
    Some(Step {
        verb: Located {
            value: word.to_owned(),
            place: field.place().clone(),
        },
        action,
    })
}

fn unknown_verb<T>(field: Field<'_>, word: &str) -> Option<T> {
    let known = || BARE.iter().chain(VERBS).copied();
    let place = match field.node.kind {
        NodeKind::Scalar(_) if field.name != word => field.place(),
        _ => field.key,
    };
    field.notes.error(
        place,
        format!("unknown step `{}`", shown(word)),
        match nearest(word, known()) {
            Some(meant) => format!("did you mean `{meant}`?"),
            None => format!("known here: {}", known().collect::<Vec<_>>().join(", ")),
        },
    )
}

fn action(field: Field<'_>, each: EachAllowed) -> Option<StepAction> {
    Some(match field.name {
        "instruct" => StepAction::Instruct(text(field)?),
        "ask" => StepAction::Ask(question(field)?),
        "acclimatise" => StepAction::Acclimatise(waiting(field)?),
        "supply" => StepAction::Supply(located(supply_point)(field)?),
        "position" => StepAction::Position(located_name(field)?),
        "condition" => StepAction::Condition(located_name(field)?),
        "inrush" => StepAction::Inrush(inrush(field)?),
        "soak" => StepAction::Soak(soak(field)?),
        "measure" => StepAction::Measure(timed(field)?),
        "rest" => StepAction::Rest(waiting(field)?),
        "run in" => StepAction::RunIn(timed(field)?),
        "abnormal" => StepAction::Abnormal(abnormal(field)?),
        "each" => return each_block(field, each).map(StepAction::Each),
        word if BARE.contains(&word) => {
            return field.notes.error(
                field.key,
                format!("`{word}` takes no value"),
                format!("write `{word}` without the colon"),
            );
        }
        word => return unknown_verb(field, word),
    })
}

fn question(field: Field<'_>) -> Option<Question> {
    let fields = field.fields()?;
    let text = fields.required("text", text);
    let answer = fields.required("answer", answer);
    let finding = fields.optional("finding", finding);
    fields.finish()?;
    if let (Some(answer), Some(Some((Some(when), _)))) = (&answer, &finding) {
        possible(field, answer, when)?;
    }
    let finding = match finding? {
        Some((when, class)) => Some(QuestionFinding {
            when: when?.value,
            class: class?,
        }),
        None => None,
    };
    Some(Question {
        text: text?,
        answer: answer?,
        finding,
    })
}

fn answer(field: Field<'_>) -> Option<AnswerKind> {
    if let NodeKind::Scalar(words) = &field.node.kind {
        return match words.as_str() {
            "yes or no" => Some(AnswerKind::YesNo),
            _ => field.wrong(
                format!("`{}` is no kind of answer", shown(words)),
                "write `yes or no`, `{choice: [a, b]}` or `{number in: mm, at most: 5}`",
            ),
        };
    }
    let fields = field.fields()?;
    let choices = fields.optional("choice", names);
    let unit = fields.optional("number in", name);
    if let Some(Some(unit)) = unit {
        return number_answer(field, fields, unit, choices);
    }
    fields.finish()?;
    unit?;
    match choices? {
        Some(choices) if choices.len() >= 2 => Some(AnswerKind::Choice(
            choices.into_iter().map(|c| c.value).collect(),
        )),
        Some(_) => field.wrong("a choice of one is none", "name at least two answers"),
        None => field.wrong(
            "no kind of answer",
            "write `yes or no`, `{choice: [a, b]}` or `{number in: mm, at most: 5}`",
        ),
    }
}

fn number_answer(
    field: Field<'_>,
    fields: Fields<'_>,
    unit: String,
    choices: Option<Option<Vec<Located<String>>>>,
) -> Option<AnswerKind> {
    let low = fields.optional("at least", number(Allowed::Any));
    let high = fields.optional("at most", number(Allowed::Any));
    let ordered = match (low, high) {
        (Some(None), Some(None)) => Some(()),
        _ => limits(&fields, field, (low, high)),
    };
    let single = match &choices {
        Some(Some(_)) => fields.wrong(
            "choice",
            "an answer is a number or a choice, not both",
            "take one of the two out",
        ),
        _ => Some(()),
    };
    fields.finish()?;
    choices.and(ordered).and(single)?;
    Some(AnswerKind::Number {
        unit,
        at_least: low?,
        at_most: high?,
    })
}

const CLASSES: &[(&str, FindingClass)] = &[
    ("minor", FindingClass::Minor),
    ("major", FindingClass::Major),
    ("critical", FindingClass::Critical),
];

/// The answer that is a finding, and its class; each for itself, so that the first
/// can be looked at when the second is wrong.
type FindingWritten = (Option<Located<String>>, Option<FindingClass>);

fn finding(field: Field<'_>) -> Option<FindingWritten> {
    let fields = field.fields()?;
    let when = fields.required("if", located_name);
    let class = fields.required("class", choice(CLASSES));
    fields.finish()?;
    Some((when, class))
}

/// Whether the answer that is a finding can be given at all.
fn possible(field: Field<'_>, answer: &AnswerKind, when: &Located<String>) -> Option<()> {
    let answers: Vec<&str> = match answer {
        AnswerKind::YesNo => vec!["yes", "no"],
        AnswerKind::Number {
            at_least, at_most, ..
        } => {
            if at_least.is_none() && at_most.is_none() {
                return field.notes.error(
                    &when.place,
                    "a number without limits can't be a finding",
                    "add `at least` or `at most` to the answer",
                );
            }
            vec!["outside"]
        }
        AnswerKind::Choice(choices) => choices.iter().map(String::as_str).collect(),
    };
    if answers.contains(&when.as_str()) {
        return Some(());
    }
    field.notes.error(
        &when.place,
        format!("`{}` is not one of the answers", shown(when)),
        format!("one of: {}", answers.join(", ")),
    )
}

fn waiting(field: Field<'_>) -> Option<Waiting> {
    let fields = field.fields()?;
    let within = fields.or(
        "within",
        Kelvins::of(COOL_WITHIN),
        quantity(Allowed::Positive),
    );
    let at_most = fields.required("at most", duration);
    let every = fields.required("every", interval);
    let fits = fitting(&fields, ("at most", at_most), every);
    fields.finish()?;
    fits?;
    Some(Waiting {
        within: within?,
        at_most: at_most?,
        every: every?,
    })
}

fn timed(field: Field<'_>) -> Option<Timed> {
    let fields = field.fields()?;
    let timed = stretch(&fields);
    fields.finish()?;
    timed
}

/// An inrush may ask for a waveform.
fn inrush(field: Field<'_>) -> Option<Timed> {
    let fields = field.fields()?;
    let timed = stretch(&fields);
    let waveform = fields.or("waveform", false, yes_no);
    fields.finish()?;
    Some(Timed {
        waveform: waveform?,
        ..timed?
    })
}

fn stretch(fields: &Fields<'_>) -> Option<Timed> {
    let length = fields.required("for", duration);
    let every = fields.required("every", interval);
    fitting(fields, ("for", length), every)?;
    Some(Timed {
        length: length?,
        every: every?,
        waveform: false,
    })
}

/// A polling interval longer than its step reads nothing.
pub(super) fn fitting(
    fields: &Fields<'_>,
    (key, length): (&str, Option<Seconds>),
    every: Option<Seconds>,
) -> Option<()> {
    match (length, every) {
        (Some(length), Some(every)) if every > length => fields.wrong(
            "every",
            format!("`every` is {every}, longer than `{key}`, {length}"),
            "poll several times within the step",
        ),
        _ => Some(()),
    }
}

fn abnormal(field: Field<'_>) -> Option<Abnormal> {
    let fields = field.fields()?;
    let fault = fields.required("fault", text);
    let length = fields.required("for", duration);
    let every = fields.required("every", interval);
    let body = fields.required("body", temperature);
    let fits = fitting(&fields, ("for", length), every);
    fields.finish()?;
    fits?;
    Some(Abnormal {
        fault: fault?,
        length: length?,
        every: every?,
        body: body?,
    })
}

fn supply_point(field: Field<'_>) -> Option<SupplyPoint> {
    let fields = field.fields()?;
    let voltage = fields.required("voltage", quantity::<Volts>(Allowed::Positive));
    let frequency = fields.required("frequency", quantity::<Hertz>(Allowed::Positive));
    fields.finish()?;
    Some(SupplyPoint {
        voltage: voltage?,
        frequency: frequency?,
    })
}

fn each_block(field: Field<'_>, allowed: EachAllowed) -> Option<Each> {
    if allowed == EachAllowed::No {
        return field.notes.error(
            field.key,
            "an `each` within an `each`",
            "name all conditions, positions and supplies in one block",
        );
    }
    let fields = field.fields()?;
    let conditions = axis(&fields, "conditions");
    let positions = fields.required("positions", names);
    let supplies = fields.required("supplies", some(located(supply_point)));
    let steps = fields.required("steps", some(step(EachAllowed::No)));
    let different = conditions
        .as_ref()
        .and_then(|names| all_different(names, field.notes));
    fields.finish()?;
    different?;
    Some(Each {
        conditions: conditions?,
        positions: positions?,
        supplies: supplies?,
        steps: steps?,
    })
}

#[cfg(test)]
mod tests {
    use crate::spec::wrong_files::{Kind, wrong};

    #[test]
    fn each_wrong_step_is_one_problem() {
        Kind::Sequence.check(&[
            wrong(
                "- energise",
                "- energize",
                "56:11",
                "unknown step `energize`",
                "mean `energise`",
            ),
            wrong(
                "- energise",
                "- energise: now",
                "56:11",
                "takes no value",
                "without the colon",
            ),
            wrong(
                "- energise",
                "- soak",
                "56:11",
                "needs a value",
                "`soak: ...`",
            ),
            wrong(
                "- energise",
                "- wait",
                "56:11",
                "unknown step `wait`",
                "known here",
            ),
            wrong("- energise", "- [energise]", "56:11", "a verb, or", "verbs"),
            wrong(
                "- energise",
                "- sok: {at most: 5 min}",
                "56:11",
                "unknown step `sok`",
                "mean `soak`",
            ),
            wrong(
                "- energise",
                "- {supply: 1, position: low}",
                "56:23",
                "one verb",
                "own dash",
            ),
            wrong(
                "- energise",
                "- each: {}",
                "56:11",
                "within an `each`",
                "one block",
            ),
            wrong(
                "- energise",
                "- supply: {voltage: 230 V}",
                "56:11",
                "lacks `frequency`",
                "add",
            ),
            wrong(
                "every: 2 s",
                "every: 0 s",
                "61:20",
                "at least 1 ms",
                "`2 s`",
            ),
            wrong("every: 2 s", "every: 2", "61:20", "has no unit", "`2 min`"),
            wrong(
                "every: 2 s",
                "every: 2 h",
                "61:20",
                "longer than `at most`",
                "several times",
            ),
            wrong(
                "least: 10 min",
                "least: -10 min",
                "59:23",
                "is negative",
                "check",
            ),
            wrong(
                "least: 10 min",
                "least: 0 min",
                "59:23",
                "longer than nothing",
                "20 min",
            ),
            wrong(
                "most: 45 min",
                "most: 5 min",
                "60:22",
                "less than `at least`",
                "10 min",
            ),
            wrong(
                "most: 45 min",
                "most: 45000 h",
                "60:22",
                "31 days",
                "20 min",
            ),
            wrong(
                "criterion: slope",
                "criterion: slop",
                "62:32",
                "can't be `slop`",
                "mean `slope`",
            ),
            wrong("window: 5 min, ", "", "62:13", "lacks `window`", "add"),
            wrong(
                "criterion: slope",
                "criterion: three readings",
                "62:48",
                "unknown key `window`",
                "known",
            ),
            wrong(
                "power change: 2 %, temperature change: 3 K",
                "",
                "62:13",
                "watches nothing",
                "add",
            ),
            wrong(
                "power change: 2 %",
                "power change: 2 K",
                "62:68",
                "not a ratio",
                "10 %",
            ),
            wrong(
                "every: 2 s",
                "early finish: perhaps\n            every: 2 s",
                "61:27",
                "neither yes nor no",
                "`yes`",
            ),
            wrong(
                "criterion: slope, window: 5 min, power change: 2 %, temperature change: 3 K",
                "criterion: sampling method, power change: 2 %",
                "62:63",
                "brings its own limit",
                "10 mW/h",
            ),
            wrong(
                "power change: 2 %",
                "power change: 0 mW",
                "62:68",
                "above zero",
                "check",
            ),
            wrong(
                "{if: no, class: major}",
                "{if: maybe, class: major}",
                "44:21",
                "not one of the answers",
                "yes, no",
            ),
            wrong(
                "{if: no, class: major}",
                "{if: no, class: mayor}",
                "44:32",
                "can't be `mayor`",
                "mean `major`",
            ),
            wrong(
                "answer: yes or no",
                "answer: yes",
                "43:15",
                "no kind of answer",
                "yes or no",
            ),
            wrong(
                "answer: yes or no",
                "answer: {choice: [no]}",
                "43:15",
                "choice of one",
                "two",
            ),
            wrong(
                "answer: yes or no",
                "answer: {number in: mm}",
                "44:21",
                "without limits",
                "add",
            ),
            wrong(
                "within: 3 K",
                "within: 3 °C",
                "64:26",
                "not a temperature difference",
                "10 K",
            ),
            wrong(
                "conditions: [refill full, dry]",
                "conditions: [dry, dry]",
                "51:25",
                "stands twice",
                "one of",
            ),
            wrong(
                "positions: [low, high]\n      s",
                "positions: []\n      s",
                "52:18",
                "is empty",
                "at least one",
            ),
        ]);
    }
}
