//! Pure: crosses sequence, bench and drivers into a [`Plan`], or says everything
//! that is wrong with them at once.

mod calibration;
mod duration;
mod expand;
mod guards;
mod intervals;
mod meter;
mod notes;
mod other_rules;
mod ratings;
mod reference;
mod resolve;
mod roles;
mod rules;
mod sensing;
mod soaking;
#[cfg(test)]
mod tests;
mod text;
mod types;
mod waveform;
mod wiring;
mod words;

pub use other_rules::other_rules;
pub use resolve::{Resolved, resolve};
pub use types::{
    Action, Cell, Guards, PLAN_FORMAT, Plan, PlannedAppliance, PlannedBay, PlannedInstrument,
    PlannedLine, PlannedLink, PlannedPlate, PlannedRole, PlannedRule, PlannedStep,
};
pub use waveform::time_for_block;
