//! Steps: `each` blocks become cells, and every step is held to whether the unit is
//! energised when it comes.

use std::collections::BTreeSet;

use super::notes::Notes;
use super::types::{Action, Cell, PlannedStep};
use crate::spec::sequence::{Each, RoleKind, Sequence, Step, StepAction, SupplyPoint};
use crate::spec::{Located, Place};

/// More steps than this are a mistake: three axes multiply quickly.
const MOST_STEPS: usize = 20_000;

/// Cells and steps of a sequence.
#[derive(Debug, Default)]
pub(super) struct Expanded {
    pub(super) cells: Vec<Cell>,
    pub(super) steps: Vec<PlannedStep>,
}

impl Expanded {
    /// By cell, whether one of its steps is wanted.
    pub(super) fn cells_with(&self, wanted: impl Fn(&Action) -> bool) -> Vec<bool> {
        let mut with = vec![false; self.cells.len()];
        for step in &self.steps {
            if let Some(cell) = step.cell
                && wanted(&step.action)
            {
                with[cell] = true;
            }
        }
        with
    }
}

/// Expands every step.
pub(super) fn expand(sequence: &Sequence, notes: &mut Notes) -> Expanded {
    let by_switch = sequence
        .roles
        .iter()
        .any(|need| need.kind == RoleKind::PositionSwitch);
    let mut walk = Walk {
        sequence,
        by_switch,
        notes,
        out: Expanded::default(),
        condition: None,
        position: None,
        supply: None,
        cell: None,
        in_each: false,
        energised: false,
    };
    for step in &sequence.steps {
        walk.step(step);
    }
    walk.end_energised();
    let Walk { notes, out, .. } = walk;
    if !out.steps.iter().any(|s| s.action == Action::Energise) && !notes.has_errors() {
        notes.error(
            &sequence.title.place,
            "no step energises the unit: nothing would be measured",
            "write `energise` where the unit is to be switched on",
        );
    }
    out
}

/// What is set while the steps are walked.
struct Walk<'a> {
    sequence: &'a Sequence,
    by_switch: bool,
    notes: &'a mut Notes,
    out: Expanded,
    condition: Option<String>,
    position: Option<String>,
    supply: Option<SupplyPoint>,
    cell: Option<usize>,
    in_each: bool,
    energised: bool,
}

