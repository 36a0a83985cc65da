//! Inrush, steady state, temperatures and their uncertainty, from the closed
//! record alone. Cannot fail: absent values carry a reason.

mod inrush;
mod steady;
mod table;
mod types;
mod uncertain;
mod view;
mod warmth;

use crate::plan::{Plan, PlannedRole};
use crate::record::{Event, Happening, RunOutcome, Sample};
use crate::spec::sequence::RoleKind;

use view::View;

pub use table::results_csv;
pub use types::{Analysis, CellResult, Estimate, Figure, Inrush, Looked, Peak, Share, Steady};

/// What a record holds.
#[derive(Debug, Clone, Copy)]
pub struct Input<'a> {
    /// The plan that was run.
    pub plan: &'a Plan,
    /// Every sample, in order.
    pub samples: &'a [Sample],
    /// Every event, in order.
    pub happenings: &'a [Happening],
    /// How the run ended.
    pub outcome: &'a RunOutcome,
}

/// Analyses a record.
pub fn analyse(input: &Input) -> Analysis {
    let tripped = match input.outcome {
        RunOutcome::Tripped { reason, .. } => Some(reason.clone()),
        _ => None,
    };
    Analysis {
        cells: (0..input.plan.cells.len()).map(|cell| result_of(input, cell)).collect(),
        looked: input.happenings.iter().filter_map(looked).collect(),
        tripped,
        notes: notes(input.plan),
    }
}

fn result_of(input: &Input, cell: usize) -> CellResult {
    let view = View::of(input, cell);
    let settling = steady::settling(&view);
    let settled_s = steady::settled_after(&view, settling.as_ref());
    let steady = steady::steady(&view, settling.as_ref());
    let cold_start = warmth::cold_start(&view, input.samples);
    let (body_peak, budget) = warmth::body_peak(&view);
    let seconds = |at: Option<crate::quantity::Moment>, why: &str| match at {
        Some(at) => Figure::Known(at.as_secs_f64()),
        None => Figure::Absent(why.to_owned()),
    };
    CellResult {
        cell: input.plan.cells[cell].clone(),
        energised_s: seconds(view.on, "not run"),
        off_s: seconds(view.off, "never switched off in this cell"),
        inrush: inrush::inrush(&view, steady.known().map(|s| s.power_w.value)),
        body_worst: warmth::body_worst(&view, &body_peak, budget, settled_s.known().is_some()),
        disbelief: warmth::disbelief(&view, &cold_start),
        rises: other_temperatures(input.plan)
            .map(|(n, role)| (role.name.clone(), warmth::highest_rise(&view, n)))
            .collect(),
        cold_start,
        drawn_w: steady::drawn(&view),
        went_open: settling == Some(crate::settle::Settling::WentOpen),
        settled_s,
        steady,
        body_peak,
    }
}

fn other_temperatures(plan: &Plan) -> impl Iterator<Item = (usize, &PlannedRole)> {
    let roles = plan.bay.roles.iter().enumerate();
    roles.filter(|(_, r)| r.kind == RoleKind::Temperature && r.name != "body" && r.name != "ambient")
}

fn looked(happening: &Happening) -> Option<Looked> {
    match &happening.event {
        Event::Answered { text, answer, finding } => {
            Some(Looked { question: text.clone(), answer: answer.clone(), class: *finding })
        }
        _ => None,
    }
}

/// What a reader of half-wave results must know.
fn notes(plan: &Plan) -> Vec<String> {
    let half_wave = plan.appliance.diode_in.iter().map(|position| {
        format!(
            "position {position} is half-wave: a meter that loses the DC part reads its current 22.9 % too low; its power still holds under a sine voltage"
        )
    });
    half_wave.collect()
}
