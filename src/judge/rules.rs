//! Findings of the plan's rules.

use crate::analysis::{
    Analysis, CellResult, Estimate, Figure, at_voltage, plate_point, plate_points,
};
use crate::plan::{Cell, Plan, PlannedRule};
use crate::spec::plate::{self, PlatePoint};
use crate::spec::sequence::{Decision, RuleKind};

use super::decision::{Limits, decide};
use super::finding::{Draft, by_position_and_supply, grouped, supply_words, worst};
use super::types::{Finding, Outcome};

/// Every finding of one rule: one for each position and supply, of the worst
/// condition where the rule names none. A cell that was not run, or cannot be
/// judged, makes its finding `not judged`, unless another one fails.
pub(super) fn findings(plan: &Plan, analysis: &Analysis, rule: &PlannedRule) -> Vec<Finding> {
    let draft = Draft {
        rule: words(&rule.kind),
        weight: rule.weight,
        decision: rule.decision,
        limits: Limits::default(),
        unit: "",
        source: rule.source.clone(),
        fail_means: String::new(),
    };
    let ask = Ask {
        plan,
        analysis,
        rule,
    };
    match &rule.kind {
        RuleKind::PlatePower => ask.plate_power(draft),
        RuleKind::PowerLimits { at_least, at_most } => {
            let limits = Limits {
                at_least: at_least.map(|watts| watts.get()),
                at_most: at_most.map(|watts| watts.get()),
            };
            ask.each(
                &draft.compares(limits, "W", "its input lies outside the limits"),
                power,
            )
        }
        RuleKind::LinkHolding => ask.link(draft, |link| link.th, "Th, its holding temperature"),
        RuleKind::LinkOpening => {
            ask.link(draft, |link| Some(link.opens_from), "its earliest opening")
        }
        RuleKind::Inrush { at_most } => {
            let limits = upper(at_most.get());
            ask.each(
                &draft.compares(limits, "A", "its inrush is too high"),
                inrush,
            )
        }
        RuleKind::MomentaryInrush { .. }
        | RuleKind::HarmonicsClassA
        | RuleKind::VoltageChange { .. } => super::waveform::findings(&ask, &draft, &rule.kind),
        RuleKind::PositionOrder => ask.order(draft),
        RuleKind::TemperatureRise { role, at_most } => {
            let means = format!("{role} rises too far over ambient");
            let draft = draft.compares(upper(at_most.get()), "K", &means);
            ask.each(&draft, |draft, result| rise(draft, result, role))
        }
    }
}

fn words(kind: &RuleKind) -> String {
    match kind {
        RuleKind::PlatePower => "power against the plate".to_owned(),
        RuleKind::PowerLimits { .. } => "power".to_owned(),
        RuleKind::LinkHolding => "thermal link, holding temperature".to_owned(),
        RuleKind::LinkOpening => "thermal link, earliest opening".to_owned(),
        RuleKind::Inrush { .. } => "inrush".to_owned(),
        RuleKind::MomentaryInrush { .. } => "momentary inrush".to_owned(),
        RuleKind::HarmonicsClassA => "harmonics, class A".to_owned(),
        RuleKind::VoltageChange { .. } => "voltage change".to_owned(),
        RuleKind::PositionOrder => "order of positions".to_owned(),
        RuleKind::TemperatureRise { role, .. } => format!("temperature rise, {role}"),
    }
}

pub(super) fn upper(limit: f64) -> Limits {
    Limits {
        at_least: None,
        at_most: Some(limit),
    }
}

impl Draft {
    pub(super) fn compares(self, limits: Limits, unit: &'static str, fail_means: &str) -> Self {
        Draft {
            limits,
            unit,
            fail_means: fail_means.to_owned(),
            ..self
        }
    }
}

/// One rule asked of a record.
pub(super) struct Ask<'a> {
    plan: &'a Plan,
    analysis: &'a Analysis,
    rule: &'a PlannedRule,
}