impl Walk<'_> {
    fn add(&mut self, action: Action) {
        let number = self.out.steps.len() as u32 + 1;
        self.out.steps.push(PlannedStep {
            number,
            cell: self.cell,
            action,
        });
    }

    fn step(&mut self, step: &Step) {
        let place = &step.verb.place;
        match &step.action {
            StepAction::Instruct(text) => self.while_off(place, Action::Instruct(text.clone())),
            StepAction::Ask(question) => self.add(Action::Ask(question.clone())),
            StepAction::Acclimatise(waiting) => {
                self.while_off(place, Action::Acclimatise(waiting.clone()));
            }
            StepAction::Rest(waiting) => {
                self.end_energised();
                self.add(Action::Rest(waiting.clone()));
            }
            StepAction::Supply(_) | StepAction::Position(_) | StepAction::Condition(_) => {
                self.set(step);
            }
            StepAction::Energise => self.energise(place),
            StepAction::Deenergise => self.deenergise(place),
            StepAction::Inrush(timed) => {
                self.inrush_is_first(place);
                self.while_on(place, Action::Inrush(timed.clone()));
            }
            StepAction::Measure(timed) => self.while_on(place, Action::Measure(timed.clone())),
            StepAction::RunIn(timed) => self.while_on(place, Action::RunIn(timed.clone())),
            StepAction::Soak(soak) => {
                let action = Action::Soak {
                    at_least: soak.at_least,
                    at_most: soak.at_most,
                    every: soak.every,
                    until: soak.until.clone(),
                    early_finish: soak.early_finish,
                };
                self.while_on(place, action);
            }
            StepAction::Abnormal(abnormal) => {
                let action = Action::Abnormal {
                    fault: abnormal.fault.clone(),
                    length: abnormal.length,
                    every: abnormal.every,
                    body: abnormal.body,
                };
                self.while_on(place, action);
            }
            StepAction::Each(each) => self.each(each, place),
        }
    }

    /// A step that sets one axis of the cells to come.
    fn set(&mut self, step: &Step) {
        if self.in_each {
            return self.notes.error(
                &step.verb.place,
                format!(
                    "`{}` stands in an `each` block, which sets it for every cell",
                    step.verb.value
                ),
                "name it in the block's `conditions:`, `positions:` or `supplies:`, or put the step before the block",
            );
        }
        // What is set from here on belongs to the next cell.
        if !self.energised {
            self.cell = None;
        }
        match &step.action {
            StepAction::Supply(point) => self.set_supply(point),
            StepAction::Position(position) => self.set_position(position),
            StepAction::Condition(condition) => self.set_condition(condition),
            _ => {}
        }
    }

    fn each(&mut self, each: &Each, place: &Place) {
        if self.energised {
            self.notes.error(
                place,
                "`each` begins while the unit is energised",
                "put `de-energise` before it",
            );
        }
        self.end_energised();
        self.cell = None;
        if !self.each_is_sound(each, place) {
            return;
        }
        let unnamed = [None];
        let named: Vec<Option<&Located<String>>> = each.conditions.iter().map(Some).collect();
        let conditions = if named.is_empty() {
            &unnamed[..]
        } else {
            &named[..]
        };
        self.in_each = true;
        for condition in conditions {
            for position in &each.positions {
                for supply in &each.supplies {
                    self.cell_of(each, *condition, position, supply);
                }
            }
        }
        self.in_each = false;
        self.cell = None;
    }

    /// Nothing named twice, and no more cells than anybody can mean.
    fn each_is_sound(&mut self, each: &Each, place: &Place) -> bool {
        for (names, what) in [
            (&each.conditions, "condition"),
            (&each.positions, "position"),
        ] {
            let mut seen = BTreeSet::new();
            for name in names.iter().filter(|name| !seen.insert(&name.value)) {
                self.notes.error(
                    &name.place,
                    format!("the {what} `{}` is listed twice", name.value),
                    "take one out",
                );
            }
        }
        let cells = each
            .conditions
            .len()
            .max(1)
            .saturating_mul(each.positions.len())
            .saturating_mul(each.supplies.len());
        let steps = cells.saturating_mul(each.steps.len() + 4);
        let fits = self.out.steps.len().saturating_add(steps) <= MOST_STEPS;
        if !fits {
            self.notes.error(
                place,
                format!("`each` makes {cells} cells: a plan has at most {MOST_STEPS} steps"),
                "name fewer conditions, positions or supplies",
            );
        }
        fits
    }

    fn cell_of(
        &mut self,
        each: &Each,
        condition: Option<&Located<String>>,
        position: &Located<String>,
        supply: &Located<SupplyPoint>,
    ) {
        let cell = Cell {
            condition: condition
                .map(|c| c.value.clone())
                .or_else(|| self.condition.clone()),
            position: position.value.clone(),
            supply: supply.value,
        };
        self.out.cells.push(cell);
        self.cell = Some(self.out.cells.len() - 1);
        if let Some(condition) = condition
            && self.condition.as_ref() != Some(&condition.value)
        {
            self.set_condition(condition);
        }
        self.set_supply(supply);
        self.set_position(position);
        for step in &each.steps {
            self.step(step);
        }
        self.end_energised();
    }

    fn set_condition(&mut self, condition: &Located<String>) {
        let known = &self.sequence.conditions;
        let Some(found) = known.iter().find(|c| c.name.value == condition.value) else {
            let names: Vec<&str> = known.iter().map(|c| c.name.value.as_str()).collect();
            return self
                .notes
                .unknown(&condition.place, "condition", &condition.value, &names);
        };
        let action = Action::SetCondition {
            condition: condition.value.clone(),
            instruction: found.instruction.clone(),
        };
        self.condition = Some(condition.value.clone());
        self.while_off(&condition.place, action);
    }

    fn set_position(&mut self, position: &Located<String>) {
        let known: Vec<&str> = self
            .sequence
            .appliance
            .positions
            .iter()
            .map(|p| p.value.as_str())
            .collect();
        let Some(index) = known.iter().position(|name| *name == position.value) else {
            return self
                .notes
                .unknown(&position.place, "position", &position.value, &known);
        };
        self.position = Some(position.value.clone());
        let action = Action::SetPosition {
            position: position.value.clone(),
            number: index as u32 + 1,
            by_switch: self.by_switch,
        };
        // By the switch too: a cell's results are of one position.
        self.while_off(&position.place, action);
    }

    fn set_supply(&mut self, supply: &Located<SupplyPoint>) {
        self.supply = Some(supply.value);
        self.while_off(&supply.place, Action::SetSupply(supply.value));
    }

    /// Steps that come only while the unit is off.
    fn while_off(&mut self, place: &Place, action: Action) {
        if self.energised {
            self.notes.error(
                place,
                format!("`{}` comes while the unit is energised", action.verb()),
                "put `de-energise` or a `rest` before it",
            );
        }
        self.add(action);
    }

    /// Steps that come only while the unit is energised.
    fn while_on(&mut self, place: &Place, action: Action) {
        if !self.energised {
            self.notes.error(
                place,
                format!("`{}` comes while the unit is not energised", action.verb()),
                "put `energise` before it",
            );
        }
        self.add(action);
    }

    /// The peak lies in the first moments after energising.
    fn inrush_is_first(&mut self, place: &Place) {
        let before = self.out.steps.last().map(|step| &step.action);
        if self.energised && before != Some(&Action::Energise) {
            self.notes.warning(
                place,
                "the inrush has passed when this step comes",
                "put `inrush` right after `energise`",
            );
        }
    }

    fn energise(&mut self, place: &Place) {
        if self.energised {
            self.notes.error(
                place,
                "the unit is energised already",
                "take this `energise` out",
            );
        }
        if self.cell.is_none() {
            self.open_cell(place);
        }
        self.energised = true;
        self.add(Action::Energise);
    }

    /// Outside `each`, a cell is what was set last.
    fn open_cell(&mut self, place: &Place) {
        let (Some(position), Some(supply)) = (self.position.clone(), self.supply) else {
            return self.notes.error(
                place,
                "the unit is energised before position and supply are set",
                "put `position: ...` and `supply: {voltage: ..., frequency: ...}` before it, or use `each`",
            );
        };
        self.out.cells.push(Cell {
            condition: self.condition.clone(),
            position,
            supply,
        });
        self.cell = Some(self.out.cells.len() - 1);
    }

    fn deenergise(&mut self, place: &Place) {
        if !self.energised {
            self.notes.error(
                place,
                "the unit is not energised here",
                "take this `de-energise` out",
            );
        }
        self.end_energised();
    }

    fn end_energised(&mut self) {
        if self.energised {
            self.add(Action::Deenergise);
            self.energised = false;
        }
    }
}
