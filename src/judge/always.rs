//! Findings that are there whatever the sequence asks.

use crate::analysis::{Analysis, CellResult, Estimate, Figure, plate_point, plate_points};
use crate::plan::{Action, Plan};
use crate::quantity::{at_least, shortest};
use crate::record::{RunOutcome, TripOf};
use crate::spec::sequence::{FindingClass, Question, RuleWeight};

use super::decision::Limits;
use super::finding::{Draft, by_position_and_supply, worst};
use super::types::{Finding, Outcome};

/// A unit works where it draws more than this share of its plate value,
const OF_PLATE: f64 = 0.1;
/// and more than so many times the meter's floor (house defaults).
const OF_FLOOR: f64 = 5.0;

/// How the run ended. A guard that tripped on the unit itself (too hot, or drawing too
/// much) is evidence against it, unless the temperatures of a cell are not believed;
/// any other trip, stop or failure leaves it unjudged.
pub(super) fn run(plan: &Plan, outcome: &RunOutcome, analysis: &Analysis) -> Finding {
    let draft = Draft::house("run complete", "");
    match outcome {
        RunOutcome::Complete => draft.plainly(None, Outcome::Pass, "every step was walked"),
        RunOutcome::Tripped { reason, speaks_of } => guard(plan, analysis, reason, *speaks_of),
        RunOutcome::Stopped => draft.not_judged(None, "the operator stopped the run"),
        RunOutcome::Failed { reason } => {
            draft.not_judged(None, &format!("the run failed: {reason}"))
        }
        RunOutcome::Interrupted => {
            draft.not_judged(None, "the run was interrupted and closed afterwards")
        }
    }
}

fn guard(plan: &Plan, analysis: &Analysis, reason: &str, speaks_of: TripOf) -> Finding {
    let draft = Draft::house("guard tripped", "");
    let tripped = format!("a guard tripped: {reason}");
    let last = analysis
        .cells
        .iter()
        .rev()
        .find(|cell| cell.energised_s.known().is_some());
    let cell = last.map(|result| &result.cell);
    if speaks_of == TripOf::Bench {
        return draft.not_judged(cell, &tripped);
    }
    // A sensor that is not believed may have tripped the body's guard for nothing.
    let doubted = last.is_some_and(|cell| near_its_trip(plan, cell) && !cell.disbelief.is_empty());
    if doubted {
        let why = format!("{tripped}, and the sensors are not believed");
        return draft.not_judged(cell, &why);
    }
    draft.plainly(cell, Outcome::Fail, &tripped)
}

fn near_its_trip(plan: &Plan, result: &CellResult) -> bool {
    let (Some(limit), Some(peak)) = (plan.guards.body, result.body_peak.known()) else {
        return false;
    };
    let body = &peak.temperature_degc;
    at_least(body.value + body.expanded, limit.get())
}

/// A unit that an earlier record marked is not judged as good.
pub(super) fn history(analysis: &Analysis) -> Option<Finding> {
    let first = analysis.history.first()?;
    Some(Draft::house("the unit's history", "").not_judged(None, first))
}

/// Each position draws a settled input worth the name, and keeps drawing it.
pub(super) fn works_at_all(plan: &Plan, analysis: &Analysis) -> Vec<Finding> {
    by_position_and_supply(analysis, |_| true)
        .into_iter()
        .filter_map(|group| worst(group.into_iter().map(|cell| works(plan, cell))))
        .collect()
}

