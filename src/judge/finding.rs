//! Making findings: one rule, one value or the reason for none, one outcome.

use crate::analysis::{Analysis, CellResult, Estimate};
use crate::plan::Cell;
use crate::spec::sequence::{Decision, RuleWeight, SupplyPoint};

use super::decision::{Limits, decide};
use super::types::{Finding, Outcome};

/// What is common to the findings of one rule.
#[derive(Debug, Clone)]
pub(super) struct Draft {
    pub(super) rule: String,
    pub(super) weight: RuleWeight,
    pub(super) decision: Decision,
    pub(super) limits: Limits,
    pub(super) unit: &'static str,
    pub(super) source: String,
    /// What a fail means, in words.
    pub(super) fail_means: String,
}

/// A supply in words: `230 V 50 Hz`.
pub(super) fn supply_words(supply: &SupplyPoint) -> String {
    format!("{} {}", supply.voltage, supply.frequency)
}

impl Draft {
    /// A rule of ours that every unit is held to.
    pub(super) fn house(rule: impl Into<String>, fail_means: impl Into<String>) -> Self {
        Draft {
            rule: rule.into(),
            weight: RuleWeight::Required,
            decision: Decision::Simple,
            limits: Limits::default(),
            unit: "",
            source: "house rule".to_owned(),
            fail_means: fail_means.into(),
        }
    }

    /// An outcome that no number decided.
    pub(super) fn plainly(&self, cell: Option<&Cell>, outcome: Outcome, reason: &str) -> Finding {
        Finding {
            rule: self.rule.clone(),
            condition: cell.and_then(|cell| cell.condition.clone()),
            position: cell.map(|cell| cell.position.clone()),
            supply: cell.map(|cell| supply_words(&cell.supply)),
            weight: self.weight,
            outcome,
            value: None,
            expanded: None,
            unit: self.unit.to_owned(),
            at_least: self.limits.at_least,
            at_most: self.limits.at_most,
            margin: None,
            probability: None,
            source: self.source.clone(),
            reason: reason.to_owned(),
        }
    }

    /// Not judged, and why.
    pub(super) fn not_judged(&self, cell: Option<&Cell>, reason: &str) -> Finding {
        let reason = if reason.is_empty() {
            "no reason was recorded"
        } else {
            reason
        };
        self.plainly(cell, Outcome::NotJudged, reason)
    }

    /// Decided by the rule.
    pub(super) fn decided(&self, cell: Option<&Cell>, value: &Estimate) -> Finding {
        let decided = decide(value, self.limits, self.decision);
        let reason = match decided.outcome {
            Outcome::Pass => "within its limits".to_owned(),
            Outcome::ConditionalPass => {
                "within its limit, but nearer to it than the uncertainty".to_owned()
            }
            Outcome::ConditionalFail => {
                format!("{}, but by less than the uncertainty", self.fail_means)
            }
            Outcome::Fail => self.fail_means.clone(),
            Outcome::NotJudged => decided.reason,
        };
        Finding {
            value: value.value.is_finite().then_some(value.value),
            expanded: value.expanded.is_finite().then_some(value.expanded),
            margin: decided.margin.filter(|margin| margin.is_finite()),
            probability: decided.probability,
            ..self.plainly(cell, decided.outcome, &reason)
        }
    }
}

impl Finding {
    /// Rule, where it is for, outcome and reason in one line.
    pub(super) fn in_words(&self) -> String {
        let place: Vec<&str> = [&self.position, &self.condition, &self.supply]
            .into_iter()
            .filter_map(Option::as_deref)
            .collect();
        let place = if place.is_empty() {
            String::new()
        } else {
            format!(" ({})", place.join(", "))
        };
        format!(
            "{}{place}: {}: {}",
            self.rule,
            self.outcome.word(),
            self.reason
        )
    }
}

/// The worst of several findings: by outcome, then by margin, then the first.
pub(super) fn worst(findings: impl IntoIterator<Item = Finding>) -> Option<Finding> {
    let margin = |finding: &Finding| finding.margin.unwrap_or(f64::INFINITY);
    findings.into_iter().reduce(|worst, next| {
        let (is, was) = (next.outcome.rank(), worst.outcome.rank());
        let worse = is > was || (is == was && margin(&next) < margin(&worst));
        if worse { next } else { worst }
    })
}

/// Cells of one position and supply, over every condition.
pub(super) type Group<'a> = Vec<&'a CellResult>;

/// Groups the cells by position and supply, in the order of the plan.
pub(super) fn by_position_and_supply<'a>(
    analysis: &'a Analysis,
    keep: impl Fn(&Cell) -> bool,
) -> Vec<Group<'a>> {
    grouped(analysis, keep, |cell| {
        (cell.position.clone(), supply_words(&cell.supply))
    })
}

/// Groups the cells by a key, in the order in which keys first come.
pub(super) fn grouped<'a, K: PartialEq>(
    analysis: &'a Analysis,
    keep: impl Fn(&Cell) -> bool,
    key: impl Fn(&Cell) -> K,
) -> Vec<Group<'a>> {
    let mut groups: Vec<(K, Group<'a>)> = Vec::new();
    for result in analysis.cells.iter().filter(|result| keep(&result.cell)) {
        let key = key(&result.cell);
        match groups.iter_mut().find(|(known, _)| *known == key) {
            Some((_, group)) => group.push(result),
            None => groups.push((key, vec![result])),
        }
    }
    groups.into_iter().map(|(_, group)| group).collect()
}
