//! Pure: crosses sequence, bench and drivers into a [`Plan`], or says everything
//! that is wrong with them at once.

mod types;

pub use types::{
    Action, Cell, Guards, PLAN_FORMAT, Plan, PlannedAppliance, PlannedBay, PlannedInstrument,
    PlannedLine, PlannedLink, PlannedPlate, PlannedRole, PlannedRule, PlannedStep,
};
