//! Each rule against the cells that it is for.

use super::decide::{Limits, decide, severity};
use super::types::{Finding, Outcome};
use crate::analysis::{Analysis, CellResult, Estimate, Figure};
use crate::plan::{Plan, PlannedRule};
use crate::quantity::Reading;
use crate::record::supply_words;
use crate::spec::plate;
use crate::spec::sequence::{Decision, RoleKind, RuleKind, RuleWeight};

/// An input below this share of the plate value does not work at all.
const TENTH: f64 = 0.1;

/// ... nor one below this multiple of the meter's floor.
const FLOORS: f64 = 5.0;

/// A finding of a rule that is not about a limit of the sequence.
pub(super) fn plain(rule: &str, outcome: Outcome, reason: impl Into<String>) -> Finding {
    Finding {
        rule: rule.to_owned(),
        condition: None,
        position: None,
        supply: None,
        weight: RuleWeight::Required,
        outcome,
        value: None,
        expanded: None,
        unit: String::new(),
        at_least: None,
        at_most: None,
        margin: None,
        probability: None,
        source: "house default".to_owned(),
        reason: reason.into(),
    }
}

fn of_cell(mut finding: Finding, cell: &CellResult) -> Finding {
    finding.condition = cell.cell.condition.clone();
    finding.position = Some(cell.cell.position.clone());
    finding.supply = Some(supply_words(&cell.cell));
    finding
}

/// It works at all: before any band, because up to 25 W there is no lower limit.
pub(super) fn works(plan: &Plan, analysis: &Analysis) -> Vec<Finding> {
    let cells = analysis.cells.iter().enumerate();
    let all = cells.map(|(n, cell)| of_cell(works_in(plan, n, cell), cell));
    worst_by_place(all.collect())
}

fn works_in(plan: &Plan, number: usize, cell: &CellResult) -> Finding {
    let rule = format!("works at all, position {}", cell.cell.position);
    let limit = least_input(plan, number, cell);
    let drawn = match (&cell.energised_s, &cell.drawn_w) {
        (Figure::Absent(_), _) => return plain(&rule, Outcome::NotJudged, "this position was not run"),
        (_, Figure::Absent(reason)) => return plain(&rule, Outcome::NotJudged, reason.clone()),
        (_, Figure::Known(drawn)) => *drawn,
    };
    let mut finding = if cell.went_open {
        plain(&rule, Outcome::Fail, "the current vanished while energised: the link, an element or the switch opened")
    } else if drawn < limit {
        let reason = format!("it draws {drawn:.3} W, less than {limit:.3} W: an open link, element, cord or switch");
        plain(&rule, Outcome::Fail, reason)
    } else {
        plain(&rule, Outcome::Pass, "")
    };
    finding.value = Some(drawn);
    finding.unit = "W".to_owned();
    finding.at_least = Some(limit);
    finding.margin = Some(drawn - limit);
    finding.source = "house default: a tenth of the plate value and five times the meter's floor".to_owned();
    finding
}

fn least_input(plan: &Plan, number: usize, cell: &CellResult) -> f64 {
    let rated = plan.rated_in(&cell.cell).map(|rated| rated.power.low.get());
    // An unrated position is measured by what its guard allows.
    let expected = rated.or_else(|| plan.guards.input.get(number).map(|w| w.get() / 1.3));
    let meter = plan.role_of_kind(RoleKind::PowerMeter).map(|(_, role)| plan.instrument_of(role));
    let floor = meter.and_then(|m| m.driver.accuracy_of(Reading::Power)).map_or(0.0, |a| a.floor);
    (TENTH * expected.unwrap_or(0.0)).max(FLOORS * floor)
}

/// The watched sensors are believable.
pub(super) fn believable(analysis: &Analysis) -> Vec<Finding> {
    let judged = analysis.cells.iter().map(|cell| {
        let rule = format!("body sensor is believable, position {}", cell.cell.position);
        let finding = match (cell.disbelief.first(), &cell.energised_s) {
            (Some(why), _) => plain(&rule, Outcome::NotJudged, why.clone()),
            (None, Figure::Absent(_)) => plain(&rule, Outcome::NotJudged, "this position was not run"),
            (None, Figure::Known(_)) => plain(&rule, Outcome::Pass, ""),
        };
        of_cell(finding, cell)
    });
    worst_by_place(judged.collect())
}

/// Every finding of one rule of the sequence.
pub(super) fn judge_rule(plan: &Plan, rule: &PlannedRule, analysis: &Analysis) -> Vec<Finding> {
    if rule.kind == RuleKind::PositionOrder {
        return order(plan, rule, analysis);
    }
    let cells = analysis.cells.iter().filter(|cell| is_for(plan, rule, cell));
    let findings = cells.map(|cell| of_cell(in_cell(plan, rule, cell), cell));
    worst_by_place(findings.collect())
}

