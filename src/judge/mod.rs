//! Rules, findings, verdict: pure, and only from what analysis says of a record.

mod decide;
mod rules;
mod table;
mod types;
mod unit;

pub use decide::{Decided, Limits, decide};
pub use table::findings_csv;
pub use types::{Finding, Judgement, Outcome};

use crate::analysis::Analysis;
use crate::plan::Plan;
use crate::record::RunOutcome;

/// Judges a unit: the run itself, whether it works at all, whether its sensors can be
/// believed, what the operator saw, and every rule of the sequence.
pub fn judge(plan: &Plan, outcome: &RunOutcome, analysis: &Analysis) -> Judgement {
    let mut findings = vec![unit::run_finding(outcome)];
    findings.extend(unit::missing_positions(plan));
    findings.extend(rules::works(plan, analysis));
    findings.extend(rules::believable(analysis));
    findings.extend(analysis.looked.iter().map(unit::looked_at));
    for rule in &plan.rules {
        findings.extend(rules::judge_rule(plan, rule, analysis));
    }
    unit::verdict(findings)
}
