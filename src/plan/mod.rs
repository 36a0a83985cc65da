//! Pure: crosses sequence, bench and drivers into a [`Plan`], or says everything
//! that is wrong with them at once.

mod expand;
mod guards;
mod notes;
mod reference;
mod resolve;
mod rules;
#[cfg(test)]
mod tests;
mod text;
mod types;
mod wiring;

pub use reference::Rated;
pub use resolve::{Resolved, resolve};
pub use types::{
    Action, Cell, Guards, PLAN_FORMAT, Plan, PlannedAppliance, PlannedBay, PlannedInstrument,
    PlannedLine, PlannedLink, PlannedPlate, PlannedRole, PlannedRule, PlannedStep,
};