fn is_for(plan: &Plan, rule: &PlannedRule, cell: &CellResult) -> bool {
    let position = rule.position.as_ref().is_none_or(|p| *p == cell.cell.position);
    let condition = rule.condition.as_ref().is_none_or(|c| Some(c) == cell.cell.condition.as_ref());
    let rated = rule.kind != RuleKind::PlatePower || plan.rated_in(&cell.cell).is_some();
    position && condition && rated
}

/// What a rule compares in a cell.
struct Compared<'a> {
    name: String,
    value: Figure<&'a Estimate>,
    limits: Limits,
    unit: &'static str,
}

fn in_cell(plan: &Plan, rule: &PlannedRule, cell: &CellResult) -> Finding {
    let compared = compared(plan, rule, cell);
    let mut finding = plain(&compared.name, Outcome::NotJudged, "");
    finding.weight = rule.weight;
    finding.source = rule.source.clone();
    finding.unit = compared.unit.to_owned();
    finding.at_least = compared.limits.at_least;
    finding.at_most = compared.limits.at_most;
    match compared.value {
        Figure::Absent(reason) => finding.reason = reason,
        Figure::Known(estimate) => {
            fill(&mut finding, estimate, compared.limits, rule.decision);
            if let (RuleKind::Inrush { .. }, Some(inrush)) = (&rule.kind, cell.inrush.known()) {
                lower_bound_only(&mut finding, &inrush.lower_bound);
            }
        }
    }
    finding
}

fn fill(finding: &mut Finding, estimate: &Estimate, limits: Limits, decision: Decision) {
    let decided = decide(estimate, limits, decision);
    finding.value = Some(estimate.value);
    finding.expanded = Some(estimate.expanded);
    finding.margin = decided.margin;
    finding.probability = decided.probability;
    finding.outcome = decided.outcome;
    finding.reason = decided.reason.unwrap_or_else(|| in_words(finding, estimate));
}

/// The comparison as a sentence.
fn in_words(finding: &Finding, estimate: &Estimate) -> String {
    let (unit, difference) = (&finding.unit, finding.margin_unit());
    let Some(margin) = finding.margin else { return String::new() };
    let side = if margin < 0.0 { "beyond" } else { "within" };
    format!(
        "{:.3} {unit} with U {:.3} {difference} lies {side} its limit by {:.3} {difference}, {:.1} times U",
        estimate.value,
        estimate.expanded,
        margin.abs(),
        if estimate.expanded > 0.0 { margin.abs() / estimate.expanded } else { f64::INFINITY }
    )
}

/// A lower bound can only show that a limit is exceeded.
fn lower_bound_only(finding: &mut Finding, reasons: &[String]) {
    let exceeded = finding.margin.is_some_and(|margin| margin < 0.0);
    if let (Some(reason), false) = (reasons.first(), exceeded) {
        finding.outcome = Outcome::NotJudged;
        finding.probability = None;
        finding.reason = format!("a lower bound only: {reason}");
    }
}

fn compared<'a>(plan: &Plan, rule: &PlannedRule, cell: &'a CellResult) -> Compared<'a> {
    let position = &cell.cell.position;
    let link = plan.appliance.link.as_ref();
    match &rule.kind {
        RuleKind::PlatePower => Compared {
            name: format!("power by the plate, position {position}"),
            value: power_of(cell),
            limits: plan.rated_in(&cell.cell).map_or_else(Limits::default, |rated| {
                let band = plate::limits(plan.appliance.kind, rated.power);
                Limits { at_least: band.at_least.map(|w| w.get()), at_most: Some(band.at_most.get()) }
            }),
            unit: "W",
        },
        RuleKind::PowerLimits { at_least, at_most } => Compared {
            name: format!("power by limits, position {position}"),
            value: power_of(cell),
            limits: Limits { at_least: at_least.map(|w| w.get()), at_most: at_most.map(|w| w.get()) },
            unit: "W",
        },
        RuleKind::LinkHolding => Compared {
            name: format!("thermal link holds, position {position}"),
            value: worst_body(cell),
            limits: Limits { at_least: None, at_most: link.and_then(|l| l.th).map(|th| th.get()) },
            unit: "°C",
        },
        RuleKind::LinkOpening => Compared {
            name: format!("thermal link's earliest opening, position {position}"),
            value: worst_body(cell),
            limits: Limits { at_least: None, at_most: link.map(|l| l.opens_from.get()) },
            unit: "°C",
        },
        RuleKind::Inrush { at_most } => Compared {
            name: format!("inrush, position {position}"),
            value: inrush_of(cell),
            limits: Limits { at_least: None, at_most: Some(at_most.get()) },
            unit: "A",
        },
        RuleKind::TemperatureRise { role, at_most } => Compared {
            name: format!("rise of {role}, position {position}"),
            value: rise_of(cell, role),
            limits: Limits { at_least: None, at_most: Some(at_most.get()) },
            unit: "K",
        },
        // Judged over positions, not within one.
        RuleKind::PositionOrder => Compared {
            name: String::new(),
            value: Figure::Absent(String::new()),
            limits: Limits::default(),
            unit: "W",
        },
    }
}

