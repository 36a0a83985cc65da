//! The rules of a sequence.

use crate::quantity::{Amps, Dimension, Kelvins, Watts};
use crate::spec::Located;
use crate::spec::fields::{Field, Fields};
use crate::spec::scalars::{
    Allowed, choice, duration, located_name, name, number, quantity, share, text, value_of,
};
use crate::spec::sequence::{CyclingRule, Decision, ProcessSpread, Rule, RuleKind, RuleWeight};
use crate::spec::yaml::NodeKind;

use super::sequence::limits;

/// What a rule can compare: the key that names it, and how its value is read.
type Kind = (&'static str, fn(Field<'_>) -> Option<RuleKind>);

const KINDS: &[Kind] = &[
    ("power", power),
    ("thermal link", thermal_link),
    ("inrush", inrush),
    ("order of positions", order),
    ("temperature", temperature_rise),
    ("harmonics", harmonics),
    ("voltage change", voltage_change),
];

const WEIGHTS: &[(&str, RuleWeight)] = &[
    ("required", RuleWeight::Required),
    ("information", RuleWeight::Information),
];

const CYCLING: &[(&str, CyclingRule)] = &[
    ("on-state", CyclingRule::OnState),
    ("representative period", CyclingRule::RepresentativePeriod),
];

/// One rule.
pub(super) fn rule(field: Field<'_>) -> Option<Rule> {
    let fields = field.fields()?;
    let kind = kind(&fields, field);
    let decision = fields.or(
        "decision",
        Written::Decided(Decision::FourOutcomes),
        decision,
    );
    let weight = fields.or("weight", usual_weight(kind.as_ref()), choice(WEIGHTS));
    let position = fields.optional("position", located_name);
    let condition = fields.optional("condition", located_name);
    let source = fields.optional("source", text);
    let unit = kind.as_ref().and_then(|kind| kind.value.dimension());
    let decision = decision.and_then(|decision| decided(&fields, decision, unit));
    let process = fields.optional("process", |field| process(field, unit));
    let cycling = fields.optional("cycling", choice(CYCLING));
    let of_power = match (&kind, cycling) {
        (Some(kind), Some(Some(_))) if !compares_power(&kind.value) => fields.wrong(
            "cycling",
            "only a rule of the power can choose between inputs of a cycling load",
            "take it out",
        ),
        _ => Some(()),
    };
    fields.finish()?;
    of_power?;
    Some(Rule {
        kind: kind?,
        decision: decision?,
        process: process?,
        weight: weight?,
        position: position?,
        condition: condition?,
        source: source?,
        cycling: cycling?.unwrap_or_default(),
    })
}

fn compares_power(kind: &RuleKind) -> bool {
    matches!(kind, RuleKind::PlatePower | RuleKind::PowerLimits { .. })
}

/// What rests on the waveform of one switch-on is an indication.
fn usual_weight(kind: Option<&Located<RuleKind>>) -> RuleWeight {
    match kind.map(|kind| &kind.value) {
        Some(RuleKind::HarmonicsClassA | RuleKind::VoltageChange { .. }) => RuleWeight::Information,
        _ => RuleWeight::Required,
    }
}

