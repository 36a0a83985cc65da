//! Rules, findings, verdict.
//!
//! Some findings are there whatever the sequence asks: that the unit works at all,
//! that its sensors are believable, that every position of the plate was run, what
//! the operator found, and that the run was complete. The others come from the
//! plan's rules. The unit fails where a required finding fails; else it is not
//! judged where one is not; else the worst of the conditional outcomes counts.

mod always;
mod decision;
mod finding;
mod link;
mod marks;
mod rules;
mod table;
mod types;
mod waveform;

#[cfg(test)]
mod tests;

pub use decision::{CONVENTION, Decided, Limits, decide};
pub use table::findings_csv;
pub use types::{Finding, Judgement, Mark, Outcome, ProcessRisks};

use crate::analysis::Analysis;
use crate::plan::Plan;
use crate::quantity::Watts;
use crate::record::RunOutcome;
use crate::spec::plate;
use crate::spec::sequence::{ApplianceKind, RuleWeight, Span};

/// Every finding and the unit's verdict, from a stored plan and what analysis says
/// of the record.
pub fn judge(plan: &Plan, outcome: &RunOutcome, analysis: &Analysis) -> Judgement {
    let mut findings = vec![always::run(plan, outcome, analysis)];
    findings.extend(always::history(analysis));
    findings.extend(always::works_at_all(plan, analysis));
    findings.extend(always::believable(plan, analysis));
    findings.extend(always::plate_positions(plan));
    findings.extend(always::looked(plan, analysis));
    for rule in &plan.rules {
        findings.extend(rules::findings(plan, analysis, rule));
    }
    let (verdict, because) = verdict(&findings);
    Judgement {
        verdict,
        because,
        findings,
        convention: CONVENTION.to_owned(),
        other_rules: None,
        marks: marks::of(plan, analysis),
    }
}

/// The band of IEC 60335-1 clause 10.1: at least (where there is a lower limit) and
/// at most. See [`plate::limits`].
pub fn plate_limits(kind: ApplianceKind, rated: Span<Watts>) -> (Option<Watts>, Watts) {
    let band = plate::limits(kind, rated);
    (band.at_least, band.at_most)
}

/// The worst required outcome, and the finding that decided it: among equals the one
/// whose margin is the smallest in units of U, one without a margin before all others
/// unless it passes, else the first.
fn verdict(findings: &[Finding]) -> (Outcome, String) {
    let margin = |finding: &Finding| {
        let without = match finding.outcome {
            Outcome::Pass => f64::INFINITY,
            _ => f64::NEG_INFINITY,
        };
        finding.margin_in_u().unwrap_or(without)
    };
    let required = findings
        .iter()
        .filter(|finding| finding.weight == RuleWeight::Required);
    let deciding = required.reduce(|worst, next| {
        let (is, was) = (next.outcome.rank(), worst.outcome.rank());
        let worse = is > was || (is == was && margin(next) < margin(worst));
        if worse { next } else { worst }
    });
    match deciding {
        None => (
            Outcome::NotJudged,
            "there was nothing to judge it by".to_owned(),
        ),
        Some(finding) if finding.outcome == Outcome::Pass => {
            (Outcome::Pass, finding.pass_in_words())
        }
        Some(finding) => (finding.outcome, finding.in_words()),
    }
}
