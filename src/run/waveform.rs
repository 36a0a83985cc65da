//! The waveform of a switch-on: armed before it, fetched while still energised.
//!
//! What can't be armed or fetched is an event of the record and leaves its results
//! without a value; it never ends a run.

use super::bay::{Cut, Working};
use crate::plan::{Action, PlannedRole, time_for_block};
use crate::record::Event;
use crate::spec::sequence::RoleKind;

/// Whether a step fetches a waveform.
pub(super) fn is_wanted(action: &Action) -> bool {
    matches!(action, Action::Inrush(timed) if timed.waveform)
}

/// Arms the meter: the first current to come is what it takes.
pub(super) async fn arm(bay: &mut Working) -> Result<(), Cut> {
    bay.armed = false;
    let Some((_, role)) = meter(bay) else {
        return Ok(());
    };
    let (line, index) = bay.instrument_of(&role);
    match bay.attend_to(line.arm(index)).await? {
        Ok(()) => bay.armed = true,
        Err(error) => failed(bay, format!("the meter could not be armed: {error}"))?,
    }
    Ok(())
}

/// Fetches what the meter took, where it was armed. Its line gives no readings
/// meanwhile; the guards and every other line go on.
pub(super) async fn fetch(bay: &mut Working) -> Result<(), Cut> {
    if !std::mem::take(&mut bay.armed) {
        return Ok(());
    }
    let (Some((number, role)), Some(cell)) = (meter(bay), bay.cell) else {
        return Ok(());
    };
    let driver = &bay.plan.instrument_of(&role).driver;
    let at_most = time_for_block(bay.plan.guards.silence[number], driver);
    let (line, index) = bay.instrument_of(&role);
    match bay.attend_to(line.waveform(index, at_most)).await? {
        Ok(wave) => bay.store(cell, &wave),
        Err(error) => failed(bay, error.to_string()),
    }
}

fn meter(bay: &Working) -> Option<(usize, PlannedRole)> {
    let (number, role) = bay.plan.role_of_kind(RoleKind::PowerMeter)?;
    Some((number, role.clone()))
}

fn failed(bay: &mut Working, reason: String) -> Result<(), Cut> {
    match bay.cell {
        Some(cell) => bay.note(Event::WaveformFailed { cell, reason }),
        None => Ok(()),
    }
}
