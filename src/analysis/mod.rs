//! Inrush, steady state, temperatures and their uncertainty, from the closed
//! record alone. Cannot fail: absent values carry a reason.

mod belief;
mod cell;
#[cfg(test)]
pub(crate) mod fixture;
mod inrush;
mod measured;
mod steady;
mod table;
mod temperature;
mod types;
mod voltage;
pub mod waveform;

pub use table::results_csv;
pub use types::{
    Analysis, CellResult, Drawn, Estimate, Figure, Inrush, Looked, Peak, Share, Steady,
};
pub use voltage::{at_voltage, plate_point, plate_points};

use crate::plan::Plan;
use crate::record::{Event, Happening, RunOutcome, Sample};
use crate::spec::sequence::HeatingElement;

use cell::{CellView, Switched};

/// What a record holds, as analysis reads it.
#[derive(Debug, Clone, Copy)]
pub struct Input<'a> {
    /// The stored plan.
    pub plan: &'a Plan,
    /// Every row, in the order of the record.
    pub samples: &'a [Sample],
    /// Every event, in the order of the record.
    pub happenings: &'a [Happening],
    /// How the run ended.
    pub outcome: &'a RunOutcome,
}

/// What the record says, cell by cell.
pub fn analyse(input: &Input) -> Analysis {
    let switched = cell::switched(input.plan, input.happenings);
    let cells: Vec<CellResult> = switched
        .into_iter()
        .enumerate()
        .map(|(index, switched)| result(input, index, switched))
        .collect();
    let notes = cells
        .iter()
        .filter_map(|cell| half_wave(input.plan, cell))
        .collect();
    Analysis {
        cells,
        looked: looked(input.happenings),
        tripped: tripped(input),
        notes,
    }
}

fn result(input: &Input, index: usize, switched: Switched) -> CellResult {
    let view = CellView::new(input, index, switched);
    let settled = steady::settled(&view);
    let steady = steady::steady(&view, &settled);
    let drawn = steady::drawn(&view);
    let peak = temperature::body_peak(&view);
    let seconds = |moment: Option<crate::quantity::Moment>, otherwise: String| match moment {
        Some(moment) => Figure::Known(moment.as_secs_f64()),
        None => Figure::Absent(otherwise),
    };
    CellResult {
        cell: view.cell.clone(),
        energised_s: seconds(switched.energised, not_run(input.outcome, &switched)),
        off_s: seconds(switched.off, "no OFF is recorded after it".to_owned()),
        cold_start: match belief::cold(&view) {
            Ok(()) => Figure::Known(()),
            Err(reason) => Figure::Absent(reason),
        },
        inrush: inrush::inrush(&view, steady.known()),
        settled_s: steady::settled_after(&view, &settled),
        body_worst: temperature::body_worst(&view, &peak, &settled),
        body_peak: peak,
        rises: temperature::rises(&view),
        disbelief: belief::disbelief(&view, drawn.known()),
        drawn,
        steady,
    }
}

/// Why a cell was never energised.
fn not_run(outcome: &RunOutcome, switched: &Switched) -> String {
    let why = match outcome {
        RunOutcome::Complete => "the sequence does not energise it",
        RunOutcome::Tripped { .. } => "a guard tripped before",
        RunOutcome::Stopped => "the operator stopped the run before",
        RunOutcome::Failed { .. } => "the run failed before",
        RunOutcome::Interrupted => "the run was interrupted before",
    };
    let how = if switched.began {
        "not energised"
    } else {
        "not run"
    };
    format!("{how}: {why}")
}

fn looked(happenings: &[Happening]) -> Vec<Looked> {
    happenings
        .iter()
        .filter_map(|happening| match &happening.event {
            Event::Answered {
                text,
                answer,
                finding,
            } => Some(Looked {
                question: text.clone(),
                answer: answer.clone(),
                class: *finding,
            }),
            _ => None,
        })
        .collect()
}

fn tripped(input: &Input) -> Option<String> {
    let recorded = input.happenings.iter().find_map(|h| match &h.event {
        Event::Tripped { reason } => Some(reason.clone()),
        _ => None,
    });
    recorded.or(match input.outcome {
        RunOutcome::Tripped { reason, .. } => Some(reason.clone()),
        _ => None,
    })
}

/// A half-wave load that is read by a meter which loses the DC part: a resistive one
/// then shows a power factor of 0.917 instead of 0.707 (computed). Its power is right
/// under a sine voltage all the same.
fn half_wave(plan: &Plan, cell: &CellResult) -> Option<String> {
    let resistive = plan.appliance.element == HeatingElement::Resistor && !plan.appliance.fan;
    let position = &cell.cell.position;
    if !resistive || !plan.appliance.diode_in.contains(position) {
        return None;
    }
    let steady = cell.steady.known()?;
    let factor = steady.power_w.value / (steady.voltage_v * steady.current_a?);
    (factor > HALF_WAVE_MIDDLE).then(|| {
        format!(
            "position {position} is fed through a diode and shows a power factor of {factor:.3}, \
             not 0.707: the meter loses the DC part and its current is not to be believed; \
             its power is right under a sine voltage"
        )
    })
}

/// Half-way between 1/sqrt(2) and 0.917.
const HALF_WAVE_MIDDLE: f64 = 0.81;

#[cfg(test)]
mod tests;
