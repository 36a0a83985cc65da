//! Rules with their names resolved, and whether the steps can feed them.

use super::expand::Expanded;
use super::notes::Notes;
use super::reference::{rated_in, rated_points};
use super::resolve::written_steps;
use super::types::{Action, Cell, PlannedAppliance, PlannedRule};
use super::words::span;
use crate::quantity::at_most;
use crate::spec::Place;
use crate::spec::plate::CORRECTABLE;
use crate::spec::sequence::{
    CyclingRule, MeasuredAt, RoleKind, Rule, RuleKind, Sequence, StepAction,
};

/// Where the limits of a rule come from, where the sequence does not say.
fn usual_source(kind: &RuleKind) -> &'static str {
    match kind {
        RuleKind::PlatePower => {
            "IEC 60335-1 clause 10.1 (from memory of later editions, check against your copy)"
        }
        RuleKind::LinkHolding => "IEC 60691: holding temperature Th of the part's data sheet",
        RuleKind::LinkOpening => "IEC 60691: Tf - 10 K, earliest opening",
        RuleKind::LinkHouse { .. } => "house limit: the lower of Th and Tf less a distance",
        RuleKind::LinkMaximum => "IEC 60691: maximum limit Tm of the part's data sheet",
        RuleKind::PositionOrder => "the declared order of positions",
        RuleKind::HarmonicsClassA => "IEC 61000-3-2 class A, on one switch-on: an indication",
        RuleKind::VoltageChange { .. } => {
            "IEC 61000-3-3 with 0.40 + j0.25 ohm (from memory, check against your copy), on one switch-on: an indication"
        }
        RuleKind::PowerLimits { .. }
        | RuleKind::Inrush { .. }
        | RuleKind::MomentaryInrush { .. }
        | RuleKind::TemperatureRise { .. } => "house limit",
    }
}

/// Resolves every rule.
pub(super) fn rules(
    sequence: &Sequence,
    appliance: &PlannedAppliance,
    expanded: &Expanded,
    notes: &mut Notes,
) -> Vec<PlannedRule> {
    let cells = Fed {
        cells: &expanded.cells,
        soaked: expanded.cells_with(|action| matches!(action, Action::Soak { .. })),
        inrush: expanded.cells_with(|action| matches!(action, Action::Inrush(_))),
        abnormal: expanded.cells_with(|action| matches!(action, Action::Abnormal { .. })),
        waveform: expanded.cells_with(|action| matches!(action, Action::Inrush(t) if t.waveform)),
    };
    let planned: Vec<PlannedRule> = sequence.rules.iter().map(planned).collect();
    for (rule, written) in planned.iter().zip(&sequence.rules) {
        if names_known(sequence, written, notes) {
            cells.can_feed(appliance, rule, &written.kind.place, notes);
        }
        link_known(sequence, written, notes);
        fits_the_load(sequence, written, notes);
    }
    planned
}

/// One rule as the plan keeps it.
pub(super) fn planned(rule: &Rule) -> PlannedRule {
    PlannedRule {
        kind: rule.kind.value.clone(),
        decision: rule.decision,
        weight: rule.weight,
        position: rule.position.as_ref().map(|p| p.value.clone()),
        condition: rule.condition.as_ref().map(|c| c.value.clone()),
        source: rule
            .source
            .clone()
            .unwrap_or_else(|| usual_source(&rule.kind.value).to_owned()),
        process: rule.process,
        cycling: rule.cycling,
    }
}

/// A choice between inputs of a load that does not cycle, and a temperature that nobody
/// follows to its end, are warned of.
fn fits_the_load(sequence: &Sequence, rule: &Rule, notes: &mut Notes) {
    let place = &rule.kind.place;
    let chosen = rule.cycling == CyclingRule::RepresentativePeriod;
    if chosen && !sequence.appliance.facts.thermostat {
        notes.warning(
            place,
            "the rule of a representative period is for a load that cycles, and no thermostat is declared",
            "write `thermostat: yes` below `facts:`, or take `cycling` out",
        );
    }
    let early = written_steps(sequence)
        .any(|step| matches!(&step.action, StepAction::Soak(soak) if soak.early_finish));
    if early && matches!(&rule.kind.value, RuleKind::TemperatureRise { role, .. } if role != "body")
    {
        notes.warning(
            place,
            "a soak may finish early, and this temperature is not followed to its end: then the rule will be not judged",
            "take `early finish` out of the soak, or this rule",
        );
    }
}

