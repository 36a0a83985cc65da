//! Rules with their names resolved, and whether the steps can feed them.

use super::expand::Expanded;
use super::notes::Notes;
use super::types::{Action, PlannedAppliance, PlannedRule};
use crate::quantity::Seconds;
use crate::spec::Place;
use crate::spec::plate;
use crate::spec::sequence::{CriterionKind, RoleKind, Rule, RuleKind, Sequence, Span};

/// Where the limits of a rule come from, where the sequence does not say.
fn usual_source(kind: &RuleKind) -> &'static str {
    match kind {
        RuleKind::PlatePower => {
            "IEC 60335-1 clause 10.1, later editions from memory: check against your copy"
        }
        RuleKind::LinkHolding => "IEC 60691: holding temperature Th, from the part's data sheet",
        RuleKind::LinkOpening => "IEC 60691: earliest opening, Tf - 10 K",
        RuleKind::PositionOrder => "the plate's order of positions",
        RuleKind::PowerLimits { .. }
        | RuleKind::Inrush { .. }
        | RuleKind::TemperatureRise { .. } => "house limit",
    }
}

/// Resolves every rule.
pub(super) fn rules(
    sequence: &Sequence,
    expanded: &Expanded,
    notes: &mut Notes,
) -> Vec<PlannedRule> {
    for rule in &sequence.rules {
        names_known(sequence, rule, notes);
        can_be_fed(sequence, expanded, rule, notes);
    }
    sequence.rules.iter().map(planned).collect()
}

fn planned(rule: &Rule) -> PlannedRule {
    PlannedRule {
        kind: rule.kind.value.clone(),
        decision: rule.decision,
        weight: rule.weight,
        position: rule.position.as_ref().map(|p| p.value.clone()),
        condition: rule.condition.as_ref().map(|c| c.value.clone()),
        source: rule
            .source
            .clone()
            .unwrap_or_else(|| usual_source(&rule.kind.value).to_owned()),
    }
}

fn names_known(sequence: &Sequence, rule: &Rule, notes: &mut Notes) {
    if let Some(position) = &rule.position {
        let known: Vec<&str> = sequence
            .appliance
            .positions
            .iter()
            .map(|p| p.value.as_str())
            .collect();
        if !known.contains(&position.value.as_str()) {
            notes.unknown(&position.place, "position", &position.value, &known);
        }
    }
    if let Some(condition) = &rule.condition {
        let known: Vec<&str> = sequence
            .conditions
            .iter()
            .map(|c| c.name.value.as_str())
            .collect();
        if !known.contains(&condition.value.as_str()) {
            notes.unknown(&condition.place, "condition", &condition.value, &known);
        }
    }
    if let RuleKind::TemperatureRise { role, .. } = &rule.kind.value {
        let temperatures = sequence
            .roles
            .iter()
            .filter(|need| need.kind == RoleKind::Temperature);
        let known: Vec<&str> = temperatures.map(|need| need.name.value.as_str()).collect();
        if !known.contains(&role.as_str()) {
            notes.unknown(&rule.kind.place, "temperature role", role, &known);
        }
    }
}

fn can_be_fed(sequence: &Sequence, expanded: &Expanded, rule: &Rule, notes: &mut Notes) {
    let place = &rule.kind.place;
    let has = |verb: &str| expanded.steps.iter().any(|step| step.action.verb() == verb);
    match &rule.kind.value {
        RuleKind::PlatePower if sequence.appliance.plate.is_empty() => {
            notes.error(
                place,
                "the appliance has no rating plate to judge by",
                "add entries below `plate:`",
            );
        }
        RuleKind::PlatePower | RuleKind::PowerLimits { .. } if !has("soak") => {
            notes.error(
                place,
                "no step soaks the unit: its settled power is never known",
                "add a `soak` step",
            );
        }
        RuleKind::Inrush { .. } if !has("inrush") => {
            notes.error(
                place,
                "no step captures the inrush",
                "add an `inrush` step right after `energise`",
            );
        }
        RuleKind::LinkHolding | RuleKind::LinkOpening => link_known(sequence, rule, place, notes),
        RuleKind::PositionOrder if sequence.appliance.positions.len() < 2 => {
            notes.error(
                place,
                "there is only one position: nothing can be in order",
                "take this rule out",
            );
        }
        _ => {}
    }
}

