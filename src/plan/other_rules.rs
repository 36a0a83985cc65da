//! The rules of another sequence, for judging a record that was made by its own.

use super::notes::Notes;
use super::rules::planned;
use super::types::{Plan, PlannedRule};
use crate::spec::Problem;
use crate::spec::sequence::{RoleKind, RuleKind, Sequence};

/// The rules of `sequence` for a record of `plan`: every position, condition and role
/// that they name must be the plan's.
///
/// # Errors
/// Every name that the plan does not know.
pub fn other_rules(sequence: &Sequence, plan: &Plan) -> Result<Vec<PlannedRule>, Vec<Problem>> {
    let mut notes = Notes::default();
    let positions: Vec<&str> = plan
        .appliance
        .positions
        .iter()
        .map(String::as_str)
        .collect();
    let cells = plan.cells.iter();
    let conditions: Vec<&str> = cells.filter_map(|cell| cell.condition.as_deref()).collect();
    let roles: Vec<&str> = plan
        .bay
        .roles
        .iter()
        .filter(|role| role.kind == RoleKind::Temperature)
        .map(|role| role.name.as_str())
        .collect();
    for rule in &sequence.rules {
        if let Some(position) = &rule.position
            && !positions.contains(&position.value.as_str())
        {
            notes.unknown(&position.place, "position", &position.value, &positions);
        }
        if let Some(condition) = &rule.condition
            && !conditions.contains(&condition.value.as_str())
        {
            notes.unknown(&condition.place, "condition", &condition.value, &conditions);
        }
        if let RuleKind::TemperatureRise { role, .. } = &rule.kind.value
            && !roles.contains(&role.as_str())
        {
            notes.unknown(&rule.kind.place, "temperature role", role, &roles);
        }
    }
    if notes.has_errors() {
        return Err(notes.into_problems(&sequence.title.place));
    }
    Ok(sequence.rules.iter().map(planned).collect())
}
