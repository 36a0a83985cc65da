//! A record seen cell by cell.

use super::Input;
use crate::plan::{Action, Plan};
use crate::quantity::{Moment, Reading};
use crate::record::{Event, Sample, Status};
use crate::spec::sequence::RoleKind;

/// One cell's part of a record.
pub(super) struct View<'a> {
    pub(super) plan: &'a Plan,
    pub(super) cell: usize,
    /// Samples of the cell, in order.
    pub(super) samples: Vec<&'a Sample>,
    /// When the output went on.
    pub(super) on: Option<Moment>,
    /// When it went off again.
    pub(super) off: Option<Moment>,
}

/// A value and when its reply was whole.
pub(super) type Timed = (Moment, f64);

impl<'a> View<'a> {
    /// The part of `input` that belongs to a cell.
    pub(super) fn of(input: &Input<'a>, cell: usize) -> Self {
        let (on, off) = switched(input, cell);
        Self {
            plan: input.plan,
            cell,
            samples: input.samples.iter().filter(|s| s.cell == Some(cell)).collect(),
            on,
            off,
        }
    }

    /// Good readings of a role, in order.
    pub(super) fn readings(&self, role: usize, reading: Reading) -> impl Iterator<Item = (&'a Sample, f64)> + '_ {
        let of_role = self.samples.iter().filter(move |s| s.role == role && s.status == Status::Ok);
        of_role.filter_map(move |s| Some((*s, s.readings.get(reading)?)))
    }

    /// Good readings of a role in steps of the given verb.
    pub(super) fn in_step(&self, verb: &str, role: usize, reading: Reading) -> Vec<Timed> {
        let steps = self.steps(verb);
        self.readings(role, reading)
            .filter(|(s, _)| steps.contains(&s.step))
            .map(|(s, value)| (s.reply, value))
            .collect()
    }

    /// Good readings of a role from energising on, to the end of the cell.
    pub(super) fn since_on(&self, role: usize, reading: Reading) -> Vec<Timed> {
        let Some(on) = self.on else { return Vec::new() };
        self.readings(role, reading).filter(|(s, _)| s.reply >= on).map(|(s, v)| (s.reply, v)).collect()
    }

    /// Good readings of a role while energised.
    pub(super) fn while_on(&self, role: usize, reading: Reading) -> Vec<Timed> {
        let off = self.off.unwrap_or(Moment::from_micros(u64::MAX));
        self.since_on(role, reading).into_iter().filter(|(at, _)| *at <= off).collect()
    }

    /// Numbers of the cell's steps of a verb.
    pub(super) fn steps(&self, verb: &str) -> Vec<u32> {
        let steps = self.plan.steps.iter().filter(|s| s.cell == Some(self.cell) && s.action.verb() == verb);
        steps.map(|s| s.number).collect()
    }

    /// The cell's first soak.
    pub(super) fn soak(&self) -> Option<&'a Action> {
        let mut steps = self.plan.steps.iter().filter(|s| s.cell == Some(self.cell));
        steps.find(|s| matches!(s.action, Action::Soak { .. })).map(|s| &s.action)
    }

    pub(super) fn meter(&self) -> Option<usize> {
        self.plan.role_of_kind(RoleKind::PowerMeter).map(|(n, _)| n)
    }

    pub(super) fn body(&self) -> Option<usize> {
        self.plan.role("body").map(|(n, _)| n)
    }

    pub(super) fn ambient(&self) -> Option<usize> {
        self.plan.role("ambient").map(|(n, _)| n)
    }
}

/// The value of a series at a moment: the last one before it, else the first after.
pub(super) fn value_at(series: &[Timed], at: Moment) -> Option<f64> {
    let after = series.partition_point(|(t, _)| *t <= at);
    series[..after].last().or(series.first()).map(|(_, value)| *value)
}

/// When a cell was energised, and switched off, by the events. Energising counts from
/// its announcement, as in the run.
fn switched(input: &Input, cell: usize) -> (Option<Moment>, Option<Moment>) {
    let mut here = false;
    let (mut on, mut off) = (None, None);
    for happening in input.happenings {
        match &happening.event {
            Event::StepBegan { step } => {
                here = input.plan.steps.iter().any(|s| s.number == *step && s.cell == Some(cell));
            }
            Event::Energising if here && on.is_none() => on = Some(happening.at),
            Event::Off { .. } if on.is_some() && off.is_none() => off = Some(happening.at),
            _ => {}
        }
    }
    (on, off)
}
