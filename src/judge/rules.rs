//! Findings of the plan's rules.

use crate::analysis::{
    Analysis, CellResult, Estimate, Figure, Opening, Steady, at_voltage, plate_points,
    points_in_reach,
};
use crate::plan::{Cell, Plan, PlannedLink, PlannedRule};
use crate::quantity::{Celsius, Reading, Volts, Watts, at_most};
use crate::spec::plate::{self, PlatePoint};
use crate::spec::sequence::{Decision, MeasuredAt, RoleKind, RuleKind, Span};

/// A resolution coarser than this share of what the limits leave judges nothing.
const COARSEST: f64 = 0.1;

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
        RuleKind::LinkHolding => ask.link(draft, |link| link.th, "Th, its holding temperature"),
        RuleKind::LinkOpening => {
            ask.link(draft, |link| Some(link.opens_from), "its earliest opening")
        }
        RuleKind::LinkHouse { below_tf } => {
            let below = |link: &PlannedLink| link.tf.get() - below_tf.get();
            let limit =
                |link: &PlannedLink| link.th.map(|th| Celsius::of(th.get().min(below(link))));
            ask.link(draft, limit, "the house limit for it")
        }
        RuleKind::LinkMaximum => ask.opening(draft),
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
                let judged = steady.judged_w(draft.cycling).value / steady.power_w.value;
                let input = if judged.is_finite() {
                    input.scaled(judged)
                } else {
                    input
                };
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

    // ---- thermal link ----

    fn link(
        &self,
        draft: Draft,
        limit: impl Fn(&PlannedLink) -> Option<Celsius>,
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
        if let MeasuredAt::OutsideOnly { place, limit } = &link.measured_at {
            return self.outside_only(draft, place, *limit);
        }
        let means = format!("the link's body would exceed {what}");
        let draft = draft.compares(upper(limit.get()), "°C", &means);
        let mut findings = self.each(&draft, body);
        findings.extend(self.ends_not_run(&draft));
        findings
    }

    /// The link itself cannot be reached: a house limit for the outside, which says so.
    fn outside_only(&self, draft: Draft, place: &str, limit: Celsius) -> Vec<Finding> {
        let mut draft = draft.compares(
            upper(limit.get()),
            "°C",
            &format!("{place} exceeds the house limit; the link itself was not measured"),
        );
        draft.rule = format!("{place}, in place of the thermal link");
        draft.source = "house limit; the link was not measured".to_owned();
        self.each(&draft, body)
    }

    /// A fan runs slower at one end of the supply range and the heater hotter at the
    /// other: each position of such a unit is run at both, or it is not judged.
    fn ends_not_run(&self, draft: &Draft) -> Vec<Finding> {
        if !self.plan.appliance.fan {
            return Vec::new();
        }
        let groups = grouped(
            self.analysis,
            |cell| self.is_for(cell),
            |cell| (cell.position.clone(), cell.condition.clone()),
        );
        groups
            .into_iter()
            .filter_map(|group| {
                let position = &group.first()?.cell.position;
                let appliance = &self.plan.appliance;
                let (low, high) = appliance.supply_ends(position);
                let is_run = |end: Volts| {
                    let mut cells = group.iter().map(|result| &result.cell);
                    cells.any(|cell| appliance.is_at_end(cell, end))
                };
                let ends = if low == high { vec![low] } else { vec![low, high] };
                let missing: Vec<String> = ends
                    .into_iter()
                    .filter(|end| !is_run(*end))
                    .map(|end| end.to_string())
                    .collect();
                let why = format!(
                    "a unit with a fan is run at both ends of its supply range, and it is not run at {}",
                    missing.join(" and ")
                );
                (!missing.is_empty()).then(|| draft.not_judged(Some(&group[0].cell), &why))
            })
            .collect()
    }

    /// The link that opened in an `abnormal` step, against Tm.
    fn opening(&self, draft: Draft) -> Vec<Finding> {
        let tm = self.plan.appliance.link.as_ref().and_then(|link| link.tm);
        let Some(tm) = tm else {
            let why = "the sequence states no maximum limit Tm from the link's data sheet";
            return vec![draft.not_judged(None, why)];
        };
        let draft = draft.compares(upper(tm.get()), "°C", "the opened link exceeded Tm");
        if self.analysis.openings.is_empty() {
            return vec![draft.not_judged(None, "the sequence runs no `abnormal` step")];
        }
        self.analysis
            .openings
            .iter()
            .map(|opening| opened(&draft, opening))
            .collect()
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

/// A link that opened, or did not, in one `abnormal` step.
fn opened(draft: &Draft, opening: &Opening) -> Finding {
    let mut draft = draft.clone();
    draft.rule = format!("{}, {}", draft.rule, opening.fault);
    match (&opening.peak_degc, &opening.closed_again_s) {
        (Figure::Known(_), Some(after)) => draft.plainly(
            None,
            Outcome::Fail,
            &format!("the link closed again {after:.0} s after it had opened"),
        ),
        (Figure::Known(peak), None) => draft.decided(None, peak),
        (Figure::Absent(reason), _) => draft.not_judged(None, reason),
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
            let power = steady.judged_w(draft.cycling);
            said_extrapolated(draft.decided(Some(&result.cell), &power), result)
        }
        Err(reason) => draft.not_judged(Some(&result.cell), &reason),
    }
}

/// A finding whose soak was ended early says so.
fn said_extrapolated(finding: Finding, result: &CellResult) -> Finding {
    if !result.steady.known().is_some_and(|s| s.extrapolated) {
        return finding;
    }
    Finding {
        reason: format!("{}; extrapolated: the soak was ended early", finding.reason),
        ..finding
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
        Figure::Known(worst) => return said_extrapolated(draft.decided(cell, worst), result),
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