fn absent<'a>(cell: &CellResult, reason: &str) -> Figure<&'a Estimate> {
    match &cell.energised_s {
        Figure::Absent(_) => Figure::Absent("this position was not run".to_owned()),
        Figure::Known(_) => Figure::Absent(reason.to_owned()),
    }
}

fn power_of(cell: &CellResult) -> Figure<&Estimate> {
    match &cell.steady {
        Figure::Known(steady) => Figure::Known(&steady.power_w),
        Figure::Absent(reason) => absent(cell, reason),
    }
}

/// Doubt about the sensor is doubt about every temperature.
fn worst_body(cell: &CellResult) -> Figure<&Estimate> {
    match (cell.disbelief.first(), &cell.body_worst) {
        (Some(why), _) => absent(cell, &format!("the body's sensor is not believed: {why}")),
        (None, Figure::Known(worst)) => Figure::Known(worst),
        (None, Figure::Absent(reason)) => absent(cell, reason),
    }
}

fn rise_of<'a>(cell: &'a CellResult, role: &str) -> Figure<&'a Estimate> {
    match cell.rises.iter().find(|(name, _)| name == role) {
        Some((_, Figure::Known(rise))) => Figure::Known(rise),
        Some((_, Figure::Absent(reason))) => absent(cell, reason),
        None => absent(cell, "the role was not read"),
    }
}

/// Only from a cold start, and only where the supply did not limit it.
fn inrush_of(cell: &CellResult) -> Figure<&Estimate> {
    match (&cell.inrush, &cell.cold_start) {
        (Figure::Absent(reason), _) => absent(cell, reason),
        (_, Figure::Absent(reason)) => absent(cell, &format!("not from a cold start: {reason}")),
        (Figure::Known(inrush), Figure::Known(())) => match &inrush.supply_limited {
            Some(why) => absent(cell, &format!("limited by the supply: {why}")),
            None => Figure::Known(&inrush.peak_a),
        },
    }
}

/// The input rises in the declared order: each position above the one before.
fn order(plan: &Plan, rule: &PlannedRule, analysis: &Analysis) -> Vec<Finding> {
    let mut findings = Vec::new();
    for pair in plan.appliance.positions.windows(2) {
        for lower in analysis.cells.iter().filter(|cell| cell.cell.position == pair[0]) {
            let twin = analysis.cells.iter().find(|cell| {
                cell.cell.position == pair[1]
                    && cell.cell.condition == lower.cell.condition
                    && cell.cell.supply == lower.cell.supply
            });
            findings.extend(twin.map(|higher| above(rule, lower, higher)));
        }
    }
    worst_by_place(findings)
}

fn above(rule: &PlannedRule, lower: &CellResult, higher: &CellResult) -> Finding {
    let name = format!("order of positions, {} below {}", lower.cell.position, higher.cell.position);
    let mut finding = of_cell(plain(&name, Outcome::NotJudged, ""), higher);
    finding.weight = rule.weight;
    finding.source = rule.source.clone();
    finding.unit = "W".to_owned();
    let limits = Limits { at_least: Some(0.0), at_most: None };
    finding.at_least = limits.at_least;
    match (power_of(lower), power_of(higher)) {
        (Figure::Known(low), Figure::Known(high)) => {
            let difference = Estimate {
                value: high.value - low.value,
                expanded: low.expanded.hypot(high.expanded),
                coverage: low.coverage.max(high.coverage),
                budget: Vec::new(),
            };
            fill(&mut finding, &difference, limits, rule.decision);
            if finding.outcome == Outcome::Fail {
                finding.reason = format!(
                    "`{}` draws less than `{}`: the positions are swapped, or an element is missing",
                    higher.cell.position, lower.cell.position
                );
            }
        }
        (Figure::Absent(reason), _) | (_, Figure::Absent(reason)) => finding.reason = reason,
    }
    finding
}

/// Of findings that differ only in their condition, the worst; it names its condition.
fn worst_by_place(findings: Vec<Finding>) -> Vec<Finding> {
    let mut kept: Vec<Finding> = Vec::new();
    for finding in findings {
        let same = |other: &&mut Finding| {
            other.rule == finding.rule && other.position == finding.position && other.supply == finding.supply
        };
        match kept.iter_mut().find(same) {
            Some(other) if worse(&finding, other) => *other = finding,
            Some(_) => {}
            None => kept.push(finding),
        }
    }
    kept
}

fn worse(a: &Finding, b: &Finding) -> bool {
    let margin = |f: &Finding| f.margin.unwrap_or(f64::INFINITY);
    match severity(a.outcome).cmp(&severity(b.outcome)) {
        std::cmp::Ordering::Greater => true,
        std::cmp::Ordering::Less => false,
        std::cmp::Ordering::Equal => margin(a) < margin(b),
    }
}
