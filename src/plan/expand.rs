//! Steps: `each` blocks become cells, and every step is held to whether the unit is
//! energised when it comes.

use super::notes::Notes;
use super::types::{Action, Cell, PlannedStep};
use crate::quantity::Seconds;
use crate::spec::sequence::{Each, RoleKind, Sequence, Step, StepAction, SupplyPoint};
use crate::spec::{Located, Place};

/// Longest polling interval while energised: a slower one would trip too late (house default).
const SLOWEST_ENERGISED: Seconds = Seconds::whole(10);

/// Cells and steps of a sequence.
#[derive(Debug, Default)]
pub(super) struct Expanded {
    pub(super) cells: Vec<Cell>,
    pub(super) steps: Vec<PlannedStep>,
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
        energised: false,
    };
    for step in &sequence.steps {
        walk.step(step);
    }
    walk.end_energised();
    walk.out
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
            StepAction::Instruct(text) => self.untouched(place, |_| Action::Instruct(text.clone())),
            StepAction::Ask(question) => self.add(Action::Ask(question.clone())),
            StepAction::Acclimatise(waiting) => {
                self.untouched(place, |_| Action::Acclimatise(waiting.clone()))
            }
            StepAction::Rest(waiting) => {
                self.end_energised();
                self.add(Action::Rest(waiting.clone()));
            }
            StepAction::Supply(point) => self.set_supply(point.value, &point.place),
            StepAction::Position(position) => self.set_position(position),
            StepAction::Condition(condition) => self.set_condition(condition),
            StepAction::Energise => self.energise(place),
            StepAction::Deenergise => self.deenergise(place),
            StepAction::Inrush(timed) => {
                self.polled(place, timed.every, Action::Inrush(timed.clone()))
            }
            StepAction::Measure(timed) => {
                self.polled(place, timed.every, Action::Measure(timed.clone()))
            }
            StepAction::RunIn(timed) => {
                self.polled(place, timed.every, Action::RunIn(timed.clone()))
            }
            StepAction::Soak(soak) => {
                let action = Action::Soak {
                    at_least: soak.at_least,
                    at_most: soak.at_most,
                    every: soak.every,
                    until: soak.until.clone(),
                };
                self.polled(place, soak.every, action);
            }
            StepAction::Abnormal(abnormal) => {
                let action = Action::Abnormal {
                    fault: abnormal.fault.clone(),
                    length: abnormal.length,
                    every: abnormal.every,
                    body: abnormal.body,
                };
                self.polled(place, abnormal.every, action);
            }
            StepAction::Each(each) => self.each(each, place),
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
        let unnamed = [None];
        let named: Vec<Option<&Located<String>>> = each.conditions.iter().map(Some).collect();
        let conditions = if named.is_empty() {
            &unnamed[..]
        } else {
            &named[..]
        };
        for condition in conditions {
            for position in &each.positions {
                for supply in &each.supplies {
                    self.cell_of(each, *condition, position, supply);
                }
            }
        }
        self.cell = None;
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
        self.set_supply(supply.value, &supply.place);
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
        let instruction = found.instruction.clone();
        self.condition = Some(condition.value.clone());
        let condition_name = condition.value.clone();
        self.untouched(&condition.place, |_| Action::SetCondition {
            condition: condition_name,
            instruction,
        });
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
        let by_switch = self.by_switch;
        let name = position.value.clone();
        self.untouched(&position.place, |_| Action::SetPosition {
            position: name,
            number: index as u32 + 1,
            by_switch,
        });
    }

    fn set_supply(&mut self, point: SupplyPoint, place: &Place) {
        self.supply = Some(point);
        self.untouched(place, |_| Action::SetSupply(point));
    }

    /// Steps that come only while the unit is off.
    fn untouched(&mut self, place: &Place, action: impl FnOnce(()) -> Action) {
        let action = action(());
        if self.energised {
            self.notes.error(
                place,
                format!("`{}` comes while the unit is energised", action.verb()),
                "put `de-energise` or a `rest` before it",
            );
        }
        self.add(action);
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

    fn polled(&mut self, place: &Place, every: Seconds, action: Action) {
        if !self.energised {
            self.notes.error(
                place,
                format!("`{}` comes while the unit is not energised", action.verb()),
                "put `energise` before it",
            );
        }
        if every > SLOWEST_ENERGISED {
            self.notes.error(
                place,
                format!("polled every {every} while energised: a guard would trip too late"),
                format!("poll at least every {SLOWEST_ENERGISED} (house default)"),
            );
        }
        self.add(action);
    }
}