fn names_known(sequence: &Sequence, rule: &Rule, notes: &mut Notes) -> bool {
    let positions = sequence.appliance.positions.iter();
    let conditions = sequence.conditions.iter().map(|c| &c.name);
    let mut all_known = true;
    let mut must_be = |place: &Place, what: &str, name: &str, known: Vec<&str>| {
        if !known.contains(&name) {
            notes.unknown(place, what, name, &known);
            all_known = false;
        }
    };
    if let Some(position) = &rule.position {
        let known = positions.map(|p| p.value.as_str()).collect();
        must_be(&position.place, "position", &position.value, known);
    }
    if let Some(condition) = &rule.condition {
        let known = conditions.map(|c| c.value.as_str()).collect();
        must_be(&condition.place, "condition", &condition.value, known);
    }
    if let RuleKind::TemperatureRise { role, .. } = &rule.kind.value {
        let temperatures = sequence
            .roles
            .iter()
            .filter(|need| need.kind == RoleKind::Temperature);
        let known = temperatures.map(|need| need.name.value.as_str()).collect();
        must_be(&rule.kind.place, "temperature role", role, known);
    }
    all_known
}

/// What the cells are fed with.
struct Fed<'a> {
    cells: &'a [Cell],
    soaked: Vec<bool>,
    inrush: Vec<bool>,
    abnormal: Vec<bool>,
    waveform: Vec<bool>,
}

impl Fed<'_> {
    fn can_feed(
        &self,
        appliance: &PlannedAppliance,
        rule: &PlannedRule,
        place: &Place,
        notes: &mut Notes,
    ) {
        let plate = &appliance.plate;
        let for_it = |cell: &Cell| {
            rule.is_for(cell)
                && (rule.kind != RuleKind::PlatePower || rated_in(plate, cell).is_some())
        };
        match &rule.kind {
            RuleKind::PlatePower if plate.is_empty() => notes.error(
                place,
                "the appliance has no rating plate to judge by",
                "add entries below `plate:`",
            ),
            RuleKind::PositionOrder => self.in_order(appliance, rule, place, notes),
            _ if self.cells.is_empty() => {}
            _ if !self.cells.iter().any(for_it) => notes.warning(
                place,
                "no step runs what this rule is for: it will be not judged",
                "run its position and condition, or take the rule out",
            ),
            RuleKind::PlatePower | RuleKind::PowerLimits { .. } => self.every_cell(
                &self.soaked,
                for_it,
                Lack {
                    anywhere: "no step soaks the unit: its settled power is never known",
                    somewhere: "no step soaks the unit",
                    hint: "add a `soak` step after `energise`",
                },
                place,
                notes,
            ),
            RuleKind::Inrush { .. } => self.every_cell(
                &self.inrush,
                for_it,
                Lack {
                    anywhere: "no step captures the inrush",
                    somewhere: "no step captures the inrush",
                    hint: "add an `inrush` step right after `energise`",
                },
                place,
                notes,
            ),
            RuleKind::LinkHolding | RuleKind::LinkOpening | RuleKind::LinkHouse { .. } => {
                self.both_ends(appliance, rule, place, notes);
            }
            RuleKind::LinkMaximum if !self.abnormal.contains(&true) => notes.warning(
                place,
                "no step runs the unit with a fault until its link opens: this rule will be not judged",
                "add an `abnormal` step, or take this rule out",
            ),
            RuleKind::MomentaryInrush { .. }
            | RuleKind::HarmonicsClassA
            | RuleKind::VoltageChange { .. } => self.every_cell(
                &self.waveform,
                for_it,
                Lack {
                    anywhere: "no step takes a waveform",
                    somewhere: "no step takes a waveform",
                    hint: "write `waveform: yes` in the `inrush` step",
                },
                place,
                notes,
            ),
            RuleKind::LinkMaximum | RuleKind::TemperatureRise { .. } => {}
        }
    }

    /// An error where no cell of the rule is fed, a warning for the first that is not.
    fn every_cell(
        &self,
        fed: &[bool],
        for_it: impl Fn(&Cell) -> bool,
        lack: Lack,
        place: &Place,
        notes: &mut Notes,
    ) {
        let mut of_rule = self.cells.iter().zip(fed).filter(|(cell, _)| for_it(cell));
        if !of_rule.clone().any(|(_, fed)| *fed) {
            notes.error(place, lack.anywhere, lack.hint);
        } else if let Some((cell, _)) = of_rule.find(|(_, fed)| !**fed) {
            let what = format!(
                "{} in {}: there the rule will be not judged",
                lack.somewhere,
                cell.words()
            );
            notes.warning(place, what, lack.hint);
        }
    }

    /// A unit with a fan is run at both ends of its supply range.
    fn both_ends(
        &self,
        appliance: &PlannedAppliance,
        rule: &PlannedRule,
        place: &Place,
        notes: &mut Notes,
    ) {
        if !appliance.fan {
            return;
        }
        for position in &appliance.positions {
            let of_it = |cell: &&Cell| cell.position == *position && rule.is_for(cell);
            if !self.cells.iter().any(|cell| of_it(&cell)) {
                continue;
            }
            let (low, high) = appliance.supply_ends(position);
            for end in [low, high] {
                let at_end = |cell: &&Cell| appliance.is_at_end(cell, end);
                if !self.cells.iter().filter(of_it).any(|cell| at_end(&cell)) {
                    return notes.warning(
                        place,
                        format!(
                            "a unit with a fan is run at both ends of its supply range, and no step runs `{position}` at {end}: this rule will be not judged"
                        ),
                        format!("add a supply of {end}, or state the `supply range:` in which it may be used"),
                    );
                }
            }
        }
    }

    fn in_order(
        &self,
        appliance: &PlannedAppliance,
        rule: &PlannedRule,
        place: &Place,
        notes: &mut Notes,
    ) {
        if appliance.positions.len() < 2 {
            return notes.error(
                place,
                "there is only one position: nothing can be in order",
                "take this rule out",
            );
        }
        let soaked: Vec<&Cell> = self
            .cells
            .iter()
            .zip(&self.soaked)
            .filter(|(cell, soaked)| **soaked && rule.is_for(cell))
            .map(|(cell, _)| cell)
            .collect();
        let comparable = soaked.iter().any(|a| {
            soaked.iter().any(|b| {
                a.position != b.position && a.condition == b.condition && a.supply == b.supply
            })
        });
        if !comparable && !self.cells.is_empty() {
            notes.warning(
                place,
                "no two positions are soaked in the same condition at the same supply: their order will be not judged",
                "run every position in one `each` block",
            );
        }
    }
}

