//! Making findings: one rule, one value or the reason for none, one outcome.

use crate::analysis::{Analysis, CellResult, Estimate};
use crate::plan::Cell;
use crate::quantity::{at_most, significant};
use crate::spec::sequence::{CyclingRule, Decision, ProcessSpread, RuleWeight, SupplyPoint};
use crate::stats::{Interval, global_risks};

use super::decision::{Decided, Limits, decide, guard_band, in_words};
use super::types::{Finding, Outcome, ProcessRisks};

/// What is common to the findings of one rule.
#[derive(Debug, Clone)]
pub(super) struct Draft {
    pub(super) rule: String,
    pub(super) weight: RuleWeight,
    pub(super) decision: Decision,
    pub(super) limits: Limits,
    pub(super) unit: &'static str,
    /// What the plate says, where the tolerance is meant around it.
    pub(super) nominal: Option<f64>,
    /// Which input of a cycling load is compared.
    pub(super) cycling: CyclingRule,
    /// How the quantity spreads over units, where it is stated.
    pub(super) process: Option<ProcessSpread>,
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
            nominal: None,
            cycling: CyclingRule::OnState,
            process: None,
            source: "house rule".to_owned(),
            fail_means: fail_means.into(),
        }
    }

    /// An outcome that no number decided.
    pub(super) fn plainly(&self, cell: Option<&Cell>, outcome: Outcome, reason: &str) -> Finding {
        Finding {
            rule: self.rule_at(cell.map(|cell| cell.position.as_str())),
            condition: cell.and_then(|cell| cell.condition.clone()),
            position: cell.map(|cell| cell.position.clone()),
            supply: cell.map(|cell| supply_words(&cell.supply)),
            weight: self.weight,
            decision: None,
            outcome,
            value: None,
            expanded: None,
            coverage: None,
            budget: Vec::new(),
            unit: self.unit.to_owned(),
            at_least: self.limits.at_least.and_then(twelve_digits),
            at_most: self.limits.at_most.and_then(twelve_digits),
            margin: None,
            probability: None,
            risks: None,
            source: self.source.clone(),
            reason: reason.to_owned(),
        }
    }

    /// The rule in words: `inrush, high`.
    fn rule_at(&self, position: Option<&str>) -> String {
        match position {
            Some(position) => format!("{}, {position}", self.rule),
            None => self.rule.clone(),
        }
    }

    /// Not judged in a position that no cell stands for, and why.
    pub(super) fn not_judged_in(&self, position: &str, reason: &str) -> Finding {
        Finding {
            rule: self.rule_at(Some(position)),
            position: Some(position.to_owned()),
            ..self.not_judged(None, reason)
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

    /// What the decision risks for the process that the sequence states, at this
    /// measurement's uncertainty.
    fn risks(&self, value: &Estimate) -> Option<ProcessRisks> {
        let process = self.process?;
        let band = guard_band(self.decision, value);
        let Limits { at_least, at_most } = self.limits;
        let tolerance = Interval {
            low: at_least.unwrap_or(f64::NEG_INFINITY),
            high: at_most.unwrap_or(f64::INFINITY),
        };
        let acceptance = Interval {
            low: tolerance.low + band,
            high: tolerance.high - band,
        };
        let standard = value.standard();
        let risks = global_risks(
            process.mean,
            process.spread,
            standard,
            tolerance,
            acceptance,
        )?;
        Some(ProcessRisks {
            conforming: twelve_digits(risks.conforming)?,
            consumer: twelve_digits(risks.consumer)?,
            producer: twelve_digits(risks.producer)?,
        })
    }

    /// Takes back a decision for which the measurement is too coarse: U larger than the
    /// distance from the plate's value to the limit (with two limits: half of their
    /// distance). What exceeds a limit by more than U fails all the same.
    fn fit(&self, value: &Estimate, decided: Decided) -> Decided {
        let Some(room) = self.room() else {
            return decided;
        };
        let certain = decide(value, self.limits, Decision::FourOutcomes).outcome == Outcome::Fail;
        if certain || decided.outcome == Outcome::NotJudged || at_most(value.expanded, room) {
            return decided;
        }
        Decided {
            outcome: Outcome::NotJudged,
            reason: format!(
                "U is {} {unit}, larger than the {} {unit} that the limit leaves",
                significant(value.expanded, 3),
                significant(room, 3),
                unit = self.unit
            ),
            ..decided
        }
    }

    /// How much the limits leave around the plate's value.
    pub(super) fn room(&self) -> Option<f64> {
        let nominal = self.nominal?;
        match (self.limits.at_least, self.limits.at_most) {
            (Some(low), Some(high)) => Some(0.5 * (high - low)),
            (Some(limit), None) | (None, Some(limit)) => Some((limit - nominal).abs()),
            (None, None) => None,
        }
    }

    /// Decided by the rule.
    pub(super) fn decided(&self, cell: Option<&Cell>, value: &Estimate) -> Finding {
        let decided = self.fit(value, decide(value, self.limits, self.decision));
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
            decision: Some(in_words(self.decision, self.unit)),
            value: twelve_digits(value.value),
            expanded: twelve_digits(value.expanded),
            coverage: twelve_digits(value.coverage),
            budget: value.budget.clone(),
            margin: decided.margin.and_then(twelve_digits),
            probability: decided.probability.and_then(twelve_digits),
            risks: self.risks(value),
            ..self.plainly(cell, decided.outcome, &reason)
        }
    }
}