impl Ask<'_> {
    fn is_for(&self, cell: &Cell) -> bool {
        let position = self.rule.position.as_ref();
        position.is_none_or(|position| *position == cell.position) && self.is_for_condition(cell)
    }

    fn is_for_condition(&self, cell: &Cell) -> bool {
        let condition = self.rule.condition.as_ref();
        condition.is_none_or(|condition| Some(condition) == cell.condition.as_ref())
    }

    /// One finding for each position and supply that the rule is for.
    pub(super) fn each(
        &self,
        draft: &Draft,
        one: impl Fn(&Draft, &CellResult) -> Finding,
    ) -> Vec<Finding> {
        let findings: Vec<Finding> =
            by_position_and_supply(self.analysis, |cell| self.is_for(cell))
                .into_iter()
                .filter_map(|group| worst(group.into_iter().map(|result| one(draft, result))))
                .collect();
        if findings.is_empty() {
            return vec![self.nowhere(draft)];
        }
        findings
    }

    /// Nothing in the plan is what the rule is for.
    fn nowhere(&self, draft: &Draft) -> Finding {
        Finding {
            position: self.rule.position.clone(),
            condition: self.rule.condition.clone(),
            ..draft.not_judged(None, "the sequence runs nothing that this rule is for")
        }
    }

    // ---- power against the plate ----

    fn plate_power(&self, draft: Draft) -> Vec<Finding> {
        let mut positions: Vec<&str> = Vec::new();
        for entry in &self.plan.appliance.plate {
            let wanted = self.rule.position.as_ref();
            let is_for = wanted.is_none_or(|position| *position == entry.position);
            if is_for && !positions.contains(&entry.position.as_str()) {
                positions.push(&entry.position);
            }
        }
        if positions.is_empty() {
            return vec![self.nowhere(&draft)];
        }
        positions
            .into_iter()
            .flat_map(|position| self.plate_position(&draft, position))
            .collect()
    }

    fn plate_position(&self, draft: &Draft, position: &str) -> Vec<Finding> {
        let points = plate_points(self.plan, position);
        if points.is_empty() {
            let why = "the plate rates only an element in this position, not the whole";
            return vec![draft.not_judged_in(position, why)];
        }
        points
            .into_iter()
            .map(|point| self.plate_point(draft, position, point))
            .collect()
    }

    fn plate_point(&self, draft: &Draft, position: &str, point: PlatePoint) -> Finding {
        let band = plate::limits(self.plan.appliance.kind, point.rated);
        let limits = Limits {
            at_least: band.at_least.map(|watts| watts.get()),
            at_most: Some(band.at_most.get()),
        };
        let draft =
            draft
                .clone()
                .compares(limits, "W", "its input lies outside the band of its plate");
        let cells = self.analysis.cells.iter().filter(|result| {
            let cell = &result.cell;
            cell.position == position
                && self.is_for_condition(cell)
                && plate_point(self.plan, cell) == Some(point)
        });
        let found = worst(cells.map(|result| self.at_plate(&draft, result, point)));
        found.unwrap_or_else(|| {
            let why = format!(
                "it is not run within reach of the plate's {}",
                point.voltage
            );
            draft.not_judged_in(position, &why)
        })
    }

    fn at_plate(&self, draft: &Draft, result: &CellResult, point: PlatePoint) -> Finding {
        let cell = Some(&result.cell);
        let steady = match known_steady(result) {
            Ok(steady) => steady,
            Err(reason) => return draft.not_judged(cell, &reason),
        };
        let (from, to) = (result.cell.supply.voltage.get(), point.voltage.get());
        match at_voltage(self.plan, steady, from, to) {
            Figure::Known(input) => draft.decided(cell, &input),
            Figure::Absent(reason) => draft.not_judged(cell, &reason),
        }
    }

    // ---- thermal link ----

    fn link(
        &self,
        draft: Draft,
        limit: impl Fn(&crate::plan::PlannedLink) -> Option<crate::quantity::Celsius>,
        what: &str,
    ) -> Vec<Finding> {
        let Some(link) = &self.plan.appliance.link else {
            return vec![draft.not_judged(None, "the sequence declares no thermal link")];
        };
        let Some(limit) = limit(link) else {
            return vec![draft.not_judged(
                None,
                "the sequence states no holding temperature from the link's data sheet",
            )];
        };
        let means = format!("the link's body would exceed {what}");
        self.each(&draft.compares(upper(limit.get()), "°C", &means), body)
    }

    // ---- order of positions ----

    /// Each position draws more than the one before it; one finding for each pair of
    /// neighbours, of the condition and supply where they are nearest.
    fn order(&self, draft: Draft) -> Vec<Finding> {
        let is_run = |position: &&String| {
            let cells = &self.analysis.cells;
            cells
                .iter()
                .any(|result| result.cell.position == **position)
        };
        let positions: Vec<&String> = self
            .plan
            .appliance
            .positions
            .iter()
            .filter(is_run)
            .collect();
        if positions.len() < 2 {
            return vec![draft.not_judged(None, "fewer than two positions are run")];
        }
        let limits = Limits {
            at_least: Some(0.0),
            at_most: None,
        };
        positions
            .windows(2)
            .map(|pair| {
                let means = format!(
                    "{} draws no more than {}: the positions are swapped, or an element is open",
                    pair[1], pair[0]
                );
                let mut draft = draft.clone().compares(limits, "W", &means);
                draft.rule = format!("{}, {} before {}", draft.rule, pair[0], pair[1]);
                self.pair(&draft, pair[0], pair[1])
            })
            .collect()
    }

    fn pair(&self, draft: &Draft, low: &str, high: &str) -> Finding {
        let groups = grouped(
            self.analysis,
            |cell| self.is_for_condition(cell),
            |cell| (cell.condition.clone(), supply_words(&cell.supply)),
        );
        let found = groups.into_iter().filter_map(|group| {
            let at = |position: &str| group.iter().find(|r| r.cell.position == position);
            let (low, high) = (at(low)?, at(high)?);
            let finding = match (known_steady(low), known_steady(high)) {
                (Err(reason), _) | (_, Err(reason)) => draft.not_judged(Some(&high.cell), &reason),
                (Ok(low), Ok(more)) => draft.decided(Some(&high.cell), &difference(more, low)),
            };
            Some(Finding {
                rule: draft.rule.clone(),
                position: None,
                ..finding
            })
        });
        worst(found).unwrap_or_else(|| {
            draft.not_judged(
                None,
                "they are not run in the same condition at the same supply",
            )
        })
    }
}

