//! Inrush, steady state, temperatures and their uncertainty, from the closed
//! record alone. Cannot fail: absent values carry a reason.

mod belief;
mod budget;
mod budget_table;
mod cell;
mod change;
mod cycling;
mod dc;
mod fetched;
#[cfg(test)]
pub(crate) mod fixture;
mod input;
mod inrush;
mod measured;
mod opening;
mod plate;
mod referral;
mod steady;
mod table;
mod temperature;
mod types;
pub mod waveform;

pub use budget::{Distribution, Share, SharedError};
pub use budget_table::{budgets_csv, budgets_text};
pub use plate::{plate_point, plate_points, points_in_reach};
pub use referral::at_voltage;
pub use table::results_csv;
pub use types::{
    Analysis, CellResult, Change, Drawn, Estimate, Exponent, Figure, Harmonic, Inrush, Looked,
    Opening, Peak, Steady, Wave,
};

use crate::plan::{Action, Plan};
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
    let views: Vec<CellView> = switched
        .into_iter()
        .enumerate()
        .map(|(index, switched)| CellView::new(input, index, switched))
        .collect();
    let mut cells: Vec<CellResult> = views.iter().map(|view| result(input, view)).collect();
    referral::refer(input.plan, &mut cells);
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
        openings: views.iter().flat_map(opening::openings).collect(),
        looked: looked(input.happenings),
        history: history(input.happenings),
        tripped: tripped(input),
        notes,
    }
}

fn result(input: &Input, view: &CellView) -> CellResult {
    let switched = view.switched;
    let settled = steady::settled(view);
    let steady = steady::steady(view, &settled);
    let drawn = steady::drawn(view);
    let peak = temperature::body_peak(view);
    let waveform = fetched::wave(input, view, steady.known());
    let captured = inrush::inrush(view, steady.known(), waveform.known());
    let (inrush, switch_in_peak) = inrush::parted(captured, belief::cold(view));
    let seconds = |moment: Option<crate::quantity::Moment>, otherwise: String| match moment {
        Some(moment) => Figure::Known(moment.as_secs_f64()),
        None => Figure::Absent(otherwise),
    };
    CellResult {
        cell: view.cell.clone(),
        energised_s: seconds(switched.energised, not_run(input.outcome, &switched)),
        off_s: seconds(switched.off, "no OFF is recorded after it".to_owned()),
        cold_start: match belief::cold(view) {
            Ok(()) => Figure::Known(()),
            Err(reason) => Figure::Absent(reason),
        },
        inrush,
        switch_in_peak,
        waveform,
        dc_lost: None,
        settled_s: steady::settled_after(view, &settled),
        body_worst: temperature::body_worst(view, &peak, &settled, steady.known()),
        body_peak: peak,
        rises: followed(temperature::rises(view), &settled),
        disbelief: belief::disbelief(view, drawn.known()),
        abnormal: view
            .step(|action| matches!(action, Action::Abnormal { .. }))
            .is_some(),
        drawn,
        steady,
    }
}

/// A soak that was ended early followed the body alone: no other temperature is known
/// to have come to its end.
fn followed(
    rises: Vec<(String, Figure<Estimate>)>,
    settled: &Figure<steady::Window>,
) -> Vec<(String, Figure<Estimate>)> {
    let early = settled.known().is_some_and(|w| w.extrapolated.is_some());
    let cut = |rise: Figure<Estimate>| match rise {
        Figure::Known(_) if early => Figure::Absent(
            "the soak was ended early, and this temperature was not followed to its end".to_owned(),
        ),
        rise => rise,
    };
    rises
        .into_iter()
        .map(|(name, rise)| (name, cut(rise)))
        .collect()
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

fn history(happenings: &[Happening]) -> Vec<String> {
    happenings
        .iter()
        .filter_map(|happening| match &happening.event {
            Event::Marked { mark, by, record } => {
                Some(format!("record {record} left it marked `{mark}`: {by}"))
            }
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
