//! Findings of the plan's rules.

use crate::analysis::{
    Analysis, CellResult, Estimate, Figure, Steady, at_voltage, plate_points, points_in_reach,
};
use crate::plan::{Cell, Plan, PlannedRule};
use crate::quantity::{Reading, Watts, at_most};
use crate::spec::plate::{self, PlatePoint};
use crate::spec::sequence::{Decision, RoleKind, RuleKind, Span};

/// A resolution coarser than this share of what the limits leave judges nothing.
const COARSEST: f64 = 0.1;

use super::decision::{Limits, decide};
use super::finding::{Draft, by_position_and_supply, grouped, supply_words, worst};
use super::link;
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
        nominal: None,
        cycling: rule.cycling,
        process: rule.process,
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
        RuleKind::LinkHolding
        | RuleKind::LinkOpening
        | RuleKind::LinkHouse { .. }
        | RuleKind::LinkMaximum => link::findings(&ask, draft),
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
        RuleKind::LinkHouse { below_tf } => {
            format!("thermal link, house limit min(Th, Tf - {below_tf})")
        }
        RuleKind::LinkMaximum => "thermal link, after opening".to_owned(),
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
    pub(super) plan: &'a Plan,
    pub(super) analysis: &'a Analysis,
    pub(super) rule: &'a PlannedRule,
}

impl Ask<'_> {
    pub(super) fn is_for(&self, cell: &Cell) -> bool {
        self.rule.is_for(cell)
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
        let mut draft =
            draft
                .clone()
                .compares(limits, "W", "its input lies outside the band of its plate");
        draft.nominal = Some(0.5 * (point.rated.low.get() + point.rated.high.get()));
        let cells = self.analysis.cells.iter().filter(|result| {
            let cell = &result.cell;
            !result.abnormal
                && cell.position == position
                && self.is_for_condition(cell)
                && points_in_reach(self.plan, cell).contains(&point)
        });
        let away =
            |result: &&CellResult| (result.cell.supply.voltage.get() - point.voltage.get()).abs();
        let nearest = cells
            .clone()
            .map(|r| away(&r))
            .fold(f64::INFINITY, f64::min);
        let found = worst(
            cells
                .filter(|result| at_most(away(result), nearest))
                .map(|result| self.at_plate(&draft, result, point)),
        );
        found.unwrap_or_else(|| {
            let why = format!(
                "it is not run within reach of the plate's {} at {}",
                point.voltage,
                frequencies(point)
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
        if let Some(coarse) = self.too_coarse(draft) {
            return draft.not_judged(cell, &coarse);
        }
        match at_voltage(self.plan, steady, point.voltage.get()) {
            Figure::Known(input) => {
                let input = input.scaled(steady.judged_share(draft.cycling));
                said_extrapolated(draft.decided(cell, &input), result)
            }
            Figure::Absent(reason) => draft.not_judged(cell, &reason),
        }
    }

    /// Why the meter's last digit is too coarse for what the limits leave.
    fn too_coarse(&self, draft: &Draft) -> Option<String> {
        let (_, role) = self.plan.role_of_kind(RoleKind::PowerMeter)?;
        let meter = self.plan.instruments.get(role.instrument)?;
        let digit = meter.driver.accuracy_of(Reading::Power)?.resolution;
        let room = draft.room()?;
        (!at_most(digit, COARSEST * room)).then(|| {
            format!(
                "the meter resolves {}, more than a tenth of the {} that the limit leaves",
                Watts::of(digit),
                Watts::of(room)
            )
        })
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
                (Ok(low), Ok(more)) => {
                    let more = more.power_w.minus(&low.power_w);
                    draft.decided(Some(&high.cell), &more)
                }
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

/// The frequencies of a plate's promise in words.
fn frequencies(point: PlatePoint) -> String {
    let Span { low, high } = point.frequency;
    if low == high {
        low.to_string()
    } else {
        format!("{low} to {high}")
    }
}

/// The settled input of a cell, or why there is none; the reason of a cell that was
/// not run comes first.
fn known_steady(result: &CellResult) -> Result<&Steady, String> {
    if let Figure::Absent(reason) = &result.energised_s {
        return Err(reason.clone());
    }
    match &result.steady {
        Figure::Known(steady) => Ok(steady),
        Figure::Absent(reason) => Err(reason.clone()),
    }
}

fn power(draft: &Draft, result: &CellResult) -> Finding {
    match known_steady(result) {
        Ok(steady) => {
            let power = steady.power_w.scaled(steady.judged_share(draft.cycling));
            said_extrapolated(draft.decided(Some(&result.cell), &power), result)
        }
        Err(reason) => draft.not_judged(Some(&result.cell), &reason),
    }
}

/// A finding whose soak was ended early says so.
pub(super) fn said_extrapolated(finding: Finding, result: &CellResult) -> Finding {
    if !result.steady.known().is_some_and(|s| s.extrapolated) {
        return finding;
    }
    Finding {
        reason: format!("{}; extrapolated: the soak was ended early", finding.reason),
        ..finding
    }
}

/// Why the temperatures of a cell cannot be judged.
pub(super) fn doubt(result: &CellResult) -> Option<String> {
    if let Figure::Absent(reason) = &result.energised_s {
        return Some(reason.clone());
    }
    let first = result.disbelief.first()?;
    Some(format!("the sensors are not believed: {first}"))
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