/// A difference of two independent estimates; errors that both share would cancel,
/// so its uncertainty is on the safe side.
fn difference(more: &Estimate, less: &Estimate) -> Estimate {
    Estimate {
        value: more.value - less.value,
        expanded: libm::hypot(more.expanded, less.expanded),
        coverage: more.coverage.max(less.coverage),
        budget: Vec::new(),
    }
}

/// The settled input of a cell, or why there is none; the reason of a cell that was
/// not run comes first.
fn known_steady(result: &CellResult) -> Result<&Estimate, String> {
    if let Figure::Absent(reason) = &result.energised_s {
        return Err(reason.clone());
    }
    match &result.steady {
        Figure::Known(steady) => Ok(&steady.power_w),
        Figure::Absent(reason) => Err(reason.clone()),
    }
}

fn power(draft: &Draft, result: &CellResult) -> Finding {
    match known_steady(result) {
        Ok(power) => draft.decided(Some(&result.cell), power),
        Err(reason) => draft.not_judged(Some(&result.cell), &reason),
    }
}

/// Why the temperatures of a cell cannot be judged.
fn doubt(result: &CellResult) -> Option<String> {
    if let Figure::Absent(reason) = &result.energised_s {
        return Some(reason.clone());
    }
    let first = result.disbelief.first()?;
    Some(format!("the sensors are not believed: {first}"))
}

/// The worst case; where there is none, what was seen still fails if it lies above
/// the limit with certainty, because it can only be lower than the worst case.
fn body(draft: &Draft, result: &CellResult) -> Finding {
    let cell = Some(&result.cell);
    if let Some(doubt) = doubt(result) {
        return draft.not_judged(cell, &doubt);
    }
    let reason = match &result.body_worst {
        Figure::Known(worst) => return draft.decided(cell, worst),
        Figure::Absent(reason) => reason,
    };
    match result.body_peak.known() {
        Some(peak) if certainly_above(&peak.temperature_degc, draft.limits) => {
            let seen = draft.decided(cell, &peak.temperature_degc);
            Finding {
                reason: format!("{}, by what was seen alone", draft.fail_means),
                outcome: Outcome::Fail,
                ..seen
            }
        }
        _ => draft.not_judged(cell, reason),
    }
}

/// Above the limit by more than the uncertainty, whatever the rule's own decision.
pub(super) fn certainly_above(value: &Estimate, limits: Limits) -> bool {
    decide(value, limits, Decision::FourOutcomes).outcome == Outcome::Fail
}

/// From a cold start only. A lower bound can exceed a limit, never meet it.
fn inrush(draft: &Draft, result: &CellResult) -> Finding {
    let cell = Some(&result.cell);
    if let Figure::Absent(reason) = &result.energised_s {
        return draft.not_judged(cell, reason);
    }
    if let Some(reason) = &result.dc_lost {
        return draft.not_judged(cell, reason);
    }
    let inrush = match &result.inrush {
        Figure::Known(inrush) => inrush,
        Figure::Absent(reason) => return draft.not_judged(cell, reason),
    };
    if let Figure::Absent(reason) = &result.cold_start {
        return draft.not_judged(cell, &format!("it was no cold start: {reason}"));
    }
    if let Some(reason) = &inrush.supply_limited {
        return draft.not_judged(cell, &format!("the supply limited it: {reason}"));
    }
    let finding = draft.decided(cell, &inrush.peak_a);
    match inrush.lower_bound.first() {
        Some(reason) if !certainly_above(&inrush.peak_a, draft.limits) => Finding {
            outcome: Outcome::NotJudged,
            probability: None,
            reason: format!("the highest reading is a lower bound only: {reason}"),
            ..finding
        },
        _ => finding,
    }
}

fn rise(draft: &Draft, result: &CellResult, role: &str) -> Finding {
    let cell = Some(&result.cell);
    if let Some(doubt) = doubt(result) {
        return draft.not_judged(cell, &doubt);
    }
    let settled = result.settled_s.reason();
    match result.rises.iter().find(|(name, _)| name == role) {
        None => draft.not_judged(cell, &format!("the bay has no role {role}")),
        Some((_, Figure::Absent(reason))) => draft.not_judged(cell, reason),
        Some((_, Figure::Known(rise))) => match settled {
            Some(reason) if !certainly_above(rise, draft.limits) => {
                let why = format!("the rise still to come is unknown: {reason}");
                draft.not_judged(cell, &why)
            }
            _ => draft.decided(cell, rise),
        },
    }
}