/// What cells lack.
struct Lack {
    anywhere: &'static str,
    somewhere: &'static str,
    hint: &'static str,
}

fn link_known(sequence: &Sequence, rule: &Rule, notes: &mut Notes) {
    let (needs_th, needs_tm) = match rule.kind.value {
        RuleKind::LinkHolding | RuleKind::LinkHouse { .. } => (true, false),
        RuleKind::LinkOpening => (false, false),
        RuleKind::LinkMaximum => (false, true),
        _ => return,
    };
    let Some(link) = &sequence.appliance.link else {
        return notes.error(
            &rule.kind.place,
            "the appliance states no thermal link",
            "add `thermal link:` with Tf and Th from the part's data sheet, or take this rule out",
        );
    };
    if link.tm.is_none() && needs_tm {
        notes.error(
            &link.tf.place,
            "the thermal link states no Tm, its maximum limit after opening",
            "add `Tm:` from the part's data sheet below `thermal link:`",
        );
    }
    if link.th.is_none() && needs_th {
        notes.error(
            &link.tf.place,
            "the thermal link states no Th: its holding temperature lies anywhere from 13 to 45 K below Tf",
            "add `Th:` from the part's data sheet below `thermal link:`",
        );
    }
    if let MeasuredAt::Elsewhere {
        place,
        allowance: None,
        ..
    } = &link.measured_at
    {
        notes.warning(
            &link.tf.place,
            format!(
                "the temperature is measured at {place}, and nothing says how much hotter the link may be: its margins will be not judged"
            ),
            "add `allowance:` and `allowance source:`, or measure at the link's body",
        );
    }
    if let MeasuredAt::Elsewhere {
        place,
        self_heating: None,
        ..
    } = &link.measured_at
    {
        notes.warning(
            &link.tf.place,
            format!(
                "the temperature is measured at {place}, and nothing says how far the link heats itself: its margins will be not judged"
            ),
            "add `self-heating: {rise: ..., at: ...}` from the part's data sheet (I2 Rth), or measure at the link's body",
        );
    }
}

/// Every position, every rated position, and every voltage at which the plate is judged.
pub(super) fn every_rating_is_run(
    sequence: &Sequence,
    appliance: &PlannedAppliance,
    expanded: &Expanded,
    notes: &mut Notes,
) {
    let cells = &expanded.cells;
    if cells.is_empty() {
        return;
    }
    let is_run = |position: &str| cells.iter().any(|cell| cell.position == position);
    for position in &sequence.appliance.positions {
        if !is_run(&position.value) {
            notes.warning(
                &position.place,
                format!(
                    "no step runs the position `{}`: the unit will be not judged",
                    position.value
                ),
                "add it to the `positions:` of an `each` block",
            );
        }
    }
    for (entry, written) in appliance.plate.iter().zip(&sequence.appliance.plate) {
        if entry.element.is_some() || !is_run(&entry.position) {
            continue;
        }
        for rated in rated_points(entry, appliance.fan) {
            let volts = rated.voltage.get();
            let reached = cells.iter().any(|cell| {
                let away = (cell.supply.voltage.get() - volts).abs();
                cell.position == entry.position
                    && at_most(away, CORRECTABLE * volts)
                    && rated.has_frequency(cell.supply.frequency)
            });
            if !reached {
                notes.warning(
                    &written.voltage.place,
                    format!(
                        "no step runs the position `{}` near {} at {}, where this entry is judged: it will be not judged",
                        entry.position, rated.voltage, span(rated.frequency)
                    ),
                    format!("add a supply of {} at {}", rated.voltage, span(rated.frequency)),
                );
            }
        }
    }
    for condition in &sequence.conditions {
        let name = &condition.name;
        if !cells
            .iter()
            .any(|c| c.condition.as_ref() == Some(&name.value))
        {
            notes.warning(
                &name.place,
                format!("no step is run in the condition `{}`", name.value),
                "add it to the `conditions:` of an `each` block, or take it out",
            );
        }
    }
}
