//! Inrush, steady state, temperatures and their uncertainty, from the closed
//! record alone. Cannot fail: absent values carry a reason.

mod belief;
mod cell;
mod change;
mod dc;
mod fetched;
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
    Analysis, CellResult, Change, Drawn, Estimate, Figure, Harmonic, Inrush, Looked, Peak, Share,
    Steady, Wave,
};
pub use voltage::{at_voltage, plate_point, plate_points};

use crate::plan::Plan;
use crate::record::{Event, Happening, RunOutcome, Sample, StoredWaveform};

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
    /// Every waveform; none in records that were made before they were kept.
    pub waveforms: &'a [StoredWaveform],
    /// How the run ended.
    pub outcome: &'a RunOutcome,
}

/// What the record says, cell by cell.
pub fn analyse(input: &Input) -> Analysis {
    let switched = cell::switched(input.plan, input.happenings);
    let mut cells: Vec<CellResult> = switched
        .into_iter()
        .enumerate()
        .map(|(index, switched)| result(input, index, switched))
        .collect();
    let lost: Vec<Option<String>> = (0..cells.len())
        .map(|index| dc::lost(input.plan, &cells, index))
        .collect();
    let mut notes = Vec::new();
    for (cell, why) in cells.iter_mut().zip(lost) {
        if let Some(why) = &why {
            notes.push(format!(
                "{why}; its current is not to be believed, its power is right under a sine voltage"
            ));
            doubt_current(cell, why);
        }
        cell.dc_lost = why;
    }
    notes.dedup();
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
    let waveform = fetched::wave(input, &view, steady.known());
    let captured = inrush::inrush(&view, steady.known(), waveform.known());
    let (inrush, switch_in_peak) = inrush::parted(captured, belief::cold(&view));
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
        inrush,
        switch_in_peak,
        waveform,
        dc_lost: None,
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

/// What rests on a current without its DC part is no result.
fn doubt_current(cell: &mut CellResult, why: &str) {
    if let Figure::Known(steady) = &mut cell.steady {
        steady.current_a = None;
    }
    if cell.switch_in_peak.known().is_some() {
        let doubt = format!("the meter's current is not to be believed: {why}");
        cell.switch_in_peak = Figure::Absent(doubt);
    }
}

#[cfg(test)]
mod tests;
