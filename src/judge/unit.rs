//! The whole unit: what the operator saw, what the run itself says, and the verdict.

use super::decide::severity;
use super::rules::plain;
use super::types::{Finding, Judgement, Outcome};
use crate::analysis::Looked;
use crate::plan::Plan;
use crate::record::{RunOutcome, TripOf};
use crate::spec::sequence::{FindingClass, RuleWeight};

/// A run that was cut short can't carry a pass; a trip may speak about the unit.
pub(super) fn run_finding(outcome: &RunOutcome) -> Finding {
    let rule = "the run was walked to its end";
    match outcome {
        RunOutcome::Complete => plain(rule, Outcome::Pass, ""),
        RunOutcome::Tripped { reason, speaks_of: TripOf::Unit } => {
            plain(rule, Outcome::Fail, format!("a guard tripped: {reason}"))
        }
        RunOutcome::Tripped { reason, speaks_of: TripOf::Bench } => {
            plain(rule, Outcome::NotJudged, format!("a guard tripped: {reason}"))
        }
        RunOutcome::Stopped => plain(rule, Outcome::NotJudged, "the operator stopped the run"),
        RunOutcome::Failed { reason } => plain(rule, Outcome::NotJudged, format!("the run failed: {reason}")),
        RunOutcome::Interrupted => plain(rule, Outcome::NotJudged, "the run was interrupted"),
    }
}

/// Positions that the plate rates and that no cell runs.
pub(super) fn missing_positions(plan: &Plan) -> Vec<Finding> {
    let mut missing: Vec<&str> = Vec::new();
    for entry in &plan.appliance.plate {
        let run = plan.cells.iter().any(|cell| cell.position == entry.position);
        if !run && !missing.contains(&entry.position.as_str()) {
            missing.push(&entry.position);
        }
    }
    let finding = |position: &str| {
        let mut finding = plain(
            &format!("every position of the plate is run, {position}"),
            Outcome::NotJudged,
            format!("the plate rates the position `{position}`, and no step runs it"),
        );
        finding.position = Some(position.to_owned());
        finding
    };
    missing.into_iter().map(finding).collect()
}

/// Critical and major findings fail; minor ones inform.
pub(super) fn looked_at(looked: &Looked) -> Finding {
    let rule = format!("operator: {}", looked.question);
    let mut finding = match looked.class {
        None => plain(&rule, Outcome::Pass, format!("answered {}", looked.answer)),
        Some(class) => {
            let word = match class {
                FindingClass::Minor => "minor",
                FindingClass::Major => "major",
                FindingClass::Critical => "critical",
            };
            plain(&rule, Outcome::Fail, format!("answered {}: a {word} finding", looked.answer))
        }
    };
    finding.source = "the sequence".to_owned();
    if looked.class == Some(FindingClass::Minor) {
        finding.weight = RuleWeight::Information;
    }
    finding
}

/// The verdict of the required findings, and the one reason that decided it.
pub(super) fn verdict(findings: Vec<Finding>) -> Judgement {
    let required = || findings.iter().filter(|f| f.weight == RuleWeight::Required);
    let worst = required().map(|f| severity(f.outcome)).max();
    let deciding = required().filter(|f| Some(severity(f.outcome)) == worst).min_by(|a, b| {
        in_u(a).total_cmp(&in_u(b))
    });
    match deciding {
        None => Judgement {
            verdict: Outcome::NotJudged,
            because: "no finding is required".to_owned(),
            findings,
        },
        Some(finding) => Judgement { verdict: finding.outcome, because: because(finding), findings },
    }
}

/// Margin in units of U: what decides among equals.
fn in_u(finding: &Finding) -> f64 {
    match (finding.margin, finding.expanded) {
        (Some(margin), Some(u)) if u > 0.0 => margin / u,
        // A finding without a value comes first where it fails, last where it passes.
        _ if finding.outcome == Outcome::Pass => f64::MAX,
        _ => f64::MIN,
    }
}

fn because(finding: &Finding) -> String {
    let condition = finding.condition.as_ref().map_or_else(String::new, |c| format!(" ({c})"));
    let rule = format!("{}{condition}", finding.rule);
    match (finding.outcome, finding.margin, finding.expanded) {
        (Outcome::Pass, Some(margin), Some(u)) if u > 0.0 => format!(
            "every required rule passes; the smallest margin is {margin:.2} {}, {:.1} times U: {rule}",
            finding.margin_unit(),
            margin / u
        ),
        (Outcome::Pass, _, _) => "every required rule passes".to_owned(),
        _ => format!("{rule}: {}", finding.reason),
    }
}
