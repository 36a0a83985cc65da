//! Roles without which nothing can be energised, guarded or judged.

use super::notes::Notes;
use super::resolve::written_steps;
use crate::spec::Place;
use crate::spec::sequence::{RoleKind, RuleKind, Sequence, StepAction};

/// What a role by name is needed for.
struct Need<'a> {
    role: &'static str,
    place: &'a Place,
    by: String,
}

/// Reports every role that the sequence lacks.
pub(super) fn must_have(sequence: &Sequence, notes: &mut Notes) {
    once(
        sequence,
        RoleKind::Supply,
        "without it there is no energy path: nothing could energise the unit, or switch it off",
        notes,
    );
    once(
        sequence,
        RoleKind::PowerMeter,
        "without it the rating plate can't be judged, and no guard watches the input",
        notes,
    );
    at_most_once(sequence, RoleKind::PositionSwitch, notes);
    watched(sequence, notes);
    body_is_guarded(sequence, notes);
}

fn once(sequence: &Sequence, kind: RoleKind, why: &str, notes: &mut Notes) {
    if !sequence.roles.iter().any(|need| need.kind == kind) {
        let word = kind.word();
        let name = word.split(' ').next_back().unwrap_or(word);
        notes.error(
            &sequence.title.place,
            format!("the sequence has no role of the kind `{word}`: {why}"),
            format!("below `roles:`, write `{name}: {word}`"),
        );
    }
    at_most_once(sequence, kind, notes);
}

fn at_most_once(sequence: &Sequence, kind: RoleKind, notes: &mut Notes) {
    let of_kind = sequence.roles.iter().filter(|need| need.kind == kind);
    for second in of_kind.skip(1) {
        notes.error(
            &second.name.place,
            format!("a second role of the kind `{}`", kind.word()),
            "a bay has one; take one of the two out",
        );
    }
}

/// `body` and `ambient`, where something needs them.
fn watched(sequence: &Sequence, notes: &mut Notes) {
    let needs = needs(sequence);
    for name in ["body", "ambient"] {
        let found = sequence.roles.iter().find(|need| need.name.value == name);
        match found {
            Some(need) if need.kind != RoleKind::Temperature => notes.error(
                &need.name.place,
                format!("the role `{name}` must be a temperature"),
                format!("write `{name}: temperature`"),
            ),
            Some(_) => {}
            None => {
                if let Some(first) = needs.iter().find(|need| need.role == name) {
                    notes.error(
                        first.place,
                        format!(
                            "the sequence has no role `{name}`, which {} needs",
                            first.by
                        ),
                        format!("below `roles:`, write `{name}: temperature`"),
                    );
                }
            }
        }
    }
}

fn needs(sequence: &Sequence) -> Vec<Need<'_>> {
    let mut needs = Vec::new();
    let mut add = |roles: &[&'static str], place, by: &str| {
        needs.extend(roles.iter().map(|role| Need {
            role,
            place,
            by: by.to_owned(),
        }));
    };
    if let Some(link) = &sequence.appliance.link {
        add(&["body"], &link.tf.place, "the thermal link's guard");
    }
    if let Some(body) = &sequence.guards.body {
        add(&["body"], &body.place, "this guard");
    }
    for step in written_steps(sequence) {
        let place = &step.verb.place;
        match &step.action {
            StepAction::Acclimatise(_) | StepAction::Rest(_) => {
                add(&["body", "ambient"], place, "this wait");
            }
            StepAction::Soak(soak) if soak.until.temperature_change.is_some() => {
                add(&["body", "ambient"], place, "this soak's criterion");
            }
            StepAction::Abnormal(_) => add(&["body"], place, "this step's own trip temperature"),
            _ => {}
        }
    }
    for rule in &sequence.rules {
        let place = &rule.kind.place;
        match &rule.kind.value {
            RuleKind::LinkHolding | RuleKind::LinkOpening => {
                add(&["body", "ambient"], place, "this rule");
            }
            RuleKind::TemperatureRise { .. } => add(&["ambient"], place, "this rule"),
            _ => {}
        }
    }
    needs
}

/// A body that is watched has a limit that trips.
fn body_is_guarded(sequence: &Sequence, notes: &mut Notes) {
    if sequence.appliance.link.is_some() || sequence.guards.body.is_some() {
        return;
    }
    if let Some(body) = sequence.roles.iter().find(|r| r.name.value == "body") {
        notes.error(
            &body.name.place,
            "nothing states at which temperature of the body to trip: there is neither a thermal link nor a guard",
            "below `guards:`, write for example `body: 90 °C`",
        );
    }
}