fn link_known(sequence: &Sequence, rule: &Rule, place: &Place, notes: &mut Notes) {
    match &sequence.appliance.link {
        None => notes.error(
            place,
            "the appliance states no thermal link",
            "add `thermal link:` with Tf and Th from the part's data sheet, or take this rule out",
        ),
        Some(link) if link.th.is_none() && rule.kind.value == RuleKind::LinkHolding => notes.error(
            &link.tf.place,
            "the thermal link states no Th: its holding temperature lies anywhere from 13 to 45 K below Tf",
            "add `Th:` from the part's data sheet",
        ),
        Some(_) => {}
    }
}

/// What can be known before anything is energised and would leave results not judged.
pub(super) fn warn_early(
    sequence: &Sequence,
    appliance: &PlannedAppliance,
    expanded: &Expanded,
    meter: Option<&crate::spec::driver::Driver>,
    notes: &mut Notes,
) {
    for position in &sequence.appliance.positions {
        if !expanded
            .cells
            .iter()
            .any(|cell| cell.position == position.value)
        {
            notes.warning(
                &position.place,
                format!(
                    "no step runs the position `{}`: the unit will be not judged",
                    position.value
                ),
                "add it to the `positions:` of an `each` block",
            );
        }
    }
    for step in &expanded.steps {
        if let Action::Soak {
            at_least, until, ..
        } = &step.action
            && let CriterionKind::Slope { window } = until.kind
            && window > *at_least
            && let Some(place) = soak_place(sequence)
        {
            notes.warning(
                place,
                format!("the criterion's window of {window} is longer than the shortest soak of {at_least}"),
                "the soak lasts at least the window in any case",
            );
            break;
        }
    }
    if let Some(meter) = meter {
        meter_fits(sequence, appliance, meter, notes);
        polled_too_fast(sequence, expanded, meter.update_interval, notes);
    }
}

/// U at the plate value against the distance to the limit: above it nothing can pass.
fn meter_fits(
    sequence: &Sequence,
    appliance: &PlannedAppliance,
    meter: &crate::spec::driver::Driver,
    notes: &mut Notes,
) {
    let Some(accuracy) = meter.accuracy_of(crate::quantity::Reading::Power) else {
        return;
    };
    for (entry, written) in appliance.plate.iter().zip(&sequence.appliance.plate) {
        let band = plate::limits(appliance.kind, entry.power);
        let Span { low, high } = entry.power;
        let up = band.at_most.get() - high.get();
        let room = band
            .at_least
            .map_or(up, |at_least| up.min(low.get() - at_least.get()));
        // Rectangular half-width, k = 2.
        let expanded = 2.0 * accuracy.half_width(high.get()) / 3f64.sqrt();
        if expanded > room {
            notes.warning(
                &written.power.place,
                format!(
                    "the meter's accuracy alone makes U {expanded:.2} W, the band leaves {room:.2} W: the power will be not judged"
                ),
                "use a meter with a range that fits, or a more accurate one",
            );
        }
    }
}

fn polled_too_fast(sequence: &Sequence, expanded: &Expanded, update: Seconds, notes: &mut Notes) {
    let faster = expanded.steps.iter().find_map(|step| match &step.action {
        Action::Inrush(timed) | Action::Measure(timed) if timed.every < update => Some(timed.every),
        _ => None,
    });
    if let Some(every) = faster {
        notes.warning(
            &sequence.title.place,
            format!("a step asks for a reading every {every}, the meter updates every {update}"),
            "it is polled at its own interval",
        );
    }
}

fn soak_place(sequence: &Sequence) -> Option<&Place> {
    use crate::spec::sequence::StepAction;
    let flat = sequence.steps.iter().flat_map(|step| match &step.action {
        StepAction::Each(each) => each.steps.iter().collect::<Vec<_>>(),
        _ => vec![step],
    });
    flat.into_iter()
        .find(|step| matches!(step.action, StepAction::Soak(_)))
        .map(|step| &step.verb.place)
}
