//! The rules of a sequence.

use crate::quantity::{Amps, Kelvins, Watts};
use crate::spec::Located;
use crate::spec::fields::{Field, Fields};
use crate::spec::scalars::{Allowed, choice, located_name, name, number, quantity, text};
use crate::spec::sequence::{Decision, Rule, RuleKind, RuleWeight};
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
];

const WEIGHTS: &[(&str, RuleWeight)] = &[
    ("required", RuleWeight::Required),
    ("information", RuleWeight::Information),
];

/// One rule.
pub(super) fn rule(field: Field<'_>) -> Option<Rule> {
    let fields = field.fields()?;
    let kind = kind(&fields, field);
    let decision = fields.or("decision", Decision::FourOutcomes, decision);
    let weight = fields.or("weight", RuleWeight::Required, choice(WEIGHTS));
    let position = fields.optional("position", located_name);
    let condition = fields.optional("condition", located_name);
    let source = fields.optional("source", text);
    fields.finish()?;
    Some(Rule {
        kind: kind?,
        decision: decision?,
        weight: weight?,
        position: position?,
        condition: condition?,
        source: source?,
    })
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
    choice(&[
        ("holding", RuleKind::LinkHolding),
        ("earliest opening", RuleKind::LinkOpening),
    ])(field)
}

fn inrush(field: Field<'_>) -> Option<RuleKind> {
    let fields = field.fields()?;
    let at_most = fields.required("at most", quantity::<Amps>(Allowed::Positive));
    fields.finish()?;
    Some(RuleKind::Inrush { at_most: at_most? })
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

fn decision(field: Field<'_>) -> Option<Decision> {
    if let NodeKind::Scalar(_) = field.node.kind {
        return choice(&[
            ("simple", Decision::Simple),
            ("four outcomes", Decision::FourOutcomes),
        ])(field);
    }
    let fields = field.fields()?;
    let ratio = fields.required("guarded", number(Allowed::Within(0.0, 3.0)));
    fields.finish()?;
    Some(Decision::Guarded { ratio: ratio? })
}