fn works(plan: &Plan, result: &CellResult) -> Finding {
    let cell = &result.cell;
    let means = "it draws next to nothing: an open link, element or switch";
    let mut draft = Draft {
        unit: "W",
        ..Draft::house("works at all", means)
    };
    if let Figure::Absent(reason) = &result.energised_s {
        return draft.not_judged(Some(cell), reason);
    }
    let drawn = match &result.drawn {
        Figure::Known(drawn) => drawn,
        Figure::Absent(reason) => return draft.not_judged(Some(cell), reason),
    };
    let rated = plate_point(plan, cell)
        .or(plate_points(plan, &cell.position).first().copied())
        .map_or(0.0, |point| point.rated.low.get());
    let least = (OF_PLATE * rated).max(OF_FLOOR * drawn.floor_w);
    draft.limits = Limits {
        at_least: Some(least),
        at_most: None,
    };
    if let Some(after) = drawn.vanished_s {
        let why = format!(
            "the power vanished {after:.0} s after energising: an open link, element or switch, or a loose contact"
        );
        return draft.plainly(Some(cell), Outcome::Fail, &why);
    }
    let steady = result.steady.known().map(|steady| steady.power_w.clone());
    // What is drawn before OFF is compared alone: it has no uncertainty of its own.
    let unsettled = Estimate::combined(drawn.power_w, Vec::new());
    let finding = draft.decided(Some(cell), steady.as_ref().unwrap_or(&unsettled));
    match result.steady.reason() {
        Some(reason) if finding.outcome == Outcome::Pass => {
            let why = format!(
                "it drew {} W, but {reason}",
                shortest((drawn.power_w * 1e3).round() / 1e3)
            );
            draft.not_judged(Some(cell), &why)
        }
        _ => finding,
    }
}

/// The watched body's readings can be believed.
pub(super) fn believable(plan: &Plan, analysis: &Analysis) -> Vec<Finding> {
    if plan.role("body").is_none() {
        return Vec::new();
    }
    let draft = Draft::house("sensors believable", "");
    let one = |result: &CellResult| {
        let cell = Some(&result.cell);
        match (&result.energised_s, result.disbelief.first()) {
            (Figure::Absent(reason), _) => draft.not_judged(cell, reason),
            (_, Some(_)) => draft.not_judged(cell, &result.disbelief.join("; ")),
            (Figure::Known(_), None) => match result.body_peak.reason() {
                Some(reason) => draft.not_judged(cell, reason),
                None => draft.plainly(cell, Outcome::Pass, "nothing speaks against them"),
            },
        }
    };
    by_position_and_supply(analysis, |_| true)
        .into_iter()
        .filter_map(|group| worst(group.into_iter().map(one)))
        .collect()
}

/// Every position of the plate is in the plan; those that are not leave the unit
/// unjudged.
pub(super) fn plate_positions(plan: &Plan) -> Vec<Finding> {
    let mut missing: Vec<&str> = Vec::new();
    for entry in &plan.appliance.plate {
        let position = entry.position.as_str();
        let is_run = plan.cells.iter().any(|cell| cell.position == position);
        if !is_run && !missing.contains(&position) {
            missing.push(position);
        }
    }
    let draft = Draft::house("every position of the plate", "");
    missing
        .into_iter()
        .map(|position| {
            draft.not_judged_in(
                position,
                "the sequence does not run this position of the plate",
            )
        })
        .collect()
}

/// What the operator was asked that can be a finding. Critical and major ones are
/// required; minor ones inform.
pub(super) fn looked(plan: &Plan, analysis: &Analysis) -> Vec<Finding> {
    let mut answers: Vec<_> = analysis.looked.iter().collect();
    let mut findings = Vec::new();
    for step in &plan.steps {
        let Action::Ask(question) = &step.action else {
            continue;
        };
        // Answers come in the order of the questions; one text may come twice.
        let at = answers.iter().position(|l| l.question == question.text);
        let answer = at.map(|at| answers.remove(at));
        let cell = step.cell.and_then(|cell| plan.cells.get(cell));
        let Some(class) = question.finding.as_ref().map(|finding| finding.class) else {
            continue;
        };
        let draft = asked(question, class);
        findings.push(match answer {
            None => draft.not_judged(cell, "it was not answered"),
            Some(looked) if looked.class.is_some() => {
                let why = format!("answered `{}`: a {} finding", looked.answer, word(class));
                draft.plainly(cell, Outcome::Fail, &why)
            }
            Some(looked) => {
                let why = format!("answered `{}`", looked.answer);
                draft.plainly(cell, Outcome::Pass, &why)
            }
        });
    }
    findings
}

fn asked(question: &Question, class: FindingClass) -> Draft {
    Draft {
        weight: match class {
            FindingClass::Critical | FindingClass::Major => RuleWeight::Required,
            FindingClass::Minor => RuleWeight::Information,
        },
        source: "operator".to_owned(),
        ..Draft::house(question.text.clone(), "")
    }
}

fn word(class: FindingClass) -> &'static str {
    match class {
        FindingClass::Minor => "minor",
        FindingClass::Major => "major",
        FindingClass::Critical => "critical",
    }
}