impl Finding {
    /// Rule, condition and supply, outcome and reason in one line.
    pub(super) fn in_words(&self) -> String {
        let (place, outcome) = (self.place(), self.outcome.word());
        format!("{}{place}: {outcome}: {}", self.rule, self.reason)
    }

    /// The nearest of all passes in words: its margin, and how many U that is.
    pub(super) fn pass_in_words(&self) -> String {
        let (Some(margin), Some(times)) = (self.margin, self.margin_in_u()) else {
            return "every required finding passes".to_owned();
        };
        format!(
            "every required finding passes; the smallest margin is {margin:.2} {}, {times:.1} times U: {}{}",
            self.margin_unit(),
            self.rule,
            self.place()
        )
    }

    /// Margin over U, where there are both.
    pub(super) fn margin_in_u(&self) -> Option<f64> {
        let expanded = self.expanded.filter(|u| *u > 0.0)?;
        self.margin.map(|margin| margin / expanded)
    }

    fn place(&self) -> String {
        let place: Vec<&str> = [&self.condition, &self.supply]
            .into_iter()
            .filter_map(Option::as_deref)
            .collect();
        if place.is_empty() {
            String::new()
        } else {
            format!(" ({})", place.join(", "))
        }
    }
}

/// A number as it is kept: twelve digits, so that 10.8 is not 10.799999999999999 and
/// that any reader of decimals gets the same number back; nothing where it is not finite.
fn twelve_digits(value: f64) -> Option<f64> {
    let rounded = format!("{value:.11e}").parse::<f64>().ok()?;
    rounded.is_finite().then_some(rounded)
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

/// Groups the cells of normal operation by a key, in the order in which keys first come.
pub(super) fn grouped<'a, K: PartialEq>(
    analysis: &'a Analysis,
    keep: impl Fn(&Cell) -> bool,
    key: impl Fn(&Cell) -> K,
) -> Vec<Group<'a>> {
    let mut groups: Vec<(K, Group<'a>)> = Vec::new();
    let normal = |result: &&CellResult| !result.abnormal && keep(&result.cell);
    for result in analysis.cells.iter().filter(normal) {
        let key = key(&result.cell);
        match groups.iter_mut().find(|(known, _)| *known == key) {
            Some((_, group)) => group.push(result),
            None => groups.push((key, vec![result])),
        }
    }
    groups.into_iter().map(|(_, group)| group).collect()
}