/// The one key that says what the rule compares.
fn kind(fields: &Fields<'_>, whole: Field<'_>) -> Option<Located<RuleKind>> {
    let found: Vec<(Field<'_>, Option<RuleKind>)> = KINDS
        .iter()
        .filter_map(|(key, decode)| fields.find(key).map(|field| (field, decode(field))))
        .collect();
    let known = || {
        let words: Vec<&str> = KINDS.iter().map(|(key, _)| *key).collect();
        format!("one of: {}", words.join(", "))
    };
    match found.as_slice() {
        [(field, kind)] => kind.clone().map(|value| Located {
            value,
            place: field.key.clone(),
        }),
        // A misspelt key is reported once, as the unknown one that it is.
        [] if KINDS.iter().any(|(key, _)| fields.misspelt(key).is_some()) => None,
        [] => whole
            .notes
            .error(whole.key, "a rule that compares nothing", known()),
        [_, (second, _), ..] => whole.notes.error(
            second.key,
            "a rule compares one thing",
            "begin each rule with its own dash",
        ),
    }
}

fn power(field: Field<'_>) -> Option<RuleKind> {
    if let NodeKind::Scalar(_) = field.node.kind {
        return choice(&[("plate", RuleKind::PlatePower)])(field);
    }
    let fields = field.fields()?;
    let at_least = fields.optional("at least", quantity::<Watts>(Allowed::NotNegative));
    let at_most = fields.optional("at most", quantity::<Watts>(Allowed::Positive));
    let watts = |limit: Option<Option<Watts>>| limit.map(|l| l.map(Watts::get));
    let ordered = limits(&fields, field, (watts(at_least), watts(at_most)));
    fields.finish()?;
    ordered?;
    Some(RuleKind::PowerLimits {
        at_least: at_least?,
        at_most: at_most?,
    })
}

fn thermal_link(field: Field<'_>) -> Option<RuleKind> {
    if let NodeKind::Scalar(_) = field.node.kind {
        return choice(&[
            ("holding", RuleKind::LinkHolding),
            ("earliest opening", RuleKind::LinkOpening),
            ("after opening", RuleKind::LinkMaximum),
        ])(field);
    }
    let fields = field.fields()?;
    let below_tf = fields.required("below Tf", quantity::<Kelvins>(Allowed::Positive));
    fields.finish()?;
    Some(RuleKind::LinkHouse {
        below_tf: below_tf?,
    })
}

fn inrush(field: Field<'_>) -> Option<RuleKind> {
    let fields = field.fields()?;
    if fields.find("momentary at most").is_some() && fields.find("at most").is_none() {
        let limit = fields.required("momentary at most", quantity::<Amps>(Allowed::Positive));
        fields.finish()?;
        return Some(RuleKind::MomentaryInrush { at_most: limit? });
    }
    let at_most = fields.required("at most", quantity::<Amps>(Allowed::Positive));
    fields.finish()?;
    Some(RuleKind::Inrush { at_most: at_most? })
}

fn harmonics(field: Field<'_>) -> Option<RuleKind> {
    choice(&[("class A", RuleKind::HarmonicsClassA)])(field)
}

fn voltage_change(field: Field<'_>) -> Option<RuleKind> {
    let fields = field.fields()?;
    let dmax = fields.optional("dmax", share);
    let dc = fields.optional("dc", share);
    let time_above = fields.optional("time above 3.3 %", duration);
    fields.finish()?;
    let (dmax, dc, time_above) = (dmax?, dc?, time_above?);
    if dmax.is_none() && dc.is_none() && time_above.is_none() {
        return field.wrong(
            "no limit is stated",
            "write for example `voltage change: {dmax: 4 %, dc: 3.3 %, time above 3.3 %: 500 ms}`",
        );
    }
    Some(RuleKind::VoltageChange {
        dmax,
        dc,
        time_above,
    })
}

fn order(field: Field<'_>) -> Option<RuleKind> {
    choice(&[("rising", RuleKind::PositionOrder)])(field)
}

fn temperature_rise(field: Field<'_>) -> Option<RuleKind> {
    let fields = field.fields()?;
    let role = fields.required("role", name);
    let at_most = fields.required("rise at most", quantity::<Kelvins>(Allowed::Positive));
    fields.finish()?;
    Some(RuleKind::TemperatureRise {
        role: role?,
        at_most: at_most?,
    })
}

/// A decision as it is written: the largest U of a simple one still has to be read in
/// the unit of what the rule compares.
#[derive(Clone, Copy)]
enum Written<'a> {
    Decided(Decision),
    UpTo(Field<'a>),
}

fn decision(field: Field<'_>) -> Option<Written<'_>> {
    if let NodeKind::Scalar(_) = field.node.kind {
        let words = &[
            ("four outcomes", Decision::FourOutcomes),
            ("simple", Decision::Simple),
        ];
        let decision = choice(words)(field)?;
        if decision == Decision::Simple {
            return field.wrong(
                "a simple decision without the largest U that it is good for",
                "write `{simple: {largest U: 0.2 W}}` in the unit of the rule, or `four outcomes`",
            );
        }
        return Some(Written::Decided(decision));
    }
    let fields = field.fields()?;
    if let Some(simple) = fields.find("simple") {
        fields.finish()?;
        return Some(Written::UpTo(simple));
    }
    let ratio = fields.required("guarded", number(Allowed::Within(0.0, 3.0)));
    fields.finish()?;
    Some(Written::Decided(Decision::Guarded { ratio: ratio? }))
}

fn decided(rule: &Fields<'_>, written: Written<'_>, unit: Option<Dimension>) -> Option<Decision> {
    match (written, unit) {
        (Written::Decided(decision), _) => Some(decision),
        (Written::UpTo(field), Some(unit)) => {
            let fields = field.fields()?;
            let largest = fields.required("largest U", value_of(unit, Allowed::Positive));
            fields.finish()?;
            Some(Decision::SimpleUpTo { largest: largest? })
        }
        (Written::UpTo(_), None) => rule.wrong(
            "decision",
            "this rule compares more than one quantity, and no single U is good for all",
            "take the decision out",
        ),
    }
}

fn process(field: Field<'_>, unit: Option<Dimension>) -> Option<ProcessSpread> {
    let Some(unit) = unit else {
        return field.wrong(
            "this rule compares more than one quantity, and no single spread describes them",
            "take `process` out",
        );
    };
    // A mean of temperatures is a point, their spread a difference.
    let point = match unit {
        Dimension::TemperatureDifference => Dimension::Temperature,
        other => other,
    };
    let fields = field.fields()?;
    let mean = fields.required("mean", value_of(point, Allowed::Any));
    let spread = fields.required("spread", value_of(unit, Allowed::Positive));
    fields.finish()?;
    Some(ProcessSpread {
        mean: mean?,
        spread: spread?,
    })
}

#[cfg(test)]
mod tests {
    use crate::spec::wrong_files::{Kind, wrong};

    #[test]
    fn each_wrong_rule_is_one_problem() {
        Kind::Sequence.check(&[
            wrong(
                "- power: plate",
                "- power: label",
                "67:12",
                "can't be `label`",
                "one of: plate",
            ),
            wrong(
                "- power: plate",
                "- power: {}",
                "67:5",
                "no limit is stated",
                "at least",
            ),
            wrong(
                "- power: plate",
                "- power: {at least: 9 W, at most: 8 W}",
                "67:37",
                "below `at least`",
                "larger",
            ),
            wrong(
                "- power: plate",
                "- powr: plate",
                "67:5",
                "unknown key `powr`",
                "mean `power`",
            ),
            wrong(
                "- thermal link: holding",
                "- weight: information",
                "70:5",
                "compares nothing",
                "one of",
            ),
            wrong(
                "- thermal link: holding",
                "- thermal link: holding\n    inrush: {at most: 1 A}",
                "71:5",
                "compares one thing",
                "dash",
            ),
            wrong(
                "link: holding",
                "link: hold",
                "70:19",
                "can't be `hold`",
                "one of",
            ),
            wrong(
                "positions: rising",
                "positions: falling",
                "72:25",
                "can't be `falling`",
                "one of: rising",
            ),
            wrong(
                "- thermal link: holding",
                "- harmonics: class B",
                "70:16",
                "can't be `class B`",
                "class A",
            ),
            wrong(
                "- thermal link: holding",
                "- voltage change: {}",
                "70:21",
                "no limit is stated",
                "dmax",
            ),
            wrong(
                "- thermal link: holding",
                "- voltage change: {dmax: 4}",
                "70:28",
                "",
                "",
            ),
            wrong(
                "decision: four outcomes",
                "decision: {guarded: -1}",
                "68:25",
                "out of range",
                "unit",
            ),
            wrong(
                "decision: four outcomes",
                "decision: fair",
                "68:15",
                "can't be `fair`",
                "simple",
            ),
            wrong(
                "decision: four outcomes",
                "decision: simple",
                "68:15",
                "without the largest U",
                "largest U",
            ),
            wrong(
                "decision: four outcomes",
                "decision: {simple: {largest U: 2 K}}",
                "68:36",
                "not a power",
                "W",
            ),
            wrong(
                "decision: four outcomes",
                "process: {mean: 9 W, spread: 0 W}",
                "68:34",
                "above zero",
                "check",
            ),
            wrong(
                "thermal link: holding",
                "thermal link: {below Tf: 25 °C}",
                "70:30",
                "not a temperature difference",
                "K",
            ),
            wrong(
                "- thermal link: holding",
                "- thermal link: holding\n    cycling: on-state",
                "71:14",
                "only a rule of the power",
                "take it out",
            ),
            wrong(
                "- power: plate",
                "- power: plate\n    cycling: sometimes",
                "68:14",
                "can't be `sometimes`",
                "one of: on-state, representative period",
            ),
            wrong(
                "weight: required",
                "weight: heavy",
                "69:13",
                "can't be `heavy`",
                "required",
            ),
            wrong(
                "at most: 0.5 A",
                "at most: 0.5",
                "73:23",
                "has no unit",
                "`0.5 A`",
            ),
            wrong(
                "rise at most: 50 K",
                "rise at most: 50 °C",
                "76:50",
                "not a temperature difference",
                "K",
            ),
        ]);
    }
}
