//! The rows and moments of one cell.

use crate::plan::{Action, Cell, Plan, PlannedStep};
use crate::quantity::{Moment, Reading};
use crate::record::{Event, Happening, Sample, Status, StepEnd};
use crate::spec::sequence::RoleKind;

use super::Input;

/// A value and when, seconds since the record's start. The moment of a row is
/// that of its reply, here and wherever else rows are placed in time.
pub(super) type Track = Vec<(f64, f64)>;

/// When a row was taken, seconds since the record's start.
pub(super) fn time(sample: &Sample) -> f64 {
    sample.reply.as_secs_f64()
}

/// When the output of a cell went on and off.
#[derive(Debug, Clone, Copy, PartialEq, Default)]
pub(super) struct Switched {
    pub(super) energised: Option<Moment>,
    pub(super) off: Option<Moment>,
    pub(super) began: bool,
}

/// What the happenings say of every cell: the first time that energising was
/// announced, and the last OFF after that.
pub(super) fn switched(plan: &Plan, happenings: &[Happening]) -> Vec<Switched> {
    let mut all = vec![Switched::default(); plan.cells.len()];
    let cell_of = |number: u32| {
        let step = plan.steps.iter().find(|step| step.number == number)?;
        step.cell.filter(|cell| *cell < plan.cells.len())
    };
    let (mut current, mut on) = (None, None);
    for happening in happenings {
        match &happening.event {
            Event::StepBegan { step } => {
                current = cell_of(*step);
                if let Some(cell) = current {
                    all[cell].began = true;
                }
            }
            // The announcement counts: from then on the output may be on.
            Event::Energising | Event::Energised => {
                on = current;
                if let Some(cell) = on {
                    all[cell].energised.get_or_insert(happening.at);
                }
            }
            Event::Off { .. } => {
                if let Some(cell) = on.take() {
                    all[cell].off = Some(happening.at);
                }
            }
            _ => {}
        }
    }
    all
}

/// One cell of a record.
pub(super) struct CellView<'a> {
    pub(super) plan: &'a Plan,
    pub(super) index: usize,
    pub(super) cell: &'a Cell,
    pub(super) switched: Switched,
    pub(super) happenings: &'a [Happening],
    /// Rows of the cell.
    pub(super) rows: Vec<&'a Sample>,
    /// Rows of the whole record.
    pub(super) all: &'a [Sample],
    /// Index of the role that reads power.
    pub(super) meter: Option<usize>,
    /// Index of the role `body`.
    pub(super) body: Option<usize>,
    /// Index of the role `ambient`.
    pub(super) ambient: Option<usize>,
}

impl<'a> CellView<'a> {
    pub(super) fn new(input: &Input<'a>, index: usize, switched: Switched) -> Self {
        let plan = input.plan;
        let role = |name| plan.role(name).map(|(role, _)| role);
        CellView {
            plan,
            index,
            cell: &plan.cells[index],
            switched,
            happenings: input.happenings,
            rows: input
                .samples
                .iter()
                .filter(|row| row.cell == Some(index))
                .collect(),
            all: input.samples,
            meter: plan
                .role_of_kind(RoleKind::PowerMeter)
                .map(|(role, _)| role),
            body: role("body"),
            ambient: role("ambient"),
        }
    }

    /// The cell's steps.
    pub(super) fn steps(&self) -> impl Iterator<Item = &'a PlannedStep> {
        let index = self.index;
        self.plan
            .steps
            .iter()
            .filter(move |s| s.cell == Some(index))
    }

    /// The cell's first step of a kind.
    pub(super) fn step(&self, wanted: impl Fn(&Action) -> bool) -> Option<&'a PlannedStep> {
        self.steps().find(|step| wanted(&step.action))
    }

    /// How a step ended.
    pub(super) fn end_of(&self, number: u32) -> Option<StepEnd> {
        self.happenings.iter().find_map(|h| match &h.event {
            Event::StepEnded { step, end } if *step == number => Some(end.clone()),
            _ => None,
        })
    }

    /// When it was energised, seconds since the record's start.
    pub(super) fn energised_s(&self) -> Option<f64> {
        self.switched.energised.map(Moment::as_secs_f64)
    }

    /// When it went off, else its last energised row.
    pub(super) fn energised_until_s(&self) -> Option<f64> {
        let last = self.rows.iter().rev().find(|row| row.energised);
        let off = self.switched.off.map(Moment::as_secs_f64);
        off.or(last.map(|row| time(row)))
    }

    /// Values of a role in the cell's rows that `keep` keeps.
    pub(super) fn track(
        &self,
        role: Option<usize>,
        reading: Reading,
        keep: impl Fn(&Sample) -> bool,
    ) -> Track {
        let Some(role) = role else {
            return Track::new();
        };
        self.rows
            .iter()
            .filter(|row| row.role == role && row.status == Status::Ok && keep(row))
            .filter_map(|row| Some((time(row), row.readings.get(reading)?)))
            .collect()
    }

    /// Values of a role while the output was on.
    pub(super) fn energised(&self, role: Option<usize>, reading: Reading) -> Track {
        let off = self.switched.off.map_or(f64::INFINITY, Moment::as_secs_f64);
        self.track(role, reading, |row| row.energised && time(row) <= off)
    }

    /// The last value of a role in the whole record before the cell was energised.
    pub(super) fn before_energising(&self, role: Option<usize>) -> Option<f64> {
        let (role, energised) = (role?, self.switched.energised?);
        self.all
            .iter()
            .rev()
            .filter(|row| row.role == role && row.reply <= energised && !row.energised)
            .filter(|row| row.status == Status::Ok)
            .find_map(|row| row.readings.get(Reading::Temperature))
    }

    /// Mean of the ambient within half a minute of `t`, else the nearest value
    /// within five minutes.
    pub(super) fn ambient_at(&self, t: f64) -> Option<f64> {
        let track = self.track(self.ambient, Reading::Temperature, |_| true);
        let close: Track = track
            .iter()
            .copied()
            .filter(|(at, _)| (at - t).abs() <= 30.0)
            .collect();
        if let Some(mean) = mean(&close) {
            return Some(mean);
        }
        track
            .into_iter()
            .filter(|(at, _)| (at - t).abs() <= 300.0)
            .min_by(|a, b| (a.0 - t).abs().total_cmp(&(b.0 - t).abs()))
            .map(|(_, value)| value)
    }
}

/// Mean of a track's values.
pub(super) fn mean(track: &[(f64, f64)]) -> Option<f64> {
    let sum: f64 = track.iter().map(|(_, value)| value).sum();
    (!track.is_empty()).then(|| sum / track.len() as f64)
}

/// Highest value of a track, the first of equals.
pub(super) fn highest(track: &[(f64, f64)]) -> Option<(f64, f64)> {
    track
        .iter()
        .copied()
        .reduce(|best, next| if next.1 > best.1 { next } else { best })
}

/// The part of a track within two moments, both included.
pub(super) fn within(track: &[(f64, f64)], from: f64, to: f64) -> &[(f64, f64)] {
    let first = track.partition_point(|(t, _)| *t < from);
    let last = track.partition_point(|(t, _)| *t <= to);
    &track[first..last.max(first)]
}
